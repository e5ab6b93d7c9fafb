//! What flows in the parts of the supply while every channel plays: windings, diodes, capacitors,
//! fuses.
//! Must not know what is allowed.

use std::rc::Rc;

use super::case::{Case, line_part, solved};
use super::loads::Driven;
use super::margins::Margins;
use super::rails::{Made, Mains, Reservoir as End};
use crate::build::Needs;
use crate::build::parts::{FuseLine, Reservoir, Supply, both};
use crate::finding::{Part, Related, Site, Step, Witness};
use crate::physics::output_stage::power;
use crate::physics::supply::{self, Cycle};
use crate::physics::unit::{Amp, Ohm, Volt};
use crate::rule::Rule;

/// Channels up to which a supply is tried.
const MOST_CHANNELS: u32 = 64;

/// The currents of one supply while all its channels play one sine, nominal mains. Where a
/// capacitor's tolerance matters, each current is the greater of both ends.
#[derive(Clone, Copy, Debug)]
pub struct Flow {
    /// Peak output of one channel.
    pub amplitude: Volt,
    /// Peak current of one channel.
    pub peak: Amp,
    /// The resistance that one channel sees.
    pub seen: Ohm,
    /// Mean current on each rail, idle included.
    pub rail: Amp,
    /// Mean rail.
    pub volts: Volt,
    /// R.m.s. of one rail's charging current.
    pub charging: Amp,
    /// R.m.s. of one winding.
    pub winding: Amp,
    /// Volt-amperes drawn from one transformer.
    pub volt_amps: f64,
    /// R.m.s. of one transformer's primary.
    pub primary: Amp,
    /// R.m.s. of all of one rail's capacitors, from charging.
    pub ripple_charging: Amp,
    /// The same from the signal.
    pub ripple_audio: Amp,
}

/// Capacitors of one kind on a rail.
#[derive(Clone, Debug)]
pub struct Bank<'a> {
    /// The part.
    pub part: Part,
    /// As stated.
    pub stated: &'a Reservoir,
    /// How many on one rail of one supply.
    pub count: u32,
    /// They stand on the boards.
    pub on_board: bool,
}

