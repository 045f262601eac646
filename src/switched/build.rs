//! A switched system from a stage, its control law and its compensator at a condition.
//!
//! *Method*: every signal is a row over joint states and inputs; the rows of stage, sense filter, inner compensator and compensator are
//! put together by what drives them, once for each configuration. *Conventions*: the sense filter and the comparator see the switched
//! current in every interval; the comparator's volts are those behind its divider.

use super::system::{Comparator, Configuration, Piece, Places, Probe, Rule, SwitchedSystem, inputs};
use crate::circuit::StateEquations;
use crate::control::{AverageCurrent, ControlLaw, Edge, Mode};
use crate::converter::{OperatingPoint, Stage, StageCondition, SwitchingEquations};
use crate::finding::Finding;
use crate::linear::StateSpace;
use crate::quantity::Unit;
use nalgebra::{DMatrix, DVector, RowDVector};

/// What makes the control voltage.
#[derive(Clone, Copy, Debug)]
pub enum Driven<'a> {
    /// The compensator: its state space with the inputs "vout" and "vref" and the output "vc", and its reference [V].
    Loop(&'a StateSpace, f64),
    /// A given control voltage [V]: the loop is open.
    Voltage(f64),
}

/// What is joined into a switched system.
#[derive(Clone, Copy, Debug)]
pub struct Joined<'a> {
    /// The stage.
    pub stage: &'a Stage,
    /// Its control law, the compensating ramp settled.
    pub law: &'a ControlLaw,
    /// What makes the control voltage.
    pub driven: Driven<'a>,
}

/// Where the parts of the joint state begin, and how wide a row is.
struct Layout {
    stage: usize,
    filter: usize,
    inner: usize,
    outer: usize,
    stage_inputs: usize,
}

/// Inputs beside the stage's own.
const OWN_INPUTS: [&str; 3] = [inputs::REFERENCE, inputs::INJECTED, inputs::CONTROL];

impl Layout {
    fn states(&self) -> usize {
        self.stage + self.filter + self.inner + self.outer
    }

    fn width(&self) -> usize {
        self.states() + self.stage_inputs + OWN_INPUTS.len()
    }

    fn zero(&self) -> RowDVector<f64> {
        RowDVector::zeros(self.width())
    }

    /// A row that is one joint state.
    fn state(&self, place: usize) -> RowDVector<f64> {
        let mut row = self.zero();
        row[place] = 1.0;
        row
    }

    /// A row that is one of the own inputs.
    fn own(&self, name: &str) -> RowDVector<f64> {
        let mut row = self.zero();
        if let Some(k) = OWN_INPUTS.iter().position(|own| *own == name) {
            row[self.states() + self.stage_inputs + k] = 1.0;
        }
        row
    }

    /// A row over the stage's states and inputs.
    fn of_stage(&self, by_states: &RowDVector<f64>, by_inputs: &RowDVector<f64>) -> RowDVector<f64> {
        let mut row = self.zero();
        row.columns_mut(0, self.stage).copy_from(by_states);
        row.columns_mut(self.states(), self.stage_inputs).copy_from(by_inputs);
        row
    }

    /// Output rows and rates of a linear block whose states begin at `place` and whose inputs are the given rows.
    fn block(&self, block: &StateSpace, place: usize, drive: &dyn Fn(&str) -> RowDVector<f64>) -> Block {
        let driven = |by_states: RowDVector<f64>, by_inputs: RowDVector<f64>| {
            let mut row = self.zero();
            row.columns_mut(place, block.order()).copy_from(&by_states);
            for (name, gain) in block.inputs.iter().zip(by_inputs.iter()) {
                if *gain != 0.0 {
                    row += drive(name) * *gain;
                }
            }
            row
        };
        let rows = |by_states: &DMatrix<f64>, by_inputs: &DMatrix<f64>| {
            (0..by_states.nrows()).map(|r| driven(by_states.row(r).into(), by_inputs.row(r).into())).collect()
        };
        Block { rates: rows(&block.a, &block.b), outputs: rows(&block.c, &block.d) }
    }
}

