//! Holds the results against the requirements of a design.

use super::condition::NOMINAL;
use super::result::{ConditionResult, ConditionSummary, LimitKind, RequirementVerdict, Worst};
use crate::design::{Asked, Limit, Scope};

/// A number taken from one condition.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Taken {
    /// It has this value.
    Value(f64),
    /// Nothing bounds it, as the gain margin of a loop that no rise in gain makes unstable.
    Unbounded,
    /// It cannot be evaluated, and why.
    Absent(&'static str),
}

impl Taken {
    pub(super) fn value(self) -> Option<f64> {
        if let Taken::Value(value) = self { Some(value) } else { None }
    }
}

/// The number a requirement asks about, from one condition.
pub(super) fn take(asked: Asked, summary: &ConditionSummary) -> Taken {
    let found = |value: Option<f64>, absent| value.map_or(absent, Taken::Value);
    let margins = &summary.loop_gain.margins;
    if !summary.loop_gain.stable() {
        return Taken::Absent("the loop is not stable");
    }
    if summary.loop_gain.gain_at_half_switching_db >= 0.0
        && !matches!(asked, Asked::LoadStepDeviation | Asked::Settling)
    {
        return Taken::Absent("the loop gain is above 1 at ½ fs");
    }
    let crossover = margins.headline_crossover();
    let none = Taken::Absent("the loop gain has no crossover");
    match asked {
        Asked::PhaseMargin => found(crossover.map(|c| c.phase_margin_deg), Taken::Unbounded),
        Asked::GainMargin => found(margins.gain_margin_up_db(), Taken::Unbounded),
        Asked::ModulusMargin => Taken::Value(margins.modulus_margin),
        Asked::CrossoverLeast | Asked::CrossoverGreatest => found(crossover.map(|c| c.frequency_hz), none),
        Asked::RightHalfPlaneRatio => match (summary.right_half_plane_zero_hz, crossover) {
            (None, _) => Taken::Unbounded,
            (Some(_), None) => none,
            (Some(zero), Some(c)) => Taken::Value(zero / c.frequency_hz),
        },
        Asked::LoadStepDeviation => {
            found(summary.load_step.map(|step| step.deviation_v.abs()), Taken::Absent("the load step was not computed"))
        }
        Asked::Settling => {
            found(summary.load_step.and_then(|step| step.settling_s), Taken::Absent("it does not settle"))
        }
    }
}

/// The worst of a number over the conditions: one that cannot be evaluated is worse than any value.
pub(super) fn worst(asked: Asked, conditions: &[ConditionResult]) -> (Taken, usize) {
    let mut worst = (Taken::Unbounded, 0);
    for (index, condition) in conditions.iter().enumerate() {
        let taken = match &condition.outcome {
            Ok(summary) => take(asked, summary),
            Err(_) => Taken::Absent("a condition has no results"),
        };
        let worse = match (taken, worst.0) {
            (Taken::Absent(_) | Taken::Value(_), Taken::Absent(_)) | (Taken::Unbounded, _) => false,
            (Taken::Absent(_), _) | (Taken::Value(_), Taken::Unbounded) => true,
            (Taken::Value(new), Taken::Value(old)) => {
                if asked.is_least() {
                    new < old
                } else {
                    new > old
                }
            }
        };
        if worse {
            worst = (taken, index);
        }
    }
    worst
}

/// The worst value as a read-out shows it.
pub(super) fn worst_shown(asked: Asked, conditions: &[ConditionResult]) -> Option<Worst> {
    let (taken, index) = worst(asked, conditions);
    if taken == Taken::Unbounded {
        return None;
    }
    Some(Worst { value: taken.value(), condition: conditions.get(index)?.condition.label.clone(), index })
}

/// Key of the read-out a requirement belongs to.
pub(super) fn readout_key(asked: Asked) -> &'static str {
    match asked {
        Asked::PhaseMargin => "phase-margin",
        Asked::GainMargin => "gain-margin",
        Asked::ModulusMargin => "modulus-margin",
        Asked::CrossoverLeast | Asked::CrossoverGreatest => "crossover",
        Asked::RightHalfPlaneRatio => "right-half-plane-ratio",
        Asked::LoadStepDeviation => "load-step-deviation",
        Asked::Settling => "settling",
    }
}

/// Whether a limit is met over the conditions.
pub(super) fn verdict(limit: &Limit, conditions: &[ConditionResult]) -> RequirementVerdict {
    let (taken, index) = match limit.scope {
        Scope::Worst => worst(limit.asked, conditions),
        Scope::Nominal => match conditions.get(NOMINAL).map(|c| &c.outcome) {
            Some(Ok(summary)) => (take(limit.asked, summary), NOMINAL),
            _ => (Taken::Absent("the nominal condition has no results"), NOMINAL),
        },
    };
    let (met, reason) = match taken {
        Taken::Value(value) => (limit.met_by(Some(value)), ""),
        Taken::Unbounded => (limit.is_least(), "none below ½ fs"),
        Taken::Absent(why) => (false, why),
    };
    RequirementVerdict {
        path: limit.entry.path,
        name: limit.entry.name,
        unit: limit.entry.unit,
        kind: if limit.is_least() { LimitKind::AtLeast } else { LimitKind::AtMost },
        limit: limit.value,
        value: taken.value(),
        met,
        reason: reason.to_owned(),
        condition: conditions.get(index).map(|c| c.condition.label.clone()).unwrap_or_default(),
        readout: readout_key(limit.asked),
        over_all_conditions: limit.scope == Scope::Worst,
    }
}
