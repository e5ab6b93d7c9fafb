//! protection.dc-fault-time: how long a rail stands on the loudspeaker.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::finding::{Verdict, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// When an output device fails short, the rail stands on the voice coil until the detector has seen
    /// it and the contact has opened. Fifty milliseconds a woofer usually forgives; a second later its
    /// coil has left the former. The filter that keeps bass from tripping the detector is also what
    /// makes it slow.
    "protection.dc-fault-time",
    compares: "time from a rail on the loudspeaker to the open contact",
    stress: "time to open",
    rating: "",
    formula: "t = -RC·ln(1 - Vth/Vu) + release",
    source: "charge of a capacitor through a resistor; 50 ms is common practice",
    reads: ["protection.detector", "protection.contacts", "protection.switch", "build.protection", "build.mains", "transformer.secondary", "transformer.regulation"],
    sense: AtMost,
    unit: "s",
    allow: Allow::Fixed(0.05, 0.2), "common practice, no source",
    remedies: [
        Remedy { key: "protection.detector", slot: "F", series: Series::E12, up: false },
        Remedy { key: "protection.detector", slot: "ohm", series: Series::E12, up: false },
    ],
    example: "tern60", [("1.5 V 22k 22 uF", "1.5 V 100k 22 uF")],
}

/// One margin for the detector, both polarities; without one `protection.absent` speaks.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let (part, site) = match case.build.protection.get() {
        Some(p) => (line_part(&p.detector), p.detector.site()),
        None => (
            line_part(&case.build.protection),
            case.build.protection.site(),
        ),
    };
    let off = match case.off(Mains::Nominal) {
        Ok(None) => return,
        Ok(Some(off)) => off,
        Err(needs) => return out.compare(&RULE, part, site, Err(needs)),
    };
    let rail = case
        .unsagged(Mains::Nominal)
        .map(|v| v.0)
        .unwrap_or_default();
    let detector = case
        .build
        .protection
        .get()
        .and_then(|p| p.detector.stated_at());
    let mut stress = Stress {
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            rail_v: Some(rail),
            ..case.witness()
        },
        working: vec![
            solved(
                "Vu",
                "unsagged rail on the loudspeaker",
                "V0 - Vd",
                rail,
                "V",
                "definition of the unsagged rail",
            ),
            stated(
                "Vth",
                "threshold, the greater",
                off.threshold.0,
                "V",
                detector,
            ),
            stated(
                "RC",
                "time constant of the filter",
                off.time_constant.0,
                "s",
                detector,
            ),
            solved(
                "trelease",
                "from the threshold to the open contact",
                "",
                off.release.0,
                "s",
                "data sheet of the relay, 10 ms where not stated",
            ),
        ],
        related: case.rail_sites(None),
        ..Stress::default()
    };
    let Some((detected, time)) = off.detected.zip(off.time()) else {
        stress.note = format!(
            "the threshold of {:.1} V is above the rail of {rail:.1} V: it never trips",
            off.threshold.0
        );
        return out.judge(&RULE, part, site, Verdict::Over, stress);
    };
    stress.value = time.0;
    stress.working.push(solved(
        "trest",
        "from rest to the threshold",
        "-RC·ln(1 - Vth/Vu)",
        detected.0,
        "s",
        "charge of a capacitor",
    ));
    if let Some(worst) = off.worst {
        stress.working.push(solved(
            "tworst",
            "the same just after music has charged it the other way",
            "RC·ln((Vu + Vth)/(Vu - Vth))",
            worst.0,
            "s",
            "charge of a capacitor",
        ));
    }
    out.compare(&RULE, part, site, Ok(stress));
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    fn detector(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("1.5 V 22k 22 uF watches output", text)]),
            "protection.dc-fault-time",
            "guard detector",
        )
    }

    #[test]
    fn charge_of_the_filter_and_release() {
        // RC = 0.484 s, Vu = √2·28·1.07 - 1.0 = 41.36984 V: -0.484·ln(1 - 1.5/41.36984) = 17.87513 ms,
        // and 12 ms of release
        let m = detector("1.5 V 22k 22 uF watches output");
        assert!(
            (m.stress.unwrap().value - 29.875_1e-3).abs() < 1e-7,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn the_slower_polarity_counts() {
        // below 3 V: -0.484·ln(1 - 3/41.36984) = 36.4325 ms, + 12 = 48.4 ms; below 3.2 V 50.96 ms
        assert_eq!(
            detector("1.5 V below 3.0 V 22k 22 uF watches output").verdict,
            Verdict::Ok
        );
        assert_eq!(
            detector("1.5 V below 3.2 V 22k 22 uF watches output").verdict,
            Verdict::Thin
        );
    }

    #[test]
    fn a_fifth_of_a_second_is_over() {
        // 100k: RC = 2.2 s, 81.25 ms + 12 = 93.3 ms; 220k: 178.75 + 12 = 190.8 ms; 270k: 231 ms
        assert_eq!(
            detector("1.5 V 100k 22 uF watches output").verdict,
            Verdict::Thin
        );
        assert_eq!(
            detector("1.5 V 220k 22 uF watches output").verdict,
            Verdict::Thin
        );
        assert_eq!(
            detector("1.5 V 270k 22 uF watches output").verdict,
            Verdict::Over
        );
    }

    #[test]
    fn a_policy_sets_the_time() {
        let kit = tern60(&[(
            "build mono {",
            "policy house from bench { detector-time 20 ms }\nbuild mono {\n    policy house",
        )]);
        let m = margin(&kit, "protection.dc-fault-time", "guard detector");
        assert_eq!(
            (m.allowance.unwrap().value, m.verdict),
            (0.02, Verdict::Thin)
        );
    }

    #[test]
    fn a_release_that_is_not_stated_is_ten_milliseconds_and_listed() {
        let kit = tern60(&[("series 2 release 12 ms coil", "series 2 coil")]);
        let m = margin(&kit, "protection.dc-fault-time", "guard detector");
        assert!((m.stress.unwrap().value - 27.875_1e-3).abs() < 1e-7);
        assert!(
            report(&kit).builds[0]
                .assumed
                .iter()
                .any(|a| a.key == "protection guard contacts release")
        );
    }

    #[test]
    fn no_detector_is_for_another_rule_and_an_unstated_one_is_unchecked() {
        let line = "    detector           1.5 V 22k 22 uF watches output\n";
        let none = report(&tern60(&[(line, "    detector none\n")]));
        assert!(
            none.builds[0]
                .margins
                .iter()
                .all(|m| m.rule != "protection.dc-fault-time")
        );
        let m = margin(
            &tern60(&[(line, "")]),
            "protection.dc-fault-time",
            "guard detector",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["protection guard detector".to_owned()]
            )
        );
    }
}
