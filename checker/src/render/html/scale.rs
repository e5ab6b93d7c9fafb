//! From the numbers of an axis to places on paper, and the ticks between.
//! Must not know what is drawn.

use crate::physics::math;

/// An axis laid out on paper.
#[derive(Clone, Copy, Debug)]
pub(super) struct Scale {
    from: f64,
    to: f64,
    log: bool,
    /// Where `from` and `to` come to.
    ends: (f64, f64),
}

/// A tick: where, and whether it is named.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Tick {
    pub(super) value: f64,
    pub(super) named: bool,
}

impl Scale {
    /// From `from` to `to` between two places. `None` unless there is something between.
    pub(super) fn new(from: f64, to: f64, log: bool, ends: (f64, f64)) -> Option<Self> {
        let some = from.is_finite() && to.is_finite() && to > from && (!log || from > 0.0);
        some.then_some(Self {
            from,
            to,
            log,
            ends,
        })
    }

    /// The place of a value; what lies outside is put a little outside.
    pub(super) fn place(&self, value: f64) -> f64 {
        let of = |v: f64| {
            if self.log {
                math::ln(v.max(f64::MIN_POSITIVE))
            } else {
                v
            }
        };
        let share = (of(value) - of(self.from)) / (of(self.to) - of(self.from));
        self.ends.0 + share.clamp(-0.5, 1.5) * (self.ends.1 - self.ends.0)
    }

    /// Whether a value lies on the axis.
    pub(super) fn holds(&self, value: f64) -> bool {
        let slack = 1e-9 * (self.to - self.from);
        (self.from - slack..=self.to + slack).contains(&value)
    }

    /// Ticks from the bottom up.
    pub(super) fn ticks(&self) -> Vec<Tick> {
        if self.log {
            self.decades()
        } else {
            let step = step(self.to - self.from, 6.0);
            let first = (self.from / step - 1e-9).ceil();
            let count = ((self.to / step + 1e-9).floor() - first).clamp(0.0, 20.0) as u32;
            (0..=count)
                .map(|k| Tick {
                    value: (first + f64::from(k)) * step,
                    named: true,
                })
                .collect()
        }
    }

    /// Every digit of every decade, 1, 2 and 5 named; over four decades or more only 1.
    fn decades(&self) -> Vec<Tick> {
        let mut ticks = Vec::new();
        let span = math::log10(self.to / self.from);
        let first = math::log10(self.from).floor();
        let count = (span.ceil() + 1.0).clamp(1.0, 20.0) as u32;
        for decade in 0..=count {
            for digit in 1..=9_u32 {
                let ten = first + f64::from(decade);
                let value: f64 = format!("{digit}e{ten}").parse().unwrap_or(f64::NAN);
                let named = digit == 1 || (span < 4.0 && matches!(digit, 2 | 5));
                if self.holds(value) {
                    ticks.push(Tick { value, named });
                }
            }
        }
        ticks
    }
}

/// 1, 2 or 5 times a power of ten, about `count` of which make `span`.
pub(super) fn step(span: f64, count: f64) -> f64 {
    let rough = span / count;
    let ten = math::pow(10.0, math::log10(rough).floor());
    let digit = [1.0, 2.0, 5.0].into_iter().find(|d| d * ten >= rough);
    digit.unwrap_or(10.0) * ten
}

/// The range of an axis that holds values from `low` to `high`: to the next tick, in 1, 2 and 5 if
/// logarithmic.
pub(super) fn range(low: f64, high: f64, log: bool) -> Option<(f64, f64)> {
    if !(low.is_finite() && high.is_finite()) || (log && low <= 0.0) {
        return None;
    }
    if log {
        return Some((round(low * 1.000_001, false), round(high * 0.999_999, true)));
    }
    let (low, high) = if high > low {
        (low, high)
    } else {
        (low - 1.0, high + 1.0)
    };
    let step = step(high - low, 6.0);
    Some(((low / step).floor() * step, (high / step).ceil() * step))
}

/// The nearest of 1, 2, 5 and their decades, below or above.
fn round(value: f64, up: bool) -> f64 {
    let ten = math::pow(10.0, math::log10(value).floor());
    let steps = [1.0, 2.0, 5.0, 10.0].map(|d| d * ten);
    let found = if up {
        steps.into_iter().find(|s| *s >= value * (1.0 - 1e-9))
    } else {
        steps.into_iter().rfind(|s| *s <= value * (1.0 + 1e-9))
    };
    found.unwrap_or(value)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// By hand: the axis from 20 Hz to 20 kHz is three decades, and 2 kHz stands at two thirds.
    #[test]
    fn logarithmic_places() {
        let scale = Scale::new(20.0, 20_000.0, true, (0.0, 300.0)).unwrap();
        assert!((scale.place(2000.0) - 200.0).abs() < 1e-9);
        let named: Vec<f64> = scale
            .ticks()
            .iter()
            .filter(|t| t.named)
            .map(|t| t.value)
            .collect();
        assert_eq!(
            named,
            [20.0, 50.0, 100.0, 200.0, 500.0, 1e3, 2e3, 5e3, 1e4, 2e4]
        );
    }

    #[test]
    fn ranges_end_on_ticks() {
        assert_eq!(range(0.3, 16.0, true), Some((0.2, 20.0)));
        assert_eq!(range(31.0, 42.0, false), Some((30.0, 42.0)));
        assert_eq!(range(5.0, 5.0, false), Some((4.0, 6.0)));
        assert_eq!(range(-1.0, 5.0, true), None);
        assert_eq!(range(f64::NAN, 5.0, false), None);
        assert!(Scale::new(1.0, 1.0, false, (0.0, 1.0)).is_none());
    }
}
