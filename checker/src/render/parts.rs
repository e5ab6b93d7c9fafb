//! A bill of materials held against a spec: in a terminal, as a comment on a pull request, and as a
//! table for a spreadsheet. Must not know how they were compared.

use std::fmt::{self, Write};

use crate::bom::{Basis, Crossed, Row};
use crate::finding::{Severity, Verdict};

use super::escape::{self, markdown as plain, markdown_code as code};
use super::filled;
use super::message::listed;
use super::run::{FailOn, severity};
use super::terminal::Style;

/// Rows that a waiver does not accept, by severity; what could not be compared apart.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Counts {
    /// At error.
    pub error: usize,
    /// At warning.
    pub warning: usize,
    /// At information.
    pub information: usize,
    /// Not compared.
    pub unchecked: usize,
    /// Accepted.
    pub waived: usize,
}

impl Counts {
    /// Count the rows.
    #[must_use]
    pub fn of(crossed: &Crossed) -> Self {
        let mut counts = Self::default();
        for row in &crossed.rows {
            match (row.waiver, row.verdict, row.severity) {
                (Some(_), ..) => counts.waived += 1,
                (_, Verdict::Unchecked, _) => counts.unchecked += 1,
                (_, _, Severity::Error) => counts.error += 1,
                (_, _, Severity::Warning) => counts.warning += 1,
                (_, _, Severity::Information) => counts.information += 1,
            }
        }
        counts
    }

    /// Whether something stands at or above the level.
    #[must_use]
    pub fn fails(&self, at: FailOn) -> bool {
        self.error > 0
            || (at != FailOn::Error && self.warning > 0)
            || (at == FailOn::Unchecked && self.unchecked > 0)
    }
}

/// What the quantities are for, as one word.
#[must_use]
pub fn per(basis: Basis) -> &'static str {
    match basis {
        Basis::Build => "build",
        Basis::Board => "board",
    }
}

/// `error`, `warning`, `unchecked`, `waived` or `information`.
fn level(row: &Row) -> &'static str {
    match (row.waiver, row.verdict) {
        (Some(_), _) => "waived",
        (_, Verdict::Unchecked) => "unchecked",
        _ => severity(row.severity),
    }
}

/// `kit.ampspec:12`, and the list's own line.
fn places(crossed: &Crossed, row: &Row) -> Vec<String> {
    let spec = row.site.and_then(|site| {
        let file = crossed.sources.file(site.file)?;
        let line = file.tree.line_index().position(site.span.start).line;
        Some(format!("{}:{line}", file.name))
    });
    let list = row.line.map(|n| format!("{}:{n}", crossed.list));
    spec.into_iter().chain(list).collect()
}

/// `bom.csv against kit.ampspec, build mono: 2 errors, ...`.
#[must_use]
pub fn total(crossed: &Crossed) -> String {
    let counts = Counts::of(crossed);
    let spec = crossed.sources.iter().next().map_or("", |(_, f)| &f.name);
    let plural = |n: usize, one: &str| format!("{n} {one}{}", if n == 1 { "" } else { "s" });
    format!(
        "{} against {spec}, build {}, quantities for one {}: {}, {}, {} unchecked, {} waived ({} of {} parts found, {})",
        crossed.list,
        crossed.build,
        per(crossed.basis),
        plural(counts.error, "error"),
        plural(counts.warning, "warning"),
        counts.unchecked,
        counts.waived,
        crossed.found,
        crossed.wanted,
        plural(crossed.listed, "row")
    )
}

/// For a terminal. Rows that the spec does not speak of are named in one line.
#[must_use]
pub fn terminal(crossed: &Crossed, style: Style) -> String {
    super::text(|out| write_terminal(out, crossed, style))
}

fn write_terminal(out: &mut String, crossed: &Crossed, style: Style) -> fmt::Result {
    for row in crossed.rows.iter().filter(|r| !aside(r)) {
        let head = format!("{} {}: {}: {}", level(row), row.rule, row.part, row.message);
        match tint(row).filter(|_| style.colour) {
            Some(tint) => writeln!(out, "{tint}{}\u{1b}[0m", escape::terminal(&head))?,
            None => writeln!(out, "{}", escape::terminal(&head))?,
        }
        let mut say = |label: &str, text: &str| {
            filled(
                out,
                &escape::terminal(&format!("{label} {text}")),
                4,
                style.width,
            )
        };
        let places = places(crossed, row).join(", ");
        if !places.is_empty() {
            say("at", &places)?;
        }
        if let Some(text) = &row.spec {
            say("spec:", text)?;
        }
        if let Some(text) = &row.listed {
            say("list:", text)?;
        }
        if let Some(reason) = reason(crossed, row) {
            say("waived:", reason)?;
        }
    }
    for text in gathered(crossed) {
        filled(out, &escape::terminal(&text), 0, style.width)?;
    }
    writeln!(out, "{}", escape::terminal(&total(crossed)))
}

