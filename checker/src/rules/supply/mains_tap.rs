//! supply.mains-tap: the primary tap in use against the mains of the region.

use crate::analysis::case::{solved, stated};
use crate::analysis::supply::places;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, three};
use crate::finding::{Verdict, Witness};
use crate::physics::unit::Volt;
use crate::rule::Allow;

rule! {
    /// A primary strapped for 115 V and plugged into 230 V doubles every voltage in the amplifier in
    /// the first second: reservoirs vent, devices break down, the transformer burns. Strapped the
    /// other way nothing breaks, and nothing has its power. It is the mistake that nobody checks
    /// because the paperwork never meets the outlet.
    "supply.mains-tap",
    compares: "nominal mains of the region with the primary tap in use",
    stress: "nominal mains away from the tap",
    rating: "limit",
    formula: "|Vnominal/Vtap - 1|",
    source: "common practice, no source",
    reads: ["build.mains", "transformer.primary"],
    sense: AtMost,
    unit: "%",
    allow: Allow::Fixed(10.0, 20.0), "common practice, no source",
    remedies: [],
    example: "tern60", [("tap 230 V\n    loads", "tap 115 V\n    loads")],
}

/// Two voltages nearer than this are one tap.
const SAME: Volt = Volt(0.5);

/// One margin for the transformer, the worst region.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let part = case.transformer_part(supply);
    let site = case.region.map_or(case.build.mains.site(), |r| r.site);
    match stress(case, supply) {
        Ok((true, stress)) => out.judge(&RULE, part, site, Verdict::Over, stress),
        Ok((false, stress)) => out.compare(&RULE, part, site, Ok(stress)),
        Err(needs) => out.compare(&RULE, part, site, Err(needs)),
    }
}

/// The stress, and whether the tap is none of the transformer's.
fn stress(case: &Case<'_>, supply: &Supply) -> Result<(bool, Stress), Needs> {
    let transformer = &supply.transformer;
    let (region, tap, primary) = three(case.region(), case.tap(), transformer.primary.need())?;
    if tap <= Volt::ZERO {
        return Err(Needs::because("the tap must be positive"));
    }
    let percent = 100.0 * (region.nominal / tap - 1.0).abs();
    let foreign = !primary.iter().any(|p| (*p - tap).abs() < SAME);
    let taps: Vec<String> = primary.iter().map(|p| format!("{:.0} V", p.0)).collect();
    let away = |p: &Volt| (region.nominal - *p).abs();
    let better = primary
        .iter()
        .filter(|p| away(p) + SAME < away(&tap))
        .min_by(|a, b| away(a).0.total_cmp(&away(b).0));
    let note = match better {
        _ if foreign => format!(
            "the primary has no tap for {:.0} V; it has {}",
            tap.0,
            taps.join(", ")
        ),
        Some(p) => format!("the tap for {:.0} V is nearer", p.0),
        None => String::new(),
    };
    let stress = Stress {
        value: percent,
        rating: f64::NAN,
        witness: Witness {
            mains_v: Some(region.nominal.0),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            stated("Vn", "nominal mains", region.nominal.0, "V", [region.site]),
            stated(
                "Vtap",
                "primary tap in use",
                tap.0,
                "V",
                transformer.primary.stated_at(),
            ),
            solved(
                "d",
                "mains away from the tap",
                "|Vn/Vtap - 1|",
                percent,
                "%",
                "",
            ),
        ],
        related: places([("the taps there are", transformer.primary.stated_at())]),
        note,
        ..Stress::default()
    };
    Ok((foreign, stress))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn tap(primary: &str, mains: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[
                ("115 V, 230 V", primary),
                ("230 V ±10 % 50 Hz loop 0.3 ohm tap 230 V", mains),
            ]),
            super::RULE.name,
            "t300",
        )
    }

    /// 230 V on 230 V is 0 %; 127 V on 115 V 10.4 %; 230 V on 115 V 100 %. By hand.
    #[test]
    fn mains_against_the_tap() {
        assert_eq!(
            tap("115 V, 230 V", "230 V ±10 % 50 Hz tap 230 V").verdict,
            Verdict::Ok
        );
        assert_eq!(
            tap("115 V, 230 V", "127 V ±5 % 60 Hz tap 115 V").verdict,
            Verdict::Thin
        );
        let m = tap("115 V, 230 V", "230 V ±10 % 50 Hz tap 115 V");
        assert_eq!(m.verdict, Verdict::Over);
        assert!((m.stress.unwrap().value - 100.0).abs() < 1e-9);
        assert_eq!(m.note, "the tap for 230 V is nearer");
    }

    #[test]
    fn a_tap_that_the_primary_has_not() {
        let m = tap("115 V, 230 V", "240 V ±6 % 50 Hz tap 240 V");
        assert_eq!(
            (m.verdict, m.note.as_str()),
            (
                Verdict::Over,
                "the primary has no tap for 240 V; it has 115 V, 230 V"
            )
        );
    }

    #[test]
    fn one_primary_needs_no_tap_and_several_do() {
        assert_eq!(tap("230 V", "230 V ±10 % 50 Hz").verdict, Verdict::Ok);
        let m = tap("115 V, 230 V", "230 V ±10 % 50 Hz");
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["build mono mains tap".to_owned()])
        );
    }
}
