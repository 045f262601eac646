//! A continuous system whose output is sampled once a period, and driven through a difference equation: the exact map from sample to sample.
//!
//! *Conventions*: the output is sampled just before t = n·T. What the equation makes of it acts a delay later: as an impulse of weight T times
//! the value, or held from then on for a period. The equation's input is the reference less the sampled output. Events start right after
//! the sample at t = 0, the latest the loop can notice; a reference counts from that sample on. Responses are deviations from rest.
//!
//! *Method*: matrix exponentials of the system with its inputs carry the state from one part of a period to the next, so samples, and the
//! times between them that a period is divided into, are exact. Poles are eigenvalues of the map; they are found for the map less one,
//! because those of slow modes crowd around z = 1.
//!
//! *Source*: the sampled-data map as in Åström & Wittenmark, Computer-Controlled Systems, 3rd ed., ch. 3 (from memory).

use nalgebra::{DMatrix, DVector};

use super::{Complex, LinearError, StateSpace, Zpk, eigenvalues, expm};

/// Parts a period is divided into, at whose ends outputs are known.
pub(super) const PARTS: usize = 8;

/// A delay nearer than this part of a period to a whole one is a whole one.
const WHOLE: f64 = 1e-12;

/// How a value of the difference equation acts on the system.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Drive {
    /// All at once, with the weight of a period.
    Impulse,
    /// For a period.
    Held,
}

/// When samples are taken and count.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SampleTiming {
    /// Time between samples [s].
    pub period_s: f64,
    /// From a sample to where it acts [s]; may be longer than a period.
    pub delay_s: f64,
    /// How it acts.
    pub drive: Drive,
}

/// A difference equation u[n] = Σ a·u + Σ b·e as states: u = c·ξ + d·e, ξ' = A·ξ + B·e.
#[derive(Clone, Debug)]
struct Recursion {
    a: DMatrix<f64>,
    b: DVector<f64>,
    d: f64,
}

impl Recursion {
    /// Transposed direct form: the first state is the output less what the present error adds.
    fn new(feedback: &[f64], forward: &[f64]) -> Self {
        let order = feedback.len().max(forward.len().saturating_sub(1));
        let d = forward.first().copied().unwrap_or(0.0);
        let at = |list: &[f64], k: usize| list.get(k).copied().unwrap_or(0.0);
        let a = DMatrix::from_fn(order, order, |row, column| {
            let shifted = if column == row + 1 { 1.0 } else { 0.0 };
            shifted + if column == 0 { at(feedback, row) } else { 0.0 }
        });
        let b = DVector::from_fn(order, |row, _| at(forward, row + 1) + at(feedback, row) * d);
        Recursion { a, b, d }
    }

    fn order(&self) -> usize {
        self.b.len()
    }
}

/// The closed loop as a map over a period.
///
/// Everything is linear in the extended state: plant, values on their way, equation; then, for each event input, its value at the sample, at
/// the period's start and its slope; then the reference.
#[derive(Clone, Debug)]
pub struct SampledLoop {
    /// Time between samples [s].
    pub(super) period_s: f64,
    /// States of the map.
    pub(super) order: usize,
    /// Event inputs.
    pub(super) events: usize,
    /// Map of the states from the extended state.
    pub(super) next: DMatrix<f64>,
    /// For each output, rows over the extended state at the parts of a period.
    pub(super) rows: Vec<DMatrix<f64>>,
    /// Output of the equation over the extended state.
    pub(super) control: DMatrix<f64>,
    /// The plant with its inputs over a part of a period, for a ramp that ends inside.
    pub(super) pieces: Pieces,
    delays: usize,
    pulse: DMatrix<f64>,
    pulse_before: Option<DMatrix<f64>>,
    sensed: DMatrix<f64>,
    transition: DMatrix<f64>,
}

/// The plant with its inputs made part of the state: state, drive, event inputs, their slopes.
#[derive(Clone, Debug)]
pub(super) struct Pieces {
    generator: DMatrix<f64>,
    /// Over a part of a period.
    pub(super) part: DMatrix<f64>,
    /// Length of a part [s].
    pub(super) part_s: f64,
    /// States of the plant.
    pub(super) states: usize,
    /// Output rows over plant states and event inputs.
    pub(super) c: DMatrix<f64>,
    /// Direct rows of the event inputs.
    pub(super) d: DMatrix<f64>,
}

