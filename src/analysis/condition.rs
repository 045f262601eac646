//! The nine operating conditions of a design, and a what-if beside them.

use super::analyse::Shown;
use super::result::{Condition, Level};
use crate::converter::{Stage, StageCondition};
use crate::quantity::{Unit, print};

impl Condition {
    /// The condition that is shown: one of the nine, or a what-if.
    pub fn shown(stage: &Stage, shown: Shown) -> Self {
        match shown {
            Shown::Levels(input, load) => Condition::at_levels(stage, input, load),
            Shown::At { input_voltage, load_current } => Condition::what_if(input_voltage, load_current),
        }
    }

    /// The condition at two levels of a stage's ranges.
    pub(in crate::analysis) fn at_levels(stage: &Stage, input: Level, load: Level) -> Self {
        let input_voltage = stage.input_voltages[input as usize];
        let load_current = stage.load_currents[load as usize];
        let label = format!(
            "{} input {}, {} load {}",
            input.word(),
            print(input_voltage, Unit::Volt),
            load.word(),
            print(load_current, Unit::Ampere)
        );
        Condition { input_voltage, load_current, label, levels: Some((input, load)) }
    }

    /// A condition of the user's own.
    pub(in crate::analysis) fn what_if(input_voltage: f64, load_current: f64) -> Self {
        let label = format!("input {}, load {}", print(input_voltage, Unit::Volt), print(load_current, Unit::Ampere));
        Condition { input_voltage, load_current, label, levels: None }
    }

    /// The nine conditions, input voltage outermost, both rising.
    pub(super) fn nine(stage: &Stage) -> Vec<Self> {
        let pairs = Level::ALL.into_iter().flat_map(|input| Level::ALL.map(|load| (input, load)));
        pairs.map(|(input, load)| Condition::at_levels(stage, input, load)).collect()
    }

    /// The condition as the stage takes it.
    pub(super) fn of_stage(&self, stage: &Stage) -> StageCondition {
        StageCondition {
            input_voltage: self.input_voltage,
            load_current: self.load_current,
            output_voltage: stage.output_voltage,
        }
    }
}

/// Place of the nominal condition among the nine.
pub(super) const NOMINAL: usize = 4;

/// Place of a pair of levels among the nine.
pub(super) fn index_of(input: Level, load: Level) -> usize {
    input as usize * Level::ALL.len() + load as usize
}
