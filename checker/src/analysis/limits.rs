//! The limit line of a build: what its limiter lets the most loaded device carry, whether music
//! stays clear of it, and what a short circuit comes to.
//! Must not know verdicts.

use super::Stress;
use super::case::{Case, Side, solved, stated};
use super::devices::emitter;
use super::heat::{Heat, mounting, sink_model};
use super::loads::{Driven, Spot};
use super::rails::Mains;
use super::safe_area::{SafeArea, aim, settled};
use crate::build::Needs;
use crate::build::parts::{Protection, both, three};
use crate::finding::{Related, Site, Witness};
use crate::physics::fuse::{Melting, Speed, melting};
use crate::physics::heat::{ALUMINIUM_HEAT_J_PER_KG_K, sink_temperature};
use crate::physics::limiter::{self, Clamp, Extreme, Network, TURN_ON_DRIFT, Tolerance, turn_on};
use crate::physics::load::Impedance;
use crate::physics::math::PI;
use crate::physics::safe_area::{Clearance, LimitLine};
use crate::physics::sharing::Bank;
use crate::physics::unit::{Amp, Celsius, Ohm, Second, Volt, Watt};
use crate::physics::waveform::Locus;
use crate::rule::Rule;

/// What a limiter senses.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Senses {
    /// The current of one device.
    Device,
    /// The current of all devices of a side.
    Bank,
}

/// A limit line at one end of its tolerances: where two lines are given, the extreme lies on either.
#[derive(Clone, Debug)]
pub struct Limit {
    senses: Senses,
    lines: Vec<limiter::LimitLine>,
    extreme: Extreme,
    /// Turn-on volts; `None` for a stated line, which has no spread.
    turn_on: Option<Volt>,
    site: Site,
}

impl Limit {
    /// Current of what is sensed, at a voltage.
    pub(super) fn sensed(&self, volts: Volt) -> Option<Amp> {
        let all = self.lines.iter().map(|l| l.current(volts));
        all.reduce(|a, b| match self.extreme {
            Extreme::Most => Some(a?.max(b?)),
            Extreme::Least => Some(a?.min(b?)),
        })?
    }

    /// Current of the most loaded device while what is sensed is at the limit: a limiter that senses
    /// one device may sense the least loaded.
    pub(super) fn most_loaded(&self, bank: &Bank, sensed: Amp) -> Option<Amp> {
        match self.senses {
            Senses::Device => bank.most_loaded_beside(sensed.max(Amp::ZERO)),
            Senses::Bank => Some(bank.most_loaded(sensed.max(Amp::ZERO))),
        }
    }

    /// The same where the most loaded device is the one that is sensed.
    pub(super) fn when_sensed(&self, bank: &Bank, sensed: Amp) -> Option<Amp> {
        match self.senses {
            Senses::Device => Some(sensed.max(Amp::ZERO)),
            Senses::Bank => Some(bank.most_loaded(sensed.max(Amp::ZERO))),
        }
    }

    /// Where the line bends.
    pub(super) fn kinks(&self) -> Vec<Volt> {
        self.lines
            .iter()
            .flat_map(|l| l.corners().map(|c| c.volts))
            .filter(|v| *v >= Volt::ZERO)
            .collect()
    }
}

/// Where a limit line comes nearest to a load.
#[derive(Debug)]
pub(super) struct Clear {
    limit: Limit,
    rail: Volt,
    /// Where on the load's impedance.
    pub(super) spot: Spot,
    /// Peak output there.
    pub(super) amplitude: Volt,
    nearest: Clearance,
}

/// A short at the output of one channel.
#[derive(Clone, Copy, Debug)]
struct Short {
    /// Across the most loaded device.
    volts: Volt,
    /// Through it.
    amps: Amp,
    /// Through each device at the least.
    least: Amp,
    /// Rail to ground.
    rail: Volt,
}

