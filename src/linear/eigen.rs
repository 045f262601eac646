//! Balancing and eigenvalues of real matrices.
//!
//! A matrix is first split into its irreducible blocks, so a mode that stands apart (an integrator, a stage in front of
//! another) keeps its eigenvalue to the last bit and cannot be disturbed by modes a million times faster. Each block is
//! scaled, ordered from fast to slow, reduced to Hessenberg form and solved by the double-shift QR iteration.
//!
//! Source: Parlett and Reinsch, Numerische Mathematik 13 (1969), 293 (scaling); Martin, Peters and Wilkinson,
//! Numerische Mathematik 14 (1970), 219 (`hqr`); both from memory.
//!
//! Bad input: a matrix that is not square or not finite is an error.

use nalgebra::DMatrix;

use super::{Complex, LinearError};

/// Iterations granted to each eigenvalue. The customary bound is 30; exceptional shifts come every ten.
const SWEEPS_PER_EIGENVALUE: usize = 90;

/// Rounds of scaling. Each round at least halves what is left to do; real systems need three to six.
const SCALING_ROUNDS: usize = 60;

/// Eigenvalues of a real square matrix, sorted by rising magnitude; conjugate pairs adjacent and exact, the upper one first.
///
/// # Errors
/// [`LinearError::Shape`] when not square, [`LinearError::NotFinite`], [`LinearError::NoConvergence`].
pub fn eigenvalues(a: &DMatrix<f64>) -> Result<Vec<Complex>, LinearError> {
    let n = a.nrows();
    if a.ncols() != n {
        return Err(LinearError::Shape(format!("{n} rows but {} columns", a.ncols())));
    }
    if a.iter().any(|x| !x.is_finite()) {
        return Err(LinearError::NotFinite);
    }
    let mut found = Vec::with_capacity(n);
    for block in irreducible_blocks(a) {
        block_eigenvalues(a, &block, &mut found)?;
    }
    if found.iter().any(|x| !x.re.is_finite() || !x.im.is_finite()) {
        return Err(LinearError::NotFinite);
    }
    sort_roots(&mut found);
    Ok(found)
}

/// Sorts roots by rising magnitude; of each conjugate pair the upper one is kept and followed by its exact conjugate.
pub(super) fn sort_roots(roots: &mut Vec<Complex>) {
    let mut upper: Vec<Complex> = roots.iter().copied().filter(|r| r.im >= 0.0).collect();
    upper.sort_by(|p, q| p.norm().total_cmp(&q.norm()).then(p.re.total_cmp(&q.re)));
    roots.clear();
    for root in upper {
        roots.push(root);
        if root.im > 0.0 {
            roots.push(root.conj());
        }
    }
}

/// Index sets of the strongly connected parts of the matrix's graph; together they hold every index once.
fn irreducible_blocks(a: &DMatrix<f64>) -> Vec<Vec<usize>> {
    let n = a.nrows();
    if n > 64 {
        return vec![(0..n).collect()];
    }
    let reach = reachability(a);
    let mut taken = 0_u64;
    let mut blocks = Vec::new();
    for i in 0..n {
        if taken >> i & 1 == 1 {
            continue;
        }
        let block: Vec<usize> =
            (i..n).filter(|&j| j == i || (reach[i] >> j & 1 == 1 && reach[j] >> i & 1 == 1)).collect();
        for &j in &block {
            taken |= 1 << j;
        }
        blocks.push(block);
    }
    blocks
}

/// For each state the set of states that drive it, directly or through others, one bit each; at most 64 states.
pub(super) fn reachability(a: &DMatrix<f64>) -> Vec<u64> {
    let n = a.nrows();
    let mut reach = vec![0_u64; n];
    for (j, column) in a.column_iter().enumerate() {
        for (i, value) in column.iter().enumerate() {
            if *value != 0.0 {
                reach[i] |= 1 << j;
            }
        }
    }
    for k in 0..n {
        let through = reach[k];
        for row in &mut reach {
            if *row >> k & 1 == 1 {
                *row |= through;
            }
        }
    }
    reach
}

