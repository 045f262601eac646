//! The operating point: the duty ratio that gives the wanted output with all losses, and the currents that follow.
//!
//! *Method*: in continuous conduction the averaged state equations A(d)·x + B(d)·u = 0, A(d) = d·Aon + (1−d)·Aoff, are solved for the duty
//! ratio by scanning from zero for the first bracket and refining with safeguarded Newton steps, so that of two
//! solutions the one below the peak of the conversion curve is found. Ripple is that of straight-line segments.
//! *Source*: state-space averaging, Middlebrook & Ćuk 1976.

use super::further::{Further, of_phases};
use super::pulse::Pulse;
use super::pulse_point::Found;
use super::rows::{Rows, SwitchRow};
use super::stage::{Intervals, OutOfReach, Stage, StageCondition};
use super::waves::{ALWAYS, Waves};
use crate::circuit::{CircuitError, StateEquations};
use nalgebra::{DMatrix, DVector};

/// How the inductor current behaves over a period.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Conduction {
    /// Never reaches zero.
    Continuous,
    /// A synchronous rectifier conducts throughout, reverse current included.
    ForcedContinuous,
    /// The rectifier blocks and the current rests at zero for part of the period.
    Discontinuous,
}

impl Conduction {
    /// The word for people and files.
    pub fn word(self) -> &'static str {
        match self {
            Conduction::Continuous => "continuous",
            Conduction::ForcedContinuous => "forced continuous",
            Conduction::Discontinuous => "discontinuous",
        }
    }
}

/// A current over one period [A].
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct CurrentFigures {
    /// Average [A].
    pub average: f64,
    /// Peak to peak of the triangular part [A].
    pub ripple: f64,
    /// Greatest value [A].
    pub peak: f64,
    /// Least value [A].
    pub least: f64,
    /// Root mean square [A].
    pub rms: f64,
}

impl CurrentFigures {
    /// Figures of a waveform of this mean and mean square [A, A²] and these extremes [A], moved to another average [A].
    pub(super) fn moved(average: f64, (mean, square): (f64, f64), (least, peak): (f64, f64)) -> Self {
        let variance = (square - mean * mean).max(0.0);
        CurrentFigures {
            average,
            ripple: peak - least,
            peak: average + peak - mean,
            least: average + least - mean,
            rms: (average * average + variance).sqrt(),
        }
    }
}

/// An inductor and its current.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct InductorFigures {
    /// Its name.
    pub name: &'static str,
    /// Its current.
    pub current: CurrentFigures,
}

/// The switched current over one period: the one that stops when switch and rectifier block.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct SwitchedCurrent {
    /// Average over the period [A].
    pub average: f64,
    /// Greatest value, as the switch opens [A].
    pub peak: f64,
    /// Least value, as the switch closes [A]; zero where it rests.
    pub valley: f64,
}

/// A conduction loss.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Loss {
    /// Where it arises.
    pub name: &'static str,
    /// Power [W].
    pub watts: f64,
}

