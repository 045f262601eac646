//! The pulse-width modulator of voltage mode: duty ratio from control voltage.
//!
//! *Conventions*: d = (vc − valley)/ramp, delayed. With line feed-forward the ramp is proportional to the input voltage
//! and has its entered height at the nominal input, so ∂d/∂vin = −D/Vin.
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 7.3 (modulator gain 1/VM).

use super::entries::ENTRIES;
use crate::quantity::{Choices, Values};

/// A modulator with usable values.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Modulator {
    /// Ramp from valley to peak, at the nominal input where it follows the line [V].
    pub ramp_amplitude: f64,
    /// Control voltage at which the duty ratio is zero [V].
    pub ramp_valley: f64,
    /// Smallest duty ratio.
    pub duty_least: f64,
    /// Largest duty ratio.
    pub duty_greatest: f64,
    /// Delay from comparator to switch node [s].
    pub delay_s: f64,
    /// Input voltage at which a line-fed ramp has its entered height [V]; none without feed-forward.
    pub feedforward_at: Option<f64>,
}

impl Modulator {
    /// A modulator from entered values, which must have been checked against their bounds and order.
    pub fn from_values(values: &Values, choices: &Choices) -> Self {
        let get =
            |path: &str| ENTRIES.iter().find(|e| e.path == path).and_then(|e| values.get_or_default(e)).unwrap_or(0.0);
        Modulator {
            ramp_amplitude: get("control.ramp.amplitude"),
            ramp_valley: get("control.ramp.valley"),
            duty_least: get("control.duty.least"),
            duty_greatest: get("control.duty.greatest"),
            delay_s: get("control.delay"),
            feedforward_at: choices
                .is("control.feedforward", "line")
                .then(|| values.get("stage.input.nominal").unwrap_or(1.0)),
        }
    }

    /// Height of the ramp at an input voltage [V].
    pub fn ramp_at(&self, input_voltage: f64) -> f64 {
        self.feedforward_at.map_or(self.ramp_amplitude, |nominal| self.ramp_amplitude * input_voltage / nominal)
    }

    /// Duty ratio from control voltage [1/V].
    pub fn duty_from_control(&self, input_voltage: f64) -> f64 {
        self.ramp_at(input_voltage).recip()
    }

    /// Duty ratio from input voltage [1/V].
    pub fn duty_from_input(&self, duty: f64, input_voltage: f64) -> f64 {
        if self.feedforward_at.is_some() { -duty / input_voltage } else { 0.0 }
    }

    /// Control voltage that holds a duty ratio [V].
    pub fn control_voltage(&self, duty: f64, input_voltage: f64) -> f64 {
        self.ramp_valley + duty * self.ramp_at(input_voltage)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Erickson & Maksimovic 3rd ed., 9.5.4: D 0.536 at a 4 V ramp asks 2.14 V (quoted in many courses; seen).
    #[test]
    fn control_voltage_of_the_textbook_buck() {
        let mut values = Values::new();
        values.set("control.ramp.amplitude", 4.0).unwrap();
        let m = Modulator::from_values(&values, &Choices::new());
        assert!((m.control_voltage(0.536, 28.0) - 2.144).abs() < 1e-12);
        assert!((m.duty_from_control(28.0) - 0.25).abs() < 1e-15);
    }

    #[test]
    fn line_fed_ramp_keeps_the_product_of_duty_and_input() {
        let mut values = Values::new();
        values.set("stage.input.nominal", 12.0).unwrap();
        let mut choices = Choices::new();
        choices.set("control.feedforward", "line");
        let m = Modulator::from_values(&values, &choices);
        let duty = |vin: f64| 0.6 / m.ramp_at(vin);
        assert!((duty(9.0) * 9.0 - duty(16.0) * 16.0).abs() < 1e-12);
        let slope = (duty(12.0 + 1e-4) - duty(12.0 - 1e-4)) / 2e-4;
        assert!((m.duty_from_input(duty(12.0), 12.0) - slope).abs() < 1e-8);
    }
}
