//! A topology that nobody builds, registered in tests alone: a boost with a resistor of its own before its inductor.
//!
//! It stands in this one file and on one line of the registry; whatever else knows of it found it there. The tests of the whole
//! registry run it with all others, `terminal` drives it through a file, its rows and a report.

use super::drawing::StageDrawing;
use super::landmark::Form;
use super::sizing::{Sized, Sizing};
use super::topology::{LeftOut, Reach, Topology};
use crate::circuit::{Drawn, Symbol};
use crate::quantity::{Bounds, Choice, ChoiceOption, Choices, Entry, Unit};
use std::f64::consts::TAU;

static RESISTOR: Entry = Entry::new(
    "stage.made-up.resistance",
    "Made-up resistor",
    Unit::Ohm,
    Bounds::Positive,
    0.05,
    "A resistor that nobody would fit.",
);

static FITTED: Choice = Choice {
    path: "stage.made-up",
    name: "Made-up resistor",
    options: &[
        ChoiceOption { key: "none", name: "None", help: "A wire in its place." },
        ChoiceOption { key: "fitted", name: "Fitted", help: "The resistor before the inductor." },
    ],
    default: "fitted",
    help: "Whether the resistor is fitted.",
};

static INDUCTOR: Entry = Entry::new(
    "stage.inductor.inductance",
    "Made-up inductor",
    Unit::Henry,
    Bounds::Positive,
    10e-6,
    "An inductor behind a resistor that nobody would fit.",
);

/// The topology.
pub(super) static TOPOLOGY: Topology = Topology {
    key: "made-up",
    name: "Made up",
    line: "A boost with a resistor of its own.",
    reach: Reach::AboveInput,
    draw,
    entries: &[&RESISTOR, &INDUCTOR],
    choices: &[&FITTED],
    applies: |path, choices| path != RESISTOR.path || fitted(choices),
    ideal_duty: |v| 1.0 - v.input / v.output,
    highest_voltage: |v| 3.0 * v.output,
    landmarks: &[Form {
        key: "lc-resonance",
        name: "Made-up resonance",
        formula: "(1 − D) / (2π·√(L·C))",
        hz: |t| Some((1.0 - t.duty) / (TAU * (t.inductance * t.capacitance).sqrt())),
        parts: &["stage.inductor.inductance", "stage.bank"],
    }],
    resting: super::landmark::RestingForms {
        duty: |m, k| (k * m * (m - 1.0)).sqrt(),
        landmarks: &[Form::low_pole("(2M − 1) / ((M − 1)·2π·R·C)", |t| {
            let m = t.conversion;
            Some((2.0 * m - 1.0) / ((m - 1.0) * TAU * t.load_resistance * t.capacitance))
        })],
        ..super::landmark::RestingForms::NONE
    },
    sizing,
    left_out: &[LeftOut {
        place: RESISTOR.path,
        message: "The resistor's noise is left out.",
        hint: "leave it out, too",
    }],
    ..Topology::COMMON
};

fn fitted(choices: &Choices) -> bool {
    !choices.is(FITTED.path, "none")
}

fn sizing(s: &Sizing) -> Vec<Sized> {
    vec![
        Sized::chosen(FITTED.path, "fitted", "somebody has to"),
        Sized::by_rule(RESISTOR.path, 0.002 * s.input.0 * s.input.0 / (s.load * s.output), "0.2 % of the power"),
    ]
}

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let (behind, switch_node) = (stage.node("behind the resistor"), stage.node("switch node"));
    // Without an entry that applies its value is zero, a wire.
    stage.filters.resistor(&mut stage.netlist, "made-up resistor", (supply, behind), RESISTOR.path);
    let drawn = Drawn::new(Symbol::Resistor, "Made-up resistor", "Rm").value(RESISTOR.path).also(&[FITTED.path]);
    stage.sketch.part(supply, behind, drawn);
    stage.inductor(behind, switch_node);
    stage.switch(switch_node, ground);
    stage.rectifier(switch_node, output);
    stage.output(output, ground);
}
