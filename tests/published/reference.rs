//! The engine against independent calculations in Python: `tests/reference/closed_loop.json`, remade and compared by CI.
//!
//! *Source*: `tests/reference/closed_loop.py`: ten designs from hand-written interval matrices, the compensator's node equations,
//! python-control and scipy. Nothing there knows this crate.

use crate::common::{analysed, assert_absolute, assert_relative, checked, design, ratio};
use polewright::analysis::{Analysis, Curves, Detail, Step};
use polewright::design::Design;
use polewright::linear::{Complex, Margins};
use serde_json::Value;

const CLOSED_LOOP: &str = include_str!("../reference/closed_loop.json");

fn json(text: &str) -> Value {
    serde_json::from_str(text).expect("valid JSON")
}

pub(crate) fn list(value: &Value) -> &[Value] {
    value.as_array().expect("a list")
}

pub(crate) fn number(value: &Value) -> f64 {
    value.as_f64().expect("a number")
}

pub(crate) fn numbers(value: &Value) -> Vec<f64> {
    list(value).iter().map(number).collect()
}

pub(crate) fn complex(value: &Value) -> Vec<Complex> {
    list(value).iter().map(|pair| Complex::new(number(&pair[0]), number(&pair[1]))).collect()
}

pub(crate) fn texts(value: &Value) -> Vec<(&str, &str)> {
    value.as_object().expect("an object").iter().map(|(k, v)| (k.as_str(), v.as_str().expect("a text"))).collect()
}

pub(crate) fn values(value: &Value) -> Vec<(&str, f64)> {
    value.as_object().expect("an object").iter().map(|(k, v)| (k.as_str(), number(v))).collect()
}

/// The designs of a reference, among them those wanted, with what Python found for each.
pub(crate) fn designs(text: &str, wanted: impl Fn(&Value) -> bool) -> Vec<(Design, Value)> {
    let content = json(text);
    list(&content["designs"])
        .iter()
        .filter(|row| wanted(row))
        .map(|row| {
            let mut design = design(&texts(&row["choices"]), &values(&row["values"]));
            row["title"].as_str().expect("a text").clone_into(&mut design.title);
            (design, row.clone())
        })
        .collect()
}

fn ten() -> Vec<(Design, Value)> {
    let found = designs(CLOSED_LOOP, |_| true);
    assert_eq!(found.len(), 10);
    found
}

fn shown(analysis: Analysis) -> Detail {
    *analysis.shown.unwrap_or_else(|finding| panic!("{finding:?}"))
}

pub(crate) fn polar(db: f64, deg: f64) -> Complex {
    Complex::from_polar(ratio(db), deg.to_radians())
}

#[track_caller]
fn assert_complex(what: &str, found: Complex, wanted: Complex, fraction: f64) {
    let error = (found - wanted).norm();
    assert!(
        error <= fraction * wanted.norm(),
        "{what}: {found}, wanted {wanted}, off by {:e} of it",
        error / wanted.norm()
    );
}

fn compare_curves(title: &str, curves: &Curves, row: &Value, reference: f64, regulated: f64) {
    let complex_at = |name: &str| complex(&row["responses"][name]);
    let signed = [
        ("plant", &curves.plant_db, &curves.plant_deg, 1.0),
        ("compensator", &curves.compensator_db, &curves.compensator_deg, 1.0),
        ("loop", &curves.loop_db, &curves.loop_deg, 1.0),
        ("line_to_output", &curves.line_to_output_db, &curves.line_to_output_deg, 1.0),
        // Shown scaled so that 0 dB is perfect following.
        ("reference_to_output", &curves.reference_to_output_db, &curves.reference_to_output_deg, regulated / reference),
    ];
    for (name, db, deg, scale) in signed {
        for (k, wanted) in complex_at(name).into_iter().enumerate() {
            let what = format!("{title}: {name} at {} Hz", curves.frequencies_hz[k]);
            assert_complex(&what, polar(db[k], deg[k]) * scale, wanted, 1e-6);
        }
    }
    for (k, wanted) in complex_at("output_impedance").into_iter().enumerate() {
        let found = Complex::from_polar(curves.output_impedance_ohm[k], curves.output_impedance_deg[k].to_radians());
        assert_complex(&format!("{title}: output impedance at {} Hz", curves.frequencies_hz[k]), found, wanted, 1e-6);
    }
    for (k, wanted) in complex_at("open_loop_output_impedance").into_iter().enumerate() {
        let what = format!("{title}: open-loop output impedance at {} Hz", curves.frequencies_hz[k]);
        assert_relative(&what, curves.open_loop_output_impedance_ohm[k], wanted.norm(), 1e-6);
    }
    for (k, wanted) in complex_at("open_loop_line_to_output").into_iter().enumerate() {
        let what = format!("{title}: open-loop line to output at {} Hz", curves.frequencies_hz[k]);
        assert_relative(&what, ratio(curves.open_loop_line_to_output_db[k]), wanted.norm(), 1e-6);
    }
}

