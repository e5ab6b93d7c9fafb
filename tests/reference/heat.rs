//! Thermal chain, heatsinks, derating and touch limits against published figures.
//! Knows only the public functions of the heat and heatsink models.
//!
//! Letters: F a value read in its source, M quoted from memory, D derived and checked by a second
//! numerical route. Tolerances are half a unit of the last digit printed, unless said otherwise.

use derate::physics::heat::{
    Contact, Mounting, Sharing, Surface, derated, greatest_power, junction_case, sink_temperature,
    touch_limit,
};
use derate::physics::heatsink::{
    Air, FinnedSink, Geometry, Material, Orientation, Sink, StatedSink, apparent_emissivity,
    channel_nusselt, radiation_coefficient,
};
use derate::physics::math;
use derate::physics::unit::{Celsius, Kelvin, KelvinPerWatt, Watt};

fn near(got: f64, want: f64, tolerance: f64) {
    assert!(
        (got - want).abs() <= tolerance,
        "got {got}, want {want} within {tolerance}"
    );
}

/// Textbook sinks have a constant resistance. Ours has that resistance at one rise only, so it is
/// stated at the rise of the worked answer.
fn greatest(theta_jc: f64, theta_cs: f64, theta_sa: f64, air: f64, limit: f64) -> f64 {
    let answer = (limit - air) / (theta_jc + theta_cs + theta_sa);
    let mounting = Mounting {
        junction_case: KelvinPerWatt(theta_jc),
        case_sink: KelvinPerWatt(theta_cs),
    };
    let alone = Sharing {
        devices: 1,
        other: Watt(0.0),
    };
    StatedSink::new(KelvinPerWatt(theta_sa), Kelvin(answer * theta_sa))
        .and_then(|s| {
            greatest_power(
                &Sink::Stated(s),
                Celsius(air),
                mounting,
                alone,
                Celsius(limit),
            )
        })
        .map_or(f64::NAN, |w| w.0)
}

/// M. Sedra and Smith, Microelectronic Circuits, power-transistor example (5e Ex. 14.5):
/// RJC 3.12, RCS 0.5, RSA 4, 50 °C, 150 °C: 13.1 W (13.12), case 109.1 °C, sink 102.5 °C.
#[test]
fn chain_with_sink() {
    let p = greatest(3.12, 0.5, 4.0, 50.0, 150.0);
    near(p, 13.12, 0.005);
    let mounting = Mounting {
        junction_case: KelvinPerWatt(3.12),
        case_sink: KelvinPerWatt(0.5),
    };
    let t = mounting
        .temperatures(Celsius(50.0 + 4.0 * p), Watt(p))
        .unwrap();
    near(t.sink.0, 102.5, 0.05);
    near(t.case.0, 109.1, 0.1); // the source multiplies by a rounded 13.1 W
    near(t.junction.0, 150.0, 1e-6);
}

/// M. The same book, Ex. 14.4: 2 W at 25 °C, 150 °C junction is 62.5 K/W; 1.6 W at 50 °C.
#[test]
fn free_standing_device() {
    let theta = junction_case(Watt(2.0), Celsius(25.0), Celsius(150.0)).unwrap();
    near(theta.0, 62.5, 1e-12);
    let left = derated(Watt(2.0), Celsius(25.0), Celsius(150.0), Celsius(50.0)).unwrap();
    near(left.0, 1.6, 1e-12);
    near(25.0 + theta.0 * 1.0, 87.5, 1e-12);
}

/// F. Boylestad and Nashelsky, Electronic Devices and Circuit Theory 11e, ch. 12 problem 24:
/// 0.5, 0.8, 1.5 K/W, 80 °C, 200 °C: 42.86 W.
#[test]
fn boylestad_problem() {
    near(greatest(0.5, 0.8, 1.5, 80.0, 200.0), 42.86, 0.005);
}

/// F (inputs). Rashid, Power Electronics 4e, Ex. 4.4: 0.4, 0.1, 0.5 K/W, 25 °C, 150 °C: 125 W,
/// case 100 °C.
#[test]
fn rashid_example() {
    let p = greatest(0.4, 0.1, 0.5, 25.0, 150.0);
    near(p, 125.0, 0.5);
    near(25.0 + p * 0.6, 100.0, 0.5);
}

/// F (inputs). Neamen, Electronic Circuit Analysis and Design, ch. 8: 1.75, 1, 5 K/W, 30 °C, 150 °C:
/// 15.5 W with a sink, 2.32 W into 50 K/W of case to air. And 20 W at 25 °C with 175 °C: 7.5 K/W, then
/// 11.1 W through 1 and 5 K/W.
#[test]
fn neamen_examples() {
    near(greatest(1.75, 1.0, 5.0, 30.0, 150.0), 15.5, 0.05);
    near(greatest(1.75, 0.0, 50.0, 30.0, 150.0), 2.32, 0.005);
    let theta = junction_case(Watt(20.0), Celsius(25.0), Celsius(175.0)).unwrap();
    near(theta.0, 7.5, 1e-12);
    near(greatest(theta.0, 1.0, 5.0, 25.0, 175.0), 11.1, 0.05);
}

