"""Published examples in discontinuous conduction, current mode and behind input filters, recomputed from the hand-written equations.

    python textbook_modes.py OUTPUT.json

Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed.: 9.5.4 with 15.4.2 (buck at 25 ohm), 15.3.1 (boost plant), 18.4 to 18.6
(current-programmed buck), 17.3 to 17.4 (input filter).  Ridley 1991 for the sampled current loop.
"""

import sys

import control
import numpy as np
from scipy.optimize import brentq

from amplifiers import Network
from conduction import conduct
from controlled import Control, ControlledLoop
from controlled_designs import design
from orbit import Orbit
from output import write
from stages import Branch, Filter, Stage

TAU = 2.0 * np.pi


def close(value, want, relative):
    assert abs(value / want - 1.0) <= relative, (value, want)


def buck(rectifier, input_filter=None):
    return Stage("buck", 100e3, 50e-6, 0.0, 0.0, rectifier, [Branch(500e-6, 0.0)], "resistor", input_filter=input_filter)


def printed_compensator():
    """Gain 3.7 behind a sensor of 1/3, zero 1.7 kHz, pole 14.5 kHz, inverted zero 500 Hz, over a ramp of 4 V."""
    s = control.tf("s")
    return 3.7 / 3.0 * (1.0 + s / (TAU * 1.7e3)) / (1.0 + s / (TAU * 14.5e3)) * (1.0 + TAU * 500.0 / s) / 4.0


def loop_of(model):
    """The loop of the buck as (function of frequency, closed-loop poles)."""
    compensator = printed_compensator()
    plant = control.ss(model.a, model.f[:, None], model.output.x[None], [[model.output.d]])
    closed = control.feedback(plant * control.ss(compensator), 1)
    return lambda f: model.at(2j * np.pi * f)[:, 2] * compensator(2j * np.pi * f), closed.poles()


def crossovers(loop, low, high):
    f = np.geomspace(low, high, 20001)
    gain = np.log(np.abs(loop(f)))
    found = []
    for k in np.nonzero(gain[:-1] * gain[1:] < 0.0)[0]:
        root = brentq(lambda x: np.log(abs(loop(np.array([x]))[0])), f[k], f[k + 1], xtol=1e-12, rtol=1e-14)
        found.append({"frequency_hz": root, "phase_margin_deg": float(np.angle(-loop(np.array([root]))[0], deg=True)),
                      "falling": bool(gain[k] > 0.0)})
    return found


def light_load_buck():
    """15.4.2: the buck of 9.5.4 at 25 ohm; printed 390 Hz, 55 degrees, line 0.02."""
    model = conduct(buck("diode"), 28.0, 15.0, 15.0 / 25.0)
    assert model.conduction == "discontinuous"
    loop, poles = loop_of(model)
    [crossing] = crossovers(loop, 1.0, 50e3)
    line = abs(model.at(2j * np.pi * 100.0)[0, 0] / (1.0 + loop(np.array([100.0]))[0]))
    assert np.all(poles.real < 0.0)
    # The exact switched stage under the same compensator; the network only fills the place of one.
    network = Network(2, "op-amp", 5.0, 96e3, 48e3, 1e-9, 1e5, 1e-11, gain=1e4, limit=1e7)
    switched = Orbit(ControlledLoop(design("", buck("diode"), (28.0,) * 3, 15.0, (0.6,) * 3, Control("voltage", ramp=4.0), network),
                                    28.0, 0.6))
    compensator = printed_compensator()

    def exact(f):
        return switched.plant(f) * 4.0 * compensator(2j * np.pi * f)

    root = brentq(lambda f: np.log(abs(exact(np.array([f]))[0])), 300.0, 500.0, xtol=1e-9)
    close(crossing["frequency_hz"], 392.0, 5e-4)
    assert abs(crossing["phase_margin_deg"] - 55.08) < 0.05
    close(line, 0.01913, 3e-4)
    return {
        "duty": float(model.duty), "second_duty": float(model.second), **crossing, "line_at_100_hz": float(line),
        "switched_frequency_hz": root,
        "switched_phase_margin_deg": float(np.angle(-exact(np.array([root]))[0], deg=True)),
    }