/// A linear block's rates and outputs as rows over joint states and inputs.
struct Block {
    rates: Vec<RowDVector<f64>>,
    outputs: Vec<RowDVector<f64>>,
}

/// What the control law is made of here.
struct Law<'a> {
    control: &'a ControlLaw,
    filter_s: f64,
    inner: Option<(&'a AverageCurrent, StateSpace)>,
}

impl<'a> Law<'a> {
    fn new(law: &'a ControlLaw) -> Result<Self, Finding> {
        let (filter_s, inner) = match &law.mode {
            Mode::Voltage(_) => (0.0, None),
            Mode::Current(_, sense) => (sense.filter_s, None),
            Mode::Average(average) => {
                let space = average.inner.state_space().map_err(|error| {
                    Finding::problem("control.inner", format!("The inner compensator cannot be solved: {error}."))
                })?;
                (average.filter_s, Some((average.as_ref(), space)))
            }
        };
        Ok(Law { control: law, filter_s, inner })
    }

    /// What the comparator compares, from control voltage, sensed current and the inner amplifier's output.
    fn compared(
        &self,
        control: &RowDVector<f64>,
        sensed: &RowDVector<f64>,
        inner: Option<RowDVector<f64>>,
    ) -> RowDVector<f64> {
        match &self.control.mode {
            Mode::Voltage(_) => control.clone(),
            Mode::Current(_, sense) => control * sense.divider - sensed * sense.comparator_ohms(),
            Mode::Average(_) => inner.unwrap_or_else(|| control.clone()),
        }
    }

    fn comparator(&self, row: usize, period: f64) -> Comparator {
        let law = self.control;
        let mut comparator = Comparator {
            edge: Edge::Peak,
            row,
            valley_v: 0.0,
            rate: 0.0,
            rate_per_input: 0.0,
            delay_s: law.delay_s,
            blanking_s: 0.0,
            on_time_least_s: 0.0,
            duty_least: law.duty_least,
            duty_greatest: law.duty_greatest,
            clamp: law.clamp,
        };
        let ramp = match &law.mode {
            Mode::Voltage(ramp) => ramp,
            Mode::Average(average) => &average.ramp,
            Mode::Current(edge, sense) => {
                comparator.edge = *edge;
                comparator.valley_v = sense.divider * sense.offset;
                comparator.rate = if *edge == Edge::Peak { sense.ramp() } else { -sense.ramp() };
                comparator.blanking_s = sense.blanking_s;
                comparator.on_time_least_s = sense.on_time_least_s;
                return comparator;
            }
        };
        comparator.valley_v = ramp.valley;
        match ramp.feedforward_at {
            Some(nominal) => comparator.rate_per_input = ramp.amplitude / (nominal * period),
            None => comparator.rate = ramp.amplitude / period,
        }
        comparator
    }
}

impl SwitchedSystem {
    /// Joins a stage, its law and what makes the control voltage at a condition.
    ///
    /// # Errors
    /// A finding for a netlist or an inner compensator without state equations.
    pub fn new(joined: Joined<'_>, condition: &StageCondition) -> Result<Self, Finding> {
        let equations = joined.stage.switching(condition)?;
        let law = Law::new(joined.law)?;
        let outer = match joined.driven {
            Driven::Loop(space, _) => Some(space),
            Driven::Voltage(_) => None,
        };
        let layout = Layout {
            stage: equations.state_names.len(),
            filter: usize::from(law.filter_s > 0.0),
            inner: law.inner.as_ref().map_or(0, |(_, space)| space.order()),
            outer: outer.map_or(0, StateSpace::order),
            stage_inputs: equations.input_names.len(),
        };
        let (probes, places) = probes(&equations);
        let period_s = joined.stage.switching_frequency.recip();
        let builder = Builder { layout: &layout, equations: &equations, law: &law, outer, places: &places };
        let pieces = [&equations.conducting, &equations.freewheeling, &equations.resting].map(|e| builder.piece(e));
        let pad = |row: &RowDVector<f64>| row.clone().resize_horizontally(layout.states(), 0.0);
        let mut rest_projector = DMatrix::identity(layout.states(), layout.states());
        rest_projector.view_mut((0, 0), (layout.stage, layout.stage)).copy_from(&equations.rest);
        Ok(SwitchedSystem {
            pieces,
            rest_projector,
            rest: equations.blocks.then(|| pad(&equations.switched_current)),
            rotation: None,
            state_names: state_names(&equations, &layout),
            input_names: equations.input_names.iter().cloned().chain(OWN_INPUTS.map(str::to_owned)).collect(),
            steady_inputs: steady_inputs(&equations.inputs, joined.driven),
            rule: Rule::Compared(law.comparator(places.compared, period_s)),
            probes,
            places,
            period_s,
        })
    }

