//! Junction temperature under pulses and under a sine, from a Foster network.
//! Must not know ratings, curves or where the power comes from.
//!
//! A Foster network is a row of thermal resistors, each with a time constant; the junction rises by
//! the sum of what each does alone, so a periodic answer is a sum of first-order answers.

use crate::physics::load::Impedance;
use crate::physics::math;
use crate::physics::unit::{Hertz, Kelvin, KelvinPerWatt, Ohm, Second, Volt, Watt};

/// Most terms a network may have; data sheets print two to six.
const MOST_TERMS: usize = 32;
/// Steps of the scan over the half-cycle before its slope is solved.
const STEPS: u32 = 24;

/// One term: a resistance and its time constant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Term {
    /// R.
    pub resistance: KelvinPerWatt,
    /// τ.
    pub time_constant: Second,
}

/// Transient thermal impedance, junction to case: Z(t) = Σ R·(1 - exp(-t/τ)).
#[derive(Clone, Debug, PartialEq)]
pub struct Foster {
    terms: Vec<Term>,
}

/// The half-cycle of dissipation that a class-B bank gives one device:
/// p(α) = w·sin α·(V - A·sin α - B·cos α) for α from 0 to π of the current, then nothing.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HalfCycle {
    /// Peak device current times V, and times A and B with the sign of the angle, watts.
    direct: f64,
    sine: f64,
    cosine: f64,
}

impl HalfCycle {
    /// One device of a bank under a sine: `share_of_bank` is the part of the bank's current that it
    /// carries, taken the same at every instant, `emitters` the resistors in parallel (RE/N). Unlike the peak watts, the
    /// temperature differs between a lagging load, which heats late in the half-cycle, and a leading
    /// one.
    ///
    /// `None` for a value that is negative, not finite or a load that is not passive.
    #[must_use]
    pub fn new(
        rail: Volt,
        amplitude: Volt,
        load: Impedance,
        emitters: Ohm,
        share_of_bank: f64,
    ) -> Option<Self> {
        let valid = rail >= Volt::ZERO
            && amplitude >= Volt::ZERO
            && emitters >= Ohm::ZERO
            && load.is_passive()
            && (0.0..=1.0).contains(&share_of_bank);
        if !valid {
            return None;
        }
        let (modulus, angle) = (load.modulus(), load.angle_rad());
        let (sin, cos) = math::sin_cos(angle);
        let bank = amplitude / modulus;
        let device = bank.0 * share_of_bank;
        let half = Self {
            direct: device * rail.0,
            sine: device * (amplitude * cos + bank * emitters).0,
            cosine: device * amplitude.0 * sin,
        };
        [half.direct, half.sine, half.cosine]
            .iter()
            .all(|w| w.is_finite())
            .then_some(half)
    }

    /// Mean over the whole period, V/π - A/4 times the device's peak current.
    #[must_use]
    pub fn mean(&self) -> Watt {
        Watt(self.direct / math::PI - self.sine / 4.0)
    }

    /// Instantaneous watts at a phase of the current within 0 to π.
    fn at(&self, sin: f64, cos: f64) -> f64 {
        sin * (self.direct - self.sine * sin - self.cosine * cos)
    }
}

impl Foster {
    /// `None` unless there are 1 to 32 terms, each positive and finite.
    #[must_use]
    pub fn new(terms: &[Term]) -> Option<Self> {
        let plausible = 1e-12..=1e12;
        let valid = |t: &Term| {
            plausible.contains(&t.resistance.0) && plausible.contains(&t.time_constant.0)
        };
        ((1..=MOST_TERMS).contains(&terms.len()) && terms.iter().all(valid)).then(|| Self {
            terms: terms.to_vec(),
        })
    }

    /// Σ R, the steady resistance.
    #[must_use]
    pub fn steady(&self) -> KelvinPerWatt {
        self.sum(|_| 1.0)
    }

    /// Z(t), the peak rise per watt of a single rectangular pulse. Zero for no time.
    #[must_use]
    pub fn single_pulse(&self, length: Second) -> KelvinPerWatt {
        self.sum(|tau| -math::expm1(-length.0.max(0.0) / tau))
    }

    /// Peak rise per watt under endlessly repeated rectangular pulses:
    /// Σ R·(1 - exp(-tp/τ))/(1 - exp(-T/τ)). `None` unless 0 < tp <= T.
    #[must_use]
    pub fn repeated_peak(&self, length: Second, period: Second) -> Option<KelvinPerWatt> {
        Self::is_train(length, period)
            .then(|| self.sum(|tau| math::expm1(-length.0 / tau) / math::expm1(-period.0 / tau)))
    }

    /// Least rise per watt under the same pulses, just before the next one: each term of the peak
    /// times exp(-(T - tp)/τ). `None` unless 0 < tp <= T.
    #[must_use]
    pub fn repeated_valley(&self, length: Second, period: Second) -> Option<KelvinPerWatt> {
        Self::is_train(length, period).then(|| {
            self.sum(|tau| {
                math::expm1(-length.0 / tau) / math::expm1(-period.0 / tau)
                    * math::exp((length.0 - period.0) / tau)
            })
        })
    }

