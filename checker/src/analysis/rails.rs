//! The rails at low, nominal and high mains: unloaded, unsagged, and loaded with a current.
//! Must not know what draws the current.

use super::case::{Case, solved, stated};
use super::margins::Stress;
use crate::build::Needs;
use crate::build::parts::{Field, Rails as Given, three};
use crate::finding::{Measure, Site, Witness};
use crate::physics::supply::{self, Cycle, Rail, RailParts, Rectifier, Transformer};
use crate::physics::unit::{Amp, Farad, Ohm, Volt};

/// Where in the declared mains range.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Mains {
    /// Bottom.
    Low,
    /// Nominal.
    Nominal,
    /// Top.
    High,
}

impl Mains {
    /// As reports say it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Low => "low",
            Self::Nominal => "nominal",
            Self::High => "high",
        }
    }
}

/// The rails of a build. Both rails are alike; volts are of one rail to ground.
#[derive(Clone, Debug)]
pub enum Rails {
    /// From transformer, rectifier and reservoir.
    Made(Box<Made>),
    /// As the build states them.
    Given {
        /// The figures.
        rails: Given,
        /// The line.
        site: Site,
    },
}

/// A solved supply.
#[derive(Clone, Debug)]
pub struct Made {
    /// One transformer on the tap in use.
    pub transformer: Transformer,
    /// How the windings are rectified.
    pub rectifier: Rectifier,
    /// How many transformers the supply has.
    pub transformers: u32,
    /// Windings in parallel on one rail.
    pub parallel: u32,
    /// Channels that one supply feeds.
    pub channels: u32,
    /// Supplies in the build.
    pub supplies: u32,
    /// Capacitance per rail: low, nominal, high.
    pub reservoir: [Farad; 3],
    /// ESR per rail; zero where not every capacitor states its own.
    pub esr: Ohm,
    /// Drop of one rail's charging path.
    pub diodes: Volt,
    /// Source resistance of one rail: windings, leads and mains.
    pub source: Ohm,
    /// The part of it that stands in the mains.
    pub mains_resistance: Ohm,
    /// Low, nominal, high mains, V r.m.s.
    pub mains: [Volt; 3],
    /// The tap in use.
    pub tap: Volt,
}

/// A rail under load.
#[derive(Clone, Copy, Debug)]
pub struct Loaded {
    /// Mean.
    pub mean: Volt,
    /// Lowest.
    pub trough: Volt,
    /// Highest.
    pub crest: Volt,
    /// The whole cycle, where a supply was solved.
    pub cycle: Option<Cycle>,
}

/// Which end of the capacitors' tolerance.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reservoir {
    /// Least capacitance.
    Low,
    /// As stated.
    Nominal,
    /// Greatest capacitance.
    High,
}

impl Reservoir {
    /// As reports say it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Low => "low",
            Self::Nominal => "nominal",
            Self::High => "high",
        }
    }
}

