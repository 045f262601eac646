//! Factors in z of a difference equation, seen at the frequencies of its samples.
//!
//! Conventions: a root r stands for the factor `1 − r·z⁻¹`, z = e^(jωT); the gain in front of the factors is the caller's. Like the factors of a
//! continuous response each is taken relative to its value at zero frequency, so its phase starts at 0° and is continuous; the sign of
//! that value belongs to the gain. A root at 1 counts 90° − ωT/2 throughout. Roots come with their conjugates.
//!
//! Valid for: frequencies up to half the sampling frequency; beyond, the response repeats itself and says nothing.

use std::f64::consts::{FRAC_PI_2, TAU};

use super::{Complex, LogPoint};

/// Roots of a difference equation that runs once a period.
#[derive(Clone, Debug, PartialEq)]
pub struct DiscreteFactors {
    /// Time between samples [s].
    pub period_s: f64,
    /// Roots of the numerator in the z plane.
    pub zeros: Vec<Complex>,
    /// Roots of the denominator in the z plane.
    pub poles: Vec<Complex>,
}

/// Squares of magnitudes are kept above this, so that a zero on the circle has a logarithm.
const LEAST_SQUARE: f64 = 1e-280;

impl DiscreteFactors {
    /// Half the sampling frequency [Hz].
    pub fn highest_hz(&self) -> f64 {
        0.5 / self.period_s
    }

    /// Whether the product of the factors is negative at zero frequency; factors that vanish there do not count.
    pub fn negative(&self) -> bool {
        self.zeros.iter().chain(&self.poles).filter(|r| r.im == 0.0 && r.re > 1.0).count() % 2 == 1
    }

    /// Magnitude and phase of the product of the factors, with their slopes over ln f; of the sign at zero frequency nothing.
    pub(super) fn log_point(&self, f_hz: f64) -> LogPoint {
        let theta = TAU * f_hz * self.period_s;
        let mut sum = LogPoint { ln_gain: 0.0, phase_rad: 0.0, gain_slope: 0.0, phase_slope: 0.0 };
        for (roots, sign) in [(&self.zeros, 1.0), (&self.poles, -1.0)] {
            for root in roots {
                let turned = root * Complex::cis(-theta);
                // 1 − e^(−jθ) apart, so that a root near 1 keeps its digits at low frequency.
                let half = (0.5 * theta).sin();
                let value = (Complex::ONE - root) + root * Complex::new(2.0 * half * half, theta.sin());
                let square = value.norm_sqr().max(LEAST_SQUARE);
                // θ·d/dθ of ln(1 − r·e^(−jθ)).
                let slope = Complex::I * turned * value.conj() * (theta / square);
                sum.ln_gain += sign * 0.5 * square.ln();
                sum.phase_rad += sign * phase(*root, theta);
                sum.gain_slope += sign * slope.re;
                sum.phase_slope += sign * slope.im;
            }
        }
        sum
    }

    /// Frequencies of roots near the circle [Hz].
    pub(super) fn breakpoints_hz(&self) -> Vec<f64> {
        let near = |r: &&Complex| r.im > 0.0 && (r.norm() - 1.0).abs() < 0.5;
        let mut found = Vec::new();
        for root in self.zeros.iter().chain(&self.poles).filter(near) {
            let centre = root.arg() / (TAU * self.period_s);
            let width = (root.norm().ln().abs() / root.arg()).max(1e-9);
            found.push(centre);
            let mut offset = 0.5 * width;
            while offset < 0.12 {
                found.extend([centre * offset.exp(), centre * (-offset).exp()]);
                offset *= 2.0;
            }
        }
        found.retain(|f| *f < self.highest_hz());
        found
    }
}

/// Phase of `1 − r·e^(−jθ)` [rad], continuous in θ; of conjugate roots together it starts at zero.
fn phase(root: Complex, theta: f64) -> f64 {
    if root == Complex::ONE {
        return FRAC_PI_2 - 0.5 * theta;
    }
    if root == -Complex::ONE {
        return -0.5 * theta;
    }
    if root.norm_sqr() <= 1.0 {
        (Complex::ONE - root * Complex::cis(-theta)).arg()
    } else {
        // −r·z⁻¹·(1 − z/r): the constant argument of −r is the sign of a real root, and cancels between conjugates.
        (Complex::ONE - Complex::cis(theta) / root).arg() - theta
    }
}

#[cfg(test)]
mod tests {
    use super::super::precision::assert_near;
    use super::*;

    fn factors(zeros: &[Complex], poles: &[Complex]) -> DiscreteFactors {
        DiscreteFactors { period_s: 1e-5, zeros: zeros.to_vec(), poles: poles.to_vec() }
    }

    /// Definition: the product of the factors, and central differences for the slopes.
    #[test]
    fn the_product_of_its_factors() {
        let pair = Complex::new(0.7, 0.4);
        let outside = Complex::new(-0.6, 1.1);
        let c = |re: f64| Complex::new(re, 0.0);
        let all = factors(&[c(-1.0), pair, pair.conj(), c(1.7)], &[c(1.0), c(-0.3), outside, outside.conj()]);
        let mut last: Option<f64> = None;
        for f in [1e-2, 37.0, 1e3, 7e3, 11e3, 20e3, 31e3, 44e3, 49e3] {
            let inverse = Complex::cis(-TAU * f * all.period_s);
            let product = |roots: &[Complex]| roots.iter().map(|r| Complex::ONE - r * inverse).product::<Complex>();
            let point = all.log_point(f);
            let sign = if all.negative() { -1.0 } else { 1.0 };
            let expected = product(&all.zeros) / product(&all.poles) * sign;
            // The product itself loses what 1 − e^(−jθ) cancels.
            assert!((point.value() / expected - 1.0).norm() < 1e-12 + 1e-15 / (f * all.period_s), "{f}");
            let (above, below) = (all.log_point(f * 1.000_01), all.log_point(f / 1.000_01));
            let width = 2.0 * 1.000_01_f64.ln();
            assert_near(point.gain_slope, (above.ln_gain - below.ln_gain) / width, 2e-5);
            assert_near(point.phase_slope, (above.phase_rad - below.phase_rad) / width, 2e-5);
            assert!(last.is_none_or(|phase| (phase - point.phase_rad).abs() < 2.5), "{f}");
            last = Some(point.phase_rad);
        }
    }

    #[test]
    fn a_zero_on_the_circle_has_a_finite_logarithm() {
        let notch = factors(&[-Complex::ONE, -Complex::ONE], &[Complex::ONE]);
        assert!(notch.log_point(notch.highest_hz()).ln_gain.is_finite());
    }
}
