//! From a tree to declared blocks: every line is matched with the vocabulary.
//! Must not know what a value is for, nor what other files say except the kinds of declared names.
//!
//! Nothing here fails: what cannot be read becomes a finding, and everything else is kept.

use std::cmp::Reverse;
use std::collections::{HashMap, HashSet};
use std::sync::Arc;

use ampspec_grammar::{self as grammar, Item as TreeItem, Span, Token, TokenKind, Tree};

use super::statement::{Bought, Declared, Group, Select, Slot, Statement, Value};
use crate::finding::{FileId, Finding, Related, Severity, Site, TextEdit};
use crate::quantity::{self, Band, Dimension, FaultKind, FuseSpeed, NoteSeverity, Reading, Slip};
use crate::vocabulary::shape::CONNECTING;
use crate::vocabulary::{
    BLOCKS, Block, Extent, Item, Key, STATEMENTS, Selector, Shape, Takes, block_kind, nearest,
};

/// Most channels, pairs or counts that a number may state; above it the text is asked about.
const MOST: f64 = 10_000.0;

/// A waiver as written.
#[derive(Clone, Debug, Default)]
pub struct WaiverText {
    /// The rule named.
    pub rule: String,
    /// `of PART`.
    pub part: Option<String>,
    /// `in BUILD`.
    pub build: Option<String>,
    /// `with ALTERNATE`.
    pub alternate: Option<String>,
    /// `because "…"`.
    pub reason: Option<String>,
    /// `by "…"`.
    pub by: Option<String>,
    /// `until DATE`.
    pub until: Option<String>,
    /// The statement.
    pub site: Option<Site>,
}

/// What one file declares.
#[derive(Clone, Debug, Default)]
pub struct Lowered {
    /// Its blocks, in order.
    pub blocks: Vec<Declared>,
    /// Its waivers, in order.
    pub waivers: Vec<WaiverText>,
    /// What could not be read.
    pub findings: Vec<Finding>,
    /// The usual spelling of texts that were read in another, by place. Several of one place belong
    /// together, in order.
    pub spellings: Vec<(Span, String)>,
}

/// Names and kinds of the blocks a tree declares, without reading their lines.
pub fn declared_kinds(tree: &Tree) -> impl Iterator<Item = (&str, &'static Block)> {
    tree.blocks().filter_map(|block| {
        let name = block.name()?;
        Some((
            name.text(&tree.text),
            block_kind(block.kind.text(&tree.text))?,
        ))
    })
}

/// The text of the path of every `use` statement, with its place.
#[must_use]
pub fn uses(tree: &Tree) -> Vec<(String, Span)> {
    let mut out = Vec::new();
    for item in &tree.items {
        let TreeItem::Line(line) = item else { continue };
        if line.key.text(&tree.text) != "use" {
            continue;
        }
        for token in line.groups.iter().flat_map(|g| &g.tokens) {
            if token.kind == TokenKind::Text {
                out.push((token.content(&tree.text).to_owned(), token.span));
            }
        }
    }
    out
}

/// Lower one file. `kinds` knows every name declared in any file of the check.
#[must_use]
pub fn lower(file: FileId, tree: &Tree, kinds: &HashMap<String, &'static Block>) -> Lowered {
    let mut lowering = Lowering {
        file,
        tree,
        text: &tree.text,
        kinds,
        out: Lowered::default(),
    };
    lowering.problems();
    lowering.items();
    lowering.one_a_line();
    lowering.out
}

struct Lowering<'a> {
    file: FileId,
    tree: &'a Tree,
    text: &'a str,
    kinds: &'a HashMap<String, &'static Block>,
    out: Lowered,
}

/// A piece of a token that is read on its own: `2x28VAC` is three.
#[derive(Clone, Copy, Debug)]
struct Atom<'a> {
    text: &'a str,
    kind: TokenKind,
    span: Span,
    /// It is a part of the token at `span`.
    split: bool,
}

