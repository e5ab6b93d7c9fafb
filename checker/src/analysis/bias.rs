//! Whether the idle current can run away with heat, and whether two statements of it agree.
//! Must not know what loop gain or what difference is allowed.

use super::Stress;
use super::case::{Case, Side, solved, stated};
use super::chain::no_gain;
use super::devices::{emitter, idle_of, transfer};
use super::heat::{mounting, sink_model};
use super::rails::Mains;
use crate::build::Needs;
use crate::build::parts::{Device, Flavour, Idle, Stage, both, three};
use crate::finding::{Related, Step, Witness};
use crate::physics::bias::{
    BASE_EMITTER_DRIFT, Heating, THERMAL_VOLTAGE, ThermalLoop, disagreement,
};
use crate::physics::heat::sink_temperature;
use crate::physics::load::Impedance;
use crate::physics::math::ln;
use crate::physics::unit::{Amp, KelvinPerWatt, Ohm, Volt, VoltPerKelvin, Watt};

/// The device whose junction voltage sets the idle current.
struct Setter<'c> {
    stage: &'c Stage,
    /// Its current at idle.
    current: Amp,
    /// Resistance in its emitter loop, at its lowest.
    resistance: Ohm,
    /// Drift of its junction voltage.
    drift: VoltPerKelvin,
    /// Slope resistance of its junction.
    inverse_gm: Ohm,
    /// Watts into the output sink for each watt of it.
    sharing: f64,
    /// Whether it stands on the sink of the output devices.
    on_sink: bool,
}

/// The lowest resistance in the emitter of each device of a stage.
fn least_emitter(stage: &Stage) -> Result<Ohm, Needs> {
    stage
        .emitter
        .get()
        .map_or_else(|| emitter(stage), |r| Ok(r.ohm.low))
}

/// Drift of the gate voltage at a drain current, straight in ln I between the stated points.
fn gate_drift(device: &Device, current: Amp) -> Result<VoltPerKelvin, Needs> {
    let points = device.gate_drift.need()?;
    let inside = points.windows(2).find_map(|pair| match pair {
        [a, b] if a.1 <= current && current <= b.1 && a.1 < b.1 && a.1 > Amp::ZERO => {
            let along = ln(current / a.1) / ln(b.1 / a.1);
            Some(a.0 + (b.0 - a.0) * along)
        }
        _ => None,
    });
    let at_a_point = || {
        points
            .iter()
            .find(|p| (p.1 / current - 1.0).abs() < 0.01)
            .map(|p| p.0)
    };
    inside.or_else(at_a_point).ok_or_else(|| {
        Needs::because(format!(
            "the gate-drift points of {} do not reach its idle current of {:.3} A",
            device.owner.name, current.0
        ))
    })
}

