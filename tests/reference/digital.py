"""Difference equations as compensators: coefficients, rounded words, sampled loops.

    python digital.py OUTPUT.json

Aim of the lanes, magnitude from output to control voltage: C(s) = wg/s prod(1 + s/wz)/prod(1 + s/wp); as fractions of the converter's input
range and of the modulator's full scale Cn = C FSin/(H FSout), H the divider.  Forms: Tustin s = k (z - 1)/(z + 1) with k = 2/T, prewarped
k = wp/tan(wp T/2); matched z = exp(sT), zeros at infinity to z = -1, the integrator's gain kept.  Second routes: scipy's cont2discrete
(bilinear), python-control's matched form of single factors.

Word length: codes round(c 2^F), half away from zero, F the greatest with which every coefficient of its group fits; `integrator` moves the
feedback code with the greatest error so that their sum is 2^F exactly.

Closed loop: sampled just before t = nT; the value acts at nT + td as an impulse of weight T on the averaged stage under its law without delay,
td = computation + modulator + propagation; uniformly sampled trailing edge: modulator delay D T (Van de Sype, De Gusseme, Van den Bossche,
Melkebeek 2004; Corradini, Maksimovic, Mattavelli, Zane 2015; from memory).  The map of one period is exact (matrix exponentials), events begin
right after a sample.
"""

import random
import sys
import warnings
from dataclasses import dataclass

import control
import mpmath
import numpy as np
from scipy.linalg import expm
from scipy.signal import cont2discrete

from closed_loop import pairs
from controlled import ControlledLoop
from output import write

TAU = 2.0 * np.pi
PARTS = 8  # of a period, at which step responses are looked at