impl Pieces {
    /// Carries the plant with its inputs over a time [s].
    pub(super) fn over(&self, time_s: f64) -> Result<DMatrix<f64>, LinearError> {
        expm(&(&self.generator * time_s))
    }
}

impl SampledLoop {
    /// The loop of a system whose first input is driven by the equation and whose first output is sampled; its other inputs are the events'.
    ///
    /// # Errors
    /// [`LinearError::Shape`] for a system without input or output or a period that is none, [`LinearError::NotFinite`].
    pub fn new(
        system: &StateSpace,
        feedback: &[f64],
        forward: &[f64],
        timing: SampleTiming,
    ) -> Result<Self, LinearError> {
        let period_s = timing.period_s;
        if system.inputs.is_empty() || system.outputs.is_empty() || !(period_s > 0.0 && timing.delay_s >= 0.0) {
            return Err(LinearError::Shape("a sampled loop needs an input, an output and a period".to_owned()));
        }
        let recursion = Recursion::new(feedback, forward);
        let (n, events) = (system.order(), system.inputs.len() - 1);
        let (delays, within) = split(timing.delay_s / period_s);
        let held = timing.drive == Drive::Held;
        let waiting = if held { delays + 1 } else { delays };
        let order = n + waiting + recursion.order();
        let width = order + 3 * events + 1;
        let layout = Layout { n, waiting, order, events, width };
        let pieces = pieces(system, period_s)?;
        let control = layout.control(system, &recursion);
        let waited = |k: usize| if k == 0 { control.clone() } else { layout.unit(n + k - 1) };
        let (pulse, before) = (waited(delays), held.then(|| waited(delays + 1)));
        let effects = Effects::new(system, &pieces, timing.drive, within, period_s)?;
        let mut rows = vec![DMatrix::zeros(PARTS, width); system.outputs.len()];
        let mut state = DMatrix::zeros(n, width);
        for part in 0..=PARTS {
            state = layout.state(&effects, part, &pulse, before.as_ref());
            if part == PARTS {
                break;
            }
            for (output, rows) in rows.iter_mut().enumerate() {
                let mut row = system.c.row(output) * &state;
                layout.direct(&mut row, system, output, part as f64 * pieces.part_s);
                if let Some(before) = &before {
                    let acting = if effects.acts(part) { &pulse } else { before };
                    row += acting * system.d[(output, 0)];
                }
                rows.row_mut(part).copy_from(&row);
            }
        }
        let mut next = DMatrix::zeros(order, width);
        next.rows_mut(0, n).copy_from(&state);
        layout.shift(&mut next, &control);
        layout.recur(&mut next, &recursion, system);
        let whole = &effects.steps[PARTS];
        Ok(SampledLoop {
            period_s,
            order,
            events,
            next,
            rows,
            control,
            delays,
            pulse: effects.pulses[PARTS].clone(),
            pulse_before: held.then(|| whole.view((0, n), (n, 1)) - &effects.pulses[PARTS]),
            sensed: system.c.rows(0, 1).into_owned(),
            transition: whole.view((0, 0), (n, n)).into_owned(),
            pieces,
        })
    }

    /// Time between samples [s].
    pub fn period_s(&self) -> f64 {
        self.period_s
    }

    /// Eigenvalues of the map in the z plane.
    ///
    /// # Errors
    /// As the search for eigenvalues.
    pub fn poles_z(&self) -> Result<Vec<Complex>, LinearError> {
        Ok(self.less_one()?.into_iter().map(|d| d + 1.0).collect())
    }

    /// Eigenvalues of the map less one: z − 1.
    pub(super) fn less_one(&self) -> Result<Vec<Complex>, LinearError> {
        let square = self.next.columns(0, self.order).into_owned();
        eigenvalues(&(square - DMatrix::identity(self.order, self.order)))
    }

    /// Closed-loop poles in the plane w = 2/T·(z − 1)/(z + 1) [rad/s], whose left half is the unit disc.
    ///
    /// # Errors
    /// As the search for eigenvalues.
    pub fn poles_w(&self) -> Result<Vec<Complex>, LinearError> {
        let scale = 2.0 / self.period_s;
        Ok(self.less_one()?.into_iter().map(|d| scale * d / (d + 2.0)).collect())
    }

