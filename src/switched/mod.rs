//! The exact side: a stage and its control as one piecewise linear system, without averaging.
//!
//! *Conventions*: SI units; within one configuration of switches the system is linear and solved by matrix exponentials.

mod progress;

pub use progress::{Cancel, Progress};
