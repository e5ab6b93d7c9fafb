//! bom.polarity: npn and pnp in the places that the connection wants.

use crate::analysis::case::Side;
use crate::analysis::{Case, Margins, Stress};
use crate::build::parts::Stage;
use crate::finding::Verdict;
use crate::rule::Allow;

rule! {
    /// The upper device of a follower pulls towards the positive rail and is an npn or an n-channel type,
    /// the lower one its complement; in a compound pair the output devices stand the other way round.
    /// Two order codes swapped in the list put the wrong one in every kit, and both rails across the
    /// first amplifier that is switched on.
    "bom.polarity",
    compares: "the polarity of each device with its place",
    stress: "",
    rating: "",
    formula: "",
    source: "definition of the connections",
    reads: ["stage.devices", "stage.connection"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("devices             n16 p16  ref", "devices             p16 n16  ref")],
}

/// One margin for each device of a follower whose polarity is declared.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    for stage in case.followers() {
        for side in Side::BOTH {
            let device = stage.device(side);
            let Some(kind) = device.kind.filter(|k| *k != "complementary") else {
                continue;
            };
            let wanted = wanted(stage, side);
            let right = wanted.contains(&kind);
            let note = if right {
                String::new()
            } else {
                format!(
                    "{} is {kind}; the {} place of a {} wants {} or {}",
                    device.owner.name,
                    side.name(),
                    stage.connection,
                    wanted[0],
                    wanted[1]
                )
            };
            let verdict = if right { Verdict::Ok } else { Verdict::Over };
            out.judge(
                &RULE,
                case.device_part(stage, side),
                stage.devices.site(),
                verdict,
                Stress {
                    note,
                    ..Stress::default()
                },
            );
        }
    }
}

/// Bipolar and MOSFET kinds that belong in a place.
fn wanted(stage: &Stage, side: Side) -> [&'static str; 2] {
    let upper = matches!(side, Side::Upper);
    // the collector, not the emitter, of a compound pair's output device goes to the output
    if upper != matches!(stage.connection, "compound-pair" | "common-emitter") {
        ["npn", "nmos"]
    } else {
        ["pnp", "pmos"]
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{tern60, verdict};

    #[test]
    fn followers_and_compound_pairs_stand_opposite_ways() {
        assert_eq!(verdict(&tern60(&[]), "bom.polarity", "n16"), Verdict::Ok);
        assert_eq!(verdict(&tern60(&[]), "bom.polarity", "p16"), Verdict::Ok);
        let swapped = tern60(&[(
            "devices             n16 p16  ref",
            "devices             p16 n16  ref",
        )]);
        assert_eq!(verdict(&swapped, "bom.polarity", "n16"), Verdict::Over);
        let pair = tern60(&[
            (
                "devices             n16 p16  ref",
                "devices             p16 n16  ref",
            ),
            (
                "connection          emitter-follower",
                "connection          compound-pair",
            ),
        ]);
        assert_eq!(verdict(&pair, "bom.polarity", "p16"), Verdict::Ok);
    }
}
