//! Step responses of a sampled loop: exact at every part of a period that is looked at.
//!
//! *Method*: while an event ramps, and as long as fast modes live, period by period; once they have died, in leaps by powers of the map that stay
//! short against the modes still alive. The extreme is refined by a parabola through its neighbours.

use nalgebra::{DMatrix, DVector};

use super::sampled_loop::{PARTS, SampledLoop};
use super::{Complex, LinearError, RampStep, StepMetrics, UniformGrid};

/// What an event acts on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SampledInput {
    /// An event input of the system, counted from 0 behind the driven one.
    Event(usize),
    /// The reference.
    Reference,
}

/// What is looked at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum SampledOutput {
    /// An output of the system.
    Output(usize),
    /// The output of the difference equation, as it is computed.
    Control,
}

/// A mode is dead when it has decayed by this many nepers.
const DEAD_NEPERS: f64 = 13.0;
/// A leap stays below this part of the time 1/|ln z| of the fastest mode alive.
const LEAP_PART: f64 = 0.3;
/// Longest leap, as a power of two of periods.
const LONGEST_LEAP: usize = 20;
/// Periods or leaps looked at at most: a mode of Q = 1,000 needs some ten thousand.
const VISITS_AT_MOST: usize = 100_000;

impl SampledLoop {
    /// Deviation and settling of an output for one event; `band` is half the band's width.
    ///
    /// # Errors
    /// [`LinearError::NotStable`], [`LinearError::UnknownPort`], [`LinearError::NotFinite`].
    pub fn settle(
        &self,
        input: SampledInput,
        output: SampledOutput,
        event: RampStep,
        band: f64,
    ) -> Result<StepMetrics, LinearError> {
        let mut walk = Walk::new(self, input, output, event)?;
        let mut trace = Vec::new();
        while walk.ramping() {
            walk.look(&mut trace)?;
            walk.advance()?;
        }
        let rest = walk.at_rest()?;
        walk.leave(&rest);
        let modes = self.less_one()?;
        let mut leaps = vec![self.next.columns(0, self.order).into_owned()];
        let mut visits = 0;
        while let Some(power) = leap(&modes, walk.since_ramp()) {
            visits += 1;
            if visits > VISITS_AT_MOST {
                break;
            }
            walk.look_around(&rest, power == 0, &mut trace);
            while leaps.len() <= power {
                let last = leaps.last().map(|m| m * m).unwrap_or_default();
                leaps.push(last);
            }
            walk.leap(&leaps[power], power);
        }
        walk.look_around(&rest, true, &mut trace);
        let final_value = rest.values.first().copied().unwrap_or(0.0);
        judged(&trace, final_value, band)
    }

    /// The grid nearest to evenly dividing a span [s] into so many points, on parts of a period or whole periods.
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "at most the number of points")]
    pub fn grid(&self, span_s: f64, points: usize) -> UniformGrid {
        let wanted = span_s / points.saturating_sub(1).max(1) as f64;
        let part_s = self.period_s / PARTS as f64;
        let parts = (wanted / part_s).ceil().max(1.0);
        let step_s =
            if parts < PARTS as f64 { parts * part_s } else { (wanted / self.period_s).ceil() * self.period_s };
        let count = (span_s / step_s).ceil().clamp(1.0, points.max(2) as f64) as usize + 1;
        UniformGrid { step_s, count: count.min(points.max(2)) }
    }

    /// Values of an output on a grid of [`SampledLoop::grid`], as deviations from rest.
    ///
    /// # Errors
    /// As [`SampledLoop::settle`]; [`LinearError::Shape`] for another grid.
    pub fn curve(
        &self,
        input: SampledInput,
        output: SampledOutput,
        event: RampStep,
        grid: UniformGrid,
    ) -> Result<Vec<f64>, LinearError> {
        let parts = whole(grid.step_s / self.period_s * PARTS as f64)
            .ok_or_else(|| LinearError::Shape("a grid of parts of a period".to_owned()))?;
        let periods = parts / PARTS;
        let mut walk = Walk::new(self, input, output, event)?;
        let mut values = Vec::with_capacity(grid.count);
        let rest = walk.at_rest()?;
        let jump = (periods > 1).then(|| power(&self.next.columns(0, self.order).into_owned(), periods));
        let mut seen = Vec::with_capacity(PARTS);
        let mut left = false;
        while values.len() < grid.count {
            seen.clear();
            if walk.ramping() {
                walk.look(&mut seen)?;
            } else {
                if !left {
                    walk.leave(&rest);
                    left = true;
                }
                walk.look_around(&rest, true, &mut seen);
            }
            // The first part of this period that is on the grid, and those after it.
            let start = walk.period * PARTS;
            let mut place = start.div_ceil(parts) * parts;
            while place < start + PARTS && values.len() < grid.count {
                values.push(seen.get(place - start).map_or(0.0, |(_, value)| *value));
                place += parts;
            }
            match &jump {
                Some(jump) if left && walk.period.is_multiple_of(periods) => walk.skip(jump, periods),
                _ if left => walk.leap(&self.next.columns(0, self.order).into_owned(), 0),
                _ => walk.advance()?,
            }
        }
        if values.iter().all(|v| v.is_finite()) { Ok(values) } else { Err(LinearError::NotFinite) }
    }
}

