//! Miniature fuse-links: how long one may take to melt, what pulses it stands, and what it carries
//! when warm.
//! Must not know which circuit a fuse is in, nor what a fuse is to protect.
//!
//! All of it is for ratings by IEC 60127-2 (5 x 20 mm), where a fuse must HOLD 1.5 times its rating
//! for half an hour or an hour and may carry its rating for ever. A rating by UL 248-14 must OPEN
//! within an hour at 1.35 times and within two minutes at twice; such a fuse carries no more than
//! about 75 % of its number for long (common practice, no source), and the two numbers must not
//! be taken for each other.

use crate::physics::unit::{Amp, AmpSquaredSecond, Celsius, Second};

/// How fast a fuse-link acts.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Speed {
    /// Time-lag, marked T.
    Slow,
    /// Quick-acting, marked F.
    Fast,
}

/// Pre-arcing times one standard sheet allows for a band of ratings, in seconds.
struct Gates {
    speed: Speed,
    /// First rating of the band and the first that is no longer in it, amperes.
    from: f64,
    below: f64,
    /// Least at 1.5 times the rating.
    hold: f64,
    /// Most at 2.1 times.
    open: f64,
    /// Least and most at 2.75, 4 and 10 times.
    at_2_75: (f64, f64),
    at_4: (f64, f64),
    at_10: (f64, f64),
}

const fn gates(
    speed: Speed,
    (from, below): (f64, f64),
    (hold, open): (f64, f64),
    [at_2_75, at_4, at_10]: [(f64, f64); 3],
) -> Gates {
    Gates {
        speed,
        from,
        below,
        hold,
        open,
        at_2_75,
        at_4,
        at_10,
    }
}

const MINUTES_15: f64 = 900.0;
const MINUTES_30: f64 = 1800.0;
const HOUR: f64 = 3600.0;

/// IEC 60127-2 sheets 1, 2, 3 and 5, as makers restate them: sheet 3 Schurter FST 5x20, Littelfuse
/// 213; sheet 5 Schurter SPT 5x20, Littelfuse 215 and 215SP (the wider of the two where they
/// differ); sheet 1 Littelfuse 216SP; sheet 2 from secondary tables. Above 6.3 A, and below 1 A on
/// sheet 5, the makers go beyond the standard. From memory: sheet 1 below 1 A, sheet 2 from 8 A
/// (Littelfuse 217), the 10-times gate of sheet 5 below 1 A.
const SHEETS: [Gates; 14] = [
    // Sheet 3: time-lag, low breaking capacity (glass).
    gates(
        Speed::Slow,
        (0.032, 0.125),
        (HOUR, 120.0),
        [(0.2, 10.0), (0.04, 3.0), (0.01, 0.3)],
    ),
    gates(
        Speed::Slow,
        (0.125, 8.0),
        (HOUR, 120.0),
        [(0.6, 10.0), (0.15, 3.0), (0.02, 0.3)],
    ),
    gates(
        Speed::Slow,
        (8.0, 20.1),
        (MINUTES_30, 120.0),
        [(0.6, 10.0), (0.15, 3.0), (0.02, 0.3)],
    ),
    // Sheet 5: time-lag, high breaking capacity (ceramic).
    gates(
        Speed::Slow,
        (0.125, 1.0),
        (HOUR, MINUTES_30),
        [(0.25, 80.0), (0.05, 5.0), (0.005, 0.15)],
    ),
    gates(
        Speed::Slow,
        (1.0, 4.0),
        (HOUR, MINUTES_30),
        [(0.75, 80.0), (0.095, 5.0), (0.01, 0.15)],
    ),
    gates(
        Speed::Slow,
        (4.0, 8.0),
        (HOUR, MINUTES_30),
        [(0.75, 80.0), (0.15, 5.0), (0.01, 0.15)],
    ),
    gates(
        Speed::Slow,
        (8.0, 12.5),
        (MINUTES_30, MINUTES_30),
        [(0.75, 80.0), (0.15, 5.0), (0.01, 0.15)],
    ),
    gates(
        Speed::Slow,
        (12.5, 20.1),
        (MINUTES_15, MINUTES_30),
        [(0.75, 80.0), (0.15, 5.0), (0.01, 0.15)],
    ),
    // Sheet 2: quick-acting, low breaking capacity (glass).
    gates(
        Speed::Fast,
        (0.032, 0.125),
        (HOUR, MINUTES_30),
        [(0.01, 0.5), (0.003, 0.1), (0.0, 0.02)],
    ),
    gates(
        Speed::Fast,
        (0.125, 8.0),
        (HOUR, MINUTES_30),
        [(0.05, 2.0), (0.01, 0.3), (0.0, 0.02)],
    ),
    gates(
        Speed::Fast,
        (8.0, 15.1),
        (MINUTES_30, MINUTES_30),
        [(0.05, 2.0), (0.01, 0.4), (0.0, 0.04)],
    ),
    // Sheet 1: quick-acting, high breaking capacity (ceramic).
    gates(
        Speed::Fast,
        (0.05, 5.0),
        (HOUR, MINUTES_30),
        [(0.01, 2.0), (0.003, 0.3), (0.0, 0.02)],
    ),
    gates(
        Speed::Fast,
        (5.0, 8.0),
        (HOUR, MINUTES_30),
        [(0.01, 3.0), (0.003, 0.3), (0.0, 0.02)],
    ),
    gates(
        Speed::Fast,
        (8.0, 10.1),
        (MINUTES_30, MINUTES_30),
        [(0.04, 20.0), (0.01, 1.0), (0.0, 0.03)],
    ),
];

