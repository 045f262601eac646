"""Isolated feedback: a 431-type shunt regulator that pulls an optocoupler's LED, in two hand-written forms, and loops closed by it.

    python isolated.py OUTPUT.json

`Isolated.at` solves the nodal equations at one frequency, currents into each node; `Isolated.state_space` writes the same circuit as
first-order equations.  The script compares the two.

Circuit, secondary side: divider from the output to the tap and to ground; the regulator holds its cathode at A(s) (vref - tap),
A(s) = A0/(1 + s A0/(2 pi GBW)); c1, with r2 in series where fitted, from the cathode to the tap.  From the LED's supply (the output at the
load, the bank ahead of a second stage, or a fixed voltage) the LED resistor to node a, r3 in series with c3 across it in a type III; from a
to the cathode the LED's dynamic resistance, the bias resistor across it.  Primary side: the transistor draws ratio times the LED's current
from the control voltage's node, pull-up to a supply, c2 and the optocoupler's own capacitance to ground.

Two loops act: the slow one through the divider and the regulator, the fast one from the LED's supply.  Conventions: SI; responses from vout
and from the fast supply with the inversion taken out.
"""

import sys
import warnings
from dataclasses import dataclass, replace

import numpy as np

from controlled import ControlledLoop
from controlled_results import against_switched, condition, check_state_space, pairs
from output import write

TAU = 2.0 * np.pi


