"""Averaged stages in continuous and discontinuous conduction, perturbed exactly by complex steps.

Discontinuous: the switched current is a triangle of peak `ipk` over the share d1 + d2 of a period and rests at zero for what is left.
Its average is s = ipk (d1 + d2)/2, so while it flows its mean is ipk/2, in the on interval and in the off interval alike.  The other
states move little within a period.  With q the row of the switched current, e what the states are for one ampere of it, and
r = x - e (q x) the states without it,

    on slope     m1 = q (slope of the on equations) at the mean current of that interval, ipk/2 with ipk = m1 d1 T
    d1 + d2      = 2 s / (m1 d1 T)
    x'           = d1 (on equations at r + e ipk/2) + d2 (off equations at r + e ipk/2) + (1 - d1 - d2) (idle equations at r)

with s = q x itself among the states: full order, and equal to the continuous average where d1 + d2 = 1.  One inductor: q and e pick its
current.  Two: q is their sum, and e shares it out as one voltage across both would.
Source of the method: Sun, Mitchell, Greuel, Krein, Bass, "Averaged modeling of PWM converters operating in discontinuous conduction
mode", IEEE Trans. Power Electronics 16(4), 2001 (from memory; derived anew above).
"""

from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq, fsolve

from cells import FORWARD_FAMILY, TWO_INDUCTORS, inductance_matrix, sensed
from stages import averaged, equations

STEP = 1e-30  # of a complex step: exact derivatives of these smooth functions


@dataclass
class Row:
    """A quantity about the operating point: its value, and its change with states, inputs (vin, io) and duty ratio."""

    value: float
    x: np.ndarray
    u: np.ndarray
    d: float


@dataclass
class Model:
    """Operating point and small-signal model x' = A x + B u + F d with u = (vin, io)."""

    conduction: str  # "continuous" or "discontinuous"
    duty: float
    second: float  # share of the off interval
    x: np.ndarray
    a: np.ndarray
    b: np.ndarray
    f: np.ndarray
    output: Row  # [V]
    current: Row  # averaged switched current, as the switch's sensor reads it [A]
    input_current: Row  # [A]
    difference: Row  # on slope less off slope of the current [A/s]
    on_slope: Row  # [A/s]
    off_slope: float  # negative [A/s]
    first: float  # average of the first inductor's current [A]
    first_ripple: float  # its ripple, peak to peak [A]
    bank: Row  # voltage of the output bank, ahead of a second stage [V]
    magnetised: Row  # what magnetises a transformer while the switch conducts [V]
    names: list

    def at(self, s, of=None):
        """The response of the output, or of another row, to (vin, io, duty) at the complex frequencies s, one row each."""
        of = of or self.output
        return of.x @ self.states_at(s) + np.array([*of.u, of.d])

    def states_at(self, s):
        """The states' responses to (vin, io, duty) at the complex frequencies s."""
        s = np.atleast_1d(s)
        inputs = np.column_stack([self.b, self.f]).astype(complex)
        return np.linalg.solve(s[:, None, None] * np.eye(len(self.a)) - self.a, inputs[None])


def full(vin, io=0.0):
    return np.array([vin, 1.0, io])


def rates(found, cell, x, u, duty):
    """(x', outputs, on slope, off slope, d1 + d2, rises of the first state, magnetising voltage) of the discontinuous average.

    `cell` is (period, q, e).
    """
    period, q, e = cell
    (a1, b1, c1, e1), (a2, b2, c2, e2), (a0, b0, c0, e0) = found["on"], found["off"], found["idle"]
    current = q @ x
    rest = x - e * current
    m1 = q @ (a1 @ rest + b1 @ u) / (1.0 - q @ a1 @ e * duty * period / 2.0)
    peak = m1 * duty * period
    share = 2.0 * current / peak
    flowing = rest + e * (peak / 2.0)
    d2, idle = share - duty, 1.0 - share
    on = a1 @ flowing + b1 @ u
    off = a2 @ flowing + b2 @ u
    slope = duty * on + d2 * off + idle * (a0 @ rest + b0 @ u)
    outputs = duty * (c1 @ flowing + e1 @ u) + d2 * (c2 @ flowing + e2 @ u) + idle * (c0 @ rest + e0 @ u)
    outputs[1] = current
    # The first inductor's current at the ends of the three intervals, from where it began.
    rises = np.array([duty * on[0], d2 * off[0], idle * (a0 @ rest + b0 @ u)[0]]) * period
    return slope, outputs, m1, q @ off, share, rises, c1[4] @ flowing + e1[4] @ u


