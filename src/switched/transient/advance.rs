//! From one event to the next within a mode: the first instant at which a watched signal leaves its interval, to rounding.
//!
//! *Method*: the signals are looked at on the grid of a table of exponentials; the step in which one leaves its interval, or in which a
//! parabola through its neighbours says that it may touch the end, is looked at on the next finer grid, and at last as a polynomial in
//! time, whose root is found by Newton's method kept within a bracket. So an instant is exact, and a signal that only touches its end
//! between two grid points is not missed.

use super::flow::{TERMS, dot, whole};
use super::mode::{Mode, Role, Watch};

/// What a watch is compared with as time goes on: the signal less offset and less rate times time.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Ramp {
    /// At the beginning.
    pub(super) offset: f64,
    /// Per second.
    pub(super) rate: f64,
}

/// Working memory of the search.
#[derive(Clone, Debug)]
pub(super) struct Scratch {
    out: Vec<f64>,
    terms: Vec<f64>,
    values: Vec<f64>,
    polynomial: [f64; TERMS],
}

impl Scratch {
    pub(super) fn new(n: usize) -> Self {
        let stride = n.next_multiple_of(4);
        Scratch {
            out: vec![0.0; stride],
            terms: vec![0.0; stride * (TERMS + 1)],
            values: vec![0.0; 64 + BLOCK],
            polynomial: [0.0; TERMS],
        }
    }
}

/// Where an advance ended.
#[derive(Clone, Copy, Debug)]
pub(super) struct Reached {
    /// Time advanced [s]; exactly the limit where nothing ended it before.
    pub(super) elapsed: f64,
    /// The watch that ended it, by its place in the mode.
    pub(super) ended_by: Option<usize>,
}

/// Turns of Newton's method at most; each halves the bracket at least.
const TURNS: usize = 60;

impl Mode {
    /// Advances the extended state by at most `limit`, to the first instant at which one of the watches (their places as bits) leaves
    /// its interval. `ramp` is what the comparator's signal is compared with.
    pub(super) fn advance(&self, z: &mut [f64], limit: f64, active: u32, ramp: Ramp, scratch: &mut Scratch) -> Reached {
        let moving = z[self.flow.n + self.flow.m..].iter().any(|s| *s != 0.0);
        let mut elapsed = 0.0;
        // A step of rounding is no step.
        let least = limit * 1e-15;
        while limit - elapsed > least {
            let mut span = limit - elapsed;
            let mut near = false;
            for t in 0..self.flow.tables.len() {
                let table = &self.flow.tables[t];
                let steps = whole(span / table.step * (1.0 + 1e-15)).min(table.count);
                if steps == 0 {
                    continue;
                }
                let first = self.first_exit(z, (t, steps), active, ramp, elapsed, (moving, near), &mut scratch.values);
                near |= first.is_some();
                let sure = first.map_or(steps, |step| step - 1);
                if sure > 0 {
                    self.flow.step(t, sure, z, moving, &mut scratch.out);
                    let time = table.step * sure as f64;
                    self.take(z, &scratch.out, time);
                    elapsed += time;
                }
                span = if first.is_some() { table.step } else { (span - table.step * sure as f64).max(0.0) };
            }
            // What is left of an interval that ended on a grid point.
            let span = span.min(limit - elapsed);
            if span <= least {
                continue;
            }
            let count = self.flow.series(z, span, moving, &mut scratch.terms);
            // A limiter's polynomial is made where its end is out, or something is near.
            let often = if near { active } else { active & !self.rare };
            let mut ended = self.root(z, span, count, often, ramp, elapsed, scratch);
            if ended.is_none() && often != active && self.out_after(z, span, count, active & self.rare, scratch) {
                ended = self.root(z, span, count, active, ramp, elapsed, scratch);
            }
            let share = ended.map_or(1.0, |(_, share)| share);
            self.sum(z, count, share, span, scratch);
            elapsed += span * share;
            if let Some((watch, _)) = ended {
                return Reached { elapsed, ended_by: Some(watch) };
            }
        }
        Reached { elapsed: limit, ended_by: None }
    }

    fn take(&self, z: &mut [f64], x: &[f64], time: f64) {
        let (n, m) = (self.flow.n, self.flow.m);
        z[..n].copy_from_slice(&x[..n]);
        let (signals, slopes) = z[n..].split_at_mut(m);
        signals.iter_mut().zip(slopes).for_each(|(w, s)| *w += *s * time);
    }

