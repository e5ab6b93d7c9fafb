//! What would settle a finding, as edits: re-solved changes, corrected words and units, lines for
//! missing keys, waivers to fill in. Must not know any particular rule.

use std::path::Path;

use ampspec_grammar::{Block, Span};

use crate::Outcome;
use crate::finding::{FileId, Severity, TextEdit};
use crate::render::shown::{Origin, Shown, shown};
use crate::rules;
use crate::vocabulary::{Key, block_kind};

use super::Scene;
use super::web::Spot;

/// A way to settle something.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fix {
    /// In words.
    pub title: String,
    /// What is replaced by what, across files; all of it belongs together.
    pub edits: Vec<(Spot, String)>,
    /// The finding it settles: its rule, message and place in this file.
    pub settles: Option<(String, String, Span)>,
    /// It was re-solved, or is the one correction there is.
    pub preferred: bool,
}

/// Whether a change could clear a finding that touches this range, so that it is worth solving again.
#[must_use]
pub fn worth_solving(scene: &Scene<'_>, range: Span) -> bool {
    scene.checks().any(|(outcome, file)| {
        touching(outcome, file, range).iter().any(|s| {
            let past = matches!(&s.origin, Origin::Margins(of) if of.iter().any(|p| p.margin.used_percent.is_some()));
            past && s.waiver.is_none() && rules::find(s.rule).is_some_and(|r| !r.remedies.is_empty())
        })
    })
}

/// Every fix of the findings that touch a range, the re-solved ones first, then what a block lacks.
#[must_use]
pub fn fixes(scene: &Scene<'_>, range: Span) -> Vec<Fix> {
    let mut out: Vec<Fix> = Vec::new();
    let mut waivers = Vec::new();
    for (outcome, file) in scene.checks() {
        for finding in touching(outcome, file, range) {
            let settles = Some((
                finding.rule.to_owned(),
                finding.message.clone(),
                finding.site.span,
            ));
            let only = finding.fixes.len() == 1;
            for fix in &finding.fixes {
                let edits = fix
                    .edits
                    .iter()
                    .filter_map(|e| placed(outcome, e))
                    .collect();
                out.push(Fix {
                    title: fix.title.clone(),
                    edits,
                    settles: settles.clone(),
                    preferred: fix.solved || only,
                });
            }
            if let Origin::Waiting(key, _) = &finding.origin {
                out.extend(missing(outcome, key).map(|f| Fix {
                    settles: settles.clone(),
                    ..f
                }));
            }
            waivers.extend(waiver(outcome, &finding).map(|f| Fix { settles, ..f }));
        }
    }
    out.extend(required(scene, range));
    out.extend(waivers);
    let mut seen: Vec<(String, Vec<(Spot, String)>)> = Vec::new();
    out.retain(|f| {
        let key = (f.title.clone(), f.edits.clone());
        let fresh = !f.edits.is_empty() && !seen.contains(&key);
        seen.push(key);
        fresh
    });
    out
}

fn touching(outcome: &Outcome, file: FileId, range: Span) -> Vec<Shown<'_>> {
    let mut all = shown(&outcome.sources, &outcome.report);
    all.retain(|s| {
        s.site.file == file && s.site.span.start <= range.end && range.start <= s.site.span.end
    });
    all
}

fn placed(outcome: &Outcome, edit: &TextEdit) -> Option<(Spot, String)> {
    let file = outcome.sources.file(edit.site.file)?;
    Some((
        Spot {
            path: file.path.clone(),
            span: edit.site.span,
        },
        edit.text.clone(),
    ))
}

