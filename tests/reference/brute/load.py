"""What a loudspeaker or a resistor presents: complex impedance from the stated figures."""

import numpy as np


def voice_coil(f, ohms, henries, lossy, resonances, cold):
    """Z(f) of a voice coil; `cold` scales the d.c. resistance, the motional part keeps its ohms."""
    w = 2 * np.pi * np.asarray(f, float)
    z = ohms * cold + (henries * (1j * w) ** lossy)
    for fs, qms, qes in resonances:
        z = z + ohms * qms / qes / (1 + 1j * qms * (f / fs - fs / f))
    return z


def table(f, rows):
    """Z(f) from (Hz, ohm, degrees): logarithm of the modulus, and degrees, straight against log f."""
    hz, ohm, deg = np.array(rows, float).T
    x = np.log(np.asarray(f, float))
    modulus = np.exp(np.interp(x, np.log(hz), np.log(ohm)))
    return modulus * np.exp(1j * np.radians(np.interp(x, np.log(hz), deg)))


def impedances(load, tmin, angle):
    """Every impedance a load can present: a list of functions of frequency, lagging before leading."""
    cold = 1 + 0.0039 * (tmin - 20)
    kind = load["kind"]
    if kind == "resistive":
        up, down = load["tolerance"]
        ends = [load["ohms"]] if up == down == 0 else [load["ohms"] * (1 - down), load["ohms"] * (1 + up)]
        return [lambda f, r=r: r + 0j * np.asarray(f, float) for r in ends]
    if kind == "nominal":
        least = load.get("minimum", 0.8 * load["nominal"])
        phi = np.radians(load.get("angle", angle))
        return [lambda f, s=s: least * np.exp(1j * s * phi) + 0j * np.asarray(f, float) for s in (1, -1)]
    if kind == "voice-coil":
        return [lambda f: voice_coil(f, load["re"], load["le"], load["lossy"], load["resonances"], cold)]
    if kind == "table":
        return [lambda f: table(f, load["rows"])]
    if kind == "parallel":
        sides = [impedances(part, tmin, angle) for part in load["parts"]]
        together = [[]]
        for side in sides:
            together = [t + [z] for t in together for z in side]
        return [lambda f, t=t: 1 / sum(1 / z(f) for z in t) for t in together]
    raise ValueError(kind)


def nominal(load):
    """The resistance the load is rated at."""
    if load["kind"] == "resistive":
        return load["ohms"]
    return load["nominal"]


def grid(band, count=4001):
    """A dense logarithmic grid over the band."""
    return np.geomspace(band[0], band[1], count)


def knots(load):
    """Frequencies at which a load's impedance has a corner."""
    if load["kind"] == "table":
        return [row[0] for row in load["rows"]]
    return [k for part in load.get("parts", []) for k in knots(part)]


def refined_least(function, band, extra=()):
    """Least value of a function of frequency over the band: dense grid, then zoom on the best points."""
    f = np.unique(np.concatenate([grid(band), [x for x in extra if band[0] <= x <= band[1]]]))
    y = function(f)
    best = (np.inf, None)
    order = np.argsort(y)[:3]
    for k in order:
        lo, hi = f[max(k - 1, 0)], f[min(k + 1, len(f) - 1)]
        for _ in range(12):
            x = np.geomspace(lo, hi, 41)
            v = function(x)
            j = int(np.argmin(v))
            lo, hi = x[max(j - 1, 0)], x[min(j + 1, 40)]
        if v[j] < best[0]:
            best = (float(v[j]), float(x[j]))
    if y.min() < best[0]:
        best = (float(y.min()), float(f[int(np.argmin(y))]))
    return best


def flat(load):
    """Whether the load is the same at every frequency."""
    return load["kind"] in ("resistive", "nominal")
