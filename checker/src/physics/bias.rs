//! Bias: whether the idle current can run away with temperature, and what the ways of stating it mean.
//! Must not know the loop gain that is allowed or where a figure was stated.

use super::unit::{Amp, Kelvin, KelvinPerWatt, Ohm, Volt, VoltPerKelvin, Watt};

/// VT = kT/q at 25 °C: 25.7 mV. Junctions are hotter and their VT is larger, which lowers the loop
/// gain, so the cold value is on the safe side.
pub const THERMAL_VOLTAGE: Volt = Volt(0.0257);

/// Drift of the base-emitter voltage at constant current, -2.1 mV/K: `(VBE - 1.205 V - 3.2·VT)/T` is
/// -2.5 to -1.8 mV/K between 0.55 V and 0.75 V at 300 K. Source: P. R. Gray and R. G. Meyer, Analysis
/// and Design of Analog Integrated Circuits, band-gap section (from memory).
pub const BASE_EMITTER_DRIFT: VoltPerKelvin = VoltPerKelvin(-0.0021);

/// Drop across the WHOLE emitter resistance, internal parts included, at which the crossover of an
/// emitter follower is smoothest. Source: B. Oliver, Hewlett-Packard Journal, February 1971.
pub const CROSSOVER_OPTIMUM: Volt = Volt(0.026);

/// How heat reaches the junction whose voltage sets the idle current, and what the bias sensor sees
/// of it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Heating {
    /// θjc + θcs of that device: its own heat, which no sensor follows.
    pub own: KelvinPerWatt,
    /// Rsa of the sink that the output devices share.
    pub sink: KelvinPerWatt,
    /// Watts into that sink for each watt of that device, as the idle current of all moves together:
    /// the number of output devices on it. Of a compound pair: times the current gain from the driver
    /// to one output device, since the device is the driver.
    pub sharing: f64,
    /// Whether that device is on the sink. Always so for an output device.
    pub device_on_sink: bool,
    /// κ: whether the bias sensor is on the sink or on a device of it.
    pub sensor_on_sink: bool,
}

impl Heating {
    /// `θeff = θjc + θcs + (d - κ)·Rsa·n`, d and κ each 1 where the device and the sensor are on the
    /// sink, else 0.
    ///
    /// Negative where the sensor follows a sink that the device does not feel: the bias falls as the
    /// sink warms. The chord Rsa = ΔT/P is meant; the slope of a real sink is four fifths of it, so the
    /// chord is on the safe side. `None` for a negative or non-finite part.
    #[must_use]
    pub fn effective(&self) -> Option<KelvinPerWatt> {
        let parts = [self.own.0, self.sink.0, self.sharing];
        if !parts.iter().all(|x| x.is_finite() && *x >= 0.0) {
            return None;
        }
        let untracked = f64::from(self.device_on_sink) - f64::from(self.sensor_on_sink);
        let theta = self.own + self.sink * (self.sharing * untracked);
        theta.is_finite().then_some(theta)
    }
}

/// The loop: more current, more heat, a lower junction voltage, more current.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ThermalLoop {
    rail: Volt,
    drift: VoltPerKelvin,
    theta: KelvinPerWatt,
    resistance: Ohm,
}

impl ThermalLoop {
    /// Of a bipolar transistor: an output device with its idle current and RE, or the driver of a
    /// compound pair with the driver's standing current and the resistance in its emitter loop.
    /// `1/gm = VT/I`.
    ///
    /// `None` unless rail and current are positive, the resistance is not negative, all finite.
    #[must_use]
    pub fn bipolar(rail: Volt, theta: KelvinPerWatt, current: Amp, emitter: Ohm) -> Option<Self> {
        if !(current.is_finite() && current.0 > 0.0) {
            return None;
        }
        let inverse_gm = THERMAL_VOLTAGE / current;
        Self::with(
            rail,
            theta,
            BASE_EMITTER_DRIFT,
            inverse_gm + nonnegative(emitter)?,
        )
    }

    /// Of a source follower: dVGS/dT and 1/gm at the idle current, from the device's own figures.
    /// The drift is signed; above its zero-coefficient current a lateral type has a positive one and
    /// the loop gain is negative: stable.
    #[must_use]
    pub fn fet(
        rail: Volt,
        theta: KelvinPerWatt,
        drift: VoltPerKelvin,
        inverse_gm: Ohm,
        source: Ohm,
    ) -> Option<Self> {
        Self::with(
            rail,
            theta,
            drift,
            nonnegative(inverse_gm)? + nonnegative(source)?,
        )
    }

    fn with(
        rail: Volt,
        theta: KelvinPerWatt,
        drift: VoltPerKelvin,
        resistance: Ohm,
    ) -> Option<Self> {
        let sensible = rail.is_finite()
            && rail.0 > 0.0
            && theta.is_finite()
            && drift.is_finite()
            && resistance.is_finite()
            && resistance.0 > 0.0;
        sensible.then_some(Self {
            rail,
            drift,
            theta,
            resistance,
        })
    }

