//! thermal.enclosure: the air inside the case.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Everything that is not on a heatsink lives in the air inside: capacitors, relays, fuses, resistors,
    /// the transformer. Most of their ratings hold up to 70 degC of air and fall from there, and
    /// electrolytics halve their life every 10 K. Amplifiers in a closed rack fail in summer for this,
    /// and the heatsink outside is still cool.
    "thermal.enclosure",
    compares: "air inside the case in the hottest room with what small parts are rated for",
    stress: "air inside, hottest room",
    rating: "air for which parts keep their ratings",
    formula: "T = Ta + Tencl",
    source: "knee of common resistor and relay derating, 70 degC; 60 degC common practice, no source",
    reads: ["build.ambient", "build.enclosure"],
    sense: Temperature,
    unit: "degC",
    allow: Allow::Fixed(60.0, 70.0), "common practice, no source",
    remedies: [
        Remedy { key: "build.enclosure", slot: "K", series: Series::TwoDigits, up: false },
    ],
    example: "tern60", [("enclosure          5 K", "enclosure          25 K")],
}

/// One margin for the build.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let field = &case.build.enclosure;
    out.compare(&RULE, line_part(field), field.site(), stress(case));
}

fn stress(case: &Case<'_>) -> Result<Stress, Needs> {
    let (hottest, inside) = (case.hottest()?, case.air_inside()?);
    let field = &case.build.enclosure;
    Ok(Stress {
        value: inside.0,
        rating: f64::NAN,
        ambient: hottest.0,
        witness: Witness {
            ambient_c: Some(hottest.0),
            ..Witness::default()
        },
        working: vec![
            stated(
                "Ta",
                "hottest air round the case",
                hottest.0,
                "degC",
                case.build.ambient.stated_at(),
            ),
            stated(
                "Tencl",
                "rise inside",
                (inside - hottest).0,
                "K",
                field.stated_at(),
            ),
            solved("T", "air inside", "Ta + Tencl", inside.0, "degC", ""),
        ],
        related: vec![Related {
            message: "the hottest room".to_owned(),
            site: case.build.ambient.site(),
        }],
        note: if field.assumed {
            "no rise inside is stated: none is assumed".to_owned()
        } else {
            String::new()
        },
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Thin, Unchecked};
    use crate::testing::{margin, tern60, verdict};

    /// 40 degC round the case: 20 K inside is the allowance of 60 degC, 30 K the limit of 70 degC.
    #[test]
    fn limits() {
        let at = |rise: &str| {
            verdict(
                &tern60(&[(
                    "enclosure          5 K",
                    &format!("enclosure          {rise}"),
                )]),
                RULE.name,
                "mono enclosure",
            )
        };
        assert_eq!(at("20 K"), Ok);
        assert_eq!(at("20.1 K"), Thin);
        assert_eq!(at("30 K"), Thin);
        assert_eq!(at("30.1 K"), Over);
    }

    #[test]
    fn an_unstated_room_is_named() {
        let m = margin(
            &tern60(&[("    ambient            10 degC to 40 degC\n", "")]),
            RULE.name,
            "mono enclosure",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["build mono ambient".to_owned()][..])
        );
    }
}
