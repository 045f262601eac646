//! The output bank's series inductance where the averaged stage must not carry it as a state.
//!
//! A branch inductance that carries switched current settles within one switching interval; averaged as a state it
//! would make a 9 → 24 V boost read 9 V. It is left out of the switched stage and given back to everything driven by
//! the load: as the difference of the bank's impedance with and without it, each ended by the load's V/I so that it
//! stays proper. *Valid* where the bank is far below the load resistance, which any working converter's is.

use super::drawing::draw_branch;
use crate::circuit::{CircuitError, Compiled, Netlist};
use crate::linear::StateSpace;

/// One branch of the output bank, all its capacitors taken together.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Branch {
    /// Capacitance left at bias and temperature, of all capacitors of the branch [F].
    pub capacitance: f64,
    /// Equivalent series resistance of the branch [Ω].
    pub esr: f64,
    /// Equivalent series inductance of the branch [H].
    pub esl: f64,
}

/// Output voltage from load current [V/A] of the bank alone, with and without its branches' inductance.
#[derive(Clone, Debug, PartialEq)]
pub struct BankInductance {
    /// The bank as it is.
    pub with: StateSpace,
    /// The bank its inductance left out; the stage stands for this one.
    pub without: StateSpace,
}

/// The two banks whose difference gives the inductance back; none without inductance.
///
/// # Errors
/// As netlist extraction.
pub(super) fn bank_inductance(bank: &[Branch], load_resistance: f64) -> Result<Option<BankInductance>, CircuitError> {
    if bank.iter().all(|branch| branch.esl <= 0.0) {
        return Ok(None);
    }
    let (with, without) = (alone(bank, load_resistance, true)?, alone(bank, load_resistance, false)?);
    Ok(with.zip(without).map(|(with, without)| BankInductance { with, without }))
}

/// A bank ended by the load's resistance and driven by the load current.
fn alone(bank: &[Branch], load_resistance: f64, inductance: bool) -> Result<Option<StateSpace>, CircuitError> {
    let mut n = Netlist::new();
    let (ground, end) = (n.ground(), n.node("output"));
    let input = n.input("load current");
    for (k, branch) in bank.iter().enumerate() {
        draw_branch(&mut n, k, (end, ground), inductance && branch.esl > 0.0);
    }
    let load = n.slot("load resistance");
    n.resistor("load", end, ground, load);
    n.current_source("load current", end, ground, input);
    n.voltage_output("output voltage", end, ground);
    let values: Vec<f64> =
        n.slot_names().iter().map(|name| branch_value(name, bank).unwrap_or(load_resistance)).collect();
    let (equations, _) = Compiled::new(&n, |_| true, &values)?.equations(&values)?.independent();
    Ok(StateSpace::new(equations.a, equations.b, equations.c, equations.d, &["load current"], &["output voltage"]).ok())
}

/// The value of a bank slot by name: "bank 2 ESR".
pub(super) fn branch_value(name: &str, bank: &[Branch]) -> Option<f64> {
    let mut words = name.strip_prefix("bank ")?.split(' ');
    let branch = bank.get(words.next()?.parse::<usize>().ok()?.checked_sub(1)?)?;
    match words.next()? {
        "capacitance" => Some(branch.capacitance),
        "ESR" => Some(branch.esr),
        "ESL" => Some(branch.esl),
        _ => None,
    }
}
