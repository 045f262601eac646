"""The switched cell of each topology: what it draws, what it delivers, and what its inductors see, interval by interval, by hand.

Conventions: SI units; turns ratio n = secondary/primary; the output of an inverting stage counts as a magnitude.  Currents and
voltages are rows over the stage's columns, so each line reads like Kirchhoff's law for the drawn circuit.  `v_in` is the voltage at the
stage's input terminals, `v_out` that of the bank.  Duty ratio and period are those of one pulse: a double-ended stage gives two pulses per
switching period.

Two inductors: counted so that the switch carries i1 + i2 while it conducts and the rectifier the same afterwards.
"""

from dataclasses import dataclass

import numpy as np

# Two pulses reach the output filter in every period of a switch.
DOUBLE_ENDED = ("push-pull", "half-bridge", "full-bridge")
FORWARD_FAMILY = ("forward", *DOUBLE_ENDED)
TWO_INDUCTORS = ("sepic", "cuk")


def state_names(topology):
    return ["i1", "i2", "vc"] if topology in TWO_INDUCTORS else ["iL"]


@dataclass
class Cell:
    """One interval of a cell."""

    drawn: np.ndarray  # current out of the input terminal
    delivered: np.ndarray  # current into the bank
    slopes: object  # function of (v_in, v_out) giving {state: slope}
    magnetised: object = None  # transformer of the forward family: function of v_in giving the primary's voltage


def inductance_matrix(stage):
    """Of the two inductors; coupled with the dots so that both rise together."""
    l1, (l2, _) = stage.inductance, stage.second
    mutual = stage.coupling * np.sqrt(l1 * l2)
    return np.array([[l1, mutual], [mutual, l2]])


def sensed(stage):
    """What a current sensor in the switch reads while the switch conducts, by state."""
    if stage.topology in TWO_INDUCTORS:
        return {"i1": 1.0, "i2": 1.0}
    # A transformer's primary carries n times the inductor's current; one of N phases its own share.
    return {"iL": stage.ratio if stage.topology in FORWARD_FAMILY else 1.0 / stage.phases}


def along(stage):
    """How the states move with one ampere more of what the sensor reads, while nothing slower than the switches moves."""
    if stage.topology in TWO_INDUCTORS:
        # Both inductors see the same change of voltage when the switch node moves.
        pull = np.linalg.solve(inductance_matrix(stage), np.ones(2))
        return {"i1": pull[0] / pull.sum(), "i2": pull[1] / pull.sum()}
    return {name: 1.0 / share for name, share in sensed(stage).items()}


def natural_ramp(stage):
    """What the magnetising current adds to the sensed one, over what a current from zero would: see `forward`."""
    return {"forward": 1.0}.get(stage.topology, 0.5)


def cell(stage, which, row, one, commutates=True):
    """The interval `which` ("on", "off" or "idle"); `row` names a state's row, `one` that of the constant 1.

    `commutates`: current flows when the switch closes, which a transformer's leakage inductance delays.
    """
    if stage.topology in TWO_INDUCTORS:
        return two_inductors(stage, which, row, one)
    i_l = row("iL")
    zero = 0.0 * i_l
    if which == "idle":
        return Cell(zero, zero, lambda v_in, v_out: {"iL": zero})
    rectified = stage.rectifier == "diode"
    drop = stage.drop * one if rectified else zero
    resistance = stage.diode if rectified else stage.synchronous
    wire = stage.winding * i_l
    make = {"flyback": flyback, "four-switch": four_switch}.get(stage.topology)
    if make:
        return make(stage, which == "on", i_l, wire, resistance, drop)
    if stage.topology in FORWARD_FAMILY:
        return forward(stage, which == "on", i_l, wire, resistance, drop, commutates)
    return single(stage, which == "on", i_l, wire, resistance, drop)


def single(stage, on, i_l, wire, resistance, drop):
    """Buck, boost, inverting buck-boost; N equal phases driven alike as one of an Nth of all impedances."""
    n = stage.phases
    inductance = stage.inductance / n
    lost = wire / n + (stage.switch / n * i_l if on else resistance / n * i_l + drop)
    zero = 0.0 * i_l
    drawn = {"buck": i_l if on else zero, "boost": i_l, "buck-boost": i_l if on else zero}[stage.topology]
    delivered = {"buck": i_l, "boost": zero if on else i_l, "buck-boost": zero if on else i_l}[stage.topology]

    def slopes(v_in, v_out):
        across = {
            ("buck", True): v_in - v_out,
            ("buck", False): -v_out,
            ("boost", True): v_in,
            ("boost", False): v_in - v_out,
            ("buck-boost", True): v_in,
            ("buck-boost", False): -v_out,
        }[stage.topology, on]
        return {"iL": (across - lost) / inductance}

    return Cell(drawn, delivered, slopes)


