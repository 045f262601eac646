"""Times general-purpose Python libraries at the same tasks as the crate's benchmarks, and prints medians and ratios.

Tasks, on one loop of six states: W1 gain in dB and unwrapped phase at 2,000 frequencies; W2 all crossovers and margins;
W3 the closed loop's step response at 1,000 times. Each is done by the call of a control library, as its user would, and by
the best plain numpy/scipy found here; of several ways the fastest counts. One thread. W6, the exact switched loop, is in
switched_peers.py.

    peers.py                     medians of the Python side
    peers.py --criterion DIR     the same beside the medians of `cargo bench`, with ratios and aims
"""

import argparse
import cmath
import json
import math
import os
import pathlib
import time
import warnings

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[name] = "1"

import control  # noqa: E402
import numpy as np  # noqa: E402
import scipy.linalg  # noqa: E402
import scipy.signal  # noqa: E402
import switched_peers  # noqa: E402

warnings.filterwarnings("ignore")

TAU = 2 * np.pi
# The loop of tests/bench/linear.rs: corner frequencies in hertz.
LC_HZ, LC_Q = 2e3, 3.0
LC = TAU * LC_HZ * complex(-0.5 / LC_Q, np.sqrt(1 - 0.25 / LC_Q**2))
ZEROS = -TAU * np.array([1.6e3, 2.2e3, 80e3, -45e3])
POLES = np.concatenate([[0, LC, LC.conjugate()], -TAU * np.array([60e3, 150e3, 800e3])])
UNITY_HZ, PLANT_GAIN = 264.0, 20.0
GAIN = PLANT_GAIN * TAU * UNITY_HZ * np.prod(-POLES[1:]).real / np.prod(-ZEROS)
FREQUENCIES = np.geomspace(10, 150e3, 2000)
TIMES = np.arange(1000) * 1e-6

AIMS = {"W1": (5, 3), "W2": (50, 10), "W3": (500, 20)}
W8_AIM_S = 1e-3
NAMES = {"W1": "response, 2,000 points", "W2": "all margins", "W3": "closed-loop step, 1,000 points"}


def systems():
    """The loop and the closed loop as the libraries want them."""
    num, den = GAIN * np.poly(ZEROS), np.poly(POLES).real
    a, b, c, d = scipy.signal.zpk2ss(ZEROS, POLES, GAIN)
    closed_a, closed_b = a - b @ c, b
    # Scaling the states once keeps the closed loop's numbers good; it is not timed.
    closed_a, (scale, _) = scipy.linalg.matrix_balance(closed_a, permute=False, separate=True)
    closed_b, closed_c = closed_b / scale[:, None], c * scale
    return num, den, (a, b, c, d), (closed_a, closed_b, closed_c, np.zeros((1, 1)))


NUM, DEN, OPEN, CLOSED = systems()
TF = control.TransferFunction(NUM, DEN)
CLOSED_SS = control.StateSpace(*CLOSED)
OPEN_SS = control.StateSpace(*OPEN)


# W1 ---------------------------------------------------------------------------------------------------------------------


def w1_library():
    """The frequency response of the transfer function, gain in dB and unwrapped phase."""
    answer = control.frequency_response(TF, TAU * FREQUENCIES)
    return 20 * np.log10(answer.magnitude.ravel()), np.degrees(np.unwrap(answer.phase.ravel()))


def w1_library_state_space():
    answer = control.frequency_response(OPEN_SS, TAU * FREQUENCIES)
    return 20 * np.log10(answer.magnitude.ravel()), np.degrees(np.unwrap(answer.phase.ravel()))


def w1_scipy():
    _, gain, phase = scipy.signal.bode((NUM, DEN), TAU * FREQUENCIES)
    return gain, phase


S = 1j * TAU * FREQUENCIES
OMEGA = TAU * FREQUENCIES
OMEGA2 = OMEGA * OMEGA
# Even and odd coefficients in ω², signs of j² included, highest first; numpy.polyval on complex s costs four times as much.


def _split(coefficients):
    rising = coefficients[::-1]
    even = [(-1) ** k * x for k, x in enumerate(rising[0::2])]
    odd = [(-1) ** k * x for k, x in enumerate(rising[1::2])]
    return even[::-1], odd[::-1]