    /// The same at the condition of an operating point.
    ///
    /// # Errors
    /// As [`SwitchedSystem::new`].
    pub fn at_point(joined: Joined<'_>, point: &OperatingPoint) -> Result<Self, Finding> {
        let condition = StageCondition {
            input_voltage: point.input_voltage,
            load_current: point.load_current,
            output_voltage: point.output_voltage,
        };
        Self::new(joined, &condition)
    }
}

fn steady_inputs(stage: &DVector<f64>, driven: Driven<'_>) -> DVector<f64> {
    let (reference, control) = match driven {
        Driven::Loop(_, reference) => (reference, 0.0),
        Driven::Voltage(control) => (0.0, control),
    };
    DVector::from_iterator(stage.len() + OWN_INPUTS.len(), stage.iter().copied().chain([reference, 0.0, control]))
}

fn state_names(equations: &SwitchingEquations, layout: &Layout) -> Vec<String> {
    let numbered = |what: &'static str, count: usize| (1..=count).map(move |k| format!("{what} {k}"));
    equations
        .state_names
        .iter()
        .cloned()
        .chain((0..layout.filter).map(|_| "sense filter".to_owned()))
        .chain(numbered("inner compensator", layout.inner))
        .chain(numbered("compensator", layout.outer))
        .collect()
}

/// The stage's outputs, all of them in its own order, then switched current, control voltage, what is compared, and the sensed current.
fn probes(equations: &SwitchingEquations) -> (Vec<Probe>, Places) {
    let rows = &equations.rows;
    let count = equations.conducting.c.nrows();
    let mut named = vec![None; count];
    let mut name = |row: usize, name: String, unit: Unit| {
        if let Some(place) = named.get_mut(row) {
            *place = Some(Probe { name, unit });
        }
    };
    name(rows.output_voltage, "output voltage".to_owned(), Unit::Volt);
    name(rows.load_voltage, "load voltage".to_owned(), Unit::Volt);
    name(rows.switch_node, "switch-node voltage".to_owned(), Unit::Volt);
    name(rows.switch_voltage, "switch voltage".to_owned(), Unit::Volt);
    name(rows.rectifier_voltage, "rectifier voltage".to_owned(), Unit::Volt);
    name(rows.input_current, "input current".to_owned(), Unit::Ampere);
    name(rows.switch_current, "switch current".to_owned(), Unit::Ampere);
    name(rows.rectifier_current, "rectifier current".to_owned(), Unit::Ampere);
    let counted = |what: &str, k: usize, of: usize| if of == 1 { what.to_owned() } else { format!("{what} {}", k + 1) };
    for (k, row) in rows.inductor_currents.iter().enumerate() {
        name(*row, counted("inductor current", k, rows.inductor_currents.len()), Unit::Ampere);
    }
    for (k, row) in rows.branch_currents.iter().enumerate() {
        name(*row, counted("output capacitor current", k, rows.branch_currents.len()), Unit::Ampere);
    }
    for (what, row) in &rows.filter_inductors {
        name(*row, format!("{what} current"), Unit::Ampere);
    }
    // Rows without a name carry the currents of lossy filter resistances.
    let unnamed = || Probe { name: String::new(), unit: Unit::Ampere };
    let mut probes: Vec<Probe> = named.into_iter().map(|probe| probe.unwrap_or_else(unnamed)).collect();
    for (name, unit) in [
        ("switched current", Unit::Ampere),
        ("control voltage", Unit::Volt),
        ("compared voltage", Unit::Volt),
        ("sensed current", Unit::Ampere),
    ] {
        probes.push(Probe { name: name.to_owned(), unit });
    }
    let places = Places {
        output_voltage: rows.output_voltage,
        load_voltage: rows.load_voltage,
        switch_node: rows.switch_node,
        switch_voltage: rows.switch_voltage,
        rectifier_voltage: rows.rectifier_voltage,
        input_current: rows.input_current,
        switch_current: rows.switch_current,
        rectifier_current: rows.rectifier_current,
        switched_current: count,
        inductor_currents: rows
            .inductor_currents
            .iter()
            .copied()
            .chain(rows.filter_inductors.iter().map(|(_, row)| *row))
            .collect(),
        branch_currents: rows.branch_currents.clone(),
        control_voltage: count + 1,
        compared: count + 2,
        sensed_current: count + 3,
    };
    (probes, places)
}

