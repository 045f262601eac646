//! The result of a transient, as window, terminal and exports take it.

use super::super::result::{Condition, Step};
use super::event::TransientEvent;
use crate::finding::Finding;
use crate::switched::Waveforms;

/// What the scope will show of one event at one condition.
#[derive(Clone, Debug)]
pub struct Transient {
    /// The condition before the event.
    pub condition: Condition,
    /// The event.
    pub event: TransientEvent,
    /// The signals over time.
    pub waveforms: Waveforms,
    /// Figures read off them.
    pub figures: TransientFigures,
    /// The small-signal prediction of the same step, from the same t = 0; none for start-up and overload, and where the linear loop is
    /// not stable.
    pub prediction: Option<Step>,
    /// What is to be known about the result.
    pub notices: Vec<Finding>,
    /// Whether it was cancelled before its end.
    pub cancelled: bool,
}

/// Figures of a transient. Voltages are the load's; means over a period unless said otherwise.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct TransientFigures {
    /// Voltage before the event [V].
    pub before_v: f64,
    /// Voltage at the end [V]; none where nothing was run.
    pub after_v: Option<f64>,
    /// Signed extreme against the voltage before; at start-up and for a reference step the signed extreme beyond the final voltage [V].
    pub deviation_v: Option<f64>,
    /// When that extreme is reached [s].
    pub deviation_at_s: Option<f64>,
    /// Signed extreme on the other side of the final voltage after it: undershoot or overshoot of the recovery [V].
    pub rebound_v: Option<f64>,
    /// Last exit from the settling band around the final voltage, counted from the event's begin, for an overload from its end [s];
    /// none where it does not settle.
    pub settling_s: Option<f64>,
    /// Least and greatest voltage since the event began, ripple included [V].
    pub least_v: f64,
    /// Greatest voltage since the event began, ripple included [V].
    pub greatest_v: f64,
    /// Greatest magnitude of an inductor's current since the event began [A].
    pub peak_inductor_a: f64,
    /// Greatest current of the controlled switch since the event began [A].
    pub peak_switch_a: f64,
    /// Switching periods run.
    pub periods: usize,
    /// Periods in which the rectifier's current came to rest.
    pub rested: u64,
    /// Periods without a pulse.
    pub skipped: u64,
    /// Limits that acted, with the number of periods in which they did.
    pub limited: Vec<(&'static str, u64)>,
}
