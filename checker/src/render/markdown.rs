//! Findings and margins as Markdown, fit for a comment on a pull request.
//! Must not know what a finding is about.

use std::fmt::{self, Write};

use crate::finding::{BuildReport, Margin, Related, Verdict, WaiverState};
use crate::source::Sources;

use super::escape::{markdown as plain, markdown_code as code, markdown_words as words};
use super::margins::{Row, assumptions, governed, groups, purchase, tally, waived};
use super::message::{build_name, part_name, proposed, would_pass};
use super::run::{Run, severity};
use super::shown::{Origin, Placed, Shown};
use super::{CAUTION, UNSETTLED};

/// Most characters of a comment; the services that take them stop at 65 536.
const MOST: usize = 60_000;

/// The findings of a run.
#[must_use]
pub fn check(run: &Run) -> String {
    super::text(|out| write_check(out, run))
}

fn write_check(out: &mut String, run: &Run) -> fmt::Result {
    writeln!(out, "### derate: {}\n", plain(&run.counts.line()))?;
    let all: Vec<_> = run.shown().filter(|(_, s)| s.open()).collect();
    let mut said = String::new();
    let mut told = 0;
    for (outcome, one) in &all {
        let mut entry = String::new();
        finding(&mut entry, &outcome.sources, one)?;
        if said.len() + entry.len() > MOST {
            break;
        }
        said.push_str(&entry);
        told += 1;
    }
    out.write_str(&said)?;
    if told < all.len() {
        writeln!(
            out,
            "\n{} more are not shown here; `derate check` lists all.",
            all.len() - told
        )?;
    }
    let honoured = run
        .outcomes
        .iter()
        .flat_map(|o| &o.report.waivers)
        .filter(|w| w.state == WaiverState::Honoured);
    for waiver in honoured {
        writeln!(
            out,
            "- waived: {}: {}",
            code(&waiver.rule),
            plain(&waiver.reason)
        )?;
    }
    for line in run.stale_lines() {
        writeln!(out, "- {}", plain(&line))?;
    }
    Ok(())
}

fn finding(out: &mut String, sources: &Sources, one: &Shown<'_>) -> fmt::Result {
    let file = sources.file(one.site.file);
    let line = file.map_or(0, |f| {
        f.tree.line_index().position(one.site.span.start).line
    });
    let name = file.map_or("", |f| &f.name);
    let level = severity(one.severity);
    writeln!(
        out,
        "- **{level}** {} {}: {}",
        code(one.rule),
        code(&format!("{name}:{line}")),
        words(&one.message)
    )?;
    if let Some(parts) = parts(one) {
        writeln!(out, "  - *part:* {}", plain(&parts))?;
    }
    for detail in &one.details {
        let lead = if detail.label.is_empty() {
            String::new()
        } else {
            format!("*{}:* ", detail.label)
        };
        writeln!(out, "  - {lead}{}", words(&detail.text))?;
    }
    if let Origin::Margins(group) = &one.origin
        && let Some(Placed { build, margin }) = group.first()
    {
        for change in margin.changes.iter().skip(1) {
            writeln!(out, "  - *or:* {}", words(&proposed(change, build)))?;
        }
    }
    if !one.related.is_empty() {
        let related: Vec<String> = one.related.iter().map(|r| place(sources, r)).collect();
        writeln!(out, "  - *see:* {}", related.join("; "))?;
    }
    Ok(())
}

/// What is known of the parts that a finding is about: designators, how many, order code.
fn parts(one: &Shown<'_>) -> Option<String> {
    let Origin::Margins(group) = &one.origin else {
        return None;
    };
    let mut said: Vec<String> = Vec::new();
    for Placed { margin, .. } in group {
        let bought = purchase(margin);
        let line = format!("{}: {bought}", part_name(margin));
        if !bought.is_empty() && !said.contains(&line) {
            said.push(line);
        }
    }
    (!said.is_empty()).then(|| said.join(". "))
}

