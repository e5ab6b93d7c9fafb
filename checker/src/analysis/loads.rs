//! The loads of a build as one channel sees them.
//! Must not know what drives them.

use std::rc::Rc;

use super::case::{Case, Tables};
use super::memory::Identity;
use crate::build::Needs;
use crate::build::parts::{Load as Stated, LoadKind};
use crate::finding::{Measure, Site};
use crate::physics::load::{Band, Impedance, Load, Resonance, Survey, Variant, VoiceCoil, Worst};
use crate::physics::math::PI;
use crate::physics::unit::{Celsius, Hertz, Ohm};
use crate::policy::Policy;

/// A declared load, as one channel sees it.
#[derive(Clone, Debug)]
pub struct Driven {
    /// Its name.
    pub name: String,
    /// Its header.
    pub site: Site,
    /// The impedance with a cold coil, between the load's own two terminals.
    pub load: Load,
    /// Rated (or least) resistance BETWEEN THE LOAD'S TERMINALS, for powers and duty.
    pub nominal: Ohm,
    /// Each channel sees half: the load stands between two outputs.
    pub bridged: bool,
    /// Extremes of the impedance between the load's terminals, within the band.
    pub survey: Survey,
    /// The declared load.
    pub stated: Rc<Stated>,
    /// Frequencies for which the impedance is known.
    pub covered: Band,
    /// Of the impedance that one channel sees.
    pub identity: Identity,
}

/// A place on the impedance of a load where something is worst, as one channel sees it.
#[derive(Clone, Copy, Debug)]
pub struct Spot {
    /// What was searched for.
    pub value: f64,
    /// Frequency.
    pub frequency: Hertz,
    /// Impedance that ONE CHANNEL sees.
    pub seen: Impedance,
    /// The variant of the load.
    pub variant: Variant,
}

impl Driven {
    /// What one channel sees of an impedance between the load's terminals.
    #[must_use]
    pub fn seen(&self, z: Impedance) -> Impedance {
        if self.bridged { z.halved() } else { z }
    }

    /// The nominal resistance that one channel sees.
    #[must_use]
    pub fn nominal_seen(&self) -> Ohm {
        if self.bridged {
            self.nominal / 2.0
        } else {
            self.nominal
        }
    }

    /// Least modulus that one channel sees.
    #[must_use]
    pub fn minimum_seen(&self) -> Spot {
        let w = self.survey.minimum;
        let seen = self.seen(w.impedance);
        Spot {
            value: seen.modulus().0,
            frequency: w.frequency,
            seen,
            variant: w.variant,
        }
    }

    /// That part of the band is not known: a table covers less.
    #[must_use]
    pub fn uncovered(&self, band: Band) -> Option<Needs> {
        (self.covered != band).then(|| {
            let (from, to) = (self.covered.bottom().0, self.covered.top().0);
            Needs::because(format!(
                "the table of load {} covers {from:.0} Hz to {to:.0} Hz of the band only",
                self.name
            ))
        })
    }

    /// Where `objective` of what one channel sees is greatest within the band.
    pub fn worst(&self, band: Band, objective: impl Fn(Hertz, Impedance) -> f64) -> Option<Spot> {
        let found = self.load.worst(band, |f, z| objective(f, self.seen(z)))?;
        Some(self.spot(found))
    }

    /// The same with a cheap `rough` objective that tells where to look, see
    /// [`crate::physics::load::Sampled::worst_screened`].
    pub fn worst_screened(
        &self,
        band: Band,
        rough: impl Fn(Hertz, Impedance) -> f64,
        objective: impl Fn(Hertz, Impedance) -> f64,
    ) -> Option<Spot> {
        let found = self.load.sampled(band)?.worst_screened(
            |f, z| rough(f, self.seen(z)),
            |f, z| objective(f, self.seen(z)),
        )?;
        Some(self.spot(found))
    }

    fn spot(&self, worst: Worst) -> Spot {
        Spot {
            value: worst.value,
            frequency: worst.frequency,
            seen: self.seen(worst.impedance),
            variant: worst.variant,
        }
    }
}

