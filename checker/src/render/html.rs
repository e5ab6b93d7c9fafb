//! The margin report as one self-contained page: no script, nothing fetched, every text escaped.
//! Must not know how a margin was computed.

use std::fmt::{self, Write};

use crate::finding::{BuildReport, Verdict};

use super::escape::xml as plain;
use super::margins::{Group, Row, assumptions, governed, groups, purchase, tally, waived};
use super::message::build_name;
use super::run::Run;
use super::{CAUTION, UNSETTLED};

/// The page allows itself its own style and drawings, and nothing else.
const HEAD: &str = r#"<!DOCTYPE html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; img-src data:">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>derate: margins</title>
<style>
:root { color-scheme: light dark; --line: #8884; --over: #c62828; --thin: #b26a00; --ok: #2e7d32; --unchecked: #6a6a6a; }
body { font: 15px/1.45 system-ui, sans-serif; margin: 2rem auto; max-width: 78rem; padding: 0 1rem; }
table { border-collapse: collapse; width: 100%; margin: .5rem 0 1.5rem; font-variant-numeric: tabular-nums; }
caption { text-align: left; padding: .3rem 0; }
th, td { border-bottom: 1px solid var(--line); padding: .25rem .6rem; text-align: left; vertical-align: top; }
td.n, th.n { text-align: right; white-space: nowrap; }
tbody th { padding-top: .9rem; }
.over { color: var(--over); font-weight: 600; } .thin { color: var(--thin); font-weight: 600; }
.ok { color: var(--ok); } .unchecked { color: var(--unchecked); font-style: italic; }
.caution { border-left: 4px solid var(--over); padding: .4rem .8rem; }
@media (prefers-color-scheme: dark) { :root { --over: #ff8a80; --thin: #ffc46b; --ok: #8fd694; --unchecked: #aaa; } }
</style>
</head>
<body>
"#;

/// The margins of a run.
#[must_use]
pub fn margins(run: &Run) -> String {
    super::text(|out| write_margins(out, run))
}

fn write_margins(out: &mut String, run: &Run) -> fmt::Result {
    out.write_str(HEAD)?;
    writeln!(
        out,
        "<h1>Margins</h1>\n<p>{}</p>",
        plain(&run.counts.line())
    )?;
    writeln!(out, "<p class=\"caution\">{}</p>", plain(CAUTION))?;
    for outcome in &run.outcomes {
        if let Some((_, file)) = outcome.sources.iter().next() {
            writeln!(out, "<h2>{}</h2>", plain(&file.name))?;
        }
        for build in &outcome.report.builds {
            section(out, build)?;
            notes(
                out,
                "Assumed, because the file does not state it",
                &assumptions(build),
            )?;
            notes(out, "Waived", &waived(build, &outcome.report))?;
            out.write_str("</section>\n")?;
        }
    }
    out.write_str("</body>\n</html>\n")
}

fn section(out: &mut String, build: &BuildReport) -> fmt::Result {
    writeln!(out, "<section>\n<h3>{}</h3>", plain(&build_name(build)))?;
    let about = format!(
        "policy {}, duty {}; {}; {}",
        build.policy,
        build.duty,
        tally(build),
        governed(build)
    );
    writeln!(out, "<p>{}</p>", plain(&about))?;
    if !build.settled {
        writeln!(out, "<p class=\"over\">{UNSETTLED}</p>")?;
    }
    writeln!(out, "<table>\n<thead><tr>")?;
    for (index, heading) in Row::HEADINGS.iter().enumerate() {
        writeln!(out, "<th scope=\"col\"{}>{heading}</th>", class(index))?;
    }
    writeln!(out, "</tr></thead>")?;
    for group in groups(build) {
        rows(out, &group)?;
    }
    writeln!(out, "</table>")
}

fn rows(out: &mut String, group: &Group<'_>) -> fmt::Result {
    let bought = group
        .margins
        .first()
        .map(|m| purchase(m))
        .unwrap_or_default();
    writeln!(
        out,
        "<tbody><tr><th colspan=\"8\" scope=\"rowgroup\">{} <small>{}</small></th></tr>",
        plain(&group.name),
        plain(&bought)
    )?;
    for margin in &group.margins {
        out.write_str("<tr>")?;
        for (index, cell) in Row::of(margin).cells().iter().enumerate() {
            let class = if index == 6 {
                verdict_class(margin.verdict)
            } else {
                class(index)
            };
            write!(out, "<td{class}>{}</td>", plain(cell))?;
        }
        out.write_str("</tr>\n")?;
    }
    out.write_str("</tbody>\n")
}

fn class(column: usize) -> &'static str {
    if (1..=5).contains(&column) {
        " class=\"n\""
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
    writeln!(out, "<h4>{title}</h4>\n<ul>")?;
    for line in lines {
        writeln!(out, "<li>{}</li>", plain(line))?;
    }
    out.write_str("</ul>\n")
}
