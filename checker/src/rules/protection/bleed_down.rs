//! protection.bleed-down: how long the rails stay dangerous after switching off.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, three};
use crate::finding::{Related, Verdict, Witness};
use crate::physics::supply::Bleeder;
use crate::physics::unit::Volt;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The reservoirs keep their charge after the plug is pulled, and from rail to rail they hold more
    /// than enough to hurt or to weld a screwdriver. A bleeder brings them below 60 V while the lid is
    /// still being unscrewed. Idle current is not counted on: it stops when a fuse has blown, which is
    /// when somebody opens the lid.
    "protection.bleed-down",
    compares: "time for the volts between the rails to fall to 60 V after switching off, high mains",
    stress: "time to 60 V",
    rating: "",
    formula: "t = τ·ln(2·V0/60), τ = R·C per rail, R·C/2 from rail to rail",
    source: "discharge of a capacitor; 60 V is ES1 of IEC 62368-1; the minutes are common practice, no source",
    reads: ["supply.bleeder", "supply.reservoir", "supply.terminals", "amplifier.board-reservoir", "build.supply", "build.mains", "transformer.secondary", "transformer.regulation"],
    sense: AtMost,
    unit: "s",
    allow: Allow::Fixed(60.0, 300.0), "common practice, no source",
    remedies: [Remedy { key: "supply.bleeder", slot: "ohm", series: Series::E12, up: false }],
    example: "tern60", [("bleeder            3k3 ±5 % 3 W per rail", "bleeder            22k ±5 % 1 W per rail")],
}

/// Between the rails this is no hazard: ES1 of IEC 62368-1.
const SAFE: Volt = Volt(60.0);
/// What touchable terminals may take, s: IEC 62368-1 5.5.2.2.
const TOUCHABLE: f64 = 2.0;

/// One margin for the bleeder.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some((supply, _)) = case.build.supply.get() else {
        return;
    };
    let (part, site) = (line_part(&supply.bleeder), supply.bleeder.site());
    if supply.bleeder.none {
        let note = "no bleeder: nothing that can be counted on empties the reservoirs".to_owned();
        return out.judge(
            &RULE,
            part,
            site,
            Verdict::Unchecked,
            Stress {
                note,
                ..Stress::default()
            },
        );
    }
    match stress(case, supply) {
        Ok(mut stress) if supply.touchable && stress.value > TOUCHABLE => {
            stress.note = format!(
                "terminals that can be touched must be below 60 V in 2 s, this takes {:.1} s",
                stress.value
            );
            out.judge(&RULE, part, site, Verdict::Over, stress);
        }
        found => out.compare(&RULE, part, site, found),
    }
}

fn stress(case: &Case<'_>, supply: &Supply) -> Result<Stress, Needs> {
    let ((resistor, across), rail, made) = three(
        supply.bleeder.need().copied(),
        case.no_load(Mains::High),
        case.made(),
    )?;
    // the slowest: greatest resistor and capacitors
    let (ohm, farad) = (resistor.ohm.high, made.reservoir[2]);
    let bleeder = if across {
        Bleeder::RailToRail(ohm)
    } else {
        Bleeder::PerRail(ohm)
    };
    let start = rail * 2.0;
    let time = bleeder.discharge_time(farad, start, SAFE).ok_or_else(|| {
        Needs::because(format!(
            "bleeder and reservoir of supply {} give no time",
            supply.owner.name
        ))
    })?;
    let mut related = case.rail_sites(None);
    related.push(Related {
        message: "what it empties".to_owned(),
        site: supply.reservoir.site(),
    });
    Ok(Stress {
        value: time.0,
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            rail_v: Some(rail.0),
            tolerance: vec![
                (format!("{} bleeder", supply.owner.name), "high"),
                (format!("{} reservoir", supply.owner.name), "high"),
            ],
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            solved(
                "2·V0",
                "between the rails, high mains",
                "2·m·√2·Vs·(1 + ρ)",
                start.0,
                "V",
                "definition of regulation",
            ),
            stated(
                "R",
                "bleeder, highest",
                ohm.0,
                "ohm",
                supply.bleeder.stated_at(),
            ),
            stated(
                "C",
                "reservoir of one rail, greatest",
                farad.0,
                "F",
                supply.reservoir.stated_at(),
            ),
            solved(
                "t",
                "to 60 V",
                "τ·ln(2·V0/60)",
                time.0,
                "s",
                "discharge of a capacitor",
            ),
        ],
        related,
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    const LINE: &str = "bleeder            3k3 ±5 % 3 W per rail";

    fn bleeder(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[(LINE, text)]),
            "protection.bleed-down",
            "toroid bleeder",
        )
    }

    #[test]
    fn greatest_resistor_and_capacitors_decide() {
        // 3k3·1.05 = 3465 ohm; 2·4700 uF·1.2 = 11.28 mF: τ = 39.0852 s; ln(93.21363/60) = 0.440557: 17.219 s
        let m = bleeder(LINE);
        assert!(
            (m.stress.unwrap().value - 17.219).abs() < 2e-3,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Verdict::Ok);
        // rail to rail the two reservoirs are in series: half the time constant
        let across = bleeder("bleeder            3k3 ±5 % 3 W per supply")
            .stress
            .unwrap()
            .value;
        assert!((across - 17.219 / 2.0).abs() < 1e-3);
    }

    #[test]
    fn minutes_are_thin_and_five_of_them_over() {
        // 5.21790 s for each kilohm of nominal resistance: 12k 62.6 s, 56k 292 s, 68k 355 s
        assert_eq!(
            bleeder("bleeder 12k ±5 % 3 W per rail").verdict,
            Verdict::Thin
        );
        assert_eq!(
            bleeder("bleeder 56k ±5 % 3 W per rail").verdict,
            Verdict::Thin
        );
        assert_eq!(
            bleeder("bleeder 68k ±5 % 3 W per rail").verdict,
            Verdict::Over
        );
    }

    #[test]
    fn terminals_that_can_be_touched_have_two_seconds() {
        assert_eq!(
            bleeder("bleeder            3k3 ±5 % 3 W per rail\n    terminals          touchable")
                .verdict,
            Verdict::Over
        );
        assert_eq!(
            bleeder("bleeder            330R ±5 % 20 W per rail\n    terminals          touchable")
                .verdict,
            Verdict::Ok
        );
    }

    #[test]
    fn no_bleeder_is_information_and_an_unstated_one_is_named() {
        let m = bleeder("bleeder            none");
        assert_eq!((m.verdict, m.needs.len()), (Verdict::Unchecked, 0));
        let m = margin(
            &tern60(&[("    bleeder            3k3 ±5 % 3 W per rail\n", "")]),
            "protection.bleed-down",
            "toroid bleeder",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["supply toroid bleeder".to_owned()])
        );
    }
}
