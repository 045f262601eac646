//! The loop of a difference equation as what it is: sampled once a period. Its exact map, its verdict, its margins with all bands folded.
//!
//! *Conventions*: a value acts at the pulse's edge, as an impulse of a period's weight on the averaged stage; behind a converter that acts
//! throughout it is held. What samples fold together is the sum of all bands, so this loop's margins differ from those of the plain
//! product by what the plant lets through beyond half the sampling frequency.
//!
//! *Method*: poles are the map's eigenvalues. The count of encirclements that checks them is taken in the plane w = 2/T·(z − 1)/(z + 1), where the sampled
//! loop gain is a quotient of polynomials without delay, so the count is a proof like that of continuous loops.
//!
//! *Source*: impulse-sampled model of the pulse: Maksimović & Zane, Small-signal discrete-time modeling of digitally controlled PWM converters,
//! IEEE Trans. Power Electronics 22 (2007), 2552 (from memory).

use super::loop_model::{Judged, LoopModel};
use super::motion::{Motion, SampledMotion};
use crate::compensator::{DifferenceEquation, Digital};
use crate::control::CONTROL;
use crate::converter::BankInductance;
use crate::converter::signals::{INPUT_VOLTAGE, LOAD_CURRENT, LOAD_VOLTAGE, OUTPUT_VOLTAGE};
use crate::linear::{
    Complex, Drive, FactoredResponse, LinearError, Margins, Port, SampleTiming, SampledLoop, StateSpace, Verdict, Wire,
    Zpk, closed_loop_verdict_knowing, margins,
};
use std::f64::consts::{PI, TAU};

/// Margins in the plane w are searched from this many times the sampling frequency …
const SEARCH_FROM: f64 = 1e-6;
/// … to this one, which stands for all but the last thousandth below half of it.
const SEARCH_TO: f64 = 300.0;

/// A difference equation and what it is made from.
#[derive(Clone, Debug, PartialEq)]
pub struct SharedDigital {
    /// Lanes, method, words, times.
    pub digital: Digital,
    /// The equation at work.
    pub equation: DifferenceEquation,
}

impl SharedDigital {
    pub(super) fn new(digital: Digital) -> Self {
        SharedDigital { equation: digital.equation(), digital }
    }

    /// The same before rounding.
    pub(super) fn before_rounding(&self) -> Self {
        SharedDigital { equation: self.digital.exact(), digital: self.digital }
    }

    /// Control voltage from output voltage, inversion taken out.
    pub fn response(&self) -> FactoredResponse {
        self.digital.response_of(&self.equation)
    }

    /// The same times a factor.
    pub(super) fn scaled_response(&self, factor: f64) -> FactoredResponse {
        let response = self.response();
        let scaled = FactoredResponse::new(response.zpk().scaled(factor), response.delay_s());
        match response.discrete() {
            Some(factors) => scaled.with_discrete(factors.clone()),
            None => scaled,
        }
    }

    /// The equation's response in the plane w, as control voltage over output voltage.
    fn in_w(&self) -> Zpk {
        let equation = &self.equation;
        let scale = 2.0 / self.digital.period_s;
        let mut zpk = Zpk::constant(equation.gain() * self.digital.scale());
        // 1 − r·z⁻¹ = (1 + r)·(w − wr)/(w + scale), and 2·scale/(w + scale) for r = −1.
        for (roots, zero) in [(equation.zeros(), true), (equation.poles(), false)] {
            let mut gain = Complex::ONE;
            let (mut own, mut other) = (Vec::new(), Vec::new());
            for root in roots {
                if *root == -Complex::ONE {
                    gain *= 2.0 * scale;
                } else {
                    gain *= 1.0 + root;
                    own.push(scale * (root - 1.0) / (root + 1.0));
                }
                other.push(Complex::from(-scale));
            }
            let (zeros, poles) = if zero { (own, other) } else { (other, own) };
            zpk.zeros.extend(zeros);
            zpk.poles.extend(poles);
            zpk.gain *= if zero { gain.re } else { gain.re.recip() };
        }
        for _ in 0..equation.delays() {
            zpk.zeros.push(Complex::from(scale));
            zpk.poles.push(Complex::from(-scale));
            zpk.gain = -zpk.gain;
        }
        cancelled(zpk, Complex::from(-scale))
    }
}

/// A response without as many zeros as poles at one place.
fn cancelled(mut zpk: Zpk, place: Complex) -> Zpk {
    loop {
        let find = |roots: &[Complex]| roots.iter().position(|root| *root == place);
        let (Some(zero), Some(pole)) = (find(&zpk.zeros), find(&zpk.poles)) else { return zpk };
        zpk.zeros.remove(zero);
        zpk.poles.remove(pole);
    }
}

/// A loop with its exact map.
#[derive(Debug)]
pub struct SampledModel {
    motion: SampledMotion,
    /// The sampled loop gain in the plane w.
    open: FactoredResponse,
}

