//! What a topology says of itself: how it is drawn, its own rows, which switches close when, and its textbook forms.
//!
//! Everything else is derived from the netlist it draws; textbook forms serve as landmarks and first sizes only.

use super::drawing::{RECTIFIER, SWITCH, StageDrawing};
use super::landmark::{Form, RestingForms};
use super::sizing::{Sized, Sizing};
use super::stage::StageCondition;
use super::topology_entries::always;
use crate::quantity::{Choice, Choices, Entry};

/// A power-stage topology. One file reads like its schematic.
#[derive(Debug)]
pub struct Topology {
    /// Word in files and on the command line.
    pub key: &'static str,
    /// Name shown.
    pub name: &'static str,
    /// What it does, in one line.
    pub line: &'static str,
    /// Where its output can stand against the input it sees, [`Topology::seen_input`].
    pub reach: Reach,
    /// Draws the stage's own parts.
    pub draw: fn(&mut StageDrawing),
    /// Numbers that only some topologies have. A row at the path of a common one stands in for it: another name and help.
    pub entries: &'static [&'static Entry],
    /// Choices that only some topologies have.
    pub choices: &'static [&'static Choice],
    /// Whether one of its own rows, by path, plays a part under the choices made.
    pub applies: fn(&str, &Choices) -> bool,
    /// Which switches conduct in which interval, one set per region of operation.
    pub switching: &'static [SwitchSets],
    /// The region at a condition: an index into `switching`.
    pub region: fn(&StageCondition) -> usize,
    /// Pulses at the rectifier per period of one switch: 2 for a double-ended stage.
    pub pulses: u8,
    /// Share of the input voltage that its transformer's first winding sees.
    pub input_share: f64,
    /// Lossless duty ratio in continuous conduction.
    pub ideal_duty: fn(&Voltages) -> f64,
    /// Greatest duty ratio that the circuit bears, whatever the modulator gives, from its entries by path.
    pub duty_limit: fn(&Entered<'_>) -> Option<DutyLimit>,
    /// Share of the slope of a transformer's magnetising current that acts as a ramp on the sensed current; 0 where that current is
    /// the switched one itself, or there is none.
    pub magnetising_ramp: f64,
    /// Greatest voltage between two points of the circuit [V], without ringing.
    pub highest_voltage: fn(&Voltages) -> f64,
    /// Textbook landmarks of continuous conduction, in the order shown.
    pub landmarks: &'static [Form],
    /// What holds in their place in discontinuous conduction.
    pub resting: RestingForms,
    /// First sizes of its own parts for a new design.
    pub sizing: fn(&Sizing) -> Vec<Sized>,
    /// What its model leaves out: remarks shown beside its results.
    pub left_out: &'static [LeftOut],
}

/// Voltages that a textbook form starts from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Voltages {
    /// Input [V].
    pub input: f64,
    /// Output, as a magnitude [V].
    pub output: f64,
    /// Turns ratio, second to first; 1 without a transformer.
    pub ratio: f64,
}

/// Where a topology's output can stand against its input.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reach {
    /// Below the input voltage.
    BelowInput,
    /// Above the input voltage.
    AboveInput,
    /// Anywhere.
    Any,
}

/// Which switches conduct in the three intervals of a period, by their names in the netlist.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct SwitchSets {
    /// Name of the region of operation for people; empty where there is only one.
    pub name: &'static str,
    /// Conduct while the controlled switch does.
    pub on: &'static [&'static str],
    /// Conduct while the rectifier does.
    pub off: &'static [&'static str],
    /// Conduct while the current rests.
    pub idle: &'static [&'static str],
    /// The controlled switch: its current is sensed.
    pub switch: &'static str,
    /// The rectifier: its current is the switched one while it conducts, and rests where it blocks.
    pub rectifier: &'static str,
}

/// One switch and one rectifier in turn.
pub static IN_TURN: &[SwitchSets] =
    &[SwitchSets { name: "", on: &[SWITCH], off: &[RECTIFIER], idle: &[], switch: SWITCH, rectifier: RECTIFIER }];

/// Entered values by path.
pub type Entered<'a> = dyn Fn(&str) -> f64 + 'a;

/// A greatest duty ratio that the circuit sets.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DutyLimit {
    /// The duty ratio.
    pub greatest: f64,
    /// Path of the entry that sets it.
    pub place: &'static str,
    /// How, and what happens above it.
    pub why: &'static str,
}

/// A remark about what a topology's model leaves out.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct LeftOut {
    /// Path of the entry it belongs to.
    pub place: &'static str,
    /// What is left out, and what that costs.
    pub message: &'static str,
    /// What to do about it.
    pub hint: &'static str,
}

impl Topology {
    /// What most topologies have in common, to be taken over where nothing else is said.
    pub const COMMON: Topology = Topology {
        key: "",
        name: "",
        line: "",
        reach: Reach::Any,
        draw: |_| {},
        entries: &[],
        choices: &[],
        applies: always,
        switching: IN_TURN,
        region: |_| 0,
        pulses: 1,
        input_share: 1.0,
        ideal_duty: |_| f64::NAN,
        duty_limit: |_| None,
        magnetising_ramp: 0.0,
        highest_voltage: |v| v.input.max(v.output),
        landmarks: &[],
        resting: RestingForms::NONE,
        sizing: |_| Vec::new(),
        left_out: &[],
    };

    /// Voltage the output is held against in [`Reach`] [V]: the input by the transformer's turns ratio.
    pub fn seen_input(&self, input: f64, ratio: f64) -> f64 {
        input * ratio * self.input_share
    }

    /// Its own row at a path.
    pub fn entry(&self, path: &str) -> Option<&'static Entry> {
        self.entries.iter().copied().find(|entry| entry.path == path)
    }

    /// Whether it has a row of its own, number or choice, at a path.
    pub(super) fn has(&self, path: &str) -> bool {
        self.entry(path).is_some() || self.choices.iter().any(|choice| choice.path == path)
    }

    /// The textbook landmark of this key in continuous conduction.
    pub fn landmark(&self, key: &str) -> Option<&'static Form> {
        self.landmarks.iter().find(|form| form.key == key)
    }

    /// The switch sets at a condition.
    pub fn sets(&self, condition: &StageCondition) -> &'static SwitchSets {
        self.switching.get((self.region)(condition)).unwrap_or(&IN_TURN[0])
    }
}
