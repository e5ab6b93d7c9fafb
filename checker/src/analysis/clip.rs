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
    /// The phase is searched at a level, the level then lowered at that phase until the rail just
    /// holds, and the phase searched again: each level found is too high or right, so the last, at
    /// which the worst phase holds too, is right.
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
        let collapsed = -most.0;
        let mut amplitude = self.sustained(mains, driven, seen)?.min(most);
        for _ in 0..MOST_PHASES {
            let worst = low
                .rail
                .least_headroom(low.load(amplitude), needed(amplitude));
            let phase = match worst {
                Some(headroom) if headroom.least.0 >= -EXACT * most.0 => return Ok(amplitude),
                Some(headroom) => headroom.mains_rad,
                // so much is drawn that the rail is gone: the level is far too high in any phase
                None => 0.0,
            };
            let spare = |v: f64| {
                let v = Volt(v);
                low.rail
                    .least_headroom_at(low.load(v), phase, needed(v))
                    .map_or(collapsed, |h| h.least.0)
            };
            let found = root(spare, 0.0, amplitude.0, 0.1 * EXACT * most.0).map(Volt);
            // where the level holds at this phase, rounding alone decided
            amplitude = found.unwrap_or(amplitude * (1.0 - EXACT));
        }
        Ok(amplitude)
    }
}

/// A rail and who draws on it.
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
}
