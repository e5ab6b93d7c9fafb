//! What an editor shows and does over a session: findings, hover, hints, actions, names, layout.

use serde_json::{Value, json};

use crate::client::{Client, find, kit, kits, place, uri};
use crate::judge::offset;

const KIT: &str = "tern60.ampspec";

fn document(path: &str) -> Value {
    json!({"textDocument": {"uri": path}})
}

fn at(path: &str, position: &Value) -> Value {
    json!({"textDocument": {"uri": path}, "position": position})
}

/// The text after some edits of the protocol, none of which overlap.
fn applied(text: &str, edits: &Value, bytes: bool) -> String {
    let at = |place: &Value| offset(text, place, bytes).unwrap();
    let mut edits: Vec<(usize, usize, &str)> = edits
        .as_array()
        .unwrap()
        .iter()
        .map(|e| {
            (
                at(&e["range"]["start"]),
                at(&e["range"]["end"]),
                e["newText"].as_str().unwrap(),
            )
        })
        .collect();
    edits.sort_unstable();
    let mut out = text.to_owned();
    for (start, end, new) in edits.into_iter().rev() {
        out.replace_range(start..end, new);
    }
    out
}

/// A whole session, in both encodings, with letters beside the mistake that take two bytes and one
/// unit of UTF-16, and one that takes four and two.
#[test]
fn a_mistake_is_seen_understood_and_put_right() {
    for (encodings, bytes) in [
        (vec!["utf-8", "utf-16"], true),
        (vec!["utf-16"], false),
        (vec![], false),
    ] {
        let mut client = Client::start(&kits(), &encodings, Value::Null);
        assert_eq!(
            client.capabilities["positionEncoding"],
            if bytes { "utf-8" } else { "utf-16" }
        );
        let path = uri(&kits().join("session.ampspec"));
        // the emitter resistor is typed without its R: 22 ohm in place of 0.22 ohm
        let text = kit(KIT)
            .replace("emitter            0R22", "emitter            22R")
            .replace(
                "load hall-8 \"two-way hall speaker\" {",
                "load hall-8 \"Ω🔊 hall\" { # µ",
            );
        assert!(text.contains("22R"));
        client.open(&path, &text);
        let found = client.settled(&path, 1);
        let suspect = found
            .as_array()
            .unwrap()
            .iter()
            .find(|d| d["code"] == "data.unit-suspect")
            .unwrap_or_else(|| panic!("{found:#}"));
        assert_eq!(suspect["range"]["start"], find(&text, "22R", bytes));
        assert_eq!(suspect["source"], "derate");
        assert_eq!(suspect["severity"], 1);

        let hover = client.get(
            "textDocument/hover",
            at(&path, &find(&text, "emitter  ", bytes)),
        );
        assert!(
            hover["contents"]["value"]
                .as_str()
                .unwrap()
                .contains("resistor of each device"),
            "{hover}"
        );

        let actions = client.get("textDocument/codeAction", json!({"textDocument": {"uri": path}, "range": suspect["range"], "context": {"diagnostics": [suspect]}}));
        let fix = actions
            .as_array()
            .unwrap()
            .iter()
            .find(|a| {
                a["diagnostics"][0]["code"] == "data.unit-suspect" && a["isPreferred"] == true
            })
            .unwrap_or_else(|| panic!("{actions:#}"));
        let change = &fix["edit"]["documentChanges"][0];
        assert_eq!(change["textDocument"]["version"], 1);
        let fixed = applied(&text, &change["edits"], bytes);
        assert!(fixed.contains("0R22"), "{fixed}");
        client.change(&path, 2, json!([{"text": fixed}]));
        let found = client.settled(&path, 2);
        assert!(
            !found.to_string().contains("data.unit-suspect"),
            "{found:#}"
        );

        let end = json!({"line": 999, "character": 0});
        let hints = client.get("textDocument/inlayHint", json!({"textDocument": {"uri": path}, "range": {"start": {"line": 0, "character": 0}, "end": end}}));
        let labels = hints.to_string();
        assert!(
            labels.contains("rail idle") && labels.contains("% used"),
            "{labels}"
        );
        let lenses = client
            .get("textDocument/codeLens", document(&path))
            .to_string();
        assert!(lenses.contains("governed by"), "{lenses}");

        let symbols = client.get("textDocument/documentSymbol", document(&path));
        assert!(
            symbols
                .as_array()
                .unwrap()
                .iter()
                .any(|s| s["name"] == "hall-8")
        );
        assert!(
            !client
                .get("textDocument/foldingRange", document(&path))
                .as_array()
                .unwrap()
                .is_empty()
        );
        let tokens = client.get("textDocument/semanticTokens/full", document(&path));
        assert_eq!(tokens["data"].as_array().unwrap().len() % 5, 0);
        let grown = client.get(
            "textDocument/selectionRange",
            json!({"textDocument": {"uri": path}, "positions": [find(&fixed, "0R22", bytes)]}),
        );
        assert!(grown[0]["parent"]["parent"]["range"].is_object());
        let signature = client.get(
            "textDocument/signatureHelp",
            at(&path, &after(&fixed, "emitter            ", bytes)),
        );
        assert!(
            signature["signatures"][0]["label"]
                .as_str()
                .unwrap()
                .starts_with("emitter "),
            "{signature}"
        );
        let margins = client.get(
            "workspace/executeCommand",
            json!({"command": "derate.margins", "arguments": [path]}),
        );
        assert!(
            margins.as_str().unwrap().contains("thermal.sink"),
            "{margins}"
        );
        client.tell("textDocument/didClose", document(&path));
        let cleared = client.until(&path, |d| d.as_array().unwrap().is_empty());
        assert_eq!(cleared, json!([]));
        assert_eq!(client.stop(), 0);
    }
}

