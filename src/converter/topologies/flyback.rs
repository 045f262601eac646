//! The flyback: a transformer stores each pulse's energy in its magnetising inductance and gives it to an isolated output.
//!
//! *Conventions*: the inductor is the magnetising inductance at the primary winding; the switched current is the secondary's.
//! Leakage inductance is left out, and said so.
//! *Source* of the landmarks: those of the buck-boost with the input and the inductance as the secondary sees them, n·Vin and n²·L:
//! Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 6.3.4 and Table 8.2; in discontinuous conduction ch. 15,
//! M = Vout/Vin, K = 2·L·fs/R (forms from memory).

use crate::converter::drawing::StageDrawing;
use crate::converter::landmark::{Form, RestingForms, Textbook};
use crate::converter::sizing::{Sized, Sizing};
use crate::converter::topology::{LeftOut, Reach, Topology, Voltages};
use crate::converter::topology_entries::{MAGNETISING_INDUCTOR, PRIMARY_WINDING, RATIO};
use std::f64::consts::{PI, TAU};

/// The flyback.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "flyback",
    name: "Flyback",
    line: "Isolated output of any magnitude; a transformer stores the energy of each pulse.",
    reach: Reach::Any,
    draw,
    entries: &[&MAGNETISING_INDUCTOR, &PRIMARY_WINDING, &RATIO],
    ideal_duty: |v| v.output / (v.output + v.ratio * v.input),
    highest_voltage,
    landmarks: &[
        Form::resonance("(1 − D) / (2π·n·√(L·C))", |t| {
            Some((1.0 - t.duty) / (TAU * (secondary(t) * t.capacitance).sqrt()))
        }),
        Form::right_half_plane_zero("(1 − D)²·R / (2π·D·n²·L)", |t| {
            Some((1.0 - t.duty).powi(2) * t.load_resistance / (TAU * t.duty * secondary(t)))
        }),
    ],
    resting: RestingForms {
        duty: |m, k| m * k.sqrt(),
        landmarks: &[
            Form::low_pole("1 / (π·R·C)", |t| Some(1.0 / (PI * t.load_resistance * t.capacitance))),
            Form::second_pole("M·fs / (π·n·D)", |t| {
                Some(t.conversion * t.switching_frequency / (PI * t.ratio * t.duty))
            }),
            Form::right_half_plane_zero("fs / (π·D)", |t| Some(t.switching_frequency / (PI * t.duty))),
        ],
        ..RestingForms::NONE
    },
    sizing,
    left_out: &[LeftOut {
        place: RATIO.path,
        message: "The transformer's leakage inductance is left out: duty ratio, loss and voltage stress come out a little low, \
                  and the ringing of the switch node is not shown.",
        hint: "its energy, ½·Lleak·I², goes to the clamp once a period; below a few per cent of the magnetising inductance the loop hardly sees it",
    }],
    ..Topology::COMMON
};

/// Duty ratio at the least input that a new design's turns ratio aims at.
const DUTY: f64 = 0.45;

fn sizing(s: &Sizing) -> Vec<Sized> {
    let ratio = s.output * (1.0 - DUTY) / (DUTY * s.input.0);
    vec![Sized::by_rule(RATIO.path, ratio, "n = Vout·(1 − D) / (D·Vin), for a duty ratio near 0.45 at the least input")]
}

/// Magnetising inductance as the secondary winding sees it [H].
fn secondary(t: &Textbook) -> f64 {
    t.ratio * t.ratio * t.inductance
}

/// The open switch holds off the input and the output as the primary sees it, the blocking rectifier the output and the input
/// as the secondary does.
fn highest_voltage(v: &Voltages) -> f64 {
    (v.input + v.output / v.ratio).max(v.output + v.input * v.ratio)
}

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let (switch_node, secondary) = (stage.node("switch node"), stage.node("secondary"));
    let isolated = stage.isolated_return();
    // The second winding's dot is at its lower end: the rectifier blocks while the switch conducts.
    stage.storing_transformer((supply, switch_node), (isolated, secondary));
    stage.switch(switch_node, ground);
    stage.rectifier(secondary, output);
    stage.output(output, isolated);
}
