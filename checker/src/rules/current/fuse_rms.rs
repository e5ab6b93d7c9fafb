//! current.fuse-rms: every fuse under the continuous rated sine.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::supply::Flow;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{FuseLine, Supply, three};
use crate::finding::{Step, Witness};
use crate::physics::fuse::temperature_factor;
use crate::physics::math::SQRT_2;
use crate::physics::supply::Draw;
use crate::physics::unit::Amp;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A fuse that runs near its rating ages and opens one day for no reason anyone can find; the
    /// builder fits a bigger one, and that no longer protects. A mains fuse carries the pulses of the
    /// rectifier, well above watts over volts. Warm air inside the case takes some of the rating.
    "current.fuse-rms",
    compares: "r.m.s. current of a fuse at the continuous rated sine, all channels, with its rating in warm air",
    stress: "r.m.s. current at the continuous rated sine",
    rating: "fuse rating in the air inside",
    formula: "mains Σ windings Irms·Vs(1+ρ)/Vtap; secondary Irms; rail √((n·Î/2)² + (n·N·Iq)²), bridged n·Î/(2√2); loudspeaker Î/√2; rating less 0.5 %/K above 25 degC",
    source: "periodic solution of the rectifier; r.m.s. of half-sines; derating: a parts policy of NASA, as restated",
    reads: ["supply.fuse", "supply.transformer", "supply.rectifier", "supply.reservoir", "transformer.secondary", "transformer.rating", "transformer.regulation", "transformer.primary", "amplifier.rated", "build.supply", "build.loads", "build.mains", "build.ambient", "build.enclosure", "stage.idle"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice for IEC 60127 ratings, no source; 75 % for UL ratings",
    remedies: [
        Remedy { key: "supply.fuse", slot: "A", series: Series::R10, up: true },
    ],
    example: "tern60", [("fuse rail          5 A fast", "fuse rail          2 A fast")],
}

/// One margin for the fuses of each place: the load that draws most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(supply) = case.fitted(&RULE, out) else {
        return;
    };
    for place in ["mains", "secondary", "rail", "speaker"] {
        let part = case.fuse_part(supply, place);
        // fuses of other places are not missed where none is stated
        let fuses = match place {
            "mains" => case.mains_fuses(),
            "rail" => case.rail_fuses(),
            _ => case.fuses(place),
        };
        match fuses {
            Err(needs) => out.compare(&RULE, part, supply.mains_fuse.site(), Err(needs)),
            Ok(fuses) => {
                for fuse in fuses {
                    for found in case.per_load(|load| stress(case, supply, fuse, load)) {
                        out.compare(&RULE, part.clone(), fuse.site, found);
                    }
                }
            }
        }
    }
}

fn stress(
    case: &Case<'_>,
    supply: &Supply,
    fuse: &FuseLine,
    load: &Driven,
) -> Result<Stress, Needs> {
    let (flow, air, channels) = three(
        case.sine_flow(load),
        case.air_inside(),
        case.channels_per_supply(),
    )?;
    let fed = if fuse.per == Some("channel") {
        1
    } else {
        channels
    };
    let (current, step) = match fuse.place {
        "mains" => {
            let behind = Case::transformers_behind(supply, fuse);
            let current = flow.primary * f64::from(behind);
            (
                current,
                solved(
                    "I",
                    "mains, pulses of the rectifier",
                    "Σ windings Irms·Vs(1 + ρ)/Vtap",
                    current.0,
                    "A",
                    "periodic solution of the rectifier",
                ),
            )
        }
        "secondary" => (
            flow.winding,
            solved(
                "I",
                "one winding",
                "periodic solution of the rectifier",
                flow.winding.0,
                "A",
                "",
            ),
        ),
        "rail" => rail(case, &flow, fed)?,
        _ => {
            let current = flow.peak / SQRT_2;
            (
                current,
                solved(
                    "I",
                    "one loudspeaker",
                    "Î/√2",
                    current.0,
                    "A",
                    "r.m.s. of a sine",
                ),
            )
        }
    };
    let factor = temperature_factor(air);
    let mut working = case.rail_steps(&flow, "√(2PR) of the claimed power, else what is sustained");
    working.push(step);
    working.push(stated(
        "IN",
        "rated current",
        fuse.rating.0,
        "A",
        [fuse.site],
    ));
    working.push(solved(
        "IT",
        "rated current in the air inside",
        "IN·(1 - 0.005·(T - 25))",
        fuse.rating.0 * factor,
        "A",
        "0.5 %/K above 25 degC",
    ));
    Ok(Stress {
        value: current.0,
        rating: fuse.rating.0 * factor,
        witness: Witness {
            ambient_c: Some(air.0),
            ..case.at_flow(load, &flow, None)
        },
        working,
        related: case.loading_sites(load),
        ..Stress::default()
    })
}

