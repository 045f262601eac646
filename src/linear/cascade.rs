//! Zeros, poles and gain realised as a scaled cascade of first- and second-order sections.
//!
//! Each section keeps its poles in its own two states, so no coefficient of a long polynomial ever appears and a pole far from
//! the others stays where it is to the last digits. The states are scaled at the end so that rows and columns are alike.

use nalgebra::DMatrix;

use super::eigen::balance;
use super::{Complex, LinearError, StateSpace, Zpk};

impl Zpk {
    /// The same transfer function in state space, from input `u` to output `y`.
    ///
    /// # Errors
    /// [`LinearError::Improper`] with more zeros than poles, [`LinearError::NotFinite`].
    pub fn cascade(&self) -> Result<StateSpace, LinearError> {
        let sections = sections(self)?.iter().map(Section::state_space).collect::<Result<Vec<_>, _>>()?;
        // Every section is brought to gain one at its poles, and what remains is shared evenly: no signal inside is much larger than another.
        let mut levelled = Vec::with_capacity(sections.len());
        let mut ln_gain = self.gain.abs().ln();
        for (section, size) in sections {
            let level = section.entry_at(0, 0, Complex::new(0.0, size)).map_or(1.0, Complex::norm);
            let level = if level.is_normal() { level } else { 1.0 };
            ln_gain += level.ln();
            levelled.push((section, level));
        }
        let share = (ln_gain / levelled.len().max(1) as f64).exp();
        let unit =
            if levelled.is_empty() { self.gain } else { f64::from(u8::from(self.gain != 0.0)).copysign(self.gain) };
        let mut whole = StateSpace::constant(DMatrix::from_element(1, 1, unit), &["u"], &["y"])?;
        for (mut section, level) in levelled {
            section.c *= share / level;
            section.d *= share / level;
            whole = whole.series(&section)?;
        }
        scale_states(whole)
    }
}

/// Scales the states of a system with one input and one output so that rows and columns of `[A B; C D]` are alike.
fn scale_states(mut system: StateSpace) -> Result<StateSpace, LinearError> {
    let n = system.order();
    let mut all = DMatrix::zeros(n + 2, n + 2);
    all.view_mut((0, 0), (n, n)).copy_from(&system.a);
    all.view_mut((0, n), (n, 1)).copy_from(&system.b);
    all.view_mut((n + 1, 0), (1, n)).copy_from(&system.c);
    // A unit way back from output to input lets the two ports scale against each other; only the states' scales are taken over.
    all[(n, n + 1)] = 1.0;
    let scales = balance(&mut all);
    for i in 0..n {
        system.b[(i, 0)] /= scales[i];
        system.c[(0, i)] *= scales[i];
        for j in 0..n {
            system.a[(i, j)] *= scales[j] / scales[i];
        }
    }
    StateSpace::new(system.a, system.b, system.c, system.d, &["u"], &["y"])
}

/// Poles of one section, and the zeros it takes.
struct Section {
    poles: Poles,
    zeros: Vec<Complex>,
}

enum Poles {
    One(f64),
    Two(f64, f64),
    Pair(Complex),
}

impl Poles {
    /// How badly a zero fits here. A zero far below the poles is a small rest of large terms, so it costs most; one far above only spreads
    /// the scales.
    fn cost(&self, zero: Complex) -> f64 {
        let size = match *self {
            Self::One(p) => p.abs(),
            Self::Two(p, q) => p.abs().max(q.abs()),
            Self::Pair(p) => p.norm(),
        };
        let apart = ((zero.norm() + f64::MIN_POSITIVE) / (size + f64::MIN_POSITIVE)).ln();
        if apart < 0.0 { -apart } else { 1e-3 * apart }
    }

    fn room(&self) -> usize {
        if matches!(self, Self::One(_)) { 1 } else { 2 }
    }
}

