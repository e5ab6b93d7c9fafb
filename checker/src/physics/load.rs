//! Complex impedance of a load over the band, and the search for the frequency that is worst.
//! Must not know rails, devices or what the objective of a search means.
//!
//! An angle is positive where the voltage leads the current (an inductive, lagging load).

use crate::physics::math;
use crate::physics::unit::{Celsius, Henry, Hertz, Ohm};

/// Relative difference below which two results of a search tie.
const TIE: f64 = 1e-9;
/// Grid points per octave of a search; narrower features bring grid points of their own.
const POINTS_PER_OCTAVE: f64 = 5.0;
/// Width, in ln f, to which an extremum is narrowed; its value is then exact to the square of this.
const NARROWED: f64 = 1e-8;
/// A point of the grid whose rough value is below this part of the roughly greatest is not the worst.
const SCREENED: f64 = 0.8;
/// Temperature coefficient of resistance of copper at 20 °C, per kelvin (IEC 60028 rounds to 0.003 93).
const COPPER: f64 = 0.0039;

/// A complex impedance, in ohms.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Impedance {
    /// Resistance.
    pub resistance: Ohm,
    /// Reactance, positive where inductive.
    pub reactance: Ohm,
}

impl Impedance {
    /// A pure resistance.
    #[must_use]
    pub fn resistive(resistance: Ohm) -> Self {
        Self {
            resistance,
            reactance: Ohm::ZERO,
        }
    }

    /// Z = |Z|·(cos φ + j sin φ).
    #[must_use]
    pub fn polar(modulus: Ohm, angle_rad: f64) -> Self {
        let (sin, cos) = math::sin_cos(angle_rad);
        Self {
            resistance: modulus * cos,
            reactance: modulus * sin,
        }
    }

    /// |Z| = √(R² + X²).
    #[must_use]
    pub fn modulus(self) -> Ohm {
        // Not `hypot`, which is the platform's own and may differ in the last digit.
        let (r, x) = (self.resistance.0, self.reactance.0);
        Ohm((r * r + x * x).sqrt())
    }

    /// φ = atan2(X, R), radians.
    #[must_use]
    pub fn angle_rad(self) -> f64 {
        math::atan2(self.reactance.0, self.resistance.0)
    }

    /// cos φ and |sin φ|.
    #[must_use]
    pub fn cos_and_abs_sin(self) -> (f64, f64) {
        let modulus = self.modulus();
        (self.resistance / modulus, self.reactance.abs() / modulus)
    }

    /// What each half of a bridge sees: half the impedance at the same angle.
    #[must_use]
    pub fn halved(self) -> Self {
        Self {
            resistance: self.resistance * 0.5,
            reactance: self.reactance * 0.5,
        }
    }

    /// Equivalent peak dissipation resistance: the resistor that would put the same peak
    /// instantaneous watts into one polarity of an ideal class-B stage at full swing.
    ///
    /// EPDR = |Z| / (8·sin³(30° + |φ|/3)), for |φ| up to 90°. Method: E. Benjamin, JAES 42(9),
    /// 1994 (from memory); closed form from the stationary point of (1 - sin θ)·sin(θ - φ).
    #[must_use]
    pub fn peak_dissipation_resistance(self) -> Ohm {
        let s = math::sin(math::PI / 6.0 + self.angle_rad().abs() / 3.0);
        self.modulus() / (8.0 * s * s * s)
    }

    /// Whether this can stand in a passive circuit: finite, not zero, and no negative resistance.
    #[must_use]
    pub fn is_passive(self) -> bool {
        self.resistance.is_finite()
            && self.reactance.is_finite()
            && self.resistance >= Ohm::ZERO
            && self.modulus() > Ohm::ZERO
            && self.modulus().is_finite()
    }

    /// 1/Z as conductance and susceptance, in siemens.
    fn admittance(self) -> (f64, f64) {
        let square = self.resistance.0 * self.resistance.0 + self.reactance.0 * self.reactance.0;
        (self.resistance.0 / square, -self.reactance.0 / square)
    }
}

/// A range of frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Band {
    bottom: Hertz,
    top: Hertz,
}

impl Band {
    /// `None` unless 0 < bottom <= top, both finite.
    #[must_use]
    pub fn new(bottom: Hertz, top: Hertz) -> Option<Self> {
        (bottom > Hertz::ZERO && bottom <= top && top.is_finite()).then_some(Self { bottom, top })
    }

    /// The lowest frequency.
    #[must_use]
    pub fn bottom(self) -> Hertz {
        self.bottom
    }

    /// The highest frequency.
    #[must_use]
    pub fn top(self) -> Hertz {
        self.top
    }

    /// What two bands have in common.
    #[must_use]
    pub fn common(self, other: Self) -> Option<Self> {
        Self::new(self.bottom.max(other.bottom), self.top.min(other.top))
    }
}

/// One mechanical resonance as the voice coil shows it: Res/(1 + jQms(f/fs - fs/f)),
/// Res = Re·Qms/Qes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Resonance {
    /// fs.
    pub frequency: Hertz,
    /// Qms, the mechanical quality factor.
    pub mechanical_q: f64,
    /// Qes, the electrical quality factor, at the resistance of the coil it is given with.
    pub electrical_q: f64,
}

