//! supply.soft-start-timing: how far the rails have come when the soft start is bypassed.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::{Mains, Reservoir};
use crate::analysis::supply::places;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, three};
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A soft start that is bypassed too early gives the second surge it was fitted to avoid. One of
    /// too much resistance never gets there: the idle current of the amplifier holds the rails down
    /// as long as it is in circuit, and the bypass finds them half empty however long it waits.
    "supply.soft-start-timing",
    compares: "rail when the soft start is bypassed with the unsagged rail",
    stress: "rail reached when the soft start is bypassed",
    rating: "limit",
    formula: "rail after the bypass time, greatest or least reservoir, idle current drawn from 10 V up, over Vu; low or high mains, the worst",
    source: "charging of a reservoir through winding and resistor, exact half-cycle by half-cycle",
    reads: ["supply.soft-start", "supply.reservoir", "supply.rectifier", "transformer.secondary", "transformer.rating", "transformer.regulation", "build.mains", "build.supply", "stage.idle"],
    sense: AtLeast,
    unit: "%",
    allow: Allow::Fixed(80.0, 40.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.soft-start", slot: "bypass", series: Series::TwoDigits, up: true },
        Remedy { key: "supply.soft-start", slot: "ohm", series: Series::E12, up: false },
    ],
    example: "tern60", [("bypass 400 ms", "bypass 30 ms")],
}

/// One margin for a soft start that is bypassed.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let field = &supply.soft_start;
    if field.unstated() {
        return out.compare(
            &RULE,
            case.supply_part(supply, "soft-start", 1),
            field.site(),
            Err(field.missing()),
        );
    }
    let Some(soft) = field.get() else { return };
    // an NTC may stay in circuit for good
    if soft.hot.is_some() && soft.bypass.is_none() {
        return;
    }
    // the greatest reservoir fills last, the least falls furthest between two pulses
    for reservoir in [Reservoir::High, Reservoir::Low] {
        for mains in [Mains::High, Mains::Low] {
            out.compare(
                &RULE,
                case.supply_part(supply, "soft-start", 1),
                field.site(),
                stress(case, supply, mains, reservoir),
            );
        }
    }
}

fn stress(
    case: &Case<'_>,
    supply: &Supply,
    mains: Mains,
    reservoir: Reservoir,
) -> Result<Stress, Needs> {
    let field = &supply.soft_start;
    let (soft, unsagged, stated_as) = three(
        case.through_soft_start(mains, reservoir),
        case.unsagged(mains),
        field.need(),
    )?;
    let percent = 100.0 * (soft.reached / unsagged);
    Ok(Stress {
        value: percent,
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(mains),
            tolerance: vec![("reservoir".to_owned(), reservoir.name())],
            rail_v: Some(soft.reached.0),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            stated(
                "R",
                "soft-start resistor",
                stated_as.cold.0,
                "ohm",
                field.stated_at(),
            ),
            stated(
                "t",
                "bypassed after",
                stated_as.bypass.map_or(0.0, |t| t.0),
                "s",
                field.stated_at(),
            ),
            solved(
                "Iq",
                "idle current on each rail, all channels",
                "n·N·Iq",
                case.idle_of_supply()?.0,
                "A",
                "",
            ),
            solved(
                "V",
                "rail then",
                "from event to event",
                soft.reached.0,
                "V",
                "charging through winding and resistor, exact",
            ),
            solved("Vu", "unsagged rail", "V0 - Vd", unsagged.0, "V", ""),
        ],
        related: places([
            ("the reservoir", supply.reservoir.stated_at()),
            ("the idle current", case.output().idle.stated_at()),
        ]),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    fn soft(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("27R 10 W bypass 400 ms", text)]),
            super::RULE.name,
            "toroid soft-start",
        )
    }

    /// A small-step integration written apart from this program reaches 44.18 V of 45.607 V at high
    /// mains and 35.83 V of 37.133 V at low, 96.5 %, after 400 ms; 22.84 V, 61.5 %, after 30 ms.
    #[test]
    fn against_small_steps() {
        let m = soft("27R 10 W bypass 400 ms");
        assert_eq!(m.verdict, Verdict::Ok);
        assert!((m.stress.unwrap().value - 96.5).abs() < 0.3);
        let m = soft("27R 10 W bypass 30 ms");
        assert_eq!(m.verdict, Verdict::Thin);
        assert!(
            (m.stress.unwrap().value - 61.5).abs() < 0.5,
            "{:?}",
            m.stress
        );
    }

    /// 1k seen from a rail is 2·(28·1.07/230)²·1000 = 33.9 ohm; 1 A of idle current would lose 33.9 V in
    /// it if it flowed all the time, and more in pulses: of some 37 V at low mains little is left.
    #[test]
    fn too_much_resistance_never_gets_there() {
        let text = tern60(&[
            ("27R 10 W bypass 400 ms", "1k 10 W bypass 10 s"),
            (
                "50 mA per device, 11 mV across emitter",
                "500 mA per device",
            ),
        ]);
        assert_eq!(
            margin(&text, super::RULE.name, "toroid soft-start").verdict,
            Verdict::Over
        );
    }

    #[test]
    fn says_what_is_missing_and_leaves_a_thermistor_alone() {
        let m = soft("27R 10 W");
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid soft-start bypass".to_owned()]
            )
        );
        let m = margin(
            &tern60(&[(
                "    soft-start         27R 10 W bypass 400 ms thermal-fuse 130 degC\n",
                "",
            )]),
            super::RULE.name,
            "toroid soft-start",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid soft-start".to_owned()]
            )
        );
        let ntc = tern60(&[(
            "27R 10 W bypass 400 ms",
            "ntc 10 ohm hot 0.2 ohm energy 100 J",
        )]);
        assert!(
            report(&ntc).builds[0]
                .margins
                .iter()
                .all(|m| m.rule != super::RULE.name)
        );
    }
}
