//! The language reference as one page, from the vocabulary and the rules' own records.
//! Must not know anything that stands in neither.

use std::fmt::Write;

use super::text;
use crate::rules;
use crate::vocabulary::{BLOCKS, Block, Key, STATEMENTS};

/// How to read the tables.
const INTRODUCTION: &str = "\
# The ampspec language

UTF-8 text, one statement a line: `key group, group, ...`. A block is `kind NAME \"title\" {` ... `}`; blocks do not
nest, and a header starts in column one. `#` starts a comment. A line that ends in a comma goes on in lines
indented deeper than its key.

- A **shape** says what a key takes. `V` one quantity in that unit; `±` a tolerance may follow; `label:V` after a
  label; `{a b}` one of the words; `label{a b}` the same after a label; `per{a b}` how many there are, with `N` also
  `per 3 channels`; `<kind>` the name of a declared block; `\"text\"`; `n` a whole number; `num` a plain number; `nx` a
  count such as `2 x`; `V..V` a range; `V(..V)` one value or a range; `?` may be left out; `,...` a list of groups;
  `+bom` may end in `ref R21-R24`, `part \"code\"`, `qty 4`; `@` the selector, first on the line.
- Connecting words (`at`, `into`, `on`, `of`, `with`, `to`) carry no meaning. Order within a group is free, but a
  tolerance stands directly after its quantity and a label directly before.
- **Default**: `req` must be stated; `-` has none, and whatever needs it is *unchecked*; anything else is used when the
  key is left out, and listed as assumed. `none` after an optional key means known not fitted, which is not the same.
- Every block may start `from` another of its kind: its lines, each key given here replacing that key.
- Quantities are written as the trade writes them: `4k7`, `0R22 ±5 %`, `4700 uF`, `2 x 28 Vac`, `0.45 K/W`, `8R`. A text
  with two readings is asked about, never guessed.

";

/// The whole page, as markdown.
#[must_use]
pub fn markdown() -> String {
    text(|out| {
        out.push_str(INTRODUCTION);
        writeln!(out, "## Statements outside blocks\n")?;
        table(out, STATEMENTS, None)?;
        for block in BLOCKS {
            writeln!(out, "## {}\n\n{}", block.kind, sentence(block.meaning))?;
            if !block.flavours.is_empty() {
                writeln!(
                    out,
                    "\nThe header says which: `{} NAME {{{}}}`.",
                    block.kind,
                    block.flavours.join("|")
                )?;
            }
            writeln!(out)?;
            table(out, block.keys, Some(block))?;
        }
        Ok(())
    })
}

fn table(out: &mut String, keys: &[Key], block: Option<&Block>) -> std::fmt::Result {
    writeln!(
        out,
        "| key | shape | default | meaning | read by |\n|---|---|---|---|---|"
    )?;
    for key in keys {
        let repeats = if key.repeats { " \\*" } else { "" };
        let symbol = if key.symbol.is_empty() {
            String::new()
        } else {
            format!(" ({})", key.symbol)
        };
        let readers: Vec<&str> = match block {
            Some(block) => rules::all()
                .filter(|r| {
                    r.reads
                        .contains(&format!("{}.{}", block.kind, key.name).as_str())
                })
                .map(|r| r.name)
                .collect(),
            None => Vec::new(),
        };
        let shape = key.shape.replace('|', "\\|");
        let meaning = key.meaning.replace('|', "\\|");
        writeln!(
            out,
            "| `{}`{repeats} | `{shape}` | {} | {meaning}{symbol} | {} |",
            key.name,
            key.default,
            readers.join(", ")
        )?;
    }
    writeln!(out)
}

fn sentence(text: &str) -> String {
    let mut letters = text.chars();
    let first = letters
        .next()
        .map(|c| c.to_uppercase().collect::<String>())
        .unwrap_or_default();
    format!("{first}{}.", letters.as_str())
}
