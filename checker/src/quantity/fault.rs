//! The words for what cannot be taken as a quantity: what is wrong, what was expected, what to write.
//! Must not know keys; what a value would mean for an amplifier is for the caller to add.

use super::letter_code::Code;
use super::read::{Typed, attempt};
use super::unit::{self, Foreign, Unit};
use super::{Dimension, Fault, FaultKind, Meaning, Reading, number, print};

/// Longest piece of the user's text that a message repeats.
const MOST_QUOTED: usize = 40;

fn quoted(text: &str) -> String {
    if text.chars().count() <= MOST_QUOTED {
        return text.to_string();
    }
    let start: String = text.chars().take(MOST_QUOTED).collect();
    format!("{start}...")
}

fn joined(tokens: &[&str], used: usize) -> String {
    quoted(&tokens.get(..used).unwrap_or(tokens).join(" "))
}

fn fault(kind: FaultKind, message: String, hint: String, used: usize) -> Fault {
    Fault {
        kind,
        message,
        hint,
        used: used.max(1),
        readings: Vec::new(),
    }
}

fn reading(text: String, meaning: impl Into<String>) -> Meaning {
    Meaning {
        text,
        meaning: meaning.into(),
    }
}

/// `a resistance` or `a current or a voltage`.
fn names(wants: &[Dimension]) -> String {
    let names: Vec<&str> = wants.iter().map(|want| want.name()).collect();
    names.join(" or ")
}

/// `4.7 ohm` or `50 mA` or `28 V`, each in backticks.
fn examples(wants: &[Dimension]) -> String {
    let examples: Vec<String> = wants
        .iter()
        .map(|want| format!("`{}`", want.example()))
        .collect();
    examples.join(" or ")
}

/// The one reading that shows in the hint as well.
fn with_reading(mut fault: Fault, text: String, meaning: &str) -> Fault {
    fault.readings.push(reading(text, meaning));
    fault
}

/// `nan`, `inf` and their like, which a conversion would take for numbers.
pub(super) fn is_no_number(text: &str) -> bool {
    const WORDS: [&str; 5] = ["nan", "inf", "infinity", "infinite", "\u{221e}"];
    WORDS.iter().any(|word| word.eq_ignore_ascii_case(text))
}

/// What to say to one of those.
pub(super) fn not_a_number(text: &str, used: usize) -> Fault {
    fault(
        FaultKind::OutOfRange,
        format!("`{text}` is not a number"),
        "write a figure with its unit, or `none` if nothing is fitted".to_string(),
        used,
    )
}

/// The letter O typed for a zero: `1OO`, `OR22`, `0hm`.
pub(super) fn letter_o(tokens: &[&str], wants: &[Dimension]) -> Option<Fault> {
    let near: Vec<String> = tokens
        .iter()
        .take(4)
        .map(|token| without_o(token))
        .collect();
    let unchanged = near.iter().zip(tokens).all(|(new, old)| new == old);
    if unchanged {
        return None;
    }
    let repaired: Vec<&str> = near.iter().map(String::as_str).collect();
    let (used, text, meaning) = match attempt(&repaired, wants) {
        Reading::Read { quantity, notes } => {
            let typed = repaired.get(..quantity.used).unwrap_or(&repaired).join(" ");
            let text = notes.first().map_or(typed, |note| note.canonical.clone());
            let meaning = print::format(quantity.value, quantity.dimension);
            (quantity.used, text, meaning)
        }
        // A number it is, but its unit is missing too; the first reading supplies one.
        Reading::Wrong(Fault {
            kind: FaultKind::MissingUnit,
            used,
            readings,
            ..
        }) if tokens
            .first()
            .is_some_and(|t| t.starts_with(|c: char| c.is_ascii_digit())) =>
        {
            let first = readings.into_iter().next()?;
            (used, first.text, first.meaning)
        }
        _ => return None,
    };
    let is_touched = near
        .iter()
        .zip(tokens)
        .take(used)
        .any(|(new, old)| new != old);
    is_touched.then(|| {
        let fault = fault(
            FaultKind::Number,
            format!(
                "`{}` has a letter O and a zero mixed up",
                joined(tokens, used)
            ),
            format!("write `{text}`"),
            used,
        );
        with_reading(fault, text, &meaning)
    })
}

/// The token with `0hm` turned to `ohm` and, if it holds a digit, every other O to a zero.
fn without_o(token: &str) -> String {
    const MARK: &str = "\u{1}";
    if token.len() > MOST_QUOTED || !token.bytes().any(|b| b.is_ascii_digit()) {
        return token.to_string();
    }
    token
        .replace("0hm", MARK)
        .replace("ohm", MARK)
        .replace(['O', 'o'], "0")
        .replace(MARK, "ohm")
}