/// A moving-coil drive unit: Z(f) = Re + inductance + Σ resonances.
///
/// The inductance is jωLe; with a loss exponent n < 1 it is K·(jω)ⁿ (W. M. Leach, JAES 50(6),
/// 2002), K chosen so that its modulus at 1 kHz is the 2π·1000·Le of the stated Le, because 1 kHz
/// is where data sheets measure it: K = Le·(2π·1000)^(1-n).
#[derive(Clone, Debug, PartialEq)]
pub struct VoiceCoil {
    /// Re, at 20 °C.
    pub resistance: Ohm,
    /// Le, at 1 kHz.
    pub inductance: Henry,
    /// n: 1 is a lossless inductance, 0.5 a semi-inductance.
    pub loss_exponent: f64,
    /// Box and drive-unit resonances, any number.
    pub resonances: Vec<Resonance>,
}

impl VoiceCoil {
    fn is_valid(&self) -> bool {
        let positive = |x: f64| x > 0.0 && x.is_finite();
        positive(self.resistance.0)
            && self.inductance.is_finite()
            && self.inductance >= Henry::ZERO
            && (0.0..=1.0).contains(&self.loss_exponent)
            && self.resonances.iter().all(|r| {
                positive(r.frequency.0) && positive(r.mechanical_q) && positive(r.electrical_q)
            })
    }

    fn impedance(&self, f: Hertz) -> Impedance {
        let (mut r, mut x) = (self.resistance.0, 0.0);
        let reference = math::TAU * 1000.0;
        if self.loss_exponent < 1.0 {
            let modulus =
                reference * self.inductance.0 * math::pow(f.0 / 1000.0, self.loss_exponent);
            let (sin, cos) = math::sin_cos(math::FRAC_PI_2 * self.loss_exponent);
            r += modulus * cos;
            x += modulus * sin;
        } else {
            x += math::TAU * f.0 * self.inductance.0;
        }
        for resonance in &self.resonances {
            let peak = self.resistance.0 * resonance.mechanical_q / resonance.electrical_q;
            let tuning =
                resonance.mechanical_q * (f / resonance.frequency - resonance.frequency / f);
            let square = 1.0 + tuning * tuning;
            r += peak / square;
            x -= peak * tuning / square;
        }
        Impedance {
            resistance: Ohm(r),
            reactance: Ohm(x),
        }
    }

    /// The same unit with its coil at another temperature. The motional resistance Res = Bl²/Rms
    /// does not know the coil's temperature, so Qes moves with Re and Res stays.
    fn with_coil_at(&self, ratio: f64) -> Self {
        Self {
            resistance: self.resistance * ratio,
            resonances: self
                .resonances
                .iter()
                .map(|r| Resonance {
                    electrical_q: r.electrical_q * ratio,
                    ..*r
                })
                .collect(),
            ..self.clone()
        }
    }

    /// Frequencies that an even grid could step over: each resonance and its flanks, where the
    /// tuning term is 0 and ±(1 + Qms/Qes)^(k/4).
    fn landmarks(&self, out: &mut Vec<f64>) {
        for resonance in &self.resonances {
            out.push(resonance.frequency.0);
            let ratio = 1.0 + resonance.mechanical_q / resonance.electrical_q;
            for quarter in 0..=6 {
                let tuning = math::pow(ratio, f64::from(quarter) / 4.0);
                let half = tuning / (2.0 * resonance.mechanical_q);
                let up = half + (half * half + 1.0).sqrt();
                out.push(resonance.frequency.0 * up);
                out.push(resonance.frequency.0 / up);
            }
        }
    }
}

/// One row of an impedance table.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TableRow {
    /// Frequency.
    pub frequency: Hertz,
    /// |Z|.
    pub modulus: Ohm,
    /// Phase, radians, positive where inductive.
    pub angle_rad: f64,
}

/// Why rows are not an impedance table; each names the row, counted from zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TableError {
    /// Fewer than two rows.
    TooFew,
    /// A frequency that is not above the one before, not positive or not finite.
    Frequency(usize),
    /// A modulus that is not positive and finite.
    Modulus(usize),
    /// A phase beyond ±90°: not a passive load.
    Angle(usize),
}

/// A measured impedance: log modulus and phase straight against log frequency, never extrapolated.
#[derive(Clone, Debug, PartialEq)]
pub struct Table {
    /// ln f, ln |Z|, phase in radians.
    rows: Vec<(f64, f64, f64)>,
    band: Band,
}

