//! The averaged small-signal model of a stage at one condition.
//!
//! *Conventions*: inputs and outputs by the names in `signals`. The duty column is (Aon − Aoff)·X + (Bon − Boff)·U, and
//! likewise for the outputs, so an ESR's step is kept. The slopes of the switched current s = c·x are c·(A·x + B·u) of
//! the intervals at the averaged state.
//! *Source*: state-space averaging, Middlebrook & Ćuk 1976. *Valid* below about a third of the switching frequency.

use super::bank::{BankInductance, bank_inductance};
use super::landmark::{Landmark, Textbook, landmarks, resting_landmarks, right_half_plane_zero_hz};
use super::operating_point::{Conduction, NoOperatingPoint, OperatingPoint, Solution};
use super::signals::{INPUTS, OUTPUTS};
use super::stage::{OutOfReach, Stage, StageCondition, circuit_finding, with_duty};
use crate::finding::Finding;
use crate::linear::{StateSpace, Zpk};
use crate::quantity::{Unit, print};
use nalgebra::{DMatrix, RowDVector};

/// The stage linearised about one operating point.
#[derive(Clone, Debug)]
pub struct AveragedModel {
    /// The operating point.
    pub operating_point: OperatingPoint,
    /// From duty, input voltage and load current to output voltage, inductor and input current, switched current and its
    /// slopes: see [`signals`](super::signals).
    pub stage: StateSpace,
    /// The bank with and without its series inductance, where the stage must not carry it as a state; the difference
    /// belongs to the output voltage from the load current.
    pub bank_inductance: Option<BankInductance>,
}

impl Stage {
    /// The averaged model at a condition.
    ///
    /// # Errors
    /// A finding when no duty ratio gives the output; it names the greatest output that can be had.
    pub fn averaged(&self, condition: &StageCondition) -> Result<AveragedModel, Finding> {
        self.refuse_drop(condition)?;
        let solution = self.solve(condition).map_err(|why| {
            let told = no_operating_point(&why, condition);
            let reason = told.message.trim_end_matches('.');
            let out_of_reach = matches!(why, NoOperatingPoint::OutOfReach(_));
            self.between_regions(condition, reason).filter(|_| out_of_reach).unwrap_or(told)
        })?;
        let operating_point = self.figures(condition, &solution);
        let with_inductance = self.intervals_with_inductance(condition).filter(|_| solution.pulse.is_none());
        let inductance_left_out = with_inductance.is_none();
        let linearised = match with_inductance {
            None => self.linearise(&solution),
            Some(intervals) => {
                let intervals = intervals.map_err(|e| circuit_finding(&e))?;
                self.solution_at(intervals, solution.duty).and_then(|solution| self.linearise(&solution))
            }
        };
        let stage = linearised.ok_or_else(|| Finding::problem("stage", "The stage's averaged model is singular."))?;
        // Behind a second stage the load's current does not reach the bank fast enough for its inductance to count.
        let bank_inductance = if inductance_left_out && self.second_stage.is_none() {
            let resistance = condition.output_voltage / condition.load_current;
            bank_inductance(&self.bank, resistance).map_err(|e| circuit_finding(&e))?
        } else {
            None
        };
        Ok(AveragedModel { operating_point, stage, bank_inductance })
    }

    /// A second stage that drops the whole regulated voltage.
    fn refuse_drop(&self, condition: &StageCondition) -> Result<(), Finding> {
        if self.load_voltage(condition) > 0.0 {
            return Ok(());
        }
        let message = format!(
            "At a load of {} the second inductor's resistance drops the whole regulated {}.",
            print(condition.load_current, Unit::Ampere),
            print(condition.output_voltage, Unit::Volt)
        );
        Err(Finding::problem("stage.output-filter.resistance", message)
            .with_hint("lower the resistance or the load, or sense at the load"))
    }

    pub(super) fn linearise(&self, solution: &Solution) -> Option<StateSpace> {
        let (i, x, duty) = (&solution.intervals, &solution.x, solution.duty);
        let rows = self.averaged_rows();
        if let Some(pulse) = &solution.pulse {
            return i.linearise_pulse(solution, pulse, &rows, self.switching_frequency.recip());
        }
        let a = i.mix(duty, |e| &e.a);
        let b = i.mix(duty, |e| &e.b);
        let c = i.mix(duty, |e| &e.c).select_rows(&rows);
        let d = i.mix(duty, |e| &e.d).select_rows(&rows);
        let push = (&i.on.a - &i.off.a) * x + (&i.on.b - &i.off.b) * &i.inputs;
        let jump = ((&i.on.c - &i.off.c) * x + (&i.on.d - &i.off.d) * &i.inputs).select_rows(&rows);
        let s = &i.cell.c;
        let (slope_x, slope_u) = (s * (&i.on.a - &i.off.a), s * (&i.on.b - &i.off.b));
        let (on_x, on_u) = (s * &i.on.a, s * &i.on.b);
        // Switched current, its slopes and a ramp beside it have no direct path from the duty ratio.
        let (natural_x, natural_u) = i.natural_rows();
        let c = stacked(&c, &[s, &slope_x, &on_x, &natural_x]);
        let none = RowDVector::zeros(d.ncols());
        let d = stacked(&d, &[&none, &slope_u, &on_u, &natural_u]);
        let jump = jump.resize_vertically(c.nrows(), 0.0);
        let b = with_duty(&push, &b);
        let d = with_duty(&jump, &d);
        StateSpace::new(a, b, c, d, &INPUTS, &OUTPUTS).ok()
    }

