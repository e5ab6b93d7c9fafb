//! soa.idle: the idle point against the derated d.c. curve.

use crate::analysis::{Case, Margins};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Between pieces of music every output device stands at the full rail with its idle current, for hours.
    /// It is a point of direct current: no pulse curve helps, and at high voltage second breakdown allows
    /// far less than the power does. Bias millivolts mistaken for milliamperes, or a bias set warm, end here.
    "soa.idle",
    compares: "idle current of the most loaded device at the unsagged rail, high mains, with the derated d.c. curve",
    stress: "idle current of the most loaded device",
    rating: "safe area at the rail voltage, derated",
    formula: "Iq·share/Iallowed(Vu), case at idle in the hottest room",
    source: "derating of data sheets: power straight to Tj,max, second breakdown alike where not stated (onsemi MJ15022/D, 2N3055A/D, read); log-log between points",
    reads: ["device.soa", "device.power", "device.current", "device.junction", "device.vceo", "device.structure", "device.second-breakdown", "stage.pairs", "stage.emitter", "stage.vbe-spread", "stage.insulator", "amplifier.drop", "build.loads", "build.mains", "build.ambient", "build.duty", "heatsink.resistance", "stage.idle"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.idle", slot: "A", series: Series::TwoDigits, up: false },
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
    ],
    example: "tern60", [("50 mA per device, 11 mV across emitter", "2.2 A per device")],
}

/// One margin for each declared output device.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    for side in stage.sides() {
        out.compare(
            &RULE,
            case.device_part(stage, *side),
            stage.idle.site(),
            case.idle_stress(&RULE, *side),
        );
    }
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::Unchecked;
    use crate::testing::{margin, tern60};

    /// Alone, a device shares with nobody: 50 mA at Vu = 46.6068 - 1.0 = 45.6068 V. The curve from 11 V to
    /// 50 V, s = ln(16/3.6)/ln(50/11) = 0.98515, allows 3.6·(50/45.6068)^0.98515 = 3.9413 A of k, and the
    /// power 180/45.6068 = 3.9468 A of k. Hand calculation.
    #[test]
    fn the_idle_point_by_hand() {
        let m = margin(
            &tern60(&[("pairs              2", "pairs              1")]),
            RULE.name,
            "n16",
        );
        let k = (150.0 - m.witness.case_c.unwrap()) / 125.0;
        assert!((m.stress.unwrap().value - 0.05).abs() < 1e-12);
        assert!(
            (m.rating.unwrap().value - 3.9413 * k).abs() < 1e-3,
            "{:?} {k}",
            m.rating
        );
        assert_eq!(m.witness.mains_v, Some(253.0));
    }

    /// Two share by exp(20/25.7) at small currents, less by what the resistors do: more than 1, less than
    /// 2·2.1775/3.1775 = 1.3706.
    #[test]
    fn the_more_loaded_one_counts() {
        let amps = margin(&tern60(&[]), RULE.name, "n16").stress.unwrap().value;
        assert!(amps > 0.05 && amps < 0.05 * 1.3706, "{amps}");
    }

    #[test]
    fn an_unstated_idle_is_named() {
        let m = margin(
            &tern60(&[(
                "    idle               50 mA per device, 11 mV across emitter\n",
                "",
            )]),
            RULE.name,
            "n16",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["stage out idle".to_owned()][..])
        );
    }
}
