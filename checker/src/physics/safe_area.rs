//! Safe operating area: what a derated curve allows, and how much of it a locus or a line uses.
//! Must not know rails, loads, policies or verdicts.
//!
//! A limit is always of the form i·v^s <= c: s = 0 a current, s = 1 a power, anything else a segment
//! of a curve that is straight in log-log. What is allowed at a voltage is the least of the limits,
//! so what is used is the greatest of the uses, and no crossing points need to be found.

use crate::physics::math;
use crate::physics::sharing::Bank;
use crate::physics::unit::{Amp, Celsius, Hertz, Kelvin, Second, Volt, Watt};
use crate::physics::waveform::{Locus, Point, Spot};

/// A log-log slope steeper than this (negative) is second breakdown: a power limit has -1.
const SECOND_BREAKDOWN_SLOPE: f64 = 1.05;
/// Part of a locus's peak current that may fall beyond the end of a curve without mattering.
const NEGLIGIBLE: f64 = 0.01;
/// Case temperature at which data sheets state power and curves.
const STATED_AT: Celsius = Celsius(25.0);
/// Above this a vertical MOSFET's curve must differ from constant power to be linear-mode data.
const LINEAR_MODE_FROM: Volt = Volt(30.0);
/// How near constant power a stated point counts as constant power: the rounding of data sheets.
const SAME_POWER: f64 = 0.02;
/// Part of a period above which pulse ratings do not hold for second breakdown unless stated.
const PULSE_DUTY: f64 = 0.1;
/// Samples of a half-cycle in which crossings of a curve are looked for.
const SAMPLES: u32 = 512;
/// Points nearer than this, as a ratio, are one point: their slope would be noise.
const CLOSEST: f64 = 1e-9;
/// No rating or point of a curve is outside this range, in SI units; inside it nothing overflows.
const PLAUSIBLE: std::ops::RangeInclusive<f64> = 1e-6..=1e9;

/// Why points are not a safe-area curve; each names the point, counted from zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum CurveError {
    /// Fewer than two points.
    TooFew,
    /// A value that is not positive, or beyond anything a device could be.
    Value(usize),
    /// A voltage that is not above the one before, or by less than a rounding error.
    Order(usize),
    /// A current above the one before: no device stands more current at more volts.
    Rising(usize),
}

/// One stated curve, straight in log-log between its points.
#[derive(Clone, Debug, PartialEq)]
pub struct Curve {
    points: Vec<(Volt, Amp)>,
}

impl Curve {
    /// Checks and keeps the points.
    ///
    /// # Errors
    /// The first point that cannot be part of a curve.
    pub fn new(points: &[(Volt, Amp)]) -> Result<Self, CurveError> {
        let mut before: Option<(Volt, Amp)> = None;
        for (index, &(v, i)) in points.iter().enumerate() {
            if !(PLAUSIBLE.contains(&v.0) && PLAUSIBLE.contains(&i.0)) {
                return Err(CurveError::Value(index));
            }
            if before.is_some_and(|b| v <= b.0 * (1.0 + CLOSEST)) {
                return Err(CurveError::Order(index));
            }
            if before.is_some_and(|b| i > b.1) {
                return Err(CurveError::Rising(index));
            }
            before = Some((v, i));
        }
        if points.len() < 2 {
            return Err(CurveError::TooFew);
        }
        Ok(Self {
            points: points.to_vec(),
        })
    }

    /// Whether the curve says more than constant power about a vertical MOSFET: whether any point
    /// above 30 V leaves Prated/v by more than the 2 % of rounding. A curve without a point up there
    /// claims nothing and is left to its end.
    #[must_use]
    pub fn has_linear_mode_data(&self, power: Watt) -> bool {
        let mut above = self
            .points
            .iter()
            .filter(|p| p.0 > LINEAR_MODE_FROM)
            .peekable();
        above.peek().is_none() || above.any(|p| ((p.0 * p.1) / power - 1.0).abs() > SAME_POWER)
    }

    fn last(&self) -> Volt {
        self.points.last().map_or(Volt::ZERO, |p| p.0)
    }
}

/// What a data sheet states beside the curves.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rating {
    /// IC, continuous for a DC curve and peak for a pulse curve; never derated.
    pub current: Amp,
    /// Prated, case at 25 °C.
    pub power: Watt,
    /// Tj,max.
    pub junction: Celsius,
    /// V(BR)CEO or V(BR)DSS.
    pub breakdown: Volt,
}

/// How the segments steeper than constant power come down with case temperature.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum SecondBreakdown {
    /// Like the power: the conservative reading where a sheet does not say.
    AsThermal,
    /// Stated: this ratio less per kelvin of case above 25 °C.
    PerKelvin(f64),
}

impl SecondBreakdown {
    fn factor(self, thermal: f64, above: Kelvin) -> f64 {
        match self {
            Self::AsThermal => thermal,
            Self::PerKelvin(ratio) => 1.0 - ratio * above.0,
        }
    }
}

/// Why nothing can be said about what is allowed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Refused {
    /// A rating that is not positive, or beyond anything a device could be.
    Rating,
    /// The case is as hot as the junction may be (or second breakdown is derated to nothing).
    TooHot,
}

/// Which limit a use is measured against.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Limit {
    /// IC, or the flat top of a curve.
    Current,
    /// k·Prated/v.
    Power,
    /// A segment of the curve no steeper than constant power.
    Thermal,
    /// A steeper segment.
    SecondBreakdown,
}

/// i·(v/v0)^s <= i0 between two voltages.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Bound {
    from: f64,
    to: f64,
    s: f64,
    ln_v0: f64,
    i0: f64,
    limit: Limit,
}

impl Bound {
    /// i <= i0, whatever the voltage.
    fn current(from: f64, to: f64, i0: f64, limit: Limit) -> Self {
        Self {
            from,
            to,
            s: 0.0,
            ln_v0: 0.0,
            i0,
            limit,
        }
    }

    fn used(&self, volts: f64, amps: f64) -> f64 {
        if self.s <= 0.0 {
            return amps / self.i0;
        }
        if volts <= 0.0 {
            return 0.0;
        }
        amps / self.i0 * math::exp(self.s * (math::ln(volts) - self.ln_v0))
    }

    fn holds_at(&self, volts: f64) -> bool {
        volts >= self.from && volts <= self.to
    }
}

/// How much of what was asked the data covers.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Coverage {
    /// All of it, but for a negligible 1 % of the peak current.
    Whole,
    /// The curve ends at this voltage, and beyond it flows this part of the peak current.
    EndsAt {
        /// The last point.
        volts: Volt,
        /// Greatest current beyond it over the peak current.
        fraction: f64,
    },
    /// There is no curve of two points: only power and current were compared.
    NoCurve,
    /// Current flows above V(BR)CEO or V(BR)DSS.
    AboveBreakdown,
}

