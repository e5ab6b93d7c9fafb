//! A long session that uses everything the server offers, in front of the judge, who sees every message;
//! and the same in front of a client that can do nothing, who must be sent nothing it did not ask for.

use std::path::Path;
use std::time::Duration;

use serde_json::{Value, json};

use crate::client::{Client, kit, uri};
use crate::judge::Judge;

/// What this server has no need to send.
const UNUSED: &[&str] = &[
    "ask workspace/applyEdit",
    "window/logMessage",
    "window/showMessage",
];

/// A workspace of a spec with mistakes of several kinds, the parts it uses, and a sound spec. Letters of
/// two bytes and one unit, and of four bytes and two units, stand before what is asked about.
fn workspace(root: &Path) -> (String, String) {
    let whole = kit("tern60.ampspec");
    let (cut, end) = (
        whole.find("device n16").unwrap(),
        whole.find("load hall-8").unwrap(),
    );
    let parts = format!("ampspec 1\n# Ω 🔊\n{}", &whole[cut..end]);
    let spec = format!("{}\n{}", &whole[..cut], &whole[end..])
        .replacen("ampspec 1\n", "ampspec 1\nuse \"parts.ampspec\"\n", 1)
        .replace("\"two-way hall speaker\" {", "\"Ω🔊\" { # µ")
        .replace("3k3 ±5 % 3 W", "3300 Ω ±5 % 3 VA")
        .replace("0.45 K/W at 50 K", "2 K/W at 50 K")
        .replace("    mass  ", "  mss  ");
    std::fs::write(root.join("spec.ampspec"), &spec).unwrap();
    std::fs::write(root.join("parts.ampspec"), &parts).unwrap();
    std::fs::write(root.join("sound.ampspec"), &whole).unwrap();
    (spec, parts)
}

/// Where the words of a text begin, and one place inside each, in the columns of the session.
fn words(text: &str, bytes: bool) -> Vec<Value> {
    let mut out = Vec::new();
    for (row, line) in text.lines().enumerate() {
        let mut column = 0;
        let mut before = ' ';
        for letter in line.chars() {
            if before == ' ' && letter != ' ' {
                out.push(json!({"line": row, "character": column}));
            }
            column += if bytes {
                letter.len_utf8()
            } else {
                letter.len_utf16()
            };
            before = letter;
        }
        out.push(json!({"line": row, "character": column}));
    }
    out
}

fn everything() -> Value {
    json!({"start": {"line": 0, "character": 0}, "end": {"line": 9999, "character": 0}})
}

/// Ask everything there is to ask of one document.
fn ask_all(client: &mut Client, path: &str, text: &str, bytes: bool) {
    let document = json!({"uri": path});
    let options = json!({"tabSize": 4, "insertSpaces": true});
    for method in [
        "codeLens",
        "documentLink",
        "documentSymbol",
        "foldingRange",
        "semanticTokens/full",
    ] {
        client.get(
            &format!("textDocument/{method}"),
            json!({"textDocument": document}),
        );
    }
    client.get(
        "textDocument/formatting",
        json!({"textDocument": document, "options": options}),
    );
    client.get(
        "textDocument/inlayHint",
        json!({"textDocument": document, "range": everything()}),
    );
    let places = words(text, bytes);
    client.get(
        "textDocument/selectionRange",
        json!({"textDocument": document, "positions": places}),
    );
    for (number, place) in places.iter().enumerate() {
        let at = json!({"textDocument": document, "position": place});
        client.get("textDocument/hover", at.clone());
        // the rest take turns: what each says depends on the kind of word, and there are many of each
        match number % 7 {
            0 => client.get("textDocument/completion", at),
            1 => client.get("textDocument/signatureHelp", at),
            2 => client.get("textDocument/definition", at),
            3 => client.get("textDocument/documentHighlight", at),
            4 => client.get("textDocument/prepareRename", at),
            5 => client.get("textDocument/onTypeFormatting", json!({"textDocument": document, "position": place, "ch": "\n", "options": options})),
            _ => client.get("textDocument/references", json!({"textDocument": document, "position": place, "context": {"includeDeclaration": true}})),
        };
    }
}

/// Ask for the fixes of every finding.
fn fix_all(client: &mut Client, path: &str) {
    for finding in client.diagnostics[path].as_array().unwrap().clone() {
        let context = json!({"diagnostics": [finding], "only": ["quickfix"]});
        client.get(
            "textDocument/codeAction",
            json!({"textDocument": {"uri": path}, "range": finding["range"], "context": context}),
        );
    }
}

