//! Joining linear systems by state-space algebra.
//!
//! Every input of every part is a sum of wires from outputs and of external inputs. With the parts' matrices side by side in
//! block form, `u = K y + E w` closes into `u = (I − K D)⁻¹ (K C x + E w)`; the states stay those of the parts, in order.

use nalgebra::DMatrix;

use super::{LinearError, StateSpace};

/// A wire from an output of one part to an input of another (or the same) part; several wires into one input add up.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Wire<'a> {
    /// Place of the driving part in the list of parts.
    pub from_part: usize,
    /// Name of its output.
    pub output: &'a str,
    /// Place of the driven part in the list of parts.
    pub to_part: usize,
    /// Name of its input.
    pub input: &'a str,
    /// Factor on the way [input unit per output unit]; −1 for a negative feedback.
    pub gain: f64,
}

/// A port of the whole: an input or output of one part, seen from outside under a name.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Port<'a> {
    /// Name of the input or output of the whole. Inputs of one name drive all their ports; outputs of one name add up.
    pub name: &'a str,
    /// Place of the part in the list of parts.
    pub part: usize,
    /// Name of the part's input or output.
    pub port: &'a str,
}

impl StateSpace {
    /// The whole made of parts, wires between them, and ports to the outside.
    ///
    /// # Errors
    /// [`LinearError::UnknownPort`], [`LinearError::Shape`] for a part that is not in the list, [`LinearError::AlgebraicLoop`] when
    /// the direct paths close on themselves with unit gain, [`LinearError::NotFinite`].
    pub fn connect(
        parts: &[&Self],
        wires: &[Wire<'_>],
        inputs: &[Port<'_>],
        outputs: &[Port<'_>],
    ) -> Result<Self, LinearError> {
        let whole = Blocks::new(parts);
        let (input_count, output_count) = (whole.d.ncols(), whole.d.nrows());
        let mut k = DMatrix::zeros(input_count, output_count);
        for wire in wires {
            let row = whole.input(parts, wire.to_part, wire.input)?;
            let column = whole.output(parts, wire.from_part, wire.output)?;
            k[(row, column)] += wire.gain;
        }
        let (input_names, output_names) = (distinct(inputs), distinct(outputs));
        let mut e = DMatrix::zeros(input_count, input_names.len());
        for port in inputs {
            let row = whole.input(parts, port.part, port.port)?;
            let column = input_names.iter().position(|name| *name == port.name).unwrap_or(0);
            e[(row, column)] = 1.0;
        }
        let mut select = DMatrix::zeros(output_names.len(), output_count);
        for port in outputs {
            let row = output_names.iter().position(|name| *name == port.name).unwrap_or(0);
            select[(row, whole.output(parts, port.part, port.port)?)] = 1.0;
        }
        let closed = DMatrix::identity(input_count, input_count) - &k * &whole.d;
        let size = closed.amax();
        let lu = closed.full_piv_lu();
        let least = lu.u().diagonal().iter().fold(f64::INFINITY, |least: f64, pivot| least.min(pivot.abs()));
        // A pivot this small means a loop gain of one to the last digits: no realisable circuit, only rounding, differs from singular.
        if input_count > 0 && least <= size * f64::EPSILON {
            return Err(LinearError::AlgebraicLoop);
        }
        let feedback = lu.solve(&(&k * &whole.c)).ok_or(LinearError::AlgebraicLoop)?;
        let drive = lu.solve(&e).ok_or(LinearError::AlgebraicLoop)?;
        Self::new(
            &whole.a + &whole.b * &feedback,
            &whole.b * &drive,
            &select * (&whole.c + &whole.d * &feedback),
            &select * &whole.d * &drive,
            &input_names,
            &output_names,
        )
    }

    /// This system followed by `next`: its outputs drive the inputs of `next` in order.
    ///
    /// # Errors
    /// [`LinearError::Shape`] when the numbers of ports differ, [`LinearError::NotFinite`].
    pub fn series(&self, next: &Self) -> Result<Self, LinearError> {
        if self.outputs.len() != next.inputs.len() {
            return Err(LinearError::Shape(format!(
                "{} outputs drive {} inputs",
                self.outputs.len(),
                next.inputs.len()
            )));
        }
        let (n1, n2) = (self.order(), next.order());
        let mut a = DMatrix::zeros(n1 + n2, n1 + n2);
        a.view_mut((0, 0), (n1, n1)).copy_from(&self.a);
        a.view_mut((n1, 0), (n2, n1)).copy_from(&(&next.b * &self.c));
        a.view_mut((n1, n1), (n2, n2)).copy_from(&next.a);
        let mut b = DMatrix::zeros(n1 + n2, self.inputs.len());
        b.rows_mut(0, n1).copy_from(&self.b);
        b.rows_mut(n1, n2).copy_from(&(&next.b * &self.d));
        let mut c = DMatrix::zeros(next.outputs.len(), n1 + n2);
        c.columns_mut(0, n1).copy_from(&(&next.d * &self.c));
        c.columns_mut(n1, n2).copy_from(&next.c);
        Self::new(a, b, c, &next.d * &self.d, &names(&self.inputs), &names(&next.outputs))
    }

    /// The first output fed back to the first input with negative sign: from the reference to that output, `T/(1 + T)`.
    /// The remaining inputs and outputs stay.
    ///
    /// # Errors
    /// [`LinearError::Shape`] without an input or output, [`LinearError::AlgebraicLoop`], [`LinearError::NotFinite`].
    pub fn negative_feedback(&self) -> Result<Self, LinearError> {
        let (Some(input), Some(output)) = (self.inputs.first(), self.outputs.first()) else {
            return Err(LinearError::Shape("feedback needs an input and an output".to_owned()));
        };
        let wires = [Wire { from_part: 0, output, to_part: 0, input, gain: -1.0 }];
        let port = |name| Port { name, part: 0, port: name };
        let inputs: Vec<_> = self.inputs.iter().map(|name| port(name.as_str())).collect();
        let outputs: Vec<_> = self.outputs.iter().map(|name| port(name.as_str())).collect();
        Self::connect(&[self], &wires, &inputs, &outputs)
    }
}

/// Names as string slices.
fn names(owned: &[String]) -> Vec<&str> {
    owned.iter().map(String::as_str).collect()
}

/// The names of ports, each once, in order of first use.
fn distinct<'a>(ports: &[Port<'a>]) -> Vec<&'a str> {
    let mut found = Vec::new();
    for port in ports {
        if !found.contains(&port.name) {
            found.push(port.name);
        }
    }
    found
}

