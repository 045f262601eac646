"""Designs for the reference with further topologies: our own scenarios, parts in preferred values.

Each topology in continuous conduction; both regions of the four-switch stage; inductors apart and coupled; input and second-stage filters;
discontinuous conduction where one current or the sum of two comes to rest.
"""

from amplifiers import Network
from controlled import Control
from controlled_designs import design, op2
from stages import Branch, Filter, Stage


def op3(reference, upper, lower, c1, r2, c2, r3, c3, gain=1e4, gbw=10e6):
    return Network(3, "op-amp", reference, upper, lower, c1, r2, c2, r3, c3, gain=gain, limit=gbw)


INDUCTIVE = [
    design(
        "peak-current flyback, diode, unlike bank, sense filter, delay",
        Stage("flyback", 150e3, 100e-6, 0.08, 0.05, "diode", [Branch(330e-6, 0.02, 0.0, 2), Branch(10e-6, 4e-3)], "resistor",
              drop=0.5, diode=0.015, ratio=0.25),
        (36.0, 48.0, 60.0), 12.0, (1.5, 2.5, 3.5), Control("peak-current", 0.2, 60e3, 120e-9),
        op2(2.5, 20e3, 5230.0, 5.6e-9, 33e3, 390e-12),
        delay=60e-9, load_step=(0.5, 1e6), line_step=(4.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode flyback, synchronous, second-stage output filter",
        Stage("flyback", 120e3, 33e-6, 0.03, 0.02, "synchronous", [Branch(220e-6, 0.02, 0.0, 2)], "resistor", synchronous=0.01,
              ratio=0.5, output_filter=Filter(1e-6, 4e-3, 100e-6, 0.03)),
        (18.0, 24.0, 32.0), 5.0, (1.5, 2.5, 4.0), Control("voltage", ramp=1.5),
        op3(1.25, 20e3, 6650.0, 560e-9, 470.0, 39e-9, 1500.0, 11e-9),
        load_step=(0.5, 1e6), line_step=(2.0, 1e5), reference_step=(0.1, 1e4), band=0.002),
    design(
        "discontinuous voltage-mode flyback, constant current, delay",
        Stage("flyback", 100e3, 18e-6, 0.05, 0.08, "diode", [Branch(470e-6, 0.025)], "current", drop=0.45, diode=0.02, ratio=0.4),
        (36.0, 48.0, 60.0), 12.0, (0.3, 0.8, 1.2), Control("voltage", ramp=2.0),
        op2(2.5, 20e3, 5230.0, 5.1e-9, 30e3, 620e-12, gbw=10e6),
        delay=100e-9, load_step=(0.2, 1e6), line_step=(4.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode SEPIC, inductors apart, diode, delay",
        Stage("sepic", 200e3, 33e-6, 0.04, 0.03, "diode", [Branch(220e-6, 0.02, 0.0, 2)], "resistor", drop=0.45, diode=0.02,
              second=(47e-6, 0.05), coupling_capacitor=(10e-6, 0.08)),
        (9.0, 12.0, 16.0), 12.0, (0.6, 1.0, 1.5), Control("voltage", ramp=1.5),
        op3(1.25, 20e3, 2320.0, 1.1e-6, 360.0, 150e-9, 2700.0, 18e-9),
        delay=100e-9, load_step=(0.2, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "peak-current SEPIC, coupled inductors, synchronous, delay",
        Stage("sepic", 250e3, 22e-6, 0.03, 0.025, "synchronous", [Branch(150e-6, 0.02, 0.0, 2)], "resistor", synchronous=0.02,
              second=(22e-6, 0.03), coupling=0.9, coupling_capacitor=(22e-6, 0.02)),
        (9.0, 12.0, 16.0), 12.0, (0.8, 1.2, 1.8), Control("peak-current", 0.08, 40e3),
        op2(1.25, 20e3, 2320.0, 13e-9, 20e3, 620e-12),
        delay=60e-9, load_step=(0.3, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "discontinuous voltage-mode SEPIC",
        Stage("sepic", 150e3, 10e-6, 0.03, 0.03, "diode", [Branch(330e-6, 0.02)], "resistor", drop=0.45, diode=0.02,
              second=(15e-6, 0.03), coupling_capacitor=(10e-6, 0.05)),
        (9.0, 12.0, 16.0), 15.0, (0.1, 0.3, 0.5), Control("voltage", ramp=1.5),
        op2(1.25, 20e3, 1820.0, 11e-9, 36e3, 750e-12),
        load_step=(0.1, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "peak-current Cuk, inductors apart, synchronous, sense filter",
        Stage("cuk", 200e3, 47e-6, 0.04, 0.03, "synchronous", [Branch(100e-6, 0.02)], "resistor", synchronous=0.02,
              second=(33e-6, 0.04), coupling_capacitor=(22e-6, 0.05)),
        (18.0, 24.0, 32.0), 15.0, (1.0, 1.5, 2.5), Control("peak-current", 0.06, 40e3, 80e-9),
        op2(1.25, 20e3, 1820.0, 39e-9, 6200.0, 2.2e-9),
        load_step=(0.3, 1e6), line_step=(2.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode Cuk behind a damped input filter, coupled inductors, source resistance",
        Stage("cuk", 200e3, 47e-6, 0.08, 0.03, "diode", [Branch(150e-6, 0.03)], "resistor", 0.02, drop=0.45, diode=0.02,
              second=(33e-6, 0.08), coupling=0.4, coupling_capacitor=(22e-6, 0.1),
              input_filter=Filter(3.3e-6, 10e-3, 22e-6, 5e-3, damping=(0.4, 100e-6))),
        (9.0, 12.0, 16.0), 12.0, (0.8, 1.2, 2.0), Control("voltage", ramp=1.5),
        op2(1.25, 20e3, 2320.0, 1e-6, 100.0, 10e-9),
        load_step=(0.2, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "discontinuous voltage-mode Cuk, coupled inductors, delay",
        Stage("cuk", 150e3, 15e-6, 0.03, 0.03, "diode", [Branch(100e-6, 0.02)], "resistor", drop=0.45, diode=0.02,
              second=(12e-6, 0.03), coupling=0.3, coupling_capacitor=(10e-6, 0.05)),
        (9.0, 12.0, 16.0), 12.0, (0.1, 0.25, 0.4), Control("voltage", ramp=1.5),
        op2(1.25, 20e3, 2320.0, 27e-9, 16e3, 1.8e-9),
        delay=80e-9, load_step=(0.1, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
]

BRIDGED = [
    design(
        "voltage-mode forward, diodes, leakage, delay",
        Stage("forward", 150e3, 22e-6, 0.01, 0.08, "diode", [Branch(220e-6, 0.015, 0.0, 2)], "resistor", drop=0.45, diode=0.01,
              ratio=0.4, magnetising=400e-6, leakage=1.5e-6),
        (36.0, 48.0, 60.0), 5.0, (3.0, 6.0, 10.0), Control("voltage", ramp=1.5),
        op3(1.25, 20e3, 6650.0, 13e-9, 7500.0, 560e-12, 820.0, 4.7e-9),
        delay=150e-9, load_step=(2.0, 1e6), line_step=(4.0, 1e5), reference_step=(0.1, 1e4), band=0.002),
    design(
        "discontinuous voltage-mode forward, leakage, delay",
        Stage("forward", 150e3, 6.8e-6, 0.01, 0.08, "diode", [Branch(220e-6, 0.02)], "resistor", drop=0.45, diode=0.01,
              ratio=0.4, magnetising=400e-6, leakage=1e-6),
        (36.0, 48.0, 60.0), 5.0, (0.3, 0.8, 1.2), Control("voltage", ramp=1.5),
        op2(1.25, 20e3, 6650.0, 11e-9, 16e3, 1.1e-9),
        delay=100e-9, load_step=(0.3, 1e6), line_step=(4.0, 1e5), reference_step=(0.1, 1e4), band=0.002),
    design(
        "peak-current forward, synchronous, magnetising current sensed, delay",
        Stage("forward", 200e3, 15e-6, 0.01, 0.06, "synchronous", [Branch(150e-6, 0.01, 0.0, 2)], "resistor", synchronous=5e-3,
              ratio=0.3, magnetising=250e-6, leakage=0.5e-6),
        (36.0, 48.0, 60.0), 3.3, (3.0, 6.0, 12.0), Control("peak-current", 0.15, 5e3),
        op2(0.8, 20e3, 6340.0, 11e-9, 15e3, 150e-12),
        delay=60e-9, load_step=(2.0, 1e6), line_step=(4.0, 1e5), reference_step=(0.05, 1e4), band=0.003),
    design(
        "peak-current push-pull, constant current, input capacitor, magnetising current sensed, delay",
        Stage("push-pull", 100e3, 15e-6, 0.01, 0.01, "diode", [Branch(220e-6, 0.015, 0.0, 2)], "current", 0.01, (470e-6, 0.02),
              drop=0.5, diode=0.01, ratio=1.8, magnetising=150e-6, leakage=0.05e-6),
        (10.0, 12.0, 15.0), 12.0, (2.0, 4.0, 6.0), Control("peak-current", 0.02, 20e3),
        op2(2.5, 20e3, 5230.0, 11e-9, 11e3, 620e-12),
        delay=80e-9, load_step=(1.0, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode half-bridge, second-stage output filter, delay",
        Stage("half-bridge", 100e3, 22e-6, 0.015, 0.1, "diode", [Branch(330e-6, 0.02)], "resistor", drop=0.6, diode=0.015,
              ratio=0.15, magnetising=1.5e-3, leakage=8e-6, output_filter=Filter(1e-6, 3e-3, 150e-6, 0.015, across=0.3)),
        (300.0, 360.0, 400.0), 12.0, (3.0, 6.0, 10.0), Control("voltage", ramp=2.0),
        op3(2.5, 20e3, 5230.0, 82e-9, 2e3, 5.1e-9, 1100.0, 8.2e-9),
        delay=200e-9, load_step=(2.0, 1e6), line_step=(20.0, 1e6), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode full-bridge behind a damped input filter, constant power, delay",
        Stage("full-bridge", 80e3, 10e-6, 4e-3, 0.03, "synchronous", [Branch(470e-6, 0.008, 0.0, 2)], "power", 0.01,
              synchronous=4e-3, ratio=0.4, magnetising=200e-6, leakage=0.6e-6,
              input_filter=Filter(4.7e-6, 10e-3, 22e-6, 5e-3, damping=(0.5, 100e-6))),
        (40.0, 48.0, 60.0), 12.0, (5.0, 10.0, 20.0), Control("voltage", ramp=1.5),
        op3(1.25, 20e3, 2320.0, 12e-9, 8200.0, 470e-12, 750.0, 5.1e-9),
        delay=150e-9, load_step=(3.0, 1e6), line_step=(4.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "peak-current full-bridge, sense filter, magnetising current sensed, delay",
        Stage("full-bridge", 100e3, 8.2e-6, 4e-3, 0.03, "synchronous", [Branch(330e-6, 0.01, 0.0, 2)], "resistor",
              synchronous=4e-3, ratio=0.4, magnetising=1e-3, leakage=0.2e-6),
        (40.0, 48.0, 60.0), 12.0, (5.0, 10.0, 20.0), Control("peak-current", 0.05, 15e3, 100e-9),
        op2(1.25, 20e3, 2320.0, 8.2e-9, 15e3, 240e-12),
        delay=100e-9, load_step=(4.0, 1e6), line_step=(4.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "peak-current four-switch, boost at the least input and buck above, delay",
        Stage("four-switch", 250e3, 8.2e-6, 8e-3, 8e-3, "synchronous", [Branch(100e-6, 0.012, 0.0, 3)], "resistor",
              synchronous=8e-3),
        (9.0, 15.0, 20.0), 12.0, (1.0, 3.0, 5.0), Control("peak-current", 0.05, 50e3),
        op2(1.25, 20e3, 2320.0, 22e-9, 8200.0, 1.2e-9),
        delay=60e-9, load_step=(1.0, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode four-switch in its boost region, delay",
        Stage("four-switch", 200e3, 10e-6, 10e-3, 8e-3, "synchronous", [Branch(220e-6, 0.015, 0.0, 2)], "resistor",
              synchronous=8e-3),
        (9.0, 12.0, 16.0), 19.0, (1.0, 2.0, 3.0), Control("voltage", ramp=1.2),
        op3(1.25, 20e3, 1400.0, 910e-9, 330.0, 43e-9, 1e3, 15e-9),
        delay=60e-9, load_step=(0.5, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode four-switch in its buck region, diodes, delay",
        Stage("four-switch", 200e3, 10e-6, 10e-3, 8e-3, "diode", [Branch(220e-6, 0.015, 0.0, 2)], "resistor", drop=0.4, diode=0.01),
        (18.0, 24.0, 30.0), 12.0, (2.0, 3.0, 5.0), Control("voltage", ramp=1.5),
        op3(1.25, 20e3, 2320.0, 39e-9, 2400.0, 1.6e-9, 820.0, 4.7e-9),
        delay=60e-9, load_step=(1.0, 1e6), line_step=(3.0, 1e5), reference_step=(0.2, 1e4), band=0.002),
    design(
        "voltage-mode buck of three phases, delay",
        Stage("buck", 300e3, 1.5e-6, 6e-3, 12e-3, "synchronous", [Branch(47e-6, 3e-3, 0.0, 6, 0.7)], "resistor", synchronous=6e-3,
              phases=3),
        (9.0, 12.0, 14.0), 1.8, (10.0, 20.0, 30.0), Control("voltage", ramp=1.5),
        op3(0.8, 20e3, 15.8e3, 9.1e-9, 2e3, 1.3e-9, 2700.0, 820e-12),
        delay=60e-9, load_step=(8.0, 1e7), line_step=(1.0, 1e5), reference_step=(0.03, 1e4), band=0.003),
    design(
        "peak-current boost of two phases, diodes, sense filter, delay",
        Stage("boost", 150e3, 33e-6, 20e-3, 15e-3, "diode", [Branch(330e-6, 0.02, 0.0, 3)], "resistor", drop=0.45, diode=0.012,
              phases=2),
        (18.0, 27.0, 32.0), 48.0, (2.0, 4.0, 6.0), Control("peak-current", 0.05, 20e3, 80e-9),
        op2(2.5, 20e3, 1100.0, 15e-9, 16e3, 1e-9),
        delay=60e-9, load_step=(1.0, 1e6), line_step=(2.0, 1e5), reference_step=(0.5, 1e4), band=0.002),
]
