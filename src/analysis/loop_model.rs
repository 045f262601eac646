//! The loop at one condition: stage, control law and compensator joined.
//!
//! *Conventions*: the plant runs from control voltage to output voltage, control law and delay included; the compensator
//! from output voltage to control voltage with its inversion taken out; their product is the loop gain. The delay of the
//! control voltage is exact in every frequency response and a third-order Padé form in the closed-loop state space; inside
//! the inner loop of average current mode it is the latter in both. A loop with a difference equation is judged and followed by its exact map from
//! sample to sample (`sampled`); its curves here are those of the unfolded band, as an analyser reads them.

use super::fast_path::FastPath;
use super::motion::Motion;
use super::sampled::SharedDigital;
use crate::compensator::{FAST, joined_paths};
use crate::control::{CONTROL, ControlLaw, Controlled, Edge, Mode};
use crate::converter::signals::LOAD_VOLTAGE;
use crate::converter::{AveragedModel, Conduction, Stage, StageCondition};
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::linear::{
    Complex, FactoredResponse, LinearError, Margins, Modes, Port, StateSpace, Verdict, Wire, Zpk,
    closed_loop_verdict_knowing, pade_delay,
};
use crate::quantity::{Unit, print};
use nalgebra::DMatrix;

/// What all conditions of a design share: the compensator, solved once.
#[derive(Clone, Debug)]
pub struct Shared {
    /// From "vout", "vref" and, where it has a fast path, "fast" to "vc".
    pub compensator: StateSpace,
    /// −vc/vout, a fast path seeing the same voltage.
    pub compensator_response: FactoredResponse,
    /// The fast path of isolated feedback, where there is one.
    pub fast_path: Option<FastPath>,
    /// The control law, its compensating ramp settled.
    pub law: ControlLaw,
    /// The difference equation in place of a network: then `compensator` answers nothing.
    pub digital: Option<SharedDigital>,
    delay: Option<StateSpace>,
}

/// Order of the rational form of the delay in poles and time responses.
const DELAY_ORDER: usize = 3;

impl Shared {
    /// Solves the compensator of a design.
    ///
    /// # Errors
    /// A finding when its network has no state equations.
    pub fn new(design: &CheckedDesign) -> Result<Self, Finding> {
        let singular = |e: &dyn std::fmt::Display| {
            Finding::problem("compensator", format!("The compensator cannot be solved: {e}."))
        };
        let digital = design.compensator.digital().map(SharedDigital::new);
        let (compensator, compensator_response) = if let Some(digital) = &digital {
            (no_network().map_err(|e| singular(&e))?, digital.response())
        } else {
            let compensator = design.compensator.state_space().map_err(|e| singular(&e))?;
            let joined = joined_paths(compensator.clone()).map_err(|e| singular(&e))?;
            let response = Zpk::from_state_space(&joined, 0, 0).map_err(|e| singular(&e))?.scaled(-1.0);
            (compensator, FactoredResponse::new(response, 0.0))
        };
        let fast_path = FastPath::new(design, &compensator).map_err(|e| singular(&e))?;
        let law = settled(design)?;
        let outside = !matches!(law.mode, Mode::Average(_));
        let delay = if law.delay_s > 0.0 && outside {
            Some(pade_delay(law.delay_s, DELAY_ORDER).map_err(|e| singular(&e))?)
        } else {
            None
        };
        Ok(Shared { compensator, compensator_response, fast_path, law, digital, delay })
    }
}

impl Shared {
    /// Control voltage from reference; `scale` is the output voltage over the reference.
    ///
    /// # Errors
    /// As the reduction to zeros and poles.
    pub(super) fn reference(&self, scale: f64) -> Result<FactoredResponse, LinearError> {
        match &self.digital {
            Some(digital) => Ok(digital.scaled_response(scale)),
            None => Ok(FactoredResponse::new(Zpk::from_state_space(&self.compensator, 0, 1)?, 0.0)),
        }
    }

    /// The same with the difference equation before rounding; none without one.
    pub(super) fn before_rounding(&self) -> Option<Self> {
        let exact = self.digital.as_ref()?.before_rounding();
        Some(Shared { compensator_response: exact.response(), digital: Some(exact), ..self.clone() })
    }

    /// The same with another control law of the same delay.
    pub(super) fn with_law(&self, law: ControlLaw) -> Self {
        Shared { law, ..self.clone() }
    }
}

