"""Switched stages under control without averaging: the orbit that repeats, and small changes of it, exact.

Each interval is solved by the matrix exponential.  An interval ends at the clock, where the comparator trips (delayed), or where the
current reaches zero; when an end moves by tau, the state behind it changes by (slope before - slope after) tau and the output has a pulse of
(output before - output after) tau.  That gives the map of a small change over one period, whose eigenvalues tell stability, and the
answer to a small sine on the control voltage: with every change written as exp(j w t) xi(t), xi repeats with the period, and its mean,
pulses included, is the response an analyser reads at w.  Neither ripple nor speed is assumed small.
"""

import numpy as np
from scipy.linalg import expm
from scipy.optimize import brentq

from cells import FORWARD_FAMILY
from conduction import full
from stages import equations


def magnetise(stage, control, found, names):
    """Adds a transformer's magnetising current where a sensor in the switch reads it; also what becomes of each state at the clock.

    A forward converter's current starts from zero every period, a double-ended one's reverses with every pulse.
    """
    if stage.topology not in FORWARD_FAMILY or control.mode != "peak-current" or not np.isfinite(stage.magnetising):
        return names, np.ones(len(names))
    n = len(names)
    for which, (a, b, c, d) in found.items():
        wide = np.zeros((n + 1, n + 1))
        wide[:n, :n] = a
        wide[n, :n] = c[4] / stage.magnetising
        read = np.zeros((len(c), 1))
        read[1] = 1.0 if which == "on" else 0.0
        found[which] = (wide, np.vstack([b, d[4] / stage.magnetising]), np.hstack([c, read]), d)
    return [*names, "im"], np.append(np.ones(n), 0.0 if stage.topology == "forward" else -1.0)


