//! voltage.voltage-stage: the devices of the voltage amplifier against their breakdown voltage.

use crate::analysis::{Case, Margins};
use crate::build::parts::both;
use crate::finding::Part;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The voltage amplifier swings its output from rail to rail, so at each end one of its devices
    /// has both rails across it. It is a small part that is quickly replaced by another small part
    /// of half the voltage. When it breaks down the output sticks at a rail, and the direct current
    /// goes through the loudspeaker.
    "voltage.voltage-stage",
    compares: "voltage across a device of the voltage amplifier, high mains, no load, with V(BR)CEO",
    stress: "voltage rail to rail at high mains, no load",
    rating: "breakdown voltage",
    formula: "V = V0+ + V0- + 2·Vdr, V0 = m·√2·Vs·(1 + ρ), Vdr = stated driver rail x V0(high)/V0(nominal)",
    source: "definition of regulation, full-load base: maker's practice for toroids; node voltages",
    reads: ["device.vceo", "stage.driver-rail", "transformer.secondary", "transformer.regulation", "build.mains", "build.rails"],
    sense: AtMost,
    unit: "V",
    allow: Allow::Percent(90.0), "common practice, no source",
    remedies: [
        Remedy { key: "device.vceo", slot: "V", series: Series::TwoDigits, up: true },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("vceo               250 V", "vceo               60 V")],
}

/// One margin for each declared device of the voltage amplifier.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let amplifier = &case.build.amplifier;
    let field = &amplifier.voltage_field;
    if field.unstated() {
        let name = amplifier.owner.name.clone();
        let part = Part {
            name: format!("{name} voltage-amplifier"),
            block: name,
            key: "voltage-amplifier",
            ..Part::default()
        };
        return out.compare(&RULE, part, field.site(), Err(field.missing()));
    }
    if let Some(stage) = &amplifier.voltage_amplifier {
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

    /// Twice 253/230·√2·28·1.07 = 93.2137 V; 90 % of 103.6 V is 93.24 V. By hand.
    #[test]
    fn both_rails_stand_across_it() {
        let at = |volts: &str| {
            verdict(
                &tern60(&[(
                    "250 V\n    current            100 mA",
                    &format!("{volts} V\n    current            100 mA"),
                )]),
                super::RULE.name,
                "v1",
            )
        };
        assert_eq!(at("103.6"), Verdict::Ok);
        assert_eq!(at("103.5"), Verdict::Thin);
        assert_eq!(at("93.2"), Verdict::Over);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[("    voltage-amplifier  vas\n", "")]),
            super::RULE.name,
            "tern60 voltage-amplifier",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (
                Verdict::Unchecked,
                ["amplifier tern60 voltage-amplifier".to_owned()].as_slice()
            )
        );
    }

    #[test]
    fn none_is_nothing_to_check() {
        let report = crate::testing::report(&tern60(&[(
            "voltage-amplifier  vas",
            "voltage-amplifier  none",
        )]));
        assert!(
            report.builds[0]
                .margins
                .iter()
                .all(|m| m.rule != super::RULE.name)
        );
    }
}
