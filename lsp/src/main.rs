//! The language server for ampspec files: starts its threads, and ends the process when the client
//! says so or is gone. Must not know any message.

mod answer;
mod capabilities;
mod check;
mod convert;
mod documents;
mod guard;
mod pool;
mod remote;
mod server;
mod snapshot;
mod wire;

use std::io::{self, BufReader};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::pin::Pin;
use std::process;
use std::sync::mpsc::{self, Sender};
use std::thread;

use futures_util::{FutureExt, Sink, StreamExt};
use tokio::runtime::{self, Handle};
use tower_lsp::jsonrpc::Response;
use tower_lsp::{ClientSocket, ExitedError, Loopback, LspService};
use tower_service::Service;

use documents::{Event, Owner};
use guard::{Answer, Guard};
use remote::Remote;
use server::Server;
use wire::{Incoming, Outbox};

/// Events that may wait for the owner before the reader waits too.
const MOST_EVENTS: usize = 1024;
/// Stack of the owner, in bytes.
const STACK: usize = 8 << 20;

fn main() {
    let status = serve().unwrap_or(1);
    // threads that wait for input never end by themselves
    process::exit(i32::from(status));
}

/// Serve until the end; the status of the process.
fn serve() -> io::Result<u8> {
    let (exit, exited) = mpsc::channel();
    let (events, queue) = mpsc::sync_channel::<Event>(MOST_EVENTS);
    let (outbox, writer) = Outbox::new();
    let runtime = runtime::Builder::new_current_thread().build()?;
    let mut client = None;
    let server = |c: tower_lsp::Client| {
        client = Some(c);
        Server::new(events.clone())
    };
    let (service, socket) = LspService::build(server)
        .custom_method("window/workDoneProgress/cancel", Server::stop)
        .custom_method("$/setTrace", Server::trace)
        .finish();
    let Some(client) = client else { return Ok(1) };
    let remote = Remote::new(
        client,
        runtime.handle().clone(),
        events.clone(),
        exit.clone(),
    );
    let owner_box = outbox.clone();
    thread::Builder::new()
        .name("owner".to_owned())
        .stack_size(STACK)
        .spawn(move || Owner::new(events, owner_box, remote).run(&queue))?;
    let writing = exit.clone();
    thread::Builder::new()
        .name("writer".to_owned())
        .spawn(move || {
            if writer.run(io::stdout()).is_err() {
                // the client no longer reads; nobody listens only if the process is ending already
                let _ = writing.send(1);
            }
        })?;
    let guard = Guard::new(service, exit.clone());
    let handle = runtime.handle().clone();
    let (requests, answers) = socket.split();
    let (reading, last) = (outbox.clone(), outbox.clone());
    thread::Builder::new()
        .name("reader".to_owned())
        .spawn(move || read(guard, answers, &handle, &reading, &exit))?;
    // requests of ours, and handlers that wait for their answer, run here
    thread::Builder::new()
        .name("requests".to_owned())
        .spawn(move || {
            runtime.block_on(requests.for_each(|request| {
                outbox.send(&request);
                std::future::ready(())
            }));
            runtime.block_on(std::future::pending::<()>());
        })?;
    let status = exited.recv().unwrap_or(1);
    last.drain();
    Ok(status)
}

type Requests = <ClientSocket as Loopback>::ResponseSink;

/// Read messages and begin them in order, until the end of input.
fn read(
    mut guard: Guard<LspService<Server>>,
    mut answers: Requests,
    runtime: &Handle,
    outbox: &Outbox,
    exit: &Sender<u8>,
) {
    let mut input = BufReader::with_capacity(1 << 16, io::stdin());
    while let Ok(Some(message)) = wire::read(&mut input) {
        match message {
            Incoming::Call(request) => begin(guard.call(request), runtime, outbox),
            Incoming::Answer(response) => {
                // an answer that nobody waits for any more makes the sink panic: it is passed over
                let _ = catch_unwind(AssertUnwindSafe(|| {
                    Pin::new(&mut answers).start_send(response)
                }));
            }
            Incoming::Broken(response) => outbox.send(&response),
        }
    }
    // the client is gone
    let _ = exit.send(guard.status());
}

/// Send the answer of a call: at once if it has one, else when it does.
fn begin(mut answer: Answer<ExitedError>, runtime: &Handle, outbox: &Outbox) {
    match (&mut answer).now_or_never() {
        Some(done) => reply(done, outbox),
        None => {
            let outbox = outbox.clone();
            runtime.spawn(async move { reply(answer.await, &outbox) });
        }
    }
}

fn reply(done: Result<Option<Response>, ExitedError>, outbox: &Outbox) {
    if let Ok(Some(response)) = done {
        outbox.send(&response);
    }
}
