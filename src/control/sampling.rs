//! What sampling the current once a period does: slope factor, quality factor of the sampling pair, subharmonic boundary.
//!
//! *Conventions*: the sensed interval is the one the comparator ends: the switch's in peak, the rectifier's in valley
//! current mode; q is its share of the period. M is the slope of the current while the switch conducts less that while the
//! rectifier does. Slopes of the current [A/s]; a ramp is stated in amperes of the sensed current [A/s] or at the comparator [V/s].
//!
//! *Source*: Ridley 1991 for mc, Qp and the sampling pair at half the switching frequency; Erickson & Maksimovic,
//! Fundamentals of Power Electronics, 3rd ed., 18.7 for the fast multiplier. The sense filter and the delay enter as in
//! `current`: the sensed current is a sum of steps answered by the filter, z = e^(sT).

use super::law::Edge;
use crate::converter::OperatingPoint;
use std::f64::consts::{FRAC_1_PI, PI};

/// The sensed interval of one period, with filter and delay.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Interval {
    /// Share of the period q.
    pub(super) share: f64,
    /// Switching period T [s].
    pub(super) period: f64,
    /// Delay from comparator to switch node [s].
    pub(super) delay: f64,
    /// Time constant of the sense filter τ [s].
    pub(super) filter: f64,
}

impl Interval {
    /// e^(−t/τ), nothing without a filter. A delay longer than the interval would ask for less than nothing.
    fn decay(&self, time: f64) -> f64 {
        if self.filter > 0.0 { (-time.max(0.0) / self.filter).exp() } else { 0.0 }
    }

    /// What a step is short of after a whole period: e^(−T/τ).
    pub(super) fn memory(&self) -> f64 {
        self.decay(self.period)
    }

    /// The same at the comparator, a delay earlier.
    pub(super) fn memory_at_comparator(&self) -> f64 {
        self.decay(self.period - self.delay)
    }

    /// What the filter is short of its straight line where the comparator decides, per second of M.
    fn transient(&self) -> f64 {
        let rest = self.decay((1.0 - self.share) * self.period);
        self.decay(self.share * self.period - self.delay) * (1.0 - rest) / (1.0 - self.memory())
    }

    /// Filtered ripple at the end of the interval over M, less the delay's slope [s]: half the ripple without a filter.
    pub(super) fn ripple(&self) -> f64 {
        let q = self.share;
        q * (1.0 - q) * self.period / 2.0 + self.filter * (self.transient() - (1.0 - q))
    }

    /// Its derivative over q [s].
    pub(super) fn ripple_over_share(&self) -> f64 {
        let lag = self.decay(self.share * self.period - self.delay) / (1.0 - self.memory());
        (0.5 - self.share) * self.period + self.filter - self.period * lag
    }

    /// Slope of the filtered current at the comparator over M.
    fn slope(&self) -> f64 {
        (1.0 - self.share) - self.transient()
    }

    /// The comparator's slope over M that stands just at the boundary of subharmonic oscillation.
    fn boundary(&self) -> f64 {
        0.5 - self.memory_at_comparator() / (1.0 + self.memory())
    }

    /// Ramp that gives a quality factor [A/s]; negative where less than none would be needed.
    pub(super) fn ramp_for(&self, quality: f64, slope_difference: f64) -> f64 {
        slope_difference * (self.boundary() + FRAC_1_PI / quality - self.slope())
    }
}

/// The sampling figures at one condition in continuous conduction.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sampling {
    /// Slope factor mc = 1 + ramp / slope of the sensed interval, the ramp that the current has of its own included.
    pub slope_factor: f64,
    /// 1/(π·Qp); zero at the boundary of subharmonic oscillation, negative beyond.
    pub damping: f64,
    /// Factor α by which a small deviation of the current is carried into the next period; below −1 it grows.
    pub fast_multiplier: f64,
    /// Compensating ramp at the boundary [V/s at the comparator]; zero where none is needed.
    pub boundary_ramp: f64,
    /// Compensating ramp for Qp = 1 [V/s at the comparator]; zero where none is needed.
    pub recommended_ramp: f64,
    /// Compensating ramp as a share of the slope it works against: the down-slope in peak, the up-slope in valley mode.
    pub ramp_share: f64,
}

impl Sampling {
    /// The figures for a ramp of `ramp` amperes per second beside the one the sensed current has of its own; `gain` is the
    /// comparator's volts per ampere.
    pub(super) fn new(interval: &Interval, edge: Edge, point: &OperatingPoint, ramp: f64, gain: f64) -> Self {
        let difference = point.on_slope - point.off_slope;
        let natural = edge.natural(point);
        let whole = ramp + natural;
        let g = interval.slope() + whole / difference;
        let volts = |amperes: f64| (gain * (amperes - natural)).max(0.0);
        Sampling {
            slope_factor: 1.0 + whole / sensed_slope(edge, point).abs(),
            damping: g - interval.boundary(),
            fast_multiplier: fast_multiplier(interval, g),
            boundary_ramp: volts(interval.ramp_for(f64::INFINITY, difference)),
            recommended_ramp: volts(interval.ramp_for(1.0, difference)),
            ramp_share: ramp / opposing_slope(edge, point),
        }
    }

    /// Quality factor of the sampling pair at half the switching frequency; none where it does not decay.
    pub fn quality(&self) -> Option<f64> {
        (self.damping > 0.0).then(|| 1.0 / (PI * self.damping))
    }

    /// Whether the current oscillates at half the switching frequency, whatever the voltage loop does.
    pub fn subharmonic(&self) -> bool {
        self.damping <= 0.0
    }
}

/// Slope of the current in the sensed interval [A/s].
pub(super) fn sensed_slope(edge: Edge, point: &OperatingPoint) -> f64 {
    match edge {
        Edge::Peak => point.on_slope,
        Edge::Valley => point.off_slope,
    }
}

/// Magnitude of the slope that the ramp works against [A/s].
pub(super) fn opposing_slope(edge: Edge, point: &OperatingPoint) -> f64 {
    match edge {
        Edge::Peak => point.off_slope.abs(),
        Edge::Valley => point.on_slope.abs(),
    }
}

/// The root of 1/(z − 1) − e/(z − p) + g = 0 of greatest magnitude: e and p are the filter's memory at the comparator and of
/// a period, g the comparator's slope over M. Without a filter 1 − 1/g.
fn fast_multiplier(interval: &Interval, g: f64) -> f64 {
    let (p, e) = (interval.memory(), interval.memory_at_comparator());
    let linear = 1.0 - e - g * (1.0 + p);
    let constant = e - p + g * p;
    let discriminant = linear * linear - 4.0 * g * constant;
    if discriminant < 0.0 {
        // A pair of equal magnitude, given with the sign of its real part.
        return (constant / g).sqrt().copysign(-linear / g);
    }
    let root = discriminant.sqrt();
    let [one, other] = [(-linear + root) / (2.0 * g), (-linear - root) / (2.0 * g)];
    if one.abs() > other.abs() { one } else { other }
}
