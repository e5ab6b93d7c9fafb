//! drive.driver-soa: the driver's locus against its derated safe area.

use crate::analysis::case::{Side, solved};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::safe_area::{SafeArea, aim, settled};
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::both;
use crate::finding::{Related, Verdict, Witness};
use crate::physics::math::PI;
use crate::physics::safe_area::Coverage;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A driver sees the same volts as its output devices, both rails nearly, at a smaller current. Its
    /// own safe area is smaller still, and a reactive load asks for its current where its volts are
    /// high. A driver beyond its curve fails short, and the output devices follow in the same instant.
    "drive.driver-soa",
    compares: "driver current at the worst instant, nominal mains, with its derated d.c. safe area",
    stress: "driver current at the worst instant",
    rating: "current that its safe area allows there",
    formula: "i = i_out/hFE(i_out/N) + VBE/Rbe at v_CE = Vu - v_out - VBE; allowed min(IC, k·P/v, k·C(v))",
    source: "node voltages; straight-line derating of the data sheet",
    reads: [
        "device.soa", "device.power", "device.current", "device.junction", "device.vceo", "device.hfe", "stage.insulator", "stage.own-sink", "stage.base-emitter",
        "amplifier.driver", "amplifier.drop", "build.loads", "build.duty", "build.ambient", "build.mains",
    ],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.own-sink", slot: "K/W", series: Series::Heatsink, up: false },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("soa dc             2 A at 15 V, 0.6 A at 50 V, 0.2 A at 100 V", "soa dc             2 A at 15 V, 0.1 A at 50 V, 5 mA at 100 V")],
}

/// One margin for each declared driver device.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    if out.lacking(&RULE, &case.build.amplifier.driver_field) {
        return;
    }
    let Ok(driver) = case.driver() else { return };
    for side in Side::BOTH {
        let (part, site) = (case.device_part(driver, side), driver.devices.site());
        let (loads, heats) = match both(case.loads(), case.heats()) {
            Ok(found) => found,
            Err(needs) => {
                out.compare(&RULE, part, site, Err(needs));
                continue;
            }
        };
        for (load, heat) in loads.iter().zip(heats) {
            let found = both(
                load.as_ref().map_err(Clone::clone),
                heat.as_ref().map_err(Clone::clone),
            );
            match found.and_then(|(load, heat)| stress(case, load, heat, side)) {
                Ok((None, stress)) => out.compare(&RULE, part.clone(), site, Ok(stress)),
                Ok((Some(verdict), stress)) => {
                    out.judge(&RULE, part.clone(), site, verdict, stress)
                }
                Err(needs) => out.compare(&RULE, part.clone(), site, Err(needs)),
            }
        }
    }
}

