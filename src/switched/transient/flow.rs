//! Exact propagation of one linear system over any time, without allocation: tables of exponentials, and a short Taylor series
//! for what is left.
//!
//! *Conventions*: x' = A·x + B·w, w' = s with constant s. The extended state z = [x; w; s] lies in one slice; a map takes z to x,
//! column by column, columns padded to a multiple of four. *Method*: time is written in digits: so many steps of a 32nd of the
//! period, so many of a 16th of that, and so on until a step is short against everything the system does; one table of
//! exponentials for each digit, and the rest is a series. *Source*: the exponential of the extended matrix holds the forced response
//! (Van Loan, IEEE Trans. Automatic Control 23 (1978), 395, from memory).

use crate::linear::{LinearError, expm};
use nalgebra::DMatrix;

/// Steps of the first table in a period.
const FIRST: usize = 32;
/// Steps of every further table in one of the table before.
const FURTHER: usize = 16;
/// The series is taken where norm times time is below this.
const SHORT: f64 = 0.2;
/// Tables at most: a mode faster than 10¹⁰ per period has long decayed.
const TABLES: usize = 9;
/// Terms of the series at most, the state itself counted.
pub(super) const TERMS: usize = 14;

/// The whole part of a number that is not negative; what is not finite counts as nothing.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "cut on purpose, and saturating")]
pub(super) fn whole(x: f64) -> usize {
    x as usize
}

/// Multiplies a padded map with a vector: `out` takes the sum of the columns.
pub(super) fn multiply(map: &[f64], vector: &[f64], out: &mut [f64]) {
    match out.len() {
        4 => fixed::<4>(map, vector, out),
        8 => fixed::<8>(map, vector, out),
        12 => fixed::<12>(map, vector, out),
        16 => fixed::<16>(map, vector, out),
        20 => fixed::<20>(map, vector, out),
        stride => {
            out.fill(0.0);
            for (column, factor) in map.chunks_exact(stride).zip(vector) {
                for (sum, entry) in out.iter_mut().zip(column) {
                    *sum += entry * factor;
                }
            }
        }
    }
}

fn fixed<const S: usize>(map: &[f64], vector: &[f64], out: &mut [f64]) {
    let mut sum = [0.0; S];
    for (column, factor) in map.as_chunks::<S>().0.iter().zip(vector) {
        for k in 0..S {
            sum[k] += column[k] * factor;
        }
    }
    out.copy_from_slice(&sum);
}

/// Inner product of two slices of one length.
pub(super) fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// The maps of one digit: 1, 2, … `count` steps.
#[derive(Clone, Debug)]
pub(super) struct Table {
    /// Length of a step [s].
    pub(super) step: f64,
    /// Steps it reaches.
    pub(super) count: usize,
    maps: Vec<f64>,
}

/// Exact propagation of x' = A·x + B·w.
#[derive(Clone, Debug)]
pub(super) struct Flow {
    /// States and forcing signals.
    pub(super) n: usize,
    pub(super) m: usize,
    /// Length of a column.
    pub(super) stride: usize,
    pub(super) tables: Vec<Table>,
    /// [A | B], columns padded.
    rate: Vec<f64>,
    norm: f64,
}

impl Flow {
    /// The tables of a system for a period.
    pub(super) fn new(a: &DMatrix<f64>, b: &DMatrix<f64>, period: f64) -> Result<Self, LinearError> {
        let (n, m) = (a.nrows(), b.ncols());
        let stride = n.next_multiple_of(4);
        let norm = one_norm(a).min(one_norm(&a.transpose()));
        let mut steps = vec![(period / FIRST as f64, FIRST)];
        while norm * steps[steps.len() - 1].0 > SHORT && steps.len() < TABLES {
            steps.push((steps[steps.len() - 1].0 / FURTHER as f64, FURTHER));
        }
        let width = n + 2 * m;
        let mut extended = DMatrix::zeros(width, width);
        extended.view_mut((0, 0), (n, n)).copy_from(a);
        extended.view_mut((0, n), (n, m)).copy_from(b);
        for k in 0..m {
            extended[(n + k, n + m + k)] = 1.0;
        }
        let mut tables = Vec::with_capacity(steps.len());
        // One exponential for each digit: products of the shortest would gather its rounding.
        for &(step, count) in &steps {
            let one = expm(&(&extended * step))?;
            let mut maps = vec![0.0; count * stride * width];
            let mut map = one.clone();
            for (k, place) in maps.chunks_exact_mut(stride * width).enumerate() {
                if k > 0 {
                    map = &one * &map;
                }
                for (column, out) in place.chunks_exact_mut(stride).enumerate() {
                    out[..n].copy_from_slice(&map.column(column).as_slice()[..n]);
                }
            }
            tables.push(Table { step, count, maps });
        }
        let mut rate = vec![0.0; stride * (n + m)];
        for (column, out) in rate.chunks_exact_mut(stride).enumerate() {
            let from = if column < n { a.column(column) } else { b.column(column - n) };
            out[..n].copy_from_slice(from.as_slice());
        }
        Ok(Flow { n, m, stride, tables, rate, norm })
    }

