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
    # One half-cycle is nearly a straight map: the secant is there in a few; brentq where it is not.
    a, b = max(high - 1.4 * (high - gap), low), gap
    at_a, at_b = miss(a), miss(b)
    for _ in range(12):
        if abs(b - a) < 1e-11 or at_a == at_b:
            break
        a, at_a, b = b, at_b, b - at_b * (b - a) / (at_b - at_a)
        at_b = miss(b)
    start = b if abs(at_b) < 1e-10 else brentq(miss, low, high, xtol=1e-11, rtol=1e-13)
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


@dataclass(frozen=True)
class Start:
    """One switching on: the rail, its extra source ohms until the bypass, seconds of it, idle amps."""

    rail: Rail
    extra: float
    bypass: float
    idle: float
    until: float


def switch_on(starts, at_crest, per_cycle=1600):
    """Empty reservoirs, many supplies marched side by side in small equal steps of the mains.

    The source closes at its crest or at its zero; until the bypass, `idle` is drawn from when a rail has
    come up to 10 V. Returns arrays: the greatest amps before and after the bypass, the square of the charging current integrated before
    the bypass, to the end of the first half-cycle, over the first half-cycle after the bypass (`again`),
    and to the end, and the rail volts at the bypass.
    """
    get = lambda f: np.array([f(s) for s in starts])
    peak, fall, source = get(lambda s: s.rail.peak), get(lambda s: s.rail.drop), get(lambda s: s.rail.source)
    farads, esr, hertz = get(lambda s: s.rail.farads), get(lambda s: s.rail.esr), get(lambda s: s.rail.hertz)
    extra, bypass, idle, until = (get(lambda s, n=n: getattr(s, n)) for n in ("extra", "bypass", "idle", "until"))
    h = 1 / (hertz * per_cycle)
    w = 2 * np.pi * hertz
    shift = np.pi / 2 if at_crest else 0.0
    v = np.zeros(len(starts))
    early, late, square, before, first, again, volts = (np.zeros(len(starts)) for _ in range(7))
    switched = np.round(bypass / h).astype(int)
    end = np.round(until / h).astype(int)
    biased = np.zeros(len(starts), bool)

    for k in range(int(end.max()) + 1):
        t = k * h
        soft = k < switched
        total = source + esr + np.where(soft, extra, 0.0)

        biased |= v >= 10.0
        # A surge at the bypass is taken as charging alone: what is drawn beside it is no part of it.
        idling = np.where(biased, idle, 0.0)
        drawn = np.where(soft, idling, 0.0)

        def flow(t, v):
            i = np.maximum(peak * np.abs(np.sin(w * t + shift)) - fall - v + esr * drawn, 0.0) / total
            return i, (i - drawn) / farads

        alive = k <= end
        i0, a = flow(t, v)
        if np.any(k == switched):
            last = np.maximum(peak * np.abs(np.sin(w * t + shift)) - fall - v + esr * idling, 0.0) / (source + esr + extra)
            volts = np.where(k == switched, v + esr * (last - idling), volts)
        i1, b = flow(t + h / 2, v + h / 2 * a)
        i2, c = flow(t + h / 2, v + h / 2 * b)
        i3, d = flow(t + h, v + h * c)
        early = np.where(soft & alive, np.maximum(early, i0), early)
        late = np.where(~soft & alive, np.maximum(late, i0), late)
        part = h / 6 * (i0**2 + 2 * i1**2 + 2 * i2**2 + i3**2) * alive
        square = square + part
        before = before + np.where(soft, part, 0.0)
        first = first + (part if k < per_cycle // 2 else 0.0)
        again = again + np.where((k >= switched) & (k < switched + per_cycle // 2), part, 0.0)
        v = np.maximum(v + h / 6 * (a + 2 * b + 2 * c + d), 0.0)
    return dict(early=early, late=late, square=square, before=before, first=first, again=again, volts=volts)


def sag_batch(rails, idles, channels, ohms, need, bottom, judge, bridged, per_cycle=1000, settle=14):
    """Greatest clean amplitude at the bottom of the band, for many builds at once, by marching.

    One entry per build: the rail, the standing current (A), the channels in phase, the load (ohm), a
    function from (V of output) to the rail it needs, the lowest frequency (Hz), the periods to judge.
    Each rail is marched in small equal steps with half-sine currents, for many phases of the signal
    against the mains side by side; the amplitude is brought to where the least headroom is zero.
    """
    col = lambda name: np.array([getattr(r, name) for r in rails])[:, None]
    peak, fall, source, farads, esr, mains = (col(x) for x in ("peak", "drop", "source", "farads", "esr", "hertz"))
    idle, many, ohm, low = (np.asarray(x, float)[:, None] for x in (idles, channels, ohms, bottom))
    # The halves of a bridge draw on a rail in turn.
    halves = np.asarray(bridged)[:, None]
    total = source + esr
    h = 1 / (low * per_cycle)
    w = 2 * np.pi * mains
    table = np.sin(2 * np.pi * np.arange(2 * per_cycle + 1) / (2 * per_cycle))

    def headroom(volts, phases, loads):
        """Least of rail less what the output needs, per build and phase."""
        level = loads * volts[:, None] / ohm
        wanted = np.array([need[b](volts[b] * np.maximum(table[::2], 0)) for b in range(len(need))])
        # Begun where the last march ended: a weak supply takes long to settle.
        v = begin["volts"] + 0 * phases
        periods = begin["periods"]
        least = np.full_like(v, np.inf)
        for k in range(per_cycle * (periods + judge)):
            j = k % per_cycle
            t = k * h
            at = lambda n: idle + level * np.where(halves, 0.5 * abs(table[n]), max(table[n], 0.0))
            wave = [peak * np.abs(np.sin(w * (t + x * h) + phases)) - fall for x in (0, 0.5, 1)]
            out, mid, nxt = at(2 * j), at(2 * j + 1), at(2 * j + 2)
            i = np.maximum(wave[0] - v + esr * out, 0) / total
            a = (i - out) / farads
            if k >= per_cycle * periods and 0 < 2 * j < per_cycle:
                least = np.minimum(least, v + esr * (i - out) - wanted[:, j : j + 1])
            b = (np.maximum(wave[1] - v - h / 2 * a + esr * mid, 0) / total - mid) / farads
            c = (np.maximum(wave[1] - v - h / 2 * b + esr * mid, 0) / total - mid) / farads
            d = (np.maximum(wave[2] - v - h * c + esr * nxt, 0) / total - nxt) / farads
            v = v + h / 6 * (a + 2 * b + 2 * c + d)
        begin.update(volts=v.mean(axis=1, keepdims=True), periods=settle)
        return least

    begin = dict(volts=peak - fall, periods=4 * settle)
    count = len(rails)
    every = np.arange(count)

    def secant(volts, phases, rounds):
        """Amplitude at which the least headroom over these phases is zero, and the phase that has it."""
        x0, y0 = volts, headroom(volts, phases, many).min(axis=1)
        x1 = volts + np.clip(y0 / 1.2, -0.3 * volts, 0.3 * volts)
        for _ in range(rounds):
            rooms = headroom(x1, phases, many)
            y1 = rooms.min(axis=1)
            moved = np.abs(y1 - y0) > 1e-12
            step = np.where(moved, -y1 * (x1 - x0) / np.where(moved, y1 - y0, 1.0), 0.0)
            x0, y0, x1 = x1, y1, np.maximum(x1 + np.clip(step, -0.3 * x1, 0.3 * x1), 0.1)
        return x1, phases[every, np.argmin(rooms, axis=1)]

    phases = np.pi * np.arange(16)[None, :] / 16 + np.zeros((count, 1))
    guess, best = secant(np.array([r.unsagged for r in rails]) * 0.75, phases, 4)
    reach = np.pi / 16
    for _ in range(5):
        near = best[:, None] + reach * np.linspace(-1, 1, 9)[None, :]
        best = near[every, np.argmin(headroom(guess, near, many), axis=1)]
        reach /= 3.5
    guess, _ = secant(guess, best[:, None], 3)
    return guess


def scaled(rail, **changes):
    """The same rail with some figures replaced."""
    return replace(rail, **changes)
