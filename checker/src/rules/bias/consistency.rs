//! bias.consistency: two statements of one idle current.

use crate::analysis::bias::idle_apart;
use crate::analysis::case::line_part;
use crate::analysis::{Case, Margins};
use crate::rule::Allow;

rule! {
    /// The assembly note says millivolts, the design says milliamps, and a resistor joins the two. When
    /// they disagree the builder sets the wrong current with a steady hand: half of it and the crossover
    /// is rough, twice of it and the amplifier idles at twice the heat. A factor of two is nearly always
    /// a meter across both resistors in place of one, or a figure per channel read as one per device.
    "bias.consistency",
    compares: "two statements of one idle current, beyond the tolerance of the emitter resistor, with each other",
    stress: "difference between two statements of the idle current",
    rating: "rounding",
    formula: "greater/lesser - 1, both as current of one device, less the tolerance of RE",
    source: "Ohm's law",
    reads: ["stage.idle", "stage.emitter", "stage.pairs"],
    sense: AtMost,
    unit: "%",
    // two printed digits are rounded by up to 5 % each; half as much again is another meaning
    allow: Allow::Fixed(10.0, 50.0), "rounding of two printed digits; common practice, no source",
    remedies: [],
    example: "tern60", [("11 mV across emitter", "22 mV across emitter")],
}

/// One margin for each stage that states its idle current more than once.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    for stage in case.stages() {
        let groups = stage.idle.get().map(Vec::as_slice).unwrap_or_default();
        for (n, a) in groups.iter().enumerate() {
            for b in groups.iter().skip(n + 1) {
                out.compare(
                    &RULE,
                    line_part(&stage.idle),
                    stage.idle.site(),
                    idle_apart(stage, a, b),
                );
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    fn idle(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[("50 mA per device, 11 mV across emitter", text)]),
            "bias.consistency",
            "out idle",
        )
    }

    #[test]
    fn figures_that_agree_are_silent() {
        // 11 mV/0.22 ohm = 50 mA
        assert_eq!(
            idle("50 mA per device, 11 mV across emitter").verdict,
            Verdict::Ok
        );
        // 12 mV/0.22 = 54.5 mA; at 0.22·1.05 it is 51.9 mA: 3.9 % beyond the resistor
        let m = idle("50 mA per device, 12 mV across emitter");
        assert!((m.stress.unwrap().value - (12.0 / 0.231 / 50.0 - 1.0) * 100.0).abs() < 1e-9);
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn a_factor_of_two_is_over_and_the_slip_is_named() {
        let m = idle("50 mA per device, 22 mV across emitter");
        assert_eq!(m.verdict, Verdict::Over);
        assert!(m.note.contains("across both"), "{}", m.note);
        let m = idle("50 mA per device, 50 mA per channel");
        assert_eq!(m.verdict, Verdict::Over);
        assert!(m.note.contains("per channel"), "{}", m.note);
    }

    #[test]
    fn a_quarter_more_is_thin() {
        // 50/40 - 1 = 25 %
        assert_eq!(
            idle("50 mA per device, 80 mA per channel").verdict,
            Verdict::Thin
        );
    }

    #[test]
    fn one_statement_is_not_compared() {
        let kit = tern60(&[("50 mA per device, 11 mV across emitter", "50 mA per device")]);
        assert!(
            report(&kit).builds[0]
                .margins
                .iter()
                .all(|m| m.rule != "bias.consistency")
        );
    }

    #[test]
    fn volts_across_a_resistor_that_is_not_stated_are_unchecked() {
        let kit = tern60(&[(
            "    emitter             0R22 ±5 % 5 W pulse 20 A  ref R21-R24  part \"WW5-0R22J\"\n",
            "",
        )]);
        let m = margin(&kit, "bias.consistency", "out idle");
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["stage out emitter".to_owned()])
        );
    }
}
