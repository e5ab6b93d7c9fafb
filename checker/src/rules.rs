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
        remedies: [$($remedy:expr),* $(,)?] $(,)?
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
        };
    };
}

pub mod thermal {
    //! Temperatures and hours.
    pub mod sink;
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
    build!(thermal::sink),
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
