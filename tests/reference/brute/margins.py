"""Every margin of a build worked from its figures by samples, steps and root finding.

The entry is `expected`: a dict from (rule, part name) to stress, rating and used per cent, the
worst over mains regions, loads, stated tolerances, frequencies, amplitudes and angles.
"""

import functools
import math

import numpy as np
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from . import heat, load as loads_, safe_area, stage as stage_, supply as supply_

COUNT = stage_.SAMPLES
TURN = (np.arange(COUNT) + 0.5) * 2 * np.pi / COUNT


class Worst(dict):
    """Keeps, per rule and part, the candidate that uses most of its allowance.

    `past` names those whose data end before the stress: such a margin may be over, never ok.
    """

    def __init__(self):
        super().__init__()
        self.past = set()

    def note(self, rule, part, stress, rating, used, **more):
        key = (rule, part)
        if key not in self or used > self[key]["used"]:
            self[key] = dict(stress=float(stress), rating=None if rating is None else float(rating), used=float(used), **more)

    def below(self, rule, part, stress, rating, factor, **more):
        """A stress that must stay below a factor of its rating."""
        self.note(rule, part, stress, rating, 100 * stress / (factor * rating), **more)


class Case:
    """One build in one mains region: the solved supply, signals and temperatures."""

    def __init__(self, b, mains):
        self.b, self.mains = b, mains
        s, out = b["supply"], b["out"]
        self.halves = 2 if b["bridged"] else 1
        self.stage = dict(pairs=out["pairs"], spread=out["spread"], re=out["re"], re_low=out["re_low"])
        self.pairs, self.idle, self.re = out["pairs"], out["idle"], out["re"]
        self.share_channels = b["per_supply"]
        self.hottest = b["ambient"][1] + b["enclosure"]
        self.supplies = b["channels"] // b["per_supply"]
        # A tolerance that is not stated is zero, but a reservoir's is then 20 % either way.
        up, down = s["cap_tol"] if any(s["cap_tol"]) else (0.2, 0.2)
        self.cap_corners = [1 - down, 1.0, 1 + up]
        ends = sorted({1.0, 1 - out["re_low"], 1 + out["re_tol"][0]})
        self.heat_corners = [(cap, factor) for cap in self.cap_corners for factor in ends]

    def rail(self, level, cap=1.0):
        """The rail at `low`, `volts` (nominal) or `high` mains, with a reservoir scaled by `cap`."""
        s, m = self.b["supply"], self.mains
        turns = s["vs"] * (1 + s["rho"]) / m["tap"]
        return supply_.Rail(
            peak=m[level] / m["tap"] * math.sqrt(2) * s["vs"] * (1 + s["rho"]),
            drop=s["bridges"] * s["diode"],
            # One lead carries a winding's current to a centre tap's bridge, two to a bridge of its own.
            # Both windings of every supply of the build draw through the one mains loop.
            source=s["rho"] * s["vs"] ** 2 / (s["va"] / 2) + s["bridges"] * s["wiring"] + 2 * self.supplies * m["loop"] * turns**2,
            farads=s["cap_n"] * s["cap"] * cap,
            esr=s["esr"] / s["cap_n"],
            hertz=m["hertz"],
        )

    def unsagged(self, level):
        return self.rail(level).unsagged

    def off_load(self, level):
        return self.rail(level).peak

    # Loads. A half of a bridge sees half of what stands between the outputs.
    def half(self, ohms):
        return ohms / self.halves

    def sides(self, load):
        """Impedances as one half sees them."""
        return [lambda f, z=z: z(f) / self.halves for z in loads_.impedances(load, self.b["ambient"][0], 45.0)]

    def resistance(self, load):
        return self.half(loads_.nominal(load))

    def least_modulus(self, load):
        return min(
            loads_.refined_least(lambda f, z=z: np.abs(z(f)), self.b["band"], loads_.knots(load))[0] for z in self.sides(load)
        )

    def burst(self, level, ohms):
        return stage_.burst(self.unsagged(level), self.b["drop"], ohms)

    # The duty.
    def rated(self, load):
        """The greatest claim into this load's nominal resistance, W (of the pair of halves if bridged)."""
        return max((w for w, r in self.b["rated"] if abs(r - loads_.nominal(load)) < 1e-9), default=0.0)

    def duty_amplitude(self, load):
        """Peak volts of one half at the duty."""
        ohms = self.resistance(load)
        burst = self.burst("volts", ohms)
        reference = max(self.rated(load) / self.halves, burst**2 / 2 / ohms)
        return math.sqrt(2 * self.b["duty"] * reference * ohms)

    def drawn(self, amps_peak):
        """Mean current of one rail of one supply, all its channels in phase."""
        return self.share_channels * (amps_peak / math.pi + self.pairs * self.idle)

    def at_duty(self, load, cap=1.0):
        """(amplitude, peak amps, solved rail) with every channel at the duty."""
        volts = self.duty_amplitude(load)
        amps = volts / self.resistance(load)
        return volts, amps, supply_.steady(self.rail("volts", cap), self.drawn(amps))

    def heat_at(self, load, cap, re):
        """One bank's (watts, mean device amps, rail) with the signal, and with idle alone."""
        volts, amps, state = self.at_duty(load, cap)
        signal = stage_.bank_heat(state.mean, volts, self.resistance(load), 0.0, self.pairs, self.idle, re)
        still = supply_.steady(self.rail("volts", cap), self.drawn(0.0)).mean
        return [
            (signal, amps / math.pi / self.pairs + self.idle, state.mean, volts),
            (still * self.pairs * self.idle, self.idle, still, 0.0),
        ]

    # Drivers.
    def driver_current(self, bank_amps):
        """What a driver carries for a bank current: base current of the bank and its standing part."""
        b, out = self.b, self.b["out"]
        gain = gain_at(out["up"]["hfe"], bank_amps / self.pairs)
        return bank_amps / gain + standing(out)

    def driver_heat(self, rail, volts, ohms):
        """Mean watts of one driver at an amplitude: sampled along the locus, standing part always."""
        amps = volts / ohms * np.sin(TURN)
        v = volts * np.sin(TURN)
        carried = np.where(amps > 0, self.driver_current(np.maximum(amps, 0)), standing(self.b["out"]))
        return float(np.mean((rail - v - self.b["out"]["up"]["vbe"]) * carried))

    @functools.lru_cache(maxsize=None)
    def worst_driver_heat(self, rail, most, ohms):
        """The greatest mean watts of one driver up to an amplitude."""
        if most == 0:
            return self.driver_heat(rail, 0.0, ohms)
        lo, hi = 0.0, most
        for _ in range(7):
            tried = np.linspace(lo, hi, 9)
            got = [self.driver_heat(rail, a, ohms) for a in tried]
            k = int(np.argmax(got))
            lo, hi = tried[max(k - 1, 0)], tried[min(k + 1, 8)]
        return got[k]

    def ambient_used(self, temperature, allowed):
        return 100 * (temperature - self.b["ambient"][1]) / (allowed - self.b["ambient"][1])

    def sink(self, channel_watts, extra=0.0):
        """Heatsink temperature in the hottest room for the watts of one channel, all channels on it."""
        s = self.b["sink"]
        return self.hottest + heat.sink_rise(self.b["per_sink"] * channel_watts + extra, s["rsa"], s["at"])

    @functools.cached_property
    def hot(self):
        """Every state at the duty, over loads, stated tolerances, signal or idle alone: temperatures."""
        found = []
        out, drv = self.b["out"], self.b["drv"]
        for load in self.b["loads"]:
            ohms = self.resistance(load)
            for cap, factor in self.heat_corners:
                for bank, mean_amps, rail, level in self.heat_at(load, cap, self.re * factor):
                    driver = self.worst_driver_heat(rail, level, ohms)
                    on_sink = 0.0 if drv["own"] or math.isnan(driver) else 2 * driver
                    sink = self.sink(2 * bank + on_sink)
                    watts = bank / self.pairs * stage_.share_one(mean_amps, self.stage)
                    case = self.case_temperature(sink, watts)
                    found.append(dict(load=load["name"], sink=sink, watts=watts, bank=bank, driver=driver, case=case))
        return found

    def hottest_case(self, load=None):
        """Case of the hottest device at the duty, in one load or in the worst."""
        return max(h["case"] for h in self.hot if load in (None, h["load"]))

    def hottest_driver(self, load):
        """Case of the hottest driver at the duty in one load; NaN where its current cannot be told."""
        return max(self.driver_case(h) for h in self.hot if h["load"] == load)

    def driver_case(self, h):
        drv = self.b["drv"]
        base = h["sink"] + self.spot if not drv["own"] else self.hottest + h["driver"] * drv["own"]
        return base + h["driver"] * drv["cs"]

    def case_temperature(self, sink, watts):
        """Case of the hottest device: it alone stands above the others, and the sink is their mean."""
        out = self.b["out"]
        return sink + self.spot + watts * out["cs"]

    @property
    def spot(self):
        """How far the hottest place is above the mean of the sink."""
        return self.b["out"]["across"] * (1 - 1 / (2 * self.pairs * self.b["per_sink"]))