@dataclass
class Digital:
    """Lanes and words of one difference equation; frequencies in hertz."""

    method: str  # "tustin", "tustin-prewarped" or "matched"
    gain: float
    zeros: tuple
    poles: tuple  # those beside the integrator
    reference: float  # [V]
    upper: float  # [ohm]
    lower: float  # [ohm]
    input_range: float  # [V] at the divider's tap
    bits: int = 16
    prewarp: float = 0.0
    computation: float = 0.0  # [s]
    rounding: str = "integrator"
    fraction: int | None = None  # bits of the forward coefficients, None for automatic
    feedback_fraction: int | None = None
    output_range: float = 0.0  # [V]; voltage mode: the ramp's
    amplifier: str = "digital"
    kind: int = 2

    @property
    def divider(self):
        return self.lower / (self.upper + self.lower)

    def scale(self, full):
        """Control voltage over output voltage, for each unit of output fraction over input fraction."""
        return self.divider * full / self.input_range

    def exact(self, period, full):
        """(feedback a1.., forward b0..) of u[n] = sum a u[n-k] + sum b e[n-k], in fractions of full scale, by mpmath."""
        with mpmath.workdps(50):
            mp = mpmath.mpf
            t = mp(period)
            rate = 2 / t
            if self.method == "tustin-prewarped":
                w = 2 * mpmath.pi * mp(self.prewarp)
                rate = w / mpmath.tan(w * t / 2)
            wz = [2 * mpmath.pi * mp(f) for f in self.zeros]
            wp = [2 * mpmath.pi * mp(f) for f in self.poles]
            gain = 2 * mpmath.pi * mp(self.gain) / mp(self.scale(full))
            order = 1 + len(wp)
            if self.method == "matched":
                def image(w):
                    return mpmath.exp(-w * t)

                # (z - 1)/T C(z) at z = 1 is the integrator's gain.
                zeros = [image(w) for w in wz] + [mp(-1)] * (order - len(wz))
                poles = [mp(1)] + [image(w) for w in wp]
                k = gain * t
                for root in poles[1:]:
                    k *= 1 - root
                for root in zeros:
                    k /= 1 - root
            else:
                def image(w):
                    # s = -w
                    return (rate - w) / (rate + w)

                zeros = [image(w) for w in wz] + [mp(-1)] * (order - len(wz))
                poles = [mp(1)] + [image(w) for w in wp]
                # gain/s -> gain/rate (z + 1)/(z - 1); 1 + s/w -> (rate + w)/w (z - root)/(z + 1).
                k = gain / rate
                for w in wz:
                    k *= (rate + w) / w
                for w in wp:
                    k *= w / (rate + w)
            numerator, denominator = [k], [mp(1)]
            for root in zeros:
                numerator = multiply(numerator, root)
            for root in poles:
                denominator = multiply(denominator, root)
            return [float(-c) for c in denominator[1:]], [float(c) for c in numerator]

    def words(self, period, full):
        """Codes and fraction bits of feedback and forward coefficients, and what they stand for."""
        feedback, forward = self.exact(period, full)
        f_a = self.feedback_fraction if self.feedback_fraction is not None else automatic(feedback, self.bits)
        f_b = self.fraction if self.fraction is not None else automatic(forward, self.bits)
        codes_a, codes_b = [code(c, f_a) for c in feedback], [code(c, f_b) for c in forward]
        if self.rounding == "integrator":
            missing = 2**f_a - sum(codes_a)
            while missing:
                sign = 1 if missing > 0 else -1
                errors = [sign * (c * 2.0**f_a - w) for c, w in zip(feedback, codes_a)]
                codes_a[int(np.argmax(errors))] += sign
                missing -= sign
        return {
            "feedback_fraction_bits": f_a, "forward_fraction_bits": f_b, "feedback_codes": codes_a, "forward_codes": codes_b,
            "feedback": [w / 2.0**f_a for w in codes_a], "forward": [w / 2.0**f_b for w in codes_b],
        }

    def entries(self):
        """(choices, values) by entry path."""
        choices = {
            "compensator.amplifier": self.amplifier,
            "compensator.digital.method": self.method,
            "compensator.digital.order": str(1 + len(self.poles)),
            "compensator.digital.zeros": str(len(self.zeros)),
            "compensator.digital.rounding": self.rounding,
        }
        values = {
            "compensator.reference": self.reference,
            "compensator.divider.upper": self.upper,
            "compensator.divider.lower": self.lower,
            "compensator.digital.gain": self.gain,
            "compensator.digital.bits": float(self.bits),
            "compensator.digital.computation": self.computation,
            "compensator.digital.input-range": self.input_range,
        }
        for prefix, roots in [("zero", self.zeros), ("pole", self.poles)]:
            values |= {f"compensator.digital.{prefix}-{k}": f for k, f in enumerate(roots, 1)}
        if self.method == "tustin-prewarped":
            values["compensator.digital.prewarp"] = self.prewarp
        if self.fraction is not None:
            values["compensator.digital.fraction-bits"] = float(self.fraction)
        if self.feedback_fraction is not None:
            values["compensator.digital.feedback-fraction-bits"] = float(self.feedback_fraction)
        if self.output_range:
            values["compensator.digital.output-range"] = self.output_range
        return choices, values


def multiply(polynomial, root):
    """A polynomial in falling powers times (z - root)."""
    return [one - root * other for one, other in zip([*polynomial, 0], [0, *polynomial])]


def code(value, fraction):
    scaled = value * 2.0**fraction
    return int(np.floor(abs(scaled) + 0.5)) * (1 if scaled >= 0.0 else -1)


def automatic(values, bits):
    fits = [f for f in range(63) if all(-2**(bits - 1) <= code(v, f) <= 2**(bits - 1) - 1 for v in values)]
    return max(fits)


def check_libraries(digital, period, full):
    """scipy's bilinear form; python-control's matched form of each lag or lead by itself."""
    feedback, forward = digital.exact(period, full)
    if digital.method != "matched":
        # A longer period is what prewarping amounts to.
        step = period
        if digital.method == "tustin-prewarped":
            w = TAU * digital.prewarp
            step = 2.0 * np.tan(w * period / 2.0) / w
        numerator, denominator = np.array([TAU * digital.gain / digital.scale(full)]), np.array([1.0, 0.0])
        for f in digital.zeros:
            numerator = np.polymul(numerator, [1.0 / (TAU * f), 1.0])
        for f in digital.poles:
            denominator = np.polymul(denominator, [1.0 / (TAU * f), 1.0])
        num, den, _ = cont2discrete((numerator, denominator), step, "bilinear")
        num, den = np.atleast_2d(num)[0] / den[0], den / den[0]
        assert np.max(np.abs(num - forward)) <= 1e-9 * np.max(np.abs(forward)), (num, forward)
        assert np.max(np.abs(-den[1:] - feedback)) <= 1e-9 * np.max(np.abs(feedback)), (den, feedback)
        return
    for f_z, f_p in zip(digital.zeros, digital.poles):
        system = control.tf([1.0 / (TAU * f_z), 1.0], [1.0 / (TAU * f_p), 1.0])
        theirs = control.sample_system(system, period, method="matched")
        for root, f in [(theirs.zeros()[0], f_z), (theirs.poles()[0], f_p)]:
            assert abs(root.real - np.exp(-TAU * f * period)) < 1e-12


