//! The drive chain: what each stage asks of the one before it.
//! Must not know ratings.

use std::rc::Rc;

use super::case::{Case, Side};
use super::devices::{gain, idle_of};
use crate::build::Needs;
use crate::build::parts::{Flavour, Stage as Stated, both};
use crate::physics::drive::{Driver, NoGain, Stage, standing_current};
use crate::physics::load::Impedance;
use crate::physics::unit::{Amp, Volt, Watt};

/// A gain that the data do not give, in words.
#[must_use]
pub fn no_gain(device: &str, why: &NoGain) -> Needs {
    match why {
        NoGain::BeyondCurve { needed, last } => Needs::because(format!(
            "the hfe curve of {device} ends at {:.3} A, {:.3} A is needed",
            last.0, needed.0
        )),
        NoGain::NoSuchCurrent => {
            Needs::because(format!("the current asked of {device} is no current"))
        }
    }
}

impl Case<'_> {
    /// One side of a bipolar stage as the chain sees it: gain, devices, and the standing current of the
    /// stage before it: what its base-emitter resistor takes, or the idle current stated for the stage
    /// before, the greater.
    ///
    /// # Errors
    /// What the stage does not state.
    pub fn follower(&self, stage: &Rc<Stated>, side: Side) -> Result<Stage, Needs> {
        let device = stage.device(side);
        let through_resistor = match stage.base_emitter.get() {
            None => Amp::ZERO,
            // the least resistor takes the most
            Some(r) => standing_current(Self::vbe(device), r.ohm.low).ok_or_else(|| {
                Needs::because(format!(
                    "the base-emitter resistor of stage {} must be positive",
                    stage.owner.name
                ))
            })?,
        };
        let standing = through_resistor.max(self.idle_before(stage)?);
        if device.flavour == Flavour::Mosfet {
            return Err(Needs::because(format!(
                "{} is a MOSFET: its gate takes no steady current",
                device.owner.name
            )));
        }
        let (gain, pairs) = both(
            gain(device, self.policy.typical_gain),
            stage.pairs.need().copied(),
        )?;
        Ok(Stage {
            gain,
            devices: pairs,
            standing,
        })
    }

    /// The idle current stated for the stage before a follower, all its devices of a side together; zero
    /// where none is stated.
    fn idle_before(&self, stage: &Rc<Stated>) -> Result<Amp, Needs> {
        let followers = self.followers();
        let before = followers
            .iter()
            .skip_while(|s| !Rc::ptr_eq(s, stage))
            .nth(1);
        let Some(before) = before else {
            return Ok(Amp::ZERO);
        };
        let groups = before.idle.get().map(Vec::as_slice).unwrap_or_default();
        let mut most = Amp::ZERO;
        for group in groups {
            most = most.max(idle_of(before, group)?);
        }
        Ok(most * f64::from(before.pairs.get().copied().unwrap_or(1)))
    }

    /// The followers from the output back: output, driver, predriver, as far as they are named.
    #[must_use]
    pub fn followers(&self) -> Vec<&Rc<Stated>> {
        let amplifier = &self.build.amplifier;
        [
            Some(&amplifier.output),
            amplifier.driver.as_ref(),
            amplifier.predriver.as_ref(),
        ]
        .into_iter()
        .flatten()
        .collect()
    }

    /// The greatest mean heat of ONE driver device of a side at any amplitude up to that of a signal,
    /// on a mean rail, and that amplitude: a driver is hottest at some four tenths of full power.
    ///
    /// # Errors
    /// What the chain does not state.
    pub fn driver_heat(
        &self,
        side: Side,
        rail: Volt,
        amplitude: Volt,
        load: Impedance,
    ) -> Result<(Volt, Watt), Needs> {
        let output = self.output();
        let driver = self
            .build
            .amplifier
            .driver
            .as_ref()
            .ok_or_else(|| self.build.amplifier.driver_field.missing())?;
        let (bank, pairs) = both(self.follower(output, side), driver.pairs.need().copied())?;
        let device = output.device(side);
        let model = Driver::new(
            &bank,
            rail,
            Self::vbe(device),
            load.modulus(),
            load.angle_rad(),
        )
        .ok_or_else(|| Needs::because("the rail leaves the driver no voltage"))?;
        // a loaded rail clips what an unsagged one would carry
        let most = (rail - Self::vbe(device)) * (1.0 - 1e-12);
        let (worst, heat) = model
            .worst_mean_heat(amplitude.min(most))
            .map_err(|e| no_gain(&device.owner.name, &e))?;
        Ok((worst, heat / f64::from(pairs.max(1))))
    }

    /// Watts that the stages before the output put on the BUILD'S heatsink, of one channel, at a signal on
    /// a mean rail.
    /// A stage with a sink of its own, or none declared, puts none. Predrivers carry a few per cent of
    /// the driver's current and are left out.
    ///
    /// # Errors
    /// What those stages do not state.
    pub fn other_watts(&self, rail: Volt, amplitude: Volt, load: Impedance) -> Result<Watt, Needs> {
        let amplifier = &self.build.amplifier;
        let mut watts = Watt::ZERO;
        if let Some(driver) = &amplifier.driver
            && driver.own_sink.get().is_none()
            && self.output().upper.flavour == Flavour::Bipolar
        {
            let pairs = f64::from(*driver.pairs.need()?);
            for side in Side::BOTH {
                let (_, one) = self.driver_heat(side, rail, amplitude, load)?;
                watts += one * pairs;
            }
        }
        if let Some(stage) = &amplifier.voltage_amplifier
            && stage.own_sink.get().is_none()
            && stage.insulator.get().is_some()
        {
            // the voltage stage and its current source each stand between a rail and the output
            watts += rail * *stage.output_current.need()? * 2.0;
        }
        Ok(watts)
    }
}
