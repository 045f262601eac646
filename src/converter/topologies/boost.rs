//! The boost: the inductor charges from the input and discharges into the output.
//!
//! *Source* of the landmarks: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2; in discontinuous
//! conduction ch. 15 and Table 5.2, M = Vout/Vin, K = 2·L·fs/R (forms from memory).

use crate::converter::drawing::StageDrawing;
use crate::converter::landmark::{Form, RestingForms};
use crate::converter::phases::PHASES;
use crate::converter::topology::{Reach, Topology};
use std::f64::consts::{PI, TAU};

/// The boost.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "boost",
    name: "Boost",
    line: "Output above the input; the inductor stands at the input.",
    reach: Reach::AboveInput,
    draw,
    entries: &[&PHASES],
    ideal_duty: |v| 1.0 - v.input / v.output,
    landmarks: &[
        Form::resonance("(1 − D) / (2π·√(L·C))", |t| {
            Some((1.0 - t.duty) / (TAU * (t.inductance * t.capacitance).sqrt()))
        }),
        Form::right_half_plane_zero("(1 − D)²·R / (2π·L)", |t| {
            Some((1.0 - t.duty).powi(2) * t.load_resistance / (TAU * t.inductance))
        }),
    ],
    resting: RestingForms {
        duty: |m, k| (k * m * (m - 1.0)).sqrt(),
        landmarks: &[
            Form::low_pole("(2M − 1) / ((M − 1)·2π·R·C)", |t| {
                Some((2.0 * t.conversion - 1.0) / ((t.conversion - 1.0) * TAU * t.load_resistance * t.capacitance))
            }),
            Form::second_pole("(M − 1)·fs / (π·D)", |t| {
                Some((t.conversion - 1.0) * t.switching_frequency / (PI * t.duty))
            }),
            Form::right_half_plane_zero("fs / (π·D)", |t| Some(t.switching_frequency / (PI * t.duty))),
        ],
        ..RestingForms::NONE
    },
    ..Topology::COMMON
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let switch_node = stage.node("switch node");
    stage.inductor(supply, switch_node);
    stage.switch(switch_node, ground);
    stage.rectifier(switch_node, output);
    stage.output(output, ground);
}
