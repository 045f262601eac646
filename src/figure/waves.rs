//! One steady period of the switched loop as a chart over time: currents, voltages, what the comparator compares.

use super::stroke::{Dash, Role};
use super::time_chart::{Instant, Panel, TimeChart, Trace, TraceLook};
use crate::analysis::{Steady, Wave, WaveKind};
use crate::quantity::{Unit, print};

/// The panels: name, unit, height against the others, and what stands in them.
const PANELS: [(&str, Unit, f64, &[WaveKind]); 4] = [
    (
        "Currents",
        Unit::Ampere,
        1.7,
        &[WaveKind::Input, WaveKind::Capacitor, WaveKind::Rectifier, WaveKind::Switch, WaveKind::Inductor],
    ),
    ("Switch node", Unit::Volt, 0.8, &[WaveKind::SwitchNode]),
    ("Output voltage", Unit::Volt, 1.0, &[WaveKind::Output]),
    ("Comparator", Unit::Volt, 1.0, &[WaveKind::Control]),
];

/// Roles of the second inductor, output capacitor or control signal and those after it; the kind has its line style.
const FURTHER: [Role; 4] = [Role::Measured, Role::Plant, Role::Compensator, Role::Good];

/// Looks of the waves of one panel: by kind, and by their place among those of their kind.
fn look(kind: WaveKind, place: usize) -> TraceLook {
    let further = |dash| TraceLook::beside(FURTHER.get(place.wrapping_sub(1)).copied().unwrap_or(Role::Ink), dash);
    match (kind, place) {
        (WaveKind::Inductor | WaveKind::SwitchNode | WaveKind::Output | WaveKind::Control, 0) => TraceLook::MAIN,
        (WaveKind::Inductor, _) => further(Dash::Solid),
        (WaveKind::Switch, _) | (WaveKind::Control | WaveKind::Output, 1) => {
            TraceLook::beside(Role::Plant, Dash::Dashed)
        }
        (WaveKind::Capacitor, 0) => TraceLook::beside(Role::Held, Dash::Dotted),
        (WaveKind::Capacitor, _) => further(Dash::Dotted),
        (WaveKind::Input, _) => TraceLook::beside(Role::Good, Dash::DashDot),
        _ => TraceLook::beside(Role::Compensator, Dash::DashDot),
    }
}

/// A steady period as a chart.
pub fn waves(title: &str, steady: &Steady) -> TimeChart {
    let panels = PANELS.iter().filter_map(|(name, unit, share, kinds)| {
        let mut panel = Panel::new(name, *unit, *share);
        for kind in *kinds {
            let of_kind: Vec<&Wave> = steady.waves.iter().filter(|wave| wave.kind == *kind).collect();
            panel.traces.extend(of_kind.iter().enumerate().rev().map(|(place, wave)| Trace {
                name: wave.name.clone(),
                times_s: wave.times_s.clone(),
                values: wave.values.clone(),
                reach: Vec::new(),
                look: look(*kind, place),
            }));
        }
        if let [alone] = &mut panel.traces[..] {
            alone.name.clear();
        }
        (!panel.traces.is_empty()).then_some(panel)
    });
    TimeChart {
        title: title.to_owned(),
        condition: format!(
            "One steady period of {} at {}",
            print(steady.period_s, Unit::Second),
            steady.condition.label
        ),
        span_s: (0.0, steady.period_s),
        panels: panels.collect(),
        instants: steady
            .instants
            .iter()
            .map(|(at_s, name)| Instant { at_s: *at_s, name: (*name).to_owned() })
            .collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::{Level, Shown, steady};
    use crate::design::sample;
    use crate::figure::Mark;

    #[test]
    fn every_sample_has_its_waveforms_within_the_figure() {
        for sample in sample::all() {
            let design = sample.design().expect("read").check().expect("usable");
            // A converter that skips periods has none; the reason is told elsewhere.
            let Ok(steady) = steady(&design, Shown::Levels(Level::Nominal, Level::Nominal)) else { continue };
            let chart = waves(sample.title, &steady);
            assert_eq!(chart.panels.len(), PANELS.len(), "{}", sample.file);
            let drawn: usize = chart.panels.iter().map(|panel| panel.traces.len()).sum();
            assert_eq!(drawn, steady.waves.len(), "{}: no waveform is left out", sample.file);
            let (figure, frames) = chart.figure([760.0, 620.0], true);
            assert_eq!(frames.len(), PANELS.len());
            for mark in &figure.marks {
                if let Mark::Line { points, .. } = mark {
                    assert!(points.iter().flatten().all(|at| (-0.01..=760.01).contains(at)), "{}", sample.file);
                }
            }
            // Of several traces in a panel none looks like another.
            for panel in &chart.panels {
                let looks: Vec<TraceLook> = panel.traces.iter().map(|trace| trace.look).collect();
                let alike = looks.iter().enumerate().any(|(k, look)| looks[..k].contains(look));
                assert!(!alike, "{}: {}", sample.file, panel.name);
            }
        }
    }
}
