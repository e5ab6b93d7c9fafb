//! Values that parts are sold in, and the next one up or down.
//! Must not know which part a value is for.

use crate::physics::math;

/// A series of preferred values. [`Series::at_or_above`] and its like work in the base unit.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Series {
    /// IEC 60063, 20 % steps.
    E6,
    /// IEC 60063, 10 % steps.
    E12,
    /// IEC 60063, 5 % steps.
    E24,
    /// IEC 60063, 2 % steps.
    E48,
    /// IEC 60063, 1 % steps.
    E96,
    /// IEC 60063, 0.5 % steps.
    E192,
    /// Rated currents of miniature fuses: R10 of ISO 3 as rounded in IEC 60127-2 (1, 1.25, 1.6 ...),
    /// 32 mA to 10 A there; makers go on to 20 A.
    FuseCurrent,
    /// Rated voltages of aluminium electrolytics. Common practice, no source.
    CapacitorVoltage,
    /// Ratings of toroidal transformers in stock. Common practice, no source.
    TransformerRating,
    /// Secondary voltages of transformers in stock. Common practice, no source.
    SecondaryVoltage,
    /// Rated powers of wire-wound and cement resistors. Common practice, no source.
    ResistorPower,
}

/// E24 is not the rounded geometric series: eight of its values (27 30 33 36 39 43 47 82) were
/// settled before the rule and differ from `10 * 10^(k/24)`.
const E24: [u32; 24] = [
    10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91,
];
/// Hundredths; the third digits of 125 and 315 need them.
const R10: [u32; 10] = [100, 125, 160, 200, 250, 315, 400, 500, 630, 800];

const CAPACITOR_VOLTAGE: &[f64] = &[
    6.3, 10.0, 16.0, 25.0, 35.0, 40.0, 50.0, 63.0, 80.0, 100.0, 160.0, 200.0, 250.0, 350.0, 400.0,
    450.0,
];
const TRANSFORMER_RATING: &[f64] = &[
    15.0, 30.0, 50.0, 80.0, 120.0, 160.0, 225.0, 300.0, 400.0, 500.0, 625.0, 800.0, 1000.0, 1500.0,
    2000.0, 3000.0,
];
const SECONDARY_VOLTAGE: &[f64] = &[
    6.0, 7.0, 9.0, 12.0, 15.0, 18.0, 20.0, 22.0, 25.0, 28.0, 30.0, 35.0, 40.0, 45.0, 50.0, 55.0,
    60.0,
];
const RESISTOR_POWER: &[f64] = &[
    0.25, 0.5, 0.6, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 20.0, 25.0, 50.0, 100.0,
];

/// A value this close, relatively, to a member counts as that member: what a calculation left of
/// 0.47 is 0.47, not a reason to go up to 0.51.
const SAME: f64 = 1e-9;

/// Decades of the repeating series that are searched.
const DECADES: std::ops::RangeInclusive<i32> = -15..=12;

impl Series {
    /// The least member not below `value`. `None` if there is none, or `value` is not positive.
    #[must_use]
    pub fn at_or_above(self, value: f64) -> Option<f64> {
        let least = value * (1.0 - SAME);
        self.near(value)?
            .into_iter()
            .find(|member| *member >= least)
    }

    /// The greatest member not above `value`. `None` if there is none, or `value` is not positive.
    #[must_use]
    pub fn at_or_below(self, value: f64) -> Option<f64> {
        let most = value * (1.0 + SAME);
        self.near(value)?
            .into_iter()
            .rfind(|member| *member <= most)
    }

    /// The member nearest to `value` by ratio.
    #[must_use]
    pub fn nearest(self, value: f64) -> Option<f64> {
        match (self.at_or_below(value), self.at_or_above(value)) {
            (Some(below), Some(above)) => {
                let is_lower = value / below <= above / value;
                Some(if is_lower { below } else { above })
            }
            (below, above) => below.or(above),
        }
    }

    /// Whether `value` is a member.
    #[must_use]
    pub fn contains(self, value: f64) -> bool {
        self.at_or_above(value)
            .is_some_and(|member| (member - value).abs() <= SAME * value)
    }

    /// The members of one decade as whole numbers, and the number of digits each has. `None` for a
    /// series that is a list.
    fn decade(self) -> Option<(Vec<u32>, i32)> {
        let every = |step: usize| E24.iter().copied().step_by(step).collect();
        match self {
            Self::E6 => Some((every(4), 2)),
            Self::E12 => Some((every(2), 2)),
            Self::E24 => Some((every(1), 2)),
            Self::E48 => Some((geometric(48), 3)),
            Self::E96 => Some((geometric(96), 3)),
            Self::E192 => Some((geometric(192), 3)),
            Self::FuseCurrent => Some((R10.to_vec(), 3)),
            _ => None,
        }
    }

    fn list(self) -> &'static [f64] {
        match self {
            Self::CapacitorVoltage => CAPACITOR_VOLTAGE,
            Self::TransformerRating => TRANSFORMER_RATING,
            Self::SecondaryVoltage => SECONDARY_VOLTAGE,
            Self::ResistorPower => RESISTOR_POWER,
            _ => &[],
        }
    }

    /// The members of the decade of `value` and its neighbours, ascending; all of a list.
    fn near(self, value: f64) -> Option<Vec<f64>> {
        if !value.is_finite() || value <= 0.0 {
            return None;
        }
        let Some((members, digits)) = self.decade() else {
            return Some(self.list().to_vec());
        };
        // The decade may come out one off at its edge, which the neighbours make up for.
        let exact = math::log10(value).floor();
        let decade = DECADES
            .into_iter()
            .find(|d| (f64::from(*d) - exact).abs() < 0.5)?;
        let mut near = Vec::with_capacity(members.len() * 3);
        for decade in decade - 1..=decade + 1 {
            let ten = decade - digits + 1;
            // Through decimal text, so that 22 * 10^-2 is the double a person's 0.22 is.
            near.extend(
                members
                    .iter()
                    .filter_map(|m| format!("{m}e{ten}").parse::<f64>().ok()),
            );
        }
        Some(near)
    }
}

/// `100 * 10^(k/n)` rounded, for k = 0 to n - 1, with the one exception of E192: 920, where the
/// formula gives 919.
fn geometric(n: u32) -> Vec<u32> {
    (0..n)
        .filter_map(|k| {
            let value = math::pow(10.0, 2.0 + f64::from(k) / f64::from(n)).round();
            (100..1000).find(|whole| (f64::from(*whole) - value).abs() < 0.5)
        })
        .map(|value| if value == 919 && n == 192 { 920 } else { value })
        .collect()
}
