//! The rails: volts against current at three mains levels, and one cycle of the mains at the duty.
//! Must not know how they are drawn.

use super::{axis, even, fact, region};
use crate::analysis::case::Case;
use crate::analysis::rails::{Mains, Reservoir};
use crate::build::Needs;
use crate::curves::{Kind, Line, Mark, Panel, Picture, Role};
use crate::finding::Measure;
use crate::physics::math::{PI, TAU};
use crate::physics::unit::Amp;

/// Steps of current.
const STEPS: u32 = 32;
/// Steps of one cycle of the mains.
const CYCLE: u32 = 240;

pub(super) fn draw(case: &Case<'_>, out: &mut Vec<Picture>) {
    out.extend(against_current(case).ok());
    out.extend(ripple(case).ok().flatten());
}

/// The greatest current at the duty, with the load's name.
fn duty(case: &Case<'_>) -> Result<(String, Amp), Needs> {
    let mut most: Option<(String, Amp)> = None;
    for load in case.loads()?.iter().flatten() {
        let current = case.duty_signal(load)?.rail_current;
        if most.as_ref().is_none_or(|m| current > m.1) {
            most = Some((load.name.clone(), current));
        }
    }
    most.ok_or_else(|| case.build.loads.missing())
}

/// The greatest current of a continuous sine from all channels, with the load's name.
fn sine(case: &Case<'_>) -> Option<(String, Amp)> {
    let loads = case.loads().ok()?.iter().flatten();
    let flows = loads.filter_map(|l| Some((l.name.clone(), case.sine_flow(l).ok()?.rail)));
    flows.reduce(|a, b| if b.1 > a.1 { b } else { a })
}

fn against_current(case: &Case<'_>) -> Result<Picture, Needs> {
    let (load, duty) = duty(case)?;
    let sine = sine(case);
    let most = sine.as_ref().map_or(duty * 3.0, |s| s.1.max(duty)) * 1.2;
    let mut lines = Vec::new();
    for mains in [Mains::High, Mains::Nominal, Mains::Low] {
        let label = match case.mains_volts(mains) {
            Some(volts) => format!("{} mains, {volts:.0} V", mains.name()),
            None => format!("{} mains", mains.name()),
        };
        let mean = |i: f64| Some((i, case.mean_rail(mains, Amp(i)).ok()?.0));
        let trough = |i: f64| Some((i, case.loaded(mains, Reservoir::Low, Amp(i)).ok()?.trough.0));
        let drawn = |of: &dyn Fn(f64) -> Option<(f64, f64)>| -> Vec<(f64, f64)> {
            even(0.0, most.0, STEPS).map_while(of).collect()
        };
        let (mean, trough) = (drawn(&mean), drawn(&trough));
        if !mean.is_empty() {
            lines.push(Line {
                role: Role::Plain,
                label: label.clone(),
                points: mean,
            });
        }
        if mains == Mains::Nominal && !trough.is_empty() {
            lines.push(Line {
                role: Role::Beside,
                label: "trough, nominal mains".to_owned(),
                points: trough,
            });
        }
    }
    let mark = |label: String, i: Amp| -> Option<Mark> {
        let rail = case.mean_rail(Mains::Nominal, i).ok()?.0;
        Some(Mark {
            role: Role::Point,
            label,
            x: i.0,
            y: rail,
            value: Some(Measure::new(rail, "V")),
        })
    };
    let duty = mark(format!("duty, {load}"), duty);
    let sine = sine.and_then(|(load, i)| mark(format!("sine, {load}"), i));
    Ok(Picture {
        kind: Kind::Rail,
        of: Vec::new(),
        region: region(case),
        facts: vec![fact(
            "channels",
            f64::from(case.channels_per_supply()?),
            "1",
        )],
        panels: vec![Panel {
            x: axis("mean current from each rail of one supply", "A", false),
            y: axis("one rail to ground", "V", false),
            lines,
            marks: duty.into_iter().chain(sine).collect(),
        }],
    })
}

fn ripple(case: &Case<'_>) -> Result<Option<Picture>, Needs> {
    let (load, current) = duty(case)?;
    let loaded = case.loaded(Mains::Nominal, Reservoir::Low, current)?;
    let (Some(cycle), Some(region_of)) = (loaded.cycle, case.region) else {
        return Ok(None);
    };
    let milliseconds = |angle: f64| 1e3 * angle / TAU / region_of.frequency.0;
    let points = even(0.0, 2.0 * PI, CYCLE)
        .map(|angle| (milliseconds(angle), cycle.at(angle).rail.0))
        .collect();
    let level = |label: &str, role, volts: f64| Line {
        role,
        label: label.to_owned(),
        points: vec![(0.0, volts), (milliseconds(2.0 * PI), volts)],
    };
    Ok(Some(Picture {
        kind: Kind::Ripple,
        of: vec![load],
        region: region(case),
        facts: vec![
            fact("current", current.0, "A"),
            fact("mean", loaded.mean.0, "V"),
            fact("ripple", (loaded.crest - loaded.trough).0, "V"),
            fact("conduction", cycle.conduction_rad() * 180.0 / PI, "deg"),
            fact("charging", cycle.charging_peak().0, "A"),
        ],
        panels: vec![Panel {
            x: axis("time", "ms", false),
            y: axis("one rail to ground", "V", false),
            lines: vec![
                Line {
                    role: Role::Plain,
                    label: "rail".to_owned(),
                    points,
                },
                level("crest", Role::Beside, loaded.crest.0),
                level("mean", Role::Beside, loaded.mean.0),
                level("trough", Role::Beside, loaded.trough.0),
            ],
            marks: Vec::new(),
        }],
    }))
}
