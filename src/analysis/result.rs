//! What an analysis finds: plain results that window, terminal and sheet read and never change.
//!
//! *Conventions*: SI units, frequencies in hertz; phases in degrees as the sum of the factors' phases, so they are
//! unwrapped upward from low frequency; the loop gain has the sign of the negative feedback taken out. Every result
//! names the operating condition it was computed at.

use super::digital::DigitalDetail;
use super::filter_result::{InputFilterDetail, InputFilterResult};
use super::isolated::IsolatedFigures;
use crate::control::Sampling;
use crate::converter::{Landmark, OperatingPoint};
use crate::finding::Finding;
use crate::linear::{Margins, Verdict};
use crate::quantity::Unit;

/// Which of three values of a range an operating condition takes.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Level {
    /// The smallest entered value.
    Least,
    /// The nominal entered value.
    Nominal,
    /// The largest entered value.
    Greatest,
}

impl Level {
    /// All three, in rising order.
    pub const ALL: [Level; 3] = [Level::Least, Level::Nominal, Level::Greatest];

    /// The word for people.
    pub fn word(self) -> &'static str {
        match self {
            Level::Least => "least",
            Level::Nominal => "nominal",
            Level::Greatest => "greatest",
        }
    }
}

/// Input voltage and load of one operating condition.
#[derive(Clone, Debug, PartialEq)]
pub struct Condition {
    /// Input voltage [V].
    pub input_voltage: f64,
    /// Load current at the regulated output voltage [A].
    pub load_current: f64,
    /// The condition in words, with its values: "least input 9 V, greatest load 1.5 A".
    pub label: String,
    /// Levels of input voltage and load, absent for a what-if condition.
    pub levels: Option<(Level, Level)>,
}

/// Loop gain at one condition: stability and margins.
#[derive(Clone, Debug)]
pub struct LoopResult {
    /// Stability by closed-loop poles, checked by the encirclement count on the exact delay.
    pub verdict: Verdict,
    /// All crossovers and margins between fs·1e-6 and fs/2.
    pub margins: Margins,
    /// Those of a loop with a difference equation as it is sampled, all bands folded.
    pub sampled: Option<Margins>,
    /// Gain of the loop at half the switching frequency [dB].
    pub gain_at_half_switching_db: f64,
    /// Magnitude of the loop gain at the switching frequency; large values make averaged numbers doubtful.
    pub gain_at_switching: f64,
}

impl LoopResult {
    /// True when the closed loop is stable.
    pub fn stable(&self) -> bool {
        matches!(self.verdict, Verdict::Stable { .. })
    }

    /// True when it is stable, but a lower gain would make it unstable.
    pub fn conditionally_stable(&self) -> bool {
        matches!(self.verdict, Verdict::Stable { conditionally: true })
    }
}

/// Response of the regulated output to one event in the closed loop.
#[derive(Clone, Debug, PartialEq)]
pub struct Step {
    /// Times from the start of the event [s], evenly spaced.
    pub times_s: Vec<f64>,
    /// Output voltage, its steady value before the event included [V]; magnitude for an inverting output.
    pub output_v: Vec<f64>,
    /// Signed extreme of the output against its value before the event [V].
    pub deviation_v: f64,
    /// When that extreme is reached [s]; absent when it is only approached.
    pub deviation_at_s: Option<f64>,
    /// Last exit from the settling band around the final value [s]; absent when it does not settle in the time looked at.
    pub settling_s: Option<f64>,
    /// Value before the event [V].
    pub initial_v: f64,
    /// Final value [V].
    pub final_v: f64,
    /// Half width of the settling band [V].
    pub band_v: f64,
    /// Least and greatest control voltage on the way [V].
    pub control_v: (f64, f64),
    /// Size of the event in its own unit: [A] for a load step, [V] for line and reference.
    pub size: f64,
    /// Time over which the event ramps [s].
    pub rise_s: f64,
}

/// The three events at one condition. All are absent when the closed loop is not stable.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Steps {
    /// Rise in load current.
    pub load: Option<Step>,
    /// Rise in input voltage.
    pub line: Option<Step>,
    /// Rise of the reference, given as the change it asks of the output.
    pub reference: Option<Step>,
}

