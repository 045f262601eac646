//! What follows an event as a chart over time: the switched loop cycle by cycle, and the small-signal prediction over it.

use super::axis::extent;
use super::stroke::{Dash, Role};
use super::time_chart::{Instant, Panel, TimeChart, Trace, TraceLook};
use crate::analysis::Step;
use crate::quantity::Unit;
use crate::switched::{self, Waveforms};

/// The panels: name, unit, height against the others, and the signals in it by how their names begin, the one read first first.
const PANELS: [(&str, Unit, f64, &[&str]); 4] = [
    ("Output", Unit::Volt, 1.7, &["load voltage", "output voltage"]),
    ("Currents", Unit::Ampere, 1.0, &["inductor current", "load current"]),
    ("Control voltage", Unit::Volt, 1.0, &["control voltage"]),
    ("Input voltage", Unit::Volt, 0.5, &["input voltage"]),
];

/// Looks of several traces in one panel.
const LOOKS: [TraceLook; 4] = [
    TraceLook::MAIN,
    TraceLook::beside(Role::Plant, Dash::Dashed),
    TraceLook::beside(Role::Compensator, Dash::DashDot),
    TraceLook::beside(Role::Measured, Dash::Solid),
];

/// Two signals closer than this share of their size are one.
const ALIKE: f64 = 1e-9;
/// A signal that moves by less than this share of its size has no panel of its own.
const STILL: f64 = 1e-6;

/// Waveforms as a chart; where there is a prediction it is drawn over the output voltage.
pub fn transient(title: &str, condition: &str, waveforms: &Waveforms, prediction: Option<&Step>) -> TimeChart {
    let mut panels: Vec<Panel> = PANELS.iter().filter_map(|row| panel(waveforms, row)).collect();
    if let (Some(step), Some(output)) = (prediction, panels.first_mut()) {
        if let Some(simulated) = output.traces.last_mut() {
            "cycle by cycle".clone_into(&mut simulated.name);
        }
        output.traces.push(Trace {
            name: "predicted".to_owned(),
            times_s: step.times_s.clone(),
            values: step.output_v.clone(),
            reach: Vec::new(),
            look: TraceLook::beside(Role::Compensator, Dash::Dashed),
        });
        output.band = Some((step.final_v - step.band_v, step.final_v + step.band_v));
    }
    let from = waveforms.from_s;
    TimeChart {
        title: title.to_owned(),
        condition: condition.to_owned(),
        span_s: (from, waveforms.column_s.mul_add(waveforms.columns() as f64, from)),
        panels,
        instants: vec![Instant { at_s: 0.0, name: String::new() }],
    }
}

fn panel(waveforms: &Waveforms, row: &(&str, Unit, f64, &[&str])) -> Option<Panel> {
    let (name, unit, share, begins) = row;
    let mut panel = Panel::new(name, *unit, *share);
    let of_panel =
        begins.iter().flat_map(|begin| waveforms.traces.iter().filter(|trace| trace.name.starts_with(*begin)));
    let mut kept: Vec<&switched::Trace> = Vec::new();
    for trace in of_panel {
        if !kept.iter().any(|other| alike(other, trace, waveforms.filled)) {
            kept.push(trace);
        }
    }
    if *name == "Input voltage" {
        kept.retain(|trace| moves(trace, waveforms.filled));
    }
    let alone = kept.len() == 1;
    // The first is painted last: it is read first.
    for (k, trace) in kept.iter().enumerate().rev() {
        let look = LOOKS.get(k).copied().unwrap_or(LOOKS[3]);
        let name = if alone { String::new() } else { trace.name.clone() };
        panel.traces.push(drawn(trace, waveforms, name, look));
    }
    (!panel.traces.is_empty()).then_some(panel)
}

/// Whether two signals are the same voltage, as those before and behind a second stage that is not there.
fn alike(one: &switched::Trace, other: &switched::Trace, filled: usize) -> bool {
    let near = |(a, b): (&f64, &f64)| (a - b).abs() <= ALIKE * a.abs().max(b.abs());
    one.unit == other.unit && one.least.iter().zip(&other.least).take(filled).all(near)
}

fn moves(trace: &switched::Trace, filled: usize) -> bool {
    let all = trace.least.iter().take(filled).chain(trace.greatest.iter().take(filled)).copied();
    extent(all).is_some_and(|(least, greatest)| greatest - least > STILL * greatest.abs())
}

/// The middle of every column, and its least and greatest value about it: ripple is seen as what it is, however many periods a
/// column holds.
fn drawn(trace: &switched::Trace, waveforms: &Waveforms, name: String, look: TraceLook) -> Trace {
    let both = trace.least.iter().zip(&trace.greatest).take(waveforms.filled);
    let reach: Vec<(f64, f64)> = both.map(|(least, greatest)| (*least, *greatest)).collect();
    Trace {
        name,
        times_s: (0..reach.len()).map(|column| waveforms.time_s(column)).collect(),
        values: reach.iter().map(|(least, greatest)| least.midpoint(*greatest)).collect(),
        reach,
        look,
    }
}
