//! The converter at rest before start-up: its input network charged, its output at what it is charged to, the amplifiers at their limits.

use super::super::{Configuration, SwitchedSystem, inputs};
use super::limiters::Amplifiers;
use crate::compensator::{Limit, LimitKind};
use nalgebra::{DMatrix, DVector};

/// What is known of the converter at rest.
#[derive(Clone, Copy, Debug)]
pub struct AtRest<'a> {
    /// Voltage that the output is charged to [V].
    pub output_v: f64,
    /// Conductance beside what the equations hold of the load, so that both together draw current from a voltage [S].
    pub load_siemens: f64,
    /// What both together are [S].
    pub total_siemens: f64,
    /// The amplifiers' limits.
    pub amplifiers: Amplifiers<'a>,
}

/// Singular values below this share of the greatest are none.
const SINGULAR: f64 = 1e-11;

/// Rates below this share of those with a switch closed are rounding.
const ROUNDING: f64 = 1e-9;

/// Solution of least size of a·x = b; zero where there is none.
fn solve(a: &DMatrix<f64>, b: &DVector<f64>) -> DVector<f64> {
    let n = a.ncols();
    if n == 0 || a.nrows() == 0 {
        return DVector::zeros(n);
    }
    // Rows of one size, so that rates of fast and slow states count alike.
    let sizes: Vec<f64> = a.row_iter().map(|row| row.amax()).map(|s| if s > 0.0 { s } else { 1.0 }).collect();
    let scaled = DMatrix::from_fn(a.nrows(), n, |i, j| a[(i, j)] / sizes[i]);
    let b = DVector::from_fn(b.len(), |i, _| b[i] / sizes[i]);
    let svd = scaled.svd(true, true);
    let least = SINGULAR * svd.singular_values.amax();
    svd.solve(&b, least).unwrap_or_else(|_missing| DVector::zeros(n))
}

impl SwitchedSystem {
    /// States before start-up, the reference at zero and no switch closed.
    pub fn at_rest(&self, rest: &AtRest<'_>) -> (DVector<f64>, Configuration) {
        let piece = self.piece(Configuration::Resting);
        let mut u = self.steady_inputs.clone();
        for name in [inputs::REFERENCE, inputs::CONTROL, inputs::INJECTED] {
            if let Some(column) = self.input(name) {
                u[column] = 0.0;
            }
        }
        let mut a = piece.a.clone();
        if let Some(load) = self.input(inputs::LOAD_CURRENT) {
            let g = rest.load_siemens;
            let row = piece.c.row(self.places.stage.load_voltage).into_owned();
            let through = piece.d[(self.places.stage.load_voltage, load)];
            a += piece.b.column(load) * row * (g / (1.0 - g * through));
            u[load] = -rest.output_v * rest.total_siemens;
        }
        let place = |prefix: &str| self.state_names.iter().position(|name| name.starts_with(prefix));
        let outer = place("compensator").unwrap_or(self.order());
        let inner = place("inner compensator").unwrap_or(outer);
        let mut x = DVector::zeros(self.order());
        let mut drive = &piece.b * &u;
        // What a state at rest has for a rate is rounding, and told apart by its rates with a switch closed.
        for row in 0..inner {
            let usual = self.pieces.iter().map(|piece| piece.a.row(row).amax()).fold(0.0, f64::max);
            if a.row(row).amax() <= ROUNDING * usual {
                a.row_mut(row).fill(0.0);
                drive[row] = 0.0;
            }
        }
        let stage = solve(&a.view((0, 0), (inner, inner)).into_owned(), &-drive.rows(0, inner).into_owned());
        x.rows_mut(0, inner).copy_from(&stage);
        x = &self.rest_projector * x;
        for (limits, which, from, to, row) in [
            (rest.amplifiers.outer, "", outer, self.order(), self.places.control_voltage),
            (rest.amplifiers.inner, "inner ", inner, outer, self.places.compared),
        ] {
            let drive = &piece.a * &x + &drive;
            let a = piece.a.view((from, from), (to - from, to - from)).into_owned();
            let drive = -drive.rows(from, to - from).into_owned();
            let free = solve(&a, &drive);
            let output = piece.c.view((row, from), (1, to - from)).into_owned();
            let beyond = (piece.c.row(row) * &x)[0] + (piece.d.row(row) * &u)[0];
            let volts = beyond + (&output * &free).sum();
            let held = limits.iter().find(|limit| limit.kind == LimitKind::Hold).and_then(|limit| level(limit, volts));
            let force = limits.first().and_then(|limit| self.input(&format!("{which}{}", limit.force)));
            let found = match (held, force) {
                (Some(level), Some(force)) => {
                    let n = to - from;
                    let mut all = DMatrix::zeros(n + 1, n + 1);
                    all.view_mut((0, 0), (n, n)).copy_from(&a);
                    all.view_mut((0, n), (n, 1)).copy_from(&piece.b.view((from, force), (n, 1)));
                    all.view_mut((n, 0), (1, n)).copy_from(&output);
                    let asked = drive.push(level - beyond);
                    solve(&all, &asked).rows(0, n).into_owned()
                }
                _ => free,
            };
            x.rows_mut(from, to - from).copy_from(&found);
        }
        let configuration = if self.rest.is_some() { Configuration::Resting } else { Configuration::Freewheeling };
        (x, configuration)
    }
}

/// The limit that a voltage is beyond.
fn level(limit: &Limit, volts: f64) -> Option<f64> {
    if volts <= limit.least {
        Some(limit.least)
    } else if volts >= limit.greatest {
        Some(limit.greatest)
    } else {
        None
    }
}
