"""SEPIC, Cuk and flyback without losses, in continuous conduction with a resistive load: transfer functions derived symbolically.

    python symbolic.py OUTPUT.json

State equations of both intervals by Kirchhoff's laws for the circuits named below, averaged and perturbed by sympy; numerators and
denominators as polynomials in s with symbolic coefficients, written beside their values for random parts.  Roots by mpmath at 40 digits.
Duty ratio d, turns ratio n = secondary/primary; the Cuk's output counts as a magnitude.

Source of the method: Middlebrook and Cuk (1976), state-space averaging (from memory).  Checks on the way: the conversion ratio of a
textbook, and the flyback's right-half-plane zero d'^2 R/(d L n^2) (Erickson & Maksimovic, from memory).
"""

import random
import sys

import mpmath
import sympy as sp
from sympy.polys.matrices import DomainMatrix

from output import write

CASES = 60  # per circuit
s, d, vin, r, c, n = sp.symbols("s d vin r c n", positive=True)
l1, l2, m, cc = sp.symbols("l1 l2 m cc", positive=True)
i1, i2, vc, v = sp.symbols("i1 i2 vc v", real=True)


def two_inductors(cuk):
    """Rates (switch closed, switch open) of (i1, i2, vc, v); i1 + i2 flows through the switch, then through the rectifier.

    L1 from the source to A, switch A to ground, capacitor A to B.  SEPIC: L2 from ground to B, rectifier B to the output.  Cuk: rectifier B
    to ground, L2 from the output, which lies v under ground, to B.
    """
    inverse = sp.Matrix([[l1, m], [m, l2]]).inv()
    if cuk:
        # Closed: A at ground, B at -vc.  Open: B at ground, A at vc.
        across = (sp.Matrix([vin, vc - v]), sp.Matrix([vin - vc, -v]))
        into = (i2, i2)
    else:
        # Closed: A at ground, B at -vc.  Open: B at v, A at v + vc.
        across = (sp.Matrix([vin, vc]), sp.Matrix([vin - v - vc, -v]))
        into = (0, i1 + i2)
    through = (-i2, i1)
    return [sp.Matrix([*(inverse * across[k]), through[k] / cc, (into[k] - v / r) / c]) for k in (0, 1)], [i1, i2, vc, v]


def flyback():
    """Rates of (magnetising current at the primary, output voltage); l1 the magnetising inductance."""
    return [sp.Matrix([vin / l1, -v / r / c]), sp.Matrix([-v / n / l1, (i1 / n - v / r) / c])], [i1, v]


def transfer(rates, states):
    """Steady output over vin; numerators from duty ratio and from input voltage, and their denominator, as lists from s^0 up."""
    on, off = rates
    average = d * on + (1 - d) * off
    a = average.jacobian(states)
    rest = {state: 0 for state in states}
    point = a.LUsolve(-average.subs(rest)).applyfunc(sp.simplify)
    held = dict(zip(states, point))
    by_duty = (on - off).subs(held).applyfunc(sp.simplify)
    by_vin = average.diff(vin)
    system = s * sp.eye(len(states)) - a

    def determinant(matrix):
        """As a polynomial in s, its coefficients rational in the parts."""
        field = DomainMatrix.from_Matrix(matrix).to_field()
        top, bottom = sp.fraction(sp.cancel(field.domain.to_sympy(field.det())))
        assert not bottom.has(s)
        return sp.Poly(top, s), bottom

    denominator, below = determinant(system)

    def numerator(column):
        # Cramer's rule for the output, the last state.
        replaced = system.copy()
        replaced[:, len(states) - 1] = column
        top, bottom = determinant(replaced)
        return top * sp.Poly(below / bottom, s)

    def ascending(poly, by):
        return [sp.factor(sp.cancel(coefficient / by)) for coefficient in reversed(poly.all_coeffs())]

    constant = denominator.all_coeffs()[-1]
    return {
        "ratio": sp.factor(point[len(states) - 1] / vin),
        "from_duty": ascending(numerator(by_duty), constant),
        "from_vin": ascending(numerator(by_vin), constant),
        "denominator": ascending(denominator, constant),
    }


def roots(coefficients):
    """Roots of a polynomial given from s^0 up, as [real, imaginary], by size; leading zeros dropped."""
    kept = list(coefficients)
    while kept and kept[-1] == 0:
        kept.pop()
    if len(kept) < 2:
        return []
    found = mpmath.polyroots(list(reversed(kept)), maxsteps=500, extraprec=200)
    return [[float(z.real), float(z.imag)] for z in sorted(found, key=lambda z: (float(f"{float(abs(z)):.10e}"), z.imag))]


