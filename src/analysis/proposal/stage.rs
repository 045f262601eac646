//! Sizes the power stage: inductor by its ripple, output bank by load step, resonance and ripple, resistances by losses.
//!
//! *Source.* Inductor ripple of 30 to 40 % of the greatest average current, and losses of half a per cent in each part: common
//! practice. Load step: C ≥ ΔI/(2π·fc·ΔV), the impedance of the bank at the crossover. Ripple of the bank's charge: half of the
//! mean magnitude of its current over a period, which by the Cauchy–Schwarz inequality is at most the RMS value, so
//! ΔV ≤ `I_rms`/(2·fs·C) whatever the waveform.

use super::assumption::{Draft, set, text};
use super::brief::Brief;
use crate::compensator::Series;
use crate::converter::{self, CurrentFigures, OperatingPoint, Size, Sizing, StageCondition};
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::quantity::Unit;

/// Peak-to-peak ripple of the inductor current over its greatest average.
const RIPPLE_SHARE: f64 = 0.35;
/// Loss of each resistance at full load, as a share of the output power.
const LOSS_SHARE: f64 = 0.005;
/// Switching frequency over the crossover aimed at.
const BELOW_SWITCHING: f64 = 10.0;
/// Lowest right-half-plane zero over the crossover aimed at.
const BELOW_ZERO: f64 = 4.0;
/// Landmarks that lag where other zeros lead, with their names: a pair that the load turns into the right half-plane counts.
const ZEROS: [(&str, &str); 2] =
    [("right-half-plane-zero", "right-half-plane zero"), ("zero-pair", "zero pair of the coupling capacitor")];
/// Crossover aimed at over the highest resonance.
const ABOVE_RESONANCE: f64 = 2.5;
/// Share of the allowed ripple that the bank's charge may take; the rest is the ESR's.
const CHARGE_SHARE: f64 = 0.7;
/// Share of the allowed deviation that the ESR may take.
const ESR_SHARE: f64 = 0.2;
/// ESR times capacitance of ceramic capacitors, at most [s].
const ESR_TIME: f64 = 0.5e-6;
/// Ripple of the input voltage that the input capacitor allows, as a share.
const INPUT_RIPPLE: f64 = 0.01;

/// Paths whose resistances are zero while currents are found.
const RESISTANCES: [&str; 6] = [
    "stage.source.resistance",
    "stage.inductor.resistance",
    "stage.switch.resistance",
    "stage.synchronous.resistance",
    "stage.bank.1.esr",
    "stage.bank.1.esl",
];

/// Sizes the stage of a draft whose divider is set.
pub(super) fn size(draft: &mut Draft, brief: &Brief) -> Result<(), Vec<Finding>> {
    for path in RESISTANCES {
        set(&mut draft.design, path, 0.0);
    }
    own_parts(draft, brief);
    if brief.ripple().is_some() {
        // Any values do to find volt-seconds and averages.
        set(&mut draft.design, "stage.inductor.inductance", first_inductance(brief));
        set(&mut draft.design, "stage.bank.1.capacitance", 1e-3);
        inductor(draft)?;
    }
    let points = full_load(&draft.checked()?)?;
    resistances(draft, brief, &points);
    if let Some(ripple) = brief.ripple() {
        bank(draft, brief, &points, ripple)?;
    }
    esr(draft, brief, &points);
    input(draft, brief, &points);
    Ok(())
}

/// What the topology has of its own.
fn own_parts(draft: &mut Draft, brief: &Brief) {
    let Some(topology) = converter::find(&brief.topology) else { return };
    let sizing = Sizing {
        input: (brief.get("stage.input.least"), brief.get("stage.input.greatest")),
        output: brief.get("stage.output.voltage"),
        load: brief.get("stage.load.greatest"),
        switching_frequency: brief.get("stage.switching-frequency") * f64::from(topology.pulses),
        inductance: brief.ripple().is_none().then(|| brief.get("stage.inductor.inductance")),
    };
    for size in (topology.sizing)(&sizing) {
        match size.size {
            Size::Value(value) => draft.assume(size.path, value, size.reason, size.common_practice),
            Size::Option(key) => draft.choose(size.path, key, &size.reason, size.common_practice),
        }
    }
}

/// An inductance of the right order [H]: the whole output voltage over a period, a tenth of the power's current.
fn first_inductance(brief: &Brief) -> f64 {
    let volts = brief.get("stage.output.voltage").max(brief.get("stage.input.greatest"));
    volts / (brief.get("stage.switching-frequency") * brief.get("stage.load.greatest"))
}