NUM_EVEN, NUM_ODD = _split(NUM)
DEN_EVEN, DEN_ODD = _split(DEN)


def _horner(coefficients, x):
    value = np.full_like(x, coefficients[0])
    for coefficient in coefficients[1:]:
        value *= x
        value += coefficient
    return value


def w1_numpy_complex():
    t = np.polyval(NUM, S) / np.polyval(DEN, S)
    return 20 * np.log10(np.abs(t)), np.degrees(np.unwrap(np.angle(t)))


def w1_numpy_split():
    """Real Horner in ω², then one logarithm, one arc tangent, and a cumulative unwrapping."""
    nr, ni = _horner(NUM_EVEN, OMEGA2), OMEGA * _horner(NUM_ODD, OMEGA2)
    dr, di = _horner(DEN_EVEN, OMEGA2), OMEGA * _horner(DEN_ODD, OMEGA2)
    gain = 10 * np.log10((nr * nr + ni * ni) / (dr * dr + di * di))
    phase = np.arctan2(ni * dr - nr * di, nr * dr + ni * di)
    turns = np.cumsum(np.round(np.diff(phase) / TAU))
    phase[1:] -= TAU * turns
    return gain, phase * (180 / np.pi)


# W2 ---------------------------------------------------------------------------------------------------------------------


def w2_library():
    """Gain, phase and modulus margins with their frequencies, all of them."""
    return control.stability_margins(TF, returnall=True)


def w2_library_state_space():
    return control.stability_margins(OPEN_SS, returnall=True)


def w2_numpy():
    """Real polynomials in ω²: |N|² − |D|² for crossovers, Im(N·D*) for phase crossings; |1 + T| on a grid, then Newton."""
    nn = np.polyadd(np.polymul(NUM_EVEN, NUM_EVEN), np.append(np.polymul(NUM_ODD, NUM_ODD), 0.0))
    dd = np.polyadd(np.polymul(DEN_EVEN, DEN_EVEN), np.append(np.polymul(DEN_ODD, DEN_ODD), 0.0))
    square = np.roots(np.polysub(nn, dd))
    w = np.sqrt(square[(abs(square.imag) < 1e-9 * abs(square)) & (square.real > 0)].real)
    t = np.polyval(NUM, 1j * w) / np.polyval(DEN, 1j * w)
    phase_margin = 180 - (-np.degrees(np.angle(t))) % 360
    imaginary = np.polysub(np.polymul(NUM_ODD, DEN_EVEN), np.polymul(NUM_EVEN, DEN_ODD))
    square = np.roots(imaginary)
    wp = np.sqrt(square[(abs(square.imag) < 1e-9 * abs(square)) & (square.real > 0)].real)
    tp = (np.polyval(NUM, 1j * wp) / np.polyval(DEN, 1j * wp)).real
    gain_margin = -20 * np.log10(-tp[tp < 0])
    # |1 + T|² = |N + D|²/|D|²: stationary where its derivative by ω² vanishes.
    total = np.polyadd(NUM, DEN)
    even, odd = _split(total)
    tt = np.polyadd(np.polymul(even, even), np.append(np.polymul(odd, odd), 0.0))
    stationary = np.roots(np.polysub(np.polymul(np.polyder(tt), dd), np.polymul(tt, np.polyder(dd))))
    ws = stationary[(abs(stationary.imag) < 1e-9 * abs(stationary)) & (stationary.real > 0)].real
    modulus = np.sqrt(np.min(np.polyval(tt, ws) / np.polyval(dd, ws)))
    return w / TAU, phase_margin, wp[tp < 0] / TAU, gain_margin, modulus


SCAN = np.geomspace(0.3, 150e3, 300) * TAU
SCAN2 = SCAN * SCAN
NUM_LIST, DEN_LIST = [float(x) for x in NUM], [float(x) for x in DEN]


def _point(w):
    """T at one frequency [rad/s] in plain Python complex numbers, which beat numpy on single values."""
    s = 1j * w
    n = 0j
    for x in NUM_LIST:
        n = n * s + x
    d = 0j
    for x in DEN_LIST:
        d = d * s + x
    return n / d


