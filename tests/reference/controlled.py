"""Stages under voltage, peak-current, valley-current and average-current control: from control voltage to output, averaged.

Current mode in continuous conduction, derived.  In one period the current is its local average s plus a triangle of slopes M d' (on)
and -M d (off), M = on slope less off slope, because s' = (on slope) - M d'.  The comparator trips at t_c, the switch follows after the
delay td.  Peak control compares, through the sense gain Ri and the sense filter F = 1/(1 + s tau), with the control voltage less the ramp:

    vc(t_c) = Ri [F s](t_c) + Ri w(dT - td) + Se (dT - td)

w is the triangle behind the filter in its periodic state.  Without filter w(dT) = M d d' T/2, half the ripple.  Seen from the instant the
switch opens, vc is td older, and so is s: [F s](t_c) = F s - td s'.  Valley control is the mirror image: w at the end of the off interval,
ramp -Se (d'T - td).

That holds for slow changes.  For fast ones the steps count that the duty ratio makes in the current: M T d^ once a period.  Behind the
filter the steps before add up at the comparator, with x = sT, z = exp(x), p = exp(-T/tau), e = exp(-(T - td)/tau), to

    M T [1/(z - 1) - e/(z - p)] d^        and on average, which is what F s holds of them, to        M T (F/x) d^

so the law gains M T k d^ with k = 1/(z - 1) - e/(z - p) - F/x, less its value at rest, which w holds already.  What the voltages do to the
current is no step and is not sampled.  1/(z - 1) = 1/x - 1/2 + x/pi^2 to half the switching frequency (Ridley, "A new, continuous-time
model for current-mode control", 1991, from memory: He = 1 - x/2 + x^2/pi^2), which is z = (1 + x/2 + x^2/pi^2)/(1 - x/2 + x^2/pi^2).

    k = x/pi^2 + (tau/T) (F - 1) - e [1/(z - p) - 1/(1 - p)]

Discontinuous: every period starts from rest, so the law is algebraic: vc = Ri w + Se (dT - td) with w = m1 t for t = dT - td, behind a
rested filter m1 (t - tau (1 - exp(-t/tau))).  Valley control has only its ramp there: vc = -Se (1 - d) T (delay taken off).

Average control: an inner amplifier compares the sensed current, filtered, with the control voltage; its output meets a ramp: d = v/ramp,
delayed.  What ripple the amplifier leaves on its output changes the slope at the comparator; averaging does not see that.
"""

from dataclasses import dataclass, replace

import numpy as np

from amplifiers import Network
from cells import FORWARD_FAMILY, natural_ramp
from closed_loop import Loop, pade_modal
from conduction import STEP, conduct


@dataclass
class Control:
    """How a control voltage commands the switch."""

    mode: str  # "voltage", "peak-current", "valley-current" or "average-current"
    sense: float = 0.0  # sense gain [V/A]
    slope: float = 0.0  # compensating ramp [V/s]
    filter: float = 0.0  # time constant of the sense filter [s]
    inner: Network | None = None  # inner amplifier; vout is the sensed current, vref the control voltage
    ramp: float = 0.0  # ramp of voltage and average-current control [V]
    divider: float = 1.0  # comparator's volts per volt of control voltage
    offset: float = 0.0  # control voltage that the comparator sees as nothing [V]


def triangle_behind_filter(at_end_of_on, d, m, period, tau, before):
    """Filtered ripple current `before` [s] the end of the on (or off) interval."""
    e = 1.0 - d
    half = m * d * e * period / 2.0
    if tau == 0.0:
        return half - m * e * before if at_end_of_on else -half + m * d * before
    a, b = np.exp(-d * period / tau), np.exp(-e * period / tau)
    start = tau * m * (1.0 - b) / (1.0 - a * b)  # of the decaying part in the on interval
    if at_end_of_on:
        return half - m * e * before - tau * m * e + start * a * np.exp(before / tau)
    return -half + m * d * before + tau * m * d - tau * m * (1.0 - a) / (1.0 - a * b) * b * np.exp(before / tau)


