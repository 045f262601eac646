//! From the brief to the proposal: the steps in their order.

use super::assumption::{Assumption, Draft};
use super::brief::Brief;
use super::{closing, control, stage};
use crate::analysis::RequirementVerdict;
use crate::design::Design;
use crate::finding::Finding;

/// A proposed design and what stands behind it.
#[derive(Clone, Debug)]
pub struct Proposal {
    /// The design; its notes list the assumptions.
    pub design: Design,
    /// Every value that was not given, in the order it was assumed.
    pub assumptions: Vec<Assumption>,
    /// Its requirements over the nine conditions.
    pub requirements: Vec<RequirementVerdict>,
    /// Conditions without a result or with an unstable loop, and requirements that are missed, in sentences; empty when all is
    /// met.
    pub shortfalls: Vec<String>,
}

/// Proposes a design.
///
/// # Errors
/// What is wrong with the brief, each problem at its entry; or why no operating point exists.
pub fn propose(brief: &Brief) -> Result<Proposal, Vec<Finding>> {
    brief.check()?;
    let mut draft = Draft::new(brief)?;
    control::before_the_stage(&mut draft);
    stage::size(&mut draft, brief)?;
    control::after_the_stage(&mut draft)?;
    closing::close(draft, brief)
}
