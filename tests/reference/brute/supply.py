"""The supply by integration in time: no closed form of the charging pulse is used.

A rail is a rectified sine behind a diode drop and a resistance, into a capacitor with a series
resistance, from which a current is drawn.
"""

import functools
import math
from dataclasses import dataclass, replace

import numpy as np
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

TIGHT = dict(method="DOP853", rtol=1e-11, atol=1e-12)


@dataclass(frozen=True)
class Rail:
    """One rail of a supply: peak of the source (V), diode drop (V), ohms, farads, ohms, mains Hz."""

    peak: float
    drop: float
    source: float
    farads: float
    esr: float
    hertz: float

    @property
    def unsagged(self):
        """The rail with the diodes' drop but no current, in volts."""
        return self.peak - self.drop


@dataclass(frozen=True)
class Steady:
    """A rail in periodic steady state; currents are those of one winding (both half-cycles)."""

    mean: float
    crest: float
    trough: float
    rms: float
    peak: float
    load: float
    conduction_deg: float

    @property
    def form(self):
        """F, rms over mean of the charging current."""
        return self.rms / self.load

    @property
    def ripple(self):
        """Rms of the charging current into the capacitor, A."""
        return np.sqrt(max(self.rms**2 - self.load**2, 0.0))


def _half_cycle(rail, load, start, keep=False):
    """March one half-cycle of the mains from its zero crossing; the capacitor begins at `start`.

    Returns [capacitor V, charge, square of the current, rail V] integrated, and the pieces marched.
    """
    w = 2 * np.pi * rail.hertz
    end = 0.5 / rail.hertz
    total = rail.source + rail.esr

    def drive(t, y):
        return rail.peak * math.sin(w * t) - rail.drop - y[0] + rail.esr * load

    def off(_t, y):
        return [-load / rail.farads, 0.0, 0.0, y[0] - rail.esr * load]

    def on(t, y):
        i = drive(t, y) / total
        return [(i - load) / rail.farads, i, i * i, y[0] + rail.esr * (i - load)]

    def up(t, y):
        return drive(t, y)

    def down(t, y):
        return drive(t, y)

    up.terminal, up.direction = True, 1
    down.terminal, down.direction = True, -1
    y, t, pieces = np.array([start, 0.0, 0.0, 0.0]), 0.0, []
    for motion, event, conducting in ((off, up, False), (on, down, True), (off, None, False)):
        if t >= end:
            break
        got = solve_ivp(motion, (t, end), y, events=event, dense_output=keep, max_step=end / 8, **TIGHT)
        pieces.append((conducting, t, got.t[-1], got.sol))
        t, y = got.t[-1], got.y[:, -1]
    return y, pieces


@functools.lru_cache(maxsize=None)
def steady(rail, load):
    """Periodic steady state by shooting: the capacitor ends a half-cycle where it began it."""
    if load <= 0:
        v = rail.unsagged
        return Steady(v, v, v, 0.0, 0.0, 0.0, 0.0)
    half = 0.5 / rail.hertz

    def miss(v):
        return _half_cycle(rail, load, v)[0][0] - v

    high = rail.unsagged + rail.esr * load
    gap = high - rail.source * load
    low = max(gap - (high - gap) * 4, 0.0)
    if miss(low) < 0:
        low = 0.0
        if miss(low) < 0:
            raise ValueError("the supply cannot hold this current")
    start = brentq(miss, low, high, xtol=1e-11, rtol=1e-13)
    end, pieces = _half_cycle(rail, load, start, keep=True)
    w = 2 * np.pi * rail.hertz
    total = rail.source + rail.esr

    def current(t, v):
        return (rail.peak * np.sin(w * t) - rail.drop - v + rail.esr * load) / total

    peak, crest, trough, width = 0.0, -np.inf, np.inf, 0.0
    for conducting, a, b, sol in pieces:
        def volts(t, sol=sol, conducting=conducting):
            v = sol(t)[0]
            return v + rail.esr * ((current(t, v) if conducting else 0.0) - load)

        crest = max(crest, _extreme(volts, a, b, +1))
        trough = min(trough, _extreme(volts, a, b, -1))
        if conducting:
            peak = _extreme(lambda t, sol=sol: current(t, sol(t)[0]), a, b, +1)
            width = (b - a) * 2 * rail.hertz * 180.0
    return Steady(
        mean=end[3] / half,
        crest=crest,
        trough=trough,
        rms=math.sqrt(end[2] / half),
        peak=peak,
        load=load,
        conduction_deg=width,
    )


def _extreme(function, a, b, sign):
    """The greatest (+1) or least (-1) value on [a, b]: samples, then ever finer ones round the best."""
    for _ in range(4):
        t = np.linspace(a, b, 401)
        y = sign * function(t)
        k = int(np.argmax(y))
        a, b = t[max(k - 1, 0)], t[min(k + 1, 400)]
    return sign * float(y[k])


