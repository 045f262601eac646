//! A stage's netlist, drawn and compiled for every interval of every region of operation.

use super::cell::SwitchedCell;
use super::drawing::{Options, StageDrawing};
use super::rows::Rows;
use super::topology::{SwitchSets, Topology};
use crate::circuit::{CircuitError, Compiled, Netlist, StateEquations};
use nalgebra::DMatrix;

/// A netlist drawn and compiled.
#[derive(Clone, Debug)]
pub(super) struct Drawn {
    regions: Vec<Region>,
    pub(super) rows: Rows,
    pub(super) values: Vec<f64>,
    pub(super) load_slot: Option<usize>,
    slot_names: Vec<String>,
    /// Parts that hold the independent states.
    pub(super) state_names: Vec<String>,
}

/// A netlist compiled for the intervals of one region of operation.
#[derive(Clone, Debug)]
struct Region {
    sets: &'static SwitchSets,
    on: Compiled,
    off: Compiled,
    idle: Compiled,
}

/// State equations of the intervals over the same states, and the current that stops.
#[derive(Clone, Debug)]
pub(super) struct Equations {
    pub(super) on: StateEquations,
    pub(super) off: StateEquations,
    pub(super) cell: SwitchedCell,
}

impl Drawn {
    pub(super) fn new(
        topology: &Topology,
        options: Options,
        lookup: &dyn Fn(&str) -> f64,
    ) -> Result<Self, CircuitError> {
        let mut drawing = StageDrawing::new(options);
        (topology.draw)(&mut drawing);
        let unfinished = || CircuitError::Floating { names: vec![topology.name.to_owned()] };
        let (netlist, rows): (Netlist, Rows) = drawing.finish().ok_or_else(unfinished)?;
        let values: Vec<f64> = netlist.slot_names().iter().map(|name| lookup(name)).collect();
        let load_slot = netlist.slot_names().iter().position(|name| name == "load resistance");
        let compiled = |closed: &[&str]| Compiled::new(&netlist, |part| closed.contains(&part), &values);
        let region = |sets: &'static SwitchSets| {
            Ok(Region { sets, on: compiled(sets.on)?, off: compiled(sets.off)?, idle: compiled(sets.idle)? })
        };
        let slot_names = netlist.slot_names().to_vec();
        let regions = topology.switching.iter().map(region).collect::<Result<Vec<_>, CircuitError>>()?;
        let all: Vec<String> = netlist.state_names().map(str::to_owned).collect();
        let first: &Region = regions.first().ok_or_else(unfinished)?;
        let state_names = kept_names(&all, &first.on.equations(&values)?.independent().1);
        Ok(Drawn { regions, rows, values, load_slot, slot_names, state_names })
    }

    /// The slot of this name.
    pub(super) fn slot(&self, name: &str) -> Option<usize> {
        self.slot_names.iter().position(|known| known == name)
    }

    /// Whether the bank's current jumps as the switches change over: its expression differs between the intervals.
    pub(super) fn bank_is_switched(&self) -> bool {
        self.regions.iter().any(|region| {
            let (Ok(on), Ok(off)) = (region.on.equations(&self.values), region.off.equations(&self.values)) else {
                return true;
            };
            self.rows.branch_currents.iter().any(|&row| {
                let scale = on.c.row(row).amax().max(off.c.row(row).amax());
                (on.c.row(row) - off.c.row(row)).amax() > 1e-9 * scale
            })
        })
    }

    /// State equations with these switch sets at the values given.
    ///
    /// # Errors
    /// As netlist extraction.
    pub(super) fn equations(&self, sets: &'static SwitchSets, values: &[f64]) -> Result<Equations, CircuitError> {
        let unknown = || CircuitError::Floating { names: vec![sets.name.to_owned()] };
        let region = self.regions.iter().find(|region| region.sets == sets).ok_or_else(unknown)?;
        let on = region.on.equations(values)?;
        let off = region.off.equations(values)?.over_states_of(&on);
        let idle = region.idle.equations(values)?.over_states_of(&on);
        let on = on.independent().0;
        let row = |name: &str| self.rows.switch(name).map(|switch| switch.row).ok_or_else(unknown);
        let cell = SwitchedCell::new(idle, (&on, row(sets.switch)?), (&off, row(sets.rectifier)?))?;
        Ok(Equations { on, off, cell })
    }
}

/// Names of the states kept of all, by the matrix that gives all from them.
pub(super) fn kept_names(all: &[String], basis: &DMatrix<f64>) -> Vec<String> {
    let unit = |column: usize, row: usize| {
        (0..basis.ncols()).all(|k| (basis[(row, k)] - f64::from(u8::from(k == column))).abs() < f64::EPSILON)
    };
    let name = |column: usize| (0..basis.nrows()).find(|row| unit(column, *row)).and_then(|row| all.get(row));
    (0..basis.ncols()).map(|column| name(column).cloned().unwrap_or_default()).collect()
}
