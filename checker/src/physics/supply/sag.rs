//! A rail at a signal frequency low enough to pull it down within each half wave: an exact march
//! through charging and discharging against a sine load, and the least headroom over it.
//! Must not know amplifiers: what the rail is needed for is a closure of the signal's phase.

use super::conduction::bracketed_root;
use super::rail::Rail;
use super::reservoir::Draw;
use crate::physics::math::{FRAC_PI_2, PI, asin, cos, exp, root, sin_cos};
use crate::physics::unit::{Amp, Hertz, Volt};

/// Signal periods in the longest pattern after which signal and mains repeat together.
const MOST_PERIODS: u32 = 8;

/// Most half-cycles of the mains in one signal period; 100 at 1 Hz and 50 Hz.
const MOST_HALF_CYCLES: f64 = 400.0;

/// Phases of the signal against the mains that are searched before refining: at least 16, and so
/// many that the sine of the signal, which turns that much faster against them, moves by less than
/// 0.08 radians from one to the next; within a limit that counts above the mains frequency only.
const PHASES: f64 = 16.0;
const PHASES_PER_PACE: f64 = 40.0;
const MOST_PHASES: usize = 64;

/// Most parabolas laid through the neighbourhood of the worst phase, and the gain (as a part of
/// the crest of the source) below which another is not worth its time.
const PARABOLAS: u32 = 6;
const GAIN: f64 = 1e-7;

/// How exactly a level is settled, as the square of the last change: while comparing phases, and
/// for the result.
const ROUGH: f64 = 1e-6;
const EXACT: f64 = 1e-13;

/// Longest step of sampling within a piece, radians of the mains or of the signal, and how far above
/// the least so far (as a part of the source's crest) the bottom of a parabola through three samples
/// may lie and still be looked at closer.
const SAMPLING: f64 = PI / 8.0;
const SLACK: f64 = 5e-3;

/// Most samples of a piece; a piece is no longer than half a period of mains and of signal.
const MOST_SAMPLES: usize = 18;

/// Most marches that look for level and headroom at once before they are looked for apart.
const ROUGH_MARCHES: u32 = 4;

/// Most patterns marched through to find the steady state; three or four are usual.
const MAX_MARCHES: u32 = 100;

/// How much the load may bend the drive before spans are kept short, and how short.
const STEEP: f64 = 0.1;
const SHORT_SPAN: f64 = PI / 32.0;

/// Most pieces between two break points of source and load; one or two are usual.
const MOST_PIECES: u32 = 16;

/// A rail current: a standing part and the half waves of a sine.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LowFrequencyLoad {
    /// Drawn all the time (idle current).
    pub standing: Amp,
    /// Peak of the half waves, all channels in phase.
    pub peak: Amp,
    /// Frequency of the signal.
    pub frequency: Hertz,
    /// In which halves of the signal period this rail is drawn upon.
    pub draw: Draw,
}

/// The moment at which a rail has least to spare.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Headroom {
    /// Rail less what is needed of it; negative if it falls short.
    pub least: Volt,
    /// The rail then.
    pub rail: Volt,
    /// Phase of the signal current then, radians from its rise through zero, 0 to 2π.
    pub signal_rad: f64,
    /// Mains angle at which the signal rose through zero, radians from a zero crossing, 0 to π.
    pub mains_rad: f64,
}

impl Rail {
    /// The least of rail(t) - needed(t) over the signal period and over every phase of the signal
    /// against the mains, in the periodic steady state. `needed` is a function of the phase of the
    /// signal current in radians, 0 to 2π.
    ///
    /// At least 16 phases are searched and the neighbourhood of the worst is refined. `needed` must rise
    /// and fall no more than once within each half wave, as what a sine needs does.
    ///
    /// A signal period that holds p/q half-cycles of the mains, q up to 8, repeats after q
    /// periods. Any other frequency is replaced by the next LOWER one that does, less than
    /// 1/8 of a half-cycle away (at 31.5 Hz and 50 Hz mains, 31.25 Hz): a mains frequency is only
    /// held to about 1 %, and a longer half wave sags deeper.
    ///
    /// The source resistance is that of both rails charging together, though at this frequency
    /// they take turns to be loaded: slightly low rails, deliberately.
    ///
    /// `None` where the rail collapses to zero under the load, for a frequency above zero but under
    /// 1/400 of twice the mains, and for anything negative or not finite.
    pub fn least_headroom(
        &self,
        load: LowFrequencyLoad,
        needed: impl Fn(f64) -> Volt,
    ) -> Option<Headroom> {
        let scan = self.scan_headroom(load, &needed)?;
        let worst = self.lowest_near(
            load,
            &scan.promising(SLACK * self.crest),
            scan.step,
            &needed,
        )?;
        self.least_headroom_at(load, worst, needed)
    }