def derivative(function, x, u, duty):
    """Value of a vector function of (x, u, duty) and its derivatives by complex steps: over x, over (vin, io), over duty."""
    value = function(x, u, duty)

    def along(dx, du, dd):
        return function(x + 1j * STEP * dx, u + 1j * STEP * du, duty + 1j * STEP * dd).imag / STEP

    zero, nothing = np.zeros(len(x)), np.zeros(len(u))
    by_x = np.column_stack([along(unit, nothing, 0.0) for unit in np.eye(len(x))])
    by_u = np.column_stack([along(zero, np.eye(3)[k], 0.0) for k in (0, 2)])
    return value, by_x, by_u, along(zero, nothing, 1.0)


def discontinuous(stage, vin, vout, load):
    found, names = equations(stage, vout, load, commutates=False)
    period, u = 1.0 / stage.pulse_frequency, full(vin)
    n = len(names)
    q, e = stage.sensed(names), stage.along(names)
    cell = (period, q, e)

    def settled(duty, guess):
        """States that hold still at a duty ratio."""
        def residual(x):
            return rates(found, cell, x.astype(complex), u.astype(complex), duty)[0].real

        def jacobian(x):
            return derivative(lambda *z: rates(found, cell, *z)[0], x.astype(complex), u.astype(complex), duty + 0j)[1]

        x = np.array(guess, float)
        for _ in range(60):
            move = np.linalg.solve(jacobian(x), residual(x))
            # The current may not change its sign on the way.
            scale = 1.0 if q @ move < 0.8 * (q @ x) else 0.8 * (q @ x) / (q @ move)
            x = x - scale * move
            if scale == 1.0 and np.max(np.abs(move) / (np.abs(x) + 1e-12)) < 1e-13:
                break
        return x

    # From the lossless triangle: what the load draws, by duty ratio; then Newton on states and duty ratio together.
    guess = np.zeros(n)
    for k, name in enumerate(names):
        guess[k] = {"v0": vout, "v1": vout, "v2": vout, "v_out": vout, "vd_out": vout, "i_out": load,
                    "vci": vin, "v_in": vin, "vd_in": vin, "i_in": load * vout / vin,
                    "i1": load * vout / vin, "i2": load, "vc": vin + (vout if stage.topology == "cuk" else 0.0)}.get(name, 0.0)
    duty, current = triangle(stage, vin, vout, load)
    guess = guess + e * (current - q @ guess)
    z = np.append(settled(duty, guess), duty)
    for _ in range(60):
        def function(x, uu, d):
            slope, outputs, *_ = rates(found, cell, x, uu, d)
            return np.append(slope, outputs[0] - vout)

        value, by_x, _, by_d = derivative(function, z[:n].astype(complex), u.astype(complex), z[n] + 0j)
        move = np.linalg.solve(np.column_stack([by_x, by_d]), value.real)
        scale = min(1.0, 0.5 * z[n] / max(abs(move[n]), 1e-300))
        z = z - scale * move
        if scale == 1.0 and np.max(np.abs(move) / (np.abs(z) + 1e-12)) < 1e-13:
            break
    else:
        raise AssertionError("no discontinuous operating point")

    def everything(x, uu, d):
        slope, outputs, m1, m2, share, rises, magnetised = rates(found, cell, x, uu, d)
        return np.concatenate([slope, outputs, [m1, m1 - m2, share, m2, magnetised], rises])

    value, by_x, by_u, by_d = derivative(everything, z[:n].astype(complex), u.astype(complex), z[n] + 0j)
    value = value.real

    def row(k):
        return Row(value[k], by_x[k], by_u[k], by_d[k])

    share = value[n + 7]
    corners = np.cumsum(value[n + 10:])
    assert 0.0 < z[n] < share < 1.0, ("not discontinuous", z[n], share)
    return Model("discontinuous", z[n], share - z[n], z[:n], by_x[:n], by_u[:n], by_d[:n],
                 row(n), row(n + 1), row(n + 2), row(n + 6), row(n + 5), value[n + 8],
                 z[0] / stage.phases, np.ptp(corners) / stage.phases, row(n + 3), row(n + 9), names)