impl Case<'_> {
    /// The loads in order of declaration, each solved or with what it lacks.
    ///
    /// # Errors
    /// When the build states no loads.
    pub fn loads(&self) -> Result<&[Result<Driven, Needs>], Needs> {
        let stated = self.build.loads.need()?;
        Ok(self
            .loads
            .get_or_init(|| stated.iter().map(|l| self.drive(l)).collect()))
    }

    fn drive(&self, stated: &Rc<Stated>) -> Result<Driven, Needs> {
        let load = physics_load(stated, self.policy, self.tables)?;
        // a cold coil lets the most current through
        let coldest = self.coldest().unwrap_or(Celsius(20.0)).min(Celsius(20.0));
        let cold = load.with_coil_at(coldest).unwrap_or(load);
        let band = self.band()?;
        let covered = cold.covered(band).ok_or_else(|| {
            Needs::because(format!(
                "the table of load {} covers none of the band",
                stated.owner.name
            ))
        })?;
        let survey = cold.survey(band).ok_or_else(|| {
            Needs::because(format!(
                "the impedance of load {} cannot be surveyed",
                stated.owner.name
            ))
        })?;
        let nominal = match stated
            .nominal
            .get()
            .copied()
            .or_else(|| rated(&stated.kind))
        {
            Some(z) => z,
            None => {
                let least = survey.minimum.impedance.modulus();
                let key = format!("load {} nominal", stated.owner.name);
                self.assume(
                    key,
                    Measure::new(least.0, "ohm"),
                    "its least modulus",
                    stated.owner.site,
                );
                least
            }
        };
        Ok(Driven {
            name: stated.owner.name.clone(),
            site: stated.owner.site,
            identity: Identity::of(&(&cold, self.build.bridged)),
            load: cold,
            nominal,
            bridged: self.build.bridged,
            survey,
            stated: stated.clone(),
            covered,
        })
    }
}

/// The rated resistance of a load that states none of its own: a resistor's, or that of its parts in
/// parallel where each has one.
fn rated(kind: &LoadKind) -> Option<Ohm> {
    match kind {
        LoadKind::Resistive(r) => Some(r.nominal),
        LoadKind::Parallel(loads) => {
            let mut siemens = 0.0;
            for load in loads {
                siemens += 1.0 / load.nominal.get().copied().or_else(|| rated(&load.kind))?.0;
            }
            (siemens > 0.0).then(|| Ohm(1.0 / siemens))
        }
        _ => None,
    }
}

/// A declared load as a model, its coil at 20 degC.
///
/// # Errors
/// What it does not state, or why its values are no load.
pub fn physics_load(stated: &Stated, policy: &Policy, tables: &Tables) -> Result<Load, Needs> {
    let wrong = || {
        Needs::because(format!(
            "the values of load {} are no passive load",
            stated.owner.name
        ))
    };
    let dc = stated.dc.get().copied();
    match &stated.kind {
        LoadKind::Resistive(r) => {
            // the two ends as stated, even where they are not alike
            let (middle, half) = ((r.low + r.high) / 2.0, (r.high - r.low) / 2.0);
            Load::resistive(middle, half / middle).ok_or_else(wrong)
        }
        LoadKind::Nominal(_, minimum, angle) => {
            let degrees = angle.get().copied().unwrap_or(policy.angle_deg);
            Load::nominal(*minimum.need()?, degrees * PI / 180.0, dc).ok_or_else(wrong)
        }
        LoadKind::VoiceCoil(re, le, lossy, resonances) => Load::voice_coil(VoiceCoil {
            resistance: *re,
            inductance: *le,
            loss_exponent: lossy.unwrap_or(1.0),
            resonances: resonances
                .iter()
                .map(|(f, m, e)| Resonance {
                    frequency: *f,
                    mechanical_q: *m,
                    electrical_q: *e,
                })
                .collect(),
        })
        .ok_or_else(wrong),
        LoadKind::Table(_, site) => {
            let table = tables
                .get(site)
                .cloned()
                .unwrap_or_else(|| Err(stated.line.missing()))?;
            Load::table(table, dc).ok_or_else(wrong)
        }
        LoadKind::Parallel(loads) => {
            let members = loads
                .iter()
                .map(|l| physics_load(l, policy, tables))
                .collect::<Result<Vec<_>, _>>()?;
            Load::parallel(&members).ok_or_else(wrong)
        }
        LoadKind::Unstated => Err(stated.line.missing()),
    }
}