#[test]
fn every_message_of_a_long_session_is_sound() {
    for bytes in [true, false] {
        let folder = tempfile::tempdir().unwrap();
        let root = folder.path().canonicalize().unwrap();
        let (spec, parts) = workspace(&root);
        let path = |name: &str| uri(&root.join(name));
        let (s, p) = (path("spec.ampspec"), path("parts.ampspec"));
        let encodings: &[&str] = if bytes { &["utf-8"] } else { &["utf-16"] };
        let mut client = Client::start(&root, encodings, json!({"workspace": true}));
        client.settings = json!({"workspace": true, "hints": {"derived": true}});
        client.until(&s, |d| d.to_string().contains("thermal.sink"));
        client.open(&s, &spec);
        client.open(&p, &parts);
        client.settled(&s, 1);
        client.settled(&p, 1);
        ask_all(&mut client, &s, &spec, bytes);
        ask_all(&mut client, &p, &parts, bytes);
        fix_all(&mut client, &s);

        let name = crate::client::find(&parts, "n16", bytes);
        let renamed = client.get(
            "textDocument/rename",
            json!({"textDocument": {"uri": p}, "position": name, "newName": "q9"}),
        );
        assert!(renamed["documentChanges"].is_array(), "{renamed}");
        let refused = client.ask(
            "textDocument/rename",
            json!({"textDocument": {"uri": p}, "position": name, "newName": "ohm"}),
        );
        assert!(refused["error"].is_object());
        client.get("workspace/symbol", json!({"query": ""}));
        for arguments in [json!([s]), json!([s, "html"])] {
            let page = client.get(
                "workspace/executeCommand",
                json!({"command": "derate.margins", "arguments": arguments}),
            );
            assert!(page.as_str().unwrap().contains("thermal.sink"));
        }

        // an edit in the parts makes the hints of the spec stale; settings, files and folders change
        let lower = parts.replace("240 V\n    current", "60 V\n    current");
        client.change(&p, 2, json!([{"text": lower}]));
        client.settled(&p, 2);
        client.until(&s, |d| d.to_string().contains("voltage.device"));
        client.get(
            "textDocument/rangeFormatting",
            json!({"textDocument": {"uri": s}, "range": everything(), "options": {"tabSize": 4, "insertSpaces": true}}),
        );
        client.settings = json!({"policy": "strict"});
        client.tell(
            "workspace/didChangeConfiguration",
            json!({"settings": null}),
        );
        let asked = |c: &Client| {
            let all = c.notes.iter();
            all.filter(|n| n["method"] == "workspace/configuration")
                .count()
        };
        client.within(Duration::from_secs(10), |c| asked(c) == 2);
        client.tell(
            "window/workDoneProgress/cancel",
            json!({"token": "derate/1"}),
        );
        std::fs::remove_file(root.join("sound.ampspec")).unwrap();
        client.tell(
            "workspace/didChangeWatchedFiles",
            json!({"changes": [{"uri": path("sound.ampspec"), "type": 3}]}),
        );
        let moved =
            json!({"event": {"added": [], "removed": [{"uri": uri(&root), "name": "kits"}]}});
        client.tell("workspace/didChangeWorkspaceFolders", moved);
        client.change(&p, 3, json!([{"text": parts}]));
        client.settled(&p, 3);
        client.tell("textDocument/didClose", json!({"textDocument": {"uri": p}}));
        client.get(
            "textDocument/hover",
            json!({"textDocument": {"uri": s}, "position": {"line": 5, "character": 6}}),
        );
        client.within(Duration::from_secs(10), |c| {
            c.judge.as_ref().unwrap().at_rest()
        });
        client.get("shutdown", Value::Null);
        assert!(
            client.judge.as_ref().unwrap().at_rest(),
            "progress never ends"
        );
        let unseen = client.judge.as_ref().unwrap().unseen();
        let left: Vec<_> = unseen
            .iter()
            .filter(|n| !UNUSED.contains(&n.as_str()))
            .collect();
        assert!(left.is_empty(), "never judged: {left:?}");
        client.tell("exit", Value::Null);
        assert_eq!(client.wait(), 0);
    }
}

#[test]
fn a_client_that_can_do_nothing_is_sent_nothing_it_cannot_take() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let (spec, parts) = workspace(&root);
    let (s, p) = (
        uri(&root.join("spec.ampspec")),
        uri(&root.join("parts.ampspec")),
    );
    let mut client = Client::spawn();
    client.begin(json!({"processId": null, "rootUri": uri(&root), "capabilities": {}}));
    client.open(&s, &spec);
    client.open(&p, &parts);
    let found = client.settled(&s, 1);
    for finding in found.as_array().unwrap() {
        assert!(finding.get("relatedInformation").is_none() && finding.get("tags").is_none());
    }
    ask_all(&mut client, &s, &spec, false);
    let at = json!({"textDocument": {"uri": s}, "position": {"line": 5, "character": 6}});
    let hover = client.get("textDocument/hover", at.clone());
    assert_eq!(hover["contents"]["kind"], "plaintext");
    let offers = client.get("textDocument/completion", at).to_string();
    assert!(!offers.contains("insertTextFormat\":2"), "{offers}");
    let symbols = client.get(
        "textDocument/documentSymbol",
        json!({"textDocument": {"uri": s}}),
    );
    assert!(symbols[0]["location"].is_object(), "{symbols}");
    let name = crate::client::find(&parts, "n16", false);
    let renamed = client.get(
        "textDocument/rename",
        json!({"textDocument": {"uri": p}, "position": name, "newName": "q9"}),
    );
    assert!(renamed["changes"].is_object() && renamed.get("documentChanges").is_none());
    assert!(client.capabilities.get("codeActionProvider").is_none());
    assert!(client.notes.is_empty(), "{:#?}", client.notes);
    assert_eq!(client.stop(), 0);
}

