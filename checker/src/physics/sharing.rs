//! How a bank's current divides among its parallel devices when one of them deviates.
//! Must not know rails, loads or temperatures.
//!
//! Model: the devices have a common base (or gate) node and a common output node, each with its own
//! resistor in the emitter (source). One device deviates, its junction voltage ΔV below that of the
//! others and its resistor low by the tolerance; the other N-1 are nominal. It is the most loaded.

use crate::physics::math;
use crate::physics::unit::{Amp, Ohm, Volt};

/// Greatest deviation of a junction voltage that is still two devices of one type.
const MOST_DEVIATION: Volt = Volt(2.0);

/// VGS against ID of a field-effect transistor, straight between the stated points in
/// (VGS, √ID): the square law of a device in saturation, so few points describe it well.
#[derive(Clone, Debug, PartialEq)]
pub struct Transfer {
    /// √ID, VGS.
    points: Vec<(f64, f64)>,
}

impl Transfer {
    /// `None` unless there are two points or more, finite, currents from zero up and both columns
    /// strictly ascending.
    #[must_use]
    pub fn new(points: &[(Volt, Amp)]) -> Option<Self> {
        let ascending = points.windows(2).all(|pair| match pair {
            [a, b] => a.0 < b.0 && a.1 < b.1,
            _ => false,
        });
        let finite = points.iter().all(|p| p.0.is_finite() && p.1.is_finite());
        let from_zero = points.first().is_some_and(|p| p.1 >= Amp::ZERO);
        (points.len() >= 2 && ascending && finite && from_zero).then(|| Self {
            points: points.iter().map(|p| (p.1.0.sqrt(), p.0.0)).collect(),
        })
    }

    /// VGS at a drain current; `None` outside the stated points.
    #[must_use]
    pub fn gate_source(&self, drain: Amp) -> Option<Volt> {
        self.covers(drain).then(|| Volt(self.extended(drain.0).0))
    }

    /// Transconductance dID/dVGS = 2√ID·d√ID/dVGS at a drain current, in siemens; at a stated
    /// point the greater of the two sides. `None` outside the stated points.
    #[must_use]
    pub fn transconductance_siemens(&self, drain: Amp) -> Option<f64> {
        let x = drain.0.sqrt();
        self.points
            .windows(2)
            .filter_map(|pair| match pair {
                [a, b] if a.0 <= x && x <= b.0 => Some(2.0 * x * (b.0 - a.0) / (b.1 - a.1)),
                _ => None,
            })
            .reduce(f64::max)
    }

    /// Whether the stated points reach round this current.
    #[must_use]
    pub fn covers(&self, drain: Amp) -> bool {
        let x = drain.0.sqrt();
        self.points.first().is_some_and(|p| p.0 <= x)
            && self.points.last().is_some_and(|p| x <= p.0)
    }

    /// VGS and dVGS/d√ID, the first and last segment extended: only the DIFFERENCE of two such
    /// voltages is used, which the square law carries beyond the points.
    fn extended(&self, drain: f64) -> (f64, f64) {
        let x = drain.max(0.0).sqrt();
        let mut line = (0.0, 0.0);
        for pair in self.points.windows(2) {
            if let [a, b] = pair {
                let slope = (b.1 - a.1) / (b.0 - a.0);
                line = (a.1 + slope * (x - a.0), slope);
                if x <= b.0 {
                    break;
                }
            }
        }
        line
    }
}

#[derive(Clone, Debug, PartialEq)]
enum Law {
    /// Every device carries the same.
    Even,
    /// VBE = VT·ln(I/Is).
    Bipolar { thermal: f64 },
    /// VGS from a transfer curve.
    SourceFollower { transfer: Transfer },
}

/// The parallel devices of one polarity in one channel.
#[derive(Clone, Debug, PartialEq)]
pub struct Bank {
    devices: u32,
    /// Nominal emitter resistor.
    emitter: Ohm,
    /// Emitter resistor of the deviating device.
    low: Ohm,
    /// How much less junction voltage the deviating device needs.
    deviation: Volt,
    law: Law,
}

