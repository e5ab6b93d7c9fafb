//! Drives the built language server over standard input and output, as an editor would.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::panic,
    reason = "a test that cannot go on fails"
)]

mod client;
mod edits;
mod judge;
mod session;
mod strict;
mod typing;
mod wire;
