//! State equations of a compiled netlist at one set of values.
//!
//! *Conventions*: x' = A·x + B·u, y = C·x + D·u, SI units, seconds. Where capacitor loops or inductor cut-sets tie
//! states together the constraint Kx·x + Ku·u = 0 holds and the matrices are projected onto it: A·P, C·P mean the same
//! on the constraint and something definite off it. A constraint that involves an input moves the state to
//! x − B1·u; outputs are unaffected, and one that would need the input's rate of change is refused.

use super::eliminate::{CircuitError, Compiled, Solved, Unknown};
use super::netlist::{Kind, Node, PartId, Probe};
use nalgebra::{DMatrix, DVector};

/// State equations of a netlist for one set of closed switches.
#[derive(Clone, Debug, PartialEq)]
pub struct StateEquations {
    /// States by states [1/s].
    pub a: DMatrix<f64>,
    /// States by inputs.
    pub b: DMatrix<f64>,
    /// Outputs by states.
    pub c: DMatrix<f64>,
    /// Outputs by inputs.
    pub d: DMatrix<f64>,
    /// Projection of the states onto the constraint; absent when all states are independent.
    pub projector: Option<DMatrix<f64>>,
}

impl StateEquations {
    /// The same equations over independent states only: keeps a subset of the states that determines the others.
    ///
    /// Returns the reduced equations and the matrix N with x = N·kept.
    pub fn independent(&self) -> (StateEquations, DMatrix<f64>) {
        let n = self.a.nrows();
        let Some(p) = &self.projector else {
            return (self.clone(), DMatrix::identity(n, n));
        };
        let (kept, basis) = independent_basis(p);
        let pick = DMatrix::from_fn(kept.len(), n, |i, j| f64::from(u8::from(kept[i] == j)));
        let reduced = StateEquations {
            a: &pick * &self.a * &basis,
            b: &pick * &self.b,
            c: &self.c * &basis,
            d: self.d.clone(),
            projector: None,
        };
        (reduced, basis)
    }

    /// These equations over the states another set of closed switches leaves independent; the projector goes with them.
    ///
    /// *Valid* where the constraints of `other` hold here too, as when only switches were opened that `other` has closed.
    #[must_use]
    pub fn over_states_of(&self, other: &StateEquations) -> StateEquations {
        let Some(p) = &other.projector else { return self.clone() };
        let (kept, basis) = independent_basis(p);
        StateEquations {
            a: self.a.select_rows(&kept) * &basis,
            b: self.b.select_rows(&kept),
            c: &self.c * &basis,
            d: self.d.clone(),
            projector: self.projector.as_ref().map(|own| own.select_rows(&kept) * &basis),
        }
    }
}

/// States that span the range of a projector, and the matrix that gives all states from them.
fn independent_basis(p: &DMatrix<f64>) -> (Vec<usize>, DMatrix<f64>) {
    let n = p.nrows();
    // Gauss–Jordan on the columns of P: a state is kept when its row still has something new to say.
    let mut columns = p.clone();
    let mut kept = Vec::new();
    let mut used = vec![false; n];
    for row in 0..n {
        let best =
            (0..n).filter(|c| !used[*c]).max_by(|a, b| columns[(row, *a)].abs().total_cmp(&columns[(row, *b)].abs()));
        let Some(c) = best.filter(|c| columns[(row, *c)].abs() > 1e-9) else { continue };
        used[c] = true;
        kept.push((row, c));
        let scale = columns[(row, c)].recip();
        columns.column_mut(c).scale_mut(scale);
        for other in (0..n).filter(|o| *o != c) {
            let factor = columns[(row, other)];
            if factor != 0.0 {
                let pivot: DVector<f64> = columns.column(c).into();
                columns.column_mut(other).axpy(-factor, &pivot, 1.0);
            }
        }
    }
    let basis = DMatrix::from_fn(n, kept.len(), |i, j| columns[(i, kept[j].1)]);
    (kept.iter().map(|(row, _)| *row).collect(), basis)
}

/// A linear combination of the tableau's columns: unknowns, states, inputs.
type Combination = Vec<(usize, f64)>;

impl Compiled {
    /// State equations at `values` (slot order, SI units).
    ///
    /// # Errors
    /// When a storage part has no usable value, the network is undetermined at these values, or a wanted output would
    /// follow the rate of change of an input; the error names the parts.
    pub fn equations(&self, values: &[f64]) -> Result<StateEquations, CircuitError> {
        if !self.fits(values) {
            return self.recompiled(values)?.equations_fitting(values);
        }
        self.equations_fitting(values)
    }