/// A waiver to fill in, at the end of the file that the check started from. Its reason is left empty,
/// and a waiver without a reason waives nothing.
fn waiver(outcome: &Outcome, finding: &Shown<'_>) -> Option<Fix> {
    if finding.waiver.is_some()
        || rules::find(finding.rule).is_none()
        || finding.rule.starts_with("syntax.")
    {
        return None;
    }
    let scope = match &finding.origin {
        Origin::Margins(of) => {
            let lead = of.first()?;
            let part = &lead.margin.part;
            let name = if part.name.is_empty() || part.name.contains(' ') {
                &part.block
            } else {
                &part.name
            };
            let with = lead
                .build
                .alternate
                .as_ref()
                .map(|a| format!(" with {a}"))
                .unwrap_or_default();
            let of = if name.is_empty() {
                String::new()
            } else {
                format!(" of {name}")
            };
            format!("{of} in {}{with}", lead.build.name)
        }
        Origin::Text(text)
            if text.rule.starts_with("data.") && text.severity > Severity::Information =>
        {
            text.build
                .as_ref()
                .map(|b| format!(" in {b}"))
                .unwrap_or_default()
        }
        Origin::Text(_) | Origin::Waiting(..) => return None,
    };
    let (_, root) = outcome.sources.iter().next()?;
    let text = &root.tree.text;
    let gap = if text.is_empty() || text.ends_with('\n') {
        ""
    } else {
        "\n"
    };
    let line = format!("{gap}waive {}{scope} because \"\" by \"\"\n", finding.rule);
    let spot = Spot {
        path: root.path.clone(),
        span: Span::at(text.len()),
    };
    Some(Fix {
        title: format!(
            "waive {}{scope}: the reason is yours to write",
            finding.rule
        ),
        edits: vec![(spot, line)],
        settles: None,
        preferred: false,
    })
}

/// A line for a missing key, written `device n16 junction-case`.
fn missing(outcome: &Outcome, need: &str) -> Option<Fix> {
    let mut words = need.split(' ');
    let (kind, name, key) = (block_kind(words.next()?)?, words.next()?, words.next()?);
    let key = kind.key(key)?;
    outcome.sources.iter().find_map(|(_, file)| {
        let text = &file.tree.text;
        let named = |b: &&Block| {
            b.kind.text(text) == kind.kind && b.name().is_some_and(|n| n.text(text) == name)
        };
        let block = file.tree.blocks().find(named)?;
        // the line is there and lacks an item: a second one would replace it
        let stated = block.lines.iter().any(|l| l.key.text(text) == key.name);
        if stated && key.shape().selector.is_none() {
            return None;
        }
        let edits = lines_into(&file.path, text, block, &[key]);
        Some(Fix {
            title: format!(
                "add `{}` to {} {name}, value to be filled in",
                key.name, kind.kind
            ),
            edits,
            settles: None,
            preferred: false,
        })
    })
}

/// The required keys that a block in the range lacks.
fn required(scene: &Scene<'_>, range: Span) -> Option<Fix> {
    let text = scene.text();
    let block = scene
        .tree
        .blocks()
        .find(|b| b.span.start <= range.start && range.start <= b.span.end)?;
    let kind = block_kind(block.kind.text(text))?;
    if block.header.iter().any(|t| t.text(text) == "from") {
        return None;
    }
    let stated = |key: &Key| block.lines.iter().any(|l| l.key.text(text) == key.name);
    let lacking: Vec<&Key> = kind
        .keys
        .iter()
        .filter(|k| k.default == "req" && !stated(k))
        .collect();
    if lacking.is_empty() {
        return None;
    }
    let names: Vec<String> = lacking.iter().map(|k| format!("`{}`", k.name)).collect();
    let edits = lines_into(scene.path, text, block, &lacking);
    Some(Fix {
        title: format!("add {}, values to be filled in", names.join(", ")),
        edits,
        settles: None,
        preferred: false,
    })
}

/// Lines with a key and no value, at the end of a block. A line without its value is an error until
/// it is filled in: no number is ever made up.
fn lines_into(path: &Path, text: &str, block: &Block, keys: &[&Key]) -> Vec<(Spot, String)> {
    let lines: String = keys.iter().map(|k| format!("    {} \n", k.name)).collect();
    let edit = |span, text| {
        vec![(
            Spot {
                path: path.to_path_buf(),
                span,
            },
            text,
        )]
    };
    let Some(close) = block.close else {
        let end = block.span.end;
        return edit(Span::at(end), format!("\n{}", lines.trim_end_matches('\n')));
    };
    let inside = Span::new(block.open.end, close.start);
    if inside.slice(text).contains('\n') {
        let start = text
            .get(..close.start)
            .and_then(|t| t.rfind('\n'))
            .map_or(close.start, |at| at + 1);
        return edit(Span::at(start), lines);
    }
    let kept = inside.slice(text).trim();
    let kept = if kept.is_empty() {
        String::new()
    } else {
        format!("    {kept}\n")
    };
    edit(inside, format!("\n{kept}{lines}"))
}
