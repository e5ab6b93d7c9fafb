//! voltage.reservoir: the reservoir capacitors against their rated voltage.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::supply::Bank;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// With no load the reservoir charges to the crest of the unloaded winding, at high mains 15 to
    /// 20 % above what the nominal secondary voltage lets one expect. A capacitor above its rating
    /// leaks, gasses and vents, at worst hours later with nobody near. The short surge rating of a
    /// data sheet is no operating rating.
    "voltage.reservoir",
    compares: "voltage on a reservoir capacitor, high mains, no load, with its rating",
    stress: "rail at high mains, no load",
    rating: "capacitor's rated voltage",
    formula: "V0 = m·√2·Vs·(1 + ρ)",
    source: "definition of regulation, full-load base: maker's practice for toroids; IEC 60384-4 for the rating",
    reads: ["supply.reservoir", "amplifier.board-reservoir", "transformer.secondary", "transformer.regulation", "build.mains", "build.rails"],
    sense: AtMost,
    unit: "V",
    allow: Allow::Percent(90.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.reservoir", slot: "V", series: Series::CapacitorVolts, up: true },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("±20 % 63 V", "±20 % 50 V")],
}

/// One margin for each kind of capacitor, on the supply and on the boards.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let banks = case.banks();
    if banks.iter().all(|b| b.on_board)
        && let Some(supply) = case.fitted(&RULE, out)
    {
        let part = case.supply_part(supply, "reservoir", 1);
        out.compare(
            &RULE,
            part,
            supply.reservoir.site(),
            Err(supply.reservoir.missing()),
        );
    }
    for bank in banks {
        let (part, site) = (bank.part.clone(), bank.stated.site);
        out.compare(&RULE, part, site, stress(case, &bank));
    }
}

fn stress(case: &Case<'_>, bank: &Bank<'_>) -> Result<Stress, Needs> {
    let rail = case.no_load(Mains::High)?;
    let rating = bank.stated.volt;
    Ok(Stress {
        value: rail.0,
        rating: rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            rail_v: Some(rail.0),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            solved(
                "V0",
                "rail, no load, high mains",
                "m·√2·Vs·(1 + ρ)",
                rail.0,
                "V",
                "definition of regulation",
            ),
            stated("UR", "rated voltage", rating.0, "V", [bank.stated.site]),
        ],
        related: case.rail_sites(None),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{edited, margin, tern60, verdict};

    /// V0 = 253/230·√2·28·1.07 = 46.6068 V; 90 % of 51.8 V is 46.62 V, of 51.7 V 46.53 V. By hand.
    #[test]
    fn crest_of_the_unloaded_winding() {
        let m = margin(&tern60(&[]), super::RULE.name, "toroid reservoir");
        assert!((m.stress.unwrap().value - 46.6068).abs() < 1e-3);
        let at = |volts: &str| {
            verdict(
                &tern60(&[("±20 % 63 V", &format!("±20 % {volts} V"))]),
                super::RULE.name,
                "toroid reservoir",
            )
        };
        assert_eq!(at("51.8"), Verdict::Ok);
        assert_eq!(at("51.7"), Verdict::Thin);
        assert_eq!(at("46.7"), Verdict::Thin);
        assert_eq!(at("46.6"), Verdict::Over);
    }

    /// 2 x 35 V, 6 %, +10 %: 35·1.06·1.10·√2 = 57.71 V. Published worked example, recomputed by hand.
    #[test]
    fn a_published_case() {
        let text = tern60(&[
            ("2 x 28 Vac", "2 x 35 Vac"),
            ("7 % of full-load", "6 % of full-load"),
        ]);
        let m = margin(&text, super::RULE.name, "toroid reservoir");
        assert!((m.stress.unwrap().value - 57.71).abs() < 0.005);
        assert_eq!(m.verdict, Verdict::Thin);
        assert_eq!(
            verdict(
                &edited(&text, &[("±20 % 63 V", "±20 % 50 V")]),
                super::RULE.name,
                "toroid reservoir"
            ),
            Verdict::Over
        );
    }

    #[test]
    fn capacitors_on_the_board_are_on_the_rail_too() {
        let text = tern60(&[(
            "board-reservoir    none",
            "board-reservoir    1 x 470 uF ±20 % 40 V per rail",
        )]);
        assert_eq!(
            verdict(&text, super::RULE.name, "tern60 board-reservoir"),
            Verdict::Over
        );
        assert_eq!(
            verdict(&text, super::RULE.name, "toroid reservoir"),
            Verdict::Ok
        );
    }

    #[test]
    fn says_what_is_missing() {
        let text = tern60(&[("    secondary          2 x 28 Vac\n", "")]);
        assert_eq!(
            margin(&text, super::RULE.name, "toroid reservoir").needs,
            ["transformer t300 secondary"]
        );
    }
}
