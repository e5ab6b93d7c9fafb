//! The vocabulary: one table that lowering, validation, suggestions, completion, hover, tidy and the
//! language reference are all read from. Must not know how a value is used.

pub mod shape;
mod table;

use std::sync::LazyLock;

pub use shape::{Extent, Item, Selector, Shape, Takes};
pub use table::{BLOCKS, STATEMENTS};

/// A key of a block, or a statement outside blocks.
#[derive(Debug)]
pub struct Key {
    /// As written.
    pub name: &'static str,
    /// The shape text; see [`Shape`].
    pub shape: &'static str,
    /// `req`, `-` (not stated: whatever needs it is unchecked), or the default in words.
    pub default: &'static str,
    /// One line.
    pub meaning: &'static str,
    /// The symbol data sheets use, or empty.
    pub symbol: &'static str,
    /// It may be stated again with another selector.
    pub repeats: bool,
    /// Plausible values by slot, in SI units: outside it people are asked.
    pub bands: [Option<(&'static str, f64, f64)>; 6],
}

/// A kind of block.
#[derive(Debug)]
pub struct Block {
    /// `device`.
    pub kind: &'static str,
    /// Words of which one stands in the header: `npn`.
    pub flavours: &'static [&'static str],
    /// One line.
    pub meaning: &'static str,
    /// Its keys.
    pub keys: &'static [Key],
}

const fn key(
    name: &'static str,
    shape: &'static str,
    default: &'static str,
    meaning: &'static str,
) -> Key {
    Key {
        name,
        shape,
        default,
        meaning,
        symbol: "",
        repeats: false,
        bands: [None; 6],
    }
}

const fn block(
    kind: &'static str,
    flavours: &'static [&'static str],
    meaning: &'static str,
    keys: &'static [Key],
) -> Block {
    Block {
        kind,
        flavours,
        meaning,
        keys,
    }
}

impl Key {
    const fn symbol(mut self, symbol: &'static str) -> Self {
        self.symbol = symbol;
        self
    }
    const fn repeats(mut self) -> Self {
        self.repeats = true;
        self
    }
    const fn band(mut self, slot: &'static str, low: f64, high: f64) -> Self {
        let mut at = 0;
        while self.bands[at].is_some() {
            at += 1;
        }
        self.bands[at] = Some((slot, low, high));
        self
    }
    /// The build does not check without it.
    #[must_use]
    pub fn required(&self) -> bool {
        self.default == "req"
    }
    /// Plausible values of a slot.
    #[must_use]
    pub fn plausible(&self, slot: &str) -> Option<(f64, f64)> {
        self.bands
            .iter()
            .flatten()
            .find(|b| b.0 == slot)
            .map(|b| (b.1, b.2))
    }
}

/// The kind of this name.
#[must_use]
pub fn block_kind(kind: &str) -> Option<&'static Block> {
    BLOCKS.iter().find(|b| b.kind == kind)
}

impl Block {
    /// The key of this name.
    #[must_use]
    pub fn key(&self, name: &str) -> Option<&'static Key> {
        self.keys.iter().find(|k| k.name == name)
    }
}

/// Every shape, read once.
static SHAPES: LazyLock<Vec<(&'static str, Shape)>> = LazyLock::new(|| {
    let keys = BLOCKS.iter().flat_map(|b| b.keys).chain(STATEMENTS);
    let mut shapes: Vec<_> = keys.map(|k| (k.shape, Shape::read(k.shape))).collect();
    shapes.sort_by_key(|s| s.0);
    shapes.dedup_by_key(|s| s.0);
    shapes
});

/// An empty shape, for the case that cannot be.
static NO_SHAPE: LazyLock<Shape> = LazyLock::new(Shape::default);

impl Key {
    /// What it takes.
    #[must_use]
    pub fn shape(&self) -> &'static Shape {
        match SHAPES.binary_search_by_key(&self.shape, |s| s.0) {
            Ok(at) => SHAPES.get(at).map_or(&NO_SHAPE, |s| &s.1),
            Err(_) => &NO_SHAPE,
        }
    }
}

/// The names nearest to `word`, best first, at most three, for "did you mean".
#[must_use]
pub fn nearest<'a>(word: &str, names: impl Iterator<Item = &'a str>) -> Vec<&'a str> {
    let mut scored: Vec<(f64, &str)> = names
        .map(|name| (strsim::jaro_winkler(word, name), name))
        .filter(|(score, name)| {
            *score > 0.82 || strsim::damerau_levenshtein(word, name) <= 1 + name.len() / 6
        })
        .collect();
    scored.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(b.1)));
    scored.dedup();
    scored.into_iter().take(3).map(|s| s.1).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Every word of every shape is understood, and two quantities of one dimension in a group are
    /// told apart by labels.
    #[test]
    fn the_table_is_sound() {
        for block in BLOCKS {
            for key in block.keys {
                let name = format!("{} {}", block.kind, key.name);
                let shape = key.shape();
                assert!(shape.special.is_some() || !shape.items.is_empty(), "{name}");
                for (at, item) in shape.items.iter().enumerate() {
                    assert!(
                        !shape.items[..at].iter().any(|i| i.slot == item.slot),
                        "{name}: slot {} twice",
                        item.slot
                    );
                    let Takes::Quantity { dimension, .. } = item.takes else {
                        continue;
                    };
                    let unlabelled = shape.items.iter().filter(|i| i.label.is_none());
                    let same = unlabelled.filter(|i| matches!(i.takes, Takes::Quantity { dimension: d, .. } if d == dimension));
                    assert!(same.count() <= 1, "{name}: two unlabelled {dimension:?}");
                }
                for (slot, low, high) in key.bands.iter().flatten() {
                    assert!(
                        shape.item(slot).is_some(),
                        "{name}: band for unknown slot {slot}"
                    );
                    assert!(low < high, "{name}: empty band");
                }
            }
        }
    }

    #[test]
    fn a_typed_key_finds_its_neighbours() {
        let keys = || block_kind("stage").unwrap().keys.iter().map(|k| k.name);
        assert_eq!(nearest("emiter", keys()).first(), Some(&"emitter"));
        assert_eq!(nearest("isulator", keys()).first(), Some(&"insulator"));
        assert!(nearest("zzz", keys()).is_empty());
    }
}
