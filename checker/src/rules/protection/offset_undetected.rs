//! protection.offset-undetected: what a coil takes from an offset that the detector does not see.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::fault::detector_model;
use crate::analysis::loads::Driven;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::{Related, Verdict, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// An offset just below the detector's threshold stays on the loudspeaker for ever: the cone sits off
    /// centre, the coil warms, and nobody is told. A volt or two is harmless to most coils; a threshold of
    /// ten volts, chosen so that bass cannot trip it, is a slow fire.
    "protection.offset-undetected",
    compares: "watts in a cold coil at the greatest offset that never trips the detector with its endurance",
    stress: "watts that stay undetected",
    rating: "endurance",
    formula: "P = Vth²/Re",
    source: "Ohm's law",
    reads: ["protection.detector", "load.endurance", "load.voice-coil", "load.dc", "build.ambient", "build.loads"],
    sense: AtMost,
    unit: "W",
    allow: Allow::Percent(100.0), "common practice, no source",
    remedies: [Remedy { key: "protection.detector", slot: "V", series: Series::TwoDigits, up: false }],
    example: "tern60", [("endurance          60 J", "endurance          0.2 W")],
}

/// One margin for each load that states what it stands: against its watts, or for information.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Ok(loads) = case.loads() else { return };
    for load in loads.iter().flatten() {
        let Some((_, watts)) = load.stated.endurance.get() else {
            continue;
        };
        let (part, site) = (
            line_part(&load.stated.endurance),
            load.stated.endurance.site(),
        );
        match (undetected(case, load), watts) {
            (Ok(None), _) => {}
            (Ok(Some(mut stress)), Some(watts)) => {
                stress.rating = watts.0;
                out.compare(&RULE, part, site, Ok(stress));
            }
            (Ok(Some(mut stress)), None) => {
                stress.note = format!("up to {:.2} W stay in the coil undetected", stress.value);
                out.judge(&RULE, part, site, Verdict::Ok, stress);
            }
            (Err(needs), _) => out.compare(&RULE, part, site, Err(needs)),
        }
    }
}

fn undetected(case: &Case<'_>, load: &Driven) -> Result<Option<Stress>, Needs> {
    let Some((protection, detector)) = case.detector()? else {
        return Ok(None);
    };
    let threshold = detector.above.max(detector.below);
    let coil = case.coil(load)?;
    let watts = detector_model(protection, detector, threshold)?
        .undetected(coil)
        .ok_or_else(|| Needs::because(format!("load {} has no d.c. resistance", load.name)))?;
    Ok(Some(Stress {
        value: watts.0,
        rating: f64::NAN,
        witness: Witness {
            load: Some(load.name.clone()),
            power_w: Some(watts.0),
            ..case.witness()
        },
        working: vec![
            stated(
                "Vth",
                "threshold, the greater",
                threshold.0,
                "V",
                protection.detector.stated_at(),
            ),
            solved(
                "Re",
                "cold coil",
                "Re·(1 + 0.0039·(Tmin - 20))",
                coil.0,
                "ohm",
                "temperature coefficient of copper",
            ),
            solved(
                "P",
                "stays in the coil",
                "Vth²/Re",
                watts.0,
                "W",
                "Ohm's law",
            ),
        ],
        related: vec![Related {
            message: "the threshold".to_owned(),
            site: protection.detector.site(),
        }],
        ..Stress::default()
    }))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    #[test]
    fn the_threshold_in_the_cold_coil() {
        // 1.5²/5.6699 = 0.396832 W
        let with = |text: &str| {
            margin(
                &tern60(&[("endurance          60 J", text)]),
                "protection.offset-undetected",
                "hall-8 endurance",
            )
        };
        let m = with("endurance          0.4 W");
        assert!((m.stress.unwrap().value - 0.396_832).abs() < 1e-6);
        assert_eq!(m.verdict, Verdict::Ok);
        assert_eq!(with("endurance          0.39 W").verdict, Verdict::Over);
        // joules say nothing of watts: information
        let m = with("endurance          60 J");
        assert_eq!((m.verdict, m.note.contains("0.40 W")), (Verdict::Ok, true));
    }
}
