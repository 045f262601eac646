//! What the stages of two inductors and a coupling capacitor share: their rows, first sizes and textbook forms.
//!
//! *Conventions*: both inductors see the same voltage while the switch conducts; their currents add up in switch and rectifier.
//! Coupled, their dots are at the ends where that voltage is positive.
//! *Source* of the forms: own derivation by Cramer's rule from the averaged equations (state-space averaging, Middlebrook & Ćuk
//! 1976) without losses. Resonances and zero pairs are those without load, whose damping is left out; tests hold the whole
//! polynomials against the derived model. A damping branch is left out of them, too.

use super::landmark::{BANK, Form, Textbook};
use super::sizing::{Sized, Sizing};
use super::topology_entries::{
    COUPLING, COUPLING_CAPACITOR, COUPLING_CAPACITOR_ESR, DAMPING, DAMPING_CAPACITANCE, DAMPING_RESISTANCE, INDUCTORS,
    INPUT_SIDE_INDUCTOR, INPUT_SIDE_WINDING, SECOND_INDUCTOR, SECOND_WINDING,
};
use crate::quantity::{Choice, Entry};
use std::f64::consts::TAU;

/// Numbers of a stage of two inductors.
pub(super) const ENTRIES: &[&Entry] = &[
    &INPUT_SIDE_INDUCTOR,
    &INPUT_SIDE_WINDING,
    &SECOND_INDUCTOR,
    &SECOND_WINDING,
    &COUPLING,
    &COUPLING_CAPACITOR,
    &COUPLING_CAPACITOR_ESR,
    &DAMPING_CAPACITANCE,
    &DAMPING_RESISTANCE,
];

/// Its choices.
pub(super) const CHOICES: &[&Choice] = &[&INDUCTORS, &DAMPING];

/// Entries that make what the coupling capacitor does.
pub(super) const OF_COUPLING: &[&str] =
    &[COUPLING_CAPACITOR.path, "stage.inductor.inductance", SECOND_INDUCTOR.path, COUPLING.path];

const OF_BOTH: &[&str] = &["stage.inductor.inductance", SECOND_INDUCTOR.path, COUPLING.path, BANK];
const OF_ALL: &[&str] =
    &[COUPLING_CAPACITOR.path, "stage.inductor.inductance", SECOND_INDUCTOR.path, COUPLING.path, BANK];

/// Inductance that the sum of both currents sees [H]: (L1·L2 − M²) / (L1 + L2 − 2M), L1 and L2 in parallel where separate.
pub(super) fn parallel(t: &Textbook) -> f64 {
    inner(t) / (t.inductance + t.second_inductance - 2.0 * t.mutual())
}

/// L1·L2 − M² [H²].
fn inner(t: &Textbook) -> f64 {
    t.inductance * t.second_inductance - t.mutual().powi(2)
}

/// L1 + L2 − 2M, what a current round through both inductors sees [H].
pub(super) fn round(t: &Textbook) -> f64 {
    t.inductance + t.second_inductance - 2.0 * t.mutual()
}

/// L1·D² + L2·D'² + 2·M·D·D', what the output capacitor sees [H].
pub(super) fn seen_by_output(t: &Textbook) -> f64 {
    let (on, off) = (t.duty, 1.0 - t.duty);
    t.inductance * on * on + t.second_inductance * off * off + 2.0 * t.mutual() * on * off
}

/// Lower and upper root of a4·ω⁴ − a2·ω² + D'² = 0 [Hz], with a4 = C·Cc·(L1·L2 − M²).
fn resonances(t: &Textbook, second: f64) -> (f64, f64) {
    let (fourth, none) = (t.capacitance * t.coupling_capacitance * inner(t), (1.0 - t.duty).powi(2));
    // Never negative for a passive circuit, but for rounding.
    let root = (second * second - 4.0 * fourth * none).max(0.0).sqrt();
    let upper = (second + root) / (2.0 * fourth);
    let lower = 2.0 * none / (second + root);
    (lower.sqrt() / TAU, upper.sqrt() / TAU)
}

