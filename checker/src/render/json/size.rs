//! What builds need, as JSON. Must not know how it was found.

use super::form::{self, Number};
use super::{lines, qty, report, some, verdict};
use crate::render::run::Run;
use crate::size::{Left, Row, Sized};

/// The report of a run with what its builds need.
#[must_use]
pub fn sized(run: &Run, sized: &Sized, status: u8) -> String {
    let elsewhere = |(build, margin): &(String, Left)| form::Elsewhere {
        build: build.clone(),
        margin: left(margin),
    };
    let pasted = |(build, text): &(String, String)| form::Pasted {
        build: build.clone(),
        text: text.clone(),
    };
    let cell = |c: &crate::size::Cell| form::Cell {
        answer: c.answer.name().to_owned(),
        channels: c.channels,
        load: c.load.clone(),
        mains: c.mains.clone(),
        words: c.words.clone(),
    };
    lines(&form::Report {
        exit_status: status,
        size: Some(form::Size {
            cells: sized.cells.iter().map(cell).collect(),
            elsewhere: sized.elsewhere.iter().map(elsewhere).collect(),
            pasted: sized.pasted.iter().map(pasted).collect(),
            rows: sized.rows.iter().map(row).collect(),
        }),
        ..report(run)
    })
}

fn row(r: &Row) -> form::SizeRow {
    form::SizeRow {
        build: r.build.clone(),
        item: r.item.to_owned(),
        limited: r.limited.as_ref().map(|(value, margin)| form::LimitedBy {
            margin: left(margin),
            value: value.clone(),
        }),
        margins: r.margins.iter().map(left).collect(),
        needed: r.needed.map(qty),
        offered: r.offered.clone(),
        stated: some(&r.stated),
        statements: r.statements.clone(),
    }
}

fn left(l: &Left) -> form::Left {
    form::Left {
        id: l.id.clone(),
        used_percent: l.used.map(Number),
        verdict: verdict(l.verdict),
    }
}