def _close(function, low, high):
    """Secant within a bracket, in ln ω."""
    low, high = math.log(low), math.log(high)
    at_low, at_high = function(math.exp(low)), function(math.exp(high))
    for _ in range(60):
        x = low - at_low * (high - low) / (at_high - at_low)
        here = function(math.exp(x))
        if abs(here) < 1e-12:
            break
        if (here > 0) == (at_low > 0):
            low, at_low, at_high = x, here, at_high * 0.5
        else:
            high, at_high, at_low = x, here, at_low * 0.5
    return math.exp(x)


def w2_numpy_scan():
    """A scan of 300 points by real Horner, then a secant on each bracket."""
    nr, ni = _horner(NUM_EVEN, SCAN2), SCAN * _horner(NUM_ODD, SCAN2)
    dr, di = _horner(DEN_EVEN, SCAN2), SCAN * _horner(DEN_ODD, SCAN2)
    size = dr * dr + di * di
    above = nr * nr + ni * ni > size
    re, im = nr * dr + ni * di, ni * dr - nr * di
    crossovers = [
        _close(lambda w: math.log(abs(_point(w))), SCAN[i], SCAN[i + 1]) for i in np.flatnonzero(above[1:] != above[:-1])
    ]
    phase_margins = [180 - (-math.degrees(cmath.phase(_point(w)))) % 360 for w in crossovers]
    turning = np.flatnonzero(((im[1:] > 0) != (im[:-1] > 0)) & (re[1:] < 0))
    crossings = [_close(lambda w: cmath.phase(-_point(w)), SCAN[i], SCAN[i + 1]) for i in turning]
    gain_margins = [-20 * math.log10(abs(_point(w))) for w in crossings]
    least = int(np.argmin(((nr + dr) ** 2 + (ni + di) ** 2) / size))
    best, low, high = None, math.log(SCAN[max(least - 1, 0)]), math.log(SCAN[min(least + 1, len(SCAN) - 1)])
    for _ in range(20):  # golden section to 1e-6 of the interval
        third = 0.381966 * (high - low)
        left, right = abs(1 + _point(math.exp(low + third))), abs(1 + _point(math.exp(high - third)))
        low, high, best = (low, high - third, left) if left < right else (low + third, high, right)
    return np.array(crossovers) / TAU, np.array(phase_margins), np.array(crossings) / TAU, np.array(gain_margins), best


# W3 ---------------------------------------------------------------------------------------------------------------------


def w3_library():
    return control.step_response(CLOSED_SS, TIMES).outputs


def w3_scipy():
    return scipy.signal.step(CLOSED, T=TIMES)[1]


def w3_numpy_modal():
    """Eigenvectors, then one matrix of exponentials."""
    a, b, c, _ = CLOSED
    poles, vectors = np.linalg.eig(a)
    residues = (c @ vectors)[0] * np.linalg.solve(vectors, b[:, 0]) / poles
    return (np.exp(np.outer(TIMES, poles)) @ residues - residues.sum()).real


def w3_numpy_powers():
    """One exponential of the augmented matrix, then rows by doubling: ten products for a thousand points."""
    a, b, c, _ = CLOSED
    n = len(a)
    augmented = np.zeros((n + 1, n + 1))
    augmented[:n, :n], augmented[:n, n:] = a * 1e-6, b * 1e-6
    power = scipy.linalg.expm(augmented)
    states = np.zeros((n + 1, 1024))
    states[n, 0] = 1.0
    count = 1
    while count < 1000:
        states[:, count : 2 * count] = power @ states[:, :count]
        power = power @ power
        count *= 2
    return (c @ states[:n, :1000])[0]


TASKS = {
    "W1": ([w1_library, w1_library_state_space, w1_scipy], [w1_numpy_complex, w1_numpy_split]),
    "W2": ([w2_library, w2_library_state_space], [w2_numpy, w2_numpy_scan]),
    "W3": ([w3_library, w3_scipy], [w3_numpy_modal, w3_numpy_powers]),
}


def median_seconds(task, budget_s=1.5):
    """Median over repetitions; a fast task is timed in batches, so that the clock does not count."""
    task()
    begin = time.perf_counter()
    task()
    once = time.perf_counter() - begin
    batch = max(1, int(2e-4 / once))
    samples = []
    begin = time.perf_counter()
    while time.perf_counter() - begin < budget_s or len(samples) < 5:
        start = time.perf_counter()
        for _ in range(batch):
            task()
        samples.append((time.perf_counter() - start) / batch)
    return float(np.median(samples))


