//! Tests of the reader, the printer and their agreement.
//! Spellings and their meanings are those of the language reference and of the trade (common
//! practice, no source) unless a standard is named; IEC values are in `tests/reference/codes.rs`.

use super::Dimension as D;
use super::*;
use proptest::prelude::*;

fn tokens(text: &str) -> Vec<&str> {
    text.split_whitespace().collect()
}

fn quantity(text: &str, want: D) -> (Quantity, Vec<Note>) {
    match read(&tokens(text), want) {
        Reading::Read { quantity, notes } => (quantity, notes),
        other => panic!("`{text}` as {want:?}: {other:?}"),
    }
}

fn wrong(text: &str, want: D) -> Fault {
    match read(&tokens(text), want) {
        Reading::Wrong(fault) => fault,
        other => panic!("`{text}` as {want:?}: {other:?}"),
    }
}

fn texts(fault: &Fault) -> Vec<&str> {
    fault.readings.iter().map(|r| r.text.as_str()).collect()
}

/// Text, dimension, value, spelling after tidying (the text itself if it is fine), told or not.
#[rustfmt::skip]
const ACCEPTED: &[(&str, D, f64, &str, bool)] = &[
    ("0R22", D::Resistance, 0.22, "0R22", false),
    ("R22", D::Resistance, 0.22, "R22", false),
    ("4k7", D::Resistance, 4700.0, "4k7", false),
    ("4K7", D::Resistance, 4700.0, "4k7", false),
    ("8R", D::Resistance, 8.0, "8R", false),
    ("8r", D::Resistance, 8.0, "8R", false),
    ("100E", D::Resistance, 100.0, "100R", false),
    ("22k", D::Resistance, 22e3, "22k", false),
    ("1M", D::Resistance, 1e6, "1M", false),
    ("220m", D::Resistance, 0.22, "220 mohm", false),
    ("4.7k", D::Resistance, 4700.0, "4.7 kohm", false),
    ("4.7 k ohm", D::Resistance, 4700.0, "4.7 kohm", false),
    ("4.7 Kohm", D::Resistance, 4700.0, "4.7 kohm", false),
    ("8 ohms", D::Resistance, 8.0, "8 ohm", false),
    ("8\u{3a9}", D::Resistance, 8.0, "8 ohm", false),
    ("8 \u{2126}", D::Resistance, 8.0, "8 ohm", false),
    ("4k7 \u{3a9}", D::Resistance, 4700.0, "4k7", false),
    ("4\u{3a9}7", D::Resistance, 4.7, "4R7", false),
    ("25 mohm", D::Resistance, 0.025, "25 mohm", false),
    ("0,22 ohm", D::Resistance, 0.22, "0.22 ohm", false),
    ("0,22R", D::Resistance, 0.22, "0.22 ohm", false),
    ("0,001 ohm", D::Resistance, 0.001, "0.001 ohm", false),
    ("2,2 ohm", D::Resistance, 2.2, "2.2 ohm", true),
    (".5 ohm", D::Resistance, 0.5, "0.5 ohm", false),
    ("1e3 ohm", D::Resistance, 1000.0, "1e3 ohm", false),
    ("4E7 ohm", D::Resistance, 4e7, "4e7 ohm", false),
    ("10.000 ohm", D::Resistance, 10.0, "10.000 ohm", false),
    ("10 000 ohm", D::Resistance, 10_000.0, "10000 ohm", true),
    ("27KK", D::Resistance, 27e3, "27k ±10 %", true),
    ("27KJ", D::Resistance, 27e3, "27k ±5 %", true),
    ("4700 uF", D::Capacitance, 4.7e-3, "4700 uF", false),
    ("10000\u{b5}F", D::Capacitance, 0.01, "10000 uF", false),
    ("10000\u{3bc}F", D::Capacitance, 0.01, "10000 uF", false),
    ("10000 muF", D::Capacitance, 0.01, "10000 uF", false),
    ("10 mF", D::Capacitance, 0.01, "10 mF", false),
    ("470 MFD", D::Capacitance, 470e-6, "470 uF", true),
    ("470 mfd", D::Capacitance, 470e-6, "470 uF", true),
    ("100nF", D::Capacitance, 100e-9, "100 nF", false),
    ("100n", D::Capacitance, 100e-9, "100n", false),
    ("2\u{b5}2", D::Capacitance, 2.2e-6, "2u2", false),
    ("2u2F", D::Capacitance, 2.2e-6, "2u2", true),
    ("10.001 uF", D::Capacitance, 10.001e-6, "10.001 uF", false),
    ("2u2", D::Inductance, 2.2e-6, "2u2", false),
    ("0.7 mH", D::Inductance, 0.7e-3, "0.7 mH", false),
    ("63V", D::Voltage, 63.0, "63 V", false),
    ("5V6", D::Voltage, 5.6, "5.6 V", false),
    ("28VAC", D::Voltage, 28.0, "28 Vac", false),
    ("28 V ac", D::Voltage, 28.0, "28 Vac", false),
    ("28 V~", D::Voltage, 28.0, "28 Vac", false),
    ("60 V dc", D::Voltage, 60.0, "60 Vdc", false),
    ("40 Vpk", D::Voltage, 40.0, "40 Vpk", false),
    ("+-42V", D::Voltage, 42.0, "±42 V", false),
    ("\u{2212}42 V", D::Voltage, -42.0, "-42 V", false),
    ("3,15A", D::Current, 3.15, "3.15 A", true),
    ("5a", D::Current, 5.0, "5 A", false),
    ("60 watts", D::Power, 60.0, "60 W", false),
    ("60 W RMS", D::Power, 60.0, "60 W", true),
    ("1/4 W", D::Power, 0.25, "0.25 W", false),
    ("1/2W", D::Power, 0.5, "0.5 W", false),
    ("300VA", D::ApparentPower, 300.0, "300 VA", false),
    ("20 kHz", D::Frequency, 20e3, "20 kHz", false),
    ("20 KHz", D::Frequency, 20e3, "20 kHz", false),
    ("5000 h", D::Time, 1.8e7, "5000 h", false),
    ("5 minutes", D::Time, 300.0, "5 minute", false),
    ("75mm", D::Length, 0.075, "75 mm", false),
    ("1.4 kg", D::Mass, 1.4, "1.4 kg", false),
    ("80 \u{ba}C", D::Temperature, 80.0, "80 degC", false),
    ("80\u{2da}C", D::Temperature, 80.0, "80 degC", false),
    ("80 deg C", D::Temperature, 80.0, "80 degC", false),
    ("-10 degC", D::Temperature, -10.0, "-10 degC", false),
    ("5 degC", D::TemperatureDifference, 5.0, "5 K", true),
    ("45 deg", D::Angle, 45.0, "45 deg", false),
    ("0.45 degC/W", D::ThermalResistance, 0.45, "0.45 K/W", false),
    ("0.45 C/W", D::ThermalResistance, 0.45, "0.45 K/W", false),
    ("0.45\u{b0}C/W", D::ThermalResistance, 0.45, "0.45 K/W", false),
    ("0.45 K / W", D::ThermalResistance, 0.45, "0.45 K/W", false),
    ("20 V/\u{b5}s", D::SlewRate, 20e6, "20 V/us", false),
    ("25 A\u{b2}s", D::FuseIntegral, 25.0, "25 A2s", false),
    ("60 J", D::Energy, 60.0, "60 J", false),
    ("900 J/K", D::HeatCapacity, 900.0, "900 J/K", false),
    ("-2.2 mV/\u{b0}C", D::VoltagePerKelvin, -2.2e-3, "-2.2 mV/K", false),
    ("0.4 %/K", D::PercentPerKelvin, 0.004, "0.4 %/K", false),
    ("7%", D::Ratio, 0.07, "7 %", false),
    ("28 dB", D::Decibel, 28.0, "28 dB", false),
    ("80", D::Number, 80.0, "80", false),
    ("1/8", D::Number, 0.125, "1/8", false),
];