    fn is_train(length: Second, period: Second) -> bool {
        length > Second::ZERO && length <= period && period.is_finite()
    }

    fn sum(&self, part: impl Fn(f64) -> f64) -> KelvinPerWatt {
        KelvinPerWatt(
            self.terms
                .iter()
                .map(|t| t.resistance.0 * part(t.time_constant.0))
                .sum(),
        )
    }

    /// Greatest rise of the junction above the case in the periodic steady state of a half-cycle
    /// repeated at `frequency`; the mean rise is in it.
    ///
    /// With a = ωτ each term obeys a·dx/dα + x = R·p. While the bank conducts p is a constant, a
    /// sine and a pair at twice the frequency, so x is their first-order answers plus K·exp(-α/a);
    /// then it falls as exp(-(α - π)/a); K makes the end meet the beginning. The peak is inside the
    /// half-cycle, because every term only falls outside it: a scan, then the root of the slope.
    /// `None` unless the frequency is positive and finite.
    #[must_use]
    pub fn periodic_peak(&self, half: &HalfCycle, frequency: Hertz) -> Option<Kelvin> {
        if !(frequency > Hertz::ZERO && frequency.is_finite()) {
            return None;
        }
        let omega = math::TAU * frequency.0;
        let mut answers = [Answer::default(); MOST_TERMS];
        let count = self.terms.len().min(MOST_TERMS);
        for (answer, term) in answers.iter_mut().zip(&self.terms) {
            *answer = Answer::new(half, term.resistance.0, omega * term.time_constant.0);
        }
        let answers = answers.get(..count)?;
        let rise_and_slope = |alpha: f64| {
            let (sin, cos) = math::sin_cos(alpha);
            let watts = half.at(sin, cos);
            answers.iter().fold((0.0, 0.0), |(rise, slope), answer| {
                let x = answer.at(alpha, sin, cos);
                (rise + x, slope + (answer.resistance * watts - x) / answer.a)
            })
        };
        let step = math::PI / f64::from(STEPS);
        let mut before = (0.0, rise_and_slope(0.0));
        let mut peak = before.1.0;
        for k in 1..=STEPS {
            let alpha = step * f64::from(k);
            let here = (alpha, rise_and_slope(alpha));
            peak = peak.max(here.1.0);
            if before.1.1 > 0.0 && here.1.1 <= 0.0 {
                let top = math::root(|x| rise_and_slope(x).1, before.0, alpha, 1e-12)?;
                peak = peak.max(rise_and_slope(top).0);
            }
            before = here;
        }
        peak.is_finite().then_some(Kelvin(peak))
    }
}

/// The periodic answer of one term, as coefficients.
#[derive(Clone, Copy, Debug, Default)]
struct Answer {
    resistance: f64,
    a: f64,
    constant: f64,
    /// Of sin α and cos α.
    first: (f64, f64),
    /// Of sin 2α and cos 2α.
    second: (f64, f64),
    /// K of K·exp(-α/a).
    decay: f64,
}

impl Answer {
    /// p = V·sin α - A/2 + A/2·cos 2α - B/2·sin 2α; a·x' + x = R·p answers sin nα with
    /// (sin nα - na·cos nα)/(1 + n²a²) and cos nα with (cos nα + na·sin nα)/(1 + n²a²).
    fn new(half: &HalfCycle, resistance: f64, a: f64) -> Self {
        let direct = resistance * half.direct / (1.0 + a * a);
        let double = 0.5 * resistance / (1.0 + 4.0 * a * a);
        let first = (direct, -a * direct);
        let second = (
            double * (2.0 * a * half.sine - half.cosine),
            double * (half.sine + 2.0 * a * half.cosine),
        );
        let constant = -0.5 * resistance * half.sine;
        // x(π) = xp(π) + K·E and x(0) = xp(0) + K = E·x(π), E = exp(-π/a). The constant and the
        // double frequency are the same at 0 and π, the first reverses: K = (E·xp(π) - xp(0))/(1 - E²)
        // falls into two quotients that keep their digits for slow terms.
        let e = math::exp(-math::PI / a);
        let decay = -(constant + second.1) / (1.0 + e) + first.1 / math::expm1(-math::PI / a);
        Self {
            resistance,
            a,
            constant,
            first,
            second,
            decay,
        }
    }

    fn at(&self, alpha: f64, sin: f64, cos: f64) -> f64 {
        self.constant
            + self.first.0 * sin
            + self.first.1 * cos
            + self.second.0 * (2.0 * sin * cos)
            + self.second.1 * (1.0 - 2.0 * sin * sin)
            + self.decay * math::exp(-alpha / self.a)
    }
}

