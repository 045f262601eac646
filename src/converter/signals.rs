//! Names of the inputs and outputs of an averaged stage.

/// Input: duty ratio of the controlled switch.
pub const DUTY: &str = "duty";
/// Input: voltage of the ideal source [V].
pub const INPUT_VOLTAGE: &str = "input voltage";
/// Input: current drawn from the output [A].
pub const LOAD_CURRENT: &str = "load current";
/// Output: voltage that is sensed and regulated, a magnitude [V].
pub const OUTPUT_VOLTAGE: &str = "output voltage";
/// Output: average current of the first inductor [A].
pub const INDUCTOR_CURRENT: &str = "inductor current";
/// Output: average current drawn from the ideal source [A].
pub const INPUT_CURRENT: &str = "input current";
/// Output: voltage at the load's terminals, a magnitude [V]; the output voltage unless a second stage stands between.
pub const LOAD_VOLTAGE: &str = "load voltage";
/// Output: voltage of the output bank, ahead of a second stage, a magnitude [V]; the output voltage unless that is sensed at the load.
pub const BANK_VOLTAGE: &str = "bank voltage";
/// Output: average switched current [A], the one that stops when switch and rectifier block: the inductor's, or the
/// sum of both in a stage of two inductors.
pub const SWITCHED_CURRENT: &str = "switched current";
/// Output: slope of the switched current while the switch conducts less that while the rectifier does [A/s].
pub const SLOPE_DIFFERENCE: &str = "slope difference";
/// Output: slope of the switched current while the switch conducts [A/s].
pub const ON_SLOPE: &str = "on slope";

/// Output: slope of a current that adds to the sensed one as a ramp, in amperes of switched current [A/s]: a transformer's
/// magnetising current.
pub const NATURAL_RAMP: &str = "natural ramp";

/// The inputs, in column order.
pub(super) const INPUTS: [&str; 3] = [DUTY, INPUT_VOLTAGE, LOAD_CURRENT];
/// The outputs, in row order.
pub(super) const OUTPUTS: [&str; 9] = [
    OUTPUT_VOLTAGE,
    INDUCTOR_CURRENT,
    INPUT_CURRENT,
    LOAD_VOLTAGE,
    BANK_VOLTAGE,
    SWITCHED_CURRENT,
    SLOPE_DIFFERENCE,
    ON_SLOPE,
    NATURAL_RAMP,
];
