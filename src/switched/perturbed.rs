//! A small change of the orbit on its way through one period: exact, switching instants included.
//!
//! *Conventions*: a change of the state as the clock starts the period is carried to the edges of every phase by real matrices. Where an
//! event moves by τ the state behind it changes by (rates before − rates after)·τ, and every probe that jumps there has a pulse of
//! (value before − value after)·τ. τ answers the change of the state at the event; the comparator's carries over to the switches
//! that follow it. A change at the comparator alone (`at_comparator`, one volt there) is carried along as one more column.
//! *Source*: saltation matrices: Aizerman & Gantmakher, Quarterly J. Mech. Appl. Math. 11 (1958), 333; di Bernardo & Vasca,
//! IEEE Trans. Circuits Syst. I 47 (2000), 130 (both from memory).

use super::flow::Flow;
use super::orbit::Orbit;
use super::phase::{Event, after};
use super::system::{Configuration, Rule};
use crate::finding::Finding;
use crate::linear::LinearError;
use nalgebra::{DMatrix, DVector, RowDVector};

/// A change at the edges of one phase.
#[derive(Clone, Debug)]
pub(super) struct Passage {
    pub(super) configuration: Configuration,
    pub(super) start_s: f64,
    pub(super) end_s: f64,
    /// State at the phase's begin and end, ahead of its event, from the change at the clock and at the comparator.
    pub(super) start: DMatrix<f64>,
    pub(super) end: DMatrix<f64>,
    /// The phase's own map of the state.
    pub(super) map: DMatrix<f64>,
    pub(super) event: Option<Instant>,
}

/// An event that moves.
#[derive(Clone, Debug)]
pub(super) struct Instant {
    pub(super) kind: Event,
    /// How far it moves from the state at the end of its phase (compare and rest; later events follow the comparator) [s].
    pub(super) own: RowDVector<f64>,
    /// The same from the change at the clock and at the comparator [s].
    pub(super) moves: RowDVector<f64>,
    /// Movement from one volt at the comparator [s/V].
    pub(super) from_comparator: f64,
    /// What a movement adds to the state behind it [1/s of each].
    pub(super) kick: DVector<f64>,
    /// Pulses of all probes per second of movement.
    pub(super) pulse: DVector<f64>,
}

/// A linearised period.
#[derive(Clone, Debug)]
pub(super) struct Perturbed {
    pub(super) passages: Vec<Passage>,
    /// A period's change of the state, and in the last column what one volt at the comparator leaves.
    pub(super) period: DMatrix<f64>,
    /// How the comparator's margin falls as it trips [V/s]; zero without a comparator.
    pub(super) margin_slope: f64,
}

/// Slopes below this share of the larger of what they are the difference of make a switching instant undefined.
const GRAZING: f64 = 1e-12;

impl Perturbed {
    /// Linearises a period about its orbit.
    ///
    /// # Errors
    /// A finding where an event only grazes, or an exponential leaves the number range.
    pub(super) fn new(orbit: &Orbit) -> Result<Self, Finding> {
        let n = orbit.system.order();
        let mut carried = DMatrix::identity(n, n + 1);
        carried.column_mut(n).fill(0.0);
        let mut passages: Vec<Passage> = Vec::with_capacity(orbit.phases.len());
        let mut trip: Option<(RowDVector<f64>, f64)> = None;
        let mut margin_slope = 0.0;
        for (place, phase) in orbit.phases.iter().enumerate() {
            let piece = orbit.system.piece(phase.configuration);
            let flow = Flow::new(piece, &orbit.inputs, phase.length_s).map_err(|error| left_range(&error))?;
            let start = carried.clone();
            if phase.length_s != 0.0 {
                carried = &flow.map * &carried;
            }
            let end = carried.clone();
            let event = match phase.end {
                Event::Compare => {
                    let (own, slope) = compare(orbit, place)?;
                    margin_slope = slope;
                    let mut moves = &own * &carried;
                    moves[n] -= slope.recip();
                    trip = Some((moves.clone(), -slope.recip()));
                    Some(Instant {
                        kind: phase.end,
                        own,
                        moves,
                        from_comparator: -slope.recip(),
                        kick: DVector::zeros(n),
                        pulse: DVector::zeros(orbit.system.probes.len()),
                    })
                }
                Event::Switch => trip.clone().map(|(moves, from_comparator)| {
                    let (kick, pulse) = crossing(orbit, place);
                    Instant { kind: phase.end, own: RowDVector::zeros(n), moves, from_comparator, kick, pulse }
                }),
                Event::Rest => {
                    let own = rest(orbit, place)?;
                    let moves = &own * &carried;
                    let (kick, pulse) = crossing(orbit, place);
                    Some(Instant { kind: phase.end, own, moves, from_comparator: 0.0, kick, pulse })
                }
                Event::Given | Event::Clock => None,
            };
            if let Some(event) = &event {
                if phase.end == Event::Rest {
                    carried = &orbit.system.rest_projector * carried;
                }
                carried += &event.kick * &event.moves;
            }
            let end_s = phase.start_s + phase.length_s;
            let (configuration, start_s, map) = (phase.configuration, phase.start_s, flow.map);
            passages.push(Passage { configuration, start_s, end_s, start, end, map, event });
        }
        if let Some(rotation) = &orbit.system.rotation {
            carried = rotation * carried;
        }
        Ok(Perturbed { passages, period: carried, margin_slope })
    }

