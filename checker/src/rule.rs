//! What a rule is: the record that the check, `explain`, hover, report metadata and the rule
//! reference are all read from. Must not know any particular rule.

use crate::finding::{Measure, Verdict};

/// Which way a comparison goes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sense {
    /// The stress must stay at or below the allowance: used = 100 x stress / allowance.
    AtMost,
    /// The figure must reach the allowance (power, life, time to act): used = 100 x allowance / figure.
    AtLeast,
    /// Temperatures: used = 100 x (T - ambient) / (allowed - ambient).
    Temperature,
    /// Nothing is compared: the rule reports a fault of the text or the data.
    Fault,
}

/// How a policy makes an allowance out of a rating.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Allow {
    /// A share of the rating, per cent.
    Percent(f64),
    /// This far below a rated temperature, K, and never above the second figure, degC.
    Below(f64, f64),
    /// A figure of its own, with the hard limit that stands for a rating, both in the rule's unit.
    /// For [`Sense::AtLeast`] the hard limit is the lower one.
    Fixed(f64, f64),
    /// Nothing to allow: a fault of text or data.
    None,
}

/// What can be edited to clear a margin: a slot of a key, and what a person can buy or set there.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Remedy {
    /// Kind of block and key, `stage.pairs`.
    pub key: &'static str,
    /// The slot of the key's shape that is edited, `n`, `ohm`, `V`.
    pub slot: &'static str,
    /// Which values exist.
    pub series: Series,
    /// Whether a larger value helps.
    pub up: bool,
}

/// The values that a person can buy or set.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Series {
    /// Whole numbers.
    Count,
    /// E12.
    E12,
    /// E24.
    E24,
    /// R10 (fuses).
    R10,
    /// Preferred capacitor voltages.
    CapacitorVolts,
    /// Reservoir capacitances as sold.
    Reservoir,
    /// Usual transformer sizes, VA.
    TransformerVa,
    /// Usual secondary volts.
    SecondaryVolts,
    /// Resistor watts as sold.
    ResistorWatts,
    /// Heatsinks, K/W in steps of about a tenth.
    Heatsink,
    /// Two significant digits: a rating to look for in data sheets.
    TwoDigits,
}

/// A kit made to trip a rule: replacements of text in a demo kit.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Example {
    /// The demo kit it starts from, `tern60`.
    pub kit: &'static str,
    /// What is replaced by what. The replacement is the mistake.
    pub edits: &'static [(&'static str, &'static str)],
}

/// One rule. The check itself is added by [`crate::rules`], so that whoever only describes rules
/// needs no physics.
#[derive(Clone, Copy, Debug)]
pub struct Rule {
    /// `voltage.device`.
    pub name: &'static str,
    /// What is compared, one line: `collector-emitter voltage against V(BR)CEO`.
    pub compares: &'static str,
    /// Why it matters and what failing costs, one paragraph.
    pub why: &'static str,
    /// The stress as a noun phrase for messages: `rail to rail, no load, high mains`.
    pub stress: &'static str,
    /// The rating as a noun phrase for messages: `V(BR)CEO`.
    pub rating: &'static str,
    /// The formula as text.
    pub formula: &'static str,
    /// Its published source, or `common practice, no source`.
    pub source: &'static str,
    /// Vocabulary keys it reads, `device.vceo`.
    pub reads: &'static [&'static str],
    /// Which way it compares.
    pub sense: Sense,
    /// Unit of stress, rating and allowance; empty for a fault.
    pub unit: &'static str,
    /// The allowance of policy `bench`.
    pub allow: Allow,
    /// Where that figure comes from.
    pub allow_source: &'static str,
    /// What can be edited to clear it, best first.
    pub remedies: &'static [Remedy],
    /// A kit that it finds fault with.
    pub example: Example,
}

impl Rule {
    /// `voltage` of `voltage.device`.
    #[must_use]
    pub fn family(&self) -> &'static str {
        self.name.split('.').next().unwrap_or(self.name)
    }
}

/// A comparison made: allowance, verdict and used.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Compared {
    /// The rating.
    pub rating: Measure,
    /// The allowance.
    pub allowance: Measure,
    /// The outcome.
    pub verdict: Verdict,
    /// Used, per cent; `None` where no rating is left.
    pub used_percent: Option<f64>,
}

