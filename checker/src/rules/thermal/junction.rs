//! thermal.junction: the mean temperature of the hottest junction at the duty.

use crate::analysis::case::{Side, solved, stated};
use crate::analysis::heat::{Heat, at};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::both;
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The junction is hotter than the sink by what the device dissipates through its own body and its
    /// insulator. Every 10 K less about doubles a transistor's life, and at Tj,max nothing is left for
    /// peaks. A good sink does not help a device that alone carries too many watts.
    "thermal.junction",
    compares: "mean junction temperature of the hottest output device at the duty, hottest room, with Tj,max",
    stress: "mean junction temperature",
    rating: "Tj,max",
    formula: "Tj = Ts + P·(θcs + θjc), P = share·bank/N, on the mean rail at nominal mains",
    source: "energy balance; allowance common practice, no source",
    reads: ["device.junction", "device.junction-case", "stage.insulator", "stage.pairs", "stage.idle", "stage.emitter", "stage.vbe-spread", "stage.spread-across-sink", "heatsink.resistance", "build.heatsink", "build.ambient", "build.enclosure", "build.duty", "build.loads", "amplifier.drop"],
    sense: Temperature,
    unit: "degC",
    allow: Allow::Below(25.0, f64::INFINITY), "common practice, no source",
    remedies: [
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
    ],
    example: "tern60", [("resistance         0.45 K/W at 50 K", "resistance         3 K/W at 50 K")],
}

/// One margin for each declared output device: the load that heats it most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    for side in stage.sides() {
        for played in case.played() {
            let stress = played.and_then(|(load, heat)| stress(case, load, heat, *side));
            out.compare(
                &RULE,
                case.device_part(stage, *side),
                stage.pairs.site(),
                stress,
            );
        }
    }
}

fn stress(case: &Case<'_>, load: &Driven, heat: &Heat, side: Side) -> Result<Stress, Needs> {
    let stage = case.output();
    let device = stage.device(side);
    let (limit, found) = both(
        device.junction.need().copied(),
        case.temperatures(heat, side),
    )?;
    let watts = heat.device[at(side)];
    let mut related = vec![Related {
        message: "into this load".to_owned(),
        site: load.site,
    }];
    related.extend(stage.insulator.stated_at().map(|site| Related {
        message: "case to sink".to_owned(),
        site,
    }));
    related.extend(device.junction_case.stated_at().map(|site| Related {
        message: "junction to case".to_owned(),
        site,
    }));
    if let Ok((sink, _)) = case.heatsink() {
        related.push(Related {
            message: "the sink".to_owned(),
            site: sink.resistance.site(),
        });
    }
    Ok(Stress {
        value: found.junction.0,
        rating: limit.0,
        ambient: case.hottest()?.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(heat.duty.amplitude.0),
            power_w: Some(heat.duty.power.0),
            duty: Some(case.duty().shown.clone()),
            ambient_c: Some(case.hottest()?.0),
            sink_c: Some(found.sink.0),
            case_c: Some(found.case.0),
            junction_c: Some(found.junction.0),
            rail_v: Some(heat.rail.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "P",
                "mean heat of the most loaded device",
                "share·(Vm(Î/π + N·Iq) - V̂Î/4 - Î²RE/4N)/N",
                watts.0,
                "W",
                "energy balance of class B",
            ),
            solved(
                "Ts",
                "sink at the hottest place",
                "Ta + ΣP·Rsa, spread across the sink",
                found.sink.0,
                "degC",
                "energy balance",
            ),
            solved(
                "Tcase",
                "its case",
                "Ts + P·θcs",
                found.case.0,
                "degC",
                "energy balance",
            ),
            solved(
                "Tj",
                "its junction",
                "Tcase + P·θjc",
                found.junction.0,
                "degC",
                "energy balance",
            ),
            stated(
                "Tj,max",
                "limit",
                limit.0,
                "degC",
                device.junction.stated_at(),
            ),
        ],
        related,
        note: if heat.idle_decides {
            "idle current alone heats it more than the duty".to_owned()
        } else {
            String::new()
        },
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Thin, Unchecked};
    use crate::testing::{margin, tern60, verdict};

    /// The chain by hand from the witness' own sink: Tj = Ts + P·(0.35 + 0.69), P from the working.
    #[test]
    fn the_chain_adds_up() {
        let m = margin(&tern60(&[]), RULE.name, "n16");
        let watts = m.working.iter().find(|s| s.symbol == "P").unwrap().value;
        let junction = m.witness.sink_c.unwrap() + watts * 1.04;
        assert!((m.stress.unwrap().value - junction).abs() < 1e-9);
        assert!((m.allowance.unwrap().value - 125.0).abs() < 1e-12);
        // used counts from the room: 100·(Tj - 40)/(125 - 40)
        assert!((m.used_percent.unwrap() - 100.0 * (junction - 40.0) / 85.0).abs() < 1e-9);
        assert_eq!(m.verdict, Ok);
    }

    /// Limits set round the junction found: 25 K above it is thin's edge, the junction itself over's.
    #[test]
    fn thin_and_over_meet_at_the_limits() {
        let found = margin(&tern60(&[]), RULE.name, "n16").stress.unwrap().value;
        let at = |limit: f64| {
            verdict(
                &tern60(&[(
                    "junction           150 degC\n    junction-case      0.69",
                    &format!("junction           {limit:.3} degC\n    junction-case      0.69"),
                )]),
                RULE.name,
                "n16",
            )
        };
        assert_eq!(at(found + 25.01), Ok);
        assert_eq!(at(found + 24.99), Thin);
        assert_eq!(at(found - 0.01), Over);
    }

    #[test]
    fn an_unstated_insulator_is_named() {
        let m = margin(
            &tern60(&[("    insulator          0.35 K/W \"mica and grease\"\n", "")]),
            RULE.name,
            "n16",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["stage out insulator".to_owned()][..])
        );
    }
}
