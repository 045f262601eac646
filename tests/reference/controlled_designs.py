"""Designs for the references in discontinuous conduction, current mode and behind filters: our own scenarios, parts in preferred values."""

from dataclasses import dataclass, field

import numpy as np

from amplifiers import Network
from closed_loop_designs import Design
from controlled import Control
from stages import Branch, Filter, Stage


@dataclass
class ControlledDesign(Design):
    """A design with the control it runs under; the ramp of the base is that of `control`."""

    control: Control = field(default_factory=lambda: Control("voltage", ramp=1.0))

    def entries(self):
        """(choices, values) by entry path."""
        choices, values = super().entries()
        control = self.control
        choices["control.mode"] = control.mode
        if control.mode in ("peak-current", "valley-current"):
            del choices["control.feedforward"], values["control.ramp.amplitude"]
            choices |= {"control.sense": "gain", "control.slope": "rate"}
            values |= {"control.slope.rate": control.slope, "control.sense.divider": control.divider,
                       "control.sense.offset": control.offset}
            # Neither plays a part in the model; both are kept out of its way.
            values |= {"control.blanking": 0.0, "control.clamp": 100.0}
        if control.mode != "voltage":
            values |= {"control.sense.gain": control.sense, "control.sense.filter": control.filter}
        if control.mode == "average-current":
            inner = control.inner
            choices["control.inner.amplifier"] = inner.amplifier
            values |= {"control.inner.r2": inner.r2, "control.inner.c1": inner.c1, "control.inner.c2": inner.c2}
            if inner.amplifier == "op-amp":
                values |= {"control.inner.r1": inner.upper, "control.inner.op-amp.dc-gain": inner.gain,
                           "control.inner.op-amp.gain-bandwidth": inner.limit}
            else:
                values |= {"control.inner.transconductance.gm": inner.gain,
                           "control.inner.transconductance.output-resistance": inner.limit}
        for prefix, part in [("input", self.stage.input_filter), ("output", self.stage.output_filter)]:
            if not part:
                continue
            path = f"stage.{prefix}-filter"
            choices |= {path: "fitted", f"{path}.damping": "none"}
            values |= {f"{path}.inductance": part.inductance, f"{path}.resistance": part.resistance}
            if prefix == "input":
                # The filter's capacitor is the stage's input capacitor.
                choices["stage.input-capacitor"] = "fitted"
                values |= {"stage.input-capacitor.capacitance": part.capacitance, "stage.input-capacitor.esr": part.esr}
            else:
                choices[f"{path}.sense"] = "load"
                values |= {f"{path}.capacitance": part.capacitance, f"{path}.esr": part.esr}
            if part.damping:
                choices[f"{path}.damping"] = "capacitor"
                values |= {f"{path}.damping.resistance": part.damping[0], f"{path}.damping.capacitance": part.damping[1]}
            if part.bypass:
                choices[f"{path}.damping"] = "inductor"
                values |= {f"{path}.damping.resistance": part.bypass[0], f"{path}.damping.inductance": part.bypass[1]}
            if part.across:
                choices[f"{path}.damping"] = "resistor"
                values[f"{path}.damping.resistance"] = part.across
        return choices, values


def inner_op_amp(r1, r2, c1, c2, gain=1e4, gbw=10e6):
    """Inner amplifier with the sensed current through r1 on its inverting input, the control voltage on the other."""
    return Network(2, "op-amp", 0.0, r1, np.inf, c1, r2, c2, gain=gain, limit=gbw)


def inner_transconductance(gm, resistance, r2, c1, c2):
    """Inner amplifier from control voltage less sensed current to its own network to ground."""
    # Divider of ratio one: a picoohm above an ohm.
    return Network(2, "transconductance", 0.0, 1e-12, 1.0, c1, r2, c2, gain=gm, limit=resistance)


def design(title, stage, vin, output, load, control, network, **more):
    return ControlledDesign(title, stage, vin, output, load, control.ramp or 1.0, network, control=control, **more)