#[test]
fn spellings_of_the_trade_are_read_and_tidied() {
    for &(text, want, value, canonical, told) in ACCEPTED {
        let (read, notes) = quantity(text, want);
        assert!(
            (read.value - value).abs() <= 1e-15 * value.abs(),
            "`{text}` is {}",
            read.value
        );
        assert_eq!(read.used, tokens(text).len(), "`{text}`");
        let tidied = notes.first().map_or(text, |n| n.canonical.as_str());
        assert_eq!(tidied, canonical, "`{text}`");
        let is_told = notes
            .iter()
            .any(|n| n.severity == NoteSeverity::Information);
        assert_eq!(is_told, told, "`{text}`: {notes:?}");
    }
}

/// Text, dimension, kind, readings offered.
#[rustfmt::skip]
const REFUSED: &[(&str, D, FaultKind, &[&str])] = &[
    ("1,000 ohm", D::Resistance, FaultKind::Ambiguous, &["1000 ohm", "1 ohm"]),
    ("10,000 uF", D::Capacitance, FaultKind::Ambiguous, &["10000 uF", "10 uF"]),
    ("10.000uF", D::Capacitance, FaultKind::Ambiguous, &["10000 uF", "10 uF"]),
    ("4.700 uF", D::Capacitance, FaultKind::Ambiguous, &["4700 uF", "4.7 uF"]),
    ("1,000,000 ohm", D::Resistance, FaultKind::Ambiguous, &["1000000 ohm"]),
    ("1.234,5 ohm", D::Resistance, FaultKind::Ambiguous, &["1234.5 ohm"]),
    ("1,000", D::Number, FaultKind::Ambiguous, &["1000", "1"]),
    ("4 700 uF", D::Capacitance, FaultKind::Ambiguous, &["4700 uF", "4 x 700 uF"]),
    ("56VCT", D::Voltage, FaultKind::Ambiguous, &["2 x 28 Vac", "2 x 56 Vac"]),
    ("56 V CT", D::Voltage, FaultKind::Ambiguous, &["2 x 28 Vac", "2 x 56 Vac"]),
    ("4E7", D::Resistance, FaultKind::Ambiguous, &["4R7", "40 Mohm"]),
    ("0R225W", D::Resistance, FaultKind::Ambiguous, &["0R225 ±0.05 %", "0R22 5 W"]),
    ("10 MF", D::Capacitance, FaultKind::Ambiguous, &["10 uF", "10 mF"]),
    ("50 MA", D::Current, FaultKind::Ambiguous, &["50 mA"]),
    ("30 mHz", D::Frequency, FaultKind::Ambiguous, &["30 MHz"]),
    ("47K", D::Resistance, FaultKind::WrongDimension, &["47k"]),
    ("4.7 K", D::Resistance, FaultKind::WrongDimension, &["4.7 kohm"]),
    ("300 W", D::ApparentPower, FaultKind::WrongDimension, &["300 VA"]),
    ("0.45 W/K", D::ThermalResistance, FaultKind::WrongDimension, &["0.45 K/W", "2.222 K/W"]),
    ("0.45 kW", D::ThermalResistance, FaultKind::WrongDimension, &["0.45 K/W"]),
    ("353.15 K", D::Temperature, FaultKind::WrongDimension, &["80 degC", "353.15 degC"]),
    ("5 W", D::Resistance, FaultKind::WrongDimension, &[]),
    ("80 A", D::Number, FaultKind::WrongDimension, &[]),
    ("160 F", D::Temperature, FaultKind::UnknownUnit, &["71.11 degC"]),
    ("160 \u{b0}F", D::Temperature, FaultKind::UnknownUnit, &["71.11 degC"]),
    ("2 in", D::Length, FaultKind::UnknownUnit, &["50.8 mm"]),
    ("5 m", D::Time, FaultKind::UnknownUnit, &["5 ms", "5 minute"]),
    ("5 min", D::Time, FaultKind::UnknownUnit, &["5 minute"]),
    ("50 m", D::Current, FaultKind::UnknownUnit, &["50 mA"]),
    ("80 Vpp", D::Voltage, FaultKind::UnknownUnit, &["40 Vpk"]),
    ("8 \u{3c9}", D::Resistance, FaultKind::UnknownUnit, &["8 ohm"]),
    ("3 S", D::Time, FaultKind::UnknownUnit, &["3 s"]),
    ("10000uF/63V", D::Capacitance, FaultKind::UnknownUnit, &["10000 uF 63 V"]),
    ("1_000 ohm", D::Resistance, FaultKind::Ambiguous, &["1000 ohm"]),
    ("1'000.5 ohm", D::Resistance, FaultKind::Ambiguous, &["1000.5 ohm"]),
    ("1_0 ohm", D::Resistance, FaultKind::Number, &[]),
    ("1OO ohm", D::Resistance, FaultKind::Number, &["100 ohm"]),
    ("1OO", D::Resistance, FaultKind::Number, &["100 ohm"]),
    ("8 0hm", D::Resistance, FaultKind::Number, &["8 ohm"]),
    ("OR22", D::Resistance, FaultKind::Number, &["0R22"]),
    ("5. ohm", D::Resistance, FaultKind::Number, &[]),
    ("1.2.3 ohm", D::Resistance, FaultKind::Number, &[]),
    ("22", D::Resistance, FaultKind::MissingUnit, &["22 ohm"]),
    ("7", D::Ratio, FaultKind::MissingUnit, &["7 %"]),
    ("47K ±5 %", D::Resistance, FaultKind::WrongDimension, &["47k ±5 %"]),
    ("10,000uF±20%", D::Capacitance, FaultKind::Ambiguous, &["10000 uF ±20 %", "10 uF ±20 %"]),
    ("10.000 uF +80 % -20 %", D::Capacitance, FaultKind::Ambiguous, &["10000 uF +80 % -20 %", "10 uF +80 % -20 %"]),
    ("22 ±5 %", D::Resistance, FaultKind::MissingUnit, &["22 ohm ±5 %"]),
    ("1,234 MA", D::Current, FaultKind::Ambiguous, &["1,234 mA"]),
    ("nan", D::Voltage, FaultKind::OutOfRange, &[]),
    ("nan V", D::Voltage, FaultKind::OutOfRange, &[]),
    ("-Inf", D::Voltage, FaultKind::OutOfRange, &[]),
    ("1e999 V", D::Voltage, FaultKind::OutOfRange, &[]),
    ("1e-999 V", D::Voltage, FaultKind::OutOfRange, &[]),
    ("1e99999999999999999999 V", D::Voltage, FaultKind::OutOfRange, &[]),
    ("8 ohm ±10", D::Resistance, FaultKind::Tolerance, &[]),
    ("8 ohm +10 %", D::Resistance, FaultKind::Tolerance, &[]),
    ("8 ohm ±100 %", D::Resistance, FaultKind::Tolerance, &[]),
    ("8 ohm ±5 K", D::Resistance, FaultKind::Tolerance, &[]),
];

