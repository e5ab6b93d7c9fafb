//! drive.driver-dissipation: the driver's mean heat against what its case temperature leaves it.

use crate::analysis::case::{Side, solved, stated};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{both, three};
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A driver carries little current, but at the whole rail, and part of it all the time. The watts on
    /// the front of its data sheet hold with the case at 25 degC; on a warm sink, or on no sink at all,
    /// little of them is left. A driver that fails short takes its output devices with it.
    "drive.driver-dissipation",
    compares: "mean heat of a driver at the duty with Ptot at its case temperature",
    stress: "mean heat of the driver",
    rating: "Ptot at its case temperature",
    formula: "P = mean of (i/hFE(i/N) + VBE/Rbe)·(V - v - VBE); rating Ptot·(Tj,max - Tcase)/(Tj,max - T0)",
    source: "energy balance; straight-line derating of the data sheet",
    reads: [
        "device.power", "device.junction", "device.hfe", "stage.insulator", "stage.own-sink", "stage.base-emitter", "stage.idle",
        "amplifier.driver", "build.duty", "build.ambient", "build.enclosure", "build.heatsink", "build.loads",
    ],
    sense: AtMost,
    unit: "W",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.own-sink", slot: "K/W", series: Series::Heatsink, up: false },
        Remedy { key: "device.power", slot: "W", series: Series::TwoDigits, up: true },
    ],
    example: "tern60", [("base-emitter        100R", "base-emitter        2R2")],
}

/// One margin for each declared driver device.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    if out.lacking(&RULE, &case.build.amplifier.driver_field) {
        return;
    }
    let Ok(driver) = case.driver() else { return };
    for side in driver.sides() {
        let (part, site) = (case.device_part(driver, *side), driver.devices.site());
        let (loads, heats) = match both(case.loads(), case.heats()) {
            Ok(found) => found,
            Err(needs) => {
                out.compare(&RULE, part, site, Err(needs));
                continue;
            }
        };
        for (load, heat) in loads.iter().zip(heats) {
            let found = both(
                load.as_ref().map_err(Clone::clone),
                heat.as_ref().map_err(Clone::clone),
            );
            // where both sides are one declared part the hotter half stands for it
            let halves: &[Side] = if driver.sides().len() == 1 {
                &Side::BOTH
            } else {
                std::slice::from_ref(side)
            };
            for half in halves {
                out.compare(
                    &RULE,
                    part.clone(),
                    site,
                    found
                        .clone()
                        .and_then(|(load, heat)| stress(case, load, heat, *half)),
                );
            }
        }
    }
}

fn stress(case: &Case<'_>, load: &Driven, heat: &Heat, side: Side) -> Result<Stress, Needs> {
    let driver = case.driver()?;
    let device = driver.device(side);
    let (found, (rated, stated_at), junction) = three(
        case.driver_temperatures(driver, heat, side),
        device.power.need().copied(),
        device.junction.need().copied(),
    )?;
    let (own, hot) = (found.watts, found.case);
    let left = crate::physics::heat::derated(rated, stated_at, junction, hot).ok_or_else(|| {
        Needs::because(format!(
            "the power of {} is stated at its junction limit",
            device.owner.name
        ))
    })?;
    let sink = driver
        .own_sink
        .stated_at()
        .unwrap_or_else(|| case.build.heatsink.site());
    Ok(Stress {
        value: own.0,
        rating: left.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(heat.duty.amplitude.0),
            duty: Some(case.duty().shown.clone()),
            ambient_c: case.hottest().ok().map(|t| t.0),
            case_c: Some(hot.0),
            rail_v: Some(heat.rail.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "Vm",
                "mean rail at the duty",
                "rectifier steady state",
                heat.rail.0,
                "V",
                "periodic solution of the rectifier",
            ),
            solved(
                "P",
                "mean heat of one driver",
                "mean of i_d·v_CE",
                own.0,
                "W",
                "energy balance",
            ),
            solved(
                "Tcase",
                "its case, hottest room",
                "Tsink + P·θcs",
                hot.0,
                "degC",
                "energy balance",
            ),
            stated(
                "Ptot",
                "rated power",
                rated.0,
                "W",
                device.power.stated_at(),
            ),
            solved(
                "Pleft",
                "what is left of it",
                "Ptot·(Tj,max - Tcase)/(Tj,max - T0)",
                left.0,
                "W",
                "straight-line derating of the data sheet",
            ),
        ],
        related: vec![
            Related {
                message: "what it stands on".to_owned(),
                site: sink,
            },
            Related {
                message: "the load of the duty".to_owned(),
                site: load.site,
            },
        ],
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    #[test]
    fn a_standing_current_alone_is_the_rail_times_it() {
        // with the signal's part below a quarter of a watt, 2R2 across the output bases makes
        // 0.65/2.2 = 295.5 mA at Vm - VBE; Vm lies between 36 V and 41.4 V at the duty
        let m = margin(
            &tern60(&[("base-emitter        100R", "base-emitter        2R2")]),
            "drive.driver-dissipation",
            "d3",
        );
        let watts = m.stress.unwrap().value;
        assert!(
            watts > 0.2955 * 35.35 && watts < 0.2955 * 40.72 + 0.5,
            "{watts}"
        );
        // its case: 45 degC of air + P·(6 + 1) K/W, Ptot 30 W falling to nothing at 150 degC
        let left = 30.0 * (150.0 - (45.0 + watts * 7.0)) / 125.0;
        assert!(
            (m.rating.unwrap().value - left).abs() < 1e-9,
            "{:?} {left}",
            m.rating
        );
        assert_eq!(m.verdict, Verdict::Over);
    }

    #[test]
    fn the_kit_runs_its_drivers_cool() {
        // 6.5 mA standing at about 40 V is 0.26 W, the signal adds about as much
        let m = margin(&tern60(&[]), "drive.driver-dissipation", "d3");
        assert_eq!(m.verdict, Verdict::Ok);
        assert!(
            (0.26..1.2).contains(&m.stress.unwrap().value),
            "{:?}",
            m.stress
        );
    }

    #[test]
    fn a_driver_without_mounting_is_unchecked() {
        let m = margin(
            &tern60(&[("    insulator          1 K/W\n", "")]),
            "drive.driver-dissipation",
            "d3",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["stage drv insulator".to_owned()])
        );
    }
}
