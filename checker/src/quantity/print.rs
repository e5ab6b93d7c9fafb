//! Quantities as text, in the units the trade uses for them.
//! Must not know how they were typed.

use super::Dimension;

/// Most digits after the point; past that a number is written with a power of ten.
const MOST_DECIMALS: i32 = 9;

/// `value` (base unit) for a message: four significant digits, whole numbers kept whole.
#[must_use]
pub fn format(value: f64, dimension: Dimension) -> String {
    format_digits(value, dimension, 4)
}

/// `value` (base unit) with `digits` significant digits, trailing zeros dropped. Digits before the
/// point are never lost: 12 345 ohm with three digits is `12.3 kohm`, 12 345 uF is `12345 uF`.
#[must_use]
pub fn format_digits(value: f64, dimension: Dimension, digits: usize) -> String {
    print(value, dimension, Some(digits.clamp(1, 15)))
}

/// `value` (base unit) with the fewest digits that read back as exactly `value`.
#[must_use]
pub fn format_exact(value: f64, dimension: Dimension) -> String {
    print(value, dimension, None)
}

fn print(value: f64, dimension: Dimension, digits: Option<usize>) -> String {
    let Some(mut decimal) = Decimal::of(value) else {
        return "an undefined value".to_string();
    };
    if dimension == Dimension::Time && value >= 3600.0 && (value % 3600.0).abs() < f64::EPSILON {
        return format!("{} h", value / 3600.0);
    }
    if let Some(digits) = digits {
        // The unit is chosen after rounding, so that 999.97 mV becomes 1 V; the digits are then
        // taken again, since a unit with a long whole part keeps more of them.
        let rounded = decimal.rounded(digits);
        let (ten, _) = scale(rounded.exponent, dimension);
        let whole = usize::try_from(rounded.exponent - ten + 1).unwrap_or(0);
        decimal = decimal.rounded(digits.max(whole));
    }
    let (ten, unit) = scale(decimal.exponent, dimension);
    let number = decimal.shifted(-ten).text();
    if unit.is_empty() {
        number
    } else {
        format!("{number} {unit}")
    }
}

/// The power of ten and the unit for a value whose first digit stands at `10^exponent`.
fn scale(exponent: i32, dimension: Dimension) -> (i32, &'static str) {
    // Each step: below this exponent, this power of ten and unit. The last one has no end.
    let steps: &[(i32, i32, &'static str)] = match dimension {
        Dimension::Voltage => &[(-3, -6, "uV"), (0, -3, "mV"), (4, 0, "V"), (99, 3, "kV")],
        Dimension::Current => &[(-6, -9, "nA"), (-3, -6, "uA"), (0, -3, "mA"), (99, 0, "A")],
        Dimension::Power => &[(-3, -6, "uW"), (0, -3, "mW"), (4, 0, "W"), (99, 3, "kW")],
        Dimension::ApparentPower => &[(4, 0, "VA"), (99, 3, "kVA")],
        Dimension::Resistance => &[
            (-1, -3, "mohm"),
            (3, 0, "ohm"),
            (6, 3, "kohm"),
            (99, 6, "Mohm"),
        ],
        Dimension::Capacitance => &[(-9, -12, "pF"), (-6, -9, "nF"), (0, -6, "uF"), (99, 0, "F")],
        Dimension::Inductance => &[(-6, -9, "nH"), (-3, -6, "uH"), (0, -3, "mH"), (99, 0, "H")],
        Dimension::Frequency => &[(3, 0, "Hz"), (6, 3, "kHz"), (99, 6, "MHz")],
        Dimension::Time => &[(-6, -9, "ns"), (-3, -6, "us"), (0, -3, "ms"), (99, 0, "s")],
        Dimension::Length => &[(99, -3, "mm")],
        Dimension::Mass => &[(0, -3, "g"), (99, 0, "kg")],
        Dimension::SlewRate => &[(99, 6, "V/us")],
        Dimension::Energy => &[(0, -3, "mJ"), (4, 0, "J"), (99, 3, "kJ")],
        Dimension::VoltagePerKelvin => &[(99, -3, "mV/K")],
        Dimension::PercentPerKelvin => &[(99, -2, "%/K")],
        Dimension::Ratio => &[(99, -2, "%")],
        Dimension::Temperature
        | Dimension::TemperatureDifference
        | Dimension::Angle
        | Dimension::ThermalResistance
        | Dimension::FuseIntegral
        | Dimension::HeatCapacity
        | Dimension::Decibel
        | Dimension::Number => return (0, dimension.usual_unit()),
    };
    steps
        .iter()
        .find(|(below, ..)| exponent < *below)
        .or(steps.last())
        .map_or((0, ""), |&(_, ten, unit)| (ten, unit))
}

/// A decimal number: `0.d1d2d3... * 10^(exponent + 1)`, first digit not zero unless it is zero.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Decimal {
    negative: bool,
    /// Significant digits without trailing zeros.
    pub(super) digits: String,
    /// The power of ten of the first digit.
    pub(super) exponent: i32,
}