/// How much of the allowed current is used, at the worst point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Usage {
    /// i/I_allowed.
    pub used: f64,
    /// Where. For a line, the angle is zero.
    pub at: Point,
    /// Against which limit.
    pub limit: Limit,
    /// What the figure covers.
    pub coverage: Coverage,
}

/// A curve, a power and a current brought down to a case temperature.
///
/// I_allowed(v) = min(IC, k·Prated/v, kseg·C(v)), k = (Tj,max - Tcase)/(Tj,max - 25 °C), Tcase taken
/// as 25 °C if cooler. C is straight in log-log between its points. The flat top of a curve is a
/// current and is not derated; the first sloped segment runs on to the left of its point, so that
/// the derated slope meets the current at a lower voltage. kseg is k, or the stated
/// second-breakdown factor on segments steeper than -1.05. Where a stated factor would let a steep
/// segment start above the end of the one before it, the lower current is held: a device does not
/// stand more at more volts. For the same reason the current of the last point is held beyond the end
/// of the curve: what is used there is at least this, and coverage says that it may be more. The
/// Prated term is left out of pulse curves.
#[derive(Clone, Debug, PartialEq)]
pub struct Allowance {
    bounds: Vec<Bound>,
    /// End of the curve; zero without one.
    end: f64,
    /// Whether a curve is due: not for a lateral MOSFET.
    curve_due: bool,
    breakdown: f64,
}

impl Allowance {
    /// For direct current; without a curve only power and current count, and coverage says so.
    ///
    /// # Errors
    /// A rating is unusable, or the case leaves nothing to allow.
    pub fn dc(
        rating: Rating,
        curve: Option<&Curve>,
        case: Celsius,
        second_breakdown: SecondBreakdown,
    ) -> Result<Self, Refused> {
        let mut allowance = Self::new(rating, curve, case, second_breakdown)?;
        allowance.add_power(rating, case)?;
        Ok(allowance)
    }

    /// For a pulse curve, with the peak current as `rating.current`: no power term.
    ///
    /// # Errors
    /// As [`Allowance::dc`].
    pub fn pulse(
        rating: Rating,
        curve: &Curve,
        case: Celsius,
        second_breakdown: SecondBreakdown,
    ) -> Result<Self, Refused> {
        Self::new(rating, Some(curve), case, second_breakdown)
    }

    /// For a lateral MOSFET, which has no second breakdown: power and current only, no curve due.
    ///
    /// # Errors
    /// As [`Allowance::dc`].
    pub fn power_and_current(rating: Rating, case: Celsius) -> Result<Self, Refused> {
        let mut allowance = Self::new(rating, None, case, SecondBreakdown::AsThermal)?;
        allowance.add_power(rating, case)?;
        allowance.curve_due = false;
        Ok(allowance)
    }

    fn new(
        rating: Rating,
        curve: Option<&Curve>,
        case: Celsius,
        second_breakdown: SecondBreakdown,
    ) -> Result<Self, Refused> {
        let thermal = thermal_factor(rating, case)?;
        let steep = second_breakdown.factor(thermal, case.max(STATED_AT) - STATED_AT);
        if !steep.is_finite() || steep > 1.0 {
            return Err(Refused::Rating);
        }
        if steep <= 0.0 {
            return Err(Refused::TooHot);
        }
        let mut allowance = Self {
            bounds: Vec::new(),
            end: curve.map_or(0.0, |c| c.last().0),
            curve_due: true,
            breakdown: rating.breakdown.0,
        };
        let mut current = rating.current.0;
        if let Some(curve) = curve {
            current = allowance.add_curve(curve, current, thermal, steep);
        }
        let everywhere = (f64::NEG_INFINITY, f64::INFINITY);
        allowance.bounds.push(Bound::current(
            everywhere.0,
            everywhere.1,
            current,
            Limit::Current,
        ));
        Ok(allowance)
    }

    /// Adds the sloped segments; gives back the current of a flat top, if that is less.
    fn add_curve(&mut self, curve: &Curve, mut current: f64, thermal: f64, steep: f64) -> f64 {
        let (mut sloped, mut last) = (false, Limit::Thermal);
        // Least derated current at the end of a segment so far.
        let mut held = f64::INFINITY;
        for pair in curve.points.windows(2) {
            let [(v0, i0), (v1, i1)] = pair else { continue };
            if !sloped && i1 == i0 {
                current = current.min(i0.0);
                continue;
            }
            let s = math::ln(*i0 / *i1) / math::ln(*v1 / *v0);
            let (factor, limit) = if s > SECOND_BREAKDOWN_SLOPE {
                (steep, Limit::SecondBreakdown)
            } else {
                (thermal, Limit::Thermal)
            };
            let (from, i0) = (if sloped { v0.0 } else { 0.0 }, i0.0 * factor);
            self.bounds.push(Bound {
                from,
                to: v1.0,
                s,
                ln_v0: math::ln(v0.0),
                i0,
                limit,
            });
            if i0 > held {
                self.bounds
                    .push(Bound::current(from, self.end, held, Limit::Thermal));
            }
            held = held.min(i1.0 * factor);
            sloped = true;
            last = limit;
        }
        if sloped {
            self.bounds
                .push(Bound::current(self.end, f64::INFINITY, held, last));
        }
        current
    }

    fn add_power(&mut self, rating: Rating, case: Celsius) -> Result<(), Refused> {
        let watts = rating.power.0 * thermal_factor(rating, case)?;
        self.bounds.push(Bound {
            from: 0.0,
            to: f64::INFINITY,
            s: 1.0,
            ln_v0: 0.0,
            i0: watts,
            limit: Limit::Power,
        });
        Ok(())
    }

    /// The greatest current allowed at a voltage by every limit that is known there; beyond the end
    /// of the curve the truth may be less.
    #[must_use]
    pub fn allowed(&self, volts: Volt) -> Amp {
        // Used by 1 A, inverted.
        Amp(1.0 / self.used_at(volts.0, 1.0).0)
    }

    /// The voltages at which a limit begins, ends or crosses another: between two of them
    /// [`Allowance::allowed`] is straight in log-log.
    #[must_use]
    pub fn kinks(&self) -> Vec<Volt> {
        let mut kinks = Vec::new();
        for (at, a) in self.bounds.iter().enumerate() {
            kinks.extend([a.from, a.to]);
            // ln i0a - sa·(x - xa) = ln i0b - sb·(x - xb), x = ln v
            for b in self.bounds.iter().skip(at + 1) {
                let level = |c: &Bound| math::ln(c.i0) + c.s * c.ln_v0;
                kinks.push(math::exp((level(a) - level(b)) / (a.s - b.s)));
            }
        }
        kinks.retain(|v| v.is_finite() && *v > 0.0);
        kinks.sort_by(f64::total_cmp);
        kinks.into_iter().map(Volt).collect()
    }

