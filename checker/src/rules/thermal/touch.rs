//! thermal.touch: a heatsink that people can touch.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::heat::Heat;
use crate::analysis::loads::Driven;
use crate::analysis::temperatures::TOUCH_AMBIENT;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::{Related, Witness};
use crate::physics::heat::{Contact, Surface, touch_limit};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A heatsink on the outside of a case is touched, by people who do not expect it. Metal burns skin
    /// sooner than plastic: 60 degC hurts within seconds, 48 degC is the most that may be held. The limits
    /// hold at 25 degC in the room and are not raised for a hot one. Judged only where the sink is
    /// declared touchable.
    "thermal.touch",
    compares: "temperature of a touchable heatsink at the duty, 25 degC in the room, with the touch limit of metal",
    stress: "heatsink temperature in a room at 25 degC",
    rating: "touch limit",
    formula: "T = 25 + Tencl + P·Rsa",
    source: "IEC 62368-1 table 38, TS1, metal (from memory): 60 degC touched for 1 to 10 s, 48 degC held",
    reads: ["heatsink.touchable", "heatsink.resistance", "build.heatsink", "build.duty", "build.loads", "build.enclosure", "stage.idle", "amplifier.drop"],
    sense: Temperature,
    unit: "degC",
    allow: Allow::Below(0.0, f64::INFINITY), "IEC 62368-1 table 38 (from memory)",
    remedies: [
        Remedy { key: "heatsink.resistance", slot: "K/W", series: Series::Heatsink, up: false },
    ],
    example: "tern60", [("touchable          no", "touchable          held"), ("enclosure          5 K", "enclosure          15 K")],
}

/// One margin for the build's heatsink, where it is declared touchable.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Ok((sink, _)) = case.heatsink() else {
        return;
    };
    let contact = match sink.touchable.get() {
        Some(&"brushed") => Contact::Brushed,
        Some(&"held") => Contact::Held,
        _ => return,
    };
    let mut part = line_part(&sink.touchable);
    part.name.clone_from(&sink.owner.name);
    for played in case.played() {
        let stress = played.and_then(|(load, heat)| stress(case, load, heat, contact));
        out.compare(&RULE, part.clone(), sink.resistance.site(), stress);
    }
}

fn stress(case: &Case<'_>, load: &Driven, heat: &Heat, contact: Contact) -> Result<Stress, Needs> {
    let (sink, channels) = case.heatsink()?;
    let warm = case.touched(heat)?;
    let limit = touch_limit(Surface::Metal, contact);
    Ok(Stress {
        value: warm.0,
        rating: limit.0,
        ambient: TOUCH_AMBIENT.0,
        witness: Witness {
            load: Some(load.name.clone()),
            frequency_hz: Some(1000.0),
            amplitude_v: Some(heat.duty.amplitude.0),
            power_w: Some(heat.duty.power.0),
            duty: Some(case.duty().shown.clone()),
            ambient_c: Some(TOUCH_AMBIENT.0),
            sink_c: Some(warm.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "P",
                "all of the heat on one sink",
                "channels·(P+ + P- + Pother)",
                heat.total.0,
                "W",
                "energy balance of class B",
            ),
            solved(
                "T",
                "the sink, room at 25 degC",
                "25 + Tencl + P·Rsa",
                warm.0,
                "degC",
                "Rsa falls with rise to the power 1/4",
            ),
            stated(
                "limit",
                "touch limit of metal",
                limit.0,
                "degC",
                sink.touchable.stated_at(),
            ),
        ],
        related: vec![
            Related {
                message: "into this load".to_owned(),
                site: load.site,
            },
            Related {
                message: "declared touchable".to_owned(),
                site: sink.touchable.site(),
            },
            Related {
                message: format!("{channels} channel(s) on each"),
                site: case.build.heatsink.site(),
            },
        ],
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::testing::{margin, report, tern60};

    /// The rise of a sink does not depend on the room: 15 K cooler air makes a 15 K cooler sink (40 degC is the
    /// kit's hottest room, 25 degC the one judged here).
    #[test]
    fn judged_in_a_room_at_25_degrees() {
        for (word, limit) in [("brushed", 60.0), ("held", 48.0)] {
            let text = tern60(&[(
                "touchable          no",
                &format!("touchable          {word}"),
            )]);
            let (touch, sink) = (
                margin(&text, RULE.name, "fins"),
                margin(&text, "thermal.sink", "fins"),
            );
            assert!((sink.stress.unwrap().value - touch.stress.unwrap().value - 15.0).abs() < 1e-9);
            assert!((touch.rating.unwrap().value - limit).abs() < 1e-12);
        }
    }

    #[test]
    fn a_sink_out_of_reach_is_not_judged() {
        for edit in ["touchable          no", ""] {
            let found = report(&tern60(&[("touchable          no", edit)]));
            assert!(!found.builds[0].margins.iter().any(|m| m.rule == RULE.name));
        }
    }
}
