//! A client over standard input and output: sends what it is told, keeps what comes back.
//! Must not know what the server is about.

use std::collections::HashMap;
use std::io::{BufRead, BufReader, Write};
use std::path::{Path, PathBuf};
use std::process::{Child, ChildStdin, Command, Stdio};
use std::sync::mpsc::{Receiver, RecvTimeoutError, channel};
use std::thread;
use std::time::{Duration, Instant};

use serde_json::{Value, json};

use crate::judge::Judge;

/// How long an answer may take on a busy machine.
const PATIENCE: Duration = Duration::from_secs(60);

pub(crate) struct Client {
    pub(crate) child: Child,
    pub(crate) input: Option<ChildStdin>,
    messages: Receiver<Value>,
    next: i64,
    pub(crate) diagnostics: HashMap<String, Value>,
    pub(crate) versions: HashMap<String, i64>,
    pub(crate) answers: HashMap<i64, Value>,
    pub(crate) notes: Vec<Value>,
    pub(crate) settings: Value,
    pub(crate) capabilities: Value,
    /// Fails the session where the server breaks the protocol.
    pub(crate) judge: Option<Judge>,
}

impl Client {
    pub(crate) fn spawn() -> Self {
        let mut child = Command::new(env!("CARGO_BIN_EXE_derate-lsp"))
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .unwrap();
        let mut output = BufReader::new(child.stdout.take().unwrap());
        let input = child.stdin.take();
        let (sender, messages) = channel();
        thread::spawn(move || {
            while let Some(message) = frame(&mut output) {
                if sender.send(message).is_err() {
                    break;
                }
            }
        });
        Self {
            child,
            input,
            messages,
            next: 0,
            diagnostics: HashMap::new(),
            versions: HashMap::new(),
            answers: HashMap::new(),
            notes: Vec::new(),
            settings: Value::Null,
            capabilities: Value::Null,
            judge: Some(Judge::default()),
        }
    }

    /// A client that has been through the first exchange. `encodings` are those it offers.
    pub(crate) fn start(root: &Path, encodings: &[&str], options: Value) -> Self {
        let mut client = Self::spawn();
        client.begin(initialize(root, encodings, options));
        client
    }

    /// The first exchange.
    pub(crate) fn begin(&mut self, params: Value) {
        let answer = self.ask("initialize", params);
        self.capabilities = answer["result"]["capabilities"].clone();
        assert!(self.capabilities.is_object(), "{answer}");
        self.tell("initialized", json!({}));
    }

    pub(crate) fn raw(&mut self, bytes: &[u8]) {
        let input = self.input.as_mut().unwrap();
        input.write_all(bytes).unwrap();
        input.flush().unwrap();
    }

    pub(crate) fn send(&mut self, message: &Value) {
        if let Some(judge) = &mut self.judge {
            judge.sent(message);
        }
        let body = message.to_string();
        self.raw(format!("Content-Length: {}\r\n\r\n{body}", body.len()).as_bytes());
    }

    pub(crate) fn tell(&mut self, method: &str, params: Value) {
        self.send(&json!({"jsonrpc": "2.0", "method": method, "params": params}));
    }

    pub(crate) fn request(&mut self, method: &str, params: Value) -> i64 {
        self.next += 1;
        self.send(&json!({"jsonrpc": "2.0", "id": self.next, "method": method, "params": params}));
        self.next
    }

    pub(crate) fn ask(&mut self, method: &str, params: Value) -> Value {
        let id = self.request(method, params);
        self.answer(id)
    }

    /// The result of a request, which must have one.
    pub(crate) fn get(&mut self, method: &str, params: Value) -> Value {
        let answer = self.ask(method, params);
        assert!(answer.get("error").is_none(), "{method}: {answer}");
        answer["result"].clone()
    }

    pub(crate) fn answer(&mut self, id: i64) -> Value {
        let until = Instant::now() + PATIENCE;
        loop {
            if let Some(answer) = self.answers.remove(&id) {
                return answer;
            }
            assert!(
                self.take(until.saturating_duration_since(Instant::now())),
                "no answer to {id}"
            );
        }
    }

    /// Take one message; whether there was one.
    pub(crate) fn take(&mut self, patience: Duration) -> bool {
        let message = match self.messages.recv_timeout(patience) {
            Ok(message) => message,
            Err(RecvTimeoutError::Timeout | RecvTimeoutError::Disconnected) => return false,
        };
        if let Some(judge) = &mut self.judge {
            judge.received(&message);
        }
        match (message["method"].as_str(), message.get("id")) {
            (Some("textDocument/publishDiagnostics"), None) => {
                let params = &message["params"];
                let uri = params["uri"].as_str().unwrap().to_owned();
                if let Some(version) = params["version"].as_i64() {
                    let before = self.versions.insert(uri.clone(), version);
                    assert!(
                        before.is_none_or(|b| b <= version),
                        "an older version came after a newer one"
                    );
                }
                self.diagnostics.insert(uri, params["diagnostics"].clone());
            }
            (Some(method), Some(id)) => {
                let result = match method {
                    "workspace/configuration" => json!([self.settings]),
                    _ => Value::Null,
                };
                let answer = json!({"jsonrpc": "2.0", "id": id, "result": result});
                self.notes.push(message.clone());
                self.send(&answer);
            }
            (Some(_), None) => self.notes.push(message),
            (None, _) => {
                let id = message["id"].as_i64().unwrap_or(-1);
                self.answers.insert(id, message);
            }
        }
        true
    }

