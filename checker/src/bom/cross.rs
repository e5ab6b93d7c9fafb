//! Rows of a list brought together with the parts that a spec wants, and compared.
//! Must not know how a list or a spec is read.

use std::collections::{BTreeSet, HashMap};

use super::Row;
use super::list::{List, Row as Listed};
use super::reading::{quantities, speed};
use super::wanted::{Alternative, Figure, Sense, Wanted};
use crate::build::project::Project;
use crate::finding::{Severity, Verdict};
use crate::quantity::{Dimension, Quantity, format_exact};

/// Relative difference up to which two values are the same value written twice.
const SAME: f64 = 1e-6;

/// What came of it.
pub(super) struct Outcome {
    /// In the order of the spec, then of the list.
    pub(super) rows: Vec<Row>,
    /// Parts that were found.
    pub(super) found: usize,
}

/// Hold a list against what is wanted.
pub(super) fn cross(
    project: &Project,
    wanted: &[Wanted],
    alternates: &[Alternative],
    list: &List,
) -> Outcome {
    let index = Index::new(wanted, alternates);
    let met: Vec<Vec<usize>> = list.rows.iter().map(|row| index.of(row)).collect();
    let mut cross = Cross {
        wanted,
        alternates,
        list,
        rows: Vec::new(),
    };
    let mut found = 0;
    for group in groups(wanted.len(), &met) {
        found += if group.rows.is_empty() {
            0
        } else {
            group.wanted.len()
        };
        cross.group(&group);
    }
    for (row, met) in list.rows.iter().zip(&met) {
        if met.is_empty() {
            cross.extra(project, row);
        }
    }
    Outcome {
        rows: cross.rows,
        found,
    }
}

/// What leads from a row to the parts it may be.
struct Index<'w> {
    wanted: &'w [Wanted],
    by_ref: HashMap<&'w str, Vec<usize>>,
    by_code: HashMap<String, Vec<usize>>,
    by_handle: HashMap<String, usize>,
}

impl<'w> Index<'w> {
    fn new(wanted: &'w [Wanted], alternates: &[Alternative]) -> Self {
        let mut index = Self {
            wanted,
            by_ref: HashMap::new(),
            by_code: HashMap::new(),
            by_handle: HashMap::new(),
        };
        for (at, one) in wanted.iter().enumerate() {
            for name in &one.refs {
                index.by_ref.entry(name).or_default().push(at);
            }
            if let Some(code) = &one.code {
                index.by_code.entry(folded(code)).or_default().push(at);
            }
            index.by_handle.insert(folded(&one.handle), at);
        }
        // a part of an alternate stands in the place of the one it replaces
        for other in alternates.iter().flat_map(|a| &a.wanted) {
            if let Some(at) = index.by_handle.get(&folded(&other.handle))
                && let Some(code) = &other.code
            {
                let places = index.by_code.entry(folded(code)).or_default();
                if !places.contains(at) {
                    places.push(*at);
                }
            }
        }
        index
    }

    /// The parts a row is: by its place in a template, by order code and designator, by designator,
    /// by order code, in this order. The type of a transistor often stands as its value, and a part
    /// without an order code is listed under its name.
    fn of(&self, row: &Listed) -> Vec<usize> {
        if let Some(at) = self.by_handle.get(&folded(&row.spec)) {
            return vec![*at];
        }
        let by_ref: BTreeSet<usize> = row
            .refs
            .iter()
            .filter_map(|r| self.by_ref.get(r.as_str()))
            .flatten()
            .copied()
            .collect();
        let by_code: BTreeSet<usize> = codes(row)
            .filter_map(|c| self.by_code.get(&c))
            .flatten()
            .copied()
            .collect();
        let both: Vec<usize> = by_ref.intersection(&by_code).copied().collect();
        if !both.is_empty() {
            return both;
        }
        if !by_ref.is_empty() {
            return by_ref.into_iter().collect();
        }
        if !by_code.is_empty() {
            return by_code.into_iter().collect();
        }
        let named = |w: &Wanted| w.code.is_none() && codes(row).any(|c| c == folded(&w.name));
        self.wanted
            .iter()
            .enumerate()
            .filter(|(_, w)| named(w))
            .map(|(at, _)| at)
            .collect()
    }
}

