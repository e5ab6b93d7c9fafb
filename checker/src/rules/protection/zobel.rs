//! protection.zobel: the resistor of the output network at full power and the top of the band.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Network, three};
use crate::finding::{Related, Verdict, Witness};
use crate::physics::network::Zobel;
use crate::physics::unit::Volt;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The resistor and capacitor across the output keep the amplifier from singing with cables and
    /// loudspeakers. At the top of the band the resistor gets warm; once it has burnt open the amplifier
    /// may oscillate, and then everything behind it burns too.
    "protection.zobel",
    compares: "watts of the zobel resistor at full output, top of the band, with its rating",
    stress: "watts in the zobel resistor",
    rating: "its rated watts",
    formula: "P = (V̂²/2)·R/(R² + X²), X = 1/(2π·f·C), V̂ = Vu - drop(0)",
    source: "circuit theory",
    reads: ["network.zobel", "amplifier.network", "amplifier.band", "amplifier.drop", "build.mains", "transformer.secondary", "transformer.regulation"],
    sense: AtMost,
    unit: "W",
    allow: Allow::Percent(60.0), "common practice, no source",
    remedies: [Remedy { key: "network.zobel", slot: "W", series: Series::ResistorWatts, up: true }],
    example: "tern60", [("8R2 3 W 82 nF", "8R2 1 W 100 nF")],
}

/// One margin for the zobel.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let amplifier = &case.build.amplifier;
    if amplifier.network_field.none {
        return;
    }
    let Some(network) = &amplifier.network else {
        return out.compare(
            &RULE,
            line_part(&amplifier.network_field),
            amplifier.network_field.site(),
            Err(amplifier.network_field.missing()),
        );
    };
    if network.zobel.none {
        return;
    }
    let (part, site) = (line_part(&network.zobel), network.zobel.site());
    out.compare(&RULE, part.clone(), site, watts(case, network));
    if let Some(stress) = capacitor(case, network) {
        out.judge(&RULE, part, site, Verdict::Over, stress);
    }
}

fn watts(case: &Case<'_>, network: &Network) -> Result<Stress, Needs> {
    let ((ohm, rating, farad, _), peak, band) = three(
        network.zobel.need().copied(),
        case.greatest_output(Mains::Nominal),
        case.band(),
    )?;
    let rms = peak / std::f64::consts::SQRT_2;
    let wrong = || {
        Needs::because(format!(
            "the zobel of network {} needs positive values",
            network.owner.name
        ))
    };
    let zobel = Zobel::new(ohm, farad).ok_or_else(wrong)?;
    let (watts, reactance) = zobel
        .watts(rms, band.top())
        .zip(zobel.reactance(band.top()))
        .ok_or_else(wrong)?;
    Ok(Stress {
        value: watts.0,
        rating: rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            frequency_hz: Some(band.top().0),
            amplitude_v: Some(peak.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "V̂",
                "greatest peak output",
                "Vu - drop(0)",
                peak.0,
                "V",
                "drop as stated",
            ),
            stated("R", "its resistor", ohm.0, "ohm", network.zobel.stated_at()),
            solved(
                "X",
                "its capacitor at the top of the band",
                "1/(2π·f·C)",
                reactance.0,
                "ohm",
                "circuit theory",
            ),
            solved(
                "P",
                "in the resistor",
                "(V̂²/2)·R/(R² + X²)",
                watts.0,
                "W",
                "circuit theory",
            ),
        ],
        related: vec![Related {
            message: "the top of the band".to_owned(),
            site: case.build.amplifier.band.site(),
        }],
        ..Stress::default()
    })
}

/// A capacitor that does not stand the rail, which a d.c. fault puts on it; `None` where it does, or
/// states no volts.
fn capacitor(case: &Case<'_>, network: &Network) -> Option<Stress> {
    let rated: Volt = network.zobel.get()?.3?;
    let rail = case.unsagged(Mains::High).ok()?;
    (rail > rated).then(|| Stress {
        note: format!(
            "the output reaches {:.1} V, its capacitor is stated for {:.0} V",
            rail.0, rated.0
        ),
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            rail_v: Some(rail.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "Vu",
                "unsagged rail, high mains",
                "V0 - Vd",
                rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            stated(
                "VC",
                "rated volts of the capacitor",
                rated.0,
                "V",
                network.zobel.stated_at(),
            ),
        ],
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn zobel(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("8R2 3 W 82 nF", text)]),
            "protection.zobel",
            "net zobel",
        )
    }

    #[test]
    fn watts_at_the_top_of_the_band() {
        // V̂ = 41.36984 - 1.8 = 39.56984 V, V̂²/2 = 782.8861; X = 1/(2π·20 kHz·82 nF) = 97.04564 ohm
        // P = 782.8861·8.2/(67.24 + 9417.856) = 0.676820 W
        let m = zobel("8R2 3 W 82 nF");
        assert!(
            (m.stress.unwrap().value - 0.676_820).abs() < 2e-5,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Verdict::Ok);
        // 0.67682/0.6 = 1.128 W
        assert_eq!(zobel("8R2 1.13 W 82 nF").verdict, Verdict::Ok);
        assert_eq!(zobel("8R2 1.12 W 82 nF").verdict, Verdict::Thin);
        assert_eq!(zobel("8R2 0.67 W 82 nF").verdict, Verdict::Over);
    }

    #[test]
    fn a_capacitor_below_the_rail_is_over() {
        assert_eq!(zobel("8R2 3 W 82 nF 40 V").verdict, Verdict::Over);
        assert_eq!(zobel("8R2 3 W 82 nF 63 V").verdict, Verdict::Ok);
    }

    #[test]
    fn a_network_that_is_not_stated_is_unchecked() {
        let m = margin(
            &tern60(&[("    network            net\n", "")]),
            "protection.zobel",
            "tern60 network",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["amplifier tern60 network".to_owned()]
            )
        );
    }
}
