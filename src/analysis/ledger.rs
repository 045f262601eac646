//! The phase ledger: the phase at the headline crossover itemised by cause, adding up to the phase margin.

use super::curves::wrapped;
use super::loop_model::{LoopModel, Shared};
use super::pairs::{Pair, pairs};
use super::result::{Ledger, LedgerRole, LedgerRow};
use crate::compensator::{Compensator, Digital, LaneKind};
use crate::converter::Landmark;
use crate::converter::signals::LOAD_VOLTAGE;
use crate::linear::{FactorKind, FactorPhase, FactoredResponse};
use crate::quantity::{Unit, print_digits};
use std::f64::consts::TAU;

/// Shares of less than this [°] are taken together in one row.
const SMALL_DEG: f64 = 0.05;

/// How the rows of the stage begin that belong to a landmark, with its key.
const LANDMARKS: [(&str, &str); 8] = [
    ("LC resonance", "lc-resonance"),
    ("second resonance", "second-resonance"),
    ("zero pair", "zero-pair"),
    ("RHP zero pair", "zero-pair"),
    ("ESR zero", "esr-zero"),
    ("RHP zero", "right-half-plane-zero"),
    ("low pole", "low-pole"),
    ("sampling", "half-switching"),
];

/// The ledger at a crossover [Hz].
pub(super) fn ledger(
    model: &LoopModel,
    shared: &Shared,
    compensator: &Compensator,
    landmarks: &[Landmark],
    crossover_hz: f64,
) -> Ledger {
    let mut rows = vec![LedgerRow {
        label: "half turn".into(),
        degrees: 180.0,
        role: LedgerRole::HalfTurn,
        lane: None,
        landmark: None,
    }];
    let ideal = FactoredResponse::new(compensator.ideal(), 0.0);
    rows.extend(compensator_rows(compensator, &ideal, crossover_hz));
    let amplifier = shared.compensator_response.phase_deg(crossover_hz) - ideal.phase_deg(crossover_hz);
    match &shared.digital {
        Some(digital) => rows.extend(sampling_rows(&digital.digital, amplifier, crossover_hz)),
        None => rows.push(plain_row("amplifier", amplifier, LedgerRole::Amplifier)),
    }
    rows.extend(fast_path_row(model, shared, crossover_hz));
    let mut small = 0.0;
    let mut factors = model.plant.factor_phases_deg(crossover_hz);
    let cancelling = pairs(&mut factors);
    for factor in factors {
        if factor.phase_deg.abs() < SMALL_DEG && factor.kind != FactorKind::Delay {
            small += factor.phase_deg;
        } else {
            rows.extend(
                delays_apart(&factor, model, crossover_hz)
                    .unwrap_or_else(|| vec![plant_row(&factor, landmarks, model)]),
            );
        }
    }
    for pair in cancelling {
        if pair.phase_deg.abs() < SMALL_DEG {
            small += pair.phase_deg;
        } else {
            rows.push(pair_row(&pair));
        }
    }
    if small != 0.0 {
        rows.push(LedgerRow {
            label: "stage, far poles and zeros".into(),
            degrees: small,
            role: LedgerRole::Plant,
            lane: None,
            landmark: None,
        });
    }
    let sum: f64 = rows.iter().map(|row| row.degrees).sum();
    let phase_margin_deg = wrapped(sum);
    let turns = phase_margin_deg - sum;
    if turns.abs() > 180.0 {
        rows.push(LedgerRow {
            label: "whole turns".into(),
            degrees: turns,
            role: LedgerRole::Turns,
            lane: None,
            landmark: None,
        });
    }
    Ledger { frequency_hz: crossover_hz, rows, phase_margin_deg }
}

/// A row that belongs to no lane and no landmark.
fn plain_row(label: &str, degrees: f64, role: LedgerRole) -> LedgerRow {
    LedgerRow { label: label.into(), degrees, role, lane: None, landmark: None }
}

/// What a difference equation adds to its lanes: computation and hold by their delays, sampling and rounding by the rest.
fn sampling_rows(digital: &Digital, beside_lanes: f64, f: f64) -> Vec<LedgerRow> {
    let computation = -360.0 * f * digital.computation_s;
    let hold = if digital.held { -180.0 * f * digital.period_s } else { 0.0 };
    let mut rows = vec![plain_row("sampling", beside_lanes - computation - hold, LedgerRole::Sampling)];
    for (label, degrees) in [("computation", computation), ("hold of the converter", hold)] {
        if degrees != 0.0 {
            rows.push(plain_row(label, degrees, LedgerRole::Delay));
        }
    }
    rows
}

/// The plant's delay with the modulator's apart from it.
fn delays_apart(factor: &FactorPhase, model: &LoopModel, f: f64) -> Option<Vec<LedgerRow>> {
    let modulator = model.modulator_delay_s.filter(|_| factor.kind == FactorKind::Delay)?;
    let share = -360.0 * f * modulator;
    let mut rows = vec![plain_row("modulator", share, LedgerRole::Delay)];
    if model.controlled.delay_s > 0.0 {
        rows.push(plain_row("delay", factor.phase_deg - share, LedgerRole::Delay));
    } else if let Some(first) = rows.first_mut() {
        first.degrees = factor.phase_deg;
    }
    Some(rows)
}