impl Table {
    /// Checks and keeps the rows.
    ///
    /// # Errors
    /// The first row that cannot be part of a passive load's table.
    pub fn new(rows: &[TableRow]) -> Result<Self, TableError> {
        let (Some(first), Some(last)) = (rows.first(), rows.last()) else {
            return Err(TableError::TooFew);
        };
        let mut before = Hertz::ZERO;
        for (index, row) in rows.iter().enumerate() {
            if !(row.frequency > before && row.frequency.is_finite()) {
                return Err(TableError::Frequency(index));
            }
            if !(row.modulus > Ohm::ZERO && row.modulus.is_finite()) {
                return Err(TableError::Modulus(index));
            }
            // Degrees in a file turn to radians with a rounding error.
            if !(0.0..=math::FRAC_PI_2 * (1.0 + 1e-12)).contains(&row.angle_rad.abs()) {
                return Err(TableError::Angle(index));
            }
            before = row.frequency;
        }
        if rows.len() < 2 {
            return Err(TableError::TooFew);
        }
        let band = Band::new(first.frequency, last.frequency).ok_or(TableError::Frequency(0))?;
        let limit = |angle: f64| angle.clamp(-math::FRAC_PI_2, math::FRAC_PI_2);
        let rows = rows
            .iter()
            .map(|r| {
                (
                    math::ln(r.frequency.0),
                    math::ln(r.modulus.0),
                    limit(r.angle_rad),
                )
            })
            .collect();
        Ok(Self { rows, band })
    }

    /// The frequencies it covers.
    #[must_use]
    pub fn band(&self) -> Band {
        self.band
    }

    /// Rows per octave within half an octave either side of `f`; near an end of the table the
    /// window is the part of it that the table covers. Zero outside the table.
    #[must_use]
    pub fn rows_per_octave(&self, f: Hertz) -> f64 {
        let half = 0.5 * math::LN_2;
        let (bottom, top) = (math::ln(self.band.bottom.0), math::ln(self.band.top.0));
        let middle = math::ln(f.0);
        let (lo, hi) = ((middle - half).max(bottom), (middle + half).min(top));
        if hi <= lo || !middle.is_finite() {
            return 0.0;
        }
        let count = self
            .rows
            .iter()
            .filter(|r| r.0 >= lo - 1e-12 && r.0 <= hi + 1e-12)
            .count();
        count as f64 * math::LN_2 / (hi - lo)
    }

    fn impedance(&self, f: Hertz) -> Option<Impedance> {
        // A grid point on the last row may come back from exp(ln f) a rounding error beyond it.
        let (bottom, top) = (self.rows.first()?.0, self.rows.last()?.0);
        let x = math::ln(f.0);
        if !(x >= bottom - 1e-12 && x <= top + 1e-12) {
            return None;
        }
        let right = self
            .rows
            .partition_point(|r| r.0 < x)
            .clamp(1, self.rows.len() - 1);
        let (x0, m0, a0) = *self.rows.get(right - 1)?;
        let (x1, m1, a1) = *self.rows.get(right)?;
        let w = ((x - x0) / (x1 - x0)).clamp(0.0, 1.0);
        Some(Impedance::polar(
            Ohm(math::exp(m0 + w * (m1 - m0))),
            a0 + w * (a1 - a0),
        ))
    }
}

/// Which sign the angle of a flat load takes. The order is the order in which ties are settled.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Side {
    /// The load states its own phase.
    AsGiven,
    /// Inductive.
    Lagging,
    /// Capacitive.
    Leading,
}

/// Which end of its tolerance a resistive load sits at.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Tolerance {
    /// No tolerance.
    AsGiven,
    /// Low.
    Low,
    /// High.
    High,
}

/// One of the few impedances that a load's description stands for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Variant {
    /// Sign of the angle.
    pub side: Side,
    /// End of the tolerance.
    pub tolerance: Tolerance,
}

#[derive(Clone, Debug, PartialEq)]
enum Member {
    Resistive {
        resistance: Ohm,
        tolerance: f64,
    },
    Nominal {
        minimum: Ohm,
        angle_rad: f64,
        dc: Option<Ohm>,
    },
    VoiceCoil(VoiceCoil),
    Table {
        table: Table,
        dc: Option<Ohm>,
    },
}

impl Member {
    fn impedance(&self, variant: Variant, f: Hertz) -> Option<Impedance> {
        match self {
            Self::Resistive {
                resistance,
                tolerance,
            } => Some(Impedance::resistive(match variant.tolerance {
                Tolerance::AsGiven => *resistance,
                Tolerance::Low => *resistance * (1.0 - tolerance),
                Tolerance::High => *resistance * (1.0 + tolerance),
            })),
            Self::Nominal {
                minimum, angle_rad, ..
            } => Some(Impedance::polar(
                *minimum,
                match variant.side {
                    Side::AsGiven => 0.0,
                    Side::Lagging => *angle_rad,
                    Side::Leading => -angle_rad,
                },
            )),
            Self::VoiceCoil(coil) => Some(coil.impedance(f)),
            Self::Table { table, .. } => table.impedance(f),
        }
    }

    fn dc(&self) -> Option<Ohm> {
        match self {
            Self::Resistive { resistance, .. } => Some(*resistance),
            Self::Nominal { dc, .. } | Self::Table { dc, .. } => *dc,
            Self::VoiceCoil(coil) => Some(coil.resistance),
        }
    }

    fn with_coil_at(&self, ratio: f64) -> Self {
        match self {
            Self::Resistive { .. } => self.clone(),
            Self::Nominal {
                minimum,
                angle_rad,
                dc,
            } => Self::Nominal {
                minimum: *minimum,
                angle_rad: *angle_rad,
                dc: dc.map(|dc| dc * ratio),
            },
            Self::VoiceCoil(coil) => Self::VoiceCoil(coil.with_coil_at(ratio)),
            Self::Table { table, dc } => Self::Table {
                table: table.clone(),
                dc: dc.map(|dc| dc * ratio),
            },
        }
    }

