//! The points of the pictures of one case, from the same functions that the margins come from.
//! Must not know how they are drawn, and judges nothing.

mod heat;
mod loads;
mod rails;
mod safe_area;
#[cfg(test)]
mod tests;

use super::case::Case;
use crate::curves::{Axis, Fact, Picture};
use crate::finding::{Margin, Measure};
use crate::physics::math;

/// Add the pictures of a case. What cannot be solved is left out: the margins say why. `margins` are
/// those of the build; `first` is its first region, with which what no mains changes is drawn.
pub fn draw(case: &Case<'_>, margins: &[Margin], first: bool, out: &mut Vec<Picture>) {
    safe_area::draw(case, margins, out);
    if first {
        loads::draw(case, out);
    }
    rails::draw(case, out);
    heat::draw(case, margins, out);
}

/// The region of a case as a picture names it.
fn region(case: &Case<'_>) -> String {
    case.region
        .map(|r| format!("{} V", r.nominal.0))
        .unwrap_or_default()
}

fn axis(name: &'static str, unit: &'static str, log: bool) -> Axis {
    Axis { name, unit, log }
}

fn fact(name: &'static str, value: f64, unit: &'static str) -> Fact {
    fact_of(name, "", value, unit)
}

fn fact_of(name: &'static str, of: &str, value: f64, unit: &'static str) -> Fact {
    Fact {
        name,
        of: of.to_owned(),
        value: Measure::new(value, unit),
    }
}

/// `count` + 1 points from `from` to `to`, even.
fn even(from: f64, to: f64, count: u32) -> impl Iterator<Item = f64> {
    (0..=count).map(move |k| from + (to - from) * f64::from(k) / f64::from(count.max(1)))
}

/// The same, even in the logarithm; both ends positive.
fn even_log(from: f64, to: f64, count: u32) -> impl Iterator<Item = f64> {
    even(math::ln(from), math::ln(to), count).map(math::exp)
}