/// State equations in the place of a network's where a difference equation works instead.
fn no_network() -> Result<StateSpace, LinearError> {
    StateSpace::constant(DMatrix::zeros(2, 2), &["vout", "vref"], &["vc", "error"])
}

/// The control law with its compensating ramp settled by the nominal condition.
fn settled(design: &CheckedDesign) -> Result<ControlLaw, Finding> {
    if !design.law.unsettled() {
        return Ok(design.law.clone());
    }
    let stage = &design.stage;
    let nominal = StageCondition {
        input_voltage: stage.input_voltages[1],
        load_current: stage.load_currents[1],
        output_voltage: stage.output_voltage,
    };
    match stage.averaged(&nominal) {
        Ok(averaged) => Ok(design.law.settled(&averaged.operating_point, stage.switching_frequency.recip())),
        Err(why) => Err(Finding::problem(
            "control.slope",
            format!("The compensating ramp is stated at the nominal condition, which cannot be held: {}", why.message),
        )
        .with_hint("state the ramp in V/s, or mend the nominal condition")),
    }
}

/// The loop at one condition.
#[derive(Clone, Debug)]
pub struct LoopModel {
    /// The stage linearised about its operating point.
    pub averaged: AveragedModel,
    /// The stage as the control voltage drives it.
    pub controlled: Controlled,
    /// Control voltage to output voltage, delay included.
    pub plant: FactoredResponse,
    /// The loop gain.
    pub loop_gain: FactoredResponse,
    /// From the start of a period to where a value set there acts [s]; none where the control voltage acts throughout.
    pub modulator_delay_s: Option<f64>,
    /// Whether the load's voltage is another than the regulated one: a second stage stands behind the sense point.
    pub load_beyond: bool,
    /// The fast path of isolated feedback, where it sees another voltage than the regulated one: the loop gain is the sum over both
    /// paths.
    pub apart: Option<FastPath>,
}

/// What closing the loop leads to.
#[derive(Clone, Debug)]
pub struct Judged {
    /// Stability.
    pub verdict: Verdict,
    /// Margins of the loop as it is sampled, where a difference equation is at work.
    pub sampled: Option<Margins>,
    /// How the loop moves, when it is stable.
    pub motion: Option<Motion>,
}

/// A zero beyond this many switching frequencies is rounding of a path that is none.
const FARTHEST_ZERO: f64 = 1000.0;

/// Names of the closed loop's inputs.
pub const EVENTS: [&str; 4] = ["load current", "input voltage", "reference", "output disturbance"];
/// Column of the load current.
const LOAD: usize = 0;
/// Column of the output's disturbance.
const DISTURBANCE: usize = 3;

impl LoopModel {
    /// Builds the loop at a condition.
    ///
    /// # Errors
    /// A finding when the stage has no operating point there or a model is singular.
    pub fn new(stage: &Stage, shared: &Shared, condition: &StageCondition) -> Result<Self, Finding> {
        let averaged = stage.averaged(condition)?;
        let period = stage.switching_frequency.recip();
        held_open(&shared.law, &averaged)?;
        ended_blind(&shared.law, &averaged, period)?;
        let controlled = shared.law.controlled(&averaged, period).map_err(|e| model_finding(&e))?;
        let plant = Zpk::from_state_space(&controlled.stage, 0, 0).map_err(|e| model_finding(&e))?;
        let compensator = &shared.compensator_response;
        let apart = shared.fast_path.as_ref().filter(|path| path.apart).cloned();
        let loop_zpk = match &apart {
            None => plant.multiply(compensator.zpk()),
            Some(path) => path.loop_gain(&controlled.stage, &shared.compensator).map_err(|e| model_finding(&e))?,
        };
        let decided = shared.law.decision_share(averaged.operating_point.duty);
        let modulator_delay_s = shared.digital.as_ref().and(decided).map(|share| share * period);
        let delay_s = controlled.delay_s + modulator_delay_s.unwrap_or(0.0);
        let mut loop_gain = FactoredResponse::new(loop_zpk, delay_s + compensator.delay_s());
        if let Some(factors) = compensator.discrete() {
            loop_gain = loop_gain.with_discrete(factors.clone());
        }
        Ok(LoopModel {
            plant: FactoredResponse::new(plant, delay_s),
            loop_gain,
            modulator_delay_s,
            controlled,
            averaged,
            load_beyond: stage.second_stage.is_some_and(|second| !second.sensed_at_load),
            apart,
        })
    }

