//! Cautions for people: voltages that are hazardous to touch, and the energy a bank keeps after the input is gone.
//!
//! *Source*: 60 V DC as the limit above which parts count as hazardous to touch in the IEC 60950 and 62368-1 lineage (from
//! memory); stored energy ½·C·V². Which local code applies is the reader's to find.

use super::Design;
use crate::converter::{self, Voltages};
use crate::finding::Finding;
use crate::quantity::{Unit, print};

/// Greatest DC voltage that is not treated as hazardous to touch [V].
const TOUCHABLE: f64 = 60.0;

/// A caution when the input, the output or anything between goes above [`TOUCHABLE`]; how high is the topology's to say.
pub(super) fn caution(design: &Design, output: f64) -> Option<Finding> {
    let input = design.values.get("stage.input.greatest").unwrap_or(0.0);
    let voltages = Voltages { input, output, ratio: design.turns_ratio() };
    let topology = design.choices.get("stage.topology").and_then(converter::find);
    let inside = topology.map_or(0.0, |topology| (topology.highest_voltage)(&voltages));
    let highest = input.max(output).max(inside);
    if highest <= TOUCHABLE {
        return None;
    }
    let place = if output >= input { "stage.output.voltage" } else { "stage.input.greatest" };
    let stored = 0.5 * bank_capacitance(design) * output * output;
    let at_input = stored_at_input(design, input);
    Some(
        Finding::notice(
            place,
            format!(
                "Caution: this circuit carries {}. Above 60 V DC, parts are treated as hazardous to touch \
                 (in the lineage of IEC 60950 and 62368-1). The output bank at {} holds {} (½·C·V²){} and keeps it after \
                 the input is gone; a loop measurement is made on a live circuit.",
                print(highest, Unit::Volt),
                print(output, Unit::Volt),
                print(stored, Unit::Joule),
                at_input
            ),
        )
        .with_hint(
            "discharge and measure before touching; the code of the place and its rules on who may work on live parts apply",
        ),
    )
}

/// What the input capacitor holds, in words, where the input is hazardous itself.
fn stored_at_input(design: &Design, input: f64) -> String {
    let path = "stage.input-capacitor.capacitance";
    let fitted = design.entries().iter().any(|row| row.path == path);
    match design.values.get(path).filter(|_| fitted && input > TOUCHABLE) {
        Some(farads) => {
            let (volts, joules) = (print(input, Unit::Volt), print(0.5 * farads * input * input, Unit::Joule));
            format!(", the input capacitor at {volts} {joules},")
        }
        None => String::new(),
    }
}

/// Printed capacitance of the output bank [F]: what is left at bias is less, so the energy is not understated.
fn bank_capacitance(design: &Design) -> f64 {
    let branches = design.choices.get("stage.bank").and_then(|key| key.parse::<usize>().ok()).unwrap_or(1);
    (1..=branches.min(4))
        .filter_map(|branch| {
            let capacitance = design.values.get(&format!("stage.bank.{branch}.capacitance"))?;
            let count = design.values.get(&format!("stage.bank.{branch}.count"))?;
            Some(capacitance * count)
        })
        .sum()
}
