//! What the checks share: designs by entry path, analyses of them, and the one way floats are compared.

use polewright::analysis::loop_model::Shared;
use polewright::analysis::{Analysis, Detail, Level, Request, Shown, analyse};
use polewright::converter::StageCondition;
use polewright::design::{CheckedDesign, Design};
use polewright::finding::Finding;
use polewright::switched::{Closing, Driven, ExactLoop, Joined, Start, SwitchedSystem};

/// A design with every choice and value at its default but these.
pub(crate) fn design(choices: &[(&str, &str)], values: &[(&str, f64)]) -> Design {
    let mut design = Design::default();
    for (path, key) in choices {
        design.set_from_text(path, key).unwrap_or_else(|finding| panic!("{finding:?}"));
    }
    for (path, value) in values {
        design.values.set(path, *value).expect("finite");
    }
    design
}

/// A design whose stage loses nothing: synchronous, no resistances, one output capacitor.
pub(crate) fn lossless(topology: &str, values: &[(&str, f64)]) -> Design {
    let mut design = design(
        &[
            ("stage.topology", topology),
            ("stage.rectifier", "synchronous"),
            ("stage.load", "resistor"),
            ("stage.input-capacitor", "none"),
            ("stage.bank", "1"),
            ("control.feedforward", "none"),
        ],
        &[
            ("stage.source.resistance", 0.0),
            ("stage.inductor.resistance", 0.0),
            ("stage.switch.resistance", 0.0),
            ("stage.synchronous.resistance", 0.0),
            ("stage.bank.1.esr", 0.0),
            ("stage.bank.1.esl", 0.0),
            ("stage.bank.1.count", 1.0),
            ("stage.bank.1.remaining", 1.0),
            ("control.delay", 0.0),
            ("control.ramp.valley", 0.0),
            ("control.duty.least", 0.0),
            ("control.duty.greatest", 1.0),
        ],
    );
    for (path, value) in values {
        design.values.set(path, *value).expect("finite");
    }
    design
}

/// Sets one input voltage [V] and one load [A] for least, nominal and greatest.
pub(crate) fn at_one_condition(design: &mut Design, input_voltage: f64, load_current: f64) {
    for level in ["least", "nominal", "greatest"] {
        design.values.set(&format!("stage.input.{level}"), input_voltage).expect("finite");
        design.values.set(&format!("stage.load.{level}"), load_current).expect("finite");
    }
}

/// An op amp so good that it does not show.
pub(crate) fn ideal_op_amp(design: &mut Design) {
    design.values.set("compensator.op-amp.dc-gain", 1e9).expect("finite");
    design.values.set("compensator.op-amp.gain-bandwidth", 1e12).expect("finite");
}

/// The design with usable entries, or the problems as a panic.
pub(crate) fn checked(design: &Design) -> CheckedDesign {
    design.check().unwrap_or_else(|problems| panic!("{}: {problems:?}", design.title))
}

/// Analysis with the nominal condition shown.
pub(crate) fn analysed(design: &Design, frequencies_hz: &[f64], step_points: usize) -> Analysis {
    let request = Request {
        shown: Shown::Levels(Level::Nominal, Level::Nominal),
        frequencies_hz: frequencies_hz.to_vec(),
        band_frequencies_hz: Vec::new(),
        step_points,
    };
    analyse(&checked(design), &request)
}

/// The nominal condition in full.
pub(crate) fn nominal(design: &Design, frequencies_hz: &[f64]) -> Detail {
    let analysis = analysed(design, frequencies_hz, 200);
    *analysis.shown.unwrap_or_else(|finding| panic!("{}: {finding:?}", design.title))
}

/// Ratio of decibels.
pub(crate) fn ratio(db: f64) -> f64 {
    10_f64.powf(db / 20.0)
}

/// Panics unless two numbers agree to a fraction of the wanted one.
#[track_caller]
pub(crate) fn assert_relative(what: &str, value: f64, wanted: f64, fraction: f64) {
    assert!(
        (value - wanted).abs() <= fraction * wanted.abs(),
        "{what}: {value}, wanted {wanted} within {fraction:e} of it"
    );
}

/// Panics unless two numbers agree to an absolute amount.
#[track_caller]
pub(crate) fn assert_absolute(what: &str, value: f64, wanted: f64, amount: f64) {
    assert!((value - wanted).abs() <= amount, "{what}: {value}, wanted {wanted} ± {amount:e}");
}

/// Tolerance for published frequencies and gains: half a percent, as a fraction.
pub(crate) const PUBLISHED: f64 = 0.005;
/// Tolerance for published phases [°].
pub(crate) const PUBLISHED_DEG: f64 = 0.3;

/// The switched loop at the nominal condition or another, solved exactly.
pub(crate) fn try_exact_loop(design: &Design, condition: Option<StageCondition>) -> Result<ExactLoop, Finding> {
    let checked = checked(design);
    let stage = &checked.stage;
    let nominal = StageCondition {
        input_voltage: stage.input_voltages[1],
        load_current: stage.load_currents[1],
        output_voltage: stage.output_voltage,
    };
    let condition = condition.unwrap_or(nominal);
    let shared = Shared::new(&checked)?;
    let point = stage.averaged(&condition)?.operating_point;
    let held = checked.compensator.steady_inputs().into_iter().map(|(name, volts)| (name.to_owned(), volts)).collect();
    let fed = shared.fast_path.iter().map(|path| ("fast".to_owned(), path.signal.to_owned())).collect();
    let closing = Closing { space: &shared.compensator, held, fed };
    let joined = |driven| Joined { stage, law: &shared.law, driven };
    let closed = SwitchedSystem::new(&joined(Driven::Loop(closing)), &condition)?;
    let open = SwitchedSystem::new(&joined(Driven::Voltage(0.0)), &condition)?;
    ExactLoop::new(&closed, &open, Start::of(&point), condition.output_voltage)
}

/// The same, or the finding as a panic.
pub(crate) fn exact_loop(design: &Design, condition: Option<StageCondition>) -> ExactLoop {
    try_exact_loop(design, condition).unwrap_or_else(|finding| panic!("{}: {finding:?}", design.title))
}
