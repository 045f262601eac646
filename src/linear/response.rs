//! Gain and unwrapped phase of a factored transfer function with an exact delay.
//!
//! Conventions: the phase is the sum of the factors' phases, each in the form `1 − s/root`, so every factor starts at 0° and the
//! phase is continuous in frequency: a left-half-plane zero adds 0 to +90°, a right-half-plane zero 0 to −90°, a pole the opposite, a
//! zero or pole at the origin ±90° throughout, a pair up to ±180°, a delay −360°·f·delay. A negative gain at low frequency
//! counts −180° once. An undamped pair is taken as the limit of a damped one.
//!
//! Method: roots are joined two and two into real sections `1 − c2·ω² + jω·c1`, whose imaginary part keeps its sign; the product of
//! the sections then tells its whole turns by sign changes, and one logarithm and one arc tangent serve the whole response.

use std::f64::consts::{LN_10, PI, TAU};

use wide::f64x4;

use super::kernel::{angle, ln_ratio};
use super::{Complex, DiscreteFactors, FrequencyResponse, LogPoint, Zpk};

/// Sections multiplied before a logarithm is taken: keeps the squares within the number range for corners 1e18 away.
const SECTIONS_PER_GROUP: usize = 4;

/// Vectors of four frequencies evaluated together: enough to spread the cost of each section, few enough for the fastest cache.
const BLOCK: usize = 4;

/// Decibels per neper.
const DB_PER_NEPER: f64 = 20.0 / LN_10;

/// What a factor of a response is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum FactorKind {
    /// The sign of the gain at low frequency.
    Sign,
    /// A zero, or a conjugate pair of zeros.
    Zero,
    /// A pole, or a conjugate pair of poles.
    Pole,
    /// The delay.
    Delay,
}

/// The phase of one factor at one frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FactorPhase {
    /// What the factor is.
    pub kind: FactorKind,
    /// Its root [rad/s], the upper one of a pair; zero for a sign or a delay.
    pub root: Complex,
    /// Its phase [°].
    pub phase_deg: f64,
}

/// A real section `1 − c2·ω² + jω·c1` of one or two roots.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Section {
    /// [s]; never zero, its sign is that of the phase.
    c1: f64,
    /// [s²].
    c2: f64,
}

/// A factored transfer function with an exact delay, ready to be evaluated fast.
#[derive(Clone, Debug, PartialEq)]
pub struct FactoredResponse {
    zpk: Zpk,
    delay_s: f64,
    zeros: Vec<Section>,
    poles: Vec<Section>,
    /// Zeros less poles at the origin.
    origin: i32,
    /// ln of the gain with every factor in the form 1 − s/root; −∞ for a response that is zero.
    ln_scale: f64,
    negative: bool,
    discrete: Option<DiscreteFactors>,
}

impl FactoredResponse {
    /// From zeros, poles and gain and a delay [s].
    pub fn new(zpk: Zpk, delay_s: f64) -> Self {
        let mut ln_scale = zpk.gain.abs().ln();
        let mut negative = zpk.gain < 0.0;
        let mut origin = 0;
        for (roots, sign) in [(&zpk.zeros, 1), (&zpk.poles, -1)] {
            for root in roots {
                if *root == Complex::ZERO {
                    origin += sign;
                } else {
                    ln_scale += f64::from(sign) * root.norm().ln();
                    negative ^= root.im == 0.0 && root.re > 0.0;
                }
            }
        }
        let (zeros, poles) = (sections(&zpk.zeros), sections(&zpk.poles));
        Self { zpk, delay_s, zeros, poles, origin, ln_scale, negative, discrete: None }
    }

    /// The same times factors in z = e^(jωT), with their gain at `1 − r·z⁻¹`. Everything but gain and phase, such as the encirclement count, knows nothing of
    /// them; a search for margins ends at half the sampling frequency.
    #[must_use]
    pub fn with_discrete(mut self, factors: DiscreteFactors) -> Self {
        self.negative ^= factors.negative();
        self.discrete = Some(factors);
        self
    }

