//! The one table of unit spellings and SI prefixes, and the lookup of a unit's text.
//! Must not know numbers, tokens or which dimension is wanted.
//!
//! Text is matched exactly. Folding case would turn the ohm sign into a small omega, mega into
//! milli and siemens into seconds, so every spelling that differs only in case is listed.

use super::{Dimension, Form};

/// One unit of the table: `value in base unit = number * 10^ten * times`.
struct Row {
    /// All spellings; the first is the usual one.
    spellings: &'static [&'static str],
    dimension: Dimension,
    ten: i32,
    times: f64,
    /// SI prefixes it takes.
    prefixes: &'static str,
    form: Form,
    /// What the user is told when this unit is used.
    remark: &'static str,
}

const fn row(
    dimension: Dimension,
    ten: i32,
    prefixes: &'static str,
    spellings: &'static [&'static str],
) -> Row {
    Row {
        spellings,
        dimension,
        ten,
        times: 1.0,
        prefixes,
        form: Form::Plain,
        remark: "",
    }
}

const fn times(mut row: Row, times: f64) -> Row {
    row.times = times;
    row
}

const fn form(mut row: Row, form: Form) -> Row {
    row.form = form;
    row
}

const fn remark(mut row: Row, remark: &'static str) -> Row {
    row.remark = remark;
    row
}

use Dimension as D;

#[rustfmt::skip]
const ROWS: &[Row] = &[
    row(D::Voltage, 0, "num k", &["V", "v", "volt", "volts", "Volt", "Volts", "VOLT", "VOLTS"]),
    form(row(D::Voltage, 0, "mk", &["Vac", "VAC", "vac", "V~", "v~", "Vrms", "VRMS", "vrms", "VACrms", "Vacrms"]), Form::Rms),
    form(row(D::Voltage, 0, "mk", &["Vdc", "VDC", "vdc"]), Form::Dc),
    form(row(D::Voltage, 0, "mk", &["Vpk", "VPK", "vpk", "Vp", "Vpeak"]), Form::Peak),
    row(D::Current, 0, "pnum k", &["A", "a", "amp", "amps", "Amp", "Amps", "AMP", "AMPS", "ampere", "amperes"]),
    form(row(D::Current, 0, "um", &["Arms", "ARMS", "Aac", "AAC", "A~"]), Form::Rms),
    form(row(D::Current, 0, "um", &["Adc", "ADC"]), Form::Dc),
    form(row(D::Current, 0, "um", &["Apk", "APK", "Apeak"]), Form::Peak),
    row(D::Power, 0, "num k", &["W", "w", "watt", "watts", "Watt", "Watts", "WATT", "WATTS"]),
    remark(row(D::Power, 0, "mk", &["W", "Wrms", "WRMS", "wrms"]), "power has no r.m.s. value: read as average power of a sine"),
    row(D::ApparentPower, 0, "k", &["VA", "va"]),
    // U+03A9 is the Greek letter, U+2126 the ohm sign.
    row(D::Resistance, 0, "um kMG", &["ohm", "ohms", "Ohm", "Ohms", "OHM", "OHMS", "\u{3a9}", "\u{2126}"]),
    row(D::Resistance, 0, "", &["ohm", "R", "r"]),
    row(D::Capacitance, 0, "pnum", &["F", "farad", "farads", "Farad", "Farads"]),
    row(D::Capacitance, -12, "", &["pF", "pf", "PF"]),
    row(D::Capacitance, -9, "", &["nF", "nf", "NF"]),
    row(D::Capacitance, -6, "", &["uF", "uf", "UF", "Uf", "ufd", "uFd", "UFD", "\u{b5}f", "\u{3bc}f"]),
    remark(row(D::Capacitance, -6, "", &["uF", "mfd", "MFD", "Mfd", "mFD"]), "MFD on old sheets is the microfarad: read as uF"),
    remark(row(D::Capacitance, -12, "", &["pF", "mmfd", "MMFD", "uuF", "\u{b5}\u{b5}F", "\u{3bc}\u{3bc}F"]), "micro-microfarad on old sheets is the picofarad: read as pF"),
    row(D::Inductance, 0, "pnum", &["H", "henry", "henries", "Henry", "Henries"]),
    row(D::Frequency, 0, "kMG", &["Hz", "hz", "HZ", "hertz", "Hertz"]),
    row(D::Time, 0, "pnum", &["s", "sec", "secs", "second", "seconds"]),
    times(row(D::Time, 0, "", &["minute", "minutes"]), 60.0),
    times(row(D::Time, 0, "", &["h", "hour", "hours", "hr", "hrs"]), 3600.0),
    row(D::Length, -3, "", &["mm", "millimetre", "millimetres"]),
    row(D::Length, -2, "", &["cm", "centimetre", "centimetres"]),
    row(D::Length, -6, "", &["um", "\u{b5}m", "\u{3bc}m"]),
    row(D::Mass, -3, "mk", &["g", "gram", "grams", "gramme", "grammes"]),
    row(D::Mass, 0, "", &["kg", "KG", "kilogram", "kilograms"]),
    // Degree sign, masculine ordinal, ring above, and the one-character degree Celsius.
    row(D::Temperature, 0, "", &["degC", "\u{b0}C", "\u{ba}C", "\u{2da}C", "\u{2103}", "C", "degc", "DegC", "degreesC", "celsius", "Celsius"]),
    // U+212A is the kelvin sign, which an editor may insert.
    row(D::TemperatureDifference, 0, "m", &["K", "\u{212a}", "kelvin", "kelvins", "Kelvin"]),
    row(D::Angle, 0, "", &["deg", "degree", "degrees", "\u{b0}", "\u{ba}", "\u{2da}"]),
    row(D::FuseIntegral, 0, "", &["A2s", "A\u{b2}s", "A^2s", "A2S", "A2.s", "A\u{b2}\u{b7}s", "A2\u{b7}s"]),
    row(D::Energy, 0, "umk", &["J", "joule", "joules", "Joule", "Joules", "Ws"]),
    row(D::Ratio, -2, "", &["%", "percent", "pct"]),
    row(D::Decibel, 0, "", &["dB", "db", "DB", "Db"]),
];

