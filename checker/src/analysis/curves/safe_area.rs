//! The safe area of each output device with the locus of every load, and the limit line against both.
//! Must not know how it is drawn.

use super::{axis, fact, fact_of, region};
use crate::analysis::case::{Case, Side};
use crate::analysis::limits::Limit;
use crate::analysis::loads::Spot;
use crate::analysis::rails::Mains;
use crate::analysis::safe_area::{Angle, Ready, SafeArea, Use};
use crate::build::Needs;
use crate::curves::{Fact, Kind, Line, Mark, Panel, Picture, Role};
use crate::finding::{Margin, Measure, Verdict};
use crate::physics::limiter::Extreme;
use crate::physics::load::Impedance;
use crate::physics::math::{self, PI};
use crate::physics::safe_area::Allowance;
use crate::physics::unit::{Amp, Celsius, Volt};

/// Case temperature of the curve as stated.
const STATED_AT: Celsius = Celsius(25.0);
/// Steps of a locus over half a period.
const STEPS: u32 = 120;
/// Where the curves begin, V: left of everything that matters.
const FROM: f64 = 1.0;

/// A load at its worst for a device.
struct Played<'c> {
    name: String,
    /// The same at every frequency.
    flat: bool,
    ready: Ready<'c>,
    spot: Spot,
    found: Use,
}

/// One picture for each output device, and one more where a limiter is declared.
pub(super) fn draw(case: &Case<'_>, margins: &[Margin], out: &mut Vec<Picture>) {
    for side in case.output().sides() {
        let (Ok(area), Ok(limit)) = (picture(case, margins, *side), limiter(case, margins, *side))
        else {
            continue;
        };
        add(area, out);
        if let Some(limit) = limit {
            add(limit, out);
        }
    }
}

/// A complement with the same data makes the same picture: its name is added to the first.
fn add(picture: Picture, out: &mut Vec<Picture>) {
    let same = |p: &&mut Picture| {
        p.kind == picture.kind
            && p.region == picture.region
            && p.facts == picture.facts
            && p.panels == picture.panels
    };
    match out.iter_mut().find(same) {
        Some(first) => first.of.extend(picture.of),
        None => out.push(picture),
    }
}

/// The part of the curve that the policy allows, as the margin of this device was judged.
fn aim(margins: &[Margin], device: &str) -> f64 {
    let margin = margins
        .iter()
        .find(|m| m.rule == "soa.reactive" && m.part.name == device);
    let share = margin.and_then(|m| Some(m.allowance?.value / m.rating?.value));
    share.filter(|s| s.is_finite() && *s > 0.0).unwrap_or(1.0)
}

fn played<'c>(case: &'c Case<'_>, side: Side, aim: f64) -> Vec<Played<'c>> {
    let mut out = Vec::new();
    for (load, heat) in case.played().into_iter().flatten() {
        let Ok(ready) = case.ready_at_duty(heat, side, case.safe_area_mains(), aim) else {
            continue;
        };
        if let Ok((spot, found)) = case.worst_use(&ready, load, Angle::Own) {
            out.push(Played {
                name: load.name.clone(),
                flat: load.load.is_flat(),
                ready,
                spot,
                found,
            });
        }
    }
    out
}

fn picture(case: &Case<'_>, margins: &[Margin], side: Side) -> Result<Picture, Needs> {
    let device = case.output().device(side);
    let aim = aim(margins, &device.owner.name);
    let area = SafeArea::of(device)?;
    let played = played(case, side, aim);
    let mut lines = Vec::new();
    lines.extend(
        area.allowance(STATED_AT)?
            .map(|stated| curve(Role::Stated, String::new(), &stated, 1.0)),
    );
    derated(&played, aim, &mut lines);
    lines.extend(limit_line(case, side, Extreme::Most));
    for one in &played {
        lines.extend(locus(one));
    }
    let marks = played.iter().map(|one| witness(one, aim)).collect();
    Ok(Picture {
        kind: Kind::SafeArea,
        of: vec![device.owner.name.clone()],
        region: region(case),
        facts: facts(case, &played, aim),
        panels: vec![panel(lines, marks)],
    })
}

fn panel(lines: Vec<Line>, marks: Vec<Mark>) -> Panel {
    Panel {
        x: axis("voltage across the most loaded device", "V", true),
        y: axis("its current", "A", true),
        lines,
        marks,
    }
}

