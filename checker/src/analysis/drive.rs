//! The drive chain at full output: what each follower carries and asks for, and the driver's locus.
//! Must not know what is allowed.

use std::rc::Rc;

use super::case::{Case, Side};
use super::chain::no_gain;
use super::loads::{Driven, Spot};
use super::rails::Mains;
use crate::build::Needs;
use crate::build::parts::{Flavour, Stage as Stated, both, three};
use crate::physics::drive::{Driver, LocusPoint, NoGain, Screen, Stage};
use crate::physics::load::Impedance;
use crate::physics::safe_area::{Allowance, Coverage};
use crate::physics::unit::{Amp, Hertz, Ohm, Volt};

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

/// The worst point of a driver's locus in a load.
#[derive(Clone, Copy, Debug)]
pub struct DriverUse {
    /// Where in the band.
    pub spot: Spot,
    /// Peak output.
    pub amplitude: Volt,
    /// The point, for all drivers of one side together.
    pub point: LocusPoint,
    /// Through one driver then.
    pub amps: Amp,
    /// Allowed then.
    pub allowed: Amp,
    /// What the data cover.
    pub coverage: Coverage,
}

impl Case<'_> {
    /// The greatest peak output there is: no load current, V = Vu - drop(0).
    ///
    /// # Errors
    /// What rails or drop lack.
    pub fn greatest_output(&self, mains: Mains) -> Result<Volt, Needs> {
        let (rail, drop) = both(self.unsagged(mains), self.drop())?;
        let volts = rail - drop.at(Amp::ZERO);
        if volts > Volt::ZERO {
            Ok(volts)
        } else {
            Err(Needs::because(format!(
                "the drop takes all of the {:.1} V rail",
                rail.0
            )))
        }
    }

    /// The greatest peak current into a load, and where.
    ///
    /// # Errors
    /// As [`Case::burst`].
    pub fn peak_into(&self, load: &Driven, mains: Mains) -> Result<Peak, Needs> {
        let spot = load.minimum_seen();
        let (rail, (volts, amps)) = both(self.unsagged(mains), self.greatest_current(mains, load))?;
        Ok(Peak {
            rail,
            volts,
            modulus: spot.seen.modulus(),
            frequency: spot.frequency,
            amps,
        })
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
            let asks = bank
                .greatest_demand(carries)
                .map_err(|e| no_gain(&stage.device(side).owner.name, &e))?;
            links.push(Link {
                stage: stage.clone(),
                carries,
                asks,
                standing: bank.standing,
            });
            carries = asks;
        }
        Ok(links)
    }

    /// The driver stage.
    ///
    /// # Errors
    /// When it is not stated.
    pub fn driver(&self) -> Result<&Rc<Stated>, Needs> {
        self.build
            .amplifier
            .driver
            .as_ref()
            .ok_or_else(|| self.build.amplifier.driver_field.missing())
    }

    /// The worst point of the driver's locus in a load at full drive, nominal mains, the drivers of a
    /// side carrying alike.
    ///
    /// At every frequency of the search the locus is walked with the gain of each instant: neither the
    /// least impedance nor the worst point of the output devices is where a driver has it worst.
    ///
    /// # Errors
    /// What chain, load or supply do not state.
    pub fn driver_use(
        &self,
        load: &Driven,
        side: Side,
        allowance: &Allowance,
    ) -> Result<DriverUse, Needs> {
        let output = self.output();
        let (bank, (drivers, drop), rail) = three(
            self.follower(output, side),
            both(self.driver()?.pairs.need().copied(), self.drop()),
            self.unsagged(Mains::Nominal),
        )?;
        let drivers = f64::from(drivers.max(1));
        let peak = self.peak_into(load, Mains::Nominal)?;
        // a gain that ends before the peak is told as such
        bank.demand(peak.amps)
            .map_err(|e| no_gain(&output.device(side).owner.name, &e))?;
        let vbe = Self::vbe(output.device(side));
        let nothing = || {
            Needs::because(format!(
                "load {} cannot be driven on the {:.1} V rail",
                load.name, rail.0
            ))
        };
        let walk = Walk {
            bank: &bank,
            rail,
            vbe,
            drivers,
            allowance,
        };
        let highest = rail - vbe + peak.volts.max(self.greatest_output(Mains::Nominal)?);
        let screen = walk.screen(peak.amps, highest);
        let burst = |seen: Impedance| drop.burst(rail, seen.modulus());
        let band = self.band()?;
        let inputs = (load.identity, &walk, &drop, (band, peak.amps, highest));
        let found = self.memory.recall("use of a driver", &inputs, || {
            let rough = |_, z| {
                let driver = burst(z).zip(walk.driver(z));
                driver.map_or(f64::NAN, |(v, d)| d.roughly_worst(v, &screen))
            };
            let exact = |_, z| {
                let point = burst(z).and_then(|v| walk.worst(z, v, &screen).ok());
                point.map_or(f64::NAN, |point| point.used)
            };
            load.worst_screened(band, rough, exact).ok_or_else(nothing)
        })?;
        let amplitude = burst(found.seen).ok_or_else(nothing)?;
        let name = &output.device(side).owner.name;
        let point = walk
            .worst(found.seen, amplitude, &screen)
            .map_err(|e| no_gain(name, &e))?;
        Ok(DriverUse {
            spot: found,
            amplitude,
            amps: point.amps / drivers,
            allowed: allowance.allowed(point.volts),
            coverage: walk.coverage(found.seen, amplitude)?,
            point,
        })
    }
}

