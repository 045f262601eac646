//! Crossovers and margins of anything that answers at a frequency.
//!
//! Conventions: phase margin is 180° + phase wrapped to (−180°, 180°]; gain margins lie at crossings of −180° − k·360° and are −|T| in
//! dB, positive where the gain may rise; modulus margin is the least |1 + T|, its inverse the peak sensitivity; delay margin is
//! the least of (PM mod 360°)/(360°·f) over all crossovers and means something for a stable loop only.
//!
//! Method: the band is scanned on a logarithmic grid that is refined around every resonance and notch the response knows of.
//! Sign changes bracket a crossing; an extremum near the level is found itself, so that two crossings between grid points are
//! not missed. Each bracket is closed in ln f by Newton's method, safeguarded by bisection, on the response itself.
//!
//! Bad input: a band that is empty or not finite has no crossings; the modulus margin is then the one at its lower end.

use std::f64::consts::{LN_10, PI, TAU};

use wide::f64x4;

use super::root::{bracketed_root, newton_root};
use super::{Complex, FrequencyResponse, LogPoint};

/// Grid points per decade: a real corner bends over a decade, and resonances bring their own points.
const POINTS_PER_DECADE: f64 = 24.0;

/// Crossovers above the upper limit are listed up to this many times the limit.
const LISTED_ABOVE: f64 = 100.0;

/// Level crossings of the phase listed at most; only an absurd delay has more.
const PHASE_CROSSINGS_AT_MOST: usize = 1000;

/// A frequency where |T| = 1.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Crossover {
    /// Frequency [Hz].
    pub frequency_hz: f64,
    /// 180° + phase wrapped to (−180°, 180°] [°].
    pub phase_margin_deg: f64,
    /// Whether the gain falls through 0 dB with rising frequency.
    pub falling: bool,
    /// Slope of the gain there [dB/decade].
    pub slope_db_per_decade: f64,
}

/// A frequency where the phase crosses −180° − turns·360°.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PhaseCrossover {
    /// Frequency [Hz].
    pub frequency_hz: f64,
    /// −|T| [dB]: positive where the gain may rise by so much, negative where it may fall.
    pub gain_margin_db: f64,
    /// Whole turns below −180°.
    pub turns: i32,
}

/// All crossings and margins of a loop gain within a band.
#[derive(Clone, Debug, PartialEq)]
pub struct Margins {
    /// Gain crossovers in the band, by rising frequency.
    pub crossovers: Vec<Crossover>,
    /// Phase crossovers in the band, by rising frequency.
    pub phase_crossovers: Vec<PhaseCrossover>,
    /// Least |1 + T| in the band.
    pub modulus_margin: f64,
    /// Where it lies [Hz].
    pub modulus_frequency_hz: f64,
    /// Peak sensitivity, 1/modulus margin; infinite for a loop through −1.
    pub sensitivity_peak: f64,
    /// Delay [s] that takes a stable loop to the boundary; `None` without a crossover.
    pub delay_margin_s: Option<f64>,
    /// Gain crossovers above the band, up to 100 times its upper limit: listed only.
    pub above: Vec<Crossover>,
}

impl Margins {
    /// The crossover of least |phase margin|.
    pub fn headline_crossover(&self) -> Option<&Crossover> {
        self.crossovers.iter().min_by(|p, q| p.phase_margin_deg.abs().total_cmp(&q.phase_margin_deg.abs()))
    }

    /// The least positive gain margin: how far the gain may rise [dB].
    pub fn gain_margin_up_db(&self) -> Option<f64> {
        self.phase_crossovers.iter().map(|c| c.gain_margin_db).filter(|m| *m >= 0.0).min_by(f64::total_cmp)
    }

    /// The greatest negative gain margin: how far the gain may fall [dB].
    pub fn gain_margin_down_db(&self) -> Option<f64> {
        self.phase_crossovers.iter().map(|c| c.gain_margin_db).filter(|m| *m < 0.0).max_by(f64::total_cmp)
    }
}