    fn is_flat(&self) -> bool {
        matches!(self, Self::Resistive { .. } | Self::Nominal { .. })
    }
}

/// What one channel drives: one load, or several in parallel.
#[derive(Clone, Debug, PartialEq)]
pub struct Load {
    members: Vec<Member>,
}

/// Where a search found its greatest value.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Worst {
    /// The objective there.
    pub value: f64,
    /// The frequency.
    pub frequency: Hertz,
    /// The impedance.
    pub impedance: Impedance,
    /// The variant of the load.
    pub variant: Variant,
}

/// What a load asks of an amplifier over a band.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Survey {
    /// Least modulus.
    pub minimum: Worst,
    /// Most lagging (or least leading) angle.
    pub most_lagging: Worst,
    /// Most leading (or least lagging) angle.
    pub most_leading: Worst,
    /// Least equivalent peak dissipation resistance.
    pub dissipation: Worst,
}

fn positive(x: Ohm) -> bool {
    x > Ohm::ZERO && x.is_finite()
}

impl Load {
    /// A resistor with a tolerance (a ratio, 0.05 for ±5 %). `None` unless positive and the
    /// tolerance below 1.
    #[must_use]
    pub fn resistive(resistance: Ohm, tolerance: f64) -> Option<Self> {
        (positive(resistance) && (0.0..1.0).contains(&tolerance)).then(|| {
            Self::of(Member::Resistive {
                resistance,
                tolerance,
            })
        })
    }

    /// A rated impedance: its least modulus at an angle of either sign, over the whole band.
    /// `None` unless the modulus is positive and the angle within 0 to 90°.
    #[must_use]
    pub fn nominal(minimum: Ohm, angle_rad: f64, dc: Option<Ohm>) -> Option<Self> {
        (positive(minimum)
            && (0.0..=math::FRAC_PI_2).contains(&angle_rad)
            && dc.is_none_or(positive))
        .then(|| {
            Self::of(Member::Nominal {
                minimum,
                angle_rad,
                dc,
            })
        })
    }

    /// A drive unit from its parameters. `None` unless each is positive (Le may be zero) and the
    /// loss exponent within 0 to 1.
    #[must_use]
    pub fn voice_coil(coil: VoiceCoil) -> Option<Self> {
        coil.is_valid().then(|| Self::of(Member::VoiceCoil(coil)))
    }

    /// A measured impedance. `None` if the d.c. resistance is not positive.
    #[must_use]
    pub fn table(table: Table, dc: Option<Ohm>) -> Option<Self> {
        dc.is_none_or(positive)
            .then(|| Self::of(Member::Table { table, dc }))
    }

    /// All of these at once on one channel. `None` if there is none.
    #[must_use]
    pub fn parallel(loads: &[Load]) -> Option<Self> {
        let members: Vec<_> = loads
            .iter()
            .flat_map(|l| l.members.iter().cloned())
            .collect();
        (!members.is_empty()).then_some(Self { members })
    }

    fn of(member: Member) -> Self {
        Self {
            members: vec![member],
        }
    }

    /// The same load with its voice coils at `temperature` instead of 20 °C:
    /// Re·(1 + 0.0039(T - 20)), the coefficient of copper. Only a voice coil's impedance and a
    /// stated d.c. resistance move; a resistor is not a coil, and a nominal or measured impedance
    /// does not say how much of it is copper. `None` below -200 °C or above 400 °C.
    #[must_use]
    pub fn with_coil_at(&self, temperature: Celsius) -> Option<Self> {
        (-200.0..=400.0).contains(&temperature.0).then(|| {
            let ratio = 1.0 + COPPER * (temperature - Celsius(20.0)).0;
            Self {
                members: self.members.iter().map(|m| m.with_coil_at(ratio)).collect(),
            }
        })
    }

    /// Resistance to direct current, where every parallel member states it.
    #[must_use]
    pub fn dc(&self) -> Option<Ohm> {
        let mut siemens = 0.0;
        for member in &self.members {
            siemens += 1.0 / member.dc()?.0;
        }
        Some(Ohm(1.0 / siemens))
    }

    /// Whether the impedance is the same at every frequency.
    #[must_use]
    pub fn is_flat(&self) -> bool {
        self.members.iter().all(Member::is_flat)
    }

    /// The part of `band` for which the impedance is known; `None` if none of it.
    #[must_use]
    pub fn covered(&self, band: Band) -> Option<Band> {
        self.members
            .iter()
            .try_fold(band, |band, member| match member {
                Member::Table { table, .. } => band.common(table.band),
                _ => Some(band),
            })
    }