/// The drivers of one side, their bank and what they are allowed.
#[derive(Debug)]
struct Walk<'a> {
    bank: &'a Stage,
    rail: Volt,
    /// VBE of the bank.
    vbe: Volt,
    drivers: f64,
    allowance: &'a Allowance,
}

impl Walk<'_> {
    /// Their use in tables, for bank currents and voltages up to these.
    fn screen(&self, most: Amp, highest: Volt) -> Screen {
        let allowed = |v| self.allowance.allowed(v).0;
        Screen::new(self.bank, most, highest, |v| {
            1.0 / (self.drivers * allowed(v))
        })
    }

    fn driver(&self, z: Impedance) -> Option<Driver<'_>> {
        Driver::new(self.bank, self.rail, self.vbe, z.modulus(), z.angle_rad())
    }

    /// The worst point at an amplitude into an impedance.
    fn worst(&self, z: Impedance, amplitude: Volt, screen: &Screen) -> Result<LocusPoint, NoGain> {
        let used = |volts: Volt, amps: Amp| amps / self.drivers / self.allowance.allowed(volts);
        self.driver(z)
            .ok_or(NoGain::NoSuchCurrent)?
            .worst_on_locus(amplitude, screen, used)
    }

    /// What the data cover of that locus.
    fn coverage(&self, z: Impedance, amplitude: Volt) -> Result<Coverage, Needs> {
        let wrong = || Needs::because("the rail leaves the driver no voltage");
        // the other half-cycle leaves the standing current at the greatest voltage
        let highest = self.rail - self.vbe + amplitude;
        let standing = self.bank.standing / self.drivers;
        let reach = self.allowance.point_usage(highest, standing);
        let reach = reach.ok_or_else(wrong)?.coverage;
        let driver = self.driver(z).ok_or_else(wrong)?;
        Ok(match reach {
            Coverage::EndsAt { volts, .. } => {
                let part = driver.current_beyond(volts, amplitude);
                // one per cent of the peak current beyond the end of a curve does not matter
                if part <= 0.01 {
                    Coverage::Whole
                } else {
                    Coverage::EndsAt {
                        volts,
                        fraction: part,
                    }
                }
            }
            Coverage::AboveBreakdown if self.bank.standing <= Amp::ZERO => Coverage::Whole,
            other => other,
        })
    }
}
