//! What all stages have in common that are a buck behind a transformer: rows, textbook forms, remarks, first sizes.
//!
//! *Model*: one pulse at the secondary, Vin·n (half of it where the input is halved), chopped and smoothed like a buck's; two pulses
//! per period of one switch in a double-ended stage, so D is a share of a pulse's period and T that period in every law.
//! The magnetising current is no state of the averaged model: it starts anew every pulse, or alternates. It adds to the switch's
//! current: see [`Magnetising`](super::topology::Magnetising). The leakage inductance delays every pulse by
//! Lleak·n·I/Vin, which costs the volt-seconds of a resistance n²·Lleak·f in series with the output inductor, f the frequency of the pulses.
//! *Source* of the landmarks: the buck's with n·Vin in the place of the input, Erickson & Maksimovic, Fundamentals of Power
//! Electronics, 3rd ed., 6.3 and Table 8.2; in discontinuous conduction ch. 15, M = Vout/(n·Vin), K = 2·L·f/R (forms from memory).
//! Commutation resistance: common practice (own derivation in the tests).

use super::entries::part;
use super::landmark::{Form, RestingForms};
use super::sizing::{Sized, Sizing, two_digits};
use super::topology::LeftOut;
use super::topology_entries::RATIO;
use crate::quantity::{Bounds, Entry, Unit};
use std::f64::consts::{PI, TAU};

/// Magnetising inductance of a transformer that stores nothing.
pub(super) static MAGNETISING: Entry = part(
    "stage.transformer.magnetising",
    "Magnetising inductance",
    Unit::Henry,
    Bounds::Positive,
    500e-6,
    "Inductance of the primary winding with the secondary open. Its current adds to the switch's: in peak current mode it is a ramp of its own.",
)
.spread(0.25);

/// Leakage inductance.
pub(super) static LEAKAGE: Entry = part(
    "stage.transformer.leakage",
    "Leakage inductance",
    Unit::Henry,
    Bounds::NonNegative,
    0.0,
    "Inductance of the primary winding with the secondary shorted; 0 for none. It delays every pulse, as a resistance n²·Lleak·f in series with the inductor would.",
)
.spread(0.3);

/// Name of the slot of the commutation resistance.
pub(super) const COMMUTATION: &str = "commutation resistance";

/// Resistance n²·Lleak·fs that the leakage inductance acts as, for one pulse per period [Ω].
pub(super) fn commutation_resistance(get: &dyn Fn(&str) -> f64) -> f64 {
    get(RATIO.path).powi(2) * get(LEAKAGE.path) * get("stage.switching-frequency")
}

/// The textbook resonance.
pub(super) const LANDMARKS: &[Form] =
    &[Form::resonance("1 / (2π·√(L·C))", |t| Some(1.0 / (TAU * (t.inductance * t.capacitance).sqrt())))];

/// The textbook forms of discontinuous conduction.
pub(super) const RESTING: RestingForms = RestingForms {
    conversion: |t| t.seen_conversion,
    duty: |m, k| m * (k / (1.0 - m)).sqrt(),
    landmarks: &[
        Form::low_pole("(2 − M) / ((1 − M)·2π·R·C)", |t| {
            let m = t.seen_conversion;
            Some((2.0 - m) / ((1.0 - m) * TAU * t.load_resistance * t.capacitance))
        }),
        Form::second_pole("M·f / (π·D·(1 − M))", |t| {
            let m = t.seen_conversion;
            Some(m * t.switching_frequency / (PI * t.duty * (1.0 - m)))
        }),
    ],
    ..RestingForms::NONE
};

/// What the commutation's model leaves out.
pub(super) const LEAKAGE_LEFT_OUT: LeftOut = LeftOut {
    place: LEAKAGE.path,
    message: "Leakage inductance counts as the resistance n²·Lleak·f in series with the inductor, by its average current while that flows continuously. What it \
              takes is not a loss where clamp or body diodes return it to the input, so the input current is overstated by that \
              much; ringing and clamp are left out.",
    hint: "look at the duty ratio at full load and least input, where the delay of the pulses costs most",
};

/// What is left out of the magnetising current.
pub(super) const MAGNETISING_LEFT_OUT: LeftOut = LeftOut {
    place: MAGNETISING.path,
    message: "The magnetising current is in the switch's peak and, as a ramp, in peak current mode; its own losses, and in valley and average \
              current mode the current itself, are left out. It is taken as balanced: what drives the core to one side is not in the model.",
    hint: "keep the magnetising current well below the reflected load current",
};

/// The rectifier that conducts during a pulse, of two at a centre tap.
pub(super) const PULSE: &str = "rectifier of the pulse";
/// Both rectifiers at a centre tap, which share the inductor's current between pulses.
pub(super) const FREEWHEEL: &str = "both rectifiers";

/// Holds the voltage of the windings at nothing while no switch conducts; nothing flows in it.
pub(super) const AT_REST: &str = "windings at rest";

/// Share of the magnetising slope that acts as a ramp where the flux swings to both sides.
///
/// From one pulse to the next the magnetising current changes its sign, m(k) = −m(k−1) + μ·T·d(k), and meets the control voltage together
/// with the inductor's. At rest that is half the slope μ over the pulse; and with the inductor's slopes m1 up and m2 down deviations decay
/// where m2 < m1 + μ, just as with a ramp of μ/2, for which the boundary is m2 < m1 + 2·μ/2.
pub(super) const BALANCED: f64 = 0.5;

/// What is meant by the two rectifiers drawn.
pub(super) const CENTRE_TAP: LeftOut = LeftOut {
    place: "stage.rectifier",
    message: "Two rectifiers at a centre-tapped secondary: one conducts in a pulse, both share the current between pulses, and one \
              pulse of the two is drawn. A bridge of four has two drops in series in every interval.",
    hint: "for a bridge of four rectifiers enter twice drop and resistance",
};

/// Turns ratio, magnetising and leakage inductance for a new design: `duty` is aimed at with the least input, of which the primary
/// sees `share`.
pub(super) fn first_sizes(given: &Sizing, duty: f64, share: f64) -> Vec<Sized> {
    /// Output voltage with the drops on the way there.
    const WITH_LOSSES: f64 = 1.06;
    /// Magnetising current, peak to peak, over the reflected load current.
    const MAGNETISING_SHARE: f64 = 0.1;
    /// Leakage over magnetising inductance.
    const LEAKAGE_SHARE: f64 = 0.003;
    let least = given.input.0 * share;
    let ratio = two_digits(given.output * WITH_LOSSES / (duty * least));
    let why = if share < 1.0 { ", half of which the primary sees" } else { "" };
    let reflected = ratio * given.load;
    // The volt-seconds of a pulse are those of the output, whatever the input.
    let volt_seconds = given.output / (ratio * given.switching_frequency);
    let magnetising = two_digits(volt_seconds / (MAGNETISING_SHARE * reflected));
    vec![
        Sized::by_rule(RATIO.path, ratio, format!("n = 1.06·Vout / (D·Vin), with D {duty} at the least input{why}")),
        Sized::by_rule(
            MAGNETISING.path,
            magnetising,
            "its current swings by a tenth of the reflected full load current",
        ),
        Sized::by_rule(LEAKAGE.path, LEAKAGE_SHARE * magnetising, "0.3 % of the magnetising inductance"),
    ]
}
