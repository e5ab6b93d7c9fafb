//! drive.input-level: the input that rated power needs.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Claim, both};
use crate::finding::Witness;
use crate::physics::math::pow;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Closed-loop gain and rated power together fix the input volts for full output. A domestic source
    /// gives about 2 V, a mixing desk up to 8 or 12 V; an amplifier that needs more than its source can
    /// give never reaches its rated power, however good its supply. Below the limit the figure is
    /// information for whoever chooses the source.
    "drive.input-level",
    compares: "input volts r.m.s. for the greatest rated power with what sources give",
    stress: "input for rated power, r.m.s.",
    rating: "",
    formula: "Vin = √(P·R)/10^(G/20); half of it for each half of a bridge",
    source: "definition of power and gain; +20 and +24 dBu of studio equipment are common practice, no source",
    reads: ["amplifier.gain", "amplifier.rated", "build.channels"],
    sense: AtMost,
    unit: "V",
    // +20 dBu and +24 dBu, dBu counted from 0.7746 V
    allow: Allow::Fixed(7.75, 12.28), "usual greatest output of studio and stage equipment; common practice, no source",
    remedies: [Remedy { key: "amplifier.gain", slot: "dB", series: Series::TwoDigits, up: true }],
    example: "tern60", [("gain               28 dB", "gain               6 dB")],
}

/// What a domestic source gives at full scale, V r.m.s.
const DOMESTIC: f64 = 2.0;

/// One margin for the gain: the claim that needs most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let amplifier = &case.build.amplifier;
    if amplifier.gain.none || amplifier.rated.none {
        return;
    }
    let (part, site) = (line_part(&amplifier.gain), amplifier.gain.site());
    match both(amplifier.gain.need().copied(), amplifier.rated.need()) {
        Err(needs) => out.compare(&RULE, part, site, Err(needs)),
        Ok((gain, claims)) => {
            for claim in claims {
                out.compare(
                    &RULE,
                    part.clone(),
                    site,
                    Ok::<_, Needs>(stress(case, gain, claim)),
                );
            }
        }
    }
}

fn stress(case: &Case<'_>, gain_db: f64, claim: &Claim) -> Stress {
    let halves = if case.build.bridged { 2.0 } else { 1.0 };
    let output = (claim.power.0 * claim.load.0).sqrt() / halves;
    let input = output / pow(10.0, gain_db / 20.0);
    let note = if input > DOMESTIC {
        "more than the 2 V of a domestic source"
    } else {
        ""
    };
    Stress {
        value: input,
        rating: f64::NAN,
        witness: Witness {
            amplitude_v: Some(output * std::f64::consts::SQRT_2),
            power_w: Some(claim.power.0),
            ..case.witness()
        },
        working: vec![
            stated("P", "rated power", claim.power.0, "W", [claim.site]),
            stated(
                "G",
                "closed-loop gain",
                gain_db,
                "dB",
                case.build.amplifier.gain.stated_at(),
            ),
            solved(
                "Vout",
                "output of one channel, r.m.s.",
                "√(P·R)",
                output,
                "V",
                "definition of power",
            ),
            solved(
                "Vin",
                "input, r.m.s.",
                "Vout/10^(G/20)",
                input,
                "V",
                "definition of gain",
            ),
        ],
        note: note.to_owned(),
        ..Stress::default()
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn gain(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("gain               28 dB", text)]),
            "drive.input-level",
            "tern60 gain",
        )
    }

    #[test]
    fn the_claim_that_needs_most_decides() {
        // 60 W into 8 ohm is √480 = 21.9089 V, 100 W into 4 ohm only 20 V; 28 dB is 25.11886
        let m = gain("gain               28 dB");
        assert!(
            (m.stress.unwrap().value - 21.908_902 / 25.118_864).abs() < 1e-6,
            "{:?}",
            m.stress
        );
        assert!(m.note.is_empty());
    }

    #[test]
    fn too_little_gain_is_said() {
        // 21.9089 V at 20 dB is 2.19 V: a note; at 8.9 dB 7.864 V is thin; at 5 dB 12.32 V is over
        let m = gain("gain               20 dB");
        assert_eq!(m.verdict, Verdict::Ok);
        assert!(m.note.contains("domestic"));
        assert_eq!(gain("gain               8.9 dB").verdict, Verdict::Thin);
        assert_eq!(gain("gain               5 dB").verdict, Verdict::Over);
    }

    #[test]
    fn a_gain_that_is_not_stated_is_unchecked() {
        let m = margin(
            &tern60(&[("    gain               28 dB\n", "")]),
            "drive.input-level",
            "tern60 gain",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["amplifier tern60 gain".to_owned()])
        );
    }
}
