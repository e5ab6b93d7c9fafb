//! Numbers that people want beside a line: rails, powers, temperatures, amps.
//! Must not judge any of them.

use super::case::{Case, Side};
use super::heat::at;
use super::rails::{Mains, Rails, Reservoir};
use crate::build::Needs;
use crate::finding::{Corner, Derived, Measure, Site};
use crate::physics::output_stage::power;
use crate::physics::unit::Amp;

/// Add what this case has to show. What cannot be solved is left out: the margins say why.
pub fn note(case: &Case<'_>, out: &mut Vec<Derived>) {
    let mut notes = Notes {
        case,
        region: case
            .region
            .map(|r| format!("{} V", r.nominal.0))
            .unwrap_or_default(),
        out,
    };
    // each group stands alone: one that lacks a key must not take the others with it
    let _ = notes.rails();
    let _ = notes.loads();
    let _ = notes.heat();
}

struct Notes<'n, 'c> {
    case: &'n Case<'c>,
    region: String,
    out: &'n mut Vec<Derived>,
}

impl Notes<'_, '_> {
    fn add(
        &mut self,
        name: &'static str,
        of: &str,
        (mains, drive): (Mains, &'static str),
        value: Measure,
        site: Site,
    ) {
        if !value.value.is_finite() {
            return;
        }
        let of = match (of.is_empty(), self.region.is_empty()) {
            (true, _) => self.region.clone(),
            (false, true) => of.to_owned(),
            (false, false) => format!("{of}, {}", self.region),
        };
        let corner = Corner {
            mains: mains.name(),
            ambient: "high",
            channels_driven: self.case.build.channels.get().copied().unwrap_or(1),
            drive,
        };
        self.out.push(Derived {
            name,
            of,
            corner,
            value,
            site,
        });
    }

    fn rails(&mut self) -> Result<(), Needs> {
        let case = self.case;
        let site = match case.rails()? {
            Rails::Made(_) => case.supply()?.transformer.secondary.site(),
            Rails::Given { site, .. } => *site,
        };
        for mains in [Mains::Low, Mains::Nominal, Mains::High] {
            if let Ok(volts) = case.unsagged(mains) {
                self.add(
                    "rail-idle",
                    "",
                    (mains, "idle"),
                    Measure::new(volts.0, "V"),
                    site,
                );
            }
        }
        if let Ok(volts) = case.no_load(Mains::High) {
            self.add(
                "rail-no-load",
                "",
                (Mains::High, "idle"),
                Measure::new(volts.0, "V"),
                site,
            );
        }
        Ok(())
    }

    fn loads(&mut self) -> Result<(), Needs> {
        let case = self.case;
        for load in case.loads()?.iter().flatten() {
            let site = load.site;
            let survey = load.survey;
            self.add(
                "least-modulus",
                &load.name,
                (Mains::Nominal, "full"),
                Measure::new(survey.minimum.impedance.modulus().0, "ohm"),
                site,
            );
            let epdr = survey.dissipation.impedance.peak_dissipation_resistance().0;
            self.add(
                "peak-dissipation-resistance",
                &load.name,
                (Mains::Nominal, "full"),
                Measure::new(epdr, "ohm"),
                site,
            );
            if let Ok((_, amps)) = case.greatest_current(Mains::Nominal, load) {
                self.add(
                    "peak-current",
                    &load.name,
                    (Mains::Nominal, "full"),
                    Measure::new(amps.0, "A"),
                    site,
                );
            }
            let resistance = load.nominal_seen();
            let clean = case.drop().and_then(|drop| {
                let rail = |peak: Amp| {
                    case.rail_current(peak)
                        .and_then(|i| case.loaded(Mains::Nominal, Reservoir::Low, i))
                        .ok()
                        .map(|l| l.trough)
                };
                drop.clip_on(rail, crate::physics::load::Impedance::resistive(resistance))
                    .ok_or_else(|| Needs::because("no output"))
            });
            if let Ok(volts) = clean {
                let watts = power(volts, resistance).0 * if load.bridged { 2.0 } else { 1.0 };
                self.add(
                    "clean-power",
                    &load.name,
                    (Mains::Nominal, "full"),
                    Measure::new(watts, "W"),
                    site,
                );
            }
        }
        Ok(())
    }

    fn heat(&mut self) -> Result<(), Needs> {
        let case = self.case;
        let (load, heat) = case.hottest_load()?;
        let (sink, _) = case.heatsink()?;
        let name = load.name.clone();
        self.add(
            "rail-loaded",
            &name,
            (Mains::Nominal, "duty"),
            Measure::new(heat.rail.0, "V"),
            case.build.supply.site(),
        );
        self.add(
            "heat-per-channel",
            &name,
            (Mains::Nominal, "duty"),
            Measure::new(
                (heat.bank[0].total() + heat.bank[1].total() + heat.other).0,
                "W",
            ),
            case.output().devices.site(),
        );
        self.add(
            "sink",
            &name,
            (Mains::Nominal, "duty"),
            Measure::new(heat.sink.0, "degC"),
            sink.resistance.site(),
        );
        for side in Side::BOTH {
            if let Ok(t) = case.temperatures(heat, side) {
                let of = format!("{} {}", case.output().device(side).owner.name, side.name());
                self.add(
                    "junction",
                    &of,
                    (Mains::Nominal, "duty"),
                    Measure::new(t.junction.0, "degC"),
                    case.output().devices.site(),
                );
                self.add(
                    "device-heat",
                    &of,
                    (Mains::Nominal, "duty"),
                    Measure::new(heat.device[at(side)].0, "W"),
                    case.output().devices.site(),
                );
            }
        }
        Ok(())
    }
}
