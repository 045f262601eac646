//! Interleaved phases of a switched system: it works on a share T/N of the switching period, at whose end the phases are renamed.
//!
//! *Conventions*: phase k is the one whose switch closed k shares ago. The orbit sought is the one in which all phases are alike; what is
//! read of it, differences between the phases included, is read about that orbit.

use super::orbit::Orbit;
use super::stress::Figures;
use super::system::{Rule, SwitchedSystem};
use super::waveforms::SteadyWaveforms;
use crate::control::{ControlLaw, Edge, Mode};
use crate::converter::{Interleaved, not_followed};
use crate::finding::Finding;
use nalgebra::DMatrix;

/// Phases of a switched system whose period is a share of the switching period.
#[derive(Clone, Debug, PartialEq)]
pub struct Interleaving {
    /// How many there are.
    pub phases: usize,
    /// How many conduct all the time.
    pub always: usize,
    /// Probes that answer alike for each phase, by phase.
    pub turns: Vec<Vec<usize>>,
}

impl Interleaving {
    pub(super) fn new(interleaved: &Interleaved) -> Self {
        Interleaving { phases: interleaved.phases, always: interleaved.always, turns: interleaved.turns.clone() }
    }

    /// The row that a probe has so many shares later, under the names that hold then.
    fn later(&self, row: usize, shares: usize) -> usize {
        let found = self.turns.iter().find_map(|turn| {
            let place = turn.iter().position(|own| *own == row)?;
            turn.get((place + shares) % turn.len().max(1))
        });
        found.copied().unwrap_or(row)
    }

    /// A whole switching period from the waveforms of a share of it.
    pub(super) fn repeated(&self, share: &SteadyWaveforms, share_s: f64) -> SteadyWaveforms {
        let shares = || 0..self.phases;
        let shifted = |at: f64, k: usize| at + share_s * k as f64;
        let trace = |row: usize| {
            shares().flat_map(|k| share.values.get(self.later(row, k)).into_iter().flatten().copied()).collect()
        };
        SteadyWaveforms {
            times_s: shares().flat_map(|k| share.times_s.iter().map(move |at| shifted(*at, k))).collect(),
            values: (0..share.values.len()).map(trace).collect(),
            ramp: share.ramp.as_ref().map(|ramp| shares().flat_map(|_| ramp.iter().copied()).collect()),
            events: shares()
                .flat_map(|k| share.events.iter().map(move |(at, event)| (shifted(*at, k), *event)))
                .collect(),
        }
    }

    /// Figures over a whole switching period from those over a share of it.
    pub(super) fn over_all(&self, figures: &mut [Figures]) {
        for turn in &self.turns {
            let of: Vec<Figures> = turn.iter().filter_map(|row| figures.get(*row)).copied().collect();
            let count = of.len() as f64;
            let all = Figures {
                least: of.iter().map(|f| f.least).fold(f64::INFINITY, f64::min),
                greatest: of.iter().map(|f| f.greatest).fold(f64::NEG_INFINITY, f64::max),
                mean: of.iter().map(|f| f.mean).sum::<f64>() / count,
                rms: (of.iter().map(|f| f.rms * f.rms).sum::<f64>() / count).sqrt(),
            };
            for row in turn {
                if let Some(own) = figures.get_mut(*row) {
                    *own = all;
                }
            }
        }
    }
}

/// Renames states of the phases as a share ends: the last becomes the first, the others grow older by one.
pub(super) fn rename(rotation: &mut DMatrix<f64>, ring: &[usize]) {
    for (to, from) in ring.iter().zip(ring.iter().cycle().skip(ring.len().saturating_sub(1))) {
        rotation[(*to, *to)] = 0.0;
        rotation[(*to, *from)] = 1.0;
    }
}

/// Refuses several phases under a law that is not followed for them.
pub(super) fn followed(interleaved: Option<&Interleaved>, law: &ControlLaw) -> Result<(), Finding> {
    match (&law.mode, interleaved) {
        (_, None) | (Mode::Voltage(_) | Mode::Current(Edge::Peak, _), _) => Ok(()),
        _ => Err(not_followed("they are in voltage mode and peak current mode only")),
    }
}

impl SwitchedSystem {
    /// Period of each switch [s]: that of the system, with several phases so many times that.
    pub fn switching_period_s(&self) -> f64 {
        self.period_s * self.interleaving.as_ref().map_or(1.0, |i| i.phases as f64)
    }

    /// For how long after the clock a switch conducts that has not conducted since the clock before [s], from the duty ratio.
    pub(super) fn opens_at(&self, duty: f64) -> f64 {
        duty * self.switching_period_s() - self.since()
    }

    /// How long the switch that opens has conducted as the clock comes [s].
    pub(super) fn since(&self) -> f64 {
        self.period_s * self.interleaving.as_ref().map_or(0.0, |i| i.always as f64)
    }
}

impl Orbit {
    /// Refuses an orbit in which a phase switches outside the share of the period in which it was taken to.
    pub(super) fn within_share(&self) -> Result<(), Finding> {
        let (Some(interleaving), Rule::Compared(comparator)) = (&self.system.interleaving, &self.system.rule) else {
            return Ok(());
        };
        if interleaving.always > 0 && self.phases.iter().any(|phase| phase.length_s < 0.0) {
            let delay = if comparator.delay_s > 0.0 { ", or its comparator's delay reaches back to it" } else { "" };
            return Err(not_followed(&format!("a switch opens just as that of another phase closes{delay}")));
        }
        Ok(())
    }
}
