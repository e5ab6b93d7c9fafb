//! The one owner of the documents: takes every event in order, keeps snapshots, has specs checked and
//! publishes what was found. Must not know how a check or an answer is made.

use std::collections::{BTreeMap, HashMap};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::sync::mpsc::{Receiver, SyncSender};

use ampspec_grammar::{ColumnUnit, LineIndex, Tree, parse};
use derate::assist::hover::needs_check;
use derate::source::Files;
use serde_json::Value;
use tower_lsp::jsonrpc;
use tower_lsp::lsp_types::{
    Diagnostic, Position, PublishDiagnosticsParams, TextDocumentContentChangeEvent, Url,
};

use crate::answer::View;
use crate::capabilities::{Client, Settings};
use crate::check::{Checked, Session};
use crate::convert;
use crate::pool::Pool;
use crate::remote::Remote;
use crate::snapshot::{Buffer, Snapshot};
use crate::wire::Outbox;

/// What an answer needs before it can be given.
#[derive(Clone, Copy, Debug)]
pub(crate) enum Need {
    /// The text.
    Text,
    /// What was found in this very text.
    Check,
    /// What was found, if the word at this position calls for it.
    CheckAt(Position),
}

/// Gives an answer, or says why there is none.
pub(crate) type Work = Box<dyn FnOnce(Result<View, jsonrpc::Error>) + Send>;

/// What is done for a question about the whole workspace.
pub(crate) type WorkOnAll = Box<dyn FnOnce(&Snapshot, &Session) + Send>;

/// What the owner is told, in the order in which it happened.
pub(crate) enum Event {
    /// The client has said who it is: its abilities, its folders, its settings if it sent them.
    Start(Box<Client>, Vec<Url>, Option<Value>),
    /// The client is ready for requests.
    Ready,
    /// A document was opened.
    Open(Url, i32, String),
    /// A document was edited.
    Change(Url, i32, Vec<TextDocumentContentChangeEvent>),
    /// A document was closed.
    Close(Url),
    /// Files changed on the disk.
    Touched(Vec<Url>),
    /// Workspace folders came and went.
    Folders(Vec<Url>, Vec<Url>),
    /// Settings; `None` where the client says only that they changed.
    Settings(Option<Value>),
    /// A question about a document.
    Ask(Url, Need, Work),
    /// A question about the whole workspace.
    AskAll(WorkOnAll),
    /// A check was done.
    Checked(PathBuf, u64, Box<Checked>),
    /// The specs below the workspace folders.
    Found(Vec<PathBuf>),
    /// The client wants the check of the whole workspace to stop.
    Stop,
}

/// A spec that is checked.
#[derive(Default)]
struct Root {
    /// A new number with every change of anything it reads.
    wanted: u64,
    /// The check that runs.
    running: Option<u64>,
    /// What has changed since it began and is not known to be read: the check may come to read it.
    meanwhile: Vec<PathBuf>,
    /// What the result holds for.
    settled: Option<u64>,
    result: Option<Arc<Checked>>,
    /// It is checked because it lies in the workspace.
    in_workspace: bool,
}

impl Root {
    fn is_fresh(&self) -> bool {
        self.settled == Some(self.wanted)
    }
    fn reads(&self, path: &Path) -> bool {
        self.result
            .as_ref()
            .is_none_or(|r| r.seen.contains_key(path))
    }
}

struct Waiting {
    path: PathBuf,
    version: i32,
    uri: Url,
    work: Work,
}

/// The owner.
pub(crate) struct Owner {
    events: SyncSender<Event>,
    outbox: Outbox,
    pool: Pool,
    remote: Remote,
    session: Arc<Session>,
    settings: Settings,
    ready: bool,
    /// The last number given out: no two states of anything ever have the same.
    stamp: u64,
    paths: HashMap<Url, PathBuf>,
    /// Texts that were edited and are not read yet, with their versions.
    drafts: HashMap<Url, (i32, Arc<str>)>,
    snapshot: Snapshot,
    roots: BTreeMap<PathBuf, Root>,
    /// The document that was edited last: it is checked first.
    latest: Option<PathBuf>,
    published: HashMap<PathBuf, (Option<i32>, Vec<Diagnostic>)>,
    waiting: Vec<Waiting>,
    /// Another document than the edited one has new findings.
    rippled: bool,
}