impl Case<'_> {
    /// The rails.
    ///
    /// # Errors
    /// What the supply does not state.
    pub fn rails(&self) -> Result<&Rails, Needs> {
        self.rails
            .get_or_init(|| self.solve_rails())
            .as_ref()
            .map_err(Clone::clone)
    }

    /// The solved supply.
    ///
    /// # Errors
    /// What it lacks; given rails have no supply.
    pub fn made(&self) -> Result<&Made, Needs> {
        match self.rails()? {
            Rails::Made(made) => Ok(made),
            Rails::Given { .. } => Err(self.build.supply.missing()),
        }
    }

    /// The transformer of the supply on the tap in use, with the tap.
    ///
    /// # Errors
    /// What the transformer or the mains line does not state.
    pub fn transformer(&self) -> Result<(Transformer, Volt), Needs> {
        let supply = self.supply()?;
        let t = &supply.transformer;
        let (primary, (windings, volts), va) = three(
            t.primary.need(),
            t.secondary.need().copied(),
            t.rating.need().copied(),
        )?;
        let region = self.region()?;
        let tap = match (region.tap, primary.as_slice()) {
            (Some(tap), _) => tap,
            (None, [only]) => *only,
            (None, _) => return Err(self.build.mains.missing_part("tap")),
        };
        let wrong = || {
            Needs::because(format!(
                "transformer {} does not make sense: rating, volts and regulation must be positive",
                t.owner.name
            ))
        };
        let regulation = match (t.resistance.get(), t.regulation.get()) {
            (Some((primary, secondary)), _) => {
                supply::regulation_from_resistances(tap, volts, windings, va, *primary, *secondary)
                    .ok_or_else(wrong)?
            }
            (None, Some(rho)) => *rho,
            (None, None) if t.regulation.unstated() => {
                let rho = supply::assumed_regulation(va).ok_or_else(wrong)?;
                let key = format!("transformer {} regulation", t.owner.name);
                self.assume(
                    key,
                    Measure::new(100.0 * rho, "%"),
                    "usual for a toroid of this VA, from memory",
                    t.owner.site,
                );
                rho
            }
            (None, None) => return Err(t.regulation.missing()),
        };
        let transformer =
            Transformer::new(tap, volts, windings, va, regulation).ok_or_else(wrong)?;
        Ok((transformer, tap))
    }

    fn solve_rails(&self) -> Result<Rails, Needs> {
        let build = self.build;
        if build.supply.get().is_none() {
            if let Some(rails) = build.rails.get() {
                return Ok(Rails::Given {
                    rails: *rails,
                    site: build.rails.site(),
                });
            }
            return Err(build.supply.missing());
        }
        let (supply, carried) = build.supply.need()?;
        let ((transformer, tap), rectifier, reservoir) = three(
            self.transformer(),
            supply.rectifier.need(),
            supply.reservoir.need(),
        )?;
        let region = self.region()?;
        let channels = self.channels()?;
        let name = &supply.owner.name;
        let windings = supply.transformer.secondary.need()?.0 * supply.transformers;
        if windings < 2 || windings % 2 == 1 {
            let why = format!(
                "supply {name} has {windings} winding(s): two rails need an even number, or a centre-tapped total"
            );
            return Err(Needs::because(why));
        }
        let parallel = windings / 2;
        let kind = match rectifier.bridges {
            1 => Rectifier::CentreTap,
            _ => Rectifier::PerWinding,
        };
        let boards_fed = (*carried).div_ceil(
            build
                .amplifier
                .channels_per_board
                .get()
                .copied()
                .unwrap_or(1)
                .max(1),
        );
        let mut groups: Vec<(u32, [Farad; 3], Option<Ohm>)> = reservoir
            .iter()
            .map(|r| (r.count, [r.farad.low, r.farad.nominal, r.farad.high], r.esr))
            .collect();
        if let Some(r) = build.amplifier.board_reservoir.get() {
            groups.push((
                r.count * boards_fed,
                [r.farad.low, r.farad.nominal, r.farad.high],
                r.esr,
            ));
        }
        let mut total = [Farad::ZERO; 3];
        let mut esr = Ohm::ZERO;
        for (end, sum) in total.iter_mut().enumerate() {
            let parts: Vec<supply::Reservoir> = groups
                .iter()
                .map(|(n, c, e)| supply::Reservoir {
                    count: *n,
                    capacitance: c[end],
                    esr: *e,
                })
                .collect();
            let found = supply::in_parallel(&parts).ok_or_else(|| {
                Needs::because(format!("the reservoir of supply {name} has no capacitance"))
            })?;
            (*sum, esr) = found;
        }
        let loop_resistance = region.loop_resistance.unwrap_or(Ohm::ZERO);
        // every winding behind the mains resistance charges at the same time
        let supplies = channels.div_ceil(*carried);
        let mains_resistance = transformer.referred(loop_resistance, windings * supplies);
        let wiring = supply.wiring.get().copied().unwrap_or(Ohm::ZERO);
        let source = (transformer.winding_resistance() + wiring * kind.leads() + mains_resistance)
            / f64::from(parallel);
        let diodes = kind.drop(rectifier.drop);
        let made = Made {
            transformer,
            rectifier: kind,
            transformers: supply.transformers,
            parallel,
            channels: *carried,
            supplies,
            reservoir: total,
            esr,
            diodes,
            source,
            mains_resistance,
            mains: [region.low, region.nominal, region.high],
            tap,
        };
        // one rail that cannot be solved is a fault of the data, found here and not in every rule
        made.rail(Mains::Nominal, Reservoir::Nominal, region.frequency)
            .ok_or_else(|| {
                Needs::because(format!(
                    "supply {name} gives no rail: the diode drops take all of its voltage"
                ))
            })?;
        Ok(Rails::Made(Box::new(made)))
    }

    /// V0 = m·√2·Vs·(1 + ρ): a rail with no current and no diode drop.
    ///
    /// # Errors
    /// What the supply lacks; given rails state high mains or not at all.
    pub fn no_load(&self, mains: Mains) -> Result<Volt, Needs> {
        if self.build.supply.get().is_some() {
            let (transformer, tap) = self.transformer()?;
            let windings =
                self.supply()?.transformer.secondary.need()?.0 * self.supply()?.transformers;
            if windings < 2 {
                self.rails()?;
            }
            let region = self.region()?;
            let volts = match mains {
                Mains::Low => region.low,
                Mains::Nominal => region.nominal,
                Mains::High => region.high,
            };
            return Ok(transformer.no_load_crest(volts / tap));
        }
        let rails = self
            .build
            .rails
            .need()
            .map_err(|_| self.build.supply.missing())?;
        match mains {
            Mains::Nominal => Ok(rails.idle),
            Mains::High => rails
                .high
                .ok_or_else(|| self.build.rails.missing_part("high")),
            Mains::Low => Err(self.build.supply.missing()),
        }
    }

    /// Vu = V0 - Vd: an unsagged rail.
    ///
    /// # Errors
    /// As [`Case::rails`].
    pub fn unsagged(&self, mains: Mains) -> Result<Volt, Needs> {
        match self.rails()? {
            Rails::Made(made) => Ok(made
                .transformer
                .no_load_crest(made.mains_volts(mains) / made.tap)
                - made.diodes),
            Rails::Given { .. } => self.no_load(mains),
        }
    }

    /// The rail with a steady current drawn from it by ALL channels of one supply.
    ///
    /// # Errors
    /// As [`Case::rails`], and when the supply cannot give this current.
    pub fn loaded(
        &self,
        mains: Mains,
        reservoir: Reservoir,
        current: Amp,
    ) -> Result<Loaded, Needs> {
        match self.rails()? {
            Rails::Made(made) => {
                let rail = made.rail(mains, reservoir, self.region()?.frequency);
                let cycle = rail.and_then(|r| r.loaded(current));
                let cycle = cycle.ok_or_else(|| {
                    Needs::because(format!(
                        "the supply cannot give {:.3} A at {} mains",
                        current.0,
                        mains.name()
                    ))
                })?;
                Ok(Loaded {
                    mean: cycle.mean(),
                    trough: cycle.trough(),
                    crest: cycle.crest(),
                    cycle: Some(cycle),
                })
            }
            Rails::Given { rails, .. } => {
                if rails.at <= Amp::ZERO || rails.loaded > rails.idle {
                    return Err(Needs::because("the given rails do not fall with current"));
                }
                let share = match mains {
                    Mains::Nominal => 1.0,
                    Mains::High => self.no_load(mains)? / rails.idle,
                    Mains::Low => return Err(self.build.supply.missing()),
                };
                let volts = rails.idle * share - (rails.idle - rails.loaded) * (current / rails.at);
                if volts <= Volt::ZERO {
                    return Err(Needs::because(format!(
                        "the given rails are gone at {:.3} A",
                        current.0
                    )));
                }
                Ok(Loaded {
                    mean: volts,
                    trough: volts,
                    crest: volts,
                    cycle: None,
                })
            }
        }
    }

    /// Channels that share one supply; all of them where rails are given.
    ///
    /// # Errors
    /// When the channels are not stated.
    pub fn channels_per_supply(&self) -> Result<u32, Needs> {
        match self.build.supply.get() {
            Some((_, n)) => Ok(*n),
            None => Ok(1.max(self.channels()?)),
        }
    }

    /// Mains volts at a level, where there are mains.
    #[must_use]
    pub fn mains_volts(&self, mains: Mains) -> Option<f64> {
        self.region.map(|r| {
            match mains {
                Mains::Low => r.low,
                Mains::Nominal => r.nominal,
                Mains::High => r.high,
            }
            .0
        })
    }
}

