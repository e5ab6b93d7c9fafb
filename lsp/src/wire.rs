//! Messages on standard input and output: frames in, frames out, and what to do with broken ones.
//! Must not know what any message means.

use std::io::{self, BufRead, Read, Write};
use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::mpsc::{Receiver, Sender, channel};
use std::thread;
use std::time::{Duration, Instant};

use serde::Serialize;
use serde_json::Value;
use tower_lsp::jsonrpc::{Error, Id, Request, Response};

/// Largest message that is read, in bytes; a longer one is passed over.
const MOST_BYTES: usize = 64 << 20;
/// Longest header line.
const LONGEST_HEADER: u64 = 4096;
/// What may wait for a client that does not read before it is taken for dead, in bytes.
const MOST_WAITING: usize = 64 << 20;
/// How long a process that ends waits for its last messages to go out.
const LAST_WORDS: Duration = Duration::from_millis(500);

/// What came in.
#[derive(Debug)]
pub(crate) enum Incoming {
    /// A request or a notification.
    Call(Request),
    /// The answer to a request of ours.
    Answer(Response),
    /// Something that is no message; this is what to say to it.
    Broken(Response),
}

/// The next message; `None` at the end of the stream. Bytes that are no frame are passed over up to
/// the next header that gives a length.
///
/// # Errors
/// When the stream cannot be read.
pub(crate) fn read(from: &mut impl BufRead) -> io::Result<Option<Incoming>> {
    let Some(length) = header(from)? else {
        return Ok(None);
    };
    let Some(length) = length else {
        return Ok(Some(broken(Error::parse_error())));
    };
    if length > MOST_BYTES {
        let passed = io::copy(&mut from.take(length as u64), &mut io::sink())?;
        return Ok((passed == length as u64).then(|| broken(Error::parse_error())));
    }
    let mut body = vec![0; length];
    match from.read_exact(&mut body) {
        Ok(()) => Ok(Some(message(&body))),
        Err(e) if e.kind() == io::ErrorKind::UnexpectedEof => Ok(None),
        Err(e) => Err(e),
    }
}

/// The length that a header gives: outer `None` at the end of the stream, inner where it gives none.
fn header(from: &mut impl BufRead) -> io::Result<Option<Option<usize>>> {
    let mut length = None;
    let mut any = false;
    loop {
        let mut line = Vec::new();
        if from
            .by_ref()
            .take(LONGEST_HEADER)
            .read_until(b'\n', &mut line)?
            == 0
        {
            return Ok(None);
        }
        let text = String::from_utf8_lossy(&line);
        let text = text.trim_end();
        if text.is_empty() {
            // blank lines before a header are noise, after it they end it
            if any {
                return Ok(Some(length));
            }
            continue;
        }
        any = true;
        // what a broken message left may stand before the next header on one line
        let lower = text.to_ascii_lowercase();
        if let Some(at) = lower.rfind("content-length:") {
            length = lower
                .get(at + "content-length:".len()..)
                .and_then(|n| n.trim().parse().ok());
        }
    }
}

fn broken(error: Error) -> Incoming {
    Incoming::Broken(Response::from_error(Id::Null, error))
}

fn message(body: &[u8]) -> Incoming {
    if let Ok(request) = serde_json::from_slice::<Request>(body)
        && !request.method().is_empty()
    {
        return Incoming::Call(request);
    }
    if let Ok(response) = serde_json::from_slice::<Response>(body) {
        return Incoming::Answer(response);
    }
    match serde_json::from_slice::<Value>(body) {
        Err(_) => broken(Error::parse_error()),
        Ok(value) => {
            let id = value
                .get("id")
                .and_then(|id| serde_json::from_value::<Id>(id.clone()).ok())
                .unwrap_or(Id::Null);
            Incoming::Broken(Response::from_error(id, Error::invalid_request()))
        }
    }
}

/// Where messages to the client go. Cloned freely; a message goes out whole, in the order sent.
#[derive(Clone, Debug)]
pub(crate) struct Outbox {
    queue: Sender<Vec<u8>>,
    waiting: Arc<AtomicUsize>,
}

impl Outbox {
    /// An outbox, and what writes it.
    pub(crate) fn new() -> (Self, Writer) {
        let (queue, frames) = channel();
        let waiting = Arc::new(AtomicUsize::new(0));
        (
            Self {
                queue,
                waiting: Arc::clone(&waiting),
            },
            Writer { frames, waiting },
        )
    }

