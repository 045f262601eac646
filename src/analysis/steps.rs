//! Load, line and reference steps of the closed loop, exact on their time grid.
//!
//! *Conventions*: an event starts at t = 0 and ramps at its slew; deviation is the signed extreme against the value
//! before; settling is the last exit from the band around the final value. Linear prediction: limits of amplifier and
//! duty ratio do not act, and the results say so where they would.

use super::motion::Motion;
use super::result::{Step, StepFigures, Steps};
use crate::design::{CheckedDesign, Event};
use crate::linear::{LinearError, RampStep};
use std::f64::consts::TAU;

/// Columns of the closed loop's inputs.
const LOAD: usize = 0;
const LINE: usize = 1;
const REFERENCE: usize = 2;
/// Rows of its outputs.
const OUTPUT: usize = 0;
const CONTROL: usize = 1;

/// A time plot reaches this many times past the settling.
const BEYOND_SETTLING: f64 = 1.6;
/// … and shows at least this many radians of the crossover.
const LEAST_RADIANS: f64 = 12.0;

fn ramp(event: Event) -> RampStep {
    RampStep { from: 0.0, to: event.change, rise_s: event.rise_s() }
}

fn band_v(design: &CheckedDesign) -> f64 {
    design.events.settling_band * design.stage.output_voltage
}

/// Deviation and settling of the load step of one condition.
///
/// # Errors
/// As taking the closed loop apart into its modes.
pub(super) fn load_figures(design: &CheckedDesign, modes: &Motion) -> Result<StepFigures, LinearError> {
    let metrics = modes.settle(LOAD, OUTPUT, ramp(design.events.load_step), band_v(design))?;
    Ok(StepFigures { deviation_v: metrics.deviation, settling_s: metrics.settling_s })
}

/// The three steps with their curves, from the closed loop's modes. `at_rest` are the load's voltage and the control voltage that hold
/// the condition [V].
///
/// # Errors
/// As taking the response from the modes.
pub(super) fn steps(
    design: &CheckedDesign,
    modes: &Motion,
    crossover_hz: Option<f64>,
    at_rest: (f64, f64),
    points: usize,
) -> Result<Steps, LinearError> {
    let (before, control_voltage) = at_rest;
    let context = Context { modes, design, crossover_hz, before, control_voltage, points };
    let events = &design.events;
    // The reference step is stated at the output; the loop takes it at the reference.
    let scale = design.compensator.reference / design.compensator.dc_output_voltage();
    Ok(Steps {
        load: context.step(LOAD, events.load_step, 1.0)?,
        line: context.step(LINE, events.line_step, 1.0)?,
        reference: context.step(REFERENCE, events.reference_step, scale)?,
    })
}

struct Context<'a> {
    modes: &'a Motion,
    design: &'a CheckedDesign,
    crossover_hz: Option<f64>,
    /// Load's voltage before the event [V].
    before: f64,
    control_voltage: f64,
    points: usize,
}

impl Context<'_> {
    fn step(&self, input: usize, event: Event, scale: f64) -> Result<Option<Step>, LinearError> {
        if event.change == 0.0 || self.points < 2 {
            return Ok(None);
        }
        let change = ramp(Event { change: event.change * scale, slew: event.slew * scale });
        let band = band_v(self.design);
        let metrics = self.modes.settle(input, OUTPUT, change, band)?;
        let span = self.span_s(metrics.settling_s, change.rise_s);
        let grid = self.modes.grid(span, self.points);
        let before = self.before;
        let output = self.modes.curve(input, OUTPUT, change, grid)?;
        let control = self.modes.curve(input, CONTROL, change, grid)?;
        let extreme = |pick: fn(f64, f64) -> f64| self.control_voltage + control.iter().copied().fold(0.0, pick);
        Ok(Some(Step {
            times_s: grid.times_s(),
            output_v: output.iter().map(|v| before + v).collect(),
            deviation_v: metrics.deviation,
            deviation_at_s: metrics.deviation_time_s,
            settling_s: metrics.settling_s,
            initial_v: before,
            final_v: before + metrics.final_value,
            band_v: band,
            control_v: (extreme(f64::min), extreme(f64::max)),
            size: event.change,
            rise_s: change.rise_s,
        }))
    }

    /// How long the plot runs: past the settling, and some turns of the crossover.
    fn span_s(&self, settling_s: Option<f64>, rise_s: f64) -> f64 {
        let turns = self.crossover_hz.map_or(0.0, |f| LEAST_RADIANS / (TAU * f));
        let span = (BEYOND_SETTLING * settling_s.unwrap_or(0.0)).max(turns).max(2.0 * rise_s);
        if span > 0.0 { span } else { 1000.0 / self.design.stage.switching_frequency }
    }
}