/// The operating point of a stage at one condition.
#[derive(Clone, Debug, PartialEq)]
pub struct OperatingPoint {
    /// Fraction of the period in which the controlled switch conducts.
    pub duty: f64,
    /// How the inductor current behaves.
    pub conduction: Conduction,
    /// Regulated output voltage, as a magnitude [V].
    pub output_voltage: f64,
    /// Voltage at the load's terminals, as a magnitude [V]; the regulated one unless the second stage's drop lies between.
    pub load_voltage: f64,
    /// Input voltage at the ideal source [V].
    pub input_voltage: f64,
    /// Load current [A].
    pub load_current: f64,
    /// Average current drawn from the source [A].
    pub input_current: f64,
    /// The current that switch and rectifier carry in turn: the inductor's, or the sum of both in a stage of two.
    pub switched_current: SwitchedCurrent,
    /// Current of the controlled switch, which current modes sense, per ampere of switched current: the turns ratio of a stage
    /// with a transformer, 1 without.
    pub sense_ratio: f64,
    /// Slope of the switched current while the switch conducts [A/s].
    pub on_slope: f64,
    /// Ramp that a transformer's magnetising current adds to what is sensed at a peak, in amperes of switched current [A/s]; 0 without.
    pub natural_ramp: f64,
    /// Slope of the switched current while the rectifier conducts, negative [A/s].
    pub off_slope: f64,
    /// Fraction of the period in which the rectifier conducts, where that is not all the rest of it.
    pub second_duty: Option<f64>,
    /// Figures that only some stages have.
    pub further: Vec<Further>,
    /// The inductors: those that carry switched current first, then those of the filters; of several phases one.
    pub inductors: Vec<InductorFigures>,
    /// The controlled switch, of several phases one.
    pub switch: CurrentFigures,
    /// The rectifier, of several phases one.
    pub rectifier: CurrentFigures,
    /// RMS current of the whole output bank [A].
    pub output_bank_rms: f64,
    /// Step of the output voltage at a switching instant, from the bank's ESR [V].
    pub output_step: f64,
    /// Losses by conduction; switching, core and gate losses are not modelled.
    pub conduction_losses: Vec<Loss>,
    /// Sum of the conduction losses [W].
    pub conduction_loss: f64,
}

/// The averaged steady state at one duty ratio.
pub(super) struct Steady {
    pub(super) x: DVector<f64>,
    pub(super) output: f64,
    /// Slope of the output over the duty ratio [V].
    slope: f64,
}

impl Intervals {
    /// d·on + (1 − d)·off.
    pub(super) fn mix(&self, duty: f64, part: impl Fn(&StateEquations) -> &DMatrix<f64>) -> DMatrix<f64> {
        part(&self.on) * duty + part(&self.off) * (1.0 - duty)
    }

    pub(super) fn steady(&self, duty: f64, row: usize) -> Option<Steady> {
        let lu = self.mix(duty, |e| &e.a).lu();
        let x = lu.solve(&-(self.mix(duty, |e| &e.b) * &self.inputs))?;
        let push = (&self.on.a - &self.off.a) * &x + (&self.on.b - &self.off.b) * &self.inputs;
        let dx = lu.solve(&-push)?;
        let c = self.on.c.row(row) * duty + self.off.c.row(row) * (1.0 - duty);
        let d = self.on.d.row(row) * duty + self.off.d.row(row) * (1.0 - duty);
        let output = (&c * &x)[0] + (d * &self.inputs)[0];
        let slope = (c * dx)[0]
            + ((self.on.c.row(row) - self.off.c.row(row)) * &x)[0]
            + ((self.on.d.row(row) - self.off.d.row(row)) * &self.inputs)[0];
        (output.is_finite() && slope.is_finite()).then_some(Steady { x, output, slope })
    }

    /// The duty ratio below the conversion curve's peak that gives `target` at output `row`, and its steady state.
    ///
    /// Searched with a resistor for the load, which draws the same at the target but for ripple on ESR, then polished with the load
    /// itself: a load of constant current, or the tangent of one of constant power, can put a pole into the conversion curve, which a
    /// bracket would take for a root.
    pub(super) fn solve_duty(&self, target: f64, row: usize) -> Result<(f64, DVector<f64>), OutOfReach> {
        if self.to_resistor.1 <= 0.0 {
            return self.first_duty(target, row);
        }
        match self.with_resistor().first_duty(target, row) {
            Ok(found) => Ok(self.polished(found, target, row)),
            // The limit told is that of the load itself.
            Err(by_resistor) => Err(self.first_duty(target, row).err().unwrap_or(by_resistor)),
        }
    }

    /// Newton steps from a duty ratio that is nearly right.
    fn polished(&self, found: (f64, DVector<f64>), target: f64, row: usize) -> (f64, DVector<f64>) {
        let (start, mut duty) = (found.0, found.0);
        let mut best = found;
        for _ in 0..MOST_STEPS {
            let Some(steady) = self.steady(duty, row) else { break };
            let error = steady.output - target;
            best = (duty, steady.x);
            let next = duty - error / steady.slope;
            let near = (next - start).abs() <= NEARLY_RIGHT * start.min(1.0 - start);
            if !near || error.abs() <= 4.0 * f64::EPSILON * target.abs() || (next - duty).abs() <= f64::EPSILON * duty {
                break;
            }
            duty = next;
        }
        best
    }