    /// The least headroom at each phase of the search, roughly: to a few thousandths of the crest of the
    /// source, for finding out where to look closer.
    pub fn scan_headroom(
        &self,
        load: LowFrequencyLoad,
        needed: &impl Fn(f64) -> Volt,
    ) -> Option<Scan> {
        let march = March::new(self, load)?;
        let (phases, step) = march.phases();
        let (mut level, mut drift) = (1.0, 0.0);
        let mut spares = Vec::with_capacity(phases);
        for n in 0..phases {
            let phase = step * n as f64;
            let (spare, next) = march.roughly_least(phase, level + drift, needed)?;
            drift = if n == 0 { 0.0 } else { next - level };
            level = next;
            spares.push(spare);
        }
        Some(Scan { spares, step })
    }

    /// Of some phases, each with its neighbourhood of a step, the one with the least headroom.
    pub fn lowest_near(
        &self,
        load: LowFrequencyLoad,
        phases: &[f64],
        step: f64,
        needed: &impl Fn(f64) -> Volt,
    ) -> Option<f64> {
        let march = March::new(self, load)?;
        let mut centres = Vec::with_capacity(phases.len());
        for &phase in phases {
            let level = march.settle(phase, 1.0, ROUGH)?;
            centres.push((phase, march.spare(phase, level, needed), level));
        }
        let lowest = centres.iter().map(|c| c.1).fold(f64::INFINITY, f64::min);
        let mut worst: Option<Point> = None;
        for (phase, here, level) in centres {
            if here > lowest + SLACK * self.crest {
                continue;
            }
            let spare = |phase: f64| march.spare(phase, level, needed);
            let (before, after) = (phase - step, phase + step);
            let points = [
                (before, spare(before)),
                (phase, here),
                (after, spare(after)),
            ];
            let found = bottom(spare, points, GAIN * self.crest);
            if worst.is_none_or(|w| found.1 < w.1) {
                worst = Some(found);
            }
        }
        worst.map(|w| w.0.rem_euclid(PI))
    }

    /// The least headroom at one phase: the signal current rises through zero at `mains_rad` radians
    /// after a zero crossing of the mains. Some ten times quicker, for a search that holds the phase.
    pub fn least_headroom_at(
        &self,
        load: LowFrequencyLoad,
        mains_rad: f64,
        needed: impl Fn(f64) -> Volt,
    ) -> Option<Headroom> {
        let phase = mains_rad.rem_euclid(PI);
        let march = March::new(self, load)?;
        let level = march.settle(phase, 1.0, EXACT)?;
        march.least(phase, level, &needed)
    }
}

/// Rough least headroom, in volts, at even steps of the phase of the signal against the mains.
#[derive(Clone, Debug)]
pub struct Scan {
    spares: Vec<f64>,
    /// Mains radians from one phase to the next.
    pub step: f64,
}

impl Scan {
    /// The lowest, in volts.
    #[must_use]
    pub fn lowest(&self) -> f64 {
        self.spares.iter().copied().fold(f64::INFINITY, f64::min)
    }

    /// The phases of all local minima within this many volts of the lowest, lowest first.
    #[must_use]
    pub fn promising(&self, within: f64) -> Vec<f64> {
        let count = self.spares.len();
        let lowest = self.lowest();
        let at = |n: usize| self.spares.get(n % count.max(1)).copied();
        let mut found: Vec<Point> = (0..count)
            .filter_map(|n| Some((n, at(n + count - 1)?, at(n)?, at(n + 1)?)))
            .filter(|&(_, before, here, after)| {
                here <= before.min(after) && here <= lowest + within
            })
            .map(|(n, _, here, _)| (self.step * n as f64, here))
            .collect();
        found.sort_by(|a, b| a.1.total_cmp(&b.1));
        found.into_iter().map(|(phase, _)| phase).collect()
    }
}

