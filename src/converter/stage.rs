//! A power stage with usable values: its netlist drawn and compiled, ready for any operating condition.

use super::bank::{Branch, branch_value};
use super::buck_derived::{COMMUTATION, MAGNETISING, commutation_resistance};
use super::cell::SwitchedCell;
use super::drawing::{INPUT_VOLTAGE, LOAD_CURRENT, Options};
use super::drawn::{Drawn, Equations};
use super::entries::{BRANCHES, applies, branch_count};
use super::filter_values::{InputFilter, SecondStage};
use super::filters::network_impedance;
use super::interleaved::PhasesDrawn;
use super::load::Loaded;
use super::phases;
use super::registry::find;
use super::rows::Rows;
use super::signals::INPUTS;
use super::topology::{DutyLimit, SwitchSets, Topology, Voltages};
use super::topology_entries::{self, COUPLING, COUPLING_CAPACITOR, RATIO, SECOND_INDUCTOR};
use crate::circuit::{CircuitError, StateEquations};
use crate::finding::Finding;
use crate::linear::StateSpace;
use crate::quantity::{Choices, Values};
use nalgebra::{DMatrix, DVector, RowDVector};

/// How the load current answers the output voltage.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LoadKind {
    /// Proportional to the voltage.
    Resistor,
    /// Constant.
    Current,
    /// Inverse to the voltage; linear models take the tangent.
    Power,
}

impl LoadKind {
    /// The kind chosen.
    pub(super) fn chosen(choices: &Choices) -> Self {
        match choices.get("stage.load") {
            Some("current") => LoadKind::Current,
            Some("power") => LoadKind::Power,
            _ => LoadKind::Resistor,
        }
    }
}

/// What conducts while the controlled switch is open.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Rectifier {
    /// A diode: a drop, a resistance, and no reverse current.
    Diode,
    /// A switch that conducts whenever the controlled one does not, reverse current included.
    Synchronous,
    /// A switch that opens when its current reaches zero: a resistance, and no reverse current.
    Emulated,
}

impl Rectifier {
    /// The rectifier chosen.
    pub(super) fn chosen(choices: &Choices) -> Self {
        match choices.get("stage.rectifier") {
            Some("synchronous") => Rectifier::Synchronous,
            Some("emulated") => Rectifier::Emulated,
            _ => Rectifier::Diode,
        }
    }

    /// Whether it stops reverse current, so that light loads run in discontinuous conduction.
    pub fn blocks(self) -> bool {
        self != Rectifier::Synchronous
    }
}

/// One operating condition of a stage.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StageCondition {
    /// Input voltage at the ideal source [V].
    pub input_voltage: f64,
    /// Load current at the regulated output voltage [A].
    pub load_current: f64,
    /// Regulated output voltage, as a magnitude [V].
    pub output_voltage: f64,
}

/// Why no duty ratio gives the wanted output.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum OutOfReach {
    /// The wanted output is above the peak of the conversion curve.
    Above {
        /// Greatest output that can be had [V].
        greatest: f64,
        /// Duty ratio at which it is had.
        at_duty: f64,
    },
    /// Even a duty ratio of zero gives more than the wanted output.
    Below {
        /// Least output that can be had [V].
        least: f64,
    },
}

