//! Published figures on wear: the 10 K rule of electrolytics and the derating of resistors.
//! Must not know how they are computed.

use derate::physics::unit::{Celsius, Watt};
use derate::physics::wear::{electrolytic_life_hours, resistor_rating};

/// The 10 K rule (F, restated by makers; D, arithmetic): 12,000 h at 85 degC is
/// 12,000·2³ = 96,000 h at 55 degC and 12,000·2^4.5 = 271,529 h at 40 degC. Tolerance: the source's
/// rounding to 500 h. BC Components 051/053 publishes 200,000 h at 40 degC, but with 1.4 times the
/// rated ripple (11.1 K for each doubling).
#[test]
fn electrolytic_life_doubles_every_10_kelvin() {
    let life = |core| electrolytic_life_hours(12_000.0, Celsius(85.0), Celsius(core)).unwrap();
    assert!((life(55.0) - 96_000.0).abs() < 1e-6);
    assert!((life(40.0) - 271_500.0).abs() < 500.0, "{}", life(40.0));
}

/// Yageo MFR and Vishay MRS25 derating curves (F) and P = P70·(155 - T)/85 (D): a 0.6 W resistor has
/// 0.388 W at 100 degC, 35.3 % at 125 degC, and loses 1.18 % a kelvin. Tolerance: printed digits.
#[test]
fn resistors_lose_their_rating_between_70_and_155_degrees() {
    let at = |t| resistor_rating(Watt(0.6), Celsius(t)).0;
    assert!((at(70.0) - 0.6).abs() < 1e-15);
    assert!((at(100.0) - 0.388).abs() < 5e-4);
    assert!((at(125.0) / 0.6 - 0.353).abs() < 5e-4);
    assert!(((at(100.0) - at(101.0)) / 0.6 - 0.0118).abs() < 5e-5);
    assert!(at(155.0).abs() < 1e-15);
}
