//! `derate check --apply`: one proposed change written into the file. Must not know how a change is found.

use std::collections::BTreeMap;
use std::fmt::Write;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use derate::Outcome;
use derate::compare::{Comparison, Course, POINTS};
use derate::finding::{BuildReport, Change, FileId, Margin, Severity, TextEdit, Verdict};
use derate::render::compare as moves;
use derate::render::message::{build_name, part_name};
use derate::rules;
use derate::source::{Disk, Files};

use super::input::{Given, Input, Shelf, inputs};
use super::solve::{Solve, outcome};
use super::{Done, save};

/// Nothing was written, and why.
const REFUSED: u8 = 1;

/// Write the change proposed for a rule, and print what it moved.
pub(crate) fn run(solve: &Solve, paths: &[PathBuf], rule: &str, of: Option<&str>) -> Done {
    if rules::find(rule).is_none() {
        return Done::refused(format!(
            "no rule is named {rule}; derate explain lists them"
        ));
    }
    let (files, notes) = inputs(paths);
    let file = match (files.as_slice(), notes.first()) {
        ([file], None) if !file.is_stdin() => file,
        (_, Some(note)) => return Done::refused(note.clone()),
        ([_], None) => return Done::refused("--apply writes a file, and standard input is none"),
        (many, None) => {
            return Done::refused(format!(
                "--apply writes one file, and {} are named",
                many.len()
            ));
        }
    };
    let mut options = solve.options();
    options.changes = true;
    let before = match outcome(file, &Shelf::default(), &options) {
        Ok(before) => before,
        Err(note) => return Done::refused(note),
    };
    match write(solve, file, &before, rule, of) {
        Ok(output) => Done::with(output),
        Err(why) => Done {
            notes: vec![why],
            status: REFUSED,
            ..Done::default()
        },
    }
}

/// A change with the margin it clears.
type Offer<'a> = (&'a BuildReport, &'a Margin, &'a Change);

fn write(
    solve: &Solve,
    file: &Input,
    before: &Outcome,
    rule: &str,
    of: Option<&str>,
) -> Result<String, String> {
    let (build, margin, change) = choose(before, rule, of)?;
    let edited = edited(before, &change.edits)?;
    let (id, text) = &edited;
    let target = before
        .sources
        .file(*id)
        .ok_or("the file of the change is not known")?;
    let after = again(solve, file, &target.path, text)?;
    let comparison = Comparison::new(before, &after, POINTS);
    let cleared = after
        .report
        .builds
        .iter()
        .filter(|b| build_name(b) == build_name(build))
        .flat_map(|b| &b.margins)
        .any(|m| m.id == margin.id && m.verdict == Verdict::Ok);
    if !cleared {
        return Err(format!(
            "left as it is: the whole file checked again, {} does not clear {rule}",
            change.title
        ));
    }
    if let Some(worse) = harmed(&comparison) {
        return Err(format!(
            "left as it is: {} would push {worse}",
            change.title
        ));
    }
    save::replace(&target.path, text)
        .map_err(|error| format!("cannot write {}: {error}", target.name))?;
    Ok(told(before, &after, change, &comparison, solve))
}

/// The change to write: the first that is offered. Several margins may want it, or each another.
fn choose<'a>(before: &'a Outcome, rule: &str, of: Option<&str>) -> Result<Offer<'a>, String> {
    let about = |m: &Margin| {
        of.is_none_or(|of| {
            m.part.name == of || m.part.block == of || m.part.refs.iter().any(|r| r == of)
        })
    };
    let past: Vec<(&BuildReport, &Margin)> = before
        .report
        .builds
        .iter()
        .flat_map(|b| b.margins.iter().map(move |m| (b, m)))
        .filter(|(_, m)| m.rule == rule && about(m) && m.waiver.is_none())
        .filter(|(_, m)| matches!(m.verdict, Verdict::Over | Verdict::Thin))
        .collect();
    if past.is_empty() {
        return Err(format!(
            "nothing to change: {rule} is not past any allowance here"
        ));
    }
    let mut offers: Vec<Offer<'a>> = Vec::new();
    for (build, margin) in past {
        let first = margin.changes.iter().find(|c| !c.edits.is_empty());
        if let Some(change) = first
            && !offers.iter().any(|o| o.2.edits == change.edits)
        {
            offers.push((build, margin, change));
        }
    }
    match offers.as_slice() {
        [one] => Ok(*one),
        [] => Err(format!(
            "no change is known that clears {rule} and breaks nothing else"
        )),
        many => {
            let said: Vec<String> = many
                .iter()
                .map(|(b, m, c)| format!("{} in {}: {}", part_name(m), build_name(b), c.title))
                .collect();
            Err(format!(
                "several changes are proposed for {rule}; pick one with --of PART or --build NAME: {}",
                said.join("; ")
            ))
        }
    }
}

