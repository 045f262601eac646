//! The push-pull: a buck behind a centre-tapped transformer that two switches drive in turn.
//!
//! *Conventions*: drawn and solved is one pulse of one half; the other half is alike. Two pulses per period of one switch, so a duty
//! ratio of 1 is half of the period for each. While no switch conducts, both halves of the secondary share the inductor's current.
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 6.3.3 (from memory); landmarks as in `buck_derived`.

use crate::converter::buck_derived::{
    AT_REST, BALANCED, CENTRE_TAP, FREEWHEEL, LANDMARKS, LEAKAGE, LEAKAGE_LEFT_OUT, MAGNETISING, MAGNETISING_LEFT_OUT,
    PULSE, RESTING, first_sizes,
};
use crate::converter::drawing::{SWITCH, StageDrawing};
use crate::converter::topology::{Reach, SwitchSets, Topology};
use crate::converter::topology_entries::RATIO;

/// The push-pull.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "push-pull",
    name: "Push-pull",
    line: "Isolated buck from a low input: two switches to ground drive a centre-tapped transformer in turn.",
    reach: Reach::BelowInput,
    draw,
    entries: &[&RATIO, &MAGNETISING, &LEAKAGE],
    switching: &[SwitchSets {
        name: "",
        on: &[SWITCH, PULSE],
        off: &[FREEWHEEL, AT_REST],
        idle: &[AT_REST],
        switch: SWITCH,
        rectifier: FREEWHEEL,
    }],
    pulses: 2,
    ideal_duty: |v| v.output / (v.ratio * v.input),
    magnetising_ramp: BALANCED,
    // The open switch holds off the input and the winding of the closed one; a rectifier both halves of the secondary.
    highest_voltage: |v| (2.0 * v.input).max(2.0 * v.ratio * v.input).max(v.output),
    landmarks: LANDMARKS,
    resting: RESTING,
    sizing: |given| first_sizes(given, 0.8, 1.0),
    left_out: &[CENTRE_TAP, LEAKAGE_LEFT_OUT, MAGNETISING_LEFT_OUT],
    ..Topology::COMMON
};

fn draw(stage: &mut StageDrawing) {
    let (supply, ground, output) = (stage.supply(), stage.ground(), stage.node("output"));
    let (drain, secondary, rectified) = (stage.node("drain"), stage.node("secondary"), stage.node("switch node"));
    let isolated = stage.isolated_return();
    stage.pulse_transformer((supply, drain), (secondary, isolated), &[]);
    stage.switch(drain, ground);
    stage.centre_tap(secondary, isolated, rectified);
    stage.smoothing_inductor(rectified, output);
    stage.output(output, isolated);
}
