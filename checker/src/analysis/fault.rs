//! A rail stuck on the loudspeaker: what the coil and the contact see, and how long it lasts.
//! Must not know what is allowed.

use std::rc::Rc;

use super::case::Case;
use super::devices::emitter;
use super::loads::Driven;
use super::rails::Mains;
use crate::build::Needs;
use crate::build::parts::{Detector as Stated, FuseLine, Load, LoadKind, Protection, both, three};
use crate::finding::{Measure, Site};
use crate::physics::fuse::{Speed, melting};
use crate::physics::protection::{DcFault, Detector};
use crate::physics::unit::{Amp, Ohm, Second, Volt};

/// Release time of a relay that states none: usual for small power relays, common practice.
const RELEASE: Second = Second(0.010);

/// A d.c. fault at one load.
#[derive(Clone, Copy, Debug)]
pub struct Fault {
    /// The rail that stands on the load.
    pub rail: Volt,
    /// Cold coil, or the resistor at its lowest.
    pub coil: Ohm,
    /// The emitter resistors of the failed bank in parallel.
    pub series: Ohm,
    /// The two in series on the rail.
    pub model: DcFault,
}

/// How a detector ends a fault.
#[derive(Clone, Copy, Debug)]
pub struct Off {
    /// From a capacitor at rest to the threshold; `None`: this rail never trips it.
    pub detected: Option<Second>,
    /// The same when music has just left the capacitor at the other threshold.
    pub worst: Option<Second>,
    /// From there until contact or switch is open.
    pub release: Second,
    /// The greater threshold.
    pub threshold: Volt,
    /// Filter time constant.
    pub time_constant: Second,
}

impl Off {
    /// From the fault to the open contact.
    #[must_use]
    pub fn time(&self) -> Option<Second> {
        self.detected.map(|t| t + self.release)
    }
}

/// A fuse that stands alone between a rail and the loudspeaker.
#[derive(Clone, Debug)]
pub struct Alone {
    /// The fuse.
    pub fuse: FuseLine,
    /// The latest that it has melted; `None`: nothing is promised.
    pub melted: Option<Second>,
}

/// The load, or its member, that does not state a d.c. resistance.
fn without_dc(load: &Rc<Load>) -> Needs {
    match &load.kind {
        LoadKind::Parallel(members) => members
            .iter()
            .find(|m| !has_dc(m))
            .map_or_else(|| load.dc.missing(), without_dc),
        _ => load.dc.missing(),
    }
}

fn has_dc(load: &Load) -> bool {
    match &load.kind {
        LoadKind::Resistive(_) | LoadKind::VoiceCoil(..) => true,
        LoadKind::Parallel(members) => members.iter().all(|m| has_dc(m)),
        _ => load.dc.get().is_some(),
    }
}

