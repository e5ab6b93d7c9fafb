//! What each block says in one build with one alternate: `from`, `change` and `replace` applied.
//! Must not know what a value is for.

use std::cell::RefCell;
use std::collections::{BTreeSet, HashMap};
use std::rc::Rc;
use std::sync::Arc;

use super::project::Project;
use super::statement::{Declared, Group, Statement, Value};

/// Longest chain of `from`; a longer one is a circle, which has its own finding.
const MOST_FROM: usize = 64;

/// A block as one build sees it.
#[derive(Clone, Debug)]
pub struct Seen<'a> {
    /// The declaration.
    pub declared: &'a Declared,
    /// Its lines after `from` and `change`.
    pub lines: Vec<Arc<Statement>>,
    /// `npn` and its like, its own or inherited.
    pub flavour: Option<&'static str>,
}

impl Seen<'_> {
    /// The line of a key, `none` included.
    #[must_use]
    pub fn line(&self, key: &str) -> Option<&Arc<Statement>> {
        self.lines.iter().find(|l| l.key.name == key)
    }
    /// Every line of a key that repeats.
    pub fn all<'s>(&'s self, key: &'s str) -> impl Iterator<Item = &'s Arc<Statement>> {
        self.lines
            .iter()
            .filter(move |l| l.key.name == key && !l.none)
    }
    /// The first group of the line of a key.
    #[must_use]
    pub fn group(&self, key: &str) -> Option<&Group> {
        self.line(key)?.groups.first()
    }
}

/// One build, with one alternate or none.
#[derive(Debug)]
pub struct View<'a> {
    /// The files and blocks.
    pub project: &'a Project,
    /// The build.
    pub build: &'a Declared,
    /// The alternate.
    pub alternate: Option<&'a Declared>,
    changes: Vec<(String, Arc<Statement>)>,
    replaced: HashMap<String, String>,
    reached: RefCell<BTreeSet<String>>,
}

impl<'a> View<'a> {
    /// The view of `build` with `alternate`, and with `extra` changes that a proposal tries.
    #[must_use]
    pub fn new(
        project: &'a Project,
        build: &'a Declared,
        alternate: Option<&'a Declared>,
        extra: &[(String, Arc<Statement>)],
    ) -> Self {
        let mut changes = Vec::new();
        let mut replaced = HashMap::new();
        let mut chain = chain_of(project, build);
        chain.reverse();
        for block in chain.into_iter().chain(alternate) {
            for line in &block.lines {
                if let Some(change) = &line.change {
                    changes.push(change.clone());
                }
                if line.key.name == "replace" {
                    for group in &line.groups {
                        if let (Some(old), Some(new)) = (group.name("any"), group.name("any2")) {
                            replaced.insert(old.to_owned(), new.to_owned());
                        }
                    }
                }
            }
        }
        changes.extend(extra.iter().cloned());
        Self {
            project,
            build,
            alternate,
            changes,
            replaced,
            reached: RefCell::default(),
        }
    }

    /// The name in force for a name on a line.
    #[must_use]
    pub fn name<'n>(&'n self, name: &'n str) -> &'n str {
        self.replaced.get(name).map_or(name, String::as_str)
    }

    /// A block by the name on a line, if it is of this kind.
    #[must_use]
    pub fn block(&self, name: &str, kind: &str) -> Option<Rc<Seen<'a>>> {
        let declared = self.project.find(self.name(name))?;
        if declared.kind.kind != kind {
            return None;
        }
        Some(Rc::new(self.seen(declared)))
    }

    /// A block as this build sees it.
    #[must_use]
    pub fn seen(&self, declared: &'a Declared) -> Seen<'a> {
        let mut lines: Vec<Arc<Statement>> = Vec::new();
        let mut flavour = None;
        let mut chain = chain_of(self.project, declared);
        {
            let mut reached = self.reached.borrow_mut();
            for block in &chain {
                reached.insert(block.name.clone());
            }
        }
        chain.reverse();
        for block in chain {
            flavour = block.flavour.or(flavour);
            for line in &block.lines {
                put(&mut lines, line);
            }
            for (name, line) in &self.changes {
                if *name == block.name {
                    put(&mut lines, line);
                }
            }
        }
        Seen {
            declared,
            lines,
            flavour,
        }
    }

    /// Names of the blocks this view has reached so far.
    #[must_use]
    pub fn reached(&self) -> BTreeSet<String> {
        let mut all = self.reached.borrow().clone();
        all.extend(self.replaced.keys().cloned());
        all
    }
}

/// The block and the blocks it starts from, itself first.
fn chain_of<'a>(project: &'a Project, block: &'a Declared) -> Vec<&'a Declared> {
    let mut chain = vec![block];
    let mut at = block;
    while let Some(next) = at.from.as_ref().and_then(|(name, _)| project.find(name)) {
        if next.kind.kind != block.kind.kind
            || chain.len() >= MOST_FROM
            || chain.iter().any(|b| b.name == next.name)
        {
            break;
        }
        chain.push(next);
        at = next;
    }
    chain
}

/// A later line replaces an earlier one of the same key and selector. `change` lines all stay.
fn put(lines: &mut Vec<Arc<Statement>>, line: &Arc<Statement>) {
    if line.change.is_none() {
        if let Some(old) = lines.iter_mut().find(|old| old.replaced_by(line)) {
            *old = line.clone();
            return;
        }
        // a key restated without its selector, as `none`, clears every line of that key
        if line.none && line.select.is_none() {
            lines.retain(|old| !std::ptr::eq(old.key, line.key));
        }
    }
    lines.push(line.clone());
}

/// The blocks a line names, for walking from a build to everything it uses.
pub fn names(line: &Statement) -> impl Iterator<Item = &str> {
    line.groups
        .iter()
        .flat_map(|g| &g.slots)
        .filter_map(|s| match &s.value {
            Value::Name(name) => Some(name.as_str()),
            _ => None,
        })
}
