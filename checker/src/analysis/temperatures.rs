//! Temperatures beside those of the duty: the peak of a junction, drivers, what people touch, and
//! the sink when a cutout opens.
//! Must not know what is allowed.

use super::case::{Case, Side};
use super::heat::{Heat, at, mounting, sink_model};
use super::loads::Driven;
use super::rails::Mains;
use crate::build::Needs;
use crate::build::parts::{Flavour, Stage, both, three};
use crate::physics::foster::{Foster, HalfCycle, Term};
use crate::physics::heat::{Mounting, sink_temperature};
use crate::physics::protection::Cutout;
use crate::physics::unit::{Celsius, Hertz, Kelvin, Second, Volt, Watt};

/// Time constant, s, of a junction that follows every instant of an audio signal.
const NO_CAPACITY: Second = Second(1e-6);

/// Tolerance of a cutout that states none; common practice, no source.
const UNSTATED_TOLERANCE: Kelvin = Kelvin(3.0);
/// Air at which touched parts are judged.
pub const TOUCH_AMBIENT: Celsius = Celsius(25.0);

/// The hottest moment of a junction at the bottom of the band.
#[derive(Clone, Copy, Debug)]
pub struct PeakJunction {
    /// Unsagged rail.
    pub rail: Volt,
    /// Peak output.
    pub amplitude: Volt,
    /// Frequency.
    pub frequency: Hertz,
    /// Case at the duty.
    pub case: Celsius,
    /// Greatest rise above the case that the signal causes.
    pub rise: Kelvin,
    /// Rise that the idle current causes, added whole.
    pub idle_rise: Kelvin,
    /// How much more than its even part the most loaded device carries, at the mean current.
    pub share: f64,
    /// The junction.
    pub junction: Celsius,
    /// No transient terms are stated: the junction is taken to have no heat capacity, which no real one
    /// is hotter than.
    pub bounded: bool,
}

/// A driver at the duty.
#[derive(Clone, Copy, Debug)]
pub struct DriverHeat {
    /// Peak output at which it is hottest, up to that of the duty.
    pub amplitude: Volt,
    /// Mean watts of one device.
    pub watts: Watt,
    /// What it is screwed to.
    pub sink: Celsius,
    /// Its case.
    pub case: Celsius,
    /// Its junction.
    pub junction: Celsius,
    /// It has a sink of its own.
    pub own_sink: bool,
}