/// `mu` comes before `m`, so that `muF` is a microfarad; `K` and `U` are accepted where the rest of
/// the text makes a unit, since no other prefix is written so.
const PREFIXES: &[(&str, &str, i32)] = &[
    ("p", "p", -12),
    ("n", "n", -9),
    ("mu", "u", -6),
    ("u", "u", -6),
    ("U", "u", -6),
    ("\u{b5}", "u", -6),
    ("\u{3bc}", "u", -6),
    ("m", "m", -3),
    ("k", "k", 3),
    ("K", "k", 3),
    ("M", "M", 6),
    ("G", "G", 9),
];

/// A unit that was recognised.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Unit {
    /// The usual spelling, prefix included.
    pub(super) symbol: String,
    pub(super) dimension: Dimension,
    /// Power of ten to the base unit.
    pub(super) ten: i32,
    /// Further factor to the base unit; 1 except for minutes and hours.
    pub(super) times: f64,
    pub(super) form: Form,
    /// What the user is told; mostly empty.
    pub(super) remark: &'static str,
}

/// What a unit's text turned out to be.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Lookup {
    /// A unit.
    Unit(Unit),
    /// A unit whose prefix nobody uses with it, and the units it may have been meant to be.
    BadPrefix(Vec<Unit>),
    /// A unit this language does not read, and which there is a way to rewrite.
    Foreign(Foreign),
    /// None.
    Unknown,
}

/// Texts people type that are no unit here but whose meaning is plain.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Foreign {
    /// Degrees Fahrenheit.
    Fahrenheit,
    /// Inches.
    Inch,
    /// A secondary voltage counted over both halves.
    CentreTapped,
    /// Volts from crest to trough.
    PeakToPeak,
    /// `W/K`, the reciprocal of a thermal resistance.
    Conductance,
    /// `min`.
    Min,
    /// `m` alone.
    Metre,
    /// A small omega, what case folding makes of the ohm sign.
    SmallOmega,
}

