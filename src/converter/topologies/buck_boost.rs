//! The inverting buck-boost: the inductor charges from the input and discharges into a negative output.
//!
//! *Conventions*: the output port's positive terminal is the ground, so the output voltage is a magnitude.
//! *Source* of the landmarks: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2.

use crate::converter::drawing::{Reach, StageDrawing, Topology};
use std::f64::consts::TAU;

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
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let switch_node = stage.node("switch node");
    stage.switch(supply, switch_node);
    stage.inductor(switch_node, ground);
    stage.rectifier(output, switch_node);
    stage.output(ground, output);
}
