//! Reading one quantity from tokens.
//! Must not know keys or blocks; the caller says which dimensions would do.

use super::cursor::Cursor;
use super::letter_code::{self, Code};
use super::number::{self, Mark, Number};
use super::unit::{self, Lookup, Unit};
use super::{
    Dimension, Fault, FaultKind, Form, Meaning, Note, NoteSeverity, Quantity, Reading, Tolerance,
    compound, fault, print, tolerance,
};

/// Reads a quantity of dimension `want`, and the tolerance behind it, from the start of `tokens`.
#[must_use]
pub fn read(tokens: &[&str], want: Dimension) -> Reading {
    read_one_of(tokens, &[want])
}

/// Reads a quantity of any dimension in `wants`; [`Quantity::dimension`] says which it was.
///
/// A text that would do for two of them (`4m7` where both ohms and henries are wanted) is a fault
/// that names both.
#[must_use]
pub fn read_one_of(tokens: &[&str], wants: &[Dimension]) -> Reading {
    match attempt(tokens, wants) {
        read @ Reading::Read { .. } => read,
        other => match fault::letter_o(tokens, wants) {
            Some(fault) => Reading::Wrong(fault),
            None => other,
        },
    }
}

/// [`read_one_of`] without a second try at mistyped zeros.
pub(super) fn attempt(tokens: &[&str], wants: &[Dimension]) -> Reading {
    let mut cursor = Cursor::new(tokens);
    let sign = Sign::take(&mut cursor);
    cursor.next_text();
    if fault::is_no_number(cursor.rest()) {
        let text = cursor.rest();
        cursor.skip(text.len());
        return Reading::Wrong(fault::not_a_number(text, past_unit(cursor).used()));
    }
    let stated = fraction(cursor, wants)
        .map(Ok)
        .or_else(|| coded(cursor, wants))
        .or_else(|| {
            let number =
                fraction_of_watt(cursor.rest(), wants).or_else(|| number::scan(cursor.rest()))?;
            cursor.skip(number.len);
            Some(with_unit(cursor, Typed { sign, number }, tokens, wants))
        });
    match stated {
        None => Reading::Not,
        Some(Err(fault)) => Reading::Wrong(with_tolerance(fault, tokens)),
        Some(Ok(stated)) => match stated.finish(sign, tokens) {
            Ok(read) => read,
            Err(fault) => Reading::Wrong(fault),
        },
    }
}

/// Lets a fault span the tolerance behind it and its readings keep it, so that a repair of `47K ±5 %`
/// loses nothing and the tolerance is not reported as a stray.
fn with_tolerance(mut fault: Fault, tokens: &[&str]) -> Fault {
    let Some(last) = fault.used.checked_sub(1) else {
        return fault;
    };
    let glued = tokens
        .get(last)
        .and_then(|token| token.find(['±', '+']))
        .filter(|offset| *offset > 0);
    let cursor = match glued {
        Some(offset) => Cursor::at(tokens, last, offset),
        None => Cursor::at(tokens, fault.used, 0),
    };
    // A tolerance in percent is the same for every dimension; any other is left to be judged once
    // the quantity is settled.
    if let Some(Ok((tolerance, after, text))) = tolerance::read(cursor, Dimension::Resistance)
        && tolerance.is_relative()
    {
        fault.used = after.used();
        for reading in &mut fault.readings {
            reading.text = format!("{} {text}", reading.text);
        }
    }
    fault
}

/// What stood before the digits.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Sign {
    None,
    Plus,
    Minus,
    Both,
}

impl Sign {
    fn take(cursor: &mut Cursor<'_>) -> Self {
        let text = cursor.rest();
        if let Some(len) = tolerance::both_signs(text) {
            cursor.skip(len);
            return Self::Both;
        }
        for (sign, found) in [
            ("+", Self::Plus),
            ("-", Self::Minus),
            ("\u{2212}", Self::Minus),
        ] {
            if text.starts_with(sign) {
                cursor.skip(sign.len());
                return found;
            }
        }
        Self::None
    }

    fn text(self) -> &'static str {
        match self {
            Self::None => "",
            Self::Plus => "+",
            Self::Minus => "-",
            Self::Both => "±",
        }
    }
}

/// A signed number as typed.
#[derive(Clone, Debug)]
pub(super) struct Typed {
    pub(super) sign: Sign,
    pub(super) number: Number,
}

