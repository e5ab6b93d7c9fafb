//! The path in (v_CE, i) that one bank of a class-B stage runs through under a sine.
//! Must not know ratings, curves of data sheets or temperatures.
//!
//! With β the phase of the load current counted from the zero at which v_CE is the higher,
//! i = Î·sin β and v_CE = V - A·sin β + B·cos β, where A = V̂·cos φ + Î·RE/N and B = V̂·|sin φ|.
//! Over the first quarter v_CE only falls. The second quarter passes the same currents at lower
//! voltages, so the first holds the worst point of every limit that falls with voltage.
//! Positions are kept as t = tan(β/2), in which sine and cosine are rational.

use crate::physics::load::Impedance;
use crate::physics::math;
use crate::physics::sharing::Bank;
use crate::physics::unit::{Amp, Volt, Watt};

/// Where a search for a position stops; the value at a maximum is exact to the square of it.
const NARROWED: f64 = 1e-12;

/// One bank driven with a sine.
#[derive(Clone, Copy, Debug)]
pub struct Locus<'a> {
    bank: &'a Bank,
    rail: f64,
    /// A and B of the module text.
    a: f64,
    b: f64,
    peak: f64,
    angle_rad: f64,
}

/// A point of a locus, for the most loaded device.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Point {
    /// Phase of the output voltage, radians, 0 to π where it has the sign of this bank's rail.
    pub angle_rad: f64,
    /// v_CE (v_DS).
    pub volts: Volt,
    /// Current of the most loaded device.
    pub amps: Amp,
}

impl Point {
    /// Instantaneous dissipation.
    #[must_use]
    pub fn watts(&self) -> Watt {
        self.volts * self.amps
    }
}

/// A position of a locus with what the most loaded device stands there, in volts and amps.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Spot {
    pub(crate) t: f64,
    pub(crate) volts: f64,
    pub(crate) amps: f64,
}

/// Sine and cosine of β from t = tan(β/2).
fn rational(t: f64) -> (f64, f64) {
    let square = t * t;
    (2.0 * t / (1.0 + square), (1.0 - square) / (1.0 + square))
}

impl<'a> Locus<'a> {
    /// The locus at a rail and a peak output voltage. `None` unless both are positive and finite
    /// and the load is passive.
    #[must_use]
    pub fn new(bank: &'a Bank, rail: Volt, amplitude: Volt, load: Impedance) -> Option<Self> {
        let positive = |v: Volt| v > Volt::ZERO && v.is_finite();
        if !(positive(rail) && positive(amplitude) && load.is_passive()) {
            return None;
        }
        let (cos, sin) = load.cos_and_abs_sin();
        let peak = amplitude / load.modulus();
        let a = amplitude * cos + peak * bank.emitters_in_parallel();
        let b = amplitude * sin;
        (peak.is_finite() && a.is_finite()).then_some(Self {
            bank,
            rail: rail.0,
            a: a.0,
            b: b.0,
            peak: peak.0,
            angle_rad: load.angle_rad(),
        })
    }

    /// Peak current of the bank.
    #[must_use]
    pub fn peak_current(&self) -> Amp {
        Amp(self.peak)
    }

    /// Greatest v_CE while the bank conducts, reached as the current begins or ends.
    #[must_use]
    pub fn greatest_voltage(&self) -> Volt {
        Volt(self.rail + self.b)
    }

    /// Greatest instantaneous dissipation of the most loaded device.
    ///
    /// One stationary point of i·v_CE on the first quarter; for an ideal stage at full swing it is
    /// (2V²/|Z|)·sin³(30° + |φ|/3), own derivation.
    #[must_use]
    pub fn peak_dissipation(&self) -> Point {
        self.point(self.worst(1.0, 0.0, self.highest_with_volts()))
    }

    /// A spot as a report shows it.
    pub(crate) fn point(&self, spot: Spot) -> Point {
        let Spot { t, volts, amps } = spot;
        // The first quarter of β is the beginning of the half-cycle for a leading load and its
        // mirrored end for a lagging one.
        let beta = 2.0 * math::atan(t);
        let current_phase = if self.angle_rad > 0.0 {
            math::PI - beta
        } else {
            beta
        };
        Point {
            angle_rad: current_phase + self.angle_rad,
            volts: Volt(volts),
            amps: Amp(amps),
        }
    }

    /// The most loaded device at position t of the first quarter.
    pub(crate) fn at(&self, t: f64) -> Spot {
        self.spot(t).0
    }

