//! Difference equations and the loops they close against an independent calculation in Python.
//!
//! *Source*: `tests/reference/digital.py`: coefficients by mpmath, held there against scipy's `cont2discrete` (bilinear, prewarped by a longer
//! period) and python-control's matched form; rounded words; averaged stages of hand-written cells sampled by matrix exponentials, with
//! the map's eigenvalues, the pulse transfer function and the answers to events. Nothing there knows this crate.
//!
//! *Tolerance*: coefficients 1e-9 of the greatest, codes exact, all else 1e-6.

use crate::common::{analysed, assert_absolute, assert_relative, checked, design};
use crate::reference::{compare_margins, compare_responses, complex, designs, list, number, numbers, texts, values};
use polewright::analysis::{Detail, Step};
use polewright::design::Design;
use polewright::linear::{Complex, FrequencyResponse};
use serde_json::Value;
use std::f64::consts::TAU;

const DIGITAL: &str = include_str!("../reference/digital.json");

fn assert_coefficients(what: &str, found: &[f64], wanted: &Value, fraction: f64) {
    let wanted = numbers(wanted);
    assert_eq!(found.len(), wanted.len(), "{what}: {found:?}, wanted {wanted:?}");
    let scale = wanted.iter().fold(0.0_f64, |most, c| most.max(c.abs()));
    for (found, wanted) in found.iter().zip(&wanted) {
        assert_absolute(what, *found, *wanted, fraction * scale);
    }
}

#[track_caller]
fn assert_codes(what: &str, found: &[i64], wanted: &Value) {
    let wanted: Vec<i64> = list(wanted).iter().map(|code| code.as_i64().expect("a whole number")).collect();
    assert_eq!(found, wanted, "{what}");
}

#[test]
fn coefficients_codes_and_responses_are_those_of_the_libraries() {
    let content: Value = serde_json::from_str(DIGITAL).expect("valid JSON");
    let equations = list(&content["equations"]);
    assert!(equations.len() >= 90);
    for (k, row) in equations.iter().enumerate() {
        let design = design(&texts(&row["choices"]), &values(&row["values"]));
        let compensator = checked(&design).compensator;
        let digital = compensator.digital().expect("a difference equation");
        let what = |name: &str| format!("equation {k}, {name}: {}", row["choices"]);
        let (exact, equation) = (digital.exact(), digital.equation());
        assert_coefficients(&what("feedback"), &exact.feedback, &row["feedback"], 1e-9);
        assert_coefficients(&what("forward"), &exact.forward, &row["forward"], 1e-9);
        let words = &row["words"];
        let codes = digital.fixed_point().expect("it fits");
        assert_codes(&what("feedback codes"), &codes.feedback.codes, &words["feedback_codes"]);
        assert_codes(&what("forward codes"), &codes.forward.codes, &words["forward_codes"]);
        assert_coefficients(&what("feedback words"), &equation.feedback, &words["feedback"], 1e-15);
        assert_coefficients(&what("forward words"), &equation.forward, &words["forward"], 1e-15);
        let response = digital.response();
        for (f, wanted) in numbers(&row["frequencies_hz"]).iter().zip(complex(&row["response"])) {
            let off = (response.at_hz(*f) - wanted).norm() / wanted.norm();
            assert!(off < 1e-6, "{} at {f} Hz: off by {off:e}", what("response"));
        }
    }
}

fn each(compare: impl Fn(&Design, &Value)) {
    let found = designs(DIGITAL, |_| true);
    assert!(found.len() >= 4);
    for (design, row) in &found {
        compare(design, row);
    }
}

fn nominal(design: &Design, points: usize) -> Detail {
    *analysed(design, &[1e3], points).shown.unwrap_or_else(|finding| panic!("{}: {finding:?}", design.title))
}

#[test]
fn sampled_loops_over_frequency() {
    each(compare_responses);
}

