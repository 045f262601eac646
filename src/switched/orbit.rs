//! The orbit that repeats with the period: states, switching instants and conduction mode of a steady switched system.
//!
//! *Method*: Newton steps on start state and instants (`search`), from the averaged operating point. The conduction mode is the one that
//! holds itself: continuous where the rectifier's current is not below zero as its interval ends, else with a rest.
//! *Bad input*: a limit of the controller that the orbit would have to pass (blanking, least on-time, duty ratio, clamp), a comparator
//! that would trip earlier, a search that does not settle: a finding that says so.

use super::flow::Flow;
use super::phase::{Event, Instants, Phase};
use super::search::{Guess, Search, Sweep, Wanted};
use super::system::{Comparator, Configuration, Rule, SwitchedSystem, inputs};
use crate::control::Edge;
use crate::converter::{Conduction, OperatingPoint, not_followed};
use crate::finding::Finding;
use crate::quantity::{Unit, print};
use nalgebra::DVector;

/// What the orbit is to hold.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Goal {
    /// Whatever its inputs give.
    AsDriven,
    /// A mean output voltage [V]; the control voltage is varied.
    Output(f64),
}

/// Where the search begins.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Start {
    /// Duty ratio.
    pub duty: f64,
    /// Fraction of the period in which the rectifier conducts, where that is not all the rest.
    pub second_duty: Option<f64>,
}

impl Start {
    /// From an averaged operating point.
    pub fn of(point: &OperatingPoint) -> Self {
        Start { duty: point.duty, second_duty: point.second_duty }
    }
}

/// A steady period.
#[derive(Clone, Debug)]
pub struct Orbit {
    /// The system that runs it.
    pub system: SwitchedSystem,
    /// Its inputs, the control voltage among them where that was sought.
    pub inputs: DVector<f64>,
    /// The phases of the period in order.
    pub phases: Vec<Phase>,
    /// State as each phase begins.
    pub starts: Vec<DVector<f64>>,
    /// State as each phase ends, before what its event does to it.
    pub ends: Vec<DVector<f64>>,
    /// Fraction of the period in which the controlled switch conducts.
    pub duty: f64,
    /// How the switched current behaves.
    pub conduction: Conduction,
}

/// A rectifier current below zero by this share of its greatest is the rounding of a boundary.
const AT_REST: f64 = 1e-9;
/// Where a rest is sought of which the averaged point knows nothing, as a share of the freewheeling interval.
const LATE: f64 = 0.98;
/// Points at which the comparator's margin is looked at ahead of its trip.
const LOOKS: usize = 12;

impl Orbit {
    /// Finds the orbit of a system.
    ///
    /// # Errors
    /// A finding that says what keeps the system from holding a steady period.
    pub fn find(system: &SwitchedSystem, start: Start, goal: Goal) -> Result<Self, Finding> {
        let column = system.input(inputs::CONTROL).unwrap_or_default();
        let output = if let Goal::Output(target) = goal { Some((column, target)) } else { None };
        let search = Search { system, wanted: Wanted { output } };
        let mut rests = start.second_duty.is_some() && system.rest.is_some();
        let mut tried = [false; 2];
        loop {
            if std::mem::replace(&mut tried[usize::from(rests)], true) {
                return Err(unsettled());
            }
            let Some((guess, sweep)) = search.find(first_guess(system, start, rests)) else {
                rests = !rests && system.rest.is_some() && system.interleaving.is_none();
                continue;
            };
            if rests == flows_back(system, &sweep, rests) {
                let orbit = Orbit::of(system, guess, sweep);
                orbit.within_share()?;
                orbit.within_limits()?;
                return Ok(orbit);
            }
            if system.interleaving.is_some() {
                return Err(not_followed("their currents come to rest here, and that is not followed phase by phase"));
            }
            rests = !rests;
        }
    }

    fn of(system: &SwitchedSystem, guess: Guess, sweep: Sweep) -> Self {
        let conducts = |phase: &&Phase| phase.configuration == Configuration::Conducting;
        let on: f64 = sweep.phases.iter().filter(conducts).map(|phase| phase.length_s).sum();
        let conduction = match (guess.instants.rest, &system.rest) {
            (Some(_), _) => Conduction::Discontinuous,
            (None, Some(_)) => Conduction::Continuous,
            (None, None) => Conduction::ForcedContinuous,
        };
        Orbit {
            system: system.clone(),
            inputs: guess.inputs,
            phases: sweep.phases,
            starts: sweep.starts,
            ends: sweep.ends,
            duty: (on + system.since()) / system.switching_period_s(),
            conduction,
        }
    }

    /// The comparator, and place of the phase that it ends.
    pub(super) fn comparator(&self) -> Option<(&Comparator, usize)> {
        let Rule::Compared(comparator) = &self.system.rule else { return None };
        let place = self.phases.iter().position(|phase| phase.end == Event::Compare)?;
        Some((comparator, place))
    }

    /// Value of a probe as a phase ends.
    pub(super) fn value_at_end(&self, place: usize, row: usize) -> f64 {
        match (self.phases.get(place), self.ends.get(place)) {
            (Some(phase), Some(x)) => self.system.piece(phase.configuration).value(row, x, &self.inputs),
            _ => f64::NAN,
        }
    }

