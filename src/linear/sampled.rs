//! A measured response that answers at a frequency.
//!
//! Between points, ln|T| and phase are straight lines over ln f; outside the measured band the end values hold, and searches are
//! kept to the band.

use super::{Complex, FrequencyResponse, LinearError, LogPoint};

/// Measured points, interpolated on logarithmic axes.
#[derive(Clone, Debug, PartialEq)]
pub struct SampledResponse {
    /// Frequencies [Hz], rising.
    frequencies_hz: Vec<f64>,
    ln_frequencies: Vec<f64>,
    ln_gain: Vec<f64>,
    phase_rad: Vec<f64>,
}

impl SampledResponse {
    /// From complex values at rising frequencies [Hz]. The phase is unwrapped by the nearest way from point to point, starting in (−360°, 0°].
    ///
    /// # Errors
    /// [`LinearError::Shape`] for fewer than two points, different lengths, or frequencies that do not rise from above zero;
    /// [`LinearError::NotFinite`] for a value that is zero or not finite.
    pub fn new(frequencies_hz: &[f64], values: &[Complex]) -> Result<Self, LinearError> {
        let gains: Vec<f64> = values.iter().map(|v| v.norm().ln()).collect();
        let mut phases = Vec::with_capacity(values.len());
        let mut last: Option<f64> = None;
        for value in values {
            let principal = value.arg();
            let phase = match last {
                None => {
                    if principal > 0.0 {
                        principal - std::f64::consts::TAU
                    } else {
                        principal
                    }
                }
                Some(last) => {
                    last + (principal - last + std::f64::consts::PI).rem_euclid(std::f64::consts::TAU)
                        - std::f64::consts::PI
                }
            };
            phases.push(phase);
            last = Some(phase);
        }
        Self::from_logarithms(frequencies_hz, gains, phases)
    }

    /// From gain [dB] and phase [°] as unwrapped by the instrument.
    ///
    /// # Errors
    /// As [`Self::new`].
    pub fn from_db_degrees(frequencies_hz: &[f64], gain_db: &[f64], phase_deg: &[f64]) -> Result<Self, LinearError> {
        let gains = gain_db.iter().map(|g| g * std::f64::consts::LN_10 / 20.0).collect();
        Self::from_logarithms(frequencies_hz, gains, phase_deg.iter().map(|p| p.to_radians()).collect())
    }

    fn from_logarithms(frequencies_hz: &[f64], ln_gain: Vec<f64>, phase_rad: Vec<f64>) -> Result<Self, LinearError> {
        let count = frequencies_hz.len();
        if count < 2 || ln_gain.len() != count || phase_rad.len() != count {
            return Err(LinearError::Shape(format!(
                "{count} frequencies, {} gains, {} phases",
                ln_gain.len(),
                phase_rad.len()
            )));
        }
        if ln_gain.iter().chain(&phase_rad).chain(frequencies_hz).any(|x| !x.is_finite()) {
            return Err(LinearError::NotFinite);
        }
        if frequencies_hz[0] <= 0.0 || frequencies_hz.windows(2).any(|pair| pair[1] <= pair[0]) {
            return Err(LinearError::Shape("frequencies must rise from above zero".to_owned()));
        }
        let ln_frequencies = frequencies_hz.iter().map(|f| f.ln()).collect();
        Ok(Self { frequencies_hz: frequencies_hz.to_vec(), ln_frequencies, ln_gain, phase_rad })
    }

    /// The measured frequencies [Hz].
    pub fn frequencies_hz(&self) -> &[f64] {
        &self.frequencies_hz
    }
}

impl FrequencyResponse for SampledResponse {
    fn log_point(&self, f_hz: f64) -> LogPoint {
        let last = self.frequencies_hz.len() - 1;
        let hold = |i: usize| LogPoint {
            ln_gain: self.ln_gain[i],
            phase_rad: self.phase_rad[i],
            gain_slope: 0.0,
            phase_slope: 0.0,
        };
        let after = self.frequencies_hz.partition_point(|f| *f <= f_hz);
        if after == 0 {
            return hold(0);
        }
        if after > last {
            return hold(last);
        }
        let (i, j) = (after - 1, after);
        let width = self.ln_frequencies[j] - self.ln_frequencies[i];
        let (rise, turn) = (self.ln_gain[j] - self.ln_gain[i], self.phase_rad[j] - self.phase_rad[i]);
        let part = (f_hz.ln() - self.ln_frequencies[i]) / width;
        LogPoint {
            ln_gain: self.ln_gain[i] + part * rise,
            phase_rad: self.phase_rad[i] + part * turn,
            gain_slope: rise / width,
            phase_slope: turn / width,
        }
    }

    fn breakpoints_hz(&self) -> Vec<f64> {
        self.frequencies_hz.clone()
    }

    fn band_hz(&self) -> Option<(f64, f64)> {
        Some((*self.frequencies_hz.first()?, *self.frequencies_hz.last()?))
    }
}

#[cfg(test)]
mod tests {
    use super::super::precision::assert_near;
    use super::*;

    #[test]
    fn straight_lines_between_points_and_held_ends() {
        let sampled = SampledResponse::from_db_degrees(&[10.0, 1e3], &[40.0, 0.0], &[-90.0, -180.0]).unwrap();
        let middle = sampled.log_point(100.0);
        assert_near(middle.ln_gain * 20.0 / std::f64::consts::LN_10, 20.0, 1e-12);
        assert_near(middle.phase_rad.to_degrees(), -135.0, 1e-12);
        assert_near(middle.gain_slope, -1.0, 1e-14);
        assert_near(sampled.log_point(1.0).phase_rad.to_degrees(), -90.0, 1e-12);
        assert_near(sampled.log_point(1e9).ln_gain, 0.0, 1e-12);
        assert_eq!(sampled.band_hz(), Some((10.0, 1e3)));
    }

    #[test]
    fn complex_points_unwrap() {
        let f: Vec<f64> = (1..50).map(f64::from).collect();
        let values: Vec<Complex> = f.iter().map(|f| Complex::cis(-0.5 * f)).collect();
        let sampled = SampledResponse::new(&f, &values).unwrap();
        assert_near(sampled.log_point(49.0).phase_rad, -24.5, 1e-12);
    }

    #[test]
    fn bad_sweeps_are_errors() {
        assert!(SampledResponse::from_db_degrees(&[1.0], &[0.0], &[0.0]).is_err());
        assert!(SampledResponse::from_db_degrees(&[1.0, 1.0], &[0.0; 2], &[0.0; 2]).is_err());
        assert!(SampledResponse::from_db_degrees(&[0.0, 1.0], &[0.0; 2], &[0.0; 2]).is_err());
        assert!(SampledResponse::from_db_degrees(&[1.0, 2.0], &[0.0, f64::NAN], &[0.0; 2]).is_err());
        assert_eq!(SampledResponse::new(&[1.0, 2.0], &[Complex::ZERO; 2]), Err(LinearError::NotFinite));
    }
}
