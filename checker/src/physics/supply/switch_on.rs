//! Switching a supply on: the charging surge, a soft start, a saturated core.
//! Must not know fuses or ratings; currents are a winding's unless a name says primary.

use super::conduction::{HalfCycle, half_cycle};
use super::rail::Rail;
use super::transformer::Transformer;
use crate::physics::math::{FRAC_PI_2, PI, SQRT_2};
use crate::physics::unit::{Amp, AmpSquaredSecond, Hertz, Joule, Ohm, Second, Volt, Watt};

/// Most half-cycles any switch-on is followed for.
const MOST_HALF_CYCLES: usize = 20_000;

/// A rail below this draws no idle current while it comes up: no stage is biased yet (a
/// convention of this model).
const BIASED: Volt = Volt(10.0);

/// The moment of the mains at which a switch closes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Closing {
    /// At a zero crossing.
    Zero,
    /// At a crest.
    Crest,
}

/// The current of one winding while its reservoir charges.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Surge {
    /// Peak.
    pub peak: Amp,
    /// I²t over the first half period of the mains after closing.
    pub first: AmpSquaredSecond,
    /// I²t until the reservoir is full.
    pub total: AmpSquaredSecond,
}

impl Surge {
    /// The surge of the primary, `conducting` windings charging at once: currents times n·a, their
    /// squares times (n·a)².
    #[must_use]
    pub fn primary(self, transformer: &Transformer, conducting: u32) -> Self {
        let ratio = f64::from(conducting) * transformer.turns_ratio();
        Self {
            peak: self.peak * ratio,
            first: self.first * (ratio * ratio),
            total: self.total * (ratio * ratio),
        }
    }

    /// Peak and I²t each the greater of two.
    #[must_use]
    pub fn worse(self, other: Self) -> Self {
        Self {
            peak: self.peak.max(other.peak),
            first: self.first.max(other.first),
            total: self.total.max(other.total),
        }
    }
}

/// Charging of a reservoir from `start` volts, nothing drawn, the core not saturated: exact from
/// half-cycle to half-cycle. Core and leakage inductance are left out, so the peak is high.
///
/// The rail's source resistance is to hold winding, leads and mains seen from the winding, and a
/// soft start if there is one. `None` for a start below zero or not finite.
#[must_use]
pub fn switch_on(rail: &Rail, closing: Closing, start: Volt) -> Option<Surge> {
    if !(start.0 >= 0.0 && start.is_finite()) {
        return None;
    }
    let from = match closing {
        Closing::Zero => 0.0,
        Closing::Crest => FRAC_PI_2,
    };
    let closing = half_cycle(rail.x, 0.0, from, rail.level(start));
    let mut next = half_cycle(rail.x, 0.0, 0.0, closing.level);
    let first = closing.square(PI) + next.square(from);
    let peak = closing.peak().max(next.peak());
    let mut total = closing.square(PI);
    for _ in 0..MOST_HALF_CYCLES {
        let pulse = next.square(PI);
        total += pulse;
        if pulse <= 1e-9 * total {
            break;
        }
        next = half_cycle(rail.x, 0.0, 0.0, next.level);
    }
    Some(Surge {
        peak: rail.amps(peak),
        first: rail.let_through(first),
        total: rail.let_through(total),
    })
}

/// The surge of a primary whose core saturates for the whole half-cycle after closing at the worst
/// moment: Ipk = m·√2·Vtap/(Rpri + Rmains + Rinrush), a half sine at mains frequency, so
/// I²t = Ipk²/(4f). The air-core inductance that remains is left out: an upper bound.
///
/// `voltage`: r.m.s. mains across the tap, m·Vtap; `resistance`: everything in the primary circuit.
/// Gives peak and I²t; `None` unless all are finite and above zero.
#[must_use]
pub fn core_surge(voltage: Volt, resistance: Ohm, mains: Hertz) -> Option<(Amp, AmpSquaredSecond)> {
    if !(voltage.0 > 0.0 && resistance.0 > 0.0 && mains.0 > 0.0) {
        return None;
    }
    let peak = voltage * SQRT_2 / resistance;
    let let_through = AmpSquaredSecond(peak.0 * peak.0 / (4.0 * mains.0));
    (let_through.is_finite() && let_through.0 > 0.0).then_some((peak, let_through))
}

