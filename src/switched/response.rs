//! What a gain/phase analyser reads on the switched system: the component of every probe at the injected frequency.
//!
//! *Method*: a sine e^(jωt) on one input. The change of the orbit that repeats with it, x(t + T) = e^(jωT)·x(t), follows from one real
//! map over the period; its component at ω is the mean of e^(−jωt)·y over the period, pulses at the switching instants included:
//! ∫e^(−jωt)·x = (jω − A)⁻¹·(b·τ − [e^(−jωt)·x]) over each configuration. No sideband is dropped, and no frequency is too high.
//! *Source*: multi-frequency averaging by the exact harmonic balance of a periodic linear system: Tymerski, IEEE Trans. Power Electronics 9
//! (1994), 370 (time-varying transfer functions); Yue, Wang & Lee on multi-frequency models (both from memory); sampled against
//! drive-frequency response: Brown & Middlebrook, IEEE PESC 1981, 349 (from memory).
//! *Valid* but within 1 % of multiples of half the switching frequency, where what is read depends on the injection's phase.

use super::orbit::Orbit;
use super::perturbed::{Passage, Perturbed, left_range};
use super::phase::Event;
use super::system::{Configuration, inputs};
use crate::finding::Finding;
use crate::linear::{Bench, Complex, LinearError, Resolvent};
use nalgebra::{DMatrix, DVector, RowDVector};
use std::f64::consts::TAU;

/// Share of a multiple of half the switching frequency within which a reading is not defined.
pub const UNDEFINED_WITHIN: f64 = 0.01;

/// Whether what an analyser reads at a frequency [Hz] is defined for a period [s]: not within 1 % of a multiple of half the
/// switching frequency, where the answer folds back onto the injected frequency and depends on the injection's phase.
pub fn defined(f_hz: f64, period_s: f64) -> bool {
    let halves = 2.0 * f_hz * period_s;
    let nearest = halves.round();
    nearest < 1.0 || (halves - nearest).abs() > UNDEFINED_WITHIN * nearest
}

/// A linearised orbit made ready for many frequencies.
#[derive(Clone, Debug)]
pub struct Response {
    orbit: Orbit,
    perturbed: Perturbed,
    /// A period's map.
    period: Resolvent,
    /// What one volt at the comparator leaves after a period, in the coordinates of `period`.
    left: DVector<f64>,
    /// The configurations in use, by [`Configuration::ALL`].
    pieces: [Option<Resolvent>; 3],
    spans: Vec<Span>,
}

/// A stretch of the period in one configuration.
#[derive(Clone, Debug)]
struct Span {
    configuration: usize,
    start_s: f64,
    end_s: f64,
    /// Places of its first and last passage.
    first: usize,
    last: usize,
    /// The state's change at its edges, in the coordinates of its resolvent, from the change in the coordinates of `period` and from the
    /// comparator.
    start: DMatrix<f64>,
    end: DMatrix<f64>,
}

fn place_of(configuration: Configuration) -> usize {
    match configuration {
        Configuration::Conducting => 0,
        Configuration::Freewheeling => 1,
        Configuration::Resting => 2,
    }
}

/// A change at an edge with the states at the clock in the coordinates of the period's resolvent.
fn seen(edge: &DMatrix<f64>, piece: &Resolvent, period: &Resolvent) -> DMatrix<f64> {
    let n = period.order();
    let turned = &piece.into * edge;
    let mut all = DMatrix::zeros(n, n + 1);
    all.columns_mut(0, n).copy_from(&(turned.columns(0, n) * &period.out_of));
    all.column_mut(n).copy_from(&turned.column(n));
    all
}