class Orbit:
    """The periodic orbit of one `ControlledLoop` at its output voltage; `closed` includes the outer compensator."""

    def __init__(self, loop, closed=False):
        design, control = loop.design, loop.control
        self.loop, self.closed, self.control = loop, closed, control
        self.since = 0.0  # how old the comparator's interval is when the orbit begins [s]
        self.period, self.delay = loop.period, design.delay
        stage = loop.stage
        self.discontinuous = loop.model.conduction == "discontinuous"
        found, names = equations(stage, design.regulated, loop.load, not self.discontinuous)
        names, turn = magnetise(stage, control, found, names)
        u = full(loop.vin)
        n_s = len(names)
        filtered = control.filter > 0.0
        inner = control.inner.state_space() if control.mode == "average-current" else None
        outer = design.network.state_space() if closed else None
        n = n_s + int(filtered) + (len(inner[0]) if inner else 0) + (len(outer[0]) if outer else 0)
        self.switched = np.zeros(n)
        self.switched[:n_s] = stage.sensed(names)
        # What becomes of the state from the end of one period to the start of the next.
        self.turn = np.eye(n)
        self.turn[:n_s, :n_s] = np.diag(turn)
        self.n, width = n, n + 2  # columns: states, the constant 1, the control voltage where it is given
        at = n_s + int(filtered)
        i_slot = slice(at, at + (len(inner[0]) if inner else 0))
        o_slot = slice(i_slot.stop, n)

        def row(k):
            return np.eye(width)[k]

        vc = row(n + 1)
        if closed:
            vc = np.zeros(width)
            vc[o_slot] = outer[2]
        # What the comparator is given of it.
        vc = control.divider * (vc - control.offset * row(n))
        self.intervals = {}
        for which, (a, b, c, d) in found.items():
            stage_rows, outputs = np.zeros((n_s, width)), np.zeros((len(c), width))
            stage_rows[:, :n_s], stage_rows[:, n] = a, b @ u
            outputs[:, :n_s], outputs[:, n] = c, d @ u
            rows = np.zeros((n, width))
            rows[:n_s] = stage_rows
            if filtered:
                rows[n_s] = (outputs[1] - row(n_s)) / control.filter
            sensed = row(n_s) if filtered else np.zeros(width)
            if not filtered:
                sensed[:n_s] = c[1]
            if inner:
                rows[i_slot, i_slot] = inner[0]
                rows[i_slot] += np.outer(inner[1][:, 0], control.sense * sensed) + np.outer(inner[1][:, 1], vc)
            if outer:
                rows[o_slot, o_slot] = outer[0]
                rows[o_slot] += np.outer(outer[1][:, 0], outputs[0])
                rows[o_slot, n] += outer[1][:, 1] * design.network.reference
                if outer[1].shape[1] > 2:
                    # Isolated feedback: what feeds the LED, and its constants.
                    rows[o_slot] += np.outer(outer[1][:, 2], outputs[3 if design.network.fast == "bank" else 0])
                    rows[o_slot, n] += outer[1][:, 3]
            self.intervals[which] = (rows[:, :n], rows[:, n], rows[:, n + 1], outputs[0])
        # The comparator trips where compare . (states, 1, vc) = ramp slope . time since its interval began.
        if control.mode == "voltage":
            self.compare, self.slope = vc, control.ramp / self.period
        elif control.mode == "average-current":
            self.compare, self.slope = np.zeros(width), control.ramp / self.period
            self.compare[i_slot] = inner[2]
        else:
            read = np.zeros(width)
            read[:n_s] = found["on"][2][1]
            read = row(n_s) if filtered else read
            self.compare = vc - control.sense * read
            self.slope = control.slope if control.mode == "peak-current" else -control.slope
        self._find()

    def phases(self, duty, second):
        """[(interval, length [s], event at its end)] in order from the clock."""
        t_on, t_off = duty * self.period, second * self.period
        if self.control.mode == "valley-current" and not self.discontinuous:
            return [("off", t_off - self.delay, "compare"), ("off", self.delay, "switch on"), ("on", t_on, "clock")]
        start = [("on", t_on - self.delay, "compare"), ("on", self.delay, "switch off")]
        if self.discontinuous:
            return [*start, ("off", t_off, "zero"), ("idle", self.period - t_on - t_off, "clock")]
        return [*start, ("off", t_off, "clock")]

    def _advance(self, which, length):
        """Maps of the state: from itself, from (1, vc), and the integrals of both."""
        a, b1, bv, _ = self.intervals[which]
        n = self.n
        m = np.zeros((2 * n + 2, 2 * n + 2))
        m[:n, :n], m[:n, n], m[:n, n + 1] = a, b1, bv
        m[n + 2:, :n] = np.eye(n)
        return expm(m * length)

    def _repeat(self, duty, second, vc):
        """The repeating state at the clock, its values at the ends of the phases, and the mean output."""
        n = self.n
        steps = [(which, length, self._advance(which, length)) for which, length, _ in self.phases(duty, second)]
        given = np.array([1.0, vc])
        f, g = np.eye(n), np.zeros(n)
        for _, _, step in steps:
            f, g = step[:n, :n] @ f, step[:n, :n] @ g + step[:n, n:n + 2] @ given
        start = np.linalg.solve(np.eye(n) - self.turn @ f, self.turn @ g)
        state, ends, total = start, [], 0.0
        for which, length, step in steps:
            c = self.intervals[which][3]
            integral = step[n + 2:, :n] @ state + step[n + 2:, n:n + 2] @ given
            total += c[:n] @ integral + (c[n] + c[n + 1] * vc) * length
            state = step[:n, :n] @ state + step[:n, n:n + 2] @ given
            ends.append(state)
        return start, ends, total / self.period

    def _trip(self, ends, duty, second, vc):
        """How far the comparator is from tripping where it should [V]."""
        length = self.phases(duty, second)[0][1]
        return self.compare @ np.concatenate([ends[0], [1.0, vc]]) - self.slope * (length + self.since)

    def bracket(self, duty):
        """Where to look for the exact duty ratio."""
        return 0.85 * duty, min(1.15 * duty, 0.5 + 0.5 * duty)

    def _find(self):
        model = self.loop.model
        target = self.loop.design.regulated

        def second_of(duty, vc):
            if not self.discontinuous:
                return 1.0 - duty
            return brentq(lambda d2: self.switched @ self._repeat(duty, d2, vc)[1][2], 0.5 * model.second,
                          min(1.5 * model.second, 1.0 - duty), xtol=1e-15, rtol=1e-14)

        # An open loop is held at its output voltage; a closed one finds it, through the comparator.
        if self.closed:
            def off(duty):
                second = second_of(duty, 0.0)
                return self._trip(self._repeat(duty, second, 0.0)[1], duty, second, 0.0)

            duty = brentq(off, *self.bracket(model.duty), xtol=1e-15, rtol=1e-14)
            vc = 0.0
        else:
            def off(duty):
                return self._repeat(duty, second_of(duty, 0.0), 0.0)[2] - target

            duty = brentq(off, *self.bracket(model.duty), xtol=1e-15, rtol=1e-14)
            second = second_of(duty, 0.0)
            at = [self._trip(self._repeat(duty, second, vc)[1], duty, second, vc) for vc in (0.0, 1.0)]
            vc = at[0] / (at[0] - at[1])
        self.duty, self.second, self.vc = duty, second_of(duty, vc), vc
        self.start, self.ends, self.mean = self._repeat(duty, self.second, vc)

    def perturbed(self, omega):
        """Map of a small change over one period, and the output's answer to a sine on the control voltage (open loop)."""
        n = self.n
        given = np.array([1.0, self.vc])
        psi = np.hstack([np.eye(n), np.zeros((n, 1))]).astype(complex)
        read = np.zeros(n + 1, complex)
        phases = self.phases(self.duty, self.second)
        trip = None
        for k, (which, length, event) in enumerate(phases):
            a, b1, bv, c = self.intervals[which]
            rotated = a - 1j * omega * np.eye(n)
            step = expm(rotated * length)
            if omega:
                drive = np.outer(bv, np.eye(n + 1)[n])
                forced = np.linalg.solve(rotated, step - np.eye(n)) @ drive
                after = step @ psi + forced
                read += c[:n] @ np.linalg.solve(rotated, after - psi - drive * length)
                read[n] += c[n + 1] * length
                psi = after
            else:
                psi = step @ psi
            state = self.ends[k]
            slope = a @ state + np.column_stack([b1, bv]) @ given
            if event == "compare":
                margin = self.compare[:n] @ slope - self.slope
                trip = -(self.compare[:n] @ psi + self.compare[n + 1] * np.eye(n + 1)[n]) / margin
                trip = trip * np.exp(-1j * omega * self.delay)
                continue
            if event == "clock":
                psi = self.turn @ psi
                continue
            moved = -(self.switched @ psi) / (self.switched @ slope) if event == "zero" else trip
            following = self.intervals[phases[k + 1][0]]
            slope_after = following[0] @ state + np.column_stack([following[1], following[2]]) @ given
            psi = psi + np.outer(slope - slope_after, moved)
            pulse = (c - following[3]) @ np.concatenate([state, given])
            read += pulse * moved
        return psi[:, :n], psi[:, n], read / self.period

    def multipliers(self):
        """Eigenvalues of the map of a small change over one period, greatest first."""
        found = np.linalg.eigvals(self.perturbed(0.0)[0])
        return found[np.argsort(-np.abs(found))]

    def plant(self, frequencies):
        """Control voltage to output at the frequencies [Hz], as an analyser reads it."""
        answers = []
        for f in frequencies:
            omega = 2.0 * np.pi * f
            phi, gamma, read = self.perturbed(omega)
            start = np.linalg.solve(np.eye(self.n) - phi, gamma)
            answers.append(read[:self.n] @ start + read[self.n])
        return np.array(answers)