impl Made {
    /// Mains volts at a level.
    #[must_use]
    pub fn mains_volts(&self, mains: Mains) -> Volt {
        match mains {
            Mains::Low => self.mains[0],
            Mains::Nominal => self.mains[1],
            Mains::High => self.mains[2],
        }
    }

    /// The rail at a mains level and an end of the capacitors' tolerance.
    #[must_use]
    pub fn rail(
        &self,
        mains: Mains,
        reservoir: Reservoir,
        frequency: crate::physics::unit::Hertz,
    ) -> Option<Rail> {
        let farad = match reservoir {
            Reservoir::Low => self.reservoir[0],
            Reservoir::Nominal => self.reservoir[1],
            Reservoir::High => self.reservoir[2],
        };
        Rail::new(RailParts {
            no_load_crest: self
                .transformer
                .no_load_crest(self.mains_volts(mains) / self.tap),
            diode_drop: self.diodes,
            source: self.source,
            reservoir: farad,
            esr: self.esr,
            mains: frequency,
        })
    }
}

/// Voltage across a device that stands between the two driver supplies.
#[derive(Clone, Copy, Debug)]
pub struct Across {
    /// Rail, no load, high mains.
    pub rail: Volt,
    /// How much higher the driver supply is.
    pub above: Volt,
}

