//! data.substitute-speed: an alternate's devices against the speed and kind of those they replace.

use crate::build::statement::Statement;
use crate::build::view::Seen;
use crate::build::{Project, View};
use crate::finding::{Finding, Related, Severity, Site};
use crate::rule::Allow;

rule! {
    /// A substitute is chosen by volts, amperes and watts, and is then far slower or far faster than the
    /// part it replaces. The compensation was set for the old one: a slow substitute turns the feedback
    /// into an oscillator, a fast one finds the inductance of every wire. Neither shows in any rating.
    "data.substitute-speed",
    compares: "the transition frequency and kind of a substitute with those of the device it replaces",
    stress: "",
    rating: "",
    formula: "fT of the substitute within half and twice of the original",
    source: "common practice, no source",
    reads: ["alternate.replace", "device.transition"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60-revisions", [("transition         35 MHz at 1 A", "transition         3 MHz at 1 A")],
}

/// An octave: the pole of the output stage may move so far before the compensation must move with it.
const FAR: f64 = 2.0;

/// One finding for each substitution that is too far off, or cannot be compared.
pub fn check(project: &Project, findings: &mut Vec<Finding>) {
    let Some(build) = project.of_kind("build").next() else {
        return;
    };
    let view = View::new(project, build, None, &[]);
    for alternate in project.of_kind("alternate") {
        for line in &alternate.lines {
            for (old, new, site) in substitutions(&view, line) {
                let devices = view.block(&old, "device").zip(view.block(&new, "device"));
                findings.extend(devices.and_then(|(old, new)| judged(&old, &new, site)));
            }
        }
    }
}

/// The names that a line of an alternate puts in place of others.
fn substitutions(view: &View<'_>, line: &Statement) -> Vec<(String, String, Site)> {
    if line.key.name == "replace" {
        let named = line.groups.iter().filter_map(|g| {
            Some((
                g.name("any")?.to_owned(),
                g.name("any2")?.to_owned(),
                g.site,
            ))
        });
        return named.collect();
    }
    let Some((block, stated)) = line.change.as_ref().filter(|c| c.1.key.name == "devices") else {
        return Vec::new();
    };
    let stage = view.block(block, "stage");
    let Some((before, after)) = stage
        .as_ref()
        .and_then(|s| s.group("devices"))
        .zip(stated.groups.first())
    else {
        return Vec::new();
    };
    let places = ["device", "device2"].into_iter();
    places
        .filter_map(|place| {
            Some((
                before.name(place)?.to_owned(),
                after.name(place)?.to_owned(),
                after.site,
            ))
        })
        .collect()
}

fn judged(old: &Seen<'_>, new: &Seen<'_>, site: Site) -> Option<Finding> {
    let (was, is) = (&old.declared.name, &new.declared.name);
    if was == is {
        return None;
    }
    let mut finding = match (old.flavour, new.flavour) {
        (Some(a), Some(b)) if a != b => {
            let message = format!("`{is}` is {b}, and replaces `{was}`, which is {a}");
            Finding::error(
                RULE.name,
                site,
                message,
                "name a substitute of the same kind".to_owned(),
            )
        }
        _ => speeds(old, new, site)?,
    };
    finding.related = vec![
        Related {
            message: "replaced".to_owned(),
            site: old.declared.name_site,
        },
        Related {
            message: "the substitute".to_owned(),
            site: new.declared.name_site,
        },
    ];
    Some(finding)
}

fn speeds(old: &Seen<'_>, new: &Seen<'_>, site: Site) -> Option<Finding> {
    let speed = |seen: &Seen<'_>| {
        seen.group("transition")
            .and_then(|g| g.number("Hz"))
            .filter(|f| *f > 0.0)
    };
    let (was, is) = (&old.declared.name, &new.declared.name);
    let (Some(before), Some(after)) = (speed(old), speed(new)) else {
        let silent = if speed(old).is_none() { was } else { is };
        let message = format!(
            "`{is}` replaces `{was}`: speed not compared, `device {silent} transition` is not stated"
        );
        return Some(
            Finding::error(
                RULE.name,
                site,
                message,
                "state the transition frequency of both".to_owned(),
            )
            .at(Severity::Information),
        );
    };
    let ratio = after / before;
    if (1.0 / FAR..=FAR).contains(&ratio) {
        return None;
    }
    let (times, how, then) = if ratio < 1.0 {
        (1.0 / ratio, "slower", "oscillate")
    } else {
        (ratio, "faster", "ring with its wiring")
    };
    let message = format!(
        "`{is}` is {times:.1} times {how} than `{was}` ({:.3} MHz, {:.3} MHz): the amplifier may {then}",
        after / 1e6,
        before / 1e6
    );
    Some(
        Finding::error(
            RULE.name,
            site,
            message,
            "choose one within half and twice the speed, or set the compensation anew".to_owned(),
        )
        .at(Severity::Warning),
    )
}

#[cfg(test)]
mod tests {
    use crate::finding::Severity;
    use crate::testing::{edited, kit, report};

    fn found(edits: &[(&str, &str)]) -> Vec<(Severity, String)> {
        let report = report(&edited(&kit("tern60-revisions"), edits));
        report
            .findings
            .into_iter()
            .filter(|f| f.rule == "data.substitute-speed")
            .map(|f| (f.severity, f.message))
            .collect()
    }

    #[test]
    fn an_octave_either_way_is_near_enough() {
        // n16 is 30 MHz; p17 takes its lines from n17
        assert!(found(&[]).is_empty());
        assert!(found(&[("transition         35 MHz", "transition         60 MHz")]).is_empty());
        assert!(found(&[("transition         35 MHz", "transition         15 MHz")]).is_empty());
        let slow = found(&[("transition         35 MHz", "transition         14 MHz")]);
        assert_eq!(slow.len(), 2);
        assert!(
            slow.iter()
                .all(|f| f.0 == Severity::Warning && f.1.contains("slower")),
            "{slow:?}"
        );
        assert!(
            found(&[("transition         35 MHz", "transition         61 MHz")])
                .iter()
                .all(|f| f.1.contains("faster"))
        );
    }

    #[test]
    fn another_polarity_is_an_error() {
        let swapped = found(&[("n16 with n17, p16 with p17", "n16 with p17, p16 with n17")]);
        assert_eq!(
            swapped.iter().filter(|f| f.0 == Severity::Error).count(),
            2,
            "{swapped:?}"
        );
    }
}
