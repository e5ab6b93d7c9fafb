//! What a class-B output stage reaches, draws and dissipates under a test signal.
//! Must not know how the rail is made, what parts are rated for, or temperatures.
//!
//! One bank is the parallel devices of one polarity. Ideal class B: the bank conducts while the
//! load current has its sign; idle current is added to mean heat, never to peaks.

use crate::physics::load::Impedance;
use crate::physics::math;
use crate::physics::sharing::{Bank, Transfer};
use crate::physics::unit::{Amp, Hertz, Ohm, Volt, VoltPerSecond, Watt};

/// Rise of a MOSFET's on-resistance from 25 °C to a hot junction; common practice, no source.
const HOT_ON_RESISTANCE: f64 = 1.6;

/// Volts between the loaded rail and the peak output against load current, emitter resistors
/// included: straight lines through the stated points, the last one extended. Below the first
/// point the first line is extended too, or held above zero. One point is a constant.
#[derive(Clone, Debug, PartialEq)]
pub struct Drop {
    pieces: Vec<Piece>,
}

/// drop = volts + ohms·i from this current to the next piece.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Piece {
    from: f64,
    volts: f64,
    ohms: f64,
}

impl Drop {
    /// From (A, V) points. `None` if there is none, a value is negative or not finite, currents do
    /// not ascend strictly, or the volts fall: a stage does not lose less when it carries more, and
    /// everything solved from a drop relies on that.
    #[must_use]
    pub fn new(points: &[(Amp, Volt)]) -> Option<Self> {
        let valid = |p: &(Amp, Volt)| {
            p.0 >= Amp::ZERO && p.0.is_finite() && p.1 >= Volt::ZERO && p.1.is_finite()
        };
        let (first, _) = (points.first()?, points.iter().all(valid).then_some(())?);
        let mut pieces = Vec::new();
        for pair in points.windows(2) {
            let [a, b] = pair else { return None };
            if a.0 >= b.0 || a.1 > b.1 {
                return None;
            }
            let ohms = ((b.1 - a.1) / (b.0 - a.0)).0;
            pieces.push(Piece {
                from: a.0.0,
                volts: (a.1 - a.0 * Ohm(ohms)).0,
                ohms,
            });
        }
        match pieces.first_mut() {
            None => pieces.push(Piece {
                from: 0.0,
                volts: first.1.0,
                ohms: 0.0,
            }),
            Some(piece) if piece.volts >= 0.0 => piece.from = 0.0,
            // A first line that would start below zero: from the origin to the first point.
            Some(_) => {
                let ohms = (first.1 / first.0).0;
                pieces.insert(
                    0,
                    Piece {
                        from: 0.0,
                        volts: 0.0,
                        ohms,
                    },
                );
            }
        }
        Some(Self { pieces })
    }

    /// The drop at a load current.
    #[must_use]
    pub fn at(&self, current: Amp) -> Volt {
        let i = current.0.max(0.0);
        let piece = self.pieces.iter().rev().find(|p| p.from <= i);
        Volt(piece.map_or(0.0, |p| p.volts + p.ohms * i))
    }

    /// V(burst): the peak output on a stiff rail into a modulus, V = Vu - drop(V/|Z|), solved line
    /// by line. `None` if the rail is below the drop at no current, or a value is not positive.
    #[must_use]
    pub fn burst(&self, rail: Volt, modulus: Ohm) -> Option<Volt> {
        if !(rail.is_finite() && modulus > Ohm::ZERO && modulus.is_finite()) {
            return None;
        }
        // V + drop(V/|Z|) rises with V, so the last line whose start is not beyond the rail holds
        // the answer.
        let piece = self
            .pieces
            .iter()
            .rev()
            .find(|p| p.from * modulus.0 + p.volts + p.ohms * p.from <= rail.0)?;
        let volts = (rail.0 - piece.volts) / (1.0 + piece.ohms / modulus.0);
        (volts > 0.0).then_some(Volt(volts))
    }

    /// The greatest sine amplitude for which V - v_out(t) >= drop(|i(t)|) whenever v_out has the
    /// sign of the rail, on a rail that stands still.
    ///
    /// `None` if nothing can be put out, or the load is not passive.
    #[must_use]
    pub fn clip(&self, rail: Volt, load: Impedance) -> Option<Volt> {
        self.clip_on(|_| Some(rail), load)
    }