    /// The voltage up to which the data speak: the end of the curve, or the breakdown where none is due.
    #[must_use]
    pub fn known_to(&self) -> Volt {
        let end = if self.end > 0.0 {
            self.end
        } else {
            self.breakdown
        };
        Volt(end.min(self.breakdown))
    }

    /// Use at one steady point, such as idle at the full rail. `None` if a value is negative or not
    /// finite.
    #[must_use]
    pub fn point_usage(&self, volts: Volt, amps: Amp) -> Option<Usage> {
        let valid = volts >= Volt::ZERO && amps >= Amp::ZERO;
        if !(valid && volts.is_finite() && amps.is_finite()) {
            return None;
        }
        let (used, limit) = self.used_at(volts.0, amps.0);
        let beyond = f64::from(u8::from(volts.0 > self.end));
        let coverage = self.coverage(beyond, volts.0 > self.breakdown);
        Some(Usage {
            used,
            at: Point {
                angle_rad: 0.0,
                volts,
                amps,
            },
            limit,
            coverage,
        })
    }

    /// Greatest use over a locus, by the most loaded device.
    ///
    /// Each limit has its worst point at the one stationary point of i·v^s or at an end of its
    /// voltage range. The largest amplitude is always the worst one: take any point of a smaller
    /// sine, λV̂, at phase β; the full sine passes the same current at the phase β' with
    /// sin β' = λ·sin β, where cos β' >= λ·cos β, hence at a v_CE = V - A·sin β' + B·cos β' no lower;
    /// and nothing here allows more current at more volts, nor does a share depend on anything but
    /// the current. So callers need one amplitude.
    #[must_use]
    pub fn usage(&self, locus: &Locus<'_>) -> Usage {
        let (spot, used, limit) = self.worst_spot(locus);
        let beyond = match locus.position(self.end) {
            t if t >= 1.0 => 1.0,
            t => 2.0 * t / (1.0 + t * t),
        };
        let above = locus.greatest_voltage().0 > self.breakdown;
        Usage {
            used,
            at: locus.point(spot),
            limit,
            coverage: self.coverage(beyond, above),
        }
    }

    /// The worst spot, its use and its limit.
    ///
    /// A share is costly to solve, so each limit is first tried with even sharing: the greatest share
    /// times that is more than it can come to. The most promising limit is solved first, and then
    /// only those that could still beat it.
    fn worst_spot(&self, locus: &Locus<'_>) -> (Spot, f64, Limit) {
        let highest = locus.highest_with_volts();
        let range = |bound: &Bound| {
            let to = if bound.from.is_finite() {
                locus.position(bound.from).min(highest)
            } else {
                1.0
            };
            (locus.position(bound.to), to)
        };
        let solved = |bound: &Bound| {
            let (from, to) = range(bound);
            (from < to).then(|| {
                let spot = locus.worst(bound.s, from, to);
                (spot, bound.used(spot.volts, spot.amps), bound.limit)
            })
        };
        // What each limit comes to with even sharing; beyond the array no limit is ruled out.
        let mut even = [f64::INFINITY; 16];
        let mut first = (0, 0.0);
        for (index, (slot, bound)) in even.iter_mut().zip(&self.bounds).enumerate() {
            let (from, to) = range(bound);
            let t = locus.worst_if_even(bound.s, from, to);
            *slot = if from < to {
                bound.used(locus.volts(t), locus.even_part(t))
            } else {
                0.0
            };
            if *slot > first.1 {
                first = (index, *slot);
            }
        }
        let mut best = (locus.at(1.0), 0.0, Limit::Current);
        let share = locus.greatest_share();
        let others = (0..self.bounds.len()).filter(|index| *index != first.0);
        for index in std::iter::once(first.0).chain(others) {
            if even.get(index).is_some_and(|used| used * share <= best.1) {
                continue;
            }
            if let Some(found) = self.bounds.get(index).and_then(solved)
                && found.1 > best.1
            {
                best = found;
            }
        }
        best
    }

    /// Greatest use by a line of current against voltage, from 0 to `to`, such as what a limiter
    /// lets the most loaded device carry. `line` must be smooth between `kinks`; a current below
    /// zero uses nothing. `None` if `to` is not positive or the line is not finite.
    #[must_use]
    pub fn line_usage(
        &self,
        line: impl Fn(Volt) -> Amp,
        kinks: &[Volt],
        to: Volt,
    ) -> Option<Usage> {
        if !(to > Volt::ZERO && to.is_finite()) {
            return None;
        }
        let mut marks = vec![0.0, to.0, self.end, self.breakdown];
        marks.extend(kinks.iter().map(|v| v.0));
        marks.extend(self.bounds.iter().flat_map(|b| [b.from, b.to]));
        marks.retain(|v| (0.0..=to.0).contains(v));
        marks.sort_by(f64::total_cmp);
        marks.dedup();
        let mut scans = Vec::new();
        let (mut peak, mut beyond, mut above) = (0.0_f64, 0.0_f64, false);
        for pair in marks.windows(2) {
            let [lo, hi] = *pair else { continue };
            let samples = sample(|v| line(Volt(v)).0, lo, hi)?;
            let current = samples.iter().map(|s| s.1).fold(0.0, f64::max);
            peak = peak.max(current);
            if lo >= self.end {
                beyond = beyond.max(current);
            }
            above |= lo >= self.breakdown && current > 0.0;
            for bound in self.bounds.iter().filter(|b| b.from <= lo && b.to >= hi) {
                scans.push((*bound, samples.map(|(v, i)| (v, bound.used(v, i)))));
            }
        }
        let mut best: Option<(f64, f64, Limit)> = None;
        for (bound, samples) in &scans {
            for &(v, used) in samples {
                if best.is_none_or(|b| used > b.1) {
                    best = Some((v, used, bound.limit));
                }
            }
        }
        for (bound, samples) in &scans {
            let used = |v: f64| bound.used(v, line(Volt(v)).0);
            if let Some((v, value)) = narrowed(used, samples, best.map_or(0.0, |b| b.1)) {
                best = Some((v, value, bound.limit));
            }
        }
        let (v, used, limit) = best?;
        let fraction = if peak > 0.0 { beyond / peak } else { 0.0 };
        let at = Point {
            angle_rad: 0.0,
            volts: Volt(v),
            amps: line(Volt(v)).max(Amp::ZERO),
        };
        let used = used.max(0.0);
        Some(Usage {
            used,
            at,
            limit,
            coverage: self.coverage(fraction, above),
        })
    }