/// All margins of a loop gain between two frequencies [Hz].
pub fn margins(loop_gain: &impl FrequencyResponse, from_hz: f64, to_hz: f64) -> Margins {
    let scan = Scan::new(loop_gain, from_hz, to_hz, LISTED_ABOVE);
    let mut crossovers = scan.gain_crossings();
    let above = crossovers.split_off(crossovers.partition_point(|c| c.frequency_hz <= to_hz));
    let phase_crossovers = scan.phase_crossings(|_| true);
    let (modulus_margin, modulus_frequency_hz) = scan.modulus();
    let delay_margin_s = crossovers
        .iter()
        .map(|c| c.phase_margin_deg.rem_euclid(360.0) / (360.0 * c.frequency_hz))
        .min_by(f64::total_cmp);
    Margins {
        crossovers,
        phase_crossovers,
        modulus_margin,
        modulus_frequency_hz,
        sensitivity_peak: 1.0 / modulus_margin,
        delay_margin_s,
        above,
    }
}

/// Whether the phase crosses −180° − k·360° anywhere in the band while the gain is above one.
pub(super) fn crosses_above_unity(loop_gain: &impl FrequencyResponse, from_hz: f64, to_hz: f64) -> bool {
    Scan::new(loop_gain, from_hz, to_hz, 1.0)
        .phase_crossings(|ln_gain| ln_gain > 0.0)
        .iter()
        .any(|c| c.gain_margin_db < 0.0)
}

/// A response on a grid fine enough to bracket everything.
struct Scan<'a, R> {
    response: &'a R,
    frequencies: Vec<f64>,
    ln_gain: Vec<f64>,
    phase: Vec<f64>,
    /// Grid points within the band; the rest lies above it.
    within: usize,
}

impl<'a, R: FrequencyResponse> Scan<'a, R> {
    fn new(response: &'a R, from_hz: f64, to_hz: f64, above: f64) -> Self {
        let (lowest, highest) = response.band_hz().unwrap_or((0.0, f64::MAX));
        let (from, to) = (from_hz.max(lowest), to_hz.min(highest));
        let sensible = from > 0.0 && from < to && to < f64::MAX / LISTED_ABOVE;
        let grid =
            if sensible { grid(response.breakpoints_hz(), from, to, (to * above).min(highest)) } else { Vec::new() };
        let mut scan = Self { response, frequencies: grid, ln_gain: Vec::new(), phase: Vec::new(), within: 0 };
        if scan.frequencies.is_empty() {
            scan.frequencies.push(if from_hz > 0.0 && from_hz.is_finite() { from_hz } else { 1.0 });
        }
        scan.evaluate(to);
        let extremes = scan.extremes_near_a_level();
        if !extremes.is_empty() {
            scan.frequencies = merge(&scan.frequencies, &extremes);
            scan.evaluate(to);
        }
        scan
    }

    fn evaluate(&mut self, to: f64) {
        let count = self.frequencies.len();
        self.ln_gain.resize(count, 0.0);
        self.phase.resize(count, 0.0);
        self.response.log_curve(&self.frequencies, &mut self.ln_gain, &mut self.phase);
        self.within = self.frequencies.partition_point(|f| *f <= to).max(1);
    }

    /// Extremes of gain and phase that may reach over a level from between grid points.
    fn extremes_near_a_level(&self) -> Vec<f64> {
        let mut found = Vec::new();
        for i in 1..self.frequencies.len().saturating_sub(1) {
            let gain = self.ln_gain[i];
            let direction = if gain < 0.0 { 1.0 } else { -1.0 };
            if is_extreme(&self.ln_gain[i - 1..=i + 1], direction) {
                found.extend(self.extremum(i, direction, gain.abs(), |point| point.gain_slope));
            }
            if i + 1 < self.within {
                for direction in [1.0, -1.0] {
                    if is_extreme(&self.phase[i - 1..=i + 1], direction) {
                        let distance = (direction * (-PI - self.phase[i])).rem_euclid(TAU);
                        found.extend(self.extremum(i, direction, distance, |point| point.phase_slope));
                    }
                }
            }
        }
        found.sort_by(f64::total_cmp);
        found
    }

