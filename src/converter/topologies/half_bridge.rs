//! The half-bridge: a buck behind a transformer whose primary two switches connect to either side of half the input.
//!
//! *Conventions*: drawn and solved is one pulse, of the upper switch; that of the lower one is alike. Two capacitors hold the primary's other
//! end at half the input and are taken as stiff, so the source supplies half of the primary's current in every pulse. Two pulses per period
//! of one switch.
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 6.3.1 (from memory); landmarks as in `buck_derived`.

use crate::converter::buck_derived::{
    AT_REST, BALANCED, CENTRE_TAP, FREEWHEEL, LANDMARKS, LEAKAGE, LEAKAGE_LEFT_OUT, MAGNETISING, MAGNETISING_LEFT_OUT,
    PULSE, RESTING, first_sizes,
};
use crate::converter::drawing::{SWITCH, StageDrawing};
use crate::converter::topology::{LeftOut, Reach, SwitchSets, Topology};
use crate::converter::topology_entries::turns_ratio;
use crate::quantity::Entry;

/// Turns ratio; half the input asks for twice of it.
static TURNS: Entry = turns_ratio(2.0);

/// The half-bridge.
pub(in crate::converter) static TOPOLOGY: Topology = Topology {
    key: "half-bridge",
    name: "Half-bridge",
    line: "Isolated buck from a high input: two switches drive the transformer from half the input.",
    reach: Reach::BelowInput,
    draw,
    entries: &[&TURNS, &MAGNETISING, &LEAKAGE],
    switching: &[SwitchSets {
        name: "",
        on: &[SWITCH, PULSE],
        off: &[FREEWHEEL, AT_REST],
        idle: &[AT_REST],
        switch: SWITCH,
        rectifier: FREEWHEEL,
    }],
    pulses: 2,
    input_share: 0.5,
    ideal_duty: |v| 2.0 * v.output / (v.ratio * v.input),
    magnetising_ramp: BALANCED,
    // A rectifier holds off both halves of the secondary.
    highest_voltage: |v| v.input.max(v.ratio * v.input).max(v.output),
    landmarks: LANDMARKS,
    resting: RESTING,
    sizing: |given| first_sizes(given, 0.8, 0.5),
    left_out: &[
        LeftOut {
            place: "stage.topology",
            message: "The capacitors that halve the input are taken as stiff. Peak current mode drives their midpoint to one side unless a \
                      balancing winding holds it; that is not in the model.",
            hint: "common practice: voltage mode for a half-bridge, or a balancing winding with two diodes",
        },
        CENTRE_TAP,
        LEAKAGE_LEFT_OUT,
        MAGNETISING_LEFT_OUT,
    ],
    ..Topology::COMMON
};

fn draw(stage: &mut StageDrawing) {
    let (output, primary, middle) = (stage.node("output"), stage.node("primary"), stage.node("half input"));
    let (secondary, rectified) = (stage.node("secondary"), stage.node("switch node"));
    let isolated = stage.isolated_return();
    stage.switch_from_half_input(primary);
    stage.pulse_transformer_over_half_input((primary, middle), (secondary, isolated));
    stage.centre_tap(secondary, isolated, rectified);
    stage.smoothing_inductor(rectified, output);
    stage.output(output, isolated);
}
