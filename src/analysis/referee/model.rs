//! The switched systems of a design at a condition, closed and open, beside the averaged loop.

use crate::analysis::analyse::loop_at;
use crate::analysis::digital::refuse_switched;
use crate::analysis::loop_model::{LoopModel, Shared};
use crate::analysis::{Condition, LoopResult, Shown};
use crate::compensator::FAST;
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::switched::{Closing, Driven, Joined, Start, SwitchedSystem};

/// Everything that is looked at from both sides.
pub(super) struct Model {
    pub(super) condition: Condition,
    pub(super) shared: Shared,
    /// The averaged loop, its margins and verdict.
    pub(super) averaged: LoopModel,
    pub(super) loop_gain: LoopResult,
    /// The switched system with its loop closed.
    pub(super) closed: SwitchedSystem,
}

impl Model {
    /// Builds the models of the condition shown.
    ///
    /// # Errors
    /// A finding where the averaged or the switched model cannot be built.
    pub(super) fn new(design: &CheckedDesign, shown: Shown) -> Result<Self, Finding> {
        refuse_switched(design)?;
        let shared = Shared::new(design)?;
        if shared.digital.is_some() {
            let message = "The exact switched model does not follow a difference equation; the averaged results solve its sampled loop.";
            return Err(Finding::notice("compensator.amplifier", message));
        }
        let condition = match shown {
            Shown::Levels(input, load) => Condition::at_levels(&design.stage, input, load),
            Shown::At { input_voltage, load_current } => Condition::what_if(input_voltage, load_current),
        };
        let (averaged, loop_gain, _) = loop_at(design, &shared, &condition)?;
        let held = design.compensator.steady_inputs().into_iter().map(|(name, volts)| (name.to_owned(), volts));
        let fed = shared.fast_path.as_ref().map(|path| (FAST.to_owned(), path.signal.to_owned()));
        let closing = Closing { space: &shared.compensator, held: held.collect(), fed: fed.into_iter().collect() };
        let joined = Joined { stage: &design.stage, law: &shared.law, driven: Driven::Loop(closing) };
        let closed = SwitchedSystem::at_point(&joined, &averaged.averaged.operating_point)?;
        Ok(Model { condition, shared, averaged, loop_gain, closed })
    }

    /// The same with the loop open, at the control voltage of the averaged one.
    ///
    /// # Errors
    /// As building it.
    pub(super) fn open(&self, design: &CheckedDesign) -> Result<SwitchedSystem, Finding> {
        let driven = Driven::Voltage(self.averaged.controlled.control_voltage);
        let joined = Joined { stage: &design.stage, law: &self.shared.law, driven };
        SwitchedSystem::at_point(&joined, &self.averaged.averaged.operating_point)
    }

    /// Where the search for the steady period begins.
    pub(super) fn start(&self) -> Start {
        Start::of(&self.averaged.averaged.operating_point)
    }
}
