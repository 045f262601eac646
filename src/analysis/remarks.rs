//! Remarks about the results: what makes averaged numbers doubtful, what misses a requirement, what common practice says.

use super::condition::NOMINAL;
use super::conduction::{discontinuous, resonates, step_leaves_mode};
use super::control_remarks::control_remarks;
use super::crossover_window::nominal_crossover;
use super::digital_remarks::digital_remarks;
use super::filter_remarks::filter_remarks;
use super::isolated_remarks::isolated_remarks;
use super::loop_model::Shared;
use super::result::{ConditionResult, ConditionSummary, CrossoverWindow, Detail, RequirementVerdict, WindowEdge};
use super::stability_remarks::{conditionally_stable, unstable, what_if_unstable};
use crate::compensator::Amplifier;
use crate::converter::LoadKind;
use crate::design::CheckedDesign;
use crate::finding::{Finding, Severity};
use crate::linear::FrequencyResponse;
use crate::quantity::{Unit, print, print_digits};

/// Loop gain at the switching frequency above which ripple at the comparator makes averaged numbers doubtful (measured
/// against an exact switched model).
const RIPPLE_GAIN: f64 = 0.03;
/// Share of the ramp the output's step, amplified, may take before the same.
const RIPPLE_STEP: f64 = 0.05;

/// All remarks of an analysis, the gravest first.
pub(super) fn remarks(
    design: &CheckedDesign,
    shared: &Shared,
    detail: Option<&Detail>,
    conditions: &[ConditionResult],
    verdicts: &[RequirementVerdict],
    window: &CrossoverWindow,
) -> Vec<Finding> {
    let mut findings = design.findings.clone();
    findings.extend(no_outcome(conditions));
    findings.extend(unstable(conditions));
    findings.extend(conditionally_stable(conditions, detail));
    findings.extend(what_if_unstable(detail));
    findings.extend(filter_remarks(design, detail, conditions));
    findings.extend(control_remarks(design, shared, detail, conditions));
    findings.extend(digital_remarks(design, shared, detail, conditions));
    findings.extend(isolated_remarks(design, detail, conditions, window));
    findings.extend(beyond_the_model(conditions));
    findings.extend(verdicts.iter().filter(|v| !v.met).map(missed));
    findings.extend(ripple(design, shared, conditions));
    findings.extend(step_leaves_limits(design, detail));
    findings.extend(window_remarks(conditions, window));
    findings.extend(model_limits(design));
    findings.extend(discontinuous(design, conditions));
    findings.extend(step_leaves_mode(design, detail));
    findings.sort_by_key(|f| match f.severity {
        Severity::Problem => 0,
        Severity::Notice => 1,
        Severity::Note => 2,
    });
    findings
}

/// Conditions without results, alike ones taken together.
fn no_outcome(conditions: &[ConditionResult]) -> Vec<Finding> {
    let failed: Vec<(&ConditionResult, &Finding)> =
        conditions.iter().filter_map(|c| c.outcome.as_ref().err().map(|f| (c, f))).collect();
    let mut grouped: Vec<(Finding, usize)> = Vec::new();
    for (condition, finding) in failed {
        if let Some(known) = grouped.iter_mut().find(|(f, _)| f.place == finding.place && f.hint == finding.hint) {
            known.1 += 1;
        } else {
            let mut first = finding.clone();
            first.message = format!("{} First at {}", first.message, condition.condition.label);
            grouped.push((first, 1));
        }
    }
    grouped
        .into_iter()
        .map(|(mut finding, count)| {
            if count > 1 {
                finding.message = format!("{}; so or alike in {count} of the nine conditions.", finding.message);
            } else {
                finding.message.push('.');
            }
            finding
        })
        .collect()
}

pub(super) fn summaries(conditions: &[ConditionResult]) -> impl Iterator<Item = (&ConditionResult, &ConditionSummary)> {
    conditions.iter().filter_map(|c| c.outcome.as_ref().ok().map(|s| (c, s)))
}

