//! Many solves with s·1 − A at changing s: the matrix is brought to Hessenberg form once, each solve then costs n²/2.
//!
//! *Conventions*: A = V·H·V⁻¹ with H upper Hessenberg; V is a scaling and ordering times an orthogonal matrix. Right-hand sides and
//! solutions stand in the coordinates of H. *Source*: Laub, IEEE Trans. Automatic Control 26 (1981), 407 (from memory).

use super::Complex;
use super::eigen::balance;
use nalgebra::DMatrix;

/// A real matrix made ready for solves with s·1 − A.
#[derive(Clone, Debug)]
pub struct Resolvent {
    order: usize,
    /// Rows of H, one after the other.
    hessenberg: Vec<f64>,
    /// From the coordinates of A to those of H.
    pub into: DMatrix<f64>,
    /// From the coordinates of H to those of A.
    pub out_of: DMatrix<f64>,
}

/// Room for the solves, so that none allocates.
#[derive(Clone, Debug, Default)]
pub struct Bench {
    upper: Vec<Complex>,
    below: Vec<Complex>,
}

impl Resolvent {
    /// Makes a square matrix ready.
    pub fn new(a: &DMatrix<f64>) -> Self {
        let n = a.nrows();
        let mut scaled = a.clone();
        let scales = balance(&mut scaled);
        // Fast states first: the small entries of a graded matrix then survive the reduction.
        let mut order: Vec<usize> = (0..n).collect();
        let size: Vec<f64> = (0..n).map(|i| scaled.row(i).iter().map(|x| x.abs()).sum()).collect();
        order.sort_by(|&p, &q| size[q].total_cmp(&size[p]));
        let graded = DMatrix::from_fn(n, n, |i, j| scaled[(order[i], order[j])]);
        let (q, h) = if n > 1 { graded.hessenberg().unpack() } else { (DMatrix::identity(n, n), graded) };
        let mut out_of = DMatrix::zeros(n, n);
        let mut into = DMatrix::zeros(n, n);
        for (i, &place) in order.iter().enumerate() {
            for j in 0..n {
                out_of[(place, j)] = scales[place] * q[(i, j)];
                into[(j, place)] = q[(i, j)] / scales[place];
            }
        }
        let hessenberg = (0..n * n).map(|k| h[(k / n, k % n)]).collect();
        Resolvent { order: n, hessenberg, into, out_of }
    }

    /// Number of rows.
    pub fn order(&self) -> usize {
        self.order
    }

    /// Solves (s·1 − H)·x = right in place; false where s is an eigenvalue.
    pub fn solve(&self, s: Complex, right: &mut [Complex], bench: &mut Bench) -> bool {
        let n = self.order;
        if right.len() != n {
            return false;
        }
        let Bench { upper, below } = bench;
        // Whatever stands there from the last solve is overwritten before it is read.
        upper.resize(n * n, Complex::ZERO);
        below.resize(n, Complex::ZERO);
        // `below` holds the row still to be eliminated, `upper` the finished ones.
        self.fill(s, 0, below);
        for k in 0..n {
            let (head, tail) = upper.split_at_mut((k + 1) * n);
            let row = &mut head[k * n..];
            if k + 1 == n {
                row.copy_from_slice(below);
                break;
            }
            let next = &mut tail[..n];
            self.fill(s, k + 1, next);
            let exchange = next[k].norm_sqr() > below[k].norm_sqr();
            let (kept, reduced) = if exchange {
                right.swap(k, k + 1);
                row.copy_from_slice(next);
                (&*row, below.as_mut_slice())
            } else {
                row.copy_from_slice(below);
                below.copy_from_slice(next);
                (&*row, below.as_mut_slice())
            };
            if kept[k].norm_sqr() == 0.0 {
                return false;
            }
            let factor = reduced[k] * reciprocal(kept[k]);
            for j in k + 1..n {
                reduced[j] -= factor * kept[j];
            }
            let (done, open) = right.split_at_mut(k + 1);
            open[0] -= factor * done[k];
        }
        for k in (0..n).rev() {
            let row = &upper[k * n..(k + 1) * n];
            if row[k].norm_sqr() == 0.0 {
                return false;
            }
            let mut sum = right[k];
            for j in k + 1..n {
                sum -= row[j] * right[j];
            }
            right[k] = sum * reciprocal(row[k]);
        }
        true
    }

    /// Row i of s·1 − H, from the entry before the diagonal on.
    fn fill(&self, s: Complex, i: usize, row: &mut [Complex]) {
        let n = self.order;
        let entries = &self.hessenberg[i * n..(i + 1) * n];
        for j in i.saturating_sub(1)..n {
            row[j] = Complex::new(-entries[j], 0.0);
        }
        row[i] += s;
    }
}

/// 1/z without the guards against overflow that numbers of this room do not need.
fn reciprocal(z: Complex) -> Complex {
    let scale = 1.0 / z.norm_sqr();
    Complex::new(z.re * scale, -z.im * scale)
}

#[cfg(test)]
mod tests {
    use super::super::precision::assert_near;
    use super::*;

    /// Definition: (s·1 − A)·x = b put back, over sizes and scales.
    #[test]
    fn solutions_put_back_give_the_right_hand_side() {
        for n in [1_usize, 2, 3, 6, 9] {
            const SCALES: [f64; 4] = [1.0, 30.0, 1e3, 0.02];
            let a = DMatrix::from_fn(n, n, |i, j| {
                (((i * 31 + j * 17 + 5) % 23) as f64 - 11.0) / 7.0 * SCALES[i % 4] / SCALES[j % 3]
            });
            let resolvent = Resolvent::new(&a);
            let identity = &resolvent.out_of * &resolvent.into;
            assert_near((identity - DMatrix::identity(n, n)).amax(), 0.0, 1e-12);
            let b: Vec<Complex> = (0..n).map(|i| Complex::new(1.0 + i as f64, -0.5)).collect();
            let s = Complex::new(0.3, 2.0);
            let mut x: Vec<Complex> = (0..n).map(|r| (0..n).map(|k| b[k] * resolvent.into[(r, k)]).sum()).collect();
            assert!(resolvent.solve(s, &mut x, &mut Bench::default()));
            let x: Vec<Complex> = (0..n).map(|r| (0..n).map(|k| x[k] * resolvent.out_of[(r, k)]).sum()).collect();
            for r in 0..n {
                let back: Complex = s * x[r] - (0..n).map(|k| x[k] * a[(r, k)]).sum::<Complex>();
                let size: f64 = (0..n).map(|k| (x[k] * a[(r, k)]).norm()).sum::<f64>() + (s * x[r]).norm();
                assert_near((back - b[r]).norm() / size, 0.0, 1e-12);
            }
        }
    }

    #[test]
    fn an_eigenvalue_has_no_solution() {
        let resolvent = Resolvent::new(&DMatrix::from_diagonal_element(2, 2, 3.0));
        let mut right = [Complex::new(1.0, 0.0); 2];
        assert!(!resolvent.solve(Complex::new(3.0, 0.0), &mut right, &mut Bench::default()));
        assert!(!resolvent.solve(Complex::new(1.0, 0.0), &mut [], &mut Bench::default()));
    }
}
