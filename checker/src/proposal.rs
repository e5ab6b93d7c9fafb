//! Changes that a person could make, each re-solved before it is offered.
//! Must not know any particular rule: what may be edited stands in the rule's record.

use std::collections::HashMap;
use std::sync::Arc;

use crate::build::statement::{Statement, Value};
use crate::build::view::{View, names};
use crate::finding::{AlsoMoves, Change, Margin, Site, TextEdit, Verdict};
use crate::quantity::{Dimension, Quantity, Series as Preferred, format_exact, letter_code};
use crate::rule::{Remedy, Series};
use crate::rules;

/// Most values of one series that are looked at.
const REACH: usize = 16;
/// Most changes offered for one margin.
const OFFERED: usize = 3;
/// A margin that moves by no more than this, in points, is not mentioned.
const MENTIONED: f64 = 1.0;

/// Solves a view again with extra changes, and gives all its margins.
pub type Solve<'s> = dyn Fn(&[(String, Arc<Statement>)]) -> Vec<Margin> + 's;

/// Fill in the changes of every margin that is over or thin and not waived.
pub fn fill(view: &View<'_>, margins: &mut [Margin], solve: &Solve<'_>) {
    let before: Vec<Margin> = margins.to_vec();
    // the same edit is asked about by every margin it may clear: solve it once
    let mut tried: HashMap<(Site, String), Arc<Vec<Margin>>> = HashMap::new();
    for margin in margins.iter_mut() {
        if !stands_in_the_way(margin) {
            continue;
        }
        let Some(rule) = rules::find(margin.rule) else {
            continue;
        };
        for remedy in rule.remedies {
            if margin.changes.len() >= OFFERED {
                break;
            }
            margin
                .changes
                .extend(offer(view, margin, remedy, &before, solve, &mut tried));
        }
    }
}

/// The least change of one remedy that clears the margin.
fn offer(
    view: &View<'_>,
    margin: &Margin,
    remedy: &Remedy,
    before: &[Margin],
    solve: &Solve<'_>,
    tried: &mut HashMap<(Site, String), Arc<Vec<Margin>>>,
) -> Option<Change> {
    let (kind, key) = remedy.key.split_once('.')?;
    let block = target(view, margin, kind)?;
    let seen = view.block(&block, kind)?;
    let line = seen
        .lines
        .iter()
        .find(|l| l.key.name == key && !l.none)?
        .clone();
    let (group, slot) = line
        .groups
        .iter()
        .enumerate()
        .find_map(|(at, g)| Some((at, g.get(remedy.slot)?)))?;
    let Value::Quantity(quantity) = &slot.value else {
        return None;
    };
    let values = values(remedy, quantity.value);
    let mut attempt = |value: f64| -> Option<(String, Arc<Vec<Margin>>)> {
        let text = written(value, quantity, remedy.series == Series::Count);
        let margins = tried.entry((slot.site, text.clone())).or_insert_with(|| {
            let changed = with_value(&line, group, remedy.slot, value);
            Arc::new(solve(&[(block.clone(), Arc::new(changed))]))
        });
        Some((text, margins.clone()))
    };
    let clears = |after: &[Margin]| {
        after
            .iter()
            .find(|m| m.id == margin.id)
            .is_some_and(|m| m.verdict == Verdict::Ok)
    };
    // the further, the better: if the furthest does not clear it, nothing of this series does
    let (mut low, mut high) = (0, values.len().checked_sub(1)?);
    if !clears(&attempt(*values.get(high)?)?.1) {
        return None;
    }
    while low < high {
        let middle = (low + high) / 2;
        if clears(&attempt(*values.get(middle)?)?.1) {
            high = middle;
        } else {
            low = middle + 1;
        }
    }
    let (text, after) = attempt(*values.get(high)?)?;
    if !clears(&after) || breaks(before, &after) {
        return None;
    }
    let used_after = after.iter().find(|m| m.id == margin.id)?.used_percent?;
    let old = view
        .project
        .sources
        .text(slot.site.file)
        .get(slot.site.span.start..slot.site.span.end)?;
    let bought_part = kind == "device";
    let title = if bought_part {
        format!(
            "another {block}: `{key}` of {text} or {}",
            if remedy.up { "more" } else { "less" }
        )
    } else {
        format!("`{key}` of {block}: {text} instead of {old}")
    };
    let statement = statement_text(view, &line, slot.site, &text)?;
    Some(Change {
        title,
        // a data sheet is not edited: another part is bought
        statements: if bought_part {
            Vec::new()
        } else {
            vec![format!("change {block} {statement}")]
        },
        edits: if bought_part {
            Vec::new()
        } else {
            vec![TextEdit {
                site: slot.site,
                text,
            }]
        },
        used_after,
        also_moves: moves(margin, before, &after),
    })
}

/// Past its allowance, and no waiver accepts it.
pub(crate) fn stands_in_the_way(margin: &Margin) -> bool {
    matches!(margin.verdict, Verdict::Over | Verdict::Thin) && margin.waiver.is_none()
}

/// A change must not push any other margin past its rating, or leave it without a figure.
fn breaks(before: &[Margin], after: &[Margin]) -> bool {
    let counted = |m: &&Margin| !m.rule.starts_with("bom.") && !m.rule.starts_with("data.");
    after.iter().filter(counted).any(|now| {
        let then = before.iter().find(|m| m.id == now.id);
        match now.verdict {
            Verdict::Over => then.is_none_or(|m| m.verdict != Verdict::Over),
            Verdict::Unchecked => then.is_none_or(|m| m.verdict != Verdict::Unchecked),
            Verdict::Thin => then.is_none_or(|m| m.verdict == Verdict::Ok),
            Verdict::Ok => false,
        }
    })
}

