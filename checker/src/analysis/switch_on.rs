//! Switching a build on: empty reservoirs, a saturated core, and what a soft start makes of them.
//! Must not know what is allowed.

use super::case::Case;
use super::rails::{Mains, Reservoir};
use crate::build::Needs;
use crate::build::parts::{SoftStart as Stated, three};
use crate::finding::Measure;
use crate::physics::supply::{self, Closing, Rail, SoftStart, Surge, switch_on};
use crate::physics::unit::{Amp, AmpSquaredSecond, Ohm, Volt};

/// Resistance of a mains outlet where none is stated; common practice, no source.
const USUAL_MAINS: Ohm = Ohm(0.3);

/// Rails that charge at the same time.
const RAILS: u32 = 2;

/// The surges of one supply at switch-on, high mains, the greatest reservoir. Currents of a RAIL'S
/// charging path.
#[derive(Clone, Copy, Debug)]
pub struct SwitchOn {
    /// The first surge, through the soft start where one is fitted.
    pub first: Surge,
    /// The one when it is bypassed.
    pub second: Option<Surge>,
}

/// What one mains fuse sees.
#[derive(Clone, Copy, Debug)]
pub struct MainsSurge {
    /// Charging of empty reservoirs, the surge at the bypass added.
    pub reservoir: AmpSquaredSecond,
    /// Half a cycle of a saturated core.
    pub core: AmpSquaredSecond,
    /// The peak of the worse.
    pub peak: Amp,
    /// Copper of the primary.
    pub primary: Ohm,
    /// Resistance of the mains.
    pub mains: Ohm,
}

impl MainsSurge {
    /// The worse of both.
    #[must_use]
    pub fn worse(&self) -> AmpSquaredSecond {
        self.reservoir.max(self.core)
    }
}

