//! Texts that change: whatever is typed, the findings shown are those of a check of the final text.

use std::collections::HashMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::Duration;

use ampspec_grammar::{ColumnUnit, LineIndex};
use derate::render::shown::shown;
use derate::source::{Disk, Files, normal};
use serde_json::{Value, json};

use crate::client::{Client, kit, place, uri};

/// Texts by path, over the disk.
struct Texts<'a>(&'a HashMap<PathBuf, String>);

impl Files for Texts<'_> {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        match self.0.get(path) {
            Some(text) => Ok(text.as_str().into()),
            None => Disk.read(path),
        }
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        normal(path)
    }
}

/// Rule, first line of the message, line, column of both ends: what an editor shows.
type Said = (String, String, u64, u64, u64, u64);

/// What `derate check` says of each file, over all files as roots.
fn expected(texts: &HashMap<PathBuf, String>, root: &Path) -> HashMap<PathBuf, Vec<Said>> {
    let mut out: HashMap<PathBuf, Vec<Said>> =
        texts.keys().map(|p| (p.clone(), Vec::new())).collect();
    for path in texts.keys() {
        let options = derate::Options {
            today: derate::today::today(),
            root: Some(root.to_owned()),
            ..derate::Options::default()
        };
        let outcome = derate::check(&Texts(texts), path, "kit", &options).unwrap();
        for finding in shown(&outcome.sources, &outcome.report) {
            let file = outcome.sources.file(finding.site.file).unwrap();
            let lines = LineIndex::new(Arc::clone(&file.tree.text));
            let (l, c) = lines.locate(finding.site.span.start, ColumnUnit::Utf16);
            let (m, d) = lines.locate(finding.site.span.end, ColumnUnit::Utf16);
            let first = finding.message.lines().next().unwrap_or("").to_owned();
            out.get_mut(&file.path).unwrap().push((
                finding.rule.to_owned(),
                first,
                l as u64,
                c as u64,
                m as u64,
                d as u64,
            ));
        }
    }
    for said in out.values_mut() {
        said.sort();
        said.dedup();
    }
    out
}

fn said(diagnostics: &Value) -> Vec<Said> {
    let one = |d: &Value| {
        let at = |end: &str, what: &str| d["range"][end][what].as_u64().unwrap();
        let first = d["message"]
            .as_str()
            .unwrap()
            .lines()
            .next()
            .unwrap_or("")
            .to_owned();
        (
            d["code"].as_str().unwrap().to_owned(),
            first,
            at("start", "line"),
            at("start", "character"),
            at("end", "line"),
            at("end", "character"),
        )
    };
    let mut out: Vec<Said> = diagnostics.as_array().unwrap().iter().map(one).collect();
    out.sort();
    out.dedup();
    out
}

/// Numbers that look random and are the same on every run: the generator of Knuth, The Art of
/// Computer Programming vol. 2, 3.3.4 (MMIX).
struct Dice(u64);

impl Dice {
    fn roll(&mut self, sides: usize) -> usize {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        ((self.0 >> 33) as usize) % sides.max(1)
    }
}

fn boundary(text: &str, mut at: usize) -> usize {
    while !text.is_char_boundary(at) {
        at -= 1;
    }
    at
}

const PIECES: &[&str] = &[
    "1",
    "0",
    " ",
    "\n",
    "Ω",
    "🔊",
    "}",
    "{",
    ",",
    "\"",
    "# c\n",
    "16 A",
    "    pairs 3\n",
    "n16",
    "µ",
    "\r\n",
    "ohm",
    "none",
    "change out pairs 4",
    "use \"parts.ampspec\"\n",
    "x",
];

