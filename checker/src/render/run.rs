//! One run of a command over one or more files: what is counted, and whether it fails.
//! Must not know how the run is printed.

use std::collections::HashSet;

use crate::Outcome;
use crate::baseline::Entry;
use crate::finding::{Margin, Report, Severity, Verdict};

use super::shown::{Placed, Shown, shown};

/// From where on a run fails.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum FailOn {
    /// Errors only.
    #[default]
    Error,
    /// Errors and warnings.
    Warning,
    /// Errors, warnings, and margins that could not be checked.
    Unchecked,
}

impl FailOn {
    /// As written on the command line.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Error => "error",
            Self::Warning => "warning",
            Self::Unchecked => "unchecked",
        }
    }
}

/// A severity as one word.
#[must_use]
pub fn severity(severity: Severity) -> &'static str {
    match severity {
        Severity::Error => "error",
        Severity::Warning => "warning",
        Severity::Information => "information",
    }
}

/// What a run found. Severities count what is not waived; verdicts count every margin, waived or not.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub struct Counts {
    /// Findings and margins at error.
    pub error: usize,
    /// Findings and margins at warning.
    pub warning: usize,
    /// Findings at information, margins past their allowance that policy makes information, and
    /// missing keys that margins wait for.
    pub information: usize,
    /// Margins within their allowance.
    pub ok: usize,
    /// Margins between allowance and rating.
    pub thin: usize,
    /// Margins past their rating.
    pub over: usize,
    /// Margins that could not be checked.
    pub unchecked: usize,
    /// Those of them that no waiver accepts.
    pub unchecked_open: usize,
    /// Findings and margins that a waiver accepts.
    pub waived: usize,
    /// Findings and margins that the baseline holds, counted nowhere else but by verdict.
    pub known: usize,
    /// Values used because the file does not state them, each counted once a file.
    pub assumed: usize,
    /// Builds, each alternate counted.
    pub builds: usize,
}

impl Counts {
    /// Count one report.
    #[must_use]
    pub fn of(report: &Report) -> Self {
        let mut counts = Self {
            builds: report.builds.len(),
            ..Self::default()
        };
        for finding in &report.findings {
            counts.severity(finding.severity, finding.waiver.is_some(), finding.known);
        }
        let mut assumed = HashSet::new();
        let mut waiting = HashSet::new();
        for build in &report.builds {
            assumed.extend(build.assumed.iter().map(|a| a.key.as_str()));
            for margin in &build.margins {
                counts.margin(margin, &mut waiting);
            }
        }
        counts.assumed = assumed.len();
        counts.information += waiting.len();
        counts
    }

    fn margin<'a>(&mut self, margin: &'a Margin, waiting: &mut HashSet<(&'a str, &'a str)>) {
        let waived = margin.waiver.is_some();
        match margin.verdict {
            Verdict::Ok => self.ok += 1,
            Verdict::Thin => self.thin += 1,
            Verdict::Over => self.over += 1,
            Verdict::Unchecked => self.unchecked += 1,
        }
        match margin.verdict {
            Verdict::Ok => {}
            Verdict::Unchecked if waived => self.waived += 1,
            Verdict::Unchecked if margin.known => self.known += 1,
            Verdict::Unchecked => {
                self.unchecked_open += 1;
                waiting.extend(margin.needs.iter().map(|key| ("", key.as_str())));
                if margin.needs.is_empty() {
                    waiting.insert((margin.rule, margin.note.as_str()));
                }
            }
            Verdict::Thin | Verdict::Over => self.severity(margin.severity, waived, margin.known),
        }
    }

    fn severity(&mut self, severity: Severity, waived: bool, known: bool) {
        match severity {
            _ if waived => self.waived += 1,
            _ if known => self.known += 1,
            Severity::Error => self.error += 1,
            Severity::Warning => self.warning += 1,
            Severity::Information => self.information += 1,
        }
    }

    /// Whether something stands at or above the level.
    #[must_use]
    pub fn fails(&self, at: FailOn) -> bool {
        self.error > 0
            || (at != FailOn::Error && self.warning > 0)
            || (at == FailOn::Unchecked && self.unchecked_open > 0)
    }

    /// `2 errors, 1 warning, 4 unchecked, 3 assumed, 1 waived`: always all five; what a baseline
    /// holds is added where it holds anything.
    #[must_use]
    pub fn line(&self) -> String {
        let plural = |n: usize, one: &str| format!("{n} {one}{}", if n == 1 { "" } else { "s" });
        let known = match self.known {
            0 => String::new(),
            n => format!(", {n} known"),
        };
        format!(
            "{}, {}, {} unchecked, {} assumed, {} waived{known}",
            plural(self.error, "error"),
            plural(self.warning, "warning"),
            self.unchecked,
            self.assumed,
            self.waived
        )
    }
}