impl Case<'_> {
    /// Resistance of the mains at switch-on.
    fn mains_at_switch_on(&self) -> Result<Ohm, Needs> {
        let region = self.region()?;
        Ok(region.loop_resistance.unwrap_or_else(|| {
            let key = format!("build {} mains loop", self.build.owner.name);
            self.assume(
                key,
                Measure::new(USUAL_MAINS.0, "ohm"),
                "usual at an outlet; counts at switch-on only",
                region.site,
            );
            USUAL_MAINS
        }))
    }

    /// A rail as it charges at switch-on, the mains behind it.
    fn charging_rail(&self, mains: Mains, reservoir: Reservoir) -> Result<Rail, Needs> {
        let made = self.made()?;
        let region = self.region()?;
        let resistance = self.mains_at_switch_on()?;
        let rail = made.rail(mains, reservoir, region.frequency);
        // a stated resistance is in the rail already
        let more = if region.loop_resistance.is_some() {
            Ohm::ZERO
        } else {
            made.transformer.referred(resistance, RAILS * made.supplies)
        };
        rail.and_then(|r| r.with_series(more))
            .ok_or_else(|| Needs::because("the rail cannot be solved at switch-on"))
    }

    /// The soft start, or none.
    ///
    /// # Errors
    /// When the build names no supply.
    pub fn soft_start(&self) -> Result<Option<Stated>, Needs> {
        Ok(self.supply()?.soft_start.get().copied())
    }

    /// A soft start of one resistance seen from a rail. Both rails charge at once through it.
    fn seen_from_rail(&self, primary_side: Ohm) -> Result<Ohm, Needs> {
        Ok(self.made()?.transformer.referred(primary_side, RAILS))
    }

    /// The rails come up through a bypassed soft start.
    ///
    /// # Errors
    /// What supply or output stage lack; no bypass is stated.
    pub fn through_soft_start(
        &self,
        mains: Mains,
        reservoir: Reservoir,
    ) -> Result<SoftStart, Needs> {
        let field = &self.supply()?.soft_start;
        let stated = field.need()?;
        let bypass = stated.bypass.ok_or_else(|| field.missing_part("bypass"));
        let (rail, idle, bypass) = three(
            self.charging_rail(mains, reservoir),
            self.idle_of_supply(),
            bypass,
        )?;
        let referred = self.seen_from_rail(stated.cold)?;
        let inputs = (rail, referred, idle, bypass);
        self.memory.recall("soft start", &inputs, || {
            supply::soft_start(&rail, referred, RAILS, idle, bypass)
                .ok_or_else(|| Needs::because("the soft start cannot be solved"))
        })
    }

    /// The surges of a rail, through the soft start where one is fitted and `with` it.
    ///
    /// # Errors
    /// What the supply lacks.
    pub fn switch_on(&self, with: bool) -> Result<SwitchOn, Needs> {
        match self.soft_start()?.filter(|_| with) {
            None => Ok(SwitchOn {
                first: self.surge(&self.charging_rail(Mains::High, Reservoir::High)?)?,
                second: None,
            }),
            Some(ntc) if ntc.hot.is_some() && ntc.bypass.is_none() => {
                let more = self.seen_from_rail(ntc.cold)?;
                let rail = self
                    .charging_rail(Mains::High, Reservoir::High)?
                    .with_series(more);
                Ok(SwitchOn {
                    first: self.surge(
                        &rail.ok_or_else(|| Needs::because("the soft start cannot be solved"))?,
                    )?,
                    second: None,
                })
            }
            Some(stated) => {
                let soft = self.through_soft_start(Mains::High, Reservoir::High)?;
                let rail = self.charging_rail(Mains::High, Reservoir::High)?;
                let referred = self.seen_from_rail(stated.cold)?;
                let bypass = stated.bypass.unwrap_or_default();
                let inputs = (rail, referred, bypass, soft.reached);
                let (first, second) = self.memory.recall("soft surges", &inputs, || {
                    supply::soft_surges(&rail, referred, bypass, soft.reached)
                        .ok_or_else(|| Needs::because("the soft start cannot be solved"))
                })?;
                Ok(SwitchOn {
                    first,
                    second: Some(second),
                })
            }
        }
    }

    /// What a mains fuse of one supply sees that feeds `behind` of its transformers.
    ///
    /// # Errors
    /// What the supply lacks.
    pub fn mains_surge(&self, behind: u32, with: bool) -> Result<MainsSurge, Needs> {
        let made = self.made()?;
        let (region, mains) = (self.region()?, self.mains_at_switch_on()?);
        let surges = self.switch_on(with)?;
        // the supply's transformers share the rails' current; a fuse sees that of its own
        let part = f64::from(behind) / f64::from(made.transformers.max(1));
        let seen = |s: Surge| s.primary(&made.transformer, RAILS);
        let first = seen(surges.first);
        let second = surges
            .second
            .map_or(AmpSquaredSecond::ZERO, |s| seen(s).total);
        let stated = self.supply()?.transformer.resistance.get().map(|r| r.0);
        let primary = stated.unwrap_or_else(|| made.transformer.assumed_primary_resistance());
        let soft = self
            .soft_start()?
            .filter(|_| with)
            .map_or(Ohm::ZERO, |s| s.cold);
        let all = primary / f64::from(behind.max(1)) + mains + soft;
        let wrong = || Needs::because("the primary has no resistance to speak of");
        let (core_peak, core) =
            supply::core_surge(made.mains_volts(Mains::High), all, region.frequency)
                .ok_or_else(wrong)?;
        let reservoir_peak = surges
            .second
            .map_or(first.peak, |s| first.peak.max(seen(s).peak))
            * part;
        Ok(MainsSurge {
            reservoir: (first.total + second) * (part * part),
            core,
            peak: core_peak.max(reservoir_peak),
            primary,
            mains,
        })
    }

    /// Watts in a soft-start resistor whose bypass never closes, with this current drawn from each
    /// rail, or with the greatest below it that the rail still gives.
    ///
    /// # Errors
    /// What the supply lacks.
    pub fn stuck_watts(&self, resistor: Ohm, current: Amp) -> Result<(f64, Amp), Needs> {
        let (rail, referred) = (
            self.charging_rail(Mains::High, Reservoir::High)?,
            self.seen_from_rail(resistor)?,
        );
        let watts = |i: f64| supply::stuck_soft_start(&rail, referred, RAILS, Amp(i)).map(|w| w.0);
        if let Some(found) = watts(current.0) {
            return Ok((found, current));
        }
        // the rail collapses first: the greatest current it gives, from below
        let (mut holds, mut fails) = (0.0, current.0);
        for _ in 0..30 {
            let middle = 0.5 * (holds + fails);
            if watts(middle).is_some() {
                holds = middle;
            } else {
                fails = middle;
            }
        }
        watts(holds)
            .map(|w| (w, Amp(holds)))
            .ok_or_else(|| Needs::because("the stuck soft start cannot be solved"))
    }

    /// Energy of both rails' reservoirs at high mains: what a limiter of any resistance takes at
    /// most while they charge.
    ///
    /// # Errors
    /// What the supply lacks.
    pub fn stored(&self) -> Result<(f64, Volt), Needs> {
        let (made, rail) = (self.made()?, self.no_load(Mains::High)?);
        let [_, _, most] = made.reservoir;
        Ok((f64::from(RAILS) * supply::stored_energy(most, rail).0, rail))
    }

    /// The worse of closing at zero and at crest, empty reservoirs.
    fn surge(&self, rail: &Rail) -> Result<Surge, Needs> {
        self.memory.recall("surge", rail, || {
            let closed = |moment| switch_on(rail, moment, Volt::ZERO);
            let worse = closed(Closing::Zero)
                .zip(closed(Closing::Crest))
                .map(|(a, b)| a.worse(b));
            worse.ok_or_else(|| Needs::because("the surge at switch-on cannot be solved"))
        })
    }
}
