//! The equations of the switching intervals at a condition, for whoever follows the switches instead of averaging over them.
//!
//! *Conventions*: x' = A·x + B·u, y = C·x + D·u over the same states in every interval, SI units. While both block, A and C mean
//! something only on the constraint that ties the states together: put the states there with `rest` as that interval begins.
//! The bank's series inductance is left out: an edge into it would be an impulse.

use super::interleaved::Interleaved;
use super::rows::{Rows, SwitchRow};
use super::signals::{INPUT_VOLTAGE, LOAD_CURRENT};
use super::stage::{Intervals, Stage, StageCondition, circuit_finding};
use crate::circuit::{CircuitError, StateEquations};
use crate::finding::Finding;
use nalgebra::{DMatrix, DVector, RowDVector};

/// Name of the input that is the rectifier's drop.
pub(super) const DIODE_DROP: &str = "diode drop";

/// Rows of `C` and `D` by what they answer with.
#[derive(Clone, Debug, PartialEq)]
pub struct SwitchingRows {
    /// Regulated voltage, a magnitude [V].
    pub output_voltage: usize,
    /// Voltage at the load's terminals, a magnitude [V].
    pub load_voltage: usize,
    /// Voltage of the output bank, ahead of a second stage, a magnitude [V].
    pub bank_voltage: usize,
    /// Voltage of the switch node against ground [V].
    pub switch_node: usize,
    /// Voltage across the controlled switch [V].
    pub switch_voltage: usize,
    /// Voltage that the rectifier blocks [V].
    pub rectifier_voltage: usize,
    /// Current drawn from the ideal source [A].
    pub input_current: usize,
    /// Current of the controlled switch [A].
    pub switch_current: usize,
    /// Current of the rectifier [A].
    pub rectifier_current: usize,
    /// Currents of the inductors that carry switched current [A].
    pub inductor_currents: Vec<usize>,
    /// Currents into the branches of the output bank [A].
    pub branch_currents: Vec<usize>,
    /// Currents of the filters' inductors, with their names [A].
    pub filter_inductors: Vec<(&'static str, usize)>,
}

/// A transformer's magnetising current as the controlled switch carries it.
#[derive(Clone, Debug, PartialEq)]
pub struct Magnetising {
    /// Its slope while the switch conducts, from states and inputs [A/s].
    pub slope: (RowDVector<f64>, RowDVector<f64>),
    /// What becomes of it for the next period: 0 where the core is reset, −1 where the next pulse drives it the other way.
    pub turn: f64,
}

/// The equations of the switching intervals at a condition.
#[derive(Clone, Debug)]
pub struct SwitchingEquations {
    /// While the controlled switch conducts.
    pub conducting: StateEquations,
    /// While the rectifier conducts.
    pub freewheeling: StateEquations,
    /// While both block.
    pub resting: StateEquations,
    /// Puts the states on the constraint that holds while both block.
    pub rest: DMatrix<f64>,
    /// The current that stops when both block, from the states [A]: the rectifier's while that conducts.
    pub switched_current: RowDVector<f64>,
    /// What current mode senses, from the states [A].
    pub sensed_current: RowDVector<f64>,
    /// What a magnetising current that is no state of the stage adds to what the controlled switch carries.
    pub magnetising: Option<Magnetising>,
    /// Parts that hold the states.
    pub state_names: Vec<String>,
    /// Names of the inputs.
    pub input_names: Vec<String>,
    /// Their values at the condition; a load of constant power is its tangent.
    pub inputs: DVector<f64>,
    /// What the outputs are.
    pub rows: SwitchingRows,
    /// Whether the rectifier stops reverse current.
    pub blocks: bool,
    /// How several phases hang together: the equations are then those of a share of the period.
    pub interleaved: Option<Interleaved>,
}

impl Stage {
    /// The equations of the intervals as the conduction mode at a condition has them; it matters to a leakage inductance alone.
    fn intervals_in_mode(&self, condition: &StageCondition) -> Result<Intervals, CircuitError> {
        match self.intervals_from_rest(condition) {
            Some(from_rest) if self.solve(condition).is_ok_and(|solution| solution.pulse.is_some()) => from_rest,
            _ => self.intervals(condition),
        }
    }

    /// The equations of the switching intervals at a condition.
    ///
    /// # Errors
    /// A finding for a netlist without state equations, and for several phases that are not followed.
    pub fn switching(&self, condition: &StageCondition) -> Result<SwitchingEquations, Finding> {
        if let Some(drawn) = &self.phases_drawn {
            return self.interleaved(drawn, condition);
        }
        let intervals = self.intervals_in_mode(condition).map_err(|e| circuit_finding(&e))?;
        let magnetising = self.magnetising(&intervals);
        let Intervals { on, off, cell, sets, inputs, .. } = intervals;
        let named = |name: &'static str| {
            let missing = || Finding::problem("stage", format!("The stage has no part called {name}."));
            self.rows.switch(name).ok_or_else(missing)
        };
        Ok(SwitchingEquations {
            conducting: on,
            freewheeling: off,
            rest: cell.rest,
            resting: cell.idle,
            sensed_current: &cell.c * cell.sense,
            switched_current: cell.c,
            magnetising,
            state_names: self.state_names().to_vec(),
            input_names: [INPUT_VOLTAGE, LOAD_CURRENT, DIODE_DROP].map(str::to_owned).to_vec(),
            inputs,
            rows: public_rows(&self.rows, named(sets.switch)?, named(sets.rectifier)?),
            blocks: self.rectifier.blocks(),
            interleaved: None,
        })
    }
}

impl Stage {
    /// The magnetising current, from the ramp that averages it: a share κ of its slope, 1 where the core is reset every period. From
    /// m0 = turn·(m0 + Δ) and κ·Δ = m0 + Δ follows turn = 1 − 1/κ.
    fn magnetising(&self, intervals: &Intervals) -> Option<Magnetising> {
        let share = self.topology().magnetising_ramp;
        intervals.natural.filter(|_| share > 0.0)?;
        let (by_states, by_inputs) = intervals.natural_rows();
        // Of switched current there, of the switch's own here.
        let whole = intervals.cell.sense / share;
        Some(Magnetising { slope: (by_states * whole, by_inputs * whole), turn: 1.0 - share.recip() })
    }
}

pub(super) fn public_rows(rows: &Rows, switch: SwitchRow, rectifier: SwitchRow) -> SwitchingRows {
    SwitchingRows {
        output_voltage: rows.output_voltage,
        load_voltage: rows.load_voltage,
        bank_voltage: rows.bank_voltage,
        switch_node: switch.node,
        switch_voltage: switch.voltage,
        rectifier_voltage: rectifier.voltage,
        input_current: rows.input_current,
        switch_current: switch.row,
        rectifier_current: rectifier.row,
        inductor_currents: rows.inductors.iter().map(|winding| winding.row).collect(),
        branch_currents: rows.branch_currents.clone(),
        filter_inductors: rows.filter_inductors.clone(),
    }
}
