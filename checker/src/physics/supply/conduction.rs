//! One stretch of conduction of a rectifier into a reservoir, in closed form, and the exact map
//! from one zero crossing of the mains to the next.
//! Must not know transformers or units: everything is a ratio to the crest of the source.
//!
//! Symbols, with E the crest of the source before the diode drop Vd, R the whole series resistance
//! including the ESR r of the reservoir C, I the current drawn and θ = ωt the mains angle from a
//! zero crossing:
//! - level y = (u - r·I + Vd)/E, u the voltage inside the capacitor; without conduction the rail
//!   terminal is at E·y - Vd;
//! - x = ωRC; j = R·I/E;
//! - s = sin θ - y = R·i/E, the charging current i while it is positive.
//!
//! Conducting: dy/dθ = (s - j)/x. Not conducting: dy/dθ = -j/x. The diode drop shifts the level and
//! drops out of both, and so does the ESR: it only belongs to R.

use crate::physics::math::{FRAC_PI_2, PI, acos, asin, exp, expm1, pow, root, sin, sin_cos};

/// Most steps of any Newton iteration here; bisection alone needs about 55.
const MAX_STEPS: usize = 100;

/// The root of `f` between `positive`, where f > 0, and `negative`, where f < 0: Newton's method,
/// with a bisection whenever a step would leave the bracket. `f` gives value and slope.
///
/// The signs at the two ends are taken on trust, so that an end may itself be a root (the moment
/// at which a stretch of conduction began). Newton doubles its digits, so a step of 1e-8 leaves an
/// error at the last digit.
pub(super) fn bracketed_root(
    f: impl Fn(f64) -> (f64, f64),
    mut positive: f64,
    mut negative: f64,
    start: f64,
) -> f64 {
    let mut at = start;
    for _ in 0..MAX_STEPS {
        let (value, slope) = f(at);
        if value > 0.0 {
            positive = at;
        } else {
            negative = at;
        }
        let newton = at - value / slope;
        let inside = (newton - positive) * (newton - negative) < 0.0;
        let next = if inside {
            newton
        } else {
            0.5 * (positive + negative)
        };
        let settled = inside && (next - at).abs() <= 1e-8;
        at = next;
        if settled || (positive - negative).abs() <= 1e-14 {
            break;
        }
    }
    at
}

/// Conduction that begins at `start` with s = `current` there:
/// s = A·sin θ + B·cos θ + j - k·exp(-(θ - start)/x), A = x²/(1 + x²), B = x/(1 + x²).
#[derive(Clone, Copy, Debug)]
pub(super) struct Conduction {
    x: f64,
    j: f64,
    a: f64,
    b: f64,
    k: f64,
    start: f64,
    sin: f64,
    cos: f64,
}

impl Conduction {
    pub(super) fn new(x: f64, j: f64, start: f64, current: f64) -> Self {
        let (sin, cos) = sin_cos(start);
        let b = x / (1.0 + x * x);
        let a = x * b;
        let k = a * sin + b * cos + j - current;
        Self {
            x,
            j,
            a,
            b,
            k,
            start,
            sin,
            cos,
        }
    }

    fn fading(&self, angle: f64) -> f64 {
        exp((self.start - angle) / self.x)
    }

    /// The charging current s and its slope ds/dθ = cos θ - (s - j)/x.
    pub(super) fn current(&self, angle: f64) -> (f64, f64) {
        let (sin, cos) = sin_cos(angle);
        let s = self.a * sin + self.b * cos + self.j - self.k * self.fading(angle);
        (s, cos - (s - self.j) / self.x)
    }

    /// d²s/dθ² = -sin θ - (ds/dθ)/x.
    fn bend(&self, angle: f64, slope: f64) -> f64 {
        -sin(angle) - slope / self.x
    }