    /// Factors in z, where there are some.
    pub fn discrete(&self) -> Option<&DiscreteFactors> {
        self.discrete.as_ref()
    }

    /// Zeros, poles and gain.
    pub fn zpk(&self) -> &Zpk {
        &self.zpk
    }

    /// The delay [s].
    pub fn delay_s(&self) -> f64 {
        self.delay_s
    }

    /// Zeros less poles at the origin.
    pub(super) fn origin(&self) -> i32 {
        self.origin
    }

    /// ln of the magnitude of the gain with every factor in the form `1 − s/root`, and whether that gain is negative.
    pub(super) fn scale(&self) -> (f64, bool) {
        (self.ln_scale, self.negative)
    }

    /// Gain [dB] at a frequency [Hz].
    pub fn gain_db(&self, f_hz: f64) -> f64 {
        self.log_point(f_hz).ln_gain * DB_PER_NEPER
    }

    /// Unwrapped phase [°] at a frequency [Hz].
    pub fn phase_deg(&self, f_hz: f64) -> f64 {
        self.log_point(f_hz).phase_rad.to_degrees()
    }

    /// Gain [dB] and unwrapped phase [°] at many frequencies [Hz]; what exceeds the shortest slice is left alone.
    pub fn curve(&self, frequencies_hz: &[f64], gain_db: &mut [f64], phase_deg: &mut [f64]) {
        self.scan(frequencies_hz, gain_db, phase_deg, DB_PER_NEPER, 180.0 / PI);
    }

    /// The phase of every factor [°] at a frequency [Hz]: sign, zeros, poles, delay. They sum to [`Self::phase_deg`].
    pub fn factor_phases_deg(&self, f_hz: f64) -> Vec<FactorPhase> {
        let omega = TAU * f_hz;
        let mut phases = Vec::with_capacity(self.zpk.zeros.len() + self.zpk.poles.len() + 2);
        if self.negative {
            phases.push(FactorPhase { kind: FactorKind::Sign, root: Complex::ZERO, phase_deg: -180.0 });
        }
        for (roots, kind, sign) in [(&self.zpk.zeros, FactorKind::Zero, 1.0), (&self.zpk.poles, FactorKind::Pole, -1.0)]
        {
            for root in roots.iter().filter(|r| r.im >= 0.0) {
                phases.push(FactorPhase {
                    kind,
                    root: *root,
                    phase_deg: sign * factor_phase_rad(*root, omega).to_degrees(),
                });
            }
        }
        if self.delay_s != 0.0 {
            phases.push(FactorPhase {
                kind: FactorKind::Delay,
                root: Complex::ZERO,
                phase_deg: -360.0 * f_hz * self.delay_s,
            });
        }
        phases
    }

    /// Phase without delay that does not depend on frequency [rad]: sign and roots at the origin.
    fn constant_phase(&self) -> f64 {
        f64::from(self.origin) * (0.5 * PI) - if self.negative { PI } else { 0.0 }
    }

    /// Gain and phase in the units asked for, in blocks of many frequencies and a remainder.
    fn scan(&self, frequencies_hz: &[f64], gain: &mut [f64], phase: &mut [f64], gain_unit: f64, phase_unit: f64) {
        let count = frequencies_hz.len().min(gain.len()).min(phase.len());
        self.scan_continuous(frequencies_hz, gain, phase, (gain_unit, phase_unit), count);
        if let Some(discrete) = &self.discrete {
            for ((f, gain), phase) in frequencies_hz.iter().zip(gain).zip(phase) {
                let point = discrete.log_point(*f);
                *gain += point.ln_gain * gain_unit;
                *phase += point.phase_rad * phase_unit;
            }
        }
    }

