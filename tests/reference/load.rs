//! Published and derived figures for loudspeaker impedance.
//!
//! Letters: F = printed value read at the source; M = value from memory, its arithmetic checked;
//! D = own derivation checked by an independent numerical route.

#![allow(
    clippy::unwrap_used,
    clippy::disallowed_methods,
    reason = "a test may fail loudly and checks against the platform's own functions"
)]

use derate::physics::load::{
    Band, Impedance, Load, Resonance, Table, TableRow, Tolerance, Variant, VoiceCoil,
};
use derate::physics::unit::{Henry, Hertz, Ohm};
use std::f64::consts::{PI, TAU};

fn near(value: f64, expected: f64, tolerance: f64) {
    assert!(
        (value - expected).abs() <= tolerance,
        "{value}, expected {expected} ± {tolerance}"
    );
}

fn audio() -> Band {
    Band::new(Hertz(20.0), Hertz(20_000.0)).unwrap()
}

fn coil(re: f64, le: f64, n: f64, resonance: (f64, f64, f64)) -> Load {
    let (fs, qms, qes) = resonance;
    Load::voice_coil(VoiceCoil {
        resistance: Ohm(re),
        inductance: Henry(le),
        loss_exponent: n,
        resonances: vec![Resonance {
            frequency: Hertz(fs),
            mechanical_q: qms,
            electrical_q: qes,
        }],
    })
    .unwrap()
}

fn at(load: &Load, f: f64) -> Impedance {
    load.impedance(load.variants()[0], Hertz(f)).unwrap()
}

/// The unit of a published driver sheet (F): Re 6.18 ohm, fs 110.3 Hz, Qms 4.537, Qes 1.297.
fn published_unit() -> Load {
    coil(6.18, 0.0, 1.0, (110.3, 4.537, 1.297))
}

/// F: a published driver sheet states Re 6.0 ohm, Mms 62 g, Cms 0.48 mm/N, Rms 2.3 kg/s, Bl 13.5
/// and fs 29 Hz, Qes 0.37, Qms 4.91. Tolerance: half a unit of the sheet's last digit.
/// Zmax = Re(1 + Qms/Qes) = 85.62 ohm from the printed Q.
#[test]
fn resonance_from_mechanical_parameters() {
    let (re, mms, cms, rms, bl): (f64, f64, f64, f64, f64) = (6.0, 0.062, 0.48e-3, 2.3, 13.5);
    let omega = 1.0 / (mms * cms).sqrt();
    near(omega / TAU, 29.0, 0.5);
    // The sheet's Q go with its printed fs; with the computed 29.17 Hz, Qms would be 4.94.
    let omega = TAU * 29.0;
    near(omega * mms * re / (bl * bl), 0.37, 0.005);
    near(omega * mms / rms, 4.91, 0.01);
    let load = coil(re, 0.0, 1.0, (29.0, 4.91, 0.37));
    near(at(&load, 29.0).modulus().0, 85.62, 0.005);
}

/// F: a second published sheet; Res = Re·Qms/Qes = 21.62 ohm, which is Bl²/Rms of the same sheet
/// (11.325²/5.932 = 21.62). Tolerance: half a unit of the last digit.
#[test]
fn motional_resistance_is_force_factor_squared_over_loss() {
    let peak = at(&published_unit(), 110.3).modulus().0 - 6.18;
    near(peak, 21.62, 0.005);
    near(peak, 11.325 * 11.325 / 5.932, 0.005);
}

/// D, with R. H. Small, JAES 20(5) 1972 for the Q method (M): without inductance the phase extreme
/// is asin(r/(r+2)), r = Qms/Qes, at the two frequencies where |Z| = √(Re·Zmax), and their product
/// is fs². Tolerance 1e-4 of the printed figures.
#[test]
fn phase_extremes_are_the_two_frequencies_of_the_q_method() {
    let survey = published_unit().survey(audio()).unwrap();
    let r: f64 = 4.537 / 1.297;
    let extreme = (r / (r + 2.0)).asin();
    near(extreme.to_degrees(), 39.51, 0.005);
    near(survey.most_lagging.value, extreme, 1e-12);
    near(survey.most_leading.value, extreme, 1e-12);
    near(survey.most_lagging.frequency.0, 87.49, 0.005);
    near(survey.most_leading.frequency.0, 139.05, 0.005);
    near(
        survey.most_lagging.frequency.0 * survey.most_leading.frequency.0,
        110.3 * 110.3,
        0.01,
    );
    near(
        survey.most_lagging.impedance.modulus().0,
        6.18 * (1.0 + r).sqrt(),
        1e-5,
    );
    near(6.18 * (1.0 + r).sqrt(), 13.107, 5e-4);
}

/// D: the least equivalent peak dissipation resistance of that unit lies neither at the phase
/// extreme (5.116 ohm there) nor at the least modulus. Tolerance 5e-4, the printed digits.
#[test]
fn peak_dissipation_is_worst_between_phase_extreme_and_minimum() {
    let load = published_unit();
    let survey = load.survey(audio()).unwrap();
    near(-survey.dissipation.value, 3.777, 5e-4);
    near(-survey.dissipation.value / 6.18, 0.611, 5e-4);
    // Two frequencies tie by symmetry of the resonance; the lower one stands.
    near(survey.dissipation.frequency.0, 62.7, 0.05);
    near(survey.dissipation.impedance.modulus().0, 7.905, 5e-4);
    near(
        survey.dissipation.impedance.angle_rad().abs().to_degrees(),
        29.3,
        0.05,
    );
    near(
        at(&load, 194.1).peak_dissipation_resistance().0,
        3.777,
        5e-4,
    );
    near(
        survey
            .most_leading
            .impedance
            .peak_dissipation_resistance()
            .0,
        5.116,
        5e-4,
    );
}