impl Typed {
    /// The usual spelling with another unit.
    pub(super) fn with_unit(&self, unit: &str) -> String {
        format!("{}{} {unit}", self.sign.text(), self.number.text())
            .trim_end()
            .to_string()
    }

    /// The usual spelling with other digits.
    fn with_digits(&self, digits: &str, unit: &str) -> String {
        format!("{}{} {unit}", self.sign.text(), self.number.with(digits))
            .trim_end()
            .to_string()
    }

    /// The value with its sign, in base units.
    pub(super) fn value(&self, ten: i32, times: f64) -> Option<f64> {
        let value = self.number.value(ten, times)?;
        Some(if self.sign == Sign::Minus {
            -value
        } else {
            value
        })
    }
}

/// A quantity without sign and before its tolerance.
struct Stated<'t> {
    value: f64,
    dimension: Dimension,
    form: Form,
    /// The usual spelling.
    body: String,
    messages: Vec<String>,
    /// From a letter code.
    tolerance: Option<(Tolerance, String)>,
    cursor: Cursor<'t>,
}

impl Stated<'_> {
    fn finish(mut self, sign: Sign, tokens: &[&str]) -> Result<Reading, Fault> {
        if self.tolerance.is_none()
            && let Some(read) = tolerance::read(self.cursor, self.dimension)
        {
            let (tolerance, cursor, text) = read?;
            self.tolerance = Some((tolerance, text));
            self.cursor = cursor;
        }
        let used = self.cursor.used();
        if !self.cursor.is_between() {
            return Err(fault::left_over(&self.body, self.cursor.rest(), used));
        }
        let mut canonical = format!("{}{}", sign.text(), self.body);
        if let Some((_, text)) = &self.tolerance {
            canonical = format!("{canonical} {text}");
        }
        let quantity = Quantity {
            value: if sign == Sign::Minus {
                -self.value
            } else {
                self.value
            },
            dimension: self.dimension,
            tolerance: self.tolerance.map(|(tolerance, _)| tolerance),
            form: if sign == Sign::Both {
                Form::SymmetricalPair
            } else {
                self.form
            },
            used,
        };
        let notes = notes(
            self.messages,
            canonical,
            tokens.get(..used).unwrap_or(tokens),
        );
        Ok(Reading::Read { quantity, notes })
    }
}

/// One note for each message; a silent one if only the spelling differs.
fn notes(messages: Vec<String>, canonical: String, typed: &[&str]) -> Vec<Note> {
    if messages.is_empty() {
        if typed.join(" ") == canonical {
            return Vec::new();
        }
        return vec![Note {
            severity: NoteSeverity::Silent,
            message: String::new(),
            canonical,
        }];
    }
    messages
        .into_iter()
        .map(|message| Note {
            severity: NoteSeverity::Information,
            message,
            canonical: canonical.clone(),
        })
        .collect()
}

/// `1/8` where a number would do.
fn fraction<'t>(mut cursor: Cursor<'t>, wants: &[Dimension]) -> Option<Stated<'t>> {
    if !wants.contains(&Dimension::Number) {
        return None;
    }
    let text = cursor.rest();
    let value = compound::fraction(text)?;
    cursor.skip(text.len());
    Some(Stated {
        value,
        dimension: Dimension::Number,
        form: Form::Plain,
        body: text.to_string(),
        messages: Vec::new(),
        tolerance: None,
        cursor,
    })
}

/// The `1/4` of `1/4 W`, which is how small resistors are sold.
fn fraction_of_watt(text: &str, wants: &[Dimension]) -> Option<Number> {
    if !wants.contains(&Dimension::Power) {
        return None;
    }
    let len = text
        .bytes()
        .take_while(|b| b.is_ascii_digit() || *b == b'/')
        .count();
    let value = compound::fraction(text.get(..len)?)?;
    Some(Number {
        digits: value.to_string(),
        grouped: None,
        exponent: None,
        mark: Mark::Clear,
        len,
    })
}

