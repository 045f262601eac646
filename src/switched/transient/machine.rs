//! The running converter: what is closed, where every limiter stands, and how it comes from one event to the next.

use super::super::{Configuration, Rule};
use super::advance::{Ramp, Reached, Scratch};
use super::drive::Signal;
use super::flow::dot;
use super::mode::{Mode, Role, Side, Watched};
use super::plant::{Act, Plant};
use super::samples::Samples;
use super::settle::{other_configuration, other_side};
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

/// A sink that could take more than its level by this share of it does not fall off within an interval.
const FAR: f64 = 1.0;

/// The running converter.
#[derive(Clone, Debug)]
pub(super) struct Machine {
    pub(super) plant: Plant,
    pub(super) setup: Setup,
    signals: Vec<Signal>,
    pub(super) modes: Vec<Option<Box<Mode>>>,
    scratch: Scratch,
    /// Scaled states, forcing signals, their slopes.
    pub(super) z: Vec<f64>,
    before: Vec<f64>,
    pub(super) configuration: Configuration,
    sides: Vec<Side>,
    /// Time of the first clock [s], and periods since.
    first_s: f64,
    pub(super) periods: u64,
    /// Time since the clock [s].
    pub(super) since: f64,
    pub(super) on_s: f64,
    pub(super) rested: bool,
    pub(super) changes: usize,
    /// Periods in which each limiter acted.
    pub(super) acted: Vec<u64>,
    pub(super) acting: Vec<bool>,
    pub(super) samples: Samples,
}

/// What ended a stretch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Ended {
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
    pub(super) fn probed(&mut self) -> Result<&[f64], Stopped> {
        let place = self.ready()?;
        if let Some(mode) = self.modes[place].as_deref() {
            self.samples.probe(mode, &self.z);
        }
        Ok(&self.samples.values)
    }

    /// Place of the present mode, made where it is not there yet.
    pub(super) fn ready(&mut self) -> Result<usize, Stopped> {
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
    pub(super) fn follow(&mut self) -> Result<(), Stopped> {
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
    pub(super) fn settle(&mut self) -> Result<(), Stopped> {
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
    pub(super) fn switch(&mut self, configuration: Configuration) -> Result<(), Stopped> {
        if configuration == self.configuration {
            return Ok(());
        }
        self.record()?;
        self.enter(configuration);
        self.follow()?;
        self.settle()?;
        self.record()
    }

    pub(super) fn record(&mut self) -> Result<(), Stopped> {
        let time = self.time_s();
        self.probed()?;
        self.samples.take(time);
        Ok(())
    }

    /// Runs on to a time since the clock, or to the comparator or current limit where they are looked at.
    pub(super) fn run_to(&mut self, target: f64, looking: bool) -> Result<Ended, Stopped> {
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
            let active = self.looked_at(mode, looking);
            let ramp = ramp(&self.setup.rule, self.since);
            self.before.copy_from_slice(&self.z);
            let Reached { elapsed, ended_by } =
                mode.advance(&mut self.z, until - self.since, active, ramp, &mut self.scratch);
            if self.periods.is_multiple_of(self.samples.every) {
                self.samples.between(mode, &self.before, now, elapsed);
            }
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
            if self.time_s() >= self.samples.next_s() {
                self.record()?;
            }
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

    /// The watches to look at, as bits. A sink whose voltage is far above where it falls off is left to the ends of the interval.
    fn looked_at(&self, mode: &Mode, looking: bool) -> u32 {
        let mut active = 0;
        for (k, watch) in mode.watches.iter().enumerate() {
            let at = match watch.role {
                Role::Comparator | Role::CurrentLimit => looking,
                Role::Limiter(i) => match self.plant.limiters[i].act {
                    Act::Sink { level, .. } if self.sides[i] != Side::Free => {
                        dot(&watch.row, &self.z[..watch.row.len()]) < FAR * self.z[self.plant.n + level].abs()
                    }
                    _ => true,
                },
                Role::Rectifier | Role::Wake => true,
            };
            active |= u32::from(at) << k;
        }
        active
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
}

/// What the comparator's signal is compared with from a time since the clock on.
pub(super) fn ramp(rule: &Rule, since: f64) -> Ramp {
    match rule {
        Rule::Given { .. } => Ramp::default(),
        Rule::Compared(c) => Ramp { offset: c.valley_v + c.rate * since, rate: c.rate },
    }
}