    /// What the system makes of the equation's values, from sample to sample, in the plane w [rad/s], in which a period of delay is an
    /// all-pass. It is the sum of all bands that sampling folds together.
    ///
    /// # Errors
    /// As the reduction to zeros and poles; [`LinearError::PoleThere`] for a pole at z = −1.
    pub fn pulse_response_w(&self) -> Result<Zpk, LinearError> {
        let n = self.transition.nrows();
        let more = usize::from(self.pulse_before.is_some());
        let mut a = DMatrix::zeros(n + more, n + more);
        a.view_mut((0, 0), (n, n)).copy_from(&self.transition);
        let mut b = DMatrix::zeros(n + more, 1);
        b.view_mut((0, 0), (n, 1)).copy_from(&self.pulse);
        if let Some(before) = &self.pulse_before {
            a.view_mut((0, n), (n, 1)).copy_from(before);
            b[(n, 0)] = 1.0;
        }
        let mut c = DMatrix::zeros(1, n + more);
        c.view_mut((0, 0), (1, n)).copy_from(&self.sensed);
        let one = DMatrix::identity(n + more, n + more);
        let inverse = (&a + &one).try_inverse().ok_or(LinearError::PoleThere)?;
        let scale = 2.0 / self.period_s;
        let direct = -(&c * &inverse * &b);
        let in_w = StateSpace::new(
            (a - one) * &inverse * scale,
            &inverse * b * (2.0 * scale),
            c * &inverse,
            direct,
            &["u"],
            &["y"],
        )?;
        let mut zpk = Zpk::from_state_space(&in_w, 0, 0)?;
        for _ in 0..self.delays {
            zpk.zeros.push(Complex::from(scale));
            zpk.poles.push(Complex::from(-scale));
            zpk.gain = -zpk.gain;
        }
        Ok(zpk)
    }
}

/// Whole periods of a delay, and the rest as a part of a period.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "not negative, and of some periods")]
fn split(periods: f64) -> (usize, f64) {
    let mut whole = periods.min(1e3).floor();
    let mut rest = (periods - whole).clamp(0.0, 1.0);
    if rest > 1.0 - WHOLE {
        whole += 1.0;
        rest = 0.0;
    }
    (whole as usize, if rest < WHOLE { 0.0 } else { rest })
}

/// The plant with its inputs as one system without inputs.
fn pieces(system: &StateSpace, period_s: f64) -> Result<Pieces, LinearError> {
    let (n, events) = (system.order(), system.inputs.len() - 1);
    let size = n + 1 + 2 * events;
    let mut generator = DMatrix::zeros(size, size);
    generator.view_mut((0, 0), (n, n)).copy_from(&system.a);
    generator.view_mut((0, n), (n, 1 + events)).copy_from(&system.b);
    generator.view_mut((n + 1, n + 1 + events), (events, events)).fill_with_identity();
    let part_s = period_s / PARTS as f64;
    let part = expm(&(&generator * part_s))?;
    let d = system.d.columns(1, events).into_owned();
    Ok(Pieces { generator, part, part_s, states: n, c: system.c.clone(), d })
}

/// What inputs do to the plant's state by the ends of the parts of a period.
struct Effects {
    /// Powers of a part: state and inputs carried from the period's start.
    steps: Vec<DMatrix<f64>>,
    /// What a value that starts to act in this period does.
    pulses: Vec<DMatrix<f64>>,
    /// The first end of a part at or after that start.
    first: usize,
    held: bool,
    events: usize,
}

impl Effects {
    fn new(
        system: &StateSpace,
        pieces: &Pieces,
        drive: Drive,
        within: f64,
        period_s: f64,
    ) -> Result<Self, LinearError> {
        let (n, events) = (system.order(), system.inputs.len() - 1);
        let size = pieces.part.nrows();
        let mut steps = vec![DMatrix::identity(size, size)];
        for k in 0..PARTS {
            steps.push(&pieces.part * &steps[k]);
        }
        let first = end_after(within);
        let rest = pieces.over((first as f64 * pieces.part_s - within * period_s).max(0.0))?;
        let state = pieces.part.view((0, 0), (n, n));
        let held = drive == Drive::Held;
        let (start, more) = if held {
            (rest.view((0, n), (n, 1)).into_owned(), pieces.part.view((0, n), (n, 1)).into_owned())
        } else {
            (rest.view((0, 0), (n, n)) * system.b.columns(0, 1) * period_s, DMatrix::zeros(n, 1))
        };
        let mut pulses = vec![DMatrix::zeros(n, 1); first];
        pulses.push(start);
        while pulses.len() <= PARTS {
            let last = pulses.last().map(|p| state * p + &more).unwrap_or_default();
            pulses.push(last);
        }
        Ok(Effects { steps, pulses, first, held, events })
    }

