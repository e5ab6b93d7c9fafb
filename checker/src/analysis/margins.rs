//! Collects margins: one per declared part, rule and build, the worst of all its instances.
//! Must not know how a stress was found.

use std::collections::HashMap;

use super::case::line_part;
use crate::build::Needs;
use crate::build::parts::Field;
use crate::finding::{Margin, Measure, Part, Related, Severity, Site, Step, Verdict, Witness};
use crate::policy::Policy;
use crate::rule::{Rule, compare};

/// Relative difference of used below which two candidates tie.
const TIE: f64 = 1e-9;

/// What a part sees, ready to be compared.
#[derive(Clone, Debug, Default)]
pub struct Stress {
    /// The stress, in the rule's unit.
    pub value: f64,
    /// The rating, in the rule's unit; not read where the policy states the limit.
    pub rating: f64,
    /// Ambient, where the rule counts from it.
    pub ambient: f64,
    /// Where it is worst.
    pub witness: Witness,
    /// How the numbers were had.
    pub working: Vec<Step>,
    /// Other lines that take part.
    pub related: Vec<Related>,
    /// What the numbers do not say.
    pub note: String,
}

/// Margins of one build with one alternate.
#[derive(Debug)]
pub struct Margins<'a> {
    build: &'a str,
    alternate: Option<&'a str>,
    policy: &'a Policy,
    margins: Vec<Margin>,
    index: HashMap<String, usize>,
}

impl<'a> Margins<'a> {
    /// None yet.
    #[must_use]
    pub fn new(build: &'a str, alternate: Option<&'a str>, policy: &'a Policy) -> Self {
        Self {
            build,
            alternate,
            policy,
            margins: Vec::new(),
            index: HashMap::new(),
        }
    }

    /// All of them, in the order in which rules and parts first came.
    #[must_use]
    pub fn into_margins(self) -> Vec<Margin> {
        self.margins
    }

    /// Compare a stress, or note what it lacks. `site` is the line to blame.
    pub fn compare(
        &mut self,
        rule: &'static Rule,
        part: Part,
        site: Site,
        stress: Result<Stress, Needs>,
    ) {
        let margin = match stress {
            Err(needs) => self.unchecked(rule, part, site, needs),
            Ok(stress) => {
                let allow = self.policy.entry(rule).allow;
                match compare(rule, allow, stress.value, stress.rating, stress.ambient) {
                    None => self.unchecked(
                        rule,
                        part,
                        site,
                        Needs::because("the numbers do not make sense together"),
                    ),
                    Some(c) => Margin {
                        severity: self.policy.severity_of(rule, c.verdict),
                        stress: Some(Measure::new(stress.value, rule.unit)),
                        rating: Some(c.rating),
                        allowance: Some(c.allowance),
                        verdict: c.verdict,
                        used_percent: c.used_percent,
                        note: stress.note,
                        witness: stress.witness,
                        working: stress.working,
                        related: stress.related,
                        ..self.blank(rule, part, site)
                    },
                }
            }
        };
        self.put(margin);
    }

    /// Note that a key is not stated, where it is neither stated nor `none`; whether it was so.
    pub fn lacking<T>(&mut self, rule: &'static Rule, field: &Field<T>) -> bool {
        if field.unstated() {
            let part = line_part(field);
            self.compare(rule, part, field.site(), Err(field.missing()));
        }
        field.unstated()
    }

    /// A verdict that no comparison of numbers gives: a fault of kind (`over`), or a thing that is
    /// plainly right (`ok`), with the reason in words.
    pub fn judge(
        &mut self,
        rule: &'static Rule,
        part: Part,
        site: Site,
        verdict: Verdict,
        stress: Stress,
    ) {
        let margin = Margin {
            verdict,
            severity: self.policy.severity_of(rule, verdict),
            note: stress.note,
            witness: stress.witness,
            working: stress.working,
            related: stress.related,
            ..self.blank(rule, part, site)
        };
        self.put(margin);
    }