def random_cases(count):
    draw = random.Random(51)

    def log(low, high):
        return low * (high / low) ** draw.random()

    rows = []
    for k in range(count):
        fs = log(50e3, 2e6)
        period = 1.0 / fs
        order, zeros = draw.choice([2, 3]), draw.choice([1, 2])
        method = ["tustin", "tustin-prewarped", "matched"][k % 3]
        digital = Digital(
            method, log(fs / 1e3, fs / 20.0), tuple(log(fs / 2e3, fs / 20.0) for _ in range(zeros)),
            tuple(log(fs / 20.0, fs / 2.2) for _ in range(order - 1)), 1.2, 10e3, log(1e3, 10e3), log(1.6, 5.0),
            bits=draw.choice([10, 12, 16, 18, 24, 32]), prewarp=log(fs / 50.0, fs / 4.0) if method == "tustin-prewarped" else 0.0,
            computation=draw.choice([0.0, 0.3 / fs, 0.9 / fs]), rounding=draw.choice(["integrator", "integrator", "nearest"]),
        )
        full = log(0.5, 4.0)
        feedback, forward = digital.exact(period, full)
        if max(map(abs, feedback + forward)) > 0.9 * 2.0**(digital.bits - 1):
            digital.bits = 32
        check_libraries(digital, period, full)
        choices, values = digital.entries()
        words = digital.words(period, full)
        frequencies = np.geomspace(fs / 1e4, fs / 2.02, 12)
        late = np.exp(-1j * TAU * frequencies * digital.computation)
        rows.append({
            "choices": choices | {"control.mode": "voltage"},
            "values": values | {"stage.switching-frequency": fs, "control.ramp.amplitude": full},
            "feedback": feedback, "forward": forward, "words": words,
            "frequencies_hz": frequencies.tolist(),
            "response": pairs(answer(words, digital.scale(full), TAU * frequencies * period) * late),
        })
    return rows


def answer(words, scale, angle):
    """C(z) on the unit circle."""
    back = np.exp(-1j * np.asarray(angle))
    top = sum(b * back**k for k, b in enumerate(words["forward"]))
    return scale * top / (1.0 - sum(a * back**k for k, a in enumerate(words["feedback"], 1)))


