//! supply.fuse-inrush: the mains fuse at switch-on.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::supply::places;
use crate::analysis::switch_on::MainsSurge;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{FuseLine, Supply, both};
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A toroid switched on at the wrong moment of the mains saturates and is, for half a cycle, a
    /// piece of copper; empty reservoirs follow. A fuse that just survives ages with each switch-on.
    /// When it opens the builder fits a larger one, and the next real fault meets no fuse at all.
    "supply.fuse-inrush",
    compares: "I2t of the mains surge at switch-on, high mains, with the melting I2t of the mains fuse",
    stress: "I2t at switch-on",
    rating: "melting I2t of the fuse",
    formula: "greater of the charging of empty reservoirs, before and after the bypass, and of a saturated core Ipk²/(4f), Ipk = √2·Vhigh/(Rpri + Rmains + Rsoft); Rpri else ρ·Vtap²/2VA",
    source: "charging of a reservoir through the winding, exact; half a sine of a saturated core; half of the melting I2t: Littelfuse, Fuseology",
    reads: ["supply.fuse", "supply.soft-start", "supply.transformer", "supply.rectifier", "supply.reservoir", "transformer.rating", "transformer.secondary", "transformer.regulation", "transformer.resistance", "transformer.primary", "build.mains", "stage.idle"],
    sense: AtMost,
    unit: "A2s",
    allow: Allow::Percent(50.0), "about a hundred pulses; Littelfuse, Fuseology",
    remedies: [
        Remedy { key: "supply.fuse", slot: "melts", series: Series::TwoDigits, up: true },
        Remedy { key: "supply.soft-start", slot: "ohm", series: Series::E12, up: true },
    ],
    example: "tern60", [("    soft-start         27R 10 W bypass 400 ms thermal-fuse 130 degC", "    soft-start         none"), ("melts 90 A2s", "melts 12 A2s")],
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
                let found =
                    stress(case, supply, fuse).and_then(|stress| survives(case, supply, stress));
                out.compare(&RULE, part.clone(), fuse.site, found);
            }
        }
    }
}

/// A soft start that is not stated might still be fitted: without it the fuse may pass, not fail.
fn survives(case: &Case<'_>, supply: &Supply, stress: Stress) -> Result<Stress, Needs> {
    let share = match case.policy.entry(&RULE).allow {
        Allow::Percent(percent) => percent / 100.0,
        _ => 1.0,
    };
    if supply.soft_start.unstated() && stress.value > share * stress.rating {
        Err(supply.soft_start.missing())
    } else {
        Ok(stress)
    }
}

fn stress(case: &Case<'_>, supply: &Supply, fuse: &FuseLine) -> Result<Stress, Needs> {
    let melts = fuse
        .melts
        .ok_or_else(|| supply.mains_fuse.missing_part("melts"));
    let behind = Case::transformers_behind(supply, fuse);
    let (melts, surge) = both(melts, case.mains_surge(behind, true))?;
    let mut working = steps(&surge);
    if supply.soft_start.get().is_some()
        && let Ok(bare) = case.mains_surge(behind, false)
    {
        working.push(solved(
            "bare",
            "without the soft start, information",
            "",
            bare.worse().0,
            "A2s",
            "",
        ));
    }
    working.push(stated("melts", "melting I2t", melts.0, "A2s", [fuse.site]));
    Ok(Stress {
        value: surge.worse().0,
        rating: melts.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            tolerance: vec![("reservoir".to_owned(), "high")],
            channels_driven: None,
            ..case.witness()
        },
        working,
        related: places([
            ("the transformer", supply.transformer_field.stated_at()),
            ("the reservoir", supply.reservoir.stated_at()),
            ("the soft start", supply.soft_start.stated_at()),
            ("the mains", case.region.map(|r| r.site)),
        ]),
        note: if surge.core > surge.reservoir {
            "the saturated core is worse".to_owned()
        } else {
            "the empty reservoirs are worse".to_owned()
        },
        ..Stress::default()
    })
}

/// How a mains surge was had.
#[must_use]
pub fn steps(surge: &MainsSurge) -> Vec<crate::finding::Step> {
    vec![
        solved(
            "Rpri",
            "copper of one primary",
            "stated, else ρ·Vtap²/2VA",
            surge.primary.0,
            "ohm",
            "least-copper design",
        ),
        solved(
            "Rmains",
            "mains",
            "stated, else 0.3 ohm",
            surge.mains.0,
            "ohm",
            "common practice, no source",
        ),
        solved(
            "core",
            "I2t of a saturated core",
            "Ipk²/(4f)",
            surge.core.0,
            "A2s",
            "half a sine",
        ),
        solved(
            "empty",
            "I2t of empty reservoirs, bypass included",
            "",
            surge.reservoir.0,
            "A2s",
            "charging through the winding, exact",
        ),
    ]
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60, verdict};

    const SOFT: &str = "    soft-start         27R 10 W bypass 400 ms thermal-fuse 130 degC\n";

    /// Rpri = 0.07·230²/600 = 6.1717 ohm. With 0.3 ohm of mains and 27 ohm: √2·253/33.472 = 10.6895 A,
    /// I²t = 10.6895²/200 = 0.57133 A²s; without the 27 ohm 55.2865 A, 15.283 A²s. By hand. Empty
    /// reservoirs, by a small-step integration written apart from this program: 0.4800 A²s and
    /// 0.0015 A²s at the bypass; without soft start 1.628 A²s.
    #[test]
    fn core_and_reservoirs() {
        let m = margin(&tern60(&[]), super::RULE.name, "toroid fuse mains");
        assert!((m.stress.unwrap().value - 0.571_33).abs() < 1e-4);
        let step = |symbol: &str| m.working.iter().find(|s| s.symbol == symbol).unwrap().value;
        assert!(
            (step("empty") / 0.4815 - 1.0).abs() < 5e-3,
            "{}",
            step("empty")
        );
        assert!((step("bare") - 15.283).abs() < 1e-3);
        let bare = margin(
            &tern60(&[(SOFT, "    soft-start         none\n")]),
            super::RULE.name,
            "toroid fuse mains",
        );
        let empty = bare
            .working
            .iter()
            .find(|s| s.symbol == "empty")
            .unwrap()
            .value;
        assert!((empty / 1.628 - 1.0).abs() < 5e-3, "{empty}");
    }

    /// 50 % of 30.6 A²s is 15.3 A²s, of 30.5 A²s 15.25 A²s. By hand.
    #[test]
    fn limits() {
        let at = |melts: &str| {
            verdict(
                &tern60(&[
                    (SOFT, "    soft-start         none\n"),
                    ("90 A2s", &format!("{melts} A2s")),
                ]),
                super::RULE.name,
                "toroid fuse mains",
            )
        };
        assert_eq!(at("30.6"), Verdict::Ok);
        assert_eq!(at("30.5"), Verdict::Thin);
        assert_eq!(at("15.2"), Verdict::Over);
    }

    /// With no word of a soft start the fuse may pass without it, not fail for want of it.
    #[test]
    fn an_unstated_soft_start() {
        let with = |melts: &str| {
            margin(
                &tern60(&[(SOFT, ""), ("90 A2s", melts)]),
                super::RULE.name,
                "toroid fuse mains",
            )
        };
        assert_eq!(with("90 A2s").verdict, Verdict::Ok);
        let m = with("20 A2s");
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid soft-start".to_owned()]
            )
        );
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[(" melts 90 A2s", "")]),
            super::RULE.name,
            "toroid fuse mains",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid fuse mains melts".to_owned()]
            )
        );
    }
}
