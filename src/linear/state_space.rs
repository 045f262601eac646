//! Linear systems in state space, with named inputs and outputs.
//!
//! Conventions: `x' = A x + B u`, `y = C x + D u`; SI units, seconds; frequencies at the interface in hertz.

use std::f64::consts::TAU;

use nalgebra::DMatrix;

use super::{Complex, LinearError, eigenvalues};

/// A linear time-invariant system with named inputs and outputs.
#[derive(Clone, Debug, PartialEq)]
pub struct StateSpace {
    /// State matrix, n × n [1/s between states of one unit].
    pub a: DMatrix<f64>,
    /// Input matrix, n × inputs.
    pub b: DMatrix<f64>,
    /// Output matrix, outputs × n.
    pub c: DMatrix<f64>,
    /// Direct path, outputs × inputs.
    pub d: DMatrix<f64>,
    /// Names of the inputs, in the order of the columns of `b`.
    pub inputs: Vec<String>,
    /// Names of the outputs, in the order of the rows of `c`.
    pub outputs: Vec<String>,
}

impl StateSpace {
    /// A system from its matrices and names.
    ///
    /// # Errors
    /// [`LinearError::Shape`] when matrices and names do not fit, [`LinearError::NotFinite`].
    pub fn new(
        a: DMatrix<f64>,
        b: DMatrix<f64>,
        c: DMatrix<f64>,
        d: DMatrix<f64>,
        inputs: &[&str],
        outputs: &[&str],
    ) -> Result<Self, LinearError> {
        let (n, m, p) = (a.nrows(), inputs.len(), outputs.len());
        for (matrix, rows, columns, name) in [(&a, n, n, "A"), (&b, n, m, "B"), (&c, p, n, "C"), (&d, p, m, "D")] {
            if matrix.shape() != (rows, columns) {
                return Err(LinearError::Shape(format!(
                    "{name} is {} × {} where {rows} × {columns} is needed",
                    matrix.nrows(),
                    matrix.ncols()
                )));
            }
            if matrix.iter().any(|x| !x.is_finite()) {
                return Err(LinearError::NotFinite);
            }
        }
        let owned = |names: &[&str]| names.iter().map(|&name| name.to_owned()).collect();
        Ok(Self { a, b, c, d, inputs: owned(inputs), outputs: owned(outputs) })
    }

    /// A system without states: `y = D u`.
    ///
    /// # Errors
    /// [`LinearError::Shape`] when matrix and names do not fit, [`LinearError::NotFinite`].
    pub fn constant(d: DMatrix<f64>, inputs: &[&str], outputs: &[&str]) -> Result<Self, LinearError> {
        let (p, m) = d.shape();
        Self::new(DMatrix::zeros(0, 0), DMatrix::zeros(0, m), DMatrix::zeros(p, 0), d, inputs, outputs)
    }

    /// Number of states.
    pub fn order(&self) -> usize {
        self.a.nrows()
    }

    /// Place of the input of that name.
    pub fn input(&self, name: &str) -> Option<usize> {
        self.inputs.iter().position(|n| n == name)
    }

    /// Place of the output of that name.
    pub fn output(&self, name: &str) -> Option<usize> {
        self.outputs.iter().position(|n| n == name)
    }

    /// Place of the input of that name.
    ///
    /// # Errors
    /// [`LinearError::UnknownPort`].
    pub fn need_input(&self, name: &str) -> Result<usize, LinearError> {
        self.input(name).ok_or_else(|| LinearError::UnknownPort(name.to_owned()))
    }

    /// Place of the output of that name.
    ///
    /// # Errors
    /// [`LinearError::UnknownPort`].
    pub fn need_output(&self, name: &str) -> Result<usize, LinearError> {
        self.output(name).ok_or_else(|| LinearError::UnknownPort(name.to_owned()))
    }

    /// Poles [rad/s], sorted by rising magnitude, conjugate pairs adjacent and exact.
    ///
    /// # Errors
    /// [`LinearError::NotFinite`], [`LinearError::NoConvergence`].
    pub fn poles(&self) -> Result<Vec<Complex>, LinearError> {
        eigenvalues(&self.a)
    }

