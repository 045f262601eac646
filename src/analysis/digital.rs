//! What a difference equation comes to at the condition shown: coefficients as rounded and before, and what rounding and sampling do to the loop.

use super::analyse::{SEARCH_FROM, SEARCH_TO};
use super::loop_model::{LoopModel, Shared};
use super::result::{Condition, LoopResult};
use super::sampled::SharedDigital;
use crate::compensator::{Built, DifferenceEquation, Digital, FixedPoint};
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::linear::{Complex, FrequencyResponse, LinearError, Verdict, margins};

/// A difference equation at one condition.
#[derive(Clone, Debug)]
pub struct DigitalDetail {
    /// What the equation is made from.
    pub digital: Digital,
    /// Its coefficients as codes.
    pub codes: FixedPoint,
    /// The equation in the controller.
    pub equation: DifferenceEquation,
    /// The equation before rounding.
    pub exact: DifferenceEquation,
    /// Lanes as wanted and as built.
    pub lanes: Vec<Built>,
    /// From the start of a period to where a value set there acts [s]; none where the control voltage acts throughout.
    pub modulator_delay_s: Option<f64>,
    /// Closed-loop poles in the z plane.
    pub poles_z: Vec<Complex>,
    /// The loop with the equation before rounding.
    pub before_rounding: LoopResult,
}

/// The detail of a design with a difference equation.
///
/// # Errors
/// As the joining of systems.
pub(super) fn digital_detail(
    design: &CheckedDesign,
    shared: &Shared,
    model: &LoopModel,
    condition: &Condition,
) -> Result<Option<DigitalDetail>, LinearError> {
    let Some((SharedDigital { digital, equation }, before)) = shared.digital.as_ref().zip(shared.before_rounding())
    else {
        return Ok(None);
    };
    let Some(codes) = digital.fixed_point() else { return Ok(None) };
    let built = digital.corners_of(equation);
    let lanes = digital
        .aims
        .iter()
        .filter_map(|(key, aim_hz)| built.get(key).map(|as_built_hz| Built { key, aim_hz, as_built_hz }));
    let sampled = model.sampled(&SharedDigital { digital: *digital, equation: equation.clone() })?;
    let before_rounding = loop_result(design, &before, condition)?;
    Ok(before_rounding.map(|before_rounding| DigitalDetail {
        digital: *digital,
        codes,
        exact: digital.exact(),
        lanes: lanes.collect(),
        modulator_delay_s: model.modulator_delay_s,
        poles_z: sampled.poles_z().unwrap_or_default(),
        before_rounding,
        equation: equation.clone(),
    }))
}

/// Margins and verdict at a condition; none where the condition cannot be held.
fn loop_result(
    design: &CheckedDesign,
    shared: &Shared,
    condition: &Condition,
) -> Result<Option<LoopResult>, LinearError> {
    let Ok(model) = LoopModel::new(&design.stage, shared, &condition.of_stage(&design.stage)) else { return Ok(None) };
    let fs = design.stage.switching_frequency;
    let margins = margins(&model.loop_gain, fs * SEARCH_FROM, fs * SEARCH_TO);
    let judged = model.verdict(shared, &margins)?;
    Ok(Some(LoopResult {
        verdict: judged.verdict,
        sampled: judged.sampled,
        gain_at_half_switching_db: model.loop_gain.gain_db(fs / 2.0),
        gain_at_switching: 0.0,
        margins,
    }))
}

/// Refuses the exact side for a difference equation: neither its steady period nor its cycles are followed with sampled control.
///
/// # Errors
/// The finding that says so.
pub(super) fn refuse_switched(design: &CheckedDesign) -> Result<(), Finding> {
    if design.compensator.digital().is_none() {
        return Ok(());
    }
    let message = "The exact switched model is not offered for a difference equation: waveforms, multipliers and transients are those of analog control only. Stability and steps shown are those of the sampled loop on the averaged stage.";
    Err(Finding::problem("compensator.amplifier", message)
        .with_hint("choose an op amp with the same poles and zeros to see ripple and stress of the stage"))
}

/// Whether the loop is stable before rounding at a condition; none where that is not known.
pub(super) fn stable_before_rounding(design: &CheckedDesign, shared: &Shared, condition: &Condition) -> Option<bool> {
    let before = shared.before_rounding()?;
    let result = loop_result(design, &before, condition).ok()??;
    Some(matches!(result.verdict, Verdict::Stable { .. }))
}

/// The highest frequency at which curves of a design are worth drawing [Hz]: short of half the sampling frequency, at which zeros stand.
pub(super) fn highest_hz(design: &CheckedDesign) -> f64 {
    design.compensator.digital().map_or(f64::INFINITY, |digital| digital.highest_hz() * 0.998)
}

/// Magnitude of an equation's answer to an error at rest, where it does not integrate.
pub(super) fn gain_at_rest(shared: &Shared) -> Option<f64> {
    let digital = shared.digital.as_ref()?;
    let integrates = digital.equation.poles().contains(&Complex::ONE);
    (!integrates).then(|| shared.compensator_response.at_hz(f64::MIN_POSITIVE.sqrt()).norm())
}
