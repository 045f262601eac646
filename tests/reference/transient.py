"""The switched closed loop in time, integrated by scipy: every interval by solve_ivp, every switching instant as its event.

    python transient.py OUTPUT.json

The equations of each interval are those of `cells.py` and `stages.py`, joined with sense filter and compensators; the method is DOP853 at a
relative tolerance of 1e-10.  A run starts on the exact periodic orbit (`orbit.py`, which must integrate to itself here) or
at rest, the event at a clock's edge.

Rules.  The clock closes the switch (valley control: opens it).  The comparator, blind during the blanking time, ends the interval a delay
later; a duty ratio's limit ends it at once.  A pulse is left out where the control voltage stands at or below the ramp's valley at the
clock (peak control: at or below the comparator's offset).  A limit of the sensed current trips like the comparator.  An op amp's output is held at
its limit until its drive turns inward; a transconductance amplifier's current saturates, and its output is held likewise.  Load steps are
a current beside the load.
"""

import sys
import warnings
from dataclasses import dataclass, field, replace

import numpy as np
from scipy.integrate import solve_ivp

from controlled import ControlledLoop
from orbit import Orbit
from output import write
from stages import equations

RELATIVE = 1e-10
MOST = 1.0  # of a step, as a share of the fastest mode's time: the interpolation between steps is of lower order than they are
SAMPLES = 300  # times of a run's record


@dataclass
class Limits:
    """Where amplifiers and modulator end."""

    output: tuple = (0.0, 10.0)  # of the outer amplifier [V]
    current: float = np.inf  # of a transconductance amplifier [A]
    inner: tuple = (0.0, 10.0)  # of the inner amplifier [V]
    duty: float = 0.95
    blanking: float = 0.0  # [s]
    clamp: float = np.inf  # of the control voltage [V]
    sensed: float = np.inf  # limit of the sensed current [A]

    def entries(self, design):
        control, opamp = design.control, design.network.amplifier == "op-amp"
        own = "op-amp" if opamp else "transconductance"
        values = {
            f"compensator.{own}.output-least": self.output[0],
            f"compensator.{own}.output-greatest": self.output[1],
            "control.duty.least": 0.0,
            "control.duty.greatest": self.duty,
        }
        if not opamp:
            values["compensator.transconductance.output-current"] = self.current if np.isfinite(self.current) else 1.0
        if control.mode in ("peak-current", "valley-current"):
            values["control.blanking"] = self.blanking
        if control.mode != "voltage" and np.isfinite(self.clamp):
            values["control.clamp"] = self.clamp
        if control.mode == "average-current":
            values |= {"control.inner.output-least": self.inner[0], "control.inner.output-greatest": self.inner[1]}
        if np.isfinite(self.sensed):
            values["control.current-limit"] = self.sensed
        return values


@dataclass
class Ramp:
    """A quantity that changes linearly between given times."""

    start: float
    corners: list = field(default_factory=list)  # (time, value) in order

    def __call__(self, t):
        if not self.corners or t <= self.corners[0][0]:
            return self.start
        for (t0, v0), (t1, v1) in zip(self.corners, self.corners[1:]):
            if t <= t1:
                return v0 + (v1 - v0) * (t - t0) / (t1 - t0)
        return self.corners[-1][1]


def step(start, change, slew, at=0.0):
    return Ramp(start, [(at, start), (at + abs(change) / slew, start + change)])