    /// The same on a rail that depends on the peak current drawn: the greatest amplitude that the
    /// rail it causes still carries. `rail` must not rise with current; `None` from it means that
    /// the supply collapses. Solved to 1e-12 of the rail.
    #[must_use]
    pub fn clip_on(&self, rail: impl Fn(Amp) -> Option<Volt>, load: Impedance) -> Option<Volt> {
        if !load.is_passive() {
            return None;
        }
        let modulus = load.modulus();
        let unloaded = rail(Amp::ZERO).filter(|v| v.is_finite())?;
        let most = (unloaded - self.at(Amp::ZERO)).0;
        if most <= 0.0 {
            return None;
        }
        let missing = |amplitude: f64| {
            let peak = Volt(amplitude) / modulus;
            self.rail_needed(amplitude, load) - rail(peak).map_or(0.0, |v| v.0)
        };
        // The rail needed is at least the amplitude plus the drop at no current; with a constant drop
        // on a stiff rail it is no more, and rounding decides on which side the end falls.
        let amplitude = if missing(most) <= 1e-12 * most {
            most
        } else {
            math::root(missing, 0.0, most, 1e-12 * most)?
        };
        (amplitude > 0.0).then_some(Volt(amplitude))
    }

    /// The greatest v_out + drop(|i|) over the part of the period with v_out positive.
    ///
    /// With ψ the phase of the current from its zero, only 0 to 90° of it matters: at any other
    /// time with v_out positive there is one in that quarter with the same |i| and a higher v_out.
    /// There v_out = V̂·sin(ψ + |φ|), and on each line of the drop the sum is
    /// p + P·x + Q·√(1 - x²) in x = sin ψ, P = V̂·cos φ + r·Î, Q = V̂·|sin φ|, with one maximum at
    /// x = P/√(P² + Q²).
    fn rail_needed(&self, amplitude: f64, load: Impedance) -> f64 {
        let (cos, sin) = load.cos_and_abs_sin();
        let peak = amplitude / load.modulus().0;
        let q = amplitude * sin;
        if peak <= 0.0 {
            return self.at(Amp::ZERO).0 + q;
        }
        let mut most = 0.0_f64;
        let mut to = 1.0;
        for piece in self.pieces.iter().rev() {
            let from = piece.from / peak;
            if from > 1.0 {
                continue;
            }
            let p = amplitude * cos + piece.ohms * peak;
            let hypotenuse = (p * p + q * q).sqrt();
            let top = if hypotenuse > 0.0 {
                p / hypotenuse
            } else {
                1.0
            };
            let x = top.clamp(from, to);
            most = most.max(piece.volts + p * x + q * (1.0 - x * x).max(0.0).sqrt());
            to = from;
        }
        most
    }
}

/// What heat depends on of a signal that spends equal times either side of zero.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Signal {
    /// Mean of |i| in the load.
    mean_current: Amp,
    /// Mean of i² in the load, A².
    mean_square: f64,
    /// Mean power into the load.
    output: Watt,
}

impl Signal {
    /// A sine: mean|i| = 2Î/π, mean i² = Î²/2, P = V̂Î·cos φ/2. `None` for a negative or non-finite
    /// amplitude or a load that is not passive.
    #[must_use]
    pub fn sine(amplitude: Volt, load: Impedance) -> Option<Self> {
        let rms = Self::rms(amplitude, load)? * std::f64::consts::FRAC_1_SQRT_2;
        Some(Self::of(rms, math::SQRT_2 * 2.0 / math::PI, load))
    }

    /// Gaussian noise of an r.m.s. value, unclipped: mean|i| = σ·√(2/π), mean i² = σ².
    #[must_use]
    pub fn noise(rms: Volt, load: Impedance) -> Option<Self> {
        Some(Self::of(
            Self::rms(rms, load)?,
            (2.0 / math::PI).sqrt(),
            load,
        ))
    }

    fn rms(volts: Volt, load: Impedance) -> Option<Amp> {
        (volts >= Volt::ZERO && volts.is_finite() && load.is_passive())
            .then(|| volts / load.modulus())
            .filter(|i| i.is_finite())
    }

    fn of(rms: Amp, form: f64, load: Impedance) -> Self {
        let mean_square = rms.0 * rms.0;
        Self {
            mean_current: rms * form,
            mean_square,
            output: Watt(mean_square * load.resistance.0),
        }
    }

    /// Mean power into the load.
    #[must_use]
    pub fn output(&self) -> Watt {
        self.output
    }