def check():
    """All ways of one task agree, so that the fastest did the whole work."""
    reference = w1_numpy_complex()
    for task in TASKS["W1"][0] + TASKS["W1"][1]:
        gain, phase = task()
        assert np.allclose(gain, reference[0], atol=1e-6), task.__name__
        offset = 360 * np.round((phase[0] - reference[1][0]) / 360)
        assert np.allclose(phase - offset, reference[1], atol=1e-6), task.__name__
    crossovers, phase_margins, phase_crossovers, gain_margins, modulus = w2_numpy()
    gm, pm, sm, wpc, wgc, _ = w2_library()
    assert np.allclose(np.sort(wgc), TAU * np.sort(crossovers), rtol=1e-6)
    assert np.isclose(np.min(np.abs(sm)), modulus, rtol=1e-3)
    for ours, theirs in zip(w2_numpy_scan(), w2_numpy(), strict=True):
        assert np.allclose(ours, theirs, rtol=1e-6), (ours, theirs)
    reference = w3_numpy_modal()
    for task in TASKS["W3"][0] + TASKS["W3"][1]:
        assert np.allclose(task(), reference, atol=1e-6), task.__name__
    print(f"crossover {crossovers} Hz, phase margin {phase_margins}°, phase crossing {phase_crossovers} Hz,")
    print(f"gain margin {gain_margins} dB, modulus margin {modulus!r}, step at 0.1 ms {reference[100]!r}\n")


def criterion_median(folder, key):
    files = list(pathlib.Path(folder).glob(f"{key}*/new/estimates.json"))
    if not files:
        raise SystemExit(f"no benchmark named {key}… in {folder}: run `cargo bench` first")
    return json.loads(files[0].read_text())["median"]["point_estimate"] * 1e-9


def text(seconds):
    return f"{seconds * 1e6:,.1f} µs"


def beside_w6(criterion):
    """The exact switched loop: scipy frequency by frequency and numpy all at once; the aim is a time."""
    switched_peers.check()
    (key, name), (plain, best) = switched_peers.NAME, switched_peers.TASKS
    print(f"{key} {name}")
    times = {task.__name__: median_seconds(task) for task in plain + best}
    for task, seconds in times.items():
        print(f"    {task:28}{text(seconds):>16}")
    if not criterion:
        return False
    ours = criterion_median(criterion, key)
    met = ours <= switched_peers.AIM_S
    print(f"    {'this crate':28}{text(ours):>16} (aim {text(switched_peers.AIM_S)}){'' if met else '   MISSED'}")
    for side, tasks in (("plain scipy", plain), ("best numpy", best)):
        print(f"    {side:14}{min(times[task.__name__] for task in tasks) / ours:10,.1f} ×")
    return not met


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--criterion", help="folder of criterion's results, target/criterion")
    options = parser.parse_args()
    check()
    missed = False
    for key, (library, plain) in TASKS.items():
        print(f"{key} {NAMES[key]}")
        times = {task.__name__: median_seconds(task) for task in library + plain}
        for name, seconds in times.items():
            print(f"    {name:28}{text(seconds):>16}")
        if options.criterion:
            ours = criterion_median(options.criterion, key)
            print(f"    {'this crate':28}{text(ours):>16}")
            sides = [("library call", library, AIMS[key][0]), ("best numpy", plain, AIMS[key][1])]
            for side, tasks, aim in sides:
                ratio = min(times[task.__name__] for task in tasks) / ours
                met = ratio >= aim
                missed |= not met
                print(f"    {side:14}{ratio:10,.1f} × (aim {aim} ×){'' if met else '   MISSED'}")
    missed |= beside_w6(options.criterion)
    if options.criterion:
        # No library does this task; the aim is a time: one edit must fit well inside a frame.
        ours = criterion_median(options.criterion, "W8")
        met = ours <= W8_AIM_S
        missed |= not met
        print(f"W8 one edit, nine conditions, plot data\n    {'this crate':28}{text(ours):>16} (aim {text(W8_AIM_S)}){'' if met else '   MISSED'}")
    return 1 if missed else 0


if __name__ == "__main__":
    raise SystemExit(main())