/// Appends the eigenvalues of one irreducible block.
fn block_eigenvalues(a: &DMatrix<f64>, block: &[usize], found: &mut Vec<Complex>) -> Result<(), LinearError> {
    if let [i] = *block {
        found.push(Complex::new(a[(i, i)], 0.0));
        return Ok(());
    }
    let n = block.len();
    let mut m = Square { n, data: vec![0.0; n * n] };
    for (i, &from_row) in block.iter().enumerate() {
        for (j, &from_column) in block.iter().enumerate() {
            m.data[i * n + j] = a[(from_row, from_column)];
        }
    }
    m.balance();
    m.order_fast_to_slow();
    m.hessenberg();
    m.qr_eigenvalues(found)
}

/// Scales the rows and columns of a square matrix by powers of two until row and column sums are alike; returns the scales `t`
/// of the new coordinates, so that `scaled[(i, j)] = a[(i, j)]·t[j]/t[i]`.
pub(super) fn balance(a: &mut DMatrix<f64>) -> Vec<f64> {
    let n = a.nrows();
    let mut m = Square { n, data: a.transpose().as_slice().to_vec() };
    let scales = m.balance();
    for i in 0..n {
        for j in 0..n {
            a[(i, j)] = m.data[i * n + j];
        }
    }
    scales
}

/// A square matrix stored by rows, for the kernels below.
struct Square {
    n: usize,
    data: Vec<f64>,
}

impl Square {
    fn at(&self, i: usize, j: usize) -> f64 {
        self.data[i * self.n + j]
    }

    fn set(&mut self, i: usize, j: usize, value: f64) {
        self.data[i * self.n + j] = value;
    }

    /// Diagonal scaling by powers of two; returns the scales.
    fn balance(&mut self) -> Vec<f64> {
        let n = self.n;
        let mut scales = vec![1.0; n];
        for _ in 0..SCALING_ROUNDS {
            let mut settled = true;
            for (i, scale) in scales.iter_mut().enumerate() {
                let (mut column, mut row) = (0.0, 0.0);
                for j in (0..n).filter(|&j| j != i) {
                    column += self.at(j, i).abs();
                    row += self.at(i, j).abs();
                }
                if column == 0.0 || row == 0.0 {
                    continue;
                }
                // Within a factor of two either way the nearest power of two to the root is one.
                if (0.5..=2.0).contains(&(row / column)) {
                    continue;
                }
                // The power of two nearest to √(row/column).
                let factor = (0.5 * (row / column).log2()).round().clamp(-500.0, 500.0).exp2();
                if column * factor + row / factor < 0.95 * (column + row) {
                    settled = false;
                    *scale *= factor;
                    for j in 0..n {
                        self.data[j * n + i] *= factor;
                    }
                    for j in 0..n {
                        self.data[i * n + j] /= factor;
                    }
                }
            }
            if settled {
                break;
            }
        }
        scales
    }

    /// Orders the coordinates by falling row sum: the QR iteration finds small eigenvalues well from below a graded matrix.
    fn order_fast_to_slow(&mut self) {
        let n = self.n;
        let mut order: Vec<(f64, usize)> =
            (0..n).map(|i| (self.data[i * n..(i + 1) * n].iter().map(|x| x.abs()).sum(), i)).collect();
        order.sort_by(|p, q| q.0.total_cmp(&p.0).then(p.1.cmp(&q.1)));
        let old = std::mem::take(&mut self.data);
        self.data = order
            .iter()
            .flat_map(|&(_, i)| order.iter().map(move |&(_, j)| (i, j)))
            .map(|(i, j)| old[i * n + j])
            .collect();
    }