impl Foreign {
    /// What it measures.
    pub(super) fn dimension(self) -> Dimension {
        match self {
            Self::Fahrenheit => D::Temperature,
            Self::Inch | Self::Metre => D::Length,
            Self::CentreTapped | Self::PeakToPeak => D::Voltage,
            Self::Conductance => D::ThermalResistance,
            Self::Min => D::Time,
            Self::SmallOmega => D::Resistance,
        }
    }
}

#[rustfmt::skip]
const FOREIGN: &[(Foreign, &[&str])] = &[
    (Foreign::Fahrenheit, &["\u{b0}F", "\u{ba}F", "\u{2da}F", "degF", "\u{2109}", "Fahrenheit", "fahrenheit"]),
    (Foreign::Inch, &["in", "inch", "inches", "\"", "\u{2033}"]),
    (Foreign::CentreTapped, &["VCT", "Vct", "vct", "CT", "VACCT", "Vacct", "VacCT", "V-CT", "VCt", "V.C.T."]),
    (Foreign::PeakToPeak, &["Vpp", "VPP", "Vp-p", "Vpkpk", "Vpk-pk", "VP-P"]),
    (Foreign::Min, &["min", "mins"]),
    (Foreign::Metre, &["m", "metre", "metres", "meter", "meters"]),
    (Foreign::SmallOmega, &["\u{3c9}", "k\u{3c9}", "m\u{3c9}", "M\u{3c9}"]),
];

/// Longer texts are not looked up; the longest unit is half this.
const LONGEST: usize = 40;

/// Whether `text` is exactly a unit, so that no part may bear it as a name.
#[must_use]
pub fn is_unit(text: &str) -> bool {
    matches!(lookup(text), Lookup::Unit(_))
}

/// Finds the unit spelled `text`, compound units included.
pub(super) fn lookup(text: &str) -> Lookup {
    if text.is_empty() || text.len() > LONGEST {
        return Lookup::Unknown;
    }
    if let Some(unit) = simple(text) {
        return Lookup::Unit(unit);
    }
    if let Some((top, bottom)) = text.split_once('/') {
        return compound(top.trim_end(), bottom.trim_start());
    }
    if let Some((foreign, _)) = FOREIGN.iter().find(|(_, all)| all.contains(&text)) {
        return Lookup::Foreign(*foreign);
    }
    let meant = other_prefixes(text);
    if meant.is_empty() {
        Lookup::Unknown
    } else {
        Lookup::BadPrefix(meant)
    }
}

fn simple(text: &str) -> Option<Unit> {
    if let Some(row) = ROWS.iter().find(|row| row.spellings.contains(&text)) {
        return Some(unit_of(row, "", 0));
    }
    PREFIXES.iter().find_map(|&(spelling, prefix, ten)| {
        let rest = text.strip_prefix(spelling)?;
        let row = ROWS
            .iter()
            .find(|row| row.spellings.contains(&rest) && row.prefixes.contains(prefix))?;
        Some(unit_of(row, prefix, ten))
    })
}

fn unit_of(row: &Row, prefix: &str, ten: i32) -> Unit {
    let usual = row.spellings.first().copied().unwrap_or_default();
    Unit {
        symbol: format!("{prefix}{usual}"),
        dimension: row.dimension,
        ten: row.ten + ten,
        times: row.times,
        form: row.form,
        remark: row.remark,
    }
}

fn compound(top: &str, bottom: &str) -> Lookup {
    let (Some(top), Some(bottom)) = (simple(top), simple(bottom)) else {
        return Lookup::Unknown;
    };
    let per_kelvin = matches!(bottom.dimension, D::TemperatureDifference | D::Temperature);
    let dimension = match top.dimension {
        D::TemperatureDifference | D::Temperature if bottom.dimension == D::Power => {
            D::ThermalResistance
        }
        D::Voltage if bottom.dimension == D::Time => D::SlewRate,
        D::Voltage if per_kelvin => D::VoltagePerKelvin,
        D::Energy if per_kelvin => D::HeatCapacity,
        D::Ratio if per_kelvin => D::PercentPerKelvin,
        D::Power if per_kelvin => return Lookup::Foreign(Foreign::Conductance),
        _ => return Lookup::Unknown,
    };
    Lookup::Unit(Unit {
        symbol: format!("{}/{}", kelvin(&top), kelvin(&bottom)),
        dimension,
        ten: top.ten - bottom.ten,
        times: top.times / bottom.times,
        form: Form::Plain,
        remark: "",
    })
}

