//! The inverting buck-boost: the inductor charges from the input and discharges into a negative output.
//!
//! *Conventions*: the output port's positive terminal is the ground, so the output voltage is a magnitude.
//! *Source* of the landmarks: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2; in discontinuous
//! conduction ch. 15 and Table 5.2, M = Vout/Vin, K = 2·L·fs/R (forms from memory).

use crate::converter::drawing::{Reach, StageDrawing, Topology};
use crate::converter::landmark::RestingForms;
use std::f64::consts::{PI, TAU};

/// The inverting buck-boost.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "buck-boost",
    name: "Inverting buck-boost",
    line: "Negative output of any magnitude; the inductor stands between switch node and ground.",
    reach: Reach::Any,
    draw,
    ideal_duty: |input, output| output / (input + output),
    resonance_hz: |t| (1.0 - t.duty) / (TAU * (t.inductance * t.capacitance).sqrt()),
    resonance_formula: "(1 − D) / (2π·√(L·C))",
    right_half_plane_zero_hz: |t| Some((1.0 - t.duty).powi(2) * t.load_resistance / (TAU * t.duty * t.inductance)),
    right_half_plane_zero_formula: "(1 − D)²·R / (2π·D·L)",
    resting: RestingForms {
        duty: |m, k| m * k.sqrt(),
        low_pole_hz: |t| 1.0 / (PI * t.load_resistance * t.capacitance),
        low_pole_formula: "1 / (π·R·C)",
        second_pole_hz: |t| t.conversion * t.switching_frequency / (PI * t.duty),
        second_pole_formula: "M·fs / (π·D)",
        right_half_plane_zero_hz: Some(|t| t.switching_frequency / (PI * t.duty)),
        right_half_plane_zero_formula: "fs / (π·D)",
    },
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let switch_node = stage.node("switch node");
    stage.switch(supply, switch_node);
    stage.inductor(switch_node, ground);
    stage.rectifier(output, switch_node);
    stage.output(ground, output);
}