def gain_at(points, amps):
    """Least gain at a current: straight against its logarithm, flat below the first point, none past the last."""
    gain, at = np.array(points, float).T
    x = np.log(np.maximum(np.asarray(amps, float), 1e-12))
    return np.where(np.asarray(amps) > at[-1] * (1 + 1e-12), np.nan, np.interp(x, np.log(at), gain))


def standing(out):
    """What a base-emitter resistor draws at all times, A."""
    return out["up"]["vbe"] / out["be"] if out["be"] else 0.0


def expected(b, progress=None):
    """All margins of a build: {(rule, part): ...}."""
    worst = Worst()
    for mains in b["mains"]:
        case = Case(b, mains)
        for rule in (voltages, rated_power, peaks, means, temperatures, bias, drive, protection, safe_areas, limiters):
            try:
                rule(case, worst)
            except Unreached as why:
                worst.setdefault(("unreached", rule.__name__), dict(stress=0.0, rating=None, used=0.0, why=str(why)))
    return worst


class Unreached(Exception):
    """The data end before the stress: no number is expected."""


def voltages(case, worst):
    b, s = case.b, case.b["supply"]
    v0 = case.off_load("high")
    for d in (b["out"]["up"], b["out"]["down"]):
        worst.below("voltage.device", d["name"], 2 * v0, d["vceo"], 0.9)
    worst.below("voltage.driver", b["drv"]["up"]["name"], 2 * v0, b["drv"]["up"]["vceo"], 0.9)
    worst.below("voltage.voltage-stage", "v1", 2 * v0, b["vas"]["vceo"], 0.9)
    worst.below("voltage.reservoir", "psu reservoir", v0, s["cap_volts"], 0.9)
    worst.below("voltage.rectifier-reverse", "psu rectifier", 2 * v0 if s["bridges"] == 1 else v0, s["vrrm"], 0.7)