def light_load_boost():
    """15.3.1: printed D 0.25, Gd0 72 V, 112.9 Hz, 63.7 kHz, RHP zero 127 kHz."""
    model = conduct(Stage("boost", 100e3, 5e-6, 0.0, 0.0, "diode", [Branch(470e-6, 0.0)], "resistor"), 24.0, 36.0, 3.0)
    high, low = np.sort(np.linalg.eigvals(model.a)) / -TAU
    system = control.ss(model.a, model.f[:, None], model.output.x[None], [[model.output.d]])
    zero = max(z.real for z in system.zeros() if abs(z) < 1e10) / TAU
    gain = abs(model.at(1e-3j)[0, 2])
    for value, want in [(model.duty, 0.25), (gain, 72.0), (low, 113.0), (high, 63.58e3), (zero, 127.3e3)]:
        close(value, want, 3e-4)
    return {"duty": float(model.duty), "gain_v": float(gain), "low_pole_hz": low, "high_pole_hz": high, "zero_hz": zero}


def programmed_buck():
    """18.4 to 18.6: 12 V, 35 uH, 100 uF, 10 ohm, 200 kHz, 1 ohm, artificial ramp 0.6 V per period, control voltage 1.4 V."""
    stage = Stage("buck", 200e3, 35e-6, 0.0, 0.0, "synchronous", [Branch(100e-6, 0.0)], "resistor")
    law = Control("peak-current", 1.0, 0.6 * 200e3)

    def loop(vout):
        network = Network(2, "op-amp", 1.0, vout - 1.0, 1.0, 1e-9, 1e5, 1e-11, gain=1e4, limit=1e7)
        return ControlledLoop(design("", stage, (12.0,) * 3, vout, (vout / 10.0,) * 3, law, network), 12.0, vout / 10.0)

    vout = brentq(lambda v: loop(v).law.value - 1.4, 6.0, 10.0, xtol=1e-13)
    found = loop(vout)
    ratio = law.slope / -found.model.off_slope
    gain = abs(found.responses(np.array([1e-3]))["plant"][0])
    poles = np.linalg.eigvals(found.controlled()[0])
    low = np.min(np.abs(poles)) / TAU
    pair = poles[np.argmax(poles.imag)]
    for value, want in [(found.model.duty, 0.673), (vout, 8.08), (vout / 10.0, 0.808), (ratio, 0.520), (gain, 7.98),
                        (low, 199.3), (found.fast_multiplier, -0.478)]:
        close(value, want, 2e-3)
    orbit = Orbit(found)
    exact = min(orbit.multipliers(), key=lambda z: abs(z - found.fast_multiplier))
    return {"duty": float(found.model.duty), "output_v": vout, "ramp_over_fall": float(ratio), "gain_ohm": float(gain),
            "low_pole_hz": float(low), "pair_hz": float(abs(pair) / TAU), "pair_quality": float(abs(pair) / (-2.0 * pair.real)),
            "fast_multiplier": float(found.fast_multiplier), "switched_fast_multiplier": float(exact.real)}