    /// The impedances that the description stands for, in the order in which ties are settled.
    ///
    /// In parallel all unstated signs are taken alike and all resistors at one end together: for a
    /// given conductance the extreme of a sum of susceptances of free sign is all plus or all
    /// minus, so a mixture is never worse.
    #[must_use]
    pub fn variants(&self) -> Vec<Variant> {
        let signed = self
            .members
            .iter()
            .any(|m| matches!(m, Member::Nominal { angle_rad, .. } if *angle_rad > 0.0));
        let tolerant = self
            .members
            .iter()
            .any(|m| matches!(m, Member::Resistive { tolerance, .. } if *tolerance > 0.0));
        let sides: &[Side] = if signed {
            &[Side::Lagging, Side::Leading]
        } else {
            &[Side::AsGiven]
        };
        let ends: &[Tolerance] = if tolerant {
            &[Tolerance::Low, Tolerance::High]
        } else {
            &[Tolerance::AsGiven]
        };
        sides
            .iter()
            .flat_map(|&side| {
                ends.iter()
                    .map(move |&tolerance| Variant { side, tolerance })
            })
            .collect()
    }

    /// Z at `f`: `None` where a table does not reach, or f is not positive.
    #[must_use]
    pub fn impedance(&self, variant: Variant, f: Hertz) -> Option<Impedance> {
        if !(f > Hertz::ZERO && f.is_finite()) {
            return None;
        }
        if let [only] = self.members.as_slice() {
            return only.impedance(variant, f).filter(|z| z.is_passive());
        }
        let (mut g, mut b) = (0.0, 0.0);
        for member in &self.members {
            let (conductance, susceptance) = member.impedance(variant, f)?.admittance();
            g += conductance;
            b += susceptance;
        }
        let square = g * g + b * b;
        Some(Impedance {
            resistance: Ohm(g / square),
            reactance: Ohm(-b / square),
        })
        .filter(|z| z.is_passive())
    }

    /// The load on the points that searches over the covered part of `band` start from, for as many
    /// searches as are wanted. `None` if the load covers none of the band.
    #[must_use]
    pub fn sampled(&self, band: Band) -> Option<Sampled> {
        Sampled::on(self, self.grid(band, 0.0)?)
    }

    /// [`Sampled::worst`] for one search.
    #[must_use]
    pub fn worst(&self, band: Band, objective: impl Fn(Hertz, Impedance) -> f64) -> Option<Worst> {
        self.sampled(band)?.worst(objective)
    }

    /// [`Sampled::survey`].
    #[must_use]
    pub fn survey(&self, band: Band) -> Option<Survey> {
        self.sampled(band)?.survey()
    }

    /// ln f of the points a search starts from, ascending. `shift`, 0 to 1, moves the inner ones by
    /// that part of a step; only tests move them.
    fn grid(&self, band: Band, shift: f64) -> Option<Vec<f64>> {
        let band = self.covered(band)?;
        let (bottom, top) = (math::ln(band.bottom.0), math::ln(band.top.0));
        if self.is_flat() {
            return Some(vec![bottom]);
        }
        let steps = ((top - bottom) / math::LN_2 * POINTS_PER_OCTAVE)
            .ceil()
            .clamp(1.0, 4096.0);
        let step = (top - bottom) / steps;
        let mut grid: Vec<f64> = (0..steps as usize)
            .map(|k| bottom + step * (k as f64 + shift))
            .collect();
        let mut landmarks = Vec::new();
        for member in &self.members {
            match member {
                Member::VoiceCoil(coil) => coil.landmarks(&mut landmarks),
                Member::Table { table, .. } => grid.extend(table.rows.iter().map(|r| r.0)),
                Member::Resistive { .. } | Member::Nominal { .. } => {}
            }
        }
        grid.extend(landmarks.into_iter().map(math::ln));
        grid.extend([bottom, top]);
        grid.retain(|x| *x >= bottom && *x <= top);
        grid.sort_by(f64::total_cmp);
        grid.dedup_by(|a, b| (*a - *b).abs() < NARROWED);
        Some(grid)
    }
}

/// A load on the points from which searches start.
#[derive(Clone, Debug, PartialEq)]
pub struct Sampled {
    load: Load,
    /// ln f, ascending.
    grid: Vec<f64>,
    /// Each variant, with f and Z on the grid.
    variants: Vec<(Variant, Vec<(Hertz, Impedance)>)>,
}

impl Sampled {
    fn on(load: &Load, grid: Vec<f64>) -> Option<Self> {
        let sample = |variant: Variant| {
            let points = grid.iter().map(|x| {
                let f = Hertz(math::exp(*x));
                Some((f, load.impedance(variant, f)?))
            });
            Some((variant, points.collect::<Option<Vec<_>>>()?))
        };
        let variants = load
            .variants()
            .into_iter()
            .map(sample)
            .collect::<Option<Vec<_>>>()?;
        Some(Self {
            load: load.clone(),
            grid,
            variants,
        })
    }

    /// The greatest value of `objective` over the covered part of the band and every variant.
    ///
    /// A logarithmic grid with the rows of tables and the flanks of resonances added, then each
    /// local maximum narrowed, so the answer does not depend on where grid points fell. A flat
    /// load is asked once per variant, at the bottom of the band: its objective may depend on
    /// frequency only through the impedance. Results within 1e-9 tie: the earlier variant
    /// (lagging before leading), then the lower frequency, stands.
    ///
    /// `None` if the objective was not finite anywhere it was asked: a hole in it must not hide the
    /// worst case.
    #[must_use]
    pub fn worst(&self, objective: impl Fn(Hertz, Impedance) -> f64) -> Option<Worst> {
        let values = self.on_grid(&objective);
        self.narrowed(&values, &objective)
    }

