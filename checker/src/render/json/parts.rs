//! A bill of materials held against a spec, for other programs: JSON, version 1.
//! Must not know how they were compared.

use crate::bom::{Crossed, Row};
use crate::render::parts::{Counts, per};
use crate::render::run::FailOn;

use super::form::parts as form;
use super::{SCHEMA, VERSION, accepted, level, lines, span, tool, verdict};

/// The rows as text.
#[must_use]
pub fn render(crossed: &Crossed, fail_on: FailOn, exit_status: u8) -> String {
    let counts = Counts::of(crossed);
    lines(&form::Parts {
        ampspec_report: VERSION,
        bom: crossed.list.clone(),
        build: crossed.build.clone(),
        command: "parts".to_owned(),
        exit_status,
        fail_on: fail_on.name().to_owned(),
        per: per(crossed.basis).to_owned(),
        rows: crossed.rows.iter().map(|r| row(crossed, r)).collect(),
        schema: SCHEMA.to_owned(),
        spec: crossed
            .sources
            .iter()
            .next()
            .map(|(_, f)| f.name.clone())
            .unwrap_or_default(),
        summary: form::PartsCount {
            error: counts.error,
            found: crossed.found,
            information: counts.information,
            listed: crossed.listed,
            unchecked: counts.unchecked,
            waived: counts.waived,
            wanted: crossed.wanted,
            warning: counts.warning,
        },
        tool: tool(),
    })
}

fn row(crossed: &Crossed, row: &Row) -> form::Line {
    let at = row.line.map(|n| format!("/{n}")).unwrap_or_default();
    form::Line {
        bom: row.listed.clone(),
        id: format!("{}/{}{at}", row.rule, row.part),
        message: row.message.clone(),
        part: row.part.clone(),
        refs: row.refs.clone(),
        row: row.line,
        rule: row.rule.to_owned(),
        severity: level(row.severity),
        span: row.site.map(|s| span(&crossed.sources, s)),
        spec: row.spec.clone(),
        verdict: verdict(row.verdict),
        waiver: row
            .waiver
            .and_then(|at| crossed.waivers.get(at))
            .map(accepted),
    }
}
