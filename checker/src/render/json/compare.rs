//! A comparison for other programs: JSON, version 1.
//! Must not know what counts as moved.

use sha2::{Digest, Sha256};

use crate::Outcome;
use crate::compare::{self, Comparison, Course, FIGURE, State};
use crate::finding::{Derived, Margin};

use super::form::Number;
use super::form::compare as form;
use super::{SCHEMA, VERSION, level, lines, part, qty, some, tool, verdict};
use crate::render::message::build_name;
use crate::render::run::FailOn;
use crate::render::shown::hex;

/// The comparison as text; `all` lists also what did not move.
#[must_use]
pub fn render(comparison: &Comparison<'_>, all: bool, fail_on: FailOn, exit_status: u8) -> String {
    let counts = comparison.counts();
    let rows = comparison.builds.iter().flat_map(|b| &b.rows);
    lines(&form::Comparison {
        ampspec_report: VERSION,
        command: "compare".to_owned(),
        exit_status,
        fail_on: fail_on.name().to_owned(),
        figure_threshold_percent: Number(100.0 * FIGURE),
        figures: figures(comparison),
        findings: comparison.said.iter().map(said).collect(),
        new: checked(comparison.new),
        old: checked(comparison.old),
        rows: rows
            .filter(|r| all || r.state != State::Same)
            .map(row)
            .collect(),
        schema: SCHEMA.to_owned(),
        summary: form::Tally {
            better: counts.better,
            error: counts.error,
            gone: counts.gone,
            new: counts.new,
            same: counts.same,
            unchecked: counts.unchecked,
            warning: counts.warning,
            worse: counts.worse,
        },
        threshold_points: Number(comparison.points),
        tool: tool(),
    })
}

fn checked(outcome: &Outcome) -> form::Checked {
    let file = outcome.sources.iter().next().map(|(_, f)| f);
    form::Checked {
        path: file.map(|f| f.name.clone()).unwrap_or_default(),
        sha256: file
            .map(|f| hex(&Sha256::digest(f.tree.text.as_bytes())))
            .unwrap_or_default(),
    }
}

fn row(row: &compare::Row<'_>) -> form::Row {
    let margin = row.margin();
    form::Row {
        after: row.after.map(held),
        before: row.before.map(held),
        course: match row.course {
            Course::Worse => form::Course::Worse,
            Course::Level => form::Course::Level,
            Course::Better => form::Course::Better,
        },
        id: margin.map(|m| m.id.clone()).unwrap_or_default(),
        rule: margin.map(|m| m.rule.to_owned()).unwrap_or_default(),
        state: state(row.state),
    }
}

fn held(m: &Margin) -> form::Held {
    form::Held {
        allowance: m.allowance.map(qty),
        part: part(&m.part),
        rating: m.rating.map(qty),
        severity: level(m.severity),
        stress: m.stress.map(qty),
        used_percent: m.used_percent.map(Number),
        verdict: verdict(m.verdict),
        waived: m.waiver.is_some(),
    }
}

fn figures(comparison: &Comparison<'_>) -> Vec<form::Figure> {
    let mut out = Vec::new();
    for build in &comparison.builds {
        let name = build.report().map(build_name).unwrap_or_default();
        for figure in &build.figures {
            let value = |d: Option<&Derived>| d.map(|d| qty(d.value));
            let known = figure.after.or(figure.before);
            out.push(form::Figure {
                after: value(figure.after),
                before: value(figure.before),
                build: name.clone(),
                mains: known.map(|d| d.corner.mains.to_owned()).unwrap_or_default(),
                name: known.map(|d| d.name.to_owned()).unwrap_or_default(),
                of: known.and_then(|d| some(&d.of)),
                state: state(figure.state),
            });
        }
    }
    out
}

fn said(said: &compare::Said) -> form::Said {
    form::Said {
        message: said.message.clone(),
        rule: said.rule.to_owned(),
        severity: level(said.severity),
        state: state(said.state),
        waived: said.waived,
    }
}

fn state(state: State) -> form::Change {
    match state {
        State::New => form::Change::New,
        State::Gone => form::Change::Gone,
        State::Moved => form::Change::Moved,
        State::Same => form::Change::Same,
    }
}
