//! Heat of a channel against its output, and the temperatures from the air to the junction.
//! Must not know how they are drawn.

use super::{axis, even, fact, region};
use crate::analysis::case::{Case, Side};
use crate::analysis::heat::{Heat, at};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::build::Needs;
use crate::curves::{Kind, Line, Mark, Panel, Picture, Role};
use crate::finding::{Margin, Measure};
use crate::physics::math;
use crate::physics::output_stage::power;

/// Steps of output power.
const STEPS: u32 = 48;

pub(super) fn draw(case: &Case<'_>, margins: &[Margin], out: &mut Vec<Picture>) {
    out.extend(against_output(case).ok());
    for side in case.output().sides() {
        let Ok(picture) = ladder(case, margins, *side) else {
            continue;
        };
        let same = |p: &&mut Picture| {
            p.kind == Kind::Ladder && p.region == picture.region && p.panels == picture.panels
        };
        match out.iter_mut().find(same) {
            Some(first) => first.of.extend(picture.of),
            None => out.push(picture),
        }
    }
}

/// Heat of one channel and its output power at a fraction of the power at clip.
fn spent(case: &Case<'_>, load: &Driven, fraction: f64) -> Result<(f64, f64), Needs> {
    let heat = case.heat_at(load, fraction, Mains::Nominal)?;
    Ok((heat.duty.power.0, of_channel(&heat)))
}

fn of_channel(heat: &Heat) -> f64 {
    (heat.bank[0].total() + heat.bank[1].total() + heat.other).0
}

fn against_output(case: &Case<'_>) -> Result<Picture, Needs> {
    let (hottest, _) = case.hottest_load()?;
    let (mut lines, mut marks) = (Vec::new(), Vec::new());
    for load in case.loads()?.iter().flatten() {
        let full = case.signal_at(load, 1.0)?;
        let seen = load.nominal_seen();
        let sustained = case.sustained(Mains::Nominal, case.channels_per_supply()?, seen)?;
        // on the sagging rail it clips before the power at which the duty is reckoned
        let most = (power(sustained, seen) / full.power).min(1.0);
        let points: Vec<_> = even(0.0, most.sqrt(), STEPS)
            .map(|root| spent(case, load, root * root))
            .collect::<Result<_, _>>()?;
        lines.push(Line {
            role: Role::Plain,
            label: load.name.clone(),
            points,
        });
        let heat = |d: f64| spent(case, load, d).map_or(f64::NAN, |(_, watts)| watts);
        let (worst, _) = math::maximum(heat, 0.0, most, 1e-6);
        let duty = case.duty();
        let mut of_load = vec![
            (Role::Point, "1/8".to_owned(), 0.125),
            (Role::Point, "1/3".to_owned(), 1.0 / 3.0),
            (Role::Worst, "worst".to_owned(), worst),
        ];
        if !of_load
            .iter()
            .any(|(_, _, d)| (d - duty.fraction).abs() < 1e-9)
        {
            of_load.push((Role::Point, format!("duty {}", duty.shown), duty.fraction));
        }
        for (role, label, fraction) in of_load.into_iter().filter(|m| m.2 <= most) {
            let (x, y) = spent(case, load, fraction)?;
            let label = if load.name == hottest.name {
                label
            } else {
                String::new()
            };
            marks.push(Mark {
                role,
                label,
                x,
                y,
                value: Some(Measure::new(y, "W")),
            });
        }
    }
    Ok(Picture {
        kind: Kind::Heat,
        of: vec![hottest.name.clone()],
        region: region(case),
        facts: vec![fact("duty", case.duty().fraction, "1")],
        panels: vec![Panel {
            x: axis("output of one channel, nominal resistance", "W", false),
            y: axis("heat of one channel", "W", false),
            lines,
            marks,
        }],
    })
}

/// From the air to the junction of the hottest device of a side, hottest room, at the duty in the load
/// that heats most. A rung is a line from the temperature before it to its own; marks are what is
/// allowed of it and its rating.
fn ladder(case: &Case<'_>, margins: &[Margin], side: Side) -> Result<Picture, Needs> {
    let (load, heat) = case.hottest_load()?;
    let device = &case.output().device(side).owner.name;
    let found = case.temperatures(heat, side)?;
    let mut rungs = vec![
        ("room", case.hottest()?.0, None),
        ("air inside", heat.air.0, None),
        ("sink", heat.sink.0, Some("thermal.sink")),
        ("hottest place on it", heat.hot_spot.0, None),
        ("case", found.case.0, None),
        ("junction", found.junction.0, Some("thermal.junction")),
    ];
    if let Ok(peak) = case.peak_junction(heat, load, side) {
        rungs.push((
            "junction, peak",
            peak.junction.0,
            Some("thermal.junction-peak"),
        ));
    }
    let (mut lines, mut marks) = (Vec::new(), Vec::new());
    let mut before = case.hottest()?.0;
    for (row, (name, degrees, rule)) in rungs.into_iter().enumerate() {
        let y = row as f64;
        lines.push(Line {
            role: Role::Plain,
            label: name.to_owned(),
            points: vec![(before, y), (degrees, y)],
        });
        before = degrees;
        let of = |m: &&Margin| {
            Some(m.rule) == rule && (m.part.name == *device || m.rule == "thermal.sink")
        };
        let Some(margin) = margins.iter().find(of) else {
            continue;
        };
        for (role, figure) in [
            (Role::Allowed, margin.allowance),
            (Role::Rating, margin.rating),
        ] {
            marks.extend(figure.filter(|f| f.unit == "degC").map(|f| Mark {
                role,
                label: name.to_owned(),
                x: f.value,
                y,
                value: Some(f),
            }));
        }
    }
    Ok(Picture {
        kind: Kind::Ladder,
        of: vec![device.clone()],
        region: region(case),
        facts: vec![
            fact("device", heat.device[at(side)].0, "W"),
            fact("sink", heat.total.0, "W"),
        ],
        panels: vec![Panel {
            x: axis("temperature", "degC", false),
            y: axis("", "", false),
            lines,
            marks,
        }],
    })
}
