//! What may be written where the cursor stands, read off the vocabulary and the declared names.
//! Must not know any particular key.

use ampspec_grammar::{Span, Token, TokenKind};

use crate::build::lower::{describe, expected};
use crate::policy;
use crate::quantity::Dimension;
use crate::rules;
use crate::vocabulary::{BLOCKS, Block, Key, STATEMENTS, Selector, Takes};

use super::Scene;
use super::cursor::{Change, Place, Values, place, token_at};
use super::web::Declaration;

/// What an offer is, for the picture beside it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sort {
    /// A kind of block or a statement.
    Block,
    /// A key.
    Key,
    /// One of the words of a key, or a label.
    Word,
    /// A unit.
    Unit,
    /// A declared name.
    Name,
    /// A rule.
    Rule,
    /// A policy that is built in.
    Policy,
}

/// One thing that may be written.
#[derive(Clone, Debug, PartialEq)]
pub struct Offer {
    /// The text that is shown and matched.
    pub label: String,
    /// What it is.
    pub sort: Sort,
    /// A few words beside it.
    pub detail: String,
    /// More of them, in Markdown.
    pub help: String,
    /// What is written.
    pub insert: String,
    /// The same with places to fill in, `${1:name}`, where there are any.
    pub snippet: Option<String>,
    /// What it replaces.
    pub replaces: Span,
    /// Its rank: required keys come first.
    pub rank: u8,
}

/// Everything that may be written at an offset.
#[must_use]
pub fn complete(scene: &Scene<'_>, offset: usize) -> Vec<Offer> {
    let text = scene.text();
    let typed = token_at(scene.tree, offset);
    if typed.is_some_and(|t| t.kind == TokenKind::Text && t.span.start < offset) {
        return Vec::new();
    }
    // a number at the cursor is not the beginning of any word
    let replaces = match typed.filter(|t| t.kind == TokenKind::Word && t.span.start < offset) {
        Some(token) => token.span,
        None => Span::at(offset),
    };
    let declared = scene.web.declarations(scene.path);
    let kinds = scene.web.kinds(scene.path);
    let mut offers = Offers {
        replaces,
        declared: &declared,
        out: Vec::new(),
    };
    match place(scene.tree, offset, &kinds) {
        Place::Comment => {}
        Place::Outside => offers.outside(),
        Place::Header { kind, before } => offers.header(text, kind, &before),
        Place::Key { block, kind } => {
            let stated: Vec<&str> = block
                .lines
                .iter()
                .filter(|l| !l.key.span.touches(offset))
                .map(|l| l.key.text(text))
                .collect();
            offers.keys(kind, &stated);
            let column_one = scene
                .tree
                .line_index()
                .line_span(scene.tree.line_index().line_of(offset))
                .start
                == replaces.start;
            if column_one {
                offers.outside();
            }
        }
        Place::Values(values) => offers.values(text, &values),
    }
    offers.out
}

struct Offers<'a> {
    replaces: Span,
    declared: &'a [Declaration],
    out: Vec<Offer>,
}

