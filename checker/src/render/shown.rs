//! From a report to the findings that people see: margins of one cause as one, unchecked margins
//! gathered by the missing key, and what is wrong with text and data. Shared by every form and by
//! the editor. Must not know where or how they are shown.

use std::cmp::Ordering;
use std::collections::HashMap;

use sha2::{Digest, Sha256};

use crate::finding::{
    BuildReport, Finding, Margin, Related, Report, Severity, Site, TextEdit, Verdict, Waiver,
};
use crate::source::Sources;

use super::figure::percent;
use super::message::{self, Detail, build_name, listed, part_name};

/// The rule under which missing data are gathered.
pub const MISSING: &str = "data.missing";
/// Margins listed under the one that leads them.
const LISTED: usize = 6;

/// A margin with the build it belongs to.
#[derive(Clone, Copy, Debug)]
pub struct Placed<'a> {
    /// The build.
    pub build: &'a BuildReport,
    /// The margin.
    pub margin: &'a Margin,
}

/// What a shown finding stands for.
#[derive(Clone, Debug)]
pub enum Origin<'a> {
    /// Margins past their allowance that share one cause, the governing one first.
    Margins(Vec<Placed<'a>>),
    /// Margins that wait for one missing key.
    Waiting(&'a str, Vec<Placed<'a>>),
    /// Text or data.
    Text(&'a Finding),
}

/// A way to settle a finding, as replacements of text.
#[derive(Clone, Debug, PartialEq)]
pub struct Fix {
    /// `3 pairs instead of 2`.
    pub title: String,
    /// The replacements, all of which belong together.
    pub edits: Vec<TextEdit>,
    /// It was re-solved and clears the margin; else it only settles how the text reads.
    pub solved: bool,
}

/// One finding as it is shown.
#[derive(Clone, Debug)]
pub struct Shown<'a> {
    /// How loud; a waived one keeps the severity it would have.
    pub severity: Severity,
    /// The rule.
    pub rule: &'a str,
    /// The line to blame.
    pub site: Site,
    /// A word or two to stand under it; may be empty.
    pub mark: String,
    /// The other lines that take part.
    pub related: &'a [Related],
    /// One line: value, limit, used, margin, verdict.
    pub message: String,
    /// Worst at, why, what would pass, what else.
    pub details: Vec<Detail>,
    /// What would settle it.
    pub fixes: Vec<Fix>,
    /// What it stands for.
    pub origin: Origin<'a>,
    /// The waiver that accepts it.
    pub waiver: Option<&'a Waiver>,
    /// The baseline holds all that it stands for.
    pub known: bool,
    /// Which of several that are otherwise alike.
    ordinal: usize,
}

impl Shown<'_> {
    /// Whether it calls for anything: no waiver accepts it, no baseline holds it.
    #[must_use]
    pub fn open(&self) -> bool {
        self.waiver.is_none() && !self.known
    }

    /// The details, one a line.
    #[must_use]
    pub fn help(&self) -> String {
        let line = |d: &Detail| {
            if d.label.is_empty() {
                d.text.clone()
            } else {
                format!("{}: {}", d.label, d.text)
            }
        };
        self.details.iter().map(line).collect::<Vec<_>>().join("\n")
    }

    /// A name that stays when lines move: from rule, build, part and key, or from the guilty text.
    #[must_use]
    pub fn fingerprint(&self, sources: &Sources) -> String {
        match &self.origin {
            Origin::Margins(of) => of
                .first()
                .map(|p| margin_fingerprint(p.build, p.margin))
                .unwrap_or_default(),
            Origin::Waiting(key, _) => fingerprint(&[MISSING, key]),
            Origin::Text(finding) => {
                let build = finding.build.as_deref().unwrap_or("-");
                fingerprint(&[
                    finding.rule,
                    build,
                    &guilty(sources, finding),
                    &self.ordinal.to_string(),
                ])
            }
        }
    }
}

/// The fingerprint of a margin: rule, build, alternate, part, block and key.
#[must_use]
pub fn margin_fingerprint(build: &BuildReport, margin: &Margin) -> String {
    let part = &margin.part;
    fingerprint(&[
        margin.rule,
        &build.name,
        build.alternate.as_deref().unwrap_or("-"),
        &part.name,
        &part.block,
        part.key,
    ])
}