    /// The extremum beside grid point `i` where the slope vanishes, if it may lie as far beyond that point as `distance`.
    fn extremum(&self, i: usize, direction: f64, distance: f64, slope: impl Fn(&LogPoint) -> f64) -> Option<f64> {
        let here = self.frequencies[i].ln();
        let value = |x: f64| slope(&self.response.log_point(x.exp()));
        let at_here = value(here);
        let other = self.frequencies[if direction * at_here > 0.0 { i + 1 } else { i - 1 }].ln();
        // The curve flattens towards its extremum, so the tangent overshoots it; half as much again is granted for curves that do not.
        if distance > 1.5 * at_here.abs() * (other - here).abs() {
            return None;
        }
        let at_other = value(other);
        let (low, high) =
            if other > here { ((here, at_here), (other, at_other)) } else { ((other, at_other), (here, at_here)) };
        (at_here * at_other < 0.0).then(|| bracketed_root(value, low, high, 1e-9).exp())
    }

    fn gain_crossings(&self) -> Vec<Crossover> {
        let mut found = Vec::new();
        for i in 1..self.frequencies.len() {
            let (before, after) = (self.ln_gain[i - 1], self.ln_gain[i]);
            if (before >= 0.0) == (after >= 0.0) {
                continue;
            }
            if let Some((frequency_hz, point)) = self.close(i, before, after, |p| (p.ln_gain, p.gain_slope)) {
                found.push(Crossover {
                    frequency_hz,
                    phase_margin_deg: wrap_deg(180.0 + point.phase_rad.to_degrees()),
                    falling: after < 0.0,
                    slope_db_per_decade: 20.0 * point.gain_slope,
                });
            }
        }
        found
    }

    /// Phase crossings in the band, of those intervals whose gain at either end is of interest.
    fn phase_crossings(&self, interesting: impl Fn(f64) -> bool) -> Vec<PhaseCrossover> {
        let mut found = Vec::new();
        let level_number = |phase: f64| ((-PI - phase) / TAU).floor();
        let mut after = level_number(self.phase[0]);
        for i in 1..self.within {
            let before = after;
            after = level_number(self.phase[i]);
            let (least, most) = (before.min(after), before.max(after));
            if least >= most || !(interesting(self.ln_gain[i - 1]) || interesting(self.ln_gain[i])) {
                continue;
            }
            let mut passed = 0.0;
            while passed < most - least && found.len() < PHASE_CROSSINGS_AT_MOST {
                let number = if after > before { least + 1.0 + passed } else { most - passed };
                passed += 1.0;
                let level = -PI - TAU * number;
                let ends = (self.phase[i - 1] - level, self.phase[i] - level);
                if let Some((frequency_hz, point)) =
                    self.close(i, ends.0, ends.1, |p| (p.phase_rad - level, p.phase_slope))
                {
                    let gain_margin_db = -point.ln_gain * 20.0 / LN_10;
                    found.push(PhaseCrossover { frequency_hz, gain_margin_db, turns: whole(number) });
                }
            }
        }
        found
    }

    /// Closes the bracket between grid points `i − 1` and `i`; `None` when the value jumps over zero instead of passing it.
    fn close(
        &self,
        i: usize,
        at_low: f64,
        at_high: f64,
        value: impl Fn(&LogPoint) -> (f64, f64),
    ) -> Option<(f64, LogPoint)> {
        let (low, high) = (self.frequencies[i - 1].ln(), self.frequencies[i].ln());
        let resolution = 4.0 * f64::EPSILON * low.abs().max(high.abs()).max(1.0);
        let at = |x: f64| value(&self.response.log_point(x.exp()));
        let f_hz = newton_root(at, (low, at_low), (high, at_high), resolution).exp();
        let point = self.response.log_point(f_hz);
        let (v, slope) = value(&point);
        // A jump leaves a large value at a bracket of no width.
        (v.abs() < 1e-3 || (v / slope).abs() <= resolution).then_some((f_hz, point))
    }

