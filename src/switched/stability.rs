//! Stability of the switched loop: the multipliers of a period, and the name of an instability.
//!
//! *Conventions*: a small change of the orbit is multiplied by μ from period to period; the orbit is stable where every |μ| < 1. A real μ
//! below −1 doubles the period (the fast-scale or subharmonic oscillation), a complex pair outside the circle oscillates slowly
//! beside the switching, a real μ above 1 drifts away. Of interleaved phases the period is that of each switch, and the multipliers are those of
//! what they do alike and of what they do against each other: how their currents share. *Source*: Floquet; Iu & Tse, IEEE Trans. Circuits Syst. I 50 (2003), 679 and
//! El Aroudi et al., Int. J. Bifurcation Chaos 17 (2007), on slow-scale and fast-scale instability (from memory).

use super::response::Response;
use crate::finding::Finding;
use crate::linear::{Complex, eigenvalues};
use std::f64::consts::{PI, TAU};

/// How a small change of the orbit grows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Instability {
    /// Every other period is alike: a real multiplier below −1.
    PeriodDoubling {
        /// The multiplier.
        multiplier: f64,
    },
    /// A slow oscillation beside the switching: a complex pair outside the unit circle.
    SlowScale {
        /// The upper one of the pair.
        multiplier: Complex,
        /// Frequency of the oscillation [Hz].
        frequency_hz: f64,
    },
    /// The orbit drifts away: a real multiplier above 1.
    Drift {
        /// The multiplier.
        multiplier: f64,
    },
}

/// The verdict on an orbit.
#[derive(Clone, Debug, PartialEq)]
pub struct Stability {
    /// The multipliers, greatest first, conjugate pairs adjacent.
    pub multipliers: Vec<Complex>,
    /// The instability of the greatest multiplier; none for a stable orbit.
    pub instability: Option<Instability>,
    /// The real multiplier nearest to −1 from above where the orbit is stable, or below: how far period doubling is away.
    pub nearest_to_doubling: Option<f64>,
}

impl Stability {
    /// The verdict on a linearised orbit.
    ///
    /// # Errors
    /// A finding where the eigenvalues do not converge.
    pub fn new(response: &Response) -> Result<Self, Finding> {
        let mut multipliers = eigenvalues(&response.monodromy()).map_err(|error| {
            Finding::problem("", format!("The multipliers of the switched loop cannot be found: {error}."))
        })?;
        if let Some(interleaving) = &response.orbit().system.interleaving {
            for multiplier in &mut multipliers {
                *multiplier = over_all(*multiplier, interleaving.phases);
            }
        }
        multipliers.sort_by(|p, q| q.norm().total_cmp(&p.norm()).then(q.im.total_cmp(&p.im)));
        let period_s = response.orbit().system.switching_period_s();
        let instability = multipliers.first().filter(|m| m.norm() >= 1.0).map(|m| named(*m, period_s));
        let nearest_to_doubling =
            multipliers.iter().filter(|m| m.im == 0.0 && m.re < 0.0).map(|m| m.re).min_by(f64::total_cmp);
        Ok(Stability { multipliers, instability, nearest_to_doubling })
    }

    /// Whether every small change dies away.
    pub fn stable(&self) -> bool {
        self.instability.is_none()
    }

    /// Greatest magnitude of a multiplier: growth of a small change per period.
    pub fn growth_per_period(&self) -> f64 {
        self.multipliers.first().map_or(0.0, |m| m.norm())
    }
}

/// Multiplier of a whole switching period from that of a share of it; what rounding leaves beside the real axis is taken off.
fn over_all(multiplier: Complex, shares: usize) -> Complex {
    let all = (0..shares).fold(Complex::ONE, |product, _| product * multiplier);
    if all.im.abs() <= ON_THE_AXIS * all.norm() { Complex::new(all.re, 0.0) } else { all }
}

/// A power of a multiplier nearer to the real axis than this share of it is on it.
const ON_THE_AXIS: f64 = 1e-9;
/// A pair nearer than this to the negative axis [rad] counts as doubling that has just begun to turn.
const NEARLY_HALF: f64 = 0.02 * PI;

fn named(multiplier: Complex, period_s: f64) -> Instability {
    let angle = multiplier.arg().abs();
    if multiplier.im == 0.0 && multiplier.re > 0.0 {
        return Instability::Drift { multiplier: multiplier.re };
    }
    if PI - angle <= NEARLY_HALF {
        return Instability::PeriodDoubling { multiplier: multiplier.re };
    }
    Instability::SlowScale { multiplier, frequency_hz: angle / (TAU * period_s) }
}
