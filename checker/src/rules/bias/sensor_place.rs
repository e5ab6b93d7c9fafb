//! bias.sensor-place: what the bias sensor is screwed to.

use crate::analysis::case::line_part;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::Verdict;
use crate::rule::Allow;

rule! {
    /// The bias sensor turns the idle current down as the part that sets it gets hot, if it feels that
    /// part: the output devices of an emitter follower, the drivers of a compound pair. Beside the board
    /// or on the wrong sink it compensates something else, and the idle current wanders with every loud
    /// passage. How far it goes is `bias.stability`; this rule says that it is in the wrong place.
    "bias.sensor-place",
    compares: "the place of the bias sensor with the part that sets the idle current",
    stress: "",
    rating: "",
    formula: "",
    source: "common practice, no source",
    reads: ["stage.sensor", "stage.own-sink", "stage.connection", "device.structure"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("sensor              on sink", "sensor              on driver")],
}

/// One margin for the sensor of the output stage.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    if stage.idle.none {
        return;
    }
    let (part, site) = (line_part(&stage.sensor), stage.sensor.site());
    match place(case) {
        Err(needs) => out.compare(&RULE, part, site, Err(needs)),
        Ok(wrong) => {
            let verdict = if wrong.is_some() {
                Verdict::Thin
            } else {
                Verdict::Ok
            };
            out.judge(
                &RULE,
                part,
                site,
                verdict,
                Stress {
                    note: wrong.unwrap_or_default().to_owned(),
                    ..Stress::default()
                },
            );
        }
    }
}

/// What is wrong with the place; `None` where it is right.
fn place(case: &Case<'_>) -> Result<Option<&'static str>, Needs> {
    let stage = case.output();
    if stage.upper.structure.get() == Some(&"lateral")
        && stage.lower.structure.get() == Some(&"lateral")
    {
        // a lateral MOSFET turns itself down
        return Ok(None);
    }
    if stage.sensor.none {
        return Ok(Some(
            "no sensor is fitted: nothing turns the idle current down as the devices warm",
        ));
    }
    let on = stage.sensor.need()?.0;
    if stage.connection != "compound-pair" {
        let wrong = "the output devices set the idle current, and the sensor is not on their sink: \
             `sensor on sink` or `on device` is";
        return Ok((!case.sensor_on_sink()?).then_some(wrong));
    }
    let driver = case
        .build
        .amplifier
        .driver
        .as_ref()
        .ok_or_else(|| case.build.amplifier.driver_field.missing())?;
    let together = case.on_output_sink(driver);
    let right = match on {
        "driver" => true,
        "sink" | "device" => together,
        _ => false,
    };
    Ok((!right).then_some(
        "the drivers of a compound pair set the idle current, and the sensor is not on them: \
         `sensor on driver` is",
    ))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn on(place: &str, connection: &str) -> crate::finding::Margin {
        let kit = tern60(&[
            ("sensor              on sink", place),
            ("connection          emitter-follower", connection),
        ]);
        margin(&kit, "bias.sensor-place", "out sensor")
    }

    #[test]
    fn an_emitter_follower_is_watched_at_its_output_devices() {
        let follower = "connection          emitter-follower";
        assert_eq!(on("sensor on sink", follower).verdict, Verdict::Ok);
        assert_eq!(on("sensor on device", follower).verdict, Verdict::Ok);
        // the drivers of the kit have a sink of their own
        assert_eq!(on("sensor on driver", follower).verdict, Verdict::Thin);
        assert_eq!(on("sensor on board", follower).verdict, Verdict::Thin);
        assert_eq!(on("sensor none", follower).verdict, Verdict::Thin);
    }

    #[test]
    fn a_compound_pair_is_watched_at_its_drivers() {
        let pair = "connection          compound-pair";
        assert_eq!(on("sensor on driver", pair).verdict, Verdict::Ok);
        assert_eq!(on("sensor on sink", pair).verdict, Verdict::Thin);
    }

    #[test]
    fn a_place_that_is_not_stated_is_unchecked() {
        let m = margin(
            &tern60(&[("    sensor              on sink\n", "")]),
            "bias.sensor-place",
            "out sensor",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["stage out sensor".to_owned()])
        );
    }
}
