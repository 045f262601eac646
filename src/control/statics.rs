//! A law without states of its own: the duty ratio follows control voltage, states and inputs at once.

use super::law::CONTROL;
use crate::converter::signals::{INPUT_VOLTAGE, LOAD_CURRENT};
use crate::linear::{LinearError, StateSpace};
use nalgebra::{DMatrix, RowDVector};

/// d = states + control + inputs.
#[derive(Clone, Debug)]
pub(super) struct StaticLaw {
    /// Duty ratio from the stage's states; none for a law that does not look at them.
    pub(super) states: Option<RowDVector<f64>>,
    /// Duty ratio from control voltage [1/V].
    pub(super) control: f64,
    /// Duty ratio from input voltage [1/V] and load current [1/A].
    pub(super) inputs: [f64; 2],
}

impl StaticLaw {
    /// The stage with this law in place of its duty ratio.
    ///
    /// # Errors
    /// [`LinearError::NotFinite`].
    pub(super) fn close(&self, stage: &StateSpace) -> Result<StateSpace, LinearError> {
        let (mut a, mut c) = (stage.a.clone(), stage.c.clone());
        if let Some(row) = &self.states {
            a += stage.b.column(0) * row;
            c += stage.d.column(0) * row;
        }
        let driven = |m: &DMatrix<f64>| {
            DMatrix::from_fn(m.nrows(), 3, |r, k| match k {
                0 => m[(r, 0)] * self.control,
                _ => m[(r, k)] + m[(r, 0)] * self.inputs[k - 1],
            })
        };
        let outputs: Vec<&str> = stage.outputs.iter().map(String::as_str).collect();
        StateSpace::new(a, driven(&stage.b), c, driven(&stage.d), &[CONTROL, INPUT_VOLTAGE, LOAD_CURRENT], &outputs)
    }
}
