"""Safe operating area: the derated curve, and its use by a locus, by exhaustive sampling."""

import numpy as np
from scipy.optimize import minimize


def allowed(device, case, volts):
    """Amps allowed at each collector voltage; NaN between the end of the curve and breakdown.

    The curve is straight in log-log; left of its first sloped segment that segment goes on; only
    the rated current is not derated.
    """
    volts = np.asarray(volts, float)
    k = (device["tj"] - max(case, 25.0)) / (device["tj"] - 25.0)
    points = device["soa"]
    v = np.log(np.array([p[1] for p in points]))
    i = np.log(np.array([p[0] for p in points]))
    slopes = np.diff(i) / np.diff(v)
    first = int(np.argmax(slopes < -1e-9)) if np.any(slopes < -1e-9) else None
    x = np.log(np.maximum(volts, 1e-9))
    where = np.clip(np.searchsorted(v, x, side="right") - 1, 0, len(slopes) - 1)
    if first is not None:
        where = np.maximum(where, first)
    curve = np.exp(i[where] + slopes[where] * (x - v[where]))
    factor = np.full(len(slopes), k)
    if device.get("sb") is not None:
        steep = slopes < -1.05
        factor[steep] = 1 - device["sb"] * (max(case, 25.0) - 25.0)
    limit = np.minimum(factor[where] * curve, k * device["power"] / np.maximum(volts, 1e-9))
    # At Tj,max nothing is allowed any more.
    limit = np.clip(limit, 1e-12, device["ic"])
    return np.where(volts > points[-1][1], np.nan, limit)


def zoom(function, boxes, points, rounds, shrink):
    """Greatest value of a vectorised function near each start: (centre, half widths, lower, upper).

    A small grid is laid round the best point so far, again and again, ever finer.
    """
    best = (-np.inf, None)
    for centre, half, lower, upper in boxes:
        centre, half = np.array(centre, float), np.array(half, float)
        for _ in range(rounds):
            axes = [np.clip(np.linspace(c - h, c + h, n), a, b) for c, h, a, b, n in zip(centre, half, lower, upper, points)]
            mesh = np.meshgrid(*axes, indexing="ij")
            got = function(*mesh)
            got = np.where(np.isnan(got), -np.inf, got)
            k = np.unravel_index(int(np.argmax(got)), got.shape)
            centre = np.array([m[k] for m in mesh])
            if got[k] > best[0]:
                best = (float(got[k]), centre.copy())
            half = half * shrink
    if best[1] is None:
        return best
    # A last walk without a grid, begun again until it stands still.
    lower, upper = boxes[0][2], boxes[0][3]
    free = [k for k in range(len(lower)) if upper[k] > lower[k]]

    def less(x):
        at = best[1].copy()
        at[free] = np.clip(x, np.array(lower)[free], np.array(upper)[free])
        got = float(function(*[np.array([a]) for a in at])[0])
        return 1e9 if np.isnan(got) else -got

    for reach in (3e-3, 1e-4):
        start = best[1][free]
        simplex = np.vstack([start, start + np.diag(reach * np.maximum(np.abs(start), 1e-3))])
        got = minimize(less, start, method="Nelder-Mead", options=dict(initial_simplex=simplex, xatol=1e-8, fatol=1e-9, maxfev=110))
        if -got.fun > best[0]:
            at = best[1].copy()
            at[free] = np.clip(got.x, np.array(lower)[free], np.array(upper)[free])
            best = (float(-got.fun), at)
    return best
