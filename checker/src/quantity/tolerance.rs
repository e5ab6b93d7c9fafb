//! The tolerance after a quantity: `±10 %`, `+10 % -6 %`, `±5 K`.
//! Must not know whether the place it stands in allows one.

use super::cursor::Cursor;
use super::number::{self, Mark};
use super::unit::{self, Lookup, Unit};
use super::{Amount, Dimension, Fault, FaultKind, Meaning, Tolerance};

/// The tolerance at `cursor`, where it ends and its usual spelling. `None` if there is none.
pub(super) fn read<'t>(
    cursor: Cursor<'t>,
    dimension: Dimension,
) -> Option<Result<(Tolerance, Cursor<'t>, String), Fault>> {
    if matches!(
        dimension,
        Dimension::Number | Dimension::Ratio | Dimension::Decibel
    ) {
        return None;
    }
    let mut cursor = cursor;
    cursor.next_text();
    if let Some(len) = both_signs(cursor.rest()) {
        cursor.skip(len);
        return both_sides(cursor, dimension);
    }
    one_by_one(cursor, dimension)
}

/// Length of `±`, `+-` or `+/-` at the start of `text`.
pub(super) fn both_signs(text: &str) -> Option<usize> {
    ["±", "+/-", "+-", "+/\u{2212}", "+\u{2212}", "-/+", "-+"]
        .iter()
        .find(|sign| text.starts_with(**sign))
        .map(|sign| sign.len())
}

fn both_sides<'t>(
    mut cursor: Cursor<'t>,
    dimension: Dimension,
) -> Option<Result<(Tolerance, Cursor<'t>, String), Fault>> {
    cursor.next_text();
    let side = side(&mut cursor)?;
    let result =
        amount(&side, side.unit.as_ref(), dimension, cursor.used()).and_then(|(amount, text)| {
            let tolerance = Tolerance {
                plus: amount,
                minus: amount,
            };
            checked(tolerance, cursor, format!("±{text}"))
        });
    Some(result)
}

/// `+10 % -6 %`, `-20/+80 %`: two sides of opposite sign; a single one is no tolerance.
fn one_by_one<'t>(
    mut cursor: Cursor<'t>,
    dimension: Dimension,
) -> Option<Result<(Tolerance, Cursor<'t>, String), Fault>> {
    let first_is_plus = sign(&mut cursor)?;
    cursor.next_text();
    let first = side(&mut cursor)?;
    let after_first = cursor;
    cursor.next_text();
    if cursor.rest().starts_with('/') {
        cursor.skip(1);
        cursor.next_text();
    }
    let second = sign(&mut cursor)
        .filter(|is_plus| *is_plus != first_is_plus)
        .and_then(|_| {
            cursor.next_text();
            side(&mut cursor)
        });
    let Some(second) = second else {
        return lone(&first, first_is_plus, after_first.used()).map(Err);
    };
    let used = cursor.used();
    let unit = first.unit.as_ref().or(second.unit.as_ref());
    let result = amount(&first, unit, dimension, used).and_then(|one| {
        let other = amount(&second, second.unit.as_ref().or(unit), dimension, used)?;
        let (plus, minus) = if first_is_plus {
            (one, other)
        } else {
            (other, one)
        };
        let tolerance = Tolerance {
            plus: plus.0,
            minus: minus.0,
        };
        checked(tolerance, cursor, format!("+{} -{}", plus.1, minus.1))
    });
    Some(result)
}

/// A single `+10 %` after a quantity says only half; any other signed quantity is not ours.
fn lone(side: &Side, is_plus: bool, used: usize) -> Option<Fault> {
    let unit = side.unit.as_ref()?;
    if unit.dimension != Dimension::Ratio {
        return None;
    }
    let amount = format!("{} %", side.number.text());
    let one_sided = if is_plus {
        format!("+{amount} -0 %")
    } else {
        format!("+0 % -{amount}")
    };
    Some(Fault {
        kind: FaultKind::Tolerance,
        message: "a tolerance needs both sides".to_string(),
        hint: format!("write `±{amount}`, or `{one_sided}` if it goes one way only"),
        used,
        readings: Vec::new(),
    })
}

