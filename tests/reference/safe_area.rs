//! Published and derived figures for safe operating area.
//!
//! Letters: F = printed value read at the source; M = value from memory, its arithmetic checked;
//! D = own derivation checked by an independent numerical route.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::disallowed_methods,
    reason = "a test may fail loudly and checks against the platform's own functions"
)]

use derate::physics::load::Impedance;
use derate::physics::safe_area::{
    Allowance, Coverage, Curve, Limit, LimitLine, Rating, SecondBreakdown, most_loaded_on_line,
};
use derate::physics::sharing::Bank;
use derate::physics::unit::{Amp, Celsius, Ohm, Volt, Watt};
use derate::physics::waveform::Locus;

fn near(value: f64, expected: f64, tolerance: f64) {
    assert!(
        (value - expected).abs() <= tolerance,
        "{value}, expected {expected} ± {tolerance}"
    );
}

fn curve(points: &[(f64, f64)]) -> Curve {
    let points: Vec<_> = points.iter().map(|p| (Volt(p.0), Amp(p.1))).collect();
    Curve::new(&points).unwrap()
}

fn dc(rating: Rating, curve: Option<&Curve>, case: f64) -> Allowance {
    Allowance::dc(rating, curve, Celsius(case), SecondBreakdown::AsThermal).unwrap()
}

/// F: the 2N3055 of three makers: 15 A, 60 V, 115 W at 25 °C, Tj,max 200 °C.
fn two_n_3055() -> Rating {
    Rating {
        current: Amp(15.0),
        power: Watt(115.0),
        junction: Celsius(200.0),
        breakdown: Volt(60.0),
    }
}

/// F: derating of the 2N3055: 115/175 = 0.657 W/K, so 65.7 W with the case at 100 °C; current and
/// power limits meet at 7.67 V. Tolerance: half a unit of the last digit.
#[test]
fn power_derating() {
    let watts = |case: f64| {
        let v = Volt(30.0);
        (v * dc(two_n_3055(), None, case).allowed(v)).0
    };
    near(watts(25.0), 115.0, 1e-9);
    near(watts(100.0), 65.7, 0.05);
    near((watts(25.0) - watts(100.0)) / 75.0, 0.657, 0.0005);
    // A case cooler than 25 °C earns nothing.
    near(watts(-20.0), 115.0, 1e-9);
    let cool = dc(two_n_3055(), None, 25.0);
    near(cool.allowed(Volt(7.66)).0, 15.0, 1e-9);
    assert!(cool.allowed(Volt(7.68)).0 < 15.0);
}

/// F: the military version of the same type: 117 W, 668 mW/K, that is 117/175.
#[test]
fn power_derating_of_the_military_version() {
    let rating = Rating {
        power: Watt(117.0),
        breakdown: Volt(70.0),
        ..two_n_3055()
    };
    let watts = |case: f64| 20.0 * dc(rating, None, case).allowed(Volt(20.0)).0;
    near((watts(25.0) - watts(125.0)) / 100.0, 0.668, 0.0007);
}

/// F: second breakdown of the 2N3055 is given as 2.87 A at 40 V, 1 s: 114.8 W, on the power line.
#[test]
fn second_breakdown_starts_on_the_power_line() {
    let stated = curve(&[(7.67, 15.0), (40.0, 2.87), (60.0, 1.2)]);
    let allowance = dc(two_n_3055(), Some(&stated), 25.0);
    near(40.0 * allowance.allowed(Volt(40.0)).0, 114.8, 0.05);
    let usage = allowance.point_usage(Volt(50.0), Amp(1.0)).unwrap();
    assert_eq!(usage.limit, Limit::SecondBreakdown);
}

/// F points, D interpolation: a 250 W transistor's sheet gives 5 A at 50 V and 2 A at 80 V (0.5 s).
/// Log-log slope ln(2/5)/ln(80/50) = -1.9495; 2.998 A at 65 V; 160 W at 80 V, 64 % of 250 W (M).
#[test]
fn interpolation_is_straight_in_log_log() {
    let stated = curve(&[(50.0, 5.0), (80.0, 2.0)]);
    let rating = Rating {
        current: Amp(16.0),
        power: Watt(250.0),
        junction: Celsius(200.0),
        breakdown: Volt(200.0),
    };
    let allowance = dc(rating, Some(&stated), 25.0);
    near(allowance.allowed(Volt(65.0)).0, 2.998, 5e-4);
    let ratio = allowance.allowed(Volt(65.0)).0 / allowance.allowed(Volt(80.0)).0;
    near(ratio.ln() / (65f64 / 80.0).ln(), -1.9495, 5e-5);
    near(80.0 * allowance.allowed(Volt(80.0)).0 / 250.0, 0.64, 1e-9);
}

