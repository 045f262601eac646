//! Currents of the filters' inductors and resistances over one period.
//!
//! A filter inductor's ripple is made by the ripple of its capacitor, so straight lines around the averaged state would show
//! none. It is taken from the exact periodic orbit of the open-loop stage at the same durations of the intervals: each interval is
//! solved by the matrix exponential, and the state that repeats itself by one linear solve. Averages stay those of the averaged
//! state. *Source*: periodic steady state of a switched linear circuit by its transition matrices (from memory, Middlebrook &
//! Ćuk 1976 derive averaging from it).

use super::operating_point::{CurrentFigures, InductorFigures, Loss};
use super::stage::Stage;
use crate::circuit::StateEquations;
use crate::linear::expm;
use nalgebra::{DMatrix, DVector};

/// Even parts of an interval in which a current is sampled.
const PARTS: usize = 8;

/// One interval of the period: its equations and how long it lasts [s]. Where they tie states together, the states are put on
/// that constraint as the interval begins: a current that comes to rest is zero then.
pub(super) type Span<'a> = (&'a StateEquations, f64);

/// The states of a period at evenly spaced instants of each interval, both ends included.
pub(super) struct Orbit<'a> {
    spans: Vec<Span<'a>>,
    inputs: &'a DVector<f64>,
    states: Vec<Vec<DVector<f64>>>,
}

impl<'a> Orbit<'a> {
    /// The periodic orbit; none where no state repeats itself or an exponential leaves the number range.
    pub(super) fn new(spans: Vec<Span<'a>>, inputs: &'a DVector<f64>) -> Option<Self> {
        let n = spans.first()?.0.a.nrows();
        let steps: Vec<(DMatrix<f64>, DVector<f64>)> =
            spans.iter().map(|(e, duration)| step(e, inputs, duration / PARTS as f64)).collect::<Option<_>>()?;
        let (mut map, mut offset) = (DMatrix::identity(n, n), DVector::zeros(n));
        for ((transition, push), (equations, _)) in steps.iter().zip(&spans) {
            if let Some(p) = &equations.projector {
                (map, offset) = (p * map, p * offset);
            }
            for _ in 0..PARTS {
                map = transition * map;
                offset = transition * offset + push;
            }
        }
        let mut x = (DMatrix::identity(n, n) - map).lu().solve(&offset)?;
        let mut states = Vec::with_capacity(spans.len());
        for ((transition, push), (equations, _)) in steps.iter().zip(&spans) {
            if let Some(p) = &equations.projector {
                x = p * x;
            }
            let mut along = vec![x.clone()];
            for _ in 0..PARTS {
                x = transition * x + push;
                along.push(x.clone());
            }
            states.push(along);
        }
        states.iter().flatten().all(|x| x.iter().all(|v| v.is_finite())).then_some(Orbit { spans, inputs, states })
    }

    /// The samples of an output row in each interval.
    fn samples(&self, row: usize) -> impl Iterator<Item = (f64, Vec<f64>)> + '_ {
        self.spans.iter().zip(&self.states).map(move |((e, duration), along)| {
            let direct = (e.d.row(row) * self.inputs)[0];
            (*duration, along.iter().map(|x| (e.c.row(row) * x)[0] + direct).collect())
        })
    }

    /// How long the period is [s].
    pub(super) fn period(&self) -> f64 {
        self.spans.iter().map(|span| span.1).sum()
    }

    /// An output row at a time from the start of the period [s], by the cubic through values and slopes of the samples.
    pub(super) fn value(&self, row: usize, time: f64) -> f64 {
        let mut start = 0.0;
        let mut value = 0.0;
        for ((e, duration), along) in self.spans.iter().zip(&self.states) {
            let end = start + duration;
            if *duration > 0.0 && time >= start {
                let place = ((time - start) / duration * PARTS as f64).clamp(0.0, PARTS as f64);
                let first = (0..PARTS).rev().find(|k| *k as f64 <= place).unwrap_or(0);
                let c = e.c.row(row);
                let (Some(from), Some(to)) = (along.get(first), along.get(first + 1)) else { break };
                let rate = |x: &DVector<f64>| (c * (&e.a * x + &e.b * self.inputs))[0] * duration / PARTS as f64;
                let direct = (e.d.row(row) * self.inputs)[0];
                value = direct + hermite(place - first as f64, [(c * from)[0], (c * to)[0]], [rate(from), rate(to)]);
            }
            if time < end {
                break;
            }
            start = end;
        }
        value
    }

    /// Figures of the current at an output row, moved to its average in the averaged state [A].
    pub(super) fn figures(&self, row: usize, average: f64) -> CurrentFigures {
        let period = self.period();
        let (mut mean, mut square) = (0.0, 0.0);
        let (mut least, mut peak) = (f64::INFINITY, f64::NEG_INFINITY);
        for (duration, values) in self.samples(row) {
            let share = duration / period;
            mean += share * simpson(values.iter().copied());
            square += share * simpson(values.iter().map(|v| v * v));
            least = values.iter().copied().fold(least, f64::min);
            peak = values.iter().copied().fold(peak, f64::max);
        }
        CurrentFigures::moved(average, (mean, square), (least, peak))
    }
}

