//! One steady period of the switched loop, as the views take it: waveforms, and what the parts bear.

use super::model::Model;
use super::result::{Steady, Stress, Wave, WaveKind};
use crate::analysis::Shown;
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::quantity::Unit;
use crate::switched::{Event, Figures, Goal, Orbit, SteadyWaveforms, SwitchedSystem};

/// Samples of a period: about as many as its plot has columns.
const SAMPLES: usize = 400;
/// A value below this share of the greatest value is rounding.
const ROUNDING: f64 = 1e-9;
/// Names of the output's two voltages, where a second stage parts them.
const LOAD: &str = "load";
const SENSED: &str = "sensed";

/// The steady period of the condition shown.
///
/// # Errors
/// A finding where the condition cannot be held or the switched circuit has no steady period.
pub fn steady(design: &CheckedDesign, shown: Shown) -> Result<Steady, Finding> {
    let model = Model::new(design, shown)?;
    let orbit = Orbit::find(&model.closed, model.start(), Goal::AsDriven)?;
    let waveforms = orbit.waveforms(SAMPLES)?;
    let ripple = orbit.output_ripple()?;
    Ok(Steady {
        condition: model.condition.clone(),
        period_s: orbit.system.switching_period_s(),
        instants: instants(&orbit, &waveforms),
        stress: stress(&orbit.system, &orbit.figures()?),
        ripple_v: ripple.map_or([f64::NAN; 3], |ripple| [ripple.bank, ripple.capacitive, ripple.resistive]),
        waves: waves(&orbit, waveforms),
    })
}

/// When switches act, and what happens then.
fn instants(orbit: &Orbit, waveforms: &SteadyWaveforms) -> Vec<(f64, &'static str)> {
    use crate::switched::Configuration::Conducting;
    let conducts = |place: usize| orbit.phases.get(place).is_some_and(|phase| phase.configuration == Conducting);
    let switches = |closes: bool| if closes { "switch closes" } else { "switch opens" };
    let mut found = vec![(0.0, switches(conducts(0)))];
    let delayed = orbit.phases.iter().any(|phase| phase.end == Event::Switch && phase.length_s > 0.0);
    // Of several phases the one that is shown opens in one share of the period.
    let shown = orbit.system.interleaving.as_ref().map_or(0, |interleaving| interleaving.always);
    let events = waveforms.events.iter().skip(shown * orbit.phases.len()).take(orbit.phases.len());
    for (place, (at_s, event)) in events.enumerate() {
        let name = match event {
            // Without a delay the comparator's trip is the switch's own instant.
            Event::Compare if delayed => "comparator trips",
            Event::Switch | Event::Given => switches(conducts(place + 1)),
            Event::Rest => "current rests",
            Event::Compare | Event::Clock => continue,
        };
        found.push((*at_s, name));
    }
    found
}

/// Rows that are drawn: probe, kind, name.
fn rows(system: &SwitchedSystem) -> Vec<(usize, WaveKind, String)> {
    let places = &system.places;
    let name = |row: usize| {
        let name = system.probes.get(row).map_or("", |probe| probe.name.as_str());
        name.replace(" current", "")
    };
    let mut rows: Vec<(usize, WaveKind, String)> = Vec::new();
    rows.extend(places.inductor_currents.iter().map(|row| (*row, WaveKind::Inductor, name(*row))));
    rows.push((places.stage.switch_current, WaveKind::Switch, "switch".to_owned()));
    rows.push((places.stage.rectifier_current, WaveKind::Rectifier, "rectifier".to_owned()));
    rows.extend(places.stage.branch_currents.iter().map(|row| (*row, WaveKind::Capacitor, name(*row))));
    rows.push((places.stage.input_current, WaveKind::Input, "input".to_owned()));
    rows.push((places.stage.switch_node, WaveKind::SwitchNode, "switch node".to_owned()));
    rows.push((places.stage.load_voltage, WaveKind::Output, LOAD.to_owned()));
    rows.push((places.stage.output_voltage, WaveKind::Output, SENSED.to_owned()));
    rows.push((places.control_voltage, WaveKind::Control, "control".to_owned()));
    rows.push((places.compared, WaveKind::Control, "compared".to_owned()));
    rows
}

/// Whether two waves are one.
fn alike(one: &Wave, other: &Wave) -> bool {
    one.kind == other.kind && one.values.iter().zip(&other.values).all(|(a, b)| (a - b).abs() <= 1e-12 * a.abs())
}

fn waves(orbit: &Orbit, mut waveforms: SteadyWaveforms) -> Vec<Wave> {
    let mut waves: Vec<Wave> = Vec::new();
    let wave = |kind, name, values| Wave { kind, name, times_s: waveforms.times_s.clone(), values };
    for (row, kind, name) in rows(&orbit.system) {
        let Some(values) = waveforms.values.get_mut(row).map(|values| values.clone()) else { continue };
        let wave = wave(kind, name, values);
        // Without a second stage the sensed voltage is the load's; in voltage mode the control voltage itself is compared.
        if !waves.iter().any(|known| alike(known, &wave)) {
            waves.push(wave);
        }
    }
    if let Some(ramp) = waveforms.ramp.take() {
        waves.push(wave(WaveKind::Control, "ramp".to_owned(), ramp));
    }
    if !waves.iter().any(|wave| wave.name == SENSED)
        && let Some(output) = waves.iter_mut().find(|wave| wave.name == LOAD)
    {
        "output".clone_into(&mut output.name);
    }
    waves
}

fn stress(system: &SwitchedSystem, figures: &[Figures]) -> Vec<Stress> {
    let places = &system.places;
    let currents =
        places.inductor_currents.iter().chain([&places.stage.switch_current, &places.stage.rectifier_current]);
    let currents = currents.chain(&places.stage.branch_currents).chain([&places.stage.input_current]);
    let voltages = [
        &places.stage.switch_voltage,
        &places.stage.rectifier_voltage,
        &places.stage.load_voltage,
        &places.control_voltage,
    ];
    let row = |row: &usize, unit: Unit| {
        let (probe, figures) = (system.probes.get(*row)?, figures.get(*row)?);
        // A capacitor's mean current is nothing but rounding, as is what is left of a current at rest.
        let rounded = |value: f64| if value.abs() < ROUNDING * figures.peak() { 0.0 } else { value };
        Some(Stress {
            name: probe.name.clone(),
            unit,
            peak: rounded(figures.greatest),
            least: rounded(figures.least),
            rms: (unit == Unit::Ampere).then_some(figures.rms),
            average: rounded(figures.mean),
        })
    };
    let currents = currents.map(|place| row(place, Unit::Ampere));
    currents.chain(voltages.into_iter().map(|place| row(place, Unit::Volt))).flatten().collect()
}
