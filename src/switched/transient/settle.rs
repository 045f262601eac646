//! What configuration and which sides states ask for that may have jumped.

use super::super::Configuration;
use super::flow::dot;
use super::mode::{Mode, Side};
use super::plant::{Act, Plant};

/// The configuration the states ask for, where it is another: the rectifier opens without current, and closes where it would get one.
pub(super) fn other_configuration(plant: &Plant, mode: &Mode, z: &[f64], now: Configuration) -> Option<Configuration> {
    let rest = plant.rest.as_ref()?;
    let rate = dot(&mode.wake, &z[..mode.wake.len()]);
    match now {
        Configuration::Freewheeling => {
            let current = dot(rest, &z[..rest.len()]);
            (current < 0.0 || current <= 0.0 && rate <= 0.0).then_some(Configuration::Resting)
        }
        Configuration::Resting => (rate > 0.0).then_some(Configuration::Freewheeling),
        Configuration::Conducting => None,
    }
}

/// Of what a signal is summed from, this share is rounding.
const ROUNDING: f64 = 1e-12;

/// A signal, and what of it is rounding.
fn read(row: &[f64], z: &[f64]) -> (f64, f64) {
    let size: f64 = row.iter().zip(z).map(|(r, x)| (r * x).abs()).sum();
    (dot(row, &z[..row.len()]), ROUNDING * size)
}

/// A limiter that has to change its side, and to which. Within rounding it stays where it is.
pub(super) fn other_side(plant: &Plant, mode: &Mode, z: &[f64], sides: &[Side]) -> Option<(usize, Side)> {
    for (i, (limiter, side)) in plant.limiters.iter().zip(sides).enumerate() {
        let held = &mode.held[i];
        let (signal, close) = read(&held.signal, z);
        let (least, greatest) = (limiter.least, limiter.greatest);
        let next = match (limiter.act, side) {
            (Act::Sink { .. }, _) if signal > close => Side::Greatest,
            (Act::Sink { .. }, _) if signal < -close => Side::Free,
            (Act::Saturate, _) if signal > greatest + close => Side::Greatest,
            (Act::Saturate, _) if signal < least - close => Side::Least,
            (Act::Saturate, _) if signal < greatest - close && signal > least + close => Side::Free,
            (Act::Hold, _) => {
                let (rate, still) = read(&held.rate, z);
                match side {
                    Side::Free if signal > greatest + close || signal >= greatest - close && rate > still => {
                        Side::Greatest
                    }
                    Side::Free if signal < least - close || signal <= least + close && rate < -still => Side::Least,
                    Side::Greatest if rate < -still => Side::Free,
                    Side::Least if rate > still => Side::Free,
                    _ => *side,
                }
            }
            _ => *side,
        };
        if next != *side {
            return Some((i, next));
        }
    }
    None
}