impl<'a> Case<'a> {
    /// The supply whose parts there are to judge. None where a build gives its rails instead; where
    /// it gives neither, `rule` is unchecked for want of a supply.
    pub fn fitted(&self, rule: &'static Rule, out: &mut Margins<'_>) -> Option<&'a Rc<Supply>> {
        let field = &self.build.supply;
        if let Some((supply, _)) = field.get() {
            return Some(supply);
        }
        if self.build.rails.get().is_none() {
            out.compare(rule, line_part(field), field.site(), Err(field.missing()));
        }
        None
    }

    /// Supplies in the build.
    #[must_use]
    pub fn supplies(&self) -> Option<u32> {
        let (_, carried) = self.build.supply.get()?;
        Some(self.build.channels.get()?.div_ceil((*carried).max(1)))
    }

    /// A line of the supply as a part, of which each supply holds `each`.
    #[must_use]
    pub fn supply_part(&self, supply: &Supply, key: &'static str, each: u32) -> Part {
        let name = &supply.owner.name;
        Part {
            name: format!("{name} {key}"),
            block: name.clone(),
            key,
            quantity: self.supplies().map(|n| n * each),
            ..Part::default()
        }
    }

    /// The transformer as a part.
    #[must_use]
    pub fn transformer_part(&self, supply: &Supply) -> Part {
        Part {
            name: supply.transformer.owner.name.clone(),
            ..self.supply_part(supply, "transformer", supply.transformers)
        }
    }

    /// The fuses of a place as a part.
    #[must_use]
    pub fn fuse_part(&self, supply: &Supply, place: &str) -> Part {
        let name = format!("{} fuse {place}", supply.owner.name);
        Part {
            name,
            block: supply.owner.name.clone(),
            key: "fuse",
            ..Part::default()
        }
    }

    /// The answer for each load in order of declaration, or what the loads lack.
    pub fn per_load<T>(&self, of: impl Fn(&Driven) -> Result<T, Needs>) -> Vec<Result<T, Needs>> {
        match self.loads() {
            Err(needs) => vec![Err(needs)],
            Ok(loads) => loads
                .iter()
                .map(|l| l.as_ref().map_err(Clone::clone).and_then(&of))
                .collect(),
        }
    }

    /// Boards that one supply feeds.
    #[must_use]
    pub fn boards_fed(&self) -> u32 {
        let carried = self
            .build
            .supply
            .get()
            .map(|s| s.1)
            .or(self.build.channels.get().copied())
            .unwrap_or(1);
        carried.div_ceil(
            self.build
                .amplifier
                .channels_per_board
                .get()
                .copied()
                .unwrap_or(1)
                .max(1),
        )
    }

    /// Every kind of capacitor on the rails: the supply's in order, then the boards'.
    #[must_use]
    pub fn banks(&self) -> Vec<Bank<'a>> {
        let mut banks = Vec::new();
        if let Some((supply, _)) = self.build.supply.get() {
            for (at, stated) in supply.reservoir.get().into_iter().flatten().enumerate() {
                let mut part = self.supply_part(supply, "reservoir", 2 * stated.count);
                if at > 0 {
                    part.name = format!("{} {}", part.name, at + 1);
                }
                part.refs.clone_from(&stated.bought.refs);
                banks.push(Bank {
                    part,
                    stated,
                    count: stated.count,
                    on_board: false,
                });
            }
        }
        let board = &self.build.amplifier.board_reservoir;
        if let Some(stated) = board.get() {
            let mut part = line_part(board);
            part.refs.clone_from(&stated.bought.refs);
            part.quantity = self.boards().ok().map(|n| 2 * n * stated.count);
            banks.push(Bank {
                part,
                stated,
                count: stated.count * self.boards_fed(),
                on_board: true,
            });
        }
        banks
    }

    /// The supply's currents with a sine of this amplitude from every channel.
    ///
    /// # Errors
    /// What supply or output stage lack, or that the supply cannot give so much.
    pub fn flow(&self, amplitude: Volt, seen: Ohm) -> Result<Flow, Needs> {
        self.flow_of(self.channels_per_supply()?, amplitude, seen)
    }

    /// The same with this many channels on the supply.
    fn flow_of(&self, channels: u32, amplitude: Volt, seen: Ohm) -> Result<Flow, Needs> {
        let (made, idle) = both(self.made(), self.idle_of_supply())?;
        let peak = amplitude / seen;
        let (draw, peaks) = self.draw(channels);
        let idle = idle * (f64::from(channels) / f64::from(self.channels_per_supply()?.max(1)));
        let rail = draw.mean(peak * peaks) + idle;
        let [low, high] = self.cycles(made, rail)?;
        let charging = low.charging_rms().max(high.charging_rms());
        let winding = charging / f64::from(made.parallel.max(1));
        let windings = f64::from(self.supply()?.transformer.secondary.need()?.0);
        Ok(Flow {
            amplitude,
            peak,
            seen,
            rail,
            volts: low.mean(),
            charging,
            winding,
            volt_amps: made.transformer.va_used(winding) * windings,
            primary: made.transformer.primary_current(winding) * windings,
            ripple_charging: low.reservoir_rms().max(high.reservoir_rms()),
            ripple_audio: draw.ripple(peak * peaks),
        })
    }

    /// The rail's cycle with the least and with the greatest reservoir, nominal mains.
    fn cycles(&self, made: &Made, current: Amp) -> Result<[Cycle; 2], Needs> {
        let frequency = self.region()?.frequency;
        let cycle = |end| {
            made.rail(Mains::Nominal, end, frequency)
                .and_then(|r| r.loaded(current))
        };
        let pair = cycle(End::Low).zip(cycle(End::High));
        pair.map(<[Cycle; 2]>::from).ok_or_else(|| {
            Needs::because(format!(
                "the supply cannot give {:.3} A at nominal mains",
                current.0
            ))
        })
    }

    /// The supply's currents at the duty, into a load.
    ///
    /// # Errors
    /// As [`Case::duty_signal`] and [`Case::flow`].
    pub fn duty_flow(&self, load: &Driven) -> Result<Flow, Needs> {
        self.flow(self.duty_signal(load)?.amplitude, load.nominal_seen())
    }

    /// The supply's currents at the continuous rated sine into a load: the greatest power claimed of
    /// all channels into its nominal resistance, clipping or not, or what they sustain where nothing
    /// is claimed or the supply collapses under the claim.
    ///
    /// # Errors
    /// As [`Case::sustained`] and [`Case::flow`].
    pub fn sine_flow(&self, load: &Driven) -> Result<Flow, Needs> {
        let seen = load.nominal_seen();
        let claims = self.build.amplifier.rated.get().into_iter().flatten();
        let same = claims.filter(|c| c.all_channels && (c.load / load.nominal - 1.0).abs() < 0.02);
        let claimed = same
            .map(|c| self.asked(c).map(|a| a.amplitude))
            .collect::<Result<Vec<_>, _>>()?;
        if let Some(most) = claimed.into_iter().reduce(Volt::max)
            && let Ok(flow) = self.flow(most, seen)
        {
            return Ok(flow);
        }
        self.flow(
            self.sustained(Mains::Nominal, self.channels_per_supply()?, seen)?,
            seen,
        )
    }

    /// Channels that a supply carries at the duty into a load without overloading its transformer,
    /// and without the rail giving out.
    ///
    /// # Errors
    /// As [`Case::duty_flow`].
    pub fn most_channels(&self, load: &Driven) -> Result<u32, Needs> {
        let amplitude = self.duty_signal(load)?.amplitude;
        let (rating, _) = both(
            self.supply()?.transformer.rating.need().copied(),
            self.flow_of(1, amplitude, load.nominal_seen()),
        )?;
        let carried = |n: &u32| {
            self.flow_of(*n, amplitude, load.nominal_seen())
                .is_ok_and(|f| f.volt_amps <= rating)
        };
        let step = if self.build.bridged { 2 } else { 1 };
        // more channels load it more: the last that is carried is found by halving
        let (mut low, mut high) = (0, MOST_CHANNELS + 1);
        while high - low > 1 {
            let middle = u32::midpoint(low, high);
            if carried(&(middle * step)) {
                low = middle;
            } else {
                high = middle;
            }
        }
        Ok(low * step)
    }

    /// The part of a rail's ripple current that ONE capacitor of each kind carries.
    ///
    /// # Errors
    /// When the capacitances make no sense.
    pub fn ripple_shares(&self, banks: &[Bank<'_>]) -> Result<Vec<f64>, Needs> {
        let groups: Vec<_> = banks
            .iter()
            .map(|b| supply::Reservoir {
                count: b.count,
                capacitance: b.stated.farad.nominal,
                esr: b.stated.esr,
            })
            .collect();
        supply::ripple_shares(&groups)
            .ok_or_else(|| Needs::because("the reservoir has no capacitance"))
    }

    /// The mains tap in use, with the transformer's own list of taps where it must be chosen.
    ///
    /// # Errors
    /// When it is not stated, or nor is the primary.
    pub fn tap(&self) -> Result<Volt, Needs> {
        let (region, primary) = both(self.region(), self.supply()?.transformer.primary.need())?;
        match (region.tap, primary.as_slice()) {
            (Some(tap), _) => Ok(tap),
            (None, [only]) => Ok(*only),
            (None, _) => Err(self.build.mains.missing_part("tap")),
        }
    }

    /// The fuses of a place that are in circuit on the tap in use.
    ///
    /// # Errors
    /// When the tap is not stated.
    pub fn fuses(&self, place: &str) -> Result<Vec<&'a FuseLine>, Needs> {
        let Some((supply, _)) = self.build.supply.get() else {
            return Ok(Vec::new());
        };
        let mut fuses: Vec<&FuseLine> = supply.fuses.iter().filter(|f| f.place == place).collect();
        if fuses.iter().any(|f| f.tap.is_some()) {
            let tap = self.tap()?;
            fuses.retain(|f| f.tap.is_none_or(|t| (t - tap).abs() < Volt(0.5)));
        }
        Ok(fuses)
    }

    /// The mains fuses in circuit. Empty where none is fitted.
    ///
    /// # Errors
    /// When none is stated, or none for the tap in use.
    pub fn mains_fuses(&self) -> Result<Vec<&'a FuseLine>, Needs> {
        let field = &self.supply()?.mains_fuse;
        let fuses = self.fuses("mains")?;
        if fuses.is_empty() && !field.none {
            return Err(if field.unstated() {
                field.missing()
            } else {
                field.missing_part(&format!("tap {:.0} V", self.tap()?.0))
            });
        }
        Ok(fuses)
    }

    /// The fuses of the rails in circuit. Empty where none is fitted.
    ///
    /// # Errors
    /// When none is stated.
    pub fn rail_fuses(&self) -> Result<Vec<&'a FuseLine>, Needs> {
        let field = &self.supply()?.rail_fuse;
        if field.unstated() {
            Err(field.missing())
        } else {
            self.fuses("rail")
        }
    }

    /// Transformers that one mains fuse feeds.
    #[must_use]
    pub fn transformers_behind(supply: &Supply, fuse: &FuseLine) -> u32 {
        if fuse.per == Some("transformer") {
            1
        } else {
            supply.transformers.max(1)
        }
    }

    /// Where a flow holds.
    #[must_use]
    pub fn at_flow(&self, load: &Driven, flow: &Flow, duty: Option<&str>) -> Witness {
        let halves = if self.build.bridged { 2.0 } else { 1.0 };
        Witness {
            mains_v: self.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(flow.amplitude.0),
            power_w: Some((power(flow.amplitude, flow.seen) * halves).0),
            duty: duty.map(str::to_owned),
            rail_v: Some(flow.volts.0),
            ..self.witness()
        }
    }

    /// The lines that load a supply: its share, the load.
    #[must_use]
    pub fn loading_sites(&self, load: &Driven) -> Vec<Related> {
        let channels = self.build.supply.get().map_or(1, |s| s.1);
        let mut related = vec![
            Related {
                message: format!("{channels} channel(s) on each supply"),
                site: self.build.supply.site(),
            },
            Related {
                message: "loads it most".to_owned(),
                site: load.site,
            },
        ];
        related.extend(self.region.map(|r| Related {
            message: "the mains".to_owned(),
            site: r.site,
        }));
        related
    }

    /// The working up to the current of a rail.
    #[must_use]
    pub fn rail_steps(&self, flow: &Flow, amplitude: &'static str) -> Vec<Step> {
        let channels = self.build.supply.get().map_or(1, |s| s.1);
        vec![
            solved(
                "V̂",
                "peak output of one channel",
                amplitude,
                flow.amplitude.0,
                "V",
                "",
            ),
            solved(
                "Î",
                "peak current of one channel",
                "V̂/R",
                flow.peak.0,
                "A",
                "Ohm's law",
            ),
            Step {
                symbol: "n",
                meaning: "channels on one supply",
                expression: "",
                value: f64::from(channels),
                unit: "1",
                source: "",
                from: vec![self.build.supply.site()],
            },
            solved(
                "Idc",
                "mean current on each rail",
                "n·(Î/π + N·Iq)",
                flow.rail.0,
                "A",
                "mean of a half-sine",
            ),
        ]
    }
}

/// Several lines that take part, as related places.
#[must_use]
pub fn places(sites: impl IntoIterator<Item = (&'static str, Option<Site>)>) -> Vec<Related> {
    sites
        .into_iter()
        .filter_map(|(message, site)| {
            Some(Related {
                message: message.to_owned(),
                site: site?,
            })
        })
        .collect()
}
