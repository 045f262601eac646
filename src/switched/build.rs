//! A switched system from a stage, its control law and its compensator at a condition.
//!
//! *Method*: every signal is a row over joint states and inputs; the rows of stage, sense filter, inner compensator and compensator are
//! put together by what drives them, once for each configuration. *Conventions*: the sense filter and the comparator see the switched
//! current in every interval; the comparator's volts are those behind its divider.

use super::interleave::{Interleaving, followed, rename};
use super::probes::stage_probes;
use super::system::{Comparator, Configuration, Piece, Places, Probe, Rule, Simplified, SwitchedSystem, inputs};
use crate::circuit::StateEquations;
use crate::control::{AverageCurrent, ControlLaw, Edge, Mode};
use crate::converter::{LoadKind, OperatingPoint, Stage, StageCondition, SwitchingEquations};
use crate::finding::Finding;
use crate::linear::StateSpace;
use crate::quantity::Unit;
use nalgebra::{DMatrix, DVector, RowDVector};

/// A compensator that closes the loop.
///
/// Of its inputs "vout" is the sensed output voltage, those in `fed` are probes of the stage, those in `held` are constant; any other is
/// an input of the system, zero at rest. Its output "vc" is the control voltage, further outputs are probes.
#[derive(Clone, Debug)]
pub struct Closing<'a> {
    /// Its equations.
    pub space: &'a StateSpace,
    /// Inputs held at a value [V], "vref" among them.
    pub held: Vec<(String, f64)>,
    /// Inputs that follow a probe of the stage: their name, the probe's.
    pub fed: Vec<(String, String)>,
}

impl<'a> Closing<'a> {
    /// A compensator that knows nothing but the sensed voltage and its reference [V].
    pub fn new(space: &'a StateSpace, reference: f64) -> Self {
        Closing { space, held: vec![("vref".to_owned(), reference)], fed: Vec::new() }
    }
}

/// What makes the control voltage.
#[derive(Clone, Debug)]
pub enum Driven<'a> {
    /// The compensator.
    Loop(Closing<'a>),
    /// A given control voltage [V]: the loop is open.
    Voltage(f64),
}

/// What is joined into a switched system.
#[derive(Clone, Debug)]
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
    /// The magnetising current, where the comparator sees it.
    magnetising: usize,
    filter: usize,
    inner: usize,
    outer: usize,
    stage_inputs: usize,
    /// Names of the inputs beside the stage's own.
    own: Vec<String>,
}

/// Inputs that every system has beside the stage's own.
const OWN_INPUTS: [&str; 3] = [inputs::REFERENCE, inputs::INJECTED, inputs::CONTROL];
/// Before the names of the inner compensator's further inputs and outputs.
const INNER: &str = "inner ";
/// Inputs of every compensator.
const KNOWN_INPUTS: [&str; 2] = ["vout", "vref"];

impl Layout {
    fn states(&self) -> usize {
        self.stage + self.magnetising + self.filter + self.inner + self.outer
    }

    fn filter_place(&self) -> usize {
        self.stage + self.magnetising
    }

    fn inner_place(&self) -> usize {
        self.filter_place() + self.filter
    }

    fn outer_place(&self) -> usize {
        self.inner_place() + self.inner
    }