    /// Reduces to upper Hessenberg form by Householder reflections.
    fn hessenberg(&mut self) {
        let n = self.n;
        let mut v = vec![0.0; n];
        for k in 0..n.saturating_sub(2) {
            let scale: f64 = (k + 1..n).map(|i| self.at(i, k).abs()).sum();
            if (k + 2..n).all(|i| self.at(i, k) == 0.0) {
                continue;
            }
            let mut length = 0.0;
            for (i, part) in v.iter_mut().enumerate().skip(k + 1) {
                *part = self.at(i, k) / scale;
                length += *part * *part;
            }
            let pivot = -length.sqrt().copysign(v[k + 1]);
            let beta = length - v[k + 1] * pivot;
            v[k + 1] -= pivot;
            for j in k + 1..n {
                let dot: f64 = (k + 1..n).map(|i| v[i] * self.at(i, j)).sum::<f64>() / beta;
                for (i, part) in v.iter().enumerate().skip(k + 1) {
                    self.data[i * n + j] -= dot * part;
                }
            }
            for row in self.data.chunks_exact_mut(n) {
                let dot: f64 = (k + 1..n).map(|j| v[j] * row[j]).sum::<f64>() / beta;
                for j in k + 1..n {
                    row[j] -= dot * v[j];
                }
            }
            self.set(k + 1, k, pivot * scale);
            for i in k + 2..n {
                self.set(i, k, 0.0);
            }
        }
    }

    /// Eigenvalues of a Hessenberg matrix by the double-shift QR iteration, deflating from below.
    fn qr_eigenvalues(&mut self, found: &mut Vec<Complex>) -> Result<(), LinearError> {
        let norm: f64 = self.data.iter().map(|x| x.abs()).sum();
        let mut shift_total = 0.0;
        let mut rest = self.n;
        let mut sweeps = 0;
        while rest > 0 {
            let last = rest - 1;
            let top = self.deflation_row(last, norm);
            if top == last {
                found.push(Complex::new(self.at(last, last) + shift_total, 0.0));
                rest -= 1;
                sweeps = 0;
            } else if top + 1 == last {
                let [upper, lower] = self.pair_eigenvalues(last, shift_total);
                found.push(upper);
                found.push(lower);
                rest -= 2;
                sweeps = 0;
            } else {
                if sweeps == SWEEPS_PER_EIGENVALUE {
                    return Err(LinearError::NoConvergence);
                }
                let shifts = self.shifts(last, sweeps, &mut shift_total);
                sweeps += 1;
                self.sweep(top, last, shifts);
            }
        }
        Ok(())
    }

    /// First row of the lowest unreduced block that ends at `last`.
    fn deflation_row(&mut self, last: usize, norm: f64) -> usize {
        let mut row = last;
        while row > 0 {
            let near = self.at(row - 1, row - 1).abs() + self.at(row, row).abs();
            let size = if near == 0.0 { norm } else { near };
            if self.at(row, row - 1).abs() <= f64::EPSILON * size {
                self.set(row, row - 1, 0.0);
                return row;
            }
            row -= 1;
        }
        0
    }

    /// Eigenvalues of the 2×2 block that ends at `last`.
    fn pair_eigenvalues(&self, last: usize, shift_total: f64) -> [Complex; 2] {
        let x = self.at(last, last);
        let half = 0.5 * (self.at(last - 1, last - 1) - x);
        let product = self.at(last, last - 1) * self.at(last - 1, last);
        let discriminant = half * half + product;
        let root = discriminant.abs().sqrt();
        let x = x + shift_total;
        if discriminant < 0.0 {
            return [Complex::new(x + half, root), Complex::new(x + half, -root)];
        }
        let step = half + root.copysign(half);
        let other = if step == 0.0 { x } else { x - product / step };
        [Complex::new(x + step, 0.0), Complex::new(other, 0.0)]
    }

    /// The two shifts as sum-and-product parts `(x, y, w)`; an exceptional shift every ten sweeps breaks cycles.
    fn shifts(&mut self, last: usize, sweeps: usize, shift_total: &mut f64) -> (f64, f64, f64) {
        let x = self.at(last, last);
        if sweeps > 0 && sweeps.is_multiple_of(10) {
            *shift_total += x;
            for i in 0..=last {
                self.data[i * self.n + i] -= x;
            }
            let size = self.at(last, last - 1).abs() + self.at(last - 1, last - 2).abs();
            return (0.75 * size, 0.75 * size, -0.4375 * size * size);
        }
        (x, self.at(last - 1, last - 1), self.at(last, last - 1) * self.at(last - 1, last))
    }