    /// Wait until the findings of this version have come.
    pub(crate) fn settled(&mut self, uri: &str, version: i64) -> Value {
        let until = Instant::now() + PATIENCE;
        while self.versions.get(uri).is_none_or(|v| *v < version) {
            assert!(
                self.take(until.saturating_duration_since(Instant::now())),
                "no findings for version {version} of {uri}"
            );
        }
        self.diagnostics[uri].clone()
    }

    /// Wait until what is told of a file is as wanted.
    pub(crate) fn until(&mut self, uri: &str, wanted: impl Fn(&Value) -> bool) -> Value {
        let until = Instant::now() + PATIENCE;
        loop {
            if let Some(found) = self.diagnostics.get(uri).filter(|d| wanted(d)) {
                return found.clone();
            }
            assert!(
                self.take(until.saturating_duration_since(Instant::now())),
                "{uri} never came to be as wanted"
            );
        }
    }

    /// Take messages until something holds, or for so long.
    pub(crate) fn within(&mut self, patience: Duration, holds: impl Fn(&Self) -> bool) {
        let until = Instant::now() + patience;
        while !holds(self) && self.take(until.saturating_duration_since(Instant::now())) {}
    }

    pub(crate) fn open(&mut self, uri: &str, text: &str) {
        self.open_at(uri, 1, text);
    }

    pub(crate) fn open_at(&mut self, uri: &str, version: i64, text: &str) {
        self.tell("textDocument/didOpen", json!({"textDocument": {"uri": uri, "languageId": "ampspec", "version": version, "text": text}}));
    }

    pub(crate) fn change(&mut self, uri: &str, version: i64, changes: Value) {
        self.tell(
            "textDocument/didChange",
            json!({"textDocument": {"uri": uri, "version": version}, "contentChanges": changes}),
        );
    }

    /// The exit status after shutdown and exit.
    pub(crate) fn stop(mut self) -> i32 {
        let answer = self.ask("shutdown", Value::Null);
        assert!(
            answer["result"].is_null() && answer.get("error").is_none(),
            "{answer}"
        );
        self.tell("exit", Value::Null);
        self.wait()
    }

    /// The exit status of a server that ends by itself while its input stays open.
    pub(crate) fn wait(mut self) -> i32 {
        let until = Instant::now() + PATIENCE;
        loop {
            if let Some(status) = self.child.try_wait().unwrap() {
                return status.code().unwrap();
            }
            assert!(Instant::now() < until, "the server does not end");
            thread::sleep(Duration::from_millis(2));
        }
    }
}

impl Drop for Client {
    fn drop(&mut self) {
        // one that has ended cannot be killed
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

pub(crate) fn initialize(root: &Path, encodings: &[&str], options: Value) -> Value {
    json!({
        "processId": std::process::id(),
        "rootUri": uri(root),
        "workspaceFolders": [{"uri": uri(root), "name": "kits"}],
        "initializationOptions": options,
        "capabilities": {
            "general": {"positionEncodings": encodings},
            "textDocument": {
                "publishDiagnostics": {"relatedInformation": true, "versionSupport": true, "tagSupport": {"valueSet": [1, 2]}},
                "hover": {"contentFormat": ["markdown", "plaintext"]},
                "codeAction": {"codeActionLiteralSupport": {"codeActionKind": {"valueSet": ["quickfix"]}}},
                "documentSymbol": {"hierarchicalDocumentSymbolSupport": true},
                "completion": {"completionItem": {"snippetSupport": true}},
            },
            "workspace": {"configuration": true, "codeLens": {"refreshSupport": true}, "inlayHint": {"refreshSupport": true}, "workspaceEdit": {"documentChanges": true}, "didChangeWatchedFiles": {"dynamicRegistration": true}},
            "window": {"workDoneProgress": true},
        },
    })
}

/// One message, or nothing at the end. Anything that is not protocol fails the test.
fn frame(from: &mut impl BufRead) -> Option<Value> {
    let mut header = String::new();
    if from.read_line(&mut header).ok()? == 0 {
        return None;
    }
    let length: usize = header
        .strip_prefix("Content-Length: ")
        .unwrap_or_else(|| panic!("no protocol: {header}"))
        .trim()
        .parse()
        .unwrap();
    let mut blank = String::new();
    from.read_line(&mut blank).ok()?;
    assert_eq!(blank, "\r\n");
    let mut body = vec![0; length];
    from.read_exact(&mut body).ok()?;
    Some(serde_json::from_slice(&body).unwrap())
}

pub(crate) fn uri(path: &Path) -> String {
    format!("file://{}", path.to_string_lossy())
}

/// The folder of the demo kits.
pub(crate) fn kits() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("../tests/kits")
        .canonicalize()
        .unwrap()
}

/// A demo kit.
pub(crate) fn kit(name: &str) -> String {
    std::fs::read_to_string(kits().join(name)).unwrap()
}

/// Line and column, from 0, of a text in another; columns in UTF-16 units, or in bytes.
pub(crate) fn find(text: &str, wanted: &str, bytes: bool) -> Value {
    let at = text.find(wanted).unwrap_or_else(|| panic!("no {wanted}"));
    place(text, at, bytes)
}

pub(crate) fn place(text: &str, at: usize, bytes: bool) -> Value {
    let before = &text[..at];
    let line = before.matches('\n').count();
    let start = before.rfind('\n').map_or(0, |n| n + 1);
    let column = if bytes {
        at - start
    } else {
        before[start..].encode_utf16().count()
    };
    json!({"line": line, "character": column})
}