    /// The integral of s² from the start to `end`.
    ///
    /// With p = A·sin θ + B·cos θ and ε the fading exponential, ∫p·ε is simply -A·[ε·cos θ]: the
    /// sine terms cancel, because p is the forced response to the same first-order circuit.
    pub(super) fn square(&self, end: f64) -> f64 {
        let (sin, cos) = sin_cos(end);
        let (a, b, j, k, x) = (self.a, self.b, self.j, self.k, self.x);
        let span = end - self.start;
        let double_sine = 2.0 * (sin * cos - self.sin * self.cos);
        let double_cosine = 2.0 * (self.sin * self.sin - sin * sin);
        let faded = -expm1(-span / x);
        let faded_twice = -expm1(-2.0 * span / x);
        let forced =
            0.5 * a * span + 0.25 * (b * b - a * a) * double_sine - 0.5 * a * b * double_cosine;
        let steady = 2.0 * j * (a * (self.cos - cos) + b * (sin - self.sin)) + j * j * span;
        let transient = 0.5 * k * k * x * faded_twice
            - 2.0 * k * j * x * faded
            - 2.0 * k * a * (self.cos - self.fading(end) * cos);
        // Rounding can leave a hair below zero when hardly any current flows.
        (forced + steady + transient).max(0.0)
    }

    /// The angle at which s is greatest between the start and `end`.
    ///
    /// Every stationary point of s is a maximum: where ds/dθ = 0 the second derivative is -sin θ.
    pub(super) fn greatest(&self, end: f64) -> f64 {
        if self.current(self.start).1 <= 0.0 {
            return self.start;
        }
        if self.current(end).1 >= 0.0 {
            return end;
        }
        let slope = |angle| {
            let (_, slope) = self.current(angle);
            (slope, self.bend(angle, slope))
        };
        bracketed_root(slope, self.start, end, 0.5 * (self.start + end))
    }

    /// The angle at which s falls to zero, or `limit` if it is still positive there.
    ///
    /// There ds/dθ = cos θ + j/x is below zero, so it lies beyond π/2; the mirror image of the start
    /// is close to it.
    pub(super) fn turn_off(&self, limit: f64) -> f64 {
        if self.current(limit).0 >= 0.0 {
            return limit;
        }
        let positive = self.start.max(FRAC_PI_2);
        let guess = if self.start < FRAC_PI_2 {
            PI - self.start
        } else {
            limit
        };
        bracketed_root(
            |angle| self.current(angle),
            positive,
            limit,
            guess.min(limit),
        )
    }
}

/// The angle after `from` (within this half-cycle) at which the source overtakes a level that falls
/// by j/x per radian from `level`; `None` if it does not. The source must start below the level.
///
/// The gap sin θ - y is concave, so Newton from the left never overshoots the first crossing, and from
/// the right it does so once. It starts where the source would meet the level if that did not fall.
pub(super) fn turn_on(x: f64, j: f64, from: f64, level: f64) -> Option<f64> {
    let fall = j / x;
    let gap = |angle: f64| {
        let (sin, cos) = sin_cos(angle);
        (sin - level + fall * (angle - from), cos + fall)
    };
    let greatest = if fall < 1.0 { acos(-fall) } else { PI };
    if greatest <= from || gap(greatest).0 <= 0.0 {
        return None;
    }
    let mut at = if level < 1.0 && from < FRAC_PI_2 {
        asin(level).max(from)
    } else {
        from
    };
    for _ in 0..MAX_STEPS {
        let (value, slope) = gap(at);
        let step = -value / slope;
        at += step;
        if step.abs() <= 1e-8 {
            break;
        }
    }
    at.is_finite().then_some(at.min(greatest))
}

/// One half-cycle of the mains, or a part of one.
#[derive(Clone, Copy, Debug)]
pub(super) struct HalfCycle {
    /// Level at its end.
    pub(super) level: f64,
    /// Charging current s at its end: not zero only where it ends within the conduction.
    pub(super) current: f64,
    /// Its conduction and the angle at which that ended, if there was any.
    conduction: Option<(Conduction, f64)>,
}

impl HalfCycle {
    /// Integral of s² up to the angle `until`.
    pub(super) fn square(&self, until: f64) -> f64 {
        self.conduction
            .map_or(0.0, |(c, end)| c.square(end.min(until).max(c.start)))
    }

    /// The angle at which the level has risen to `level`, if it does so while the rectifier conducts.
    /// The level sin θ - s rises by (s - j)/x per radian.
    pub(super) fn rises_to(&self, level: f64) -> Option<f64> {
        let (conduction, end) = self.conduction?;
        let gap = |angle: f64| {
            let (s, _) = conduction.current(angle);
            let slope = (s - conduction.j) / conduction.x;
            (level - (sin(angle) - s), -slope)
        };
        let crosses = gap(conduction.start).0 > 0.0 && gap(end).0 <= 0.0;
        crosses.then(|| bracketed_root(gap, conduction.start, end, 0.5 * (conduction.start + end)))
    }