    fn width(&self) -> usize {
        self.states() + self.stage_inputs + self.own.len()
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
        if let Some(k) = self.own.iter().position(|own| own == name) {
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
        Block { width: self.width(), rates: rows(&block.a, &block.b), outputs: rows(&block.c, &block.d) }
    }
}

/// A linear block's rates and outputs as rows over joint states and inputs.
struct Block {
    width: usize,
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
                let limited = average.inner.limited().map_err(|error| {
                    Finding::problem("control.inner", format!("The inner compensator cannot be solved: {error}."))
                })?;
                (average.filter_s, Some((average.as_ref(), limited.space)))
            }
        };
        Ok(Law { control: law, filter_s, inner })
    }

    /// Whether the comparator sees the controlled switch's own current, a magnetising current with it.
    fn senses_the_switch(&self) -> bool {
        matches!(self.control.mode, Mode::Current(Edge::Peak, _))
    }

    /// What the comparator compares, from control voltage, sensed current and the inner amplifier's output.
    fn compared(&self, control: &RowDVector<f64>, sensed: &RowDVector<f64>, inner: RowDVector<f64>) -> RowDVector<f64> {
        match &self.control.mode {
            Mode::Voltage(_) => control.clone(),
            Mode::Current(_, sense) => control * sense.divider - sensed * sense.comparator_ohms(),
            Mode::Average(_) => inner,
        }
    }

    fn comparator(&self, row: usize, period: f64) -> Comparator {
        let law = self.control;
        let mut comparator = Comparator {
            edge: Edge::Peak,
            row,
            valley_v: 0.0,
            since_s: 0.0,
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
    pub fn new(joined: &Joined<'_>, condition: &StageCondition) -> Result<Self, Finding> {
        let equations = joined.stage.switching(condition)?;
        let law = Law::new(joined.law)?;
        let interleaved = equations.interleaved.as_ref();
        followed(interleaved, joined.law)?;
        let phases = interleaved.map_or(1, |i| i.phases);
        let outer = match &joined.driven {
            Driven::Loop(closing) => Some(closing),
            Driven::Voltage(_) => None,
        };
        let (mut probes, places) = stage_probes(&equations);
        let layout = Layout {
            stage: equations.state_names.len(),
            magnetising: usize::from(equations.magnetising.is_some() && law.senses_the_switch()),
            filter: if law.filter_s > 0.0 { phases } else { 0 },
            inner: law.inner.as_ref().map_or(0, |(_, space)| space.order()),
            outer: outer.map_or(0, |closing| closing.space.order()),
            stage_inputs: equations.input_names.len(),
            own: own_inputs(&law, outer),
        };
        let switching_period_s = joined.stage.switching_frequency.recip();
        let period_s = switching_period_s / phases as f64;
        let builder =
            Builder { layout: &layout, equations: &equations, law: &law, outer, places: &places, probes: &probes };
        let pieces = [
            (&equations.conducting, Configuration::Conducting),
            (&equations.freewheeling, Configuration::Freewheeling),
            (&equations.resting, Configuration::Resting),
        ]
        .map(|(equations, configuration)| builder.piece(equations, configuration));
        probes.extend(further_probes(&law, outer));
        let pad = |row: &RowDVector<f64>| row.clone().resize_horizontally(layout.states(), 0.0);
        let mut rest_projector = DMatrix::identity(layout.states(), layout.states());
        rest_projector.view_mut((0, 0), (layout.stage, layout.stage)).copy_from(&equations.rest);
        Ok(SwitchedSystem {
            pieces,
            rest_projector,
            rest: equations.blocks.then(|| pad(interleaved.map_or(&equations.switched_current, |i| &i.last))),
            rotation: rotation(&equations, &layout),
            state_names: state_names(&equations, &layout),
            input_names: equations.input_names.iter().chain(&layout.own).cloned().collect(),
            steady_inputs: steady_inputs(&equations.inputs, &joined.driven, &layout.own),
            rule: Rule::Compared(Comparator {
                since_s: interleaved.map_or(0.0, |i| i.always as f64 * period_s),
                ..law.comparator(places.compared, switching_period_s)
            }),
            interleaving: interleaved.map(Interleaving::new),
            probes,
            places,
            period_s,
            bank_esr: joined.stage.bank.iter().map(|branch| branch.esr).collect(),
            simplified: Simplified {
                power_tangent: joined.stage.load == LoadKind::Power,
                inductance_left_out: joined.stage.bank.iter().any(|branch| branch.esl > 0.0),
            },
        })
    }

    /// The same at the condition of an operating point.
    ///
    /// # Errors
    /// As [`SwitchedSystem::new`].
    pub fn at_point(joined: &Joined<'_>, point: &OperatingPoint) -> Result<Self, Finding> {
        let condition = StageCondition {
            input_voltage: point.input_voltage,
            load_current: point.load_current,
            output_voltage: point.output_voltage,
        };
        Self::new(joined, &condition)
    }
}

/// Inputs beside the stage's own: those of every system, then what compensator and inner compensator have beyond the usual.
fn own_inputs(law: &Law<'_>, outer: Option<&Closing<'_>>) -> Vec<String> {
    let further = |name: &&String| !KNOWN_INPUTS.contains(&name.as_str());
    let of_outer = outer.into_iter().flat_map(|closing| {
        let fed = |name: &String| closing.fed.iter().any(|(input, _)| input == name);
        closing.space.inputs.iter().filter(further).filter(move |name| !fed(name))
    });
    let of_inner = law.inner.iter().flat_map(|(_, space)| space.inputs.iter().filter(further));
    OWN_INPUTS
        .map(str::to_owned)
        .into_iter()
        .chain(of_outer.cloned())
        .chain(of_inner.map(|name| format!("{INNER}{name}")))
        .collect()
}

/// Outputs of compensator and inner compensator beside the control voltage.
fn further_probes(law: &Law<'_>, outer: Option<&Closing<'_>>) -> Vec<Probe> {
    let further = |name: &&String| name.as_str() != "vc";
    let of_outer = outer.into_iter().flat_map(|closing| closing.space.outputs.iter().filter(further)).cloned();
    let of_inner = law.inner.iter().flat_map(|(_, space)| space.outputs.iter().filter(further));
    of_outer
        .chain(of_inner.map(|name| format!("{INNER}{name}")))
        .map(|name| {
            let unit = if name.ends_with("error") { Unit::Volt } else { Unit::One };
            Probe { name, unit }
        })
        .collect()
}

fn steady_inputs(stage: &DVector<f64>, driven: &Driven<'_>, own: &[String]) -> DVector<f64> {
    let value = |name: &str| match driven {
        Driven::Loop(closing) => {
            let name = if name == inputs::REFERENCE { "vref" } else { name };
            closing.held.iter().find(|(held, _)| held == name).map_or(0.0, |(_, value)| *value)
        }
        Driven::Voltage(control) => {
            if name == inputs::CONTROL {
                *control
            } else {
                0.0
            }
        }
    };
    let own: Vec<f64> = own.iter().map(|name| value(name)).collect();
    DVector::from_iterator(stage.len() + own.len(), stage.iter().chain(&own).copied())
}

/// What becomes of the magnetising current as a period ends, and of several phases.
fn rotation(equations: &SwitchingEquations, layout: &Layout) -> Option<DMatrix<f64>> {
    let magnetising = equations.magnetising.as_ref().filter(|_| layout.magnetising > 0);
    let mut rotation = DMatrix::identity(layout.states(), layout.states());
    if let Some(magnetising) = magnetising {
        rotation[(layout.stage, layout.stage)] = magnetising.turn;
    }
    if let Some(interleaved) = &equations.interleaved {
        let filters: Vec<usize> = (0..layout.filter).map(|k| layout.filter_place() + k).collect();
        rename(&mut rotation, &interleaved.states);
        rename(&mut rotation, &filters);
    }
    (magnetising.is_some() || equations.interleaved.is_some()).then_some(rotation)
}

fn state_names(equations: &SwitchingEquations, layout: &Layout) -> Vec<String> {
    let numbered = |what: &'static str, count: usize| (1..=count).map(move |k| format!("{what} {k}"));
    equations
        .state_names
        .iter()
        .cloned()
        .chain((0..layout.magnetising).map(|_| "magnetising current".to_owned()))
        .chain((0..layout.filter).map(|_| "sense filter".to_owned()))
        .chain(numbered("inner compensator", layout.inner))
        .chain(numbered("compensator", layout.outer))
        .collect()
}

/// What the pieces of one system share.
struct Builder<'a> {
    layout: &'a Layout,
    equations: &'a SwitchingEquations,
    law: &'a Law<'a>,
    outer: Option<&'a Closing<'a>>,
    places: &'a Places,
    probes: &'a [Probe],
}