impl Owner {
    /// An owner of nothing yet.
    pub(crate) fn new(events: SyncSender<Event>, outbox: Outbox, remote: Remote) -> Self {
        let client = Client::of(&tower_lsp::lsp_types::InitializeParams::default());
        Self {
            events,
            outbox,
            pool: Pool::new(),
            remote,
            session: Arc::new(Session {
                client,
                policy: None,
                duty: None,
                folders: Vec::new(),
                memory: Arc::default(),
            }),
            settings: Settings::default(),
            ready: false,
            stamp: 0,
            paths: HashMap::new(),
            drafts: HashMap::new(),
            snapshot: Snapshot::default(),
            roots: BTreeMap::new(),
            latest: None,
            published: HashMap::new(),
            waiting: Vec::new(),
            rippled: false,
        }
    }

    /// Take events until there are no more. What waits in the queue is taken before any check is begun,
    /// so that edits typed at once cost one check.
    pub(crate) fn run(mut self, events: &Receiver<Event>) {
        while let Ok(event) = events.recv() {
            self.take(event);
            while let Ok(event) = events.try_recv() {
                self.take(event);
            }
            if catch_unwind(AssertUnwindSafe(|| self.settle())).is_err() {
                self.waiting.clear();
            }
        }
    }

    fn take(&mut self, event: Event) {
        // whatever an event does to one document, the others live on
        let _ = catch_unwind(AssertUnwindSafe(|| self.handle(event)));
    }

    fn handle(&mut self, event: Event) {
        if !matches!(event, Event::Change(..) | Event::Checked(..)) {
            self.read_drafts();
        }
        match event {
            Event::Start(client, folders, options) => {
                if let Some(options) = options {
                    self.settings = Settings::of(&options);
                }
                self.remote.watch_parent(client.process);
                let folders = folders.iter().map(|f| self.snapshot.path_of(f)).collect();
                self.session = Arc::new(Session {
                    client: *client,
                    policy: self.settings.policy.clone(),
                    duty: self.settings.duty.clone(),
                    folders,
                    memory: Arc::clone(&self.session.memory),
                });
            }
            Event::Ready => {
                self.ready = true;
                self.remote.ready(&self.session.client);
                self.search();
            }
            Event::Open(uri, version, text) => self.open(uri, version, text),
            Event::Change(uri, version, changes) => self.change(&uri, version, changes),
            Event::Close(uri) => self.close(&uri),
            Event::Touched(uris) => {
                self.snapshot.forget();
                for uri in uris {
                    let path = self.snapshot.path_of(&uri);
                    self.touch(&path);
                }
                self.search();
            }
            Event::Folders(added, removed) => self.folders(&added, &removed),
            Event::Settings(Some(sent)) => self.set(Settings::of(&sent)),
            Event::Settings(None) => self.remote.fetch_settings(&self.session.client),
            Event::Ask(uri, need, work) => self.ask(uri, need, work),
            Event::AskAll(work) => {
                let (snapshot, session) = (self.snapshot.clone(), Arc::clone(&self.session));
                self.pool.first(move || work(&snapshot, &session));
            }
            Event::Checked(path, stamp, checked) => self.accept(&path, stamp, *checked),
            Event::Found(specs) => self.found(specs),
            Event::Stop => {
                let buffers = Arc::clone(&self.snapshot.buffers);
                self.roots
                    .retain(|path, root| root.is_fresh() || buffers.contains_key(path));
                self.remote.step(0);
            }
        }
    }

    fn put(&mut self, path: &Path, uri: &Url, version: i32, tree: Tree) {
        let buffer = Buffer {
            uri: uri.clone(),
            version,
            tree: Arc::new(tree),
        };
        Arc::make_mut(&mut self.snapshot.buffers).insert(path.to_owned(), buffer);
        self.touch(path);
    }

    /// The spec at a path, from now on checked.
    fn root(&mut self, path: PathBuf) -> &mut Root {
        self.stamp += 1;
        let wanted = self.stamp;
        self.roots.entry(path).or_insert_with(|| Root {
            wanted,
            ..Root::default()
        })
    }

    fn open(&mut self, uri: Url, version: i32, text: String) {
        self.snapshot.forget();
        let path = self.snapshot.path_of(&uri);
        self.paths.insert(uri.clone(), path.clone());
        self.root(path.clone());
        self.latest = Some(path.clone());
        self.put(&path, &uri, version, parse(text));
    }