/// 128 bits of SHA-256 over the words, as 32 hexadecimal digits.
fn fingerprint(words: &[&str]) -> String {
    let mut hash = Sha256::new();
    for word in words {
        hash.update(word.as_bytes());
        hash.update([0]);
    }
    hex(hash.finalize().get(..16).unwrap_or_default())
}

/// Bytes as hexadecimal digits.
#[must_use]
pub fn hex(bytes: &[u8]) -> String {
    bytes.iter().map(|b| format!("{b:02x}")).collect()
}

/// Everything to show of a report, errors first, then in the order of the text. A margin that policy
/// makes information is no finding: it stands in the margin summary.
#[must_use]
pub fn shown<'a>(sources: &Sources, report: &'a Report) -> Vec<Shown<'a>> {
    let mut all = texts(sources, report);
    all.extend(clusters(report));
    all.extend(waiting(sources, report));
    all.sort_by(|a, b| b.severity.cmp(&a.severity).then(a.site.cmp(&b.site)));
    all
}

/// The fingerprints of the findings about text and data, in their order.
#[must_use]
pub fn text_fingerprints(sources: &Sources, report: &Report) -> Vec<String> {
    texts(sources, report)
        .iter()
        .map(|s| s.fingerprint(sources))
        .collect()
}

/// The text a finding points at, with single spaces.
fn guilty(sources: &Sources, finding: &Finding) -> String {
    let text = finding.site.span.slice(sources.text(finding.site.file));
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

fn texts<'a>(sources: &Sources, report: &'a Report) -> Vec<Shown<'a>> {
    let mut seen: HashMap<(&str, Option<&str>, String), usize> = HashMap::new();
    let mut out = Vec::with_capacity(report.findings.len());
    for finding in &report.findings {
        let count = seen
            .entry((
                finding.rule,
                finding.build.as_deref(),
                guilty(sources, finding),
            ))
            .or_default();
        out.push(text(report, finding, *count));
        *count += 1;
    }
    out
}

fn text<'a>(report: &'a Report, finding: &'a Finding, ordinal: usize) -> Shown<'a> {
    let waiver = finding.waiver.and_then(|at| report.waivers.get(at));
    let mut details = Vec::new();
    if !finding.hint.is_empty() {
        details.push(Detail::new("", &finding.hint));
    }
    details.extend(
        finding
            .readings
            .iter()
            .map(|(text, means)| Detail::new("could be", format!("`{text}`: {means}"))),
    );
    details.extend(waiver.map(waived));
    let fix = |edit: &TextEdit| Fix {
        title: format!("write `{}`", edit.text.trim()),
        edits: vec![edit.clone()],
        solved: false,
    };
    Shown {
        severity: finding.severity,
        rule: finding.rule,
        site: finding.site,
        mark: String::new(),
        related: &finding.related,
        message: finding.message.clone(),
        details,
        fixes: finding.edits.iter().map(fix).collect(),
        origin: Origin::Text(finding),
        waiver,
        known: finding.known,
        ordinal,
    }
}

/// `inside a locked rack (workshop, until 2030-01-01)`.
fn waived(waiver: &Waiver) -> Detail {
    let until = waiver.until.as_ref().map(|date| format!("until {date}"));
    let signed: Vec<String> = waiver.by.iter().cloned().chain(until).collect();
    let signed = if signed.is_empty() {
        String::new()
    } else {
        format!(" ({})", signed.join(", "))
    };
    Detail::new("waived", format!("{}{signed}", waiver.reason))
}