    /// The same with a `rough` objective, cheap and right to a few per cent, that tells which points of
    /// the grid need the true one: those below [`SCREENED`] of its crest cannot be the worst.
    #[must_use]
    pub fn worst_screened(
        &self,
        rough: impl Fn(Hertz, Impedance) -> f64,
        objective: impl Fn(Hertz, Impedance) -> f64,
    ) -> Option<Worst> {
        let mut values = self.on_grid(&rough);
        let crest = values
            .iter()
            .flatten()
            .copied()
            .fold(f64::NEG_INFINITY, f64::max);
        for ((_, points), values) in self.variants.iter().zip(&mut values) {
            for (&(f, z), value) in points.iter().zip(values) {
                // what is not a number must be asked too
                if *value >= SCREENED * crest || value.is_nan() {
                    *value = objective(f, z);
                }
            }
        }
        self.narrowed(&values, &objective)
    }

    /// An objective on the grid, variant by variant.
    fn on_grid(&self, objective: &impl Fn(Hertz, Impedance) -> f64) -> Vec<Vec<f64>> {
        let of =
            |points: &[(Hertz, Impedance)]| points.iter().map(|&(f, z)| objective(f, z)).collect();
        self.variants.iter().map(|(_, points)| of(points)).collect()
    }

    /// The greatest value, each local maximum of the grid narrowed.
    fn narrowed(
        &self,
        values: &[Vec<f64>],
        objective: &impl Fn(Hertz, Impedance) -> f64,
    ) -> Option<Worst> {
        let mut best: Option<Worst> = None;
        for ((variant, _), values) in self.variants.iter().zip(values) {
            if values.iter().any(|v| !v.is_finite()) {
                return None;
            }
            // NaN marks a point without an answer; it spreads through the sums and is caught below.
            let value_at = |x: f64| {
                let f = Hertz(math::exp(x));
                self.load
                    .impedance(*variant, f)
                    .map_or(f64::NAN, |z| objective(f, z))
            };
            let crest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
            for (k, (&x, &value)) in self.grid.iter().zip(values).enumerate() {
                let neighbour = |k: usize| self.grid.get(k).copied().zip(values.get(k).copied());
                let (left, right) = (k.checked_sub(1).and_then(neighbour), neighbour(k + 1));
                let higher = |side: Option<(f64, f64)>| side.is_some_and(|(_, v)| v > value);
                if higher(left) || higher(right) {
                    continue;
                }
                let mut found = (x, value);
                if self.grid.len() > 1 && reach(left, (x, value), right) >= crest {
                    let (lo, hi) = (left.map_or(x, |l| l.0), right.map_or(x, |r| r.0));
                    let narrowed = math::maximum(value_at, lo, hi, NARROWED);
                    if !narrowed.1.is_finite() {
                        return None;
                    }
                    if narrowed.1 > value {
                        found = narrowed;
                    }
                }
                if best.is_none_or(|b| found.1 > b.value + TIE * b.value.abs()) {
                    let frequency = Hertz(math::exp(found.0));
                    let impedance = self.load.impedance(*variant, frequency)?;
                    best = Some(Worst {
                        value: found.1,
                        frequency,
                        impedance,
                        variant: *variant,
                    });
                }
            }
        }
        best
    }

    /// Minimum modulus, extremes of phase, and equivalent peak dissipation resistance.
    #[must_use]
    pub fn survey(&self) -> Option<Survey> {
        Some(Survey {
            minimum: self.worst(|_, z| -z.modulus().0)?,
            most_lagging: self.worst(|_, z| z.angle_rad())?,
            most_leading: self.worst(|_, z| -z.angle_rad())?,
            dissipation: self.worst(|_, z| -z.peak_dissipation_resistance().0)?,
        })
    }
}

