//! The control law: how the control voltage makes a duty ratio, at rest and for small changes.
//!
//! A law joins the averaged stage into one *controlled stage* with the inputs "control", "input voltage" and "load
//! current"; responses and steps are read off the same one.

use super::average::{AverageCurrent, InnerLoop};
use super::entries::{ENTRIES, applies, mode};
use super::modulator::Ramp;
use super::sampling::Sampling;
use super::sense::CurrentSense;
use super::statics::StaticLaw;
use crate::converter::{AveragedModel, OperatingPoint};
use crate::finding::Finding;
use crate::linear::{LinearError, StateSpace};
use crate::quantity::{Choices, Values};

/// Name of the controlled stage's first input.
pub const CONTROL: &str = "control";

/// Which end of the current's ripple the comparator decides at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Edge {
    /// The peak opens the switch.
    Peak,
    /// The valley closes it.
    Valley,
}

/// What the control voltage commands.
#[derive(Clone, Debug, PartialEq)]
pub enum Mode {
    /// The duty ratio, through a ramp.
    Voltage(Ramp),
    /// The peak or valley of the switched current.
    Current(Edge, CurrentSense),
    /// The average of the switched current, through an inner loop.
    Average(Box<AverageCurrent>),
}

/// A control law with usable values.
#[derive(Clone, Debug, PartialEq)]
pub struct ControlLaw {
    /// What the control voltage commands.
    pub mode: Mode,
    /// Smallest duty ratio.
    pub duty_least: f64,
    /// Largest duty ratio.
    pub duty_greatest: f64,
    /// Delay from comparator to switch node [s].
    pub delay_s: f64,
    /// Greatest control voltage that is let through [V].
    pub clamp: Option<f64>,
    /// Sensed current that ends the pulse in every period [A].
    pub current_limit: Option<f64>,
}

/// The stage as the control voltage drives it.
#[derive(Clone, Debug)]
pub struct Controlled {
    /// Inputs "control", "input voltage", "load current"; outputs those of the averaged stage. Open-loop unstable beyond the
    /// subharmonic boundary.
    pub stage: StateSpace,
    /// Delay of the control voltage that is not in `stage` [s].
    pub delay_s: f64,
    /// Control voltage that holds the operating point [V].
    pub control_voltage: f64,
    /// Sampling figures; peak and valley current mode in continuous conduction only.
    pub sampling: Option<Sampling>,
    /// The inner loop of average current mode.
    pub inner: Option<InnerLoop>,
}

impl ControlLaw {
    /// A law from entered values, which must have been checked against their bounds.
    ///
    /// # Errors
    /// Every problem between entries: a clamp below what no current needs, a blanking longer than the period, an inner
    /// amplifier without room.
    pub fn from_values(values: &Values, choices: &Choices) -> Result<Self, Vec<Finding>> {
        let get = |path: &str| {
            let entry = ENTRIES.iter().find(|e| e.path == path).filter(|e| applies(e.path, choices));
            entry.and_then(|e| values.get_or_default(e)).unwrap_or(0.0)
        };
        let ramp = || Ramp::read(get, values, choices.is("control.feedforward", "line"));
        let mode = match mode(choices) {
            "peak-current" => Mode::Current(Edge::Peak, CurrentSense::read(get, choices)),
            "valley-current" => Mode::Current(Edge::Valley, CurrentSense::read(get, choices)),
            "average-current" => Mode::Average(Box::new(AverageCurrent::read(get, choices, ramp()))),
            _ => Mode::Voltage(ramp()),
        };
        let clamp = values.get("control.clamp").filter(|_| applies("control.clamp", choices));
        let law = ControlLaw {
            mode,
            duty_least: get("control.duty.least"),
            duty_greatest: get("control.duty.greatest"),
            delay_s: get("control.delay"),
            clamp,
            current_limit: values.get("control.current-limit"),
        };
        let problems = law.problems(values.get("stage.switching-frequency"));
        if problems.is_empty() { Ok(law) } else { Err(problems) }
    }

    /// The same law with its compensating ramp settled in V/s by the stage's nominal condition, where it is stated otherwise.
    #[must_use]
    pub fn settled(&self, nominal: &OperatingPoint, period: f64) -> Self {
        let mut law = self.clone();
        if let Mode::Current(edge, sense) = &mut law.mode {
            let mut referred = sense.referred(nominal);
            referred.settle(*edge, nominal, period, self.delay_s);
            // A slope at the comparator is the same for either current.
            sense.slope = referred.slope;
        }
        law
    }

