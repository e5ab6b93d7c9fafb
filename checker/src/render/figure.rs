//! Numbers of a report as text: three significant digits, or as many as tell two of them apart.
//! Must not know what is being said about the number.

use crate::finding::Measure;
use crate::quantity::{Dimension, format_digits};

/// Significant digits of a printed number.
const DIGITS: usize = 3;
/// Significant digits up to which two unequal numbers are told apart.
const APART: usize = 7;

/// `216 V`.
#[must_use]
pub fn figure(m: Measure) -> String {
    with_unit(m, DIGITS)
}

/// Two figures with as many digits as it takes to tell them apart.
#[must_use]
pub fn apart(a: Measure, b: Measure) -> (String, String) {
    let mut digits = DIGITS;
    loop {
        let pair = (with_unit(a, digits), with_unit(b, digits));
        if pair.0 != pair.1 || a.value.total_cmp(&b.value).is_eq() || digits >= APART {
            return pair;
        }
        digits += 1;
    }
}

/// The figure not below the value: three digits, rounded up. For a rating that is needed.
#[must_use]
pub fn at_least(m: Measure) -> String {
    with_unit(
        Measure {
            value: rounded(m.value, f64::ceil),
            ..m
        },
        DIGITS,
    )
}

/// The figure not above the value: three digits, rounded down. For a stress that is allowed.
#[must_use]
pub fn at_most(m: Measure) -> String {
    with_unit(
        Measure {
            value: rounded(m.value, f64::floor),
            ..m
        },
        DIGITS,
    )
}

/// A share of the allowance: `118 %`, and never `100 %` for what is not 100.
#[must_use]
pub fn percent(value: f64) -> String {
    apart(Measure::new(value, "%"), Measure::new(100.0, "%")).0
}

/// A bare number to three digits.
#[must_use]
pub fn number(value: f64) -> String {
    format_digits(value, Dimension::Number, DIGITS)
}

/// A value that is given as stated, such as the mains volts of a corner: up to four digits.
#[must_use]
pub fn plain(value: f64) -> String {
    format_digits(value, Dimension::Number, DIGITS + 1)
}

/// Rounded to three digits in the direction that `way` goes; a value already on the grid stays.
fn rounded(value: f64, way: fn(f64) -> f64) -> f64 {
    let nearest: f64 = scientific(value, DIGITS).parse().unwrap_or(value);
    if (nearest - value).abs() <= value.abs() * 1e-9 {
        return nearest;
    }
    let exponent = exponent(value);
    let step: f64 = format!("1e{}", exponent - 2).parse().unwrap_or(1.0);
    let stepped = way(value / step) * step;
    scientific(stepped, DIGITS).parse().unwrap_or(stepped)
}

fn scientific(value: f64, digits: usize) -> String {
    format!("{value:.*e}", digits.saturating_sub(1))
}

fn exponent(value: f64) -> i32 {
    let text = scientific(value, DIGITS);
    text.split_once('e')
        .and_then(|(_, e)| e.parse().ok())
        .unwrap_or(0)
}

fn with_unit(m: Measure, digits: usize) -> String {
    let dimension = match m.unit {
        "V" => Dimension::Voltage,
        "A" => Dimension::Current,
        "W" => Dimension::Power,
        "VA" => Dimension::ApparentPower,
        "ohm" => Dimension::Resistance,
        "F" => Dimension::Capacitance,
        "H" => Dimension::Inductance,
        "Hz" => Dimension::Frequency,
        "s" => Dimension::Time,
        "J" => Dimension::Energy,
        "V/s" => Dimension::SlewRate,
        "kg" => Dimension::Mass,
        "V/K" => Dimension::VoltagePerKelvin,
        other => {
            let bare = format_digits(m.value, Dimension::Number, digits);
            return if matches!(other, "1" | "") {
                bare
            } else {
                format!("{bare} {other}")
            };
        }
    };
    format_digits(m.value, dimension, digits)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn shown(value: f64, unit: &'static str) -> String {
        figure(Measure::new(value, unit))
    }

    #[test]
    fn the_trade_writes_it_so() {
        assert_eq!(shown(216.04, "V"), "216 V");
        assert_eq!(shown(0.22, "ohm"), "0.22 ohm");
        assert_eq!(shown(0.035, "ohm"), "35 mohm");
        assert_eq!(shown(0.0047, "F"), "4700 uF");
        assert_eq!(shown(3300.0, "ohm"), "3.3 kohm");
        assert_eq!(shown(1.2, "1"), "1.2");
        assert_eq!(shown(12_345.0, "h"), "12345 h");
        assert_eq!(shown(0.4, "s"), "400 ms");
        assert_eq!(shown(-13.04, "%"), "-13 %");
        assert_eq!(shown(0.0, "A"), "0 A");
    }

    #[test]
    fn unequal_figures_look_unequal() {
        let v = |x| Measure::new(x, "V");
        assert_eq!(
            apart(v(216.04), v(216.0)),
            ("216.04 V".to_owned(), "216 V".to_owned())
        );
        assert_eq!(percent(100.02), "100.02 %");
        assert_eq!(percent(100.0), "100 %");
    }

    #[test]
    fn what_would_pass_does_pass() {
        let v = |x| Measure::new(x, "V");
        assert_eq!(at_least(v(282.23)), "283 V");
        assert_eq!(at_most(v(216.9)), "216 V");
        assert_eq!(at_least(v(282.0)), "282 V");
    }
}
