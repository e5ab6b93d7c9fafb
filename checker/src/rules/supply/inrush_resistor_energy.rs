//! supply.inrush-resistor-energy: the energy a soft start takes at each switch-on.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::{Mains, Reservoir};
use crate::analysis::supply::places;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{SoftStart, Supply, both, three};
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Whatever its resistance, a soft start takes as much energy as it puts into the reservoirs, in
    /// a fraction of a second and before any of it can leave. A resistor or thermistor too small for
    /// that cracks open, often at the first try, and the amplifier never starts again.
    "supply.inrush-resistor-energy",
    compares: "energy in the soft start at one switch-on, high mains, with what it stands",
    stress: "energy at one switch-on",
    rating: "what the soft start stands",
    formula: "resistor: greater of Σ R·i² until the bypass and of R·I2t of a saturated core; rating stated, else 5·P·5 s; NTC: 2·½CV0²",
    source: "charging through winding and resistor, exact; a limiter of any resistance loses ½CV² (Ametherm); short-time overload of wire-wound resistors, 5 x for 5 s: from memory",
    reads: ["supply.soft-start", "supply.reservoir", "supply.rectifier", "transformer.secondary", "transformer.rating", "transformer.regulation", "build.mains", "stage.idle"],
    sense: AtMost,
    unit: "J",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.soft-start", slot: "W", series: Series::ResistorWatts, up: true },
        Remedy { key: "supply.soft-start", slot: "energy", series: Series::TwoDigits, up: true },
    ],
    example: "tern60", [("27R 10 W bypass", "27R 0.5 W bypass")],
}

/// Short-time overload of a resistor: times its watts, and seconds. From memory.
const OVERLOAD: f64 = 5.0;
const OVERLOAD_S: f64 = 5.0;

/// One margin for the soft start.
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
    let found = if soft.hot.is_some() {
        thermistor(case, supply)
    } else {
        resistor(case, supply, soft)
    };
    out.compare(
        &RULE,
        case.supply_part(supply, "soft-start", 1),
        field.site(),
        found,
    );
}

fn resistor(case: &Case<'_>, supply: &Supply, soft: &SoftStart) -> Result<Stress, Needs> {
    let field = &supply.soft_start;
    let stands = match (soft.energy, soft.watt) {
        (Some(joules), _) => Ok(joules.0),
        (None, Some(watt)) => Ok(OVERLOAD * OVERLOAD_S * watt.0),
        (None, None) => Err(field.missing_part("W")),
    };
    let (stands, start, surge) = three(
        stands,
        case.through_soft_start(Mains::High, Reservoir::High),
        case.mains_surge(supply.transformers.max(1), true),
    )?;
    let core = surge.core.0 * soft.cold.0;
    let joules = start.energy.0.max(core);
    let working = vec![
        stated(
            "R",
            "soft-start resistor",
            soft.cold.0,
            "ohm",
            field.stated_at(),
        ),
        solved(
            "E",
            "until the bypass, empty reservoirs",
            "Σ R·i²",
            start.energy.0,
            "J",
            "charging through winding and resistor, exact",
        ),
        solved(
            "Ecore",
            "half a cycle of a saturated core",
            "R·I2t",
            core,
            "J",
            "half a sine",
        ),
        solved(
            "Emax",
            "what it stands",
            "stated, else 5·P·5 s",
            stands,
            "J",
            "from memory",
        ),
    ];
    Ok(at(case, supply, joules, stands, working))
}

fn thermistor(case: &Case<'_>, supply: &Supply) -> Result<Stress, Needs> {
    let field = &supply.soft_start;
    let (stands, (joules, rail)) = both(field.part("energy", |s| s.energy), case.stored())?;
    let working = vec![
        solved(
            "V0",
            "rail, no load, high mains",
            "m·√2·Vs·(1 + ρ)",
            rail.0,
            "V",
            "definition of regulation",
        ),
        solved(
            "E",
            "both rails, greatest reservoir",
            "2·½CV0²",
            joules,
            "J",
            "a limiter of any resistance loses that",
        ),
        stated("Emax", "what it stands", stands.0, "J", field.stated_at()),
    ];
    Ok(at(case, supply, joules, stands.0, working))
}

fn at(
    case: &Case<'_>,
    supply: &Supply,
    value: f64,
    rating: f64,
    working: Vec<crate::finding::Step>,
) -> Stress {
    Stress {
        value,
        rating,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            tolerance: vec![("reservoir".to_owned(), "high")],
            channels_driven: None,
            ..case.witness()
        },
        working,
        related: places([
            ("the reservoir", supply.reservoir.stated_at()),
            ("the mains", case.region.map(|r| r.site)),
        ]),
        ..Stress::default()
    }
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

    /// A saturated core puts 27·10.6895²/200 = 15.426 J into the resistor: by hand. Empty reservoirs
    /// put 12.9 J by a small-step integration written apart from this program. 10 W stand 250 J.
    #[test]
    fn core_or_reservoirs() {
        let m = soft("27R 10 W bypass 400 ms");
        assert!((m.stress.unwrap().value - 15.426).abs() < 1e-2);
        assert!((m.rating.unwrap().value - 250.0).abs() < 1e-9);
        let empty = m.working.iter().find(|s| s.symbol == "E").unwrap().value;
        assert!((empty / 12.93 - 1.0).abs() < 0.02, "{empty}");
        // 80 % of 25·0.8 W is 16 J, of 25·0.75 W 15 J, and 25·0.6 W is 15 J
        assert_eq!(soft("27R 0.8 W bypass 400 ms").verdict, Verdict::Ok);
        assert_eq!(soft("27R 0.75 W bypass 400 ms").verdict, Verdict::Thin);
        assert_eq!(soft("27R 0.6 W bypass 400 ms").verdict, Verdict::Over);
    }

    /// Two rails of 11.28 mF at 46.6068 V hold 2·½·0.01128·46.6068² = 24.502 J. By hand.
    #[test]
    fn a_thermistor_takes_what_the_reservoirs_hold() {
        let m = soft("ntc 10 ohm hot 0.2 ohm energy 100 J");
        assert!((m.stress.unwrap().value - 24.502).abs() < 1e-2);
        assert_eq!(m.verdict, Verdict::Ok);
        assert_eq!(
            soft("ntc 10 ohm hot 0.2 ohm energy 20 J").verdict,
            Verdict::Over
        );
        let m = soft("ntc 10 ohm hot 0.2 ohm");
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid soft-start energy".to_owned()]
            )
        );
    }
}
