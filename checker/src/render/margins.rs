//! The margin summary: a table for each build, grouped by part, worst first.
//! Must not know how a margin was computed.

use std::fmt::{self, Write};

use crate::finding::{Assumed, BuildReport, Margin, Report, Verdict};

use super::escape;
use super::figure::{apart, figure, percent};
use super::message::{self, build_name, listed, part_name, points, worst_at};
use super::run::Run;
use super::shown::governing;
use super::terminal::Style;
use super::{CAUTION, UNSETTLED, filled};

/// The margins of one part in one build, worst first, unchecked last.
#[derive(Debug)]
pub struct Group<'a> {
    /// `n16 of out`.
    pub name: String,
    /// Its rows.
    pub margins: Vec<&'a Margin>,
}

/// The parts of a build, the one with the governing margin first.
#[must_use]
pub fn groups(build: &BuildReport) -> Vec<Group<'_>> {
    let mut groups: Vec<Group<'_>> = Vec::new();
    let mut at: std::collections::HashMap<String, usize> = std::collections::HashMap::new();
    for margin in &build.margins {
        let name = part_name(margin);
        let index = *at.entry(name.clone()).or_insert(groups.len());
        if index == groups.len() {
            groups.push(Group {
                name,
                margins: Vec::new(),
            });
        }
        if let Some(group) = groups.get_mut(index) {
            group.margins.push(margin);
        }
    }
    for group in &mut groups {
        group.margins.sort_by(|a, b| governing(a, b));
    }
    groups.sort_by(|a, b| match (a.margins.first(), b.margins.first()) {
        (Some(a), Some(b)) => governing(a, b),
        _ => std::cmp::Ordering::Equal,
    });
    groups
}

/// The governing margin of a build: the highest used among over, thin, ok. Unchecked and waived
/// margins are not ranked.
#[must_use]
pub fn governing_of(build: &BuildReport) -> Option<&Margin> {
    let ranked = |m: &&Margin| m.verdict != Verdict::Unchecked && m.waiver.is_none();
    build
        .margins
        .iter()
        .filter(ranked)
        .min_by(|a, b| governing(a, b))
}

/// One row as text: what every form of the table prints.
#[derive(Debug)]
pub struct Row {
    /// The rule.
    pub rule: &'static str,
    /// What the part sees.
    pub stress: String,
    /// What the policy allows.
    pub allowance: String,
    /// What the data sheet allows.
    pub rating: String,
    /// Share of the allowance.
    pub used: String,
    /// What is left, points.
    pub margin: String,
    /// With a waiver or an information-only rule said.
    pub verdict: String,
    /// The worst operating point, or what is missing.
    pub at: String,
}

impl Row {
    /// The headings, in the order of [`Row::cells`].
    pub const HEADINGS: [&'static str; 8] = [
        "rule",
        "stress",
        "allowed",
        "rating",
        "used",
        "margin",
        "verdict",
        "worst at, or what is missing",
    ];

    /// The text of a margin.
    #[must_use]
    pub fn of(margin: &Margin) -> Self {
        let (stress, allowance) = match (margin.stress, margin.allowance) {
            (Some(s), Some(a)) => apart(s, a),
            (s, a) => (
                s.map(figure).unwrap_or_default(),
                a.map(figure).unwrap_or_default(),
            ),
        };
        let used = if message::nothing_left(margin) {
            message::spent(margin).to_owned()
        } else {
            margin.used_percent.map(percent).unwrap_or_default()
        };
        let information = margin.severity == crate::finding::Severity::Information
            && matches!(margin.verdict, Verdict::Over | Verdict::Thin);
        let mut verdict = message::verdict(margin.verdict).to_owned();
        if margin.waiver.is_some() {
            verdict.push_str(", waived");
        } else if information {
            verdict.push_str(", information");
        }
        let needs = (!margin.needs.is_empty()).then(|| format!("needs {}", listed(&margin.needs)));
        let said = [worst_at(&margin.witness), margin.note.clone()];
        let said = needs.into_iter().chain(said).filter(|s| !s.is_empty());
        let at = said.collect::<Vec<_>>().join("; ");
        Self {
            rule: margin.rule,
            stress,
            allowance,
            rating: margin.rating.map(figure).unwrap_or_default(),
            used,
            margin: margin.margin_percent().map(points).unwrap_or_default(),
            verdict,
            at,
        }
    }

