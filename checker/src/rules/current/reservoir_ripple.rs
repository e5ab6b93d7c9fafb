//! current.reservoir-ripple: the ripple current of each reservoir capacitor.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::supply::Bank;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::both;
use crate::physics::supply::{RippleMultipliers, reservoir_ripple};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A reservoir takes its charge in short pulses and gives it out as half-waves of the signal; all
    /// of that current warms it from inside. Above its ripple rating the electrolyte dries out in
    /// months instead of decades. Small capacitors with low series resistance beside big ones
    /// take more than their part.
    "current.reservoir-ripple",
    compares: "ripple current of a reservoir capacitor at the duty, all channels, with its rating",
    stress: "ripple current at the duty",
    rating: "capacitor's rated ripple current",
    formula: "I = share·√(Ich² + Iaf²), Ich = √(Irms² - Idc²) of the charging current, Iaf = 0.3856·ΣÎ (bridged 0.3078·ΣÎ); shares by 1/ESR, else by C",
    source: "charge balance; mean and r.m.s. of half-sines",
    reads: ["supply.reservoir", "amplifier.board-reservoir", "transformer.secondary", "transformer.rating", "transformer.regulation", "build.supply", "build.duty", "build.loads", "build.mains", "stage.idle"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(90.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.reservoir", slot: "x", series: Series::Count, up: true },
        Remedy { key: "supply.reservoir", slot: "ripple", series: Series::TwoDigits, up: true },
    ],
    example: "tern60", [("ripple 4 A", "ripple 0.4 A")],
}

/// No sheet's multipliers are stated: the rating holds at every frequency.
const NO_MULTIPLIERS: RippleMultipliers = RippleMultipliers {
    charging: 1.0,
    audio: 1.0,
};

/// One margin for each kind of capacitor: the load that draws most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let banks = case.banks();
    if banks.iter().all(|b| b.on_board)
        && let Some(supply) = case.fitted(&RULE, out)
    {
        out.compare(
            &RULE,
            case.supply_part(supply, "reservoir", 1),
            supply.reservoir.site(),
            Err(supply.reservoir.missing()),
        );
    }
    for (at, bank) in banks.iter().enumerate() {
        for found in case.per_load(|load| stress(case, &banks, at, load)) {
            out.compare(&RULE, bank.part.clone(), bank.stated.site, found);
        }
    }
}

fn stress(case: &Case<'_>, banks: &[Bank<'_>], at: usize, load: &Driven) -> Result<Stress, Needs> {
    let (flow, shares) = both(case.duty_flow(load), case.ripple_shares(banks))?;
    let lost = || Needs::because("the reservoir cannot be worked out");
    let (bank, share) = banks.get(at).zip(shares.get(at)).ok_or_else(lost)?;
    let rating = bank
        .stated
        .ripple
        .ok_or_else(|| field_missing(case, bank))?;
    let all = reservoir_ripple(flow.ripple_charging, flow.ripple_audio, NO_MULTIPLIERS)
        .ok_or_else(lost)?;
    let one = all * *share;
    let mut working = case.rail_steps(&flow, "√(2·d·Pref·R)");
    working.push(solved(
        "Irms",
        "charging current of one rail",
        "periodic solution of the rectifier",
        flow.charging.0,
        "A",
        "",
    ));
    working.push(solved(
        "Ich",
        "ripple from charging, all capacitors of one rail",
        "√(Irms² - Idc²)",
        flow.ripple_charging.0,
        "A",
        "charge balance",
    ));
    working.push(solved(
        "Iaf",
        "ripple from the signal",
        "0.3856·ΣÎ, bridged 0.3078·ΣÎ",
        flow.ripple_audio.0,
        "A",
        "mean and r.m.s. of half-sines",
    ));
    working.push(solved(
        "I",
        "one capacitor",
        "share·√(Ich² + Iaf²)",
        one.0,
        "A",
        "currents of different frequency add by squares",
    ));
    working.push(stated(
        "IR",
        "rated ripple current",
        rating.0,
        "A",
        [bank.stated.site],
    ));
    Ok(Stress {
        value: one.0,
        rating: rating.0,
        witness: case.at_flow(load, &flow, Some(&case.duty().shown)),
        working,
        related: case.loading_sites(load),
        ..Stress::default()
    })
}

/// That a kind of capacitor states no ripple rating.
fn field_missing(case: &Case<'_>, bank: &Bank<'_>) -> Needs {
    match (bank.on_board, case.build.supply.get()) {
        (false, Some((supply, _))) => supply.reservoir.missing_part("ripple"),
        _ => case.build.amplifier.board_reservoir.missing_part("ripple"),
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60, verdict};

    /// At Idc = 0.63745 A a small-step integration written apart from this program has an r.m.s. of
    /// 1.5794 A (C low) to 1.5802 A (C high): Ich = 1.4459 A. Iaf = 0.38556·1.6885 = 0.6510 A. Two
    /// capacitors share √(1.4459² + 0.6510²) = 1.5857 A: 0.7928 A each.
    #[test]
    fn against_small_steps() {
        let m = margin(&tern60(&[]), super::RULE.name, "toroid reservoir");
        assert!((m.stress.unwrap().value / 0.7928 - 1.0).abs() < 2e-3);
        // 90 % of 0.9 A is 0.81 A, of 0.87 A 0.783 A
        let at = |amps: &str| {
            verdict(
                &tern60(&[("ripple 4 A", &format!("ripple {amps} A"))]),
                super::RULE.name,
                "toroid reservoir",
            )
        };
        assert_eq!(at("0.9"), Verdict::Ok);
        assert_eq!(at("0.87"), Verdict::Thin);
        assert_eq!(at("0.78"), Verdict::Over);
    }

    /// A small capacitor of half the series resistance takes twice the current: of 2/35 + 1/17.5 =
    /// 4/35 it has half, each of the big ones a quarter. By hand.
    #[test]
    fn low_resistance_takes_more() {
        let text = tern60(&[(
            "board-reservoir    none",
            "board-reservoir    1 x 470 uF ±20 % 63 V esr 17.5 mohm ripple 0.5 A per rail",
        )]);
        let (board, big) = (
            margin(&text, super::RULE.name, "tern60 board-reservoir"),
            margin(&text, super::RULE.name, "toroid reservoir"),
        );
        assert!((board.stress.unwrap().value / big.stress.unwrap().value - 2.0).abs() < 1e-9);
        assert_eq!(board.verdict, Verdict::Over);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[(" ripple 4 A", "")]),
            super::RULE.name,
            "toroid reservoir",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid reservoir ripple".to_owned()]
            )
        );
    }
}
