//! What items a key takes, read off the shape text of the table.
//! Must not know any particular key.

use crate::quantity::Dimension;

/// One value, one or a range, or always a range.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Extent {
    /// One value.
    One,
    /// One value or `A to B`.
    OneOrRange,
    /// `A to B`.
    Range,
}

/// What an item takes.
#[derive(Clone, Debug, PartialEq)]
pub enum Takes {
    /// A quantity; `unit` is the spelling of the table.
    Quantity {
        /// `V`, `ohm`, `n`, `num`.
        unit: &'static str,
        /// What `unit` measures.
        dimension: Dimension,
        /// A tolerance may follow.
        tolerance: bool,
        /// One or a range.
        extent: Extent,
    },
    /// One of these words.
    Choice(Vec<&'static str>),
    /// `per WORD`, and `per N channels` where the list holds `N`.
    Per(Vec<&'static str>),
    /// The name of a declared block of this kind, or of any.
    Name(&'static str),
    /// `"text"`.
    Text,
    /// `N x`.
    Count,
    /// `1/8`.
    Fraction,
}

/// One item of a group.
#[derive(Clone, Debug, PartialEq)]
pub struct Item {
    /// What the value is called: its label, else its unit, kind or first word.
    pub slot: &'static str,
    /// The word that stands before it.
    pub label: Option<&'static str>,
    /// What it takes.
    pub takes: Takes,
    /// It may be left out.
    pub optional: bool,
}

/// What selects one of several lines of the same key.
#[derive(Clone, Debug, PartialEq)]
pub enum Selector {
    /// One of these words, or a time where the flag is set.
    Words(Vec<&'static str>, bool),
    /// A rule name.
    Rule,
}

/// What a key takes.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Shape {
    /// The selector, first on the line.
    pub selector: Option<Selector>,
    /// The items of one group.
    pub items: Vec<Item>,
    /// Several groups may stand on the line.
    pub list: bool,
    /// The line may end in `ref`, `part`, `qty`.
    pub bought: bool,
    /// `CHANGE` or `WAIVE`: read by a form of its own.
    pub special: Option<&'static str>,
}

/// Words that carry no meaning and may stand anywhere in a group.
pub const CONNECTING: &[&str] = &["at", "into", "on", "of", "with", "to", "for", "and"];

impl Shape {
    /// Read a shape of the table. Unknown units are a bug in the table; a test reads every shape,
    /// and the item is then left out here.
    #[must_use]
    pub fn read(text: &'static str) -> Self {
        let mut shape = Self::default();
        for word in words(text) {
            match word {
                ",..." => shape.list = true,
                "+bom" => shape.bought = true,
                "CHANGE" | "WAIVE" => shape.special = Some(word),
                _ if CONNECTING.contains(&word) => {}
                _ => {
                    if let Some(rest) = word.strip_prefix('@') {
                        shape.selector = Some(selector(rest));
                    } else if let Some(mut item) = item(word) {
                        if shape.items.iter().any(|i| i.slot == item.slot) {
                            item.slot = second(item.slot);
                        }
                        shape.items.push(item);
                    }
                }
            }
        }
        shape
    }

    /// The item with this slot.
    #[must_use]
    pub fn item(&self, slot: &str) -> Option<&Item> {
        self.items.iter().find(|i| i.slot == slot)
    }
}

/// Split at blanks outside braces.
fn words(text: &'static str) -> Vec<&'static str> {
    let mut out = Vec::new();
    let (mut start, mut depth) = (None, 0);
    for (at, c) in text.char_indices() {
        match c {
            '{' => depth += 1,
            '}' => depth -= 1,
            _ => {}
        }
        if c == ' ' && depth == 0 {
            if let Some(s) = start.take() {
                out.push(&text[s..at]);
            }
        } else if start.is_none() {
            start = Some(at);
        }
    }
    if let Some(s) = start {
        out.push(&text[s..]);
    }
    out
}

fn selector(text: &'static str) -> Selector {
    if text == "RULE" {
        return Selector::Rule;
    }
    let (list, time) = match text.strip_suffix("|s") {
        Some(list) => (list, true),
        None => (text, false),
    };
    Selector::Words(choices(list), time)
}

fn choices(braced: &'static str) -> Vec<&'static str> {
    braced
        .trim_start_matches('{')
        .trim_end_matches('}')
        .split(' ')
        .collect()
}

fn item(word: &'static str) -> Option<Item> {
    let (word, optional) = match word.strip_suffix('?') {
        Some(w) => (w, true),
        None => (word, false),
    };
    let make = |slot, label, takes| {
        Some(Item {
            slot,
            label,
            takes,
            optional,
        })
    };
    if word == "\"text\"" {
        return make("text", None, Takes::Text);
    }
    if word == "nx" {
        return make("x", None, Takes::Count);
    }
    if word == "fraction" {
        return make("fraction", None, Takes::Fraction);
    }
    if let Some(kind) = word.strip_prefix('<') {
        let kind = kind.trim_end_matches('>');
        return make(kind, None, Takes::Name(kind));
    }
    if let Some(brace) = word.find('{') {
        let list = choices(&word[brace..]);
        return match &word[..brace] {
            "" => make(list.first()?, None, Takes::Choice(list)),
            "per" => make("per", Some("per"), Takes::Per(list)),
            label => make(label, Some(label), Takes::Choice(list)),
        };
    }
    let (label, rest) = match word.split_once(':') {
        Some((label, rest)) => (Some(label), rest),
        None => (None, word),
    };
    let (rest, extent) = match rest.split_once('(') {
        Some((unit, _)) => (unit, Extent::OneOrRange),
        None => match rest.split_once("..") {
            Some((unit, _)) => (unit, Extent::Range),
            None => (rest, Extent::One),
        },
    };
    let (unit, tolerance) = match rest.strip_suffix('±') {
        Some(u) => (u, true),
        None => (rest, false),
    };
    let dimension = dimension(unit)?;
    make(
        label.unwrap_or(unit),
        label,
        Takes::Quantity {
            unit,
            dimension,
            tolerance,
            extent,
        },
    )
}

/// What a unit of the table measures.
#[must_use]
pub fn dimension(unit: &str) -> Option<Dimension> {
    Some(match unit {
        "V" => Dimension::Voltage,
        "A" => Dimension::Current,
        "W" => Dimension::Power,
        "VA" => Dimension::ApparentPower,
        "ohm" => Dimension::Resistance,
        "F" => Dimension::Capacitance,
        "H" => Dimension::Inductance,
        "Hz" => Dimension::Frequency,
        "s" | "h" => Dimension::Time,
        "J" => Dimension::Energy,
        "mm" => Dimension::Length,
        "kg" => Dimension::Mass,
        "K" => Dimension::TemperatureDifference,
        "degC" => Dimension::Temperature,
        "deg" => Dimension::Angle,
        "dB" => Dimension::Decibel,
        "K/W" => Dimension::ThermalResistance,
        "A2s" => Dimension::FuseIntegral,
        "mV/K" => Dimension::VoltagePerKelvin,
        "%/K" => Dimension::PercentPerKelvin,
        "%" => Dimension::Ratio,
        "n" | "num" => Dimension::Number,
        _ => return None,
    })
}

/// The slot of a second item of the same kind.
fn second(slot: &'static str) -> &'static str {
    match slot {
        "device" => "device2",
        "any" => "any2",
        "text" => "text2",
        other => other,
    }
}