    fn first_duty(&self, target: f64, row: usize) -> Result<(f64, DVector<f64>), OutOfReach> {
        let mut below = (0.0, f64::NEG_INFINITY);
        let mut best = (0.0, f64::NEG_INFINITY);
        for k in 0..=SCAN {
            // Denser towards one, where the curve of a boost bends.
            let duty = 1.0 - (1.0 - f64::from(k) / f64::from(SCAN)).powi(2);
            let Some(steady) = self.steady(duty, row) else { continue };
            if steady.output >= target {
                if k == 0 {
                    return Err(OutOfReach::Below { least: steady.output });
                }
                return self.refine(below.0, duty, target, row);
            }
            below = (duty, steady.output);
            if steady.output > best.1 {
                best = below;
            }
        }
        let (at_duty, greatest) = self.peak(best.0, row).unwrap_or(best);
        if greatest >= target {
            let step = f64::from(SCAN).recip();
            return self.refine((at_duty - 2.0 * step).max(0.0), at_duty, target, row);
        }
        Err(OutOfReach::Above { greatest, at_duty })
    }

    /// Newton steps on the output, bisecting whenever one would leave the bracket.
    fn refine(&self, low: f64, high: f64, target: f64, row: usize) -> Result<(f64, DVector<f64>), OutOfReach> {
        let (mut low, mut high) = (low, high);
        let mut duty = f64::midpoint(low, high);
        let mut state = None;
        for _ in 0..MOST_STEPS {
            let Some(steady) = self.steady(duty, row) else { break };
            let error = steady.output - target;
            if error < 0.0 {
                low = duty;
            } else {
                high = duty;
            }
            let newton = duty - error / steady.slope;
            let next = if newton > low && newton < high { newton } else { f64::midpoint(low, high) };
            let moved = (next - duty).abs();
            let done = error.abs() <= 4.0 * f64::EPSILON * target.abs() || moved <= f64::EPSILON * duty;
            state = Some((duty, steady.x));
            if done {
                break;
            }
            duty = next;
        }
        state.ok_or(OutOfReach::Above { greatest: f64::NAN, at_duty: duty })
    }

    /// The peak of the conversion curve near a duty ratio, by bisection on its slope.
    fn peak(&self, near: f64, row: usize) -> Option<(f64, f64)> {
        let step = 2.0 / f64::from(SCAN);
        let (mut low, mut high) = ((near - step).max(0.0), (near + step).min(1.0));
        for _ in 0..MOST_STEPS {
            let middle = f64::midpoint(low, high);
            if self.steady(middle, row)?.slope > 0.0 { low = middle } else { high = middle }
        }
        self.steady(low, row).map(|steady| (low, steady.output))
    }
}

/// Points of the scan for the first bracket.
const SCAN: u16 = 12;
/// How far a duty ratio may be polished, as a fraction of it and of its rest.
const NEARLY_RIGHT: f64 = 0.1;
/// Refinements halve the bracket at worst, so this many reach the last bit.
const MOST_STEPS: u32 = 60;

/// Why a stage has no operating point at a condition.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum NoOperatingPoint {
    /// No duty ratio gives the output.
    OutOfReach(OutOfReach),
    /// The netlist has no state equations.
    Circuit(CircuitError),
}

/// A solved condition: interval equations, duty ratio and averaged state.
#[derive(Clone, Debug)]
pub(super) struct Solution {
    pub(super) intervals: Intervals,
    pub(super) duty: f64,
    pub(super) x: DVector<f64>,
    /// The switched current's pulse in discontinuous conduction.
    pub(super) pulse: Option<Pulse>,
}

