//! What a line of a block says once its words have been matched with the vocabulary.
//! Must not know what the values are for.

use std::sync::Arc;

use crate::finding::Site;
use crate::quantity::Quantity;
use crate::vocabulary::{Block, Key};

/// A value on a line.
#[derive(Clone, Debug, PartialEq)]
pub enum Value {
    /// One quantity.
    Quantity(Quantity),
    /// `A to B`.
    Range(Quantity, Quantity),
    /// One of the words of the vocabulary.
    Word(&'static str),
    /// `per channel`, or `per 3 channels` with the count.
    Per(&'static str, u32),
    /// A declared name.
    Name(String),
    /// Quoted text, without quotes.
    Text(String),
    /// `2 x`.
    Count(u32),
    /// `1/8`.
    Fraction(f64, String),
}

/// A value with its slot and its place.
#[derive(Clone, Debug, PartialEq)]
pub struct Slot {
    /// Which item of the shape.
    pub slot: &'static str,
    /// The value.
    pub value: Value,
    /// Where it stands.
    pub site: Site,
}

/// `ref`, `part` and `qty` of a bought part.
#[derive(Clone, Debug, PartialEq, Eq, Default)]
pub struct Bought {
    /// Designators, ranges expanded.
    pub refs: Vec<String>,
    /// Order code.
    pub part: Option<String>,
    /// Stated count.
    pub quantity: Option<u32>,
}

/// The values between two commas.
#[derive(Clone, Debug, PartialEq)]
pub struct Group {
    /// Its values, in the order written.
    pub slots: Vec<Slot>,
    /// What the bill of materials says of it.
    pub bought: Bought,
    /// All of it.
    pub site: Site,
}

impl Group {
    /// The value in a slot.
    #[must_use]
    pub fn get(&self, slot: &str) -> Option<&Slot> {
        self.slots.iter().find(|s| s.slot == slot)
    }
    /// The quantity in a slot.
    #[must_use]
    pub fn quantity(&self, slot: &str) -> Option<&Quantity> {
        match &self.get(slot)?.value {
            Value::Quantity(q) => Some(q),
            _ => None,
        }
    }
    /// The SI value of the quantity in a slot.
    #[must_use]
    pub fn number(&self, slot: &str) -> Option<f64> {
        self.quantity(slot).map(|q| q.value)
    }
    /// The word chosen in a slot.
    #[must_use]
    pub fn word(&self, slot: &str) -> Option<&'static str> {
        match self.get(slot)?.value {
            Value::Word(w) => Some(w),
            _ => None,
        }
    }
    /// The name in a slot.
    #[must_use]
    pub fn name(&self, slot: &str) -> Option<&str> {
        match &self.get(slot)?.value {
            Value::Name(n) => Some(n),
            _ => None,
        }
    }
    /// The text in a slot.
    #[must_use]
    pub fn text(&self, slot: &str) -> Option<&str> {
        match &self.get(slot)?.value {
            Value::Text(t) => Some(t),
            _ => None,
        }
    }
    /// The count before what it counts, 1 if none is written.
    #[must_use]
    pub fn count(&self) -> u32 {
        match self.get("x").map(|s| &s.value) {
            Some(Value::Count(n)) => *n,
            _ => 1,
        }
    }
    /// `per WORD`, with its count.
    #[must_use]
    pub fn per(&self) -> Option<(&'static str, u32)> {
        match self.get("per")?.value {
            Value::Per(word, n) => Some((word, n)),
            _ => None,
        }
    }
}

/// What tells apart the lines of a key that repeats.
#[derive(Clone, Debug, PartialEq)]
pub enum Select {
    /// A word of the vocabulary, `dc`.
    Word(&'static str),
    /// A pulse length, s.
    Time(f64),
    /// A rule name.
    Rule(String),
    /// The first quantity of the line, where the key has no selector of its own: the frequency of a
    /// resonance.
    First(f64),
}

/// A line matched with its key.
#[derive(Clone, Debug)]
pub struct Statement {
    /// Which key.
    pub key: &'static Key,
    /// What tells it from others of that key.
    pub select: Option<Select>,
    /// `none` was written: known not fitted.
    pub none: bool,
    /// Its groups.
    pub groups: Vec<Group>,
    /// All of the line, without its comment.
    pub site: Site,
    /// The key.
    pub key_site: Site,
    /// For `change`: the block and the line as if it stood there.
    pub change: Option<(String, Arc<Statement>)>,
}

impl Statement {
    /// Whether `other` replaces this line: same key, and same selector where the key repeats.
    #[must_use]
    pub fn replaced_by(&self, other: &Self) -> bool {
        std::ptr::eq(self.key, other.key) && (!self.key.repeats || self.select == other.select)
    }
}

/// A declared block.
#[derive(Clone, Debug)]
pub struct Declared {
    /// Its kind.
    pub kind: &'static Block,
    /// Its name.
    pub name: String,
    /// Its title.
    pub title: Option<String>,
    /// `npn` and its like.
    pub flavour: Option<&'static str>,
    /// The block it starts from.
    pub from: Option<(String, Site)>,
    /// Its lines.
    pub lines: Vec<Arc<Statement>>,
    /// The header up to the brace.
    pub site: Site,
    /// The name in the header.
    pub name_site: Site,
    /// The whole block.
    pub whole: Site,
}

/// Lower and upper bound of a toleranced quantity; the value itself where no tolerance is stated.
#[must_use]
pub fn bounds(q: &Quantity) -> (f64, f64) {
    q.tolerance
        .map_or((q.value, q.value), |t| t.limits(q.value))
}