    /// The same without factors in z.
    fn scan_continuous(
        &self,
        frequencies_hz: &[f64],
        gain: &mut [f64],
        phase: &mut [f64],
        (gain_unit, phase_unit): (f64, f64),
        count: usize,
    ) {
        const POINTS: usize = 4 * BLOCK;
        let whole = count - count % POINTS;
        let mut done = 0;
        while done < whole {
            let block = done..done + POINTS;
            let f_hz = std::array::from_fn(|k| four(&frequencies_hz[block.start + 4 * k..]));
            let values = self.evaluate::<BLOCK>(&f_hz);
            values.write(&mut gain[block.clone()], &mut phase[block], gain_unit, phase_unit);
            done += POINTS;
        }
        while done < count {
            let block = done..count.min(done + 4);
            let values = self.evaluate::<1>(&[four(&frequencies_hz[block.clone()])]);
            values.write(&mut gain[block.clone()], &mut phase[block], gain_unit, phase_unit);
            done += 4;
        }
    }

    /// ln|T| and phase [rad] at frequencies [Hz], a section at a time over the whole block.
    #[inline]
    fn evaluate<const W: usize>(&self, f_hz: &[f64x4; W]) -> Values<W> {
        let omega = f_hz.map(|f| f * f64x4::splat(TAU));
        let omega2 = omega.map(|w| w * w);
        let delay = f64x4::splat(self.delay_s);
        let mut values = Values {
            ln_gain: [f64x4::splat(self.ln_scale); W],
            phase: omega.map(|w| f64x4::splat(self.constant_phase()) - w * delay),
        };
        let groups = self.zeros.len().max(self.poles.len()).div_ceil(SECTIONS_PER_GROUP).max(1);
        for group in 0..groups {
            let zeros = Turning::product(group_of(&self.zeros, group), &omega, &omega2);
            let poles = Turning::product(group_of(&self.poles, group), &omega, &omega2);
            for (k, square) in omega2.iter().enumerate() {
                values.phase[k] += zeros.phase_against(&poles, k);
                let (mut top, mut bottom) = (zeros.squared(k), poles.squared(k));
                match self.origin {
                    n if group > 0 || n == 0 => {}
                    -1 => bottom *= *square,
                    n if n > 0 => top *= power(*square, n),
                    n => bottom *= power(*square, -n),
                }
                values.ln_gain[k] += ln_ratio(top, bottom) * f64x4::splat(0.5);
            }
        }
        values
    }
}

/// A whole positive power.
fn power(x: f64x4, exponent: i32) -> f64x4 {
    (1..exponent).fold(x, |product, _| product * x)
}

/// Four frequencies from the start of a slice; what it lacks is its last.
#[inline]
fn four(f_hz: &[f64]) -> f64x4 {
    match *f_hz {
        [a, b, c, d, ..] => f64x4::new([a, b, c, d]),
        [a, b, c] => f64x4::new([a, b, c, c]),
        [a, b] => f64x4::new([a, b, b, b]),
        [a] => f64x4::splat(a),
        [] => f64x4::ONE,
    }
}

/// ln|T| and phase [rad] of a block.
struct Values<const W: usize> {
    ln_gain: [f64x4; W],
    phase: [f64x4; W],
}

impl<const W: usize> Values<W> {
    /// Writes the block out in other units; the slices may be shorter than the block.
    #[inline]
    fn write(&self, gain: &mut [f64], phase: &mut [f64], gain_unit: f64, phase_unit: f64) {
        for (slice, values, unit) in [(gain, &self.ln_gain, gain_unit), (phase, &self.phase, phase_unit)] {
            let mut points = slice.chunks_exact_mut(4);
            for (points, value) in (&mut points).zip(values) {
                points.copy_from_slice((*value * f64x4::splat(unit)).as_array());
            }
            let rest = points.into_remainder();
            if let Some(last) = values.last().filter(|_| !rest.is_empty()) {
                rest.copy_from_slice(&(*last * f64x4::splat(unit)).as_array()[..rest.len()]);
            }
        }
    }
}

