//! What drives the closed loop during an event.

use super::event::{MOST_PERIODS, TransientEvent, TransientRequest};
use super::model::Model;
use crate::design::CheckedDesign;
use crate::switched::{Configuration, Scenario, Signal};
use nalgebra::DVector;

/// Periods followed where nothing says how long.
const FEW: f64 = 400.0;
/// Shown ahead of the event, as a share of the span.
const AHEAD: f64 = 0.05;
/// At least so many periods are shown.
const LEAST_PERIODS: f64 = 20.0;

/// By so much of a period a span may lie beyond whole ones: rounding of what was asked.
const WHOLE: f64 = 1e-6;

/// How long an event is followed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Span {
    /// From the event's begin [s], whole periods.
    pub(super) to_s: f64,
    /// Shown ahead of it [s], whole periods; none at start-up.
    pub(super) ahead_s: f64,
    /// Whether it was cut at the most that is followed.
    pub(super) cut: bool,
}

/// The span of an event; `step_s` is what the small-signal prediction shows of a step [s].
pub(super) fn span(design: &CheckedDesign, request: &TransientRequest, step_s: Option<f64>) -> Span {
    let period = design.stage.switching_frequency.recip();
    let step = step_s.unwrap_or(FEW * period);
    let events = &design.events;
    let wanted = request.span_s.unwrap_or(match request.event {
        TransientEvent::StartUp => 1.25 * events.soft_start_s + 4.0 * step,
        // An amplifier at its limit takes its time to come back.
        TransientEvent::Overload => events.overload_s + 10.0 * step,
        _ => step,
    });
    let wanted = wanted.max(LEAST_PERIODS * period);
    let cut = wanted > MOST_PERIODS * period;
    // Whole periods: those that are run cover all that is shown, and no more.
    let to_s = (wanted / period - WHOLE).ceil().min(MOST_PERIODS) * period;
    let ahead = (AHEAD * to_s / period).ceil().max(2.0);
    let ahead = if request.event == TransientEvent::StartUp { 0.0 } else { ahead };
    Span { to_s, ahead_s: ahead * period, cut }
}

/// End of an overload [s], and its change of the load current [A].
pub(super) fn overload(design: &CheckedDesign, load_current: f64) -> (f64, f64) {
    let events = &design.events;
    let current = events.overload_a.unwrap_or(2.0 * design.stage.load_currents[2]);
    (events.overload_s, current - load_current)
}

/// The event as signals, from a state at the first clock.
pub(super) fn scenario<'a>(
    design: &CheckedDesign,
    model: &'a Model,
    request: &TransientRequest,
    (input_voltage, load_current): (f64, f64),
    span: Span,
    start: (DVector<f64>, Configuration),
) -> Scenario<'a> {
    let events = &design.events;
    let reference = design.compensator.reference;
    let mut scenario = Scenario {
        amplifiers: model.amplifiers(),
        input_voltage: Signal::constant(input_voltage),
        reference: Signal::constant(reference),
        sink: Signal::constant(0.0),
        load: model.load,
        load_voltage: model.load_voltage,
        current_limit: model.law.current_limit,
        nothing: model.nothing,
        from_s: -span.ahead_s,
        to_s: span.to_s,
        start,
        columns: request.columns,
        recorded: model.shown.clone(),
        times_s: Vec::new(),
    };
    match request.event {
        TransientEvent::StartUp => {
            scenario.reference = Signal::constant(0.0).ramp(0.0, reference, events.soft_start_s);
        }
        TransientEvent::LoadStep => {
            let step = events.load_step;
            scenario.sink = scenario.sink.ramp(0.0, step.change, step.rise_s());
        }
        TransientEvent::LineStep => {
            let step = events.line_step;
            scenario.input_voltage = scenario.input_voltage.ramp(0.0, step.change, step.rise_s());
        }
        TransientEvent::ReferenceStep => {
            let (step, share) = (events.reference_step, reference / design.compensator.dc_output_voltage());
            scenario.reference = scenario.reference.ramp(0.0, step.change * share, step.rise_s());
        }
        TransientEvent::Overload => {
            let (until, change) = overload(design, load_current);
            let rise = (change.abs() / events.load_step.slew).min(until);
            scenario.sink = scenario.sink.ramp(0.0, change, rise).ramp(until, -change, rise);
        }
    }
    scenario
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::sample;

    #[test]
    fn a_span_is_cut_at_what_is_followed_at_most() {
        let design = sample::built_in().check().expect("sound");
        let request = |span_s| TransientRequest { event: TransientEvent::LoadStep, columns: 100, span_s };
        let asked = span(&design, &request(Some(1e9)), None);
        assert!(asked.cut && (asked.to_s * design.stage.switching_frequency - MOST_PERIODS).abs() < 1e-3);
        // A period begun is followed to its end; rounding begins none.
        let period = design.stage.switching_frequency.recip();
        let periods = |asked: f64| (span(&design, &request(Some(asked * period)), None).to_s / period).round();
        let given = span(&design, &request(Some(100.5 * period)), None).to_s / period;
        assert!((given - given.round()).abs() < 1e-9, "{given}");
        assert_eq!([periods(100.5), periods(100.0), periods(100.0 + 1e-9)], [101.0, 100.0, 100.0]);
        let short = span(&design, &request(Some(1e-12)), Some(1e-3));
        assert!(!short.cut && short.to_s > 0.0 && short.ahead_s > 0.0);
        assert!((span(&design, &request(None), Some(1e-3)).to_s - 1e-3).abs() < 1e-15);
    }
}
