//! Exact step response on a uniform grid, by powers of the transition matrix.
//!
//! The input is made part of the state, so one matrix exponential carries system and input over a grid step without any error of
//! discretisation. The output is read through precomputed rows `c Φ^j`, and the state only leaps from block to block.
//!
//! Conventions: before t = 0 the system rests at the input's value `from`; at t = 0 the value after an ideal step is given.

use nalgebra::{DMatrix, DVector};

use super::dense::Rows;
use super::{LinearError, StateSpace, expm};

/// Grid points between leaps of the state: the cost of the rows and of the leaps balances for the usual 1,000 points.
const BLOCK: usize = 32;

/// An input that goes from one value to another at constant slew.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RampStep {
    /// Value before t = 0 [unit of the input].
    pub from: f64,
    /// Value from `rise_s` on [unit of the input].
    pub to: f64,
    /// Time of the way [s]; 0 is an ideal step.
    pub rise_s: f64,
}

impl RampStep {
    /// An ideal step from zero.
    pub fn ideal(to: f64) -> Self {
        Self { from: 0.0, to, rise_s: 0.0 }
    }

    /// From zero at a slew [unit of the input per second]; a slew of zero or infinite is an ideal step.
    pub fn with_slew(to: f64, slew: f64) -> Self {
        let rise = (to / slew).abs();
        Self { from: 0.0, to, rise_s: if rise.is_finite() { rise } else { 0.0 } }
    }

    /// Whether the numbers can be used.
    pub(super) fn check(&self) -> Result<(), LinearError> {
        if !(self.from.is_finite() && self.to.is_finite() && self.rise_s.is_finite()) {
            return Err(LinearError::NotFinite);
        }
        if self.rise_s < 0.0 {
            return Err(LinearError::Shape("a rise time is not negative".to_owned()));
        }
        Ok(())
    }
}

/// Times 0, step, 2·step, …
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct UniformGrid {
    /// Distance of the times [s].
    pub step_s: f64,
    /// Number of times.
    pub count: usize,
}

impl UniformGrid {
    /// The times [s].
    pub fn times_s(&self) -> Vec<f64> {
        (0..self.count).map(|k| k as f64 * self.step_s).collect()
    }
}

/// Output values on the grid for an input that steps, absolute (not as a deviation).
///
/// # Errors
/// [`LinearError::UnknownPort`], [`LinearError::Shape`] for a grid step or rise that is negative, [`LinearError::PoleThere`] when there is no rest at
/// a `from` other than zero, [`LinearError::NotFinite`] when numbers run out of range, as the response of an unstable system can.
pub fn step_response(
    system: &StateSpace,
    input: usize,
    output: usize,
    grid: UniformGrid,
    event: RampStep,
) -> Result<Vec<f64>, LinearError> {
    event.check()?;
    if !grid.step_s.is_finite() || grid.step_s <= 0.0 {
        return Err(LinearError::Shape("a grid step is positive".to_owned()));
    }
    if input >= system.inputs.len() || output >= system.outputs.len() {
        return Err(LinearError::UnknownPort(format!("output {output}, input {input}")));
    }
    let before = if event.from == 0.0 {
        0.0
    } else {
        event.from * system.dc_gain(output, input).ok_or(LinearError::PoleThere)?
    };
    let mut values = Vec::with_capacity(grid.count + BLOCK);
    let driven = Driven::new(system, input, output);
    if event.rise_s > 0.0 {
        driven.ramp(&mut values, grid, event)?;
    } else {
        let start = driven.at_rest(&[event.to - event.from]);
        driven.propagate(&driven.held(), &start, grid.step_s, grid.count, &mut values)?;
    }
    values.truncate(grid.count);
    for value in &mut values {
        *value += before;
    }
    if values.iter().all(|v| v.is_finite()) { Ok(values) } else { Err(LinearError::NotFinite) }
}

/// A system with one input made part of its state, seen through one output.
struct Driven<'a> {
    system: &'a StateSpace,
    input: usize,
    output: usize,
}

impl<'a> Driven<'a> {
    fn new(system: &'a StateSpace, input: usize, output: usize) -> Self {
        Self { system, input, output }
    }

    /// State matrix with the input held: `[A b; 0 0]`.
    fn held(&self) -> DMatrix<f64> {
        let n = self.system.order();
        let mut m = DMatrix::zeros(n + 1, n + 1);
        m.view_mut((0, 0), (n, n)).copy_from(&self.system.a);
        m.view_mut((0, n), (n, 1)).copy_from(&self.system.b.column(self.input));
        m
    }

