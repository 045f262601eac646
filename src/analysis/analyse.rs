//! The analysis itself: nine conditions at every edit, one of them in full.

use super::condition::index_of;
use super::control_figures::control_figures;
use super::crossover_window::window;
use super::curves::curves;
use super::digital::{digital_detail, highest_hz};
use super::filter_readouts::filter_readouts;
use super::filter_remarks::DAMPED_BELOW;
use super::filter_result::{InputFilterDetail, InputFilterResult};
use super::impedance::Interface;
use super::isolated::{IsolatedFigures, isolated_figures};
use super::isolated_readouts::isolated_readouts;
use super::ledger::ledger;
use super::loop_model::{LoopModel, Shared, model_finding};
use super::motion::Motion;
use super::readouts::readouts;
use super::remarks::remarks;
use super::requirement::verdict;
use super::result::{
    Analysis, Condition, ConditionResult, ConditionSummary, ControlFigures, Detail, Level, LoopResult, Steps,
};
use super::steps::{load_figures, steps};
use crate::converter::{Conduction, DutyLimit, StageCondition};
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::linear::{FrequencyResponse, Verdict, margins};
use crate::quantity::{Unit, print_digits};
use std::sync::atomic::{AtomicUsize, Ordering};

/// Which condition is shown in full.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Shown {
    /// One of the nine.
    Levels(Level, Level),
    /// A what-if: input voltage [V] and load current [A], positive.
    At {
        /// Input voltage [V].
        input_voltage: f64,
        /// Load current at the regulated output [A].
        load_current: f64,
    },
}

/// What an analysis is asked for.
#[derive(Clone, Debug, PartialEq)]
pub struct Request {
    /// The condition shown in full.
    pub shown: Shown,
    /// Frequencies of its curves [Hz], rising.
    pub frequencies_hz: Vec<f64>,
    /// Frequencies of the bands over the nine conditions [Hz], rising; may be empty.
    pub band_frequencies_hz: Vec<f64>,
    /// Points of its step curves.
    pub step_points: usize,
}

impl Request {
    /// A request over the usual span of a stage: from a hundred-thousandth of the switching frequency to it.
    pub fn spanning(shown: Shown, switching_frequency: f64, points: usize) -> Self {
        let grid = |n: usize| logarithmic(switching_frequency * 1e-5, switching_frequency, n);
        Request {
            shown,
            frequencies_hz: grid(points),
            band_frequencies_hz: grid(points.div_ceil(4)),
            step_points: points,
        }
    }
}

impl Request {
    /// The same without frequencies above a limit [Hz].
    fn up_to(&self, highest_hz: f64) -> Self {
        let within = |list: &[f64]| list.iter().copied().filter(|f| *f <= highest_hz).collect();
        Request {
            frequencies_hz: within(&self.frequencies_hz),
            band_frequencies_hz: within(&self.band_frequencies_hz),
            ..self.clone()
        }
    }
}

/// Frequencies evenly spaced on a logarithmic axis, both ends included [Hz].
pub fn logarithmic(from_hz: f64, to_hz: f64, points: usize) -> Vec<f64> {
    let last = points.saturating_sub(1).max(1) as f64;
    let ratio = (to_hz / from_hz).ln();
    (0..points).map(|k| from_hz * (ratio * k as f64 / last).exp()).collect()
}

/// Margins are searched from this share of the switching frequency …
pub(in crate::analysis) const SEARCH_FROM: f64 = 1e-6;
/// … to this one.
pub(super) const SEARCH_TO: f64 = 0.5;

/// A gain that is none [dB]: zeros at half the sampling frequency leave nothing there.
pub(super) const NO_GAIN_DB: f64 = -200.0;

/// Analyses a checked design.
pub fn analyse(design: &CheckedDesign, request: &Request) -> Analysis {
    let request = &request.up_to(highest_hz(design));
    let shared = Shared::new(design);
    let (condition, place) = match request.shown {
        Shown::Levels(input, load) => (Condition::at_levels(&design.stage, input, load), Some(index_of(input, load))),
        Shown::At { input_voltage, load_current } => (Condition::what_if(input_voltage, load_current), None),
    };
    let band = &request.band_frequencies_hz;
    let (shown, conditions) = match &shared {
        Ok(shared) => Crew { design, shared, band }.work_off(&condition, place, request),
        Err(finding) => {
            let failed = |condition| ConditionResult { condition, outcome: Err(finding.clone()) };
            (Err(finding.clone()), Condition::nine(&design.stage).into_iter().map(failed).collect())
        }
    };
    conclude(design, shared.ok().as_ref(), condition, shown, conditions, band)
}