    /// One double-shift sweep over rows `top..=last`.
    fn sweep(&mut self, top: usize, last: usize, (x, y, w): (f64, f64, f64)) {
        let (start, mut bulge) = self.sweep_start(top, last, x, y, w);
        for i in start + 2..=last {
            self.set(i, i - 2, 0.0);
            if i > start + 2 {
                self.set(i, i - 3, 0.0);
            }
        }
        for k in start..last {
            let three = k + 1 != last;
            let mut size = 1.0;
            if k != start {
                bulge = [self.at(k, k - 1), self.at(k + 1, k - 1), if three { self.at(k + 2, k - 1) } else { 0.0 }];
                size = bulge.iter().map(|b| b.abs()).sum();
                if size != 0.0 {
                    bulge = bulge.map(|b| b / size);
                }
            }
            let [p, q, r] = bulge;
            let s = (p * p + q * q + r * r).sqrt().copysign(p);
            if s == 0.0 {
                continue;
            }
            if k != start {
                self.set(k, k - 1, -s * size);
            } else if top != start {
                self.set(k, k - 1, -self.at(k, k - 1));
            }
            let p = p + s;
            self.reflect(k, top, last, [p / s, q / s, r / s], [q / p, r / p]);
        }
    }

    /// Where a sweep may start below `top` because two small subdiagonals follow each other, and its first column.
    fn sweep_start(&self, top: usize, last: usize, x: f64, y: f64, w: f64) -> (usize, [f64; 3]) {
        let mut m = last - 2;
        loop {
            let z = self.at(m, m);
            let (r, s) = (x - z, y - z);
            let p = (r * s - w) / self.at(m + 1, m) + self.at(m, m + 1);
            let q = self.at(m + 1, m + 1) - z - r - s;
            let r = self.at(m + 2, m + 1);
            let size = p.abs() + q.abs() + r.abs();
            let column = if size == 0.0 { [p, q, r] } else { [p / size, q / size, r / size] };
            if m == top {
                return (m, column);
            }
            let small = self.at(m, m - 1).abs() * (column[1].abs() + column[2].abs());
            let large = column[0].abs() * (self.at(m - 1, m - 1).abs() + z.abs() + self.at(m + 1, m + 1).abs());
            if small <= f64::EPSILON * large {
                return (m, column);
            }
            m -= 1;
        }
    }

    /// Applies the reflection of step `k` from both sides.
    fn reflect(&mut self, k: usize, top: usize, last: usize, [x, y, z]: [f64; 3], [q, r]: [f64; 2]) {
        let n = self.n;
        let three = k + 1 != last;
        for j in k..=last {
            let mut p = self.at(k, j) + q * self.at(k + 1, j);
            if three {
                p += r * self.at(k + 2, j);
                self.data[(k + 2) * n + j] -= p * z;
            }
            self.data[(k + 1) * n + j] -= p * y;
            self.data[k * n + j] -= p * x;
        }
        for i in top..=last.min(k + 3) {
            let row = &mut self.data[i * n + k..];
            let mut p = x * row[0] + y * row[1];
            if three {
                p += z * row[2];
                row[2] -= p * r;
            }
            row[1] -= p * q;
            row[0] -= p;
        }
    }
}

#[cfg(test)]
mod tests {
    use nalgebra::DMatrix;
    use proptest::prelude::*;

    use super::super::precision::assert_same_roots;
    use super::*;