/// A load against a rail, in the units of the module `conduction` (currents as R·i/E), with the
/// voltage inside the capacitor as the level: y = (u + Vd)/E.
struct March<'a> {
    rail: &'a Rail,
    standing: f64,
    peak: f64,
    draw: Draw,
    /// Signal frequency / mains frequency.
    pace: f64,
    /// Signal periods after which everything repeats.
    periods: u32,
    /// Longest span searched for switching at once, radians of the mains.
    longest: f64,
}

/// What is carried from piece to piece.
#[derive(Clone, Copy)]
struct State {
    level: f64,
    /// Derivative of the level by the level at the start of the pattern.
    slope: f64,
    /// Whether the rectifier conducts.
    on: bool,
}

/// A stretch between two events: rectifier on or off, load half wave on or off, within one
/// half-cycle of the mains.
struct Piece<'a> {
    march: &'a March<'a>,
    on: bool,
    /// Mains angle at its start, within the half-cycle.
    angle: f64,
    /// Signal phase at its start, within the half wave, and its cosine.
    phase: f64,
    phase_cos: f64,
    /// Whether the signal is in its negative half.
    negative: bool,
    /// Peak of the half wave if this one loads the rail, else 0.
    wave: f64,
    /// Level at the start, and what of it fades while conducting.
    level: f64,
    fading: f64,
}

/// A moment within a piece.
struct Moment {
    level: f64,
    /// d = sin θ - y + (r/R)·l: the charging current while the rectifier conducts, and how far the
    /// source is above the rail while it does not; and its slope.
    drive: f64,
    slope: f64,
    /// Rail terminal in the units of a level.
    terminal: f64,
}

impl<'a> March<'a> {
    fn new(rail: &'a Rail, load: LowFrequencyLoad) -> Option<Self> {
        let unit = rail.resistance / rail.crest;
        let (standing, peak) = (load.standing.0 * unit, load.peak.0 * unit);
        let half_cycles = rail.omega / (PI * load.frequency.0);
        let sound = standing >= 0.0
            && peak >= 0.0
            && (standing + peak).is_finite()
            && half_cycles > 0.0
            && half_cycles <= MOST_HALF_CYCLES;
        let (pattern, periods) = sound.then(|| next_ratio(half_cycles))?;
        let pace = 2.0 * f64::from(periods) / pattern;
        // The drive bends by -sin θ from the source and by up to l1·ν/x from the load. While the
        // source rules, the rectifier switches on once and off once between break points; a
        // steep load can make it stutter, which only short spans are sure to see.
        let steep = peak * pace / rail.x > STEEP;
        Some(Self {
            rail,
            standing,
            peak,
            draw: load.draw,
            pace,
            periods,
            longest: if steep {
                SHORT_SPAN / pace.max(1.0)
            } else {
                PI
            },
        })
    }

    /// How many phases of the signal to search, and the mains angle between them. One pattern of q
    /// periods already meets q phases, evenly spread.
    fn phases(&self) -> (usize, f64) {
        let wanted = PHASES.max(PHASES_PER_PACE * self.pace) / f64::from(self.periods);
        let phases = (wanted.ceil() as usize).clamp(3, MOST_PHASES);
        (phases, PI / f64::from(self.periods) / phases as f64)
    }

    /// Least headroom in volts at one phase, infinite where the rail collapses.
    fn spare(&self, phase: f64, guess: f64, needed: &impl Fn(f64) -> Volt) -> f64 {
        let phase = phase.rem_euclid(PI);
        let level = self.settle(phase, guess, ROUGH);
        let found = level.and_then(|level| self.least(phase, level, needed));
        found.map_or(f64::INFINITY, |h| h.least.0)
    }

