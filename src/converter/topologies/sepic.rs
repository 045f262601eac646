//! The SEPIC: an output of either side of the input, not inverted; two inductors and a coupling capacitor.
//!
//! *Source* of the landmarks: own derivation, see `two_inductors`; the zero of the right half-plane is the cubic's real root where it
//! lies far above the zero pair. In discontinuous conduction M = D/√K with K = 2·Le·fs/R, Le = L1·L2/(L1 + L2): Simonetti,
//! Sebastián & Uceda, IEEE Trans. Industrial Electronics 44 (1997), 630 (from memory).

use crate::converter::drawing::StageDrawing;
use crate::converter::landmark::{Form, RestingForms, Textbook};
use crate::converter::topology::{Reach, Topology};
use crate::converter::topology_entries::of_two_inductors;
use crate::converter::two_inductors as two;
use std::f64::consts::{PI, TAU};

/// The SEPIC.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "sepic",
    name: "SEPIC",
    line: "Output of any magnitude, not inverted; two inductors and a coupling capacitor.",
    reach: Reach::Any,
    draw,
    entries: two::ENTRIES,
    choices: two::CHOICES,
    applies: of_two_inductors,
    ideal_duty: |v| v.output / (v.input + v.output),
    highest_voltage: |v| v.input + v.output,
    landmarks: &[
        two::low_resonance(RESONANCES_LOW, |t| Some(two::lower_hz(t, second_coefficient(t)))),
        two::zero_pair("1 / (2π·√((L1 + L2 − 2M)·Cc))", |t| {
            Some(1.0 / (TAU * (two::round(t) * t.coupling_capacitance).sqrt()))
        }),
        two::upper_resonance(RESONANCES_HIGH, |t| Some(two::upper_hz(t, second_coefficient(t)))),
        Form::right_half_plane_zero(
            "≈ (1 − D)²·R / (2π·D·Le), Le = (L1·L2 − M²) / (L1 + L2 − 2M)",
            |t| Some((1.0 - t.duty).powi(2) * t.load_resistance / (TAU * t.duty * two::parallel(t))),
        ),
    ],
    resting: RestingForms {
        conversion: |t| t.conversion,
        inductance: two::parallel,
        duty: |m, k| m * k.sqrt(),
        landmarks: &[Form::low_pole("1 / (π·R·C)", |t| Some(1.0 / (PI * t.load_resistance * t.capacitance)))],
    },
    sizing: two::sizing,
    ..Topology::COMMON
};

/// Lo and Lr are told with the terms: what the output sees, and what a current round through both inductors sees.
const RESONANCES_LOW: &str = "lower ω of C·Cc·(L1·L2 − M²)·ω⁴ − a2·ω² + (1 − D)² = 0, a2 = C·Lo + Cc·Lr·(1 − D)²";
const RESONANCES_HIGH: &str = "upper ω of C·Cc·(L1·L2 − M²)·ω⁴ − a2·ω² + (1 − D)² = 0, a2 = C·Lo + Cc·Lr·(1 − D)²";

/// Coefficient of ω² of the undamped poles [s²].
fn second_coefficient(t: &Textbook) -> f64 {
    t.capacitance * two::seen_by_output(t) + t.coupling_capacitance * two::round(t) * (1.0 - t.duty).powi(2)
}

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let (switch_node, second) = (stage.node("switch node"), stage.node("second node"));
    stage.first_inductor(supply, switch_node);
    stage.switch(switch_node, ground);
    stage.coupling_capacitor(switch_node, second);
    stage.second_inductor(ground, second);
    stage.rectifier(second, output);
    stage.output(output, ground);
}