/// A loop gain that has not fallen below one where the averaged model ends.
fn beyond_the_model(conditions: &[ConditionResult]) -> Option<Finding> {
    let (condition, summary) = summaries(conditions)
        .max_by(|a, b| {
            let gain = |s: &ConditionSummary| s.loop_gain.gain_at_half_switching_db;
            gain(a.1).total_cmp(&gain(b.1))
        })
        .filter(|(_, s)| s.loop_gain.gain_at_half_switching_db >= 0.0)?;
    let message = format!(
        "The loop gain is still {} at half the switching frequency at {}: the averaged model ends there, so crossover and margins say nothing.",
        print_digits(summary.loop_gain.gain_at_half_switching_db, Unit::Decibel, 3),
        condition.condition.label
    );
    Some(Finding::problem("", message).with_hint("lower the gain or raise the switching frequency"))
}

fn missed(verdict: &RequirementVerdict) -> Finding {
    let limit = print(verdict.limit, verdict.unit);
    let message = match verdict.value {
        Some(value) => {
            format!("{} {} misses {limit} at {}.", verdict.name, print(value, verdict.unit), verdict.condition)
        }
        None => format!("{} {limit} is not met at {}: {}.", verdict.name, verdict.condition, verdict.reason),
    };
    Finding::notice(verdict.path, message)
}

/// Ripple at the comparator large enough to make averaged numbers doubtful.
fn ripple(design: &CheckedDesign, shared: &Shared, conditions: &[ConditionResult]) -> Vec<Finding> {
    if shared.digital.is_some() {
        return Vec::new();
    }
    let fs = design.stage.switching_frequency;
    // Several phases cancel the ripple below the frequency of all together.
    let high = shared.compensator_response.at_hz(design.stage.ripple_frequency()).norm();
    let mut findings = Vec::new();
    let gain = summaries(conditions)
        .max_by(|a, b| a.1.loop_gain.gain_at_switching.total_cmp(&b.1.loop_gain.gain_at_switching));
    if let Some((condition, summary)) = gain.filter(|(_, s)| s.loop_gain.gain_at_switching > RIPPLE_GAIN) {
        let message = format!(
            "The loop gain at the switching frequency is {}, above {RIPPLE_GAIN}, at {}: ripple reaches the comparator and averaged margins are doubtful.",
            print_digits(summary.loop_gain.gain_at_switching, Unit::One, 2),
            condition.condition.label
        );
        findings.push(Finding::notice("", message).with_hint("lower the highest compensator pole or the crossover"));
    }
    let share =
        |s: &ConditionSummary| s.operating_point.output_step * high / shared.law.swing(&s.operating_point, fs.recip());
    let step = summaries(conditions).map(|(c, s)| (c, share(s))).max_by(|a, b| a.1.total_cmp(&b.1));
    if let Some((condition, share)) = step.filter(|(_, share)| *share > RIPPLE_STEP) {
        let message = format!(
            "The output's ESR step times the compensator's gain at the switching frequency is {} % of what the comparator compares it with, above 5 %, at {}: averaged numbers are doubtful.",
            print_digits(100.0 * share, Unit::One, 2),
            condition.condition.label
        );
        findings.push(Finding::notice("", message).with_hint("lower the ESR, or the compensator's highest pole"));
    }
    findings
}

