//! Landmarks: the textbook frequencies of the plant. They are shown and tested against, and feed no curve.

use super::drawing::Topology;
use super::stage::{LoadKind, Stage};
use crate::linear::Zpk;
use std::f64::consts::TAU;

/// The lossless quantities textbook formulas are written in.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Textbook {
    /// Lossless duty ratio.
    pub duty: f64,
    /// Inductance [H].
    pub inductance: f64,
    /// Output capacitance [F].
    pub capacitance: f64,
    /// Output voltage over load current [Ω], whatever the load kind.
    pub load_resistance: f64,
}

/// The lossless quantities textbook forms of discontinuous conduction are written in.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RestingTextbook {
    /// Lossless duty ratio.
    pub duty: f64,
    /// Output voltage over input voltage, M.
    pub conversion: f64,
    /// Output capacitance [F].
    pub capacitance: f64,
    /// Output voltage over load current [Ω], whatever the load kind.
    pub load_resistance: f64,
    /// Switching frequency [Hz].
    pub switching_frequency: f64,
}

/// A topology's textbook forms of discontinuous conduction.
#[derive(Clone, Copy, Debug)]
pub struct RestingForms {
    /// Lossless duty ratio from M and K = 2·L·fs/R.
    pub duty: fn(f64, f64) -> f64,
    /// Pole of the output capacitor [Hz].
    pub low_pole_hz: fn(&RestingTextbook) -> f64,
    /// Its formula, for people.
    pub low_pole_formula: &'static str,
    /// Pole of the inductor [Hz], near or above the switching frequency.
    pub second_pole_hz: fn(&RestingTextbook) -> f64,
    /// Its formula, for people.
    pub second_pole_formula: &'static str,
    /// Right-half-plane zero [Hz], where there is one.
    pub right_half_plane_zero_hz: Option<fn(&RestingTextbook) -> f64>,
    /// Its formula, for people.
    pub right_half_plane_zero_formula: &'static str,
}

/// A frequency worth knowing.
#[derive(Clone, Debug, PartialEq)]
pub struct Landmark {
    /// Stable key: "lc-resonance", "esr-zero", "right-half-plane-zero", "input-filter", "output-filter",
    /// "half-switching"; in discontinuous conduction "low-pole" and "second-pole" in place of the resonance.
    pub key: &'static str,
    /// Name for people.
    pub name: &'static str,
    /// Where it is [Hz].
    pub frequency_hz: f64,
    /// The formula, or how it was derived.
    pub formula: &'static str,
    /// True when it was read off the derived model's poles and zeros because no textbook formula fits.
    pub derived: bool,
    /// Paths of the entries of the parts that make it.
    pub parts: Vec<String>,
}

const READ_OFF: &str =
    "read off the poles and zeros of the derived model: no textbook form fits unlike branches or a second stage";

const READ_OFF_LOAD: &str = "read off the poles of the derived model: the textbook form is that of a resistor";

/// The landmarks of a stage: textbook forms for a bank of one kind of capacitor at the load, else read off the plant, which is
/// that of the stage without its input filter.
pub(super) fn landmarks(topology: &Topology, t: &Textbook, stage: &Stage, plant: &Zpk) -> Vec<Landmark> {
    let mut marks = Vec::with_capacity(6);
    let mut add = |key, name, frequency_hz: f64, formula, derived| {
        if frequency_hz.is_finite() && frequency_hz > 0.0 {
            let parts = parts_of(key, stage.bank.len());
            marks.push(Landmark { key, name, frequency_hz, formula, derived, parts });
        }
    };
    if let ([only], None) = (stage.bank.as_slice(), &stage.second_stage) {
        add("lc-resonance", "LC resonance", (topology.resonance_hz)(t), topology.resonance_formula, false);
        if only.esr > 0.0 {
            add("esr-zero", "ESR zero", 1.0 / (TAU * only.esr * only.capacitance), "1 / (2π·ESR·C)", false);
        }
        if let Some(f) = (topology.right_half_plane_zero_hz)(t) {
            add("right-half-plane-zero", "RHP zero", f, topology.right_half_plane_zero_formula, false);
        }
    } else {
        let pair = plant.poles.iter().filter(|p| p.im > 0.0).map(|p| p.norm()).min_by(f64::total_cmp);
        add("lc-resonance", "LC resonance", pair.unwrap_or(f64::NAN) / TAU, READ_OFF, true);
        let left = plant.zeros.iter().filter(|z| z.re < 0.0 && z.im >= 0.0).map(|z| z.norm()).min_by(f64::total_cmp);
        add("esr-zero", "ESR zero", left.unwrap_or(f64::NAN) / TAU, READ_OFF, true);
        let right = right_half_plane_zero_hz(plant).filter(|_| topology.right_half_plane_zero_hz_exists());
        add("right-half-plane-zero", "RHP zero", right.unwrap_or(f64::NAN), READ_OFF, true);
    }
    marks.extend(filters_and_switching(stage));
    marks
}