/// The most that a local maximum between its neighbours can plausibly be: twice the gain at which
/// the straight lines through it and either neighbour would arrive.
fn reach(left: Option<(f64, f64)>, middle: (f64, f64), right: Option<(f64, f64)>) -> f64 {
    match (left, right) {
        (Some(l), Some(r)) => {
            let ratio = (r.0 - middle.0) / (middle.0 - l.0);
            let gain = ((middle.1 - l.1) * ratio).max((middle.1 - r.1) / ratio);
            middle.1 + 2.0 * gain
        }
        // At an end of the band nothing bounds the rise inside the first step.
        _ => f64::INFINITY,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn audio() -> Band {
        Band::new(Hertz(20.0), Hertz(20_000.0)).unwrap()
    }

    fn woofer(q: (f64, f64), fs: f64, le: f64, n: f64) -> Load {
        Load::voice_coil(VoiceCoil {
            resistance: Ohm(6.0),
            inductance: Henry(le),
            loss_exponent: n,
            resonances: vec![Resonance {
                frequency: Hertz(fs),
                mechanical_q: q.0,
                electrical_q: q.1,
            }],
        })
        .unwrap()
    }

    const GIVEN: Variant = Variant {
        side: Side::AsGiven,
        tolerance: Tolerance::AsGiven,
    };

    /// The exhaustive twin of a search: 400 000 points.
    fn brute(load: &Load, objective: impl Fn(Impedance) -> f64) -> f64 {
        let mut best = f64::NEG_INFINITY;
        for k in 0..=400_000 {
            let f = Hertz(20.0 * math::pow(1000.0, f64::from(k) / 400_000.0));
            for variant in load.variants() {
                if let Some(z) = load.impedance(variant, f) {
                    best = best.max(objective(z));
                }
            }
        }
        best
    }

    #[test]
    fn search_agrees_with_brute_force() {
        let two = Load::parallel(&[
            woofer((4.5, 1.3), 110.3, 0.6e-3, 0.7),
            woofer((9.0, 0.4), 31.0, 1.1e-3, 1.0),
        ])
        .unwrap();
        for load in [
            woofer((4.5, 1.3), 110.3, 0.0, 1.0),
            woofer((80.0, 0.3), 55.0, 1e-3, 0.6),
            two,
        ] {
            let found = load.survey(audio()).unwrap();
            let fine = brute(&load, |z| -z.peak_dissipation_resistance().0);
            assert!((found.dissipation.value - fine).abs() < 1e-8 * fine.abs());
            assert!(found.dissipation.value >= fine * (1.0 + 1e-14));
            let fine = brute(&load, |z| -z.modulus().0);
            assert!((found.minimum.value - fine).abs() < 1e-8 * fine.abs());
            let fine = brute(&load, |z| z.angle_rad());
            assert!((found.most_lagging.value - fine).abs() < 1e-8);
            let fine = brute(&load, |z| -z.angle_rad());
            assert!((found.most_leading.value - fine).abs() < 1e-8);
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(200))]

        #[test]
        fn answer_does_not_depend_on_the_grid(
            shift in 0.0..1.0f64, fs in 21.0..5000.0f64,
            qms in 0.3..60.0f64, qes in 0.2..5.0f64, le in 0.0..3e-3f64, n in 0.5..=1.0f64,
        ) {
            let load = woofer((qms, qes), fs, le, n);
            let at = |shift: f64, objective: fn(Hertz, Impedance) -> f64| {
                Sampled::on(&load, load.grid(audio(), shift).unwrap()).unwrap().worst(objective).unwrap()
            };
            let objectives: [fn(Hertz, Impedance) -> f64; 3] = [
                |_, z| -z.modulus().0,
                |_, z| -z.peak_dissipation_resistance().0,
                |_, z| z.angle_rad().abs(),
            ];
            for objective in objectives {
                let (a, b) = (at(0.0, objective), at(shift, objective));
                prop_assert!((a.value - b.value).abs() <= 2e-9 * a.value.abs());
            }
        }

        #[test]
        fn any_input_is_refused_or_answered_with_numbers(
            r in prop_oneof![-10.0..1e9f64, Just(f64::NAN), Just(f64::INFINITY), Just(0.0)],
            l in prop_oneof![-1.0..1e9f64, Just(f64::NAN)], n in -1.0..2.0f64,
            fs in prop_oneof![-1.0..1e12f64, Just(f64::MIN_POSITIVE), Just(f64::MAX)],
            q in prop_oneof![-1.0..1e12f64, Just(f64::MIN_POSITIVE), Just(f64::MAX)],
        ) {
            let coil = VoiceCoil {
                resistance: Ohm(r), inductance: Henry(l), loss_exponent: n,
                resonances: vec![Resonance { frequency: Hertz(fs), mechanical_q: q, electrical_q: 1.0 }],
            };
            if let Some(survey) = Load::voice_coil(coil).and_then(|load| load.survey(audio())) {
                prop_assert!(survey.minimum.value.is_finite());
                prop_assert!(survey.dissipation.impedance.modulus().is_finite());
            }
        }
    }

    #[test]
    fn flat_loads_are_asked_once_per_variant() {
        let asked = std::cell::Cell::new(0);
        let load = Load::nominal(Ohm(6.4), 0.5, None).unwrap();
        let worst = load.worst(audio(), |_, z| {
            asked.set(asked.get() + 1);
            -z.modulus().0
        });
        assert_eq!(asked.get(), 2);
        let worst = worst.unwrap();
        assert_eq!(worst.variant.side, Side::Lagging);
        assert!((worst.impedance.angle_rad() - 0.5).abs() < 1e-15);
    }

    #[test]
    fn mixed_signs_are_never_worse_than_like_signs() {
        // Two nominal loads, every combination of signs: the greatest peak dissipation is among
        // the combinations that `variants` lists.
        let parts = [(Ohm(6.4), 0.9), (Ohm(3.2), 0.4)];
        let loads = parts.map(|(r, a)| Load::nominal(r, a, None).unwrap());
        let found = Load::parallel(&loads)
            .unwrap()
            .survey(audio())
            .unwrap()
            .dissipation;
        for signs in [[1.0, 1.0], [1.0, -1.0], [-1.0, 1.0], [-1.0, -1.0]] {
            let (g, b) = parts
                .iter()
                .zip(signs)
                .fold((0.0, 0.0), |(g, b), ((r, a), sign)| {
                    let (dg, db) = Impedance::polar(*r, a * sign).admittance();
                    (g + dg, b + db)
                });
            let z = Impedance::polar(Ohm(1.0 / (g * g + b * b).sqrt()), math::atan2(-b, g));
            assert!(-z.peak_dissipation_resistance().0 <= found.value + 1e-12);
        }
    }

    #[test]
    fn tables_are_not_extrapolated() {
        let row = |f, z, a| TableRow {
            frequency: Hertz(f),
            modulus: Ohm(z),
            angle_rad: a,
        };
        let table = Table::new(&[row(50.0, 8.0, 0.3), row(500.0, 4.0, -0.1)]).unwrap();
        assert!(table.rows_per_octave(Hertz(5.0)).abs() < 1e-15);
        let load = Load::table(table, Some(Ohm(3.5))).unwrap();
        assert!(load.impedance(GIVEN, Hertz(49.0)).is_none());
        assert!(load.impedance(GIVEN, Hertz(501.0)).is_none());
        // Half-way in log f: the geometric mean of the moduli, the mean of the phases.
        let z = load
            .impedance(GIVEN, Hertz((50.0f64 * 500.0).sqrt()))
            .unwrap();
        assert!((z.modulus().0 - 32f64.sqrt()).abs() < 1e-12);
        assert!((z.angle_rad() - 0.1).abs() < 1e-12);
        assert_eq!(load.covered(audio()), Band::new(Hertz(50.0), Hertz(500.0)));
        let least = load.worst(audio(), |_, z| -z.modulus().0).unwrap();
        assert!((least.frequency.0 - 500.0).abs() < 1e-6);
        assert!(
            load.survey(Band::new(Hertz(1e3), Hertz(2e3)).unwrap())
                .is_none()
        );
    }

    #[test]
    fn bad_tables_name_the_row() {
        let row = |f, z, a| TableRow {
            frequency: Hertz(f),
            modulus: Ohm(z),
            angle_rad: a,
        };
        let bad = |rows: &[TableRow]| Table::new(rows).unwrap_err();
        assert_eq!(bad(&[]), TableError::TooFew);
        assert_eq!(bad(&[row(1.0, 1.0, 0.0)]), TableError::TooFew);
        assert_eq!(
            bad(&[row(2.0, 1.0, 0.0), row(2.0, 1.0, 0.0)]),
            TableError::Frequency(1)
        );
        assert_eq!(bad(&[row(f64::NAN, 1.0, 0.0)]), TableError::Frequency(0));
        assert_eq!(bad(&[row(1.0, 0.0, 0.0)]), TableError::Modulus(0));
        assert_eq!(bad(&[row(1.0, 1.0, 1.6)]), TableError::Angle(0));
        assert_eq!(bad(&[row(1.0, 1.0, f64::NAN)]), TableError::Angle(0));
    }

    #[test]
    fn third_octave_rows_count_as_three_per_octave() {
        let rows: Vec<_> = [20.0, 25.0, 31.5, 40.0, 50.0, 63.0, 80.0, 100.0]
            .map(|f| TableRow {
                frequency: Hertz(f),
                modulus: Ohm(8.0),
                angle_rad: 0.0,
            })
            .into();
        let table = Table::new(&rows).unwrap();
        for f in [25.0, 31.5, 40.0, 50.0, 63.0] {
            assert!(table.rows_per_octave(Hertz(f)) >= 2.99, "{f}");
        }
    }

    #[test]
    fn cold_coil_moves_re_and_leaves_the_motional_resistance() {
        let load = woofer((5.0, 0.5), 40.0, 0.0, 1.0);
        let cold = load.with_coil_at(Celsius(-10.0)).unwrap();
        // 6 ohm x (1 - 0.0039 x 30) = 5.298 ohm; Res = 6 x 5/0.5 = 60 ohm at fs either way.
        assert!((cold.dc().unwrap().0 - 5.298).abs() < 1e-12);
        let peak = cold.impedance(GIVEN, Hertz(40.0)).unwrap();
        assert!((peak.modulus().0 - 65.298).abs() < 1e-10);
        assert_eq!(load.with_coil_at(Celsius(f64::NAN)), None);
    }

    #[test]
    fn a_hole_in_the_objective_gives_no_answer() {
        let load = woofer((5.0, 0.5), 40.0, 1e-3, 1.0);
        let holed = |f: Hertz, _| if f.0 > 1e3 { f64::NAN } else { 1.0 };
        assert_eq!(load.worst(audio(), holed), None);
    }

    #[test]
    fn unstated_dc_of_one_member_hides_the_sum() {
        let a = Load::nominal(Ohm(6.4), 0.5, Some(Ohm(6.0))).unwrap();
        let b = Load::nominal(Ohm(6.4), 0.5, None).unwrap();
        assert_eq!(Load::parallel(&[a.clone(), b]).unwrap().dc(), None);
        assert!((Load::parallel(&[a.clone(), a]).unwrap().dc().unwrap().0 - 3.0).abs() < 1e-15);
        assert_eq!(Load::parallel(&[]), None);
    }
}
