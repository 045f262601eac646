//! The actual network: its netlist with the amplifier's limits, solved by the circuit room.
//!
//! *Conventions.* Inputs `vout` (the converter's output) and `vref`; outputs `vc` (control voltage) and `error`, the voltage
//! between the amplifier's inputs, reference minus tap of the divider. Here the sign is the circuit's: `vc` falls when `vout`
//! rises. Output limits are not in these linear equations. Isolated feedback has more inputs: `fast`, the voltage its LED is fed from
//! where that follows the output, and the constants `led supply` where it does not, `led drop` and `supply`.
//!
//! *Model.* An op amp is a transconductance into a resistance and a capacitance (its DC gain and gain-bandwidth product), buffered by
//! a source of gain 1, so the network does not load it. A transconductance amplifier is a controlled current source beside its
//! output resistance. The shunt regulator's cathode is such a buffered source; the optocoupler's transistor copies the LED's current.

use std::fmt;

use super::network::{Amplifier, Compensator, Kind, Part};
use crate::circuit::{CircuitError, Compiled, Netlist, Node, PartId, Slot};
use crate::linear::{Complex, FrequencyResponse, LinearError, StateSpace, Zpk};

/// Resistance inside a buffered amplifier's model [Ω]; any value gives the same response, this one keeps the equations well scaled.
const INNER_RESISTANCE: f64 = 1e6;

/// Why the network could not be solved.
#[derive(Clone, Debug, PartialEq)]
pub enum NetworkError {
    /// The netlist has no state equations.
    Circuit(CircuitError),
    /// The state equations could not be used.
    Linear(LinearError),
    /// A difference equation is no network.
    Sampled,
}

impl fmt::Display for NetworkError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            NetworkError::Circuit(error) => write!(f, "compensator network: {error}"),
            NetworkError::Linear(error) => write!(f, "compensator response: {error}"),
            NetworkError::Sampled => f.write_str("a difference equation has no state equations in continuous time"),
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

/// Where limits of the amplifier act.
#[derive(Clone, Copy, Debug)]
pub(super) struct Driven {
    /// The node that the amplifier drives by a current: ahead of the buffer of an op amp or shunt regulator, or the output of a
    /// transconductance amplifier.
    pub(super) node: Node,
    /// The optocoupler's transistor, from its collector to ground, with the node of its collector.
    pub(super) transistor: Option<(PartId, Node)>,
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
    pub(super) fn slot(&mut self, name: &str, value: f64) -> Slot {
        let slot = self.netlist.slot(name);
        if slot.index() == self.values.len() {
            self.values.push(value);
        }
        slot
    }

    /// Fits a part of the compensator between two nodes.
    pub(super) fn fit(&mut self, compensator: &Compensator, part: Part, from: Node, to: Node) {
        let slot = self.slot(part.path(), compensator.parts.get(part));
        if part.is_resistor() {
            self.netlist.resistor(part.path(), from, to, slot);
        } else {
            self.netlist.capacitor(part.path(), from, to, slot);
        }
    }

    /// Fits a voltage amplifier with one pole from plus and minus to its output, from its gain at DC and gain-bandwidth product [Hz]; gives
    /// the node ahead of its buffer.
    pub(super) fn buffered(&mut self, name: &str, gain: (f64, f64), [plus, minus, out]: [Node; 3]) -> Node {
        let (dc_gain, bandwidth) = gain;
        let ground = self.netlist.ground();
        let inner = self.netlist.node(name);
        let [gm_name, resistance_name, capacitance_name, buffer_name] =
            ["gm", "resistance", "capacitance", "buffer"].map(|what| format!("{name}.{what}"));
        let gm = self.slot(&gm_name, dc_gain / INNER_RESISTANCE);
        let resistance = self.slot(&resistance_name, INNER_RESISTANCE);
        let pole_rad_s = std::f64::consts::TAU * bandwidth / dc_gain;
        let capacitance = self.slot(&capacitance_name, 1.0 / (pole_rad_s * INNER_RESISTANCE));
        let unity = self.slot(&buffer_name, 1.0);
        self.netlist.controlled_current(&gm_name, ground, inner, gm, plus, minus);
        self.netlist.resistor(&resistance_name, inner, ground, resistance);
        self.netlist.capacitor(&capacitance_name, inner, ground, capacitance);
        self.netlist.controlled_voltage(&buffer_name, out, ground, unity, inner, ground);
        inner
    }

    /// A voltage source that is an input.
    pub(super) fn source(&mut self, name: &str, plus: Node, minus: Node) {
        let input = self.netlist.input(name);
        self.netlist.voltage_source(name, plus, minus, input);
    }
}

impl Compensator {
    /// The network with its amplifier as a netlist: reads like the schematic.
    pub fn netlist(&self) -> ValuedNetlist {
        self.drawn().0
    }

