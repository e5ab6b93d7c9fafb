//! What is asked of the client: settings, watched files, progress, a second look at hints. Nothing here
//! waits: each request runs by itself, and its answer comes back as an event.
//! Must not know what the answers are for.

use std::path::PathBuf;
use std::sync::mpsc::{Sender, SyncSender};
use std::thread;
use std::time::Duration;

use tokio::runtime::Handle;
use tokio::sync::mpsc::{UnboundedReceiver, UnboundedSender, unbounded_channel};
use tower_lsp::lsp_types::notification::Progress;
use tower_lsp::lsp_types::request::{RegisterCapability, WorkDoneProgressCreate};
use tower_lsp::lsp_types::*;

use crate::capabilities::Client;
use crate::documents::Event;

/// How often the process of the client is looked for.
const PARENT_EVERY: Duration = Duration::from_secs(2);

/// The client, from afar.
pub(crate) struct Remote {
    client: tower_lsp::Client,
    runtime: Handle,
    events: SyncSender<Event>,
    exit: Sender<u8>,
    /// Takes how many specs are left, while the check of the workspace is shown.
    shown: Option<UnboundedSender<usize>>,
    count: i32,
}

impl Remote {
    /// Nothing asked yet.
    pub(crate) fn new(
        client: tower_lsp::Client,
        runtime: Handle,
        events: SyncSender<Event>,
        exit: Sender<u8>,
    ) -> Self {
        Self {
            client,
            runtime,
            events,
            exit,
            shown: None,
            count: 0,
        }
    }

    /// End the process.
    pub(crate) fn client_is_gone(&self) {
        // nobody listens only if the process is ending already
        let _ = self.exit.send(1);
    }

    /// End the process when the one that started it has ended but left its pipes to others. Where a
    /// process can not be looked for by number, the end of standard input has to do.
    pub(crate) fn watch_parent(&self, process: Option<u32>) {
        let Some(parent) = process.map(|id| PathBuf::from(format!("/proc/{id}"))) else {
            return;
        };
        let exit = self.exit.clone();
        if parent.exists() {
            // without the thread, the end of standard input has to do
            let _ = thread::Builder::new()
                .name("parent".to_owned())
                .spawn(move || {
                    while parent.exists() {
                        thread::sleep(PARENT_EVERY);
                    }
                    let _ = exit.send(1);
                });
        }
    }

    /// The client takes requests from now on.
    pub(crate) fn ready(&self, client: &Client) {
        self.fetch_settings(client);
        if client.watching {
            let watcher = FileSystemWatcher {
                glob_pattern: GlobPattern::String("**/*.{ampspec,csv}".to_owned()),
                kind: None,
            };
            let options = DidChangeWatchedFilesRegistrationOptions {
                watchers: vec![watcher],
            };
            let registration = Registration {
                id: "files".to_owned(),
                method: "workspace/didChangeWatchedFiles".to_owned(),
                register_options: serde_json::to_value(options).ok(),
            };
            let remote = self.client.clone();
            self.runtime.spawn(async move {
                // a client that refuses has no files watched; open buffers are still checked
                let _ = remote
                    .send_request::<RegisterCapability>(RegistrationParams {
                        registrations: vec![registration],
                    })
                    .await;
            });
        }
    }

    /// Ask for the settings.
    pub(crate) fn fetch_settings(&self, client: &Client) {
        if !client.configuration {
            return;
        }
        let (remote, events) = (self.client.clone(), self.events.clone());
        self.runtime.spawn(async move {
            let item = ConfigurationItem {
                scope_uri: None,
                section: Some("derate".to_owned()),
            };
            if let Ok(mut settings) = remote.configuration(vec![item]).await
                && let Some(settings) = settings.pop().filter(|s| !s.is_null())
            {
                let _ = events.send(Event::Settings(Some(settings)));
            }
        });
    }

    /// Ask that hints and lenses be fetched anew: they changed with another text than their own.
    pub(crate) fn refresh(&self, client: &Client) {
        let remote = self.client.clone();
        let (hints, lenses) = (client.hint_refresh, client.lens_refresh);
        if hints || lenses {
            self.runtime.spawn(async move {
                if hints {
                    let _ = remote.inlay_hint_refresh().await;
                }
                if lenses {
                    let _ = remote.code_lens_refresh().await;
                }
            });
        }
    }

    /// The check of a workspace begins.
    pub(crate) fn begin(&mut self, client: &Client, specs: usize) {
        if !client.progress || self.shown.is_some() {
            return;
        }
        self.count += 1;
        let token = NumberOrString::String(format!("derate/{}", self.count));
        let (left, steps) = unbounded_channel();
        self.shown = Some(left);
        self.runtime
            .spawn(show_progress(self.client.clone(), token, specs, steps));
    }

    /// So many specs are left to check.
    pub(crate) fn step(&mut self, left: usize) {
        if let Some(shown) = &self.shown {
            // nobody listens where the client did not want to show anything
            let _ = shown.send(left);
        }
        if left == 0 {
            self.shown = None;
        }
    }
}

/// Show the progress of a check of so many specs, in the order of the protocol: nothing is told before
/// the client has agreed, and the end comes last.
async fn show_progress(
    remote: tower_lsp::Client,
    token: NumberOrString,
    all: usize,
    mut steps: UnboundedReceiver<usize>,
) {
    let create = WorkDoneProgressCreateParams {
        token: token.clone(),
    };
    if remote
        .send_request::<WorkDoneProgressCreate>(create)
        .await
        .is_err()
    {
        return;
    }
    let begin = WorkDoneProgressBegin {
        title: "Checking specs".to_owned(),
        cancellable: Some(true),
        message: None,
        percentage: Some(0),
    };
    tell(&remote, &token, WorkDoneProgress::Begin(begin)).await;
    let mut most = 0;
    while let Some(left) = steps.recv().await.filter(|left| *left > 0) {
        // an edit can make specs wait again: what is shown never falls
        most = most.max(all.saturating_sub(left));
        let report = WorkDoneProgressReport {
            cancellable: Some(true),
            message: Some(format!("{most} of {all}")),
            percentage: u32::try_from(100 * most / all.max(1)).ok(),
        };
        tell(&remote, &token, WorkDoneProgress::Report(report)).await;
    }
    let end = WorkDoneProgressEnd { message: None };
    tell(&remote, &token, WorkDoneProgress::End(end)).await;
}

async fn tell(remote: &tower_lsp::Client, token: &NumberOrString, progress: WorkDoneProgress) {
    let params = ProgressParams {
        token: token.clone(),
        value: ProgressParamsValue::WorkDone(progress),
    };
    remote.send_notification::<Progress>(params).await;
}
