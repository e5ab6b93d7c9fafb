//! Ten thousand random edits: the findings shown are those of a check of the final text.

use std::collections::HashMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::Duration;

use ampspec_grammar::{ColumnUnit, LineIndex};
use derate::render::shown::shown;
use derate::source::{Disk, Files, normal};
use serde_json::{Value, json};

use crate::client::{Client, kit, uri};
use crate::judge::offset;

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

/// As [`place`], where a lone carriage return ends a line too, as the protocol has it.
fn place_of(text: &str, at: usize) -> Value {
    let lines = LineIndex::new(text.into());
    let (line, character) = lines.locate(at, ColumnUnit::Utf16);
    json!({"line": line, "character": character})
}

/// An edit of bytes, and what undoes it.
#[derive(Clone)]
struct Edit {
    start: usize,
    end: usize,
    new: String,
}

impl Edit {
    /// Make it; what would undo it.
    fn make(&self, text: &mut String) -> Self {
        let old = text[self.start..self.end].to_owned();
        text.replace_range(self.start..self.end, &self.new);
        Self {
            start: self.start,
            end: self.start + self.new.len(),
            new: old,
        }
    }
}

/// Three files on a desk: two specs and the parts that both use.
struct Desk {
    root: PathBuf,
    client: Client,
    dice: Dice,
    texts: HashMap<PathBuf, String>,
    originals: HashMap<PathBuf, String>,
    versions: HashMap<PathBuf, i64>,
    undo: HashMap<PathBuf, Vec<Vec<Edit>>>,
    gone: Vec<PathBuf>,
}

impl Desk {
    fn new(root: PathBuf) -> Self {
        let kit = kit("tern60.ampspec");
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
        let mut client = Client::start(&root, &["utf-16"], Value::Null);
        // every message of this length would be judged for minutes; the long session judges each kind
        client.judge = None;
        let mut desk = Self {
            root,
            client,
            dice: Dice(60),
            texts: HashMap::new(),
            originals: HashMap::new(),
            versions: HashMap::new(),
            undo: HashMap::new(),
            gone: Vec::new(),
        };
        for (name, text) in [
            ("a.ampspec", &spec),
            ("b.ampspec", &spec),
            ("parts.ampspec", &parts),
        ] {
            let path = desk.root.join(name);
            std::fs::write(&path, text).unwrap();
            desk.texts.insert(path.clone(), text.clone());
            desk.originals.insert(path.clone(), text.clone());
            desk.client.open(&uri(&path), text);
            desk.versions.insert(path, 1);
        }
        desk
    }

    fn names(&self) -> Vec<PathBuf> {
        let mut names: Vec<PathBuf> = self.texts.keys().cloned().collect();
        names.sort();
        names
    }

    fn next_version(&mut self, path: &Path) -> i64 {
        let version = self.versions.get_mut(path).unwrap();
        *version += 1;
        *version
    }

    /// Edits, each on the text after the one before, sent as one change.
    fn edit(&mut self, path: &Path, edits: &[Edit]) {
        let text = self.texts.get_mut(path).unwrap();
        let (mut changes, mut back) = (Vec::new(), Vec::new());
        for edit in edits {
            changes.push(json!({"range": {"start": place_of(text, edit.start), "end": place_of(text, edit.end)}, "text": edit.new}));
            back.push(edit.make(text));
        }
        back.reverse();
        self.undo.entry(path.to_owned()).or_default().push(back);
        let version = self.next_version(path);
        self.client.change(&uri(path), version, json!(changes));
    }

    /// One to four cursors type, delete or replace.
    fn type_at_cursors(&mut self, path: &Path) {
        let mut text = self.texts[path].clone();
        let mut edits = Vec::new();
        for _ in 0..=self.dice.roll(4) {
            let start = boundary(&text, self.dice.roll(text.len() + 1));
            let longer = [0, 0, 0, 1, 4, 30][self.dice.roll(6)];
            let end = boundary(&text, (start + longer).min(text.len())).max(start);
            // a cursor never stands inside a line end
            let inside = |at: usize| at > 0 && text.get(at - 1..=at) == Some("\r\n");
            if inside(start) || inside(end) {
                continue;
            }
            let edit = Edit {
                start,
                end,
                new: PIECES[self.dice.roll(PIECES.len())].to_owned(),
            };
            edit.make(&mut text);
            edits.push(edit);
        }
        self.edit(path, &edits);
    }

    /// The whole text anew, as some editors send it.
    fn replace(&mut self, path: &Path, text: String) {
        self.undo.remove(path);
        let version = self.next_version(path);
        self.client
            .change(&uri(path), version, json!([{"text": text}]));
        self.texts.insert(path.to_owned(), text);
    }

    fn undo(&mut self, path: &Path) {
        for _ in 0..=self.dice.roll(3) {
            let Some(edits) = self.undo.get_mut(path).and_then(Vec::pop) else {
                return;
            };
            self.edit(path, &edits);
            // what undoes an undo is not undone next
            self.undo.get_mut(path).unwrap().pop();
        }
    }

