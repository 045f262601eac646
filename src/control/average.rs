//! Average current mode: an inner loop with its own compensator makes the average current follow the control voltage.
//!
//! *Conventions*: the control voltage is the inner amplifier's reference, the sensed current its other input; the amplifier's
//! output meets the ramp. The inner loop gain is taken with the control voltage at rest, sign of the negative feedback taken
//! out, delay exact; inside the controlled stage the delay is a third-order Padé form.
//! *Source*: averaged models joined; the slope rule of the inner amplifier is common practice. *Valid* where little of the
//! current's ripple reaches the comparator.

use super::law::{CONTROL, Controlled};
use super::modulator::Ramp;
use super::sense::clamp_too_low;
use crate::compensator::{Amplifier, Anchor, Compensator, Kind, OpAmp, Parts, Transconductance};
use crate::converter::signals::{DUTY, INPUT_VOLTAGE, LOAD_CURRENT, SWITCHED_CURRENT};
use crate::converter::{AveragedModel, OperatingPoint};
use crate::finding::Finding;
use crate::linear::{
    Complex, FactoredResponse, FrequencyResponse, LinearError, Port, StateSpace, Wire, Zpk, pade_delay,
};
use crate::quantity::{Choices, Unit, print};
use nalgebra::DMatrix;

/// Order of the rational form of the delay inside the inner loop.
const DELAY_ORDER: usize = 3;
/// Resistance that stands for no lower divider resistor [Ω].
const OPEN: f64 = 1e15;
/// Resistance that stands for a straight connection [Ω].
const STRAIGHT: f64 = 1.0;

/// Average current mode with usable values.
#[derive(Clone, Debug, PartialEq)]
pub struct AverageCurrent {
    /// Sensed volts per ampere of the switch's current while it conducts, or of the switched one where it was
    /// referred to that [V/A].
    pub ohms: f64,
    /// Time constant of the sense filter [s]; 0 for none.
    pub filter_s: f64,
    /// Network and amplifier of the inner loop, the sensed current in the place of the output voltage.
    pub inner: Compensator,
    /// Ramp that the inner amplifier's output is compared with.
    pub ramp: Ramp,
}

/// The inner loop at one condition.
#[derive(Clone, Debug)]
pub struct InnerLoop {
    /// Its loop gain, delay exact.
    pub loop_gain: FactoredResponse,
    /// Output of the inner amplifier that holds the operating point [V].
    pub output_voltage: f64,
    /// Least and greatest output of the inner amplifier [V].
    pub output_limits: (f64, f64),
    /// Slope of the current's falling ripple at the inner amplifier's output over the ramp's slope. Above one the comparator
    /// meets the ramp more than once.
    pub slope_ratio: f64,
}

impl AverageCurrent {
    /// From entered values; `get` reads the control's rows.
    pub(super) fn read(get: impl Fn(&str) -> f64, choices: &Choices, ramp: Ramp) -> Self {
        let limits = (get("control.inner.output-least"), get("control.inner.output-greatest"));
        let op_amp = !choices.is("control.inner.amplifier", "transconductance");
        let amplifier = if op_amp {
            Amplifier::OpAmp(OpAmp {
                dc_gain: get("control.inner.op-amp.dc-gain"),
                gain_bandwidth_hz: get("control.inner.op-amp.gain-bandwidth"),
                output_least: limits.0,
                output_greatest: limits.1,
            })
        } else {
            Amplifier::Transconductance(Transconductance {
                gm: get("control.inner.transconductance.gm"),
                output_resistance: get("control.inner.transconductance.output-resistance"),
                // The linear model does not ask.
                output_current: f64::INFINITY,
                output_least: limits.0,
                output_greatest: limits.1,
            })
        };
        let parts = Parts {
            upper: if op_amp { get("control.inner.r1") } else { STRAIGHT },
            lower: OPEN,
            r2: get("control.inner.r2"),
            c1: get("control.inner.c1"),
            c2: get("control.inner.c2"),
            r3: 0.0,
            c3: 0.0,
            feedforward: 0.0,
            led: 0.0,
            bias: 0.0,
            pull_up: 0.0,
        };
        let inner = Compensator {
            kind: Kind::Two,
            amplifier,
            anchor: Anchor::Upper,
            has_feedforward: false,
            parts,
            reference: 0.0,
        };
        AverageCurrent { ohms: get("control.sense.gain"), filter_s: get("control.sense.filter"), inner, ramp }
    }

    /// The same as it acts on the switched current at an operating point: the switch carries so many times that one.
    pub(super) fn referred(&self, point: &OperatingPoint) -> Self {
        AverageCurrent { ohms: self.ohms * point.sense_ratio, ..self.clone() }
    }

    /// Problems between entries.
    pub(super) fn problems(&self, clamp: Option<f64>) -> Vec<Finding> {
        let mut problems: Vec<Finding> =
            clamp.filter(|clamp| *clamp <= 0.0).map(|clamp| clamp_too_low(clamp, 0.0)).into_iter().collect();
        let (least, greatest) = self.inner.output_limits();
        if least >= greatest {
            let message = format!(
                "The inner amplifier's least output, {}, must be below its greatest, {}.",
                print(least, Unit::Volt),
                print(greatest, Unit::Volt)
            );
            problems.push(
                Finding::problem("control.inner.output-least", message)
                    .with_hint("an amplifier's output moves between its supply rails"),
            );
        }
        problems
    }

