//! The whole engine, from entered design to analysis, against values from outside the project.
//!
//! Each value stands beside its source. Values marked "recomputed" are the printed ones without the source's asymptotes and
//! rounded intermediate results.
#![expect(clippy::expect_used, clippy::panic, reason = "a test may stop at a wrong or missing value")]

mod analyser;
mod common;
mod compensator;
mod controlled;
mod cross_checks;
mod current_mode;
mod digital;
mod digital_forms;
mod discontinuous;
mod every_mode;
mod exact;
mod filters;
mod interleaved;
mod isolated;
mod lossless;
mod orbit;
mod proposal;
mod pulsed;
mod pulsed_findings;
mod random;
mod reference;
mod registry;
mod sampled;
mod switched;
mod symbolic;
mod textbook;
mod topologies;
mod transient;
mod two_inductors;
mod wrong_parts;