fn facts(case: &Case<'_>, played: &[Played<'_>], aim: f64) -> Vec<Fact> {
    let mut facts = vec![fact("allowed", 100.0 * aim, "%")];
    facts.extend(
        case.mains_volts(case.safe_area_mains())
            .map(|v| fact("mains", v, "V")),
    );
    facts.extend(case.hottest().ok().map(|t| fact("room", t.0, "degC")));
    for one in played {
        let modulus = one.spot.seen.modulus().0;
        let angle = one.spot.seen.angle_rad() * 180.0 / PI;
        facts.extend([
            fact_of("case", &one.name, one.ready.case.0, "degC"),
            fact_of("modulus", &one.name, modulus, "ohm"),
            fact_of("angle", &one.name, angle, "deg"),
            fact_of("amplitude", &one.name, one.found.amplitude.0, "V"),
            fact_of("rail", &one.name, one.ready.rail.0, "V"),
        ]);
        if !one.flat {
            facts.push(fact_of("frequency", &one.name, one.spot.frequency.0, "Hz"));
        }
    }
    facts
}

/// What is allowed, from corner to corner: between two of them it is straight in log-log.
fn curve(role: Role, label: String, allowance: &Allowance, share: f64) -> Line {
    let to = allowance.known_to();
    let mut volts = vec![FROM];
    for kink in allowance.kinks() {
        // a limit that ends or begins may leave a step: one point on either side of it
        volts.extend([kink.0 * (1.0 - 1e-9), kink.0, kink.0 * (1.0 + 1e-9)]);
    }
    volts.push(to.0);
    volts.retain(|v| (FROM..=to.0).contains(v));
    volts.sort_by(f64::total_cmp);
    volts.dedup();
    let points = volts
        .into_iter()
        .map(|v| (v, allowance.allowed(Volt(v)).0 * share))
        .filter(|(_, i)| i.is_finite() && *i > 0.0)
        .collect();
    Line {
        role,
        label,
        points: straightened(points),
    }
}

/// Points without those that lie on the straight line in log-log between their neighbours.
fn straightened(points: Vec<(f64, f64)>) -> Vec<(f64, f64)> {
    let log = |p: (f64, f64)| (math::ln(p.0), math::ln(p.1));
    let mut out: Vec<(f64, f64)> = Vec::with_capacity(points.len());
    for (at, point) in points.iter().enumerate() {
        let (Some(before), Some(after)) = (out.last(), points.get(at + 1)) else {
            out.push(*point);
            continue;
        };
        let (a, b, c) = (log(*before), log(*point), log(*after));
        let line = a.1 + (c.1 - a.1) * (b.0 - a.0) / (c.0 - a.0);
        if (line - b.1).abs() > 1e-12 {
            out.push(*point);
        }
    }
    out
}