    /// Whether the period's own value already acts at the end of a part.
    fn acts(&self, part: usize) -> bool {
        part >= self.first
    }
}

/// The end of a part at or after a place in the period.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "from 0 to the number of parts")]
fn end_after(within: f64) -> usize {
    (within * PARTS as f64).ceil().clamp(0.0, PARTS as f64) as usize
}

/// Places in the extended state.
struct Layout {
    n: usize,
    waiting: usize,
    order: usize,
    events: usize,
    width: usize,
}

impl Layout {
    /// A row that picks one place.
    fn unit(&self, place: usize) -> DMatrix<f64> {
        let mut row = DMatrix::zeros(1, self.width);
        row[(0, place)] = 1.0;
        row
    }

    /// The sampled error over the extended state.
    fn error(&self, system: &StateSpace) -> DMatrix<f64> {
        let mut row = DMatrix::zeros(1, self.width);
        row.view_mut((0, 0), (1, self.n)).copy_from(&(-system.c.rows(0, 1)));
        row.view_mut((0, self.order), (1, self.events)).copy_from(&(-system.d.view((0, 1), (1, self.events))));
        row[(0, self.width - 1)] = 1.0;
        row
    }

    /// The equation's output over the extended state.
    fn control(&self, system: &StateSpace, recursion: &Recursion) -> DMatrix<f64> {
        let mut row = self.error(system) * recursion.d;
        if recursion.order() > 0 {
            row[(0, self.n + self.waiting)] += 1.0;
        }
        row
    }

    /// The plant's state at the end of a part, over the extended state.
    fn state(
        &self,
        effects: &Effects,
        part: usize,
        pulse: &DMatrix<f64>,
        before: Option<&DMatrix<f64>>,
    ) -> DMatrix<f64> {
        let (n, events) = (self.n, self.events);
        let step = &effects.steps[part];
        let mut state = DMatrix::zeros(n, self.width);
        state.view_mut((0, 0), (n, n)).copy_from(&step.view((0, 0), (n, n)));
        let inputs = step.view((0, n + 1), (n, 2 * effects.events));
        state.view_mut((0, self.order + events), (n, 2 * events)).copy_from(&inputs);
        if part > 0 {
            state += &effects.pulses[part] * pulse;
            if let Some(before) = before.filter(|_| effects.held) {
                state += (step.view((0, n), (n, 1)) - &effects.pulses[part]) * before;
            }
        }
        state
    }

    /// Adds what the event inputs do directly, a time into the period [s].
    fn direct(
        &self,
        row: &mut nalgebra::Matrix<
            f64,
            nalgebra::U1,
            nalgebra::Dyn,
            nalgebra::VecStorage<f64, nalgebra::U1, nalgebra::Dyn>,
        >,
        system: &StateSpace,
        output: usize,
        time_s: f64,
    ) {
        for event in 0..self.events {
            let direct = system.d[(output, 1 + event)];
            row[self.order + self.events + event] += direct;
            row[self.order + 2 * self.events + event] += direct * time_s;
        }
    }

    /// Values on their way move on by one.
    fn shift(&self, next: &mut DMatrix<f64>, control: &DMatrix<f64>) {
        if self.waiting > 0 {
            next.row_mut(self.n).copy_from(&control.row(0));
        }
        for k in 1..self.waiting {
            next[(self.n + k, self.n + k - 1)] = 1.0;
        }
    }

    /// The equation's states move on.
    fn recur(&self, next: &mut DMatrix<f64>, recursion: &Recursion, system: &StateSpace) {
        let (start, order) = (self.n + self.waiting, recursion.order());
        let mut rows = &recursion.b * self.error(system);
        let mut own = rows.view_mut((0, start), (order, order));
        own += &recursion.a;
        next.rows_mut(start, order).copy_from(&rows);
    }
}

