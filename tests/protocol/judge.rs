//! Listens to both sides of a session and fails it where a message of the server breaks LSP 3.17: the
//! strict schema first, then what a schema cannot say of places, edits, versions and progress.
//! Must not know what the server is about.

use std::collections::{BTreeSet, HashMap};
use std::sync::OnceLock;

use jsonschema::Validator;
use serde_json::{Value, json};

/// Everything a server may send, by method; `schema/make` says how it was made.
static SCHEMA: &str = include_str!("schema/lsp-3.17.schema.json");

fn schema() -> &'static Validator {
    static MADE: OnceLock<Validator> = OnceLock::new();
    MADE.get_or_init(|| jsonschema::draft7::new(&serde_json::from_str(SCHEMA).unwrap()).unwrap())
}

/// What a request was about: its method and the document it names.
struct Asked {
    method: String,
    about: Option<String>,
}

/// A text that the client has shown the server.
struct Text {
    version: i64,
    text: String,
}

/// How far the progress of a token has come.
#[derive(PartialEq)]
enum Progress {
    Created,
    Begun(u64),
    Ended,
}

#[derive(Default)]
pub(crate) struct Judge {
    /// Columns count bytes, not units of UTF-16.
    bytes: bool,
    /// Every version of each open text, the newest last.
    texts: HashMap<String, Vec<Text>>,
    asked: HashMap<String, Asked>,
    published: HashMap<String, i64>,
    progress: HashMap<String, Progress>,
    /// Every kind of message of the server that was judged.
    seen: BTreeSet<String>,
}

impl Judge {
    /// What the client sends.
    pub(crate) fn sent(&mut self, message: &Value) {
        let (method, params) = (message["method"].as_str(), &message["params"]);
        let uri = params["textDocument"]["uri"].as_str().map(str::to_owned);
        match (method, uri) {
            (Some("textDocument/didOpen"), Some(uri)) => {
                let text = Text {
                    version: params["textDocument"]["version"].as_i64().unwrap(),
                    text: params["textDocument"]["text"].as_str().unwrap().to_owned(),
                };
                self.published.remove(&uri);
                self.texts.insert(uri, vec![text]);
            }
            (Some("textDocument/didChange"), Some(uri)) => self.changed(&uri, params),
            (Some("textDocument/didClose"), Some(uri)) => {
                self.texts.remove(&uri);
                self.published.remove(&uri);
            }
            (Some(method), about) if message.get("id").is_some() => {
                let asked = Asked {
                    method: method.to_owned(),
                    about,
                };
                self.asked.insert(message["id"].to_string(), asked);
            }
            _ => {}
        }
    }

    fn changed(&mut self, uri: &str, params: &Value) {
        let Some(versions) = self.texts.get_mut(uri) else {
            return;
        };
        let mut text = versions.last().unwrap().text.clone();
        for change in params["contentChanges"].as_array().unwrap() {
            let new = change["text"].as_str().unwrap();
            match change.get("range") {
                None => new.clone_into(&mut text),
                Some(range) => {
                    let at = |end: &str| offset(&text, &range[end], self.bytes);
                    let (Some(start), Some(end)) = (at("start"), at("end")) else {
                        // a client in error: what the text is now is for the server to say
                        self.texts.remove(uri);
                        return;
                    };
                    text.replace_range(start..end, new);
                }
            }
        }
        let version = params["textDocument"]["version"].as_i64().unwrap();
        versions.push(Text { version, text });
    }

    /// What the server sends.
    pub(crate) fn received(&mut self, message: &Value) {
        assert_eq!(message["jsonrpc"], "2.0", "{message}");
        let known = ["jsonrpc", "id", "method", "params", "result", "error"];
        for name in message.as_object().unwrap().keys() {
            assert!(known.contains(&name.as_str()), "{name} in {message}");
        }
        match (message["method"].as_str(), message.get("id")) {
            (Some(method), None) => self.notification(method, &message["params"]),
            (Some(method), Some(id)) => {
                assert!(id.is_i64() || id.is_string(), "{message}");
                self.valid(&format!("ask {method}"), &message["params"]);
                if method == "window/workDoneProgress/create" {
                    let token = message["params"]["token"].to_string();
                    let before = self.progress.insert(token, Progress::Created);
                    assert!(before.is_none(), "a token is created twice: {message}");
                }
            }
            (None, Some(id)) => self.answer(id, message),
            (None, None) => panic!("neither a method nor an id: {message}"),
        }
    }

    fn valid(&mut self, name: &str, payload: &Value) {
        let named = json!({ name: payload });
        if let Some(why) = schema().iter_errors(&named).next() {
            panic!("{name}: {why} at {}: {payload:#}", why.instance_path);
        }
        self.seen.insert(name.to_owned());
    }

