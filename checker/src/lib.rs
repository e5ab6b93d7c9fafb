//! Design-rule checks for class-AB audio power amplifier specs.

pub mod build;
pub mod finding;
pub mod physics;
pub mod quantity;
pub mod rule;
pub mod source;
pub mod vocabulary;