    /// The level at the signal's rise through zero at `phase` of the mains, in the periodic steady
    /// state.
    ///
    /// The map from one pattern to the next is a contraction whose derivative is the product of
    /// what each conduction lets fade, so Newton needs one march a step, and after a step that
    /// changed the level by δ the error is of the order δ²: that much is `tolerance`. Should a Newton step fall
    /// so low that the rail collapses, plain repetition from the unloaded level follows, which
    /// approaches from above.
    fn settle(&self, phase: f64, guess: f64, tolerance: f64) -> Option<f64> {
        let mut level = guess;
        let mut newton = true;
        for _ in 0..MAX_MARCHES {
            let before = level;
            let Some((end, slope)) = self.pattern(phase, level, |_, _| {}) else {
                if !newton {
                    return None;
                }
                (newton, level) = (false, 1.0);
                continue;
            };
            let change = end - level;
            level = if newton && slope < 1.0 {
                level + change / (1.0 - slope)
            } else {
                end
            };
            if (level - before) * (level - before) < tolerance {
                return Some(level);
            }
        }
        Some(level)
    }

    /// Least headroom in volts at one phase and the settled level, from marches that look for both at
    /// once: the headroom is that of a level up to a thousandth of the crest away.
    fn roughly_least(
        &self,
        phase: f64,
        guess: f64,
        needed: &impl Fn(f64) -> Volt,
    ) -> Option<(f64, f64)> {
        let mut level = guess;
        for _ in 0..ROUGH_MARCHES {
            let Some((headroom, end, slope)) = self.looked_through(phase, level, needed) else {
                break;
            };
            let change = (end - level) / (1.0 - slope).max(1e-3);
            level += change;
            if change * change < ROUGH {
                return Some((headroom?.least.0, level));
            }
        }
        let level = self.settle(phase, 1.0, ROUGH)?;
        Some((self.least(phase, level, needed)?.least.0, level))
    }

    /// Least headroom over one pattern that starts at `level`.
    fn least(&self, phase: f64, level: f64, needed: &impl Fn(f64) -> Volt) -> Option<Headroom> {
        self.looked_through(phase, level, needed)?.0
    }

    /// Least headroom over one pattern that starts at `level`, with the level at its end and the
    /// derivative of that by the level at its start.
    ///
    /// Each piece that may hold less than was found so far is sampled; where the
    /// samples promise about the least so far or less, parabolas find the bottom next to them.
    fn looked_through(
        &self,
        phase: f64,
        level: f64,
        needed: &impl Fn(f64) -> Volt,
    ) -> Option<(Option<Headroom>, f64, f64)> {
        let crest = self.rail.crest;
        let mut least: Option<Headroom> = None;
        let (end, slope) = self.pattern(phase, level, |piece, length| {
            let so_far = least.map_or(f64::INFINITY, |l| l.least.0);
            if piece.least_promised(length, needed) > so_far {
                return;
            }
            let headroom = |after: f64| {
                let rail = Volt(self.rail.volts(piece.at(after).terminal));
                let signal_rad = piece.signal_phase(after);
                Headroom {
                    least: rail - needed(signal_rad),
                    rail,
                    signal_rad,
                    mains_rad: phase,
                }
            };
            let spare = |after| headroom(after).least.0;
            let spacing = SAMPLING / self.pace.max(1.0);
            // The rail may turn soon after the rectifier has: samples crowd there, as n² does.
            let crowding = if piece.on { 2 } else { 1 };
            let parts = (crowding * (length / spacing).ceil() as usize).clamp(2, MOST_SAMPLES - 1);
            let mut samples = [(0.0, f64::INFINITY); MOST_SAMPLES];
            let mut lowest = 0;
            for n in 0..=parts {
                let part = n as f64 / parts as f64;
                let after = length * if piece.on { part * part } else { part };
                samples[n] = (after, spare(after));
                if samples[n].1 < samples[lowest].1 {
                    lowest = n;
                }
            }
            let middle = lowest.clamp(1, parts - 1);
            let points = [samples[middle - 1], samples[middle], samples[middle + 1]];
            let promise = vertex(points)
                .map_or(f64::INFINITY, |v| v.1)
                .min(samples[lowest].1);
            if promise < so_far + SLACK * crest {
                let found = headroom(bottom(spare, points, GAIN * crest).0);
                if found.least.0 < so_far {
                    least = Some(found);
                }
            }
        })?;
        Some((least, end, slope))
    }

