//! The items of the key that is being filled in, and which of them comes next.
//! Must not know any particular key.

use ampspec_grammar::TokenKind;

use crate::build::lower::describe;
use crate::vocabulary::{Selector, Takes};

use super::Scene;
use super::cursor::{Change, Place, place};

/// The items of a key.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Signature {
    /// `emitter ohm W pulse A`.
    pub label: String,
    /// The one-line meaning of the key.
    pub meaning: &'static str,
    /// The items, as byte ranges of the label.
    pub items: Vec<(usize, usize)>,
    /// The item that comes next.
    pub active: Option<usize>,
}

/// The signature at an offset, where the cursor stands after a key.
#[must_use]
pub fn signature(scene: &Scene<'_>, offset: usize) -> Option<Signature> {
    let kinds = scene.web.kinds(scene.path);
    let Place::Values(values) = place(scene.tree, offset, &kinds) else {
        return None;
    };
    if !matches!(values.change, Change::Settled) {
        return None;
    }
    let (key, text) = (values.key, scene.text());
    let shape = key.shape();
    let mut out = Signature {
        label: key.name.to_owned(),
        meaning: key.meaning,
        items: Vec::new(),
        active: None,
    };
    let mut add = |text: String| {
        out.label.push(' ');
        let start = out.label.len();
        out.label.push_str(&text);
        out.items.push((start, out.label.len()));
    };
    let mut before = values.before.as_slice();
    let mut skipped = 0;
    if values.group == 0
        && let Some(selector) = &shape.selector
    {
        add(match selector {
            Selector::Rule => "RULE".to_owned(),
            Selector::Words(words, time) => {
                format!("{}{}", words.join("|"), if *time { "|time" } else { "" })
            }
        });
        skipped = 1;
        before = before.split_first().map_or(&[][..], |s| s.1);
    }
    for item in &shape.items {
        let said = describe(item);
        add(if item.optional {
            format!("[{said}]")
        } else {
            said
        });
    }
    let said = |word: &str| before.iter().any(|t| t.text(text) == word);
    let mut numbers = before
        .iter()
        .filter(|t| t.kind == TokenKind::Number)
        .count();
    let mut words = before.iter().filter(|t| t.kind == TokenKind::Word).count();
    out.active = if skipped == 1 && values.before.is_empty() {
        Some(0)
    } else {
        // labelled items are told by their label, the others by counting what they are made of
        shape
            .items
            .iter()
            .position(|item| match (&item.takes, item.label) {
                (Takes::Per(_), _) => !said("per"),
                (_, Some(label)) => !said(label) && !item.optional,
                (Takes::Choice(choices), None) => !choices.iter().any(|c| said(c)),
                (Takes::Quantity { .. } | Takes::Count | Takes::Fraction, None) => {
                    let open = numbers == 0;
                    numbers = numbers.saturating_sub(1);
                    open && !(item.optional && matches!(item.takes, Takes::Count))
                }
                (Takes::Name(_), None) => {
                    let open = words == 0;
                    words = words.saturating_sub(1);
                    open
                }
                (Takes::Text, None) => !before.iter().any(|t| t.kind == TokenKind::Text),
            })
    }
    .map(|at| {
        if skipped == 1 && !values.before.is_empty() {
            at + 1
        } else {
            at
        }
    });
    Some(out)
}
