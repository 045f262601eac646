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

/// Of a limit's span, what counts as being there.
const AT_LIMIT: f64 = 1e-12;

/// A limiter that has to change its side, and to which.
pub(super) fn other_side(plant: &Plant, mode: &Mode, z: &[f64], sides: &[Side]) -> Option<(usize, Side)> {
    for (i, (limiter, side)) in plant.limiters.iter().zip(sides).enumerate() {
        let held = &mode.held[i];
        let signal = dot(&held.signal, &z[..held.signal.len()]);
        let (least, greatest) = (limiter.least, limiter.greatest);
        let next = match limiter.act {
            Act::Sink { .. } => {
                if signal > 0.0 {
                    Side::Greatest
                } else {
                    Side::Free
                }
            }
            Act::Saturate => {
                if signal > greatest {
                    Side::Greatest
                } else if signal < least {
                    Side::Least
                } else {
                    Side::Free
                }
            }
            Act::Hold => {
                let rate = dot(&held.rate, &z[..held.rate.len()]);
                let close = AT_LIMIT * (greatest.abs().min(1e3) + least.abs().min(1e3));
                match side {
                    Side::Free if signal > greatest + close || signal >= greatest - close && rate > 0.0 => {
                        Side::Greatest
                    }
                    Side::Free if signal < least - close || signal <= least + close && rate < 0.0 => Side::Least,
                    Side::Greatest if rate < 0.0 => Side::Free,
                    Side::Least if rate > 0.0 => Side::Free,
                    _ => *side,
                }
            }
        };
        if next != *side {
            return Some((i, next));
        }
    }
    None
}
