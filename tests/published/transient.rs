//! The switched closed loop in time against scipy's ODE solver.
//!
//! *Source*: `tests/reference/transient.py`: hand-written interval equations integrated by `solve_ivp` (DOP853, relative tolerance 1e-10), every
//! switching instant and every limit of an amplifier as its event; started on the exact periodic orbit or at rest. Nothing there knows this
//! crate.
//!
//! *Tolerance*: 1e-8 of full scale, the greatest magnitude that the waveform reaches; the solver's own error is some 1e-10 of it.

use crate::common::{analysed, checked};
use crate::reference::{list, numbers, texts, values};
use polewright::analysis::{TransientEvent, transient_at};
use serde_json::Value;

const TRANSIENT: &str = include_str!("../reference/transient.json");

const TOLERANCE: f64 = 1e-8;

const COLUMNS: [(&str, &str); 3] = [
    ("output voltage", "output_voltage_v"),
    ("inductor current", "inductor_current_a"),
    ("control voltage", "control_voltage_v"),
];

fn event(key: &str) -> TransientEvent {
    TransientEvent::ALL.into_iter().find(|event| event.key() == key).unwrap_or_else(|| panic!("no event {key}"))
}

/// The greatest difference of each column, as a share of its full scale.
fn differences(case: &Value) -> Vec<(&'static str, f64)> {
    let title = case["title"].as_str().expect("a text");
    let design = crate::common::design(&texts(&case["choices"]), &values(&case["values"]));
    let condition = analysed(&design, &[1e3], 10).conditions[4].condition.clone();
    let times = numbers(&case["times_s"]);
    let found = transient_at(&checked(&design), &condition, event(case["event"].as_str().expect("a text")), &times)
        .unwrap_or_else(|finding| panic!("{title}: {finding:?}"));
    let shares = COLUMNS.map(|(name, column)| {
        let names: Vec<_> = found.iter().map(|(name, _)| name.as_str()).collect();
        let (_, curve) =
            found.iter().find(|(n, _)| n.starts_with(name)).unwrap_or_else(|| panic!("{name} in {names:?}"));
        let wanted = numbers(&case[column]);
        assert_eq!(curve.len(), wanted.len(), "{title}: {name}");
        let scale = wanted.iter().fold(0.0_f64, |most, v| most.max(v.abs()));
        let off = curve.iter().zip(&wanted).map(|(v, w)| (v - w).abs()).fold(0.0, f64::max);
        (name, off / scale)
    });
    shares.to_vec()
}

#[test]
fn waveforms_are_those_of_the_ode_solver() {
    let content: Value = serde_json::from_str(TRANSIENT).expect("valid JSON");
    let cases = list(&content["cases"]);
    assert!(cases.len() >= 9);
    let mut off = Vec::new();
    for case in cases {
        for (name, share) in differences(case) {
            println!("{} {name}: {share:.1e}", case["title"]);
            if share.is_nan() || share > TOLERANCE {
                off.push(format!("{} {name}: {share:.1e}", case["title"]));
            }
        }
    }
    assert!(off.is_empty(), "beyond {TOLERANCE:e} of full scale: {off:#?}");
}