/// The deviating device at one current of the bank.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Split {
    /// Its part of the bank's current, 0 to 1.
    pub(crate) fraction: f64,
    /// d ln(its current)/d ln(bank current).
    pub(crate) elasticity: f64,
}

impl Bank {
    /// Devices that share evenly. `None` without a device or with a negative resistor.
    #[must_use]
    pub fn even(devices: u32, emitter: Ohm) -> Option<Self> {
        Self::new(devices, emitter, 0.0, Volt::ZERO, Law::Even)
    }

    /// Emitter followers: one has a VBE lower by `deviation` and a resistor low by `tolerance` (a
    /// ratio); `thermal` is VT = kT/q. `None` for a negative, non-finite or absurd value.
    #[must_use]
    pub fn bipolar(
        devices: u32,
        emitter: Ohm,
        tolerance: f64,
        deviation: Volt,
        thermal: Volt,
    ) -> Option<Self> {
        // Below 1 mV (12 K) nothing here holds, and exp(ΔV/VT) stays finite.
        (thermal >= Volt(1e-3) && thermal.is_finite() && deviation / thermal < 500.0)
            .then(|| {
                Self::new(
                    devices,
                    emitter,
                    tolerance,
                    deviation,
                    Law::Bipolar { thermal: thermal.0 },
                )
            })
            .flatten()
    }

    /// Source followers: one needs a VGS lower by `deviation` and has a source resistor low by
    /// `tolerance`.
    #[must_use]
    pub fn source_follower(
        devices: u32,
        source: Ohm,
        tolerance: f64,
        deviation: Volt,
        transfer: Transfer,
    ) -> Option<Self> {
        Self::new(
            devices,
            source,
            tolerance,
            deviation,
            Law::SourceFollower { transfer },
        )
    }

    fn new(devices: u32, emitter: Ohm, tolerance: f64, deviation: Volt, law: Law) -> Option<Self> {
        let valid = devices > 0
            && emitter >= Ohm::ZERO
            && emitter.is_finite()
            && (0.0..1.0).contains(&tolerance)
            && deviation >= Volt::ZERO
            && deviation <= MOST_DEVIATION;
        let law = if devices == 1 { Law::Even } else { law };
        valid.then(|| Self {
            devices,
            emitter,
            low: emitter * (1.0 - tolerance),
            deviation,
            law,
        })
    }

    /// The same bank with another resistor in the deviating device's own emitter. `None` for a negative
    /// one.
    #[must_use]
    pub fn with_own_resistor(&self, own: Ohm) -> Option<Self> {
        (own >= Ohm::ZERO && own.is_finite()).then(|| Self {
            low: own,
            ..self.clone()
        })
    }

    /// N.
    #[must_use]
    pub fn devices(&self) -> u32 {
        self.devices
    }

    /// Nominal emitter (source) resistor of each device.
    #[must_use]
    pub fn emitter(&self) -> Ohm {
        self.emitter
    }

    /// The resistors of the bank in parallel, RE/N.
    #[must_use]
    pub fn emitters_in_parallel(&self) -> Ohm {
        self.emitter / f64::from(self.devices)
    }

    /// Current of the most loaded device when the bank carries `total`.
    #[must_use]
    pub fn most_loaded(&self, total: Amp) -> Amp {
        total * self.split(total.0).fraction
    }

    /// Current of each other device when the bank carries `total`.
    #[must_use]
    pub fn least_loaded(&self, total: Amp) -> Amp {
        match self.law {
            Law::Even => total / f64::from(self.devices),
            _ => total * ((1.0 - self.split(total.0).fraction) / f64::from(self.devices - 1)),
        }
    }

    /// share(I) = I1·N/I: how much more than its even part the most loaded device carries.
    /// At zero current the limit for small currents. It moves one way only with the current, from
    /// exp(ΔV/VT) against one towards the inverse ratio of the resistors.
    #[must_use]
    pub fn share(&self, total: Amp) -> f64 {
        self.split(total.0).fraction * f64::from(self.devices)
    }

