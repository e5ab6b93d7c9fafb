//! One build with one alternate in one mains region, and what has been solved of it.
//! Must not know any rule.

use std::cell::{OnceCell, RefCell};
use std::collections::HashMap;
use std::rc::Rc;

use super::devices::Bench;
use super::heat::Heat;
use super::loads::Driven;
use super::memory::Memory;
use super::rails::Rails;
use crate::build::Needs;
use crate::build::parts::{
    Build, Device, Duty, Field, Heatsink, Protection, Region, Stage, Supply,
};
use crate::finding::{Assumed, Measure, Part, Related, Site, Step, Witness};
use crate::physics::load::{Band, Table};
use crate::physics::unit::{Celsius, Kelvin};
use crate::policy::Policy;

/// Impedance tables by the place of their path, each read once per check.
pub type Tables = HashMap<Site, Result<Table, Needs>>;

/// Upper or lower half of a stage.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Side {
    /// Fed from the positive rail.
    Upper,
    /// Fed from the negative rail.
    Lower,
}

impl Side {
    /// Both, upper first: ties are settled for the positive rail.
    pub const BOTH: [Self; 2] = [Self::Upper, Self::Lower];
    /// As reports say it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Upper => "upper",
            Self::Lower => "lower",
        }
    }
}

impl Stage {
    /// The device of one side.
    #[must_use]
    pub fn device(&self, side: Side) -> &Rc<Device> {
        match side {
            Side::Upper => &self.upper,
            Side::Lower => &self.lower,
        }
    }
    /// The sides that hold different declared parts: one where a part is stated once for both.
    #[must_use]
    pub fn sides(&self) -> &'static [Side] {
        if Rc::ptr_eq(&self.upper, &self.lower) {
            &Side::BOTH[..1]
        } else {
            &Side::BOTH
        }
    }
}

/// One build in one region.
pub struct Case<'a> {
    /// The build.
    pub build: &'a Build,
    /// The allowances.
    pub policy: &'a Policy,
    /// The mains region; `None` with given rails.
    pub region: Option<&'a Region>,
    /// Impedance tables.
    pub tables: &'a Tables,
    /// What was solved before.
    pub memory: &'a Memory,
    assumed: RefCell<Vec<Assumed>>,
    pub(super) rails: OnceCell<Result<Rails, Needs>>,
    pub(super) loads: OnceCell<Vec<Result<Driven, Needs>>>,
    pub(super) bench: OnceCell<Result<Bench, Needs>>,
    pub(super) heat: OnceCell<Vec<Result<Heat, Needs>>>,
}

impl<'a> Case<'a> {
    /// Nothing solved yet.
    #[must_use]
    pub fn new(
        build: &'a Build,
        policy: &'a Policy,
        region: Option<&'a Region>,
        tables: &'a Tables,
        memory: &'a Memory,
    ) -> Self {
        Self {
            build,
            policy,
            region,
            tables,
            memory,
            assumed: RefCell::default(),
            rails: OnceCell::new(),
            loads: OnceCell::new(),
            bench: OnceCell::new(),
            heat: OnceCell::new(),
        }
    }

    /// Note a value that nothing states.
    pub fn assume(
        &self,
        key: String,
        value: impl Into<Option<Measure>>,
        why: &'static str,
        site: Site,
    ) {
        let mut all = self.assumed.borrow_mut();
        if !all.iter().any(|a| a.key == key) {
            all.push(Assumed {
                key,
                value: value.into(),
                why,
                site,
            });
        }
    }

    /// What was assumed while solving.
    #[must_use]
    pub fn assumed(&self) -> Vec<Assumed> {
        self.assumed.borrow().clone()
    }

    /// Amplifier channels of the build.
    ///
    /// # Errors
    /// When they are not stated.
    pub fn channels(&self) -> Result<u32, Needs> {
        self.build.channels.need().copied()
    }

    /// The output stage.
    #[must_use]
    pub fn output(&self) -> &Rc<Stage> {
        &self.build.amplifier.output
    }

    /// The supply.
    ///
    /// # Errors
    /// When the build names none.
    pub fn supply(&self) -> Result<&Rc<Supply>, Needs> {
        self.build.supply.need().map(|s| &s.0)
    }

    /// The heatsink and the channels on each.
    ///
    /// # Errors
    /// When the build names none.
    pub fn heatsink(&self) -> Result<(&Rc<Heatsink>, u32), Needs> {
        self.build.heatsink.need().map(|s| (&s.0, s.1))
    }

    /// The protection.
    ///
    /// # Errors
    /// When the build names none.
    pub fn protection(&self) -> Result<&Rc<Protection>, Needs> {
        self.build.protection.need()
    }