    /// The longest unbroken time within one period for which the most loaded device uses more than
    /// `allowance` of what is allowed.
    #[must_use]
    pub fn dwell(&self, locus: &Locus<'_>, frequency: Hertz, allowance: f64) -> Second {
        let excess = |beta: f64| {
            let (volts, amps) = locus.at_phase(beta);
            self.used_at(volts, amps).0 - allowance
        };
        let worst = 2.0 * math::atan(self.worst_spot(locus).0.t);
        let step = math::PI / f64::from(SAMPLES);
        let mut marks: Vec<f64> = (0..=SAMPLES).map(|k| step * f64::from(k)).collect();
        marks.extend([worst, math::PI - worst]);
        marks.sort_by(f64::total_cmp);
        let (mut longest, mut entered) = (0.0_f64, None);
        let mut before: Option<(f64, f64)> = None;
        for &beta in &marks {
            let value = excess(beta);
            if let Some((left, value_left)) = before {
                if value_left <= 0.0 && value > 0.0 {
                    entered = Some(math::root(excess, left, beta, 1e-12).unwrap_or(left));
                } else if value_left > 0.0 && value <= 0.0 {
                    let leaves = math::root(excess, left, beta, 1e-12).unwrap_or(beta);
                    longest = longest.max(leaves - entered.take().unwrap_or(0.0));
                }
            }
            before = Some((beta, value));
        }
        Second(longest / (math::TAU * frequency.0))
    }

    /// The greatest use at one point, of the limits that hold there.
    fn used_at(&self, volts: f64, amps: f64) -> (f64, Limit) {
        let mut best = (0.0, Limit::Current);
        for bound in self.bounds.iter().filter(|b| b.holds_at(volts)) {
            let used = bound.used(volts, amps);
            if used > best.0 {
                best = (used, bound.limit);
            }
        }
        best
    }

    fn coverage(&self, beyond_end: f64, above_breakdown: bool) -> Coverage {
        if above_breakdown {
            Coverage::AboveBreakdown
        } else if !self.curve_due {
            Coverage::Whole
        } else if self.end <= 0.0 {
            Coverage::NoCurve
        } else if beyond_end > NEGLIGIBLE {
            Coverage::EndsAt {
                volts: Volt(self.end),
                fraction: beyond_end,
            }
        } else {
            Coverage::Whole
        }
    }
}

/// k = (Tj,max - Tcase)/(Tj,max - 25 °C), never above 1.
fn thermal_factor(rating: Rating, case: Celsius) -> Result<f64, Refused> {
    let usable = PLAUSIBLE.contains(&rating.current.0)
        && PLAUSIBLE.contains(&rating.power.0)
        && PLAUSIBLE.contains(&rating.breakdown.0)
        && PLAUSIBLE.contains(&(rating.junction - STATED_AT).0)
        && case.0.is_finite();
    if !usable {
        return Err(Refused::Rating);
    }
    let headroom = rating.junction - case.max(STATED_AT);
    if headroom <= Kelvin::ZERO {
        return Err(Refused::TooHot);
    }
    Ok(headroom / (rating.junction - STATED_AT))
}

/// A smooth function on nine points from `lo` to `hi`. `None` if it is not finite.
fn sample(f: impl Fn(f64) -> f64, lo: f64, hi: f64) -> Option<[(f64, f64); 9]> {
    let mut samples = [(0.0, 0.0); 9];
    for (k, slot) in samples.iter_mut().enumerate() {
        let weight = k as f64 / 8.0;
        let x = lo * (1.0 - weight) + hi * weight;
        *slot = (x, f(x));
    }
    samples.iter().all(|s| s.1.is_finite()).then_some(samples)
}

/// The greatest value of a sampled function between its samples, if it beats `best`. Each local
/// maximum is narrowed whose neighbours let it rise so far: by twice their difference at most.
fn narrowed(f: impl Fn(f64) -> f64, samples: &[(f64, f64); 9], best: f64) -> Option<(f64, f64)> {
    let mut found: Option<(f64, f64)> = None;
    for window in samples.windows(3) {
        let [left, middle, right] = window else {
            continue;
        };
        let rise = 2.0 * (2.0 * middle.1 - left.1.min(right.1) - middle.1);
        let crest = middle.1 >= left.1 && middle.1 >= right.1;
        // At either end of the samples the maximum may lie in the first or the last step.
        let edge = (left.0 <= samples[0].0 && left.1 >= middle.1)
            || (right.0 >= samples[8].0 && right.1 >= middle.1);
        let reach = if edge {
            left.1.max(right.1) + (left.1 - right.1).abs()
        } else {
            middle.1 + rise
        };
        if (crest || edge) && reach > found.map_or(best, |f| f.1) {
            let top = math::maximum(&f, left.0, right.0, 1e-9 * (right.0 - left.0));
            if top.1 > found.map_or(best, |f| f.1) {
                found = Some(top);
            }
        }
    }
    found
}

/// A limit on the current of one device against its v_CE: straight lines through stated points,
/// flat beyond the last, the first line extended down to no volts.
#[derive(Clone, Debug, PartialEq)]
pub struct LimitLine {
    points: Vec<(Volt, Amp)>,
}

/// How far a limit line stays clear of a locus.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Clearance {
    /// Least line/i; 1 touches, and 0 means that the limiter acts without any current.
    pub ratio: f64,
    /// Where.
    pub at: Point,
}

impl LimitLine {
    /// `None` unless there is a point, volts ascend strictly from zero up, and currents do not rise:
    /// a line that allows more at more volts protects nothing. Currents may be negative.
    #[must_use]
    pub fn new(points: &[(Volt, Amp)]) -> Option<Self> {
        let finite = points
            .iter()
            .all(|p| p.0 >= Volt::ZERO && p.0.is_finite() && p.1.is_finite());
        let falling = points.windows(2).all(|pair| match pair {
            [a, b] => a.0 < b.0 && a.1 >= b.1,
            _ => false,
        });
        (!points.is_empty() && finite && falling).then(|| Self {
            points: points.to_vec(),
        })
    }

    /// The limit at a voltage.
    #[must_use]
    pub fn at(&self, volts: Volt) -> Amp {
        let (p, q) = self.line_at(volts.0);
        Amp(p + q * volts.0)
    }

    /// The voltages at which the line bends.
    #[must_use]
    pub fn kinks(&self) -> Vec<Volt> {
        self.points.iter().map(|p| p.0).collect()
    }

