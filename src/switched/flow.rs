//! What a phase makes of the state it begins with: exact, by one exponential of an augmented matrix.
//!
//! *Conventions*: inputs hold still over the phase. x(end) = `map`·x + `push`, d x(end)/d control = `control`; the integral of a probe
//! over the phase is `read`·x + `read_push`. *Source*: Van Loan, IEEE Trans. Automatic Control 23 (1978), 395 (from memory).

use super::system::Piece;
use crate::linear::{LinearError, expm};
use nalgebra::{DMatrix, DVector, RowDVector};

/// The exact map of a phase.
#[derive(Clone, Debug)]
pub(super) struct Flow {
    pub(super) map: DMatrix<f64>,
    pub(super) push: DVector<f64>,
}

/// The same with the answer to one input and the integral of one probe.
#[derive(Clone, Debug)]
pub(super) struct ReadFlow {
    pub(super) flow: Flow,
    /// End state from the input.
    pub(super) control: DVector<f64>,
    /// Integral from the states at the start.
    pub(super) read: RowDVector<f64>,
    /// Integral from the steady inputs.
    pub(super) read_push: f64,
    /// Integral from the input.
    pub(super) read_control: f64,
}

impl Flow {
    /// The map of a piece under steady inputs over a time [s].
    ///
    /// # Errors
    /// As [`expm`].
    pub(super) fn new(piece: &Piece, inputs: &DVector<f64>, length_s: f64) -> Result<Self, LinearError> {
        let n = piece.a.nrows();
        if length_s == 0.0 {
            return Ok(Flow { map: DMatrix::identity(n, n), push: DVector::zeros(n) });
        }
        let mut m = DMatrix::zeros(n + 1, n + 1);
        m.view_mut((0, 0), (n, n)).copy_from(&piece.a);
        m.view_mut((0, n), (n, 1)).copy_from(&(&piece.b * inputs));
        m *= length_s;
        let e = expm(&m)?;
        Ok(Flow { map: e.view((0, 0), (n, n)).into(), push: e.view((0, n), (n, 1)).column(0).into() })
    }

    /// The state at the end.
    pub(super) fn end(&self, start: &DVector<f64>) -> DVector<f64> {
        &self.map * start + &self.push
    }
}

impl ReadFlow {
    /// The map with the answer to input `column` and the integral of probe `row`.
    ///
    /// # Errors
    /// As [`expm`].
    pub(super) fn new(
        piece: &Piece,
        inputs: &DVector<f64>,
        length_s: f64,
        (row, column): (usize, usize),
    ) -> Result<Self, LinearError> {
        let n = piece.a.nrows();
        let mut m = DMatrix::zeros(n + 3, n + 3);
        m.view_mut((0, 0), (n, n)).copy_from(&piece.a);
        m.view_mut((0, n), (n, 1)).copy_from(&(&piece.b * inputs));
        m.view_mut((0, n + 1), (n, 1)).copy_from(&piece.b.column(column));
        m.view_mut((n + 2, 0), (1, n)).copy_from(&piece.c.row(row));
        m[(n + 2, n)] = (piece.d.row(row) * inputs)[0];
        m[(n + 2, n + 1)] = piece.d[(row, column)];
        m *= length_s;
        let e = expm(&m)?;
        Ok(ReadFlow {
            flow: Flow { map: e.view((0, 0), (n, n)).into(), push: e.view((0, n), (n, 1)).column(0).into() },
            control: e.view((0, n + 1), (n, 1)).column(0).into(),
            read: e.view((n + 2, 0), (1, n)).row(0).into(),
            read_push: e[(n + 2, n)],
            read_control: e[(n + 2, n + 1)],
        })
    }
}

impl Piece {
    /// Rates of the states.
    pub(super) fn rates(&self, x: &DVector<f64>, inputs: &DVector<f64>) -> DVector<f64> {
        &self.a * x + &self.b * inputs
    }

    /// Value of a probe.
    pub(super) fn value(&self, row: usize, x: &DVector<f64>, inputs: &DVector<f64>) -> f64 {
        let by_states: f64 = self.c.row(row).iter().zip(x.iter()).map(|(c, x)| c * x).sum();
        let by_inputs: f64 = self.d.row(row).iter().zip(inputs.iter()).map(|(d, u)| d * u).sum();
        by_states + by_inputs
    }
}