    /// v_CE at position t of the first quarter.
    pub(crate) fn volts(&self, t: f64) -> f64 {
        let (sin, cos) = rational(t);
        self.rail - self.a * sin + self.b * cos
    }

    /// v_CE and current of the most loaded device at a phase β of the whole half-cycle, 0 to π.
    pub(crate) fn at_phase(&self, beta_rad: f64) -> (f64, f64) {
        let (sin, cos) = math::sin_cos(beta_rad);
        let total = self.peak * sin.max(0.0);
        (
            self.rail - self.a * sin + self.b * cos,
            total * self.bank.split(total).fraction,
        )
    }

    /// The position where v_CE falls to `volts`: 0 if it starts below, 1 if it stays above.
    pub(crate) fn position(&self, volts: f64) -> f64 {
        let fallen = self.rail - volts;
        if fallen <= -self.b {
            return 0.0;
        }
        if fallen >= self.a {
            return 1.0;
        }
        // (W - B)t² - 2At + (W + B) = 0 with W = V - v; this root keeps its digits for every sign.
        let (sum, difference) = (fallen + self.b, fallen - self.b);
        let root = (self.a * self.a - difference * sum).max(0.0).sqrt();
        (sum / (self.a + root)).clamp(0.0, 1.0)
    }

    /// The last position with v_CE still positive: beyond it the stage would be saturated.
    pub(crate) fn highest_with_volts(&self) -> f64 {
        self.position(0.0)
    }

    /// The position in `[from, to]`, v_CE not negative, where i·v_CE^s is greatest for the most
    /// loaded device (s = 1 power; s = minus the log-log slope of a safe-area segment; s = 0
    /// current).
    ///
    /// The slope of ln(i·v^s) vanishes where e·v·cos β = s·sin β·(A·cos β + B·sin β), e the
    /// elasticity of the device's current. For a given e there is one such point (see `stationary`),
    /// so on part of the quarter it is that point or the nearer end. As e drifts with the current
    /// only slowly, taking it from the last point and solving again closes in by a factor of ten or
    /// more each time; where it does not, the slope itself is solved. At a kink of a transfer curve
    /// the elasticity jumps and there can be several such points: those shares are scanned.
    pub(crate) fn worst(&self, s: f64, from: f64, to: f64) -> Spot {
        const ROUNDS: usize = 12;
        if s <= 0.0 || to <= from {
            return self.spot(to.max(from)).0;
        }
        if self.bank.has_kinks() {
            return self.scanned(s, from, to);
        }
        let (mut elasticity, mut before) = (1.0, f64::NAN);
        for _ in 0..ROUNDS {
            let t = self.stationary(s, elasticity).clamp(from, to);
            let (spot, here) = self.spot(t);
            // An error of 1e-6 in e moves t by less than that, and the value by its square. At an
            // end of the range two e that agree on it are enough.
            let settled = (here - elasticity).abs() < 1e-6 || (t - before).abs() <= f64::EPSILON;
            if settled {
                return spot;
            }
            (elasticity, before) = (here, t);
        }
        let slope = |t: f64| self.slope(t, s, self.spot(t).1).0;
        let t = if slope(to) >= 0.0 {
            to
        } else if slope(from) <= 0.0 {
            from
        } else {
            math::root(slope, from, to, NARROWED).unwrap_or(to)
        };
        self.spot(t).0
    }

    /// The same by a scan of 96 positions and the best bracket narrowed.
    fn scanned(&self, s: f64, from: f64, to: f64) -> Spot {
        const STEPS: u32 = 96;
        let value = |t: f64| {
            let spot = self.spot(t).0;
            spot.amps * math::pow(spot.volts.max(0.0), s)
        };
        let step = (to - from) / f64::from(STEPS);
        let position = |k: u32| {
            if k == STEPS {
                to
            } else {
                from + step * f64::from(k)
            }
        };
        let mut best = (to, value(to));
        for k in 0..STEPS {
            let here = value(position(k));
            if here > best.1 {
                best = (position(k), here);
            }
        }
        let (lo, hi) = ((best.0 - step).max(from), (best.0 + step).min(to));
        let (t, top) = math::maximum(value, lo, hi, NARROWED);
        self.spot(if top > best.1 { t } else { best.0 }).0
    }

    /// The position where i·v_CE^s would be greatest with every device carrying its even part: the
    /// true maximum is at most the greatest share times the value there.
    pub(crate) fn worst_if_even(&self, s: f64, from: f64, to: f64) -> f64 {
        if s <= 0.0 || to <= from {
            return to.max(from);
        }
        self.stationary(s, 1.0).clamp(from, to)
    }

