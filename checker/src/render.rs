//! How a report is shown: the words, the terminal, and every form another program reads.
//! Must not know how any number was computed, and never changes a verdict.

pub mod annotations;
pub mod compare;
pub mod csv;
pub mod escape;
pub mod explain;
pub mod figure;
pub mod html;
pub mod json;
pub mod language;
pub mod margins;
pub mod markdown;
pub mod message;
pub mod parts;
pub mod run;
pub mod sarif;
pub mod shown;
pub mod size;
pub mod spread;
mod table;
pub mod terminal;
pub mod test_xml;

#[cfg(test)]
mod sample;
#[cfg(test)]
mod tests;

use std::fmt::Write;

use crate::rule::Rule;
use crate::rules;

/// The caution that stands under every margin summary and every page.
pub const CAUTION: &str = "Caution: mains wiring and charged reservoirs kill. Isolate, discharge and \
measure before touching; fuse and earth as the local wiring code demands; have mains work done or checked by \
someone licensed where the law says so. A clean report is arithmetic on the numbers given, not a certificate.";

/// The record of a rule. Tests of the forms bring records of their own, so that what they show does
/// not change with every rule.
fn rule(name: &str) -> Option<&'static Rule> {
    #[cfg(test)]
    if let Some(rule) = sample::rule(name) {
        return Some(rule);
    }
    rules::find(name)
}

/// What stands over a build whose solution did not converge.
const UNSETTLED: &str = "The coupled solution did not settle: nothing here is to be relied on.";

/// Words filled into lines of a width, each after an indent.
fn filled(out: &mut String, text: &str, indent: usize, width: usize) -> std::fmt::Result {
    let mut column = 0;
    for word in text.split_whitespace() {
        let length = word.chars().count();
        if column > 0 && column + 1 + length > width {
            writeln!(out)?;
            column = 0;
        }
        if column == 0 {
            write!(out, "{:indent$}{word}", "")?;
            column = indent + length;
        } else {
            write!(out, " {word}")?;
            column += 1 + length;
        }
    }
    writeln!(out)
}

/// Text put together by writing; writing into a string does not fail.
fn text(write: impl FnOnce(&mut String) -> std::fmt::Result) -> String {
    let mut out = String::new();
    match write(&mut out) {
        Ok(()) | Err(_) => out,
    }
}
