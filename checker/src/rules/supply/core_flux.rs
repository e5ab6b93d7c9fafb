//! supply.core-flux: the flux in the transformer's core at high mains.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::supply::places;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, three};
use crate::finding::{Measure, Witness};
use crate::physics::supply::Transformer;
use crate::physics::unit::{Hertz, Volt};
use crate::rule::Allow;

rule! {
    /// A toroid is wound close to the limit of its core. A tenth more voltage, or a sixth less
    /// frequency, and the core saturates at each crest: it hums, draws current with no load and
    /// runs hot. A transformer made for 60 Hz only does that on any 50 Hz mains.
    "supply.core-flux",
    compares: "peak flux at high mains with the flux the core was wound for",
    stress: "flux at high mains over rated flux",
    rating: "limit",
    formula: "B/Brated = (Vmains,high/Vtap)·(frated/f); frated 50 Hz, or 60 Hz where every tap is from 106 V to 199 V",
    source: "induction law; limits: common practice, no source",
    reads: ["build.mains", "transformer.primary"],
    sense: AtMost,
    unit: "1",
    allow: Allow::Fixed(1.10, 1.12), "common practice, no source",
    remedies: [],
    example: "tern60", [("230 V ±10 % 50 Hz loop 0.3 ohm tap 230 V", "240 V ±10 % 50 Hz loop 0.3 ohm tap 230 V")],
}

/// Used ratios are rounded to this: mains exactly 10 % above the tap must not be over by the last digit.
const GRAIN: f64 = 1e-9;

/// One margin for the transformer, the worst region.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let site = case.region.map_or(case.build.mains.site(), |r| r.site);
    out.compare(
        &RULE,
        case.transformer_part(supply),
        site,
        stress(case, supply),
    );
}

/// The frequency a transformer was wound for. No plate figure is in the language; taps of 110 to 127 V
/// alone are sold where mains are 60 Hz, any other for both.
fn wound_for(primary: &[Volt]) -> Hertz {
    let american = |v: &Volt| (106.0..200.0).contains(&v.0);
    if primary.iter().all(american) {
        Hertz(60.0)
    } else {
        Hertz(50.0)
    }
}

fn stress(case: &Case<'_>, supply: &Supply) -> Result<Stress, Needs> {
    let transformer = &supply.transformer;
    let (region, tap, primary) = three(case.region(), case.tap(), transformer.primary.need())?;
    if tap <= Volt::ZERO || region.frequency <= Hertz::ZERO {
        return Err(Needs::because("tap and frequency must be positive"));
    }
    let rated = wound_for(primary);
    let key = format!("transformer {} rated frequency", transformer.owner.name);
    case.assume(
        key,
        Measure::new(rated.0, "Hz"),
        "60 Hz where every tap is for 110 V to 127 V, else 50 Hz",
        transformer.owner.site,
    );
    let flux = Transformer::core_flux(region.high / tap, rated, region.frequency);
    let flux = (flux / GRAIN).round() * GRAIN;
    Ok(Stress {
        value: flux,
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            stated("Vhigh", "high mains", region.high.0, "V", [region.site]),
            stated(
                "Vtap",
                "primary tap in use",
                tap.0,
                "V",
                transformer.primary.stated_at(),
            ),
            solved(
                "frated",
                "frequency it was wound for",
                "assumed",
                rated.0,
                "Hz",
                "common practice, no source",
            ),
            solved(
                "B",
                "flux over rated flux",
                "(Vhigh/Vtap)·(frated/f)",
                flux,
                "1",
                "induction law",
            ),
        ],
        related: places([("the taps there are", transformer.primary.stated_at())]),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn flux(primary: &str, mains: &str) -> (Verdict, f64) {
        let m = margin(
            &tern60(&[
                ("115 V, 230 V", primary),
                ("230 V ±10 % 50 Hz loop 0.3 ohm tap 230 V", mains),
            ]),
            super::RULE.name,
            "t300",
        );
        (m.verdict, m.stress.unwrap().value)
    }

    /// By hand: 253/230 = 1.1; 127/115·50/60 = 0.9203; a 120 V transformer at 127 V: 1.0583 on 60 Hz and
    /// 1.27 on 50 Hz; 257/230 = 1.1174; 258/230 = 1.1217.
    #[test]
    fn volts_over_hertz() {
        assert_eq!(
            flux("115 V, 230 V", "230 V ±10 % 50 Hz tap 230 V"),
            (Verdict::Ok, 1.1)
        );
        let (verdict, b) = flux("115 V, 230 V", "120 V range 104 V to 127 V 60 Hz tap 115 V");
        assert!(verdict == Verdict::Ok && (b - 0.920_29).abs() < 1e-5);
        let (verdict, b) = flux("120 V", "120 V range 104 V to 127 V 60 Hz");
        assert!(verdict == Verdict::Ok && (b - 1.058_33).abs() < 1e-5);
        assert_eq!(
            flux("120 V", "120 V range 104 V to 127 V 50 Hz").0,
            Verdict::Over
        );
        assert_eq!(
            flux("230 V", "230 V range 207 V to 257 V 50 Hz").0,
            Verdict::Thin
        );
        assert_eq!(
            flux("230 V", "230 V range 207 V to 258 V 50 Hz").0,
            Verdict::Over
        );
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[("loop 0.3 ohm tap 230 V", "loop 0.3 ohm")]),
            super::RULE.name,
            "t300",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["build mono mains tap".to_owned()])
        );
    }
}