impl Gates {
    /// A current melts the fuse no sooner than any greater current, so the least time is that of
    /// the next gate at or above `multiple`. Above the last gate nothing is promised.
    fn least(&self, multiple: f64) -> f64 {
        match multiple {
            m if m <= 1.5 => self.hold,
            m if m <= 2.75 => self.at_2_75.0,
            m if m <= 4.0 => self.at_4.0,
            m if m <= 10.0 => self.at_10.0,
            _ => 0.0,
        }
    }

    /// Nor later than any lesser current, so the most is that of the next gate at or below. Beyond
    /// 10 times, I²t only falls, as less heat escapes: t <= t(10)·(10/multiple)².
    fn most(&self, multiple: f64) -> Option<f64> {
        match multiple {
            m if m >= 10.0 => Some(self.at_10.1 * 100.0 / (m * m)),
            m if m >= 4.0 => Some(self.at_4.1),
            m if m >= 2.75 => Some(self.at_2_75.1),
            m if m >= 2.1 => Some(self.open),
            _ => None,
        }
    }
}

/// Between which times a fuse melts.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Melting {
    /// It holds at least so long; zero where nothing is promised.
    pub least: Second,
    /// It has melted by then; `None` where nothing is promised, below 2.1 times the rating.
    pub most: Option<Second>,
}

/// Between which times a fuse of `speed` and rating `rated` melts at a steady r.m.s. `current`.
///
/// No interpolation: the gates of IEC 60127-2 and the fact that more current melts it sooner. Glass
/// or ceramic body is not asked for: the interval covers every sheet that has the rating. The arc
/// comes on top, up to half a mains cycle on alternating current; on a direct-current rail a
/// miniature fuse may not break the arc at all.
/// `None` for a rating no sheet holds (0.032 to 20 A slow, to 15 A fast) or a current not finite
/// and above zero.
#[must_use]
pub fn melting(speed: Speed, rated: Amp, current: Amp) -> Option<Melting> {
    if !(current.0 > 0.0 && current.is_finite()) {
        return None;
    }
    let multiple = current / rated;
    let sheets = || {
        SHEETS
            .iter()
            .filter(move |s| s.speed == speed && (s.from..s.below).contains(&rated.0))
    };
    sheets().next()?;
    let least = sheets()
        .map(|s| s.least(multiple))
        .fold(f64::INFINITY, f64::min);
    let most = sheets()
        .map(|s| s.most(multiple))
        .try_fold(0.0, |a: f64, t| Some(a.max(t?)));
    Some(Melting {
        least: Second(least),
        most: most.map(Second),
    })
}