fn after(text: &str, wanted: &str, bytes: bool) -> Value {
    place(text, text.find(wanted).unwrap() + wanted.len(), bytes)
}

#[test]
fn completion_knows_keys_names_units_and_rules() {
    let mut client = Client::start(&kits(), &[], Value::Null);
    let path = uri(&kits().join("typing.ampspec"));
    let text = "ampspec 1\nstage out {\n    \n    devices \n    emitter 0.22 \n}\ndevice n16 npn { vceo 80 V }\nbuild b {\n    change out pa\n}\nwaive the\n";
    client.open(&path, text);
    let mut labels = |line: u64, character: u64| -> Vec<String> {
        let offers = client.get(
            "textDocument/completion",
            at(&path, &json!({"line": line, "character": character})),
        );
        offers
            .as_array()
            .unwrap()
            .iter()
            .map(|o| o["label"].as_str().unwrap().to_owned())
            .collect()
    };
    let keys = labels(2, 4);
    assert!(
        keys.contains(&"pairs".to_owned()) && !keys.contains(&"devices".to_owned()),
        "{keys:?}"
    );
    assert!(labels(3, 12).contains(&"n16".to_owned()));
    assert!(labels(4, 17).contains(&"ohm".to_owned()));
    assert!(labels(8, 17).contains(&"pairs".to_owned()));
    assert!(labels(10, 9).contains(&"thermal.sink".to_owned()));
    assert!(labels(11, 0).contains(&"heatsink".to_owned()));
    assert_eq!(client.stop(), 0);
}

#[test]
fn formatting_changes_layout_only() {
    let mut client = Client::start(&kits(), &[], Value::Null);
    let path = uri(&kits().join("layout.ampspec"));
    let text = "ampspec 1\nload a {\n  nominal    8 ohm\n}\nload b {\n  nominal    8 ohm\n}\n";
    client.open(&path, text);
    let options = json!({"tabSize": 4, "insertSpaces": true});
    let edits = client.get(
        "textDocument/formatting",
        json!({"textDocument": {"uri": path}, "options": options}),
    );
    let tidied = applied(text, &edits, false);
    assert_eq!(tidied, derate::tidy::tidy(text).unwrap());
    let one = json!({"start": {"line": 5, "character": 0}, "end": {"line": 5, "character": 3}});
    let edits = client.get(
        "textDocument/rangeFormatting",
        json!({"textDocument": {"uri": path}, "range": one, "options": options}),
    );
    let part = applied(text, &edits, false);
    assert!(
        part.starts_with("ampspec 1\nload a {\n  nominal    8 ohm\n") && part != text,
        "{part}"
    );
    let edits = client.get("textDocument/onTypeFormatting", json!({"textDocument": {"uri": path}, "position": {"line": 6, "character": 1}, "ch": "}", "options": options}));
    assert_eq!(applied(text, &edits, false), part);
    assert_eq!(client.stop(), 0);
}

