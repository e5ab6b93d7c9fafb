//! The physical quantities that cross the boundary of a physics function.
//! Knows nothing of text, spans, files or rules.
//!
//! Each is an `f64` in the SI unit its name states. Only combinations that mean
//! something compile: volts divide by ohms into amps, two absolute temperatures
//! subtract into a difference and cannot be added.

use std::ops::{Add, AddAssign, Div, Mul, Neg, Sub, SubAssign};

macro_rules! quantity {
    ($($(#[$doc:meta])* $name:ident;)*) => { $(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq, PartialOrd, Default)]
        pub struct $name(pub f64);
        impl $name {
            /// Zero of this quantity.
            pub const ZERO: Self = Self(0.0);
            /// The modulus.
            #[must_use]
            pub fn abs(self) -> Self { Self(self.0.abs()) }
            /// The greater of two.
            #[must_use]
            pub fn max(self, other: Self) -> Self { Self(self.0.max(other.0)) }
            /// The lesser of two.
            #[must_use]
            pub fn min(self, other: Self) -> Self { Self(self.0.min(other.0)) }
            /// Neither NaN nor infinite.
            #[must_use]
            pub fn is_finite(self) -> bool { self.0.is_finite() }
        }
        impl Add for $name { type Output = Self; fn add(self, o: Self) -> Self { Self(self.0 + o.0) } }
        impl Sub for $name { type Output = Self; fn sub(self, o: Self) -> Self { Self(self.0 - o.0) } }
        impl AddAssign for $name { fn add_assign(&mut self, o: Self) { self.0 += o.0; } }
        impl SubAssign for $name { fn sub_assign(&mut self, o: Self) { self.0 -= o.0; } }
        impl Neg for $name { type Output = Self; fn neg(self) -> Self { Self(-self.0) } }
        impl Mul<f64> for $name { type Output = Self; fn mul(self, k: f64) -> Self { Self(self.0 * k) } }
        impl Mul<$name> for f64 { type Output = $name; fn mul(self, q: $name) -> $name { $name(self * q.0) } }
        impl Div<f64> for $name { type Output = Self; fn div(self, k: f64) -> Self { Self(self.0 / k) } }
        impl Div for $name { type Output = f64; fn div(self, o: Self) -> f64 { self.0 / o.0 } }
    )* };
}

quantity! {
    /// Volts; whether peak, r.m.s. or steady is said where it is used.
    Volt;
    /// Amperes.
    Amp;
    /// Ohms.
    Ohm;
    /// Watts.
    Watt;
    /// Farads.
    Farad;
    /// Henries.
    Henry;
    /// Hertz.
    Hertz;
    /// Seconds.
    Second;
    /// Joules.
    Joule;
    /// A temperature DIFFERENCE in kelvins (a rise, a tolerance); never an absolute temperature.
    Kelvin;
    /// Thermal resistance, kelvins per watt.
    KelvinPerWatt;
    /// Let-through integral of current squared, A²s.
    AmpSquaredSecond;
    /// Slew rate, volts per second.
    VoltPerSecond;
    /// Temperature coefficient of a voltage, volts per kelvin.
    VoltPerKelvin;
}

/// An ABSOLUTE temperature in degrees Celsius. Two of them subtract into a [`Kelvin`].
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd, Default)]
pub struct Celsius(pub f64);

impl Celsius {
    /// The hotter of two.
    #[must_use]
    pub fn max(self, other: Self) -> Self {
        Self(self.0.max(other.0))
    }
    /// The colder of two.
    #[must_use]
    pub fn min(self, other: Self) -> Self {
        Self(self.0.min(other.0))
    }
}
impl Sub for Celsius {
    type Output = Kelvin;
    fn sub(self, o: Self) -> Kelvin {
        Kelvin(self.0 - o.0)
    }
}
impl Add<Kelvin> for Celsius {
    type Output = Self;
    fn add(self, d: Kelvin) -> Self {
        Self(self.0 + d.0)
    }
}
impl Sub<Kelvin> for Celsius {
    type Output = Self;
    fn sub(self, d: Kelvin) -> Self {
        Self(self.0 - d.0)
    }
}

/// `$a * $b = $c`, with both quotients.
macro_rules! product {
    ($($a:ident * $b:ident = $c:ident;)*) => { $(
        impl Mul<$b> for $a { type Output = $c; fn mul(self, o: $b) -> $c { $c(self.0 * o.0) } }
        impl Mul<$a> for $b { type Output = $c; fn mul(self, o: $a) -> $c { $c(self.0 * o.0) } }
        impl Div<$b> for $c { type Output = $a; fn div(self, o: $b) -> $a { $a(self.0 / o.0) } }
        impl Div<$a> for $c { type Output = $b; fn div(self, o: $a) -> $b { $b(self.0 / o.0) } }
    )* };
}

product! {
    Amp * Ohm = Volt;
    Volt * Amp = Watt;
    Ohm * Farad = Second;
    Watt * Second = Joule;
    Watt * KelvinPerWatt = Kelvin;
    VoltPerSecond * Second = Volt;
    VoltPerKelvin * Kelvin = Volt;
}
