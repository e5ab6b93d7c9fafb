//! The margin report as one self-contained page to sign: no script, nothing fetched, every text
//! escaped. Must not know how a margin was computed.

mod labels;
mod ladder;
mod plot;
mod scale;
mod words;

use std::fmt::{self, Write};

use crate::curves::{Kind, Picture};
use crate::finding::{BuildReport, Margin, PolicyReport, Report, Verdict};

use super::escape::xml as plain;
use super::figure::figure;
use super::margins::{Row, assumptions, governing_of, groups, purchase, tally, waived};
use super::message::{build_name, listed, part_name, would_pass};
use super::run::Run;
use super::{CAUTION, UNSETTLED};

/// The page allows itself its own style and drawings, and nothing else.
const HEAD: &str = concat!(
    r#"<!DOCTYPE html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; img-src data:">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>derate: margins</title>
<style>
"#,
    include_str!("html/style.css"),
    "</style>\n</head>\n<body>\n"
);

/// The margins of a run.
#[must_use]
pub fn margins(run: &Run) -> String {
    super::text(|out| write_margins(out, run))
}

fn write_margins(out: &mut String, run: &Run) -> fmt::Result {
    out.write_str(HEAD)?;
    writeln!(
        out,
        "<main>\n<h1>Margins</h1>\n<p>{}</p>",
        plain(&run.counts.line())
    )?;
    verdicts(out, run)?;
    writeln!(out, "<p class=\"caution\">{}</p>", plain(CAUTION))?;
    out.write_str(
        "<div class=\"sign\"><div>reviewed by</div><div>signature</div><div>date</div></div>\n",
    )?;
    let mut pictures = 0;
    for outcome in &run.outcomes {
        let file = outcome
            .sources
            .iter()
            .next()
            .map(|(_, f)| f.name.as_str())
            .unwrap_or_default();
        for build in &outcome.report.builds {
            section(out, file, build, &outcome.report)?;
            drawn(out, build, &mut pictures)?;
            out.write_str("</section>\n")?;
        }
    }
    out.write_str("</main>\n</body>\n</html>\n")
}

/// The verdict of every build, one line each.
fn verdicts(out: &mut String, run: &Run) -> fmt::Result {
    let headings = [
        "build",
        "verdict",
        "governed by",
        "used",
        "margins",
        "policy",
    ];
    out.write_str("<table>\n<thead><tr>")?;
    for heading in headings {
        write!(out, "<th scope=\"col\">{heading}</th>")?;
    }
    out.write_str("</tr></thead>\n<tbody>\n")?;
    for outcome in &run.outcomes {
        for build in &outcome.report.builds {
            let (verdict, class) = overall(build);
            let governing = governing_of(build);
            let by = governing
                .map(|m| format!("{} of {}", m.rule, part_name(m)))
                .unwrap_or_default();
            let used = governing.map(|m| Row::of(m).used).unwrap_or_default();
            let policy = format!("{}, duty {}", build.policy, build.duty);
            let cells = [
                build_name(build),
                verdict.to_owned(),
                by,
                used,
                tally(build),
                policy,
            ];
            out.write_str("<tr>")?;
            for (at, (cell, heading)) in cells.iter().zip(headings).enumerate() {
                let class = if at == 1 {
                    format!(" class=\"{class}\"")
                } else {
                    String::new()
                };
                write!(out, "<td{class} data-h=\"{heading}\">{}</td>", plain(cell))?;
            }
            out.write_str("</tr>\n")?;
        }
    }
    out.write_str("</tbody></table>\n")
}

/// What a build comes to, in words: nothing that is unchecked passes silently.
fn overall(build: &BuildReport) -> (&'static str, &'static str) {
    let open = |v: Verdict| {
        build
            .margins
            .iter()
            .any(|m| m.verdict == v && m.waiver.is_none())
    };
    if !build.settled {
        ("not solved", "over")
    } else if open(Verdict::Over) {
        ("over a rating", "over")
    } else if open(Verdict::Thin) {
        ("within ratings, past an allowance", "thin")
    } else if open(Verdict::Unchecked) {
        ("within every allowance that could be checked", "ok")
    } else {
        ("within every allowance", "ok")
    }
}