/// A whole number not below 1, to within rounding.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "positive and whole")]
fn whole(x: f64) -> Option<usize> {
    let rounded = x.round();
    ((x - rounded).abs() < 1e-6 * rounded && (1.0..1e12).contains(&rounded)).then_some(rounded as usize)
}

/// A power of a square matrix.
fn power(matrix: &DMatrix<f64>, mut exponent: usize) -> DMatrix<f64> {
    let mut result = DMatrix::identity(matrix.nrows(), matrix.nrows());
    let mut square = matrix.clone();
    while exponent > 0 {
        if exponent % 2 == 1 {
            result = &result * &square;
        }
        square = &square * &square;
        exponent /= 2;
    }
    result
}

/// Power of two of periods that may be leaped when so many periods have passed; none when all modes are dead.
fn leap(less_one: &[Complex], passed: usize) -> Option<usize> {
    let alive = less_one.iter().map(|d| (d + 1.0).ln()).filter(|ln| -ln.re * (passed as f64) < DEAD_NEPERS);
    let fastest = alive.map(Complex::norm).fold(0.0, f64::max);
    if fastest == 0.0 {
        return None;
    }
    Some(
        (0..=LONGEST_LEAP)
            .rev()
            .find(|power| fastest * 2f64.powi(i32::try_from(*power).unwrap_or(0)) < LEAP_PART)
            .unwrap_or(0),
    )
}

/// Rest after the event: states and the output over a period.
struct Rest {
    states: DVector<f64>,
    values: Vec<f64>,
}

/// What the end of a ramp inside a period changes.
struct Bend {
    /// The output at the ends of the period's parts.
    outputs: Vec<f64>,
    /// The plant's states at the period's end.
    states: DVector<f64>,
}

/// A walk along a response.
struct Walk<'a> {
    sampled: &'a SampledLoop,
    input: SampledInput,
    /// Rows of the output over the extended state.
    rows: DMatrix<f64>,
    /// Place of the output among the plant's; none for the control.
    place: Option<usize>,
    event: RampStep,
    states: DVector<f64>,
    period: usize,
    /// The period in which the ramp had ended.
    ended: Option<usize>,
}

impl<'a> Walk<'a> {
    fn new(
        sampled: &'a SampledLoop,
        input: SampledInput,
        output: SampledOutput,
        event: RampStep,
    ) -> Result<Self, LinearError> {
        event.check()?;
        let (rows, place) = match output {
            SampledOutput::Output(k) => {
                let rows = sampled.rows.get(k).ok_or_else(|| LinearError::UnknownPort(format!("output {k}")))?;
                (rows.clone(), Some(k))
            }
            SampledOutput::Control => {
                let row = sampled.control.row(0);
                (DMatrix::from_fn(PARTS, row.len(), |_, column| row[column]), None)
            }
        };
        if let SampledInput::Event(k) = input
            && k >= sampled.events
        {
            return Err(LinearError::UnknownPort(format!("event {k}")));
        }
        let states = DVector::zeros(sampled.order);
        let ended = (event.rise_s <= 0.0).then_some(0);
        Ok(Walk { sampled, input, rows, place, event, states, period: 0, ended })
    }