impl FrequencyResponse for FactoredResponse {
    fn log_point(&self, f_hz: f64) -> LogPoint {
        let omega = TAU * f_hz;
        let values = self.evaluate::<1>(&[f64x4::splat(f_hz)]);
        let (mut gain_slope, mut phase_slope) = (f64::from(self.origin), -omega * self.delay_s);
        for (sections, sign) in [(&self.zeros, 1.0), (&self.poles, -1.0)] {
            for section in sections {
                let (u, v) = (section.c2 * omega * omega, section.c1 * omega);
                let (re, squared) = (1.0 - u, (1.0 - u) * (1.0 - u) + v * v);
                let weight = sign / squared.max(f64::MIN_POSITIVE);
                // ω·(d/dω) of the section is −2u + jv.
                gain_slope += weight * (v * v - 2.0 * u * re);
                phase_slope += weight * (v * re + 2.0 * u * v);
            }
        }
        let first = |v: f64x4| v.to_array()[0];
        let continuous =
            LogPoint { ln_gain: first(values.ln_gain[0]), phase_rad: first(values.phase[0]), gain_slope, phase_slope };
        match &self.discrete {
            Some(discrete) => continuous.times(&discrete.log_point(f_hz)),
            None => continuous,
        }
    }

    fn log_curve(&self, frequencies_hz: &[f64], ln_gain: &mut [f64], phase_rad: &mut [f64]) {
        self.scan(frequencies_hz, ln_gain, phase_rad, 1.0, 1.0);
    }

    fn band_hz(&self) -> Option<(f64, f64)> {
        self.discrete.as_ref().map(|discrete| (0.0, discrete.highest_hz()))
    }

    fn breakpoints_hz(&self) -> Vec<f64> {
        let mut found = self.discrete.as_ref().map(DiscreteFactors::breakpoints_hz).unwrap_or_default();
        found.reserve(8 * (self.zpk.zeros.len() + self.zpk.poles.len()));
        for root in self.zpk.zeros.iter().chain(&self.zpk.poles).filter(|r| r.im > 0.0) {
            let size = root.norm();
            // Half the width of the resonance in ln f; below 1e-12 the points fall together.
            let damping = (root.re.abs() / size).max(1e-12);
            let centre = size / TAU;
            found.push(centre);
            let mut offset = 0.5 * damping;
            while offset < 0.12 {
                let factor = offset.exp();
                found.push(centre * factor);
                found.push(centre / factor);
                offset *= 2.0;
            }
        }
        found
    }
}

/// Phase of the factor `1 − jω/root`, or of a conjugate pair of them [rad]; ±90° is for a root at the origin.
fn factor_phase_rad(root: Complex, omega: f64) -> f64 {
    if root == Complex::ZERO {
        return 0.5 * PI;
    }
    if root.im == 0.0 {
        return (omega / -root.re).atan();
    }
    let squared = root.norm_sqr();
    let imaginary = if root.re == 0.0 { 0.0 } else { -2.0 * root.re * omega / squared };
    imaginary.atan2(1.0 - omega * omega / squared)
}

/// Roots joined into sections; roots at the origin are left out.
fn sections(roots: &[Complex]) -> Vec<Section> {
    let mut found = Vec::with_capacity(roots.len().div_ceil(2));
    let mut single = None;
    for root in roots {
        if root.im > 0.0 {
            // Divided twice by the modulus: its square may leave the number range.
            let size = root.norm();
            found.push(Section { c1: damping_term(-2.0 * (root.re / size) / size, size), c2: 1.0 / size / size });
        } else if root.im == 0.0 && root.re != 0.0 {
            let corner = -1.0 / root.re;
            match single.take() {
                None => single = Some(corner),
                Some(first) => {
                    let size = 1.0 / f64::max(f64::abs(first), f64::abs(corner));
                    found.push(Section { c1: damping_term(first + corner, size), c2: first * corner });
                }
            }
        }
    }
    if let Some(corner) = single {
        found.push(Section { c1: corner, c2: 0.0 });
    }
    found
}

