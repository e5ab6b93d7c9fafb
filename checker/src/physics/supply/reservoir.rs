//! Reservoir capacitors: the ripple they carry, how several share it, what they store, and how a
//! bleeder empties them.
//! Must not know rectifiers or ratings.

use crate::physics::math::{PI, ln};
use crate::physics::unit::{Amp, Farad, Joule, Ohm, Second, Volt, Watt};

/// When within a signal period a channel draws on one rail.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Draw {
    /// While its output current has the rail's sign: half-sine pulses.
    OneHalf,
    /// In both halves, as a bridged pair does: rectified sine.
    BothHalves,
}

impl Draw {
    /// Mean of a rail current of peak `peak`: Î/π, or 2Î/π in both halves.
    #[must_use]
    pub fn mean(self, peak: Amp) -> Amp {
        match self {
            Self::OneHalf => peak / PI,
            Self::BothHalves => peak * (2.0 / PI),
        }
    }

    /// R.m.s. of what is left of a rail current without its mean, which the reservoir carries at
    /// mid-band: for half-sines Î·√(1/4 - 1/π²) = 0.3856·Î (r.m.s. Î/2, mean Î/π), in both halves
    /// Î·√(1/2 - 4/π²) = 0.3078·Î. `peak` is the sum of all in-phase peaks.
    #[must_use]
    pub fn ripple(self, peak: Amp) -> Amp {
        let mean = self.mean(Amp(1.0)).0;
        let mean_square = match self {
            Self::OneHalf => 0.25,
            Self::BothHalves => 0.5,
        };
        peak * (mean_square - mean * mean).sqrt()
    }
}

/// Factors by which a sheet multiplies its rated ripple current at other frequencies than the rated
/// one; 1 where it states none.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RippleMultipliers {
    /// At the ripple frequency, twice the mains.
    pub charging: f64,
    /// At the frequency of the signal.
    pub audio: f64,
}

/// Ripple current of a reservoir as its rating counts it:
/// √((Ich/k_ch)² + (Iaf/k_af)²). The two are uncorrelated, so their squares add.
/// `None` unless both multipliers are above zero and the currents finite and not negative.
#[must_use]
pub fn reservoir_ripple(charging: Amp, audio: Amp, k: RippleMultipliers) -> Option<Amp> {
    if !(k.charging > 0.0 && k.audio > 0.0 && charging.0 >= 0.0 && audio.0 >= 0.0) {
        return None;
    }
    let (a, b) = (charging.0 / k.charging, audio.0 / k.audio);
    let total = (a * a + b * b).sqrt();
    total.is_finite().then_some(Amp(total))
}

/// Equal capacitors in parallel on one rail.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reservoir {
    /// How many.
    pub count: u32,
    /// Capacitance of one.
    pub capacitance: Farad,
    /// ESR of one, if it is stated.
    pub esr: Option<Ohm>,
}

/// Total capacitance and ESR of `groups` in parallel: ΣnC and 1/Σ(n/ESR). The ESR is 0 unless every
/// group states its own. `None` for no capacitor, or for a value that is not above zero.
#[must_use]
pub fn in_parallel(groups: &[Reservoir]) -> Option<(Farad, Ohm)> {
    let capacitance = weights(groups, |g| Some(g.capacitance.0))?;
    let esr = weights(groups, |g| g.esr.map(|r| 1.0 / r.0)).map_or(0.0, |(sum, _)| 1.0 / sum);
    Some((Farad(capacitance.0), Ohm(esr)))
}

/// The part of a rail's ripple current that ONE capacitor of each group carries: in proportion to
/// 1/ESR where every ESR is stated (at ripple frequencies the ESR of a large electrolytic exceeds
/// its reactance, or both scale alike), else to C. `None` as for [`in_parallel`].
#[must_use]
pub fn ripple_shares(groups: &[Reservoir]) -> Option<Vec<f64>> {
    let (sum, one) = weights(groups, |g| g.esr.map(|r| 1.0 / r.0))
        .or_else(|| weights(groups, |g| Some(g.capacitance.0)))?;
    Some(one.into_iter().map(|w| w / sum).collect())
}

/// The weight of one capacitor of each group, and their sum over all capacitors.
fn weights(
    groups: &[Reservoir],
    weight: impl Fn(&Reservoir) -> Option<f64>,
) -> Option<(f64, Vec<f64>)> {
    let one: Vec<f64> = groups.iter().map(weight).collect::<Option<_>>()?;
    let sum: f64 = groups.iter().zip(&one).map(|(g, w)| f64::from(g.count) * w).sum();
    let sound = one.iter().all(|w| *w > 0.0 && w.is_finite());
    (sound && sum > 0.0 && sum.is_finite()).then_some((sum, one))
}

/// Energy in a capacitor: ½CV². It is also what a series resistance loses while it charges one from
/// a steady voltage, whatever the resistance, and a safe upper bound from a rectified sine.
#[must_use]
pub fn stored_energy(capacitance: Farad, voltage: Volt) -> Joule {
    Joule(0.5 * capacitance.0 * voltage.0 * voltage.0)
}

/// Resistors that empty the two equal reservoirs of a symmetrical supply.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Bleeder {
    /// One on each rail.
    PerRail(Ohm),
    /// One from rail to rail.
    RailToRail(Ohm),
}

impl Bleeder {
    /// Time for the voltage between the rails to fall from `start` to `limit` with nothing else
    /// drawing: t = τ·ln(start/limit), τ = R·C on each rail, or R·C/2 from rail to rail, the two
    /// reservoirs `per_rail` being in series there. Zero if it starts below.
    /// `None` unless everything is finite and above zero.
    #[must_use]
    pub fn discharge_time(self, per_rail: Farad, start: Volt, limit: Volt) -> Option<Second> {
        let (resistance, capacitance) = match self {
            Self::PerRail(r) => (r, per_rail),
            Self::RailToRail(r) => (r, per_rail / 2.0),
        };
        if !(resistance.0 > 0.0 && capacitance.0 > 0.0 && start.0 > 0.0 && limit.0 > 0.0) {
            return None;
        }
        let time = resistance * capacitance * ln(start / limit).max(0.0);
        time.is_finite().then_some(time)
    }

    /// Dissipation of one of these resistors at `rail` volts on each rail. `None` for a resistance
    /// not above zero or a voltage not finite.
    #[must_use]
    pub fn dissipation(self, rail: Volt) -> Option<Watt> {
        let (across, resistance) = match self {
            Self::PerRail(r) => (rail, r),
            Self::RailToRail(r) => (rail * 2.0, r),
        };
        let watts = across.0 * across.0 / resistance.0;
        (resistance.0 > 0.0 && watts.is_finite()).then_some(Watt(watts))
    }
}
