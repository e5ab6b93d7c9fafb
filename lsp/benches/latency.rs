//! How long an editor waits: keystroke to findings, hover, a burst, the start, each beside a server that
//! does nothing, in the same run. `cargo bench -p derate-lsp`.
//!
//! Absolute times drift with the machine; compare the ratios.
#![allow(
    clippy::unwrap_used,
    clippy::print_stdout,
    reason = "a bench that cannot go on stops, and prints"
)]

use std::io::{BufRead, BufReader, BufWriter, Write};
use std::path::{Path, PathBuf};
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};
use std::time::{Duration, Instant};

use serde_json::{Value, json};

const EDITS: usize = 400;
const BURST: usize = 50;
const STARTS: usize = 9;

struct Server {
    child: Child,
    input: ChildStdin,
    output: BufReader<ChildStdout>,
    version: i64,
}

fn frame(message: &Value) -> Vec<u8> {
    let body = message.to_string();
    format!("Content-Length: {}\r\n\r\n{body}", body.len()).into_bytes()
}

fn receive(from: &mut impl BufRead) -> Option<Value> {
    let mut length = 0;
    loop {
        let mut line = String::new();
        if from.read_line(&mut line).ok()? == 0 {
            return None;
        }
        if let Some(n) = line.strip_prefix("Content-Length: ") {
            length = n.trim().parse().ok()?;
        }
        if line.trim().is_empty() {
            break;
        }
    }
    let mut body = vec![0; length];
    from.read_exact(&mut body).ok()?;
    serde_json::from_slice(&body).ok()
}

impl Server {
    fn start(mut command: Command, root: &Path, files: &[(String, String)]) -> Self {
        let mut child = command
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .spawn()
            .unwrap();
        let (input, output) = (
            child.stdin.take().unwrap(),
            BufReader::new(child.stdout.take().unwrap()),
        );
        let mut server = Self {
            child,
            input,
            output,
            version: 1,
        };
        server.send(&json!({"jsonrpc": "2.0", "id": 0, "method": "initialize", "params": {"capabilities": {}, "rootUri": format!("file://{}", root.display())}}));
        server.until(|m| m["id"] == 0);
        server.send(&json!({"jsonrpc": "2.0", "method": "initialized", "params": {}}));
        for (uri, text) in files {
            server.send(&json!({"jsonrpc": "2.0", "method": "textDocument/didOpen", "params": {"textDocument": {"uri": uri, "languageId": "ampspec", "version": 1, "text": text}}}));
        }
        let last = &files.last().unwrap().0;
        server.until(|m| m["params"]["uri"] == *last);
        server
    }

    fn send(&mut self, message: &Value) {
        self.input.write_all(&frame(message)).unwrap();
    }

    fn until(&mut self, wanted: impl Fn(&Value) -> bool) {
        while let Some(message) = receive(&mut self.output) {
            if wanted(&message) {
                return;
            }
        }
    }

    /// The next edit of a document: a digit typed, or taken away again.
    fn edit(&mut self, uri: &str, line: usize, column: usize) -> Vec<u8> {
        self.version += 1;
        let typed = self.version % 2 == 0;
        let end = if typed { column } else { column + 1 };
        let range = json!({"start": {"line": line, "character": column}, "end": {"line": line, "character": end}});
        frame(
            &json!({"jsonrpc": "2.0", "method": "textDocument/didChange", "params": {"textDocument": {"uri": uri, "version": self.version}, "contentChanges": [{"range": range, "text": if typed { "2" } else { "" }}]}}),
        )
    }

    fn settled(&mut self, uri: &str) {
        let version = self.version;
        self.until(|m| {
            m["params"]["uri"] == *uri
                && m["params"]["version"]
                    .as_i64()
                    .is_some_and(|v| v >= version)
        });
    }

    fn memory_mib(&self) -> f64 {
        let status = std::fs::read_to_string(format!("/proc/{}/status", self.child.id()))
            .unwrap_or_default();
        let line = status
            .lines()
            .find_map(|l| l.strip_prefix("VmRSS:"))
            .unwrap_or("0");
        line.trim()
            .trim_end_matches(" kB")
            .parse::<f64>()
            .unwrap_or(0.0)
            / 1024.0
    }
}