/// Frequency curves of one condition over a common grid. Gains in decibels, phases in degrees.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Curves {
    /// Frequencies [Hz], rising.
    pub frequencies_hz: Vec<f64>,
    /// Control voltage to output voltage, modulator included [dB].
    pub plant_db: Vec<f64>,
    /// Its phase [°].
    pub plant_deg: Vec<f64>,
    /// Output voltage to control voltage, inversion taken out [dB].
    pub compensator_db: Vec<f64>,
    /// Its phase [°].
    pub compensator_deg: Vec<f64>,
    /// Loop gain [dB].
    pub loop_db: Vec<f64>,
    /// Its phase [°].
    pub loop_deg: Vec<f64>,
    /// Closed-loop output impedance, magnitude [Ω].
    pub output_impedance_ohm: Vec<f64>,
    /// Its phase [°], within (−180°, 180°].
    pub output_impedance_deg: Vec<f64>,
    /// Open-loop output impedance, magnitude [Ω].
    pub open_loop_output_impedance_ohm: Vec<f64>,
    /// Closed-loop input voltage to output voltage [dB].
    pub line_to_output_db: Vec<f64>,
    /// Its phase [°], within (−180°, 180°].
    pub line_to_output_deg: Vec<f64>,
    /// Open-loop input voltage to output voltage, feed-forward left in [dB].
    pub open_loop_line_to_output_db: Vec<f64>,
    /// Closed-loop reference to output voltage, scaled so that 0 dB is perfect following [dB].
    pub reference_to_output_db: Vec<f64>,
    /// Its phase [°], within (−180°, 180°].
    pub reference_to_output_deg: Vec<f64>,
}

/// What a ledger row stands for; the window colours by it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LedgerRole {
    /// The 180° of the negative feedback.
    HalfTurn,
    /// A pole or zero of the compensator, amplifier ideal.
    Compensator,
    /// Difference of the real amplifier to the ideal one.
    Amplifier,
    /// What sampling and rounding make of the compensator.
    Sampling,
    /// A pole or left-half-plane zero of the power stage.
    Plant,
    /// A right-half-plane zero or pole of the power stage.
    RightHalfPlane,
    /// Propagation delay.
    Delay,
    /// Whole turns taken out so that the sum is the phase margin.
    Turns,
}

/// One row of the phase ledger.
#[derive(Clone, Debug, PartialEq)]
pub struct LedgerRow {
    /// What causes it: "integrator", "zero 0.90 kHz", "LC resonance 1.54 kHz".
    pub label: String,
    /// Its share of the phase at the crossover [°].
    pub degrees: f64,
    /// What kind of cause it is.
    pub role: LedgerRole,
    /// Key of the lane it belongs to, for compensator rows.
    pub lane: Option<&'static str>,
    /// Key of the landmark it belongs to, for rows of the stage.
    pub landmark: Option<&'static str>,
}

/// The phase at the headline crossover itemised by cause; the rows add up to the phase margin.
#[derive(Clone, Debug, PartialEq)]
pub struct Ledger {
    /// Crossover at which it is taken [Hz].
    pub frequency_hz: f64,
    /// Rows in the order: half turn, compensator, amplifier, plant, delay, turns.
    pub rows: Vec<LedgerRow>,
    /// Their sum, the phase margin [°].
    pub phase_margin_deg: f64,
}

/// The inner loop of average current mode at one condition.
#[derive(Clone, Debug)]
pub struct InnerResult {
    /// Stability of the inner loop with the control voltage at rest.
    pub verdict: Verdict,
    /// Its crossovers and margins.
    pub margins: Margins,
    /// Output of the inner amplifier that holds the operating point [V].
    pub output_voltage: f64,
    /// Least and greatest output of the inner amplifier [V].
    pub output_limits: (f64, f64),
    /// Slope of the current's falling ripple at the inner amplifier's output over the ramp's slope.
    pub slope_ratio: f64,
}

