//! The load at a condition, as the netlist of a stage takes it.

use super::drawing::{DIODE_DROP, INPUT_VOLTAGE, LOAD_CURRENT};
use super::stage::{LoadKind, Stage, StageCondition};
use nalgebra::DVector;

/// A load at a condition.
pub(super) struct Loaded {
    /// Value of its resistance in the netlist [Ω].
    pub(super) ohms: f64,
    /// Steady inputs: input voltage, load current, diode drop.
    pub(super) inputs: DVector<f64>,
    /// The conductance that makes it a resistor, its own current left out [S].
    pub(super) to_resistor: f64,
}

impl Stage {
    /// The load and the steady inputs at a condition.
    pub(super) fn loaded(&self, condition: &StageCondition) -> Loaded {
        let resistance = self.load_voltage(condition) / condition.load_current;
        let mut inputs = DVector::zeros(3);
        inputs[INPUT_VOLTAGE] = condition.input_voltage;
        inputs[DIODE_DROP] = self.diode_drop;
        let ohms = match self.load {
            LoadKind::Resistor => resistance,
            LoadKind::Current => {
                inputs[LOAD_CURRENT] = condition.load_current;
                0.0
            }
            // The tangent at V, I: conductance −I/V beside a source of 2·I.
            LoadKind::Power => {
                inputs[LOAD_CURRENT] = 2.0 * condition.load_current;
                -resistance
            }
        };
        // Of the load's own −I/V, 0 or I/V.
        let to_resistor = match self.load {
            LoadKind::Resistor => 0.0,
            LoadKind::Current => resistance.recip(),
            LoadKind::Power => 2.0 * resistance.recip(),
        };
        Loaded { ohms, inputs, to_resistor }
    }
}
