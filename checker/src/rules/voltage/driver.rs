//! voltage.driver: the followers before the output stage against their breakdown voltage.

use crate::analysis::{Case, Margins};
use crate::build::parts::both;
use crate::finding::Part;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A driver stands between the same two rails as the output devices, and its base is carried from
    /// one to the other. Drivers are often chosen for speed and gain, and their lower voltage is
    /// forgotten. One that breaks down takes the output devices with it, because it turns them on.
    "voltage.driver",
    compares: "voltage across a driver, high mains, no load, with V(BR)CEO or V(BR)DSS",
    stress: "voltage rail to rail at high mains, no load",
    rating: "breakdown voltage",
    formula: "V = V0+ + V0- + 2·Vdr, V0 = m·√2·Vs·(1 + ρ), Vdr = stated driver rail x V0(high)/V0(nominal)",
    source: "definition of regulation, full-load base: maker's practice for toroids; node voltages",
    reads: ["device.vceo", "device.vdss", "stage.driver-rail", "transformer.secondary", "transformer.regulation", "build.mains", "build.rails"],
    sense: AtMost,
    unit: "V",
    allow: Allow::Percent(90.0), "common practice, no source",
    remedies: [
        Remedy { key: "device.vceo", slot: "V", series: Series::TwoDigits, up: true },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("vceo               230 V", "vceo               80 V")],
}

/// One margin for each declared device of the driver and the predriver.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let amplifier = &case.build.amplifier;
    let field = &amplifier.driver_field;
    if field.unstated() {
        let name = amplifier.owner.name.clone();
        let part = Part {
            name: format!("{name} driver"),
            block: name,
            key: "driver",
            ..Part::default()
        };
        return out.compare(&RULE, part, field.site(), Err(field.missing()));
    }
    for stage in [&amplifier.driver, &amplifier.predriver]
        .into_iter()
        .flatten()
    {
        for side in stage.sides() {
            let device = stage.device(*side);
            let stress = both(device.breakdown.need().copied(), case.across_drivers());
            let part = case.device_part(stage, *side);
            out.compare(
                &RULE,
                part,
                stage.devices.site(),
                stress.map(|(rating, across)| across.against(case, rating, &device.breakdown)),
            );
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60, verdict};

    /// V0 = 253/230·√2·28·1.07 = 46.6068 V, twice that 93.2137 V; 90 % of 103.6 V is 93.24 V. By hand.
    #[test]
    fn both_rails_stand_across_it() {
        let m = margin(&tern60(&[]), super::RULE.name, "d3");
        assert!((m.stress.unwrap().value - 93.2137).abs() < 1e-3);
        let at = |volts: &str| {
            verdict(
                &tern60(&[(
                    "230 V\n    current            4 A",
                    &format!("{volts} V\n    current            4 A"),
                )]),
                super::RULE.name,
                "d3",
            )
        };
        assert_eq!(at("103.6"), Verdict::Ok);
        assert_eq!(at("103.5"), Verdict::Thin);
        assert_eq!(at("93.3"), Verdict::Thin);
        assert_eq!(at("93.2"), Verdict::Over);
    }

    /// A driver supply 5 V above the rail adds twice 5.5 V at high mains. By hand.
    #[test]
    fn a_driver_supply_above_the_rail_counts() {
        let m = margin(
            &tern60(&[(
                "    own-sink           6 K/W per device",
                "    own-sink           6 K/W per device\n    driver-rail        5 V",
            )]),
            super::RULE.name,
            "d3",
        );
        assert!((m.stress.unwrap().value - 104.2137).abs() < 1e-3);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[("    driver             drv\n", "")]),
            super::RULE.name,
            "tern60 driver",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (
                Verdict::Unchecked,
                ["amplifier tern60 driver".to_owned()].as_slice()
            )
        );
        let m = margin(
            &tern60(&[("    vceo               230 V\n", "")]),
            super::RULE.name,
            "d3",
        );
        assert_eq!(m.needs, ["device d3 vceo"]);
    }

    #[test]
    fn none_is_nothing_to_check() {
        let report = crate::testing::report(&tern60(&[(
            "driver             drv",
            "driver             none",
        )]));
        assert!(
            report.builds[0]
                .margins
                .iter()
                .all(|m| m.rule != super::RULE.name)
        );
    }
}
