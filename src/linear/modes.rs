//! Deviation and settling of a step, from the modes of the system.
//!
//! A stable system's response to a ramp that ends is a straight line plus one decaying exponential per mode, exactly. So the search for
//! the extreme and for the last exit of a band knows from the envelope where it may stop, and looks as closely as the modes
//! still alive require: the step of the search doubles as the fast ones die.
//!
//! Method: eigenvectors by inverse iteration on the balanced matrix, residues from one real factorisation, and a check that the
//! modes add up to the system again. Where modes coincide (a multiple pole has too few eigenvectors), the matrix is moved by a few
//! 1e-9 of itself and the check repeated; so the response is good to about 1e-7 of its peak there, else to 1e-10.
//!
//! Bad input: a system that is not stable is an error.

use nalgebra::{DMatrix, DVector};

use super::eigen::balance;
use super::root::bracketed_root;
use super::{Complex, LinearError, RampStep, StateSpace, eigenvalues};

/// Search step as a part of the fastest living mode's 1/|pole|.
const STEP_PART: f64 = 0.35;

/// A mode smaller than this part of the extreme found so far is dead to the search.
const DEAD: f64 = 1e-6;

/// Points looked at in one search at most; a mode of Q = 1,000 needs some ten thousand.
const POINTS_AT_MOST: usize = 400_000;

/// Condition of the eigenvectors up to which the modes are trusted: rounding then costs the response at most about 1e-9.
const CONDITION_AT_MOST: f64 = 1e7;

/// What a step does to an output.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StepMetrics {
    /// Value before the step [unit of the output].
    pub initial_value: f64,
    /// Value long after [unit of the output].
    pub final_value: f64,
    /// Signed extreme against the value before [unit of the output].
    pub deviation: f64,
    /// When it is reached [s]; `None` when it is only approached.
    pub deviation_time_s: Option<f64>,
    /// Last exit from the band around the final value, from the start of the step [s]; 0 when the band is never left, `None` for a band of no width.
    pub settling_s: Option<f64>,
}

/// A stable system taken apart into its modes.
#[derive(Clone, Debug, PartialEq)]
pub struct Modes {
    /// Poles [rad/s], of each pair the upper one.
    poles: Vec<Complex>,
    /// For each output, what it sees of each mode.
    seen: Vec<Vec<Complex>>,
    /// For each input, what it excites of each mode.
    driven: Vec<Vec<Complex>>,
    direct: DMatrix<f64>,
}

/// Deviation and settling of one output for one event; `band` is half the band's width [unit of the output].
///
/// # Errors
/// [`LinearError::NotStable`], [`LinearError::UnknownPort`], [`LinearError::NotFinite`], [`LinearError::NoConvergence`].
pub fn settle(
    system: &StateSpace,
    input: usize,
    output: usize,
    event: RampStep,
    band: f64,
) -> Result<StepMetrics, LinearError> {
    Modes::new(system)?.settle(input, output, event, band)
}

impl Modes {
    /// Takes a stable system apart.
    ///
    /// # Errors
    /// [`LinearError::NotStable`], [`LinearError::NotFinite`], [`LinearError::NoConvergence`].
    pub fn new(system: &StateSpace) -> Result<Self, LinearError> {
        Self::with_poles(system, &system.poles()?)
    }

    /// The same when the poles [rad/s] are known already, as [`StateSpace::poles`] gives them.
    ///
    /// # Errors
    /// As [`Self::new`].
    pub fn with_poles(system: &StateSpace, poles: &[Complex]) -> Result<Self, LinearError> {
        if poles.iter().any(|p| p.re >= 0.0 || p.re.is_nan()) {
            return Err(LinearError::NotStable);
        }
        let scaled = Scaled::new(system);
        if let Some(modes) = scaled.modes(&scaled.a, poles) {
            return Ok(modes);
        }
        for (round, size) in [3e-10, 1e-9, 3e-9, 1e-8, 3e-8].into_iter().enumerate() {
            let moved = scaled.moved(size, round);
            if let Some(modes) = eigenvalues(&moved).ok().and_then(|poles| scaled.modes(&moved, &poles)) {
                return Ok(modes);
            }
        }
        Err(LinearError::NoConvergence)
    }