/// What a soft start does.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SoftStart {
    /// The rail when the bypass closes.
    pub reached: Volt,
    /// Energy the resistor takes until then.
    pub energy: Joule,
    /// The first surge, through the resistor: the worse of closing at zero and at crest.
    pub first: Surge,
    /// The second, when the bypass closes: the worse of both moments again.
    pub second: Surge,
}

/// A resistor in the primary, bypassed `bypass` seconds after switch-on at a zero crossing, while
/// the rail draws `idle` once it stands above 10 V.
///
/// Exact from one half-cycle to the next; whether the idle current flows is decided once in each,
/// at its zero crossing, and only whole half-cycles are counted, so the rail when the bypass
/// closes is rather low than high. `rail` is the rail without the resistor; `referred` is the
/// resistor seen from one of `conducting` windings, n·a²·R ([`Transformer::referred`]), in which
/// the n windings' currents i lose n·(n·a²·R)·i² together.
/// `None` for values below zero or not finite, or a bypass later than 20 000 half-cycles.
#[must_use]
pub fn soft_start(
    rail: &Rail,
    referred: Ohm,
    conducting: u32,
    idle: Amp,
    bypass: Second,
) -> Option<SoftStart> {
    let slow = rail.with_series(referred)?;
    let half_cycles = (bypass.0 * rail.omega / PI).floor();
    let sound = (0.0..=MOST_HALF_CYCLES as f64).contains(&half_cycles)
        && referred.0 >= 0.0
        && idle.0 >= 0.0
        && idle.is_finite();
    if !sound {
        return None;
    }
    let mut square = 0.0;
    let mut inside = rail.floor;
    for _ in 0..half_cycles as usize {
        let current = if slow.volts(inside) > BIASED.0 { idle } else { Amp::ZERO };
        let next = charging_half_cycle(&slow, current, inside);
        (square, inside) = (square + next.square(PI), next.level);
    }
    let reached = Volt(slow.volts(inside));
    let all = referred * f64::from(conducting);
    let surge = |rail: &Rail, start| {
        Some(switch_on(rail, Closing::Zero, start)?.worse(switch_on(rail, Closing::Crest, start)?))
    };
    Some(SoftStart {
        reached,
        energy: Joule(all.0 * slow.let_through(square).0),
        first: surge(&slow, Volt::ZERO)?,
        second: surge(rail, reached)?,
    })
}

/// One half-cycle from the level `inside` the capacitor, with a current drawn that stops when the
/// rail reaches zero.
fn charging_half_cycle(rail: &Rail, current: Amp, inside: f64) -> HalfCycle {
    let j = rail.resistance * current.0 / rail.crest;
    let drop = rail.esr_share * j;
    let mut next = half_cycle(rail.x, j, 0.0, inside - drop);
    next.level = (next.level + drop).max(rail.floor);
    next
}

/// Dissipation of a soft-start resistor whose bypass never closes, in the steady state with
/// `current` drawn from each rail: n·(n·a²·R)·Irms². `None` where the rail collapses.
#[must_use]
pub fn stuck_soft_start(rail: &Rail, referred: Ohm, conducting: u32, current: Amp) -> Option<Watt> {
    let rms = rail.with_series(referred)?.loaded(current)?.charging_rms();
    Some(rms * (referred * f64::from(conducting)) * rms)
}

impl Rail {
    /// The level of a rail terminal voltage without current.
    fn level(&self, voltage: Volt) -> f64 {
        voltage.0 / self.crest + self.floor
    }

    fn amps(&self, s: f64) -> Amp {
        Amp(s * self.crest / self.resistance)
    }

    /// I²t from the integral of s² over the mains angle.
    fn let_through(&self, square: f64) -> AmpSquaredSecond {
        let unit = self.crest / self.resistance;
        AmpSquaredSecond(square * unit * unit / self.omega)
    }
}
