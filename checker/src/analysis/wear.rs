//! What heat does to parts that are no transistors: capacitors that dry out, resistors that may
//! dissipate less.
//! Must not know what is allowed.

use super::case::Case;
use super::heat::Heat;
use super::rails::{Mains, Reservoir};
use crate::build::Needs;
use crate::build::parts::{Reservoir as Stated, both, three};
use crate::finding::Measure;
use crate::physics::supply::{self, Draw, RippleMultipliers};
use crate::physics::unit::{Amp, Celsius, Kelvin, Volt, Watt};
use crate::physics::wear::{core_temperature, electrolytic_life_hours, resistor_rating};

/// From here up a capacitor counts as a 105 degC type.
const LONG_LIFE_TYPE: Celsius = Celsius(100.0);

/// One kind of reservoir capacitor at the duty.
#[derive(Clone, Copy, Debug)]
pub struct Life {
    /// Ripple current of one, r.m.s.
    pub ripple: Amp,
    /// Air round it.
    pub air: Celsius,
    /// Its core.
    pub core: Celsius,
    /// Hours as stated.
    pub stated_hours: f64,
    /// The temperature they are stated at.
    pub stated_at: Celsius,
    /// Hours expected.
    pub hours: f64,
}

/// A resistor with its rating at its temperature.
#[derive(Clone, Copy, Debug)]
pub struct Warm {
    /// Air round it.
    pub air: Celsius,
    /// What it dissipates.
    pub watts: Watt,
    /// What it may.
    pub rating: Watt,
}

impl Case<'_> {
    /// The capacitors of one rail of a supply: its own, then those of the boards it feeds.
    fn capacitors(&self) -> Result<Vec<(u32, &Stated)>, Needs> {
        let (supply, carried) = self.build.supply.need()?;
        let boards = carried.div_ceil(self.build.amplifier.channels_per_board.get().copied().unwrap_or(1).max(1));
        let mut all: Vec<(u32, &Stated)> = supply.reservoir.need()?.iter().map(|r| (r.count, r)).collect();
        all.extend(self.build.amplifier.board_reservoir.get().map(|r| (r.count * boards, r)));
        Ok(all)
    }

    /// Ripple current of one rail's reservoir at the duty: charging and audio.
    fn rail_ripple(&self, heat: &Heat) -> Result<Amp, Needs> {
        let loaded = self.loaded(Mains::Nominal, Reservoir::Nominal, heat.duty.rail_current)?;
        let cycle = loaded.cycle.ok_or_else(|| self.build.supply.missing())?;
        let channels = f64::from(self.channels_per_supply()?);
        let audio = if self.build.bridged { Draw::BothHalves.ripple(heat.duty.peak * channels / 2.0) } else { Draw::OneHalf.ripple(heat.duty.peak * channels) };
        let plain = RippleMultipliers { charging: 1.0, audio: 1.0 };
        supply::reservoir_ripple(cycle.reservoir_rms(), audio, plain).ok_or_else(|| Needs::because("the ripple current cannot be worked out"))
    }

    /// Life of every kind of reservoir capacitor at the duty into a load, hottest room, in the order
    /// in which they are stated.
    ///
    /// # Errors
    /// What supply or capacitors do not state.
    pub fn reservoir_lives(&self, heat: &Heat) -> Result<Vec<Life>, Needs> {
        let (all, total, air) = three(self.capacitors(), self.rail_ripple(heat), self.air_inside())?;
        let groups: Vec<supply::Reservoir> = all.iter().map(|(n, r)| supply::Reservoir { count: *n, capacitance: r.farad.nominal, esr: r.esr }).collect();
        let shares = supply::ripple_shares(&groups).ok_or_else(|| Needs::because("the reservoir has no capacitance"))?;
        let field = &self.supply()?.reservoir;
        let mut out = Vec::new();
        for ((_, stated), share) in all.iter().zip(shares) {
            let (life, rated) = both(stated.life.ok_or_else(|| field.missing_part("life")), stated.ripple.ok_or_else(|| field.missing_part("ripple")))?;
            let (length, at) = life;
            let rise = if at >= LONG_LIFE_TYPE { Kelvin(5.0) } else { Kelvin(10.0) };
            let key = format!("supply {} reservoir core rise at rated ripple", field.owner().name);
            self.assume(key, Measure::new(rise.0, "K"), "usual for this temperature class", stated.site);
            let ripple = total * share;
            let core = core_temperature(air, ripple, rated, rise);
            let hours = core.and_then(|core| electrolytic_life_hours(length.0 / 3600.0, at, core).map(|h| (core, h)));
            let (core, hours) = hours.ok_or_else(|| Needs::because("the life of the reservoir cannot be worked out"))?;
            out.push(Life { ripple, air, core, stated_hours: length.0 / 3600.0, stated_at: at, hours });
        }
        Ok(out)
    }

    /// The most loaded emitter resistor of either side at the duty.
    ///
    /// The signal's part is mean(i²)·RE/2N², times the square of the share; the idle current's Iq²·RE
    /// is added whole.
    ///
    /// # Errors
    /// What output stage or build do not state.
    pub fn emitter_resistor(&self, heat: &Heat) -> Result<(Warm, f64, Watt), Needs> {
        let stage = self.output();
        let (resistor, (bench, idle), air) = three(stage.emitter.need(), both(self.bench(), self.idle()), self.air_inside())?;
        let rated = stage.emitter.part("W", |r| r.watt)?;
        let signal = self.sine(heat.duty.amplitude, heat.duty.load)?;
        let mut worst: Option<(Watt, f64, Watt)> = None;
        for side in super::case::Side::BOTH {
            let bank = bench.bank(side);
            let pairs = f64::from(bank.devices());
            let mean = heat.duty.peak / crate::physics::math::PI;
            let share = bank.share(mean);
            // alone, the greatest resistor takes the most; among several, the least one has the share
            let spread = if bank.devices() == 1 { resistor.ohm.high / resistor.ohm.nominal } else { 1.0 };
            let own = bank.share(idle * pairs) * idle.0;
            let still = Watt(own * own * resistor.ohm.high.0);
            let watts = signal.emitter_watts(bank, share) * spread + still;
            if worst.is_none_or(|w| watts > w.0) {
                worst = Some((watts, share, still));
            }
        }
        let (watts, share, still) = worst.ok_or_else(|| stage.pairs.missing())?;
        Ok((Warm { air, watts, rating: resistor_rating(rated, air) }, share, still))
    }

    /// The bleeder at high mains, for ever: V²/R with the least resistance.
    ///
    /// # Errors
    /// What the supply does not state.
    pub fn bleeder(&self) -> Result<(Warm, Volt), Needs> {
        let supply = self.supply()?;
        let (rail, air, (resistor, rail_to_rail)) = three(self.unsagged(Mains::High), self.air_inside(), supply.bleeder.need())?;
        let rated = supply.bleeder.part("W", |b| b.0.watt)?;
        let volts = if *rail_to_rail { rail * 2.0 } else { rail };
        let watts = volts * (volts / resistor.ohm.low);
        if !watts.is_finite() {
            return Err(Needs::because("the bleeder must have a resistance"));
        }
        Ok((Warm { air, watts, rating: resistor_rating(rated, air) }, volts))
    }
}
