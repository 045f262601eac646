//! The actual network: its netlist with the amplifier's limits, solved by the circuit room.
//!
//! *Conventions.* Inputs `vout` (the converter's output) and `vref`; outputs `vc` (control voltage) and `error`, the voltage
//! between the amplifier's inputs, reference minus tap of the divider. Here the sign is the circuit's: `vc` falls when `vout`
//! rises. Output limits are not in these linear equations.
//!
//! *Model.* An op amp is a transconductance into a resistance and a capacitance (its DC gain and gain-bandwidth product), buffered by
//! a source of gain 1, so the network does not load it. A transconductance amplifier is a controlled current source beside its
//! output resistance.

use std::fmt;

use super::network::{Amplifier, Compensator, Kind, Part};
use crate::circuit::{CircuitError, Compiled, Netlist, Node, Slot};
use crate::linear::{LinearError, StateSpace, Zpk};

/// Resistance inside the op amp's model [Ω]; any value gives the same response, this one keeps the equations well scaled.
const OP_AMP_RESISTANCE: f64 = 1e6;

/// Why the network could not be solved.
#[derive(Clone, Debug, PartialEq)]
pub enum NetworkError {
    /// The netlist has no state equations.
    Circuit(CircuitError),
    /// The state equations could not be used.
    Linear(LinearError),
}

impl fmt::Display for NetworkError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            NetworkError::Circuit(error) => write!(f, "compensator network: {error}"),
            NetworkError::Linear(error) => write!(f, "compensator response: {error}"),
        }
    }
}

impl std::error::Error for NetworkError {}

impl From<CircuitError> for NetworkError {
    fn from(error: CircuitError) -> Self {
        NetworkError::Circuit(error)
    }
}

impl From<LinearError> for NetworkError {
    fn from(error: LinearError) -> Self {
        NetworkError::Linear(error)
    }
}

/// A netlist with the values that go with it.
#[derive(Clone, Debug, PartialEq)]
pub struct ValuedNetlist {
    /// The structure: nodes, parts, inputs, outputs. Parts of the network are named by the paths of their entries.
    pub netlist: Netlist,
    /// Values in slot order [SI].
    pub values: Vec<f64>,
}

impl ValuedNetlist {
    /// A slot holding this value.
    fn slot(&mut self, name: &str, value: f64) -> Slot {
        let slot = self.netlist.slot(name);
        if slot.index() == self.values.len() {
            self.values.push(value);
        }
        slot
    }

    /// Fits a part of the compensator between two nodes.
    fn fit(&mut self, compensator: &Compensator, part: Part, from: Node, to: Node) {
        let slot = self.slot(part.path(), compensator.parts.get(part));
        if part.is_resistor() {
            self.netlist.resistor(part.path(), from, to, slot);
        } else {
            self.netlist.capacitor(part.path(), from, to, slot);
        }
    }
}

impl Compensator {
    /// The network with its amplifier as a netlist: reads like the schematic.
    pub fn netlist(&self) -> ValuedNetlist {
        self.drawn().0
    }

    /// The netlist, and the node that the amplifier drives by a current: behind an op amp's gain ahead of its buffer, or the output
    /// of a transconductance amplifier.
    pub(super) fn drawn(&self) -> (ValuedNetlist, Node) {
        let mut circuit = ValuedNetlist { netlist: Netlist::new(), values: Vec::new() };
        let ground = circuit.netlist.ground();
        let [vout, vref, tap, vc] = ["vout", "vref", "tap", "vc"].map(|name| circuit.netlist.node(name));
        for (name, node) in [("vout", vout), ("vref", vref)] {
            let input = circuit.netlist.input(name);
            circuit.netlist.voltage_source(name, node, ground, input);
        }
        circuit.fit(self, Part::Upper, vout, tap);
        circuit.fit(self, Part::Lower, tap, ground);
        if self.has(Part::C3) {
            let inner = circuit.netlist.node("r3-c3");
            circuit.fit(self, Part::R3, vout, inner);
            circuit.fit(self, Part::C3, inner, tap);
        }
        if self.has(Part::Feedforward) {
            circuit.fit(self, Part::Feedforward, vout, tap);
        }
        let (far_end, driven) = self.fit_amplifier(&mut circuit, [vref, tap, vc]);
        if self.kind == Kind::One {
            circuit.fit(self, Part::C1, vc, far_end);
        } else {
            let inner = circuit.netlist.node("r2-c1");
            circuit.fit(self, Part::R2, vc, inner);
            circuit.fit(self, Part::C1, inner, far_end);
            circuit.fit(self, Part::C2, vc, far_end);
        }
        circuit.netlist.voltage_output("vc", vc, ground);
        circuit.netlist.voltage_output("error", vref, tap);
        (circuit, driven)
    }

