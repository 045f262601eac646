//! The inverting buck-boost: the inductor charges from the input and discharges into a negative output.
//!
//! *Conventions*: the output port's positive terminal is the ground, so the output voltage is a magnitude.
//! *Source* of the landmarks: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2; in discontinuous
//! conduction ch. 15 and Table 5.2, M = Vout/Vin, K = 2·L·fs/R (forms from memory).

use crate::converter::drawing::StageDrawing;
use crate::converter::landmark::{Form, RestingForms};
use crate::converter::phases::PHASES;
use crate::converter::topology::{Reach, Topology};
use std::f64::consts::{PI, TAU};

/// The inverting buck-boost.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "buck-boost",
    name: "Inverting buck-boost",
    line: "Negative output of any magnitude; the inductor stands between switch node and ground.",
    reach: Reach::Any,
    draw,
    entries: &[&PHASES],
    ideal_duty: |v| v.output / (v.input + v.output),
    highest_voltage: |v| v.input + v.output,
    landmarks: &[
        Form::resonance("(1 − D) / (2π·√(L·C))", |t| {
            Some((1.0 - t.duty) / (TAU * (t.inductance * t.capacitance).sqrt()))
        }),
        Form::right_half_plane_zero("(1 − D)²·R / (2π·D·L)", |t| {
            Some((1.0 - t.duty).powi(2) * t.load_resistance / (TAU * t.duty * t.inductance))
        }),
    ],
    resting: RestingForms {
        duty: |m, k| m * k.sqrt(),
        landmarks: &[
            Form::low_pole("1 / (π·R·C)", |t| Some(1.0 / (PI * t.load_resistance * t.capacitance))),
            Form::second_pole("M·fs / (π·D)", |t| Some(t.conversion * t.switching_frequency / (PI * t.duty))),
            Form::right_half_plane_zero("fs / (π·D)", |t| Some(t.switching_frequency / (PI * t.duty))),
        ],
        ..RestingForms::NONE
    },
    ..Topology::COMMON
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let switch_node = stage.node("switch node");
    stage.switch(supply, switch_node);
    stage.inductor(switch_node, ground);
    stage.rectifier(output, switch_node);
    stage.output(ground, output);
}