/// A linear step that asks the amplifier or modulator for what they cannot give.
fn step_leaves_limits(design: &CheckedDesign, detail: Option<&Detail>) -> Option<Finding> {
    let detail = detail?;
    let step = detail.steps.load.as_ref()?;
    let (least, greatest) = design.compensator.output_limits();
    let followed = design.law.control_limits(detail.condition.input_voltage);
    let (least, greatest) = (least.max(followed.0), greatest.min(followed.1));
    let (low, high) = step.control_v;
    let label = &detail.condition.label;
    if high > greatest || low < least {
        let (asked, stop) = if high > greatest { (high, greatest) } else { (low, least) };
        let message = format!(
            "The load step asks a control voltage of {} and amplifier, clamp and duty limits stop at {} ({label}): the real response is slower than the linear one shown.",
            print(asked, Unit::Volt),
            print(stop, Unit::Volt)
        );
        return Some(Finding::notice("event.load-step.change", message));
    }
    if let Amplifier::Transconductance(amplifier) = design.compensator.amplifier {
        let asked = amplifier.gm * design.compensator.divider_ratio() * step.deviation_v.abs();
        if asked > amplifier.output_current {
            let message = format!(
                "The load step asks an amplifier current of {} and it gives {} ({label}): the real response is slower than the linear one shown.",
                print(asked, Unit::Ampere),
                print(amplifier.output_current, Unit::Ampere)
            );
            return Some(Finding::notice("compensator.transconductance.output-current", message));
        }
    }
    None
}

fn window_remarks(conditions: &[ConditionResult], window: &CrossoverWindow) -> Vec<Finding> {
    let mut findings = Vec::new();
    if !window.empty.is_empty() {
        findings.push(Finding::notice("", format!("The crossover window is {}.", window.empty)));
    }
    let Some(crossover) = nominal_crossover(conditions) else { return findings };
    let at = conditions.get(NOMINAL).map(|c| c.condition.label.as_str()).unwrap_or_default();
    let crossover_text = print(crossover, Unit::Hertz);
    if let Some(upper) = window.upper.as_ref().filter(|e| crossover > e.frequency_hz) {
        let edge = print(upper.frequency_hz, Unit::Hertz);
        findings.push(Finding::notice(
            "",
            format!(
                "The crossover {crossover_text} at {at} stands above the crossover window's upper edge {edge} ({}).",
                upper.cause
            ),
        ));
    }
    // Where the current rests there is no resonance to stay above.
    let resonates = conditions.get(NOMINAL).and_then(|c| c.outcome.as_ref().ok()).is_some_and(resonates);
    let holds = |e: &&WindowEdge| crossover < e.frequency_hz && (resonates || !e.of_resonance);
    if let Some(lower) = window.lower.as_ref().filter(holds) {
        let edge = print(lower.frequency_hz, Unit::Hertz);
        findings.push(Finding::note(
            "",
            format!(
                "The crossover {crossover_text} at {at} stands below the crossover window's lower edge {edge} ({}).",
                lower.cause
            ),
        ));
    }
    findings
}

/// Limits of the models that bear on this design.
fn model_limits(design: &CheckedDesign) -> Vec<Finding> {
    let mut notes = Vec::new();
    if design.stage.load == LoadKind::Power {
        notes.push(Finding::note(
            "stage.load",
            "The constant-power load is taken by its tangent in all linear results.",
        ));
    }
    if design.stage.phases() > 1.0 && design.stage.bank.iter().any(|b| b.esr > 0.0) && design.stage.bank_is_switched() {
        notes.push(Finding::note(
            "stage.phases",
            "The averaged model lets all phases conduct at once through the output bank's ESR; driven one after the other they drop a little less there. The ESR zero is exact.",
        ));
    }
    if design.stage.bank.iter().any(|b| b.esl > 0.0) && !design.stage.bank_inductance_averaged() {
        let why = if design.stage.load == LoadKind::Resistor {
            "it carries switched current and settles within one switching interval"
        } else {
            "a load that is not a resistor leaves it undamped"
        };
        let rest = if design.stage.second_stage.is_some() {
            "behind the second stage it does not reach the load"
        } else {
            "output impedance and load step include it"
        };
        let message = format!("The output bank's ESL is left out of the control path ({why}); {rest}.");
        notes.push(Finding::note("stage.bank.1.esl", message));
    }
    notes
}