/// A number, and its unit where one follows.
struct Side {
    number: number::Number,
    unit: Option<Unit>,
}

fn sign(cursor: &mut Cursor<'_>) -> Option<bool> {
    let sign = cursor.rest().chars().next()?;
    let is_plus = match sign {
        '+' => true,
        '-' | '\u{2212}' => false,
        _ => return None,
    };
    cursor.skip(sign.len_utf8());
    Some(is_plus)
}

fn side(cursor: &mut Cursor<'_>) -> Option<Side> {
    let number = number::scan(cursor.rest())?;
    cursor.skip(number.len);
    let mut at_unit = *cursor;
    at_unit.next_text();
    let text = until_sign(at_unit.rest());
    // A slash is part of `K/W` and stands between the sides of `+10%/-6%`.
    let candidates = [text, text.split_once('/').map_or(text, |(unit, _)| unit)];
    for candidate in candidates {
        if let Lookup::Unit(unit) = unit::lookup(candidate) {
            at_unit.skip(candidate.len());
            *cursor = at_unit;
            return Some(Side {
                number,
                unit: Some(unit),
            });
        }
    }
    Some(Side { number, unit: None })
}

/// `text` up to the sign of a tolerance.
pub(super) fn until_sign(text: &str) -> &str {
    text.split(['±', '+', '-', '\u{2212}']).next().unwrap_or("")
}

fn fault(message: String, hint: String, used: usize, readings: Vec<Meaning>) -> Fault {
    Fault {
        kind: FaultKind::Tolerance,
        message,
        hint,
        used,
        readings,
    }
}

/// The amount of one side and its usual spelling.
fn amount(
    side: &Side,
    unit: Option<&Unit>,
    dimension: Dimension,
    used: usize,
) -> Result<(Amount, String), Fault> {
    let number = &side.number;
    let typed = number.text();
    if !matches!(number.mark, Mark::Clear | Mark::Comma | Mark::PerhapsGroup) {
        return Err(fault(
            "the tolerance is not one clear number".to_string(),
            "write it with a decimal point and no digit groups, for example `±2.5 %`".to_string(),
            used,
            Vec::new(),
        ));
    }
    let Some(unit) = unit else {
        return Err(fault(
            format!("the tolerance `{typed}` has no unit"),
            format!("write `±{typed} %` if percent is meant"),
            used,
            vec![],
        ));
    };
    let out_of_range = || {
        fault(
            format!("the tolerance `{typed}` is beyond any size a tolerance can have"),
            "check the number".to_string(),
            used,
            Vec::new(),
        )
    };
    let size = number
        .value(unit.ten, unit.times)
        .ok_or_else(out_of_range)?;
    let difference = dimension.difference();
    if unit.dimension == Dimension::Ratio {
        Ok((Amount::Relative(size), format!("{typed} %")))
    } else if unit.dimension == difference {
        Ok((Amount::Absolute(size), format!("{typed} {}", unit.symbol)))
    } else if unit.dimension.difference() == difference {
        Ok((Amount::Absolute(size), format!("{typed} K")))
    } else {
        Err(fault(
            format!(
                "the tolerance is {}, its quantity {}",
                unit.dimension.name(),
                dimension.name()
            ),
            "give the tolerance in `%` or in the unit of its quantity".to_string(),
            used,
            Vec::new(),
        ))
    }
}

/// Refuses a tolerance that reaches down to nothing or below.
fn checked(
    tolerance: Tolerance,
    cursor: Cursor<'_>,
    text: String,
) -> Result<(Tolerance, Cursor<'_>, String), Fault> {
    match tolerance.minus {
        Amount::Relative(minus) if minus >= 1.0 => Err(fault(
            format!("a tolerance of `{text}` would let the value vanish or turn negative"),
            "the lower side must be less than 100 %".to_string(),
            cursor.used(),
            Vec::new(),
        )),
        _ => Ok((tolerance, cursor, text)),
    }
}
