//! The number at the start of a text: decimal point or comma, digit groups, exponent.
//! Must not know units.

/// A number as typed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Number {
    /// Digits with at most one decimal point, a digit before it.
    pub(super) digits: String,
    /// The digits under the other reading, where there is one.
    pub(super) grouped: Option<String>,
    /// Power of ten, if one was typed.
    pub(super) exponent: Option<i32>,
    /// What there is to say about its spelling.
    pub(super) mark: Mark,
    /// Bytes it takes.
    pub(super) len: usize,
}

/// How certain the reading of a number is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Mark {
    /// Nothing to say.
    Clear,
    /// `2,2`: a decimal comma, worth a word.
    Comma,
    /// `1,000`: a decimal comma or a digit group.
    Either,
    /// `4.700`: a decimal point, unless three digits with a closing zero are a digit group.
    PerhapsGroup,
    /// `1,000,000`, `1,000.5`, `1.000,5`, `1'000`, `1_000`: only a digit group makes sense, but it is not accepted.
    Group,
    /// `1.2.3`, `5.`: no number.
    Malformed,
}

impl Number {
    /// `digits * 10^(exponent + ten) * times`, rounded once by the decimal conversion where `times`
    /// is 1. `None` if that is not finite, or vanishes though the digits do not.
    pub(super) fn value(&self, ten: i32, times: f64) -> Option<f64> {
        value_of(
            &self.digits,
            self.exponent.unwrap_or(0).saturating_add(ten),
            times,
        )
    }

    /// As it is usually written. An undecided comma stays, so that a repair of something else does
    /// not decide it.
    pub(super) fn text(&self) -> String {
        if self.mark == Mark::Either {
            return self.with(&self.digits.replace('.', ","));
        }
        self.with(&self.digits)
    }

    /// As it is usually written, with other digits.
    pub(super) fn with(&self, digits: &str) -> String {
        match self.exponent {
            Some(exponent) => format!("{digits}e{exponent}"),
            None => digits.to_string(),
        }
    }
}

/// Values beyond these are no quantity anybody states; the limits keep later arithmetic finite.
const LARGEST: f64 = 1e15;
const SMALLEST: f64 = 1e-18;

/// `digits * 10^ten * times` if it is zero or of a size that a quantity can have.
pub(super) fn value_of(digits: &str, ten: i32, times: f64) -> Option<f64> {
    let decimal: f64 = format!("{digits}e{ten}").parse().ok()?;
    let value = decimal * times;
    let is_zero = digits.bytes().all(|b| b == b'0' || b == b'.');
    (is_zero || (SMALLEST..=LARGEST).contains(&value)).then_some(value)
}

/// The number at the start of `text`, without sign. `None` if there is none.
pub(super) fn scan(text: &str) -> Option<Number> {
    let body_len = text
        .bytes()
        .take_while(|b| b.is_ascii_digit() || matches!(b, b'.' | b',' | b'_' | b'\''))
        .count();
    let (body, rest) = text.split_at_checked(body_len)?;
    let after_mark = body.strip_prefix(['.', ',']).unwrap_or(body);
    if !after_mark.starts_with(|c: char| c.is_ascii_digit()) {
        return None;
    }
    let (mark, digits, grouped) = marks(body);
    let (exponent, exponent_len) = match exponent(rest) {
        Some((value, len)) => (Some(value), len),
        None => (None, 0),
    };
    Some(Number {
        digits,
        grouped,
        exponent,
        mark,
        len: body_len + exponent_len,
    })
}

/// `e3`, `E-6`: the power and its length.
fn exponent(text: &str) -> Option<(i32, usize)> {
    let after_e = text.strip_prefix(['e', 'E'])?;
    let (negative, digits) = match after_e.strip_prefix('-') {
        Some(rest) => (true, rest),
        None => (false, after_e.strip_prefix('+').unwrap_or(after_e)),
    };
    let len = digits.bytes().take_while(u8::is_ascii_digit).count();
    if len == 0 {
        return None;
    }
    // Too long to fit is too large to be a quantity; the value check says so.
    let size: i32 = digits.get(..len)?.parse().unwrap_or(9999).min(9999);
    let sign_len = after_e.len() - digits.len();
    Some((if negative { -size } else { size }, 1 + sign_len + len))
}

/// Sorts out points and commas: how sure, the digits, and the digits of the other reading.
fn marks(body: &str) -> (Mark, String, Option<String>) {
    let points = body.matches('.').count();
    let commas = body.matches(',').count();
    match (points, commas) {
        _ if body.contains(['_', '\'']) => several_marks(body),
        (0, 0) => (Mark::Clear, body.to_string(), None),
        (1, 0) => one_mark(body, '.'),
        (0, 1) => one_mark(body, ','),
        _ => several_marks(body),
    }
}

fn one_mark(body: &str, mark: char) -> (Mark, String, Option<String>) {
    let (whole, fraction) = body.split_once(mark).unwrap_or((body, ""));
    if fraction.is_empty() {
        return (Mark::Malformed, whole.to_string(), None);
    }
    let leading = if whole.is_empty() { "0" } else { whole };
    let digits = format!("{leading}.{fraction}");
    let leads_with_zero = leading.bytes().all(|b| b == b'0');
    let could_group = fraction.len() == 3 && !leading.starts_with('0') && leading.len() <= 3;
    let grouped = could_group.then(|| format!("{whole}{fraction}"));
    let certainty = match (mark, could_group) {
        (',', true) => Mark::Either,
        (',', false) if leads_with_zero => Mark::Clear,
        (',', false) => Mark::Comma,
        (_, true) if fraction.ends_with('0') => Mark::PerhapsGroup,
        _ => Mark::Clear,
    };
    (certainty, digits, grouped)
}

/// Two or more marks, or one that can only group: digit groups of three, then perhaps one decimal mark of the other kind.
fn several_marks(body: &str) -> (Mark, String, Option<String>) {
    let is_digits = |part: &str| part.bytes().all(|b| b.is_ascii_digit());
    let malformed = || (Mark::Malformed, body.to_string(), None);
    let Some(group_mark) = body.chars().find(|c| !c.is_ascii_digit()) else {
        return malformed();
    };
    let decimal_mark = if group_mark == '.' { ',' } else { '.' };
    let (whole, fraction) = match body.split_once(decimal_mark) {
        Some((whole, fraction)) => (whole, Some(fraction)),
        None => (body, None),
    };
    let mut groups = whole.split(group_mark);
    let first_fits = groups
        .next()
        .is_some_and(|g| (1..=3).contains(&g.len()) && !g.starts_with('0') && is_digits(g));
    let grouped = first_fits && groups.all(|g| g.len() == 3 && is_digits(g));
    let fraction_fits = fraction.is_none_or(|f| !f.is_empty() && is_digits(f));
    if !grouped || !fraction_fits {
        return malformed();
    }
    let mut digits = whole.replace(group_mark, "");
    if let Some(fraction) = fraction {
        digits = format!("{digits}.{fraction}");
    }
    (Mark::Group, digits.clone(), Some(digits))
}
