//! Remarks about an input filter: the impedance criterion, its resonance against the crossover, instability it causes, and the
//! damping that mends it.
//!
//! *Source* of the rules: Middlebrook 1976 for the criterion; 6 dB and the neighbourhood of the crossover are common practice.

use super::filter_result::InputFilterResult;
use super::result::{ConditionResult, ConditionSummary, Detail};
use crate::converter::{Damping, InputFilter};
use crate::design::CheckedDesign;
use crate::finding::{Finding, Remedy};
use crate::linear::Verdict;
use crate::quantity::{Unit, parse, print_digits};

/// A damped filter's peak is put at this share of the least input impedance: 6 dB below.
pub(super) const DAMPED_BELOW: f64 = 0.5;
/// Margin below which the criterion is called narrowly met [dB].
const NARROW_DB: f64 = 6.0;
/// A damped peak within this factor of the one wanted has reached it.
const REACHED: f64 = 1.1;
/// Damping is offered only where it leaves no more than this part of the present peak.
const HELPS: f64 = 0.95;
/// A resonance below this many times the crossover stands where the loop is at work.
const NEAR: f64 = 3.0;
/// A damping capacitor beyond this many times the input capacitor says that the filter itself is wrong.
const UNWIELDY: f64 = 10.0;

/// A condition with what was found of the filter at it.
type At<'a> = (&'a str, &'a ConditionSummary, &'a InputFilterResult);

/// All remarks about the input filter over the nine conditions.
pub(super) fn filter_remarks(
    design: &CheckedDesign,
    detail: Option<&Detail>,
    conditions: &[ConditionResult],
) -> Vec<Finding> {
    let Some(filter) = &design.stage.input_filter else { return Vec::new() };
    let found: Vec<At<'_>> = conditions
        .iter()
        .filter_map(|c| {
            let summary = c.outcome.as_ref().ok()?;
            Some((c.condition.label.as_str(), summary, summary.input_filter.as_ref()?))
        })
        .collect();
    let remedy = remedy(filter, &found);
    let mut findings: Vec<Finding> = unstable_by_filter(&found).into_iter().collect();
    findings.extend(criterion(filter, &found));
    findings.extend(near_crossover(filter, &found));
    findings.extend(what_if(detail));
    // One press is enough: the gravest remark carries it.
    if let (Some((remedy, hint)), false) = (remedy, findings.is_empty()) {
        let first = findings.remove(0).with_hint(hint);
        findings.insert(0, remedy.into_iter().fold(first, Finding::with_remedy));
    }
    findings
}

/// Whether a loop is unstable and would not be without its filter.
pub(super) fn caused_by_filter(result: Option<&InputFilterResult>) -> bool {
    result.is_some_and(|r| r.stable_without == Some(true))
}

/// What to add to the sentence about an unstable loop: the filter that makes it so.
pub(super) fn cause(result: &InputFilterResult) -> String {
    format!(
        "The input filter's resonance at {} makes it so: without the filter the loop is stable.",
        print_digits(result.resonance_hz, Unit::Hertz, 3)
    )
}

