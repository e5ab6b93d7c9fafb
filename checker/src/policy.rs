//! Policies: tables of allowances. A policy is data, not code.
//! Must not know how a stress is found.

use crate::build::parts::{Duty, duty};
use crate::build::statement::{Group, Select};
use crate::build::view::View;
use crate::finding::{
    Finding, Measure, PolicyEntry, PolicyReport, Severity, Site, TextEdit, Verdict,
};
use crate::rule::{Allow, Rule};
use crate::rules;
use crate::vocabulary::nearest;

/// Which safe-area curves count.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Curve {
    /// Only the d.c. curve.
    Dc,
    /// Pulse curves where the dwell allows.
    Pulse,
}

/// Allowance and severity of one rule.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Entry {
    /// How an allowance is made out of a rating.
    pub allow: Allow,
    /// A severity that replaces the usual one.
    pub severity: Option<Severity>,
    /// Where the figure comes from.
    pub source: &'static str,
    /// The line that overrides the built-in figure.
    pub site: Option<Site>,
}

/// A policy in force.
#[derive(Clone, Debug, PartialEq)]
pub struct Policy {
    /// Its name.
    pub name: String,
    /// The policy it starts from.
    pub from: Option<String>,
    /// By rule, in the order of [`rules::ALL`].
    entries: Vec<Entry>,
    /// The duty where a build states none.
    pub duty: Duty,
    /// The angle where a load states none, degrees.
    pub angle_deg: f64,
    /// Which safe-area curves count.
    pub curve: Curve,
    /// The safe-area verdict holds at high mains, else at nominal.
    pub soa_at_high_mains: bool,
    /// What is left of a gain that is only typical.
    pub typical_gain: f64,
}

/// A built-in policy: what it changes of `bench`.
struct BuiltIn {
    name: &'static str,
    angle_deg: f64,
    soa_at_high_mains: bool,
    changes: &'static [(&'static str, Allow, &'static str)],
}

/// From memory, not confirmed in the standard's text.
const ECSS: &str = "ECSS-Q-ST-30-11C, transistors, from memory, unconfirmed";
const ECSS_DIODE: &str = "ECSS-Q-ST-30-11C, rectifiers, from memory, unconfirmed";
const ECSS_RESISTOR: &str = "ECSS-Q-ST-30-11C, wire-wound resistors, from memory, unconfirmed";
const ECSS_FUSE: &str = "ECSS-Q-ST-30-11C Rev.2 table 6-17 (cermet fuses, up to 85 degC)";
const STRICT: &str = "common practice for equipment that must not come back, no source";

const BUILT_IN: &[BuiltIn] = &[
    BuiltIn {
        name: "bench",
        angle_deg: 45.0,
        soa_at_high_mains: false,
        changes: &[],
    },
    BuiltIn {
        name: "strict",
        angle_deg: 60.0,
        soa_at_high_mains: true,
        changes: &[
            ("voltage.device", Allow::Percent(80.0), STRICT),
            ("voltage.driver", Allow::Percent(80.0), STRICT),
            ("voltage.voltage-stage", Allow::Percent(80.0), STRICT),
            ("voltage.reservoir", Allow::Percent(80.0), STRICT),
            ("voltage.rectifier-reverse", Allow::Percent(50.0), STRICT),
            ("current.device-peak", Allow::Percent(70.0), STRICT),
            ("current.transformer-duty", Allow::Percent(70.0), STRICT),
            ("current.reservoir-ripple", Allow::Percent(80.0), STRICT),
            ("soa.resistive", Allow::Percent(100.0), STRICT),
            ("soa.reactive", Allow::Percent(100.0), STRICT),
            (
                "thermal.junction",
                Allow::Below(40.0, f64::INFINITY),
                STRICT,
            ),
            ("thermal.sink", Allow::Fixed(70.0, 90.0), STRICT),
            ("bias.stability", Allow::Fixed(0.5, 1.0), STRICT),
        ],
    },
    BuiltIn {
        name: "ecss",
        angle_deg: 45.0,
        soa_at_high_mains: false,
        changes: &[
            ("voltage.device", Allow::Percent(75.0), ECSS),
            ("voltage.driver", Allow::Percent(75.0), ECSS),
            ("voltage.voltage-stage", Allow::Percent(75.0), ECSS),
            ("voltage.gate", Allow::Percent(75.0), ECSS),
            (
                "voltage.rectifier-reverse",
                Allow::Percent(75.0),
                ECSS_DIODE,
            ),
            ("current.device-peak", Allow::Percent(75.0), ECSS),
            ("current.rectifier-mean", Allow::Percent(75.0), ECSS_DIODE),
            ("current.emitter-mean", Allow::Percent(60.0), ECSS_RESISTOR),
            ("thermal.resistor", Allow::Percent(60.0), ECSS_RESISTOR),
            ("soa.resistive", Allow::Percent(65.0), ECSS),
            ("soa.reactive", Allow::Percent(65.0), ECSS),
            ("thermal.junction", Allow::Below(40.0, 110.0), ECSS),
            ("current.fuse-rms", Allow::Percent(65.0), ECSS_FUSE),
        ],
    },
];

