//! Builds over random kits, for people. Must not know how they were drawn.

use std::fmt::{self, Write};

use super::figure::{number, percent};
use super::message::listed;
use super::terminal::Style;
use super::{CAUTION, escape, filled, message};
use crate::spread::{BuildSpread, MarginSpread, PERCENTILES};

/// Margins shown; the others use less.
const SHOWN: usize = 12;

fn headings() -> [String; 9] {
    let [a, b, c, d, e] = PERCENTILES.map(|p| format!("{} %", number(p)));
    [
        "margin".to_owned(),
        "worst case".to_owned(),
        a,
        b,
        c,
        d,
        e,
        "past".to_owned(),
        "moved most by".to_owned(),
    ]
}

/// In a terminal.
#[must_use]
pub fn terminal(builds: &[BuildSpread], seed: u64, style: Style) -> String {
    super::text(|out| write_terminal(out, builds, seed, style))
}

fn write_terminal(
    out: &mut String,
    builds: &[BuildSpread],
    seed: u64,
    style: Style,
) -> fmt::Result {
    for build in builds {
        filled(out, &escape::terminal(&lead(build, seed)), 0, style.width)?;
        let rows: Vec<[String; 9]> = shown(build).map(cells).collect();
        let head = headings();
        let width = |at: usize| {
            let all = rows.iter().chain([&head]).filter_map(|c| c.get(at));
            all.map(|c| c.chars().count()).max().unwrap_or(0)
        };
        for row in [&head].into_iter().chain(&rows) {
            let mut text = String::from(" ");
            for (at, cell) in row.iter().enumerate() {
                let width = width(at);
                let words = matches!(at, 0 | 8);
                text.push_str(&if words {
                    format!(" {cell:width$} ")
                } else {
                    format!(" {cell:>width$} ")
                });
            }
            writeln!(out, "{}", escape::terminal(text.trim_end()))?;
        }
        for note in notes(build) {
            filled(out, &escape::terminal(&note), 2, style.width)?;
        }
        out.write_char('\n')?;
    }
    filled(out, CAUTION, 0, style.width)
}

/// For a page or a comment.
#[must_use]
pub fn markdown(builds: &[BuildSpread], seed: u64) -> String {
    super::text(|out| write_markdown(out, builds, seed))
}

fn write_markdown(out: &mut String, builds: &[BuildSpread], seed: u64) -> fmt::Result {
    let plain = escape::markdown;
    for build in builds {
        writeln!(
            out,
            "## {}\n\n{}\n",
            plain(&build.build),
            plain(&lead(build, seed))
        )?;
        writeln!(
            out,
            "| {} |\n|---|--:|--:|--:|--:|--:|--:|--:|---|",
            headings().join(" | ")
        )?;
        for margin in shown(build) {
            let cells = cells(margin).map(|c| plain(&c));
            writeln!(out, "| {} |", cells.join(" | "))?;
        }
        out.write_char('\n')?;
        for note in notes(build) {
            writeln!(out, "- {}", plain(&note))?;
        }
        out.write_char('\n')?;
    }
    writeln!(out, "> {}", plain(CAUTION))
}

fn shown(build: &BuildSpread) -> impl Iterator<Item = &MarginSpread> {
    build.margins.iter().take(SHOWN)
}

/// A share of kits: never 100 % for what is not all, never 0 % for what is not none.
fn share(x: f64) -> String {
    if x > 0.0 && x < 0.0001 {
        return "under 0.01 %".to_owned();
    }
    if x < 1.0 && x > 0.9999 {
        return "over 99.99 %".to_owned();
    }
    format!("{} %", number(100.0 * x))
}

fn lead(build: &BuildSpread, seed: u64) -> String {
    let how = if build.modelled {
        format!(
            "{} solved in full, the others by a model of each margin",
            build.solved
        )
    } else {
        "each solved in full".to_owned()
    };
    let drawn = if build.inputs.is_empty() {
        "no line states a tolerance".to_owned()
    } else {
        format!("drawn: {}", listed(&build.inputs))
    };
    format!(
        "build {}: {} of {} kits pass, {} are within every rating; seed {seed}; {how}; {drawn}",
        build.build,
        share(build.pass.0),
        build.kits,
        share(build.pass.1)
    )
}

fn cells(m: &MarginSpread) -> [String; 9] {
    let [a, b, c, d, e] = m.percentiles.map(used);
    let by =
        m.by.as_ref()
            .map(|(name, part)| format!("{name}, {:.0} %", 100.0 * part));
    [
        format!("{} of {}", m.rule, m.part),
        format!(
            "{} {}",
            used(m.worst_case.0),
            message::verdict(m.worst_case.1)
        ),
        a,
        b,
        c,
        d,
        e,
        share(m.past.0),
        by.unwrap_or_default(),
    ]
}

fn used(x: f64) -> String {
    if x.is_finite() {
        percent(x)
    } else {
        "none left".to_owned()
    }
}

fn notes(build: &BuildSpread) -> Vec<String> {
    let mut out = Vec::new();
    if let Some(most) = build
        .margins
        .iter()
        .max_by(|a, b| a.governs.total_cmp(&b.governs))
    {
        out.push(format!(
            "{} of {} governs {} of the kits",
            most.rule,
            most.part,
            share(most.governs)
        ));
    }
    for m in build.margins.iter().filter(|m| m.disagrees()) {
        out.push(format!(
            "{} of {}: the worst case is {} at {}, yet {} of the kits are within the allowance; the verdict of a check is the worst case",
            m.rule,
            m.part,
            message::verdict(m.worst_case.1),
            used(m.worst_case.0),
            share(1.0 - m.past.0)
        ));
    }
    for m in build.margins.iter().filter(|m| m.beyond()) {
        out.push(format!(
            "{} of {}: a kit uses {}, more than the {} of the worst case that a check takes",
            m.rule,
            m.part,
            used(m.range.1),
            used(m.worst_case.0)
        ));
    }
    for (part, rule, verdict) in &build.fixed {
        out.push(format!(
            "{rule} of {part} is {} in every kit: no tolerance moves it",
            message::verdict(*verdict)
        ));
    }
    if build.modelled {
        let most = build
            .margins
            .iter()
            .max_by(|a, b| a.error.total_cmp(&b.error));
        out.extend(most.map(|m| {
            format!(
                "greatest error of a model against full solutions at random places: {} points of used, {} of {}; where a figure lies within three times the error of its margin from a limit, the kit is solved in full",
                number(m.error),
                m.rule,
                m.part
            )
        }));
    }
    if build.margins.len() > SHOWN {
        out.push(format!(
            "{} more margins use less",
            build.margins.len() - SHOWN
        ));
    }
    out
}
