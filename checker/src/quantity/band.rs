//! Plausibility: is a value of the size such a value has, and if not, which slip would explain it.
//! Must not know the bands themselves; the caller passes the one for its key.

use super::{Dimension, print};

/// The usual sizes of one kind of value, in base units, ends included.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Band {
    /// Lowest usual value.
    pub low: f64,
    /// Highest usual value.
    pub high: f64,
}

impl Band {
    /// Whether `value` lies inside.
    #[must_use]
    pub fn holds(self, value: f64) -> bool {
        // One part in 10^9 keeps a stated end inside when it was computed on the way here.
        let slack = 1e-9 * self.low.abs().max(self.high.abs());
        (self.low - slack..=self.high + slack).contains(&value)
    }
}

/// One way a value gets mistyped.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Slip {
    /// The value meant is this factor times the value typed.
    Factor(f64, &'static str),
    /// The value meant is the reciprocal.
    Reciprocal(&'static str),
}

/// A wrong SI prefix.
pub const PREFIX: [Slip; 4] = [
    Slip::Factor(1e-3, "a thousandth"),
    Slip::Factor(1e3, "a thousand times that"),
    Slip::Factor(1e-6, "a millionth"),
    Slip::Factor(1e6, "a million times that"),
];

/// `22R` for `0R22` and the other way.
pub const LETTER_CODE: [Slip; 2] = [
    Slip::Factor(1e-2, "a hundredth, the letter one place off"),
    Slip::Factor(1e2, "a hundred times that, the letter one place off"),
];

/// A total for a half and the other way.
pub const HALF_OR_DOUBLE: [Slip; 2] = [
    Slip::Factor(0.5, "half, if the total was typed for each"),
    Slip::Factor(2.0, "double, if one was typed for the total"),
];

/// A value outside its band.
#[derive(Clone, Debug, PartialEq)]
pub struct Suggestion {
    /// The value probably meant, in base units, if a slip leads into the band.
    pub likely: Option<f64>,
    /// The likely value as a text to put in place of the typed one.
    pub replacement: Option<String>,
    /// What is unusual and what would fit, as one sentence without a full stop.
    pub text: String,
}

/// Judges `value` against `band`; `None` if it lies inside. Of `slips` the first that leads into the
/// band is offered, so the caller lists the likeliest first.
#[must_use]
pub fn suspect(value: f64, band: Band, dimension: Dimension, slips: &[Slip]) -> Option<Suggestion> {
    if !value.is_finite() || band.holds(value) {
        return None;
    }
    let show = |value: f64| print::format(value, dimension);
    let unusual = format!(
        "{} is outside the usual {} to {}",
        show(value),
        show(band.low),
        show(band.high)
    );
    let meant = slips.iter().find_map(|slip| {
        let (likely, why) = match *slip {
            Slip::Factor(factor, why) => (value * factor, why),
            Slip::Reciprocal(why) => (1.0 / value, why),
        };
        (likely.is_finite() && band.holds(likely)).then_some((likely, why))
    });
    Some(match meant {
        Some((likely, why)) => Suggestion {
            likely: Some(likely),
            // Twelve digits drop the noise of the factor and keep every digit a person typed.
            replacement: Some(print::format_digits(likely, dimension, 12)),
            text: format!("{unusual}; {} would fit ({why})", show(likely)),
        },
        None => Suggestion {
            likely: None,
            replacement: None,
            text: unusual,
        },
    })
}