    /// The cells in order.
    #[must_use]
    pub fn cells(&self) -> [&str; 8] {
        [
            self.rule,
            &self.stress,
            &self.allowance,
            &self.rating,
            &self.used,
            &self.margin,
            &self.verdict,
            &self.at,
        ]
    }
}

/// `stereo: policy bench, duty 1/8; governed by ...`.
#[must_use]
pub fn governed(build: &BuildReport) -> String {
    match governing_of(build) {
        Some(m) => format!(
            "governed by {} of {}: {}",
            m.rule,
            part_name(m),
            message::used(m)
        ),
        None => "no margin could be checked".to_owned(),
    }
}

/// `41 ok, 0 thin, 2 over, 4 unchecked, 1 waived`.
#[must_use]
pub fn tally(build: &BuildReport) -> String {
    let count = |v: Verdict| build.margins.iter().filter(|m| m.verdict == v).count();
    let waived = build.margins.iter().filter(|m| m.waiver.is_some()).count();
    format!(
        "{} ok, {} thin, {} over, {} unchecked, {waived} waived",
        count(Verdict::Ok),
        count(Verdict::Thin),
        count(Verdict::Over),
        count(Verdict::Unchecked)
    )
}

/// `load pa-4 minimum 3.2 ohm (80 % of nominal)`, one for each value that nothing states.
#[must_use]
pub fn assumptions(build: &BuildReport) -> Vec<String> {
    let said = |a: &Assumed| match a.value {
        Some(value) => format!("{} {} ({})", a.key, figure(value), a.why),
        None => format!("{} ({})", a.key, a.why),
    };
    build.assumed.iter().map(said).collect()
}

/// `Q7, Q8; 4 in the build; N16-Y`, what is known of it.
#[must_use]
pub fn purchase(margin: &Margin) -> String {
    let part = &margin.part;
    let refs = (!part.refs.is_empty()).then(|| listed(&runs(&part.refs)));
    let count = part.quantity.map(|n| format!("{n} in the build"));
    let said: Vec<String> = refs
        .into_iter()
        .chain(count)
        .chain(part.order_code.clone())
        .collect();
    said.join("; ")
}

/// `Q7-Q10` for designators that follow each other.
fn runs(refs: &[String]) -> Vec<String> {
    let split = |name: &str| {
        let letters = name.trim_end_matches(|c: char| c.is_ascii_digit()).len();
        let (letters, number) = name.split_at_checked(letters)?;
        Some((letters.to_owned(), number.parse::<u32>().ok()?))
    };
    let mut out: Vec<String> = Vec::new();
    // where the run that is open began, and the letters and number it has come to
    let mut open: Option<(&String, String, u32)> = None;
    for name in refs {
        match (split(name), &mut open) {
            (Some((letters, number)), Some((first, same, last)))
                if letters == *same && Some(number) == last.checked_add(1) =>
            {
                *last = number;
                let run = format!("{first}-{name}");
                if let Some(end) = out.last_mut() {
                    *end = run;
                }
            }
            (now, open) => {
                out.push(name.clone());
                *open = now.map(|(letters, number)| (name, letters, number));
            }
        }
    }
    out
}

/// The reason each waived margin of a build was accepted for: `thermal.touch: inside a rack`.
#[must_use]
pub fn waived(build: &BuildReport, report: &Report) -> Vec<String> {
    let mut out: Vec<String> = Vec::new();
    for margin in &build.margins {
        if let Some(waiver) = margin.waiver.and_then(|at| report.waivers.get(at)) {
            let line = format!(
                "{} of {}: {}",
                margin.rule,
                part_name(margin),
                waiver.reason
            );
            if !out.contains(&line) {
                out.push(line);
            }
        }
    }
    out
}

/// The summary for a terminal.
#[must_use]
pub fn terminal(run: &Run, style: Style) -> String {
    super::text(|out| write_terminal(out, run, style))
}