/// F. A published worked sheet: 3.9 W through 3.125 and 13 K/W from 25 °C: 88 °C.
#[test]
fn small_sink() {
    let mounting = Mounting {
        junction_case: KelvinPerWatt(3.125),
        case_sink: KelvinPerWatt(0.0),
    };
    let t = mounting
        .temperatures(Celsius(25.0 + 13.0 * 3.9), Watt(3.9))
        .unwrap();
    near(t.junction.0, 88.0, 0.5);
}

/// F (inputs), M (answer). A sink maker's text: TO-3, 10 W, 125 °C, 50 °C, 1.5 and 0.09 K/W leave
/// 5.91 K/W for the sink.
#[test]
fn sink_wanted() {
    near(greatest(1.5, 0.09, 5.91, 50.0, 125.0), 10.0, 0.005);
}

/// F. Correction factors of a maker's table against a 75 K rise: exactly (75/ΔT)^1/4.
#[test]
fn correction_table() {
    let sink = Sink::Stated(StatedSink::new(KelvinPerWatt(1.0), Kelvin(75.0)).unwrap());
    for (rise, factor) in [
        (70.0, 1.017),
        (60.0, 1.057),
        (50.0, 1.106),
        (40.0, 1.170),
        (30.0, 1.257),
    ] {
        let r = sink.resistance(Kelvin(rise), Celsius(25.0)).unwrap();
        near(r.0, factor, 0.0007);
    }
}

/// Air at a film temperature of 55 °C as the next example prints it.
const EXAMPLE_AIR: Air = Air {
    conductivity_w_per_mk: 0.02772,
    viscosity_m2_per_s: 1.847e-5,
    prandtl: 0.7215,
    expansion_per_k: 1.0 / 328.0,
};

/// F. Çengel and Ghajar, Heat and Mass Transfer 5e, Ex. 9-3: 12 cm wide, 18 cm high, fins 2.4 cm by
/// 1 mm, 80 °C in 30 °C: Ra(L) 1.845e7, best gap 7.45 mm, 14 fins (0.12/(S + t) = 14.2), h 4.863,
/// 29.4 W from the fins alone (1.70 K/W).
#[test]
fn finned_plate_example() {
    let rise = Kelvin(50.0);
    let ra = EXAMPLE_AIR.rayleigh(rise, 0.18);
    near(ra / 1e7, 1.845, 0.001);
    let best = 2.714 * 0.18 / math::pow(ra, 0.25);
    near(best * 1e3, 7.45, 0.005);
    // The book uses Nu = 1.307 at the best gap; the formula behind it gives the same.
    let h = EXAMPLE_AIR.channel_coefficient(rise, best, 0.18);
    near(h, 4.863, 0.005);
    near(h * 2.0 * 14.0 * 0.18 * 0.024 * 50.0, 29.4, 0.05);
}

/// F, D. Nu at the best gap is 1.307; limits El/24 and 0.59 El^1/4; the best gap of the printed
/// formula is (1152/2.873)^(1/6) = 2.7155 L/Ra^1/4 where the source prints 2.714; Elenbaas' own form
/// (M: Physica 9 (1942) 1-28) is within 2 % there.
#[test]
fn parallel_plate_formula() {
    let best = math::pow(1152.0 / 2.873, 1.0 / 6.0);
    near(best, 2.7155, 5e-4);
    let el = math::pow(2.714, 4.0); // El = Ra(S)·S/L = (S·Ra(L)^1/4/L)^4, at the printed gap
    near(channel_nusselt(el), 1.307, 0.0005);
    near(channel_nusselt(1e-3) / (1e-3 / 24.0), 1.0, 1e-4);
    near(channel_nusselt(1e8) / (0.59 * 100.0), 1.0, 1e-3);
    let elenbaas = el / 24.0 * math::pow(-math::expm1(-35.0 / el), 0.75);
    near(channel_nusselt(el) / elenbaas, 1.0, 0.02);
    // Heat of a given width goes as Nu/S² for thin fins: its maximum is at `best`.
    let heat = |s: f64| channel_nusselt(math::pow(s, 4.0)) / (s * s);
    near(math::maximum(heat, 1.0, 6.0, 1e-9).0, best, 1e-6);
}

/// D. Exponent of h against the rise: 1 narrow, 0.5006 at the best gap, 0.25 wide.
#[test]
fn exponent_of_the_rise() {
    let exponent = |el: f64| {
        let step = 1e-4;
        math::ln(channel_nusselt(el * (1.0 + step)) / channel_nusselt(el * (1.0 - step)))
            / math::ln((1.0 + step) / (1.0 - step))
    };
    near(exponent(1e-4), 1.0, 1e-4);
    near(exponent(math::pow(2.714, 4.0)), 0.5006, 1e-4);
    near(exponent(1e9), 0.25, 1e-4);
}

