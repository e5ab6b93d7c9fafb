//! current.rectifier-mean: the mean current of the rectifier diodes.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, three};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A bridge is rated for the current it gives, bolted to metal and into a resistor. Into a
    /// reservoir it comes in short high pulses that heat it more, and makers ask for a fifth less.
    /// A bridge that runs too hot fails as a short circuit across the transformer.
    "current.rectifier-mean",
    compares: "mean current of one diode at the duty, all channels, with its share of the bridge's rating",
    stress: "mean current of one diode at the duty",
    rating: "half of the bridge's output current x 0.8 for a capacitor load",
    formula: "ID = Idc/2, Idc = n·(Î/π + N·Iq); rating 0.8·IO/2, IO the output current of one bridge",
    source: "two diodes take turns on each rail; the 20 % printed on bridge data sheets for capacitive loads",
    reads: ["supply.rectifier", "supply.reservoir", "transformer.secondary", "transformer.rating", "build.supply", "build.duty", "build.loads", "build.mains", "stage.idle", "amplifier.drop"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.rectifier", slot: "A", series: Series::TwoDigits, up: true },
    ],
    example: "tern60", [("bridge 400 V 25 A", "bridge 400 V 0.6 A")],
}

/// What a capacitor load leaves of the rating.
const CAPACITOR_LOAD: f64 = 0.8;

/// One margin for the rectifier: the load that draws most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let each = supply.rectifier.get().map_or(1, |r| r.bridges);
    for found in case.per_load(|load| stress(case, supply, load)) {
        out.compare(
            &RULE,
            case.supply_part(supply, "rectifier", each),
            supply.rectifier.site(),
            found,
        );
    }
}

fn stress(case: &Case<'_>, supply: &Supply, load: &Driven) -> Result<Stress, Needs> {
    let field = &supply.rectifier;
    let (bridge, flow, bridges) = three(
        field.part("A", |r| r.mean),
        case.duty_flow(load),
        field.need().map(|r| r.bridges),
    )?;
    // more bridges than two stand side by side
    let side_by_side = f64::from((bridges / 2).max(1));
    let diode = flow.rail / 2.0 / side_by_side;
    let rating = bridge * CAPACITOR_LOAD / 2.0;
    let mut working = case.rail_steps(&flow, "√(2·d·Pref·R)");
    working.push(solved(
        "ID",
        "mean of one diode",
        "Idc/2",
        diode.0,
        "A",
        "two diodes take turns on each rail",
    ));
    working.push(stated(
        "IO",
        "output current of the bridge",
        bridge.0,
        "A",
        field.stated_at(),
    ));
    working.push(solved(
        "IF",
        "its share for one diode, capacitor load",
        "0.8·IO/2",
        rating.0,
        "A",
        "printed on bridge data sheets",
    ));
    Ok(Stress {
        value: diode.0,
        rating: rating.0,
        witness: case.at_flow(load, &flow, Some(&case.duty().shown)),
        working,
        related: case.loading_sites(load),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60, verdict};

    /// V(burst) = (41.370 - 1.8)/(1 + 2/7/8) = 38.205 V, 91.228 W; an eighth of it 13.508 V, 1.6885 A;
    /// Idc = 1.6885/π + 0.1 = 0.63745 A; one diode 0.31873 A. Rating 0.8·25/2 = 10 A. By hand.
    #[test]
    fn half_of_each_rail() {
        let m = margin(&tern60(&[]), super::RULE.name, "toroid rectifier");
        assert!((m.stress.unwrap().value - 0.318_73).abs() < 1e-4);
        assert!((m.rating.unwrap().value - 10.0).abs() < 1e-9);
        // 80 % of 0.4 A/A: 0.31873 A is inside at 1 A, outside at 0.99 A, past the rating at 0.79 A
        let at = |amps: &str| {
            verdict(
                &tern60(&[("400 V 25 A", &format!("400 V {amps} A"))]),
                super::RULE.name,
                "toroid rectifier",
            )
        };
        assert_eq!(at("1"), Verdict::Ok);
        assert_eq!(at("0.99"), Verdict::Thin);
        assert_eq!(at("0.79"), Verdict::Over);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[("400 V 25 A", "400 V")]),
            super::RULE.name,
            "toroid rectifier",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid rectifier A".to_owned()]
            )
        );
    }
}
