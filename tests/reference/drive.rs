//! The drive chain and slew against hand calculations and published figures.
//! Knows only the public functions of the drive model.
//!
//! Letters: F a value read in its source, M quoted from memory, D derived and checked by a second
//! numerical route.

use derate::physics::drive::{
    Driver, GainCurve, NoGain, Screen, Stage, slew_given, slew_needed, standing_current,
};
use derate::physics::unit::{Amp, Farad, Hertz, Ohm, Volt};

fn near(got: f64, want: f64, tolerance: f64) {
    assert!(
        (got - want).abs() <= tolerance,
        "got {got}, want {want} within {tolerance}"
    );
}

/// D, F. 2πf·V̂ at 20 kHz for 100 W in 8 ohm (40 V), 100 W in 4 ohm, 200 W in 8 ohm: 5.027, 3.554,
/// 7.109 V/us. The 6 V/us that is sometimes printed for 200 W in 8 ohm is wrong.
#[test]
fn slew_of_a_sine() {
    for (watts, ohms, want) in [
        (100.0_f64, 8.0_f64, 5.027),
        (100.0, 4.0, 3.554),
        (200.0, 8.0, 7.109),
    ] {
        let peak = (2.0 * watts * ohms).sqrt();
        near(
            slew_needed(Hertz(20e3), Volt(peak)).unwrap().0 * 1e-6,
            want,
            0.0005,
        );
    }
}

/// M. Gray and Meyer; Solomon, IEEE JSSC 1974: 19 uA into 30 pF is 0.63 V/us.
/// By hand: 4 mA into 100 pF is 40 V/us.
#[test]
fn slew_of_a_tail_current() {
    near(
        slew_given(Amp(19e-6), Farad(30e-12)).unwrap().0 * 1e-6,
        0.63,
        0.005,
    );
    near(
        slew_given(Amp(4e-3), Farad(100e-12)).unwrap().0 * 1e-6,
        40.0,
        1e-9,
    );
}

/// A JEDEC 2N3055: hFE at least 20 at 4 A and 5 at 10 A (data sheet, from memory).
fn registered(devices: u32, standing: f64) -> Option<Stage> {
    Some(Stage {
        gain: GainCurve::new(&[(Amp(4.0), 20.0), (Amp(10.0), 5.0)])?,
        devices,
        standing: Amp(standing),
    })
}

/// By hand. One device at 4 A wants 200 mA, at 10 A 2 A; at √40 = 6.325 A, half-way in log I, the gain is
/// 12.5 and the base current 506 mA. Two devices share 8 A at 4 A each: 400 mA. Above 10 A a device
/// nothing is known.
#[test]
fn base_current_of_a_registered_type() {
    let one = registered(1, 0.0).unwrap();
    near(one.demand(Amp(4.0)).unwrap().0, 0.2, 1e-12);
    near(one.demand(Amp(10.0)).unwrap().0, 2.0, 1e-12);
    near(
        one.demand(Amp(40.0_f64.sqrt())).unwrap().0,
        40.0_f64.sqrt() / 12.5,
        1e-9,
    );
    let two = registered(2, 0.0).unwrap();
    near(two.demand(Amp(8.0)).unwrap().0, 0.4, 1e-12);
    let beyond = NoGain::BeyondCurve {
        needed: Amp(10.5),
        last: Amp(10.0),
    };
    assert_eq!(one.demand(Amp(10.5)), Err(beyond));
}

/// By hand. 8 A from two such devices with 0.7 V across 100 ohm (7 mA): the driver delivers 407 mA; its
/// own gain of 40 and 0.65 V across 220 ohm (2.955 mA) make 10.175 + 2.955 = 13.130 mA of the voltage
/// stage.
#[test]
fn chain_of_two_stages() {
    let standing = standing_current(Volt(0.7), Ohm(100.0)).unwrap();
    near(standing.0, 7e-3, 1e-12);
    let output = registered(2, standing.0).unwrap();
    let driver = Stage {
        gain: GainCurve::new(&[(Amp(0.5), 40.0)]).unwrap(),
        devices: 1,
        standing: standing_current(Volt(0.65), Ohm(220.0)).unwrap(),
    };
    let chain = [output, driver];
    let needed = chain
        .iter()
        .try_fold(Amp(8.0), |i, s| s.greatest_demand(i))
        .unwrap();
    near(needed.0, 0.407 / 40.0 + 0.65 / 220.0, 1e-12);
    near(needed.0 * 1e3, 13.130, 0.0005);
}

/// D. With a constant gain the driver dissipates the ideal class-B mean of its bank over that gain,
/// `(V·Î/π - V̂·Î·cos φ/4)/hFE`, worst at V̂ = 2V/(π·cos φ): 35 V, 4 ohm, 50: V²/(π²·R·hFE) = 31.03/50 W
/// for a resistor; at 60° and clip 59.201/50 W (printed to five digits).
#[test]
fn driver_heat_with_a_constant_gain() {
    let bank = Stage {
        gain: GainCurve::new(&[(Amp(10.0), 50.0)]).unwrap(),
        devices: 1,
        standing: Amp(0.0),
    };
    let driver = |phase: f64| Driver::new(&bank, Volt(35.7), Volt(0.7), Ohm(4.0), phase).unwrap();
    let (at, worst) = driver(0.0).worst_mean_heat(Volt(35.0)).unwrap();
    near(worst.0 * 50.0, 31.03, 0.005);
    near(at.0, 2.0 * 35.0 / std::f64::consts::PI, 0.05); // flat top: a thousandth of the range
    let clipped = driver(60.0_f64.to_radians()).mean_heat(Volt(35.0)).unwrap();
    near(clipped.0 * 50.0, 59.201, 59.201e-4);
}

/// By hand. Nothing played: the standing current times the rail less VBE, 7 mA x 35 V = 0.245 W.
#[test]
fn driver_heat_at_rest() {
    let bank = registered(1, 7e-3).unwrap();
    let driver = Driver::new(&bank, Volt(35.7), Volt(0.7), Ohm(8.0), 0.0).unwrap();
    near(driver.mean_heat(Volt(0.0)).unwrap().0, 0.245, 1e-12);
}

/// D. Peak instantaneous dissipation with a constant gain, 35 V, 4 ohm, 60°, full swing: the output
/// device has 275.34 W at 41.078 V and 6.7029 A, its driver a fiftieth of it at the same voltage.
#[test]
fn driver_peak_on_the_locus() {
    let bank = Stage {
        gain: GainCurve::new(&[(Amp(10.0), 50.0)]).unwrap(),
        devices: 1,
        standing: Amp(0.0),
    };
    let phase = 60.0_f64.to_radians();
    let driver = Driver::new(&bank, Volt(35.0), Volt(0.0), Ohm(4.0), phase).unwrap();
    let screen = Screen::new(&bank, Amp(35.0 / 4.0), Volt(70.0), |v| v.0);
    let worst = driver
        .worst_on_locus(Volt(35.0), &screen, |v, i| v.0 * i.0)
        .unwrap();
    near(worst.used * 50.0, 275.34, 0.005);
    near(worst.volts.0, 41.078, 0.005);
    near(worst.amps.0 * 50.0, 6.7029, 0.001);
}