/// Digits and marks that make no number.
pub(super) fn malformed(tokens: &[&str], used: usize) -> Fault {
    fault(
        FaultKind::Number,
        format!("`{}` is not one number", joined(tokens, used)),
        "write it with one decimal point, digits on both sides, and no digit groups".to_string(),
        used,
    )
}

/// A value no quantity has.
pub(super) fn out_of_range(text: &str, used: usize) -> Fault {
    fault(
        FaultKind::OutOfRange,
        format!("`{}` is beyond any size a quantity can have", quoted(text)),
        "check the number and its unit".to_string(),
        used,
    )
}

/// Text behind a quantity in the same token.
pub(super) fn left_over(body: &str, rest: &str, used: usize) -> Fault {
    fault(
        FaultKind::UnknownUnit,
        format!(
            "`{}` after `{}` is not understood",
            quoted(rest),
            quoted(body)
        ),
        "put a space between two items; a tolerance is written `±5 %`".to_string(),
        used,
    )
}

/// A number without the unit it needs.
pub(super) fn missing_unit(typed: &Typed, wants: &[Dimension], used: usize) -> Fault {
    let number = quoted(&typed.with_unit(""));
    let mut fault = fault(
        FaultKind::MissingUnit,
        format!("`{number}` has no unit; {} is wanted here", names(wants)),
        format!("write the unit, as in {}", examples(wants)),
        used,
    );
    for want in wants {
        let text = typed.with_unit(want.usual_unit());
        fault.readings.push(reading(text, want.name()));
    }
    fault
}

/// A unit that is none, with the nearest one that is.
pub(super) fn unknown_unit(
    typed: &Typed,
    text: &str,
    tokens: &[&str],
    wants: &[Dimension],
    used: usize,
) -> Fault {
    if let Some(fault) = two_quantities(tokens, used) {
        return fault;
    }
    let unknown = format!(
        "`{}` is not a unit; {} is wanted here",
        quoted(text),
        names(wants)
    );
    if let Some(symbol) = unit::ignoring_case(text, wants) {
        let meant = typed.with_unit(&symbol);
        let hint = format!(
            "write `{}`; capital and small letters differ",
            quoted(&meant)
        );
        let fault = fault(FaultKind::UnknownUnit, unknown, hint, used);
        return with_reading(fault, meant, "the same with its letters right");
    }
    fault(
        FaultKind::UnknownUnit,
        unknown,
        format!("write it as in {}", examples(wants)),
        used,
    )
}

/// `10000uF/63V` where one quantity was wanted.
fn two_quantities(tokens: &[&str], used: usize) -> Option<Fault> {
    let token = tokens.get(used.checked_sub(1)?)?;
    let (left, right) = super::split_slash(token)?;
    let part = |text: &str| match attempt(&[text], &Dimension::ALL) {
        Reading::Read { quantity, .. } => {
            Some(print::format_exact(quantity.value, quantity.dimension))
        }
        _ => None,
    };
    let text = format!("{} {}", part(left)?, part(right)?);
    let fault = fault(
        FaultKind::UnknownUnit,
        format!("`{}` is two quantities", quoted(token)),
        format!("write `{text}`"),
        used,
    );
    Some(with_reading(fault, text, "the two, one after the other"))
}

/// `MA`, `mHz`, `MF`: `units` are what it may have been meant to be.
pub(super) fn bad_prefix(
    typed: &Typed,
    text: &str,
    units: &[Unit],
    wants: &[Dimension],
    used: usize,
) -> Fault {
    if let Some(unit) = units.first()
        && !wants.contains(&unit.dimension)
    {
        return other_kind(typed, text, unit.dimension, wants, used);
    }
    let prefix = if text.starts_with('M') {
        "mega"
    } else {
        "milli"
    };
    let readings: Vec<Meaning> = units
        .iter()
        .map(|unit| reading(typed.with_unit(&unit.symbol), format!("in {}", unit.symbol)))
        .collect();
    let listed: Vec<String> = readings
        .iter()
        .map(|reading| format!("`{}`", quoted(&reading.text)))
        .collect();
    let mut fault = fault(
        FaultKind::Ambiguous,
        format!("`{text}` would be {prefix}, which nobody uses with this unit"),
        format!("write {}", listed.join(" or ")),
        used,
    );
    fault.readings = readings;
    fault
}

