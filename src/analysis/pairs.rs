//! Poles and zeros of the stage that nearly cancel, taken together, so that the ledger lists what matters.
//!
//! *Rule.* A pole and a zero of the left half-plane, both real or both with their conjugates, are one row when their frequencies
//! differ by less than a factor of 1.5 and their phases at the crossover cancel to a quarter or less. The sum is theirs exactly.

use crate::linear::{FactorKind, FactorPhase};
use std::f64::consts::TAU;

/// Greatest ratio of the two frequencies.
const NEAR: f64 = 1.5;
/// What may be left of the greater of the two phases.
const LEFT: f64 = 0.25;

/// A pole and a zero taken together.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Pair {
    /// Geometric mean of both frequencies [Hz].
    pub frequency_hz: f64,
    /// Sum of both phases [°].
    pub phase_deg: f64,
}

/// Takes nearly cancelling poles and zeros out of the factors; of several partners the one that cancels best.
pub(super) fn pairs(factors: &mut Vec<FactorPhase>) -> Vec<Pair> {
    let mut found = Vec::new();
    while let Some((pole, zero)) = best(factors) {
        let (one, other) = (factors[pole], factors[zero]);
        found.push(Pair {
            frequency_hz: (one.root.norm() * other.root.norm()).sqrt() / TAU,
            phase_deg: one.phase_deg + other.phase_deg,
        });
        factors.remove(pole.max(zero));
        factors.remove(pole.min(zero));
    }
    found
}

/// The pole and the zero that cancel best, if any do.
fn best(factors: &[FactorPhase]) -> Option<(usize, usize)> {
    let all = |kind| factors.iter().enumerate().filter(move |(_, factor)| factor.kind == kind);
    let pairs = all(FactorKind::Pole).flat_map(|pole| all(FactorKind::Zero).map(move |zero| (pole, zero)));
    pairs
        .filter(|((_, pole), (_, zero))| cancel(pole, zero))
        .min_by(|(a, b), (c, d)| apart(a.1, b.1).total_cmp(&apart(c.1, d.1)))
        .map(|((pole, _), (zero, _))| (pole, zero))
}

fn apart(pole: &FactorPhase, zero: &FactorPhase) -> f64 {
    (pole.root.norm() / zero.root.norm()).ln().abs()
}

fn cancel(pole: &FactorPhase, zero: &FactorPhase) -> bool {
    let left = pole.root.re < 0.0 && zero.root.re < 0.0;
    let alike = (pole.root.im != 0.0) == (zero.root.im != 0.0);
    let greater = pole.phase_deg.abs().max(zero.phase_deg.abs());
    left && alike && apart(pole, zero) < NEAR.ln() && (pole.phase_deg + zero.phase_deg).abs() <= LEFT * greater
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::linear::{Complex, FactoredResponse, Zpk};

    fn root(frequency_hz: f64, damping: f64) -> [Complex; 2] {
        let omega = TAU * frequency_hz;
        let im = omega * (1.0 - damping * damping).sqrt();
        [Complex::new(-damping * omega, im), Complex::new(-damping * omega, -im)]
    }

    /// Planted: two pairs that nearly cancel, and what stays by itself; the sum over all is that of the whole response.
    #[test]
    fn near_cancelling_pairs_are_found_and_nothing_else() {
        let real = |hz: f64| Complex::new(-TAU * hz, 0.0);
        let mut zeros = vec![real(1.0e3), real(40e3), Complex::new(TAU * 1.1e3, 0.0)];
        let mut poles = vec![real(1.2e3), real(900e3)];
        zeros.extend(root(2.0e3, 0.3));
        poles.extend(root(2.1e3, 0.3));
        poles.extend(root(20e3, 0.2));
        let response = FactoredResponse::new(Zpk { zeros, poles, gain: 1.0 }, 0.0);
        let mut factors = response.factor_phases_deg(10e3);
        let whole: f64 = factors.iter().map(|factor| factor.phase_deg).sum();
        let found = pairs(&mut factors);
        assert_eq!(found.len(), 2, "{found:?}");
        assert!((found[0].frequency_hz / (2.0e3_f64 * 2.1e3).sqrt() - 1.0).abs() < 1e-9);
        assert!((found[1].frequency_hz / (1.0e3_f64 * 1.2e3).sqrt() - 1.0).abs() < 1e-9);
        assert!(factors.iter().any(|factor| factor.root.re > 0.0), "a right-half-plane zero cancels nothing");
        let rest: f64 = factors.iter().map(|factor| factor.phase_deg).sum();
        let taken: f64 = found.iter().map(|pair| pair.phase_deg).sum();
        assert!((rest + taken - whole).abs() < 1e-9);
    }

    /// Right at a lightly damped pair the phases differ by much, however near the frequencies are: both rows stay.
    #[test]
    fn a_pair_astride_the_crossover_stays_apart() {
        let response = FactoredResponse::new(
            Zpk { zeros: root(9e3, 0.02).to_vec(), poles: root(11e3, 0.02).to_vec(), gain: 1.0 },
            0.0,
        );
        let mut factors = response.factor_phases_deg(10e3);
        assert!(pairs(&mut factors).is_empty());
        assert_eq!(factors.len(), 2);
    }
}