impl std::ops::AddAssign for Counts {
    fn add_assign(&mut self, o: Self) {
        self.error += o.error;
        self.warning += o.warning;
        self.information += o.information;
        self.ok += o.ok;
        self.thin += o.thin;
        self.over += o.over;
        self.unchecked += o.unchecked;
        self.unchecked_open += o.unchecked_open;
        self.waived += o.waived;
        self.known += o.known;
        self.assumed += o.assumed;
        self.builds += o.builds;
    }
}

/// One run, ready to be shown.
#[derive(Debug)]
pub struct Run {
    /// The command.
    pub command: &'static str,
    /// From where on it fails.
    pub fail_on: FailOn,
    /// One for each file named, in order.
    pub outcomes: Vec<Outcome>,
    /// Over all of them.
    pub counts: Counts,
    /// Entries of the baseline that match nothing any more.
    pub stale: Vec<Entry>,
}

impl Run {
    /// Gather outcomes. What several files find in a part file they share is kept once.
    #[must_use]
    pub fn new(command: &'static str, fail_on: FailOn, mut outcomes: Vec<Outcome>) -> Self {
        let mut seen = HashSet::new();
        let several = outcomes.len() > 1;
        let mut counts = Counts::default();
        for Outcome { sources, report } in &mut outcomes {
            if several {
                report.findings.retain(|f| {
                    let Some(file) = sources.file(f.site.file) else {
                        return true;
                    };
                    f.build.is_some()
                        || seen.insert((file.path.clone(), f.site.span, f.rule, f.message.clone()))
                });
            }
            counts += Counts::of(report);
        }
        Self {
            command,
            fail_on,
            outcomes,
            counts,
            stale: Vec::new(),
        }
    }

    /// 0 where nothing stands at or above the fail level, else 1.
    #[must_use]
    pub fn exit_status(&self) -> u8 {
        u8::from(self.counts.fails(self.fail_on))
    }

    /// What is said of each entry of the baseline that matches nothing any more.
    pub fn stale_lines(&self) -> impl Iterator<Item = String> {
        self.stale.iter().map(|e| {
            format!(
                "stale in the baseline: {} {}: {}; write the baseline anew",
                e.file, e.rule, e.about
            )
        })
    }

    /// Every shown finding with the outcome it is in.
    pub fn shown(&self) -> impl Iterator<Item = (&Outcome, Shown<'_>)> {
        self.outcomes.iter().flat_map(|o| {
            shown(&o.sources, &o.report)
                .into_iter()
                .map(move |s| (o, s))
        })
    }

    /// Every margin with the outcome and build it is in.
    pub fn margins(&self) -> impl Iterator<Item = (&Outcome, Placed<'_>)> {
        self.outcomes.iter().flat_map(|outcome| {
            let placed = outcome.report.builds.iter().flat_map(|build| {
                build
                    .margins
                    .iter()
                    .map(move |margin| Placed { build, margin })
            });
            placed.map(move |p| (outcome, p))
        })
    }
}
