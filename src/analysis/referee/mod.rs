//! The referee: what the exact switched model says about the condition shown, beside what the averaged one says.
//!
//! Stability is decided by the multipliers of the switched loop, never by its margins. The curves are those a gain/phase analyser
//! would read at the injection point; at a multiple of half the switching frequency such a reading depends on the phase of the
//! injected sine, so they have gaps there.

mod as_read;
mod examine;
mod model;
mod reach;
mod remarks;
mod result;
mod steady;
#[cfg(test)]
mod tests;

pub use examine::referee;
pub use result::{ExactCurves, Reach, ReachedBy, Referee, Steady, Stress, SwitchedStability, Wave, WaveKind};
pub use steady::steady;
