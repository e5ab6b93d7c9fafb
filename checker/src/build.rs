//! From text to a typed build: what was stated, what was assumed, and where.
//! Must not know physics, rules or verdicts.
//!
//! `lower` matches lines with the vocabulary, `project` brings the files of one check together,
//! `view` answers what a block says in one build with one alternate, `parts` types the answer.

pub mod lower;
pub mod parts;
pub mod project;
pub mod statement;
pub mod view;

pub use parts::{Field, Need, Needs};
pub use project::Project;
pub use view::View;
