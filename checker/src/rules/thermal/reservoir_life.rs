//! thermal.reservoir-life: hours until the reservoir capacitors have dried out.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::supply::Bank;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Electrolytics dry out: every 10 K at the core halves their hours. They stand in the same warm box as
    /// the heatsink, and their own ripple current warms them from inside. Hum and failing bass come
    /// first, a vented can later. Ten thousand hours are some seven years of four hours a day.
    "thermal.reservoir-life",
    compares: "life of the reservoir capacitors, continuous at the duty, hottest room, with the hours wanted",
    stress: "expected life in hours",
    rating: "least life",
    formula: "L = L0·2^((T0 - max(Tcore, 40 degC))/10), Tcore = Ta + Tencl + ΔT·(I/Irated)²",
    source: "10 K rule (Cosel FAQ a0057, read; Cornell Dubilier application guide, from memory); hours common practice, no source",
    reads: ["supply.reservoir", "amplifier.board-reservoir", "build.supply", "build.ambient", "build.enclosure", "build.duty", "build.loads", "stage.idle"],
    sense: AtLeast,
    unit: "h",
    allow: Allow::Fixed(10_000.0, 2_000.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.reservoir", slot: "ripple", series: Series::TwoDigits, up: true },
        Remedy { key: "supply.reservoir", slot: "life", series: Series::TwoDigits, up: true },
    ],
    example: "tern60", [("life 5000 h life-at 105 degC", "life 1000 h life-at 85 degC"), ("enclosure          5 K", "enclosure          25 K")],
}

/// One margin for each kind of capacitor: the load that warms it most.
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
    let shares = case.ripple_shares(&banks);
    for (at, bank) in banks.iter().enumerate() {
        let share = shares
            .as_ref()
            .map_err(Clone::clone)
            .map(|all| all.get(at).copied().unwrap_or(1.0));
        for found in case.per_load(|load| stress(case, load, bank, share.clone()?)) {
            out.compare(&RULE, bank.part.clone(), bank.stated.site, found);
        }
    }
}

fn stress(case: &Case<'_>, load: &Driven, bank: &Bank<'_>, share: f64) -> Result<Stress, Needs> {
    let life = case.reservoir_life(load, bank, share)?;
    let flow = case.duty_flow(load)?;
    let line = [bank.stated.site];
    Ok(Stress {
        value: life.hours,
        rating: f64::NAN,
        witness: Witness {
            ambient_c: case.hottest().ok().map(|t| t.0),
            ..case.at_flow(load, &flow, Some(&case.duty().shown))
        },
        working: vec![
            stated("L0", "hours as stated", life.stated_hours, "h", line),
            stated("T0", "at", life.stated_at.0, "degC", line),
            solved(
                "T",
                "air round them, hottest room",
                "Ta + Tencl",
                life.air.0,
                "degC",
                "",
            ),
            solved(
                "I",
                "ripple current of one at the duty, charging and signal",
                "share·√(Ich² + Iaf²)",
                life.ripple.0,
                "A",
                "charge balance; r.m.s. of half-sines",
            ),
            solved(
                "Tcore",
                "its core",
                "T + ΔT·(I/Irated)²",
                life.core.0,
                "degC",
                "10 K rule holds for the core",
            ),
            solved(
                "L",
                "hours expected",
                "L0·2^((T0 - max(Tcore, 40))/10)",
                life.hours,
                "h",
                "10 K rule",
            ),
        ],
        related: case.loading_sites(load),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Thin, Unchecked};
    use crate::testing::{margin, tern60, verdict};

    /// Ripple made harmless by a rating of 90 A: core = air = 45 degC. 5000 h at 105 degC is six doublings away:
    /// 320 000 h, less what (ripple/90)² of 5 K takes, below 0.1 %.
    #[test]
    fn six_doublings() {
        let m = margin(
            &tern60(&[("ripple 4 A", "ripple 90 A")]),
            RULE.name,
            "toroid reservoir",
        );
        assert!(
            (m.stress.unwrap().value / 320_000.0 - 1.0).abs() < 1e-3,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Ok);
    }

    /// At 85 degC inside and 85 degC stated there is nothing to gain: the stated hours, less the ripple's.
    #[test]
    fn verdicts_by_the_hours() {
        let at = |hours: &str| {
            verdict(
                &tern60(&[
                    ("ripple 4 A", "ripple 90 A"),
                    (
                        "life 5000 h life-at 105 degC",
                        &format!("life {hours} life-at 85 degC"),
                    ),
                    ("enclosure          5 K", "enclosure          45 K"),
                ]),
                RULE.name,
                "toroid reservoir",
            )
        };
        assert_eq!(at("10100 h"), Ok);
        assert_eq!(at("9900 h"), Thin);
        assert_eq!(at("1900 h"), Over);
    }

    #[test]
    fn unstated_hours_and_ripple_are_named() {
        let m = margin(
            &tern60(&[(" ripple 4 A life 5000 h life-at 105 degC", "")]),
            RULE.name,
            "toroid reservoir",
        );
        assert_eq!(m.verdict, Unchecked);
        assert_eq!(
            m.needs,
            [
                "supply toroid reservoir life",
                "supply toroid reservoir ripple"
            ]
        );
    }
}
