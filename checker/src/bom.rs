//! A bill of materials against the spec: what is missing, what is extra, how many, and whether what
//! is ordered is what was checked. Must not know physics, nor how a finding is shown.

mod cross;
mod list;
mod reading;
mod template;
mod wanted;

use std::path::Path;

use crate::build::project::{self, Project};
use crate::build::statement::Declared;
use crate::build::view::View;
use crate::finding::{BuildReport, Margin, Severity, Site, Verdict, Waiver, Witness};
use crate::policy::{self, Policy};
use crate::rules::{self, Check};
use crate::source::{Files, Sources};
use crate::{Options, waiver};

pub use list::{COLUMNS, Column, List};
pub use wanted::Basis;

/// One thing said of the list.
#[derive(Clone, Debug, PartialEq)]
pub struct Row {
    /// `bom.quantity`.
    pub rule: &'static str,
    /// What it is about, as a template names it: `out emitter`.
    pub part: String,
    /// The block whose line wants it, empty for a row that no line wants.
    pub block: String,
    /// Designators concerned.
    pub refs: Vec<String>,
    /// The outcome; `Ok` for what is only worth knowing.
    pub verdict: Verdict,
    /// After policy.
    pub severity: Severity,
    /// What is wrong.
    pub message: String,
    /// What the spec says.
    pub spec: Option<String>,
    /// What the list says.
    pub listed: Option<String>,
    /// The line of the list.
    pub line: Option<u64>,
    /// The line of the spec.
    pub site: Option<Site>,
    /// Index into [`Crossed::waivers`] where one accepts it.
    pub waiver: Option<usize>,
}

/// A list held against a spec.
#[derive(Clone, Debug)]
pub struct Crossed {
    /// The files of the spec.
    pub sources: Sources,
    /// The build.
    pub build: String,
    /// What the quantities are for.
    pub basis: Basis,
    /// The list's name.
    pub list: String,
    /// Rows of the list that are ordered.
    pub listed: usize,
    /// Parts that the spec wants.
    pub wanted: usize,
    /// Of them, found in the list.
    pub found: usize,
    /// What is said, the loudest first, then in the order of the spec.
    pub rows: Vec<Row>,
    /// The waivers that speak of the list.
    pub waivers: Vec<Waiver>,
}

/// A list and how to read it.
#[derive(Clone, Debug)]
pub struct Against<'a> {
    /// Its name.
    pub name: &'a str,
    /// Its text.
    pub text: &'a str,
    /// Columns named by the user.
    pub columns: &'a [(Column, String)],
    /// What its quantities are for.
    pub basis: Basis,
}

/// Hold a list against one build of a spec.
///
/// # Errors
/// When the spec or the list cannot be read, or it is not clear which build is meant.
pub fn against(
    files: &dyn Files,
    path: &Path,
    shown: &str,
    options: &Options,
    given: &Against<'_>,
) -> Result<Crossed, String> {
    let list = list::read(given)?;
    let project = load(files, path, shown, options)?;
    let build = chosen(&project, options)?;
    let view = View::new(&project, build, None, &[]);
    let wanted = wanted::of(&view, given.basis)?;
    let alternates: Vec<wanted::Alternative> = alternates(&project, build)
        .filter_map(|alternate| {
            let view = View::new(&project, build, Some(alternate), &[]);
            let wanted = wanted::of(&view, given.basis).ok()?;
            Some(wanted::Alternative {
                name: alternate.name.clone(),
                wanted,
            })
        })
        .collect();
    let policy = policy_of(&view, options);
    let mut crossed = cross::cross(&project, &wanted, &alternates, &list);
    for row in &mut crossed.rows {
        row.severity = severity(&policy, row);
    }
    let waivers = apply_waivers(&project, options, &build.name, &mut crossed.rows);
    crossed
        .rows
        .sort_by_key(|r| std::cmp::Reverse((r.severity, r.verdict == Verdict::Unchecked)));
    Ok(Crossed {
        sources: project.sources.clone(),
        build: build.name.clone(),
        basis: given.basis,
        list: given.name.to_owned(),
        listed: list.rows.len(),
        wanted: wanted.len(),
        found: crossed.found,
        rows: crossed.rows,
        waivers,
    })
}

/// A list that one build of a spec wants, as comma-separated values.
///
/// # Errors
/// When the spec cannot be read, or it is not clear which build is meant.
pub fn template(
    files: &dyn Files,
    path: &Path,
    shown: &str,
    options: &Options,
    basis: Basis,
) -> Result<String, String> {
    let project = load(files, path, shown, options)?;
    let build = chosen(&project, options)?;
    let view = View::new(&project, build, None, &[]);
    Ok(template::write(&wanted::of(&view, basis)?))
}

fn load(files: &dyn Files, path: &Path, shown: &str, options: &Options) -> Result<Project, String> {
    let root = options
        .root
        .as_deref()
        .or_else(|| path.parent())
        .unwrap_or(Path::new(""));
    project::load(files, path, shown, root, policy::NAMES)
}

