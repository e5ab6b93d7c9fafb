//! The drive chain: what each stage must deliver to the next, what the drivers dissipate, and slew.
//! Must not know what a stage is able or allowed to deliver.
//!
//! A bank of N devices in parallel carries the current i; the stage before it delivers
//! `i/hFE(i/N) + standing`. Every stage up the chain is the same sum, so a chain is a fold of
//! [`Stage::greatest_demand`] from the output upward.

use std::sync::LazyLock;

use super::math;
use super::unit::{Amp, Farad, Hertz, Ohm, Volt, VoltPerSecond, Watt};

/// Current gain of a device against its collector current, from stated points.
#[derive(Clone, Debug, PartialEq)]
pub struct GainCurve {
    /// Ascending in current; never empty.
    knots: Vec<Knot>,
}

#[derive(Clone, Copy, Debug, PartialEq)]
struct Knot {
    amps: f64,
    ln_amps: f64,
    gain: f64,
}

/// Why a gain, and whatever follows from it, is not known.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum NoGain {
    /// A device carries more than the last point of its curve. Gain falls ever faster with current,
    /// so the curve is not extended.
    BeyondCurve {
        /// Current of one device.
        needed: Amp,
        /// The last point.
        last: Amp,
    },
    /// The current or voltage asked about is negative, not a number, above the rail, or the answer
    /// overflows.
    NoSuchCurrent,
}

impl GainCurve {
    /// From points in any order. `None` without a point, unless all are positive and finite, or for two
    /// gains at one current. Whether they are minimum or typical gains is for the caller to settle.
    #[must_use]
    pub fn new(points: &[(Amp, f64)]) -> Option<Self> {
        let positive = |x: f64| x.is_finite() && x > 0.0;
        let mut knots: Vec<Knot> = points
            .iter()
            .map(|&(amps, gain)| Knot {
                amps: amps.0,
                ln_amps: math::ln(amps.0),
                gain,
            })
            .collect();
        knots.sort_by(|a, b| a.amps.total_cmp(&b.amps));
        let good = knots.iter().all(|k| positive(k.amps) && positive(k.gain));
        let distinct = knots
            .windows(2)
            .all(|pair| matches!(pair, [a, b] if a.ln_amps < b.ln_amps));
        (good && distinct && !knots.is_empty()).then_some(Self { knots })
    }

    /// The gain at the current of one device: straight in `ln I` between two points, the first gain
    /// below the first point.
    ///
    /// Below the first point the true gain is lower, but so is the current: the demand i/hFE there is
    /// below that at the point itself and decides nothing.
    ///
    /// # Errors
    /// [`NoGain::BeyondCurve`] past the last point (a billionth past it is rounding).
    pub fn at(&self, current: Amp) -> Result<f64, NoGain> {
        let last = self.knots.last().map_or(0.0, |k| k.amps);
        if !(current.is_finite() && current.0 >= 0.0) {
            return Err(NoGain::NoSuchCurrent);
        }
        if current.0 > last * (1.0 + 1e-9) {
            return Err(NoGain::BeyondCurve {
                needed: current,
                last: Amp(last),
            });
        }
        Ok(self.within(current.0))
    }

    /// The gain at a current known to be on the curve; the end gains are held outside.
    fn within(&self, amps: f64) -> f64 {
        let above = self.knots.iter().position(|k| k.amps >= amps);
        let segment = above.map_or(self.knots.last(), |k| self.knots.get(k));
        let below = above
            .and_then(|k| k.checked_sub(1))
            .and_then(|k| self.knots.get(k));
        match (below, segment) {
            (Some(a), Some(b)) => {
                let along = (math::ln(amps) - a.ln_amps) / (b.ln_amps - a.ln_amps);
                a.gain + (b.gain - a.gain) * along
            }
            (None, Some(end)) => end.gain,
            // A curve has at least one point, so this is never reached.
            (_, None) => f64::INFINITY,
        }
    }
}

