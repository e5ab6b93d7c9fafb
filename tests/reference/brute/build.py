"""Random but plausible builds: the figures, and the same figures written as an ampspec text.

Every figure is rounded to what the text says before it is used, so that both sides start alike.
Parts and names are invented.
"""

import math

import numpy as np


def tidy(value, digits=4):
    """A figure as a person would write it: few significant digits."""
    return float(f"{value:.{digits}g}")


def num(value):
    """A number for the text: plain decimals, no exponent."""
    return np.format_float_positional(value, trim="-")


def tolerance(pair):
    """A tolerance after its quantity, from (up, down) as fractions; nothing if none is stated."""
    up, down = pair
    if up == down == 0:
        return ""
    if up == down:
        return f" ±{num(tidy(up * 100))} %"
    return f" +{num(tidy(up * 100))} % -{num(tidy(down * 100))} %"


def curve(points, unit="A"):
    """`A at V` (or `num at A`) pairs as the text lists them."""
    return ", ".join(f"{num(a)} {unit} at {num(b)} V" for a, b in points)


def _safe_area(rng, ic, power, vceo):
    """A monotone d.c. curve: the current limit, the power line, then second breakdown to the end."""
    corner = tidy(power / ic * rng.uniform(0.8, 1.0), 3)
    points = [(ic, corner)]
    last_v = tidy(vceo * (1.0 if rng.random() < 0.8 else rng.uniform(0.75, 0.95)), 3)
    steps = int(rng.integers(2, 6))
    volts = np.geomspace(corner, last_v, steps + 1)[1:]
    breakdown = rng.uniform(30, 80)
    for v in volts:
        v = tidy(float(v), 3)
        if v <= points[-1][1]:
            continue
        slope = -rng.uniform(0.9, 1.1) if v < breakdown else -rng.uniform(1.3, 2.4)
        a = tidy(points[-1][0] * (v / points[-1][1]) ** slope, 3)
        points.append((min(a, points[-1][0] * 0.98) if a >= points[-1][0] else a, v))
    if rng.random() < 0.2:
        points.insert(0, (ic, tidy(corner * 0.5, 3)))
    return [(tidy(a, 4), v) for a, v in points]


def _gain(rng, ic, least):
    """Least gain against current, falling towards the rated current and stated up to it."""
    amps = [tidy(ic * x, 3) for x in ([0.05, 0.3, 0.6, 1.0] if rng.random() < 0.6 else [0.1, 1.0])]
    gain, out = tidy(rng.uniform(60, 150), 3), []
    for a in amps:
        out.append((gain, a))
        gain = max(tidy(gain * rng.uniform(0.45, 0.95), 3), least)
    return out


def _foster(rng, total):
    """Three or four thermal terms whose resistances sum to the junction's."""
    n = int(rng.integers(3, 5))
    parts = rng.dirichlet(np.ones(n) * 4) * total
    parts = [tidy(float(p), 4) for p in parts[:-1]]
    parts.append(float(f"{total - sum(parts):.6f}"))
    taus = sorted(tidy(float(t), 3) for t in 10 ** rng.uniform(-3.5, 0, n))
    return list(zip(parts, taus))


def _power_device(rng, name, rail_to_rail, amps):
    """An output transistor with room to spare, or nearly so."""
    vceo = tidy(rail_to_rail * rng.uniform(1.12, 2.0), 3)
    ic = tidy(max(amps * rng.uniform(1.1, 2.5), 4), 2)
    tj = float(rng.choice([150, 175, 200]))
    power = tidy(rng.uniform(90, 260), 3)
    jc = tidy((tj - 25) / power * rng.uniform(0.97, 1.0), 4)
    device = dict(name=name, vceo=vceo, ic=ic, icm=tidy(ic * 1.6, 3), power=power, tj=tj, jc=jc)
    device["soa"] = _safe_area(rng, ic, power, vceo)
    device["sb"] = tidy(rng.uniform(0.002, 0.005), 2) if rng.random() < 0.3 else None
    device["hfe"] = _gain(rng, ic, 12)
    device["vbe"] = tidy(rng.uniform(0.58, 0.72), 3)
    device["foster"] = _foster(rng, jc)
    return device