    /// Whether the event still changes, or its start is still to be seen.
    fn ramping(&self) -> bool {
        self.ended.is_none_or(|ended| self.period <= ended)
    }

    fn since_ramp(&self) -> usize {
        self.period - self.ended.unwrap_or(0).min(self.period)
    }

    fn change(&self) -> f64 {
        self.event.to - self.event.from
    }

    fn start_s(&self) -> f64 {
        self.period as f64 * self.sampled.period_s
    }

    /// The event's value at a time [s], and its slope from there on.
    fn value(&self, time_s: f64) -> (f64, f64) {
        if time_s < self.event.rise_s {
            let slope = self.change() / self.event.rise_s;
            (slope * time_s, slope)
        } else {
            (self.change(), 0.0)
        }
    }

    /// The extended state at the start of this period.
    fn extended(&self) -> DVector<f64> {
        let sampled = self.sampled;
        let mut all = DVector::zeros(self.rows.ncols());
        all.rows_mut(0, sampled.order).copy_from(&self.states);
        let (value, slope) = self.value(self.start_s());
        match self.input {
            SampledInput::Event(k) => {
                let at = sampled.order + k;
                // The first sample is taken before the event starts.
                all[at] = if self.period == 0 { 0.0 } else { value };
                all[at + sampled.events] = value;
                all[at + 2 * sampled.events] = slope;
            }
            SampledInput::Reference => all[self.rows.ncols() - 1] = value,
        }
        all
    }

    /// What the end of the ramp inside this period changes; none where it does not end here.
    fn bend(&self) -> Result<Option<Bend>, LinearError> {
        let SampledInput::Event(k) = self.input else { return Ok(None) };
        let into = self.event.rise_s - self.start_s();
        if !(into > 0.0 && into < self.sampled.period_s) {
            return Ok(None);
        }
        let pieces = &self.sampled.pieces;
        let (n, slope) = (pieces.states, self.change() / self.event.rise_s);
        let input = n + 1 + k;
        let mut outputs = Vec::with_capacity(PARTS + 1);
        let mut carried: Option<DVector<f64>> = None;
        for part in 0..=PARTS {
            let after = part as f64 * pieces.part_s - into;
            carried = match carried {
                Some(state) => Some(&pieces.part * state),
                None if after > 0.0 => {
                    let over = pieces.over(after)?;
                    Some(over.column(input + self.sampled.events) * -slope)
                }
                None => None,
            };
            outputs.push(match (&carried, self.place) {
                (Some(state), Some(place)) => {
                    pieces.c.row(place).transpose().dot(&state.rows(0, n)) + pieces.d[(place, k)] * state[input]
                }
                _ => 0.0,
            });
        }
        Ok(carried.map(|state| Bend { outputs, states: state.rows(0, n).into_owned() }))
    }

    /// Appends times and values of this period.
    fn look(&self, trace: &mut Vec<(f64, f64)>) -> Result<(), LinearError> {
        let values = &self.rows * self.extended();
        let bend = self.bend()?;
        for part in 0..PARTS {
            let more = bend.as_ref().and_then(|bend| bend.outputs.get(part)).copied().unwrap_or(0.0);
            trace.push((self.start_s() + part as f64 * self.sampled.pieces.part_s, values[part] + more));
        }
        Ok(())
    }

    /// On to the next period.
    fn advance(&mut self) -> Result<(), LinearError> {
        let mut next = &self.sampled.next * self.extended();
        if let Some(bend) = self.bend()? {
            let mut plant = next.rows_mut(0, bend.states.len());
            plant += &bend.states;
        }
        self.states = next;
        self.period += 1;
        if self.ended.is_none() && self.start_s() >= self.event.rise_s {
            self.ended = Some(self.period);
        }
        if self.states.iter().all(|x| x.is_finite()) { Ok(()) } else { Err(LinearError::NotFinite) }
    }

