//! What the control law comes to at one condition: control voltage, sampling figures, the inner loop and its margins.

use super::loop_model::LoopModel;
use super::result::{ControlFigures, InnerResult};
use crate::linear::{LinearError, closed_loop_verdict_knowing, margins};

/// The figures of a condition; margins of an inner loop are searched between two frequencies [Hz].
///
/// # Errors
/// As taking the poles of the controlled stage.
pub(super) fn control_figures(model: &LoopModel, from_hz: f64, to_hz: f64) -> Result<ControlFigures, LinearError> {
    let controlled = &model.controlled;
    let inner = match &controlled.inner {
        None => None,
        Some(inner) => {
            let margins = margins(&inner.loop_gain, from_hz, to_hz);
            let poles = controlled.stage.poles()?;
            Some(InnerResult {
                verdict: closed_loop_verdict_knowing(&poles, &inner.loop_gain, &margins),
                margins,
                output_voltage: inner.output_voltage,
                output_limits: inner.output_limits,
                slope_ratio: inner.slope_ratio,
            })
        }
    };
    Ok(ControlFigures { control_voltage: controlled.control_voltage, sampling: controlled.sampling, inner })
}
