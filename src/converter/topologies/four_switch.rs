//! The four-switch buck-boost: a buck and a boost on one inductor, the output not inverted.
//!
//! *Regions*: where the input is above the output, A and B switch in turn while D conducts throughout: a buck. Where it is not, C and
//! D switch in turn while A conducts throughout: a boost. Which one it is follows from input and output of the condition. A
//! condition that neither region holds within its duty ratios stands between the two; what a controller does there, mixing pulses
//! of both, is left out.
//! *Source* of the landmarks: those of buck and boost, Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2; in
//! discontinuous conduction ch. 15 and Table 5.2, M = Vout/Vin, K = 2·L·fs/R (forms from memory).

use crate::converter::drawing::StageDrawing;
use crate::converter::landmark::{Form, RestingForms, Textbook};
use crate::converter::topology::{LeftOut, Reach, SwitchSets, Topology};
use std::f64::consts::{PI, TAU};

const A: &str = "switch A";
const B: &str = "rectifier B";
const C: &str = "switch C";
const D: &str = "rectifier D";

/// The four-switch buck-boost.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "four-switch",
    name: "Four-switch buck-boost",
    line: "Output above or below the input, not inverted: a buck above it, a boost below it, on one inductor.",
    reach: Reach::Any,
    draw,
    switching: &[
        SwitchSets { name: "buck", on: &[A, D], off: &[B, D], idle: &[D], switch: A, rectifier: B },
        SwitchSets { name: "boost", on: &[A, C], off: &[A, D], idle: &[A], switch: C, rectifier: D },
    ],
    region: |condition| usize::from(condition.input_voltage <= condition.output_voltage),
    ideal_duty: |v| if v.output < v.input { v.output / v.input } else { 1.0 - v.input / v.output },
    landmarks: &[
        Form::resonance("1 / (2π·√(L·C)), in the boost region × (1 − D)", |t| {
            let share = if bucks(t) { 1.0 } else { 1.0 - t.duty };
            Some(share / (TAU * (t.inductance * t.capacitance).sqrt()))
        }),
        Form::right_half_plane_zero("(1 − D)²·R / (2π·L), in the boost region", |t| {
            (!bucks(t)).then(|| (1.0 - t.duty).powi(2) * t.load_resistance / (TAU * t.inductance))
        }),
    ],
    resting: RestingForms {
        duty: |m, k| if m < 1.0 { m * (k / (1.0 - m)).sqrt() } else { (k * m * (m - 1.0)).sqrt() },
        landmarks: &[
            Form::low_pole(
                "(2 − M) / ((1 − M)·2π·R·C), in the boost region (2M − 1) / ((M − 1)·2π·R·C)",
                |t| {
                    let m = t.conversion;
                    let share = if bucks(t) { (2.0 - m) / (1.0 - m) } else { (2.0 * m - 1.0) / (m - 1.0) };
                    Some(share / (TAU * t.load_resistance * t.capacitance))
                },
            ),
            Form::second_pole("M·fs / (π·D·(1 − M)), in the boost region (M − 1)·fs / (π·D)", |t| {
                let m = t.conversion;
                let share = if bucks(t) { m / (1.0 - m) } else { m - 1.0 };
                Some(share * t.switching_frequency / (PI * t.duty))
            }),
            Form::right_half_plane_zero("fs / (π·D), in the boost region", |t| {
                (!bucks(t)).then(|| t.switching_frequency / (PI * t.duty))
            }),
        ],
        ..RestingForms::NONE
    },
    left_out: &[LeftOut {
        place: "stage.topology",
        message: "Each condition is that of one region, buck or boost; the control voltage counts on that region's own ramp. How a \
                  controller hands over between the regions is left out.",
        hint: "look at conditions on both sides of the output voltage; where none of the regions holds a condition, it has no result",
    }],
    ..Topology::COMMON
};

/// Whether the output is below the input.
fn bucks(t: &Textbook) -> bool {
    t.conversion < 1.0
}

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let (input_side, output_side) = (stage.node("input side"), stage.node("output side"));
    stage.switch_called((A, "Switch A", "SA"), supply, input_side);
    stage.rectifier_called(B, ground, input_side);
    stage.inductor(input_side, output_side);
    stage.switch_called((C, "Switch C", "SC"), output_side, ground);
    stage.rectifier_called(D, output_side, output);
    stage.output(output, ground);
}
