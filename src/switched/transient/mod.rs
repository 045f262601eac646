//! The closed loop in time, period by period, with all its limits.
//!
//! A set of closed switches with a side for every limiter is one linear mode, propagated exactly; an interval ends where a watched signal
//! leaves its bounds. Nothing is allocated in a period once its modes are there.
//!
//! | file | holds |
//! |---|---|
//! | `flow` | exact propagation over any time |
//! | `plant`, `limiters` | the system with its limits as forces |
//! | `mode` | one mode: forces eliminated, signals watched |
//! | `advance` | from one event to the next |
//! | `settle` | which mode states ask for that may have jumped |
//! | `machine`, `period` | the running converter, period after period |
//! | `drive` | signals of straight lines from outside |
//! | `samples`, `waveforms` | what is recorded, thinned to columns |
//! | `rest` | the converter before start-up |
//! | `run` | a whole run |

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