    /// The watched signals that are active, with what they are compared with.
    fn watched(&self, active: u32, ramp: Ramp) -> impl Iterator<Item = (usize, &Watch, Ramp)> {
        self.watches.iter().enumerate().filter(move |(k, _)| active & (1 << k) != 0).map(move |(k, watch)| {
            let ramp = if watch.role == Role::Comparator { ramp } else { Ramp::default() };
            (k, watch, ramp)
        })
    }

    /// The first of some steps of a table in which a signal leaves its interval, or may touch its end. A limiter is looked at now and then
    /// only, unless something is `near`: it leaves to stay, and a touch of its limit is nothing.
    #[expect(clippy::too_many_arguments, reason = "one kernel, called from one place")]
    fn first_exit(
        &self,
        z: &[f64],
        (t, steps): (usize, usize),
        active: u32,
        ramp: Ramp,
        elapsed: f64,
        (moving, near): (bool, bool),
        values: &mut [f64],
    ) -> Option<usize> {
        let table = &self.flow.tables[t];
        let used = if moving { self.flow.width() } else { self.flow.n + self.flow.m };
        let mut first = None;
        let mut within = steps;
        for (_, watch, ramp) in self.watched(active, ramp) {
            if !near && matches!(watch.role, Role::Limiter(_)) {
                if let Some(step) = rare_exit(watch, t, table.count, &z[..used], within) {
                    first = Some(step);
                    within = step;
                }
                continue;
            }
            values[0] = dot(&watch.row, &z[..watch.row.len()]) - ramp.offset - ramp.rate * elapsed;
            let mut seen = 0;
            while seen < within {
                let sums = block(&watch.tables[t], table.count, &z[..used], seen);
                for (k, (value, sum)) in values[seen + 1..].iter_mut().zip(sums).enumerate() {
                    *value = sum - ramp.offset - ramp.rate * (elapsed + table.step * (seen + k + 1) as f64);
                }
                // A parabola needs the neighbours of the block's first values.
                let from = seen.saturating_sub(2);
                seen = (seen + BLOCK).min(within);
                if let Some(step) = exit(watch, &values[from..=seen], t == 0) {
                    first = Some(from + step);
                    within = from + step;
                    break;
                }
            }
        }
        first
    }

    /// The first root of a watched signal's polynomial over a short span, as a share of it.
    #[expect(clippy::too_many_arguments, reason = "one kernel, called from one place")]
    fn root(
        &self,
        z: &[f64],
        span: f64,
        count: usize,
        active: u32,
        ramp: Ramp,
        elapsed: f64,
        scratch: &mut Scratch,
    ) -> Option<(usize, f64)> {
        let (n, m, stride) = (self.flow.n, self.flow.m, self.flow.stride);
        let mut first: Option<(usize, f64)> = None;
        for (k, watch, ramp) in self.watched(active, ramp) {
            let polynomial = &mut scratch.polynomial[..count];
            for (j, coefficient) in polynomial.iter_mut().enumerate() {
                *coefficient = dot(&watch.row[..n], &scratch.terms[j * stride..j * stride + n]);
            }
            polynomial[0] += dot(&watch.row[n..], &z[n..n + m]) - ramp.offset - ramp.rate * elapsed;
            polynomial[1] += (dot(&watch.row[n..], &z[n + m..]) - ramp.rate) * span;
            let within = first.map_or(1.0, |(_, share)| share);
            if let Some(share) = leaves(watch, polynomial, within) {
                first = Some((k, share));
            }
        }
        first
    }

    /// Whether one of some signals is out at the end of a short span.
    fn out_after(&self, z: &[f64], span: f64, count: usize, which: u32, scratch: &mut Scratch) -> bool {
        let (n, m, stride) = (self.flow.n, self.flow.m, self.flow.stride);
        let Scratch { out, terms, .. } = scratch;
        out.fill(0.0);
        for term in terms[..count * stride].chunks_exact(stride) {
            for (sum, value) in out.iter_mut().zip(term) {
                *sum += value;
            }
        }
        let (signals, slopes) = (&z[n..n + m], &z[n + m..]);
        self.watched(which, Ramp::default()).any(|(_, watch, _)| {
            let later = dot(&watch.row[n..], signals) + dot(&watch.row[n..], slopes) * span;
            watch.out(dot(&watch.row[..n], &out[..n]) + later)
        })
    }

    fn sum(&self, z: &mut [f64], count: usize, share: f64, span: f64, scratch: &mut Scratch) {
        let stride = self.flow.stride;
        let Scratch { out, terms, .. } = scratch;
        out.copy_from_slice(&terms[(count - 1) * stride..count * stride]);
        for term in terms[..(count - 1) * stride].chunks_exact(stride).rev() {
            for (sum, value) in out.iter_mut().zip(term) {
                *sum = *sum * share + value;
            }
        }
        self.take(z, out, span * share);
    }
}

