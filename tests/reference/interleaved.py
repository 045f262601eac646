"""N equal phases driven a period's Nth apart, each drawn by itself: the exact orbit that `orbit.py` finds of one switched current.

The orbit repeats after T/N with the phases renamed: phase k is the one whose switch closed k windows ago.  One phase's switch opens in a
window, m = floor(N d) windows after it closed.
"""

from dataclasses import replace

import numpy as np

from cells import Cell, cell
from conduction import full
from orbit import Orbit
from stages import equations


def many(stage, conducting):
    """Cell of N phases, of which those in `conducting` have their switch closed, as a function of (row, one)."""
    lone = replace(stage, phases=1)

    def make(row, one):
        parts = [cell(lone, "on" if k in conducting else "off", lambda name, k=k: row(f"i{k}"), one) for k in range(stage.phases)]

        def slopes(v_in, v_out):
            return {f"i{k}": part.slopes(v_in, v_out)["iL"] for k, part in enumerate(parts)}

        return Cell(sum(part.drawn for part in parts), sum(part.delivered for part in parts), slopes)

    return make


class Interleaved(Orbit):
    """The orbit of one `ControlledLoop` whose stage has several phases, in continuous conduction under voltage or peak-current control."""

    def __init__(self, loop, closed=False):
        design, control, stage = loop.design, loop.control, loop.stage
        assert control.mode in ("voltage", "peak-current") and loop.model.conduction == "continuous"
        count = stage.phases
        self.loop, self.closed, self.control = loop, closed, control
        self.discontinuous = False
        self.period, self.delay = loop.period / count, design.delay
        self.opens = int(np.floor(count * loop.model.duty))
        self.since = self.opens * self.period
        found, names = equations(stage, design.regulated, loop.load, cells=([f"i{k}" for k in range(count)], {
            "on": many(stage, range(self.opens + 1)), "off": many(stage, range(self.opens))}))
        u, n_s = full(loop.vin), len(names)
        filters = count if control.filter else 0
        outer = design.network.state_space() if closed else None
        n = n_s + filters + (len(outer[0]) if outer else 0)
        self.n, width = n, n + 2
        vc = np.eye(width)[n + 1]
        if closed:
            vc = np.zeros(width)
            vc[n_s + filters:n] = outer[2]
        vc = control.divider * (vc - control.offset * np.eye(width)[n])
        self.intervals = {}
        for which, (a, b, c, d) in found.items():
            rows, output = np.zeros((n, width)), np.zeros(width)
            rows[:n_s, :n_s], rows[:n_s, n] = a, b @ u
            output[:n_s], output[n] = c[0], d[0] @ u
            for k in range(filters):
                # What flows in the switch is sensed while it conducts, and on into the rectifier.
                rows[n_s + k, k] = 1.0 / control.filter
                rows[n_s + k, n_s + k] = -1.0 / control.filter
            if outer:
                slot = slice(n_s + filters, n)
                rows[slot, slot] = outer[0]
                rows[slot] += np.outer(outer[1][:, 0], output)
                rows[slot, n] += outer[1][:, 1] * design.network.reference
            self.intervals[which] = (rows[:, :n], rows[:, n], rows[:, n + 1], output)
        self.compare = vc.copy()
        self.slope = control.ramp / loop.period
        if control.mode == "peak-current":
            self.compare[(n_s if filters else 0) + self.opens] -= control.sense
            self.slope = control.slope
        # Renamed at the end of a window.
        self.turn = np.eye(n)
        for start in [0] + ([n_s] if filters else []):
            self.turn[start:start + count, start:start + count] = np.roll(np.eye(count), 1, axis=0)
        self.switched = np.eye(n)[0]
        self._find()

    def phases(self, duty, second):
        on = duty * self.loop.period - self.since
        assert self.delay < on < self.period, "a switch opens at the edge of a window"
        return [("on", on - self.delay, "compare"), ("on", self.delay, "switch off"), ("off", self.period - on, "clock")]

    def bracket(self, duty):
        low, high = super().bracket(duty)
        start, share = self.since / self.loop.period, self.period / self.loop.period
        late = 1.01 * self.delay / self.loop.period
        return max(low, start + late), min(high, start + share - late)