class Run:
    """One design from a clock's edge on."""

    def __init__(self, design, vin, load, limits, source=None, sink=None, reference=None, ahead=0):
        self.design, self.control, self.limits = design, design.control, limits
        self.loop = loop = ControlledLoop(design, vin, load)
        self.period, self.stage = loop.period, loop.stage
        self.source, self.sink = source or Ramp(vin), sink or Ramp(0.0)
        self.reference = reference or Ramp(design.network.reference)
        self.corners = sorted({t for ramp in (self.source, self.sink, self.reference) for t, _ in ramp.corners})
        self.ahead = ahead
        control = self.control
        found, self.stage_names = equations(self.stage, design.regulated, load)
        n_s = len(self.stage_names)
        self.names = list(self.stage_names) + (["filtered"] if control.filter else [])
        inner = control.inner.state_space() if control.mode == "average-current" else None
        outer = design.network.state_space()
        self.inner = slice(len(self.names), len(self.names) + (len(inner[0]) if inner else 0))
        self.outer = slice(self.inner.stop, self.inner.stop + len(outer[0]))
        n = self.n = self.outer.stop
        # Columns: states, vin, 1, io, vref.
        width = n + 4
        vc = np.zeros(width)
        vc[self.outer] = outer[2]
        self.vc = vc
        self.pieces = {}
        for which, (a, b, c, d) in found.items():
            rows = np.zeros((n, width))
            rows[:n_s, :n_s], rows[:n_s, n:n + 3] = a, b
            out = np.zeros((len(c), width))
            out[:, :n_s], out[:, n:n + 3] = c, d
            sensed = out[1]
            if control.filter:
                rows[n_s] = out[1] / control.filter
                rows[n_s, n_s] -= 1.0 / control.filter
                sensed = np.eye(width)[n_s]
            if inner:
                rows[self.inner, self.inner] = inner[0]
                rows[self.inner] += np.outer(inner[1][:, 0], control.sense * sensed) + np.outer(inner[1][:, 1], vc)
            rows[self.outer, self.outer] = outer[0]
            rows[self.outer] += np.outer(outer[1][:, 0], out[0])
            rows[self.outer, n + 3] += outer[1][:, 1]
            self.pieces[which] = (rows, out[0], sensed)
        self.switched = np.zeros(n)
        self.switched[:n_s] = self.stage.sensed(self.stage_names)
        # Amplifiers: (state held, its limits, drive's name).
        self.amplifiers = [(self.outer.start, limits.output)] + ([(self.inner.start, limits.inner)] if inner else [])
        self.fastest = max(np.max(np.abs(np.linalg.eigvals(rows[:, :n]))) for rows, _, _ in self.pieces.values())
        self.held = [0] * len(self.amplifiers)
        self.saturated = 0
        self.records = []

    # --- equations of the moment ------------------------------------------------------------------------------------

    def inputs(self, t):
        return np.array([self.source(t), 1.0, self.sink(t), self.reference(t)])

    def vector(self, t, x):
        return np.concatenate([x, self.inputs(t)])

    def drive_rows(self, which):
        """The equations, a transconductance amplifier's current as saturated as it is."""
        rows = self.pieces[which][0]
        network = self.design.network
        if self.saturated:
            rows = rows.copy()
            # gm (vref - vfb) gives way to the limit.
            rows[self.outer.start] += (self.saturated * self.limits.current * np.eye(self.n + 4)[self.n + 1] - self.ota(which)) / network.c2
        return rows

    def ota(self, which):
        """Row of a transconductance amplifier's current, were it not limited."""
        network = self.design.network
        plain = replace(network, gain=0.0)
        a, b, _, _ = network.state_space()
        a0, b0, _, _ = plain.state_space()
        row = np.zeros(self.n + 4)
        row[self.outer] = (a - a0)[0] * network.c2
        row += (b - b0)[0, 0] * network.c2 * self.pieces[which][1]
        row[self.n + 3] += (b - b0)[0, 1] * network.c2
        return row

    def held_rows(self, which):
        rows = self.drive_rows(which).copy()
        for (state, _), held in zip(self.amplifiers, self.held):
            if held:
                rows[state] = 0.0
        return rows

    def compared(self, which):
        """Row whose value less the ramp is the comparator's margin."""
        control = self.control
        seen = control.divider * (self.vc - control.offset * np.eye(self.n + 4)[self.n + 1])
        if control.mode == "voltage":
            return seen
        if control.mode == "average-current":
            row = np.zeros(self.n + 4)
            row[self.inner] = control.inner.state_space()[2]
            return row
        return seen - control.sense * self.pieces[which][2]

    # --- integration ------------------------------------------------------------------------------------------------

    def integrate(self, which, t, until, x, stops):
        """Until a time or the first of `stops` (functions of (t, x), from positive to negative); amplifier limits taken on the way.

        Gives time, state and the index of what stopped it, or None.
        """
        while t < until - 1e-15 * max(abs(until), self.period):
            stop_at = min([until] + [c for c in self.corners if t + 1e-13 * self.period < c])
            rows = self.held_rows(which)
            a, b = rows[:, :self.n], rows[:, self.n:]
            events = [*stops]
            changes = []
            for k, (state, (least, greatest)) in enumerate(self.amplifiers):
                if self.held[k]:
                    drive = self.drive_rows(which)[state]
                    sign = self.held[k]
                    # Its drive turns inward.
                    changes.append((k, 0))
                    events.append(lambda tt, xx, drive=drive, sign=sign: sign * (drive @ self.vector(tt, xx)))
                else:
                    changes += [(k, 1), (k, -1)]
                    events.append(lambda tt, xx, state=state, level=greatest: level - xx[state])
                    events.append(lambda tt, xx, state=state, level=least: xx[state] - level)
            if np.isfinite(self.limits.current):
                row = self.ota(which)
                most = self.limits.current
                if self.saturated:
                    changes.append(("current", 0))
                    events.append(lambda tt, xx, s=self.saturated: s * (row @ self.vector(tt, xx)) - most)
                else:
                    changes += [("current", 1), ("current", -1)]
                    events += [lambda tt, xx: most - row @ self.vector(tt, xx), lambda tt, xx: most + row @ self.vector(tt, xx)]
            # What is past its stop already stops at once.
            for k, event in enumerate(stops):
                if event(t, x) <= 0.0:
                    return t, x, k
            switched = False
            for event, (what, to) in zip(events[len(stops):], changes):
                # Past it by more than the instant's own rounding: an edge took it there.
                if event(t, x) < -1e-9 * (self.limits.current if what == "current" else 1.0):
                    self.change(what, to)
                    switched = True
                    break
            if switched:
                continue
            wrapped = []
            for event in events:
                def stop(tt, xx, event=event):
                    return event(tt, xx)
                stop.terminal, stop.direction = True, -1
                wrapped.append(stop)
            solution = solve_ivp(lambda tt, xx: a @ xx + b @ self.inputs(tt), (t, stop_at), x, method="DOP853", rtol=RELATIVE,
                                 atol=1e-12 * np.maximum(np.abs(self.scale), 1e-6), events=wrapped, dense_output=True, max_step=MOST / self.fastest)
            assert solution.success
            self.record(which, t, solution)
            t, x = solution.t[-1], solution.y[:, -1]
            fired = [k for k, times in enumerate(solution.t_events) if len(times)]
            if fired:
                k = fired[0]
                if k < len(stops):
                    return t, x, k
                what, to = changes[k - len(stops)]
                if what != "current" and to:
                    state, limits = self.amplifiers[what]
                    x = x.copy()
                    x[state] = limits[0 if to < 0 else 1]
                self.change(what, to)
        return t, x, None

    def change(self, what, to):
        if what == "current":
            self.saturated = to
        else:
            self.held[what] = to

    def record(self, which, start, solution):
        out = self.pieces[which][1]
        while self.wanted and self.wanted[0] < solution.t[-1]:
            t = self.wanted.pop(0)
            x = solution.sol(t)
            v = self.vector(t, x)
            self.records.append([t, out @ v, self.first @ x, self.vc @ v])

    def trips(self, which, since):
        """Stops of the conducting (valley: the freewheeling) interval: the comparator, the limit of the sensed current."""
        control, row = self.control, self.compared(which)
        if control.mode in ("voltage", "average-current"):
            slope = control.ramp / self.period
        else:
            slope = control.slope if control.mode == "peak-current" else -control.slope
        sign = -1.0 if control.mode == "valley-current" else 1.0
        stops = [lambda t, x: sign * (row @ self.vector(t, x) - slope * (t - since))]
        if np.isfinite(self.limits.sensed) and control.mode != "valley-current":
            sensed = self.pieces[which][2]
            stops.append(lambda t, x: self.limits.sensed - sensed @ self.vector(t, x))
        return stops

    def left_out(self, t, x):
        """Whether the clock's pulse does not come."""
        control = self.control
        if control.mode == "valley-current":
            return False
        v = self.vector(t, x)
        level = self.compared("on") @ v if control.mode != "peak-current" else self.vc @ v - control.offset
        return level <= 0.0

    def rest(self, t, until, x):
        """Freewheeling until a time; a diode's current may come to rest."""
        if self.stage.rectifier == "synchronous" or self.resting:
            return self.integrate("idle" if self.resting else "off", t, until, x, [])[:2]
        t, x, fired = self.integrate("off", t, until, x, [lambda tt, xx: self.switched @ xx])
        if fired is None:
            return t, x
        self.resting = True
        return self.integrate("idle", t, until, x, [])[:2]

    def go(self, x, until, times):
        self.wanted = list(times)
        self.scale = np.abs(x) + 1e-3
        names = np.zeros(self.n)
        names[0] = 1.0
        self.first = names
        self.resting = False
        delay, duty = self.design.delay, self.limits.duty
        self.pulses = []
        clock = -self.ahead
        while clock * self.period < until:
            t, end = clock * self.period, (clock + 1) * self.period
            if self.control.mode == "valley-current":
                t1, x, fired = self.integrate("off", t, end, x, self.trips("off", t))
                if fired is not None:
                    t1, x, _ = self.integrate("off", t1, min(t1 + delay, end), x, [])
                    self.pulses.append((end - t1) / self.period)
                    t1, x, _ = self.integrate("on", t1, end, x, [])
            else:
                opened = t
                if not self.left_out(t, x):
                    self.resting = False
                    longest = t + duty * self.period
                    t1, x, _ = self.integrate("on", t, min(t + self.limits.blanking, longest), x, [])
                    t1, x, fired = self.integrate("on", t1, longest, x, self.trips("on", t))
                    if fired is not None:
                        t1, x, _ = self.integrate("on", t1, min(t1 + delay, longest), x, [])
                    opened = t1
                _, x = self.rest(opened, end, x)
                self.pulses.append((opened - t) / self.period)
            clock += 1
        return x


