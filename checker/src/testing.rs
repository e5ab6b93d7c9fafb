//! Kits for the tests of rules: a demo kit, edited, checked, and looked at.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::finding::{Margin, Report, Verdict};
use crate::source::{Files, normal};

/// Demo kits and their parts from the source tree, and one text that stands for a file beside them.
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

/// The text of a demo kit, its columns closed up, so that an edit need not count blanks.
pub(crate) fn kit(name: &str) -> String {
    closed_up(&std::fs::read_to_string(kits().join(name).with_extension("ampspec")).unwrap())
}

/// Runs of blanks inside lines as one.
fn closed_up(text: &str) -> String {
    let line = |line: &str| {
        let indent = line.len() - line.trim_start().len();
        format!(
            "{}{}",
            &line[..indent],
            line.split_whitespace().collect::<Vec<_>>().join(" ")
        )
    };
    text.split('\n').map(line).collect::<Vec<_>>().join("\n")
}

/// The text with replacements made; each must be found.
pub(crate) fn edited(text: &str, edits: &[(&str, &str)]) -> String {
    let mut out = text.to_owned();
    for (old, new) in edits {
        let old = closed_up(old);
        assert!(out.contains(&old), "`{old}` is not in the kit");
        out = out.replace(&old, new);
    }
    out
}

/// The demo kit `tern60`, edited.
pub(crate) fn tern60(edits: &[(&str, &str)]) -> String {
    edited(&kit("tern60"), edits)
}

/// The same, with the changes that would clear what is found.
pub(crate) fn changes(text: &str) -> Report {
    checked(text, true).report
}

/// Check a text as a file beside the demo kits, and keep the files.
pub(crate) fn outcome(text: &str) -> crate::Outcome {
    checked(text, false)
}

/// The same, with the points of the pictures.
pub(crate) fn drawn(text: &str) -> Report {
    let options = crate::Options {
        today: "2026-06-01".to_owned(),
        curves: true,
        ..crate::Options::default()
    };
    beside(text, |files, path| {
        crate::check(files, path, "under-test.ampspec", &options)
    })
    .unwrap()
    .report
}

fn checked(text: &str, changes: bool) -> crate::Outcome {
    let options = crate::Options {
        today: "2026-06-01".to_owned(),
        changes,
        ..crate::Options::default()
    };
    crate::check(
        &Beside(text),
        &kits().join("under-test.ampspec"),
        "under-test.ampspec",
        &options,
    )
    .unwrap()
}

/// Check a text as a file beside the demo kits.
pub(crate) fn report(text: &str) -> Report {
    outcome(text).report
}

/// The bill of materials that the first build of a text wants.
pub(crate) fn template(text: &str) -> String {
    let path = kits().join("under-test.ampspec");
    let options = crate::Options::default();
    let basis = crate::bom::Basis::Build;
    crate::bom::template(&Beside(text), &path, "under-test.ampspec", &options, basis).unwrap()
}

/// A bill of materials held against a text.
pub(crate) fn crossed(text: &str, list: &str) -> crate::bom::Crossed {
    let given = crate::bom::Against {
        name: "bom.csv",
        text: list,
        columns: &[],
        basis: crate::bom::Basis::Build,
    };
    let path = kits().join("under-test.ampspec");
    let options = crate::Options {
        today: "2026-06-01".to_owned(),
        ..crate::Options::default()
    };
    crate::bom::against(&Beside(text), &path, "under-test.ampspec", &options, &given).unwrap()
}

/// Do something with a text as a file beside the demo kits.
pub(crate) fn beside<T>(text: &str, work: impl FnOnce(&dyn Files, &Path) -> T) -> T {
    work(&Beside(text), &kits().join("under-test.ampspec"))
}

/// The margin of a rule for a part, in the first build, without alternate.
pub(crate) fn margin(text: &str, rule: &str, part: &str) -> Margin {
    let report = report(text);
    let build = report.builds.first().expect("a build");
    let found = build
        .margins
        .iter()
        .find(|m| m.rule == rule && m.part.name == part);
    let known: Vec<_> = build
        .margins
        .iter()
        .filter(|m| m.rule == rule)
        .map(|m| &m.part.name)
        .collect();
    found
        .unwrap_or_else(|| {
            panic!(
                "no margin of {rule} for {part}; there are {known:?}; findings {:#?}",
                report.findings
            )
        })
        .clone()
}

/// Verdict of a rule for a part in the first build.
pub(crate) fn verdict(text: &str, rule: &str, part: &str) -> Verdict {
    margin(text, rule, part).verdict
}

/// Every demo kit and part file.
pub(crate) fn all_kits() -> Vec<PathBuf> {
    let mut out = Vec::new();
    let mut folders = vec![kits()];
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|e| e == "ampspec") {
                out.push(path);
            }
        }
    }
    out.sort();
    out
}