/// A fuse in a rail: half-sines of every channel behind it in phase, idle added by squares.
fn rail(case: &Case<'_>, flow: &Flow, fed: u32) -> Result<(Amp, Step), Needs> {
    let (draw, peaks) = case.draw(fed);
    let all = f64::from(case.channels_per_supply()?.max(1));
    let idle = case.idle_of_supply()? * (f64::from(fed) / all);
    let peak = flow.peak * peaks;
    let signal = match draw {
        Draw::OneHalf => peak / 2.0,
        Draw::BothHalves => peak / SQRT_2,
    };
    let current = Amp((signal.0 * signal.0 + idle.0 * idle.0).sqrt());
    Ok((
        current,
        solved(
            "I",
            "one rail",
            "√((n·Î/2)² + (n·N·Iq)²), bridged n·Î/(2√2)",
            current.0,
            "A",
            "r.m.s. of half-sines",
        ),
    ))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60, verdict};

    /// Rail: 60 W into 8 ohm is 3.873 A peak, √(1.9365² + 0.1²) = 1.9391 A. Air 45 degC leaves 90 %:
    /// 80 % of 0.9 x 2.7 A is 1.944 A, of 0.9 x 2.69 A 1.937 A. By hand.
    #[test]
    fn rail_fuse() {
        let m = margin(&tern60(&[]), super::RULE.name, "toroid fuse rail");
        assert!((m.stress.unwrap().value - 1.9391).abs() < 1e-3);
        assert!((m.rating.unwrap().value - 4.5).abs() < 1e-9);
        let at = |amps: &str| {
            verdict(
                &tern60(&[("5 A fast", &format!("{amps} A fast"))]),
                super::RULE.name,
                "toroid fuse rail",
            )
        };
        assert_eq!(at("2.7"), Verdict::Ok);
        assert_eq!(at("2.69"), Verdict::Thin);
        assert_eq!(at("2.1"), Verdict::Over);
    }

    /// Mains: each winding carries 2.9188 A by a small-step integration written apart from this
    /// program; 2·2.9188·28·1.07/230 = 0.7604 A.
    #[test]
    fn mains_fuse() {
        let m = margin(&tern60(&[]), super::RULE.name, "toroid fuse mains");
        assert!((m.stress.unwrap().value / 0.7604 - 1.0).abs() < 1e-3);
    }

    /// Loudspeaker 3.873/√2 = 2.7386 A; a winding 2.9188 A. By hand and as above.
    #[test]
    fn other_places() {
        let text = tern60(&[(
            "    fuse rail          5 A fast",
            "    fuse rail          5 A fast\n    fuse speaker       4 A fast\n    fuse secondary     6.3 A slow",
        )]);
        let of = |part: &str| margin(&text, super::RULE.name, part).stress.unwrap().value;
        assert!((of("toroid fuse speaker") - 2.7386).abs() < 1e-3);
        assert!((of("toroid fuse secondary") / 2.9188 - 1.0).abs() < 1e-3);
    }

    #[test]
    fn says_what_is_missing() {
        let m = margin(
            &tern60(&[("    fuse rail          5 A fast\n", "")]),
            super::RULE.name,
            "toroid fuse rail",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid fuse rail".to_owned()]
            )
        );
        let m = margin(
            &tern60(&[(
                "    fuse mains         2.5 A slow melts 90 A2s tap 230 V\n",
                "",
            )]),
            super::RULE.name,
            "toroid fuse mains",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["supply toroid fuse mains".to_owned()]
            )
        );
        let none = crate::testing::report(&tern60(&[(
            "fuse mains         2.5 A slow melts 90 A2s tap 230 V",
            "fuse none",
        )]));
        assert!(
            none.builds[0]
                .margins
                .iter()
                .all(|m| m.rule != super::RULE.name || m.part.name != "toroid fuse mains")
        );
    }
}
