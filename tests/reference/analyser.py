"""Switched closed loops as a gain/phase analyser reads them, exact: loop gain, output impedance, line and reference response, multipliers;
and what flows in a steady period.

    python analyser.py OUTPUT.json

An `Orbit` with its outer compensator, perturbed by a sine on any input: written as exp(jwt) xi(t), xi repeats with the period; its mean, with
the pulses of jumping outputs, is what an analyser reads.  The loop gain is read at an injection in series with the compensator's output:
-(returned)/(injected and returned).  No averaging, no sideband dropped.

Low-frequency checks on the way: reference- and line-to-output tend to the slope of the exact steady output, found by moving the input.
Source of the method: sampled-data modelling, Brown & Middlebrook 1981, and time-varying transfer functions, Tymerski 1994 (from memory).
"""

import sys
import warnings
from dataclasses import replace

import numpy as np
from scipy.linalg import expm
from scipy.optimize import minimize_scalar

from closed_loop import pairs
from controlled import ControlledLoop
from controlled_designs import CURRENT_MODE, DISCONTINUOUS, FILTERS
from isolated import IsolatedLoop
from orbit import Orbit
from output import write
from stages import equations

TAU = 2.0 * np.pi
COLUMNS = ("injected", "vin", "io", "vref")


class Analyser(Orbit):
    """A closed orbit with what moves it and what is read."""

    def __init__(self, loop):
        super().__init__(loop, closed=True)
        design, control, n = loop.design, self.control, self.n
        found, names = equations(loop.stage, design.regulated, loop.load, not self.discontinuous)
        assert not design.feedforward
        n_s = len(names)
        inner = control.inner.state_space() if control.mode == "average-current" else None
        outer = design.network.state_space()
        at = n_s + int(control.filter > 0.0)
        i_slot = slice(at, at + (len(inner[0]) if inner else 0))
        o_slot = slice(i_slot.stop, n)
        self.control_row = np.zeros(n)
        self.control_row[o_slot] = outer[2]
        self.drives, self.direct = {}, {}
        for which, (_, b, _, d) in found.items():
            drive = np.zeros((n, len(COLUMNS)))
            drive[:n_s, 1], drive[:n_s, 2] = b[:, 0], b[:, 2]
            if inner:
                drive[i_slot, 0] = control.divider * inner[1][:, 1]
            # What feeds the regulated voltage, and an LED, straight from the inputs.
            fed = np.outer(outer[1][:, 0], d[0])
            if outer[1].shape[1] > 2:
                fed = fed + np.outer(outer[1][:, 2], d[3 if design.network.fast == "bank" else 0])
            drive[o_slot, 1] += fed[:, 0]
            drive[o_slot, 2] += fed[:, 2]
            drive[o_slot, 3] += outer[1][:, 1]
            self.drives[which] = drive
            self.direct[which] = np.array([0.0, d[0, 0], d[0, 2], 0.0])
        self.compare_direct = np.array([0.0 if inner else control.divider, 0.0, 0.0, 0.0])

    def answers(self, frequency):
        """Output voltage, and control voltage with what is injected, from each of `COLUMNS`."""
        n, k = self.n, len(COLUMNS)
        omega = TAU * frequency
        given = np.array([1.0, self.vc])
        psi = np.hstack([np.eye(n), np.zeros((n, k))]).astype(complex)
        unit = np.hstack([np.zeros((k, n)), np.eye(k)])
        read = np.zeros((2, n + k), complex)
        read[1, n] = self.period
        phases = self.phases(self.duty, self.second)
        trip = None
        for p, (which, length, event) in enumerate(phases):
            a, b1, bv, out = self.intervals[which]
            rotated = a - 1j * omega * np.eye(n)
            # The exponential, its integral and that one's in one, for an interval may hold a current that nothing damps.
            grown = np.zeros((3 * n, 3 * n), complex)
            grown[:n, :n], grown[:n, n:2 * n], grown[n:2 * n, 2 * n:] = rotated, np.eye(n), np.eye(n)
            grown = expm(grown * length)
            step, once, twice = grown[:n, :n], grown[:n, n:2 * n], grown[:n, 2 * n:]
            drive = self.drives[which] @ unit
            after = step @ psi + once @ drive
            integral = once @ psi + twice @ drive
            read[0] += out[:n] @ integral + self.direct[which] @ unit * length
            read[1] += self.control_row @ integral
            psi = after
            state = self.ends[p]
            slope = a @ state + np.column_stack([b1, bv]) @ given
            if event == "compare":
                margin = self.compare[:n] @ slope - self.slope
                trip = -(self.compare[:n] @ psi + self.compare_direct @ unit) / margin * np.exp(-1j * omega * self.delay)
                continue
            if event == "clock":
                psi = self.turn @ psi
                continue
            moved = -(self.switched @ psi) / (self.switched @ slope) if event == "zero" else trip
            following = self.intervals[phases[p + 1][0]]
            after = following[0] @ state + np.column_stack([following[1], following[2]]) @ given
            psi = psi + np.outer(slope - after, moved)
            read[0] += (out - following[3]) @ np.concatenate([state, given]) * moved
        start = np.linalg.solve(np.eye(n) - psi[:, :n], psi[:, n:])
        return (read[:, :n] @ start + read[:, n:]) / self.period

    def read(self, frequencies):
        answers = np.array([self.answers(f) for f in frequencies])
        total = answers[:, 1, 0]
        return {
            "loop": (1.0 - total) / total,
            "output_impedance": -answers[:, 0, 2],
            "line_to_output": answers[:, 0, 1],
            "reference_to_output": answers[:, 0, 3],
        }

    def figures(self):
        """First inductor and output over a steady period: least, greatest, mean and RMS."""
        x, first, output = self.start, [], []
        nodes, weights = np.polynomial.legendre.leggauss(16)
        mean, square, mean_v, square_v = 0.0, 0.0, 0.0, 0.0
        for which, length, _ in self.phases(self.duty, self.second):
            a, b1, bv, out = self.intervals[which]
            grown = np.zeros((self.n + 1, self.n + 1))
            grown[:self.n, :self.n], grown[:self.n, self.n] = a, b1 + bv * self.vc

            def at(t, grown=grown, x=x):
                return expm(grown * t) @ np.append(x, 1.0)

            def volts(t, out=out):
                return out[:self.n + 1] @ at(t) + out[self.n + 1] * self.vc

            pieces = 12
            for j in range(pieces):
                t = (j + 0.5 * (nodes + 1.0)) * length / pieces
                states = np.array([at(v) for v in t])
                w = weights * length / pieces / 2.0
                v = states @ out[:self.n + 1] + out[self.n + 1] * self.vc
                mean, square = mean + w @ states[:, 0], square + w @ states[:, 0] ** 2
                mean_v, square_v = mean_v + w @ v, square_v + w @ v**2
            grid = np.linspace(0.0, length, 41)
            for name, function in [(first, lambda t: at(t)[0]), (output, volts)]:
                values = np.array([function(t) for t in grid])
                name += [values[0], values[-1]]
                for sign in (1.0, -1.0):
                    k = int(np.argmax(sign * values))
                    if 0 < k < len(grid) - 1:
                        best = minimize_scalar(lambda t: -sign * function(t), bounds=(grid[k - 1], grid[k + 1]), method="bounded",
                                               options={"xatol": 1e-13 * length})
                        name.append(-sign * best.fun)
            x = at(length)[:self.n]
        period = self.period
        return {
            "first_inductor": [min(first), max(first), mean / period, np.sqrt(square / period)],
            "output_voltage": [min(output), max(output), mean_v / period, np.sqrt(square_v / period)],
        }