def _small_device(rng, name, rail_to_rail, amps, watts):
    device = _power_device(rng, name, rail_to_rail, amps)
    ic = tidy(max(amps * rng.uniform(1.5, 4), 0.5), 2)
    power = tidy(watts * rng.uniform(0.8, 1.5), 3)
    jc = tidy((device["tj"] - 25) / power, 4)
    device.update(ic=ic, icm=tidy(ic * 2, 3), power=power, jc=jc, foster=_foster(rng, jc))
    device["soa"] = _safe_area(rng, ic, power, device["vceo"])
    device["hfe"] = _gain(rng, ic, 25)
    return device


def _load(rng, index, name, folder, kinds, base=None):
    """One load of a given kind; tables are written to the folder as CSV."""
    kind = str(rng.choice(kinds))
    size = base or float(rng.choice([4, 6, 8]))
    load = dict(name=name, kind=kind)
    if kind == "resistive":
        load.update(ohms=size, tolerance=[(0, 0), (0.05, 0.05), (0.1, 0.1), (0.1, 0.05)][int(rng.integers(4))])
    elif kind == "nominal":
        load.update(nominal=size)
        if rng.random() < 0.7:
            load.update(minimum=tidy(size * rng.uniform(0.7, 0.95), 3), angle=tidy(rng.uniform(5, 65), 3))
        load["dc"] = tidy(size * rng.uniform(0.65, 0.8), 3)
    elif kind == "voice-coil":
        re = tidy(size * rng.uniform(0.68, 0.85), 3)
        lossy = 1.0
        le = tidy(rng.uniform(0.2, 1.2) * 1e-3 * size / 8, 3)
        resonances = []
        for _ in range(int(rng.integers(1, 3))):
            resonances.append((tidy(rng.uniform(25, 90) * (1 if not resonances else 12), 3), tidy(rng.uniform(1.5, 6), 3), tidy(rng.uniform(0.3, 1.2), 3)))
        load.update(nominal=size, re=re, le=le, lossy=lossy, resonances=resonances)
    elif kind == "table":
        re, le = size * 0.78, 0.5e-3
        fs, qms, qes = rng.uniform(30, 70), rng.uniform(2, 5), rng.uniform(0.4, 1)
        f = np.geomspace(10, 40_000, 97)
        z = re + 1j * 2 * np.pi * f * le + re * qms / qes / (1 + 1j * qms * (f / fs - fs / f))
        rows = [(tidy(a, 6), tidy(abs(b), 5), tidy(math.degrees(np.angle(b)), 5)) for a, b in zip(f, z)]
        load.update(nominal=size, rows=rows, file=f"{index:04d}-{name}.csv")
        (folder / load["file"]).write_text("frequency_hz,modulus_ohm,phase_deg\n" + "".join(f"{num(a)},{num(b)},{num(c)}\n" for a, b, c in rows))
    elif kind == "parallel":
        load["parts"] = [
            _load(rng, index, f"{name}-{x}", folder, ["resistive", "voice-coil"] if x == "b" else ["voice-coil"], size * 2)
            for x in "ab"
        ]
        load["nominal"] = size
    return load


def _points_drop(rng, peak_amps, emitters):
    """The drop as a person states it: one figure, or two or three points; the emitter resistors' is in it."""
    first = tidy(rng.uniform(1.0, 2.5), 3)
    n = int(rng.integers(1, 4))
    if n == 1:
        return [(tidy(first + 1.3 * peak_amps * emitters, 3), 0.0)]
    points = [(first, 0.0)]
    amps, volts = 0.0, first
    for _ in range(n - 1):
        step = rng.uniform(2, 6)
        amps = tidy(amps + step, 2)
        volts = tidy(volts + rng.uniform(0.4, 2.0) + step * emitters, 3)
        points.append((volts, amps))
    return points


def _tolerance(rng, figures):
    return figures[int(rng.integers(len(figures)))]


