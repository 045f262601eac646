//! Isolated feedback: a shunt regulator of the 431 type that pulls the LED of an optocoupler, whose transistor pulls the control voltage
//! down against a pull-up.
//!
//! *Circuit.* The regulator compares the divider's tap with its reference; C1, with R2 in series where one is fitted, stands from its
//! cathode back to the tap. The LED resistor runs from the LED's supply to the LED, the LED to the cathode, the bias resistor across
//! the LED. R3 and C3 of a type III stand in series across the LED resistor. On the other side of the insulation the pull-up, C2 and
//! the optocoupler's own capacitance stand at the collector.
//!
//! *Two paths.* Where the LED is fed from the output, a change of the output drives its current at once (the fast path), and through
//! the regulator's network (the slow path). Both go through the same optocoupler.
//!
//! *Source.* Nodal analysis; 1 + Zf/Rupper of both paths together is the common result, as in Basso, Designing Control Loops for Linear and
//! Switching Power Supplies, 2012, ch. 7 (from memory).

use super::entries::chosen;
use super::lanes::parallel;
use super::network::{Kind, Parts};
use crate::finding::{Finding, Remedy};
use crate::quantity::{Choices, Unit, print, print_digits};

/// What the LED resistor is tied to.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum LedSupply {
    /// The load's terminals.
    Load,
    /// The output bank, ahead of a second stage.
    Bank,
    /// A fixed voltage [V]: no fast path.
    Fixed(f64),
}

/// Regulator and optocoupler; the resistors around them are parts of the network.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ShuntRegulator {
    /// Cathode voltage over reference voltage at DC [V/V].
    pub dc_gain: f64,
    /// Gain-bandwidth product of the regulator [Hz].
    pub gain_bandwidth_hz: f64,
    /// Least cathode current at which it regulates [A].
    pub least_current: f64,
    /// Least cathode voltage [V].
    pub least_voltage: f64,
    /// Least, nominal and greatest transfer ratio, collector current over LED current; the curves are drawn with the nominal one.
    pub ratios: [f64; 3],
    /// Supply of the pull-up [V].
    pub supply: f64,
    /// Least control voltage the transistor reaches [V].
    pub saturation: f64,
    /// Capacitance of the optocoupler at its collector [F].
    pub capacitance: f64,
    /// Forward drop of the LED at no current [V].
    pub led_drop: f64,
    /// Dynamic resistance of the LED [Ω].
    pub led_resistance: f64,
    /// What feeds the LED.
    pub led_supply: LedSupply,
    /// Whether R2 stands in series with C1.
    pub has_series_resistor: bool,
    /// Whether a moved lane keeps the LED resistor, R2 following; otherwise the LED resistor follows.
    pub keeps_led_resistor: bool,
}

impl ShuntRegulator {
    /// From entered values; `read` reads the compensator's rows.
    pub(super) fn read(mut read: impl FnMut(&str) -> f64, choices: &Choices) -> Self {
        let kind = chosen(choices, "compensator.type");
        let mut ratio = |level: &str| read(&format!("compensator.opto.transfer-ratio.{level}"));
        let ratios = ["least", "nominal", "greatest"].map(&mut ratio);
        let capacitance = if chosen(choices, "compensator.opto.speed") == "capacitance" {
            read("compensator.opto.capacitance")
        } else {
            let (pole, at) = (read("compensator.opto.pole"), read("compensator.opto.pole-at"));
            1.0 / (std::f64::consts::TAU * pole * at)
        };
        let led_supply = match chosen(choices, "compensator.opto.fast-path") {
            "none" => LedSupply::Fixed(read("compensator.opto.led-supply")),
            "bank" => LedSupply::Bank,
            _ => LedSupply::Load,
        };
        ShuntRegulator {
            dc_gain: read("compensator.shunt.dc-gain"),
            gain_bandwidth_hz: read("compensator.shunt.gain-bandwidth"),
            least_current: read("compensator.shunt.least-current"),
            least_voltage: read("compensator.shunt.least-voltage"),
            ratios,
            supply: read("compensator.opto.supply"),
            saturation: read("compensator.opto.saturation"),
            capacitance,
            led_drop: read("compensator.opto.led-drop"),
            led_resistance: read("compensator.opto.led-resistance"),
            led_supply,
            has_series_resistor: super::shunt_entries::has_series_resistor(kind, choices),
            keeps_led_resistor: chosen(choices, "compensator.opto.kept") == "led-resistor",
        }
    }

    /// The nominal transfer ratio.
    pub fn ratio(&self) -> f64 {
        self.ratios[1]
    }

    /// Whether the LED's supply follows the output.
    pub fn has_fast_path(&self) -> bool {
        !matches!(self.led_supply, LedSupply::Fixed(_))
    }

    /// Share of the LED branch's current that flows in the LED, the rest in the bias resistor.
    pub(super) fn led_share(&self, parts: &Parts) -> f64 {
        parts.bias / (parts.bias + self.led_resistance)
    }

    /// Resistance of LED and bias resistor together, in series with the LED resistor [Ω].
    pub(super) fn led_side(&self, parts: &Parts) -> f64 {
        parallel(self.led_resistance, parts.bias)
    }

    /// Control voltage per volt across the LED branch below all corners, nominal ratio: the gain of the fast path [V/V].
    pub(super) fn branch_gain(&self, parts: &Parts) -> f64 {
        self.ratio() * self.led_share(parts) * parts.pull_up / (parts.led + self.led_side(parts))
    }