/// Said in one line for all: the list holds something that no line of the spec speaks of, or a line
/// of the spec gives nothing to look for it by.
fn aside(row: &Row) -> bool {
    let only_known = row.verdict == Verdict::Ok && row.severity == Severity::Information;
    let nothing_to_find_it_by = row.verdict == Verdict::Unchecked && row.line.is_none();
    match row.rule {
        "bom.extra" => only_known,
        "bom.missing" => nothing_to_find_it_by && row.waiver.is_none(),
        _ => false,
    }
}

/// The rows that are said in one line: `not in the spec, not checked: line 12 (printed board)`.
fn gathered(crossed: &Crossed) -> Vec<String> {
    let names = |rule: &str| -> Vec<String> {
        let rows = crossed.rows.iter().filter(|r| r.rule == rule && aside(r));
        rows.map(|r| match r.line {
            Some(line) => format!("line {line} ({})", r.part),
            None => r.part.clone(),
        })
        .collect()
    };
    let (missing, extra) = (names("bom.missing"), names("bom.extra"));
    let mut out = Vec::new();
    if !missing.is_empty() {
        out.push(format!(
            "unchecked bom.missing: these lines state neither `ref` nor `part`, so that they cannot be looked for: {}",
            missing.join(", ")
        ));
    }
    if !extra.is_empty() {
        out.push(format!("not in the spec, not checked: {}", listed(&extra)));
    }
    out
}

fn reason<'c>(crossed: &'c Crossed, row: &Row) -> Option<&'c str> {
    let waiver = row.waiver.and_then(|at| crossed.waivers.get(at))?;
    Some(&waiver.reason)
}

fn tint(row: &Row) -> Option<&'static str> {
    match level(row) {
        "error" => Some("\u{1b}[31m"),
        "warning" => Some("\u{1b}[33m"),
        _ => None,
    }
}

/// As a comment on a pull request.
#[must_use]
pub fn markdown(crossed: &Crossed) -> String {
    super::text(|out| write_markdown(out, crossed))
}

fn write_markdown(out: &mut String, crossed: &Crossed) -> fmt::Result {
    writeln!(out, "### derate parts: {}\n", plain(&total(crossed)))?;
    if crossed.rows.iter().any(|r| !aside(r)) {
        writeln!(out, "| | rule | part | refs | what | spec | list | where |")?;
        writeln!(out, "|---|---|---|---|---|---|---|---|")?;
    }
    for row in crossed.rows.iter().filter(|r| !aside(r)) {
        let mut message = row.message.clone();
        if let Some(reason) = reason(crossed, row) {
            message.push_str(&format!(" (waived: {reason})"));
        }
        let cells = [
            level(row).to_owned(),
            code(row.rule),
            plain(&row.part),
            plain(&row.refs.join(" ")),
            plain(&message),
            plain(row.spec.as_deref().unwrap_or_default()),
            plain(row.listed.as_deref().unwrap_or_default()),
            plain(&places(crossed, row).join(", ")),
        ];
        writeln!(out, "| {} |", cells.join(" | "))?;
    }
    for text in gathered(crossed) {
        writeln!(out, "\n{}", plain(&text))?;
    }
    Ok(())
}

/// As comma-separated values after RFC 4180, safe to open in a spreadsheet.
#[must_use]
pub fn csv(crossed: &Crossed) -> String {
    let head = [
        "level",
        "rule",
        "part",
        "refs",
        "message",
        "spec",
        "list",
        "spec line",
        "list line",
        "waived because",
    ];
    let mut out = line(&head.map(str::to_owned));
    for row in &crossed.rows {
        let spec_line = row.site.and_then(|site| {
            let file = crossed.sources.file(site.file)?;
            let line = file.tree.line_index().position(site.span.start).line;
            Some(format!("{}:{line}", file.name))
        });
        out.push_str(&line(&[
            level(row).to_owned(),
            row.rule.to_owned(),
            row.part.clone(),
            row.refs.join(" "),
            row.message.clone(),
            row.spec.clone().unwrap_or_default(),
            row.listed.clone().unwrap_or_default(),
            spec_line.unwrap_or_default(),
            row.line.map(|n| n.to_string()).unwrap_or_default(),
            reason(crossed, row).unwrap_or_default().to_owned(),
        ]));
    }
    out
}

fn line(cells: &[String]) -> String {
    let cells: Vec<String> = cells.iter().map(|c| escape::csv(c)).collect();
    format!("{}\r\n", cells.join(","))
}
