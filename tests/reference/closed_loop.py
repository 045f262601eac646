"""Ten closed loops from hand-written equations: responses, margins and steps, for comparison with the program.

    python closed_loop.py OUTPUT.json

Conventions: the loop gain has the inversion of the amplifier taken out; the plant runs from control voltage to output voltage
with modulator and exact delay; the output impedance is positive for a resistive output, with the load in place; the closed
loop's step responses carry the delay as a diagonal Pade form of order 3.  Frequencies in hertz, phases in degrees.

Second routes, asserted while running: compensator by node equations against its state equations; closed-loop frequency
response of the assembled state space (python-control) against the algebra on transfer functions; step responses by
eigenvectors against python-control's simulation.
"""

import json
import sys
import warnings

import control
import numpy as np
from scipy.optimize import brentq, minimize_scalar

from closed_loop_designs import DESIGNS
from output import write
from stages import Branch, Stage, averaged

TAU = 2.0 * np.pi
FREQUENCIES = 60


class Loop:
    """One design at one operating condition."""

    def __init__(self, design, vin, load):
        self.design, self.vin, self.load = design, vin, load
        self.stage = design.stage.at(vin, design.regulated)
        self.model = averaged(design.stage, vin, design.regulated, load)
        self.ramp = design.effective_ramp(vin)
        self.line_to_duty = -self.model.duty / vin if design.feedforward else 0.0

    def responses(self, frequency):
        """All transfer functions at the given frequencies [Hz], the delay exact."""
        s = 1j * TAU * np.atleast_1d(frequency)
        from_vin, from_io, from_duty = self.model.at(s).T
        plant = from_duty * np.exp(-s * self.design.delay) / self.ramp
        compensator, from_reference = self.design.network.at(s)
        loop = plant * compensator
        line = from_vin + from_duty * self.line_to_duty
        return {
            "plant": plant,
            "compensator": compensator,
            "loop": loop,
            "open_loop_output_impedance": -from_io,
            "output_impedance": -from_io / (1.0 + loop),
            "open_loop_line_to_output": line,
            "line_to_output": line / (1.0 + loop),
            "reference_to_output": plant * from_reference / (1.0 + loop),
        }

    def loop(self, frequency):
        return self.responses(frequency)["loop"]

    # --- margins ---------------------------------------------------------------------------------------------------

    def margins(self):
        """All crossovers and phase crossovers between fs/1e6 and fs/2, and the modulus margin."""
        fs = self.design.stage.pulse_frequency
        x = np.linspace(np.log(fs * 1e-6), np.log(fs / 2.0), 6001)
        t = self.loop(np.exp(x))

        def value(log_f):
            return self.loop(np.exp(log_f))[0]

        def refine(function, k):
            return brentq(function, x[k], x[k + 1], xtol=1e-14, rtol=1e-14)

        crossovers = []
        gain = np.log(np.abs(t))
        for k in np.nonzero(np.sign(gain[:-1]) != np.sign(gain[1:]))[0]:
            root = refine(lambda log_f: np.log(abs(value(log_f))), k)

            def chord(step):
                return (np.log(abs(value(root + step))) - np.log(abs(value(root - step)))) / (2.0 * step) * 20.0

            # Extrapolated to no step: beside a sharp resonance the slope itself turns fast.
            slope = (4.0 * chord(5e-5) - chord(1e-4)) / 3.0
            crossovers.append({
                "frequency_hz": np.exp(root),
                # 180 degrees + phase, wrapped to (-180, 180], is the angle of -T.
                "phase_margin_deg": np.angle(-value(root), deg=True),
                "falling": bool(gain[k] > 0.0),
                "slope_db_per_decade": slope,
            })
        phase_crossovers = []
        sine = t.imag / np.abs(t)
        for k in np.nonzero((np.sign(sine[:-1]) != np.sign(sine[1:])) & (t.real[:-1] < 0.0) & (t.real[1:] < 0.0))[0]:
            root = refine(lambda log_f: (lambda z: z.imag / abs(z))(value(log_f)), k)
            phase_crossovers.append({"frequency_hz": np.exp(root), "gain_margin_db": -20.0 * np.log10(abs(value(root)))})
        distance = np.abs(1.0 + t)
        k = int(np.argmin(distance))
        found = minimize_scalar(
            lambda log_f: abs(1.0 + value(log_f)), bounds=(x[max(k - 1, 0)], x[min(k + 1, len(x) - 1)]),
            method="bounded", options={"xatol": 1e-12})
        return {
            "crossovers": crossovers,
            "phase_crossovers": phase_crossovers,
            # Far above the band the loop gain dies out, and the distance tends to one.
            "modulus_margin": min(found.fun, distance[k], 1.0),
            "delay_margin_s": min((c["phase_margin_deg"] % 360.0) / 360.0 / c["frequency_hz"] for c in crossovers),
        }

    # --- time ------------------------------------------------------------------------------------------------------

    def closed(self):
        """Closed loop (A, B, C, D) with inputs (vin, io, vref), output vout and the Pade form of order 3."""
        m = self.model
        a_c, b_c, c_c, _ = self.design.network.state_space()
        a_d, b_d, c_d, d_d = pade_modal(self.design.delay)
        n_p, n_d, n_c = len(m.a), len(a_d), len(a_c)
        n = n_p + n_d + n_c
        p, q, r = slice(0, n_p), slice(n_p, n_p + n_d), slice(n_p + n_d, n)
        # duty = (delayed vc)/ramp + line_to_duty vin, as a row over states and over inputs
        duty_x, duty_u = np.zeros(n), np.array([self.line_to_duty, 0.0, 0.0])
        duty_x[q] = c_d / self.ramp
        duty_x[r] = d_d * c_c / self.ramp
        out_x = np.concatenate([m.c[0], np.zeros(n_d + n_c)]) + m.g[0] * duty_x
        out_u = np.array([m.d[0, 0], m.d[0, 2], 0.0]) + m.g[0] * duty_u
        a, b = np.zeros((n, n)), np.zeros((n, 3))
        a[p, p] = m.a
        a[p, :] += np.outer(m.f, duty_x)
        b[p, 0], b[p, 1] = m.b[:, 0], m.b[:, 2]
        b[p, :] += np.outer(m.f, duty_u)
        a[q, q] = a_d
        a[q, r] = np.outer(b_d, c_c)
        a[r, r] = a_c
        a[r, :] += np.outer(b_c[:, 0], out_x)
        b[r, :] += np.outer(b_c[:, 0], out_u)
        b[r, 2] += b_c[:, 1]
        return a, b, out_x, out_u

    def steps(self):
        """Deviation of the output [V] after a load, a line and a reference step."""
        design = self.design
        to_vref = design.network.reference / design.regulated
        a, b, c, d = self.closed()
        events = {
            "load": (1, *design.load_step),
            "line": (0, *design.line_step),
            "reference": (2, design.reference_step[0] * to_vref, design.reference_step[1] * to_vref),
        }
        check_with_control(self, a, b, c, d, events)
        band = design.band * design.regulated
        result = {}
        for name, (column, change, slew) in events.items():
            response = RampResponse(a, b[:, column], c, d[column], change, abs(change) / slew)
            horizon = response.horizon
            times = np.concatenate([np.linspace(0.0, 0.05, 41), np.linspace(0.05, 1.0, 61)[1:]]) * horizon
            final = response.final
            # A grid fine enough for the fastest oscillation that shows, then refined about its extreme and its last exit.
            fine = np.concatenate([np.geomspace(1e-3, 1.0, 6000) * horizon / 50.0, np.linspace(0.02, 8.0, 60000) * horizon])
            values = response(fine)
            k = int(np.argmax(np.abs(values)))
            low, high = fine[max(k - 1, 0)], fine[min(k + 1, len(fine) - 1)]
            sign = np.sign(values[k])
            found = minimize_scalar(lambda t: -sign * response(t)[0], bounds=(low, high), method="bounded",
                                    options={"xatol": 1e-9 * high})
            deviation = sign * max(-found.fun, abs(values[k]))
            outside = np.nonzero(np.abs(values - final) > band)[0]
            settling = 0.0
            if len(outside):
                k = outside[-1]
                settling = brentq(lambda t: abs(response(t)[0] - final) - band, fine[k], fine[k + 1], xtol=1e-16)
            result[name] = {
                "times_s": times.tolist(),
                "values_v": response(times).tolist(),
                "final_v": float(final),
                "deviation_v": float(deviation),
                "settling_s": float(settling),
            }
        return result


