//! What joins stage and compensator: the modulator that makes a duty ratio of the control voltage, and its delay.

mod entries;
mod modulator;

pub use entries::{CHOICES, ENTRIES, applies};
pub use modulator::Modulator;
