//! The limits of a closed loop as limiters: amplifier, clamp, inner amplifier, and what a load sink can take.

use super::super::{Rule, SwitchedSystem, inputs};
use super::plant::{Act, Force, Limiter};
use crate::compensator::{LimitKind, Limited};
use nalgebra::{DVector, RowDVector};

/// The amplifiers of a loop with their limits, as their compensators give them.
#[derive(Clone, Copy, Debug, Default)]
pub struct Amplifiers<'a> {
    /// The compensator's; none where the loop is open.
    pub outer: Option<&'a Limited>,
    /// The inner one of average current mode.
    pub inner: Option<&'a Limited>,
}

/// A row over states and inputs, by configuration.
type Rows = [(RowDVector<f64>, RowDVector<f64>); 3];

fn probe(system: &SwitchedSystem, row: usize) -> Rows {
    [0, 1, 2].map(|k| (system.pieces[k].c.row(row).into_owned(), system.pieces[k].d.row(row).into_owned()))
}

/// All limiters but the load's.
pub(super) fn limiters(system: &SwitchedSystem, amplifiers: Amplifiers<'_>) -> Vec<Limiter> {
    let outer_order = amplifiers.outer.map_or(0, |limited| limited.space.order());
    let inner_order = amplifiers.inner.map_or(0, |limited| limited.space.order());
    let outer_at = system.order() - outer_order;
    let inner_at = outer_at - inner_order;
    let mut all = Vec::new();
    if let Some(outer) = amplifiers.outer {
        of_amplifier(system, outer, outer_at, "", &mut all);
    }
    if let (Rule::Compared(comparator), Some(control)) = (&system.rule, system.input(inputs::CONTROL))
        && let Some(clamp) = comparator.clamp
    {
        all.push(Limiter {
            act: Act::Saturate,
            name: "control voltage clamp",
            signal: probe(system, system.places.control_voltage),
            force: Force::Input(control),
            least: f64::NEG_INFINITY,
            greatest: clamp,
        });
    }
    if let Some(inner) = amplifiers.inner {
        of_amplifier(system, inner, inner_at, "inner ", &mut all);
    }
    all
}

fn of_amplifier(system: &SwitchedSystem, limited: &Limited, at: usize, which: &str, all: &mut Vec<Limiter>) {
    let space = &limited.space;
    for limit in &limited.limits {
        let (Some(row), Some(column)) = (space.output(limit.signal), space.input(limit.force)) else { continue };
        if limit.least.is_infinite() && limit.greatest.is_infinite() {
            continue;
        }
        let mut states = DVector::zeros(system.order());
        states.rows_mut(at, space.order()).copy_from(&space.b.column(column));
        let signal = [0, 1, 2].map(|k| {
            let piece = &system.pieces[k];
            let mut by_states = RowDVector::zeros(system.order());
            by_states.columns_mut(at, space.order()).copy_from(&space.c.row(row));
            let mut by_inputs = RowDVector::zeros(system.input_names.len());
            if which.is_empty() {
                let through = |name: &str| space.input(name).map_or(0.0, |k| space.d[(row, k)]);
                let (output, reference) = (through("vout"), through("vref"));
                by_states += piece.c.row(system.places.output_voltage) * output;
                by_inputs += piece.d.row(system.places.output_voltage) * output;
                for (name, gain) in [(inputs::INJECTED, output), (inputs::REFERENCE, reference)] {
                    if let Some(column) = system.input(name) {
                        by_inputs[column] += gain;
                    }
                }
            }
            (by_states, by_inputs)
        });
        let act = match limit.kind {
            LimitKind::Hold => Act::Hold,
            LimitKind::Saturate => Act::Saturate,
        };
        let name = if which.is_empty() { limit.name } else { "inner amplifier output" };
        let (least, greatest) = (limit.least, limit.greatest);
        all.push(Limiter { act, name, signal, force: Force::States(states), least, greatest });
    }
}

/// A load that takes a level of current, and less where the voltage is too low to drive it.
pub(super) fn sink(system: &SwitchedSystem, siemens: f64, level: usize) -> Option<Limiter> {
    Some(Limiter {
        act: Act::Sink { siemens, level },
        name: "",
        signal: probe(system, system.places.load_voltage),
        force: Force::Input(system.input(inputs::LOAD_CURRENT)?),
        least: f64::NEG_INFINITY,
        greatest: f64::INFINITY,
    })
}
