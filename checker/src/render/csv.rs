//! Every margin as one line of comma-separated values after RFC 4180, safe to open in a spreadsheet.
//! Must not know how a margin was computed.

use std::fmt::{self, Write};

use crate::finding::Measure;

use super::escape;
use super::message::{self, worst_at};
use super::run::Run;

/// The headings, in the order of the cells.
const HEADINGS: [&str; 23] = [
    "file",
    "build",
    "alternate",
    "policy",
    "part",
    "block",
    "key",
    "refs",
    "quantity",
    "order code",
    "rule",
    "verdict",
    "severity",
    "waived because",
    "stress",
    "allowed",
    "rating",
    "unit",
    "used %",
    "margin points",
    "line",
    "worst at",
    "needs",
];

/// The table of a run.
#[must_use]
pub fn margins(run: &Run) -> String {
    super::text(|out| write_margins(out, run))
}

fn write_margins(out: &mut String, run: &Run) -> fmt::Result {
    line(out, HEADINGS.iter().copied())?;
    for (outcome, placed) in run.margins() {
        let (build, m) = (placed.build, placed.margin);
        let file = outcome.sources.file(m.site.file);
        let number = |x: Option<f64>| x.map(digits).unwrap_or_default();
        let value = |x: Option<Measure>| number(x.map(|x| x.value));
        let waiver = m.waiver.and_then(|at| outcome.report.waivers.get(at));
        let cells = [
            file.map(|f| f.name.clone()).unwrap_or_default(),
            build.name.clone(),
            build.alternate.clone().unwrap_or_default(),
            build.policy.clone(),
            m.part.name.clone(),
            m.part.block.clone(),
            m.part.key.to_owned(),
            m.part.refs.join(" "),
            m.part.quantity.map(|n| n.to_string()).unwrap_or_default(),
            m.part.order_code.clone().unwrap_or_default(),
            m.rule.to_owned(),
            message::verdict(m.verdict).to_owned(),
            super::run::severity(m.severity).to_owned(),
            waiver.map(|w| w.reason.clone()).unwrap_or_default(),
            value(m.stress),
            value(m.allowance),
            value(m.rating),
            m.stress
                .or(m.rating)
                .map(|s| s.unit.to_owned())
                .unwrap_or_default(),
            number(m.used_percent),
            number(m.margin_percent()),
            file.map(|f| {
                f.tree
                    .line_index()
                    .position(m.site.span.start)
                    .line
                    .to_string()
            })
            .unwrap_or_default(),
            worst_at(&m.witness),
            if m.needs.is_empty() {
                m.note.clone()
            } else {
                m.needs.join("; ")
            },
        ];
        line(out, cells.iter().map(String::as_str))?;
    }
    Ok(())
}

/// Six significant digits: enough to sort and sum, no false precision.
fn digits(value: f64) -> String {
    let rounded: f64 = format!("{value:.5e}").parse().unwrap_or(0.0);
    format!("{}", if rounded == 0.0 { 0.0 } else { rounded })
}

fn line<'a>(out: &mut String, cells: impl Iterator<Item = &'a str>) -> fmt::Result {
    for (index, cell) in cells.enumerate() {
        if index > 0 {
            out.write_char(',')?;
        }
        out.write_str(&escape::csv(cell))?;
    }
    out.write_str("\r\n")
}