impl Response {
    /// Linearises an orbit.
    ///
    /// # Errors
    /// A finding where an event only grazes or the system leaves the number range.
    pub fn new(orbit: Orbit) -> Result<Self, Finding> {
        let perturbed = Perturbed::new(&orbit)?;
        let n = orbit.system.order();
        if perturbed.period.iter().any(|x| !x.is_finite()) {
            return Err(left_range(&LinearError::NotFinite));
        }
        let period = Resolvent::new(&perturbed.monodromy());
        let left = &period.into * perturbed.period.column(n);
        let mut pieces = [None, None, None];
        let mut spans: Vec<Span> = Vec::new();
        for (place, passage) in perturbed.passages.iter().enumerate() {
            let configuration = place_of(passage.configuration);
            let piece =
                pieces[configuration].get_or_insert_with(|| Resolvent::new(&orbit.system.pieces[configuration].a));
            match spans.last_mut().filter(|span| span.configuration == configuration) {
                Some(span) => {
                    span.end = seen(&passage.end, piece, &period);
                    (span.end_s, span.last) = (passage.end_s, place);
                }
                None => spans.push(Span {
                    configuration,
                    start_s: passage.start_s,
                    end_s: passage.end_s,
                    first: place,
                    last: place,
                    start: seen(&passage.start, piece, &period),
                    end: seen(&passage.end, piece, &period),
                }),
            }
        }
        Ok(Response { orbit, perturbed, period, left, pieces, spans })
    }

    /// The orbit.
    pub fn orbit(&self) -> &Orbit {
        &self.orbit
    }

    /// The map of a small change over one period.
    pub fn monodromy(&self) -> DMatrix<f64> {
        self.perturbed.monodromy()
    }

    /// Slope of the comparator's margin as it trips [V/s]; zero without a comparator.
    pub fn margin_slope(&self) -> f64 {
        self.perturbed.margin_slope
    }

    /// Made ready to read probes from one input.
    ///
    /// # Errors
    /// A finding for an input or probe that does not exist.
    pub fn reading(&self, input: &str, probes: &[usize]) -> Result<Reading<'_>, Finding> {
        let system = &self.orbit.system;
        let unknown =
            || Finding::problem("", format!("The switched system has no input \"{input}\" or no such probe."));
        let column = system.input(input).ok_or_else(unknown)?;
        if probes.iter().any(|row| *row >= system.probes.len()) {
            return Err(unknown());
        }
        let by_span = |span: &Span| {
            let piece = system.pieces[span.configuration].c.select_rows(probes);
            self.pieces[span.configuration].as_ref().map_or_else(|| piece.clone(), |p| &piece * &p.out_of)
        };
        let forced = system.pieces.iter().any(|piece| piece.b.column(column).iter().any(|x| *x != 0.0));
        let drives = if forced { self.spans.iter().map(|span| self.drive(span, column)).collect() } else { Vec::new() };
        let direct = probes.iter().map(|row| {
            let share = |span: &Span| system.pieces[span.configuration].d[(*row, column)] * (span.end_s - span.start_s);
            self.spans.iter().map(share).sum::<f64>() / system.period_s
        });
        let moved = |passage: &Passage| passage.event.as_ref().filter(|e| e.kind != Event::Compare).cloned();
        let pulses = self.perturbed.passages.iter().filter_map(|passage| {
            let event = moved(passage)?;
            let mut turned = event.moves.clone();
            let n = system.order();
            turned.columns_mut(0, n).copy_from(&(event.moves.columns(0, n) * &self.period.out_of));
            let heights: Vec<f64> = probes.iter().map(|row| event.pulse[*row]).collect();
            heights.iter().any(|h| *h != 0.0).then_some(Pulse { at_s: passage.end_s, moves: turned, heights })
        });
        Ok(Reading {
            response: self,
            rows: self.spans.iter().map(by_span).collect(),
            direct: direct.collect(),
            pulses: pulses.collect(),
            at_comparator: self.at_comparator(column),
            column,
            forced: forced.then_some(Forced { drives, probes: probes.to_vec() }),
        })
    }

    fn drive(&self, span: &Span, column: usize) -> DVector<f64> {
        let b = self.orbit.system.pieces[span.configuration].b.column(column);
        self.pieces[span.configuration].as_ref().map_or_else(|| b.into_owned(), |piece| &piece.into * b)
    }

    /// How an input moves the comparator's margin by itself [V per unit].
    fn at_comparator(&self, column: usize) -> f64 {
        let Some((comparator, place)) = self.orbit.comparator() else { return 0.0 };
        let (Some(phase), system) = (self.orbit.phases.get(place), &self.orbit.system) else { return 0.0 };
        let direct = system.piece(phase.configuration).d[(comparator.row, column)];
        let line = system.input(inputs::INPUT_VOLTAGE) == Some(column);
        let ramp =
            if line { comparator.rate_per_input * (phase.start_s + phase.length_s + comparator.since_s) } else { 0.0 };
        direct - ramp
    }
}