/// A unit of another kind, itself not one this language reads.
fn other_kind(typed: &Typed, text: &str, is: Dimension, wants: &[Dimension], used: usize) -> Fault {
    fault(
        FaultKind::WrongDimension,
        format!(
            "`{}` is {}; {} is wanted here",
            quoted(&typed.with_unit(text)),
            is.name(),
            names(wants)
        ),
        format!("write it as in {}", examples(wants)),
        used,
    )
}

/// A text of plain meaning that this language does not take for a unit.
pub(super) fn foreign(
    typed: &Typed,
    foreign: Foreign,
    text: &str,
    wants: &[Dimension],
    used: usize,
) -> Fault {
    let is = foreign.dimension();
    let is_wanted = wants
        .iter()
        .any(|want| want.difference() == is.difference());
    if !is_wanted && foreign != Foreign::Metre {
        return other_kind(typed, text, is, wants, used);
    }
    match foreign {
        Foreign::Fahrenheit if !wants.contains(&is) => fahrenheit_difference(typed, used),
        Foreign::Fahrenheit => fahrenheit(typed, used),
        Foreign::Inch => inches(typed, used),
        Foreign::CentreTapped => centre_tapped(typed, used),
        Foreign::PeakToPeak => peak_to_peak(typed, used),
        Foreign::Conductance => conductance(typed, text, used),
        Foreign::Min => replaced(typed, "`min` is not a unit here", "minute", used),
        Foreign::SmallOmega => {
            let prefix = text.trim_end_matches('\u{3c9}');
            let message = "this is a small omega, not the ohm sign";
            replaced(typed, message, &format!("{prefix}ohm"), used)
        }
        Foreign::Metre if wants.contains(&Dimension::Length) => metres(typed, used),
        Foreign::Metre => lone_milli(typed, wants, used),
    }
}

/// `50 m`: milli of what, or minutes.
fn lone_milli(typed: &Typed, wants: &[Dimension], used: usize) -> Fault {
    let mut fault = fault(
        FaultKind::UnknownUnit,
        format!("`m` alone is no unit; {} is wanted here", names(wants)),
        format!("write the whole unit, as in {}", examples(wants)),
        used,
    );
    for want in wants {
        if let Some(milli) = unit::milli(*want) {
            fault
                .readings
                .push(reading(typed.with_unit(&milli), "milli"));
        }
        if *want == Dimension::Time {
            fault
                .readings
                .push(reading(typed.with_unit("minute"), "minutes"));
        }
    }
    fault
}

fn replaced(typed: &Typed, message: &str, unit: &str, used: usize) -> Fault {
    let text = typed.with_unit(unit);
    let hint = format!("write `{}`", quoted(&text));
    let fault = fault(FaultKind::UnknownUnit, message.to_string(), hint, used);
    with_reading(fault, text, "the same quantity")
}

/// `value` rewritten in a unit this language has.
fn converted(message: &str, value: Option<f64>, dimension: Dimension, used: usize) -> Fault {
    let Some(value) = value else {
        return out_of_range("the number", used);
    };
    let text = print::format(value, dimension);
    let hint = format!("write `{text}`");
    let fault = fault(FaultKind::UnknownUnit, message.to_string(), hint, used);
    with_reading(fault, text, "converted")
}

fn fahrenheit(typed: &Typed, used: usize) -> Fault {
    let celsius = typed.value(0, 1.0).map(|f| (f - 32.0) * 5.0 / 9.0);
    let message = "temperatures are stated in degC, not in Fahrenheit";
    converted(message, celsius, Dimension::Temperature, used)
}

fn fahrenheit_difference(typed: &Typed, used: usize) -> Fault {
    let kelvin = typed.value(0, 1.0).map(|f| f * 5.0 / 9.0);
    let message = "differences of temperature are stated in K, not in Fahrenheit";
    converted(message, kelvin, Dimension::TemperatureDifference, used)
}

fn inches(typed: &Typed, used: usize) -> Fault {
    let metres = typed.value(0, 0.0254);
    converted(
        "lengths are stated in mm, not in inches",
        metres,
        Dimension::Length,
        used,
    )
}

fn metres(typed: &Typed, used: usize) -> Fault {
    let message = "`m` is milli here; lengths are stated in mm or cm";
    converted(message, typed.value(0, 1.0), Dimension::Length, used)
}

fn peak_to_peak(typed: &Typed, used: usize) -> Fault {
    let peak = typed.value(0, 0.5).map(|peak| {
        let text = print::format_exact(peak, Dimension::Voltage);
        format!("{text}pk")
    });
    let hint = "write the peak value, half of it";
    let message = "voltages are stated as rms or peak, not from peak to peak";
    let fault = fault(
        FaultKind::UnknownUnit,
        message.to_string(),
        hint.to_string(),
        used,
    );
    match peak {
        Some(text) => with_reading(fault, text, "the peak value"),
        None => fault,
    }
}