/// A power stage with usable values.
#[derive(Clone, Debug)]
pub struct Stage {
    topology: &'static Topology,
    /// The stage without the bank's series inductance: operating point and waveforms, for which it is a fast mode.
    plain: Drawn,
    /// The stage with it, where it is an ordinary part of the averaged model.
    with_inductance: Option<Drawn>,
    pub(super) rows: Rows,
    pub(super) diode_drop: f64,
    /// Least, nominal and greatest input voltage [V].
    pub input_voltages: [f64; 3],
    /// Least, nominal and greatest load current at the regulated output [A].
    pub load_currents: [f64; 3],
    /// Regulated output voltage, as a magnitude [V].
    pub output_voltage: f64,
    /// Switching frequency of the pulses at the rectifier [Hz]: twice that of one switch in a double-ended stage.
    pub switching_frequency: f64,
    /// Inductance [H], of all phases in parallel.
    pub inductance: f64,
    /// How many equal phases there are, a whole number.
    pub(super) phases: f64,
    /// The stage with every phase drawn, where there are several.
    pub(super) phases_drawn: Option<PhasesDrawn>,
    /// Turns ratio of the transformer, second to first; 1 without one.
    pub ratio: f64,
    /// Magnetising inductance of a transformer that stores nothing, at its primary [H]; 0 without one.
    pub magnetising: f64,
    /// Greatest duty ratio that the circuit bears, where it sets one.
    pub duty_limit: Option<DutyLimit>,
    /// Inductance of the second inductor [H]; 0 without one.
    pub second_inductance: f64,
    /// Coupling factor of the two inductors; 0 where they are separate.
    pub coupling: f64,
    /// Capacitance of the coupling capacitor [F]; 0 without one.
    pub coupling_capacitance: f64,
    /// Resistance of the source [Ω].
    pub(super) source_resistance: f64,
    /// How the load current answers the output voltage.
    pub load: LoadKind,
    /// What conducts while the controlled switch is open.
    pub rectifier: Rectifier,
    /// The output bank.
    pub bank: Vec<Branch>,
    /// The input filter, where one is fitted.
    pub input_filter: Option<InputFilter>,
    /// The second-stage output filter, where one is fitted.
    pub second_stage: Option<SecondStage>,
    /// The same stage fed at its input terminals by an ideal source, where an input filter is fitted.
    unfiltered: Option<Box<Stage>>,
    /// Output impedance of the input network alone [V/A], where an input filter is fitted.
    network_impedance: Option<StateSpace>,
}

/// What feeds a stage that is put together.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Fed {
    /// Source resistance, input capacitor and filter, as entered.
    ThroughNetwork,
    /// An ideal source at the stage's input terminals.
    AtTerminals,
}

/// What a transformer's leakage inductance has to take over as the switch closes.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Commutation {
    /// The inductor's current.
    AtCurrent,
    /// None: the current has come to rest.
    FromRest,
}

/// The state equations of the switching intervals at one condition.
#[derive(Clone, Debug)]
pub(super) struct Intervals {
    pub(super) on: StateEquations,
    pub(super) off: StateEquations,
    /// Both open, and the current that stops then; of a synchronous rectifier too, for which it names the switched current.
    pub(super) cell: SwitchedCell,
    /// The switches that conduct in each.
    pub(super) sets: &'static SwitchSets,
    /// Row of the primary's voltage, and the ramp per volt there, in amperes of switched current [A/(V·s)], that a magnetising current
    /// adds to what is sensed.
    pub(super) natural: Option<(usize, f64)>,
    /// Steady inputs: input voltage, load current, diode drop.
    pub(super) inputs: DVector<f64>,
    /// Row of the load's voltage, and the conductance that makes the load a resistor, its own current left out [S].
    pub(super) to_resistor: (usize, f64),
}

impl Stage {
    /// A stage from entered values, which must have been checked against their bounds and order; the output voltage is
    /// the one that reference and divider give.
    ///
    /// # Errors
    /// A finding for an unknown topology or a netlist without state equations.
    pub fn from_values(values: &Values, choices: &Choices) -> Result<Self, Vec<Finding>> {
        let mut stage = Self::put_together(values, choices, Fed::ThroughNetwork)?;
        if stage.input_filter.is_some() {
            stage.unfiltered = Some(Box::new(Self::put_together(values, choices, Fed::AtTerminals)?));
        }
        Ok(stage)
    }

