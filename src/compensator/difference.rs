//! Difference equations: coefficients from poles and zeros in s by a method, and roots back from coefficients.
//!
//! *Conventions*: u[n] = a1·u[n−1] + a2·u[n−2] + … + b0·e[n] + b1·e[n−1] + …, so the response is Σ bk·z⁻ᵏ over 1 − Σ ak·z⁻ᵏ, and an integrator is
//! Σ ak = 1. T is the time between samples.
//!
//! *Source.* Tustin's rule and its stretch to one exact frequency: s = k·(z − 1)/(z + 1), k = 2/T or ωp/tan(ωp·T/2). Matched poles: z = e^(sT),
//! zeros at infinity at z = −1, the integrator's gain kept. Franklin, Powell & Workman, Digital Control of Dynamic Systems, 3rd ed.,
//! ch. 6 (from memory).

use std::f64::consts::{PI, TAU};

use nalgebra::DMatrix;

use super::lanes::Corners;
use crate::linear::{Complex, DiscreteFactors, eigenvalues};

/// How poles and zeros in s become poles and zeros in z.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Method {
    /// Tustin's rule.
    Tustin,
    /// Tustin's rule, exact at a frequency [Hz].
    Prewarped(f64),
    /// e^(sT).
    Matched,
}

impl Method {
    /// k of s = k·(z − 1)/(z + 1) [rad/s]; none for matched poles.
    fn stretch(self, period_s: f64) -> Option<f64> {
        match self {
            Method::Tustin => Some(2.0 / period_s),
            Method::Prewarped(f) => Some(TAU * f / (PI * f * period_s).tan()),
            Method::Matched => None,
        }
    }

    /// Where a real root at −2π·f goes.
    fn root(self, frequency_hz: f64, period_s: f64) -> f64 {
        let rate = TAU * frequency_hz;
        match self.stretch(period_s) {
            Some(k) => (k - rate) / (k + rate),
            None => (-rate * period_s).exp(),
        }
    }

    /// The frequency that a root in z stands for [Hz]; of a pair, or of one that is no decay, its magnitude in s.
    pub(super) fn frequency_hz(self, root: Complex, period_s: f64) -> f64 {
        let s = match self.stretch(period_s) {
            Some(k) => k * (root - 1.0) / (root + 1.0),
            None => root.ln() / period_s,
        };
        s.norm() / TAU
    }

    /// What the method says about a root, in the words of a lane.
    pub(super) fn formula(self) -> &'static str {
        match self {
            Method::Tustin => "z = (1 − π·f·T) / (1 + π·f·T)",
            Method::Prewarped(_) => "z = (k − 2π·f) / (k + 2π·f), k = 2π·fx / tan(π·fx·T), exact at fx",
            Method::Matched => "z = e^(−2π·f·T)",
        }
    }
}

/// A difference equation with its roots.
#[derive(Clone, Debug, PartialEq)]
pub struct DifferenceEquation {
    /// Time between samples [s].
    pub period_s: f64,
    /// a1, a2, …: coefficients of earlier outputs.
    pub feedback: Vec<f64>,
    /// b0, b1, …: coefficients of the present and earlier errors.
    pub forward: Vec<f64>,
    /// Response as gain times factors 1 − r·z⁻¹.
    roots: Roots,
}

/// Gain, whole periods of delay, and factors.
#[derive(Clone, Debug, PartialEq)]
struct Roots {
    gain: f64,
    delays: usize,
    zeros: Vec<Complex>,
    poles: Vec<Complex>,
}

impl DifferenceEquation {
    /// The equation of an integrator with the zeros and poles of `corners`, in `order` poles altogether. `scale` multiplies the gain.
    pub(super) fn from_corners(method: Method, corners: &Corners, order: usize, scale: f64, period_s: f64) -> Self {
        let places = |lanes: [Option<f64>; 2]| lanes.into_iter().flatten().collect::<Vec<f64>>();
        let zeros_hz = places([corners.zero_1, corners.zero_2]);
        let poles_hz = places([corners.pole_1, corners.pole_2]);
        let in_z = |f: &f64| Complex::from(method.root(*f, period_s));
        let mut zeros: Vec<Complex> = zeros_hz.iter().map(in_z).collect();
        let mut poles = vec![Complex::ONE];
        poles.extend(poles_hz.iter().map(in_z));
        zeros.resize(order.max(zeros.len()), -Complex::ONE);
        let gain = TAU * corners.gain.unwrap_or(0.0) * scale;
        let gain = gain * method_gain(method, [&zeros_hz, &poles_hz], [&zeros, &poles], period_s);
        let roots = Roots { gain, delays: 0, zeros, poles };
        let forward = expanded(&roots.zeros).into_iter().map(|c| gain * c).collect();
        let feedback = expanded(&roots.poles).into_iter().skip(1).map(|c| -c).collect();
        Self { period_s, feedback, forward, roots }
    }

