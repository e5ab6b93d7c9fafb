//! soa.resistive: the load as a resistor against the derated safe area.

use crate::analysis::safe_area::Angle;
use crate::analysis::{Case, Margins};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The cheap early warning: the path of voltage and current that a plain resistor of the load's least
    /// impedance makes. Data sheets print the safe area for a case at 25 degC, which no device in a box
    /// ever has; at 75 degC little more than half is left. A build that fails here fails on the bench, with
    /// a load resistor, before any loudspeaker is connected.
    "soa.resistive",
    compares: "current of the most loaded device along a resistive load line with the temperature-derated safe area",
    stress: "current of the most loaded device into a resistive load",
    rating: "safe area, derated to the case temperature",
    formula: "i(t)/Iallowed(v(t)), Iallowed = min(IC, k·P/v, kseg·C(v)), k = (Tj,max - Tcase)/(Tj,max - 25); Vu at nominal mains, at high mains where the policy says so (`strict`)",
    source: "derating of data sheets: power straight to Tj,max, second breakdown alike where not stated (onsemi MJ15022/D, 2N3055A/D, read); log-log between points",
    reads: ["device.soa", "device.power", "device.current", "device.junction", "device.vceo", "device.structure", "device.second-breakdown", "stage.pairs", "stage.emitter", "stage.vbe-spread", "stage.insulator", "amplifier.drop", "build.loads", "build.mains", "build.ambient", "build.duty", "heatsink.resistance"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("pairs              2", "pairs              1"), ("resistive 8 ohm", "resistive 2 ohm")],
}

/// One margin for each declared output device: the worst load taken as a resistor.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    case.compare_loci(&RULE, out, Angle::Zero);
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Over, Unchecked};
    use crate::testing::{margin, tern60};

    const ALONE: [(&str, &str); 2] = [
        ("pairs              2", "pairs              1"),
        (
            "loads              hall-8, bench-8",
            "loads              bench-8",
        ),
    ];

    /// One pair into 7.6 ohm (8 ohm - 5 %), Vu 41.3699 V as in current.emitter-mean. The line is
    /// v = 41.3699 - i·(7.6 + 0.22). From 11 V to 50 V the curve falls as v^-s, s = ln(16/3.6)/ln(50/11) =
    /// 0.985158. Along the line i·v^s is greatest at v = s/(1 + s)·41.3699 = 20.5302 V with i = 2.66492 A,
    /// where the curve allows 16·(11/20.5302)^s = 8.6522 A of k and the power more, 180/20.5302 = 8.7676 A.
    /// Hand calculation; k is read from the witness' own case temperature.
    #[test]
    fn one_pair_by_hand() {
        let m = margin(&tern60(&ALONE), RULE.name, "n16");
        let k = (150.0 - m.witness.case_c.unwrap()) / 125.0;
        assert!(
            (m.witness.device_v.unwrap() - 20.530).abs() < 2e-3,
            "{:?}",
            m.witness
        );
        assert!((m.stress.unwrap().value - 2.6649).abs() < 2e-4);
        assert!((m.rating.unwrap().value - 8.6522 * k).abs() < 2e-3);
        assert!(k > 0.5 && k < 0.9, "{k}");
    }

    /// Curves that end below the greatest voltage are no pass: 3.6 A at 50 V is above the 41.4 V of the
    /// rail, so a resistive line is covered; ending at 20 V it is not.
    #[test]
    fn a_curve_that_ends_too_soon_passes_nothing() {
        let curve =
            "soa dc             16 A at 11 V, 3.6 A at 50 V, 0.9 A at 100 V, 110 mA at 240 V";
        let m = margin(
            &tern60(&[
                ALONE[0],
                ALONE[1],
                (curve, "soa dc 16 A at 11 V, 8.9 A at 20 V"),
            ]),
            RULE.name,
            "n16",
        );
        assert_eq!(m.verdict, Unchecked);
        assert!(m.note.contains("ends at 20 V"), "{}", m.note);
    }

    /// A case as hot as the junction may be leaves nothing.
    #[test]
    fn no_rating_left_is_over() {
        let m = margin(
            &tern60(&[(
                "resistance         0.45 K/W at 50 K",
                "resistance         9 K/W at 50 K",
            )]),
            RULE.name,
            "n16",
        );
        assert_eq!((m.verdict, m.used_percent), (Over, None));
    }

    #[test]
    fn what_is_missing_is_named() {
        for (line, key) in [
            (
                "    junction           150 degC\n    junction-case      0.69 K/W\n",
                "device n16 junction",
            ),
            (
                "    insulator          0.35 K/W \"mica and grease\"\n",
                "stage out insulator",
            ),
        ] {
            let m = margin(&tern60(&[(line, "")]), RULE.name, "n16");
            assert_eq!(m.verdict, Unchecked, "{key}");
            assert!(m.needs.iter().any(|n| n == key), "{key}: {:?}", m.needs);
        }
        // without a curve the hyperbola is not enough to pass
        let curve =
            "    soa dc             16 A at 11 V, 3.6 A at 50 V, 0.9 A at 100 V, 110 mA at 240 V\n";
        let m = margin(&tern60(&[(curve, "")]), RULE.name, "n16");
        assert_eq!(m.verdict, Unchecked);
        assert!(
            m.needs.iter().any(|n| n == "device n16 soa dc"),
            "{:?}",
            m.needs
        );
    }
}
