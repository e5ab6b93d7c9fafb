//! drive.output-gain-droop: base current up the chain against what the voltage stage gives.

use crate::analysis::case::{Side, line_part, solved, stated};
use crate::analysis::drive::Peak;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::both;
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The gain of an output transistor falls as its current rises: one that shows a hundred on the
    /// bench gives twenty at ten amperes. The driver must make up the difference, and the stage before
    /// the driver must feed it. If that stage runs out, the amplifier clips early and ugly into four
    /// ohms while the meters say that nothing is wrong.
    "drive.output-gain-droop",
    compares: "base current asked of the voltage stage at full output with what it gives",
    stress: "base current asked of the voltage stage",
    rating: "current it gives, less standing current",
    formula: "Î = V(burst)/|Z|min; i_d = i/hFE(i/N) + VBE/Rbe at each follower; rating Ivas - VBE/Rbe of the first",
    source: "definition of current gain; gain straight in log I between the points of the data sheet",
    reads: [
        "device.hfe", "device.vbe", "stage.pairs", "stage.base-emitter", "stage.output-current", "amplifier.driver",
        "amplifier.predriver", "amplifier.voltage-amplifier", "amplifier.drop", "build.loads", "build.mains", "transformer.secondary",
    ],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.output-current", slot: "A", series: Series::TwoDigits, up: true },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("output-current     7 mA", "output-current     1 mA")],
}

/// One margin for the voltage stage: the load and side that ask most of it.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let amplifier = &case.build.amplifier;
    if amplifier.voltage_field.none || !case.has_base_current() {
        return;
    }
    let (part, site) = match &amplifier.voltage_amplifier {
        Some(stage) => (
            line_part(&stage.output_current),
            stage.output_current.site(),
        ),
        None => (
            line_part(&amplifier.voltage_field),
            amplifier.voltage_field.site(),
        ),
    };
    let loads = match case.loads() {
        Ok(loads) => loads,
        Err(needs) => return out.compare(&RULE, part, site, Err(needs)),
    };
    for side in Side::BOTH {
        for load in loads {
            let stress = load
                .as_ref()
                .map_err(Clone::clone)
                .and_then(|load| stress(case, load, side));
            out.compare(&RULE, part.clone(), site, stress);
        }
    }
}

fn stress(case: &Case<'_>, load: &Driven, side: Side) -> Result<Stress, Needs> {
    let amplifier = &case.build.amplifier;
    let voltage = amplifier
        .voltage_amplifier
        .as_ref()
        .ok_or_else(|| amplifier.voltage_field.missing());
    let (peak, gives) = both(
        case.peak_into(load, Mains::Nominal),
        voltage.and_then(|s| Ok((s.output_current.need().copied()?, s))),
    )?;
    let (gives, voltage) = gives;
    let links = case.chain(side, peak.amps)?;
    let first = links
        .last()
        .ok_or_else(|| amplifier.driver_field.missing())?;
    let mut working = peak_working(&peak);
    let mut related = vec![Related {
        message: "asks most".to_owned(),
        site: load.site,
    }];
    for link in &links {
        working.push(solved(
            "i",
            "carried by one bank",
            "",
            link.carries.0,
            "A",
            "",
        ));
        working.push(solved(
            "ib",
            "asked of the stage before",
            "i/hFE(i/N) + VBE/Rbe",
            link.asks.0,
            "A",
            "definition of current gain",
        ));
        related.push(Related {
            message: format!(
                "carries {:.3} A, asks for {:.4} A",
                link.carries.0, link.asks.0
            ),
            site: link.stage.devices.site(),
        });
    }
    working.push(stated(
        "Ivas",
        "the voltage stage gives",
        gives.0,
        "A",
        voltage.output_current.stated_at(),
    ));
    working.push(solved(
        "Istand",
        "taken of it by base-emitter resistors",
        "VBE/Rbe",
        first.standing.0,
        "A",
        "Ohm's law",
    ));
    Ok(Stress {
        value: (first.asks - first.standing).0,
        rating: (gives - first.standing).0,
        witness: witness(case, load, &peak),
        working,
        related,
        ..Stress::default()
    })
}