/// All curves of the nominal condition.
pub(crate) fn compare_responses(design: &Design, row: &Value) {
    let frequencies = numbers(&row["frequencies_hz"]);
    let detail = shown(analysed(design, &frequencies, 10));
    let regulated = number(&row["regulated_output"]);
    let reference = design.values.get("compensator.reference").expect("entered");
    compare_curves(&design.title, &detail.curves, row, reference, regulated);
}

#[test]
fn ten_designs_at_sixty_frequencies() {
    for (design, row) in ten() {
        assert_eq!(list(&row["frequencies_hz"]).len(), 60);
        compare_responses(&design, &row);
    }
}

/// Operating point and margins of all nine conditions.
pub(crate) fn compare_conditions(design: &Design, row: &Value) {
    let analysis = analysed(design, &[1e3], 10);
    let wanted = list(&row["conditions"]);
    assert_eq!(analysis.conditions.len(), wanted.len());
    for (found, wanted) in analysis.conditions.iter().zip(wanted) {
        let what = |name: &str| format!("{}, {}: {name}", design.title, found.condition.label);
        let summary = found.outcome.as_ref().unwrap_or_else(|finding| panic!("{finding:?}"));
        let at = |name: &str| number(&wanted[name]);
        assert_relative(&what("input voltage"), found.condition.input_voltage, at("input_voltage"), 1e-12);
        assert_relative(&what("load current"), found.condition.load_current, at("load_current"), 1e-12);
        let point = &summary.operating_point;
        assert_relative(&what("duty ratio"), point.duty, at("duty"), 1e-9);
        assert_relative(&what("input current"), point.input_current, at("input_current"), 1e-8);
        let inductor = &point.inductors[0].current;
        assert_relative(&what("inductor current"), inductor.average, at("inductor_current"), 1e-8);
        // Straight-line ripple from averaged states; the on and off slopes close to well under a percent.
        assert_relative(&what("inductor ripple"), inductor.ripple, at("inductor_ripple"), 1e-6);
        assert!(summary.loop_gain.stable(), "{}: {:?}", what("stable"), summary.loop_gain.verdict);
        compare_margins(&what, &summary.loop_gain.margins, wanted);
    }
}

#[test]
fn ten_designs_at_nine_conditions() {
    for (design, row) in ten() {
        compare_conditions(&design, &row);
    }
}

/// Every crossover and margin of a stable loop.
pub(crate) fn compare_margins(what: &dyn Fn(&str) -> String, margins: &Margins, wanted: &Value) {
    let crossovers = list(&wanted["crossovers"]);
    assert_eq!(margins.crossovers.len(), crossovers.len(), "{}", what("crossovers"));
    for (found, wanted) in margins.crossovers.iter().zip(crossovers) {
        assert_relative(&what("crossover"), found.frequency_hz, number(&wanted["frequency_hz"]), 1e-8);
        assert_absolute(&what("phase margin"), found.phase_margin_deg, number(&wanted["phase_margin_deg"]), 1e-4);
        assert_absolute(&what("slope"), found.slope_db_per_decade, number(&wanted["slope_db_per_decade"]), 1e-4);
        assert_eq!(Some(found.falling), wanted["falling"].as_bool(), "{}", what("falling"));
    }
    let crossings = list(&wanted["phase_crossovers"]);
    assert_eq!(margins.phase_crossovers.len(), crossings.len(), "{}", what("phase crossovers"));
    for (found, wanted) in margins.phase_crossovers.iter().zip(crossings) {
        assert_relative(&what("phase crossover"), found.frequency_hz, number(&wanted["frequency_hz"]), 1e-7);
        assert_absolute(&what("gain margin"), found.gain_margin_db, number(&wanted["gain_margin_db"]), 1e-5);
    }
    assert_relative(&what("modulus margin"), margins.modulus_margin, number(&wanted["modulus_margin"]), 1e-8);
    let delay = margins.delay_margin_s.expect("a stable loop with a crossover has one");
    assert_relative(&what("delay margin"), delay, number(&wanted["delay_margin_s"]), 1e-6);
}

