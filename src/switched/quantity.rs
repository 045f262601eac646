//! The quantities of a loop as they are read on the switched system: plant, loop gain, output impedance, line and reference response.
//!
//! *Conventions*: as in the averaged analysis. The loop gain has the sign of the negative feedback taken out: −(returned)/(injected and
//! returned), both at the injected frequency. It is the same at the compensator's input and at its output, because a linear compensator
//! turns an injection ahead of it into one behind it; it is read behind, where every feedback path has joined. The plant is read with
//! the loop open and the output held at its mean. Output impedance counts current drawn by the load as positive.
//! *Source* of Lf/(1 + Ls − Lf): an injected e gives the comparator w = e/(1 + Ls) at its instants, the feedback returns −Lf·w at the
//! injected frequency.

use super::orbit::{Goal, Orbit, Start};
use super::response::{Reading, Response, Scratch, defined};
use super::system::{SwitchedSystem, inputs};
use crate::finding::Finding;
use crate::linear::Complex;

/// What is read.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Quantity {
    /// Control voltage to regulated output voltage, loop open.
    Plant,
    /// Loop gain as an analyser reads it at the injection point.
    LoopGain,
    /// Load voltage from load current, loop closed [Ω].
    OutputImpedance,
    /// Input voltage to load voltage, loop closed.
    LineToOutput,
    /// Reference to load voltage, loop closed.
    ReferenceToOutput,
}

impl Quantity {
    /// All of them.
    pub const ALL: [Quantity; 5] = [
        Quantity::Plant,
        Quantity::LoopGain,
        Quantity::OutputImpedance,
        Quantity::LineToOutput,
        Quantity::ReferenceToOutput,
    ];
}

/// The two loop gains that meet in a loop with a sampler, at one frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SampledLoop {
    /// Ls: what the comparator samples of its own past; 1 + Ls = 0 decides stability.
    pub sampled: Complex,
    /// Lf: what returns at the injected frequency.
    pub drive: Complex,
}

impl SampledLoop {
    /// What an analyser reads of them.
    pub fn read(&self) -> Complex {
        self.drive / (1.0 + self.sampled - self.drive)
    }
}

/// The exact linearisation of a loop at one condition: closed, and open for the plant.
#[derive(Clone, Debug)]
pub struct ExactLoop {
    /// With the loop closed.
    pub closed: Response,
    /// With the loop open and the output held at its mean.
    pub open: Response,
}

impl ExactLoop {
    /// Finds both orbits and linearises them; the open one is held at a mean output voltage [V].
    ///
    /// # Errors
    /// As [`Orbit::find`] and [`Response::new`].
    pub fn new(closed: &SwitchedSystem, open: &SwitchedSystem, start: Start, output: f64) -> Result<Self, Finding> {
        let response = |system, goal| Orbit::find(system, start, goal).and_then(Response::new);
        Ok(ExactLoop { closed: response(closed, Goal::AsDriven)?, open: response(open, Goal::Output(output))? })
    }

    /// Made ready to read a quantity.
    ///
    /// # Errors
    /// As [`Response::reading`].
    pub fn reader(&self, quantity: Quantity) -> Result<Reader<'_>, Finding> {
        match quantity {
            Quantity::Plant => Reader::new(&self.open, quantity),
            _ => Reader::new(&self.closed, quantity),
        }
    }
}

/// A quantity made ready to be read at many frequencies.
#[derive(Clone, Debug)]
pub struct Reader<'a> {
    quantity: Quantity,
    reading: Reading<'a>,
    control_row: usize,
    period_s: f64,
    scratch: Scratch,
}

impl<'a> Reader<'a> {
    /// Reads a quantity off a response; the plant wants an open loop, all else a closed one.
    ///
    /// # Errors
    /// As [`Response::reading`].
    pub fn new(response: &'a Response, quantity: Quantity) -> Result<Self, Finding> {
        let system = &response.orbit().system;
        let places = &system.places;
        let (input, probe) = match quantity {
            Quantity::Plant => (inputs::CONTROL, places.stage.output_voltage),
            Quantity::LoopGain => (inputs::CONTROL, places.control_voltage),
            Quantity::OutputImpedance => (inputs::LOAD_CURRENT, places.stage.load_voltage),
            Quantity::LineToOutput => (inputs::INPUT_VOLTAGE, places.stage.load_voltage),
            Quantity::ReferenceToOutput => (inputs::REFERENCE, places.stage.load_voltage),
        };
        let reading = response.reading(input, &[probe])?;
        let (control_row, period_s) = (places.control_voltage, system.period_s);
        Ok(Reader { quantity, reading, control_row, period_s, scratch: Scratch::default() })
    }

    /// Whether the reading at a frequency [Hz] is defined: not within 1 % of a multiple of half the switching frequency.
    pub fn defined(&self, f_hz: f64) -> bool {
        defined(f_hz, self.period_s)
    }

    /// The quantity at a frequency [Hz]; none where the orbit itself rings there.
    pub fn at(&mut self, f_hz: f64) -> Option<Complex> {
        let mut value = [Complex::ZERO];
        if !self.reading.at(f_hz, &mut self.scratch, &mut value) {
            return None;
        }
        let [value] = value;
        Some(match self.quantity {
            // What was added, and what the compensator returned of it.
            Quantity::LoopGain => (1.0 - value) / value,
            Quantity::OutputImpedance => -value,
            _ => value,
        })
    }

    /// Sampled and drive-frequency loop at a frequency [Hz]; none but for a loop gain whose comparator sees the control voltage.
    pub fn sampled_loop(&mut self, f_hz: f64) -> Option<SampledLoop> {
        if self.quantity != Quantity::LoopGain || self.reading.drives_states() {
            return None;
        }
        let mut value = [Complex::ZERO];
        if !self.reading.at(f_hz, &mut self.scratch, &mut value) {
            return None;
        }
        let at_trip = self.reading.sampled(f_hz, self.control_row, &mut self.scratch)?;
        let returned = value[0] - 1.0;
        Some(SampledLoop { sampled: at_trip.inv() - 1.0, drive: -returned / at_trip })
    }
}