    /// State matrix with the input moving at a rate that is the last state.
    fn moving(&self) -> DMatrix<f64> {
        let n = self.system.order();
        let mut m = self.held().resize(n + 2, n + 2, 0.0);
        m[(n, n + 1)] = 1.0;
        m
    }

    /// The states at zero, followed by the states of the input.
    fn at_rest(&self, input: &[f64]) -> DVector<f64> {
        let n = self.system.order();
        DVector::from_fn(n + input.len(), |i, _| if i < n { 0.0 } else { input[i - n] })
    }

    /// Appends the output values at `count` times from the start state on.
    fn propagate(
        &self,
        matrix: &DMatrix<f64>,
        start: &DVector<f64>,
        step_s: f64,
        count: usize,
        values: &mut Vec<f64>,
    ) -> Result<(), LinearError> {
        let size = matrix.nrows();
        let transition = expm(&(matrix * step_s))?;
        let transition = Rows::from_fn(size, size, |i, j| transition[(i, j)]);
        let n = self.system.order();
        let seen = Rows::from_fn(1, size, |_, j| match j {
            j if j < n => self.system.c[(self.output, j)],
            j if j == n => self.system.d[(self.output, self.input)],
            _ => 0.0,
        });
        // Rows c Φ^j side by side, times the state at the start of each block: all outputs of a block at once.
        let outputs = transition.orbit(&seen, BLOCK).transpose(size);
        let mut leap = transition;
        for _ in 0..BLOCK.ilog2() {
            leap = leap.times(&leap);
        }
        let start = Rows::from_fn(1, size, |_, j| start[j]);
        let states = leap.transpose(size).orbit(&start, count.div_ceil(BLOCK));
        let blocks = states.times(&outputs);
        // A block is a whole number of vectors, so its rows follow each other without padding.
        values.extend(blocks.entries().iter().take(count));
        Ok(())
    }