/// A bank of like devices and what stands across its base-emitter junctions.
#[derive(Clone, Debug, PartialEq)]
pub struct Stage {
    /// Gain of one device.
    pub gain: GainCurve,
    /// Devices in parallel.
    pub devices: u32,
    /// Current that the stage before supplies besides base current: `VBE/Rbe`, or as stated.
    pub standing: Amp,
}

impl Stage {
    /// Current that the stage before delivers while this bank carries `current`:
    /// `i/hFE(i/N) + standing`.
    ///
    /// # Errors
    /// Where the gain is not known, see [`NoGain`].
    pub fn demand(&self, current: Amp) -> Result<Amp, NoGain> {
        let gain = self.gain.at(self.per_device(current)?)?;
        let demand = current / gain + self.standing;
        if demand.is_finite() {
            Ok(demand)
        } else {
            Err(NoGain::NoSuchCurrent)
        }
    }

    /// The greatest demand while the bank swings from nothing to `peak`.
    ///
    /// Within a segment, gain `a + b·ln i`, the derivative of i/hFE has the sign of hFE - b, which
    /// turns from minus to plus only: the greatest is at an end of a segment, hence at the peak or, where
    /// the gain rises steeply with current, at a stated point below it.
    ///
    /// # Errors
    /// Where the gain is not known, see [`NoGain`].
    pub fn greatest_demand(&self, peak: Amp) -> Result<Amp, NoGain> {
        let n = f64::from(self.devices);
        let points = self.gain.knots.iter().map(|k| Amp(k.amps * n));
        points
            .filter(|i| *i < peak)
            .try_fold(self.demand(peak)?, |most, i| Ok(most.max(self.demand(i)?)))
    }

    fn per_device(&self, current: Amp) -> Result<Amp, NoGain> {
        if self.devices == 0 {
            return Err(NoGain::NoSuchCurrent);
        }
        Ok(current / f64::from(self.devices))
    }
}

/// Current through the resistor across the base-emitter junctions of a bank, `VBE/Rbe`. `None` unless
/// both are positive.
#[must_use]
pub fn standing_current(base_emitter: Volt, resistor: Ohm) -> Option<Amp> {
    let current = base_emitter / resistor;
    let positive = base_emitter.0 > 0.0 && resistor.0 > 0.0;
    (positive && current.is_finite()).then_some(current)
}

/// The driver of one output bank while a sine is played into a load.
///
/// With β the angle of the load current `i = Î·sin β` and `v = V̂·sin(β + φ)`, φ positive where the
/// current lags, the driver carries `i/hFE(i/N) + standing` while i is positive and the standing
/// current alone otherwise, at `v_CE = V - v - VBE`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Driver<'a> {
    bank: &'a Stage,
    /// The rail less VBE of the bank.
    volts: f64,
    impedance: f64,
    phase_rad: f64,
}

/// A point of the locus of a driver.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LocusPoint {
    /// Collector-emitter voltage.
    pub volts: Volt,
    /// Driver current.
    pub amps: Amp,
    /// Angle of the load current, 0 to 2π.
    pub angle_rad: f64,
    /// What the closure made of it.
    pub used: f64,
}

impl<'a> Driver<'a> {
    /// The driver of `bank`, `base_emitter` the VBE of the bank's devices, the load by modulus and angle.
    ///
    /// `None` unless the rail is above VBE, the modulus positive, the angle within ±90° and the bank has
    /// devices and a standing current that is not negative.
    #[must_use]
    pub fn new(
        bank: &'a Stage,
        rail: Volt,
        base_emitter: Volt,
        modulus: Ohm,
        phase_rad: f64,
    ) -> Option<Self> {
        let volts = rail - base_emitter;
        let sensible = volts.is_finite()
            && volts.0 > 0.0
            && modulus.is_finite()
            && modulus.0 > 0.0
            && phase_rad.abs() <= math::FRAC_PI_2
            && bank.devices > 0
            && bank.standing.is_finite()
            && bank.standing.0 >= 0.0;
        sensible.then_some(Self {
            bank,
            volts: volts.0,
            impedance: modulus.0,
            phase_rad,
        })
    }