@dataclass
class Isolated:
    """Parts of one isolated compensator; zero means not fitted."""

    kind: int  # 1, 2 or 3
    fast: str  # what feeds the LED: "load", "bank" or "none" for a fixed supply
    reference: float  # [V]
    upper: float  # [ohm]
    lower: float  # [ohm]
    c1: float  # [F]
    led: float  # LED resistor [ohm]
    pull_up: float  # [ohm]
    ratio: float  # collector current over LED current
    r2: float = 0.0
    c2: float = 0.0
    r3: float = 0.0
    c3: float = 0.0
    bias: float = 1e3  # across the LED [ohm]
    dynamic: float = 25.0  # resistance of the LED [ohm]
    own: float = 1e-9  # capacitance at the collector [F]
    gain: float = 1e3  # of the regulator at rest
    limit: float = 1e6  # its gain-bandwidth product [Hz]
    drop: float = 1.05  # of the LED [V]
    supply: float = 5.0  # of the pull-up [V]
    fixed: float = 0.0  # LED's own supply [V]
    amplifier: str = "shunt-regulator"

    def at(self, s):
        """-vc/vout, -vc/fast and vc/vref at the complex frequencies s, by the nodal equations of tap, cathode, node a and vc."""
        answers = []
        for z in np.atleast_1d(s):
            upper, lower = 1.0 / self.upper, 1.0 / self.lower
            local = 1.0 / (self.r2 + 1.0 / (z * self.c1))
            branch = 1.0 / self.led + (1.0 / (self.r3 + 1.0 / (z * self.c3)) if self.kind == 3 else 0.0)
            lamp, across = 1.0 / self.dynamic, 1.0 / self.bias
            a = self.gain / (1.0 + z * self.gain / (TAU * self.limit))
            collector = 1.0 / self.pull_up + z * (self.c2 + self.own)
            # Columns: tap, cathode, a, vc.
            nodes = np.array([
                [upper + lower + local, -local, 0.0, 0.0],
                [a, 1.0, 0.0, 0.0],
                [0.0, -lamp - across, branch + lamp + across, 0.0],
                [0.0, -self.ratio * lamp, self.ratio * lamp, collector],
            ])
            given = np.array([[upper, 0.0, 0.0], [0.0, 0.0, a], [0.0, branch, 0.0], [0.0, 0.0, 0.0]])
            answers.append(np.linalg.solve(nodes, given)[3] * np.array([-1.0, -1.0, 1.0]))
        slow, fast, reference = np.array(answers).T
        return slow, (0.0 * fast if self.fast == "none" else fast), reference

    def ideal(self, s):
        """-vc/vout with a regulator of infinite gain, the LED's supply being the output where it is not fixed: the usual formula."""
        lamp = 1.0 / (1.0 / self.dynamic + 1.0 / self.bias)
        share = self.bias / (self.bias + self.dynamic)
        branch = 1.0 / (1.0 / self.led + (1.0 / (self.r3 + 1.0 / (s * self.c3)) if self.kind == 3 else 0.0))
        through = (self.r2 + 1.0 / (s * self.c1)) / self.upper + (0.0 if self.fast == "none" else 1.0)
        return self.ratio * share * self.pull_up / (branch + lamp) * through / (1.0 + s * self.pull_up * (self.c2 + self.own))

    def state_space(self):
        """(A, B, C, names) with inputs (vout, vref, fast, constants) and the output vc."""
        names = ["k", "v1", "vc"] + (["v3"] if self.kind == 3 else [])
        columns = names + ["vout", "vref", "fast", "one"]

        def row(name):
            return np.eye(len(columns))[columns.index(name)]

        cathode, v1, vc, vout, vref = row("k"), row("v1"), row("vc"), row("vout"), row("vref")
        one = row("one")
        fast = self.fixed * one if self.fast == "none" else row("fast")
        # v1 stands from the cathode to the tap.
        if self.r2:
            tap = (vout / self.upper + (cathode - v1) / self.r2) / (1.0 / self.upper + 1.0 / self.lower + 1.0 / self.r2)
            through = (cathode - v1 - tap) / self.r2
        else:
            tap = cathode - v1
            through = tap / self.lower - (vout - tap) / self.upper
        slopes = {"v1": through / self.c1}
        slopes["k"] = TAU * self.limit * (vref - tap - cathode / self.gain)
        g_led, g_3 = 1.0 / self.led, (1.0 / self.r3 if self.kind == 3 else 0.0)
        g_a = 1.0 / self.dynamic + 1.0 / self.bias
        v3 = row("v3") if self.kind == 3 else 0.0 * vc
        node = (g_led * fast + g_3 * (fast - v3) + g_a * cathode + self.drop / self.dynamic * one) / (g_led + g_3 + g_a)
        lamp = (node - cathode - self.drop * one) / self.dynamic
        if self.kind == 3:
            slopes["v3"] = (fast - v3 - node) * g_3 / self.c3
        slopes["vc"] = ((self.supply * one - vc) / self.pull_up - self.ratio * lamp) / (self.c2 + self.own)
        n = len(names)
        ab = np.array([slopes[name] for name in names])
        return ab[:, :n], ab[:, n:], vc[:n], names

    def entries(self):
        """(choices, values) by entry path."""
        choices = {
            "compensator.type": str(self.kind),
            "compensator.amplifier": self.amplifier,
            "compensator.opto.fast-path": self.fast,
            "compensator.opto.speed": "capacitance",
        }
        if self.kind > 1 and self.fast != "none":
            choices["compensator.shunt.series-resistor"] = "fitted" if self.r2 else "none"
        values = {
            "compensator.reference": self.reference,
            "compensator.divider.upper": self.upper,
            "compensator.divider.lower": self.lower,
            "compensator.c1": self.c1,
            "compensator.opto.led-resistor": self.led,
            "compensator.opto.pull-up": self.pull_up,
            "compensator.opto.transfer-ratio.least": 0.7 * self.ratio,
            "compensator.opto.transfer-ratio.nominal": self.ratio,
            "compensator.opto.transfer-ratio.greatest": 1.4 * self.ratio,
            "compensator.opto.bias-resistor": self.bias,
            "compensator.opto.led-resistance": self.dynamic,
            "compensator.opto.led-drop": self.drop,
            "compensator.opto.supply": self.supply,
            "compensator.opto.saturation": 0.2,
            "compensator.opto.capacitance": self.own,
            "compensator.shunt.dc-gain": self.gain,
            "compensator.shunt.gain-bandwidth": self.limit,
            "compensator.shunt.least-current": 0.8e-3,
            "compensator.shunt.least-voltage": self.reference,
        }
        if self.fast == "none":
            values["compensator.opto.led-supply"] = self.fixed
        for name in ("r2", "c2", "r3", "c3"):
            if getattr(self, name):
                values[f"compensator.{name}"] = getattr(self, name)
        return choices, values


