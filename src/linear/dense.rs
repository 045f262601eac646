//! Small dense matrices by rows of vectors, for the exponential and for powers of a transition matrix.
//!
//! A row is padded with zeros to a whole number of vectors of four, so every product is a sum of scaled rows without remainders.

use wide::f64x4;

/// A matrix stored by rows, each padded to whole vectors.
#[derive(Clone, Debug)]
pub(super) struct Rows {
    height: usize,
    /// Vectors in a row.
    lanes: usize,
    data: Vec<[f64; 4]>,
}

impl Rows {
    /// All zeros.
    pub(super) fn zeros(rows: usize, columns: usize) -> Self {
        Self::blank(rows, columns.div_ceil(4))
    }

    fn blank(rows: usize, lanes: usize) -> Self {
        Self { height: rows, lanes, data: vec![[0.0; 4]; rows * lanes] }
    }

    /// From entries by place.
    pub(super) fn from_fn(rows: usize, columns: usize, entry: impl Fn(usize, usize) -> f64) -> Self {
        let mut all = Self::zeros(rows, columns);
        let width = 4 * all.lanes;
        for (i, row) in all.data.as_flattened_mut().chunks_exact_mut(width.max(1)).enumerate() {
            for (j, x) in row[..columns].iter_mut().enumerate() {
                *x = entry(i, j);
            }
        }
        all
    }

    /// Number of rows.
    pub(super) fn rows(&self) -> usize {
        self.height
    }

    /// The entry at a place.
    pub(super) fn at(&self, i: usize, j: usize) -> f64 {
        self.data.as_flattened()[4 * i * self.lanes + j]
    }

    /// One row, padding included.
    pub(super) fn row(&self, i: usize) -> &[f64] {
        &self.data.as_flattened()[4 * i * self.lanes..4 * (i + 1) * self.lanes]
    }

    /// All rows one after the other, padding included.
    pub(super) fn entries(&self) -> &[f64] {
        self.data.as_flattened()
    }

    /// Scales all entries.
    pub(super) fn scale(&mut self, factor: f64) {
        self.data.as_flattened_mut().iter_mut().for_each(|x| *x *= factor);
    }

    /// Adds a multiple of a matrix of the same shape.
    pub(super) fn add_scaled(&mut self, other: &Self, factor: f64) {
        for (x, y) in self.data.as_flattened_mut().iter_mut().zip(other.data.as_flattened()) {
            *x += *y * factor;
        }
    }

    /// Adds to the diagonal.
    pub(super) fn add_to_diagonal(&mut self, value: f64) {
        let step = 4 * self.lanes + 1;
        self.data.as_flattened_mut().iter_mut().step_by(step).for_each(|x| *x += value);
    }

    /// The product with a matrix that has as many rows as this has columns.
    pub(super) fn times(&self, other: &Self) -> Self {
        let mut data = Vec::with_capacity(self.height * other.lanes);
        for i in 0..self.height {
            other.combine(self.row(i), &mut data);
        }
        Self { height: self.height, lanes: other.lanes, data }
    }

    /// The rows `start`, `start·M`, `start·M²`, … of this square matrix M.
    pub(super) fn orbit(&self, start: &Self, count: usize) -> Self {
        let mut data = Vec::with_capacity(count * self.lanes);
        if count > 0 {
            data.extend_from_slice(&start.data[..self.lanes]);
        }
        let mut last = start.data[..self.lanes].to_vec();
        for i in 1..count {
            self.combine(last.as_flattened(), &mut data);
            last.copy_from_slice(&data[i * self.lanes..]);
        }
        Self { height: count, lanes: self.lanes, data }
    }

    /// The transpose of the first columns.
    pub(super) fn transpose(&self, columns: usize) -> Self {
        Self::from_fn(columns, self.height, |i, j| self.at(j, i))
    }

    /// Appends a sum of the rows, weighted: a row vector times this matrix.
    #[inline]
    fn combine(&self, weights: &[f64], data: &mut Vec<[f64; 4]>) {
        match self.lanes {
            1 => data.extend_from_slice(&weighted::<1>(self.data.as_chunks().0, weights)),
            2 => data.extend_from_slice(&weighted::<2>(self.data.as_chunks().0, weights)),
            3 => data.extend_from_slice(&weighted::<3>(self.data.as_chunks().0, weights)),
            8 => data.extend_from_slice(&weighted::<8>(self.data.as_chunks().0, weights)),
            lanes => {
                for lane in 0..lanes {
                    let mut total = f64x4::ZERO;
                    for (row, weight) in self.data.chunks_exact(lanes).zip(weights) {
                        total += f64x4::new(row[lane]) * f64x4::splat(*weight);
                    }
                    data.push(total.to_array());
                }
            }
        }
    }