/// What of a row may be an order code, folded.
fn codes(row: &Listed) -> impl Iterator<Item = String> {
    std::iter::once(&row.code)
        .chain(&row.values)
        .map(|c| folded(c))
        .filter(|c| !c.is_empty())
}

/// Upper case without blanks: how order codes differ between two lists of one maker.
fn folded(text: &str) -> String {
    text.chars()
        .filter(|c| !c.is_whitespace())
        .flat_map(char::to_uppercase)
        .collect()
}

/// Parts and rows that hang together.
#[derive(Default)]
struct Group {
    wanted: Vec<usize>,
    rows: Vec<usize>,
}

/// Parts that no row joins stand alone; a row that may be several parts joins them.
fn groups(wanted: usize, met: &[Vec<usize>]) -> Vec<Group> {
    let mut root: Vec<usize> = (0..wanted).collect();
    fn top(root: &[usize], mut at: usize) -> usize {
        while let Some(next) = root.get(at).filter(|n| **n != at) {
            at = *next;
        }
        at
    }
    for parts in met {
        for pair in parts.windows(2) {
            if let [a, b] = pair {
                let (a, b) = (top(&root, *a), top(&root, *b));
                if let Some(slot) = root.get_mut(a.max(b)) {
                    *slot = a.min(b);
                }
            }
        }
    }
    let mut groups: Vec<Group> = (0..wanted).map(|_| Group::default()).collect();
    for at in 0..wanted {
        if let Some(group) = groups.get_mut(top(&root, at)) {
            group.wanted.push(at);
        }
    }
    for (row, parts) in met.iter().enumerate() {
        if let Some(first) = parts.first()
            && let Some(group) = groups.get_mut(top(&root, *first))
        {
            group.rows.push(row);
        }
    }
    groups.retain(|g| !g.wanted.is_empty());
    groups
}

struct Cross<'c> {
    wanted: &'c [Wanted],
    alternates: &'c [Alternative],
    list: &'c List,
    rows: Vec<Row>,
}

impl<'c> Cross<'c> {
    fn group(&mut self, group: &Group) {
        let wanted: Vec<&Wanted> = group
            .wanted
            .iter()
            .filter_map(|at| self.wanted.get(*at))
            .collect();
        let rows: Vec<&Listed> = group
            .rows
            .iter()
            .filter_map(|at| self.list.rows.get(*at))
            .collect();
        if rows.is_empty() {
            for one in wanted {
                self.missing(one);
            }
            return;
        }
        self.designators(&wanted, &rows);
        self.quantity(&wanted, &rows);
        for row in rows {
            self.identity(&wanted, row);
            self.polarity(&wanted, row);
            self.substitutes(&wanted, row);
        }
    }

    fn say(
        &mut self,
        rule: &'static str,
        verdict: Verdict,
        one: &Wanted,
        row: Option<&Listed>,
        message: String,
    ) {
        self.rows.push(Row {
            rule,
            part: one.handle.clone(),
            block: one.block.clone(),
            refs: if one.refs.is_empty() {
                row.map(|r| r.refs.clone()).unwrap_or_default()
            } else {
                one.refs.clone()
            },
            verdict,
            severity: Severity::Information,
            message,
            spec: Some(one.text()),
            listed: row.map(Listed::text),
            line: row.map(|r| r.line),
            site: Some(one.site),
            waiver: None,
        });
    }

    /// In the spec and not in the list; unchecked where there is nothing to look for it by.
    fn missing(&mut self, one: &Wanted) {
        let place = self.list.rows.iter().any(|r| !r.spec.is_empty());
        let named = one.handle != one.name;
        if one.refs.is_empty() && one.code.is_none() && !place && !named {
            let message =
                "neither `ref` nor `part` is stated, so that it cannot be looked for in the list"
                    .to_owned();
            self.say("bom.missing", Verdict::Unchecked, one, None, message);
        } else {
            let message = format!("the {} is not in the list", one.what);
            self.say("bom.missing", Verdict::Over, one, None, message);
        }
    }