#[cfg(test)]
mod tests {
    use super::super::precision::{assert_close, assert_complex_close, assert_near};
    use super::super::{FactoredResponse, FrequencyResponse, RampStep, SampledInput, SampledOutput};
    use super::*;
    use std::f64::consts::TAU;

    /// A resonance with a zero, and a load that acts on its output directly as well.
    fn plant() -> StateSpace {
        let a = DMatrix::from_row_slice(2, 2, &[-3e3, -2.2e4, 2.0e4, -1.1e3]);
        let b = DMatrix::from_row_slice(2, 2, &[6e4, 1e2, 0.0, -2e4]);
        let c = DMatrix::from_row_slice(2, 2, &[0.02, 1.0, 0.0, 1.0]);
        let d = DMatrix::from_row_slice(2, 2, &[0.0, -0.03, 0.0, 0.0]);
        StateSpace::new(a, b, c, d, &["control", "load"], &["sensed", "shown"]).unwrap()
    }

    const FEEDBACK: [f64; 2] = [1.35, -0.35];
    const FORWARD: [f64; 3] = [0.08, -0.075, 0.002];

    fn sampled(delay_periods: f64, drive: Drive) -> SampledLoop {
        let timing = SampleTiming { period_s: 1e-5, delay_s: delay_periods * 1e-5, drive };
        SampledLoop::new(&plant(), &FEEDBACK, &FORWARD, timing).unwrap()
    }

    /// Definition: sampling sums the bands, each at its own place beside the sampling frequency (Poisson's sum).
    #[test]
    fn the_pulse_response_is_the_sum_of_all_bands() {
        let period = 1e-5;
        let plant = FactoredResponse::new(Zpk::from_state_space(&plant(), 0, 0).unwrap(), 0.0);
        for (delay, drive) in [(0.37, Drive::Impulse), (1.62, Drive::Impulse), (0.0, Drive::Held), (1.2, Drive::Held)] {
            let pulse = FactoredResponse::new(sampled(delay, drive).pulse_response_w().unwrap(), 0.0);
            for f in [700.0, 9e3, 31e3] {
                let in_w = (std::f64::consts::PI * f * period).tan() / (std::f64::consts::PI * period);
                let mut sum = Complex::ZERO;
                for band in -4000..=4000 {
                    let shifted = f + f64::from(band) / period;
                    let size = shifted.abs();
                    let one_sided = plant.at_hz(size) * Complex::cis(-TAU * size * delay * period);
                    let value = if shifted < 0.0 { one_sided.conj() } else { one_sided };
                    let turn = Complex::new(0.0, TAU * shifted * period);
                    sum += value * if drive == Drive::Held { (1.0 - (-turn).exp()) / turn } else { Complex::ONE };
                }
                // The sum converges with one over the number of bands.
                assert_complex_close(pulse.at_hz(in_w), sum, 3e-4);
            }
        }
    }

