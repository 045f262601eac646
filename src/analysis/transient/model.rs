//! The switched closed loop of a design at a condition, with all its limits, and the state it starts from.

use super::super::digital::refuse_switched;
use super::super::loop_model::Shared;
use super::super::result::Condition;
use crate::compensator::{FAST, Limit, Limited};
use crate::control::{ControlLaw, Mode};
use crate::converter::{LoadKind, StageCondition, not_followed};
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::quantity::Unit;
use crate::switched::{Amplifiers, AtRest, Closing, Driven, Joined, Load, Probe, Rule, SwitchedSystem, inputs};

/// A design's switched closed loop at a condition.
#[derive(Clone, Debug)]
pub(super) struct Model {
    pub(super) system: SwitchedSystem,
    pub(super) law: ControlLaw,
    outer: Limited,
    inner: Vec<Limit>,
    pub(super) load: Load,
    /// Voltage at the load's terminals [V].
    pub(super) load_voltage: f64,
    /// Load's conductance in the system's equations, and what makes it a resistor [S].
    in_equations: f64,
    to_resistor: f64,
    /// The level at or below which a probe asks for no pulse.
    pub(super) nothing: Option<(usize, f64)>,
    /// Rows of the probes that are shown, and of those the inductors', by place.
    pub(super) shown: Vec<usize>,
    pub(super) inductors: Vec<usize>,
    pub(super) switch: usize,
}

/// Name of the probe that is the load's current, that of a sink beside it included.
const LOAD: &str = "load current";

impl Model {
    /// The closed loop.
    ///
    /// # Errors
    /// A finding for what cannot be solved.
    pub(super) fn new(design: &CheckedDesign, shared: &Shared, condition: &Condition) -> Result<Self, Finding> {
        refuse_switched(design)?;
        let stage = &design.stage;
        if stage.phases() > 1.0 {
            return Err(not_followed("over time, phases would have to be told apart; their steady period is exact"));
        }
        let at = StageCondition {
            input_voltage: condition.input_voltage,
            load_current: condition.load_current,
            output_voltage: stage.output_voltage,
        };
        let unsolved = |what: &str, why: &dyn std::fmt::Display| {
            Finding::problem(what, format!("The network with its limits cannot be solved: {why}."))
        };
        if design.compensator.digital().is_some() {
            return Err(Finding::problem(
                "compensator.amplifier",
                "A difference equation is not followed switch by switch.",
            )
            .with_hint("its exact sampled loop and its steps are in the check; a network of parts can be followed"));
        }
        let outer = design.compensator.limited().map_err(|e| unsolved("compensator", &e))?;
        let inner = match &shared.law.mode {
            Mode::Average(average) => average.inner.limited().map_err(|e| unsolved("control.inner", &e))?.limits,
            _ => Vec::new(),
        };
        let held = design.compensator.steady_inputs().into_iter().map(|(name, volts)| (name.to_owned(), volts));
        let fed = shared.fast_path.as_ref().map(|path| (FAST.to_owned(), path.signal.to_owned()));
        let driven =
            Driven::Loop(Closing { space: &outer.space, held: held.collect(), fed: fed.into_iter().collect() });
        let mut system = SwitchedSystem::new(&Joined { stage, law: &shared.law, driven }, &at)?;
        let load_voltage = stage.load_voltage(&at);
        let siemens = condition.load_current / load_voltage;
        let (load, in_equations, to_resistor) = match stage.load {
            LoadKind::Resistor => (Load::AsItStands, siemens, 0.0),
            LoadKind::Current => (Load::Current(condition.load_current), 0.0, siemens),
            LoadKind::Power => {
                let watts = condition.load_current * load_voltage;
                (Load::Power { watts, tangent: -siemens }, -siemens, 2.0 * siemens)
            }
        };
        add_outside(&mut system, in_equations);
        let nothing = nothing(&system, &shared.law);
        let (shown, inductors, switch) = shown(&system);
        Ok(Model {
            system,
            law: shared.law.clone(),
            outer,
            inner,
            load,
            load_voltage,
            in_equations,
            to_resistor,
            nothing,
            shown,
            inductors,
            switch,
        })
    }

    /// The amplifiers' limits.
    pub(super) fn amplifiers(&self) -> Amplifiers<'_> {
        Amplifiers { outer: &self.outer.limits, inner: &self.inner }
    }

    /// The converter at rest, its output charged to a voltage [V].
    pub(super) fn at_rest(&self, output_v: f64) -> AtRest<'_> {
        AtRest {
            output_v,
            load_siemens: self.to_resistor,
            total_siemens: self.in_equations + self.to_resistor,
            amplifiers: self.amplifiers(),
        }
    }
}

/// Adds input voltage and load current to what can be looked at.
fn add_outside(system: &mut SwitchedSystem, siemens: f64) {
    let columns = [inputs::INPUT_VOLTAGE, inputs::LOAD_CURRENT].map(|name| system.input(name));
    let load_row = system.places.stage.load_voltage;
    for piece in &mut system.pieces {
        let last = piece.c.nrows();
        let (c, d) = (std::mem::take(&mut piece.c), std::mem::take(&mut piece.d));
        piece.c = c.resize_vertically(last + 2, 0.0);
        piece.d = d.resize_vertically(last + 2, 0.0);
        let (by_states, by_inputs) = (piece.c.row(load_row) * siemens, piece.d.row(load_row) * siemens);
        piece.c.row_mut(last + 1).copy_from(&by_states);
        piece.d.row_mut(last + 1).copy_from(&by_inputs);
        for (k, column) in columns.iter().enumerate() {
            if let Some(column) = column {
                piece.d[(last + k, *column)] += 1.0;
            }
        }
    }
    system.probes.push(Probe { name: "input voltage".to_owned(), unit: Unit::Volt });
    system.probes.push(Probe { name: LOAD.to_owned(), unit: Unit::Ampere });
}

/// The level at or below which a probe asks for no pulse.
fn nothing(system: &SwitchedSystem, law: &ControlLaw) -> Option<(usize, f64)> {
    let Rule::Compared(comparator) = &system.rule else { return None };
    Some(match &law.mode {
        Mode::Current(_, sense) => (system.places.control_voltage, sense.offset),
        _ => (system.places.compared, comparator.valley_v),
    })
}

/// Probes in the order shown; places of the inductors and of the switch among them.
fn shown(system: &SwitchedSystem) -> (Vec<usize>, Vec<usize>, usize) {
    let places = &system.places;
    let outside = system.probe(LOAD).unwrap_or(places.stage.load_voltage);
    let mut rows = vec![places.stage.load_voltage];
    if places.stage.output_voltage != places.stage.load_voltage {
        rows.push(places.stage.output_voltage);
    }
    rows.extend([outside, places.control_voltage]);
    let first = rows.len();
    rows.extend(&places.inductor_currents);
    let inductors = (first..rows.len()).collect();
    let switch = rows.len();
    rows.extend([
        places.stage.switch_current,
        places.stage.rectifier_current,
        places.stage.switch_node,
        places.stage.input_current,
    ]);
    rows.extend(system.probe("input voltage"));
    (rows, inductors, switch)
}