/// The resonances as landmarks, from the coefficient of ω².
pub(super) const fn low_resonance(formula: &'static str, hz: fn(&Textbook) -> Option<f64>) -> Form {
    Form { key: "lc-resonance", name: "LC resonance", formula, hz, parts: OF_BOTH }
}

/// The upper resonance, which the coupling capacitor makes.
pub(super) const fn upper_resonance(formula: &'static str, hz: fn(&Textbook) -> Option<f64>) -> Form {
    Form { key: "second-resonance", name: "Second resonance", formula, hz, parts: OF_ALL }
}

/// The zero pair that the coupling capacitor makes.
pub(super) const fn zero_pair(formula: &'static str, hz: fn(&Textbook) -> Option<f64>) -> Form {
    Form { key: "zero-pair", name: "Zero pair", formula, hz, parts: OF_COUPLING }
}

/// Lower resonance [Hz], given the coefficient of ω² [s²].
pub(super) fn lower_hz(t: &Textbook, second: f64) -> f64 {
    resonances(t, second).0
}

/// Upper resonance [Hz], likewise.
pub(super) fn upper_hz(t: &Textbook, second: f64) -> f64 {
    resonances(t, second).1
}

/// Ripple of either inductor's current over its average, as of a new design.
const RIPPLE: f64 = 0.35;
/// Ripple of the coupling capacitor's voltage over the input's.
const COUPLING_RIPPLE: f64 = 0.05;
/// ESR times capacitance of ceramic capacitors [s].
const ESR_TIME: f64 = 0.5e-6;
/// Damping capacitor over coupling capacitor.
const DAMPING_SHARE: f64 = 4.0;
/// Optimum resistance over √(L/C) for a branch of four times the capacitance: √((2 + n)·(4 + 3n) / (2n²·(4 + n))), n = 4 (Erickson &
/// Maksimovic, Fundamentals of Power Electronics, 17.4.1, from memory).
const DAMPING_RATIO: f64 = 0.612;
/// Loss of a winding over the output power.
const LOSS: f64 = 0.005;

/// First sizes by lossless forms; the engine sizes the first inductor by its ripple.
pub(super) fn sizing(s: &Sizing) -> Vec<Sized> {
    let duty = |input: f64| s.output / (s.output + input);
    let volt_seconds = [s.input.0, s.input.1].map(|input| input * duty(input) / s.switching_frequency);
    let most = volt_seconds.into_iter().fold(0.0, f64::max);
    let second = most / (RIPPLE * s.load);
    let first = s.inductance.unwrap_or(most / (RIPPLE * s.load * s.output / s.input.0));
    // The charge of a period is greatest at the least input, and so is its share of the voltage.
    let charge = s.load * duty(s.input.0) / s.switching_frequency;
    let farads = charge / (COUPLING_RIPPLE * s.input.0);
    let impedance = ((first + second) / farads).sqrt();
    vec![
        Sized::by_rule(SECOND_INDUCTOR.path, second, "ΔI = V·t / L: 35 % of the greatest load; 30 to 40 % are usual"),
        Sized::by_rule(
            SECOND_WINDING.path,
            LOSS * s.output / s.load,
            "R = 0.5 % of the output power / I², at full load",
        ),
        Sized::by_rule(COUPLING_CAPACITOR.path, farads, "C = I·D / (fs·ΔV), with ΔV 5 % of the least input"),
        Sized::by_rule(COUPLING_CAPACITOR_ESR.path, ESR_TIME / farads, "ceramic capacitors: ESR·C about 0.5 µs"),
        Sized::chosen(
            DAMPING.path,
            "capacitor",
            "undamped, the coupling capacitor's resonance turns the phase by a whole turn",
        ),
        Sized::by_rule(DAMPING_CAPACITANCE.path, DAMPING_SHARE * farads, "four times the coupling capacitor"),
        Sized::by_rule(
            DAMPING_RESISTANCE.path,
            DAMPING_RATIO * impedance,
            "0.61·√((L1 + L2) / C), the optimum for that capacitor",
        ),
    ]
}