/// The linear coefficient of a section; one that vanishes becomes the smallest that still decides the sign of the phase.
fn damping_term(c1: f64, size: f64) -> f64 {
    if c1 == 0.0 { 1e-150 / size } else { c1 }
}

/// The sections of one group.
fn group_of(sections: &[Section], group: usize) -> &[Section] {
    let start = (group * SECTIONS_PER_GROUP).min(sections.len());
    let end = (start + SECTIONS_PER_GROUP).min(sections.len());
    &sections[start..end]
}

/// A product of sections at a block of frequencies that remembers how often its phase went around.
struct Turning<const W: usize> {
    re: [f64x4; W],
    im: [f64x4; W],
    /// Whole turns on top of the principal phase, which is in (−π, 0) where the imaginary part is negative and in [0, π] elsewhere.
    turns: [f64x4; W],
}

impl<const W: usize> Turning<W> {
    #[inline]
    fn product(sections: &[Section], omega: &[f64x4; W], omega2: &[f64x4; W]) -> Self {
        let (one, zero) = (f64x4::ONE, f64x4::ZERO);
        let mut all = Self { re: [one; W], im: [zero; W], turns: [zero; W] };
        let Some((first, rest)) = sections.split_first() else { return all };
        let (c1, c2) = (f64x4::splat(first.c1), f64x4::splat(first.c2));
        for k in 0..W {
            all.re[k] = one - omega2[k] * c2;
            all.im[k] = omega[k] * c1;
        }
        for section in rest {
            let (c1, c2) = (f64x4::splat(section.c1), f64x4::splat(section.c2));
            // A section of positive phase carries the product over π exactly when its sign changes from plus to minus, one of negative
            // phase when it changes from minus to plus.
            if section.c1 > 0.0 {
                for k in 0..W {
                    let above = all.im[k].simd_ge(zero);
                    all.multiply(k, one - omega2[k] * c2, omega[k] * c1);
                    all.turns[k] += above & all.im[k].simd_lt(zero) & one;
                }
            } else {
                for k in 0..W {
                    let below = all.im[k].simd_lt(zero);
                    all.multiply(k, one - omega2[k] * c2, omega[k] * c1);
                    all.turns[k] -= below & all.im[k].simd_ge(zero) & one;
                }
            }
        }
        all
    }

    #[inline]
    fn multiply(&mut self, k: usize, re: f64x4, im: f64x4) {
        (self.re[k], self.im[k]) = (self.re[k] * re - self.im[k] * im, self.re[k] * im + self.im[k] * re);
    }

    #[inline]
    fn squared(&self, k: usize) -> f64x4 {
        self.re[k] * self.re[k] + self.im[k] * self.im[k]
    }

