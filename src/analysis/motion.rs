//! How a stable closed loop moves: by its modes, or from sample to sample.

use crate::linear::{LinearError, Modes, RampStep, SampledInput, SampledLoop, SampledOutput, StepMetrics, UniformGrid};

/// Column of the reference among the closed loop's inputs.
const REFERENCE: usize = 2;
/// Row of the output among the closed loop's outputs.
const OUTPUT: usize = 0;

/// A stable closed loop, ready for time responses. Inputs: load current, input voltage, reference; outputs: the load's voltage, the control voltage.
#[derive(Clone, Debug)]
pub enum Motion {
    /// A continuous loop by its modes.
    Continuous(Modes),
    /// A loop with a difference equation. Its reference counts as the change it asks of the output.
    Sampled(Box<SampledMotion>),
}

/// A sampled loop with its reference.
#[derive(Clone, Debug)]
pub struct SampledMotion {
    /// The exact map; event inputs load current and input voltage, outputs the sensed and the load's voltage.
    pub map: SampledLoop,
    /// Output voltage over reference.
    pub reference_scale: f64,
}

impl SampledMotion {
    fn ports(&self, input: usize, output: usize, event: RampStep) -> (SampledInput, SampledOutput, RampStep) {
        let output = if output == OUTPUT { SampledOutput::Output(1) } else { SampledOutput::Control };
        if input == REFERENCE {
            let scale = self.reference_scale;
            let event = RampStep { from: event.from * scale, to: event.to * scale, ..event };
            (SampledInput::Reference, output, event)
        } else {
            (SampledInput::Event(input), output, event)
        }
    }
}

impl Motion {
    /// Deviation and settling of one output for one event; `band` is half the band's width.
    ///
    /// # Errors
    /// As the responses of either kind.
    pub fn settle(&self, input: usize, output: usize, event: RampStep, band: f64) -> Result<StepMetrics, LinearError> {
        match self {
            Motion::Continuous(modes) => modes.settle(input, output, event, band),
            Motion::Sampled(sampled) => {
                let (input, output, event) = sampled.ports(input, output, event);
                sampled.map.settle(input, output, event, band)
            }
        }
    }

    /// Evenly spaced times over a span [s]; those of a sampled loop fall on parts of its period.
    pub fn grid(&self, span_s: f64, points: usize) -> UniformGrid {
        match self {
            Motion::Continuous(_) => UniformGrid { step_s: span_s / (points - 1) as f64, count: points },
            Motion::Sampled(sampled) => sampled.map.grid(span_s, points),
        }
    }

    /// Values of one output on the grid for one event, as deviations from rest.
    ///
    /// # Errors
    /// As the responses of either kind.
    pub fn curve(
        &self,
        input: usize,
        output: usize,
        event: RampStep,
        grid: UniformGrid,
    ) -> Result<Vec<f64>, LinearError> {
        match self {
            Motion::Continuous(modes) => modes.curve(input, output, event, grid),
            Motion::Sampled(sampled) => {
                let (input, output, event) = sampled.ports(input, output, event);
                sampled.map.curve(input, output, event, grid)
            }
        }
    }
}