#[test]
fn what_cannot_be_taken_gets_its_own_words() {
    for &(text, want, kind, readings) in REFUSED {
        let fault = wrong(text, want);
        assert_eq!(fault.kind, kind, "`{text}`: {fault:?}");
        assert_eq!(texts(&fault), readings, "`{text}`: {fault:?}");
        assert_eq!(fault.used, tokens(text).len(), "`{text}`: {fault:?}");
    }
}

#[test]
fn words_are_not_quantities() {
    for word in [
        "out", "on", "Mohm", "x", "±", "+", "-", "", "none", "O1", "p", "R",
    ] {
        assert_eq!(read(&[word], D::Resistance), Reading::Not, "{word}");
    }
    assert_eq!(read(&[], D::Resistance), Reading::Not);
    // A designator and a name where no ohms are wanted.
    assert_eq!(read(&["R22"], D::Voltage), Reading::Not);
}

#[test]
fn only_the_tokens_of_the_quantity_are_used() {
    for (text, want, used) in [
        ("0R22 ±5 % 5 W", D::Resistance, 3),
        ("240 V at 1 A", D::Voltage, 2),
        ("16 A peak 28 A", D::Current, 2),
        ("80 at 1 A", D::Number, 1),
        ("28 V A", D::Voltage, 2),
        ("1.5 V 22k 47 uF", D::Voltage, 2),
        ("230 V ±10 % 50 Hz", D::Voltage, 4),
        ("80 degC ±5 K on sink", D::Temperature, 4),
        ("22k 100 nF", D::Resistance, 1),
    ] {
        assert_eq!(quantity(text, want).0.used, used, "`{text}`");
    }
}

