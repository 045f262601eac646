"""Exact periodic orbits of switched boosts: the average output at a given duty ratio, for banks that averaging may get wrong.

    python switched.py OUTPUT.json

Each interval's equations (stages.py, written by hand) are solved by the matrix exponential, the state that repeats after one period is found
from the two maps, and the output is integrated exactly along the way.  No averaging, no small ripple.
"""

import sys

import numpy as np
from scipy.linalg import expm

from output import write
from stages import Branch, Stage, intervals

VIN, DUTY = 9.0, 0.625


def average_output(stage, duty, resistance):
    """Mean output voltage [V] over one period of the orbit, into a resistor."""
    on, off, names = intervals(stage, resistance, 1.0)
    period = 1.0 / stage.fs
    u = np.array([VIN, 1.0, 0.0])
    n = len(names)

    def advance(equations, time):
        # States, the constant 1, and the running integral of the states.
        a, b, _, _ = equations
        m = np.zeros((2 * n + 1, 2 * n + 1))
        m[:n, :n] = a
        m[:n, n] = b @ u
        m[n + 1:, :n] = np.eye(n)
        return expm(m * time)

    first, second = advance(on, duty * period), advance(off, (1.0 - duty) * period)
    f1, g1, f2, g2 = first[:n, :n], first[:n, n], second[:n, :n], second[:n, n]
    start = np.linalg.solve(np.eye(n) - f2 @ f1, f2 @ g1 + g2)
    middle = f1 @ start + g1
    total = 0.0
    for equations, step, state, share in [(on, first, start, duty), (off, second, middle, 1.0 - duty)]:
        _, _, c, d = equations
        integral = step[n + 1:, :n] @ state + step[n + 1:, n]
        total += c[0] @ integral + (d @ u)[0] * share * period
    return float(total / period)


def boost(bank, losses=0.0):
    return Stage("boost", 300e3, 10e-6, losses, losses, "synchronous", bank, "resistor", synchronous=losses)


CASES = [
    ("one branch", boost([Branch(150e-6, 3e-3)])),
    ("one branch, 1 nH", boost([Branch(150e-6, 3e-3, 1e-9)])),
    ("one branch, 5 nH", boost([Branch(150e-6, 3e-3, 5e-9)])),
    ("electrolytic beside one ceramic", boost([Branch(470e-6, 0.1), Branch(10e-6, 3e-3)], 0.01)),
    ("electrolytic beside four ceramics", boost([Branch(470e-6, 0.1), Branch(10e-6, 3e-3, 0.0, 4)], 0.01)),
    ("polymer beside six ceramics", boost([Branch(470e-6, 0.03), Branch(22e-6, 2e-3, 0.0, 6, 0.5)], 0.01)),
    ("two electrolytics", boost([Branch(330e-6, 0.15), Branch(100e-6, 0.1)], 0.01)),
]


def main():
    rows = []
    for title, stage in CASES:
        values = {
            "stage.switching-frequency": stage.fs,
            "stage.inductor.inductance": stage.inductance,
            "stage.inductor.resistance": stage.winding,
            "stage.switch.resistance": stage.switch,
            "stage.synchronous.resistance": stage.synchronous,
        }
        for k, branch in enumerate(stage.bank, 1):
            values[f"stage.bank.{k}.capacitance"] = branch.capacitance
            values[f"stage.bank.{k}.remaining"] = branch.remaining
            values[f"stage.bank.{k}.esr"] = branch.esr
            values[f"stage.bank.{k}.esl"] = branch.esl
            values[f"stage.bank.{k}.count"] = branch.count
        rows.append({
            "title": title,
            "branches": str(len(stage.bank)),
            "values": values,
            "output": average_output(stage, DUTY, 16.0),
        })
    write({"about": "made by tests/reference/switched.py: 9 V boosts into 16 ohm at a duty ratio of 0.625, exact periodic orbit",
           "cases": rows}, sys.argv[1])


if __name__ == "__main__":
    main()