    fn answer(&mut self, id: &Value, message: &Value) {
        let (result, error) = (message.get("result"), message.get("error"));
        assert!(
            result.is_some() != error.is_some(),
            "a result or an error, and not both: {message}"
        );
        if let Some(error) = error {
            return self.valid("error", error);
        }
        let Some(asked) = self.asked.remove(&id.to_string()) else {
            panic!("nobody asked: {message}");
        };
        let result = result.unwrap();
        self.valid(&asked.method, result);
        if asked.method == "initialize" {
            self.bytes = result["capabilities"]["positionEncoding"] == "utf-8";
        }
        let text = asked.about.as_deref().and_then(|uri| self.newest(uri));
        self.places(result, text.as_deref());
        if asked.method == "textDocument/semanticTokens/full"
            && let Some(text) = &text
        {
            tokens(result, text, self.bytes);
        }
        if asked.method == "textDocument/foldingRange"
            && let Some(text) = &text
        {
            folds(result, text);
        }
    }

    fn notification(&mut self, method: &str, params: &Value) {
        self.valid(method, params);
        match method {
            "textDocument/publishDiagnostics" => {
                let uri = params["uri"].as_str().unwrap();
                let version = params["version"].as_i64();
                if let Some(version) = version {
                    let before = self.published.insert(uri.to_owned(), version);
                    assert!(
                        before.is_none_or(|b| b <= version),
                        "version {version} of {uri} came after {before:?}"
                    );
                }
                let text = match version {
                    Some(version) => self.at_version(uri, version),
                    None => self.newest(uri),
                };
                self.places(&params["diagnostics"], text.as_deref());
            }
            "$/progress" => self.progressed(params),
            _ => {}
        }
    }

    /// Created, then begun, then reported with a percentage that never falls, then ended.
    fn progressed(&mut self, params: &Value) {
        let (token, value) = (params["token"].to_string(), &params["value"]);
        let before = self.progress.get(&token);
        let done = value["percentage"].as_u64();
        assert!(done.is_none_or(|d| d <= 100), "{params}");
        let now = match (value["kind"].as_str().unwrap(), before) {
            ("begin", Some(Progress::Created)) => Progress::Begun(done.unwrap_or(0)),
            ("report", Some(Progress::Begun(last))) => {
                let done = done.unwrap_or(*last);
                assert!(done >= *last, "progress goes back: {params}");
                Progress::Begun(done)
            }
            ("end", Some(Progress::Begun(_))) => Progress::Ended,
            _ => panic!("progress out of order: {params}"),
        };
        self.progress.insert(token, now);
    }

    /// Whether every progress that was begun has ended.
    pub(crate) fn at_rest(&self) -> bool {
        self.progress.values().all(|p| *p == Progress::Ended)
    }

    /// Every kind of message in the schema that was not judged.
    pub(crate) fn unseen(&self) -> Vec<String> {
        let schema: Value = serde_json::from_str(SCHEMA).unwrap();
        let all = schema["definitions"]["Sent"]["properties"].as_object();
        let unseen = all
            .unwrap()
            .keys()
            .filter(|name| !self.seen.contains(*name));
        unseen.cloned().collect()
    }

    fn at_version(&self, uri: &str, version: i64) -> Option<String> {
        let versions = self.texts.get(uri)?;
        let found = versions.iter().rev().find(|t| t.version == version);
        Some(
            found
                .unwrap_or_else(|| panic!("{uri} never had version {version}"))
                .text
                .clone(),
        )
    }

    /// The newest text of a file: as the client shows it, or as it is on the disk.
    fn newest(&self, uri: &str) -> Option<String> {
        match self.texts.get(uri) {
            Some(versions) => versions.last().map(|t| t.text.clone()),
            None => std::fs::read_to_string(uri.strip_prefix("file://")?).ok(),
        }
    }

    /// Judge every place inside a value, all of them in one text until something names another.
    fn places(&self, value: &Value, text: Option<&str>) {
        match value {
            Value::Array(all) => {
                if let Some(text) = text {
                    self.apart(all, text);
                }
                for one in all {
                    self.places(one, text);
                }
            }
            Value::Object(members) => self.members(members, text),
            _ => {}
        }
    }

