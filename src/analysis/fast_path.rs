//! The fast path of isolated feedback in the loop: what its LED is fed from, and the loop gain over both paths.
//!
//! *Conventions.* The slow path reads the regulated voltage, the fast one the voltage its LED is fed from. Where both are one voltage, the
//! loop gain is plant × compensator like any; where they are not, T = P·Cs + Pf·Cf with Pf the plant to the LED's supply. Signs of
//! the negative feedback are taken out.

use super::loop_model::{LoopModel, wire};
use crate::compensator::{FAST, LedSupply};
use crate::control::CONTROL;
use crate::converter::signals::{BANK_VOLTAGE, LOAD_VOLTAGE, OUTPUT_VOLTAGE};
use crate::design::CheckedDesign;
use crate::linear::{Complex, FactoredResponse, FrequencyResponse, LinearError, Port, StateSpace, Zpk};

/// A fast path.
#[derive(Clone, Debug)]
pub struct FastPath {
    /// The stage's output that feeds the LED.
    pub signal: &'static str,
    /// Whether that is another voltage than the regulated one.
    pub apart: bool,
    /// −vc/vout and −vc/fast.
    pub paths: [FactoredResponse; 2],
}

impl FastPath {
    /// The fast path of a design; none where its compensator has none.
    ///
    /// # Errors
    /// As the reduction to zeros and poles.
    pub(super) fn new(design: &CheckedDesign, compensator: &StateSpace) -> Result<Option<Self>, LinearError> {
        let Some(regulator) = design.compensator.isolated() else { return Ok(None) };
        let at_load = design.stage.second_stage.as_ref().map(|second| second.sensed_at_load);
        let (signal, apart) = match regulator.led_supply {
            LedSupply::Fixed(_) => return Ok(None),
            LedSupply::Load => (LOAD_VOLTAGE, at_load == Some(false)),
            LedSupply::Bank => (BANK_VOLTAGE, at_load == Some(true)),
        };
        let path = |input: &str| -> Result<FactoredResponse, LinearError> {
            let zpk = Zpk::from_state_space(compensator, 0, compensator.need_input(input)?)?;
            Ok(FactoredResponse::new(zpk.scaled(-1.0), 0.0))
        };
        Ok(Some(FastPath { signal, apart, paths: [path("vout")?, path(FAST)?] }))
    }

    /// The loop gain over both paths, without the control voltage's delay.
    ///
    /// # Errors
    /// As the joining of systems.
    pub(super) fn loop_gain(&self, stage: &StateSpace, compensator: &StateSpace) -> Result<Zpk, LinearError> {
        const STAGE: usize = 0;
        const COMPENSATOR: usize = 1;
        let open = StateSpace::connect(
            &[stage, compensator],
            &[wire(STAGE, OUTPUT_VOLTAGE, COMPENSATOR, "vout", 1.0), wire(STAGE, self.signal, COMPENSATOR, FAST, 1.0)],
            &[Port { name: CONTROL, part: STAGE, port: CONTROL }],
            &[Port { name: "control voltage", part: COMPENSATOR, port: "vc" }],
        )?;
        Ok(Zpk::from_state_space(&open, 0, 0)?.scaled(-1.0))
    }
}

/// What the feedback reads from one input of the controlled stage: the regulated voltage alone, or the sum over both paths.
#[derive(Clone, Debug)]
pub(super) struct Fed {
    sensed: FactoredResponse,
    fast: Option<(FactoredResponse, [FactoredResponse; 2])>,
}

impl Fed {
    /// From an input of a loop's controlled stage.
    ///
    /// # Errors
    /// As the reduction to zeros and poles.
    pub(super) fn new(model: &LoopModel, input: &str) -> Result<Self, LinearError> {
        let from = |output: &str| model.open_loop(output, input).map(|zpk| FactoredResponse::new(zpk, 0.0));
        let fast = match &model.apart {
            Some(path) => Some((from(path.signal)?, path.paths.clone())),
            None => None,
        };
        Ok(Fed { sensed: from(OUTPUT_VOLTAGE)?, fast })
    }

    /// Its value at a frequency [Hz]: volts of the regulated voltage, or of the control voltage that both paths ask for. Only
    /// ratios of two such values mean the same in both cases.
    pub(super) fn at_hz(&self, f: f64) -> Complex {
        let sensed = self.sensed.at_hz(f);
        match &self.fast {
            None => sensed,
            Some((fast, [slow_path, fast_path])) => sensed * slow_path.at_hz(f) + fast.at_hz(f) * fast_path.at_hz(f),
        }
    }
}
