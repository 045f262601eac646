//! Compensators against node equations in Python, published designs and preferred values from elsewhere.
#![expect(clippy::unwrap_used, reason = "a test may stop at a missing or malformed reference value")]

use std::collections::BTreeSet;
use std::path::Path;

use polewright::compensator::{
    Amplifier, Anchor, Compensator, Corners, KFactorGoal, Kind, OpAmp, Parts, Series, joined_paths, k_factor,
};
use polewright::linear::Complex;
use polewright::quantity::{Choices, Values};
use serde_json::Value;

/// A committed result of the Python scripts.
fn reference(file: &str) -> Value {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference").join(file);
    serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap()
}

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(|number| number.as_f64().unwrap()).collect()
}

fn complex(value: &Value) -> Complex {
    Complex::new(value[0].as_f64().unwrap(), value[1].as_f64().unwrap())
}

fn compensator(network: &Value) -> Compensator {
    let (mut values, mut choices) = (Values::new(), Choices::new());
    for (path, key) in network["choices"].as_object().unwrap() {
        choices.set(path, key.as_str().unwrap());
    }
    for (path, value) in network["values"].as_object().unwrap() {
        values.set(path, value.as_f64().unwrap()).unwrap();
    }
    Compensator::from_values(&values, &choices).unwrap()
}

fn apart(actual: Complex, wanted: Complex) -> f64 {
    (actual - wanted).norm() / wanted.norm()
}

/// tests/reference/compensator.py: node equations in admittances, every type, both amplifiers and isolated feedback, with and without
/// limits.
#[test]
fn every_network_against_node_equations() {
    let file = reference("compensator.json");
    let frequencies = numbers(&file["frequencies_hz"]);
    let networks = file["networks"].as_array().unwrap();
    assert!(frequencies.len() >= 20 && networks.len() >= 68);
    let (mut worst_ideal, mut worst_limited) = (0.0f64, 0.0f64);
    for network in networks {
        let compensator = compensator(network);
        let (ideal, limited) = (compensator.ideal(), compensator.response().unwrap());
        // A fast path sees the output, too.
        let system = joined_paths(compensator.state_space().unwrap()).unwrap();
        for (index, &frequency) in frequencies.iter().enumerate() {
            let wanted = complex(&network["limited"][index]);
            worst_ideal = worst_ideal.max(apart(ideal.at_hz(frequency), complex(&network["ideal"][index])));
            worst_limited = worst_limited.max(apart(limited.at_hz(frequency), wanted));
            let matrix = system.at_hz(frequency).unwrap();
            worst_limited = worst_limited.max(apart(-matrix[(0, 0)], wanted));
            worst_limited = worst_limited.max(apart(matrix[(0, 1)], complex(&network["from_reference"][index])));
        }
    }
    println!("worst relative error: ideal {worst_ideal:.1e}, limited {worst_limited:.1e}");
    assert!(worst_ideal < 1e-9, "{worst_ideal}");
    assert!(worst_limited < 1e-6, "{worst_limited}");
}

/// tests/reference/preferred.py: every series as the package `eseries` has it.
#[test]
fn every_series_of_preferred_values() {
    let file = reference("preferred.json");
    let all = file["series"].as_object().unwrap();
    assert_eq!(all.len(), 7);
    for (key, values) in all {
        assert_eq!(Series::from_key(key).unwrap().decade(), numbers(values), "{key}");
    }
}

fn op_amp_network(kind: Kind, upper: f64) -> Compensator {
    Compensator {
        kind,
        amplifier: Amplifier::OpAmp(OpAmp {
            dc_gain: 1e5,
            gain_bandwidth_hz: 1e8,
            output_least: 0.0,
            output_greatest: 5.0,
        }),
        anchor: Anchor::Upper,
        has_feedforward: false,
        parts: Parts {
            upper,
            lower: upper / 2.0,
            r2: 10e3,
            c1: 10e-9,
            c2: 1e-9,
            r3: 1e3,
            c3: 1e-9,
            feedforward: 1e-10,
            led: 1e3,
            bias: 1e3,
            pull_up: 4.7e3,
        },
        reference: 5.0,
    }
}

fn near(actual: f64, wanted: f64, relative: f64) {
    assert!((actual / wanted - 1.0).abs() <= relative, "{actual} for {wanted}");
}

/// Type III by K factor: Basso, Switch-Mode Power Supplies, ch. 3 (quoted, three digits), method of Venable 1983. Crossover 5 kHz, margin
/// 45°, plant −9.2 dB and −146° there, upper resistor 10 k.
#[test]
fn type_three_by_k_factor() {
    let goal = KFactorGoal { crossover_hz: 5e3, phase_margin_deg: 45.0, plant_gain_db: -9.2, plant_phase_deg: -146.0 };
    let placed = k_factor(Kind::Three, &goal).unwrap();
    near(placed.boost_deg, 101.0, 1e-12);
    near(placed.pole_over_zero, 7.76, 1e-3);
    near(placed.corners.zero_1.unwrap(), 1795.0, 1e-3);
    near(placed.corners.pole_2.unwrap(), 13.93e3, 1e-3);
    let placement = op_amp_network(Kind::Three, 10e3).place(&placed.corners, &BTreeSet::new());
    assert_eq!(placement.why, None);
    let parts = placement.compensator.parts;
    for (actual, printed) in
        [(parts.c1, 7.46e-9), (parts.c2, 1.104e-9), (parts.c3, 7.72e-9), (parts.r2, 11.89e3), (parts.r3, 1480.0)]
    {
        near(actual, printed, 2e-3);
    }
    near(placement.compensator.ideal().at_hz(5e3).norm(), 2.884, 1e-3);
}

/// Erickson & Maksimovic, 3rd ed., 9.5.4: a lead network with added integrator and its equivalent type III (parts quoted).
/// Upper resistor 96 k with 12.42 k + 862 pF across it, feedback 120 k + 2.7 nF: gain 1.25, zeros 491 Hz and 1702 Hz, pole
/// 14.86 kHz. That network has no c2; one of 0.01 pF puts the first pole where it does not matter.
#[test]
fn type_three_of_a_lead_network_with_integrator() {
    let mut network = op_amp_network(Kind::Three, 96e3);
    network.parts = Parts { r2: 120e3, c1: 2.7e-9, c2: 1e-14, r3: 12.42e3, c3: 862e-12, ..network.parts };
    let corners = network.corners();
    near(corners.zero_1.unwrap(), 491.0, 1e-3);
    near(corners.zero_2.unwrap(), 1702.0, 1e-3);
    near(corners.pole_2.unwrap(), 14.86e3, 1e-3);
    near(corners.gain.unwrap() / corners.zero_1.unwrap(), 1.25, 1e-3);
    // And back: those corners ask for those parts.
    let asked = Corners {
        gain: Some(1.25 * 491.2),
        zero_1: Some(491.2),
        zero_2: Some(1702.0),
        pole_2: Some(14.86e3),
        ..corners
    };
    let parts = op_amp_network(Kind::Three, 96e3).place(&asked, &BTreeSet::new()).compensator.parts;
    for (actual, quoted) in [(parts.r2, 120e3), (parts.c1, 2.7e-9), (parts.r3, 12.42e3), (parts.c3, 862e-12)] {
        near(actual, quoted, 3e-3);
    }
}
