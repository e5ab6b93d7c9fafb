//! Quantities as the trade writes them: read from text, judged for plausibility, printed as text.
//! Must not know keys, blocks, spans, files or amplifiers.
//!
//! The reader takes bare tokens (text already split on white space and separator commas, quoted
//! strings removed) and the dimensions that would do. It never guesses silently: a text with two
//! readings becomes a [`Fault`] that lists both, and a text with one reading that is not the usual
//! spelling becomes a value with a [`Note`] that holds the usual spelling.

mod band;
mod compound;
mod cursor;
mod dimension;
mod fault;
mod letter_code;
mod number;
mod print;
mod read;
mod series;
mod tolerance;
mod unit;

pub use band::{Band, HALF_OR_DOUBLE, LETTER_CODE, PREFIX, Slip, Suggestion, suspect};
pub use compound::{Fuse, FuseSpeed, Windings, fraction, fuse, split_count, split_slash, windings};
pub use dimension::Dimension;
pub use letter_code::letter_code;
pub use print::{format, format_digits, format_exact};
pub use read::{read, read_one_of};
pub use series::Series;
pub use unit::is_unit;

/// A quantity as it was stated.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Quantity {
    /// The value in the base unit of [`Dimension`].
    pub value: f64,
    /// What kind of quantity it is.
    pub dimension: Dimension,
    /// The tolerance that stood after it, or that its letter code carried.
    pub tolerance: Option<Tolerance>,
    /// Whether the text said r.m.s., peak, d.c., or both polarities.
    pub form: Form,
    /// How many tokens it took, its tolerance included.
    pub used: usize,
}

/// How a voltage or current was qualified. Every other quantity is [`Form::Plain`].
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub enum Form {
    /// Nothing said.
    #[default]
    Plain,
    /// `Vac`, `Vrms`, `V~`.
    Rms,
    /// `Vpk`.
    Peak,
    /// `Vdc`.
    Dc,
    /// `±42 V`: both polarities of the value.
    SymmetricalPair,
}

/// How far a quantity may lie from its stated value. Both amounts are zero or more.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tolerance {
    /// Above the stated value.
    pub plus: Amount,
    /// Below the stated value.
    pub minus: Amount,
}

/// One side of a [`Tolerance`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Amount {
    /// A fraction of the stated value: 0.05 for 5 %.
    Relative(f64),
    /// In the base unit of the quantity; kelvins for a temperature.
    Absolute(f64),
}

impl Amount {
    /// The amount in the base unit of a quantity whose stated value is `value`.
    #[must_use]
    pub fn of(self, value: f64) -> f64 {
        match self {
            Self::Relative(fraction) => fraction * value.abs(),
            Self::Absolute(amount) => amount,
        }
    }
}

impl Tolerance {
    /// Whether both sides are fractions of the stated value.
    #[must_use]
    pub fn is_relative(self) -> bool {
        matches!(
            (self.plus, self.minus),
            (Amount::Relative(_), Amount::Relative(_))
        )
    }

    /// Lowest and highest value this tolerance admits round `value`.
    #[must_use]
    pub fn limits(self, value: f64) -> (f64, f64) {
        (value - self.minus.of(value), value + self.plus.of(value))
    }
}

/// What reading came to.
#[derive(Clone, Debug, PartialEq)]
pub enum Reading {
    /// A quantity of a wanted dimension.
    Read {
        /// The quantity.
        quantity: Quantity,
        /// What there is to say about its spelling; usually nothing.
        notes: Vec<Note>,
    },
    /// The first token does not start a quantity; it may be a word.
    Not,
    /// It starts like a quantity and cannot be taken as one.
    Wrong(Fault),
}

/// A remark on the spelling of a quantity that was accepted.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Note {
    /// Whether the user is told.
    pub severity: NoteSeverity,
    /// One sentence; empty for [`NoteSeverity::Silent`].
    pub message: String,
    /// The usual spelling of the tokens that were used.
    pub canonical: String,
}

/// Whether a [`Note`] is shown.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum NoteSeverity {
    /// Only a formatter needs it.
    Silent,
    /// The user is told how it was read.
    Information,
}

/// Why a text that looks like a quantity was not taken, and what to write.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Fault {
    /// The kind of fault.
    pub kind: FaultKind,
    /// What is wrong and what was expected.
    pub message: String,
    /// What to do.
    pub hint: String,
    /// How many tokens it spans, one or more.
    pub used: usize,
    /// What it may have been meant to be; each text can replace the tokens.
    pub readings: Vec<Meaning>,
}

/// One way to settle a [`Fault`].
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Meaning {
    /// Replaces the tokens the fault spans.
    pub text: String,
    /// What that would mean.
    pub meaning: String,
}

/// The kinds of [`Fault`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum FaultKind {
    /// Digits that do not make one number.
    Number,
    /// A number that stands where a unit is needed.
    MissingUnit,
    /// No unit is written like this.
    UnknownUnit,
    /// A unit, but of something else than was wanted.
    WrongDimension,
    /// Two readings, neither of them surely meant.
    Ambiguous,
    /// Too large or too small to be a quantity of this world, or not a number.
    OutOfRange,
    /// The tolerance, not its quantity, is at fault.
    Tolerance,
}

#[cfg(test)]
mod tests;
