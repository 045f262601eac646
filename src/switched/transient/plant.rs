//! The switched system with its limits as forces: what every mode of the limits is eliminated from.
//!
//! *Conventions*: rows are rates of the states, then signals; columns are states, forcing signals, then one force per limiter.
//! States are scaled by powers of two, so that the equations are of one size; `scale` times a scaled state is the state. Two states
//! are added at the end: the integral of the load's voltage since the clock, and with line feed-forward the ramp.

use super::super::{Configuration, Rule, SwitchedSystem, inputs};
use nalgebra::{DMatrix, DVector, RowDVector};

/// How a limiter acts.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Act {
    /// The force holds the signal, a state, at the limit until its own drive turns inward.
    Hold,
    /// The force makes up the difference between the signal and the limit.
    Saturate,
    /// The force is a load's current: what a conductance [S] would take of the signal, and no more than the level in a forcing
    /// signal.
    Sink {
        /// Conductance [S].
        siemens: f64,
        /// Column of the level among the forcing signals.
        level: usize,
    },
}

/// A limit that can act.
#[derive(Clone, Debug)]
pub(super) struct Limiter {
    pub(super) act: Act,
    /// What is limited, for people; empty for what is no remark.
    pub(super) name: &'static str,
    /// Its signal over the system's states and inputs, by configuration.
    pub(super) signal: [(RowDVector<f64>, RowDVector<f64>); 3],
    /// Input by which it acts.
    pub(super) force: usize,
    pub(super) least: f64,
    pub(super) greatest: f64,
}

/// A forcing signal: weights of the system's inputs.
#[derive(Clone, Debug)]
pub(super) struct Forcing {
    pub(super) weights: DVector<f64>,
}

/// One configuration's rows over states, forcing signals and forces.
#[derive(Clone, Debug)]
pub(super) struct Plant {
    /// States, the added ones counted.
    pub(super) n: usize,
    /// Forcing signals.
    pub(super) m: usize,
    pub(super) limiters: Vec<Limiter>,
    /// Rates, probes, the rectifier current's rate while that conducts, then the limiters' signals; by configuration.
    pub(super) rows: [DMatrix<f64>; 3],
    /// Rows ahead of the limiters' signals, the rates not counted.
    pub(super) probes: usize,
    /// State by scaled state.
    pub(super) scale: DVector<f64>,
    /// The rectifier's current from the scaled states; none where it conducts reverse current.
    pub(super) rest: Option<Vec<f64>>,
    /// Puts the scaled states on the constraint of the resting interval.
    pub(super) projector: DMatrix<f64>,
    /// Applied to the scaled states as a period ends; none for a single phase.
    pub(super) rotation: Option<DMatrix<f64>>,
    /// State that is the ramp, where line feed-forward makes it one.
    pub(super) ramp: Option<usize>,
}

/// Sweeps of the scaling.
const SWEEPS: usize = 12;

impl Plant {
    /// Puts the rows together.
    pub(super) fn new(system: &SwitchedSystem, forcing: &[Forcing], limiters: Vec<Limiter>) -> Self {
        let (order, m) = (system.order(), forcing.len());
        let fed = match &system.rule {
            Rule::Compared(comparator) if comparator.rate_per_input != 0.0 => Some(comparator),
            _ => None,
        };
        let n = order + 1 + usize::from(fed.is_some());
        let probes = system.probes.len() + 1;
        let width = n + m + limiters.len();
        let weights = DMatrix::from_fn(system.input_names.len(), m, |i, k| forcing[k].weights[i]);
        let rests = system.rest.as_ref();
        let mut rows = [0, 1, 2].map(|k| {
            let piece = &system.pieces[k];
            let mut all = DMatrix::zeros(n + probes + limiters.len(), width);
            all.view_mut((0, 0), (order, order)).copy_from(&piece.a);
            all.view_mut((0, n), (order, m)).copy_from(&(&piece.b * &weights));
            all.view_mut((n, 0), (probes - 1, order)).copy_from(&piece.c);
            all.view_mut((n, n), (probes - 1, m)).copy_from(&(&piece.d * &weights));
            for (i, limiter) in limiters.iter().enumerate() {
                let force = n + m + i;
                all.view_mut((0, force), (order, 1)).copy_from(&piece.b.column(limiter.force));
                all.view_mut((n, force), (probes - 1, 1)).copy_from(&piece.d.column(limiter.force));
                for (j, other) in limiters.iter().enumerate() {
                    all[(n + probes + j, force)] = other.signal[k].1[limiter.force];
                }
                let (by_states, by_inputs) = &limiter.signal[k];
                all.view_mut((n + probes + i, 0), (1, order)).copy_from(by_states);
                all.view_mut((n + probes + i, n), (1, m)).copy_from(&(by_inputs * &weights));
            }
            let integral = all.row(n + system.places.stage.load_voltage).into_owned();
            all.row_mut(order).copy_from(&integral);
            if let Some(comparator) = fed {
                let input = system.input(inputs::INPUT_VOLTAGE).unwrap_or(0);
                for (k, signal) in forcing.iter().enumerate() {
                    all[(order + 1, n + k)] = comparator.rate_per_input * signal.weights[input];
                }
            }
            all
        });
        if let Some(rest) = rests {
            let off = &rows[Configuration::Freewheeling as usize];
            let rate: RowDVector<f64> = rest * off.rows(0, order);
            for all in &mut rows {
                all.row_mut(n + probes - 1).copy_from(&rate);
            }
        }
        let scale = scaling(&rows, n, system.period_s);
        for all in &mut rows {
            for k in 0..n {
                all.row_mut(k).scale_mut(scale[k].recip());
                all.column_mut(k).scale_mut(scale[k]);
            }
        }
        let rest = rests.map(|rest| (0..n).map(|k| if k < order { rest[k] * scale[k] } else { 0.0 }).collect());
        let scaled = |of: &DMatrix<f64>| {
            let mut all = DMatrix::identity(n, n);
            all.view_mut((0, 0), (order, order)).copy_from(of);
            DMatrix::from_fn(n, n, |i, j| all[(i, j)] * scale[j] / scale[i])
        };
        let projector = scaled(&system.rest_projector);
        let rotation = system.rotation.as_ref().map(scaled);
        Plant { n, m, limiters, rows, probes, scale, rest, projector, rotation, ramp: fed.map(|_| order + 1) }
    }

    /// State that is the integral of the load's voltage since the clock.
    pub(super) fn integral(&self) -> usize {
        self.n - 1 - usize::from(self.ramp.is_some())
    }
}

/// Powers of two that bring rows and columns of all configurations to one size. Source: Osborne, J. ACM 7 (1960), 338 (from memory).
fn scaling(rows: &[DMatrix<f64>; 3], n: usize, period: f64) -> DVector<f64> {
    let mut size = DMatrix::<f64>::zeros(n, n);
    for all in rows {
        size += all.view((0, 0), (n, n)).abs();
    }
    let mut scale = DVector::from_element(n, 1.0);
    let power = |x: f64| x.log2().round().exp2();
    for _ in 0..SWEEPS {
        for k in 0..n {
            let entry = |i: usize, j: usize| size[(i, j)] * scale[j] / scale[i];
            let out: f64 = (0..n).filter(|j| *j != k).map(|j| entry(j, k)).sum();
            let into: f64 = (0..n).filter(|j| *j != k).map(|j| entry(k, j)).sum();
            if out > 0.0 && into > 0.0 {
                scale[k] *= power((into / out).sqrt());
            } else if into > 0.0 {
                // It drives nothing: as small as a state that fills once a period.
                scale[k] *= power(into * period);
            }
        }
    }
    scale
}
