//! What the exact model has to remark beside the averaged one.

use super::result::{Reach, SwitchedStability};
use crate::analysis::LoopResult;
use crate::converter::LoadKind;
use crate::design::CheckedDesign;
use crate::finding::{Finding, Severity};
use crate::linear::{Complex, Crossover, Margins};
use crate::quantity::{Unit, print_digits};
use crate::switched::RippleFacts;

/// Share of ½ fs about whose multiples a reading depends on the phase of the injected sine.
pub(super) const UNDEFINED_WITHIN: f64 = 0.01;
/// How much the margins of product and running loop may differ before it is told: crossover as a share, phase [°].
const APART: (f64, f64) = (0.05, 3.0);

/// What the remarks are made from.
pub(super) struct Case<'a> {
    pub(super) design: &'a CheckedDesign,
    /// The condition in words.
    pub(super) label: &'a str,
    pub(super) averaged: &'a LoopResult,
    pub(super) margins: &'a Margins,
    /// Margins of compensator times exact plant, where they were worth looking at.
    pub(super) product: Option<&'a Margins>,
    pub(super) stability: SwitchedStability,
    /// The multiplier that decides.
    pub(super) greatest: Option<Complex>,
    pub(super) reach: Reach,
    /// What ripple does at the comparator, where product and running loop lie apart.
    pub(super) ripple: Option<&'a RippleFacts>,
}

/// All remarks, the gravest first.
pub(super) fn remarks(case: &Case<'_>) -> Vec<Finding> {
    // Where ripple is fed back, that says why the averaged model ends early.
    let apart = product(case).or_else(|| holds_below(case));
    let mut findings: Vec<Finding> = [instability(case), apart, undefined(case)].into_iter().flatten().collect();
    findings.extend(limits(case.design));
    findings.sort_by_key(|finding| std::cmp::Reverse(finding.severity));
    findings
}

fn multiplier(greatest: Complex) -> String {
    let number = |value: f64| print_digits(value, Unit::One, 3);
    match greatest.im.abs() {
        0.0 => format!("a multiplier of {}", number(greatest.re)),
        im => format!("multipliers of {} ± j{}", number(greatest.re), number(im)),
    }
}

/// Both verdicts where they differ, and what kind of instability the switched loop has.
fn instability(case: &Case<'_>) -> Option<Finding> {
    let label = case.label;
    let Some(greatest) = case.greatest.filter(|_| !case.stability.is_stable()) else {
        let unstable = matches!(case.averaged.verdict, crate::linear::Verdict::Unstable { .. });
        return unstable.then(|| {
            let message = format!("The switched loop is stable at {label}, although the averaged one is not.");
            Finding::notice("", message).with_hint("the averaged model does not hold here; trust the multipliers")
        });
    };
    let fs = case.design.stage.switching_frequency;
    let how = match case.stability {
        SwitchedStability::PeriodDoubling => {
            let half = print_digits(fs / 2.0, Unit::Hertz, 3);
            format!("period doubling: what happens alternates from one period to the next, at {half}")
        }
        SwitchedStability::Oscillates { frequency_hz } => {
            let at = print_digits(frequency_hz, Unit::Hertz, 3);
            if frequency_hz < fs / 10.0 {
                format!("on the slow scale: an oscillation at {at} that grows over many periods")
            } else {
                format!("an oscillation at {at}")
            }
        }
        _ => "the steady period is left for good".to_owned(),
    };
    let of_averaged = if case.averaged.stable() {
        "; the averaged poles do not see it, nor do the margins"
    } else {
        ", as the averaged one is"
    };
    let message = format!("The switched loop is unstable at {label} by {}: {how}{of_averaged}.", multiplier(greatest));
    let hint = match case.stability {
        SwitchedStability::PeriodDoubling if case.design.law.current().is_some() => "add compensating ramp",
        SwitchedStability::PeriodDoubling => {
            "let less ripple through to the comparator: lower the highest compensator pole"
        }
        _ => "lower the gain or the crossover",
    };
    Some(Finding { severity: Severity::Problem, ..Finding::notice("", message).with_hint(hint) })
}

/// Compensator times plant against the running loop: they part where ripple is fed back.
fn product(case: &Case<'_>) -> Option<Finding> {
    let (product, running) = (case.product?.headline_crossover()?, case.margins.headline_crossover()?);
    let apart = (running.frequency_hz / product.frequency_hz - 1.0).abs() > APART.0
        || (running.phase_margin_deg - product.phase_margin_deg).abs() > APART.1;
    if !apart {
        return None;
    }
    let words = |crossover: &Crossover| {
        format!(
            "{} with {}",
            print_digits(crossover.frequency_hz, Unit::Hertz, 3),
            print_digits(crossover.phase_margin_deg, Unit::Degree, 3)
        )
    };
    let lost = running.phase_margin_deg < product.phase_margin_deg;
    let cause = match case.ripple {
        Some(ripple) if lost && ripple.step_resistance > 0.0 => {
            "The output's jump across the ESR reaches the comparator and takes damping away".to_owned()
        }
        Some(ripple) => {
            let factor = print_digits(ripple.slope_factor(), Unit::One, 3);
            format!("Ripple reaches the comparator and changes its gain by {factor}")
        }
        None => "Ripple reaches the comparator".to_owned(),
    };
    let message = format!(
        "{cause}: the running loop crosses at {}, compensator times plant at {} ({}).",
        words(running),
        words(product),
        case.label
    );
    Some(Finding::notice("", message).with_hint("lower the highest compensator pole or the ESR"))
}

/// The averaged model ends below the crossover it is read at.
fn holds_below(case: &Case<'_>) -> Option<Finding> {
    let crossover = case.averaged.margins.headline_crossover()?.frequency_hz;
    let holds = case.reach.frequency_hz.unwrap_or(0.0);
    if case.reach.by.is_none() || holds >= crossover {
        return None;
    }
    let to = if holds > 0.0 {
        format!("holds to {} only", print_digits(holds, Unit::Hertz, 3))
    } else {
        "holds nowhere".to_owned()
    };
    let message = format!(
        "The averaged model {to}, below its crossover of {} at {}: read the exact margins.",
        print_digits(crossover, Unit::Hertz, 3),
        case.label
    );
    Some(Finding::notice("", message))
}

/// A crossover where an analyser's reading depends on the phase of its sine.
fn undefined(case: &Case<'_>) -> Option<Finding> {
    let half = case.design.stage.switching_frequency / 2.0;
    let crossover = case.margins.headline_crossover()?.frequency_hz;
    let nearest = (crossover / half).round().max(1.0) * half;
    if (crossover - nearest).abs() > UNDEFINED_WITHIN * half {
        return None;
    }
    let message = format!(
        "The loop crosses 0 dB within 1 % of {} at {}, a multiple of half the switching frequency: what an analyser reads there depends on the phase of its sine.",
        print_digits(nearest, Unit::Hertz, 3),
        case.label
    );
    Some(Finding::notice("", message))
}

/// What the exact model leaves out of this design.
fn limits(design: &CheckedDesign) -> Vec<Finding> {
    let mut notes = Vec::new();
    if design.stage.bank.iter().any(|branch| branch.esl > 0.0) {
        let message = "The output bank's ESL is left out of the exact results: an edge into it would be an impulse.";
        notes.push(Finding::note("stage.bank.1.esl", message));
    }
    if design.stage.load == LoadKind::Power {
        let message = "The constant-power load is taken by its tangent in the exact results, too.";
        notes.push(Finding::note("stage.load", message));
    }
    notes
}
