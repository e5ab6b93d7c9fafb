//! Temperatures at the duty: watts of every device on a sink, the sink, the cases, the junctions.
//! Must not know what is allowed.

use super::case::{Case, Side};
use super::devices::emitter;
use super::loads::Driven;
use super::rails::Mains;
use super::signal::Duty;
use crate::build::Needs;
use crate::build::parts::{Heatsink, Stage, both, three};
use crate::physics::heat::{Mounting, Temperatures, hottest_place, sink_temperature};
use crate::physics::heatsink::{FinnedSink, Geometry, Material, Orientation, Sink, StatedSink};
use crate::physics::output_stage::BankHeat;
use crate::physics::sharing::Bank;
use crate::physics::unit::{Amp, Celsius, KelvinPerWatt, Volt, Watt};

/// Emissivity of black anodised aluminium; from memory.
const ANODISED: f64 = 0.85;
/// Thermal conductivity of extruded aluminium, W/(m K); from memory.
const ALUMINIUM: f64 = 200.0;

/// Heat and temperatures of one sink while every channel plays the duty into one load.
#[derive(Clone, Copy, Debug)]
pub struct Heat {
    /// The signal.
    pub duty: Duty,
    /// Mean rail.
    pub rail: Volt,
    /// Heat of one bank: upper, lower.
    pub bank: [BankHeat; 2],
    /// The build idles hotter than it plays: idle decides.
    pub idle_decides: bool,
    /// Mean watts of the most loaded device: upper, lower.
    pub device: [Watt; 2],
    /// Watts of one channel's other stages on the sink.
    pub other: Watt,
    /// All watts on one sink.
    pub total: Watt,
    /// Mean temperature of the sink.
    pub sink: Celsius,
    /// The hottest place on it.
    pub hot_spot: Celsius,
    /// Sink, case and junction at the most loaded, hottest device: upper, lower; `Err` where its own
    /// thermal resistances are missing.
    pub air: Celsius,
}

/// Index of a side in the arrays of [`Heat`].
#[must_use]
pub fn at(side: Side) -> usize {
    match side {
        Side::Upper => 0,
        Side::Lower => 1,
    }
}

impl Case<'_> {
    /// Heat at the duty for each load, in order of declaration.
    ///
    /// # Errors
    /// When the build states no loads.
    pub fn heats(&self) -> Result<&[Result<Heat, Needs>], Needs> {
        let loads = self.loads()?;
        Ok(self.heat.get_or_init(|| {
            loads
                .iter()
                .map(|load| match load {
                    Ok(load) => self.heat_at(load, self.duty().fraction, Mains::Nominal),
                    Err(needs) => Err(needs.clone()),
                })
                .collect()
        }))
    }

    /// Heat with every channel at a fraction of the power at clip.
    ///
    /// # Errors
    /// What the build does not state.
    pub fn heat_at(&self, load: &Driven, fraction: f64, mains: Mains) -> Result<Heat, Needs> {
        let duty = self.signal_at(load, fraction)?;
        let rail = self.mean_rail(mains, duty.rail_current)?;
        let (idle, other) = both(
            self.idle(),
            self.other_watts(rail, duty.amplitude, duty.load),
        )?;
        let signal = self.sine(duty.amplitude, duty.load)?;
        // what the emitter resistors do not take, the devices do
        let least = least_resistors(self.output())?;
        let mut quiet = None;
        let mut bank = [BankHeat {
            signal: Watt::ZERO,
            idle: Watt::ZERO,
        }; 2];
        let mut device = [Watt::ZERO; 2];
        for side in Side::BOTH {
            let parallel = self.bench()?.bank(side);
            let playing = signal.heat(rail, &least, idle);
            // the greater of playing and idling stands
            let idle_rail = match quiet {
                Some(volts) => volts,
                None => {
                    let volts = self.mean_rail(mains, self.rail_current(Amp::ZERO)?)?;
                    quiet = Some(volts);
                    volts
                }
            };
            let pairs = f64::from(parallel.devices());
            let idling = BankHeat {
                signal: Watt::ZERO,
                idle: idle_rail * idle * pairs,
            };
            let stands = if idling.total() > playing.total() {
                idling
            } else {
                playing
            };
            // the mean current of the bank decides how unevenly it divides
            let mean = duty.peak / crate::physics::math::PI + idle * pairs;
            bank[at(side)] = stands;
            device[at(side)] = stands.total() / pairs * parallel.share(mean);
        }
        let idle_decides =
            bank.iter().all(|b| b.signal == Watt::ZERO) && duty.amplitude > Volt::ZERO;
        let (sink, channels) = self.heatsink()?;
        let total = (bank[0].total() + bank[1].total() + other) * f64::from(channels);
        let (model, air) = both(sink_model(sink), self.air_inside())?;
        let mean = sink_temperature(&model, air, total).ok_or_else(|| {
            Needs::because(format!(
                "heatsink {} has no temperature at {:.1} W",
                sink.owner.name, total.0
            ))
        })?;
        let stage = self.output();
        let spread = *stage.spread_across_sink.need()?;
        let places = 2 * stage.pairs.need()? * channels;
        let hot_spot = hottest_place(mean, spread, places)
            .ok_or_else(|| Needs::because("the spread across the sink must not be negative"))?;
        Ok(Heat {
            duty,
            rail,
            bank,
            idle_decides,
            device,
            other,
            total,
            sink: mean,
            hot_spot,
            air,
        })
    }

    /// Sink, case and junction of the hottest device of a side.
    ///
    /// # Errors
    /// When its thermal resistances are not stated.
    pub fn temperatures(&self, heat: &Heat, side: Side) -> Result<Temperatures, Needs> {
        let stage = self.output();
        let mounting = mounting(stage, side)?;
        mounting
            .temperatures(heat.hot_spot, heat.device[at(side)])
            .ok_or_else(|| Needs::because("thermal resistances must not be negative"))
    }

    /// Case of the hottest device of a side: needs no junction resistance.
    ///
    /// # Errors
    /// When the insulator is not stated.
    pub fn case_temperature(&self, heat: &Heat, side: Side) -> Result<Celsius, Needs> {
        let insulator = case_to_sink(self.output())?;
        Ok(heat.hot_spot + heat.device[at(side)] * insulator)
    }

    /// The load whose duty makes the sink hottest, with its heat.
    ///
    /// # Errors
    /// What any load lacks: the hottest might be the one that is not known.
    pub fn hottest_load(&self) -> Result<(&Driven, &Heat), Needs> {
        let (loads, heats) = both(self.loads(), self.heats())?;
        let mut worst: Option<(&Driven, &Heat)> = None;
        for (load, heat) in loads.iter().zip(heats) {
            let (load, heat) = both(
                load.as_ref().map_err(Clone::clone),
                heat.as_ref().map_err(Clone::clone),
            )?;
            if worst.is_none_or(|(_, w)| heat.sink > w.sink) {
                worst = Some((load, heat));
            }
        }
        worst.ok_or_else(|| self.build.loads.missing())
    }
}

