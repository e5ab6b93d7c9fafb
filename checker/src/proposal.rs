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

/// A margin that is past its limit may be pushed this much further by a remedy for another, no more.
const FURTHER: f64 = 1.1;

/// Figures that hold for the one part that was measured: a part of another value has its own, so that
/// a change takes them out.
const ITS_OWN: &[(&str, &str, &[&str])] = &[("supply.fuse", "A", &["melts"])];

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
    let its_own = its_own(remedy, &line, group);
    let mut attempt = |value: f64| -> Option<(String, Arc<Vec<Margin>>)> {
        let text = written(value, quantity, remedy.series == Series::Count);
        let margins = tried.entry((slot.site, text.clone())).or_insert_with(|| {
            let changed = with_value(&line, group, remedy.slot, value, &its_own);
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
    if !clears(&after) || breaks(before, &after, &its_own) {
        return None;
    }
    let used_after = after.iter().find(|m| m.id == margin.id)?.used_percent?;
    let old = view
        .project
        .sources
        .text(slot.site.file)
        .get(slot.site.span.start..slot.site.span.end)?;
    let bought_part = kind == "device";
    let mut title = if bought_part {
        format!(
            "another {block}: `{key}` of {text} or {}",
            if remedy.up { "more" } else { "less" }
        )
    } else {
        format!("`{key}` of {block}: {text} instead of {old}")
    };
    if !its_own.is_empty() {
        title.push_str(&format!(
            ", and the `{}` of that part",
            its_own.join("`, `")
        ));
    }
    let edits = edits(view, &line, group, slot.site, &text, &its_own)?;
    let statement = statement_text(view, &line, &edits)?;
    Some(Change {
        title,
        // a data sheet is not edited: another part is bought
        statements: if bought_part {
            Vec::new()
        } else {
            vec![format!("change {block} {statement}")]
        },
        edits: if bought_part { Vec::new() } else { edits },
        used_after,
        also_moves: moves(margin, before, &after),
    })
}

/// Past its allowance, and no waiver accepts it.
pub(crate) fn stands_in_the_way(margin: &Margin) -> bool {
    matches!(margin.verdict, Verdict::Over | Verdict::Thin) && margin.waiver.is_none()
}

/// The figures that a changed line does not keep: they are those of the part that was there.
fn its_own(remedy: &Remedy, line: &Statement, group: usize) -> Vec<&'static str> {
    let listed = ITS_OWN
        .iter()
        .filter(|(key, slot, _)| *key == remedy.key && *slot == remedy.slot)
        .flat_map(|(.., own)| *own);
    let stated = |own: &&str| line.groups.get(group).is_some_and(|g| g.get(own).is_some());
    listed.copied().filter(stated).collect()
}

/// A change must not push any other margin past its rating, nor much further past one that it is past
/// already, nor leave it without a figure, unless it waits for one of the new part's own.
fn breaks(before: &[Margin], after: &[Margin], its_own: &[&str]) -> bool {
    let waits = |m: &Margin| {
        let own = |need: &String| its_own.iter().any(|own| need.ends_with(own));
        !m.needs.is_empty() && m.needs.iter().all(own)
    };
    let counted = |m: &&Margin| !m.rule.starts_with("bom.") && !m.rule.starts_with("data.");
    after.iter().filter(counted).any(|now| {
        let Some(then) = before.iter().find(|m| m.id == now.id) else {
            return now.verdict != Verdict::Ok;
        };
        let further = || match (then.used_percent, now.used_percent) {
            (Some(then), Some(now)) => now > then * FURTHER,
            (then, now) => then.is_some() && now.is_none(),
        };
        match now.verdict {
            Verdict::Over => then.verdict != Verdict::Over || further(),
            Verdict::Thin => {
                then.verdict == Verdict::Ok || (then.verdict == Verdict::Thin && further())
            }
            Verdict::Unchecked => then.verdict != Verdict::Unchecked && !waits(now),
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
    if like.form == crate::quantity::Form::Dc {
        text = text.replace(" V", " Vdc");
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

/// The line with another value in one slot, and without what was the old part's own.
pub(crate) fn with_value(
    line: &Statement,
    group: usize,
    slot: &str,
    value: f64,
    its_own: &[&str],
) -> Statement {
    let mut line = line.clone();
    if let Some(group) = line.groups.get_mut(group) {
        group.slots.retain(|s| !its_own.contains(&s.slot));
        let found = group.slots.iter_mut().find(|s| s.slot == slot);
        if let Some(Value::Quantity(q)) = found.map(|s| &mut s.value) {
            q.value = value;
        }
    }
    line
}

/// The replacements of text: the value, and taken out what is the old part's own, which its order code
/// is always. In the order of the text.
fn edits(
    view: &View<'_>,
    line: &Statement,
    group: usize,
    value: Site,
    text: &str,
    its_own: &[&str],
) -> Option<Vec<TextEdit>> {
    let group = line.groups.get(group)?;
    let whole = view.project.sources.text(value.file);
    let mut edits = vec![TextEdit {
        site: value,
        text: text.to_owned(),
    }];
    let mut take_out = |from: usize, to: usize| {
        // with the blank before it
        let from = whole
            .get(..from)
            .map_or(from, |before| before.trim_end_matches([' ', '\t']).len());
        edits.push(TextEdit {
            site: Site {
                span: ampspec_grammar::Span::new(from, to),
                ..value
            },
            text: String::new(),
        });
    };
    for own in its_own {
        let span = group.get(own)?.site.span;
        // the label stands before the figure
        let label = whole.get(..span.start)?.trim_end().strip_suffix(own)?.len();
        take_out(label, span.end);
    }
    if group.bought.part.is_some() {
        let span = group.site.span;
        let (from, to) = order_code(whole.get(span.start..span.end)?)?;
        take_out(span.start + from, span.start + to);
    }
    edits.sort_by_key(|e| e.site);
    Some(edits)
}

/// Where `part "code"` stands in a text, quotes of other texts passed over.
fn order_code(text: &str) -> Option<(usize, usize)> {
    let mut open = false;
    for (at, c) in text.char_indices() {
        match c {
            '"' => open = !open,
            'p' if !open => {
                let Some(code) = text.get(at..)?.strip_prefix("part") else {
                    continue;
                };
                let quoted = code.trim_start();
                let own_word = text.get(..at)?.ends_with(char::is_whitespace);
                if own_word && let Some(inside) = quoted.strip_prefix('"') {
                    let blanks = code.len() - quoted.len();
                    return Some((at, at + "part".len() + blanks + inside.find('"')? + 2));
                }
            }
            _ => {}
        }
    }
    None
}

/// The text of the line with the edits made, on one line.
pub(crate) fn statement_text(
    view: &View<'_>,
    line: &Statement,
    edits: &[TextEdit],
) -> Option<String> {
    // a changed line begins with `change BLOCK`; its own key is where it starts
    let whole = view.project.sources.text(line.site.file);
    let mut out = String::new();
    let mut at = line.key_site.span.start;
    for edit in edits {
        if edit.site.file != line.site.file {
            return None;
        }
        out.push_str(whole.get(at..edit.site.span.start)?);
        out.push_str(&edit.text);
        at = edit.site.span.end;
    }
    out.push_str(whole.get(at..line.site.span.end)?);
    Some(out.split_whitespace().collect::<Vec<_>>().join(" "))
}

#[cfg(test)]
mod tests {
    use crate::finding::Margin;
    use crate::testing;

    fn changes(rule: &str, text: &str) -> Vec<Margin> {
        let report = testing::changes(text);
        let margins = report.builds.into_iter().flat_map(|b| b.margins);
        margins
            .filter(|m| m.rule == rule && !m.changes.is_empty())
            .collect()
    }

    #[test]
    fn another_value_is_another_part() {
        // the order code WW2-0R22J is that of a 0R22
        let margins = changes("bias.stability", &testing::kit("tern60-mistakes"));
        let change = &margins[0].changes[0];
        assert!(
            change.statements[0].starts_with("change out emitter 0R39"),
            "{change:?}"
        );
        assert!(!change.statements[0].contains("part"), "{change:?}");
        assert!(change.edits.iter().any(|e| e.text.is_empty()));
    }

    /// The melting integral of a fuse goes with its rating: what a 6.3 A fuse lets through says
    /// nothing of a 1 A fuse.
    #[test]
    fn a_fuse_of_another_rating_has_its_own_melting_integral() {
        let margins = changes("supply.fuse-band", &testing::kit("tern60-mistakes"));
        let change = &margins[0].changes[0];
        assert_eq!(
            change.statements[0],
            "change toroid fuse mains 1 A slow tap 230 V"
        );
        assert!(
            change.title.ends_with("and the `melts` of that part"),
            "{}",
            change.title
        );
    }

    #[test]
    fn volts_of_a_relay_stay_direct() {
        let margins = changes("protection.relay-dc", &testing::kit("tern60-mistakes"));
        assert!(
            margins[0].changes[0].statements[0].contains("Vdc"),
            "{:?}",
            margins[0].changes
        );
    }

    /// Twenty volts in place of 28 clear the safe area and leave a fifth of the claimed power, of which
    /// too little is there already: that is no remedy.
    #[test]
    fn what_is_past_its_limit_is_not_pushed_further() {
        for margin in changes("soa.reactive", &testing::kit("tern60-mistakes")) {
            for change in &margin.changes {
                assert!(!change.title.contains("secondary"), "{}", change.title);
            }
        }
    }

    /// What is offered has been re-solved: written into the file, it clears the margin.
    #[test]
    fn every_change_of_the_kit_full_of_mistakes_clears_its_margin() {
        let text = testing::kit("tern60-mistakes");
        let report = testing::changes(&text);
        let mut tried = 0;
        for margin in report.builds.iter().flat_map(|b| &b.margins) {
            for change in margin.changes.iter().filter(|c| !c.edits.is_empty()) {
                let mut changed = text.clone();
                for edit in change.edits.iter().rev() {
                    changed.replace_range(edit.site.span.start..edit.site.span.end, &edit.text);
                }
                let after = testing::report(&changed);
                let now = after
                    .builds
                    .iter()
                    .flat_map(|b| &b.margins)
                    .find(|m| m.id == margin.id);
                let used = now.and_then(|m| m.used_percent);
                assert!(
                    used.is_some_and(|u| (u - change.used_after).abs() < 1e-6 * u.abs().max(1.0)),
                    "{}: {} gives {used:?}, offered {}",
                    margin.id,
                    change.title,
                    change.used_after
                );
                tried += 1;
            }
        }
        assert!(tried > 15);
    }
}
