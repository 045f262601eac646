//! Regions of operation: what is said where a condition stands between two of them.

use super::stage::{Stage, StageCondition};
use crate::finding::Finding;
use crate::quantity::{Unit, print};

impl Stage {
    /// What to say of a condition that its region cannot hold, for the reason given; none where the stage has only one region, and
    /// so no other that might take over.
    pub fn between_regions(&self, condition: &StageCondition, reason: &str) -> Option<Finding> {
        let names: Vec<&str> = self.topology().switching.iter().map(|sets| sets.name).collect();
        let [first, second] = names.as_slice() else { return None };
        let message = format!(
            "{} in and {} out stand between the {first} and the {second} region: {reason}. What a controller does there, mixing pulses of \
             both, is left out, so there are no results here.",
            print(condition.input_voltage, Unit::Volt),
            print(condition.output_voltage, Unit::Volt)
        );
        Some(
            Finding::problem("control.duty.greatest", message)
                .with_hint("widen the duty limits, or choose input voltages that stand farther from the output"),
        )
    }
}