/// D (method E. Benjamin, JAES 42(9) 1994, M; convention of K. Howard, "Heavy Load", 2007, F):
/// EPDR/|Z| against angle. Tolerance: half a unit of the fifth decimal.
#[test]
fn equivalent_peak_dissipation_resistance() {
    let table = [
        (0.0, 1.0),
        (30.0, 0.47066),
        (45.0, 0.35355),
        (60.0, 0.27807),
        (75.0, 0.22741),
        (90.0, 0.19245),
    ];
    for (degrees, ratio) in table {
        for sign in [1.0, -1.0] {
            let z = Impedance::polar(Ohm(7.0), sign * f64::to_radians(degrees));
            near(z.peak_dissipation_resistance().0 / 7.0, ratio, 5e-6);
        }
    }
    // Exact limits: 2√2 at 45°, 3√3 at 90°.
    let z = |degrees: f64| Impedance::polar(Ohm(1.0), f64::to_radians(degrees));
    near(
        z(45.0).peak_dissipation_resistance().0,
        1.0 / 8f64.sqrt(),
        1e-14,
    );
    near(
        z(90.0).peak_dissipation_resistance().0,
        1.0 / 27f64.sqrt(),
        1e-14,
    );
}

/// F: IEC 60268-5:2003 clause 16.1 (number from memory) wants the least modulus in the rated range
/// at 80 % of the rated value or more: 6.4 and 3.2 ohm for 8 and 4 ohm. A unit of Zmin 7.31 ohm
/// passes though its d.c. resistance of 5.61 ohm is below 6.4: the rule is about the band.
#[test]
fn minimum_modulus_is_searched_inside_the_band_only() {
    let load = coil(5.61, 0.0, 1.0, (1.0, 4.0, 0.4));
    let band = Band::new(Hertz(20.0), Hertz(40.0)).unwrap();
    assert!(load.survey(band).unwrap().minimum.impedance.modulus() > load.dc().unwrap());
}

/// F form (W. M. Leach, JAES 50(6) 2002), D figures: arg K(jω)ⁿ = 90°·n at every frequency.
#[test]
fn lossy_inductance_has_a_constant_angle() {
    for (n, degrees) in [(0.5, 45.0), (0.7, 63.0), (1.0, 90.0)] {
        let load = Load::voice_coil(VoiceCoil {
            resistance: Ohm(1e-9),
            inductance: Henry(0.5884e-3),
            loss_exponent: n,
            resonances: vec![],
        })
        .unwrap();
        for f in [20.0, 1000.0, 20_000.0] {
            near(at(&load, f).angle_rad().to_degrees(), degrees, 1e-6);
        }
        // By definition the stated inductance is met at 1 kHz: 2π·1000·0.5884 mH = 3.6971 ohm.
        near(
            at(&load, 1000.0).modulus().0,
            TAU * 1000.0 * 0.5884e-3,
            1e-8,
        );
        near(at(&load, 1000.0).modulus().0, 3.6971, 5e-4);
    }
}

/// F coefficients (a published sheet), form Wright, JAES 1990, restated by Leach 2002 (F):
/// Z = Kr·ω^Xr + jKi·ω^Xi gives 1.5526 + j3.6971 at 1 kHz and 14.684 + j36.03 at 20 kHz. The form is
/// not built in: it comes as a table, which must return what was tabulated, and between rows of a
/// power law what the law says, within the bend of the phase.
#[test]
fn tabulated_lossy_coil_is_returned() {
    let wright = |f: f64| {
        let w = TAU * f;
        (0.0022 * w.powf(0.75), 0.0048 * w.powf(0.76))
    };
    near(wright(1000.0).0, 1.5526, 5e-4);
    near(wright(1000.0).1, 3.6971, 5e-4);
    near(wright(20_000.0).0, 14.684, 5e-3);
    near(wright(20_000.0).1, 36.03, 5e-3);
    let rows: Vec<_> = (0..=60)
        .map(|k| 20.0 * 1000f64.powf(f64::from(k) / 60.0))
        .map(|f| {
            let (r, x) = wright(f);
            TableRow {
                frequency: Hertz(f),
                modulus: Ohm(r.hypot(x)),
                angle_rad: x.atan2(r),
            }
        })
        .collect();
    let load = Load::table(Table::new(&rows).unwrap(), None).unwrap();
    for f in [20.0, 1000.0, 20_000.0] {
        near(at(&load, f).resistance.0, wright(f).0, 1e-5 * wright(f).0);
        near(at(&load, f).reactance.0, wright(f).1, 1e-5 * wright(f).1);
    }
}

/// Hand calculation: 8 ohm and 4 ohm at 0° in parallel are 8·4/12 = 2.667 ohm; both 5 % low,
/// 7.6·3.8/11.4 = 2.533 ohm. A bridge halves the modulus and leaves the angle.
#[test]
fn parallel_and_bridged() {
    let a = Load::resistive(Ohm(8.0), 0.05).unwrap();
    let b = Load::resistive(Ohm(4.0), 0.05).unwrap();
    let both = Load::parallel(&[a, b]).unwrap();
    let low = both.survey(audio()).unwrap().minimum;
    near(low.impedance.modulus().0, 7.6 * 3.8 / 11.4, 1e-12);
    assert_eq!(
        low.variant,
        Variant {
            tolerance: Tolerance::Low,
            ..low.variant
        }
    );
    near(both.dc().unwrap().0, 8.0 * 4.0 / 12.0, 1e-12);
    let half = Impedance::polar(Ohm(8.0), PI / 5.0).halved();
    near(half.modulus().0, 4.0, 1e-12);
    near(half.angle_rad(), PI / 5.0, 1e-12);
}
