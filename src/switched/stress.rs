//! Peak, RMS and mean of every probe over a steady period, and the output's ripple taken apart.
//!
//! *Method*: means are exact, by integrating the states with the exponential. Extremes are those of the samples and of the cubic through
//! two of them with their slopes, RMS values Simpson's rule on the samples: both to about 1e-6 of the swing for whatever moves no
//! faster than a switching interval.

use super::flow::Flow;
use super::orbit::Orbit;
use super::perturbed::left_range;
use super::system::Piece;
use crate::finding::Finding;
use crate::linear::expm;
use nalgebra::{DMatrix, DVector};

/// Parts of a phase, an even number.
const PARTS: usize = 48;

/// A probe over a steady period, in its unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Figures {
    /// Least value.
    pub least: f64,
    /// Greatest value.
    pub greatest: f64,
    /// Mean.
    pub mean: f64,
    /// Root mean square.
    pub rms: f64,
}

impl Figures {
    /// Greatest magnitude.
    pub fn peak(&self) -> f64 {
        self.greatest.abs().max(self.least.abs())
    }

    /// Peak to peak.
    pub fn swing(&self) -> f64 {
        self.greatest - self.least
    }
}

/// The ripple of the output, peak to peak.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct OutputRipple {
    /// At the load's terminals [V].
    pub load: f64,
    /// At the output bank, ahead of a second stage [V].
    pub bank: f64,
    /// Of the voltage on the capacitance of the branch that carries the most ripple current [V].
    pub capacitive: f64,
    /// Across that branch's series resistance [V].
    pub resistive: f64,
    /// That branch, counted from 0.
    pub branch: usize,
}

/// Figures being gathered for one signal.
struct Gathered {
    least: f64,
    greatest: f64,
    square: f64,
}

impl Gathered {
    fn new() -> Self {
        Gathered { least: f64::INFINITY, greatest: f64::NEG_INFINITY, square: 0.0 }
    }

    fn take(&mut self, value: f64) {
        self.least = self.least.min(value);
        self.greatest = self.greatest.max(value);
    }

    /// Values and slopes at even steps through a phase.
    fn phase(&mut self, samples: &[(f64, f64)], step: f64) {
        for (k, (value, _)) in samples.iter().enumerate() {
            self.take(*value);
            let weight = if k == 0 || k + 1 == samples.len() {
                1.0
            } else if k % 2 == 1 {
                4.0
            } else {
                2.0
            };
            self.square += weight * value * value * step / 3.0;
        }
        for pair in samples.windows(2) {
            if let [from, to] = pair
                && let Some(turn) = turning_value(*from, *to, step)
            {
                self.take(turn);
            }
        }
    }
}

/// Value at which the cubic through two samples with their slopes turns between them; none where it does not.
fn turning_value((from, slope_from): (f64, f64), (to, slope_to): (f64, f64), step: f64) -> Option<f64> {
    if slope_from * slope_to >= 0.0 {
        return None;
    }
    let (a, b) = (slope_from * step, slope_to * step);
    let rise = to - from;
    // Slope of the cubic over its step: a + 2·p·s + 3·q·s².
    let (p, q) = (3.0 * rise - 2.0 * a - b, a + b - 2.0 * rise);
    let root = (p * p - 3.0 * a * q).sqrt();
    // The root between 0 and 1, in the form that does not cancel.
    let at = [-a / (p + root), -a / (p - root)].into_iter().find(|s| (0.0..=1.0).contains(s))?;
    Some(from + at * (a + at * (p + at * q)))
}

impl Orbit {
    /// Figures of every probe, in the system's order.
    ///
    /// # Errors
    /// A finding where an exponential leaves the number range.
    pub fn figures(&self) -> Result<Vec<Figures>, Finding> {
        self.gather(&DMatrix::zeros(0, self.system.probes.len()))
    }

