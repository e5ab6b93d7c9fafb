//! Used of each margin over the box of tolerances, fitted to full solutions.
//! Must not know what an input or a margin is.
//!
//! u(x) = u0 + Σ f_j(x_j) + Σ g_jk(x_j, x_k): the f_j run through nine full solutions each, as
//! parabolas through the three nearest; g_jk is what the two do together beyond that, from a full solution
//! at each of the four corners of their square, bilinear from the middle to each.

use std::collections::BTreeSet;

use rayon::prelude::*;

use super::draw::{self, Input};
use crate::finding::Margin;

/// Full solutions along each input.
const NODES: usize = 9;
/// The middle of the box.
const MIDDLE: f64 = 0.5;
/// A margin that moves by less, in points, is not moved.
const STILL: f64 = 1e-7;
/// Kits from which the variance of a single input is taken.
const SAMPLE: u64 = 1024;

/// The model of one margin.
#[derive(Clone, Debug)]
pub(super) struct Model {
    middle: f64,
    /// The input, and what it adds at each node.
    single: Vec<(usize, [f64; NODES])>,
    /// Two inputs, and what they add together at the corners: low-low, low-high, high-low, high-high.
    both: Vec<(usize, usize, [f64; 4])>,
}

/// What a fit gives.
pub(super) struct Fitted {
    /// The margins that some input moves.
    pub(super) moving: Vec<String>,
    /// Their models; `None` where one has no figure somewhere.
    pub(super) models: Option<Vec<Model>>,
}

/// Used of a margin, per cent.
pub(super) fn used(margins: &[Margin], id: &str) -> Option<f64> {
    margins.iter().find(|m| m.id == id)?.used_percent
}

type Full<'f> = dyn Fn(&[f64]) -> Vec<Margin> + Sync + 'f;

fn node(k: usize) -> f64 {
    k as f64 / (NODES - 1) as f64
}

/// Fit every margin that moves. `worst` is the worst case, which a margin may be in beside the box.
pub(super) fn fit(inputs: usize, worst: &[Margin], full: &Full<'_>) -> Fitted {
    let middle = vec![MIDDLE; inputs];
    let centre = full(&middle);
    let places: Vec<(usize, usize)> = (0..inputs)
        .flat_map(|j| (0..NODES).map(move |k| (j, k)))
        .collect();
    let along: Vec<Vec<Margin>> = places
        .par_iter()
        .map(|(j, k)| {
            let mut at = middle.clone();
            if let Some(x) = at.get_mut(*j) {
                *x = node(*k);
            }
            full(&at)
        })
        .collect();
    let mut moving: BTreeSet<String> = BTreeSet::new();
    let mut whole = true;
    for margin in &centre {
        let mut figures = vec![used(&centre, &margin.id), used(worst, &margin.id)];
        figures.extend(along.iter().map(|m| used(m, &margin.id)));
        let some: Vec<f64> = figures.iter().flatten().copied().collect();
        let low = some.iter().copied().fold(f64::INFINITY, f64::min);
        let high = some.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let verdicts = along
            .iter()
            .chain([&centre])
            .filter_map(|m| m.iter().find(|n| n.id == margin.id));
        let same = verdicts.clone().all(|m| m.verdict == margin.verdict);
        if some.is_empty() && same {
            continue;
        }
        if some.len() < figures.len() {
            // a figure here and none there: nothing to draw a curve through
            whole = false;
            moving.insert(margin.id.clone());
        } else if high - low > STILL {
            moving.insert(margin.id.clone());
        }
    }
    let moving: Vec<String> = moving.into_iter().collect();
    let models = whole.then(|| {
        let singles: Vec<Model> = moving
            .iter()
            .map(|id| single(id, &centre, &places, &along))
            .collect();
        with_both(singles, &moving, &middle, full)
    });
    Fitted { moving, models }
}

/// What each input does alone.
fn single(id: &str, centre: &[Margin], places: &[(usize, usize)], along: &[Vec<Margin>]) -> Model {
    let middle = used(centre, id).unwrap_or_default();
    let mut single: Vec<(usize, [f64; NODES])> = Vec::new();
    for ((j, k), margins) in places.iter().zip(along) {
        let adds = used(margins, id).unwrap_or(middle) - middle;
        match single.last_mut() {
            Some((last, nodes)) if last == j => {
                if let Some(node) = nodes.get_mut(*k) {
                    *node = adds;
                }
            }
            _ => {
                let mut nodes = [0.0; NODES];
                nodes[0] = adds;
                single.push((*j, nodes));
            }
        }
    }
    single.retain(|(_, nodes)| nodes.iter().any(|n| n.abs() > STILL));
    Model {
        middle,
        single,
        both: Vec::new(),
    }
}

