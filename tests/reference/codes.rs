//! Marking codes and preferred values against IEC 60062 and IEC 60063.
//!
//! Letters in brackets: F the value was found in a maker's restatement of the standard, M from
//! memory, D derived by calculation. Both standards are sold, not published; neither was seen in
//! full.

#![allow(
    clippy::panic,
    clippy::expect_used,
    reason = "what the tests share fails by panicking"
)]

use derate::quantity::{
    Amount, Dimension, FaultKind, Quantity, Reading, Series, Tolerance, letter_code, read,
};

fn quantity(text: &str, dimension: Dimension) -> Quantity {
    match read(&[text], dimension) {
        Reading::Read { quantity, .. } => quantity,
        other => panic!("`{text}`: {other:?}"),
    }
}

/// Decimal text is converted once, so the value is the nearest double to the decimal the code
/// stands for: exact equality is asked for.
fn assert_value(text: &str, dimension: Dimension, value: f64) {
    let read = quantity(text, dimension).value;
    assert_eq!(read.to_bits(), value.to_bits(), "`{text}` is {read}");
}

/// IEC 60062, clause on the letter and digit code for resistance values [F for the forms; the small
/// k is common use, the standard prints K].
#[test]
fn resistance_codes() {
    for (text, ohms) in [
        ("4K7", 4700.0),
        ("4k7", 4700.0),
        ("R22", 0.22),
        ("0R22", 0.22),
        ("R022", 0.022),
        ("R47", 0.47),
        ("4R7", 4.7),
        ("470R", 470.0),
        ("47K3", 47_300.0),
        ("4M7", 4.7e6),
        // L is the standard's letter for the milliohm [F].
        ("4L7", 4.7e-3),
    ] {
        assert_value(text, Dimension::Resistance, ohms);
    }
}

/// IEC 60062, capacitance values [F for the forms; m for millifarad F].
#[test]
fn capacitance_codes() {
    for (text, farads) in [
        ("2p2", 2.2e-12),
        ("p47", 0.47e-12),
        ("4n7", 4.7e-9),
        ("10n", 10e-9),
        ("1u0", 1e-6),
        ("1\u{b5}0", 1e-6),
        ("1m0", 1e-3),
    ] {
        assert_value(text, Dimension::Capacitance, farads);
    }
}

/// The letter K is kilo inside a code and 10 % behind it; M is mega inside and 20 % behind [F].
#[test]
fn a_letter_means_tolerance_at_the_end() {
    for (text, ohms, percent) in [
        ("1K0F", 1000.0, 1.0),
        ("4K7K", 4700.0, 10.0),
        ("2M2M", 2.2e6, 20.0),
    ] {
        let read = quantity(text, Dimension::Resistance);
        assert_eq!(read.value.to_bits(), f64::to_bits(ohms), "{text}");
        assert_relative(read.tolerance, percent, percent);
    }
}

/// A percentage is divided by 100 after conversion, so one rounding is allowed for.
fn assert_relative(tolerance: Option<Tolerance>, minus: f64, plus: f64) {
    let Some(Tolerance {
        plus: Amount::Relative(up),
        minus: Amount::Relative(down),
    }) = tolerance
    else {
        panic!("{tolerance:?} is not a tolerance in percent");
    };
    assert!((up - plus / 100.0).abs() < 1e-15, "+{up}");
    assert!((down - minus / 100.0).abs() < 1e-15, "-{down}");
}

/// IEC 60062, tolerance letters [F and K are F, the rest M]. W is left out: a resistor code that
/// ends in W is far more often a power run on, so the reader asks.
#[test]
fn tolerance_letters() {
    for (letter, minus, plus) in [
        ('E', 0.005, 0.005),
        ('L', 0.01, 0.01),
        ('P', 0.02, 0.02),
        ('B', 0.1, 0.1),
        ('C', 0.25, 0.25),
        ('D', 0.5, 0.5),
        ('F', 1.0, 1.0),
        ('G', 2.0, 2.0),
        ('J', 5.0, 5.0),
        ('K', 10.0, 10.0),
        ('M', 20.0, 20.0),
        ('N', 30.0, 30.0),
        ('Q', 10.0, 30.0),
        ('T', 10.0, 50.0),
        ('S', 20.0, 50.0),
        ('Z', 20.0, 80.0),
    ] {
        let read = quantity(&format!("4R7{letter}"), Dimension::Resistance);
        assert_relative(read.tolerance, minus, plus);
    }
    let Reading::Wrong(fault) = read(&["4R7W"], Dimension::Resistance) else {
        panic!("4R7W has two readings");
    };
    assert_eq!(fault.kind, FaultKind::Ambiguous);
}

/// Below 10 pF the letters are picofarads [M].
#[test]
fn tolerance_letters_of_small_capacitors_are_picofarads() {
    for (letter, picofarads) in [('B', 0.1), ('C', 0.25), ('D', 0.5), ('G', 2.0)] {
        let read = quantity(&format!("4p7{letter}"), Dimension::Capacitance);
        let Some(Tolerance {
            plus: Amount::Absolute(up),
            minus: Amount::Absolute(down),
        }) = read.tolerance
        else {
            panic!("4p7{letter}: {:?}", read.tolerance);
        };
        assert!((up - picofarads * 1e-12).abs() < 1e-24);
        assert!((down - picofarads * 1e-12).abs() < 1e-24);
    }
    // At 10 pF and above they are percent.
    let read = quantity("10p0G", Dimension::Capacitance);
    assert_relative(read.tolerance, 2.0, 2.0);
}