/// The derated curve of every load: each heats the case in its own way. Loads that heat it alike
/// share one. What the policy allows of it is drawn for the load that uses most.
fn derated(played: &[Played<'_>], aim: f64, lines: &mut Vec<Line>) {
    let most = played.iter().map(|one| one.found.used).fold(0.0, f64::max);
    let mut known: Vec<(Role, Vec<(f64, f64)>)> = Vec::new();
    for one in played {
        for (allowance, pulse) in one.ready.allowances(one.found.pulse) {
            for (role, share) in [(Role::Derated, 1.0), (Role::Allowed, aim)] {
                if role == Role::Allowed && one.found.used < most {
                    continue;
                }
                let label = match pulse {
                    None => one.name.clone(),
                    Some(length) => format!("{}, {:.3} ms", one.name, 1e3 * length.0),
                };
                let line = curve(role, label, allowance, share);
                if !known.iter().any(|(r, p)| *r == role && *p == line.points) {
                    known.push((role, line.points.clone()));
                    lines.push(line);
                }
            }
        }
    }
}

/// The most loaded device over half a period, with its worst point among the samples.
fn locus(one: &Played<'_>) -> Option<Line> {
    let seen = one.spot.seen;
    let point = one.found.point;
    let current_phase = point.angle_rad - seen.angle_rad();
    let beta = if seen.angle_rad() > 0.0 {
        PI - current_phase
    } else {
        current_phase
    };
    let worst = (beta, point.volts.0, point.amps.0);
    path(one, seen, one.found.amplitude, Some(worst))
}

/// The locus of a load into an impedance, with one more sample of phase, volts and amps.
fn path(
    one: &Played<'_>,
    seen: Impedance,
    amplitude: Volt,
    more: Option<(f64, f64, f64)>,
) -> Option<Line> {
    let locus = one.ready.locus(amplitude, seen)?;
    // without an angle the second quarter runs back along the first
    let last = if seen.angle_rad() == 0.0 {
        STEPS / 2
    } else {
        STEPS - 1
    };
    let mut samples: Vec<(f64, f64, f64)> = (1..=last)
        .map(|k| {
            let beta = PI * f64::from(k) / f64::from(STEPS);
            let (volts, amps) = locus.at_phase(beta);
            (beta, volts, amps)
        })
        .collect();
    samples.extend(more);
    samples.sort_by(|a, b| a.0.total_cmp(&b.0));
    Some(Line {
        role: Role::Locus,
        label: one.name.clone(),
        points: samples
            .into_iter()
            .map(|(_, v, i)| (v, i))
            .filter(|(v, i)| *v > 0.0 && *i > 0.0)
            .collect(),
    })
}

fn witness(one: &Played<'_>, aim: f64) -> Mark {
    Mark {
        role: Role::Worst,
        label: one.name.clone(),
        x: one.found.point.volts.0,
        y: one.found.point.amps.0,
        value: Some(Measure::new(100.0 * one.found.used / aim, "%")),
    }
}

/// What the limiter lets the most loaded device carry, up to both rails at high mains.
fn limit_line(case: &Case<'_>, side: Side, extreme: Extreme) -> Option<Line> {
    let (limit, label) = match extreme {
        Extreme::Most => (case.limit(extreme, case.coldest().ok()?), "at most"),
        Extreme::Least => {
            let (_, heat) = case.hottest_load().ok()?;
            (case.limit(extreme, heat.hot_spot), "at least")
        }
    };
    let limit = limit.ok()?;
    let swing = case.unsagged(Mains::High).ok()? * 2.0;
    let bank = case.bench().ok()?.bank(side);
    let current = |v: Volt| -> Option<Amp> {
        let sensed = limit.sensed(v)?;
        match extreme {
            Extreme::Most => limit.most_loaded(bank, sensed),
            Extreme::Least => limit.when_sensed(bank, sensed),
        }
    };
    Some(Line {
        role: Role::Limit,
        label: label.to_owned(),
        points: limit_volts(&limit, swing)
            .into_iter()
            .filter_map(|v| Some((v, current(Volt(v))?.0)))
            .filter(|(_, i)| i.is_finite() && *i > 0.0)
            .collect(),
    })
}

/// A line straight in plain axes bends in logarithmic ones: sampled, with its corners.
fn limit_volts(limit: &Limit, swing: Volt) -> Vec<f64> {
    let mut volts: Vec<f64> = super::even_log(FROM, swing.0.max(FROM), 80).collect();
    volts.extend(limit.kinks().iter().map(|v| v.0));
    volts.retain(|v| (FROM..=swing.0).contains(v));
    volts.sort_by(f64::total_cmp);
    volts.dedup();
    volts
}

/// The limit line at both ends of its tolerances against the hottest derated curve and every locus.
fn limiter(case: &Case<'_>, margins: &[Margin], side: Side) -> Result<Option<Picture>, Needs> {
    let device = case.output().device(side);
    let mut limits: Vec<Line> = [Extreme::Most, Extreme::Least]
        .into_iter()
        .filter_map(|e| limit_line(case, side, e))
        .collect();
    if limits.is_empty() {
        return Ok(None);
    }
    // a stated line has no spread
    limits.dedup_by(|b, a| a.points == b.points);
    if let [only] = limits.as_mut_slice() {
        only.label.clear();
    }
    let played = played(case, side, 1.0);
    let hottest = played
        .iter()
        .max_by(|a, b| a.ready.case.0.total_cmp(&b.ready.case.0));
    let mut lines = Vec::new();
    if let Some(allowance) = hottest.and_then(|one| one.ready.allowance()) {
        lines.push(curve(Role::Derated, String::new(), allowance, 1.0));
    }
    lines.extend(limits);
    for (load, heat) in case.played().into_iter().flatten() {
        let Some(one) = played.iter().find(|one| one.name == load.name) else {
            continue;
        };
        // at the frequency at which the line comes nearest, which is not that of the safe area
        if let Ok(clear) = case.clearance(heat, load, side) {
            lines.extend(path(one, clear.spot.seen, clear.amplitude, None));
        }
    }
    let mut facts = Vec::new();
    facts.extend(hottest.map(|one| fact("case", one.ready.case.0, "degC")));
    facts.extend(case.mains_volts(Mains::High).map(|v| fact("mains", v, "V")));
    let bank = case.bench()?.bank(side);
    let nearest = |rule: &str, label: &str, mains: Mains| {
        let here = |m: &&Margin| {
            m.rule == rule
                && m.verdict != Verdict::Unchecked
                && m.witness.mains_v == case.mains_volts(mains)
        };
        let margin = margins.iter().find(here)?;
        let witness = &margin.witness;
        // a line of the bank is judged by the current of the bank
        let of_bank = || witness.bank_a.map(|i| bank.most_loaded(Amp(i)).0);
        Some(Mark {
            role: Role::Worst,
            label: label.to_owned(),
            x: witness.device_v?,
            y: witness.device_a.or_else(of_bank)?,
            value: margin.used_percent.map(|u| Measure::new(u, "%")),
        })
    };
    let marks = [
        nearest("soa.limiter-soa", "against safe area", Mains::High),
        nearest("soa.limiter-music", "clear of music", Mains::Nominal),
    ];
    Ok(Some(Picture {
        kind: Kind::Limiter,
        of: vec![device.owner.name.clone()],
        region: region(case),
        facts,
        panels: vec![panel(lines, marks.into_iter().flatten().collect())],
    }))
}
