//! protection.dc-fault-false-trip: whether loud bass looks like a fault to the detector.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::fault::detector_model;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::both;
use crate::finding::{Related, Witness};
use crate::physics::unit::Hertz;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A filter that is quick to see a fault also passes loud bass. The relay then chatters on an organ
    /// pedal, its contacts arc under full current, and one day they weld shut, which is the one thing
    /// the protection must never do.
    "protection.dc-fault-false-trip",
    compares: "frequency below which full output trips the detector, high mains, with the bottom of the band",
    stress: "full output trips the detector below",
    rating: "twice the bottom of the band",
    formula: "f = √((V/Vth)² - 1)/(2π·RC), V = Vu - drop(0); allowance the bottom of the band",
    source: "response of one resistor and one capacitor",
    reads: ["protection.detector", "amplifier.band", "amplifier.drop", "build.protection", "build.mains", "transformer.secondary"],
    sense: AtMost,
    unit: "Hz",
    // half of twice the bottom of the band: still tripping an octave up is over
    allow: Allow::Percent(50.0), "a trip within the band is a fault; an octave up is common practice, no source",
    remedies: [
        Remedy { key: "protection.detector", slot: "F", series: Series::E12, up: true },
        Remedy { key: "protection.detector", slot: "ohm", series: Series::E12, up: true },
    ],
    example: "tern60", [("1.5 V 22k 22 uF", "1.5 V 22k 4u7")],
}

/// One margin for the detector: the more sensitive polarity.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let (part, site) = match case.build.protection.get() {
        Some(p) => (line_part(&p.detector), p.detector.site()),
        None => (
            line_part(&case.build.protection),
            case.build.protection.site(),
        ),
    };
    match stress(case) {
        Ok(None) => {}
        Ok(Some(stress)) => out.compare(&RULE, part, site, Ok(stress)),
        Err(needs) => out.compare(&RULE, part, site, Err(needs)),
    }
}

fn stress(case: &Case<'_>) -> Result<Option<Stress>, Needs> {
    let Some((protection, detector)) = case.detector()? else {
        return Ok(None);
    };
    let (peak, band) = both(case.greatest_output(Mains::High), case.band())?;
    let threshold = detector.above.min(detector.below);
    let model = detector_model(protection, detector, threshold)?;
    // never above the threshold: no frequency trips it
    let trips = model.trips_below(peak).unwrap_or(Hertz::ZERO);
    Ok(Some(Stress {
        value: trips.0,
        rating: 2.0 * band.bottom().0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            frequency_hz: Some(trips.0),
            amplitude_v: Some(peak.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "V",
                "greatest peak output, high mains",
                "Vu - drop(0)",
                peak.0,
                "V",
                "drop as stated",
            ),
            stated(
                "Vth",
                "threshold, the lesser",
                threshold.0,
                "V",
                protection.detector.stated_at(),
            ),
            stated(
                "RC",
                "time constant of the filter",
                (detector.ohm * detector.farad).0,
                "s",
                protection.detector.stated_at(),
            ),
            solved(
                "f",
                "a full sine below this trips it",
                "√((V/Vth)² - 1)/(2π·RC)",
                trips.0,
                "Hz",
                "response of one resistor and one capacitor",
            ),
            stated(
                "fmin",
                "bottom of the band",
                band.bottom().0,
                "Hz",
                case.build.amplifier.band.stated_at(),
            ),
        ],
        related: vec![Related {
            message: "the bottom of the band".to_owned(),
            site: case.build.amplifier.band.site(),
        }],
        ..Stress::default()
    }))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn detector(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("1.5 V 22k 22 uF watches output", text)]),
            "protection.dc-fault-false-trip",
            "guard detector",
        )
    }

    #[test]
    fn full_output_trips_below_ten_hertz() {
        // V = 45.60682 - 1.8 = 43.80682 V; V/Vth = 29.20455; √(852.9055 - 1)/(2π·0.484) = 29.18742/3.041062
        // = 9.59777 Hz
        let m = detector("1.5 V 22k 22 uF watches output");
        assert!(
            (m.stress.unwrap().value - 9.597_8).abs() < 1e-4,
            "{:?}",
            m.stress
        );
        assert!((m.allowance.unwrap().value - 20.0).abs() < 1e-9);
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn an_octave_into_the_band_is_over() {
        // 9.598 Hz·22 uF/C: 10 uF 21.1 Hz, 4.7 uF 44.9 Hz
        assert_eq!(
            detector("1.5 V 22k 10 uF watches output").verdict,
            Verdict::Thin
        );
        assert_eq!(
            detector("1.5 V 22k 4u7 watches output").verdict,
            Verdict::Over
        );
        // the more sensitive polarity counts
        assert_eq!(
            detector("1.5 V below 0.5 V 22k 22 uF watches output").verdict,
            Verdict::Thin
        );
    }

    #[test]
    fn a_detector_that_is_not_stated_is_unchecked() {
        let m = margin(
            &tern60(&[(
                "    detector           1.5 V 22k 22 uF watches output\n",
                "",
            )]),
            "protection.dc-fault-false-trip",
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