fn stress(
    case: &Case<'_>,
    load: &Driven,
    heat: &Heat,
    side: Side,
) -> Result<(Option<Verdict>, Stress), Needs> {
    let driver = case.driver()?;
    let (area, found) = both(
        SafeArea::of(driver.device(side)),
        case.driver_temperatures(driver, heat, side),
    )?;
    let witness = Witness {
        mains_v: case.mains_volts(Mains::Nominal),
        load: Some(load.name.clone()),
        duty: Some(case.duty().shown.clone()),
        ambient_c: case.hottest().ok().map(|t| t.0),
        case_c: Some(found.case.0),
        curve: Some("dc".to_owned()),
        ..case.witness()
    };
    let Some(allowance) = area.allowance(found.case)? else {
        let note = format!(
            "its case reaches {:.0} degC at the duty: nothing is allowed there",
            found.case.0
        );
        return Ok((
            Some(Verdict::Over),
            Stress {
                note,
                witness,
                ..Stress::default()
            },
        ));
    };
    let use_ = case.driver_use(load, side, &allowance)?;
    settled(&area, use_.coverage, use_.point.used, aim(case, &RULE))?;
    let verdict = (use_.coverage == Coverage::AboveBreakdown).then_some(Verdict::Over);
    let note = if verdict.is_some() {
        "its current flows above its breakdown voltage"
    } else {
        ""
    };
    let stress = Stress {
        value: use_.amps.0,
        rating: use_.allowed.0,
        witness: Witness {
            frequency_hz: Some(use_.spot.frequency.0),
            amplitude_v: Some(use_.amplitude.0),
            angle_deg: Some(use_.point.angle_rad * 180.0 / PI),
            device_v: Some(use_.point.volts.0),
            device_a: Some(use_.amps.0),
            ..witness
        },
        working: vec![
            solved(
                "V̂",
                "peak output",
                "Vu - drop(V̂/|Z|)",
                use_.amplitude.0,
                "V",
                "drop as stated",
            ),
            solved(
                "|Z|",
                "impedance that one channel sees",
                "",
                use_.spot.seen.modulus().0,
                "ohm",
                "",
            ),
            solved(
                "φ",
                "its angle",
                "",
                use_.spot.seen.angle_rad() * 180.0 / PI,
                "deg",
                "",
            ),
            solved(
                "Tcase",
                "case of the driver at the duty",
                "Tsink + P·θcs",
                found.case.0,
                "degC",
                "energy balance",
            ),
            solved(
                "v",
                "across the driver at the worst instant",
                "Vu - v_out - VBE",
                use_.point.volts.0,
                "V",
                "node voltages",
            ),
            solved(
                "i",
                "through one driver then",
                "(i_out/hFE(i_out/N) + VBE/Rbe)/drivers",
                use_.amps.0,
                "A",
                "definition of current gain",
            ),
            solved(
                "Iallowed",
                "allowed at that voltage",
                "min(IC, k·P/v, k·C(v))",
                use_.allowed.0,
                "A",
                "log-log curve of the data sheet, derated",
            ),
        ],
        related: vec![
            Related {
                message: "the load".to_owned(),
                site: load.site,
            },
            Related {
                message: "case to sink".to_owned(),
                site: driver.insulator.site(),
            },
        ],
        note: note.to_owned(),
        ..Stress::default()
    };
    Ok((verdict, stress))
}