/// The build named, or the only one: how many parts are wanted hangs on it.
fn chosen<'p>(project: &'p Project, options: &Options) -> Result<&'p Declared, String> {
    let named = options.build.as_deref();
    let builds: Vec<&Declared> = project
        .of_kind("build")
        .filter(|b| named.is_none_or(|n| b.name == n))
        .collect();
    match (builds.as_slice(), named) {
        ([build], _) => Ok(build),
        ([], Some(name)) => Err(format!("no build is named {name}")),
        ([], None) => Err("it holds no build, so that no part is wanted".to_owned()),
        (many, _) => {
            let names: Vec<&str> = many.iter().map(|b| b.name.as_str()).collect();
            Err(format!(
                "it holds several builds; say which with --build: {}",
                names.join(", ")
            ))
        }
    }
}

/// The alternates that may be used in a build.
fn alternates<'p>(project: &'p Project, build: &'p Declared) -> impl Iterator<Item = &'p Declared> {
    crate::variants(project, Some(&build.name))
        .into_iter()
        .filter_map(|(_, alternate)| alternate)
}

fn policy_of(view: &View<'_>, options: &Options) -> Policy {
    let stated = view.seen(view.build).group("policy").and_then(|g| {
        g.slots.iter().find_map(|s| match &s.value {
            crate::build::statement::Value::Name(name) => Some(name.clone()),
            _ => None,
        })
    });
    options
        .policy
        .clone()
        .or(stated)
        .and_then(|name| Policy::named(&name, view, &mut Vec::new()))
        .or_else(|| Policy::built_in("bench"))
        .unwrap_or_else(Policy::bare)
}

/// What the policy makes of a row. A row that is only worth knowing stays so, unless the policy
/// names its rule.
fn severity(policy: &Policy, row: &Row) -> Severity {
    let Some(rule) = rules::find(row.rule) else {
        return Severity::Error;
    };
    match row.verdict {
        Verdict::Ok => policy.entry(rule).severity.unwrap_or(Severity::Information),
        verdict => policy.severity_of(rule, verdict),
    }
}

/// The waivers of the spec that speak of the list, applied as everywhere else: the rows go through
/// as the margins of one build.
fn apply_waivers(
    project: &Project,
    options: &Options,
    build: &str,
    rows: &mut Vec<Row>,
) -> Vec<Waiver> {
    let margins = rows.iter().map(|row| as_margin(row, project)).collect();
    let mut reports = [BuildReport {
        name: build.to_owned(),
        alternate: None,
        policy: String::new(),
        duty: String::new(),
        site: project.blocks.first().map_or(nowhere(), |b| b.site),
        settled: true,
        assumed: Vec::new(),
        derived: Vec::new(),
        margins,
        curves: None,
    }];
    let mut findings = Vec::new();
    let waivers = waiver::apply_to_list(project, options, &mut reports, &mut findings);
    // a waiver of a rule that also speaks without a list is judged there
    let ours = |f: &crate::finding::Finding| {
        waivers
            .iter()
            .any(|w| w.site == f.site && needs_list(&w.rule))
    };
    findings.retain(ours);
    for (row, margin) in rows.iter_mut().zip(reports.iter().flat_map(|r| &r.margins)) {
        row.waiver = margin.waiver;
    }
    rows.extend(findings.into_iter().map(|finding| Row {
        rule: finding.rule,
        part: String::new(),
        block: String::new(),
        refs: Vec::new(),
        verdict: Verdict::Thin,
        severity: finding.severity,
        message: finding.message,
        spec: None,
        listed: None,
        line: None,
        site: Some(finding.site),
        waiver: None,
    }));
    waivers
}

fn as_margin(row: &Row, project: &Project) -> Margin {
    Margin {
        id: String::new(),
        rule: row.rule,
        part: crate::finding::Part {
            name: row.part.clone(),
            block: row.block.clone(),
            refs: row.refs.clone(),
            ..crate::finding::Part::default()
        },
        // a waiver passes over what is in order; a row that is listed at all is something
        verdict: if row.verdict == Verdict::Ok {
            Verdict::Thin
        } else {
            row.verdict
        },
        severity: row.severity,
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
        site: row
            .site
            .unwrap_or_else(|| project.blocks.first().map_or(nowhere(), |b| b.site)),
        related: Vec::new(),
        changes: Vec::new(),
    }
}

fn nowhere() -> Site {
    Site {
        file: crate::finding::FileId(0),
        span: ampspec_grammar::Span::new(0, 0),
    }
}

/// Whether a rule looks at a list: without one it has nothing to say, and nothing to waive.
#[must_use]
pub fn needs_list(rule: &str) -> bool {
    rules::ALL
        .iter()
        .any(|r| r.rule.name == rule && matches!(r.check, Check::List))
}