/// Compare a stress with a rating under an allowance. `ambient` is read by [`Sense::Temperature`].
///
/// Rating and stress are in the rule's unit. `None` if a number is not finite: no NaN or infinity
/// ever reaches a margin.
#[must_use]
pub fn compare(
    rule: &Rule,
    allow: Allow,
    stress: f64,
    rating: f64,
    ambient: f64,
) -> Option<Compared> {
    let (allowance, rating) = match allow {
        Allow::Percent(p) => (rating * p / 100.0, rating),
        Allow::Below(k, most) => ((rating - k).min(most), rating),
        Allow::Fixed(a, hard) => (a, hard),
        Allow::None => return None,
    };
    if ![stress, rating, allowance, ambient]
        .iter()
        .all(|x| x.is_finite())
    {
        return None;
    }
    let verdict = match rule.sense {
        Sense::AtLeast if stress < rating.min(allowance) => Verdict::Over,
        Sense::AtLeast if stress < allowance => Verdict::Thin,
        Sense::AtLeast | Sense::Fault => Verdict::Ok,
        Sense::AtMost | Sense::Temperature if stress > rating.max(allowance) => Verdict::Over,
        Sense::AtMost | Sense::Temperature if stress > allowance => Verdict::Thin,
        Sense::AtMost | Sense::Temperature => Verdict::Ok,
    };
    let (over, under) = match rule.sense {
        Sense::AtLeast => (allowance, stress),
        Sense::Temperature => (stress - ambient, allowance - ambient),
        Sense::AtMost | Sense::Fault => (stress, allowance),
    };
    let used_percent = if under > 0.0 {
        Some(100.0 * over / under)
    } else {
        None
    };
    let used_percent = used_percent.filter(|u| u.is_finite());
    // no rating left, yet something is asked of it
    let verdict = if used_percent.is_none() && over > 0.0 {
        Verdict::Over
    } else {
        verdict
    };
    Some(Compared {
        rating: Measure::new(rating, rule.unit),
        allowance: Measure::new(allowance, rule.unit),
        verdict,
        used_percent,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    const RULE: Rule = Rule {
        name: "voltage.device",
        compares: "",
        why: "",
        stress: "",
        rating: "",
        formula: "",
        source: "",
        reads: &[],
        sense: Sense::AtMost,
        unit: "V",
        allow: Allow::Percent(90.0),
        allow_source: "",
        remedies: &[],
        example: Example {
            kit: "",
            edits: &[],
        },
    };

    #[test]
    fn verdicts_meet_at_the_limits_before_rounding() {
        let verdict = |stress| {
            compare(&RULE, RULE.allow, stress, 100.0, 0.0)
                .unwrap()
                .verdict
        };
        assert_eq!(verdict(90.0), Verdict::Ok);
        assert_eq!(verdict(90.000_001), Verdict::Thin);
        assert_eq!(verdict(100.0), Verdict::Thin);
        assert_eq!(verdict(100.000_001), Verdict::Over);
    }

    #[test]
    fn no_rating_left_is_over() {
        let c = compare(&RULE, RULE.allow, 1.0, 0.0, 0.0).unwrap();
        assert_eq!((c.verdict, c.used_percent), (Verdict::Over, None));
        assert_eq!(compare(&RULE, RULE.allow, f64::NAN, 1.0, 0.0), None);
    }

    #[test]
    fn temperatures_count_from_ambient() {
        let rule = Rule {
            sense: Sense::Temperature,
            allow: Allow::Below(25.0, f64::INFINITY),
            ..RULE
        };
        let c = compare(&rule, rule.allow, 100.0, 150.0, 40.0).unwrap();
        let want = 100.0 * 60.0 / 85.0; // (100 - 40) / (150 - 25 - 40)
        assert!((c.used_percent.unwrap() - want).abs() < 1e-12);
    }

    #[test]
    fn more_is_better_counts_the_other_way() {
        let rule = Rule {
            sense: Sense::AtLeast,
            allow: Allow::Fixed(10_000.0, 2_000.0),
            ..RULE
        };
        let verdict = |h| compare(&rule, rule.allow, h, 0.0, 0.0).unwrap().verdict;
        assert_eq!(verdict(10_000.0), Verdict::Ok);
        assert_eq!(verdict(9_999.0), Verdict::Thin);
        assert_eq!(verdict(1_999.0), Verdict::Over);
        assert_eq!(
            compare(&rule, rule.allow, 5_000.0, 0.0, 0.0)
                .unwrap()
                .used_percent,
            Some(200.0)
        );
    }
}