    fn put_together(values: &Values, choices: &Choices, fed: Fed) -> Result<Self, Vec<Finding>> {
        let entered = |path: &str| {
            if fed == Fed::AtTerminals && path == "stage.source.resistance" {
                return 0.0;
            }
            let entry = topology_entries::entries().iter().find(|entry| entry.path == path);
            let entry = entry.map(|entry| topology_entries::row(entry, choices));
            entry.filter(|e| applies(e.path, choices)).and_then(|e| values.get_or_default(e)).unwrap_or(0.0)
        };
        let phases = phases::count(entered(phases::PHASES.path)).map_err(|problem| vec![problem])?;
        let get = |path: &str| entered(path) / phases::divisor(path, phases);
        let key = choices.get("stage.topology").unwrap_or("boost");
        let Some(topology) = find(key) else {
            return Err(vec![Finding::problem("stage.topology", format!("No topology is called \"{key}\"."))]);
        };
        let input_voltages = ["least", "nominal", "greatest"].map(|level| get(&format!("stage.input.{level}")));
        let load_currents = ["least", "nominal", "greatest"].map(|level| get(&format!("stage.load.{level}")));
        let rectifier = Rectifier::chosen(choices);
        let bank: Vec<Branch> = (1..=branch_count(choices)).map(|k| entered_branch(k, &get)).collect();
        let load = LoadKind::chosen(choices);
        let mut options = Options::chosen(choices);
        if fed == Fed::AtTerminals {
            options.input_filter = None;
        }
        // Across an ideal source a capacitor changes nothing but the source's own current.
        options.input_capacitor &= get("stage.source.resistance") > 0.0 || options.input_filter.is_some();
        let input_filter = InputFilter::entered(choices, &get).filter(|_| fed == Fed::ThroughNetwork);
        let second_stage = SecondStage::entered(choices, &get);
        let output = get("stage.output.voltage");
        let lookup = |name: &str| match name {
            "load resistance" => load_voltage(second_stage.as_ref(), output, load_currents[1]) / load_currents[1],
            COMMUTATION => commutation_resistance(&get) * f64::from(topology.pulses),
            _ => branch_value(name, &bank).unwrap_or_else(|| multiple(name, &get)),
        };
        let drawn = Drawn::new(topology, options, &lookup).map_err(|e| vec![circuit_finding(&e)])?;
        // A load that is not a resistor leaves the inductance undamped where it stands right at the bank.
        let damped = load == LoadKind::Resistor || second_stage.is_some();
        let averaged_inductance = damped && bank.iter().any(|b| b.esl > 0.0) && !drawn.bank_is_switched();
        let with_inductance = if averaged_inductance {
            let mut branch_inductance = [false; BRANCHES];
            for (flag, branch) in branch_inductance.iter_mut().zip(&bank) {
                *flag = branch.esl > 0.0;
            }
            let options = Options { branch_inductance, ..options };
            Some(Drawn::new(topology, options, &lookup).map_err(|e| vec![circuit_finding(&e)])?)
        } else {
            None
        };
        let network_impedance = match input_filter {
            Some(_) => network_impedance(&options, &lookup).map_err(|e| vec![circuit_finding(&e)])?,
            None => None,
        };
        Ok(Stage {
            topology,
            rows: drawn.rows.clone(),
            plain: drawn,
            with_inductance,
            diode_drop: get("stage.diode.drop"),
            input_voltages,
            load_currents,
            output_voltage: output,
            switching_frequency: get("stage.switching-frequency") * f64::from(topology.pulses),
            inductance: get("stage.inductor.inductance"),
            phases,
            phases_drawn: PhasesDrawn::new(topology, options, phases),
            ratio: if applies(RATIO.path, choices) { get(RATIO.path) } else { 1.0 },
            magnetising: get(MAGNETISING.path),
            duty_limit: (topology.duty_limit)(&get),
            second_inductance: get(SECOND_INDUCTOR.path),
            coupling: get(COUPLING.path),
            coupling_capacitance: get(COUPLING_CAPACITOR.path),
            source_resistance: get("stage.source.resistance"),
            load,
            rectifier,
            bank,
            input_filter,
            second_stage,
            unfiltered: None,
            network_impedance,
        })
    }