/// Two threads that share the nine conditions: one starts with the condition shown in full, and both take what is left.
struct Crew<'a> {
    design: &'a CheckedDesign,
    shared: &'a Shared,
    band: &'a [f64],
}

impl Crew<'_> {
    fn outcome(&self, condition: &Condition) -> Result<ConditionSummary, Finding> {
        work(self.design, self.shared, condition).map(|w| w.summary(self.band))
    }

    fn work_off(
        &self,
        shown: &Condition,
        place: Option<usize>,
        request: &Request,
    ) -> (Result<Box<Detail>, Finding>, Vec<ConditionResult>) {
        let nine = Condition::nine(&self.design.stage);
        let next = AtomicUsize::new(0);
        let take_rest = || {
            let mut done = Vec::with_capacity(nine.len());
            while let Some((k, condition)) = {
                let k = next.fetch_add(1, Ordering::Relaxed);
                nine.get(k).map(|condition| (k, condition))
            } {
                if Some(k) != place {
                    done.push((k, self.outcome(condition)));
                }
            }
            done
        };
        let (detail, done) = std::thread::scope(|scope| {
            // Where no thread is to be had, this one does all the work.
            let helper = std::thread::Builder::new().spawn_scoped(scope, take_rest);
            let worked = work(self.design, self.shared, shown);
            let detail = worked
                .as_ref()
                .map_err(Clone::clone)
                .and_then(|w| detailed(self.design, self.shared, shown, w, request).map(Box::new));
            let mut done = take_rest();
            done.extend(place.map(|k| (k, worked.map(|w| w.summary(self.band)))));
            done.extend(helper.ok().and_then(|helper| helper.join().ok()).unwrap_or_default());
            (detail, done)
        });
        let mut outcomes: Vec<Option<_>> = nine.iter().map(|_| None).collect();
        for (k, outcome) in done {
            outcomes[k] = Some(outcome);
        }
        // What a lost thread left undone is worked off here.
        let conditions = nine.into_iter().zip(outcomes).map(|(condition, outcome)| ConditionResult {
            outcome: outcome.unwrap_or_else(|| self.outcome(&condition)),
            condition,
        });
        (detail, conditions.collect())
    }
}

/// Requirements, read-outs and remarks over finished conditions.
fn conclude(
    design: &CheckedDesign,
    shared: Option<&Shared>,
    condition: Condition,
    shown: Result<Box<Detail>, Finding>,
    conditions: Vec<ConditionResult>,
    band: &[f64],
) -> Analysis {
    let requirements: Vec<_> = design.requirements.iter().map(|limit| verdict(limit, &conditions)).collect();
    let detail = shown.as_deref().ok();
    let window = shared.map(|s| window(design, s, &conditions)).unwrap_or_default();
    let findings = match shared {
        Some(shared) => remarks(design, shared, detail, &conditions, &requirements, &window),
        None => shown.as_ref().err().into_iter().cloned().collect(),
    };
    Analysis {
        readouts: [
            readouts(detail, &conditions, &requirements, design.events.settling_band),
            filter_readouts(detail, &conditions),
            isolated_readouts(detail, &conditions),
        ]
        .concat(),
        shown,
        condition,
        conditions,
        band_frequencies_hz: band.to_vec(),
        requirements,
        window,
        findings,
    }
}

/// A condition worked out, its model kept.
struct Worked {
    model: LoopModel,
    /// Modes of the closed loop, when it is stable.
    modes: Option<Motion>,
    loop_gain: LoopResult,
    control: ControlFigures,
    load_step: Option<super::result::StepFigures>,
    right_half_plane_zero_hz: Option<f64>,
    /// The input filter's interface with what was found there.
    input_filter: Option<(Interface, InputFilterResult)>,
    isolated: Option<IsolatedFigures>,
}