/// What the control law comes to at one condition.
#[derive(Clone, Debug)]
pub struct ControlFigures {
    /// Control voltage that holds the operating point [V].
    pub control_voltage: f64,
    /// Sampling figures of peak and valley current mode in continuous conduction.
    pub sampling: Option<Sampling>,
    /// The inner loop of average current mode.
    pub inner: Option<InnerResult>,
}

/// Everything about the one condition that is shown in full.
#[derive(Clone, Debug)]
pub struct Detail {
    /// The condition.
    pub condition: Condition,
    /// Duty ratio, currents, losses.
    pub operating_point: OperatingPoint,
    /// Load current at which a diode's stage enters discontinuous conduction [A]; none for a synchronous rectifier.
    pub boundary_load: Option<f64>,
    /// Lowest right-half-plane zero of the derived plant [Hz].
    pub right_half_plane_zero_hz: Option<f64>,
    /// Textbook frequencies of the plant.
    pub landmarks: Vec<Landmark>,
    /// Stability and margins.
    pub loop_gain: LoopResult,
    /// Frequency curves on the requested grid.
    pub curves: Curves,
    /// The difference equation, where the compensator is one.
    pub digital: Option<DigitalDetail>,
    /// Input filter against converter, where one is fitted.
    pub input_filter: Option<InputFilterDetail>,
    /// Operating point and ends of the transfer ratio, where the feedback is isolated.
    pub isolated: Option<IsolatedFigures>,
    /// Time responses.
    pub steps: Steps,
    /// Phase ledger; absent when the loop has no crossover.
    pub ledger: Option<Ledger>,
    /// Control voltage that holds the operating point, sampling figures, inner loop.
    pub control: ControlFigures,
    /// Compensating ramp of peak and valley current mode [V/s at the comparator].
    pub ramp: Option<f64>,
}

/// The results of one of the nine conditions.
#[derive(Clone, Debug)]
pub struct ConditionResult {
    /// The condition.
    pub condition: Condition,
    /// The results, or why there are none.
    pub outcome: Result<ConditionSummary, Finding>,
}

/// What every condition is worked out to at every edit.
#[derive(Clone, Debug)]
pub struct ConditionSummary {
    /// Duty ratio, currents, losses.
    pub operating_point: OperatingPoint,
    /// Stability and margins.
    pub loop_gain: LoopResult,
    /// Control voltage that holds the operating point, sampling figures, inner loop.
    pub control: ControlFigures,
    /// Load step; absent when unstable.
    pub load_step: Option<StepFigures>,
    /// Input filter against converter, where one is fitted.
    pub input_filter: Option<InputFilterResult>,
    /// Operating point and ends of the transfer ratio, where the feedback is isolated.
    pub isolated: Option<IsolatedFigures>,
    /// Lowest right-half-plane zero of the plant [Hz].
    pub right_half_plane_zero_hz: Option<f64>,
    /// Loop gain on the band grid [dB].
    pub loop_db: Vec<f64>,
    /// Loop phase on the band grid [°].
    pub loop_deg: Vec<f64>,
}

/// The figures of a step without its curve.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StepFigures {
    /// Signed extreme against the value before [V].
    pub deviation_v: f64,
    /// Last exit from the settling band [s].
    pub settling_s: Option<f64>,
}

/// Which way a limit works.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LimitKind {
    /// The value must not be below the limit.
    AtLeast,
    /// The value must not be above the limit.
    AtMost,
}

/// One requirement and whether it is met.
#[derive(Clone, Debug, PartialEq)]
pub struct RequirementVerdict {
    /// Path of the entry that states it.
    pub path: &'static str,
    /// Its name for people.
    pub name: &'static str,
    /// Unit of limit and value.
    pub unit: Unit,
    /// Which way the limit works.
    pub kind: LimitKind,
    /// The limit.
    pub limit: f64,
    /// The value held against it; absent when it cannot be evaluated.
    pub value: Option<f64>,
    /// Whether it is met. One that cannot be evaluated is not met.
    pub met: bool,
    /// Why it could not be evaluated, or an empty text.
    pub reason: String,
    /// The condition at which the value was found.
    pub condition: String,
    /// Key of the read-out it belongs to.
    pub readout: &'static str,
    /// True for a limit on the worst of the nine conditions, false for one on the nominal condition.
    pub over_all_conditions: bool,
}