    /// Deviation and settling of one output for one event; `band` is half the band's width [unit of the output].
    ///
    /// # Errors
    /// [`LinearError::UnknownPort`], [`LinearError::NotFinite`], [`LinearError::Shape`] for a negative rise time.
    pub fn settle(&self, input: usize, output: usize, event: RampStep, band: f64) -> Result<StepMetrics, LinearError> {
        event.check()?;
        let (Some(seen), Some(driven)) = (self.seen.get(output), self.driven.get(input)) else {
            return Err(LinearError::UnknownPort(format!("output {output}, input {input}")));
        };
        let residues: Vec<Complex> = seen.iter().zip(driven).map(|(c, b)| c * b).collect();
        let direct = self.direct[(output, input)];
        let gain = direct - residues.iter().zip(&self.poles).map(|(r, p)| (r / p).re).sum::<f64>();
        let change = event.to - event.from;
        let (initial_value, final_value) = (gain * event.from, gain * event.to);
        let mut segments = Vec::with_capacity(2);
        if event.rise_s > 0.0 {
            segments.push(self.on_ramp(&residues, gain, initial_value, change / event.rise_s, event.rise_s));
        }
        segments.push(self.after(&residues, final_value, change, event.rise_s));
        let extreme = extreme(&segments, initial_value, final_value);
        let settling_s = (band > 0.0).then(|| last_exit(&segments, final_value, band));
        let metrics =
            StepMetrics { initial_value, final_value, deviation: extreme.0, deviation_time_s: extreme.1, settling_s };
        let finite = [metrics.initial_value, metrics.final_value, metrics.deviation].iter().all(|x| x.is_finite());
        if finite { Ok(metrics) } else { Err(LinearError::NotFinite) }
    }

    /// The response while the input moves at a slew: a straight line plus the modes.
    fn on_ramp(&self, residues: &[Complex], gain: f64, before: f64, slew: f64, length: f64) -> Segment<'_> {
        let amplitudes: Vec<Complex> = residues.iter().zip(&self.poles).map(|(r, p)| r / p / p * slew).collect();
        let offset = before - amplitudes.iter().map(|a| a.re).sum::<f64>();
        Segment { start: 0.0, offset, slope: gain * slew, amplitudes, poles: &self.poles, length }
    }

    /// The response once the input has arrived: the modes alone.
    fn after(&self, residues: &[Complex], final_value: f64, change: f64, rise: f64) -> Segment<'_> {
        // A mode excited evenly over the rise has grown to the mean of exp(λτ) over it.
        let amplitudes =
            residues.iter().zip(&self.poles).map(|(r, p)| r / p * mean_exponential(p * rise) * change).collect();
        Segment { start: rise, offset: final_value, slope: 0.0, amplitudes, poles: &self.poles, length: f64::INFINITY }
    }
}

/// `(exp(z) − 1)/z`.
fn mean_exponential(z: Complex) -> Complex {
    if z.norm() > 0.03 {
        return (z.exp() - 1.0) / z;
    }
    // The series to the sixth term is exact to rounding for so small an argument.
    [7.0, 6.0, 5.0, 4.0, 3.0, 2.0].into_iter().fold(Complex::new(1.0, 0.0), |sum, k| sum * z / k + 1.0)
}

/// A stretch of the response: `offset + slope·t + Σ Re(amplitude·exp(pole·t))`.
struct Segment<'a> {
    /// When it begins [s].
    start: f64,
    offset: f64,
    slope: f64,
    amplitudes: Vec<Complex>,
    poles: &'a [Complex],
    /// How long it lasts [s].
    length: f64,
}