impl Stage {
    /// Solves the duty ratio at a condition, in whichever conduction mode holds there.
    pub(super) fn solve(&self, condition: &StageCondition) -> Result<Solution, NoOperatingPoint> {
        let solution = self.solve_continuous(condition)?;
        let (current, ..) = Waves::new(&solution, self.switching_frequency).switched_current();
        if !self.rectifier.blocks() || current.valley >= 0.0 {
            return Ok(solution);
        }
        let Solution { intervals, duty, x, .. } = solution;
        let start = Found { duty, x, pulse: None };
        let intervals = match self.intervals_from_rest(condition) {
            Some(from_rest) => from_rest.map_err(NoOperatingPoint::Circuit)?,
            None => intervals,
        };
        let found = intervals
            .solve_pulse(&start, self.switching_frequency.recip(), condition.output_voltage, self.rows.output_voltage)
            .map_err(NoOperatingPoint::OutOfReach)?;
        Ok(Solution::from_found(intervals, found))
    }

    /// Solves the duty ratio as if the rectifier let current flow back.
    fn solve_continuous(&self, condition: &StageCondition) -> Result<Solution, NoOperatingPoint> {
        let intervals = self.intervals(condition).map_err(NoOperatingPoint::Circuit)?;
        let (duty, x) = intervals
            .solve_duty(condition.output_voltage, self.rows.output_voltage)
            .map_err(NoOperatingPoint::OutOfReach)?;
        Ok(Solution { intervals, duty, x, pulse: None })
    }

    /// The averaged state at a duty ratio that is known already.
    pub(super) fn solution_at(&self, intervals: Intervals, duty: f64) -> Option<Solution> {
        let x = intervals.steady(duty, self.rows.output_voltage)?.x;
        Some(Solution { intervals, duty, x, pulse: None })
    }

    /// Output voltage at a given duty ratio in continuous conduction [V]; none where the averaged equations are singular.
    pub fn output_at_duty(&self, condition: &StageCondition, duty: f64) -> Option<f64> {
        self.intervals(condition).ok()?.steady(duty, self.rows.output_voltage).map(|steady| steady.output)
    }

    /// Currents and losses of a solved condition.
    pub(super) fn figures(&self, condition: &StageCondition, solution: &Solution) -> OperatingPoint {
        let waves = Waves::new(solution, self.switching_frequency);
        let duty = solution.duty;
        let rows: &Rows = &self.rows;
        let mut inductors: Vec<InductorFigures> = rows
            .inductors
            .iter()
            .map(|winding| InductorFigures { name: winding.name, current: waves.figures(&[winding.row], ALWAYS) })
            .collect();
        let sets = solution.intervals.sets;
        let figures_of = |switch: &SwitchRow| {
            let flows = [sets.on, sets.off, sets.idle].map(|closed| closed.contains(&switch.name));
            waves.figures(&[switch.row], flows)
        };
        let devices = self.devices(&waves, solution);
        // What the phases share.
        let shared = |rows: &[usize]| waves.summed(rows, ALWAYS, self.phases);
        let bank = shared(&rows.branch_currents);
        let input = shared(&[rows.input_current]);
        let windings: Vec<usize> = rows.inductors.iter().map(|winding| winding.row).collect();
        let further = [devices.further, of_phases(self.phases, shared(&windings), input)].concat();
        let (switched_current, on_slope, off_slope) = waves.switched_current();
        let conduction = match &solution.pulse {
            Some(_) => Conduction::Discontinuous,
            None if self.rectifier.blocks() => Conduction::Continuous,
            None => Conduction::ForcedContinuous,
        };
        let branches: f64 = rows
            .branch_currents
            .iter()
            .zip(&self.bank)
            .map(|(row, branch)| shared(&[*row]).rms.powi(2) * branch.esr)
            .sum();
        let windings = rows.inductors.iter().zip(&inductors).map(|(winding, figures)| Loss {
            name: winding.loss,
            watts: self.slot_value(winding.ohms) * figures.current.rms.powi(2),
        });
        let switches = rows.switches.iter().map(|switch| {
            let current = figures_of(switch);
            let drop = if switch.diode { self.diode_drop * current.average } else { 0.0 };
            Loss { name: switch.name, watts: self.slot_value(switch.ohms) * current.rms.powi(2) + drop }
        });
        let mut conduction_losses: Vec<Loss> = windings.chain(switches).collect();
        conduction_losses.push(Loss { name: "output bank ESR", watts: branches });
        conduction_losses.push(Loss { name: "source resistance", watts: self.source_resistance * input.rms.powi(2) });
        let lines = |row: usize| shared(&[row]);
        let (filter_inductors, filter_losses) = self.filter_figures(waves.spans(), &solution.intervals.inputs, &lines);
        for inductor in &mut inductors {
            inductor.current = inductor.current.of_one_phase(self.phases);
        }
        inductors.extend(filter_inductors);
        conduction_losses.extend(filter_losses);
        conduction_losses.retain(|loss| loss.watts > 0.0);
        OperatingPoint {
            duty,
            conduction,
            output_voltage: condition.output_voltage,
            load_voltage: self.load_voltage(condition),
            input_voltage: condition.input_voltage,
            load_current: condition.load_current,
            input_current: input.average,
            switched_current,
            sense_ratio: solution.intervals.cell.sense,
            on_slope,
            natural_ramp: devices.natural_ramp,
            off_slope,
            second_duty: solution.pulse.as_ref().map(|pulse| pulse.second_duty),
            further,
            inductors,
            switch: devices.switch,
            rectifier: devices.rectifier,
            output_bank_rms: bank.rms,
            output_step: waves.step(rows.output_voltage) / self.phases,
            conduction_loss: conduction_losses.iter().map(|loss| loss.watts).sum(),
            conduction_losses,
        }
    }