    /// Loop gain `S = -Vu·(dV/dT)·θeff/(1/gm + RE)`: 1 and above runs away, below 0 is over-compensated.
    ///
    /// One kelvin more moves the junction voltage by dV/dT, the current by that over 1/gm + RE, the
    /// watts by that times the rail, which at idle stands across the device, and the junction by
    /// those watts times θeff. `None` if the figures overflow.
    #[must_use]
    pub fn gain(&self) -> Option<f64> {
        let current_per_kelvin = self.drift * Kelvin(-1.0) / self.resistance;
        let watts: Watt = self.rail * current_per_kelvin;
        let gain = (watts * self.theta).0;
        gain.is_finite().then_some(gain)
    }

    /// The emitter (or source) resistance above which no idle current can run away:
    /// `RE = |dV/dT|·θeff·Vu`, the limit of S = 1 for 1/gm = 0. Zero where the loop is stable without.
    ///
    /// That such a resistance exists: R. P. Arnold and D. S. Zoroglu, A quantitative study of emitter
    /// ballasting, IEEE Trans. Electron Devices, 1974 (abstract).
    #[must_use]
    pub fn unconditional(&self) -> Option<Ohm> {
        let gain = self.gain()?;
        let resistance = (self.resistance * gain).max(Ohm::ZERO);
        resistance.is_finite().then_some(resistance)
    }
}

fn nonnegative(r: Ohm) -> Option<Ohm> {
    (r.is_finite() && r.0 >= 0.0).then_some(r)
}

/// How much a small difference between devices in parallel grows once each heats its own junction:
/// `1/(1 - S)`, S the loop gain with what the devices do not share. `None` at S >= 1: it does not settle.
#[must_use]
pub fn imbalance_growth(gain: f64) -> Option<f64> {
    (gain.is_finite() && gain < 1.0).then(|| 1.0 / (1.0 - gain))
}

/// The four ways in which an idle current is stated.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Idle {
    /// Volts across the emitter resistor of one device.
    AcrossEmitter(Volt),
    /// Volts from emitter to emitter of one pair.
    AcrossBoth(Volt),
    /// Amperes of one device.
    PerDevice(Amp),
    /// Amperes of all pairs of a channel together, as the rail carries them.
    PerChannel(Amp),
}

/// One idle current in all four ways.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct IdleFigures {
    /// Volts across one emitter resistor: `I·RE`.
    pub across_emitter: Volt,
    /// Volts from emitter to emitter: `2·I·RE`.
    pub across_both: Volt,
    /// Amperes of one device.
    pub per_device: Amp,
    /// Amperes of a channel: `N·I`.
    pub per_channel: Amp,
}

impl Idle {
    /// The same idle current in all four ways, for N pairs with the emitter resistor RE.
    ///
    /// `None` if it is negative or not finite, without a pair, or for volts across no resistor.
    #[must_use]
    pub fn figures(self, emitter: Ohm, pairs: u32) -> Option<IdleFigures> {
        let re = nonnegative(emitter)?;
        let n = f64::from(pairs);
        let per_device = match self {
            Self::AcrossEmitter(v) => v / re,
            Self::AcrossBoth(v) => v / (2.0 * re),
            Self::PerDevice(i) => i,
            Self::PerChannel(i) => i / n,
        };
        let figures = IdleFigures {
            across_emitter: per_device * re,
            across_both: per_device * re * 2.0,
            per_device,
            per_channel: per_device * n,
        };
        let finite = figures.across_both.is_finite() && figures.per_channel.is_finite();
        (pairs > 0 && finite && per_device.is_finite() && per_device.0 >= 0.0).then_some(figures)
    }
}

/// How far two statements of one idle current are apart: `greater/lesser - 1`. `None` unless both are
/// positive.
#[must_use]
pub fn disagreement(a: Amp, b: Amp) -> Option<f64> {
    let apart = a.max(b) / a.min(b) - 1.0;
    (a.0 > 0.0 && b.0 > 0.0 && apart.is_finite()).then_some(apart)
}