/// Names of the built-in policies.
pub const NAMES: &[&str] = &["bench", "strict", "ecss"];

impl Policy {
    /// The built-in policy of this name.
    #[must_use]
    pub fn built_in(name: &str) -> Option<Self> {
        let built_in = BUILT_IN.iter().find(|p| p.name == name)?;
        let entries = rules::ALL.iter().map(|r| {
            let change = built_in.changes.iter().find(|c| c.0 == r.rule.name);
            let (allow, source) =
                change.map_or((r.rule.allow, r.rule.allow_source), |c| (c.1, c.2));
            Entry {
                allow,
                severity: None,
                source,
                site: None,
            }
        });
        Some(Self {
            name: name.to_owned(),
            entries: entries.collect(),
            angle_deg: built_in.angle_deg,
            soa_at_high_mains: built_in.soa_at_high_mains,
            ..Self::bare()
        })
    }

    /// A policy of the rules' own allowances, should no built-in one be found.
    #[must_use]
    pub fn bare() -> Self {
        Self {
            name: "bench".to_owned(),
            from: None,
            entries: Vec::new(),
            duty: Duty {
                fraction: 0.125,
                shown: "1/8".to_owned(),
            },
            angle_deg: 45.0,
            curve: Curve::Dc,
            soa_at_high_mains: false,
            typical_gain: 0.5,
        }
    }

    /// The policy of this name as a view sees it: built in, or declared on top of one. What its
    /// lines get wrong is said in `findings`.
    #[must_use]
    pub fn named(name: &str, view: &View<'_>, findings: &mut Vec<Finding>) -> Option<Self> {
        if let Some(policy) = Self::built_in(name) {
            return Some(policy);
        }
        let seen = view.block(name, "policy")?;
        // the chain of `from` ends at a built-in name, which `seen` has no lines of
        let mut base = seen.declared;
        let mut from = base.from.as_ref()?.0.as_str();
        for _ in 0..64 {
            match view.project.find(from).filter(|d| d.kind.kind == "policy") {
                Some(next) => {
                    base = next;
                    from = base.from.as_ref()?.0.as_str();
                }
                None => break,
            }
        }
        let mut policy = Self::built_in(from)?;
        policy.name = name.to_owned();
        policy.from = seen.declared.from.as_ref().map(|f| f.0.clone());
        for line in &seen.lines {
            let Some(group) = line.groups.first() else {
                continue;
            };
            match (line.key.name, &line.select) {
                ("allow", Some(Select::Rule(rule))) => {
                    policy.allow(rule, group, line.site, findings)
                }
                ("severity", Some(Select::Rule(rule))) => {
                    policy.severity(rule, group, line.site, findings)
                }
                ("duty", _) => policy.duty = duty(group).unwrap_or(policy.duty),
                ("angle", _) => policy.angle_deg = group.number("deg").unwrap_or(policy.angle_deg),
                ("curve", _) if group.word("dc") == Some("pulse") => policy.curve = Curve::Pulse,
                ("curve", _) => policy.curve = Curve::Dc,
                // another way to write the allowance of that rule
                ("detector-time", _) => {
                    policy.allow("protection.dc-fault-time", group, line.site, findings)
                }
                _ => {}
            }
        }
        Some(policy)
    }

    fn index(rule: &str) -> Option<usize> {
        rules::ALL.iter().position(|r| r.rule.name == rule)
    }

    /// Allowance and severity of a rule.
    #[must_use]
    pub fn entry(&self, rule: &Rule) -> Entry {
        let known = Self::index(rule.name)
            .and_then(|at| self.entries.get(at))
            .copied();
        known.unwrap_or(Entry {
            allow: rule.allow,
            severity: None,
            source: rule.allow_source,
            site: None,
        })
    }