    /// Mean of |i| in the load.
    #[must_use]
    pub fn mean_current(&self) -> Amp {
        self.mean_current
    }

    /// √(mean of i²) in the load; each rail feeds half of the square, a half-sine of Î/2 r.m.s.
    #[must_use]
    pub fn rms_current(&self) -> Amp {
        Amp(self.mean_square.sqrt())
    }

    /// Mean current drawn from each rail: mean|i|/2 + N·Iq, Iq the idle current of one device.
    #[must_use]
    pub fn supply_current(&self, bank: &Bank, idle: Amp) -> Amp {
        self.mean_current * 0.5 + idle * f64::from(bank.devices())
    }

    /// The same where two channels are bridged: each rail is drawn on in both half-cycles,
    /// mean|i| + 2N·Iq.
    #[must_use]
    pub fn bridged_supply_current(&self, bank: &Bank, idle: Amp) -> Amp {
        self.supply_current(bank, idle) * 2.0
    }

    /// Mean heat of one bank on a mean rail:
    /// V·(mean|i|/2 + N·Iq) - P/2 - mean(i²)·RE/2N, which for a sine is
    /// V·(Î/π + N·Iq) - V̂Î·cos φ/4 - Î²·RE/4N.
    ///
    /// The idle current is added whole at every level: deliberately high, a class-AB stage gives it
    /// up as the signal grows. Energy balance of one rail over one period.
    #[must_use]
    pub fn heat(&self, rail: Volt, bank: &Bank, idle: Amp) -> BankHeat {
        let emitters = Watt(self.mean_square * bank.emitters_in_parallel().0 * 0.5);
        BankHeat {
            signal: rail * self.mean_current * 0.5 - self.output * 0.5 - emitters,
            idle: rail * idle * f64::from(bank.devices()),
        }
    }

    /// Mean watts in the emitter (source) resistor of one of a bank's `devices`, mean(i²)·RE/2N²; a sine
    /// puts Î²·RE/4 of its own peak current into it. `share` is how much more than its even part the
    /// device carries.
    #[must_use]
    pub fn emitter_watts(&self, devices: u32, resistor: Ohm, share: f64) -> Watt {
        let part = share / f64::from(devices.max(1));
        Watt(self.mean_square * 0.5 * resistor.0 * part * part)
    }
}

/// Mean heat of one bank.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct BankHeat {
    /// From the signal.
    pub signal: Watt,
    /// From the idle current.
    pub idle: Watt,
}

impl BankHeat {
    /// Both.
    #[must_use]
    pub fn total(self) -> Watt {
        self.signal + self.idle
    }
}

/// The sine amplitude at which a bank's mean heat is greatest on a rail that stands still:
/// 2V/(π·(cos φ + RE/(N·|Z|))), or the clip level if that is less.
#[must_use]
pub fn hottest_amplitude(rail: Volt, clip: Volt, load: Impedance, bank: &Bank) -> Volt {
    let (cos, _) = load.cos_and_abs_sin();
    let slope = cos + bank.emitters_in_parallel() / load.modulus();
    // With a purely reactive load and no resistor the heat only rises.
    let free = rail * (2.0 / math::PI) / slope;
    if free < clip { free } else { clip }
}

/// The amplitude up to `clip` and the mean heat of one bank there, greatest on a mean rail that
/// sags with the peak current. A scan of 32 amplitudes, then the best bracket narrowed.
/// `None` where the rail has no answer or a value is not usable.
#[must_use]
pub fn hottest_sine(
    rail: impl Fn(Amp) -> Option<Volt>,
    clip: Volt,
    load: Impedance,
    bank: &Bank,
    idle: Amp,
) -> Option<(Volt, BankHeat)> {
    const STEPS: u32 = 32;
    let heat = |amplitude: f64| {
        let signal = Signal::sine(Volt(amplitude), load)?;
        Some(signal.heat(rail(Volt(amplitude) / load.modulus())?, bank, idle))
    };
    let watts = |amplitude: f64| heat(amplitude).map_or(f64::NAN, |h| h.total().0);
    let step = clip.0 / f64::from(STEPS);
    let mut best = (0.0, watts(0.0));
    for k in 0..=STEPS {
        let amplitude = step * f64::from(k);
        let value = watts(amplitude);
        if !value.is_finite() {
            return None;
        }
        if value > best.1 {
            best = (amplitude, value);
        }
    }
    let (lo, hi) = ((best.0 - step).max(0.0), (best.0 + step).min(clip.0));
    let (amplitude, _) = math::maximum(watts, lo, hi, 1e-9 * clip.0);
    Some((Volt(amplitude), heat(amplitude)?))
}