    /// Edits are made at once, and read when somebody wants to know: fifty typed together cost fifty
    /// replacements of text and one reading.
    fn change(&mut self, uri: &Url, version: i32, changes: Vec<TextDocumentContentChangeEvent>) {
        let Some(path) = self.paths.get(uri) else {
            return;
        };
        let Some(buffer) = self.snapshot.buffers.get(path) else {
            return;
        };
        let text = self
            .drafts
            .get(uri)
            .map_or(&buffer.tree.text, |(_, text)| text);
        let text = edited(text, changes, self.session.client.unit);
        self.drafts.insert(uri.clone(), (version, text));
        // what is on its way is stale already
        let path = path.clone();
        self.latest = Some(path.clone());
        self.touch(&path);
    }

    fn read_drafts(&mut self) {
        for (uri, (version, text)) in std::mem::take(&mut self.drafts) {
            let Some(path) = self.paths.get(&uri).cloned() else {
                continue;
            };
            let Some(buffer) = self.snapshot.buffers.get(&path) else {
                continue;
            };
            let tree = buffer.tree.reparse(text);
            self.put(&path, &uri, version, tree);
        }
    }

    fn close(&mut self, uri: &Url) {
        let Some(path) = self.paths.remove(uri) else {
            return;
        };
        Arc::make_mut(&mut self.snapshot.buffers).remove(&path);
        if self.roots.get(&path).is_some_and(|r| !r.in_workspace) {
            self.roots.remove(&path);
        }
        // those that use it read the disk again
        self.touch(&path);
        self.published.remove(&path);
        self.send(uri.clone(), Vec::new(), None);
    }

    /// Something at this path is new: whoever reads it is checked again.
    fn touch(&mut self, path: &Path) {
        for (own, root) in &mut self.roots {
            if own == path || root.reads(path) {
                self.stamp += 1;
                root.wanted = self.stamp;
            } else if root.running.is_some() {
                root.meanwhile.push(path.to_owned());
            }
        }
    }

    fn folders(&mut self, added: &[Url], removed: &[Url]) {
        let path = |u: &Url| self.snapshot.path_of(u);
        let gone: Vec<PathBuf> = removed.iter().map(path).collect();
        let mut folders: Vec<PathBuf> = self
            .session
            .folders
            .iter()
            .filter(|f| !gone.contains(f))
            .cloned()
            .collect();
        folders.extend(added.iter().map(path));
        self.session = Arc::new(Session {
            folders,
            ..(*self.session).clone()
        });
        self.restart();
    }

    fn set(&mut self, settings: Settings) {
        if settings == self.settings {
            return;
        }
        self.settings = settings;
        self.session = Arc::new(Session {
            policy: self.settings.policy.clone(),
            duty: self.settings.duty.clone(),
            ..(*self.session).clone()
        });
        self.restart();
        self.rippled = true;
    }

    /// Everything found so far was found under other settings.
    fn restart(&mut self) {
        for root in self.roots.values_mut() {
            self.stamp += 1;
            root.wanted = self.stamp;
            root.result = None;
        }
        self.search();
    }

    /// Look for the specs of the workspace, if they are wanted.
    fn search(&mut self) {
        if !self.ready {
            return;
        }
        if !self.settings.workspace {
            return self.found(Vec::new());
        }
        let (session, snapshot, events) = (
            Arc::clone(&self.session),
            self.snapshot.clone(),
            self.events.clone(),
        );
        self.pool.then(move || {
            let specs = session
                .specs()
                .iter()
                .map(|p| snapshot.resolve(p))
                .collect();
            // the owner is gone only when the process ends
            let _ = events.send(Event::Found(specs));
        });
    }

    fn found(&mut self, specs: Vec<PathBuf>) {
        let before = self.roots.len();
        for root in self.roots.values_mut() {
            root.in_workspace = false;
        }
        for path in specs {
            self.root(path).in_workspace = true;
        }
        let buffers = Arc::clone(&self.snapshot.buffers);
        self.roots
            .retain(|path, root| root.in_workspace || buffers.contains_key(path));
        let more = self.roots.len().saturating_sub(before);
        if more > 0 {
            self.remote.begin(&self.session.client, more);
        }
    }

