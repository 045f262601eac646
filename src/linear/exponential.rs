//! The exponential of a real matrix.
//!
//! Source: Higham, SIAM J. Matrix Anal. Appl. 26 (2005), 1179, Algorithm 2.3: scaling and squaring with diagonal Padé
//! approximants of degree 3, 5, 7, 9, 13 and the bounds θ of its Table 2.3 (from memory). The matrix is balanced first.

use nalgebra::DMatrix;

use super::LinearError;
use super::dense::Rows;
use super::eigen::balance;

/// Largest 1-norm for which each degree is good to double precision.
const THETA: [(usize, f64); 4] =
    [(3, 1.495585217958292e-2), (5, 2.539398330063230e-1), (7, 9.504178996162932e-1), (9, 2.097847961257068)];

/// The same for degree 13.
const THETA_13: f64 = 5.371920351148152;

/// Halvings beyond which the result cannot be a finite matrix other than of decayed modes.
const SQUARINGS_AT_MOST: i32 = 1000;

/// `exp(a)`.
///
/// # Errors
/// [`LinearError::Shape`] when not square; [`LinearError::NotFinite`] when the matrix or its exponential leaves the number range.
pub fn expm(a: &DMatrix<f64>) -> Result<DMatrix<f64>, LinearError> {
    let n = a.nrows();
    if a.ncols() != n {
        return Err(LinearError::Shape(format!("{n} rows but {} columns", a.ncols())));
    }
    if a.iter().any(|x| !x.is_finite()) {
        return Err(LinearError::NotFinite);
    }
    if n == 0 {
        return Ok(a.clone());
    }
    let mut scaled = a.clone();
    let scales = balance(&mut scaled);
    let rows = exponential(Rows::from_fn(n, n, |i, j| scaled[(i, j)]))?;
    let result = DMatrix::from_fn(n, n, |i, j| rows.at(i, j) * (scales[i] / scales[j]));
    if result.iter().all(|x| x.is_finite()) { Ok(result) } else { Err(LinearError::NotFinite) }
}

/// The algorithm on a balanced matrix.
pub(super) fn exponential(mut a: Rows) -> Result<Rows, LinearError> {
    let n = a.rows();
    let norm = (0..n).map(|j| (0..n).map(|i| a.at(i, j).abs()).sum::<f64>()).fold(0.0, f64::max);
    for (degree, bound) in THETA {
        if norm <= bound {
            let (odd, even) = low_degree(&a, degree);
            return quotient(&odd, even);
        }
    }
    let mut squarings = 0;
    let mut size = norm;
    while size > THETA_13 {
        size *= 0.5;
        squarings += 1;
        if squarings > SQUARINGS_AT_MOST {
            return Err(LinearError::NotFinite);
        }
    }
    a.scale(0.5_f64.powi(squarings));
    let (odd, even) = degree_13(&a);
    let mut result = quotient(&odd, even)?;
    for _ in 0..squarings {
        result = result.times(&result);
    }
    Ok(result)
}

/// `(even − odd)⁻¹ (even + odd)`.
fn quotient(odd: &Rows, even: Rows) -> Result<Rows, LinearError> {
    let mut right = even.clone();
    right.add_scaled(odd, 1.0);
    let mut left = even;
    left.add_scaled(odd, -1.0);
    if left.solve(&mut right) { Ok(right) } else { Err(LinearError::NotFinite) }
}

/// Odd and even part of the numerator for degree 3, 5, 7 or 9.
fn low_degree(a: &Rows, degree: usize) -> (Rows, Rows) {
    let n = a.rows();
    let coefficients = pade_coefficients(degree);
    let squared = a.times(a);
    let (mut odd, mut even) = (Rows::zeros(n, n), Rows::zeros(n, n));
    even.add_to_diagonal(coefficients[0]);
    odd.add_to_diagonal(coefficients[1]);
    let mut power = squared.clone();
    for (k, pair) in coefficients.chunks_exact(2).enumerate().skip(1) {
        if k > 1 {
            power = power.times(&squared);
        }
        even.add_scaled(&power, pair[0]);
        odd.add_scaled(&power, pair[1]);
    }
    (a.times(&odd), even)
}

/// Numerator coefficients `(2m − k)! m! / ((2m)! (m − k)! k!)` of the diagonal Padé approximant of degree m, k rising from 0.
fn pade_coefficients(m: usize) -> Vec<f64> {
    let mut coefficients = vec![1.0];
    let mut last = 1.0;
    for k in 1..=m {
        last *= (m + 1 - k) as f64 / ((2 * m + 1 - k) * k) as f64;
        coefficients.push(last);
    }
    coefficients
}

