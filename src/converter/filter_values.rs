//! Values of the filters as the stage keeps them, and what follows from them without a model.

use super::entries::applies;
use super::filters::{Damping, input_filter, output_filter};
use crate::quantity::Choices;
use std::f64::consts::TAU;

/// The input filter with usable values.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct InputFilter {
    /// Inductance between source and input capacitor [H].
    pub inductance: f64,
    /// The input capacitor [F].
    pub capacitance: f64,
    /// What damps it.
    pub damping: Damping,
    /// Resistor of the damping branch [Ω]; zero without one.
    pub damping_resistance: f64,
    /// Capacitor of a branch across the input capacitor [F]; zero without one.
    pub damping_capacitance: f64,
    /// Inductor of a branch across the filter inductor [H]; zero without one.
    pub damping_inductance: f64,
    /// Resistance of the source [Ω].
    pub source_resistance: f64,
    /// Resistance of the inductor's winding [Ω].
    pub winding: f64,
    /// ESR of the input capacitor [Ω].
    pub esr: f64,
}

impl InputFilter {
    pub(super) fn entered(choices: &Choices, get: &dyn Fn(&str) -> f64) -> Option<Self> {
        let damping = input_filter(choices)?;
        let branch = |what: &str| {
            let path = format!("stage.input-filter.damping.{what}");
            if applies(&path, choices) { get(&path) } else { 0.0 }
        };
        Some(InputFilter {
            inductance: get("stage.input-filter.inductance"),
            capacitance: get("stage.input-capacitor.capacitance"),
            damping,
            damping_resistance: branch("resistance"),
            damping_capacitance: branch("capacitance"),
            damping_inductance: branch("inductance"),
            source_resistance: get("stage.source.resistance"),
            winding: get("stage.input-filter.resistance"),
            esr: get("stage.input-capacitor.esr"),
        })
    }

    /// Undamped resonance 1/(2π·√(L·C)) [Hz].
    pub fn resonance_hz(&self) -> f64 {
        (TAU * (self.inductance * self.capacitance).sqrt()).recip()
    }

    /// Characteristic impedance √(L/C) [Ω].
    pub fn characteristic_impedance(&self) -> f64 {
        (self.inductance / self.capacitance).sqrt()
    }
}

/// The second-stage output filter with usable values.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SecondStage {
    /// Inductance behind the output bank [H].
    pub inductance: f64,
    /// Capacitance at the load [F].
    pub capacitance: f64,
    /// Resistance of inductor and damping resistor to direct current [Ω].
    pub dc_resistance: f64,
    /// Whether the load's voltage is the regulated one; else the bank's is.
    pub sensed_at_load: bool,
}

impl SecondStage {
    pub(super) fn entered(choices: &Choices, get: &dyn Fn(&str) -> f64) -> Option<Self> {
        let filter = output_filter(choices)?;
        let winding = get("stage.output-filter.resistance");
        let across = get("stage.output-filter.damping.resistance");
        Some(SecondStage {
            inductance: get("stage.output-filter.inductance"),
            capacitance: get("stage.output-filter.capacitance"),
            dc_resistance: if filter.damped { winding * across / (winding + across) } else { winding },
            sensed_at_load: filter.sensed_at_load,
        })
    }

    /// Resonance of the inductor with the bank and the second capacitor in series [Hz].
    pub fn resonance_hz(&self, bank_capacitance: f64) -> f64 {
        let capacitance = bank_capacitance * self.capacitance / (bank_capacitance + self.capacitance);
        (TAU * (self.inductance * capacitance).sqrt()).recip()
    }
}
