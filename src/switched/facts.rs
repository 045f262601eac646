//! What ripple at the comparator does to a loop, in numbers.
//!
//! *Conventions*: slopes at the comparator [V/s], just ahead of its trip. With the slope S at which the margin would fall were the
//! control voltage still, and the slope g·vc' that its ripple adds, m = S/(S − g·vc'). In a voltage-mode buck whose output does
//! not jump the loop then runs at m·T/(1 + m·Σ T(ω + k·ωs)) in place of T (exact; the sum runs over all k but 0). Where the output
//! jumps with the switched current (a bank fed by the rectifier alone), the jump is a feedback of current: `step_resistance`
//! volts per ampere, positive where it un-damps the resonance.

use super::orbit::Orbit;
use super::phase::{Event, after};
use super::response::Response;
use super::stress::Figures;
use crate::control::Edge;
use crate::finding::Finding;

/// A product of compensator and plant that is still this large at the switching frequency lets ripple reach the comparator: the loop
/// that runs is then not the product. Found over voltage-mode designs as the level of a few per cent of gain.
pub const RIPPLE_WARNING: f64 = 0.03;

/// What ripple at the comparator does to a loop.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RippleFacts {
    /// Slope at which the margin would fall were the control voltage still [V/s].
    pub still_slope: f64,
    /// Slope that the control voltage's ripple adds at the trip [V/s].
    pub ripple_slope: f64,
    /// Peak to peak of the control voltage [V].
    pub control_swing: f64,
    /// Height of the ramp over a period, or of what is compared with the control voltage in current mode [V].
    pub compared_swing: f64,
    /// Jump of the sensed output voltage as the switch opens, in peak current and voltage mode, or closes [V].
    pub output_step: f64,
    /// Jump of the sensed output voltage per ampere of switched current as the switch opens [Ω]; zero for a bank that sees no switched
    /// current.
    pub step_resistance: f64,
}

impl RippleFacts {
    /// Slope factor m: what ripple at the comparator multiplies the loop's gain with.
    pub fn slope_factor(&self) -> f64 {
        self.still_slope / (self.still_slope - self.ripple_slope)
    }

    /// Of a closed loop; none without a comparator.
    ///
    /// # Errors
    /// As [`Orbit::figures`].
    pub fn new(response: &Response) -> Result<Option<Self>, Finding> {
        let orbit = response.orbit();
        let (system, inputs) = (&orbit.system, &orbit.inputs);
        let Some((comparator, place)) = orbit.comparator() else { return Ok(None) };
        let (Some(phase), Some(x)) = (orbit.phases.get(place), orbit.ends.get(place)) else { return Ok(None) };
        let piece = system.piece(phase.configuration);
        let figures = orbit.figures()?;
        let swing = |row: usize| figures.get(row).map_or(0.0, Figures::swing);
        // What of the compared voltage is the control voltage's; with an inner amplifier all of it counts as such.
        let control = system.input(super::system::inputs::CONTROL).unwrap_or_default();
        let gain = piece.d[(comparator.row, control)];
        let row = if gain == 0.0 { comparator.row } else { system.places.control_voltage };
        let gain = if gain == 0.0 { 1.0 } else { gain };
        let rates = piece.rates(x, inputs);
        let slope: f64 = piece.c.row(row).iter().zip(rates.iter()).map(|(c, x)| c * x).sum();
        let sense = if comparator.edge == Edge::Peak { 1.0 } else { -1.0 };
        let ripple_slope = sense * gain * slope;
        let still_slope = ripple_slope - sense * response.margin_slope();
        let ramp = system.ramp_rate(inputs).abs() * system.switching_period_s();
        let compared_swing = if row == comparator.row { ramp } else { swing(comparator.row).max(ramp) };
        let (output_step, step_resistance) = output_step(orbit);
        Ok(Some(RippleFacts {
            still_slope,
            ripple_slope,
            control_swing: gain.abs() * swing(row),
            compared_swing,
            output_step,
            step_resistance,
        }))
    }
}

/// Jump of the sensed output at the switches' event, and per ampere of switched current as the switch opens.
fn output_step(orbit: &Orbit) -> (f64, f64) {
    let system = &orbit.system;
    let acts = |event: Event| matches!(event, Event::Switch | Event::Given);
    let Some(place) = orbit.phases.iter().position(|phase| acts(phase.end)) else { return (0.0, 0.0) };
    let (Some(phase), Some(x)) = (orbit.phases.get(place), orbit.ends.get(place)) else { return (0.0, 0.0) };
    let row = system.places.stage.output_voltage;
    let (before, behind) =
        (system.piece(phase.configuration), system.piece(after(&system.rule, phase.configuration, phase.end)));
    let step = behind.value(row, x, &orbit.inputs) - before.value(row, x, &orbit.inputs);
    // The states that go with one ampere of switched current are what the rest takes away.
    let [conducting, freewheeling, _] = &system.pieces;
    let stopped = nalgebra::DMatrix::identity(system.order(), system.order()) - &system.rest_projector;
    let switched = conducting.c.row(system.places.switched_current);
    let norm = (switched * switched.transpose())[0];
    let ampere = &stopped * switched.transpose() / norm;
    let per_ampere = ((freewheeling.c.row(row) - conducting.c.row(row)) * ampere)[0];
    (step, per_ampere)
}