fn section(out: &mut String, file: &str, build: &BuildReport, report: &Report) -> fmt::Result {
    writeln!(
        out,
        "<section>\n<h2>{} <small>{}</small></h2>\n<p>{}</p>",
        plain(&build_name(build)),
        plain(file),
        plain(&tally(build))
    )?;
    if !build.settled {
        writeln!(out, "<p class=\"over\">{UNSETTLED}</p>")?;
    }
    table(out, build)?;
    let waived = waived(build, report);
    notes(out, &format!("Waived: {}", waived.len()), &waived)?;
    let unchecked = unchecked(build);
    notes(out, &format!("Unchecked: {}", unchecked.len()), &unchecked)?;
    notes(
        out,
        "Assumed, because the file does not state it",
        &assumptions(build),
    )?;
    let own = report
        .policies
        .iter()
        .find(|p| p.name == build.policy)
        .map(own_lines)
        .unwrap_or_default();
    notes(
        out,
        &format!("Policy {}, duty {}", build.policy, build.duty),
        &own,
    )
}

/// The lines of a policy that differ from the built-in figures.
fn own_lines(policy: &PolicyReport) -> Vec<String> {
    let own = policy.entries.iter().filter(|e| e.site.is_some());
    let mut lines: Vec<String> = own
        .map(|e| format!("{}: {}", e.rule, figure(e.allowance)))
        .collect();
    lines.push(match &policy.from {
        Some(from) => format!("every other line as in {from}"),
        None => {
            "the built-in allowances; derate explain RULE gives each with its source".to_owned()
        }
    });
    lines
}

/// What could not be checked, and for want of what.
fn unchecked(build: &BuildReport) -> Vec<String> {
    let open = build
        .margins
        .iter()
        .filter(|m| m.verdict == Verdict::Unchecked && m.waiver.is_none());
    open.map(|m| {
        let why = [
            (!m.needs.is_empty()).then(|| format!("needs {}", listed(&m.needs))),
            Some(m.note.clone()),
        ];
        let why: Vec<String> = why
            .into_iter()
            .flatten()
            .filter(|w| !w.is_empty())
            .collect();
        format!("{} of {}: {}", m.rule, part_name(m), why.join("; "))
    })
    .collect()
}

/// By part, worst first; what is waived or unchecked stands apart.
fn table(out: &mut String, build: &BuildReport) -> fmt::Result {
    out.write_str("<table>\n<thead><tr>")?;
    for (index, heading) in Row::HEADINGS.iter().enumerate() {
        write!(out, "<th scope=\"col\"{}>{heading}</th>", class(index))?;
    }
    out.write_str("</tr></thead>\n")?;
    for group in groups(build) {
        let shown: Vec<&Margin> = group
            .margins
            .iter()
            .copied()
            .filter(|m| ranked(m))
            .collect();
        let Some(first) = shown.first() else { continue };
        writeln!(
            out,
            "<tbody><tr><th colspan=\"8\" scope=\"rowgroup\">{} <small>{}</small></th></tr>",
            plain(&group.name),
            plain(&purchase(first))
        )?;
        // what compares no numbers and is right needs no line of its own
        let (plainly, numbers): (Vec<&Margin>, Vec<&Margin>) = shown
            .into_iter()
            .partition(|m| m.verdict == Verdict::Ok && m.stress.is_none());
        for margin in numbers {
            row(out, build, margin)?;
        }
        agreed(out, &plainly)?;
        out.write_str("</tbody>\n")?;
    }
    out.write_str("</table>\n")
}

/// What is plainly right, on one line: `bom.quantity; supply.bypass-stuck (the thermal fuse opens)`.
fn agreed(out: &mut String, margins: &[&Margin]) -> fmt::Result {
    if margins.is_empty() {
        return Ok(());
    }
    let said = |m: &&Margin| match m.note.as_str() {
        "" => m.rule.to_owned(),
        note => format!("{} ({note})", m.rule),
    };
    let text = margins.iter().map(said).collect::<Vec<_>>().join("; ");
    writeln!(
        out,
        "<tr><td colspan=\"8\" class=\"at wide\"><span class=\"ok\">ok</span> without figures: {}</td></tr>",
        plain(&text)
    )
}