    /// Where everything comes to rest.
    fn at_rest(&self) -> Result<Rest, LinearError> {
        let (sampled, change) = (self.sampled, self.change());
        let mut all = DVector::zeros(self.rows.ncols());
        match self.input {
            SampledInput::Event(k) => {
                all[sampled.order + k] = change;
                all[sampled.order + sampled.events + k] = change;
            }
            SampledInput::Reference => all[self.rows.ncols() - 1] = change,
        }
        let square = sampled.next.columns(0, sampled.order);
        let driven = &sampled.next * &all;
        let system = DMatrix::identity(sampled.order, sampled.order) - square;
        let states = system.full_piv_lu().solve(&driven).ok_or(LinearError::NotStable)?;
        all.rows_mut(0, sampled.order).copy_from(&states);
        let values = &self.rows * all;
        Ok(Rest { states, values: values.iter().copied().collect() })
    }

    /// From here on the states are counted from rest.
    fn leave(&mut self, rest: &Rest) {
        self.states -= &rest.states;
    }

    /// Appends this period, whose states are counted from rest; the start only where nothing fast is left.
    fn look_around(&self, rest: &Rest, all_parts: bool, trace: &mut Vec<(f64, f64)>) {
        let own = self.rows.columns(0, self.sampled.order);
        let parts = if all_parts { PARTS } else { 1 };
        for part in 0..parts {
            let value = rest.values.get(part).copied().unwrap_or(0.0) + own.row(part).transpose().dot(&self.states);
            trace.push((self.start_s() + part as f64 * self.sampled.pieces.part_s, value));
        }
    }

    /// Leaps by a power of two of periods.
    fn leap(&mut self, by: &DMatrix<f64>, power: usize) {
        self.skip(by, 1 << power);
    }

    /// On by so many periods, whose map is `by`.
    fn skip(&mut self, by: &DMatrix<f64>, periods: usize) {
        self.states = by * &self.states;
        self.period += periods;
    }
}

/// Extreme and last exit of a band along a trace that ends at rest.
fn judged(trace: &[(f64, f64)], final_value: f64, band: f64) -> Result<StepMetrics, LinearError> {
    if !final_value.is_finite() || trace.iter().any(|(_, value)| !value.is_finite()) {
        return Err(LinearError::NotFinite);
    }
    let (mut deviation, mut at) = (0.0_f64, None);
    for (k, (_, value)) in trace.iter().enumerate() {
        if value.abs() > deviation.abs() {
            (deviation, at) = (*value, Some(k));
        }
    }
    let mut time = None;
    if let Some(k) = at {
        let (t, value) = trace[k];
        (time, deviation) = (Some(t), value);
        if let (Some(before), Some(after)) = (k.checked_sub(1).and_then(|k| trace.get(k)), trace.get(k + 1))
            && let Some((t, value)) = vertex(*before, trace[k], *after)
        {
            (time, deviation) = (Some(t), value);
        }
    }
    if deviation.abs() <= final_value.abs() * (1.0 + 1e-7) {
        (deviation, time) = (final_value, None);
    }
    let outside = |value: f64| (value - final_value).abs() > band;
    let last = trace.iter().rposition(|(_, value)| outside(*value));
    let settling_s = match last {
        _ if band <= 0.0 => None,
        None => Some(0.0),
        Some(k) => trace.get(k + 1).map(|(t, value)| {
            let (before, level) = (trace[k], band * (trace[k].1 - final_value).signum());
            let part = (before.1 - final_value - level) / (before.1 - value);
            before.0 + part.clamp(0.0, 1.0) * (t - before.0)
        }),
    };
    Ok(StepMetrics { initial_value: 0.0, final_value, deviation, deviation_time_s: time, settling_s })
}

/// The vertex of the parabola through three points, where it lies between the outer ones.
fn vertex(a: (f64, f64), b: (f64, f64), c: (f64, f64)) -> Option<(f64, f64)> {
    let (left, right) = ((b.1 - a.1) / (b.0 - a.0), (c.1 - b.1) / (c.0 - b.0));
    let bend = (right - left) / (c.0 - a.0);
    let middle = left + bend * (b.0 - a.0);
    let t = b.0 - middle / (2.0 * bend);
    let inside = bend.is_finite() && bend != 0.0 && t > a.0 && t < c.0 && left * right < 0.0;
    // A jump is no parabola: its vertex would overshoot by more than a part of the neighbours' distance.
    let value = b.1 - middle * middle / (4.0 * bend);
    let reach = (a.1 - b.1).abs().min((c.1 - b.1).abs());
    (inside && (value - b.1).abs() <= 0.25 * reach.max(f64::MIN_POSITIVE)).then_some((t, value))
}