/// One number of the neutral list that window, terminal and sheet print.
#[derive(Clone, Debug, PartialEq)]
pub struct Readout {
    /// Stable key: "crossover", "phase-margin", …
    pub key: &'static str,
    /// Name for people.
    pub name: &'static str,
    /// Unit.
    pub unit: Unit,
    /// Value at the shown condition; absent when there is none.
    pub value: Option<f64>,
    /// What to print when there is no value: "none", "infinite", "unstable".
    pub absent: &'static str,
    /// True when the value is not to be trusted as a headline, as margins of an unstable loop.
    pub greyed: bool,
    /// Worst value over the nine conditions and where it was found.
    pub worst: Option<Worst>,
    /// Least and greatest value over the nine conditions, where both ways matter.
    pub range: Option<[Worst; 2]>,
    /// Verdicts of the requirements on this number.
    pub requirements: Vec<RequirementVerdict>,
    /// What to say in place of a zero, where a zero would mislead: "stays within ±1 %" for a settling time.
    pub at_zero: Option<String>,
    /// What the number means, with its formula.
    pub help: &'static str,
}

impl Readout {
    /// A value of this read-out for people, with its unit: with so many digits, or in the words for a zero.
    pub fn said(&self, value: f64, digits: usize) -> String {
        match &self.at_zero {
            Some(words) if value == 0.0 => words.clone(),
            _ => crate::quantity::print_digits(value, self.unit, digits),
        }
    }
}

/// A worst value and where it was found.
#[derive(Clone, Debug, PartialEq)]
pub struct Worst {
    /// The value; absent when at that condition there is none (unstable, no operating point).
    pub value: Option<f64>,
    /// Label of the condition.
    pub condition: String,
    /// Index into the nine conditions.
    pub index: usize,
}

/// One edge of the crossover window.
#[derive(Clone, Debug, PartialEq)]
pub struct WindowEdge {
    /// Frequency [Hz].
    pub frequency_hz: f64,
    /// What sets it: "2 × LC resonance at greatest input 16 V, ...".
    pub cause: String,
    /// Whether an LC resonance sets it, which conditions in discontinuous conduction do not have.
    pub of_resonance: bool,
}

/// The band of crossover frequencies the stage allows.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct CrossoverWindow {
    /// Lowest useful crossover; absent when nothing sets one.
    pub lower: Option<WindowEdge>,
    /// Highest safe crossover; absent when nothing sets one.
    pub upper: Option<WindowEdge>,
    /// Why it is empty and what would open it, or an empty text.
    pub empty: String,
}

/// All results of a checked design.
#[derive(Clone, Debug)]
pub struct Analysis {
    /// The condition shown in full, or why it cannot be computed.
    pub shown: Result<Box<Detail>, Finding>,
    /// Condition that was asked for, even where it could not be computed.
    pub condition: Condition,
    /// The nine conditions, input voltage outermost, both rising.
    pub conditions: Vec<ConditionResult>,
    /// Frequencies of the bands in [`ConditionSummary`] [Hz].
    pub band_frequencies_hz: Vec<f64>,
    /// The neutral list of read-outs.
    pub readouts: Vec<Readout>,
    /// All requirements of the design.
    pub requirements: Vec<RequirementVerdict>,
    /// The crossover window.
    pub window: CrossoverWindow,
    /// Remarks, the gravest first.
    pub findings: Vec<Finding>,
}

impl Analysis {
    /// The condition shown with its conduction mode: "nominal input 12 V, nominal load 50 mA, discontinuous conduction".
    pub fn place(&self) -> String {
        match &self.shown {
            Ok(detail) => format!("{}, {} conduction", self.condition.label, detail.operating_point.conduction.word()),
            Err(_) => self.condition.label.clone(),
        }
    }

    /// True when every stated requirement is met.
    pub fn all_met(&self) -> bool {
        self.requirements.iter().all(|requirement| requirement.met)
    }
}