impl Case<'_> {
    /// Each load with the heat of the duty in it, in order of declaration, or what it lacks.
    #[must_use]
    pub fn played(&self) -> Vec<Result<(&Driven, &Heat), Needs>> {
        match both(self.loads(), self.heats()) {
            Err(needs) => vec![Err(needs)],
            Ok((loads, heats)) => loads
                .iter()
                .zip(heats)
                .map(|(load, heat)| {
                    both(
                        load.as_ref().map_err(Clone::clone),
                        heat.as_ref().map_err(Clone::clone),
                    )
                })
                .collect(),
        }
    }

    /// That a load's table leaves part of the band unknown.
    #[must_use]
    pub fn unknown_part(&self, load: &Driven) -> Option<Needs> {
        load.uncovered(self.band().ok()?)
    }

    /// Peak of the most loaded junction of a side under a sine at V(burst) at the bottom of the band,
    /// repeated for ever, from the case at the duty.
    ///
    /// # Errors
    /// When the Foster terms, or anything else it takes, are not stated.
    pub fn peak_junction(
        &self,
        heat: &Heat,
        load: &Driven,
        side: Side,
    ) -> Result<PeakJunction, Needs> {
        let device = self.output().device(side);
        // a junction without heat capacity follows every instant: no network is hotter
        let bounded = device.foster.get().is_none();
        let terms = match device.foster.get() {
            Some(terms) => Ok(terms.clone()),
            None => device.junction_case.need().map(|r| vec![(*r, NO_CAPACITY)]),
        };
        let ((terms, case), (bench, idle), (rail, drop)) = three(
            both(terms, self.case_temperature(heat, side)),
            both(self.bench(), self.idle()),
            both(self.unsagged(Mains::Nominal), self.drop()),
        )?;
        let terms: Vec<Term> = terms
            .iter()
            .map(|(r, tau)| Term {
                resistance: *r,
                time_constant: *tau,
            })
            .collect();
        let foster = Foster::new(&terms).ok_or_else(|| {
            Needs::because(format!(
                "the foster terms of {} must be positive, 32 at most",
                device.owner.name
            ))
        })?;
        let frequency = self.band()?.bottom();
        let bank = bench.bank(side);
        let devices = f64::from(bank.devices());
        let idle_rise = rail * (idle * bank.share(idle * devices)) * foster.steady();
        let mut worst: Option<PeakJunction> = None;
        for variant in load.load.variants() {
            let Some(z) = load.load.impedance(variant, frequency) else {
                continue;
            };
            let z = load.seen(z);
            let found = drop.burst(rail, z.modulus()).and_then(|amplitude| {
                // the share of the mean current, greater than that of the peak
                let share = bank.share(amplitude / z.modulus() / crate::physics::math::PI);
                let half = HalfCycle::new(
                    rail,
                    amplitude,
                    z,
                    bank.emitters_in_parallel(),
                    (share / devices).min(1.0),
                )?;
                let rise = foster.periodic_peak(&half, frequency)?;
                Some(PeakJunction {
                    rail,
                    amplitude,
                    frequency,
                    case,
                    rise,
                    idle_rise,
                    share,
                    junction: case + rise + idle_rise,
                    bounded,
                })
            });
            match found {
                Some(found) if worst.is_none_or(|w| found.junction > w.junction) => {
                    worst = Some(found)
                }
                _ => {}
            }
        }
        worst.ok_or_else(|| {
            load.uncovered(Self::band(self).unwrap_or(load.covered))
                .unwrap_or_else(|| {
                    Needs::because(format!(
                        "load {} has no impedance at {:.0} Hz",
                        load.name, frequency.0
                    ))
                })
        })
    }

    /// A driver of a side at the duty: on a sink of its own, else on the build's.
    ///
    /// # Errors
    /// What driver, output stage or sink do not state.
    pub fn driver_temperatures(
        &self,
        stage: &Stage,
        heat: &Heat,
        side: Side,
    ) -> Result<DriverHeat, Needs> {
        if self.output().device(side).flavour == Flavour::Mosfet {
            return Err(Needs::because(
                "the driver's heat depends on the charge of the gates, which is not stated",
            ));
        }
        let ((amplitude, watts), mounting) = both(
            self.driver_heat(side, heat.rail, heat.duty.amplitude, heat.duty.load),
            mounting(stage, side),
        )?;
        let sink = match stage.own_sink.get() {
            None => heat.hot_spot,
            Some((resistance, per)) => {
                let shared = if *per == "device" {
                    1.0
                } else {
                    f64::from(2 * *stage.pairs.need()?)
                };
                self.air_inside()? + watts * shared * *resistance
            }
        };
        let mounting: Mounting = mounting;
        let found = mounting
            .temperatures(sink, watts)
            .ok_or_else(|| Needs::because("thermal resistances must not be negative"))?;
        Ok(DriverHeat {
            amplitude,
            watts,
            sink,
            case: found.case,
            junction: found.junction,
            own_sink: stage.own_sink.get().is_some(),
        })
    }

    /// The sink as warm as in a room at 25 degC.
    ///
    /// # Errors
    /// What the sink does not state.
    pub fn touched(&self, heat: &Heat) -> Result<Celsius, Needs> {
        let (sink, _) = self.heatsink()?;
        let air = TOUCH_AMBIENT + self.build.enclosure.get().copied().unwrap_or(Kelvin::ZERO);
        sink_temperature(&sink_model(sink)?, air, heat.total).ok_or_else(|| {
            Needs::because(format!(
                "heatsink {} has no temperature at {:.1} W",
                sink.owner.name, heat.total.0
            ))
        })
    }

    /// The cutout at its place.
    ///
    /// # Errors
    /// When it, or how much cooler its place is, is not stated.
    pub fn cutout(&self) -> Result<Cutout, Needs> {
        let field = &self.protection()?.cutout;
        let stated = field.need()?;
        let cooler = field.part("cooler", |c| c.cooler)?;
        let tolerance = if stated.toleranced {
            (stated.trip.high - stated.trip.nominal).max(stated.trip.nominal - stated.trip.low)
        } else {
            let key = format!("protection {} cutout tolerance", field.owner().name);
            self.assume(
                key,
                crate::finding::Measure::new(UNSTATED_TOLERANCE.0, "K"),
                "usual for a bimetal cutout",
                field.site(),
            );
            UNSTATED_TOLERANCE
        };
        Ok(Cutout {
            trip: stated.trip.nominal,
            tolerance,
            cooler,
        })
    }

    /// The sink beside the devices when a late cutout opens.
    ///
    /// # Errors
    /// As [`Case::cutout`].
    pub fn cutout_latest(&self) -> Result<Celsius, Needs> {
        self.cutout()?
            .sink_at_latest()
            .ok_or_else(|| Needs::because("the cutout has no latest trip"))
    }

    /// Case and junction of the most loaded device of a side with the sink held at a temperature and
    /// the heat of the duty.
    ///
    /// # Errors
    /// When thermal resistances are not stated.
    pub fn held(
        &self,
        heat: &Heat,
        side: Side,
        sink: Celsius,
    ) -> Result<(Celsius, Celsius), Needs> {
        let found = mounting(self.output(), side)?.temperatures(sink, heat.device[at(side)]);
        found
            .map(|t| (t.case, t.junction))
            .ok_or_else(|| Needs::because("thermal resistances must not be negative"))
    }
}
