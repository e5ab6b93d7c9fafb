//! Tokens that hold more than one item: counts, split windings, two ratings, fuse markings.
//! Must not know which key they stand in.

use super::{Dimension, Fault, FaultKind, Form, Meaning, Quantity, Reading, number, print, read};

/// The value of `1/8`: whole numbers, neither of them zero.
#[must_use]
pub fn fraction(text: &str) -> Option<f64> {
    let (top, bottom) = text.split_once('/')?;
    let whole = |part: &str| -> Option<f64> {
        let short = (1..=6).contains(&part.len()) && part.bytes().all(|b| b.is_ascii_digit());
        let value: u32 = if short { part.parse().ok()? } else { 0 };
        (value > 0).then(|| f64::from(value))
    };
    Some(whole(top)? / whole(bottom)?)
}

/// `2x28VAC` into 2 and `28VAC`; `2x` into 2 and nothing. The sign may be `x`, `X`, `×` or `*`.
#[must_use]
pub fn split_count(text: &str) -> Option<(u32, &str)> {
    let len = text.bytes().take_while(u8::is_ascii_digit).count();
    let (count, rest) = text.split_at_checked(len)?;
    let rest = rest.strip_prefix(['x', 'X', '\u{d7}', '*'])?;
    let starts_value =
        rest.is_empty() || rest.starts_with(|c: char| c.is_ascii_digit() || ".±+-Rp".contains(c));
    let count = count.parse().ok().filter(|count| *count > 0)?;
    starts_value.then_some((count, rest))
}

/// `10000uF/63V` into its two ratings. Neither a fraction (`1/8`) nor a unit (`0.5K/W`) is split.
#[must_use]
pub fn split_slash(text: &str) -> Option<(&str, &str)> {
    let (left, right) = text.split_once('/')?;
    let starts_value = |part: &str| part.starts_with(|c: char| c.is_ascii_digit() || c == '.');
    let has_unit = left.contains(|c: char| c.is_alphabetic() || c == '%');
    (starts_value(left) && starts_value(right) && has_unit).then_some((left, right))
}

/// Two equal windings or the halves of one, as `28-0-28` and `28+28` state them.
#[derive(Clone, Debug, PartialEq)]
pub struct Windings {
    /// The r.m.s. voltage of each of the two; `used` counts the tokens of the whole.
    pub each: Quantity,
    /// The usual spelling: `2 x 28 Vac`.
    pub canonical: String,
}

/// Reads `28-0-28`, `28+28`, `28-0-28 Vac`, `28V+28V` from the start of `tokens`.
///
/// `None` if it is nothing of the kind. A fault if the two differ.
#[must_use]
pub fn windings(tokens: &[&str]) -> Option<Result<Windings, Fault>> {
    let first = tokens.first()?;
    let (left, right) = first.split_once("-0-").or_else(|| first.split_once('+'))?;
    let (left, left_unit) = half(left)?;
    let (right, right_unit) = half(right)?;
    let following = tokens.get(1..).unwrap_or(&[]);
    let mut unit: Vec<&str> = if right_unit.is_empty() {
        following.iter().take(2).copied().collect()
    } else {
        vec![right_unit]
    };
    let from_next = right_unit.is_empty();
    let mut each = match voltage(right, &unit) {
        Some(quantity) => quantity,
        None if from_next => {
            unit = vec!["V"];
            let mut quantity = voltage(right, &unit)?;
            quantity.used = 1;
            quantity
        }
        None => return None,
    };
    each.used = if from_next { each.used } else { 1 };
    let other = voltage(left, &[if left_unit.is_empty() { "V" } else { left_unit }])?;
    match each.form {
        Form::Plain | Form::Rms => each.form = Form::Rms,
        _ => return None,
    }
    if (each.value - other.value).abs() > 1e-9 * each.value.abs() {
        return Some(Err(unequal(first, other.value, each.value, each.used)));
    }
    let text = print::format_exact(each.value, Dimension::Voltage);
    Some(Ok(Windings {
        each,
        canonical: format!("2 x {text}ac"),
    }))
}

/// The digits of one winding and what follows them.
fn half(text: &str) -> Option<(&str, &str)> {
    let number = number::scan(text)?;
    text.split_at_checked(number.len)
}

fn voltage(number: &str, unit: &[&str]) -> Option<Quantity> {
    let tokens: Vec<&str> = std::iter::once(number)
        .chain(unit.iter().copied())
        .collect();
    match read::attempt(&tokens, &[Dimension::Voltage]) {
        Reading::Read { quantity, .. } if quantity.tolerance.is_none() => Some(quantity),
        _ => None,
    }
}

fn unequal(text: &str, left: f64, right: f64, used: usize) -> Fault {
    let left = print::format_exact(left, Dimension::Voltage);
    let right = print::format_exact(right, Dimension::Voltage);
    Fault {
        kind: FaultKind::Number,
        message: format!("`{text}` states two unequal windings"),
        hint: "two windings in one figure must be equal: a split supply has one voltage"
            .to_string(),
        used,
        readings: vec![
            Meaning {
                text: format!("2 x {left}ac"),
                meaning: format!("{left} each"),
            },
            Meaning {
                text: format!("2 x {right}ac"),
                meaning: format!("{right} each"),
            },
        ],
    }
}

/// How quickly a fuse melts.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum FuseSpeed {
    /// `F`, `FF`.
    Fast,
    /// `T`, `TT`.
    Slow,
}

/// What a fuse marking says.
#[derive(Clone, Debug, PartialEq)]
pub struct Fuse {
    /// Rated current.
    pub current: Quantity,
    /// Time-current characteristic.
    pub speed: FuseSpeed,
    /// The usual spelling: `3.15 A slow`.
    pub canonical: String,
}

/// Reads a fuse marking in the style of IEC 60127: `T3.15A`, `3A15T`, `5AT`, `F500mA`.
#[must_use]
pub fn fuse(text: &str) -> Option<Fuse> {
    let marked = |letter: char| {
        let front = text.trim_start_matches(letter);
        let back = text.trim_end_matches(letter);
        let found = if front.len() < text.len() {
            front
        } else {
            back
        };
        (1..=2)
            .contains(&(text.len() - found.len()))
            .then_some(found)
    };
    let (speed, rating) = match (marked('T'), marked('F')) {
        (Some(rating), None) => (FuseSpeed::Slow, rating),
        (None, Some(rating)) => (FuseSpeed::Fast, rating),
        _ => return None,
    };
    let Reading::Read { quantity, .. } = read::attempt(&[rating], &[Dimension::Current]) else {
        return None;
    };
    if quantity.value <= 0.0 || quantity.tolerance.is_some() {
        return None;
    }
    let word = match speed {
        FuseSpeed::Slow => "slow",
        FuseSpeed::Fast => "fast",
    };
    let current = print::format_exact(quantity.value, Dimension::Current);
    Some(Fuse {
        current: quantity,
        speed,
        canonical: format!("{current} {word}"),
    })
}
