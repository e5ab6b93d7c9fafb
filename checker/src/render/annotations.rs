//! Findings as the workflow commands of a build service, which then marks the lines of a change.
//! Must not know what a finding is about.

use std::fmt::{self, Write};

use crate::finding::Severity;

use super::escape::{annotation, annotation_property as property};
use super::run::Run;
use super::terminal::total;

/// The service shows no more than this many of a kind for a step.
const MOST: usize = 10;

/// The findings of a run, the loudest first, and the total.
#[must_use]
pub fn check(run: &Run) -> String {
    super::text(|out| write_check(out, run))
}

fn write_check(out: &mut String, run: &Run) -> fmt::Result {
    let all: Vec<_> = run.shown().filter(|(_, s)| s.open()).collect();
    let kinds = [
        (Severity::Error, "error"),
        (Severity::Warning, "warning"),
        (Severity::Information, "notice"),
    ];
    for (severity, command) in kinds {
        let kind = || all.iter().filter(|(_, s)| s.severity == severity);
        for (outcome, one) in kind().take(MOST) {
            let Some(file) = outcome.sources.file(one.site.file) else {
                continue;
            };
            let lines = file.tree.line_index();
            let (from, to) = (
                lines.position(one.site.span.start),
                lines.position(one.site.span.end),
            );
            let end = if from.line == to.line {
                format!(",endColumn={}", to.column)
            } else {
                format!(",endLine={}", to.line)
            };
            let text = format!("{}\n{}", one.message, one.help());
            writeln!(
                out,
                "::{command} file={},line={},col={}{end},title={}::{}",
                property(&file.name),
                from.line,
                from.column,
                property(one.rule),
                lines_of(text.trim_end())
            )?;
        }
        let more = kind().count().saturating_sub(MOST);
        if more > 0 {
            writeln!(
                out,
                "::{command} title=derate::{more} more of this kind; the log of derate check lists all"
            )?;
        }
    }
    for line in run.stale_lines() {
        writeln!(out, "::notice title=derate::{}", annotation(&line))?;
    }
    writeln!(out, "derate: {}", total(run))
}

/// A message of several lines, each made harmless.
fn lines_of(text: &str) -> String {
    text.lines().map(annotation).collect::<Vec<_>>().join("%0A")
}
