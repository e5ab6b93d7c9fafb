//! Design-rule checks for class-AB audio power amplifier specs. [`check`] is the whole pipeline: read
//! it first.

pub mod analysis;
pub mod assist;
pub mod baseline;
pub mod bom;
pub mod build;
pub mod compare;
pub mod curves;
pub mod finding;
pub mod physics;
pub mod policy;
pub mod proposal;
pub mod quantity;
pub mod render;
pub mod rule;
pub mod rules;
pub mod size;
pub mod solver;
pub mod source;
pub mod spread;
pub mod tables;
#[cfg(test)]
pub(crate) mod testing;
pub mod tidy;
pub mod today;
pub mod vocabulary;
pub mod waiver;

pub use analysis::Memory;
pub use build::parts::Duty;

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use analysis::{Case, Margins, Tables, derived};
use build::parts::Reader;
use build::statement::Declared;
use build::{Project, View, project};
use finding::{Assumed, BuildReport, Finding, Margin, Report};
use policy::Policy;
use rules::Check;
use source::{Files, Sources};

/// How to check.
#[derive(Clone, Debug, Default)]
pub struct Options {
    /// A policy that replaces the one each build names.
    pub policy: Option<String>,
    /// A duty that replaces the one each build or policy states.
    pub duty: Option<Duty>,
    /// Only this build.
    pub build: Option<String>,
    /// Today, `2030-01-31`, for waivers with a date.
    pub today: String,
    /// Look for changes that clear what is over or thin. Each is re-solved, which takes time.
    pub changes: bool,
    /// Work out the points of the pictures.
    pub curves: bool,
    /// The folder that no path may leave; the folder of the file where not given.
    pub root: Option<PathBuf>,
    /// What earlier checks solved. Give the same to every check of a run: results do not depend on it.
    pub memory: Arc<Memory>,
}

/// What a check came to.
#[derive(Clone, Debug, Default)]
pub struct Outcome {
    /// The files.
    pub sources: Sources,
    /// What was found.
    pub report: Report,
}

/// Check one file and what it uses: text -> tree -> declared blocks -> typed builds -> cases ->
/// margins -> report.
///
/// # Errors
/// When the file cannot be read; the text says why.
pub fn check(
    files: &dyn Files,
    path: &Path,
    shown: &str,
    options: &Options,
) -> Result<Outcome, String> {
    let root = options
        .root
        .as_deref()
        .or_else(|| path.parent())
        .unwrap_or(Path::new(""));
    let mut project = project::load(files, path, shown, root, policy::NAMES)?;
    let mut findings = std::mem::take(&mut project.findings);
    let tables = tables::load(&project, files, &mut findings);
    let mut builds = Vec::new();
    let mut policies: Vec<Policy> = Vec::new();
    let mut reached = BTreeSet::new();
    for (build, alternate) in variants(&project, options.build.as_deref()) {
        let view = View::new(&project, build, alternate, &[]);
        let (report, policy) = solve(&view, options, &tables, &mut findings);
        if !policies.iter().any(|p| p.name == policy.name) {
            policies.push(policy);
        }
        reached.extend(view.reached());
        builds.push(report);
    }
    for registered in rules::ALL {
        if let Check::Text(check) = registered.check {
            check(&project, &mut findings);
        }
    }
    let waivers = waiver::apply(&project, options, &mut builds, &mut findings);
    if options.changes {
        for ((build, alternate), report) in variants(&project, options.build.as_deref())
            .into_iter()
            .zip(&mut builds)
        {
            let view = View::new(&project, build, alternate, &[]);
            proposal::fill(&view, &mut report.margins, &|changes| {
                let view = View::new(&project, build, alternate, changes);
                solve(&view, options, &tables, &mut Vec::new()).0.margins
            });
        }
    }
    findings.sort_by_key(|f| (f.site, f.rule));
    findings.dedup();
    let policies = policies.iter().map(Policy::report).collect();
    Ok(Outcome {
        sources: project.sources,
        report: Report {
            findings,
            builds,
            policies,
            waivers,
        },
    })
}

