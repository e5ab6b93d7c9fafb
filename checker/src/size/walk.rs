//! Sizing a build that states its parts: each value in place, everything else as the file says.
//! Must not know how the answer is shown.

use std::collections::{BTreeSet, HashMap};
use std::sync::Arc;

use super::item::{ITEMS, Item, nearest};
use super::{Left, Row, Sized, blocking, fails, left, moved};
use crate::build::statement::{Declared, Select, Statement, Value};
use crate::finding::{Margin, Measure, Site, TextEdit};
use crate::proposal::{statement_text, with_value, written};
use crate::quantity::Quantity;
use crate::solver::Solver;

/// A value of a line, to be tried at others.
struct Place<'i> {
    item: &'i Item,
    block: String,
    line: Arc<Statement>,
    group: usize,
    stated: Quantity,
    site: Site,
}

/// Size every thing that a build states.
pub(super) fn in_place(solver: &Solver, build: &Declared, sized: &mut Sized) {
    let base = solver.solve(build, &[]).margins;
    let mut touched = BTreeSet::new();
    for item in ITEMS {
        for place in places(solver, build, item) {
            let mut trial = Trial {
                solver,
                build,
                place: &place,
                values: (item.values)(),
                known: HashMap::new(),
            };
            sized.rows.push(trial.row(&base, &mut touched));
        }
    }
    let open = base.iter().filter(|m| fails(m) && !touched.contains(&m.id));
    sized
        .elsewhere
        .extend(open.map(|m| (build.name.clone(), Left::of(m))));
}

/// Every place where a build states a thing: a fuse for each tap, a sink for each that it has.
fn places<'i>(solver: &Solver, build: &Declared, item: &'i Item) -> Vec<Place<'i>> {
    let (kind, key) = item.key;
    let mut out = Vec::new();
    for seen in solver
        .blocks(build)
        .into_iter()
        .filter(|s| s.declared.kind.kind == kind)
    {
        for line in seen.lines.iter().filter(|l| l.key.name == key && !l.none) {
            if item
                .select
                .is_some_and(|s| line.select != Some(Select::Word(s)))
            {
                continue;
            }
            for (group, values) in line.groups.iter().enumerate() {
                if let Some(slot) = values.get(item.slot)
                    && let Value::Quantity(stated) = &slot.value
                {
                    out.push(Place {
                        item,
                        block: seen.declared.name.clone(),
                        line: line.clone(),
                        group,
                        stated: *stated,
                        site: slot.site,
                    });
                }
            }
        }
    }
    if kind == "stage" {
        // the driver's devices are not a matter of size: the first stage reached is the output stage
        out.truncate(1);
    }
    out
}

/// One value being tried.
struct Trial<'t> {
    solver: &'t Solver,
    build: &'t Declared,
    place: &'t Place<'t>,
    values: Vec<f64>,
    known: HashMap<usize, Arc<Vec<Margin>>>,
}

impl Trial<'_> {
    fn margins(&mut self, at: usize) -> Arc<Vec<Margin>> {
        if let Some(known) = self.known.get(&at) {
            return known.clone();
        }
        let place = self.place;
        let value = self.values.get(at).copied().unwrap_or(place.stated.value);
        let line = with_value(&place.line, place.group, place.item.slot, value, &[]);
        let changes = [(place.block.clone(), Arc::new(line))];
        let solved = Arc::new(self.solver.solve(self.build, &changes).margins);
        self.known.insert(at, solved.clone());
        solved
    }

    fn row(&mut self, base: &[Margin], touched: &mut BTreeSet<String>) -> Row {
        let last = self.values.len().saturating_sub(1);
        let (least, most) = (self.margins(0), self.margins(last));
        let moved: BTreeSet<String> = moved(&[base, &least, &most])
            .into_iter()
            // a count against the bill of materials says nothing of size
            .filter(|id| !id.contains("/bom.") && !id.contains("/data."))
            .collect();
        touched.extend(moved.iter().cloned());
        let start = nearest(&self.values, self.place.stated.value);
        let (found, limited) = self.smallest(start, &moved);
        let stated = self.text_at(self.place.site);
        let Some(at) = found else {
            return Row {
                offered: None,
                needed: None,
                statements: Vec::new(),
                margins: left(base, &moved),
                limited,
                build: self.build.name.clone(),
                item: self.place.item.name,
                stated,
            };
        };
        let margins = self.margins(at);
        let value = self.values.get(at).copied().unwrap_or_default();
        let text = written(value, &self.place.stated, self.place.item.slot == "n");
        let view = self.solver.view(self.build, &[]);
        let edit = TextEdit {
            site: self.place.site,
            text: text.clone(),
        };
        let line = statement_text(&view, &self.place.line, &[edit]);
        Row {
            build: self.build.name.clone(),
            item: self.place.item.name,
            needed: Some(Measure::new(
                self.needed(value, &margins),
                unit(self.place.item.slot),
            )),
            offered: Some(text),
            stated,
            statements: line
                .map(|l| format!("change {} {l}", self.place.block))
                .into_iter()
                .collect(),
            margins: left(&margins, &moved),
            limited,
        }
    }

    /// The least that a part must be rated at for this stress, where a rule compares just that.
    fn needed(&self, value: f64, margins: &[Margin]) -> f64 {
        let block = &self.place.block;
        let item = self.place.item;
        let of = |m: &&Margin| {
            Some(m.rule) == item.rated_by
                && (m.part.block == *block || m.part.name == *block)
                && item.select.is_none_or(|s| m.part.name.ends_with(s))
        };
        let used = margins.iter().filter(of).filter_map(|m| m.used_percent);
        used.reduce(f64::max)
            .map_or(value, |used| value * used / 100.0)
    }

    /// The position of the smallest value that passes, walking from one near it, and what keeps the
    /// one before it, or every one, from passing. Those that pass lie together.
    fn smallest(
        &mut self,
        start: usize,
        moved: &BTreeSet<String>,
    ) -> (Option<usize>, Option<(String, Left)>) {
        let mut at = start;
        let mut first: Option<(usize, Left)> = None;
        let mut up = true;
        // walk out of what fails, upwards first, then downwards from the start
        loop {
            let margins = self.margins(at);
            let Some(why) = blocking(&margins, moved) else {
                break;
            };
            first.get_or_insert((at, Left::of(why)));
            if up && at + 1 < self.values.len() {
                at += 1;
            } else if up {
                (up, at) = (false, start);
                if at == 0 {
                    return (None, self.why(first));
                }
                at -= 1;
            } else if at > 0 {
                at -= 1;
            } else {
                return (None, self.why(first));
            }
        }
        while at > 0 {
            let margins = self.margins(at - 1);
            if let Some(why) = blocking(&margins, moved) {
                let why = Some((at - 1, Left::of(why)));
                return (Some(at), self.why(why));
            }
            at -= 1;
        }
        (Some(0), None)
    }

    fn why(&self, found: Option<(usize, Left)>) -> Option<(String, Left)> {
        let (at, left) = found?;
        let value = self.values.get(at)?;
        let text = written(*value, &self.place.stated, self.place.item.slot == "n");
        Some((text, left))
    }

    fn text_at(&self, site: Site) -> String {
        let text = self.solver.project.sources.text(site.file);
        text.get(site.span.start..site.span.end)
            .unwrap_or_default()
            .to_owned()
    }
}

/// The unit of a slot as reports write it.
fn unit(slot: &'static str) -> &'static str {
    if slot == "n" { "1" } else { slot }
}