impl Case<'_> {
    /// Whether a stage stands on the sink that the output devices stand on.
    #[must_use]
    pub fn on_output_sink(&self, stage: &Stage) -> bool {
        std::ptr::eq(stage, std::rc::Rc::as_ptr(self.output()))
            || (stage.own_sink.get().is_none() && self.output().own_sink.get().is_none())
    }

    /// Whether the bias sensor feels the sink of the output devices (κ); `none` fitted feels nothing.
    ///
    /// # Errors
    /// When it is not stated.
    pub fn sensor_on_sink(&self) -> Result<bool, Needs> {
        let stage = self.output();
        if stage.sensor.none {
            return Ok(false);
        }
        Ok(match stage.sensor.need()?.0 {
            "sink" | "device" => true,
            "driver" => {
                let driver = self
                    .build
                    .amplifier
                    .driver
                    .as_ref()
                    .ok_or_else(|| self.build.amplifier.driver_field.missing())?;
                self.on_output_sink(driver)
            }
            _ => false,
        })
    }

    /// Resistance of the output sink as the chord ΔT/P at idle, and the output devices on it.
    fn output_sink_at_idle(&self, rail: Volt, idle: Amp) -> Result<(KelvinPerWatt, f64), Needs> {
        let stage = self.output();
        let pairs = f64::from(*stage.pairs.need()?);
        if let Some((own, per)) = stage.own_sink.get() {
            return Ok((*own, if *per == "device" { 1.0 } else { 2.0 * pairs }));
        }
        let ((sink, channels), air) = both(self.heatsink(), self.air_inside())?;
        let devices = 2.0 * pairs * f64::from(channels);
        // Drivers at rest warm it too. Where theirs is not known it is left out, which is the safe side:
        // a cooler sink has the greater resistance.
        let quiet = Impedance::resistive(Ohm(8.0));
        let others = self.other_watts(rail, Volt::ZERO, quiet);
        let watts: Watt =
            rail * idle * devices + others.unwrap_or(Watt::ZERO) * f64::from(channels);
        let model = sink_model(sink)?;
        let temperature = sink_temperature(&model, air, watts).ok_or_else(|| {
            Needs::because(format!(
                "heatsink {} has no temperature at {:.1} W",
                sink.owner.name, watts.0
            ))
        })?;
        Ok(((temperature - air) / watts, devices))
    }

    fn setter(&self, side: Side, idle: Amp) -> Result<Setter<'_>, Needs> {
        let output: &Stage = self.output();
        let device = output.device(side);
        if output.connection == "compound-pair" {
            return self.setter_of_pair(side, idle);
        }
        let resistance = least_emitter(output)?;
        let (drift, inverse_gm) = match device.flavour {
            Flavour::Bipolar => (BASE_EMITTER_DRIFT, THERMAL_VOLTAGE / idle),
            Flavour::Mosfet => {
                let (curve, drift) = both(transfer(device), gate_drift(device, idle))?;
                let siemens = curve.transconductance_siemens(idle).filter(|g| *g > 0.0);
                let siemens = siemens.ok_or_else(|| {
                    Needs::because(format!(
                        "the gate-source points of {} do not reach its idle current of {:.3} A",
                        device.owner.name, idle.0
                    ))
                })?;
                (drift, Ohm(1.0 / siemens))
            }
        };
        Ok(Setter {
            stage: output,
            current: idle,
            resistance,
            drift,
            inverse_gm,
            sharing: 1.0,
            on_sink: true,
        })
    }

    /// In a compound pair the driver's junction sets the current; the output devices only multiply it.
    fn setter_of_pair(&self, side: Side, idle: Amp) -> Result<Setter<'_>, Needs> {
        let output = self.output();
        let driver = self
            .build
            .amplifier
            .driver
            .as_ref()
            .ok_or_else(|| self.build.amplifier.driver_field.missing())?;
        let ((bank, drivers), pairs, resistance) = three(
            both(self.follower(output, side), driver.pairs.need().copied()),
            output.pairs.need().copied(),
            least_emitter(driver),
        )?;
        let name = &output.device(side).owner.name;
        let drivers = f64::from(drivers.max(1));
        let current = bank
            .demand(idle * f64::from(pairs))
            .map_err(|e| no_gain(name, &e))?
            / drivers;
        let gain = bank.gain.at(idle).map_err(|e| no_gain(name, &e))?;
        Ok(Setter {
            stage: driver,
            current,
            resistance,
            drift: BASE_EMITTER_DRIFT,
            inverse_gm: THERMAL_VOLTAGE / current,
            sharing: gain * drivers / f64::from(pairs.max(1)),
            on_sink: self.on_output_sink(driver),
        })
    }

    /// Loop gain of the idle current of one side, high mains, hottest room.
    ///
    /// # Errors
    /// What stage, device, sink or supply do not state.
    pub fn bias_loop(&self, side: Side) -> Result<Stress, Needs> {
        let (idle, rail, tracked) = three(
            self.idle(),
            self.unsagged(Mains::High),
            self.sensor_on_sink(),
        )?;
        let setter = self.setter(side, idle)?;
        let mounting = mounting(setter.stage, side)?;
        let followed = self.output().sensor.get().is_some_and(|s| s.0 == "driver");
        let own = match setter.stage.own_sink.get() {
            // a driver's own sink adds to the path, unless the sensor is on it
            Some((sink, per)) if !setter.on_sink && !followed => {
                let sharing = if *per == "device" {
                    1.0
                } else {
                    2.0 * f64::from(*setter.stage.pairs.need()?)
                };
                mounting.junction_case + mounting.case_sink + *sink * sharing
            }
            _ => mounting.junction_case + mounting.case_sink,
        };
        // where device and sensor feel the sink alike it cancels, and nothing need be known of it
        let (sink, devices) = if setter.on_sink == tracked {
            (KelvinPerWatt::ZERO, 0.0)
        } else {
            // the rail idles below its unsagged value: less heat, and a sink that is worse for it
            let idling = self.mean_rail(Mains::High, self.rail_current(Amp::ZERO)?)?;
            self.output_sink_at_idle(idling, idle)?
        };
        let heating = Heating {
            own,
            sink,
            sharing: devices * setter.sharing,
            device_on_sink: setter.on_sink,
            sensor_on_sink: tracked,
        };
        let wrong = || {
            Needs::because(
                "the thermal resistances and currents of the bias loop make no sense together",
            )
        };
        let theta = heating.effective().ok_or_else(wrong)?;
        let model = match setter.stage.device(side).flavour {
            Flavour::Bipolar => {
                ThermalLoop::bipolar(rail, theta, setter.current, setter.resistance)
            }
            Flavour::Mosfet => ThermalLoop::fet(
                rail,
                theta,
                setter.drift,
                setter.inverse_gm,
                setter.resistance,
            ),
        };
        let model = model.ok_or_else(wrong)?;
        let (gain, safe) = model.gain().zip(model.unconditional()).ok_or_else(wrong)?;
        let note = if setter.drift >= VoltPerKelvin::ZERO {
            "above its zero-coefficient current the device turns itself down as it warms"
        } else if gain < 0.0 {
            "over-compensated: the idle current falls as the sink warms"
        } else {
            ""
        };
        Ok(Stress {
            value: gain,
            rating: f64::NAN,
            witness: Witness {
                mains_v: self.mains_volts(Mains::High),
                ambient_c: self.hottest().ok().map(|t| t.0),
                rail_v: Some(rail.0),
                device_v: Some(rail.0),
                device_a: Some(setter.current.0),
                ..self.witness()
            },
            working: self.loop_working(&setter, rail, theta, safe),
            related: loop_sites(self.output(), &setter),
            note: note.to_owned(),
            ..Stress::default()
        })
    }

    fn loop_working(
        &self,
        setter: &Setter<'_>,
        rail: Volt,
        theta: KelvinPerWatt,
        safe: Ohm,
    ) -> Vec<Step> {
        let resistor = setter.stage.emitter.stated_at();
        vec![
            solved(
                "Vu",
                "unsagged rail, high mains",
                "V0 - Vd",
                rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            stated(
                "Iq",
                "idle current of the device that sets it",
                setter.current.0,
                "A",
                self.output().idle.stated_at(),
            ),
            solved(
                "1/gm",
                "slope resistance of its junction",
                "VT/Iq, or 1/gm of the transfer curve",
                setter.inverse_gm.0,
                "ohm",
                "junction law",
            ),
            stated(
                "RE",
                "resistor in its emitter, at its lowest",
                setter.resistance.0,
                "ohm",
                resistor,
            ),
            solved(
                "dV/dT",
                "drift of its junction voltage",
                "",
                setter.drift.0,
                "V/K",
                "band-gap theory, Gray and Meyer, from memory; of a MOSFET its data sheet",
            ),
            solved(
                "θeff",
                "heat path that the sensor does not follow",
                "θjc + θcs + (d - κ)·Rsa·n",
                theta.0,
                "K/W",
                "energy balance",
            ),
            solved(
                "REsafe",
                "emitter resistance above which no idle current runs away",
                "|dV/dT|·θeff·Vu",
                safe.0,
                "ohm",
                "limit of S = 1 at 1/gm = 0",
            ),
        ]
    }
}

