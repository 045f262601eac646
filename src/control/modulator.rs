//! The ramp of voltage and average current mode: duty ratio from the voltage compared with it.
//!
//! *Conventions*: d = (v − valley)/ramp. With line feed-forward the ramp is proportional to the input voltage
//! and has its entered height at the nominal input, so ∂d/∂vin = −D/Vin.
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 7.3 (modulator gain 1/VM).

use crate::quantity::Values;

/// A ramp with usable values.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ramp {
    /// From valley to peak, at the nominal input where it follows the line [V].
    pub amplitude: f64,
    /// Voltage at which the duty ratio is zero [V].
    pub valley: f64,
    /// Input voltage at which a line-fed ramp has its entered height [V]; none without feed-forward.
    pub feedforward_at: Option<f64>,
}

impl Ramp {
    /// A ramp from entered values; `get` reads the control's rows.
    pub(super) fn read(get: impl Fn(&str) -> f64, values: &Values, line_fed: bool) -> Self {
        Ramp {
            amplitude: get("control.ramp.amplitude"),
            valley: get("control.ramp.valley"),
            feedforward_at: line_fed.then(|| values.get("stage.input.nominal").unwrap_or(1.0)),
        }
    }

    /// Height of the ramp at an input voltage [V].
    pub fn at(&self, input_voltage: f64) -> f64 {
        self.feedforward_at.map_or(self.amplitude, |nominal| self.amplitude * input_voltage / nominal)
    }

    /// A ramp of one height, the one this has at an input voltage [V].
    #[must_use]
    pub(super) fn held(&self, input_voltage: f64) -> Self {
        Ramp { amplitude: self.at(input_voltage), valley: self.valley, feedforward_at: None }
    }

    /// Duty ratio from the compared voltage [1/V].
    pub fn duty_from_voltage(&self, input_voltage: f64) -> f64 {
        self.at(input_voltage).recip()
    }

    /// Duty ratio from input voltage [1/V].
    pub fn duty_from_input(&self, duty: f64, input_voltage: f64) -> f64 {
        if self.feedforward_at.is_some() { -duty / input_voltage } else { 0.0 }
    }

    /// Voltage that holds a duty ratio [V].
    pub fn voltage(&self, duty: f64, input_voltage: f64) -> f64 {
        self.valley + duty * self.at(input_voltage)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Erickson & Maksimovic 3rd ed., 9.5.4: D 0.536 at a 4 V ramp asks 2.14 V (quoted in many courses; seen).
    #[test]
    fn control_voltage_of_the_textbook_buck() {
        let ramp = Ramp { amplitude: 4.0, valley: 0.0, feedforward_at: None };
        assert!((ramp.voltage(0.536, 28.0) - 2.144).abs() < 1e-12);
        assert!((ramp.duty_from_voltage(28.0) - 0.25).abs() < 1e-15);
    }

    #[test]
    fn line_fed_ramp_keeps_the_product_of_duty_and_input() {
        let ramp = Ramp { amplitude: 1.2, valley: 0.0, feedforward_at: Some(12.0) };
        let duty = |vin: f64| 0.6 / ramp.at(vin);
        assert!((duty(9.0) * 9.0 - duty(16.0) * 16.0).abs() < 1e-12);
        let slope = (duty(12.0 + 1e-4) - duty(12.0 - 1e-4)) / 2e-4;
        assert!((ramp.duty_from_input(duty(12.0), 12.0) - slope).abs() < 1e-8);
    }
}
