//! Replaces stretches of a text. Knows nothing of what the text means.

use std::fmt;

use crate::span::Span;

/// Put `text` in place of the bytes of `span`.
#[derive(Clone, Eq, PartialEq, Debug)]
pub struct Edit {
    /// The bytes to go; empty to insert.
    pub span: Span,
    /// What comes in their place.
    pub text: String,
}

/// Why edits cannot be applied; the span is that of the edit at fault.
#[derive(Copy, Clone, Eq, PartialEq, Debug)]
pub enum EditError {
    /// The span ends outside the text or inside a character.
    OutOfText(Span),
    /// The span shares bytes with another one.
    Overlap(Span),
}

impl fmt::Display for EditError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::OutOfText(span) => {
                write!(
                    f,
                    "edit of bytes {} to {} does not fit the text",
                    span.start, span.end
                )
            }
            Self::Overlap(span) => {
                write!(
                    f,
                    "edit of bytes {} to {} overlaps another",
                    span.start, span.end
                )
            }
        }
    }
}

impl std::error::Error for EditError {}

/// The text with all edits made. Their order does not matter, except that insertions at one
/// place come out in the order given.
///
/// # Errors
/// If an edit does not fit the text or overlaps another; then nothing is applied.
pub fn apply(text: &str, edits: &[Edit]) -> Result<String, EditError> {
    let mut ordered: Vec<&Edit> = edits.iter().collect();
    ordered.sort_by_key(|edit| edit.span);
    let mut result = String::with_capacity(text.len());
    let mut reached = 0;
    for edit in ordered {
        let Span { start, end } = edit.span;
        if start < reached {
            return Err(EditError::Overlap(edit.span));
        }
        if text.get(start..end).is_none() {
            return Err(EditError::OutOfText(edit.span));
        }
        result.push_str(Span::new(reached, start).slice(text));
        result.push_str(&edit.text);
        reached = end;
    }
    result.push_str(Span::new(reached, text.len()).slice(text));
    Ok(result)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn edit(start: usize, end: usize, text: &str) -> Edit {
        Edit {
            span: Span { start, end },
            text: text.into(),
        }
    }

    #[test]
    fn edits_are_made_in_place_whatever_their_order() {
        let edits = [
            edit(5, 8, "mohm"),
            edit(0, 1, "12"),
            edit(0, 0, "a "),
            edit(8, 8, "!"),
        ];
        assert_eq!(apply("1 2  ohm", &edits), Ok("a 12 2  mohm!".into()));
        assert_eq!(apply("", &[]), Ok(String::new()));
    }

    #[test]
    fn what_overlaps_or_does_not_fit_is_refused() {
        let overlap = [edit(0, 3, ""), edit(2, 4, "")];
        assert_eq!(
            apply("abcdef", &overlap),
            Err(EditError::Overlap(Span::new(2, 4)))
        );
        for (start, end) in [(1, 2), (0, 9), (9, 9)] {
            let outside = Err(EditError::OutOfText(Span { start, end }));
            assert_eq!(apply("Ω", &[edit(start, end, "")]), outside);
        }
        let reversed = edit(2, 1, "");
        assert!(apply("abc", &[reversed]).is_err());
    }
}