/// The text of the one file that the edits are in, with them made.
fn edited(before: &Outcome, edits: &[TextEdit]) -> Result<(FileId, String), String> {
    let mut by_file: BTreeMap<FileId, Vec<&TextEdit>> = BTreeMap::new();
    for edit in edits {
        by_file.entry(edit.site.file).or_default().push(edit);
    }
    let mut files = by_file.into_iter();
    let (Some((id, mut edits)), None) = (files.next(), files.next()) else {
        return Err("left as it is: the change is in several files".to_owned());
    };
    let broken = before.report.findings.iter().any(|f| {
        f.site.file == id && f.rule.starts_with("syntax.") && f.severity == Severity::Error
    });
    if broken {
        return Err(
            "left as it is: some of the file could not be read; mend that first".to_owned(),
        );
    }
    // from the end, so that places before stay true
    edits.sort_by_key(|e| std::cmp::Reverse(e.site.span.start));
    let mut text = before.sources.text(id).to_owned();
    for edit in edits {
        let span = edit.site.span;
        if text.get(span.start..span.end).is_none() {
            return Err("left as it is: the change does not fit the file".to_owned());
        }
        text.replace_range(span.start..span.end, &edit.text);
    }
    Ok((id, text))
}

/// The check with the new text in the place of the old.
fn again(solve: &Solve, file: &Input, changed: &Path, text: &str) -> Result<Outcome, String> {
    let shelf = Shelf::default();
    let mut options = solve.options();
    options.root = file.root();
    let here = Disk.resolve(&file.path) == changed;
    let (path, own): (&Path, Arc<str>) = if here {
        (&file.path, text.into())
    } else {
        (changed, text.into())
    };
    let given = Given {
        path,
        text: own,
        shelf: &shelf,
    };
    derate::check(&given, &file.path, &file.name, &options)
}

/// The worst of what the change would push past an allowance, in any build.
fn harmed(comparison: &Comparison<'_>) -> Option<String> {
    let rows = comparison
        .builds
        .iter()
        .flat_map(|b| b.rows.iter().map(move |r| (b, r)));
    let mut worse = rows.filter(|(_, r)| {
        let verdict = |m: Option<&Margin>| m.map(|m| m.verdict);
        let counts = r
            .margin()
            .is_some_and(|m| !m.rule.starts_with("bom.") && !m.rule.starts_with("data."));
        counts
            && r.course == Course::Worse
            && verdict(r.before) != verdict(r.after)
            && matches!(verdict(r.after), Some(Verdict::Over | Verdict::Thin))
    });
    let (build, row) = worse.next()?;
    let margin = row.margin()?;
    let name = build.report().map(build_name).unwrap_or_default();
    Some(format!(
        "{} of {} in {name} past its allowance",
        margin.rule,
        part_name(margin)
    ))
}

fn told(
    before: &Outcome,
    after: &Outcome,
    change: &Change,
    comparison: &Comparison<'_>,
    solve: &Solve,
) -> String {
    let mut out = String::new();
    for edit in &change.edits {
        let Some(file) = before.sources.file(edit.site.file) else {
            continue;
        };
        let line = file.tree.line_index().position(edit.site.span.start).line;
        let old = edit.site.span.slice(&file.tree.text);
        // writing into a string does not fail
        let _ = match edit.text.is_empty() {
            true => writeln!(out, "{}:{line}: `{}` taken out", file.name, old.trim()),
            false => writeln!(
                out,
                "{}:{line}: `{}` instead of `{old}`",
                file.name, edit.text
            ),
        };
        if after
            .sources
            .iter()
            .next()
            .is_some_and(|(_, root)| root.path != file.path)
        {
            let _ = writeln!(
                out,
                "{} is used by this spec; others that use it were not checked",
                file.name
            );
        }
    }
    let out = derate::render::escape::source(&out).into_owned();
    format!("{out}{}", moves::terminal(comparison, false, solve.style()))
}
