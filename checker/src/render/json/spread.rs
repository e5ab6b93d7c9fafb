//! Builds over random kits, as JSON. Must not know how they were drawn.

use super::form::{self, Number};
use super::{lines, report, verdict};
use crate::render::run::Run;
use crate::spread::{BuildSpread, MarginSpread, PERCENTILES};

/// The report of a run with its builds over random kits.
#[must_use]
pub fn spread(run: &Run, builds: &[BuildSpread], seed: u64, status: u8) -> String {
    lines(&form::Report {
        exit_status: status,
        spread: Some(form::Spread {
            builds: builds.iter().map(build).collect(),
            percentiles: PERCENTILES.map(Number).to_vec(),
            seed,
        }),
        ..report(run)
    })
}

fn build(b: &BuildSpread) -> form::SpreadBuild {
    form::SpreadBuild {
        build: b.build.clone(),
        inputs: b.inputs.clone(),
        kits: b.kits,
        margins: b.margins.iter().map(margin).collect(),
        modelled: b.modelled,
        pass: Number(b.pass.0),
        solved: b.solved,
        within_ratings: Number(b.pass.1),
    }
}

fn margin(m: &MarginSpread) -> form::SpreadMargin {
    // a figure that is none, no rating left, is written as one beyond any other
    let finite = |x: f64| Number(x.clamp(-1e9, 1e9));
    form::SpreadMargin {
        by: m.by.as_ref().map(|b| b.0.clone()),
        by_share: m.by.as_ref().map(|b| Number(b.1)),
        disagrees: m.disagrees(),
        error: finite(m.error),
        governs: Number(m.governs),
        id: m.id.clone(),
        past_allowance: Number(m.past.0),
        past_rating: Number(m.past.1),
        used_percent: m.percentiles.map(finite).to_vec(),
        worst_case_percent: finite(m.worst_case.0),
        worst_case_verdict: verdict(m.worst_case.1),
    }
}
