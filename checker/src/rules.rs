//! The rules, one file each, in report order. This list is the only registry.
//! A rule compares; it does no physics of its own.

use crate::analysis::{Case, Margins};
use crate::build::Project;
use crate::finding::Finding;
use crate::rule::Rule;

/// What a rule looks at.
#[derive(Clone, Copy)]
pub enum Check {
    /// One solved build: gives margins.
    Build(fn(&Case<'_>, &mut Margins<'_>)),
    /// The text and data as a whole: gives findings.
    Text(fn(&Project, &mut Vec<Finding>)),
    /// Found while the text is read; there is nothing to run afterwards.
    Reading,
}

/// A rule with its check.
#[derive(Clone, Copy)]
pub struct Registered {
    /// What it is.
    pub rule: &'static Rule,
    /// What it looks at.
    pub check: Check,
}

/// Declares the `RULE` of a file. The doc comment is the rule's "why": `explain`, hover, report
/// metadata and the rule reference all show it.
macro_rules! rule {
    (
        $(#[doc = $why:literal])+
        $name:literal,
        compares: $compares:literal,
        stress: $stress:literal,
        rating: $rating:literal,
        formula: $formula:literal,
        source: $source:literal,
        reads: [$($reads:literal),* $(,)?],
        sense: $sense:ident,
        unit: $unit:literal,
        allow: $allow:expr, $allow_source:literal,
        remedies: [$($remedy:expr),* $(,)?],
        example: $kit:literal, [$(($old:literal, $new:literal)),+ $(,)?] $(,)?
    ) => {
        $(#[doc = $why])+
        pub const RULE: crate::rule::Rule = crate::rule::Rule {
            name: $name,
            compares: $compares,
            why: concat!($($why, "\n"),+),
            stress: $stress,
            rating: $rating,
            formula: $formula,
            source: $source,
            reads: &[$($reads),*],
            sense: crate::rule::Sense::$sense,
            unit: $unit,
            allow: $allow,
            allow_source: $allow_source,
            remedies: &[$($remedy),*],
            example: crate::rule::Example { kit: $kit, edits: &[$(($old, $new)),+] },
        };
    };
}

pub mod current {
    //! Amperes and the watts they make.
    pub mod device_peak;
    pub mod device_share;
    pub mod emitter_mean;
    pub mod emitter_pulse;
}
pub mod soa {
    //! Loci and limit lines against derated safe-area curves.
    pub mod idle;
    pub mod limiter_music;
    pub mod limiter_soa;
    pub mod low_frequency;
    pub mod pulse_dwell;
    pub mod reactive;
    pub mod resistive;
    pub mod short_circuit;
}
pub mod thermal {
    //! Temperatures and hours.
    pub mod cutout_nuisance;
    pub mod cutout_protects;
    pub mod driver;
    pub mod enclosure;
    pub mod junction;
    pub mod junction_peak;
    pub mod reservoir_life;
    pub mod resistor;
    pub mod sink;
    pub mod touch;
}
pub mod voltage {
    //! Volts against breakdown and rated volts.
    pub mod device;
}

macro_rules! build {
    ($($path:ident)::+) => { Registered { rule: &$($path)::+::RULE, check: Check::Build($($path)::+::check) } };
}

/// Every rule.
pub static ALL: &[Registered] = &[
    build!(voltage::device),
    build!(current::device_peak),
    build!(current::device_share),
    build!(current::emitter_mean),
    build!(current::emitter_pulse),
    build!(soa::resistive),
    build!(soa::reactive),
    build!(soa::idle),
    build!(soa::pulse_dwell),
    build!(soa::low_frequency),
    build!(soa::short_circuit),
    build!(soa::limiter_soa),
    build!(soa::limiter_music),
    build!(thermal::junction),
    build!(thermal::junction_peak),
    build!(thermal::sink),
    build!(thermal::touch),
    build!(thermal::driver),
    build!(thermal::cutout_protects),
    build!(thermal::cutout_nuisance),
    build!(thermal::reservoir_life),
    build!(thermal::resistor),
    build!(thermal::enclosure),
];

/// Every rule's record, in report order.
pub fn all() -> impl Iterator<Item = &'static Rule> {
    ALL.iter().map(|r| r.rule)
}

/// The rule of this name.
#[must_use]
pub fn find(name: &str) -> Option<&'static Rule> {
    all().find(|r| r.name == name)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::finding::Verdict;
    use crate::testing;

    /// Every rule finds fault with its own example, and not with the kit the example starts from.
    #[test]
    fn every_rule_trips_on_its_example_only() {
        for registered in ALL {
            let rule = registered.rule;
            let kit = testing::kit(rule.example.kit);
            let fires = |text: &str| {
                let report = testing::report(text);
                let margins = report.builds.iter().flat_map(|b| &b.margins);
                margins.filter(|m| m.rule == rule.name).any(|m| matches!(m.verdict, Verdict::Over | Verdict::Thin))
                    || report.findings.iter().any(|f| f.rule == rule.name)
            };
            assert!(!fires(&kit), "{} fires on the sound kit {}", rule.name, rule.example.kit);
            assert!(fires(&testing::edited(&kit, rule.example.edits)), "{} does not fire on its example", rule.name);
        }
    }

    #[test]
    fn names_are_unique_and_every_record_is_whole() {
        for (at, registered) in ALL.iter().enumerate() {
            let r = registered.rule;
            assert!(!ALL[..at].iter().any(|other| other.rule.name == r.name), "{} twice", r.name);
            assert!(r.name.contains('.') && r.why.len() > 80 && !r.compares.is_empty() && !r.source.is_empty(), "{}", r.name);
            for key in r.reads {
                let (block, name) = key.split_once('.').unwrap();
                let known = crate::vocabulary::block_kind(block).is_some_and(|b| b.key(name).is_some());
                assert!(known, "{} reads unknown key {key}", r.name);
            }
            for remedy in r.remedies {
                let (block, name) = remedy.key.split_once('.').unwrap();
                let key = crate::vocabulary::block_kind(block).and_then(|b| b.key(name));
                assert!(key.is_some_and(|k| k.shape().item(remedy.slot).is_some()), "{}: remedy {}", r.name, remedy.key);
            }
        }
    }
}