def pade_modal(delay):
    """Diagonal Pade form of order 3 of a delay as real blocks of its partial fractions: (A, B, C, D)."""
    if delay == 0.0:
        return np.zeros((0, 0)), np.zeros(0), np.zeros(0), 1.0
    # (120 - 60 z + 12 z^2 - z^3) / (120 + 60 z + 12 z^2 + z^3) with z = s delay: -1 + sum r_k / (z - p_k).
    poles = np.roots([1.0, 12.0, 60.0, 120.0])
    real = poles[np.abs(poles.imag) < 1e-9].real[0]
    pair = poles[poles.imag > 1e-9][0]

    def residue(p):
        return np.polyval([-1.0, 12.0, -60.0, 120.0], p) / np.polyval([3.0, 24.0, 60.0], p)

    r0, r1 = residue(real), residue(pair)
    a = np.array([[real, 0.0, 0.0], [0.0, pair.real, pair.imag], [0.0, -pair.imag, pair.real]]) / delay
    b = np.array([1.0, 1.0, 0.0]) / delay
    # The pair driven at its first state x, second state y: x + j y... x = Re, y = -Im of 1 / (z - p), so 2 Re(r (x - j y)).
    c = np.array([r0, 2.0 * r1.real, 2.0 * r1.imag])
    return a, b, c, -1.0


