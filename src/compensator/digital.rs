//! A compensator that is a difference equation: read from entered values, its coefficients rounded to a word length.
//!
//! *Conventions*: one sample a period T of the pulses. The error counts as a fraction of the converter's input range at the divider's tap,
//! the output as a fraction of full scale: the duty ratio in voltage mode, a control voltage over the output range in the current modes. The
//! coefficients as rounded are the truth; the entered frequencies are where poles and zeros are wanted.
//!
//! *Model*: neither the steps of the converter nor those of the pulse width are in it, nor rounding inside the sums; only coefficients are rounded.
//!
//! *Source*: Corradini, Maksimović, Mattavelli & Zane, Digital Control of High-Frequency Switched-Mode Power Converters, 2015, ch. 4 to 6
//! (from memory).

use super::difference::{DifferenceEquation, Method};
use super::digital_entries::{ENTRIES, chosen, voltage_mode};
use super::fixed_point::{Codes, Overflow};
use super::lanes::Corners;
use super::network::read_entry;
use crate::finding::{Finding, Remedy};
use crate::linear::{Complex, FactoredResponse, Zpk};
use crate::quantity::{Choices, Unit, Values, print, print_digits};

/// How far below half the sampling frequency Tustin's rule may be exact, as a share: there its stretch has no end.
const LEAST_BELOW_HALF: f64 = 1e-3;

/// How coefficients become codes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Rounding {
    /// The feedback codes keep the pole at z = 1.
    Integrator,
    /// Each to its nearest.
    Nearest,
}

/// A difference equation by what it is made from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Digital {
    /// Time between samples: the period of the pulses [s].
    pub period_s: f64,
    /// Where gain, poles and zeros are wanted [Hz].
    pub aims: Corners,
    /// How they become coefficients.
    pub method: Method,
    /// Poles, that of the integrator included.
    pub order: usize,
    /// Zeros that are placed.
    pub zeros: usize,
    /// Bits of a coefficient.
    pub bits: u32,
    /// Binary places of the forward coefficients, where entered.
    pub fraction_bits: Option<u32>,
    /// Binary places of the feedback coefficients, where entered.
    pub feedback_fraction_bits: Option<u32>,
    /// How they are rounded.
    pub rounding: Rounding,
    /// From sample to the start of the period it counts in [s].
    pub computation_s: f64,
    /// Full scale of the error at the divider's tap [V].
    pub input_range: f64,
    /// Control voltage from nothing to full scale [V].
    pub output_range: f64,
    /// Control voltage of output 0 [V].
    pub output_zero: f64,
    /// Whether the output is the duty ratio itself.
    pub duty_command: bool,
    /// Whether the output is held for a period and acts all the while, as on an inner loop; else it acts once, at the pulse's edge.
    pub held: bool,
    /// Fraction of the output voltage at the divider's tap.
    pub divider_ratio: f64,
}

/// The equation as it stands in the controller.
#[derive(Clone, Debug, PartialEq)]
pub struct FixedPoint {
    /// Codes of a1, a2, …
    pub feedback: Codes,
    /// Codes of b0, b1, …
    pub forward: Codes,
}

/// Which group of coefficients does not fit its word.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum TooLarge {
    /// One of a1, a2, …
    Feedback(Overflow),
    /// One of b0, b1, …
    Forward(Overflow),
}

impl Digital {
    /// Reads entered values; what cannot be used is added to `faults`.
    pub(super) fn read(
        values: &Values,
        choices: &Choices,
        pulses_hz: Option<f64>,
        divider_ratio: f64,
        faults: &mut Vec<Finding>,
    ) -> Self {
        let start = faults.len();
        let mut get = |path: &str| read_entry(path, values, choices, faults);
        let pulses_hz = pulses_hz.filter(|f| f.is_finite() && *f > 0.0);
        let period_s = pulses_hz.unwrap_or(1.0).recip();
        let duty_command = voltage_mode(choices);
        let lane = |path: &str, applies: bool, get: &mut dyn FnMut(&str) -> f64| applies.then(|| get(path));
        let order = if chosen(choices, "compensator.digital.order") == "2" { 2 } else { 3 };
        let zeros = if chosen(choices, "compensator.digital.zeros") == "1" { 1 } else { 2 };
        let aims = Corners {
            gain: Some(get("compensator.digital.gain")),
            zero_1: Some(get("compensator.digital.zero-1")),
            pole_1: Some(get("compensator.digital.pole-1")),
            zero_2: lane("compensator.digital.zero-2", zeros == 2, &mut get),
            pole_2: lane("compensator.digital.pole-2", order == 3, &mut get),
        };
        let method = match chosen(choices, "compensator.digital.method") {
            "matched" => Method::Matched,
            "tustin-prewarped" => Method::Prewarped(get("compensator.digital.prewarp")),
            _ => Method::Tustin,
        };
        let own = |path: &str| values.get(path).unwrap_or(f64::NAN);
        let (output_range, output_zero) = if duty_command {
            (own("control.ramp.amplitude"), own("control.ramp.valley"))
        } else {
            (get("compensator.digital.output-range"), 0.0)
        };
        let (bits, computation_s) = (get("compensator.digital.bits"), get("compensator.digital.computation"));
        let input_range = get("compensator.digital.input-range");
        let optional = |path: &str, faults: &mut Vec<Finding>| {
            values.get(path).map(|_| whole(path, read_entry(path, values, choices, faults), faults))
        };
        let fraction_bits = optional("compensator.digital.fraction-bits", faults);
        let feedback_fraction_bits = optional("compensator.digital.feedback-fraction-bits", faults);
        let digital = Digital {
            period_s,
            aims,
            method,
            order,
            zeros,
            bits: whole("compensator.digital.bits", bits, faults),
            fraction_bits,
            feedback_fraction_bits,
            rounding: match chosen(choices, "compensator.digital.rounding") {
                "nearest" => Rounding::Nearest,
                _ => Rounding::Integrator,
            },
            computation_s,
            input_range,
            // A control whose rows cannot be used is reported there.
            output_range: if output_range.is_finite() && output_range > 0.0 { output_range } else { 1.0 },
            output_zero: if output_zero.is_finite() { output_zero } else { 0.0 },
            duty_command,
            held: choices.is("control.mode", "average-current"),
            divider_ratio,
        };
        if faults.len() == start && pulses_hz.is_some() {
            digital.check(values, faults);
        }
        digital
    }

