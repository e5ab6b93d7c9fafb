"""The output stage by samples: drop, amplitude before clipping, shares, waveforms, mean heat."""

import numpy as np
from scipy.optimize import brentq

VT = 0.0257
SAMPLES = 20_000


def drop_at(points, amps):
    """Volts lost from rail to output: straight lines through (V, A), the last one extended."""
    if len(points) == 1:
        return points[0][0] + 0.0 * np.asarray(amps, float)
    amps = np.asarray(amps, float)
    v, a = np.array(points, float).T
    out = np.interp(amps, a, v)
    slope = (v[-1] - v[-2]) / (a[-1] - a[-2])
    out = np.where(amps > a[-1], v[-1] + slope * (amps - a[-1]), out)
    first = (v[1] - v[0]) / (a[1] - a[0])
    return np.where(amps < a[0], v[0] + first * (amps - a[0]), out)


def burst(rail, drop, ohms):
    """V = rail - drop(V / ohms), by bisection."""
    gap = lambda v: v - rail + float(drop_at(drop, v / ohms))
    if gap(0.0) >= 0:
        raise ValueError("no amplitude is left")
    return brentq(gap, 0.0, rail, xtol=1e-13)


def burst_array(rail, drop, ohms):
    """`burst` for an array of moduli: V = rail - drop(V / |Z|) repeated by secant until it stands."""
    old = rail + 0.0 * ohms
    miss_old = rail - drop_at(drop, old / ohms) - old
    new = old + miss_old
    for _ in range(12):
        miss = rail - drop_at(drop, new / ohms) - new
        if np.max(np.abs(miss)) < 1e-13 * rail:
            break
        moved = miss - miss_old
        slope = np.where(np.abs(moved) > 1e-15, (new - old) / np.where(np.abs(moved) > 1e-15, moved, 1.0), -1.0)
        old, miss_old, new = new, miss, new - miss * slope
    return new


def share(mean, count, spread, ohms, low):
    """I1/I of the device that hogs, for a mean device current I (array): halving, then Newton.

    VT ln I1 + I1 RE1 - dV = VT ln I2 + I2 RE, I1 + (N - 1) I2 = N I, RE1 = RE (1 - low).
    """
    mean = np.asarray(mean, float)
    if count == 1:
        return np.ones_like(mean)
    first = ohms * (1 - low)
    lo, hi = np.ones_like(mean), np.full_like(mean, float(count) * (1 - 1e-15))

    def gap(s):
        i1, i2 = s * mean, (count - s) * mean / (count - 1)
        slope = VT * (1 / s + 1 / (count - s)) + mean * (first + ohms / (count - 1))
        return VT * np.log(i1 / i2) + i1 * first - i2 * ohms - spread, slope

    for _ in range(5):
        s = 0.5 * (lo + hi)
        over = gap(s)[0] > 0
        hi, lo = np.where(over, s, hi), np.where(over, lo, s)
    s = 0.5 * (lo + hi)
    for _ in range(12):
        miss, slope = gap(s)
        old, s = s, np.clip(s - miss / slope, lo, hi)
        if np.max(np.abs(s - old)) < 1e-13:
            break
    return s


def beside(least, count, spread, ohms, low):
    """Current of the device that hogs while each of the others carries `least` (array), by halving."""
    if count == 1:
        return least
    lo, hi = least, least + 10.0
    for _ in range(60):
        most = 0.5 * (lo + hi)
        over = VT * np.log(most / np.maximum(least, 1e-12)) + most * ohms * (1 - low) - least * ohms - spread > 0
        hi, lo = np.where(over, most, hi), np.where(over, lo, most)
    return 0.5 * (lo + hi)


def share_one(mean, stage):
    """The worst share at one mean device current of a stage."""
    return float(share(np.array([max(mean, 1e-12)]), stage["pairs"], stage["spread"], stage["re"], stage["re_low"])[0])


def bank_heat(rail, amplitude, ohms, angle, pairs, idle, re):
    """Mean watts of one bank (all devices of a polarity): sampled v_CE x i plus the full idle current."""
    t = (np.arange(SAMPLES) + 0.5) * 2 * np.pi / SAMPLES
    i = amplitude / ohms * np.sin(t)
    v = amplitude * np.sin(t + angle)
    up = np.maximum(i, 0)
    return float(np.mean((rail - v - up / pairs * re) * up)) + rail * pairs * idle