/// What margins of one cause have in common.
#[derive(PartialEq, Eq, Hash)]
enum Cause<'a> {
    /// The change that clears them all.
    Change(Vec<(Site, &'a str)>),
    /// The same comparison at the same line, in several builds or for both polarities.
    Line(&'static str, Site),
}

impl<'a> Cause<'a> {
    fn of(margin: &'a Margin) -> Self {
        match margin.changes.first() {
            Some(change) if !change.edits.is_empty() => Self::Change(
                change
                    .edits
                    .iter()
                    .map(|e| (e.site, e.text.as_str()))
                    .collect(),
            ),
            _ => Self::Line(margin.rule, margin.site),
        }
    }
}

fn clusters(report: &Report) -> Vec<Shown<'_>> {
    let mut at: HashMap<(Cause<'_>, Option<usize>), usize> = HashMap::new();
    let mut groups: Vec<Vec<Placed<'_>>> = Vec::new();
    for build in &report.builds {
        for margin in &build.margins {
            let past = matches!(margin.verdict, Verdict::Over | Verdict::Thin);
            if !past || margin.severity == Severity::Information {
                continue;
            }
            let group = *at
                .entry((Cause::of(margin), margin.waiver))
                .or_insert(groups.len());
            if group == groups.len() {
                groups.push(Vec::new());
            }
            if let Some(group) = groups.get_mut(group) {
                group.push(Placed { build, margin });
            }
        }
    }
    groups
        .into_iter()
        .filter_map(|group| cluster(report, group))
        .collect()
}

/// The order in which margins govern: over, thin, ok by used; then unchecked.
#[must_use]
pub fn governing(a: &Margin, b: &Margin) -> Ordering {
    // past a rating of which nothing is left comes before any share, agreement without numbers last
    let none = |m: &Margin| {
        if message::nothing_left(m) {
            f64::INFINITY
        } else {
            f64::NEG_INFINITY
        }
    };
    let used = |m: &Margin| m.used_percent.unwrap_or_else(|| none(m));
    rank(b.verdict)
        .cmp(&rank(a.verdict))
        .then(used(b).total_cmp(&used(a)))
}

fn rank(verdict: Verdict) -> u8 {
    match verdict {
        Verdict::Unchecked => 0,
        Verdict::Ok => 1,
        Verdict::Thin => 2,
        Verdict::Over => 3,
    }
}

fn cluster<'a>(report: &'a Report, mut group: Vec<Placed<'a>>) -> Option<Shown<'a>> {
    group.sort_by(|a, b| governing(a.margin, b.margin));
    let lead = *group.first()?;
    let margin = lead.margin;
    let waiver = margin.waiver.and_then(|at| report.waivers.get(at));
    let (message, details) = words(lead, &group, waiver);
    let fix = |change: &crate::finding::Change| Fix {
        title: change.title.clone(),
        edits: change.edits.clone(),
        solved: true,
    };
    Some(Shown {
        severity: group
            .iter()
            .map(|p| p.margin.severity)
            .max()
            .unwrap_or(margin.severity),
        rule: margin.rule,
        site: margin.site,
        mark: message::brief(margin),
        related: &margin.related,
        message,
        details,
        fixes: margin
            .changes
            .iter()
            .filter(|c| !c.edits.is_empty())
            .map(fix)
            .collect(),
        known: group.iter().all(|p| p.margin.known),
        origin: Origin::Margins(group),
        waiver,
        ordinal: 0,
    })
}

/// The message of a cluster and the lines under it.
fn words(lead: Placed<'_>, group: &[Placed<'_>], waiver: Option<&Waiver>) -> (String, Vec<Detail>) {
    let mut details = Vec::new();
    let worst = message::worst_at(&lead.margin.witness);
    let rule = super::rule(lead.margin.rule);
    let message = match rule {
        Some(rule) => message::headline(rule, lead.margin, lead.build),
        None => format!(
            "{} in {}: {}",
            part_name(lead.margin),
            build_name(lead.build),
            message::used(lead.margin)
        ),
    };
    if !worst.is_empty() {
        details.push(Detail::new("worst at", worst));
    }
    if let Some(rule) = rule {
        details.push(Detail::new("why", message::why(rule)));
        let pass = message::would_pass(rule, lead.margin, lead.build);
        details.extend(pass.map(|text| Detail::new("would pass", text)));
    }
    let others: Vec<String> = group
        .iter()
        .skip(1)
        .take(LISTED)
        .map(|other| in_short(lead, *other))
        .collect();
    if !others.is_empty() {
        let more = group.len() - 1 - others.len();
        let more = if more > 0 {
            format!(" and {more} more")
        } else {
            String::new()
        };
        details.push(Detail::new("also", format!("{}{more}", others.join("; "))));
    }
    details.extend(waiver.map(waived));
    (message, details)
}

/// Another margin of a cluster, without what the leader already says.
fn in_short(lead: Placed<'_>, other: Placed<'_>) -> String {
    let mut text = String::new();
    if other.margin.rule != lead.margin.rule {
        text.push_str(other.margin.rule);
        text.push(' ');
    }
    if part_name(other.margin) != part_name(lead.margin) {
        text.push_str(&format!("{} ", part_name(other.margin)));
    }
    if build_name(other.build) != build_name(lead.build) {
        text.push_str(&format!("in {} ", build_name(other.build)));
    }
    let verdict = message::verdict(other.margin.verdict);
    match other.margin.used_percent {
        Some(used) => format!("{text}{} {verdict}", percent(used)),
        None => format!("{text}{verdict}"),
    }
}

/// Unchecked margins by the key they wait for; those that wait for none stand by rule and line.
fn waiting<'a>(sources: &Sources, report: &'a Report) -> Vec<Shown<'a>> {
    let mut keys: Vec<(&str, Vec<Placed<'_>>)> = Vec::new();
    let mut key_at: HashMap<&str, usize> = HashMap::new();
    let mut ended: Vec<Vec<Placed<'_>>> = Vec::new();
    let mut ended_at: HashMap<(&str, Site, &str), usize> = HashMap::new();
    for build in &report.builds {
        let open = |m: &&Margin| m.verdict == Verdict::Unchecked && m.waiver.is_none();
        for margin in build.margins.iter().filter(open) {
            let placed = Placed { build, margin };
            for need in &margin.needs {
                let at = *key_at.entry(need).or_insert(keys.len());
                if at == keys.len() {
                    keys.push((need, Vec::new()));
                }
                if let Some(key) = keys.get_mut(at) {
                    key.1.push(placed);
                }
            }
            if margin.needs.is_empty() {
                let at = *ended_at
                    .entry((margin.rule, margin.site, margin.note.as_str()))
                    .or_insert(ended.len());
                if at == ended.len() {
                    ended.push(Vec::new());
                }
                if let Some(group) = ended.get_mut(at) {
                    group.push(placed);
                }
            }
        }
    }
    let lacking = keys
        .into_iter()
        .filter_map(|(key, group)| lacking(sources, key, group));
    lacking
        .chain(ended.into_iter().filter_map(|group| cluster(report, group)))
        .collect()
}