fn unstable_by_filter(found: &[At<'_>]) -> Option<Finding> {
    let unstable: Vec<&At<'_>> = found.iter().filter(|(_, _, r)| caused_by_filter(Some(r))).collect();
    let (label, summary, result) = unstable.first()?;
    let Verdict::Unstable { frequency_hz, growth_per_s, .. } = &summary.loop_gain.verdict else { return None };
    let more = match unstable.len() {
        1 => String::new(),
        n => format!(" So in {n} of the nine conditions."),
    };
    let message = format!(
        "Unstable at {label} because of the input filter: oscillation at {} growing with {} per second. {}{more}",
        print_digits(*frequency_hz, Unit::Hertz, 3),
        print_digits(*growth_per_s, Unit::One, 3),
        cause(result)
    );
    Some(Finding::problem("stage.input-filter", message))
}

/// A condition beside the nine that the filter makes unstable.
fn what_if(detail: Option<&Detail>) -> Option<Finding> {
    let detail = detail.filter(|d| d.condition.levels.is_none())?;
    let result = &detail.input_filter.as_ref()?.result;
    let message = format!("Unstable at {} because of the input filter. {}", detail.condition.label, cause(result));
    caused_by_filter(Some(result)).then(|| Finding::problem("stage.input-filter", message))
}

/// The criterion violated, or met by less than 6 dB.
fn criterion(filter: &InputFilter, found: &[At<'_>]) -> Option<Finding> {
    let (label, _, result) = found
        .iter()
        .min_by(|a, b| a.2.least_margin().margin_db.total_cmp(&b.2.least_margin().margin_db))
        .filter(|(_, _, r)| r.least_margin().margin_db < NARROW_DB)?;
    let margin = result.least_margin();
    let sizes = format!(
        "{} of the filter against {} of the {} at {}",
        print_digits(margin.filter_ohm, Unit::Ohm, 3),
        print_digits(margin.converter_ohm, Unit::Ohm, 3),
        margin.against.name(),
        print_digits(margin.frequency_hz, Unit::Hertz, 3)
    );
    let bare = if filter.damping == Damping::None { " No damping branch is fitted." } else { "" };
    if margin.margin_db < 0.0 {
        let message = format!("The impedance criterion is violated at {label}: {sizes}.{bare}");
        return Some(Finding::notice("stage.input-filter", message));
    }
    let by = print_digits(margin.margin_db, Unit::Decibel, 2);
    let message = format!("The impedance criterion is met by only {by} at {label}: {sizes}; 6 dB are usual.{bare}");
    Some(Finding::note("stage.input-filter", message))
}

/// A resonance that the criterion does not keep apart, near or below the crossover.
fn near_crossover(filter: &InputFilter, found: &[At<'_>]) -> Option<Finding> {
    let crossover = |s: &ConditionSummary| s.loop_gain.margins.headline_crossover().map(|c| c.frequency_hz);
    let (label, at) = found
        .iter()
        .filter(|(_, _, r)| r.least_margin().margin_db < 0.0)
        .filter_map(|(label, s, r)| crossover(s).filter(|f| r.peak_hz < NEAR * f).map(|f| (label, f)))
        .max_by(|a, b| a.1.total_cmp(&b.1))?;
    let resonance = filter.resonance_hz();
    let place = if resonance < at / NEAR { "below" } else { "near" };
    let message = format!(
        "The input filter's resonance {} stands {place} the crossover {} at {label}, where the loop depends on it.",
        print_digits(resonance, Unit::Hertz, 3),
        print_digits(at, Unit::Hertz, 3)
    );
    Some(Finding::notice("stage.input-filter", message))
}

/// Damping for the worst of the conditions where it helps, and the same in words.
fn remedy(filter: &InputFilter, found: &[At<'_>]) -> Option<(Option<Remedy>, String)> {
    let least = found.iter().map(|(_, _, r)| r.least_input_impedance_ohm).min_by(f64::total_cmp)?;
    let wanted = least * DAMPED_BELOW;
    let damping = filter.damping_for(wanted);
    let part_unit = if damping.kind == Damping::Inductor { Unit::Henry } else { Unit::Farad };
    let usable = |value: f64, unit: Unit| {
        let (smallest, greatest) = unit.usable_magnitudes();
        (smallest..=greatest).contains(&value)
    };
    let present = found.iter().map(|(_, _, r)| r.peak_ohm).fold(0.0, f64::max);
    if damping.peak > present * HELPS
        || !usable(damping.resistance, Unit::Ohm)
        || !usable(damping.reactance_value, part_unit)
    {
        return Some((None, beyond_damping(filter, wanted)));
    }
    let words = damping.in_words();
    let mut hint = format!(
        "damp the filter with {words}: its peak falls to {} at {}",
        print_digits(damping.peak, Unit::Ohm, 3),
        print_digits(damping.peak_hz, Unit::Hertz, 3)
    );
    if damping.kind == Damping::Capacitor && damping.ratio > UNWIELDY {
        hint.push_str("; a smaller inductor or a larger input capacitor would need less");
    }
    if damping.peak > wanted * REACHED {
        hint = format!("{hint}; {}", beyond_damping(filter, wanted));
    }
    let (key, part, unit) = match damping.kind {
        Damping::Inductor => ("inductor", "stage.input-filter.damping.inductance", Unit::Henry),
        _ => ("capacitor", "stage.input-filter.damping.capacitance", Unit::Farad),
    };
    let remedy = Remedy {
        label: format!("Damp with {words}"),
        values: vec![
            ("stage.input-filter.damping.resistance".into(), rounded(damping.resistance, Unit::Ohm)),
            (part.into(), rounded(damping.reactance_value, unit)),
        ],
        choices: vec![("stage.input-filter.damping".into(), key.into())],
    };
    Some((Some(remedy), hint))
}

/// What to change where no damping branch brings the filter down to an impedance [Ω].
fn beyond_damping(filter: &InputFilter, wanted: f64) -> String {
    let ohms = |value| print_digits(value, Unit::Ohm, 3);
    let (direct, wanted_text) = (filter.source_resistance + filter.winding, ohms(wanted));
    if direct > wanted {
        return format!(
            "no damping brings the filter down to {wanted_text}: source and winding alone have {}; lower their resistance, or draw less power",
            ohms(direct)
        );
    }
    if filter.esr > wanted {
        return format!(
            "this damping cannot bring the filter down to {wanted_text}: the input capacitor's ESR is {}; lower it, or enlarge the capacitor",
            ohms(filter.esr)
        );
    }
    format!(
        "this damping cannot bring the filter down to {wanted_text}; a smaller inductor or a larger input capacitor lowers it"
    )
}

/// The number as it is printed to three digits.
fn rounded(value: f64, unit: Unit) -> f64 {
    parse(&print_digits(value, unit, 3), unit).unwrap_or(value)
}