/// The parts side by side, unconnected.
struct Blocks {
    a: DMatrix<f64>,
    b: DMatrix<f64>,
    c: DMatrix<f64>,
    d: DMatrix<f64>,
    first_input: Vec<usize>,
    first_output: Vec<usize>,
}

impl Blocks {
    fn new(parts: &[&StateSpace]) -> Self {
        let total = |count: &dyn Fn(&StateSpace) -> usize| parts.iter().map(|part| count(part)).sum::<usize>();
        let (n, m, p) = (total(&StateSpace::order), total(&|s| s.inputs.len()), total(&|s| s.outputs.len()));
        let mut blocks = Self {
            a: DMatrix::zeros(n, n),
            b: DMatrix::zeros(n, m),
            c: DMatrix::zeros(p, n),
            d: DMatrix::zeros(p, m),
            first_input: Vec::with_capacity(parts.len()),
            first_output: Vec::with_capacity(parts.len()),
        };
        let (mut state, mut input, mut output) = (0, 0, 0);
        for part in parts {
            blocks.a.view_mut((state, state), part.a.shape()).copy_from(&part.a);
            blocks.b.view_mut((state, input), part.b.shape()).copy_from(&part.b);
            blocks.c.view_mut((output, state), part.c.shape()).copy_from(&part.c);
            blocks.d.view_mut((output, input), part.d.shape()).copy_from(&part.d);
            blocks.first_input.push(input);
            blocks.first_output.push(output);
            state += part.order();
            input += part.inputs.len();
            output += part.outputs.len();
        }
        blocks
    }

    /// Place of a part's input among all inputs.
    fn input(&self, parts: &[&StateSpace], part: usize, name: &str) -> Result<usize, LinearError> {
        Ok(self.first_input.get(part).ok_or_else(|| no_part(part))?
            + parts.get(part).ok_or_else(|| no_part(part))?.need_input(name)?)
    }