fn centre_tapped(typed: &Typed, used: usize) -> Fault {
    let Some(total) = typed.value(0, 1.0) else {
        return out_of_range("the number", used);
    };
    let whole = print::format_exact(total, Dimension::Voltage);
    let half = print::format_exact(total / 2.0, Dimension::Voltage);
    let mut fault = fault(
        FaultKind::Ambiguous,
        format!("{whole} CT may be the total over both halves or the voltage of each"),
        format!(
            "write `2 x {half}ac` if {whole} is end to end, `2 x {whole}ac` if it is each half"
        ),
        used,
    );
    fault.readings = vec![
        reading(
            format!("2 x {half}ac"),
            format!("{whole} end to end, {half} from each end to the tap"),
        ),
        reading(
            format!("2 x {whole}ac"),
            format!("{whole} from each end to the tap"),
        ),
    ];
    fault
}

fn conductance(typed: &Typed, text: &str, used: usize) -> Fault {
    let same = typed.with_unit("K/W");
    let mut fault = fault(
        FaultKind::WrongDimension,
        format!("`{text}` is the reciprocal of a thermal resistance, which is stated in K/W"),
        format!(
            "write `{}`, unless the figure really is watts per kelvin",
            quoted(&same)
        ),
        used,
    );
    fault
        .readings
        .push(reading(same, "the unit was turned over"));
    let reciprocal = typed
        .value(0, 1.0)
        .filter(|value| *value > 0.0)
        .map(|value| print::format(1.0 / value, Dimension::ThermalResistance));
    if let Some(reciprocal) = reciprocal {
        fault
            .readings
            .push(reading(reciprocal, "the figure is watts per kelvin"));
    }
    fault
}

/// A good unit of the wrong kind.
pub(super) fn wrong_dimension(
    typed: &Typed,
    unit: &Unit,
    wants: &[Dimension],
    used: usize,
) -> Fault {
    let text = quoted(&typed.with_unit(&unit.symbol));
    let is = unit.dimension.name();
    let mut fault = fault(
        FaultKind::WrongDimension,
        format!("`{text}` is {is}; {} is wanted here", names(wants)),
        format!("write it as in {}", examples(wants)),
        used,
    );
    if let Some((unit, meaning)) = wants.iter().find_map(|want| usual_slip(unit, *want)) {
        let meant = typed.with_unit(unit);
        fault.hint = format!("write `{}` if {meaning}", quoted(&meant));
        fault.readings.push(reading(meant, meaning));
    } else if unit.dimension == Dimension::TemperatureDifference
        && wants.contains(&Dimension::Temperature)
    {
        return absolute_kelvin(typed, fault);
    } else if unit.dimension == Dimension::Capacitance && wants.contains(&Dimension::Temperature) {
        // `160 F` on a thermal cut-out is Fahrenheit, not farads.
        return fahrenheit(typed, used);
    }
    fault
}

/// The unit people mean when they write `unit` where `want` is wanted.
fn usual_slip(unit: &Unit, want: Dimension) -> Option<(&'static str, &'static str)> {
    use Dimension as D;
    let slip = match (unit.dimension, want) {
        (D::TemperatureDifference, D::Resistance) => {
            ("kohm", "kilohms are meant; K alone is kelvin")
        }
        (D::Power, D::ApparentPower) => ("VA", "this is a transformer rating, which is in VA"),
        (D::ApparentPower, D::Power) => ("W", "real power is meant"),
        (D::Power, D::ThermalResistance) => ("K/W", "a thermal resistance is meant"),
        (D::TemperatureDifference | D::Temperature, D::ThermalResistance) => {
            ("K/W", "a thermal resistance is meant")
        }
        (D::Voltage, D::ThermalResistance) => ("K/W", "a thermal resistance is meant"),
        (D::Angle, D::Temperature) => ("degC", "a temperature is meant"),
        (D::Temperature | D::TemperatureDifference, D::Angle) => ("deg", "an angle is meant"),
        (D::Resistance, D::ThermalResistance) => ("K/W", "a thermal resistance is meant"),
        _ => return None,
    };
    Some(slip)
}

