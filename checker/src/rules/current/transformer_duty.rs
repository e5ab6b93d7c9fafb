//! current.transformer-duty: the transformer's volt-amperes at the duty.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, both};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A rectifier with a reservoir takes its current in short pulses, which heat the windings half
    /// as much again as the watts it delivers suggest. A transformer too small for its channels
    /// sags, hums, and in the end blows the thermal fuse in its winding, which nobody can replace.
    "current.transformer-duty",
    compares: "volt-amperes of a transformer at the duty, all its channels, with its rating",
    stress: "volt-amperes at the duty",
    rating: "transformer's rating",
    formula: "VA = Σ windings Vs·Irms, Irms from the rectifier at Idc = n·(Î/π + N·Iq)",
    source: "periodic solution of the rectifier, after O. H. Schade, Proc. IRE 31 (1943) 341; winding current against its rating",
    reads: ["transformer.rating", "transformer.secondary", "transformer.regulation", "supply.transformer", "supply.rectifier", "supply.reservoir", "build.supply", "build.duty", "build.loads", "build.mains", "stage.idle", "amplifier.drop"],
    sense: AtMost,
    unit: "VA",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "transformer.rating", slot: "VA", series: Series::TransformerVa, up: true },
    ],
    example: "tern60", [("300 VA", "50 VA")],
}

/// One margin for the transformer: the load that draws most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    for found in case.per_load(|load| stress(case, supply, load)) {
        out.compare(
            &RULE,
            case.transformer_part(supply),
            supply.transformer_field.site(),
            found,
        );
    }
}

fn stress(case: &Case<'_>, supply: &Supply, load: &Driven) -> Result<Stress, Needs> {
    let field = &supply.transformer.rating;
    let (rating, flow) = both(field.need().copied(), case.duty_flow(load))?;
    let mut working = case.rail_steps(&flow, "√(2·d·Pref·R)");
    working.push(solved(
        "Irms",
        "one winding",
        "periodic solution of the rectifier",
        flow.winding.0,
        "A",
        "",
    ));
    working.push(solved(
        "VA",
        "one transformer",
        "Σ windings Vs·Irms",
        flow.volt_amps,
        "VA",
        "rated volts stand for the heating of the copper",
    ));
    working.push(stated(
        "rating",
        "one transformer",
        rating,
        "VA",
        field.stated_at(),
    ));
    Ok(Stress {
        value: flow.volt_amps,
        rating,
        witness: case.at_flow(load, &flow, Some(&case.duty().shown)),
        working,
        related: case.loading_sites(load),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    /// A small-step integration written apart from this program has 1.5802 A in each winding at
    /// Idc = 0.63745 A: 2·28·1.5802 = 88.49 VA. 80 % of 300 VA is 240 VA: 36.87 %.
    #[test]
    fn against_small_steps() {
        let m = margin(&tern60(&[]), super::RULE.name, "t300");
        assert!((m.stress.unwrap().value / 88.49 - 1.0).abs() < 1e-3);
        assert!((m.used_percent.unwrap() - 36.87).abs() < 0.05);
    }

    /// Two channels on it take more than one and a half times as much; two transformers halve it.
    #[test]
    fn channels_and_transformers_share() {
        let used = |edits: &[(&str, &str)]| {
            margin(&tern60(edits), super::RULE.name, "t300")
                .used_percent
                .unwrap()
        };
        let channels = ("    channels           1\n", "    channels           2\n");
        let one = used(&[]);
        let two = used(&[channels]);
        let both = used(&[
            channels,
            (
                "    transformer        t300",
                "    transformer        2 x t300",
            ),
        ]);
        assert!(two > 1.5 * one && two < 2.0 * one && both < two && both > 0.9 * one);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[("    rating             300 VA per transformer\n", "")]),
            super::RULE.name,
            "t300",
        );
        assert_eq!(m.verdict, Verdict::Unchecked);
        assert!(m.needs.contains(&"transformer t300 rating".to_owned()));
    }
}
