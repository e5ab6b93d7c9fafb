//! thermal.driver: the junction of the drivers at the duty.

use crate::analysis::case::{Side, line_part, solved, stated};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Stage, both};
use crate::finding::{Related, Witness};
use crate::physics::output_stage::power;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Drivers are small, stand at the full rail, and carry the base current of every output device
    /// besides what their resistor takes in both half-cycles. Those on the output sink are as hot as it
    /// is before they dissipate anything; those without any sink are often the first part to die, and
    /// a shorted driver turns its output devices hard on.
    "thermal.driver",
    compares: "mean junction temperature of a driver at the duty, hottest room, with Tj,max",
    stress: "mean junction temperature of the driver",
    rating: "Tj,max",
    formula: "Tj = Ts + P·(θcs + θjc); Ts = Ta + Tencl + P·Rown on a sink of its own, else the output sink",
    source: "energy balance; allowance common practice, no source",
    reads: ["amplifier.driver", "device.junction", "device.junction-case", "device.hfe", "stage.insulator", "stage.own-sink", "stage.pairs", "stage.base-emitter", "heatsink.resistance", "build.duty", "build.loads", "build.ambient", "build.enclosure"],
    sense: Temperature,
    unit: "degC",
    allow: Allow::Below(25.0, f64::INFINITY), "common practice, no source",
    remedies: [
        Remedy { key: "stage.own-sink", slot: "K/W", series: Series::Heatsink, up: false },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("own-sink           6 K/W per device", "own-sink           99 K/W per stage")],
}

/// One margin for each declared driver device: the load that heats it most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let amplifier = &case.build.amplifier;
    let Some(stage) = &amplifier.driver else {
        if !amplifier.driver_field.none {
            let field = &amplifier.driver_field;
            out.compare(&RULE, line_part(field), field.site(), Err(field.missing()));
        }
        return;
    };
    let site = stage.own_sink.stated_at().unwrap_or(stage.insulator.site());
    for side in stage.sides() {
        for played in case.played() {
            let stress = played.and_then(|(load, heat)| stress(case, stage, load, heat, *side));
            out.compare(&RULE, case.device_part(stage, *side), site, stress);
        }
    }
}

fn stress(
    case: &Case<'_>,
    stage: &Stage,
    load: &Driven,
    heat: &Heat,
    side: Side,
) -> Result<Stress, Needs> {
    let device = stage.device(side);
    let (limit, found) = both(
        device.junction.need().copied(),
        case.driver_temperatures(stage, heat, side),
    )?;
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
    let onto = if found.own_sink {
        "its own sink"
    } else {
        "the output sink at its hottest place"
    };
    Ok(Stress {
        value: found.junction.0,
        rating: limit.0,
        ambient: case.hottest()?.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(found.amplitude.0),
            power_w: Some(power(found.amplitude, heat.duty.load.modulus()).0),
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
                "mean heat of one driver",
                "mean of (Vm - v_out - VBE)·i_d",
                found.watts.0,
                "W",
                "base current point by point along the locus",
            ),
            solved(
                "Ts",
                onto,
                "Ta + Tencl + P·Rown, or the output sink",
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
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Unchecked};
    use crate::testing::{margin, report, tern60};

    fn value(text: &str, symbol: &str) -> f64 {
        margin(text, RULE.name, "d3")
            .working
            .iter()
            .find(|s| s.symbol == symbol)
            .unwrap()
            .value
    }

    /// On a sink of its own: 45 degC inside + P·6 K/W + P·(1 + (150 - 25)/30) = 45 + P·(6 + 1 + 4.16667).
    #[test]
    fn a_sink_of_its_own() {
        let text = tern60(&[]);
        let m = margin(&text, RULE.name, "d3");
        let want = 45.0 + value(&text, "P") * (6.0 + 1.0 + 125.0 / 30.0);
        assert!((m.stress.unwrap().value - want).abs() < 1e-9);
        assert_eq!(m.verdict, Ok);
    }

    /// `per stage`: both drivers of one pair warm the same sink.
    #[test]
    fn a_sink_for_the_stage_takes_both() {
        let (own, both) = (
            tern60(&[]),
            tern60(&[("6 K/W per device", "6 K/W per stage")]),
        );
        let rise = |text: &str| (value(text, "Ts") - 45.0) / value(text, "P");
        assert!((rise(&own) - 6.0).abs() < 1e-9);
        assert!((rise(&both) - 12.0).abs() < 1e-9);
    }

    /// Without one it takes the temperature of the output sink.
    #[test]
    fn on_the_output_sink() {
        let text = tern60(&[("    own-sink           6 K/W per device\n", "")]);
        let m = margin(&text, RULE.name, "d3");
        let sink = margin(&text, "thermal.sink", "fins").stress.unwrap().value;
        assert!((m.witness.sink_c.unwrap() - sink).abs() < 1e-9);
    }

    #[test]
    fn no_mounting_is_unchecked_and_no_driver_has_no_margin() {
        let m = margin(
            &tern60(&[(
                "    insulator          1 K/W\n    own-sink           6 K/W per device\n",
                "",
            )]),
            RULE.name,
            "d3",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["stage drv insulator".to_owned()][..])
        );
        let none = report(&tern60(&[(
            "driver             drv",
            "driver             none",
        )]));
        assert!(!none.builds[0].margins.iter().any(|m| m.rule == RULE.name));
    }
}
