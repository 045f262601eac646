//! A loop gain that is only known by its values, as something that answers at a frequency: what the search for margins needs.
//!
//! *Conventions*: the phase is that of the averaged loop plus the angle between the two, which is far from a half turn wherever the averaged
//! model means anything; so it is unwrapped like the averaged one without walking there. Slopes are central differences.

use crate::linear::{Complex, FactoredResponse, FrequencyResponse, LogPoint};
use crate::linear::{Margins, margins};

/// Half the width of the difference for a slope, in ln f: rounding and curvature both cost about 1e-9 of the slope.
const HALF_STEP: f64 = 1e-4;

/// An exact loop gain beside the averaged one.
struct AsRead<'a, F> {
    averaged: &'a FactoredResponse,
    read: F,
    band_hz: (f64, f64),
}

impl<F: Fn(f64) -> Complex> AsRead<'_, F> {
    /// ln of the gain and unwrapped phase [rad] at a frequency [Hz].
    fn logarithm(&self, f_hz: f64) -> (f64, f64) {
        let averaged = self.averaged.log_point(f_hz);
        let read = (self.read)(f_hz);
        (read.norm().ln(), averaged.phase_rad + (read * averaged.value().conj()).arg())
    }
}

impl<F: Fn(f64) -> Complex> FrequencyResponse for AsRead<'_, F> {
    fn log_point(&self, f_hz: f64) -> LogPoint {
        let (ln_gain, phase_rad) = self.logarithm(f_hz);
        let [before, after] = [-HALF_STEP, HALF_STEP].map(|step| self.logarithm(f_hz * step.exp()));
        LogPoint {
            ln_gain,
            phase_rad,
            gain_slope: (after.0 - before.0) / (2.0 * HALF_STEP),
            phase_slope: (after.1 - before.1) / (2.0 * HALF_STEP),
        }
    }

    fn breakpoints_hz(&self) -> Vec<f64> {
        self.averaged.breakpoints_hz()
    }

    fn band_hz(&self) -> Option<(f64, f64)> {
        Some(self.band_hz)
    }

    fn log_curve(&self, frequencies_hz: &[f64], ln_gain: &mut [f64], phase_rad: &mut [f64]) {
        for ((f, gain), phase) in frequencies_hz.iter().zip(ln_gain).zip(phase_rad) {
            (*gain, *phase) = self.logarithm(*f);
        }
    }
}

/// Margins of a loop gain that is known by its values, within a band [Hz]; `averaged` is the averaged one.
pub(super) fn margins_as_read(
    averaged: &FactoredResponse,
    read: impl Fn(f64) -> Complex,
    band_hz: (f64, f64),
) -> Margins {
    let mut found = margins(&AsRead { averaged, read, band_hz }, band_hz.0, band_hz.1);
    // As of the averaged loop: beyond the band |1 + T| tends to one.
    found.modulus_margin = found.modulus_margin.min(1.0);
    found.sensitivity_peak = found.sensitivity_peak.max(1.0);
    found
}

/// Unwraps phases [rad] of values beside the averaged ones; in degrees.
pub(super) fn phase_deg(averaged_deg: f64, averaged: Complex, exact: Complex) -> f64 {
    averaged_deg + (exact * averaged.conj()).arg().to_degrees()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::linear::Zpk;

    /// A loop read by its values alone has the margins that the search finds on its factors.
    #[test]
    fn margins_of_values_are_those_of_the_factors() {
        let real = |roots: &[f64]| roots.iter().map(|root| Complex::new(*root, 0.0)).collect::<Vec<_>>();
        let loop_of = |gain: f64, pole: f64| {
            FactoredResponse::new(Zpk { zeros: real(&[-2e3]), poles: real(&[0.0, -30.0, pole, -4e5]), gain }, 3e-7)
        };
        let (averaged, exact) = (loop_of(3e13, -1.1e5), loop_of(3.3e13, -0.9e5));
        let direct = margins(&exact, 1.0, 2e5);
        let read = margins_as_read(&averaged, |f| exact.at_hz(f), (1.0, 2e5));
        let near = |one: f64, other: f64| assert!((one / other - 1.0).abs() < 1e-8, "{one} against {other}");
        let [one, other] = [&direct, &read].map(|m| *m.headline_crossover().unwrap());
        near(one.frequency_hz, other.frequency_hz);
        near(one.phase_margin_deg, other.phase_margin_deg);
        near(direct.gain_margin_up_db().unwrap(), read.gain_margin_up_db().unwrap());
        near(direct.modulus_margin, read.modulus_margin);
        assert_eq!(direct.crossovers.len(), read.crossovers.len());
    }
}
