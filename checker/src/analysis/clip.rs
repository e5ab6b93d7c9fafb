//! How loud a channel plays before its rail gives out: at mid-band and at the bottom of the band.
//! Must not know what was claimed to be a verdict, nor any part.

use super::case::Case;
use super::rails::{Mains, Rails, Reservoir};
use crate::build::Needs;
use crate::build::parts::{Claim, three};
use crate::physics::load::Impedance;
use crate::physics::math::root;
use crate::physics::output_stage::power;
use crate::physics::supply::{Draw, LowFrequencyLoad, Rail};
use crate::physics::unit::{Amp, Hertz, Ohm, Volt, Watt};

/// Most times the phase of the signal against the mains is looked for anew.
const MOST_PHASES: u32 = 8;

/// Where the search for the level at the bottom of the band starts, as a multiple of that at mid-band.
const ABOVE: f64 = 1.01;

/// Phases are kept whose headroom at the first, too high level is within this part of the unloaded rail
/// of the least: on the way down to the level that holds they change places by far less.
const PROMISING: f64 = 0.015;

/// How far beside the worst phase it is looked for again, in steps of the search.
const NEAR_STEP: f64 = 0.2;

/// How exactly a clip level is found, as a part of the unloaded rail.
const EXACT: f64 = 1e-7;

/// What a claim asks of one channel.
#[derive(Clone, Copy, Debug)]
pub struct Asked {
    /// Peak output of one channel.
    pub amplitude: Volt,
    /// Peak current of one channel.
    pub peak: Amp,
    /// The resistance that one channel sees.
    pub seen: Ohm,
    /// Channels of one supply that play.
    pub driven: u32,
    /// Mains at which it is claimed.
    pub mains: Mains,
}

/// The rail at its lowest while a sine plays.
#[derive(Clone, Copy, Debug)]
pub struct Trough {
    /// Mean current on each rail of the supply, idle included.
    pub current: Amp,
    /// Mean of the rail.
    pub mean: Volt,
    /// Its lowest, less what the peaks of the signal lose in the reservoir's ESR.
    pub lowest: Volt,
}

