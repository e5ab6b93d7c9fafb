//! current.emitter-mean: mean watts of each emitter resistor at the duty.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Each emitter resistor carries its device's half of the wave, and stands beside a hot sink. An
    /// overheated one drifts upward, discolours the board and at last opens: then its neighbours carry
    /// the whole current. Ratings are printed for 70 degC of air and fall to nothing at 155 degC.
    "current.emitter-mean",
    compares: "mean watts of an emitter resistor at the duty with its rating at its temperature",
    stress: "mean power in one emitter resistor at the duty",
    rating: "rated power, derated",
    formula: "P = share²·(Î/N)²·RE/4 + Iq²·RE; rating = P70·(155 - T)/85 above 70 degC",
    source: "r.m.s. of a half-sine is half its peak; derating of common wirewound and film types (Yageo MFR, Vishay MRS25)",
    reads: ["stage.emitter", "stage.pairs", "stage.idle", "stage.vbe-spread", "build.duty", "build.ambient", "build.enclosure", "build.loads", "amplifier.drop"],
    sense: AtMost,
    unit: "W",
    allow: Allow::Percent(50.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.emitter", slot: "W", series: Series::ResistorWatts, up: true },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("0R22 ±5 % 5 W pulse", "0R22 ±5 % 0.1 W pulse")],
}

/// One margin for the build's emitter resistors: the load that warms them most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let field = &case.output().emitter;
    if field.none {
        return;
    }
    let (part, site) = (|| line_part(field), field.site());
    for played in case.played() {
        out.compare(
            &RULE,
            part(),
            site,
            played.and_then(|(load, heat)| stress(case, load, heat)),
        );
    }
}

fn stress(case: &Case<'_>, load: &Driven, heat: &Heat) -> Result<Stress, Needs> {
    let stage = case.output();
    let (warm, share, still) = case.emitter_resistor(heat)?;
    let pairs = f64::from(*stage.pairs.need()?);
    Ok(Stress {
        value: warm.watts.0,
        rating: warm.rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(heat.duty.amplitude.0),
            power_w: Some(heat.duty.power.0),
            duty: Some(case.duty().shown.clone()),
            ambient_c: case.hottest().ok().map(|t| t.0),
            device_a: Some(heat.duty.peak.0 / pairs * share),
            bank_a: Some(heat.duty.peak.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "Î",
                "peak current of the bank at the duty",
                "√(2·d·Pref·R)/R",
                heat.duty.peak.0,
                "A",
                "definition of the duty",
            ),
            solved(
                "share",
                "of the most loaded device",
                "I1·N/I",
                share,
                "1",
                "junction voltage and emitter resistor in balance",
            ),
            solved(
                "Pidle",
                "from the idle current, added whole",
                "Iq²·RE",
                still.0,
                "W",
                "Joule's law",
            ),
            solved(
                "P",
                "in the most loaded resistor",
                "share²·(Î/N)²·RE/4 + Pidle",
                warm.watts.0,
                "W",
                "r.m.s. of a half-sine",
            ),
            solved(
                "T",
                "air round it, hottest room",
                "Ta + Tencl",
                warm.air.0,
                "degC",
                "",
            ),
            solved(
                "Prated",
                "allowed at that temperature",
                "P70·(155 - T)/85 above 70 degC",
                warm.rating.0,
                "W",
                "Yageo MFR, Vishay MRS25 derating curves",
            ),
        ]
        .into_iter()
        .chain(stage.emitter.get().map(|r| {
            stated(
                "RE",
                "emitter resistor",
                r.ohm.nominal.0,
                "ohm",
                stage.emitter.stated_at(),
            )
        }))
        .collect(),
        related: vec![Related {
            message: "into this load".to_owned(),
            site: load.site,
        }],
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Thin, Unchecked};
    use crate::testing::{margin, report, tern60, verdict};

    /// One pair into bench-8 alone, idle left out. Duty 1/8 of the greater of 60 W and V(burst)²/2R.
    /// Vu at 230 V: √2·28·1.07 - 1 = 42.3699 - 1 = 41.3699 V; burst into 8 ohm: (41.3699 - 1.8)/
    /// (1 + 0.285714/8) = 39.5699/1.035714 = 38.2055 V, 91.229 W. Î² = 2·(91.229/8)/8 = 2.85090 A²;
    /// P = Î²·0.22/4 = 0.156800 W, and the resistor 5 % high 0.164640 W.
    #[test]
    fn one_pair_by_hand() {
        let text = tern60(&[
            ("pairs              2", "pairs              1"),
            (
                "loads              hall-8, bench-8",
                "loads              bench-8",
            ),
            (
                "idle               50 mA per device, 11 mV across emitter",
                "idle               none",
            ),
        ]);
        let m = margin(&text, RULE.name, "out emitter");
        assert!(
            (m.stress.unwrap().value - 0.164640).abs() < 2e-5,
            "{:?}",
            m.stress
        );
        // 45 degC inside: not derated
        assert!((m.rating.unwrap().value - 5.0).abs() < 1e-12);
        let rated = |w: &str| {
            verdict(
                &text.replace("0R22 ±5 % 5 W", &format!("0R22 ±5 % {w} W")),
                RULE.name,
                "out emitter",
            )
        };
        // 50 % of 0.3294 W is 0.16470 W, of 0.3291 W 0.16455 W; 0.1646 W is below the stress
        assert_eq!(rated("0.3294"), Ok);
        assert_eq!(rated("0.3291"), Thin);
        assert_eq!(rated("0.1646"), Over);
    }

    /// Air at 40 + 60 = 100 degC: 5 W·(155 - 100)/85 = 3.2353 W.
    #[test]
    fn hot_air_takes_from_the_rating() {
        let m = margin(
            &tern60(&[("enclosure          5 K", "enclosure          60 K")]),
            RULE.name,
            "out emitter",
        );
        assert!((m.rating.unwrap().value - 5.0 * 55.0 / 85.0).abs() < 1e-9);
    }

    #[test]
    fn watts_not_stated_are_named_and_none_has_no_margin() {
        let m = margin(
            &tern60(&[("0R22 ±5 % 5 W pulse 20 A", "0R22 ±5 % pulse 20 A")]),
            RULE.name,
            "out emitter",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["stage out emitter W".to_owned()][..])
        );
        let none = report(&tern60(&[
            (
                "emitter            0R22 ±5 % 5 W pulse 20 A ref R21-R24 part \"WW5-0R22J\"",
                "emitter            none",
            ),
            ("50 mA per device, 11 mV across emitter", "50 mA per device"),
        ]));
        assert!(!none.builds[0].margins.iter().any(|m| m.rule == RULE.name));
    }
}