impl Lowering<'_> {
    fn site(&self, span: Span) -> Site {
        Site {
            file: self.file,
            span,
        }
    }

    fn say(
        &mut self,
        rule: &'static str,
        severity: Severity,
        span: Span,
        message: String,
        hint: String,
    ) -> &mut Finding {
        let site = self.site(span);
        self.out
            .findings
            .push(Finding::error(rule, site, message, hint).at(severity));
        let last = self.out.findings.len() - 1;
        &mut self.out.findings[last]
    }

    fn error(
        &mut self,
        rule: &'static str,
        span: Span,
        message: String,
        hint: String,
    ) -> &mut Finding {
        self.say(rule, Severity::Error, span, message, hint)
    }

    /// What the grammar could not read.
    fn problems(&mut self) {
        for problem in &self.tree.problems {
            let related = problem
                .related
                .iter()
                .map(|(message, span)| Related {
                    message: message.clone(),
                    site: self.site(*span),
                })
                .collect();
            let (message, hint) = (problem.message.clone(), problem.hint.clone());
            self.error("syntax.text", problem.span, message, hint)
                .related = related;
        }
    }

    /// One fault of form for each source line: those after the first are mostly its consequences, and
    /// a line that is being typed would flood. What the grammar has told counts.
    fn one_a_line(&mut self) {
        let tree = self.tree;
        let mut told: HashSet<usize> = HashSet::new();
        let mut order: Vec<usize> = (0..self.out.findings.len()).collect();
        order.sort_by_key(|&at| {
            self.out
                .findings
                .get(at)
                .map(|f| (Reverse(f.severity), f.site.span))
        });
        let mut kept = vec![true; order.len()];
        for at in order {
            let Some(finding) = self.out.findings.get(at) else {
                continue;
            };
            if !finding.rule.starts_with("syntax.") || finding.rule == "syntax.text" {
                continue;
            }
            let fresh = !tree.is_faulty(finding.site.span)
                && told.insert(tree.line_index().line_of(finding.site.span.start));
            if let Some(keep) = kept.get_mut(at) {
                *keep = fresh;
            }
        }
        let mut kept = kept.into_iter();
        self.out.findings.retain(|_| kept.next().unwrap_or(true));
    }

    fn items(&mut self) {
        let tree = self.tree;
        for (at, item) in tree.items.iter().enumerate() {
            match item {
                TreeItem::Block(block) => self.block(block),
                TreeItem::Line(line) => self.top_line(line, at == 0),
            }
        }
    }

    fn top_line(&mut self, line: &grammar::Line, first: bool) {
        let word = line.key.text(self.text);
        match word {
            "ampspec" => {
                let version: Vec<_> = line
                    .groups
                    .iter()
                    .flat_map(|g| &g.tokens)
                    .map(|t| t.text(self.text))
                    .collect();
                if version != ["1"] {
                    self.error(
                        "syntax.version",
                        line.span,
                        format!("this is written for version {} of the language; this program reads version 1", version.join(" ")),
                        "write `ampspec 1`".to_owned(),
                    );
                } else if !first {
                    self.error(
                        "syntax.version",
                        line.span,
                        "the version stands on the first line".to_owned(),
                        "move `ampspec 1` to the top".to_owned(),
                    );
                }
            }
            "use" => {
                let texts = line
                    .groups
                    .iter()
                    .flat_map(|g| &g.tokens)
                    .filter(|t| t.kind == TokenKind::Text)
                    .count();
                let tokens = line.groups.iter().map(|g| g.tokens.len()).sum::<usize>();
                if texts != 1 || tokens != 1 {
                    self.error(
                        "syntax.value",
                        line.span,
                        "`use` wants one path in quotes".to_owned(),
                        "write `use \"parts/output.ampspec\"`".to_owned(),
                    );
                }
            }
            "waive" => self.waive(line),
            // the grammar has told what is wrong with this line
            _ if self.tree.is_faulty(line.span) => {}
            _ => {
                let names = STATEMENTS
                    .iter()
                    .map(|k| k.name)
                    .chain(BLOCKS.iter().map(|b| b.kind));
                let near = nearest(word, names);
                let block = block_kind(word).is_some();
                let hint = if block {
                    format!("a block opens with a brace: `{word} NAME {{`")
                } else if BLOCKS.iter().any(|b| b.key(word).is_some()) {
                    let homes: Vec<_> = BLOCKS
                        .iter()
                        .filter(|b| b.key(word).is_some())
                        .map(|b| b.kind)
                        .collect();
                    format!(
                        "`{word}` is a key of {}: it stands inside such a block",
                        homes.join(", ")
                    )
                } else {
                    did_you_mean(
                        &near,
                        "outside blocks stand `ampspec`, `use`, `waive` and block headers such as `stage out {`",
                    )
                };
                self.unknown(
                    "syntax.statement",
                    line.key,
                    format!("`{word}` is no statement"),
                    hint,
                    &near,
                );
            }
        }
    }

    fn unknown(
        &mut self,
        rule: &'static str,
        token: Token,
        message: String,
        hint: String,
        near: &[&str],
    ) {
        let site = self.site(token.span);
        let edits = near
            .iter()
            .map(|n| TextEdit {
                site,
                text: (*n).to_owned(),
            })
            .collect();
        self.error(rule, token.span, message, hint).edits = edits;
    }

    fn waive(&mut self, line: &grammar::Line) {
        let tokens: Vec<Token> = line
            .groups
            .iter()
            .flat_map(|g| g.tokens.iter().copied())
            .collect();
        let mut waiver = WaiverText {
            site: Some(self.site(line.span)),
            ..WaiverText::default()
        };
        let mut tokens = tokens.into_iter();
        match tokens.next() {
            Some(rule) if rule.kind == TokenKind::Word => {
                waiver.rule = rule.text(self.text).to_owned()
            }
            _ => {
                self.error(
                    "syntax.value",
                    line.span,
                    "`waive` names no rule".to_owned(),
                    waive_form(),
                );
                return;
            }
        }
        while let Some(word) = tokens.next() {
            let slot = match word.text(self.text) {
                "of" => &mut waiver.part,
                "in" => &mut waiver.build,
                "with" => &mut waiver.alternate,
                "because" => &mut waiver.reason,
                "by" => &mut waiver.by,
                "until" => &mut waiver.until,
                other => {
                    let message = format!("`{other}` is not understood in a waiver");
                    self.error("syntax.word", word.span, message, waive_form());
                    return;
                }
            };
            let Some(value) = tokens.next() else {
                let message = format!("nothing follows `{}`", word.text(self.text));
                self.error("syntax.value", word.span, message, waive_form());
                return;
            };
            *slot = Some(value.content(self.text).to_owned());
        }
        self.out.waivers.push(waiver);
    }

    fn block(&mut self, block: &grammar::Block) {
        let word = block.kind.text(self.text);
        let Some(kind) = block_kind(word) else {
            let near = nearest(word, BLOCKS.iter().map(|b| b.kind));
            let kinds: Vec<_> = BLOCKS.iter().map(|b| b.kind).collect();
            let hint = did_you_mean(&near, &format!("blocks are {}", kinds.join(", ")));
            self.unknown(
                "syntax.block",
                block.kind,
                format!("`{word}` is no kind of block"),
                hint,
                &near,
            );
            return;
        };
        // a block without a name is a problem that the grammar has told
        let Some(name) = block.name() else { return };
        let mut declared = Declared {
            kind,
            name: name.text(self.text).to_owned(),
            title: None,
            flavour: None,
            from: None,
            lines: Vec::new(),
            site: self.site(block.header_span),
            name_site: self.site(name.span),
            whole: self.site(block.span),
        };
        if quantity::is_unit(&declared.name) {
            let message = format!("`{}` is a unit and cannot be a name", declared.name);
            self.error(
                "syntax.name",
                name.span,
                message,
                "choose another name".to_owned(),
            );
        }
        self.header(block, &mut declared);
        for line in &block.lines {
            let Some(statement) = self.line(kind, line) else {
                continue;
            };
            if let Some(before) = declared
                .lines
                .iter()
                .find(|s| s.replaced_by(&statement) && statement.change.is_none())
            {
                let before = before.key_site;
                let message = format!(
                    "`{}` is stated twice in `{} {}`",
                    statement.key.name, kind.kind, declared.name
                );
                let hint = if statement.key.repeats {
                    "keep one of the two, or give them different selectors".to_owned()
                } else {
                    "keep one of the two".to_owned()
                };
                let related = vec![Related {
                    message: "first stated here; this line is the one used".to_owned(),
                    site: before,
                }];
                self.error("data.duplicate", line.key.span, message, hint)
                    .related = related;
                continue;
            }
            declared.lines.push(Arc::new(statement));
        }
        self.out.blocks.push(declared);
    }

    fn header(&mut self, block: &grammar::Block, declared: &mut Declared) {
        let mut tokens = block.header.iter().skip(1).copied();
        while let Some(token) = tokens.next() {
            let word = token.text(self.text);
            if token.kind == TokenKind::Text {
                declared.title = Some(token.content(self.text).to_owned());
            } else if let Some(flavour) = declared.kind.flavours.iter().find(|f| **f == word) {
                declared.flavour = Some(flavour);
            } else if word == "from" {
                match tokens.next() {
                    Some(other) if other.kind == TokenKind::Word => {
                        declared.from =
                            Some((other.text(self.text).to_owned(), self.site(other.span)));
                    }
                    _ => {
                        let message = "`from` names no block to start from".to_owned();
                        let hint = format!(
                            "write `{} {} from OTHER {{`",
                            declared.kind.kind, declared.name
                        );
                        self.error("syntax.word", token.span, message, hint);
                    }
                }
            } else {
                let near = nearest(word, declared.kind.flavours.iter().copied().chain(["from"]));
                let usual = if declared.kind.flavours.is_empty() {
                    "a header is `KIND NAME \"title\" from OTHER {`".to_owned()
                } else {
                    format!(
                        "here may stand {}, a title in quotes, or `from OTHER`",
                        declared.kind.flavours.join(", ")
                    )
                };
                let hint = did_you_mean(&near, &usual);
                self.unknown(
                    "syntax.word",
                    token,
                    format!("`{word}` is not understood in this header"),
                    hint,
                    &near,
                );
            }
        }
        if !declared.kind.flavours.is_empty()
            && declared.flavour.is_none()
            && declared.from.is_none()
        {
            let message = format!("device `{}` does not say what it is", declared.name);
            let hint = format!(
                "add one of {}: `device {} npn {{`",
                declared.kind.flavours.join(", "),
                declared.name
            );
            self.error("syntax.word", declared.name_site.span, message, hint);
        }
    }

    /// A line of a block of this kind.
    fn line(&mut self, kind: &'static Block, line: &grammar::Line) -> Option<Statement> {
        // the grammar has told what is wrong with this line; its values are not complete
        if self.tree.is_faulty(line.span) {
            return None;
        }
        let groups: Vec<&[Token]> = line.groups.iter().map(|g| g.tokens.as_slice()).collect();
        self.statement(kind, line.key, &groups, line.span)
    }

    fn statement(
        &mut self,
        kind: &'static Block,
        key: Token,
        groups: &[&[Token]],
        span: Span,
    ) -> Option<Statement> {
        let word = key.text(self.text);
        let Some(found) = kind.key(word) else {
            let near = nearest(word, kind.keys.iter().map(|k| k.name));
            let elsewhere: Vec<_> = BLOCKS
                .iter()
                .filter(|b| b.key(word).is_some())
                .map(|b| b.kind)
                .collect();
            let usual = if elsewhere.is_empty() {
                let keys: Vec<_> = kind.keys.iter().map(|k| k.name).collect();
                format!("keys of a {} are {}", kind.kind, keys.join(", "))
            } else {
                format!("`{word}` is a key of {}", elsewhere.join(", "))
            };
            let hint = did_you_mean(&near, &usual);
            self.unknown(
                "syntax.key",
                key,
                format!("a {} has no key `{word}`", kind.kind),
                hint,
                &near,
            );
            return None;
        };
        let mut statement = Statement {
            key: found,
            select: None,
            none: false,
            groups: Vec::new(),
            site: self.site(span),
            key_site: self.site(key.span),
            change: None,
        };
        let shape = found.shape();
        if shape.special == Some("CHANGE") {
            return self.change(statement, key, groups);
        }
        let only: Vec<&str> = groups
            .iter()
            .flat_map(|g| g.iter())
            .map(|t| t.text(self.text))
            .collect();
        if only == ["none"] {
            if found.required() {
                let message = format!("`{word}` cannot be `none`");
                self.error(
                    "syntax.value",
                    span,
                    message,
                    format!("a {} needs it: {}", kind.kind, found.meaning),
                );
                return None;
            }
            statement.none = true;
            return Some(statement);
        }
        if only.is_empty() {
            let message = format!("nothing follows `{word}`");
            self.error("syntax.value", key.span, message, expected(found));
            return None;
        }
        if groups.len() > 1 && !shape.list {
            let at = groups
                .get(1)
                .and_then(|g| g.first())
                .map_or(span, |t| t.span);
            self.error(
                "syntax.value",
                at,
                format!("`{word}` takes one group, without commas"),
                expected(found),
            );
        }
        for (at, tokens) in groups.iter().enumerate() {
            let mut rest = *tokens;
            if at == 0
                && let Some(selector) = &shape.selector
            {
                let (select, used) = self.selector(found, selector, key, tokens)?;
                statement.select = Some(select);
                rest = tokens.get(used..).unwrap_or(&[]);
                if groups.len() == 1 && matches!(rest, [only] if only.text(self.text) == "none") {
                    statement.none = true;
                    return Some(statement);
                }
            }
            if let Some(group) = self.group(found, shape, rest, key) {
                statement.groups.push(group);
            }
            if !shape.list {
                break;
            }
        }
        if found.repeats && shape.selector.is_none() {
            let first = statement.groups.first().and_then(|g| g.slots.first());
            statement.select = first.and_then(|s| match &s.value {
                Value::Quantity(q) => Some(Select::First(q.value)),
                _ => None,
            });
        }
        if statement.groups.is_empty() {
            None
        } else {
            Some(statement)
        }
    }

    fn change(
        &mut self,
        mut statement: Statement,
        key: Token,
        groups: &[&[Token]],
    ) -> Option<Statement> {
        let first = groups.first().copied().unwrap_or(&[]);
        let (Some(block), Some(inner)) = (first.first(), first.get(1)) else {
            let message = "`change` wants a block, a key and its value".to_owned();
            self.error(
                "syntax.value",
                key.span,
                message,
                "write `change out pairs 3`".to_owned(),
            );
            return None;
        };
        let name = block.text(self.text);
        let Some(kind) = self.kinds.get(name).copied() else {
            let near = nearest(name, self.kinds.keys().map(String::as_str));
            let hint = did_you_mean(&near, "name a declared block first: `change out pairs 3`");
            self.unknown(
                "data.missing",
                *block,
                format!("no block is called `{name}`"),
                hint,
                &near,
            );
            return None;
        };
        let mut rest: Vec<&[Token]> = vec![first.get(2..).unwrap_or(&[])];
        rest.extend(groups.iter().skip(1));
        let inner = self.statement(kind, *inner, &rest, statement.site.span)?;
        if inner.change.is_some() {
            let message = "a `change` cannot hold another `change`".to_owned();
            self.error(
                "syntax.value",
                statement.site.span,
                message,
                "name the block and key to change directly".to_owned(),
            );
            return None;
        }
        statement.change = Some((name.to_owned(), Arc::new(inner)));
        Some(statement)
    }

    fn selector(
        &mut self,
        key: &'static Key,
        selector: &Selector,
        at: Token,
        tokens: &[Token],
    ) -> Option<(Select, usize)> {
        let Some(first) = tokens.first().copied() else {
            self.error(
                "syntax.value",
                at.span,
                format!("`{}` lacks its selector", key.name),
                expected(key),
            );
            return None;
        };
        let word = first.text(self.text);
        match selector {
            Selector::Rule => Some((Select::Rule(word.to_owned()), 1)),
            Selector::Words(words, time) => {
                if let Some(found) = words.iter().find(|w| **w == word) {
                    return Some((Select::Word(found), 1));
                }
                if *time {
                    let texts: Vec<&str> = tokens
                        .iter()
                        .take(MOST_TOKENS)
                        .map(|t| t.text(self.text))
                        .collect();
                    if let Reading::Read { quantity, .. } = quantity::read(&texts, Dimension::Time)
                    {
                        return Some((Select::Time(quantity.value), quantity.used));
                    }
                }
                let near = nearest(word, words.iter().copied());
                let choice = if *time {
                    format!("{} or a time such as `100 ms`", words.join(", "))
                } else {
                    words.join(", ")
                };
                let hint = did_you_mean(
                    &near,
                    &format!("the first word after `{}` is {choice}", key.name),
                );
                self.unknown(
                    "syntax.word",
                    first,
                    format!("`{word}` does not select a `{}`", key.name),
                    hint,
                    &near,
                );
                None
            }
        }
    }

    fn group(
        &mut self,
        key: &'static Key,
        shape: &'static Shape,
        tokens: &[Token],
        at: Token,
    ) -> Option<Group> {
        let span = match (tokens.first(), tokens.last()) {
            (Some(a), Some(b)) => a.span.cover(b.span),
            _ => {
                if shape.items.iter().any(|i| !i.optional) {
                    self.error(
                        "syntax.value",
                        at.span,
                        format!("nothing follows in `{}`", key.name),
                        expected(key),
                    );
                }
                return None;
            }
        };
        let (values, bought) = match tokens
            .iter()
            .position(|t| matches!(t.text(self.text), "ref" | "part" | "qty"))
        {
            Some(end) if shape.bought => tokens.split_at(end),
            _ => (tokens, &tokens[tokens.len()..]),
        };
        let atoms = atoms(self.text, values, shape);
        let spelled = self.out.spellings.len();
        let mut group = Group {
            slots: Vec::new(),
            bought: self.bought(bought),
            site: self.site(span),
        };
        let mut faulty = false;
        let mut next = 0;
        while next < atoms.len() {
            let used = self.item(key, shape, &atoms[next..], &mut group, &mut faulty);
            next += used.max(1);
        }
        if faulty {
            self.out.spellings.truncate(spelled);
        } else {
            self.lacking(key, shape, &group, span);
        }
        Some(group)
    }

    fn lacking(&mut self, key: &'static Key, shape: &Shape, group: &Group, span: Span) {
        let lacks: Vec<String> = shape
            .items
            .iter()
            .filter(|i| !i.optional && group.get(i.slot).is_none())
            .map(describe)
            .collect();
        if !lacks.is_empty() {
            let message = format!("`{}` lacks {}", key.name, lacks.join(" and "));
            self.error("syntax.value", span, message, expected(key));
        } else if group.slots.is_empty() {
            self.error(
                "syntax.value",
                span,
                format!("nothing in `{}` could be read", key.name),
                expected(key),
            );
        }
    }

    /// Read one item at the start of `atoms`; the number of atoms used.
    fn item(
        &mut self,
        key: &'static Key,
        shape: &'static Shape,
        atoms: &[Atom<'_>],
        group: &mut Group,
        faulty: &mut bool,
    ) -> usize {
        let Some(atom) = atoms.first() else { return 1 };
        let word = atom.text;
        let free = |item: &&Item, group: &Group| group.get(item.slot).is_none();
        if atom.kind == TokenKind::Text {
            match shape
                .items
                .iter()
                .find(|i| i.takes == Takes::Text && free(i, group))
            {
                Some(item) => self.fill(
                    group,
                    item,
                    Value::Text(word.trim_matches(['"', '“', '”', '„']).to_owned()),
                    atom.span,
                ),
                None => {
                    *faulty = true;
                    self.error(
                        "syntax.word",
                        atom.span,
                        format!("no text is wanted in `{}`", key.name),
                        expected(key),
                    );
                }
            }
            return 1;
        }
        if atom.kind == TokenKind::Word {
            if let Some(item) = shape.items.iter().find(|i| i.label == Some(word)) {
                return self.labelled(key, item, atoms, group, faulty);
            }
            let choice = shape.items.iter().find(|i| match &i.takes {
                Takes::Choice(words) => {
                    i.label.is_none() && free(i, group) && words.contains(&word)
                }
                _ => false,
            });
            if let Some(item) = choice
                && let Takes::Choice(words) = &item.takes
                && let Some(found) = words.iter().find(|w| **w == word)
            {
                self.fill(group, item, Value::Word(found), atom.span);
                return 1;
            }
            if CONNECTING.contains(&word) || matches!(word, "x" | "×") {
                return 1;
            }
        }
        if let Some(item) = shape
            .items
            .iter()
            .find(|i| i.takes == Takes::Fraction && free(i, group))
            && let Some(value) = fraction(word)
        {
            self.fill(
                group,
                item,
                Value::Fraction(value, word.to_owned()),
                atom.span,
            );
            return 1;
        }
        if atom.kind == TokenKind::Number
            && atoms.get(1).is_some_and(|a| a.kind == TokenKind::Times)
            && let Some(item) = shape
                .items
                .iter()
                .find(|i| i.takes == Takes::Count && free(i, group))
        {
            match whole(word) {
                Some(n) => {
                    if atom.split {
                        self.out.spellings.push((atom.span, format!("{n} x")));
                    }
                    self.fill(group, item, Value::Count(n), atom.span);
                }
                None => {
                    *faulty = true;
                    let message = format!("`{word}` is no whole number");
                    self.error(
                        "syntax.number",
                        atom.span,
                        message,
                        "a count is written `2 x`".to_owned(),
                    );
                }
            }
            return 2;
        }
        if let Some(used) = self.compound(shape, atoms, group, faulty) {
            return used;
        }
        let open: Vec<&'static Item> = shape
            .items
            .iter()
            .filter(|i| {
                i.label.is_none()
                    && matches!(i.takes, Takes::Quantity { .. })
                    && group.get(i.slot).is_none()
            })
            .collect();
        if let Some(used) = self.quantity(key, &open, atoms, group, faulty) {
            return used;
        }
        if atom.kind == TokenKind::Word
            && let Some(item) = shape
                .items
                .iter()
                .find(|i| matches!(i.takes, Takes::Name(_)) && free(i, group))
        {
            self.fill(group, item, Value::Name(word.to_owned()), atom.span);
            return 1;
        }
        *faulty = true;
        self.stray(key, shape, atom);
        1
    }

    fn stray(&mut self, key: &'static Key, shape: &Shape, atom: &Atom<'_>) {
        let words: Vec<&'static str> = shape
            .items
            .iter()
            .flat_map(|i| {
                let choices = match &i.takes {
                    Takes::Choice(words) if i.label.is_none() => words.clone(),
                    _ => Vec::new(),
                };
                choices.into_iter().chain(i.label)
            })
            .collect();
        let near = nearest(atom.text, words.into_iter());
        let message = if atom.kind == TokenKind::Number {
            format!("`{}` is one number too many in `{}`", atom.text, key.name)
        } else {
            format!("`{}` is not understood in `{}`", atom.text, key.name)
        };
        let hint = did_you_mean(&near, &expected(key));
        let site = self.site(atom.span);
        let edits = near
            .iter()
            .map(|n| TextEdit {
                site,
                text: (*n).to_owned(),
            })
            .collect();
        self.error("syntax.word", atom.span, message, hint).edits = edits;
    }

    /// A label and what follows it.
    fn labelled(
        &mut self,
        key: &'static Key,
        item: &'static Item,
        atoms: &[Atom<'_>],
        group: &mut Group,
        faulty: &mut bool,
    ) -> usize {
        let Some(label) = atoms.first() else { return 1 };
        let skipped = atoms
            .iter()
            .skip(1)
            .take_while(|a| a.kind == TokenKind::Word && CONNECTING.contains(&a.text))
            .count();
        let start = 1 + skipped;
        let rest = atoms.get(start..).unwrap_or(&[]);
        if group.get(item.slot).is_some() {
            *faulty = true;
            let message = format!("`{}` stands twice in this group", label.text);
            self.error("syntax.word", label.span, message, "keep one".to_owned());
            return start + 1;
        }
        let Some(value) = rest.first() else {
            *faulty = true;
            let message = format!("nothing follows `{}`", label.text);
            self.error("syntax.value", label.span, message, expected(key));
            return start;
        };
        match &item.takes {
            Takes::Quantity { .. } => match self.quantity(key, &[item], rest, group, faulty) {
                Some(used) => start + used,
                None => {
                    *faulty = true;
                    let message = format!("`{}` after `{}` is no quantity", value.text, label.text);
                    let hint = format!("write `{} {}`", label.text, describe_value(item));
                    self.error("syntax.value", value.span, message, hint);
                    start + 1
                }
            },
            Takes::Choice(words) => {
                match words.iter().find(|w| **w == value.text) {
                    Some(found) => self.fill(group, item, Value::Word(found), value.span),
                    None => {
                        *faulty = true;
                        let near = nearest(value.text, words.iter().copied());
                        let hint = did_you_mean(
                            &near,
                            &format!("after `{}` stands one of {}", label.text, words.join(", ")),
                        );
                        let site = self.site(value.span);
                        let edits = near
                            .iter()
                            .map(|n| TextEdit {
                                site,
                                text: (*n).to_owned(),
                            })
                            .collect();
                        let message =
                            format!("`{}` is not understood after `{}`", value.text, label.text);
                        self.error("syntax.word", value.span, message, hint).edits = edits;
                    }
                }
                start + 1
            }
            Takes::Per(words) => start + self.per(item, words, rest, label, group, faulty),
            Takes::Name(_) | Takes::Text | Takes::Count | Takes::Fraction => start,
        }
    }

    fn per(
        &mut self,
        item: &Item,
        words: &[&'static str],
        rest: &[Atom<'_>],
        label: &Atom<'_>,
        group: &mut Group,
        faulty: &mut bool,
    ) -> usize {
        let Some(first) = rest.first() else { return 0 };
        if let Some(found) = words.iter().find(|w| **w == first.text && **w != "N") {
            self.fill(
                group,
                item,
                Value::Per(found, 1),
                label.span.cover(first.span),
            );
            return 1;
        }
        let follows = rest
            .get(1)
            .is_some_and(|a| matches!(a.text, "channels" | "channel"));
        if words.contains(&"N")
            && follows
            && let Some(n) = whole(first.text).filter(|n| *n > 0)
        {
            let end = rest.get(1).map_or(first.span, |a| a.span);
            self.fill(group, item, Value::Per("channel", n), label.span.cover(end));
            return 2;
        }
        *faulty = true;
        let mut choices: Vec<String> = words
            .iter()
            .filter(|w| **w != "N")
            .map(|w| (*w).to_owned())
            .collect();
        if words.contains(&"N") {
            choices.push("a number of channels such as `per 2 channels`".to_owned());
        }
        let message = format!("`per {}` is not understood here", first.text);
        self.error(
            "syntax.word",
            first.span,
            message,
            format!("after `per` stands {}", choices.join(", ")),
        );
        1
    }

    /// The trade's forms that state two items at once: `28-0-28`, `T3.15A`.
    fn compound(
        &mut self,
        shape: &'static Shape,
        atoms: &[Atom<'_>],
        group: &mut Group,
        faulty: &mut bool,
    ) -> Option<usize> {
        let texts = texts(atoms);
        let first = atoms.first()?;
        let free =
            |slot: &str, group: &Group| shape.item(slot).filter(|_| group.get(slot).is_none());
        if let (Some(count), Some(volts)) = (free("x", group), free("V", group))
            && let Some(found) = quantity::windings(&texts)
        {
            match found {
                Ok(windings) => {
                    let used = windings.each.used.max(1);
                    let span = atoms
                        .get(used - 1)
                        .map_or(first.span, |a| first.span.cover(a.span));
                    self.out.spellings.push((span, windings.canonical));
                    self.fill(group, count, Value::Count(2), span);
                    self.fill(group, volts, Value::Quantity(windings.each), span);
                    return Some(used);
                }
                Err(fault) => {
                    *faulty = true;
                    return Some(self.fault(fault, atoms, String::new()));
                }
            }
        }
        if let (Some(amps), Some(speed)) = (free("A", group), free("slow", group))
            && let Some(found) = quantity::fuse(first.text)
        {
            let word = match found.speed {
                FuseSpeed::Fast => "fast",
                FuseSpeed::Slow => "slow",
            };
            self.out.spellings.push((first.span, found.canonical));
            self.fill(group, amps, Value::Quantity(found.current), first.span);
            self.fill(group, speed, Value::Word(word), first.span);
            return Some(1);
        }
        None
    }

    /// Report a fault; the number of atoms it spans.
    fn fault(&mut self, fault: quantity::Fault, atoms: &[Atom<'_>], more: String) -> usize {
        let used = fault.used.clamp(1, atoms.len().max(1));
        let Some(span) = atoms
            .first()
            .zip(atoms.get(used - 1))
            .map(|(a, b)| a.span.cover(b.span))
        else {
            return used;
        };
        let rule = match fault.kind {
            FaultKind::Ambiguous => "data.unit-suspect",
            FaultKind::Number | FaultKind::OutOfRange => "syntax.number",
            FaultKind::MissingUnit | FaultKind::UnknownUnit | FaultKind::WrongDimension => {
                "syntax.unit"
            }
            FaultKind::Tolerance => "syntax.tolerance",
        };
        let site = self.site(span);
        let finding = self.error(rule, span, fault.message, format!("{}{more}", fault.hint));
        finding.edits = fault
            .readings
            .iter()
            .map(|r| TextEdit {
                site,
                text: r.text.clone(),
            })
            .collect();
        finding.readings = fault
            .readings
            .into_iter()
            .map(|r| (r.text, r.meaning))
            .collect();
        used
    }

    /// Read a quantity into the item of `items` whose dimension fits. `None` if this is no quantity.
    fn quantity(
        &mut self,
        key: &'static Key,
        items: &[&'static Item],
        atoms: &[Atom<'_>],
        group: &mut Group,
        faulty: &mut bool,
    ) -> Option<usize> {
        let dimension = |item: &Item| match item.takes {
            Takes::Quantity { dimension, .. } => Some(dimension),
            _ => None,
        };
        let wants: Vec<Dimension> = items.iter().filter_map(|i| dimension(i)).collect();
        if wants.is_empty() {
            return None;
        }
        match quantity::read_one_of(&texts(atoms), &wants) {
            Reading::Not => None,
            Reading::Wrong(fault) => {
                *faulty = true;
                let labels: Vec<String> = key
                    .shape()
                    .items
                    .iter()
                    .filter(|i| i.label.is_some() && group.get(i.slot).is_none())
                    .map(describe)
                    .collect();
                let more = match (fault.kind, labels.is_empty()) {
                    (FaultKind::WrongDimension, false) => {
                        format!("; `{}` also takes {}", key.name, labels.join(", "))
                    }
                    _ => String::new(),
                };
                Some(self.fault(fault, atoms, more))
            }
            Reading::Read { quantity, notes } => {
                let item = items
                    .iter()
                    .find(|i| dimension(i) == Some(quantity.dimension))?;
                Some(self.read(key, item, quantity, notes, atoms, group, faulty))
            }
        }
    }

    #[expect(
        clippy::too_many_arguments,
        reason = "the state of one match, used here only"
    )]
    fn read(
        &mut self,
        key: &'static Key,
        item: &'static Item,
        quantity: quantity::Quantity,
        notes: Vec<quantity::Note>,
        atoms: &[Atom<'_>],
        group: &mut Group,
        faulty: &mut bool,
    ) -> usize {
        let used = quantity.used.max(1);
        let Takes::Quantity {
            dimension,
            tolerance,
            extent,
            ..
        } = item.takes
        else {
            return used;
        };
        let Some(first) = atoms.first() else {
            return used;
        };
        let span = atoms
            .get(used - 1)
            .map_or(first.span, |a| first.span.cover(a.span));
        self.spell(&notes, &atoms[..used.min(atoms.len())], span);
        for note in notes {
            self.note(note, span);
        }
        if quantity.tolerance.is_some() && !tolerance {
            let message = format!(
                "no tolerance is wanted after {} in `{}`",
                describe_value(item),
                key.name
            );
            self.say(
                "syntax.tolerance",
                Severity::Error,
                span,
                message,
                "it would not be used here: write it right after the value it belongs to, or leave it out"
                    .to_owned(),
            );
        }
        if dimension == Dimension::Number
            && item.slot == "n"
            && (quantity.value.fract() != 0.0 || !(0.0..=MOST).contains(&quantity.value))
        {
            *faulty = true;
            let message = format!("`{}` wants a whole number", key.name);
            self.error("syntax.number", span, message, expected(key));
            return used;
        }
        let to = atoms.get(used).is_some_and(|a| a.text == "to");
        if extent != Extent::One && to {
            let rest = atoms.get(used + 1..).unwrap_or(&[]);
            match quantity::read(&texts(rest), dimension) {
                Reading::Read {
                    quantity: high,
                    notes,
                } => {
                    let more = high.used.max(1);
                    let end = rest.get(more - 1).map_or(span, |a| a.span);
                    self.spell(&notes, &rest[..more.min(rest.len())], end);
                    for note in notes {
                        self.note(note, end);
                    }
                    let whole = span.cover(end);
                    if high.value < quantity.value {
                        *faulty = true;
                        let message = "this range ends below its start".to_owned();
                        self.error(
                            "syntax.value",
                            whole,
                            message,
                            "write the lower value first".to_owned(),
                        );
                    }
                    self.plausible(key, item, quantity.value, span);
                    self.plausible(key, item, high.value, end);
                    self.fill(group, item, Value::Range(quantity, high), whole);
                    return used + 1 + more;
                }
                Reading::Wrong(wrong) => {
                    *faulty = true;
                    return used + 1 + self.fault(wrong, rest, String::new());
                }
                Reading::Not => {}
            }
        }
        if extent == Extent::Range {
            *faulty = true;
            let message = format!("`{}` wants a range", key.name);
            let dash = |a: &&Atom<'_>| matches!(a.text, "-" | "–" | "—" | "−" | ".." | "...");
            let other = atoms.get(used).filter(dash).and(atoms.get(used + 1));
            let hint = format!(
                "write both ends with their unit: `{} to {}`",
                atoms[0].text,
                other.map_or("…", |a| a.text)
            );
            self.error("syntax.value", span, message, hint);
            return used;
        }
        self.plausible(key, item, quantity.value, span);
        self.fill(group, item, Value::Quantity(quantity), span);
        used
    }

    /// Keep the usual spelling of a quantity that was written otherwise, or that is a part of a token.
    /// Every remark on one text carries the same usual spelling.
    fn spell(&mut self, notes: &[quantity::Note], atoms: &[Atom<'_>], span: Span) {
        if let Some(note) = notes.first() {
            self.out.spellings.push((span, note.canonical.clone()));
        } else if atoms.iter().any(|a| a.split) {
            let texts: Vec<&str> = atoms.iter().map(|a| a.text).collect();
            self.out.spellings.push((span, texts.join(" ")));
        }
    }

    fn note(&mut self, note: quantity::Note, span: Span) {
        if note.severity == NoteSeverity::Silent {
            return;
        }
        let edit = TextEdit {
            site: self.site(span),
            text: note.canonical.clone(),
        };
        let hint = format!("write `{}`", note.canonical);
        self.say(
            "syntax.spelling",
            Severity::Information,
            span,
            note.message,
            hint,
        )
        .edits
        .push(edit);
    }

    /// Ask about a value outside what such a part ever has.
    fn plausible(&mut self, key: &'static Key, item: &Item, value: f64, span: Span) {
        let Some((low, high)) = key.plausible(item.slot) else {
            return;
        };
        let Takes::Quantity { dimension, .. } = item.takes else {
            return;
        };
        let Some(found) =
            quantity::suspect(value, Band { low, high }, dimension, &slips(key, dimension))
        else {
            return;
        };
        let what = if item.label.is_some() {
            format!("`{}` of `{}`", item.slot, key.name)
        } else {
            format!("`{}`", key.name)
        };
        let site = self.site(span);
        let hint = match &found.replacement {
            Some(text) => format!(
                "did you mean `{text}`? if the value is right, waive data.unit-suspect with the reason"
            ),
            None => "correct it; if the value is right, waive data.unit-suspect with the reason"
                .to_owned(),
        };
        let finding = self.error(
            "data.unit-suspect",
            span,
            format!("{what}: {}", found.text),
            hint,
        );
        finding.edits = found
            .replacement
            .into_iter()
            .map(|text| TextEdit { site, text })
            .collect();
    }

    fn fill(&self, group: &mut Group, item: &Item, value: Value, span: Span) {
        group.slots.push(Slot {
            slot: item.slot,
            value,
            site: self.site(span),
        });
    }

    fn bought(&mut self, tokens: &[Token]) -> Bought {
        let mut bought = Bought::default();
        let mut tokens = tokens.iter().copied().peekable();
        while let Some(word) = tokens.next() {
            match word.text(self.text) {
                "ref" => {
                    while let Some(token) = tokens.next_if(|t| {
                        t.kind != TokenKind::Text
                            && !matches!(t.text(self.text), "ref" | "part" | "qty")
                    }) {
                        match designators(token.text(self.text)) {
                            Some(refs) => bought.refs.extend(refs),
                            None => {
                                let message =
                                    format!("`{}` is no designator", token.text(self.text));
                                self.error(
                                    "syntax.word",
                                    token.span,
                                    message,
                                    "write `ref R21-R24 R31`".to_owned(),
                                );
                            }
                        }
                    }
                }
                "part" => match tokens.next_if(|t| t.kind == TokenKind::Text) {
                    Some(token) => bought.part = Some(token.content(self.text).to_owned()),
                    None => {
                        self.error(
                            "syntax.value",
                            word.span,
                            "`part` wants an order code in quotes".to_owned(),
                            "write `part \"WW5-0R22J\"`".to_owned(),
                        );
                    }
                },
                "qty" => match tokens.next().map(|t| (t, whole(t.text(self.text)))) {
                    Some((_, Some(n))) => bought.quantity = Some(n),
                    _ => {
                        self.error(
                            "syntax.number",
                            word.span,
                            "`qty` wants a whole number".to_owned(),
                            "write `qty 4`".to_owned(),
                        );
                    }
                },
                other => {
                    let message = format!("`{other}` is not understood after the designators");
                    self.error(
                        "syntax.word",
                        word.span,
                        message,
                        "a bought part ends `ref R21-R24 part \"code\" qty 4`".to_owned(),
                    );
                }
            }
        }
        bought
    }
}

/// Most tokens that one quantity with its tolerance can take.
const MOST_TOKENS: usize = 12;

fn texts<'a>(atoms: &[Atom<'a>]) -> Vec<&'a str> {
    atoms
        .iter()
        .take_while(|a| a.kind != TokenKind::Text)
        .take(MOST_TOKENS)
        .map(|a| a.text)
        .collect()
}

/// Tokens as pieces that are read on their own: `2x28VAC` is a count, its sign and a quantity where
/// the shape has room for a count; `10000uF/63V` is two quantities.
fn atoms<'a>(text: &'a str, tokens: &[Token], shape: &Shape) -> Vec<Atom<'a>> {
    let mut out = Vec::with_capacity(tokens.len() + 2);
    let counts = shape.item("x").is_some();
    for token in tokens {
        let span = token.span;
        let word = token.text(text);
        let mut rest = word;
        let part = |text, kind| Atom {
            text,
            kind,
            span,
            split: true,
        };
        if counts
            && token.kind == TokenKind::Number
            && let Some((_, after)) = quantity::split_count(word)
        {
            let digits = word
                .find(|c: char| !c.is_ascii_digit())
                .unwrap_or(word.len());
            out.push(part(&word[..digits], TokenKind::Number));
            out.push(part("x", TokenKind::Times));
            rest = after;
        }
        if rest.is_empty() {
            continue;
        }
        match quantity::split_slash(rest) {
            Some((a, b)) if token.kind == TokenKind::Number => {
                out.push(part(a, TokenKind::Number));
                out.push(part(b, TokenKind::Number));
            }
            _ => out.push(Atom {
                text: rest,
                kind: token.kind,
                span,
                split: rest.len() < word.len(),
            }),
        }
    }
    out
}

/// The slips to try on an implausible value, the likeliest first.
fn slips(key: &Key, dimension: Dimension) -> Vec<Slip> {
    let mut slips = Vec::new();
    match dimension {
        Dimension::Resistance => slips.extend(quantity::LETTER_CODE),
        Dimension::ThermalResistance => slips.push(Slip::Reciprocal(
            "its reciprocal, if the unit was meant the other way up",
        )),
        _ => {}
    }
    if matches!(key.name, "secondary" | "rating") {
        slips.extend(quantity::HALF_OR_DOUBLE);
    }
    slips.extend(quantity::PREFIX);
    slips
}

fn waive_form() -> String {
    "write `waive RULE of PART in BUILD with ALTERNATE because \"reason\" by \"who\" until 2030-01-01`; only the rule and the reason are needed".to_owned()
}

fn did_you_mean(near: &[&str], usual: &str) -> String {
    match near {
        [] => usual.to_owned(),
        [one] => format!("did you mean `{one}`?"),
        more => format!(
            "did you mean {}?",
            more.iter()
                .map(|n| format!("`{n}`"))
                .collect::<Vec<_>>()
                .join(" or ")
        ),
    }
}

/// What a key takes, in words: `` `emitter` takes ohm±, W, pulse A ``.
#[must_use]
pub fn expected(key: &Key) -> String {
    let shape = key.shape();
    let items: Vec<String> = shape
        .items
        .iter()
        .map(|i| {
            if i.optional {
                format!("[{}]", describe(i))
            } else {
                describe(i)
            }
        })
        .collect();
    let selector = match &shape.selector {
        None => String::new(),
        Some(Selector::Rule) => "RULE ".to_owned(),
        Some(Selector::Words(words, time)) => {
            format!("{}{} ", words.join("|"), if *time { "|time" } else { "" })
        }
    };
    let more = if shape.list {
        ", and more groups after commas"
    } else {
        ""
    };
    format!(
        "write `{} {selector}{}`{more}: {}",
        key.name,
        items.join(" "),
        key.meaning
    )
}

/// An item with its label, in words.
#[must_use]
pub fn describe(item: &Item) -> String {
    match (&item.takes, item.label) {
        (Takes::Per(words), _) => {
            let words: Vec<&str> = words
                .iter()
                .map(|w| if *w == "N" { "N channels" } else { w })
                .collect();
            format!("per {}", words.join("|"))
        }
        (Takes::Choice(words), Some(label)) => format!("{label} {}", words.join("|")),
        (Takes::Choice(words), None) => words.join("|"),
        (_, Some(label)) => format!("{label} {}", describe_value(item)),
        (_, None) => describe_value(item),
    }
}

/// An item without its label.
fn describe_value(item: &Item) -> String {
    match &item.takes {
        Takes::Quantity { unit: "n", .. } => "a whole number".to_owned(),
        Takes::Quantity { unit: "num", .. } => "a number".to_owned(),
        Takes::Quantity {
            unit,
            extent: Extent::Range,
            ..
        } => format!("{unit} to {unit}"),
        Takes::Quantity { unit, .. } => (*unit).to_owned(),
        Takes::Choice(words) | Takes::Per(words) => words.join("|"),
        Takes::Name(kind) => format!("<{kind}>"),
        Takes::Text => "\"text\"".to_owned(),
        Takes::Count => "N x".to_owned(),
        Takes::Fraction => "1/8".to_owned(),
    }
}

fn whole(text: &str) -> Option<u32> {
    text.parse().ok().filter(|n| f64::from(*n) <= MOST)
}

/// `1/8` as a number in (0, 1].
fn fraction(text: &str) -> Option<f64> {
    let (a, b) = text.split_once('/')?;
    let (a, b): (u32, u32) = (a.parse().ok()?, b.parse().ok()?);
    (a > 0 && b >= a && f64::from(b) <= MOST).then(|| f64::from(a) / f64::from(b))
}

/// `R21-R24` as four designators, `R21` as one. At most a thousand; the two ends must share letters.
pub(crate) fn designators(text: &str) -> Option<Vec<String>> {
    let split = |d: &str| -> Option<(String, u32)> {
        let at = d.find(|c: char| c.is_ascii_digit())?;
        let (letters, digits) = d.split_at(at);
        (!letters.is_empty() && letters.chars().all(|c| c.is_alphabetic() || c == '_'))
            .then_some(())?;
        Some((letters.to_owned(), digits.parse().ok()?))
    };
    match text.split_once('-') {
        None => split(text).map(|_| vec![text.to_owned()]),
        Some((from, to)) => {
            let ((letters, first), (same, last)) = (split(from)?, split(to)?);
            if letters != same || last < first || last - first > 1000 {
                return None;
            }
            Some((first..=last).map(|n| format!("{letters}{n}")).collect())
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn designator_ranges_expand() {
        assert_eq!(designators("R21-R23").unwrap(), ["R21", "R22", "R23"]);
        assert_eq!(designators("Q7").unwrap(), ["Q7"]);
        assert_eq!(designators("R24-R21"), None);
        assert_eq!(designators("R1-C4"), None);
        assert_eq!(designators("R1-R99999"), None);
    }

    #[test]
    fn fractions_lie_in_zero_to_one() {
        assert_eq!(fraction("1/8"), Some(0.125));
        assert_eq!(fraction("8/1"), None);
        assert_eq!(fraction("0/8"), None);
        assert_eq!(fraction("1/0"), None);
    }
}