/// A letter code, if one of the wanted dimensions uses its letter.
fn coded<'t>(mut cursor: Cursor<'t>, wants: &[Dimension]) -> Option<Result<Stated<'t>, Fault>> {
    let text = tolerance::until_sign(cursor.rest());
    let codes = letter_code::scan(text, wants);
    let (code, others) = codes.split_first()?;
    cursor.skip(code.len);
    if !others.is_empty() {
        return Some(Err(fault::two_codes(text, &codes, cursor.used())));
    }
    let unit_follows = repeated_unit(cursor, code.dimension);
    let has_exponent = number::scan(text).is_some_and(|number| number.exponent.is_some());
    if has_exponent {
        if unit_follows.is_some() {
            return None;
        }
        return Some(Err(fault::code_or_exponent(text, code, cursor.used())));
    }
    if !code.has_fraction && code.tolerance.is_none() && text.ends_with('K') {
        if wants.contains(&Dimension::TemperatureDifference) {
            return None;
        }
        return Some(Err(fault::kelvin_for_kilohm(
            text.trim_end_matches('K'),
            cursor.used(),
        )));
    }
    if code.tolerance == Some('W') {
        return Some(Err(fault::tolerance_or_watt(text, code, cursor.used())));
    }
    Some(stated_code(text, code, unit_follows.unwrap_or(cursor)))
}

fn stated_code<'t>(text: &str, code: &Code, cursor: Cursor<'t>) -> Result<Stated<'t>, Fault> {
    let Some(value) = number::value_of(&code.digits, code.ten, 1.0) else {
        return Err(fault::out_of_range(text, cursor.used()));
    };
    let mut messages = Vec::new();
    let tolerance = code
        .tolerance
        .and_then(|letter| letter_code::tolerance(letter, value, code.dimension));
    if let (false, Some((_, spelled))) = (code.has_fraction, &tolerance) {
        messages.push(format!("`{text}` is read as {} {spelled}", code.canonical));
    }
    if code.dimension == Dimension::Capacitance && code.has_fraction && text.ends_with('F') {
        messages.push(format!(
            "the F of `{text}` is read as farad; a 1 % part is written `{} ±1 %`",
            code.canonical
        ));
    }
    Ok(Stated {
        value,
        dimension: code.dimension,
        form: Form::Plain,
        body: code.canonical.clone(),
        messages,
        tolerance,
        cursor,
    })
}

/// Past the `ohm` of `4k7 ohm`.
fn repeated_unit<'t>(mut cursor: Cursor<'t>, dimension: Dimension) -> Option<Cursor<'t>> {
    cursor.next_text();
    if !cursor.is_between() {
        return None;
    }
    let text = tolerance::until_sign(cursor.rest());
    letter_code::is_base_unit(text, dimension).then(|| {
        cursor.skip(text.len());
        cursor
    })
}

/// What stands where a unit is expected.
struct Found<'t> {
    lookup: Lookup,
    text: String,
    after: Cursor<'t>,
}

/// Words that belong to the unit before them, with a space between: `V ac`.
const UNIT_TAILS: [&str; 11] = [
    "ac", "AC", "dc", "DC", "rms", "RMS", "pk", "PK", "CT", "ct", "~",
];
/// Texts that belong to the unit after them: `deg C`, `k ohm`.
const UNIT_HEADS: [&str; 12] = [
    "deg", "\u{b0}", "\u{ba}", "\u{2da}", "k", "K", "M", "m", "u", "\u{b5}", "n", "p",
];

/// The unit at `cursor`, in the same token or the next, perhaps written in several tokens.
fn unit_at(cursor: Cursor<'_>) -> Option<Found<'_>> {
    let mut at = cursor;
    at.next_text();
    let whole = at.rest();
    let head = before_tolerance(whole);
    if head.is_empty() {
        return None;
    }
    let joined = if head.len() == whole.len() {
        joined_unit(at, head)
    } else {
        None
    };
    joined.or_else(|| {
        let mut after = at;
        after.skip(head.len());
        Some(Found {
            lookup: unit::lookup(head),
            text: head.to_string(),
            after,
        })
    })
}

/// Past the unit at `cursor`, if there is one.
fn past_unit(cursor: Cursor<'_>) -> Cursor<'_> {
    match unit_at(cursor) {
        Some(Found {
            lookup: Lookup::Unit(_),
            after,
            ..
        }) => after,
        _ => cursor,
    }
}

fn joined_unit<'t>(at: Cursor<'t>, head: &str) -> Option<Found<'t>> {
    let mut next = at;
    next.skip(head.len());
    next.next_text();
    let second = before_tolerance(next.rest());
    let belongs = UNIT_TAILS.contains(&second)
        || UNIT_HEADS.contains(&head)
        || head.ends_with('/')
        || second.starts_with('/');
    if second.is_empty() || !belongs {
        return None;
    }
    let mut after_second = next;
    after_second.skip(second.len());
    let two = format!("{head}{second}");
    let mut after_third = after_second;
    after_third.next_text();
    let third = before_tolerance(after_third.rest());
    if second == "/" || third.starts_with('/') {
        after_third.skip(third.len());
        let three = format!("{two}{third}");
        if let found @ Some(_) = known(three, after_third) {
            return found;
        }
    }
    known(two, after_second)
}