def flyback(stage, on, i_l, wire, resistance, drop):
    """Magnetising inductance and winding at the primary; the rectifier carries the magnetising current over n."""
    n = stage.ratio
    zero = 0.0 * i_l
    if on:
        return Cell(i_l, zero, lambda v_in, v_out: {"iL": (v_in - stage.switch * i_l - wire) / stage.inductance})
    secondary = i_l / n
    return Cell(zero, secondary, lambda v_in, v_out: {
        "iL": (-(v_out + drop + resistance * secondary) / n - wire) / stage.inductance})


def forward(stage, on, i_l, wire, resistance, drop, commutates):
    """Buck-derived behind a transformer; the inductor stands at the secondary.

    On: the switches in the primary's path, the transformer, one rectifier.  Off: the freewheeling rectifier of a forward converter; both
    rectifiers of a double-ended one, half the current each.

    The magnetising current is no state.  It starts every pulse of a forward converter from zero, and so adds its slope to what the switch's
    sensor reads; in a double-ended one it swings from -m d T/2 to m d T/2, reversed with every pulse: half of m d T at the end of one.
    """
    n = stage.ratio
    # While the leakage current follows, both rectifiers hold the secondary at nothing: n^2 L i of flux is lost in each pulse.
    wire = wire + (n**2 * stage.leakage * stage.pulse_frequency * i_l if commutates else 0.0)
    in_series = 2.0 if stage.topology == "full-bridge" else 1.0
    share = 0.5 if stage.topology == "half-bridge" else 1.0
    zero = 0.0 * i_l
    if on:
        primary = n * i_l
        # The half-bridge's capacitors give half of it each, and the source makes good one half.
        return Cell(share * primary, i_l, lambda v_in, v_out: {
            "iL": (n * (share * v_in - in_series * stage.switch * primary) - drop - resistance * i_l - wire - v_out)
                  / stage.inductance},
            lambda v_in: share * v_in - in_series * stage.switch * primary)
    together = 0.5 if stage.topology in DOUBLE_ENDED else 1.0
    return Cell(zero, i_l, lambda v_in, v_out: {"iL": (-drop - together * resistance * i_l - wire - v_out) / stage.inductance})


def four_switch(stage, on, i_l, wire, resistance, drop):
    """A buck whose current always passes the output rectifier, or a boost whose current always passes the input switch."""
    zero = 0.0 * i_l
    switch = stage.switch * i_l
    rectifier = resistance * i_l + drop
    if stage.region == "buck":
        lost = wire + rectifier + (switch if on else rectifier)
        return Cell(i_l if on else zero, i_l, lambda v_in, v_out: {
            "iL": ((v_in if on else 0.0 * v_in) - v_out - lost) / stage.inductance})
    lost = wire + switch + (switch if on else rectifier)
    return Cell(i_l, zero if on else i_l, lambda v_in, v_out: {
        "iL": (v_in - (0.0 * v_out if on else v_out) - lost) / stage.inductance})


def two_inductors(stage, which, row, one):
    """SEPIC: L1 from the input to node A, switch A to ground, capacitor A to B, L2 from ground to B, rectifier B to the output.

    Cuk: the same up to B; rectifier from B to ground, L2 from the (negative) output to B.
    """
    i1, i2, vc = row("i1"), row("i2"), row("vc")
    zero = 0.0 * i1
    cuk = stage.topology == "cuk"
    capacitance, esr = stage.coupling_capacitor
    winding_1, winding_2 = stage.winding * i1, stage.second[1] * i2
    rectified = stage.rectifier == "diode"
    drop = stage.drop * one if rectified else zero
    resistance = stage.diode if rectified else stage.synchronous
    # Current through the coupling capacitor from A to B.
    through = -i2 if which == "on" else i1
    delivered = i2 if cuk else (i1 + i2 if which == "off" else zero)

    def slopes(v_in, v_out):
        inverse = np.linalg.inv(inductance_matrix(stage))
        behind = vc + esr * through  # voltage of A over B
        below = v_out if cuk else zero  # what L2's far end stands under ground
        if which == "on":
            v_a = stage.switch * (i1 + i2)
            v_b = v_a - behind
        else:
            v_b = drop + resistance * (i1 + i2) + (zero if cuk else v_out)
            v_a = v_b + behind
        across = np.array([v_in - winding_1 - v_a, -below - v_b - winding_2])
        if which == "idle":
            # Both block: B floats to where i1 + i2 stays at rest.
            across = np.array([v_in - winding_1 - behind, -below - winding_2])
            floating = np.ones(2) @ inverse @ across / (np.ones(2) @ inverse @ np.ones(2))
            across = across - floating
        rates = inverse @ across
        return {"i1": rates[0], "i2": rates[1], "vc": through / capacitance}

    return Cell(i1, delivered, slopes)
