//! The banks of the output stage: how their devices share, and what they idle at.
//! Must not know signals or rails.

use super::case::{Case, Side};
use crate::build::Needs;
use crate::build::parts::{Device, Flavour, GainLine, Idle, Stage, both};
use crate::physics::bias::{self, THERMAL_VOLTAGE};
use crate::physics::drive::GainCurve;
use crate::physics::sharing::{Bank, Transfer};
use crate::physics::unit::{Amp, Ohm, Volt};

/// Upper and lower bank of one channel.
#[derive(Clone, Debug)]
pub struct Bench {
    upper: Bank,
    lower: Bank,
}

impl Bench {
    /// The bank of one side.
    #[must_use]
    pub fn bank(&self, side: Side) -> &Bank {
        match side {
            Side::Upper => &self.upper,
            Side::Lower => &self.lower,
        }
    }
}

/// Resistor in the emitter of each device: zero where `none` is fitted. One device alone needs no
/// figure: zero is then on the safe side for its voltage.
///
/// # Errors
/// When several are in parallel and nothing is stated.
pub fn emitter(stage: &Stage) -> Result<Ohm, Needs> {
    match stage.emitter.get() {
        Some(r) => Ok(r.ohm.nominal),
        None if stage.emitter.none || stage.pairs.get() == Some(&1) => Ok(Ohm::ZERO),
        None => Err(stage.emitter.missing()),
    }
}

/// The transfer curve of a MOSFET.
///
/// # Errors
/// When it is not stated, or its points are no curve.
pub fn transfer(device: &Device) -> Result<Transfer, Needs> {
    let points = device.gate_source.need()?;
    Transfer::new(points).ok_or_else(|| {
        Needs::because(format!(
            "the gate-source points of {} do not rise together, or are fewer than two",
            device.owner.name
        ))
    })
}

/// The gain curve of a device: the `minimum` line, else the `typical` one times `typical` of a policy.
///
/// # Errors
/// When no gain is stated, or its points are no curve.
pub fn gain(device: &Device, typical: f64) -> Result<GainCurve, Needs> {
    let line = device.hfe.iter().find(|l| l.minimum).or(device.hfe.first());
    let Some(GainLine {
        minimum, points, ..
    }) = line
    else {
        return Err(device.hfe_field.missing());
    };
    let factor = if *minimum { 1.0 } else { typical };
    let points: Vec<(Amp, f64)> = points.iter().map(|(i, h)| (*i, h * factor)).collect();
    GainCurve::new(&points).ok_or_else(|| {
        Needs::because(format!(
            "the hfe points of {} are no curve: currents must rise and gains be positive",
            device.owner.name
        ))
    })
}

/// How the devices of one side share.
///
/// # Errors
/// What the stage or its devices do not state.
pub fn bank(stage: &Stage, side: Side) -> Result<Bank, Needs> {
    let device = stage.device(side);
    let (pairs, re) = both(stage.pairs.need().copied(), emitter(stage))?;
    let wrong = || {
        Needs::because(format!(
            "pairs and emitter resistor of stage {} do not make a bank",
            stage.owner.name
        ))
    };
    let low = stage.emitter.get().map_or(0.0, |r| {
        if r.ohm.nominal > Ohm::ZERO {
            (r.ohm.nominal - r.ohm.low) / r.ohm.nominal
        } else {
            0.0
        }
    });
    if pairs <= 1 {
        return Bank::even(pairs, re).ok_or_else(wrong);
    }
    match device.flavour {
        Flavour::Bipolar => {
            let spread = stage.vbe_spread.need()?;
            Bank::bipolar(pairs, re, low, *spread, THERMAL_VOLTAGE).ok_or_else(wrong)
        }
        Flavour::Mosfet => {
            let (spread, curve) = both(stage.vbe_spread.need().copied(), transfer(device))?;
            Bank::source_follower(pairs, re, low, spread, curve).ok_or_else(wrong)
        }
    }
}

/// One group of `idle` as current of one device.
///
/// # Errors
/// When volts are stated across a resistor that is not.
pub fn idle_of(stage: &Stage, group: &Idle) -> Result<Amp, Needs> {
    let pairs = stage.pairs.need().copied()?;
    let figure = match (group.current, group.volts, group.per, group.across) {
        (Some(i), None, Some("channel"), _) => bias::Idle::PerChannel(i),
        (Some(i), None, _, _) => bias::Idle::PerDevice(i),
        (None, Some(v), _, Some("both-emitters")) => bias::Idle::AcrossBoth(v),
        (None, Some(v), _, _) => bias::Idle::AcrossEmitter(v),
        _ => {
            return Err(Needs::because(
                "a group of `idle` states one current or one voltage",
            ));
        }
    };
    let re = match group.volts {
        Some(_) => stage.emitter.need()?.ohm.nominal,
        None => emitter(stage).unwrap_or(Ohm::ZERO),
    };
    let figures = figure.figures(re, pairs);
    let per_device = figures.map(|f| f.per_device).or_else(|| {
        group.current.map(|i| {
            if group.per == Some("channel") {
                i / f64::from(pairs.max(1))
            } else {
                i
            }
        })
    });
    per_device
        .filter(|i| i.is_finite() && *i >= Amp::ZERO)
        .ok_or_else(|| {
            Needs::because(format!(
                "the idle current of stage {} cannot be worked out",
                stage.owner.name
            ))
        })
}

impl Case<'_> {
    /// The banks of the output stage.
    ///
    /// # Errors
    /// What the stage does not state.
    pub fn bench(&self) -> Result<&Bench, Needs> {
        self.bench
            .get_or_init(|| {
                let stage = self.output();
                let (upper, lower) = both(bank(stage, Side::Upper), bank(stage, Side::Lower))?;
                Ok(Bench { upper, lower })
            })
            .as_ref()
            .map_err(Clone::clone)
    }

    /// Idle current of one output device: the greatest that its `idle` line states. `none` is zero.
    ///
    /// # Errors
    /// When it is not stated.
    pub fn idle(&self) -> Result<Amp, Needs> {
        let stage = self.output();
        if stage.idle.none {
            return Ok(Amp::ZERO);
        }
        let mut most = Amp::ZERO;
        for group in stage.idle.need()? {
            most = most.max(idle_of(stage, group)?);
        }
        Ok(most)
    }

    /// VBE of a device.
    #[must_use]
    pub fn vbe(device: &Device) -> Volt {
        device.vbe.get().map_or(Volt(0.65), |v| v.0)
    }
}