    /// Greatest s.
    pub(super) fn peak(&self) -> f64 {
        self.conduction
            .map_or(0.0, |(c, end)| c.current(c.greatest(end)).0)
    }
}

/// Carries a level from angle `from` to angle `to` (both 0 to π), with j drawn throughout.
pub(super) fn half_cycle(x: f64, j: f64, (from, to): (f64, f64), level: f64) -> HalfCycle {
    let fall = j / x;
    let excess = sin(from) - level;
    let on = if excess > 0.0 {
        Some((from, excess))
    } else {
        turn_on(x, j, from, level)
            .filter(|&at| at < to)
            .map(|at| (at, 0.0))
    };
    let Some((start, current)) = on else {
        return HalfCycle {
            level: level - fall * (to - from),
            current: 0.0,
            conduction: None,
        };
    };
    let conduction = Conduction::new(x, j, start, current);
    let end = conduction.turn_off(to);
    let left = conduction.current(end).0.max(0.0);
    HalfCycle {
        level: sin(end) - left - fall * (to - end),
        current: if end < to { 0.0 } else { left },
        conduction: Some((conduction, end)),
    }
}

/// Turn-on and turn-off angles (α, β) of the periodic steady state, with the rail above a level of
/// `floor` at turn-on; `None` if the source cannot supply j at such a level.
///
/// Two equations: s(β) = 0, and the charge of one stretch is what half a cycle draws, ∫s = πj. With
/// q = cos α + j/x and p = cos β + j/x their derivatives are
/// ∂s/∂α = -ε·q, ∂s/∂β = p, ∂Q/∂α = -q·x(1 - ε), ∂Q/∂β = s(β) = 0, so Newton needs no more than
/// the two sines and the exponential the equations already hold. The charge stands in place of the
/// discharge line because for a large reservoir that one and s(β) = 0 say the same thing.
///
/// Any solution with α in (0, π/2) and β in (π/2, π) is THE solution: carrying the level through a
/// half-cycle is a contraction, so it has one fixed point. Where Newton wanders off, that
/// contraction is solved by bracketing instead.
pub(super) fn steady_angles(x: f64, j: f64, floor: f64) -> Option<(f64, f64)> {
    let (alpha, beta) = newton_angles(x, j).or_else(|| bracketed_angles(x, j, floor))?;
    (sin(alpha) > floor).then_some((alpha, beta))
}

fn newton_angles(x: f64, j: f64) -> Option<(f64, f64)> {
    let fall = j / x;
    let b = x / (1.0 + x * x);
    let a = x * b;
    let (mut alpha, mut beta) = first_guess(j, fall);
    for _ in 0..12 {
        let ((sin_a, cos_a), (sin_b, cos_b)) = (sin_cos(alpha), sin_cos(beta));
        let span = beta - alpha;
        let k = a * sin_a + b * cos_a + j;
        let faded = -expm1(-span / x);
        let s = a * sin_b + b * cos_b + j - k * (1.0 - faded);
        let charge = a * (cos_a - cos_b) + b * (sin_b - sin_a) + j * (span - PI) - k * x * faded;
        let (q, p) = (cos_a + fall, cos_b + fall - s / x);
        let step_alpha_per_q = (charge * p - s * s) / (x * faded * p - s * (1.0 - faded));
        let step_alpha = step_alpha_per_q / q;
        let step_beta = ((1.0 - faded) * step_alpha_per_q - s) / p;
        alpha += step_alpha;
        beta += step_beta;
        if !(alpha > 0.0 && alpha < FRAC_PI_2 && beta > FRAC_PI_2 && beta < PI) {
            return None;
        }
        if step_alpha.abs() + step_beta.abs() < 1e-9 {
            return Some((alpha, beta));
        }
    }
    None
}

/// Half width from the pulse of an infinite reservoir, j = (2/π)(sin φ - φ·cos φ); centre from the
/// straight discharge over the rest, sin β - sin α = (j/x)(π - 2φ).
fn first_guess(j: f64, fall: f64) -> (f64, f64) {
    let cube_root = pow(1.5 * PI * j, 1.0 / 3.0);
    let half = (cube_root * (1.0 + cube_root * cube_root / 30.0)).min(1.4);
    let lead = (0.5 * fall * (PI - 2.0 * half) / sin(half)).min(0.9);
    let centre = acos(lead);
    (
        (centre - half).max(0.05),
        (centre + half).clamp(FRAC_PI_2 + 0.05, PI - 0.05),
    )
}

