//! The averaged stage against exact switched orbits, for output banks that averaging may get wrong: series inductance that carries
//! switched current, and unlike capacitors that share their charge within a period.
//!
//! *Source*: `tests/reference/switched.py`: matrix exponentials of hand-written interval equations, the orbit that repeats.
//!
//! *Tolerance*: 0.3 % of the output. Averaging leaves out the ripple's own share, which is of that size for such banks.

use crate::common::{assert_relative, at_one_condition, checked, lossless, nominal};
use polewright::converter::StageCondition;
use polewright::design::Design;
use serde_json::Value;

/// A 9 V to 24 V boost with 10 µH and 150 µF / 3 mΩ at 300 kHz into 16 Ω, without losses.
fn boost(esl: f64) -> Design {
    let mut design = lossless(
        "boost",
        &[
            ("stage.output.voltage", 24.0),
            ("stage.switching-frequency", 300e3),
            ("stage.inductor.inductance", 10e-6),
            ("stage.bank.1.capacitance", 150e-6),
            ("stage.bank.1.esr", 3e-3),
            ("stage.bank.1.esl", esl),
            ("compensator.reference", 12.0),
            ("compensator.divider.upper", 10e3),
            ("compensator.divider.lower", 10e3),
        ],
    );
    at_one_condition(&mut design, 9.0, 1.5);
    design
}

/// The output at which the solved duty ratio is the given one, into 16 Ω.
fn output_at_duty(design: &Design, duty: f64) -> f64 {
    let stage = checked(design).stage;
    let (mut low, mut high) = (12.0, 40.0);
    for _ in 0..60 {
        let middle = f64::midpoint(low, high);
        let condition = StageCondition { input_voltage: 9.0, load_current: middle / 16.0, output_voltage: middle };
        let found = stage.averaged(&condition).expect("an operating point").operating_point.duty;
        if found < duty {
            low = middle;
        } else {
            high = middle;
        }
    }
    low
}

#[test]
fn outputs_at_a_duty_ratio_are_those_of_the_switched_orbit() {
    let content: Value = serde_json::from_str(include_str!("../reference/switched.json")).expect("valid JSON");
    let cases = content["cases"].as_array().expect("a list");
    assert!(cases.len() >= 7);
    for case in cases {
        let mut design = boost(0.0);
        design.set_from_text("stage.bank", case["branches"].as_str().expect("a text")).expect("an option");
        for (path, value) in case["values"].as_object().expect("an object") {
            design.values.set(path, value.as_f64().expect("a number")).expect("finite");
        }
        let what = case["title"].as_str().expect("a text");
        assert_relative(what, output_at_duty(&design, 0.625), case["output"].as_f64().expect("a number"), 0.003);
    }
}

/// A boost of 24 V at duty 0.625 must give 23.99 V ± 0.3 % whatever the series inductance; averaged as a state it would give 9 V.
#[test]
fn a_boost_keeps_its_output_whatever_the_series_inductance() {
    for esl in [0.0, 1e-9, 5e-9] {
        assert_relative("output at duty 0.625", output_at_duty(&boost(esl), 0.625), 23.99, 0.003);
    }
}

#[test]
fn series_inductance_hardly_moves_the_plant_below_a_tenth_of_the_switching_frequency() {
    let frequencies: Vec<f64> = (0..=200).map(|k| 30.0 * 1000_f64.powf(f64::from(k) / 200.0)).collect();
    let bare = nominal(&boost(0.0), &frequencies).curves;
    for esl in [1e-9, 5e-9] {
        let curves = nominal(&boost(esl), &frequencies).curves;
        for (k, f) in frequencies.iter().enumerate() {
            let moved = (curves.plant_db[k] - bare.plant_db[k]).abs();
            assert!(moved < 0.1, "{moved} dB at {f} Hz with {esl} H");
        }
    }
}
