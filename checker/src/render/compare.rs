//! What moved between two checks, for people: in a terminal, and as a comment on a pull request.
//! Must not know how a margin was computed, nor what counts as moved.

use std::fmt::{self, Write};

use crate::compare::{Build, Comparison, Counts, Course, FIGURE, Figure, Row, State, substituted};
use crate::finding::{BuildReport, Corner, Derived, Margin, Verdict};

use super::escape::{self, markdown as plain, markdown_code as code};
use super::figure::{apart, figure, percent};
use super::margins::purchase;
use super::message::{self, build_name, part_name, points, worst_at};
use super::run::severity;
use super::table::Table;
use super::terminal::Style;
use super::{CAUTION, filled};

const RED: &str = "\u{1b}[31m";
const GREEN: &str = "\u{1b}[32m";

/// What stands in the columns of a margin: before and after are stress, allowance and verdict.
const HEADINGS: [&str; 6] = [
    "rule",
    "before",
    "after",
    "used before",
    "used after",
    "rise",
];

/// Which columns hold numbers.
const NUMBERS: [bool; 6] = [false, false, false, true, true, true];

/// The comparison for a terminal; `all` shows also what did not move.
#[must_use]
pub fn terminal(comparison: &Comparison<'_>, all: bool, style: Style) -> String {
    super::text(|out| write_terminal(out, comparison, all, style))
}

fn write_terminal(
    out: &mut String,
    comparison: &Comparison<'_>,
    all: bool,
    style: Style,
) -> fmt::Result {
    for build in shown(comparison, all) {
        writeln!(out, "{}", escape::terminal(&heading(build)))?;
        for (name, rows) in groups(build, all) {
            writeln!(out, "  {}", escape::terminal(&name))?;
            let mut table = Table::new(HEADINGS, NUMBERS);
            for row in &rows {
                table.row(cells(row), tint(row.course));
            }
            table.write(out, 4, style)?;
            for row in rows.iter().filter(|r| r.course == Course::Worse) {
                if let Some(why) = row.after.and_then(why) {
                    filled(out, &escape::terminal(&why), 6, style.width)?;
                }
            }
        }
        if !build.figures.is_empty() {
            writeln!(out, "  figures")?;
            let mut table = Table::new(["figure", "before", "after"], [false, true, true]);
            for one in &build.figures {
                table.row(figure_cells(one), None);
            }
            table.write(out, 4, style)?;
        }
        out.write_char('\n')?;
    }
    for said in &comparison.said {
        let line = said_line(
            said.state,
            severity(said.severity),
            said.rule,
            &said.message,
        );
        writeln!(out, "{}", escape::terminal(&line))?;
    }
    writeln!(out, "{}", escape::terminal(&total(comparison)))
}

/// The comparison as a comment on a pull request.
#[must_use]
pub fn markdown(comparison: &Comparison<'_>, all: bool) -> String {
    super::text(|out| write_markdown(out, comparison, all))
}

fn write_markdown(out: &mut String, comparison: &Comparison<'_>, all: bool) -> fmt::Result {
    writeln!(out, "### derate compare: {}\n", plain(&total(comparison)))?;
    for build in shown(comparison, all) {
        writeln!(out, "**{}**\n", plain(&heading(build)))?;
        let groups = groups(build, all);
        if !groups.is_empty() {
            writeln!(out, "| part | {} | worst at |", HEADINGS.join(" | "))?;
            writeln!(out, "|---|---|---|---|--:|--:|--:|---|")?;
        }
        for (name, rows) in groups {
            for (index, row) in rows.iter().enumerate() {
                let part = if index == 0 {
                    plain(&name)
                } else {
                    String::new()
                };
                let [rule, rest @ ..] = cells(row);
                let rest = rest.map(|c| plain(&c)).join(" | ");
                let at = row.after.and_then(why).unwrap_or_default();
                writeln!(
                    out,
                    "| {part} | {} | {rest} | {} |",
                    code(&rule),
                    plain(&at)
                )?;
            }
        }
        if !build.figures.is_empty() {
            writeln!(out, "\n| figure | before | after |\n|---|--:|--:|")?;
            for one in &build.figures {
                writeln!(
                    out,
                    "| {} |",
                    figure_cells(one).map(|c| plain(&c)).join(" | ")
                )?;
            }
        }
        out.write_char('\n')?;
    }
    for said in &comparison.said {
        let line = said_line(
            said.state,
            severity(said.severity),
            said.rule,
            &said.message,
        );
        writeln!(out, "- {}", plain(&line))?;
    }
    writeln!(out, "\n{}\n\n{CAUTION}", plain(&threshold(comparison)))
}

