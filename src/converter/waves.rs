//! Straight-line waveforms over one period around the averaged state, and the figures read off them.

use super::operating_point::{CurrentFigures, Solution, SwitchedCurrent};
use crate::circuit::StateEquations;
use nalgebra::DVector;

/// One interval of the period.
struct Segment<'a> {
    equations: &'a StateEquations,
    /// States in its middle.
    middle: &'a DVector<f64>,
    /// Their rates of change [1/s].
    rate: DVector<f64>,
    /// How long it lasts [s].
    duration: f64,
}

/// In which intervals a current flows: while the switch conducts, while the rectifier does, while neither does.
pub(super) type Flows = [bool; 3];

/// A current that flows throughout.
pub(super) const ALWAYS: Flows = [true; 3];
/// The waveforms of a solved condition.
pub(super) struct Waves<'a> {
    solution: &'a Solution,
    segments: Vec<Segment<'a>>,
    period: f64,
}

impl<'a> Waves<'a> {
    pub(super) fn new(solution: &'a Solution, switching_frequency: f64) -> Self {
        let i = &solution.intervals;
        let period = switching_frequency.recip();
        let segment = |equations: &'a StateEquations, middle: &'a DVector<f64>, share: f64| Segment {
            equations,
            middle,
            rate: &equations.a * middle + &equations.b * &i.inputs,
            duration: share * period,
        };
        let duty = solution.duty;
        let segments = match &solution.pulse {
            None => vec![segment(&i.on, &solution.x, duty), segment(&i.off, &solution.x, 1.0 - duty)],
            Some(pulse) => vec![
                segment(&i.on, &pulse.conducting, duty),
                segment(&i.off, &pulse.conducting, pulse.second_duty),
                segment(&i.cell.idle, &pulse.resting, (1.0 - duty - pulse.second_duty).max(0.0)),
            ],
        };
        Waves { solution, segments, period }
    }

    /// Equations and duration [s] of each interval.
    pub(super) fn spans(&self) -> Vec<(&'a StateEquations, f64)> {
        self.segments.iter().map(|segment| (segment.equations, segment.duration)).collect()
    }

    /// Middle value and swing of the sum of output rows in one interval.
    fn line(&self, rows: &[usize], segment: &Segment<'_>) -> (f64, f64) {
        rows.iter().fold((0.0, 0.0), |(middle, swing), &row| {
            let c = segment.equations.c.row(row);
            let direct = segment.equations.d.row(row) * &self.solution.intervals.inputs;
            (middle + (c * segment.middle)[0] + direct[0], swing + (c * &segment.rate)[0] * segment.duration)
        })
    }

    /// The switched current with its slopes while switch and rectifier conduct [A/s].
    pub(super) fn switched_current(&self) -> (SwitchedCurrent, f64, f64) {
        let c = &self.solution.intervals.cell.c;
        let slope = |k: usize| self.segments.get(k).map_or(0.0, |s| (c * &s.rate)[0]);
        let (on, off) = (slope(0), slope(1));
        let average = (c * &self.solution.x)[0];
        let half = on * self.solution.duty * self.period / 2.0;
        let current = match &self.solution.pulse {
            None => SwitchedCurrent { average, peak: average + half, valley: average - half },
            Some(pulse) => SwitchedCurrent { average, peak: 2.0 * pulse.half, valley: 0.0 },
        };
        (current, on, off)
    }

    /// Middle value, swing and duration [s] of the sum of output rows in each interval, which flows in those marked.
    pub(super) fn lines(&self, rows: &[usize], flows: Flows) -> Vec<(f64, f64, f64)> {
        let segments = self.segments.iter().zip(flows);
        let line = |segment: &Segment<'_>, flows| if flows { self.line(rows, segment) } else { (0.0, 0.0) };
        segments.map(|(segment, flows)| (line(segment, flows), segment.duration)).map(|((m, s), d)| (m, s, d)).collect()
    }

    /// Figures of the sum of output rows, which flows in the intervals marked.
    pub(super) fn figures(&self, rows: &[usize], flows: Flows) -> CurrentFigures {
        figures_of_lines(&self.lines(rows, flows))
    }

    /// Jump of an output where the switch opens, the states holding still.
    pub(super) fn step(&self, row: usize) -> f64 {
        let [on, off, ..] = self.segments.as_slice() else { return 0.0 };
        let ((on, rise), (off, fall)) = (self.line(&[row], on), self.line(&[row], off));
        ((off - fall / 2.0) - (on + rise / 2.0)).abs()
    }
}

/// Figures of a current of lines: middle value, swing and duration [s] of each, a whole period in all.
pub(super) fn figures_of_lines(lines: &[(f64, f64, f64)]) -> CurrentFigures {
    if lines.is_empty() {
        return CurrentFigures::default();
    }
    let period: f64 = lines.iter().map(|line| line.2).sum();
    let mut figures = CurrentFigures { peak: f64::NEG_INFINITY, least: f64::INFINITY, ..CurrentFigures::default() };
    let mut square = 0.0;
    for (middle, swing, duration) in lines {
        let share = duration / period;
        figures.average += share * middle;
        square += share * (middle * middle + swing * swing / 12.0);
        figures.peak = figures.peak.max(middle + swing.abs() / 2.0);
        figures.least = figures.least.min(middle - swing.abs() / 2.0);
        figures.ripple = figures.ripple.max(swing.abs());
    }
    figures.rms = square.sqrt();
    figures
}
