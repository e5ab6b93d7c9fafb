//! x
/// s
pub trait Spelling {}
/// s
pub struct AsWritten;
/// s
pub fn layout() {}
