"""Power stages in continuous conduction: equations of the on and off interval written by hand, averaged and perturbed.

Conventions: SI units; the inverting output counts as a magnitude; a rise of load current `io` is drawn at the output in
parallel with the load.  Every quantity is a row over (states, inputs), so the lines below read like the circuit laws.

Source of the method: Middlebrook and Cuk, "A general unified approach to modelling switching-converter power stages"
(1976); Erickson and Maksimovic, Fundamentals of Power Electronics, section on state-space averaging (from memory).
"""

from dataclasses import dataclass, field

import numpy as np
from scipy.optimize import brentq

INPUTS = ["vin", "one", "io"]  # source voltage [V], a constant 1 for drops and constant load current, extra load current [A]


@dataclass
class Branch:
    """One output capacitor branch, all its parts in parallel counted."""

    capacitance: float  # [F] of one part as marked
    esr: float  # [ohm] of one part
    esl: float = 0.0  # [H] of one part
    count: int = 1
    remaining: float = 1.0  # fraction of the capacitance left at bias and temperature


@dataclass
class Stage:
    """A power stage as an engineer enters it."""

    topology: str  # "buck", "boost" or "buck-boost"
    fs: float  # switching frequency [Hz]
    inductance: float  # [H]
    winding: float  # [ohm]
    switch: float  # on resistance [ohm]
    rectifier: str  # "diode" or "synchronous"
    bank: list  # of Branch
    load: str  # "resistor", "current" or "power"
    source: float = 0.0  # source resistance [ohm]
    input_capacitor: tuple = ()  # (capacitance [F], esr [ohm]) or empty
    drop: float = 0.0  # diode drop [V]
    diode: float = 0.0  # diode resistance [ohm]
    synchronous: float = 0.0  # on resistance of the synchronous rectifier [ohm]


@dataclass
class Averaged:
    """Operating point and small-signal model x' = A x + B u + F d, y = C x + D u + G d about it; y = (vout, iL, iin)."""

    duty: float
    inductor_current: float  # [A]
    input_current: float  # [A]
    a: np.ndarray
    b: np.ndarray
    c: np.ndarray
    d: np.ndarray
    f: np.ndarray
    g: np.ndarray
    on_slope: float  # slope of the inductor current in the on interval [A/s]
    states: list = field(default_factory=list)

    def at(self, s):
        """vout from (vin, io, duty) at the complex frequencies s, one row each."""
        s = np.atleast_1d(s)
        inputs = np.column_stack([self.b[:, [0, 2]], self.f])
        x = np.linalg.solve(s[:, None, None] * np.eye(len(self.a)) - self.a, inputs[None])
        return self.c[0] @ x + np.array([self.d[0, 0], self.d[0, 2], self.g[0]])