fn known(text: String, after: Cursor<'_>) -> Option<Found<'_>> {
    match unit::lookup(&text) {
        Lookup::Unknown | Lookup::BadPrefix(_) => None,
        lookup => Some(Found {
            lookup,
            text,
            after,
        }),
    }
}

fn before_tolerance(text: &str) -> &str {
    text.split(['±', '+']).next().unwrap_or("")
}

/// The number was read; `cursor` stands behind it.
fn with_unit<'t>(
    cursor: Cursor<'t>,
    typed: Typed,
    tokens: &[&str],
    wants: &[Dimension],
) -> Result<Stated<'t>, Fault> {
    let is_glued = !cursor.is_between();
    let number_wanted = wants.contains(&Dimension::Number);
    if typed.number.mark == Mark::Malformed {
        return Err(fault::malformed(tokens, past_unit(cursor).used()));
    }
    let Some(found) = unit_at(cursor) else {
        return without_unit(cursor, typed, tokens, wants);
    };
    let used = found.after.used();
    let prefixed = prefix_units(&found.text, wants);
    match found.lookup {
        Lookup::Unit(unit) => stated_unit(found.after, &typed, &unit, wants),
        _ if let [unit] = prefixed.as_slice() => stated_unit(found.after, &typed, unit, wants),
        _ if !is_glued && number_wanted => without_unit(cursor, typed, tokens, wants),
        Lookup::BadPrefix(units) => {
            Err(fault::bad_prefix(&typed, &found.text, &units, wants, used))
        }
        Lookup::Foreign(foreign) => Err(fault::foreign(&typed, foreign, &found.text, wants, used)),
        Lookup::Unknown if is_glued => Err(fault::unknown_unit(
            &typed,
            &found.text,
            tokens,
            wants,
            used,
        )),
        Lookup::Unknown => match unit::ignoring_case(&found.text, wants) {
            Some(_) => Err(fault::unknown_unit(
                &typed,
                &found.text,
                tokens,
                wants,
                used,
            )),
            None => without_unit(cursor, typed, tokens, wants),
        },
    }
}

/// The units a bare prefix may stand for: `22k`, `4.7 n`.
fn prefix_units(text: &str, wants: &[Dimension]) -> Vec<Unit> {
    wants
        .iter()
        .filter_map(|&want| unit::bare_prefix(text, want))
        .collect()
}

fn stated_unit<'t>(
    cursor: Cursor<'t>,
    typed: &Typed,
    unit: &Unit,
    wants: &[Dimension],
) -> Result<Stated<'t>, Fault> {
    let used = cursor.used();
    let as_difference = unit.dimension == Dimension::Temperature
        && !wants.contains(&unit.dimension)
        && wants.contains(&Dimension::TemperatureDifference);
    if !wants.contains(&unit.dimension) && !as_difference {
        return Err(fault::wrong_dimension(typed, unit, wants, used));
    }
    let mut messages = Vec::new();
    if !unit.remark.is_empty() {
        messages.push(unit.remark.to_string());
    }
    let (symbol, dimension) = if as_difference {
        messages.push("a difference of temperature is written in K".to_string());
        ("K", Dimension::TemperatureDifference)
    } else {
        (unit.symbol.as_str(), unit.dimension)
    };
    settle_number(typed, symbol, dimension, unit.ten, used, &mut messages)?;
    let Some(value) = typed.number.value(unit.ten, unit.times) else {
        return Err(fault::out_of_range(&typed.with_unit(symbol), used));
    };
    Ok(Stated {
        value,
        dimension,
        form: unit.form,
        body: format!("{} {symbol}", typed.number.text()),
        messages,
        tolerance: None,
        cursor,
    })
}

/// A fault if the number has two readings, a message if its one reading is unusual.
fn settle_number(
    typed: &Typed,
    symbol: &str,
    dimension: Dimension,
    ten: i32,
    used: usize,
    messages: &mut Vec<String>,
) -> Result<(), Fault> {
    let number = &typed.number;
    let grouped = number.grouped.as_deref().unwrap_or(&number.digits);
    let whole = typed.with_digits(grouped, symbol);
    let decimal = typed.with_digits(&number.digits, symbol);
    match number.mark {
        Mark::Clear | Mark::Malformed => Ok(()),
        Mark::Comma => {
            messages.push(format!("the comma is read as a decimal point: {decimal}"));
            Ok(())
        }
        Mark::Either => Err(fault::point_or_group(&whole, &decimal, "comma", used)),
        // Film and electrolytic values are printed in continental style on sheets and labels;
        // nobody states three decimals of a microfarad.
        Mark::PerhapsGroup if dimension == Dimension::Capacitance && ten == -6 => {
            Err(fault::point_or_group(&whole, &decimal, "point", used))
        }
        Mark::PerhapsGroup => Ok(()),
        Mark::Group => Err(fault::digit_groups(&whole, used)),
    }
}

