//! Deviation, recovery, settling and peaks of a transient, read off its periods.

use super::event::TransientEvent;
use super::model::Model;
use super::result::TransientFigures;
use crate::switched::{Cycle, Run};

/// What the figures need to know of the event.
#[derive(Clone, Copy, Debug)]
pub(super) struct Asked {
    pub(super) event: TransientEvent,
    /// Time of the first period's begin, and the period [s].
    pub(super) from_s: f64,
    pub(super) period_s: f64,
    /// Half width of the settling band [V].
    pub(super) band_v: f64,
    /// Voltage before where nothing is shown of it [V].
    pub(super) at_first_v: f64,
    /// When the event ends: an overload's end, else 0 [s].
    pub(super) over_s: f64,
}

/// The last of so many parts of the run is taken as its end …
const END: usize = 50;
/// … of at most so many periods.
const END_PERIODS: usize = 200;

pub(super) fn figures(model: &Model, run: &Run, asked: &Asked) -> TransientFigures {
    let time = |k: usize| asked.from_s + (k as f64 + 0.5) * asked.period_s;
    let begin = run.cycles.iter().enumerate().position(|(k, _)| time(k) >= 0.0).unwrap_or(run.cycles.len());
    let (ahead, after) = run.cycles.split_at(begin);
    let before_v = mean(ahead).unwrap_or(asked.at_first_v);
    let ending = (after.len() / END).clamp(1, END_PERIODS);
    let after_v = mean(&after[after.len().saturating_sub(ending)..]);
    let mut figures = TransientFigures {
        before_v,
        after_v,
        periods: run.cycles.len(),
        rested: run.rested,
        skipped: run.skipped,
        limited: run.limited.clone(),
        ..peaks(model, run)
    };
    let Some(final_v) = after_v else { return figures };
    let against = match asked.event {
        TransientEvent::StartUp | TransientEvent::ReferenceStep => final_v,
        _ => before_v,
    };
    // Beyond the final value: on the side the voltage comes to it.
    let side = (final_v - before_v).signum();
    let beyond = against.total_cmp(&before_v).is_ne();
    let offset = |k: &usize| after[*k].mean_v - against;
    let first = (0..after.len()).max_by(|a, b| {
        let size = |k: &usize| if beyond { offset(k) * side } else { offset(k).abs() };
        size(a).total_cmp(&size(b)).then(b.cmp(a))
    });
    if let Some(k) = first {
        figures.deviation_v = Some(offset(&k));
        figures.deviation_at_s = Some(time(begin + k));
        let sign = offset(&k).signum();
        let other = after[k..].iter().map(|c| (c.mean_v - final_v) * sign).fold(0.0, f64::min);
        figures.rebound_v = Some(other * sign);
    }
    let outside = after.iter().rposition(|c| (c.mean_v - final_v).abs() > asked.band_v);
    figures.settling_s = match outside {
        None => Some(0.0),
        // Outside so near the end that it cannot be called settled.
        Some(k) if k + ending >= after.len() => None,
        Some(k) => Some((time(begin + k + 1) - asked.over_s).max(0.0)),
    };
    figures
}

fn mean(cycles: &[Cycle]) -> Option<f64> {
    (!cycles.is_empty()).then(|| cycles.iter().map(|c| c.mean_v).sum::<f64>() / cycles.len() as f64)
}

/// Extremes, ripple included.
fn peaks(model: &Model, run: &Run) -> TransientFigures {
    let of = |place: usize| run.extremes.get(place).copied().filter(|e| e.0 <= e.1).unwrap_or((0.0, 0.0));
    let (least_v, greatest_v) = of(0);
    let size = |place: &usize| of(*place).0.abs().max(of(*place).1.abs());
    TransientFigures {
        least_v,
        greatest_v,
        peak_inductor_a: model.inductors.iter().map(size).fold(0.0, f64::max),
        peak_switch_a: of(model.switch).1.max(0.0),
        ..TransientFigures::default()
    }
}