    fn equations_fitting(&self, values: &[f64]) -> Result<StateEquations, CircuitError> {
        let solved = self.solve(values);
        let (n, m) = (self.netlist.states.len(), self.netlist.inputs.len());
        let free = self.free_unknowns.len();
        let storage = self.storage_voltages_and_currents();
        let rates = self.rate_matrix(values)?;
        let (wx, wu, wf) = self.expand(&solved, &storage);
        let mut a = &rates * wx;
        let mut b = &rates * wu;
        let f = &rates * wf;
        let probes: Vec<Combination> =
            self.netlist.outputs.iter().map(|(_, probe)| self.probe(*probe, values)).collect();
        let (mut c, mut d, cf) = self.expand(&solved, &probes);
        let mut projector = None;
        if free > 0 {
            let rows = self.unknowns.len();
            let kx = DMatrix::from_fn(free, n, |i, j| solved.at(self.leftover_rows[i], rows + j));
            let ku = DMatrix::from_fn(free, m, |i, j| solved.at(self.leftover_rows[i], rows + n + j));
            let lu = (&kx * &f).lu();
            let unsolvable = || CircuitError::Degenerate { parts: self.constrained_parts(&kx) };
            let inverse = lu.try_inverse().ok_or_else(unsolvable)?;
            let gain = &inverse * &kx;
            let p = DMatrix::identity(n, n) - &f * &gain;
            // Free unknowns: z = −gain·(A0·x + B0·u) − inverse·Ku·u'.
            c -= &cf * &gain * &a;
            d -= &cf * &gain * &b;
            a = &p * &a;
            b = &p * &b;
            if ku.iter().any(|k| *k != 0.0) {
                let rate = -(&inverse * &ku);
                self.refuse_improper(&(&cf * &rate))?;
                // The state becomes x − B1·u; B1 lies off the constraint, so it meets A and C before they are projected.
                let b1 = &f * &rate;
                b += &a * &b1;
                d += &c * &b1;
            }
            a = &a * &p;
            c = &c * &p;
            projector = Some(p);
        }
        let finite = a.iter().chain(b.iter()).chain(c.iter()).chain(d.iter()).all(|v| v.is_finite());
        if !finite {
            return Err(CircuitError::Degenerate { parts: self.netlist.state_names().map(str::to_owned).collect() });
        }
        Ok(StateEquations { a, b, c, d, projector })
    }

    fn refuse_improper(&self, rate: &DMatrix<f64>) -> Result<(), CircuitError> {
        let outputs: Vec<String> = rate
            .row_iter()
            .zip(&self.netlist.outputs)
            .filter(|(row, _)| row.iter().any(|v| v.abs() > 1e-9 * rate.amax().max(f64::MIN_POSITIVE)))
            .map(|(_, (name, _))| name.clone())
            .collect();
        if outputs.is_empty() { Ok(()) } else { Err(CircuitError::Improper { outputs }) }
    }

    fn constrained_parts(&self, kx: &DMatrix<f64>) -> Vec<String> {
        let names = self.netlist.state_names();
        names.enumerate().filter(|(j, _)| kx.column(*j).iter().any(|k| *k != 0.0)).map(|(_, n)| n.to_owned()).collect()
    }

    /// What drives each state: a capacitor's current, an inductor's voltage.
    fn storage_voltages_and_currents(&self) -> Vec<Combination> {
        self.netlist
            .states
            .iter()
            .map(|&id| {
                let part = &self.netlist.parts[id.0];
                if matches!(part.kind, Kind::Capacitor { .. }) { self.current(id) } else { voltage(part.from, part.to) }
            })
            .collect()
    }