/// F: makers disagree on second breakdown and temperature. With the case at 100 °C (k = 4/7) the
/// steep point scales by k unless the sheet states a slope: 0.25 %/K leaves 1 - 0.0025·75 = 0.8125.
/// Hand calculation; the hyperbola k·250/v stays above both at 80 V.
#[test]
fn second_breakdown_derating_as_stated() {
    let stated = curve(&[(50.0, 5.0), (80.0, 2.0)]);
    let rating = Rating {
        current: Amp(16.0),
        power: Watt(250.0),
        junction: Celsius(200.0),
        breakdown: Volt(200.0),
    };
    near(
        dc(rating, Some(&stated), 100.0).allowed(Volt(80.0)).0,
        2.0 * 4.0 / 7.0,
        1e-9,
    );
    let own = SecondBreakdown::PerKelvin(0.0025);
    let allowance = Allowance::dc(rating, Some(&stated), Celsius(100.0), own).unwrap();
    near(allowance.allowed(Volt(80.0)).0, 2.0 * 0.8125, 1e-9);
    // At 50 V the power, k·250/50 = 2.857 A, is the lower.
    near(
        allowance.allowed(Volt(50.0)).0,
        250.0 * 4.0 / 7.0 / 50.0,
        1e-9,
    );
}

/// D: 35 V, 4 ohm at 60°, full swing, one ideal device: the peak of 275.34 W sits at 41.078 V, so a
/// 250 W device with its case at 25 °C is used to 275.34/250, and a curve that ends at 40 V does not
/// cover it: at 40 V, sin β from 40 = 35 - A·sin β + B·cos β with A = 17.5 V, B = 30.311 V is 0.78976.
#[test]
fn reactive_locus_against_power_and_the_end_of_a_curve() {
    let rating = Rating {
        current: Amp(16.0),
        power: Watt(250.0),
        junction: Celsius(200.0),
        breakdown: Volt(200.0),
    };
    let bank = Bank::even(1, Ohm(0.0)).unwrap();
    let load = Impedance::polar(Ohm(4.0), std::f64::consts::FRAC_PI_3);
    let locus = Locus::new(&bank, Volt(35.0), Volt(35.0), load).unwrap();
    let usage = dc(rating, None, 25.0).usage(&locus);
    near(usage.used, 275.34 / 250.0, 5e-5);
    near(usage.at.volts.0, 41.078, 5e-4);
    assert_eq!(usage.limit, Limit::Power);
    assert_eq!(usage.coverage, Coverage::NoCurve);
    let short = curve(&[(15.0, 16.0), (40.0, 6.0)]);
    let usage = dc(rating, Some(&short), 25.0).usage(&locus);
    let Coverage::EndsAt { volts, fraction } = usage.coverage else {
        panic!("{usage:?}")
    };
    near(volts.0, 40.0, 1e-12);
    // Put back: 35 - 17.5·x + 30.311·√(1 - x²) = 40.
    let x = fraction;
    near(
        35.0 - 17.5 * x + 35.0 * 0.75f64.sqrt() * (1.0 - x * x).sqrt(),
        40.0,
        1e-9,
    );
}

/// Hand calculation: a flat limiter of 5 A against 100 W at 25 °C from 0 to 60 V: the power is
/// reached first at 20 V and used 5·60/100 = 3 times at 60 V. A locus of 4 A peak clears it by 1.25.
#[test]
fn limiter_against_curve_and_music() {
    let rating = Rating {
        current: Amp(10.0),
        power: Watt(100.0),
        junction: Celsius(150.0),
        breakdown: Volt(100.0),
    };
    let line = LimitLine::new(&[(Volt(0.0), Amp(5.0))]).unwrap();
    let usage = dc(rating, None, 25.0)
        .line_usage(|v| line.at(v), &line.kinks(), Volt(60.0))
        .unwrap();
    near(usage.used, 3.0, 1e-9);
    near(usage.at.volts.0, 60.0, 1e-9);
    let bank = Bank::even(1, Ohm(0.1)).unwrap();
    let locus = Locus::new(
        &bank,
        Volt(40.0),
        Volt(32.0),
        Impedance::resistive(Ohm(8.0)),
    )
    .unwrap();
    near(line.clearance(&locus).ratio, 1.25, 1e-9);
    // Beside a device at 5 A on 0.22 ohm, one of 20 mV less VBE: I·0.22 + VT·ln(I/5) = 1.12 V.
    let pair = Bank::bipolar(2, Ohm(0.22), 0.0, Volt(0.02), Volt(0.0257)).unwrap();
    let most = most_loaded_on_line(&line, &pair, Volt(30.0)).unwrap().0;
    near(most * 0.22 + 0.0257 * (most / 5.0).ln(), 1.12, 1e-9);
}
