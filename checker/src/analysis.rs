//! Where the models meet: one build at its corners, from stated values to stresses.
//! Must not know how findings are shown, nor text beyond the places values came from.
//!
//! A [`Case`] is one build with one alternate in one mains region. Every intermediate result is a
//! method that solves once and answers with what is missing where it cannot. Data flow one way:
//! loads -> rails -> signals -> heat -> ratings; rules ask for stresses and compare.

pub mod bias;
pub mod case;
pub mod chain;
pub mod clip;
pub mod curves;
pub mod derived;
pub mod devices;
pub mod drive;
pub mod fault;
pub mod heat;
pub mod limits;
pub mod loads;
pub mod margins;
pub mod memory;
pub mod rails;
pub mod reach;
pub mod safe_area;
pub mod signal;
pub mod supply;
pub mod switch_on;
pub mod temperatures;
pub mod wear;

pub use case::{Case, Tables};
pub use margins::{Margins, Stress};
pub use memory::Memory;
