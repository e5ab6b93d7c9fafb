//! Missing data is unchecked, never a pass: every single statement of the demo kits is taken away in turn.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    reason = "helpers of tests, outside a test function"
)]

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use ampspec_grammar::{Item, Tree, parse};
use derate::finding::{Margin, Report, Verdict};
use derate::source::{Files, normal};
use derate::vocabulary::block_kind;

struct Beside<'a>(&'a str);

fn kits() -> PathBuf {
    normal(&Path::new(env!("CARGO_MANIFEST_DIR")).join("../tests/kits"))
}

impl Files for Beside<'_> {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        if path.ends_with("under-test.ampspec") {
            return Ok(self.0.into());
        }
        std::fs::read_to_string(path)
            .map(Into::into)
            .map_err(|e| e.to_string())
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        normal(path)
    }
}

fn report(text: &str) -> Report {
    let options = derate::Options {
        today: "2026-06-01".to_owned(),
        ..derate::Options::default()
    };
    derate::check(
        &Beside(text),
        &kits().join("under-test.ampspec"),
        "under-test.ampspec",
        &options,
    )
    .unwrap()
    .report
}

fn margins(report: &Report) -> BTreeMap<String, Margin> {
    report
        .builds
        .iter()
        .flat_map(|b| &b.margins)
        .map(|m| (m.id.clone(), m.clone()))
        .collect()
}

/// Every line of every block: kind, block, key, and the text without it.
fn without_each_line(tree: &Tree) -> Vec<(String, String, String, String)> {
    let mut out = Vec::new();
    for item in &tree.items {
        let Item::Block(block) = item else { continue };
        for line in &block.lines {
            let kind = block.kind.text(&tree.text).to_owned();
            let name = block.name().unwrap().text(&tree.text).to_owned();
            let key = line.key.text(&tree.text).to_owned();
            let mut text = tree.text.to_string();
            text.replace_range(line.span.start..line.span.end, "");
            out.push((kind, name, key, text));
        }
    }
    out
}

/// Taking a statement away never turns a verdict into a pass, and never makes a margin vanish without
/// saying which key is missing; what needed the key names it.
fn missing_is_never_a_pass(kit: &str) {
    let text = std::fs::read_to_string(kits().join(kit)).unwrap();
    let tree = parse(text.as_str());
    let whole = margins(&report(&text));
    assert!(!whole.is_empty());
    let mut faults = Vec::new();
    for (kind, name, key, cut) in without_each_line(&tree) {
        let vocabulary = block_kind(&kind).and_then(|b| b.key(&key)).unwrap();
        if vocabulary.required() || vocabulary.default == "req with mains" {
            continue;
        }
        let report = report(&cut);
        let after = margins(&report);
        let missing = format!("{kind} {name} {key}");
        let named = report
            .builds
            .iter()
            .flat_map(|b| &b.assumed)
            .any(|a| a.key.starts_with(&missing));
        for (id, before) in &whole {
            let Some(now) = after.get(id) else {
                // these judge the statement itself, or are a second measure beside one that stands
                let own = [
                    "data.",
                    "bom.",
                    "bias.consistency",
                    "protection.dc-fault-energy",
                    "protection.offset-undetected",
                ];
                if own.iter().any(|o| before.rule.starts_with(o)) {
                    continue;
                }
                // a build that cannot be solved at all says so as a finding
                let told = report
                    .findings
                    .iter()
                    .any(|f| f.message.contains(&key) || f.message.contains(&name));
                let replaced = after
                    .values()
                    .any(|m| m.rule == before.rule && m.verdict == Verdict::Unchecked);
                if !told && !replaced && vocabulary.default == "-" {
                    faults.push(format!("without `{missing}`: {id} vanished"));
                }
                continue;
            };
            let worse = matches!(before.verdict, Verdict::Over | Verdict::Thin);
            if worse && now.verdict == Verdict::Ok && !named {
                faults.push(format!(
                    "without `{missing}`: {id} went from {:?} to Ok",
                    before.verdict
                ));
            }
            if now.verdict == Verdict::Unchecked
                && before.verdict != Verdict::Unchecked
                && now.needs.is_empty()
                && now.note.is_empty()
            {
                faults.push(format!(
                    "without `{missing}`: {id} is unchecked and does not say why"
                ));
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn of_the_sound_kit() {
    missing_is_never_a_pass("tern60.ampspec");
}

#[test]
fn of_the_kit_full_of_mistakes() {
    missing_is_never_a_pass("tern60-mistakes.ampspec");
}
