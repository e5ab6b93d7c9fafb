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
    /// Found when a bill of materials is held against the spec.
    List,
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

/// Declares the `RULE` of a file that finds a fault of text or data and compares no stress.
macro_rules! fault {
    (
        $(#[doc = $why:literal])+
        $name:literal,
        finds: $finds:literal,
        example: $kit:literal, [$(($old:literal, $new:literal)),+ $(,)?] $(,)?
    ) => {
        rule! {
            $(#[doc = $why])+
            $name,
            compares: $finds,
            stress: "",
            rating: "",
            formula: "",
            source: "definition of the language",
            reads: [],
            sense: Fault,
            unit: "",
            allow: crate::rule::Allow::None, "",
            remedies: [],
            example: $kit, [$(($old, $new)),+],
        }
    };
}

pub mod bias {
    //! The idle current.
    pub mod consistency;
    pub mod sensor_place;
    pub mod stability;
}
pub mod bom {
    //! The spec against the bill of materials.
    pub mod extra;
    pub mod missing;
    pub mod polarity;
    pub mod quantity;
    pub mod rating;
}
pub mod current {
    //! Amperes and volt-amperes against ratings.
    pub mod device_peak;
    pub mod device_share;
    pub mod emitter_mean;
    pub mod emitter_pulse;
    pub mod fuse_rms;
    pub mod rectifier_mean;
    pub mod rectifier_surge;
    pub mod reservoir_ripple;
    pub mod transformer_duty;
    pub mod transformer_sine;
}
pub mod data {
    //! The spec against itself.
    pub mod curve_against_power;
    pub mod curve_order;
    pub mod gain_order;
    pub mod reading;
    pub mod source;
    pub mod substitute_speed;
    pub mod thermal_against_power;
    pub mod unused;
}
pub mod drive {
    //! What the output stage asks of the stages before it.
    pub mod driver_current;
    pub mod driver_dissipation;
    pub mod driver_soa;
    pub mod input_level;
    pub mod output_gain_droop;
    pub mod slew;
    pub mod standing_current;
}
pub mod power {
    //! Claimed watts and stated rails against solved ones.
    pub mod low_frequency_sag;
    pub mod rails_stated;
    pub mod rated_power;
    pub mod ripple_headroom;
}
pub mod protection {
    //! A rail on the loudspeaker, and what stays charged.
    pub mod absent;
    pub mod bleed_down;
    pub mod bridge_detector;
    pub mod dc_fault_energy;
    pub mod dc_fault_false_trip;
    pub mod dc_fault_time;
    pub mod fuse_fault;
    pub mod offset_undetected;
    pub mod relay_dc;
    pub mod zobel;
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
pub mod syntax;
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
    pub mod driver;
    pub mod gate;
    pub mod rectifier_reverse;
    pub mod reservoir;
    pub mod voltage_stage;
}

macro_rules! build {
    ($($path:ident)::+) => { Registered { rule: &$($path)::+::RULE, check: Check::Build($($path)::+::check) } };
}

macro_rules! text {
    ($($path:ident)::+) => { Registered { rule: &$($path)::+::RULE, check: Check::Text($($path)::+::check) } };
}

macro_rules! reading {
    ($($path:ident)::+) => { Registered { rule: &$($path)::+::RULE, check: Check::Reading } };
}

macro_rules! list {
    ($($path:ident)::+) => { Registered { rule: &$($path)::+::RULE, check: Check::List } };
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
    build!(current::device_peak),
    build!(current::device_share),
    build!(current::emitter_mean),
    build!(current::emitter_pulse),
    build!(current::rectifier_mean),
    build!(current::rectifier_surge),
    build!(current::reservoir_ripple),
    build!(current::transformer_duty),
    build!(current::transformer_sine),
    build!(current::fuse_rms),
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
    build!(bias::stability),
    build!(bias::consistency),
    build!(bias::sensor_place),
    build!(drive::output_gain_droop),
    build!(drive::driver_current),
    build!(drive::driver_dissipation),
    build!(drive::driver_soa),
    build!(drive::standing_current),
    build!(drive::slew),
    build!(drive::input_level),
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
    build!(protection::dc_fault_time),
    build!(protection::dc_fault_energy),
    build!(protection::dc_fault_false_trip),
    build!(protection::offset_undetected),
    build!(protection::relay_dc),
    build!(protection::bridge_detector),
    build!(protection::fuse_fault),
    build!(protection::bleed_down),
    build!(protection::absent),
    build!(protection::zobel),
    build!(data::curve_order),
    build!(data::curve_against_power),
    build!(data::thermal_against_power),
    build!(data::gain_order),
    reading!(data::reading::unit_suspect),
    text!(data::unused),
    reading!(data::reading::duplicate),
    reading!(data::reading::stale_waiver),
    reading!(data::reading::missing),
    reading!(data::reading::used),
    reading!(data::reading::cycle),
    reading!(data::reading::table),
    reading!(data::reading::unknown_rule),
    build!(data::source),
    text!(data::substitute_speed),
    build!(bom::quantity),
    build!(bom::polarity),
    list!(bom::missing),
    list!(bom::extra),
    list!(bom::rating),
    reading!(syntax::text),
    reading!(syntax::version),
    reading!(syntax::statement),
    reading!(syntax::block),
    reading!(syntax::key),
    reading!(syntax::name),
    reading!(syntax::word),
    reading!(syntax::value),
    reading!(syntax::number),
    reading!(syntax::unit),
    reading!(syntax::tolerance),
    reading!(syntax::spelling),
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
        let mut wrong = Vec::new();
        for registered in ALL {
            let rule = registered.rule;
            let kit = testing::kit(rule.example.kit);
            let fires = |text: &str| {
                if matches!(registered.check, Check::List) {
                    // what the sound kit wants is the list that its example is held against
                    let rows = testing::crossed(text, &testing::template(&kit)).rows;
                    return rows
                        .iter()
                        .any(|r| r.rule == rule.name && r.verdict == Verdict::Over);
                }
                let report = testing::report(text);
                let margins = report.builds.iter().flat_map(|b| &b.margins);
                margins
                    .filter(|m| m.rule == rule.name)
                    .any(|m| matches!(m.verdict, Verdict::Over | Verdict::Thin))
                    || report.findings.iter().any(|f| f.rule == rule.name)
            };
            if fires(&kit) {
                wrong.push(format!(
                    "{} fires on the sound kit {}",
                    rule.name, rule.example.kit
                ));
            }
            if !fires(&testing::edited(&kit, rule.example.edits)) {
                wrong.push(format!("{} does not fire on its example", rule.name));
            }
        }
        assert!(wrong.is_empty(), "{wrong:#?}");
    }

    /// A false alarm costs as much trust as a miss: no demo kit that is meant to be sound is found
    /// fault with, in any of its builds.
    #[test]
    fn the_demo_kits_are_sound() {
        let mut wrong = Vec::new();
        for kit in ["tern60", "tern-family", "heron80-mosfet", "tern100-limiter"] {
            let report = testing::report(&testing::kit(kit));
            wrong.extend(
                report
                    .findings
                    .iter()
                    .map(|f| format!("{kit}: {} {}", f.rule, f.message)),
            );
            let margins = report.builds.iter().flat_map(|b| &b.margins);
            let faults = margins.filter(|m| matches!(m.verdict, Verdict::Over | Verdict::Thin));
            wrong.extend(faults.map(|m| format!("{kit}: {} {:?}", m.id, m.used_percent)));
        }
        assert!(wrong.is_empty(), "{wrong:#?}");
    }

    #[test]
    fn names_are_unique_and_every_record_is_whole() {
        for (at, registered) in ALL.iter().enumerate() {
            let r = registered.rule;
            assert!(
                !ALL[..at].iter().any(|other| other.rule.name == r.name),
                "{} twice",
                r.name
            );
            assert!(
                r.name.contains('.')
                    && r.why.len() > 60
                    && !r.compares.is_empty()
                    && !r.source.is_empty(),
                "{}",
                r.name
            );
            for key in r.reads {
                let (block, name) = key.split_once('.').unwrap();
                let known =
                    crate::vocabulary::block_kind(block).is_some_and(|b| b.key(name).is_some());
                assert!(known, "{} reads unknown key {key}", r.name);
            }
            for remedy in r.remedies {
                let (block, name) = remedy.key.split_once('.').unwrap();
                let key = crate::vocabulary::block_kind(block).and_then(|b| b.key(name));
                assert!(
                    key.is_some_and(|k| k.shape().item(remedy.slot).is_some()),
                    "{}: remedy {}",
                    r.name,
                    remedy.key
                );
            }
        }
    }
}