/// The builds in which there is something to show.
fn shown<'c, 'a>(comparison: &'c Comparison<'a>, all: bool) -> impl Iterator<Item = &'c Build<'a>> {
    comparison.builds.iter().filter(move |b| all || b.any())
}

/// `build mono`, and whether only one side has it.
fn heading(build: &Build<'_>) -> String {
    let name = build.report().map(build_name).unwrap_or_default();
    let mut text = match (build.before, build.after) {
        (None, _) => format!("build {name} (new)"),
        (_, None) => format!("build {name} (gone)"),
        _ => format!("build {name}"),
    };
    let policy = |b: Option<&BuildReport>| b.map(|b| (b.policy.clone(), b.duty.clone()));
    if let Some(((was, before), (now, after))) = policy(build.before).zip(policy(build.after)) {
        if was != now {
            text.push_str(&format!("; policy {now}, was {was}"));
        }
        if before != after {
            text.push_str(&format!("; duty {after}, was {before}"));
        }
    }
    if build.after.is_some_and(|b| !b.settled) {
        text.push_str("; the coupled solution did not settle");
    }
    text
}

/// Rows by part, the part with the worst row first.
fn groups<'c, 'a>(build: &'c Build<'a>, all: bool) -> Vec<(String, Vec<&'c Row<'a>>)> {
    let mut groups: Vec<(String, Vec<&Row<'_>>)> = Vec::new();
    for row in build.rows.iter().filter(|r| all || r.state != State::Same) {
        let name = name(row);
        match groups.iter_mut().find(|g| g.0 == name) {
            Some(group) => group.1.push(row),
            None => groups.push((name, vec![row])),
        }
    }
    groups
}

/// `n18 of out, was n16 (Q7-Q10; 2 in the build; N18-Y)`.
fn name(row: &Row<'_>) -> String {
    let Some(margin) = row.margin() else {
        return String::new();
    };
    let mut text = part_name(margin);
    if let Some((before, after)) = row.before.zip(row.after)
        && substituted(&before.part, &after.part)
    {
        let code = |m: &Margin| m.part.order_code.clone();
        let was = if before.part.name == after.part.name {
            code(before).unwrap_or_default()
        } else {
            before.part.name.clone()
        };
        text.push_str(&format!(", was {was}"));
    }
    let bought = purchase(margin);
    if !bought.is_empty() {
        text.push_str(&format!(" ({bought})"));
    }
    text
}

fn cells(row: &Row<'_>) -> [String; 6] {
    let side = |m: Option<&Margin>| m.map_or("-".to_owned(), held);
    let used = |m: Option<&Margin>| {
        m.and_then(|m| m.used_percent)
            .map(percent)
            .unwrap_or_default()
    };
    let rise = match (row.state, row.rise()) {
        (State::New, _) => "new".to_owned(),
        (State::Gone, _) => "gone".to_owned(),
        (_, Some(rise)) => format!("{}{}", if rise > 0.0 { "+" } else { "" }, points(rise)),
        (_, None) => String::new(),
    };
    [
        row.margin().map(|m| m.rule.to_owned()).unwrap_or_default(),
        side(row.before),
        side(row.after),
        used(row.before),
        used(row.after),
        rise,
    ]
}

/// `677 mW / 1.8 W ok`: what the part sees, what it is allowed, the verdict.
fn held(margin: &Margin) -> String {
    let numbers = margin
        .stress
        .zip(margin.allowance)
        .map(|(stress, allowance)| {
            let (stress, allowance) = apart(stress, allowance);
            format!("{stress} / {allowance} ")
        });
    format!("{}{}", numbers.unwrap_or_default(), verdict(margin))
}

fn verdict(margin: &Margin) -> String {
    let word = message::verdict(margin.verdict);
    if margin.waiver.is_some() {
        format!("{word}, waived")
    } else {
        word.to_owned()
    }
}

/// Where a margin that is not ok is worst, or what it waits for.
fn why(margin: &Margin) -> Option<String> {
    if margin.verdict == Verdict::Ok {
        return None;
    }
    let needs =
        (!margin.needs.is_empty()).then(|| format!("needs {}", message::listed(&margin.needs)));
    let said = [worst_at(&margin.witness), margin.note.clone()];
    let said: Vec<String> = needs
        .into_iter()
        .chain(said)
        .filter(|s| !s.is_empty())
        .collect();
    (!said.is_empty()).then(|| format!("{}: {}", margin.rule, said.join("; ")))
}

fn tint(course: Course) -> Option<&'static str> {
    match course {
        Course::Worse => Some(RED),
        Course::Better => Some(GREEN),
        Course::Level => None,
    }
}

