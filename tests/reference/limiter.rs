//! Limiter lines against published networks, computed by hand from the node equation.
//! Knows only the public functions of the limiter model.
//!
//! The networks are those of D. Self, Audio Power Amplifier Design, and R. Cordell, Designing Audio
//! Power Amplifiers (method from memory); the figures are derived (D): the closed form and a root
//! of the node equation agree to 1e-8. They are printed to four digits, hence the 0.1 %.

use derate::physics::limiter::{Clamp, LimitLine, Network};
use derate::physics::unit::{Ohm, Volt};

fn close(got: f64, want: f64, tolerance: f64) {
    assert!(
        (got - want).abs() <= tolerance * want.abs(),
        "got {got}, want {want}"
    );
}

fn amps(line: &LimitLine, volts: f64) -> f64 {
    line.current(Volt(volts)).map_or(f64::NAN, |i| i.0)
}

const SINGLE: Network = Network {
    emitter: Ohm(0.22),
    sense_base: Ohm(220.0),
    base_output: Some(Ohm(100.0)),
    rail_base: Some(Ohm(11e3)),
    clamp: None,
};

const DUAL: Network = Network {
    emitter: Ohm(0.22),
    sense_base: Ohm(220.0),
    base_output: Some(Ohm(150.0)),
    rail_base: Some(Ohm(47e3)),
    clamp: Some(Clamp {
        rail_node: Ohm(6800.0),
        node_base: Ohm(3300.0),
        zener: Volt(15.0),
    }),
};

/// D. Single slope, Von 0.65 V: sum of conductances 14.636 mS,
/// I(0) = 0.65 x 14.636 mS / (0.22 x 4.6364 mS) = 9.327 A; slope -R1/[RE(R1 + R3)].
#[test]
fn single_slope() {
    let line = SINGLE.line(Volt(0.65)).unwrap();
    close(amps(&line, 0.0), 9.327, 1e-3);
    close(
        amps(&line, 1.0) - amps(&line, 0.0),
        -220.0 / (0.22 * 11_220.0),
        1e-9,
    );
    close(amps(&line, 1.0) - amps(&line, 0.0), -0.08913, 1e-3);
    close(line.holds_off_at().unwrap().0, 104.65, 1e-3);
    close(amps(&line, 40.0), 5.762, 1e-3);
    close(amps(&line, 80.0), 2.197, 1e-3);
}

/// D. The same on +/-40 V rails: short at the output node, and the worst point of the line,
/// I0·V0/4 at V0/2.
#[test]
fn single_slope_short_circuit() {
    let line = SINGLE.line(Volt(0.65)).unwrap();
    let short = line.short_circuit(Volt(40.0), Ohm(0.22)).unwrap();
    close(short.amps.0, 5.877, 1e-3);
    close(short.volts.0, 38.71, 1e-3);
    close(short.watts().0, 227.5, 1e-3);
    let worst = line.hottest(Volt(80.0)).unwrap();
    close(worst.watts().0, 244.0, 1e-3);
    close(worst.volts.0, 52.3, 1e-3);
}

/// D. Hot, Von 0.55 V: current and intercept are both proportional to Von.
#[test]
fn single_slope_hot() {
    let line = SINGLE.line(Volt(0.55)).unwrap();
    close(amps(&line, 0.0), 7.892, 1e-3);
    close(line.holds_off_at().unwrap().0, 88.55, 1e-3);
}

/// D. Without R3 the line is flat at Von(R1 + R2)/(R2·RE) = 0.65 x 320/22 = 9.4545 A.
#[test]
fn no_resistor_to_the_rail() {
    let line = Network {
        rail_base: None,
        ..SINGLE
    }
    .line(Volt(0.65))
    .unwrap();
    close(amps(&line, 0.0), 9.4545, 1e-5);
    close(amps(&line, 80.0), 9.4545, 1e-5);
    assert_eq!(line.holds_off_at(), None);
}

/// D. Dual slope on +/-50 V; the break is at X = 0.65 + 14.35 x 10100/3300 = 44.57 V.
#[test]
fn dual_slope() {
    let line = DUAL.line(Volt(0.65)).unwrap();
    let knee = line.corners().next().unwrap();
    close(knee.volts.0 + knee.amps.0 * 0.22, 44.57, 1e-3);
    let printed = [
        (0.0, 7.176),
        (20.0, 4.832),
        (40.0, 2.488),
        (50.0, 1.881),
        (80.0, 1.245),
        (99.9, 0.824),
    ];
    for (volts, want) in printed {
        close(amps(&line, volts), want, 1e-3);
    }
}

/// D. Short and worst point of the dual slope.
#[test]
fn dual_slope_short_circuit() {
    let line = DUAL.line(Volt(0.65)).unwrap();
    let short = line.short_circuit(Volt(50.0), Ohm(0.22)).unwrap();
    close(short.amps.0, 1.889, 1e-3);
    close(short.volts.0, 49.58, 1e-3);
    close(short.watts().0, 93.7, 1e-3);
    let worst = line.hottest(Volt(100.0)).unwrap();
    close(worst.watts().0, 109.9, 1e-3);
    close(worst.volts.0, 30.6, 2e-3); // flat summit, printed to three digits
}

/// D. One device into a load: 8 ohm is never limited up to 45 V at the output, 4 ohm is limited
/// above 10.42 V.
#[test]
fn dual_slope_loads() {
    let line = DUAL.line(Volt(0.65)).unwrap();
    let limited = line.first_limited(Volt(50.0), Ohm(0.22 + 4.0)).unwrap();
    close(limited.amps.0 * 4.0, 10.42, 1e-3);
    let eight = line.first_limited(Volt(50.0), Ohm(0.22 + 8.0));
    assert!(eight.is_none_or(|p| p.amps.0 * 8.0 > 45.0), "{eight:?}");
}
