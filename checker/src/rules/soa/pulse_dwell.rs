//! soa.pulse-dwell: how long a locus stays above the d.c. curve, against the longest pulse curve.

use crate::analysis::case::{Side, solved, stated};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::Witness;
use crate::physics::unit::Second;
use crate::policy::Curve;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A data sheet's pulse curve holds for one pulse of its length. A policy that takes credit from such
    /// curves is only as good as the time for which the music stays above the d.c. curve: at 20 Hz that
    /// is many milliseconds. Longer than the longest pulse stated, no curve covers it, and only the
    /// d.c. curve counts. Asked only where the policy says `curve pulse`.
    "soa.pulse-dwell",
    compares: "longest unbroken time above the derated d.c. curve with the longest stated pulse",
    stress: "time above the derated d.c. curve",
    rating: "longest stated pulse",
    formula: "dwell = longest t with i(t) > Iallowed,dc(v(t)) within one period, over the band",
    source: "meaning of a single-pulse curve; common practice, no source",
    reads: ["device.soa", "device.current", "stage.pairs", "policy.curve", "amplifier.band", "build.loads", "stage.insulator", "build.ambient"],
    sense: AtMost,
    unit: "s",
    allow: Allow::Percent(100.0), "the stated pulse itself",
    remedies: [
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [
        ("pairs              2", "pairs              1"),
        ("resistive 8 ohm ±5 %", "nominal 4 ohm"),
        ("soa 100 ms ", "soa 1 ms "),
        ("    duty               1/8\n", "    duty               1/8\n    policy quick\n"),
        ("network net {", "policy quick from bench { curve pulse }\n\nnetwork net {"),
    ],
}

/// One margin for each declared output device, where the policy takes pulse credit.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    if case.policy.curve != Curve::Pulse {
        return;
    }
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
    let device = case.output().device(side);
    let mains = case.safe_area_mains();
    let ready = case.ready_at_duty(heat, side, mains, 1.0)?;
    let (spot, dwell) = case.longest_dwell(&ready, load)?;
    let longest = device.soa.iter().find_map(|l| l.pulse.map(|s| (s, l.site)));
    let (pulse, site) = match longest {
        Some((pulse, site)) => (pulse, Some(site)),
        // nothing above the d.c. curve needs no pulse curve: any length will do
        None if dwell == Second::ZERO => (Second(0.5 / spot.frequency.0), None),
        None => return Err(device.soa_dc.missing_part("of a pulse")),
    };
    Ok(Stress {
        value: dwell.0,
        rating: pulse.0,
        witness: Witness {
            mains_v: case.mains_volts(mains),
            load: Some(load.name.clone()),
            frequency_hz: Some(spot.frequency.0),
            duty: Some(case.duty().shown.clone()),
            case_c: Some(ready.case.0),
            rail_v: Some(ready.rail.0),
            curve: Some("dc".to_owned()),
            ..case.witness()
        },
        working: vec![
            solved(
                "Vu",
                "unsagged rail",
                "V0 - Vd",
                ready.rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            solved(
                "Tcase",
                "case of the hottest device at the duty",
                "Tsink + P·θcs",
                ready.case.0,
                "degC",
                "energy balance",
            ),
            solved(
                "dwell",
                "longest time above the d.c. curve in one period",
                "",
                dwell.0,
                "s",
                "",
            ),
            stated("τ", "longest pulse curve", pulse.0, "s", site),
        ],
        related: case.safe_area_sites(side, Some(load)),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over};
    use crate::testing::{edited, margin, report, tern60};

    const QUICK: [(&str, &str); 2] = [
        (
            "    duty               1/8\n",
            "    duty               1/8\n    policy quick\n",
        ),
        (
            "network net {",
            "policy quick from bench { curve pulse }\n\nnetwork net {",
        ),
    ];

    #[test]
    fn only_a_policy_with_pulse_credit_is_asked() {
        assert!(
            !report(&tern60(&[])).builds[0]
                .margins
                .iter()
                .any(|m| m.rule == RULE.name)
        );
        // the sound kit stays below its d.c. curve: no time above it
        let m = margin(&tern60(&QUICK), RULE.name, "n16");
        assert_eq!((m.verdict, m.stress.unwrap().value), (Ok, 0.0));
    }

    /// Less than half a period of the lowest frequency, 25 ms at 20 Hz, and something where one pair
    /// drives a hard load; a 100 ms curve covers it, a 1 ms curve does not.
    #[test]
    fn the_longest_pulse_must_last() {
        let hard = edited(
            &tern60(&QUICK),
            &[
                ("pairs              2", "pairs              1"),
                ("resistive 8 ohm ±5 %", "nominal 4 ohm"),
            ],
        );
        let m = margin(&hard, RULE.name, "n16");
        let dwell = m.stress.unwrap().value;
        assert!(dwell > 1e-3 && dwell < 0.025, "{dwell}");
        assert_eq!(m.verdict, Ok);
        assert_eq!(
            margin(&hard.replace("soa 100 ms ", "soa 1 ms "), RULE.name, "n16").verdict,
            Over
        );
    }
}
