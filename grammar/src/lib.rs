//! The ampspec text format: a parser that accepts every text and keeps every byte.
//! It knows words, numbers, strings and `, { } x`; it must not know a unit, a key or a block kind.
//!
//! ```
//! let tree = ampspec_grammar::parse("load bench-4 { resistive 4 ohm ±5 % }\n");
//! assert!(tree.problems.is_empty());
//! let block = tree.blocks().next().unwrap();
//! assert_eq!(block.name().unwrap().text(&tree.text), "bench-4");
//! assert_eq!(block.lines[0].groups[0].tokens.len(), 4);
//! ```
//!
//! | file | holds |
//! |---|---|
//! | `ampspec.pest`, `parse` | one source line to pieces: tokens, commas, braces, a comment |
//! | `read` | a text line by line, all of it or what an edit changed |
//! | `row` | the pieces of a line to groups, and what is wrong with them |
//! | `assemble` | lines to statements and blocks, and what is wrong with their form |
//! | `tree`, `problem`, `span` | what comes out |
//! | `line_index` | bytes to lines and columns and back |
//! | `layout` | the canonical layout of a tree |
//! | `edit` | replacing stretches of a text |

mod assemble;
mod edit;
mod layout;
mod line_index;
mod parse;
mod problem;
mod read;
mod row;
mod span;
mod tree;

pub use assemble::MAX_PROBLEMS;
pub use edit::{Edit, EditError, apply};
pub use layout::{AsWritten, Spelling, layout};
pub use line_index::{ColumnUnit, LineIndex, Position};
pub use problem::{Problem, ProblemKind};
pub use read::{MAX_LINE_BYTES, parse};
pub use span::Span;
pub use tree::{Block, Group, Item, Line, Piece, PieceKind, Token, TokenKind, Tree};
