//! Period after period: clock, comparator, current limit, rectifier and limiters, each at its exact instant.
//!
//! *Conventions*: the clock closes the switch (in valley current mode it opens it). The switch follows the comparator, or the current
//! limit, a delay later, not before the least on-time and within the limits of the duty ratio. A pulse is left out where the control
//! voltage asks for nothing at the clock and no least duty ratio is set. Both are blind during the blanking.

use super::super::{Comparator, Configuration, Rule};
use super::advance::{Ramp, Reached, Scratch};
use super::drive::Signal;
use super::flow::dot;
use super::mode::{Mode, Role, Side, Watched};
use super::plant::{Act, Plant};
use super::samples::Samples;
use crate::control::Edge;
use nalgebra::DVector;

/// Why a run ended before its time.
#[derive(Clone, Debug, PartialEq)]
pub enum Stopped {
    /// The numbers left their range, or a mode's equations cannot be solved.
    Unsolvable,
    /// Limits changed sides more often in one period than a circuit can.
    Chattering {
        /// When [s].
        at_s: f64,
    },
}

/// How a load takes the current that is held over short steps.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct ConstantPower {
    /// Power [W].
    pub(super) watts: f64,
    /// Below this voltage it falls off as a resistor would [V].
    pub(super) falls_below_v: f64,
    /// Conductance that the equations hold of its tangent [S], negative.
    pub(super) tangent: f64,
    /// Its column among the forcing signals.
    pub(super) column: usize,
    /// Row of the load's voltage among the recorded probes.
    pub(super) row: usize,
}

/// What the machine is told once.
#[derive(Clone, Debug)]
pub(super) struct Setup {
    pub(super) rule: Rule,
    pub(super) period_s: f64,
    /// Row of the sensed current among the probes, and the limit on it [A].
    pub(super) current_limit: Option<(usize, f64)>,
    /// Recorded row, and the level at or below which the control asks for nothing; none where it always asks.
    pub(super) nothing: Option<(usize, f64)>,
    /// Rows among the probes that are recorded.
    pub(super) recorded: Vec<usize>,
    pub(super) power: Option<ConstantPower>,
}

/// What one period came to.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Period {
    /// Mean of the load's voltage [V].
    pub(super) mean_v: f64,
    /// Share of the period in which the switch conducted.
    pub(super) duty: f64,
    /// Whether both blocked for some of it.
    pub(super) rested: bool,
    /// Whether the current limit ended the pulse.
    pub(super) current_limited: bool,
}

/// Changes of configuration and sides in one period at most.
const CHANGES: usize = 400;
/// A load of constant power is held over this share of the period at most.
const HELD: f64 = 1.0 / 32.0;

/// The running converter.
#[derive(Clone, Debug)]
pub(super) struct Machine {
    plant: Plant,
    setup: Setup,
    signals: Vec<Signal>,
    modes: Vec<Option<Box<Mode>>>,
    scratch: Scratch,
    /// Scaled states, forcing signals, their slopes.
    z: Vec<f64>,
    before: Vec<f64>,
    configuration: Configuration,
    sides: Vec<Side>,
    /// Time of the first clock [s], and periods since.
    first_s: f64,
    periods: u64,
    /// Time since the clock [s].
    since: f64,
    on_s: f64,
    rested: bool,
    changes: usize,
    /// Periods in which each limiter acted.
    pub(super) acted: Vec<u64>,
    acting: Vec<bool>,
    pub(super) samples: Samples,
}

/// What ended a stretch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Ended {
    InTime,
    ByComparator,
    ByCurrentLimit,
}

impl Machine {
    /// A converter at a clock's edge. `state` are the system's states there.
    pub(super) fn new(
        plant: Plant,
        setup: Setup,
        signals: Vec<Signal>,
        (first_s, state): (f64, &DVector<f64>),
        configuration: Configuration,
        samples: Samples,
    ) -> Self {
        let (n, m, limiters) = (plant.n, plant.m, plant.limiters.len());
        let mut z = vec![0.0; n + 2 * m];
        for (k, x) in state.iter().enumerate() {
            z[k] = x / plant.scale[k];
        }
        let modes = vec![None; 3 * 3_usize.pow(u32::try_from(limiters).unwrap_or(0))];
        let sides =
            plant.limiters.iter().map(|l| if matches!(l.act, Act::Sink { .. }) { Side::Greatest } else { Side::Free });
        Machine {
            scratch: Scratch::new(n),
            sides: sides.collect(),
            before: z.clone(),
            plant,
            setup,
            signals,
            modes,
            z,
            configuration,
            first_s,
            periods: 0,
            since: 0.0,
            on_s: 0.0,
            rested: false,
            changes: 0,
            acted: vec![0; limiters],
            acting: vec![false; limiters],
            samples,
        }
    }

