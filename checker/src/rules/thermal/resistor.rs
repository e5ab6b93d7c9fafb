//! thermal.resistor: power resistors that burn for ever, at their temperature.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A bleeder burns its watts whenever the mains is on, at high mains for years, next to the capacitors
    /// it discharges. Ratings are for 70 degC of air and fall to nothing at 155 degC. One that opens
    /// fails in silence: the next person to touch the reservoir finds it charged. (Emitter resistors are
    /// compared by current.emitter-mean, the output network's by its own rule.)
    "thermal.resistor",
    compares: "power in the bleeder at high mains with its rating at its temperature",
    stress: "power in the bleeder, high mains",
    rating: "rated power, derated",
    formula: "P = Vu²/R with R at its least; rating = P70·(155 - T)/85 above 70 degC",
    source: "Joule's law; derating of common types (Yageo MFR, Vishay MRS25)",
    reads: ["supply.bleeder", "build.supply", "build.mains", "build.ambient", "build.enclosure", "transformer.secondary"],
    sense: AtMost,
    unit: "W",
    allow: Allow::Percent(50.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.bleeder", slot: "W", series: Series::ResistorWatts, up: true },
        Remedy { key: "supply.bleeder", slot: "ohm", series: Series::E12, up: true },
    ],
    example: "tern60", [("3k3 ±5 % 3 W", "1k ±5 % 2 W")],
}

/// One margin for the bleeder. None fitted, or rails that are given, have none.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let field = &supply.bleeder;
    if !field.none {
        out.compare(&RULE, line_part(field), field.site(), stress(case));
    }
}

fn stress(case: &Case<'_>) -> Result<Stress, Needs> {
    let field = &case.supply()?.bleeder;
    let (warm, volts) = case.bleeder()?;
    let (resistor, _) = *field.need()?;
    Ok(Stress {
        value: warm.watts.0,
        rating: warm.rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            ambient_c: case.hottest().ok().map(|t| t.0),
            rail_v: Some(case.unsagged(Mains::High)?.0),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            solved(
                "V",
                "across it, high mains, no load",
                "Vu, or 2·Vu from rail to rail",
                volts.0,
                "V",
                "definition of the unsagged rail",
            ),
            stated(
                "R",
                "at its least",
                resistor.ohm.low.0,
                "ohm",
                field.stated_at(),
            ),
            solved("P", "in it", "V²/R", warm.watts.0, "W", "Joule's law"),
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
        ],
        related: case.rail_sites(None),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Thin, Unchecked};
    use crate::testing::{margin, report, tern60, verdict};

    /// Vu at 253 V: 46.6068 - 1.0 = 45.6068 V; 3300 ohm - 5 % = 3135 ohm: 2079.98/3135 = 0.663471 W. Half of 1.33 W
    /// is 0.665 W, of 1.32 W 0.660 W. Hand calculation.
    #[test]
    fn by_hand() {
        let m = margin(&tern60(&[]), RULE.name, "toroid bleeder");
        assert!(
            (m.stress.unwrap().value - 0.663471).abs() < 1e-5,
            "{:?}",
            m.stress
        );
        let rated = |w: &str| {
            verdict(
                &tern60(&[("3k3 ±5 % 3 W", &format!("3k3 ±5 % {w} W"))]),
                RULE.name,
                "toroid bleeder",
            )
        };
        assert_eq!(rated("1.33"), Ok);
        assert_eq!(rated("1.32"), Thin);
        assert_eq!(rated("0.66"), Over);
    }

    /// From rail to rail it stands at twice the volts: four times the watts.
    #[test]
    fn rail_to_rail() {
        let m = margin(
            &tern60(&[("3 W per rail", "3 W per supply")]),
            RULE.name,
            "toroid bleeder",
        );
        assert!((m.stress.unwrap().value - 4.0 * 0.663471).abs() < 5e-5);
    }

    #[test]
    fn none_has_no_margin_and_silence_is_unchecked() {
        let line = "    bleeder            3k3 ±5 % 3 W per rail\n";
        let none = report(&tern60(&[(line, "    bleeder none\n")]));
        assert!(!none.builds[0].margins.iter().any(|m| m.rule == RULE.name));
        let m = margin(&tern60(&[(line, "")]), RULE.name, "toroid bleeder");
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["supply toroid bleeder".to_owned()][..])
        );
        let m = margin(
            &tern60(&[("3k3 ±5 % 3 W", "3k3 ±5 %")]),
            RULE.name,
            "toroid bleeder",
        );
        assert_eq!(m.needs, ["supply toroid bleeder W"]);
    }
}
