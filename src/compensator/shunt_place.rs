//! Parts of isolated feedback from poles and zeros, and what limits them.
//!
//! *Conventions.* Divider, pull-up and bias resistor stay: they hold the operating point. The LED resistor follows the gain where R2 is
//! kept or not fitted; it stays small enough for the least transfer ratio to pull the control voltage down to saturation.
//!
//! *Source.* The formulas of `lanes.rs`, solved for the parts: with K the gain of the LED branch, f the gain lane and z the first zero,
//! C1 = K/(2π·Rupper·f) and f/z = K·(1 + R2/Rupper) beside a fast path; without one R2 = 1/(2π·z·C1).

use std::f64::consts::TAU;

use super::lanes::{Corner, Corners, corner_hz};
use super::network::{Compensator, Kind, Part, Parts};
use super::shunt::ShuntRegulator;
use crate::quantity::{Unit, print, print_digits};

/// Least C2 against the optocoupler's capacitance, and least R2 against the upper resistor, when a lane is pushed to its limit, so
/// that a part remains to be fitted.
const LEAST_SHARE: f64 = 1e-3;
/// Relative change of a lane below which it counts as unmoved.
const SAME: f64 = 1e-9;
/// An LED resistor may exceed the greatest by this much: rounding, not a limit.
const ROUNDING: f64 = 1e-9;

impl Compensator {
    /// Formula and parts behind a lane of isolated feedback.
    pub(super) fn isolated_origin(
        &self,
        regulator: &ShuntRegulator,
        corner: Corner,
    ) -> (&'static str, &'static [Part]) {
        use Part::{Bias, C1, C2, C3, Led, PullUp, R2, R3, Upper};
        match corner {
            Corner::Gain => (
                "ratio · Rpull / (Rled + Rd || Rbias) · Rbias / (Rbias + Rd) / (2π · Rupper · C1)",
                &[PullUp, Led, Bias, Upper, C1],
            ),
            Corner::Zero1 if !regulator.has_fast_path() => ("1 / (2π · R2 · C1)", &[R2, C1]),
            Corner::Zero1 if self.has(R2) => ("1 / (2π · (Rupper + R2) · C1)", &[Upper, R2, C1]),
            Corner::Zero1 => ("1 / (2π · Rupper · C1)", &[Upper, C1]),
            Corner::Pole1 => ("1 / (2π · Rpull · (C2 + Copto))", &[PullUp, C2]),
            Corner::Zero2 => ("1 / (2π · (Rled + R3) · C3)", &[Led, R3, C3]),
            Corner::Pole2 => ("1 / (2π · (R3 + Rled || Rd || Rbias) · C3)", &[Led, Bias, R3, C3]),
        }
    }

    /// Resistors and feedback parts that put gain, first zero and first pole exactly at `aim`; the branch of r3 and c3 is left alone.
    pub(super) fn isolated_parts(&self, regulator: &ShuntRegulator, aim: &Corners) -> Result<Parts, String> {
        let present = self.corners();
        let unmoved = |corner: Corner| match (present.at(corner), aim.at(corner)) {
            (Some(a), Some(b)) => (a / b - 1.0).abs() < SAME,
            _ => true,
        };
        let mut parts = self.parts;
        if !unmoved(Corner::Gain) || !unmoved(Corner::Zero1) {
            self.fill_slow_path(regulator, &mut parts, aim)?;
        }
        if let (false, Some(pole)) = (unmoved(Corner::Pole1), aim.pole_1) {
            parts.c2 = 1.0 / (TAU * pole * parts.pull_up) - regulator.capacitance;
            if parts.c2 < LEAST_SHARE * regulator.capacitance {
                return Err(self.pole_limit(regulator));
            }
        }
        Ok(parts)
    }

    /// C1, and R2 or the LED resistor, from the gain lane and the first zero.
    fn fill_slow_path(&self, regulator: &ShuntRegulator, parts: &mut Parts, aim: &Corners) -> Result<(), String> {
        let gain = aim.gain.unwrap_or(f64::NAN);
        let Some(zero) = aim.zero_1 else {
            // A type I moves its capacitor.
            parts.c1 = regulator.branch_gain(parts) / (TAU * parts.upper * gain);
            return Ok(());
        };
        if self.has(Part::R2) && regulator.keeps_led_resistor {
            parts.c1 = regulator.branch_gain(parts) / (TAU * parts.upper * gain);
            parts.r2 = 1.0 / (TAU * zero * parts.c1);
            if regulator.has_fast_path() {
                parts.r2 -= parts.upper;
                if parts.r2 < LEAST_SHARE * parts.upper {
                    return Err(floor(regulator.branch_gain(parts), "with the LED resistor kept"));
                }
            }
            return Ok(());
        }
        parts.c1 = 1.0 / (TAU * zero * self.zero_resistance(parts));
        let wanted = TAU * gain * parts.upper * parts.c1;
        parts.led = regulator.led_for(parts, wanted);
        let greatest = self.led_limit(regulator);
        if parts.led > greatest.max(self.parts.led) * (1.0 + ROUNDING) {
            let at_limit = Parts { led: greatest.max(self.parts.led), ..*parts };
            return Err(led_floor(regulator, &at_limit));
        }
        if parts.led <= 0.0 {
            return Err(format!(
                "With this pull-up the gain of the LED branch stays below {}: the LED's own resistance is in the way.",
                print_digits(regulator.branch_gain(&Parts { led: 0.0, ..*parts }), Unit::One, 3)
            ));
        }
        Ok(())
    }