/// What a fast path does that does not read the regulated voltage: the loop's phase beside that of plant and compensator.
fn fast_path_row(model: &LoopModel, shared: &Shared, f: f64) -> Option<LedgerRow> {
    let path = model.apart.as_ref()?;
    let product = model.plant.phase_deg(f) + shared.compensator_response.phase_deg(f);
    let place = if path.signal == LOAD_VOLTAGE { "at the load" } else { "at the bank" };
    Some(LedgerRow {
        label: format!("fast path {place}"),
        degrees: wrapped(model.loop_gain.phase_deg(f) - product),
        role: LedgerRole::Compensator,
        lane: None,
        landmark: None,
    })
}

/// One row per lane, and one for what the ideal network has beside its lanes.
fn compensator_rows(compensator: &Compensator, ideal: &FactoredResponse, f: f64) -> Vec<LedgerRow> {
    let mut rows: Vec<LedgerRow> = compensator
        .lanes()
        .iter()
        .map(|lane| {
            let at = print_digits(lane.frequency_hz, Unit::Hertz, 3);
            let turn = (f / lane.frequency_hz).atan().to_degrees();
            let (label, degrees) = match lane.kind {
                LaneKind::Gain => ("integrator".to_owned(), -90.0),
                LaneKind::Zero => (format!("zero {at}"), turn),
                LaneKind::Pole if lane.of_optocoupler => (format!("optocoupler with C2 {at}"), -turn),
                LaneKind::Pole => (format!("pole {at}"), -turn),
            };
            LedgerRow { label, degrees, role: LedgerRole::Compensator, lane: Some(lane.key), landmark: None }
        })
        .collect();
    let beside = ideal.phase_deg(f) - rows.iter().map(|row| row.degrees).sum::<f64>();
    if beside.abs() > 1e-6 {
        let named = compensator.beside_lanes();
        let label = named.map(|(what, hz)| format!("{what} {}", print_digits(hz, Unit::Hertz, 3)));
        rows.push(LedgerRow {
            label: label.unwrap_or_else(|| "network beside its lanes".into()),
            degrees: beside,
            role: LedgerRole::Compensator,
            lane: None,
            landmark: None,
        });
    } else if let Some(first) = rows.first_mut() {
        // Rounding of the sum, so that the ledger closes to the last digit.
        first.degrees += beside;
    }
    rows
}

/// One row for a pole and a zero that nearly cancel.
fn pair_row(pair: &Pair) -> LedgerRow {
    let label = format!("pole and zero near {}", print_digits(pair.frequency_hz, Unit::Hertz, 2));
    LedgerRow { label, degrees: pair.phase_deg, role: LedgerRole::Plant, lane: None, landmark: None }
}

fn plant_row(factor: &FactorPhase, landmarks: &[Landmark], model: &LoopModel) -> LedgerRow {
    let f = factor.root.norm() / TAU;
    let at = print_digits(f, Unit::Hertz, 3);
    let near = |key: &str| landmarks.iter().any(|m| m.key == key && (m.frequency_hz / f).ln().abs() < 0.3);
    let right = factor.root.re > 0.0;
    let sampled = model.controlled.sampling.is_some();
    let half =
        landmarks.iter().find(|mark| mark.key == "half-switching").map_or(f64::INFINITY, |mark| mark.frequency_hz);
    let (label, role) = match factor.kind {
        FactorKind::Sign => ("sign of the plant".to_owned(), LedgerRole::RightHalfPlane),
        FactorKind::Delay => ("delay".to_owned(), LedgerRole::Delay),
        // The rational form of the inner loop's delay; the stage's own lies lower.
        FactorKind::Zero if right && model.controlled.inner.is_some() && f > half => {
            (format!("delay of the inner loop {at}"), LedgerRole::Delay)
        }
        FactorKind::Zero if right => {
            let pair = if factor.root.im == 0.0 { "" } else { " pair" };
            (format!("RHP zero{pair} {at}"), LedgerRole::RightHalfPlane)
        }
        FactorKind::Zero if factor.root.im != 0.0 => (format!("zero pair {at}"), LedgerRole::Plant),
        FactorKind::Zero if near("esr-zero") => (format!("ESR zero {at}"), LedgerRole::Plant),
        FactorKind::Zero => (format!("stage zero {at}"), LedgerRole::Plant),
        FactorKind::Pole if right => (format!("RHP pole {at}"), LedgerRole::RightHalfPlane),
        FactorKind::Pole if near("low-pole") => (format!("low pole {at}"), LedgerRole::Plant),
        FactorKind::Pole if sampled && factor.root.im != 0.0 && near("half-switching") => {
            (format!("sampling pair {at}"), LedgerRole::Plant)
        }
        // A pair of low quality parts into two poles around half the switching frequency.
        FactorKind::Pole if sampled && factor.root.im == 0.0 && f > half / 10.0 => {
            (format!("sampling pole {at}"), LedgerRole::Plant)
        }
        FactorKind::Pole if factor.root.im != 0.0 && near("lc-resonance") => {
            (format!("LC resonance {at}"), LedgerRole::Plant)
        }
        FactorKind::Pole if factor.root.im != 0.0 && near("second-resonance") => {
            (format!("second resonance {at}"), LedgerRole::Plant)
        }
        FactorKind::Pole if factor.root.im != 0.0 => (format!("resonance {at}"), LedgerRole::Plant),
        FactorKind::Pole if near("second-pole") => (format!("second pole {at}"), LedgerRole::Plant),
        FactorKind::Pole => (format!("stage pole {at}"), LedgerRole::Plant),
    };
    let key = LANDMARKS.iter().find(|(words, _)| label.starts_with(words)).map(|(_, key)| *key);
    let landmark = landmarks.iter().map(|mark| mark.key).find(|own| Some(*own) == key);
    LedgerRow { label, degrees: factor.phase_deg, role, lane: None, landmark }
}