impl Segment<'_> {
    fn value(&self, t: f64) -> f64 {
        self.offset + self.slope * t + self.terms(t).map(|term| term.re).sum::<f64>()
    }

    fn rate(&self, t: f64) -> f64 {
        self.slope + self.terms(t).zip(self.poles).map(|(term, p)| (term * p).re).sum::<f64>()
    }

    fn terms(&self, t: f64) -> impl Iterator<Item = Complex> {
        self.amplitudes.iter().zip(self.poles).map(move |(a, p)| a * (p * t).exp())
    }

    /// Where the rate vanishes between two times.
    fn turning_point(&self, from: f64, to: f64) -> f64 {
        bracketed_root(|t| self.rate(t), (from, self.rate(from)), (to, self.rate(to)), 1e-10 * (to - from))
    }

    /// Time after which the modes together stay within the band for good.
    fn envelope_end(&self, band: f64) -> f64 {
        let mut t = 0.0;
        // ln Σ|a|·exp(σt) is convex and falling, so Newton's method from the left never overshoots.
        for _ in 0..100 {
            let (mut sum, mut rate) = (0.0, 0.0);
            for (a, p) in self.amplitudes.iter().zip(self.poles) {
                let size = a.norm() * (p.re * t).exp();
                sum += size;
                rate += size * p.re;
            }
            if sum <= band * (1.0 + 1e-6) || rate >= 0.0 {
                break;
            }
            t -= sum * (sum / band).ln() / rate;
        }
        t
    }
}

/// A walk along a segment in steps that adapt to the modes still alive.
struct Walk<'s> {
    segment: &'s Segment<'s>,
    t: f64,
    step: f64,
    terms: Vec<Complex>,
    factors: Vec<Complex>,
}

impl<'s> Walk<'s> {
    fn new(segment: &'s Segment<'s>, t: f64) -> Self {
        Self {
            segment,
            t,
            step: 0.0,
            terms: segment.terms(t).collect(),
            factors: vec![Complex::ZERO; segment.poles.len()],
        }
    }

    /// The largest sensible step for modes above a size; `None` when all are dead.
    fn sensible_step(&self, dead: f64) -> Option<f64> {
        let living = self.terms.iter().zip(self.segment.poles).filter(|(term, _)| term.norm_sqr() > dead * dead);
        let fastest = living.map(|(_, p)| p.norm_sqr()).fold(0.0, f64::max);
        (fastest > 0.0).then(|| STEP_PART / fastest.sqrt())
    }

    /// Goes on by about the given signed time: a step in use is kept while it is between half and all of it.
    fn advance(&mut self, wanted: f64) {
        let ratio = wanted / self.step;
        if !(1.0..2.0).contains(&ratio) {
            self.step = wanted;
            for (factor, p) in self.factors.iter_mut().zip(self.segment.poles) {
                *factor = (p * wanted).exp();
            }
        }
        self.t += self.step;
        for (term, factor) in self.terms.iter_mut().zip(&self.factors) {
            *term *= factor;
        }
    }

    fn value(&self) -> f64 {
        self.segment.offset + self.segment.slope * self.t + self.terms.iter().map(|term| term.re).sum::<f64>()
    }
}