    /// Current of the most loaded device when each other one carries `nominal`: what the worst
    /// device stands when a limiter senses one of the others. `None` for a negative or non-finite
    /// current, or where no finite current answers (no resistor, all current in one device).
    #[must_use]
    pub fn most_loaded_beside(&self, nominal: Amp) -> Option<Amp> {
        if !(nominal >= Amp::ZERO && nominal.is_finite()) {
            return None;
        }
        let (r1, r2, i2) = (self.low.0, self.emitter.0, nominal.0);
        match &self.law {
            Law::Even => Some(nominal),
            Law::Bipolar { thermal } => {
                let balance =
                    |y: f64| thermal * y + i2 * (r1 * math::exp(y) - r2) - self.deviation.0;
                let (lo, hi) = self.bounds(*thermal);
                let y = if hi - lo < 1e-15 {
                    lo
                } else {
                    math::root(balance, lo, hi, 1e-14)?
                };
                Some(nominal * math::exp(y))
            }
            Law::SourceFollower { transfer } => {
                let level = i2 * r2 + transfer.extended(i2).0 + self.deviation.0;
                let excess = |i1: f64| i1 * r1 + transfer.extended(i1).0 - level;
                let mut top = i2.max(1e-3);
                // Each doubling raises VGS by 1.4 of its slope: 60 of them are beyond any device.
                for _ in 0..60 {
                    if excess(top) > 0.0 {
                        return math::root(excess, i2, top, 1e-12 * top).map(Amp);
                    }
                    top *= 2.0;
                }
                None
            }
        }
    }

    /// The two limits of ln(I1/I2): by the junctions alone at small currents, ΔV/VT, and by the
    /// resistors alone at large ones, ln(R2/R1). Every current lies between them.
    fn bounds(&self, thermal: f64) -> (f64, f64) {
        let junctions = self.deviation.0 / thermal;
        if self.emitter <= Ohm::ZERO {
            return (junctions, junctions);
        }
        let resistors = math::ln(self.emitter / self.low);
        (junctions.min(resistors), junctions.max(resistors))
    }

    /// The share bends where a transfer curve does.
    pub(crate) fn has_kinks(&self) -> bool {
        matches!(self.law, Law::SourceFollower { .. })
    }

    pub(crate) fn split(&self, total: f64) -> Split {
        let others = f64::from(self.devices) - 1.0;
        match &self.law {
            Law::Even => Split {
                fraction: 1.0 / (others + 1.0),
                elasticity: 1.0,
            },
            Law::Bipolar { thermal } => self.bipolar_split(total.max(0.0), others, *thermal),
            Law::SourceFollower { transfer } => self.source_split(total.max(0.0), others, transfer),
        }
    }

    /// Solves VT·y + I1·R1 - I2·R2 = ΔV for y = ln(I1/I2), with I1 = I·eʸ/(N-1+eʸ). In y the left
    /// side rises with a slope of VT at least, and R = 0 needs no case of its own. Newton, kept
    /// between the two limits of `bounds`.
    fn bipolar_split(&self, total: f64, others: f64, thermal: f64) -> Split {
        let (r1, r2) = (self.low.0, self.emitter.0);
        let (mut lo, mut hi) = self.bounds(thermal);
        // At large currents the resistors decide, at small ones the junctions: start where the two
        // pull evenly.
        let drop = total * r2 / (others + 1.0);
        let mut y = (self.deviation.0 + drop * math::ln(r2.max(1e-300) / r1.max(1e-300)))
            / (thermal + drop);
        y = y.clamp(lo, hi);
        for _ in 0..60 {
            let e = math::exp(y);
            let sum = others + e;
            let balance = thermal * y + total * (r1 * e - r2) / sum - self.deviation.0;
            let slope = thermal + total * e * (r1 * others + r2) / (sum * sum);
            if balance > 0.0 {
                hi = y;
            } else {
                lo = y;
            }
            let step = balance / slope;
            let next = y - step;
            let kept = if next >= lo && next <= hi {
                next
            } else {
                0.5 * (lo + hi)
            };
            let moved = (kept - y).abs();
            y = kept;
            // Newton squares what is left of the error.
            if moved <= 1e-8 {
                break;
            }
        }
        let e = math::exp(y);
        let sum = others + e;
        let slope = thermal + total * e * (r1 * others + r2) / (sum * sum);
        let elasticity = 1.0 - others / sum * total * (r1 * e - r2) / (sum * slope);
        Split {
            fraction: e / sum,
            elasticity,
        }
    }