impl Across {
    /// Rail to rail.
    #[must_use]
    pub fn volts(self) -> Volt {
        (self.rail + self.above) * 2.0
    }

    /// Ready to be compared with a breakdown voltage.
    #[must_use]
    pub fn against(self, case: &Case<'_>, rating: Volt, stated_in: &Field<Volt>) -> Stress {
        let mut working = vec![solved(
            "V0",
            "rail, no load, high mains",
            "m·√2·Vs·(1 + ρ)",
            self.rail.0,
            "V",
            "definition of regulation",
        )];
        if self.above > Volt::ZERO {
            working.push(solved(
                "Vdr",
                "driver supply above the rail, high mains",
                "stated x V0(high)/V0(nominal)",
                self.above.0,
                "V",
                "",
            ));
        }
        working.push(solved(
            "V",
            "across the device that is off",
            "V0+ + V0- + 2·Vdr",
            self.volts().0,
            "V",
            "node voltages",
        ));
        working.push(stated(
            "V(BR)",
            "breakdown voltage",
            rating.0,
            "V",
            stated_in.stated_at(),
        ));
        Stress {
            value: self.volts().0,
            rating: rating.0,
            witness: Witness {
                mains_v: case.mains_volts(Mains::High),
                rail_v: Some(self.rail.0),
                device_v: Some(self.volts().0),
                channels_driven: None,
                ..case.witness()
            },
            working,
            related: case.rail_sites(stated_in.stated_at().map(|site| ("the rating", site))),
            ..Stress::default()
        }
    }
}

impl Case<'_> {
    /// How much higher than the output rail the drivers are fed, at high mains: the greatest that
    /// output stage or driver state, in proportion to the mains.
    fn drivers_above(&self, rail: Volt) -> Result<Volt, Needs> {
        let amplifier = &self.build.amplifier;
        let stages = [
            Some(&amplifier.output),
            amplifier.driver.as_ref(),
            amplifier.voltage_amplifier.as_ref(),
        ];
        let above = stages
            .into_iter()
            .flatten()
            .filter_map(|s| s.driver_rail.get().copied())
            .fold(Volt::ZERO, Volt::max);
        if above <= Volt::ZERO {
            return Ok(Volt::ZERO);
        }
        Ok(above * (rail / self.no_load(Mains::Nominal)?))
    }

    /// What stands across a device between the two driver supplies: high mains, no load.
    ///
    /// # Errors
    /// As [`Case::no_load`].
    pub fn across_drivers(&self) -> Result<Across, Needs> {
        let rail = self.no_load(Mains::High)?;
        Ok(Across {
            rail,
            above: self.drivers_above(rail)?,
        })
    }

    /// The driver supply to ground, high mains, no load.
    ///
    /// # Errors
    /// As [`Case::no_load`].
    pub fn driver_supply(&self) -> Result<Volt, Needs> {
        let across = self.across_drivers()?;
        Ok(across.rail + across.above)
    }
}