class SampledLoop(ControlledLoop):
    """One design closed by a difference equation."""

    def __init__(self, design, vin, load):
        super().__init__(design, vin, load)
        digital = design.network
        self.full = digital.output_range or self.control.ramp
        self.words = digital.words(self.period, self.full)
        self.modulator = self.model.duty * self.period

    def responses(self, frequency):
        s = 2j * np.pi * np.atleast_1d(frequency)
        digital = self.design.network
        out, _ = self.stage_responses(s)
        compensator = answer(self.words, digital.scale(self.full), s.imag * self.period) * np.exp(-s * digital.computation)
        plant = out[:, 2] * np.exp(-s * self.modulator)
        loop = plant * compensator
        return {
            "plant": plant,
            "compensator": compensator,
            "loop": loop,
            "open_loop_output_impedance": -out[:, 1],
            "output_impedance": -out[:, 1] / (1.0 + loop),
            "open_loop_line_to_output": out[:, 0],
            "line_to_output": out[:, 0] / (1.0 + loop),
            "reference_to_output": plant * compensator / digital.divider / (1.0 + loop),
        }

    # --- the exact map of a period ------------------------------------------------------------------------------------

    def timing(self):
        """(A, B, C, D) of the stage without delay; when a value acts: whole periods and the rest [s]."""
        td = self.design.network.computation + self.modulator + self.design.delay
        whole = int(np.floor(td / self.period))
        return self.controlled(late=False), whole, td - whole * self.period

    def map(self):
        """One period: states of the stage, past outputs u[n-1].., past errors e[n-1].., with inputs."""
        (a, b, c, d), whole, rest = self.timing()
        scale = self.design.network.scale(self.full)
        back, ahead = self.words["feedback"], self.words["forward"]
        n, n_u, n_e = len(a), max(len(back), whole), len(ahead) - 1
        size = n + n_u + n_e
        error = np.zeros(size)
        error[:n] = -c
        new = np.zeros(size)
        new[n:n + len(back)] = back
        new += ahead[0] * error
        new[n + n_u:] += ahead[1:]
        step = np.zeros((size, size))
        step[:n, :n] = expm(a * self.period)
        kick = scale * self.period * expm(a * (self.period - rest)) @ b[:, 2]
        acting = new if whole == 0 else np.eye(size)[n + whole - 1]
        step[:n] += np.outer(kick, acting)
        step[n] = new
        for k in range(1, n_u):
            step[n + k, n + k - 1] = 1.0
        if n_e:
            step[n + n_u] = error
            for k in range(1, n_e):
                step[n + n_u + k, n + n_u + k - 1] = 1.0
        return step

    def pulse_response(self, angle):
        """P(z) on the unit circle: output at the samples from control voltage values."""
        (a, b, c, _), whole, rest = self.timing()
        z = np.exp(1j * np.asarray(angle))
        kick = expm(a * (self.period - rest)) @ b[:, 2] * self.period
        grown = expm(a * self.period)
        return np.array([c @ np.linalg.solve(v * np.eye(len(a)) - grown, kick.astype(complex)) * v**-whole for v in z])

    def sampled_loop(self, frequency):
        angle = TAU * np.atleast_1d(frequency) * self.period
        return self.pulse_response(angle) * answer(self.words, self.design.network.scale(self.full), angle)

    def steps(self, periods):
        """Deviation of the output [V] at every part of a period after each event, and where it ends."""
        (a, b, c, d), whole, rest = self.timing()
        n, period = len(a), self.period
        scale = self.design.network.scale(self.full)
        back, ahead = self.words["feedback"], self.words["forward"]
        result = {}
        for name, column, (change, slew) in [("load", 1, self.design.load_step), ("line", 0, self.design.line_step),
                                             ("reference", 2, self.design.reference_step)]:
            rise = abs(change) / slew
            slope = change / rise
            x, past_u, past_e, waiting = np.zeros(n), [0.0] * len(back), [0.0] * (len(ahead) - 1), [0.0] * whole
            # Ramp and its value are two more states while the event lasts.
            driven = np.zeros((n + 2, n + 2))
            driven[:n, :n] = a
            if column < 2:
                driven[:n, n] = b[:, column]
            driven[n, n + 1] = 1.0
            values = []

            def advance(x, start, length):
                """State after a time, from `start` after the event."""
                while length > 1e-15 * period:
                    going = start < rise
                    piece = min(length, rise - start) if going and start + length > rise else length
                    state = np.concatenate([x, [slope * min(start, rise), slope if going else 0.0]])
                    x = (expm(driven * piece) @ state)[:n]
                    start, length = start + piece, length - piece
                return x

            for k in range(periods):
                now = k * period
                wanted = slope * min(now, rise) if column == 2 else 0.0
                # The first sample comes just before the event begins, but for the reference.
                event = slope * min(now, rise) if column < 2 else 0.0
                y = c @ x + (d[column] * event if column < 2 else 0.0)
                e = wanted - y
                u = sum(f * v for f, v in zip(back, past_u)) + ahead[0] * e + sum(f * v for f, v in zip(ahead[1:], past_e))
                past_u, past_e = [u, *past_u][:len(back)], [e, *past_e][:len(ahead) - 1]
                waiting.append(u)
                acting = waiting.pop(0)
                seen = x
                for part in range(PARTS):
                    begin, end = part * period / PARTS, (part + 1) * period / PARTS
                    at = now + begin
                    values.append(c @ seen + (d[column] * slope * min(at, rise) if column < 2 else 0.0))
                    if begin <= rest < end:
                        seen = advance(seen, at, rest - begin)
                        seen = seen + b[:, 2] * scale * period * acting
                        seen = advance(seen, now + rest, end - rest)
                    else:
                        seen = advance(seen, at, end - begin)
                x = seen
            result[name] = {"values_v": [float(v) for v in values]}
        return result


