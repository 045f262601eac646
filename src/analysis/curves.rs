//! Frequency curves of the condition shown in full.
//!
//! *Conventions*: closed-loop quantities are the open-loop ones over 1 + T with the exact delay; the output impedance
//! counts current drawn by the load as positive, so a resistive output reads positive. All three are taken at the load's terminals.

use super::fast_path::Fed;
use super::loop_model::{LoopModel, Shared};
use super::result::Curves;
use crate::control::CONTROL;
use crate::converter::signals::{INPUT_VOLTAGE, LOAD_CURRENT, LOAD_VOLTAGE, OUTPUT_VOLTAGE};
use crate::linear::{Complex, FactoredResponse, FrequencyResponse, LinearError};

/// Decibels of a magnitude.
fn db(magnitude: f64) -> f64 {
    20.0 * magnitude.log10()
}

/// All curves of a loop over the given frequencies [Hz]. `reference_scale` is the output voltage over the reference.
///
/// # Errors
/// As the reduction to zeros and poles.
pub(super) fn curves(
    model: &LoopModel,
    shared: &Shared,
    reference: &FactoredResponse,
    frequencies_hz: &[f64],
    reference_scale: f64,
) -> Result<Curves, LinearError> {
    let n = frequencies_hz.len();
    let both = |response: &FactoredResponse| {
        let (mut gain, mut phase) = (vec![0.0; n], vec![0.0; n]);
        response.curve(frequencies_hz, &mut gain, &mut phase);
        (gain, phase)
    };
    let (plant_db, plant_deg) = both(&model.plant);
    let (compensator_db, compensator_deg) = both(&shared.compensator_response);
    let (loop_db, loop_deg) = both(&model.loop_gain);
    let (mut impedance_db, mut impedance_deg) =
        both(&FactoredResponse::new(model.open_loop(LOAD_VOLTAGE, LOAD_CURRENT)?.scaled(-1.0), 0.0));
    if let Some([with, without]) = model.bank_inductance()? {
        for ((gain, phase), f) in impedance_db.iter_mut().zip(&mut impedance_deg).zip(frequencies_hz) {
            let impedance = polar(*gain, *phase) - with.at_hz(*f) + without.at_hz(*f);
            (*gain, *phase) = (db(impedance.norm()), impedance.arg().to_degrees());
        }
    }
    let (line_db, line_deg) = both(&FactoredResponse::new(model.open_loop(LOAD_VOLTAGE, INPUT_VOLTAGE)?, 0.0));
    let (reference_db, reference_deg) = both(reference);
    let mut c = Curves {
        frequencies_hz: frequencies_hz.to_vec(),
        open_loop_output_impedance_ohm: impedance_db.iter().map(|g| from_db(*g)).collect(),
        open_loop_line_to_output_db: line_db.clone(),
        ..Curves::default()
    };
    let reference_offset_db = db(reference_scale);
    let beyond = if model.load_beyond || model.apart.is_some() { Some(Beyond::new(model)?) } else { None };
    for k in 0..n {
        if let Some(beyond) = &beyond {
            let loop_gain = polar(loop_db[k], loop_deg[k]);
            let at = beyond.at(frequencies_hz[k], loop_gain);
            let follows = polar(plant_db[k] + reference_db[k] - reference_offset_db, plant_deg[k] + reference_deg[k]);
            let following = follows * at.load_over_sensed / (loop_gain + 1.0);
            c.output_impedance_ohm.push(at.impedance.norm());
            c.output_impedance_deg.push(at.impedance.arg().to_degrees());
            c.line_to_output_db.push(db(at.line.norm()));
            c.line_to_output_deg.push(at.line.arg().to_degrees());
            c.reference_to_output_db.push(db(following.norm()));
            c.reference_to_output_deg.push(following.arg().to_degrees());
            continue;
        }
        let feedback = Complex::ONE + polar(loop_db[k], loop_deg[k]);
        let (size, turn) = (0.5 * db(feedback.norm_sqr()), feedback.arg().to_degrees());
        c.output_impedance_ohm.push(from_db(impedance_db[k] - size));
        c.output_impedance_deg.push(wrapped(impedance_deg[k] - turn));
        c.line_to_output_db.push(line_db[k] - size);
        c.line_to_output_deg.push(wrapped(line_deg[k] - turn));
        c.reference_to_output_db.push(plant_db[k] + reference_db[k] - size - reference_offset_db);
        c.reference_to_output_deg.push(wrapped(plant_deg[k] + reference_deg[k] - turn));
    }
    Ok(Curves { plant_db, plant_deg, compensator_db, compensator_deg, loop_db, loop_deg, ..c })
}

/// Responses of a load whose voltage is not all that the feedback reads: it stands behind a second stage, or a fast path reads another
/// voltage beside.
///
/// With w a disturbance, u the control voltage, y the load's voltage and s what the feedback reads:
/// y/w closed = y/w open − y/u·T/(1 + T)·(s/w)/(s/u).
struct Beyond {
    load: [FactoredResponse; 3],
    fed: [Fed; 3],
    sensed_from_control: FactoredResponse,
}

/// What they come to at one frequency.
struct BeyondAt {
    impedance: Complex,
    line: Complex,
    load_over_sensed: Complex,
}

impl Beyond {
    fn new(model: &LoopModel) -> Result<Self, LinearError> {
        let load = |input: &str| model.open_loop(LOAD_VOLTAGE, input).map(|zpk| FactoredResponse::new(zpk, 0.0));
        let fed = |input: &str| Fed::new(model, input);
        Ok(Beyond {
            load: [load(CONTROL)?, load(INPUT_VOLTAGE)?, load(LOAD_CURRENT)?],
            fed: [fed(CONTROL)?, fed(INPUT_VOLTAGE)?, fed(LOAD_CURRENT)?],
            sensed_from_control: FactoredResponse::new(model.open_loop(OUTPUT_VOLTAGE, CONTROL)?, 0.0),
        })
    }

    fn at(&self, f: f64, loop_gain: Complex) -> BeyondAt {
        let load = self.load[0].at_hz(f);
        let held = load / self.fed[0].at_hz(f) * loop_gain / (loop_gain + 1.0);
        let closed = |input: usize| self.load[input].at_hz(f) - held * self.fed[input].at_hz(f);
        let load_over_sensed = load / self.sensed_from_control.at_hz(f);
        BeyondAt { impedance: -closed(2), line: closed(1), load_over_sensed }
    }
}

/// Nepers per decibel.
const NEPER_PER_DB: f64 = std::f64::consts::LN_10 / 20.0;

fn from_db(gain_db: f64) -> f64 {
    // The exponential is several times faster than a power, and this runs for every point of every curve.
    (gain_db * NEPER_PER_DB).exp()
}

fn polar(gain_db: f64, phase_deg: f64) -> Complex {
    Complex::from_polar(from_db(gain_db), phase_deg.to_radians())
}

/// An angle brought into (−180°, 180°].
pub(super) fn wrapped(degrees: f64) -> f64 {
    let turned = degrees.rem_euclid(360.0);
    if turned > 180.0 { turned - 360.0 } else { turned }
}
