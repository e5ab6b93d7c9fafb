//! A spec typed from empty, one character at a time: what is shown while a person types.

use std::collections::BTreeMap;

use serde_json::{Value, json};

use crate::client::{Client, kit, place, uri};

/// A kit with a mistake of another kind on each of some lines.
fn with_mistakes() -> String {
    let kit = kit("tern60.ampspec");
    let slips = [
        (
            "pairs              2\n    emitter",
            "pairs              two\n    emitter",
        ),
        ("±5 % 5 W pulse", "±5 % 5 VA pulse"),
        (
            "    gain               28 dB",
            "    gian               28 dB",
        ),
        ("vceo               240 V", "vceo               240"),
        ("mass               1.4 kg", "mass               1.4 Ω"),
        ("2 x 28 Vac", "2 x \"28 Vac"),
    ];
    slips.iter().fold(kit, |text, (right, wrong)| {
        assert_eq!(text.matches(right).count(), 1, "{right}");
        text.replace(right, wrong)
    })
}

/// The findings about the form of each line, by line; that a block is not closed yet is left out, for
/// the one that is being typed never is.
fn by_line(found: &Value) -> BTreeMap<u64, Vec<String>> {
    let mut out: BTreeMap<u64, Vec<String>> = BTreeMap::new();
    for one in found.as_array().unwrap() {
        let (code, said) = (
            one["code"].as_str().unwrap(),
            one["message"].as_str().unwrap(),
        );
        let first = said.lines().next().unwrap_or("");
        if code.starts_with("syntax.") && !first.starts_with("the block ") {
            let row = one["range"]["start"]["line"].as_u64().unwrap();
            out.entry(row).or_default().push(format!("{code}: {first}"));
        }
    }
    out
}

#[test]
fn typing_never_floods_and_finished_lines_keep_their_findings() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let path = uri(&root.join("typed.ampspec"));
    let whole = with_mistakes();
    let mut client = Client::start(&root, &["utf-8"], Value::Null);
    client.open(&path, "");
    let mut finished: BTreeMap<u64, Vec<String>> = BTreeMap::new();
    for (version, (at, c)) in (2..).zip(whole.char_indices()) {
        let here = place(&whole, at, true);
        client.change(
            &path,
            version,
            json!([{"range": {"start": here, "end": here}, "text": c.to_string()}]),
        );
        let typed = &whole[..at + c.len_utf8()];
        let mut now = by_line(&client.settled(&path, version));
        let row = typed.matches('\n').count() as u64;
        let on_line = now.remove(&row).unwrap_or_default();
        assert!(on_line.len() <= 1, "while typing {typed:?}: {on_line:#?}");
        if c == '\n' {
            // what is said of the line that was just ended is said from now on
            finished.insert(row - 1, now.get(&(row - 1)).cloned().unwrap_or_default());
        }
        finished.retain(|_, said| !said.is_empty());
        assert_eq!(now, finished, "after {typed:?}");
    }
    assert_eq!(finished.len(), 6, "{finished:#?}");
    assert_eq!(client.stop(), 0);
}