def clip(case, ohms, cap):
    """Greatest clean amplitude at 1 kHz, all channels in phase: tried over every sample of the period."""
    rail = case.rail("volts", cap)
    t = TURN[TURN < np.pi]
    sine = np.append(np.sin(t), 1.0)

    def headroom(volts):
        amps = volts / ohms
        mean = case.drawn(amps)
        # The halves of a bridge draw on a rail in turn.
        trough = supply_.steady(rail, mean).trough - rail.esr * (case.share_channels / case.halves * amps - mean)
        return float(np.min(trough - volts * sine - stage_.drop_at(case.b["drop"], amps * sine)))

    high = case.burst("volts", ohms)
    low = high * 0.5
    while headroom(low) < 0:
        low *= 0.5
        if low < 0.01:
            raise Unreached("no clean amplitude")
    return brentq(headroom, low, high, xtol=1e-8, rtol=1e-9)


def rated_power(case, worst):
    for claim, ohms in case.b["rated"]:
        for cap in [min(case.cap_corners)]:
            volts = clip(case, case.half(ohms), cap)
            watts = (case.halves * volts) ** 2 / 2 / ohms
            worst.note("power.rated-power", "board rated", watts, claim * 10**-0.05, 100 * claim / watts)


def peaks(case, worst):
    out = case.b["out"]
    for load in case.b["loads"]:
        least = case.least_modulus(load)
        volts = case.burst("high", least)
        amps = volts / least
        share = stage_.share_one(amps / case.pairs, case.stage)
        for d in (out["up"], out["down"]):
            worst.below("current.device-peak", d["name"], amps / case.pairs * share, d["ic"], 0.8)
        if case.pairs > 1:
            worst.note("current.device-share", "n1", share, 1.5, 100 * share / 1.25)