/// Odd and even part of the numerator for degree 13, with six products.
fn degree_13(a: &Rows) -> (Rows, Rows) {
    const B: [f64; 14] = [
        64764752532480000.0,
        32382376266240000.0,
        7771770303897600.0,
        1187353796428800.0,
        129060195264000.0,
        10559470521600.0,
        670442572800.0,
        33522128640.0,
        1323241920.0,
        40840800.0,
        960960.0,
        16380.0,
        182.0,
        1.0,
    ];
    let a2 = a.times(a);
    let a4 = a2.times(&a2);
    let a6 = a4.times(&a2);
    let mix = |c6: f64, c4: f64, c2: f64, c0: f64| {
        let mut sum = a6.clone();
        sum.scale(c6);
        sum.add_scaled(&a4, c4);
        sum.add_scaled(&a2, c2);
        sum.add_to_diagonal(c0);
        sum
    };
    let mut odd = a6.times(&mix(B[13], B[11], B[9], 0.0));
    odd.add_scaled(&mix(B[7], B[5], B[3], B[1]), 1.0);
    let mut even = a6.times(&mix(B[12], B[10], B[8], 0.0));
    even.add_scaled(&mix(B[6], B[4], B[2], B[0]), 1.0);
    (a.times(&odd), even)
}

#[cfg(test)]
mod tests {
    use super::super::precision::{assert_close, assert_near};
    use super::*;

    /// Planted answer: a rotation that decays, over all degrees of the approximant.
    #[test]
    fn decaying_rotation() {
        for size in [1e-6, 0.01, 0.2, 0.8, 1.9, 5.0, 40.0, 300.0] {
            let a = DMatrix::from_row_slice(2, 2, &[-0.5, 1.0, -1.0, -0.5]) * size;
            let e = expm(&a).unwrap();
            let (s, c) = f64::sin_cos(size);
            let decay = (-0.5 * size).exp();
            // Rounding of the halved argument grows back with the number of halvings.
            let tolerance = 1e-15 * (10.0 + size * 3.0) * decay;
            assert_near(e[(0, 0)], decay * c, tolerance);
            assert_near(e[(0, 1)], decay * s, tolerance);
            assert_near(e[(1, 0)], -decay * s, tolerance);
        }
    }

    /// Planted answer: a nilpotent chain has the powers of t over factorials.
    #[test]
    fn chain_of_integrators() {
        let n = 5;
        let t = 3.0_f64;
        let a = DMatrix::from_fn(n, n, |i, j| if j == i + 1 { t } else { 0.0 });
        let e = expm(&a).unwrap();
        let mut expected = 1.0;
        for j in 0..n {
            assert_close(e[(0, j)], expected, 1e-14);
            expected *= t / (j + 1) as f64;
        }
    }

    /// Reference: Moler and Van Loan, SIAM Review 45 (2003), Example 1 (from memory); plain series fail on it. Eigenvalues −1 and −17.
    #[test]
    fn the_example_where_series_fail() {
        let a = DMatrix::from_row_slice(2, 2, &[-49.0, 24.0, -64.0, 31.0]);
        let e = expm(&a).unwrap();
        let expected = [-0.735759, 0.551819, -1.471518, 1.103638];
        for (actual, expected) in [e[(0, 0)], e[(0, 1)], e[(1, 0)], e[(1, 1)]].iter().zip(expected) {
            assert_near(*actual, expected, 1e-6);
        }
    }

    /// Definition: exp(A)·exp(−A) = 1, with entries over eight decades.
    #[test]
    fn inverse_of_a_badly_scaled_matrix() {
        let a = DMatrix::from_row_slice(3, 3, &[-1.0, 2e4, 0.0, -1e-4, -0.5, 3e-4, 0.0, 5e3, -2.0]);
        let product = expm(&a).unwrap() * expm(&-&a).unwrap();
        for i in 0..3 {
            assert_near(product[(i, i)], 1.0, 1e-13);
        }
    }

    #[test]
    fn out_of_range_is_an_error() {
        assert_eq!(expm(&DMatrix::from_element(1, 1, 1e4)), Err(LinearError::NotFinite));
        assert_eq!(expm(&DMatrix::from_element(1, 1, f64::NAN)), Err(LinearError::NotFinite));
        assert!(expm(&DMatrix::from_element(1, 1, -1e9)).unwrap()[(0, 0)].abs() <= 0.0);
        assert_eq!(expm(&DMatrix::zeros(0, 0)).unwrap().nrows(), 0);
    }
}