impl Case<'_> {
    /// The claims that bind this build. A bridged one is bound by those into a load it declares: a
    /// claim into another resistance was made of single channels.
    ///
    /// # Errors
    /// When no power is claimed and none is not said either.
    pub fn claims(&self) -> Result<Vec<Claim>, Needs> {
        let rated = &self.build.amplifier.rated;
        if rated.none {
            return Ok(Vec::new());
        }
        let bound = |claim: &&Claim| {
            let loads = self.loads().unwrap_or_default();
            !self.build.bridged
                || loads
                    .iter()
                    .flatten()
                    .any(|l| (l.nominal / claim.load - 1.0).abs() < 0.02)
        };
        Ok(rated.need()?.iter().filter(bound).copied().collect())
    }

    /// Channels of one supply that play at once: all of them, or one speaker's worth.
    ///
    /// # Errors
    /// When the channels are not stated.
    pub fn driven(&self, all: bool) -> Result<u32, Needs> {
        let channels = self.channels_per_supply()?;
        let one = if self.build.bridged { 2 } else { 1 };
        Ok(if all { channels } else { one.min(channels) })
    }

    /// What a claim asks of one channel: V̂ = √(2PR), and half of it into half the resistance where
    /// two channels are bridged.
    ///
    /// # Errors
    /// When the channels are not stated.
    pub fn asked(&self, claim: &Claim) -> Result<Asked, Needs> {
        let halves = if self.build.bridged { 2.0 } else { 1.0 };
        let seen = claim.load / halves;
        let amplitude = Volt((2.0 * claim.power.0 * claim.load.0).sqrt() / halves);
        if !(seen > Ohm::ZERO && amplitude > Volt::ZERO && amplitude.is_finite()) {
            return Err(Needs::because(
                "a claimed power and its load must be positive",
            ));
        }
        let mains = if claim.low_mains {
            Mains::Low
        } else {
            Mains::Nominal
        };
        Ok(Asked {
            amplitude,
            peak: amplitude / seen,
            seen,
            driven: self.driven(claim.all_channels)?,
            mains,
        })
    }

    /// Power into the load at a peak output of one channel: V̂²/2R, and (2V̂)²/2R between two.
    #[must_use]
    pub fn power_of(&self, amplitude: Volt, seen: Ohm) -> Watt {
        power(amplitude, seen) * if self.build.bridged { 2.0 } else { 1.0 }
    }

    /// How `driven` channels in phase draw on one rail, and how many peaks add up there. Bridged
    /// channels take turns on a rail, one in each half-cycle.
    #[must_use]
    pub fn draw(&self, driven: u32) -> (Draw, f64) {
        if self.build.bridged && driven.is_multiple_of(2) {
            (Draw::BothHalves, f64::from(driven / 2))
        } else {
            (Draw::OneHalf, f64::from(driven))
        }
    }

    /// Idle current of all channels of one supply on each rail.
    ///
    /// # Errors
    /// What the output stage or the build does not state.
    pub fn idle_of_supply(&self) -> Result<Amp, Needs> {
        let (idle, pairs, channels) = three(
            self.idle(),
            self.output().pairs.need().copied(),
            self.channels_per_supply(),
        )?;
        Ok(idle * f64::from(pairs) * f64::from(channels))
    }

    /// The rail under `driven` channels' mid-band sines of this peak, the least reservoir: the trough
    /// at the constant mean current Σ(Î/π + N·Iq), less ESR·(ΣÎ - mean).
    ///
    /// # Errors
    /// What rails or output stage lack, or that the supply cannot give the current.
    pub fn trough(&self, mains: Mains, driven: u32, peak: Amp) -> Result<Trough, Needs> {
        let (draw, peaks) = self.draw(driven);
        let current = draw.mean(peak * peaks) + self.idle_of_supply()?;
        let esr = match self.rails()? {
            Rails::Made(made) => made.esr,
            Rails::Given { .. } => Ohm::ZERO,
        };
        let rail = self.loaded(mains, Reservoir::Low, current)?;
        Ok(Trough {
            current,
            mean: rail.mean,
            lowest: rail.trough - esr * (peak * peaks - current),
        })
    }

    /// The greatest mid-band sine that `driven` channels sustain at once into a resistance each sees.
    ///
    /// # Errors
    /// What rails, drop or output stage lack, or that nothing can be put out.
    pub fn sustained(&self, mains: Mains, driven: u32, seen: Ohm) -> Result<Volt, Needs> {
        let drop = self.drop()?;
        // what is missing altogether shows without a signal
        self.trough(mains, driven, Amp::ZERO)?;
        let rail = |peak: Amp| self.trough(mains, driven, peak).ok().map(|t| t.lowest);
        drop.clip_on(rail, Impedance::resistive(seen))
            .ok_or_else(|| Needs::because("the drop takes all of the rail"))
    }

    /// The same at the bottom of the band: the greatest sine for which the rail never falls below
    /// v_out + drop over the signal period, in the worst phase of the signal against the mains.
    ///
    /// All phases are searched roughly at a level that is too high, the level then lowered at the worst of
    /// them until the rail just holds; there the phases that were within some hundredths of the worst are
    /// searched exactly, and the level lowered again, until the worst phase holds too.
    ///
    /// # Errors
    /// What supply, drop or output stage lack: given rails say nothing of it.
    pub fn sustained_low(
        &self,
        mains: Mains,
        driven: u32,
        seen: Ohm,
        frequency: Hertz,
    ) -> Result<Volt, Needs> {
        let made = self.made()?;
        let (drop, standing, region) = three(self.drop(), self.idle_of_supply(), self.region())?;
        let (draw, peaks) = self.draw(driven);
        let fails = || Needs::because("the rail at the bottom of the band cannot be solved");
        let rail = made
            .rail(mains, Reservoir::Low, region.frequency)
            .ok_or_else(fails)?;
        let most = rail.unloaded() - drop.at(Amp::ZERO);
        if most <= Volt::ZERO {
            return Err(Needs::because("the drop takes all of the rail"));
        }
        let low = Low {
            rail,
            standing,
            peaks,
            draw,
            frequency,
            seen,
        };
        let needed = |amplitude: Volt| {
            let drop = &drop;
            move |phase: f64| {
                let output = amplitude * crate::physics::math::sin_cos(phase).0;
                match draw {
                    Draw::OneHalf if output < Volt::ZERO => output,
                    _ => output.abs() + drop.at(output.abs() / seen),
                }
            }
        };
        // a little above what the mean current would leave, which the low band seldom exceeds
        let start = (self.sustained(mains, driven, seen)? * ABOVE).min(most);
        let inputs = (&low, &drop, most, start);
        self.memory.recall("sag", &inputs, || {
            low.sustained(start, most, needed).ok_or_else(fails)
        })
    }
}