    /// A matrix with planted eigenvalues behind a dense similarity, and the eigenvalues.
    fn planted(reals: &[f64], pairs: &[(f64, f64)], mixing: &[f64]) -> (DMatrix<f64>, Vec<Complex>) {
        let n = reals.len() + 2 * pairs.len();
        let mut core = DMatrix::zeros(n, n);
        let mut roots = Vec::new();
        for (i, r) in reals.iter().enumerate() {
            core[(i, i)] = *r;
            roots.push(Complex::new(*r, 0.0));
        }
        for (k, (re, im)) in pairs.iter().enumerate() {
            let i = reals.len() + 2 * k;
            core.view_mut((i, i), (2, 2)).copy_from_slice(&[*re, -im, *im, *re]);
            roots.extend([Complex::new(*re, *im), Complex::new(*re, -im)]);
        }
        // A product of plane rotations: orthogonal, so the eigenvalues keep their condition.
        for (k, angle) in mixing.iter().enumerate() {
            let (i, j) = (k % n, (k * 5 + 1) % n);
            if i != j {
                let mut turn = DMatrix::identity(n, n);
                let (s, c) = angle.sin_cos();
                (turn[(i, i)], turn[(j, j)], turn[(i, j)], turn[(j, i)]) = (c, c, -s, s);
                core = &turn * core * turn.transpose();
            }
        }
        (core, roots)
    }

    proptest! {
        /// Planted answer: what was put in comes out, to rounding times the norm.
        #[test]
        fn planted_eigenvalues_are_found(
            reals in prop::collection::vec(-10.0..10.0_f64, 0..5),
            pairs in prop::collection::vec((-5.0..5.0_f64, 0.1..10.0_f64), 1..4),
            mixing in prop::collection::vec(-3.0..3.0_f64, 40),
        ) {
            let (matrix, roots) = planted(&reals, &pairs, &mixing);
            let mut found = eigenvalues(&matrix).unwrap();
            for root in &roots {
                let (i, distance) = found.iter().enumerate().map(|(i, r)| (i, (r - root).norm())).min_by(|p, q| p.1.total_cmp(&q.1)).unwrap();
                prop_assert!(distance < 1e-11, "{root} off by {distance:e}");
                found.swap_remove(i);
            }
        }
    }

    /// Planted answer over nine decades: a companion-like chain of well separated modes that only balancing and ordering keep apart.
    #[test]
    fn stiff_blocks_keep_their_slow_modes() {
        // Two stages in series, the second feeding back weakly to the first: slow modes near −1 and −20, fast near −1e9.
        let a = DMatrix::from_row_slice(3, 3, &[-1.0, 1e3, 0.0, 0.0, -20.0, 0.0, 0.0, 5.0, -1e9]);
        let roots = [-1.0, -20.0, -1e9].map(|r| Complex::new(r, 0.0));
        assert_same_roots(&eigenvalues(&a).unwrap(), &roots, 0.0);
    }

    /// Reference: the matrix of Wilkinson, The Algebraic Eigenvalue Problem, ch. 7, whose unshifted iteration cycles (from memory).
    #[test]
    fn cyclic_permutation_converges() {
        let mut a = DMatrix::zeros(5, 5);
        for i in 0..5 {
            a[(i, (i + 4) % 5)] = 1.0;
        }
        let roots: Vec<Complex> =
            (0..5).map(|k| Complex::from_polar(1.0, std::f64::consts::TAU * f64::from(k) / 5.0)).collect();
        assert_same_roots(&eigenvalues(&a).unwrap(), &roots, 1e-14);
    }

    #[test]
    fn conjugates_stay_together_even_when_pairs_repeat() {
        let (matrix, _) = planted(&[-1.0], &[(-2.0, 3.0), (-2.0, 3.0)], &[0.0; 3]);
        let found = eigenvalues(&matrix).unwrap();
        assert!(found[0].im.abs() <= 0.0);
        assert_eq!(found[1], found[2].conj());
        assert_eq!(found[3], found[4].conj());
    }

    #[test]
    fn bad_matrices_are_errors() {
        assert!(matches!(eigenvalues(&DMatrix::zeros(2, 3)), Err(LinearError::Shape(_))));
        assert_eq!(eigenvalues(&DMatrix::from_element(2, 2, f64::NAN)), Err(LinearError::NotFinite));
        assert_eq!(eigenvalues(&DMatrix::zeros(0, 0)), Ok(vec![]));
    }
}
