//! Canonical layout and spelling of a text. Meaning never changes.
//! Must not know what values are for.

use std::collections::HashMap;

use ampspec_grammar::{Block, Line, Spelling, Tree, layout, parse};

use crate::build::lower::{declared_kinds, lower};
use crate::finding::FileId;
use crate::quantity::{Dimension, Reading, read};
use crate::vocabulary::{Selector, block_kind};

/// The text in canonical layout and spelling. Lines that do not parse stay as they are.
///
/// # Errors
/// Why nothing is changed.
pub fn tidy(text: &str) -> Result<String, String> {
    let tree = parse(text);
    let kinds: HashMap<String, _> = declared_kinds(&tree)
        .map(|(name, kind)| (name.to_owned(), kind))
        .collect();
    let lowered = lower(FileId(0), &tree, &kinds);
    let mut spellings: HashMap<usize, (usize, Vec<String>)> = HashMap::new();
    for (span, text) in lowered.spellings {
        let entry = spellings
            .entry(span.start)
            .or_insert((span.end, Vec::new()));
        entry.0 = entry.0.max(span.end);
        entry.1.extend(text.split_whitespace().map(str::to_owned));
    }
    layout(&tree, &Usual { spellings })
        .ok_or_else(|| "the tidied text would not be read as this one is".to_owned())
}

/// The usual spellings of one text, by where they start: where they end, and the tokens.
struct Usual {
    spellings: HashMap<usize, (usize, Vec<String>)>,
}

impl Spelling for Usual {
    fn selector(&self, tree: &Tree, block: &Block, line: &Line) -> Option<usize> {
        let kind = block_kind(block.kind.text(&tree.text))?;
        let shape = kind.key(line.key.text(&tree.text))?.shape();
        if shape.special.is_some() {
            return None;
        }
        match &shape.selector {
            None => Some(0),
            Some(Selector::Rule) => None,
            Some(Selector::Words(words, _)) => {
                let tokens: Vec<&str> = line
                    .groups
                    .first()?
                    .tokens
                    .iter()
                    .map(|t| t.text(&tree.text))
                    .collect();
                if tokens.first().is_some_and(|t| words.contains(t)) {
                    return Some(1);
                }
                match read(&tokens, Dimension::Time) {
                    Reading::Read { quantity, .. } => Some(quantity.used),
                    _ => Some(0),
                }
            }
        }
    }

    fn group(
        &self,
        tree: &Tree,
        _: Option<&Block>,
        line: &Line,
        group: usize,
    ) -> Option<Vec<String>> {
        let tokens = &line.groups.get(group)?.tokens;
        let mut out = Vec::with_capacity(tokens.len());
        let mut reached = 0;
        let mut changed = false;
        for token in tokens {
            if token.span.start < reached {
                continue;
            }
            match self.spellings.get(&token.span.start) {
                Some((end, words)) => {
                    out.extend(words.iter().cloned());
                    reached = *end;
                    changed = true;
                }
                None => out.push(token.text(&tree.text).to_owned()),
            }
        }
        changed.then_some(out)
    }
}

#[cfg(test)]
mod tests {
    use super::tidy;

    /// The same spellings that the language page lists as accepted silently.
    #[test]
    fn the_trades_habits_become_the_usual_spelling() {
        let before = "ampspec 1\ntransformer t {\n secondary 2x28VAC\n}\ntransformer u {\n secondary 28-0-28\n}\nsupply s {\nreservoir 10000uF/63V per rail\nfuse mains T3.15A\n}\nstage o {\nemitter 4K7 5W\ninsulator 0,35 degC/W\n}\n";
        let after = tidy(before).unwrap();
        for text in [
            "secondary",
            "2 x 28 Vac",
            "10000 uF 63 V per rail",
            "fuse mains",
            "3.15 A slow",
            "4k7 5 W",
            "0.35 K/W",
        ] {
            assert!(after.contains(text), "{text} in\n{after}");
        }
        assert_eq!(tidy(&after).unwrap(), after);
    }

    #[test]
    fn demo_kits_are_tidy() {
        for kit in crate::testing::all_kits() {
            let text = std::fs::read_to_string(&kit).unwrap();
            assert_eq!(tidy(&text).unwrap(), text, "{}", kit.display());
        }
    }
}
