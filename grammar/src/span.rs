//! Byte ranges of the source text. Knows nothing of lines, columns or what a range holds.

/// A half-open range of byte offsets into one source text.
#[derive(Copy, Clone, Eq, PartialEq, Debug, Hash, Ord, PartialOrd)]
pub struct Span {
    /// Offset of the first byte.
    pub start: usize,
    /// Offset one past the last byte.
    pub end: usize,
}

impl Span {
    /// The range from `start` up to but not including `end`; a reversed pair gives the empty
    /// range at `start`.
    #[must_use]
    pub const fn new(start: usize, end: usize) -> Self {
        let end = if end < start { start } else { end };
        Self { start, end }
    }

    /// The empty range at `offset`: a place between two bytes.
    #[must_use]
    pub const fn at(offset: usize) -> Self {
        Self::new(offset, offset)
    }

    /// Number of bytes.
    #[must_use]
    pub const fn len(self) -> usize {
        self.end.saturating_sub(self.start)
    }

    /// Whether the range holds no byte.
    #[must_use]
    pub const fn is_empty(self) -> bool {
        self.len() == 0
    }

    /// The smallest range that holds both.
    #[must_use]
    pub fn cover(self, other: Self) -> Self {
        Self::new(self.start.min(other.start), self.end.max(other.end))
    }

    /// Whether the byte at `offset` lies inside.
    #[must_use]
    pub const fn contains(self, offset: usize) -> bool {
        self.start <= offset && offset < self.end
    }

    /// Whether a cursor at `offset` touches the range, its end included.
    #[must_use]
    pub const fn touches(self, offset: usize) -> bool {
        self.start <= offset && offset <= self.end
    }

    /// The text of the range; empty where the range does not fit the text.
    #[must_use]
    pub fn slice(self, text: &str) -> &str {
        text.get(self.start..self.end).unwrap_or("")
    }
}
