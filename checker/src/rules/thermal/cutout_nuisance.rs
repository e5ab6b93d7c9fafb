//! thermal.cutout-nuisance: the cutout must not open on music.

use super::cutout_protects::cutout_site;
use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A cutout that opens early stops the music in a warm room, and the owner bridges it. Its earliest
    /// trip must lie above what its place reaches at the duty in the hottest room, by enough for dust
    /// on the fins.
    "thermal.cutout-nuisance",
    compares: "room between the cutout's place at the duty, hottest room, and its earliest trip",
    stress: "room below the earliest trip",
    rating: "no room",
    formula: "(trip - tolerance) - (Tsink - gradient)",
    source: "energy balance; 5 K common practice, no source",
    reads: ["protection.cutout", "build.protection", "heatsink.resistance", "build.heatsink", "build.ambient", "build.enclosure", "build.duty", "build.loads", "stage.idle", "stage.spread-across-sink", "amplifier.drop"],
    sense: AtLeast,
    unit: "K",
    allow: Allow::Fixed(5.0, 0.0), "common practice, no source",
    remedies: [
        Remedy { key: "protection.cutout", slot: "degC", series: Series::TwoDigits, up: true },
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
    ],
    example: "tern60", [("cutout             80 degC ±5 K", "cutout             55 degC ±5 K")],
}

/// One margin for the cutout: the load that heats the sink most. None fitted has none.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(site) = cutout_site(case) else {
        return;
    };
    let part = || {
        case.build.protection.get().map_or_else(
            || line_part(&case.build.protection),
            |p| line_part(&p.cutout),
        )
    };
    for played in case.played() {
        out.compare(
            &RULE,
            part(),
            site,
            played.and_then(|(load, heat)| stress(case, load, heat)),
        );
    }
}

fn stress(case: &Case<'_>, load: &Driven, heat: &Heat) -> Result<Stress, Needs> {
    let cutout = case.cutout()?;
    let room = cutout
        .headroom(heat.hot_spot)
        .ok_or_else(|| Needs::because("the cutout has no earliest trip"))?;
    let (sink, _) = case.heatsink()?;
    Ok(Stress {
        value: room.0,
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(heat.duty.amplitude.0),
            power_w: Some(heat.duty.power.0),
            duty: Some(case.duty().shown.clone()),
            ambient_c: case.hottest().ok().map(|t| t.0),
            sink_c: Some(heat.hot_spot.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "Ts",
                "sink beside the devices at the duty, hottest room",
                "Ta + ΣP·Rsa",
                heat.hot_spot.0,
                "degC",
                "energy balance",
            ),
            stated(
                "cooler",
                "how much cooler the cutout's place is",
                cutout.cooler.0,
                "K",
                case.protection()?.cutout.stated_at(),
            ),
            solved(
                "early",
                "earliest trip",
                "trip - tolerance",
                (cutout.trip - cutout.tolerance).0,
                "degC",
                "",
            ),
            solved(
                "room",
                "between them",
                "(trip - tolerance) - (Ts - cooler)",
                room.0,
                "K",
                "",
            ),
        ],
        related: vec![
            Related {
                message: "into this load".to_owned(),
                site: load.site,
            },
            Related {
                message: "the sink".to_owned(),
                site: sink.resistance.site(),
            },
        ],
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Thin};
    use crate::testing::{margin, tern60, verdict};

    /// (trip - 5) - (Ts - 4) from the sink's own figure, and the verdicts round 5 K and 0 K.
    #[test]
    fn room_by_hand() {
        let sink = margin(&tern60(&[]), "thermal.sink", "fins")
            .stress
            .unwrap()
            .value;
        let m = margin(&tern60(&[]), RULE.name, "guard cutout");
        assert!((m.stress.unwrap().value - (75.0 - (sink - 4.0))).abs() < 1e-9);
        let at = |trip: f64| {
            verdict(
                &tern60(&[(
                    "cutout             80 degC",
                    &format!("cutout             {trip:.3} degC"),
                )]),
                RULE.name,
                "guard cutout",
            )
        };
        let none = sink - 4.0 + 5.0; // the trip that leaves no room
        assert_eq!(at(none + 5.01), Ok);
        assert_eq!(at(none + 4.99), Thin);
        assert_eq!(at(none - 0.01), Over);
    }
}