    /// Rows of the netlist's outputs that an averaged model answers with.
    pub(super) fn averaged_rows(&self) -> Vec<usize> {
        std::iter::once(self.rows.output_voltage)
            .chain(self.rows.inductors.iter().take(1).map(|winding| winding.row))
            .chain([self.rows.input_current, self.rows.load_voltage, self.rows.bank_voltage])
            .collect()
    }

    /// The landmarks at a condition in its conduction mode; `vout_from_duty`, of the stage without its input filter, serves where no
    /// textbook form fits.
    pub fn landmarks(&self, condition: &StageCondition, conduction: Conduction, vout_from_duty: &Zpk) -> Vec<Landmark> {
        let topology = self.topology();
        match conduction {
            Conduction::Discontinuous => {
                resting_landmarks(topology, &self.resting_textbook(condition), self, vout_from_duty)
            }
            _ => landmarks(topology, &self.textbook(condition), self, vout_from_duty),
        }
    }

    /// The lossless quantities textbook forms of discontinuous conduction are written in.
    fn resting_textbook(&self, condition: &StageCondition) -> Textbook {
        let continuous = self.textbook(condition);
        let forms = &self.topology().resting;
        let k = 2.0 * (forms.inductance)(&continuous) * self.switching_frequency / continuous.load_resistance;
        Textbook { duty: (forms.duty)((forms.conversion)(&continuous), k), ..continuous }
    }

    /// The lossless quantities textbook formulas are written in.
    pub fn textbook(&self, condition: &StageCondition) -> Textbook {
        Textbook {
            duty: (self.topology().ideal_duty)(&self.voltages(condition)),
            conversion: condition.output_voltage / condition.input_voltage,
            seen_conversion: condition.output_voltage / self.topology().seen_input(condition.input_voltage, self.ratio),
            ratio: self.ratio,
            inductance: self.inductance,
            second_inductance: self.second_inductance,
            coupling: self.coupling,
            coupling_capacitance: self.coupling_capacitance,
            capacitance: self.output_capacitance(),
            load_resistance: condition.output_voltage / condition.load_current,
            switching_frequency: self.switching_frequency,
        }
    }

    /// The lowest right-half-plane zero of a derived plant [Hz].
    pub fn right_half_plane_zero_hz(&self, vout_from_duty: &Zpk) -> Option<f64> {
        right_half_plane_zero_hz(vout_from_duty)
    }
}

/// A matrix with rows put below it.
fn stacked(top: &DMatrix<f64>, rows: &[&RowDVector<f64>]) -> DMatrix<f64> {
    DMatrix::from_fn(top.nrows() + rows.len(), top.ncols(), |r, k| {
        if r < top.nrows() { top[(r, k)] } else { rows[r - top.nrows()][k] }
    })
}

fn no_operating_point(why: &NoOperatingPoint, condition: &StageCondition) -> Finding {
    let wanted = print(condition.output_voltage, Unit::Volt);
    let from = print(condition.input_voltage, Unit::Volt);
    match why {
        NoOperatingPoint::Circuit(error) => circuit_finding(error),
        NoOperatingPoint::OutOfReach(OutOfReach::Above { greatest, at_duty }) => Finding::problem(
            "stage.output.voltage",
            format!(
                "{wanted} is out of reach from {from}: the greatest output is {}, at a duty ratio of {at_duty:.3}.",
                print(*greatest, Unit::Volt)
            ),
        )
        .with_hint("raise the input, lower the output or the load, or lower the resistances"),
        NoOperatingPoint::OutOfReach(OutOfReach::Below { least }) => Finding::problem(
            "stage.output.voltage",
            format!(
                "{wanted} is out of reach from {from}: even a duty ratio of zero gives {}.",
                print(*least, Unit::Volt)
            ),
        )
        .with_hint("a boost's output must stand above its input"),
    }
}
