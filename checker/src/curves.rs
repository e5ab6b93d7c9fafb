//! The points of the pictures of a build: axes, lines and marks, as numbers.
//! Must not know how a point was computed, nor how it is drawn.

use crate::finding::Measure;

/// What a picture shows.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// Current against voltage of an output device: what is allowed, what every load asks for.
    SafeArea,
    /// The limit line against loads and safe area.
    Limiter,
    /// Modulus, equivalent peak dissipation resistance and phase of a load.
    Impedance,
    /// Rail against current, three mains levels.
    Rail,
    /// One cycle of the rail at the duty.
    Ripple,
    /// Heat of one channel against its output.
    Heat,
    /// From the air to the junction.
    Ladder,
}

impl Kind {
    /// As reports write it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::SafeArea => "safe_area",
            Self::Limiter => "limiter",
            Self::Impedance => "impedance",
            Self::Rail => "rail",
            Self::Ripple => "ripple",
            Self::Heat => "heat",
            Self::Ladder => "ladder",
        }
    }
}

/// What a line or a mark stands for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Role {
    /// A curve as the data sheet states it.
    Stated,
    /// The same brought down to the case temperature.
    Derated,
    /// The part of it that the policy allows.
    Allowed,
    /// What a load asks for.
    Locus,
    /// Where a limiter acts.
    Limit,
    /// A figure that has no other role: modulus, mean rail, heat.
    Plain,
    /// A figure beside the plain one: peak dissipation resistance, trough.
    Beside,
    /// The worst point.
    Worst,
    /// A point that people ask for.
    Point,
    /// A rating.
    Rating,
}

impl Role {
    /// As reports write it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Stated => "stated",
            Self::Derated => "derated",
            Self::Allowed => "allowed",
            Self::Locus => "locus",
            Self::Limit => "limit",
            Self::Plain => "plain",
            Self::Beside => "beside",
            Self::Worst => "worst",
            Self::Point => "point",
            Self::Rating => "rating",
        }
    }
}

/// One axis.
#[derive(Clone, Debug, PartialEq)]
pub struct Axis {
    /// What it counts: `across the device`.
    pub name: &'static str,
    /// Its unit, as the language spells it.
    pub unit: &'static str,
    /// Logarithmic.
    pub log: bool,
}

/// A line through points.
#[derive(Clone, Debug, PartialEq)]
pub struct Line {
    /// What it stands for.
    pub role: Role,
    /// Which one: a load, a mains level.
    pub label: String,
    /// In the units of the axes. Straight between them in the scales of the axes.
    pub points: Vec<(f64, f64)>,
}

/// A point that is pointed out.
#[derive(Clone, Debug, PartialEq)]
pub struct Mark {
    /// What it stands for.
    pub role: Role,
    /// Which one.
    pub label: String,
    /// Where, in the units of the axes.
    pub x: f64,
    /// The same.
    pub y: f64,
    /// A figure that belongs to it, such as the part of the allowance used.
    pub value: Option<Measure>,
}

/// One pair of axes.
#[derive(Clone, Debug, PartialEq)]
pub struct Panel {
    /// Across.
    pub x: Axis,
    /// Up.
    pub y: Axis,
    /// The lines.
    pub lines: Vec<Line>,
    /// The points pointed out.
    pub marks: Vec<Mark>,
}

/// A figure that holds for all of a picture.
#[derive(Clone, Debug, PartialEq)]
pub struct Fact {
    /// What it is: `case`.
    pub name: &'static str,
    /// The load it holds for; empty where it holds for all.
    pub of: String,
    /// The figure.
    pub value: Measure,
}

/// A picture as numbers.
#[derive(Clone, Debug, PartialEq)]
pub struct Picture {
    /// What it shows.
    pub kind: Kind,
    /// Of which parts or load.
    pub of: Vec<String>,
    /// The mains region, `230 V`; empty where it does not matter or there is none.
    pub region: String,
    /// Figures for the words under it.
    pub facts: Vec<Fact>,
    /// Its panels, one above the other, the same axis across.
    pub panels: Vec<Panel>,
}

impl Picture {
    /// A figure by its name, the first of them.
    #[must_use]
    pub fn fact(&self, name: &str) -> Option<Measure> {
        self.facts.iter().find(|f| f.name == name).map(|f| f.value)
    }
}
