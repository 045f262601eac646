//! A first design from what a converter has to do: every part that was not given is assumed, with its value and its reason.
//!
//! [`Brief`] is what is asked, in rows of the table of entries; [`propose`] sizes the stage, places the compensator and tries the
//! result at the nine conditions. No topology is named: currents and volt-seconds come from the operating point, resonance and
//! right-half-plane zero from the registry.
//!
//! | file | holds |
//! |---|---|
//! | `brief` | what is asked, and what is wrong with it |
//! | `assumption` | the design being filled in, each value with its reason |
//! | `stage` | inductor, output bank, resistances, input |
//! | `control` | modulator, amplifier, divider, requirements |
//! | `closing` | the crossover and the compensator, tried at the nine conditions |

mod assumption;
mod brief;
mod closing;
mod control;
mod stage;

pub use assumption::Assumption;
pub use brief::{Brief, Parts};

use super::result::RequirementVerdict;
use crate::design::Design;
use crate::finding::Finding;
use assumption::Draft;

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
    control::after_the_stage(&mut draft, brief)?;
    closing::close(draft, brief)
}