/// A judge who has seen a client open a text of two lines and ask for a hover and for the layout.
fn judge() -> Judge {
    let mut judge = Judge::default();
    let document =
        json!({"uri": "file:///a", "languageId": "ampspec", "version": 3, "text": "a±\nb"});
    judge.sent(&json!({"method": "textDocument/didOpen", "params": {"textDocument": document}}));
    for (id, method) in [(1, "textDocument/hover"), (2, "textDocument/formatting")] {
        let params = json!({"textDocument": {"uri": "file:///a"}});
        judge.sent(&json!({"id": id, "method": method, "params": params}));
    }
    judge
}

/// The judge is worth nothing unless what breaks the protocol fails; each of these differs from a sound
/// message in one thing.
#[test]
fn the_judge_lets_nothing_pass_that_breaks_the_protocol() {
    let range = |a: Value, b: Value, c: Value, d: Value| json!({"start": {"line": a, "character": b}, "end": {"line": c, "character": d}});
    let whole = || range(json!(0), json!(0), json!(1), json!(1));
    let publish = |version: i64, finding: Value| json!({"jsonrpc": "2.0", "method": "textDocument/publishDiagnostics", "params": {"uri": "file:///a", "version": version, "diagnostics": [finding]}});
    let edits = |all: Value| json!({"jsonrpc": "2.0", "id": 2, "result": all});
    let edit = |range: Value| json!({"range": range, "newText": ""});
    let progress = |kind: &str| json!({"jsonrpc": "2.0", "method": "$/progress", "params": {"token": "t", "value": {"kind": kind, "title": "x"}}});
    for sound in [
        publish(3, json!({"range": whole(), "message": "m"})),
        json!({"jsonrpc": "2.0", "id": 1, "result": {"contents": {"kind": "markdown", "value": "v"}, "range": whole()}}),
        edits(json!([edit(whole())])),
        json!({"jsonrpc": "2.0", "id": 1, "error": {"code": -32800, "message": "m"}}),
    ] {
        judge().received(&sound);
    }
    let at = |a: i64, b: i64, c: i64, d: i64| range(json!(a), json!(b), json!(c), json!(d));
    let finding = |range: Value| publish(3, json!({"range": range, "message": "m"}));
    let broken = [
        publish(3, json!({"range": whole()})),
        publish(3, json!({"range": whole(), "message": "m", "severity": 9})),
        publish(
            3,
            json!({"range": whole(), "message": "m", "colour": "red"}),
        ),
        publish(3, json!({"range": whole(), "message": 7})),
        publish(2, json!({"range": whole(), "message": "m"})),
        finding(at(-1, 0, 1, 1)),
        finding(range(json!("0"), json!(0), json!(1), json!(1))),
        finding(range(json!(0.5), json!(0), json!(1), json!(1))),
        finding(at(1, 1, 0, 0)),
        finding(at(0, 0, 0, 3)),
        finding(at(0, 0, 2, 0)),
        finding(at(0, 0, 1, 1 << 31)),
        edits(json!([edit(at(0, 0, 0, 2)), edit(at(0, 1, 1, 0))])),
        edits(json!([{"range": whole()}])),
        json!({"jsonrpc": "2.0", "id": 1, "result": null, "error": {"code": 1, "message": "m"}}),
        json!({"jsonrpc": "2.0", "id": 1}),
        json!({"jsonrpc": "2.0", "id": 9, "result": null}),
        json!({"id": 1, "result": null}),
        json!({"jsonrpc": "2.0", "method": "no/such", "params": {}}),
        progress("begin"),
    ];
    for message in broken {
        let passed = std::panic::catch_unwind(|| judge().received(&message));
        assert!(passed.is_err(), "passed: {message}");
    }
}

/// Positions counted by hand: `±` is two bytes and one unit, the loudspeaker four bytes and two units.
#[test]
fn the_judge_counts_columns_as_the_protocol_does() {
    let text = "a±b\r\n🔊c\rd\n";
    let at = |line: u64, character: u64, bytes: bool| {
        let place = json!({"line": line, "character": character});
        crate::judge::offset(text, &place, bytes)
    };
    assert_eq!(at(0, 2, false), Some(3));
    assert_eq!(at(0, 2, true), None);
    assert_eq!(at(0, 4, true), Some(4));
    assert_eq!(at(0, 4, false), None);
    assert_eq!(at(1, 1, false), None);
    assert_eq!(at(1, 2, false), Some(10));
    assert_eq!(at(2, 0, false), Some(12));
    assert_eq!(at(3, 0, true), Some(14));
    assert_eq!(at(4, 0, true), None);
}