    /// The map of a change over one period.
    pub(super) fn monodromy(&self) -> DMatrix<f64> {
        let n = self.period.nrows();
        self.period.view((0, 0), (n, n)).into()
    }
}

/// The comparator's movement from the state at its trip, and the slope of its margin there.
fn compare(orbit: &Orbit, place: usize) -> Result<(RowDVector<f64>, f64), Finding> {
    let (Rule::Compared(comparator), Some(phase), Some(x)) =
        (&orbit.system.rule, orbit.phases.get(place), orbit.ends.get(place))
    else {
        return Err(grazes());
    };
    let piece = orbit.system.piece(phase.configuration);
    let rate = orbit.system.ramp_rate(&orbit.inputs);
    let row = piece.c.row(comparator.row);
    let rising: f64 = row.iter().zip(piece.rates(x, &orbit.inputs).iter()).map(|(c, x)| c * x).sum();
    let slope = rising - rate;
    if slope.abs() <= GRAZING * rising.abs().max(rate.abs()) || !slope.is_finite() {
        return Err(grazes());
    }
    Ok((row / -slope, slope))
}

/// The rest's movement from the state as it comes.
fn rest(orbit: &Orbit, place: usize) -> Result<RowDVector<f64>, Finding> {
    let (Some(row), Some(phase), Some(x)) = (&orbit.system.rest, orbit.phases.get(place), orbit.ends.get(place)) else {
        return Err(grazes());
    };
    let slope = (row * orbit.system.piece(phase.configuration).rates(x, &orbit.inputs))[0];
    if slope == 0.0 || !slope.is_finite() {
        return Err(grazes());
    }
    Ok(row / -slope)
}

/// What an event's movement adds to the state behind it, and the pulses of the probes.
fn crossing(orbit: &Orbit, place: usize) -> (DVector<f64>, DVector<f64>) {
    let system = &orbit.system;
    let (Some(phase), Some(x)) = (orbit.phases.get(place), orbit.ends.get(place)) else {
        return (DVector::zeros(system.order()), DVector::zeros(system.probes.len()));
    };
    let before = system.piece(phase.configuration);
    let behind = system.piece(after(&system.rule, phase.configuration, phase.end));
    let u = &orbit.inputs;
    let mut rates = before.rates(x, u);
    let mut reached = x.clone();
    if phase.end == Event::Rest {
        rates = &system.rest_projector * rates;
        reached = &system.rest_projector * reached;
    }
    let pulse = (&before.c * x + &before.d * u) - (&behind.c * &reached + &behind.d * u);
    (rates - behind.rates(&reached, u), pulse)
}

fn grazes() -> Finding {
    Finding::problem(
        "",
        "The comparator only grazes its ramp: the switching instant is not defined for a small change.",
    )
}

pub(super) fn left_range(error: &LinearError) -> Finding {
    Finding::problem("", format!("The switched system cannot be solved: {error}."))
}