#[test]
fn the_unit_picks_among_several_dimensions() {
    let pick = |text: &str, wants: &[D]| match read_one_of(&tokens(text), wants) {
        Reading::Read { quantity, .. } => quantity.dimension,
        other => panic!("`{text}`: {other:?}"),
    };
    assert_eq!(pick("5 W", &[D::Resistance, D::Power]), D::Power);
    assert_eq!(pick("100mW", &[D::Resistance, D::Power]), D::Power);
    assert_eq!(
        pick("47K", &[D::Resistance, D::TemperatureDifference]),
        D::TemperatureDifference
    );
    assert_eq!(
        pick("75 %", &[D::Ratio, D::TemperatureDifference, D::Number]),
        D::Ratio
    );
    assert_eq!(
        pick("0.75", &[D::Ratio, D::TemperatureDifference, D::Number]),
        D::Number
    );
    let Reading::Wrong(fault) = read_one_of(&["0m7"], &[D::Resistance, D::Inductance]) else {
        panic!("0m7 has two meanings");
    };
    assert_eq!(texts(&fault), ["0.7 mohm", "700 uH"]);
}

#[test]
fn qualifiers_are_kept() {
    for (text, form) in [
        ("28 Vac", Form::Rms),
        ("28 Vrms", Form::Rms),
        ("60 Vdc", Form::Dc),
        ("40 Vpk", Form::Peak),
        ("±42 V", Form::SymmetricalPair),
        ("± 42 V", Form::SymmetricalPair),
        ("+/-42V", Form::SymmetricalPair),
        ("42 V", Form::Plain),
    ] {
        assert_eq!(quantity(text, D::Voltage).0.form, form, "`{text}`");
    }
}