    /// Least |1 + T| in the band, and where.
    fn modulus(&self) -> (f64, f64) {
        let squares = self.distance_squares();
        let (mut best, mut best_f) = (f64::INFINITY, self.frequencies[0]);
        for (square, f) in squares.iter().zip(&self.frequencies) {
            if *square < best {
                (best, best_f) = (*square, *f);
            }
        }
        let least = best.sqrt();
        for i in 1..squares.len().saturating_sub(1) {
            let [before, here, after] = [squares[i - 1], squares[i], squares[i + 1]];
            if here > before || here > after {
                continue;
            }
            // Between grid points the distance falls below the smaller neighbour by less than what separates the neighbours.
            let here = here.sqrt();
            if here - (before.max(after).sqrt() - here) > least {
                continue;
            }
            let (square, f) = self.refine_modulus(i);
            if square < best {
                (best, best_f) = (square, f);
            }
        }
        if let Some((square, f)) = self.modulus_before_the_end(squares.len()).filter(|(square, _)| *square < best) {
            (best, best_f) = (square, f);
        }
        (best.sqrt(), best_f)
    }

    /// The minimum of |1 + T|² between the last two of `count` grid points, which no point beyond brackets: there is one where the
    /// distance falls into that interval and rises out of it.
    fn modulus_before_the_end(&self, count: usize) -> Option<(f64, f64)> {
        let (low, high) = (self.frequencies[count.checked_sub(2)?].ln(), self.frequencies[count - 1].ln());
        let (rising, falling) = (self.distance(high).1, self.distance(low).1);
        (falling < 0.0 && rising > 0.0).then(|| {
            let x = bracketed_root(|x| self.distance(x).1, (low, falling), (high, rising), 1e-11);
            (self.distance(x).0, x.exp())
        })
    }

    /// |1 + T|² on the grid points of the band.
    fn distance_squares(&self) -> Vec<f64> {
        let mut squares = Vec::with_capacity(self.within + 3);
        let gains = self.ln_gain[..self.within].chunks(4);
        for (g, p) in gains.zip(self.phase[..self.within].chunks(4)) {
            let mut padded = ([0.0; 4], [0.0; 4]);
            padded.0[..g.len()].copy_from_slice(g);
            padded.1[..p.len()].copy_from_slice(p);
            let gain = f64x4::new(padded.0).fast_max(f64x4::splat(-300.0)).fast_min(f64x4::splat(300.0)).exp();
            let (_, half) = (f64x4::new(padded.1) * f64x4::splat(0.5)).sin_cos();
            squares.extend_from_slice(distance_square(gain, half).as_array());
        }
        squares.truncate(self.within);
        squares
    }

    /// |1 + T|² at ln f, and half its derivative by ln f.
    fn distance(&self, x: f64) -> (f64, f64) {
        let point = self.response.log_point(x.exp());
        let t = point.value();
        let slope = ((t + 1.0).conj() * t * Complex::new(point.gain_slope, point.phase_slope)).re;
        let gain = point.ln_gain.clamp(-300.0, 300.0).exp();
        let half = (0.5 * point.phase_rad).cos();
        ((1.0 - gain) * (1.0 - gain) + 4.0 * gain * half * half, slope)
    }

    /// The minimum of |1 + T|² around grid point `i`, and where.
    fn refine_modulus(&self, i: usize) -> (f64, f64) {
        let [low, middle, high] = [i - 1, i, i + 1].map(|k| self.frequencies[k].ln());
        let (square, at_middle) = self.distance(middle);
        let (low, high) = if at_middle > 0.0 {
            ((low, self.distance(low).1), (middle, at_middle))
        } else {
            ((middle, at_middle), (high, self.distance(high).1))
        };
        let x = bracketed_root(|x| self.distance(x).1, low, high, 1e-11);
        let refined = self.distance(x).0;
        if refined < square { (refined, x.exp()) } else { (square, middle.exp()) }
    }
}

