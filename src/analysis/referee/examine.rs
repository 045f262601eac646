//! The exact curves, margins and multipliers of the condition shown, and how far the averaged model holds.

use super::as_read::{margins_as_read, phase_deg};
use super::model::Model;
use super::reach::{Pair, reach};
use super::remarks::{Case, remarks};
use super::result::{ExactCurves, Referee, SwitchedStability};
use crate::analysis::Request;
use crate::analysis::analyse::SEARCH_FROM;
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::linear::{Complex, FactoredResponse, FrequencyResponse, Margins};
use crate::switched::{ExactLoop, Instability, Quantity, Reader, RippleFacts, Stability};
use std::cell::RefCell;

/// Most frequencies of the curves: straight lines between so many are not seen under curves as broad as these.
const MOST_POINTS: usize = 150;
/// Margins are searched to this share of the switching frequency: just below half of it no reading is defined.
const SEARCH_TO: f64 = 0.495;
/// How far product and running loop may lie apart at the crossover before the product's own margins are looked for: as a ratio.
const PRODUCT_APART: f64 = 0.03;

/// A quantity that is read at one frequency after another.
struct Read<'a>(RefCell<Reader<'a>>);

impl<'a> Read<'a> {
    fn new(exact: &'a ExactLoop, quantity: Quantity) -> Result<Self, Finding> {
        exact.reader(quantity).map(|reader| Read(RefCell::new(reader)))
    }

    /// The value at a frequency [Hz]; not a number where there is none.
    fn at(&self, f_hz: f64) -> Complex {
        let none = Complex::new(f64::NAN, f64::NAN);
        self.0.try_borrow_mut().map_or(none, |mut reader| reader.at(f_hz).unwrap_or(none))
    }

    /// The same, not a number either where an analyser's reading is undefined.
    fn defined_at(&self, f_hz: f64) -> Complex {
        let defined = self.0.try_borrow().is_ok_and(|reader| reader.defined(f_hz));
        if defined { self.at(f_hz) } else { Complex::new(f64::NAN, f64::NAN) }
    }
}

/// The three quantities read.
struct Reads<'a> {
    plant: Read<'a>,
    loop_gain: Read<'a>,
    impedance: Read<'a>,
}

/// Examines the condition shown of a checked design: what an analyser would read on the switched circuit, and whether it is stable.
///
/// # Errors
/// A finding where the condition cannot be held or the switched circuit has no steady period.
pub fn referee(design: &CheckedDesign, request: &Request) -> Result<Referee, Finding> {
    let model = Model::new(design, request.shown)?;
    let output = model.averaged.averaged.operating_point.output_voltage;
    let exact = ExactLoop::new(&model.closed, &model.open(design)?, model.start(), output)?;
    let stability = Stability::new(&exact.closed)?;
    let reads = Reads {
        plant: Read::new(&exact, Quantity::Plant)?,
        loop_gain: Read::new(&exact, Quantity::LoopGain)?,
        impedance: Read::new(&exact, Quantity::OutputImpedance)?,
    };
    let fs = design.stage.switching_frequency;
    let band = (fs * SEARCH_FROM, fs * SEARCH_TO);
    let margins = margins_as_read(&model.averaged.loop_gain, |f| reads.loop_gain.at(f), band);
    let averaged = &model.averaged;
    let both = |averaged: &FactoredResponse, read: &Read<'_>, f: f64| -> Pair { [averaged.at_hz(f), read.at(f)] };
    let reach = reach(fs, |f| (both(&averaged.plant, &reads.plant, f), both(&averaged.loop_gain, &reads.loop_gain, f)));
    let product = product_margins(&model, &reads, &margins, band);
    // What ripple does is looked at where it shows.
    let ripple = product.as_ref().map(|_| RippleFacts::new(&exact.closed)).transpose()?.flatten();
    let named = named(stability.instability);
    let case = Case {
        design,
        label: &model.condition.label,
        averaged: &model.loop_gain,
        margins: &margins,
        product: product.as_ref(),
        stability: named,
        greatest: stability.multipliers.first().copied(),
        reach,
        ripple: ripple.as_ref(),
    };
    Ok(Referee {
        findings: remarks(&case),
        condition: model.condition.clone(),
        curves: curves(&model, &reads, &thinned(&request.frequencies_hz)),
        margins,
        stability: named,
        multipliers: stability.multipliers,
        reach,
    })
}

fn named(instability: Option<Instability>) -> SwitchedStability {
    match instability {
        None => SwitchedStability::Stable,
        Some(Instability::PeriodDoubling { .. }) => SwitchedStability::PeriodDoubling,
        Some(Instability::SlowScale { frequency_hz, .. }) => SwitchedStability::Oscillates { frequency_hz },
        Some(Instability::Drift { .. }) => SwitchedStability::RunsAway,
    }
}

/// Every so many of the frequencies, both ends included.
fn thinned(frequencies_hz: &[f64]) -> Vec<f64> {
    let step = frequencies_hz.len().div_ceil(MOST_POINTS).max(1);
    let mut kept: Vec<f64> = frequencies_hz.iter().copied().step_by(step).collect();
    if let Some(last) = frequencies_hz.last()
        && kept.last() != Some(last)
    {
        kept.push(*last);
    }
    kept
}

fn curves(model: &Model, reads: &Reads<'_>, frequencies_hz: &[f64]) -> ExactCurves {
    let mut curves = ExactCurves { frequencies_hz: frequencies_hz.to_vec(), ..ExactCurves::default() };
    let db = |value: Complex| 20.0 * value.norm().log10();
    let mut apart_before = [0.0; 2];
    for f in frequencies_hz {
        let (plant, of_loop) = (reads.plant.defined_at(*f), reads.loop_gain.defined_at(*f));
        let impedance = reads.impedance.defined_at(*f);
        let mut phase = |which: usize, averaged: &FactoredResponse, exact: Complex| {
            let point = averaged.log_point(*f);
            let averaged_deg = point.phase_rad.to_degrees();
            let deg = phase_deg(averaged_deg, point.value(), exact);
            // Where the two drift apart by a half turn the line jumps by a whole one: a gap says so.
            let (apart, before) = (deg - averaged_deg, apart_before[which]);
            if apart.is_finite() {
                apart_before[which] = apart;
            }
            if (apart - before).abs() > 180.0 { f64::NAN } else { deg }
        };
        curves.plant_db.push(db(plant));
        curves.plant_deg.push(phase(0, &model.averaged.plant, plant));
        curves.loop_db.push(db(of_loop));
        curves.loop_deg.push(phase(1, &model.averaged.loop_gain, of_loop));
        curves.output_impedance_ohm.push(impedance.norm());
        curves.output_impedance_deg.push(impedance.arg().to_degrees());
    }
    curves
}

/// Margins of compensator times exact plant, where that lies apart from the running loop at its crossover. With a fast path that is
/// fed from another voltage there is no such product.
fn product_margins(model: &Model, reads: &Reads<'_>, running: &Margins, band: (f64, f64)) -> Option<Margins> {
    if model.averaged.apart.is_some() {
        return None;
    }
    let compensator = &model.shared.compensator_response;
    let product = |f: f64| compensator.at_hz(f) * reads.plant.at(f);
    let crossover = running.headline_crossover()?.frequency_hz;
    let ratio = product(crossover) / reads.loop_gain.at(crossover);
    let apart = (ratio - 1.0).norm() > PRODUCT_APART;
    apart.then(|| margins_as_read(&model.averaged.loop_gain, product, band))
}
