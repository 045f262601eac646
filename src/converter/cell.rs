//! The switched cell: what comes to rest when switch and rectifier both block.
//!
//! *Method*: with both open the netlist ties its inductor currents together; its equations come with a projector P of
//! one rank less, I − P = v·c, c·v = 1. The switched current s = c·x is what stops: the inductor's current, or the sum of
//! both in a stage of two inductors. It is scaled to be the rectifier's current while that conducts.
//! *Conventions*: x = P·x + v·s; P·x does not see the switches' ripple.

use super::drawing::RECTIFIER;
use crate::circuit::{CircuitError, StateEquations};
use nalgebra::{DMatrix, DVector, RowDVector};

/// The interval in which neither switch nor rectifier conducts, and the current that rests in it.
#[derive(Clone, Debug)]
pub(super) struct SwitchedCell {
    /// State equations while both block.
    pub(super) idle: StateEquations,
    /// Switched current from states.
    pub(super) c: RowDVector<f64>,
    /// States that go with one ampere of switched current.
    pub(super) v: DVector<f64>,
    /// States without their switched current.
    pub(super) rest: DMatrix<f64>,
    /// Current of the controlled switch per ampere of switched current, while it conducts: the turns ratio of a stage with a
    /// transformer, 1 without.
    pub(super) sense: f64,
}

/// A projector of another rank than expected shows as a remainder of the order of one.
const RANK_TOLERANCE: f64 = 1e-9;

impl SwitchedCell {
    /// Reads the cell off the equations with both open, over the same states as those of the other intervals, which come with
    /// the row of the switch's and of the rectifier's current.
    ///
    /// # Errors
    /// When the rectifier's opening does not stop exactly one current.
    pub(super) fn new(
        idle: StateEquations,
        (on, switch_row): (&StateEquations, usize),
        (off, rectifier_row): (&StateEquations, usize),
    ) -> Result<Self, CircuitError> {
        let unfit = || CircuitError::Floating { names: vec![format!("the current that stops with the {RECTIFIER}")] };
        let n = off.a.nrows();
        let rest = idle.projector.clone().ok_or_else(unfit)?;
        let stopped = DMatrix::identity(n, n) - &rest;
        let (row, column) = stopped.iamax_full();
        let scale = stopped[(row, column)];
        let v: DVector<f64> = stopped.column(column).into();
        let c: RowDVector<f64> = stopped.row(row) / scale;
        let flow = off.c.row(rectifier_row).dot(&v.transpose());
        if (&v * &c - &stopped).amax() > RANK_TOLERANCE * scale.abs() || flow.abs() <= RANK_TOLERANCE {
            return Err(unfit());
        }
        let v = v / flow;
        let sense = on.c.row(switch_row).dot(&v.transpose());
        Ok(SwitchedCell { idle, c: c * flow, v, rest, sense })
    }
}