    /// Inverse of the storage matrix: 1/C and 1/L on the diagonal, inverted 2×2 blocks for coupled inductors.
    fn rate_matrix(&self, values: &[f64]) -> Result<DMatrix<f64>, CircuitError> {
        let n = self.netlist.states.len();
        let mut storage = DMatrix::zeros(n, n);
        for &id in &self.netlist.states {
            match self.netlist.parts[id.0].kind {
                Kind::Capacitor { farads: slot, state } | Kind::Inductor { henries: slot, state } => {
                    storage[(state, state)] = values[slot.0];
                }
                _ => {}
            }
        }
        let bad: Vec<String> = self
            .netlist
            .state_names()
            .enumerate()
            .filter(|(k, _)| storage[(*k, *k)] <= 0.0)
            .map(|(_, name)| name.to_owned())
            .collect();
        if !bad.is_empty() {
            return Err(CircuitError::Degenerate { parts: bad });
        }
        if self.netlist.couplings.is_empty() {
            return Ok(DMatrix::from_fn(n, n, |i, j| if i == j { 1.0 / storage[(i, i)] } else { 0.0 }));
        }
        for coupling in &self.netlist.couplings {
            let (i, j) = (self.state_of(coupling.first), self.state_of(coupling.second));
            let mutual = values[coupling.factor.0] * (storage[(i, i)] * storage[(j, j)]).sqrt();
            storage[(i, j)] += mutual;
            storage[(j, i)] += mutual;
        }
        let coupled = || {
            let ends = self.netlist.couplings.iter().flat_map(|c| [c.first, c.second]);
            CircuitError::Degenerate { parts: ends.map(|p| self.netlist.parts[p.0].name.clone()).collect() }
        };
        storage.cholesky().map(|ch| ch.inverse()).ok_or_else(coupled)
    }

    fn state_of(&self, part: PartId) -> usize {
        match self.netlist.parts[part.0].kind {
            Kind::Capacitor { state, .. } | Kind::Inductor { state, .. } => state,
            _ => 0,
        }
    }

    /// A part's current as a combination of tableau columns.
    fn current(&self, id: PartId) -> Combination {
        let rows = self.unknowns.len();
        match self.netlist.parts[id.0].kind {
            Kind::Inductor { state, .. } => vec![(rows + state, 1.0)],
            Kind::CurrentSource { input } => vec![(rows + self.netlist.states.len() + input.0, 1.0)],
            _ => self
                .unknowns
                .iter()
                .position(|unknown| *unknown == Unknown::PartCurrent(id))
                .map(|column| vec![(column, 1.0)])
                .unwrap_or_default(),
        }
    }

    fn probe(&self, probe: Probe, values: &[f64]) -> Combination {
        match probe {
            Probe::Voltage { plus, minus } => voltage(plus, minus),
            Probe::Current { part } => match self.netlist.parts[part.0].kind {
                Kind::ControlledCurrent { siemens, plus, minus } => {
                    voltage(plus, minus).into_iter().map(|(c, sign)| (c, sign * values[siemens.0])).collect()
                }
                Kind::CopiedCurrent { gain, of } => {
                    self.current(of).into_iter().map(|(c, sign)| (c, sign * values[gain.0])).collect()
                }
                _ => self.current(part),
            },
        }
    }

    /// Combinations of unknowns, states and inputs, with the solved unknowns put in: matrices over states, inputs and
    /// free unknowns.
    fn expand(&self, solved: &Solved, wanted: &[Combination]) -> (DMatrix<f64>, DMatrix<f64>, DMatrix<f64>) {
        let rows = self.unknowns.len();
        let (n, m, free) = (self.netlist.states.len(), self.netlist.inputs.len(), self.free_unknowns.len());
        let mut x = DMatrix::zeros(wanted.len(), n);
        let mut u = DMatrix::zeros(wanted.len(), m);
        let mut z = DMatrix::zeros(wanted.len(), free);
        for (i, combination) in wanted.iter().enumerate() {
            for &(column, factor) in combination {
                if column >= rows + n {
                    u[(i, column - rows - n)] += factor;
                } else if column >= rows {
                    x[(i, column - rows)] += factor;
                } else if let Some(row) = self.row_of_unknown[column] {
                    for j in 0..n {
                        x[(i, j)] += factor * solved.at(row, rows + j);
                    }
                    for j in 0..m {
                        u[(i, j)] += factor * solved.at(row, rows + n + j);
                    }
                    for (j, &unknown) in self.free_unknowns.iter().enumerate() {
                        z[(i, j)] -= factor * solved.at(row, unknown);
                    }
                } else if let Some(j) = self.free_unknowns.iter().position(|unknown| *unknown == column) {
                    z[(i, j)] += factor;
                }
            }
        }
        (x, u, z)
    }
}

/// The voltage of one node against another as a combination of tableau columns; the ground has none.
fn voltage(plus: Node, minus: Node) -> Combination {
    let mut combination = Vec::with_capacity(2);
    if plus.0 > 0 {
        combination.push((plus.0 - 1, 1.0));
    }
    if minus.0 > 0 {
        combination.push((minus.0 - 1, -1.0));
    }
    combination
}
