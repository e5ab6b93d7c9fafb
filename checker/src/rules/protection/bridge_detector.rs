//! protection.bridge-detector: whether the protection of a bridge sees and opens both halves.

use crate::analysis::case::line_part;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::{Related, Verdict};
use crate::physics::protection::{BreakLimit, DcBreak};
use crate::rule::Allow;

rule! {
    /// In a bridge neither loudspeaker terminal is ground. A detector on one output is blind to the other
    /// half, and one across the load sees nothing when both halves fail the same way and the whole cable
    /// stands at a rail. A contact in one lead must then break both rails at once if the halves fail
    /// opposite ways.
    "protection.bridge-detector",
    compares: "what detector and contacts of a bridged build see and open with both halves",
    stress: "",
    rating: "",
    formula: "either a protection per channel, or `both-halves` and contacts that break 2·V0",
    source: "node voltages of a bridge",
    reads: ["protection.detector", "protection.relay", "build.channels", "build.protection"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [
        ("channels           1\n", "channels           2 bridged\n"),
        ("protection         guard per channel", "protection         guard per build"),
    ],
}

/// One margin for the detector of a bridged build.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    if !case.build.bridged {
        return;
    }
    let (part, site) = match case.build.protection.get() {
        Some(p) => (line_part(&p.detector), p.detector.site()),
        None => (
            line_part(&case.build.protection),
            case.build.protection.site(),
        ),
    };
    match fault(case) {
        Err(needs) => out.compare(&RULE, part, site, Err(needs)),
        Ok(None) => {}
        Ok(Some(wrong)) => {
            let verdict = if wrong.is_empty() {
                Verdict::Ok
            } else {
                Verdict::Over
            };
            let related = vec![Related {
                message: "bridged here".to_owned(),
                site: case.build.channels.site(),
            }];
            out.judge(
                &RULE,
                part,
                site,
                verdict,
                Stress {
                    note: wrong,
                    related,
                    ..Stress::default()
                },
            );
        }
    }
}

/// What is wrong, empty where nothing is; `None` where there is no detector at all.
fn fault(case: &Case<'_>) -> Result<Option<String>, Needs> {
    let Some((protection, detector)) = case.detector()? else {
        return Ok(None);
    };
    // each half then has its own detector and its own contacts
    if case.build.protected == Some(1) {
        return Ok(Some(String::new()));
    }
    if detector.watches != "both-halves" {
        return Ok(Some(format!(
            "it watches `{}`: the other half may stand at a rail unseen",
            detector.watches
        )));
    }
    let Some(relay) = protection.relay.get() else {
        return Ok(Some(String::new()));
    };
    let volts = case.no_load(Mains::High)? * 2.0;
    let points: Vec<_> = relay.iter().filter(|g| g.2).map(|g| (g.1, g.0)).collect();
    let breaks = DcBreak::new(&points)
        .is_some_and(|c| matches!(c.limit(volts), Some(BreakLimit::Allowed(_))));
    Ok(Some(if breaks {
        String::new()
    } else {
        format!(
            "one set of contacts for both halves must break 2·V0 = {:.1} V d.c., for which it is not stated",
            volts.0
        )
    }))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    fn bridged(per: &str, watches: &str, relay: &str) -> crate::finding::Margin {
        let kit = tern60(&[
            ("channels           1\n", "channels           2 bridged\n"),
            (
                "protection         guard per channel",
                &format!("protection         guard {per}"),
            ),
            ("watches output", watches),
            ("10 A at 60 Vdc", relay),
        ]);
        margin(&kit, "protection.bridge-detector", "guard detector")
    }

    #[test]
    fn both_halves_must_be_seen_and_opened() {
        assert_eq!(
            bridged("per channel", "watches output", "10 A at 60 Vdc").verdict,
            Verdict::Ok
        );
        assert_eq!(
            bridged("per build", "watches output", "10 A at 60 Vdc").verdict,
            Verdict::Over
        );
        assert_eq!(
            bridged("per build", "watches across-load", "10 A at 60 Vdc").verdict,
            Verdict::Over
        );
        // 2·V0(hi) = 93.2 V
        let m = bridged("per build", "watches both-halves", "10 A at 60 Vdc");
        assert_eq!(
            (m.verdict, m.note.contains("93.2 V")),
            (Verdict::Over, true)
        );
        assert_eq!(
            bridged("per build", "watches both-halves", "10 A at 100 Vdc").verdict,
            Verdict::Ok
        );
    }

    #[test]
    fn a_grounded_load_is_no_bridge() {
        assert!(
            report(&tern60(&[])).builds[0]
                .margins
                .iter()
                .all(|m| m.rule != "protection.bridge-detector")
        );
    }
}