/// D. Radiation of the same sink: black-body coefficient 8.061 W/(m²K) between 80 and 30 °C, apparent
/// emissivity 0.9768 (walls 0.85) and 0.4239 (0.09), 14.17 W and 6.15 W from the 0.036 m² envelope.
#[test]
fn finned_plate_radiation() {
    let h = radiation_coefficient(Celsius(80.0), Celsius(30.0)).unwrap();
    near(h, 8.061, 1e-3);
    let black = apparent_emissivity(7.45e-3, 0.024, 0.85);
    let bare = apparent_emissivity(7.45e-3, 0.024, 0.09);
    near(black, 0.9768, 1e-3);
    near(bare, 0.4239, 1e-3);
    near(h * 0.036 * 50.0 * black, 14.17, 0.01);
    near(h * 0.036 * 50.0 * bare, 6.15, 0.01);
}

/// D. The whole sink: fins 29.4 W and envelope 14.17 W make 1.148 K/W. Our model also counts the
/// plate between the fins and lets the outer fin sides convect freely, and keeps the plate edges;
/// the model is good to ±20 %.
#[test]
fn finned_plate_total() {
    let shape = Geometry {
        width_m: 0.12,
        length_m: 0.18,
        plate_m: 0.003,
        fins: 14,
        fin_height_m: 0.024,
        fin_m: 0.001,
        gap_m: 7.45e-3,
        orientation: Orientation::Vertical,
        back_open: false,
    };
    let material = Material {
        emissivity: 0.85,
        conductivity_w_per_mk: 200.0,
    };
    let sink = Sink::Finned(FinnedSink::new(shape, material).unwrap());
    let r = sink.resistance(Kelvin(50.0), Celsius(30.0)).unwrap();
    near(r.0 / 1.148, 1.0, 0.2);
    let t = sink_temperature(&sink, Celsius(30.0), Watt(50.0 / r.0)).unwrap();
    near(t.0, 80.0, 1e-6);
}

/// M. Air at 300 K and 350 K in heat-transfer textbooks: k 0.0263 and 0.0300, ν 15.89e-6 and
/// 20.92e-6, Pr 0.707 and 0.700. Tables differ among themselves by up to 3 % (the example above has
/// k 0.0277 at 55 °C, others 0.0284), which is what the formula claims.
#[test]
fn air_properties() {
    for (kelvins, k, nu, pr) in [
        (300.0, 0.0263, 15.89e-6, 0.707),
        (350.0, 0.0300, 20.92e-6, 0.700),
    ] {
        let air = Air::at(Celsius(kelvins - 273.15)).unwrap();
        near(air.conductivity_w_per_mk / k, 1.0, 0.03);
        near(air.viscosity_m2_per_s / nu, 1.0, 0.03);
        near(air.prandtl / pr, 1.0, 0.03);
    }
    let air = Air::at(Celsius(55.0)).unwrap();
    near(
        air.conductivity_w_per_mk / EXAMPLE_AIR.conductivity_w_per_mk,
        1.0,
        0.03,
    );
    near(
        air.viscosity_m2_per_s / EXAMPLE_AIR.viscosity_m2_per_s,
        1.0,
        0.03,
    );
}

/// F. Data sheets of a JEDEC 2N3055: 115 W at a 25 °C case and 200 °C: 1.52 K/W, 65.7 W at 100 °C.
/// The military sheet, 117 W: 1.5 K/W, 668 mW/K.
#[test]
fn device_derating() {
    let theta = junction_case(Watt(115.0), Celsius(25.0), Celsius(200.0)).unwrap();
    near(theta.0, 1.52, 0.005);
    let hot = derated(Watt(115.0), Celsius(25.0), Celsius(200.0), Celsius(100.0)).unwrap();
    near(hot.0, 65.7, 0.05);
    let military = junction_case(Watt(117.0), Celsius(25.0), Celsius(200.0)).unwrap();
    near(military.0, 1.5, 0.05);
    near(1e3 / military.0, 668.0, 0.7);
}

/// F, D. A maker's derating of a 0.6 W film resistor: P70·(155 - T)/85: 0.388 W at 100 °C, 35.3 % at
/// 125 °C, 1.18 %/K.
#[test]
fn resistor_derating() {
    let at = |t: f64| {
        derated(Watt(0.6), Celsius(70.0), Celsius(155.0), Celsius(t))
            .unwrap()
            .0
    };
    near(at(25.0), 0.6, 1e-12);
    near(at(100.0), 0.388, 0.0005);
    near(at(125.0) / 0.6, 0.353, 0.0005);
    near((at(80.0) - at(81.0)) / 0.6, 0.0118, 0.00005);
    near(at(200.0), 0.0, 1e-12);
}

/// IEC 62368-1 Table 38, TS1. Plastic at 1 to 10 s is F (a practitioners' list); the rest M.
#[test]
fn touch_limits() {
    use Contact::{Brushed, Grazed, Gripped, Held};
    let table = [
        (Held, [48.0, 48.0, 48.0]),
        (Gripped, [51.0, 56.0, 60.0]),
        (Brushed, [60.0, 71.0, 77.0]),
        (Grazed, [70.0, 85.0, 94.0]),
    ];
    for (contact, limits) in table {
        for (surface, want) in [Surface::Metal, Surface::Glass, Surface::Plastic]
            .into_iter()
            .zip(limits)
        {
            near(touch_limit(surface, contact).0, want, 1e-12);
        }
    }
}