#[test]
fn random_edits_leave_what_a_check_of_the_final_text_says() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let kit = kit("tern60.ampspec");
    let cut = kit.find("device n16").unwrap();
    let end = kit.find("load hall-8").unwrap();
    let parts = format!("ampspec 1\n{}", &kit[cut..end]);
    let spec = format!(
        "{}\n{}",
        kit[..cut].replacen("ampspec 1\n", "ampspec 1\nuse \"parts.ampspec\"\n", 1),
        &kit[end..]
    );
    let mut texts: HashMap<PathBuf, String> = HashMap::new();
    for (name, text) in [
        ("a.ampspec", &spec),
        ("b.ampspec", &spec),
        ("parts.ampspec", &parts),
    ] {
        std::fs::write(root.join(name), text).unwrap();
        texts.insert(root.join(name), text.clone());
    }
    let originals = texts.clone();
    let mut names: Vec<PathBuf> = texts.keys().cloned().collect();
    names.sort();
    let mut client = Client::start(&root, &["utf-16"], Value::Null);
    let mut versions: HashMap<PathBuf, i64> = HashMap::new();
    for path in &names {
        client.open(&uri(path), &texts[path]);
        versions.insert(path.clone(), 1);
    }
    let mut dice = Dice(60);
    let mut undo: Vec<(PathBuf, String)> = Vec::new();
    let edits = std::env::var("EDITS")
        .ok()
        .and_then(|n| n.parse().ok())
        .unwrap_or(1000);
    for step in 1..=edits {
        let path = &names[dice.roll(names.len())];
        let version = versions.get_mut(path).unwrap();
        *version += 1;
        let text = texts.get_mut(path).unwrap();
        undo.push((path.clone(), text.clone()));
        let mut changes = Vec::new();
        match dice.roll(12) {
            0 => {
                // back to where this file was some edits ago, as one replacement
                let back = undo
                    .iter()
                    .rev()
                    .filter(|(p, _)| p == path)
                    .nth(dice.roll(5))
                    .map_or_else(|| originals[path].clone(), |(_, t)| t.clone());
                changes.push(json!({"text": back}));
                *text = back;
            }
            1 => {
                text.clone_from(&originals[path]);
                changes.push(json!({"text": text}));
            }
            n => {
                // one to three cursors, each edit counted on the text after the one before
                for _ in 0..=(n % 3) {
                    let start = boundary(text, dice.roll(text.len() + 1));
                    let end = boundary(
                        text,
                        (start + [0, 0, 0, 1, 4, 30][dice.roll(6)]).min(text.len()),
                    );
                    let end = end.max(start);
                    // a cursor never stands inside a line end
                    let inside = |at: usize| {
                        at > 0
                            && text.as_bytes()[at - 1] == b'\r'
                            && text.as_bytes().get(at) == Some(&b'\n')
                    };
                    if inside(start) || inside(end) {
                        continue;
                    }
                    let piece = PIECES[dice.roll(PIECES.len())];
                    changes.push(json!({"range": {"start": place_of(text, start), "end": place_of(text, end)}, "text": piece}));
                    text.replace_range(start..end, piece);
                }
            }
        }
        client.change(&uri(path), *version, json!(changes));
        match dice.roll(40) {
            0 => {
                std::fs::write(path, texts[path].as_str()).unwrap();
                client.tell(
                    "textDocument/didSave",
                    json!({"textDocument": {"uri": uri(path)}}),
                );
            }
            1 => {
                client.tell(
                    "textDocument/didClose",
                    json!({"textDocument": {"uri": uri(path)}}),
                );
                let version = versions.get_mut(path).unwrap();
                *version += 1;
                client.open_at(&uri(path), *version, &texts[path]);
            }
            _ => {}
        }
        if step % 50 == 0 {
            let want = expected(&texts, &root);
            for path in &names {
                client.settled(&uri(path), versions[path]);
                // what another file of the three changes here may still be on its way
                client.within(Duration::from_secs(5), |c| {
                    said(&c.diagnostics[&uri(path)]) == want[path]
                });
                let got = said(&client.diagnostics[&uri(path)]);
                let only = |a: &[Said], b: &[Said]| {
                    a.iter()
                        .filter(|s| !b.contains(s))
                        .cloned()
                        .collect::<Vec<_>>()
                };
                assert!(
                    got == want[path],
                    "{} after {step} edits: {:#?} surplus, {:#?} missing",
                    path.display(),
                    only(&got, &want[path]),
                    only(&want[path], &got)
                );
            }
        }
    }
    assert_eq!(client.stop(), 0);
}

/// As [`place`], where a lone carriage return ends a line too, as the protocol has it.
fn place_of(text: &str, at: usize) -> Value {
    let lines = LineIndex::new(text.into());
    let (line, character) = lines.locate(at, ColumnUnit::Utf16);
    json!({"line": line, "character": character})
}

/// Typed from empty, one character at a time: at most one finding about the form of the line that is
/// being typed, and none about the form of any finished line.
#[test]
fn typing_never_floods() {
    let folder = tempfile::tempdir().unwrap();
    let root = folder.path().canonicalize().unwrap();
    let path = uri(&root.join("typed.ampspec"));
    let whole = kit("tern60.ampspec");
    let whole = &whole[..whole.find("device n16").unwrap() + 120];
    let mut client = Client::start(&root, &["utf-8"], Value::Null);
    client.open(&path, "");
    for (version, (at, c)) in (2..).zip(whole.char_indices()) {
        let here = place(whole, at, true);
        client.change(
            &path,
            version,
            json!([{"range": {"start": here, "end": here}, "text": c.to_string()}]),
        );
        let found = client.settled(&path, version);
        let typed = &whole[..at + c.len_utf8()];
        let row = typed.matches('\n').count() as u64;
        let form: Vec<&Value> = found
            .as_array()
            .unwrap()
            .iter()
            .filter(|d| d["code"].as_str().unwrap().starts_with("syntax."))
            .collect();
        let on_line = form
            .iter()
            .filter(|d| d["range"]["start"]["line"] == row)
            .count();
        assert!(
            on_line <= 1,
            "{on_line} findings while typing {:?}: {form:#?}",
            typed.lines().last()
        );
        // the block that is open has no `}` yet: that is one finding at its header
        let elsewhere: Vec<_> = form
            .iter()
            .filter(|d| {
                d["range"]["start"]["line"] != row && !d["message"].as_str().unwrap().contains('}')
            })
            .collect();
        assert!(
            elsewhere.is_empty(),
            "a finished line is found fault with after {typed:?}: {elsewhere:#?}"
        );
    }
    assert_eq!(client.stop(), 0);
}