#[test]
fn sampled_loops_at_nine_conditions() {
    each(|design, row| {
        let analysis = analysed(design, &[1e3], 10);
        for (found, wanted) in analysis.conditions.iter().zip(list(&row["conditions"])) {
            let what = |name: &str| format!("{}, {}: {name}", design.title, found.condition.label);
            let summary = found.outcome.as_ref().unwrap_or_else(|finding| panic!("{finding:?}"));
            assert_relative(&what("duty ratio"), summary.operating_point.duty, number(&wanted["duty"]), 1e-9);
            assert!(summary.loop_gain.stable(), "{}: {:?}", what("stable"), summary.loop_gain.verdict);
            compare_margins(&what, &summary.loop_gain.margins, wanted);
            let sampled = summary.loop_gain.sampled.as_ref().expect("a sampled loop");
            let crossovers = list(&wanted["sampled_crossovers"]);
            assert_eq!(sampled.crossovers.len(), crossovers.len(), "{}", what("sampled crossovers"));
            for (found, wanted) in sampled.crossovers.iter().zip(crossovers) {
                assert_relative(&what("sampled crossover"), found.frequency_hz, number(&wanted["frequency_hz"]), 1e-6);
                let margin = number(&wanted["phase_margin_deg"]);
                assert_absolute(&what("sampled phase margin"), found.phase_margin_deg, margin, 1e-4);
            }
        }
    });
}

#[test]
fn poles_of_the_map_and_the_modulator_delay() {
    each(|design, row| {
        let digital = nominal(design, 10).digital.expect("a difference equation");
        let wanted: Vec<Complex> = complex(&row["poles_z"]);
        let found: Vec<_> = digital.poles_z.iter().filter(|z| z.norm() > 1e-3).collect();
        assert_eq!(found.len(), wanted.len(), "{}: {found:?}, wanted {wanted:?}", design.title);
        for wanted in wanted {
            let nearest = found.iter().map(|z| (*z - wanted).norm()).fold(f64::INFINITY, f64::min);
            assert!(nearest < 1e-6, "{}: {found:?}, wanted {wanted}", design.title);
        }
        let delay = number(&row["conditions"][4]["modulator_delay_s"]);
        assert_relative("modulator delay", digital.modulator_delay_s.expect("a pulse"), delay, 1e-9);
    });
}

/// −360·f·td: what computation and modulator cost the phase of the loop, by definition.
#[test]
fn a_delay_costs_its_angle_at_crossover() {
    each(|design, row| {
        let crossing = &row["conditions"][4]["crossovers"][0];
        let f = number(&crossing["frequency_hz"]);
        let mut prompt = design.clone();
        prompt.values.set("compensator.digital.computation", 0.0).expect("finite");
        let loop_deg = |design: &Design| {
            let detail = analysed(design, &[f], 10).shown.unwrap_or_else(|finding| panic!("{finding:?}"));
            detail.curves.loop_deg[0]
        };
        let computation = design.values.get("compensator.digital.computation").expect("entered");
        assert_absolute(&design.title, loop_deg(design) - loop_deg(&prompt), -360.0 * f * computation, 1e-6);
        assert!((TAU * f * computation) > 0.0);
    });
}

/// The grid of parts of a period, from the event on.
fn compare_curve(what: &str, step: &Step, wanted: &[f64], part_s: f64) {
    let peak = wanted.iter().fold(0.0_f64, |most, v| most.max(v.abs()));
    let mut compared = 0;
    for (t, v) in step.times_s.iter().zip(&step.output_v) {
        let parts = t / part_s;
        let Some(wanted) = (0..wanted.len()).find(|k| (*k as f64 - parts).abs() < 1e-6).map(|k| wanted[k]) else {
            continue;
        };
        assert_absolute(&format!("{what} at {t} s"), v - step.initial_v, wanted, 1e-6 * peak);
        compared += 1;
    }
    assert!(compared >= 60, "{what}: {compared} points compared");
}

#[test]
fn sampled_loops_through_three_steps() {
    each(|design, row| {
        let steps = nominal(design, 20_001).steps;
        let period = checked(design).stage.switching_frequency.recip();
        for (name, step) in [("load", &steps.load), ("line", &steps.line), ("reference", &steps.reference)] {
            let step = step.as_ref().expect("a stable loop");
            let what = format!("{}: {name} step", design.title);
            compare_curve(&what, step, &numbers(&row["steps"][name]["values_v"]), period / number(&row["parts"]));
        }
    });
}