    /// Time now [s].
    pub(super) fn time_s(&self) -> f64 {
        self.clock_s() + self.since
    }

    fn clock_s(&self) -> f64 {
        self.first_s + self.periods as f64 * self.setup.period_s
    }

    /// What limits acted, and in how many periods.
    pub(super) fn limited(&self, by_current: u64) -> Vec<(&'static str, u64)> {
        let limiters = self.plant.limiters.iter().zip(&self.acted).map(|(limiter, count)| (limiter.name, *count));
        limiters.chain([("current limit", by_current)]).filter(|(name, count)| !name.is_empty() && *count > 0).collect()
    }

    /// States of the system now, and its configuration.
    pub(super) fn state(&self) -> (DVector<f64>, Configuration) {
        let order = self.plant.integral();
        (DVector::from_fn(order, |k, _| self.z[k] * self.plant.scale[k]), self.configuration)
    }

    /// Values of the recorded probes now.
    fn probed(&mut self) -> Result<&[f64], Stopped> {
        let place = self.ready()?;
        if let Some(mode) = self.modes[place].as_deref() {
            self.samples.probe(mode, &self.z);
        }
        Ok(&self.samples.values)
    }

    /// Place of the present mode, made where it is not there yet.
    fn ready(&mut self) -> Result<usize, Stopped> {
        let sides = self.sides.iter().fold(0, |place, side| place * 3 + *side as usize);
        let place = sides * 3 + self.configuration as usize;
        if self.modes.get(place).is_some_and(Option::is_none) {
            let mode = self.mode().map_err(|_unsolvable| Stopped::Unsolvable)?;
            self.modes[place] = Some(Box::new(mode));
        }
        Ok(place)
    }

    fn mode(&self) -> Result<Mode, crate::linear::LinearError> {
        let mut probes = Vec::new();
        let conducting = self.configuration == Configuration::Conducting;
        if let Rule::Compared(comparator) = &self.setup.rule {
            match comparator.edge {
                Edge::Peak if conducting => {
                    probes.push((Role::Comparator, comparator.row, (0.0, f64::INFINITY)));
                }
                Edge::Valley if !conducting => {
                    probes.push((Role::Comparator, comparator.row, (f64::NEG_INFINITY, 0.0)));
                }
                _ => {}
            }
        }
        if let (true, Some((row, limit))) = (conducting, self.setup.current_limit) {
            probes.push((Role::CurrentLimit, row, (f64::NEG_INFINITY, limit)));
        }
        let watched = Watched {
            probes: &probes,
            rectifier: self.configuration == Configuration::Freewheeling,
            wake: self.configuration == Configuration::Resting,
            recorded: &self.setup.recorded,
            period: self.setup.period_s,
        };
        Mode::new(&self.plant, self.configuration as usize, &self.sides, &watched)
    }

    /// Sets the forcing signals and their slopes to those just after now.
    fn follow(&mut self) -> Result<(), Stopped> {
        let (n, m, now) = (self.plant.n, self.plant.m, self.time_s());
        for (k, signal) in self.signals.iter().enumerate() {
            let (value, slope) = signal.at(now);
            self.z[n + k] = value;
            self.z[n + m + k] = slope;
        }
        if let Some(power) = self.setup.power {
            // The current depends on the voltage, which jumps with it across a series resistance: two turns settle that.
            for _ in 0..2 {
                let volts = self.probed()?[power.row];
                let floor = power.falls_below_v;
                let amperes = if volts > floor { power.watts / volts } else { power.watts * volts / (floor * floor) };
                self.z[n + power.column] = amperes - power.tangent * volts;
            }
        }
        Ok(())
    }

