//! power.ripple-headroom: the trough of the rail against what the output stage needs at the claim.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Claim, both};
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

use super::rated_power::{related, witness};

rule! {
    /// Between two crests of the mains the reservoir alone feeds the load, and the rail falls until
    /// the next one. The claimed peak and the volts that the output stage loses must fit under the
    /// lowest point, not under the mean that a meter shows. Where they do not, every crest of a loud
    /// note is cut off a hundred times a second.
    "power.ripple-headroom",
    compares: "lowest point of the rail at the claimed power with what the output stage needs there",
    stress: "lowest point of the rail at the claimed sine",
    rating: "volts needed, less 0.5 dB",
    formula: "Vt = trough at Σ(Î/π + N·Iq) - ESR·(ΣÎ - mean); needed V̂ + drop(Î), V̂ = √(2PR), bridged half of it into R/2",
    source: "Kirchhoff's laws; periodic solution of the rectifier, after O. H. Schade, Proc. IRE 31 (1943) 341",
    reads: ["amplifier.rated", "amplifier.drop", "stage.idle", "stage.pairs", "transformer.secondary", "transformer.rating", "transformer.regulation", "supply.rectifier", "supply.reservoir", "supply.wiring", "build.mains", "build.channels", "build.supply", "build.rails"],
    sense: AtLeast,
    unit: "V",
    allow: Allow::Percent(NEED), "the need itself; 0.5 dB short of it is common practice, no source",
    remedies: [
        Remedy { key: "supply.reservoir", slot: "F", series: Series::Reservoir, up: true },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: true },
        Remedy { key: "transformer.rating", slot: "VA", series: Series::TransformerVa, up: true },
    ],
    example: "tern60", [("2 x 4700 uF ±20 %", "2 x 1000 uF ±20 %")],
}

/// 0.5 dB of a voltage as a ratio, 10^-0.025.
const HALF_DECIBEL: f64 = 0.944_060_876_285_923_4;
/// What is needed in per cent of what is 0.5 dB less.
const NEED: f64 = 100.0 / HALF_DECIBEL;

/// One margin for the line of claims: the claim with least to spare.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let field = &case.build.amplifier.rated;
    match case.claims() {
        Err(needs) => out.compare(&RULE, line_part(field), field.site(), Err(needs)),
        Ok(claims) => {
            for claim in claims {
                out.compare(&RULE, line_part(field), claim.site, stress(case, &claim));
            }
        }
    }
}

fn stress(case: &Case<'_>, claim: &Claim) -> Result<Stress, Needs> {
    let (drop, asked) = both(case.drop(), case.asked(claim))?;
    let rail = case.trough(asked.mains, asked.driven, asked.peak)?;
    let needed = asked.amplitude + drop.at(asked.peak);
    let known = Witness {
        amplitude_v: Some(asked.amplitude.0),
        power_w: Some(claim.power.0),
        rail_v: Some(rail.lowest.0),
        ..case.witness()
    };
    Ok(Stress {
        value: rail.lowest.0,
        rating: needed.0 * HALF_DECIBEL,
        witness: witness(case, claim, &asked, known),
        working: vec![
            stated("Pclaim", "claimed", claim.power.0, "W", [claim.site]),
            solved(
                "V̂",
                "peak output of one channel",
                "√(2PR), bridged half of it",
                asked.amplitude.0,
                "V",
                "power of a sine",
            ),
            solved(
                "need",
                "rail that the peak needs",
                "V̂ + drop(Î)",
                needed.0,
                "V",
                "",
            ),
            solved(
                "Idc",
                "mean current on each rail",
                "Σ(Î/π + N·Iq)",
                rail.current.0,
                "A",
                "mean of a half-sine",
            ),
            solved(
                "Vm",
                "mean rail, least reservoir",
                "periodic solution of the rectifier",
                rail.mean.0,
                "V",
                "",
            ),
            solved(
                "Vt",
                "its lowest point",
                "trough - ESR·(ΣÎ - Idc)",
                rail.lowest.0,
                "V",
                "periodic solution of the rectifier",
            ),
        ],
        related: related(case),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    const CLAIMS: &str =
        "60 W into 8 ohm all-channels nominal-mains, 100 W into 4 ohm all-channels nominal-mains";

    /// 60 W into 8 ohm: V̂ = √960 = 30.984 V, Î = 3.873 A, drop 1.8 + 3.873·2/7 = 2.907 V: 33.890 V.
    /// A small-step integration written apart from this program leaves 37.373 V: 90.68 %.
    #[test]
    fn against_small_steps() {
        let m = margin(
            &tern60(&[(CLAIMS, "60 W into 8 ohm")]),
            super::RULE.name,
            "tern60 rated",
        );
        assert!((m.stress.unwrap().value - 37.373).abs() < 0.02);
        assert!((m.allowance.unwrap().value - 33.890).abs() < 1e-3);
        assert!((m.used_percent.unwrap() - 90.68).abs() < 0.05);
    }

    #[test]
    fn too_little_for_the_peak() {
        let at = |claim: &str| {
            margin(
                &tern60(&[(CLAIMS, claim)]),
                super::RULE.name,
                "tern60 rated",
            )
            .verdict
        };
        assert_eq!(at("72 W into 8 ohm"), Verdict::Ok);
        assert_eq!(at("76 W into 8 ohm"), Verdict::Thin);
        assert_eq!(at("90 W into 8 ohm"), Verdict::Over);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[("2 x 28 Vac", "none")]),
            super::RULE.name,
            "tern60 rated",
        );
        assert_eq!(m.verdict, Verdict::Unchecked);
        assert!(m.needs.contains(&"transformer t300 secondary".to_owned()));
    }
}
