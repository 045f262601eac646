//! Isolated feedback in the report: its object in the JSON, its section in the text.

use crate::analysis::{Analysis, AtRatio, Detail};
use crate::compensator::LedSupply;
use crate::design::CheckedDesign;
use crate::linear::Verdict;
use serde::Serialize;

/// Isolated feedback at the shown condition.
#[derive(Serialize)]
pub(super) struct Isolated {
    transfer_ratio: [f64; 3],
    fast_path: &'static str,
    fast_path_gain_db: Option<f64>,
    least_crossover_hz: Option<f64>,
    led_current: f64,
    cathode_current: f64,
    cathode_voltage: f64,
    control_voltage_least: f64,
    control_voltage_greatest: f64,
    greatest_led_resistor: Option<f64>,
    output_error_v: f64,
    at_least_ratio: End,
    at_greatest_ratio: End,
}

/// The loop at one end of the transfer ratio.
#[derive(Serialize)]
pub(super) struct End {
    stable: Option<bool>,
    crossover_hz: Option<f64>,
    phase_margin_deg: Option<f64>,
    gain_margin_db: Option<f64>,
    modulus_margin: f64,
}

/// The object at the shown condition; none where the feedback is not isolated.
pub(super) fn object(design: &CheckedDesign, detail: &Detail) -> Option<Isolated> {
    let regulator = design.compensator.isolated()?;
    let figures = detail.isolated.as_ref()?;
    let greatest = design.compensator.greatest_led_resistor(figures.feed, regulator.saturation);
    Some(Isolated {
        transfer_ratio: regulator.ratios,
        fast_path: match regulator.led_supply {
            LedSupply::Load => "load",
            LedSupply::Bank => "bank",
            LedSupply::Fixed(_) => "none",
        },
        fast_path_gain_db: design.compensator.fast_path_gain().map(|gain| 20.0 * gain.log10()),
        least_crossover_hz: figures.floor_crossover_hz,
        led_current: figures.bias.led_current,
        cathode_current: figures.bias.cathode_current,
        cathode_voltage: figures.bias.cathode_voltage,
        control_voltage_least: figures.control_limits.0,
        control_voltage_greatest: figures.control_limits.1,
        greatest_led_resistor: greatest.filter(|ohms| *ohms > 0.0),
        output_error_v: figures.output_error,
        at_least_ratio: end(&figures.ends[0]),
        at_greatest_ratio: end(&figures.ends[1]),
    })
}

/// One end of the transfer ratio.
pub(super) fn end(at: &AtRatio) -> End {
    let crossover = at.margins.headline_crossover();
    End {
        stable: match at.verdict {
            Verdict::Stable { .. } => Some(true),
            Verdict::Unstable { .. } => Some(false),
            Verdict::Undecided { .. } => None,
        },
        crossover_hz: crossover.map(|c| c.frequency_hz),
        phase_margin_deg: crossover.map(|c| c.phase_margin_deg),
        gain_margin_db: at.margins.gain_margin_up_db(),
        modulus_margin: at.margins.modulus_margin,
    }
}

/// Rows of the text report: every condition with what the ends of the transfer ratio make of it.
pub(super) fn rows(analysis: &Analysis) -> Vec<(String, String)> {
    let row = |result: &crate::analysis::ConditionResult| {
        let lines = result.outcome.as_ref().ok()?.beside();
        (!lines.is_empty()).then(|| (result.condition.label.clone(), lines.join("; ")))
    };
    analysis.conditions.iter().filter_map(row).collect()
}