/// In a compound unit a degree Celsius is a kelvin.
fn kelvin(unit: &Unit) -> &str {
    if unit.dimension == D::Temperature {
        "K"
    } else {
        &unit.symbol
    }
}

/// The units `text` may have been meant to be if it is a unit with a prefix nobody uses with it:
/// `MA` for `mA`, `mHz` for `MHz`, `MF` for `uF` or `mF`.
fn other_prefixes(text: &str) -> Vec<Unit> {
    let (rest, others): (&str, &[&str]) = if let Some(rest) = text.strip_prefix('M') {
        (rest, &["u", "m", "k"])
    } else if let Some(rest) = text.strip_prefix('m') {
        (rest, &["M"])
    } else {
        return Vec::new();
    };
    let Some(row) = ROWS
        .iter()
        .find(|row| row.spellings.contains(&rest) && !row.prefixes.is_empty())
    else {
        return Vec::new();
    };
    // The micro prefix is offered for farads only: there alone is M, as in MFD, a habit for it.
    others
        .iter()
        .filter(|prefix| row.prefixes.contains(**prefix))
        .filter(|prefix| **prefix != "u" || row.dimension == D::Capacitance)
        .filter(|prefix| **prefix != "k" || !row.prefixes.contains('m'))
        .map(|prefix| unit_of(row, prefix, 0))
        .collect()
}

/// The unit that `text` would be if the case of its letters did not matter, among `wanted`.
pub(super) fn ignoring_case(text: &str, wanted: &[Dimension]) -> Option<String> {
    let fits = |row: &Row, prefix: &str| {
        wanted.contains(&row.dimension)
            && row.spellings.iter().any(|s| {
                text.len() == prefix.len() + s.len()
                    && text.is_char_boundary(prefix.len())
                    && text.split_at_checked(prefix.len()).is_some_and(|(p, u)| {
                        p.eq_ignore_ascii_case(prefix) && u.eq_ignore_ascii_case(s)
                    })
            })
    };
    ROWS.iter().find_map(|row| {
        if fits(row, "") {
            return Some(unit_of(row, "", 0).symbol);
        }
        PREFIXES
            .iter()
            .find(|(spelling, prefix, _)| row.prefixes.contains(prefix) && fits(row, spelling))
            .map(|(_, prefix, _)| unit_of(row, prefix, 0).symbol)
    })
}

/// The unit of `dimension` with the prefix milli, if it takes that.
pub(super) fn milli(dimension: Dimension) -> Option<String> {
    ROWS.iter()
        .find(|row| row.dimension == dimension && row.prefixes.contains('m'))
        .map(|row| unit_of(row, "m", 0).symbol)
}

/// The unit that a bare prefix stands for where `dimension` is wanted: `22k`, `100n`.
pub(super) fn bare_prefix(text: &str, dimension: Dimension) -> Option<Unit> {
    let (allowed, base) = match dimension {
        D::Resistance => ("mkMG", "ohm"),
        D::Capacitance => ("pnum", "F"),
        D::Inductance => ("num", "H"),
        _ => return None,
    };
    let &(_, prefix, ten) = PREFIXES
        .iter()
        .find(|(spelling, prefix, _)| *spelling == text && allowed.contains(prefix))?;
    // A capital K alone is the kelvin, U alone nothing.
    if text == "K" || text == "U" {
        return None;
    }
    Some(Unit {
        symbol: format!("{prefix}{base}"),
        dimension,
        ten,
        times: 1.0,
        form: Form::Plain,
        remark: "",
    })
}