    /// The severity of a margin with this verdict.
    #[must_use]
    pub fn severity_of(&self, rule: &Rule, verdict: Verdict) -> Severity {
        let usual = match verdict {
            Verdict::Over => Severity::Error,
            Verdict::Thin => Severity::Warning,
            Verdict::Unchecked | Verdict::Ok => return Severity::Information,
        };
        self.entry(rule).severity.unwrap_or(usual)
    }

    fn rule(&mut self, rule: &str, site: Site, findings: &mut Vec<Finding>) -> Option<&mut Entry> {
        let at = Self::index(rule);
        if at.is_none() {
            findings.push(unknown_rule(rule, site));
        }
        at.and_then(|at| self.entries.get_mut(at))
    }

    fn allow(&mut self, rule: &str, group: &Group, site: Site, findings: &mut Vec<Finding>) {
        let Some(entry) = self.rule(rule, site, findings) else {
            return;
        };
        let (percent, kelvin) = (group.number("%").map(|p| p * 100.0), group.number("K"));
        let number = group.number("num").or(group.number("s"));
        let wanted = match (entry.allow, percent, kelvin, number) {
            (Allow::Percent(_), Some(p), None, None) if p > 0.0 => Ok(Allow::Percent(p)),
            (Allow::Below(_, cap), None, Some(k), None) if k >= 0.0 => Ok(Allow::Below(k, cap)),
            (Allow::Fixed(_, hard), None, None, Some(n)) => Ok(Allow::Fixed(n, hard)),
            (Allow::Percent(_), ..) => Err("a share of the rating: `75 %`"),
            (Allow::Below(..), ..) => Err("how far below the rated temperature: `25 K`"),
            (Allow::Fixed(..), ..) => Err("a plain number in the rule's unit"),
            (Allow::None, ..) => Err("nothing: this rule compares no stress; use `severity`"),
        };
        match wanted {
            Ok(allow) => {
                *entry = Entry {
                    allow,
                    source: "this policy's own line",
                    site: Some(site),
                    ..*entry
                }
            }
            Err(what) => findings.push(Finding::error(
                "syntax.value",
                site,
                format!("`allow {rule}` does not take that"),
                format!("it takes {what}"),
            )),
        }
    }

    fn severity(&mut self, rule: &str, group: &Group, site: Site, findings: &mut Vec<Finding>) {
        let Some(entry) = self.rule(rule, site, findings) else {
            return;
        };
        entry.severity = match group.word("error") {
            Some("error") => Some(Severity::Error),
            Some("warning") => Some(Severity::Warning),
            Some("information") => Some(Severity::Information),
            _ => entry.severity,
        };
    }

    /// The table as reports show it.
    #[must_use]
    pub fn report(&self) -> PolicyReport {
        let entries = rules::ALL
            .iter()
            .zip(&self.entries)
            .map(|(registered, entry)| {
                let (value, unit) = match entry.allow {
                    Allow::Percent(p) => (p, "%"),
                    Allow::Below(k, _) => (k, "K"),
                    Allow::Fixed(n, _) => (n, registered.rule.unit),
                    Allow::None => return None,
                };
                let severity = entry.severity.unwrap_or(Severity::Error);
                Some(PolicyEntry {
                    rule: registered.rule.name,
                    allowance: Measure::new(value, unit),
                    severity,
                    source: entry.source,
                    site: entry.site,
                })
            });
        PolicyReport {
            name: self.name.clone(),
            from: self.from.clone(),
            entries: entries.flatten().collect(),
        }
    }
}

/// A rule name that no rule has.
#[must_use]
pub fn unknown_rule(rule: &str, site: Site) -> Finding {
    let near = nearest(rule, rules::ALL.iter().map(|r| r.rule.name));
    let hint = match near.first() {
        Some(best) => format!("did you mean `{best}`? `derate explain` lists the rules"),
        None => "`derate explain` lists the rules".to_owned(),
    };
    let mut finding = Finding::error(
        "data.unknown-rule",
        site,
        format!("no rule is called `{rule}`"),
        hint,
    );
    finding.edits = near
        .iter()
        .map(|n| TextEdit {
            site,
            text: (*n).to_owned(),
        })
        .collect();
    finding
}