impl LoopModel {
    /// The loop as it is sampled.
    ///
    /// # Errors
    /// As the joining of systems and the exponential.
    pub(super) fn sampled(&self, shared: &SharedDigital) -> Result<SampledModel, LinearError> {
        let (digital, equation) = (&shared.digital, &shared.equation);
        let system = driven(&self.controlled.stage, self.averaged.bank_inductance.as_ref())?;
        let timing = SampleTiming {
            period_s: digital.period_s,
            delay_s: digital.computation_s + self.modulator_delay_s.unwrap_or(0.0) + self.controlled.delay_s,
            drive: if self.modulator_delay_s.is_some() { Drive::Impulse } else { Drive::Held },
        };
        let forward: Vec<f64> = equation.forward.iter().map(|b| b * digital.scale()).collect();
        let map = SampledLoop::new(&system, &equation.feedback, &forward, timing)?;
        let open = FactoredResponse::new(shared.in_w().multiply(&map.pulse_response_w()?), 0.0);
        Ok(SampledModel { motion: SampledMotion { map, reference_scale: digital.divider_ratio.recip() }, open })
    }
}

impl SampledModel {
    /// Stability by the map's eigenvalues, checked by the count of encirclements; margins, and for a stable loop how it moves.
    pub(super) fn judged(self) -> Result<Judged, LinearError> {
        let poles = self.motion.map.poles_w()?;
        let in_w = self.margins_w();
        let verdict = match closed_loop_verdict_knowing(&poles, &self.open, &in_w) {
            Verdict::Unstable { poles, .. } => {
                let z = self.motion.map.poles_z()?;
                let fastest = z.iter().copied().max_by(|p, q| p.norm().total_cmp(&q.norm())).unwrap_or(Complex::ONE);
                let s = fastest.ln() / self.motion.map.period_s();
                Verdict::Unstable { frequency_hz: s.im.abs() / TAU, growth_per_s: s.re, poles }
            }
            other => other,
        };
        let sampled = Some(self.at_samples(in_w));
        let motion = matches!(verdict, Verdict::Stable { .. }).then(|| Motion::Sampled(Box::new(self.motion)));
        Ok(Judged { verdict, sampled, motion })
    }

    /// Eigenvalues of the map in the z plane.
    ///
    /// # Errors
    /// As the search for eigenvalues.
    pub(super) fn poles_z(&self) -> Result<Vec<Complex>, LinearError> {
        self.motion.map.poles_z()
    }

    fn margins_w(&self) -> Margins {
        let fs = self.motion.map.period_s().recip();
        margins(&self.open, fs * SEARCH_FROM, fs * SEARCH_TO)
    }

    /// Crossovers and margins of the sampled loop, moved from the plane w to the frequencies of its samples. A delay margin would not be a whole
    /// number of periods, so there is none.
    fn at_samples(&self, mut margins: Margins) -> Margins {
        let period_s = self.motion.map.period_s();
        let hertz = |f: f64| (PI * f * period_s).atan() / (PI * period_s);
        for crossover in margins.crossovers.iter_mut().chain(&mut margins.above) {
            crossover.frequency_hz = hertz(crossover.frequency_hz);
        }
        for crossover in &mut margins.phase_crossovers {
            crossover.frequency_hz = hertz(crossover.frequency_hz);
        }
        margins.modulus_frequency_hz = hertz(margins.modulus_frequency_hz);
        margins.delay_margin_s = None;
        margins
    }
}

/// The controlled stage with its bank's series inductance: inputs control, load current, input voltage; outputs the sensed and the
/// load's voltage.
fn driven(stage: &StateSpace, bank: Option<&BankInductance>) -> Result<StateSpace, LinearError> {
    const STAGE: usize = 0;
    let inputs = [CONTROL, LOAD_CURRENT, INPUT_VOLTAGE];
    let Some(bank) = bank else { return stage.subsystem(&[OUTPUT_VOLTAGE, LOAD_VOLTAGE], &inputs) };
    let mut without = bank.without.clone();
    without.c.neg_mut();
    without.d.neg_mut();
    let added = [&bank.with, &without];
    let parts = [stage, added[0], added[1]];
    let mut ports: Vec<Port<'_>> = inputs.iter().map(|name| Port { name, part: STAGE, port: name }).collect();
    let mut outputs = Vec::new();
    for name in [OUTPUT_VOLTAGE, LOAD_VOLTAGE] {
        outputs.push(Port { name, part: STAGE, port: name });
    }
    for (k, part) in added.iter().enumerate() {
        ports.push(Port { name: LOAD_CURRENT, part: k + 1, port: part.inputs[0].as_str() });
        for name in [OUTPUT_VOLTAGE, LOAD_VOLTAGE] {
            outputs.push(Port { name, part: k + 1, port: part.outputs[0].as_str() });
        }
    }
    let wires: [Wire<'_>; 0] = [];
    StateSpace::connect(&parts, &wires, &ports, &outputs)
}
