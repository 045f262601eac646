//! The buck: the switch chops the input, the inductor smooths it.
//!
//! *Source* of the landmarks: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2.

use crate::converter::drawing::{Reach, StageDrawing, Topology};
use crate::converter::landmark::Textbook;

/// The buck.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "buck",
    name: "Buck",
    line: "Output below the input; the switch stands between input and inductor.",
    reach: Reach::BelowInput,
    draw,
    ideal_duty: |input, output| output / input,
    resonance_hz: |t| 1.0 / (std::f64::consts::TAU * (t.inductance * t.capacitance).sqrt()),
    resonance_formula: "1 / (2π·√(L·C))",
    right_half_plane_zero_hz: none,
    right_half_plane_zero_formula: "",
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
