//! The statistical view of tolerance: random kits, each part drawn within what the file states.
//! Must not know any rule, nor how the answer is shown.
//!
//! A full solution takes milliseconds and a hundred thousand kits are wanted in seconds, so each margin
//! gets a model of its own: one curve for each part whose tolerance moves it, and for each two such
//! parts what they do together beyond that. The model is fitted to full solutions and then held against
//! further ones at random places; the greatest error found there, three times over, is the band in
//! which a kit's verdict is not believed but solved in full. Where a margin has no figure somewhere
//! in the box, there is no model and every kit is solved in full.

mod draw;
mod model;
#[cfg(test)]
mod tests;

use std::path::Path;

use rayon::prelude::*;

use crate::Options;
use crate::build::statement::Declared;
use crate::finding::{Margin, Verdict};
use crate::solver::Solver;
use crate::source::Files;

use draw::Input;
use model::Model;

/// Most kits of one run: every margin of every kit is held in memory.
pub const MOST_KITS: u32 = 1_000_000;
/// Kits of one run where every one is solved in full.
pub const FULL_KITS: u32 = 2_000;
/// Kits that are worked out between two reports of progress.
const CHUNK: u32 = 512;
/// Full solutions at random places that measure the model's error.
const CHECKS: u32 = 192;
/// How much of the greatest error found is allowed for.
const CAUTION: f64 = 3.0;
/// The shares, per cent, of which the used figures are given.
pub const PERCENTILES: [f64; 5] = [1.0, 50.0, 95.0, 99.0, 99.9];

/// What to draw.
#[derive(Clone, Copy, Debug)]
pub struct Ask {
    /// Kits.
    pub kits: u32,
    /// The seed: the same seed draws the same kits.
    pub seed: u64,
}

/// Told how far it has come: kits done, of how many.
pub type Progress<'p> = dyn Fn(u64, u64) + Sync + 'p;

/// One margin over all kits.
#[derive(Clone, Debug, PartialEq)]
pub struct MarginSpread {
    /// [`Margin::id`].
    pub id: String,
    /// The rule.
    pub rule: &'static str,
    /// The part.
    pub part: String,
    /// Used in the worst case of every check, per cent, and its verdict.
    pub worst_case: (f64, Verdict),
    /// Used at each of [`PERCENTILES`].
    pub percentiles: [f64; 5],
    /// The least and the most of all kits.
    pub range: (f64, f64),
    /// Share of kits past the allowance, and past the rating.
    pub past: (f64, f64),
    /// The line that moves it most, and its share of the variance that single lines make.
    pub by: Option<(String, f64)>,
    /// Greatest error of the model found, points.
    pub error: f64,
    /// Share of kits in which it is the governing margin.
    pub governs: f64,
}

