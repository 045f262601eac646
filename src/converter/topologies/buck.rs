//! The buck: the switch chops the input, the inductor smooths it.
//!
//! *Source* of the landmarks: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2; in discontinuous
//! conduction ch. 15 and Table 5.2, M = Vout/Vin, K = 2·L·fs/R (forms from memory).

use crate::converter::drawing::{Reach, StageDrawing, Topology};
use crate::converter::landmark::{RestingForms, Textbook};
use std::f64::consts::{PI, TAU};

/// The buck.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "buck",
    name: "Buck",
    line: "Output below the input; the switch stands between input and inductor.",
    reach: Reach::BelowInput,
    draw,
    ideal_duty: |input, output| output / input,
    resonance_hz: |t| 1.0 / (TAU * (t.inductance * t.capacitance).sqrt()),
    resonance_formula: "1 / (2π·√(L·C))",
    right_half_plane_zero_hz: none,
    right_half_plane_zero_formula: "",
    resting: RestingForms {
        duty: |m, k| m * (k / (1.0 - m)).sqrt(),
        low_pole_hz: |t| (2.0 - t.conversion) / ((1.0 - t.conversion) * TAU * t.load_resistance * t.capacitance),
        low_pole_formula: "(2 − M) / ((1 − M)·2π·R·C)",
        second_pole_hz: |t| t.conversion * t.switching_frequency / (PI * t.duty * (1.0 - t.conversion)),
        second_pole_formula: "M·fs / (π·D·(1 − M))",
        right_half_plane_zero_hz: None,
        right_half_plane_zero_formula: "",
    },
};

fn none(_: &Textbook) -> Option<f64> {
    None
}

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let switch_node = stage.node("switch node");
    stage.switch(supply, switch_node);
    stage.rectifier(ground, switch_node);
    stage.inductor(switch_node, output);
    stage.output(output, ground);
}
