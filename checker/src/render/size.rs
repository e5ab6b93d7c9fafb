//! What each build needs, for people. Must not know how it was found.

use std::fmt::{self, Write};

use super::figure::{at_least, percent};
use super::terminal::Style;
use super::{CAUTION, escape, filled};
use crate::size::{Cell, Left, Row, Sized};

/// The headings of a row.
const HEADINGS: [&str; 5] = ["thing", "stated", "smallest that passes", "needs", "leaves"];

/// In a terminal.
#[must_use]
pub fn terminal(sized: &Sized, style: Style) -> String {
    super::text(|out| write_terminal(out, sized, style))
}

fn write_terminal(out: &mut String, sized: &Sized, style: Style) -> fmt::Result {
    for (build, rows) in by_build(sized) {
        writeln!(out, "build {}: {}", escape::terminal(build), lead(&rows))?;
        let cells: Vec<[String; 5]> = rows.iter().map(|r| cells(r)).collect();
        let width = |at: usize| {
            let all = cells
                .iter()
                .filter_map(|c| c.get(at))
                .map(|c| c.chars().count());
            all.chain([HEADINGS.get(at).map_or(0, |h| h.len())])
                .max()
                .unwrap_or(0)
        };
        let widths: Vec<usize> = (0..5).map(width).collect();
        let line = |out: &mut String, cells: &[&str]| {
            let mut text = String::from(" ");
            for (cell, width) in cells.iter().zip(&widths) {
                text.push_str(&format!(" {cell:width$} "));
            }
            writeln!(out, "{}", escape::terminal(text.trim_end()))
        };
        line(out, &HEADINGS)?;
        for (row, cells) in rows.iter().zip(&cells) {
            let cells: Vec<&str> = cells.iter().map(String::as_str).collect();
            line(out, &cells)?;
            if let Some(why) = why(row) {
                filled(out, &escape::terminal(&why), 6, style.width)?;
            }
        }
        for left in elsewhere(sized, build) {
            filled(out, &escape::terminal(&left), 2, style.width)?;
        }
        out.write_char('\n')?;
    }
    for (build, text) in &sized.pasted {
        writeln!(out, "to paste for build {}:\n", escape::terminal(build))?;
        writeln!(out, "{}", escape::source(text))?;
    }
    for (mains, cells) in by_mains(sized) {
        writeln!(out, "mains {}", escape::terminal(mains))?;
        for cell in cells {
            let text = format!(
                "{}, {}: {}",
                cell.load,
                channels(cell.channels),
                answer(cell)
            );
            filled(out, &escape::terminal(&text), 2, style.width)?;
        }
        out.write_char('\n')?;
    }
    filled(out, CAUTION, 0, style.width)
}

/// For a page or a comment.
#[must_use]
pub fn markdown(sized: &Sized) -> String {
    super::text(|out| write_markdown(out, sized))
}

fn write_markdown(out: &mut String, sized: &Sized) -> fmt::Result {
    let plain = escape::markdown;
    for (build, rows) in by_build(sized) {
        writeln!(out, "## {}\n\n{}\n", plain(build), plain(&lead(&rows)))?;
        writeln!(
            out,
            "| {} | limited by |\n|---|---|---|---|---|---|",
            HEADINGS.join(" | ")
        )?;
        for row in rows {
            let cells: Vec<String> = cells(row).iter().map(|c| plain(c)).collect();
            let why = why(row).unwrap_or_default();
            writeln!(out, "| {} | {} |", cells.join(" | "), plain(&why))?;
        }
        out.write_char('\n')?;
        for left in elsewhere(sized, build) {
            writeln!(out, "- {}", plain(&left))?;
        }
        out.write_char('\n')?;
    }
    for (build, text) in &sized.pasted {
        writeln!(out, "To paste for {}:\n", plain(build))?;
        // indented, so that nothing in it can end the block
        for line in escape::source(text).lines() {
            writeln!(out, "    {line}")?;
        }
        out.write_char('\n')?;
    }
    if !sized.cells.is_empty() {
        writeln!(
            out,
            "| mains | load | channels | answer |\n|---|---|---|---|"
        )?;
        for cell in &sized.cells {
            let (mains, load) = (plain(&cell.mains), plain(&cell.load));
            writeln!(
                out,
                "| {mains} | {load} | {} | {} |",
                cell.channels,
                plain(&answer(cell))
            )?;
        }
        out.write_char('\n')?;
    }
    writeln!(out, "> {}", plain(CAUTION))
}

fn by_build(sized: &Sized) -> Vec<(&str, Vec<&Row>)> {
    let mut out: Vec<(&str, Vec<&Row>)> = Vec::new();
    for row in &sized.rows {
        match out.iter_mut().find(|(build, _)| *build == row.build) {
            Some((_, rows)) => rows.push(row),
            None => out.push((&row.build, vec![row])),
        }
    }
    out
}

fn by_mains(sized: &Sized) -> Vec<(&str, Vec<&Cell>)> {
    let mut out: Vec<(&str, Vec<&Cell>)> = Vec::new();
    for cell in &sized.cells {
        match out.iter_mut().find(|(mains, _)| *mains == cell.mains) {
            Some((_, cells)) => cells.push(cell),
            None => out.push((&cell.mains, vec![cell])),
        }
    }
    out
}

fn lead(rows: &[&Row]) -> String {
    if rows.iter().all(|r| r.stated.is_empty()) {
        "states no supply; usual parts that pass together".to_owned()
    } else {
        "each thing alone, everything else as the file says".to_owned()
    }
}

fn cells(row: &Row) -> [String; 5] {
    let worst = row
        .margins
        .iter()
        .find_map(|m| m.used.map(|used| (m, used)));
    let leaves = match (&row.offered, worst) {
        (Some(_), Some((m, used))) => format!("{} {}", m.rule, percent(used)),
        _ => String::new(),
    };
    [
        row.item.to_owned(),
        row.stated.clone(),
        row.offered
            .clone()
            .unwrap_or_else(|| "none passes".to_owned()),
        row.needed.map(at_least).unwrap_or_default(),
        leaves,
    ]
}

/// What keeps the next smaller value, or every value, from passing.
fn why(row: &Row) -> Option<String> {
    let (value, left) = row.limited.as_ref()?;
    Some(format!("{value}: {}", named(left)))
}

fn named(left: &Left) -> String {
    match left.used {
        Some(used) => format!("{} of {} {} used", left.rule, left.part, percent(used)),
        None => {
            let verdict = super::message::verdict(left.verdict);
            format!("{} of {} is {verdict}", left.rule, left.part)
        }
    }
}

fn elsewhere<'s>(sized: &'s Sized, build: &'s str) -> impl Iterator<Item = String> + 's {
    let here = sized.elsewhere.iter().filter(move |(b, _)| b == build);
    here.map(|(_, left)| format!("not a matter of size: {}", named(left)))
}

fn channels(count: u32) -> String {
    if count == 1 {
        "one channel".to_owned()
    } else {
        format!("{count} channels")
    }
}

fn answer(cell: &Cell) -> String {
    match cell.answer {
        crate::size::Answer::Allowed => format!("allowed: {}", cell.words),
        crate::size::Answer::Condition => format!("allowed {}", cell.words),
        crate::size::Answer::Not => format!("not allowed: {}", cell.words),
    }
}