impl Offers<'_> {
    fn add(&mut self, sort: Sort, label: &str, detail: impl Into<String>) -> Option<&mut Offer> {
        if self.out.iter().any(|o| o.label == label && o.sort == sort) {
            return None;
        }
        self.out.push(Offer {
            label: label.to_owned(),
            sort,
            detail: detail.into(),
            help: String::new(),
            insert: label.to_owned(),
            snippet: None,
            replaces: self.replaces,
            rank: 5,
        });
        self.out.last_mut()
    }

    fn outside(&mut self) {
        for key in STATEMENTS {
            if let Some(offer) = self.add(Sort::Block, key.name, key.meaning) {
                offer.insert = format!("{} ", key.name);
                offer.rank = 6;
            }
        }
        for block in BLOCKS {
            if let Some(offer) = self.add(Sort::Block, block.kind, block.meaning) {
                offer.snippet = Some(skeleton(block));
                offer.help = keys_table(block);
            }
        }
    }

    fn header(&mut self, text: &str, kind: &'static Block, before: &[Token]) {
        if before.is_empty() {
            return;
        }
        if before.last().is_some_and(|t| t.text(text) == "from") {
            self.names(kind.kind);
            return;
        }
        for flavour in kind.flavours {
            self.add(Sort::Word, flavour, kind.meaning);
        }
        self.add(
            Sort::Word,
            "from",
            format!("start from another {}", kind.kind),
        );
    }

    fn keys(&mut self, kind: &'static Block, stated: &[&str]) {
        for key in kind
            .keys
            .iter()
            .filter(|k| k.repeats || !stated.contains(&k.name))
        {
            if let Some(offer) = self.add(Sort::Key, key.name, key.meaning) {
                offer.insert = format!("{} ", key.name);
                offer.help = key_help(key);
                offer.rank = if key.default.starts_with("req") { 1 } else { 3 };
            }
        }
    }

    fn names(&mut self, kind: &str) {
        for declared in self
            .declared
            .iter()
            .filter(|d| kind == "any" || d.kind.kind == kind)
        {
            let detail = declared
                .title
                .clone()
                .unwrap_or_else(|| declared.kind.kind.to_owned());
            if let Some(offer) = self.add(Sort::Name, &declared.name, detail) {
                offer.rank = 2;
            }
        }
        if kind == "policy" {
            for name in policy::NAMES {
                self.add(Sort::Policy, name, "built-in policy");
            }
        }
    }

    fn rules(&mut self) {
        for rule in rules::all() {
            if let Some(offer) = self.add(Sort::Rule, rule.name, rule.compares) {
                offer.help = crate::render::explain::markdown(rule);
            }
        }
    }

    fn values(&mut self, text: &str, values: &Values) {
        let shape = values.key.shape();
        match values.change {
            Change::Block => return self.names("any"),
            Change::Key(kind) => {
                for key in kind.keys.iter().filter(|k| k.shape().special.is_none()) {
                    if let Some(offer) = self.add(Sort::Key, key.name, key.meaning) {
                        offer.help = key_help(key);
                    }
                }
                return;
            }
            Change::Settled => {}
        }
        if shape.special == Some("WAIVE") {
            return self.waiver(text, &values.before);
        }
        let mut before = values.before.as_slice();
        if values.group == 0
            && let Some(selector) = &shape.selector
        {
            match before.split_first() {
                None => return self.selector(selector),
                Some((_, rest)) => before = rest,
            }
        }
        if values.group == 0 && before.is_empty() && !values.key.required() {
            self.add(Sort::Word, "none", "known not fitted");
        }
        self.items(text, values.key, before);
    }

    fn selector(&mut self, selector: &Selector) {
        match selector {
            Selector::Rule => self.rules(),
            Selector::Words(words, _) => {
                for word in words {
                    self.add(Sort::Word, word, "which of several");
                }
            }
        }
    }

    fn waiver(&mut self, text: &str, before: &[Token]) {
        match before.last().map(|t| t.text(text)) {
            None => self.rules(),
            Some("of") => self.names("any"),
            Some("in") => self.names("build"),
            Some("with") => self.names("alternate"),
            Some("because" | "by" | "until") => {}
            Some(_) => {
                let words = [
                    ("because", "why it is acceptable"),
                    ("of", "only this part"),
                    ("in", "only this build"),
                    ("with", "only with this alternate"),
                    ("by", "who accepted it"),
                    ("until", "2030-01-31"),
                ];
                for (word, detail) in words {
                    if !before.iter().any(|t| t.text(text) == word) {
                        self.add(Sort::Word, word, detail);
                    }
                }
            }
        }
    }

    fn items(&mut self, text: &str, key: &'static Key, before: &[Token]) {
        let shape = key.shape();
        let said = |word: &str| before.iter().any(|t| t.text(text) == word);
        let last = before.last();
        let label = last.and_then(|t| shape.items.iter().find(|i| i.label == Some(t.text(text))));
        if let Some(item) = label {
            match &item.takes {
                Takes::Choice(words) => return self.words(words, item.label.unwrap_or("")),
                Takes::Per(words) => {
                    let words: Vec<&str> = words.iter().copied().filter(|w| *w != "N").collect();
                    return self.words(&words, "per");
                }
                _ => {}
            }
        }
        let named = before
            .iter()
            .filter(|t| {
                t.kind == TokenKind::Word && self.declared.iter().any(|d| d.name == t.text(text))
            })
            .count();
        let mut names = 0;
        for item in &shape.items {
            match (&item.takes, item.label) {
                (
                    Takes::Quantity {
                        dimension, unit, ..
                    },
                    _,
                ) => {
                    if last.is_some_and(|t| t.kind == TokenKind::Number) {
                        for unit in units(unit, *dimension) {
                            self.add(Sort::Unit, unit, describe(item));
                        }
                    } else if let Some(label) = item.label.filter(|l| !said(l)) {
                        self.add(Sort::Word, label, describe(item));
                    }
                }
                (Takes::Choice(words), None) if !words.iter().any(|w| said(w)) => {
                    self.words(words, key.name)
                }
                (Takes::Choice(_) | Takes::Per(_), Some(label)) if !said(label) => {
                    self.add(Sort::Word, label, describe(item));
                }
                (Takes::Name(kind), _) => {
                    if names >= named {
                        self.names(kind);
                    }
                    names += 1;
                }
                _ => {}
            }
        }
        if shape.bought && !before.is_empty() {
            for (word, detail) in [
                ("ref", "designators: R21-R24"),
                ("part", "order code in quotes"),
                ("qty", "how many"),
            ] {
                if !said(word) {
                    self.add(Sort::Word, word, detail);
                }
            }
        }
    }

    fn words(&mut self, words: &[&str], detail: &str) {
        for word in words {
            self.add(Sort::Word, word, detail);
        }
    }
}

