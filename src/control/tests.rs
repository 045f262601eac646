//! Tests of the control laws.