    /// The same stage fed at its input terminals by an ideal source; none where no input filter is fitted.
    pub fn without_input_filter(&self) -> Option<&Stage> {
        self.unfiltered.as_deref()
    }

    /// Output impedance [V/A] of source and input filter alone at the stage's input terminals; none where no input filter is fitted.
    pub fn input_network_impedance(&self) -> Option<&StateSpace> {
        self.network_impedance.as_ref()
    }

    /// Voltage at the load's terminals at a condition [V]: below the regulated one by the second stage's drop where the bank's is
    /// regulated.
    pub fn load_voltage(&self, condition: &StageCondition) -> f64 {
        load_voltage(self.second_stage.as_ref(), condition.output_voltage, condition.load_current)
    }

    /// How many equal phases there are, a whole number.
    pub fn phases(&self) -> f64 {
        self.phases
    }

    /// Whether the output bank carries switched current.
    pub fn bank_is_switched(&self) -> bool {
        self.plain.bank_is_switched()
    }

    /// Lowest frequency of the ripple at input and output [Hz]: that of all phases together.
    pub fn ripple_frequency(&self) -> f64 {
        self.switching_frequency * self.phases
    }

    /// Voltage of the output bank at a condition [V]: above the regulated one by the second stage's drop where the load's is regulated.
    pub fn bank_voltage(&self, condition: &StageCondition) -> f64 {
        match &self.second_stage {
            Some(second) if second.sensed_at_load => {
                condition.output_voltage + condition.load_current * second.dc_resistance
            }
            _ => condition.output_voltage,
        }
    }

    /// Value in a slot of the netlist.
    pub(super) fn slot_value(&self, slot: usize) -> f64 {
        self.plain.values.get(slot).copied().unwrap_or(0.0)
    }

    /// Input and output voltage of a condition, with the turns ratio.
    pub(super) fn voltages(&self, condition: &StageCondition) -> Voltages {
        Voltages { input: condition.input_voltage, output: condition.output_voltage, ratio: self.ratio }
    }

    /// Value in the slot of this name; none where the netlist has no such slot.
    pub(super) fn slot_named(&self, name: &str) -> Option<f64> {
        self.plain.slot(name).map(|slot| self.slot_value(slot))
    }

