//! The forward: a buck behind a transformer, its core reset by a third winding while the switch is open.
//!
//! *Conventions*: the reset winding returns the magnetising current to the input; it takes Nr/Np of the on-time, so the duty ratio
//! must stay below 1 / (1 + Nr/Np), or the core does not reset and saturates within some periods.
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 6.3.2 (from memory); landmarks as in `buck_derived`.

use crate::converter::buck_derived::{
    AT_REST, LANDMARKS, LEAKAGE, LEAKAGE_LEFT_OUT, MAGNETISING, MAGNETISING_LEFT_OUT, RESTING, first_sizes,
};
use crate::converter::drawing::{RECTIFIER, SWITCH, StageDrawing};
use crate::converter::sizing::Sized;
use crate::converter::topology::{DutyLimit, Reach, SwitchSets, Topology};
use crate::converter::topology_entries::turns_ratio;
use crate::quantity::{Bounds, Entry, Unit};

/// Rectifier that conducts with the switch.
const FORWARD: &str = "forward rectifier";

/// Turns ratio; the duty ratio is limited, so it is larger than where it is not.
static TURNS: Entry = turns_ratio(1.5);

/// Turns of the reset winding.
static RESET: Entry = Entry::new(
    "stage.transformer.reset",
    "Reset winding, Nr/Np",
    Unit::One,
    Bounds::Between(0.05, 20.0),
    1.0,
    "Turns of the reset winding over turns of the primary winding. The core resets while the duty ratio stays below 1 / (1 + Nr/Np); the open switch holds off Vin·(1 + Np/Nr).",
);

/// The forward.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "forward",
    name: "Forward",
    line: "Isolated buck with one switch; a reset winding limits the duty ratio.",
    reach: Reach::BelowInput,
    draw,
    entries: &[&TURNS, &MAGNETISING, &LEAKAGE, &RESET],
    switching: &[SwitchSets {
        name: "",
        on: &[SWITCH, FORWARD],
        off: &[RECTIFIER, AT_REST],
        idle: &[AT_REST],
        switch: SWITCH,
        rectifier: RECTIFIER,
    }],
    ideal_duty: |v| v.output / (v.ratio * v.input),
    duty_limit: |get| {
        Some(DutyLimit {
            greatest: 1.0 / (1.0 + get(RESET.path)),
            place: RESET.path,
            why: "1 / (1 + Nr/Np): above it the core does not reset while the switch is open, and saturates",
        })
    },
    magnetising_ramp: 1.0,
    // The open switch holds off twice the input with a reset winding of as many turns as the primary.
    highest_voltage: |v| (2.0 * v.input).max(v.ratio * v.input).max(v.output),
    landmarks: LANDMARKS,
    resting: RESTING,
    sizing: |given| {
        let reset =
            Sized::by_rule(RESET.path, 1.0, "as many turns as the primary winding: the duty ratio may reach a half");
        [first_sizes(given, 0.4, 1.0), vec![reset]].concat()
    },
    left_out: &[LEAKAGE_LEFT_OUT, MAGNETISING_LEFT_OUT],
    ..Topology::COMMON
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let (drain, secondary, rectified) = (stage.node("drain"), stage.node("secondary"), stage.node("switch node"));
    let isolated = stage.isolated_return();
    stage.pulse_transformer((supply, drain), (secondary, isolated), &[RESET.path]);
    stage.switch(drain, ground);
    stage.rectifier_called(FORWARD, secondary, rectified);
    stage.rectifier_called(RECTIFIER, isolated, rectified);
    stage.smoothing_inductor(rectified, output);
    stage.output(output, isolated);
}
