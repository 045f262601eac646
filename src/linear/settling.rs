//! Extreme and last exit of a band, on one walk along a response that is a line plus decaying modes.
//!
//! The walk steps as closely as the modes still alive require; what has died stays dead. It ends when the modes left can
//! neither make a new extreme nor leave the band again, which their summed size tells.

use super::root::newton_root;
use super::{Complex, UniformGrid};

/// Search step as a part of the fastest living mode's 1/|pole|.
const STEP_PART: f64 = 0.35;

/// A mode smaller than this part of the extreme found so far is dead to the search.
const DEAD: f64 = 3e-8;

/// Points looked at in one search at most; a mode of Q = 1,000 needs some ten thousand.
const POINTS_AT_MOST: usize = 400_000;

/// Radians of a lone ringing mode that are walked before its envelope enters the band.
const TURNS_BEFORE: f64 = 60.0;

/// A stretch of the response: `offset + slope·t + Σ Re(amplitude·exp(pole·t))`.
pub(super) struct Segment<'a> {
    /// When it begins [s].
    pub(super) start: f64,
    pub(super) offset: f64,
    pub(super) slope: f64,
    pub(super) amplitudes: Vec<Complex>,
    pub(super) poles: &'a [Complex],
    /// How long it lasts [s].
    pub(super) length: f64,
}

/// Points between fresh exponentials: keeps the rounding of repeated products below 1e-14.
const PRODUCTS: usize = 64;

impl Segment<'_> {
    /// Appends the values at the grid's times that lie in this stretch, from the first time not yet there.
    pub(super) fn sample(&self, grid: UniformGrid, values: &mut Vec<f64>) {
        let factors: Vec<Complex> = self.poles.iter().map(|p| (p * grid.step_s).exp()).collect();
        let mut terms: Vec<Complex> = Vec::with_capacity(self.poles.len());
        let mut since = PRODUCTS;
        while values.len() < grid.count {
            let t = values.len() as f64 * grid.step_s - self.start;
            if t > self.length {
                return;
            }
            if since == PRODUCTS {
                terms.clear();
                terms.extend(self.terms(t));
                since = 0;
            } else {
                for (term, factor) in terms.iter_mut().zip(&factors) {
                    // A dead mode would crawl through the slow numbers near zero.
                    *term = if term.norm_sqr() < 1e-290 { Complex::ZERO } else { *term * factor };
                }
            }
            since += 1;
            values.push(self.offset + self.slope * t + terms.iter().map(|term| term.re).sum::<f64>());
        }
    }

    fn value(&self, t: f64) -> f64 {
        self.offset + self.slope * t + self.terms(t).map(|term| term.re).sum::<f64>()
    }

    /// First and second derivative.
    fn rate_and_bend(&self, t: f64) -> (f64, f64) {
        self.terms(t).zip(self.poles).fold((self.slope, 0.0), |(rate, bend), (term, p)| {
            let moving = term * p;
            (rate + moving.re, bend + (moving * p).re)
        })
    }

    /// Value and first derivative.
    fn value_and_rate(&self, t: f64) -> (f64, f64) {
        let start = (self.offset + self.slope * t, self.slope);
        self.terms(t).zip(self.poles).fold(start, |(value, rate), (term, p)| (value + term.re, rate + (term * p).re))
    }

    fn terms(&self, t: f64) -> impl Iterator<Item = Complex> {
        self.amplitudes.iter().zip(self.poles).map(move |(a, p)| a * (p * t).exp())
    }

    /// Where the rate vanishes between two points of a walk; the last Newton step squares the tolerance.
    fn turning_point(&self, from: &Point, to: &Point) -> f64 {
        newton_root(|t| self.rate_and_bend(t), (from.t, from.rate), (to.t, to.rate), 1e-5 * (to.t - from.t))
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

    /// Goes on by about the given time: a step in use is kept while it is between half and all of it.
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
            // A dead mode would crawl through the slow numbers near zero.
            *term = if term.norm_sqr() < 1e-290 { Complex::ZERO } else { *term * factor };
        }
    }

    /// Where the walk stands.
    fn point(&self) -> Point {
        let start = (self.segment.offset + self.segment.slope * self.t, self.segment.slope);
        let modes = self.terms.iter().zip(self.segment.poles);
        let (value, rate) =
            modes.fold(start, |(value, rate), (term, p)| (value + term.re, rate + term.re * p.re - term.im * p.im));
        Point { t: self.t, value, rate }
    }

    /// Where a single slowly decaying pair, all other modes smaller than `dead`, comes within a few turns of leaving a band for good; none
    /// where that is near anyway. All that the walk would meet before is turns that leave the band again.
    fn near_last_exit(&self, band: f64, dead: f64) -> Option<f64> {
        let mut living = self.terms.iter().zip(self.segment.poles).filter(|(term, _)| term.norm() > dead);
        let (Some((term, pole)), None) = (living.next(), living.next()) else { return None };
        if pole.im == 0.0 || band <= 0.0 {
            return None;
        }
        let ahead = (term.norm() / band).ln() / -pole.re - TURNS_BEFORE / pole.im.abs();
        (ahead > TURNS_BEFORE / pole.im.abs()).then_some(self.t + ahead)
    }

    /// Sum of the modes' magnitudes: what the response can still depart from its line.
    fn size(&self) -> f64 {
        self.terms.iter().map(|term| term.norm_sqr().sqrt()).sum()
    }
}

