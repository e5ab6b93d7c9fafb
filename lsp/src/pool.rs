//! Threads that work on snapshots: questions of the user first, then checks.
//! Must not know what the work is.

use std::collections::VecDeque;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::{Arc, Condvar, Mutex, PoisonError};
use std::thread;

/// Stack of a worker, in bytes.
const STACK: usize = 8 << 20;
/// Most workers.
const MOST: usize = 4;

type Work = Box<dyn FnOnce() + Send>;

#[derive(Default)]
struct Queues {
    first: VecDeque<Work>,
    then: VecDeque<Work>,
}

/// A pool that lives as long as the process.
#[derive(Clone)]
pub(crate) struct Pool(Arc<(Mutex<Queues>, Condvar)>);

impl Pool {
    /// As many workers as processors, between two and four: an answer never waits for a check.
    pub(crate) fn new() -> Self {
        let pool = Self(Arc::new((Mutex::default(), Condvar::new())));
        let count = thread::available_parallelism()
            .map_or(2, usize::from)
            .clamp(2, MOST);
        for at in 0..count {
            let own = pool.clone();
            let only_first = at == 0;
            // without threads nothing is answered, which the client sees
            let _ = thread::Builder::new()
                .name(format!("worker {at}"))
                .stack_size(STACK)
                .spawn(move || own.work(only_first));
        }
        pool
    }

    fn work(&self, only_first: bool) {
        let (queues, ready) = &*self.0;
        loop {
            let mut held = queues.lock().unwrap_or_else(PoisonError::into_inner);
            let work = loop {
                let next = held.first.pop_front().or_else(|| {
                    if only_first {
                        None
                    } else {
                        held.then.pop_front()
                    }
                });
                match next {
                    Some(work) => break work,
                    None => held = ready.wait(held).unwrap_or_else(PoisonError::into_inner),
                }
            };
            drop(held);
            // a panic has dropped the reply, which whoever waits for it takes for an answer
            let _ = catch_unwind(AssertUnwindSafe(work));
        }
    }

    fn add(&self, put: impl FnOnce(&mut Queues)) {
        let (queues, ready) = &*self.0;
        put(&mut queues.lock().unwrap_or_else(PoisonError::into_inner));
        ready.notify_all();
    }

    /// Do this before any check.
    pub(crate) fn first(&self, work: impl FnOnce() + Send + 'static) {
        self.add(|q| q.first.push_back(Box::new(work)));
    }

    /// Do this when no question waits.
    pub(crate) fn then(&self, work: impl FnOnce() + Send + 'static) {
        self.add(|q| q.then.push_back(Box::new(work)));
    }
}