def means(case, worst):
    b, s = case.b, case.b["supply"]
    for load in b["loads"]:
        for cap in case.cap_corners:
            volts, amps, state = case.at_duty(load, cap)
            # The bridge's rating is its output current; a diode has half, less a fifth for a capacitor load.
            worst.below("current.rectifier-mean", "psu rectifier", state.load / 2, 0.8 * s["bridge_amps"] / 2, 0.8)
            ripple = math.hypot(state.ripple, music(case, amps)) / s["cap_n"]
            worst.below("current.reservoir-ripple", "psu reservoir", ripple, s["ripple"], 0.9)
            worst.below("current.transformer-duty", "t1", 2 * s["vs"] * state.rms, s["va"], 0.8)
            core = case.hottest + 5.0 * (ripple / s["ripple"]) ** 2
            # Makers' life figures stop at 40 degC.
            hours = s["life"] * 2 ** ((s["life_at"] - max(core, 40.0)) / 10)
            worst.note("thermal.reservoir-life", "psu reservoir", hours, 2000.0, 100 * 10_000 / hours)
        peak = case.duty_amplitude(load) / case.resistance(load) / case.pairs
        # The hogging device's own resistor at either end of its tolerance, and as marked.
        for off in (-b["out"]["re_low"], 0.0, b["out"]["re_tol"][0]):
            corner = dict(case.stage, re_low=-off)
            signal = float(np.mean(np.maximum(peak * stage_.share_one(peak / math.pi, corner) * np.sin(TURN), 0) ** 2))
            rest = (case.idle * stage_.share_one(case.idle, corner)) ** 2
            worst.below("current.emitter-mean", "out emitter", (signal + rest) * case.re * (1 + off), b["out"]["re_watts"], 0.5)
    hot = 1 - 0.005 * (case.hottest - 25)
    for claim, ohms in b["rated"]:
        half = case.half(ohms)
        amps = math.sqrt(2 * claim / case.halves / half)
        n = case.share_channels
        waves = np.maximum(np.sin(TURN), 0) if case.halves == 1 else np.abs(np.sin(TURN)) / 2
        rail_rms = math.hypot(n * amps * math.sqrt(float(np.mean(waves**2))), n * case.pairs * case.idle)
        worst.below("current.fuse-rms", "psu fuse rail", rail_rms, s["rail_fuse"] * hot, 0.8)
        for cap in case.cap_corners:
            state = supply_.steady(case.rail("volts", cap), case.drawn(amps))
            line = 2 * state.rms * s["vs"] * (1 + s["rho"]) / case.mains["tap"]
            worst.below("current.fuse-rms", "psu fuse mains", line, s["fuse"] * hot, 0.8)


def music(case, amps):
    """Rms of the signal's own ripple into the reservoir of one rail, sampled about its mean."""
    wave = np.maximum(np.sin(TURN), 0) if case.halves == 1 else np.abs(np.sin(TURN)) / 2
    return case.share_channels * amps * float(np.std(wave))


def temperatures(case, worst):
    b, out, drv = case.b, case.b["out"], case.b["drv"]
    for h in case.hot:
        worst.note("thermal.sink", "fins", h["sink"], 100.0, case.ambient_used(h["sink"], 80.0))
        for d in (out["up"], out["down"]):
            tj = h["case"] + h["watts"] * d["jc"]
            worst.note("thermal.junction", d["name"], tj, d["tj"], case.ambient_used(tj, d["tj"] - 25))
        d = drv["up"]
        tj = case.driver_case(h) + h["driver"] * d["jc"]
        if not math.isnan(tj):
            worst.note("thermal.driver", "d1", tj, d["tj"], case.ambient_used(tj, d["tj"] - 25))
    junction_peaks(case, worst)


def junction_peaks(case, worst):
    b, out = case.b, case.b["out"]
    low = b["band"][0]
    rail = case.unsagged("volts")
    for load in b["loads"]:
        for z in case.sides(load):
            at = complex(z(np.array([low]))[0])
            size, phi = abs(at), math.atan2(at.imag, at.real)
            volts = stage_.burst(rail, b["drop"], size)
            i = volts / size * np.sin(TURN)
            v = volts * np.sin(TURN + phi)
            each = np.maximum(i, 0) / case.pairs
            mean = float(np.mean(each))
            hog = stage_.share_one(mean, case.stage)
            power = np.maximum((rail - v - each * case.re) * each, 0) * hog
            rest = rail * case.idle * stage_.share_one(case.idle, case.stage)
            for d in (out["up"], out["down"]):
                # The idle current is added whole, as it is to the mean heat.
                rise = heat.foster_peak(d["foster"], power, 1 / low) + rest * sum(r for r, _ in d["foster"])
                tj = case.hottest_case(load["name"]) + rise
                worst.note("thermal.junction-peak", d["name"], tj, d["tj"], case.ambient_used(tj, d["tj"]), rise=rise)