class RampResponse:
    """Output after an input ramp of a given rise time, exact by the eigenvectors of the closed loop."""

    def __init__(self, a, b, c, d, change, rise):
        poles, vectors = np.linalg.eig(a)
        self.poles, self.d, self.change, self.rise = poles, d, change, rise
        self.weights = (c @ vectors) * np.linalg.solve(vectors, b.astype(complex))
        self.final = float((d + np.sum(-self.weights / poles)).real * change)
        assert np.all(poles.real < 0.0), "the closed loop is unstable"
        # Long enough for what the output shows of the slowest mode.
        size = np.abs(self.weights / poles * change)
        visible = size > 1e-3 * np.max(size)
        self.horizon = 8.0 / np.min(-poles.real[visible])

    def __call__(self, times):
        t = np.atleast_1d(times).astype(float)
        ramp = self._ramp(t) - self._ramp(t - self.rise)
        return self.change / self.rise * ramp

    def _ramp(self, t):
        t = np.maximum(t, 0.0)
        return self.d * t + self._sum(t, lambda z, p: (np.expm1(z) - z) / p**2)

    def _sum(self, t, kernel):
        total = np.zeros(len(t))
        for pole, weight in zip(self.poles, self.weights):
            total = total + (weight * kernel(pole * t, pole)).real
        return total


def check_with_control(loop, a, b, c, d, events):
    """python-control as the second route: closed-loop responses and a simulation."""
    system = control.ss(a, b, c[None, :], d[None, :])
    fs = loop.design.stage.pulse_frequency
    f = np.geomspace(fs / 1e5, fs / 20.0, 25)
    ours = loop.responses(f)
    theirs = system(1j * TAU * f)[0]
    # The Pade form of order 3 is close to the exact delay at these frequencies, and exact without one.
    bound = 1e-9 if loop.design.delay == 0.0 else 1e-5
    for column, name, sign in [(0, "line_to_output", 1.0), (1, "output_impedance", -1.0), (2, "reference_to_output", 1.0)]:
        error = np.max(np.abs(theirs[column] * sign - ours[name]) / np.abs(ours[name]))
        assert error < bound, f"{loop.design.title}: {name} differs from the assembled system by {error:.1e}"
    for column, change, slew in events.values():
        rise = abs(change) / slew
        response = RampResponse(a, b[:, column], c, d[column], change, rise)
        single = control.ss(a, b[:, [column]], c[None, :], d[None, [column]])
        # A simulation is exact for inputs linear between its points: put the corner on the grid.
        t = np.arange(401) * rise / 20.0
        u = change * np.minimum(t / rise, 1.0)
        simulated = control.forced_response(single, t, u).outputs
        error = np.max(np.abs(simulated - response(t))) / np.max(np.abs(simulated))
        assert error < 1e-8, f"{loop.design.title}: simulation differs by {error:.1e}"


