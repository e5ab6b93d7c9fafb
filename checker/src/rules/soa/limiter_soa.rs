//! soa.limiter-soa: what the limiter lets through against the derated safe area.

use crate::analysis::{Case, Margins};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A limiter protects only if its line lies inside the safe area everywhere, with its parts at their
    /// worst: a cold sense transistor turns on later, and it may sense the device that carries least
    /// while another carries most. Limiters drawn against the 25 degC curve let hot devices die.
    "soa.limiter-soa",
    compares: "limit line, as the most loaded device sees it, with the temperature-derated safe area, 0 to both rails",
    stress: "current the limiter lets the most loaded device carry",
    rating: "safe area, derated to the case temperature",
    formula: "(i·RE/R1 + (v + i·RE)/R3)/(1/R1 + 1/R2 + 1/R3) = Von, Von cold; most loaded device beside the one sensed",
    source: "Kirchhoff's current law at the sense base; D. Self and R. Cordell, protection chapters (from memory)",
    reads: ["protection.limit-line", "protection.limiter", "protection.limiter-break", "build.protection", "device.soa", "device.power", "device.junction", "device.current", "device.vceo", "stage.emitter", "stage.pairs", "stage.vbe-spread", "stage.insulator", "build.ambient", "build.mains", "build.duty", "heatsink.resistance"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(100.0), "the derated data sheet itself",
    remedies: [
        Remedy { key: "protection.limiter", slot: "base", series: Series::E24, up: true },
        Remedy { key: "protection.limiter", slot: "rail", series: Series::E24, up: false },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("1 A at 95 V", "1.7 A at 95 V")],
}

/// One margin for each declared output device. A limiter known not to be fitted has none.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    if case.no_limiter() {
        return;
    }
    let stage = case.output();
    for side in stage.sides() {
        for played in case.played() {
            let stress =
                played.and_then(|(load, heat)| case.limiter_stress(&RULE, heat, load, *side));
            out.compare(
                &RULE,
                case.device_part(stage, *side),
                case.limiter_site(),
                stress,
            );
        }
    }
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Unchecked};
    use crate::testing::{margin, report, tern60};

    const LINE: &str = "    limit-line bank    10 A at 0 V, 10 A at 15 V, 6.4 A at 30 V, 3.6 A at 50 V, 1.8 A at 70 V, 1 A at 95 V\n";
    const ONE: (&str, &str) = ("pairs              2", "pairs              1");

    /// A flat line of the device meets the curve where it is lowest, at both rails: 2·45.6068 = 91.2136 V.
    /// Between (50 V, 3.6 A) and (100 V, 0.9 A) the slope is -2 exactly: 3.6·(50/91.2136)² = 1.08175 A of k.
    #[test]
    fn a_flat_line_is_worst_at_both_rails() {
        let m = margin(
            &tern60(&[ONE, (LINE, "    limit-line device   0.5 A at 0 V\n")]),
            RULE.name,
            "n16",
        );
        let k = (150.0 - m.witness.case_c.unwrap()) / 125.0;
        assert!(
            (m.witness.device_v.unwrap() - 91.2136).abs() < 1e-3,
            "{:?}",
            m.witness
        );
        assert!((m.stress.unwrap().value - 0.5).abs() < 1e-9);
        assert!((m.rating.unwrap().value - 1.08175 * k).abs() < 1e-4);
        assert_eq!(m.verdict, Ok);
    }

    /// R1 220, R2 100, R3 11 k, RE 0.22, Von 0.65 V at 25 degC, cold room at 10 degC: Von = 0.65 + 0.030 =
    /// 0.680 V. The published case gives I(0) 9.327 A and slope -0.08913 A/V at 0.65 V; currents go with Von at
    /// v = 0 and the slope stays: I(v) = 9.7575 - 0.08913·v. With RE at -5 % both grow by 1/0.95.
    /// At v = 91.2136 V: (9.7575 - 8.1299)/0.95 = 1.7133 A.
    #[test]
    fn a_limiter_of_parts_is_taken_cold() {
        let text = tern60(&[
            ONE,
            (
                LINE,
                "    limiter            sense 220R base 100R rail 11k on 0.65 V\n",
            ),
        ]);
        let m = margin(&text, RULE.name, "n16");
        let von = m.working.iter().find(|s| s.symbol == "Von").unwrap().value;
        assert!((von - 0.680).abs() < 1e-12);
        let v = m.witness.device_v.unwrap();
        let line = (0.68 / 0.65 * 9.327 - 0.08913 * v) / 0.95;
        assert!(
            (m.stress.unwrap().value - line).abs() < 5e-3,
            "{:?} {line}",
            m.stress
        );
        assert_eq!(m.verdict, Over);
    }

    /// What a resistor in parallel with the base resistor does, the base resistor itself does.
    #[test]
    fn a_shunt_stands_in_parallel() {
        let with = |parts: &str| {
            margin(&tern60(&[ONE, (LINE, parts)]), RULE.name, "n16")
                .stress
                .unwrap()
                .value
        };
        let (a, b) = (
            with("    limiter            sense 220R base 200R shunt 200R rail 11k\n"),
            with("    limiter            sense 220R base 100R rail 11k\n"),
        );
        assert!((a - b).abs() < 1e-9);
    }

    #[test]
    fn a_break_without_its_resistors_is_named() {
        let m = margin(
            &tern60(&[(
                LINE,
                "    limiter            sense 220R base 150R rail 47k\n    limiter-break      15 V\n",
            )]),
            RULE.name,
            "n16",
        );
        assert_eq!(m.verdict, Unchecked);
        assert_eq!(
            m.needs,
            [
                "protection guard limiter-break from-rail",
                "protection guard limiter-break to-base"
            ]
        );
    }

    #[test]
    fn none_has_no_margin_and_silence_is_unchecked() {
        let none = report(&tern60(&[(LINE, "    limit-line         none\n")]));
        assert!(!none.builds[0].margins.iter().any(|m| m.rule == RULE.name));
        let m = margin(&tern60(&[(LINE, "")]), RULE.name, "n16");
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["protection guard limiter".to_owned()][..])
        );
    }
}
