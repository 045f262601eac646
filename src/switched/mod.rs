//! The switched side: a stage and its control without averaging.
//!
//! A [`SwitchedSystem`] is a stage, its control law and its compensator as one piecewise linear system: equations for each
//! configuration of the switches, and the rule by which one gives way to the next. Everything here is solved exactly, each
//! interval by its matrix exponential.
//!
//! | file | holds |
//! |---|---|
//! | `system` | configurations, probes, the switching rule |
//! | `build` | the system of a stage, a law and a compensator at a condition |
//! | `probes` | what can be looked at, and where it stands |
//! | `progress` | the cancel flag and the progress of slow work |

mod build;
mod probes;
mod progress;
mod system;
#[cfg(test)]
mod tests;
mod transient;

pub use build::{Closing, Driven, Joined};
pub use progress::{Cancel, Progress};
pub use system::{Comparator, Configuration, Piece, Places, Probe, Rule, SwitchedSystem, inputs};
pub use transient::{
    Amplifiers, AtRest, Cycle, Load, POWER_FALLS, Run, SINK_FALLS, Scenario, Signal, Stopped, Trace, Waveforms,
    simulate,
};