/// IEC 60063, E24 and its subsets [M].
const E24: [f64; 24] = [
    1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2, 2.4, 2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6,
    6.2, 6.8, 7.5, 8.2, 9.1,
];

/// Every member of `series` in one decade, walked upwards.
fn decade(series: Series) -> Vec<f64> {
    let mut members = vec![1.0];
    while let Some(next) = members
        .last()
        .and_then(|last| series.at_or_above(last * 1.0001))
    {
        if next >= 9.9999 {
            break;
        }
        members.push(next);
    }
    members
}

fn assert_members(series: Series, expected: &[f64]) {
    let members = decade(series);
    assert_eq!(members.len(), expected.len(), "{series:?}");
    for (member, expected) in members.iter().zip(expected) {
        assert!((member - expected).abs() < 1e-12, "{member} {expected}");
    }
}

#[test]
fn e24_and_its_subsets() {
    let every = |step| E24.iter().copied().step_by(step).collect::<Vec<_>>();
    assert_members(Series::E24, &E24);
    assert_members(Series::E12, &every(2));
    assert_members(Series::E6, &every(4));
}

/// E24 differs from the rounded `10^(k/24)` at exactly eight values [D: the powers by libm].
#[test]
fn e24_departs_from_the_formula_at_eight_values() {
    let departs: Vec<f64> = (0..24)
        .zip(E24)
        .filter(|(k, value)| {
            let formula = (libm::pow(10.0, f64::from(*k) / 24.0) * 10.0).round() / 10.0;
            (formula - value).abs() > 0.01
        })
        .map(|(_, value)| value)
        .collect();
    assert_eq!(departs, [2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 8.2]);
}

/// E192 in hundredths [D: round(10^(2 + k/192)) by whole-number comparison of
/// (2v - 1)^192 <= 10^(384 + k) 2^192 < (2v + 1)^192 in arbitrary precision; the one exception, 920
/// for 919, M].
#[rustfmt::skip]
const E192: [u16; 192] = [
    100, 101, 102, 104, 105, 106, 107, 109, 110, 111, 113, 114, 115, 117, 118, 120,
    121, 123, 124, 126, 127, 129, 130, 132, 133, 135, 137, 138, 140, 142, 143, 145,
    147, 149, 150, 152, 154, 156, 158, 160, 162, 164, 165, 167, 169, 172, 174, 176,
    178, 180, 182, 184, 187, 189, 191, 193, 196, 198, 200, 203, 205, 208, 210, 213,
    215, 218, 221, 223, 226, 229, 232, 234, 237, 240, 243, 246, 249, 252, 255, 258,
    261, 264, 267, 271, 274, 277, 280, 284, 287, 291, 294, 298, 301, 305, 309, 312,
    316, 320, 324, 328, 332, 336, 340, 344, 348, 352, 357, 361, 365, 370, 374, 379,
    383, 388, 392, 397, 402, 407, 412, 417, 422, 427, 432, 437, 442, 448, 453, 459,
    464, 470, 475, 481, 487, 493, 499, 505, 511, 517, 523, 530, 536, 542, 549, 556,
    562, 569, 576, 583, 590, 597, 604, 612, 619, 626, 634, 642, 649, 657, 665, 673,
    681, 690, 698, 706, 715, 723, 732, 741, 750, 759, 768, 777, 787, 796, 806, 816,
    825, 835, 845, 856, 866, 876, 887, 898, 909, 920, 931, 942, 953, 965, 976, 988,
];

#[test]
fn e48_e96_and_e192() {
    let every = |step| {
        E192.iter()
            .step_by(step)
            .map(|v| f64::from(*v) / 100.0)
            .collect::<Vec<_>>()
    };
    assert_members(Series::E192, &every(1));
    assert_members(Series::E96, &every(2));
    assert_members(Series::E48, &every(4));
}

/// 2.2 and 4.7 are members of E24 and not of E96 [D].
#[test]
fn the_coarse_values_are_not_in_the_fine_series() {
    for value in [0.22, 2.2, 4700.0] {
        assert!(Series::E24.contains(value) && Series::E12.contains(value));
        assert!(!Series::E96.contains(value));
        assert_eq!(Series::E24.at_or_above(value), Some(value));
    }
    assert_eq!(Series::E96.at_or_above(4.7), Some(4.75));
    assert_eq!(Series::E96.at_or_below(4.7), Some(4.64));
}

/// R10 of ISO 3 as IEC 60127-2 rounds it for 32 mA to 10 A [M; every one of these ratings was found
/// in makers' tables of melting integrals].
#[test]
fn fuse_currents() {
    let expected = [
        0.2, 0.25, 0.315, 0.4, 0.5, 0.63, 0.8, 1.0, 1.25, 1.6, 2.0, 2.5, 3.15, 4.0, 5.0, 6.3, 8.0,
        10.0, 12.5, 16.0,
    ];
    let mut current = 0.19;
    for rating in expected {
        assert_eq!(Series::FuseCurrent.at_or_above(current), Some(rating));
        current = rating * 1.001;
    }
    assert_eq!(Series::FuseCurrent.at_or_below(3.0), Some(2.5));
}

/// Printing a code is the inverse of reading it, for every E24 value from 0.1 ohm to 9.1 Mohm.
#[test]
fn printed_codes_read_back() {
    for exponent in -2..=5 {
        for value in [
            10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75,
            82, 91,
        ] {
            let ohms: f64 = format!("{value}e{exponent}").parse().expect("decimal");
            let code = letter_code(ohms, Dimension::Resistance).expect("in range");
            assert_value(&code, Dimension::Resistance, ohms);
        }
    }
}