/// No unit follows: a plain number, a number in space-separated groups, or a fault.
fn without_unit<'t>(
    cursor: Cursor<'t>,
    typed: Typed,
    tokens: &[&str],
    wants: &[Dimension],
) -> Result<Stated<'t>, Fault> {
    let used = cursor.used();
    if wants.contains(&Dimension::Number) {
        let mut messages = Vec::new();
        settle_number(&typed, "", Dimension::Number, 0, used, &mut messages)?;
        let Some(value) = typed.number.value(0, 1.0) else {
            return Err(fault::out_of_range(&typed.with_unit(""), used));
        };
        return Ok(Stated {
            value,
            dimension: Dimension::Number,
            form: Form::Plain,
            body: typed.number.text(),
            messages,
            tolerance: None,
            cursor,
        });
    }
    match space_groups(cursor, &typed, tokens, wants) {
        Some(result) => result,
        None => Err(fault::missing_unit(&typed, wants, used)),
    }
}

/// `10 000 uF`: accepted if the second group cannot be a value of its own, else asked about.
fn space_groups<'t>(
    cursor: Cursor<'t>,
    typed: &Typed,
    tokens: &[&str],
    wants: &[Dimension],
) -> Option<Result<Stated<'t>, Fault>> {
    let first = &typed.number;
    let is_group_start = first.mark == Mark::Clear
        && first.exponent.is_none()
        && first.digits.len() <= 3
        && !first.digits.starts_with('0')
        && first.digits.bytes().all(|b| b.is_ascii_digit());
    if !is_group_start {
        return None;
    }
    let mut digits = first.digits.clone();
    let mut at = cursor;
    at.next_text();
    let second = at.rest();
    while let Some(group) = group_of_three(at.rest()) {
        digits.push_str(group);
        at.skip(group.len());
        if !at.is_between() || digits.len() > 15 {
            break;
        }
        at.next_text();
    }
    if digits.len() == first.digits.len() {
        return None;
    }
    let joined = Typed {
        sign: typed.sign,
        number: Number {
            digits,
            ..first.clone()
        },
    };
    let found = unit_at(at)?;
    let Lookup::Unit(unit) = found.lookup else {
        return None;
    };
    let stated = stated_unit(found.after, &joined, &unit, wants);
    if second.starts_with('0') {
        return Some(stated.map(|mut stated| {
            let message = format!(
                "the groups of digits are read as one number: {}",
                stated.body
            );
            stated.messages.push(message);
            stated
        }));
    }
    let Ok(stated) = stated else {
        return Some(stated);
    };
    let rest = tokens.get(1..).unwrap_or(&[]);
    let counted = match attempt(rest, wants) {
        Reading::Read { quantity, .. } => {
            Some(print::format_exact(quantity.value, quantity.dimension))
        }
        _ => None,
    };
    let used = stated.cursor.used();
    let mut readings = vec![Meaning {
        meaning: "one number, its digits in groups".to_string(),
        text: stated.body,
    }];
    if let Some(each) = counted {
        readings.push(Meaning {
            text: format!("{} x {each}", first.digits),
            meaning: format!("{} of {each}", first.digits),
        });
    }
    Some(Err(Fault {
        kind: FaultKind::Ambiguous,
        message: format!(
            "`{}` may be one number or a count without its x",
            tokens.get(..used).unwrap_or(tokens).join(" ")
        ),
        hint: "write the digits without a space, or put an x after the count".to_string(),
        used,
        readings,
    }))
}

/// The three digits at the start of `text`, if a fourth or a decimal mark does not follow.
fn group_of_three(text: &str) -> Option<&str> {
    let (group, rest) = text.split_at_checked(3)?;
    let ends = !rest.starts_with(|c: char| c.is_ascii_digit() || c == '.' || c == ',');
    (group.bytes().all(|b| b.is_ascii_digit()) && ends).then_some(group)
}