fn bracketed_angles(x: f64, j: f64, floor: f64) -> Option<(f64, f64)> {
    let gain = |alpha: f64| {
        let level = sin(alpha) + j / x * alpha;
        half_cycle(x, j, (0.0, PI), level).level - level
    };
    let alpha = root(gain, asin(floor.clamp(0.0, 1.0)), FRAC_PI_2, 1e-15)?;
    Some((alpha, Conduction::new(x, j, alpha, 0.0).turn_off(PI)))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::physics::supply::twin::Twin;
    use proptest::prelude::*;

    #[test]
    fn square_matches_quadrature() {
        // Simpson's rule, 2,000 panels.
        for (x, j, start, first, end) in [
            (0.3, 0.1, 0.9, 0.0, 1.8),
            (1.5, 0.02, 1.2, 0.0, 1.9),
            (40.0, 0.001, 1.4, 0.3, 1.6),
        ] {
            let c = Conduction::new(x, j, start, first);
            let h = (end - start) / 2000.0;
            let f = |n: i32| c.current(start + h * f64::from(n)).0;
            let simpson: f64 = (0..1000)
                .map(|n| {
                    let [a, b, d] = [f(2 * n), f(2 * n + 1), f(2 * n + 2)];
                    h / 3.0 * (a * a + 4.0 * b * b + d * d)
                })
                .sum();
            assert!(
                (c.square(end) - simpson).abs() < 1e-12,
                "{x}: {} {simpson}",
                c.square(end)
            );
        }
    }

    #[test]
    fn newton_seldom_needs_the_bracket() {
        let mut misses = 0;
        let grid =
            |n: i32, of: i32, lo: f64, hi: f64| lo * pow(hi / lo, f64::from(n) / f64::from(of));
        for a in 0..=40 {
            for b in 0..=40 {
                let (x, j) = (grid(a, 40, 0.2, 300.0), grid(b, 40, 1e-5, 0.3));
                if bracketed_angles(x, j, 0.0).is_some() && newton_angles(x, j).is_none() {
                    misses += 1;
                }
            }
        }
        assert!(misses < 40, "{misses} of 1681");
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(1000))]

        /// The two ways to the steady state agree wherever both find it.
        #[test]
        fn newton_agrees_with_the_bracket(lx in -4.0f64..9.0, lj in -16.0f64..0.5) {
            let (x, j) = (exp(lx), exp(lj));
            if let (Some(a), Some(b)) = (newton_angles(x, j), bracketed_angles(x, j, 0.0)) {
                // Near the crest the level hardly depends on the angle, and in a large reservoir
                // it hardly moves in a half-cycle: the bracket is no surer than rounding allows.
                let tolerance = 1e-9 + 1e-14 * (1.0 + x) / (b.1 - b.0) / (b.1 - b.0);
                prop_assert!((a.0 - b.0).abs() < tolerance, "{x} {j} {a:?} {b:?}");
                prop_assert!((a.1 - b.1).abs() < tolerance, "{x} {j} {a:?} {b:?}");
            }
        }

        /// A half-cycle from any level equals small-step integration.
        #[test]
        fn half_cycle_equals_small_steps(
            lx in -1.5f64..4.0, lj in -8.0f64..-1.0, level in 0.05f64..1.0, crest in any::<bool>(),
        ) {
            let (x, j) = (exp(lx), exp(lj));
            let from = if crest { FRAC_PI_2 } else { 0.0 };
            let found = half_cycle(x, j, (from, PI), level);
            // E = 1, Vd = 0, R = 1, so C = x at an angular frequency of 1.
            let twin = Twin { crest: 1.0, drop: 0.0, source: 1.0, esr: 0.0, reservoir: x, omega: 1.0 };
            let (mut square, mut peak) = (0.0, 0.0f64);
            let h = (PI - from) / 5_000.0;
            let end = twin.march(&|_| j, (from, level), h, 5_000, |_, _, s| {
                square += s * s * h;
                peak = peak.max(s);
            });
            prop_assert!((end - found.level).abs() < 1e-6, "{end} {found:?}");
            // A sum of rectangles, and the current may begin with a jump.
            let edge = h * peak * peak + 1e-5;
            prop_assert!((square - found.square(PI)).abs() < edge, "{square} {found:?}");
            prop_assert!((peak - found.peak()).abs() < 1e-4);
        }
    }
}
