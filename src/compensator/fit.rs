//! Parts whose lanes come nearest to their aims while some parts are kept.
//!
//! *Method.* Least squares in the logarithms of parts and frequencies, so a part can neither turn negative nor count more for
//! its size; Levenberg's damping (Quarterly of Applied Mathematics 2, 1944, 164–168). The lane that is moved weighs so much that
//! the others only share what it leaves free.

use nalgebra::{DMatrix, DVector};

use super::lanes::{Corner, Corners};
use super::network::{Amplifier, Compensator, Part, Parts};
use crate::quantity::Bounds;

/// Weight of the moved lane against the others: its error is then this squared times smaller than theirs.
const MOVED_WEIGHT: f64 = 1e5;
/// Rounds of the iteration; a handful suffices, the rest is for far starts.
const ROUNDS: usize = 200;
/// Step in the logarithm of a part for the derivative: errors of rounding and of the second order balance near 1e-5.
const DIFFERENCE: f64 = 1e-5;
/// Longest step in the logarithm of a part, one decade, so a far aim does not overshoot.
const LONGEST: f64 = 2.3;
/// Step below which the fit has settled.
const SETTLED: f64 = 1e-14;

/// What to fit.
pub(super) struct Fit<'a> {
    /// The compensator the search starts from.
    pub(super) start: &'a Compensator,
    /// Where the lanes should be.
    pub(super) aim: &'a Corners,
    /// The lane that comes first.
    pub(super) moved: Option<Corner>,
    /// Parts that stay.
    pub(super) kept: &'a [Part],
}

/// The nearest parts.
pub(super) fn fit(task: &Fit<'_>) -> Parts {
    let free = free_parts(task);
    let mut best = task.start.clone();
    if free.is_empty() {
        return best.parts;
    }
    let mut error = residuals(task, &best);
    let mut damping = 1e-3;
    for _ in 0..ROUNDS {
        let Some(step) = damped_step(&slopes(task, &best, &free), &error, damping) else { break };
        let tried = stepped(&best, &free, &step);
        let tried_error = residuals(task, &tried);
        if tried_error.norm_squared() < error.norm_squared() {
            best = tried;
            error = tried_error;
            damping *= 0.1;
        } else {
            damping *= 10.0;
        }
        if step.amax() < SETTLED || damping > 1e12 {
            break;
        }
    }
    best.parts
}

/// Parts that may change. The lower divider resistor only ever follows the upper one, so it is never free by itself, and locked
/// it holds the upper one too.
fn free_parts(task: &Fit<'_>) -> Vec<Part> {
    let op_amp = matches!(task.start.amplifier, Amplifier::OpAmp(_));
    // With isolated feedback what holds the operating point is among the kept parts.
    task.start
        .fitted()
        .into_iter()
        .filter(|part| !task.kept.contains(part))
        .filter(|part| match part {
            Part::Lower => false,
            Part::Upper => op_amp && !task.kept.contains(&Part::Lower),
            _ => true,
        })
        .collect()
}

/// Weighted distances of the lanes from their aims, in log frequency.
fn residuals(task: &Fit<'_>, at: &Compensator) -> DVector<f64> {
    let built = at.corners();
    let distances: Vec<f64> = Corner::ALL
        .into_iter()
        .filter_map(|corner| {
            let weight = if task.moved == Some(corner) { MOVED_WEIGHT } else { 1.0 };
            Some(weight * (built.at(corner)? / task.aim.at(corner)?).ln())
        })
        .collect();
    DVector::from_vec(distances)
}

/// Change of the residuals with the logarithm of each free part, by central differences.
fn slopes(task: &Fit<'_>, at: &Compensator, free: &[Part]) -> DMatrix<f64> {
    let columns: Vec<DVector<f64>> = (0..free.len())
        .map(|index| {
            let mut step = DVector::zeros(free.len());
            step[index] = DIFFERENCE;
            let above = residuals(task, &stepped(at, free, &step));
            step[index] = -DIFFERENCE;
            (above - residuals(task, &stepped(at, free, &step))) / (2.0 * DIFFERENCE)
        })
        .collect();
    DMatrix::from_columns(&columns)
}

/// Step that lowers the residuals, held back by `damping`; the damped system is stacked, never squared, to keep its digits.
fn damped_step(slopes: &DMatrix<f64>, error: &DVector<f64>, damping: f64) -> Option<DVector<f64>> {
    let (rows, columns) = slopes.shape();
    let mut stacked = DMatrix::zeros(rows + columns, columns);
    stacked.view_mut((0, 0), (rows, columns)).copy_from(slopes);
    for index in 0..columns {
        stacked[(rows + index, index)] = damping.sqrt();
    }
    let mut right = DVector::zeros(rows + columns);
    right.rows_mut(0, rows).copy_from(&(-error));
    let mut step = stacked.svd(true, true).solve(&right, 1e-14).ok()?;
    let longest = step.amax();
    if longest > LONGEST {
        step *= LONGEST / longest;
    }
    step.iter().all(|part| part.is_finite()).then_some(step)
}

/// The compensator after a step in the logarithms of its free parts, within the bounds of the table.
fn stepped(from: &Compensator, free: &[Part], step: &DVector<f64>) -> Compensator {
    let mut stepped = from.clone();
    for (&part, change) in free.iter().zip(step.iter()) {
        let before = from.parts.get(part);
        let (least, greatest) = range(from, part);
        let value = (before * change.exp()).max(least).min(greatest);
        stepped.parts.set(part, value);
        if part == Part::Upper {
            stepped.parts.lower = from.parts.lower * (value / before);
        }
    }
    stepped
}

/// Least and greatest value a part may take [Ω or F]; the upper divider resistor also minds the lower one that follows it.
fn range(at: &Compensator, part: Part) -> (f64, f64) {
    let Bounds::Between(mut least, mut greatest) = part.entry().bounds else { return (0.0, f64::INFINITY) };
    if let (Part::Led, Some(regulator)) = (part, at.isolated()) {
        greatest = greatest.min(at.led_limit(regulator).max(at.parts.led));
    }
    if part == Part::Upper
        && let Bounds::Between(lower_least, lower_greatest) = Part::Lower.entry().bounds
    {
        let ratio = at.parts.upper / at.parts.lower;
        // A millionth inside, so that rounding does not take the lower resistor over its bound.
        least = least.max(lower_least * ratio * (1.0 + 1e-6));
        greatest = greatest.min(lower_greatest * ratio * (1.0 - 1e-6));
    }
    (least, greatest)
}