impl Worked {
    fn summary(self, band: &[f64]) -> ConditionSummary {
        let (mut loop_db, mut loop_deg) = (vec![0.0; band.len()], vec![0.0; band.len()]);
        self.model.loop_gain.curve(band, &mut loop_db, &mut loop_deg);
        ConditionSummary {
            operating_point: self.model.averaged.operating_point,
            loop_gain: self.loop_gain,
            control: self.control,
            load_step: self.load_step,
            input_filter: self.input_filter.map(|(_, result)| result),
            isolated: self.isolated,
            right_half_plane_zero_hz: self.right_half_plane_zero_hz,
            loop_db,
            loop_deg,
        }
    }
}

fn work(design: &CheckedDesign, shared: &Shared, condition: &Condition) -> Result<Worked, Finding> {
    let (model, loop_gain, modes) = loop_at(design, shared, condition)?;
    let (stage_condition, fs) = (condition.of_stage(&design.stage), design.stage.switching_frequency);
    let load_step =
        modes.as_ref().map(|modes| load_figures(design, modes)).transpose().map_err(|e| model_finding(&e))?;
    let control = control_figures(&model, fs * SEARCH_FROM, fs * SEARCH_TO).map_err(|e| model_finding(&e))?;
    let right_half_plane_zero_hz = model.right_half_plane_zero_hz(&design.stage).map_err(|e| model_finding(&e))?;
    let input_filter = filter_interface(design, shared, &stage_condition, &model, &loop_gain)?;
    let isolated = isolated_figures(design, shared, &model, &stage_condition, (fs * SEARCH_FROM, fs * SEARCH_TO))
        .map_err(|e| model_finding(&e))?;
    Ok(Worked { model, modes, loop_gain, control, load_step, right_half_plane_zero_hz, input_filter, isolated })
}

/// Model, margins and verdict at a condition; and for a stable loop its modes.
///
/// # Errors
/// A finding when the condition cannot be held or its model cannot be solved.
pub(in crate::analysis) fn loop_at(
    design: &CheckedDesign,
    shared: &Shared,
    condition: &Condition,
) -> Result<(LoopModel, LoopResult, Option<Motion>), Finding> {
    let stage_condition = condition.of_stage(&design.stage);
    let model = LoopModel::new(&design.stage, shared, &stage_condition)?;
    refuse_out_of_limits(design, &model, &stage_condition)?;
    let fs = design.stage.switching_frequency;
    let mut margins = margins(&model.loop_gain, fs * SEARCH_FROM, fs * SEARCH_TO);
    // Far above the band the loop gain dies out and |1 + T| tends to one, so its least value is no more than that.
    margins.modulus_margin = margins.modulus_margin.min(1.0);
    margins.sensitivity_peak = margins.sensitivity_peak.max(1.0);
    let judged = model.verdict(shared, &margins).map_err(|e| model_finding(&e))?;
    let loop_gain = LoopResult {
        verdict: judged.verdict,
        sampled: judged.sampled,
        margins,
        gain_at_half_switching_db: model.loop_gain.gain_db(fs / 2.0).max(NO_GAIN_DB),
        // What is sampled once a period sees ripple as a constant.
        gain_at_switching: if shared.digital.is_some() {
            0.0
        } else {
            model.loop_gain.at_hz(design.stage.ripple_frequency()).norm()
        },
    };
    Ok((model, loop_gain, judged.motion))
}

/// The input filter against the converter, where one is fitted.
fn filter_interface(
    design: &CheckedDesign,
    shared: &Shared,
    condition: &StageCondition,
    model: &LoopModel,
    loop_gain: &LoopResult,
) -> Result<Option<(Interface, InputFilterResult)>, Finding> {
    let current = model.averaged.operating_point.input_current;
    let Some(interface) = Interface::new(&design.stage, shared, condition, current)? else { return Ok(None) };
    let unstable = matches!(loop_gain.verdict, Verdict::Unstable { .. });
    let result = interface.study(&design.stage, model, unstable).map_err(|e| model_finding(&e))?;
    Ok(result.map(|result| (interface, result)))
}

