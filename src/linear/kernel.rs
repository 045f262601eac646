//! Logarithm and angle of four numbers at once, without special cases, branches or more than one division each.
//!
//! Valid for: any numbers; both are good to about 1e-15 of the larger of the result and one.
//!
//! Source: the series of arc tangent and of the inverse hyperbolic tangent, their coefficients moved to the near-minimax polynomial on
//! the interval needed (Chebyshev interpolation in 50 digits); the tests compare with the standard library.

#![expect(clippy::inline_always, reason = "the kernels must melt into the loop that calls them")]

use std::f64::consts::{FRAC_PI_2, FRAC_PI_4, LN_2, PI, SQRT_2};

use wide::{f64x4, u64x4};

/// atan(√u)/√u on 0 ≤ u ≤ tan²(π/8), rising powers; error 1e-15 at the most, 4e-16 rad of the angle.
const ARC_TANGENT: [f64; 10] = [
    0.999999999999999,
    -0.3333333333322143,
    0.19999999978392663,
    -0.14285712661684793,
    0.11111048853751296,
    -0.09089529956562307,
    0.07673535428183285,
    -0.0650598296717084,
    0.05024762118940128,
    -0.025316479573776477,
];

/// artanh(√u)/√u on 0 ≤ √u ≤ (√2 − 1)/(√2 + 1), rising powers; error 2.3e-16, 4e-17 of the logarithm.
const HYPERBOLIC: [f64; 7] = [
    1.0000000000000002,
    0.3333333333327646,
    0.20000000030870807,
    0.14285708010553835,
    0.11111717273758953,
    0.09060967215607607,
    0.08418829985340244,
];

/// tan(π/8), where the angle is taken from 45° instead of from 0°.
const TAN_EIGHTH: f64 = SQRT_2 - 1.0;

/// The polynomial with these coefficients, rising powers.
#[inline(always)]
fn polynomial<const N: usize>(coefficients: &[f64; N], x: f64x4) -> f64x4 {
    coefficients[..N - 1].iter().rev().fold(f64x4::splat(coefficients[N - 1]), |sum, c| sum * x + f64x4::splat(*c))
}

/// Mantissas in [1, 2) of positive normal numbers.
#[inline(always)]
fn mantissa(bits: u64x4) -> f64x4 {
    f64x4::from_bits((bits & u64x4::splat((1 << 52) - 1)) | u64x4::splat(1.0_f64.to_bits()))
}

/// `ln(top/bottom)`; zero and what is not a number count as the least positive normal number, infinity as the greatest.
#[inline(always)]
pub(super) fn ln_ratio(top: f64x4, bottom: f64x4) -> f64x4 {
    // Whole numbers of either sign added to the bits of this number add to its value.
    const COUNTER: f64 = 6755399441055744.0;
    let least = f64x4::splat(f64::MIN_POSITIVE);
    let (top, bottom) = (top.fast_max(least).to_bits(), bottom.fast_max(least).to_bits());
    let exponent =
        f64x4::from_bits((top >> 52) - (bottom >> 52) + u64x4::splat(COUNTER.to_bits())) - f64x4::splat(COUNTER);
    let (top, bottom) = (mantissa(top), mantissa(bottom));
    // A quotient of mantissas beyond √2 either way gives a factor of two to the exponent.
    let root = f64x4::splat(SQRT_2);
    let high = top.simd_gt(bottom * root) & f64x4::ONE;
    let low = bottom.simd_gt(top * root) & f64x4::ONE;
    let top = top * (f64x4::ONE + low - high * f64x4::splat(0.5));
    let s = (top - bottom) / (top + bottom);
    (exponent + high - low) * f64x4::splat(LN_2) + (s + s) * polynomial(&HYPERBOLIC, s * s)
}

/// The angle of `re + j·im` in [−π, π]; 0 for zero.
#[inline(always)]
pub(super) fn angle(im: f64x4, re: f64x4) -> f64x4 {
    let (x, y) = (re.abs(), im.abs());
    let steep = y.simd_gt(x);
    let (small, large) = (x.fast_min(y), x.fast_max(y));
    let oblique = small.simd_gt(large * f64x4::splat(TAN_EIGHTH));
    let t = (small - (oblique & large)) / (large + (oblique & small)).fast_max(f64x4::splat(f64::MIN_POSITIVE));
    let octant = (oblique & f64x4::splat(FRAC_PI_4)) + t * polynomial(&ARC_TANGENT, t * t);
    let quadrant = steep.select(f64x4::splat(FRAC_PI_2) - octant, octant);
    let half = re.simd_lt(f64x4::ZERO).select(f64x4::splat(PI) - quadrant, quadrant);
    half ^ (im & f64x4::splat(-0.0))
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    proptest! {
        /// Two routes: against the standard library, over the whole range and all quadrants.
        #[test]
        fn logarithm_and_angle(a in -1e3..1e3_f64, b in -1e3..1e3_f64, p in -300..300_i32, q in -300..300_i32) {
            let (x, y) = (a * 2.0_f64.powi(p / 10), b * 2.0_f64.powi(q / 10));
            let angle = angle(f64x4::splat(y), f64x4::splat(x)).to_array()[0];
            prop_assert!((angle - y.atan2(x)).abs() < 1.5e-15, "{angle} against {}", y.atan2(x));
            let (top, bottom) = (a.abs() * 2.0_f64.powi(p), b.abs() * 2.0_f64.powi(q));
            prop_assume!(top > 0.0 && bottom > 0.0);
            let exact = top.ln() - bottom.ln();
            let ln = ln_ratio(f64x4::splat(top), f64x4::splat(bottom)).to_array()[0];
            prop_assert!((ln - exact).abs() < 1e-15 * (1.0 + top.ln().abs() + bottom.ln().abs()), "{ln} against {exact}");
        }
    }

    #[test]
    fn axes_and_edges() {
        let at = |im: f64, re: f64| angle(f64x4::splat(im), f64x4::splat(re)).to_array()[0];
        for (im, re) in [
            (0.0, 1.0),
            (0.0, -1.0),
            (-0.0, -1.0),
            (1.0, 0.0),
            (-1.0, 0.0),
            (0.0, 0.0),
            (1.0, 1.0),
            (-1.0, -1.0),
            (1e300, 1e-300),
        ] {
            assert!((at(im, re) - f64::atan2(im, re)).abs() < 1e-15, "{im} {re}: {}", at(im, re));
        }
        let ln = |top: f64, bottom: f64| ln_ratio(f64x4::splat(top), f64x4::splat(bottom)).to_array()[0];
        assert!(ln(3.5, 3.5).abs() <= 0.0);
        let small = 2.0_f64.powi(-40);
        assert!((ln(1.0 + small, 1.0) - small.ln_1p()).abs() < 1e-27);
        for extreme in [ln(0.0, 1.0), ln(f64::INFINITY, 0.0), ln(f64::NAN, 1.0)] {
            assert!(extreme.is_finite());
        }
    }
}
