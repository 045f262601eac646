//! Tests of the analysis that need no outside reference: definitions put back, sums that close.

use super::*;
use crate::design::sample;
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
    let model = loop_model::LoopModel::new(&design.stage, &design.modulator, &shared, &condition).unwrap();
    let closed = model.closed(&shared).unwrap();
    let open = model.vout_from_load().unwrap();
    for f in [10.0, 300.0, 3e3, 3e4] {
        let by_states = closed.at_hz(f).unwrap()[(0, 0)];
        let by_curve = open.at_hz(f) / (model.loop_gain.at_hz(f) + 1.0);
        assert!((by_states / by_curve - 1.0).norm() < 1e-6, "{by_states} against {by_curve} at {f} Hz");
    }
}

#[test]
fn nominal_condition_is_the_middle_one() {
    let analysis = analyse(&built_in(), &request());
    assert_eq!(analysis.conditions[condition::NOMINAL].condition.levels, Some((Level::Nominal, Level::Nominal)));
    assert_eq!(analysis.conditions.len(), 9);
    assert_eq!(analysis.condition, analysis.conditions[condition::NOMINAL].condition);
}
