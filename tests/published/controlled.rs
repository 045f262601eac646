//! Discontinuous conduction, current modes and filters against independent calculations in Python, remade and compared by CI.
//!
//! *Source*: `tests/reference/controlled.py` on averaged models from hand-written interval equations (`conduction.py`), the control law
//! derived there; `tests/reference/orbit.py` for the exact switched stage. Nothing there knows this crate.
//!
//! *Tolerance*: 1e-6 against the averaged equations. Against the switched stage, to a fifth of the switching frequency, what
//! averaging itself costs: 0.4 dB and 1°; in average current mode, where ripple reaches the comparator, 0.5 dB and 10°.

use crate::common::{analysed, assert_absolute, assert_relative};
use crate::reference::{
    compare_conditions, compare_margins, compare_responses, compare_steps, complex, designs, list, number, numbers,
    polar,
};
use polewright::converter::Conduction;
use polewright::design::Design;
use serde_json::Value;

const DISCONTINUOUS: &str = include_str!("../reference/discontinuous.json");
const CURRENT_MODE: &str = include_str!("../reference/current_mode.json");
const FILTERS: &str = include_str!("../reference/filters.json");

fn each(text: &str, least: usize, compare: impl Fn(&Design, &Value)) {
    let designs = designs(text, |_| true);
    assert!(designs.len() >= least);
    for (design, row) in designs {
        compare(&design, &row);
    }
}

/// The mode, how long the rectifier conducts, and what the law asks, at all nine conditions.
pub(crate) fn compare_laws(design: &Design, row: &Value) {
    let analysis = analysed(design, &[1e3], 10);
    for (found, wanted) in analysis.conditions.iter().zip(list(&row["conditions"])) {
        let what = |name: &str| format!("{}, {}: {name}", design.title, found.condition.label);
        let summary = found.outcome.as_ref().unwrap_or_else(|finding| panic!("{finding:?}"));
        let point = &summary.operating_point;
        let rests = wanted["conduction"].as_str() == Some("discontinuous");
        assert_eq!(point.conduction == Conduction::Discontinuous, rests, "{}", what("conduction"));
        assert_eq!(point.second_duty.is_some(), rests, "{}", what("second duty ratio"));
        if let Some(second) = point.second_duty {
            assert_relative(&what("second duty ratio"), second, number(&wanted["second_duty"]), 1e-8);
        }
        if let Some(volts) = wanted["control_voltage"].as_f64() {
            assert_absolute(&what("control voltage"), summary.control.control_voltage, volts, 1e-8);
        }
        let multiplier = summary.control.sampling.map(|sampling| sampling.fast_multiplier);
        assert_eq!(multiplier.is_some(), wanted["fast_multiplier"].is_number(), "{}", what("sampling"));
        if let Some(multiplier) = multiplier {
            assert_absolute(&what("fast multiplier"), multiplier, number(&wanted["fast_multiplier"]), 1e-8);
        }
    }
}

/// The inner loop of average current control at the nominal condition.
fn compare_inner_loop(design: &Design, row: &Value) {
    let detail = analysed(design, &[1e3], 10).shown.unwrap_or_else(|finding| panic!("{finding:?}"));
    let inner = detail.control.inner.as_ref();
    assert_eq!(inner.is_some(), row["inner_margins"].is_object(), "{}", design.title);
    if let Some(inner) = inner {
        compare_margins(&|name| format!("{}: inner {name}", design.title), &inner.margins, &row["inner_margins"]);
    }
}

/// The plant against what an analyser reads on the switched stage.
pub(crate) fn compare_switched(design: &Design, row: &Value) {
    let switched = &row["switched"];
    let frequencies = numbers(&switched["frequencies_hz"]);
    let curves = analysed(design, &frequencies, 10).shown.unwrap_or_else(|finding| panic!("{finding:?}")).curves;
    let average = design.choices.is("control.mode", "average-current");
    let (gain, phase) = if average { (0.5, 10.0) } else { (0.4, 1.0) };
    let fifth = design.values.get("stage.switching-frequency").expect("entered") / 5.0;
    for (k, wanted) in complex(&switched["plant"]).into_iter().enumerate() {
        if frequencies[k] > fifth {
            continue;
        }
        let apart = polar(curves.plant_db[k], curves.plant_deg[k]) / wanted;
        let (db, deg) = (20.0 * apart.norm().log10(), apart.arg().to_degrees());
        let what = format!("{} at {} Hz: {db} dB, {deg}°", design.title, frequencies[k]);
        assert!(db.abs() < gain && deg.abs() < phase, "{what}");
    }
    // A disturbance of the current, one period later: by straight lines here, by the map of the orbit there.
    let multiplier = analysed(design, &[1e3], 10).shown.ok().and_then(|detail| detail.control.sampling);
    // Where a magnetising current turns its sign every pulse, there is no one multiplier, and the reference gives none.
    if let Some((sampling, exact)) = multiplier.zip(switched["fast_multiplier"].as_f64()) {
        assert_absolute(&design.title, sampling.fast_multiplier, exact, 0.02);
    }
}

#[test]
fn discontinuous_designs_over_frequency() {
    each(DISCONTINUOUS, 6, compare_responses);
}

#[test]
fn discontinuous_designs_at_nine_conditions() {
    each(DISCONTINUOUS, 6, compare_conditions);
    each(DISCONTINUOUS, 6, compare_laws);
}

#[test]
fn discontinuous_designs_through_three_steps() {
    each(DISCONTINUOUS, 6, compare_steps);
}

#[test]
fn discontinuous_designs_against_the_switched_stage() {
    each(DISCONTINUOUS, 6, compare_switched);
}

#[test]
fn current_mode_designs_over_frequency() {
    each(CURRENT_MODE, 7, compare_responses);
}

#[test]
fn current_mode_designs_at_nine_conditions() {
    each(CURRENT_MODE, 7, compare_conditions);
    each(CURRENT_MODE, 7, compare_laws);
    each(CURRENT_MODE, 7, compare_inner_loop);
}

#[test]
fn current_mode_designs_through_three_steps() {
    each(CURRENT_MODE, 7, compare_steps);
}

#[test]
fn current_mode_designs_against_the_switched_stage() {
    each(CURRENT_MODE, 7, compare_switched);
}

#[test]
fn filtered_designs_over_frequency() {
    each(FILTERS, 4, compare_responses);
}

#[test]
fn filtered_designs_at_nine_conditions() {
    each(FILTERS, 4, compare_conditions);
    each(FILTERS, 4, compare_laws);
}

#[test]
fn filtered_designs_through_three_steps() {
    each(FILTERS, 4, compare_steps);
}

#[test]
fn filtered_designs_against_the_switched_stage() {
    each(FILTERS, 4, compare_switched);
}
