//! bias.stability: whether the idle current can run away with heat.

use crate::analysis::{Case, Margins};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A warm output device wants less voltage for the same current, so it takes more current, gets
    /// warmer, and takes more still. The emitter resistor and the bias sensor hold this back. At a loop
    /// gain of one nothing does: the idle current climbs without any signal until the devices are gone,
    /// usually on a hot evening some minutes after switch-on.
    "bias.stability",
    compares: "thermal loop gain of the idle current, high mains, with one",
    stress: "thermal loop gain of the idle current",
    rating: "runaway",
    formula: "S = Vu·|dV/dT|·θeff/(1/gm + RE), θeff = θjc + θcs + (d - κ)·Rsa·n",
    source: "loop gain of a heated junction, standard derivation; dVBE/dT from Gray and Meyer, band-gap section, from memory",
    reads: [
        "stage.idle", "stage.emitter", "stage.insulator", "stage.sensor", "stage.connection", "device.junction-case",
        "device.gate-source", "device.gate-drift", "heatsink.resistance", "transformer.secondary", "transformer.regulation", "build.mains",
    ],
    sense: AtMost,
    unit: "1",
    allow: Allow::Fixed(0.7, 1.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.emitter", slot: "ohm", series: Series::E12, up: true },
        Remedy { key: "stage.insulator", slot: "K/W", series: Series::TwoDigits, up: false },
        Remedy { key: "stage.idle", slot: "A", series: Series::TwoDigits, up: false },
    ],
    example: "tern60", [
        ("sensor              on sink", "sensor              on board"),
        ("50 mA per device, 11 mV across emitter", "150 mA per device"),
    ],
}

/// One margin for each declared output device; a stage without idle current has no loop.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    if stage.idle.none {
        return;
    }
    for side in stage.sides() {
        out.compare(
            &RULE,
            case.device_part(stage, *side),
            stage.emitter.site(),
            case.bias_loop(*side),
        );
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60, verdict};

    #[test]
    fn a_sensor_on_the_sink_leaves_only_the_path_to_it() {
        // Vu(hi) = 1.1·√2·28·1.07 - 1.0 = 45.6068 V; θeff = 0.69 + 0.35 = 1.04 K/W;
        // 1/gm + RE = 25.7 mV/50 mA + 0.22·0.95 = 0.514 + 0.209 = 0.723 ohm
        // S = 45.6068·2.1 mV/K·1.04/0.723 = 0.137768
        let m = margin(&tern60(&[]), "bias.stability", "n16");
        assert!(
            (m.stress.unwrap().value - 0.137_768).abs() < 2e-6,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn a_sensor_on_the_board_follows_nothing() {
        // The rail with 0.1 A of idle current at 253 V: mean 45.0130 V, by a separate integration in
        // 16 000 steps a half-cycle (crest 46.6068 V, 0.3861 ohm, 11.28 mF, 17.5 mohm).
        // 2·2 devices on one sink: P = 4·45.0130·0.05 = 9.00259 W at 0.45 K/W at 50 K.
        // ΔT = P·0.45·(ΔT/50)^-1/4 -> ΔT^(5/4) = 4.051167·50^(1/4) -> ΔT = 6.696659 K,
        // Rsa = 0.743859 K/W; θeff = 1.04 + 4·0.743859 = 4.015435 K/W
        // S = 45.60682·0.0021·4.015435/0.723 = 0.531917
        let kit = tern60(&[(
            "sensor              on sink",
            "sensor              on board",
        )]);
        let m = margin(&kit, "bias.stability", "n16");
        assert!(
            (m.stress.unwrap().value - 0.531_917).abs() < 2e-6,
            "{:?}",
            m.stress
        );
    }

    #[test]
    fn more_idle_current_without_a_resistor_runs_away() {
        let edits = [
            (
                "sensor              on sink",
                "sensor              on board",
            ),
            ("0R22 ±5 % 5 W pulse 20 A", "R05 5 W pulse 20 A"),
            (
                "50 mA per device, 11 mV across emitter",
                "200 mA per device",
            ),
        ];
        assert_eq!(
            verdict(&tern60(&edits), "bias.stability", "n16"),
            Verdict::Over
        );
    }

    #[test]
    fn a_sensor_that_is_not_stated_passes_nothing() {
        let m = margin(
            &tern60(&[("    sensor              on sink\n", "")]),
            "bias.stability",
            "n16",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["stage out sensor".to_owned()])
        );
    }

    #[test]
    fn class_b_has_no_loop() {
        let kit = tern60(&[(
            "idle                50 mA per device, 11 mV across emitter",
            "idle                none",
        )]);
        let report = crate::testing::report(&kit);
        assert!(
            report.builds[0]
                .margins
                .iter()
                .all(|m| m.rule != "bias.stability")
        );
    }
}