def crossovers(function, fs):
    """Crossovers of a loop gain up to half the sampling frequency, with their margins."""
    from scipy.optimize import brentq
    x = np.linspace(np.log(fs * 1e-5), np.log(fs / 2.0 * 0.9999), 6001)
    t = function(np.exp(x))
    gain = np.log(np.abs(t))
    found = []
    for k in np.nonzero(np.sign(gain[:-1]) != np.sign(gain[1:]))[0]:
        root = brentq(lambda v: np.log(abs(function(np.exp(v))[0])), x[k], x[k + 1], xtol=1e-14, rtol=1e-14)
        found.append({"frequency_hz": float(np.exp(root)),
                      "phase_margin_deg": float(np.angle(-function(np.exp(root))[0], deg=True)), "falling": bool(gain[k] > 0.0)})
    return found


def closed_loop(design):
    choices, values = design.entries()
    nominal = SampledLoop(design, design.vin[1], design.load[1])
    fs = 1.0 / nominal.period
    digital = design.network
    check_libraries(digital, nominal.period, nominal.full)
    # The map's poles are the roots of 1 + L(z): evaluate at each.
    multipliers = np.linalg.eigvals(nominal.map())
    (a, b, c, _), whole, rest = nominal.timing()
    for z in multipliers[np.abs(multipliers) > 0.05]:
        p = c @ np.linalg.solve(z * np.eye(len(a)) - expm(a * nominal.period), expm(a * (nominal.period - rest)) @ b[:, 2] + 0j)
        loop = p * nominal.period * z**-whole * answer_at(nominal.words, digital.scale(nominal.full), z)
        assert abs(1.0 + loop) < 1e-6 * max(abs(loop), 1.0), (z, loop)
    assert np.all(np.abs(multipliers) < 1.0)
    frequencies = np.geomspace(fs / 1e5, 0.48 * fs, 30)
    conditions = []
    for vin in design.vin:
        for load in design.load:
            loop = SampledLoop(design, vin, load)
            assert np.all(np.abs(np.linalg.eigvals(loop.map())) < 1.0), (design.title, vin, load)
            conditions.append({
                "input_voltage": vin, "load_current": load, "duty": float(loop.model.duty),
                **loop.margins(),
                "sampled_crossovers": crossovers(loop.sampled_loop, fs),
                "modulator_delay_s": float(loop.modulator),
            })
    found = {
        "title": design.title, "choices": choices, "values": values, "regulated_output": design.regulated,
        "words": nominal.words,
        "frequencies_hz": frequencies.tolist(),
        "responses": {name: pairs(curve) for name, curve in nominal.responses(frequencies).items()},
        "sampled_loop": pairs(nominal.sampled_loop(frequencies)),
        "conditions": conditions,
        "poles_z": pairs(sorted(multipliers[np.abs(multipliers) > 1e-3], key=lambda z: (-round(abs(z), 10), z.imag))),
        "parts": PARTS,
        "steps": nominal.steps(60),
    }
    print(design.title, [(round(c["frequency_hz"]), round(float(c["phase_margin_deg"]), 2)) for c in conditions[4]["crossovers"]],
          [(round(c["frequency_hz"]), round(c["phase_margin_deg"], 2)) for c in conditions[4]["sampled_crossovers"]],
          nominal.words["feedback_codes"], nominal.words["forward_codes"])
    return found


def answer_at(words, scale, z):
    top = sum(b * z**-k for k, b in enumerate(words["forward"]))
    return scale * top / (1.0 - sum(a * z**-k for k, a in enumerate(words["feedback"], 1)))


def main():
    from digital_designs import DESIGNS

    warnings.simplefilter("error")
    write({
        "about": "made by tests/reference/digital.py; complex values as [real, imaginary]; words: rounded coefficients; steps at every part of a "
                 "period from the event on, deviation of the output",
        "equations": random_cases(90),
        "designs": [closed_loop(design) for design in DESIGNS],
    }, sys.argv[1])


if __name__ == "__main__":
    main()