/// One build over all kits.
#[derive(Clone, Debug, PartialEq)]
pub struct BuildSpread {
    /// Its name.
    pub build: String,
    /// Kits drawn.
    pub kits: u32,
    /// Kits that were solved in full for their verdict.
    pub solved: u32,
    /// A model stood for the others.
    pub modelled: bool,
    /// The lines drawn, with what is drawn of them.
    pub inputs: Vec<String>,
    /// Share of kits in which no margin is past its allowance, and none past its rating.
    pub pass: (f64, f64),
    /// Margins that some tolerance moves.
    pub margins: Vec<MarginSpread>,
    /// Margins past their allowance that no tolerance moves: they decide the pass as they stand.
    pub fixed: Vec<(String, &'static str, Verdict)>,
}

/// Every build of a file over random kits.
///
/// # Errors
/// When the file cannot be read; the text says why.
pub fn spread(
    files: &dyn Files,
    path: &Path,
    shown: &str,
    options: &Options,
    ask: Ask,
    progress: &Progress<'_>,
) -> Result<Vec<BuildSpread>, String> {
    let solver = Solver::read(files, path, shown, options)?;
    let ask = Ask {
        kits: ask.kits.clamp(1, MOST_KITS),
        ..ask
    };
    let builds: Vec<&Declared> = solver.builds().collect();
    let all = u64::from(ask.kits) * builds.len() as u64;
    let mut out = Vec::new();
    for (at, build) in builds.into_iter().enumerate() {
        let before = at as u64 * u64::from(ask.kits);
        out.push(of_build(&solver, build, ask, &|done| {
            progress(before + done, all);
        }));
    }
    Ok(out)
}

/// What moves: the margins with a figure that some input changes.
struct Moving {
    id: String,
    /// Used per cent above which it is over; infinite where it cannot be.
    over: f64,
    worst: Margin,
}

/// A kit: used of each moving margin, and whether it was solved in full.
#[derive(Clone)]
struct Kit {
    used: Vec<f64>,
    solved: bool,
    pass: bool,
    within: bool,
}

fn of_build(
    solver: &Solver,
    build: &Declared,
    ask: Ask,
    progress: &(dyn Fn(u64) + Sync),
) -> BuildSpread {
    of_build_with(solver, build, ask, true, progress)
}

/// The same with or without models.
fn of_build_with(
    solver: &Solver,
    build: &Declared,
    ask: Ask,
    modelled: bool,
    progress: &(dyn Fn(u64) + Sync),
) -> BuildSpread {
    let inputs = draw::inputs(solver, build);
    let worst = solver.solve(build, &[]).margins;
    let full = |at: &[f64]| solver.solve(build, &draw::changes(&inputs, at)).margins;
    let mut fitted = model::fit(inputs.len(), &worst, &full);
    fitted.models = fitted.models.filter(|_| modelled);
    let moving: Vec<Moving> = fitted
        .moving
        .iter()
        .filter_map(|id| moving(id, &worst))
        .collect();
    let fixed: Vec<&Margin> = worst
        .iter()
        .filter(|m| crate::proposal::stands_in_the_way(m) && !fitted.moving.contains(&m.id))
        .collect();
    let bands = fitted
        .models
        .as_deref()
        .map(|models| bands(models, &inputs, &moving, ask, &full));
    let kits = if bands.is_some() {
        ask.kits
    } else {
        ask.kits.min(FULL_KITS)
    };
    let judge = Judge {
        moving: &moving,
        models: fitted.models.as_deref().zip(bands.as_deref()),
        full: &full,
        inputs: &inputs,
        seed: ask.seed,
        fails: (
            !fixed.is_empty(),
            fixed.iter().any(|m| m.verdict == Verdict::Over),
        ),
    };
    let all = judge.all(kits, progress);
    let share = |count: usize| count as f64 / f64::from(kits.max(1));
    BuildSpread {
        build: build.name.clone(),
        kits,
        solved: all.iter().filter(|k| k.solved).count() as u32,
        modelled: bands.is_some(),
        inputs: inputs.iter().map(|i| i.name.clone()).collect(),
        pass: (
            share(all.iter().filter(|k| k.pass).count()),
            share(all.iter().filter(|k| k.within).count()),
        ),
        margins: margins(&judge, &all, bands.as_deref()),
        fixed: fixed
            .iter()
            .map(|m| (m.part.name.clone(), m.rule, m.verdict))
            .collect(),
    }
}

fn moving(id: &str, worst: &[Margin]) -> Option<Moving> {
    let worst = worst.iter().find(|m| m.id == id)?;
    Some(Moving {
        id: id.to_owned(),
        over: over(worst),
        worst: worst.clone(),
    })
}

/// Used, per cent, at the rating: 100 x rating/allowance and its kin.
fn over(margin: &Margin) -> f64 {
    let figures = margin.stress.zip(margin.rating).zip(margin.allowance);
    let Some(((stress, rating), allowance)) = figures else {
        return f64::INFINITY;
    };
    let rule = crate::rules::find(margin.rule);
    let at = match rule.map(|r| r.sense) {
        Some(crate::rule::Sense::AtLeast) => 100.0 * allowance.value / rating.value,
        Some(crate::rule::Sense::Temperature) => {
            // used = 100·(T - Ta)/(allowed - Ta): the ambient follows from the figures themselves
            let share = margin.used_percent.unwrap_or(f64::NAN) / 100.0;
            let ambient = (stress.value - share * allowance.value) / (1.0 - share);
            100.0 * (rating.value - ambient) / (allowance.value - ambient)
        }
        _ => 100.0 * rating.value / allowance.value,
    };
    if at.is_finite() && at >= 100.0 {
        at
    } else {
        100.0
    }
}

/// The band of each margin within which the model is not believed.
fn bands(
    models: &[Model],
    inputs: &[Input],
    moving: &[Moving],
    ask: Ask,
    full: &(dyn Fn(&[f64]) -> Vec<Margin> + Sync),
) -> Vec<f64> {
    // other kits than those that are counted
    let seed = ask.seed ^ 0x5eed_c4ec_5eed_c4ec;
    let errors: Vec<Vec<f64>> = (0..CHECKS)
        .into_par_iter()
        .map(|n| {
            let at = draw::kit(inputs, seed, u64::from(n));
            let solved = full(&at);
            let error = |(model, of): (&Model, &Moving)| match model::used(&solved, &of.id) {
                Some(used) => (used - model.at(&at)).abs(),
                None => f64::INFINITY,
            };
            models.iter().zip(moving).map(error).collect()
        })
        .collect();
    let worst = |k: usize| {
        errors
            .iter()
            .filter_map(|e| e.get(k))
            .copied()
            .fold(0.0, f64::max)
    };
    (0..models.len())
        .map(|k| CAUTION * worst(k) + 1e-9)
        .collect()
}

/// All that it takes to judge one kit.
struct Judge<'j> {
    moving: &'j [Moving],
    models: Option<(&'j [Model], &'j [f64])>,
    full: &'j (dyn Fn(&[f64]) -> Vec<Margin> + Sync),
    inputs: &'j [Input],
    seed: u64,
    /// Margins that nothing moves are past an allowance, past a rating.
    fails: (bool, bool),
}