/// Conditions that cannot be held: a duty ratio beyond the modulator's limits.
fn refuse_out_of_limits(design: &CheckedDesign, model: &LoopModel, condition: &StageCondition) -> Result<(), Finding> {
    let duty = model.averaged.operating_point.duty;
    let (least, greatest) = (design.law.duty_least, design.law.duty_greatest);
    if let Some(limit) = design.stage.duty_limit.filter(|limit| duty > limit.greatest) {
        return Err(beyond_the_circuit(duty, &limit));
    }
    if (least..=greatest).contains(&duty) {
        return Ok(());
    }
    let needed = print_digits(duty, Unit::One, 3);
    // A limit that a proposal or a file computed is not told to its last digit.
    let given = [least, greatest].map(|limit| print_digits(limit, Unit::One, 3)).join(" to ");
    let reason = format!("a duty ratio of {needed} is needed, and the modulator gives {given}");
    if let Some(between) = design.stage.between_regions(condition, &reason) {
        return Err(between);
    }
    let message = format!("A duty ratio of {needed} is needed, and the modulator gives {given}.");
    let resting = model.averaged.operating_point.conduction == Conduction::Discontinuous;
    Err(if duty > greatest {
        Finding::problem("control.duty.greatest", message).with_hint("widen the duty limits or the input range")
    } else if resting {
        Finding::problem("control.duty.least", message)
            .with_hint("widen the duty limits, or raise the least load: below it the modulator skips pulses")
    } else {
        Finding::problem("control.duty.least", message).with_hint("widen the duty limits or the input range")
    })
}

/// A duty ratio that the circuit does not bear.
fn beyond_the_circuit(duty: f64, limit: &DutyLimit) -> Finding {
    let message = format!(
        "A duty ratio of {} is needed, and the circuit bears {}: {}.",
        print_digits(duty, Unit::One, 3),
        print_digits(limit.greatest, Unit::One, 3),
        limit.why
    );
    Finding::problem(limit.place, message)
        .with_hint("raise the turns ratio Ns/Np or the least input, or change what sets the limit")
}

fn detailed(
    design: &CheckedDesign,
    shared: &Shared,
    condition: &Condition,
    worked: &Worked,
    request: &Request,
) -> Result<Detail, Finding> {
    let model = &worked.model;
    let stage_condition = condition.of_stage(&design.stage);
    let plain = worked.input_filter.as_ref().map_or(model, |(interface, _)| &interface.without);
    let conduction = model.averaged.operating_point.conduction;
    let landmarks = design.stage.landmarks(&stage_condition, conduction, plain.plant.zpk());
    let landmarks = shared.law.landmarks(landmarks, plain.plant.zpk(), &plain.controlled);
    let input_filter =
        worked.input_filter.as_ref().zip(design.stage.input_filter).map(|((interface, result), filter)| {
            InputFilterDetail {
                result: *result,
                curves: interface.curves(&request.frequencies_hz),
                damping: filter.damping_for(result.least_input_impedance_ohm * DAMPED_BELOW),
            }
        });
    let scale = design.compensator.dc_output_voltage() / design.compensator.reference;
    let reference = shared.reference(scale).map_err(|e| model_finding(&e))?;
    let curves = curves(model, shared, &reference, &request.frequencies_hz, scale).map_err(|e| model_finding(&e))?;
    let digital = digital_detail(design, shared, model, condition).map_err(|e| model_finding(&e))?;
    let crossover = worked.loop_gain.margins.headline_crossover();
    let ledger = crossover.map(|c| ledger(model, shared, &design.compensator, &landmarks, c.frequency_hz));
    let operating_point = model.averaged.operating_point.clone();
    let at_rest = (operating_point.load_voltage, worked.control.control_voltage);
    let crossover_hz = crossover.map(|c| c.frequency_hz);
    let steps = match &worked.modes {
        Some(modes) => steps(design, modes, crossover_hz, at_rest, request.step_points),
        None => Ok(Steps::default()),
    };
    Ok(Detail {
        condition: condition.clone(),
        boundary_load: design.stage.boundary_load(&stage_condition),
        right_half_plane_zero_hz: worked.right_half_plane_zero_hz,
        operating_point,
        landmarks,
        loop_gain: worked.loop_gain.clone(),
        curves,
        digital,
        input_filter,
        steps: steps.map_err(|e| model_finding(&e))?,
        ledger,
        control: worked.control.clone(),
        isolated: worked.isolated.clone(),
        ramp: shared.law.current().map(|(_, sense)| sense.ramp()),
    })
}

impl Detail {
    /// Lowest right-half-plane zero over the headline crossover.
    pub fn right_half_plane_ratio(&self) -> Option<f64> {
        let crossover = self.loop_gain.margins.headline_crossover()?;
        Some(self.right_half_plane_zero_hz? / crossover.frequency_hz)
    }
}
