//! Byte offsets to lines and columns and back. Knows nothing of the grammar.
//!
//! A line ends at LF, CRLF or a lone CR, as in the language server protocol. Every conversion
//! clamps: an offset or a column that does not exist becomes the nearest one before it that does.

use std::sync::Arc;

use crate::span::Span;

/// What a column counts.
#[derive(Copy, Clone, Eq, PartialEq, Debug, Hash)]
pub enum ColumnUnit {
    /// Bytes of UTF-8.
    Byte,
    /// Code units of UTF-16.
    Utf16,
    /// Characters (Unicode scalar values).
    Character,
}

impl ColumnUnit {
    fn of(self, character: char) -> usize {
        match self {
            Self::Byte => character.len_utf8(),
            Self::Utf16 => character.len_utf16(),
            Self::Character => 1,
        }
    }

    fn count(self, text: &str) -> usize {
        match self {
            Self::Byte => text.len(),
            _ if text.is_ascii() => text.len(),
            _ => text.chars().map(|c| self.of(c)).sum(),
        }
    }
}

/// A place as a person names it: line and column in characters, both from 1.
#[derive(Copy, Clone, Eq, PartialEq, Debug, Hash, Ord, PartialOrd)]
pub struct Position {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
}

/// The line starts of one text, built once.
#[derive(Clone, Eq, PartialEq, Debug)]
pub struct LineIndex {
    text: Arc<str>,
    starts: Vec<usize>,
}

impl LineIndex {
    /// Indexes a text in one pass.
    #[must_use]
    pub fn new(text: Arc<str>) -> Self {
        let bytes = text.as_bytes();
        let mut starts = vec![0];
        starts.extend(bytes.iter().enumerate().filter_map(|(i, &byte)| {
            let ends_line =
                byte == b'\n' || (byte == b'\r' && bytes.get(i + 1).copied() != Some(b'\n'));
            ends_line.then_some(i + 1)
        }));
        Self { text, starts }
    }

    /// The indexed text.
    #[must_use]
    pub fn text(&self) -> &Arc<str> {
        &self.text
    }

    /// Number of lines: line ends plus one.
    #[must_use]
    pub fn line_count(&self) -> usize {
        self.starts.len()
    }

    /// The line, from 0, that holds `offset`; its line end belongs to it.
    #[must_use]
    pub fn line_of(&self, offset: usize) -> usize {
        self.starts
            .partition_point(|&start| start <= offset)
            .saturating_sub(1)
    }

    /// Where a line, from 0, begins; the end of the text for a line that does not exist.
    #[must_use]
    pub fn line_start(&self, line: usize) -> usize {
        let end = self.text.len();
        self.starts.get(line).copied().unwrap_or(end)
    }

    /// The bytes of a line, from 0, without its line end; empty at the end of the text for a
    /// line that does not exist.
    #[must_use]
    pub fn line_span(&self, line: usize) -> Span {
        let start = self.line_start(line);
        let content = Span::new(start, self.line_start(line + 1)).slice(&self.text);
        let content = content.strip_suffix('\n').unwrap_or(content);
        let content = content.strip_suffix('\r').unwrap_or(content);
        Span::new(start, start + content.len())
    }

    /// The text of a line, from 0, without its line end.
    #[must_use]
    pub fn line_text(&self, line: usize) -> &str {
        self.line_span(line).slice(&self.text)
    }

    /// Line and column of a byte offset, both from 0.
    #[must_use]
    pub fn locate(&self, offset: usize, unit: ColumnUnit) -> (usize, usize) {
        let line = self.line_of(offset.min(self.text.len()));
        let span = self.line_span(line);
        let end = floor_boundary(&self.text, offset.min(span.end));
        let before = Span::new(span.start, end).slice(&self.text);
        (line, unit.count(before))
    }

    /// The byte offset of a line and column, both from 0.
    #[must_use]
    pub fn offset(&self, line: usize, column: usize, unit: ColumnUnit) -> usize {
        let span = self.line_span(line);
        let mut left = column;
        let mut offset = span.start;
        for character in span.slice(&self.text).chars() {
            let width = unit.of(character);
            if width > left {
                break;
            }
            left -= width;
            offset += character.len_utf8();
        }
        offset
    }

    /// Line and column in characters, both from 1.
    #[must_use]
    pub fn position(&self, offset: usize) -> Position {
        let (line, column) = self.locate(offset, ColumnUnit::Character);
        Position {
            line: line + 1,
            column: column + 1,
        }
    }
}

fn floor_boundary(text: &str, offset: usize) -> usize {
    (0..=offset)
        .rev()
        .find(|&i| text.is_char_boundary(i))
        .unwrap_or(0)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn index(text: &str) -> LineIndex {
        LineIndex::new(Arc::from(text))
    }

    #[test]
    fn every_kind_of_line_end_starts_a_line() {
        let lines = index("a\nb\r\nc\rd\n\re\r");
        let found: Vec<&str> = (0..lines.line_count())
            .map(|i| lines.line_text(i))
            .collect();
        assert_eq!(found, ["a", "b", "c", "d", "", "e", ""]);
    }

    #[test]
    fn columns_count_what_they_say() {
        // U+03A9 is two bytes, one UTF-16 unit; U+1F50A is four bytes, two units.
        let lines = index("x\n8 Ω 🔊 y");
        let y = lines.text().len() - 1;
        assert_eq!(lines.locate(y, ColumnUnit::Byte), (1, 10));
        assert_eq!(lines.locate(y, ColumnUnit::Utf16), (1, 7));
        assert_eq!(lines.position(y), Position { line: 2, column: 7 });
    }

    #[test]
    fn what_does_not_exist_is_clamped() {
        let lines = index("ab\r\n🔊");
        assert_eq!(lines.locate(3, ColumnUnit::Utf16), (0, 2)); // between CR and LF
        assert_eq!(lines.locate(5, ColumnUnit::Utf16), (1, 0)); // inside a character
        assert_eq!(lines.locate(999, ColumnUnit::Utf16), (1, 2));
        assert_eq!(lines.offset(0, 99, ColumnUnit::Utf16), 2);
        assert_eq!(lines.offset(1, 1, ColumnUnit::Utf16), 4); // half a surrogate pair
        assert_eq!(lines.offset(99, 0, ColumnUnit::Utf16), 8);
        assert_eq!(index("").position(0), Position { line: 1, column: 1 });
    }

    proptest! {
        #[test]
        fn there_and_back(text in "[a\r\nΩ🔊é]{0,40}") {
            let lines = index(&text);
            for unit in [ColumnUnit::Byte, ColumnUnit::Utf16, ColumnUnit::Character] {
                for (offset, _) in text.char_indices() {
                    let (line, column) = lines.locate(offset, unit);
                    let inside = lines.line_span(line).touches(offset);
                    prop_assert!(!inside || lines.offset(line, column, unit) == offset);
                }
            }
        }
    }
}
