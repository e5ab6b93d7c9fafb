//! protection.absent: whether anything stands between a rail and the loudspeaker.

use crate::analysis::case::line_part;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::Verdict;
use crate::rule::Allow;

rule! {
    /// A direct-coupled amplifier is one shorted transistor away from putting its rail on the voice
    /// coil. Without a detector and something that opens, the coil burns in seconds, and the cone can
    /// catch fire. A bench amplifier may do without: then say so and waive this, with the reason.
    "protection.absent",
    compares: "the d.c. protection of a build that drives loudspeakers with none",
    stress: "",
    rating: "",
    formula: "",
    source: "common practice, no source",
    reads: ["build.protection", "protection.detector", "protection.relay", "protection.contacts", "protection.switch", "protection.crowbar"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("protection         guard per channel", "protection         none")],
}

/// One margin for the build's protection.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let field = &case.build.protection;
    match absent(case) {
        Err(needs) => out.compare(&RULE, line_part(field), field.site(), Err(needs)),
        Ok(why) => {
            let verdict = if why.is_some() {
                Verdict::Over
            } else {
                Verdict::Ok
            };
            out.judge(
                &RULE,
                line_part(field),
                field.site(),
                verdict,
                Stress {
                    note: why.unwrap_or_default().to_owned(),
                    ..Stress::default()
                },
            );
        }
    }
}

/// What is missing for certain; `None` where there is protection.
fn absent(case: &Case<'_>) -> Result<Option<&'static str>, Needs> {
    if case.build.protection.none {
        return Ok(Some(
            "no protection: a failed output device puts its rail on the loudspeaker",
        ));
    }
    let protection = case.protection()?;
    if protection.detector.none {
        return Ok(Some(
            "no d.c. detector: nothing sees a rail on the loudspeaker",
        ));
    }
    protection.detector.need()?;
    let opens = [
        protection.relay.get().is_some(),
        protection.contacts.get().is_some(),
        protection.switch.get().is_some(),
        protection.crowbar.get().is_some(),
    ];
    if opens.contains(&true) {
        return Ok(None);
    }
    if protection.relay.unstated() && protection.switch.unstated() {
        return Err(protection.relay.missing());
    }
    Ok(Some("a detector, and nothing that it opens"))
}

#[cfg(test)]
mod tests {
    use crate::finding::{Severity, Verdict};
    use crate::testing::{margin, tern60};

    const LINE: &str = "    protection         guard per channel\n";

    #[test]
    fn none_is_over_and_left_out_is_unchecked() {
        let m = margin(
            &tern60(&[(LINE, "    protection         none\n")]),
            "protection.absent",
            "mono protection",
        );
        assert_eq!((m.verdict, m.severity), (Verdict::Over, Severity::Error));
        let m = margin(
            &tern60(&[(LINE, "")]),
            "protection.absent",
            "mono protection",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["build mono protection".to_owned()])
        );
    }

    #[test]
    fn a_limiter_alone_does_not_see_a_rail_on_the_loudspeaker() {
        let kit = tern60(&[(
            "detector           1.5 V 22k 22 uF watches output",
            "detector           none",
        )]);
        assert_eq!(
            margin(&kit, "protection.absent", "mono protection").verdict,
            Verdict::Over
        );
        assert_eq!(
            margin(&tern60(&[]), "protection.absent", "mono protection").verdict,
            Verdict::Ok
        );
    }

    #[test]
    fn a_none_can_be_waived_with_a_reason() {
        let kit = tern60(&[
            (LINE, "    protection         none\n"),
            (
                "ampspec 1\n",
                "ampspec 1\nwaive protection.absent because \"drives a dummy load only\"\n",
            ),
        ]);
        assert!(
            margin(&kit, "protection.absent", "mono protection")
                .waiver
                .is_some()
        );
    }
}
