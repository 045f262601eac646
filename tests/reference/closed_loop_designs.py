"""Ten voltage-mode designs for the closed-loop reference: three topologies, both rectifiers, both amplifiers, all loads.

Our own scenarios, with parts in preferred values.  Each is given once, as an engineer would enter it; `entries` writes it in the
entry paths of a design file.
"""

from dataclasses import dataclass

from amplifiers import Network
from cells import FORWARD_FAMILY, TWO_INDUCTORS
from stages import Branch, Stage


@dataclass
class Design:
    """Stage, loop and events of one design; ranges are (least, nominal, greatest)."""

    title: str
    stage: Stage
    vin: tuple  # [V]
    output: float  # wanted output as entered [V]; the divider decides
    load: tuple  # [A]
    ramp: float  # ramp amplitude, at the nominal input when fed forward [V]
    network: Network
    delay: float = 0.0  # [s]
    feedforward: bool = False
    band: float = 0.01  # settling band, fraction of the output
    load_step: tuple = (1.0, 1e6)  # change [A], slew [A/s]
    line_step: tuple = (1.0, 1e5)  # change [V], slew [V/s]
    reference_step: tuple = (0.1, 1e4)  # change and slew at the output [V], [V/s]

    @property
    def regulated(self):
        """The output the divider and the reference give [V]."""
        return self.network.reference * (1.0 + self.network.upper / self.network.lower)

    def effective_ramp(self, vin):
        """Ramp amplitude at an input voltage [V]: proportional to it with line feed-forward."""
        return self.ramp * (vin / self.vin[1] if self.feedforward else 1.0)

    def entries(self):
        """(choices, values) by entry path."""
        stage, network = self.stage, self.network
        opamp = network.amplifier == "op-amp"
        choices = {
            "stage.topology": stage.topology,
            "stage.rectifier": stage.rectifier,
            "stage.load": stage.load,
            "stage.bank": str(len(stage.bank)),
            "stage.input-capacitor": "fitted" if stage.input_capacitor else "none",
            "control.mode": "voltage",
            "control.feedforward": "line" if self.feedforward else "none",
            "compensator.type": str(network.kind),
            "compensator.amplifier": network.amplifier,
        }
        isolated = network.amplifier in ("shunt-regulator", "digital")
        if network.kind != 3 and not isolated:
            choices["compensator.feedforward-capacitor"] = "fitted" if network.cff else "none"
        values = {
            "stage.output.voltage": self.output,
            "stage.source.resistance": stage.source,
            "stage.switching-frequency": stage.fs,
            "stage.inductor.inductance": stage.inductance,
            "stage.inductor.resistance": stage.winding,
            "stage.switch.resistance": stage.switch,
            "control.ramp.amplitude": self.ramp,
            "control.delay": self.delay,
            "compensator.reference": network.reference,
            "compensator.divider.upper": network.upper,
            "compensator.divider.lower": network.lower,
            **{f"compensator.{part}": getattr(network, part) for part in ("c1", "c2", "r2") if hasattr(network, part)},
            "event.load-step.change": self.load_step[0],
            "event.load-step.slew": self.load_step[1],
            "event.line-step.change": self.line_step[0],
            "event.line-step.slew": self.line_step[1],
            "event.reference-step.change": self.reference_step[0],
            "event.reference-step.slew": self.reference_step[1],
            "event.settling-band": self.band,
        }
        for k, name in enumerate(["least", "nominal", "greatest"]):
            values[f"stage.input.{name}"] = self.vin[k]
            values[f"stage.load.{name}"] = self.load[k]
        if stage.topology in ("flyback", *FORWARD_FAMILY):
            values["stage.transformer.ratio"] = stage.ratio
        if stage.topology in FORWARD_FAMILY:
            values |= {"stage.transformer.magnetising": stage.magnetising, "stage.transformer.leakage": stage.leakage}
        if stage.topology in TWO_INDUCTORS:
            choices["stage.inductors"] = "coupled" if stage.coupling else "separate"
            values["stage.second-inductor.inductance"], values["stage.second-inductor.resistance"] = stage.second
            values["stage.coupling-capacitor.capacitance"], values["stage.coupling-capacitor.esr"] = stage.coupling_capacitor
            if stage.coupling:
                values["stage.inductors.coupling"] = stage.coupling
        if stage.phases > 1:
            values["stage.phases"] = float(stage.phases)
        if stage.rectifier == "diode":
            values |= {"stage.diode.drop": stage.drop, "stage.diode.resistance": stage.diode}
        else:
            values["stage.synchronous.resistance"] = stage.synchronous
        if stage.input_capacitor:
            values["stage.input-capacitor.capacitance"], values["stage.input-capacitor.esr"] = stage.input_capacitor
        for k, branch in enumerate(stage.bank, 1):
            values[f"stage.bank.{k}.capacitance"] = branch.capacitance
            values[f"stage.bank.{k}.remaining"] = branch.remaining
            values[f"stage.bank.{k}.esr"] = branch.esr
            values[f"stage.bank.{k}.esl"] = branch.esl
            values[f"stage.bank.{k}.count"] = branch.count
        if isolated:
            own_choices, own_values = network.entries()
            # A part not fitted has no entry.
            values = {path: value for path, value in values.items() if value or not path.startswith("compensator.")}
            if network.amplifier == "digital":
                del choices["compensator.type"]
            return choices | own_choices, values | own_values
        if network.kind == 3:
            values |= {"compensator.r3": network.r3, "compensator.c3": network.c3}
        if network.cff:
            values["compensator.cff"] = network.cff
        if opamp:
            values["compensator.op-amp.dc-gain"] = network.gain
            values["compensator.op-amp.gain-bandwidth"] = network.limit
        else:
            values["compensator.transconductance.gm"] = network.gain
            values["compensator.transconductance.output-resistance"] = network.limit
        return choices, values


