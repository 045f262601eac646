//! What can be looked at in a switched system: the stage's outputs by name, and what its control adds.

use super::system::{Places, Probe};
use crate::converter::SwitchingEquations;
use crate::quantity::Unit;

/// The stage's outputs, all of them in its own order, then switched and sensed current, control voltage and what is compared.
pub(super) fn stage_probes(equations: &SwitchingEquations) -> (Vec<Probe>, Places) {
    let rows = &equations.rows;
    let count = equations.conducting.c.nrows();
    let mut named = vec![None; count];
    let mut name = |row: usize, name: String, unit: Unit| {
        if let Some(place) = named.get_mut(row) {
            *place = Some(Probe { name, unit });
        }
    };
    name(rows.output_voltage, "output voltage".to_owned(), Unit::Volt);
    name(rows.load_voltage, "load voltage".to_owned(), Unit::Volt);
    name(rows.bank_voltage, "bank voltage".to_owned(), Unit::Volt);
    name(rows.switch_node, "switch-node voltage".to_owned(), Unit::Volt);
    name(rows.switch_voltage, "switch voltage".to_owned(), Unit::Volt);
    name(rows.rectifier_voltage, "rectifier voltage".to_owned(), Unit::Volt);
    name(rows.input_current, "input current".to_owned(), Unit::Ampere);
    name(rows.switch_current, "switch current".to_owned(), Unit::Ampere);
    name(rows.rectifier_current, "rectifier current".to_owned(), Unit::Ampere);
    let counted = |what: &str, k: usize, of: usize| if of == 1 { what.to_owned() } else { format!("{what} {}", k + 1) };
    for (k, row) in rows.inductor_currents.iter().enumerate() {
        name(*row, counted("inductor current", k, rows.inductor_currents.len()), Unit::Ampere);
    }
    for (k, row) in rows.branch_currents.iter().enumerate() {
        name(*row, counted("output capacitor current", k, rows.branch_currents.len()), Unit::Ampere);
    }
    for (what, row) in &rows.filter_inductors {
        name(*row, format!("{what} current"), Unit::Ampere);
    }
    if let Some(interleaved) = &equations.interleaved {
        name(interleaved.together, "inductor currents together".to_owned(), Unit::Ampere);
    }
    // Rows without a name carry the currents of lossy filter resistances, and what is the same of other phases.
    let unnamed = || Probe { name: String::new(), unit: Unit::Ampere };
    let mut probes: Vec<Probe> = named.into_iter().map(|probe| probe.unwrap_or_else(unnamed)).collect();
    for (name, unit) in [
        ("switched current", Unit::Ampere),
        ("sensed current", Unit::Ampere),
        ("control voltage", Unit::Volt),
        ("compared voltage", Unit::Volt),
    ] {
        probes.push(Probe { name: name.to_owned(), unit });
    }
    let places = Places {
        stage: rows.clone(),
        switched_current: count,
        inductor_currents: rows
            .inductor_currents
            .iter()
            .copied()
            .chain(rows.filter_inductors.iter().map(|(_, row)| *row))
            .collect(),
        sensed_current: count + 1,
        control_voltage: count + 2,
        compared: count + 3,
    };
    (probes, places)
}
