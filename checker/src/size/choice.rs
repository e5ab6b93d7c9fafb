//! What is chosen for a supply and its sink, as positions in the lists of usual values.
//! Must not know how a choice is tried.

use super::item::{BRIDGE_VOLTS, BRIDGES, RESERVOIRS, fuses, heatsinks, members};
use crate::quantity::{Dimension, Series};

/// The positions of what is chosen in the lists of usual values.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Choice {
    pub(super) secondary: usize,
    pub(super) rating: usize,
    pub(super) reservoir: usize,
    pub(super) sink: usize,
    pub(super) capacitor_volts: usize,
    pub(super) bridge: usize,
    pub(super) bridge_volts: usize,
    pub(super) ripple: usize,
    pub(super) rail_fuse: usize,
    /// For each tap.
    pub(super) mains_fuse: [usize; 4],
}

/// The lists of usual values.
pub(super) struct Lists {
    pub(super) secondary: Vec<f64>,
    pub(super) rating: Vec<f64>,
    pub(super) sink: Vec<f64>,
    pub(super) capacitor_volts: Vec<f64>,
    pub(super) ripple: Vec<f64>,
    pub(super) fuse: Vec<f64>,
}

pub(super) fn lists() -> Lists {
    Lists {
        secondary: members(Series::SecondaryVoltage, 6.0, 60.0),
        rating: members(Series::TransformerRating, 15.0, 3000.0),
        sink: heatsinks(),
        capacitor_volts: members(Series::CapacitorVoltage, 16.0, 450.0),
        ripple: members(Series::E24, 0.5, 60.0),
        fuse: fuses(),
    }
}

/// One coordinate of a choice.
pub(super) struct Coordinate {
    pub(super) name: &'static str,
    pub(super) of: fn(&mut Choice) -> &mut usize,
    /// The rule that rates just this value, and the end of the name of its part.
    pub(super) rated: Option<(&'static str, &'static str)>,
}

const fn coordinate(
    name: &'static str,
    of: fn(&mut Choice) -> &mut usize,
    rated: Option<(&'static str, &'static str)>,
) -> Coordinate {
    Coordinate { name, of, rated }
}

/// Everything that is chosen. What couples with other things comes first, what only its own rating
/// decides comes last.
pub(super) const COORDINATES: &[Coordinate] = &[
    coordinate("transformer secondary", |c| &mut c.secondary, None),
    coordinate(
        "transformer rating",
        |c| &mut c.rating,
        Some(("current.transformer-duty", "")),
    ),
    coordinate("reservoir", |c| &mut c.reservoir, None),
    coordinate("heatsink", |c| &mut c.sink, None),
    coordinate(
        "reservoir volts",
        |c| &mut c.capacitor_volts,
        Some(("voltage.reservoir", "supply reservoir")),
    ),
    coordinate(
        "reservoir ripple",
        |c| &mut c.ripple,
        Some(("current.reservoir-ripple", "supply reservoir")),
    ),
    coordinate(
        "bridge amperes",
        |c| &mut c.bridge,
        Some(("current.rectifier-mean", "")),
    ),
    coordinate(
        "bridge volts",
        |c| &mut c.bridge_volts,
        Some(("voltage.rectifier-reverse", "")),
    ),
    coordinate(
        "rail fuse",
        |c| &mut c.rail_fuse,
        Some(("current.fuse-rms", "fuse rail")),
    ),
    coordinate(
        "mains fuse",
        |c| &mut c.mains_fuse[0],
        Some(("current.fuse-rms", "fuse mains")),
    ),
    coordinate(
        "mains fuse, second tap",
        |c| &mut c.mains_fuse[1],
        Some(("current.fuse-rms", "fuse mains")),
    ),
    coordinate(
        "mains fuse, third tap",
        |c| &mut c.mains_fuse[2],
        Some(("current.fuse-rms", "fuse mains")),
    ),
    coordinate(
        "mains fuse, fourth tap",
        |c| &mut c.mains_fuse[3],
        Some(("current.fuse-rms", "fuse mains")),
    ),
];

/// A choice in words: value, dimension, unit and the key of its line.
pub(super) fn said(
    lists: &Lists,
    name: &str,
    at: usize,
) -> Option<(f64, Dimension, &'static str, &'static str)> {
    let of = |list: &[f64]| list.get(at).copied();
    Some(match name {
        "transformer secondary" => (
            of(&lists.secondary)?,
            Dimension::Voltage,
            "V",
            "transformer secondary 2 x",
        ),
        "transformer rating" => (
            of(&lists.rating)?,
            Dimension::ApparentPower,
            "VA",
            "transformer rating",
        ),
        "reservoir" => (
            of(RESERVOIRS)?,
            Dimension::Capacitance,
            "F",
            "supply reservoir, per rail",
        ),
        "heatsink" => (
            of(&lists.sink)?,
            Dimension::ThermalResistance,
            "K/W",
            "heatsink resistance",
        ),
        "reservoir volts" => (
            of(&lists.capacitor_volts)?,
            Dimension::Voltage,
            "V",
            "supply reservoir, working",
        ),
        "reservoir ripple" => (
            of(&lists.ripple)?,
            Dimension::Current,
            "A",
            "supply reservoir ripple",
        ),
        "bridge amperes" => (
            BRIDGES.get(at)?.0,
            Dimension::Current,
            "A",
            "supply rectifier bridge",
        ),
        "bridge volts" => (
            of(BRIDGE_VOLTS)?,
            Dimension::Voltage,
            "V",
            "supply rectifier bridge",
        ),
        "rail fuse" => (
            of(&lists.fuse)?,
            Dimension::Current,
            "A",
            "supply fuse rail",
        ),
        _ => (
            of(&lists.fuse)?,
            Dimension::Current,
            "A",
            "supply fuse mains",
        ),
    })
}
