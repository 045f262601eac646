"""Designs closed by a difference equation, for the reference: our own scenarios."""

from controlled import Control
from controlled_designs import design
from digital import Digital
from stages import Branch, Stage

DESIGNS = [
    design(
        "digital voltage-mode buck, two zeros and three poles, Tustin",
        Stage("buck", 400e3, 2.2e-6, 6e-3, 10e-3, "synchronous", [Branch(100e-6, 4e-3, 0.0, 4)], "resistor", synchronous=7e-3),
        (9.0, 12.0, 14.0), 3.3, (2.0, 5.0, 8.0), Control("voltage", ramp=1.0),
        Digital("tustin", 1.2e3, (4e3, 6e3), (90e3, 150e3), 0.8, 10e3, 3.2e3, 1.6, bits=16, computation=0.5e-6),
        delay=60e-9, load_step=(3.0, 2e6), line_step=(2.0, 1e6), reference_step=(0.05, 1e5), band=0.004),
    design(
        "digital voltage-mode boost, prewarped, computation of most of a period, short words",
        Stage("boost", 200e3, 22e-6, 25e-3, 20e-3, "diode", [Branch(150e-6, 0.03, 0.0, 2)], "resistor", drop=0.4, diode=0.025),
        (9.0, 12.0, 15.0), 24.0, (0.8, 1.5, 2.5), Control("voltage", ramp=1.0),
        Digital("tustin-prewarped", 14.0, (700.0, 900.0), (20e3, 60e3), 1.25, 22e3, 1210.0, 2.5, bits=18, prewarp=2e3,
                computation=4e-6),
        delay=100e-9, load_step=(0.5, 1e6), line_step=(1.0, 1e5), reference_step=(0.5, 1e5), band=0.004),
    design(
        "digital peak-current buck, one zero and two poles, matched",
        Stage("buck", 300e3, 4.7e-6, 12e-3, 15e-3, "synchronous", [Branch(220e-6, 0.01, 0.0, 2)], "resistor", synchronous=0.012),
        (18.0, 24.0, 30.0), 5.0, (2.0, 5.0, 8.0), Control("peak-current", 0.05, 60e3),
        Digital("matched", 4e3, (2e3,), (60e3,), 1.0, 8e3, 2e3, 2.0, bits=14, computation=0.8e-6, output_range=2.0),
        delay=60e-9, load_step=(2.0, 1e6), line_step=(3.0, 1e6), reference_step=(0.1, 1e5), band=0.004),
    design(
        "digital discontinuous voltage-mode flyback, one zero, Tustin",
        Stage("flyback", 100e3, 18e-6, 0.05, 0.08, "diode", [Branch(470e-6, 0.025)], "current", drop=0.45, diode=0.02, ratio=0.4),
        (36.0, 48.0, 60.0), 12.0, (0.3, 0.8, 1.2), Control("voltage", ramp=1.0),
        Digital("tustin", 260.0, (400.0,), (12e3,), 2.5, 20e3, 5230.0, 5.0, bits=16, computation=2e-6),
        delay=100e-9, load_step=(0.2, 1e6), line_step=(4.0, 1e5), reference_step=(0.2, 1e5), band=0.004),
]
