//! The full bridge: a buck behind a transformer whose primary four switches connect to the input, in either direction in turn.
//!
//! *Conventions*: drawn and solved is one pulse, of one diagonal of two switches; that of the other is alike. All four are open between
//! pulses, and both halves of the secondary share the inductor's current. Two pulses per period of one switch. A bridge whose legs are
//! shifted in phase keeps the primary's current flowing between pulses: it loses twice the volt-seconds at its leakage inductance.
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 6.3.1 (from memory); landmarks as in `buck_derived`.

use crate::converter::buck_derived::{
    AT_REST, BALANCED, CENTRE_TAP, FREEWHEEL, LANDMARKS, LEAKAGE, LEAKAGE_LEFT_OUT, MAGNETISING, MAGNETISING_LEFT_OUT,
    PULSE, RESTING, first_sizes,
};
use crate::converter::drawing::{SWITCH, StageDrawing};
use crate::converter::topology::{LeftOut, Reach, SwitchSets, Topology};
use crate::converter::topology_entries::RATIO;

/// The other switch of the diagonal.
const LOWER: &str = "switch below";

/// The full bridge.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "full-bridge",
    name: "Full bridge",
    line: "Isolated buck for high power: four switches drive the transformer from the whole input, in either direction.",
    reach: Reach::BelowInput,
    draw,
    entries: &[&RATIO, &MAGNETISING, &LEAKAGE],
    switching: &[SwitchSets {
        name: "",
        on: &[SWITCH, LOWER, PULSE],
        off: &[FREEWHEEL, LOWER, AT_REST],
        idle: &[LOWER, AT_REST],
        switch: SWITCH,
        rectifier: FREEWHEEL,
    }],
    pulses: 2,
    ideal_duty: |v| v.output / (v.ratio * v.input),
    magnetising_ramp: BALANCED,
    // A rectifier holds off both halves of the secondary.
    highest_voltage: |v| v.input.max(2.0 * v.ratio * v.input).max(v.output),
    landmarks: LANDMARKS,
    resting: RESTING,
    sizing: |given| first_sizes(given, 0.8, 1.0),
    left_out: &[
        CENTRE_TAP,
        LEAKAGE_LEFT_OUT,
        LeftOut {
            place: "stage.topology",
            message: "All four switches are open between pulses. Phase-shifted legs, which keep the primary's current flowing and lose twice \
                      the volt-seconds at the leakage inductance, are left out.",
            hint: "for phase-shifted legs enter twice the leakage inductance: the duty ratio and the damping are then about right",
        },
        MAGNETISING_LEFT_OUT,
    ],
    ..Topology::COMMON
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let (upper, lower) = (stage.node("upper end"), stage.node("lower end"));
    let (secondary, rectified) = (stage.node("secondary"), stage.node("switch node"));
    let isolated = stage.isolated_return();
    stage.switch(supply, upper);
    stage.pulse_transformer((upper, lower), (secondary, isolated), &[]);
    stage.switch_called((LOWER, "Switch below", "S'"), lower, ground);
    stage.centre_tap(secondary, isolated, rectified);
    stage.smoothing_inductor(rectified, output);
    stage.output(output, isolated);
}