/// Every build, then every build with every alternate that may be used in it.
fn variants<'p>(
    project: &'p Project,
    only: Option<&str>,
) -> Vec<(&'p Declared, Option<&'p Declared>)> {
    let mut out = Vec::new();
    for build in project
        .of_kind("build")
        .filter(|b| only.is_none_or(|o| b.name == o))
    {
        out.push((build, None));
        for alternate in project.of_kind("alternate") {
            let named: Vec<&str> = alternate
                .lines
                .iter()
                .filter(|l| l.key.name == "builds" && !l.none)
                .flat_map(|l| build::view::names(l))
                .collect();
            if named.is_empty() || named.contains(&build.name.as_str()) {
                out.push((build, Some(alternate)));
            }
        }
    }
    out
}

/// Solve one view: every region, every rule.
fn solve(
    view: &View<'_>,
    options: &Options,
    tables: &Tables,
    findings: &mut Vec<Finding>,
) -> (BuildReport, Policy) {
    let reader = Reader::new(view);
    let typed = reader.build();
    let mut assumed = reader.assumed();
    let named = options
        .policy
        .clone()
        .or_else(|| typed.as_ref().ok().and_then(|b| b.policy.get().cloned()));
    let policy = named
        .and_then(|name| Policy::named(&name, view, findings))
        .or_else(|| Policy::built_in("bench"))
        .unwrap_or_else(Policy::bare);
    let mut report = BuildReport {
        name: view.build.name.clone(),
        alternate: view.alternate.map(|a| a.name.clone()),
        policy: policy.name.clone(),
        duty: policy.duty.shown.clone(),
        site: view.build.site,
        settled: true,
        assumed: Vec::new(),
        derived: Vec::new(),
        margins: Vec::new(),
        curves: None,
    };
    match typed {
        Ok(mut build) => {
            if let Some(duty) = &options.duty {
                build.duty.set(duty.clone());
            }
            if let Some(duty) = build.duty.get() {
                report.duty.clone_from(&duty.shown);
            }
            let mut margins = Margins::new(&report.name, report.alternate.as_deref(), &policy);
            let regions = build.mains.get().map(Vec::as_slice).unwrap_or_default();
            let regions: Vec<_> = if regions.is_empty() {
                vec![None]
            } else {
                regions.iter().map(Some).collect()
            };
            let mut cases = Vec::new();
            for region in regions {
                let case = Case::new(&build, &policy, region, tables, &options.memory);
                for registered in rules::ALL {
                    if let Check::Build(check) = registered.check {
                        check(&case, &mut margins);
                    }
                }
                derived::note(&case, &mut report.derived);
                extend(&mut assumed, case.assumed());
                if options.curves {
                    cases.push(case);
                }
            }
            report.margins = in_rule_order(margins.into_margins());
            if options.curves {
                let pictures = report.curves.insert(Vec::new());
                for (at, case) in cases.iter().enumerate() {
                    analysis::curves::draw(case, &report.margins, at == 0, pictures);
                }
            }
        }
        Err(needs) => {
            for need in needs.keys {
                let message = format!(
                    "build `{}` cannot be checked: `{}` is missing",
                    report.name, need.key
                );
                findings.push(Finding::error(
                    "data.missing",
                    need.site,
                    message,
                    "state it".to_owned(),
                ));
            }
            report.settled = false;
        }
    }
    report.assumed = assumed;
    (report, policy)
}

fn extend(all: &mut Vec<Assumed>, more: Vec<Assumed>) {
    for one in more {
        if !all.iter().any(|a| a.key == one.key) {
            all.push(one);
        }
    }
}

fn in_rule_order(mut margins: Vec<Margin>) -> Vec<Margin> {
    let order = |m: &Margin| rules::ALL.iter().position(|r| r.rule.name == m.rule);
    margins.sort_by_key(order);
    margins
}