/// What conduction does not change: the filters' resonances and half the switching frequency.
fn filters_and_switching(stage: &Stage) -> Vec<Landmark> {
    let mark = |key, name, frequency_hz, formula| {
        let parts = parts_of(key, stage.bank.len());
        Landmark { key, name, frequency_hz, formula, derived: false, parts }
    };
    let input = stage
        .input_filter
        .as_ref()
        .map(|filter| mark("input-filter", "Input filter", filter.resonance_hz(), "1 / (2π·√(Lf·Cin))"));
    let output = stage.second_stage.as_ref().map(|second| {
        let resonance = second.resonance_hz(stage.bank_capacitance());
        mark("output-filter", "Output filter", resonance, "1 / (2π·√(Lo·C·Co/(C + Co)))")
    });
    let half = mark("half-switching", "½ switching", stage.switching_frequency / 2.0, "fs / 2");
    let sound = |m: &Landmark| m.frequency_hz.is_finite() && m.frequency_hz > 0.0;
    input.into_iter().chain(output).chain([half]).filter(sound).collect()
}

/// The landmarks of a stage in discontinuous conduction, where inductor and capacitor do not resonate.
pub(super) fn resting_landmarks(topology: &Topology, t: &RestingTextbook, stage: &Stage, plant: &Zpk) -> Vec<Landmark> {
    let forms = &topology.resting;
    let mut marks = Vec::with_capacity(7);
    let mut add = |key, name, frequency_hz: f64, formula, derived| {
        if frequency_hz.is_finite() && frequency_hz > 0.0 {
            let parts = parts_of(key, stage.bank.len());
            marks.push(Landmark { key, name, frequency_hz, formula, derived, parts });
        }
    };
    let only = match (stage.bank.as_slice(), &stage.second_stage) {
        ([only], None) => Some(only),
        _ => None,
    };
    if only.is_some() && stage.load == LoadKind::Resistor {
        add("low-pole", "Low pole", (forms.low_pole_hz)(t), forms.low_pole_formula, false);
    } else {
        let why = if only.is_some() { READ_OFF_LOAD } else { READ_OFF };
        let pole = plant.poles.iter().map(|p| p.norm()).min_by(f64::total_cmp);
        add("low-pole", "Low pole", pole.unwrap_or(f64::NAN) / TAU, why, true);
    }
    if let Some(only) = only {
        if only.esr > 0.0 {
            add("esr-zero", "ESR zero", 1.0 / (TAU * only.esr * only.capacitance), "1 / (2π·ESR·C)", false);
        }
    } else {
        let left = plant.zeros.iter().filter(|z| z.re < 0.0 && z.im >= 0.0).map(|z| z.norm()).min_by(f64::total_cmp);
        add("esr-zero", "ESR zero", left.unwrap_or(f64::NAN) / TAU, READ_OFF, true);
    }
    // The inductor's corners do not know the bank.
    add("second-pole", "Second pole", (forms.second_pole_hz)(t), forms.second_pole_formula, false);
    if let Some(zero) = forms.right_half_plane_zero_hz {
        add("right-half-plane-zero", "RHP zero", zero(t), forms.right_half_plane_zero_formula, false);
    }
    marks.extend(filters_and_switching(stage));
    marks
}

/// Paths of the entries that a landmark follows from.
fn parts_of(key: &str, branches: usize) -> Vec<String> {
    let of_bank = |what: &str| (1..=branches).map(|k| format!("stage.bank.{k}.{what}")).collect::<Vec<_>>();
    let one = |path: &str| vec![path.to_owned()];
    match key {
        "lc-resonance" => [one("stage.inductor.inductance"), of_bank("capacitance")].concat(),
        "esr-zero" => [of_bank("esr"), of_bank("capacitance")].concat(),
        "low-pole" => [of_bank("capacitance"), one("stage.load.nominal")].concat(),
        "second-pole" => one("stage.inductor.inductance"),
        "right-half-plane-zero" => [one("stage.inductor.inductance"), one("stage.load.nominal")].concat(),
        "input-filter" => [one("stage.input-filter.inductance"), one("stage.input-capacitor.capacitance")].concat(),
        "output-filter" => {
            [one("stage.output-filter.inductance"), one("stage.output-filter.capacitance"), of_bank("capacitance")]
                .concat()
        }
        // In discontinuous conduction the bank discharges into the load, and the inductor answers within a period.
        "low-pole" => [of_bank("capacitance"), one("stage.load.nominal")].concat(),
        "second-pole" => [one("stage.inductor.inductance"), one("stage.switching-frequency")].concat(),
        "half-switching" => one("stage.switching-frequency"),
        _ => Vec::new(),
    }
}

/// The lowest right-half-plane zero of a plant [Hz].
pub(super) fn right_half_plane_zero_hz(plant: &Zpk) -> Option<f64> {
    plant.zeros.iter().filter(|z| z.re > 0.0).map(|z| z.norm() / TAU).min_by(f64::total_cmp)
}

impl Topology {
    fn right_half_plane_zero_hz_exists(&self) -> bool {
        !self.right_half_plane_zero_formula.is_empty()
    }
}