/// Two specs that share a part file: names, findings and edits go across.
#[test]
fn files_belong_together() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let kit = kit(KIT);
    let (cut, end) = (
        kit.find("device n16").unwrap(),
        kit.find("load hall-8").unwrap(),
    );
    let parts = format!("ampspec 1\n{}", &kit[cut..end]);
    let spec = format!(
        "{}\n{}",
        kit[..cut].replacen("ampspec 1\n", "ampspec 1\nuse \"parts.ampspec\"\n", 1),
        &kit[end..]
    );
    for (name, text) in [
        ("a.ampspec", &spec),
        ("b.ampspec", &spec),
        ("parts.ampspec", &parts),
    ] {
        std::fs::write(root.join(name), text).unwrap();
    }
    let (a, b, p) = (
        uri(&root.join("a.ampspec")),
        uri(&root.join("b.ampspec")),
        uri(&root.join("parts.ampspec")),
    );
    let mut client = Client::start(&root, &[], Value::Null);
    client.open(&a, &spec);
    client.settled(&a, 1);
    // the definition is in a file that is not open
    let there = client.get(
        "textDocument/definition",
        at(&a, &find(&spec, "n16", false)),
    );
    assert_eq!(
        (&there["uri"], &there["range"]["start"]),
        (&json!(p), &find(&parts, "n16", false))
    );
    let links = client.get("textDocument/documentLink", document(&a));
    assert_eq!(links[0]["target"], json!(p));
    let all = client.get("textDocument/references", json!({"textDocument": {"uri": a}, "position": find(&spec, "n16", false), "context": {"includeDeclaration": true}}));
    // declared and inherited from in the parts, used in each spec, one of which nobody opened
    assert_eq!(all.as_array().unwrap().len(), 4, "{all:#}");
    let lit = client.get(
        "textDocument/documentHighlight",
        at(&p, &find(&parts, "n16", false)),
    );
    assert_eq!(lit.as_array().unwrap().len(), 2);

    let renamed = client.get(
        "textDocument/rename",
        json!({"textDocument": {"uri": a}, "position": find(&spec, "n16", false), "newName": "q9"}),
    );
    let mut files: Vec<&Value> = renamed["documentChanges"]
        .as_array()
        .unwrap()
        .iter()
        .map(|c| &c["textDocument"]["uri"])
        .collect();
    files.sort_by_key(|f| f.to_string());
    assert_eq!(files, [&json!(a), &json!(b), &json!(p)]);
    for refused in ["p16", "8x", "ohm", "per", "two words", ""] {
        let answer = client.ask("textDocument/rename", json!({"textDocument": {"uri": a}, "position": find(&spec, "n16", false), "newName": refused}));
        assert_eq!(answer["error"]["code"], -32602, "{refused}: {answer}");
    }
    let symbols = client.get("workspace/symbol", json!({"query": "hall"}));
    assert_eq!(symbols.as_array().unwrap().len(), 2, "{symbols:#}");

    // an edit of the parts that nobody saved is seen in the spec
    client.open(&p, &parts);
    client.settled(&p, 1);
    let lowered = parts.replace(
        "240 V\n    current            16 A",
        "60 V\n    current            16 A",
    );
    assert_ne!(lowered, parts);
    client.change(&p, 2, json!([{"text": lowered}]));
    client.until(&a, |d| d.to_string().contains("voltage.device"));
    // closing it brings the file of the disk back
    client.tell("textDocument/didClose", document(&p));
    client.until(&a, |d| !d.to_string().contains("voltage.device"));
    // and a change of the disk is seen when the client tells of it
    std::fs::write(root.join("parts.ampspec"), &lowered).unwrap();
    client.tell(
        "workspace/didChangeWatchedFiles",
        json!({"changes": [{"uri": p, "type": 2}]}),
    );
    client.until(&a, |d| d.to_string().contains("voltage.device"));
    assert_eq!(client.stop(), 0);
}