/// Idle current of one device at which an emitter follower crosses over most smoothly:
/// `I = 26 mV/(RE + re' + rb/hFE)`; the drop across RE alone is then `I·RE`, less than 26 mV.
///
/// `internal` is what the device adds, `re' + rb/hFE`. Source: see [`CROSSOVER_OPTIMUM`].
/// `None` if the sum is not positive.
#[must_use]
pub fn crossover_idle(emitter: Ohm, internal: Ohm) -> Option<Amp> {
    let current = CROSSOVER_OPTIMUM / (nonnegative(emitter)? + nonnegative(internal)?);
    current.is_finite().then_some(current)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        /// Brute-force twin: let the loop run. Start at the idle current, heat the junction, follow
        /// V = VT·ln(I/Is) + I·RE with a falling V, repeat with a small disturbance and see whether it
        /// grows. Near the operating point it grows by S each turn.
        #[test]
        fn gain_is_the_growth_of_one_turn(
            rail in 20.0..100.0_f64, theta in 0.2..5.0_f64, idle in 0.01..0.5_f64, re in 0.05..1.0_f64,
        ) {
            let s = ThermalLoop::bipolar(Volt(rail), KelvinPerWatt(theta), Amp(idle), Ohm(re))
                .unwrap().gain().unwrap();
            let (vt, tc) = (0.0257, 0.0021);
            let disturbance = 1e-6 * idle;
            let kelvins = rail * disturbance * theta;
            // Solve VT·ln(I/I0) + (I - I0)·RE = TC·ΔT for I.
            let balance = |i: f64| vt * libm::log(i / idle) + (i - idle) * re - tc * kelvins;
            let after = crate::physics::math::root(balance, 0.5 * idle, 2.0 * idle, 1e-18).unwrap();
            prop_assert!(((after - idle) / disturbance - s).abs() < 1e-4 * s, "{} {s}", (after - idle) / disturbance);
        }

        #[test]
        fn above_the_unconditional_resistance_no_current_runs_away(
            rail in 20.0..100.0_f64, theta in 0.2..5.0_f64, idle in 1e-4..50.0_f64,
        ) {
            let theta = KelvinPerWatt(theta);
            let bare = ThermalLoop::bipolar(Volt(rail), theta, Amp(idle), Ohm(0.0)).unwrap();
            let re = bare.unconditional().unwrap();
            let with = ThermalLoop::bipolar(Volt(rail), theta, Amp(idle), re).unwrap();
            prop_assert!(with.gain().unwrap() < 1.0);
        }

        #[test]
        fn every_way_of_stating_it_comes_back(i in 1e-4..1.0_f64, re in 0.05..1.0_f64, n in 1_u32..20) {
            let f = Idle::PerDevice(Amp(i)).figures(Ohm(re), n).unwrap();
            for idle in [Idle::AcrossEmitter(f.across_emitter), Idle::AcrossBoth(f.across_both),
                Idle::PerChannel(f.per_channel)] {
                let back = idle.figures(Ohm(re), n).unwrap();
                prop_assert!((back.per_device.0 - i).abs() < 1e-12);
            }
        }

        #[test]
        fn no_number_from_nonsense(a in proptest::num::f64::ANY, b in proptest::num::f64::ANY, c in proptest::num::f64::ANY, d in proptest::num::f64::ANY, n in any::<u32>()) {
            if let Some(l) = ThermalLoop::bipolar(Volt(a), KelvinPerWatt(b), Amp(c), Ohm(d)) {
                prop_assert!(l.gain().is_none_or(f64::is_finite));
                prop_assert!(l.unconditional().is_none_or(Ohm::is_finite));
            }
            for idle in [Idle::AcrossEmitter(Volt(a)), Idle::PerChannel(Amp(a))] {
                prop_assert!(idle.figures(Ohm(b), n).is_none_or(|f|
                    f.per_device.is_finite() && f.per_channel.is_finite() && f.across_both.is_finite()));
            }
            prop_assert!(disagreement(Amp(a), Amp(b)).is_none_or(f64::is_finite));
            prop_assert!(crossover_idle(Ohm(a), Ohm(b)).is_none_or(Amp::is_finite));
            prop_assert!(imbalance_growth(a).is_none_or(f64::is_finite));
        }
    }

    #[test]
    fn where_the_sensor_sits_decides_what_counts() {
        let at = |device_on_sink, sensor_on_sink| {
            let h = Heating {
                own: KelvinPerWatt(1.5),
                sink: KelvinPerWatt(0.5),
                sharing: 8.0,
                device_on_sink,
                sensor_on_sink,
            };
            h.effective().unwrap().0
        };
        assert!((at(true, true) - 1.5).abs() < 1e-12); // tracked: only its own heat is left
        assert!((at(true, false) - 5.5).abs() < 1e-12); // 1.5 + 8 x 0.5
        assert!((at(false, false) - 1.5).abs() < 1e-12); // a driver off the sink does not feel it
        assert!((at(false, true) + 2.5).abs() < 1e-12); // 1.5 - 4: over-compensated
    }

    #[test]
    fn a_positive_drift_is_stable() {
        let l = ThermalLoop::fet(
            Volt(50.0),
            KelvinPerWatt(2.0),
            VoltPerKelvin(0.001),
            Ohm(1.0),
            Ohm(0.22),
        )
        .unwrap();
        assert!(l.gain().unwrap() < 0.0);
        assert_eq!(l.unconditional(), Some(Ohm(0.0)));
    }

    #[test]
    fn volts_across_no_resistor_say_nothing() {
        assert_eq!(Idle::AcrossEmitter(Volt(0.02)).figures(Ohm(0.0), 1), None);
        assert!(Idle::PerDevice(Amp(0.1)).figures(Ohm(0.0), 1).is_some());
    }
}
