//! Landmarks: the textbook frequencies of the plant. They are shown and tested against, and feed no curve.

use super::bank::Branch;
use super::stage::{LoadKind, Stage};
use super::topology::Topology;
use crate::linear::{Complex, Zpk};
use std::f64::consts::TAU;

/// The lossless quantities textbook formulas are written in.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Textbook {
    /// Lossless duty ratio, of the conduction mode at hand.
    pub duty: f64,
    /// Output voltage over input voltage, M.
    pub conversion: f64,
    /// Output voltage over the input as the transformer gives it.
    pub seen_conversion: f64,
    /// Turns ratio, second to first; 1 without a transformer.
    pub ratio: f64,
    /// Inductance [H].
    pub inductance: f64,
    /// Inductance of the second inductor [H]; 0 without one.
    pub second_inductance: f64,
    /// Coupling factor of the two inductors; 0 where they are separate.
    pub coupling: f64,
    /// Capacitance of the coupling capacitor [F]; 0 without one.
    pub coupling_capacitance: f64,
    /// Output capacitance [F].
    pub capacitance: f64,
    /// Output voltage over load current [Ω], whatever the load kind.
    pub load_resistance: f64,
    /// Switching frequency of the pulses [Hz].
    pub switching_frequency: f64,
}

impl Textbook {
    /// Mutual inductance of the two inductors [H].
    pub fn mutual(&self) -> f64 {
        self.coupling * (self.inductance * self.second_inductance).sqrt()
    }
}

/// A landmark's textbook form.
#[derive(Clone, Copy, Debug)]
pub struct Form {
    /// Stable key, as of [`Landmark`].
    pub key: &'static str,
    /// Name for people.
    pub name: &'static str,
    /// The formula, for people.
    pub formula: &'static str,
    /// Where it is [Hz]; none where there is none at these values.
    pub hz: fn(&Textbook) -> Option<f64>,
    /// Paths of the entries that make it; [`BANK`] stands for the capacitance of every branch.
    pub parts: &'static [&'static str],
}

/// In the parts of a [`Form`], the output bank.
pub const BANK: &str = "stage.bank";

const INDUCTANCE: &str = "stage.inductor.inductance";

impl Form {
    /// Resonance of inductor and output bank.
    pub const fn resonance(formula: &'static str, hz: fn(&Textbook) -> Option<f64>) -> Self {
        Form { key: "lc-resonance", name: "LC resonance", formula, hz, parts: &[INDUCTANCE, BANK] }
    }

    /// Right-half-plane zero of a current that the output receives only while the switch is open.
    pub const fn right_half_plane_zero(formula: &'static str, hz: fn(&Textbook) -> Option<f64>) -> Self {
        let parts = &[INDUCTANCE, "stage.load.nominal"];
        Form { key: "right-half-plane-zero", name: "RHP zero", formula, hz, parts }
    }

    /// Pole of the output bank and the load, of discontinuous conduction with a resistor for its load.
    pub const fn low_pole(formula: &'static str, hz: fn(&Textbook) -> Option<f64>) -> Self {
        Form { key: "low-pole", name: "Low pole", formula, hz, parts: &[BANK, "stage.load.nominal"] }
    }

    /// Pole of the inductor in discontinuous conduction, near or above the switching frequency.
    pub const fn second_pole(formula: &'static str, hz: fn(&Textbook) -> Option<f64>) -> Self {
        let parts = &[INDUCTANCE, "stage.switching-frequency"];
        Form { key: "second-pole", name: "Second pole", formula, hz, parts }
    }

    /// Whether it follows from the output bank, and so holds for a bank of one kind of capacitor at the load only.
    fn of_bank(&self) -> bool {
        self.parts.contains(&BANK)
    }

    fn mark(&self, t: &Textbook, branches: usize) -> Option<Landmark> {
        let frequency_hz = (self.hz)(t)?;
        let parts = self.parts.iter().flat_map(|path| match *path {
            BANK => (1..=branches).map(|k| format!("{BANK}.{k}.capacitance")).collect(),
            path => vec![path.to_owned()],
        });
        let Form { key, name, formula, .. } = *self;
        Some(Landmark { key, name, frequency_hz, formula, derived: false, parts: parts.collect() })
    }
}

/// A topology's textbook forms of discontinuous conduction.
#[derive(Clone, Copy, Debug)]
pub struct RestingForms {
    /// The inductance L in K = 2·L·fs/R [H].
    pub inductance: fn(&Textbook) -> f64,
    /// The conversion M that its duty ratio is written in.
    pub conversion: fn(&Textbook) -> f64,
    /// Lossless duty ratio from M and K.
    pub duty: fn(f64, f64) -> f64,
    /// Landmarks, in the order shown.
    pub landmarks: &'static [Form],
}

