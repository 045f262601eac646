//! The crossover window: the band of crossover frequencies the stage allows, each edge named by what sets it.
//!
//! *Source* of the rules: common practice, never laws. Least: twice the highest LC resonance, and the load-step need
//! f ≥ ΔI/(2π·C·ΔV). Greatest: a third of the lowest right-half-plane zero, a fifth of the switching frequency, and where
//! the amplifier lags its ideal by 10°.

use super::condition::NOMINAL;
use super::conduction::resonates;
use super::loop_model::Shared;
use super::result::{Condition, ConditionResult, CrossoverWindow, WindowEdge};
use crate::design::{Asked, CheckedDesign, Scope};
use crate::linear::FactoredResponse;
use crate::quantity::{Unit, print, print_digits};
use std::f64::consts::TAU;

/// Crossover over the highest LC resonance.
const ABOVE_RESONANCE: f64 = 2.0;
/// Lowest right-half-plane zero over crossover, where no requirement states one.
const BELOW_ZERO: f64 = 3.0;
/// Switching frequency over crossover.
const BELOW_SWITCHING: f64 = 5.0;
/// Lag of the amplifier against its ideal that counts as its end [°].
const AMPLIFIER_LAG_DEG: f64 = 10.0;

/// What sets an edge, for the remedy of an empty window.
#[derive(Clone, Copy, PartialEq)]
enum Cause {
    Resonance,
    LoadStep,
    RightHalfPlaneZero,
    Other,
}

/// The window of a design over its nine conditions.
pub(super) fn window(design: &CheckedDesign, shared: &Shared, conditions: &[ConditionResult]) -> CrossoverWindow {
    let lower = [resonance_edge(design, conditions), load_step_edge(design)];
    let upper = [right_half_plane_edge(design, conditions), switching_edge(design), amplifier_edge(design, shared)];
    let lower = lower.into_iter().flatten().max_by(|a, b| a.0.frequency_hz.total_cmp(&b.0.frequency_hz));
    let upper = upper.into_iter().flatten().min_by(|a, b| a.0.frequency_hz.total_cmp(&b.0.frequency_hz));
    let empty = match (&lower, &upper) {
        (Some(low), Some(high)) if low.0.frequency_hz > high.0.frequency_hz => {
            remedy(low.1, high.1, low.0.frequency_hz / high.0.frequency_hz)
        }
        _ => String::new(),
    };
    CrossoverWindow { lower: lower.map(|e| e.0), upper: upper.map(|e| e.0), empty }
}

fn edge(frequency_hz: f64, cause: String, kind: Cause) -> Option<(WindowEdge, Cause)> {
    (frequency_hz.is_finite() && frequency_hz > 0.0)
        .then_some((WindowEdge { frequency_hz, cause, of_resonance: kind == Cause::Resonance }, kind))
}

/// The highest LC resonance of the conditions that have one [Hz], and the condition it belongs to.
pub(super) fn highest_resonance<'a>(
    design: &CheckedDesign,
    conditions: &'a [ConditionResult],
) -> Option<(f64, &'a Condition)> {
    if !design.law.voltage_mode() {
        // Current mode leaves no resonance of inductor and output capacitor.
        return None;
    }
    let form = design.stage.topology().landmark("lc-resonance")?;
    let resonance = |condition: &Condition| (form.hz)(&design.stage.textbook(&condition.of_stage(&design.stage)));
    // In discontinuous conduction there is no resonance.
    let resonates = |c: &&ConditionResult| c.outcome.as_ref().map_or(true, resonates);
    conditions
        .iter()
        .filter(resonates)
        .filter_map(|c| Some((resonance(&c.condition)?, &c.condition)))
        .max_by(|a, b| a.0.total_cmp(&b.0))
}

fn resonance_edge(design: &CheckedDesign, conditions: &[ConditionResult]) -> Option<(WindowEdge, Cause)> {
    let highest = highest_resonance(design, conditions)?;
    let cause =
        format!("{ABOVE_RESONANCE} × LC resonance {} at {}", print_digits(highest.0, Unit::Hertz, 3), highest.1.label);
    edge(ABOVE_RESONANCE * highest.0, cause, Cause::Resonance)
}