    /// Brings configuration and sides in agreement with states that may have jumped.
    fn settle(&mut self) -> Result<(), Stopped> {
        for _ in 0..=2 * self.sides.len() + 4 {
            let place = self.ready()?;
            let Some(mode) = self.modes[place].as_deref() else { return Err(Stopped::Unsolvable) };
            if let Some(next) = other_configuration(&self.plant, mode, &self.z, self.configuration) {
                self.enter(next);
                continue;
            }
            let Some((i, side)) = other_side(&self.plant, mode, &self.z, &self.sides) else { return Ok(()) };
            self.turn(i, side)?;
        }
        Ok(())
    }

    fn change(&mut self) -> Result<(), Stopped> {
        self.changes += 1;
        if self.changes > CHANGES { Err(Stopped::Chattering { at_s: self.time_s() }) } else { Ok(()) }
    }

    /// Puts a limiter on a side.
    fn turn(&mut self, i: usize, side: Side) -> Result<(), Stopped> {
        self.change()?;
        let place = self.ready()?;
        let limiter = &self.plant.limiters[i];
        if let (Act::Hold, true, Some(mode)) = (limiter.act, side != Side::Free, self.modes[place].as_deref()) {
            // Exactly onto the limit.
            let held = &mode.held[i];
            let level = if side == Side::Least { limiter.least } else { limiter.greatest };
            let missing = level - dot(&held.signal, &self.z[..held.signal.len()]);
            self.z.iter_mut().zip(&held.raise).for_each(|(x, raise)| *x += raise * missing);
        }
        self.sides[i] = side;
        Ok(())
    }

    /// Changes the configuration; the rest's constraint is put on the states as it begins.
    fn enter(&mut self, configuration: Configuration) {
        if configuration == Configuration::Resting && self.configuration != Configuration::Resting {
            let n = self.plant.n;
            let x = DVector::from_column_slice(&self.z[..n]);
            self.z[..n].copy_from_slice((&self.plant.projector * x).as_slice());
            self.rested = true;
        }
        self.configuration = configuration;
    }

    /// Changes the switches, and records both sides of the edge.
    fn switch(&mut self, configuration: Configuration) -> Result<(), Stopped> {
        if configuration == self.configuration {
            return Ok(());
        }
        self.enter(configuration);
        self.follow()?;
        self.settle()?;
        self.record()
    }

    fn record(&mut self) -> Result<(), Stopped> {
        let time = self.time_s();
        self.probed()?;
        self.samples.take(time);
        Ok(())
    }

    /// Runs on to a time since the clock, or to the comparator or current limit where they are looked at.
    fn run_to(&mut self, target: f64, looking: bool) -> Result<Ended, Stopped> {
        while self.since < target {
            let clock = self.clock_s();
            let now = clock + self.since;
            let line = self.signals.iter().map(|s| s.next(now)).fold(self.samples.next_s(), f64::min) - clock;
            let mut until = target.min(line);
            if self.setup.power.is_some() {
                until = until.min(self.since + HELD * self.setup.period_s);
            }
            // A line that begins within rounding of now has begun.
            if until <= self.since {
                until = self.since + f64::EPSILON * self.setup.period_s;
            }
            let place = self.ready()?;
            let Some(mode) = self.modes[place].as_deref() else { return Err(Stopped::Unsolvable) };
            let mut active = 0_u32;
            for (k, watch) in mode.watches.iter().enumerate() {
                if looking || !matches!(watch.role, Role::Comparator | Role::CurrentLimit) {
                    active |= 1 << k;
                }
            }
            let ramp = ramp(&self.setup.rule, self.since);
            self.before.copy_from_slice(&self.z);
            let Reached { elapsed, ended_by } =
                mode.advance(&mut self.z, until - self.since, active, ramp, &mut self.scratch);
            self.samples.between(mode, &self.before, now, elapsed);
            let role = ended_by.and_then(|k| mode.watches.get(k)).map(|watch| watch.role);
            if self.configuration == Configuration::Conducting {
                self.on_s += elapsed;
            }
            self.since = if role.is_some() { self.since + elapsed } else { until };
            if !self.z.iter().all(|x| x.is_finite()) {
                return Err(Stopped::Unsolvable);
            }
            for (acting, side) in self.acting.iter_mut().zip(&self.sides) {
                *acting |= *side != Side::Free;
            }
            self.record()?;
            match role {
                Some(Role::Comparator) => return Ok(Ended::ByComparator),
                Some(Role::CurrentLimit) => return Ok(Ended::ByCurrentLimit),
                Some(Role::Rectifier) => {
                    self.change()?;
                    self.switch(Configuration::Resting)?;
                }
                Some(Role::Wake) => {
                    self.change()?;
                    self.switch(Configuration::Freewheeling)?;
                }
                Some(Role::Limiter(i)) => {
                    let side = self.next_side(i);
                    self.turn(i, side)?;
                    self.settle()?;
                }
                None => {
                    self.follow()?;
                    if until < target {
                        self.settle()?;
                    }
                }
            }
        }
        Ok(Ended::InTime)
    }