    /// The bank's current at position t over N.
    pub(crate) fn even_part(&self, t: f64) -> f64 {
        self.peak * rational(t).0 / f64::from(self.bank.devices())
    }

    /// The greatest share that occurs on the locus: a share moves one way only with the current.
    pub(crate) fn greatest_share(&self) -> f64 {
        self.bank
            .share(Amp::ZERO)
            .max(self.bank.share(Amp(self.peak)))
    }

    /// The most loaded device at position t, and the elasticity of its current.
    fn spot(&self, t: f64) -> (Spot, f64) {
        let (sin, cos) = rational(t);
        let total = self.peak * sin;
        let split = self.bank.split(total);
        let volts = self.rail - self.a * sin + self.b * cos;
        (
            Spot {
                t,
                volts,
                amps: total * split.fraction,
            },
            split.elasticity,
        )
    }

    /// (1 + t²)²·(e·v·cos β - s·sin β·(A·cos β + B·sin β)), a quartic in t, and its derivative.
    /// With B = 0 the factor 1 - t² is common, and t = 1 a false root, so it is divided out.
    fn slope(&self, t: f64, s: f64, e: f64) -> (f64, f64) {
        let square = t * t;
        let (direct, sine) = (e * self.rail, 2.0 * (e + s) * self.a);
        if self.b <= 0.0 {
            return (direct * (1.0 + square) - sine * t, 2.0 * direct * t - sine);
        }
        let fall = 1.0 - square;
        (
            direct * fall * (1.0 + square) - sine * t * fall
                + self.b * (e * fall * fall - 4.0 * s * square),
            -4.0 * direct * t * square
                - sine * (1.0 - 3.0 * square)
                - self.b * (4.0 * e * t * fall + 8.0 * s * t),
        )
    }

    /// The one root of `slope` in 0 to 1, or 1 if it stays positive.
    ///
    /// Divided by cos β the slope is e·V + B·(e·cos β - s·sin β·tan β), which falls with β, less
    /// (e + s)·A·sin β, which rises: they cross once at most. Newton, kept inside a bracket.
    fn stationary(&self, s: f64, e: f64) -> f64 {
        if self.slope(1.0, s, e).0 >= 0.0 {
            return 1.0;
        }
        let (mut lo, mut hi, mut t) = (0.0, 1.0, 0.5);
        for _ in 0..100 {
            let (value, derivative) = self.slope(t, s, e);
            if value > 0.0 {
                lo = t;
            } else {
                hi = t;
            }
            let next = t - value / derivative;
            let kept = if next > lo && next < hi {
                next
            } else {
                0.5 * (lo + hi)
            };
            let moved = (kept - t).abs();
            t = kept;
            if moved <= NARROWED {
                break;
            }
        }
        t
    }

    /// The position in `[from, to]` where i/(p + q·v_CE) is greatest for the most loaded device: a
    /// straight limit line, positive over the range.
    ///
    /// Stationary where e·cos β·(p + q·v) + q·sin β·(A·cos β + B·sin β) = 0; for an even share
    /// cos β = -qB/(p + qV).
    pub(crate) fn worst_against_line(&self, p: f64, q: f64, from: f64, to: f64) -> Spot {
        let slope = |t: f64| {
            let (sin, cos) = rational(t);
            let (spot, elasticity) = self.spot(t);
            elasticity * cos * (p + q * spot.volts) + q * sin * (self.a * cos + self.b * sin)
        };
        let t = if to <= from || slope(to) >= 0.0 {
            to.max(from)
        } else if slope(from) <= 0.0 {
            from
        } else {
            math::root(slope, from, to, NARROWED).unwrap_or(to)
        };
        self.spot(t).0
    }
}

#[cfg(test)]
#[allow(
    clippy::disallowed_methods,
    reason = "a twin may use the platform's functions"
)]
mod tests {
    use super::*;
    use crate::physics::unit::Ohm;
    use proptest::prelude::*;

