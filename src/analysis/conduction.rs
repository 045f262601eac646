//! Remarks on conduction: where it is discontinuous, what the model then leaves out, and steps that leave it.

use super::remarks::summaries;
use super::result::{ConditionResult, ConditionSummary, Detail};
use crate::converter::Conduction;
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::quantity::{Unit, print};

/// Whether inductor and output capacitor resonate at a condition: not where the current rests.
pub(super) fn resonates(summary: &ConditionSummary) -> bool {
    summary.operating_point.conduction != Conduction::Discontinuous
}

/// Conditions in discontinuous conduction, and what that means for the model.
pub(super) fn discontinuous(design: &CheckedDesign, conditions: &[ConditionResult]) -> Vec<Finding> {
    let resting: Vec<&ConditionResult> =
        summaries(conditions).filter(|(_, s)| !resonates(s)).map(|(condition, _)| condition).collect();
    let Some(first) = resting.first() else { return Vec::new() };
    let told = match resting.len() {
        1 => format!("At {} the stage runs in discontinuous conduction", first.condition.label),
        all if all == conditions.len() => "The stage runs in discontinuous conduction in all nine conditions".into(),
        some => format!(
            "The stage runs in discontinuous conduction in {some} of the nine conditions, first at {}",
            first.condition.label
        ),
    };
    let limits = "its averaged model holds to about a third of the switching frequency, and ringing of the idle switch node is not in it";
    let mut notes = vec![Finding::note("stage.rectifier", format!("{told}: {limits}."))];
    if design.stage.bank_inductance_averaged() {
        notes.push(Finding::note(
            "stage.bank.1.esl",
            "In discontinuous conduction the output bank's ESL follows the current's pulse and is left out of the control path; output impedance and load step include it.",
        ));
    }
    notes
}

/// A load step that changes the conduction mode, which a linear response cannot follow.
pub(super) fn step_leaves_mode(design: &CheckedDesign, detail: Option<&Detail>) -> Option<Finding> {
    let detail = detail.filter(|d| d.steps.load.is_some())?;
    let boundary = detail.boundary_load?;
    let before = detail.condition.load_current;
    let after = before + design.events.load_step.change;
    if (before < boundary) == (after < boundary) {
        return None;
    }
    let [before, after, boundary] = [before, after, boundary].map(|load| print(load, Unit::Ampere));
    let message = format!(
        "The load step from {before} to {after} crosses the boundary of conduction at {boundary} ({}): the linear response shown is that of the mode before it.",
        detail.condition.label
    );
    Some(Finding::notice("event.load-step.change", message))
}
