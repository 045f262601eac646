//! The search for the orbit: Newton steps on start state and switching instants together.
//!
//! *Method*: one sweep over the period gives what is missing for the state to repeat, for the comparator to trip and for the rectifier's
//! current to be at rest where they should, and how all of these answer start state, instants and control voltage: exact
//! derivatives, carried through the phases. For given instants the equations are linear in the state, so a first solve gives the
//! start state; the bordered system stays regular where an integrator alone would make the state's own part singular.

use super::flow::{Flow, ReadFlow};
use super::phase::{Event, Instants, Phase, phases};
use super::system::{Rule, SwitchedSystem};
use nalgebra::{DMatrix, DVector, RowDVector};

/// Newton steps granted; four are usual.
const MOST_STEPS: usize = 60;
/// A step of the instants below this share of the period is followed by one more, which reaches the last digits.
const NEARLY: f64 = 1e-7;
/// Of the least gap between events, what one step may take away.
const MOST_OF_A_GAP: f64 = 0.7;

/// What the search varies.
#[derive(Clone, Debug)]
pub(super) struct Guess {
    pub(super) x: DVector<f64>,
    pub(super) instants: Instants,
    pub(super) inputs: DVector<f64>,
}

/// What is sought beside a state that repeats.
#[derive(Clone, Copy, Debug)]
pub(super) struct Wanted {
    /// Column of the control voltage and the mean output voltage it must give [V]; none where nothing is varied.
    pub(super) output: Option<(usize, f64)>,
}

/// A sweep over a period.
pub(super) struct Sweep {
    pub(super) phases: Vec<Phase>,
    /// States as each phase begins and ends.
    pub(super) starts: Vec<DVector<f64>>,
    pub(super) ends: Vec<DVector<f64>>,
    /// What is missing, and how it answers states, comparator, rest, control.
    residual: DVector<f64>,
    jacobian: DMatrix<f64>,
}

/// Places behind the states in residual and Jacobian.
const COMPARE: usize = 0;
const REST: usize = 1;
const OUTPUT: usize = 2;
const FURTHER: usize = 3;

/// State and derivatives on their way through the period.
struct Carried {
    x: DVector<f64>,
    by: DMatrix<f64>,
    mean: f64,
    mean_by: RowDVector<f64>,
}

/// The search in one conduction mode.
pub(super) struct Search<'a> {
    pub(super) system: &'a SwitchedSystem,
    pub(super) wanted: Wanted,
}

