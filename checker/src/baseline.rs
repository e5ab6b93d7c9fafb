//! Findings that a team has and lives with for now: a run that is given them fails on others only.
//! Must not know what any of them is about, nor how they are shown.

use std::collections::{BTreeSet, HashMap};

use serde::{Deserialize, Serialize};

use crate::Outcome;
use crate::compare::Weight;
use crate::finding::{BuildReport, Finding, Margin};
use crate::render::message::{build_name, part_name};
use crate::render::shown::{margin_fingerprint, text_fingerprints};

/// The version of the file.
const VERSION: u32 = 1;

/// One finding as it was.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Entry {
    /// The spec that was checked, relative.
    pub file: String,
    /// The rule.
    pub rule: String,
    /// What it was about, for people.
    pub about: String,
    /// Stays when lines move.
    pub fingerprint: String,
    /// How much it weighed: `error`, `warning` or `unchecked`.
    pub level: Level,
}

/// How much a finding weighed.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Level {
    /// It could not be checked.
    Unchecked,
    /// A warning.
    Warning,
    /// An error.
    Error,
}

impl Level {
    /// Of what weighs anything.
    fn of(weight: Weight) -> Option<Self> {
        match weight {
            Weight::None => None,
            Weight::Unchecked => Some(Self::Unchecked),
            Weight::Warning => Some(Self::Warning),
            Weight::Error => Some(Self::Error),
        }
    }
}

/// The file.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Baseline {
    ampspec_baseline: u32,
    /// Every finding, sorted.
    findings: Vec<Entry>,
}

impl Baseline {
    /// Everything that a run found and no waiver accepts.
    #[must_use]
    pub fn of(outcomes: &[Outcome]) -> Self {
        let mut found = BTreeSet::new();
        for outcome in outcomes {
            let file = root(outcome);
            for build in &outcome.report.builds {
                for margin in &build.margins {
                    found.extend(of_margin(file, build, margin));
                }
            }
            let texts = text_fingerprints(&outcome.sources, &outcome.report);
            for (finding, fingerprint) in outcome.report.findings.iter().zip(texts) {
                found.extend(of_finding(file, finding, fingerprint));
            }
        }
        Self {
            ampspec_baseline: VERSION,
            findings: found.into_iter().collect(),
        }
    }

    /// Read the file.
    ///
    /// # Errors
    /// When it is not a baseline, or one of a later version.
    pub fn read(text: &str) -> Result<Self, String> {
        let read: Self =
            serde_json::from_str(text).map_err(|e| format!("it is no baseline: {e}"))?;
        if read.ampspec_baseline == VERSION {
            Ok(read)
        } else {
            Err(format!(
                "it is a baseline of version {}, not {VERSION}",
                read.ampspec_baseline
            ))
        }
    }

    /// The file: one finding a line, sorted, so that a change of it reads well.
    #[must_use]
    pub fn text(&self) -> String {
        let lines: Vec<String> = self
            .findings
            .iter()
            .map(|entry| format!("    {}", serde_json::to_string(entry).unwrap_or_default()))
            .collect();
        let body = if lines.is_empty() {
            String::new()
        } else {
            format!("\n{}\n  ", lines.join(",\n"))
        };
        format!("{{\n  \"ampspec_baseline\": {VERSION},\n  \"findings\": [{body}]\n}}\n")
    }

    /// Mark what is in the baseline and weighs no more than it did. Gives the entries of the files
    /// checked that match nothing any more, and of files that `exists` says are gone.
    pub fn apply(&self, outcomes: &mut [Outcome], exists: impl Fn(&str) -> bool) -> Vec<Entry> {
        let mut entries: HashMap<(String, String), (Level, bool)> = HashMap::new();
        for entry in &self.findings {
            let key = (entry.file.clone(), entry.fingerprint.clone());
            entries.insert(key, (entry.level, false));
        }
        let mut checked: BTreeSet<String> = BTreeSet::new();
        for outcome in outcomes {
            let file = root(outcome).to_owned();
            checked.insert(file.clone());
            let mut known = |now: Option<Entry>| {
                let Some(now) = now else { return false };
                match entries.get_mut(&(file.clone(), now.fingerprint)) {
                    Some((then, seen)) => {
                        *seen = true;
                        now.level <= *then
                    }
                    None => false,
                }
            };
            let texts = text_fingerprints(&outcome.sources, &outcome.report);
            for (finding, fingerprint) in outcome.report.findings.iter_mut().zip(texts) {
                finding.known = known(of_finding(&file, finding, fingerprint));
            }
            for build in &mut outcome.report.builds {
                let marks: Vec<bool> = build
                    .margins
                    .iter()
                    .map(|m| known(of_margin(&file, build, m)))
                    .collect();
                for (margin, mark) in build.margins.iter_mut().zip(marks) {
                    margin.known = mark;
                }
            }
        }
        let unseen = |e: &&Entry| {
            let seen = entries
                .get(&(e.file.clone(), e.fingerprint.clone()))
                .is_some_and(|e| e.1);
            !seen && (checked.contains(&e.file) || !exists(&e.file))
        };
        self.findings.iter().filter(unseen).cloned().collect()
    }
}

