"""Power stages: equations of the on, off and idle interval written by hand; averaged and perturbed in continuous conduction.

Conventions: SI units; the inverting output counts as a magnitude; a rise of load current `io` is drawn at the output in
parallel with the load.  Every quantity is a row over (states, inputs), so the lines below read like the circuit laws.

Source of the method: Middlebrook and Cuk, "A general unified approach to modelling switching-converter power stages"
(1976); Erickson and Maksimovic, Fundamentals of Power Electronics, section on state-space averaging (from memory).
"""

from dataclasses import dataclass, field, replace

import numpy as np
from scipy.optimize import brentq

from cells import DOUBLE_ENDED, along, cell, sensed, state_names

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
class Filter:
    """An inductor in series and a capacitor across, and what damps them."""

    inductance: float  # [H]
    resistance: float  # of the inductor [ohm]
    capacitance: float  # [F]
    esr: float = 0.0  # [ohm]
    damping: tuple = ()  # resistor and capacitor in series, across the capacitor: ([ohm], [F])
    bypass: tuple = ()  # input only: resistor and inductor in series, across the inductor and its winding: ([ohm], [H])
    across: float = 0.0  # output only: resistor across the inductor and its winding [ohm]


@dataclass
class Stage:
    """A power stage as an engineer enters it."""

    topology: str  # as in a design file
    fs: float  # switching frequency of each switch [Hz]
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
    input_filter: Filter | None = None  # between the source's resistance and the stage's input
    output_filter: Filter | None = None  # between the bank and the load
    ratio: float = 1.0  # transformer: secondary over primary turns
    magnetising: float = np.inf  # transformer: inductance at the primary of a forward-type stage [H]
    leakage: float = 0.0  # transformer: at the primary [H]
    second: tuple = ()  # the output-side inductor of a SEPIC or Cuk stage: ([H], winding [ohm])
    coupling: float = 0.0  # between the two inductors
    coupling_capacitor: tuple = ()  # ([F], esr [ohm])
    phases: int = 1  # equal phases driven alike, a period's Nth apart
    region: str = ""  # of a four-switch stage: "buck" or "boost", once its voltages are known

    @property
    def pulse_frequency(self):
        """How often the output filter sees a pulse [Hz]: the period of every law."""
        return self.fs * (2.0 if self.topology in DOUBLE_ENDED else 1.0)

    def at(self, vin, vout):
        """The stage at its voltages, which decide the switches a four-switch stage moves."""
        return replace(self, region="buck" if vin > vout else "boost") if self.topology == "four-switch" else self

    def vector(self, shares, names):
        """Numbers by state as a vector."""
        return np.array([shares.get(name, 0.0) for name in names])

    def sensed(self, names):
        """Row of what the switch's current sensor reads."""
        return self.vector(sensed(self), names)

    def along(self, names):
        """How the states go with one ampere of that."""
        return self.vector(along(self), names)


@dataclass
class Averaged:
    """Operating point and small-signal model x' = A x + B u + F d, y = C x + D u + G d about it; y = (vout, sensed current, iin, bank)."""

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


def branch_currents(v_node_of, injected, branches):
    """A node with resistive branches (resistance, row of the far voltage): its voltage once `injected` flows into it.

    A branch without resistance fixes the voltage, and its current is what the others leave.
    """
    stiff = [k for k, (resistance, _) in enumerate(branches) if resistance == 0.0]
    assert len(stiff) <= 1, "two capacitors without resistance share one voltage"
    if stiff:
        v_node = branches[stiff[0]][1]
    else:
        g = [1.0 / r for r, _ in branches]
        v_node = (injected + sum(gk * far for gk, (_, far) in zip(g, branches))) / (v_node_of + sum(g))
    currents = [None if r == 0.0 else (v_node - far) / r for r, far in branches]
    if stiff:
        currents[stiff[0]] = injected - v_node_of * v_node - sum(i for i in currents if i is not None)
    return v_node, currents


