//! Elementary functions and the three numerical tools every model uses: a bracketed root,
//! a bracketed maximum, and a straight line through points.
//! Knows nothing of amplifiers.
//!
//! Elementary functions come from `libm`, which gives the same last digit on every platform;
//! `sqrt` is exact in IEEE 754 and stays with the standard library.

pub use std::f64::consts::{FRAC_PI_2, LN_2, LN_10, PI, SQRT_2, TAU};

pub use libm::{
    acos, asin, atan, atan2, cos, exp, expm1, log as ln, log1p as ln_1p, log10, pow, sin, sinh, tan,
};

/// Sine and cosine of the same angle.
#[must_use]
pub fn sin_cos(x: f64) -> (f64, f64) {
    libm::sincos(x)
}

/// Most steps any bracketed search takes before it returns its best estimate.
const MAX_STEPS: usize = 200;

/// The root of `f` in `[lo, hi]`, where `f(lo)` and `f(hi)` differ in sign (or one is zero).
///
/// Brent's method: inverse quadratic interpolation guarded by bisection, so it converges for every
/// continuous `f` and takes at most 200 steps. `None` if the ends do not bracket a sign change or a
/// value is not finite. `tolerance` is absolute, in the unit of `x`.
///
/// Source: R. P. Brent, Algorithms for Minimization without Derivatives, 1973, chapter 4 (from memory).
pub fn root(f: impl Fn(f64) -> f64, lo: f64, hi: f64, tolerance: f64) -> Option<f64> {
    let (mut a, mut b) = (lo, hi);
    let (mut fa, mut fb) = (f(a), f(b));
    if !fa.is_finite() || !fb.is_finite() {
        return None;
    }
    if fa == 0.0 {
        return Some(a);
    }
    if fb == 0.0 {
        return Some(b);
    }
    if fa.signum() == fb.signum() {
        return None;
    }
    let (mut c, mut fc) = (a, fa);
    let mut step = b - a;
    let mut before = step;
    for _ in 0..MAX_STEPS {
        if fc.abs() < fb.abs() {
            (a, b, c) = (b, c, b);
            (fa, fb, fc) = (fb, fc, fb);
        }
        let tol = 2.0 * f64::EPSILON * b.abs() + 0.5 * tolerance;
        let half = 0.5 * (c - b);
        if half.abs() <= tol || fb == 0.0 {
            return Some(b);
        }
        if before.abs() >= tol && fa.abs() > fb.abs() {
            let s = fb / fa;
            let (mut p, mut q) = if a.total_cmp(&c).is_eq() {
                (2.0 * half * s, 1.0 - s)
            } else {
                let (q, r) = (fa / fc, fb / fc);
                (
                    s * (2.0 * half * q * (q - r) - (b - a) * (r - 1.0)),
                    (q - 1.0) * (r - 1.0) * (s - 1.0),
                )
            };
            if p > 0.0 {
                q = -q;
            } else {
                p = -p;
            }
            if 2.0 * p < (3.0 * half * q - (tol * q).abs()).min((before * q).abs()) {
                before = step;
                step = p / q;
            } else {
                step = half;
                before = half;
            }
        } else {
            step = half;
            before = half;
        }
        (a, fa) = (b, fb);
        b += if step.abs() > tol {
            step
        } else {
            tol.copysign(half)
        };
        fb = f(b);
        if !fb.is_finite() {
            return None;
        }
        if fb.signum() == fc.signum() {
            (c, fc) = (a, fa);
            step = b - a;
            before = step;
        }
    }
    Some(b)
}