def generate(seed, index, folder):
    """One build as a dict of figures (SI units, fractions) with its text under `text`."""
    rng = np.random.default_rng([seed, index])
    b = dict(name=f"build{index}", file=f"b{index:04d}.ampspec")
    b["bridged"] = bool(rng.random() < 0.15)
    b["channels"] = int(rng.integers(1, 4)) * 2 if b["bridged"] else int(rng.integers(1, 7))
    per_channel_ok = not b["bridged"]
    pick = ["build", "pair"] + (["channel"] if per_channel_ok else [])
    share = lambda: {"build": b["channels"], "pair": min(2, b["channels"]), "channel": 1}[str(rng.choice(pick))]
    b["per_supply"] = share()
    if b["channels"] % b["per_supply"]:
        b["per_supply"] = b["channels"]
    b["per_sink"] = share()
    if b["channels"] % b["per_sink"]:
        b["per_sink"] = b["channels"]

    # Supply and mains.
    vs = float(rng.choice([22, 25, 28, 30, 35, 40, 45]))
    reg = tidy(rng.uniform(0.04, 0.14), 3)
    of_no_load = bool(rng.random() < 0.3)
    rho = reg / (1 - reg) if of_no_load else reg
    peak_watts = (vs * 1.3) ** 2 / 16
    va = tidy(max(b["per_supply"] * peak_watts * rng.uniform(1.5, 4) * (1.8 if b["bridged"] else 1), 100), 2)
    bridges = int(rng.integers(1, 3))
    diode = tidy(rng.uniform(0.7, 1.1), 2)
    cap_n = int(rng.integers(1, 4))
    cap = float(rng.choice([2200, 4700, 6800, 10_000, 15_000])) * 1e-6
    while cap_n * cap < 2.2e-6 * va * 12:
        cap_n += 1
    cap_tol = _tolerance(rng, [(0.2, 0.2), (0.1, 0.1), (0, 0), (0.3, 0.1)])
    esr = tidy(rng.uniform(0.01, 0.06), 2)
    mains = []
    for _ in range(2 if rng.random() < 0.15 else 1):
        style = int(rng.integers(4))
        loop = tidy(rng.uniform(0.05, 0.6), 2)
        if style == 0:
            m = dict(volts=230.0, low=207.0, high=253.0, hertz=50.0, tap=230.0, text="230 V ±10 % 50 Hz", loop=loop)
        elif style == 1:
            m = dict(volts=120.0, low=104.0, high=127.0, hertz=60.0, tap=115.0, text="120 V range 104 V to 127 V 60 Hz", loop=loop)
        elif style == 2:
            m = dict(volts=230.0, low=216.2, high=253.0, hertz=50.0, tap=230.0, text="230 V +10 % -6 % 50 Hz", loop=loop)
        else:
            m = dict(volts=240.0, low=216.0, high=254.4, hertz=50.0, tap=230.0, text="240 V range 216 V to 254.4 V 50 Hz", loop=loop)
        if not mains or mains[0]["volts"] != m["volts"]:
            mains.append(m)
    b["mains"] = mains
    b["supply"] = dict(
        vs=vs, rho=rho, va=va, bridges=bridges, diode=diode, cap_n=cap_n, cap=cap, cap_tol=cap_tol, esr=esr,
        cap_volts=float(rng.choice([50, 63, 80, 100])), ripple=tidy(rng.uniform(2, 8), 2),
        life=5000.0, life_at=105.0, vrrm=float(rng.choice([200, 400])), bridge_amps=float(rng.choice([10, 25, 35])),
        surge=float(rng.choice([150, 300, 400])), wiring=tidy(rng.uniform(0, 0.02), 2),
        bleed=float(rng.choice([1000, 2200, 3300, 4700])), bleed_tol=_tolerance(rng, [(0, 0), (0.05, 0.05)]),
        bleed_per=str(rng.choice(["rail", "supply"])),
        soft=float(rng.choice([10, 15, 22, 27, 33, 47])), bypass=float(rng.choice([0.2, 0.3, 0.4, 0.6, 1.0])),
        melts=tidy(rng.uniform(40, 250), 2), fuse=float(rng.choice([1.6, 2.5, 3.15, 4, 5, 6.3])), rail_fuse=float(rng.choice([3.15, 4, 5, 6.3, 8])),
    )
    top = max(m["high"] / m["tap"] for m in mains)
    rail_to_rail = 2 * math.sqrt(2) * vs * (1 + rho) * top
    rail = math.sqrt(2) * vs * (1 + rho)

    # Loads.
    loads = []
    kinds = ["resistive", "nominal", "voice-coil", "table", "parallel"]
    for k in range(int(rng.integers(1, 4))):
        loads.append(_load(rng, index, f"load{chr(97 + k)}", folder, kinds))
    b["loads"] = loads
    smallest = min(_least_guess(load) for load in loads) / (2 if b["bridged"] else 1)
    peak_amps = rail / smallest

    # Output stage and what drives it.
    pairs = int(rng.integers(max(1, math.ceil(peak_amps / 14)), 7)) if peak_amps < 84 else 6
    nodal = rng.random()
    device = _power_device(rng, "n1", rail_to_rail, peak_amps / pairs)
    other = dict(device, name="p1")
    if rng.random() < 0.5:
        other["soa"] = [(device["soa"][0][0], device["soa"][0][1])] + [(tidy(a * 0.93, 3), v) for a, v in device["soa"][1:]]
        other["separate"] = True
    re_ohms = float(rng.choice([0.1, 0.15, 0.22, 0.33, 0.47]))
    re_tol = _tolerance(rng, [(0, 0), (0.05, 0.05), (0.1, 0.1), (0.01, 0.01)])
    b["out"] = dict(
        pairs=pairs, up=device, down=other, re=re_ohms, re_tol=re_tol, re_low=re_tol[1], re_watts=float(rng.choice([3, 5, 7])),
        be=float(rng.choice([47, 68, 100])) if rng.random() < 0.7 else None,
        idle=tidy(rng.uniform(0.02, 0.15), 2), cs=tidy(rng.uniform(0.2, 1.0), 2),
        spread=tidy(rng.uniform(0.005, 0.05), 2), across=tidy(rng.uniform(0, 6), 2) if nodal < 0.3 else 0.0,
        sensor=str(rng.choice(["sink", "device", "board"])),
    )
    drv_amps = peak_amps / 20
    driver = _small_device(rng, "d1", rail_to_rail, drv_amps, 20 + 10 * drv_amps)
    b["drv"] = dict(
        pairs=1, up=driver, down=dict(driver), cs=tidy(rng.uniform(0.5, 1.5), 2),
        own=tidy(rng.uniform(3, 12), 2) if rng.random() < 0.6 else None,
        be=float(rng.choice([100, 150, 220])) if rng.random() < 0.3 else None,
    )
    b["vas"] = dict(
        vceo=tidy(rail_to_rail * rng.uniform(1.1, 1.6), 3), current=tidy(rng.uniform(0.005, 0.03), 2),
        tail=tidy(rng.uniform(0.002, 0.005), 2), comp=float(rng.choice([47, 68, 100])) * 1e-12,
    )

    b["drop"] = _points_drop(rng, peak_amps, re_ohms / pairs)
    bottom = float(rng.choice([20, 25, 40]))
    b["band"] = (bottom, 20_000.0)
    b["rated"] = []
    for ohms in sorted({_nominal(load) for load in loads}, reverse=True):
        if abs(ohms - round(ohms, 6)) > 1e-12:
            continue
        half = ohms / 2 if b["bridged"] else ohms
        lost = float(b["drop"][-1][0])
        volts = max(rail - lost - 1, 5) * rng.uniform(0.7, 0.9) * (0.8 if b["bridged"] else 1)
        b["rated"].append((tidy((volts * (2 if b["bridged"] else 1)) ** 2 / 2 / ohms, 3), ohms))

    # Heat.
    b["sink"] = dict(rsa=tidy(rng.uniform(0.15, 0.6) / b["per_sink"] ** 0.7, 2), at=float(rng.choice([40, 50, 75])), mass=tidy(rng.uniform(0.5, 4), 2))
    cold = float(rng.choice([0, 5, 10, 15, 20]))
    b["ambient"] = (cold, float(rng.choice([30, 35, 40, 45])))
    b["enclosure"] = float(rng.choice([0, 0, 3, 5]))
    b["duty_text"] = str(rng.choice(["1/8", "1/3", "1/10", "1/8", "1/2"]))
    b["duty"] = 1 / int(b["duty_text"][2:])

    # Protection and network.
    line_bank = bool(rng.random() < 0.6)
    base = peak_amps * rng.uniform(0.8, 2.0) / (1 if line_bank else pairs)
    knee = tidy(rail * rng.uniform(0.2, 0.5), 2)
    line = [(tidy(base, 3), 0.0), (tidy(base, 3), knee), (tidy(base * rng.uniform(0.3, 0.6), 3), tidy(rail * 1.2, 3)), (tidy(base * rng.uniform(0.08, 0.25), 3), tidy(rail * 2.2, 3))]
    vth = tidy(rng.uniform(1.0, 3.0), 2)
    b["guard"] = dict(
        bank=line_bank, line=line, network=bool(rng.random() < 0.3),
        r1=float(rng.choice([150, 220, 330])), r2=float(rng.choice([100, 150])), r3=float(rng.choice([6800, 10_000, 15_000])),
        von=0.6, vth=vth, vth_text=num(vth), r=float(rng.choice([22, 33, 47, 68])) * 1e3, c=float(rng.choice([10, 22, 47])) * 1e-6,
        release=float(rng.choice([5, 10, 15])) * 1e-3, relay_amps=float(rng.choice([8, 12, 16])), relay_volts=60.0,
    )
    b["net"] = dict(r=float(rng.choice([4.7, 8.2, 10])), watts=float(rng.choice([2, 3, 5])), c=float(rng.choice([47, 68, 82, 100])) * 1e-9)
    b["text"] = text(b)
    (folder / b["file"]).write_text(b["text"])
    return b