    /// p and q of p + q·v for each stretch, with the voltages between which it holds.
    fn stretches(&self) -> impl Iterator<Item = (f64, f64, f64, f64)> + '_ {
        let last = self
            .points
            .last()
            .map(|p| (p.0.0, f64::INFINITY, p.1.0, 0.0));
        let lines = self
            .points
            .windows(2)
            .enumerate()
            .filter_map(|(k, pair)| match pair {
                [a, b] => {
                    let q = (b.1.0 - a.1.0) / (b.0.0 - a.0.0);
                    let from = if k == 0 { f64::NEG_INFINITY } else { a.0.0 };
                    Some((from, b.0.0, a.1.0 - q * a.0.0, q))
                }
                _ => None,
            });
        let alone = self.points.len() == 1;
        lines.chain(
            last.map(move |(from, to, p, q)| {
                (if alone { f64::NEG_INFINITY } else { from }, to, p, q)
            }),
        )
    }

    fn line_at(&self, volts: f64) -> (f64, f64) {
        self.stretches()
            .find(|s| volts <= s.1)
            .map_or((0.0, 0.0), |(_, _, p, q)| (p, q))
    }

    /// The least line/i over a locus, for the most loaded device. As with safe area the first
    /// quarter of the half-cycle holds it, because the line does not rise with voltage.
    #[must_use]
    pub fn clearance(&self, locus: &Locus<'_>) -> Clearance {
        let start = locus.greatest_voltage();
        if self.at(start) <= Amp::ZERO {
            return Clearance {
                ratio: 0.0,
                at: locus.point(locus.at(0.0)),
            };
        }
        // The end of the quarter always counts; some stretch mostly holds something worse.
        let end = locus.at(1.0);
        let mut best = (end, self.at(Volt(end.volts)).0 / end.amps);
        for (from, to, p, q) in self.stretches() {
            let (first, last) = (locus.position(to), locus.position(from));
            if first < last {
                let spot = locus.worst_against_line(p, q, first, last);
                let ratio = (p + q * spot.volts) / spot.amps;
                if ratio < best.1 {
                    best = (spot, ratio);
                }
            }
        }
        Clearance {
            ratio: best.1,
            at: locus.point(best.0),
        }
    }
}

/// What the most loaded device carries when a limiter senses one of the others and holds it to the
/// line.
/// `None` where no finite current answers.
#[must_use]
pub fn most_loaded_on_line(line: &LimitLine, bank: &Bank, volts: Volt) -> Option<Amp> {
    bank.most_loaded_beside(line.at(volts).max(Amp::ZERO))
}

/// A pulse curve brought down to temperature.
#[derive(Clone, Debug, PartialEq)]
pub struct PulseAllowance {
    /// The pulse length it is stated for.
    pub length: Second,
    /// What it allows.
    pub allowance: Allowance,
}

/// The use that pulse credit leaves, and the pulse length it stands on.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Credited {
    /// The use.
    pub usage: Usage,
    /// Length of the curve used; `None` for the DC curve.
    pub length: Option<Second>,
}

/// Pulse credit for a locus repeated at `frequency`.
///
/// Curves are tried from DC down, until one is used no more than `allowance`. A curve of length τ
/// may be used only if the longest unbroken time above the next longer one (above `allowance` of
/// it) is no more than τ. Between DC and the longest pulse curve nothing is interpolated; between
/// two pulse curves log I is straight against log τ. Where second breakdown governs, no credit
/// beyond a tenth of the period, unless the sheet gives it (`second_breakdown_repeats`). `pulses`
/// may come in any order.
#[must_use]
pub fn pulse_credit(
    locus: &Locus<'_>,
    frequency: Hertz,
    dc: &Allowance,
    pulses: &[PulseAllowance],
    allowance: f64,
    second_breakdown_repeats: bool,
) -> Credited {
    let mut order: Vec<&PulseAllowance> = pulses.iter().collect();
    order.sort_by(|a, b| b.length.0.total_cmp(&a.length.0));
    let mut best = Credited {
        usage: dc.usage(locus),
        length: None,
    };
    let mut above = dc;
    for pulse in order {
        if best.usage.used <= allowance && best.usage.coverage == Coverage::Whole {
            break;
        }
        let dwell = above.dwell(locus, frequency, allowance);
        let usage = pulse.allowance.usage(locus);
        let steep = [best.usage.limit, usage.limit].contains(&Limit::SecondBreakdown);
        if steep && dwell.0 * frequency.0 > PULSE_DUTY && !second_breakdown_repeats {
            break;
        }
        if dwell <= pulse.length {
            best = Credited {
                usage,
                length: Some(pulse.length),
            };
            above = &pulse.allowance;
            continue;
        }
        if let Some(longer) = best.length.filter(|longer| dwell < *longer) {
            let weight = math::ln(longer / dwell) / math::ln(longer / pulse.length);
            let usage = between(above, &pulse.allowance, weight, locus, usage.coverage);
            best = Credited {
                usage,
                length: Some(dwell),
            };
        }
        break;
    }
    best
}

/// Use of a curve between a longer and a shorter one, ln I weighted towards the shorter.
fn between(
    longer: &Allowance,
    shorter: &Allowance,
    weight: f64,
    locus: &Locus<'_>,
    coverage: Coverage,
) -> Usage {
    let used = |t: f64| {
        let Spot { volts, amps, .. } = locus.at(t);
        math::pow(longer.used_at(volts, amps).0, 1.0 - weight)
            * math::pow(shorter.used_at(volts, amps).0, weight)
    };
    let step = 1.0 / f64::from(SAMPLES);
    let best = (0..=SAMPLES)
        .map(|k| step * f64::from(k))
        .map(|t| (t, used(t)))
        .fold(
            (0.0, 0.0),
            |best, found| if found.1 > best.1 { found } else { best },
        );
    let (from, to) = ((best.0 - step).max(0.0), (best.0 + step).min(1.0));
    let (t, value) = math::maximum(used, from, to, 1e-9);
    let at = locus.point(locus.at(t));
    let limit = shorter.used_at(at.volts.0, at.amps.0).1;
    Usage {
        used: value,
        at,
        limit,
        coverage,
    }
}

#[cfg(test)]
#[allow(
    clippy::disallowed_methods,
    reason = "a twin may use the platform's functions"
)]
mod tests {
    use super::*;
    use crate::physics::load::Impedance;
    use crate::physics::sharing::Transfer;
    use crate::physics::unit::Ohm;
    use proptest::prelude::*;

    fn curve(points: &[(f64, f64)]) -> Curve {
        let points: Vec<_> = points.iter().map(|p| (Volt(p.0), Amp(p.1))).collect();
        Curve::new(&points).unwrap()
    }

    fn rating() -> Rating {
        Rating {
            current: Amp(15.0),
            power: Watt(200.0),
            junction: Celsius(150.0),
            breakdown: Volt(230.0),
        }
    }