    /// One whole pattern from the signal's rise through zero at `phase` of the mains: the level at
    /// its end and the derivative of that by the level at its start. Each piece is shown to `visit`
    /// with its length. `None` where the rail collapses.
    fn pattern(
        &self,
        phase: f64,
        level: f64,
        mut visit: impl FnMut(&Piece, f64),
    ) -> Option<(f64, f64)> {
        let mut state = State {
            level,
            slope: 1.0,
            on: false,
        };
        let (mut angle, mut signal, mut half_waves) = (phase, 0.0, 0);
        state.on = self.piece(state, angle, signal, false).at(0.0).drive > 0.0;
        while half_waves < 2 * self.periods {
            let negative = half_waves % 2 == 1;
            let (to_crossing, to_zero) = (PI - angle, (PI - signal) / self.pace);
            let span = to_crossing.min(to_zero).min(self.longest);
            state = self.span(state, (angle, signal, negative), span, &mut visit)?;
            (angle, signal) = (angle + span, signal + self.pace * span);
            if to_zero <= span {
                (signal, half_waves) = (0.0, half_waves + 1);
            }
            if to_crossing <= span {
                angle = 0.0;
                if state.on {
                    return None; // conducting at a zero crossing: the rail is below zero
                }
            }
        }
        Some((state.level, state.slope))
    }

    /// From one break point of source or load to the next, through every switching between.
    fn span(
        &self,
        mut state: State,
        (angle, signal, negative): (f64, f64, bool),
        span: f64,
        visit: &mut impl FnMut(&Piece, f64),
    ) -> Option<State> {
        let mut done = 0.0;
        for left in (0..MOST_PIECES).rev() {
            let piece = self.piece(state, angle + done, signal + self.pace * done, negative);
            let event = if left > 0 {
                piece.event(span - done)
            } else {
                None
            };
            let length = event.unwrap_or(span - done);
            visit(&piece, length);
            let end = piece.at(length);
            if end.terminal <= self.rail.floor {
                return None;
            }
            state.level = end.level;
            if state.on {
                state.slope *= exp(-length / self.rail.x);
            }
            if event.is_none() {
                break;
            }
            state.on = !state.on;
            done += length;
        }
        Some(state)
    }

    /// The piece that begins in `state` at a mains angle and a signal phase.
    ///
    /// Conducting, with ρs = 1 - r/R and l = l0 + l1·sin a, a = the signal phase running ν times as
    /// fast as the mains, dy/dθ = (sin θ - ρs·l - y)/x has the solution
    /// y = (sin θ - x·cos θ)/(1 + x²) - ρs·l0 - ρs·l1·(sin a - xν·cos a)/(1 + x²ν²) + fading part.
    fn piece(&self, state: State, angle: f64, phase: f64, negative: bool) -> Piece<'_> {
        let idle = negative && self.draw == Draw::OneHalf;
        let wave = if idle { 0.0 } else { self.peak };
        let mut piece = Piece {
            march: self,
            on: state.on,
            angle,
            phase,
            phase_cos: cos(phase),
            negative,
            wave,
            level: state.level,
            fading: 0.0,
        };
        if state.on {
            piece.fading = state.level - piece.at(0.0).level;
        }
        piece
    }
}