/// Volts a source follower loses to its rail at the peak of the bank's current:
/// VGS(Î/N) + (Î/N)·RS - (driver supply above the rail); never below [`on_loss`], and negative
/// where the driver supply has room to spare. `None` beyond the stated transfer points.
#[must_use]
pub fn follower_loss(
    transfer: &Transfer,
    bank: &Bank,
    peak: Amp,
    driver_above_rail: Volt,
) -> Option<Volt> {
    let each = peak / f64::from(bank.devices());
    Some(transfer.gate_source(each)? + each * bank.emitter() - driver_above_rail)
}

/// Least volts a MOSFET stage loses at the peak of the bank's current, fully on and hot:
/// (Î/N)·(1.6·RDS(on) + RS), RDS(on) at 25 °C.
#[must_use]
pub fn on_loss(bank: &Bank, peak: Amp, on_resistance: Ohm) -> Volt {
    peak / f64::from(bank.devices()) * (on_resistance * HOT_ON_RESISTANCE + bank.emitter())
}

/// Power of a sine amplitude into a resistance, V̂²/2R.
#[must_use]
pub fn power(amplitude: Volt, resistance: Ohm) -> Watt {
    amplitude * (amplitude / resistance) * 0.5
}

/// Power of two bridged halves of equal amplitude into the resistance between them, (2V̂)²/2R.
#[must_use]
pub fn bridged_power(amplitude: Volt, resistance: Ohm) -> Watt {
    power(amplitude * 2.0, resistance)
}

/// Amplitude of a sine of a fraction of a power into a resistance, √(2·d·P·R). `None` if a value
/// is negative or not finite.
#[must_use]
pub fn duty_amplitude(duty: f64, reference: Watt, resistance: Ohm) -> Option<Volt> {
    let square = 2.0 * duty * reference.0 * resistance.0;
    (duty >= 0.0 && reference >= Watt::ZERO && resistance >= Ohm::ZERO && square.is_finite())
        .then(|| Volt(square.sqrt()))
}

/// Greatest rate of change of a sine, 2π·f·V̂.
#[must_use]
pub fn slew(frequency: Hertz, amplitude: Volt) -> VoltPerSecond {
    VoltPerSecond(math::TAU * frequency.0 * amplitude.0)
}

