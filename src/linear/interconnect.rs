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
