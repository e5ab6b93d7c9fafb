//! Temperatures from watts: sink, case and junction, what a hot device may still dissipate, and how
//! long a cold amplifier takes to reach a temperature.
//! Must not know where the watts come from or which temperature is allowed.

use super::heatsink::Sink;
use super::math;
use super::unit::{Celsius, Kelvin, KelvinPerWatt, Second, Watt};

/// Specific heat of aluminium, J/(kg·K).
pub const ALUMINIUM_HEAT_J_PER_KG_K: f64 = 900.0;

/// The way of the heat from a junction to the sink.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Mounting {
    /// θjc, junction to case.
    pub junction_case: KelvinPerWatt,
    /// θcs, case to sink through insulator and grease.
    pub case_sink: KelvinPerWatt,
}

/// Temperatures of one device.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Temperatures {
    /// Of the sink beside the device.
    pub sink: Celsius,
    /// Of its case.
    pub case: Celsius,
    /// Of its junction, mean.
    pub junction: Celsius,
}

impl Mounting {
    /// Temperatures of a device that dissipates `watts` on a place of the sink:
    /// `Tcase = Tsink + P·θcs`, `Tj = Tcase + P·θjc`.
    ///
    /// The sink may be solved or held (at the trip of a cutout). `None` if a value is negative or not
    /// finite.
    #[must_use]
    pub fn temperatures(&self, sink: Celsius, watts: Watt) -> Option<Temperatures> {
        if !self.sensible() || watts.0 < 0.0 {
            return None;
        }
        let case = sink + watts * self.case_sink;
        let junction = case + watts * self.junction_case;
        junction.0.is_finite().then_some(Temperatures {
            sink,
            case,
            junction,
        })
    }

    fn sensible(&self) -> bool {
        let good = |r: KelvinPerWatt| r.is_finite() && r.0 >= 0.0;
        good(self.junction_case) && good(self.case_sink)
    }
}

/// Mean temperature of a sink that takes `total` watts: every device, driver and channel on it.
///
/// `air` is the air the sink stands in: ambient, plus the rise inside the enclosure where the sink
/// is inside. `None` if the watts are negative or not finite.
#[must_use]
pub fn sink_temperature(sink: &Sink, air: Celsius, total: Watt) -> Option<Celsius> {
    let temperature = air + sink.rise(total, air)?;
    temperature.0.is_finite().then_some(temperature)
}

/// Temperature of the sink under the hottest of n places, from its mean and the spread from the
/// hottest place to the coolest: `T = mean + spread·(n - 1)/n`.
///
/// That is the most a place can stand above the mean of n places within such a spread: one hot and
/// the rest alike. One place is the mean itself. `None` without a place or for a negative spread.
#[must_use]
pub fn hottest_place(mean: Celsius, spread: Kelvin, places: u32) -> Option<Celsius> {
    if places == 0 || !(spread.is_finite() && spread.0 >= 0.0) {
        return None;
    }
    let n = f64::from(places);
    Some(mean + spread * ((n - 1.0) / n))
}

/// What shares a sink when its greatest permissible dissipation is asked for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sharing {
    /// Devices on the sink, all dissipating alike.
    pub devices: u32,
    /// Watts of everything else on it (drivers).
    pub other: Watt,
}

/// The watts each of n like devices may dissipate before its junction reaches `limit`:
/// the P for which `Tair + ΔT(n·P + other) + P(θcs + θjc) = limit`.
///
/// With a sink of constant resistance it is `(limit - Tair)/(θjc + θcs + n·Rsa)`; the resistance of a
/// real one falls with its rise, hence the search (monotone, bounded). Zero if the sink is past the
/// limit before the devices add to it. `None` for input without meaning.
#[must_use]
pub fn greatest_power(
    sink: &Sink,
    air: Celsius,
    mounting: Mounting,
    sharing: Sharing,
    limit: Celsius,
) -> Option<Watt> {
    let headroom = limit - air;
    if sharing.devices == 0 || !mounting.sensible() || !headroom.is_finite() {
        return None;
    }
    let n = f64::from(sharing.devices);
    let path = mounting.junction_case + mounting.case_sink;
    let over = |watts: f64| {
        sink.rise(Watt(n * watts) + sharing.other, air)
            .map_or(f64::NAN, |rise| (rise + Watt(watts) * path - headroom).0)
    };
    let idle = over(0.0);
    if idle >= 0.0 {
        return Some(Watt::ZERO);
    }
    let top = sink.watts(headroom.max(Kelvin::ZERO), air)? / n;
    math::root(over, 0.0, top.0, 1e-9).map(Watt)
}