def op2(reference, upper, lower, c1, r2, c2, gain=1e4, gbw=8e6):
    return Network(2, "op-amp", reference, upper, lower, c1, r2, c2, gain=gain, limit=gbw)


def ota2(reference, upper, lower, c1, r2, c2, gm=1e-3, resistance=2e6):
    return Network(2, "transconductance", reference, upper, lower, c1, r2, c2, gain=gm, limit=resistance)


DISCONTINUOUS = [
    design(
        "discontinuous diode boost, voltage mode, delay",
        Stage("boost", 100e3, 5e-6, 10e-3, 15e-3, "diode", [Branch(470e-6, 0.02)], "resistor", drop=0.45, diode=0.012),
        (20.0, 24.0, 28.0), 36.0, (0.6, 1.5, 2.5), Control("voltage", ramp=1.5),
        op2(2.5, 39e3, 2.91e3, 47e-9, 10e3, 220e-12),
        delay=150e-9, load_step=(0.5, 1e6), line_step=(1.0, 1e5), reference_step=(0.5, 1e4), band=0.002),
    design(
        "discontinuous diode buck, constant current, line feed-forward, input capacitor",
        Stage("buck", 200e3, 10e-6, 30e-3, 40e-3, "diode", [Branch(100e-6, 0.03), Branch(22e-6, 5e-3, 0.0, 2, 0.7)], "current",
              0.05, (220e-6, 0.04), 0.4, 0.03),
        (9.0, 12.0, 16.0), 5.0, (0.08, 0.2, 0.35), Control("voltage", ramp=1.0),
        ota2(0.8, 42e3, 8e3, 22e-9, 10e3, 100e-12),
        feedforward=True, load_step=(0.1, 1e6), line_step=(2.0, 1e5), reference_step=(0.05, 1e4), band=0.002),
    design(
        "diode inverting buck-boost, discontinuous at light load and continuous at full, delay",
        Stage("buck-boost", 150e3, 15e-6, 25e-3, 20e-3, "diode", [Branch(330e-6, 0.03)], "resistor", drop=0.5, diode=0.02),
        (18.0, 24.0, 30.0), 15.0, (0.3, 1.0, 4.0), Control("voltage", ramp=2.0),
        Network(3, "op-amp", 1.25, 22e3, 2e3, 220e-9, 1500.0, 820e-12, 1300.0, 11e-9, 0.0, 2e4, 10e6),
        delay=200e-9, load_step=(0.3, 1e6), line_step=(2.0, 1e5), reference_step=(0.2, 1e5), band=0.002),
    design(
        "boost with an emulated diode, discontinuous at light load and continuous at full",
        Stage("boost", 300e3, 6.8e-6, 15e-3, 12e-3, "emulated", [Branch(100e-6, 0.02, 0.0, 2)], "resistor", synchronous=0.012),
        (9.0, 12.0, 15.0), 24.0, (0.1, 0.35, 1.5), Control("voltage", ramp=1.2),
        Network(3, "op-amp", 1.25, 18.2e3, 1e3, 330e-9, 820.0, 1e-9, 1500.0, 10e-9, 0.0, 1e4, 8e6),
        load_step=(0.1, 1e6), line_step=(1.0, 1e5), reference_step=(0.3, 1e4), band=0.002),
    design(
        "discontinuous peak-current buck, diode, sense filter, delay",
        Stage("buck", 250e3, 8.2e-6, 25e-3, 30e-3, "diode", [Branch(100e-6, 0.015)], "resistor", drop=0.4, diode=0.02),
        (9.0, 12.0, 16.0), 5.0, (0.1, 0.3, 2.5), Control("peak-current", 0.2, 40e3, 60e-9),
        ota2(0.8, 42e3, 8e3, 10e-9, 15e3, 47e-12),
        delay=60e-9, load_step=(0.1, 1e6), line_step=(2.0, 1e5), reference_step=(0.05, 1e4), band=0.002),
    design(
        "discontinuous peak-current boost, emulated diode, constant current, ramp",
        Stage("boost", 200e3, 4.7e-6, 15e-3, 12e-3, "emulated", [Branch(220e-6, 0.03)], "resistor", synchronous=0.015),
        (9.0, 12.0, 15.0), 24.0, (0.15, 0.5, 0.8), Control("peak-current", 0.05, 50e3),
        op2(2.5, 43e3, 5e3, 10e-9, 27e3, 100e-12),
        load_step=(0.2, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
]

CURRENT_MODE = [
    design(
        "peak-current boost with right-half-plane zero, delay",
        Stage("boost", 300e3, 10e-6, 18e-3, 12e-3, "synchronous", [Branch(47e-6, 3e-3, 0.0, 3, 0.8), Branch(100e-6, 0.035)],
              "resistor", synchronous=0.012),
        (9.0, 12.0, 16.0), 24.0, (0.5, 1.0, 1.5), Control("peak-current", 0.1, 80e3),
        op2(1.25, 18.2e3, 1e3, 15e-9, 20e3, 220e-12),
        delay=60e-9, load_step=(0.5, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "peak-current buck above half duty, sense filter, unlike bank, transconductance",
        Stage("buck", 400e3, 10e-6, 20e-3, 25e-3, "diode", [Branch(220e-6, 0.03), Branch(22e-6, 4e-3, 0.0, 2, 0.6)], "current",
              drop=0.4, diode=0.02),
        (15.0, 18.0, 24.0), 12.0, (1.5, 2.5, 4.0), Control("peak-current", 0.08, 60e3, 400e-9),
        ota2(0.8, 140e3, 10e3, 4.7e-9, 15e3, 47e-12, 1.2e-3),
        load_step=(1.0, 1e6), line_step=(2.0, 1e5), reference_step=(0.1, 1e4), band=0.002),
    design(
        "peak-current inverting buck-boost, constant power, sense filter and delay, divider",
        Stage("buck-boost", 250e3, 15e-6, 20e-3, 20e-3, "diode", [Branch(150e-6, 0.02, 0.0, 2)], "power", drop=0.45, diode=0.02),
        (9.0, 12.0, 15.0), 12.0, (1.0, 1.5, 2.0), Control("peak-current", 0.05, 30e3, 100e-9, divider=0.4, offset=0.7),
        op2(1.2, 18e3, 2e3, 22e-9, 15e3, 220e-12),
        delay=80e-9, load_step=(0.3, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "valley-current buck, delay",
        Stage("buck", 600e3, 1.5e-6, 6e-3, 12e-3, "synchronous", [Branch(47e-6, 3e-3, 0.0, 4, 0.7)], "resistor", synchronous=6e-3),
        (9.0, 12.0, 14.0), 3.3, (1.0, 5.0, 10.0), Control("valley-current", 0.04, 150e3, offset=0.8),
        op2(0.8, 10e3, 3.2e3, 3.3e-9, 6.8e3, 33e-12),
        delay=40e-9, load_step=(3.0, 2e6), line_step=(2.0, 1e5), reference_step=(0.05, 1e4), band=0.002),
    design(
        "valley-current boost, sense filter, transconductance",
        Stage("boost", 500e3, 3.3e-6, 8e-3, 10e-3, "synchronous", [Branch(22e-6, 3e-3, 0.0, 4, 0.6)], "resistor", synchronous=0.012),
        (3.0, 3.7, 4.2), 5.0, (0.5, 1.0, 1.5), Control("valley-current", 0.1, 60e3, 50e-9, offset=0.5),
        ota2(0.6, 110e3, 15e3, 10e-9, 5.6e3, 150e-12),
        load_step=(0.4, 1e6), line_step=(0.3, 1e4), reference_step=(0.05, 1e3), band=0.003),
    design(
        "average-current boost, inner op amp, delay",
        Stage("boost", 200e3, 33e-6, 30e-3, 20e-3, "synchronous", [Branch(220e-6, 0.03, 0.0, 2)], "resistor", synchronous=0.02),
        (18.0, 24.0, 30.0), 48.0, (0.5, 1.5, 2.5),
        Control("average-current", 0.1, ramp=2.0, inner=inner_op_amp(2.2e3, 10e3, 3.3e-9, 150e-12)),
        op2(2.5, 91e3, 5e3, 10e-9, 82e3, 100e-12),
        delay=80e-9, load_step=(0.5, 1e6), line_step=(2.0, 1e5), reference_step=(0.5, 1e4), band=0.002),
    design(
        "average-current buck, inner transconductance, sense filter, constant current",
        Stage("buck", 250e3, 22e-6, 25e-3, 20e-3, "synchronous", [Branch(330e-6, 0.025)], "current", synchronous=0.02),
        (18.0, 24.0, 32.0), 12.0, (1.0, 3.0, 5.0),
        Control("average-current", 0.05, filter=150e-9, ramp=1.5, inner=inner_transconductance(1e-3, 3e6, 15e3, 2.2e-9, 22e-12)),
        ota2(1.2, 90e3, 10e3, 6.8e-9, 10e3, 100e-12),
        load_step=(1.0, 1e6), line_step=(3.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
]

FILTERS = [
    design(
        "voltage-mode buck behind a damped input filter",
        Stage("buck", 200e3, 22e-6, 25e-3, 20e-3, "synchronous", [Branch(220e-6, 0.02, 0.0, 2)], "resistor", 0.01,
              synchronous=0.02, input_filter=Filter(4.7e-6, 10e-3, 22e-6, 5e-3, damping=(0.5, 100e-6))),
        (18.0, 24.0, 32.0), 12.0, (2.0, 3.0, 5.0), Control("voltage", ramp=2.0),
        Network(3, "op-amp", 1.2, 20e3, 2220.0, 15e-9, 8200.0, 220e-12, 1e3, 3.6e-9, 0.0, 1e4, 8e6),
        delay=150e-9, load_step=(1.0, 1e6), line_step=(4.0, 2e5), reference_step=(0.2, 1e5), band=0.002),
    design(
        "peak-current buck-boost behind a filter with a damping inductor, source resistance",
        Stage("buck-boost", 300e3, 15e-6, 15e-3, 15e-3, "diode", [Branch(150e-6, 0.02, 0.0, 2)], "resistor", 0.02, (),
              0.45, 0.02, input_filter=Filter(3.3e-6, 8e-3, 47e-6, 4e-3, bypass=(0.3, 1e-6))),
        (9.0, 12.0, 15.0), 12.0, (1.0, 1.5, 2.0), Control("peak-current", 0.08, 60e3),
        op2(1.2, 18e3, 2e3, 22e-9, 8.2e3, 220e-12),
        load_step=(0.3, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode boost with a second-stage output filter, damped",
        Stage("boost", 300e3, 10e-6, 15e-3, 12e-3, "synchronous", [Branch(220e-6, 0.03)], "resistor", synchronous=0.012,
              output_filter=Filter(0.47e-6, 3e-3, 22e-6, 4e-3, across=0.3)),
        (9.0, 12.0, 15.0), 24.0, (0.5, 1.0, 1.5), Control("voltage", ramp=1.5),
        Network(3, "op-amp", 1.25, 18.2e3, 1e3, 220e-9, 1200.0, 820e-12, 1500.0, 8.2e-9, 0.0, 1e4, 8e6),
        load_step=(0.3, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "discontinuous buck behind a damped input filter, output filter",
        Stage("buck", 250e3, 8.2e-6, 25e-3, 30e-3, "diode", [Branch(100e-6, 0.015)], "resistor", 0.0, (), 0.4, 0.02,
              input_filter=Filter(4.7e-6, 20e-3, 10e-6, 5e-3, damping=(1.0, 47e-6)),
              output_filter=Filter(0.33e-6, 5e-3, 22e-6, 4e-3)),
        (9.0, 12.0, 16.0), 5.0, (0.1, 0.2, 0.3), Control("voltage", ramp=1.0),
        ota2(0.8, 42e3, 8e3, 47e-9, 6.8e3, 47e-12),
        load_step=(0.1, 1e6), line_step=(2.0, 1e5), reference_step=(0.05, 1e4), band=0.002),
]
