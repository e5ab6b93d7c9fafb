//! The impedance of each load over the band.
//! Must not know how it is drawn.

use super::{axis, even_log, fact};
use crate::analysis::case::Case;
use crate::analysis::loads::Driven;
use crate::curves::{Kind, Line, Mark, Panel, Picture, Role};
use crate::finding::Measure;
use crate::physics::load::{Impedance, Worst};
use crate::physics::math::PI;
use crate::physics::unit::Hertz;

/// Steps over the band.
const STEPS: u32 = 160;

/// One picture for each load that is solved.
pub(super) fn draw(case: &Case<'_>, out: &mut Vec<Picture>) {
    for load in case.loads().into_iter().flatten().flatten() {
        out.push(picture(load));
    }
}

fn picture(load: &Driven) -> Picture {
    let s = &load.survey;
    let grid = grid(load);
    let of = |label: &str, role, value: &dyn Fn(Impedance) -> f64, greatest: bool| Line {
        role,
        label: label.to_owned(),
        points: extreme(load, &grid, value, greatest),
    };
    let angle = |z: Impedance| z.angle_rad() * 180.0 / PI;
    let modulus = |z: Impedance| z.modulus().0;
    let resistance = |z: Impedance| z.peak_dissipation_resistance().0;
    let lagging = of("phase", Role::Plain, &angle, true);
    let mut phases = vec![of("phase", Role::Beside, &angle, false)];
    if phases.first().map(|l| &l.points) == Some(&lagging.points) {
        phases.clear();
    }
    phases.insert(0, lagging);
    let mark = |label: &str, role, w: &Worst, y: f64, unit| Mark {
        role,
        label: label.to_owned(),
        x: w.frequency.0,
        y,
        value: Some(Measure::new(y, unit)),
    };
    let flat = load.load.is_flat();
    let some = |marks: Vec<Mark>| if flat { Vec::new() } else { marks };
    Picture {
        kind: Kind::Impedance,
        of: vec![load.name.clone()],
        region: String::new(),
        facts: vec![
            fact("nominal", load.nominal.0, "ohm"),
            fact("bridged", f64::from(u8::from(load.bridged)), "1"),
        ],
        panels: vec![
            Panel {
                x: axis("frequency", "Hz", true),
                y: axis("between the terminals", "ohm", true),
                lines: vec![
                    of("modulus", Role::Plain, &modulus, false),
                    of(
                        "peak dissipation resistance",
                        Role::Beside,
                        &resistance,
                        false,
                    ),
                ],
                marks: some(vec![
                    mark(
                        "least modulus",
                        Role::Point,
                        &s.minimum,
                        modulus(s.minimum.impedance),
                        "ohm",
                    ),
                    mark(
                        "least dissipation",
                        Role::Worst,
                        &s.dissipation,
                        resistance(s.dissipation.impedance),
                        "ohm",
                    ),
                ]),
            },
            Panel {
                x: axis("frequency", "Hz", true),
                y: axis("phase", "deg", false),
                lines: phases,
                marks: some(vec![
                    mark(
                        "most lagging",
                        Role::Point,
                        &s.most_lagging,
                        angle(s.most_lagging.impedance),
                        "deg",
                    ),
                    mark(
                        "most leading",
                        Role::Point,
                        &s.most_leading,
                        angle(s.most_leading.impedance),
                        "deg",
                    ),
                ]),
            },
        ],
    }
}

/// Frequencies over what is known of the band, with those of the extremes.
fn grid(load: &Driven) -> Vec<f64> {
    let s = &load.survey;
    let mut grid: Vec<f64> =
        even_log(load.covered.bottom().0, load.covered.top().0, STEPS).collect();
    grid.extend([s.minimum, s.dissipation, s.most_lagging, s.most_leading].map(|w| w.frequency.0));
    let known = load.covered.bottom().0..=load.covered.top().0;
    grid.retain(|f| known.contains(f));
    grid.sort_by(f64::total_cmp);
    grid.dedup();
    grid
}

/// The least, or the greatest, of every impedance that the description stands for.
fn extreme(
    load: &Driven,
    grid: &[f64],
    value: &dyn Fn(Impedance) -> f64,
    greatest: bool,
) -> Vec<(f64, f64)> {
    let variants = load.load.variants();
    let at = |f: f64| {
        let values = variants
            .iter()
            .filter_map(|v| load.load.impedance(*v, Hertz(f)))
            .map(value)
            .filter(|y| y.is_finite());
        values.reduce(if greatest { f64::max } else { f64::min })
    };
    grid.iter().filter_map(|f| Some((*f, at(*f)?))).collect()
}
