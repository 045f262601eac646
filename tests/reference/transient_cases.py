"""Events for the switched closed loops in time: our own scenarios."""

import numpy as np

from amplifiers import Network
from controlled import Control
from controlled_designs import design, inner_op_amp, op2, ota2
from stages import Branch, Stage
from transient import Limits, Ramp, step


def three(*numbers):
    return numbers if len(numbers) == 3 else numbers * 3


def pulse(change, slew, until):
    """A current that comes at once and goes again."""
    rise = abs(change) / slew
    return Ramp(0.0, [(0.0, 0.0), (rise, change), (until, change), (until + rise, 0.0)])


BUCK = design(
    "", Stage("buck", 300e3, 4.7e-6, 10e-3, 12e-3, "synchronous", [Branch(100e-6, 8e-3, 0.0, 2)], "resistor", synchronous=9e-3),
    (12.0, 12.0, 12.0), 3.3, three(4.0), Control("voltage", ramp=1.2),
    Network(3, "op-amp", 0.8, 10e3, 3.2e3, 10e-9, 6.8e3, 220e-12, 470.0, 2.2e-9, 0.0, 1e4, 3e6),
    delay=80e-9, load_step=(3.0, 2e6), band=0.01)

RESTING_BUCK = design(
    "", Stage("buck", 200e3, 10e-6, 30e-3, 40e-3, "diode", [Branch(100e-6, 0.03)], "resistor", drop=0.4, diode=0.02),
    (12.0, 12.0, 12.0), 5.0, three(0.25), Control("voltage", ramp=1.5),
    Network(3, "op-amp", 1.2, 20e3, 6320.0, 22e-9, 4.7e3, 1e-9, 1e3, 3.3e-9, 0.0, 1e4, 3e6),
    delay=100e-9, load_step=(2.0, 1e6), band=0.01)

PROGRAMMED_BOOST = design(
    "", Stage("boost", 250e3, 10e-6, 15e-3, 12e-3, "synchronous", [Branch(100e-6, 0.012, 0.0, 2)], "resistor", synchronous=0.012),
    (12.0, 12.0, 12.0), 24.0, three(1.0), Control("peak-current", 0.1, 80e3, 60e-9),
    ota2(1.25, 18.2e3, 1e3, 10e-9, 16e3, 330e-12, gm=1e-3),
    delay=60e-9, load_step=(1.0, 1e6), band=0.01)

BOOST = design(
    "", Stage("boost", 300e3, 22e-6, 25e-3, 20e-3, "diode", [Branch(150e-6, 0.03, 0.0, 2)], "resistor", drop=0.4, diode=0.025),
    (12.0, 12.0, 12.0), 24.0, three(1.5), Control("voltage", ramp=1.5),
    Network(3, "op-amp", 1.25, 22e3, 1210.0, 200e-9, 1500.0, 820e-12, 2400.0, 6.8e-9, 0.0, 1e4, 3e6),
    delay=150e-9, load_step=(1.5, 1e6), band=0.01)

VALLEY_BUCK = design(
    "", Stage("buck", 600e3, 1.5e-6, 6e-3, 12e-3, "synchronous", [Branch(47e-6, 3e-3, 0.0, 4, 0.7)], "resistor", synchronous=6e-3),
    (12.0, 12.0, 12.0), 3.3, three(5.0), Control("valley-current", 0.04, 150e3, offset=0.8),
    op2(0.8, 10e3, 3.2e3, 3.3e-9, 6.8e3, 33e-12, gbw=4e6),
    delay=40e-9, load_step=(3.0, 2e6), band=0.01)

AVERAGE_BUCK = design(
    "", Stage("buck", 250e3, 22e-6, 25e-3, 20e-3, "synchronous", [Branch(330e-6, 0.025)], "resistor", synchronous=0.02),
    (24.0, 24.0, 24.0), 12.0, three(3.0),
    Control("average-current", 0.05, filter=150e-9, ramp=1.5, inner=inner_op_amp(2.2e3, 10e3, 3.3e-9, 150e-12, gbw=4e6)),
    op2(1.2, 90e3, 10e3, 6.8e-9, 22e3, 100e-12, gbw=4e6),
    load_step=(1.0, 1e6), band=0.01)