/// Operating points at the three input voltages and the greatest load.
fn full_load(design: &CheckedDesign) -> Result<Vec<OperatingPoint>, Vec<Finding>> {
    let at = |input_voltage: f64| StageCondition {
        input_voltage,
        load_current: design.stage.load_currents[2],
        output_voltage: design.stage.output_voltage,
    };
    let point = |input| design.stage.averaged(&at(input)).map(|model| model.operating_point);
    design.stage.input_voltages.into_iter().map(point).collect::<Result<_, _>>().map_err(|finding| vec![finding])
}

fn greatest(points: &[OperatingPoint], of: impl Fn(&OperatingPoint) -> f64) -> f64 {
    points.iter().map(of).fold(0.0, f64::max)
}

fn inductor(draft: &mut Draft) -> Result<(), Vec<Finding>> {
    let points = full_load(&draft.checked()?)?;
    let first = |of: fn(&CurrentFigures) -> f64| {
        greatest(&points, |point| point.inductors.first().map_or(0.0, |inductor| of(&inductor.current)))
    };
    let (average, swing) = (first(|current| current.average.abs()), first(|current| current.ripple));
    // Ripple times inductance is the volt-seconds of the switch's on time, whatever the inductance.
    let volt_seconds = swing * draft.get("stage.inductor.inductance");
    let inductance = Series::E12.nearest(volt_seconds / (RIPPLE_SHARE * average));
    let ripple = volt_seconds / inductance;
    let reason = format!(
        "ΔI = V·t / L: {} of ripple, {} % of the greatest average of {}; 30 to 40 % are usual",
        text(ripple, Unit::Ampere),
        text(100.0 * ripple / average, Unit::One),
        text(average, Unit::Ampere)
    );
    draft.assume("stage.inductor.inductance", inductance, reason, true);
    Ok(())
}

/// Resistances that each lose the same small share of the output power at full load.
fn resistances(draft: &mut Draft, brief: &Brief, points: &[OperatingPoint]) {
    let watts = LOSS_SHARE * brief.get("stage.output.voltage") * brief.get("stage.load.greatest");
    let currents = [
        ("stage.inductor.resistance", greatest(points, |point| point.inductors.first().map_or(0.0, |i| i.current.rms))),
        ("stage.switch.resistance", greatest(points, |point| point.switch.rms)),
        ("stage.synchronous.resistance", greatest(points, |point| point.rectifier.rms)),
    ];
    for (path, rms) in currents {
        let ohms = if rms > 0.0 { Series::E12.nearest(watts / (rms * rms)) } else { 0.0 };
        let reason = format!(
            "R = {} % of the output power / I_rms², with {} RMS at worst",
            text(100.0 * LOSS_SHARE, Unit::One),
            text(rms, Unit::Ampere)
        );
        draft.assume(path, ohms, reason, true);
    }
    let input_current = greatest(points, |point| point.input_current);
    let drop = LOSS_SHARE * brief.get("stage.input.least");
    draft.assume(
        "stage.source.resistance",
        Series::E12.nearest(drop / input_current.max(f64::MIN_POSITIVE)),
        format!("drops {} % of the least input at full load", text(100.0 * LOSS_SHARE, Unit::One)),
        true,
    );
}

/// The crossover the stage is sized for [Hz], and why.
pub(super) fn aim(design: &CheckedDesign) -> (f64, String) {
    let switching = design.stage.switching_frequency / BELOW_SWITCHING;
    let lowest = |(key, name)| {
        let hz = textbook_landmark(design, key).fold(f64::INFINITY, f64::min);
        (hz, name)
    };
    let [one, other] = ZEROS.map(lowest);
    let (zero, name) = if one.0 <= other.0 { one } else { other };
    if zero / BELOW_ZERO < switching {
        return (zero / BELOW_ZERO, format!("a quarter of the lowest {name}, {}", text(zero, Unit::Hertz)));
    }
    (switching, "a tenth of the switching frequency".to_owned())
}

/// A textbook landmark at the nine conditions, where there is one [Hz].
fn textbook_landmark(design: &CheckedDesign, key: &str) -> impl Iterator<Item = f64> {
    let form = design.stage.topology().landmark(key);
    textbooks(design).filter_map(move |t| (form?.hz)(&t))
}

