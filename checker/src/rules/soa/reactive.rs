//! soa.reactive: every load at its own phase against the derated safe area.

use crate::analysis::safe_area::Angle;
use crate::analysis::{Case, Margins};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A loudspeaker is no resistor. Where its impedance has an angle, the current peaks while much of the
    /// supply still stands across the device: at 45 degrees the peak heat is 2.8 times that of a resistor,
    /// at 60 degrees 3.6 times, and it falls at voltages where second breakdown limits. Amplifiers that
    /// pass every bench test fail on speakers for this reason, and a shorted output takes the woofer along.
    "soa.reactive",
    compares: "current of the most loaded device along the locus of each load with the temperature-derated safe area",
    stress: "current of the most loaded device into a load at its own phase",
    rating: "safe area, derated to the case temperature",
    formula: "i(t)/Iallowed(v(t)), v = Vu - V̂·sin θ - (i/N)·RE, Iallowed = min(IC, k·P/v, kseg·C(v)), k = (Tj,max - Tcase)/(Tj,max - 25); Vu at nominal mains, at high mains where the policy says so (`strict`)",
    source: "derating of data sheets: power straight to Tj,max, second breakdown alike where not stated (onsemi MJ15022/D, 2N3055A/D, read); log-log between points; E. Benjamin, JAES 42(9) 1994 (from memory)",
    reads: ["device.soa", "device.power", "device.current", "device.junction", "device.vceo", "device.structure", "device.second-breakdown", "stage.pairs", "stage.emitter", "stage.vbe-spread", "stage.insulator", "amplifier.drop", "build.loads", "build.mains", "build.ambient", "build.duty", "heatsink.resistance", "load.minimum", "load.angle"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("pairs              2", "pairs              1"), ("resistive 8 ohm ±5 %", "nominal 4 ohm")],
}