def intervals(stage, vout, load_current):
    """The matrices (A, B, C, D) of the on and of the off interval for outputs (vout, iL, iin)."""
    branches = stage.bank
    with_esl = any(branch.esl > 0.0 for branch in branches)
    names = ["iL"] + [f"v{k}" for k in range(len(branches))]
    if with_esl:
        names += [f"i{k}" for k in range(len(branches))]
    if stage.input_capacitor:
        names += ["vci"]
    columns = names + INPUTS

    def row(name):
        return np.array([1.0 if column == name else 0.0 for column in columns])

    i_l, vin, one, io = row("iL"), row("vin"), row("one"), row("io")
    zero = np.zeros(len(columns))

    # The load: a conductance in parallel with a constant current, both at the regulated output.
    conductance, constant = {
        "resistor": (load_current / vout, 0.0),
        "current": (0.0, load_current),
        # p/v about v0: i = I - (I/V)(v - V) = 2 I - (I/V) v.
        "power": (-load_current / vout, 2.0 * load_current),
    }[stage.load]

    def input_node(drawn):
        """Node voltage behind the source resistance, and the source's current, while `drawn` flows into the stage."""
        if stage.input_capacitor:
            capacitance, esr = stage.input_capacitor
            assert stage.source > 0.0 and esr > 0.0
            v_node = (vin / stage.source + row("vci") / esr - drawn) / (1.0 / stage.source + 1.0 / esr)
            return v_node, (vin - v_node) / stage.source, (v_node - row("vci")) / (esr * capacitance)
        return vin - stage.source * drawn, drawn, None

    def interval(on):
        resistance = stage.switch if on else (stage.diode if stage.rectifier == "diode" else stage.synchronous)
        drop = 0.0 if on or stage.rectifier != "diode" else stage.drop
        lost = (resistance + stage.winding) * i_l + drop * one
        if stage.topology == "buck":
            drawn, delivered = (i_l if on else zero), i_l
        elif stage.topology == "boost":
            drawn, delivered = i_l, (zero if on else i_l)
        else:
            drawn, delivered = (i_l, zero) if on else (zero, i_l)
        v_node, i_in, vci_slope = input_node(drawn)

        slopes = {}
        into_bank = delivered - io - constant * one  # current for the bank and the load's conductance
        if with_esl:
            assert conductance > 0.0
            v_out = (into_bank - sum(row(f"i{k}") for k in range(len(branches)))) / conductance
        else:
            g = [branch.count / branch.esr for branch in branches]
            v_out = (into_bank + sum(gk * row(f"v{k}") for k, gk in enumerate(g))) / (conductance + sum(g))
        for k, branch in enumerate(branches):
            c_k = branch.capacitance * branch.remaining * branch.count
            r_k = branch.esr / branch.count
            if with_esl:
                slopes[f"v{k}"] = row(f"i{k}") / c_k
                slopes[f"i{k}"] = (v_out - row(f"v{k}") - r_k * row(f"i{k}")) / (branch.esl / branch.count)
            else:
                slopes[f"v{k}"] = (v_out - row(f"v{k}")) / (r_k * c_k)
        if vci_slope is not None:
            slopes["vci"] = vci_slope

        # Voltage across the inductor, losses taken off.
        v_l = {
            ("buck", True): v_node - v_out,
            ("buck", False): -v_out,
            ("boost", True): v_node,
            ("boost", False): v_node - v_out,
            ("buck-boost", True): v_node,
            ("buck-boost", False): -v_out,
        }[(stage.topology, on)] - lost
        slopes["iL"] = v_l / stage.inductance

        n = len(names)
        ab = np.array([slopes[name] for name in names])
        cd = np.array([v_out, i_l, i_in])
        return ab[:, :n], ab[:, n:], cd[:, :n], cd[:, n:]

    return interval(True), interval(False), names


def averaged(stage, vin, vout, load_current):
    """Duty ratio with all losses for the wanted output (the solution below the conversion curve's peak), and the model."""
    on, off, names = intervals(stage, vout, load_current)
    u = np.array([vin, 1.0, 0.0])

    def mix(duty):
        return [duty * p + (1.0 - duty) * q for p, q in zip(on, off)]

    def output(duty):
        a, b, c, d = mix(duty)
        return (c @ np.linalg.solve(a, -b @ u) + d @ u)[0]

    # First upward crossing of the wanted output on a fine grid, refined.
    grid = np.linspace(1e-4, 1.0 - 1e-4, 500)
    above = np.array([output(duty) for duty in grid]) >= vout
    first = int(np.argmax(above))
    assert above[first] and first > 0, "wanted output out of reach"
    duty = brentq(lambda value: output(value) - vout, grid[first - 1], grid[first], xtol=1e-15, rtol=9e-16)

    a, b, c, d = mix(duty)
    x = np.linalg.solve(a, -b @ u)
    y = c @ x + d @ u
    f = (on[0] - off[0]) @ x + (on[1] - off[1]) @ u
    g = (on[2] - off[2]) @ x + (on[3] - off[3]) @ u
    on_slope = (on[0] @ x + on[1] @ u)[0]
    model = Averaged(duty, y[1], y[2], a, b, c, d, f, g, on_slope, names)
    # Continuous conduction is what these equations are about.
    assert y[1] > 0.5 * on_slope * duty / stage.fs, "discontinuous conduction"
    return model
