//! drive.slew: how fast the output can move against how fast full power needs it to.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Stage, both, three};
use crate::finding::{Related, Witness};
use crate::physics::drive::{slew_given, slew_needed};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The compensation capacitor can be charged no faster than the input pair's tail current allows, or
    /// the voltage stage for the other edge. If that is slower than full power at the top of the band
    /// needs, sines there turn into triangles: the amplifier is honest only up to some lower frequency.
    "drive.slew",
    compares: "slew rate that tail current and compensation give with the slew rate of full power at the top of the band",
    stress: "slew rate given over slew rate needed",
    rating: "",
    formula: "min(Itail, Ivas)/C / (2π·f·V(burst))",
    source: "slew rate of a sine; Solomon, IEEE JSSC 1974, from memory",
    reads: ["stage.tail", "stage.output-current", "amplifier.band", "amplifier.drop", "amplifier.voltage-amplifier", "build.loads", "build.mains", "transformer.secondary"],
    sense: AtLeast,
    unit: "1",
    allow: Allow::Fixed(1.2, 1.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.tail", slot: "A", series: Series::TwoDigits, up: true },
        Remedy { key: "stage.tail", slot: "compensation", series: Series::E12, up: false },
    ],
    example: "tern60", [("tail               3 mA compensation 100 pF", "tail               300 uA compensation 100 pF")],
}

/// One margin for the voltage stage: the load that lets the output swing furthest.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let amplifier = &case.build.amplifier;
    if amplifier.voltage_field.none {
        return;
    }
    let Some(stage) = &amplifier.voltage_amplifier else {
        return out.compare(
            &RULE,
            line_part(&amplifier.voltage_field),
            amplifier.voltage_field.site(),
            Err(amplifier.voltage_field.missing()),
        );
    };
    if stage.tail.none {
        return;
    }
    let (part, site) = (line_part(&stage.tail), stage.tail.site());
    match case.loads() {
        Err(needs) => out.compare(&RULE, part, site, Err(needs)),
        Ok(loads) => {
            for load in loads {
                let stress = load
                    .as_ref()
                    .map_err(Clone::clone)
                    .and_then(|load| stress(case, stage, load));
                out.compare(&RULE, part.clone(), site, stress);
            }
        }
    }
}

fn stress(case: &Case<'_>, stage: &Stage, load: &Driven) -> Result<Stress, Needs> {
    let ((tail, farad), band, volts) = three(
        stage.tail.need().copied(),
        case.band(),
        case.burst(Mains::Nominal, load.nominal_seen()),
    )?;
    let weaker = stage.output_current.get().map_or(tail, |i| tail.min(*i));
    let wrong = || Needs::because("tail current, compensation and band make no slew rate");
    let (given, needed) = both(
        slew_given(weaker, farad).ok_or_else(wrong),
        slew_needed(band.top(), volts).ok_or_else(wrong),
    )?;
    Ok(Stress {
        value: given / needed,
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(band.top().0),
            amplitude_v: Some(volts.0),
            ..case.witness()
        },
        working: vec![
            stated("Itail", "tail current", tail.0, "A", stage.tail.stated_at()),
            stated("C", "compensation", farad.0, "F", stage.tail.stated_at()),
            solved(
                "SRgiven",
                "slew rate given",
                "min(Itail, Ivas)/C",
                given.0,
                "V/s",
                "charge on a capacitor",
            ),
            solved(
                "V̂",
                "peak output into the rated load",
                "Vu - drop(V̂/R)",
                volts.0,
                "V",
                "drop as stated",
            ),
            solved(
                "SRneeded",
                "slew rate of a sine",
                "2π·f·V̂",
                needed.0,
                "V/s",
                "steepest point of a sine",
            ),
        ],
        related: vec![Related {
            message: "the top of the band".to_owned(),
            site: case.build.amplifier.band.site(),
        }],
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn tail(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("3 mA compensation 100 pF", text)]),
            "drive.slew",
            "vas tail",
        )
    }

    #[test]
    fn thirty_volts_a_microsecond_against_what_a_sine_needs() {
        // 3 mA/100 pF = 30 V/us; V(burst) into 8 ohm 38.20536 V (see drive.output-gain-droop),
        // 2π·20 kHz·38.20536 = 4.801027 V/us: 6.248663
        assert!((tail("3 mA compensation 100 pF").stress.unwrap().value - 6.248_66).abs() < 1e-4);
    }

    #[test]
    fn verdicts_at_the_limits() {
        // 1.2·4.801 = 5.761 V/us, of 100 pF 576.1 uA; 480.1 uA is just enough
        assert_eq!(tail("577 uA compensation 100 pF").verdict, Verdict::Ok);
        assert_eq!(tail("575 uA compensation 100 pF").verdict, Verdict::Thin);
        assert_eq!(tail("481 uA compensation 100 pF").verdict, Verdict::Thin);
        assert_eq!(tail("479 uA compensation 100 pF").verdict, Verdict::Over);
    }

    #[test]
    fn the_voltage_stage_limits_the_other_edge() {
        // 7 mA gives less than a tail of 10 mA: 70 V/us
        assert!(
            (tail("10 mA compensation 100 pF").stress.unwrap().value - 70.0 / 4.801_027).abs()
                < 1e-3
        );
    }

    #[test]
    fn a_tail_that_is_not_stated_is_unchecked() {
        let m = margin(
            &tern60(&[("    tail               3 mA compensation 100 pF\n", "")]),
            "drive.slew",
            "vas tail",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["stage vas tail".to_owned()])
        );
    }
}