impl Drop for Server {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

/// Answers everything at once with nothing: what the pipes and this client cost by themselves.
fn null() {
    let (mut input, mut output) = (
        BufReader::new(std::io::stdin()),
        BufWriter::new(std::io::stdout()),
    );
    while let Some(message) = receive(&mut input) {
        let document = &message["params"]["textDocument"];
        let answer = match message.get("id") {
            Some(id) => json!({"jsonrpc": "2.0", "id": id, "result": {"capabilities": {}}}),
            None if document.is_object() => {
                json!({"jsonrpc": "2.0", "method": "textDocument/publishDiagnostics", "params": {"uri": document["uri"], "version": document["version"], "diagnostics": []}})
            }
            None => continue,
        };
        output.write_all(&frame(&answer)).unwrap();
        output.flush().unwrap();
    }
}

fn percentile(times: &mut [Duration], share: f64) -> f64 {
    times.sort();
    let at = ((times.len() - 1) as f64 * share).round() as usize;
    times[at].as_secs_f64() * 1e3
}

struct Figures {
    p50: f64,
    p99: f64,
    hover: f64,
    burst: f64,
    start: f64,
    memory: f64,
}

fn measure(command: &dyn Fn() -> Command, root: &Path, files: &[(String, String)]) -> Figures {
    let mut starts: Vec<Duration> = (0..STARTS)
        .map(|_| {
            let began = Instant::now();
            drop(Server::start(command(), root, files));
            began.elapsed()
        })
        .collect();
    let mut server = Server::start(command(), root, files);
    let (uri, text) = files.last().unwrap();
    let line = text
        .lines()
        .position(|l| l.trim_start().starts_with("emitter "))
        .unwrap();
    let column = text.lines().nth(line).unwrap().find("0R22").unwrap() + 4;
    let mut edits = Vec::with_capacity(EDITS);
    let mut hovers = Vec::with_capacity(EDITS);
    for at in 0..2 * EDITS {
        let mut bytes = server.edit(uri, line, column);
        let hover = at >= EDITS;
        if hover {
            bytes.extend(frame(&json!({"jsonrpc": "2.0", "id": at, "method": "textDocument/hover", "params": {"textDocument": {"uri": uri}, "position": {"line": line, "character": 5}}})));
        }
        let began = Instant::now();
        server.input.write_all(&bytes).unwrap();
        if hover {
            server.until(|m| m["id"] == at);
            hovers.push(began.elapsed());
            std::thread::sleep(Duration::from_millis(2));
        } else {
            server.settled(uri);
            edits.push(began.elapsed());
        }
    }
    let mut bursts: Vec<Duration> = (0..9)
        .map(|_| {
            let bytes: Vec<u8> = (0..BURST)
                .flat_map(|_| server.edit(uri, line, column))
                .collect();
            let began = Instant::now();
            server.input.write_all(&bytes).unwrap();
            server.settled(uri);
            began.elapsed()
        })
        .collect();
    Figures {
        p50: percentile(&mut edits, 0.5),
        p99: percentile(&mut edits, 0.99),
        hover: percentile(&mut hovers, 0.5),
        burst: percentile(&mut bursts, 0.5),
        start: percentile(&mut starts, 0.5),
        memory: server.memory_mib(),
    }
}

fn main() {
    if std::env::args().any(|a| a == "--null") {
        return null();
    }
    let kits: PathBuf = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("../tests/kits")
        .canonicalize()
        .unwrap();
    let kit = std::fs::read_to_string(kits.join("tern60.ampspec")).unwrap();
    let uri = |n: usize| format!("file://{}/bench{n}.ampspec", kits.display());
    let one = vec![(uri(0), kit.clone())];
    let copies = 2000 / kit.lines().count() + 1;
    let many: Vec<(String, String)> = (0..copies).map(|n| (uri(n), kit.clone())).collect();
    let own = std::env::current_exe().unwrap();
    let nothing = || {
        let mut command = Command::new(&own);
        command.arg("--null");
        command
    };
    let served = || Command::new(env!("CARGO_BIN_EXE_derate-lsp"));
    println!(
        "{:<26} {:>9} {:>9} {:>9} {:>9} {:>9} {:>9}",
        "ms", "edit p50", "p99", "hover p50", "burst 50", "start", "MiB"
    );
    let row = |name: &str, f: &Figures| {
        println!(
            "{name:<26} {:>9.3} {:>9.3} {:>9.3} {:>9.2} {:>9.1} {:>9.1}",
            f.p50, f.p99, f.hover, f.burst, f.start, f.memory
        )
    };
    let floor = measure(&nothing, &kits, &one);
    row("null", &floor);
    for (name, files) in [("one kit", &one), ("2,000 lines of kits", &many)] {
        let f = measure(&served, &kits, files);
        row(name, &f);
        println!(
            "{:<26} {:>8.1}x {:>8.1}x {:>8.1}x {:>8.1}x {:>8.1}x",
            "  by the null server's p50",
            f.p50 / floor.p50,
            f.p99 / floor.p50,
            f.hover / floor.hover,
            f.burst / f.p50,
            f.start / floor.start
        );
    }
}
