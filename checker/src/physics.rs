//! The physics: pure functions of numbers, nothing else.
//! Must not know spans, files, names of parts, policies or verdicts.

pub mod bias;
pub mod drive;
pub mod foster;
pub mod fuse;
pub mod heat;
pub mod heatsink;
pub mod limiter;
pub mod load;
pub mod math;
pub mod network;
pub mod output_stage;
pub mod protection;
pub mod safe_area;
pub mod sharing;
pub mod supply;
pub mod unit;
pub mod waveform;
pub mod wear;
