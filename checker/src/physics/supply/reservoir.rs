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
    let sum: f64 = groups
        .iter()
        .zip(&one)
        .map(|(g, w)| f64::from(g.count) * w)
        .sum();
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::physics::math::sin;

    #[test]
    fn draws_match_fine_sampling() {
        for draw in [Draw::OneHalf, Draw::BothHalves] {
            let count = 100_000;
            let (mut mean, mut square) = (0.0, 0.0);
            for n in 0..count {
                let wave = sin(2.0 * PI * f64::from(n) / f64::from(count));
                let i = if draw == Draw::OneHalf {
                    wave.max(0.0)
                } else {
                    wave.abs()
                };
                mean += i / f64::from(count);
                square += i * i / f64::from(count);
            }
            assert!((draw.mean(Amp(1.0)).0 - mean).abs() < 1e-9);
            assert!((draw.ripple(Amp(1.0)).0 - (square - mean * mean).sqrt()).abs() < 1e-9);
        }
    }

    #[test]
    fn capacitors_share_by_esr_where_all_state_it_else_by_capacitance() {
        let one = |count, uf: f64, esr: Option<f64>| Reservoir {
            count,
            capacitance: Farad(uf * 1e-6),
            esr: esr.map(Ohm),
        };
        // By hand: 2 x 10 mF of 40 mohm and 1 x 1 mF of 0.2 ohm: 25 + 25 + 5 = 55 siemens.
        let stated = [one(2, 10e3, Some(0.04)), one(1, 1e3, Some(0.2))];
        let shares = ripple_shares(&stated).unwrap();
        assert!((shares[0] - 25.0 / 55.0).abs() < 1e-12 && (shares[1] - 5.0 / 55.0).abs() < 1e-12);
        let (c, esr) = in_parallel(&stated).unwrap();
        assert!((c.0 - 21e-3).abs() < 1e-12 && (esr.0 - 1.0 / 55.0).abs() < 1e-12);
        let silent = [one(2, 10e3, Some(0.04)), one(1, 1e3, None)];
        let shares = ripple_shares(&silent).unwrap();
        assert!((shares[0] - 10.0 / 21.0).abs() < 1e-12 && (shares[1] - 1.0 / 21.0).abs() < 1e-12);
        assert_eq!(in_parallel(&silent).unwrap().1, Ohm(0.0));
        assert_eq!(ripple_shares(&[]), None);
        assert_eq!(in_parallel(&[one(1, 0.0, None)]), None);
        assert_eq!(in_parallel(&[one(0, 1e3, None)]), None);
    }

    #[test]
    fn nonsense_is_refused() {
        let k = RippleMultipliers {
            charging: 1.0,
            audio: 1.0,
        };
        assert_eq!(reservoir_ripple(Amp(f64::NAN), Amp(1.0), k), None);
        assert_eq!(
            reservoir_ripple(Amp(1.0), Amp(1.0), RippleMultipliers { audio: 0.0, ..k }),
            None
        );
        let time = |r, c, v, l| Bleeder::PerRail(Ohm(r)).discharge_time(Farad(c), Volt(v), Volt(l));
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert_eq!(time(bad, 1.0, 100.0, 60.0), None);
            assert_eq!(time(1.0, bad, 100.0, 60.0), None);
            assert_eq!(time(1.0, 1.0, bad, 60.0), None);
            assert!(time(1.0, 1.0, 100.0, bad).is_none_or(|t| t == Second(0.0)));
        }
        assert_eq!(time(1.0, 1.0, 50.0, 60.0), Some(Second(0.0)));
        assert_eq!(Bleeder::RailToRail(Ohm(0.0)).dissipation(Volt(50.0)), None);
    }

    #[test]
    fn rail_to_rail_is_two_of_half_the_value() {
        // By symmetry its middle is at 0 V: each half bleeds one rail.
        let one = Bleeder::RailToRail(Ohm(9400.0));
        let two = Bleeder::PerRail(Ohm(4700.0));
        let time = |b: Bleeder| {
            b.discharge_time(Farad(0.01), Volt(104.0), Volt(60.0))
                .unwrap()
        };
        assert!((time(one) - time(two)).abs() < Second(1e-9));
        let watts = |b: Bleeder| b.dissipation(Volt(52.0)).unwrap().0;
        assert!((watts(one) - 2.0 * watts(two)).abs() < 1e-12);
    }
}