impl Case<'_> {
    /// Resistance of a load to direct current: the coil as cold as the room may be, a resistor at its
    /// lowest.
    ///
    /// # Errors
    /// When the load does not state it.
    pub fn coil(&self, load: &Driven) -> Result<Ohm, Needs> {
        match &load.stated.kind {
            LoadKind::Resistive(r) => Ok(r.low),
            _ => load.load.dc().ok_or_else(|| without_dc(&load.stated)),
        }
    }

    /// One half of the output stage stuck at its rail, into a load.
    ///
    /// # Errors
    /// What load, output stage or supply do not state.
    pub fn fault(&self, load: &Driven, rail: Volt) -> Result<Fault, Needs> {
        let stage = self.output();
        let re = stage
            .emitter
            .get()
            .map_or_else(|| emitter(stage), |r| Ok(r.ohm.low));
        let (coil, re, pairs) = three(self.coil(load), re, stage.pairs.need().copied())?;
        let series = re / f64::from(pairs.max(1));
        let model = DcFault::new(rail, coil, series)
            .ok_or_else(|| Needs::because(format!("load {} makes no d.c. fault", load.name)))?;
        Ok(Fault {
            rail,
            coil,
            series,
            model,
        })
    }

    /// The protection and its detector; `None` where it is known that there is none.
    ///
    /// # Errors
    /// When neither is stated.
    pub fn detector(&self) -> Result<Option<(&Rc<Protection>, &Stated)>, Needs> {
        if self.build.protection.none {
            return Ok(None);
        }
        let protection = self.protection()?;
        if protection.detector.none {
            return Ok(None);
        }
        Ok(Some((protection, protection.detector.need()?)))
    }

    /// How long what the detector moves takes to open.
    fn release(&self, protection: &Protection) -> Result<Second, Needs> {
        let contacts = protection.contacts.get();
        if let Some(time) = contacts.and_then(|c| c.release) {
            return Ok(time);
        }
        if let Some(time) = protection
            .switch
            .get()
            .and_then(|s| s.3)
            .filter(|_| contacts.is_none())
        {
            return Ok(time);
        }
        let opens = contacts.is_some()
            || protection.relay.get().is_some()
            || protection.switch.get().is_some();
        if opens {
            let key = format!("protection {} contacts release", protection.owner.name);
            self.assume(
                key,
                Measure::new(RELEASE.0, "s"),
                "usual for small power relays",
                protection.contacts.site(),
            );
            return Ok(RELEASE);
        }
        if protection.crowbar.get().is_some() {
            return Ok(Second::ZERO);
        }
        Err(protection.contacts.missing())
    }

    /// How the detector ends a fault at a rail, the slower of the two polarities; `None` where there is
    /// no detector.
    ///
    /// # Errors
    /// What protection or supply do not state.
    pub fn off(&self, mains: Mains) -> Result<Option<Off>, Needs> {
        let Some((protection, stated)) = self.detector()? else {
            return Ok(None);
        };
        let (rail, release) = both(self.unsagged(mains), self.release(protection))?;
        let threshold = stated.above.max(stated.below);
        let model = detector_model(protection, stated, threshold)?;
        Ok(Some(Off {
            detected: model.time_from_rest(rail),
            worst: model.time_at_worst(rail),
            release,
            threshold,
            time_constant: stated.ohm * stated.farad,
        }))
    }

    /// The fuse that is soonest sure to end a fault of this current, of those in rail and loudspeaker
    /// leads; `None` where none is declared.
    ///
    /// # Errors
    /// What is missing of the supply.
    pub fn fuse_alone(&self, current: Amp) -> Result<Option<Alone>, Needs> {
        if self.build.supply.unstated() && self.build.rails.get().is_some() {
            return Ok(None);
        }
        let supply = self.supply()?;
        let mut best: Option<Alone> = None;
        for fuse in supply
            .fuses
            .iter()
            .filter(|f| matches!(f.place, "rail" | "speaker"))
        {
            let speed = if fuse.slow { Speed::Slow } else { Speed::Fast };
            let melted = melting(speed, fuse.rating, current).and_then(|m| m.most);
            let sooner = match (&best, melted) {
                (None, _) => true,
                (Some(kept), Some(time)) => kept.melted.is_none_or(|k| time < k),
                (Some(_), None) => false,
            };
            if sooner {
                best = Some(Alone {
                    fuse: fuse.clone(),
                    melted,
                });
            }
        }
        Ok(best)
    }

    /// The line that speaks for the protection: its own, or the build's.
    #[must_use]
    pub fn protection_site(&self) -> Site {
        self.build.protection.site()
    }
}

/// The filter with a threshold.
///
/// # Errors
/// When its values are not positive.
pub fn detector_model(
    protection: &Protection,
    stated: &Stated,
    threshold: Volt,
) -> Result<Detector, Needs> {
    Detector::new(stated.ohm, stated.farad, threshold).ok_or_else(|| {
        Needs::because(format!(
            "the detector of protection {} needs positive values",
            protection.owner.name
        ))
    })
}