def triangle(stage, vin, vout, load):
    """Duty ratio and average switched current of a lossless stage whose current rests."""
    family = stage.region or {"boost": "boost", "buck": "buck"}.get(stage.topology)
    family = family or ("buck" if stage.topology in FORWARD_FAMILY else "buck-boost")
    fs, inductance = stage.pulse_frequency, stage.inductance / stage.phases
    if stage.topology == "flyback":
        vout = vout / stage.ratio
        load = load * stage.ratio
    elif stage.topology in FORWARD_FAMILY:
        vin = vin * stage.ratio * (0.5 if stage.topology == "half-bridge" else 1.0)
    elif stage.topology in TWO_INDUCTORS:
        inductance = 1.0 / np.sum(np.linalg.inv(inductance_matrix(stage)))
    rise = (vin - vout if family == "buck" else vin) / inductance
    # Power per period: L ipk^2/2 (buck: with what the source gives directly, boost likewise).
    share = {"buck": 1.0 - vout / vin, "boost": 1.0 - vin / vout, "buck-boost": 1.0}[family]
    peak = np.sqrt(2.0 * load * vout * share / (inductance * fs))
    duty = peak / rise * fs
    fall = (vout - vin if family == "boost" else vout) / inductance
    current = peak / 2.0 * (duty + peak / fall * fs)
    # As the switch's sensor reads it.
    return duty, current * sensed(stage).get("iL", 1.0)


def continuous(stage, vin, vout, load, forced):
    """The plain average with the rows current mode needs, and the current's least value."""
    found, names = equations(stage, vout, load)
    u = full(vin)
    plain = averaged(stage, vin, vout, load, check=False)
    (a1, b1, c1, e1), (a2, b2, c2, e2) = found["on"], found["off"]
    duty = plain.duty
    x = np.linalg.solve(plain.a, -plain.b @ u)

    def row(k):
        y = plain.c[k] @ x + plain.d[k] @ u
        return Row(y, plain.c[k], plain.d[k, [0, 2]], plain.g[k])

    q = stage.sensed(names)

    def slopes(a, b):
        return Row(q @ (a @ x + b @ u), q @ a, (q @ b)[[0, 2]], 0.0)

    on_slope = slopes(a1, b1)
    magnetised = Row(c1[4] @ x + e1[4] @ u, c1[4], e1[4, [0, 2]], 0.0)
    difference = slopes(a1 - a2, b1 - b2)
    valley = q @ x - duty / stage.pulse_frequency * on_slope.value / 2.0
    model = Model("continuous", duty, 1.0 - duty, x, plain.a, plain.b[:, [0, 2]], plain.f, row(0), row(1), row(2), difference,
                  on_slope, q @ (a2 @ x + b2 @ u), x[0] / stage.phases,
                  (a1[0] @ x + b1[0] @ u) * duty / stage.pulse_frequency / stage.phases, row(3), magnetised, names)
    return model, valley >= 0.0 or forced


def conduct(stage, vin, vout, load):
    """The averaged model of whichever conduction mode the stage runs in."""
    stage = stage.at(vin, vout)
    model, holds = continuous(stage, vin, vout, load, stage.rectifier == "synchronous")
    return model if holds else discontinuous(stage, vin, vout, load)