/// `kit.ampspec:98` and what it contributed.
fn place(sources: &Sources, related: &Related) -> String {
    let file = sources.file(related.site.file);
    let line = file.map_or(0, |f| {
        f.tree.line_index().position(related.site.span.start).line
    });
    let name = file.map_or("", |f| &f.name);
    format!(
        "{} {}",
        code(&format!("{name}:{line}")),
        words(&related.message)
    )
}

/// The margin summary: a table for each build, folded away where nothing is past its allowance.
#[must_use]
pub fn margins(run: &Run) -> String {
    super::text(|out| write_margins(out, run))
}

fn write_margins(out: &mut String, run: &Run) -> fmt::Result {
    writeln!(out, "### derate margins: {}\n", plain(&run.counts.line()))?;
    let mut length = 0;
    let mut left_out: Vec<String> = Vec::new();
    for outcome in &run.outcomes {
        for build in &outcome.report.builds {
            let mut text = String::new();
            table(&mut text, build)?;
            remedies(&mut text, build)?;
            for line in assumptions(build) {
                writeln!(text, "- assumed: {}", plain(&line))?;
            }
            for line in waived(build, &outcome.report) {
                writeln!(text, "- waived: {}", plain(&line))?;
            }
            length += text.len();
            if length > MOST {
                left_out.push(build_name(build));
                continue;
            }
            writeln!(out, "{text}")?;
        }
    }
    if !left_out.is_empty() {
        writeln!(
            out,
            "Too long for one comment, not shown: {}.\n",
            plain(&left_out.join(", "))
        )?;
    }
    writeln!(out, "{CAUTION}")
}

/// What would clear each margin that is past its allowance.
fn remedies(out: &mut String, build: &BuildReport) -> fmt::Result {
    for margin in groups(build).iter().flat_map(|g| &g.margins) {
        let past =
            matches!(margin.verdict, Verdict::Over | Verdict::Thin) && margin.waiver.is_none();
        let text = super::rule(margin.rule)
            .filter(|_| past)
            .and_then(|rule| would_pass(rule, margin, build));
        if let Some(text) = text {
            let (part, rule) = (plain(&part_name(margin)), code(margin.rule));
            writeln!(out, "- {part} {rule} would pass: {}", words(&text))?;
        }
    }
    Ok(())
}

fn table(out: &mut String, build: &BuildReport) -> fmt::Result {
    let head = format!("{}: {}", build_name(build), tally(build));
    let past =
        |m: &Margin| matches!(m.verdict, Verdict::Over | Verdict::Thin) && m.waiver.is_none();
    let open = if build.margins.iter().any(past) {
        " open"
    } else {
        ""
    };
    writeln!(out, "<details{open}><summary>{}</summary>\n", plain(&head))?;
    writeln!(
        out,
        "Policy {}, duty {}; {}.\n",
        code(&build.policy),
        plain(&build.duty),
        plain(&governed(build))
    )?;
    if !build.settled {
        writeln!(out, "**{UNSETTLED}**\n")?;
    }
    writeln!(out, "| part | {} |", Row::HEADINGS.join(" | "))?;
    writeln!(out, "|---|---|--:|--:|--:|--:|--:|---|---|")?;
    for group in groups(build) {
        for (index, margin) in group.margins.iter().enumerate() {
            let bought = purchase(margin);
            let bought = if bought.is_empty() {
                bought
            } else {
                format!(" ({bought})")
            };
            let part = if index == 0 {
                plain(&format!("{}{bought}", group.name))
            } else {
                String::new()
            };
            let row = Row::of(margin);
            let [rule, cells @ ..] = row.cells();
            let cells: Vec<String> = cells.iter().map(|c| plain(c)).collect();
            writeln!(out, "| {part} | {} | {} |", code(rule), cells.join(" | "))?;
        }
    }
    writeln!(out, "\n</details>\n")
}