    /// The stage with the inner loop closed, and that loop.
    ///
    /// # Errors
    /// As the joining of systems.
    pub(super) fn controlled(
        &self,
        averaged: &AveragedModel,
        period: f64,
        delay: f64,
    ) -> Result<Controlled, LinearError> {
        let point = &averaged.operating_point;
        // A network within the table's bounds has state equations.
        let network = self.inner.state_space().map_err(|_unsolvable| LinearError::AlgebraicLoop)?;
        let stage = self.close(&averaged.stage, &network, point.duty, point.input_voltage, delay)?;
        let output_voltage = self.ramp.voltage(point.duty, point.input_voltage);
        let sensed = self.ohms * point.switched_current.average;
        let gain = |input| network.dc_gain(0, input).ok_or(LinearError::NotFinite);
        let control_voltage = (output_voltage - gain(0)? * sensed) / gain(1)?;
        let loop_gain = self.loop_gain(averaged, &network, delay)?;
        let amplified = self.network_response(&network)?.at_hz(period.recip()).norm();
        let ramp_slope = self.ramp.at(point.input_voltage) / period;
        let inner = InnerLoop {
            loop_gain,
            output_voltage,
            output_limits: self.inner.output_limits(),
            slope_ratio: amplified * self.ohms * point.off_slope.abs() / ramp_slope,
        };
        Ok(Controlled { stage, delay_s: 0.0, control_voltage, sampling: None, inner: Some(inner) })
    }

    /// Sense filter and network, inversion taken out.
    fn network_response(&self, network: &StateSpace) -> Result<FactoredResponse, LinearError> {
        let network = Zpk::from_state_space(network, 0, 0)?.scaled(-1.0);
        Ok(FactoredResponse::new(network.multiply(&self.filter()), 0.0))
    }

    fn filter(&self) -> Zpk {
        if self.filter_s > 0.0 {
            let rate = self.filter_s.recip();
            Zpk { zeros: Vec::new(), poles: vec![Complex::new(-rate, 0.0)], gain: rate }
        } else {
            Zpk::constant(1.0)
        }
    }

    fn loop_gain(
        &self,
        averaged: &AveragedModel,
        network: &StateSpace,
        delay: f64,
    ) -> Result<FactoredResponse, LinearError> {
        let row = averaged.stage.need_output(SWITCHED_CURRENT)?;
        let current = Zpk::from_state_space(&averaged.stage, row, 0)?;
        let duty = self.ramp.duty_from_voltage(averaged.operating_point.input_voltage);
        let network = self.network_response(network)?;
        Ok(FactoredResponse::new(current.multiply(network.zpk()).scaled(self.ohms * duty), delay))
    }

    fn sense(&self) -> Result<StateSpace, LinearError> {
        let one = |x| DMatrix::from_element(1, 1, x);
        let ports: (&[&str], &[&str]) = (&["current"], &["sensed"]);
        if self.filter_s > 0.0 {
            let rate = self.filter_s.recip();
            StateSpace::new(one(-rate), one(rate), one(self.ohms), one(0.0), ports.0, ports.1)
        } else {
            StateSpace::constant(one(self.ohms), ports.0, ports.1)
        }
    }

    fn close(
        &self,
        stage: &StateSpace,
        network: &StateSpace,
        duty: f64,
        input_voltage: f64,
        delay: f64,
    ) -> Result<StateSpace, LinearError> {
        const STAGE: usize = 0;
        const SENSE: usize = 1;
        const NETWORK: usize = 2;
        const LINE: usize = 3;
        const DELAY: usize = 4;
        let line = StateSpace::constant(DMatrix::identity(1, 1), &["line"], &["line"])?;
        let sense = self.sense()?;
        let from_output = self.ramp.duty_from_voltage(input_voltage);
        let from_line = self.ramp.duty_from_input(duty, input_voltage);
        let wire = |from_part, output, to_part, input, gain| Wire { from_part, output, to_part, input, gain };
        let mut parts = vec![stage, &sense, network, &line];
        let mut wires = vec![
            wire(STAGE, SWITCHED_CURRENT, SENSE, "current", 1.0),
            wire(SENSE, "sensed", NETWORK, "vout", 1.0),
            wire(LINE, "line", STAGE, INPUT_VOLTAGE, 1.0),
            wire(LINE, "line", STAGE, DUTY, from_line),
        ];
        let padded = if delay > 0.0 { Some(pade_delay(delay, DELAY_ORDER)?) } else { None };
        if let Some(padded) = &padded {
            parts.push(padded);
            wires.push(wire(NETWORK, "vc", DELAY, padded.inputs[0].as_str(), from_output));
            wires.push(wire(DELAY, padded.outputs[0].as_str(), STAGE, DUTY, 1.0));
        } else {
            wires.push(wire(NETWORK, "vc", STAGE, DUTY, from_output));
        }
        let inputs = [
            Port { name: CONTROL, part: NETWORK, port: "vref" },
            Port { name: INPUT_VOLTAGE, part: LINE, port: "line" },
            Port { name: LOAD_CURRENT, part: STAGE, port: LOAD_CURRENT },
        ];
        let outputs: Vec<Port<'_>> = stage.outputs.iter().map(|name| Port { name, part: STAGE, port: name }).collect();
        StateSpace::connect(&parts, &wires, &inputs, &outputs)
    }
}
