//! Interleaved phases: N equal switch cells on one input and one output, driven one after the other by a share of the period.
//!
//! *Method*: N equal phases driven alike are one phase that carries the whole current, with L/N and every resistance of the cell
//! over N: a common change of all duty ratios moves all phase currents alike, so the averaged model is exact but for one term,
//! the share of the bank's ESR that other phases drop while one conducts, which is taken as if all conducted together. Each phase
//! switches, is sensed and rests at the frequency of its own switch.
//! *Waveforms*: what the phases share (input, bank, filters) is the mean of the one-phase waveform over the N shifts by T/N, which
//! is the sum of the phases' own waveforms wherever that is a sum of switched currents. A current of one phase is an N-th.
//! *Source*: superposition; ripple cancellation of a buck as in the closed form of the tests.

use super::filter_figures::Orbit;
use super::operating_point::CurrentFigures;
use super::waves::{Flows, Waves};
use crate::circuit::{Shows, Sketch};
use crate::finding::Finding;
use crate::quantity::{Bounds, Entry, Unit};

/// Largest number of phases.
const MOST: f64 = 16.0;

/// How many phases there are.
pub(super) static PHASES: Entry = Entry::new(
    "stage.phases",
    "Phases",
    Unit::One,
    Bounds::Between(1.0, MOST),
    2.0,
    "Equal phases driven one after the other: inductor, switch and rectifier are those of one phase, input and output bank are shared. Empty for one.",
)
.optional();

/// Entries of one phase whose values stand in parallel N times.
const OF_ONE_PHASE: [&str; 5] = [
    "stage.inductor.inductance",
    "stage.inductor.resistance",
    "stage.switch.resistance",
    "stage.diode.resistance",
    "stage.synchronous.resistance",
];

/// By what an entry's value is divided to stand for all phases.
pub(super) fn divisor(path: &str, phases: f64) -> f64 {
    if OF_ONE_PHASE.contains(&path) { phases } else { 1.0 }
}

/// The number of phases from what is entered; zero stands for nothing entered.
///
/// # Errors
/// A number that is not whole.
pub(super) fn count(entered: f64) -> Result<f64, Finding> {
    if entered.fract() != 0.0 {
        let message = format!("Phases: {entered} is not a whole number.");
        return Err(Finding::problem(PHASES.path, message).with_hint("phases are counted: 1, 2, 3 …"));
    }
    Ok(entered.max(1.0))
}

/// A line of a waveform: when it begins [s], how long it lasts [s], its values at both ends.
#[derive(Clone, Copy, Debug)]
struct Line {
    start: f64,
    duration: f64,
    ends: (f64, f64),
}

impl Line {
    fn at(&self, time: f64) -> f64 {
        if self.duration > 0.0 {
            self.ends.0 + (self.ends.1 - self.ends.0) * (time - self.start) / self.duration
        } else {
            self.ends.0
        }
    }
}

impl CurrentFigures {
    /// The current of one of several equal phases that carry this together.
    pub(super) fn of_one_phase(self, phases: f64) -> Self {
        CurrentFigures {
            average: self.average / phases,
            ripple: self.ripple / phases,
            peak: self.peak / phases,
            least: self.least / phases,
            rms: self.rms / phases,
        }
    }
}

impl Waves<'_> {
    /// Figures of the sum of output rows over all phases, which are driven one after the other; the ripple is that of the whole
    /// waveform, steps included.
    pub(super) fn summed(&self, rows: &[usize], flows: Flows, phases: f64) -> CurrentFigures {
        if phases <= 1.0 {
            return self.figures(rows, flows);
        }
        let mut start = 0.0;
        let mut lines = Vec::with_capacity(3);
        for (middle, swing, duration) in self.lines(rows, flows) {
            lines.push(Line { start, duration, ends: (middle - swing / 2.0, middle + swing / 2.0) });
            start += duration;
        }
        mean_over_shifts(&lines, start, phases)
    }
}

/// Figures of the mean of a waveform of lines over its shifts by the period over the number of phases.
fn mean_over_shifts(lines: &[Line], period: f64, phases: f64) -> CurrentFigures {
    let span = period / phases;
    let mut corners: Vec<f64> = lines.iter().map(|line| line.start % span).chain([0.0, span]).collect();
    corners.sort_by(f64::total_cmp);
    let mut figures = CurrentFigures { peak: f64::NEG_INFINITY, least: f64::INFINITY, ..CurrentFigures::default() };
    let mut square = 0.0;
    for pair in corners.windows(2) {
        let [from, to] = pair else { continue };
        // What is shorter is rounding of one corner counted twice.
        if to - from <= SHORTEST * span {
            continue;
        }
        let (mut first, mut last) = (0.0, 0.0);
        let mut shift = 0.0;
        while shift < phases {
            let offset = shift * span;
            let middle = offset + f64::midpoint(*from, *to);
            if let Some(line) = lines.iter().rev().find(|line| line.start <= middle) {
                first += line.at(offset + from) / phases;
                last += line.at(offset + to) / phases;
            }
            shift += 1.0;
        }
        let share = (to - from) / span;
        figures.average += share * f64::midpoint(first, last);
        square += share * (first * first + first * last + last * last) / 3.0;
        figures.peak = figures.peak.max(first).max(last);
        figures.least = figures.least.min(first).min(last);
    }
    figures.ripple = figures.peak - figures.least;
    figures.rms = square.sqrt();
    figures
}

/// Shorter parts of a period than this share of it are rounding.
const SHORTEST: f64 = 1e-12;
/// Samples of the mean over shifts of a filter's current.
const SAMPLES: u16 = 96;

impl Orbit<'_> {
    /// Figures as [`Orbit::figures`] gives them, of the mean over the shifts of several phases.
    pub(super) fn summed(&self, row: usize, average: f64, phases: f64) -> CurrentFigures {
        if phases <= 1.0 {
            return self.figures(row, average);
        }
        let span = self.period() / phases;
        let (mut mean, mut square) = (0.0, 0.0);
        let (mut least, mut peak) = (f64::INFINITY, f64::NEG_INFINITY);
        for k in 0..SAMPLES {
            let time = span * f64::from(k) / f64::from(SAMPLES);
            let (mut value, mut shift) = (0.0, 0.0);
            while shift < phases {
                value += self.value(row, time + shift * span) / phases;
                shift += 1.0;
            }
            mean += value / f64::from(SAMPLES);
            square += value * value / f64::from(SAMPLES);
            least = least.min(value);
            peak = peak.max(value);
        }
        CurrentFigures::moved(average, (mean, square), (least, peak))
    }
}

/// Writes the number of phases at the parts of one phase, of which the schematic shows one.
pub(super) fn counted(sketch: &mut Sketch) {
    for placed in &mut sketch.parts {
        let drawn = &mut placed.drawn;
        if let Some(Shows::Entry(each)) = &drawn.value
            && OF_ONE_PHASE.contains(&each.as_str())
        {
            drawn.value = Some(Shows::Count { count: PHASES.path.to_owned(), each: each.clone() });
            drawn.paths.push(PHASES.path.to_owned());
        }
    }
}
