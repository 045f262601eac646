//! A stage and its control as one piecewise linear system, and the rule that switches it.
//!
//! *Conventions*: x' = A·x + B·u, y = C·x + D·u in SI units over the same joint states, inputs and probes in every configuration; time
//! within a period counts from the clock's edge. A load of constant power is its tangent, the bank's series inductance is left out.

use super::interleave::Interleaving;
use crate::control::Edge;
use crate::converter::SwitchingRows;
use crate::quantity::Unit;
use nalgebra::{DMatrix, DVector, RowDVector};

/// Names of the inputs of every switched system.
pub mod inputs {
    pub use crate::converter::signals::{INPUT_VOLTAGE, LOAD_CURRENT};
    /// Forward drop of the rectifying diode [V].
    pub const DIODE_DROP: &str = "diode drop";
    /// Reference of the error amplifier [V].
    pub const REFERENCE: &str = "reference";
    /// Voltage in series between the sensed output and the compensator's input, where an analyser injects [V].
    pub const INJECTED: &str = "injected";
    /// Added to the compensator's output; all of the control voltage where the loop is open [V].
    pub const CONTROL: &str = "control";
}

/// Which switches conduct.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Configuration {
    /// The controlled switch.
    Conducting,
    /// The rectifier.
    Freewheeling,
    /// None.
    Resting,
}

/// Equations of one configuration.
#[derive(Clone, Debug, PartialEq)]
pub struct Piece {
    /// States by states [1/s].
    pub a: DMatrix<f64>,
    /// States by inputs.
    pub b: DMatrix<f64>,
    /// Probes by states.
    pub c: DMatrix<f64>,
    /// Probes by inputs.
    pub d: DMatrix<f64>,
}

/// A signal that can be looked at.
#[derive(Clone, Debug, PartialEq)]
pub struct Probe {
    /// Its name.
    pub name: String,
    /// Its unit: volt or ampere.
    pub unit: Unit,
}

/// Rows of the probes that have a part to play.
#[derive(Clone, Debug, PartialEq)]
pub struct Places {
    /// The stage's own outputs.
    pub stage: SwitchingRows,
    /// Current that stops when both block [A].
    pub switched_current: usize,
    /// Currents of the inductors, those of the filters last [A].
    pub inductor_currents: Vec<usize>,
    /// Control voltage [V].
    pub control_voltage: usize,
    /// What the comparator compares with its ramp [V].
    pub compared: usize,
    /// What current mode and current limit sense, behind the sense filter [A].
    pub sensed_current: usize,
}

/// The comparator that ends an interval.
///
/// It compares probe `row`, in the configuration that the clock started, with a ramp: margin = y − valley − rate·(t + since). At
/// [`Edge::Peak`] the clock closes the switch and the margin's fall to zero opens it; at [`Edge::Valley`] the clock opens the
/// switch and the margin's rise to zero closes it. The switches follow `delay_s` later.
#[derive(Clone, Debug, PartialEq)]
pub struct Comparator {
    /// Which switching instant it decides.
    pub edge: Edge,
    /// Probe that it compares.
    pub row: usize,
    /// The ramp as the clock starts it [V].
    pub valley_v: f64,
    /// How long the ramp has run as the clock starts the period, with several phases [s].
    pub since_s: f64,
    /// Slope of the ramp [V/s] that no input sets.
    pub rate: f64,
    /// Slope of the ramp per volt of input voltage, from line feed-forward [1/s].
    pub rate_per_input: f64,
    /// From the comparator to the switches [s].
    pub delay_s: f64,
    /// How long after the clock the comparator is blind [s].
    pub blanking_s: f64,
    /// Shortest time the switch conducts [s].
    pub on_time_least_s: f64,
    /// Smallest duty ratio.
    pub duty_least: f64,
    /// Largest duty ratio.
    pub duty_greatest: f64,
    /// Greatest control voltage that is let through [V].
    pub clamp: Option<f64>,
}

/// What ends the interval that the clock starts.
#[derive(Clone, Debug, PartialEq)]
pub enum Rule {
    /// The switch conducts for this share of every period.
    Given {
        /// Duty ratio.
        duty: f64,
    },
    /// A comparator decides.
    Compared(Comparator),
}

/// A stage and its control as one piecewise linear system.
#[derive(Clone, Debug)]
pub struct SwitchedSystem {
    /// Equations by [`Configuration`], in its order.
    pub pieces: [Piece; 3],
    /// Puts the states on the constraint of [`Configuration::Resting`] as that begins.
    pub rest_projector: DMatrix<f64>,
    /// The rectifier's current from the states: its fall to zero opens the rectifier. None where it conducts reverse current.
    pub rest: Option<RowDVector<f64>>,
    /// Applied to the states as a period ends: a core is reset, or driven the other way by the next pulse, phases are renamed. None where nothing changes.
    pub rotation: Option<DMatrix<f64>>,
    /// What holds each state.
    pub state_names: Vec<String>,
    /// Names of the inputs, in column order.
    pub input_names: Vec<String>,
    /// What can be looked at, in row order.
    pub probes: Vec<Probe>,
    /// Rows of the probes with a part to play.
    pub places: Places,
    /// Inputs at the condition.
    pub steady_inputs: DVector<f64>,
    /// What ends the interval that the clock starts.
    pub rule: Rule,
    /// Several phases, of which the period is a share; none for one.
    pub interleaving: Option<Interleaving>,
    /// Period [s]: that of the switches, or with several phases so many parts of that.
    pub period_s: f64,
    /// Series resistance of each branch of the output bank [Ω].
    pub bank_esr: Vec<f64>,
    /// What this system leaves out or stands in for.
    pub simplified: Simplified,
}

/// What a switched system leaves out or stands in for; to be said where its results are shown.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Simplified {
    /// A load of constant power is its tangent.
    pub power_tangent: bool,
    /// The bank has series inductance, which is left out: an edge into it would be an impulse.
    pub inductance_left_out: bool,
}

impl SwitchedSystem {
    /// Equations of a configuration.
    pub fn piece(&self, configuration: Configuration) -> &Piece {
        let [conducting, freewheeling, resting] = &self.pieces;
        match configuration {
            Configuration::Conducting => conducting,
            Configuration::Freewheeling => freewheeling,
            Configuration::Resting => resting,
        }
    }

    /// Number of states.
    pub fn order(&self) -> usize {
        self.state_names.len()
    }

    /// Column of an input by name.
    pub fn input(&self, name: &str) -> Option<usize> {
        self.input_names.iter().position(|n| n == name)
    }

    /// Row of a probe by name.
    pub fn probe(&self, name: &str) -> Option<usize> {
        self.probes.iter().position(|probe| probe.name == name)
    }

    /// Slope of the comparator's ramp at its inputs [V/s]; zero where none compares.
    pub fn ramp_rate(&self, inputs: &DVector<f64>) -> f64 {
        let input = self.input(inputs::INPUT_VOLTAGE).and_then(|column| inputs.get(column)).copied().unwrap_or(0.0);
        match &self.rule {
            Rule::Given { .. } => 0.0,
            Rule::Compared(comparator) => comparator.rate + comparator.rate_per_input * input,
        }
    }
}
