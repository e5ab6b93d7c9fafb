//! Waivers: findings accepted in the file, with a written reason.
//! Must not know what a rule compares.

use crate::Options;
use crate::bom;
use crate::build::Project;
use crate::finding::{BuildReport, Finding, Margin, Severity, Verdict, Waiver, WaiverState};
use crate::policy::unknown_rule;
use crate::rules;

/// Apply every waiver of the project. Margins and findings they accept are marked, and stay. Waivers
/// that accept nothing are findings.
pub fn apply(
    project: &Project,
    options: &Options,
    builds: &mut [BuildReport],
    findings: &mut Vec<Finding>,
) -> Vec<Waiver> {
    // what a list is checked for cannot be waived where there is no list, nor be stale
    heard(project, options, builds, findings, |rule| {
        !bom::needs_list(rule)
    })
}

/// The same for what a bill of materials is checked for, and for nothing else.
pub fn apply_to_list(
    project: &Project,
    options: &Options,
    builds: &mut [BuildReport],
    findings: &mut Vec<Finding>,
) -> Vec<Waiver> {
    heard(project, options, builds, findings, |rule| {
        rule.starts_with("bom.")
    })
}

fn heard(
    project: &Project,
    options: &Options,
    builds: &mut [BuildReport],
    findings: &mut Vec<Finding>,
    concerns: impl Fn(&str) -> bool,
) -> Vec<Waiver> {
    let mut waivers = Vec::new();
    for text in project.waivers.iter().filter(|w| concerns(&w.rule)) {
        let Some(site) = text.site else { continue };
        let mut waiver = Waiver {
            rule: text.rule.clone(),
            part: text.part.clone(),
            build: text.build.clone(),
            alternate: text.alternate.clone(),
            reason: text.reason.clone().unwrap_or_default(),
            by: text.by.clone(),
            until: text.until.clone(),
            state: WaiverState::Honoured,
            site,
        };
        let refuse = |message: String, hint: &str| {
            Finding::error("data.stale-waiver", site, message, hint.to_owned())
        };
        if waiver.reason.trim().is_empty() {
            waiver.state = WaiverState::Refused;
            findings.push(refuse(
                "this waiver gives no reason, so it waives nothing".to_owned(),
                "add `because \"why it is acceptable\"`",
            ));
        } else if rules::find(&waiver.rule).is_none() {
            waiver.state = WaiverState::Refused;
            findings.push(unknown_rule(&waiver.rule, site));
        } else if waiver.until.as_deref().is_some_and(|d| !is_date(d)) {
            waiver.state = WaiverState::Refused;
            findings.push(refuse(
                "this waiver's date is not understood, so it waives nothing".to_owned(),
                "write `until 2030-01-31`",
            ));
        } else if waiver
            .until
            .as_deref()
            .is_some_and(|d| d < options.today.as_str())
        {
            waiver.state = WaiverState::Expired;
            let date = waiver.until.as_deref().unwrap_or_default();
            findings.push(refuse(
                format!("this waiver ran out on {date}, so it waives nothing"),
                "settle the finding, or look again and set a later date",
            ));
        } else if !accept(&waiver, waivers.len(), builds, findings) && options.build.is_none() {
            // with one build picked out, what waives another matches nothing and is not stale
            waiver.state = WaiverState::Stale;
            let hint = "remove it, or correct the names: a waiver that matches nothing hides nothing, but misleads";
            findings.push(
                refuse("this waiver matches no finding any more".to_owned(), hint)
                    .at(Severity::Warning),
            );
        }
        waivers.push(waiver);
    }
    waivers
}

/// Mark what this waiver accepts; whether there was anything.
fn accept(
    waiver: &Waiver,
    index: usize,
    builds: &mut [BuildReport],
    findings: &mut [Finding],
) -> bool {
    let mut any = false;
    for build in builds {
        let here = waiver.build.as_ref().is_none_or(|b| *b == build.name)
            && (waiver.alternate.is_none() || waiver.alternate == build.alternate);
        if !here {
            continue;
        }
        for margin in &mut build.margins {
            if margin.rule == waiver.rule && margin.verdict != Verdict::Ok && covers(waiver, margin)
            {
                margin.waiver = Some(index);
                any = true;
            }
        }
    }
    if waiver.part.is_none() && waiver.alternate.is_none() {
        for finding in findings
            .iter_mut()
            .filter(|f| f.rule == waiver.rule && f.rule != "data.stale-waiver")
        {
            if waiver.build.is_none() || waiver.build == finding.build {
                finding.waiver = Some(index);
                any = true;
            }
        }
    }
    any
}

/// `of PART` may name the part, its block, or a designator.
fn covers(waiver: &Waiver, margin: &Margin) -> bool {
    waiver.part.as_ref().is_none_or(|part| {
        *part == margin.part.name || *part == margin.part.block || margin.part.refs.contains(part)
    })
}

/// `2030-01-31`: four, two and two digits, month and day within the calendar.
fn is_date(text: &str) -> bool {
    let parts: Vec<&str> = text.split('-').collect();
    let [year, month, day] = parts.as_slice() else {
        return false;
    };
    let digits = |s: &str, n: usize| {
        (s.len() == n && s.bytes().all(|b| b.is_ascii_digit()))
            .then(|| s.parse::<u32>().unwrap_or(0))
    };
    let (Some(year), Some(month), Some(day)) = (digits(year, 4), digits(month, 2), digits(day, 2))
    else {
        return false;
    };
    let leap = (year % 4 == 0 && year % 100 != 0) || year % 400 == 0;
    let days = match month {
        2 => 28 + u32::from(leap),
        4 | 6 | 9 | 11 => 30,
        1..=12 => 31,
        _ => return false,
    };
    (1..=days).contains(&day)
}

#[cfg(test)]
mod tests {
    use super::is_date;

    #[test]
    fn dates_are_of_the_calendar() {
        for good in ["2030-01-31", "2028-02-29", "2000-02-29"] {
            assert!(is_date(good), "{good}");
        }
        for bad in [
            "2030-1-31",
            "2030-02-29",
            "1900-02-29",
            "2030-13-01",
            "2030-00-10",
            "soon",
            "2030-04-31",
            "30-01-01",
        ] {
            assert!(!is_date(bad), "{bad}");
        }
    }
}