    /// Place of a part's output among all outputs.
    fn output(&self, parts: &[&StateSpace], part: usize, name: &str) -> Result<usize, LinearError> {
        Ok(self.first_output.get(part).ok_or_else(|| no_part(part))?
            + parts.get(part).ok_or_else(|| no_part(part))?.need_output(name)?)
    }
}

fn no_part(part: usize) -> LinearError {
    LinearError::Shape(format!("there is no part {part}"))
}

#[cfg(test)]
mod tests {
    use super::super::precision::{assert_close, assert_complex_close};
    use super::super::{Complex, Zpk};
    use super::*;

    fn lag(gain: f64, corner: f64) -> StateSpace {
        Zpk::new(vec![], vec![Complex::new(-corner, 0.0)], gain * corner).unwrap().cascade().unwrap()
    }

    /// Definition: the closed loop of two lags and a direct path against the algebra of complex numbers.
    #[test]
    fn a_loop_with_a_disturbance() {
        let (plant, controller) = (lag(5.0, 100.0), Zpk::from_corners_hz(3.0, &[7.0], &[900.0], 1).cascade().unwrap());
        let system = StateSpace::connect(
            &[&plant, &controller],
            &[
                Wire { from_part: 0, output: "y", to_part: 1, input: "u", gain: -2.0 },
                Wire { from_part: 1, output: "y", to_part: 0, input: "u", gain: 1.0 },
            ],
            &[Port { name: "reference", part: 1, port: "u" }, Port { name: "disturbance", part: 0, port: "u" }],
            &[Port { name: "out", part: 0, port: "y" }, Port { name: "control", part: 1, port: "y" }],
        )
        .unwrap();
        assert_eq!(system.order(), 3);
        for w in [0.3, 20.0, 4e3] {
            let s = Complex::new(0.0, w);
            let (p, c) = (plant.entry_at(0, 0, s).unwrap(), controller.entry_at(0, 0, s).unwrap());
            let back = 1.0 / (1.0 + 2.0 * p * c);
            assert_complex_close(system.entry_at(0, 0, s).unwrap(), p * c * back, 1e-12);
            assert_complex_close(system.entry_at(0, 1, s).unwrap(), p * back, 1e-12);
            assert_complex_close(system.entry_at(1, 1, s).unwrap(), -2.0 * p * c * back, 1e-12);
            assert_complex_close(system.at_hz(w / std::f64::consts::TAU).unwrap()[(1, 0)], c * back, 1e-12);
        }
        assert_close(system.dc_gain(0, 0).unwrap(), 0.5, 1e-12);
        assert_eq!(system.subsystem(&["control"], &["disturbance"]).unwrap().outputs, ["control"]);
    }

    #[test]
    fn series_is_the_product() {
        let (p, q) = (lag(2.0, 10.0), lag(-3.0, 1e4));
        let both = p.series(&q).unwrap();
        let s = Complex::new(0.0, 55.0);
        assert_complex_close(
            both.entry_at(0, 0, s).unwrap(),
            p.entry_at(0, 0, s).unwrap() * q.entry_at(0, 0, s).unwrap(),
            1e-13,
        );
        let closed = both.negative_feedback().unwrap();
        let t = both.entry_at(0, 0, s).unwrap();
        assert_complex_close(closed.entry_at(0, 0, s).unwrap(), t / (1.0 + t), 1e-13);
    }

    #[test]
    fn impossible_connections_are_errors() {
        let direct = StateSpace::constant(DMatrix::from_element(1, 1, -1.0), &["u"], &["y"]).unwrap();
        assert_eq!(direct.negative_feedback(), Err(LinearError::AlgebraicLoop));
        let wire = Wire { from_part: 0, output: "y", to_part: 0, input: "nothing", gain: 1.0 };
        assert_eq!(
            StateSpace::connect(&[&direct], &[wire], &[], &[]),
            Err(LinearError::UnknownPort("nothing".to_owned()))
        );
        let wire = Wire { from_part: 3, output: "y", to_part: 0, input: "u", gain: 1.0 };
        assert!(matches!(StateSpace::connect(&[&direct], &[wire], &[], &[]), Err(LinearError::Shape(_))));
        assert!(direct.series(&StateSpace::constant(DMatrix::zeros(1, 2), &["a", "b"], &["y"]).unwrap()).is_err());
    }
}