def sampled_loop():
    """Ridley 1991; 18.7: multipliers of a buck (10 to 5 V, 5 uH, 100 kHz) and a boost, by straight lines and by the exact map."""
    rows = []

    def add(topology, vin, vout, inductance, ratio, want):
        # A bank so stiff that the output does not move within a period.
        stage = Stage(topology, 100e3, inductance, 0.0, 0.0, "synchronous", [Branch(1.0, 0.0)], "resistor")
        fall = (vout if topology == "buck" else vout - vin) / inductance
        network = Network(2, "op-amp", 1.0, vout - 1.0, 1.0, 1e-9, 1e5, 1e-11, gain=1e4, limit=1e7)
        load = 20.0 if topology == "buck" else 10.0
        loop = ControlledLoop(design("", stage, (vin,) * 3, vout, (load,) * 3, Control("peak-current", 0.1, ratio * fall * 0.1),
                                     network), vin, load)
        exact = min(Orbit(loop).multipliers(), key=lambda z: abs(z - loop.fast_multiplier))
        assert abs(loop.fast_multiplier - want) < 6e-4, (loop.fast_multiplier, want)
        assert abs(exact - loop.fast_multiplier) < 1e-3
        rows.append({"topology": topology, "input_v": vin, "output_v": vout, "inductance": inductance, "ramp_over_fall": ratio,
                     "fast_multiplier": round(float(loop.fast_multiplier), 12), "switched_fast_multiplier": round(float(exact.real), 5)})

    for ratio, want in [(0.1, -0.818), (0.5, -0.333), (1.0, 0.0), (5.0, 0.667)]:
        add("buck", 10.0, 5.0, 5e-6, ratio, want)
    add("boost", 10.0, 25.0, 20e-6, 0.0, -1.5)
    add("boost", 10.0, 15.0, 20e-6, 0.0, -0.5)
    add("buck", 10.0, 6.0, 5e-6, 1.0 / 6.0, -1.0)
    return rows


def filter_cases():
    """17.3 to 17.4 before the buck of 9.5.4: four filters."""
    n = 2.52
    resistance = np.sqrt(330e-6 / 470e-6) * np.sqrt((2.0 + n) * (4.0 + 3.0 * n) / (2.0 * n**2 * (4.0 + n)))
    close(resistance, 0.666, 2e-3)
    # The damped filter alone, seen from the converter: printed 1 ohm at 269 Hz.
    w = TAU * np.linspace(150.0, 450.0, 30001)
    admittance = 1.0 / (1j * w * 330e-6) + 1j * w * 470e-6 + 1.0 / (0.666 + 1.0 / (1j * w * 1184e-6))
    peak = np.argmin(np.abs(admittance))
    close(1.0 / abs(admittance[peak]), 1.0, 2e-3)
    close(w[peak] / TAU, 269.0, 2e-3)
    rows = []
    for title, part in [
        ("330 uH, 470 uF, undamped", Filter(330e-6, 0.0, 470e-6)),
        ("330 uH, 470 uF, damped by 0.666 ohm and 1184 uF", Filter(330e-6, 0.0, 470e-6, damping=(0.666, 1184e-6))),
        ("31 uH, 47 uF, undamped", Filter(31e-6, 0.0, 47e-6)),
        ("31 uH, 47 uF, damped by 1.7 ohm and 29 uF", Filter(31e-6, 0.0, 47e-6, damping=(1.7, 29e-6))),
    ]:
        model = conduct(buck("synchronous", part), 28.0, 15.0, 5.0)
        loop, poles = loop_of(model)
        poles = poles[poles.imag >= 0.0]
        poles = poles[np.argsort(-poles.real)]
        rows.append({
            "title": title,
            "inductance": part.inductance, "capacitance": part.capacitance,
            "damping_resistance": part.damping[0] if part.damping else 0.0,
            "damping_capacitance": part.damping[1] if part.damping else 0.0,
            "crossovers": crossovers(loop, 10.0, 50e3),
            "stable": bool(np.all(poles.real < 0.0)),
            "growth_hz": float(poles[0].real / TAU),
            "poles": [[float(p.real), float(p.imag)] for p in poles],
        })
        print(title, [(round(c["frequency_hz"]), round(c["phase_margin_deg"], 2)) for c in rows[-1]["crossovers"]],
              "slowest pole", poles[0], "growth", poles[0].real / TAU, "Hz at", poles[0].imag / TAU)
    return rows


def main():
    write({
        "about": "made by tests/reference/textbook_modes.py",
        "light_load_buck": light_load_buck(),
        "light_load_boost": light_load_boost(),
        "programmed_buck": programmed_buck(),
        "sampled_loop": sampled_loop(),
        "filters": filter_cases(),
    }, sys.argv[1])


if __name__ == "__main__":
    main()