#[cfg(test)]
#[allow(
    clippy::disallowed_methods,
    reason = "a twin may use the platform's functions"
)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn drop_of(points: &[(f64, f64)]) -> Drop {
        let points: Vec<_> = points.iter().map(|p| (Amp(p.0), Volt(p.1))).collect();
        Drop::new(&points).unwrap()
    }

    fn any_drop() -> impl Strategy<Value = Drop> {
        proptest::collection::vec((0.1..6.0f64, 0.0..2.0f64), 1..5).prop_map(|steps| {
            let mut point = (0.0, 0.5);
            let points: Vec<_> = steps
                .iter()
                .map(|s| {
                    point = (point.0 + s.0, point.1 + s.1);
                    point
                })
                .collect();
            drop_of(&points)
        })
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(100))]

        /// The twin samples the whole half-period with v_out positive, both signs of current.
        #[test]
        fn clip_is_the_greatest_amplitude_that_fits(
            drop in any_drop(), degrees in -90.0..=90.0f64, z in 1.0..16.0f64, rail in 15.0..90.0f64,
        ) {
            let phi = f64::to_radians(degrees);
            let load = Impedance::polar(Ohm(z), phi);
            let clip = drop.clip(Volt(rail), load).unwrap().0;
            let fullest = |amplitude: f64| {
                let at = |theta: f64| {
                    let i = amplitude / z * (theta - phi).sin().abs();
                    amplitude * theta.sin() + drop.at(Amp(i)).0
                };
                let (mut lo, mut hi, mut best) = (0.0, math::PI, (0.0, 0.0));
                for _ in 0..4 {
                    let step = (hi - lo) / 2000.0;
                    for theta in (0..=2000).map(|k| lo + step * f64::from(k)) {
                        if at(theta) > best.1 {
                            best = (theta, at(theta));
                        }
                    }
                    (lo, hi) = ((best.0 - step).max(0.0), (best.0 + step).min(math::PI));
                }
                best.1
            };
            prop_assert!(fullest(clip) <= rail * (1.0 + 1e-11));
            prop_assert!(fullest(clip * (1.0 + 1e-6)) > rail * (1.0 + 1e-8));
        }

        #[test]
        fn burst_solves_its_equation(drop in any_drop(), z in 0.5..16.0f64, rail in 15.0..90.0f64) {
            let v = drop.burst(Volt(rail), Ohm(z)).unwrap();
            prop_assert!((v.0 + drop.at(v / Ohm(z)).0 - rail).abs() < 1e-11 * rail);
            let clip = drop.clip(Volt(rail), Impedance::resistive(Ohm(z))).unwrap();
            prop_assert!((clip - v).abs().0 < 1e-10 * rail);
        }

        #[test]
        fn clip_on_a_sagging_rail_is_self_consistent(
            drop in any_drop(), degrees in -90.0..90.0f64, z in 1.0..16.0f64, sag in 0.0..3.0f64,
        ) {
            let load = Impedance::polar(Ohm(z), degrees.to_radians());
            let rail = |peak: Amp| Some(Volt(50.0 - sag * peak.0));
            let clip = drop.clip_on(rail, load).unwrap();
            let again = drop.clip(rail(clip / load.modulus()).unwrap(), load).unwrap();
            prop_assert!((clip - again).abs().0 < 1e-9);
        }

        /// The twin integrates (V - v_out - i·RE/N)·i over the half-cycle of the bank.
        #[test]
        fn mean_heat_is_the_integral(
            degrees in -90.0..90.0f64, z in 1.0..16.0f64, swing in 0.0..1.0f64,
            n in 1u32..6, re in 0.0..0.5f64,
        ) {
            let (rail, phi) = (50.0, f64::to_radians(degrees));
            let bank = Bank::even(n, Ohm(re)).unwrap();
            let load = Impedance::polar(Ohm(z), phi);
            let heat = Signal::sine(Volt(rail * swing), load)
                .unwrap()
                .heat(Volt(rail), &bank, Amp(0.1));
            let steps = 4000;
            let sum: f64 = (0..steps)
                .map(|k| math::PI * (f64::from(k) + 0.5) / f64::from(steps))
                .map(|alpha| {
                    let i = rail * swing / z * alpha.sin();
                    i * (rail - rail * swing * (alpha + phi).sin() - i * re / f64::from(n))
                })
                .sum::<f64>() / (2.0 * f64::from(steps));
            prop_assert!((heat.signal.0 - sum).abs() < 1e-5 * rail * rail / z);
            prop_assert!((heat.idle.0 - rail * 0.1 * f64::from(n)).abs() < 1e-9);
        }

        #[test]
        fn hottest_amplitude_beats_every_other(
            degrees in -90.0..90.0f64, z in 1.0..16.0f64, clip in 0.3..1.0f64, re in 0.0..0.5f64,
        ) {
            let bank = Bank::even(2, Ohm(re)).unwrap();
            let load = Impedance::polar(Ohm(z), degrees.to_radians());
            let (rail, clip) = (Volt(50.0), Volt(50.0 * clip));
            let at = |v: f64| Signal::sine(Volt(v), load).unwrap().heat(rail, &bank, Amp(0.1)).total();
            let best = at(hottest_amplitude(rail, clip, load, &bank).0);
            let searched = hottest_sine(|_| Some(rail), clip, load, &bank, Amp(0.1)).unwrap();
            prop_assert!((searched.1.total() - best).abs().0 < 1e-12 * best.0);
            for k in 0..=2000 {
                prop_assert!(at(clip.0 * f64::from(k) / 2000.0).0 <= best.0 * (1.0 + 1e-13));
            }
        }

        #[test]
        fn hottest_on_a_sagging_rail_beats_every_other(
            degrees in -90.0..90.0f64, z in 1.0..16.0f64, sag in 0.0..3.0f64,
        ) {
            let bank = Bank::even(2, Ohm(0.22)).unwrap();
            let load = Impedance::polar(Ohm(z), degrees.to_radians());
            // A capacitor-input supply falls quickly at first, then nearly straight.
            let rail = |i: Amp| Some(Volt(45.0 - sag * i.0 / (1.0 + 0.2 * i.0) - 0.1 * i.0));
            let clip = drop_of(&[(0.0, 3.0)]).clip_on(rail, load).unwrap();
            let (_, best) = hottest_sine(rail, clip, load, &bank, Amp(0.0)).unwrap();
            for k in 0..=2000 {
                let v = Volt(clip.0 * f64::from(k) / 2000.0);
                let heat = Signal::sine(v, load).unwrap()
                    .heat(rail(v / load.modulus()).unwrap(), &bank, Amp(0.0));
                prop_assert!(heat.total().0 <= best.total().0 * (1.0 + 1e-12));
            }
        }

        /// The twin integrates over the Gaussian density.
        #[test]
        fn noise_heat_is_the_integral(rms in 0.5..15.0f64, r in 2.0..16.0f64, re in 0.0..0.5f64) {
            let bank = Bank::even(2, Ohm(re)).unwrap();
            let signal = Signal::noise(Volt(rms), Impedance::resistive(Ohm(r))).unwrap();
            let steps = 20_000;
            let sum: f64 = (0..steps)
                .map(|k| 10.0 * (f64::from(k) + 0.5) / f64::from(steps))
                .map(|x| {
                    let (v, density) = (rms * x, (-0.5 * x * x).exp() / math::TAU.sqrt());
                    v / r * (60.0 - v - v / r * re / 2.0) * density * 10.0 / f64::from(steps)
                })
                .sum();
            let heat = signal.heat(Volt(60.0), &bank, Amp::ZERO).signal.0;
            prop_assert!((heat - sum).abs() < 1e-6 * sum.abs().max(1.0), "{heat} {sum}");
        }
    }

    #[test]
    fn one_line_clips_at_the_closed_form() {
        // drop = p + r·i: V̂ = (V - p)/√((cos φ + r/|Z|)² + sin²φ), from the amplitude of the sum.
        let drop = drop_of(&[(0.0, 2.0), (10.0, 5.0)]);
        let load = Impedance::polar(Ohm(4.0), 1.0);
        let expected = 38.0 / ((1f64.cos() + 0.3 / 4.0).powi(2) + 1f64.sin().powi(2)).sqrt();
        assert!((drop.clip(Volt(40.0), load).unwrap().0 - expected).abs() < 1e-10);
    }

    #[test]
    fn drop_is_straight_between_points_and_extended() {
        let drop = drop_of(&[(2.0, 3.0), (6.0, 5.0)]);
        for (amps, volts) in [(0.0, 2.0), (2.0, 3.0), (4.0, 4.0), (6.0, 5.0), (10.0, 7.0)] {
            assert!((drop.at(Amp(amps)).0 - volts).abs() < 1e-12);
        }
        // Extended to no current the first line would be -2 V: from the origin instead.
        let steep = drop_of(&[(1.0, 1.0), (2.0, 4.0)]);
        for (amps, volts) in [(0.0, 0.0), (0.5, 0.5), (1.0, 1.0), (1.5, 2.5), (3.0, 7.0)] {
            assert!((steep.at(Amp(amps)).0 - volts).abs() < 1e-12);
        }
        assert!((drop_of(&[(3.0, 4.0)]).at(Amp(99.0)).0 - 4.0).abs() < 1e-15);
    }

    #[test]
    fn degenerate_inputs_have_no_answer() {
        assert_eq!(Drop::new(&[]), None);
        assert_eq!(
            Drop::new(&[(Amp(1.0), Volt(2.0)), (Amp(1.0), Volt(3.0))]),
            None
        );
        assert_eq!(
            Drop::new(&[(Amp(1.0), Volt(3.0)), (Amp(2.0), Volt(2.0))]),
            None
        );
        assert_eq!(Drop::new(&[(Amp(f64::NAN), Volt(3.0))]), None);
        let drop = drop_of(&[(0.0, 3.0)]);
        let load = Impedance::resistive(Ohm(8.0));
        for rail in [0.0, 3.0, -50.0, f64::NAN, f64::INFINITY] {
            assert_eq!(drop.clip(Volt(rail), load), None);
            assert_eq!(drop.burst(Volt(rail), Ohm(8.0)), None);
        }
        assert_eq!(drop.clip(Volt(50.0), Impedance::resistive(Ohm(-8.0))), None);
        assert_eq!(drop.clip_on(|_| None, load), None);
        assert_eq!(Signal::sine(Volt(f64::NAN), load), None);
        assert_eq!(duty_amplitude(-0.1, Watt(100.0), Ohm(8.0)), None);
        assert_eq!(duty_amplitude(0.1, Watt(f64::INFINITY), Ohm(8.0)), None);
    }
}
