//! Zeros from one input to one output.
//!
//! The output is held at zero: as long as the direct path vanishes, that fixes one combination of the states for good, and its
//! rate of change is the new output. Each round is one orthogonal reflection and removes one state; it ends when the direct
//! path is not zero, and the zeros are the eigenvalues of `A − B D⁻¹ C` of what is left.
//!
//! Source: Emami-Naeini and Van Dooren, Automatica 18 (1982), 415, for one input and one output (from memory).
//!
//! Valid for: any single entry. States that the input cannot reach, or that never reach the output, by structure, are left out
//! beforehand: they change nothing and would only add pairs of a pole and the same zero.

use nalgebra::{DMatrix, DVector};

use super::eigen::{balance, eigenvalues, reachability};
use super::{Complex, LinearError, StateSpace};

/// A direct path below this multiple of n·ε times the input matrix is rounding, not a path.
const ROUNDING_SLACK: f64 = 32.0;

/// One entry of a system, reduced to the states that matter to it.
pub(super) struct Entry {
    pub(super) a: DMatrix<f64>,
    pub(super) b: DVector<f64>,
    pub(super) c: DVector<f64>,
    pub(super) d: f64,
}

impl Entry {
    /// The entry from one input to one output without the states that are idle for it by structure.
    ///
    /// # Errors
    /// [`LinearError::UnknownPort`] for a port that does not exist.
    pub(super) fn new(system: &StateSpace, output: usize, input: usize) -> Result<Self, LinearError> {
        if output >= system.outputs.len() || input >= system.inputs.len() {
            return Err(LinearError::UnknownPort(format!("output {output}, input {input}")));
        }
        let (b, c) = (system.b.column(input), system.c.row(output));
        let used = used_states(&system.a, &b.into_owned(), &c.transpose());
        Ok(Self {
            a: DMatrix::from_fn(used.len(), used.len(), |i, j| system.a[(used[i], used[j])]),
            b: DVector::from_iterator(used.len(), used.iter().map(|&i| b[i])),
            c: DVector::from_iterator(used.len(), used.iter().map(|&i| c[i])),
            d: system.d[(output, input)],
        })
    }

    /// Value at a complex frequency [rad/s]; `None` on a pole.
    pub(super) fn at(&self, s: Complex) -> Option<Complex> {
        let mut resolvent = self.a.map(|x| Complex::new(-x, 0.0));
        for i in 0..resolvent.nrows() {
            resolvent[(i, i)] += s;
        }
        let states = resolvent.lu().solve(&self.b.map(|x| Complex::new(x, 0.0)))?;
        Some(self.c.iter().zip(states.iter()).map(|(c, x)| x * *c).sum::<Complex>() + self.d)
    }

    /// Zeros [rad/s]; `None` when the output does not answer to the input at all.
    ///
    /// # Errors
    /// [`LinearError::NotFinite`], [`LinearError::NoConvergence`].
    pub(super) fn zeros(&self) -> Result<Option<Vec<Complex>>, LinearError> {
        let (mut a, mut b, mut c, mut d) = self.balanced();
        let rounding = ROUNDING_SLACK * f64::EPSILON * (a.nrows() as f64 + 1.0);
        let (input_size, state_size) = (b.norm().max(f64::MIN_POSITIVE), a.norm());
        let mut direct_floor = 0.0;
        let mut output_floor = 0.0;
        while d.abs() <= direct_floor {
            let n = a.nrows();
            let length = c.norm();
            if n == 0 || length <= output_floor {
                return Ok(None);
            }
            reflect_to_last(&mut a, &mut b, &c);
            let rate = a.row(n - 1).columns(0, n - 1).transpose();
            d = b[n - 1];
            a = a.remove_row(n - 1).remove_column(n - 1);
            b = b.remove_row(n - 1);
            c = rate;
            direct_floor = rounding * input_size;
            output_floor = rounding * state_size;
        }
        let feedback = &b * c.transpose() / d;
        eigenvalues(&(a - feedback)).map(Some)
    }

    /// The entry with its states scaled so that rows and columns of `[A B; C D]` are alike.
    fn balanced(&self) -> (DMatrix<f64>, DVector<f64>, DVector<f64>, f64) {
        let n = self.a.nrows();
        let mut m = DMatrix::zeros(n + 1, n + 1);
        m.view_mut((0, 0), (n, n)).copy_from(&self.a);
        m.view_mut((0, n), (n, 1)).copy_from(&self.b);
        m.view_mut((n, 0), (1, n)).copy_from(&self.c.transpose());
        balance(&mut m);
        (
            m.view((0, 0), (n, n)).into_owned(),
            m.view((0, n), (n, 1)).column(0).into_owned(),
            m.view((n, 0), (1, n)).row(0).transpose(),
            self.d,
        )
    }
}

/// States that the input reaches and that reach the output, through the non-zero pattern.
fn used_states(a: &DMatrix<f64>, b: &DVector<f64>, c: &DVector<f64>) -> Vec<usize> {
    let n = a.nrows();
    if n > 64 {
        return (0..n).collect();
    }
    let drivers = reachability(a);
    let driven_by_input = (0..n).filter(|&i| b[i] != 0.0).fold(0_u64, |set, i| set | 1 << i);
    let seen_by_output = (0..n).filter(|&i| c[i] != 0.0).fold(0_u64, |set, i| set | 1 << i | drivers[i]);
    (0..n)
        .filter(|&i| {
            seen_by_output >> i & 1 == 1 && (driven_by_input >> i & 1 == 1 || drivers[i] & driven_by_input != 0)
        })
        .collect()
}

/// Turns the coordinates so that the output row points along the last one.
fn reflect_to_last(a: &mut DMatrix<f64>, b: &mut DVector<f64>, c: &DVector<f64>) {
    let last = a.nrows() - 1;
    if c.iter().take(last).all(|x| *x == 0.0) {
        return;
    }
    // An output that is a single state only needs two coordinates exchanged, which costs no rounding.
    let mut nonzero = c.iter().enumerate().filter(|(_, x)| **x != 0.0).map(|(i, _)| i);
    if let (Some(only), None) = (nonzero.next(), nonzero.next()) {
        a.swap_rows(only, last);
        a.swap_columns(only, last);
        b.swap_rows(only, last);
        return;
    }
    let scale = c.amax();
    let mut v = c / scale;
    v[last] += v.norm().copysign(v[last]);
    let beta = 2.0 / v.norm_squared();
    let row = a.tr_mul(&v) * beta;
    a.ger(-1.0, &v, &row, 1.0);
    let column = &*a * &v * beta;
    a.ger(-1.0, &column, &v, 1.0);
    b.axpy(-beta * v.dot(b), &v, 1.0);
}
