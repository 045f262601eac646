//! One steady period of every probe.
//!
//! *Conventions*: time counts from the clock's edge [s]. At a switching instant a time stands twice, with the values before and after.
//! With several phases, probes of a part are those of one phase over its whole period; what is sensed and compared is that of the phase whose
//! switch opens within each share of it.

use super::flow::Flow;
use super::orbit::Orbit;
use super::perturbed::left_range;
use super::phase::Event;
use crate::finding::Finding;

/// Fewest parts of a phase that has a length.
const LEAST_PARTS: usize = 4;

/// One steady period.
#[derive(Clone, Debug, PartialEq)]
pub struct SteadyWaveforms {
    /// Instants from the clock's edge [s], not falling.
    pub times_s: Vec<f64>,
    /// Values by probe, in the system's order.
    pub values: Vec<Vec<f64>>,
    /// The ramp that the comparator compares with, where there is one [V].
    pub ramp: Option<Vec<f64>>,
    /// Instants at which something switches, with what does [s].
    pub events: Vec<(f64, Event)>,
}

impl Orbit {
    /// About so many samples of a steady period, spread evenly within each phase.
    ///
    /// # Errors
    /// A finding where an exponential leaves the number range.
    pub fn waveforms(&self, points: usize) -> Result<SteadyWaveforms, Finding> {
        let Some(interleaving) = &self.system.interleaving else { return self.period_waveforms(points) };
        let share = self.period_waveforms(points / interleaving.phases.max(1))?;
        Ok(interleaving.repeated(&share, self.system.period_s))
    }

    fn period_waveforms(&self, points: usize) -> Result<SteadyWaveforms, Finding> {
        let system = &self.system;
        let mut found = SteadyWaveforms {
            times_s: Vec::with_capacity(points),
            values: vec![Vec::with_capacity(points); system.probes.len()],
            ramp: self.comparator().map(|_| Vec::with_capacity(points)),
            events: Vec::new(),
        };
        let rate = system.ramp_rate(&self.inputs);
        for (phase, start) in self.phases.iter().zip(&self.starts) {
            found.events.push((phase.start_s + phase.length_s, phase.end));
            if phase.length_s <= 0.0 {
                continue;
            }
            let share = phase.length_s / system.period_s * points as f64;
            // Fewer than a usize holds by far.
            #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a share of a count")]
            let parts = LEAST_PARTS.max(share as usize);
            let step = phase.length_s / parts as f64;
            let piece = system.piece(phase.configuration);
            let flow = Flow::new(piece, &self.inputs, step).map_err(|error| left_range(&error))?;
            let by_inputs = &piece.d * &self.inputs;
            let mut x = start.clone();
            for k in 0..=parts {
                let at = phase.start_s + step * k as f64;
                found.times_s.push(at);
                let values = &piece.c * &x + &by_inputs;
                for (trace, value) in found.values.iter_mut().zip(values.iter()) {
                    trace.push(*value);
                }
                if let (Some(ramp), Some((comparator, _))) = (&mut found.ramp, self.comparator()) {
                    ramp.push(comparator.valley_v + rate * (at + comparator.since_s));
                }
                x = flow.end(&x);
            }
        }
        Ok(found)
    }
}