#[test]
fn tolerances_follow_their_quantity() {
    use Amount::{Absolute, Relative};
    for (text, want, plus, minus) in [
        ("8 ohm ±10 %", D::Resistance, Relative(0.1), Relative(0.1)),
        ("8 ohm +-10%", D::Resistance, Relative(0.1), Relative(0.1)),
        ("8ohm+/-10%", D::Resistance, Relative(0.1), Relative(0.1)),
        (
            "8 ohm ± 2,5 %",
            D::Resistance,
            Relative(0.025),
            Relative(0.025),
        ),
        ("0R22±5%", D::Resistance, Relative(0.05), Relative(0.05)),
        (
            "230 V +10 % -6 %",
            D::Voltage,
            Relative(0.1),
            Relative(0.06),
        ),
        (
            "230 V -6 % +10 %",
            D::Voltage,
            Relative(0.1),
            Relative(0.06),
        ),
        (
            "4700uF -20/+80 %",
            D::Capacitance,
            Relative(0.8),
            Relative(0.2),
        ),
        (
            "4700 uF +80%/-20%",
            D::Capacitance,
            Relative(0.8),
            Relative(0.2),
        ),
        ("80 degC ±5 K", D::Temperature, Absolute(5.0), Absolute(5.0)),
        (
            "80 degC ±5 degC",
            D::Temperature,
            Absolute(5.0),
            Absolute(5.0),
        ),
        ("230 V ±23 V", D::Voltage, Absolute(23.0), Absolute(23.0)),
        (
            "0.45 K/W ±0.05 K/W",
            D::ThermalResistance,
            Absolute(0.05),
            Absolute(0.05),
        ),
    ] {
        let (read, _) = quantity(text, want);
        assert_eq!(read.tolerance, Some(Tolerance { plus, minus }), "`{text}`");
        assert_eq!(read.used, tokens(text).len(), "`{text}`");
    }
    // 230 V +10 % -6 % by hand: 230 * 0.94 = 216.2, 230 * 1.1 = 253.
    let (read, _) = quantity("230 V +10 % -6 %", D::Voltage);
    let (low, high) = read.tolerance.unwrap().limits(read.value);
    assert!((low - 216.2).abs() < 1e-9 && (high - 253.0).abs() < 1e-9);
}

#[test]
fn tokens_of_several_items_are_split() {
    assert_eq!(split_count("2x28VAC"), Some((2, "28VAC")));
    assert_eq!(split_count("2\u{d7}35"), Some((2, "35")));
    assert_eq!(split_count("2*35"), Some((2, "35")));
    assert_eq!(split_count("2x"), Some((2, "")));
    assert_eq!(split_count("0x4"), None);
    assert_eq!(split_count("2xfans"), None);
    assert_eq!(split_slash("10000uF/63V"), Some(("10000uF", "63V")));
    assert_eq!(split_slash("100V/15A"), Some(("100V", "15A")));
    assert_eq!(split_slash("1/8"), None);
    assert_eq!(split_slash("0.5K/W"), None);
    assert_eq!(fraction("1/8"), Some(0.125));
    assert_eq!(fraction("1/0"), None);
    assert_eq!(fraction("1/8W"), None);
}

#[test]
fn split_windings_are_two_of_each() {
    for (text, used) in [
        ("28-0-28", 1),
        ("28+28", 1),
        ("28-0-28V", 1),
        ("28V-0-28V", 1),
        ("28V+28V", 1),
        ("28-0-28 Vac", 2),
        ("28-0-28 V ac", 3),
        ("28-0-28 300 VA", 1),
        ("28-0-28 at 5 A", 1),
    ] {
        let windings = windings(&tokens(text)).unwrap().unwrap();
        assert_eq!(windings.canonical, "2 x 28 Vac", "`{text}`");
        assert!((windings.each.value - 28.0).abs() < 1e-12);
        assert_eq!(windings.each.used, used, "`{text}`");
    }
    assert!(windings(&["28-0-30"]).unwrap().is_err());
    for other in [
        "28",
        "0-28",
        "28-0-",
        "+28",
        "28+",
        "28-0-28Vdc",
        "",
        "28-0-28A",
    ] {
        assert_eq!(windings(&[other]), None, "{other}");
    }
}

