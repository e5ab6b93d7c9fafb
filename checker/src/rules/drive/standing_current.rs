//! drive.standing-current: what the base-emitter resistors take of the voltage stage at rest.

use crate::analysis::case::{Side, line_part, solved, stated};
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::three;
use crate::finding::Related;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// The resistor across the base and emitter of a bank empties its bases when it must turn off, and
    /// takes VBE/R of the stage before it all the time. One a decade too small looks harmless and eats
    /// the current that was meant for the music; with none left the stage cannot even hold its bias. The
    /// cure is not simply a larger one: the same resistor decides how quickly the bank turns off.
    "drive.standing-current",
    compares: "current that the chain takes of the voltage stage at rest with what that stage gives",
    stress: "current taken of the voltage stage at rest",
    rating: "current the voltage stage gives",
    formula: "i_d = i/hFE(i/N) + VBE/Rbe up the chain, from i = N·Iq",
    source: "Ohm's law; definition of current gain",
    reads: ["stage.base-emitter", "stage.idle", "stage.output-current", "device.vbe", "device.hfe", "stage.pairs", "amplifier.driver", "amplifier.voltage-amplifier"],
    sense: AtMost,
    unit: "A",
    // the rest must swing the output both ways
    allow: Allow::Percent(30.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.base-emitter", slot: "ohm", series: Series::E12, up: true },
        Remedy { key: "stage.output-current", slot: "A", series: Series::TwoDigits, up: true },
    ],
    example: "tern60", [("base-emitter        100R", "base-emitter        2R2")],
}

/// One margin for the voltage stage.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let amplifier = &case.build.amplifier;
    if out.lacking(&RULE, &amplifier.voltage_field) {
        return;
    }
    let Some(voltage) = amplifier
        .voltage_amplifier
        .as_ref()
        .filter(|_| case.has_base_current())
    else {
        return;
    };
    for side in Side::BOTH {
        out.compare(
            &RULE,
            line_part(&voltage.output_current),
            blamed(case),
            stress(case, side),
        );
    }
}

/// The resistor that takes most: the first follower that has one, from the voltage stage on.
fn blamed(case: &Case<'_>) -> crate::finding::Site {
    let followers = case.followers();
    let fitted = followers
        .iter()
        .rev()
        .find_map(|s| s.base_emitter.stated_at());
    fitted.unwrap_or_else(|| case.output().devices.site())
}

fn stress(case: &Case<'_>, side: Side) -> Result<Stress, Needs> {
    let amplifier = &case.build.amplifier;
    let voltage = amplifier
        .voltage_amplifier
        .as_ref()
        .ok_or_else(|| amplifier.voltage_field.missing())?;
    let (gives, idle, pairs) = three(
        voltage.output_current.need().copied(),
        case.idle(),
        case.output().pairs.need().copied(),
    )?;
    let links = case.chain(side, idle * f64::from(pairs))?;
    let taken = links
        .last()
        .map(|l| l.asks)
        .ok_or_else(|| amplifier.driver_field.missing())?;
    let mut working = Vec::new();
    let mut related = Vec::new();
    for link in &links {
        working.push(solved(
            "Istand",
            "taken by the base-emitter resistor of one bank",
            "VBE/Rbe",
            link.standing.0,
            "A",
            "Ohm's law",
        ));
        working.push(solved(
            "ib",
            "asked of the stage before at rest",
            "i/hFE(i/N) + VBE/Rbe",
            link.asks.0,
            "A",
            "definition of current gain",
        ));
        if let Some(site) = link.stage.base_emitter.stated_at() {
            related.push(Related {
                message: format!("takes {:.4} A all the time", link.standing.0),
                site,
            });
        }
    }
    working.push(stated(
        "Ivas",
        "the voltage stage gives",
        gives.0,
        "A",
        voltage.output_current.stated_at(),
    ));
    Ok(Stress {
        value: taken.0,
        rating: gives.0,
        witness: case.witness(),
        working,
        related,
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    #[test]
    fn the_chain_at_rest() {
        // 2·50 mA at a gain of 80 (below the first point) is 1.25 mA, and 0.65/100 = 6.5 mA: 7.75 mA
        // of the driver, whose own gain is 60: 0.1291667 mA
        let m = margin(&tern60(&[]), "drive.standing-current", "vas output-current");
        assert!(
            (m.stress.unwrap().value - 0.129_166_7e-3).abs() < 1e-10,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn a_resistor_before_the_drivers_is_felt_directly() {
        // 0.65/100 = 6.5 mA + 0.129 mA of 7 mA
        let with = |r: &str| {
            margin(
                &tern60(&[(
                    "insulator          1 K/W",
                    &format!("insulator          1 K/W\n    base-emitter       {r}"),
                )]),
                "drive.standing-current",
                "vas output-current",
            )
            .verdict
        };
        assert_eq!(with("100R"), Verdict::Thin);
        assert_eq!(with("82R"), Verdict::Over);
        assert_eq!(with("1k"), Verdict::Ok);
    }

    #[test]
    fn a_voltage_stage_that_states_nothing_is_unchecked() {
        let m = margin(
            &tern60(&[("    output-current     7 mA\n", "")]),
            "drive.standing-current",
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
