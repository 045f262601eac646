//! The buck: the switch chops the input, the inductor smooths it.
//!
//! *Source* of the landmarks: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2; in discontinuous
//! conduction ch. 15 and Table 5.2, M = Vout/Vin, K = 2·L·fs/R (forms from memory).

use crate::converter::drawing::StageDrawing;
use crate::converter::landmark::{Form, RestingForms};
use crate::converter::phases::PHASES;
use crate::converter::topology::{Reach, Topology};
use std::f64::consts::{PI, TAU};

/// The buck.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "buck",
    name: "Buck",
    line: "Output below the input; the switch stands between input and inductor.",
    reach: Reach::BelowInput,
    draw,
    entries: &[&PHASES],
    ideal_duty: |v| v.output / v.input,
    landmarks: &[Form::resonance("1 / (2π·√(L·C))", |t| {
        Some(1.0 / (TAU * (t.inductance * t.capacitance).sqrt()))
    })],
    resting: RestingForms {
        duty: |m, k| m * (k / (1.0 - m)).sqrt(),
        landmarks: &[
            Form::low_pole("(2 − M) / ((1 − M)·2π·R·C)", |t| {
                Some((2.0 - t.conversion) / ((1.0 - t.conversion) * TAU * t.load_resistance * t.capacitance))
            }),
            Form::second_pole("M·fs / (π·D·(1 − M))", |t| {
                Some(t.conversion * t.switching_frequency / (PI * t.duty * (1.0 - t.conversion)))
            }),
        ],
        ..RestingForms::NONE
    },
    ..Topology::COMMON
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let switch_node = stage.node("switch node");
    stage.switch(supply, switch_node);
    stage.rectifier(ground, switch_node);
    stage.inductor(switch_node, output);
    stage.output(output, ground);
}