#[test]
fn fuse_markings_give_speed_and_current() {
    for (text, current, speed) in [
        ("T3.15A", 3.15, FuseSpeed::Slow),
        ("T3,15A", 3.15, FuseSpeed::Slow),
        ("3A15T", 3.15, FuseSpeed::Slow),
        ("T3A15", 3.15, FuseSpeed::Slow),
        ("5AT", 5.0, FuseSpeed::Slow),
        ("F5A", 5.0, FuseSpeed::Fast),
        ("FF500mA", 0.5, FuseSpeed::Fast),
    ] {
        let fuse = fuse(text).unwrap();
        assert!((fuse.current.value - current).abs() < 1e-12, "{text}");
        assert_eq!(fuse.speed, speed, "{text}");
    }
    for other in ["5A", "T5", "TF5A", "T", "T-5A", "T0A", "TTT5A", "", "fast"] {
        assert_eq!(fuse(other), None, "{other}");
    }
}

#[test]
fn a_value_outside_its_band_offers_the_slip_that_explains_it() {
    let emitter = Band {
        low: 0.05,
        high: 1.0,
    };
    let found = suspect(22.0, emitter, D::Resistance, &LETTER_CODE).unwrap();
    assert_eq!(found.replacement.as_deref(), Some("0.22 ohm"));
    let reservoir = Band {
        low: 1e-3,
        high: 0.2,
    };
    let found = suspect(10e-6, reservoir, D::Capacitance, &PREFIX).unwrap();
    assert_eq!(found.replacement.as_deref(), Some("10000 uF"));
    let secondary = Band {
        low: 6.0,
        high: 90.0,
    };
    let found = suspect(110.0, secondary, D::Voltage, &HALF_OR_DOUBLE).unwrap();
    assert_eq!(found.replacement.as_deref(), Some("55 V"));
    let sink = Band {
        low: 0.02,
        high: 5.0,
    };
    let turned = [Slip::Reciprocal("watts per kelvin typed")];
    let found = suspect(20.0, sink, D::ThermalResistance, &turned).unwrap();
    assert_eq!(found.replacement.as_deref(), Some("0.05 K/W"));
    let found = suspect(1e4, sink, D::ThermalResistance, &[]).unwrap();
    assert_eq!(found.likely, None);
    assert_eq!(suspect(0.3, sink, D::ThermalResistance, &turned), None);
    assert_eq!(suspect(f64::NAN, sink, D::ThermalResistance, &turned), None);
    assert!(
        suspect(0.0, sink, D::ThermalResistance, &turned)
            .unwrap()
            .likely
            .is_none()
    );
}

#[test]
fn values_are_printed_as_the_trade_writes_them() {
    for (value, dimension, text) in [
        (0.22, D::Resistance, "0.22 ohm"),
        (0.022, D::Resistance, "22 mohm"),
        (4.7e-3, D::Capacitance, "4700 uF"),
        (12_345e-6, D::Capacitance, "12345 uF"),
        (0.999_99, D::Voltage, "1 V"),
        (65.333, D::Voltage, "65.33 V"),
        (1234.5, D::Power, "1235 W"),
        (1.8e7, D::Time, "5000 h"),
        (0.075, D::Length, "75 mm"),
        (0.07, D::Ratio, "7 %"),
        (2e7, D::SlewRate, "20 V/us"),
        (-2.2e-3, D::VoltagePerKelvin, "-2.2 mV/K"),
        (0.0, D::Voltage, "0 V"),
        (-0.0, D::Temperature, "0 degC"),
        (80.0, D::Number, "80"),
        (f64::NAN, D::Voltage, "an undefined value"),
        (f64::INFINITY, D::Voltage, "an undefined value"),
    ] {
        assert_eq!(format(value, dimension), text);
    }
    assert_eq!(format_exact(149.96, D::Temperature), "149.96 degC");
    assert_eq!(format_digits(149.96, D::Temperature, 3), "150 degC");
}

