//! thermal.reservoir-life: hours until the reservoir capacitors have dried out.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::wear::Life;
use crate::analysis::{Case, Margins, Stress};
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Electrolytics dry out: every 10 K at the core halves their hours. They stand in the same warm box as
    /// the heatsink, and their own ripple current warms them from inside. Hum and failing bass come
    /// first, a vented can later. Ten thousand hours are some seven years of four hours a day.
    "thermal.reservoir-life",
    compares: "life of the reservoir capacitors, continuous at the duty, hottest room, with the hours wanted",
    stress: "expected life in hours",
    rating: "least life",
    formula: "L = L0·2^((T0 - Tcore)/10), Tcore = Ta + Tencl + ΔT·(I/Irated)²",
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

/// One margin for the reservoir: its shortest-lived capacitor under the worst load. Given rails come
/// from a supply that is not described, and have none.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let field = &case.build.supply;
    let Some((supply, _)) = field.get() else {
        if case.build.rails.get().is_none() {
            out.compare(&RULE, line_part(field), field.site(), Err(field.missing()));
        }
        return;
    };
    let (part, site) = (|| line_part(&supply.reservoir), supply.reservoir.site());
    for played in case.played() {
        match played.and_then(|(load, heat)| Ok((load, heat, case.reservoir_lives(heat)?))) {
            Err(needs) => out.compare(&RULE, part(), site, Err(needs)),
            Ok((load, heat, lives)) => {
                for life in &lives {
                    out.compare(&RULE, part(), site, Ok(stress(case, load, heat, life)));
                }
            }
        }
    }
}

fn stress(case: &Case<'_>, load: &Driven, heat: &Heat, life: &Life) -> Stress {
    let lines = case.supply().ok().and_then(|s| s.reservoir.stated_at());
    Stress {
        value: life.hours,
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(heat.duty.amplitude.0),
            duty: Some(case.duty().shown.clone()),
            ambient_c: case.hottest().ok().map(|t| t.0),
            rail_v: Some(heat.rail.0),
            ..case.witness()
        },
        working: vec![
            stated("L0", "hours as stated", life.stated_hours, "h", lines),
            stated("T0", "at", life.stated_at.0, "degC", lines),
            solved("T", "air round them, hottest room", "Ta + Tencl", life.air.0, "degC", ""),
            solved("I", "ripple current of one at the duty, charging and signal", "√(Ich² + Iaf²), shared by 1/ESR", life.ripple.0, "A", "rectifier steady state; r.m.s. of a half-sine"),
            solved("Tcore", "its core", "T + ΔT·(I/Irated)²", life.core.0, "degC", "10 K rule holds for the core"),
            solved("L", "hours expected", "L0·2^((T0 - Tcore)/10)", life.hours, "h", "10 K rule"),
        ],
        related: vec![Related { message: "into this load".to_owned(), site: load.site }],
        ..Stress::default()
    }
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
        let m = margin(&tern60(&[("ripple 4 A", "ripple 90 A")]), RULE.name, "toroid reservoir");
        assert!((m.stress.unwrap().value / 320_000.0 - 1.0).abs() < 1e-3, "{:?}", m.stress);
        assert_eq!(m.verdict, Ok);
    }

    /// At 85 degC inside and 85 degC stated there is nothing to gain: the stated hours, less the ripple's.
    #[test]
    fn verdicts_by_the_hours() {
        let at = |hours: &str| {
            verdict(&tern60(&[("ripple 4 A", "ripple 90 A"), ("life 5000 h life-at 105 degC", &format!("life {hours} life-at 85 degC")), ("enclosure          5 K", "enclosure          45 K")]), RULE.name, "toroid reservoir")
        };
        assert_eq!(at("10100 h"), Ok);
        assert_eq!(at("9900 h"), Thin);
        assert_eq!(at("1900 h"), Over);
    }

    #[test]
    fn unstated_hours_and_ripple_are_named() {
        let m = margin(&tern60(&[(" ripple 4 A life 5000 h life-at 105 degC", "")]), RULE.name, "toroid reservoir");
        assert_eq!(m.verdict, Unchecked);
        assert_eq!(m.needs, ["supply toroid reservoir life", "supply toroid reservoir ripple"]);
    }
}