    /// The equation of given coefficients, its roots found.
    pub fn from_coefficients(feedback: Vec<f64>, forward: Vec<f64>, period_s: f64) -> Self {
        let delays = forward.iter().position(|b| *b != 0.0).unwrap_or(0);
        let gain = forward.get(delays).copied().unwrap_or(0.0);
        let zeros = if gain == 0.0 { Vec::new() } else { roots_of(&forward[delays..]) };
        let denominator: Vec<f64> = std::iter::once(1.0).chain(feedback.iter().map(|a| -a)).collect();
        // A pole at 1 is exact where the coefficients say so, and is taken out before the others are looked for.
        let poles = if denominator.iter().sum::<f64>() == 0.0 {
            let mut carried = 0.0;
            let rest: Vec<f64> = denominator
                .iter()
                .map(|c| {
                    carried += c;
                    carried
                })
                .collect();
            let rest = rest.get(..denominator.len() - 1).unwrap_or_default();
            std::iter::once(Complex::ONE).chain(roots_of(rest)).collect()
        } else {
            roots_of(&denominator)
        };
        Self { period_s, feedback, forward, roots: Roots { gain, delays, zeros, poles } }
    }

    /// Roots of the numerator in the z plane; those at 0, which only shift in time, are left out.
    pub fn zeros(&self) -> &[Complex] {
        &self.roots.zeros
    }

    /// Roots of the denominator in the z plane, that of the integrator included.
    pub fn poles(&self) -> &[Complex] {
        &self.roots.poles
    }

    /// Whole periods before an error counts at all.
    pub fn delays(&self) -> usize {
        self.roots.delays
    }

    /// Gain in front of the factors 1 − r·z⁻¹; none in front of an equation that answers nothing.
    pub fn gain(&self) -> f64 {
        self.roots.gain
    }

    /// The factors for a response at a frequency.
    pub fn factors(&self) -> DiscreteFactors {
        let Roots { zeros, poles, .. } = &self.roots;
        DiscreteFactors { period_s: self.period_s, zeros: zeros.clone(), poles: poles.clone() }
    }

    /// Response at a point of the z plane, from the coefficients as they stand.
    pub fn at(&self, z: Complex) -> Complex {
        let sum = |coefficients: &[f64]| coefficients.iter().rev().fold(Complex::ZERO, |sum, c| sum / z + *c);
        sum(&self.forward) / (1.0 - sum(&self.feedback) / z)
    }
}

/// Gain in front of the factors 1 − r·z⁻¹ of an integrator of gain 1 with these zeros and poles, in hertz and in z.
fn method_gain(
    method: Method,
    [zeros_hz, poles_hz]: [&[f64]; 2],
    [zeros, poles]: [&[Complex]; 2],
    period_s: f64,
) -> f64 {
    if let Some(k) = method.stretch(period_s) {
        // Π(1 + k/ωz)/Π(1 + k/ωp) of the factors (k + ω)(1 − r·z⁻¹)/(ω·(1 + z⁻¹)), and k·(1 − z⁻¹)/(1 + z⁻¹) of the integrator.
        let factor = |f: &f64| 1.0 + k / (TAU * f);
        zeros_hz.iter().map(factor).product::<f64>() / poles_hz.iter().map(factor).product::<f64>() / k
    } else {
        // (1 − z⁻¹)·C/T at z = 1 is the gain.
        let at_one = |roots: &[Complex]| roots.iter().map(|r| 1.0 - r.re).product::<f64>();
        period_s * at_one(&poles[1..]) / at_one(zeros)
    }
}

/// Coefficients of Π(1 − r·z⁻¹), from that of z⁰ on; roots come with their conjugates.
fn expanded(roots: &[Complex]) -> Vec<f64> {
    let mut product = vec![Complex::ONE];
    for root in roots {
        product.push(Complex::ZERO);
        for k in (1..product.len()).rev() {
            let before = product[k - 1];
            product[k] -= root * before;
        }
    }
    product.iter().map(|c| c.re).collect()
}

/// Roots of c0·zᴺ + c1·zᴺ⁻¹ + …, c0 not zero; those at 0 are left out.
fn roots_of(coefficients: &[f64]) -> Vec<Complex> {
    let used = coefficients.iter().rposition(|c| *c != 0.0).unwrap_or(0);
    let coefficients = coefficients.get(..=used).unwrap_or_default();
    match coefficients {
        [] | [_] => Vec::new(),
        [first, last] => vec![Complex::from(-last / first)],
        [a, b, c] => quadratic(*a, *b, *c),
        [first, rest @ ..] => {
            let order = rest.len();
            let companion = DMatrix::from_fn(order, order, |row, column| match row {
                0 => -rest[column] / first,
                _ if column + 1 == row => 1.0,
                _ => 0.0,
            });
            let found = eigenvalues(&companion).unwrap_or_default();
            found.into_iter().map(|root| polished(coefficients, root)).collect()
        }
    }
}