/// One margin for each declared output device: every load, over the band, both signs of angle.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    case.compare_loci(&RULE, out, Angle::Own);
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Unchecked};
    use crate::testing::{edited, kit, margin, tern60};

    const ONE: (&str, &str) = ("pairs              2", "pairs              1");

    fn only(load: &'static str) -> [(&'static str, &'static str); 2] {
        [
            ("resistive 8 ohm ±5 %", load),
            (
                "loads              hall-8, bench-8",
                "loads              bench-8",
            ),
        ]
    }

    /// One pair, no emitter resistor, no drop, 8 ohm at 45 degrees as stated minimum: |Z| 8 ohm, so V̂ = Vu
    /// and the greatest power of a device is (2·Vu²/|Z|)·sin³(30° + 45°/3) = 0.707107·Vu²/8 (closed form
    /// of the ideal stage), Vu = 41.3699 V: 151.274 W. A curve that is constant power, 100 V·3.6 A
    /// to 240 V·1.5 A at 360 W, with 360 W stated, makes the worst use exactly that power over k·360 W.
    #[test]
    fn constant_power_meets_the_closed_form() {
        let [a, b] = only("nominal 8 ohm\n minimum 8 ohm\n angle 45 deg");
        let curve =
            "soa dc             16 A at 11 V, 3.6 A at 50 V, 0.9 A at 100 V, 110 mA at 240 V";
        let text = tern60(&[
            ONE,
            a,
            b,
            (
                "emitter            0R22 ±5 % 5 W pulse 20 A ref R21-R24 part \"WW5-0R22J\"",
                "emitter            none",
            ),
            ("50 mA per device, 11 mV across emitter", "50 mA per device"),
            (
                "drop               1.8 V at 0 A, 3.8 V at 7 A",
                "drop               0 V",
            ),
            (curve, "soa dc             36 A at 10 V, 1.5 A at 240 V"),
            (
                "current            16 A peak 28 A",
                "current            40 A peak 50 A",
            ),
            ("power              180 W", "power              360 W"),
        ]);
        let m = margin(&text, RULE.name, "n16");
        let k = (150.0 - m.witness.case_c.unwrap()) / 125.0;
        let watts = m.witness.device_v.unwrap() * m.witness.device_a.unwrap();
        assert!((watts - 151.274).abs() < 0.01, "{watts}");
        let used = m.stress.unwrap().value / m.rating.unwrap().value;
        assert!((used - 151.274 / (360.0 * k)).abs() < 1e-4, "{used}");
    }

    /// A load that states its nominal impedance alone is taken as 80 % of it at 45 degrees, and 60
    /// degrees stand beside the verdict.
    #[test]
    fn nominal_alone_takes_the_policy_angle() {
        let [a, b] = only("nominal 8 ohm");
        let m = margin(&tern60(&[a, b]), RULE.name, "n16");
        let step = |symbol: &str| {
            m.working
                .iter()
                .find(|s| s.symbol == symbol)
                .map(|s| s.value)
        };
        assert!(
            (step("φ").unwrap() - 45.0).abs() < 1e-9,
            "lagging before leading"
        );
        assert!((step("|Z|").unwrap() - 6.4).abs() < 1e-12);
        assert!(
            step("used(60)").unwrap() > 100.0 * m.stress.unwrap().value / m.rating.unwrap().value
        );
    }

    /// The reactive load is the worse one, and the sound kit stands it.
    #[test]
    fn phase_costs_more_than_resistance() {
        let sound = margin(&tern60(&[]), RULE.name, "n16");
        let plain = margin(&tern60(&[]), "soa.resistive", "n16");
        assert_eq!(sound.verdict, Ok);
        assert!(sound.used_percent > plain.used_percent);
    }

    /// Current above V(BR)CEO is over, whatever the curve says.
    #[test]
    fn beyond_breakdown_is_over() {
        let [a, b] = only("nominal 8 ohm\n minimum 6 ohm\n angle 80 deg");
        let m = margin(
            &tern60(&[
                a,
                b,
                ("vceo               240 V", "vceo               60 V"),
            ]),
            RULE.name,
            "n16",
        );
        assert_eq!(m.verdict, Over);
        assert!(m.note.contains("breakdown"), "{}", m.note);
    }

    const LATERAL: &str = "structure          lateral";
    const MOSFET_POWER: &str = "power              250 W at 25 degC";

    fn heron80(edits: &[(&str, &str)]) -> crate::finding::Margin {
        margin(&edited(&kit("heron80-mosfet"), edits), RULE.name, "ln16")
    }

    /// A lateral MOSFET has no second breakdown: power and current are its whole safe area, no curve due.
    /// At the witness' own voltage the rating is k·250 W/v.
    #[test]
    fn a_lateral_mosfet_needs_no_curve() {
        let m = heron80(&[]);
        let k = (150.0 - m.witness.case_c.unwrap()) / 125.0;
        assert_eq!(m.verdict, Ok);
        assert!((m.rating.unwrap().value - 250.0 * k / m.witness.device_v.unwrap()).abs() < 1e-9);
    }

    /// A vertical one passes only on a d.c. curve that is more than the power hyperbola above 30 V.
    #[test]
    fn a_vertical_mosfet_needs_linear_mode_data() {
        let vertical = |soa: &str| heron80(&[(LATERAL, &format!("structure vertical\n    {soa}"))]);
        for soa in [
            "",
            "soa dc 16 A at 15.625 V, 5 A at 50 V, 1.25 A at 200 V",
            "soa 10 ms 30 A at 20 V, 3 A at 200 V",
        ] {
            let m = vertical(soa);
            assert_eq!(m.verdict, Unchecked, "{soa}");
            assert!(
                m.note.contains("no linear-mode data") && m.note.contains('%'),
                "{}",
                m.note
            );
        }
        assert_eq!(
            vertical("soa dc 16 A at 15.625 V, 5 A at 50 V, 0.9 A at 200 V").verdict,
            Ok
        );
        assert_eq!(
            vertical("soa dc 16 A at 10 V, 1 A at 50 V, 0.1 A at 200 V").verdict,
            Over
        );
    }

    /// What the hyperbola alone already forbids is over, whatever the data lack.
    #[test]
    fn the_hyperbola_condemns_without_a_curve() {
        assert_eq!(
            heron80(&[
                (LATERAL, "structure vertical"),
                (MOSFET_POWER, "power 60 W at 25 degC")
            ])
            .verdict,
            Over
        );
    }

    #[test]
    fn an_unstated_structure_is_named() {
        let m = heron80(&[(LATERAL, "")]);
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["device ln16 structure".to_owned()][..])
        );
    }

    /// Power stated at another case temperature lies on the same derating line: 180 W at 25 degC to nothing at
    /// 150 degC is 144 W at 50 degC.
    #[test]
    fn power_at_another_case_is_the_same_line() {
        let used = |power: &str| {
            margin(
                &tern60(&[("power              180 W at 25 degC", power)]),
                RULE.name,
                "n16",
            )
            .used_percent
            .unwrap()
        };
        assert!((used("power 180 W at 25 degC") - used("power 144 W at 50 degC")).abs() < 1e-9);
    }

    /// Pulse credit is off unless the policy takes it, and then it only helps.
    #[test]
    fn pulse_credit_only_where_the_policy_says() {
        let hard = tern60(&[ONE, ("resistive 8 ohm ±5 %", "nominal 6 ohm")]);
        let quick = edited(
            &hard,
            &[
                ("duty               1/8", "duty 1/8\n    policy quick"),
                (
                    "network net {",
                    "policy quick from bench { curve pulse }\n\nnetwork net {",
                ),
            ],
        );
        let (dc, pulse) = (
            margin(&hard, RULE.name, "n16"),
            margin(&quick, RULE.name, "n16"),
        );
        assert_eq!(dc.witness.curve.as_deref(), Some("dc"));
        assert!(
            pulse.used_percent < dc.used_percent,
            "{:?} {:?}",
            pulse.used_percent,
            dc.used_percent
        );
        assert!(pulse.witness.curve.unwrap().ends_with("ms"));
    }

    #[test]
    fn strict_judges_at_high_mains() {
        let at = |policy: &str| {
            margin(
                &tern60(&[("    duty               1/8", policy)]),
                RULE.name,
                "n16",
            )
            .witness
            .mains_v
        };
        assert_eq!(
            at("    duty               1/8\n    policy strict"),
            Some(253.0)
        );
        assert_eq!(at("    duty               1/8"), Some(230.0));
    }

    #[test]
    fn a_load_that_says_nothing_is_unchecked() {
        let m = margin(
            &tern60(&[(
                "load bench-8 { resistive 8 ohm ±5 % }",
                "load bench-8 { dc 3 ohm }",
            )]),
            RULE.name,
            "n16",
        );
        assert_eq!(m.verdict, Unchecked);
    }
}