def _nominal(load):
    from .load import nominal

    return nominal(load)


def _least_guess(load):
    """A first idea of the least modulus, only to choose sensible parts."""
    if load["kind"] == "parallel":
        return 1 / sum(1 / _least_guess(p) for p in load["parts"])
    return load.get("minimum", 0.75 * _nominal(load))


def _load_text(load):
    out = []
    lines = []
    if load["kind"] == "resistive":
        lines = [f"resistive {num(load['ohms'])} ohm{tolerance(load['tolerance'])}"]
    elif load["kind"] == "nominal":
        lines = [f"nominal {num(load['nominal'])} ohm"]
        if "minimum" in load:
            lines += [f"minimum {num(load['minimum'])} ohm", f"angle {num(load['angle'])} deg"]
        lines += [f"dc {num(load['dc'])} ohm"]
    elif load["kind"] == "voice-coil":
        lines = [f"nominal {num(load['nominal'])} ohm", f"voice-coil {num(load['re'])} ohm {num(tidy(load['le'] * 1e3, 6))} mH"]
        lines += [f"resonance {num(f)} Hz mechanical {num(m)} electrical {num(e)}" for f, m, e in load["resonances"]]
    elif load["kind"] == "table":
        lines = [f"nominal {num(load['nominal'])} ohm", f'table "{load["file"]}"', f"dc {num(tidy(load['nominal'] * 0.75, 3))} ohm"]
    elif load["kind"] == "parallel":
        for part in load["parts"]:
            out.append(_load_text(part))
        lines = [f"nominal {num(load['nominal'])} ohm", "parallel " + ", ".join(p["name"] for p in load["parts"])]
    body = "\n".join("    " + x for x in lines)
    out.append(f"load {load['name']} {{\n{body}\n}}")
    return "\n".join(out)