def numbers(draw, topology, coupled):
    """Random parts over decades."""
    def log(low, high):
        return low * (high / low) ** draw.random()

    given = {vin: log(3.0, 100.0), d: draw.uniform(0.15, 0.8), r: log(1.0, 300.0), c: log(1e-6, 2e-3), l1: log(1e-6, 1e-3)}
    if topology == "flyback":
        return given | {n: log(0.05, 5.0)}
    given |= {l2: log(1e-6, 1e-3), cc: log(0.5e-6, 100e-6)}
    coupling = draw.uniform(0.05, 0.95) if coupled else 0.0
    return given | {m: coupling * (given[l1] * given[l2]) ** 0.5}, coupling


def circuit(title, topology, coupled, derived, seed):
    found = dict(derived)
    if not coupled:
        for key in ("from_duty", "from_vin", "denominator"):
            found[key] = [sp.factor(item.subs(m, 0)) for item in found[key]]
    symbols = [vin, d, r, c, l1] + ([n] if topology == "flyback" else [l2, cc, m])
    numeric = {key: sp.lambdify(symbols, found[key], modules="mpmath") for key in ("ratio", "from_duty", "from_vin", "denominator")}
    draw = random.Random(seed)
    cases = []
    for _ in range(CASES):
        given, coupling = (numbers(draw, topology, coupled), None) if topology == "flyback" else numbers(draw, topology, coupled)
        exact = [mpmath.mpf(given[symbol]) for symbol in symbols]
        values = {key: function(*exact) for key, function in numeric.items()}
        row = {"input_voltage": given[vin], "duty": given[d], "resistance": given[r], "capacitance": given[c], "inductance": given[l1]}
        if topology == "flyback":
            row["turns_ratio"] = given[n]
        else:
            row |= {"second_inductance": given[l2], "coupling_capacitance": given[cc], "coupling": coupling}
        row["output_voltage"] = float(values["ratio"] * given[vin])
        for key in ("from_duty", "from_vin", "denominator"):
            row[key] = [float(item) for item in values[key]]
        row["zeros_from_duty"], row["zeros_from_vin"] = roots(values["from_duty"]), roots(values["from_vin"])
        row["poles"] = roots(values["denominator"])
        cases.append(row)
    return {
        "title": title,
        "topology": topology,
        "coupled": coupled,
        "formulas": {key: str(value) for key, value in found.items()},
        "cases": cases,
    }


def check(circuits):
    """What any textbook says of them."""
    by_title = {one["title"]: one for one in circuits}
    for title in ("SEPIC", "Cuk", "SEPIC, coupled", "Cuk, coupled"):
        assert sp.simplify(sp.sympify(by_title[title]["formulas"]["ratio"], {"d": d}) - d / (1 - d)) == 0
    ratio, from_duty = (sp.sympify(by_title["flyback"]["formulas"][key], {str(x): x for x in (d, n, vin, r, c, l1)})
                        for key in ("ratio", "from_duty"))
    assert sp.simplify(ratio - n * d / (1 - d)) == 0
    zero = -from_duty[0] / from_duty[1]
    assert sp.simplify(zero - (1 - d) ** 2 * r / (d * l1 * n**2)) == 0
    for one in circuits:
        for row in one["cases"]:
            assert all(z[0] < 0.0 or abs(z[0]) < 1e-9 * abs(complex(*z)) for z in row["poles"]), one["title"]


def main():
    mpmath.mp.dps = 40
    sepic, cuk = transfer(*two_inductors(False)), transfer(*two_inductors(True))
    circuits = [
        circuit("flyback", "flyback", False, transfer(*flyback()), 11),
        circuit("SEPIC", "sepic", False, sepic, 12),
        circuit("SEPIC, coupled", "sepic", True, sepic, 13),
        circuit("Cuk", "cuk", False, cuk, 14),
        circuit("Cuk, coupled", "cuk", True, cuk, 15),
    ]
    check(circuits)
    write({"about": "made by tests/reference/symbolic.py with sympy; polynomials from s^0 up, roots as [real, imaginary] in rad/s; output and "
                    "denominator at s = 0 are the steady ones", "circuits": circuits}, sys.argv[1])


if __name__ == "__main__":
    main()
