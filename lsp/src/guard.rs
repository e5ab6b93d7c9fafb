//! Stands between the wire and the protocol service and keeps the promises that the service does not:
//! handlers begin in the order of arrival, `exit` ends the process, null parameters are none, and a
//! panic is an answer. Must not know what any method does.

use std::any::Any;
use std::future::{Future, ready};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::pin::Pin;
use std::sync::mpsc::Sender;
use std::task::{Context, Poll, Waker};

use futures_util::FutureExt;
use serde_json::Value;
use tower_lsp::jsonrpc::{Error, Id, Request, Response};
use tower_service::Service;

/// What a call comes to.
pub(crate) type Answer<E> = Pin<Box<dyn Future<Output = Result<Option<Response>, E>> + Send>>;

/// A service, guarded.
#[derive(Debug)]
pub(crate) struct Guard<S> {
    inner: S,
    shut_down: bool,
    exit: Sender<u8>,
}

impl<S> Guard<S> {
    /// Guard a service; `exit` is told the status with which the process is to end.
    pub(crate) fn new(inner: S, exit: Sender<u8>) -> Self {
        Self {
            inner,
            shut_down: false,
            exit,
        }
    }

    /// The status of a process that ends now: 0 after a shutdown, else 1, as the protocol asks.
    pub(crate) fn status(&self) -> u8 {
        u8::from(!self.shut_down)
    }
}

impl<S, E> Service<Request> for Guard<S>
where
    S: Service<Request, Response = Option<Response>, Error = E, Future = Answer<E>>,
    E: Send + 'static,
{
    type Response = Option<Response>;
    type Error = E;
    type Future = Answer<E>;

    fn poll_ready(&mut self, cx: &mut Context<'_>) -> Poll<Result<(), E>> {
        self.inner.poll_ready(cx)
    }

    fn call(&mut self, request: Request) -> Answer<E> {
        let (method, id, params) = request.into_parts();
        if method == "exit" {
            // nobody listens only if the process is ending already
            let _ = self.exit.send(self.status());
            return Box::pin(ready(Ok(None)));
        }
        let empty = |p: &Value| {
            p.is_null() || (method == "shutdown" && p.as_object().is_some_and(|o| o.is_empty()))
        };
        let params = params.filter(|p| !empty(p));
        self.shut_down |= method == "shutdown";
        let mut call = Request::build(method);
        if let Some(params) = params {
            call = call.params(params);
        }
        if let Some(id) = id.clone() {
            call = call.id(id);
        }
        let inner = catch_unwind(AssertUnwindSafe(|| self.inner.call(call.finish())));
        let mut future = match inner {
            Ok(future) => AssertUnwindSafe(future).catch_unwind(),
            Err(panic) => return Box::pin(ready(answer(Err(panic), id))),
        };
        // the first poll hands the message to the owner of the documents: here, in order of arrival
        match Pin::new(&mut future).poll(&mut Context::from_waker(Waker::noop())) {
            Poll::Ready(done) => Box::pin(ready(answer(done, id))),
            Poll::Pending => Box::pin(future.map(|done| answer(done, id))),
        }
    }
}

type Done<E> = Result<Result<Option<Response>, E>, Box<dyn Any + Send>>;

fn answer<E>(done: Done<E>, id: Option<Id>) -> Result<Option<Response>, E> {
    match done {
        Ok(result) => result,
        Err(_) => Ok(id.map(|id| Response::from_error(id, Error::internal_error()))),
    }
}