impl Piece<'_> {
    /// The moment `after` radians of the mains from its start.
    fn at(&self, after: f64) -> Moment {
        let Rail {
            x, esr_share: esr, ..
        } = *self.march.rail;
        let (standing, pace) = (self.march.standing, self.march.pace);
        let (sin, cos) = sin_cos(self.angle + after);
        let (sin_a, cos_a) = if self.wave > 0.0 {
            sin_cos(self.phase + pace * after)
        } else {
            (0.0, self.phase_cos) // nothing below depends on it
        };
        let load = standing + self.wave * sin_a;
        let load_slope = self.wave * pace * cos_a;
        if self.on {
            let lag = x * pace;
            let wave = self.wave * (sin_a - lag * cos_a) / (1.0 + lag * lag);
            let level = (sin - x * cos) / (1.0 + x * x) - (1.0 - esr) * (standing + wave)
                + self.fading * exp(-after / x);
            let drive = sin - level + esr * load;
            let slope = cos - (drive - load) / x + esr * load_slope;
            Moment {
                level,
                drive,
                slope,
                terminal: sin - (1.0 - esr) * drive,
            }
        } else {
            let drawn = standing * after + self.wave / pace * (self.phase_cos - cos_a);
            let level = self.level - drawn / x;
            let drive = sin - level + esr * load;
            let slope = cos + load / x + esr * load_slope;
            Moment {
                level,
                drive,
                slope,
                terminal: level - esr * load,
            }
        }
    }

    /// What the headroom of this piece cannot fall below, in volts: the level falls by no more than the
    /// whole load takes, the ESR loses no more than the whole load in it, and what is needed is greatest
    /// at an end or at the crest of the half wave.
    fn least_promised(&self, length: f64, needed: &impl Fn(f64) -> Volt) -> f64 {
        let rail = self.march.rail;
        let load = self.march.standing + self.wave;
        let lowest = self.level - load * (length / rail.x + rail.esr_share);
        let (from, to) = (self.signal_phase(0.0), self.signal_phase(length));
        let crest = if self.negative { 1.5 * PI } else { FRAC_PI_2 };
        let inside = if from < crest && crest < to {
            crest
        } else {
            to
        };
        let most = needed(from).max(needed(to)).max(needed(inside));
        rail.volts(lowest) - most.0
    }

    /// Phase of the signal, 0 to 2π, `after` radians of the mains from the start.
    fn signal_phase(&self, after: f64) -> f64 {
        let phase = self.phase + self.march.pace * after;
        if self.negative { phase + PI } else { phase }
    }

    /// When the rectifier switches within `length`: where the drive changes to the sign that ends
    /// this piece.
    ///
    /// The crest of the source is looked at first, as the drive is below zero again at the end of a
    /// half-cycle. If still no end has the other sign, but the drive first runs towards zero and
    /// then away from it, the turning point between is looked at too.
    fn event(&self, length: f64) -> Option<f64> {
        let side = if self.on { 1.0 } else { -1.0 };
        let drive = |after: f64| {
            let now = self.at(after);
            (side * now.drive, side * now.slope)
        };
        let to_crest = FRAC_PI_2 - self.angle;
        let mut beyond = length;
        if !self.on && to_crest > 0.0 && to_crest < length && drive(to_crest).0 < 0.0 {
            beyond = to_crest;
        } else {
            let (end, end_slope) = drive(length);
            if end >= 0.0 {
                if end_slope <= 0.0 || drive(0.0).1 >= 0.0 {
                    return None;
                }
                beyond = root(|after| drive(after).1, 0.0, length, 1e-12)?;
                if drive(beyond).0 >= 0.0 {
                    return None;
                }
            }
        }
        // Where the source alone would meet the level of the start.
        let meeting = asin(self.level.clamp(0.0, 1.0));
        let guess = if self.on { PI - meeting } else { meeting } - self.angle;
        let start = if guess > 0.0 && guess < beyond {
            guess
        } else {
            0.5 * beyond
        };
        Some(bracketed_root(drive, 0.0, beyond, start))
    }
}

/// A position and the height there.
type Point = (f64, f64);

/// Lowest point of the parabola through three points, if it lies between the outer two.
fn vertex([a, b, c]: [Point; 3]) -> Option<Point> {
    let (first, second) = ((b.1 - a.1) / (b.0 - a.0), (c.1 - b.1) / (c.0 - b.0));
    let bend = (second - first) / (c.0 - a.0);
    let at = 0.5 * (a.0 + b.0 - first / bend);
    let height = a.1 + (at - a.0) * (first + bend * (at - b.0));
    (bend > 0.0 && at > a.0 && at < c.0).then_some((at, height))
}

/// The lowest point of `f` that parabolas find from three points in ascending order, each new one
/// replacing the point farther from it of the outer two, until one gains less than `gain`. Never
/// higher than the lowest of the three.
fn bottom(f: impl Fn(f64) -> f64, mut points: [Point; 3], gain: f64) -> Point {
    let lower = |a: Point, b: Point| if b.1 < a.1 { b } else { a };
    let mut lowest = lower(lower(points[0], points[1]), points[2]);
    for _ in 0..PARABOLAS {
        let Some((at, _)) = vertex(points) else { break };
        let new = (at, f(at));
        let gained = lowest.1 - new.1;
        lowest = lower(lowest, new);
        let [a, b, c] = points;
        points = match (at < b.0, new.1 < b.1) {
            (true, true) => [a, new, b],
            (true, false) => [new, b, c],
            (false, true) => [b, new, c],
            (false, false) => [a, b, new],
        };
        if gained.abs() < gain {
            break;
        }
    }
    lowest
}