/// One missing key and the margins that wait for it.
fn lacking<'a>(sources: &Sources, key: &'a str, group: Vec<Placed<'a>>) -> Option<Shown<'a>> {
    let first = *group.first()?;
    let (block, last) = key.rsplit_once(' ').unwrap_or(("", key));
    let count = match group.len() {
        1 => "1 margin waits".to_owned(),
        n => format!("{n} margins wait"),
    };
    let names = distinct(group.iter().map(|p| p.margin.rule.to_owned()));
    let builds = distinct(group.iter().map(|p| build_name(p.build)));
    let who = if block.is_empty() {
        String::new()
    } else {
        format!("{block} does not state ")
    };
    let stated = if block.is_empty() {
        " is not stated"
    } else {
        ""
    };
    Some(Shown {
        severity: Severity::Information,
        rule: MISSING,
        site: block_site(sources, block).unwrap_or(first.margin.site),
        mark: format!("{last} not stated"),
        related: &[],
        message: format!("{who}{last}{stated}: {count} for it, unchecked"),
        details: vec![
            Detail::new(
                "unchecked",
                format!("{} in {}", listed(&names), listed(&builds)),
            ),
            Detail::new(
                "would check",
                format!(
                    "a line `{last}` in {}",
                    if block.is_empty() {
                        "this block"
                    } else {
                        block
                    }
                ),
            ),
        ],
        fixes: Vec::new(),
        known: group.iter().all(|p| p.margin.known),
        origin: Origin::Waiting(key, group),
        waiver: None,
        ordinal: 0,
    })
}

/// Names once each, in order of appearance.
fn distinct(names: impl Iterator<Item = String>) -> Vec<String> {
    let mut out: Vec<String> = Vec::new();
    for name in names {
        if !out.contains(&name) {
            out.push(name);
        }
    }
    out
}

/// The header of the block written `device n16`.
fn block_site(sources: &Sources, block: &str) -> Option<Site> {
    let (kind, name) = block.split_once(' ')?;
    sources.iter().find_map(|(file, f)| {
        let tree = &f.tree;
        let named = |b: &&ampspec_grammar::Block| {
            b.kind.text(&tree.text) == kind && b.name().is_some_and(|n| n.text(&tree.text) == name)
        };
        tree.blocks().find(named).map(|b| Site {
            file,
            span: b.header_span,
        })
    })
}