def equations(stage, vout, load_current, commutates=True, cells=None):
    """{interval: (A, B, C, D)} of the on, off and idle interval for outputs (vout, sensed current, iin, voltage of the bank, voltage that
    magnetises a transformer), and the names of the states.  The sensed current is the switch's, which flows on in the rectifier.

    `cells`: (names of their states, {interval: function of (row, one) giving a cell}) in place of the stage's own three.
    """
    branches = stage.bank
    with_esl = any(branch.esl > 0.0 for branch in branches)
    own, made = cells or (state_names(stage.topology), {
        which: lambda row, one, which=which: cell(stage, which, row, one, commutates) for which in ["on", "off", "idle"]})
    names = own + [f"v{k}" for k in range(len(branches))]
    if with_esl:
        names += [f"i{k}" for k in range(len(branches))]
    if stage.input_capacitor:
        names += ["vci"]
    for prefix, part in [("in", stage.input_filter), ("out", stage.output_filter)]:
        if part:
            names += [f"i_{prefix}", f"v_{prefix}"] + ([f"vd_{prefix}"] if part.damping else [])
            names += [f"id_{prefix}"] if part.bypass else []
    columns = names + INPUTS

    def row(name):
        return np.array([1.0 if column == name else 0.0 for column in columns])

    vin, one, io = row("vin"), row("one"), row("io")
    read = stage.sensed(columns)

    # The load: a conductance in parallel with a constant current, both at the regulated output.
    conductance, constant = {
        "resistor": (load_current / vout, 0.0),
        "current": (0.0, load_current),
        # p/v about v0: i = I - (I/V)(v - V) = 2 I - (I/V) v.
        "power": (-load_current / vout, 2.0 * load_current),
    }[stage.load]

    def across(part, prefix):
        """Branches of a filter's capacitors: (resistance, far voltage, name of the state, capacitance)."""
        found = [(part.esr, row(f"v_{prefix}"), f"v_{prefix}", part.capacitance)]
        if part.damping:
            found.append((part.damping[0], row(f"vd_{prefix}"), f"vd_{prefix}", part.damping[1]))
        return found

    def input_node(drawn, slopes):
        """Voltage of the stage's input terminal and the source's current, while `drawn` flows into the stage."""
        capacitors = []
        if stage.input_capacitor:
            assert stage.input_capacitor[1] > 0.0 and (stage.source > 0.0 or stage.input_filter)
            capacitors.append((stage.input_capacitor[1], row("vci"), "vci", stage.input_capacitor[0]))
        part = stage.input_filter
        if part:
            i_in = row("i_in") + (row("id_in") if part.bypass else 0.0)
            capacitors += across(part, "in")
            v_node, currents = branch_currents(0.0, i_in - drawn, [c[:2] for c in capacitors])
            v_filter = vin - stage.source * i_in - v_node
            slopes["i_in"] = (v_filter - part.resistance * row("i_in")) / part.inductance
            if part.bypass:
                slopes["id_in"] = (v_filter - part.bypass[0] * row("id_in")) / part.bypass[1]
        elif capacitors:
            v_node, currents = branch_currents(1.0 / stage.source, vin / stage.source - drawn, [c[:2] for c in capacitors])
            i_in = (vin - v_node) / stage.source
        else:
            return vin - stage.source * drawn, drawn
        for (_, _, name, capacitance), current in zip(capacitors, currents):
            slopes[name] = current / capacitance
        return v_node, i_in

    def output_nodes(delivered, slopes):
        """Voltages of the bank and of the load, which are one without an output filter."""
        part = stage.output_filter
        into_bank, at_bank = delivered - io - constant * one, conductance
        if part:
            into_bank, at_bank = delivered - row("i_out"), 0.0
            into_load = row("i_out") - io - constant * one
        if with_esl:
            assert at_bank > 0.0
            v_bank = (into_bank - sum(row(f"i{k}") for k in range(len(branches)))) / at_bank
            for k, branch in enumerate(branches):
                slopes[f"i{k}"] = (v_bank - row(f"v{k}") - branch.esr / branch.count * row(f"i{k}")) / (branch.esl / branch.count)
            currents = [row(f"i{k}") for k in range(len(branches))]
        else:
            bank = [(branch.esr / branch.count, row(f"v{k}")) for k, branch in enumerate(branches)]
            if part and part.across:
                # Both nodes as sources behind their branches' resistance, joined by the resistor.
                v_1, _ = branch_currents(0.0, into_bank, bank)
                v_2, _ = branch_currents(conductance, into_load, [c[:2] for c in across(part, "out")])
                r_1 = 1.0 / sum(1.0 / r for r, _ in bank)
                r_2 = 1.0 / (conductance + sum(1.0 / c[0] for c in across(part, "out")))
                passing = (v_1 - v_2) / (part.across + r_1 + r_2)
                into_bank, into_load = into_bank - passing, into_load + passing
            v_bank, currents = branch_currents(at_bank, into_bank, bank)
        for k, branch in enumerate(branches):
            slopes[f"v{k}"] = currents[k] / (branch.capacitance * branch.remaining * branch.count)
        if not part:
            return v_bank, v_bank
        capacitors = across(part, "out")
        v_out, currents = branch_currents(conductance, into_load, [c[:2] for c in capacitors])
        slopes["i_out"] = (v_bank - part.resistance * row("i_out") - v_out) / part.inductance
        for (_, _, name, capacitance), current in zip(capacitors, currents):
            slopes[name] = current / capacitance
        return v_bank, v_out

    def interval(which):
        part = made[which](row, one)
        slopes = {}
        v_node, i_in = input_node(part.drawn, slopes)
        v_bank, v_out = output_nodes(part.delivered, slopes)
        slopes |= part.slopes(v_node, v_bank)
        n = len(names)
        ab = np.array([slopes[name] for name in names])
        magnetised = part.magnetised(v_node) if part.magnetised else 0.0 * read
        cd = np.array([v_out, 0.0 * read if which == "idle" else read, i_in, v_bank, magnetised])
        return ab[:, :n], ab[:, n:], cd[:, :n], cd[:, n:]

    return {which: interval(which) for which in made}, names


def intervals(stage, vout, load_current):
    """The matrices (A, B, C, D) of the on and of the off interval, and the names of the states."""
    found, names = equations(stage, vout, load_current)
    return found["on"], found["off"], names


def averaged(stage, vin, vout, load_current, check=True):
    """Duty ratio with all losses for the wanted output (the solution below the conversion curve's peak), and the model."""
    stage = stage.at(vin, vout)
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
    on_slope = stage.sensed(names) @ (on[0] @ x + on[1] @ u)
    model = Averaged(duty, y[1], y[2], a, b, c, d, f, g, on_slope, names)
    # Continuous conduction is what these equations are about.
    assert not check or y[1] > 0.5 * on_slope * duty / stage.pulse_frequency, "discontinuous conduction"
    return model