def on_orbit(design, vin, load, limits):
    """The state at the clock of the closed loop's exact periodic orbit, in this script's order of states.

    Where an amplifier's gain makes the orbit's duty ratio hard to tell, one Newton step with the integrator's own period betters it.
    """
    orbit = Orbit(ControlledLoop(design, vin, load), closed=True)
    start = orbit.start
    for bound in (1e-7, 1e-9):
        again = Run(design, vin, load, limits)
        moved = again.go(start, 0.9 * again.period, []) - start
        assert np.max(np.abs(moved) / (np.abs(start) + 1e-2)) < bound, (design.stage, moved)
        start = start + np.linalg.solve(np.eye(len(start)) - orbit.perturbed(0.0)[0].real, moved)
    return start


def run(case):
    design, vin, load = case["design"], case["vin"], case["load"]
    limits = case.get("limits", Limits())
    choices, values = design.entries()
    values = values | limits.entries(design) | case.get("values", {})
    runner = Run(design, vin, load, limits, case.get("source"), case.get("sink"), case.get("reference"), case.get("ahead", 0))
    period = runner.period
    start = case["start"](runner) if "start" in case else on_orbit(design, vin, load, limits)
    span = case["periods"] * period
    # No multiple of the period, so that no time stands at a clock's edge.
    times = (np.arange(SAMPLES) + 0.5) * span / SAMPLES + 0.137 * period
    runner.go(start, times[-1] + period, times)
    records = np.array(runner.records)
    assert len(records) == SAMPLES
    print(f"{case['title']}: output {records[:, 1].min():.4f} to {records[:, 1].max():.4f}, current {records[:, 2].min():.3f} to "
          f"{records[:, 2].max():.3f}, control {records[:, 3].min():.3f} to {records[:, 3].max():.3f}, duty {min(runner.pulses):.3f} to "
          f"{max(runner.pulses):.3f}, rested {runner.resting}")
    return {
        "title": case["title"], "choices": choices, "values": values, "input_voltage": vin, "load_current": load,
        "event": case["event"], "times_s": records[:, 0].tolist(), "output_voltage_v": records[:, 1].tolist(),
        "inductor_current_a": records[:, 2].tolist(), "control_voltage_v": records[:, 3].tolist(),
        "duty": [min(runner.pulses), max(runner.pulses)],
    }


def main():
    from transient_cases import CASES

    warnings.simplefilter("error")
    write({
        "about": "made by tests/reference/transient.py: waveforms of switched closed loops by scipy's solve_ivp; time from the event's begin, "
                 "which is a clock's edge on the exact periodic orbit (start-up: rest)",
        "cases": [run(case) for case in CASES],
    }, sys.argv[1])


if __name__ == "__main__":
    main()