/// Groups the roots: complex pairs of zeros first, each to the section with room for two that it fits best, then the real ones.
fn sections(zpk: &Zpk) -> Result<Vec<Section>, LinearError> {
    if zpk.zeros.len() > zpk.poles.len() {
        return Err(LinearError::Improper);
    }
    let mut sections: Vec<Section> = zpk
        .poles
        .iter()
        .filter(|p| p.im > 0.0)
        .map(|p| Section { poles: Poles::Pair(*p), zeros: Vec::new() })
        .collect();
    let real: Vec<f64> = zpk.poles.iter().filter(|p| p.im == 0.0).map(|p| p.re).collect();
    for pair in real.chunks(2) {
        let poles = if let [p, q] = *pair { Poles::Two(p, q) } else { Poles::One(pair[0]) };
        sections.push(Section { poles, zeros: Vec::new() });
    }
    for need in [2, 1] {
        for zero in zpk.zeros.iter().filter(|z| if need == 2 { z.im > 0.0 } else { z.im == 0.0 }) {
            let nearest = sections
                .iter_mut()
                .filter(|s| s.zeros.len() + need <= s.poles.room())
                .min_by(|p, q| p.poles.cost(*zero).total_cmp(&q.poles.cost(*zero)))
                .ok_or(LinearError::Improper)?;
            nearest.zeros.push(*zero);
            if need == 2 {
                nearest.zeros.push(zero.conj());
            }
        }
    }
    Ok(sections)
}

impl Section {
    /// The section with leading coefficient 1, and the size of its poles [rad/s].
    fn state_space(&self) -> Result<(StateSpace, f64), LinearError> {
        let (a, b, c, d) = match self.poles {
            Poles::One(p) => {
                let (c, d) = self.zeros.first().map_or((1.0, 0.0), |z| (p - z.re, 1.0));
                (DMatrix::from_element(1, 1, p), DMatrix::from_element(1, 1, 1.0), DMatrix::from_element(1, 1, c), d)
            }
            Poles::Two(p, q) => self.two_real(p, q),
            Poles::Pair(p) => self.pair(p),
        };
        let size = match self.poles {
            Poles::One(p) => p.abs(),
            Poles::Two(p, q) => p.abs().max(q.abs()),
            Poles::Pair(p) => p.norm(),
        };
        StateSpace::new(a, b, c, DMatrix::from_element(1, 1, d), &["u"], &["y"]).map(|section| (section, size))
    }

    /// Numerator as `d·(s − p)(s − q) + n1·(s − p) + n0`, which needs no expanded product.
    fn two_real(&self, p: f64, q: f64) -> (DMatrix<f64>, DMatrix<f64>, DMatrix<f64>, f64) {
        let (n1, n0, d) = match self.zeros[..] {
            [] => (0.0, 1.0, 0.0),
            [z] => (1.0, p - z.re, 0.0),
            [y, z, ..] => (p + q - y.re - z.re, ((p - y) * (p - z)).re, 1.0),
        };
        // x1' = p·x1 + u, x2' = q·x2 + n0·x1 + n1·u, y = x2 + d·u.
        (
            DMatrix::from_row_slice(2, 2, &[p, 0.0, n0, q]),
            DMatrix::from_row_slice(2, 1, &[1.0, n1]),
            DMatrix::from_row_slice(1, 2, &[0.0, 1.0]),
            d,
        )
    }

    /// Numerator around the pair's real part σ: `d·((s − σ)² + β²) + n1·(s − σ) + n0`.
    fn pair(&self, pole: Complex) -> (DMatrix<f64>, DMatrix<f64>, DMatrix<f64>, f64) {
        let (sigma, beta) = (pole.re, pole.im);
        let (n1, n0, d) = match self.zeros[..] {
            [] => (0.0, 1.0, 0.0),
            [z] => (1.0, sigma - z.re, 0.0),
            [y, z, ..] => (2.0 * sigma - y.re - z.re, ((sigma - y) * (sigma - z)).re - beta * beta, 1.0),
        };
        (
            DMatrix::from_row_slice(2, 2, &[sigma, beta, -beta, sigma]),
            DMatrix::from_row_slice(2, 1, &[0.0, 1.0]),
            DMatrix::from_row_slice(1, 2, &[n0 / beta, n1]),
            d,
        )
    }
}
