//! The things that are sized, and the values they are sold in, the least demanding first.
//! Must not know how a value is tried.

use crate::quantity::Series;

/// Reservoirs as sold, per capacitor. Common practice, no source.
pub(super) const RESERVOIRS: &[f64] = &[
    1000e-6, 1500e-6, 2200e-6, 3300e-6, 4700e-6, 6800e-6, 10_000e-6, 15_000e-6, 22_000e-6,
    33_000e-6, 47_000e-6, 68_000e-6,
];
/// Mean current of bridges as sold, A, with the surge that such a bridge stands at least. From
/// memory: the data sheet of the one bought goes before.
pub(super) const BRIDGES: &[(f64, f64)] = &[
    (4.0, 120.0),
    (6.0, 150.0),
    (8.0, 175.0),
    (10.0, 200.0),
    (15.0, 250.0),
    (25.0, 300.0),
    (35.0, 400.0),
    (50.0, 450.0),
];
/// Reverse volts of bridges as sold. Common practice, no source.
pub(super) const BRIDGE_VOLTS: &[f64] = &[50.0, 100.0, 200.0, 400.0, 600.0, 800.0, 1000.0];

/// A thing that is sized in place.
pub(super) struct Item {
    /// As reports write it.
    pub(super) name: &'static str,
    /// Kind of block and key.
    pub(super) key: (&'static str, &'static str),
    /// The selector of a key that repeats.
    pub(super) select: Option<&'static str>,
    /// The slot of the value.
    pub(super) slot: &'static str,
    /// The rule whose rating is just this value: what it uses says what is needed at least.
    pub(super) rated_by: Option<&'static str>,
    /// The values that exist, the least demanding first.
    pub(super) values: fn() -> Vec<f64>,
}

const fn item(
    name: &'static str,
    key: (&'static str, &'static str),
    slot: &'static str,
    rated_by: Option<&'static str>,
    values: fn() -> Vec<f64>,
) -> Item {
    Item {
        name,
        key,
        select: None,
        slot,
        rated_by,
        values,
    }
}

/// Everything that is sized, in the order in which it is shown.
pub(super) const ITEMS: &[Item] = &[
    item(
        "transformer rating",
        ("transformer", "rating"),
        "VA",
        Some("current.transformer-duty"),
        || members(Series::TransformerRating, 15.0, 3000.0),
    ),
    item(
        "transformer secondary",
        ("transformer", "secondary"),
        "V",
        None,
        || members(Series::SecondaryVoltage, 6.0, 60.0),
    ),
    item("reservoir", ("supply", "reservoir"), "F", None, || {
        RESERVOIRS.to_vec()
    }),
    item(
        "reservoir volts",
        ("supply", "reservoir"),
        "V",
        Some("voltage.reservoir"),
        || members(Series::CapacitorVoltage, 16.0, 450.0),
    ),
    item(
        "bridge amperes",
        ("supply", "rectifier"),
        "A",
        Some("current.rectifier-mean"),
        || BRIDGES.iter().map(|b| b.0).collect(),
    ),
    item(
        "bridge volts",
        ("supply", "rectifier"),
        "V",
        Some("voltage.rectifier-reverse"),
        || BRIDGE_VOLTS.to_vec(),
    ),
    Item {
        select: Some("mains"),
        ..item(
            "mains fuse",
            ("supply", "fuse"),
            "A",
            Some("current.fuse-rms"),
            fuses,
        )
    },
    Item {
        select: Some("rail"),
        ..item(
            "rail fuse",
            ("supply", "fuse"),
            "A",
            Some("current.fuse-rms"),
            fuses,
        )
    },
    item(
        "heatsink",
        ("heatsink", "resistance"),
        "K/W",
        None,
        heatsinks,
    ),
    item("pairs", ("stage", "pairs"), "n", None, || {
        (1..=16).map(f64::from).collect()
    }),
];

pub(super) fn fuses() -> Vec<f64> {
    members(Series::FuseCurrent, 0.1, 40.0)
}

/// K/W in steps of about a tenth, the smallest sink first.
pub(super) fn heatsinks() -> Vec<f64> {
    let mut all = members(Series::E24, 0.05, 5.0);
    all.reverse();
    all
}

/// The members of a series from one to another.
pub(super) fn members(series: Series, from: f64, to: f64) -> Vec<f64> {
    let mut out: Vec<f64> = Vec::new();
    let mut at = series.at_or_above(from);
    while let Some(value) = at.filter(|v| *v <= to * 1.000_001 && out.len() < 200) {
        out.push(value);
        at = series.at_or_above(value * 1.000_01);
    }
    out
}

/// The position of the member nearest to a value by ratio.
pub(super) fn nearest(values: &[f64], value: f64) -> usize {
    let far = |v: &f64| (v / value).max(value / v);
    let found = values
        .iter()
        .enumerate()
        .min_by(|a, b| far(a.1).total_cmp(&far(b.1)));
    found.map_or(0, |f| f.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn series_run_from_end_to_end() {
        let sinks = heatsinks();
        assert_eq!((sinks.first(), sinks.last()), (Some(&4.7), Some(&0.051)));
        assert!(sinks.windows(2).all(|w| w[0] > w[1]));
        assert_eq!(nearest(&[1.0, 2.0, 4.0], 2.7), 1);
        for item in ITEMS {
            assert!((item.values)().len() > 5, "{}", item.name);
        }
    }
}