    fn any_curve() -> impl Strategy<Value = Curve> {
        // Steps in ln v and slopes: concave and not, with flat stretches.
        proptest::collection::vec(
            (0.05..1.2f64, prop_oneof![Just(0.0), Just(1.0), 0.2..5.0f64]),
            1..6,
        )
        .prop_map(|steps| {
            let mut point = (5.0_f64, 18.0_f64);
            let mut points = vec![(Volt(point.0), Amp(point.1))];
            for (dx, slope) in steps {
                point = (point.0 * dx.exp(), point.1 * (-slope * dx).exp());
                points.push((Volt(point.0), Amp(point.1)));
            }
            Curve::new(&points).unwrap()
        })
    }

    fn any_bank() -> impl Strategy<Value = Bank> {
        let transfer = || {
            Transfer::new(&[
                (Volt(3.6), Amp(0.1)),
                (Volt(4.2), Amp(1.0)),
                (Volt(5.0), Amp(4.0)),
                (Volt(6.5), Amp(12.0)),
            ])
            .unwrap()
        };
        (
            1u32..6,
            prop_oneof![Just(0.0), 0.05..0.47f64],
            0.0..0.1f64,
            0.0..0.06f64,
            0u8..3,
        )
            .prop_map(move |(n, re, tol, dv, kind)| match kind {
                0 => Bank::even(n, Ohm(re)),
                1 => Bank::bipolar(n, Ohm(re), tol, Volt(dv), Volt(0.0257)),
                _ => Bank::source_follower(n, Ohm(re), tol, Volt(10.0 * dv), transfer()),
            })
            .prop_map(Option::unwrap)
    }