impl Builder<'_> {
    fn piece(&self, e: &StateEquations, configuration: Configuration) -> Piece {
        let layout = self.layout;
        let stage_row =
            |a: &DMatrix<f64>, b: &DMatrix<f64>, r: usize| layout.of_stage(&a.row(r).into(), &b.row(r).into());
        let mut rates: Vec<RowDVector<f64>> = (0..layout.stage).map(|r| stage_row(&e.a, &e.b, r)).collect();
        let mut outputs: Vec<RowDVector<f64>> = (0..e.c.nrows()).map(|r| stage_row(&e.c, &e.d, r)).collect();
        let none = RowDVector::zeros(layout.stage_inputs);
        let switched = layout.of_stage(&self.equations.switched_current, &none);
        let mut sensed = layout.of_stage(&self.equations.sensed_current, &none);
        if let Some(magnetising) = self.equations.magnetising.as_ref().filter(|_| layout.magnetising > 0) {
            let (by_states, by_inputs) = &magnetising.slope;
            let conducts = configuration == Configuration::Conducting;
            rates.push(if conducts { layout.of_stage(by_states, by_inputs) } else { layout.zero() });
            if conducts {
                sensed += layout.state(layout.stage);
            }
        }
        if layout.filter > 0 {
            let (sources, awake) = match &self.equations.interleaved {
                Some(i) => (i.sensed.iter().map(|row| layout.of_stage(row, &none)).collect(), i.always),
                None => (vec![sensed], 0),
            };
            let filtered = |k: usize| layout.state(layout.filter_place() + k);
            let rate = |(k, source): (usize, &RowDVector<f64>)| (source - filtered(k)) / self.law.filter_s;
            rates.extend(sources.iter().enumerate().map(rate));
            sensed = filtered(awake);
        }
        let output = outputs.get(self.places.stage.output_voltage).cloned().unwrap_or_else(|| layout.zero());
        let outer = self.outer(&output, &outputs);
        let control = outer.control;
        let mut inner = Controlling::none(layout.zero());
        if let Some((average, space)) = &self.law.inner {
            let drive = |name: &str| match name {
                "vref" => control.clone(),
                "vout" => &sensed * average.ohms,
                _ => layout.own(&format!("{INNER}{name}")),
            };
            inner = Controlling::new(layout.block(space, layout.inner_place(), &drive), space);
        }
        rates.extend(inner.rates);
        rates.extend(outer.rates);
        let compared = self.law.compared(&control, &sensed, inner.control);
        outputs.extend([switched, sensed, control, compared]);
        outputs.extend(outer.further);
        outputs.extend(inner.further);
        let n = layout.states();
        let split = |rows: &[RowDVector<f64>], from: usize, count: usize| {
            DMatrix::from_fn(rows.len(), count, |r, k| rows[r][from + k])
        };
        let m = layout.width() - n;
        Piece { a: split(&rates, 0, n), b: split(&rates, n, m), c: split(&outputs, 0, n), d: split(&outputs, n, m) }
    }

    /// The compensator; without one the control voltage is what is added to it.
    fn outer(&self, output: &RowDVector<f64>, outputs: &[RowDVector<f64>]) -> Controlling {
        let layout = self.layout;
        let added = layout.own(inputs::CONTROL);
        let Some(closing) = self.outer else { return Controlling::none(added) };
        let space = closing.space;
        let drive = |name: &str| match name {
            "vout" => output + layout.own(inputs::INJECTED),
            "vref" => layout.own(inputs::REFERENCE),
            _ => {
                let fed = closing.fed.iter().find(|(input, _)| input == name).map(|(_, probe)| probe);
                let probe = fed.and_then(|fed| self.probes.iter().position(|probe| probe.name == *fed));
                probe.and_then(|row| outputs.get(row).cloned()).unwrap_or_else(|| layout.own(name))
            }
        };
        let mut outer = Controlling::new(layout.block(space, layout.outer_place(), &drive), space);
        outer.control += added;
        outer
    }
}

/// A compensator's rates, its control voltage and what else it gives.
struct Controlling {
    rates: Vec<RowDVector<f64>>,
    control: RowDVector<f64>,
    further: Vec<RowDVector<f64>>,
}

impl Controlling {
    fn none(control: RowDVector<f64>) -> Self {
        Controlling { rates: Vec::new(), control, further: Vec::new() }
    }

    fn new(block: Block, space: &StateSpace) -> Self {
        let (mut control, mut further) = (None, Vec::new());
        for (name, row) in space.outputs.iter().zip(block.outputs) {
            if name == "vc" { control = Some(row) } else { further.push(row) }
        }
        let control = control.unwrap_or_else(|| RowDVector::zeros(block.width));
        Controlling { rates: block.rates, control, further }
    }
}

impl Configuration {
    /// All, in the order of [`SwitchedSystem::pieces`].
    pub const ALL: [Configuration; 3] =
        [Configuration::Conducting, Configuration::Freewheeling, Configuration::Resting];
}