    /// Mean dissipation at an amplitude V̂ of the output:
    ///
    /// `P = standing·(V - VBE) + (1/π)·∫ i/hFE(i/N)·(V - VBE - V̂·cos φ·sin β) dβ`, β from 0 to π/2.
    ///
    /// The quarter stands for the half: i and its gain are even about β = π/2, and the part of v in
    /// cos β is odd. With a constant gain it is the bank's own `(V·Î/π - V̂·Î·cos φ/4)/hFE`. The interval
    /// is cut where the current passes a stated point of the gain curve; between the cuts the integrand
    /// is smooth and six-point Gauss-Legendre is good to 1e-7.
    ///
    /// # Errors
    /// Where the gain is not known at the peak, or the amplitude is not between 0 and the rail.
    pub fn mean_heat(&self, amplitude: Volt) -> Result<Watt, NoGain> {
        let peak = self.peak(amplitude)?;
        let resistive = amplitude.0 * math::cos(self.phase_rad);
        let integrand = |beta: f64| {
            let sine = math::sin(beta);
            self.drive(peak * sine) * (self.volts - resistive * sine)
        };
        let (mut sum, mut from) = (0.0, 0.0);
        for knot in &self.bank.gain.knots {
            let sine = knot.amps * f64::from(self.bank.devices) / peak;
            if sine < 1.0 {
                let to = math::asin(sine);
                sum += gauss(integrand, from, to);
                from = to;
            }
        }
        sum += gauss(integrand, from, math::FRAC_PI_2);
        let watts = Watt(self.bank.standing.0 * self.volts + sum / math::PI);
        if watts.is_finite() {
            Ok(watts)
        } else {
            Err(NoGain::NoSuchCurrent)
        }
    }

    /// The amplitude up to `highest` at which the mean dissipation is greatest, and that dissipation.
    ///
    /// Eight steps find the hill, a golden-section search its top to a ten-thousandth of the range, which
    /// is a hundred-millionth of the value; a hill that still rises at `highest` needs no search.
    ///
    /// # Errors
    /// As for [`Driver::mean_heat`] at `highest`.
    pub fn worst_mean_heat(&self, highest: Volt) -> Result<(Volt, Watt), NoGain> {
        const STEPS: u32 = 8;
        self.mean_heat(highest)?;
        let step = highest.0 / f64::from(STEPS);
        // Every amplitude below `highest` is as good as it, so no value is missing here.
        let heat = |v: f64| self.mean_heat(Volt(v)).map_or(0.0, |watts| watts.0);
        let (mut hill, mut most) = (0.0, heat(0.0));
        for k in 1..=STEPS {
            let v = step * f64::from(k);
            let watts = heat(v);
            if watts > most {
                (hill, most) = (v, watts);
            }
        }
        if hill >= highest.0 && heat(highest.0 * (1.0 - 1e-6)) <= most {
            return Ok((highest, Watt(most)));
        }
        let (lo, hi) = ((hill - step).max(0.0), (hill + step).min(highest.0));
        let (v, watts) = math::maximum(heat, lo, hi, 1e-4 * highest.0);
        Ok((Volt(v), Watt(watts)))
    }

