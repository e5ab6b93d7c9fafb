//! The drive chain at full output: what each follower carries and asks for, and the drivers' heat and
//! locus.
//! Must not know what is allowed.

use std::rc::Rc;

use super::case::{Case, Side};
use super::chain::no_gain;
use super::heat::{Heat, case_to_sink};
use super::loads::Driven;
use super::rails::Mains;
use crate::build::Needs;
use crate::build::parts::{Flavour, Stage as Stated, both};
use crate::physics::drive::Stage;
use crate::physics::unit::{Amp, Celsius, Hertz, Ohm, Volt, Watt};

/// One follower of the chain while the output swings to its peak.
#[derive(Clone, Debug)]
pub struct Link {
    /// The stage.
    pub stage: Rc<Stated>,
    /// Current of its bank.
    pub carries: Amp,
    /// Greatest current that the stage before gives it, standing current included.
    pub asks: Amp,
    /// What its base-emitter resistor takes of that.
    pub standing: Amp,
}

/// The peak of the output into the least impedance of a load.
#[derive(Clone, Copy, Debug)]
pub struct Peak {
    /// Unsagged rail.
    pub rail: Volt,
    /// Peak output, V = Vu - drop.
    pub volts: Volt,
    /// Least modulus that one channel sees.
    pub modulus: Ohm,
    /// Where.
    pub frequency: Hertz,
    /// Peak current of one channel.
    pub amps: Amp,
}

impl Case<'_> {
    /// The greatest peak output there is: no load current, V = Vu - drop(0).
    ///
    /// # Errors
    /// What rails or drop lack.
    pub fn greatest_output(&self, mains: Mains) -> Result<Volt, Needs> {
        let (rail, drop) = both(self.unsagged(mains), self.drop())?;
        let volts = rail - drop.at(Amp::ZERO);
        if volts > Volt::ZERO { Ok(volts) } else { Err(Needs::because(format!("the drop takes all of the {:.1} V rail", rail.0))) }
    }

    /// The greatest peak current into a load, and where.
    ///
    /// # Errors
    /// As [`Case::burst`].
    pub fn peak_into(&self, load: &Driven, mains: Mains) -> Result<Peak, Needs> {
        let spot = load.minimum_seen();
        let (rail, (volts, amps)) = both(self.unsagged(mains), self.greatest_current(mains, load))?;
        Ok(Peak { rail, volts, modulus: spot.seen.modulus(), frequency: spot.frequency, amps })
    }

    /// The gates of a MOSFET stage take no steady current: there is no chain of base currents.
    #[must_use]
    pub fn has_base_current(&self) -> bool {
        self.output().upper.flavour == Flavour::Bipolar
    }

    /// The followers of one side from the output back, the output bank carrying a peak current.
    ///
    /// # Errors
    /// What the stages do not state, and where a gain curve ends.
    pub fn chain(&self, side: Side, peak: Amp) -> Result<Vec<Link>, Needs> {
        if self.build.amplifier.driver_field.unstated() {
            return Err(self.build.amplifier.driver_field.missing());
        }
        let mut carries = peak;
        let mut links = Vec::new();
        for stage in self.followers() {
            let bank = self.follower(stage, side)?;
            let asks = bank.greatest_demand(carries).map_err(|e| no_gain(&stage.device(side).owner.name, &e))?;
            links.push(Link { stage: stage.clone(), carries, asks, standing: bank.standing });
            carries = asks;
        }
        Ok(links)
    }

    /// The bank that a driver drives, for the models of the driver.
    ///
    /// # Errors
    /// What the output stage does not state.
    pub fn driven_bank(&self, side: Side) -> Result<Stage, Needs> {
        self.follower(self.output(), side)
    }

    /// The driver stage.
    ///
    /// # Errors
    /// When it is not stated.
    pub fn driver(&self) -> Result<&Rc<Stated>, Needs> {
        self.build.amplifier.driver.as_ref().ok_or_else(|| self.build.amplifier.driver_field.missing())
    }

    /// Mean watts of one driver device of each side at the duty of a load.
    ///
    /// # Errors
    /// What the chain does not state.
    pub fn driver_watts(&self, heat: &Heat) -> Result<[Watt; 2], Needs> {
        if !self.has_base_current() {
            // class A: the whole rail stands across it on average, whatever it plays
            let watts = heat.rail * super::devices::idle_of_stage(self.driver()?)?;
            return Ok([watts, watts]);
        }
        let watts = |side| self.driver_heat(side, heat.rail, heat.duty.amplitude, heat.duty.load);
        let (upper, lower) = both(watts(Side::Upper), watts(Side::Lower))?;
        Ok([upper, lower])
    }

    /// Case of one driver device of a side: on the build's sink, on a sink of its own, or on one that
    /// the drivers of a channel share.
    ///
    /// # Errors
    /// When its mounting is not stated.
    pub fn driver_case(&self, heat: &Heat, watts: [Watt; 2], side: Side) -> Result<Celsius, Needs> {
        let driver = self.driver()?;
        let (case_sink, pairs) = both(case_to_sink(driver), driver.pairs.need().copied())?;
        let own = watts[super::heat::at(side)];
        let sink = match driver.own_sink.get() {
            None => heat.hot_spot,
            Some((sink, per)) if *per == "device" => heat.air + own * *sink,
            Some((sink, _)) => heat.air + (watts[0] + watts[1]) * f64::from(pairs) * *sink,
        };
        Ok(sink + own * case_sink)
    }
}