#[test]
fn letter_codes_are_printed() {
    for (value, dimension, code) in [
        (0.22, D::Resistance, "0R22"),
        (0.005, D::Resistance, "0R005"),
        (100.0, D::Resistance, "100R"),
        (4700.0, D::Resistance, "4k7"),
        (47_300.0, D::Resistance, "47k3"),
        (2.2e6, D::Resistance, "2M2"),
        (2.2e-6, D::Capacitance, "2u2"),
        (4.7e-3, D::Capacitance, "4700u"),
        (82e-9, D::Capacitance, "82n"),
        (2e-6, D::Inductance, "2u"),
    ] {
        assert_eq!(letter_code(value, dimension).as_deref(), Some(code));
    }
    for value in [0.0, -1.0, f64::NAN, f64::INFINITY, 1e12, 1.234_56] {
        assert_eq!(letter_code(value, D::Resistance), None);
    }
    assert_eq!(letter_code(5.0, D::Voltage), None);
}

#[test]
fn every_dimension_reads_its_own_example_and_unit() {
    for dimension in D::ALL {
        let (read, notes) = quantity(dimension.example(), dimension);
        assert_eq!(read.dimension, dimension);
        assert!(notes.is_empty(), "{dimension:?}: {notes:?}");
        assert!(dimension == D::Number || is_unit(dimension.usual_unit()));
    }
    for word in ["V", "Vac", "K/W", "h", "R", "minute", "C"] {
        assert!(is_unit(word), "{word}");
    }
    for word in ["out", "bridge", "n16", "m", "min", "x", "", "/"] {
        assert!(!is_unit(word), "{word}");
    }
}

/// Pieces that readers of quantities trip over, to be strung together.
const PIECES: [&str; 58] = [
    "0", "1", "22", "4,7", "10.000", "1,000", ".", ",", "R", "k", "K", "m", "M", "u", "\u{b5}",
    "n", "p", "ohm", "\u{3a9}", "\u{2126}", "\u{3c9}", "±", "+", "-", "\u{2212}", "%", "uF", "/",
    "W", "V", "A", "ac", "dc", "CT", "x", "e3", "E9", "e-999", "O", "o", "0hm", "F", "H", "deg",
    "\u{b0}", "C", "K/W", "A2s", "h", "min", "nan", "inf", "T", "-0-", "\u{221e}", "'", "Vpp",
    "000",
];

fn jumble() -> impl Strategy<Value = String> {
    let piece = (0..PIECES.len(), any::<bool>());
    prop::collection::vec(piece, 0..10).prop_map(|pieces| {
        let mut text = String::new();
        for (index, space) in pieces {
            text.push_str(PIECES[index]);
            if space {
                text.push(' ');
            }
        }
        text
    })
}

fn dimension() -> impl Strategy<Value = D> {
    (0..D::ALL.len()).prop_map(|index| D::ALL[index])
}