    fn ask(&mut self, uri: Url, need: Need, work: Work) {
        let path = self
            .paths
            .get(&uri)
            .cloned()
            .unwrap_or_else(|| self.snapshot.path_of(&uri));
        let buffer = self.snapshot.buffers.get(&path);
        let waits = match (need, buffer) {
            (_, None) | (Need::Text, _) => false,
            (Need::Check, _) => true,
            (Need::CheckAt(at), Some(buffer)) => {
                let offset =
                    convert::offset(buffer.tree.line_index(), at, self.session.client.unit);
                needs_check(&buffer.tree, offset)
            }
        };
        match buffer.map(|b| b.version) {
            Some(version) if waits && !self.is_settled(&path) => self.waiting.push(Waiting {
                path,
                version,
                uri,
                work,
            }),
            _ => self.answer(uri, path, work),
        }
    }

    /// Whether everything that reads a document has been checked since it last changed.
    fn is_settled(&self, path: &Path) -> bool {
        self.roots
            .iter()
            .filter(|(own, root)| {
                *own == path
                    || root
                        .result
                        .as_ref()
                        .is_some_and(|r| r.seen.contains_key(path))
            })
            .all(|(_, root)| root.is_fresh())
    }

    fn answer(&self, uri: Url, path: PathBuf, work: Work) {
        let tree = match self.snapshot.tree(&path) {
            Ok(tree) => tree,
            Err(why) => {
                return work(Err(jsonrpc::Error {
                    message: format!("{uri}: {why}").into(),
                    ..jsonrpc::Error::invalid_params("")
                }));
            }
        };
        let view = self.view(uri, path, tree);
        self.pool.first(move || work(Ok(view)));
    }

    /// A document as it is now.
    fn view(&self, uri: Url, path: PathBuf, tree: Arc<Tree>) -> View {
        let reading = |(own, root): &(&PathBuf, &Root)| {
            *own != &path
                && root.is_fresh()
                && root
                    .result
                    .as_ref()
                    .is_some_and(|r| r.seen.contains_key(&path))
        };
        let own = self
            .roots
            .get_key_value(&path)
            .filter(|(_, root)| root.is_fresh());
        let roots: Vec<(&PathBuf, &Root)> = own
            .into_iter()
            .chain(self.roots.iter().filter(reading))
            .collect();
        let outcomes = roots
            .iter()
            .filter_map(|(_, root)| root.result.as_ref()?.outcome.clone())
            .collect();
        View {
            snapshot: self.snapshot.clone(),
            session: Arc::clone(&self.session),
            hints: self.settings.hints.clone(),
            near: self
                .roots
                .iter()
                .filter(|(own, root)| **own == path || root.reads(&path))
                .map(|(own, _)| own.clone())
                .collect(),
            uri,
            path,
            tree,
            outcomes,
        }
    }

    fn accept(&mut self, path: &Path, stamp: u64, checked: Checked) {
        let Some(root) = self.roots.get_mut(path) else {
            return;
        };
        root.running = None;
        let meanwhile = std::mem::take(&mut root.meanwhile);
        // something it reads has changed since: the result is stale, and is dropped
        if stamp != root.wanted {
            return;
        }
        if meanwhile.iter().any(|p| checked.seen.contains_key(p)) {
            self.stamp += 1;
            root.wanted = self.stamp;
            return;
        }
        let checked = Arc::new(checked);
        let before = root.result.replace(Arc::clone(&checked));
        root.settled = Some(stamp);
        let mut files: Vec<PathBuf> = checked.pages.keys().cloned().collect();
        files.extend(
            before
                .iter()
                .flat_map(|b| b.pages.keys())
                .filter(|p| !checked.pages.contains_key(*p))
                .cloned(),
        );
        files.push(path.to_owned());
        for file in files {
            self.publish(&file);
        }
        self.rippled |= self.latest.as_deref() != Some(path);
        self.remote
            .step(self.roots.values().filter(|r| !r.is_fresh()).count());
    }

