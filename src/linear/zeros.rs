//! Zeros from one input to one output.
//!
//! The output is held at zero: as long as the direct path vanishes, that fixes one combination of the states for good, and its
//! rate of change is the new output. Each round is one orthogonal reflection and removes one state; it ends when the direct
//! path is not zero, and the zeros are the eigenvalues of `A − B D⁻¹ C` of what is left.
//!
//! Whether a direct path vanishes is decided against the rounding it carries, which is followed entry by entry: a weak path between
//! strong modes is kept, a residue of rounding is not taken for a path.
//!
//! Source: Emami-Naeini and Van Dooren, Automatica 18 (1982), 415, for one input and one output (from memory).
//!
//! Valid for: any single entry. States that the input cannot reach, or that never reach the output, by structure, are left out
//! beforehand: they change nothing and would only add pairs of a pole and the same zero.

use nalgebra::{DMatrix, DVector};

use super::eigen::{balance, eigenvalues, reachability};
use super::{Complex, LinearError, StateSpace};

/// A path below this multiple of the rounding it carries is none.
const ROUNDING_SLACK: f64 = 16.0;

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
        let (a, b, c, mut d) = self.balanced();
        let mut left = Reduction { noise_a: a.abs() * f64::EPSILON, noise_b: b.abs() * f64::EPSILON, a, b };
        let mut noise_c = c.abs() * f64::EPSILON;
        let mut c = c;
        let mut noise_d = 0.0;
        while d.abs() <= ROUNDING_SLACK * noise_d {
            if c.iter().zip(&noise_c).all(|(c, noise)| c.abs() <= ROUNDING_SLACK * noise) {
                return Ok(None);
            }
            ((d, noise_d), (c, noise_c)) = left.hold_output(&c, &noise_c);
        }
        let feedback = &left.b * c.transpose() / d;
        eigenvalues(&(left.a - feedback)).map(Some)
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

/// What is left of state and input matrix, with a bound on the rounding in each entry.
struct Reduction {
    a: DMatrix<f64>,
    b: DVector<f64>,
    noise_a: DMatrix<f64>,
    noise_b: DVector<f64>,
}

/// A direct path and an output row, each with its rounding.
type Held = ((f64, f64), (DVector<f64>, DVector<f64>));

impl Reduction {
    /// Holds the output at zero: removes the combination of states that it shows, and returns that combination's rate as new output.
    fn hold_output(&mut self, c: &DVector<f64>, noise_c: &DVector<f64>) -> Held {
        let last = self.a.nrows() - 1;
        let length = c.norm();
        let carried: f64 = (0..=last)
            .map(|i| {
                noise_c[i] * self.b[i].abs() + c[i].abs() * (self.noise_b[i] + 2.0 * f64::EPSILON * self.b[i].abs())
            })
            .sum();
        // Taken from the rows as they are: turned first, a strong input elsewhere would leave its rounding here.
        let along = c.dot(&self.b) / length;
        let direct = (self.turn_to_last(c) * along, carried / length);
        let rate = self.a.row(last).columns(0, last).transpose();
        let noise = self.noise_a.row(last).columns(0, last).transpose();
        for m in [&mut self.a, &mut self.noise_a] {
            let reduced = m.view((0, 0), (last, last)).into_owned();
            *m = reduced;
        }
        for v in [&mut self.b, &mut self.noise_b] {
            let reduced = v.rows(0, last).into_owned();
            *v = reduced;
        }
        (direct, (rate, noise))
    }

    /// Turns the coordinates so that the output row points along the last one, and says in which sense, +1 or −1.
    fn turn_to_last(&mut self, c: &DVector<f64>) -> f64 {
        let last = self.a.nrows() - 1;
        // An output that is a single state only needs two coordinates exchanged, which costs no rounding.
        let mut nonzero = c.iter().enumerate().filter(|(_, x)| **x != 0.0).map(|(i, _)| i);
        if let (Some(only), None) = (nonzero.next(), nonzero.next()) {
            for m in [&mut self.a, &mut self.noise_a] {
                m.swap_rows(only, last);
                m.swap_columns(only, last);
            }
            self.b.swap_rows(only, last);
            self.noise_b.swap_rows(only, last);
            return c[only].signum();
        }
        let mut v = c / c.amax();
        let sense = -1.0_f64.copysign(v[last]);
        v[last] += v.norm().copysign(v[last]);
        let beta = 2.0 / v.norm_squared();
        let size = v.abs();
        let row = self.a.tr_mul(&v);
        self.noise_a += size.clone() * ((&self.noise_a + self.a.abs() * f64::EPSILON).tr_mul(&size) * beta).transpose();
        self.a.ger(-beta, &v, &row, 1.0);
        let column = &self.a * &v;
        self.noise_a += (&self.noise_a + self.a.abs() * f64::EPSILON) * &size * beta * size.transpose();
        self.a.ger(-beta, &column, &v, 1.0);
        self.noise_b += &size * (beta * size.dot(&(&self.noise_b + self.b.abs() * f64::EPSILON)));
        self.b.axpy(-beta * v.dot(&self.b), &v, 1.0);
        sense
    }
}
