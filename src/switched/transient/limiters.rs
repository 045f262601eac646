//! The limits of a closed loop as limiters: amplifier, clamp, inner amplifier, and what a load sink can take.

use super::super::{Rule, SwitchedSystem, inputs};
use super::plant::{Act, Limiter};
use crate::compensator::{Limit, LimitKind};
use nalgebra::RowDVector;

/// The limits of the amplifiers in a loop, as their compensators give them.
#[derive(Clone, Copy, Debug, Default)]
pub struct Amplifiers<'a> {
    /// The compensator's; none where the loop is open.
    pub outer: &'a [Limit],
    /// The inner one's, of average current mode.
    pub inner: &'a [Limit],
}

/// A row over states and inputs, by configuration.
type Rows = [(RowDVector<f64>, RowDVector<f64>); 3];

fn probe(system: &SwitchedSystem, row: usize) -> Rows {
    [0, 1, 2].map(|k| (system.pieces[k].c.row(row).into_owned(), system.pieces[k].d.row(row).into_owned()))
}

/// All limiters but the load's.
pub(super) fn limiters(system: &SwitchedSystem, amplifiers: Amplifiers<'_>) -> Vec<Limiter> {
    let places = &system.places;
    let mut all: Vec<Limiter> = Vec::new();
    all.extend(amplifiers.outer.iter().filter_map(|limit| of_amplifier(system, limit, "", places.control_voltage)));
    if let (Rule::Compared(comparator), Some(control)) = (&system.rule, system.input(inputs::CONTROL))
        && let Some(clamp) = comparator.clamp
    {
        all.push(Limiter {
            act: Act::Saturate,
            name: "control voltage clamp",
            signal: probe(system, places.control_voltage),
            force: control,
            least: f64::NEG_INFINITY,
            greatest: clamp,
        });
    }
    all.extend(amplifiers.inner.iter().filter_map(|limit| of_amplifier(system, limit, "inner ", places.compared)));
    all
}

/// A limit of a compensator; `output` is the probe that its output is.
fn of_amplifier(system: &SwitchedSystem, limit: &Limit, which: &str, output: usize) -> Option<Limiter> {
    if limit.least.is_infinite() && limit.greatest.is_infinite() {
        return None;
    }
    let row = if limit.signal == "vc" { output } else { system.probe(&format!("{which}{}", limit.signal))? };
    let mut signal = probe(system, row);
    if let Some(control) = system.input(inputs::CONTROL) {
        // What is let through is another matter than what the amplifier gives.
        for (_, by_inputs) in &mut signal {
            by_inputs[control] = 0.0;
        }
    }
    let act = match limit.kind {
        LimitKind::Hold => Act::Hold,
        LimitKind::Saturate => Act::Saturate,
    };
    let name = if which.is_empty() { limit.name } else { "inner amplifier output" };
    let force = system.input(&format!("{which}{}", limit.force))?;
    Some(Limiter { act, name, signal, force, least: limit.least, greatest: limit.greatest })
}

/// A load that takes a level of current, and less where the voltage is too low to drive it.
pub(super) fn sink(system: &SwitchedSystem, siemens: f64, level: usize) -> Option<Limiter> {
    Some(Limiter {
        act: Act::Sink { siemens, level },
        name: "",
        signal: probe(system, system.places.stage.load_voltage),
        force: system.input(inputs::LOAD_CURRENT)?,
        least: f64::NEG_INFINITY,
        greatest: f64::INFINITY,
    })
}
