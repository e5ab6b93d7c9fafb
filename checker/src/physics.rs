//! The physics: pure functions of numbers, nothing else.
//! Must not know spans, files, names of parts, policies or verdicts.

pub mod load;
pub mod math;
pub mod unit;
