//! What stands around the stage: rectifier, modulator, divider, amplifier, requirements.

use super::assumption::{Draft, text};
use super::stage::aim;
use crate::compensator::{Series, round_ratio};
use crate::finding::Finding;
use crate::quantity::Unit;

/// References that controllers commonly have [V], the usual one first.
const REFERENCES: [f64; 4] = [1.25, 0.8, 0.6, 0.3];
/// Output over reference from which a divider is worth its resistors.
const LEAST_RATIO: f64 = 1.1;
/// Current through the divider at most [A], and its power [W].
const DIVIDER: (f64, f64) = (0.5e-3, 50e-3);
/// Delay of comparator and driver [s], and the share of a period it takes at most.
const DELAY: (f64, f64) = (100e-9, 0.04);
/// Gain-bandwidth product over crossover, at least.
const BANDWIDTH: f64 = 200.0;

/// What the stage's operating point needs to be found.
pub(super) fn before_the_stage(draft: &mut Draft) {
    draft.choose(
        "stage.rectifier",
        "synchronous",
        "conduction stays continuous down to no load; choose a diode in the form where one is meant",
        false,
    );
    draft.choose("control.mode", "voltage", "the control voltage sets the duty ratio through a ramp", false);
    let output = draft.get("stage.output.voltage");
    let reference = REFERENCES.into_iter().find(|volts| output / volts >= LEAST_RATIO).unwrap_or(output / 2.0);
    draft.assume("compensator.reference", reference, "a usual reference below the output", true);
    let amperes = DIVIDER.0.min(DIVIDER.1 / output);
    let total = output / amperes;
    let lower = total * reference / output;
    let (upper, lower) = round_ratio(Series::E96.nearest(total - lower), lower, Series::E96, false, false);
    let reason = format!(
        "{} through the divider, at most {}; E96",
        text(output / (upper + lower), Unit::Ampere),
        text(DIVIDER.1, Unit::Watt)
    );
    draft.assume("compensator.divider.upper", upper, reason, true);
    draft.assume("compensator.divider.lower", lower, "output voltage = reference × (1 + upper / lower); E96", false);
}

/// Modulator, amplifier and requirements.
pub(super) fn after_the_stage(draft: &mut Draft) -> Result<(), Vec<Finding>> {
    // That of the pulses, in a double-ended stage twice that of a switch.
    let switching = draft.checked()?.stage.switching_frequency;
    draft.assume("control.ramp.amplitude", 1.2, "a usual ramp; take the controller's", true);
    draft.assume("control.ramp.valley", 0.5, "keeps the control voltage off the amplifier's lower end", true);
    let (delay, share) = DELAY;
    let reason = format!("comparator and driver, at most {} % of a period", text(100.0 * share, Unit::One));
    draft.assume("control.delay", delay.min(share / switching), reason, true);
    let (crossover, _) = aim(&draft.checked()?);
    draft.choose("compensator.amplifier", "op-amp", "the usual amplifier of voltage mode", true);
    draft.choose(
        "compensator.type",
        "3",
        "the LC resonance takes up to 180° of phase, and only type III gives them back",
        false,
    );
    draft.assume(
        "compensator.op-amp.gain-bandwidth",
        (BANDWIDTH * crossover).max(10e6),
        format!("{} × the crossover aimed at, 10 MHz at least, so that its lag is small", text(BANDWIDTH, Unit::One)),
        true,
    );
    draft.assume("compensator.op-amp.output-greatest", 4.5, "a 5 V supply less its headroom", true);
    // The circuit's own limit on the duty ratio, a little below so that rounding does not leave it above.
    if let Some(limit) = draft.checked()?.stage.duty_limit {
        draft.assume("control.duty.greatest", (limit.greatest * 100.0).floor() / 100.0, limit.why, false);
    }
    requirements(draft, switching);
    Ok(())
}

/// Requirements by common practice; the deviation is the one that was given.
fn requirements(draft: &mut Draft, switching: f64) {
    let practice = [
        ("requirement.phase-margin.worst", 45.0, "45° at least"),
        ("requirement.gain-margin.worst", 6.0, "6 dB at least"),
        ("requirement.modulus-margin.worst", 0.5, "peak sensitivity of 2 at most"),
        ("requirement.crossover.greatest.worst", switching / 5.0, "a fifth of the switching frequency at most"),
    ];
    for (path, value, reason) in practice {
        draft.assume(path, value, reason, true);
    }
    let with_zero = |topology: &crate::converter::Topology| topology.landmark("right-half-plane-zero").is_some();
    let topology = draft.design.choices.get("stage.topology").and_then(crate::converter::find);
    if topology.is_some_and(with_zero) {
        draft.assume("requirement.right-half-plane-ratio.worst", 3.0, "three to five times the crossover", true);
    }
}
