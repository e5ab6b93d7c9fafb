"""Temperatures by repetition, junctions by steps in time."""

import numpy as np
from scipy.signal import lfilter


def sink_rise(watts, ohms, stated_rise):
    """Rise of a heatsink whose resistance falls as the fourth root of its rise: repeated until still."""
    if watts <= 0:
        return 0.0
    rise = stated_rise
    for _ in range(400):
        new = watts * ohms * (rise / stated_rise) ** -0.25
        if abs(new - rise) <= 1e-14 * new:
            break
        rise = new
    return new


def foster_peak(terms, power, period):
    """Greatest rise of a Foster network under a periodic power, sampled evenly over one period.

    Each sample is held as a straight line to the next; the ladder is stepped with the exact
    exponential of a step, and begun where it repeats itself.
    """
    n = len(power)
    h = period / n
    total = np.zeros(n)
    following = np.roll(power, -1)
    for ohms, tau in terms:
        decay = np.exp(-h / tau)
        slope_part = 1 - (1 - decay) * tau / h
        flat_part = (1 - decay) - slope_part
        push = ohms * (flat_part * power + slope_part * following)
        once = lfilter([1.0], [1.0, -decay], push)
        begin = once[-1] / (1 - np.exp(-period / tau))
        total += once + begin * decay ** np.arange(1, n + 1)
    return float(total.max())
