//! Remarks about a difference equation: what rounding its coefficients and sampling once a period do to the loop.

use super::digital::{gain_at_rest, stable_before_rounding};
use super::loop_model::Shared;
use super::remarks::summaries;
use super::result::{ConditionResult, ConditionSummary, Detail};
use crate::compensator::{Amplifier, Compensator, Rounding};
use crate::design::CheckedDesign;
use crate::finding::{Finding, Remedy};
use crate::linear::{Complex, Margins, Verdict};
use crate::quantity::{Unit, print, print_digits};

/// Share by which rounding may move a pole, a zero or the gain without remark.
const MOVED: f64 = 0.05;
/// Change of the phase margin [°] that is worth a word.
const MARGIN_DEG: f64 = 3.0;
/// Change of the gain margin [dB] that is worth a word.
const MARGIN_DB: f64 = 1.0;

/// Gain margin that is ample [dB]; common practice.
const AMPLE_DB: f64 = 10.0;

const BITS: &str = "compensator.digital.bits";

/// All remarks about a difference equation; none without one.
pub(super) fn digital_remarks(
    design: &CheckedDesign,
    shared: &Shared,
    detail: Option<&Detail>,
    conditions: &[ConditionResult],
) -> Vec<Finding> {
    let Some(digital) = &shared.digital else { return Vec::new() };
    let mut findings = Vec::new();
    findings.extend(destabilised(design, shared, conditions));
    findings.extend(integrator(design, shared, detail));
    findings.extend(detail.and_then(moved));
    findings.extend(folded(conditions));
    findings.push(Finding::note(
        BITS,
        format!(
            "The difference equation is linear here: its coefficients are rounded to {} bits, but neither the steps of the converters and of the pulse width nor rounding inside its sums are modelled.",
            digital.digital.bits
        ),
    ));
    findings
}

/// Loops that rounding makes unstable.
fn destabilised(design: &CheckedDesign, shared: &Shared, conditions: &[ConditionResult]) -> Option<Finding> {
    let unstable = summaries(conditions)
        .filter(|(_, summary)| matches!(summary.loop_gain.verdict, Verdict::Unstable { .. }))
        .map(|(condition, _)| &condition.condition)
        .find(|condition| stable_before_rounding(design, shared, condition) == Some(true))?;
    let digital = shared.digital.as_ref()?.digital;
    let message = format!(
        "Rounding makes the loop unstable: with the coefficients in words of {} bits it is unstable at {}, before rounding it is stable.",
        digital.bits, unstable.label
    );
    Some(Finding::problem(BITS, message).with_hint("enter a longer word, or leave the fraction bits empty"))
}

/// A pole that rounding took off z = 1.
fn integrator(design: &CheckedDesign, shared: &Shared, detail: Option<&Detail>) -> Option<Finding> {
    let gain = gain_at_rest(shared)?;
    let equation = &shared.digital.as_ref()?.equation;
    let distance = |p: &Complex| (p - 1.0).norm();
    let pole = equation.poles().iter().copied().min_by(|a, b| distance(a).total_cmp(&distance(b)))?;
    let at = print_digits(pole.re, Unit::One, 6);
    let message = if pole.re > 1.0 {
        format!(
            "Rounding moves the integrator's pole from z = 1 to {at}, outside the unit circle: what the equation holds grows by itself."
        )
    } else {
        let plant = detail.map(|d| d.curves.plant_db.first().copied().unwrap_or(0.0));
        let error = plant.map_or(String::new(), |db| {
            let loop_gain = gain * 10f64.powf(db / 20.0);
            format!(", and about {} of an error stays", print_digits(1.0 / (1.0 + loop_gain), Unit::Fraction, 2))
        });
        format!(
            "Rounding moves the integrator's pole from z = 1 to {at}: at rest the equation answers {} V of control per volt of output{error}.",
            print_digits(gain, Unit::One, 3)
        )
    };
    let finding = Finding::notice("compensator.digital.rounding", message);
    Some(if kept(design) {
        finding.with_hint("let rounding keep the integrator").with_remedy(Remedy {
            label: "Keep the integrator".into(),
            values: Vec::new(),
            choices: vec![("compensator.digital.rounding".into(), "integrator".into())],
        })
    } else {
        finding.with_hint("enter a longer word")
    })
}

