//! A place in a run of tokens.
//! Must not know what the tokens mean.

/// A byte position inside a token.
#[derive(Clone, Copy, Debug)]
pub(super) struct Cursor<'t> {
    tokens: &'t [&'t str],
    index: usize,
    offset: usize,
}

impl<'t> Cursor<'t> {
    pub(super) fn new(tokens: &'t [&'t str]) -> Self {
        Self {
            tokens,
            index: 0,
            offset: 0,
        }
    }

    /// At byte `offset` of token `index`.
    pub(super) fn at(tokens: &'t [&'t str], index: usize, offset: usize) -> Self {
        Self {
            tokens,
            index,
            offset,
        }
    }

    /// What is left of the token.
    pub(super) fn rest(&self) -> &'t str {
        self.tokens
            .get(self.index)
            .and_then(|token| token.get(self.offset..))
            .unwrap_or("")
    }

    /// Goes on by `len` bytes of the token.
    pub(super) fn skip(&mut self, len: usize) {
        self.offset += len;
    }

    /// Goes to the next token if this one is used up.
    pub(super) fn next_text(&mut self) {
        if self.rest().is_empty() && self.index < self.tokens.len() {
            self.index += 1;
            self.offset = 0;
        }
    }

    /// Whether it stands between two tokens, not inside one.
    pub(super) fn is_between(&self) -> bool {
        self.offset == 0 || self.rest().is_empty()
    }

    /// How many tokens are used, a started one included.
    pub(super) fn used(&self) -> usize {
        self.index + usize::from(self.offset > 0)
    }
}
