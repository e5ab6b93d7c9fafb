//! The margins as a test report in the XML that build services read: a suite for each build, a case
//! for each margin, and a suite for what is wrong with text and data.
//! Must not know how a margin was computed.

use std::fmt::{self, Write};

use crate::Outcome;
use crate::finding::{BuildReport, Margin, Severity, Verdict, Waiver};

use super::escape::xml as plain;
use super::message::{self, build_name, part_name};
use super::run::{FailOn, Run, severity};
use super::shown::{Origin, shown};

/// Why a finding of the baseline does not fail.
const KNOWN: &str = "known: in the baseline";

/// How a case ended.
enum End {
    Pass,
    Fail(&'static str, String),
    Skip(String),
}

struct Case {
    class: String,
    name: String,
    end: End,
}

/// The report of a run.
#[must_use]
pub fn check(run: &Run) -> String {
    super::text(|out| write_check(out, run))
}

fn write_check(out: &mut String, run: &Run) -> fmt::Result {
    let mut suites: Vec<(String, Vec<Case>)> = Vec::new();
    for outcome in &run.outcomes {
        let file = outcome
            .sources
            .iter()
            .next()
            .map(|(_, f)| f.name.clone())
            .unwrap_or_default();
        suites.push((file.clone(), texts(outcome, &file, run.fail_on)));
        for build in &outcome.report.builds {
            let name = format!("{file}: {}", build_name(build));
            let cases = build
                .margins
                .iter()
                .map(|m| case(outcome, &name, build, m, run.fail_on))
                .collect();
            suites.push((name, cases));
        }
    }
    let all = || suites.iter().flat_map(|s| &s.1);
    writeln!(out, "<?xml version=\"1.0\" encoding=\"UTF-8\"?>")?;
    writeln!(out, "<testsuites name=\"derate\" {}>", totals(all()))?;
    for (name, cases) in &suites {
        writeln!(
            out,
            "  <testsuite name=\"{}\" {}>",
            plain(name),
            totals(cases.iter())
        )?;
        for case in cases {
            write_case(out, case)?;
        }
        writeln!(out, "  </testsuite>")?;
    }
    writeln!(out, "</testsuites>")
}

fn totals<'a>(cases: impl Iterator<Item = &'a Case> + Clone) -> String {
    let failed = cases
        .clone()
        .filter(|c| matches!(c.end, End::Fail(..)))
        .count();
    let skipped = cases
        .clone()
        .filter(|c| matches!(c.end, End::Skip(_)))
        .count();
    format!(
        "tests=\"{}\" failures=\"{failed}\" errors=\"0\" skipped=\"{skipped}\"",
        cases.count()
    )
}

fn write_case(out: &mut String, case: &Case) -> fmt::Result {
    write!(
        out,
        "    <testcase classname=\"{}\" name=\"{}\"",
        plain(&case.class),
        plain(&case.name)
    )?;
    match &case.end {
        End::Pass => writeln!(out, "/>"),
        End::Skip(why) => writeln!(out, "><skipped message=\"{}\"/></testcase>", plain(why)),
        End::Fail(kind, why) => {
            let first = why.lines().next().unwrap_or("");
            writeln!(
                out,
                "><failure type=\"{kind}\" message=\"{}\">{}</failure></testcase>",
                plain(first),
                plain(why)
            )
        }
    }
}

/// What is wrong with text and data; one passed case where nothing is.
fn texts(outcome: &Outcome, file: &str, fail_on: FailOn) -> Vec<Case> {
    let all = shown(&outcome.sources, &outcome.report);
    let mut cases: Vec<Case> = Vec::new();
    for one in all.iter().filter(|s| matches!(s.origin, Origin::Text(_))) {
        let place = outcome.sources.file(one.site.file);
        let line = place.map_or(0, |f| {
            f.tree.line_index().position(one.site.span.start).line
        });
        let name = place.map_or("", |f| &f.name);
        let text = format!("{}\n{}", one.message, one.help());
        cases.push(Case {
            class: file.to_owned(),
            name: format!("{} at {name}:{line}", one.rule),
            end: if one.known {
                End::Skip(KNOWN.to_owned())
            } else {
                end(one.severity, one.waiver, fail_on, text)
            },
        });
    }
    if cases.is_empty() {
        cases.push(Case {
            class: file.to_owned(),
            name: "text and data".to_owned(),
            end: End::Pass,
        });
    }
    cases
}

fn end(severity_of: Severity, waiver: Option<&Waiver>, fail_on: FailOn, text: String) -> End {
    let fails = severity_of == Severity::Error
        || (severity_of == Severity::Warning && fail_on != FailOn::Error);
    match waiver {
        Some(waiver) => End::Skip(format!("waived: {}", waiver.reason)),
        None if fails => End::Fail(severity(severity_of), text),
        None => End::Pass,
    }
}

fn case(outcome: &Outcome, suite: &str, build: &BuildReport, m: &Margin, fail_on: FailOn) -> Case {
    let report = &outcome.report;
    let text = || message::whole(super::rule(m.rule), m, build);
    let waiver = m.waiver.and_then(|at| report.waivers.get(at));
    let end = match (m.verdict, waiver) {
        (Verdict::Ok, _) => End::Pass,
        (_, Some(waiver)) => End::Skip(format!("waived: {}", waiver.reason)),
        _ if m.known => End::Skip(KNOWN.to_owned()),
        (Verdict::Unchecked, None) if fail_on == FailOn::Unchecked => {
            End::Fail("unchecked", text())
        }
        (Verdict::Unchecked, None) => End::Skip(text()),
        (Verdict::Thin | Verdict::Over, None) => end(m.severity, None, fail_on, text()),
    };
    Case {
        class: suite.to_owned(),
        name: format!("{} of {}", m.rule, part_name(m)),
        end,
    }
}
