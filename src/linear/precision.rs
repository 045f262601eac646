//! How numbers are compared in the tests of this room.

use super::Complex;

/// Asserts that two numbers agree relative to the larger of them.
#[track_caller]
pub(crate) fn assert_close(actual: f64, expected: f64, relative: f64) {
    let size = actual.abs().max(expected.abs());
    assert!((actual - expected).abs() <= relative * size, "{actual:e} is not {expected:e} to {relative:e}");
}

/// Asserts that two numbers agree absolutely.
#[track_caller]
pub(crate) fn assert_near(actual: f64, expected: f64, absolute: f64) {
    assert!((actual - expected).abs() <= absolute, "{actual:e} is not {expected:e} within {absolute:e}");
}

/// Asserts that two complex numbers agree relative to the larger modulus.
#[track_caller]
pub(crate) fn assert_complex_close(actual: Complex, expected: Complex, relative: f64) {
    let size = actual.norm().max(expected.norm());
    assert!((actual - expected).norm() <= relative * size, "{actual} is not {expected} to {relative:e}");
}

/// Asserts that two lists hold the same roots in any order, each to a relative tolerance.
#[track_caller]
pub(crate) fn assert_same_roots(actual: &[Complex], expected: &[Complex], relative: f64) {
    assert_eq!(actual.len(), expected.len(), "{actual:?} has not as many roots as {expected:?}");
    let mut left = actual.to_vec();
    for root in expected {
        let (place, distance) =
            left.iter().enumerate().map(|(i, r)| (i, (r - root).norm())).min_by(|p, q| p.1.total_cmp(&q.1)).unwrap();
        assert!(
            distance <= relative * root.norm(),
            "no root of {actual:?} is {root} to {relative:e}, the nearest is {distance:e} away"
        );
        left.swap_remove(place);
    }
}
