//! supply.fuse-band: the mains fuse against the rated current of what it feeds.

use crate::analysis::case::{solved, stated};
use crate::analysis::supply::places;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{FuseLine, Supply};
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A mains fuse protects the transformer. Fitted bigger and bigger until it survives switching on,
    /// it ends up carrying five times what the windings stand, and the transformer burns before the
    /// fuse opens. The cure for a fuse that blows at switch-on is a slow one or a soft start.
    "supply.fuse-band",
    compares: "mains fuse with the rated primary current of the transformers behind it",
    stress: "mains fuse over rated primary current",
    rating: "limit",
    formula: "IN/(ΣVA/Vtap)",
    source: "common practice, no source",
    reads: ["supply.fuse", "supply.transformer", "transformer.rating", "transformer.primary", "build.mains"],
    sense: AtMost,
    unit: "1",
    allow: Allow::Fixed(3.0, 5.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.fuse", slot: "A", series: Series::R10, up: false },
    ],
    example: "tern60", [("2.5 A slow melts 90 A2s", "5 A slow melts 90 A2s")],
}

/// One margin for the mains fuses.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let part = case.fuse_part(supply, "mains");
    match case.mains_fuses() {
        Err(needs) => out.compare(&RULE, part, supply.mains_fuse.site(), Err(needs)),
        Ok(fuses) => {
            for fuse in fuses {
                let behind = Case::transformers_behind(supply, fuse);
                out.compare(
                    &RULE,
                    part.clone(),
                    fuse.site,
                    stress(case, supply, fuse, behind),
                );
            }
        }
    }
}

/// A fuse against the rated primary current of this many of the supply's transformers.
///
/// # Errors
/// What the transformer does not state.
pub fn stress(
    case: &Case<'_>,
    supply: &Supply,
    fuse: &FuseLine,
    transformers: u32,
) -> Result<Stress, Needs> {
    let (transformer, tap) = case.transformer()?;
    let rated = transformer.rated_primary_current() * f64::from(transformers);
    let stated_in = &supply.transformer;
    Ok(Stress {
        value: fuse.rating / rated,
        rating: f64::NAN,
        witness: Witness {
            mains_v: Some(tap.0),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            stated("IN", "fuse", fuse.rating.0, "A", [fuse.site]),
            stated(
                "VA",
                "one transformer",
                stated_in.rating.need().copied()?,
                "VA",
                stated_in.rating.stated_at(),
            ),
            stated(
                "Vtap",
                "primary tap in use",
                tap.0,
                "V",
                stated_in.primary.stated_at(),
            ),
            solved(
                "Ir",
                "rated primary current behind the fuse",
                "ΣVA/Vtap",
                rated.0,
                "A",
                "",
            ),
            solved(
                "k",
                "fuse over rated current",
                "IN/Ir",
                fuse.rating / rated,
                "1",
                "",
            ),
        ],
        related: places([
            ("the transformer", supply.transformer_field.stated_at()),
            ("its rating", stated_in.rating.stated_at()),
        ]),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn fuse(amps: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("2.5 A slow melts", &format!("{amps} A slow melts"))]),
            super::RULE.name,
            "toroid fuse mains",
        )
    }

    /// 300 VA/230 V = 1.30435 A; 2.5 A is 1.91667 of it, 3 x is 3.913 A, 5 x is 6.5217 A. By hand.
    #[test]
    fn against_the_rated_current() {
        assert!((fuse("2.5").stress.unwrap().value - 1.916_67).abs() < 1e-5);
        assert_eq!(fuse("3.9").verdict, Verdict::Ok);
        assert_eq!(fuse("4").verdict, Verdict::Thin);
        assert_eq!(fuse("6.3").verdict, Verdict::Thin);
        assert_eq!(fuse("8").verdict, Verdict::Over);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[(
                "    fuse mains         2.5 A slow melts 90 A2s tap 230 V\n",
                "",
            )]),
            super::RULE.name,
            "toroid fuse mains",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid fuse mains".to_owned()]
            )
        );
        // a fuse for the other strap is none for this one
        let m = margin(
            &tern60(&[("A2s tap 230 V", "A2s tap 115 V")]),
            super::RULE.name,
            "toroid fuse mains",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid fuse mains tap 230 V".to_owned()]
            )
        );
    }
}