    /// Rename a part everywhere, with the edits that the server gives for it.
    fn rename(&mut self, path: &Path) {
        let text = &self.texts[path];
        let all = ["n16", "p16", "d3", "q9", "q8"];
        let (old, new) = (all[self.dice.roll(5)], all[self.dice.roll(5)]);
        let Some(at) = text.find(&format!(" {old} ")) else {
            return;
        };
        let asked = json!({"textDocument": {"uri": uri(path)}, "position": place_of(text, at + 1), "newName": new});
        let answer = self.client.ask("textDocument/rename", asked);
        let Some(files) = answer["result"]["documentChanges"].as_array() else {
            return;
        };
        for file in files {
            let address = file["textDocument"]["uri"].as_str().unwrap();
            let path = PathBuf::from(address.strip_prefix("file://").unwrap());
            let Some(text) = self.texts.get(&path) else {
                continue;
            };
            let at = |place: &Value| offset(text, place, false).unwrap();
            let edits = file["edits"].as_array().unwrap().iter();
            let mut edits: Vec<Edit> = edits
                .map(|e| Edit {
                    start: at(&e["range"]["start"]),
                    end: at(&e["range"]["end"]),
                    new: e["newText"].as_str().unwrap().to_owned(),
                })
                .collect();
            edits.sort_by_key(|e| std::cmp::Reverse(e.start));
            self.edit(&path, &edits);
        }
    }

    fn save(&mut self, path: &Path) {
        std::fs::write(path, self.texts[path].as_str()).unwrap();
        self.client.tell(
            "textDocument/didSave",
            json!({"textDocument": {"uri": uri(path)}}),
        );
    }

    fn close(&mut self, path: &Path) {
        self.client.tell(
            "textDocument/didClose",
            json!({"textDocument": {"uri": uri(path)}}),
        );
    }

    fn reopen(&mut self, path: &Path) {
        self.close(path);
        let version = self.next_version(path);
        self.client.open_at(&uri(path), version, &self.texts[path]);
    }

    /// Give the second spec another file name, on the disk and in the editor.
    fn rename_file(&mut self) {
        let names = self.names();
        let old = names[1].clone();
        let letter = ["b", "c"][usize::from(old.ends_with("b.ampspec"))];
        let new = self.root.join(format!("{letter}.ampspec"));
        self.close(&old);
        std::fs::rename(&old, &new).unwrap();
        let changes = json!([{"uri": uri(&old), "type": 3}, {"uri": uri(&new), "type": 1}]);
        self.client.tell(
            "workspace/didChangeWatchedFiles",
            json!({"changes": changes}),
        );
        let text = self.texts.remove(&old).unwrap();
        let original = self.originals.remove(&old).unwrap();
        let version = self.versions.remove(&old).unwrap() + 1;
        self.undo.remove(&old);
        self.client.versions.remove(&uri(&new));
        self.client.open_at(&uri(&new), version, &text);
        self.texts.insert(new.clone(), text);
        self.originals.insert(new.clone(), original);
        self.versions.insert(new.clone(), version);
        self.gone = vec![old];
    }

    fn step(&mut self) {
        let names = self.names();
        let path = &names[self.dice.roll(names.len())].clone();
        match self.dice.roll(400) {
            0..=9 => self.save(path),
            10..=19 => self.reopen(path),
            20..=22 => self.rename_file(),
            23..=42 => self.rename(path),
            43..=79 => self.undo(path),
            // every spec is brought back from time to time, or soon nothing would be left of it
            80..=109 => self.replace(path, self.originals[path].clone()),
            _ => self.type_at_cursors(path),
        }
    }

    /// What the editor shows is what a check of the texts says.
    fn compare(&mut self, step: usize) {
        let want = expected(&self.texts, &self.root);
        for path in self.names() {
            let uri = uri(&path);
            self.client.settled(&uri, self.versions[&path]);
            // what another file of the three changes here may still be on its way
            self.client.within(Duration::from_secs(5), |c| {
                said(&c.diagnostics[&uri]) == want[&path]
            });
            let got = said(&self.client.diagnostics[&uri]);
            let only = |a: &[Said], b: &[Said]| -> Vec<Said> {
                a.iter().filter(|s| !b.contains(s)).cloned().collect()
            };
            assert!(
                got == want[&path],
                "{} after {step} edits: {:#?} surplus, {:#?} missing",
                path.display(),
                only(&got, &want[&path]),
                only(&want[&path], &got)
            );
        }
        for path in std::mem::take(&mut self.gone) {
            assert_eq!(self.client.diagnostics[&uri(&path)], json!([]));
        }
    }
}

#[test]
fn ten_thousand_random_edits_leave_what_a_check_of_the_final_text_says() {
    let folder = tempfile::tempdir().unwrap();
    let mut desk = Desk::new(folder.path().canonicalize().unwrap());
    for step in 1..=10_000 {
        desk.step();
        if step % 50 == 0 {
            desk.compare(step);
        }
    }
    assert_eq!(desk.client.stop(), 0);
}
