//! What anything that answers at a frequency has in common: gain and unwrapped phase with their slopes.

use super::Complex;

/// Logarithmic gain and phase at one frequency, with their slopes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LogPoint {
    /// Natural logarithm of the magnitude.
    pub ln_gain: f64,
    /// Unwrapped phase [rad].
    pub phase_rad: f64,
    /// d ln|T| / d ln f; 1 is 20 dB per decade.
    pub gain_slope: f64,
    /// d phase / d ln f [rad].
    pub phase_slope: f64,
}

impl LogPoint {
    /// The complex value; a magnitude beyond the number range is cut off at 1e±300.
    pub fn value(&self) -> Complex {
        Complex::from_polar(self.ln_gain.clamp(-690.0, 690.0).exp(), self.phase_rad)
    }

    /// The product of two responses at the same frequency.
    #[must_use]
    pub(super) fn times(&self, other: &Self) -> Self {
        LogPoint {
            ln_gain: self.ln_gain + other.ln_gain,
            phase_rad: self.phase_rad + other.phase_rad,
            gain_slope: self.gain_slope + other.gain_slope,
            phase_slope: self.phase_slope + other.phase_slope,
        }
    }
}

/// Anything that answers at a frequency: a model, or a measured response.
pub trait FrequencyResponse {
    /// Gain and unwrapped phase at a frequency [Hz], with their slopes.
    fn log_point(&self, f_hz: f64) -> LogPoint;

    /// Frequencies [Hz], in any order, where a scan must look closely: resonances, notches, measured points.
    fn breakpoints_hz(&self) -> Vec<f64>;

    /// The band [Hz] in which the response is known; everything when `None`.
    fn band_hz(&self) -> Option<(f64, f64)> {
        None
    }

    /// The complex value at a frequency [Hz].
    fn at_hz(&self, f_hz: f64) -> Complex {
        self.log_point(f_hz).value()
    }

    /// ln|T| and unwrapped phase [rad] at many frequencies [Hz]; the three slices are of one length.
    fn log_curve(&self, frequencies_hz: &[f64], ln_gain: &mut [f64], phase_rad: &mut [f64]) {
        for ((f, gain), phase) in frequencies_hz.iter().zip(ln_gain).zip(phase_rad) {
            let point = self.log_point(*f);
            *gain = point.ln_gain;
            *phase = point.phase_rad;
        }
    }
}