impl RestingForms {
    /// No textbook forms.
    pub const NONE: Self = RestingForms {
        inductance: |t| t.inductance,
        conversion: |t| t.conversion,
        duty: |_, _| f64::NAN,
        landmarks: &[],
    };
}

/// A frequency worth knowing.
#[derive(Clone, Debug, PartialEq)]
pub struct Landmark {
    /// Stable key: "lc-resonance", "esr-zero", "right-half-plane-zero", "input-filter", "output-filter",
    /// "half-switching"; in discontinuous conduction "low-pole" and "second-pole" in place of the resonance. Stages of two
    /// inductors have a "second-resonance" and a "zero-pair" as well.
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
    let branches = stage.bank.len();
    let simple = bank_of_one(stage).is_some();
    let mut marks = Vec::with_capacity(8);
    for form in topology.landmarks {
        let instead = match form.key {
            _ if simple || !(form.of_bank() || form.key == ZERO) => form.mark(t, branches),
            "lc-resonance" => {
                let pair = plant.poles.iter().filter(|p| p.im > 0.0).map(|p| p.norm()).min_by(f64::total_cmp);
                read_off(form.key, form.name, pair.map(|norm| norm / TAU), READ_OFF, branches)
            }
            ZERO => read_off(form.key, form.name, right_half_plane_zero_hz(plant), READ_OFF, branches),
            _ => None,
        };
        marks.extend(instead);
    }
    // Behind the resonance, ahead of what lies in the right half-plane.
    let at = usize::from(topology.landmarks.first().is_some_and(|form| form.key == "lc-resonance")).min(marks.len());
    marks.splice(at..at, esr_zero(stage, plant));
    marks.extend(filters_and_switching(stage));
    marks.retain(sound);
    marks
}

const ZERO: &str = "right-half-plane-zero";

/// The only branch of a bank right at the load.
fn bank_of_one(stage: &Stage) -> Option<&Branch> {
    match (stage.bank.as_slice(), &stage.second_stage) {
        ([only], None) => Some(only),
        _ => None,
    }
}

fn sound(mark: &Landmark) -> bool {
    mark.frequency_hz.is_finite() && mark.frequency_hz > 0.0
}

/// A landmark read off the plant's poles and zeros.
fn read_off(
    key: &'static str,
    name: &'static str,
    frequency_hz: Option<f64>,
    formula: &'static str,
    branches: usize,
) -> Option<Landmark> {
    Some(Landmark { key, name, frequency_hz: frequency_hz?, formula, derived: true, parts: parts_of(key, branches) })
}

fn esr_zero(stage: &Stage, plant: &Zpk) -> Option<Landmark> {
    let (key, name, branches) = ("esr-zero", "ESR zero", stage.bank.len());
    let Some(only) = bank_of_one(stage) else {
        // A pair of the coupling capacitor is none of the bank's.
        let of_bank = |z: &&Complex| z.re < 0.0 && (z.im == 0.0 || z.im > 0.0 && stage.coupling_capacitance <= 0.0);
        let left = plant.zeros.iter().filter(of_bank).map(|z| z.norm()).min_by(f64::total_cmp);
        return read_off(key, name, left.map(|norm| norm / TAU), READ_OFF, branches);
    };
    (only.esr > 0.0).then(|| Landmark {
        key,
        name,
        frequency_hz: 1.0 / (TAU * only.esr * only.capacitance),
        formula: "1 / (2π·ESR·C)",
        derived: false,
        parts: parts_of(key, branches),
    })
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
    input.into_iter().chain(output).chain([half]).collect()
}

/// The landmarks of a stage in discontinuous conduction, where inductor and capacitor do not resonate.
pub(super) fn resting_landmarks(topology: &Topology, t: &Textbook, stage: &Stage, plant: &Zpk) -> Vec<Landmark> {
    let branches = stage.bank.len();
    let simple = bank_of_one(stage).is_some();
    let mut marks = Vec::with_capacity(8);
    for form in topology.resting.landmarks.iter().filter(|form| form.key == "low-pole") {
        marks.extend(if simple && stage.load == LoadKind::Resistor {
            form.mark(t, branches)
        } else {
            let why = if simple { READ_OFF_LOAD } else { READ_OFF };
            let pole = plant.poles.iter().map(|p| p.norm()).min_by(f64::total_cmp);
            read_off(form.key, form.name, pole.map(|norm| norm / TAU), why, branches)
        });
    }
    marks.extend(esr_zero(stage, plant));
    // The inductor's corners do not know the bank.
    let others = topology.resting.landmarks.iter().filter(|form| form.key != "low-pole" && (simple || !form.of_bank()));
    marks.extend(others.filter_map(|form| form.mark(t, branches)));
    marks.extend(filters_and_switching(stage));
    marks.retain(sound);
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