/// How the peak current was had.
pub(super) fn peak_working(peak: &Peak) -> Vec<crate::finding::Step> {
    vec![
        solved(
            "Vu",
            "unsagged rail",
            "V0 - Vd",
            peak.rail.0,
            "V",
            "definition of the unsagged rail",
        ),
        solved(
            "V̂",
            "peak output",
            "Vu - drop(V̂/|Z|)",
            peak.volts.0,
            "V",
            "drop as stated",
        ),
        solved(
            "|Z|",
            "least impedance that one channel sees",
            "",
            peak.modulus.0,
            "ohm",
            "",
        ),
        solved(
            "Î",
            "peak current of one channel",
            "V̂/|Z|",
            peak.amps.0,
            "A",
            "Ohm's law",
        ),
    ]
}

fn witness(case: &Case<'_>, load: &Driven, peak: &Peak) -> Witness {
    Witness {
        mains_v: case.mains_volts(Mains::Nominal),
        load: Some(load.name.clone()),
        frequency_hz: Some(peak.frequency.0),
        amplitude_v: Some(peak.volts.0),
        rail_v: Some(peak.rail.0),
        bank_a: Some(peak.amps.0),
        ..case.witness()
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    /// The kit with its bench resistor only.
    fn bench(edits: &[(&str, &str)]) -> String {
        let mut all = vec![
            (
                "loads              hall-8, bench-8",
                "loads              bench-8",
            ),
            (
                "bench-8 { resistive 8 ohm ±5 % }",
                "bench-8 { resistive 8 ohm }",
            ),
        ];
        all.extend_from_slice(edits);
        tern60(&all)
    }

    #[test]
    fn the_chain_is_followed_to_the_voltage_stage() {
        // Vu = √2·28·1.07 - 1.0 = 41.36984 V; drop 1.8 V + (2 V/7 A)·I into 8 ohm:
        // V = 39.56984/(1 + 0.2857143/8) = 38.20536 V, Î = 4.775670 A, 2.387835 A each
        // hFE = 80 - 20·ln(2.387835)/ln(5) = 69.18414; ib = 69.02839 mA + 0.65/100 = 75.52839 mA
        // the driver below its first point: 60 -> 1.258807 mA, no resistor of its own
        let m = margin(&bench(&[]), "drive.output-gain-droop", "vas output-current");
        assert!(
            (m.stress.unwrap().value - 1.258_81e-3).abs() < 1e-8,
            "{:?}",
            m.stress
        );
        assert!((m.rating.unwrap().value - 7e-3).abs() < 1e-12);
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn the_standing_current_comes_off_what_is_given() {
        // a resistor of 200 ohm across the drivers takes 0.65/200 = 3.25 mA of the 7 mA
        let m = margin(
            &bench(&[(
                "insulator          1 K/W",
                "insulator          1 K/W\n    base-emitter       200R",
            )]),
            "drive.output-gain-droop",
            "vas output-current",
        );
        assert!((m.rating.unwrap().value - 3.75e-3).abs() < 1e-12);
        assert!((m.stress.unwrap().value - 1.258_81e-3).abs() < 1e-8);
    }

    #[test]
    fn thin_and_over_meet_at_what_the_stage_gives() {
        let verdict = |gives: &str| {
            margin(
                &bench(&[("output-current     7 mA", gives)]),
                "drive.output-gain-droop",
                "vas output-current",
            )
            .verdict
        };
        // 1.2588/0.8 = 1.5735
        assert_eq!(verdict("output-current     1.58 mA"), Verdict::Ok);
        assert_eq!(verdict("output-current     1.57 mA"), Verdict::Thin);
        assert_eq!(verdict("output-current     1.26 mA"), Verdict::Thin);
        assert_eq!(verdict("output-current     1.25 mA"), Verdict::Over);
    }

    #[test]
    fn a_gain_curve_that_ends_early_passes_nothing() {
        let m = margin(
            &bench(&[(", 60 at 5 A, 38 at 8 A, 16 at 16 A", ", 75 at 2 A")]),
            "drive.output-gain-droop",
            "vas output-current",
        );
        assert_eq!(m.verdict, Verdict::Unchecked);
        assert!(m.note.contains("n16 ends at 2.000 A"), "{}", m.note);
    }

    #[test]
    fn a_voltage_stage_that_states_nothing_is_unchecked() {
        let m = margin(
            &bench(&[("    output-current     7 mA\n", "")]),
            "drive.output-gain-droop",
            "vas output-current",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["stage vas output-current".to_owned()]
            )
        );
    }
}