/// The name of the spec that was checked.
fn root(outcome: &Outcome) -> &str {
    outcome.sources.iter().next().map_or("", |(_, f)| &f.name)
}

fn of_margin(file: &str, build: &BuildReport, margin: &Margin) -> Option<Entry> {
    Some(Entry {
        file: file.to_owned(),
        rule: margin.rule.to_owned(),
        about: format!("{} in {}", part_name(margin), build_name(build)),
        fingerprint: margin_fingerprint(build, margin),
        level: Level::of(Weight::of(margin))?,
    })
}

fn of_finding(file: &str, finding: &Finding, fingerprint: String) -> Option<Entry> {
    let weight = if finding.waiver.is_some() {
        Weight::None
    } else {
        Weight::from(finding.severity)
    };
    Some(Entry {
        file: file.to_owned(),
        rule: finding.rule.to_owned(),
        about: finding.message.clone(),
        fingerprint,
        level: Level::of(weight)?,
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::testing::{edited, kit, outcome};

    fn mistakes(edits: &[(&str, &str)]) -> Vec<Outcome> {
        vec![outcome(&edited(&kit("tern60-mistakes"), edits))]
    }

    fn open(outcomes: &[Outcome]) -> Vec<String> {
        let found = Baseline::of(outcomes);
        let known: BTreeSet<String> = outcomes
            .iter()
            .flat_map(|o| &o.report.builds)
            .flat_map(|b| {
                b.margins
                    .iter()
                    .filter(|m| m.known)
                    .map(move |m| margin_fingerprint(b, m))
            })
            .collect();
        found
            .findings
            .into_iter()
            .filter(|e| !known.contains(&e.fingerprint) && !e.rule.starts_with("data.unused"))
            .map(|e| e.rule)
            .collect()
    }

    #[test]
    fn what_is_in_it_is_known() {
        let mut now = mistakes(&[]);
        let base = Baseline::of(&now);
        assert!(base.findings.len() > 30);
        assert_eq!(Baseline::read(&base.text()), Ok(base.clone()));
        assert_eq!(base.apply(&mut now, |_| true), []);
        assert_eq!(open(&now), Vec::<String>::new());
    }

    /// Comments, blank lines and a part that nothing hangs on leave every fingerprint as it was.
    #[test]
    fn unrelated_edits_change_nothing() {
        let base = Baseline::of(&mistakes(&[]));
        let moved = mistakes(&[
            ("amplifier tern60", "# a comment\n\n\namplifier tern60"),
            ("muting 3 s", "muting 2 s # shorter"),
        ]);
        assert_eq!(Baseline::of(&moved), base);
    }

    #[test]
    fn what_is_new_or_worse_is_not_known_and_what_is_gone_is_stale() {
        let base = Baseline::of(&mistakes(&[]));
        // 32 V caps on 48.8 V are over where 50 V ones were thin; 5 W mends the Zobel resistor
        let mut now = mistakes(&[("50 V esr", "35 V esr"), ("8R2 1 W", "8R2 5 W")]);
        let stale = base.apply(&mut now, |_| true);
        assert!(
            stale.iter().any(|e| e.rule == "protection.zobel"),
            "{stale:?}"
        );
        assert!(
            open(&now).contains(&"voltage.reservoir".to_owned()),
            "{:?}",
            open(&now)
        );
    }

    #[test]
    fn entries_of_other_files_are_not_judged() {
        let mut base = Baseline::of(&mistakes(&[]));
        for entry in &mut base.findings {
            entry.file = "elsewhere.ampspec".to_owned();
        }
        assert_eq!(base.apply(&mut mistakes(&[]), |_| true), []);
        assert_eq!(
            base.apply(&mut mistakes(&[]), |_| false).len(),
            base.findings.len()
        );
    }

    #[test]
    fn a_file_that_is_no_baseline_says_so() {
        assert!(Baseline::read("{}").is_err());
        assert!(
            Baseline::read("{\"ampspec_baseline\": 2, \"findings\": []}")
                .unwrap_err()
                .contains("version 2")
        );
        let none = Baseline::of(&[]);
        assert_eq!(Baseline::read(&none.text()), Ok(none));
    }
}