def idle_sink(case):
    """Sink, watts of the device that hogs, its share: idle at high mains, hottest room."""
    drv = case.b["drv"]
    found = []
    share = stage_.share_one(case.idle, case.stage)
    for cap in sorted({cap for cap, _ in case.heat_corners}):
        rail = supply_.steady(case.rail("high", cap), case.drawn(0.0)).mean
        on_sink = 0.0 if drv["own"] else 2 * case.driver_heat(rail, 0.0, 8.0)
        found.append((case.sink(2 * rail * case.pairs * case.idle + on_sink), rail * case.idle * share, share))
    return max(found)


def bias(case, worst):
    out = case.b["out"]
    rail = case.unsagged("high")
    sink, watts, share = idle_sink(case)
    rise = sink - case.hottest
    s = case.b["sink"]
    rsa = s["rsa"] * (rise / s["at"]) ** -0.25
    kappa = 1.0 if out["sensor"] in ("sink", "device") else 0.0
    many = 2 * case.pairs * case.b["per_sink"]
    for d in (out["up"], out["down"]):
        theta = d["jc"] + out["cs"] + (1 - kappa) * rsa * many
        gain = rail * 2.1e-3 * theta / (stage_.VT / case.idle + case.re * (1 - out["re_low"]))
        worst.note("bias.stability", d["name"], gain, 1.0, 100 * gain / 0.7)
    tc = case.case_temperature(sink, watts)
    for d in (out["up"], out["down"]):
        limit = float(safe_area.allowed(d, tc, np.array([rail]))[0])
        if not math.isnan(limit):
            worst.below("soa.idle", d["name"], case.idle * share, limit, 0.8)


def drive(case, worst):
    b, drv, vas = case.b, case.b["drv"], case.b["vas"]
    for load in b["loads"]:
        least = case.least_modulus(load)
        amps = case.burst("high", least) / least
        worst.below("drive.driver-current", "d1", float(case.driver_current(amps)), drv["up"]["ic"], 0.8)
        amps = case.burst("volts", least) / least
        carried = float(case.driver_current(amps))
        base = carried / float(gain_at(drv["up"]["hfe"], carried))
        worst.below("drive.output-gain-droop", "vas output-current", base, vas["current"] - standing(drv), 0.8)
        need = 2 * math.pi * b["band"][1] * case.burst("volts", case.resistance(load))
        has = min(vas["tail"], vas["current"]) / vas["comp"]
        worst.note("drive.slew", "vas tail", has / need, 1.0, 100 * 1.2 * need / has)
    n = b["net"]
    top = case.unsagged("volts") - float(stage_.drop_at(b["drop"], 0.0))
    x = 1 / (2 * math.pi * b["band"][1] * n["c"])
    watts = top**2 / 2 * n["r"] / (n["r"] ** 2 + x**2)
    worst.below("protection.zobel", "net zobel", watts, n["watts"], 0.6)


def protection(case, worst):
    b, g, s = case.b, case.b["guard"], case.b["supply"]
    tau = g["r"] * g["c"]
    rail = case.unsagged("volts")
    got = solve_ivp(lambda _t, y: [(rail - y[0]) / tau], (0, tau * 3), [0.0], events=_reach(g["vth"]), rtol=1e-12, atol=1e-13, max_step=tau / 200)
    rest = float(got.t_events[0][0])
    worst.note("protection.dc-fault-time", "guard detector", rest + g["release"], 0.2, 100 * (rest + g["release"]) / 0.05)
    top = case.unsagged("high") - float(stage_.drop_at(b["drop"], 0.0))
    hertz = brentq(lambda f: detector_swing(top, f, tau) - g["vth"], 0.02 / tau, 20 * top / g["vth"] / tau, xtol=1e-12, rtol=1e-12)
    worst.note("protection.dc-fault-false-trip", "guard detector", hertz, 2 * b["band"][0], 100 * hertz / b["band"][0])
    bleed_down(case, worst)
    worst.note("supply.core-flux", "t1", case.mains["high"] / case.mains["tap"] * 50 / case.mains["hertz"], 1.12, 100 * case.mains["high"] / case.mains["tap"] * 50 / case.mains["hertz"] / 1.1)


def _reach(volts):
    event = lambda _t, y: y[0] - volts
    event.terminal = True
    return event


