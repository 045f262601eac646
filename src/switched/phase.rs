//! The phases of a period: which configuration holds how long, and what ends it.
//!
//! *Conventions*: instants count from the clock's edge [s]. The events of a period sorted by their instants give the phases; the clock's
//! own edge is the last. A phase may have no length.

use super::system::{Configuration, Rule};
use crate::control::Edge;

/// What ends a phase.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Event {
    /// The comparator trips; the switches follow later.
    Compare,
    /// The controlled switch opens or closes because the comparator tripped.
    Switch,
    /// The controlled switch opens at a given instant.
    Given,
    /// The rectifier's current has come to rest.
    Rest,
    /// The clock's next edge.
    Clock,
}

impl Event {
    /// How its instant follows the two that can move: the comparator's and the rest's.
    pub(super) fn moves(self) -> [f64; 2] {
        match self {
            Event::Compare | Event::Switch => [1.0, 0.0],
            Event::Rest => [0.0, 1.0],
            Event::Given | Event::Clock => [0.0, 0.0],
        }
    }
}

/// One phase of a period.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Phase {
    /// Which switches conduct.
    pub configuration: Configuration,
    /// When it begins [s].
    pub start_s: f64,
    /// How long it lasts [s].
    pub length_s: f64,
    /// What ends it.
    pub end: Event,
}

/// The instants that can move.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Instants {
    /// When the comparator trips [s]; without a comparator, when the switch opens.
    pub(super) compare: f64,
    /// When the rectifier's current comes to rest [s].
    pub(super) rest: Option<f64>,
}

/// The phases that a rule and its instants give.
pub(super) fn phases(rule: &Rule, instants: Instants, period: f64) -> Vec<Phase> {
    let mut events = match rule {
        Rule::Given { .. } => vec![(Event::Given, instants.compare)],
        Rule::Compared(c) => {
            vec![(Event::Compare, instants.compare), (Event::Switch, instants.compare + c.delay_s)]
        }
    };
    if let Some(rest) = instants.rest {
        // Stable order: at one instant the switches act before the current rests.
        let place = events.iter().position(|(_, at)| *at > rest).unwrap_or(events.len());
        events.insert(place, (Event::Rest, rest));
    }
    events.push((Event::Clock, period));
    let mut configuration = started(rule);
    let mut start_s = 0.0;
    let mut phases = Vec::with_capacity(events.len());
    for (end, at) in events {
        phases.push(Phase { configuration, start_s, length_s: at - start_s, end });
        start_s = at;
        configuration = after(rule, configuration, end);
    }
    phases
}

/// The configuration that the clock starts.
pub(super) fn started(rule: &Rule) -> Configuration {
    match rule {
        Rule::Compared(comparator) if comparator.edge == Edge::Valley => Configuration::Freewheeling,
        _ => Configuration::Conducting,
    }
}

/// The configuration behind an event.
pub(super) fn after(rule: &Rule, before: Configuration, event: Event) -> Configuration {
    match event {
        Event::Compare => before,
        Event::Switch | Event::Given if started(rule) == Configuration::Conducting => Configuration::Freewheeling,
        Event::Switch | Event::Given => Configuration::Conducting,
        Event::Rest => Configuration::Resting,
        Event::Clock => started(rule),
    }
}
