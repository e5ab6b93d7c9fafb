//! Letter codes of IEC 60062: a letter in place of the decimal mark, a letter for the tolerance.
//! Must not know tokens, nor any unit that is not coded so.

use super::print::Decimal;
use super::unit::{self, Lookup};
use super::{Amount, Dimension, Tolerance};

/// A value in letter code.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Code {
    pub(super) dimension: Dimension,
    /// Digits with a decimal point.
    pub(super) digits: String,
    pub(super) ten: i32,
    /// The tolerance letter, if there was one.
    pub(super) tolerance: Option<char>,
    /// The usual spelling, without tolerance.
    pub(super) canonical: String,
    /// Digits stood on both sides of the letter, or after it; `8R` and `22k` are not sure codes.
    pub(super) has_fraction: bool,
    /// Bytes it takes, a repeated unit (`4k7ohm`) included.
    pub(super) len: usize,
}

/// The codes `text` (one token up to any tolerance sign) may be, one for each wanted dimension
/// that uses the letter.
pub(super) fn scan(text: &str, wants: &[Dimension]) -> Vec<Code> {
    wants
        .iter()
        .filter_map(|&dimension| scan_one(text, dimension, wants))
        .collect()
}

/// Power of ten and usual letter of a code letter.
fn letter(dimension: Dimension, letter: char) -> Option<(i32, &'static str)> {
    let found = match (dimension, letter) {
        (Dimension::Resistance, 'R' | 'r' | 'E' | '\u{3a9}' | '\u{2126}') => (0, "R"),
        (Dimension::Resistance, 'k' | 'K') => (3, "k"),
        (Dimension::Resistance, 'M') => (6, "M"),
        (Dimension::Resistance, 'G') => (9, "G"),
        // The standard's own letter for the milliohm is L; m is what people type.
        (Dimension::Resistance, 'L' | 'm') => (-3, "m"),
        (Dimension::Capacitance, 'p') => (-12, "p"),
        (Dimension::Capacitance | Dimension::Inductance, 'n') => (-9, "n"),
        (Dimension::Capacitance | Dimension::Inductance, 'u' | 'U' | '\u{b5}' | '\u{3bc}') => {
            (-6, "u")
        }
        (Dimension::Capacitance | Dimension::Inductance, 'm') => (-3, "m"),
        // Not in the standard, common on Zener diodes and fuses.
        (Dimension::Voltage, 'V') => (0, "V"),
        (Dimension::Current, 'A') => (0, "A"),
        _ => return None,
    };
    Some(found)
}

fn is_coded(dimension: Dimension) -> bool {
    matches!(
        dimension,
        Dimension::Resistance | Dimension::Capacitance | Dimension::Inductance
    )
}

fn digits_at(text: &str) -> (&str, &str) {
    let len = text.bytes().take_while(u8::is_ascii_digit).count();
    text.split_at_checked(len).unwrap_or(("", text))
}

fn scan_one(text: &str, dimension: Dimension, wants: &[Dimension]) -> Option<Code> {
    let (before, suffix) = digits_at(text);
    let mark = suffix.chars().next()?;
    let (ten, usual) = letter(dimension, mark)?;
    let (after, rest) = digits_at(suffix.get(mark.len_utf8()..)?);
    let coded = is_coded(dimension);
    let fits = match (before.is_empty(), after.is_empty()) {
        (true, true) => false,
        (true, false) => coded && mark != 'E' && mark != 'G',
        (false, true) => coded && !matches!(mark, 'L'),
        (false, false) => true,
    };
    if !fits {
        return None;
    }
    if after.is_empty() && is_plain_unit(suffix, wants) {
        return None;
    }
    let (tolerance, unit_len) = tail(rest, dimension)?;
    let canonical = match dimension {
        Dimension::Voltage | Dimension::Current => format!("{before}.{after} {usual}"),
        Dimension::Resistance if usual == "m" && after.is_empty() => format!("{before} mohm"),
        Dimension::Resistance if usual == "m" => {
            let whole = if before.is_empty() { "0" } else { before };
            format!("{whole}.{after} mohm")
        }
        _ => format!("{before}{usual}{after}"),
    };
    let whole = if before.is_empty() { "0" } else { before };
    let digits = if after.is_empty() {
        whole.to_string()
    } else {
        format!("{whole}.{after}")
    };
    Some(Code {
        dimension,
        digits,
        ten,
        tolerance,
        canonical,
        has_fraction: !after.is_empty(),
        len: text.len() - rest.len() + tolerance.map_or(unit_len, char::len_utf8),
    })
}

