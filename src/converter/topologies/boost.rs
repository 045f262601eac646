//! The boost: the inductor charges from the input and discharges into the output.
//!
//! *Source* of the landmarks: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2; in discontinuous
//! conduction ch. 15 and Table 5.2, M = Vout/Vin, K = 2·L·fs/R (forms from memory).

use crate::converter::drawing::{Reach, StageDrawing, Topology};
use crate::converter::landmark::RestingForms;
use std::f64::consts::{PI, TAU};

/// The boost.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "boost",
    name: "Boost",
    line: "Output above the input; the inductor stands at the input.",
    reach: Reach::AboveInput,
    draw,
    ideal_duty: |input, output| 1.0 - input / output,
    resonance_hz: |t| (1.0 - t.duty) / (TAU * (t.inductance * t.capacitance).sqrt()),
    resonance_formula: "(1 − D) / (2π·√(L·C))",
    right_half_plane_zero_hz: |t| Some((1.0 - t.duty).powi(2) * t.load_resistance / (TAU * t.inductance)),
    right_half_plane_zero_formula: "(1 − D)²·R / (2π·L)",
    resting: RestingForms {
        duty: |m, k| (k * m * (m - 1.0)).sqrt(),
        low_pole_hz: |t| (2.0 * t.conversion - 1.0) / ((t.conversion - 1.0) * TAU * t.load_resistance * t.capacitance),
        low_pole_formula: "(2M − 1) / ((M − 1)·2π·R·C)",
        second_pole_hz: |t| (t.conversion - 1.0) * t.switching_frequency / (PI * t.duty),
        second_pole_formula: "(M − 1)·fs / (π·D)",
        right_half_plane_zero_hz: Some(|t| t.switching_frequency / (PI * t.duty)),
        right_half_plane_zero_formula: "fs / (π·D)",
    },
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let switch_node = stage.node("switch node");
    stage.inductor(supply, switch_node);
    stage.switch(switch_node, ground);
    stage.rectifier(switch_node, output);
    stage.output(output, ground);
}
