"""Responses of type I, II and III compensators, both amplifiers and isolated feedback, from their node equations.

    python compensator.py OUTPUT.json

Responses: -vc/vout with the inversion taken out, once with an ideal amplifier and once with its limits, and vc/vref with the
limits, at 25 frequencies from 1 Hz to 10 MHz.  Parts are our own choice, spread over decades, among them networks whose limits show (a gain of 200, a gain-bandwidth
product of 300 kHz, an output resistance of 50 kohm, a regulator's gain of 60).  Isolated feedback: its fast path sees the output.
"""

import sys
from dataclasses import replace

import numpy as np

from amplifiers import Network
from isolated import Isolated
from output import write

# upper, lower, c1, r2, c2, r3, c3
PARTS = [
    (10e3, 3.24e3, 3.3e-9, 11e3, 68e-12, 330.0, 2.2e-9),
    (47e3, 2.58e3, 150e-9, 5.1e3, 680e-12, 3.3e3, 10e-9),
    (220e3, 180e3, 470e-12, 330e3, 4.7e-12, 12e3, 47e-12),
    (1e3, 9.1e3, 1e-6, 150.0, 22e-9, 27.0, 330e-9),
]
# amplifier gain (A0 or gm), limit (GBW or output resistance)
OP_AMPS = [(1e4, 10e6), (200.0, 300e3)]
TRANSCONDUCTANCES = [(1.2e-3, 2e6), (60e-6, 50e3)]


# LED resistor, pull-up, ratio, bias resistor, LED's resistance, capacitance at the collector, regulator's gain and gain-bandwidth product
OPTOCOUPLERS = [
    (820.0, 4.7e3, 0.9, 1e3, 20.0, 2.2e-9, 700.0, 1e6),
    (2.2e3, 15e3, 0.35, 2.2e3, 65.0, 470e-12, 60.0, 120e3),
]


def isolated_networks():
    """Every type, with and without a fast path, R2 beside it or not; 30 V feed the LED, enough for all of them."""
    for upper, lower, c1, r2, c2, r3, c3 in PARTS[:2]:
        for led, pull_up, ratio, bias, dynamic, own, gain, limit in OPTOCOUPLERS:
            for kind, fast, with_r2 in [(1, "none", False), (2, "load", False), (2, "load", True), (2, "none", True),
                                        (3, "load", False), (3, "load", True), (3, "none", True)]:
                yield Isolated(kind, fast, 1.24, upper, lower, c1, led, pull_up, ratio, r2 if with_r2 else 0.0,
                               c2 if kind > 1 else 0.0, r3 if kind == 3 else 0.0, c3 if kind == 3 else 0.0, bias, dynamic, own,
                               gain, limit, fixed=30.0 if fast == "none" else 0.0)


def networks():
    for upper, lower, c1, r2, c2, r3, c3 in PARTS:
        for name, amplifiers in [("op-amp", OP_AMPS), ("transconductance", TRANSCONDUCTANCES)]:
            for gain, limit in amplifiers:
                for kind in (1, 2, 3):
                    yield Network(kind, name, 1.2, upper, lower, c1, r2 if kind > 1 else 0.0, c2 if kind > 1 else 0.0,
                                  r3 if kind == 3 else 0.0, c3 if kind == 3 else 0.0, 0.0, gain, limit)
                # The capacitor straight across the upper resistor, of types I and II.
                for kind in (1, 2):
                    yield Network(kind, name, 1.2, upper, lower, c1, r2 if kind > 1 else 0.0, c2 if kind > 1 else 0.0,
                                  cff=c3 / 3.0, gain=gain, limit=limit)


def entries(network):
    """(choices, values) by entry path."""
    choices = {"compensator.type": str(network.kind), "compensator.amplifier": network.amplifier}
    if network.kind != 3:
        choices["compensator.feedforward-capacitor"] = "fitted" if network.cff else "none"
    values = {
        "compensator.reference": network.reference,
        "compensator.divider.upper": network.upper,
        "compensator.divider.lower": network.lower,
    }
    for name in ("c1", "r2", "c2", "r3", "c3", "cff"):
        if getattr(network, name):
            values[f"compensator.{name}"] = getattr(network, name)
    if network.amplifier == "op-amp":
        values["compensator.op-amp.dc-gain"] = network.gain
        values["compensator.op-amp.gain-bandwidth"] = network.limit
    else:
        values["compensator.transconductance.gm"] = network.gain
        values["compensator.transconductance.output-resistance"] = network.limit
    return choices, values


def main():
    frequencies = np.geomspace(1.0, 1e7, 25)
    s = 2j * np.pi * frequencies
    rows = []
    for network in [*networks(), *isolated_networks()]:
        if isinstance(network, Isolated):
            choices, values = network.entries()
            slow, fast, from_reference = network.at(s)
            limited, ideal = slow + fast, network.ideal(s)
        else:
            choices, values = entries(network)
            limited, from_reference = network.at(s)
            ideal = replace(network, ideal=True).at(s)[0]
        rows.append({
            "choices": choices,
            "values": values,
            "ideal": [[float(h.real), float(h.imag)] for h in ideal],
            "limited": [[float(h.real), float(h.imag)] for h in limited],
            "from_reference": [[float(h.real), float(h.imag)] for h in from_reference],
        })
    write({"about": "made by tests/reference/compensator.py; complex values as [real, imaginary]",
           "frequencies_hz": frequencies.tolist(), "networks": rows}, sys.argv[1])


if __name__ == "__main__":
    main()