    /// Solves `self · X = right` in place of `right`, by elimination with row pivoting; false when this matrix is singular.
    pub(super) fn solve(mut self, right: &mut Self) -> bool {
        let n = self.height;
        for c in 0..n {
            let pivot = (c..n).max_by(|&p, &q| self.at(p, c).abs().total_cmp(&self.at(q, c).abs())).unwrap_or(c);
            let value = self.at(pivot, c);
            if value == 0.0 || !value.is_finite() {
                return false;
            }
            self.swap(pivot, c);
            right.swap(pivot, c);
            for r in c + 1..n {
                let factor = self.at(r, c) / value;
                if factor != 0.0 {
                    self.subtract_row(r, c, factor);
                    right.subtract_row(r, c, factor);
                }
            }
        }
        for c in (0..n).rev() {
            let inverse = 1.0 / self.at(c, c);
            right.data[c * right.lanes..(c + 1) * right.lanes]
                .as_flattened_mut()
                .iter_mut()
                .for_each(|x| *x *= inverse);
            for r in 0..c {
                right.subtract_row(r, c, self.at(r, c));
            }
        }
        true
    }

    fn swap(&mut self, p: usize, q: usize) {
        if p != q {
            for lane in 0..self.lanes {
                self.data.swap(p * self.lanes + lane, q * self.lanes + lane);
            }
        }
    }

    /// Subtracts a multiple of one row from another.
    fn subtract_row(&mut self, from: usize, row: usize, factor: f64) {
        for lane in 0..self.lanes {
            let x = self.data[row * self.lanes + lane];
            let y = &mut self.data[from * self.lanes + lane];
            for (y, x) in y.iter_mut().zip(x) {
                *y -= factor * x;
            }
        }
    }
}

/// A weighted sum of rows of a width known to the compiler, kept in registers.
#[inline]
fn weighted<const L: usize>(rows: &[[[f64; 4]; L]], weights: &[f64]) -> [[f64; 4]; L] {
    let mut total = [f64x4::ZERO; L];
    for (row, weight) in rows.iter().zip(weights) {
        let weight = f64x4::splat(*weight);
        for (total, x) in total.iter_mut().zip(row) {
            *total += f64x4::new(*x) * weight;
        }
    }
    total.map(f64x4::to_array)
}

#[cfg(test)]
mod tests {
    use nalgebra::DMatrix;

    use super::super::precision::assert_near;
    use super::*;

    fn sample(rows: usize, columns: usize, seed: usize) -> DMatrix<f64> {
        DMatrix::from_fn(rows, columns, |i, j| (((i * 31 + j * 17 + seed * 7) % 23) as f64 - 11.0) / 7.0)
    }

    fn rows(m: &DMatrix<f64>) -> Rows {
        Rows::from_fn(m.nrows(), m.ncols(), |i, j| m[(i, j)])
    }

    fn matrix(rows: &Rows, columns: usize) -> DMatrix<f64> {
        DMatrix::from_fn(rows.rows(), columns, |i, j| rows.at(i, j))
    }

    /// Two routes: products, transposes and solutions against the general matrices, in every width class.
    #[test]
    fn agrees_with_general_matrices() {
        for n in [1, 3, 4, 5, 8, 9, 12, 13, 21] {
            let (a, b) = (sample(n + 2, n, 1), sample(n, n + 1, 2));
            let near = |x: &DMatrix<f64>, y: &DMatrix<f64>| assert_near((x - y).amax(), 0.0, 1e-12 * y.amax().max(1.0));
            near(&matrix(&rows(&a).times(&rows(&b)), n + 1), &(&a * &b));
            near(&matrix(&rows(&a).transpose(n), n + 2), &a.transpose());
            let square = sample(n, n, 3) + DMatrix::identity(n, n) * 5.0;
            let mut solution = rows(&b);
            assert!(rows(&square).solve(&mut solution));
            near(&(square.clone() * matrix(&solution, n + 1)), &b);
            let orbit = matrix(&rows(&square).orbit(&rows(&a), 3), n);
            near(&orbit.rows(2, 1).into_owned(), &(a.rows(0, 1) * &square * &square));
        }
        assert!(!rows(&DMatrix::zeros(2, 2)).solve(&mut Rows::zeros(2, 2)));
    }
}