fn loop_sites(output: &Stage, setter: &Setter<'_>) -> Vec<Related> {
    let mut related = Vec::new();
    let mut say = |message: &str, site: Option<crate::finding::Site>| {
        if let Some(site) = site {
            related.push(Related {
                message: message.to_owned(),
                site,
            });
        }
    };
    say("the idle current", output.idle.stated_at());
    say("where the sensor is", output.sensor.stated_at());
    say("case to sink", setter.stage.insulator.stated_at());
    related
}

/// How far two groups of one `idle` line are apart beyond what the tolerance of the emitter resistor
/// explains, per cent; with what the slip looks like.
///
/// # Errors
/// What is needed to turn volts into amperes.
pub fn idle_apart(stage: &Stage, a: &Idle, b: &Idle) -> Result<Stress, Needs> {
    let (ia, ib) = both(idle_of(stage, a), idle_of(stage, b))?;
    let ((more, high), (less, low)) = if ia >= ib {
        ((a, ia), (b, ib))
    } else {
        ((b, ib), (a, ia))
    };
    // volts across the same resistor share its tolerance; volts and amperes do not
    let mixed = more.volts.is_some() != less.volts.is_some();
    let spread = stage.emitter.get().filter(|_| mixed).map(|r| r.ohm);
    let floor = spread
        .filter(|_| more.volts.is_some())
        .map_or(high, |r| high * (r.nominal / r.high));
    let ceiling = spread
        .filter(|_| less.volts.is_some())
        .map_or(low, |r| low * (r.nominal / r.low));
    let unequal = || {
        Needs::because(format!(
            "a group of `idle` of stage {} states no current",
            stage.owner.name
        ))
    };
    let apart = if floor > ceiling {
        disagreement(floor, ceiling).ok_or_else(unequal)?
    } else {
        0.0
    };
    let pairs = *stage.pairs.need()?;
    Ok(Stress {
        value: 100.0 * apart,
        rating: f64::NAN,
        witness: Witness {
            device_a: Some(high.0),
            ..Witness::default()
        },
        working: vec![
            stated(
                "I1",
                "one group, as current of one device",
                ia.0,
                "A",
                [a.site],
            ),
            stated(
                "I2",
                "the other group, as current of one device",
                ib.0,
                "A",
                [b.site],
            ),
            solved(
                "apart",
                "beyond the tolerance of the emitter resistor",
                "greater/lesser - 1",
                100.0 * apart,
                "%",
                "Ohm's law",
            ),
        ],
        related: stage
            .emitter
            .stated_at()
            .into_iter()
            .map(|site| Related {
                message: "the resistor that joins volts and amperes".to_owned(),
                site,
            })
            .collect(),
        note: if apart > 0.0 {
            let amps = |a: Amp| {
                crate::quantity::format_digits(a.0, crate::quantity::Dimension::Current, 3)
            };
            let slip = slip(high / low, pairs, mixed || more.volts.is_some());
            format!("{} and {} of one device{slip}", amps(ia), amps(ib))
        } else {
            String::new()
        },
        ..Stress::default()
    })
}

/// What a factor between two statements of one current looks like.
fn slip(factor: f64, pairs: u32, volts: bool) -> String {
    let near = |x: f64| (factor / x - 1.0).abs() < 0.1;
    let mut likely = Vec::new();
    if pairs > 1 && near(f64::from(pairs)) {
        likely.push("per device and per channel mistaken");
    }
    if volts && near(2.0) {
        likely.push("volts across one emitter resistor and across both mistaken");
    }
    if [10.0, 100.0, 1000.0].into_iter().any(near) {
        likely.push("a decimal point lost");
    }
    if likely.is_empty() {
        String::new()
    } else {
        format!("; a factor of {factor:.2}: {}", likely.join(", or "))
    }
}