/// The bank with every emitter resistor at the low end of its tolerance.
fn least_resistors(stage: &Stage) -> Result<Bank, Needs> {
    let (pairs, nominal) = both(stage.pairs.need().copied(), emitter(stage))?;
    let least = stage.emitter.get().map_or(nominal, |r| r.ohm.low);
    Bank::even(pairs, least).ok_or_else(|| {
        Needs::because(format!(
            "pairs and emitter resistor of stage {} do not make a bank",
            stage.owner.name
        ))
    })
}

/// Case to sink; `none` is bare metal on metal with no insulator stated, which still has a resistance,
/// so it must be stated as a figure.
///
/// # Errors
/// When it is not stated.
pub fn case_to_sink(stage: &Stage) -> Result<KelvinPerWatt, Needs> {
    stage.insulator.need().copied()
}

/// Junction to case to sink of a side.
///
/// # Errors
/// What is not stated.
pub fn mounting(stage: &Stage, side: Side) -> Result<Mounting, Needs> {
    let (junction_case, case_sink) = both(
        stage.device(side).junction_case.need().copied(),
        case_to_sink(stage),
    )?;
    Ok(Mounting {
        junction_case,
        case_sink,
    })
}

/// A declared heatsink as a model.
///
/// # Errors
/// When neither resistance nor geometry is stated, or they make no sink.
pub fn sink_model(sink: &Heatsink) -> Result<Sink, Needs> {
    let wrong = |why: &str| Needs::because(format!("heatsink {}: {why}", sink.owner.name));
    if let Some((resistance, rise)) = sink.resistance.get() {
        return StatedSink::new(*resistance, *rise)
            .map(Sink::Stated)
            .ok_or_else(|| wrong("resistance and rise must be positive"));
    }
    if sink.plate.get().is_none() && sink.fins.get().is_none() {
        return Err(sink.resistance.missing());
    }
    let ([width, height, plate], (fins, [length, thick, gap], vertical), _) = three(
        sink.plate.need().copied(),
        sink.fins.need().copied(),
        Ok(()),
    )?;
    let geometry = Geometry {
        width_m: width,
        length_m: height,
        plate_m: plate,
        fins,
        fin_height_m: length,
        fin_m: thick,
        gap_m: gap,
        orientation: if vertical {
            Orientation::Vertical
        } else {
            Orientation::Horizontal
        },
        back_open: false,
    };
    let material = Material {
        emissivity: ANODISED,
        conductivity_w_per_mk: ALUMINIUM,
    };
    FinnedSink::new(geometry, material)
        .map(Sink::Finned)
        .map_err(|fault| wrong(&format!("{fault:?}")))
}
