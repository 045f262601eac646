//! Isolated feedback at rest: LED and cathode current, the limits of the control voltage, the greatest LED resistor.
//!
//! *Conventions.* The LED is its drop and its dynamic resistance in series; the transistor a current source of transfer ratio × LED
//! current down to its saturation voltage. At rest no current flows in the capacitors.
//!
//! *Source.* Kirchhoff's laws.

use super::network::{Amplifier, Compensator, Parts};
use super::shunt::ShuntRegulator;

/// Regulator and LED at one control voltage.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bias {
    /// Current in the LED [A].
    pub led_current: f64,
    /// Current in the regulator's cathode: LED and bias resistor [A].
    pub cathode_current: f64,
    /// Voltage of the cathode [V].
    pub cathode_voltage: f64,
}

impl ShuntRegulator {
    /// Cathode current beside an LED current [A]: the bias resistor has the LED's voltage across it.
    pub(super) fn cathode_current(&self, parts: &Parts, led_current: f64) -> f64 {
        led_current + (self.led_drop + self.led_resistance * led_current) / parts.bias
    }

    /// LED current at a cathode voltage [A]; zero where the LED is dark.
    fn led_current_at(&self, parts: &Parts, feed: f64, cathode: f64) -> f64 {
        let share = 1.0 + self.led_resistance / parts.bias + self.led_resistance / parts.led;
        let through = (feed - self.led_drop - cathode) / parts.led - self.led_drop / parts.bias;
        (through / share).max(0.0)
    }

    /// Most current the LED resistor lets into the cathode [A], the cathode at its least voltage.
    pub(super) fn greatest_cathode_current(&self, parts: &Parts, output: f64) -> f64 {
        let feed = self.led_supply_voltage(output);
        let led = self.led_current_at(parts, feed, self.least_voltage);
        if led > 0.0 {
            return self.cathode_current(parts, led);
        }
        // The LED stays dark: all of it flows in the bias resistor.
        ((feed - self.least_voltage) / (parts.led + parts.bias)).max(0.0)
    }

    /// Greatest LED resistor that still lets the least transfer ratio pull the control voltage to a level [Ω]; not positive
    /// where no resistor does.
    pub(super) fn greatest_led_resistor(&self, parts: &Parts, output: f64, control_voltage: f64) -> f64 {
        let led = (self.supply - control_voltage) / (parts.pull_up * self.ratios[0]);
        let left = self.led_supply_voltage(output) - self.led_drop - self.led_resistance * led - self.least_voltage;
        left / self.cathode_current(parts, led)
    }

    /// Least and greatest control voltage at a transfer ratio [V]: how far the LED can pull it down, and up to where the regulator
    /// keeps its least current.
    pub(super) fn control_limits(&self, parts: &Parts, output: f64, ratio: f64) -> (f64, f64) {
        let most = self.led_current_at(parts, self.led_supply_voltage(output), self.least_voltage);
        let least = (self.supply - ratio * parts.pull_up * most).max(self.saturation);
        let starved = (self.least_current - self.led_drop / parts.bias) / (1.0 + self.led_resistance / parts.bias);
        (least, self.supply - ratio * parts.pull_up * starved.max(0.0))
    }
}

impl Compensator {
    /// The regulator and its optocoupler, where the feedback is isolated.
    pub fn isolated(&self) -> Option<&ShuntRegulator> {
        if let Amplifier::ShuntRegulator(regulator) = &self.amplifier { Some(regulator) } else { None }
    }

    /// Least and greatest control voltage that the amplifier gives [V]; with isolated feedback at the nominal transfer ratio.
    pub fn output_limits(&self) -> (f64, f64) {
        match &self.amplifier {
            Amplifier::OpAmp(a) => (a.output_least, a.output_greatest),
            Amplifier::Transconductance(a) => (a.output_least, a.output_greatest),
            Amplifier::Digital(digital) => digital.output_limits(),
            Amplifier::ShuntRegulator(a) => a.control_limits(&self.parts, self.dc_output_voltage(), a.ratio()),
        }
    }

    /// Least and greatest control voltage of isolated feedback at a transfer ratio, the LED's supply following `output` [V].
    pub fn control_limits_at(&self, output: f64, ratio: f64) -> Option<(f64, f64)> {
        self.isolated().map(|regulator| regulator.control_limits(&self.parts, output, ratio))
    }

    /// Regulator and LED at a control voltage and transfer ratio, the LED's supply following `output` [V]; none where the feedback
    /// is not isolated.
    pub fn bias(&self, control_voltage: f64, output: f64, ratio: f64) -> Option<Bias> {
        let regulator = self.isolated()?;
        let parts = &self.parts;
        let led_current = ((regulator.supply - control_voltage) / (parts.pull_up * ratio)).max(0.0);
        let cathode_current = regulator.cathode_current(parts, led_current);
        let led_voltage = regulator.led_drop + regulator.led_resistance * led_current;
        let cathode_voltage = regulator.led_supply_voltage(output) - led_voltage - parts.led * cathode_current;
        Some(Bias { led_current, cathode_current, cathode_voltage })
    }

    /// Greatest LED resistor of isolated feedback that lets the least transfer ratio pull the control voltage down to a level [Ω].
    pub fn greatest_led_resistor(&self, output: f64, control_voltage: f64) -> Option<f64> {
        self.isolated().map(|regulator| regulator.greatest_led_resistor(&self.parts, output, control_voltage))
    }

    /// Gain of the fast path at mid-band, transfer ratio × pull-up / LED resistor with the LED's own resistance counted [V/V]; none
    /// without a fast path.
    pub fn fast_path_gain(&self) -> Option<f64> {
        self.isolated()
            .filter(|regulator| regulator.has_fast_path())
            .map(|regulator| regulator.branch_gain(&self.parts))
    }
}