    /// Publish what is known of a file, once all that read it have been checked.
    fn publish(&mut self, path: &Path) {
        let Ok(tree) = self.snapshot.tree(path) else {
            return self.clear(path);
        };
        let mut all: Vec<Diagnostic> = Vec::new();
        let own = self.roots.get(path);
        for root in own.into_iter().chain(
            self.roots
                .iter()
                .filter(|(p, _)| *p != path)
                .map(|(_, r)| r),
        ) {
            let Some(result) = &root.result else { continue };
            let Some(page) = result.pages.get(path) else {
                continue;
            };
            if !root.is_fresh() {
                return;
            }
            if Arc::ptr_eq(&page.tree, &tree) || page.tree.text == tree.text {
                for one in &page.diagnostics {
                    if !all.contains(one) {
                        all.push(one.clone());
                    }
                }
            }
        }
        let version = self.snapshot.buffers.get(path).map(|b| b.version);
        let known = self.published.get(path);
        let same = match known {
            Some((v, diagnostics)) => *v == version && *diagnostics == all,
            // a file that is not open, and of which nothing was ever said
            None => version.is_none() && all.is_empty(),
        };
        if same {
            return;
        }
        if let Some(uri) = self.snapshot.uri_of(path) {
            self.send(uri, all.clone(), version);
        }
        self.published.insert(path.to_owned(), (version, all));
    }

    fn clear(&mut self, path: &Path) {
        if let Some((_, said)) = self.published.remove(path)
            && !said.is_empty()
            && let Some(uri) = self.snapshot.uri_of(path)
        {
            self.send(uri, Vec::new(), None);
        }
    }

    fn send(&self, uri: Url, diagnostics: Vec<Diagnostic>, version: Option<i32>) {
        if self.outbox.is_stuck() {
            return self.remote.client_is_gone();
        }
        self.outbox.notify(
            "textDocument/publishDiagnostics",
            &PublishDiagnosticsParams {
                uri,
                diagnostics,
                version,
            },
        );
    }

    /// Begin what is due, answer what waited, clear what no check speaks of any more.
    fn settle(&mut self) {
        self.read_drafts();
        let latest = self.latest.clone();
        let mut due: Vec<PathBuf> = Vec::new();
        for (path, root) in &mut self.roots {
            if root.running.is_none() && !root.is_fresh() {
                root.running = Some(root.wanted);
                due.push(path.clone());
            }
        }
        due.sort_by_key(|path| Some(path) != latest.as_ref());
        for path in due {
            self.begin(path);
        }
        for one in std::mem::take(&mut self.waiting) {
            match self.snapshot.buffers.get(&one.path).map(|b| b.version) {
                Some(version) if version == one.version && !self.is_settled(&one.path) => {
                    self.waiting.push(one)
                }
                Some(version) if version == one.version => self.answer(one.uri, one.path, one.work),
                _ => (one.work)(Err(content_modified())),
            }
        }
        if self.roots.values().all(Root::is_fresh) {
            let spoken: Vec<PathBuf> = self.published.keys().cloned().collect();
            for path in spoken {
                let heard = self.roots.values().any(|r| {
                    r.result
                        .as_ref()
                        .is_some_and(|r| r.pages.contains_key(&path))
                });
                if !heard && !self.snapshot.buffers.contains_key(&path) {
                    self.clear(&path);
                }
            }
            if std::mem::take(&mut self.rippled) {
                self.remote.refresh(&self.session.client);
            }
        }
    }

    fn begin(&self, path: PathBuf) {
        let Some(root) = self.roots.get(&path) else {
            return;
        };
        let (stamp, before) = (root.wanted, root.result.clone());
        let (session, snapshot, events) = (
            Arc::clone(&self.session),
            self.snapshot.clone(),
            self.events.clone(),
        );
        self.pool.then(move || {
            let checked = session.check(&snapshot, &path, before.as_deref());
            // the owner is gone only when the process ends
            let _ = events.send(Event::Checked(path, stamp, Box::new(checked)));
        });
    }
}

/// The question was about a text that has changed since.
fn content_modified() -> jsonrpc::Error {
    jsonrpc::Error {
        code: jsonrpc::ErrorCode::ContentModified,
        message: "the text has changed since".into(),
        data: None,
    }
}

/// A text after some edits, each of which counts on those before it.
fn edited(
    text: &Arc<str>,
    changes: Vec<TextDocumentContentChangeEvent>,
    unit: ColumnUnit,
) -> Arc<str> {
    let mut text = Arc::clone(text);
    for change in changes {
        text = match change.range {
            None => change.text.into(),
            Some(range) => {
                let span = convert::span(&LineIndex::new(Arc::clone(&text)), range, unit);
                let (head, tail) = (
                    text.get(..span.start).unwrap_or(""),
                    text.get(span.end..).unwrap_or(""),
                );
                [head, &change.text, tail].concat().into()
            }
        };
    }
    text
}
