//! Closes the loop of a sized stage: crossover and margin are tried over a short list, each try held against the nine conditions.
//!
//! *Method.* The compensator is placed by the K factor on the plant at the nominal condition, its parts rounded to E96 and E12.
//! The first try that meets all requirements is taken; where none does, the one that misses least. A bank that was proposed
//! grows while the load step alone is missed.

use super::assumption::{Assumption, Draft, full, text};
use super::brief::{Brief, Parts};
use super::propose::Proposal;
use super::stage::{aim, rounded_up};
use crate::analysis::loop_model::{LoopModel, Shared};
use crate::analysis::{Analysis, Level, LimitKind, Request, RequirementVerdict, Shown, analyse};
use crate::compensator::{KFactorGoal, Part, Series};
use crate::converter::StageCondition;
use crate::design::{self, CheckedDesign, Design};
use crate::finding::Finding;
use crate::quantity::Unit;
use std::cmp::Ordering;
use std::collections::BTreeSet;

/// Crossovers that are tried, over the one aimed at.
const CROSSOVERS: [f64; 8] = [1.0, 1.25, 0.8, 1.6, 0.63, 0.5, 0.4, 0.3];
/// Phase margins that are placed [°].
const MARGINS: [f64; 3] = [60.0, 70.0, 52.0];
/// Times the bank may grow.
const GROWTHS: usize = 6;
/// A little more than what a missed deviation asks, for the series is coarse and the crossover moves.
const GROWTH_RESERVE: f64 = 1.05;

/// One closed loop.
struct Try {
    design: Design,
    crossover_hz: f64,
    margin_deg: f64,
    analysis: Analysis,
    score: Score,
}

/// How far a try is from meeting everything: conditions without a stable loop, requirements missed, and by how much.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
struct Score(usize, usize, f64);

impl Score {
    fn met(self) -> bool {
        self.0 == 0 && self.1 == 0
    }
}

/// Finds the compensator and finishes the proposal.
pub(super) fn close(mut draft: Draft, brief: &Brief) -> Result<Proposal, Vec<Finding>> {
    let mut best = attempt(&draft)?;
    for _ in 0..GROWTHS {
        let growth = growth(&best).filter(|_| brief.parts == Parts::Proposed && !best.score.met());
        let Some(factor) = growth else { break };
        let mut grown = draft.clone();
        let capacitance = rounded_up(draft.get("stage.bank.1.capacitance") * factor * GROWTH_RESERVE);
        let reason =
            "load step: grown until the deviation at the worst of the nine conditions is within what is allowed";
        grown.assume("stage.bank.1.capacitance", capacitance, reason, false);
        let larger = attempt(&grown)?;
        if larger.score.partial_cmp(&best.score).is_none_or(Ordering::is_ge) {
            break;
        }
        (draft, best) = (grown, larger);
    }
    Ok(finish(draft, best, brief))
}

/// The best try on a stage, with a plain ramp, and with one that follows the line where that is needed.
fn attempt(draft: &Draft) -> Result<Try, Vec<Finding>> {
    let plain = best_of(&draft.design)?;
    if plain.score.met() {
        return Ok(plain);
    }
    let mut fed = draft.design.clone();
    let fed =
        fed.set_from_text("control.feedforward", "line").map_err(|problem| vec![problem]).and_then(|()| best_of(&fed));
    Ok(match fed {
        Ok(fed) if fed.score < plain.score => fed,
        _ => plain,
    })
}

fn best_of(start: &Design) -> Result<Try, Vec<Finding>> {
    let checked = start.check()?;
    let shared = Shared::new(&checked).map_err(|finding| vec![finding])?;
    let condition = StageCondition {
        input_voltage: checked.stage.input_voltages[1],
        load_current: checked.stage.load_currents[1],
        output_voltage: checked.stage.output_voltage,
    };
    let model = LoopModel::new(&checked.stage, &shared, &condition).map_err(|finding| vec![finding])?;
    let (aim_hz, _) = aim(&checked);
    let mut best: Option<Try> = None;
    let mut refused = Finding::problem("compensator", "No compensator could be placed.");
    for (factor, margin_deg) in CROSSOVERS.iter().flat_map(|factor| MARGINS.map(|margin| (factor, margin))) {
        let crossover_hz = aim_hz * factor;
        match placed(start, &checked, &model, (crossover_hz, margin_deg)) {
            Ok(one) if best.as_ref().is_none_or(|known| one.score < known.score) => best = Some(one),
            Ok(_) => {}
            Err(finding) => refused = *finding,
        }
        if best.as_ref().is_some_and(|one| one.score.met()) {
            break;
        }
    }
    best.ok_or_else(|| vec![refused])
}

/// The compensator placed for a crossover [Hz] and a phase margin [°], and what comes of it.
fn placed(start: &Design, checked: &CheckedDesign, model: &LoopModel, goal: (f64, f64)) -> Result<Try, Box<Finding>> {
    let (crossover_hz, margin_deg) = goal;
    let goal = KFactorGoal {
        crossover_hz,
        phase_margin_deg: margin_deg,
        plant_gain_db: model.plant.gain_db(crossover_hz),
        plant_phase_deg: model.plant.phase_deg(crossover_hz),
    };
    let locks: BTreeSet<String> = [Part::Upper, Part::Lower].map(|part| part.path().to_owned()).into();
    let placement = checked.compensator.by_k_factor(&goal, &locks)?;
    let rounded = placement.compensator.rounded(Series::E96, Series::E12, &locks);
    let mut design = start.clone();
    rounded.write(&mut design.values);
    let first = |problems: Vec<Finding>| {
        Box::new(problems.into_iter().next().unwrap_or_else(|| Finding::problem("compensator", "No parts were found.")))
    };
    let analysis = analyse(&design.check().map_err(first)?, &request());
    let score = score(&analysis);
    Ok(Try { design, crossover_hz, margin_deg, analysis, score })
}