    /// Load current at which the least inductor current reaches zero [A]; none for a synchronous rectifier, or where
    /// no load reaches it.
    pub fn boundary_load(&self, condition: &StageCondition) -> Option<f64> {
        if !self.rectifier.blocks() {
            return None;
        }
        let mut load = condition.load_current;
        let (mut low, mut high, mut held) = (0.0, f64::INFINITY, false);
        // The average current is nearly proportional to the load and the ripple nearly independent of it; where losses bend that
        // too much, or the output cannot be held at a load tried, the bracket is halved.
        for step in 1..=BOUNDARY_STEPS {
            let at = StageCondition { load_current: load, ..*condition };
            let wanted = match self.solve_continuous(&at) {
                Ok(solution) => {
                    let (current, ..) = Waves::new(&solution, self.switching_frequency).switched_current();
                    if current.valley < 0.0 {
                        low = load;
                    } else {
                        (high, held) = (load, true);
                    }
                    let next = load * (current.average - current.valley) / current.average;
                    if (next / load - 1.0).abs() < BOUNDARY_WITHIN {
                        return Some(next);
                    }
                    next
                }
                Err(NoOperatingPoint::OutOfReach(OutOfReach::Above { .. })) => {
                    (high, held) = (load, false);
                    load
                }
                Err(_) => return None,
            };
            // Every fourth step halves in any case: near the greatest load that can be held the others only creep.
            let steady = low < wanted && wanted < high && (step % 4 != 0 || low <= 0.0 || high.is_infinite());
            load = match (steady, low > 0.0, high.is_finite()) {
                (true, ..) => wanted,
                (_, true, true) => (low * high).sqrt(),
                (_, _, true) => high / BOUNDARY_STRIDE,
                (_, true, _) => low * BOUNDARY_STRIDE,
                _ => return None,
            };
            if high / low - 1.0 < BOUNDARY_WITHIN {
                return held.then_some(high);
            }
        }
        None
    }
}

/// Steps granted to the search for the boundary load, …
const BOUNDARY_STEPS: u32 = 200;
/// … how near it must come, as a fraction, …
const BOUNDARY_WITHIN: f64 = 1e-10;
/// … and its stride where only one end of the bracket is known.
const BOUNDARY_STRIDE: f64 = 4.0;