    /// The LED resistor for a gain of the fast path [Ω]; negative where LED and bias resistor leave too little.
    pub(super) fn led_for(&self, parts: &Parts, gain: f64) -> f64 {
        self.ratio() * self.led_share(parts) * parts.pull_up / gain - self.led_side(parts)
    }

    /// Voltage that feeds the LED [V] while the output is at its own.
    pub fn led_supply_voltage(&self, output: f64) -> f64 {
        if let LedSupply::Fixed(volts) = self.led_supply { volts } else { output }
    }

    /// What of the entries contradicts itself, whatever the stage does; `output` is the regulated voltage [V].
    pub(super) fn problems(&self, kind: Kind, parts: &Parts, output: f64) -> Vec<Finding> {
        let mut problems = Vec::new();
        if kind == Kind::One && self.has_fast_path() {
            problems.push(type_one());
        }
        problems.extend(self.ratio_order());
        let volts = |v| print(v, Unit::Volt);
        if self.saturation >= self.supply {
            let message = format!(
                "The pull-up's supply, {}, is not above the saturation voltage, {}: the control voltage cannot move.",
                volts(self.supply),
                volts(self.saturation)
            );
            problems.push(
                Finding::problem("compensator.opto.supply", message).with_hint("enter the controller's supply voltage"),
            );
            return problems;
        }
        problems.extend(self.no_voltage(output).or_else(|| self.no_current(parts, output)));
        problems
    }

    fn ratio_order(&self) -> Vec<Finding> {
        let [least, nominal, greatest] = self.ratios;
        let ratio = |r| print(r, Unit::Fraction);
        let wrong = |end: &str, word: &str, value: f64| {
            let message = format!(
                "The {end} transfer ratio, {}, must not be {word} the nominal one, {}.",
                ratio(value),
                ratio(nominal)
            );
            Finding::problem(format!("compensator.opto.transfer-ratio.{end}"), message)
                .with_hint("least, nominal and greatest stand in rising order")
        };
        let mut problems = Vec::new();
        problems.extend((least > nominal).then(|| wrong("least", "above", least)));
        problems.extend((greatest < nominal).then(|| wrong("greatest", "below", greatest)));
        problems
    }

    /// A supply too low for LED and regulator in series.
    fn no_voltage(&self, output: f64) -> Option<Finding> {
        let feed = self.led_supply_voltage(output);
        if feed > self.led_drop + self.least_voltage {
            return None;
        }
        let (from, place) = match self.led_supply {
            LedSupply::Fixed(_) => ("supply", "compensator.opto.led-supply"),
            _ => ("output", "compensator.shunt.least-voltage"),
        };
        let message = format!(
            "The LED's {from} of {} leaves nothing for the LED resistor: the LED drops {} and the regulator keeps {} at least.",
            print(feed, Unit::Volt),
            print(self.led_drop, Unit::Volt),
            print(self.least_voltage, Unit::Volt)
        );
        Some(
            Finding::problem(place, message)
                .with_hint("feed the LED from a higher fixed supply, or choose a regulator for a lower voltage"),
        )
    }

    /// A regulator that never gets its least current: through the LED resistor at most, or because the pull-up asks for none.
    fn no_current(&self, parts: &Parts, output: f64) -> Option<Finding> {
        let amperes = |a| print_digits(a, Unit::Ampere, 3);
        let most = self.greatest_cathode_current(parts, output);
        if most < self.least_current {
            let message = format!(
                "An LED resistor of {} lets {} through at most, and the regulator needs {} at least.",
                print(parts.led, Unit::Ohm),
                amperes(most),
                amperes(self.least_current)
            );
            return Some(
                Finding::problem("compensator.opto.led-resistor", message).with_hint("lower the LED resistor"),
            );
        }
        let least_ratio = self.ratios[0];
        let led = (self.supply - self.saturation) / (parts.pull_up * least_ratio);
        let asked = self.cathode_current(parts, led);
        if asked >= self.least_current {
            return None;
        }
        let message = format!(
            "A pull-up of {} asks the LED for {} at most and the bias resistor adds {}: the regulator needs {} at least and does not regulate at any control voltage.",
            print(parts.pull_up, Unit::Ohm),
            amperes(led),
            amperes(asked - led),
            amperes(self.least_current)
        );
        let finding = Finding::problem("compensator.opto.pull-up", message).with_hint(
            "lower the bias resistor, so that the LED's drop gives the regulator its current, or the pull-up",
        );
        Some(match self.bias_remedy() {
            Some(remedy) => finding.with_remedy(remedy),
            None => finding,
        })
    }

    /// A bias resistor that gives the regulator its least current with the LED dark.
    pub fn bias_remedy(&self) -> Option<Remedy> {
        let least_ohms = self.led_drop / self.least_current;
        // A twentieth less, so that the nearest value does not stand above what is needed.
        let value = super::preferred::Series::E24.nearest(least_ohms / 1.05);
        (value <= least_ohms).then(|| Remedy {
            label: format!("Set the bias resistor to {}", print(value, Unit::Ohm)),
            values: vec![("compensator.opto.bias-resistor".to_owned(), value)],
            choices: Vec::new(),
        })
    }
}

/// A type I beside a fast path.
fn type_one() -> Finding {
    let message =
        "Beside the fast path the integrator has a zero at 1 / (2π · Rupper · C1): that is a type II, not a type I.";
    Finding::problem("compensator.type", message)
        .with_hint("choose type II, or feed the LED from a fixed supply")
        .with_remedy(Remedy {
            label: "Choose type II".to_owned(),
            values: Vec::new(),
            choices: vec![("compensator.type".to_owned(), "2".to_owned())],
        })
}