/// Straight-line derating: `rated` up to `knee`, falling to nothing at `zero`:
/// `P = rated·(zero - T)/(zero - knee)`, never above `rated` nor below zero.
///
/// A device: knee 25 °C (the case at which its power is stated), zero `Tj,max`. A film resistor:
/// knee 70 °C, zero 155 °C of air. `None` if zero is not above the knee, or for a negative rating.
#[must_use]
pub fn derated(rated: Watt, knee: Celsius, zero: Celsius, at: Celsius) -> Option<Watt> {
    let (span, left) = (zero - knee, zero - at);
    let sensible = span.is_finite() && span.0 > 0.0 && left.is_finite();
    if !sensible || !rated.is_finite() || rated.0 < 0.0 {
        return None;
    }
    Some(rated * (left / span).clamp(0.0, 1.0))
}

/// θjc that a stated power implies: `(Tj,max - Tcase)/Ptot`. `None` unless both are positive.
#[must_use]
pub fn junction_case(power: Watt, case: Celsius, junction_max: Celsius) -> Option<KelvinPerWatt> {
    let theta = (junction_max - case) / power;
    (power.0 > 0.0 && theta.is_finite() && theta.0 > 0.0).then_some(theta)
}

/// Time from cold (sink at the temperature of the air) until the sink stands `rise` above it, at
/// constant watts: the integral of `c·m dT/(P - Q(T))`, Q(T) what the sink gives off at the rise T.
///
/// Only the sink's own heat capacity counts, so the true time is longer. With
/// `T = Tend(1 - exp(-z²))` the integrand `2z·c·m·(Tend - T)/(P - Q)` is bounded and smooth from the
/// start, where Q grows as T^5/4, to near the end, where both differences vanish together;
/// Simpson's rule on 64 steps is then good to 1e-7.
///
/// `None` if the rise is never reached (within a millionth of the final rise counts as never), or
/// the mass is not positive.
#[must_use]
pub fn time_to_rise(
    sink: &Sink,
    air: Celsius,
    mass_kg: f64,
    watts: Watt,
    rise: Kelvin,
) -> Option<Second> {
    const STEPS: u32 = 64;
    let end = sink.rise(watts, air)?;
    let reached = rise / end;
    let sensible = mass_kg.is_finite() && mass_kg > 0.0 && rise.0 >= 0.0;
    if !(sensible && reached <= 1.0 - 1e-6) {
        return None;
    }
    let last = (-math::ln_1p(-reached)).sqrt();
    let step = last / f64::from(STEPS);
    let integrand = |z: f64| {
        let left = math::exp(-z * z);
        let here = Kelvin(-end.0 * math::expm1(-z * z));
        let surplus = watts - sink.watts(here, air)?;
        Some(2.0 * z * end.0 * left / surplus.0)
    };
    let mut sum = 0.0;
    for k in 0..=STEPS {
        let weight = match k {
            0 | STEPS => 1.0,
            odd if odd % 2 == 1 => 4.0,
            _ => 2.0,
        };
        sum += weight * integrand(step * f64::from(k))?;
    }
    let seconds = Second(ALUMINIUM_HEAT_J_PER_KG_K * mass_kg * sum * step / 3.0);
    seconds.is_finite().then_some(seconds)
}

/// How long a part is touched.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Contact {
    /// Longer than a minute.
    Held,
    /// Ten seconds to a minute.
    Gripped,
    /// One to ten seconds.
    Brushed,
    /// Less than a second.
    Grazed,
}

/// What is touched.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Surface {
    /// Metal.
    Metal,
    /// Glass, porcelain, vitreous material.
    Glass,
    /// Plastic, rubber.
    Plastic,
}

