"""Designs with isolated feedback for the reference: our own scenarios, parts in preferred values."""

from controlled import Control
from controlled_designs import design
from isolated import Isolated
from stages import Branch, Filter, Stage


def flyback(output_filter=None, **more):
    return Stage("flyback", 130e3, 120e-6, 0.09, 0.06, "diode", [Branch(470e-6, 0.018, 0.0, 2)], "resistor", drop=0.5, diode=0.015,
                 ratio=0.3, output_filter=output_filter, **more)


EVENTS = {"load_step": (0.5, 1e6), "line_step": (4.0, 1e5), "reference_step": (0.1, 1e4), "band": 0.002}

DESIGNS = [
    design(
        "peak-current flyback, type II, LED fed from the output, no second stage",
        flyback(), (36.0, 48.0, 60.0), 12.0, (1.5, 2.5, 3.5), Control("peak-current", 0.25, 50e3, 150e-9, divider=1.0 / 3.0, offset=0.6),
        Isolated(2, "load", 2.495, 38.3e3, 10e3, 10e-9, 3.9e3, 10e3, 0.9, c2=2.2e-9, own=1.8e-9, gain=700.0, limit=700e3),
        delay=70e-9, **EVENTS),
    design(
        "peak-current flyback, type II with series resistor, LED fed from the bank, second stage",
        flyback(Filter(1.5e-6, 5e-3, 220e-6, 0.025)), (36.0, 48.0, 60.0), 12.0, (1.5, 2.5, 3.5),
        Control("peak-current", 0.25, 50e3, 150e-9, divider=1.0 / 3.0, offset=0.6),
        Isolated(2, "bank", 2.495, 38.3e3, 10e3, 4.7e-9, 4.7e3, 10e3, 0.9, r2=22e3, c2=2.2e-9, own=1.8e-9, gain=700.0, limit=700e3),
        delay=70e-9, **EVENTS),
    design(
        "peak-current flyback, type II, LED fed from the load, second stage",
        flyback(Filter(0.47e-6, 5e-3, 150e-6, 0.03)), (36.0, 48.0, 60.0), 12.0, (1.5, 2.5, 3.5),
        Control("peak-current", 0.25, 50e3, divider=1.0 / 3.0, offset=0.6),
        Isolated(2, "load", 2.495, 38.3e3, 10e3, 15e-9, 4.7e3, 10e3, 0.9, c2=2.7e-9, own=1.8e-9),
        delay=70e-9, **EVENTS),
    design(
        "voltage-mode forward, type III, LED fed from a fixed supply",
        Stage("forward", 140e3, 22e-6, 0.01, 0.08, "diode", [Branch(330e-6, 0.015, 0.0, 2)], "resistor", drop=0.45, diode=0.01,
              ratio=0.4, magnetising=400e-6, leakage=1e-6),
        (36.0, 48.0, 60.0), 5.0, (3.0, 6.0, 10.0), Control("voltage", ramp=2.0),
        Isolated(3, "none", 1.24, 10e3, 3300.0, 15e-9, 1e3, 4700.0, 1.0, r2=12e3, c2=1e-9, r3=100.0, c3=22e-9, own=330e-12, fixed=9.0,
                 gain=1500.0, limit=2e6),
        delay=150e-9, load_step=(2.0, 1e6), line_step=(4.0, 1e5), reference_step=(0.1, 1e4), band=0.002),
    design(
        "discontinuous voltage-mode flyback, type III, LED fed from the output",
        Stage("flyback", 100e3, 18e-6, 0.05, 0.08, "diode", [Branch(470e-6, 0.025)], "resistor", drop=0.45, diode=0.02, ratio=0.4),
        (36.0, 48.0, 60.0), 12.0, (0.3, 0.8, 1.2), Control("voltage", ramp=2.5),
        Isolated(3, "load", 2.495, 38.3e3, 10e3, 22e-9, 3.3e3, 10e3, 0.8, c2=3.3e-9, r3=3.3e3, c3=10e-9, own=2.2e-9),
        delay=100e-9, load_step=(0.2, 1e6), line_step=(4.0, 1e5), reference_step=(0.1, 1e4), band=0.002),
]