/// Units that people write for a unit of the table, the likeliest first.
fn units(unit: &'static str, dimension: Dimension) -> Vec<&'static str> {
    match dimension {
        Dimension::Voltage => vec!["V", "mV", "Vac"],
        Dimension::Current => vec!["A", "mA"],
        Dimension::Resistance => vec!["ohm", "mohm", "kohm"],
        Dimension::Capacitance => vec!["uF", "nF", "pF"],
        Dimension::Inductance => vec!["uH", "mH"],
        Dimension::Frequency => vec!["Hz", "kHz", "MHz"],
        Dimension::Time if unit == "h" => vec!["h"],
        Dimension::Time => vec!["s", "ms"],
        Dimension::Number => Vec::new(),
        _ => vec![unit],
    }
}

/// What a key takes and means, in Markdown.
pub(super) fn key_help(key: &Key) -> String {
    let code = crate::render::escape::markdown_code;
    let mut out = crate::render::escape::markdown(&expected(key));
    if !key.symbol.is_empty() {
        out.push_str(&format!("\n\nsymbol {}", code(key.symbol)));
    }
    out.push_str(&match key.default {
        "req" => "\n\nrequired".to_owned(),
        "-" => "\n\nnot stated: what needs it is unchecked".to_owned(),
        default => format!(
            "\n\nif not stated: {}",
            crate::render::escape::markdown(default)
        ),
    });
    out
}

fn keys_table(block: &Block) -> String {
    let keys: Vec<String> = block
        .keys
        .iter()
        .map(|k| crate::render::escape::markdown_code(k.name))
        .collect();
    format!(
        "{}\n\nkeys: {}",
        crate::render::escape::markdown(block.meaning),
        keys.join(", ")
    )
}

/// A block with its required keys, with places to fill in.
fn skeleton(block: &Block) -> String {
    let flavour = if block.flavours.is_empty() {
        String::new()
    } else {
        format!(" ${{2|{}|}}", block.flavours.join(","))
    };
    let mut out = format!("{} ${{1:name}}{flavour} {{\n", block.kind);
    let mut stop = 3;
    for key in block.keys.iter().filter(|k| k.default.starts_with("req")) {
        out.push_str(&format!("    {} ${stop}\n", key.name));
        stop += 1;
    }
    if stop == 3 {
        out.push_str("    $3\n");
    }
    out.push_str("}\n");
    out
}
