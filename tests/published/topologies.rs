//! Transformers, two inductors, four switches and interleaved phases against independent calculations in Python.
//!
//! *Source*: `tests/reference/topologies.py`: cells written by hand (`tests/reference/cells.py`), averaged in both conduction modes, and
//! the exact switched stage (`tests/reference/orbit.py`; N phases each by itself in `tests/reference/interleaved.py`). Nothing there knows
//! this crate.
//!
//! *Tolerance*: 1e-6 against the averaged equations. Against the switched stage, to a fifth of the pulse frequency, what averaging costs.

use crate::controlled::{compare_laws, compare_switched};
use crate::reference::{compare_conditions, compare_responses, compare_steps, designs};
use polewright::design::Design;
use serde_json::Value;

const TOPOLOGIES: &str = include_str!("../reference/topologies.json");

/// Every design of one topology.
fn each(topology: &str, least: usize, compare: impl Fn(&Design, &Value)) {
    let found: Vec<_> = designs(TOPOLOGIES, |row| row["choices"]["stage.topology"].as_str() == Some(topology));
    assert!(found.len() >= least, "{} of {topology}", found.len());
    for (design, row) in &found {
        compare(design, row);
    }
}

fn agree(topology: &str, least: usize) {
    each(topology, least, compare_responses);
    each(topology, least, compare_conditions);
    each(topology, least, compare_laws);
    each(topology, least, compare_steps);
    each(topology, least, compare_switched);
}

#[test]
fn flyback_in_both_conduction_modes_and_with_an_output_filter() {
    agree("flyback", 3);
}

/// The reference draws each phase by itself; one phase of an Nth of the impedances must do as well.
#[test]
fn interleaved_phases_in_voltage_and_current_mode() {
    agree("buck", 1);
    agree("boost", 1);
}

#[test]
fn sepic_with_inductors_apart_and_coupled_in_both_conduction_modes() {
    agree("sepic", 3);
}

#[test]
fn cuk_with_inductors_apart_and_coupled_in_both_conduction_modes() {
    agree("cuk", 3);
}

/// Leakage counts in continuous conduction only, the magnetising current in peak current mode only.
#[test]
fn bucks_behind_a_transformer() {
    agree("forward", 3);
    agree("push-pull", 1);
    agree("half-bridge", 1);
    agree("full-bridge", 2);
}

#[test]
fn four_switches_in_both_regions() {
    agree("four-switch", 3);
}