DESIGNS = [
    Design(
        "synchronous buck, resistor, low-ESR bank, type III",
        Stage("buck", 500e3, 2.2e-6, 5e-3, 8e-3, "synchronous", [Branch(47e-6, 3e-3, 0.0, 6, 0.7)], "resistor", synchronous=6e-3),
        (9.0, 12.0, 14.0), 3.3, (2.0, 5.0, 8.0), 1.5,
        Network(3, "op-amp", 0.8, 10e3, 3.2e3, 3.3e-9, 11e3, 68e-12, 330.0, 2e-9, 0.0, 2e4, 12e6),
        load_step=(3.0, 2e6), line_step=(2.0, 1e5), reference_step=(0.05, 1e4), band=0.002,
    ),
    Design(
        "diode buck, unlike bank with ESL, input capacitor, line feed-forward, delay",
        Stage("buck", 200e3, 22e-6, 25e-3, 30e-3, "diode",
              [Branch(220e-6, 25e-3, 8e-9), Branch(10e-6, 4e-3, 1e-9, 4, 0.6)],
              "resistor", 0.04, (470e-6, 0.03), 0.45, 0.02),
        (18.0, 24.0, 32.0), 12.0, (2.0, 3.0, 5.0), 2.0,
        Network(3, "op-amp", 1.2, 20e3, 2220.0, 15e-9, 8200.0, 220e-12, 1e3, 3.6e-9, 0.0, 1e4, 8e6),
        delay=250e-9, feedforward=True, line_step=(4.0, 2e5), reference_step=(0.2, 1e5), band=0.002,
    ),
    Design(
        "synchronous buck, constant power, transconductance type II, delay, source resistance alone",
        Stage("buck", 600e3, 1.5e-6, 6e-3, 20e-3, "synchronous", [Branch(330e-6, 20e-3)], "power", 0.01, synchronous=15e-3),
        (4.5, 5.0, 5.5), 1.8, (1.0, 2.0, 3.0), 1.0,
        Network(2, "transconductance", 0.6, 10e3, 5e3, 2.4e-9, 13e3, 43e-12, gain=1.2e-3, limit=2e6),
        delay=60e-9, load_step=(-0.7, 1e6), line_step=(-0.4, 5e4), reference_step=(0.03, 1e6), band=0.003,
    ),
    Design(
        "diode buck, constant current, electrolytic with ceramic, type II",
        Stage("buck", 150e3, 100e-6, 0.08, 0.06, "diode", [Branch(470e-6, 0.15), Branch(10e-6, 0.01, 0.0, 1, 0.5)],
              "current", drop=0.5, diode=0.03),
        (36.0, 48.0, 56.0), 15.0, (1.5, 2.0, 4.0), 2.5,
        Network(2, "op-amp", 2.5, 10e3, 2e3, 15e-9, 20e3, 120e-12, gain=5e4, limit=3e6),
        load_step=(1.0, 1e7), line_step=(5.0, 1e5), reference_step=(-0.3, 1e5), band=0.002,
    ),
    Design(
        "diode boost, resistor, type III, delay",
        Stage("boost", 300e3, 22e-6, 25e-3, 20e-3, "diode", [Branch(150e-6, 0.03, 0.0, 2)], "resistor", drop=0.4, diode=0.025),
        (9.0, 12.0, 15.0), 24.0, (0.8, 1.5, 2.5), 1.5,
        Network(3, "op-amp", 1.25, 22e3, 1210.0, 200e-9, 1500.0, 820e-12, 2400.0, 6.8e-9, 0.0, 1e4, 8e6),
        delay=150e-9, load_step=(0.5, 1e6), line_step=(1.0, 1e5), reference_step=(0.5, 1e4), band=0.003,
    ),
    Design(
        "synchronous boost, constant power, transconductance type II with feed-forward capacitor, input capacitor, delay",
        Stage("boost", 1e6, 1e-6, 12e-3, 18e-3, "synchronous", [Branch(22e-6, 4e-3, 0.0, 4, 0.6)],
              "power", 0.03, (47e-6, 0.01), synchronous=22e-3),
        (3.0, 3.7, 4.2), 5.0, (1.0, 1.5, 2.0), 0.8,
        Network(2, "transconductance", 0.6, 100e3, 13.6e3, 33e-9, 430.0, 820e-12, cff=100e-12, gain=1.2e-3, limit=2e6),
        delay=30e-9, load_step=(0.4, 1e6), line_step=(0.3, 1e4), reference_step=(0.05, 1e3), band=0.003,
    ),
    Design(
        "diode boost, constant current, unlike bank, type III",
        Stage("boost", 100e3, 150e-6, 0.12, 0.09, "diode", [Branch(330e-6, 0.15), Branch(100e-6, 0.1)], "current",
              drop=0.6, diode=0.05),
        (20.0, 24.0, 28.0), 48.0, (0.5, 1.0, 1.5), 3.0,
        Network(3, "op-amp", 2.5, 47e3, 2580.0, 160e-9, 5100.0, 680e-12, 3300.0, 10e-9, 0.0, 1e5, 4e6),
        load_step=(0.4, 1e5), line_step=(2.0, 1e4), reference_step=(1.0, 1e4), band=0.002,
    ),
    Design(
        "diode inverting buck-boost, resistor, input capacitor, type III",
        Stage("buck-boost", 150e3, 47e-6, 0.03, 0.025, "diode", [Branch(470e-6, 0.04)], "resistor",
              0.05, (220e-6, 0.04), 0.5, 0.02),
        (18.0, 24.0, 30.0), 15.0, (1.0, 2.0, 3.0), 2.0,
        Network(3, "op-amp", 1.25, 22e3, 2e3, 150e-9, 2700.0, 820e-12, 1300.0, 11e-9, 0.0, 2e4, 10e6),
        load_step=(0.8, 1e6), line_step=(3.0, 1e5), reference_step=(0.3, 1e5), band=0.002,
    ),
    Design(
        "synchronous inverting buck-boost, constant current, unlike bank, transconductance type III, delay",
        Stage("buck-boost", 400e3, 10e-6, 0.015, 0.012, "synchronous", [Branch(150e-6, 0.09), Branch(100e-6, 0.04)], "current",
              synchronous=0.014),
        (10.0, 12.0, 16.0), 5.0, (1.0, 2.0, 3.0), 1.0,
        Network(3, "transconductance", 0.8, 52.3e3, 10e3, 120e-9, 820.0, 1.1e-9, 2e3, 1.3e-9, gain=1.2e-3, limit=1e6),
        delay=50e-9, load_step=(0.5, 1e6), line_step=(1.0, 1e5), reference_step=(0.1, 1e6), band=0.003,
    ),
    Design(
        "diode inverting buck-boost, constant power, type III, delay",
        Stage("buck-boost", 250e3, 22e-6, 0.03, 0.02, "diode", [Branch(330e-6, 0.035, 0.0, 2, 0.9)], "power",
              drop=0.45, diode=0.02),
        (9.0, 12.0, 15.0), 12.0, (1.0, 1.5, 2.0), 1.8,
        Network(3, "op-amp", 1.2, 18e3, 2e3, 180e-9, 2200.0, 620e-12, 1300.0, 12e-9, 0.0, 3e4, 6e6),
        delay=300e-9, load_step=(0.3, 1e6), line_step=(1.0, 1e5), reference_step=(0.2, 2e3), band=0.001,
    ),
]
