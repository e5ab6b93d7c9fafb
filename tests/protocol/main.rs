//! Drives the built language server over standard input and output, as an editor would.

mod client;
mod session;
mod typing;
mod wire;
