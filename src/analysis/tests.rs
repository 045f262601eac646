//! Tests of the analysis that need no outside reference: definitions put back, sums that close.

use super::*;
use crate::design::{Design, sample};
use crate::linear::FrequencyResponse;

fn built_in() -> crate::design::CheckedDesign {
    sample::built_in().check().unwrap()
}

fn request() -> Request {
    Request::spanning(Shown::Levels(Level::Nominal, Level::Nominal), 300e3, 200)
}

/// The phase margin put back into its definition, and the ledger's sum.
#[test]
fn margins_and_ledger_close() {
    let design = built_in();
    for (input, load) in Level::ALL.into_iter().flat_map(|i| [Level::Nominal, Level::Greatest].map(|l| (i, l))) {
        let analysis = analyse(&design, &Request { shown: Shown::Levels(input, load), ..request() });
        let detail = analysis.shown.unwrap();
        let ledger = detail.ledger.unwrap();
        let crossover = detail.loop_gain.margins.headline_crossover().unwrap();
        let sum: f64 = ledger.rows.iter().map(|row| row.degrees).sum();
        assert!((sum - crossover.phase_margin_deg).abs() < 1e-9, "{sum} against {}", crossover.phase_margin_deg);
    }
}

/// Closed-loop curves are the open-loop ones over 1 + T, and the state space agrees where its delay form does.
#[test]
fn closed_loop_state_space_agrees_with_the_curves() {
    let design = built_in();
    let shared = loop_model::Shared::new(&design).unwrap();
    let condition = Condition::at_levels(&design.stage, Level::Least, Level::Greatest).of_stage(&design.stage);
    let model = loop_model::LoopModel::new(&design.stage, &shared, &condition).unwrap();
    let closed = model.closed(&shared).unwrap();
    let open = model.open_loop("load voltage", "load current").unwrap();
    for f in [10.0, 300.0, 3e3, 3e4] {
        let by_states = closed.at_hz(f).unwrap()[(0, 0)];
        let by_curve = open.at_hz(f) / (model.loop_gain.at_hz(f) + 1.0);
        assert!((by_states / by_curve - 1.0).norm() < 1e-6, "{by_states} against {by_curve} at {f} Hz");
    }
}

/// The load step goes continuously with the bank's series inductance, for every topology and load kind: a slewed step adds
/// at most ESL·slew, and what it does to the control path is small. (Two nearly equal banks side by side once cancelled to
/// kilovolts.)
#[test]
fn load_step_is_continuous_in_the_series_inductance() {
    let with = |sample: &sample::Sample, load: &str, esl: f64| {
        let mut design = sample.design().unwrap();
        design.choices.set("stage.load", load);
        for branch in ["1", "2"] {
            design.values.set(&format!("stage.bank.{branch}.esl"), esl).unwrap();
        }
        let checked = design.check().unwrap();
        let band = checked.stage.switching_frequency;
        analyse(&checked, &Request::spanning(Shown::Levels(Level::Nominal, Level::Greatest), band, 50))
    };
    for sample in sample::all() {
        for load in ["resistor", "current", "power"] {
            let plain = with(sample, load, 0.0);
            for esl in [1e-11, 1e-10, 1e-9, 5e-9, 2e-8] {
                let inductive = with(sample, load, esl);
                for (a, b) in plain.conditions.iter().zip(&inductive.conditions) {
                    let (Ok(a), Ok(b)) = (&a.outcome, &b.outcome) else {
                        assert_eq!(a.outcome.is_ok(), b.outcome.is_ok(), "{} {load} {esl}", sample.file);
                        continue;
                    };
                    let (Some(a), Some(b)) = (a.load_step, b.load_step) else { continue };
                    let (a, b) = (a.deviation_v.abs(), b.deviation_v.abs());
                    let spike = 2.0 * esl * 1e6;
                    assert!((a - b).abs() < 0.05 * a + spike, "{} {load} {esl}: {a} V against {b} V", sample.file);
                }
            }
        }
    }
}

#[test]
fn nominal_condition_is_the_middle_one() {
    let analysis = analyse(&built_in(), &request());
    assert_eq!(analysis.conditions[condition::NOMINAL].condition.levels, Some((Level::Nominal, Level::Nominal)));
    assert_eq!(analysis.conditions.len(), 9);
    assert_eq!(analysis.condition, analysis.conditions[condition::NOMINAL].condition);
}

/// The tangent of a constant-power load puts a pole into the conversion curve of a steep boost; beyond what the winding lets through
/// there is no operating point, and none is made up at that pole.
#[test]
fn no_operating_point_is_found_at_a_pole_of_the_loads_tangent() {
    let mut design = Design::default();
    for (path, text) in [
        ("stage.topology", "boost"),
        ("stage.rectifier", "emulated"),
        ("stage.load", "power"),
        ("stage.output-filter", "fitted"),
        ("stage.input-capacitor", "none"),
        ("stage.bank", "1"),
        ("stage.input.least", "7.07"),
        ("stage.input.nominal", "12"),
        ("stage.input.greatest", "16.9"),
        ("stage.source.resistance", "0"),
        ("stage.inductor.resistance", "53m"),
        ("stage.switch.resistance", "17m"),
        ("stage.synchronous.resistance", "8.5m"),
        ("stage.load.least", "100m"),
        ("stage.load.nominal", "2"),
        ("stage.load.greatest", "6.7"),
        ("stage.output.voltage", "60"),
        ("compensator.reference", "1.2"),
        ("compensator.divider.upper", "49k"),
        ("compensator.divider.lower", "1k"),
    ] {
        design.set_from_text(path, text).unwrap();
    }
    let checked = design.check().unwrap();
    let shown = Shown::Levels(Level::Least, Level::Greatest);
    let analysis = analyse(&checked, &Request::spanning(shown, checked.stage.switching_frequency, 10));
    // 7.07 V through 70 mΩ give 179 W at most, and 402 W are asked.
    assert_eq!(analysis.shown.unwrap_err().place, "stage.output.voltage");
    assert!(
        analysis.conditions.iter().filter_map(|c| c.outcome.as_ref().ok()).all(|s| s.operating_point.on_slope > 0.0)
    );
}