/// One point of a walk.
#[derive(Clone, Copy)]
struct Point {
    t: f64,
    value: f64,
    rate: f64,
}

impl Point {
    /// Whether the response turns between this point and another, and perhaps further from a level than a distance.
    fn may_turn_beyond(&self, other: &Self, level: f64, distance: f64) -> bool {
        let reach = (self.t - other.t).abs() * self.rate.abs().max(other.rate.abs());
        let furthest = (self.value - level).abs().max((other.value - level).abs());
        self.rate * other.rate < 0.0 && furthest + reach >= distance
    }
}

/// What a walk along the response has met: the signed extreme against the value before, and the last way into the band.
pub(super) struct Met<'s> {
    before: f64,
    final_value: f64,
    band: f64,
    deviation: f64,
    deviation_time_s: Option<f64>,
    outside: bool,
    /// The stretch and the two times, outside and inside, around the last way into the band.
    last_way_in: Option<(&'s Segment<'s>, f64, f64)>,
}

impl<'s> Met<'s> {
    /// Before the walk.
    pub(super) fn new(before: f64, final_value: f64, band: f64) -> Self {
        Met {
            before,
            final_value,
            band: band.max(0.0),
            deviation: 0.0,
            deviation_time_s: Some(0.0),
            outside: false,
            last_way_in: None,
        }
    }

    /// The signed extreme against the value before, and when; no time where it is only approached.
    pub(super) fn deviation(&self) -> (f64, Option<f64>) {
        let change = self.final_value - self.before;
        if change.abs() >= self.deviation.abs() && change != 0.0 {
            (change, None)
        } else {
            (self.deviation, self.deviation_time_s)
        }
    }

    /// Takes note of a point; `from` is the time of the point before it on the same stretch.
    fn note(&mut self, segment: &'s Segment<'s>, from: f64, here: Point) {
        let deviation = here.value - self.before;
        if deviation.abs() > self.deviation.abs() {
            (self.deviation, self.deviation_time_s) = (deviation, Some(segment.start + here.t));
        }
        let outside = (here.value - self.final_value).abs() > self.band;
        if self.outside && !outside {
            self.last_way_in = Some((segment, from, here.t));
        }
        self.outside = outside;
    }

    /// Walks along a stretch, turning points included, until nothing further can matter.
    pub(super) fn walk(&mut self, segment: &'s Segment<'s>) {
        let mut walk = Walk::new(segment, 0.0);
        let mut last = walk.point();
        self.note(segment, 0.0, last);
        let modes = 1.0 + segment.poles.len() as f64;
        for _ in 0..POINTS_AT_MOST {
            let size = walk.size();
            let endless = segment.length.is_infinite();
            // Once no new extreme can come, only the band matters, and modes far inside it do not.
            let extreme_is_over = endless && (segment.offset - self.before).abs() + size < self.deviation.abs();
            let for_band = if self.band > 0.0 { 0.02 * self.band / modes } else { f64::INFINITY };
            let dead = if extreme_is_over { for_band } else { for_band.min(DEAD * self.deviation.abs()) };
            if extreme_is_over && size <= self.band || endless && size <= DEAD * DEAD * self.deviation.abs() {
                break;
            }
            if extreme_is_over && let Some(t) = walk.near_last_exit(self.band, for_band) {
                walk = Walk::new(segment, t);
                last = walk.point();
                self.note(segment, t, last);
            }
            let Some(step) = walk.sensible_step(dead) else { break };
            let at_end = walk.t + step >= segment.length;
            walk.advance(if at_end { segment.length - walk.t } else { step });
            let here = walk.point();
            if here.may_turn_beyond(&last, self.before, self.deviation.abs())
                || here.may_turn_beyond(&last, self.final_value, self.band)
            {
                let t = segment.turning_point(&last, &here);
                self.note(segment, last.t, Point { t, value: segment.value(t), rate: 0.0 });
                last.t = t;
            }
            self.note(segment, last.t, here);
            last = here;
            if at_end {
                break;
            }
        }
        if segment.length.is_finite() && last.t < segment.length {
            let end = Point { t: segment.length, value: segment.value(segment.length), rate: 0.0 };
            self.note(segment, last.t, end);
        }
    }

    /// The last exit from the band [s]; 0 when it is never left.
    pub(super) fn last_exit(&self) -> f64 {
        let Some((segment, outside, inside)) = self.last_way_in else { return 0.0 };
        let excess = |t: f64| {
            let (value, rate) = segment.value_and_rate(t);
            ((value - self.final_value).abs() - self.band, if value < self.final_value { -rate } else { rate })
        };
        let (at_outside, at_inside) = (excess(outside).0, excess(inside).0);
        segment.start + newton_root(excess, (outside, at_outside), (inside, at_inside), 1e-12 * inside.abs())
    }
}