/// |1 + T|² from |T| and the cosine of half the phase, without cancellation near −1.
fn distance_square(gain: f64x4, cos_half_phase: f64x4) -> f64x4 {
    let off = f64x4::ONE - gain;
    off * off + f64x4::splat(4.0) * gain * cos_half_phase * cos_half_phase
}

/// Whether the middle of three values is an extremum in the given direction.
fn is_extreme(values: &[f64], direction: f64) -> bool {
    direction * (values[1] - values[0]) >= 0.0 && direction * (values[1] - values[2]) >= 0.0
}

/// Wraps an angle to (−180°, 180°].
fn wrap_deg(angle: f64) -> f64 {
    180.0 - (180.0 - angle).rem_euclid(360.0)
}

/// A whole number of turns as an integer.
#[expect(clippy::cast_possible_truncation, reason = "clamped to the range of the type")]
fn whole(x: f64) -> i32 {
    x.round().clamp(f64::from(i32::MIN), f64::from(i32::MAX)) as i32
}

/// The grid from `from` to `top` [Hz], with `to` and the breakpoints in it.
fn grid(mut breakpoints: Vec<f64>, from: f64, to: f64, top: f64) -> Vec<f64> {
    let ratio = 10.0_f64.powf(1.0 / POINTS_PER_DECADE);
    let mut regular = Vec::with_capacity(256);
    let mut f = from;
    while f < to {
        regular.push(f);
        f *= ratio;
    }
    f = to;
    while f < top {
        regular.push(f);
        f *= ratio;
    }
    regular.push(top);
    breakpoints.retain(|b| *b > from && *b < top);
    breakpoints.sort_by(f64::total_cmp);
    merge(&regular, &breakpoints)
}