    /// The transfer matrix, outputs × inputs, at a frequency [Hz].
    ///
    /// # Errors
    /// [`LinearError::PoleThere`] on an undamped pole, [`LinearError::NotFinite`].
    pub fn at_hz(&self, f_hz: f64) -> Result<DMatrix<Complex>, LinearError> {
        let s = Complex::new(0.0, TAU * f_hz);
        if !s.im.is_finite() {
            return Err(LinearError::NotFinite);
        }
        let lift = |m: &DMatrix<f64>| m.map(|x| Complex::new(x, 0.0));
        let states = self.resolvent(s).lu().solve(&lift(&self.b)).ok_or(LinearError::PoleThere)?;
        finite_matrix(lift(&self.c) * states + lift(&self.d))
    }

    /// One entry of the transfer matrix at a complex frequency [rad/s]; `None` on a pole or for a port that does not exist.
    pub fn entry_at(&self, output: usize, input: usize, s: Complex) -> Option<Complex> {
        if output >= self.outputs.len() || input >= self.inputs.len() {
            return None;
        }
        let column = self.b.column(input).map(|x| Complex::new(x, 0.0));
        let states = self.resolvent(s).lu().solve(&column)?;
        let sum: Complex = self.c.row(output).iter().zip(states.iter()).map(|(c, x)| x * *c).sum();
        let value = sum + self.d[(output, input)];
        (value.re.is_finite() && value.im.is_finite()).then_some(value)
    }

    /// `sI − A`.
    fn resolvent(&self, s: Complex) -> DMatrix<Complex> {
        let mut m = self.a.map(|x| Complex::new(-x, 0.0));
        for i in 0..m.nrows() {
            m[(i, i)] += s;
        }
        m
    }

    /// Gain of one entry at zero frequency; `None` with a pole at the origin or for a port that does not exist.
    pub fn dc_gain(&self, output: usize, input: usize) -> Option<f64> {
        if output >= self.outputs.len() || input >= self.inputs.len() {
            return None;
        }
        let states = self.a.clone().lu().solve(&self.b.column(input))?;
        let gain =
            self.d[(output, input)] - self.c.row(output).iter().zip(states.iter()).map(|(c, x)| c * x).sum::<f64>();
        gain.is_finite().then_some(gain)
    }

    /// The same states seen through some of the outputs and driven by some of the inputs, in the order asked for.
    ///
    /// # Errors
    /// [`LinearError::UnknownPort`].
    pub fn subsystem(&self, outputs: &[&str], inputs: &[&str]) -> Result<Self, LinearError> {
        let rows = outputs.iter().map(|name| self.need_output(name)).collect::<Result<Vec<_>, _>>()?;
        let columns = inputs.iter().map(|name| self.need_input(name)).collect::<Result<Vec<_>, _>>()?;
        Self::new(
            self.a.clone(),
            self.b.select_columns(&columns),
            self.c.select_rows(&rows),
            self.d.select_columns(&columns).select_rows(&rows),
            inputs,
            outputs,
        )
    }
}

/// Passes a matrix on when all of it is finite.
fn finite_matrix(m: DMatrix<Complex>) -> Result<DMatrix<Complex>, LinearError> {
    if m.iter().all(|x| x.re.is_finite() && x.im.is_finite()) { Ok(m) } else { Err(LinearError::NotFinite) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn shapes_and_numbers_are_checked() {
        let square = |x| DMatrix::from_element(1, 1, x);
        assert!(StateSpace::new(square(-1.0), square(1.0), square(1.0), square(0.0), &["u"], &["y"]).is_ok());
        assert!(matches!(
            StateSpace::new(square(-1.0), square(1.0), square(1.0), square(0.0), &["u", "v"], &["y"]),
            Err(LinearError::Shape(_))
        ));
        assert_eq!(
            StateSpace::new(square(f64::INFINITY), square(1.0), square(1.0), square(0.0), &["u"], &["y"]),
            Err(LinearError::NotFinite)
        );
    }

    #[test]
    fn a_pole_where_it_is_evaluated_is_an_error() {
        let one = DMatrix::from_element(1, 1, 1.0);
        let integrator =
            StateSpace::new(DMatrix::zeros(1, 1), one.clone(), one, DMatrix::zeros(1, 1), &["u"], &["y"]).unwrap();
        assert_eq!(integrator.at_hz(0.0), Err(LinearError::PoleThere));
        assert_eq!(integrator.dc_gain(0, 0), None);
        assert_eq!(integrator.entry_at(0, 0, Complex::ZERO), None);
        assert_eq!(integrator.entry_at(1, 0, Complex::ONE), None);
        assert_eq!(integrator.at_hz(f64::NAN), Err(LinearError::NotFinite));
        assert_eq!((integrator.input("u"), integrator.output("u")), (Some(0), None));
    }
}