/// Pulses of the probes read at one moving event.
#[derive(Clone, Debug)]
struct Pulse {
    at_s: f64,
    moves: RowDVector<f64>,
    heights: Vec<f64>,
}

/// An input that drives states between the events.
#[derive(Clone, Debug)]
struct Forced {
    /// By span, in the coordinates of its resolvent.
    drives: Vec<DVector<f64>>,
    probes: Vec<usize>,
}

/// Probes read from one input, frequency by frequency.
#[derive(Clone, Debug)]
pub struct Reading<'a> {
    response: &'a Response,
    /// By span: the probes from the integrated state.
    rows: Vec<DMatrix<f64>>,
    direct: Vec<f64>,
    pulses: Vec<Pulse>,
    column: usize,
    /// What one unit of the input is at the comparator [V].
    at_comparator: f64,
    forced: Option<Forced>,
}

/// Room for readings, so that none allocates.
#[derive(Clone, Debug, Default)]
pub struct Scratch {
    bench: Bench,
    start: Vec<Complex>,
    change: Vec<Complex>,
    drive: Vec<Complex>,
    /// Particular change at the edges of all passages: begin and end, one after the other.
    edges: Vec<Vec<Complex>>,
    /// Particular movements of all passages' events.
    moved: Vec<Complex>,
}

fn turn(omega: f64, at_s: f64) -> Complex {
    Complex::cis(omega * at_s)
}

/// out = matrix · x, a real matrix on complex numbers.
fn apply(matrix: &DMatrix<f64>, x: &[Complex], out: &mut [Complex]) {
    out.fill(Complex::ZERO);
    for (column, value) in matrix.column_iter().zip(x) {
        for (sum, factor) in out.iter_mut().zip(column.iter()) {
            *sum += *value * *factor;
        }
    }
}