/// The cubic through values and slopes at both ends of a unit interval.
fn hermite(t: f64, values: [f64; 2], slopes: [f64; 2]) -> f64 {
    let rest = 1.0 - t;
    values[0] * (1.0 + 2.0 * t) * rest * rest + values[1] * t * t * (3.0 - 2.0 * t) + slopes[0] * t * rest * rest
        - slopes[1] * t * t * rest
}

/// Transition over a time and what the inputs add on the way: exp of [[A, B·u], [0, 0]].
fn step(e: &StateEquations, inputs: &DVector<f64>, time_s: f64) -> Option<(DMatrix<f64>, DVector<f64>)> {
    let n = e.a.nrows();
    let push = &e.b * inputs;
    let augmented = DMatrix::from_fn(n + 1, n + 1, |r, c| match (r < n, c < n) {
        (true, true) => e.a[(r, c)] * time_s,
        (true, false) => push[r] * time_s,
        _ => 0.0,
    });
    let whole = expm(&augmented).ok()?;
    Some((whole.view((0, 0), (n, n)).into(), whole.view((0, n), (n, 1)).column(0).into()))
}

/// Mean of evenly spaced samples, both ends included, by Simpson's rule; their number is odd.
fn simpson(values: impl Iterator<Item = f64>) -> f64 {
    let weight = |k: usize| match k {
        0 | PARTS => 1.0,
        k if k % 2 == 1 => 4.0,
        _ => 2.0,
    };
    values.enumerate().map(|(k, v)| weight(k) * v).sum::<f64>() / (3.0 * PARTS as f64)
}

impl Stage {
    /// Inductor currents of the filters, and losses of the resistances of input network and output filter. `lines` gives the
    /// figures of an output row from straight lines around the averaged state.
    pub(super) fn filter_figures(
        &self,
        spans: Vec<Span<'_>>,
        inputs: &DVector<f64>,
        lines: &dyn Fn(usize) -> CurrentFigures,
    ) -> (Vec<InductorFigures>, Vec<Loss>) {
        let rows = &self.rows;
        let orbit = if rows.filter_inductors.is_empty() { None } else { Orbit::new(spans, inputs) };
        let figures = |row: usize| match &orbit {
            Some(orbit) => orbit.summed(row, lines(row).average, self.phases),
            None => lines(row),
        };
        // Without an orbit an inductor's ripple is not known, and nothing is said of it.
        let known = rows.filter_inductors.iter().filter(|_| orbit.is_some());
        let inductors = known.map(|(name, row)| InductorFigures { name, current: figures(*row) });
        let losses = rows.filter_losses.iter().map(|(name, slot, row)| {
            let ohms = self.slot_value(*slot);
            Loss { name, watts: if ohms > 0.0 { ohms * figures(*row).rms.powi(2) } else { 0.0 } }
        });
        (inductors.collect(), losses.collect())
    }
}
