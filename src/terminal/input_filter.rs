//! The input filter against the converter, for both forms of the report.

use crate::analysis::{Detail, ImpedanceCurves, InputFilterDetail};
use crate::converter::Damping;
use crate::quantity::{Unit, print, print_digits};
use serde::Serialize;

/// The `input_filter` object of the JSON.
#[derive(Serialize)]
pub(super) struct InputFilter {
    resonance_hz: f64,
    characteristic_impedance_ohm: f64,
    peak_ohm: f64,
    peak_hz: f64,
    least_input_impedance_ohm: f64,
    least_input_impedance_hz: f64,
    margins: Vec<Distance>,
    gain_change_db: f64,
    gain_change_hz: f64,
    phase_change_deg: f64,
    phase_change_hz: f64,
    stable_without: Option<bool>,
    optimum_damping: OptimumDamping,
    response: Vec<Response>,
}

#[derive(Serialize)]
struct Distance {
    against: &'static str,
    margin_db: f64,
    frequency_hz: f64,
    converter_ohm: f64,
    filter_ohm: f64,
}

#[derive(Serialize)]
struct OptimumDamping {
    across: &'static str,
    ratio: f64,
    resistance_ohm: f64,
    capacitance_f: Option<f64>,
    inductance_h: Option<f64>,
    peak_ohm: f64,
    peak_hz: f64,
}

#[derive(Serialize)]
struct Response {
    frequency_hz: f64,
    filter_ohm: f64,
    filter_deg: f64,
    open_loop_ohm: f64,
    open_loop_deg: f64,
    nulled_ohm: f64,
    nulled_deg: f64,
    closed_loop_ohm: f64,
    closed_loop_deg: f64,
}

/// The object of a condition; none without a filter.
pub(super) fn object(detail: &Detail) -> Option<InputFilter> {
    let InputFilterDetail { result, curves, damping } = detail.input_filter.as_ref()?;
    let margins = result.margins.iter().map(|m| Distance {
        against: m.against.name(),
        margin_db: m.margin_db,
        frequency_hz: m.frequency_hz,
        converter_ohm: m.converter_ohm,
        filter_ohm: m.filter_ohm,
    });
    let inductor = damping.kind == Damping::Inductor;
    Some(InputFilter {
        resonance_hz: result.resonance_hz,
        characteristic_impedance_ohm: result.characteristic_impedance_ohm,
        peak_ohm: result.peak_ohm,
        peak_hz: result.peak_hz,
        least_input_impedance_ohm: result.least_input_impedance_ohm,
        least_input_impedance_hz: result.least_input_impedance_hz,
        margins: margins.collect(),
        gain_change_db: result.gain_change.amount,
        gain_change_hz: result.gain_change.frequency_hz,
        phase_change_deg: result.phase_change.amount,
        phase_change_hz: result.phase_change.frequency_hz,
        stable_without: result.stable_without,
        optimum_damping: OptimumDamping {
            across: if inductor { "filter inductor" } else { "input capacitor" },
            ratio: damping.ratio,
            resistance_ohm: damping.resistance,
            capacitance_f: (!inductor).then_some(damping.reactance_value),
            inductance_h: inductor.then_some(damping.reactance_value),
            peak_ohm: damping.peak,
            peak_hz: damping.peak_hz,
        },
        response: response(&detail.curves.frequencies_hz, curves),
    })
}

fn response(frequencies_hz: &[f64], curves: &ImpedanceCurves) -> Vec<Response> {
    let at = |curve: &[f64], k: usize| curve.get(k).copied().unwrap_or(f64::NAN);
    let row = |(k, frequency_hz): (usize, &f64)| Response {
        frequency_hz: *frequency_hz,
        filter_ohm: at(&curves.filter_ohm, k),
        filter_deg: at(&curves.filter_deg, k),
        open_loop_ohm: at(&curves.open_loop_ohm, k),
        open_loop_deg: at(&curves.open_loop_deg, k),
        nulled_ohm: at(&curves.nulled_ohm, k),
        nulled_deg: at(&curves.nulled_deg, k),
        closed_loop_ohm: at(&curves.closed_loop_ohm, k),
        closed_loop_deg: at(&curves.closed_loop_deg, k),
    };
    frequencies_hz.iter().enumerate().map(row).collect()
}

/// Names and values of the text report's section; none without a filter.
pub(super) fn rows(detail: &Detail) -> Vec<(String, String)> {
    let Some(InputFilterDetail { result, damping, .. }) = &detail.input_filter else { return Vec::new() };
    let hertz = |f: f64| print(f, Unit::Hertz);
    let ohm = |z: f64| print_digits(z, Unit::Ohm, 3);
    let mut rows = vec![
        (
            "Resonance".to_owned(),
            format!("{}, characteristic {}", hertz(result.resonance_hz), ohm(result.characteristic_impedance_ohm)),
        ),
        ("Peak impedance".to_owned(), format!("{} at {}", ohm(result.peak_ohm), hertz(result.peak_hz))),
    ];
    for margin in &result.margins {
        let value = format!(
            "{} at {}: {} against {} of the filter",
            print_digits(margin.margin_db, Unit::Decibel, 3),
            hertz(margin.frequency_hz),
            ohm(margin.converter_ohm),
            ohm(margin.filter_ohm)
        );
        rows.push((format!("Margin to {}", margin.against.symbol()), value));
    }
    let (gain, phase) = (&result.gain_change, &result.phase_change);
    rows.push((
        "Moves the loop gain".to_owned(),
        format!(
            "{} at {}, {} at {}",
            print_digits(gain.amount, Unit::Decibel, 3),
            hertz(gain.frequency_hz),
            print_digits(phase.amount, Unit::Degree, 3),
            hertz(phase.frequency_hz)
        ),
    ));
    rows.push((
        "Optimum damping".to_owned(),
        format!("{}: peak {} at {}", damping.in_words(), ohm(damping.peak), hertz(damping.peak_hz)),
    ));
    rows
}