#[cfg(test)]
#[allow(
    clippy::disallowed_methods,
    reason = "the twin must not share the functions under test"
)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn bench(edits: &[(&str, &str)]) -> crate::finding::Margin {
        let mut all = vec![
            (
                "loads              hall-8, bench-8",
                "loads              bench-8",
            ),
            (
                "bench-8 { resistive 8 ohm ±5 % }",
                "bench-8 { resistive 8 ohm }",
            ),
        ];
        all.extend_from_slice(edits);
        margin(&tern60(&all), "drive.driver-soa", "d3")
    }

    #[test]
    fn a_resistive_load_at_its_worst_instant() {
        // brute force over the sine, beside the code: v = 41.36984 - 38.20536·s - 0.65, i = 4.77567·s,
        // id = i/h(i/2) + 6.5 mA, allowed k·30/v and k·C(v), k from the case that the witness states
        let m = bench(&[]);
        let k = (150.0 - m.witness.case_c.unwrap()) / 125.0;
        let curve = |v: f64| {
            let (a, b) = if v <= 50.0 {
                ((15.0_f64, 2.0_f64), (50.0_f64, 0.6_f64))
            } else {
                ((50.0, 0.6), (100.0, 0.2))
            };
            a.1 * (b.1 / a.1).powf((v / a.0).ln() / (b.0 / a.0).ln())
        };
        let mut worst = 0.0_f64;
        for n in 0..=100_000 {
            let s = (std::f64::consts::PI * f64::from(n) / 1e5).sin();
            let (v, each) = (41.369_84 - 0.65 - 38.205_36 * s, 4.775_67 * s / 2.0);
            let h = if each <= 1.0 {
                80.0
            } else {
                80.0 - 20.0 * each.ln() / 5.0_f64.ln()
            };
            let id = 2.0 * each / h + 0.0065;
            worst = worst.max(id / (4.0_f64).min(k * 30.0 / v).min(k * curve(v)));
        }
        // and the standing current at the other rail
        let v = 41.369_84 - 0.65 + 38.205_36;
        worst = worst.max(0.0065 / (k * curve(v)).min(k * 30.0 / v));
        let used = m.stress.unwrap().value / m.rating.unwrap().value;
        assert!((used / worst - 1.0).abs() < 1e-4, "{used} {worst}");
        assert_eq!(m.verdict, Verdict::Ok);
    }

    /// Every frequency and every angle tried, beside the code: the search for the frequency takes one
    /// gain for all currents, and must still find the worst place of a loudspeaker to a per cent.
    #[test]
    fn a_loudspeaker_at_its_worst_frequency() {
        let m = margin(
            &tern60(&[(
                "loads              hall-8, bench-8",
                "loads              hall-8",
            )]),
            "drive.driver-soa",
            "d3",
        );
        let k = (150.0 - m.witness.case_c.unwrap()) / 125.0;
        let allowed = |v: f64| {
            let (a, b) = if v <= 50.0 {
                ((15.0_f64, 2.0_f64), (50.0_f64, 0.6_f64))
            } else {
                ((50.0, 0.6), (100.0, 0.2))
            };
            let curve = a.1 * (b.1 / a.1).powf((v / a.0).ln() / (b.0 / a.0).ln());
            4.0_f64.min(k * 30.0 / v).min(k * curve)
        };
        let mut worst = 0.0_f64;
        for step in 0..=600 {
            let f = 20.0 * 1000.0_f64.powf(f64::from(step) / 600.0);
            // coil at 10 degC; Res = 5.9·4.2/0.45 stays: Z = Re + jωL + Res/(1 + jQms(f/fs - fs/f))
            let q = 4.2 * (f / 42.0 - 42.0 / f);
            let res = 5.9 * 4.2 / 0.45 / (1.0 + q * q);
            let (r, x) = (
                5.9 * 0.961 + res,
                std::f64::consts::TAU * f * 0.7e-3 - res * q,
            );
            let z = r.hypot(x);
            let volts = 39.569_84 / (1.0 + 2.0 / 7.0 / z);
            for n in 0..=400 {
                let beta = std::f64::consts::PI * f64::from(n) / 400.0;
                let each = volts / z * beta.sin() / 2.0;
                let h = if each <= 1.0 {
                    80.0
                } else if each <= 5.0 {
                    80.0 - 20.0 * each.ln() / 5.0_f64.ln()
                } else {
                    60.0 - 22.0 * (each / 5.0).ln() / 1.6_f64.ln()
                };
                let v = 41.369_84 - 0.65 - volts * (beta + x.atan2(r)).sin();
                worst = worst.max((2.0 * each / h + 0.0065) / allowed(v));
            }
            worst = worst.max(0.0065 / allowed(41.369_84 - 0.65 + volts));
        }
        let used = m.stress.unwrap().value / m.rating.unwrap().value;
        assert!((used / worst - 1.0).abs() < 0.01, "{used} {worst}");
    }

    #[test]
    fn a_curve_that_ends_before_the_rails_passes_nothing() {
        // the standing 6.5 mA, an eighth of the peak, flows at 79 V
        let m = bench(&[("0.6 A at 50 V, 0.2 A at 100 V", "0.6 A at 50 V")]);
        assert_eq!(m.verdict, Verdict::Unchecked);
        assert!(m.note.contains("ends at 50 V"), "{}", m.note);
    }

    #[test]
    fn a_curve_that_is_not_stated_is_named() {
        let m = bench(&[(
            "    soa dc             2 A at 15 V, 0.6 A at 50 V, 0.2 A at 100 V\n",
            "",
        )]);
        assert_eq!(m.verdict, Verdict::Unchecked);
        assert_eq!(m.needs, vec!["device d3 soa dc".to_owned()]);
    }
}
