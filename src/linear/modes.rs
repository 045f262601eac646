//! A stable system taken apart into its modes, and the step response, deviation and settling they give.
//!
//! A stable system's response to a ramp that ends is a straight line plus one decaying exponential per mode, exactly.
//!
//! Method: eigenvectors by inverse iteration on the balanced matrix, residues from one real factorisation. Where poles all but
//! coincide, and a multiple pole has too few eigenvectors, the matrix is moved by 1e-8 of itself, which parts them; the response
//! is then good to about 1e-7 of its peak (1e-5 for a triple pole), else to 1e-8 or better.
//!
//! Bad input: a system that is not stable is an error.

use nalgebra::{DMatrix, DVector};

use super::eigen::balance;
use super::settling::{Met, Segment};
use super::{Complex, LinearError, RampStep, StateSpace, UniformGrid, eigenvalues};

/// Poles nearer to each other than this part of themselves are parted first: two modes at a distance g cancel to a rest of 1/g, and the
/// rounding in their eigenvectors grows with 1/g again.
const NEAR: f64 = 1e-4;

/// By which part of itself the matrix is moved to part a double, triple or higher pole, as a balance of both errors.
const MOVES: [f64; 3] = [1e-8, 1e-6, 1e-5];

/// Condition of the eigenvectors beyond which another move is tried.
const CONDITION_AT_MOST: f64 = 1e8;

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
        let crowd = crowding(poles);
        let mut best = if crowd < 2 { scaled.modes(&scaled.a, poles) } else { None };
        for (round, size) in MOVES.into_iter().enumerate().skip(crowd.saturating_sub(2).min(MOVES.len() - 1)) {
            if best.as_ref().is_some_and(|(_, condition)| *condition <= CONDITION_AT_MOST) {
                break;
            }
            let moved = scaled.moved(size, round);
            let next = eigenvalues(&moved).ok().and_then(|poles| scaled.modes(&moved, &poles));
            best = match (best, next) {
                (Some(old), Some(new)) => Some(if new.1 < old.1 { new } else { old }),
                (old, new) => old.or(new),
            };
        }
        best.map(|(modes, _)| modes).ok_or(LinearError::NoConvergence)
    }

    /// Deviation and settling of one output for one event; `band` is half the band's width [unit of the output].
    ///
    /// # Errors
    /// [`LinearError::UnknownPort`], [`LinearError::NotFinite`], [`LinearError::Shape`] for a negative rise time.
    pub fn settle(&self, input: usize, output: usize, event: RampStep, band: f64) -> Result<StepMetrics, LinearError> {
        let (segments, initial_value, final_value) = self.segments(input, output, event)?;
        let mut met = Met::new(initial_value, final_value, band);
        for segment in &segments {
            met.walk(segment);
        }
        let settling_s = (band > 0.0).then(|| met.last_exit());
        let (deviation, deviation_time_s) = met.deviation();
        let metrics = StepMetrics { initial_value, final_value, deviation, deviation_time_s, settling_s };
        let finite = [metrics.initial_value, metrics.final_value, metrics.deviation].iter().all(|x| x.is_finite());
        if finite { Ok(metrics) } else { Err(LinearError::NotFinite) }
    }

    /// Output values on a grid for an input that steps, absolute, from the modes already known: a tenth of the work of the
    /// transition matrix, and as exact as the modes are.
    ///
    /// # Errors
    /// As [`Self::settle`].
    pub fn curve(
        &self,
        input: usize,
        output: usize,
        event: RampStep,
        grid: UniformGrid,
    ) -> Result<Vec<f64>, LinearError> {
        if !grid.step_s.is_finite() || grid.step_s <= 0.0 {
            return Err(LinearError::Shape("a grid step is positive".to_owned()));
        }
        let (segments, _, _) = self.segments(input, output, event)?;
        let mut values = Vec::with_capacity(grid.count);
        for segment in &segments {
            segment.sample(grid, &mut values);
        }
        if values.iter().all(|v| v.is_finite()) { Ok(values) } else { Err(LinearError::NotFinite) }
    }

    /// Adds to what `input` does all that it does through a filter into the input `via`: `sign` times their product, exactly,
    /// by partial fractions. The filter, of one input and output, keeps its own modes, so a stiff one costs no accuracy.
    ///
    /// # Errors
    /// [`LinearError::UnknownPort`]; [`LinearError::NotFinite`] where a mode of the filter coincides with one of the system.
    pub fn add_through(&mut self, input: usize, via: usize, filter: &Self, sign: f64) -> Result<(), LinearError> {
        let unknown = || LinearError::UnknownPort(format!("inputs {input} and {via}"));
        let entry = self.driven.get(via).cloned().ok_or_else(unknown)?;
        let own: Vec<Complex> = filter.residues(0, 0).ok_or_else(unknown)?;
        let at_own_poles: Vec<Complex> =
            self.poles.iter().map(|p| sign * filter.value_at(*p, &own, filter.direct[(0, 0)])).collect();
        let target = self.driven.get_mut(input).ok_or_else(unknown)?;
        for ((driven, entered), passed) in target.iter_mut().zip(&entry).zip(&at_own_poles) {
            *driven += entered * passed;
        }
        for output in 0..self.seen.len() {
            let through: Vec<Complex> = self.residues(output, via).ok_or_else(unknown)?;
            let direct = self.direct[(output, via)];
            let seen: Vec<Complex> = filter.poles.iter().map(|q| self.value_at(*q, &through, direct)).collect();
            self.direct[(output, input)] += sign * direct * filter.direct[(0, 0)];
            self.seen[output].extend(seen);
        }
        for (place, driven) in self.driven.iter_mut().enumerate() {
            driven.extend(own.iter().map(|r| if place == input { r * sign } else { Complex::ZERO }));
        }
        self.poles.extend(&filter.poles);
        let finite = |x: &Complex| x.re.is_finite() && x.im.is_finite();
        if self.seen.iter().chain(&self.driven).flatten().all(finite) { Ok(()) } else { Err(LinearError::NotFinite) }
    }

    /// What an output sees of each mode an input excites; of a pair twice the residue of its upper pole.
    fn residues(&self, output: usize, input: usize) -> Option<Vec<Complex>> {
        Some(self.seen.get(output)?.iter().zip(self.driven.get(input)?).map(|(c, b)| c * b).collect())
    }

    /// The transfer function at a complex frequency [rad/s], from its residues; residues of modes not listed are zero.
    fn value_at(&self, s: Complex, residues: &[Complex], direct: f64) -> Complex {
        let modes = residues
            .iter()
            .zip(&self.poles)
            .map(|(r, p)| if p.im == 0.0 { r / (s - p) } else { (r / (s - p) + r.conj() / (s - p.conj())) * 0.5 });
        modes.sum::<Complex>() + direct
    }

    /// The stretches of the response to an event, with the values before it and long after.
    fn segments(
        &self,
        input: usize,
        output: usize,
        event: RampStep,
    ) -> Result<(Vec<Segment<'_>>, f64, f64), LinearError> {
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
        Ok((segments, initial_value, final_value))
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

    /// The state matrix moved by a small part of itself, differently each round, so that multiple poles part.
    ///
    /// Two equal poles in a chain part by the root of the product of the coupling and its return path: a missing return path is
    /// made as strong as that takes, all else moves in proportion.
    fn moved(&self, size: f64, round: usize) -> DMatrix<f64> {
        let n = self.a.nrows();
        let rates: Vec<f64> = self.a.row_iter().map(|row| row.iter().map(|x| x.abs()).sum()).collect();
        DMatrix::from_fn(n, n, |i, j| {
            let (here, back) = (self.a[(i, j)], self.a[(j, i)].abs());
            let scale = if here != 0.0 || back == 0.0 {
                here.abs()
            } else {
                (rates[i] * rates[j] / back).min(rates[i].max(rates[j]) / size.sqrt())
            };
            here + size * scale * scatter(i * n + j + 7 * round)
        })
    }

    /// Modes with the eigenvectors of a matrix that is this one or very near to it, and their condition; `None` when they do not exist.
    fn modes(&self, matrix: &DMatrix<f64>, poles: &[Complex]) -> Option<(Modes, f64)> {
        let n = matrix.nrows();
        let upper: Vec<Complex> = poles.iter().copied().filter(|p| p.im >= 0.0).collect();
        let mut vectors = DMatrix::zeros(n, n);
        let mut column = 0;
        for pole in &upper {
            if pole.im == 0.0 {
                let v = eigenvector(matrix, pole.re)?;
                vectors.column_mut(column).copy_from(&v);
                column += 1;
            } else {
                let v = eigenvector(&matrix.map(|x| Complex::new(x, 0.0)), *pole)?;
                vectors.column_mut(column).copy_from(&v.map(|x| x.re));
                vectors.column_mut(column + 1).copy_from(&v.map(|x| x.im));
                column += 2;
            }
        }
        let inverse = vectors.clone().try_inverse()?;
        let condition = one_norm(&vectors) * one_norm(&inverse);
        if !condition.is_finite() {
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
        Some((modes, condition))
    }
}

/// The most poles that lie near one of them, itself counted.
fn crowding(poles: &[Complex]) -> usize {
    poles.iter().map(|p| poles.iter().filter(|q| (*q - p).norm() <= NEAR * p.norm()).count()).max().unwrap_or(0)
}

/// Largest column sum of magnitudes.
fn one_norm(m: &DMatrix<f64>) -> f64 {
    m.column_iter().map(|column| column.iter().map(|x| x.abs()).sum::<f64>()).fold(0.0, f64::max)
}

/// Fixed numbers in (−1, 1) without pattern.
fn scatter(k: usize) -> f64 {
    2.0 * (0.618_033_988_749_895 * (k + 1) as f64).fract() - 1.0
}

/// The eigenvector of a matrix to a known eigenvalue, of unit length.
fn eigenvector<T: nalgebra::ComplexField<RealField = f64> + Copy>(
    matrix: &DMatrix<T>,
    eigenvalue: T,
) -> Option<DVector<T>> {
    // Off the eigenvalue by little more than rounding, so that the factorisation exists: rounding of the eigenvalue, or, where that
    // is lost beside the entries of the matrix, of those.
    let rounding = matrix.iter().fold(0.0_f64, |size, x| size.max(x.modulus())) * f64::EPSILON;
    let shifts = [
        eigenvalue * T::from_real(1.0 + 1e-13),
        eigenvalue + T::from_real(rounding),
        eigenvalue + T::from_real(8.0 * rounding),
    ];
    shifts.into_iter().find_map(|shift| inverse_iteration(matrix.clone(), shift))
}

/// Two steps of inverse iteration towards the eigenvector nearest to a shift; none where the shifted matrix is singular.
fn inverse_iteration<T: nalgebra::ComplexField<RealField = f64> + Copy>(
    mut matrix: DMatrix<T>,
    shift: T,
) -> Option<DVector<T>> {
    let n = matrix.nrows();
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

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::super::precision::{assert_close, assert_near};
    use super::super::{UniformGrid, Zpk, step_response};
    use super::*;

    fn real(x: f64) -> Complex {
        Complex::new(x, 0.0)
    }

    fn system(zeros: &[Complex], poles: &[Complex], gain: f64) -> StateSpace {
        let both = |roots: &[Complex]| {
            roots.iter().flat_map(|r| if r.im == 0.0 { vec![*r] } else { vec![*r, r.conj()] }).collect()
        };
        Zpk::new(both(zeros), both(poles), gain).unwrap().cascade().unwrap()
    }

    /// Planted answer: overshoot exp(−πζ/√(1 − ζ²)) at π/ωd of a second-order system.
    #[test]
    fn overshoot_of_a_pair() {
        for damping in [0.05, 0.2, 0.5, 0.8] {
            let pair = Complex::new(-damping, (1.0_f64 - damping * damping).sqrt()) * 2e4;
            let found = settle(&system(&[], &[pair], 4e8), 0, 0, RampStep::ideal(3.0), 0.03).unwrap();
            assert_close(
                found.deviation,
                3.0 * (1.0 + (-std::f64::consts::PI * damping / (1.0 - damping * damping).sqrt()).exp()),
                1e-11,
            );
            assert_close(found.deviation_time_s.unwrap(), std::f64::consts::PI / pair.im, 1e-6);
            assert_close(found.final_value, 3.0, 1e-13);
            assert_near(found.initial_value, 0.0, 0.0);
        }
    }

    /// Ceramics with series inductance beside an electrolytic and its load, 3 Hz against 28 MHz: off by rounding of the slow
    /// eigenvalue the shifted matrix is singular to the last digit, and the system has modes all the same.
    #[test]
    fn a_slow_mode_beside_a_far_faster_one_has_its_eigenvector() {
        let (fast, between, slow) = (-178742538.13901076, 19592.476489028217, -24.267865952669165);
        let a = [fast, between, -19919.205309905232, -5e9, 0.0, 0.0, 4999786803.971735, 0.0, slow];
        let a = DMatrix::from_column_slice(3, 3, &a);
        let (b, c) = (DMatrix::from_element(3, 1, 1.0), DMatrix::from_element(1, 3, 1.0));
        let system = StateSpace::new(a, b, c, DMatrix::zeros(1, 1), &["in"], &["out"]).unwrap();
        assert_eq!(Modes::new(&system).unwrap().poles.len(), 3);
    }

    /// Planted answer: a pair of Q 10⁶, a million turns until its envelope exp(σt) is a hundredth; the last turn beyond the band lies within
    /// half a turn of that.
    #[test]
    fn a_pair_that_rings_for_a_million_turns_settles_where_its_envelope_does() {
        let pair = Complex::new(-0.1, 2e5);
        let found = settle(&system(&[], &[pair], pair.norm_sqr()), 0, 0, RampStep::ideal(1.0), 0.01).unwrap();
        let envelope = 100.0_f64.ln() / 0.1;
        let half_turn = std::f64::consts::PI / pair.im;
        let t = found.settling_s.unwrap();
        assert!(
            t <= envelope + 1e-9 * envelope && t > envelope - 1.01 * half_turn - 1e-9 * envelope,
            "{t}, {envelope}"
        );
    }

    /// Planted answer: a fast mode leaves the band while a slow one lives on far inside it.
    #[test]
    fn a_slow_small_mode_does_not_hide_the_exit_of_a_fast_one() {
        let a = DMatrix::from_diagonal(&DVector::from_vec(vec![-1e4, -10.0]));
        let b = DMatrix::from_column_slice(2, 1, &[1e4, 10.0]);
        let c = DMatrix::from_row_slice(1, 2, &[1.0, 1e-3]);
        let both = StateSpace::new(a, b, c, DMatrix::zeros(1, 1), &["in"], &["out"]).unwrap();
        let found = settle(&both, 0, 0, RampStep::ideal(1.0), 0.01).unwrap();
        let t = found.settling_s.unwrap();
        assert_close((-1e4 * t).exp() + 1e-3 * (-10.0 * t).exp(), 0.01, 1e-9);
    }

    /// Two routes: the curve from the modes against the transition matrix, over a ramp that ends between grid points.
    #[test]
    fn curve_agrees_with_the_transition_matrix() {
        let pair = Complex::new(-2e3, 3e4);
        let system = system(&[real(-5e4)], &[pair, real(-1e2), real(-4e6)], 3e11);
        let event = RampStep { from: 0.0, to: 2.0, rise_s: 37.3e-6 };
        let grid = UniformGrid { step_s: 1e-6, count: 1000 };
        let by_modes = Modes::new(&system).unwrap().curve(0, 0, event, grid).unwrap();
        let by_matrix = step_response(&system, 0, 0, grid, event).unwrap();
        let peak = by_matrix.iter().fold(0.0_f64, |peak, v| peak.max(v.abs()));
        for (a, b) in by_modes.iter().zip(&by_matrix) {
            assert_near(*a, *b, 1e-9 * peak);
        }
    }

    /// Planted answer: a lag settles to 1 % in ln 100 time constants and only approaches its extreme; after a ramp, later by a known time.
    #[test]
    fn settling_of_a_lag() {
        let lag = system(&[], &[real(-1e3)], 1e3);
        let found = settle(&lag, 0, 0, RampStep { from: 1.0, to: 2.0, rise_s: 0.0 }, 0.01).unwrap();
        assert_close(found.settling_s.unwrap(), 100.0_f64.ln() / 1e3, 1e-11);
        assert_eq!(found.deviation_time_s, None);
        assert_close(found.deviation, 1.0, 1e-13);
        let rise = 2e-3;
        let ramp = settle(&lag, 0, 0, RampStep { from: 0.0, to: 1.0, rise_s: rise }, 0.01).unwrap();
        let lag_at_end = (1.0 - (-1e3 * rise).exp()) / (1e3 * rise);
        assert_close(ramp.settling_s.unwrap(), rise + (lag_at_end / 0.01).ln() / 1e3, 1e-11);
        // A slow ramp comes into a wide band before it ends.
        let slow = settle(&lag, 0, 0, RampStep { from: 0.0, to: 1.0, rise_s: 1.0 }, 0.5).unwrap();
        assert_close(slow.settling_s.unwrap(), 0.501, 1e-9);
        assert_eq!(settle(&lag, 0, 0, RampStep::ideal(1.0), 2.0).unwrap().settling_s, Some(0.0));
        assert_eq!(settle(&lag, 0, 0, RampStep::ideal(1.0), 0.0).unwrap().settling_s, None);
    }

    /// Planted answer: t·exp(−at) from a double pole with a zero at the origin, extreme 1/(ea) at 1/a; and a triple pole.
    #[test]
    fn multiple_poles() {
        let a = 5e3;
        let found = settle(&system(&[Complex::ZERO], &[real(-a); 2], 1.0), 0, 0, RampStep::ideal(1.0), 1e-7).unwrap();
        assert_close(found.deviation, 1.0 / (std::f64::consts::E * a), 1e-7);
        assert_close(found.deviation_time_s.unwrap(), 1.0 / a, 1e-3);
        assert_near(found.final_value, 0.0, 1e-7 * found.deviation);
        let triple = settle(&system(&[Complex::ZERO], &[real(-a); 3], 1.0), 0, 0, RampStep::ideal(1.0), 1e-10).unwrap();
        // t²/2·exp(−at) peaks at 2/a.
        assert_close(triple.deviation, 2.0 / (std::f64::consts::E.powi(2) * a * a), 1e-5);
    }

    #[test]
    fn without_states_and_without_stability() {
        let gain = StateSpace::constant(DMatrix::from_element(1, 1, -2.0), &["u"], &["y"]).unwrap();
        let found = settle(&gain, 0, 0, RampStep { from: 0.0, to: 1.0, rise_s: 1e-6 }, 0.5).unwrap();
        assert_close(found.deviation, -2.0, 1e-14);
        assert_close(found.settling_s.unwrap(), 0.75e-6, 1e-9);
        assert_eq!(
            settle(&system(&[], &[real(1.0)], 1.0), 0, 0, RampStep::ideal(1.0), 0.1),
            Err(LinearError::NotStable)
        );
        assert_eq!(
            settle(&system(&[], &[real(0.0)], 1.0), 0, 0, RampStep::ideal(1.0), 0.1),
            Err(LinearError::NotStable)
        );
        assert!(settle(&gain, 1, 0, RampStep::ideal(1.0), 0.1).is_err());
    }

    proptest! {
        /// Two routes: extreme and last exit against the step response on a fine uniform grid.
        #[test]
        fn agrees_with_the_step_response(
            pair in (3.0..4.5_f64, 0.02..0.9_f64),
            reals in prop::collection::vec(2.5..7.0_f64, 1..4),
            zero in prop::option::of(-2e4..2e4_f64),
            through_origin in any::<bool>(),
            rise in prop_oneof![Just(0.0), 1e-6..2e-3_f64],
            band in 0.003..0.3_f64,
        ) {
            let size = 10.0_f64.powf(pair.0);
            let mut poles = vec![Complex::new(-pair.1, (1.0 - pair.1 * pair.1).sqrt()) * size];
            poles.extend(reals.iter().map(|decade| real(-(10.0_f64.powf(*decade)))));
            let mut zeros: Vec<Complex> = zero.into_iter().map(real).collect();
            if through_origin {
                zeros.push(Complex::ZERO);
            }
            let shape = system(&zeros, &poles, 1.0);
            let event = RampStep { from: 0.0, to: 1.0, rise_s: rise };
            // Long enough for the slowest mode to die, fine enough for the fastest that matters on this scale.
            let slowest = poles.iter().map(|p| -p.re).fold(f64::INFINITY, f64::min);
            let grid = UniformGrid { step_s: (40.0 / slowest + rise) / 200_000.0, count: 200_001 };
            let values = step_response(&shape, 0, 0, grid, event).unwrap();
            let peak = values.iter().fold(0.0, |peak: f64, v| peak.max(v.abs()));
            let found = settle(&shape, 0, 0, event, band * peak).unwrap();
            prop_assert!((found.final_value - values[200_000]).abs() < 1e-7 * peak);
            // The grid can miss the top by a second-order amount.
            prop_assert!(found.deviation.abs() >= peak * (1.0 - 1e-7), "{} against {peak}", found.deviation);
            prop_assert!(found.deviation.abs() <= peak * (1.0 + 1e-3), "{} against {peak}", found.deviation);
            let last = values.iter().rposition(|v| (v - found.final_value).abs() > band * peak);
            let expected = last.map_or(0.0, |k| k as f64 * grid.step_s);
            let settling = found.settling_s.unwrap();
            // Between two grid points lies the exit, unless a top pokes through the band between them.
            prop_assert!(settling >= expected - 1e-9 * expected, "{settling} against {expected}");
            if settling > expected + 1.01 * grid.step_s {
                let near = (0..values.len())
                    .filter(|k| (*k as f64 * grid.step_s - settling).abs() <= grid.step_s)
                    .map(|k| (values[k] - found.final_value).abs())
                    .fold(0.0, f64::max);
                prop_assert!(near > 0.999 * band * peak, "{settling} against {expected}");
            }
        }
    }
}
