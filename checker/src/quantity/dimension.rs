//! The dimensions a text may state, what they are called and the unit a person would type.
//! Must not know how units are spelled in text, nor which key wants which dimension.

/// What a quantity measures. The unit named is the base unit of [`super::Quantity::value`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Dimension {
    /// Volts.
    Voltage,
    /// Amperes.
    Current,
    /// Watts.
    Power,
    /// Volt-amperes.
    ApparentPower,
    /// Ohms.
    Resistance,
    /// Farads.
    Capacitance,
    /// Henries.
    Inductance,
    /// Hertz.
    Frequency,
    /// Seconds.
    Time,
    /// Metres.
    Length,
    /// Kilograms.
    Mass,
    /// An absolute temperature, degrees Celsius.
    Temperature,
    /// A rise, a spread or a tolerance of temperature, kelvins.
    TemperatureDifference,
    /// Degrees of arc.
    Angle,
    /// Kelvins per watt.
    ThermalResistance,
    /// Volts per second.
    SlewRate,
    /// Melting integral of a fuse, A²s.
    FuseIntegral,
    /// Joules.
    Energy,
    /// Joules per kelvin.
    HeatCapacity,
    /// Volts per kelvin.
    VoltagePerKelvin,
    /// Fraction per kelvin: 0.01 for 1 %/K.
    PercentPerKelvin,
    /// A fraction: 0.07 for 7 %.
    Ratio,
    /// Decibels, as given.
    Decibel,
    /// A plain number without unit.
    Number,
}

impl Dimension {
    /// Every dimension.
    pub const ALL: [Self; 24] = [
        Self::Voltage,
        Self::Current,
        Self::Power,
        Self::ApparentPower,
        Self::Resistance,
        Self::Capacitance,
        Self::Inductance,
        Self::Frequency,
        Self::Time,
        Self::Length,
        Self::Mass,
        Self::Temperature,
        Self::TemperatureDifference,
        Self::Angle,
        Self::ThermalResistance,
        Self::SlewRate,
        Self::FuseIntegral,
        Self::Energy,
        Self::HeatCapacity,
        Self::VoltagePerKelvin,
        Self::PercentPerKelvin,
        Self::Ratio,
        Self::Decibel,
        Self::Number,
    ];

    /// Article and name, as a sentence needs it: `a voltage`.
    #[must_use]
    pub const fn name(self) -> &'static str {
        self.words().0
    }

    /// The unit a person would type first: `uF` for a capacitance. Empty for a plain number.
    #[must_use]
    pub const fn usual_unit(self) -> &'static str {
        self.words().1
    }

    /// A text of this dimension, to show in a hint.
    #[must_use]
    pub const fn example(self) -> &'static str {
        self.words().2
    }

    /// The dimension of a difference of two of these: kelvins for a temperature, else the same.
    #[must_use]
    pub const fn difference(self) -> Self {
        match self {
            Self::Temperature => Self::TemperatureDifference,
            other => other,
        }
    }

    const fn words(self) -> (&'static str, &'static str, &'static str) {
        match self {
            Self::Voltage => ("a voltage", "V", "28 V"),
            Self::Current => ("a current", "A", "50 mA"),
            Self::Power => ("a power", "W", "5 W"),
            Self::ApparentPower => ("an apparent power", "VA", "300 VA"),
            Self::Resistance => ("a resistance", "ohm", "4.7 ohm"),
            Self::Capacitance => ("a capacitance", "uF", "4700 uF"),
            Self::Inductance => ("an inductance", "uH", "2 uH"),
            Self::Frequency => ("a frequency", "Hz", "20 kHz"),
            Self::Time => ("a time", "s", "400 ms"),
            Self::Length => ("a length", "mm", "75 mm"),
            Self::Mass => ("a mass", "kg", "1.4 kg"),
            Self::Temperature => ("a temperature", "degC", "80 degC"),
            Self::TemperatureDifference => ("a temperature difference", "K", "5 K"),
            Self::Angle => ("an angle", "deg", "45 deg"),
            Self::ThermalResistance => ("a thermal resistance", "K/W", "0.45 K/W"),
            Self::SlewRate => ("a slew rate", "V/us", "20 V/us"),
            Self::FuseIntegral => ("a melting integral", "A2s", "25 A2s"),
            Self::Energy => ("an energy", "J", "60 J"),
            Self::HeatCapacity => ("a heat capacity", "J/K", "900 J/K"),
            Self::VoltagePerKelvin => ("a voltage drift", "mV/K", "-2 mV/K"),
            Self::PercentPerKelvin => ("a drift in percent", "%/K", "0.4 %/K"),
            Self::Ratio => ("a percentage", "%", "75 %"),
            Self::Decibel => ("a level in decibels", "dB", "28 dB"),
            Self::Number => ("a plain number", "", "80"),
        }
    }
}
