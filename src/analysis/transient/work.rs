//! The transient of a design: starts it where it runs steadily, or rests, and follows it through the event.

use super::super::analyse::loop_at;
use super::super::loop_model::{LoopModel, Shared};
use super::super::motion::Motion;
use super::super::result::{Condition, LoopResult, Step};
use super::super::steps::steps;
use super::event::{TransientEvent, TransientRequest};
use super::figures::{Asked, figures};
use super::model::Model;
use super::result::Transient;
use super::scenario::{Span, overload, scenario, span};
use crate::converter::{LoadKind, OperatingPoint};
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::quantity::{Unit, print, print_digits};
use crate::switched::{
    Cancel, Configuration, Goal, Orbit, POWER_FALLS, Progress, Run, SINK_FALLS, Scenario, Start, Stopped, Waveforms,
    simulate,
};
use nalgebra::DVector;

/// Points of the small-signal prediction.
const PREDICTED: usize = 1000;

/// Follows a design's switched closed loop through an event. `stream` is shown what there is so far some thirty times on the way.
///
/// # Errors
/// A finding where the condition has no operating point, or a model cannot be solved.
pub fn transient(
    design: &CheckedDesign,
    condition: &Condition,
    request: &TransientRequest,
    cancel: &Cancel,
    progress: &Progress,
    stream: &mut dyn FnMut(&Waveforms),
) -> Result<Transient, Finding> {
    let followed = follow(design, condition, request, &[], (cancel, progress, stream))?;
    let Followed { model, span, prediction, from_s, run } = followed;
    let (overload_end, _) = overload(design, condition.load_current);
    let asked = Asked {
        event: request.event,
        from_s,
        period_s: model.system.period_s,
        band_v: design.events.settling_band * design.stage.output_voltage,
        at_first_v: design.events.prebias_v,
        over_s: if request.event == TransientEvent::Overload { overload_end } else { 0.0 },
    };
    let figures = figures(&model, &run, &asked);
    Ok(Transient {
        condition: condition.clone(),
        event: request.event,
        notices: notices(design, request, span, &run),
        waveforms: run.waveforms,
        figures,
        prediction,
        cancelled: run.cancelled,
    })
}

/// The values of the signals at given times from the event's begin [s], rising, each by its name: for whoever compares or plots points
/// of his own.
///
/// # Errors
/// As [`transient`].
pub fn transient_at(
    design: &CheckedDesign,
    condition: &Condition,
    event: TransientEvent,
    times_s: &[f64],
) -> Result<Vec<(String, Vec<f64>)>, Finding> {
    let request = TransientRequest { event, columns: 1, span_s: times_s.last().copied() };
    let (cancel, progress) = (Cancel::new(), Progress::new());
    let Followed { run, .. } = follow(design, condition, &request, times_s, (&cancel, &progress, &mut |_| {}))?;
    let named = run.waveforms.traces.iter().enumerate();
    let values = |place: usize| run.kept.iter().filter_map(|row| row.get(place).copied()).collect();
    Ok(named.map(|(place, trace)| (trace.name.clone(), values(place))).collect())
}

/// A run with what it was made from.
struct Followed {
    model: Model,
    span: Span,
    prediction: Option<Step>,
    from_s: f64,
    run: Run,
}

/// Who watches a run: may stop it, sees how far it is, and what there is so far.
type Watching<'a> = (&'a Cancel, &'a Progress, &'a mut dyn FnMut(&Waveforms));

fn follow(
    design: &CheckedDesign,
    condition: &Condition,
    request: &TransientRequest,
    times_s: &[f64],
    (cancel, progress, stream): Watching<'_>,
) -> Result<Followed, Finding> {
    let shared = Shared::new(design)?;
    let model = Model::new(design, &shared, condition)?;
    let averaged = loop_at(design, &shared, condition)?;
    let (prediction, step_s) = prediction(design, &averaged, request);
    let span = span(design, request, step_s);
    let at = (condition.input_voltage, condition.load_current);
    let start = match request.event {
        TransientEvent::StartUp => model.system.at_rest(&model.at_rest(design.events.prebias_v)),
        _ => steady(&model, &averaged.0.averaged.operating_point)
            .filter(|start| holds(design, &model, request, at, start))
            .unwrap_or_else(|| approached(design, &model, request, at, cancel)),
    };
    let scenario = Scenario { times_s: times_s.to_vec(), ..scenario(design, &model, request, at, span, start) };
    let run = simulate(&model.system, &scenario, cancel, progress, stream);
    let from_s = scenario.from_s;
    Ok(Followed { model, span, prediction, from_s, run })
}