/// Verdicts need no curves.
fn request() -> Request {
    Request {
        shown: Shown::Levels(Level::Nominal, Level::Nominal),
        frequencies_hz: Vec::new(),
        band_frequencies_hz: Vec::new(),
        step_points: 0,
    }
}

fn score(analysis: &Analysis) -> Score {
    let unstable = analysis
        .conditions
        .iter()
        .filter(|condition| !condition.outcome.as_ref().is_ok_and(|summary| summary.loop_gain.stable()))
        .count();
    let missed: Vec<_> = analysis.requirements.iter().filter(|verdict| !verdict.met).collect();
    Score(unstable, missed.len(), missed.iter().map(|verdict| lack(verdict)).sum())
}

/// By what share of its limit a requirement is missed.
fn lack(verdict: &RequirementVerdict) -> f64 {
    verdict.value.map_or(1.0, |value| match verdict.kind {
        LimitKind::AtLeast => (verdict.limit - value) / verdict.limit,
        LimitKind::AtMost => (value - verdict.limit) / verdict.limit,
    })
}

/// By how much the bank has to grow for a deviation that is missed; none where it is not missed or growing cannot help.
fn growth(best: &Try) -> Option<f64> {
    let missed = |verdict: &&RequirementVerdict| !verdict.met && verdict.readout == "load-step-deviation";
    let verdict = best.analysis.requirements.iter().find(missed)?;
    Some(verdict.value.map_or(2.0, |value| (value / verdict.limit).min(3.0)))
}

/// Takes the best try: its parts join the assumptions, the design gets its title and notes.
fn finish(mut draft: Draft, best: Try, brief: &Brief) -> Proposal {
    draft.design = best.design;
    if draft.design.choices.is("control.feedforward", "line") {
        let reason = "without it the crossover moves too far over the input range";
        draft.choose("control.feedforward", "line", reason, true);
    }
    draft.assumptions.push(Assumption {
        name: "Crossover".to_owned(),
        value: text(best.crossover_hz, Unit::Hertz),
        reason: format!("tried from {}, the first that meets what is asked", aim_text(&draft)),
        common_practice: true,
        path: "",
    });
    compensator(&mut draft, best.margin_deg);
    let topology = crate::converter::find(&brief.topology).map_or("", |topology| topology.name);
    let volts = |path: &str| full(brief.get(path), Unit::Volt);
    draft.design.title = format!(
        "{topology}, {} to {} in, {} out",
        volts("stage.input.least"),
        volts("stage.input.greatest"),
        volts("stage.output.voltage")
    );
    draft.sort();
    draft.design.notes = draft.notes();
    Proposal {
        shortfalls: shortfalls(&best.analysis),
        requirements: best.analysis.requirements,
        design: draft.design,
        assumptions: draft.assumptions,
    }
}

fn aim_text(draft: &Draft) -> String {
    draft
        .checked()
        .map(|checked| aim(&checked))
        .map_or_else(|_| String::new(), |(aim_hz, why)| format!("{}, {why}", text(aim_hz, Unit::Hertz)))
}

/// The parts of the compensator as assumptions.
fn compensator(draft: &mut Draft, margin_deg: f64) {
    let Ok(compensator) = draft.design.compensator() else { return };
    let at = text(margin_deg, Unit::Degree);
    for part in compensator.fitted().into_iter().filter(|part| !matches!(part, Part::Upper | Part::Lower)) {
        let Some(entry) = design::entry(part.path()) else { continue };
        let series = if part.is_resistor() { "E96" } else { "E12" };
        let reason = format!("K factor for a phase margin of {at} at the nominal condition; {series}");
        draft.assume(entry.path, compensator.parts.get(part), reason, false);
    }
}

/// What the proposed design does not meet, and why, in sentences.
fn shortfalls(analysis: &Analysis) -> Vec<String> {
    let mut told: Vec<String> = Vec::new();
    for condition in &analysis.conditions {
        match &condition.outcome {
            Err(finding) => told.push(format!("No result at {}: {}", condition.condition.label, finding.message)),
            Ok(summary) if !summary.loop_gain.stable() => {
                told.push(format!("The loop is not stable at {}.", condition.condition.label));
            }
            Ok(_) => {}
        }
    }
    for verdict in analysis.requirements.iter().filter(|verdict| !verdict.met) {
        let way = if verdict.kind == LimitKind::AtLeast { "at least" } else { "at most" };
        let found = match verdict.value {
            Some(value) => text(value, verdict.unit),
            None => verdict.reason.clone(),
        };
        let why = if analysis.window.empty.is_empty() {
            String::new()
        } else {
            format!(" The crossover window is {}.", analysis.window.empty)
        };
        told.push(format!(
            "{}: {found} at {}, asked {way} {}.{why}",
            verdict.name,
            verdict.condition,
            text(verdict.limit, verdict.unit)
        ));
    }
    told
}
