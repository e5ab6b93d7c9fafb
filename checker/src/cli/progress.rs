//! How far a run has come, on standard error, and only where somebody looks.
//! Must not know what is being done.

use std::io::{self, IsTerminal, Write};
use std::sync::Mutex;
use std::time::{Duration, Instant};

/// A run shorter than this shows nothing.
const SOON: Duration = Duration::from_millis(300);
/// Time between two lines.
const EVERY: Duration = Duration::from_millis(100);

/// A count towards a total.
pub(crate) struct Progress<W: Write> {
    total: usize,
    state: Mutex<State<W>>,
}

struct State<W> {
    done: usize,
    /// When the next line is due; none where nobody looks.
    due: Option<Instant>,
    /// A line is drawn that must be wiped.
    drawn: bool,
    to: W,
}

impl Progress<io::Stderr> {
    /// On standard error, drawn only if that is a terminal.
    pub(crate) fn new(total: usize) -> Self {
        let errors = io::stderr();
        let looked_at = errors.is_terminal();
        Self::to(errors, total, looked_at, SOON)
    }
}

impl<W: Write> Progress<W> {
    fn to(to: W, total: usize, looked_at: bool, soon: Duration) -> Self {
        let state = State {
            done: 0,
            due: looked_at.then(|| Instant::now() + soon),
            drawn: false,
            to,
        };
        Self {
            total,
            state: Mutex::new(state),
        }
    }

    /// One more is done.
    pub(crate) fn step(&self) {
        let Ok(mut state) = self.state.lock() else {
            return;
        };
        state.done += 1;
        let now = Instant::now();
        if state.due.is_some_and(|due| due <= now) {
            state.due = Some(now + EVERY);
            state.drawn = true;
            let (done, total) = (state.done, self.total);
            // a terminal that is gone is no reason to stop
            let _ = write!(state.to, "\r{done} of {total} files").and_then(|()| state.to.flush());
        }
    }
}

impl<W: Write> Drop for Progress<W> {
    fn drop(&mut self) {
        if let Ok(state) = self.state.get_mut()
            && state.drawn
        {
            let _ = write!(state.to, "\r\u{1b}[K").and_then(|()| state.to.flush());
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn drawn(looked_at: bool) -> String {
        let mut bytes = Vec::new();
        let progress = Progress::to(&mut bytes, 2, looked_at, Duration::ZERO);
        progress.step();
        progress.step();
        drop(progress);
        String::from_utf8(bytes).unwrap()
    }

    #[test]
    fn nothing_is_drawn_where_nobody_looks() {
        assert_eq!(drawn(false), "");
        let seen = drawn(true);
        assert!(
            seen.starts_with("\r1 of 2 files") && seen.ends_with("\r\u{1b}[K"),
            "{seen:?}"
        );
    }
}
