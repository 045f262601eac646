//! The load sweep: how duty ratio, conduction and the loop change over the load, from deep light load beyond the greatest.
//!
//! Computed on request: some eighty operating points are eight analyses of nine.

use super::analyse::loop_at;
use super::loop_model::Shared;
use super::result::{Condition, Level, LoopResult};
use crate::converter::Conduction;
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::linear::Verdict;

/// Points per input voltage when nobody asks for another number.
pub const SWEEP_POINTS: usize = 25;
/// The sweep starts at this share of the least load, …
const BELOW_LEAST: f64 = 0.1;
/// … or at this share of a boundary that lies lower, so that both modes are seen, …
const BELOW_BOUNDARY: f64 = 0.3;
/// … and ends at this multiple of the greatest load.
const ABOVE_GREATEST: f64 = 1.2;
/// How near the points on either side of the boundary stand to it, as a fraction.
const BESIDE: f64 = 1e-6;

/// Results over the load current at least, nominal and greatest input voltage.
#[derive(Clone, Debug)]
pub struct LoadSweep {
    /// One line per input voltage, rising.
    pub lines: Vec<LoadSweepLine>,
}

/// Results over the load current at one input voltage.
#[derive(Clone, Debug)]
pub struct LoadSweepLine {
    /// Which input voltage.
    pub level: Level,
    /// Input voltage [V].
    pub input_voltage: f64,
    /// Load current below which conduction is discontinuous [A]; none where it never is. Where it lies within the sweep a
    /// point stands close to either side of it, so that what jumps there is seen to jump.
    pub boundary_load: Option<f64>,
    /// Points, load current rising.
    pub points: Vec<LoadSweepPoint>,
}

/// One load current.
#[derive(Clone, Debug)]
pub struct LoadSweepPoint {
    /// Load current at the regulated output [A].
    pub load_current: f64,
    /// The results, or why there are none.
    pub outcome: Result<LoadSweepFigures, Finding>,
}

/// Duty ratio and loop at one load current.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LoadSweepFigures {
    /// Duty ratio.
    pub duty: f64,
    /// How the switched current behaves.
    pub conduction: Conduction,
    /// Headline crossover [Hz]; none where the loop gain never is one.
    pub crossover_hz: Option<f64>,
    /// Phase margin there [°].
    pub phase_margin_deg: Option<f64>,
    /// How far the gain may rise [dB]; none where nothing below half the switching frequency limits it.
    pub gain_margin_db: Option<f64>,
    /// Whether the closed loop is stable; none where that is undecided.
    pub stable: Option<bool>,
}

impl LoadSweepFigures {
    fn new(duty: f64, conduction: Conduction, result: &LoopResult) -> Self {
        let crossover = result.margins.headline_crossover();
        LoadSweepFigures {
            duty,
            conduction,
            crossover_hz: crossover.map(|c| c.frequency_hz),
            phase_margin_deg: crossover.map(|c| c.phase_margin_deg),
            gain_margin_db: result.margins.gain_margin_up_db(),
            stable: match result.verdict {
                Verdict::Stable { .. } => Some(true),
                Verdict::Unstable { .. } => Some(false),
                Verdict::Undecided { .. } => None,
            },
        }
    }
}

/// Sweeps the load of a design with so many points per input voltage, evenly spaced in its logarithm, and two more where
/// conduction changes.
///
/// # Errors
/// A finding when the compensator cannot be solved.
pub fn load_sweep(design: &CheckedDesign, points: usize) -> Result<LoadSweep, Finding> {
    let shared = Shared::new(design)?;
    let stage = &design.stage;
    let boundaries = Level::ALL.map(|level| {
        let condition = Condition::at_levels(stage, level, Level::Nominal).of_stage(stage);
        stage.boundary_load(&condition)
    });
    let [least, _, greatest] = stage.load_currents;
    let lowest = boundaries.iter().flatten().map(|b| b * BELOW_BOUNDARY);
    let from = lowest.fold(least * BELOW_LEAST, f64::min);
    let to = greatest * ABOVE_GREATEST;
    let lines = Level::ALL.into_iter().zip(boundaries).map(|(level, boundary_load)| {
        let input_voltage = stage.input_voltages[level as usize];
        let beside = boundary_load.into_iter().flat_map(|b| [b * (1.0 - BESIDE), b * (1.0 + BESIDE)]);
        let mut loads = super::analyse::logarithmic(from, to, points);
        loads.extend(beside.filter(|load| (from..=to).contains(load)));
        loads.sort_by(f64::total_cmp);
        let point = |load_current| LoadSweepPoint {
            load_current,
            outcome: figures(design, &shared, &Condition::what_if(input_voltage, load_current)),
        };
        LoadSweepLine { level, input_voltage, boundary_load, points: loads.into_iter().map(point).collect() }
    });
    Ok(LoadSweep { lines: lines.collect() })
}

fn figures(design: &CheckedDesign, shared: &Shared, condition: &Condition) -> Result<LoadSweepFigures, Finding> {
    let (model, result, _) = loop_at(design, shared, condition)?;
    let point = &model.averaged.operating_point;
    Ok(LoadSweepFigures::new(point.duty, point.conduction, &result))
}
