//! current.rectifier-surge: the rectifier at switch-on.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Supply, both};
use crate::finding::Witness;
use crate::physics::supply::Surge;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Empty reservoirs are a short circuit at switch-on; only the copper of the windings stands
    /// between the mains and the diodes. The bigger the reservoir and the transformer, the longer
    /// and higher the surge. Diodes that see too much of it fail after some hundred switch-ons, as a
    /// short circuit, long after the amplifier was sold.
    "current.rectifier-surge",
    compares: "surge of a diode at switch-on, high mains, empty reservoirs, with IFSM and the I2t it stands for",
    stress: "share of the surge rating taken at switch-on",
    rating: "what the diode stands once",
    formula: "Ipk/IFSM and I2t/(IFSM²·8.3 ms/2), the greater; closing at zero or at crest, the worse; of a diode (I2t first + I2t total)/2",
    source: "charging of a reservoir through the winding, exact; I2t of a half-sine, as bridge data sheets print it",
    reads: ["supply.rectifier", "supply.reservoir", "supply.soft-start", "supply.wiring", "transformer.secondary", "transformer.rating", "transformer.regulation", "build.mains"],
    sense: AtMost,
    unit: "%",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "supply.rectifier", slot: "surge", series: Series::TwoDigits, up: true },
    ],
    example: "tern60", [("surge 300 A", "surge 30 A"), ("    soft-start         27R 10 W bypass 400 ms thermal-fuse 130 degC", "    soft-start         none")],
}

/// The half-sine whose I²t stands for IFSM: 60 Hz, the shorter of the two that sheets use.
const HALF_SINE_S: f64 = 8.3e-3;

/// One margin for the rectifier: peak or I²t, the surge through the soft start or past it.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    let each = supply.rectifier.get().map_or(1, |r| r.bridges);
    let part = || case.supply_part(supply, "rectifier", each);
    let site = supply.rectifier.site();
    match case.switch_on(true) {
        Err(needs) => out.compare(&RULE, part(), site, Err(needs)),
        Ok(surges) => {
            for (surge, when) in [
                (Some(surges.first), "at switch-on"),
                (surges.second, "when the soft start is bypassed"),
            ] {
                if let Some(surge) = surge {
                    out.compare(&RULE, part(), site, stress(case, supply, surge, when));
                }
            }
        }
    }
}

fn stress(case: &Case<'_>, supply: &Supply, surge: Surge, when: &str) -> Result<Stress, Needs> {
    let field = &supply.rectifier;
    let (limit, rail) = both(field.part("surge", |r| r.surge), case.no_load(Mains::High))?;
    // the pulses shrink and each diode takes every other one
    let diode = (surge.first + surge.total) * 0.5;
    let stands = 0.5 * limit.0 * limit.0 * HALF_SINE_S;
    let (by_peak, by_square) = (100.0 * (surge.peak / limit), 100.0 * diode.0 / stands);
    Ok(Stress {
        value: by_peak.max(by_square),
        rating: 100.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            tolerance: vec![("reservoir".to_owned(), "high")],
            rail_v: Some(rail.0),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            solved(
                "Ipk",
                "peak, closing at zero or at crest",
                "",
                surge.peak.0,
                "A",
                "charging through the winding, exact",
            ),
            stated("IFSM", "rating", limit.0, "A", field.stated_at()),
            solved(
                "I2t",
                "of one diode",
                "(first half-cycle + all)/2",
                diode.0,
                "A2s",
                "pulses shrink, diodes take turns",
            ),
            solved(
                "I2t max",
                "what IFSM stands for",
                "IFSM²·8.3 ms/2",
                stands,
                "A2s",
                "I2t of a half-sine",
            ),
        ],
        related: case.rail_sites(
            supply
                .soft_start
                .stated_at()
                .map(|site| ("the soft start", site)),
        ),
        note: when.to_owned(),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    const SOFT: &str = "    soft-start         27R 10 W bypass 400 ms thermal-fuse 130 degC";

    /// A small-step integration written apart from this program (2 us, C 20 % high, high mains, no soft
    /// start): closing at crest 113.0 A, 20.99 A²s in the first half-cycle, 23.99 A²s in all, so
    /// 22.49 A²s in a diode. IFSM 300 A stands for 0.5·300²·8.3 ms = 373.5 A²s (published sheets print
    /// 373.5 to 375): 37.67 % by peak, 6.02 % by I²t. Through the soft start 34.56 A, 11.52 %.
    #[test]
    fn against_small_steps() {
        let m = margin(
            &tern60(&[(SOFT, "    soft-start         none")]),
            super::RULE.name,
            "toroid rectifier",
        );
        assert!((m.stress.unwrap().value - 37.67).abs() < 0.1);
        let square = m.working.iter().find(|s| s.symbol == "I2t").unwrap().value;
        assert!((square / 22.49 - 1.0).abs() < 5e-3);
        let m = margin(&tern60(&[]), super::RULE.name, "toroid rectifier");
        assert!((m.stress.unwrap().value - 11.52).abs() < 0.05);
    }

    /// 113.01 A is 79.6 % of 142 A, 80.7 % of 140 A, past 113 A. By hand.
    #[test]
    fn limits() {
        let at = |surge: &str| {
            margin(
                &tern60(&[
                    (SOFT, "    soft-start         none"),
                    ("surge 300 A", surge),
                ]),
                super::RULE.name,
                "toroid rectifier",
            )
        };
        assert_eq!(at("surge 142 A").verdict, Verdict::Ok);
        assert_eq!(at("surge 140 A").verdict, Verdict::Thin);
        assert_eq!(at("surge 110 A").verdict, Verdict::Over);
        assert_eq!(at("").needs, ["supply toroid rectifier surge"]);
    }
}
