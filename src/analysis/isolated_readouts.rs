//! Read-outs of isolated feedback, for the neutral list; none where the feedback is not isolated.

use super::isolated::IsolatedFigures;
use super::result::{ConditionResult, Detail, Readout, Worst};
use crate::quantity::Unit;

/// A row before its values are known.
struct Row {
    key: &'static str,
    name: &'static str,
    unit: Unit,
    help: &'static str,
    /// Whether it is a margin, which an unstable loop does not have.
    end: Option<usize>,
    take: fn(&IsolatedFigures) -> Option<f64>,
    /// Whether the least value over the conditions is the worst; else the greatest.
    least_is_worst: bool,
}

static ROWS: &[Row] = &[
    Row {
        key: "crossover-least-ratio",
        name: "Crossover, least ratio",
        unit: Unit::Hertz,
        help: "Where the loop gain falls through 0 dB at the least transfer ratio of the optocoupler.",
        end: Some(0),
        take: |f| f.ends[0].headline().map(|(hz, _)| hz),
        least_is_worst: true,
    },
    Row {
        key: "phase-margin-least-ratio",
        name: "Phase margin, least ratio",
        unit: Unit::Degree,
        help: "Phase margin at the least transfer ratio of the optocoupler.",
        end: Some(0),
        take: |f| f.ends[0].headline().map(|(_, deg)| deg),
        least_is_worst: true,
    },
    Row {
        key: "crossover-greatest-ratio",
        name: "Crossover, greatest ratio",
        unit: Unit::Hertz,
        help: "Where the loop gain falls through 0 dB at the greatest transfer ratio of the optocoupler.",
        end: Some(1),
        take: |f| f.ends[1].headline().map(|(hz, _)| hz),
        least_is_worst: false,
    },
    Row {
        key: "phase-margin-greatest-ratio",
        name: "Phase margin, greatest ratio",
        unit: Unit::Degree,
        help: "Phase margin at the greatest transfer ratio of the optocoupler.",
        end: Some(1),
        take: |f| f.ends[1].headline().map(|(_, deg)| deg),
        least_is_worst: true,
    },
    Row {
        key: "led-current",
        name: "LED current",
        unit: Unit::Ampere,
        help: "Current in the optocoupler's LED that holds the control voltage, at the nominal transfer ratio.",
        end: None,
        take: |f| Some(f.bias.led_current),
        least_is_worst: false,
    },
    Row {
        key: "cathode-current",
        name: "Cathode current",
        unit: Unit::Ampere,
        help: "Current in the shunt regulator: LED and bias resistor. It must stay above the regulator's least current.",
        end: None,
        take: |f| Some(f.bias.cathode_current),
        least_is_worst: true,
    },
    Row {
        key: "cathode-voltage",
        name: "Cathode voltage",
        unit: Unit::Volt,
        help: "Voltage that is left for the shunt regulator. It must stay above the regulator's least voltage.",
        end: None,
        take: |f| Some(f.bias.cathode_voltage),
        least_is_worst: true,
    },
];

/// Ends of the transfer ratio and operating point of isolated feedback, at the shown condition and over the nine.
pub(super) fn isolated_readouts(detail: Option<&Detail>, conditions: &[ConditionResult]) -> Vec<Readout> {
    let shown = detail.and_then(|d| d.isolated.as_ref());
    let figures = |c: &ConditionResult| c.outcome.as_ref().ok().and_then(|s| s.isolated.clone());
    let all: Vec<_> =
        conditions.iter().enumerate().filter_map(|(k, c)| Some((k, c.condition.label.as_str(), figures(c)?))).collect();
    if shown.is_none() && all.is_empty() {
        return Vec::new();
    }
    let readout = |row: &Row| {
        let stable = |f: &IsolatedFigures| row.end.is_none_or(|end| f.ends[end].stable());
        let value = |f: &IsolatedFigures| (row.take)(f).filter(|v| v.is_finite());
        let unstable = all.iter().find(|(_, _, f)| !stable(f));
        let far = |a: f64| if row.least_is_worst { a } else { -a };
        let values = all.iter().filter_map(|(k, label, f)| Some((*k, *label, value(f)?)));
        let worst = match unstable {
            Some((index, label, _)) => Some(Worst { value: None, condition: (*label).to_owned(), index: *index }),
            None => values.min_by(|a, b| far(a.2).total_cmp(&far(b.2))).map(|(index, label, value)| Worst {
                value: Some(value),
                condition: label.to_owned(),
                index,
            }),
        };
        let here = shown.is_some_and(&stable);
        Readout {
            key: row.key,
            name: row.name,
            unit: row.unit,
            value: shown.and_then(value),
            absent: if shown.is_none() {
                "not computed"
            } else if here {
                "none"
            } else {
                "unstable"
            },
            greyed: !here,
            worst,
            range: None,
            requirements: Vec::new(),
            at_zero: None,
            help: row.help,
        }
    };
    ROWS.iter().map(readout).collect()
}