fn load_step_edge(design: &CheckedDesign) -> Option<(WindowEdge, Cause)> {
    let asked = |scope| design.requirements.get(Asked::LoadStepDeviation, scope).map(|limit| limit.value);
    let deviation = asked(Scope::Worst).into_iter().chain(asked(Scope::Nominal)).min_by(f64::total_cmp)?;
    let change = design.events.load_step.change.abs();
    let need = change / (TAU * design.stage.output_capacitance() * deviation);
    let cause =
        format!("load step {} within {}: ΔI / (2π·C·ΔV)", print(change, Unit::Ampere), print(deviation, Unit::Volt));
    edge(need, cause, Cause::LoadStep)
}

fn right_half_plane_edge(design: &CheckedDesign, conditions: &[ConditionResult]) -> Option<(WindowEdge, Cause)> {
    let asked = |scope| design.requirements.get(Asked::RightHalfPlaneRatio, scope).map(|limit| limit.value);
    let ratio = asked(Scope::Worst).or(asked(Scope::Nominal)).unwrap_or(BELOW_ZERO);
    let zero = |c: &ConditionResult| c.outcome.as_ref().ok().and_then(|s| s.right_half_plane_zero_hz);
    let lowest =
        conditions.iter().filter_map(|c| zero(c).map(|f| (f, &c.condition))).min_by(|a, b| a.0.total_cmp(&b.0))?;
    let cause = format!("RHP zero {} ÷ {ratio} at {}", print_digits(lowest.0, Unit::Hertz, 3), lowest.1.label);
    edge(lowest.0 / ratio, cause, Cause::RightHalfPlaneZero)
}

fn switching_edge(design: &CheckedDesign) -> Option<(WindowEdge, Cause)> {
    let fs = design.stage.switching_frequency;
    edge(fs / BELOW_SWITCHING, format!("switching {} ÷ {BELOW_SWITCHING}", print(fs, Unit::Hertz)), Cause::Other)
}

fn amplifier_edge(design: &CheckedDesign, shared: &Shared) -> Option<(WindowEdge, Cause)> {
    if shared.digital.is_some() {
        // What sampling and computation take is in the loop; it ends nothing.
        return None;
    }
    let ideal = FactoredResponse::new(design.compensator.ideal(), 0.0);
    let lag = |f: f64| ideal.phase_deg(f) - shared.compensator_response.phase_deg(f);
    let top = design.stage.switching_frequency / 2.0;
    if lag(top) < AMPLIFIER_LAG_DEG {
        return None;
    }
    // The lag is small at low frequency, where it is of the other sign, and grows; the bisection is in ln f.
    let (mut low, mut high) = ((top * 1e-4).ln(), top.ln());
    for _ in 0..40 {
        let middle = f64::midpoint(low, high);
        if lag(middle.exp()) < AMPLIFIER_LAG_DEG { low = middle } else { high = middle }
    }
    edge(low.exp(), format!("amplifier lags its ideal by {AMPLIFIER_LAG_DEG}°"), Cause::Other)
}

/// What would open an empty window: the resonance goes with 1/√(LC), the load-step need with 1/C, the right-half-plane
/// zero with 1/L.
fn remedy(lower: Cause, upper: Cause, ratio: f64) -> String {
    let (capacitance, inductance) = match (lower, upper) {
        (Cause::Resonance, Cause::RightHalfPlaneZero) => (Some(ratio * ratio), Some(1.0 / (ratio * ratio))),
        (Cause::Resonance, _) => (Some(ratio * ratio), Some(ratio * ratio)),
        (Cause::LoadStep, Cause::RightHalfPlaneZero) => (Some(ratio), Some(1.0 / ratio)),
        (Cause::LoadStep, _) => (Some(ratio), None),
        _ => (None, None),
    };
    let mut ways = Vec::new();
    if let Some(factor) = capacitance {
        ways.push(format!("{} × the capacitance", print_digits(factor, Unit::One, 2)));
    }
    if let Some(factor) = inductance {
        ways.push(format!("{} × the inductance", print_digits(factor, Unit::One, 2)));
    }
    format!("empty: needs {}", ways.join(" or "))
}

/// The crossover of the nominal condition against the window, for a remark.
pub(super) fn nominal_crossover(conditions: &[ConditionResult]) -> Option<f64> {
    let summary = conditions.get(NOMINAL)?.outcome.as_ref().ok()?;
    summary.loop_gain.margins.headline_crossover().map(|c| c.frequency_hz)
}
