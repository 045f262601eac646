//! Landmarks: the textbook frequencies of the plant. They are shown and tested against, and feed no curve.

use super::drawing::Topology;
use super::stage::Stage;
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

/// A frequency worth knowing.
#[derive(Clone, Debug, PartialEq)]
pub struct Landmark {
    /// Stable key: "lc-resonance", "esr-zero", "right-half-plane-zero", "input-filter", "output-filter",
    /// "half-switching".
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
    if let Some(filter) = &stage.input_filter {
        add("input-filter", "Input filter", filter.resonance_hz(), "1 / (2π·√(Lf·Cin))", false);
    }
    if let Some(second) = &stage.second_stage {
        let resonance = second.resonance_hz(stage.bank_capacitance());
        add("output-filter", "Output filter", resonance, "1 / (2π·√(Lo·C·Co/(C + Co)))", false);
    }
    add("half-switching", "½ switching", stage.switching_frequency / 2.0, "fs / 2", false);
    marks
}

/// Paths of the entries that a landmark follows from.
fn parts_of(key: &str, branches: usize) -> Vec<String> {
    let of_bank = |what: &str| (1..=branches).map(|k| format!("stage.bank.{k}.{what}")).collect::<Vec<_>>();
    let one = |path: &str| vec![path.to_owned()];
    match key {
        "lc-resonance" => [one("stage.inductor.inductance"), of_bank("capacitance")].concat(),
        "esr-zero" => [of_bank("esr"), of_bank("capacitance")].concat(),
        "right-half-plane-zero" => [one("stage.inductor.inductance"), one("stage.load.nominal")].concat(),
        "input-filter" => [one("stage.input-filter.inductance"), one("stage.input-capacitor.capacitance")].concat(),
        "output-filter" => {
            [one("stage.output-filter.inductance"), one("stage.output-filter.capacitance"), of_bank("capacitance")]
                .concat()
        }
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