    /// The same law with its ramp held at the height it has at an input voltage [V]: what stands behind a filter's terminals does
    /// not see the source.
    #[must_use]
    pub fn without_feedforward(&self, input_voltage: f64) -> Self {
        let mut law = self.clone();
        match &mut law.mode {
            Mode::Voltage(ramp) => *ramp = ramp.held(input_voltage),
            Mode::Average(average) => average.ramp = average.ramp.held(input_voltage),
            Mode::Current(..) => {}
        }
        law
    }

    /// Whether the compensating ramp waits to be settled by the nominal condition.
    pub fn unsettled(&self) -> bool {
        matches!(&self.mode, Mode::Current(_, sense) if sense.unsettled())
    }

    /// The controlled stage at a condition.
    ///
    /// # Errors
    /// As the joining of systems; [`LinearError::AlgebraicLoop`] where the law leaves the duty ratio open, as valley current
    /// mode without a ramp in discontinuous conduction does.
    pub fn controlled(&self, averaged: &AveragedModel, period: f64) -> Result<Controlled, LinearError> {
        let point = &averaged.operating_point;
        let plain = |stage, control_voltage, sampling| Controlled {
            stage,
            delay_s: self.delay_s,
            control_voltage,
            sampling,
            inner: None,
        };
        match &self.mode {
            Mode::Voltage(ramp) => {
                let law = StaticLaw {
                    states: None,
                    control: ramp.duty_from_voltage(point.input_voltage),
                    inputs: [ramp.duty_from_input(point.duty, point.input_voltage), 0.0],
                };
                Ok(plain(law.close(&averaged.stage)?, ramp.voltage(point.duty, point.input_voltage), None))
            }
            Mode::Current(edge, sense) => {
                let sense = sense.referred(point);
                let stage = sense.controlled(*edge, averaged, period, self.delay_s)?;
                let volts = sense.control_voltage(*edge, point, period, self.delay_s);
                Ok(plain(stage, volts, sense.sampling(*edge, point, period, self.delay_s)))
            }
            Mode::Average(average) => average.referred(point).controlled(averaged, period, self.delay_s),
        }
    }

    /// Swing of what the comparator compares over a period at an operating point, as control voltage [V].
    pub fn swing(&self, point: &OperatingPoint, period: f64) -> f64 {
        match &self.mode {
            Mode::Voltage(ramp) => ramp.at(point.input_voltage),
            Mode::Current(edge, sense) => sense.referred(point).swing(*edge, point, period),
            Mode::Average(average) => average.ramp.at(point.input_voltage),
        }
    }

    /// Least and greatest control voltage that this law can follow at an input voltage [V]; infinite where only the
    /// amplifier limits it.
    pub fn control_limits(&self, input_voltage: f64) -> (f64, f64) {
        let (least, greatest) = match &self.mode {
            Mode::Voltage(ramp) => {
                (ramp.voltage(self.duty_least, input_voltage), ramp.voltage(self.duty_greatest, input_voltage))
            }
            _ => (f64::NEG_INFINITY, f64::INFINITY),
        };
        (least, self.clamp.map_or(greatest, |clamp| clamp.min(greatest)))
    }

    /// How long into a period the comparator decides, as a share of it, where it decides once on the value the control voltage has at the
    /// period's start; none where the control voltage acts throughout, as on the inner loop of average current mode.
    ///
    /// The delay that a value set once a period suffers there: of a uniformly sampled trailing edge D·T. Van de Sype, De Gussemé, Van den
    /// Bossche & Melkebeek, APEC 2004 (from memory); in current mode the comparator reads the held value at its own edge.
    pub fn decision_share(&self, duty: f64) -> Option<f64> {
        match self.mode {
            Mode::Voltage(_) | Mode::Current(Edge::Peak, _) => Some(duty),
            Mode::Current(Edge::Valley, _) => Some(1.0 - duty),
            Mode::Average(_) => None,
        }
    }

    /// The current sense of peak and valley current mode.
    pub fn current(&self) -> Option<(Edge, &CurrentSense)> {
        if let Mode::Current(edge, sense) = &self.mode { Some((*edge, sense)) } else { None }
    }

    /// The mode's word in files and JSON.
    pub fn word(&self) -> &'static str {
        match self.mode {
            Mode::Voltage(_) => "voltage",
            Mode::Current(Edge::Peak, _) => "peak-current",
            Mode::Current(Edge::Valley, _) => "valley-current",
            Mode::Average(_) => "average-current",
        }
    }

    /// Whether the duty ratio is set by a ramp alone.
    pub fn voltage_mode(&self) -> bool {
        matches!(self.mode, Mode::Voltage(_))
    }

    fn problems(&self, switching_frequency: Option<f64>) -> Vec<Finding> {
        match &self.mode {
            Mode::Voltage(_) => Vec::new(),
            Mode::Current(_, sense) => sense.problems(self.clamp, switching_frequency),
            Mode::Average(average) => average.problems(self.clamp),
        }
    }
}