    /// Half the sampling frequency [Hz].
    pub fn highest_hz(&self) -> f64 {
        0.5 / self.period_s
    }

    /// Full scale of the output over full scale of the input, as control voltage over output voltage [V/V].
    pub fn scale(&self) -> f64 {
        self.divider_ratio * self.output_range / self.input_range
    }

    /// The equation before rounding.
    pub fn exact(&self) -> DifferenceEquation {
        DifferenceEquation::from_corners(self.method, &self.aims, self.order, self.scale().recip(), self.period_s)
    }

    /// The codes of the coefficients.
    pub(super) fn rounded(&self) -> Result<FixedPoint, TooLarge> {
        let exact = self.exact();
        let round = match self.rounding {
            Rounding::Integrator => Codes::summing_to_one,
            Rounding::Nearest => Codes::nearest,
        };
        Ok(FixedPoint {
            feedback: round(&exact.feedback, self.bits, self.feedback_fraction_bits).map_err(TooLarge::Feedback)?,
            forward: Codes::nearest(&exact.forward, self.bits, self.fraction_bits).map_err(TooLarge::Forward)?,
        })
    }

    /// The codes of the coefficients; none where one does not fit its word, which the check refuses.
    pub fn fixed_point(&self) -> Option<FixedPoint> {
        self.rounded().ok()
    }

    /// The equation in the controller: as rounded.
    pub fn equation(&self) -> DifferenceEquation {
        match self.rounded() {
            Ok(fixed) => {
                DifferenceEquation::from_coefficients(fixed.feedback.values(), fixed.forward.values(), self.period_s)
            }
            Err(_) => self.exact(),
        }
    }

    /// Control voltage from output voltage, inversion taken out: the equation at e^(jωT), its computation delay, and the hold of the
    /// converter behind it where that acts all the while. Known up to half the sampling frequency [V/V].
    pub fn response(&self) -> FactoredResponse {
        self.response_of(&self.equation())
    }

    /// The same with another equation in its place.
    pub fn response_of(&self, equation: &DifferenceEquation) -> FactoredResponse {
        let mut factors = equation.factors();
        let mut zpk = Zpk::constant(equation.gain() * self.scale());
        let delay_s = self.computation_s + equation.delays() as f64 * self.period_s;
        if self.held {
            // (1 − z⁻¹)/(sT): its zero at z = 1 takes the integrator's place where that is exact.
            zpk.poles.push(Complex::ZERO);
            zpk.gain /= self.period_s;
            match factors.poles.iter().position(|pole| *pole == Complex::ONE) {
                Some(integrator) => drop(factors.poles.remove(integrator)),
                None => factors.zeros.push(Complex::ONE),
            }
        }
        FactoredResponse::new(zpk, delay_s).with_discrete(factors)
    }

    /// Writes where its lanes are wanted, and where its method is exact.
    pub(super) fn write(&self, values: &mut Values) {
        for (key, frequency_hz) in self.aims.iter() {
            // Lanes stay within their rows' bounds, so the number is finite and is taken.
            let _ = values.set(lane_path(key), frequency_hz);
        }
        if let Method::Prewarped(frequency_hz) = self.method {
            let _ = values.set("compensator.digital.prewarp", frequency_hz);
        }
    }

    /// Least and greatest control voltage the output stands for [V].
    pub fn output_limits(&self) -> (f64, f64) {
        (self.output_zero, self.output_zero + self.output_range)
    }

