//! Numbers beside the lines they belong to, and the governing margin over each build and stage.
//! Must not know what a number means.

use std::collections::BTreeMap;

use ampspec_grammar::{Item, Span};

use crate::finding::{Derived, Margin, Measure, Verdict};
use crate::render::figure::figure;
use crate::render::margins::{governed, tally};
use crate::render::message;
use crate::render::shown::governing;

use super::Scene;
use super::cursor::line_at;

/// Which hints are wanted.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Wanted {
    /// Numbers solved on the way.
    pub derived: bool,
    /// The governing margin of each line.
    pub used: bool,
    /// Only numbers of these names; all where empty.
    pub names: Vec<String>,
}

impl Default for Wanted {
    fn default() -> Self {
        Self {
            derived: true,
            used: true,
            names: Vec::new(),
        }
    }
}

/// A text beside a line.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Hint {
    /// The end of the line.
    pub offset: usize,
    /// `rail idle 36.9 to 46.2 V; 87 % used`.
    pub label: String,
    /// Each number with its build, corner and load, one a line.
    pub more: String,
}

/// A line over a block.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Lens {
    /// The header of the block.
    pub span: Span,
    /// `governed by soa.reactive of n16: 91 % used`.
    pub label: String,
}

/// What is gathered for one line.
#[derive(Default)]
struct Beside<'a> {
    numbers: Vec<(&'a Derived, String)>,
    margins: Vec<(&'a Margin, String)>,
}

/// The hints of the lines in a range.
#[must_use]
pub fn hints(scene: &Scene<'_>, range: Span, wanted: &Wanted) -> Vec<Hint> {
    let mut lines: BTreeMap<usize, Beside<'_>> = BTreeMap::new();
    for (outcome, file) in scene.checks() {
        for build in &outcome.report.builds {
            let name = message::build_name(build);
            let mine =
                |name: &str| wanted.names.is_empty() || wanted.names.iter().any(|n| n == name);
            if wanted.derived {
                for number in build
                    .derived
                    .iter()
                    .filter(|d| d.site.file == file && mine(d.name))
                {
                    lines
                        .entry(end_of(scene, number.site.span))
                        .or_default()
                        .numbers
                        .push((number, name.clone()));
                }
            }
            if wanted.used {
                for margin in build
                    .margins
                    .iter()
                    .filter(|m| m.site.file == file && m.used_percent.is_some())
                {
                    lines
                        .entry(end_of(scene, margin.site.span))
                        .or_default()
                        .margins
                        .push((margin, name.clone()));
                }
            }
        }
    }
    let inside = lines
        .into_iter()
        .filter(|(offset, _)| range.touches(*offset));
    inside
        .map(|(offset, beside)| hint(offset, beside))
        .collect()
}

fn hint(offset: usize, beside: Beside<'_>) -> Hint {
    let mut names: Vec<&str> = Vec::new();
    for (number, _) in &beside.numbers {
        if !names.contains(&number.name) {
            names.push(number.name);
        }
    }
    let mut said: Vec<String> = names
        .into_iter()
        .map(|name| span_of(name, &beside.numbers))
        .collect();
    let mut more: Vec<String> = beside
        .numbers
        .iter()
        .map(|(n, build)| one(n, build))
        .collect();
    if let Some((worst, build)) = beside.margins.iter().min_by(|a, b| governing(a.0, b.0)) {
        let verdict = match worst.verdict {
            Verdict::Ok | Verdict::Unchecked => String::new(),
            verdict => format!(", {}", message::verdict(verdict)),
        };
        said.push(format!("{}{verdict}", message::brief(worst)));
        more.push(format!(
            "{} of {} in {build}: {}",
            worst.rule,
            message::part_name(worst),
            message::used(worst)
        ));
    }
    more.dedup();
    Hint {
        offset,
        label: said.join("; "),
        more: more.join("\n"),
    }
}

/// `rail idle 36.9 to 46.2 V`: from the least to the greatest of a name.
fn span_of(name: &str, numbers: &[(&Derived, String)]) -> String {
    let of_name = || {
        numbers
            .iter()
            .filter(|(n, _)| n.name == name)
            .map(|(n, _)| n.value)
    };
    let least = of_name().min_by(|a, b| a.value.total_cmp(&b.value));
    let most = of_name().max_by(|a, b| a.value.total_cmp(&b.value));
    let words = name.replace('-', " ");
    match (least.map(figure), most.map(figure)) {
        (Some(low), Some(high)) if low == high => format!("{words} {low}"),
        (Some(low), Some(high)) => format!("{words} {low} to {high}"),
        _ => words,
    }
}

fn one(number: &Derived, build: &str) -> String {
    let of = if number.of.is_empty() {
        String::new()
    } else {
        format!(" {}", number.of)
    };
    let Measure { value, unit } = number.value;
    format!(
        "{}{of}: {} in {build}, {} mains, {}",
        number.name.replace('-', " "),
        figure(Measure { value, unit }),
        number.corner.mains,
        number.corner.drive
    )
}

/// The end of the statement or header that a place is in.
fn end_of(scene: &Scene<'_>, span: Span) -> usize {
    if let Some((_, line)) = line_at(scene.tree, span.start) {
        return line.span.end;
    }
    let header = scene.tree.items.iter().find_map(|item| match item {
        Item::Block(block) if block.header_span.touches(span.start) => Some(block.open.end),
        _ => None,
    });
    header.unwrap_or(span.end)
}

/// The governing margin of each build and of each stage.
#[must_use]
pub fn lenses(scene: &Scene<'_>) -> Vec<Lens> {
    let text = scene.text();
    let mut out = Vec::new();
    for block in scene.tree.blocks() {
        let (Some(name), kind) = (block.name(), block.kind.text(text)) else {
            continue;
        };
        let name = name.text(text);
        for (outcome, file) in scene.checks() {
            let builds = &outcome.report.builds;
            if kind == "build" {
                for build in builds
                    .iter()
                    .filter(|b| b.name == name && b.site.file == file)
                {
                    let with = build
                        .alternate
                        .as_ref()
                        .map(|a| format!("with {a}: "))
                        .unwrap_or_default();
                    out.push(Lens {
                        span: block.header_span,
                        label: format!("{with}{}; {}", governed(build), tally(build)),
                    });
                }
            } else if kind == "stage" {
                let all = builds
                    .iter()
                    .flat_map(|b| b.margins.iter().map(move |m| (b, m)));
                let ranked = all.filter(|(_, m)| {
                    m.part.block == name && m.verdict != Verdict::Unchecked && m.waiver.is_none()
                });
                if let Some((build, worst)) = ranked.min_by(|a, b| governing(a.1, b.1)) {
                    let label = format!(
                        "{} of {} in {}: {}",
                        worst.rule,
                        message::part_name(worst),
                        message::build_name(build),
                        message::used(worst)
                    );
                    out.push(Lens {
                        span: block.header_span,
                        label,
                    });
                }
            }
        }
    }
    out.dedup();
    out
}
