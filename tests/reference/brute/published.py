"""This side against published and hand-calculated figures, so that it is itself proved."""

import math

import numpy as np

from . import heat, load, margins, stage, supply


def cases():
    """(what and who says so, here, published, relative tolerance)."""
    # One rail of a split supply: toroid 2 x 35 V 300 VA 6 %, 10 mF, 2 A; by two independent integrations.
    rail = supply.Rail(35 * math.sqrt(2) * 1.06, 0.9, 0.49, 0.01, 0.0, 50.0)
    state = supply.steady(rail, 2.0)
    for name, here, there in (
        ("mean", state.mean, 46.355), ("trough", state.trough, 45.623), ("ripple", state.crest - state.trough, 1.457),
        ("winding rms", state.rms, 4.104), ("peak", state.peak, 10.55), ("capacitor rms", state.ripple, 3.584),
        ("conduction", state.conduction_deg, 51.4),
    ):
        yield f"supply, constant current, {name}", here, there, 1e-3
    # Schade's model (Proc. IRE 31, 1943), ωCR = 20, Rs/R = 5 %.
    ohms, hertz = 100.0, 50.0
    rail = supply.Rail(100.0, 0.0, 5.0, 20 / (2 * math.pi * hertz * ohms), 0.0, hertz)
    mean, form, peak, ripple = supply.with_resistive_load(rail, ohms)
    yield "Schade, Vdc/Vpk", mean / 100, 0.8281, 2e-3
    yield "Schade, F", form, 1.788, 2e-3
    yield "Schade, Ipk/Idc", peak, 4.011, 2e-3
    yield "Schade, ripple", 100 * ripple / mean, 3.22, 2e-3
    # Empty reservoir through 0.49 + 0.03 ohm.
    start = supply.Start(supply.Rail(35 * math.sqrt(2) * 1.06, 0.9, 0.49, 0.01, 0.03, 50.0), 0.0, 0.0, 0.0, 0.4)
    crest, zero = supply.switch_on([start], True), supply.switch_on([start], False)
    yield "switch-on at crest, amps", float(crest["late"][0]), 99.2, 5e-3
    yield "switch-on at crest, A2s of the first half-cycle", float(crest["first"][0]), 17.7, 5e-3
    yield "switch-on at crest, A2s of all", float(crest["square"][0]), 20.9, 5e-3
    yield "switch-on at zero, amps", float(zero["late"][0]), 62.3, 5e-3
    yield "switch-on at zero, A2s of all", float(zero["square"][0]), 18.6, 5e-3
    # Boylestad & Nashelsky, Electronic Devices and Circuit Theory, example 12.7: 30 V, 20 V peak, 16 ohm;
    # Pi 23.88 W printed (23.873 by arithmetic), Po 12.5 W, so 5.69 W a device.
    yield "class B, 20 V into 16 ohm", stage.bank_heat(30.0, 20.0, 16.0, 0.0, 1, 0.0, 0.0), (23.873 - 12.5) / 2, 1e-4
    # 35 V, 4 ohm at 60 degrees, full swing: own derivation, closed form.
    yield "reactive mean", stage.bank_heat(35.0, 35.0, 4.0, math.radians(60), 1, 0.0, 0.0), 59.201, 1e-4
    t = np.linspace(0, np.pi, 200_001)
    p = (35 - 35 * np.sin(t + math.radians(60))) * 35 / 4 * np.sin(t)
    k = int(np.argmax(p))
    yield "reactive peak", float(p[k]), 275.34, 1e-4
    yield "reactive peak, volts", float(35 - 35 * np.sin(t[k] + math.radians(60))), 41.078, 1e-3
    # A published driver sheet: Re 6.18, fs 110.3, Qms 4.537, Qes 1.297, Le 0: extreme phase 39.51 degrees,
    # there 13.107 ohm (Small, JAES 20, 1972; the phase is an own derivation).
    z = load.voice_coil(87.49, 6.18, 0.0, 1.0, [(110.3, 4.537, 1.297)], 1.0)
    yield "loudspeaker, modulus", abs(z), 13.107, 1e-4
    yield "loudspeaker, phase", math.degrees(np.angle(z)), 39.51, 5e-4
    # Foster .3/.5/.72 K/W, 1/10/100 ms; 5 ms of every 20 ms: 0.71922 K/W (closed form, 400-cycle march).
    power = np.zeros(20_000)
    power[:5000] = 1.0
    rise = heat.foster_peak([(0.3, 1e-3), (0.5, 1e-2), (0.72, 0.1)], power, 0.02)
    yield "junction, pulses", rise, 0.71922, 2e-4
    # Two devices, 1 A and 5 A, VT of 75 degC scaled out of the sharing: 0R22, 20 mV.
    warm, stage.VT = stage.VT, 0.030001
    one = stage.share(np.array([0.5, 2.5]), 2, 0.02, 0.22, 0.0)
    stage.VT = warm
    yield "sharing, 1 A", float(one[0]) * 0.5, 0.53570, 2e-5
    yield "sharing, 5 A", float(one[1]) * 2.5, 2.54310, 2e-5
    # A maker's correction table, natural convection: 30 K against 75 K is 1.257 times the resistance.
    rise = heat.sink_rise(30.0 / 1.257, 1.0, 75.0)
    yield "heatsink at 30 K", rise, 30.0, 6e-4
    # RC detector, 100 k, 10 uF: 35 V at 20 Hz leaves 0.2785 V.
    yield "detector, 20 Hz", margins.detector_swing(35.0, 20.0, 1.0), 0.2785, 2e-4


def check():
    """Prints what does not hold; returns how many."""
    failed = 0
    for name, here, there, tolerance in cases():
        if not abs(here - there) <= tolerance * abs(there):
            print(f"published: {name}: here {here:.6g}, published {there:.6g}")
            failed += 1
    return failed