def detector_swing(volts, hertz, tau):
    """Peak of a filtered sine, marched from rest until it repeats."""
    per, w = 4000, 2 * math.pi * hertz
    h = 1 / (hertz * per)
    t = np.arange(per + 1) * h
    x = volts * np.sin(w * t)
    a = math.exp(-h / tau)
    # Held as a straight line between samples: the exact step of a first-order lag.
    slope = 1 - (1 - a) * tau / h
    push = (1 - a - slope) * x[:-1] + slope * x[1:]
    from scipy.signal import lfilter

    y = lfilter([1.0], [1.0, -a], push)
    y = y + y[-1] / (1 - a**per) * a ** np.arange(1, per + 1)
    k = int(np.argmax(y))
    lo, mid, hi = y[k - 1], y[k], y[(k + 1) % per]
    return float(mid - (hi - lo) ** 2 / 8 / (hi - 2 * mid + lo))


def bleed_down(case, worst):
    s = case.b["supply"]
    up, _ = s["bleed_tol"]
    ohms = s["bleed"] * (1 + up)
    if s["bleed_per"] == "rail":
        ohms *= 2
    cap_up = case.cap_corners[-1]
    farads = s["cap_n"] * s["cap"] * cap_up / 2
    v = 2 * case.off_load("high")
    if v <= 60:
        seconds = 0.0
    else:
        tau = ohms * farads
        down = lambda _t, y: [-y[0] / tau]
        got = solve_ivp(down, (0, 10 * tau), [v], events=_reach(60.0), rtol=1e-12, atol=1e-12)
        seconds = float(got.t_events[0][0])
    worst.note("protection.bleed-down", "psu bleeder", seconds, 300.0, 100 * seconds / 60)


def safe_areas(case, worst):
    b, out = case.b, case.b["out"]
    rail = case.unsagged("volts")
    sides = [out["up"], out["down"]] if out["down"].get("separate") else [out["up"]]
    for load in b["loads"]:
        tc = case.hottest_case(load["name"])
        least = case.least_modulus(load)
        for d in sides:
            flat = lambda f: least + 0j * f
            note_soa(worst, "soa.resistive", d, out, soa_used(case, d, flat, rail, tc, [], True), load)
        for z in case.sides(load):
            for d in sides:
                found = soa_used(case, d, z, rail, tc, loads_.knots(load), loads_.flat(load))
                note_soa(worst, "soa.reactive", d, out, found, load, past_end(lambda f, t: locus(case, z, rail, f, 1.0, t)[:2], d, case))
            driver_soa(case, load, z, rail, worst)


def note_soa(worst, rule, d, out, found, load, past=False):
    """One side's use of the safe area; both sides' where they have one curve."""
    used, where = found
    for name in [d["name"]] if out["down"].get("separate") else ["n1", "p1"]:
        worst.note(rule, name, used, 1.0, 100 * used / 0.8, load=load["name"], where=where)
        worst.past |= {(rule, name)} if past else set()


def past_end(path, device, case):
    """Whether more than 1 % of a locus' peak current flows above the last point of the curve."""
    f, t = np.meshgrid(np.geomspace(*case.b["band"], 101), np.linspace(0.001, 2 * np.pi, 361), indexing="ij")
    v, i = path(f, t)
    return bool(np.any((v > device["soa"][-1][1]) & (i > 0.01 * i.max(axis=1, keepdims=True))))


def locus(case, z, rail, f, level, angle):
    """(v_CE, worst-share device amps) for arrays of frequency, fraction of V(burst), angle of current.

    On large arrays, which only tell where to look closer, the share is taken from samples.
    """
    at = z(f)
    size, phi = np.abs(at), np.angle(at)
    volts = stage_.burst_array(rail, case.b["drop"], size) * level
    each = volts / size * np.sin(angle) / case.pairs
    out = case.b["out"]
    least = np.maximum(each, 1e-9)
    if each.size > 5000:
        at = np.geomspace(1e-9, max(float(each.max()), 1e-8), 400)
        shares = np.interp(np.log(least), np.log(at), stage_.share(at, case.pairs, out["spread"], case.re, out["re_low"]))
    else:
        shares = stage_.share(least, case.pairs, out["spread"], case.re, out["re_low"])
    hog = each * shares
    return rail - volts * np.sin(angle + phi) - each * case.re, hog, each * case.pairs