    /// The point of the locus of greatest `usage(v_CE, i)`, for example i over the current that a
    /// safe-area curve allows at v_CE; `screen` holds the same usage roughly.
    ///
    /// The half-cycle of conduction is scanned roughly and every hill within a fifth of the highest is
    /// refined with the usage itself. In the other half the current stands still, so only its greatest
    /// voltage, `V - VBE + V̂`, is looked at (usage must not fall with voltage).
    ///
    /// # Errors
    /// As for [`Driver::mean_heat`].
    pub fn worst_on_locus(
        &self,
        amplitude: Volt,
        screen: &Screen,
        usage: impl Fn(Volt, Amp) -> f64,
    ) -> Result<LocusPoint, NoGain> {
        let peak = self.peak(amplitude)?;
        let point = |angle_rad: f64| {
            let amps = Amp(self.drive(peak * math::sin(angle_rad).max(0.0)) + self.bank.standing.0);
            let v = self.volts - amplitude.0 * math::sin(angle_rad + self.phase_rad);
            let volts = Volt(v.max(0.0));
            LocusPoint {
                volts,
                amps,
                angle_rad,
                used: usage(volts, amps),
            }
        };
        let mut worst = point(1.5 * math::PI - self.phase_rad);
        let scan = self.scan(amplitude, screen);
        let floor = 0.8 * scan.iter().copied().fold(worst.used, f64::max);
        let mut take = |here: LocusPoint| {
            if here.used > worst.used {
                worst = here;
            }
        };
        for (k, &here) in scan.iter().enumerate() {
            let beside = |k: Option<usize>| k.and_then(|k| scan.get(k)).is_none_or(|s| here >= *s);
            if here >= floor && beside(k.checked_sub(1)) && beside(k.checked_add(1)) {
                let middle = SCAN_STEP * k as f64;
                take(point(middle));
                let used = |angle: f64| point(angle).used;
                // rough values may put the top of a hill one step aside
                let (lo, hi) = (middle - 2.0 * SCAN_STEP, middle + 2.0 * SCAN_STEP);
                let (angle, _) = math::maximum(used, lo.max(0.0), hi.min(math::PI), 1e-6);
                take(point(angle));
            }
        }
        Ok(worst)
    }

    /// The greatest usage of the locus, roughly: for finding out where to look. NaN where its current
    /// is not known.
    #[must_use]
    pub fn roughly_worst(&self, amplitude: Volt, screen: &Screen) -> f64 {
        if self.peak(amplitude).is_err() {
            return f64::NAN;
        }
        let still = screen.usage(0.0, self.volts + amplitude.0);
        let scan = self.scan(amplitude, screen);
        scan.iter().copied().fold(still, f64::max)
    }

    /// The greatest current at voltages above `end`, as a part of the greatest of all, sampled finely.
    #[must_use]
    pub fn current_beyond(&self, end: Volt, amplitude: Volt) -> f64 {
        const SAMPLES: u32 = 1024;
        let peak = amplitude.0 / self.impedance;
        let (mut beyond, mut most) = (0.0_f64, 0.0_f64);
        for k in 0..2 * SAMPLES {
            let angle = math::PI * f64::from(k) / f64::from(SAMPLES);
            let amps = self.drive(peak * math::sin(angle).max(0.0)) + self.bank.standing.0;
            most = most.max(amps);
            if self.volts - amplitude.0 * math::sin(angle + self.phase_rad) > end.0 {
                beyond = beyond.max(amps);
            }
        }
        if most > 0.0 { beyond / most } else { 0.0 }
    }

    /// Rough usage at even steps of the half-cycle of conduction.
    fn scan(&self, amplitude: Volt, screen: &Screen) -> [f64; SCAN_STEPS + 1] {
        let peak = amplitude.0 / self.impedance;
        let (sin_phase, cos_phase) = math::sin_cos(self.phase_rad);
        let mut scan = [0.0; SCAN_STEPS + 1];
        for (used, (sin, cos)) in scan.iter_mut().zip(SCAN_ANGLES.iter()) {
            let volts = self.volts - amplitude.0 * (sin * cos_phase + cos * sin_phase);
            *used = screen.usage(peak * sin, volts);
        }
        scan
    }

    /// The peak current of the bank, if its gain is known there.
    fn peak(&self, amplitude: Volt) -> Result<f64, NoGain> {
        if !(amplitude.0 >= 0.0 && amplitude.0 <= self.volts * (1.0 + 1e-9)) {
            return Err(NoGain::NoSuchCurrent);
        }
        let peak = amplitude.0 / self.impedance;
        self.bank
            .gain
            .at(Amp(peak / f64::from(self.bank.devices)))?;
        Ok(peak)
    }

