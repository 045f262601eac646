//! Peak current mode in discontinuous conduction: the current starts every period from rest.
//!
//! *Conventions*: the sensed current at the comparator is a function of duty ratio d, on slope m1 and average switched
//! current s, with d2 = 2·s/(d·T·m1) − d from the triangle's area; the sense filter is in its periodic steady state, so it
//! still holds what the last triangle left in it. Derivatives are exact, by carrying them along.
//! *Source*: own derivation from the triangle; without a filter m1·(d·T − delay).

use super::sense::CurrentSense;
use crate::converter::OperatingPoint;
use std::ops::{Add, Div, Mul, Sub};

/// A value with its derivatives over d, m1 and s.
#[derive(Clone, Copy, Debug)]
struct Carried {
    value: f64,
    over: [f64; 3],
}

impl Carried {
    fn constant(value: f64) -> Self {
        Carried { value, over: [0.0; 3] }
    }

    fn variable(value: f64, place: usize) -> Self {
        let mut over = [0.0; 3];
        over[place] = 1.0;
        Carried { value, over }
    }

    fn exp(self) -> Self {
        let value = self.value.exp();
        Carried { value, over: self.over.map(|x| x * value) }
    }

    fn with(self, other: Self, value: f64, own: f64, others: f64) -> Self {
        Carried { value, over: std::array::from_fn(|k| own * self.over[k] + others * other.over[k]) }
    }
}

impl Add for Carried {
    type Output = Self;
    fn add(self, other: Self) -> Self {
        self.with(other, self.value + other.value, 1.0, 1.0)
    }
}

impl Sub for Carried {
    type Output = Self;
    fn sub(self, other: Self) -> Self {
        self.with(other, self.value - other.value, 1.0, -1.0)
    }
}

impl Mul for Carried {
    type Output = Self;
    fn mul(self, other: Self) -> Self {
        self.with(other, self.value * other.value, other.value, self.value)
    }
}

impl Div for Carried {
    type Output = Self;
    fn div(self, other: Self) -> Self {
        let ratio = self.value / other.value;
        self.with(other, ratio, 1.0 / other.value, -ratio / other.value)
    }
}

/// The sensed current of a triangle that starts from rest.
#[derive(Clone, Copy, Debug)]
pub(super) struct Rested {
    sensed: Carried,
}

impl Rested {
    pub(super) fn new(sense: &CurrentSense, point: &OperatingPoint, period: f64, delay: f64) -> Self {
        let duty = Carried::variable(point.duty, 0);
        let slope = Carried::variable(point.on_slope, 1);
        let average = Carried::variable(point.switched_current.average, 2);
        let (period, delay) = (Carried::constant(period), Carried::constant(delay));
        let time = duty * period;
        if sense.filter_s <= 0.0 {
            return Rested { sensed: slope * (time - delay) };
        }
        let (filter, one) = (Carried::constant(sense.filter_s), Carried::constant(1.0));
        let decay = |t: Carried| (Carried::constant(0.0) - t / filter).exp();
        let second = Carried::constant(2.0) * average / (time * slope) * period - time;
        let down = slope * time / second;
        let idle = decay(period - time - second);
        let (up_decay, down_decay) = (decay(time), decay(second));
        // What the filter still holds as the switch closes.
        let held =
            idle * filter * (down * (one - down_decay) - slope * (one - up_decay) * down_decay) / (one - decay(period));
        let seen = time - delay;
        Rested { sensed: slope * (seen - filter) + (held + slope * filter) * decay(seen) }
    }

    /// Sensed current at the comparator [A].
    pub(super) fn sensed(&self) -> f64 {
        self.sensed.value
    }

    /// Its derivatives over duty ratio [A], on slope [s] and average switched current.
    pub(super) fn derivatives(&self) -> [f64; 3] {
        self.sensed.over
    }
}