    /// Straight from the definition, by a route of its own.
    fn allowed(curve: &Curve, v: f64, case: f64, steep: Option<f64>) -> f64 {
        let k = ((150.0 - case) / 125.0).min(1.0);
        let p: Vec<_> = curve.points.iter().map(|p| (p.0.0, p.1.0)).collect();
        let mut out = 15.0_f64.min(k * 200.0 / v);
        let Some(first) = p.windows(2).position(|w| w[0].1 > w[1].1) else {
            return out.min(p[0].1);
        };
        if first > 0 {
            out = out.min(p[0].1);
        }
        let mut held = f64::INFINITY;
        for (n, w) in p.windows(2).enumerate().skip(first) {
            let slope = (w[1].1 / w[0].1).ln() / (w[1].0 / w[0].0).ln();
            let factor = if slope < -1.05 { steep.unwrap_or(k) } else { k };
            let here = w[0].1 * (v / w[0].0).powf(slope) * factor;
            if (n == first || v >= w[0].0) && v <= w[1].0 {
                out = out.min(here.min(held));
            }
            held = held.min(w[1].1 * factor);
        }
        out
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(200))]

        #[test]
        fn allowed_current_is_the_definition(
            curve in any_curve(), case in 0.0..140.0f64, w in 0.0..1.0f64,
            sb in prop_oneof![Just(None), (0.0..0.006f64).prop_map(Some)],
        ) {
            let kind = sb.map_or(SecondBreakdown::AsThermal, SecondBreakdown::PerKelvin);
            let steep = sb.map(|r| 1.0 - r * (case.max(25.0) - 25.0));
            let allowance = Allowance::dc(rating(), Some(&curve), Celsius(case), kind).unwrap();
            let v = 0.5 + w * (curve.last().0 - 0.5);
            let expected = allowed(&curve, v, case.max(25.0), steep);
            prop_assert!((allowance.allowed(Volt(v)).0 / expected - 1.0).abs() < 1e-9);
        }

        #[test]
        fn no_more_current_is_allowed_at_more_volts(
            curve in any_curve(), case in 25.0..140.0f64, r in 0.0..0.008f64,
        ) {
            let kind = SecondBreakdown::PerKelvin(r);
            let allowance = Allowance::dc(rating(), Some(&curve), Celsius(case), kind).unwrap();
            // Short of the end by a rounding error: beyond it only the power is known.
            let last = curve.last().0 * (1.0 - 1e-12);
            let mut before = f64::INFINITY;
            for k in 1..=2000 {
                let here = allowance.allowed(Volt(last * f64::from(k) / 2000.0)).0;
                prop_assert!(here <= before * (1.0 + 1e-12));
                before = here;
            }
        }

        /// The twin samples the WHOLE half-cycle and refines twice round its best sample.
        #[test]
        fn usage_is_the_greatest_of_the_half_cycle(
            curve in any_curve(), bank in any_bank(), case in 25.0..140.0f64,
            degrees in prop_oneof![Just(0.0), -90.0..90.0f64, -1e-7..1e-7f64],
            z in 2.0..12.0f64, swing in 0.2..0.9f64,
            sb in prop_oneof![Just(SecondBreakdown::AsThermal), Just(SecondBreakdown::PerKelvin(0.003))],
        ) {
            let allowance = Allowance::dc(rating(), Some(&curve), Celsius(case), sb).unwrap();
            let load = Impedance::polar(Ohm(z), degrees.to_radians());
            let locus = Locus::new(&bank, Volt(55.0), Volt(55.0 * swing), load).unwrap();
            let found = allowance.usage(&locus);
            let at = |beta: f64| {
                let (v, i) = locus.at_phase(beta);
                allowance.used_at(v, i).0
            };
            let (mut lo, mut hi) = (0.0, math::PI);
            let mut best = (0.0, 0.0);
            for _ in 0..4 {
                let step = (hi - lo) / 4000.0;
                for k in 0..=4000 {
                    let beta = lo + step * f64::from(k);
                    let used = at(beta);
                    if used > best.1 {
                        best = (beta, used);
                    }
                }
                (lo, hi) = ((best.0 - step).max(0.0), (best.0 + step).min(math::PI));
            }
            prop_assert!(found.used >= best.1 * (1.0 - 1e-9), "{found:?} {best:?}");
            // Not above it either; where two limits meet the twin can only come near.
            prop_assert!(found.used <= best.1 * (1.0 + 1e-7), "{found:?} {best:?}");
            // A stated factor makes the curve jump at a joint, where either side may be meant.
            if sb == SecondBreakdown::AsThermal {
                let (v, i) = (found.at.volts, found.at.amps);
                prop_assert!((allowance.used_at(v.0 * (1.0 - 1e-12), i.0).0 / found.used - 1.0).abs() < 1e-6);
            }
        }

        #[test]
        fn the_largest_amplitude_is_the_worst(
            curve in any_curve(), bank in any_bank(), case in 25.0..140.0f64,
            degrees in -90.0..90.0f64, z in 2.0..12.0f64, swing in 0.2..0.9f64, less in 0.01..1.0f64,
        ) {
            let kind = SecondBreakdown::PerKelvin(0.003);
            let allowance = Allowance::dc(rating(), Some(&curve), Celsius(case), kind).unwrap();
            let load = Impedance::polar(Ohm(z), degrees.to_radians());
            let used = |swing: f64| {
                allowance.usage(&Locus::new(&bank, Volt(55.0), Volt(55.0 * swing), load).unwrap()).used
            };
            prop_assert!(used(swing * less) <= used(swing) * (1.0 + 1e-9));
        }

        #[test]
        fn fraction_beyond_the_end_is_sampled(
            degrees in -90.0..90.0f64, swing in 0.2..0.95f64, end in 5.0..120.0f64,
        ) {
            let bank = Bank::even(2, Ohm(0.1)).unwrap();
            let load = Impedance::polar(Ohm(4.0), degrees.to_radians());
            let locus = Locus::new(&bank, Volt(55.0), Volt(55.0 * swing), load).unwrap();
            let curve = curve(&[(4.0, 15.0), (end, 14.0)]);
            let allowance =
                Allowance::dc(rating(), Some(&curve), Celsius(25.0), SecondBreakdown::AsThermal)
                    .unwrap();
            let most = (0..=100_000)
                .map(|k| locus.at_phase(math::PI * f64::from(k) / 100_000.0))
                .filter(|p| p.0 > end)
                .map(|p| p.1 * 2.0 / locus.peak_current().0)
                .fold(0.0, f64::max);
            match allowance.usage(&locus).coverage {
                Coverage::EndsAt { fraction, volts } => {
                    prop_assert!((fraction - most).abs() < 1e-4);
                    prop_assert!((volts.0 - end).abs() < 1e-12);
                }
                Coverage::Whole => prop_assert!(most < 0.0101),
                other => prop_assert!(false, "{other:?}"),
            }
        }

        #[test]
        fn line_usage_is_sampled(
            curve in any_curve(), p in 5.0..20.0f64, knee in 5.0..40.0f64, q in -0.3..-0.01f64,
        ) {
            let allowance =
                Allowance::dc(rating(), Some(&curve), Celsius(80.0), SecondBreakdown::AsThermal)
                    .unwrap();
            let line = LimitLine::new(&[
                (Volt(0.0), Amp(p)), (Volt(knee), Amp(p)), (Volt(100.0), Amp(p + q * (100.0 - knee))),
            ])
            .unwrap();
            let found =
                allowance.line_usage(|v| line.at(v), &line.kinks(), Volt(100.0)).unwrap().used;
            let mut fine = 0.0_f64;
            for k in 0..=100_000 {
                let v = f64::from(k) / 1000.0;
                fine = fine.max(allowance.used_at(v, line.at(Volt(v)).0).0);
            }
            prop_assert!(found >= fine * (1.0 - 1e-9) && found <= fine * (1.0 + 1e-3));
        }

        #[test]
        fn clearance_is_sampled(
            bank in any_bank(), degrees in -90.0..90.0f64, z in 2.0..12.0f64, swing in 0.2..0.9f64,
            p in 2.0..30.0f64, knee in 1.0..60.0f64, end in 0.05..1.0f64,
        ) {
            let load = Impedance::polar(Ohm(z), degrees.to_radians());
            let locus = Locus::new(&bank, Volt(55.0), Volt(55.0 * swing), load).unwrap();
            let line = LimitLine::new(&[
                (Volt(0.0), Amp(p)), (Volt(knee), Amp(0.9 * p)), (Volt(110.0), Amp(end * 0.9 * p)),
            ])
            .unwrap();
            let fine = (1..20_000)
                .map(|k| locus.at_phase(math::PI * f64::from(k) / 20_000.0))
                .map(|(v, i)| line.at(Volt(v)).0 / i)
                .fold(f64::INFINITY, f64::min);
            let found = line.clearance(&locus).ratio;
            prop_assert!(found <= fine * (1.0 + 1e-9) && found >= fine * (1.0 - 1e-5));
        }

        #[test]
        fn dwell_is_sampled(
            curve in any_curve(), degrees in -90.0..90.0f64, z in 2.0..6.0f64, swing in 0.5..0.9f64,
        ) {
            let bank = Bank::even(2, Ohm(0.1)).unwrap();
            let allowance =
                Allowance::dc(rating(), Some(&curve), Celsius(90.0), SecondBreakdown::AsThermal)
                    .unwrap();
            let load = Impedance::polar(Ohm(z), degrees.to_radians());
            let locus = Locus::new(&bank, Volt(55.0), Volt(55.0 * swing), load).unwrap();
            let (mut longest, mut run) = (0u32, 0u32);
            for k in 0..=50_000 {
                let (v, i) = locus.at_phase(math::PI * f64::from(k) / 50_000.0);
                run = if allowance.used_at(v, i).0 > 1.0 { run + 1 } else { 0 };
                longest = longest.max(run);
            }
            let fine = f64::from(longest) / 50_000.0 * 0.5 / 20.0;
            let found = allowance.dwell(&locus, Hertz(20.0), 1.0).0;
            prop_assert!((found - fine).abs() < 2e-6, "{found} {fine}");
        }

        #[test]
        fn any_input_is_refused_or_answered_with_numbers(
            v in proptest::num::f64::ANY, i in proptest::num::f64::ANY,
            a in proptest::num::f64::ANY, b in proptest::num::f64::ANY,
        ) {
            let odd = Rating {
                current: Amp(a), power: Watt(b), junction: Celsius(v), breakdown: Volt(i),
            };
            let stated = curve(&[(10.0, 10.0), (100.0, 0.5)]);
            let sb = SecondBreakdown::PerKelvin(a);
            if let Ok(allowance) = Allowance::dc(odd, Some(&stated), Celsius(b), sb)
                && let Some(usage) = allowance.point_usage(Volt(20.0), Amp(1.0))
            {
                prop_assert!(usage.used.is_finite());
            }
            let _ = Curve::new(&[(Volt(v), Amp(i)), (Volt(a), Amp(b))]);
            let _ = LimitLine::new(&[(Volt(v), Amp(i)), (Volt(a), Amp(b))]);
        }
    }

    #[test]
    fn a_curve_of_many_points_is_walked_to_its_end() {
        // i = 400/v² in 60 segments gives what two points give.
        let power_law = |n: u32| {
            let points: Vec<_> = (0..=n)
                .map(|k| 10.0 * 10f64.powf(f64::from(k) / f64::from(n)))
                .map(|v| (v, 400.0 / (v * v)))
                .collect();
            curve(&points)
        };
        let bank = Bank::bipolar(3, Ohm(0.22), 0.05, Volt(0.02), Volt(0.0257)).unwrap();
        let locus = Locus::new(
            &bank,
            Volt(55.0),
            Volt(45.0),
            Impedance::polar(Ohm(4.0), 0.8),
        )
        .unwrap();
        let used = |n: u32| {
            Allowance::dc(
                rating(),
                Some(&power_law(n)),
                Celsius(60.0),
                SecondBreakdown::AsThermal,
            )
            .unwrap()
            .usage(&locus)
            .used
        };
        assert!((used(60) / used(1) - 1.0).abs() < 1e-9);
    }

    #[test]
    fn bad_curves_name_the_point() {
        let bad = |points: &[(f64, f64)]| {
            let points: Vec<_> = points.iter().map(|p| (Volt(p.0), Amp(p.1))).collect();
            Curve::new(&points).unwrap_err()
        };
        assert_eq!(bad(&[]), CurveError::TooFew);
        assert_eq!(bad(&[(10.0, 1.0)]), CurveError::TooFew);
        assert_eq!(bad(&[(10.0, 1.0), (10.0, 0.5)]), CurveError::Order(1));
        assert_eq!(bad(&[(10.0, 1.0), (20.0, 2.0)]), CurveError::Rising(1));
        assert_eq!(bad(&[(10.0, 0.0), (20.0, 2.0)]), CurveError::Value(0));
        assert_eq!(bad(&[(10.0, 1.0), (f64::NAN, 2.0)]), CurveError::Value(1));
    }

    #[test]
    fn a_case_at_the_junction_limit_allows_nothing() {
        let dc = |case: f64, sb| Allowance::dc(rating(), None, Celsius(case), sb);
        assert_eq!(dc(150.0, SecondBreakdown::AsThermal), Err(Refused::TooHot));
        assert_eq!(
            dc(125.0, SecondBreakdown::PerKelvin(0.01)),
            Err(Refused::TooHot)
        );
        assert_eq!(
            dc(25.0, SecondBreakdown::PerKelvin(f64::NAN)),
            Err(Refused::Rating)
        );
    }

    #[test]
    fn coverage_says_what_is_missing() {
        let none =
            Allowance::dc(rating(), None, Celsius(25.0), SecondBreakdown::AsThermal).unwrap();
        let idle = none.point_usage(Volt(50.0), Amp(0.1)).unwrap();
        assert_eq!(idle.coverage, Coverage::NoCurve);
        assert!((idle.used - 5.0 / 200.0).abs() < 1e-12);
        let lateral = Allowance::power_and_current(rating(), Celsius(25.0)).unwrap();
        assert_eq!(
            lateral.point_usage(Volt(50.0), Amp(0.1)).unwrap().coverage,
            Coverage::Whole
        );
        assert_eq!(
            lateral.point_usage(Volt(231.0), Amp(0.1)).unwrap().coverage,
            Coverage::AboveBreakdown
        );
    }

    #[test]
    fn constant_power_is_not_linear_mode_data() {
        let hyperbola = curve(&[(10.0, 15.0), (20.0, 10.0), (50.0, 4.0), (200.0, 1.0)]);
        assert!(!hyperbola.has_linear_mode_data(Watt(200.0)));
        let bent = curve(&[(10.0, 15.0), (20.0, 10.0), (50.0, 4.0), (200.0, 0.6)]);
        assert!(bent.has_linear_mode_data(Watt(200.0)));
    }

    #[test]
    fn pulse_credit_steps_down_only_as_far_as_dwell_allows() {
        let dc = curve(&[(10.0, 15.0), (13.3, 15.0), (30.0, 6.65), (150.0, 0.3)]);
        let wider = |k: f64| {
            let points: Vec<_> = dc.points.iter().map(|p| (p.0, p.1 * k)).collect();
            let rating = Rating {
                current: Amp(15.0 * k),
                ..rating()
            };
            Allowance::pulse(
                rating,
                &Curve::new(&points).unwrap(),
                Celsius(80.0),
                SecondBreakdown::AsThermal,
            )
            .unwrap()
        };
        let base = Allowance::dc(
            rating(),
            Some(&dc),
            Celsius(80.0),
            SecondBreakdown::AsThermal,
        )
        .unwrap();
        let bank = Bank::even(2, Ohm(0.22)).unwrap();
        let load = Impedance::polar(Ohm(4.0), 0.7);
        let locus = Locus::new(&bank, Volt(45.0), Volt(38.0), load).unwrap();
        let credit = |lengths: &[(f64, f64)], f: f64, repeats: bool| {
            let pulses: Vec<_> = lengths
                .iter()
                .map(|&(s, k)| PulseAllowance {
                    length: Second(s),
                    allowance: wider(k),
                })
                .collect();
            pulse_credit(&locus, Hertz(f), &base, &pulses, 0.8, repeats)
        };
        let plain = base.usage(&locus);
        assert!(plain.used > 0.8);
        // At 20 Hz the dwell is some milliseconds: a 100 ms curve may be used, a 1 µs curve not.
        let long = credit(&[(0.1, 1.5)], 20.0, true);
        assert_eq!(long.length, Some(Second(0.1)));
        assert!((long.usage.used - plain.used / 1.5).abs() < 0.35 * plain.used);
        assert_eq!(credit(&[(1e-6, 1.5)], 20.0, true).length, None);
        // Between two pulse curves the answer lies between theirs, at the length of the dwell.
        let dwell = wider(1.05).dwell(&locus, Hertz(20.0), 0.8);
        let mixed = credit(&[(0.1, 1.05), (1e-6, 4.0)], 20.0, true);
        assert_eq!(mixed.length, Some(dwell));
        assert!(mixed.usage.used < wider(1.05).usage(&locus).used);
        assert!(mixed.usage.used > wider(4.0).usage(&locus).used);
        // More than a tenth of the period: no credit where second breakdown governs.
        assert_eq!(plain.limit, Limit::SecondBreakdown);
        assert!(base.dwell(&locus, Hertz(20.0), 0.8).0 * 20.0 > 0.1);
        assert_eq!(credit(&[(0.1, 1.5)], 20.0, false).length, None);
    }

    #[test]
    fn a_limiter_that_crosses_zero_fires_without_current() {
        let bank = Bank::even(1, Ohm(0.22)).unwrap();
        let locus = Locus::new(
            &bank,
            Volt(45.0),
            Volt(38.0),
            Impedance::polar(Ohm(8.0), 0.7),
        )
        .unwrap();
        let line = LimitLine::new(&[(Volt(0.0), Amp(10.0)), (Volt(60.0), Amp(0.0))]).unwrap();
        assert!(line.clearance(&locus).ratio.abs() < 1e-15);
        assert_eq!(
            LimitLine::new(&[(Volt(0.0), Amp(1.0)), (Volt(9.0), Amp(2.0))]),
            None
        );
    }
}