    fn members(&self, members: &serde_json::Map<String, Value>, text: Option<&str>) {
        let named = members.get("uri").or_else(|| {
            let document = members.get("textDocument")?;
            document.get("uri")
        });
        let other = named.and_then(Value::as_str).map(|uri| self.newest(uri));
        let text = match &other {
            Some(other) => other.as_deref(),
            None => text,
        };
        if let (Some(start), Some(end)) = (members.get("start"), members.get("end"))
            && let Some(text) = text
        {
            let at = |place| {
                offset(text, place, self.bytes)
                    .unwrap_or_else(|| panic!("{place} is not inside the text:\n{text}"))
            };
            assert!(at(start) <= at(end), "{start} is behind {end}");
        }
        if let (Some(position), Some(text)) = (members.get("position"), text) {
            assert!(offset(text, position, self.bytes).is_some(), "{position}");
        }
        // the smaller of two ranges lies in the larger
        for (outer, inner) in [("range", "selectionRange"), ("parent", "range")] {
            let outer = members.get(outer).map(|o| o.get("range").unwrap_or(o));
            if let (Some(outer), Some(inner)) = (outer, members.get(inner)) {
                let order = |at: &Value| (at["line"].as_u64(), at["character"].as_u64());
                assert!(
                    order(&outer["start"]) <= order(&inner["start"])
                        && order(&inner["end"]) <= order(&outer["end"]),
                    "{inner} is not in {outer}"
                );
            }
        }
        for (name, member) in members {
            match member {
                // edits by the address of their file
                Value::Object(files) if name == "changes" => {
                    for (uri, edits) in files {
                        self.places(edits, self.newest(uri).as_deref());
                    }
                }
                _ => self.places(member, text),
            }
        }
        if let (Some(document), Some(_)) = (members.get("textDocument"), members.get("edits")) {
            let uri = document["uri"].as_str().unwrap();
            let version = self.texts.get(uri).map(|t| t.last().unwrap().version);
            assert_eq!(document["version"].as_i64(), version, "{document}");
        }
    }

    /// No two edits of one text touch the same letters.
    fn apart(&self, edits: &[Value], text: &str) {
        let mut spans: Vec<(usize, usize)> = Vec::new();
        for edit in edits.iter().filter(|e| e.get("newText").is_some()) {
            let at = |end: &str| offset(text, &edit["range"][end], self.bytes).unwrap();
            spans.push((at("start"), at("end")));
        }
        spans.sort_unstable();
        for two in spans.windows(2) {
            assert!(two[0].1 <= two[1].0, "edits overlap: {edits:#?}");
        }
    }
}

/// The lines of a text, each with where it starts, without its end. Line ends are those of section
/// "Text Documents": `\n`, `\r\n` and `\r`.
fn lines(text: &str) -> Vec<(usize, &str)> {
    let mut out = Vec::new();
    let mut start = 0;
    let bytes = text.as_bytes();
    for (at, byte) in bytes.iter().enumerate() {
        let pair = *byte == b'\r' && bytes.get(at + 1) == Some(&b'\n');
        if *byte == b'\n' || (*byte == b'\r' && !pair) {
            let line = &text[start..at];
            out.push((start, line.strip_suffix('\r').unwrap_or(line)));
            start = at + 1;
        }
    }
    out.push((start, &text[start..]));
    out
}

/// The byte at a position, if there is such a line and a letter or the end of the line begins there.
pub(crate) fn offset(text: &str, place: &Value, bytes: bool) -> Option<usize> {
    let (row, column) = (place["line"].as_u64()?, place["character"].as_u64()?);
    let lines = lines(text);
    let (start, line) = lines.get(usize::try_from(row).ok()?)?;
    let mut left = usize::try_from(column).ok()?;
    for (at, letter) in line.char_indices() {
        if left == 0 {
            return Some(start + at);
        }
        let width = if bytes {
            letter.len_utf8()
        } else {
            letter.len_utf16()
        };
        left = left.checked_sub(width)?;
    }
    (left == 0).then_some(start + line.len())
}

/// Tokens come in fives, lie inside their lines and do not overlap.
fn tokens(result: &Value, text: &str, bytes: bool) {
    let data: Vec<u64> = result["data"]
        .as_array()
        .unwrap()
        .iter()
        .map(|n| n.as_u64().unwrap())
        .collect();
    assert_eq!(data.len() % 5, 0);
    let (mut row, mut column, mut free) = (0, 0, 0);
    for token in data.chunks(5) {
        row += token[0];
        column = if token[0] > 0 {
            token[1]
        } else {
            column + token[1]
        };
        free = if token[0] > 0 { 0 } else { free };
        assert!(column >= free && token[2] > 0, "{token:?}");
        free = column + token[2];
        for character in [column, free] {
            let place = json!({"line": row, "character": character});
            assert!(offset(text, &place, bytes).is_some(), "token at {place}");
        }
    }
}

fn folds(result: &Value, text: &str) {
    let count = lines(text).len() as u64;
    for fold in result.as_array().unwrap() {
        let (start, end) = (fold["startLine"].as_u64(), fold["endLine"].as_u64());
        assert!(start <= end && end < Some(count), "{fold}");
    }
}
