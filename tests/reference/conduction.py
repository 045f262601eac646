"""Averaged stages in continuous and discontinuous conduction, perturbed exactly by complex steps.

Discontinuous: the inductor current is a triangle of peak `ipk` over the share d1 + d2 of a period and rests at zero for what is left.
Its average is s = ipk (d1 + d2)/2, so while it flows its mean is ipk/2, in the on interval and in the off interval alike.  The other
states move little within a period.  Hence

    on slope     m1 = slope of the on equations at the mean current of that interval, ipk/2 with ipk = m1 d1 T
    d1 + d2      = 2 s / (m1 d1 T)
    x'           = d1 (on equations at iL = ipk/2) + d2 (off equations at iL = ipk/2) + (1 - d1 - d2) (idle equations at iL = 0)

with s itself as a state: full order, and equal to the continuous average where d1 + d2 = 1.
Source of the method: Sun, Mitchell, Greuel, Krein, Bass, "Averaged modeling of PWM converters operating in discontinuous conduction
mode", IEEE Trans. Power Electronics 16(4), 2001 (from memory; derived anew above).
"""

from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq, fsolve

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
    current: Row  # averaged inductor current [A]
    input_current: Row  # [A]
    difference: Row  # on slope less off slope of the current [A/s]
    on_slope: Row  # [A/s]
    off_slope: float  # negative [A/s]
    names: list

    @property
    def inductor_current(self):
        return self.current.value

    def at(self, s):
        """The output's response to (vin, io, duty) at the complex frequencies s, one row each."""
        x = self.states_at(s)
        return self.output.x @ x + np.array([*self.output.u, self.output.d])

    def states_at(self, s):
        """The states' responses to (vin, io, duty) at the complex frequencies s."""
        s = np.atleast_1d(s)
        inputs = np.column_stack([self.b, self.f]).astype(complex)
        return np.linalg.solve(s[:, None, None] * np.eye(len(self.a)) - self.a, inputs[None])


def full(vin, io=0.0):
    return np.array([vin, 1.0, io])


def rates(found, period, x, u, duty):
    """(x', outputs, on slope, off slope, d1 + d2) of the discontinuous average."""
    (a1, b1, c1, e1), (a2, b2, c2, e2), (a0, b0, c0, e0) = found["on"], found["off"], found["idle"]
    rest = x.copy()
    rest[0] = 0.0
    m1 = (a1[0] @ rest + b1[0] @ u) / (1.0 - a1[0, 0] * duty * period / 2.0)
    peak = m1 * duty * period
    share = 2.0 * x[0] / peak
    flowing = rest.copy()
    flowing[0] = peak / 2.0
    d2, idle = share - duty, 1.0 - share
    slope = duty * (a1 @ flowing + b1 @ u) + d2 * (a2 @ flowing + b2 @ u) + idle * (a0 @ rest + b0 @ u)
    outputs = duty * (c1 @ flowing + e1 @ u) + d2 * (c2 @ flowing + e2 @ u) + idle * (c0 @ rest + e0 @ u)
    outputs[1] = x[0]
    m2 = a2[0] @ flowing + b2[0] @ u
    return slope, outputs, m1, m2, share


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
    found, names = equations(stage, vout, load)
    period, u = 1.0 / stage.fs, full(vin)
    n = len(names)

    def settled(duty, guess):
        """States that hold still at a duty ratio."""
        def residual(x):
            return rates(found, period, x.astype(complex), u.astype(complex), duty)[0].real

        def jacobian(x):
            return derivative(lambda *z: rates(found, period, *z)[0], x.astype(complex), u.astype(complex), duty + 0j)[1]

        x = np.array(guess, float)
        for _ in range(60):
            move = np.linalg.solve(jacobian(x), residual(x))
            # The current may not change its sign on the way.
            scale = 1.0 if move[0] < 0.8 * x[0] else 0.8 * x[0] / move[0]
            x = x - scale * move
            if scale == 1.0 and np.max(np.abs(move) / (np.abs(x) + 1e-12)) < 1e-13:
                break
        return x

    # From the lossless triangle: what the load draws, by duty ratio; then Newton on states and duty ratio together.
    guess = np.zeros(n)
    for k, name in enumerate(names):
        guess[k] = {"v0": vout, "v1": vout, "v2": vout, "v_out": vout, "vd_out": vout, "i_out": load,
                    "vci": vin, "v_in": vin, "vd_in": vin, "i_in": load * vout / vin}.get(name, 0.0)
    ratio = vout / vin
    rise = (vin - vout if stage.topology == "buck" else vin) / stage.inductance
    # Power per period: L ipk^2/2 (buck: with what the source gives directly, boost likewise).
    share = {"buck": 1.0 - ratio, "boost": 1.0 - 1.0 / ratio, "buck-boost": 1.0}[stage.topology]
    peak = np.sqrt(2.0 * load * vout * share / (stage.inductance * stage.fs))
    duty = peak / (rise * period)
    fall = {"buck": vout, "boost": vout - vin, "buck-boost": vout}[stage.topology] / stage.inductance
    guess[0] = peak / 2.0 * (duty + peak / fall / period)
    z = np.append(settled(duty, guess), duty)
    for _ in range(60):
        def function(x, uu, d):
            slope, outputs, *_ = rates(found, period, x, uu, d)
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
        slope, outputs, m1, m2, share = rates(found, period, x, uu, d)
        return np.concatenate([slope, outputs, [m1, m1 - m2, share, m2]])

    value, by_x, by_u, by_d = derivative(everything, z[:n].astype(complex), u.astype(complex), z[n] + 0j)
    value = value.real

    def row(k):
        return Row(value[k], by_x[k], by_u[k], by_d[k])

    share = value[n + 5]
    assert 0.0 < z[n] < share < 1.0, ("not discontinuous", z[n], share)
    return Model("discontinuous", z[n], share - z[n], z[:n], by_x[:n], by_u[:n], by_d[:n],
                 row(n), row(n + 1), row(n + 2), row(n + 4), row(n + 3), value[n + 6], names)


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

    def slopes(a, b):
        return Row(a[0] @ x + b[0] @ u, a[0], b[0, [0, 2]], 0.0)

    on_slope = slopes(a1, b1)
    difference = slopes(a1 - a2, b1 - b2)
    valley = x[0] - duty / stage.fs * on_slope.value / 2.0
    model = Model("continuous", duty, 1.0 - duty, x, plain.a, plain.b[:, [0, 2]], plain.f, row(0), row(1), row(2), difference,
                  on_slope, (a2[0] @ x + b2[0] @ u), names)
    return model, valley >= 0.0 or forced


def conduct(stage, vin, vout, load):
    """The averaged model of whichever conduction mode the stage runs in."""
    model, holds = continuous(stage, vin, vout, load, stage.rectifier == "synchronous")
    return model if holds else discontinuous(stage, vin, vout, load)