fn ranked(margin: &Margin) -> bool {
    margin.verdict != Verdict::Unchecked && margin.waiver.is_none()
}

fn row(out: &mut String, build: &BuildReport, margin: &Margin) -> fmt::Result {
    out.write_str("<tr>")?;
    for (index, (cell, heading)) in Row::of(margin)
        .cells()
        .iter()
        .zip(Row::HEADINGS)
        .enumerate()
    {
        let class = if index == 6 {
            verdict_class(margin.verdict)
        } else {
            class(index)
        };
        let named = if index == 7 { "worst at" } else { heading };
        write!(out, "<td{class} data-h=\"{named}\">{}</td>", plain(cell))?;
    }
    out.write_str("</tr>\n")?;
    let past = matches!(margin.verdict, Verdict::Over | Verdict::Thin);
    let rule = super::rule(margin.rule).filter(|_| past);
    if let Some(pass) = rule.and_then(|rule| would_pass(rule, margin, build)) {
        writeln!(
            out,
            "<tr><td colspan=\"8\" class=\"at wide pass\">would pass: {}</td></tr>",
            plain(&pass.replace('`', ""))
        )?;
    }
    Ok(())
}

fn class(column: usize) -> &'static str {
    if (1..=5).contains(&column) {
        " class=\"n\""
    } else if column == 7 {
        " class=\"at\""
    } else {
        ""
    }
}

fn verdict_class(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Ok => " class=\"ok\"",
        Verdict::Unchecked => " class=\"unchecked\"",
        Verdict::Thin => " class=\"thin\"",
        Verdict::Over => " class=\"over\"",
    }
}

fn notes(out: &mut String, title: &str, lines: &[String]) -> fmt::Result {
    if lines.is_empty() {
        return Ok(());
    }
    writeln!(out, "<h3>{}</h3>\n<ul>", plain(title))?;
    for line in lines {
        writeln!(out, "<li>{}</li>", plain(line))?;
    }
    out.write_str("</ul>\n")
}

/// The pictures of a build, where they were asked for.
fn drawn(out: &mut String, build: &BuildReport, count: &mut usize) -> fmt::Result {
    let Some(pictures) = build.curves.as_ref().filter(|all| !all.is_empty()) else {
        return Ok(());
    };
    writeln!(
        out,
        "<h3 class=\"drawn\">{}: pictures</h3>\n<div class=\"pictures\">",
        plain(&build_name(build))
    )?;
    for picture in pictures {
        *count += 1;
        one(out, picture, &format!("p{count}"))?;
    }
    out.write_str("</div>\n")
}

fn one(out: &mut String, picture: &Picture, id: &str) -> fmt::Result {
    let (title, caption) = (words::title(picture), words::caption(picture));
    writeln!(out, "<figure>\n<h4>{}</h4>", plain(&title))?;
    match picture.kind {
        Kind::Ladder => ladder::draw(out, picture, id, &title, &caption)?,
        _ => plot::draw(out, picture, id, &title, &caption)?,
    }
    key(out, picture)?;
    writeln!(
        out,
        "<figcaption>{}</figcaption>\n</figure>",
        plain(&caption)
    )
}

/// Under a picture: how each line looks, and what it is.
fn key(out: &mut String, picture: &Picture) -> fmt::Result {
    let mut lines = Vec::new();
    for panel in &picture.panels {
        for (at, line) in panel.lines.iter().enumerate() {
            lines.push((plot::class(&panel.lines, at), words::key(picture, line)));
        }
    }
    if picture.kind == Kind::Ladder {
        lines = vec![
            ("l allowed".to_owned(), "allowed".to_owned()),
            ("l rating".to_owned(), "rating".to_owned()),
        ];
    }
    lines.retain(|(_, text)| !text.is_empty());
    lines.dedup();
    out.write_str("<ul class=\"key\">\n")?;
    for (class, text) in lines {
        writeln!(
            out,
            "<li><svg viewBox=\"0 0 38 10\" aria-hidden=\"true\"><path class=\"{class}\" d=\"M0 5H38\"/></svg>{}</li>",
            plain(&text)
        )?;
    }
    out.write_str("</ul>\n")
}
