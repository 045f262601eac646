//! What joins stage and compensator: the control law that makes a duty ratio of the control voltage, and its delay.
//!
//! | file | holds |
//! |---|---|
//! | `entries` | what a user enters and chooses, and what applies to which mode |
//! | `law` | the law of a design, and the controlled stage it makes at a condition |
//! | `modulator` | the ramp of voltage and average current mode |
//! | `statics` | a law without states of its own |
//! | `sense` | current sense and compensating ramp of peak and valley current mode |
//! | `sampling` | slope factor, quality factor of the sampling pair, subharmonic boundary |
//! | `current` | the controlled stage of peak and valley current mode |
//! | `rested` | the same where the current starts every period from rest |
//! | `landmarks` | the landmarks that current mode leaves of the stage's |
//! | `average` | average current mode: inner compensator, inner loop |

mod average;
mod current;
mod entries;
mod landmarks;
mod law;
mod modulator;
mod rested;
mod sampling;
mod sense;
mod statics;
#[cfg(test)]
mod tests;

pub use average::{AverageCurrent, InnerLoop};
pub use entries::{CHOICES, ENTRIES, applies};
pub use law::{CONTROL, ControlLaw, Controlled, Edge, Mode};
pub use modulator::Ramp;
pub use sampling::Sampling;
pub use sense::{CurrentSense, Slope, ramp_remedy};
