//! Where names stand in a tree: in headers, on lines that name blocks, in changes and waivers.
//! Must not know which file declares a name.

use ampspec_grammar::{Item, Line, Span, Token, TokenKind, Tree, parse};

use crate::quantity::is_unit;
use crate::vocabulary::shape::CONNECTING;
use crate::vocabulary::{BLOCKS, Block, Key, Selector, Takes, block_kind};

use super::web::Kinds;

/// What a name does where it stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Role {
    /// It stands in the header of its block.
    Declared,
    /// It stands for a block.
    Used,
}

/// A name in a text.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Name {
    /// Its bytes.
    pub span: Span,
    /// The kind of block wanted here; `any` where any will do.
    pub kind: &'static str,
    /// What it does.
    pub role: Role,
}

/// Every name of a tree, in order. `kinds` knows the kinds of blocks that `change` may name.
#[must_use]
pub fn of_tree(tree: &Tree, kinds: &Kinds) -> Vec<Name> {
    let mut out = Vec::new();
    for item in &tree.items {
        match item {
            Item::Line(line) => waiver(tree, line, &mut out),
            Item::Block(block) => {
                let Some(kind) = block_kind(block.kind.text(&tree.text)) else {
                    continue;
                };
                out.extend(block.name().map(|n| Name {
                    span: n.span,
                    kind: kind.kind,
                    role: Role::Declared,
                }));
                let from = block.header.windows(2).filter_map(|pair| match pair {
                    [from, name]
                        if from.text(&tree.text) == "from" && name.kind == TokenKind::Word =>
                    {
                        Some(*name)
                    }
                    _ => None,
                });
                out.extend(from.map(|n| used(n, kind.kind)));
                for line in &block.lines {
                    let groups: Vec<&[Token]> =
                        line.groups.iter().map(|g| g.tokens.as_slice()).collect();
                    statement(tree, kind, line.key, &groups, kinds, &mut out);
                }
            }
        }
    }
    out
}

fn used(token: Token, kind: &'static str) -> Name {
    Name {
        span: token.span,
        kind,
        role: Role::Used,
    }
}

fn waiver(tree: &Tree, line: &Line, out: &mut Vec<Name>) {
    if line.key.text(&tree.text) != "waive" {
        return;
    }
    let tokens: Vec<Token> = line
        .groups
        .iter()
        .flat_map(|g| g.tokens.iter().copied())
        .collect();
    for pair in tokens.windows(2) {
        let [word, name] = pair else { continue };
        let kind = match word.text(&tree.text) {
            "of" => "any",
            "in" => "build",
            "with" => "alternate",
            _ => continue,
        };
        if name.kind == TokenKind::Word {
            out.push(used(*name, kind));
        }
    }
}

fn statement(
    tree: &Tree,
    kind: &'static Block,
    key: Token,
    groups: &[&[Token]],
    kinds: &Kinds,
    out: &mut Vec<Name>,
) {
    let Some(found) = kind.key(key.text(&tree.text)) else {
        return;
    };
    let shape = found.shape();
    if shape.special == Some("CHANGE") {
        let first = groups.first().copied().unwrap_or(&[]);
        let Some(block) = first.first() else { return };
        out.push(used(*block, "any"));
        let (Some(inner), Some(kind)) = (first.get(1), kinds.get(block.text(&tree.text))) else {
            return;
        };
        let mut rest: Vec<&[Token]> = vec![first.get(2..).unwrap_or(&[])];
        rest.extend(groups.iter().skip(1));
        // a `change` inside a `change` names nothing
        if kind
            .key(inner.text(&tree.text))
            .is_some_and(|k| k.shape().special.is_none())
        {
            statement(tree, kind, *inner, &rest, kinds, out);
        }
        return;
    }
    let wanted: Vec<&'static str> = wanted(found).collect();
    if wanted.is_empty() {
        return;
    }
    for group in groups {
        let names = words(&tree.text, found, group);
        out.extend(
            names
                .into_iter()
                .zip(&wanted)
                .map(|(token, kind)| used(token, kind)),
        );
    }
}

/// The kinds of block that a key names, in order.
pub(super) fn wanted(key: &Key) -> impl Iterator<Item = &'static str> {
    key.shape().items.iter().filter_map(|i| match i.takes {
        Takes::Name(kind) => Some(kind),
        _ => None,
    })
}

/// The words of a group that are no label, no choice and no connecting word.
fn words(text: &str, key: &Key, group: &[Token]) -> Vec<Token> {
    let end = group
        .iter()
        .position(|t| matches!(t.text(text), "ref" | "part" | "qty"));
    let bought = end.filter(|_| key.shape().bought).unwrap_or(group.len());
    let mut out = Vec::new();
    let mut per = false;
    for token in group.get(..bought).unwrap_or(group) {
        let word = token.text(text);
        if token.kind != TokenKind::Word || std::mem::take(&mut per) {
            // `per 2 channels` is one item of three tokens
            per = token.kind == TokenKind::Number && per_before(text, group, *token);
            continue;
        }
        if word == "per" {
            per = true;
        } else if word != "none" && !reserved_in(key, word) {
            out.push(*token);
        }
    }
    out
}

fn per_before(text: &str, group: &[Token], token: Token) -> bool {
    let at = group.iter().position(|t| *t == token).unwrap_or(0);
    at > 0 && group.get(at - 1).is_some_and(|t| t.text(text) == "per")
}

/// Words that a key reads as its own before it looks for names.
fn reserved_in(key: &Key, word: &str) -> bool {
    let shape = key.shape();
    let selects =
        matches!(&shape.selector, Some(Selector::Words(words, _)) if words.contains(&word));
    let taken = shape.items.iter().any(|i| match &i.takes {
        Takes::Choice(words) => i.label == Some(word) || words.contains(&word),
        _ => i.label == Some(word),
    });
    selects || taken || CONNECTING.contains(&word)
}

/// Why a block cannot have this name; `None` if it can.
#[must_use]
pub fn refused(name: &str) -> Option<String> {
    let tree = parse(format!("load {name} {{\n}}\n"));
    let read = tree
        .blocks()
        .next()
        .and_then(|b| (b.header.len() == 1).then(|| b.name()).flatten());
    let starts = name.chars().next().is_some_and(char::is_alphabetic);
    if !tree.problems.is_empty() || !starts || read.is_none_or(|n| n.text(&tree.text) != name) {
        return Some(format!(
            "`{name}` is no name: a name is one word that starts with a letter"
        ));
    }
    if is_unit(name) {
        return Some(format!("`{name}` is a unit and cannot be a name"));
    }
    let keys = BLOCKS
        .iter()
        .flat_map(|b| b.keys)
        .filter(|k| wanted(k).next().is_some());
    let mut reserved = keys.filter(|k| reserved_in(k, name));
    if matches!(name, "none" | "per" | "ref" | "part" | "qty" | "from") || reserved.next().is_some()
    {
        return Some(format!(
            "`{name}` is a word of the language and cannot be a name"
        ));
    }
    None
}