def check_slow(analyser, loop, design):
    """At rest the responses are the slopes of the exact steady output."""
    slow = analyser.read(np.array([loop.stage.pulse_frequency * 1e-7]))

    def output(vin, reference):
        moved = replace(design, network=replace(design.network, reference=reference))
        # The compensator alone moves: the stage stays what it was.
        shifted = type(loop)(design, vin, loop.load)
        shifted.design = moved
        shifted.stage, shifted.vin = loop.stage, vin
        moved.__class__ = Held
        moved.held = design.regulated
        return Orbit(shifted, closed=True).mean

    step = 1e-4
    vref = design.network.reference
    by_reference = (output(loop.vin, vref * (1 + step)) - output(loop.vin, vref * (1 - step))) / (2 * step * vref)
    assert abs(slow["reference_to_output"][0].real / by_reference - 1.0) < 1e-6, (design.title, slow["reference_to_output"], by_reference)
    by_line = (output(loop.vin * (1 + step), vref) - output(loop.vin * (1 - step), vref)) / (2 * step * loop.vin)
    scale = design.regulated / loop.vin * 1e-7
    assert abs(slow["line_to_output"][0].real - by_line) < 1e-6 * abs(by_line) + scale, (design.title, slow["line_to_output"], by_line)


class Held(type(FILTERS[0])):
    """A design whose load and stage stay at the voltage they were written for."""

    held = 0.0

    @property
    def regulated(self):
        return self.held


def result(design):
    kind = IsolatedLoop if design.network.amplifier == "shunt-regulator" else ControlledLoop
    loop = kind(design, design.vin[1], design.load[1])
    analyser = Analyser(loop)
    check_slow(analyser, loop, design)
    fs = loop.stage.pulse_frequency
    frequencies = fs * np.array([1e-3, 3e-3, 0.01, 0.03, 0.07, 0.13, 0.2, 0.31, 0.42, 0.48, 0.77, 1.3])
    read = analyser.read(frequencies)
    multipliers = analyser.multipliers()
    averaged = loop.responses(frequencies)["loop"]
    apart = np.abs(20.0 * np.log10(np.abs(read["loop"] / averaged)))
    print(f"{design.title}: loop from the averaged one {apart[:4].max():.2f} dB to 0.03 fs, {apart[:7].max():.2f} dB to fs/5, greatest "
          f"multiplier {multipliers[0]:.4f}")
    choices, values = design.entries()
    return {
        "title": design.title, "choices": choices, "values": values, "duty": float(analyser.duty),
        "mean_output": float(analyser.mean), "frequencies_hz": frequencies.tolist(),
        "responses": {name: pairs(curve) for name, curve in read.items()},
        "plant": pairs(Orbit(loop).plant(frequencies)),
        "multipliers": pairs(sorted((z for z in multipliers if abs(z) > 1e-4), key=lambda z: (-round(abs(z), 9), z.imag))),
        "figures": {name: [float(v) for v in row] for name, row in analyser.figures().items()},
    }


def main():
    from isolated_designs import DESIGNS as ISOLATED
    from topology_designs import INDUCTIVE

    warnings.simplefilter("error")
    # One voltage is taken as the output here, and one current as the switch's: no line feed-forward of the ramp.
    chosen = [d for d in [*DISCONTINUOUS, *CURRENT_MODE, *FILTERS, *INDUCTIVE, *ISOLATED[:3]] if not d.feedforward]
    write({
        "about": "made by tests/reference/analyser.py: exact closed loops; complex values as [real, imaginary]; figures: least, greatest, mean, RMS",
        "designs": [result(design) for design in chosen],
    }, sys.argv[1])


if __name__ == "__main__":
    main()