fn moves(margin: &Margin, before: &[Margin], after: &[Margin]) -> Vec<AlsoMoves> {
    let mut out = Vec::new();
    for now in after.iter().filter(|m| m.id != margin.id) {
        let then = before
            .iter()
            .find(|m| m.id == now.id)
            .and_then(|m| m.used_percent);
        if let Some((then, now_used)) = then.zip(now.used_percent)
            && (then - now_used).abs() > MENTIONED
        {
            out.push(AlsoMoves {
                id: now.id.clone(),
                used_before: then,
                used_after: now_used,
            });
        }
    }
    out
}

/// The block of a kind that a margin is about: its own block, its part, else the nearest that the
/// build reaches.
fn target(view: &View<'_>, margin: &Margin, kind: &str) -> Option<String> {
    let of_kind = |name: &str| view.block(name, kind).map(|s| s.declared.name.clone());
    if let Some(found) = of_kind(&margin.part.block).or_else(|| of_kind(&margin.part.name)) {
        return Some(found);
    }
    let mut queue = vec![margin.part.block.clone(), view.build.name.clone()];
    let mut at = 0;
    while at < queue.len() && queue.len() < 200 {
        let name = queue.get(at)?.clone();
        at += 1;
        let Some(declared) = view.project.find(view.name(&name)) else {
            continue;
        };
        if declared.kind.kind == kind {
            return Some(declared.name.clone());
        }
        for line in &view.seen(declared).lines {
            for next in names(line) {
                let next = view.name(next).to_owned();
                if !queue.contains(&next) {
                    queue.push(next);
                }
            }
        }
    }
    None
}

/// Values that can be bought or set, from the nearest outwards.
fn values(remedy: &Remedy, now: f64) -> Vec<f64> {
    let step = |series: Preferred, from: f64| {
        let next = if remedy.up {
            from * (1.0 + 1e-6)
        } else {
            from * (1.0 - 1e-6)
        };
        if remedy.up {
            series.at_or_above(next)
        } else {
            series.at_or_below(next)
        }
    };
    let series = match remedy.series {
        Series::Count => {
            let up = (1..=REACH).map(|k| now + k as f64);
            let down = (1..=REACH)
                .map(|k| now - k as f64)
                .take_while(|n| *n >= 1.0);
            return if remedy.up {
                up.collect()
            } else {
                down.collect()
            };
        }
        Series::E12 => Preferred::E12,
        Series::E24 | Series::Heatsink | Series::TwoDigits => Preferred::E24,
        Series::R10 => Preferred::FuseCurrent,
        Series::CapacitorVolts => Preferred::CapacitorVoltage,
        Series::Reservoir => Preferred::E6,
        Series::TransformerVa => Preferred::TransformerRating,
        Series::SecondaryVolts => Preferred::SecondaryVoltage,
        Series::ResistorWatts => Preferred::ResistorPower,
    };
    let mut out = Vec::new();
    let mut at = now;
    while out.len() < REACH {
        let Some(next) = step(series, at) else { break };
        out.push(next);
        at = next;
    }
    out
}

/// A value as the language spells it, in the style of the line: letter codes stay letter codes, a
/// `count` has no unit.
pub(crate) fn written(value: f64, like: &Quantity, count: bool) -> String {
    if count {
        return format!("{value}");
    }
    let mut text = match like.dimension {
        Dimension::Resistance => letter_code(value, like.dimension)
            .unwrap_or_else(|| format_exact(value, like.dimension)),
        other => format_exact(value, other),
    };
    if like.form == crate::quantity::Form::Rms {
        text = text.replace(" V", " Vac");
    }
    if let Some(tolerance) = &like.tolerance
        && let (crate::quantity::Amount::Relative(plus), crate::quantity::Amount::Relative(minus)) =
            (tolerance.plus, tolerance.minus)
    {
        let percent = |x: f64| format_exact(x, Dimension::Ratio);
        if (plus - minus).abs() < 1e-12 {
            text.push_str(&format!(" ±{}", percent(plus)));
        } else {
            text.push_str(&format!(" +{} -{}", percent(plus), percent(minus)));
        }
    }
    text
}

/// The line with another value in one slot.
pub(crate) fn with_value(line: &Statement, group: usize, slot: &str, value: f64) -> Statement {
    let mut line = line.clone();
    if let Some(found) = line
        .groups
        .get_mut(group)
        .and_then(|g| g.slots.iter_mut().find(|s| s.slot == slot))
        && let Value::Quantity(q) = &mut found.value
    {
        q.value = value;
    }
    line
}

/// The text of the line with one place replaced, on one line.
pub(crate) fn statement_text(
    view: &View<'_>,
    line: &Statement,
    place: Site,
    text: &str,
) -> Option<String> {
    // a changed line begins with `change BLOCK`; its own key is where it starts
    let whole = view.project.sources.text(line.site.file);
    if place.file != line.site.file {
        return None;
    }
    let before = whole.get(line.key_site.span.start..place.span.start)?;
    let after = whole.get(place.span.end..line.site.span.end)?;
    let joined = format!("{before}{text}{after}");
    Some(joined.split_whitespace().collect::<Vec<_>>().join(" "))
}