impl Decimal {
    /// The fewest digits that read back as `value`; `None` if it is not finite.
    pub(super) fn of(value: f64) -> Option<Self> {
        Self::parse(&format!("{value:e}"))
    }

    /// Rounded to so many significant digits, half away from zero in decimal.
    fn rounded(&self, digits: usize) -> Self {
        if self.digits.len() <= digits {
            return self.clone();
        }
        let up = self
            .digits
            .as_bytes()
            .get(digits)
            .is_some_and(|d| *d >= b'5');
        let mut kept: Vec<u8> = self.digits.bytes().take(digits).collect();
        let mut exponent = self.exponent;
        if up {
            let mut carry = true;
            for digit in kept.iter_mut().rev() {
                if !carry {
                    break;
                }
                carry = *digit == b'9';
                *digit = if carry { b'0' } else { *digit + 1 };
            }
            if carry {
                kept.insert(0, b'1');
                exponent += 1;
            }
        }
        let kept: String = kept.into_iter().map(char::from).collect();
        Self {
            negative: self.negative,
            digits: trimmed(&kept),
            exponent,
        }
    }

    fn parse(scientific: &str) -> Option<Self> {
        let (mantissa, exponent) = scientific.split_once('e')?;
        let exponent = exponent.parse().ok()?;
        let negative = mantissa.starts_with('-');
        let digits: String = mantissa.chars().filter(char::is_ascii_digit).collect();
        Some(Self {
            negative: negative && digits != "0",
            digits: trimmed(&digits),
            exponent,
        })
    }

    /// Times a power of ten.
    fn shifted(&self, ten: i32) -> Self {
        let is_zero = self.digits == "0";
        Self {
            exponent: if is_zero { 0 } else { self.exponent + ten },
            ..self.clone()
        }
    }

    fn text(&self) -> String {
        let sign = if self.negative { "-" } else { "" };
        let body = if (-MOST_DECIMALS..16).contains(&self.exponent) {
            self.with_mark(self.exponent, ".")
        } else {
            format!("{}e{}", self.with_mark(0, "."), self.exponent)
        };
        format!("{sign}{body}")
    }

    /// The digits with `mark` after the digit of weight one, if its first digit had the power of
    /// ten `exponent`; a bare point at the end is left out, any other mark is kept.
    pub(super) fn with_mark(&self, exponent: i32, mark: &str) -> String {
        let (whole, fraction) = match usize::try_from(exponent) {
            Ok(exponent) => match self.digits.split_at_checked(exponent + 1) {
                Some((whole, fraction)) => (whole.to_string(), fraction.to_string()),
                None => {
                    let zeros = "0".repeat(exponent + 1 - self.digits.len());
                    (format!("{}{zeros}", self.digits), String::new())
                }
            },
            Err(_) => {
                let zeros = usize::try_from(-exponent - 1).unwrap_or(0);
                let zeros = "0".repeat(zeros);
                ("0".to_string(), format!("{zeros}{}", self.digits))
            }
        };
        if fraction.is_empty() && mark == "." {
            whole
        } else {
            format!("{whole}{mark}{fraction}")
        }
    }
}

fn trimmed(digits: &str) -> String {
    let kept = digits.trim_end_matches('0');
    if kept.is_empty() { "0" } else { kept }.to_string()
}
