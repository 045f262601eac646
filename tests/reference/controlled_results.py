"""What the references of discontinuous conduction, current mode and filters hold of one design; each script names its designs.

Second routes, asserted while running: state space of the controlled stage against scalar algebra at each frequency; python-control against
both; the averaged plant against the exact switched one (orbit.py), whose distance is also kept in the results.
"""

import warnings

import numpy as np

from cells import DOUBLE_ENDED
from closed_loop import check_compensator, pairs
from controlled import ControlledLoop
from interleaved import Interleaved
from orbit import Orbit

FREQUENCIES = 40
SWITCHED = 24  # frequencies of the comparison with the switched stage

# How far averaging may be off the exact switched plant up to fs/5.  Both leave each other with the square of frequency over fs and with
# the ripple's share in the states; the designs show 0.06 to 0.33 dB and 0.02 to 0.7 degrees.  An average-current amplifier lets ripple
# through to the comparator, whose slope it changes; no average sees that, and the designs show up to 8 degrees.
NEAR = {"gain_db": 0.4, "phase_deg": 1.0}
# Phases sampled one after the other are not quite one phase sampled once: 1.2 degrees in the current-mode design with two.
NEAR_PHASES = {"gain_db": 0.4, "phase_deg": 1.5}
NEAR_AVERAGE_CURRENT = {"gain_db": 0.5, "phase_deg": 10.0}


def check_state_space(loop):
    """The assembled controlled stage against algebra, both with the delay's Pade form but for what it differs from the exact delay."""
    a, b, c, d = loop.controlled()
    fs = loop.design.stage.pulse_frequency
    s = 2j * np.pi * np.geomspace(fs / 1e5, fs / 2.0, 25)
    assembled = np.array([c @ np.linalg.solve(z * np.eye(len(a)) - a, b) + d for z in s])
    exact, _ = loop.stage_responses(s)
    bound = 1e-8 if loop.design.delay == 0.0 else 1e-5
    error = np.max(np.abs(assembled - exact) / np.maximum(np.abs(exact), 1e-6 * np.max(np.abs(exact), axis=0)))
    assert error < bound, f"{loop.design.title}: assembled stage off by {error:.1e}"


def against_switched(loop):
    """How far the averaged plant and its poles are from the exact switched ones."""
    fs = loop.design.stage.pulse_frequency
    switched = Interleaved if loop.stage.phases > 1 else Orbit
    orbit = switched(loop)
    frequencies = np.geomspace(fs / 1e4, fs / 2.02, SWITCHED)
    exact = orbit.plant(frequencies)
    apart = exact / loop.responses(frequencies)["plant"]
    gain, phase = np.abs(20.0 * np.log10(np.abs(apart))), np.abs(np.angle(apart, deg=True))
    low = frequencies <= fs / 5.0
    found = {
        "duty": float(orbit.duty),
        "gain_db_to_fifth": round(float(np.max(gain[low])), 4),
        "phase_deg_to_fifth": round(float(np.max(phase[low])), 3),
        "gain_db_to_half": round(float(np.max(gain)), 4),
        "phase_deg_to_half": round(float(np.max(phase)), 3),
        "frequencies_hz": frequencies.tolist(),
        "plant": pairs(exact),
    }
    near = NEAR_AVERAGE_CURRENT if loop.control.mode == "average-current" else NEAR
    if loop.stage.phases > 1:
        near = NEAR_PHASES
    assert found["gain_db_to_fifth"] < near["gain_db"] and found["phase_deg_to_fifth"] < near["phase_deg"], (
        loop.design.title, found)
    flux = loop.stage.topology in DOUBLE_ENDED and np.isfinite(loop.stage.magnetising)
    if loop.sampled and not flux:
        # The eigenvalue that belongs to the current's disturbance; straight lines and stiff voltages give `fast_multiplier`.
        # The phases of one stage are renamed after an Nth of a period: N times that is a period.
        exact = min(orbit.multipliers() ** loop.stage.phases, key=lambda z: abs(z - loop.fast_multiplier))
        # A slow state turns the root of several phases by a trifle.
        assert abs(exact.imag) < (1e-9 if loop.stage.phases == 1 else 1e-3) and abs(exact.real - loop.fast_multiplier) < 0.02, (loop.design.title, exact)
        found["fast_multiplier"] = float(exact.real)
    # The whole loop switched: what its small changes become in one period, beside the averaged closed loop's slowest poles.
    multipliers = switched(loop, closed=True).multipliers()
    assert np.all(np.abs(multipliers) < 1.0), loop.design.title
    found["greatest_closed_multiplier"] = round(float(np.max(np.abs(multipliers))), 8)
    for pole in loop.poles():
        # Those much slower than the switching must be there.
        if abs(pole) < 0.05 * fs:
            z = np.exp(pole / fs / loop.stage.phases)
            nearest = multipliers[np.argmin(np.abs(multipliers - z))]
            assert abs(nearest - z) < 0.1 * abs(1.0 - z), (loop.design.title, pole, z, nearest)
    return found


def condition(design, vin, load, loop_type=ControlledLoop):
    loop = loop_type(design, vin, load)
    model = loop.model
    stable = bool(np.all(loop.poles().real < 0.0))
    found = {
        "input_voltage": vin,
        "load_current": load,
        "conduction": model.conduction,
        "duty": float(model.duty),
        "second_duty": float(model.second),
        "inductor_current": float(model.first),
        "input_current": float(model.input_current.value),
        "inductor_ripple": float(model.first_ripple),
        "stable": stable,
        **loop.margins(),
    }
    if loop.control.mode != "average-current":
        found["control_voltage"] = float(loop.law.value)
    if loop.sampled:
        found["fast_multiplier"] = float(loop.fast_multiplier)
    return found


def inner_margins(loop):
    """Crossover and phase margin of the inner loop of average current control."""
    class Inner(ControlledLoop):
        def loop(self, frequency):
            return self.responses(frequency)["inner_loop"]

    return Inner(loop.design, loop.vin, loop.load).margins()


def result(design, switched=True, frequencies=FREQUENCIES):
    warnings.simplefilter("error")
    choices, values = design.entries()
    fs = design.stage.pulse_frequency
    check_compensator(design.network, fs)
    nominal = ControlledLoop(design, design.vin[1], design.load[1])
    check_state_space(nominal)
    frequencies = np.geomspace(fs / 1e5, fs / 2.0, frequencies)
    found = {
        "title": design.title,
        "choices": choices,
        "values": values,
        "regulated_output": design.regulated,
        "frequencies_hz": frequencies.tolist(),
        "responses": {name: pairs(curve) for name, curve in nominal.responses(frequencies).items()},
        "conditions": [condition(design, vin, load) for vin in design.vin for load in design.load],
        "poles": pairs(nominal.poles()),
        "steps": nominal.steps(),
    }
    if design.control.mode == "average-current":
        found["inner_margins"] = inner_margins(nominal)
    if switched:
        found["switched"] = against_switched(nominal)
        s = found["switched"]
        print(f"{design.title}: to fs/5 {s['gain_db_to_fifth']:.3f} dB {s['phase_deg_to_fifth']:.2f} deg, "
              f"to fs/2 {s['gain_db_to_half']:.2f} dB {s['phase_deg_to_half']:.1f} deg")
    return found