/// Lossless quantities at the nine conditions.
fn textbooks(design: &CheckedDesign) -> impl Iterator<Item = converter::Textbook> + '_ {
    let stage = &design.stage;
    stage.input_voltages.into_iter().flat_map(move |input_voltage| {
        stage.load_currents.into_iter().map(move |load_current| {
            stage.textbook(&StageCondition { input_voltage, load_current, output_voltage: stage.output_voltage })
        })
    })
}

/// Output capacitance: the greatest of what load step, resonance and ripple ask for.
fn bank(draft: &mut Draft, brief: &Brief, points: &[OperatingPoint], ripple: f64) -> Result<(), Vec<Finding>> {
    let design = draft.checked()?;
    let (crossover, why) = aim(&design);
    let present = draft.get("stage.bank.1.capacitance");
    let resonance = textbook_landmark(&design, "lc-resonance").fold(0.0, f64::max);
    let rms = greatest(points, |point| point.output_bank_rms);
    let step = brief.load_step() / (std::f64::consts::TAU * crossover * brief.deviation());
    let needs = [
        (step, format!("load step: C = ΔI / (2π·fc·ΔV) at a crossover of {}, {why}", text(crossover, Unit::Hertz))),
        (
            present * (ABOVE_RESONANCE * resonance / crossover).powi(2),
            format!(
                "keeps the crossover aimed at, {}, 2.5 × above the highest resonance",
                text(crossover, Unit::Hertz)
            ),
        ),
        (
            rms / (2.0 * design.stage.ripple_frequency() * CHARGE_SHARE * ripple),
            format!("ripple: ΔV = I_rms / (2·fs·C) at most, with {} RMS in the bank", text(rms, Unit::Ampere)),
        ),
    ];
    let Some((capacitance, reason)) = needs.into_iter().max_by(|one, other| one.0.total_cmp(&other.0)) else {
        return Ok(());
    };
    draft.assume("stage.bank.1.capacitance", rounded_up(capacitance), reason, true);
    Ok(())
}

/// The value of E12 at or above this one.
pub(super) fn rounded_up(value: f64) -> f64 {
    Series::E12.within(value * 0.999, value * 1.3).first().copied().unwrap_or(value)
}

fn esr(draft: &mut Draft, brief: &Brief, points: &[OperatingPoint]) {
    let peak = greatest(points, |point| point.switched_current.peak);
    let capacitance = draft.get("stage.bank.1.capacitance");
    let by_step = ESR_SHARE * brief.deviation() / brief.load_step();
    let by_ripple = brief.ripple().map_or(f64::INFINITY, |ripple| (1.0 - CHARGE_SHARE) * ripple / peak);
    let by_kind = ESR_TIME / capacitance;
    let mut needs = [
        (by_step, "takes a fifth of the deviation allowed at the load step"),
        (by_ripple, "takes what ripple the charge leaves, by the rectifier's peak current"),
        (by_kind, "ceramic capacitors: ESR·C about 0.5 µs with the wiring"),
    ];
    needs.sort_by(|one, other| one.0.total_cmp(&other.0));
    if let Some((ohms, reason)) = needs.first() {
        draft.assume("stage.bank.1.esr", Series::E12.nearest(*ohms), *reason, true);
    }
}

/// The input capacitor: a charge of a quarter of the inductor's current over a period is the most a switch asks of it, D·(1 − D)
/// being a quarter at most.
fn input(draft: &mut Draft, brief: &Brief, points: &[OperatingPoint]) {
    // What the switch carries while it conducts.
    let amperes = greatest(points, |point| (point.sense_ratio * point.switched_current.average).abs());
    let volts = INPUT_RIPPLE * brief.get("stage.input.least");
    let frequency =
        draft.checked().map_or(brief.get("stage.switching-frequency"), |design| design.stage.switching_frequency);
    let farads = rounded_up(amperes / (4.0 * frequency * volts));
    draft.choose("stage.input-capacitor", "fitted", "a switched input needs one", true);
    draft.assume(
        "stage.input-capacitor.capacitance",
        farads,
        format!("C = I / (4·fs·ΔV), with ΔV {} % of the least input", text(100.0 * INPUT_RIPPLE, Unit::One)),
        true,
    );
    draft.assume(
        "stage.input-capacitor.esr",
        Series::E12.nearest(ESR_TIME / farads),
        "as the output bank: ESR·C about 0.5 µs",
        true,
    );
}
