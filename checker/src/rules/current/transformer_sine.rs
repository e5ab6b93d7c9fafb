//! current.transformer-sine: the transformer under a continuous sine, as information.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, both};
use crate::finding::Verdict;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// No music loads an amplifier like a continuous sine at rated power, and no transformer in an
    /// amplifier for music is bought for it. Some tests, some stages and some standards do ask for
    /// it. So the figure is always shown, and counts only where the policy in force says that it
    /// does: `severity current.transformer-sine warning`, or an `allow` line.
    "current.transformer-sine",
    compares: "volt-amperes of a transformer at the continuous rated sine, all its channels, with its rating",
    stress: "volt-amperes at the continuous rated sine",
    rating: "transformer's rating",
    formula: "VA = Σ windings Vs·Irms, Irms from the rectifier at Idc = n·(Î/π + N·Iq), Î = √(2P/R)",
    source: "periodic solution of the rectifier, after O. H. Schade, Proc. IRE 31 (1943) 341",
    reads: ["transformer.rating", "transformer.secondary", "transformer.regulation", "supply.transformer", "supply.rectifier", "supply.reservoir", "amplifier.rated", "build.supply", "build.loads", "build.mains", "build.policy"],
    sense: AtMost,
    unit: "VA",
    allow: Allow::Percent(100.0), "information unless the policy says otherwise",
    remedies: [
        Remedy { key: "transformer.rating", slot: "VA", series: Series::TransformerVa, up: true },
    ],
    example: "tern60", [
        ("build mono {", "policy stage from bench { severity current.transformer-sine warning }\nbuild mono {\n    policy             stage"),
        ("300 VA", "100 VA"),
    ],
}

/// One margin for the transformer: the load that draws most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let (part, site) = (
        case.transformer_part(supply),
        supply.transformer_field.site(),
    );
    let entry = case.policy.entry(&RULE);
    let counts = entry.severity.is_some() || entry.site.is_some();
    let mut worst: Option<Stress> = None;
    for found in case.per_load(|load| stress(case, supply, load)) {
        match found {
            Ok(stress) if !counts => {
                if worst.as_ref().is_none_or(|w| stress.value > w.value) {
                    worst = Some(stress);
                }
            }
            found => out.compare(&RULE, part.clone(), site, found),
        }
    }
    if let Some(stress) = worst {
        let note = format!(
            "{:.0} VA of {:.0} VA at the continuous rated sine; information",
            stress.value, stress.rating
        );
        out.judge(&RULE, part, site, Verdict::Ok, Stress { note, ..stress });
    }
}

fn stress(case: &Case<'_>, supply: &Supply, load: &Driven) -> Result<Stress, Needs> {
    let field = &supply.transformer.rating;
    let (rating, flow) = both(field.need().copied(), case.sine_flow(load))?;
    let mut working = case.rail_steps(&flow, "√(2PR) of the claimed power, else what is sustained");
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
        witness: case.at_flow(load, &flow, None),
        working,
        related: case.loading_sites(load),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::{Margin, Severity, Verdict};
    use crate::testing::{margin, tern60};

    fn with(va: &str, policy: &str) -> Margin {
        let named = format!(
            "policy stage from bench {{ {policy} }}\nbuild mono {{\n    policy             stage"
        );
        margin(
            &tern60(&[("300 VA", va), ("build mono {", &named)]),
            super::RULE.name,
            "t300",
        )
    }

    /// 60 W into 8 ohm: Idc = 3.873/π + 0.1 = 1.3328 A; a small-step integration written apart from
    /// this program has 2.9188 A in each winding: 163.45 VA.
    #[test]
    fn information_with_the_figure() {
        let m = margin(&tern60(&[]), super::RULE.name, "t300");
        assert_eq!(
            (m.verdict, m.severity, m.note.as_str()),
            (
                Verdict::Ok,
                Severity::Information,
                "163 VA of 300 VA at the continuous rated sine; information"
            )
        );
        // past the rating it is still information
        assert_eq!(
            margin(&tern60(&[("300 VA", "120 VA")]), super::RULE.name, "t300").verdict,
            Verdict::Ok
        );
    }

    #[test]
    fn counts_where_the_policy_says_so() {
        let m = with("120 VA", "severity current.transformer-sine warning");
        assert_eq!((m.verdict, m.severity), (Verdict::Over, Severity::Warning));
        assert_eq!(
            with("300 VA", "allow current.transformer-sine 50 %").verdict,
            Verdict::Thin
        );
        assert_eq!(
            with("300 VA", "allow current.transformer-sine 100 %").verdict,
            Verdict::Ok
        );
    }
}
