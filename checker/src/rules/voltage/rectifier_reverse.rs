//! voltage.rectifier-reverse: the rectifier diodes against their reverse voltage.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, three};
use crate::finding::Witness;
use crate::physics::supply::Rectifier;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// In one bridge on a centre-tapped winding a diode that blocks has BOTH rails across it, not
    /// one. Mains spikes come on top, which is why little of the rating may be used. A diode that
    /// fails shorts the winding, and the transformer burns until a fuse opens.
    "voltage.rectifier-reverse",
    compares: "reverse voltage of a rectifier diode, high mains, no load, with VRRM",
    stress: "reverse voltage at high mains, no load",
    rating: "repetitive peak reverse voltage",
    formula: "one bridge on a centre tap: V0+ + V0-; a bridge per winding: V0; V0 = m·√2·Vs·(1 + ρ)",
    source: "node voltages; R. L. Boylestad, L. Nashelsky, Electronic Devices and Circuit Theory, ch. 2",
    reads: ["supply.rectifier", "transformer.secondary", "transformer.regulation", "build.mains"],
    sense: AtMost,
    unit: "V",
    allow: Allow::Percent(70.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.rectifier", slot: "V", series: Series::TwoDigits, up: true },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("bridge 400 V", "bridge 100 V")],
}

/// One margin for the rectifier.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let each = supply.rectifier.get().map_or(1, |r| r.bridges);
    out.compare(
        &RULE,
        case.supply_part(supply, "rectifier", each),
        supply.rectifier.site(),
        stress(case, supply),
    );
}

fn stress(case: &Case<'_>, supply: &Supply) -> Result<Stress, Needs> {
    let field = &supply.rectifier;
    let (rating, made, rail) = three(
        field.part("V", |r| r.reverse),
        case.made(),
        case.no_load(Mains::High),
    )?;
    let reverse = made.rectifier.reverse_peak(rail, rail);
    let expression = match made.rectifier {
        Rectifier::CentreTap => "V0+ + V0-",
        Rectifier::PerWinding => "V0",
    };
    Ok(Stress {
        value: reverse.0,
        rating: rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            rail_v: Some(rail.0),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            solved(
                "V0",
                "rail, no load, high mains",
                "m·√2·Vs·(1 + ρ)",
                rail.0,
                "V",
                "definition of regulation",
            ),
            solved(
                "VR",
                "across a blocking diode",
                expression,
                reverse.0,
                "V",
                "node voltages",
            ),
            stated("VRRM", "rating", rating.0, "V", field.stated_at()),
        ],
        related: case.rail_sites(None),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60, verdict};

    /// Twice 253/230·√2·28·1.07 = 93.2137 V; 70 % of 133.2 V is 93.24 V, of 133.1 V 93.17 V. By hand.
    #[test]
    fn both_rails_in_one_bridge() {
        let m = margin(&tern60(&[]), super::RULE.name, "toroid rectifier");
        assert!((m.stress.unwrap().value - 93.2137).abs() < 1e-3);
        let at = |volts: &str| {
            verdict(
                &tern60(&[("bridge 400 V", &format!("bridge {volts} V"))]),
                super::RULE.name,
                "toroid rectifier",
            )
        };
        assert_eq!(at("133.2"), Verdict::Ok);
        assert_eq!(at("133.1"), Verdict::Thin);
        assert_eq!(at("93.2"), Verdict::Over);
    }

    /// Two bridges: one rail each, 46.6068 V. By hand.
    #[test]
    fn one_rail_in_a_bridge_per_winding() {
        let m = margin(
            &tern60(&[("1 x bridge", "2 x bridge")]),
            super::RULE.name,
            "toroid rectifier",
        );
        assert!((m.stress.unwrap().value - 46.6068).abs() < 1e-3);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[("bridge 400 V", "bridge")]),
            super::RULE.name,
            "toroid rectifier",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (
                Verdict::Unchecked,
                ["supply toroid rectifier V".to_owned()].as_slice()
            )
        );
    }
}
