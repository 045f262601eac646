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
//! | `propose` | these in their order, and what comes of them |
//! | `closing` | the crossover and the compensator, tried at the nine conditions |

mod assumption;
mod brief;
mod closing;
mod control;
mod propose;
mod stage;

pub use assumption::Assumption;
pub use brief::{Brief, Parts};
pub use propose::{Proposal, propose};