def remainder(control, model, delay, period):
    """What the law adds to Ri (F s + M T k d) (in discontinuous conduction: all of it), as a function of (d, M, on slope, natural ramp).

    The natural ramp [A/s] is the magnetising current's share in what the switch's sensor reads: peak control's alone.
    """
    ri, se, tau = control.sense, control.slope, control.filter

    def continuous(d, m, on, more):
        peak = control.mode == "peak-current"
        w = triangle_behind_filter(peak, d, m, period, tau, delay)
        drift = on - m * (1.0 - d)
        ramp = (se + ri * more) * (d * period - delay) if peak else -se * ((1.0 - d) * period - delay)
        return ri * (w - delay * drift) + ramp

    def discontinuous(d, m, on, more):
        if control.mode == "valley-current":
            return -se * ((1.0 - d) * period - delay)
        t = d * period - delay
        return ri * on * (t - tau * (1.0 - np.exp(-t / tau)) if tau else t) + (se + ri * more) * t

    def voltage(d, m, on, more):
        return control.ramp * d

    if control.mode == "voltage":
        return voltage
    return continuous if model.conduction == "continuous" else discontinuous


class Law:
    """The linearised law v = [Ri (F s + M T k d)] + x-row x + u-row u + d-number d, v the delayed control voltage."""

    def __init__(self, control, model, delay, period, per_volt=0.0, line_to_duty=0.0):
        function = remainder(control, model, delay, period)
        # `per_volt` [A/s/V]: natural ramp for each volt that magnetises a transformer.
        self.natural = per_volt * model.magnetised.value
        point = (model.duty, model.difference.value, model.on_slope.value, self.natural)
        gradient = []
        for k in range(4):
            z = [complex(value) for value in point]
            z[k] += 1j * STEP
            gradient.append(function(*z).imag / STEP)
        by_d, by_m, by_on, by_more = gradient
        rows = [(by_m, model.difference), (by_on, model.on_slope), (by_more * per_volt, model.magnetised)]
        sampled = control.mode in ("peak-current", "valley-current") and model.conduction == "continuous"
        self.x = sum(g * row.x for g, row in rows)
        self.u = sum(g * row.u for g, row in rows)
        self.d = by_d + sum(g * row.d for g, row in rows)
        # A ramp that follows the input: ramp d^ = v - (d ramp/dvin) D vin^.
        self.u = self.u - np.array([line_to_duty * control.ramp, 0.0])
        # The control voltage that holds the point [V].
        self.value = function(*point) + (control.sense * model.current.value if sampled else 0.0)
        self.value = control.offset + self.value / control.divider