    /// Values for a ramp that ends in a held value; the end of the ramp need not lie on the grid.
    fn ramp(&self, values: &mut Vec<f64>, grid: UniformGrid, event: RampStep) -> Result<(), LinearError> {
        let moving = self.moving();
        let change = event.to - event.from;
        let n = self.system.order();
        let start = self.at_rest(&[0.0, change / event.rise_s]);
        let on_ramp = (0..grid.count).take_while(|k| *k as f64 * grid.step_s <= event.rise_s).count();
        let mut at_end = expm(&(&moving * event.rise_s))? * &start;
        self.propagate(&moving, &start, grid.step_s, on_ramp, values)?;
        if on_ramp == grid.count {
            return Ok(());
        }
        at_end[n] = change;
        let held = self.held();
        let to_next_time = on_ramp as f64 * grid.step_s - event.rise_s;
        let first = expm(&(&held * to_next_time))? * at_end.rows(0, n + 1);
        self.propagate(&held, &first, grid.step_s, grid.count - on_ramp, values)
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::super::precision::{assert_close, assert_near};
    use super::super::{Complex, Zpk};
    use super::*;

    fn grid(step_s: f64, count: usize) -> UniformGrid {
        UniformGrid { step_s, count }
    }

    /// Planted answer: a damped pair's step response in closed form.
    #[test]
    fn resonant_step_in_closed_form() {
        let (sigma, beta) = (-300.0, 4e3);
        let size = sigma * sigma + beta * beta;
        let pair = Complex::new(sigma, beta);
        let system = Zpk::new(vec![], vec![pair, pair.conj()], size).unwrap().cascade().unwrap();
        let values = step_response(&system, 0, 0, grid(5e-6, 1000), RampStep::ideal(2.0)).unwrap();
        for (k, value) in values.iter().enumerate() {
            let t = k as f64 * 5e-6;
            let expected = 2.0 * (1.0 - (sigma * t).exp() * ((beta * t).cos() - sigma / beta * (beta * t).sin()));
            assert_near(*value, expected, 1e-12);
        }
    }

    /// Planted answer: one lag under a ramp whose end falls between grid points, at its end, before the first and after the last.
    #[test]
    fn ramp_in_closed_form() {
        let rate = 1e3;
        let system = Zpk::new(vec![], vec![Complex::new(-rate, 0.0)], rate).unwrap().cascade().unwrap();
        for rise in [1e-9, 1e-4, 7.3e-4, 1e-3, 1.0] {
            let event = RampStep { from: 1.0, to: 3.0, rise_s: rise };
            let values = step_response(&system, 0, 0, grid(1e-4, 60), event).unwrap();
            let ramp = |t: f64| if t <= 0.0 { 0.0 } else { 2.0 / rise * (t + (-rate * t).exp_m1() / rate) };
            for (k, value) in values.iter().enumerate() {
                let t = k as f64 * 1e-4;
                // The closed form loses digits where the rise is short.
                assert_near(*value, 1.0 + ramp(t) - ramp(t - rise), 1e-12 + 3e-18 / rise);
            }
        }
    }

    #[test]
    fn a_direct_path_jumps_and_unstable_systems_grow() {
        let lead =
            Zpk::new(vec![Complex::new(-1.0, 0.0)], vec![Complex::new(-10.0, 0.0)], 4.0).unwrap().cascade().unwrap();
        let values = step_response(&lead, 0, 0, grid(10.0, 2), RampStep::ideal(1.0)).unwrap();
        assert_close(values[0], 4.0, 1e-14);
        assert_close(values[1], 0.4, 1e-13);
        let runaway = Zpk::new(vec![], vec![Complex::new(1.0, 0.0)], 1.0).unwrap().cascade().unwrap();
        assert_close(
            step_response(&runaway, 0, 0, grid(1.0, 9), RampStep::ideal(1.0)).unwrap()[8],
            8.0_f64.exp_m1(),
            1e-12,
        );
        assert_eq!(step_response(&runaway, 0, 0, grid(1e3, 9), RampStep::ideal(1.0)), Err(LinearError::NotFinite));
    }

    #[test]
    fn bad_events_are_errors() {
        let gain = StateSpace::constant(DMatrix::from_element(1, 1, 2.0), &["u"], &["y"]).unwrap();
        assert_eq!(step_response(&gain, 0, 0, grid(1.0, 3), RampStep::ideal(3.0)).unwrap(), [6.0; 3]);
        assert_eq!(step_response(&gain, 0, 0, grid(1.0, 0), RampStep::ideal(3.0)).unwrap(), [0.0; 0]);
        assert!(step_response(&gain, 0, 0, grid(0.0, 3), RampStep::ideal(3.0)).is_err());
        assert!(step_response(&gain, 1, 0, grid(1.0, 3), RampStep::ideal(3.0)).is_err());
        assert!(step_response(&gain, 0, 0, grid(1.0, 3), RampStep { from: 0.0, to: 1.0, rise_s: -1.0 }).is_err());
        assert!(step_response(&gain, 0, 0, grid(1.0, 3), RampStep::ideal(f64::NAN)).is_err());
        assert_close(RampStep::with_slew(-2.0, 1e6).rise_s, 2e-6, 1e-15);
        assert_near(RampStep::with_slew(1.0, 0.0).rise_s, 0.0, 0.0);
    }

    proptest! {
        /// Two routes: the grid against grids ten times finer, which use other powers of other matrices.
        #[test]
        fn coarse_and_fine_grids_agree(
            damping in 0.01..1.0_f64, fast in 1.0..4.0_f64, zero in -1e5..1e5_f64, rise in 0.0..3e-4_f64,
        ) {
            let pair = Complex::from_polar(1e4, std::f64::consts::PI - damping.acos());
            let poles = vec![Complex::new(-2e3, 0.0), pair, pair.conj(), Complex::new(-(10.0_f64.powf(4.0 + fast)), 0.0)];
            let gain = 1e12 * 10.0_f64.powf(fast);
            let system = Zpk::new(vec![Complex::new(zero, 0.0)], poles, gain).unwrap().cascade().unwrap();
            let event = RampStep { from: 0.0, to: 1.0, rise_s: rise };
            let coarse = step_response(&system, 0, 0, grid(1e-5, 101), event).unwrap();
            let fine = step_response(&system, 0, 0, grid(1e-6, 1010), event).unwrap();
            let peak = fine.iter().fold(0.0, |peak: f64, v| peak.max(v.abs()));
            for (k, value) in coarse.iter().enumerate() {
                prop_assert!((value - fine[10 * k]).abs() <= 1e-11 * peak, "{value} against {} at {k}", fine[10 * k]);
            }
        }
    }
}
