//! The closed loop in time, period by period.

mod advance;
mod drive;
mod flow;
mod limiters;
mod machine;
mod mode;
mod period;
mod plant;
mod rest;
mod run;
mod samples;
mod settle;
mod waveforms;

pub use drive::Signal;
pub use limiters::Amplifiers;
pub use machine::Stopped;
pub use rest::AtRest;
pub use run::{Cycle, Load, POWER_FALLS, Run, SINK_FALLS, Scenario, simulate};
pub use waveforms::{Trace, Waveforms};

#[cfg(test)]
mod balance_tests;
#[cfg(test)]
mod brute_tests;
#[cfg(test)]
mod tests;