/// The signed extreme against the value before, and when.
fn extreme(segments: &[Segment<'_>], before: f64, final_value: f64) -> (f64, Option<f64>) {
    let mut best: (f64, Option<f64>) = (0.0, Some(0.0));
    for segment in segments {
        let mut take = |deviation: f64, t: f64| {
            if deviation.abs() > best.0.abs() {
                best = (deviation, Some(segment.start + t));
            }
            best.0.abs()
        };
        let mut walk = Walk::new(segment, 0.0);
        let mut recent = [(0.0, walk.value() - before); 2];
        let mut largest = take(recent[1].1, 0.0);
        for _ in 0..POINTS_AT_MOST {
            let Some(step) = walk.sensible_step(DEAD * largest) else { break };
            let left = walk.terms.iter().map(|term| term.norm()).sum::<f64>();
            if segment.slope == 0.0 && (segment.offset - before).abs() + left < largest {
                break;
            }
            if walk.t + step >= segment.length {
                break;
            }
            walk.advance(step);
            let here = (walk.t, walk.value() - before);
            let [first, middle] = recent;
            let (rise, fall) = (middle.1 - first.1, middle.1 - here.1);
            if rise * fall >= 0.0 && middle.1.abs() + rise.abs() + fall.abs() >= largest {
                let t = segment.turning_point(first.0, here.0);
                largest = take(segment.value(t) - before, t);
            }
            largest = largest.max(take(here.1, here.0));
            recent = [middle, here];
        }
        if segment.length.is_finite() {
            take(segment.value(segment.length) - before, segment.length);
        }
    }
    let at_last = final_value - before;
    if at_last.abs() >= best.0.abs() && at_last != 0.0 { (at_last, None) } else { best }
}

/// Last time the response is outside the band around the final value [s]; 0 when it never is.
fn last_exit(segments: &[Segment<'_>], final_value: f64, band: f64) -> f64 {
    for segment in segments.iter().rev() {
        let from = if segment.length.is_finite() { segment.length } else { segment.envelope_end(band) };
        if let Some(t) = last_exit_of(segment, final_value, band, from) {
            return segment.start + t;
        }
    }
    0.0
}

/// Searches one segment backward from a time.
fn last_exit_of(segment: &Segment<'_>, final_value: f64, band: f64, from: f64) -> Option<f64> {
    let excess = |t: f64| (segment.value(t) - final_value).abs() - band;
    let close = |outside: f64, inside: f64| {
        bracketed_root(excess, (outside, excess(outside)), (inside, excess(inside)), 1e-12 * inside.abs())
    };
    let mut walk = Walk::new(segment, from);
    let mut recent = [(from, walk.value() - final_value); 2];
    if recent[0].1.abs() > band && segment.length.is_finite() {
        return Some(from);
    }
    let dead = 0.02 * band / (1.0 + segment.poles.len() as f64);
    for _ in 0..POINTS_AT_MOST {
        if walk.t <= 0.0 {
            break;
        }
        let step = walk.sensible_step(dead).unwrap_or(walk.t).min(walk.t);
        walk.advance(-step);
        let here = (walk.t.max(0.0), walk.value() - final_value);
        let [first, middle] = recent;
        let (rise, fall) = (middle.1 - first.1, middle.1 - here.1);
        if rise * fall >= 0.0 && middle.1.abs() + rise.abs() + fall.abs() > band && first.0 > here.0 {
            let t = segment.turning_point(here.0, first.0);
            if excess(t) > 0.0 {
                return Some(close(t, first.0));
            }
        }
        if here.1.abs() > band {
            return Some(close(here.0, middle.0));
        }
        recent = [middle, here];
    }
    None
}

/// A system with its states scaled alike.
struct Scaled {
    a: DMatrix<f64>,
    b: DMatrix<f64>,
    c: DMatrix<f64>,
    d: DMatrix<f64>,
}

impl Scaled {
    fn new(system: &StateSpace) -> Self {
        let mut scaled = Self { a: system.a.clone(), b: system.b.clone(), c: system.c.clone(), d: system.d.clone() };
        let scales = balance(&mut scaled.a);
        for (i, scale) in scales.iter().enumerate() {
            scaled.b.row_mut(i).iter_mut().for_each(|x| *x /= scale);
            scaled.c.column_mut(i).iter_mut().for_each(|x| *x *= scale);
        }
        scaled
    }

    /// The state matrix moved by a small part of itself, differently each round: multiple poles part.
    fn moved(&self, size: f64, round: usize) -> DMatrix<f64> {
        let n = self.a.nrows();
        let rates: Vec<f64> = self.a.row_iter().map(|row| row.iter().map(|x| x.abs()).sum()).collect();
        DMatrix::from_fn(n, n, |i, j| self.a[(i, j)] + size * rates[i].min(rates[j]) * scatter(i * n + j + 7 * round))
    }

    /// Modes with the eigenvectors of a matrix that is this one or very near to it; `None` when they cannot be trusted.
    fn modes(&self, matrix: &DMatrix<f64>, poles: &[Complex]) -> Option<Modes> {
        let n = matrix.nrows();
        let upper: Vec<Complex> = poles.iter().copied().filter(|p| p.im >= 0.0).collect();
        let mut vectors = DMatrix::zeros(n, n);
        let mut column = 0;
        for pole in &upper {
            if pole.im == 0.0 {
                let v = eigenvector(matrix.clone(), pole.re)?;
                vectors.column_mut(column).copy_from(&v);
                column += 1;
            } else {
                let v = eigenvector(matrix.map(|x| Complex::new(x, 0.0)), *pole)?;
                vectors.column_mut(column).copy_from(&v.map(|x| x.re));
                vectors.column_mut(column + 1).copy_from(&v.map(|x| x.im));
                column += 2;
            }
        }
        let inverse = vectors.clone().try_inverse()?;
        let condition = one_norm(&vectors) * one_norm(&inverse);
        if n > 0 && (condition.is_nan() || condition > CONDITION_AT_MOST) {
            return None;
        }
        let (b, c) = (inverse * &self.b, &self.c * vectors);
        let mut modes = Modes {
            seen: vec![Vec::with_capacity(upper.len()); c.nrows()],
            driven: vec![Vec::with_capacity(upper.len()); b.ncols()],
            poles: upper,
            direct: self.d.clone(),
        };
        let mut k = 0;
        for pole in &modes.poles {
            let pair = pole.im != 0.0;
            for (row, seen) in modes.seen.iter_mut().enumerate() {
                seen.push(Complex::new(c[(row, k)], if pair { c[(row, k + 1)] } else { 0.0 }));
            }
            for (column, driven) in modes.driven.iter_mut().enumerate() {
                driven.push(Complex::new(b[(k, column)], if pair { -b[(k + 1, column)] } else { 0.0 }));
            }
            k += if pair { 2 } else { 1 };
        }
        Some(modes)
    }
}

/// Largest column sum of magnitudes.
fn one_norm(m: &DMatrix<f64>) -> f64 {
    m.column_iter().map(|column| column.iter().map(|x| x.abs()).sum::<f64>()).fold(0.0, f64::max)
}

/// Fixed numbers in (−1, 1) without pattern.
fn scatter(k: usize) -> f64 {
    2.0 * (0.618_033_988_749_895 * (k + 1) as f64).fract() - 1.0
}

/// The eigenvector of a matrix to a known eigenvalue, of unit length, by two steps of inverse iteration.
fn eigenvector<T: nalgebra::ComplexField<RealField = f64> + Copy>(
    mut matrix: DMatrix<T>,
    eigenvalue: T,
) -> Option<DVector<T>> {
    let n = matrix.nrows();
    // Off the eigenvalue by little more than rounding, so that the factorisation exists.
    let shift = eigenvalue * T::from_real(1.0 + 1e-13);
    for i in 0..n {
        matrix[(i, i)] -= shift;
    }
    let factors = matrix.lu();
    let mut v = DVector::from_fn(n, |i, _| T::from_real(1.0 + 0.5 * scatter(i)));
    for _ in 0..2 {
        if !factors.solve_mut(&mut v) {
            return None;
        }
        let length = v.norm();
        if !(length.is_finite() && length > 0.0) {
            return None;
        }
        v.unscale_mut(length);
    }
    Some(v)
}