/// What the pieces of one system share.
struct Builder<'a> {
    layout: &'a Layout,
    equations: &'a SwitchingEquations,
    law: &'a Law<'a>,
    outer: Option<&'a StateSpace>,
    places: &'a Places,
}

impl Builder<'_> {
    fn piece(&self, e: &StateEquations) -> Piece {
        let layout = self.layout;
        let stage_row =
            |a: &DMatrix<f64>, b: &DMatrix<f64>, r: usize| layout.of_stage(&a.row(r).into(), &b.row(r).into());
        let mut rates: Vec<RowDVector<f64>> = (0..layout.stage).map(|r| stage_row(&e.a, &e.b, r)).collect();
        let mut outputs: Vec<RowDVector<f64>> = (0..e.c.nrows()).map(|r| stage_row(&e.c, &e.d, r)).collect();
        let none = RowDVector::zeros(layout.stage_inputs);
        let switched = layout.of_stage(&self.equations.switched_current, &none);
        let mut sensed = layout.of_stage(&self.equations.sensed_current, &none);
        if layout.filter > 0 {
            let filtered = layout.state(layout.stage);
            rates.push((&sensed - &filtered) / self.law.filter_s);
            sensed = filtered;
        }
        let output = outputs.get(self.places.output_voltage).cloned().unwrap_or_else(|| layout.zero());
        let (outer_rates, control) = self.control(&output);
        let mut inner_output = None;
        if let Some((average, space)) = &self.law.inner {
            let drive = |name: &str| if name == "vref" { control.clone() } else { &sensed * average.ohms };
            let block = layout.block(space, layout.stage + layout.filter, &drive);
            inner_output = space.output("vc").and_then(|row| block.outputs.get(row).cloned());
            rates.extend(block.rates);
        }
        rates.extend(outer_rates);
        let compared = self.law.compared(&control, &sensed, inner_output);
        outputs.extend([switched, control, compared, sensed]);
        let n = layout.states();
        let split = |rows: &[RowDVector<f64>], from: usize, count: usize| {
            DMatrix::from_fn(rows.len(), count, |r, k| rows[r][from + k])
        };
        let m = layout.width() - n;
        Piece { a: split(&rates, 0, n), b: split(&rates, n, m), c: split(&outputs, 0, n), d: split(&outputs, n, m) }
    }

    /// Rates of the compensator's states, and the control voltage.
    fn control(&self, output: &RowDVector<f64>) -> (Vec<RowDVector<f64>>, RowDVector<f64>) {
        let layout = self.layout;
        let added = layout.own(inputs::CONTROL);
        let Some(space) = self.outer else { return (Vec::new(), added) };
        let drive = |name: &str| match name {
            "vout" => output + layout.own(inputs::INJECTED),
            "vref" => layout.own(inputs::REFERENCE),
            _ => layout.zero(),
        };
        let block = layout.block(space, layout.stage + layout.filter + layout.inner, &drive);
        let control = space.output("vc").and_then(|row| block.outputs.get(row));
        (block.rates, control.map_or_else(|| added.clone(), |control| control + &added))
    }
}

impl Configuration {
    /// All, in the order of [`SwitchedSystem::pieces`].
    pub const ALL: [Configuration; 3] =
        [Configuration::Conducting, Configuration::Freewheeling, Configuration::Resting];
}