    /// Phase of this product less the phase of the other [rad].
    #[inline]
    fn phase_against(&self, other: &Self, k: usize) -> f64x4 {
        let zero = f64x4::ZERO;
        let re = self.re[k] * other.re[k] + self.im[k] * other.im[k];
        let im = self.im[k] * other.re[k] - self.re[k] * other.im[k];
        let (here, there) = (self.im[k].simd_lt(zero), other.im[k].simd_lt(zero));
        // Principal phases of one sign leave their difference in (−π, π]; of unlike sign, it leaves that upwards (here ≥ 0 > there) when its own
        // sign is minus, downwards (there ≥ 0 > here) when it is plus: when its sign is that of `there`.
        let left = (here ^ there) & !(there ^ im.simd_lt(zero));
        let turn = left & (f64x4::ONE | (here & f64x4::splat(-0.0)));
        angle(im, re) + (self.turns[k] - other.turns[k] + turn) * f64x4::splat(TAU)
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::super::precision::{assert_close, assert_complex_close, assert_near};
    use super::*;

    fn real(x: f64) -> Complex {
        Complex::new(x, 0.0)
    }

    fn zpk(zeros: &[Complex], poles: &[Complex], gain: f64) -> Zpk {
        let both = |roots: &[Complex]| {
            roots.iter().flat_map(|r| if r.im == 0.0 { vec![*r] } else { vec![*r, r.conj()] }).collect()
        };
        Zpk::new(both(zeros), both(poles), gain).unwrap()
    }

    fn samples() -> Vec<FactoredResponse> {
        let lc = Complex::new(-300.0, 8e3);
        vec![
            FactoredResponse::new(zpk(&[], &[], -2.0), 0.0),
            FactoredResponse::new(zpk(&[], &[Complex::ZERO], 1e3), 1e-6),
            FactoredResponse::new(
                zpk(
                    &[real(-1e3), real(-2e3), real(-1e5), real(4e4)],
                    &[Complex::ZERO, lc, real(-2e5), real(-3e5)],
                    -5e9,
                ),
                2e-6,
            ),
            FactoredResponse::new(
                zpk(&[Complex::new(0.0, 5e3)], &[real(2e3), Complex::new(0.0, 9e3), real(-1e4)], 3e5),
                0.0,
            ),
            FactoredResponse::new(zpk(&[], &[lc, lc, lc, lc, lc, lc, real(-8e3), real(-8e3), real(-8e3)], 1e60), 0.0),
            FactoredResponse::new(
                zpk(
                    &[Complex::new(50.0, 8e3), Complex::ZERO, real(-1e7)],
                    &[Complex::new(20.0, 3e3), Complex::new(-1.0, 9e5)],
                    1.0,
                ),
                0.0,
            ),
        ]
    }

    /// Two routes: the vector kernel against the product of the roots and the sum of the factors' phases.
    #[test]
    fn curve_is_the_product_and_the_sum_of_factors() {
        for response in samples() {
            let f: Vec<f64> = (0..203).map(|k| 10.0_f64.powf(0.5 + 0.03 * f64::from(k))).collect();
            let (mut gain, mut phase) = (vec![0.0; f.len()], vec![0.0; f.len()]);
            response.curve(&f, &mut gain, &mut phase);
            for ((f, gain), phase) in f.iter().zip(&gain).zip(&phase) {
                let exact = response.zpk().at_hz(*f);
                assert_near(*gain, 20.0 * exact.norm().log10(), 1e-11 * gain.abs().max(1.0));
                let sum: f64 = response.factor_phases_deg(*f).iter().map(|p| p.phase_deg).sum();
                assert_near(*phase, sum, 1e-11 * sum.abs().max(100.0));
                assert_complex_close(response.at_hz(*f), exact * Complex::cis(-TAU * f * response.delay_s()), 1e-11);
            }
        }
    }

    /// Definition: each factor alone, at its corner and far off.
    #[test]
    fn phases_of_single_factors() {
        let phase = |z: &[Complex], p: &[Complex], gain, f| FactoredResponse::new(zpk(z, p, gain), 0.0).phase_deg(f);
        let corner = 1e3;
        let w = TAU * corner;
        assert_near(phase(&[], &[Complex::ZERO], 1.0, 7.0), -90.0, 1e-12);
        assert_near(phase(&[Complex::ZERO], &[], 1.0, 7.0), 90.0, 1e-12);
        assert_near(phase(&[real(-w)], &[], 1.0, corner), 45.0, 1e-12);
        assert_near(phase(&[], &[real(-w)], 1.0, corner), -45.0, 1e-12);
        // (1 − s/w): positive at DC needs a negative leading gain.
        assert_near(phase(&[real(w)], &[], -1.0, corner), -45.0, 1e-12);
        assert_near(phase(&[real(w)], &[], 1.0, corner), -225.0, 1e-12);
        // 1/(s − w) = −1/(w·(1 − s/w)).
        assert_near(phase(&[], &[real(w)], 1.0, corner), -135.0, 1e-12);
        let lc = Complex::new(-0.1, (1.0_f64 - 0.01).sqrt()) * w;
        assert_near(phase(&[], &[lc], 1.0, corner), -90.0, 1e-10);
        assert_near(phase(&[], &[lc], 1.0, 1e9), -180.0, 1e-4);
        assert_near(phase(&[], &[Complex::new(0.0, w)], 1.0, 2.0 * corner), -180.0, 1e-12);
        assert_near(phase(&[], &[-lc.conj()], 1.0, 1e9), 180.0, 1e-4);
        assert_near(phase(&[], &[lc, lc, lc], 1.0, 1e9), -540.0, 1e-4);
    }

    /// Definition: slopes against differences.
    #[test]
    fn slopes_are_the_derivatives() {
        for response in samples() {
            for f in [11.0, 500.0, 1.1e3, 5e3, 3e4, 1e6] {
                let step = 1e-5;
                let (low, high) = (response.log_point(f * f64::exp(-step)), response.log_point(f * f64::exp(step)));
                let here = response.log_point(f);
                assert_near(
                    here.gain_slope,
                    (high.ln_gain - low.ln_gain) / (2.0 * step),
                    1e-4 * here.gain_slope.abs().max(1.0),
                );
                assert_near(
                    here.phase_slope,
                    (high.phase_rad - low.phase_rad) / (2.0 * step),
                    1e-4 * here.phase_slope.abs().max(1.0),
                );
            }
        }
    }

    #[test]
    fn nothing_is_ever_not_a_number() {
        for response in samples() {
            let f = [0.0, 1e-300, 5e3 / TAU, 9e3 / TAU, 1e12, 1e40];
            let (mut gain, mut phase) = ([0.0; 6], [0.0; 6]);
            response.curve(&f, &mut gain, &mut phase);
            assert!(gain.iter().chain(&phase).all(|x| !x.is_nan()), "{gain:?} {phase:?}");
        }
        let silent = FactoredResponse::new(Zpk::constant(0.0), 0.0);
        assert!(silent.gain_db(1e3) <= -f64::MAX);
        assert_complex_close(silent.at_hz(1e3), Complex::new(1e-300, 0.0), 1.0);
    }

    #[test]
    fn breakpoints_surround_resonances_only() {
        let response = FactoredResponse::new(zpk(&[], &[real(-1e3), Complex::new(-1.0, TAU * 1e3)], 1.0), 0.0);
        let points = response.breakpoints_hz();
        assert!(points.iter().any(|f| (f / 1e3 - 1.0).abs() < 1e-6));
        assert!(points.len() > 20 && points.iter().all(|f| (f / 1e3).ln().abs() < 0.13));
    }

    proptest! {
        /// The unwrapped phase never jumps: between neighbours on a fine grid it moves no more than the factors can.
        #[test]
        fn phase_is_continuous(
            roots in prop::collection::vec((2.0..6.0_f64, -1.0..1.0_f64, any::<bool>()), 1..9),
        ) {
            let (mut zeros, mut poles) = (Vec::new(), Vec::new());
            for (decade, damping, is_zero) in roots {
                let size = 10.0_f64.powf(decade);
                let damping = if damping.abs() < 0.05 { 0.05 } else { damping };
                let root = if decade > 4.0 { Complex::new(damping * size, size) } else { real(damping * size) };
                if is_zero { zeros.push(root) } else { poles.push(root) }
            }
            let response = FactoredResponse::new(zpk(&zeros, &poles, 1.0), 0.0);
            let mut last: Option<f64> = None;
            for k in 0..3000 {
                let phase = response.phase_deg(10.0_f64.powf(0.5 + 0.002 * f64::from(k)));
                prop_assert!(last.is_none_or(|last| (phase - last).abs() < 60.0), "jump at {k}: {last:?} {phase}");
                last = Some(phase);
            }
        }
    }

    #[test]
    fn gain_in_decibels() {
        let response = FactoredResponse::new(zpk(&[], &[], 10.0), 0.0);
        assert_close(response.gain_db(5.0), 20.0, 1e-15);
        assert_near(response.phase_deg(5.0), 0.0, 0.0);
    }
}
