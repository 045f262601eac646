//! One period: clock, comparator, current limit, each at its exact instant.
//!
//! *Conventions*: the clock closes the switch (in valley current mode it opens it). The switch follows the comparator, or the current
//! limit, a delay later, not before the least on-time and within the limits of the duty ratio. A pulse is left out where the control
//! voltage asks for nothing at the clock and no least duty ratio is set. Both are blind during the blanking.

use super::super::{Comparator, Configuration, Rule};
use super::flow::dot;
use super::machine::{Ended, Machine, Period, Stopped, ramp};
use super::mode::Role;
use crate::control::Edge;
use nalgebra::DVector;

impl Machine {
    /// One period from clock to clock.
    pub(super) fn period(&mut self) -> Result<Period, Stopped> {
        self.changes = 0;
        self.on_s = 0.0;
        self.rested = self.configuration == Configuration::Resting;
        self.acting.iter_mut().for_each(|acting| *acting = false);
        let integral = self.plant.integral();
        self.z[integral] = 0.0;
        if let Some(ramp) = self.plant.ramp {
            self.z[ramp] = 0.0;
        }
        self.follow()?;
        self.settle()?;
        let rule = self.setup.rule.clone();
        let period = self.setup.period_s;
        let mut limited = false;
        match &rule {
            Rule::Given { duty } => {
                self.switch(Configuration::Conducting)?;
                self.run_to(duty * period, false)?;
                self.switch(Configuration::Freewheeling)?;
            }
            Rule::Compared(comparator) => match comparator.edge {
                Edge::Peak => limited = self.pulse(comparator)?,
                Edge::Valley => limited = self.gap(comparator)?,
            },
        }
        self.run_to(period, false)?;
        self.record()?;
        let mean_v = self.z[integral] * self.plant.scale[integral] / period;
        for (acted, acting) in self.acted.iter_mut().zip(&self.acting) {
            *acted += u64::from(*acting);
        }
        if let Some(rotation) = &self.plant.rotation {
            let n = self.plant.n;
            let x = DVector::from_column_slice(&self.z[..n]);
            self.z[..n].copy_from_slice((rotation * x).as_slice());
        }
        self.periods += 1;
        self.since = 0.0;
        Ok(Period { mean_v, duty: self.on_s / period, rested: self.rested, current_limited: limited })
    }

    /// The clock closes the switch; comparator or current limit opens it. Tells whether it was the limit.
    fn pulse(&mut self, comparator: &Comparator) -> Result<bool, Stopped> {
        let period = self.setup.period_s;
        let least = comparator.on_time_least_s.max(comparator.duty_least * period);
        let greatest = comparator.duty_greatest * period;
        if let Some((row, level)) = self.setup.nothing
            && comparator.duty_least <= 0.0
            && self.probed()?[row] <= level
        {
            // The switch opens also where it had no time to before.
            self.open()?;
            return Ok(false);
        }
        self.switch(Configuration::Conducting)?;
        let last = (greatest - comparator.delay_s).max(0.0);
        let (ended, limited) = self.look(comparator.blanking_s.min(last), last)?;
        let trip = self.since;
        let until = if ended { (trip + comparator.delay_s).max(least).min(greatest) } else { greatest };
        self.run_to(until, false)?;
        if until < period {
            self.open()?;
        }
        Ok(limited)
    }

    /// The clock opens the switch; the comparator closes it, and the current limit may open it again.
    fn gap(&mut self, comparator: &Comparator) -> Result<bool, Stopped> {
        let period = self.setup.period_s;
        let least = (1.0 - comparator.duty_greatest) * period;
        let greatest = ((1.0 - comparator.duty_least) * period).min(period - comparator.on_time_least_s);
        self.open()?;
        let last = (greatest - comparator.delay_s).max(0.0);
        let (ended, _) = self.look(comparator.blanking_s.min(last), last)?;
        let until = if ended { (self.since + comparator.delay_s).max(least).min(greatest) } else { greatest };
        self.run_to(until, false)?;
        if until >= period {
            return Ok(false);
        }
        self.switch(Configuration::Conducting)?;
        if self.setup.current_limit.is_none() || self.run_to(period, true)? == Ended::InTime {
            return Ok(false);
        }
        let opens = self.since + comparator.delay_s;
        self.run_to(opens.min(period), false)?;
        if opens < period {
            self.open()?;
        }
        Ok(true)
    }

    /// Looks at comparator and current limit from the end of the blanking until `last`. Tells whether one tripped, and whether it
    /// was the limit.
    fn look(&mut self, blind: f64, last: f64) -> Result<(bool, bool), Stopped> {
        self.run_to(blind, false)?;
        let place = self.ready()?;
        if let Some(mode) = self.modes[place].as_deref() {
            let ramp = ramp(&self.setup.rule, self.since);
            for watch in &mode.watches {
                let value = dot(&watch.row, &self.z[..watch.row.len()]);
                let tripped = match watch.role {
                    Role::Comparator => watch.out(value - ramp.offset),
                    Role::CurrentLimit => watch.out(value),
                    _ => false,
                };
                if tripped {
                    return Ok((true, watch.role == Role::CurrentLimit));
                }
            }
        }
        let ended = self.run_to(last, true)?;
        Ok((ended != Ended::InTime, ended == Ended::ByCurrentLimit))
    }

    /// Opens the switch; the rectifier conducts where it has a current to carry.
    fn open(&mut self) -> Result<(), Stopped> {
        if self.configuration == Configuration::Conducting { self.switch(Configuration::Freewheeling) } else { Ok(()) }
    }
}