    /// Base current of the bank at a current no greater than the checked peak.
    fn drive(&self, current: f64) -> f64 {
        current
            / self
                .bank
                .gain
                .within(current / f64::from(self.bank.devices))
    }
}

/// Steps of a scan through the half-cycle of conduction.
const SCAN_STEPS: usize = 64;
const SCAN_STEP: f64 = math::PI / SCAN_STEPS as f64;
static SCAN_ANGLES: LazyLock<[(f64, f64); SCAN_STEPS + 1]> =
    LazyLock::new(|| std::array::from_fn(|k| math::sin_cos(SCAN_STEP * k as f64)));

/// Cells of the tables that a [`Screen`] looks things up in.
const CELLS: usize = 256;

/// Driver current against bank current, and the usage of one ampere against voltage, from tables of
/// even steps: right to about a per cent, for finding out where to look closer.
#[derive(Clone, Debug)]
pub struct Screen {
    amps: Vec<f64>,
    per_amp: f64,
    usage: Vec<f64>,
    per_volt: f64,
}

impl Screen {
    /// For bank currents up to `most` and voltages up to `highest`; `usage` is that of one ampere.
    #[must_use]
    pub fn new(bank: &Stage, most: Amp, highest: Volt, usage: impl Fn(Volt) -> f64) -> Self {
        let cells = CELLS as f64;
        let devices = f64::from(bank.devices);
        let steps = |k: usize, top: f64| top * k as f64 / cells;
        let amps = |k: usize| {
            let current = steps(k, most.0);
            current / bank.gain.within(current / devices) + bank.standing.0
        };
        Self {
            amps: (0..=CELLS).map(amps).collect(),
            per_amp: cells / most.0,
            usage: (0..=CELLS)
                .map(|k| usage(Volt(steps(k, highest.0))))
                .collect(),
            per_volt: cells / highest.0,
        }
    }

    fn usage(&self, bank_amps: f64, volts: f64) -> f64 {
        looked_up(&self.amps, bank_amps * self.per_amp)
            * looked_up(&self.usage, volts * self.per_volt)
    }
}

/// Between two entries of a table, the ends held.
fn looked_up(table: &[f64], at: f64) -> f64 {
    let at = at.clamp(0.0, CELLS as f64);
    let cell = (at as usize).min(CELLS - 1);
    match table.get(cell..cell + 2) {
        Some([a, b]) => a + (b - a) * (at - cell as f64),
        _ => f64::NAN,
    }
}

/// Six-point Gauss-Legendre quadrature.
fn gauss(f: impl Fn(f64) -> f64, from: f64, to: f64) -> f64 {
    const NODES: [(f64, f64); 3] = [
        (0.238_619_186_083_196_9, 0.467_913_934_572_691_05),
        (0.661_209_386_466_264_5, 0.360_761_573_048_138_6),
        (0.932_469_514_203_152, 0.171_324_492_379_170_35),
    ];
    let (middle, half) = (0.5 * (from + to), 0.5 * (to - from));
    let pair = |(x, weight): (f64, f64)| weight * (f(middle - half * x) + f(middle + half * x));
    half * NODES.into_iter().map(pair).sum::<f64>()
}

/// Slew rate that a sine needs: `2π·f·V̂`. `None` for negative or non-finite input.
#[must_use]
pub fn slew_needed(frequency: Hertz, peak: Volt) -> Option<VoltPerSecond> {
    let slew = VoltPerSecond(math::TAU * frequency.0 * peak.0);
    (frequency.0 >= 0.0 && peak.0 >= 0.0 && slew.is_finite()).then_some(slew)
}

