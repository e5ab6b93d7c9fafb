//! What heat does to parts that are no transistors: capacitors that dry out, resistors that may
//! dissipate less.
//! Must not know what is allowed.

use super::case::Case;
use super::heat::Heat;
use super::loads::Driven;
use super::rails::Mains;
use super::supply::Bank;
use crate::build::Needs;
use crate::build::parts::{both, three};
use crate::finding::Measure;
use crate::physics::supply::{RippleMultipliers, reservoir_ripple};
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
    /// Life of one kind of reservoir capacitor, `share` of its rail's ripple current, at the duty into a
    /// load, hottest room.
    ///
    /// # Errors
    /// What supply or capacitors do not state.
    pub fn reservoir_life(
        &self,
        load: &Driven,
        bank: &Bank<'_>,
        share: f64,
    ) -> Result<Life, Needs> {
        let missing = |part: &str| match (bank.on_board, self.build.supply.get()) {
            (false, Some((supply, _))) => supply.reservoir.missing_part(part),
            _ => self.build.amplifier.board_reservoir.missing_part(part),
        };
        let stated = bank.stated;
        let rated = both(
            stated.life.ok_or_else(|| missing("life")),
            stated.ripple.ok_or_else(|| missing("ripple")),
        );
        let (((length, at), rating), flow, air) =
            three(rated, self.duty_flow(load), self.air_inside())?;
        let rise = if at >= LONG_LIFE_TYPE {
            Kelvin(5.0)
        } else {
            Kelvin(10.0)
        };
        self.assume(
            format!("{} core rise at rated ripple", bank.part.name),
            Measure::new(rise.0, "K"),
            "usual for this temperature class",
            stated.site,
        );
        let plain = RippleMultipliers {
            charging: 1.0,
            audio: 1.0,
        };
        let ripple =
            reservoir_ripple(flow.ripple_charging, flow.ripple_audio, plain).map(|all| all * share);
        let life = ripple.and_then(|ripple| {
            let core = core_temperature(air, ripple, rating, rise)?;
            let stated_hours = length.0 / 3600.0;
            Some(Life {
                ripple,
                air,
                core,
                stated_hours,
                stated_at: at,
                hours: electrolytic_life_hours(stated_hours, at, core)?,
            })
        });
        life.ok_or_else(|| Needs::because("the life of the reservoir cannot be worked out"))
    }

    /// The most loaded emitter resistor of either side at the duty.
    ///
    /// The signal's part is mean(i²)·RE/2N², times the square of the share; the idle current's Iq²·RE
    /// is added whole. The resistor is the worst of its tolerance, with the share that follows from it.
    ///
    /// # Errors
    /// What output stage or build do not state.
    pub fn emitter_resistor(&self, heat: &Heat) -> Result<(Warm, f64, Watt), Needs> {
        let stage = self.output();
        let (resistor, (bench, idle), air) = three(
            stage.emitter.need(),
            both(self.bench(), self.idle()),
            self.air_inside(),
        )?;
        let rated = stage.emitter.part("W", |r| r.watt)?;
        let signal = self.sine(heat.duty.amplitude, heat.duty.load)?;
        let mean = heat.duty.peak / crate::physics::math::PI;
        let mut worst: Option<(Watt, f64, Watt)> = None;
        for side in super::case::Side::BOTH {
            // a low resistor takes more of the current, a high one more watts from the same current
            for own in [resistor.ohm.low, resistor.ohm.nominal, resistor.ohm.high] {
                let Some(bank) = bench.bank(side).with_own_resistor(own) else {
                    continue;
                };
                let share = bank.share(mean);
                let alone = idle * bank.share(idle * f64::from(bank.devices()));
                let still = Watt(alone.0 * alone.0 * own.0);
                let watts = signal.emitter_watts(bank.devices(), own, share) + still;
                if worst.is_none_or(|w| watts > w.0) {
                    worst = Some((watts, share, still));
                }
            }
        }
        let (watts, share, still) = worst.ok_or_else(|| stage.pairs.missing())?;
        Ok((
            Warm {
                air,
                watts,
                rating: resistor_rating(rated, air),
            },
            share,
            still,
        ))
    }

    /// The bleeder at high mains, for ever: V²/R with the least resistance.
    ///
    /// # Errors
    /// What the supply does not state.
    pub fn bleeder(&self) -> Result<(Warm, Volt), Needs> {
        let supply = self.supply()?;
        let (rail, air, (resistor, rail_to_rail)) = three(
            self.unsagged(Mains::High),
            self.air_inside(),
            supply.bleeder.need(),
        )?;
        let rated = supply.bleeder.part("W", |b| b.0.watt)?;
        let volts = if *rail_to_rail { rail * 2.0 } else { rail };
        let watts = volts * (volts / resistor.ohm.low);
        if !watts.is_finite() {
            return Err(Needs::because("the bleeder must have a resistance"));
        }
        Ok((
            Warm {
                air,
                watts,
                rating: resistor_rating(rated, air),
            },
            volts,
        ))
    }
}