/// What must hold of any answer.
fn check(text: &str, wants: &[D]) {
    let tokens = tokens(text);
    let _ = (
        windings(&tokens),
        tokens
            .first()
            .map(|t| (fuse(t), split_count(t), split_slash(t))),
    );
    match read_one_of(&tokens, wants) {
        Reading::Read { quantity, notes } => {
            assert!(quantity.value.is_finite());
            assert!((1..=tokens.len()).contains(&quantity.used));
            assert!(wants.contains(&quantity.dimension));
            // Tidying changes nothing but the text, and has no more to say the second time.
            let canonical = notes.first().map_or_else(
                || tokens[..quantity.used].join(" "),
                |note| note.canonical.clone(),
            );
            let again = self::tokens(&canonical);
            let Reading::Read {
                quantity: second,
                notes,
            } = read_one_of(&again, &[quantity.dimension])
            else {
                panic!("`{text}` tidied to `{canonical}` cannot be read");
            };
            assert_eq!(
                second.value.to_bits(),
                quantity.value.to_bits(),
                "`{canonical}`"
            );
            assert_eq!(second.form, quantity.form, "`{canonical}`");
            assert_eq!(
                second.tolerance, quantity.tolerance,
                "`{text}` `{canonical}`"
            );
            assert_eq!(second.used, again.len(), "`{canonical}`");
            assert!(notes.is_empty(), "`{text}` `{canonical}`: {notes:?}");
        }
        Reading::Not => {}
        Reading::Wrong(fault) => {
            assert!(
                (1..=tokens.len()).contains(&fault.used),
                "`{text}`: {fault:?}"
            );
            assert!(!fault.message.is_empty() && !fault.hint.is_empty());
            assert!(fault.message.len() + fault.hint.len() < 1200, "{fault:?}");
            // Whatever is offered is at least a quantity of the kind wanted, or a count of one.
            for reading in fault.readings.iter().filter(|r| !r.text.contains(" x ")) {
                match read_one_of(&self::tokens(&reading.text), wants) {
                    Reading::Read { .. } => {}
                    Reading::Wrong(second) => assert!(
                        matches!(second.kind, FaultKind::Ambiguous | FaultKind::OutOfRange)
                            || fault.message.ends_with("two quantities"),
                        "`{text}` offers {reading:?}: {second:?}"
                    ),
                    Reading::Not => panic!("`{text}` offers {reading:?}"),
                }
            }
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(2000))]

    #[test]
    fn any_text_is_answered(text in "\\PC{0,40}", want in dimension()) {
        check(&text, &[want]);
    }

    #[test]
    fn any_jumble_of_trade_pieces_is_answered(text in jumble(), want in dimension(), other in dimension()) {
        check(&text, &[want]);
        check(&text, &[want, other]);
    }

    #[test]
    fn exact_text_reads_back_as_the_same_value(
        mantissa in -9.99f64..9.99, power in -16i32..14, want in dimension(),
    ) {
        let value: f64 = format!("{mantissa}e{power}").parse().unwrap();
        prop_assume!(value.abs() > 1e-17);
        let text = format_exact(value, want);
        let (read, notes) = quantity(&text, want);
        prop_assert!((read.value - value).abs() <= 1e-12 * value.abs(), "{} {}", text, read.value);
        prop_assert!(notes.is_empty(), "{} {:?}", text, notes);
        // Four digits are right to half a unit in the fourth.
        let (short, _) = quantity(&format(value, want), want);
        prop_assert!((short.value - value).abs() <= 5.001e-4 * value.abs());
    }

    #[test]
    fn letter_codes_read_back(digits in 1u32..9999, power in -12i32..6, which in 0usize..3) {
        let want = [D::Resistance, D::Capacitance, D::Inductance][which];
        let value: f64 = format!("{digits}e{power}").parse().unwrap();
        if let Some(code) = letter_code(value, want) {
            let (read, notes) = quantity(&code, want);
            prop_assert_eq!(read.value.to_bits(), value.to_bits());
            prop_assert!(notes.is_empty(), "{} {:?}", code, notes);
        }
    }

    #[test]
    fn series_members_bracket_the_value(value in 1e-12f64..1e9, which in 0usize..7) {
        let series = [
            Series::E6, Series::E12, Series::E24, Series::E48, Series::E96, Series::E192,
            Series::FuseCurrent,
        ][which];
        let above = series.at_or_above(value).unwrap();
        let below = series.at_or_below(value).unwrap();
        prop_assert!(below <= value * (1.0 + 1e-8) && value <= above * (1.0 + 1e-8));
        // No series steps by more than E6 does at its widest, 1.0 to 1.5.
        prop_assert!(above <= below * 1.5001);
        prop_assert!(series.contains(above) && series.contains(below));
        let nearest = series.nearest(value).unwrap();
        prop_assert!((nearest - above).abs() < 1e-15 * above || (nearest - below).abs() < 1e-15 * below);
    }
}

#[test]
fn a_very_long_token_is_answered_at_once() {
    for piece in ["9", "1,000,", "±", "O0", "2 000 ", "k", "+1", "/1"] {
        let text = format!("1{}", piece.repeat(20_000));
        for want in D::ALL {
            let tokens = tokens(&text);
            if let Reading::Wrong(fault) = read(&tokens, want) {
                assert!(fault.message.len() < 600, "{}", fault.message.len());
            }
        }
    }
}

#[test]
fn a_list_series_ends() {
    assert_eq!(Series::CapacitorVoltage.at_or_above(57.0), Some(63.0));
    assert_eq!(Series::CapacitorVoltage.at_or_above(1000.0), None);
    assert_eq!(Series::TransformerRating.at_or_below(10.0), None);
    assert_eq!(Series::SecondaryVoltage.nearest(27.0), Some(28.0));
    assert_eq!(Series::ResistorPower.at_or_above(3.2), Some(5.0));
    for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        assert_eq!(Series::E24.at_or_above(bad), None);
    }
}
