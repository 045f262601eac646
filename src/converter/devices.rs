//! Currents of one switch and one rectifier, also where several take turns, and what a magnetising current adds to a switch's.
//!
//! *Conventions*: in a double-ended stage every switch conducts in every second pulse; a rectifier at a centre tap conducts in every
//! second pulse, and half of the current between pulses.

use super::buck_derived::COMMUTATION;
use super::drawing::RECTIFIER;
use super::further::Further;
use super::operating_point::{CurrentFigures, Solution};
use super::stage::Stage;
use super::waves::{Flows, Waves, figures_of_lines};
use crate::quantity::Unit;

/// While the switch conducts.
const PULSE: Flows = [true, false, false];

/// Figures of the devices at one operating point.
pub(super) struct Devices {
    pub(super) switch: CurrentFigures,
    pub(super) rectifier: CurrentFigures,
    /// Ramp that the magnetising current adds to what is sensed, in amperes of switched current [A/s].
    pub(super) natural_ramp: f64,
    pub(super) further: Vec<Further>,
}

impl CurrentFigures {
    /// The current of one of several devices that carry this in turn.
    fn in_turn(self, devices: f64) -> Self {
        let least = if devices > 1.0 { self.least.min(0.0) } else { self.least };
        CurrentFigures { average: self.average / devices, rms: self.rms / devices.sqrt(), least, ..self }
    }

    /// This current and another, never at a time.
    fn and_then(self, other: Self) -> Self {
        CurrentFigures {
            average: self.average + other.average,
            ripple: self.ripple.max(other.ripple),
            peak: self.peak.max(other.peak),
            least: self.least.min(other.least),
            rms: self.rms.hypot(other.rms),
        }
    }
}

impl Stage {
    /// Figures of switch and rectifier, of one where several are alike.
    pub(super) fn devices(&self, waves: &Waves<'_>, solution: &Solution) -> Devices {
        let sets = solution.intervals.sets;
        let lines = |name: &str| {
            let flows = [sets.on, sets.off, sets.idle].map(|closed| closed.contains(&name));
            self.rows.switch(name).map(|switch| waves.lines(&[switch.row], flows)).unwrap_or_default()
        };
        let pulses = f64::from(self.topology().pulses);
        let of_one = |figures: CurrentFigures| figures.of_one_phase(self.phases).in_turn(pulses);
        let mut carried = lines(sets.switch);
        let volts =
            solution.intervals.natural.and_then(|(row, _)| waves.lines(&[row], PULSE).first().map(|line| line.0));
        let swing = volts.map(|volts| volts * solution.duty / (self.switching_frequency * self.magnetising));
        if let (Some(line), Some(swing)) = (carried.first_mut(), swing) {
            // From nothing where the core is reset, from side to side where the flux alternates.
            line.0 += swing * (self.topology().magnetising_ramp - 0.5);
            line.1 += swing;
        }
        let natural_ramp = solution.intervals.natural.zip(volts).map_or(0.0, |((_, per_volt), volts)| per_volt * volts);
        let mut rectifier = figures_of_lines(&lines(sets.rectifier));
        let of_pulse = sets.on.iter().find(|name| name.contains(RECTIFIER)).filter(|_| pulses > 1.0);
        rectifier = match of_pulse {
            Some(name) => figures_of_lines(&lines(name)).in_turn(pulses).and_then(rectifier.of_one_phase(pulses)),
            None => rectifier.of_one_phase(self.phases),
        };
        let further = self.of_transformer(solution, swing, volts);
        Devices { switch: of_one(figures_of_lines(&carried)), rectifier, natural_ramp, further }
    }

    fn of_transformer(&self, solution: &Solution, swing: Option<f64>, volts: Option<f64>) -> Vec<Further> {
        let mut further = Vec::new();
        if self.topology().switching.len() > 1 {
            let word = solution.intervals.sets.name;
            further.push(Further::word(
                "region",
                "Region",
                word,
                "Which switches take turns at this input and output voltage.",
            ));
        }
        if self.topology().pulses > 1 {
            let help = "Two pulses per period of one switch. The duty ratio is a share of a pulse's period, and all limits are those of this frequency.";
            further.push(Further::number("pulse-frequency", "Pulses", self.switching_frequency, Unit::Hertz, help));
        }
        if let Some(swing) = swing {
            let help = "Swing of the transformer's magnetising current, peak to peak, at the primary; it is in the switch's peak.";
            further.push(Further::number("magnetising-swing", "Magnetising swing", swing, Unit::Ampere, help));
        }
        let delayed = solution.pulse.is_none();
        let ohms = self.slot_named(COMMUTATION).filter(|_| delayed).unwrap_or(0.0);
        if let Some(volts) = volts.filter(|_| ohms > 0.0) {
            let current = (&solution.intervals.cell.c * &solution.x)[0];
            let lost = ohms * current / (self.ratio * volts);
            let help =
                "Share of the period by which the leakage inductance delays every pulse; it is in the duty ratio.";
            further.push(Further::number("duty-lost", "Duty lost at leakage", lost, Unit::Fraction, help));
        }
        further
    }
}
