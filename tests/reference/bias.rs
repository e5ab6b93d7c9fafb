//! Bias stability, the crossover optimum and the constants behind them against published figures.
//! Knows only the public functions of the bias model.
//!
//! Letters: F a value read in its source, M quoted from memory, D derived and checked by a second
//! numerical route.

use derate::physics::bias::{
    BASE_EMITTER_DRIFT, Idle, THERMAL_VOLTAGE, ThermalLoop, crossover_idle, disagreement,
    imbalance_growth,
};
use derate::physics::unit::{Amp, KelvinPerWatt, Ohm, Volt, VoltPerKelvin};

fn near(got: f64, want: f64, tolerance: f64) {
    assert!(
        (got - want).abs() <= tolerance,
        "got {got}, want {want} within {tolerance}"
    );
}

/// VT in volts from the CODATA constants k and q, 1.380649e-23 J/K and 1.602176634e-19 C.
fn thermal_voltage(celsius: f64) -> f64 {
    1.380_649e-23 / 1.602_176_634e-19 * (celsius + 273.15)
}

/// D, M. kT/q is 25.693 mV at 25 °C and 30.001 mV at 75 °C; the drift (VBE - 1.205 - 3.2·VT)/T at 300 K
/// is -2.459, -2.126, -1.792 mV/K at 0.55, 0.65, 0.75 V (Gray and Meyer, band-gap section). The fixed
/// constants are these, rounded: VT to 0.1 mV, the drift to that of 0.65 V.
#[test]
fn constants() {
    near(thermal_voltage(25.0) * 1e3, 25.693, 1e-3);
    near(thermal_voltage(75.0) * 1e3, 30.001, 1e-3);
    near(THERMAL_VOLTAGE.0, thermal_voltage(25.0), 5e-5);
    let drift = |vbe: f64| (vbe - 1.205 - 3.2 * thermal_voltage(300.0 - 273.15)) / 300.0 * 1e3;
    for (vbe, want) in [(0.55, -2.459), (0.65, -2.126), (0.75, -1.792)] {
        near(drift(vbe), want, 1e-3);
    }
    near(BASE_EMITTER_DRIFT.0 * 1e3, drift(0.65), 0.05);
}

/// The derived cases use 2 mV/K and VT at 25 °C, printed as 25.693 mV but not rounded before use (the
/// rounded one gives 1.00644 for the runaway case); `fet` takes both as given.
fn published(rail: f64, theta: f64, idle: f64, re: f64) -> Option<ThermalLoop> {
    ThermalLoop::fet(
        Volt(rail),
        KelvinPerWatt(theta),
        VoltPerKelvin(-0.002),
        Ohm(thermal_voltage(25.0) / idle),
        Ohm(re),
    )
}

/// D. S = Vce·θ·TC/(VT/Iq + RE): 40 V, 1.5 K/W, 0.1 A: 0.25161 with 0.22 ohm, 0.46706 with none.
/// Tolerance 1e-5: five digits printed.
#[test]
fn loop_gain_stable() {
    near(
        published(40.0, 1.5, 0.1, 0.22).unwrap().gain().unwrap(),
        0.25161,
        1e-5,
    );
    near(
        published(40.0, 1.5, 0.1, 0.0).unwrap().gain().unwrap(),
        0.46706,
        1e-5,
    );
}

/// D. 60 V and 4 K/W make 1.00645: runaway.
#[test]
fn loop_gain_runaway() {
    near(
        published(60.0, 4.0, 0.1, 0.22).unwrap().gain().unwrap(),
        1.00645,
        1e-5,
    );
}

/// D. Unconditional stability at 40 V, 1.5 K/W, 2 mV/K: RE >= 0.120 ohm. That one exists: IEEE T-ED 1974
/// (F, abstract).
#[test]
fn unconditional_resistance() {
    near(
        published(40.0, 1.5, 0.1, 0.22)
            .unwrap()
            .unconditional()
            .unwrap()
            .0,
        0.120,
        1e-12,
    );
}

/// With the fixed constants, by hand: 40 V x 2.1 mV/K x 1.5 K/W = 0.126 ohm over
/// 25.7 mV/0.1 A + 0.22 ohm = 0.477 ohm is 0.26415.
#[test]
fn loop_gain_with_the_fixed_constants() {
    let l = ThermalLoop::bipolar(Volt(40.0), KelvinPerWatt(1.5), Amp(0.1), Ohm(0.22)).unwrap();
    near(l.gain().unwrap(), 0.26415, 1e-5);
}

/// F (formula). B. Oliver, Hewlett-Packard Journal, February 1971: RE 0.22, re' + rb/hFE 0.05 ohm:
/// 96.3 mA, 21.2 mV across RE. Half a unit of the last digit.
#[test]
fn crossover_optimum() {
    let idle = crossover_idle(Ohm(0.22), Ohm(0.05)).unwrap();
    near(idle.0 * 1e3, 96.3, 0.05);
    let figures = Idle::PerDevice(idle).figures(Ohm(0.22), 1).unwrap();
    near(figures.across_emitter.0 * 1e3, 21.2, 0.05);
}

/// D. Separate junctions: a small imbalance grows by 1/(1 - S). 0.2 A in all (0.1 A each), 0.22 ohm,
/// 40 V, 1 K/W, 2 mV/K, VT at 75 °C: S 0.1538, x1.1818.
#[test]
fn imbalance() {
    let s = ThermalLoop::fet(
        Volt(40.0),
        KelvinPerWatt(1.0),
        VoltPerKelvin(-0.002),
        Ohm(thermal_voltage(75.0) / 0.1),
        Ohm(0.22),
    )
    .and_then(|l| l.gain())
    .unwrap();
    near(s, 0.1538, 5e-5);
    near(imbalance_growth(s).unwrap(), 1.1818, 5e-5);
    assert_eq!(imbalance_growth(1.0), None);
}

/// By hand. Two pairs, 0.22 ohm: 22 mV across one resistor, 44 mV across both, 100 mA a device,
/// 200 mA a channel are one and the same; the common slip of taking "across both" for "across one"
/// is a disagreement of 100 %.
#[test]
fn four_ways_of_stating_an_idle_current() {
    for idle in [
        Idle::AcrossEmitter(Volt(0.022)),
        Idle::AcrossBoth(Volt(0.044)),
        Idle::PerDevice(Amp(0.1)),
        Idle::PerChannel(Amp(0.2)),
    ] {
        let f = idle.figures(Ohm(0.22), 2).unwrap();
        near(f.per_device.0, 0.1, 1e-12);
        near(f.across_both.0, 0.044, 1e-12);
    }
    near(disagreement(Amp(0.1), Amp(0.2)).unwrap(), 1.0, 1e-12);
}
