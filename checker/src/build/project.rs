//! The files of one check brought together: every name once, every `use` followed.
//! Must not know what a value is for.

use std::collections::{HashMap, HashSet};
use std::path::{Path, PathBuf};

use super::lower::{self, WaiverText};
use super::statement::{Declared, Select, Value};
use crate::finding::{FileId, Finding, Related, Site, TextEdit};
use crate::source::{Files, Sources, normal};
use crate::vocabulary::{Block, Takes, nearest};

/// Most files that one check follows.
const MOST_FILES: usize = 1000;

/// Names that a policy may start from without declaring them.
pub type BuiltIn<'a> = &'a [&'static str];

/// Everything declared in a root file and the files it uses.
#[derive(Clone, Debug, Default)]
pub struct Project {
    /// The texts.
    pub sources: Sources,
    /// Every block, root file first, in order of declaration.
    pub blocks: Vec<Declared>,
    /// Every waiver of the root file and of the files it uses.
    pub waivers: Vec<WaiverText>,
    /// What could not be read or does not fit together.
    pub findings: Vec<Finding>,
    by_name: HashMap<String, usize>,
    root: Option<PathBuf>,
}

/// Load `path` and everything it uses. `shown` is its name as people know it; `root` the folder that
/// no path may leave.
///
/// # Errors
/// When the root file itself cannot be read; the text says why.
pub fn load(
    files: &dyn Files,
    path: &Path,
    shown: &str,
    root: &Path,
    policies: BuiltIn<'_>,
) -> Result<Project, String> {
    let tree = files.tree(path)?;
    let mut project = Project {
        root: Some(files.resolve(root)),
        ..Project::default()
    };
    let first = project
        .sources
        .add(files.resolve(path), shown.to_owned(), tree);
    project.follow(files, first);
    project.lower();
    project.link(policies);
    Ok(project)
}

impl Project {
    /// The block with this name.
    #[must_use]
    pub fn find(&self, name: &str) -> Option<&Declared> {
        self.by_name.get(name).and_then(|at| self.blocks.get(*at))
    }

    /// Blocks of this kind, in order of declaration.
    pub fn of_kind<'a>(&'a self, kind: &'a str) -> impl Iterator<Item = &'a Declared> {
        self.blocks.iter().filter(move |b| b.kind.kind == kind)
    }

    fn say(
        &mut self,
        rule: &'static str,
        site: Site,
        message: String,
        hint: String,
    ) -> &mut Finding {
        self.findings
            .push(Finding::error(rule, site, message, hint));
        let last = self.findings.len() - 1;
        &mut self.findings[last]
    }

    /// A path beside `from`, or why it may not be read.
    ///
    /// # Errors
    /// When it leaves the root.
    pub fn beside(&self, files: &dyn Files, from: FileId, text: &str) -> Result<PathBuf, String> {
        let base = self
            .sources
            .file(from)
            .and_then(|f| f.path.parent())
            .unwrap_or(Path::new(""))
            .to_path_buf();
        let path = files.resolve(&normal(&base.join(text)));
        match &self.root {
            Some(root) if !path.starts_with(root) => {
                Err("it lies outside the folder being checked".to_owned())
            }
            _ => Ok(path),
        }
    }

    fn follow(&mut self, files: &dyn Files, first: FileId) {
        // depth first, so that a cycle shows the chain that closes it
        let mut open: Vec<(FileId, Vec<(String, ampspec_grammar::Span)>)> =
            vec![(first, self.uses(first))];
        let mut chain: Vec<FileId> = vec![first];
        while let Some((file, rest)) = open.last_mut() {
            let file = *file;
            let Some((text, span)) = (if rest.is_empty() {
                None
            } else {
                Some(rest.remove(0))
            }) else {
                open.pop();
                chain.pop();
                continue;
            };
            let site = Site { file, span };
            let path = match self.beside(files, file, &text) {
                Ok(path) => path,
                Err(why) => {
                    self.say(
                        "data.use",
                        site,
                        format!("`{text}` is not read: {why}"),
                        "a path is relative to this file and stays below the folder being checked"
                            .to_owned(),
                    );
                    continue;
                }
            };
            if let Some(known) = self.sources.find(&path) {
                if chain.contains(&known) {
                    let other = self.uses_of(known).first().copied();
                    let related = other.map(|site| Related {
                        message: "the circle closes here".to_owned(),
                        site,
                    });
                    let message = format!("`{text}` uses this file in turn");
                    self.say(
                        "data.use",
                        site,
                        message,
                        "take the shared parts into a file of their own".to_owned(),
                    )
                    .related = related.into_iter().collect();
                } else {
                    self.sources.note_use(file, known);
                }
                continue;
            }
            if self.sources.iter().count() >= MOST_FILES {
                self.say(
                    "data.use",
                    site,
                    format!("`{text}` is not read: more than {MOST_FILES} files"),
                    "use fewer files".to_owned(),
                );
                continue;
            }
            match files.tree(&path) {
                Err(why) => {
                    self.say(
                        "data.use",
                        site,
                        format!("`{text}` cannot be read: {why}"),
                        "a path is relative to this file".to_owned(),
                    );
                }
                Ok(tree) => {
                    let base = self.sources.file(file).map_or("", |f| &f.name);
                    let shown = normal(
                        &Path::new(base)
                            .parent()
                            .unwrap_or(Path::new(""))
                            .join(&text),
                    )
                    .to_string_lossy()
                    .replace('\\', "/");
                    let id = self.sources.add(path, shown, tree);
                    self.sources.note_use(file, id);
                    open.push((id, self.uses(id)));
                    chain.push(id);
                }
            }
        }
    }

    fn uses(&self, file: FileId) -> Vec<(String, ampspec_grammar::Span)> {
        self.sources
            .file(file)
            .map(|f| lower::uses(&f.tree))
            .unwrap_or_default()
    }

    fn uses_of(&self, file: FileId) -> Vec<Site> {
        self.uses(file)
            .into_iter()
            .map(|(_, span)| Site { file, span })
            .collect()
    }

    fn lower(&mut self) {
        let trees: Vec<_> = self
            .sources
            .iter()
            .map(|(id, f)| (id, f.tree.clone()))
            .collect();
        let mut kinds: HashMap<String, &'static Block> = HashMap::new();
        for (_, tree) in &trees {
            for (name, kind) in lower::declared_kinds(tree) {
                kinds.entry(name.to_owned()).or_insert(kind);
            }
        }
        for (id, tree) in &trees {
            let lowered = lower::lower(*id, tree, &kinds);
            self.findings.extend(lowered.findings);
            self.waivers.extend(lowered.waivers);
            for block in lowered.blocks {
                if let Some(first) = self.find(&block.name) {
                    let (kind, site) = (first.kind.kind, first.name_site);
                    let message = format!("`{}` is declared twice", block.name);
                    let related = vec![Related {
                        message: format!("first declared here, as a {kind}; this one is used"),
                        site,
                    }];
                    self.say(
                        "data.duplicate",
                        block.name_site,
                        message,
                        "give one of the two another name".to_owned(),
                    )
                    .related = related;
                    continue;
                }
                self.by_name.insert(block.name.clone(), self.blocks.len());
                self.blocks.push(block);
            }
        }
    }

    /// Every name on a line, and every `from`, leads to a block of the kind wanted.
    fn link(&mut self, policies: BuiltIn<'_>) {
        let mut said = Vec::new();
        for block in &self.blocks {
            if let Some((from, site)) = &block.from {
                self.check_from(block, from, *site, policies, &mut said);
            } else if block.kind.kind == "policy" {
                let message = format!("policy `{}` starts from nothing", block.name);
                let hint = format!(
                    "write `policy {} from {} {{`",
                    block.name,
                    policies.first().unwrap_or(&"bench")
                );
                said.push(Finding::error(
                    "syntax.word",
                    block.name_site,
                    message,
                    hint,
                ));
            }
            for line in &block.lines {
                let line = line.change.as_ref().map_or(line, |c| &c.1);
                for slot in line.groups.iter().flat_map(|g| &g.slots) {
                    let Value::Name(name) = &slot.value else {
                        continue;
                    };
                    let Some(Takes::Name(kind)) =
                        line.key.shape().item(slot.slot).map(|i| i.takes.clone())
                    else {
                        continue;
                    };
                    self.check_name(name, kind, slot.site, policies, &mut said);
                }
                if let Some(Select::Rule(_)) = &line.select {
                    // rule names are checked where rules are known
                }
            }
        }
        self.findings.extend(said);
    }

    fn check_from(
        &self,
        block: &Declared,
        from: &str,
        site: Site,
        policies: BuiltIn<'_>,
        said: &mut Vec<Finding>,
    ) {
        if block.kind.kind == "policy" && policies.contains(&from) {
            return;
        }
        self.check_name(from, block.kind.kind, site, policies, said);
        let mut seen = HashSet::from([block.name.as_str()]);
        let mut at = from;
        while let Some(next) = self.find(at) {
            if !seen.insert(at) {
                if at == block.name {
                    let message = format!("`{}` starts from itself", block.name);
                    let related = vec![Related {
                        message: "by way of this".to_owned(),
                        site: next.site,
                    }];
                    let mut f = Finding::error(
                        "data.cycle",
                        site,
                        message,
                        "break the circle: one of them must not have a `from`".to_owned(),
                    );
                    f.related = related;
                    said.push(f);
                }
                break;
            }
            match &next.from {
                Some((further, _)) => at = further,
                None => break,
            }
        }
    }

    fn check_name(
        &self,
        name: &str,
        kind: &'static str,
        site: Site,
        policies: BuiltIn<'_>,
        said: &mut Vec<Finding>,
    ) {
        match self.find(name) {
            Some(found) if kind == "any" || found.kind.kind == kind => {}
            Some(found) => {
                let message = format!("`{name}` is a {}; a {kind} is wanted here", found.kind.kind);
                let mut f = Finding::error("data.missing", site, message, format!("name a {kind}"));
                f.related = vec![Related {
                    message: "declared here".to_owned(),
                    site: found.name_site,
                }];
                said.push(f);
            }
            None if kind == "policy" && policies.contains(&name) => {}
            None => {
                let names = self
                    .blocks
                    .iter()
                    .filter(|b| kind == "any" || b.kind.kind == kind)
                    .map(|b| b.name.as_str());
                let near = nearest(
                    name,
                    names.chain(
                        if kind == "policy" { policies } else { &[] }
                            .iter()
                            .copied(),
                    ),
                );
                let what = if kind == "any" {
                    "part".to_owned()
                } else {
                    kind.to_owned()
                };
                let message = format!("no {what} is called `{name}`");
                let hint = if near.is_empty() {
                    format!(
                        "declare it: `{what} {name} {{`, or take in the file that does with `use`"
                    )
                } else {
                    format!(
                        "did you mean {}?",
                        near.iter()
                            .map(|n| format!("`{n}`"))
                            .collect::<Vec<_>>()
                            .join(" or ")
                    )
                };
                let mut f = Finding::error("data.missing", site, message, hint);
                f.edits = near
                    .iter()
                    .map(|n| TextEdit {
                        site,
                        text: (*n).to_owned(),
                    })
                    .collect();
                said.push(f);
            }
        }
    }
}