fn quadratic(a: f64, b: f64, c: f64) -> Vec<Complex> {
    let discriminant = b * b - 4.0 * a * c;
    if discriminant < 0.0 {
        let root = Complex::new(-b, (-discriminant).sqrt()) / (2.0 * a);
        let root = Complex::new(root.re, root.im.abs());
        return vec![root, root.conj()];
    }
    let sum = -0.5 * (b + discriminant.sqrt().copysign(b));
    // With b and the discriminant both zero both roots are zero.
    let other = if sum == 0.0 { 0.0 } else { c / sum };
    vec![Complex::from(sum / a), Complex::from(other)]
}

/// Newton's steps on the polynomial itself: the eigenvalues of the companion lose digits.
fn polished(coefficients: &[f64], mut root: Complex) -> Complex {
    for _ in 0..3 {
        let (value, slope) = coefficients
            .iter()
            .fold((Complex::ZERO, Complex::ZERO), |(value, slope), c| (value * root + *c, slope * root + value));
        let step = value / slope;
        if !step.is_finite() || step.norm() > 1e-3 {
            break;
        }
        root -= step;
    }
    root
}

#[cfg(test)]
mod tests {
    use super::*;

    const PERIOD: f64 = 5e-6;

    fn corners() -> Corners {
        Corners { gain: Some(400.0), zero_1: Some(1.2e3), pole_1: Some(30e3), zero_2: Some(2.1e3), pole_2: Some(70e3) }
    }

    fn close(a: Complex, b: Complex, tolerance: f64) {
        assert!((a / b - 1.0).norm() < tolerance, "{a} against {b}");
    }

    /// Definition: Tustin's rule is C(s) at s = k·(z − 1)/(z + 1), whatever z is.
    #[test]
    fn tustin_is_its_substitution() {
        let corners = corners();
        let ideal = super::super::lanes::ideal_response(&corners);
        for method in [Method::Tustin, Method::Prewarped(14e3)] {
            let equation = DifferenceEquation::from_corners(method, &corners, 3, 2.5, PERIOD);
            let k = method.stretch(PERIOD).unwrap();
            for z in [Complex::new(0.3, 0.8), Complex::new(1.4, -0.2), Complex::cis(0.05)] {
                close(equation.at(z), 2.5 * ideal.at(k * (z - 1.0) / (z + 1.0)), 1e-11);
            }
        }
        let exact = DifferenceEquation::from_corners(Method::Prewarped(14e3), &corners, 3, 1.0, PERIOD);
        close(exact.at(Complex::cis(TAU * 14e3 * PERIOD)), ideal.at_hz(14e3), 1e-11);
    }

    /// Definition: poles and zeros at e^(sT), and the integrator's gain kept.
    #[test]
    fn matched_poles_are_exponentials() {
        let equation = DifferenceEquation::from_corners(Method::Matched, &corners(), 3, 1.0, PERIOD);
        let near_one = Complex::new(1.0 + 1e-9, 0.0);
        let gain = equation.at(near_one) * (near_one - 1.0) / PERIOD;
        assert!((gain.re / (TAU * 400.0) - 1.0).abs() < 1e-4);
        let expected = (-TAU * 30e3 * PERIOD).exp();
        assert!(equation.poles().iter().any(|p| (p.re - expected).abs() < 1e-15));
        assert_eq!(equation.zeros().iter().filter(|z| **z == -Complex::ONE).count(), 1);
    }

    /// Two routes: roots found from the coefficients against those the coefficients were made of.
    #[test]
    fn roots_come_back() {
        for (order, corners) in [(3, corners()), (2, Corners { pole_2: None, zero_2: None, ..corners() })] {
            for method in [Method::Tustin, Method::Prewarped(14e3), Method::Matched] {
                let made = DifferenceEquation::from_corners(method, &corners, order, 1.0, PERIOD);
                let found = DifferenceEquation::from_coefficients(made.feedback.clone(), made.forward.clone(), PERIOD);
                for (mine, theirs) in [(made.zeros(), found.zeros()), (made.poles(), found.poles())] {
                    assert_eq!(mine.len(), theirs.len());
                    for root in mine {
                        let nearest = theirs.iter().map(|r| (r - root).norm()).fold(f64::INFINITY, f64::min);
                        assert!(nearest < 1e-9, "{root} {theirs:?}");
                    }
                }
                let z = Complex::cis(0.3);
                let product = |roots: &[Complex]| roots.iter().map(|r| 1.0 - r / z).product::<Complex>();
                close(found.gain() * product(found.zeros()) / product(found.poles()), made.at(z), 1e-11);
            }
        }
    }

    #[test]
    fn empty_and_late_equations() {
        let nothing = DifferenceEquation::from_coefficients(vec![1.0, 0.0], vec![0.0; 3], PERIOD);
        assert!(nothing.gain() == 0.0 && nothing.zeros().is_empty());
        let late = DifferenceEquation::from_coefficients(vec![1.0, 0.0], vec![0.0, 2.0, -1.0], PERIOD);
        assert_eq!((late.delays(), late.zeros()), (1, &[Complex::new(0.5, 0.0)][..]));
        assert_eq!(late.poles(), [Complex::ONE], "a pole at 0 only shifts in time");
    }
}