/// The touch-temperature limit for a class-1 thermal energy source.
///
/// Source: IEC 62368-1 Table 38, TS1 (from memory, except plastic touched for 1 to 10 s, which was
/// found restated). The limits are absolute, judged at 25 °C ambient, and not raised with the
/// ambient.
#[must_use]
pub fn touch_limit(surface: Surface, contact: Contact) -> Celsius {
    use Contact::{Brushed, Grazed, Gripped, Held};
    use Surface::{Glass, Metal, Plastic};
    Celsius(match (surface, contact) {
        (_, Held) => 48.0,
        (Metal, Gripped) => 51.0,
        (Glass, Gripped) => 56.0,
        (Metal, Brushed) | (Plastic, Gripped) => 60.0,
        (Metal, Grazed) => 70.0,
        (Glass, Brushed) => 71.0,
        (Plastic, Brushed) => 77.0,
        (Glass, Grazed) => 85.0,
        (Plastic, Grazed) => 94.0,
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::physics::heatsink::{FinnedSink, Geometry, Material, Orientation, StatedSink};
    use proptest::prelude::*;

    fn stated(r: f64, at: f64) -> Sink {
        Sink::Stated(StatedSink::new(KelvinPerWatt(r), Kelvin(at)).unwrap())
    }

    fn finned() -> Sink {
        let shape = Geometry {
            width_m: 0.3,
            length_m: 0.1,
            plate_m: 0.01,
            fins: 25,
            fin_height_m: 0.04,
            fin_m: 0.002,
            gap_m: 0.01,
            orientation: Orientation::Vertical,
            back_open: false,
        };
        let black = Material {
            emissivity: 0.85,
            conductivity_w_per_mk: 200.0,
        };
        Sink::Finned(FinnedSink::new(shape, black).unwrap())
    }

    /// Brute-force twin: fourth-order Runge-Kutta in time with small steps, no substitution.
    fn marched(sink: &Sink, air: Celsius, mass: f64, watts: f64, rise: f64, dt: f64) -> f64 {
        let slope = |t: f64| {
            let q = sink.watts(Kelvin(t), air).unwrap().0;
            (watts - q) / (ALUMINIUM_HEAT_J_PER_KG_K * mass)
        };
        let (mut t, mut time) = (0.0, 0.0);
        loop {
            let k1 = slope(t);
            let k2 = slope(t + 0.5 * dt * k1);
            let k3 = slope(t + 0.5 * dt * k2);
            let k4 = slope(t + dt * k3);
            let next = t + dt * (k1 + 2.0 * k2 + 2.0 * k3 + k4) / 6.0;
            if next >= rise {
                return time + dt * (rise - t) / (next - t);
            }
            (t, time) = (next, time + dt);
        }
    }

    #[test]
    fn time_to_rise_agrees_with_a_march() {
        for (sink, watts, fraction) in [
            (stated(0.5, 50.0), 80.0, 0.9),
            (stated(0.5, 50.0), 80.0, 0.2),
            (finned(), 60.0, 0.95),
            (finned(), 200.0, 0.5),
        ] {
            let air = Celsius(25.0);
            let rise = sink.rise(Watt(watts), air).unwrap() * fraction;
            let fast = time_to_rise(&sink, air, 1.5, Watt(watts), rise).unwrap().0;
            let slow = marched(&sink, air, 1.5, watts, rise.0, 0.05);
            assert!((fast - slow).abs() < 2e-6 * slow, "{fast} {slow}");
        }
    }

    proptest! {
        /// For the stated law the integral has a series: with u = ΔT/ΔTend,
        /// t = c·m·(ΔTend/P)·Σ u^(1 + 5k/4)/(1 + 5k/4), k = 0, 1, 2, …
        #[test]
        fn time_to_rise_agrees_with_the_series(
            r in 0.05..5.0_f64, watts in 1.0..500.0_f64, u in 0.0..0.97_f64, mass in 0.05..10.0_f64,
        ) {
            let sink = stated(r, 50.0);
            let end = sink.rise(Watt(watts), Celsius(20.0)).unwrap().0;
            let got = time_to_rise(&sink, Celsius(20.0), mass, Watt(watts), Kelvin(u * end)).unwrap().0;
            let series: f64 = (0..2000)
                .map(|k| 1.0 + 1.25 * f64::from(k))
                .map(|p| libm::pow(u, p) / p)
                .sum();
            let want = 900.0 * mass * end / watts * series;
            prop_assert!((got - want).abs() <= 1e-6 * want, "{got} {want}");
        }

        #[test]
        fn greatest_power_brings_the_junction_to_the_limit(
            r in 0.05..5.0_f64, jc in 0.1..3.0_f64, cs in 0.05..2.0_f64, n in 1_u32..17,
            other in 0.0..20.0_f64, air in 0.0..60.0_f64, limit in 100.0..200.0_f64,
        ) {
            for sink in [stated(r, 50.0), finned()] {
                let mounting = Mounting { junction_case: KelvinPerWatt(jc), case_sink: KelvinPerWatt(cs) };
                let sharing = Sharing { devices: n, other: Watt(other) };
                let p = greatest_power(&sink, Celsius(air), mounting, sharing, Celsius(limit)).unwrap();
                let total = p * f64::from(n) + Watt(other);
                let ts = sink_temperature(&sink, Celsius(air), total).unwrap();
                let t = mounting.temperatures(ts, p).unwrap();
                if p.0 > 0.0 {
                    prop_assert!((t.junction.0 - limit).abs() < 1e-6, "{}", t.junction.0);
                } else {
                    prop_assert!(t.junction.0 >= limit);
                }
            }
        }

        #[test]
        fn hottest_place_bounds_every_pattern(temps in proptest::collection::vec(40.0..90.0_f64, 1..12)) {
            let n = u32::try_from(temps.len()).unwrap();
            let mean = temps.iter().sum::<f64>() / f64::from(n);
            let hot = temps.iter().copied().fold(f64::MIN, f64::max);
            let cool = temps.iter().copied().fold(f64::MAX, f64::min);
            let bound = hottest_place(Celsius(mean), Kelvin(hot - cool), n).unwrap();
            prop_assert!(bound.0 >= hot - 1e-9);
        }

        #[test]
        fn no_number_from_nonsense(a in proptest::num::f64::ANY, b in proptest::num::f64::ANY, c in proptest::num::f64::ANY, d in proptest::num::f64::ANY, n in any::<u32>()) {
            let mounting = Mounting { junction_case: KelvinPerWatt(a), case_sink: KelvinPerWatt(b) };
            let sharing = Sharing { devices: n, other: Watt(c) };
            let sink = stated(0.5, 50.0);
            prop_assert!(mounting.temperatures(Celsius(c), Watt(d)).is_none_or(|t| t.junction.0.is_finite() && t.case.0.is_finite()));
            prop_assert!(greatest_power(&sink, Celsius(d), mounting, sharing, Celsius(c)).is_none_or(Watt::is_finite));
            prop_assert!(derated(Watt(a), Celsius(b), Celsius(c), Celsius(d)).is_none_or(Watt::is_finite));
            prop_assert!(junction_case(Watt(a), Celsius(b), Celsius(c)).is_none_or(KelvinPerWatt::is_finite));
            prop_assert!(time_to_rise(&sink, Celsius(a), b, Watt(c), Kelvin(d)).is_none_or(Second::is_finite));
        }
    }

    #[test]
    fn a_rise_never_reached_has_no_time() {
        let sink = stated(0.5, 50.0);
        let end = sink.rise(Watt(80.0), Celsius(25.0)).unwrap();
        assert_eq!(
            time_to_rise(&sink, Celsius(25.0), 1.0, Watt(80.0), end),
            None
        );
        assert_eq!(
            time_to_rise(&sink, Celsius(25.0), 1.0, Watt(0.0), Kelvin(1.0)),
            None
        );
    }

    #[test]
    fn places_share_one_mean() {
        // Two places 10 K apart: 5 K above the mean. One place: the mean.
        let at = |n| hottest_place(Celsius(60.0), Kelvin(10.0), n).unwrap().0;
        assert!((at(2) - 65.0).abs() < 1e-12 && (at(1) - 60.0).abs() < 1e-12);
        assert_eq!(hottest_place(Celsius(60.0), Kelvin(10.0), 0), None);
    }
}
