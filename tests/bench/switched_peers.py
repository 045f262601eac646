"""Times Python at W6: the exact loop of a switched boost with a type III at 500 frequencies, orbit included; see tests/bench/switched.rs.

Stage and compensator are written by hand; a voltage-mode comparator without delay.  Two ways, both by matrix exponentials: frequency
by frequency with scipy, as one would write it first, and all frequencies at once with numpy.  Both agree to rounding.

    switched_peers.py            the values that tests/bench/switched.rs checks against
"""

import numpy as np
from scipy.linalg import expm

TAU = 2 * np.pi
PERIOD, RAMP = 1 / 300e3, 1.5
VIN, LOAD, REFERENCE = 12.0, 12.0, 2.4
FREQUENCIES = np.geomspace(100.0, 900e3, 500)


def equations():
    """(A, b) of both intervals over [i, v, vc, v1, v2, v3], output and control row; the output row of each."""
    inductance, winding, on, capacitance, esr = 10e-6, 10e-3, 8e-3, 150e-6, 10e-3
    upper, lower, r2, c1, c2, r3, c3 = 90e3, 10e3, 10e3, 22e-9, 220e-12, 2.2e3, 1e-9
    gain, omega = 10e3, TAU * 10e6 / 10e3
    share = LOAD / (LOAD + esr)
    found = []
    for conducts in (True, False):
        out = np.array([0.0 if conducts else share * esr, share, 0, 0, 0, 0])
        a, b = np.zeros((6, 6)), np.zeros(6)
        a[0, 0] = -(winding + on) / inductance
        b[0] = VIN / inductance
        if not conducts:
            a[0] -= out / inductance
        into = np.array([0.0 if conducts else 1.0, 0, 0, 0, 0, 0]) - out / LOAD
        a[1] = into / capacitance
        vc, v1, v2, v3 = np.eye(6)[2:]
        node = v2 + vc
        i3 = (out - node - v3) / r3
        i1 = (v2 - v1) / r2
        a[2] = omega * (-gain * node - vc)
        b[2] = omega * gain * REFERENCE
        a[3] = i1 / c1
        a[4] = ((out - node) / upper + i3 - node / lower - i1) / c2
        a[5] = i3 / c3
        found.append((a, b, out))
    return found


def flow(a, b, time):
    n = len(b)
    m = np.zeros((n + 1, n + 1))
    m[:n, :n], m[:n, n] = a, b
    e = expm(m * time)
    return e[:n, :n], e[:n, n]


def orbit(duty=0.503):
    """Duty ratio, state at the trip and both maps: Newton's method on start state and duty ratio together."""
    (a1, b1, _), (a2, b2, _) = EQUATIONS
    n, x = len(b1), None
    for _ in range(20):
        (e1, p1), (e2, p2) = flow(a1, b1, duty * PERIOD), flow(a2, b2, (1 - duty) * PERIOD)
        if x is None:
            x = np.linalg.solve(np.eye(n) - e2 @ e1, e2 @ p1 + p2)
        trip = e1 @ x + p1
        end = e2 @ trip + p2
        f1, f2 = a1 @ trip + b1, a2 @ end + b2
        j = np.zeros((n + 1, n + 1))
        j[:n, :n] = e2 @ e1 - np.eye(n)
        j[:n, n] = (e2 @ f1 - f2) * PERIOD
        j[n, :n] = e1[2]
        j[n, n] = f1[2] * PERIOD - RAMP
        step = np.linalg.solve(j, -np.append(end - x, trip[2] - RAMP * duty))
        x, duty = x + step[:n], duty + step[n]
        if abs(step[n]) < 1e-13:
            break
    return duty, trip, e1, e2


def kick(duty, trip):
    """What a trip later by one second adds to the state, and the trip's answer to the state and to a volt at the comparator."""
    (a1, b1, _), (a2, b2, _) = EQUATIONS
    f1, f2 = a1 @ trip + b1, a2 @ trip + b2
    return f1 - f2, -1.0 / (f1[2] - RAMP / PERIOD)


def loop_scipy():
    """Frequency by frequency, exponentials of rotated matrices."""
    duty, trip, _, _ = orbit()
    jump, answer = kick(duty, trip)
    (a1, _, _), (a2, _, _) = EQUATIONS
    row = np.eye(6)[2]
    found = []
    for omega in TAU * FREQUENCIES:
        r1, r2 = a1 - 1j * omega * np.eye(6), a2 - 1j * omega * np.eye(6)
        e1, e2 = expm(r1 * duty * PERIOD), expm(r2 * (1 - duty) * PERIOD)
        behind = e1 + np.outer(jump, answer * (row @ e1))
        start = np.linalg.solve(np.eye(6) - e2 @ behind, e2 @ (jump * answer))
        before = e1 @ start
        after = before + jump * answer * (row @ before + 1.0)
        end = e2 @ after
        returned = row @ (np.linalg.solve(r1, before - start) + np.linalg.solve(r2, end - after)) / PERIOD
        found.append(-returned / (1.0 + returned))
    return np.array(found)


def loop_numpy():
    """All frequencies at once: one real exponential per interval, batched solves."""
    duty, trip, e1, e2 = orbit()
    jump, answer = kick(duty, trip)
    (a1, _, _), (a2, _, _) = EQUATIONS
    omega = TAU * FREQUENCIES
    eye = np.eye(6)
    behind = e1 + np.outer(jump, answer * e1[2])
    z = np.exp(1j * omega * PERIOD)
    at = np.exp(1j * omega * duty * PERIOD)
    right = (e2 @ (jump * answer))[:, None] * at
    start = np.linalg.solve(z[:, None, None] * eye - e2 @ behind, right.T[:, :, None])[:, :, 0]
    before = start @ e1.T
    after = before + np.outer(before[:, 2] + at, jump * answer)
    end = after @ e2.T
    # Rows of the resolvent that read the control voltage, from the transposed solves.
    row = eye[2][:, None] + 0j
    w1 = np.linalg.solve((a1.T - 1j * omega[:, None, None] * eye), row[None])[:, :, 0]
    w2 = np.linalg.solve((a2.T - 1j * omega[:, None, None] * eye), row[None])[:, :, 0]
    back = np.conj(at)[:, None]
    returned = np.sum(w1 * (before * back - start), axis=1)
    returned += np.sum(w2 * (end * np.conj(z)[:, None] - after * back), axis=1)
    returned /= PERIOD
    return -returned / (1.0 + returned)


EQUATIONS = equations()

NAME = "W6", "exact switched loop, 500 frequencies"
TASKS = [loop_scipy], [loop_numpy]
AIM_S = 1e-3


def check():
    """Both ways agree; prints what the crate's benchmark checks itself against."""
    first, second = loop_scipy(), loop_numpy()
    assert np.allclose(first, second, rtol=1e-8, atol=0), np.max(abs(first / second - 1))
    global FREQUENCIES
    kept, FREQUENCIES = FREQUENCIES, np.array([10e3, 700e3])
    at = loop_scipy()
    FREQUENCIES = kept
    print(f"duty ratio {float(orbit()[0])!r}, exact loop {complex(at[0])!r} at 10 kHz, {complex(at[1])!r} at 700 kHz\n")


if __name__ == "__main__":
    check()
