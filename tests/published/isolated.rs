//! Isolated feedback by a 431-type shunt regulator and an optocoupler against independent calculations in Python.
//!
//! *Source*: `tests/reference/isolated.py`: complex nodal equations of tap, cathode, LED and collector, and the same circuit as first-order
//! equations; loops over both paths around stages of `tests/reference/cells.py`. Nothing there knows this crate.
//!
//! *Tolerance*: 1e-6.

use crate::common::{analysed, assert_relative, checked};
use crate::controlled::{compare_laws, compare_switched};
use crate::reference::{compare_conditions, compare_responses, compare_steps, complex, designs, numbers};
use polewright::converter::StageCondition;
use polewright::design::Design;
use serde_json::Value;

const ISOLATED: &str = include_str!("../reference/isolated.json");

fn each(compare: impl Fn(&Design, &Value)) {
    let found = designs(ISOLATED, |_| true);
    assert!(found.len() >= 5);
    for (design, row) in &found {
        compare(design, row);
    }
}

#[test]
fn both_paths_are_those_of_the_nodal_equations() {
    each(|design, row| {
        let system = checked(design).compensator.state_space().expect("a proper network");
        let output = system.output("vc").expect("named");
        let frequencies = numbers(&row["frequencies_hz"]);
        for (input, name) in [("vout", "slow_path"), ("fast", "fast_path")] {
            let Some(column) = system.input(input) else {
                assert!(complex(&row[name]).iter().all(|z| z.norm() == 0.0), "{}: {name}", design.title);
                continue;
            };
            for (f, wanted) in frequencies.iter().zip(complex(&row[name])) {
                let found = -system.at_hz(*f).expect("no pole there")[(output, column)];
                let off = (found - wanted).norm();
                assert!(off <= 1e-6 * wanted.norm(), "{}: {name} at {f} Hz: {found} for {wanted}", design.title);
            }
        }
    });
}

#[test]
fn the_led_is_where_kirchhoff_puts_it() {
    each(|design, row| {
        let design_checked = checked(design);
        let wanted = |name: &str| row["operating"][name].as_f64().expect("a number");
        let analysis = analysed(design, &[1e3], 10);
        let condition = &analysis.conditions[4];
        let control = condition.outcome.as_ref().expect("an operating point").control.control_voltage;
        let regulated = design_checked.compensator.dc_output_voltage();
        let feed = if design.choices.is("compensator.opto.fast-path", "bank") {
            design_checked.stage.bank_voltage(&StageCondition {
                input_voltage: condition.condition.input_voltage,
                load_current: condition.condition.load_current,
                output_voltage: regulated,
            })
        } else {
            regulated
        };
        let ratio = design.values.get("compensator.opto.transfer-ratio.nominal").expect("entered");
        let bias = design_checked.compensator.bias(control, feed, ratio).expect("isolated");
        assert_relative("LED current", bias.led_current, wanted("led_current"), 1e-6);
        assert_relative("cathode current", bias.cathode_current, wanted("cathode_current"), 1e-6);
        assert_relative("cathode voltage", bias.cathode_voltage, wanted("cathode_voltage"), 1e-6);
    });
}

#[test]
fn isolated_loops_over_frequency() {
    each(compare_responses);
}

#[test]
fn isolated_loops_at_nine_conditions() {
    each(compare_conditions);
    each(compare_laws);
}

#[test]
fn isolated_loops_through_three_steps() {
    each(compare_steps);
}

#[test]
fn isolated_loops_against_the_switched_stage() {
    each(compare_switched);
}