/// Steps that are summed at once; the tables' lengths are multiples of it.
const BLOCK: usize = 8;

/// A signal after the next steps of a table, from the column-wise table.
fn block(columns: &[f64], count: usize, z: &[f64], from: usize) -> [f64; BLOCK] {
    let mut sums = [0.0; BLOCK];
    for (column, factor) in columns.chunks_exact(count).zip(z) {
        if let Some(entries) = column.get(from..).and_then(<[f64]>::first_chunk::<BLOCK>) {
            for k in 0..BLOCK {
                sums[k] += entries[k] * factor;
            }
        }
    }
    sums
}

/// The first of the steps a block apart, and of the last one, after which a signal is out: the step behind the one before.
fn rare_exit(watch: &Watch, t: usize, count: usize, z: &[f64], steps: usize) -> Option<usize> {
    let mut before = 0;
    while before < steps {
        let step = (before + BLOCK).min(steps);
        let columns = watch.tables[t].chunks_exact(count);
        let value: f64 = columns.zip(z).map(|(column, factor)| column[step - 1] * factor).sum();
        if watch.out(value) {
            return Some(before + 1);
        }
        before = step;
    }
    None
}

/// The first step after which a signal is out, or within which a parabola through its neighbours touches its end.
fn exit(watch: &Watch, values: &[f64], wary: bool) -> Option<usize> {
    let out = values.iter().skip(1).position(|v| watch.out(*v)).map(|k| k + 1);
    if !wary {
        return out;
    }
    let inside = &values[..out.unwrap_or(values.len())];
    let touched = inside.array_windows::<3>().enumerate().find_map(|(k, [a, b, c])| {
        let bend = a - 2.0 * b + c;
        let turn = 0.5 * (a - c);
        // The extreme lies between a and c, at b − turn²/(2·bend), turn/bend steps beyond b.
        if turn.abs() >= bend.abs() || !watch.out(b - 0.5 * turn * turn / bend) {
            return None;
        }
        Some(if turn / bend > 0.0 { k + 2 } else { k + 1 })
    });
    touched.or(out)
}

fn horner(polynomial: &[f64], x: f64) -> (f64, f64) {
    let (mut value, mut slope) = (0.0, 0.0);
    for coefficient in polynomial.iter().rev() {
        slope = slope * x + value;
        value = value * x + coefficient;
    }
    (value, slope)
}

/// The first share up to `within` at which a polynomial leaves its watch's interval.
fn leaves(watch: &Watch, polynomial: &[f64], within: f64) -> Option<f64> {
    let (end, end_slope) = horner(polynomial, within);
    let mut bracket = within;
    if !watch.out(end) {
        // It may leave and return: an extreme between.
        let slope = polynomial[1];
        if slope * end_slope >= 0.0 {
            return None;
        }
        let (mut low, mut high) = (0.0, within);
        for _ in 0..TURNS {
            let middle = 0.5 * (low + high);
            if horner(polynomial, middle).1 * slope > 0.0 { low = middle } else { high = middle }
        }
        if !watch.out(horner(polynomial, low).0) {
            return None;
        }
        bracket = low;
    }
    let beyond = if horner(polynomial, bracket).0 <= watch.least { watch.least } else { watch.greatest };
    let sign = if beyond <= watch.least { 1.0 } else { -1.0 };
    let value = |x: f64| {
        let (value, slope) = horner(polynomial, x);
        (sign * (value - beyond), sign * slope)
    };
    let mut low = 0.0;
    if value(0.0).0 <= 0.0 {
        // By rounding it is there already: it leaves at once, unless it first moves inward.
        let halves = std::iter::successors(Some(0.5 * bracket), |x| Some(0.5 * x)).take(TURNS);
        low = halves.into_iter().find(|x| value(*x).0 > 0.0).unwrap_or(0.0);
        if low <= 0.0 {
            return Some(0.0);
        }
    }
    let (start, mut high) = (value(low).0, bracket);
    let mut x = low + (bracket - low) * start / (start - value(bracket).0);
    for _ in 0..TURNS {
        let (v, slope) = value(x);
        if v > 0.0 {
            low = x;
        } else {
            high = x;
        }
        let mut next = x - v / slope;
        if !(next > low && next < high) {
            if (next - x).abs() <= 2.0 * f64::EPSILON {
                break;
            }
            next = 0.5 * (low + high);
        }
        if (next - x).abs() <= f64::EPSILON {
            x = next;
            break;
        }
        x = next;
    }
    Some(x.clamp(0.0, bracket))
}