/// What every two inputs do together, where some margin is moved by both.
fn with_both(
    mut models: Vec<Model>,
    moving: &[String],
    middle: &[f64],
    full: &Full<'_>,
) -> Vec<Model> {
    let mut pairs: BTreeSet<(usize, usize)> = BTreeSet::new();
    for model in &models {
        for (at, (j, _)) in model.single.iter().enumerate() {
            pairs.extend(model.single.iter().skip(at + 1).map(|(k, _)| (*j, *k)));
        }
    }
    let pairs: Vec<(usize, usize)> = pairs.into_iter().collect();
    let corners: Vec<[Vec<Margin>; 4]> = pairs
        .par_iter()
        .map(|(j, k)| {
            [(0.0, 0.0), (0.0, 1.0), (1.0, 0.0), (1.0, 1.0)].map(|(a, b)| {
                let mut at = middle.to_vec();
                for (index, x) in [(*j, a), (*k, b)] {
                    if let Some(place) = at.get_mut(index) {
                        *place = x;
                    }
                }
                full(&at)
            })
        })
        .collect();
    for (model, id) in models.iter_mut().zip(moving) {
        for ((j, k), solved) in pairs.iter().zip(&corners) {
            let ends = |input: usize| {
                model
                    .single
                    .iter()
                    .find(|s| s.0 == input)
                    .map(|s| (s.1[0], s.1[NODES - 1]))
            };
            let (Some(a), Some(b)) = (ends(*j), ends(*k)) else {
                continue;
            };
            let alone = [a.0 + b.0, a.0 + b.1, a.1 + b.0, a.1 + b.1];
            let mut adds = [0.0; 4];
            for ((adds, alone), margins) in adds.iter_mut().zip(alone).zip(solved) {
                let seen = used(margins, id).unwrap_or(model.middle + alone);
                *adds = seen - model.middle - alone;
            }
            if adds.iter().any(|a| a.abs() > STILL) {
                model.both.push((*j, *k, adds));
            }
        }
    }
    models
}

impl Model {
    /// Used at a place, per cent.
    pub(super) fn at(&self, place: &[f64]) -> f64 {
        let x = |j: usize| place.get(j).copied().unwrap_or(MIDDLE);
        let single: f64 = self
            .single
            .iter()
            .map(|(j, nodes)| through(nodes, x(*j)))
            .sum();
        let both: f64 = self
            .both
            .iter()
            .map(|(j, k, corners)| {
                let (a, b) = (2.0 * (x(*j) - MIDDLE), 2.0 * (x(*k) - MIDDLE));
                let corner = corners[usize::from(a > 0.0) * 2 + usize::from(b > 0.0)];
                corner * a.abs() * b.abs()
            })
            .sum();
        self.middle + single + both
    }

    /// The input that moves it most, and its share of the variance that single inputs make.
    pub(super) fn governing(&self, inputs: &[Input], seed: u64) -> Option<(String, f64)> {
        let kits: Vec<Vec<f64>> = (0..SAMPLE).map(|n| draw::kit(inputs, seed, n)).collect();
        let variance = |(j, nodes): &(usize, [f64; NODES])| {
            let values = || {
                kits.iter()
                    .filter_map(|k| k.get(*j))
                    .map(|x| through(nodes, *x))
            };
            let mean = values().sum::<f64>() / kits.len() as f64;
            values().map(|v| (v - mean) * (v - mean)).sum::<f64>()
        };
        let all: Vec<(usize, f64)> = self.single.iter().map(|s| (s.0, variance(s))).collect();
        let sum: f64 = all.iter().map(|a| a.1).sum();
        let (most, share) = all.into_iter().max_by(|a, b| a.1.total_cmp(&b.1))?;
        (sum > 0.0).then(|| inputs.get(most).map(|i| (i.name.clone(), share / sum)))?
    }
}

/// The parabola through the three nodes nearest to x.
fn through(nodes: &[f64; NODES], x: f64) -> f64 {
    let place = x.clamp(0.0, 1.0) * (NODES - 1) as f64;
    let centre = (place.round() as usize).clamp(1, NODES - 2);
    let t = place - centre as f64;
    match nodes.get(centre - 1..=centre + 1) {
        Some([a, b, c]) => b + 0.5 * t * (c - a) + 0.5 * t * t * (a - 2.0 * b + c),
        _ => 0.0,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A parabola is met exactly, by hand: 1 - 3x + 2x².
    #[test]
    fn parabolas_are_exact() {
        let of = |x: f64| 1.0 - 3.0 * x + 2.0 * x * x;
        let nodes: [f64; NODES] = std::array::from_fn(|k| of(node(k)));
        for k in 0..=100 {
            let x = f64::from(k) / 100.0;
            assert!((through(&nodes, x) - of(x)).abs() < 1e-12);
        }
    }
}
