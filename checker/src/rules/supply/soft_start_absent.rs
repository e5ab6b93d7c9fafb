//! supply.soft-start-absent: a large transformer without a soft start.

use crate::analysis::switch_on::MainsSurge;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{FuseLine, Supply, both};
use crate::finding::{Verdict, Witness};
use crate::physics::unit::AmpSquaredSecond;
use crate::rule::{Allow, Remedy, Series};

use super::{fuse_band, fuse_inrush};

rule! {
    /// Above some 300 VA a toroid draws a hundred amperes and more for an instant when it is switched
    /// on: the lights dim, switch contacts weld, house breakers trip. Common practice is a resistor
    /// that is bypassed after half a second. Whether it can be left out is up to the mains fuse: if
    /// that cannot stand the surge, it cannot be left out.
    "supply.soft-start-absent",
    compares: "a supply above 300 VA without soft start, and whether its mains fuse stands that",
    stress: "I2t at switch-on without soft start",
    rating: "melting I2t of the mains fuse",
    formula: "ΣVA > 300 VA and no soft start: I2t as in supply.fuse-inrush",
    source: "common practice, no source",
    reads: ["supply.soft-start", "supply.fuse", "supply.transformer", "transformer.rating", "transformer.regulation", "supply.reservoir", "build.mains"],
    sense: AtMost,
    unit: "A2s",
    allow: Allow::Percent(50.0), "as supply.fuse-inrush",
    remedies: [
        Remedy { key: "supply.soft-start", slot: "ohm", series: Series::E12, up: true },
    ],
    example: "tern60", [
        ("    soft-start         27R 10 W bypass 400 ms thermal-fuse 130 degC", "    soft-start         none"),
        ("300 VA", "500 VA"),
        ("melts 90 A2s", "melts 30 A2s"),
    ],
}

/// Up to here nobody asks for one; common practice, no source.
const USUAL_WITHOUT_VA: f64 = 300.0;

/// One margin for a supply above 300 VA that has no soft start.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let field = &supply.soft_start;
    let Some(rating) = supply.transformer.rating.get() else {
        return;
    };
    let volt_amps = rating * f64::from(supply.transformers.max(1));
    if field.get().is_some() || volt_amps <= USUAL_WITHOUT_VA {
        return;
    }
    let (part, site) = (case.supply_part(supply, "soft-start", 1), field.site());
    if field.unstated() {
        return out.compare(&RULE, part, site, Err(field.missing()));
    }
    let fuses = case.mains_fuses().unwrap_or_default();
    if fuses.is_empty() {
        let note =
            format!("{volt_amps:.0} VA without soft start; no mains fuse says what it stands");
        return out.judge(
            &RULE,
            part,
            site,
            Verdict::Ok,
            Stress {
                note,
                ..Stress::default()
            },
        );
    }
    for fuse in fuses {
        out.compare(
            &RULE,
            part.clone(),
            site,
            stress(case, supply, fuse, volt_amps),
        );
    }
}

fn stress(
    case: &Case<'_>,
    supply: &Supply,
    fuse: &FuseLine,
    volt_amps: f64,
) -> Result<Stress, Needs> {
    let melts = fuse
        .melts
        .ok_or_else(|| supply.mains_fuse.missing_part("melts"));
    let behind = Case::transformers_behind(supply, fuse);
    let (melts, surge): (AmpSquaredSecond, MainsSurge) =
        both(melts, case.mains_surge(behind, false))?;
    Ok(Stress {
        value: surge.worse().0,
        rating: melts.0,
        witness: Witness {
            mains_v: case.mains_volts(crate::analysis::rails::Mains::High),
            channels_driven: None,
            ..case.witness()
        },
        working: fuse_inrush::steps(&surge),
        related: fuse_band::stress(case, supply, fuse, behind)?.related,
        note: format!(
            "{volt_amps:.0} VA without soft start: {:.0} A for an instant; common practice is one above {USUAL_WITHOUT_VA:.0} VA",
            surge.peak.0
        ),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    const SOFT: &str = "    soft-start         27R 10 W bypass 400 ms thermal-fuse 130 degC\n";
    const NONE: &str = "    soft-start         none\n";

    fn big(soft: &str, melts: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[(SOFT, soft), ("300 VA", "500 VA"), ("90 A2s", melts)]),
            super::RULE.name,
            "toroid soft-start",
        )
    }

    /// Rpri = 0.07·230²/1000 = 3.703 ohm, √2·253/4.003 = 89.382 A, I²t = 39.946 A²s. By hand.
    #[test]
    fn up_to_the_fuse() {
        let m = big(NONE, "90 A2s");
        assert_eq!(m.verdict, Verdict::Ok);
        assert!((m.stress.unwrap().value - 39.946).abs() < 0.01);
        assert!(m.note.starts_with("500 VA without soft start: 89 A"));
        assert_eq!(big(NONE, "60 A2s").verdict, Verdict::Thin);
        assert_eq!(big(NONE, "39 A2s").verdict, Verdict::Over);
    }

    #[test]
    fn not_stated_is_unchecked() {
        let m = big("", "90 A2s");
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid soft-start".to_owned()]
            )
        );
    }

    #[test]
    fn small_ones_go_without() {
        for text in [
            tern60(&[(SOFT, NONE)]),
            tern60(&[(SOFT, "")]),
            tern60(&[("300 VA", "500 VA")]),
        ] {
            assert!(
                report(&text).builds[0]
                    .margins
                    .iter()
                    .all(|m| m.rule != super::RULE.name)
            );
        }
    }
}