    /// Fits the amplifier from its inputs `vref` (plus) and `tap` (minus) to `vc`, and returns the node where the far end of the
    /// network from `vc` goes, the tap around an op amp, ground behind a transconductance amplifier; and the node that the amplifier
    /// drives by a current.
    fn fit_amplifier(&self, circuit: &mut ValuedNetlist, [vref, tap, vc]: [Node; 3]) -> (Node, Node) {
        let ground = circuit.netlist.ground();
        match self.amplifier {
            Amplifier::OpAmp(amplifier) => {
                let inner = circuit.netlist.node("op-amp");
                let gm = circuit.slot("op-amp.gm", amplifier.dc_gain / OP_AMP_RESISTANCE);
                let resistance = circuit.slot("op-amp.resistance", OP_AMP_RESISTANCE);
                let pole_rad_s = std::f64::consts::TAU * amplifier.gain_bandwidth_hz / amplifier.dc_gain;
                let capacitance = circuit.slot("op-amp.capacitance", 1.0 / (pole_rad_s * OP_AMP_RESISTANCE));
                let unity = circuit.slot("op-amp.buffer", 1.0);
                circuit.netlist.controlled_current("op-amp.gm", ground, inner, gm, vref, tap);
                circuit.netlist.resistor("op-amp.resistance", inner, ground, resistance);
                circuit.netlist.capacitor("op-amp.capacitance", inner, ground, capacitance);
                circuit.netlist.controlled_voltage("op-amp.buffer", vc, ground, unity, inner, ground);
                (tap, inner)
            }
            Amplifier::Transconductance(amplifier) => {
                let gm = circuit.slot("transconductance.gm", amplifier.gm);
                let resistance = circuit.slot("transconductance.output-resistance", amplifier.output_resistance);
                circuit.netlist.controlled_current("transconductance.gm", ground, vc, gm, vref, tap);
                circuit.netlist.resistor("transconductance.output-resistance", vc, ground, resistance);
                (ground, vc)
            }
        }
    }

    /// State equations of the actual network: inputs `vout`, `vref`; outputs `vc`, `error` [V].
    ///
    /// The current a transconductance amplifier gives is gm × `error`.
    ///
    /// # Errors
    /// When the netlist has no state equations; parts within the table's bounds do not lead there.
    pub fn state_space(&self) -> Result<StateSpace, NetworkError> {
        let circuit = self.netlist();
        let compiled = Compiled::new(&circuit.netlist, |_| true, &circuit.values)?;
        let (equations, _) = compiled.equations(&circuit.values)?.independent();
        Ok(StateSpace::new(equations.a, equations.b, equations.c, equations.d, &["vout", "vref"], &["vc", "error"])?)
    }

    /// Control voltage from output voltage of the actual network, inversion taken out [V/V].
    ///
    /// # Errors
    /// As [`Compensator::state_space`], and when its zeros or poles do not converge.
    pub fn response(&self) -> Result<Zpk, NetworkError> {
        Ok(Zpk::from_state_space(&self.state_space()?, 0, 0)?.scaled(-1.0))
    }
}
