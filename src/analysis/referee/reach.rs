//! Up to which frequency the averaged model holds: plant and loop gain within 1 dB and 5° of the exact ones.

use super::result::{Reach, ReachedBy};
use crate::linear::Complex;

/// Tolerances: gain [dB] and phase [°].
const TOLERANCES: (f64, f64) = (1.0, 5.0);
/// Looked from this share of the switching frequency; below it nothing is left that could differ.
const FROM: f64 = 1e-4;
/// … to this one: beyond half the switching frequency an averaged model says nothing, and there a reading is undefined.
const TO: f64 = 0.495;
/// Steps of the look; resonances are far wider.
const STEPS: usize = 44;
/// Halvings of the step in which it leaves: to a ten-thousandth of a frequency.
const HALVINGS: usize = 10;

/// Averaged and exact value of one curve at a frequency.
pub(super) type Pair = [Complex; 2];

/// Whether an averaged value is within the tolerances of the exact one; one that is not defined counts as within.
fn within([averaged, exact]: Pair) -> bool {
    let ratio = exact / averaged;
    if !ratio.is_finite() {
        return true;
    }
    let (gain_db, phase_deg) = (20.0 * ratio.norm().log10(), ratio.arg().to_degrees());
    gain_db.abs() <= TOLERANCES.0 && phase_deg.abs() <= TOLERANCES.1
}

/// Looks up to where plant and loop hold; `at` gives the pairs of plant and loop at a frequency [Hz].
pub(super) fn reach(switching_frequency: f64, at: impl Fn(f64) -> (Pair, Pair)) -> Reach {
    let left_by = |f: f64| {
        let (plant, of_loop) = at(f);
        match (within(plant), within(of_loop)) {
            (true, true) => None,
            (true, false) => Some(ReachedBy::Loop),
            (false, _) => Some(ReachedBy::Plant),
        }
    };
    let looked_to_hz = switching_frequency * TO;
    let ratio = (TO / FROM).ln() / STEPS as f64;
    let step = |k: usize| switching_frequency * FROM * (ratio * k as f64).exp();
    if let Some(by) = left_by(step(0)) {
        return Reach { frequency_hz: None, by: Some(by), looked_to_hz };
    }
    for k in 1..=STEPS {
        let Some(mut by) = left_by(step(k)) else { continue };
        let (mut low, mut high) = (step(k - 1), step(k));
        for _ in 0..HALVINGS {
            let middle = (low * high).sqrt();
            match left_by(middle) {
                Some(there) => (high, by) = (middle, there),
                None => low = middle,
            }
        }
        return Reach { frequency_hz: Some(low), by: Some(by), looked_to_hz };
    }
    Reach { frequency_hz: Some(looked_to_hz), by: None, looked_to_hz }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A plant that turns by 360° · f · 1 µs against the averaged one leaves 5° at 13.9 kHz, a loop that rises in proportion to f
    /// leaves 1 dB where it says.
    #[test]
    fn the_first_to_leave_is_found_and_named() {
        let turned = |f: f64| [Complex::ONE, Complex::from_polar(1.0, -std::f64::consts::TAU * f * 1e-6)];
        let same = |_: f64| [Complex::ONE, Complex::ONE];
        let found = reach(300e3, |f| (turned(f), same(f)));
        assert_eq!(found.by, Some(ReachedBy::Plant));
        assert!((found.frequency_hz.unwrap() / (5.0 / 360.0 * 1e6) - 1.0).abs() < 2e-4, "{found:?}");
        let rising = |f: f64| [Complex::ONE, Complex::new(1.0 + f / 1e5, 0.0)];
        let found = reach(300e3, |f| (same(f), rising(f)));
        assert_eq!(found.by, Some(ReachedBy::Loop));
        assert!((found.frequency_hz.unwrap() / (1e5 * (10f64.powf(0.05) - 1.0)) - 1.0).abs() < 2e-4, "{found:?}");
        assert_eq!(reach(300e3, |f| (same(f), same(f))).frequency_hz, Some(300e3 * TO));
        let wrong = |_: f64| [Complex::ONE, Complex::new(2.0, 0.0)];
        assert_eq!(reach(300e3, |f| (wrong(f), same(f))).frequency_hz, None);
    }
}
