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
//! | `phase` | the phases of a period and the events between them |
//! | `interleave` | several phases: a share of the period, and what it says of the whole |
//! | `flow` | what a phase makes of the state it begins with |
//! | `orbit` | the steady period: states, instants, conduction mode |
//! | `search` | the Newton steps that find it |
//! | `perturbed` | a small change of the orbit over one period |
//! | `response` | what an analyser reads, at any frequency |
//! | `quantity` | plant, loop gain, impedance, line and reference response as such readings |
//! | `stability` | multipliers, and the name of an instability |
//! | `waveforms` | one steady period of every probe |
//! | `stress` | peak, RMS and mean of every probe, and the output's ripple taken apart |
//! | `facts` | what ripple at the comparator does to the loop, in numbers |
//! | `progress` | the cancel flag and the progress of slow work |
//! | `transient` | the closed loop in time, period by period, with all its limits |

mod build;
mod facts;
mod flow;
mod interleave;
mod orbit;
mod perturbed;
mod phase;
mod probes;
mod progress;
mod quantity;
mod response;
mod search;
mod stability;
mod stress;
mod system;
#[cfg(test)]
mod tests;
mod transient;
mod waveforms;

pub use build::{Closing, Driven, Joined};
pub use facts::{RIPPLE_WARNING, RippleFacts};
pub use interleave::Interleaving;
pub use orbit::{Goal, Orbit, Start};
pub use phase::{Event, Phase};
pub use progress::{Cancel, Progress};
pub use quantity::{ExactLoop, Quantity, Reader, SampledLoop};
pub use response::{Reading, Response, Scratch, UNDEFINED_WITHIN, defined};
pub use stability::{Instability, Stability};
pub use stress::{Figures, OutputRipple};
pub use system::{Comparator, Configuration, Piece, Places, Probe, Rule, Simplified, SwitchedSystem, inputs};
pub use transient::{
    Amplifiers, AtRest, Cycle, Load, POWER_FALLS, Run, SINK_FALLS, Scenario, Signal, Stopped, Trace, Waveforms,
    simulate,
};
pub use waveforms::SteadyWaveforms;