/// Slew rate that a current gives a compensation capacitor: `I/C`: the tail current of the input pair
/// for one edge; for the other, where it is less, what the voltage stage can sink. `None` unless both
/// are positive.
#[must_use]
pub fn slew_given(current: Amp, compensation: Farad) -> Option<VoltPerSecond> {
    let slew = VoltPerSecond(current.0 / compensation.0);
    (current.0 > 0.0 && compensation.0 > 0.0 && slew.is_finite()).then_some(slew)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn curve(points: &[(f64, f64)]) -> GainCurve {
        let points: Vec<_> = points.iter().map(|&(i, h)| (Amp(i), h)).collect();
        GainCurve::new(&points).unwrap()
    }

    fn bank(points: &[(f64, f64)], devices: u32, standing: f64) -> Stage {
        Stage {
            gain: curve(points),
            devices,
            standing: Amp(standing),
        }
    }

    fn falling() -> Stage {
        bank(
            &[(0.1, 60.0), (1.0, 80.0), (4.0, 50.0), (10.0, 15.0)],
            2,
            0.02,
        )
    }

    /// Brute-force twin: the mean of i·v over the whole period, sample by sample, written out from the
    /// definition with no symmetry used.
    fn sampled_heat(bank: &Stage, volts: f64, z: f64, phase: f64, amplitude: f64, n: u32) -> f64 {
        let mut sum = 0.0;
        for k in 0..n {
            let beta = math::TAU * (f64::from(k) + 0.5) / f64::from(n);
            let i = amplitude / z * math::sin(beta);
            let v = volts - amplitude * math::sin(beta + phase);
            let base = if i > 0.0 {
                i / bank.gain.at(Amp(i / f64::from(bank.devices))).unwrap()
            } else {
                0.0
            };
            sum += (base + bank.standing.0) * v;
        }
        sum / f64::from(n)
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(64))]
        #[test]
        fn mean_heat_agrees_with_samples(
            z in 2.0..16.0_f64, phase in -1.5..1.5_f64, k in 0.05..1.0_f64, volts in 20.0..40.0_f64,
        ) {
            let b = falling();
            let d = Driver::new(&b, Volt(volts + 0.7), Volt(0.7), Ohm(z), phase).unwrap();
            let v = volts * k;
            let fast = d.mean_heat(Volt(v)).unwrap().0;
            let slow = sampled_heat(&b, volts, z, phase, v, 100_000);
            prop_assert!((fast - slow).abs() < 1e-6 * slow, "{fast} {slow}");
        }

        #[test]
        fn worst_heat_beats_every_amplitude(
            z in 2.0..16.0_f64, phase in -1.5..1.5_f64, volts in 20.0..40.0_f64, top in 0.2..1.0_f64,
        ) {
            let b = falling();
            let d = Driver::new(&b, Volt(volts), Volt(0.0), Ohm(z), phase).unwrap();
            let highest = volts * top;
            let (at, worst) = d.worst_mean_heat(Volt(highest)).unwrap();
            prop_assert!(at.0 <= highest);
            for k in 0..=500 {
                let here = d.mean_heat(Volt(highest * f64::from(k) / 500.0)).unwrap();
                prop_assert!(here.0 <= worst.0 * (1.0 + 2e-6), "{here:?} {worst:?}");
            }
        }

        #[test]
        fn worst_on_locus_beats_every_angle(
            z in 2.0..16.0_f64, phase in -1.5..1.5_f64, volts in 20.0..40.0_f64, k in 0.2..1.0_f64,
        ) {
            let b = falling();
            let d = Driver::new(&b, Volt(volts), Volt(0.0), Ohm(z), phase).unwrap();
            let amplitude = volts * k;
            // A curve with a corner: 1 A to 20 V, then falling as v^-2.
            let allowed = |v: f64| if v < 20.0 { 1.0 } else { 400.0 / (v * v) };
            let screen = Screen::new(&b, Amp(amplitude / z), Volt(volts + amplitude), |v| 1.0 / allowed(v.0));
            let worst = d.worst_on_locus(Volt(amplitude), &screen, |v, i| i.0 / allowed(v.0)).unwrap();
            for n in 0..20_000 {
                let beta = math::TAU * f64::from(n) / 20_000.0;
                let i = (amplitude / z * math::sin(beta)).max(0.0);
                let base = i / b.gain.at(Amp(i / 2.0)).unwrap() + 0.02;
                let v = (volts - amplitude * math::sin(beta + phase)).max(0.0);
                prop_assert!(base / allowed(v) <= worst.used * (1.0 + 1e-7), "{beta} {worst:?}");
            }
        }

        #[test]
        fn greatest_demand_beats_every_current(
            h in proptest::array::uniform4(5.0..200.0_f64), peak in 0.01..20.0_f64,
        ) {
            let [a, b, c, d] = h;
            let s = bank(&[(0.05, a), (0.1, b), (2.0, c), (10.0, d)], 2, 0.01);
            let most = s.greatest_demand(Amp(peak)).unwrap();
            for n in 0..=1000 {
                let i = Amp(peak * f64::from(n) / 1000.0);
                prop_assert!(s.demand(i).unwrap().0 <= most.0 + 1e-12);
            }
        }

        #[test]
        fn no_number_from_nonsense(a in proptest::num::f64::ANY, b in proptest::num::f64::ANY, c in proptest::num::f64::ANY, d in proptest::num::f64::ANY, n in any::<u32>()) {
            if let Some(gain) = GainCurve::new(&[(Amp(a), b), (Amp(c), d)]) {
                prop_assert!(gain.at(Amp(d)).is_ok_and(|h| h.is_finite()) || gain.at(Amp(d)).is_err());
                let s = Stage { gain, devices: n, standing: Amp(b) };
                prop_assert!(s.greatest_demand(Amp(c)).map_or(true, Amp::is_finite));
                if let Some(driver) = Driver::new(&s, Volt(a), Volt(b), Ohm(c), d) {
                    prop_assert!(driver.mean_heat(Volt(a)).map_or(true, Watt::is_finite));
                }
            }
            prop_assert!(standing_current(Volt(a), Ohm(b)).is_none_or(Amp::is_finite));
            prop_assert!(slew_needed(Hertz(a), Volt(b)).is_none_or(VoltPerSecond::is_finite));
            prop_assert!(slew_given(Amp(a), Farad(b)).is_none_or(VoltPerSecond::is_finite));
        }
    }

    #[test]
    fn a_curve_holds_its_first_gain_and_ends_at_its_last() {
        let c = curve(&[(1.0, 80.0), (4.0, 50.0)]);
        assert!((c.at(Amp(0.01)).unwrap() - 80.0).abs() < 1e-12);
        assert!((c.at(Amp(2.0)).unwrap() - 65.0).abs() < 1e-12); // half-way in log: (80 + 50)/2
        let beyond = NoGain::BeyondCurve {
            needed: Amp(4.1),
            last: Amp(4.0),
        };
        assert_eq!(c.at(Amp(4.1)), Err(beyond));
        assert_eq!(c.at(Amp(f64::NAN)), Err(NoGain::NoSuchCurrent));
        assert_eq!(GainCurve::new(&[]), None);
        assert_eq!(GainCurve::new(&[(Amp(1.0), 5.0), (Amp(1.0), 6.0)]), None);
    }

    #[test]
    fn an_output_bank_beyond_its_curve_leaves_the_driver_unknown() {
        let b = falling();
        let d = Driver::new(&b, Volt(60.0), Volt(0.7), Ohm(2.0), 0.0).unwrap();
        let beyond = Err(NoGain::BeyondCurve {
            needed: Amp(14.0),
            last: Amp(10.0),
        });
        assert_eq!(d.mean_heat(Volt(56.0)), beyond);
        assert_eq!(d.mean_heat(Volt(61.0)), Err(NoGain::NoSuchCurrent));
    }
}