    /// The topology.
    pub fn topology(&self) -> &'static Topology {
        self.topology
    }

    /// Parts that hold the states of operating point and waveforms.
    pub(super) fn state_names(&self) -> &[String] {
        &self.plain.state_names
    }

    /// Capacitance of the whole output bank, and of the second stage where one is fitted [F].
    pub fn output_capacitance(&self) -> f64 {
        self.bank_capacitance() + self.second_stage.map_or(0.0, |second| second.capacitance)
    }

    /// Capacitance of the whole output bank [F].
    pub fn bank_capacitance(&self) -> f64 {
        self.bank.iter().map(|branch| branch.capacitance).sum()
    }

    /// Whether the bank's series inductance is an ordinary part of the averaged model.
    pub fn bank_inductance_averaged(&self) -> bool {
        self.with_inductance.is_some()
    }

    /// State equations of the intervals and the steady inputs at a condition, for operating point and waveforms.
    ///
    /// # Errors
    /// As netlist extraction.
    pub(super) fn intervals(&self, condition: &StageCondition) -> Result<Intervals, CircuitError> {
        self.intervals_of(&self.plain, condition, Commutation::AtCurrent)
    }

    /// The same where every pulse starts from no current, and so commutates at once; none where that changes nothing.
    pub(super) fn intervals_from_rest(&self, condition: &StageCondition) -> Option<Result<Intervals, CircuitError>> {
        let delayed = self.slot_named(COMMUTATION).is_some_and(|ohms| ohms > 0.0);
        delayed.then(|| self.intervals_of(&self.plain, condition, Commutation::FromRest))
    }

    /// The same with the bank's series inductance, where it is an ordinary part of the averaged model.
    pub(super) fn intervals_with_inductance(
        &self,
        condition: &StageCondition,
    ) -> Option<Result<Intervals, CircuitError>> {
        self.with_inductance.as_ref().map(|drawn| self.intervals_of(drawn, condition, Commutation::AtCurrent))
    }

    fn intervals_of(
        &self,
        drawn: &Drawn,
        condition: &StageCondition,
        commutation: Commutation,
    ) -> Result<Intervals, CircuitError> {
        let Loaded { ohms, inputs, to_resistor } = self.loaded(condition);
        let mut values = drawn.values.clone();
        if let Some(slot) = drawn.slot(COMMUTATION).filter(|_| commutation == Commutation::FromRest) {
            values[slot] = 0.0;
        }
        if let Some(slot) = drawn.load_slot {
            values[slot] = ohms;
        }
        let sets = self.topology.sets(condition);
        let Equations { on, off, mut cell } = drawn.equations(sets, &values)?;
        // What is sensed is the current of one phase.
        cell.sense /= self.phases;
        let to_resistor = (drawn.rows.load_voltage, to_resistor);
        let natural = drawn.rows.primary_voltage.filter(|_| self.magnetising > 0.0);
        let natural = natural.map(|row| (row, self.topology.magnetising_ramp / (self.magnetising * cell.sense)));
        Ok(Intervals { on, off, cell, sets, natural, inputs, to_resistor })
    }
}

impl Intervals {
    /// Rows over states and inputs of the ramp that a magnetising current adds to what is sensed, in amperes of switched current [A/s].
    pub(super) fn natural_rows(&self) -> (RowDVector<f64>, RowDVector<f64>) {
        match self.natural {
            Some((row, gain)) => (self.on.c.row(row) * gain, self.on.d.row(row) * gain),
            None => (RowDVector::zeros(self.on.a.nrows()), RowDVector::zeros(self.on.b.ncols())),
        }
    }
}

/// Value of a slot: an entry's, so many times an entry's where its name says so (`0.5 × path`), or a plain number.
fn multiple(name: &str, get: &dyn Fn(&str) -> f64) -> f64 {
    let factor = |text: &str| text.parse::<f64>().ok();
    match name.split_once(" × ").and_then(|(times, path)| Some((factor(times)?, path))) {
        Some((times, path)) => times * get(path),
        None => factor(name).unwrap_or_else(|| get(name)),
    }
}

/// Columns of an averaged model's inputs: the duty ratio's, and the two of the netlist's that it keeps.
pub(super) fn with_duty(duty: &DVector<f64>, netlist: &DMatrix<f64>) -> DMatrix<f64> {
    DMatrix::from_fn(netlist.nrows(), INPUTS.len(), |r, k| match k {
        0 => duty[r],
        1 => netlist[(r, INPUT_VOLTAGE)],
        _ => netlist[(r, LOAD_CURRENT)],
    })
}

/// Voltage at the load's terminals [V] from the regulated one.
fn load_voltage(second: Option<&SecondStage>, regulated: f64, load_current: f64) -> f64 {
    match second {
        Some(second) if !second.sensed_at_load => regulated - load_current * second.dc_resistance,
        _ => regulated,
    }
}

fn entered_branch(k: usize, get: &dyn Fn(&str) -> f64) -> Branch {
    let value = |what: &str| get(&format!("stage.bank.{k}.{what}"));
    let count = value("count").max(1.0);
    Branch {
        capacitance: value("capacitance") * value("remaining") * count,
        esr: value("esr") / count,
        esl: value("esl") / count,
    }
}

/// A netlist error as a finding about the stage.
pub(super) fn circuit_finding(error: &CircuitError) -> Finding {
    Finding::problem("stage", format!("The stage has no state equations: {error}."))
}