    /// The aim with gain and first pole brought to where LED resistor and optocoupler let them be, the other lanes as asked, and why.
    pub(super) fn isolated_order(&self, regulator: &ShuntRegulator, aim: &Corners) -> (Corners, Option<String>) {
        let (mut aim, mut why) = (*aim, None);
        let follows = !(self.has(Part::R2) && regulator.keeps_led_resistor);
        if let (true, Some(gain), Some(zero)) = (follows, aim.gain, aim.zero_1) {
            let present = self.parts.led;
            let at_limit = Parts { led: self.led_limit(regulator).max(present), ..self.parts };
            let least = regulator.branch_gain(&at_limit) * zero * self.zero_resistance(&at_limit) / at_limit.upper;
            if gain < least * (1.0 - ROUNDING) {
                aim.gain = Some(least);
                why = Some(led_floor(regulator, &at_limit));
            }
        }
        let highest = corner_hz(self.parts.pull_up, regulator.capacitance * (1.0 + 2.0 * LEAST_SHARE));
        if aim.pole_1.is_some_and(|pole| pole > highest && self.corners().pole_1.is_none_or(|own| own < pole)) {
            aim.pole_1 = Some(highest);
            why = super::place::join(why, Some(self.pole_limit(regulator)));
        }
        (aim, why)
    }

    /// The greatest LED resistor that placement fits [Ω]: the one that lets the least ratio pull the control voltage to saturation.
    pub(super) fn led_limit(&self, regulator: &ShuntRegulator) -> f64 {
        regulator.greatest_led_resistor(&self.parts, self.dc_output_voltage(), regulator.saturation)
    }

    /// The LED resistor that an aim asks for [Ω], where it follows the lanes.
    pub(super) fn aimed_parts(&self, aim: &Corners) -> Parts {
        match self.isolated().map(|regulator| self.isolated_parts(regulator, aim)) {
            Some(Ok(parts)) => parts,
            _ => self.parts,
        }
    }

    /// What holds the gain up where the LED resistor is among the kept parts; nothing where no fast path is.
    pub(super) fn floor_of_kept(&self, kept: &[Part]) -> Option<String> {
        let regulator = self.isolated().filter(|regulator| regulator.has_fast_path() && self.kind != Kind::One)?;
        kept.contains(&Part::Led).then(|| floor(regulator.branch_gain(&self.parts), "with the LED resistor kept"))
    }

    fn pole_limit(&self, regulator: &ShuntRegulator) -> String {
        format!(
            "With this pull-up the optocoupler alone has its pole at {}: a higher one needs a smaller pull-up.",
            print(corner_hz(self.parts.pull_up, regulator.capacitance), Unit::Hertz)
        )
    }
}

/// Why the LED resistor cannot grow, and so the gain not fall.
fn led_floor(regulator: &ShuntRegulator, at_limit: &Parts) -> String {
    let led = print_digits(at_limit.led, Unit::Ohm, 3);
    let reason = format!(
        "with an LED resistor of {led}: a greater one leaves LED and regulator too little to pull the control voltage down at the least transfer ratio"
    );
    if regulator.has_fast_path() {
        floor(regulator.branch_gain(at_limit), &reason)
    } else {
        format!(
            "The LED branch has a gain of at least {}, {reason}.",
            print_digits(regulator.branch_gain(at_limit), Unit::One, 3)
        )
    }
}

/// Why the mid-band gain cannot be lower.
fn floor(gain: f64, reason: &str) -> String {
    format!(
        "The fast path through the LED holds the mid-band gain at {} ({}) at least, transfer ratio × pull-up / LED resistor, {reason}.",
        print_digits(gain, Unit::One, 3),
        print_digits(20.0 * gain.log10(), Unit::Decibel, 3)
    )
}
