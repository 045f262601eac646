"""W7 by a general library: the closed loop of tests/bench/transient.rs by scipy's solve_ivp, every switching instant an event.

The equations are written by hand (boost, its input capacitor left out; op amp with one pole, type III network); of several methods the fastest
counts. So many periods are timed that it takes seconds, and scaled to 5,000.

    transient_peers.py                     time of the Python side
    transient_peers.py --criterion DIR     the same beside the median of `cargo bench`
"""

import argparse
import json
import pathlib
import time

import numpy as np
from scipy.integrate import solve_ivp

TAU = 2 * np.pi
VIN, FS, L, RL, RS, RR, LOAD = 12.0, 300e3, 10e-6, 14e-3, 9e-3, 11e-3, 24.0
C, ESR = 5 * 0.91 * 33e-6, 18e-3 / 5
RAMP, VALLEY, DELAY = 1.2, 0.3, 90e-9
VREF, RU, RD, R2, C1, C2, R3, C3, A0, GBW = 1.2, 38.3e3, 2.02e3, 2.32e3, 56e-9, 470e-12, 845.0, 3.3e-9, 1e4, 10e6
PERIODS = 200


def joined(on):
    """Matrix and vector of one interval over inductor current, capacitor, op amp, and the capacitors of the network."""
    rows, drive = np.zeros((6, 6)), np.zeros(6)
    share = LOAD / (LOAD + ESR)
    vout = np.array([0.0 if on else ESR * share, share, 0, 0, 0, 0])
    rows[0, 0] = -(RL + (RS if on else RR)) / L
    rows[1] = -vout / (LOAD * C)
    drive[0] = VIN / L
    if not on:
        rows[0] -= vout / L
        rows[1, 0] += 1 / C
    e = np.eye(6)
    tap = e[2] - e[4]
    rows[2], drive[2] = -TAU * GBW * tap - e[2] * TAU * GBW / A0, TAU * GBW * VREF
    branch = (vout - tap - e[5]) / R3
    rows[3] = (e[4] - e[3]) / (R2 * C1)
    rows[4] = (tap / RD - (vout - tap) / RU - branch - (e[4] - e[3]) / R2) / C2
    rows[5] = branch / C3
    return rows, drive


ON, OFF = joined(True), joined(False)


def run(method, periods, rtol):
    period = 1 / FS
    x = np.array([2.0, 24.0, 0.9, 0.9 - 1.2, 0.9 - 1.2, 22.8])
    (a, b), (c, d) = ON, OFF

    def trips(t, state):
        return state[2] - VALLEY - RAMP * t * FS

    trips.terminal, trips.direction = True, -1
    for _ in range(periods):
        first = solve_ivp(lambda t, s: a @ s + b, (0.0, 0.85 * period - DELAY), x, method, events=trips, rtol=rtol, atol=1e-9)
        until = min(first.t[-1] + DELAY, 0.85 * period)
        rest = solve_ivp(lambda t, s: a @ s + b, (first.t[-1], until), first.y[:, -1], method, rtol=rtol, atol=1e-9)
        last = solve_ivp(lambda t, s: c @ s + d, (until, period), rest.y[:, -1], method, rtol=rtol, atol=1e-9)
        x = last.y[:, -1]
    return x


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--criterion")
    options = parser.parse_args()
    best = None
    print("W7 5,000 periods of a closed loop")
    for method in ("RK45", "DOP853", "LSODA", "Radau", "BDF"):
        start = time.perf_counter()
        x = run(method, PERIODS, 1e-6)
        seconds = (time.perf_counter() - start) * 5000 / PERIODS
        print(f"    solve_ivp {method:18}{seconds:10.2f} s   output {x[1]:.4f} V")
        best = min(best or seconds, seconds)
    if options.criterion:
        files = list(pathlib.Path(options.criterion).glob("W7*/new/estimates.json"))
        if not files:
            raise SystemExit("no benchmark named W7: run `cargo bench` first")
        ours = json.loads(files[0].read_text())["median"]["point_estimate"] * 1e-9
        print(f"    this crate                  {ours * 1e3:10.2f} ms (aim 5 ms), {best / ours:,.0f} times as fast")


if __name__ == "__main__":
    main()