    /// An output of the controlled stage from one of its inputs, the loop open and without the control voltage's delay.
    ///
    /// # Errors
    /// As the reduction to zeros and poles.
    pub fn open_loop(&self, output: &str, input: &str) -> Result<Zpk, LinearError> {
        let stage = &self.controlled.stage;
        Zpk::from_state_space(stage, stage.need_output(output)?, stage.need_input(input)?)
    }

    /// What the bank's series inductance adds to the output voltage from the load current; none where the stage holds it, or there is none.
    ///
    /// # Errors
    /// As the reduction to zeros and poles.
    pub fn bank_inductance(&self) -> Result<Option<[FactoredResponse; 2]>, LinearError> {
        let Some(bank) = &self.averaged.bank_inductance else { return Ok(None) };
        let response = |s: &StateSpace| Zpk::from_state_space(s, 0, 0).map(|zpk| FactoredResponse::new(zpk, 0.0));
        Ok(Some([response(&bank.with)?, response(&bank.without)?]))
    }

    /// The lowest right-half-plane zero of the stage [Hz]. The rational form of an inner loop's delay has such zeros, too, and
    /// they are none of the stage's.
    ///
    /// # Errors
    /// As the reduction to zeros and poles.
    pub fn right_half_plane_zero_hz(&self, stage: &Stage) -> Result<Option<f64>, LinearError> {
        let lowest = if self.controlled.inner.is_none() {
            stage.right_half_plane_zero_hz(self.plant.zpk())
        } else {
            stage.right_half_plane_zero_hz(&Zpk::from_state_space(&self.averaged.stage, 0, 0)?)
        };
        Ok(lowest.filter(|zero| *zero < FARTHEST_ZERO * stage.switching_frequency))
    }

    /// The closed loop, from load current, input voltage, reference and a disturbance of the output voltage to the load's
    /// voltage and the control voltage. The bank's series inductance stands outside.
    ///
    /// # Errors
    /// As the joining of systems.
    pub fn closed(&self, shared: &Shared) -> Result<StateSpace, LinearError> {
        self.closed_with(shared, &shared.compensator)
    }

    /// The same around another compensator with the same ports.
    fn closed_with(&self, shared: &Shared, compensator: &StateSpace) -> Result<StateSpace, LinearError> {
        const STAGE: usize = 0;
        const COMPENSATOR: usize = 1;
        const TAP: usize = 2;
        let tap = StateSpace::constant(DMatrix::identity(1, 1), &["disturbance"], &["disturbance"])?;
        let mut parts = vec![&self.controlled.stage, compensator, &tap];
        let mut wires = vec![
            wire(STAGE, "output voltage", COMPENSATOR, "vout", 1.0),
            wire(TAP, "disturbance", COMPENSATOR, "vout", 1.0),
        ];
        if let Some(path) = &shared.fast_path {
            wires.push(wire(STAGE, path.signal, COMPENSATOR, FAST, 1.0));
            wires.push(wire(TAP, "disturbance", COMPENSATOR, FAST, 1.0));
        }
        if let Some(delay) = &shared.delay {
            let place = parts.len();
            let (input, output) = (delay.inputs[0].as_str(), delay.outputs[0].as_str());
            parts.push(delay);
            wires.push(wire(COMPENSATOR, "vc", place, input, 1.0));
            wires.push(wire(place, output, STAGE, CONTROL, 1.0));
        } else {
            wires.push(wire(COMPENSATOR, "vc", STAGE, CONTROL, 1.0));
        }
        let inputs = [
            Port { name: EVENTS[0], part: STAGE, port: "load current" },
            Port { name: EVENTS[1], part: STAGE, port: "input voltage" },
            Port { name: EVENTS[2], part: COMPENSATOR, port: "vref" },
            Port { name: EVENTS[3], part: TAP, port: "disturbance" },
        ];
        let outputs = [
            Port { name: "output voltage", part: STAGE, port: LOAD_VOLTAGE },
            Port { name: "output voltage", part: TAP, port: "disturbance" },
            Port { name: "control voltage", part: COMPENSATOR, port: "vc" },
        ];
        StateSpace::connect(&parts, &wires, &inputs, &outputs)
    }

