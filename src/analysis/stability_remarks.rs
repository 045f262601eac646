//! Remarks about loops that are unstable, undecided, or stable only as long as their gain does not fall.

use super::filter_remarks::caused_by_filter;
use super::remarks::summaries;
use super::result::{ConditionResult, Detail, LoopResult};
use crate::finding::Finding;
use crate::linear::Verdict;
use crate::quantity::{Unit, print, print_digits};

const SUBHARMONIC_HINT: &str = "the current loop needs more compensating ramp; the voltage loop cannot mend it";
const UNSTABLE_HINT: &str = "lower the gain, or move zeros down and poles up to gain phase at the crossover";

/// Unstable and undecided loops, alike ones taken together. One that its input filter makes unstable is told with the filter.
pub(super) fn unstable(conditions: &[ConditionResult]) -> Vec<Finding> {
    let mut findings: Vec<Finding> = summaries(conditions)
        .filter(|(_, summary)| !caused_by_filter(summary.input_filter.as_ref()))
        .filter_map(|(condition, summary)| {
            let told = not_stable(&summary.loop_gain.verdict, &condition.condition.label)?;
            let subharmonic = summary.control.sampling.is_some_and(|s| s.subharmonic());
            let hint = if subharmonic { SUBHARMONIC_HINT } else { UNSTABLE_HINT };
            Some(Finding::problem("", told).with_hint(hint))
        })
        .collect();
    if findings.len() > 2 {
        let more = findings.len() - 1;
        findings.truncate(1);
        if let Some(first) = findings.first_mut() {
            first.message = format!("{} So or alike in {more} more of the nine conditions.", first.message);
        }
    }
    findings
}

/// A condition shown beside the nine that is not stable.
pub(super) fn what_if_unstable(detail: Option<&Detail>) -> Option<Finding> {
    let detail = detail.filter(|d| d.condition.levels.is_none())?;
    if caused_by_filter(detail.input_filter.as_ref().map(|f| &f.result)) {
        return None;
    }
    let told = not_stable(&detail.loop_gain.verdict, &detail.condition.label)?;
    Some(Finding::problem("", told).with_hint(UNSTABLE_HINT))
}

/// Conditionally stable loops: of the nine the one whose gain may fall least, and a condition beside them.
pub(super) fn conditionally_stable(conditions: &[ConditionResult], detail: Option<&Detail>) -> Vec<Finding> {
    let found: Vec<(&str, &LoopResult)> = summaries(conditions)
        .map(|(condition, summary)| (condition.condition.label.as_str(), &summary.loop_gain))
        .filter(|(_, result)| result.conditionally_stable())
        .collect();
    let room = |result: &LoopResult| result.margins.gain_margin_down_db().unwrap_or(f64::NEG_INFINITY);
    let worst = found.iter().max_by(|a, b| room(a.1).total_cmp(&room(b.1)));
    let of_nine = worst.map(|(label, result)| told(label, result, found.len() - 1));
    let beside = detail
        .filter(|d| d.condition.levels.is_none() && d.loop_gain.conditionally_stable())
        .map(|d| told(&d.condition.label, &d.loop_gain, 0));
    of_nine.into_iter().chain(beside).map(|text| Finding::notice("", text)).collect()
}

/// The sentence about a conditionally stable loop, with every frequency at which its phase passes −180° while its gain is above 1.
fn told(label: &str, result: &LoopResult, more: usize) -> String {
    let at: Vec<String> = result
        .margins
        .phase_crossovers
        .iter()
        .filter(|c| c.gain_margin_db < 0.0)
        .map(|c| print_digits(c.frequency_hz, Unit::Hertz, 3))
        .collect();
    let passes = if at.is_empty() {
        String::new()
    } else {
        format!("the phase passes −180° at {} with the gain above 1, and ", at.join(", "))
    };
    let falls = match result.margins.gain_margin_down_db() {
        Some(db) => format!("when its gain falls by {}", print_digits(-db, Unit::Decibel, 3)),
        None => "when its gain falls far enough".to_owned(),
    };
    let more = match more {
        0 => String::new(),
        n => format!(" So or alike in {n} more of the nine conditions."),
    };
    format!("Conditionally stable at {label}: {passes}the loop turns unstable {falls}.{more}")
}

/// The sentence about a loop that is not stable, or whose stability is undecided.
fn not_stable(verdict: &Verdict, label: &str) -> Option<String> {
    match verdict {
        Verdict::Stable { .. } => None,
        Verdict::Undecided { reason } => Some(format!("Stability undecided at {label}: {reason}.")),
        Verdict::Unstable { frequency_hz, growth_per_s, .. } => {
            let growth = print_digits(*growth_per_s, Unit::One, 3);
            Some(if *frequency_hz > 0.0 {
                let at = print(*frequency_hz, Unit::Hertz);
                format!("Unstable at {label}: oscillation at {at} growing with {growth} per second.")
            } else {
                format!("Unstable at {label}: the output runs away, growing with {growth} per second.")
            })
        }
    }
}