def search(function, band, knots=(), flat=False, turn=np.pi):
    """Greatest value over frequency, amplitude and angle: a dense grid, then zoom on the best cells.

    A load that is the same at every frequency (`flat`) is searched at one.
    """
    middle = math.sqrt(band[0] * band[1])
    f = np.array([middle]) if flat else np.unique(np.concatenate([np.geomspace(*band, 91), [k for k in knots if band[0] <= k <= band[1]]]))
    a = np.array([0.3, 0.6, 0.8, 0.93, 1.0])
    t = np.linspace(0.01, turn - 0.01, 91 if turn < 4 else 181)
    grid = np.meshgrid(f, a, t, indexing="ij")
    got = function(*grid)
    got = np.where(np.isnan(got), -np.inf, got)
    boxes = []
    left = got.copy()
    for _ in range(3):
        # The best cell that is not beside one already taken.
        k, j, m = np.unravel_index(int(np.argmax(left)), left.shape)
        if flat:
            span, lower, upper = 0.0, middle, middle
        else:
            span = max(f[min(k + 1, len(f) - 1)] - f[k], f[k] - f[max(k - 1, 0)])
            lower, upper = band
        boxes.append(((f[k], a[j], t[m]), (span, 0.15, 0.06), (lower, 0.02, 1e-4), (upper, 1.0, turn - 1e-4)))
        left[max(k - 3, 0) : k + 4, :, max(m - 3, 0) : m + 4] = -np.inf
    return safe_area.zoom(function, boxes, points=(1 if flat else 7, 5, 9), rounds=11, shrink=0.45)


def soa_used(case, device, z, rail, tc, knots, flat):
    def function(f, level, angle):
        v, i, _ = locus(case, z, rail, f, level, angle)
        return i / safe_area.allowed(device, tc, v)

    return search(function, case.b["band"], knots, flat)


def driver_soa(case, load, z, rail, worst):
    d = case.b["drv"]["up"]
    tc = case.hottest_driver(load["name"])
    if not math.isfinite(tc):
        return

    def path(f, level, angle):
        at = z(f)
        volts = stage_.burst_array(rail, case.b["drop"], np.abs(at)) * level
        bank = np.maximum(volts / np.abs(at) * np.sin(angle), 0)
        v = rail - volts * np.sin(angle + np.angle(at)) - case.b["out"]["up"]["vbe"]
        return v, case.driver_current(bank)

    def function(f, level, angle):
        v, i = path(f, level, angle)
        return i / safe_area.allowed(d, tc, v)

    used, where = search(function, case.b["band"], loads_.knots(load), loads_.flat(load), 2 * np.pi)
    worst.note("drive.driver-soa", "d1", used, 1.0, 100 * used / 0.8, load=load["name"], where=where)
    if past_end(lambda f, t: path(f, 1.0, t), d, case):
        worst.past.add(("drive.driver-soa", "d1"))


def limit_line(g, pairs, volts):
    """Amps of the line: of the bank, or of one device; straight between points, flat beyond the last."""
    a, v = np.array(g["line"], float).T
    return np.interp(volts, v, a)


def limiters(case, worst):
    b, g, out = case.b, case.b["guard"], case.b["out"]
    if g["network"]:
        return
    high, rail = case.unsagged("high"), case.unsagged("volts")
    # The line acts on the bank, or on one device and that the least loaded; the most loaded is judged.
    def most_loaded(v):
        line = limit_line(g, case.pairs, v)
        if not g["bank"]:
            return stage_.beside(line, case.pairs, out["spread"], case.re, out["re_low"])
        each = line / case.pairs
        return each * stage_.share(np.maximum(each, 1e-9), case.pairs, out["spread"], case.re, out["re_low"])

    v = np.linspace(0.05, 2 * high, 4001)
    for d in (out["up"], out["down"]):
        function = lambda v, d=d: most_loaded(v) / safe_area.allowed(d, case.hottest_case(), v)
        use = np.nan_to_num(function(v))
        peaks = [v[k] for k in range(1, len(v) - 1) if use[k] >= max(use[k - 1], use[k + 1])]
        peaks = sorted(peaks, key=lambda x: -float(function(np.array([x]))[0]))[:6]
        fine = max((float(np.nanmax(function(np.linspace(x - 0.08, min(x + 0.08, 2 * high), 8001)))) for x in peaks), default=0.0)
        use = max(fine, float(use.max()))
        worst.below("soa.limiter-soa", d["name"], use, 1.0, 1.0)
    for load in b["loads"]:
        for z in case.sides(load):
            def function(f, level, angle):
                vce, hog, bank = locus(case, z, rail, f, level, angle)
                allowed = limit_line(g, case.pairs, vce)
                return (bank if g["bank"] else hog) / allowed

            used, where = search(function, b["band"], loads_.knots(load), loads_.flat(load))
            worst.note("soa.limiter-music", "guard limit-line", 1 / used, 1.0, 100 * 1.1 * used, load=load["name"], where=where)