class IsolatedLoop(ControlledLoop):
    """One design closed by an isolated compensator."""

    @property
    def feeding(self):
        """The row of the stage that feeds the LED."""
        return self.model.bank if self.design.network.fast == "bank" else self.model.output

    def responses(self, frequency):
        s = 2j * np.pi * np.atleast_1d(frequency)
        out, _ = self.stage_responses(s)
        feed, _ = self.stage_responses(s, self.feeding)
        slow, fast, from_reference = self.design.network.at(s)
        plant = out[:, 2]
        loop = plant * slow + feed[:, 2] * fast
        # vc = -slow vout - fast vfast + ref vref, with vout and vfast from (vin, io, vc).
        command = -(slow[:, None] * out[:, :2] + fast[:, None] * feed[:, :2]) / (1.0 + loop)[:, None]
        closed = out[:, :2] + plant[:, None] * command
        return {
            "plant": plant,
            "compensator": slow + fast,
            "loop": loop,
            "open_loop_output_impedance": -out[:, 1],
            "output_impedance": -closed[:, 1],
            "open_loop_line_to_output": out[:, 0],
            "line_to_output": closed[:, 0],
            "reference_to_output": plant * from_reference / (1.0 + loop),
        }

    def closed(self):
        a, b, c, d = self.controlled()
        _, _, c_f, d_f = self.controlled(self.feeding)
        a_c, b_c, c_c, _ = self.design.network.state_space()
        n, k = len(a), len(a_c)

        def joined(rows, inputs):
            return np.concatenate([rows, inputs[2] * c_c]), np.array([inputs[0], inputs[1], 0.0])

        out_x, out_u = joined(c, d)
        feed_x, feed_u = joined(c_f, d_f)
        big_a, big_b = np.zeros((n + k, n + k)), np.zeros((n + k, 3))
        big_a[:n, :n] = a
        big_a[:n, n:] = np.outer(b[:, 2], c_c)
        big_b[:n, :2] = b[:, :2]
        big_a[n:, n:] = a_c
        big_a[n:, :] += np.outer(b_c[:, 0], out_x) + np.outer(b_c[:, 2], feed_x)
        big_b[n:, :] = np.outer(b_c[:, 0], out_u) + np.outer(b_c[:, 2], feed_u)
        big_b[n:, 2] += b_c[:, 1]
        return big_a, big_b, out_x, out_u


def check_forms(network, fs):
    """Node equations against state equations; both against the usual formula with a regulator as good as none."""
    f = np.geomspace(fs / 1e5, fs / 2.0, 40)
    s = 1j * TAU * f
    a, b, c, _ = network.state_space()
    slow, fast, reference = network.at(s)
    for k, z in enumerate(s):
        vc = c @ np.linalg.solve(z * np.eye(len(a)) - a, b.astype(complex))
        for got, want in [(-vc[0], slow[k]), (vc[1], reference[k]), (-vc[2], fast[k])]:
            assert abs(got - want) <= 1e-9 * abs(want) + 1e-15, (got, want)
    best = replace(network, gain=1e12, limit=1e16)
    slow, fast, _ = best.at(s)
    assert np.max(np.abs((slow + fast) / best.ideal(s) - 1.0)) < 1e-6


def operating(design, loop):
    """LED and cathode at rest: currents [A], voltage [V]."""
    n = design.network
    led = (n.supply - loop.law.value) / n.pull_up / n.ratio
    cathode = led + (n.drop + n.dynamic * led) / n.bias
    feed = n.fixed if n.fast == "none" else (loop.model.bank.value if n.fast == "bank" else design.regulated)
    return {"led_current": led, "cathode_current": cathode, "cathode_voltage": feed - n.drop - n.dynamic * led - n.led * cathode}


def result(design):
    """As `controlled_results.result`, with both paths and the LED's operating point."""
    choices, values = design.entries()
    fs = design.stage.pulse_frequency
    check_forms(design.network, fs)
    nominal = IsolatedLoop(design, design.vin[1], design.load[1])
    check_state_space(nominal)
    frequencies = np.geomspace(fs / 1e5, fs / 2.0, 30)
    slow, fast, _ = design.network.at(2j * np.pi * frequencies)
    found = {
        "title": design.title,
        "choices": choices,
        "values": values,
        "regulated_output": design.regulated,
        "frequencies_hz": frequencies.tolist(),
        "responses": {name: pairs(curve) for name, curve in nominal.responses(frequencies).items()},
        "slow_path": pairs(slow),
        "fast_path": pairs(fast),
        "conditions": [condition(design, vin, load, IsolatedLoop) for vin in design.vin for load in design.load],
        "operating": operating(design, nominal),
        "poles": pairs(nominal.poles()),
        "steps": nominal.steps(),
        "switched": against_switched(nominal),
    }
    print(design.title, [(round(c["frequency_hz"]), round(float(c["phase_margin_deg"]), 1)) for c in found["conditions"][4]["crossovers"]],
          found["operating"])
    return found


def main():
    from isolated_designs import DESIGNS

    warnings.simplefilter("error")
    write({
        "about": "made by tests/reference/isolated.py; complex values as [real, imaginary]; nominal input, load and transfer ratio; "
                 "conditions: input least, nominal, greatest, and for each the load likewise; switched: against the exact switched stage",
        "designs": [result(design) for design in DESIGNS],
    }, sys.argv[1])


if __name__ == "__main__":
    main()
