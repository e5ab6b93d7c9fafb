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
    let Some(supply) = case.fitted(&RULE, out) else { return };
    for place in ["mains", "secondary", "rail", "speaker"] {
        let part = case.fuse_part(supply, place);
        // only a mains fuse is missed where none is stated
        match if place == "mains" { case.mains_fuses() } else { case.fuses(place) } {
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

fn stress(case: &Case<'_>, supply: &Supply, fuse: &FuseLine, load: &Driven) -> Result<Stress, Needs> {
    let (flow, air, channels) = three(case.sine_flow(load), case.air_inside(), case.channels_per_supply())?;
    let fed = if fuse.per == Some("channel") { 1 } else { channels };
    let (current, step) = match fuse.place {
        "mains" => {
            let behind = Case::transformers_behind(supply, fuse);
            let current = flow.primary * f64::from(behind);
            (current, solved("I", "mains, pulses of the rectifier", "Σ windings Irms·Vs(1 + ρ)/Vtap", current.0, "A", "periodic solution of the rectifier"))
        }
        "secondary" => (flow.winding, solved("I", "one winding", "periodic solution of the rectifier", flow.winding.0, "A", "")),
        "rail" => rail(case, &flow, fed)?,
        _ => {
            let current = flow.peak / SQRT_2;
            (current, solved("I", "one loudspeaker", "Î/√2", current.0, "A", "r.m.s. of a sine"))
        }
    };
    let factor = temperature_factor(air);
    let mut working = case.rail_steps(&flow, "√(2PR) of the claimed power, else what is sustained");
    working.push(step);
    working.push(stated("IN", "rated current", fuse.rating.0, "A", [fuse.site]));
    working.push(solved("IT", "rated current in the air inside", "IN·(1 - 0.005·(T - 25))", fuse.rating.0 * factor, "A", "0.5 %/K above 25 degC"));
    Ok(Stress {
        value: current.0,
        rating: fuse.rating.0 * factor,
        witness: Witness { ambient_c: Some(air.0), ..case.at_flow(load, &flow, None) },
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
    Ok((current, solved("I", "one rail", "√((n·Î/2)² + (n·N·Iq)²), bridged n·Î/(2√2)", current.0, "A", "r.m.s. of half-sines")))
}