    /// Stability by the poles of the closed loop, checked by the encirclement count on the exact delay; and for a stable
    /// loop how it moves.
    ///
    /// # Errors
    /// As the joining of systems.
    pub fn verdict(&self, shared: &Shared, margins: &Margins) -> Result<Judged, LinearError> {
        if let Some(digital) = &shared.digital {
            return self.sampled(digital)?.judged();
        }
        let (closed, poles, verdict) = self.judged(shared, margins)?;
        if !matches!(verdict, Verdict::Stable { .. }) {
            return Ok(Judged { verdict, sampled: None, motion: None });
        }
        let mut modes = Modes::with_poles(&closed, &poles)?;
        if let Some(bank) = &self.averaged.bank_inductance {
            modes.add_through(LOAD, DISTURBANCE, &Modes::new(&bank.with)?, 1.0)?;
            modes.add_through(LOAD, DISTURBANCE, &Modes::new(&bank.without)?, -1.0)?;
        }
        Ok(Judged { verdict, sampled: None, motion: Some(Motion::Continuous(modes)) })
    }
}

impl LoopModel {
    /// Stability alone, as [`LoopModel::verdict`] decides it.
    ///
    /// # Errors
    /// As the joining of systems.
    pub fn stability(&self, shared: &Shared, margins: &Margins) -> Result<Verdict, LinearError> {
        if let Some(digital) = &shared.digital {
            return self.sampled(digital)?.judged().map(|judged| judged.verdict);
        }
        self.judged(shared, margins).map(|judged| judged.2)
    }

    /// Stability with another compensator of the same ports, whose loop gain and margins these are.
    ///
    /// # Errors
    /// As the joining of systems.
    pub(super) fn stability_with(
        &self,
        shared: &Shared,
        compensator: &StateSpace,
        loop_gain: &FactoredResponse,
        margins: &Margins,
    ) -> Result<Verdict, LinearError> {
        let poles = self.closed_with(shared, compensator)?.poles()?;
        Ok(closed_loop_verdict_knowing(&poles, loop_gain, margins))
    }

    fn judged(&self, shared: &Shared, margins: &Margins) -> Result<(StateSpace, Vec<Complex>, Verdict), LinearError> {
        let closed = self.closed(shared)?;
        let poles = closed.poles()?;
        let verdict = closed_loop_verdict_knowing(&poles, &self.loop_gain, margins);
        Ok((closed, poles, verdict))
    }
}

pub(super) fn wire<'a>(from_part: usize, output: &'a str, to_part: usize, input: &'a str, gain: f64) -> Wire<'a> {
    Wire { from_part, output, to_part, input, gain }
}

/// Valley current mode with the current at rest and no ramp: nothing decides when the switch closes.
fn held_open(law: &ControlLaw, averaged: &AveragedModel) -> Result<(), Finding> {
    let resting = averaged.operating_point.conduction == Conduction::Discontinuous;
    match law.current() {
        Some((Edge::Valley, sense)) if resting && sense.ramp() <= 0.0 => Err(Finding::problem(
            "control.slope",
            "Valley current mode needs a compensating ramp in discontinuous conduction: the current has come to rest and nothing else closes the switch.",
        )
        .with_hint("add a ramp, raise the load or the inductance, or choose a synchronous rectifier")),
        _ => Ok(()),
    }
}

/// Peak current mode that starts from rest with an on-time within the delay: the comparator would have to act on a filtered current
/// that is not there yet.
fn ended_blind(law: &ControlLaw, averaged: &AveragedModel, period: f64) -> Result<(), Finding> {
    let point = &averaged.operating_point;
    let resting = point.conduction == Conduction::Discontinuous;
    let on_time = point.duty * period;
    match law.current() {
        Some((Edge::Peak, sense)) if resting && sense.filter_s > 0.0 && on_time <= law.delay_s => {
            let message = format!(
                "The on-time of {} is within the delay of {}: the current starts from rest and the comparator cannot end it so early; the converter skips periods.",
                print(on_time, Unit::Second),
                print(law.delay_s, Unit::Second)
            );
            Err(Finding::problem("control.delay", message)
                .with_hint("shorten the delay, lower the switching frequency, or raise the least load"))
        }
        _ => Ok(()),
    }
}

/// A linear-algebra error as a finding about the whole design.
pub(super) fn model_finding(error: &LinearError) -> Finding {
    Finding::problem("", format!("The loop's model cannot be solved at this condition: {error}."))
}
