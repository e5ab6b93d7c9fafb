//! The output network: watts and volts of the zobel, watts of the damping resistor across the coil.
//! Must not know the ratings of the parts or the frequency that is asked for.

use super::math;
use super::unit::{Amp, Farad, Henry, Hertz, Ohm, Volt, Watt};

/// A resistor and a capacitor in series from the output to ground.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Zobel {
    resistance: Ohm,
    capacitance: Farad,
}

impl Zobel {
    /// `None` unless both are positive and finite.
    #[must_use]
    pub fn new(resistance: Ohm, capacitance: Farad) -> Option<Self> {
        (positive(resistance.0) && positive(capacitance.0)).then_some(Self {
            resistance,
            capacitance,
        })
    }

    /// `X = 1/(2π·f·C)`. `None` unless the frequency is positive.
    #[must_use]
    pub fn reactance(&self, frequency: Hertz) -> Option<Ohm> {
        let x = Ohm(1.0 / (math::TAU * frequency.0 * self.capacitance.0));
        (positive(frequency.0) && x.is_finite()).then_some(x)
    }

    /// Watts of the resistor at a sine of r.m.s. volts: `P = V²·R/(R² + X²)`, towards `V²/R` as the
    /// frequency rises (an amplifier that oscillates burns it).
    #[must_use]
    pub fn watts(&self, rms: Volt, frequency: Hertz) -> Option<Watt> {
        let current = self.current(rms, frequency)?;
        finite(current * self.resistance * current)
    }

    /// R.m.s. volts across the capacitor: `V·X/√(R² + X²)`.
    #[must_use]
    pub fn capacitor_volts(&self, rms: Volt, frequency: Hertz) -> Option<Volt> {
        let volts = self.current(rms, frequency)? * self.reactance(frequency)?;
        volts.is_finite().then_some(volts)
    }

    fn current(&self, rms: Volt, frequency: Hertz) -> Option<Amp> {
        let impedance = modulus(self.resistance, self.reactance(frequency)?);
        let current = rms / impedance;
        (current.is_finite() && rms.0 >= 0.0).then_some(current)
    }
}

/// Watts of the resistor across the output coil while a sine of r.m.s. amperes passes the two in
/// parallel: `P = I²·R·X²/(R² + X²)`, `X = 2π·f·L`.
///
/// `None` unless all are positive (no current: zero watts).
#[must_use]
pub fn damping_watts(coil: Henry, damping: Ohm, rms: Amp, frequency: Hertz) -> Option<Watt> {
    let sensible = positive(coil.0) && positive(damping.0) && positive(frequency.0) && rms.0 >= 0.0;
    let x = Ohm(math::TAU * frequency.0 * coil.0);
    let through = rms * (x / modulus(damping, x));
    let watts = through * damping * through;
    if sensible { finite(watts) } else { None }
}

/// Modulus of a resistance and a reactance in series.
fn modulus(resistance: Ohm, reactance: Ohm) -> Ohm {
    Ohm((resistance.0 * resistance.0 + reactance.0 * reactance.0).sqrt())
}

fn positive(x: f64) -> bool {
    x.is_finite() && x > 0.0
}

fn finite(watts: Watt) -> Option<Watt> {
    watts.is_finite().then_some(watts)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        /// Brute-force twin: average R·i² of a marched steady state of v = R·i + q/C over one period.
        #[test]
        fn zobel_watts_agree_with_a_march(r in 1.0..47.0_f64, c in 1e-8..2e-7_f64, f in 5e3..1e5_f64) {
            let z = Zobel::new(Ohm(r), Farad(c)).unwrap();
            let want = z.watts(Volt(10.0), Hertz(f)).unwrap().0;
            // Exact current: amplitude V/|Z|, so integrate its square numerically over the period.
            let x = 1.0 / (math::TAU * f * c);
            let n = 4096;
            let mut heat = 0.0;
            for k in 0..n {
                let wt = math::TAU * f64::from(k) / f64::from(n);
                // i = Re(V·e^{jωt}/(R - jX)) = V(R·cos ωt - X·sin ωt)/(R² + X²)
                let i = 10.0 * math::SQRT_2 * (r * math::cos(wt) - x * math::sin(wt)) / (r * r + x * x);
                heat += r * i * i / f64::from(n);
            }
            prop_assert!((heat - want).abs() < 1e-9 * want);
            // Power balance: V² = VR² + VC².
            let vc = z.capacitor_volts(Volt(10.0), Hertz(f)).unwrap().0;
            prop_assert!((want * r + vc * vc - 100.0).abs() < 1e-9);
        }

        #[test]
        fn no_number_from_nonsense(a in proptest::num::f64::ANY, b in proptest::num::f64::ANY, c in proptest::num::f64::ANY, d in proptest::num::f64::ANY) {
            if let Some(z) = Zobel::new(Ohm(a), Farad(b)) {
                prop_assert!(z.watts(Volt(c), Hertz(d)).is_none_or(Watt::is_finite));
                prop_assert!(z.capacitor_volts(Volt(c), Hertz(d)).is_none_or(Volt::is_finite));
            }
            prop_assert!(damping_watts(Henry(a), Ohm(b), Amp(c), Hertz(d)).is_none_or(Watt::is_finite));
        }
    }

    #[test]
    fn damping_resistor_takes_what_the_coil_leaves() {
        // 2 uH at 20 kHz is 0.251327 ohm; against 10 ohm with 5 A: I²R·X²/(R² + X²)
        // = 250 x 0.0631655/100.0631655 = 0.157814 W, by hand.
        let p = damping_watts(Henry(2e-6), Ohm(10.0), Amp(5.0), Hertz(20e3)).unwrap();
        assert!((p.0 - 0.157_814).abs() < 1e-6, "{p:?}");
    }
}
