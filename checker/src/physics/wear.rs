//! What heat does to parts over time or at once: life of electrolytics, power of resistors.
//! Must not know where the heat comes from.

use crate::physics::math::pow;
use crate::physics::unit::{Amp, Celsius, Kelvin, Watt};

/// Core temperature of a capacitor: the air around it and the rise by its own ripple, which goes with
/// the square of the current: T = Ta + ΔT_rated·(I/I_rated)².
///
/// `rated_rise` is the rise of the core at the rated ripple current; where the sheet states none, 5 K is
/// common for 105 degC types and 10 K for 85 degC types (common practice, no source).
/// `None` unless the rated current is above zero and everything is finite.
#[must_use]
pub fn core_temperature(
    air: Celsius,
    ripple: Amp,
    rated_ripple: Amp,
    rated_rise: Kelvin,
) -> Option<Celsius> {
    let part = ripple / rated_ripple;
    let core = air + rated_rise * (part * part);
    (rated_ripple.0 > 0.0 && core.0.is_finite()).then_some(core)
}

/// Life in hours of an aluminium electrolytic by the 10 K rule: L = L0·2^((T0 - T)/10 K), with L0 hours
/// stated at a core temperature T0 and the core at T.
///
/// Holds from T0 down to about 40 degC; makers' own tables lie within some 10 % of it, one publishing
/// 11.1 K for each doubling. Below 40 degC the life is that at 40 degC: seals age too (common
/// practice, no source). A life stated WITH rated ripple is stated at a core hotter than the
/// temperature printed; taking the printed one for T0 is the lower figure.
/// `None` unless the hours are above zero and everything is finite.
#[must_use]
pub fn electrolytic_life_hours(
    stated_hours: f64,
    stated_core: Celsius,
    core: Celsius,
) -> Option<f64> {
    let cooler = stated_core - core.max(COOLEST_CORE);
    let hours = stated_hours * pow(2.0, cooler.0 / 10.0);
    (stated_hours > 0.0 && core.0.is_finite() && hours.is_finite()).then_some(hours)
}

/// The 10 K rule is not carried below this.
const COOLEST_CORE: Celsius = Celsius(40.0);

/// Full rating of a resistor up to here, none at the other end.
const RESISTOR_FULL: Celsius = Celsius(70.0);
const RESISTOR_NONE: Celsius = Celsius(155.0);

/// What a resistor rated at 70 degC may dissipate in air at `ambient`: all up to 70 degC, then straight
/// down to nothing at 155 degC, P = P70·(155 - T)/85. The curve of common metal-film and
/// wirewound types (Yageo MFR, Vishay MRS25); a type with another end is cooler or hotter than it.
#[must_use]
pub fn resistor_rating(at_70: Watt, ambient: Celsius) -> Watt {
    let part = (RESISTOR_NONE - ambient) / (RESISTOR_NONE - RESISTOR_FULL);
    at_70 * if part > 0.0 { part.min(1.0) } else { 0.0 }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nonsense_is_refused() {
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert_eq!(
                electrolytic_life_hours(bad, Celsius(85.0), Celsius(50.0)),
                None
            );
        }
        assert_eq!(
            electrolytic_life_hours(1e3, Celsius(85.0), Celsius(f64::NAN)),
            None
        );
        assert_eq!(
            core_temperature(Celsius(40.0), Amp(1.0), Amp(0.0), Kelvin(5.0)),
            None
        );
        assert_eq!(
            core_temperature(Celsius(40.0), Amp(f64::NAN), Amp(1.0), Kelvin(5.0)),
            None
        );
    }

    #[test]
    fn a_rated_ripple_gives_the_rated_rise_and_half_of_it_a_quarter() {
        // By hand: 5 K·(1/2)² = 1.25 K.
        let of = |i| core_temperature(Celsius(40.0), Amp(i), Amp(2.0), Kelvin(5.0)).unwrap();
        assert!((of(2.0).0 - 45.0).abs() < 1e-12 && (of(1.0).0 - 41.25).abs() < 1e-12);
    }

    #[test]
    fn a_cold_core_earns_no_more_life_than_one_at_40() {
        let of = |t| electrolytic_life_hours(1e3, Celsius(85.0), Celsius(t)).unwrap();
        assert!((of(-20.0) - of(40.0)).abs() < 1e-9);
        assert!(of(95.0) < 1e3, "hotter than stated is shorter");
    }

    #[test]
    fn a_resistor_keeps_its_rating_in_the_cold_and_has_none_beyond_the_end() {
        assert_eq!(resistor_rating(Watt(2.0), Celsius(-40.0)), Watt(2.0));
        assert_eq!(resistor_rating(Watt(2.0), Celsius(200.0)), Watt(0.0));
    }
}
