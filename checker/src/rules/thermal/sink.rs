//! thermal.sink: the heatsink at the duty.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Every device, driver and channel on a sink shares its temperature, and everything else that
    /// shrinks with heat hangs on it: safe area, bias, life. A sink too small for its channels shows
    /// first as drift, then as failures in warm weather. Catalogue figures hold at one rise; at a
    /// smaller rise the same sink is worse.
    "thermal.sink",
    compares: "temperature of the heatsink at the duty, hottest room, with a limit",
    stress: "heatsink temperature",
    rating: "limit",
    formula: "T = Ta + Tencl + P·Rsa, Rsa = R0·(ΔT/ΔT0)^-1/4; P = channels·(2·(V(Î/π + N·Iq) - V̂Î/4 - Î²RE/4N) + drivers), V the mean rail at nominal mains",
    source: "energy balance of class B; natural convection h ~ ΔT^1/4, maker's correction table",
    reads: ["heatsink.resistance", "heatsink.plate", "heatsink.fins", "build.heatsink", "build.ambient", "build.enclosure", "build.duty", "stage.idle", "stage.emitter", "amplifier.drop"],
    sense: Temperature,
    unit: "degC",
    allow: Allow::Fixed(80.0, 100.0), "common practice, no source",
    remedies: [
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
    ],
    example: "tern60", [("resistance         0.45 K/W at 50 K", "resistance         1.2 K/W at 50 K")],
}

/// One margin for the build's heatsink: the load that heats it most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let field = &case.build.heatsink;
    let Ok((sink, _)) = case.heatsink() else {
        return out.compare(&RULE, line_part(field), field.site(), Err(field.missing()));
    };
    let line = if sink.resistance.stated_at().is_some() {
        &sink.resistance.site()
    } else {
        &sink.owner.site
    };
    let mut part = line_part(&sink.resistance);
    part.name.clone_from(&sink.owner.name);
    out.compare(&RULE, part, *line, stress(case));
}

fn stress(case: &Case<'_>) -> Result<Stress, Needs> {
    let (load, heat) = case.hottest_load()?;
    let (sink, channels) = case.heatsink()?;
    let hottest = case.hottest()?;
    let mut related = vec![Related {
        message: format!("{channels} channel(s) on each"),
        site: case.build.heatsink.site(),
    }];
    related.push(Related {
        message: "heats it most".to_owned(),
        site: load.site,
    });
    let note = if heat.idle_decides {
        "idle current alone heats it more than the duty"
    } else {
        ""
    };
    Ok(Stress {
        value: heat.sink.0,
        rating: f64::NAN,
        ambient: hottest.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(heat.duty.amplitude.0),
            power_w: Some(heat.duty.power.0),
            duty: Some(case.duty().shown.clone()),
            ambient_c: Some(hottest.0),
            sink_c: Some(heat.sink.0),
            rail_v: Some(heat.rail.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "V̂",
                "duty amplitude",
                "√(2·d·Pref·R)",
                heat.duty.amplitude.0,
                "V",
                "definition of the duty",
            ),
            solved(
                "Vm",
                "mean rail at the duty, all channels",
                "rectifier steady state",
                heat.rail.0,
                "V",
                "periodic solution of the rectifier",
            ),
            solved(
                "Psig",
                "heat of one bank from the signal",
                "Vm·Î/π - V̂Î/4 - Î²RE/4N",
                heat.bank[0].signal.0,
                "W",
                "energy balance",
            ),
            solved(
                "Pidle",
                "heat of one bank from the idle current",
                "Vm·N·Iq",
                heat.bank[0].idle.0,
                "W",
                "energy balance",
            ),
            solved(
                "Pother",
                "other stages on the sink, one channel",
                "",
                heat.other.0,
                "W",
                "",
            ),
            solved(
                "P",
                "all of it, one sink",
                "channels·(P+ + P- + Pother)",
                heat.total.0,
                "W",
                "",
            ),
            stated(
                "Ta",
                "hottest air inside",
                heat.air.0,
                "degC",
                case.build.ambient.stated_at(),
            ),
            solved(
                "T",
                "heatsink",
                "Ta + P·Rsa",
                heat.sink.0,
                "degC",
                "Rsa falls with rise to the power 1/4",
            ),
        ]
        .into_iter()
        .chain(sink.resistance.get().map(|(r, _)| {
            stated(
                "R0",
                "stated resistance",
                r.0,
                "K/W",
                sink.resistance.stated_at(),
            )
        }))
        .collect(),
        related,
        note: note.to_owned(),
    })
}