    /// The side a limiter changes to as its watch tells.
    fn next_side(&self, i: usize) -> Side {
        let limiter = &self.plant.limiters[i];
        match (limiter.act, self.sides[i]) {
            (Act::Sink { .. }, Side::Free) => Side::Greatest,
            (_, Side::Least | Side::Greatest) => Side::Free,
            (_, Side::Free) => {
                let sides = self.sides.iter().fold(0, |place, side| place * 3 + *side as usize);
                let mode = self.modes.get(sides * 3 + self.configuration as usize).and_then(|m| m.as_deref());
                let signal = mode.map_or(0.0, |mode| {
                    let row = &mode.held[i].signal;
                    dot(row, &self.z[..row.len()])
                });
                let to_least = (signal - limiter.least).abs();
                if to_least < (signal - limiter.greatest).abs() { Side::Least } else { Side::Greatest }
            }
        }
    }

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
        let mean_v = self.z[integral] * self.plant.scale[integral] / period;
        for (acted, acting) in self.acted.iter_mut().zip(&self.acting) {
            *acted += u64::from(*acting);
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

/// What the comparator's signal is compared with from a time since the clock on.
fn ramp(rule: &Rule, since: f64) -> Ramp {
    match rule {
        Rule::Given { .. } => Ramp::default(),
        Rule::Compared(c) => Ramp { offset: c.valley_v + c.rate * since, rate: c.rate },
    }
}

/// The configuration the states ask for, where it is another: the rectifier opens without current, and closes where it would get one.
fn other_configuration(plant: &Plant, mode: &Mode, z: &[f64], now: Configuration) -> Option<Configuration> {
    let rest = plant.rest.as_ref()?;
    let rate = dot(&mode.wake, &z[..mode.wake.len()]);
    match now {
        Configuration::Freewheeling => {
            let current = dot(rest, &z[..rest.len()]);
            (current < 0.0 || current <= 0.0 && rate <= 0.0).then_some(Configuration::Resting)
        }
        Configuration::Resting => (rate > 0.0).then_some(Configuration::Freewheeling),
        Configuration::Conducting => None,
    }
}

/// Of a limit's span, what counts as being there.
const AT_LIMIT: f64 = 1e-12;

/// A limiter that has to change its side, and to which.
fn other_side(plant: &Plant, mode: &Mode, z: &[f64], sides: &[Side]) -> Option<(usize, Side)> {
    for (i, (limiter, side)) in plant.limiters.iter().zip(sides).enumerate() {
        let held = &mode.held[i];
        let signal = dot(&held.signal, &z[..held.signal.len()]);
        let (least, greatest) = (limiter.least, limiter.greatest);
        let next = match limiter.act {
            Act::Sink { .. } => {
                if signal > 0.0 {
                    Side::Greatest
                } else {
                    Side::Free
                }
            }
            Act::Saturate => {
                if signal > greatest {
                    Side::Greatest
                } else if signal < least {
                    Side::Least
                } else {
                    Side::Free
                }
            }
            Act::Hold => {
                let rate = dot(&held.rate, &z[..held.rate.len()]);
                let close = AT_LIMIT * (greatest.abs().min(1e3) + least.abs().min(1e3));
                match side {
                    Side::Free if signal > greatest + close || signal >= greatest - close && rate > 0.0 => {
                        Side::Greatest
                    }
                    Side::Free if signal < least - close || signal <= least + close && rate < 0.0 => Side::Least,
                    Side::Greatest if rate < 0.0 => Side::Free,
                    Side::Least if rate > 0.0 => Side::Free,
                    _ => *side,
                }
            }
        };
        if next != *side {
            return Some((i, next));
        }
    }
    None
}