    /// What ties entries together.
    fn check(&self, values: &Values, faults: &mut Vec<Finding>) {
        let half = self.highest_hz();
        for (key, frequency_hz) in self.aims.iter().filter(|(key, _)| *key != "gain") {
            faults.extend(above_half(lane_path(key), frequency_hz, half));
        }
        if let Method::Prewarped(f) = self.method
            && f > half * (1.0 - LEAST_BELOW_HALF)
        {
            faults.extend(above_half("compensator.digital.prewarp", f, half * (1.0 - 2.0 * LEAST_BELOW_HALF)));
        }
        if self.computation_s > self.period_s {
            let message = format!(
                "From sample to update {} pass, more than a period, {}: the next sample would be due before the last one counts.",
                print(self.computation_s, Unit::Second),
                print(self.period_s, Unit::Second)
            );
            let hint = "enter what passes from the sample to the start of the period it sets, at most a period";
            faults.push(Finding::problem("compensator.digital.computation", message).with_hint(hint));
        }
        if let Some(reference) = values.get("compensator.reference").filter(|r| *r > self.input_range) {
            let message = format!(
                "The reference, {}, is beyond the converter's input range, {}: the output could not be sampled where it is held.",
                print(reference, Unit::Volt),
                print(self.input_range, Unit::Volt)
            );
            let hint = "divide the output further, or widen the range";
            faults.push(Finding::problem("compensator.digital.input-range", message).with_hint(hint));
        }
        if !faults.is_empty() {
            return;
        }
        match self.rounded() {
            Err(too_large) => faults.push(self.overflow(too_large)),
            Ok(fixed) if fixed.forward.codes.iter().all(|code| *code == 0) => {
                let message =
                    "Rounded, every coefficient of the error is zero: the controller would not answer at all.";
                let hint = "enter more fraction bits, or leave them empty";
                faults.push(Finding::problem("compensator.digital.fraction-bits", message).with_hint(hint));
            }
            Ok(_) => {}
        }
    }

    /// The finding about a coefficient that does not fit.
    fn overflow(&self, too_large: TooLarge) -> Finding {
        let (path, name, overflow, entered) = match too_large {
            TooLarge::Feedback(o) => {
                ("compensator.digital.feedback-fraction-bits", 'a', o, self.feedback_fraction_bits)
            }
            TooLarge::Forward(o) => ("compensator.digital.fraction-bits", 'b', o, self.fraction_bits),
        };
        let index = if name == 'a' { overflow.index + 1 } else { overflow.index };
        let value = print_digits(overflow.value, Unit::One, 4);
        let Some(places) = entered else {
            let message = format!(
                "The coefficient {name}{index} = {value} overflows a word of {} bits even without fraction bits.",
                self.bits
            );
            return Finding::problem("compensator.digital.bits", message)
                .with_hint("enter a longer word, or lower the gain");
        };
        let message = format!(
            "The coefficient {name}{index} = {value} overflows a word of {} bits with {places} fraction bits.",
            self.bits
        );
        let finding = Finding::problem(path, message).with_hint("leave the fraction bits empty, or enter fewer");
        let exact = self.exact();
        let group = if name == 'a' { &exact.feedback } else { &exact.forward };
        match Codes::nearest(group, self.bits, None) {
            Ok(codes) => finding.with_remedy(Remedy {
                label: format!("Enter {}", codes.fraction_bits),
                values: vec![(path.to_owned(), f64::from(codes.fraction_bits))],
                choices: Vec::new(),
            }),
            Err(_) => finding,
        }
    }
}

/// A frequency beyond a limit by this part of it is the limit, rounded.
const ROUNDING: f64 = 1e-9;

/// Path of the entry of a lane.
pub(super) fn lane_path(key: &str) -> &'static str {
    ENTRIES.iter().map(|row| row.path).find(|path| path.rsplit('.').next() == Some(key)).unwrap_or("compensator")
}

fn above_half(path: &'static str, frequency_hz: f64, half: f64) -> Option<Finding> {
    let name = ENTRIES.iter().find(|row| row.path == path)?.name;
    (frequency_hz > half * (1.0 + ROUNDING)).then(|| {
        let message = format!(
            "{name}, {}, is above half the sampling frequency, {}.",
            print(frequency_hz, Unit::Hertz),
            print(half, Unit::Hertz)
        );
        Finding::problem(path, message)
            .with_hint("the output is sampled once a period, so nothing above half that rate can be placed")
    })
}

/// A number of bits.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "a whole number within the bounds of its row"
)]
fn whole(path: &str, value: f64, faults: &mut Vec<Finding>) -> u32 {
    if value.fract() != 0.0 && !faults.iter().any(|fault| fault.place == path) {
        let name = ENTRIES.iter().find(|row| row.path == path).map_or("", |row| row.name);
        let message = format!("{name} must be a whole number, and is {}", print(value, Unit::One));
        faults.push(Finding::problem(path, message).with_hint("enter whole bits"));
    }
    value.clamp(0.0, 64.0) as u32
}
