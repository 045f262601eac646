//! The exact switched loop as an analyser reads it against an independent calculation in Python.
//!
//! *Source*: `tests/reference/analyser.py`: hand-written interval equations, the exact orbit of the closed loop and its answer to a small
//! sine on any input; multipliers of its period; what flows in a steady period. Its slow limit is held there against the slope of the
//! exact steady output. Nothing of it knows this crate.
//!
//! *Tolerance*: 1e-6.

use crate::common::{assert_absolute, assert_relative, checked};
use crate::reference::{complex, designs, list, number, numbers};
use polewright::analysis::loop_model::Shared;
use polewright::converter::StageCondition;
use polewright::design::Design;
use polewright::switched::{Closing, Driven, ExactLoop, Joined, Quantity, Stability, Start, SwitchedSystem};
use serde_json::Value;

const ANALYSER: &str = include_str!("../reference/analyser.json");

/// The nominal condition, isolated feedback fed from where it stands.
fn exact(design: &Design) -> ExactLoop {
    let checked = checked(design);
    let stage = &checked.stage;
    let condition = StageCondition {
        input_voltage: stage.input_voltages[1],
        load_current: stage.load_currents[1],
        output_voltage: stage.output_voltage,
    };
    let shared = Shared::new(&checked).expect("a law");
    let point = stage.averaged(&condition).expect("an operating point").operating_point;
    let held = checked.compensator.steady_inputs().into_iter().map(|(name, volts)| (name.to_owned(), volts)).collect();
    let probe = if design.choices.is("compensator.opto.fast-path", "bank") { "bank voltage" } else { "load voltage" };
    let fed = match shared.compensator.input("fast") {
        Some(_) => vec![("fast".to_owned(), probe.to_owned())],
        None => Vec::new(),
    };
    let closing = Closing { space: &shared.compensator, held, fed };
    let joined = |driven| Joined { stage, law: &shared.law, driven };
    let closed = SwitchedSystem::new(&joined(Driven::Loop(closing)), &condition).expect("a closed loop");
    let open = SwitchedSystem::new(&joined(Driven::Voltage(0.0)), &condition).expect("an open loop");
    ExactLoop::new(&closed, &open, Start::of(&point), condition.output_voltage)
        .unwrap_or_else(|finding| panic!("{}: {finding:?}", design.title))
}

fn each(compare: impl Fn(&Design, &Value)) {
    let found = designs(ANALYSER, |_| true);
    assert!(found.len() >= 25, "{}", found.len());
    for (design, row) in &found {
        compare(design, row);
    }
}

#[test]
fn responses_are_those_of_the_independent_orbit() {
    let quantities = [
        (Quantity::LoopGain, "loop"),
        (Quantity::OutputImpedance, "output_impedance"),
        (Quantity::LineToOutput, "line_to_output"),
        (Quantity::ReferenceToOutput, "reference_to_output"),
    ];
    each(|design, row| {
        let exact = exact(design);
        let frequencies = numbers(&row["frequencies_hz"]);
        let curves = quantities.map(|(quantity, name)| (quantity, name, complex(&row["responses"][name])));
        for (quantity, name, wanted) in curves.into_iter().chain([(Quantity::Plant, "plant", complex(&row["plant"]))]) {
            let mut reader = exact.reader(quantity).expect("readable");
            for (f, wanted) in frequencies.iter().zip(wanted) {
                let found = reader.at(*f).expect("no resonance there");
                let off = (found - wanted).norm() / wanted.norm();
                assert!(off < 1e-6, "{}: {name} at {f} Hz: {found} for {wanted}, off by {off:e}", design.title);
            }
        }
    });
}

#[test]
fn multipliers_and_figures_are_those_of_the_independent_orbit() {
    each(|design, row| {
        let exact = exact(design);
        let orbit = exact.closed.orbit();
        let multipliers = Stability::new(&exact.closed).expect("eigenvalues").multipliers;
        let wanted = complex(&row["multipliers"]);
        let found: Vec<_> = multipliers.iter().filter(|z| z.norm() > 1e-4).collect();
        assert_eq!(found.len(), wanted.len(), "{}: {multipliers:?}, wanted {wanted:?}", design.title);
        for wanted in &wanted {
            let nearest = found.iter().map(|z| (*z - wanted).norm()).fold(f64::INFINITY, f64::min);
            assert!(nearest < 1e-6, "{}: {multipliers:?}, wanted {wanted}", design.title);
        }
        let places = &orbit.system.places;
        let figures = orbit.figures().expect("finite");
        for (name, probe) in
            [("first_inductor", places.inductor_currents[0]), ("output_voltage", places.stage.output_voltage)]
        {
            let [least, greatest, mean, rms] = list(&row["figures"][name]) else { panic!("four figures") };
            let (found, scale) = (&figures[probe], number(rms));
            assert_relative(&format!("{}: RMS of {name}", design.title), found.rms, scale, 1e-6);
            for (found, wanted) in [(found.least, least), (found.greatest, greatest), (found.mean, mean)] {
                assert_absolute(&format!("{}: {name}", design.title), found, number(wanted), 1e-6 * scale);
            }
        }
    });
}