/// Kelvins where a temperature is wanted: absolute if large, a slip for degC if not.
fn absolute_kelvin(typed: &Typed, mut fault: Fault) -> Fault {
    let as_typed = typed.with_unit("degC");
    fault.hint = format!("write `{}`; K is for differences", quoted(&as_typed));
    let absolute = typed.value(0, 1.0).filter(|kelvin| *kelvin >= 200.0);
    if let Some(kelvin) = absolute {
        let celsius = print::format(kelvin - 273.15, Dimension::Temperature);
        fault.hint = format!("write `{celsius}`; K is for differences");
        fault
            .readings
            .push(reading(celsius, "the figure is an absolute temperature"));
    }
    fault
        .readings
        .push(reading(as_typed, "degrees Celsius are meant"));
    fault
}

/// `47K` where ohms are wanted.
pub(super) fn kelvin_for_kilohm(digits: &str, used: usize) -> Fault {
    let digits = quoted(digits);
    let meant = format!("{digits}k");
    let fault = fault(
        FaultKind::WrongDimension,
        format!("`{digits}K` reads as {digits} kelvin; a resistance is wanted here"),
        format!("write `{meant}` if kilohms are meant"),
        used,
    );
    with_reading(fault, meant, "kilohms are meant; K alone is kelvin")
}

/// `1,000`, `10.000 uF`.
pub(super) fn point_or_group(whole: &str, decimal: &str, mark: &str, used: usize) -> Fault {
    let (whole, decimal) = (quoted(whole), quoted(decimal));
    let mut fault = fault(
        FaultKind::Ambiguous,
        format!("the {mark} may group thousands ({whole}) or be the decimal point ({decimal})"),
        format!("write `{whole}` or `{}`", without_zeros(&decimal)),
        used,
    );
    fault.readings = vec![
        reading(whole, format!("the {mark} groups thousands")),
        reading(
            without_zeros(&decimal),
            format!("the {mark} is the decimal point"),
        ),
    ];
    fault
}

/// `10.000 uF` as `10 uF`, which cannot be misread again.
fn without_zeros(text: &str) -> String {
    let (number, unit) = text.split_once(' ').unwrap_or((text, ""));
    let number = match number.contains('e') {
        true => number,
        false => number.trim_end_matches('0').trim_end_matches('.'),
    };
    format!("{number} {unit}").trim_end().to_string()
}

/// `1,000,000`.
pub(super) fn digit_groups(whole: &str, used: usize) -> Fault {
    let whole = quoted(whole);
    let fault = fault(
        FaultKind::Ambiguous,
        "digits are not grouped here".to_string(),
        format!("write `{whole}`"),
        used,
    );
    with_reading(fault, whole, "the marks group thousands")
}

/// A code that two wanted dimensions would take.
pub(super) fn two_codes(text: &str, codes: &[Code], used: usize) -> Fault {
    let mut fault = fault(
        FaultKind::Ambiguous,
        format!("`{}` has more than one meaning here", quoted(text)),
        "write it with its unit".to_string(),
        used,
    );
    for code in codes {
        if let Some(value) = number::value_of(&code.digits, code.ten, 1.0) {
            let text = print::format_exact(value, code.dimension);
            fault.readings.push(reading(text, code.dimension.name()));
        }
    }
    fault
}

/// `4E7`: 4.7 ohm in old style, or 4 times ten to the seventh.
pub(super) fn code_or_exponent(text: &str, code: &Code, used: usize) -> Fault {
    let mut fault = fault(
        FaultKind::Ambiguous,
        format!(
            "the E of `{}` may be a decimal point or a power of ten",
            quoted(text)
        ),
        format!(
            "write `{}` for the first, or the number in full with its unit",
            quoted(&code.canonical)
        ),
        used,
    );
    fault
        .readings
        .push(reading(code.canonical.clone(), "E is the decimal point"));
    let power = number::scan(text).and_then(|number| number.value(0, 1.0));
    if let Some(value) = power {
        let text = print::format_exact(value, code.dimension);
        fault.readings.push(reading(text, "E is a power of ten"));
    }
    fault
}

/// `0R225W`: tolerance letter W, or a resistance and a power run together.
pub(super) fn tolerance_or_watt(text: &str, code: &Code, used: usize) -> Fault {
    let mut fault = fault(
        FaultKind::Ambiguous,
        format!(
            "the W of `{}` may be watts or the tolerance letter for 0.05 %",
            quoted(text)
        ),
        "put a space between resistance and power, as in `0R22 5 W`".to_string(),
        used,
    );
    let coded = &code.canonical;
    fault.readings.push(reading(
        format!("{coded} ±0.05 %"),
        "W is the tolerance letter",
    ));
    if let Some((head, last)) = coded.split_at_checked(coded.len().saturating_sub(1))
        && head.len() > 1
        && last.bytes().all(|b| b.is_ascii_digit())
    {
        fault.readings.push(reading(
            format!("{head} {last} W"),
            "a resistance and its power",
        ));
    }
    fault
}