def bottom_of_band(builds):
    """power.low-frequency-sag of many builds at once: {build index: {(rule, part): ...}}."""
    rows = []
    for k, b in enumerate(builds):
        for mains in b["mains"]:
            case = Case(b, mains)
            for claim, ohms in b["rated"]:
                half = case.half(ohms)
                rows.append((k, case, claim, ohms, half, case.rail("volts", min(case.cap_corners))))
    if not rows:
        return {}
    together = [math.gcd(int(c.b["band"][0]), int(2 * c.mains["hertz"])) for _, c, *_ in rows]
    judge = max(int(c.b["band"][0]) // g for (_, c, *_), g in zip(rows, together))
    volts = supply_.sag_batch(
        rails=[r[5] for r in rows],
        idles=[r[1].share_channels * r[1].pairs * r[1].idle for r in rows],
        channels=[r[1].share_channels for r in rows],
        ohms=[r[4] for r in rows],
        need=[lambda v, r=r: v + stage_.drop_at(r[1].b["drop"], v / r[4]) for r in rows],
        bottom=[r[1].b["band"][0] for r in rows],
        judge=judge,
        bridged=[r[1].halves == 2 for r in rows],
    )
    found = {}
    for (k, case, claim, ohms, _half, _rail), v in zip(rows, volts):
        watts = (case.halves * v) ** 2 / 2 / ohms
        found.setdefault(k, Worst()).note("power.low-frequency-sag", "board rated", watts, claim * 10**-0.1, 100 * claim * 10**-0.05 / watts)
    return found


def switching_on(builds):
    """What happens at switch-on, of many builds at once, at every corner: {build index: {...}}."""
    rows, starts = [], []
    for k, b in enumerate(builds):
        s = b["supply"]
        for mains in b["mains"]:
            case = Case(b, mains)
            turns = s["vs"] * (1 + s["rho"]) / mains["tap"]
            for level in ("low", "volts", "high"):
                for cap in (min(case.cap_corners), max(case.cap_corners)):
                    for idle in (0.0, case.share_channels * case.pairs * case.idle):
                        rows.append((k, case, level, idle > 0, turns))
                        starts.append(supply_.Start(case.rail(level, cap), 2 * s["soft"] * turns**2, s["bypass"], idle, s["bypass"] + 0.6))
    found = {}
    for crest in (True, False):
        got = supply_.switch_on(starts, crest)
        for j, (k, case, level, drawn, turns) in enumerate(rows):
            s, w = case.b["supply"], found.setdefault(k, Worst())
            one = {name: float(x[j]) for name, x in got.items()}
            if drawn:
                unsagged = case.unsagged(level)
                full = one["volts"] / unsagged * 100
                w.note("supply.soft-start-timing", "psu soft-start", full, 40.0, 100 * 80 / max(full, 1e-9), level=level)
            if level == "high":
                filling = s["soft"] * (2 * turns) ** 2 * one["before"]
                joules = max(filling, s["soft"] * saturated_core(case, s["soft"]))
                w.note("supply.inrush-resistor-energy", "psu soft-start", joules, 250.0 * 10 / 10, 100 * joules / (0.8 * 250))
                limit = s["surge"] ** 2 * 8.3e-3 / 2
                peak = max(one["early"], one["late"]) / s["surge"]
                # Of one diode: every second pulse, at most a surge's first half-cycle and half of the rest.
                filled = one["first"] + one["before"]
                after = one["again"] + one["square"] - one["before"]
                # Idle current is no part of the first surge; of the second it is the reason.
                each = (after if drawn else max(filled, after)) / 2 / limit
                w.below("current.rectifier-surge", "psu rectifier", 100 * max(peak, each), 100.0, 0.8)
    return found


def saturated_core(case, ohms):
    """A2s of half a cycle of a saturated core behind a resistor, at high mains."""
    s, m = case.b["supply"], case.mains
    copper = s["rho"] * m["tap"] ** 2 / s["va"] / 2
    peak = m["high"] * math.sqrt(2) / (copper + m["loop"] + ohms)
    return float(np.mean((peak * np.sin(TURN)) ** 2)) / 2 / m["hertz"]
