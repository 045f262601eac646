//! SEPIC, Ćuk and flyback without losses against transfer functions derived symbolically.
//!
//! *Source*: `tests/reference/symbolic.py`: sympy, from Kirchhoff's laws; poles and zeros by mpmath at 40 digits, for 60 random sets of
//! parts each, inductors apart and coupled.
//!
//! *Tolerance*: 1e-6 of each pole, zero and gain; of a pair, of its size.

use crate::common::{assert_relative, at_one_condition, checked, lossless};
use crate::reference::{complex, list, number};
use polewright::converter::StageCondition;
use polewright::linear::{Complex, Zpk};
use serde_json::Value;

const SYMBOLIC: &str = include_str!("../reference/symbolic.json");
const TOLERANCE: f64 = 1e-6;

/// Each wanted root is found once, and nothing else is.
#[track_caller]
fn assert_roots(what: &str, found: &[Complex], wanted: &[Complex]) {
    assert_eq!(found.len(), wanted.len(), "{what}: {found:?}, wanted {wanted:?}");
    let mut left = found.to_vec();
    for root in wanted {
        let (at, off) = left
            .iter()
            .enumerate()
            .map(|(k, z)| (k, (z - root).norm()))
            .min_by(|one, other| one.1.total_cmp(&other.1))
            .expect("as many");
        assert!(off <= TOLERANCE * root.norm(), "{what}: {} for {root}, off by {:e}", left[at], off / root.norm());
        left.remove(at);
    }
}

fn agree(title: &str) {
    let content: Value = serde_json::from_str(SYMBOLIC).expect("valid JSON");
    let circuit = list(&content["circuits"]).iter().find(|one| one["title"].as_str() == Some(title)).expect("there");
    let topology = circuit["topology"].as_str().expect("a text");
    assert!(list(&circuit["cases"]).len() >= 60);
    for case in list(&circuit["cases"]) {
        let at = |name: &str| number(&case[name]);
        let (vin, vout) = (at("input_voltage"), at("output_voltage"));
        let load = vout / at("resistance");
        let mut values = vec![
            ("stage.output.voltage", vout),
            ("stage.inductor.inductance", at("inductance")),
            ("stage.bank.1.capacitance", at("capacitance")),
            ("compensator.reference", vout / 2.0),
            ("compensator.divider.upper", 10e3),
            ("compensator.divider.lower", 10e3),
        ];
        if topology == "flyback" {
            values.push(("stage.transformer.ratio", at("turns_ratio")));
        } else {
            values.extend([
                ("stage.second-inductor.inductance", at("second_inductance")),
                ("stage.second-inductor.resistance", 0.0),
                ("stage.coupling-capacitor.capacitance", at("coupling_capacitance")),
                ("stage.coupling-capacitor.esr", 0.0),
                ("stage.inductors.coupling", at("coupling")),
            ]);
        }
        let mut design = lossless(topology, &values);
        if topology != "flyback" {
            let inductors = if circuit["coupled"].as_bool() == Some(true) { "coupled" } else { "separate" };
            design.set_from_text("stage.inductors", inductors).expect("an option");
        }
        at_one_condition(&mut design, vin, load);
        let condition = StageCondition { input_voltage: vin, load_current: load, output_voltage: vout };
        let averaged = checked(&design).stage.averaged(&condition).expect("an operating point");
        assert_relative(title, averaged.operating_point.duty, at("duty"), TOLERANCE);
        let model = averaged.stage;
        for (input, name) in [("duty", "from_duty"), ("input voltage", "from_vin")] {
            let (row, column) = (model.output("output voltage").expect("named"), model.input(input).expect("named"));
            let zpk = Zpk::from_state_space(&model, row, column).expect("roots");
            let what = format!("{title} {name}: {case}");
            assert_relative(&what, zpk.dc_gain().expect("finite"), number(&case[name][0]), TOLERANCE);
            assert_roots(&what, &zpk.zeros, &complex(&case[&format!("zeros_{name}")]));
            assert_roots(&what, &zpk.poles, &complex(&case["poles"]));
        }
    }
}

#[test]
fn flyback_equals_its_derivation() {
    agree("flyback");
}

#[test]
fn sepic_equals_its_derivation() {
    agree("SEPIC");
    agree("SEPIC, coupled");
}

#[test]
fn cuk_equals_its_derivation() {
    agree("Cuk");
    agree("Cuk, coupled");
}
