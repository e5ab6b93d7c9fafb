//! thermal.cutout-protects: what the devices stand with the sink as hot as the cutout lets it be.

use crate::analysis::case::{Side, solved};
use crate::analysis::heat::{Heat, at};
use crate::analysis::loads::Driven;
use crate::analysis::safe_area::Angle;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::both;
use crate::finding::{Related, Site, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A thermal cutout that opens late, or sits where it is cooler than the devices, opens after they
    /// have died. Held at the temperature at which the cutout opens at the latest, its place's gradient
    /// included, the sink must still leave the devices their safe area and their junctions below Tj,max.
    /// Otherwise the cutout is a decoration.
    "thermal.cutout-protects",
    compares: "safe area and junction with the sink held at the latest trip of the cutout, with their limits",
    stress: "used of the safe area, or of the junction's room, at the latest trip",
    rating: "all of it",
    formula: "Ts = trip + tolerance + gradient; the greater of i/Iallowed at k(Ts + P·θcs) and P·(θcs + θjc)/(Tj,max - Ts)",
    source: "energy balance; derated data sheet",
    reads: ["protection.cutout", "build.protection", "device.soa", "device.junction", "device.junction-case", "stage.insulator", "stage.pairs", "build.loads", "build.duty", "amplifier.drop"],
    sense: AtMost,
    unit: "%",
    allow: Allow::Percent(100.0), "the derated data sheet itself",
    remedies: [
        Remedy { key: "protection.cutout", slot: "degC", series: Series::TwoDigits, up: false },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("cutout             80 degC ±5 K on sink cooler 4 K", "cutout             105 degC ±5 K on sink cooler 30 K")],
}

/// One margin for each declared output device. A cutout known not to be fitted has none.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Some(site) = cutout_site(case) else {
        return;
    };
    let stage = case.output();
    for side in stage.sides() {
        for played in case.played() {
            let stress = played.and_then(|(load, heat)| stress(case, load, heat, *side));
            out.compare(&RULE, case.device_part(stage, *side), site, stress);
        }
    }
}

/// The line that states the cutout, or could; nothing where none is fitted.
pub(super) fn cutout_site(case: &Case<'_>) -> Option<Site> {
    let field = &case.build.protection;
    match field.get() {
        Some(p) if p.cutout.none => None,
        Some(p) => Some(p.cutout.site()),
        None if field.none => None,
        None => Some(field.site()),
    }
}

fn stress(case: &Case<'_>, load: &Driven, heat: &Heat, side: Side) -> Result<Stress, Needs> {
    let device = case.output().device(side);
    let (latest, limit) = both(case.cutout_latest(), device.junction.need().copied())?;
    let ((hot, junction), mains) = (case.held(heat, side, latest)?, case.safe_area_mains());
    let watts = heat.device[at(side)];
    let ready = case.ready(side, mains, hot, watts, 1.0)?;
    let (spot, found) = case.worst_use(&ready, load, Angle::Own)?;
    case.settled(&ready, &found, 1.0)?;
    let room = limit - latest;
    // a sink as hot as the junction may be leaves no room at all
    let by_heat = if room.0 > 0.0 {
        100.0 * ((junction - latest) / room)
    } else {
        1e6
    };
    let by_curve = if found.allowed.0 > 0.0 {
        100.0 * found.used
    } else {
        1e6
    };
    let note = if by_heat >= by_curve {
        "the junction decides"
    } else {
        "the safe area decides"
    };
    Ok(Stress {
        value: by_heat.max(by_curve),
        rating: 100.0,
        witness: Witness {
            mains_v: case.mains_volts(mains),
            load: Some(load.name.clone()),
            frequency_hz: (!load.load.is_flat()).then_some(spot.frequency.0),
            amplitude_v: Some(found.amplitude.0),
            duty: Some(case.duty().shown.clone()),
            sink_c: Some(latest.0),
            case_c: Some(hot.0),
            junction_c: Some(junction.0),
            rail_v: Some(ready.rail.0),
            device_v: Some(found.point.volts.0),
            device_a: Some(found.point.amps.0),
            curve: Some("dc".to_owned()),
            ..case.witness()
        },
        working: vec![
            solved(
                "Tt",
                "sink when the cutout opens at the latest",
                "trip + tolerance + gradient",
                latest.0,
                "degC",
                "",
            ),
            solved(
                "P",
                "mean heat of the most loaded device at the duty",
                "",
                watts.0,
                "W",
                "energy balance of class B",
            ),
            solved(
                "Tcase",
                "its case then",
                "Tt + P·θcs",
                hot.0,
                "degC",
                "energy balance",
            ),
            solved(
                "Tj",
                "its junction then, mean",
                "Tcase + P·θjc",
                junction.0,
                "degC",
                "energy balance",
            ),
            solved(
                "used(Tj)",
                "of the junction's room above the sink",
                "(Tj - Tt)/(Tj,max - Tt)",
                by_heat,
                "%",
                "",
            ),
            solved(
                "used(soa)",
                "of the safe area at that case",
                "i/Iallowed",
                by_curve,
                "%",
                "log-log curve of the data sheet, derated",
            ),
        ],
        related: {
            let mut related = vec![Related {
                message: "into this load".to_owned(),
                site: load.site,
            }];
            related.extend(case.safe_area_sites(side, None));
            related
        },
        note: note.to_owned(),
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Unchecked};
    use crate::testing::{margin, report, tern60, verdict};

    /// 80 + 5 + 4 = 89 degC; case and junction by hand from the witness' own watts.
    #[test]
    fn held_at_the_latest_trip() {
        let m = margin(&tern60(&[]), RULE.name, "n16");
        assert!((m.witness.sink_c.unwrap() - 89.0).abs() < 1e-12);
        let watts = m.working.iter().find(|s| s.symbol == "P").unwrap().value;
        assert!((m.witness.case_c.unwrap() - (89.0 + 0.35 * watts)).abs() < 1e-9);
        assert!((m.witness.junction_c.unwrap() - (89.0 + 1.04 * watts)).abs() < 1e-9);
        assert_eq!(m.verdict, Ok);
    }

    /// A tolerance that is not stated is taken as 3 K, and listed.
    #[test]
    fn an_unstated_tolerance_is_assumed() {
        let text = tern60(&[("80 degC ±5 K on sink", "80 degC on sink")]);
        assert!((margin(&text, RULE.name, "n16").witness.sink_c.unwrap() - 87.0).abs() < 1e-12);
        assert!(
            report(&text).builds[0]
                .assumed
                .iter()
                .any(|a| a.key == "protection guard cutout tolerance")
        );
    }

    #[test]
    fn a_trip_above_the_junction_limit_protects_nothing() {
        assert_eq!(
            verdict(
                &tern60(&[(
                    "cutout             80 degC ±5 K on sink cooler 4 K",
                    "cutout             110 degC ±5 K on sink cooler 40 K"
                )]),
                RULE.name,
                "n16"
            ),
            Over
        );
    }

    #[test]
    fn an_unstated_gradient_is_named_and_none_has_no_margin() {
        let m = margin(
            &tern60(&[(" on sink cooler 4 K", " on sink")]),
            RULE.name,
            "n16",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (
                Unchecked,
                &["protection guard cutout cooler".to_owned()][..]
            )
        );
        let none = report(&tern60(&[(
            "cutout             80 degC ±5 K on sink cooler 4 K",
            "cutout             none",
        )]));
        assert!(!none.builds[0].margins.iter().any(|m| m.rule == RULE.name));
    }
}