#[test]
fn settings_choose_policy_hints_and_the_whole_workspace() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let text = kit(KIT).replace("0.45 K/W at 50 K", "2 K/W at 50 K");
    std::fs::write(root.join("closed.ampspec"), &text).unwrap();
    let mut client = Client::start(
        &root,
        &[],
        json!({"derate": {"workspace": true, "hints": {"derived": false}}}),
    );
    let closed = uri(&root.join("closed.ampspec"));
    client.until(&closed, |d| d.to_string().contains("thermal.sink"));
    let open = uri(&root.join("open.ampspec"));
    client.open(&open, &text);
    client.settled(&open, 1);
    let everything =
        json!({"start": {"line": 0, "character": 0}, "end": {"line": 999, "character": 0}});
    let hints = client.get(
        "textDocument/inlayHint",
        json!({"textDocument": {"uri": open}, "range": everything}),
    );
    assert!(
        !hints.to_string().contains("rail idle") && hints.to_string().contains("used"),
        "{hints}"
    );
    // the policy of the settings, and only open files again: what was told of the closed one is cleared
    client.tell(
        "workspace/didChangeConfiguration",
        json!({"settings": {"derate": {"policy": "strict"}}}),
    );
    client.until(&closed, |d| d.as_array().unwrap().is_empty());
    let hints = client.get(
        "textDocument/inlayHint",
        json!({"textDocument": {"uri": open}, "range": everything}),
    );
    assert!(hints.to_string().contains("rail idle"), "{hints}");
    assert_eq!(client.stop(), 0);
}

#[test]
fn a_duty_of_the_settings_replaces_that_of_the_build() {
    let mut client = Client::start(&kits(), &[], json!({"duty": "full"}));
    let path = uri(&kits().join("duty.ampspec"));
    client.open(&path, &kit(KIT));
    let shown = |client: &mut Client, duty: &str| {
        let asked = json!({"command": "derate.margins", "arguments": [path]});
        let page = client.get("workspace/executeCommand", asked);
        assert!(page.as_str().unwrap().contains(duty), "{duty}: {page}");
    };
    shown(&mut client, "duty full");
    // one that cannot be read is none: the kit states 1/8
    for (duty, wanted) in [
        ("crest 12 dB", "duty crest 12 dB"),
        ("9/8", "duty 1/8"),
        ("1/3", "duty 1/3"),
        ("", "duty 1/8"),
        ("full\n}\nbuild c {", "duty 1/8"),
        ("1/3, full", "duty 1/8"),
    ] {
        let settings = json!({"settings": {"derate": {"duty": duty}}});
        client.tell("workspace/didChangeConfiguration", settings);
        shown(&mut client, wanted);
    }
    assert_eq!(client.stop(), 0);
}

#[test]
fn changes_that_clear_a_margin_are_offered_solved() {
    let mut client = Client::start(&kits(), &[], Value::Null);
    let path = uri(&kits().join("hot.ampspec"));
    let text = kit(KIT).replace("0.45 K/W at 50 K", "2 K/W at 50 K");
    client.open(&path, &text);
    let found = client.settled(&path, 1);
    let hot = found
        .as_array()
        .unwrap()
        .iter()
        .find(|d| d["code"] == "thermal.sink")
        .unwrap()
        .clone();
    let actions = client.get("textDocument/codeAction", json!({"textDocument": {"uri": path}, "range": hot["range"], "context": {"diagnostics": [hot]}}));
    let titles: Vec<&str> = actions
        .as_array()
        .unwrap()
        .iter()
        .map(|a| a["title"].as_str().unwrap())
        .collect();
    let waiver = actions
        .as_array()
        .unwrap()
        .iter()
        .find(|a| {
            a["title"]
                .as_str()
                .unwrap()
                .starts_with("waive thermal.sink")
        })
        .unwrap_or_else(|| panic!("{titles:?}"));
    let edits = &waiver["edit"]["documentChanges"][0]["edits"];
    assert!(
        applied(&text, edits, false)
            .trim_end()
            .ends_with("because \"\" by \"\"")
    );
    if let Some(change) = actions
        .as_array()
        .unwrap()
        .iter()
        .find(|a| a["isPreferred"] == true)
    {
        let edited = applied(&text, &change["edit"]["documentChanges"][0]["edits"], false);
        client.change(&path, 2, json!([{"text": edited}]));
        let left = client.settled(&path, 2);
        assert!(!left.to_string().contains("\"thermal.sink\""), "{left:#}");
    } else {
        panic!("no change was offered: {titles:?}");
    }
    assert_eq!(client.stop(), 0);
}
