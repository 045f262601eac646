//! Read-outs of an input filter, for the neutral list; none without one.

use super::result::{ConditionResult, Detail, Readout, Worst};
use crate::quantity::Unit;

/// Margin of the filter, and what it does to the loop gain, at the shown condition and over the nine.
pub(super) fn filter_readouts(detail: Option<&Detail>, conditions: &[ConditionResult]) -> Vec<Readout> {
    let shown = detail.and_then(|d| d.input_filter.as_ref()).map(|f| f.result);
    let results = || {
        let found = conditions.iter().enumerate().filter_map(|(k, c)| Some((k, c, c.outcome.as_ref().ok()?)));
        found.filter_map(|(k, c, summary)| Some((k, c.condition.label.as_str(), summary.input_filter?)))
    };
    if shown.is_none() && results().next().is_none() {
        return Vec::new();
    }
    let row = |key, name, unit, value: Option<f64>, worst: Option<(usize, &str, f64)>, help| Readout {
        key,
        name,
        unit,
        value: value.filter(|v| v.is_finite()),
        absent: "not computed",
        greyed: false,
        worst: worst.map(|(index, label, value)| Worst { value: Some(value), condition: label.to_owned(), index }),
        range: None,
        requirements: Vec::new(),
        at_zero: None,
        help,
    };
    let least = results().map(|(k, label, r)| (k, label, r.least_margin().margin_db));
    let gain = results().map(|(k, label, r)| (k, label, r.gain_change.amount));
    let phase = results().map(|(k, label, r)| (k, label, r.phase_change.amount));
    vec![
        row(
            "filter-margin",
            "Filter margin",
            Unit::Decibel,
            shown.map(|r| r.least_margin().margin_db),
            least.min_by(|a, b| a.2.total_cmp(&b.2)),
            "Least of the converter's input impedances ZD, ZN and Zi over the input filter's output impedance, up to half the switching frequency. Above 0 dB the criterion is met; 6 dB are usual.",
        ),
        row(
            "filter-gain-change",
            "Filter moves gain",
            Unit::Decibel,
            shown.map(|r| r.gain_change.amount),
            gain.max_by(|a, b| a.2.abs().total_cmp(&b.2.abs())),
            "Greatest change of the loop gain by the input filter up to half the switching frequency, against the same stage fed by an ideal source.",
        ),
        row(
            "filter-phase-change",
            "Filter moves phase",
            Unit::Degree,
            shown.map(|r| r.phase_change.amount),
            phase.max_by(|a, b| a.2.abs().total_cmp(&b.2.abs())),
            "Greatest change of the loop's phase by the input filter, between −180° and 180°.",
        ),
    ]
}
