//! voltage.device: the output devices against their breakdown voltage.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Device, both};
use crate::finding::Witness;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// At no load and high mains the device that is off has both rails across it: the one on the
    /// other side holds the output at its own rail. Above V(BR)CEO it conducts without being asked
    /// to, and it takes its complement and often the loudspeaker along. Builders who compute from
    /// the nominal loaded rail miss regulation and the mains tolerance, together often 15 %.
    "voltage.device",
    compares: "voltage across an output device, high mains, no load, with V(BR)CEO or V(BR)DSS",
    stress: "voltage rail to rail at high mains, no load",
    rating: "breakdown voltage",
    formula: "V = V0+ + V0-, V0 = m·√2·Vs·(1 + ρ)",
    source: "definition of regulation, full-load base: maker's practice for toroids",
    reads: ["device.vceo", "device.vdss", "transformer.secondary", "transformer.regulation", "transformer.rating", "build.mains", "build.rails"],
    sense: AtMost,
    unit: "V",
    allow: Allow::Percent(90.0), "common practice, no source",
    remedies: [
        Remedy { key: "device.vceo", slot: "V", series: Series::TwoDigits, up: true },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("vceo               240 V", "vceo               90 V")],
}

/// One margin for each declared output device.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    for side in stage.sides() {
        let device = stage.device(*side);
        out.compare(
            &RULE,
            case.device_part(stage, *side),
            stage.devices.site(),
            rail_to_rail(case, device),
        );
    }
}

/// Both rails, unloaded, at high mains, against the breakdown voltage of a device.
///
/// # Errors
/// What device or supply do not state.
pub fn rail_to_rail(case: &Case<'_>, device: &Device) -> Result<Stress, Needs> {
    let (rating, rail) = both(device.breakdown.need().copied(), case.no_load(Mains::High))?;
    let across = rail * 2.0;
    Ok(Stress {
        value: across.0,
        rating: rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            rail_v: Some(rail.0),
            device_v: Some(across.0),
            channels_driven: None,
            ..case.witness()
        },
        working: vec![
            solved(
                "V0",
                "rail, no load, high mains",
                "m·√2·Vs·(1 + ρ)",
                rail.0,
                "V",
                "definition of regulation",
            ),
            solved(
                "V",
                "across the device that is off",
                "V0+ + V0-",
                across.0,
                "V",
                "node voltages",
            ),
            stated(
                "V(BR)",
                "breakdown voltage",
                rating.0,
                "V",
                device.breakdown.stated_at(),
            ),
        ],
        related: case.rail_sites(
            device
                .breakdown
                .stated_at()
                .map(|site| ("the rating", site)),
        ),
        ..Stress::default()
    })
}