    /// The output's ripple, taken apart; none without a bank.
    ///
    /// # Errors
    /// A finding where an exponential leaves the number range.
    pub fn output_ripple(&self) -> Result<Option<OutputRipple>, Finding> {
        let places = &self.system.places;
        let probes = self.system.probes.len();
        // The voltage on each branch's capacitance: the bank's less what its resistance drops.
        let branches = places.stage.branch_currents.len();
        let mut extra = DMatrix::zeros(branches, probes);
        for (k, (row, esr)) in places.stage.branch_currents.iter().zip(&self.system.bank_esr).enumerate() {
            extra[(k, places.stage.bank_voltage)] = 1.0;
            extra[(k, *row)] = -esr;
        }
        let figures = self.gather(&extra)?;
        let current = |k: usize| places.stage.branch_currents.get(k).and_then(|row| figures.get(*row));
        let most = (0..branches)
            .max_by(|p, q| current(*p).map_or(0.0, |f| f.rms).total_cmp(&current(*q).map_or(0.0, |f| f.rms)));
        let ripple = most.and_then(|branch| {
            Some(OutputRipple {
                load: figures.get(places.stage.load_voltage)?.swing(),
                bank: figures.get(places.stage.bank_voltage)?.swing(),
                capacitive: figures.get(probes + branch)?.swing(),
                resistive: current(branch)?.swing() * self.system.bank_esr.get(branch)?,
                branch,
            })
        });
        Ok(ripple)
    }

    /// Figures of the probes, and of combinations of them.
    fn gather(&self, combined: &DMatrix<f64>) -> Result<Vec<Figures>, Finding> {
        let system = &self.system;
        let count = system.probes.len() + combined.nrows();
        let mut gathered: Vec<Gathered> = (0..count).map(|_| Gathered::new()).collect();
        let mut mean = DVector::zeros(count);
        for (phase, start) in self.phases.iter().zip(&self.starts) {
            if phase.length_s <= 0.0 {
                continue;
            }
            let piece = system.piece(phase.configuration);
            let stack =
                |m: &DMatrix<f64>| {
                    let below = combined * m;
                    DMatrix::from_fn(count, m.ncols(), |r, k| {
                        if r < m.nrows() { m[(r, k)] } else { below[(r - m.nrows(), k)] }
                    })
                };
            let (c, by_inputs) = (stack(&piece.c), stack(&piece.d) * &self.inputs);
            mean += &c * self.integral(phase.length_s, piece, start)? + &by_inputs * phase.length_s;
            let step = phase.length_s / PARTS as f64;
            let flow = Flow::new(piece, &self.inputs, step).map_err(|error| left_range(&error))?;
            let mut samples = vec![Vec::with_capacity(PARTS + 1); count];
            let mut x = start.clone();
            for _ in 0..=PARTS {
                let (values, slopes) = (&c * &x + &by_inputs, &c * piece.rates(&x, &self.inputs));
                for (trace, (value, slope)) in samples.iter_mut().zip(values.iter().zip(slopes.iter())) {
                    trace.push((*value, *slope));
                }
                x = flow.end(&x);
            }
            for (signal, trace) in gathered.iter_mut().zip(&samples) {
                signal.phase(trace, step);
            }
        }
        let figures = gathered.iter().zip(mean.iter()).map(|(signal, mean)| Figures {
            least: signal.least,
            greatest: signal.greatest,
            mean: mean / system.period_s,
            rms: (signal.square / system.period_s).sqrt(),
        });
        let mut figures: Vec<Figures> = figures.collect();
        if let Some(interleaving) = &system.interleaving {
            interleaving.over_all(&mut figures);
        }
        Ok(figures)
    }

    /// Integral of the states over a phase.
    pub(super) fn integral(&self, length_s: f64, piece: &Piece, start: &DVector<f64>) -> Result<DVector<f64>, Finding> {
        let n = start.len();
        let mut m = DMatrix::zeros(2 * n + 1, 2 * n + 1);
        m.view_mut((0, 0), (n, n)).copy_from(&piece.a);
        m.view_mut((0, n), (n, 1)).copy_from(&(&piece.b * &self.inputs));
        m.view_mut((n + 1, 0), (n, n)).fill_with_identity();
        let e = expm(&(m * length_s)).map_err(|error| left_range(&error))?;
        Ok(e.view((n + 1, 0), (n, n)) * start + e.view((n + 1, n), (n, 1)).column(0))
    }
}
