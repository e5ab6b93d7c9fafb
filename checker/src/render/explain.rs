//! A rule in words: what it compares, why, how, from which source, from which keys, and what each
//! policy allows. Must not know any particular rule.

use std::fmt::{self, Write};

use serde::Serialize;

use crate::policy::{NAMES, Policy};
use crate::rule::{Allow, Rule, Sense};
use crate::rules;

use super::escape::{markdown as plain, markdown_code as code};
use super::figure::figure;
use super::filled;
use super::message::prose;
use crate::finding::Measure;

/// What a policy allows under a rule.
#[derive(Debug, Serialize)]
struct Allowed {
    allows: String,
    policy: String,
    source: String,
}

/// A rule for other programs. Fields in alphabetical order.
#[derive(Debug, Serialize)]
struct Record {
    allowances: Vec<Allowed>,
    compares: &'static str,
    family: &'static str,
    formula: &'static str,
    name: &'static str,
    reads: &'static [&'static str],
    sense: &'static str,
    source: &'static str,
    unit: &'static str,
    why: String,
}

fn record(rule: &Rule) -> Record {
    Record {
        allowances: allowances(rule),
        compares: rule.compares,
        family: rule.family(),
        formula: rule.formula,
        name: rule.name,
        reads: rule.reads,
        sense: sense(rule.sense),
        source: rule.source,
        unit: rule.unit,
        why: prose(rule),
    }
}

fn sense(sense: Sense) -> &'static str {
    match sense {
        Sense::AtMost => "at most",
        Sense::AtLeast => "at least",
        Sense::Temperature => "temperature",
        Sense::Fault => "fault",
    }
}

fn allowances(rule: &Rule) -> Vec<Allowed> {
    let built_in = NAMES.iter().filter_map(|name| Policy::built_in(name));
    let allowed = built_in.filter_map(|policy| {
        let entry = policy.entry(rule);
        Some(Allowed {
            allows: allows(rule, entry.allow)?,
            source: entry.source.to_owned(),
            policy: policy.name,
        })
    });
    allowed.collect()
}

/// `90 % of V(BR)CEO`.
fn allows(rule: &Rule, allow: Allow) -> Option<String> {
    let figure = |value, unit| figure(Measure::new(value, unit));
    let noun = if rule.rating.is_empty() {
        "the rating"
    } else {
        rule.rating
    };
    match allow {
        Allow::Percent(p) => Some(format!("{} of {noun}", figure(p, "%"))),
        Allow::Below(k, most) if most.is_finite() => Some(format!(
            "{noun} less {}, never above {}",
            figure(k, "K"),
            figure(most, rule.unit)
        )),
        Allow::Below(k, _) => Some(format!("{noun} less {}", figure(k, "K"))),
        Allow::Fixed(a, hard) if rule.sense == Sense::AtLeast => Some(format!(
            "{} or more; below {} it is over",
            figure(a, rule.unit),
            figure(hard, rule.unit)
        )),
        Allow::Fixed(a, hard) => Some(format!(
            "{}; above {} it is over",
            figure(a, rule.unit),
            figure(hard, rule.unit)
        )),
        Allow::None => None,
    }
}

/// One rule, as text for a terminal.
#[must_use]
pub fn terminal(rule: &Rule, width: usize) -> String {
    super::text(|out| write_terminal(out, rule, width))
}

fn write_terminal(out: &mut String, rule: &Rule, width: usize) -> fmt::Result {
    writeln!(out, "{}: {}\n", rule.name, rule.compares)?;
    filled(out, rule.why, 0, width)?;
    writeln!(out)?;
    for (label, text) in facts(rule) {
        let mut lines = String::new();
        filled(&mut lines, &text, 9, width)?;
        write!(out, "{label:<9}{}", lines.trim_start())?;
    }
    Ok(())
}

/// The facts of a rule, each with its label.
fn facts(rule: &Rule) -> Vec<(&'static str, String)> {
    let mut facts = vec![
        ("formula", rule.formula.to_owned()),
        ("source", rule.source.to_owned()),
        ("reads", rule.reads.join(", ")),
    ];
    facts.extend(allowances(rule).into_iter().map(|a| {
        (
            "allows",
            format!("{}: {} ({})", a.policy, a.allows, a.source),
        )
    }));
    facts.retain(|f| !f.1.is_empty());
    facts
}

/// Every rule, one a line.
#[must_use]
pub fn terminal_list() -> String {
    super::text(write_list)
}

fn write_list(out: &mut String) -> fmt::Result {
    let width = rules::all().map(|r| r.name.len()).max().unwrap_or(0);
    for rule in rules::all() {
        writeln!(out, "{:<width$}  {}", rule.name, rule.compares)?;
    }
    Ok(())
}

/// One rule as Markdown.
#[must_use]
pub fn markdown(rule: &Rule) -> String {
    super::text(|out| write_markdown(out, rule))
}

fn write_markdown(out: &mut String, rule: &Rule) -> fmt::Result {
    writeln!(
        out,
        "## {}\n\n{}\n\n{}\n",
        code(rule.name),
        plain(rule.compares),
        plain(&prose(rule))
    )?;
    for (label, text) in facts(rule) {
        let text = if matches!(label, "formula" | "reads") {
            code(&text)
        } else {
            plain(&text)
        };
        writeln!(out, "- {label}: {text}")?;
    }
    Ok(())
}

/// Every rule as Markdown, grouped by family.
#[must_use]
pub fn markdown_list() -> String {
    super::text(write_markdown_list)
}

fn write_markdown_list(out: &mut String) -> fmt::Result {
    writeln!(out, "| rule | compares |\n|---|---|")?;
    for rule in rules::all() {
        writeln!(out, "| {} | {} |", code(rule.name), plain(rule.compares))?;
    }
    Ok(())
}

/// Rules as JSON.
#[must_use]
pub fn json(rules: impl Iterator<Item = &'static Rule>) -> String {
    super::json::lines(&rules.map(record).collect::<Vec<_>>())
}
