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

pub mod voltage {
    //! Volts against breakdown and rated volts.
    pub mod device;
    pub mod driver;
    pub mod gate;
    pub mod rectifier_reverse;
    pub mod reservoir;
    pub mod voltage_stage;
}
pub mod power {
    //! Claimed watts and stated rails against solved ones.
    pub mod low_frequency_sag;
    pub mod rails_stated;
    pub mod rated_power;
    pub mod ripple_headroom;
}
pub mod current {
    //! Amperes and volt-amperes against ratings.
    pub mod fuse_rms;
    pub mod rectifier_mean;
    pub mod rectifier_surge;
    pub mod reservoir_ripple;
    pub mod transformer_duty;
    pub mod transformer_sine;
}
pub mod thermal {
    //! Temperatures and hours.
    pub mod sink;
}
pub mod supply {
    //! The mains side: taps, fuses, switch-on, sharing.
    pub mod bypass_stuck;
    pub mod core_flux;
    pub mod fuse_band;
    pub mod fuse_inrush;
    pub mod fuse_per_transformer;
    pub mod inrush_resistor_energy;
    pub mod mains_tap;
    pub mod shared_count;
    pub mod soft_start_absent;
    pub mod soft_start_timing;
}

macro_rules! build {
    ($($path:ident)::+) => { Registered { rule: &$($path)::+::RULE, check: Check::Build($($path)::+::check) } };
}

/// Every rule.
pub static ALL: &[Registered] = &[
    build!(voltage::device),
    build!(voltage::driver),
    build!(voltage::voltage_stage),
    build!(voltage::reservoir),
    build!(voltage::rectifier_reverse),
    build!(voltage::gate),
    build!(power::rated_power),
    build!(power::rails_stated),
    build!(power::ripple_headroom),
    build!(power::low_frequency_sag),
    build!(current::rectifier_mean),
    build!(current::rectifier_surge),
    build!(current::reservoir_ripple),
    build!(current::transformer_duty),
    build!(current::transformer_sine),
    build!(current::fuse_rms),
    build!(thermal::sink),
    build!(supply::mains_tap),
    build!(supply::core_flux),
    build!(supply::shared_count),
    build!(supply::fuse_band),
    build!(supply::fuse_per_transformer),
    build!(supply::fuse_inrush),
    build!(supply::soft_start_absent),
    build!(supply::soft_start_timing),
    build!(supply::bypass_stuck),
    build!(supply::inrush_resistor_energy),
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

    /// A false alarm costs as much trust as a miss: the demo kits come out with nothing to say.
    #[test]
    fn the_demo_kits_are_sound() {
        for kit in ["tern60", "tern-family", "tern-fet"] {
            let report = testing::report(&testing::kit(kit));
            assert_eq!(report.findings, [], "{kit}");
            for margin in report.builds.iter().flat_map(|b| &b.margins) {
                assert_eq!(margin.verdict, Verdict::Ok, "{kit}: {} {:?}", margin.id, margin.needs);
            }
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
