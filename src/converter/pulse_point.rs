//! The operating point in discontinuous conduction: states and duty ratio that hold the wanted output.
//!
//! *Method*: Newton steps on states and duty ratio together, from the point of continuous conduction: without losses that
//! point's averages are right already, and its duty ratio shrinks by √(average/half ripple) of the switched current (its
//! charge in either interval is the same). Where the steps fail, the output is bracketed over the duty ratio, each of
//! its values from a bracket of the second duty ratio, and the steps polish that.

use super::cell::SwitchedCell;
use super::drawing::LOAD_CURRENT;
use super::operating_point::Solution;
use super::pulse::Pulse;
use super::stage::{Intervals, OutOfReach};
use crate::circuit::StateEquations;
use crate::linear::bracketed_root;
use nalgebra::{DMatrix, DVector, RowDVector};

/// Newton steps granted; four are usual.
const MOST_STEPS: u32 = 40;
/// A relative step below this is followed by one more, which reaches the last digits.
const NEARLY: f64 = 1e-7;
/// A relative step that keeps this small is the rounding of a current beside the bank's far greater ones: loads of less than a
/// millionth of the boundary's end there.
const ROUNDING: f64 = 1e-3;
/// Steps before that is believed.
const PATIENCE: u32 = 12;
/// Points of the scan above the duty ratio of continuous conduction.
const SCAN: u16 = 24;

/// A duty ratio with its averaged states, and the pulse where the current rests.
#[derive(Clone, Debug)]
pub(super) struct Found {
    pub(super) duty: f64,
    pub(super) x: DVector<f64>,
    pub(super) pulse: Option<Pulse>,
}

impl Intervals {
    /// The point with `target` at output `row`, from that of continuous conduction, whose valley is below zero.
    pub(super) fn solve_pulse(
        &self,
        continuous: &Found,
        period: f64,
        target: f64,
        row: usize,
    ) -> Result<Found, OutOfReach> {
        let c = &self.cell.c;
        let ripple = (c * (&self.on.a * &continuous.x + &self.on.b * &self.inputs))[0] * continuous.duty * period / 2.0;
        let shrink = ((c * &continuous.x)[0] / ripple).sqrt();
        let start = Found { duty: continuous.duty * shrink, ..continuous.clone() };
        self.newton_pulse(start, period, target, row)
            .map_or_else(|| self.bracket_and_polish(continuous.duty, period, target, row), Ok)
    }

    fn bracket_and_polish(&self, near: f64, period: f64, target: f64, row: usize) -> Result<Found, OutOfReach> {
        let found = self.with_resistor().bracket_pulse(near, period, target, row)?;
        let polished = found.pulse.is_some().then(|| self.newton_pulse(found.clone(), period, target, row)).flatten();
        Ok(polished.unwrap_or(found))
    }

    /// Newton steps on states and duty ratio; none where they leave what can be or do not settle.
    pub(super) fn newton_pulse(&self, start: Found, period: f64, target: f64, row: usize) -> Option<Found> {
        let Found { mut duty, mut x, .. } = start;
        let mut nearly = false;
        for count in 0..MOST_STEPS {
            let pulse = self.pulse(period, duty, &x)?;
            let [rates, outputs] = self.pulse_averages(period, duty, &pulse, &[row]);
            let n = x.len();
            let mut jacobian = DMatrix::zeros(n + 1, n + 1);
            jacobian.view_mut((0, 0), (n, n)).copy_from(&rates.x);
            jacobian.view_mut((0, n), (n, 1)).copy_from(&rates.duty);
            jacobian.view_mut((n, 0), (1, n)).copy_from(&outputs.x);
            jacobian[(n, n)] = outputs.duty[0];
            let mut residual = rates.value.push(outputs.value[0] - target);
            // Rates and output have unlike sizes; each row counts by its own.
            for (mut line, value) in jacobian.row_iter_mut().zip(residual.iter_mut()) {
                let scale = line.amax();
                line /= scale;
                *value /= scale;
            }
            let step = jacobian.lu().solve(&-residual)?;
            let (moved, turned) = (step.rows(0, n), step[n]);
            let (current, change) = ((&self.cell.c * &x)[0], (&self.cell.c * moved)[0]);
            // Duty ratio and current stay positive.
            let whole = [(duty, turned), (current, change)].into_iter().fold(1.0_f64, |part, (value, step)| {
                if value + step > 0.1 * value { part } else { part.min(-0.9 * value / step) }
            });
            duty += whole * turned;
            x += moved * whole;
            if nearly {
                let pulse = self
                    .pulse(period, duty, &x)
                    .filter(|p| p.second_duty > 0.0 && duty + p.second_duty <= 1.0 + NEARLY)?;
                return x.iter().all(|v| v.is_finite()).then_some(Found { duty, x, pulse: Some(pulse) });
            }
            let enough = if count < PATIENCE { NEARLY } else { ROUNDING };
            nearly = whole >= 1.0 && turned.abs() <= enough * duty && change.abs() <= enough * current;
        }
        None
    }