fn figure_cells(one: &Figure<'_>) -> [String; 3] {
    let (before, after) = match (one.before, one.after) {
        (Some(b), Some(a)) => apart(b.value, a.value),
        (b, a) => {
            let text = |d: Option<&Derived>| d.map_or("-".to_owned(), |d| figure(d.value));
            (text(b), text(a))
        }
    };
    let name = one.after.or(one.before).map(|d| {
        let Corner { mains, drive, .. } = d.corner;
        let of = if d.of.is_empty() {
            String::new()
        } else {
            format!(" of {}", d.of)
        };
        format!("{}{of}, {mains} mains, {drive}", d.name)
    });
    [name.unwrap_or_default(), before, after]
}

fn said_line(state: State, severity: &str, rule: &str, message: &str) -> String {
    let state = if state == State::New { "new" } else { "gone" };
    format!("{state} {severity} {rule}: {message}")
}

/// `a.ampspec with b.ampspec: 3 worse (1 error, ...), 2 better, 1 new, 0 gone, 86 alike`.
#[must_use]
pub fn total(comparison: &Comparison<'_>) -> String {
    let name = |o: &crate::Outcome| {
        o.sources
            .iter()
            .next()
            .map(|(_, f)| f.name.clone())
            .unwrap_or_default()
    };
    let both = format!("{} -> {}", name(comparison.old), name(comparison.new));
    if !comparison.any() {
        let same = comparison.counts().same;
        return format!("{both}: nothing moved ({same} margins alike)");
    }
    let Counts {
        worse,
        error,
        warning,
        unchecked,
        better,
        new,
        gone,
        same,
        ..
    } = comparison.counts();
    let plural = |n: usize, one: &str| format!("{n} {one}{}", if n == 1 { "" } else { "s" });
    format!(
        "{both}: {worse} worse ({}, {}, {unchecked} unchecked), {better} better, {new} new, {gone} gone, {same} alike",
        plural(error, "error"),
        plural(warning, "warning")
    )
}

/// What counts as moved, in words.
#[must_use]
pub fn threshold(comparison: &Comparison<'_>) -> String {
    format!(
        "A margin has moved when its verdict differs or its share of the allowance by more than {} points; \
         a figure when it differs by more than {} %.",
        points(comparison.points),
        100.0 * FIGURE
    )
}