    /// Two routes: the map against a walk with many small steps of its own.
    #[test]
    fn a_walk_by_small_steps_meets_the_map() {
        let plant = plant();
        for (delay, drive) in [(0.37, Drive::Impulse), (1.62, Drive::Impulse), (0.0, Drive::Held), (1.2, Drive::Held)] {
            let map = sampled(delay, drive);
            let event = RampStep { from: 0.0, to: 2.0, rise_s: 1.3e-5 };
            let grid = map.grid(40e-5, 321);
            let shown = map.curve(SampledInput::Event(0), SampledOutput::Output(1), event, grid).unwrap();
            let sensed = map.curve(SampledInput::Event(0), SampledOutput::Output(0), event, grid).unwrap();
            // 2000 steps a period, so that delays fall on steps; a step is exact for a ramp.
            let small = 1e-5 / 2000.0;
            let step = expm(&(&pieces(&plant, 1e-5).unwrap().generator * small)).unwrap();
            let (mut state, mut outputs, mut errors) = (DVector::zeros(2), vec![0.0; 3], [0.0; 3]);
            let (mut acting, mut scheduled) = (0.0, Vec::<(usize, f64)>::new());
            for k in 0..40 * 2000_usize {
                let time = k as f64 * small;
                let load = (time / event.rise_s).min(1.0) * event.to;
                let slope = if time < event.rise_s - 0.5 * small { event.to / event.rise_s } else { 0.0 };
                if k % 250 == 0 {
                    let (x, place) = (&state, k / 250);
                    assert_near(shown[place], x[1], 1e-10);
                    let load = if k == 0 { 0.0 } else { load };
                    assert_near(sensed[place], 0.02 * x[0] + x[1] - 0.03 * load, 1e-10);
                }
                if k % 2000 == 0 {
                    let error = -(0.02 * state[0] + state[1] - 0.03 * load);
                    errors = [error, errors[0], errors[1]];
                    let u = FEEDBACK[0] * outputs[0]
                        + FEEDBACK[1] * outputs[1]
                        + FORWARD.iter().zip(&errors).map(|(b, e)| b * e).sum::<f64>();
                    outputs = vec![u, outputs[0], outputs[1]];
                    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a few thousand")]
                    scheduled.push((k + (delay * 2000.0).round() as usize, u));
                }
                if let Some((_, u)) = scheduled.iter().find(|(when, _)| *when == k) {
                    match drive {
                        Drive::Impulse => state += plant.b.column(0) * (*u * 1e-5),
                        Drive::Held => acting = *u,
                    }
                }
                let all = DVector::from_vec(vec![state[0], state[1], acting, load, slope]);
                state = (&step * all).rows(0, 2).into_owned();
            }
        }
    }

    /// Two routes: the eigenvalues of the map are where the sampled loop gain is −1.
    #[test]
    fn poles_close_the_sampled_loop() {
        for (delay, drive) in [(0.37, Drive::Impulse), (1.62, Drive::Impulse), (1.2, Drive::Held)] {
            let map = sampled(delay, drive);
            let pulse = map.pulse_response_w().unwrap();
            for z in map.poles_z().unwrap().into_iter().filter(|z| z.norm() > 0.05) {
                let w = 2e5 * (z - 1.0) / (z + 1.0);
                let forward = FORWARD[0] + FORWARD[1] / z + FORWARD[2] / z / z;
                let equation = forward / (1.0 - FEEDBACK[0] / z - FEEDBACK[1] / z / z);
                assert_complex_close(equation * pulse.at(w), Complex::from(-1.0), 1e-6);
            }
        }
    }

    #[test]
    fn deviation_and_settling_of_a_curve_looked_through() {
        for drive in [Drive::Impulse, Drive::Held] {
            let map = sampled(0.4, drive);
            let event = RampStep { from: 0.0, to: 2.0, rise_s: 2.7e-5 };
            let (input, output) = (SampledInput::Event(0), SampledOutput::Output(0));
            let met = map.settle(input, output, event, 0.01).unwrap();
            let grid = map.grid(80e-3, 64001);
            assert!((grid.step_s - 1.25e-6).abs() < 1e-12);
            let curve = map.curve(input, output, event, grid).unwrap();
            let extreme = curve.iter().copied().fold(0.0, |a: f64, b| if b.abs() > a.abs() { b } else { a });
            assert!((met.deviation / extreme - 1.0).abs() < 2e-3 && met.deviation.abs() >= extreme.abs());
            assert!(met.final_value.abs() < 1e-12, "an integrator");
            let last = curve.iter().rposition(|v| v.abs() > 0.01).unwrap();
            let settling = met.settling_s.unwrap();
            assert!((settling - last as f64 * grid.step_s).abs() < 1.3 * grid.step_s, "{settling}");
            let coarse = map.curve(input, output, event, map.grid(80e-3, 1601)).unwrap();
            for (k, value) in coarse.iter().enumerate() {
                assert_close(*value + 1.0, curve[k * 40] + 1.0, 1e-10);
            }
        }
    }

    #[test]
    fn impossible_loops_are_errors() {
        let timing = SampleTiming { period_s: 0.0, delay_s: 0.0, drive: Drive::Impulse };
        assert!(SampledLoop::new(&plant(), &FEEDBACK, &FORWARD, timing).is_err());
        let map = sampled(0.2, Drive::Impulse);
        let event = RampStep::ideal(1.0);
        assert!(map.settle(SampledInput::Event(7), SampledOutput::Control, event, 1.0).is_err());
        assert!(map.settle(SampledInput::Reference, SampledOutput::Output(9), event, 1.0).is_err());
    }
}
