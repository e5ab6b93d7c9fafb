//! soa.limiter-music: the limit line must stay clear of every declared load.

use crate::analysis::case::line_part;
use crate::analysis::{Case, Margins};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A limiter set against a resistor acts on music: an ordinary loudspeaker draws its current while
    /// much of the supply still stands across the device, just where the limiter allows least. What is
    /// heard is a burst of spikes that no bench test shows, and kits come back. A warm sense transistor
    /// turns on earlier, so the line is taken hot.
    "soa.limiter-music",
    compares: "current at which the limiter acts with the current that each declared load draws, at the nearest point",
    stress: "limit line over current, least",
    rating: "touching",
    formula: "least Iline(v(t))/i(t) over angle, frequency and load; Von hot, the most loaded device sensed",
    source: "Kirchhoff's current law at the sense base; clearance of 10 % common practice, no source",
    reads: ["protection.limit-line", "protection.limiter", "protection.limiter-break", "build.protection", "build.loads", "load.minimum", "load.angle", "amplifier.drop", "stage.emitter", "stage.pairs", "build.mains"],
    sense: AtLeast,
    unit: "1",
    allow: Allow::Fixed(1.1, 1.0), "common practice, no source",
    remedies: [
        Remedy { key: "protection.limiter", slot: "base", series: Series::E24, up: false },
        Remedy { key: "protection.limiter", slot: "rail", series: Series::E24, up: true },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("10 A at 0 V, 10 A at 15 V, 6.4 A at 30 V, 3.6 A at 50 V", "3 A at 0 V, 3 A at 50 V")],
}

/// One margin for the limiter: the declared load that comes nearest. A limiter known not to be fitted
/// has none.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    if case.no_limiter() {
        return;
    }
    let (part, site) = match case.build.protection.get() {
        None => (
            line_part(&case.build.protection),
            case.build.protection.site(),
        ),
        Some(p) if p.limiter.get().is_none() && p.limit_line.get().is_some() => {
            (line_part(&p.limit_line), p.limit_line.site())
        }
        Some(p) => (line_part(&p.limiter), p.limiter.site()),
    };
    for played in case.played() {
        if let Some(open) = played
            .as_ref()
            .ok()
            .and_then(|(load, _)| case.unknown_part(load))
        {
            out.compare(&RULE, part.clone(), site, Err(open));
        }
        for side in case.unlike_banks() {
            let stress = played
                .clone()
                .and_then(|(load, heat)| case.clearance_stress(heat, load, *side));
            out.compare(&RULE, part.clone(), site, stress);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Thin};
    use crate::testing::{margin, tern60, verdict};

    const LINE: &str = "    limit-line bank    10 A at 0 V, 10 A at 15 V, 6.4 A at 30 V, 3.6 A at 50 V, 1.8 A at 70 V, 1 A at 95 V\n";
    const ALONE: (&str, &str) = (
        "loads              hall-8, bench-8",
        "loads              bench-8",
    );

    /// A flat line of the bank is nearest at the peak: bench-8 at -5 % draws (41.3699 - 1.8)/(7.6 + 0.285714) =
    /// 5.01792 A at nominal mains. 5.52 A is 1.10006 times that, 5.51 A 1.09806, 5.01 A 0.9984. Hand calculation.
    #[test]
    fn a_flat_line_against_the_peak() {
        let with = |line: &str| tern60(&[ALONE, (LINE, line)]);
        let m = margin(
            &with("    limit-line bank    5.52 A at 0 V\n"),
            RULE.name,
            "guard limit-line",
        );
        assert!(
            (m.stress.unwrap().value - 5.52 / 5.01792).abs() < 1e-5,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Ok);
        assert_eq!(
            verdict(
                &with("    limit-line bank    5.51 A at 0 V\n"),
                RULE.name,
                "guard limit-line"
            ),
            Thin
        );
        assert_eq!(
            verdict(
                &with("    limit-line bank    5.01 A at 0 V\n"),
                RULE.name,
                "guard limit-line"
            ),
            Over
        );
    }

    /// A line of the device is compared with the most loaded device, which carries more than half.
    #[test]
    fn a_device_line_meets_the_most_loaded() {
        let m = margin(
            &tern60(&[ALONE, (LINE, "    limit-line device   3 A at 0 V\n")]),
            RULE.name,
            "guard limit-line",
        );
        let ratio = m.stress.unwrap().value;
        assert!(
            ratio < 3.0 / (5.01792 / 2.0) && ratio > 3.0 / (5.01792 * 0.55),
            "{ratio}"
        );
    }

    /// R3 so small that no current is left at both rails: 0.65 V turn-on, 1 k from the rail.
    #[test]
    fn a_line_that_ends_before_both_rails_acts_with_no_load() {
        let m = margin(
            &tern60(&[
                ALONE,
                (
                    LINE,
                    "    limiter            sense 220R base 220R rail 4k7\n",
                ),
            ]),
            RULE.name,
            "guard limiter",
        );
        assert_eq!(m.verdict, Over);
        assert!(m.note.contains("no load"), "{}", m.note);
    }
}