/// The form of a current pulse.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Pulse {
    /// Constant.
    Square,
    /// Half a sine.
    HalfSine,
    /// From the peak straight to zero, or up and down.
    Triangle,
    /// From the peak along a parabola that meets zero flat.
    Parabola,
    /// Decaying exponentially; the duration is its time constant.
    Exponential,
}

/// I²t of one pulse: k·Ip²·t with k = 1, 1/2, 1/3, 1/5, 1/2 for the forms in order, t the duration or,
/// of an exponential, its time constant. Source: Littelfuse, Fuseology, chart 1; quadrature.
#[must_use]
pub fn let_through(form: Pulse, peak: Amp, duration: Second) -> AmpSquaredSecond {
    let part = match form {
        Pulse::Square => 1.0,
        Pulse::HalfSine | Pulse::Exponential => 0.5,
        Pulse::Triangle => 1.0 / 3.0,
        Pulse::Parabola => 0.2,
    };
    AmpSquaredSecond(part * peak.0 * peak.0 * duration.0)
}

/// The part of its nominal melting I²t that a fuse stands `pulses` times, at least 10 s apart: 48 %
/// for 100 pulses, 38 % for 1,000, 29 % for 10,000, 22 % for 100,000; a number between counts as the
/// next greater. `None` above 100,000. Source: Littelfuse, Fuseology.
#[must_use]
pub fn pulse_withstand(pulses: u32) -> Option<f64> {
    match pulses {
        0..=100 => Some(0.48),
        101..=1_000 => Some(0.38),
        1_001..=10_000 => Some(0.29),
        10_001..=100_000 => Some(0.22),
        _ => None,
    }
}

/// What is left of a fuse's rating in air at `ambient`: 0.5 % less for each kelvin above 25 degC, not
/// below zero; no credit for the cold. Generic for glass and ceramic cartridge links (a NASA parts
/// policy, read on a third-party page); plated time-lag elements can lose more, a maker's curve
/// goes before.
#[must_use]
pub fn temperature_factor(ambient: Celsius) -> f64 {
    let left = 1.0 - 0.005 * (ambient - Celsius(25.0)).0;
    if left > 0.0 { left.min(1.0) } else { 0.0 }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn nonsense_is_refused() {
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY, 1e9] {
            assert_eq!(melting(Speed::Slow, Amp(bad), Amp(1.0)), None);
        }
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert_eq!(melting(Speed::Fast, Amp(1.0), Amp(bad)), None);
        }
    }

    #[test]
    fn every_preferred_rating_has_a_sheet() {
        // R10 series of IEC 60127-2.
        let ratings = [
            0.05, 0.063, 0.08, 0.1, 0.125, 0.16, 0.2, 0.25, 0.315, 0.4, 0.5, 0.63, 0.8, 1.0, 1.25,
            1.6, 2.0, 2.5, 3.15, 4.0, 5.0, 6.3, 8.0, 10.0,
        ];
        for rated in ratings {
            for speed in [Speed::Slow, Speed::Fast] {
                assert!(
                    melting(speed, Amp(rated), Amp(rated)).is_some(),
                    "{rated} A"
                );
            }
        }
    }

    proptest! {
        /// More current never melts later; the interval is never empty; below the rating it holds.
        #[test]
        fn times_fall_with_current(rated in 0.04f64..15.0, m in 0.1f64..50.0, more in 1.0f64..3.0) {
            for speed in [Speed::Slow, Speed::Fast] {
                let a = melting(speed, Amp(rated), Amp(m * rated)).unwrap();
                let b = melting(speed, Amp(rated), Amp(m * more * rated)).unwrap();
                prop_assert!(b.least <= a.least);
                if let Some(first) = a.most {
                    prop_assert!(b.most.unwrap() <= first);
                    prop_assert!(a.least <= first);
                }
                if m <= 1.0 {
                    prop_assert!(a.least.0 >= 900.0 && a.most.is_none());
                }
            }
        }
    }
}