class ControlledLoop(Loop):
    """One design at one operating condition, in any control and conduction mode."""

    def __init__(self, design, vin, load):
        self.design, self.vin, self.load = design, vin, load
        # A ramp that follows the input has its entered height at the nominal one.
        self.control = replace(design.control, ramp=design.effective_ramp(vin))
        self.period = 1.0 / design.stage.pulse_frequency
        self.stage = design.stage.at(vin, design.regulated)
        self.model = conduct(design.stage, vin, design.regulated, load)
        if self.control.mode != "average-current":
            line = -self.model.duty / vin if design.feedforward else 0.0
            transformer = self.stage.topology in FORWARD_FAMILY
            per_volt = natural_ramp(self.stage) / self.stage.magnetising if transformer else 0.0
            self.law = Law(self.control, self.model, design.delay, self.period, per_volt, line)

    @property
    def sampled(self):
        """True where a comparator samples a current that never rests."""
        return self.control.mode in ("peak-current", "valley-current") and self.model.conduction == "continuous"

    def memory(self):
        """(p, e): what a step in the filtered current is short of after a period, and at the comparator."""
        tau = self.control.filter
        return (np.exp(-self.period / tau), np.exp(-(self.period - self.design.delay) / tau)) if tau else (0.0, 0.0)

    @property
    def fast_multiplier(self):
        """What a disturbance of the current becomes one period later, for straight-line slopes and continuous conduction.

        The steps before and the comparator's own slope must cancel: 1/(z - 1) - e/(z - p) + g = 0 with g M the slope of what it sees.
        """
        c, m, d, period = self.control, self.model, self.model.duty, self.period
        peak = c.mode == "peak-current"
        q = d if peak else 1.0 - d
        more = self.law.natural if peak else 0.0
        g = 1.0 - q + (c.slope / c.sense + more) / m.difference.value
        p, e = self.memory()
        if p == 0.0:
            return 1.0 - 1.0 / g
        a, b = np.exp(-q * period / c.filter), np.exp(-(1.0 - q) * period / c.filter)
        g -= a * np.exp(self.design.delay / c.filter) * (1.0 - b) / (1.0 - a * b)
        return np.min(np.roots([g, 1.0 - e - g * (1.0 + p), e - p + g * p]).real)

    def sampling(self, s):
        """k: what sampling adds to the duty ratio's share of the current."""
        x, tau, period = s * self.period, self.control.filter, self.period
        k = x / np.pi**2
        if tau:
            p, e = self.memory()
            z = (1.0 + x / 2.0 + x**2 / np.pi**2) / (1.0 - x / 2.0 + x**2 / np.pi**2)
            k = k + tau / period * (1.0 / (1.0 + s * tau) - 1.0) - e * (1.0 / (z - p) - 1.0 / (1.0 - p))
        return k

    # --- frequency: scalar algebra at each frequency --------------------------------------------------------------

    def stage_responses(self, s, of=None):
        """Output, or another row of the stage, from (vin, io, control voltage), and the inner loop gain where there is one."""
        model, control = self.model, self.control
        states = model.states_at(s)  # from (vin, io, duty)
        output = model.at(s, of)
        late = np.exp(-s * self.design.delay)
        if control.mode == "average-current":
            current = model.current.x @ states + np.array([*model.current.u, model.current.d])
            amplifier, from_control = control.inner.at(s)
            per_current = -control.sense / (1.0 + s * control.filter) * amplifier * late / control.ramp
            inner = -per_current * current[:, 2]
            duty_from_vc = late * from_control / control.ramp / (1.0 + inner)
            per_current = per_current / (1.0 + inner)
            duty = np.column_stack([per_current * current[:, 0], per_current * current[:, 1], duty_from_vc])
        else:
            law = self.law
            rows = law.x @ states + np.array([*law.u, law.d])
            if self.sampled:
                rows = rows + (control.sense / (1.0 + s * control.filter))[:, None] * (model.current.x @ states)
                rows[:, 2] += control.sense * model.difference.value * self.period * self.sampling(s)
            inner = None
            duty = np.column_stack([-rows[:, 0], -rows[:, 1], control.divider * late]) / rows[:, [2]]
        out = output[:, [2]] * duty
        out[:, :2] += output[:, :2]
        return out, inner

    def responses(self, frequency):
        """All transfer functions at the given frequencies [Hz], the delay exact."""
        s = 2j * np.pi * np.atleast_1d(frequency)
        out, inner = self.stage_responses(s)
        compensator, from_reference = self.design.network.at(s)
        plant = out[:, 2]
        loop = plant * compensator
        found = {
            "plant": plant,
            "compensator": compensator,
            "loop": loop,
            "open_loop_output_impedance": -out[:, 1],
            "output_impedance": -out[:, 1] / (1.0 + loop),
            "open_loop_line_to_output": out[:, 0],
            "line_to_output": out[:, 0] / (1.0 + loop),
            "reference_to_output": plant * from_reference / (1.0 + loop),
        }
        return found if inner is None else found | {"inner_loop": inner}

    # --- state space, the second route ------------------------------------------------------------------------------

    def controlled(self, of=None, late=True):
        """(A, B, C, D) of the stage under its control law, inputs (vin, io, control voltage), the delay as its Pade form or left out.

        C and D give the output, or another row of the stage.
        """
        m, control = self.model, self.control
        of = of or m.output
        a_d, b_d, c_d, d_d = pade_modal(self.design.delay if late else 0.0)
        n_p, n_d = len(m.a), len(a_d)
        average = control.mode == "average-current"
        behind = int(average and control.filter > 0.0)
        extra = len(control.inner.state_space()[0]) if average else (5 if control.filter else 1) * int(self.sampled)
        n = n_p + n_d + extra + behind
        width = n + 3
        p, q, e = slice(0, n_p), slice(n_p, n_p + n_d), slice(n_p + n_d, n - behind)
        vc = np.zeros(width)
        vc[n + 2] = control.divider

        def rows(x, u=None):
            """Rows over everything of rows over the stage's states and inputs."""
            x = np.atleast_2d(x)
            full = np.zeros((len(x), width))
            full[:, p] = x
            if u is not None:
                full[:, n:n + 2] = u
            return full

        slopes = np.zeros((n, width))
        if average:
            a_i, b_i, c_i, _ = control.inner.state_space()
            given = np.zeros(width)
            given[e] = c_i
        else:
            given = vc
        given_late = d_d * given
        given_late[q] += c_d
        slopes[q, q] = a_d
        slopes[q, :] += np.outer(b_d, given)
        natural = rows(m.a, m.b)
        if average:
            duty = given_late / control.ramp
        else:
            law = self.law
            rest = rows(law.x, law.u)[0]
            if not self.sampled:
                duty = (given_late - rest) / law.d
            else:
                # The duty ratio is a state, since k ends in x/pi^2; behind it the filtered current, the filtered duty ratio, and
                # e [1/(1 - p) - 1/(z - p)] = e/(1 - p)^2 x/(1 + (1 + p)/(1 - p) x/2 + x^2/pi^2) in two states.
                tau, period = control.filter, self.period
                units = np.eye(width)[e]
                duty, step = units[0], control.sense * m.difference.value * period
                sensed, more = rows(m.current.x)[0], np.zeros(width)
                if tau:
                    past, now = self.memory()
                    square = (np.pi / period)**2
                    slopes[e][1] = (sensed - units[1]) / tau
                    slopes[e][2] = (duty - units[2]) / tau
                    slopes[e][3] = units[4]
                    slopes[e][4] = duty - square * units[3] - (1.0 + past) / (1.0 - past) / 2.0 * square * period * units[4]
                    more = tau / period * (units[2] - duty) + now / (1.0 - past)**2 * square * period * units[4]
                    sensed = units[1]
                slopes[e][0] = (given_late - control.sense * sensed - rest - law.d * duty - step * more) / (step * period / np.pi**2)
        slopes[p, :] = natural + np.outer(m.f, duty)
        out = rows(of.x, of.u)[0] + of.d * duty
        if average:
            sensed = control.sense * (rows(m.current.x, m.current.u)[0] + m.current.d * duty)
            if behind:
                filtered = np.zeros(width)
                filtered[n - 1] = 1.0
                slopes[n - 1] = (sensed - filtered) / control.filter
                sensed = filtered
            slopes[e, e] = a_i
            slopes[e, :] += np.outer(b_i[:, 0], sensed) + np.outer(b_i[:, 1], vc)
        return slopes[:, :n], slopes[:, n:], out[:n], out[n:]

    def closed(self):
        """Closed loop (A, B, C, D) with inputs (vin, io, vref) and the output voltage."""
        a, b, c, d = self.controlled()
        a_c, b_c, c_c, _ = self.design.network.state_space()
        n, k = len(a), len(a_c)
        out_x = np.concatenate([c, d[2] * c_c])
        out_u = np.array([d[0], d[1], 0.0])
        big_a, big_b = np.zeros((n + k, n + k)), np.zeros((n + k, 3))
        big_a[:n, :n] = a
        big_a[:n, n:] = np.outer(b[:, 2], c_c)
        big_b[:n, :2] = b[:, :2]
        big_a[n:, n:] = a_c
        big_a[n:, :] += np.outer(b_c[:, 0], out_x)
        big_b[n:, :] = np.outer(b_c[:, 0], out_u)
        big_b[n:, 2] += b_c[:, 1]
        return big_a, big_b, out_x, out_u

    def poles(self):
        """Closed-loop poles [rad/s], slowest first; one of each pair."""
        found = np.linalg.eigvals(self.closed()[0])
        found = found[found.imag >= 0.0]
        return found[np.argsort(np.abs(found))]