    /// The stage with a resistor for its load, whose output rises with the duty ratio where that of a tangent may not. Both
    /// draw the same current at the output wanted.
    pub(super) fn with_resistor(&self) -> Self {
        let (row, conductance) = self.to_resistor;
        let load = |e: &StateEquations| {
            let b: DVector<f64> = e.b.column(LOAD_CURRENT).into();
            let d: DVector<f64> = e.d.column(LOAD_CURRENT).into();
            let share = conductance / (1.0 - d[row] * conductance);
            let (by_states, by_inputs) = (e.c.row(row) * share, e.d.row(row) * share);
            StateEquations {
                a: &e.a + &b * &by_states,
                b: &e.b + &b * &by_inputs,
                c: &e.c + &d * &by_states,
                d: &e.d + &d * &by_inputs,
                projector: e.projector.clone(),
            }
        };
        let mut inputs = self.inputs.clone();
        inputs[LOAD_CURRENT] = 0.0;
        let cell = SwitchedCell { idle: load(&self.cell.idle), ..self.cell.clone() };
        Intervals {
            on: load(&self.on),
            off: load(&self.off),
            cell,
            sets: self.sets,
            natural: self.natural,
            inputs,
            to_resistor: (row, 0.0),
        }
    }

    /// The lowest duty ratio that gives the output, from brackets.
    pub(super) fn bracket_pulse(&self, near: f64, period: f64, target: f64, row: usize) -> Result<Found, OutOfReach> {
        let off = |duty: f64| self.held(duty, period, row).map(|(output, _)| output - target);
        let mut low = (0.0, off(0.0).unwrap_or(-target));
        let mut best = low;
        for k in 0..=SCAN {
            let duty = near + (1.0 - near) * f64::from(k) / f64::from(SCAN);
            let Some(error) = off(duty) else { continue };
            if error >= 0.0 {
                let root = bracketed_root(|d| off(d).unwrap_or(f64::NAN), low, (duty, error), f64::EPSILON * duty);
                let found = self.held(root, period, row).map(|(_, found)| found);
                return found.ok_or(OutOfReach::Above { greatest: target + best.1, at_duty: best.0 });
            }
            low = (duty, error);
            if error > best.1 {
                best = low;
            }
        }
        Err(OutOfReach::Above { greatest: target + best.1, at_duty: best.0 })
    }

    /// Output and states that settle at a held duty ratio, whichever way the current then flows.
    fn held(&self, duty: f64, period: f64, row: usize) -> Option<(f64, Found)> {
        if duty > 0.0 && self.surplus(duty, 1.0 - duty, period)?.0 < 0.0 {
            let surplus = |second: f64| self.surplus(duty, second, period).map_or(f64::NAN, |s| s.0);
            let ends = ((0.0, surplus(0.0)), (1.0 - duty, surplus(1.0 - duty)));
            let second = bracketed_root(surplus, ends.0, ends.1, f64::EPSILON * duty);
            let x = self.surplus(duty, second, period)?.1;
            let pulse = self.pulse(period, duty, &x)?;
            let [_, outputs] = self.pulse_averages(period, duty, &pulse, &[row]);
            return Some((outputs.value[0], Found { duty, x, pulse: Some(pulse) }));
        }
        let steady = self.steady(duty, row)?;
        Some((steady.output, Found { duty, x: steady.x, pulse: None }))
    }

    /// What the switched current gains over a period with both duty ratios held [A/s], and the states that settle; linear
    /// in the states, because half the peak is.
    fn surplus(&self, duty: f64, second: f64, period: f64) -> Option<(f64, DVector<f64>)> {
        let (c, v, rest) = (&self.cell.c, &self.cell.v, &self.cell.rest);
        let gain = duty * period / (2.0 - duty * period * (c * &self.on.a * v)[0]);
        let lift: RowDVector<f64> = c * &self.on.a * rest * gain;
        let push = (c * &self.on.b * &self.inputs)[0] * gain;
        let idle = 1.0 - duty - second;
        let during = &self.on.a * duty + &self.off.a * second;
        let whole = (&during + &self.cell.idle.a * idle) * rest + &during * v * &lift;
        let forced =
            (&self.on.b * duty + &self.off.b * second + &self.cell.idle.b * idle) * &self.inputs + &during * v * push;
        // The switched current itself is pinned to nothing here; it follows from the pulse.
        let pinned = rest * &whole - v * c * whole.amax().max(f64::MIN_POSITIVE);
        let resting = pinned.lu().solve(&-(rest * &forced))?;
        let half = (&lift * &resting)[0] + push;
        let gained = (c * (&whole * &resting + &forced))[0];
        Some((gained, resting + v * (half * (duty + second))))
    }
}

impl Solution {
    /// The solution that was found.
    pub(super) fn from_found(intervals: Intervals, found: Found) -> Self {
        Solution { intervals, duty: found.duty, x: found.x, pulse: found.pulse }
    }
}