    /// The mains region.
    ///
    /// # Errors
    /// When none is stated.
    pub fn region(&self) -> Result<&'a Region, Needs> {
        self.region.ok_or_else(|| self.build.mains.missing())
    }

    /// Full-power band.
    ///
    /// # Errors
    /// When it is no band.
    pub fn band(&self) -> Result<Band, Needs> {
        let (bottom, top) = *self.build.amplifier.band.need()?;
        Band::new(bottom, top)
            .ok_or_else(|| Needs::because("the band of the amplifier is no range"))
    }

    /// The duty in force.
    #[must_use]
    pub fn duty(&self) -> &Duty {
        self.build.duty.get().unwrap_or(&self.policy.duty)
    }

    /// Hottest air round the case.
    ///
    /// # Errors
    /// When it is not stated.
    pub fn hottest(&self) -> Result<Celsius, Needs> {
        self.build.ambient.need().map(|a| a.1)
    }

    /// Coldest air round the case.
    ///
    /// # Errors
    /// When it is not stated.
    pub fn coldest(&self) -> Result<Celsius, Needs> {
        self.build.ambient.need().map(|a| a.0)
    }

    /// Hottest air inside.
    ///
    /// # Errors
    /// When the ambient is not stated.
    pub fn air_inside(&self) -> Result<Celsius, Needs> {
        Ok(self.hottest()? + self.build.enclosure.get().copied().unwrap_or(Kelvin::ZERO))
    }

    /// How many boards the build has.
    ///
    /// # Errors
    /// When the channels are not stated.
    pub fn boards(&self) -> Result<u32, Needs> {
        let per = self
            .build
            .amplifier
            .channels_per_board
            .get()
            .copied()
            .unwrap_or(1)
            .max(1);
        Ok(self.channels()?.div_ceil(per))
    }

    /// A witness with what every operating point of this case shares.
    #[must_use]
    pub fn witness(&self) -> Witness {
        Witness {
            mains_hz: self.region.map(|r| r.frequency.0),
            channels_driven: self.build.channels.get().copied(),
            ..Witness::default()
        }
    }

    /// The lines that set the rails, with one more.
    #[must_use]
    pub fn rail_sites(&self, more: Option<(&str, Site)>) -> Vec<Related> {
        let mut related: Vec<Related> = more
            .into_iter()
            .map(|(message, site)| Related {
                message: message.to_owned(),
                site,
            })
            .collect();
        if let Some(region) = self.region {
            let message = format!("mains {:.0} V to {:.0} V", region.low.0, region.high.0);
            related.push(Related {
                message,
                site: region.site,
            });
        }
        if let Some((supply, _)) = self.build.supply.get() {
            related.push(Related {
                message: "sets the rails".to_owned(),
                site: supply.transformer.secondary.site(),
            });
        } else if let Some(site) = self.build.rails.stated_at() {
            related.push(Related {
                message: "the given rails".to_owned(),
                site,
            });
        }
        related
    }

    /// A device of a stage as a part.
    #[must_use]
    pub fn device_part(&self, stage: &Stage, side: Side) -> Part {
        let device = stage.device(side);
        let single = stage.sides().len() == 1;
        let count = stage
            .pairs
            .get()
            .zip(self.build.channels.get())
            .map(|(n, c)| n * c * if single { 2 } else { 1 });
        Part {
            name: device.owner.name.clone(),
            block: stage.owner.name.clone(),
            key: "devices",
            polarity: if single { None } else { Some(side.name()) },
            refs: stage.bought.refs.clone(),
            quantity: count,
            order_code: device.codes.first().cloned(),
        }
    }
}

/// The part that a line of a block is about: `toroid reservoir`.
#[must_use]
pub fn line_part<T>(field: &Field<T>) -> Part {
    let owner = field.owner();
    Part {
        name: format!("{} {}", owner.name, field.key()),
        block: owner.name.clone(),
        key: field.key(),
        ..Part::default()
    }
}

/// A stated value in the working.
#[must_use]
pub fn stated(
    symbol: &'static str,
    meaning: &'static str,
    value: f64,
    unit: &'static str,
    from: impl IntoIterator<Item = Site>,
) -> Step {
    Step {
        symbol,
        meaning,
        expression: "",
        value,
        unit,
        source: "",
        from: from.into_iter().collect(),
    }
}

/// A computed value in the working.
#[must_use]
pub fn solved(
    symbol: &'static str,
    meaning: &'static str,
    expression: &'static str,
    value: f64,
    unit: &'static str,
    source: &'static str,
) -> Step {
    Step {
        symbol,
        meaning,
        expression,
        value,
        unit,
        source,
        from: Vec::new(),
    }
}