    /// Refuses an orbit that the controller's limits keep it from.
    fn within_limits(&self) -> Result<(), Finding> {
        let Some((comparator, place)) = self.comparator() else { return Ok(()) };
        let period = self.system.switching_period_s();
        let trip = self.phases.get(place).map_or(0.0, |phase| phase.start_s + phase.length_s);
        let on_time = self.duty * period;
        if let Some(problem) = comparator.limit_passed(trip + comparator.since_s, on_time, period) {
            return Err(problem);
        }
        let control = self.value_at_end(place, self.system.places.control_voltage);
        if let Some(clamp) = comparator.clamp.filter(|clamp| control > *clamp * (1.0 + 1e-12)) {
            let message = format!(
                "The control voltage of {} that a steady period needs is above the clamp, {}: the loop does not hold it.",
                print(control, Unit::Volt),
                print(clamp, Unit::Volt)
            );
            return Err(Finding::problem("control.clamp", message).with_hint("raise the clamp, or lower the load"));
        }
        if self.trips_early(comparator, place, trip) {
            let message = "The comparator would trip earlier in the period than a steady one allows: what it compares meets its ramp more than once.";
            return Err(Finding::problem("", message)
                .with_hint("let less ripple through to the comparator, or make the ramp steeper"));
        }
        Ok(())
    }

    /// Whether the margin passes zero after the blanking and ahead of the trip.
    fn trips_early(&self, comparator: &Comparator, place: usize, trip: f64) -> bool {
        let rate = self.system.ramp_rate(&self.inputs);
        let sense = if comparator.edge == Edge::Peak { 1.0 } else { -1.0 };
        for (phase, start) in self.phases.iter().zip(&self.starts).take(place + 1) {
            let piece = self.system.piece(phase.configuration);
            let step = phase.length_s / LOOKS as f64;
            let Ok(flow) = Flow::new(piece, &self.inputs, step) else { return false };
            let mut x = start.clone();
            for k in 0..LOOKS {
                let at = phase.start_s + step * k as f64;
                let margin = piece.value(comparator.row, &x, &self.inputs)
                    - comparator.valley_v
                    - rate * (at + comparator.since_s);
                // At the trip itself the margin is zero; a look just ahead of it says nothing.
                if at + comparator.since_s >= comparator.blanking_s
                    && trip - at > 1e-6 * self.system.period_s
                    && sense * margin < 0.0
                {
                    return true;
                }
                x = flow.end(&x);
            }
        }
        false
    }
}

impl Comparator {
    /// The limit that a trip and its on-time [s] would pass, as a finding.
    fn limit_passed(&self, trip: f64, on_time: f64, period: f64) -> Option<Finding> {
        let seconds = |time: f64| print(time, Unit::Second);
        let near = 1e-9 * period;
        let problem = |path: &str, message: String| Some(Finding::problem(path, message));
        let skipping = |path: &str, message: String| {
            problem(path, message).map(|found| {
                found.with_hint("shorten it, lower the switching frequency, or raise the least load; the transient shows the pulses skipped")
            })
        };
        if trip < -near || (trip < self.blanking_s - near && self.edge == Edge::Peak) {
            let message = format!(
                "The on-time of {} is within blanking and delay, {}: the converter skips periods.",
                seconds(on_time),
                seconds(self.blanking_s + self.delay_s)
            );
            return skipping(if self.blanking_s > 0.0 { "control.blanking" } else { "control.delay" }, message);
        }
        if on_time < self.on_time_least_s - near {
            let message = format!(
                "The on-time of {} is below the least, {}: the converter skips periods.",
                seconds(on_time),
                seconds(self.on_time_least_s)
            );
            return skipping("control.on-time.least", message);
        }
        let duty = on_time / period;
        for (path, limit, passed) in [
            ("control.duty.least", self.duty_least, duty < self.duty_least - 1e-9),
            ("control.duty.greatest", self.duty_greatest, duty > self.duty_greatest + 1e-9),
        ] {
            if passed {
                return problem(
                    path,
                    format!("A steady period needs a duty ratio of {duty:.4}, beyond the limit of {limit:.4}."),
                );
            }
        }
        None
    }
}

/// The guess that the averaged point gives.
fn first_guess(system: &SwitchedSystem, start: Start, rests: bool) -> Guess {
    let period = system.period_s;
    let on = system.opens_at(start.duty);
    let (edge, delay) = match &system.rule {
        Rule::Compared(comparator) => (comparator.edge, comparator.delay_s),
        Rule::Given { .. } => (Edge::Peak, 0.0),
    };
    let freewheels = start.second_duty.map_or((period - on) * LATE, |second| second * period);
    let (switched, rest) = match edge {
        Edge::Peak => (on, on + freewheels),
        Edge::Valley => (period - on, freewheels),
    };
    // The switches follow the comparator; a trip ahead of the clock is found out later.
    let compare = if let Rule::Given { duty } = system.rule { system.opens_at(duty) } else { switched - delay };
    Guess {
        x: DVector::zeros(system.order()),
        instants: Instants { compare, rest: rests.then_some(rest) },
        inputs: system.steady_inputs.clone(),
    }
}

/// Whether the rectifier's current wants to flow back: below zero at the end of a continuous interval; a rest that comes within the
/// interval says so too.
fn flows_back(system: &SwitchedSystem, sweep: &Sweep, rests: bool) -> bool {
    let Some(rest) = &system.rest else { return false };
    if rests {
        return sweep.phases.iter().all(|phase| phase.length_s >= 0.0);
    }
    let current = |x: &DVector<f64>| (rest * x)[0];
    let greatest = sweep.ends.iter().map(|x| current(x).abs()).fold(0.0, f64::max);
    let freewheels = |phase: &Phase| phase.configuration == Configuration::Freewheeling;
    sweep.phases.iter().zip(&sweep.ends).any(|(phase, x)| freewheels(phase) && current(x) < -AT_REST * greatest)
}

fn unsettled() -> Finding {
    Finding::problem("", "No steady period was found: the search for the switched orbit did not settle.")
        .with_hint("the averaged results stand; the transient shows what the converter does")
}