def with_resistive_load(rail, ohms):
    """Steady state into a resistor (the published cases are drawn so): (mean, F, peak/mean, ripple rms)."""
    w, half, total = 2 * np.pi * rail.hertz, 0.5 / rail.hertz, rail.source

    def motion(t, y):
        i = max(rail.peak * abs(np.sin(w * t)) - rail.drop - y[0], 0.0) / total
        return [(i - y[0] / ohms) / rail.farads, i, i * i, y[0], y[0] ** 2]

    v = rail.peak * 0.8
    for _ in range(400):
        got = solve_ivp(motion, (0, half), [v, 0, 0, 0, 0], max_step=half / 400, rtol=1e-9, atol=1e-10)
        moved = got.y[0, -1] - v
        v = got.y[0, -1]
        if abs(moved) < 1e-10:
            break
    q, q2, s, s2 = got.y[1:, -1] / half
    amps = np.maximum(rail.peak * np.abs(np.sin(w * got.t)) - rail.drop - got.y[0], 0) / total
    return s, np.sqrt(q2) / q, amps.max() / q, np.sqrt(max(s2 - s * s, 0.0))


def switch_on(rail, at_crest, until):
    """Empty reservoir: (greatest amps, I2t of the first pulse, I2t of all, volts reached, joules per ohm).

    The source is closed at its crest or at its zero; nothing is drawn.
    """
    w, total = 2 * np.pi * rail.hertz, rail.source + rail.esr
    phase = np.pi / 2 if at_crest else 0.0

    def motion(t, y):
        i = max(rail.peak * abs(np.sin(w * t + phase)) - rail.drop - y[0], 0.0) / total
        return [i / rail.farads, i * i]

    step = 1 / (rail.hertz * 400)
    got = solve_ivp(motion, (0, until), [0.0, 0.0], max_step=step, rtol=1e-9, atol=1e-11, dense_output=True)
    t = np.linspace(0, min(until, 3 / rail.hertz), 60001)
    v, square = got.sol(t)
    i = np.maximum(rail.peak * np.abs(np.sin(w * t + phase)) - rail.drop - v, 0) / total
    first = square[np.argmax((i <= 0) & (t > 0.05 / rail.hertz))] if np.any((i <= 0) & (t > 0.05 / rail.hertz)) else square[-1]
    return i.max(), first, got.y[1, -1], got.y[0, -1]


def sag_batch(rails, idles, peaks, ohms, drops, bottom, band_phases=32, per_cycle=1500):
    """Greatest clean amplitude at the bottom of the band, for many builds at once.

    Every array has one entry per build: the rail, the standing current (A, of the whole supply), the
    channels in phase, the load (ohm), the drop as a function, the lowest frequency (Hz). Each rail is
    marched in small equal steps with half-sine currents, for many phases of the signal against the
    mains side by side; the amplitude is brought by secant to where the least headroom is zero.
    """
    n = len(rails)
    col = lambda name: np.array([getattr(r, name) for r in rails])[:, None]
    peak, fall, source, farads, esr, mains = (col(x) for x in ("peak", "drop", "source", "farads", "esr", "hertz"))
    idle, many, ohm, low = (np.asarray(x, float)[:, None] for x in (idles, peaks, ohms, bottom))
    total = source + esr

    def headroom(volts, phases):
        """Least of rail - output - drop over the last common period, per build and phase."""
        v = peak - fall + 0 * phases
        h = 1 / (low * per_cycle)
        ws, wm = 2 * np.pi * low, 4 * np.pi * mains

        def amps_in(t, v, out):
            e = peak * np.abs(np.sin(0.5 * wm * t + phases)) - fall
            return np.maximum(e - v + esr * out, 0) / total

        def amps_out(t):
            return idle + many * np.maximum(volts / ohm * np.sin(ws * t), 0)

        least = np.full_like(v, np.inf)
        settle, judge = 6, 10
        for k in range(per_cycle * (settle + judge)):
            t = k * h
            out, mid, nxt = amps_out(t), amps_out(t + h / 2), amps_out(t + h)
            a = (amps_in(t, v, out) - out) / farads
            if k >= per_cycle * settle:
                rail = v + esr * farads * a
                swing = volts * np.sin(ws * t)
                room = rail - swing - np.array([d(x) for d, x in zip(drops, np.abs(swing / ohm)[:, 0])])[:, None]
                least = np.where(swing > 0, np.minimum(least, room), least)
            b = (amps_in(t + h / 2, v + h / 2 * a, mid) - mid) / farads
            c = (amps_in(t + h / 2, v + h / 2 * b, mid) - mid) / farads
            d = (amps_in(t + h, v + h * c, nxt) - nxt) / farads
            v = v + h / 6 * (a + 2 * b + 2 * c + d)
        return least

    return headroom


def scaled(rail, **changes):
    """The same rail with some figures replaced."""
    return replace(rail, **changes)