/// Whether rounding that keeps the integrator is to be had.
fn kept(design: &CheckedDesign) -> bool {
    design.compensator.digital().is_some_and(|digital| {
        let kept = crate::compensator::Digital { rounding: Rounding::Integrator, ..digital };
        let compensator = Compensator { amplifier: Amplifier::Digital(kept), ..design.compensator.clone() };
        compensator.digital().and_then(|digital| digital.fixed_point()).is_some()
    })
}

/// Poles, zeros, gain or margin that rounding moves far.
fn moved(detail: &Detail) -> Option<Finding> {
    let digital = detail.digital.as_ref()?;
    let farthest = digital
        .lanes
        .iter()
        .map(|lane| (lane, (lane.as_built_hz / lane.aim_hz).ln().abs()))
        .max_by(|a, b| a.1.total_cmp(&b.1))
        .filter(|(_, apart)| *apart > MOVED);
    let (before, after) = (margin(&digital.before_rounding.margins), margin(&detail.loop_gain.margins));
    let apart = before.zip(after).filter(|(b, a)| (b - a).abs() > MARGIN_DEG);
    if farthest.is_none() && apart.is_none() {
        return None;
    }
    let mut said = Vec::new();
    if let Some((lane, _)) = farthest {
        said.push(format!(
            "the {} lands at {} in place of {}",
            lane.key.replace('-', " "),
            print_digits(lane.as_built_hz, Unit::Hertz, 3),
            print_digits(lane.aim_hz, Unit::Hertz, 3)
        ));
    }
    if let Some((before, after)) = apart {
        said.push(format!(
            "the phase margin goes from {} to {} ({})",
            print_digits(before, Unit::Degree, 3),
            print_digits(after, Unit::Degree, 3),
            detail.condition.label
        ));
    }
    let message = format!("Rounded to words of {} bits, {}.", digital.digital.bits, said.join(", and "));
    Some(Finding::notice(BITS, message).with_hint("enter a longer word, or leave the fraction bits empty"))
}

fn margin(margins: &Margins) -> Option<f64> {
    margins.headline_crossover().map(|c| c.phase_margin_deg)
}

/// Margins of the sampled loop that differ from those of the curves, at the condition where they differ most.
fn folded(conditions: &[ConditionResult]) -> Option<Finding> {
    let apart = |(_, summary): &(&ConditionResult, &ConditionSummary)| {
        let result = &summary.loop_gain;
        let sampled = result.sampled.as_ref()?;
        let degrees = margin(&result.margins).zip(margin(sampled)).map_or(0.0, |(a, b)| (a - b).abs());
        let decibels = result.margins.gain_margin_up_db().zip(sampled.gain_margin_up_db());
        // A gain margin that is ample either way is not worth a word.
        let decibels = decibels.filter(|(a, b)| a.min(*b) < AMPLE_DB).map_or(0.0, |(a, b)| (a - b).abs());
        Some((degrees / MARGIN_DEG).max(decibels / MARGIN_DB)).filter(|apart| *apart > 1.0)
    };
    let (condition, summary, _) = summaries(conditions)
        .filter_map(|row| apart(&row).map(|apart| (row.0, row.1, apart)))
        .max_by(|a, b| a.2.total_cmp(&b.2))?;
    let sampled = summary.loop_gain.sampled.as_ref()?;
    let crossover = sampled.headline_crossover()?;
    let gain = sampled.gain_margin_up_db().map_or("none".to_owned(), |db| print_digits(db, Unit::Decibel, 3));
    let message = format!(
        "Sampling folds what the plant passes above half the sampling frequency: at {} the sampled loop crosses over at {} with a phase margin of {} and a gain margin of {gain}, not as the curves have it.",
        condition.condition.label,
        print(crossover.frequency_hz, Unit::Hertz),
        print_digits(crossover.phase_margin_deg, Unit::Degree, 3),
    );
    Some(
        Finding::notice("compensator.digital.computation", message)
            .with_hint("stability and steps are those of the sampled loop; a lower crossover brings both together"),
    )
}