FLYBACK = design(
    "", Stage("flyback", 150e3, 100e-6, 0.08, 0.05, "diode", [Branch(330e-6, 0.02, 0.0, 2), Branch(10e-6, 4e-3)], "resistor",
              drop=0.5, diode=0.015, ratio=0.25),
    (48.0, 48.0, 48.0), 12.0, three(2.5), Control("peak-current", 0.2, 60e3, 120e-9),
    op2(2.5, 20e3, 5230.0, 5.6e-9, 33e3, 390e-12, gbw=4e6),
    delay=60e-9, load_step=(1.5, 1e6), band=0.01)

STARTING_BUCK = design(
    "", Stage("buck", 300e3, 6.8e-6, 15e-3, 20e-3, "diode", [Branch(100e-6, 8e-3, 0.0, 2)], "resistor", drop=0.45, diode=0.015),
    (12.0, 12.0, 12.0), 3.3, three(3.0), Control("peak-current", 0.1, 60e3, 50e-9, offset=0.5),
    op2(0.8, 10e3, 3.2e3, 3.3e-9, 20e3, 100e-12, gbw=3e6),
    delay=60e-9, load_step=(1.0, 1e6), band=0.01)


def at_rest(runner):
    """Nothing charged, no current; an op amp with its reference at zero gives nothing."""
    return np.zeros(runner.n)


CASES = [
    {"title": "voltage-mode buck, load step", "design": BUCK, "vin": 12.0, "load": 4.0, "event": "load-step",
     "sink": step(0.0, *BUCK.load_step), "periods": 90, "ahead": 2, "limits": Limits((0.0, 3.0))},
    {"title": "voltage-mode buck, load falls, pulses left out", "design": BUCK, "vin": 12.0, "load": 4.0, "event": "load-step",
     "sink": step(0.0, -3.6, 4e6), "periods": 90, "ahead": 2, "limits": Limits((0.0, 3.0)),
     "values": {"event.load-step.change": -3.6, "event.load-step.slew": 4e6}},
    {"title": "diode buck leaving and entering discontinuous conduction", "design": RESTING_BUCK, "vin": 12.0, "load": 0.25,
     "event": "overload", "sink": pulse(2.0, 1e6, 200e-6), "periods": 110, "ahead": 2, "limits": Limits((0.0, 3.0)),
     "values": {"event.overload.current": 2.25, "event.overload.time": 200e-6}},
    {"title": "peak-current boost, amplifier current limit", "design": PROGRAMMED_BOOST, "vin": 12.0, "load": 1.0, "event": "load-step",
     "sink": step(0.0, *PROGRAMMED_BOOST.load_step), "periods": 140, "ahead": 2,
     "limits": Limits((0.0, 2.5), current=6e-6, blanking=100e-9)},
    {"title": "voltage-mode boost, op amp at its limit", "design": BOOST, "vin": 12.0, "load": 1.5, "event": "load-step",
     "sink": step(0.0, *BOOST.load_step), "periods": 140, "ahead": 2, "limits": Limits((0.0, 0.74))},
    {"title": "valley-current buck, load step", "design": VALLEY_BUCK, "vin": 12.0, "load": 5.0, "event": "load-step",
     "sink": step(0.0, *VALLEY_BUCK.load_step), "periods": 120, "ahead": 2, "limits": Limits((0.0, 3.0), blanking=50e-9)},
    {"title": "average-current buck, line step", "design": AVERAGE_BUCK, "vin": 24.0, "load": 3.0, "event": "line-step",
     "source": step(24.0, 5.0, 2e5), "periods": 100, "ahead": 2, "limits": Limits((0.0, 3.0), inner=(0.0, 3.0)),
     "values": {"event.line-step.change": 5.0, "event.line-step.slew": 2e5}},
    {"title": "peak-current flyback, load step", "design": FLYBACK, "vin": 48.0, "load": 2.5, "event": "load-step",
     "sink": step(0.0, *FLYBACK.load_step), "periods": 100, "ahead": 2, "limits": Limits((0.0, 3.0), blanking=150e-9)},
    {"title": "buck from nothing by soft start, current limit", "design": STARTING_BUCK, "vin": 12.0, "load": 3.0, "event": "start-up",
     "reference": Ramp(0.0, [(0.0, 0.0), (150e-6, 0.8)]), "periods": 150, "limits": Limits((0.0, 2.0), sensed=6.0, blanking=60e-9),
     "start": at_rest, "values": {"event.soft-start": 150e-6}},
]