/// The small-signal prediction of the same step, and how long such a plot runs [s].
fn prediction(
    design: &CheckedDesign,
    (model, result, modes): &(LoopModel, LoopResult, Option<Motion>),
    request: &TransientRequest,
) -> (Option<Step>, Option<f64>) {
    let Some(modes) = modes else { return (None, None) };
    let at_rest = (model.averaged.operating_point.load_voltage, model.controlled.control_voltage);
    let crossover = result.margins.headline_crossover().map(|c| c.frequency_hz);
    let Ok(all) = steps(design, modes, crossover, at_rest, PREDICTED) else { return (None, None) };
    let length = |step: &Option<Step>| step.as_ref().and_then(|step| step.times_s.last().copied());
    let longest = [&all.load, &all.line, &all.reference].into_iter().filter_map(length).fold(0.0, f64::max);
    let predicted = match request.event {
        TransientEvent::LoadStep => &all.load,
        TransientEvent::LineStep => &all.line,
        TransientEvent::ReferenceStep => &all.reference,
        TransientEvent::StartUp | TransientEvent::Overload => &None,
    };
    let own = length(predicted).or(length(&all.load));
    (predicted.clone(), own.or((longest > 0.0).then_some(longest)))
}

/// What is to be known about a result.
fn notices(design: &CheckedDesign, request: &TransientRequest, span: Span, run: &Run) -> Vec<Finding> {
    let mut notices = Vec::new();
    let percent = |share: f64| print_digits(share, Unit::Fraction, 2);
    match &run.stopped {
        Some(Stopped::Unsolvable) => notices.push(
            Finding::problem("", "The run stopped: its numbers left their range.")
                .with_hint("values many decades apart, or a loop that grows without limit"),
        ),
        Some(Stopped::Chattering { at_s }) => notices.push(
            Finding::problem(
                "",
                format!("The run stopped at {}: limits change sides without end there.", print(*at_s, Unit::Second)),
            )
            .with_hint("a limit acts on another that acts on it"),
        ),
        None => {}
    }
    if span.cut {
        notices.push(Finding::notice("", format!("The run was cut at {}.", print(span.to_s, Unit::Second))));
    }
    let load = match design.stage.load {
        LoadKind::Power => Some(format!(
            "The constant-power load is taken by its tangent over each 32nd of a period, and as a resistor below {} of its voltage.",
            percent(POWER_FALLS)
        )),
        LoadKind::Current => Some(format!(
            "The constant-current load falls in proportion to the voltage below {} of it.",
            percent(SINK_FALLS)
        )),
        LoadKind::Resistor => None,
    };
    notices.extend(load.map(|text| Finding::note("stage.load", text)));
    if design.stage.bank.iter().any(|branch| branch.esl > 0.0) {
        notices.push(Finding::note(
            "stage.bank",
            "The bank's series inductance is left out: an edge into it would be an impulse.",
        ));
    }
    if request.event == TransientEvent::StartUp && design.law.current_limit.is_none() {
        notices.push(
            Finding::note(
                "control.current-limit",
                "No current limit is entered: at start-up the control voltage alone limits the current.",
            )
            .with_hint("enter the sensed current at which the pulse ends"),
        );
    }
    notices
}

/// Stretches of so many periods are run to come to a steady state where no orbit is found, and so many of them at most.
const STRETCH: usize = 400;
const STRETCHES: usize = 50;
/// A state has come to rest when a period changes it by less than this share of the greatest of its kind.
const AT_REST: f64 = 1e-10;

/// State and configuration at a clock of the steady period; none where none is found.
fn steady(model: &Model, point: &OperatingPoint) -> Option<(DVector<f64>, Configuration)> {
    let orbit = Orbit::find(&model.system, Start::of(point), Goal::AsDriven).ok()?;
    Some((orbit.starts.first()?.clone(), orbit.phases.last()?.configuration))
}

/// Whether no limit acts in the steady period.
fn holds(
    design: &CheckedDesign,
    model: &Model,
    request: &TransientRequest,
    at: (f64, f64),
    start: &(DVector<f64>, Configuration),
) -> bool {
    let still = TransientRequest { columns: 1, ..*request };
    let span = Span { to_s: 0.0, ahead_s: 2.0 * model.system.period_s, cut: false };
    let scenario = scenario(design, model, &still, at, span, start.clone());
    simulate(&model.system, &scenario, &Cancel::new(), &Progress::new(), &mut |_| {}).limited.is_empty()
}

/// State and configuration at a clock that the converter comes to by itself: where a limit keeps it from the steady period, or where
/// that does not hold itself.
fn approached(
    design: &CheckedDesign,
    model: &Model,
    request: &TransientRequest,
    at: (f64, f64),
    cancel: &Cancel,
) -> (DVector<f64>, Configuration) {
    let period = model.system.period_s;
    let mut start = model.system.at_rest(&model.at_rest(model.load_voltage));
    let still = TransientRequest { columns: 1, ..*request };
    let follow = |start, periods: usize| {
        let span = Span { to_s: 0.0, ahead_s: periods as f64 * period, cut: false };
        let scenario = scenario(design, model, &still, at, span, start);
        simulate(&model.system, &scenario, cancel, &Progress::new(), &mut |_| {}).end
    };
    for _ in 0..STRETCHES {
        start = follow(start, STRETCH);
        let (next, configuration) = follow(start.clone(), 1);
        let moved = (&next - &start.0).amax();
        let there = moved <= AT_REST * start.0.amax();
        start = (next, configuration);
        if there || cancel.is_cancelled() {
            break;
        }
    }
    start
}