    /// The netlist, and where the amplifier drives it.
    pub(super) fn drawn(&self) -> (ValuedNetlist, Driven) {
        let mut circuit = ValuedNetlist { netlist: Netlist::new(), values: Vec::new() };
        let ground = circuit.netlist.ground();
        let [vout, vref, tap, vc] = ["vout", "vref", "tap", "vc"].map(|name| circuit.netlist.node(name));
        for (name, node) in [("vout", vout), ("vref", vref)] {
            circuit.source(name, node, ground);
        }
        circuit.fit(self, Part::Upper, vout, tap);
        circuit.fit(self, Part::Lower, tap, ground);
        if self.has(Part::C3) && self.isolated().is_none() {
            self.fit_branch(&mut circuit, vout, tap);
        }
        if self.has(Part::Feedforward) {
            circuit.fit(self, Part::Feedforward, vout, tap);
        }
        if let Amplifier::ShuntRegulator(regulator) = self.amplifier {
            let driven = self.fit_isolated(&regulator, &mut circuit, [vref, tap, vc]);
            circuit.netlist.voltage_output("vc", vc, ground);
            circuit.netlist.voltage_output("error", vref, tap);
            return (circuit, driven);
        }
        let (far_end, driven) = self.fit_amplifier(&mut circuit, [vref, tap, vc]);
        if self.kind == Kind::One {
            circuit.fit(self, Part::C1, vc, far_end);
        } else if self.has(Part::R2) {
            let inner = circuit.netlist.node("r2-c1");
            circuit.fit(self, Part::R2, vc, inner);
            circuit.fit(self, Part::C1, inner, far_end);
            circuit.fit(self, Part::C2, vc, far_end);
        }
        circuit.netlist.voltage_output("vc", vc, ground);
        circuit.netlist.voltage_output("error", vref, tap);
        (circuit, Driven { node: driven, transistor: None })
    }

    /// Fits r3 and c3 in series.
    pub(super) fn fit_branch(&self, circuit: &mut ValuedNetlist, from: Node, to: Node) {
        let inner = circuit.netlist.node("r3-c3");
        circuit.fit(self, Part::R3, from, inner);
        circuit.fit(self, Part::C3, inner, to);
    }

    /// Fits the amplifier from its inputs `vref` (plus) and `tap` (minus) to `vc`, and returns the node where the far end of the
    /// network from `vc` goes, the tap around an op amp, ground behind a transconductance amplifier; and the node that the amplifier
    /// drives by a current.
    fn fit_amplifier(&self, circuit: &mut ValuedNetlist, [vref, tap, vc]: [Node; 3]) -> (Node, Node) {
        let ground = circuit.netlist.ground();
        match self.amplifier {
            Amplifier::OpAmp(amplifier) => {
                let gain = (amplifier.dc_gain, amplifier.gain_bandwidth_hz);
                (tap, circuit.buffered("op-amp", gain, [vref, tap, vc]))
            }
            Amplifier::Transconductance(amplifier) => {
                let gm = circuit.slot("transconductance.gm", amplifier.gm);
                let resistance = circuit.slot("transconductance.output-resistance", amplifier.output_resistance);
                circuit.netlist.controlled_current("transconductance.gm", ground, vc, gm, vref, tap);
                circuit.netlist.resistor("transconductance.output-resistance", vc, ground, resistance);
                (ground, vc)
            }
            // Sampled at the tap, which it does not load; what it computes is no part of a netlist.
            Amplifier::Digital(_) => (ground, vc),
            // Drawn by itself.
            Amplifier::ShuntRegulator(_) => (tap, vc),
        }
    }

    /// State equations of the actual network: inputs `vout`, `vref` and, with isolated feedback, those named above; outputs `vc`,
    /// `error` [V].
    ///
    /// The current a transconductance amplifier gives is gm × `error`.
    ///
    /// # Errors
    /// When the netlist has no state equations; parts within the table's bounds do not lead there.
    pub fn state_space(&self) -> Result<StateSpace, NetworkError> {
        if self.digital().is_some() {
            return Err(NetworkError::Sampled);
        }
        let circuit = self.netlist();
        let compiled = Compiled::new(&circuit.netlist, |_| true, &circuit.values)?;
        let (equations, _) = compiled.equations(&circuit.values)?.independent();
        let inputs: Vec<&str> = circuit.netlist.input_names().iter().map(String::as_str).collect();
        Ok(StateSpace::new(equations.a, equations.b, equations.c, equations.d, &inputs, &["vc", "error"])?)
    }

    /// Control voltage from output voltage of the actual network, inversion taken out [V/V]; a fast path sees the same voltage.
    ///
    /// # Errors
    /// As [`Compensator::state_space`], and when its zeros or poles do not converge.
    pub fn response(&self) -> Result<Zpk, NetworkError> {
        Ok(Zpk::from_state_space(&joined_paths(self.state_space()?)?, 0, 0)?.scaled(-1.0))
    }

    /// The slow and the fast path's share of the response at a frequency, inversion taken out [V/V]; the fast one is zero where
    /// there is none.
    pub fn paths_at(&self, frequency_hz: f64) -> Option<[Complex; 2]> {
        if let Some(digital) = self.digital() {
            return Some([digital.response().at_hz(frequency_hz), Complex::ZERO]);
        }
        let system = self.state_space().ok()?;
        let s = Complex::new(0.0, std::f64::consts::TAU * frequency_hz);
        let slow = -system.entry_at(0, 0, s)?;
        let fast = system.input(FAST).map_or(Some(Complex::ZERO), |column| Some(-system.entry_at(0, column, s)?))?;
        Some([slow, fast])
    }
}

/// The system of a compensator with its fast path driven by the voltage that is sensed.
///
/// # Errors
/// As building a system.
pub fn joined_paths(mut system: StateSpace) -> Result<StateSpace, LinearError> {
    let Some(fast) = system.input(FAST) else { return Ok(system) };
    let sensed = system.need_input("vout")?;
    for matrix in [&mut system.b, &mut system.d] {
        let sum = matrix.column(sensed) + matrix.column(fast);
        matrix.set_column(sensed, &sum);
    }
    Ok(system)
}

/// Name of the input that the fast path of isolated feedback reads.
pub const FAST: &str = "fast";
