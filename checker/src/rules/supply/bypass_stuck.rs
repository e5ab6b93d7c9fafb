//! supply.bypass-stuck: a soft start whose bypass never closes.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{SoftStart, Supply, three};
use crate::finding::{Verdict, Witness};
use crate::physics::wear::resistor_rating;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The relay that bypasses a soft start fails some day, and nobody notices: the amplifier plays
    /// on, a little weaker, with all of its current through a resistor meant for half a second. It
    /// glows on the board. A resistor that stands it, or a thermal fuse against it, makes that a
    /// repair instead of a fire.
    "supply.bypass-stuck",
    compares: "watts in the soft-start resistor with the bypass stuck open, at the duty, with its rating",
    stress: "watts with the bypass stuck open, at the duty",
    rating: "resistor's rating in the air inside",
    formula: "P = R·Imains², Imains from the rectifier behind the resistor at Idc of the duty; rating falls from 70 degC to nothing at 155 degC",
    source: "periodic solution of the rectifier; derating of film and wire-wound resistors as makers print it",
    reads: ["supply.soft-start", "supply.reservoir", "supply.rectifier", "transformer.secondary", "transformer.rating", "build.supply", "build.duty", "build.loads", "build.mains", "build.ambient", "build.enclosure", "stage.idle"],
    sense: AtMost,
    unit: "W",
    allow: Allow::Percent(100.0), "a fault: the rating itself",
    remedies: [
        Remedy { key: "supply.soft-start", slot: "W", series: Series::ResistorWatts, up: true },
    ],
    example: "tern60", [("27R 10 W bypass 400 ms thermal-fuse 130 degC", "27R 1 W bypass 400 ms")],
}

/// One margin for a bypassed resistor: the load that draws most.
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
    let Some(soft) = field.get().filter(|s| s.hot.is_none()) else {
        return;
    };
    let (part, site) = (case.supply_part(supply, "soft-start", 1), field.site());
    if let Some(opens) = soft.thermal_fuse {
        let note = format!("the thermal fuse opens at {:.0} degC", opens.0);
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
    for found in case.per_load(|load| stress(case, supply, soft, load)) {
        out.compare(&RULE, part.clone(), site, found);
    }
}

fn stress(
    case: &Case<'_>,
    supply: &Supply,
    soft: &SoftStart,
    load: &Driven,
) -> Result<Stress, Needs> {
    let field = &supply.soft_start;
    let (rated, duty, air) = three(
        field.part("W", |s| s.watt),
        case.duty_signal(load),
        case.air_inside(),
    )?;
    let (watts, current) = case.stuck_watts(soft.cold, duty.rail_current)?;
    let rating = resistor_rating(rated, air);
    Ok(Stress {
        value: watts,
        rating: rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            load: Some(load.name.clone()),
            duty: Some(case.duty().shown.clone()),
            ambient_c: Some(air.0),
            ..case.witness()
        },
        working: vec![
            stated(
                "R",
                "soft-start resistor",
                soft.cold.0,
                "ohm",
                field.stated_at(),
            ),
            solved(
                "Idc",
                "mean current on each rail",
                "n·(Î/π + N·Iq), or all that the rail gives",
                current.0,
                "A",
                "mean of a half-sine",
            ),
            solved(
                "P",
                "in the resistor",
                "R·Imains²",
                watts,
                "W",
                "periodic solution of the rectifier",
            ),
            solved(
                "Pmax",
                "rating in the air inside",
                "P70, less above 70 degC",
                rating.0,
                "W",
                "makers' derating curve",
            ),
        ],
        related: case.loading_sites(load),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn soft(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("27R 10 W bypass 400 ms thermal-fuse 130 degC", text)]),
            super::RULE.name,
            "toroid soft-start",
        )
    }

    /// At the 0.63745 A of the duty a small-step integration written apart from this program has
    /// 1.3165 A in each winding behind 27 ohm, high mains: 3.176 W.
    #[test]
    fn against_small_steps() {
        let m = soft("27R 10 W bypass 400 ms");
        assert_eq!(m.verdict, Verdict::Ok);
        assert!((m.stress.unwrap().value / 3.176 - 1.0).abs() < 5e-3);
        assert_eq!(soft("27R 3 W bypass 400 ms").verdict, Verdict::Over);
    }

    #[test]
    fn a_thermal_fuse_ends_it() {
        let m = soft("27R 1 W bypass 400 ms thermal-fuse 130 degC");
        assert_eq!(
            (m.verdict, m.note.as_str()),
            (Verdict::Ok, "the thermal fuse opens at 130 degC")
        );
    }

    /// So much resistance that the rail gives out before the duty is reached still has an answer.
    #[test]
    fn a_rail_that_gives_out() {
        assert_eq!(soft("1k 5 W bypass 400 ms").verdict, Verdict::Over);
    }

    #[test]
    fn says_what_is_missing() {
        let m = soft("27R bypass 400 ms");
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid soft-start W".to_owned()]
            )
        );
    }
}