    /// Send a message. Never waits.
    pub(crate) fn send(&self, message: &impl Serialize) {
        let Ok(body) = serde_json::to_vec(message) else {
            return;
        };
        let mut frame = format!("Content-Length: {}\r\n\r\n", body.len()).into_bytes();
        frame.extend(body);
        self.waiting.fetch_add(frame.len(), Ordering::Relaxed);
        // a closed queue means that the client is gone, and the process about to end: nothing goes out
        if self.queue.send(frame).is_err() {
            self.waiting.store(0, Ordering::Relaxed);
        }
    }

    /// Send a notification.
    pub(crate) fn notify(&self, method: &'static str, params: &impl Serialize) {
        #[derive(Serialize)]
        struct Notification<'a, P> {
            jsonrpc: &'static str,
            method: &'static str,
            params: &'a P,
        }
        self.send(&Notification {
            jsonrpc: "2.0",
            method,
            params,
        });
    }

    /// Give what was sent a moment to go out.
    pub(crate) fn drain(&self) {
        let until = Instant::now() + LAST_WORDS;
        while self.waiting.load(Ordering::Relaxed) > 0 && Instant::now() < until {
            thread::sleep(Duration::from_millis(1));
        }
    }

    /// Whether the client has stopped reading.
    pub(crate) fn is_stuck(&self) -> bool {
        self.waiting.load(Ordering::Relaxed) > MOST_WAITING
    }
}

/// The end of an outbox that writes.
#[derive(Debug)]
pub(crate) struct Writer {
    frames: Receiver<Vec<u8>>,
    waiting: Arc<AtomicUsize>,
}

impl Writer {
    /// Write until the last outbox is gone or the client is.
    ///
    /// # Errors
    /// When the client no longer reads.
    pub(crate) fn run(self, to: impl Write) -> io::Result<()> {
        let Self { frames, waiting } = self;
        let ended = write_all(&frames, &waiting, to);
        // whoever waits for what is left waits in vain
        drop(frames);
        waiting.store(0, Ordering::Relaxed);
        ended
    }
}

fn write_all(
    frames: &Receiver<Vec<u8>>,
    waiting: &AtomicUsize,
    mut to: impl Write,
) -> io::Result<()> {
    while let Ok(mut frame) = frames.recv() {
        while let Ok(more) = frames.try_recv() {
            frame.extend(more);
        }
        to.write_all(&frame)?;
        to.flush()?;
        waiting.fetch_sub(frame.len(), Ordering::Relaxed);
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn all(bytes: &[u8]) -> Vec<String> {
        let mut from = bytes;
        let mut out = Vec::new();
        while let Some(one) = read(&mut from).unwrap() {
            out.push(match one {
                Incoming::Call(r) => r.method().to_owned(),
                Incoming::Answer(r) => format!("answer {}", r.id()),
                Incoming::Broken(r) => format!("broken {}", r.error().unwrap().code.code()),
            });
        }
        out
    }

    fn frame(body: &str) -> String {
        format!("Content-Length: {}\r\n\r\n{body}", body.len())
    }

    /// Codes are those of the JSON-RPC 2.0 specification, section 5.1.
    #[test]
    fn a_broken_message_costs_itself_only() {
        let good = frame(r#"{"jsonrpc":"2.0","method":"a"}"#);
        for (bad, said) in [
            (frame("{"), "broken -32700"),
            (frame("[1]"), "broken -32600"),
            (frame(r#"{"jsonrpc":"2.0"}"#), "broken -32600"),
            (frame(""), "broken -32700"),
            ("Content-Length: x\r\n\r\n".to_owned(), "broken -32700"),
            ("Content-Type: y\r\n\r\n".to_owned(), "broken -32700"),
            (
                frame(r#"{"jsonrpc":"2.0","id":7,"result":null}"#),
                "answer 7",
            ),
            (frame(&"[".repeat(9999)), "broken -32700"),
        ] {
            assert_eq!(
                all(format!("{good}{bad}{good}").as_bytes()),
                ["a", said, "a"],
                "{bad:.40}"
            );
        }
        assert_eq!(all(format!("noise\r\n{good}").as_bytes()), ["a"]);
        assert_eq!(all(b"Content-Length: 99\r\n\r\n{"), Vec::<String>::new());
    }

    /// A client that is gone: every write fails.
    struct Gone;

    impl Write for Gone {
        fn write(&mut self, _: &[u8]) -> io::Result<usize> {
            Err(io::ErrorKind::BrokenPipe.into())
        }
        fn flush(&mut self) -> io::Result<()> {
            Ok(())
        }
    }

    #[test]
    fn nobody_waits_for_a_client_that_is_gone() {
        let (outbox, writer) = Outbox::new();
        outbox.send(&1);
        assert!(writer.run(Gone).is_err());
        outbox.send(&2);
        let began = Instant::now();
        outbox.drain();
        assert!(began.elapsed() < LAST_WORDS / 2);
    }
}