impl Case<'_> {
    /// The limit line at one end of its tolerances, the sense transistor at a temperature. A limiter
    /// stated by its parts goes before a line stated by points.
    ///
    /// # Errors
    /// What is not stated; that no limiter is fitted; values that make no line.
    pub fn limit(&self, extreme: Extreme, temperature: Celsius) -> Result<Limit, Needs> {
        let protection = self.protection()?;
        if let Some(parts) = protection.limiter.get() {
            let network = self.network(protection)?;
            let von = turn_on(parts.on, TURN_ON_DRIFT, temperature);
            let low = self.output().emitter.get().map_or(0.0, |r| {
                if r.ohm.nominal > Ohm::ZERO {
                    (r.ohm.nominal - r.ohm.low) / r.ohm.nominal
                } else {
                    0.0
                }
            });
            let tolerance = Tolerance {
                resistors: 0.0,
                emitter: low,
                zener: 0.0,
            };
            let lines = von
                .and_then(|v| network.extremes(v, tolerance, extreme))
                .ok_or_else(|| Needs::because("the values of the limiter make no limit line"))?;
            return Ok(Limit {
                senses: Senses::Device,
                lines: lines.to_vec(),
                extreme,
                turn_on: von,
                site: protection.limiter.site(),
            });
        }
        if let Some(line) = protection.limit_line.get() {
            let points: Vec<(Volt, Amp)> = line.points.clone();
            let line_of = if line.bank {
                Senses::Bank
            } else {
                Senses::Device
            };
            let lines = limiter::LimitLine::through(&points)
                .ok_or_else(|| Needs::because("the points of the limit line are no line"))?;
            return Ok(Limit {
                senses: line_of,
                lines: vec![lines],
                extreme,
                turn_on: None,
                site: protection.limit_line.site(),
            });
        }
        Err(protection.limiter.missing())
    }

    /// The line that sets the limit.
    #[must_use]
    pub fn limiter_site(&self) -> Site {
        let field = &self.build.protection;
        field.get().map_or(field.site(), |p| {
            if p.limiter.get().is_none() && p.limit_line.get().is_some() {
                p.limit_line.site()
            } else {
                p.limiter.site()
            }
        })
    }

    /// Known not to be fitted: nothing limits.
    #[must_use]
    pub fn no_limiter(&self) -> bool {
        self.build.protection.none
            || self
                .build
                .protection
                .get()
                .is_some_and(|p| absent(p) && (p.limiter.none || p.limit_line.none))
    }

    fn network(&self, protection: &Protection) -> Result<Network, Needs> {
        let parts = protection.limiter.need()?;
        let field = &protection.limiter_break;
        let clamp = match field.get() {
            None => None,
            Some(second) => {
                let missing =
                    |name: &str, r: Option<Ohm>| r.ok_or_else(|| field.missing_part(name));
                let (rail_node, node_base) = both(
                    missing("from-rail", second.from_rail),
                    missing("to-base", second.to_base),
                )?;
                Some(Clamp {
                    rail_node,
                    node_base,
                    zener: second.volts,
                })
            }
        };
        let base = parts.shunt.map_or(parts.base, |s| {
            Ohm(parts.base.0 * s.0 / (parts.base.0 + s.0))
        });
        Ok(Network {
            emitter: self.sensed_resistor()?,
            sense_base: parts.sense,
            base_output: Some(base),
            rail_base: parts.rail,
            clamp,
        })
    }

    /// The emitter resistor whose drop a limiter senses.
    fn sensed_resistor(&self) -> Result<Ohm, Needs> {
        let stage = self.output();
        match emitter(stage)? {
            re if re > Ohm::ZERO => Ok(re),
            _ => Err(stage.emitter.missing()),
        }
    }

    /// What the limit line lets the most loaded device of a side carry, at any voltage up to both
    /// rails, high mains, with what it is allowed at its case temperature at the duty.
    ///
    /// # Errors
    /// What is missing, or data that end before the line does.
    pub fn limiter_stress(
        &self,
        rule: &Rule,
        heat: &Heat,
        load: &Driven,
        side: Side,
    ) -> Result<Stress, Needs> {
        let device = self.output().device(side);
        let (limit, area, (bench, rail)) = three(
            self.limit(Extreme::Most, self.coldest()?),
            SafeArea::of(device),
            both(self.bench(), self.unsagged(Mains::High)),
        )?;
        let bank = bench.bank(side);
        let case = self.case_temperature(heat, side)?;
        let current = |v: Volt| {
            limit
                .sensed(v)
                .and_then(|i| limit.most_loaded(bank, i))
                .unwrap_or(Amp(f64::NAN))
        };
        let no_line = || Needs::because("the limit line has no current for some voltage");
        let (used, at, allowed, coverage) = match area.allowance(case)? {
            None => (
                1e9,
                Volt::ZERO,
                Amp::ZERO,
                crate::physics::safe_area::Coverage::Whole,
            ),
            Some(allowance) => {
                let usage = allowance
                    .line_usage(current, &limit.kinks(), rail * 2.0)
                    .ok_or_else(no_line)?;
                let allowed = if usage.used > 0.0 {
                    usage.at.amps / usage.used
                } else {
                    allowance.allowed(usage.at.volts)
                };
                (usage.used, usage.at.volts, allowed, usage.coverage)
            }
        };
        settled(&area, coverage, used, aim(self, rule))?;
        let above = coverage == crate::physics::safe_area::Coverage::AboveBreakdown;
        let mut working = self.limit_steps(&limit);
        working.extend([
            solved(
                "Vu",
                "unsagged rail, high mains",
                "V0 - Vd",
                rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            solved(
                "Tcase",
                "case of the hottest device at the duty",
                "Tsink + P·θcs",
                case.0,
                "degC",
                "energy balance",
            ),
            solved(
                "v",
                "where the line comes nearest to the curve",
                "0 to 2·Vu",
                at.0,
                "V",
                "",
            ),
            solved(
                "i",
                "of the most loaded device, the least loaded one sensed",
                "limit line, share",
                current(at).0,
                "A",
                "Kirchhoff's current law at the sense base; current sharing",
            ),
            solved(
                "Iallowed",
                "allowed at that voltage",
                "min(IC, k·P/v, kseg·C(v))",
                allowed.0,
                "A",
                "log-log curve of the data sheet, derated",
            ),
        ]);
        Ok(Stress {
            value: current(at).0,
            rating: if above { 0.0 } else { allowed.0 },
            witness: Witness {
                mains_v: self.mains_volts(Mains::High),
                load: Some(load.name.clone()),
                duty: Some(self.duty().shown.clone()),
                case_c: Some(case.0),
                sink_c: Some(heat.hot_spot.0),
                rail_v: Some(rail.0),
                device_v: Some(at.0),
                device_a: Some(current(at).0),
                curve: Some("dc".to_owned()),
                ..self.witness()
            },
            working,
            related: self.safe_area_sites(side, None),
            note: if above {
                format!(
                    "the line lets current flow above the breakdown voltage of {}",
                    device.owner.name
                )
            } else {
                String::new()
            },
            ..Stress::default()
        })
    }

    fn limit_steps(&self, limit: &Limit) -> Vec<crate::finding::Step> {
        match limit.turn_on {
            Some(von) => vec![solved(
                "Von",
                "turn-on of the sense transistor at its temperature",
                "Von(25) - 2 mV/K·(T - 25)",
                von.0,
                "V",
                "band-gap relation, -1.8 to -2.5 mV/K",
            )],
            None => vec![stated(
                "I(0)",
                "stated limit line at no volts",
                limit.sensed(Volt::ZERO).unwrap_or_default().0,
                "A",
                [limit.site],
            )],
        }
    }

    /// Where the limit line comes nearest to a load at full drive.
    ///
    /// # Errors
    /// What is missing.
    pub(super) fn clearance(&self, heat: &Heat, load: &Driven, side: Side) -> Result<Clear, Needs> {
        // the sense transistor stands on the board beside the sink: as hot as that at most
        let (limit, bench, (rail, drop)) = three(
            self.limit(Extreme::Least, heat.hot_spot),
            self.bench(),
            both(self.unsagged(Mains::Nominal), self.drop()),
        )?;
        let bank = bench.bank(side);
        // a line of the bank is compared with the current of the bank
        let sensed = match limit.senses {
            Senses::Device => bank.clone(),
            Senses::Bank => Bank::even(1, bank.emitters_in_parallel())
                .ok_or_else(|| Needs::because("the emitter resistors make no bank"))?,
        };
        let swing = rail * 2.0;
        let lines = limit
            .lines
            .iter()
            .map(|l| falling(l, swing))
            .collect::<Option<Vec<_>>>();
        let lines = lines.ok_or_else(|| {
            Needs::because("the limit line allows more current at more volts: it protects nothing")
        })?;
        let at_point = |z: Impedance| -> Option<(Volt, Clearance)> {
            let amplitude = drop.burst(rail, z.modulus())?;
            let locus = Locus::new(&sensed, rail, amplitude, z)?;
            let least = lines
                .iter()
                .map(|l| l.clearance(&locus))
                .reduce(|a, b| if b.ratio < a.ratio { b } else { a })?;
            Some((amplitude, least))
        };
        let nothing = || {
            Needs::because(format!(
                "load {} cannot be driven on the {:.1} V rail",
                load.name, rail.0
            ))
        };
        let spot = load
            .worst(self.band()?, |_, z| {
                at_point(z).map_or(f64::NAN, |c| -c.1.ratio)
            })
            .ok_or_else(nothing)?;
        let (amplitude, clear) = at_point(spot.seen).ok_or_else(nothing)?;
        Ok(Clear {
            limit,
            rail,
            spot,
            amplitude,
            nearest: clear,
        })
    }

    /// How far the limit line stays clear of a load at full drive: the least ratio of the current at
    /// which it acts to the current that flows.
    ///
    /// # Errors
    /// What is missing.
    pub fn clearance_stress(
        &self,
        heat: &Heat,
        load: &Driven,
        side: Side,
    ) -> Result<Stress, Needs> {
        let Clear {
            limit,
            rail,
            spot,
            amplitude,
            nearest: clear,
        } = self.clearance(heat, load, side)?;
        let swing = rail * 2.0;
        let idle = limit.sensed(swing).is_none_or(|i| i <= Amp::ZERO);
        let mut working = self.limit_steps(&limit);
        working.extend([
            solved(
                "Vu",
                "unsagged rail, nominal mains",
                "V0 - Vd",
                rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            solved(
                "V̂",
                "peak output",
                "Vu - drop(V̂/|Z|)",
                amplitude.0,
                "V",
                "drop as stated",
            ),
            solved(
                "|Z|",
                "impedance that one channel sees",
                "",
                spot.seen.modulus().0,
                "ohm",
                "",
            ),
            solved(
                "φ",
                "its angle",
                "",
                spot.seen.angle_rad() * 180.0 / PI,
                "deg",
                "",
            ),
            solved(
                "v",
                "across the device where the line is nearest",
                "Vu - v_out - (i/N)·RE",
                clear.at.volts.0,
                "V",
                "node voltages",
            ),
            solved(
                "i",
                "current sensed then",
                "",
                clear.at.amps.0,
                "A",
                "current sharing",
            ),
            solved(
                "Iline",
                "current at which the limiter acts there",
                "limit line",
                limit.sensed(clear.at.volts).unwrap_or_default().0,
                "A",
                "Kirchhoff's current law at the sense base",
            ),
        ]);
        let mut related = vec![Related {
            message: "into this load".to_owned(),
            site: load.site,
        }];
        related.extend(self.build.amplifier.drop.stated_at().map(|site| Related {
            message: "what is lost of the rail".to_owned(),
            site,
        }));
        related.extend(self.rail_sites(None));
        Ok(Stress {
            value: if idle { 0.0 } else { clear.ratio.max(0.0) },
            rating: f64::NAN,
            witness: Witness {
                mains_v: self.mains_volts(Mains::Nominal),
                load: Some(load.name.clone()),
                frequency_hz: (!load.load.is_flat()).then_some(spot.frequency.0),
                amplitude_v: Some(amplitude.0),
                angle_deg: Some(clear.at.angle_rad * 180.0 / PI),
                sink_c: Some(heat.hot_spot.0),
                rail_v: Some(rail.0),
                device_v: Some(clear.at.volts.0),
                device_a: (limit.senses == Senses::Device).then_some(clear.at.amps.0),
                bank_a: (limit.senses == Senses::Bank).then_some(clear.at.amps.0),
                ..self.witness()
            },
            working,
            related,
            note: if idle {
                "at both rails the line allows no current at all: it acts with no load".to_owned()
            } else {
                String::new()
            },
            ..Stress::default()
        })
    }

    /// A short at the output: the current on the limit line through the most loaded device, against the
    /// derated d.c. curve, and against the current whose mean heat would bring the junction to its limit.
    ///
    /// # Errors
    /// What is missing; with no limiter, what acts instead.
    pub fn short_stresses(
        &self,
        rule: &Rule,
        heat: &Heat,
        side: Side,
    ) -> Result<Vec<Stress>, Needs> {
        let device = self.output().device(side);
        let limit = self.limit(Extreme::Most, self.coldest()?)?;
        let (area, bench, rail) = three(
            SafeArea::of(device),
            self.bench(),
            self.unsagged(Mains::High),
        )?;
        let short = shorted(&limit, bench.bank(side), rail)?;
        let case = self.case_temperature(heat, side)?;
        let mut working = self.limit_steps(&limit);
        working.extend([
            solved(
                "Vu",
                "unsagged rail, high mains",
                "V0 - Vd",
                rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            solved(
                "i",
                "of the most loaded device on the limit line",
                "limit line at v = Vu - i·RE, share",
                short.amps.0,
                "A",
                "Kirchhoff's laws; current sharing",
            ),
            solved(
                "v",
                "across it",
                "Vu - i·RE",
                short.volts.0,
                "V",
                "node voltages",
            ),
            solved(
                "Tcase",
                "case of the hottest device at the duty",
                "Tsink + P·θcs",
                case.0,
                "degC",
                "energy balance",
            ),
        ]);
        let witness = Witness {
            mains_v: self.mains_volts(Mains::High),
            frequency_hz: Some(self.band()?.bottom().0),
            duty: Some(self.duty().shown.clone()),
            case_c: Some(case.0),
            sink_c: Some(heat.hot_spot.0),
            rail_v: Some(short.rail.0),
            device_v: Some(short.volts.0),
            device_a: Some(short.amps.0),
            curve: Some("dc".to_owned()),
            ..self.witness()
        };
        let mut related = vec![Related {
            message: "the limit line".to_owned(),
            site: limit.site,
        }];
        related.extend(self.safe_area_sites(side, None));
        let stress = |rating: Amp, working, note: String| Stress {
            value: short.amps.0,
            rating: rating.0,
            witness: witness.clone(),
            working,
            related: related.clone(),
            note,
            ..Stress::default()
        };

        let allowed = match area.allowance(case)? {
            None => Amp::ZERO,
            Some(allowance) => {
                let usage = allowance
                    .point_usage(short.volts, short.amps)
                    .ok_or_else(|| Needs::because("the short is no point"))?;
                settled(&area, usage.coverage, usage.used, aim(self, rule))?;
                if usage.used > 0.0 {
                    usage.at.amps / usage.used
                } else {
                    allowance.allowed(short.volts)
                }
            }
        };
        let mut by_curve = working.clone();
        by_curve.push(solved(
            "Iallowed",
            "allowed at that voltage",
            "min(IC, k·P/v, kseg·C(v))",
            allowed.0,
            "A",
            "log-log curve of the data sheet, derated",
        ));

        let watts = short.rail * short.amps * 0.5;
        let (sink, until) = self.sink_in_a_short(heat, watts, short.least)?;
        let limit_at = *device.junction.need()?;
        let junction = mounting(self.output(), side)?
            .temperatures(sink, watts)
            .ok_or_else(|| Needs::because("thermal resistances must not be negative"))?
            .junction;
        let room = (limit_at - sink) / (junction - sink);
        let by_heat = if room.is_finite() && room > 0.0 {
            short.amps * room
        } else {
            Amp::ZERO
        };
        working.extend([
            solved(
                "P",
                "mean heat of the most loaded device, sine drive",
                "½·Vu·i",
                watts.0,
                "W",
                "half of each period at the limit",
            ),
            solved(
                "Ts",
                "sink when something acts",
                until,
                sink.0,
                "degC",
                "energy balance",
            ),
            solved(
                "Tj",
                "junction then, mean",
                "Ts + P·(θcs + θjc)",
                junction.0,
                "degC",
                "energy balance",
            ),
            solved(
                "Iallowed",
                "current that would bring it to Tj,max",
                "i·(Tj,max - Ts)/(Tj - Ts)",
                by_heat.0,
                "A",
                "heat goes with current",
            ),
        ]);
        let note = if by_heat < allowed {
            format!(
                "the mean heat decides: {:.0} degC at the junction, {until}",
                junction.0
            )
        } else {
            String::new()
        };
        Ok(vec![
            stress(allowed, by_curve, String::new()),
            stress(by_heat, working, note),
        ])
    }

    /// How hot the sink is when something ends a short, and what does: the cutout, else a rail fuse at
    /// the latest for the least current, else nothing, and the sink settles.
    fn sink_in_a_short(
        &self,
        heat: &Heat,
        watts: Watt,
        current: Amp,
    ) -> Result<(Celsius, &'static str), Needs> {
        let (sink, channels) = self.heatsink()?;
        let (model, air, pairs) = three(
            sink_model(sink),
            self.air_inside(),
            self.output().pairs.need().copied(),
        )?;
        if let Ok(latest) = self.cutout_latest()
            && latest >= heat.hot_spot
        {
            return Ok((latest, "sink at the latest trip of the cutout"));
        }
        let shorted = watts * f64::from(2 * pairs);
        let others =
            heat.total * (f64::from(channels.saturating_sub(1)) / f64::from(channels.max(1)));
        let settles = sink_temperature(&model, air, shorted + others)
            .ok_or_else(|| Needs::because("the heatsink has no temperature in a short"))?;
        // the rail carries a half-wave: r.m.s. of half the time at the limit
        let rail = current * f64::from(pairs) * std::f64::consts::FRAC_1_SQRT_2;
        if let (Some(mass), Some(time)) = (sink.mass.get(), self.rail_fuse_opens(rail)) {
            let warmed = heat.hot_spot.0 + shorted.0 * time.0 / (ALUMINIUM_HEAT_J_PER_KG_K * mass);
            if warmed.is_finite() && warmed < settles.0 {
                return Ok((
                    Celsius(warmed),
                    "sink when the rail fuse has opened at the latest",
                ));
            }
        }
        Ok((settles, "nothing acts: the sink settles"))
    }

    /// The latest that a rail fuse opens at a current.
    fn rail_fuse_opens(&self, current: Amp) -> Option<Second> {
        let fuse = self
            .supply()
            .ok()?
            .fuses
            .iter()
            .find(|f| f.place == "rail")?;
        let speed = if fuse.slow { Speed::Slow } else { Speed::Fast };
        melting(speed, fuse.rating, current).and_then(|m: Melting| m.most)
    }

    /// What acts in a short where no limiter is declared.
    #[must_use]
    pub fn acts_instead(&self) -> String {
        let fuse = self
            .supply()
            .ok()
            .and_then(|s| s.fuses.iter().find(|f| f.place == "rail"));
        match fuse {
            Some(fuse) => {
                let speed = if fuse.slow { Speed::Slow } else { Speed::Fast };
                let time = melting(speed, fuse.rating, fuse.rating * 10.0).and_then(|m| m.most);
                let time = time.map_or_else(
                    || "in a time not known".to_owned(),
                    |t| format!("within {:.0} ms at ten times that", 1e3 * t.0),
                );
                format!(
                    "no limiter is declared: only the {:.3} A rail fuse acts, {time}; transistors die sooner",
                    fuse.rating.0
                )
            }
            None => "no limiter and no rail fuse are declared: nothing acts in a short".to_owned(),
        }
    }
}

/// Neither a limiter nor a limit line is stated.
fn absent(protection: &Protection) -> bool {
    protection.limiter.get().is_none() && protection.limit_line.get().is_none()
}

/// Where a short settles on the limit line, for the most loaded device.
fn shorted(limit: &Limit, bank: &Bank, rail: Volt) -> Result<Short, Needs> {
    let series = match limit.senses {
        Senses::Device => bank.emitter(),
        Senses::Bank => bank.emitters_in_parallel(),
    };
    let points: Option<Vec<_>> = limit
        .lines
        .iter()
        .map(|l| l.short_circuit(rail, series))
        .collect();
    let worst = points.and_then(|p| p.into_iter().max_by(|a, b| a.amps.0.total_cmp(&b.amps.0)));
    let worst = worst.ok_or_else(|| {
        Needs::because("the limit line never meets the short: nothing is limited")
    })?;
    let amps = limit
        .most_loaded(bank, worst.amps)
        .ok_or_else(|| Needs::because("the devices do not share at the limit"))?;
    let least = match limit.senses {
        Senses::Device => worst.amps,
        Senses::Bank => worst.amps / f64::from(bank.devices()),
    };
    Ok(Short {
        volts: worst.volts,
        amps,
        least,
        rail,
    })
}

/// A limit line by its points up to a voltage; `None` where it rises.
fn falling(line: &limiter::LimitLine, top: Volt) -> Option<LimitLine> {
    // one point beyond, so that the last stretch keeps its slope over all of the swing
    let mut volts = vec![Volt::ZERO, top * 2.0];
    volts.extend(
        line.corners()
            .map(|c| c.volts)
            .filter(|v| *v > Volt::ZERO && *v < top * 2.0),
    );
    volts.sort_by(|a, b| a.0.total_cmp(&b.0));
    volts.dedup();
    let points: Option<Vec<_>> = volts
        .iter()
        .map(|v| Some((*v, line.current(*v)?)))
        .collect();
    LimitLine::new(&points?)
}