/// The next p/q, q up to [`MOST_PERIODS`], not below `ratio`, the smallest q first among equals;
/// as (p, q), p a whole number.
fn next_ratio(ratio: f64) -> (f64, u32) {
    let mut best = (f64::INFINITY, 1);
    for q in 1..=MOST_PERIODS {
        let p = (ratio * f64::from(q) * (1.0 - 1e-12)).ceil().max(1.0);
        if p / f64::from(q) < best.0 / f64::from(best.1) * (1.0 - 1e-12) {
            best = (p, q);
        }
    }
    best
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::physics::math::{TAU, sin};
    use crate::physics::supply::rail::RailParts;
    use crate::physics::supply::rail::tests::{any_parts, parts, twin};
    use crate::physics::unit::Ohm;
    use proptest::prelude::*;

    fn load(peak: f64, frequency: f64) -> LowFrequencyLoad {
        LowFrequencyLoad {
            standing: Amp(0.1),
            peak: Amp(peak),
            frequency: Hertz(frequency),
            draw: Draw::OneHalf,
        }
    }

    fn needed(volts: f64) -> impl Fn(f64) -> Volt {
        move |phase| Volt(volts * sin(phase) + 2.0)
    }

    /// The same by small steps: `settle` signal periods to settle, then `watch` to look at.
    fn by_steps(
        parts: RailParts,
        load: LowFrequencyLoad,
        phase: f64,
        needed: &impl Fn(f64) -> Volt,
        (settle, watch): (usize, usize),
    ) -> f64 {
        let twin = twin(parts);
        let begin = phase / twin.omega;
        let turn = |time: f64| TAU * load.frequency.0 * (time - begin);
        let drawn = |time: f64| {
            let wave = sin(turn(time));
            let wave = if load.draw == Draw::OneHalf {
                wave.max(0.0)
            } else {
                wave.abs()
            };
            load.standing.0 + load.peak.0 * wave
        };
        let count = (5000.0 * (parts.mains / load.frequency).max(1.0)) as usize;
        let h = 1.0 / load.frequency.0 / count as f64;
        // Any start will do, but the mean of the load is near where it settles.
        let mean = load.standing + load.draw.mean(load.peak);
        let cycle = Rail::new(parts).unwrap().loaded(mean);
        let start = (
            begin,
            cycle.map_or(0.5 * parts.no_load_crest.0, |c| c.mean().0),
        );
        let mut least = f64::INFINITY;
        twin.march(
            &drawn,
            start,
            h,
            count * (settle + watch),
            |time, rail, _| {
                let spare = rail - needed(turn(time).rem_euclid(TAU)).0;
                if time > begin + settle as f64 / load.frequency.0 {
                    least = least.min(spare);
                }
            },
        );
        least
    }

    #[test]
    fn ratios_are_the_next_above() {
        assert_eq!(next_ratio(5.0), (5.0, 1)); // 20 Hz at 50 Hz mains
        assert_eq!(next_ratio(100.0 / 16.0), (25.0, 4)); // 16 Hz
        assert_eq!(next_ratio(100.0 / 30.0), (10.0, 3)); // 30 Hz
        assert_eq!(next_ratio(0.2), (1.0, 5));
        assert_eq!(next_ratio(100.0 / 31.5), (16.0, 5)); // 3.1746 goes to 3.2
    }

    #[test]
    fn no_load_leaves_the_unloaded_rail() {
        let rail = Rail::new(parts()).unwrap();
        let silent = LowFrequencyLoad {
            standing: Amp(0.0),
            ..load(0.0, 20.0)
        };
        let found = rail.least_headroom(silent, |_| Volt(1.0)).unwrap();
        assert!((found.least.0 - 50.567).abs() < 1e-3, "{found:?}"); // 52.467 - 0.9 - 1
    }

    #[test]
    fn a_steady_load_gives_the_trough_of_the_steady_state() {
        let rail = Rail::new(parts()).unwrap();
        let steady = LowFrequencyLoad {
            standing: Amp(2.0),
            ..load(0.0, 20.0)
        };
        let found = rail.least_headroom(steady, |_| Volt(0.0)).unwrap();
        let trough = rail.loaded(Amp(2.0)).unwrap().trough();
        assert!(
            (found.least - trough).abs() < Volt(1e-6),
            "{found:?} {trough:?}"
        );
    }

    #[test]
    fn nonsense_and_collapse_are_refused() {
        let rail = Rail::new(parts()).unwrap();
        let none = |l: LowFrequencyLoad| rail.least_headroom(l, |_| Volt(0.0)).is_none();
        for bad in [0.0, -1.0, f64::NAN, 1e-9] {
            assert!(none(load(5.0, bad)), "{bad} Hz");
        }
        for bad in [-1.0, f64::NAN, f64::INFINITY, 1e9] {
            assert!(none(load(bad, 20.0)), "{bad} A");
            assert!(none(LowFrequencyLoad {
                standing: Amp(bad),
                ..load(5.0, 20.0)
            }));
        }
    }

    #[test]
    fn the_worst_phase_is_the_worst_of_many() {
        for (esr, frequency) in [
            (0.0, 20.0),
            (0.03, 20.0),
            (0.03, 16.0),
            (0.03, 30.0),
            (0.03, 50.0),
            (0.1, 10.0),
        ] {
            let rail = Rail::new(RailParts {
                esr: Ohm(esr),
                ..parts()
            })
            .unwrap();
            let load = load(5.0, frequency);
            let found = rail.least_headroom(load, needed(40.0)).unwrap();
            let many = (0..1000)
                .map(|n| rail.least_headroom_at(load, PI * f64::from(n) / 1000.0, needed(40.0)))
                .map(|h| h.unwrap().least.0)
                .fold(f64::INFINITY, f64::min);
            assert!(
                (found.least.0 - many).abs() < 2e-4,
                "{frequency} Hz: {found:?} {many}"
            );
        }
    }

    /// A frequency that does not fit the mains drifts through every phase. The fitted one must not
    /// promise more than the drifting one keeps.
    #[test]
    fn a_drifting_signal_keeps_what_a_fitted_one_promises() {
        for frequency in [17.3, 23.0, 31.5, 37.77] {
            let rail = Rail::new(parts()).unwrap();
            let load = load(5.0, frequency);
            let found = rail.least_headroom(load, needed(40.0)).unwrap().least.0;
            let drifting = by_steps(parts(), load, 0.3, &needed(40.0), (5, 100));
            assert!(
                found < drifting + 0.005,
                "{frequency} Hz: {found} {drifting}"
            );
            assert!(
                found > drifting - 0.25,
                "{frequency} Hz: {found} {drifting}"
            );
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(100))]

        /// At one phase the march equals small steps, for any supply, load and drawing pattern.
        #[test]
        fn march_equals_small_steps(
            parts in any_parts(), strength in -6.0f64..-1.0, phase in 0.0f64..3.1,
            frequency in prop::sample::select(vec![0.1, 0.2, 0.4, 0.5, 1.0, 2.0, 3.0]),
            both in any::<bool>(), swing in 0.0f64..0.8,
        ) {
            let rail = Rail::new(parts).unwrap();
            let amps = exp(strength) * parts.no_load_crest.0 / rail.resistance;
            let load = LowFrequencyLoad {
                standing: Amp(0.02 * amps),
                peak: Amp(amps),
                frequency: Hertz(frequency * parts.mains.0),
                draw: if both { Draw::BothHalves } else { Draw::OneHalf },
            };
            let needed = needed(swing * parts.no_load_crest.0);
            let settle = 3 + ((10.0 + 20.0 * rail.x) * frequency) as usize;
            prop_assume!(settle < 500);
            if let Some(found) = rail.least_headroom_at(load, phase, &needed) {
                prop_assume!(found.rail.0 > 0.1 * parts.no_load_crest.0);
                let steps = by_steps(parts, load, phase, &needed, (settle, 4));
                // Steps miss the corner at turn-on by what the load takes off in one of them.
                let corner = amps / parts.reservoir.0 / parts.mains.0 / 5000.0;
                prop_assert!(
                    (found.least.0 - steps).abs() < 1e-3 * parts.no_load_crest.0 + corner,
                    "{found:?} {steps}",
                );
            }
        }
    }
}