def _device_text(d, kind, header=None):
    lines = [
        f"vceo {num(d['vceo'])} V",
        f"current {num(d['ic'])} A peak {num(d['icm'])} A",
        f"power {num(d['power'])} W at 25 degC",
        f"junction {num(d['tj'])} degC",
        f"junction-case {num(d['jc'])} K/W",
        f"foster {', '.join(f'{num(r)} K/W {num(tidy(t * 1e3, 6))} ms' for r, t in d['foster'])}",
        f"soa dc {curve(d['soa'])}",
        f"hfe minimum {', '.join(f'{num(g)} at {num(a)} A' for g, a in d['hfe'])}",
        f"vbe {num(d['vbe'])} V",
        "transition 30 MHz",
        f'part "{d["name"].upper()}-X"' if kind != "complementary" else f'part "{d["name"].upper()}-N" "{d["name"].upper()}-P"',
        'source authorised "invented"',
    ]
    if d["sb"] is not None:
        lines.insert(5, f"second-breakdown {num(tidy(d['sb'] * 100, 4))} %/K")
    body = "\n".join("    " + x for x in lines)
    return f"device {d['name']} {kind} {{\n{body}\n}}"


def per(count, channels):
    """How a thing shared by `count` channels is written."""
    if count == 1:
        return "per channel"
    return "per build" if count == channels else f"per {count} channels"