    /// Solves I1·R1 + VGS(I1) - ΔV = I2·R2 + VGS(I2) for I1, between an even share and all of it.
    fn source_split(&self, total: f64, others: f64, transfer: &Transfer) -> Split {
        let (r1, r2) = (self.low.0, self.emitter.0);
        let all = Split {
            fraction: 1.0,
            elasticity: 1.0,
        };
        // At no current the device with the lower threshold conducts alone.
        if total <= 0.0 {
            return if self.deviation > Volt::ZERO {
                all
            } else {
                Split {
                    fraction: 1.0 / (others + 1.0),
                    elasticity: 1.0,
                }
            };
        }
        let excess = |i1: f64| {
            let i2 = (total - i1) / others;
            i1 * r1 + transfer.extended(i1).0 - self.deviation.0 - i2 * r2 - transfer.extended(i2).0
        };
        let even = total / (others + 1.0);
        let Some(i1) = math::root(excess, even, total, 1e-13 * total) else {
            return all;
        };
        let i2 = (total - i1) / others;
        // dV/dI = (dV/d√I)/(2√I), multiplied through by √I2 so that I2 = 0 is no special case.
        let (root1, root2) = (i1.max(0.0).sqrt(), i2.max(0.0).sqrt());
        let own = (r1 + transfer.extended(i1).1 / (2.0 * root1)) * root2;
        let other = (r2 * root2 + 0.5 * transfer.extended(i2).1) / others;
        Split {
            fraction: i1 / total,
            elasticity: total / i1 * other / (own + other),
        }
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

    fn transfer() -> Transfer {
        Transfer::new(&[
            (Volt(3.6), Amp(0.1)),
            (Volt(4.2), Amp(1.0)),
            (Volt(5.0), Amp(4.0)),
            (Volt(6.5), Amp(12.0)),
        ])
        .unwrap()
    }

    proptest! {
        #[test]
        fn bipolar_currents_balance(
            n in 2u32..13, re in prop_oneof![Just(0.0), 1e-3..2.0f64], tol in 0.0..0.3f64,
            dv in 0.0..0.1f64, total in 1e-6..100.0f64,
        ) {
            let bank = Bank::bipolar(n, Ohm(re), tol, Volt(dv), Volt(0.0257)).unwrap();
            let (i1, i2) = (bank.most_loaded(Amp(total)).0, bank.least_loaded(Amp(total)).0);
            let others = f64::from(n) - 1.0;
            prop_assert!((i1 + others * i2 - total).abs() < 1e-12 * total);
            let left = i1 * re * (1.0 - tol) + 0.0257 * i1.ln() - dv;
            let right = i2 * re + 0.0257 * i2.ln();
            prop_assert!((left - right).abs() < 1e-11 * (1.0 + total * re));
            let back = bank.most_loaded_beside(Amp(i2)).unwrap().0;
            prop_assert!((back - i1).abs() < 1e-9 * i1);
        }

        #[test]
        fn elasticity_is_the_slope(
            n in 2u32..9, re in 0.0..1.0f64, dv in 1e-4..0.05f64, total in 0.01..30.0f64,
            tol in 0.0..0.2f64, fet in any::<bool>(),
        ) {
            let bank = if fet {
                Bank::source_follower(n, Ohm(re), tol, Volt(dv * 10.0), transfer())
            } else {
                Bank::bipolar(n, Ohm(re), tol, Volt(dv), Volt(0.0257))
            }
            .unwrap();
            let h = 1e-5;
            let at = |k: f64| bank.most_loaded(Amp(total * k)).0.ln();
            let (left, right) =
                ((at(1.0) - at(1.0 - h)) / -(1.0 - h).ln(), (at(1.0 + h) - at(1.0)) / (1.0 + h).ln());
            // A kink of the transfer curve has two slopes; anywhere else they agree.
            prop_assume!((left - right).abs() < 1e-4);
            prop_assert!((bank.split(total).elasticity - 0.5 * (left + right)).abs() < 2e-4);
        }

        #[test]
        fn share_moves_one_way_with_current(
            n in 2u32..9, re in 0.0..1.0f64, tol in 0.0..0.2f64, dv in 0.0..0.06f64,
        ) {
            let bank = Bank::bipolar(n, Ohm(re), tol, Volt(dv), Volt(0.0257)).unwrap();
            let shares: Vec<f64> =
                (0..60).map(|k| bank.share(Amp(1e-4 * 1.3f64.powi(k)))).collect();
            let falls = shares.windows(2).all(|s| s[1] <= s[0] + 1e-12);
            let rises = shares.windows(2).all(|s| s[1] >= s[0] - 1e-12);
            prop_assert!(falls || rises);
        }

        #[test]
        fn source_currents_balance(
            n in 2u32..9, rs in 0.0..1.0f64, dv in 0.0..0.5f64, total in 1e-3..60.0f64,
        ) {
            let (bank, curve) =
                (Bank::source_follower(n, Ohm(rs), 0.05, Volt(dv), transfer()).unwrap(), transfer());
            let (i1, i2) = (bank.most_loaded(Amp(total)).0, bank.least_loaded(Amp(total)).0);
            let excess = i1 * rs * 0.95 + curve.extended(i1).0 - dv - i2 * rs - curve.extended(i2).0;
            // Balanced, or the deviating device alone conducts and still has volts to spare.
            prop_assert!(excess.abs() < 1e-6 || (i2 <= 1e-12 && excess < 0.0));
        }
    }

    #[test]
    fn one_device_carries_all() {
        let bank = Bank::bipolar(1, Ohm(0.1), 0.1, Volt(0.05), Volt(0.0257)).unwrap();
        assert!((bank.share(Amp(3.0)) - 1.0).abs() < 1e-15);
        assert!((bank.least_loaded(Amp(3.0)).0 - 3.0).abs() < 1e-15);
    }

    #[test]
    fn degenerate_banks_are_refused() {
        assert_eq!(Bank::even(0, Ohm(0.1)), None);
        assert_eq!(Bank::even(2, Ohm(f64::NAN)), None);
        assert_eq!(
            Bank::bipolar(2, Ohm(0.1), 1.0, Volt(0.02), Volt(0.0257)),
            None
        );
        assert_eq!(
            Bank::bipolar(2, Ohm(0.1), 0.1, Volt(9.0), Volt(0.0257)),
            None
        );
        assert_eq!(Bank::bipolar(2, Ohm(0.1), 0.1, Volt(0.02), Volt(0.0)), None);
        assert_eq!(Transfer::new(&[(Volt(4.0), Amp(1.0))]), None);
        assert_eq!(
            Transfer::new(&[(Volt(4.0), Amp(1.0)), (Volt(4.0), Amp(2.0))]),
            None
        );
    }

    #[test]
    fn transfer_curve_is_straight_in_the_root_of_current() {
        // ID = 2(VGS - 3)² through (4 V, 2 A) and (5 V, 8 A): at 4.5 V, 4.5 A; gm = 4(VGS-3) = 6 S.
        let curve = Transfer::new(&[(Volt(4.0), Amp(2.0)), (Volt(5.0), Amp(8.0))]).unwrap();
        assert!((curve.gate_source(Amp(4.5)).unwrap().0 - 4.5).abs() < 1e-12);
        assert!((curve.transconductance_siemens(Amp(4.5)).unwrap() - 6.0).abs() < 1e-12);
        assert_eq!(curve.gate_source(Amp(8.1)), None);
        assert_eq!(curve.gate_source(Amp(1.9)), None);
        assert_eq!(curve.transconductance_siemens(Amp(f64::NAN)), None);
    }
}