/// The value between the points of an evenly spaced curve, by the cubic through four of them; none close to a corner of the input's ramp,
/// where no polynomial fits.
fn between_points(step: &Step, t: f64) -> Option<f64> {
    let pitch = step.times_s[1] - step.times_s[0];
    let at = t / pitch;
    let corners = [0.0, step.rise_s / pitch];
    let first = (at.floor() - 1.0).max(0.0);
    if first + 3.0 >= step.times_s.len() as f64 {
        return None;
    }
    // The corner itself may be a point; a corner inside the four points may not.
    if corners.iter().any(|corner| first < *corner && *corner < first + 3.0) {
        return None;
    }
    let start = step.times_s.iter().position(|time| time / pitch >= first - 0.5)?;
    let x = at - first;
    let weights = [
        -(x - 1.0) * (x - 2.0) * (x - 3.0) / 6.0,
        x * (x - 2.0) * (x - 3.0) / 2.0,
        -x * (x - 1.0) * (x - 3.0) / 2.0,
        x * (x - 1.0) * (x - 2.0) / 6.0,
    ];
    Some(weights.iter().zip(&step.output_v[start..]).map(|(w, v)| w * (v - step.initial_v)).sum())
}

/// Load, line and reference step of the nominal condition.
pub(crate) fn compare_steps(design: &Design, row: &Value) {
    // Points so dense that a cubic between them is exact to far below the tolerance.
    let detail = shown(analysed(design, &[1e3], 20_001));
    let steps = [("load", &detail.steps.load), ("line", &detail.steps.line), ("reference", &detail.steps.reference)];
    for (name, step) in steps {
        let step = step.as_ref().unwrap_or_else(|| panic!("{}: no {name} step", design.title));
        let wanted = &row["steps"][name];
        let what = |part: &str| format!("{}: {name} step, {part}", design.title);
        let peak = number(&wanted["deviation_v"]).abs();
        let (times, curve) = (numbers(&wanted["times_s"]), numbers(&wanted["values_v"]));
        let mut compared = 0;
        for (t, value) in times.iter().zip(&curve) {
            if let Some(found) = between_points(step, *t) {
                assert_absolute(&what(&format!("at {t} s")), found, *value, 1e-6 * peak);
                compared += 1;
            }
        }
        assert!(compared > 30, "{} of {} times compared", compared, times.len());
        assert_absolute(&what("deviation"), step.deviation_v, number(&wanted["deviation_v"]), 1e-6 * peak);
        let final_v = step.final_v - step.initial_v;
        assert_absolute(&what("final value"), final_v, number(&wanted["final_v"]), 1e-6 * peak);
        let settling = step.settling_s.expect("it settles");
        assert_absolute(&what("settling"), settling, number(&wanted["settling_s"]), 1e-5 * settling + 1e-12);
    }
}

#[test]
fn ten_designs_through_three_steps() {
    for (design, row) in ten() {
        compare_steps(&design, &row);
    }
}

/// Every one of the ten must be usable without a remark about its values: they are meant as real designs.
#[test]
fn ten_designs_have_no_problem() {
    for (design, _) in ten() {
        let regulated = checked(&design).compensator.dc_output_voltage();
        let entered = design.values.get("stage.output.voltage").expect("entered");
        assert_relative("the divider gives what is entered", regulated, entered, 0.005);
    }
}