impl Reading<'_> {
    /// The components of the probes at a frequency [Hz] per unit of the input; false where the orbit itself rings there.
    pub fn at(&self, f_hz: f64, scratch: &mut Scratch, out: &mut [Complex]) -> bool {
        let response = self.response;
        let n = response.period.order();
        let omega = TAU * f_hz;
        let period_s = response.orbit.system.period_s;
        let Some(trip) = self.start(omega, scratch) else { return false };
        for (value, direct) in out.iter_mut().zip(&self.direct) {
            *value = Complex::new(*direct * period_s, 0.0);
        }
        let s = Complex::new(0.0, omega);
        scratch.change.resize(n, Complex::ZERO);
        // The spans follow each other from the clock's edge on.
        let mut to = Complex::ONE;
        for (k, (span, rows)) in response.spans.iter().zip(&self.rows).enumerate() {
            let Some(piece) = &response.pieces[span.configuration] else { continue };
            let from = to;
            to = turn(-omega, span.end_s);
            let start = &scratch.start;
            let states = start.iter().copied().chain([trip]);
            scratch.change.fill(Complex::ZERO);
            for ((value, begin), end) in states.zip(span.start.column_iter()).zip(span.end.column_iter()) {
                let (a, b) = (value * from, value * to);
                for ((sum, begin), end) in scratch.change.iter_mut().zip(begin.iter()).zip(end.iter()) {
                    *sum += a * *begin - b * *end;
                }
            }
            if let Some(forced) = &self.forced {
                self.add_forced(forced, k, (from, to), scratch);
            }
            if !piece.solve(s, &mut scratch.change, &mut scratch.bench) {
                return false;
            }
            for (value, row) in out.iter_mut().zip(rows.row_iter()) {
                *value += row.iter().zip(&scratch.change).map(|(c, u)| *u * *c).sum::<Complex>();
            }
        }
        self.add_pulses(omega, trip, scratch, out);
        for value in out.iter_mut() {
            *value /= period_s;
        }
        out.iter().all(|value| value.re.is_finite() && value.im.is_finite())
    }

    /// Whether the input drives states between the events, not the comparator alone.
    pub(super) fn drives_states(&self) -> bool {
        self.forced.is_some()
    }

    /// The same with room of its own; none where it is not defined.
    pub fn values(&self, f_hz: f64) -> Option<Vec<Complex>> {
        let mut out = vec![Complex::ZERO; self.direct.len()];
        self.at(f_hz, &mut Scratch::default(), &mut out).then_some(out)
    }

    /// What the comparator sees of `row` as it trips, per unit of the input, as phasor at a frequency [Hz]: the sampled answer.
    pub fn sampled(&self, f_hz: f64, row: usize, scratch: &mut Scratch) -> Option<Complex> {
        let response = self.response;
        let (_, place) = response.orbit.comparator()?;
        let passage = response.perturbed.passages.get(place)?;
        let omega = TAU * f_hz;
        let trip = self.start(omega, scratch)?;
        let piece = response.orbit.system.piece(passage.configuration);
        let column = response.orbit.system.order();
        let probe = piece.c.row(row) * &passage.end;
        let own = probe.columns(0, column) * &response.period.out_of;
        let mut sum: Complex = own.iter().zip(&scratch.start).map(|(c, x)| *x * *c).sum();
        sum += trip * probe[column];
        if self.forced.is_some() {
            sum += piece.c.row(row).iter().zip(&scratch.edges[2 * place + 1]).map(|(c, x)| *x * *c).sum::<Complex>();
        }
        Some(sum * turn(-omega, passage.end_s) + piece.d[(row, self.column)])
    }

    /// The change of the state at the clock that repeats with the sine, left in `scratch.start` in the coordinates of the period's resolvent;
    /// and what the input does at the comparator [V].
    fn start(&self, omega: f64, scratch: &mut Scratch) -> Option<Complex> {
        let response = self.response;
        let n = response.period.order();
        let z = turn(omega, response.orbit.system.period_s);
        scratch.start.resize(n, Complex::ZERO);
        let trip = match (&self.forced, response.orbit.comparator()) {
            (None, Some((_, place))) => {
                let at = response.perturbed.passages.get(place)?.end_s;
                turn(omega, at) * self.at_comparator
            }
            _ => Complex::ZERO,
        };
        match &self.forced {
            None => {
                for (value, left) in scratch.start.iter_mut().zip(response.left.iter()) {
                    *value = trip * *left;
                }
            }
            Some(forced) => self.particular(forced, omega, scratch)?,
        }
        response.period.solve(z, &mut scratch.start, &mut scratch.bench).then_some(trip)
    }

    /// The change that the sine makes from no change at the clock, at the edges of all passages; what it leaves after the period goes to
    /// `scratch.start`.
    fn particular(&self, forced: &Forced, omega: f64, scratch: &mut Scratch) -> Option<()> {
        let response = self.response;
        let system = &response.orbit.system;
        let n = system.order();
        let s = Complex::new(0.0, omega);
        let passages = &response.perturbed.passages;
        scratch.edges.resize(2 * passages.len(), Vec::new());
        scratch.moved.clear();
        scratch.moved.resize(passages.len(), Complex::ZERO);
        let mut x = vec![Complex::ZERO; n];
        let mut trip = Complex::ZERO;
        let mut steady = vec![Complex::ZERO; n];
        for (k, span) in response.spans.iter().enumerate() {
            let piece = response.pieces[span.configuration].as_ref()?;
            scratch.drive.clear();
            scratch.drive.extend(forced.drives[k].iter().map(|b| Complex::new(*b, 0.0)));
            if !piece.solve(s, &mut scratch.drive, &mut scratch.bench) {
                return None;
            }
            // h with x = h·e^(jωt) while nothing else happens.
            apply(&piece.out_of, &scratch.drive, &mut steady);
            for (place, passage) in passages.iter().enumerate().take(span.last + 1).skip(span.first) {
                let (from, to) = (turn(omega, passage.start_s), turn(omega, passage.end_s));
                scratch.edges[2 * place].clone_from(&x);
                for (value, h) in x.iter_mut().zip(&steady) {
                    *value -= *h * from;
                }
                let free = x.clone();
                apply(&passage.map, &free, &mut x);
                for (value, h) in x.iter_mut().zip(&steady) {
                    *value += *h * to;
                }
                scratch.edges[2 * place + 1].clone_from(&x);
                let Some(event) = &passage.event else { continue };
                let own: Complex = event.own.iter().zip(&x).map(|(c, x)| *x * *c).sum();
                match event.kind {
                    Event::Compare => trip = own + to * (self.at_comparator * event.from_comparator),
                    Event::Switch => scratch.moved[place] = trip,
                    _ => {
                        let projected = x.clone();
                        apply(&system.rest_projector, &projected, &mut x);
                        scratch.moved[place] = own;
                    }
                }
                let moved = scratch.moved[place];
                for (value, kick) in x.iter_mut().zip(event.kick.iter()) {
                    *value += moved * *kick;
                }
            }
        }
        if let Some(rotation) = &system.rotation {
            let turned = x.clone();
            apply(rotation, &turned, &mut x);
        }
        apply(&response.period.into, &x, &mut scratch.start);
        Some(())
    }

    /// Adds to the change over a span what the sine itself does: b·τ − [e^(−jωt)·x].
    fn add_forced(&self, forced: &Forced, k: usize, (from, to): (Complex, Complex), scratch: &mut Scratch) {
        let span = &self.response.spans[k];
        let Some(piece) = &self.response.pieces[span.configuration] else { return };
        let (begin, end) = (&scratch.edges[2 * span.first], &scratch.edges[2 * span.last + 1]);
        for (place, (begin, end)) in begin.iter().zip(end).enumerate() {
            let change = *begin * from - *end * to;
            for (sum, factor) in scratch.change.iter_mut().zip(piece.into.column(place).iter()) {
                *sum += change * *factor;
            }
        }
        for (sum, drive) in scratch.change.iter_mut().zip(forced.drives[k].iter()) {
            *sum += *drive * (span.end_s - span.start_s);
        }
    }

    fn add_pulses(&self, omega: f64, trip: Complex, scratch: &Scratch, out: &mut [Complex]) {
        let n = self.response.period.order();
        for pulse in &self.pulses {
            let mut moved: Complex = pulse.moves.iter().zip(&scratch.start).map(|(c, x)| *x * *c).sum();
            moved += trip * pulse.moves[n];
            moved *= turn(-omega, pulse.at_s);
            for (value, height) in out.iter_mut().zip(&pulse.heights) {
                *value += moved * *height;
            }
        }
        let Some(forced) = &self.forced else { return };
        for (passage, moved) in self.response.perturbed.passages.iter().zip(&scratch.moved) {
            let Some(event) = &passage.event else { continue };
            let moved = *moved * turn(-omega, passage.end_s);
            for (value, row) in out.iter_mut().zip(&forced.probes) {
                *value += moved * event.pulse[*row];
            }
        }
    }
}