/// A rail and who draws on it.
#[derive(Debug)]
struct Low {
    rail: Rail,
    standing: Amp,
    peaks: f64,
    draw: Draw,
    frequency: Hertz,
    seen: Ohm,
}

impl Low {
    fn load(&self, amplitude: Volt) -> LowFrequencyLoad {
        LowFrequencyLoad {
            standing: self.standing,
            peak: amplitude / self.seen * self.peaks,
            frequency: self.frequency,
            draw: self.draw,
        }
    }

    /// The greatest amplitude up to `start` at which the rail holds in every phase; `most` is the
    /// unloaded rail less the drop.
    fn sustained<N: Fn(f64) -> Volt>(
        &self,
        start: Volt,
        most: Volt,
        needed: impl Fn(Volt) -> N,
    ) -> Option<Volt> {
        let exact = EXACT * most.0;
        let spare = |amplitude: Volt, phase: f64| {
            self.rail
                .least_headroom_at(self.load(amplitude), phase, needed(amplitude))
                .map_or(-most.0, |h| h.least.0)
        };
        // The rail loses at least what the output does, so the level is at most short of by what is
        // missing of headroom.
        let lowered = |amplitude: Volt, missing: f64, phase: f64| {
            let f = |v: f64| spare(Volt(v), phase);
            let near = (amplitude.0 - missing * (1.0 + 1e-3) - exact).max(0.0);
            let from = if f(near) >= 0.0 { near } else { 0.0 };
            let found = root(f, from, amplitude.0, 0.1 * exact).map(Volt);
            // where the level holds at this phase, rounding alone decided
            found.unwrap_or(amplitude * (1.0 - EXACT))
        };
        let mut amplitude = start;
        let mut scanned = None;
        for _ in 0..MOST_PHASES {
            scanned = self
                .rail
                .scan_headroom(self.load(amplitude), &needed(amplitude));
            match &scanned {
                // so much is drawn that the rail is gone: the level is far too high in any phase
                None => amplitude = lowered(amplitude, most.0, 0.0),
                Some(scan) if amplitude < most && scan.lowest() > 0.0 => amplitude = most,
                Some(_) => break,
            }
        }
        let scan = scanned?;
        let mut phases = scan.promising(PROMISING * most.0);
        let first = *phases.first()?;
        let missing = -spare(amplitude, first);
        if missing > 0.0 {
            amplitude = lowered(amplitude, missing, first);
        }
        let mut step = scan.step;
        for _ in 0..MOST_PHASES {
            let needs = needed(amplitude);
            let phase = self
                .rail
                .lowest_near(self.load(amplitude), &phases, step, &needs)?;
            let missing = -spare(amplitude, phase);
            if missing <= exact {
                return Some(amplitude);
            }
            amplitude = lowered(amplitude, missing, phase);
            // the level hardly moved, and with it the worst phase
            (phases, step) = (vec![phase], NEAR_STEP * scan.step);
        }
        Some(amplitude)
    }
}
