//! What the exact switched model says: plain results that window, terminal and sheet read.
//!
//! *Conventions*: those of the averaged results beside them: SI units, hertz, phases in degrees unwrapped like the averaged loop's.
//! A value that is not a number marks a frequency at which a reading is undefined.

use crate::analysis::Condition;
use crate::finding::Finding;
use crate::linear::{Complex, Margins};
use crate::quantity::Unit;

/// Frequency curves of the switched stage and loop, as an analyser reads them.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct ExactCurves {
    /// Frequencies [Hz], rising; those of the averaged curves.
    pub frequencies_hz: Vec<f64>,
    /// Loop gain [dB].
    pub loop_db: Vec<f64>,
    /// Its phase [°].
    pub loop_deg: Vec<f64>,
    /// Control voltage to output voltage [dB].
    pub plant_db: Vec<f64>,
    /// Its phase [°].
    pub plant_deg: Vec<f64>,
    /// Closed-loop output impedance, magnitude [Ω].
    pub output_impedance_ohm: Vec<f64>,
    /// Its phase [°], within (−180°, 180°].
    pub output_impedance_deg: Vec<f64>,
}

/// Stability of the switched loop by its multipliers: the factors by which small deviations come back after a period.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum SwitchedStability {
    /// All multipliers lie within the unit circle.
    Stable,
    /// A multiplier lies beyond −1: the loop alternates from period to period, at half the switching frequency.
    PeriodDoubling,
    /// A pair lies beyond the unit circle: the loop oscillates over several periods; on the slow scale where that is many.
    Oscillates {
        /// How fast [Hz].
        frequency_hz: f64,
    },
    /// A multiplier lies beyond +1: the operating point runs away.
    RunsAway,
}

impl SwitchedStability {
    /// True for a stable loop.
    pub fn is_stable(self) -> bool {
        self == SwitchedStability::Stable
    }

    /// How fast an unstable loop oscillates [Hz]; none for one that alternates from period to period or runs away.
    pub fn oscillation_hz(self) -> Option<f64> {
        match self {
            SwitchedStability::Oscillates { frequency_hz } => Some(frequency_hz),
            _ => None,
        }
    }

    /// The words for it.
    pub fn words(self) -> &'static str {
        match self {
            SwitchedStability::Stable => "stable",
            SwitchedStability::PeriodDoubling => "period doubling",
            SwitchedStability::Oscillates { .. } => "oscillates",
            SwitchedStability::RunsAway => "runs away",
        }
    }
}

/// What leaves its tolerance first where the averaged model ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ReachedBy {
    /// The plant.
    Plant,
    /// The loop gain.
    Loop,
}

/// Up to where the averaged model holds: plant and loop gain within 1 dB and 5° of the exact ones.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reach {
    /// The frequency [Hz]; the greatest that was looked at where it holds throughout, absent where it holds nowhere.
    pub frequency_hz: Option<f64>,
    /// Which curve leaves first there; none where it holds as far as was looked.
    pub by: Option<ReachedBy>,
    /// How far was looked [Hz].
    pub looked_to_hz: f64,
}

/// The exact results of one condition.
#[derive(Clone, Debug)]
pub struct Referee {
    /// The condition.
    pub condition: Condition,
    /// Frequency curves.
    pub curves: ExactCurves,
    /// Crossovers and margins of the loop gain as an analyser reads it, up to half the switching frequency.
    pub margins: Margins,
    /// Stability of the switched loop.
    pub stability: SwitchedStability,
    /// Multipliers of the closed loop, the greatest magnitude first.
    pub multipliers: Vec<Complex>,
    /// Up to where the averaged model holds.
    pub reach: Reach,
    /// Remarks, the gravest first.
    pub findings: Vec<Finding>,
}

impl Referee {
    /// Magnitude of the greatest multiplier: by how much the slowest deviation is multiplied every period.
    pub fn greatest_multiplier(&self) -> Option<f64> {
        self.multipliers.first().map(|multiplier| multiplier.norm())
    }
}

/// What a waveform belongs to; window and pictures sort and draw by it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum WaveKind {
    /// Voltage of the switch node.
    SwitchNode,
    /// Current of an inductor.
    Inductor,
    /// Current of the controlled switch.
    Switch,
    /// Current of the rectifier.
    Rectifier,
    /// Current into the output bank or one of its branches.
    Capacitor,
    /// Current drawn from the source.
    Input,
    /// Voltage at the load or at the sense point.
    Output,
    /// What the comparator compares.
    Control,
}

/// One quantity over one steady period.
#[derive(Clone, Debug, PartialEq)]
pub struct Wave {
    /// What it belongs to.
    pub kind: WaveKind,
    /// Its name.
    pub name: String,
    /// Times within the period [s]; the same time twice where the value jumps.
    pub times_s: Vec<f64>,
    /// Its values [V] or [A].
    pub values: Vec<f64>,
}

impl Wave {
    /// Its unit.
    pub fn unit(&self) -> Unit {
        match self.kind {
            WaveKind::SwitchNode | WaveKind::Output | WaveKind::Control => Unit::Volt,
            _ => Unit::Ampere,
        }
    }
}

/// What a part bears over a steady period.
#[derive(Clone, Debug, PartialEq)]
pub struct Stress {
    /// The part and the quantity: "switch current".
    pub name: String,
    /// Unit of the three.
    pub unit: Unit,
    /// Greatest value.
    pub peak: f64,
    /// Least value.
    pub least: f64,
    /// Root of the mean square; absent for voltages.
    pub rms: Option<f64>,
    /// Mean value.
    pub average: f64,
}

/// One steady period of the switched loop.
#[derive(Clone, Debug, PartialEq)]
pub struct Steady {
    /// The condition.
    pub condition: Condition,
    /// The period [s].
    pub period_s: f64,
    /// Waveforms.
    pub waves: Vec<Wave>,
    /// When a switch acts, and what happens [s].
    pub instants: Vec<(f64, &'static str)>,
    /// What the parts bear.
    pub stress: Vec<Stress>,
    /// Ripple of the output voltage peak to peak: whole, of the capacitances alone, of their series resistances alone [V].
    pub ripple_v: [f64; 3],
}