def check_pade():
    """The real blocks against the rational function they stand for."""
    a, b, c, d = pade_modal(2.0)
    for s in [0.1j, 1j, 5j]:
        z = 2.0 * s
        want = (120 - 60 * z + 12 * z**2 - z**3) / (120 + 60 * z + 12 * z**2 + z**3)
        got = c @ np.linalg.solve(s * np.eye(3) - a, b) + d
        assert abs(got - want) < 1e-12, (got, want)


def check_published():
    """The hand-written stages against published numbers."""
    def pair(model):
        pole = max(np.linalg.eigvals(model.a), key=lambda z: z.imag)
        return abs(pole) / TAU, abs(pole) / (-2.0 * pole.real)

    def close(value, want, relative):
        assert abs(value / want - 1.0) < relative, (value, want)

    # Buck-boost of Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 8.2.1: D 0.6, Gd0 187.5 V, f0 397.9 Hz, Q 4.
    esr = 1e-9  # the equations need one
    stage = Stage("buck-boost", 100e3, 160e-6, 0.0, 0.0, "synchronous", [Branch(160e-6, esr)], "resistor")
    model = averaged(stage, 30.0, 45.0, 4.5)
    close(model.duty, 0.6, 1e-6)
    close(abs(model.at(1e-3j)[0, 2]), 187.5, 1e-6)
    close(pair(model)[0], 397.887, 1e-5)
    close(pair(model)[1], 4.0, 1e-5)
    # Boost of Basso, Designing Control Loops for Linear and Switching Power Supplies, 2012, 9.4 (parts derived, ESR 20 mohm):
    # D 0.3960, f0 429.7 Hz, Q 6.78.
    stage = Stage("boost", 100e3, 50e-6, 0.0, 0.0, "synchronous", [Branch(1000e-6, 0.02)], "resistor")
    model = averaged(stage, 11.5, 19.0, 3.0)
    close(model.duty, 0.3960, 2e-4)
    close(pair(model)[0], 429.7, 2e-4)
    close(pair(model)[1], 6.78, 1e-3)


def check_compensator(network, fs):
    """Node equations against state equations."""
    a, b, c, _ = network.state_space()
    f = np.geomspace(fs / 1e5, fs / 2.0, 40)
    h, href = network.at(1j * TAU * f)
    for k, s in enumerate(1j * TAU * f):
        vc = c @ np.linalg.solve(s * np.eye(len(a)) - a, b.astype(complex))
        assert abs(-vc[0] - h[k]) < 1e-9 * abs(h[k]) and abs(vc[1] - href[k]) < 1e-9 * abs(href[k])


def pairs(values):
    return [[float(z.real), float(z.imag)] for z in values]


def result(design):
    choices, values = design.entries()
    fs = design.stage.pulse_frequency
    check_compensator(design.network, fs)
    nominal = Loop(design, design.vin[1], design.load[1])
    frequencies = np.geomspace(fs / 1e5, fs / 2.0, FREQUENCIES)
    conditions = []
    for vin in design.vin:
        for load in design.load:
            loop = Loop(design, vin, load)
            model = loop.model
            ripple = model.on_slope * model.duty / fs
            assert np.all(np.linalg.eigvals(loop.closed()[0]).real < 0.0)
            conditions.append({
                "input_voltage": vin,
                "load_current": load,
                "duty": model.duty,
                "inductor_current": float(model.inductor_current),
                "input_current": float(model.input_current),
                "inductor_ripple": float(ripple),
                **loop.margins(),
            })
    return {
        "title": design.title,
        "choices": choices,
        "values": values,
        "regulated_output": design.regulated,
        "frequencies_hz": frequencies.tolist(),
        "responses": {name: pairs(curve) for name, curve in nominal.responses(frequencies).items()},
        "conditions": conditions,
        "steps": nominal.steps(),
    }


def main():
    warnings.simplefilter("error")
    check_pade()
    check_published()
    content = {
        "about": "made by tests/reference/closed_loop.py; complex values as [real, imaginary]; nominal input and load; "
                 "conditions: input least, nominal, greatest, and for each the load likewise",
        "designs": [result(design) for design in DESIGNS],
    }
    write(content, sys.argv[1])


if __name__ == "__main__":
    main()