/// The `x` in `[lo, hi]` where `f` is greatest, and `f(x)`, for an `f` with one maximum there.
///
/// Brent's method: a parabola through the three best points, guarded by golden section, so a smooth
/// maximum takes about a dozen evaluations and any other no more than golden section would. It stops
/// when `x` is known within `tolerance` (absolute, unit of `x`); near a smooth maximum the value is
/// then exact to the square of that. The two ends are looked at too, so a maximum at an end is found
/// exactly.
///
/// Source: R. P. Brent, Algorithms for Minimization without Derivatives, 1973, chapter 5 (from memory).
pub fn maximum(f: impl Fn(f64) -> f64, lo: f64, hi: f64, tolerance: f64) -> (f64, f64) {
    const GOLDEN: f64 = 0.381_966_011_250_105_1;
    let (mut a, mut b) = (lo, hi);
    let mut x = a + GOLDEN * (b - a);
    let (mut second, mut third) = (x, x);
    let mut fx = f(x);
    let (mut f_second, mut f_third) = (fx, fx);
    let (mut step, mut before) = (0.0_f64, 0.0_f64);
    for _ in 0..MAX_STEPS {
        let middle = 0.5 * (a + b);
        let tol = f64::EPSILON.sqrt() * x.abs() * 1e-4 + 0.25 * tolerance;
        if (x - middle).abs() <= 2.0 * tol - 0.5 * (b - a) {
            break;
        }
        let mut parabolic = false;
        if before.abs() > tol {
            let r = (x - second) * (fx - f_third);
            let q = (x - third) * (fx - f_second);
            let p = (x - third) * q - (x - second) * r;
            let q = 2.0 * (q - r);
            let (p, q) = if q > 0.0 { (-p, q) } else { (p, -q) };
            let last = before;
            before = step;
            if p.abs() < (0.5 * q * last).abs() && p > q * (a - x) && p < q * (b - x) {
                step = p / q;
                let u = x + step;
                if u - a < 2.0 * tol || b - u < 2.0 * tol {
                    step = tol.copysign(middle - x);
                }
                parabolic = true;
            }
        }
        if !parabolic {
            before = if x < middle { b - x } else { a - x };
            step = GOLDEN * before;
        }
        let u = if step.abs() >= tol {
            x + step
        } else {
            x + tol.copysign(step)
        };
        let fu = f(u);
        if fu >= fx {
            if u < x {
                b = x;
            } else {
                a = x;
            }
            (third, f_third) = (second, f_second);
            (second, f_second) = (x, fx);
            (x, fx) = (u, fu);
        } else {
            if u < x {
                a = u;
            } else {
                b = u;
            }
            if fu >= f_second || second.total_cmp(&x).is_eq() {
                (third, f_third) = (second, f_second);
                (second, f_second) = (u, fu);
            } else if fu >= f_third
                || third.total_cmp(&x).is_eq()
                || third.total_cmp(&second).is_eq()
            {
                (third, f_third) = (u, fu);
            }
        }
    }
    let mut best = (x, fx);
    for end in [lo, hi] {
        let value = f(end);
        if value > best.1 {
            best = (end, value);
        }
    }
    best
}

/// The value at `x` of straight lines through `points` (ascending in `x`), the first and last
/// segment extended. One point is a constant. `None` for no point.
#[must_use]
pub fn straight_lines(points: &[(f64, f64)], x: f64) -> Option<f64> {
    let (first, last) = (points.first()?, points.last()?);
    if points.len() == 1 {
        return Some(first.1);
    }
    let right = points
        .iter()
        .position(|p| p.0 >= x)
        .unwrap_or(points.len() - 1)
        .max(1);
    let ((x0, y0), (x1, y1)) = (points[right - 1], points[right]);
    if x1 <= x0 {
        return Some(last.1);
    }
    Some(y0 + (y1 - y0) * (x - x0) / (x1 - x0))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn root_of_cosine_is_half_pi() {
        let x = root(cos, 0.0, 3.0, 1e-14).unwrap();
        assert!((x - FRAC_PI_2).abs() < 1e-13, "{x}"); // cos(pi/2) = 0, definition of pi
    }

    #[test]
    fn root_needs_a_sign_change() {
        assert_eq!(root(|x| x * x + 1.0, -1.0, 1.0, 1e-9), None);
        assert_eq!(root(|_| f64::NAN, -1.0, 1.0, 1e-9), None);
    }

    #[test]
    fn maximum_finds_the_inside_and_the_ends() {
        let (x, y) = maximum(|x| x * (1.0 - x), 0.0, 1.0, 1e-9);
        assert!((x - 0.5).abs() < 1e-8 && (y - 0.25).abs() < 1e-15); // d/dx x(1-x) = 0 at 1/2
        assert_eq!(maximum(|x| x, 0.0, 2.0, 1e-9), (2.0, 2.0));
    }

    #[test]
    fn lines_extend_both_ends() {
        let p = [(0.0, 1.0), (1.0, 2.0), (3.0, 2.0)];
        assert_eq!(straight_lines(&p, -1.0), Some(0.0));
        assert_eq!(straight_lines(&p, 0.5), Some(1.5));
        assert_eq!(straight_lines(&p, 9.0), Some(2.0));
        assert_eq!(straight_lines(&[], 1.0), None);
    }
}