    fn unchecked(&self, rule: &'static Rule, part: Part, site: Site, needs: Needs) -> Margin {
        let related = needs.keys.iter().map(|n| Related {
            message: format!("`{}` is not stated", n.key),
            site: n.site,
        });
        Margin {
            verdict: Verdict::Unchecked,
            severity: Severity::Information,
            needs: needs.keys.iter().map(|n| n.key.clone()).collect(),
            note: needs.because.clone(),
            related: related.collect(),
            ..self.blank(rule, part, site)
        }
    }

    fn blank(&self, rule: &'static Rule, part: Part, site: Site) -> Margin {
        // a part whose name is not its line's is named: one line can hold two
        let line = format!("{}.{}", part.block, part.key);
        let named = part.name == format!("{} {}", part.block, part.key) || part.name == part.block;
        let part_id = if named {
            line
        } else {
            format!("{line}:{}", part.name)
        };
        Margin {
            id: format!(
                "{}/{}/{part_id}/{}",
                self.build,
                self.alternate.unwrap_or("-"),
                rule.name
            ),
            rule: rule.name,
            part,
            verdict: Verdict::Ok,
            severity: Severity::Information,
            waiver: None,
            known: false,
            stress: None,
            rating: None,
            allowance: None,
            used_percent: None,
            needs: Vec::new(),
            note: String::new(),
            witness: Witness::default(),
            working: Vec::new(),
            site,
            related: Vec::new(),
            changes: Vec::new(),
        }
    }

    /// Keep the worse of two margins with the same identity; of two that tie, the first.
    fn put(&mut self, margin: Margin) {
        let Some(at) = self.index.get(&margin.id).copied() else {
            self.index.insert(margin.id.clone(), self.margins.len());
            self.margins.push(margin);
            return;
        };
        let Some(kept) = self.margins.get_mut(at) else {
            return;
        };
        match worse(&margin, kept) {
            std::cmp::Ordering::Greater => *kept = margin,
            std::cmp::Ordering::Equal if kept.verdict == Verdict::Unchecked => {
                for (need, related) in margin.needs.into_iter().zip(margin.related) {
                    if !kept.needs.contains(&need) {
                        kept.needs.push(need);
                        kept.related.push(related);
                    }
                }
            }
            std::cmp::Ordering::Equal => {
                let place = place(&margin.witness);
                if !place.is_empty() && kept.witness.also_at.len() < 3 {
                    kept.witness.also_at.push(place);
                }
            }
            std::cmp::Ordering::Less => {}
        }
    }
}

/// Worse first by verdict, then by used; used that agree within 1e-9 tie.
fn worse(a: &Margin, b: &Margin) -> std::cmp::Ordering {
    a.verdict
        .cmp(&b.verdict)
        .then_with(|| match (a.used_percent, b.used_percent) {
            (Some(x), Some(y)) if (x - y).abs() <= TIE * x.abs().max(y.abs()) => {
                std::cmp::Ordering::Equal
            }
            (Some(x), Some(y)) => x.total_cmp(&y),
            // no rating left is worse than any figure
            (None, Some(_)) => {
                if a.verdict == Verdict::Over {
                    std::cmp::Ordering::Greater
                } else {
                    std::cmp::Ordering::Less
                }
            }
            (Some(_), None) => {
                if a.verdict == Verdict::Over {
                    std::cmp::Ordering::Less
                } else {
                    std::cmp::Ordering::Greater
                }
            }
            (None, None) => std::cmp::Ordering::Equal,
        })
}

/// Where a witness is, in few words.
fn place(witness: &Witness) -> String {
    let mut words = Vec::new();
    if let Some(load) = &witness.load {
        words.push(load.clone());
    }
    if let Some(mains) = witness.mains_v {
        words.push(format!("{mains:.0} V mains"));
    }
    words.join(", ")
}
