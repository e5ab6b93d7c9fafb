//! Loudspeaker protection, crowbar, relay and output network against published and derived figures.
//! Knows only the public functions of the protection and network models.
//!
//! Letters: V a value seen in its source, D derived and checked by a second numerical route.

use derate::physics::network::Zobel;
use derate::physics::protection::{
    BreakLimit, DcBreak, DcFault, Detector, copper_heating_k_per_s, crowbar,
};
use derate::physics::unit::{Amp, Farad, Hertz, Ohm, Second, Volt, Watt};

fn close(got: f64, want: f64, relative: f64) {
    assert!(
        (got - want).abs() <= relative * want.abs(),
        "got {got}, want {want}"
    );
}

fn usual_detector() -> Option<Detector> {
    Detector::new(Ohm(100e3), Farad(10e-6), Volt(0.65))
}

/// D. 100 kohm and 10 uF (common values), 0.65 V, 35 V: 18.75 ms from rest, 37.15 ms at worst; corner
/// 0.159 Hz is below the band. 0.1 %: four digits printed.
#[test]
fn trip_times() {
    let d = usual_detector().unwrap();
    close(d.time_from_rest(Volt(35.0)).unwrap().0, 18.75e-3, 1e-3);
    close(d.time_at_worst(Volt(35.0)).unwrap().0, 37.15e-3, 1e-3);
}

/// D. 35 V peak through the same RC: 0.2785 V at 20 Hz, 0.557 V at 10 Hz, 1.11 V at 5 Hz; trips below
/// 8.57 Hz. 0.1 %; 1.11 is printed to three digits (0.5 %).
#[test]
fn false_trips() {
    let d = usual_detector().unwrap();
    let ripple = |f: f64| d.ripple(Volt(35.0), Hertz(f)).unwrap().0;
    close(ripple(20.0), 0.2785, 1e-3);
    close(ripple(10.0), 0.557, 1e-3);
    close(ripple(5.0), 1.11, 5e-3);
    close(d.trips_below(Volt(35.0)).unwrap().0, 8.57, 1e-3);
}

/// D. Bound: a detector of one RC that is just quiet at f trips no faster than 1/(2πf), 7.96 ms at
/// 20 Hz and 15.9 ms at 10 Hz, while Vth <= 0.94 V at 35 V.
#[test]
fn quiet_and_fast_exclude_each_other() {
    for (f, bound) in [(20.0, 7.96e-3), (10.0, 15.9e-3)] {
        for vth in [0.1, 0.65, 0.94] {
            let rc = (35.0 * 35.0 / (vth * vth) - 1.0_f64).sqrt() / (std::f64::consts::TAU * f);
            let d = Detector::new(Ohm(rc * 1e5), Farad(1e-5), Volt(vth)).unwrap();
            close(d.trips_below(Volt(35.0)).unwrap().0, f, 1e-9);
            let t = d.time_from_rest(Volt(35.0)).unwrap().0;
            assert!(t >= bound * (1.0 - 1e-3), "{t} at {vth} V, {f} Hz");
        }
    }
}

/// D. 50 V into 6.2 ohm for 20 ms + 10 ms: 403 W, 12.1 J, and 10 g of copper gain 105 K/s.
/// Half a unit of the last digit.
#[test]
fn coil_energy() {
    let fault = DcFault::new(Volt(50.0), Ohm(6.2), Ohm(0.0)).unwrap();
    close(fault.amps().0, 8.06, 1e-3);
    close(fault.coil_watts().0, 403.0, 2e-3);
    close(fault.coil_joules(Second(0.030)).unwrap().0, 12.1, 2e-3);
    close(
        copper_heating_k_per_s(Watt(403.0), 0.010).unwrap(),
        105.0,
        5e-3,
    );
}

/// By hand: an offset of 0.65 V that never trips leaves 0.65²/6.2 = 68.1 mW in the coil.
#[test]
fn undetected_offset() {
    close(
        usual_detector().unwrap().undetected(Ohm(6.2)).unwrap().0,
        0.4225 / 6.2,
        1e-12,
    );
}

/// D. 10 mF at 52 V into 0.2 ohm: V²C/2R = 67.6 A²s, exactly.
#[test]
fn crowbar_let_through() {
    close(
        crowbar(Volt(52.0), Farad(10e-3), Ohm(0.2)).unwrap().0,
        67.6,
        1e-12,
    );
}

/// V (the two points of a 16 A 250 V a.c. relay, DC-13: 2 A at 24 V, 0.2 A at 250 V); between them by
/// hand: at √(24 x 250) = 77.46 V the geometric mean √(2 x 0.2) = 0.632 A. Nothing above 250 V.
#[test]
fn relay_break() {
    let relay = DcBreak::new(&[(Volt(24.0), Amp(2.0)), (Volt(250.0), Amp(0.2))]).unwrap();
    let allowed = |v: f64| match relay.limit(Volt(v)) {
        Some(BreakLimit::Allowed(i)) => i.0,
        _ => f64::NAN,
    };
    close(allowed(24.0), 2.0, 1e-12);
    close(allowed(250.0), 0.2, 1e-12);
    close(allowed(6000.0_f64.sqrt()), 0.4_f64.sqrt(), 1e-12);
    close(allowed(12.0), 2.0, 1e-12);
    let above = BreakLimit::AboveStated {
        highest: Volt(250.0),
    };
    assert_eq!(relay.limit(Volt(251.0)), Some(above));
}

/// D. 10 ohm and 100 nF at 28.28 V r.m.s. (rounded from the root of 800, 100 W in 8 ohm): 1.2437 W at
/// 20 kHz, 22.644 W at 100 kHz, towards 80 W.
/// 1e-4: five digits printed.
#[test]
fn zobel_watts() {
    let z = Zobel::new(Ohm(10.0), Farad(100e-9)).unwrap();
    let at = |f: f64| z.watts(Volt(800.0_f64.sqrt()), Hertz(f)).unwrap().0;
    close(at(20e3), 1.2437, 1e-4);
    close(at(100e3), 22.644, 1e-4);
    close(at(1e9), 80.0, 1e-4);
}