/// Two rising lists as one, each value once.
fn merge(p: &[f64], q: &[f64]) -> Vec<f64> {
    let mut all: Vec<f64> = Vec::with_capacity(p.len() + q.len());
    let (mut p, mut q) = (p.iter().peekable(), q.iter().peekable());
    while let Some(next) = match (p.peek(), q.peek()) {
        (Some(x), Some(y)) if **x <= **y => p.next(),
        (Some(_), None) => p.next(),
        _ => q.next(),
    } {
        if all.last().is_none_or(|last| *last < *next) {
            all.push(*next);
        }
    }
    all
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::super::precision::{assert_close, assert_near};
    use super::super::{FactoredResponse, SampledResponse, Zpk, eigenvalues};
    use super::*;

    fn real(x: f64) -> Complex {
        Complex::new(x, 0.0)
    }

    fn response(zeros: &[Complex], poles: &[Complex], gain: f64, delay_s: f64) -> FactoredResponse {
        let both = |roots: &[Complex]| {
            roots.iter().flat_map(|r| if r.im == 0.0 { vec![*r] } else { vec![*r, r.conj()] }).collect()
        };
        FactoredResponse::new(Zpk::new(both(zeros), both(poles), gain).unwrap(), delay_s)
    }

    /// Reference: T = ω0/(s(1 + s/ω2)); Q = √(cos φm)/sin φm, so Q = 1 goes with 52° (any control text, from memory; exact here).
    #[test]
    fn second_order_loop() {
        for q in [0.5_f64, 1.0, 3.0] {
            let (w2, w0) = (TAU * 1e4, TAU * 1e4 * q * q);
            let found = margins(&response(&[], &[Complex::ZERO, real(-w2)], w0 * w2, 0.0), 1.0, 1e6);
            assert_eq!(found.crossovers.len(), 1);
            let margin = found.crossovers[0].phase_margin_deg.to_radians();
            assert_close(margin.cos().sqrt() / margin.sin(), q, 1e-12);
            assert!(found.crossovers[0].falling && found.phase_crossovers.is_empty() && found.above.is_empty());
            assert_eq!(found.gain_margin_up_db(), None);
            let delay = found.delay_margin_s.unwrap();
            assert_close(delay, margin / (TAU * found.crossovers[0].frequency_hz), 1e-14);
        }
    }

    /// Planted answer: 1/(s + 1)³ scaled crosses −180° at √3 rad/s where it is 1/8 of its DC gain; an integrator with delay at a quarter period.
    #[test]
    fn gain_margins_in_closed_form() {
        let cube = margins(&response(&[], &[real(-1.0); 3], 4.0, 0.0), 1e-4, 10.0);
        assert_eq!(cube.phase_crossovers.len(), 1);
        assert_close(cube.phase_crossovers[0].frequency_hz, 3.0_f64.sqrt() / TAU, 1e-13);
        assert_close(cube.gain_margin_up_db().unwrap(), 20.0 * 2.0_f64.log10(), 1e-12);
        assert_eq!(cube.phase_crossovers[0].turns, 0);
        let delayed = margins(&response(&[], &[Complex::ZERO], TAU * 1e3, 1e-4), 1.0, 1e5);
        assert_close(delayed.crossovers[0].phase_margin_deg, 90.0 - 36.0, 1e-12);
        for (k, crossing) in delayed.phase_crossovers.iter().enumerate() {
            assert_close(crossing.frequency_hz, (0.25 + k as f64) / 1e-4, 1e-12);
            assert_eq!(crossing.turns, i32::try_from(k).unwrap());
        }
        assert_eq!(delayed.phase_crossovers.len(), 10);
    }

    /// Definition: every margin put back gives |T| = 1, T = −g, |1 + T| least, and the delay margin puts T on −1.
    #[test]
    fn margins_put_back() {
        let lc = Complex::new(-2e3, 2.5e4);
        let loop_gain = response(&[real(-1e4), real(-2e4), real(3e5)], &[Complex::ZERO, lc, real(-6e5)], -2e5, 0.3e-6);
        let found = margins(&loop_gain, 0.3, 150e3);
        assert!(!found.crossovers.is_empty() && !found.phase_crossovers.is_empty());
        for c in &found.crossovers {
            assert_close(loop_gain.at_hz(c.frequency_hz).norm(), 1.0, 1e-12);
            assert_near(loop_gain.at_hz(c.frequency_hz).arg().to_degrees(), wrap_deg(c.phase_margin_deg - 180.0), 1e-9);
        }
        for c in &found.phase_crossovers {
            let t = loop_gain.at_hz(c.frequency_hz);
            assert_near(t.im / t.norm(), 0.0, 1e-12);
            assert_close(-t.re, 10.0_f64.powf(-c.gain_margin_db / 20.0), 1e-11);
        }
        let least = (0..200_000)
            .map(|k| (loop_gain.at_hz(0.3 * (150e3_f64 / 0.3).powf(f64::from(k) / 2e5)) + 1.0).norm())
            .fold(f64::INFINITY, f64::min);
        assert!(found.modulus_margin <= least && least < found.modulus_margin * (1.0 + 1e-6));
        assert_close((loop_gain.at_hz(found.modulus_frequency_hz) + 1.0).norm(), found.modulus_margin, 1e-12);
        assert_close(found.sensitivity_peak, 1.0 / found.modulus_margin, 1e-15);
        let on_edge = FactoredResponse::new(loop_gain.zpk().clone(), 0.3e-6 + found.delay_margin_s.unwrap());
        let touching = margins(&on_edge, 0.3, 150e3);
        assert!(touching.modulus_margin < 1e-10, "{}", touching.modulus_margin);
    }

    /// Planted answer: a resonance of Q = 50,000 that pokes 1 dB through 0 dB between two grid points.
    #[test]
    fn a_needle_is_not_missed() {
        let f = 13_579.0;
        let w = TAU * f;
        let q = 5e4;
        let needle = Complex::new(-0.5 / q, (1.0 - 0.25 / (q * q)).sqrt()) * w;
        let gain = w * w / q * 10.0_f64.powf(0.05);
        let found = margins(&response(&[], &[needle], gain, 0.0), 1.0, 1e5);
        assert_eq!(found.crossovers.len(), 2);
        let [up, down] = found.crossovers[..] else { unreachable!() };
        assert!(!up.falling && down.falling);
        // Around the peak |T|² = peak²/(1 + x²), x = 2Q·Δf/f.
        let expected = f * (10.0_f64.powf(0.1) - 1.0).sqrt() / q;
        assert_close(down.frequency_hz - up.frequency_hz, expected, 1e-4);
    }

    /// Planted answer: a bump that stays 0.1 % below and one that rises 0.1 % above 0 dB, on a smooth loop without resonances.
    #[test]
    fn tangency_is_decided_between_grid_points() {
        let bump = |peak: f64| {
            // s/((s + a)(s + b)) peaks at √(ab) with 1/(a + b).
            response(&[Complex::ZERO], &[real(-1e3), real(-1.3e3)], 2.3e3 * peak, 0.0)
        };
        assert_eq!(margins(&bump(1.001), 1.0, 1e5).crossovers.len(), 2);
        assert!(margins(&bump(0.999), 1.0, 1e5).crossovers.is_empty());
        let found = margins(&bump(1.0 + 1e-9), 1.0, 1e5);
        assert_eq!(found.crossovers.len(), 2);
        assert_close(found.crossovers[0].frequency_hz, 1.3e6_f64.sqrt() / TAU, 1e-3);
    }

    #[test]
    fn crossovers_above_the_limit_are_listed_apart() {
        let loop_gain = response(&[], &[Complex::ZERO], TAU * 1e4, 0.0);
        let found = margins(&loop_gain, 1e-2, 1e3);
        assert!(found.crossovers.is_empty() && found.delay_margin_s.is_none() && found.headline_crossover().is_none());
        assert_eq!(found.above.len(), 1);
        assert_close(found.above[0].frequency_hz, 1e4, 1e-13);
        assert_close(found.above[0].slope_db_per_decade, -20.0, 1e-13);
    }

    /// Two routes: a model against itself sampled.
    #[test]
    fn sampled_data_has_the_margins_of_its_model() {
        let loop_gain = response(&[real(-1e4)], &[Complex::ZERO, Complex::new(-3e3, 2e4), real(-4e5)], 5e14, 1e-6);
        let f: Vec<f64> = (0..2001).map(|k| 10.0_f64.powf(2.0 + 0.002 * f64::from(k))).collect();
        let values: Vec<Complex> = f.iter().map(|f| loop_gain.at_hz(*f)).collect();
        let (exact, sampled) =
            (margins(&loop_gain, 100.0, 1e6), margins(&SampledResponse::new(&f, &values).unwrap(), 1.0, 1e9));
        assert_eq!(exact.crossovers.len(), sampled.crossovers.len());
        for (p, q) in exact.crossovers.iter().zip(&sampled.crossovers) {
            assert_close(p.frequency_hz, q.frequency_hz, 1e-5);
            assert_near(p.phase_margin_deg, q.phase_margin_deg, 1e-2);
        }
        assert_close(exact.gain_margin_up_db().unwrap(), sampled.gain_margin_up_db().unwrap(), 1e-4);
        assert_close(exact.modulus_margin, sampled.modulus_margin, 1e-4);
        assert!(sampled.above.is_empty());
    }

    #[test]
    fn headline_and_wrapped_margins() {
        assert_near(wrap_deg(190.0), -170.0, 1e-12);
        assert_near(wrap_deg(-180.0), 180.0, 1e-12);
        assert_near(wrap_deg(540.0), 180.0, 1e-12);
        // Phase −350° at crossover: a margin of 190° wraps to −170°, and a delay of 190° reaches −1.
        let lc = Complex::new(-10.0, 1e3);
        let found = margins(&response(&[real(-1e3)], &[lc, lc], 3e11, 0.0), 1.0, 1e4);
        let least = found.headline_crossover().unwrap().phase_margin_deg.abs();
        assert!(found.crossovers.iter().all(|c| c.phase_margin_deg.abs() >= least));
    }

    #[test]
    fn impossible_bands_have_no_crossings() {
        let loop_gain = response(&[], &[Complex::ZERO], 1.0, 0.0);
        for (from, to) in [(1.0, 1.0), (2.0, 1.0), (0.0, 1.0), (f64::NAN, 1.0), (1.0, f64::INFINITY)] {
            let found = margins(&loop_gain, from, to);
            assert!(
                found.crossovers.is_empty() && found.phase_crossovers.is_empty() && found.modulus_margin.is_finite()
            );
        }
        let silent = margins(&FactoredResponse::new(Zpk::constant(0.0), 0.0), 1.0, 10.0);
        assert_near(silent.modulus_margin, 1.0, 1e-15);
    }

    /// Frequencies [Hz] where |T| = 1, as the imaginary eigenvalues of the Hamiltonian matrix of a strictly proper loop.
    /// Source: Boyd, Balakrishnan and Kabamba, Math. Control Signals Systems 2 (1989), 207 (from memory).
    fn crossovers_by_hamiltonian(loop_gain: &FactoredResponse) -> Vec<f64> {
        let system = loop_gain.zpk().cascade().unwrap();
        let n = system.order();
        let mut h = nalgebra::DMatrix::zeros(2 * n, 2 * n);
        h.view_mut((0, 0), (n, n)).copy_from(&system.a);
        h.view_mut((0, n), (n, n)).copy_from(&(&system.b * system.b.transpose()));
        h.view_mut((n, 0), (n, n)).copy_from(&-(system.c.transpose() * &system.c));
        h.view_mut((n, n), (n, n)).copy_from(&-system.a.transpose());
        let on_axis = |r: &&Complex| r.im > 0.0 && r.re.abs() < 1e-6 * r.norm();
        let mut found: Vec<f64> = eigenvalues(&h).unwrap().iter().filter(on_axis).map(|r| r.im / TAU).collect();
        found.sort_by(f64::total_cmp);
        found
    }

    proptest! {
        /// Two routes: all crossovers against the Hamiltonian's eigenvalues, with resonances down to 1 % damping.
        #[test]
        fn all_crossovers_are_found(
            pairs in prop::collection::vec((2.5..4.5_f64, 0.01..0.5_f64), 1..3),
            zeros in prop::collection::vec((2.5..4.5_f64, 0.01..0.5_f64), 0..2),
            gain_db in -20.0..60.0_f64,
        ) {
            let root = |(decade, damping): &(f64, f64)| Complex::new(-damping, (1.0 - damping * damping).sqrt()) * 10.0_f64.powf(*decade);
            let mut poles: Vec<Complex> = pairs.iter().map(root).collect();
            poles.push(real(-300.0));
            let zeros: Vec<Complex> = zeros.iter().map(root).collect();
            let shape = response(&zeros, &poles, 1.0, 0.0);
            let gain = 10.0_f64.powf(gain_db / 20.0) / shape.at_hz(1.0).norm();
            let loop_gain = response(&zeros, &poles, gain, 0.0);
            let expected = crossovers_by_hamiltonian(&loop_gain);
            let found = margins(&loop_gain, 1e-1, 1e12);
            // Where the curve all but touches 0 dB, two eigenvalues meet and the count of either route is a matter of rounding.
            prop_assume!(expected.windows(2).all(|pair| pair[1] > pair[0] * 1.0001));
            prop_assert_eq!(found.crossovers.len(), expected.len(), "{:?} {:?}", found.crossovers, expected);
            for (c, f) in found.crossovers.iter().zip(&expected) {
                prop_assert!((c.frequency_hz / f - 1.0).abs() < 1e-5, "{} against {f}", c.frequency_hz);
            }
        }
    }
}