impl Judge<'_> {
    /// Every kit, in the order of their numbers whatever the number of threads.
    fn all(&self, kits: u32, progress: &(dyn Fn(u64) + Sync)) -> Vec<Kit> {
        let mut out = Vec::with_capacity(kits as usize);
        let mut from = 0;
        while from < kits {
            // as many chunks at a time as keep every thread busy and the progress alive
            let to = kits.min(from + CHUNK * 16);
            let some: Vec<Kit> = (from..to).into_par_iter().map(|n| self.kit(n)).collect();
            out.extend(some);
            from = to;
            progress(u64::from(from));
        }
        out
    }

    fn kit(&self, n: u32) -> Kit {
        let at = draw::kit(self.inputs, self.seed, u64::from(n));
        let Some((models, bands)) = self.models else {
            return self.solved(&at);
        };
        let used: Vec<f64> = models.iter().map(|m| m.at(&at)).collect();
        let near = |((used, band), of): ((&f64, &f64), &Moving)| {
            (used - 100.0).abs() <= *band || (used - of.over).abs() <= *band
        };
        if used.iter().zip(bands).zip(self.moving).any(near) {
            return self.solved(&at);
        }
        self.verdict(used, false)
    }

    fn solved(&self, at: &[f64]) -> Kit {
        let margins = (self.full)(at);
        // no figure is no rating left: past everything
        let used = self
            .moving
            .iter()
            .map(|of| model::used(&margins, &of.id).unwrap_or(f64::INFINITY));
        self.verdict(used.collect(), true)
    }

    fn verdict(&self, used: Vec<f64>, solved: bool) -> Kit {
        let counted = || {
            used.iter()
                .zip(self.moving)
                .filter(|(_, of)| of.worst.waiver.is_none())
        };
        let pass = !self.fails.0 && counted().all(|(u, _)| *u <= 100.0);
        let within = !self.fails.1 && counted().all(|(u, of)| *u <= of.over);
        Kit {
            pass,
            within,
            used,
            solved,
        }
    }
}

fn margins(judge: &Judge<'_>, kits: &[Kit], bands: Option<&[f64]>) -> Vec<MarginSpread> {
    let count = kits.len().max(1) as f64;
    let mut governs = vec![0_u32; judge.moving.len()];
    for kit in kits {
        let greatest = kit
            .used
            .iter()
            .enumerate()
            .max_by(|a, b| a.1.total_cmp(b.1));
        if let Some(found) = greatest.and_then(|(at, _)| governs.get_mut(at)) {
            *found += 1;
        }
    }
    let mut out: Vec<MarginSpread> = judge
        .moving
        .iter()
        .enumerate()
        .map(|(k, of)| {
            let mut used: Vec<f64> = kits
                .iter()
                .filter_map(|kit| kit.used.get(k).copied())
                .collect();
            used.sort_by(f64::total_cmp);
            let past = |limit: f64| used.iter().filter(|u| **u > limit).count() as f64 / count;
            let at = |percent: f64| {
                let place = (percent / 100.0 * count).ceil().max(1.0) as usize - 1;
                used.get(place.min(used.len().saturating_sub(1)))
                    .copied()
                    .unwrap_or_default()
            };
            let by = judge
                .models
                .and_then(|(models, _)| models.get(k)?.governing(judge.inputs, judge.seed));
            MarginSpread {
                id: of.id.clone(),
                rule: of.worst.rule,
                part: of.worst.part.name.clone(),
                worst_case: (of.worst.used_percent.unwrap_or_default(), of.worst.verdict),
                percentiles: PERCENTILES.map(at),
                range: (
                    used.first().copied().unwrap_or_default(),
                    used.last().copied().unwrap_or_default(),
                ),
                past: (past(100.0), past(of.over)),
                by,
                error: bands.and_then(|b| b.get(k)).map_or(0.0, |b| b / CAUTION),
                governs: governs.get(k).map_or(0.0, |n| f64::from(*n) / count),
            }
        })
        .collect();
    out.sort_by(|a, b| b.range.1.total_cmp(&a.range.1));
    out
}

impl MarginSpread {
    /// The worst case says no and almost every kit says yes.
    #[must_use]
    pub fn disagrees(&self) -> bool {
        matches!(self.worst_case.1, Verdict::Over | Verdict::Thin) && self.past.0 < 0.5
    }

    /// Some kit uses more than the worst case of every check: by half a point and more than the model
    /// may err. A check takes each tolerance at its end, and for a few margins the worst lies within.
    #[must_use]
    pub fn beyond(&self) -> bool {
        self.range.1 > self.worst_case.0 + CAUTION * self.error + 0.5
    }
}
