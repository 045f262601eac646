//! The Ćuk: a negative output of any magnitude with a smooth current at either end; two inductors and a coupling capacitor.
//!
//! *Conventions*: the output port's positive terminal is the ground, so the output voltage is a magnitude.
//! *Source* of the landmarks: own derivation, see `two_inductors`. In discontinuous conduction M = D/√K with K = 2·Le·fs/R,
//! Le = L1·L2/(L1 + L2): Ćuk 1978 and Simonetti, Sebastián & Uceda, IEEE Trans. Industrial Electronics 44 (1997), 630 (from memory).

use crate::converter::drawing::StageDrawing;
use crate::converter::landmark::{Form, RestingForms, Textbook};
use crate::converter::topology::{Reach, Topology};
use crate::converter::topology_entries::of_two_inductors;
use crate::converter::two_inductors as two;
use std::f64::consts::{PI, TAU};

/// The Ćuk.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "cuk",
    name: "Ćuk",
    line: "Negative output of any magnitude, smooth currents at either end; two inductors and a coupling capacitor.",
    reach: Reach::Any,
    draw,
    entries: two::ENTRIES,
    choices: two::CHOICES,
    applies: of_two_inductors,
    ideal_duty: |v| v.output / (v.input + v.output),
    highest_voltage: |v| v.input + v.output,
    landmarks: &[
        two::low_resonance(RESONANCES_LOW, |t| Some(two::lower_hz(t, second_coefficient(t)))),
        two::zero_pair("√(1 − D) / (2π·√((L1 − M)·Cc)), where M is below L1", |t| {
            Some(((1.0 - t.duty) / ((t.inductance - t.mutual()) * t.coupling_capacitance)).sqrt() / TAU)
        }),
        two::upper_resonance(RESONANCES_HIGH, |t| Some(two::upper_hz(t, second_coefficient(t)))),
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
const RESONANCES_LOW: &str = "lower ω of C·Cc·(L1·L2 − M²)·ω⁴ − a2·ω² + (1 − D)² = 0, a2 = C·Lo + Cc·L1";
const RESONANCES_HIGH: &str = "upper ω of C·Cc·(L1·L2 − M²)·ω⁴ − a2·ω² + (1 − D)² = 0, a2 = C·Lo + Cc·L1";

/// Coefficient of ω² of the undamped poles [s²].
fn second_coefficient(t: &Textbook) -> f64 {
    t.capacitance * two::seen_by_output(t) + t.coupling_capacitance * t.inductance
}

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let (switch_node, second) = (stage.node("switch node"), stage.node("second node"));
    stage.first_inductor(supply, switch_node);
    stage.switch(switch_node, ground);
    stage.coupling_capacitor(switch_node, second);
    stage.rectifier(second, ground);
    // Its current flows from the negative output towards the switch.
    stage.second_inductor(output, second);
    stage.output(ground, output);
}