/// `250mW` is milliwatts, `100nF` nanofarads, `8Ω` ohms: the suffix says it all and is no code. `R`
/// alone stays a code, and so do `27KJ` and `27KG`, which are kilohms with a tolerance letter unless
/// joules or kilograms would do.
fn is_plain_unit(suffix: &str, wants: &[Dimension]) -> bool {
    let Lookup::Unit(unit) = unit::lookup(suffix) else {
        return false;
    };
    let is_silly_here = matches!(unit.dimension, Dimension::Energy | Dimension::Mass)
        && !wants.contains(&unit.dimension);
    !matches!(suffix, "R" | "r" | "K") && !is_silly_here
}

/// What follows the digits: nothing, the unit again, or a tolerance letter. `None` if it is more.
fn tail(rest: &str, dimension: Dimension) -> Option<(Option<char>, usize)> {
    if rest.is_empty() {
        return Some((None, 0));
    }
    if is_base_unit(rest, dimension) {
        return Some((None, rest.len()));
    }
    let mut letters = rest.chars();
    match (letters.next(), letters.next()) {
        (Some(letter), None) if is_coded(dimension) && percent(letter).is_some() => {
            Some((Some(letter), 0))
        }
        _ => None,
    }
}

/// Whether `text` is the unit of `dimension` without prefix.
pub(super) fn is_base_unit(text: &str, dimension: Dimension) -> bool {
    matches!(unit::lookup(text), Lookup::Unit(unit) if unit.dimension == dimension && unit.ten == 0)
}

/// Minus and plus in percent for a tolerance letter of IEC 60062. Seen in makers' restatements:
/// F and K; the rest from memory.
fn percent(letter: char) -> Option<(f64, f64)> {
    let symmetrical = |p: f64| Some((p, p));
    match letter {
        'E' => symmetrical(0.005),
        'L' => symmetrical(0.01),
        'P' => symmetrical(0.02),
        'W' => symmetrical(0.05),
        'B' => symmetrical(0.1),
        'C' => symmetrical(0.25),
        'D' => symmetrical(0.5),
        'F' => symmetrical(1.0),
        'G' => symmetrical(2.0),
        'J' => symmetrical(5.0),
        'K' => symmetrical(10.0),
        'M' => symmetrical(20.0),
        'N' => symmetrical(30.0),
        'Q' => Some((10.0, 30.0)),
        'T' => Some((10.0, 50.0)),
        'S' => Some((20.0, 50.0)),
        'Z' => Some((20.0, 80.0)),
        _ => None,
    }
}

/// Picofarads of a tolerance letter on a capacitor below 10 pF (IEC 60062, from memory).
fn picofarads(letter: char) -> Option<f64> {
    match letter {
        'B' => Some(0.1),
        'C' => Some(0.25),
        'D' => Some(0.5),
        'F' => Some(1.0),
        'G' => Some(2.0),
        _ => None,
    }
}

/// The tolerance a letter stands for on a part of `value`, with its usual spelling.
pub(super) fn tolerance(
    letter: char,
    value: f64,
    dimension: Dimension,
) -> Option<(Tolerance, String)> {
    if dimension == Dimension::Capacitance
        && value < 10e-12
        && let Some(size) = picofarads(letter)
    {
        let amount = Amount::Absolute(size * 1e-12);
        let both = Tolerance {
            plus: amount,
            minus: amount,
        };
        return Some((both, format!("±{size} pF")));
    }
    let (minus, plus) = percent(letter)?;
    let text = if plus > minus {
        format!("+{plus} % -{minus} %")
    } else {
        format!("±{plus} %")
    };
    let tolerance = Tolerance {
        plus: Amount::Relative(plus / 100.0),
        minus: Amount::Relative(minus / 100.0),
    };
    Some((tolerance, text))
}

/// Most significant digits a printed code may have; a value that needs more is better in plain
/// figures.
const MOST_DIGITS: usize = 4;

/// The letter code of `value` (base unit): `0R22`, `4k7`, `100R`, `2u2`. `None` for a value that is
/// not positive, needs more than four digits, or is of a kind that has no letter code.
#[must_use]
pub fn letter_code(value: f64, dimension: Dimension) -> Option<String> {
    if value.is_nan() || value <= 0.0 {
        return None;
    }
    let decimal = Decimal::of(value)?;
    let exponent = decimal.exponent;
    let (ten, letter) = match dimension {
        Dimension::Resistance => match exponent {
            -3..=2 => (0, "R"),
            3..=5 => (3, "k"),
            6..=8 => (6, "M"),
            _ => return None,
        },
        Dimension::Capacitance => match exponent {
            -12..=-10 => (-12, "p"),
            -9..=-7 => (-9, "n"),
            -6..=-1 => (-6, "u"),
            _ => return None,
        },
        Dimension::Inductance => match exponent {
            -9..=-7 => (-9, "n"),
            -6..=-4 => (-6, "u"),
            -3..=-1 => (-3, "m"),
            _ => return None,
        },
        _ => return None,
    };
    (decimal.digits.len() <= MOST_DIGITS).then(|| decimal.with_mark(exponent - ten, letter))
}
