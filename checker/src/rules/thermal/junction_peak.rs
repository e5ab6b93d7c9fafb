//! thermal.junction-peak: the hottest moment of a junction at the bottom of the band.

use crate::analysis::case::{Side, solved, stated};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::both;
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// At 20 Hz the chip heats and cools with every half-cycle: its peak is well above its mean, and the
    /// mean is what sinks are chosen by. The peak is solved from the transient thermal terms of the
    /// data sheet, starting from the case as the duty leaves it. A junction above Tj,max even for
    /// milliseconds tires the die bond, and then it fails for good.
    "thermal.junction-peak",
    compares: "peak junction temperature under a full sine at the bottom of the band with Tj,max",
    stress: "peak junction temperature at the bottom of the band",
    rating: "Tj,max",
    formula: "Tj,pk = Tcase + max Σ Rk·(first-order answer of p(t)) + Vu·Iq·θjc, p = i·(Vu - v_out - i·RE) at V(burst)",
    source: "periodic steady state of a Foster network, closed form, own derivation",
    reads: ["device.foster", "device.junction-case", "device.junction", "stage.insulator", "stage.pairs", "stage.emitter", "stage.idle", "amplifier.band", "amplifier.drop", "build.loads", "build.duty", "build.ambient", "heatsink.resistance"],
    sense: Temperature,
    unit: "degC",
    allow: Allow::Below(0.0, f64::INFINITY), "the data sheet's own limit",
    remedies: [
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
    ],
    example: "tern60", [("pairs              2", "pairs              1"), ("resistance         0.45 K/W at 50 K", "resistance         1.2 K/W at 50 K"), ("resistive 8 ohm", "resistive 3 ohm")],
}

/// One margin for each declared output device: the load that drives it hottest.
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
    let device = case.output().device(side);
    let (limit, peak) = both(
        device.junction.need().copied(),
        case.peak_junction(heat, load, side),
    )?;
    // a bound that fits proves it; one that does not proves nothing
    if peak.bounded && peak.junction > limit {
        return Err(device.foster.missing());
    }
    let mut related = vec![Related {
        message: "into this load".to_owned(),
        site: load.site,
    }];
    related.extend(device.foster.stated_at().map(|site| Related {
        message: "transient thermal terms".to_owned(),
        site,
    }));
    Ok(Stress {
        value: peak.junction.0,
        rating: limit.0,
        ambient: case.hottest()?.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(peak.frequency.0),
            amplitude_v: Some(peak.amplitude.0),
            duty: Some(case.duty().shown.clone()),
            ambient_c: Some(case.hottest()?.0),
            sink_c: Some(heat.hot_spot.0),
            case_c: Some(peak.case.0),
            junction_c: Some(peak.junction.0),
            rail_v: Some(peak.rail.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "Vu",
                "unsagged rail, nominal mains",
                "V0 - Vd",
                peak.rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            solved(
                "V̂",
                "peak output",
                "Vu - drop(V̂/|Z|)",
                peak.amplitude.0,
                "V",
                "drop as stated",
            ),
            solved(
                "share",
                "of the most loaded device, at the mean current",
                "I1·N/I",
                peak.share,
                "1",
                "junction voltage and emitter resistor in balance",
            ),
            solved(
                "Tcase",
                "case of the hottest device at the duty",
                "Ts + P·θcs",
                peak.case.0,
                "degC",
                "energy balance",
            ),
            solved(
                "ΔT",
                "greatest rise above the case from the signal",
                "periodic answer of the Foster terms",
                peak.rise.0,
                "K",
                "closed form, own derivation",
            ),
            solved(
                "ΔTidle",
                "rise from the idle current, added whole",
                "Vu·Iq·ΣR",
                peak.idle_rise.0,
                "K",
                "energy balance",
            ),
            solved(
                "Tj,pk",
                "hottest moment",
                "Tcase + ΔT + ΔTidle",
                peak.junction.0,
                "degC",
                "",
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
        note: if peak.bounded {
            "no transient terms are stated: an upper bound, by a junction without heat capacity"
                .to_owned()
        } else {
            String::new()
        },
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Unchecked};
    use crate::testing::{margin, tern60};

    const TERMS: &str = "foster             0.07 K/W 1 ms, 0.22 K/W 12 ms, 0.40 K/W 110 ms";
    const ALONE: [(&str, &str); 3] = [
        ("pairs              2", "pairs              1"),
        (
            "loads              hall-8, bench-8",
            "loads              bench-8",
        ),
        (
            "idle               50 mA per device, 11 mV across emitter",
            "idle               none",
        ),
    ];

    fn rise(terms: &str) -> f64 {
        let m = margin(
            &tern60(&[ALONE[0], ALONE[1], ALONE[2], (TERMS, terms)]),
            RULE.name,
            "n16",
        );
        m.working.iter().find(|s| s.symbol == "ΔT").unwrap().value
    }

    /// A term so slow that it only sees the mean: V = 41.3699 V, bench-8 at 7.6 ohm gives Î = 5.01792 A,
    /// V̂ = 38.1362 V; mean = Î·(V/π - V̂/4 - Î·RE/4) = 5.01792·(13.16845 - 9.53405 - 0.27599) = 16.8522 W,
    /// times 0.69 K/W: 11.6280 K. A term so fast that it follows: greatest power on the resistive line,
    /// 54.7145 W as in soa.resistive, times 0.69: 37.7530 K. Hand calculation.
    #[test]
    fn slow_terms_see_the_mean_and_fast_ones_the_peak() {
        assert!(
            (rise("foster 0.69 K/W 10000 s") - 11.628).abs() < 0.01,
            "{}",
            rise("foster 0.69 K/W 10000 s")
        );
        assert!(
            (rise("foster 0.69 K/W 1 us") - 37.753).abs() < 0.01,
            "{}",
            rise("foster 0.69 K/W 1 us")
        );
    }

    #[test]
    fn the_sound_kit_is_cool_enough_and_between_the_two() {
        let m = margin(&tern60(&[]), RULE.name, "n16");
        assert_eq!(m.verdict, Ok);
        let between = rise(TERMS);
        assert!(between > 11.628 && between < 37.753, "{between}");
    }

    /// Without terms the junction follows every instant, the 37.753 K of above: a bound that fits passes and
    /// says so; one that does not proves nothing, and names the terms.
    #[test]
    fn unstated_terms_are_bounded_or_named() {
        assert!((rise("") - 37.753).abs() < 0.01, "{}", rise(""));
        let m = margin(&tern60(&[(TERMS, "")]), RULE.name, "n16");
        assert!(
            m.verdict == Ok && m.note.contains("upper bound"),
            "{}",
            m.note
        );
        let hot = [RULE.example.edits, &[(TERMS, "")]].concat();
        let m = margin(&tern60(&hot), RULE.name, "n16");
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["device n16 foster".to_owned()][..])
        );
    }
}