impl Search<'_> {
    /// The repeating orbit from a guess; none where the steps leave what can be or do not settle.
    pub(super) fn find(&self, mut guess: Guess) -> Option<(Guess, Sweep)> {
        let n = self.system.order();
        let active = self.active(&guess);
        let start = self.sweep(&guess)?;
        let own = start.jacobian.view((0, 0), (n, n)).into_owned();
        if let Some(step) = solve(own, &start.residual.rows(0, n).into_owned()) {
            guess.x += step;
        }
        let mut nearly = false;
        for _ in 0..MOST_STEPS {
            let sweep = self.sweep(&guess)?;
            if nearly {
                return sweep.ends.iter().all(|x| x.iter().all(|v| v.is_finite())).then_some((guess, sweep));
            }
            let jacobian = sweep.jacobian.select_columns(&active).select_rows(&active);
            let step = solve(jacobian, &sweep.residual.select_rows(&active))?;
            nearly = self.step(&mut guess, &sweep, &active, &step);
        }
        None
    }

    /// Takes a step, shortened where events would change places; whether it was so small that the next reaches the last digits.
    fn step(&self, guess: &mut Guess, sweep: &Sweep, active: &[usize], step: &DVector<f64>) -> bool {
        let n = self.system.order();
        let part = |what: usize| active.iter().position(|k| *k == n + what).map_or(0.0, |place| step[place]);
        let moves = [part(COMPARE), part(REST)];
        let mut before = [0.0; 2];
        let mut share = 1.0_f64;
        for phase in &sweep.phases {
            let after = phase.end.moves();
            let change: f64 = (0..2).map(|k| (after[k] - before[k]) * moves[k]).sum();
            if phase.length_s > 0.0 && change < -MOST_OF_A_GAP * phase.length_s {
                share = share.min(-MOST_OF_A_GAP * phase.length_s / change);
            }
            before = after;
        }
        for (place, k) in active.iter().enumerate() {
            if *k < n {
                guess.x[*k] += share * step[place];
            }
        }
        guess.instants.compare += share * moves[0];
        if let Some(rest) = &mut guess.instants.rest {
            *rest += share * moves[1];
        }
        if let Some((column, _)) = self.wanted.output {
            guess.inputs[column] += share * part(OUTPUT);
        }
        share >= 1.0 && moves.iter().all(|m| m.abs() <= NEARLY * self.system.period_s)
    }

    /// What is varied: states, and of comparator, rest and control what there is.
    fn active(&self, guess: &Guess) -> Vec<usize> {
        let n = self.system.order();
        let compared = matches!(self.system.rule, Rule::Compared(_));
        let further =
            [(COMPARE, compared), (REST, guess.instants.rest.is_some()), (OUTPUT, self.wanted.output.is_some())];
        (0..n).chain(further.into_iter().filter(|(_, on)| *on).map(|(k, _)| n + k)).collect()
    }

    /// One period from a guess; none where an exponential leaves the number range.
    pub(super) fn sweep(&self, guess: &Guess) -> Option<Sweep> {
        let (system, n) = (self.system, self.system.order());
        let phases = phases(&system.rule, guess.instants, system.period_s);
        let mut carried = Carried {
            x: guess.x.clone(),
            by: DMatrix::identity(n, n + FURTHER),
            mean: 0.0,
            mean_by: RowDVector::zeros(n + FURTHER),
        };
        let mut residual = DVector::zeros(n + FURTHER);
        let mut jacobian = DMatrix::zeros(n + FURTHER, n + FURTHER);
        let (mut starts, mut ends) = (Vec::with_capacity(phases.len()), Vec::with_capacity(phases.len()));
        let mut before = [0.0; 2];
        for phase in &phases {
            starts.push(carried.x.clone());
            let after = phase.end.moves();
            self.through(phase, guess, &mut carried, [after[0] - before[0], after[1] - before[1]])?;
            before = after;
            ends.push(carried.x.clone());
            self.at_event(phase, guess, &mut carried, (&mut residual, &mut jacobian));
        }
        residual.rows_mut(0, n).copy_from(&(&carried.x - &guess.x));
        let mut own = carried.by;
        for k in 0..n {
            own[(k, k)] -= 1.0;
        }
        jacobian.rows_mut(0, n).copy_from(&own);
        if let Some((_, target)) = self.wanted.output {
            residual[n + OUTPUT] = carried.mean / system.period_s - target;
            jacobian.row_mut(n + OUTPUT).copy_from(&(carried.mean_by / system.period_s));
        }
        Some(Sweep { phases, starts, ends, residual, jacobian })
    }

    /// Carries state and derivatives through a phase whose length follows the instants by `lengthens`.
    fn through(&self, phase: &Phase, guess: &Guess, carried: &mut Carried, lengthens: [f64; 2]) -> Option<()> {
        let (system, n) = (self.system, self.system.order());
        let piece = system.piece(phase.configuration);
        let flow = if let Some((column, _)) = self.wanted.output {
            let place = (system.places.stage.output_voltage, column);
            let read = ReadFlow::new(piece, &guess.inputs, phase.length_s, place).ok()?;
            carried.mean += (&read.read * &carried.x)[0] + read.read_push;
            carried.mean_by += &read.read * &carried.by;
            carried.mean_by[n + OUTPUT] += read.read_control;
            carried.by = &read.flow.map * &carried.by;
            let mut by_control = carried.by.column_mut(n + OUTPUT);
            by_control += read.control;
            read.flow
        } else {
            let flow = Flow::new(piece, &guess.inputs, phase.length_s).ok()?;
            if phase.length_s != 0.0 {
                carried.by = &flow.map * &carried.by;
            }
            flow
        };
        carried.x = flow.end(&carried.x);
        if lengthens.iter().any(|k| *k != 0.0) {
            let rates = piece.rates(&carried.x, &guess.inputs);
            let output = piece.value(system.places.stage.output_voltage, &carried.x, &guess.inputs);
            for (k, lengthens) in lengthens.into_iter().enumerate() {
                carried.by.column_mut(n + k).axpy(lengthens, &rates, 1.0);
                carried.mean_by[n + k] += lengthens * output;
            }
        }
        Some(())
    }

    /// What an event misses by, and what it does to the state.
    fn at_event(
        &self,
        phase: &Phase,
        guess: &Guess,
        carried: &mut Carried,
        (residual, jacobian): (&mut DVector<f64>, &mut DMatrix<f64>),
    ) {
        let (system, n) = (self.system, self.system.order());
        let piece = system.piece(phase.configuration);
        match (phase.end, &system.rule, &system.rest) {
            (Event::Compare, Rule::Compared(comparator), _) => {
                let rate = system.ramp_rate(&guess.inputs);
                let value = piece.value(comparator.row, &carried.x, &guess.inputs);
                residual[n + COMPARE] =
                    value - comparator.valley_v - rate * (guess.instants.compare + comparator.since_s);
                let mut row = piece.c.row(comparator.row) * &carried.by;
                row[n + COMPARE] -= rate;
                if let Some((column, _)) = self.wanted.output {
                    row[n + OUTPUT] += piece.d[(comparator.row, column)];
                }
                jacobian.row_mut(n + COMPARE).copy_from(&row);
            }
            (Event::Rest, _, Some(rest)) => {
                residual[n + REST] = (rest * &carried.x)[0];
                jacobian.row_mut(n + REST).copy_from(&(rest * &carried.by));
                carried.x = &system.rest_projector * &carried.x;
                carried.by = &system.rest_projector * &carried.by;
            }
            (Event::Clock, ..) => {
                if let Some(rotation) = &system.rotation {
                    carried.x = rotation * &carried.x;
                    carried.by = rotation * &carried.by;
                }
            }
            _ => {}
        }
    }
}

/// Solves jacobian·step = −residual with rows and columns brought to one size; none where it is singular or not finite.
fn solve(mut jacobian: DMatrix<f64>, residual: &DVector<f64>) -> Option<DVector<f64>> {
    let mut right = -residual;
    let sizes: Vec<f64> = jacobian.column_iter().map(|column| column.amax()).collect();
    for (mut column, size) in jacobian.column_iter_mut().zip(&sizes) {
        column /= *size;
    }
    for (mut row, value) in jacobian.row_iter_mut().zip(right.iter_mut()) {
        let size = row.amax();
        row /= size;
        *value /= size;
    }
    let mut step = jacobian.lu().solve(&right)?;
    for (value, size) in step.iter_mut().zip(&sizes) {
        *value /= size;
    }
    step.iter().all(|v| v.is_finite()).then_some(step)
}