#[cfg(test)]
#[allow(
    clippy::disallowed_methods,
    reason = "a twin may use the platform's functions"
)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn network(terms: &[(f64, f64)]) -> Foster {
        let terms: Vec<_> = terms
            .iter()
            .map(|t| Term {
                resistance: KelvinPerWatt(t.0),
                time_constant: Second(t.1),
            })
            .collect();
        Foster::new(&terms).unwrap()
    }

    /// The twin steps every term through whole periods until they repeat: exact decay over a step,
    /// the power of its middle.
    fn marched(foster: &Foster, half: &HalfCycle, frequency: f64) -> f64 {
        let steps = 20_000;
        let dt = 1.0 / frequency / f64::from(steps);
        let slowest = foster
            .terms
            .iter()
            .map(|t| t.time_constant.0)
            .fold(0.0, f64::max);
        let watts: Vec<f64> = (0..steps)
            .map(|k| math::TAU * (f64::from(k) + 0.5) / f64::from(steps))
            .map(|x| {
                if x < math::PI {
                    half.at(x.sin(), x.cos())
                } else {
                    0.0
                }
            })
            .collect();
        let decays: Vec<_> = foster
            .terms
            .iter()
            .map(|t| (-dt / t.time_constant.0).exp())
            .collect();
        // Start each term at its mean so that few periods are left to settle.
        let mut x: Vec<_> = foster
            .terms
            .iter()
            .map(|t| t.resistance.0 * half.mean().0)
            .collect();
        let periods = (30.0 * slowest * frequency).ceil().clamp(3.0, 400.0) as usize;
        let mut peak = 0.0_f64;
        for period in 0..periods {
            for p in &watts {
                for ((x, t), d) in x.iter_mut().zip(&foster.terms).zip(&decays) {
                    *x = t.resistance.0 * p + (*x - t.resistance.0 * p) * d;
                }
                if period + 1 == periods {
                    peak = peak.max(x.iter().sum());
                }
            }
        }
        peak
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(40))]

        #[test]
        fn periodic_peak_is_what_marching_finds(
            degrees in -90.0..90.0f64, swing in 0.1..1.0f64, frequency in 10.0..200.0f64,
            terms in proptest::collection::vec((0.05..1.0f64, -4.0..-1.2f64), 1..4),
        ) {
            let terms: Vec<_> = terms.iter().map(|t| (t.0, 10f64.powf(t.1))).collect();
            let foster = network(&terms);
            let load = Impedance::polar(Ohm(4.0), degrees.to_radians());
            let half = HalfCycle::new(Volt(50.0), Volt(50.0 * swing), load, Ohm(0.1), 0.5).unwrap();
            let found = foster.periodic_peak(&half, Hertz(frequency)).unwrap().0;
            let fine = marched(&foster, &half, frequency);
            prop_assert!((found / fine - 1.0).abs() < 2e-5, "{found} {fine}");
        }

        #[test]
        fn limits_are_the_mean_and_the_instantaneous_peak(
            degrees in -90.0..90.0f64, swing in 0.1..1.0f64,
        ) {
            let load = Impedance::polar(Ohm(4.0), degrees.to_radians());
            let half = HalfCycle::new(Volt(50.0), Volt(50.0 * swing), load, Ohm(0.0), 1.0).unwrap();
            let rise = |tau: f64| {
                network(&[(1.0, tau)]).periodic_peak(&half, Hertz(50.0)).unwrap().0
            };
            prop_assert!((rise(1e6) / half.mean().0 - 1.0).abs() < 1e-5);
            let peak = (0..=100_000)
                .map(|k| math::PI * f64::from(k) / 100_000.0)
                .map(|x| half.at(x.sin(), x.cos()))
                .fold(0.0, f64::max);
            prop_assert!((rise(1e-9) / peak - 1.0).abs() < 1e-4);
            prop_assert!(rise(0.01) > half.mean().0 && rise(0.01) < peak);
        }

        #[test]
        fn any_input_is_refused_or_answered_with_numbers(
            r in proptest::num::f64::ANY, tau in proptest::num::f64::ANY,
            v in proptest::num::f64::ANY, f in proptest::num::f64::ANY,
        ) {
            let term = Term { resistance: KelvinPerWatt(r), time_constant: Second(tau) };
            let half = HalfCycle::new(
                Volt(v), Volt(v * 0.9), Impedance::resistive(Ohm(8.0)), Ohm(0.1), 0.5,
            );
            if let (Some(foster), Some(half)) = (Foster::new(&[term]), half)
                && let Some(rise) = foster.periodic_peak(&half, Hertz(f))
            {
                prop_assert!(rise.is_finite());
            }
        }
    }

    #[test]
    fn degenerate_networks_are_refused() {
        assert_eq!(Foster::new(&[]), None);
        let term = |r, tau| Term {
            resistance: KelvinPerWatt(r),
            time_constant: Second(tau),
        };
        assert_eq!(Foster::new(&[term(0.0, 1.0)]), None);
        assert_eq!(Foster::new(&[term(1.0, f64::NAN)]), None);
        assert_eq!(
            network(&[(1.0, 1.0)]).repeated_peak(Second(2.0), Second(1.0)),
            None
        );
        let eight = Impedance::resistive(Ohm(8.0));
        assert_eq!(
            HalfCycle::new(Volt(f64::NAN), Volt(1.0), eight, Ohm(0.0), 1.0),
            None
        );
    }
}