    /// Length of the extended state.
    pub(super) fn width(&self) -> usize {
        self.n + 2 * self.m
    }

    /// The map of `steps` ≥ 1 steps of a table.
    pub(super) fn map(&self, table: usize, steps: usize) -> &[f64] {
        let size = self.stride * self.width();
        self.tables
            .get(table)
            .and_then(|table| table.maps.get(steps.checked_sub(1)? * size..steps * size))
            .unwrap_or_default()
    }

    /// State after `steps` ≥ 1 steps of a table; `out` has the length of a column.
    pub(super) fn step(&self, table: usize, steps: usize, z: &[f64], moving: bool, out: &mut [f64]) {
        // Columns of the slopes only where something slopes.
        let used = if moving { self.width() } else { self.n + self.m };
        multiply(self.map(table, steps), &z[..used], out);
    }

    /// Terms of the state's series over a time: `terms` holds them one after the other, columns padded, the state itself first. Returns
    /// how many.
    pub(super) fn series(&self, z: &[f64], time: f64, moving: bool, terms: &mut [f64]) -> usize {
        let (n, m, stride) = (self.n, self.m, self.stride);
        let count = self.terms(time);
        let (first, rest) = terms.split_at_mut(stride);
        first.fill(0.0);
        first[..n].copy_from_slice(&z[..n]);
        multiply(&self.rate, &z[..n + m], &mut rest[..stride]);
        rest[..stride].iter_mut().for_each(|v| *v *= time);
        for k in 2..count {
            let (before, after) = rest.split_at_mut((k - 1) * stride);
            let last = &before[(k - 2) * stride..];
            let (this, later) = after.split_at_mut(stride);
            multiply(&self.rate[..n * stride], &last[..n], this);
            let factor = time / k as f64;
            if k == 2 && moving {
                let forced = &mut later[..stride];
                multiply(&self.rate[n * stride..], &z[n + m..], forced);
                this.iter_mut().zip(forced).for_each(|(v, f)| *v += *f * time);
            }
            for value in this {
                *value *= factor;
            }
        }
        count
    }

    /// Terms that the series over a time needs.
    fn terms(&self, time: f64) -> usize {
        let size = self.norm * time;
        let (mut term, mut count) = (size, 2);
        while term > 1e-17 && count < TERMS {
            term *= size / count as f64;
            count += 1;
        }
        count.max(3)
    }
}

fn one_norm(a: &DMatrix<f64>) -> f64 {
    a.column_iter().map(|c| c.iter().map(|v| v.abs()).sum()).fold(0.0, f64::max)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Planted answer: an oscillator driven by a ramp, and a mode a thousand times faster than the period, at times of every kind.
    #[test]
    fn any_time_is_reached_exactly() {
        let (omega, fast) = (3.0, 4000.0);
        let a = DMatrix::from_row_slice(3, 3, &[0.0, omega, 0.0, -omega, 0.0, 0.0, 0.0, 0.0, -fast]);
        let b = DMatrix::from_row_slice(3, 1, &[0.0, 1.0, fast]);
        let flow = Flow::new(&a, &b, 1.0).unwrap();
        let mut terms = vec![0.0; TERMS * flow.stride];
        let (w, s) = (0.7, -0.3);
        for time in [0.03, 0.031, 0.0312499, 1e-5, 0.999, 1.0] {
            let mut z = vec![0.4, -0.2, 1.5, w, s];
            let mut out = vec![0.0; flow.stride];
            let mut left = time;
            for (k, table) in flow.tables.iter().enumerate() {
                let steps = whole(left / table.step).min(table.count);
                if steps > 0 {
                    flow.step(k, steps, &z, true, &mut out);
                    z[..3].copy_from_slice(&out[..3]);
                    z[3] += s * table.step * steps as f64;
                    left -= table.step * steps as f64;
                }
            }
            let count = flow.series(&z, left, true, &mut terms);
            for k in 0..3 {
                z[k] = (0..count).map(|j| terms[j * flow.stride + k]).sum();
            }
            // y'' + ω²y = ω(w + s·t) for y = x0, from the closed form.
            let (sin, cos) = (omega * time).sin_cos();
            let (y0, v0) = (0.4 - w / omega, -0.2 - s / omega.powi(2));
            let y = y0 * cos + v0 * sin + (w + s * time) / omega;
            let fading = (-fast * time).exp();
            let lag = (1.5 - w + s / fast) * fading + w + s * time - s / fast;
            assert!((z[0] - y).abs() < 1e-13, "{time}: {} {y}", z[0]);
            assert!((z[2] - lag).abs() < 1e-12, "{time}: {} {lag}", z[2]);
        }
    }
}