    /// Designators that only one of the two has.
    fn designators(&mut self, wanted: &[&Wanted], rows: &[&'c Listed]) {
        let Some(first) = wanted.first() else { return };
        let ours: BTreeSet<&str> = wanted
            .iter()
            .flat_map(|w| &w.refs)
            .map(String::as_str)
            .collect();
        let theirs: BTreeSet<&str> = rows
            .iter()
            .flat_map(|r| &r.refs)
            .map(String::as_str)
            .collect();
        if ours.is_empty() || theirs.is_empty() {
            return;
        }
        // two parts of one line share its designators, and the other's rows hold the rest
        let listed = |name: &str| {
            self.list
                .rows
                .iter()
                .any(|r| r.refs.iter().any(|l| l == name))
        };
        let absent: Vec<&str> = ours.iter().copied().filter(|name| !listed(name)).collect();
        if !absent.is_empty() {
            let row = rows.first().copied();
            let already = self
                .rows
                .iter()
                .any(|r| r.rule == "bom.missing" && r.site == Some(first.site) && r.line.is_some());
            if !already {
                let message = format!("{} not in the list", are(&absent));
                self.say("bom.missing", Verdict::Over, first, row, message);
            }
        }
        for row in rows {
            let more: Vec<&str> = row
                .refs
                .iter()
                .map(String::as_str)
                .filter(|r| !ours.contains(r))
                .collect();
            if !more.is_empty() {
                let message = format!("{} not on the line of the spec", are(&more));
                self.say("bom.extra", Verdict::Over, first, Some(row), message);
            }
        }
    }

    fn quantity(&mut self, wanted: &[&Wanted], rows: &[&'c Listed]) {
        let (Some(first), Some(row)) = (wanted.first(), rows.first()) else {
            return;
        };
        if let Some((row, text)) = rows
            .iter()
            .find_map(|r| Some((r, r.bad_quantity.as_ref()?)))
        {
            let message = format!("`{text}` is no whole number");
            self.say("bom.quantity", Verdict::Over, first, Some(row), message);
            return;
        }
        let Some(listed) = rows.iter().map(|r| r.quantity).sum::<Option<u32>>() else {
            let message = "the list gives no quantity".to_owned();
            self.say(
                "bom.quantity",
                Verdict::Unchecked,
                first,
                Some(row),
                message,
            );
            return;
        };
        let counts: Option<Vec<u32>> = wanted.iter().map(|w| w.count).collect();
        let Some(counts) = counts else {
            let message =
                format!("{listed} listed; how many are needed cannot be worked out, state `qty`");
            self.say(
                "bom.quantity",
                Verdict::Unchecked,
                first,
                Some(row),
                message,
            );
            return;
        };
        let needed: u32 = counts.iter().fold(0, |sum, n| sum.saturating_add(*n));
        if listed != needed {
            let names: Vec<&str> = wanted.iter().map(|w| w.name.as_str()).collect();
            let of = if names.len() > 1 {
                format!(" of {}", names.join(" and "))
            } else {
                String::new()
            };
            let lines: Vec<String> = rows.iter().map(|r| r.line.to_string()).collect();
            let where_ = if lines.len() > 1 {
                format!(" (lines {})", lines.join(", "))
            } else {
                String::new()
            };
            let message = format!("{listed} listed{where_}, {needed} needed{of}");
            self.say("bom.quantity", Verdict::Over, first, Some(row), message);
        }
    }

    /// Order code, value and ratings of a row against the part checked, else against an alternate of
    /// it that has been checked as well.
    fn identity(&mut self, wanted: &[&'c Wanted], row: &'c Listed) {
        let faults: Vec<(&Wanted, Vec<Disagreement>)> =
            wanted.iter().map(|w| (*w, disagreements(w, row))).collect();
        let clean = |all: &[Disagreement]| all.iter().all(|d| d.verdict != Verdict::Over);
        let Some((one, told)) = faults.iter().find(|(_, d)| clean(d)).or(faults.first()) else {
            return;
        };
        if !clean(told) {
            let checked = faults.iter().find_map(|(one, _)| {
                let alternative = self.alternates.iter().find(|alternate| {
                    let same = alternate.wanted.iter().find(|a| a.handle == one.handle);
                    same.is_some_and(|a| changed(a, one) && clean(&disagreements(a, row)))
                })?;
                Some((*one, alternative.name.as_str()))
            });
            if let Some((one, name)) = checked {
                let message = format!(
                    "what is listed is that of alternate `{name}`, which has a check of its own"
                );
                self.say("bom.rating", Verdict::Ok, one, Some(row), message);
                return;
            }
        }
        for told in told.clone() {
            self.say("bom.rating", told.verdict, one, Some(row), told.message);
        }
    }

    /// `PNP` in words where an npn is wanted.
    fn polarity(&mut self, wanted: &[&Wanted], row: &Listed) {
        let text = format!("{} {}", row.values.join(" "), row.description).to_lowercase();
        let says = |names: &[&str]| {
            text.split(|c: char| !c.is_alphanumeric() && c != '-')
                .any(|w| names.contains(&w))
        };
        let kinds: [(&str, &str, &[&str]); 4] = [
            ("npn", "pnp", &["pnp"]),
            ("pnp", "npn", &["npn"]),
            ("nmos", "pmos", &["pmos", "p-channel", "p-ch"]),
            ("pmos", "nmos", &["nmos", "n-channel", "n-ch"]),
        ];
        // a row that may be either of a pair is not asked
        let [one] = wanted else { return };
        if let Some((wants, has, _)) = kinds
            .iter()
            .find(|(kind, _, other)| one.flavour == Some(kind) && says(other))
        {
            let message = format!("the list says {has} where the spec has an {wants}");
            self.say("bom.polarity", Verdict::Over, one, Some(row), message);
        }
    }

    /// Other order codes that the list allows: each must be that of an alternate.
    fn substitutes(&mut self, wanted: &[&'c Wanted], row: &'c Listed) {
        let Some(one) = wanted.first() else { return };
        for code in &row.alternates {
            let own = wanted.iter().any(|w| is(w, code));
            let checked = self.alternates.iter().any(|alternate| {
                let here = |a: &&Wanted| wanted.iter().any(|w| w.handle == a.handle);
                alternate.wanted.iter().filter(here).any(|a| is(a, code))
            });
            if !own && !checked {
                let message = format!(
                    "the list allows `{code}` as well, which no `alternate` of this build puts here: it is not checked"
                );
                self.say("bom.extra", Verdict::Over, one, Some(row), message);
            }
        }
    }

    /// In the list and not in the spec. A code that the spec knows and this build does not use is
    /// more likely a mistake than a screw is.
    fn extra(&mut self, project: &Project, row: &Listed) {
        let known = project.of_kind("device").find(|d| {
            let codes = d
                .lines
                .iter()
                .filter(|l| l.key.name == "part")
                .flat_map(|l| &l.groups);
            codes.flat_map(|g| &g.slots).any(
                |s| matches!(&s.value, crate::build::statement::Value::Text(t) if codes_of(row, t)),
            )
        });
        let (verdict, message) = match known {
            Some(device) => (
                Verdict::Thin,
                format!(
                    "device {} is not used in this build as it stands",
                    device.name
                ),
            ),
            None => (
                Verdict::Ok,
                "no line of the spec speaks of it: not checked".to_owned(),
            ),
        };
        self.rows.push(Row {
            rule: "bom.extra",
            part: row.text(),
            block: String::new(),
            refs: row.refs.clone(),
            verdict,
            severity: Severity::Information,
            message,
            spec: None,
            listed: Some(row.text()),
            line: Some(row.line),
            site: known.map(|d| d.site),
            waiver: None,
        });
    }
}

fn codes_of(row: &Listed, code: &str) -> bool {
    codes(row).any(|c| c == folded(code))
}

/// Whether a code is that of a part.
fn is(wanted: &Wanted, code: &str) -> bool {
    wanted
        .code
        .as_ref()
        .is_some_and(|c| folded(c) == folded(code))
}

/// Whether an alternate has something else in the place.
fn changed(alternative: &Wanted, base: &Wanted) -> bool {
    alternative.code != base.code || alternative.figures_text() != base.figures_text()
}

/// `R24 is`, `R24, R25 are`.
fn are(names: &[&str]) -> String {
    format!(
        "{} {}",
        names.join(", "),
        if names.len() == 1 { "is" } else { "are" }
    )
}

/// One way in which a row is not what was checked.
#[derive(Clone)]
struct Disagreement {
    verdict: Verdict,
    message: String,
}

fn disagreements(wanted: &Wanted, row: &Listed) -> Vec<Disagreement> {
    let mut out = Vec::new();
    let over = |message| Disagreement {
        verdict: Verdict::Over,
        message,
    };
    let same_code = wanted.code.as_ref().is_some_and(|code| codes_of(row, code));
    if let Some(code) = &wanted.code
        && !same_code
    {
        if !row.code.is_empty() {
            out.push(over(format!(
                "the list orders {}; the spec was checked with {code}",
                row.code
            )));
        } else if wanted.figures.is_empty() {
            out.push(Disagreement {
                verdict: Verdict::Unchecked,
                message: format!("the list gives no order code to compare with {code}"),
            });
        }
    }
    if !wanted.figures.is_empty() {
        out.extend(figures(wanted, row, same_code));
    }
    out
}

/// Value and ratings against the text of a row.
fn figures(wanted: &Wanted, row: &Listed, same_code: bool) -> Vec<Disagreement> {
    let dimensions: Vec<Dimension> = wanted
        .figures
        .iter()
        .map(|f| f.quantity.dimension)
        .collect();
    let text = if row.values.is_empty() {
        row.description.clone()
    } else {
        row.values.join(" ")
    };
    let (read, faults) = quantities(&text, &dimensions);
    let unchecked = |message| Disagreement {
        verdict: Verdict::Unchecked,
        message,
    };
    let mut out: Vec<Disagreement> = faults
        .into_iter()
        .map(|fault| {
            let readings: Vec<&str> = fault.readings.iter().map(|r| r.text.as_str()).collect();
            let readings = if readings.is_empty() {
                String::new()
            } else {
                format!(" ({})", readings.join(", or "))
            };
            unchecked(format!("{}{readings}", fault.message))
        })
        .collect();
    if let (Some(ours), Some(theirs)) = (wanted.speed, speed(&text))
        && ours != theirs
    {
        out.push(Disagreement {
            verdict: Verdict::Over,
            message: format!(
                "the list has a {theirs} fuse; the spec was checked with a {ours} one"
            ),
        });
    }
    for figure in &wanted.figures {
        let theirs: Vec<&Quantity> = read
            .iter()
            .filter(|q| q.dimension == figure.quantity.dimension)
            .collect();
        match theirs.first() {
            None if same_code || !out.is_empty() => {}
            None => out.push(unchecked(format!("the list does not say {}", figure.text))),
            Some(first) => {
                // of several figures of a kind, such as mean and surge amperes, one must be it
                let best = theirs.iter().find(|q| same(q, figure)).unwrap_or(first);
                out.extend(disagrees(best, figure));
            }
        }
    }
    out
}

fn same(theirs: &Quantity, figure: &Figure) -> bool {
    let ours = figure.quantity.value;
    (theirs.value - ours).abs() <= SAME * ours.abs().max(theirs.value.abs())
}

fn disagrees(theirs: &Quantity, figure: &Figure) -> Option<Disagreement> {
    let text = format_exact(theirs.value, theirs.dimension);
    if same(theirs, figure) {
        return looser(theirs, figure);
    }
    let above = theirs.value > figure.quantity.value;
    let better = match figure.sense {
        Sense::Equal => false,
        Sense::AtLeast => above,
        Sense::AtMost => !above,
    };
    Some(if better {
        Disagreement {
            verdict: Verdict::Ok,
            message: format!(
                "the list says {text}, which is better than the {} that was checked",
                figure.text
            ),
        }
    } else {
        Disagreement {
            verdict: Verdict::Over,
            message: format!(
                "the list says {text}; the spec was checked with {}",
                figure.text
            ),
        }
    })
}

/// The same value with more tolerance than was checked.
fn looser(theirs: &Quantity, figure: &Figure) -> Option<Disagreement> {
    let (theirs_tolerance, ours) = (theirs.tolerance?, figure.quantity.tolerance?);
    let (low, high) = theirs_tolerance.limits(theirs.value);
    let (least, most) = ours.limits(figure.quantity.value);
    let slack = SAME * figure.quantity.value.abs();
    (low < least - slack || high > most + slack).then(|| Disagreement {
        verdict: Verdict::Over,
        message: format!(
            "the list allows a wider tolerance than the {} that was checked",
            figure.text
        ),
    })
}
