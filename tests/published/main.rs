//! The whole engine, from entered design to analysis, against values from outside the project.
//!
//! Each value stands beside its source. Values marked "recomputed" are the printed ones without the source's asymptotes and
//! rounded intermediate results.
#![expect(clippy::expect_used, clippy::panic, reason = "a test may stop at a wrong or missing value")]

mod common;
mod compensator;
mod cross_checks;
mod discontinuous;
mod lossless;
mod random;
mod reference;
mod registry;
mod switched;
mod textbook;