fn write_terminal(out: &mut String, run: &Run, style: Style) -> fmt::Result {
    for outcome in &run.outcomes {
        for build in &outcome.report.builds {
            table(out, build, style)?;
            let (assumed, waived) = (assumptions(build), waived(build, &outcome.report));
            for (lead, line) in assumed
                .iter()
                .map(|a| ("assumed", a))
                .chain(waived.iter().map(|w| ("waived", w)))
            {
                writeln!(out, "  {lead}: {}", escape::terminal(line))?;
            }
            out.write_char('\n')?;
        }
    }
    filled(out, CAUTION, 0, style.width)?;
    writeln!(out, "{}", super::terminal::total(run))
}

/// A column is as wide as its widest cell; where a margin is not ok, its operating point, or what is
/// missing, stands below it.
fn table(out: &mut String, build: &BuildReport, style: Style) -> fmt::Result {
    let head = format!(
        "build {}: policy {}, duty {}; {}",
        build_name(build),
        build.policy,
        build.duty,
        tally(build)
    );
    writeln!(out, "{}", bold(&escape::terminal(&head), style))?;
    writeln!(out, "  {}", escape::terminal(&governed(build)))?;
    if !build.settled {
        writeln!(out, "  {UNSETTLED}")?;
    }
    let groups: Vec<(String, Vec<Row>)> = groups(build)
        .iter()
        .map(|g| (heading(g), g.margins.iter().map(|m| Row::of(m)).collect()))
        .collect();
    let mut widths = columns(Row::HEADINGS).map(|h| h.chars().count());
    for row in groups.iter().flat_map(|g| &g.1) {
        for (width, cell) in widths.iter_mut().zip(columns(row.cells())) {
            *width = (*width).max(cell.chars().count());
        }
    }
    line(out, columns(Row::HEADINGS), widths, None)?;
    for (heading, rows) in &groups {
        writeln!(out, "  {}", bold(&escape::terminal(heading), style))?;
        for row in rows {
            line(out, columns(row.cells()), widths, tint(&row.verdict, style))?;
            if row.verdict != "ok" && !row.at.is_empty() {
                filled(out, &escape::terminal(&row.at), 8, style.width)?;
            }
        }
    }
    Ok(())
}

/// The columns that stand side by side; the last stands below.
fn columns(cells: [&str; 8]) -> [&str; 7] {
    let [rule, stress, allowed, rating, used, margin, verdict, _] = cells;
    [rule, stress, allowed, rating, used, margin, verdict]
}

fn heading(group: &Group<'_>) -> String {
    let bought = group
        .margins
        .first()
        .map(|m| purchase(m))
        .unwrap_or_default();
    if bought.is_empty() {
        group.name.clone()
    } else {
        format!("{} ({bought})", group.name)
    }
}

/// Words to the left, numbers to the right, the verdict in its colour.
fn line(out: &mut String, cells: [&str; 7], widths: [usize; 7], tint: Option<&str>) -> fmt::Result {
    let mut text = String::from("    ");
    for (index, (cell, width)) in cells.iter().zip(widths).enumerate() {
        let room = " ".repeat(width.saturating_sub(cell.chars().count()));
        match (index, tint) {
            (6, Some(tint)) => text.push_str(&format!("{tint}{cell}\u{1b}[0m")),
            (0 | 6, _) => text.push_str(&format!("{cell}{room}  ")),
            _ => text.push_str(&format!("{room}{cell}  ")),
        }
    }
    writeln!(out, "{}", text.trim_end())
}

fn tint(verdict: &str, style: Style) -> Option<&'static str> {
    let colour = match verdict {
        "over" => "\u{1b}[31m",
        "thin" => "\u{1b}[33m",
        "ok" => "\u{1b}[32m",
        _ => "\u{1b}[2m",
    };
    style.colour.then_some(colour)
}

fn bold(text: &str, style: Style) -> String {
    if style.colour {
        format!("\u{1b}[1m{text}\u{1b}[0m")
    } else {
        text.to_owned()
    }
}