def text(b):
    """The build as an ampspec."""
    s, o, d, v, g, n = b["supply"], b["out"], b["drv"], b["vas"], b["guard"], b["net"]
    reg = s["rho"] / (1 + s["rho"])
    stated = tidy(s["rho"], 6)
    of = "full-load"
    if abs(stated - s["rho"]) > 1e-12:
        stated, of = tidy(reg, 6), "no-load"
    taps = sorted({m["tap"] for m in b["mains"]} | {115.0, 230.0})
    emitter = f"emitter {num(o['re'])} ohm{tolerance(o['re_tol'])} {num(o['re_watts'])} W pulse 20 A"
    parts = ["ampspec 1", ""]
    parts.append("amplifier board {")
    parts += [
        "    output out", "    driver drv", "    predriver none", "    voltage-amplifier vas",
        "    rated " + ", ".join(f"{num(w)} W into {num(r)} ohm all-channels nominal-mains" for w, r in b["rated"]) if b["rated"] else "    rated none",
        f"    band {num(b['band'][0])} Hz to {num(b['band'][1])} Hz",
        "    drop " + (", ".join(f"{num(x)} V at {num(a)} A" for x, a in b["drop"]) if len(b["drop"]) > 1 else f"{num(b['drop'][0][0])} V"),
        "    gain 28 dB", "    channels-per-board 1", "    board-reservoir none", "    network net", "}",
    ]
    parts += [
        "stage out {", "    connection emitter-follower", "    devices n1 p1", f"    pairs {o['pairs']}", f"    {emitter}",
        f"    base-emitter {num(o['be'])} ohm" if o["be"] else "    base-emitter none",
        f"    idle {num(o['idle'])} A per device", f"    insulator {num(o['cs'])} K/W", f"    vbe-spread {num(o['spread'])} V",
        f"    spread-across-sink {num(o['across'])} K", f"    sensor on {o['sensor']}", "}",
        "stage drv {", "    connection emitter-follower", "    devices d1", "    pairs 1", f"    insulator {num(d['cs'])} K/W",
        f"    base-emitter {num(d['be'])} ohm" if d["be"] else "    base-emitter none",
        f"    own-sink {num(d['own'])} K/W per device" if d["own"] else "    own-sink none",
        "    spread-across-sink 0 K", "}",
        "stage vas {", "    connection common-emitter", "    devices v1", "    pairs 1", f"    output-current {num(v['current'])} A",
        f"    tail {num(v['tail'])} A compensation {num(tidy(v['comp'] * 1e12, 4))} pF", "}",
    ]
    parts.append(_device_text(o["up"], "npn"))
    if o["down"].get("separate"):
        parts.append(f"device p1 pnp from n1 {{\n    soa dc {curve(o['down']['soa'])}\n    part \"P1-X\"\n}}")
    else:
        parts.append('device p1 pnp from n1 { part "P1-X" }')
    parts.append(_device_text(d["up"], "complementary"))
    parts.append(f"device v1 complementary {{\n    vceo {num(v['vceo'])} V\n    current 0.2 A\n    power 2 W\n    junction 150 degC\n    vbe 0.65 V\n}}")
    parts += [_load_text(load) for load in b["loads"]]
    parts.append(f"heatsink fins {{\n    resistance {num(b['sink']['rsa'])} K/W at {num(b['sink']['at'])} K\n    mass {num(b['sink']['mass'])} kg\n    touchable no\n}}")
    parts.append(
        f"transformer t1 {{\n    primary {', '.join(num(t) + ' V' for t in taps)}\n    secondary 2 x {num(s['vs'])} Vac\n"
        f"    rating {num(s['va'])} VA per transformer\n    regulation {num(tidy(stated * 100, 6))} % of {of}\n    thermal-fuse 130 degC\n}}"
    )
    parts += [
        "supply psu {", "    transformer t1",
        f"    rectifier {s['bridges']} x bridge {num(s['vrrm'])} V {num(s['bridge_amps'])} A surge {num(s['surge'])} A drop {num(s['diode'])} V",
        f"    reservoir {s['cap_n']} x {num(tidy(s['cap'] * 1e6, 5))} uF{tolerance(s['cap_tol'])} {num(s['cap_volts'])} V esr {num(tidy(s['esr'] * 1e3, 4))} mohm ripple {num(s['ripple'])} A life {num(s['life'])} h life-at {num(s['life_at'])} degC per rail",
        f"    bleeder {num(s['bleed'])} ohm{tolerance(s['bleed_tol'])} 5 W per {s['bleed_per']}",
        "    fuse mains " + ", ".join(f"{num(s['fuse'])} A slow melts {num(s['melts'])} A2s tap {num(t)} V" for t in taps),
        f"    fuse rail {num(s['rail_fuse'])} A fast",
        f"    soft-start {num(s['soft'])} ohm 10 W bypass {num(tidy(s['bypass'] * 1e3, 5))} ms",
        f"    wiring {num(tidy(s['wiring'] * 1e3, 4))} mohm", "    terminals enclosed", "}",
    ]
    parts += ["protection guard {"]
    if g["network"]:
        parts.append(f"    limiter sense {num(g['r1'])} ohm base {num(g['r2'])} ohm rail {num(g['r3'])} ohm on {num(g['von'])} V")
        parts.append("    limiter-break none")
    else:
        parts.append(f"    limit-line {'bank' if g['bank'] else 'device'} {curve(g['line'])}")
    parts += [
        f"    detector {g['vth_text']} V {num(g['r'])} ohm {num(tidy(g['c'] * 1e6, 4))} uF watches {'both-halves' if b['bridged'] else 'output'}",
        f"    relay {num(g['relay_amps'])} A at {num(g['relay_volts'])} Vdc",
        f"    contacts series 2 release {num(tidy(g['release'] * 1e3, 4))} ms coil 24 V grounded",
        "    muting 3 s", "    cutout 85 degC ±5 K on sink cooler 4 K", "}",
        f"network net {{\n    zobel {num(n['r'])} ohm {num(n['watts'])} W {num(tidy(n['c'] * 1e9, 4))} nF\n    coil 2 uH damp 10 ohm 2 W\n}}",
        f"build {b['name']} {{",
        f"    channels {b['channels']}{' bridged' if b['bridged'] else ''}",
        f"    supply psu {per(b['per_supply'], b['channels'])}",
        f"    heatsink fins {per(b['per_sink'], b['channels'])}",
        "    protection guard per channel",
        "    mains " + ", ".join(f"{m['text']} loop {num(m['loop'])} ohm tap {num(m['tap'])} V" for m in b["mains"]),
        "    loads " + ", ".join(load["name"] for load in b["loads"]),
        f"    ambient {num(b['ambient'][0])} degC to {num(b['ambient'][1])} degC",
        f"    enclosure {num(b['enclosure'])} K",
        f"    duty {b['duty_text']}",
        "    policy bench", "}", "",
    ]
    return "\n".join(parts)