    /// The exhaustive twin: the greatest i·v^s over the WHOLE half-cycle.
    fn brute(locus: &Locus<'_>, s: f64) -> f64 {
        (0..=40_000)
            .map(|k| locus.at_phase(math::PI * f64::from(k) / 40_000.0))
            .map(|(v, i)| i * math::pow(v.max(0.0), s))
            .fold(0.0, f64::max)
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(150))]

        #[test]
        fn one_root_finds_the_greatest_of_the_half_cycle(
            swing in 0.05..0.98f64, degrees in prop_oneof![Just(0.0), -90.0..90.0f64, -1e-6..1e-6f64],
            z in 2.0..16.0f64, s in prop_oneof![Just(1.0), 0.2..6.0f64], n in 1u32..8,
            re in prop_oneof![Just(0.0), 0.0..0.47f64], tol in 0.0..0.1f64, dv in 0.0..0.06f64,
        ) {
            let bank = Bank::bipolar(n, Ohm(re), tol, Volt(dv), Volt(0.0257)).unwrap();
            let load = Impedance::polar(Ohm(z), degrees.to_radians());
            let rail = Volt(50.0);
            // Keep the volts positive: the stage saturates before.
            let locus = Locus::new(&bank, rail, rail * (swing / (1.0 + re / z)), load).unwrap();
            let Spot { volts: v, amps: i, .. } = locus.worst(s, 0.0, locus.highest_with_volts());
            let (found, fine) = (i * math::pow(v.max(0.0), s), brute(&locus, s));
            prop_assert!(found >= fine * (1.0 - 1e-12), "{found} {fine}");
            // A grid of 40 000 steps misses a smooth maximum by (curvature)·h²/8, about 1e-8.
            prop_assert!(found <= fine * (1.0 + 1e-7), "{found} {fine}");
        }

        #[test]
        fn position_inverts_the_voltage(
            degrees in -90.0..90.0f64, swing in 0.1..1.0f64, w in 0.0..1.0f64,
        ) {
            let bank = Bank::even(2, Ohm(0.22)).unwrap();
            let load = Impedance::polar(Ohm(8.0), degrees.to_radians());
            let locus = Locus::new(&bank, Volt(40.0), Volt(40.0 * swing), load).unwrap();
            let volts = locus.rail + locus.b - w * (locus.a + locus.b);
            prop_assert!((locus.at(locus.position(volts)).volts - volts).abs() < 1e-9);
        }

        #[test]
        fn angle_of_a_point_gives_its_voltage_and_current(
            degrees in -89.0..89.0f64, swing in 0.1..0.95f64, t in 0.0..1.0f64,
        ) {
            // From the definition: v_out = V̂ sin θ, i = Î sin(θ - φ), v = V - v_out - i·RE/N.
            let bank = Bank::even(2, Ohm(0.22)).unwrap();
            let phi = f64::to_radians(degrees);
            let load = Impedance::polar(Ohm(8.0), phi);
            let amplitude = 40.0 * swing;
            let locus = Locus::new(&bank, Volt(40.0), Volt(amplitude), load).unwrap();
            let point = locus.point(locus.at(t));
            let current = amplitude / 8.0 * (point.angle_rad - phi).sin();
            let volts = 40.0 - amplitude * point.angle_rad.sin() - current * 0.11;
            prop_assert!((point.amps.0 - current / 2.0).abs() < 1e-9);
            prop_assert!((point.volts.0 - volts).abs() < 1e-9);
        }
    }

    #[test]
    fn full_swing_peak_is_the_closed_form() {
        let bank = Bank::even(1, Ohm(0.0)).unwrap();
        for degrees in [0.0, 30.0, 45.0, 60.0, 75.0, 90.0, -60.0] {
            let phi = f64::to_radians(degrees);
            let load = Impedance::polar(Ohm(4.0), phi);
            let peak = Locus::new(&bank, Volt(35.0), Volt(35.0), load)
                .unwrap()
                .peak_dissipation();
            let closed = 2.0 * 35.0 * 35.0 / 4.0 * (math::PI / 6.0 + phi.abs() / 3.0).sin().powi(3);
            assert!(
                (peak.watts().0 - closed).abs() < 1e-10 * closed,
                "{degrees}"
            );
        }
    }

    #[test]
    fn degenerate_drives_are_refused() {
        let bank = Bank::even(1, Ohm(0.1)).unwrap();
        let eight = Impedance::resistive(Ohm(8.0));
        for (rail, amplitude) in [
            (0.0, 1.0),
            (1.0, 0.0),
            (f64::NAN, 1.0),
            (1.0, f64::INFINITY),
        ] {
            assert!(Locus::new(&bank, Volt(rail), Volt(amplitude), eight).is_none());
        }
        assert!(Locus::new(&bank, Volt(9.0), Volt(1.0), Impedance::resistive(Ohm(0.0))).is_none());
        assert!(Locus::new(&bank, Volt(9.0), Volt(1.0), Impedance::polar(Ohm(8.0), 2.0)).is_none());
    }
}
