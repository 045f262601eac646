//! Remarks about isolated feedback: what the spread of the transfer ratio does, whether LED, regulator and pull-up can give the control
//! voltage that the conditions need, where the fast path holds the gain up, what the regulator's finite gain costs.

use super::condition::NOMINAL;
use super::isolated::{AtRatio, IsolatedFigures};
use super::remarks::summaries;
use super::result::{Condition, ConditionResult, CrossoverWindow, Detail};
use crate::compensator::{Series, ShuntRegulator};
use crate::design::{Asked, CheckedDesign, Scope};
use crate::finding::{Finding, Remedy};
use crate::quantity::{Unit, print, print_digits};
use std::fmt::Write as _;

/// Share of the output that finite gain may move it by without more than a note.
const REGULATION: f64 = 5e-3;

/// One condition with what isolated feedback comes to.
struct Case<'a> {
    condition: &'a Condition,
    control_voltage: f64,
    figures: &'a IsolatedFigures,
}

/// The remarks over the nine conditions and a what-if beside them; none where the feedback is not isolated.
pub(super) fn isolated_remarks(
    design: &CheckedDesign,
    detail: Option<&Detail>,
    conditions: &[ConditionResult],
    window: &CrossoverWindow,
) -> Vec<Finding> {
    let Some(regulator) = design.compensator.isolated() else { return Vec::new() };
    let case = |condition, control_voltage, figures| Case { condition, control_voltage, figures };
    let mut cases: Vec<Case<'_>> = summaries(conditions)
        .filter_map(|(c, s)| Some(case(&c.condition, s.control.control_voltage, s.isolated.as_ref()?)))
        .collect();
    let nominal =
        conditions.get(NOMINAL).and_then(|c| Some((&c.condition, c.outcome.as_ref().ok()?.isolated.as_ref()?)));
    let mut findings: Vec<Finding> = nominal.map(|(at, figures)| spread(regulator, at, figures)).into_iter().collect();
    findings.extend(floor(design, nominal, window));
    findings.extend(regulation(design, &cases));
    cases.extend(
        detail
            .filter(|d| d.condition.levels.is_none())
            .and_then(|d| Some(case(&d.condition, d.control.control_voltage, d.isolated.as_ref()?))),
    );
    for (end, word) in ["least", "greatest"].into_iter().enumerate() {
        findings.extend(unstable_end(&cases, end, word).or_else(|| missed_end(design, &cases, end, word)));
    }
    let low = too_low(design, regulator, &cases);
    findings.extend(if low.is_some() { low } else { no_saturation(design, regulator, &cases) });
    findings.extend(too_high(regulator, &cases));
    findings
}

fn ratio(value: f64) -> String {
    print(value, Unit::Fraction)
}

fn headline(end: &AtRatio) -> String {
    match end.headline() {
        _ if !end.stable() => "an unstable loop".to_owned(),
        Some((hz, deg)) => {
            format!("{} with {}", print_digits(hz, Unit::Hertz, 3), print_digits(deg, Unit::Degree, 3))
        }
        None => "no crossover".to_owned(),
    }
}

/// Crossover and phase margin over the transfer ratio, at the nominal condition.
fn spread(regulator: &ShuntRegulator, at: &Condition, figures: &IsolatedFigures) -> Finding {
    let [least, nominal, greatest] = regulator.ratios;
    let decibels = print_digits(20.0 * (greatest / least).log10(), Unit::Decibel, 3);
    let message = format!(
        "Over the transfer ratio the loop gain moves by {decibels}: crossover and phase margin are {} at {}, {} at {} ({}). Curves and margins are those of {}.",
        headline(&figures.ends[0]),
        ratio(least),
        headline(&figures.ends[1]),
        ratio(greatest),
        at.label,
        ratio(nominal),
    );
    Finding::note("compensator.opto.transfer-ratio.nominal", message)
}

fn end_path(word: &str) -> String {
    format!("compensator.opto.transfer-ratio.{word}")
}

fn unstable_end(cases: &[Case<'_>], end: usize, word: &str) -> Option<Finding> {
    let unstable: Vec<&Case<'_>> = cases.iter().filter(|case| !case.figures.ends[end].stable()).collect();
    let first = unstable.first()?;
    let message = format!(
        "At the {word} transfer ratio, {}, the loop is not stable at {}{}.",
        ratio(first.figures.ends[end].ratio),
        first.condition.label,
        if unstable.len() > 1 { format!(" and {} more", unstable.len() - 1) } else { String::new() }
    );
    Some(
        Finding::problem(end_path(word), message)
            .with_hint("choose a narrower grade of optocoupler, or place the crossover for the greatest ratio"),
    )
}

/// A required phase margin that only the nominal ratio meets.
fn missed_end(design: &CheckedDesign, cases: &[Case<'_>], end: usize, word: &str) -> Option<Finding> {
    let limit = design.requirements.get(Asked::PhaseMargin, Scope::Worst)?.value;
    let margin = |case: &&Case<'_>| case.figures.ends[end].headline().map(|(_, deg)| deg);
    let with = cases.iter().filter_map(|case| Some((case, margin(&case)?)));
    let (case, worst) = with.min_by(|a, b| a.1.total_cmp(&b.1)).filter(|(_, deg)| *deg < limit)?;
    let message = format!(
        "At the {word} transfer ratio, {}, the phase margin is {} at {}, below {} required.",
        ratio(case.figures.ends[end].ratio),
        print_digits(worst, Unit::Degree, 3),
        case.condition.label,
        print(limit, Unit::Degree)
    );
    Some(
        Finding::notice(end_path(word), message)
            .with_hint("requirements are held against the nominal ratio; a narrower grade of optocoupler, or more margin, covers its spread"),
    )
}

/// An LED resistor of the E24 series that is no more than a value.
fn led_remedy(greatest: f64) -> Option<Remedy> {
    let value = *Series::E24.within(greatest / 2.5, greatest).last()?;
    Some(Remedy {
        label: format!("Set the LED resistor to {}", print(value, Unit::Ohm)),
        values: vec![("compensator.opto.led-resistor".to_owned(), value)],
        choices: Vec::new(),
    })
}

fn with_led(finding: Finding, greatest: f64) -> Finding {
    if greatest <= 0.0 {
        return finding
            .with_hint("raise the pull-up, feed the LED from a higher voltage, or take a better grade of optocoupler");
    }
    let finding = finding.with_hint(format!(
        "an LED resistor of {} at most does it; or raise the pull-up",
        print_digits(greatest, Unit::Ohm, 3)
    ));
    match led_remedy(greatest) {
        Some(remedy) => finding.with_remedy(remedy),
        None => finding,
    }
}

/// A control voltage below what the least transfer ratio reaches.
fn too_low(design: &CheckedDesign, regulator: &ShuntRegulator, cases: &[Case<'_>]) -> Option<Finding> {
    let lack = |case: &Case<'_>| case.figures.control_limits.0 - case.control_voltage;
    let case = cases.iter().max_by(|a, b| lack(a).total_cmp(&lack(b))).filter(|case| lack(case) > 0.0)?;
    let volts = |v| print_digits(v, Unit::Volt, 3);
    let (needed, label) = (volts(case.control_voltage), &case.condition.label);
    if case.control_voltage < regulator.saturation {
        let message = format!(
            "A control voltage of {needed} is needed at {label}, below the optocoupler's saturation voltage of {}.",
            volts(regulator.saturation)
        );
        let hint = "shift the ramp or the current sense upwards, so that the control voltage stays above it";
        return Some(Finding::problem("compensator.opto.saturation", message).with_hint(hint));
    }
    let message = format!(
        "A control voltage of {needed} is needed at {label}. At the least transfer ratio, {}, LED and regulator pull it down to {} only: the regulator's cathode is at its least voltage of {} then.",
        ratio(regulator.ratios[0]),
        volts(case.figures.control_limits.0),
        print(regulator.least_voltage, Unit::Volt)
    );
    let greatest = design.compensator.greatest_led_resistor(case.figures.feed, case.control_voltage).unwrap_or(0.0);
    Some(with_led(Finding::problem("compensator.opto.led-resistor", message), greatest))
}

/// A control voltage that all conditions have, but no way down to saturation: the controller cannot be told to stop.
fn no_saturation(design: &CheckedDesign, regulator: &ShuntRegulator, cases: &[Case<'_>]) -> Option<Finding> {
    let case = cases.iter().max_by(|a, b| a.figures.control_limits.0.total_cmp(&b.figures.control_limits.0))?;
    let reached = case.figures.control_limits.0;
    // A millivolt is no matter.
    if reached <= regulator.saturation + 1e-3 {
        return None;
    }
    let message = format!(
        "At the least transfer ratio, {}, LED and regulator pull the control voltage down to {}, not to saturation at {}: a load that drops away may leave the output high.",
        ratio(regulator.ratios[0]),
        print_digits(reached, Unit::Volt, 3),
        print(regulator.saturation, Unit::Volt)
    );
    let greatest = design.compensator.greatest_led_resistor(case.figures.feed, regulator.saturation).unwrap_or(0.0);
    Some(with_led(Finding::notice("compensator.opto.led-resistor", message), greatest))
}

/// A control voltage above the pull-up's supply, or one that leaves the regulator less than its least current.
fn too_high(regulator: &ShuntRegulator, cases: &[Case<'_>]) -> Option<Finding> {
    let excess = |case: &Case<'_>| case.control_voltage - case.figures.control_limits.1;
    let case = cases.iter().max_by(|a, b| excess(a).total_cmp(&excess(b))).filter(|case| excess(case) > 0.0)?;
    let volts = |v| print_digits(v, Unit::Volt, 3);
    let (needed, label) = (volts(case.control_voltage), &case.condition.label);
    if case.control_voltage > regulator.supply {
        let message = format!(
            "A control voltage of {needed} is needed at {label}, and the pull-up's supply is {}.",
            print(regulator.supply, Unit::Volt)
        );
        let hint = "raise the supply, or lower the ramp or the sense gain";
        return Some(Finding::problem("compensator.opto.supply", message).with_hint(hint));
    }
    let message = format!(
        "A control voltage of {needed} is needed at {label}. At the greatest transfer ratio, {}, the LED then carries so little that the regulator falls below its least current of {} above {}.",
        ratio(regulator.ratios[2]),
        print(regulator.least_current, Unit::Ampere),
        volts(case.figures.control_limits.1)
    );
    let hint = format!(
        "a bias resistor of {} at most gives it that current with the LED dark",
        print_digits(regulator.led_drop / regulator.least_current, Unit::Ohm, 3)
    );
    let finding = Finding::problem("compensator.opto.bias-resistor", message).with_hint(hint);
    Some(match regulator.bias_remedy() {
        Some(remedy) => finding.with_remedy(remedy),
        None => finding,
    })
}

/// The gain that the fast path holds, and the crossover that it allows at least; a notice where that is above the window.
fn floor(
    design: &CheckedDesign,
    nominal: Option<(&Condition, &IsolatedFigures)>,
    window: &CrossoverWindow,
) -> Option<Finding> {
    let gain = design.compensator.fast_path_gain()?;
    let (at, figures) = nominal?;
    let least_hz = figures.floor_crossover_hz;
    let above = window.upper.as_ref().filter(|edge| least_hz.is_some_and(|hz| hz > edge.frequency_hz));
    let greatest = design
        .compensator
        .greatest_led_resistor(design.compensator.dc_output_voltage(), design.compensator.isolated()?.saturation)?;
    let room = greatest > design.compensator.parts.led;
    let mut message = format!(
        "The fast path holds the gain at {} ({}) at least up to its pole, transfer ratio × pull-up / LED resistor",
        print_digits(gain, Unit::One, 3),
        print_digits(20.0 * gain.log10(), Unit::Decibel, 3),
    );
    let bound = least_hz.map(|hz| {
        let hz = print_digits(hz, Unit::Hertz, 3);
        format!(": gain and first zero cannot bring the crossover below {hz} at {}", at.label)
    });
    message.push_str(&bound.unwrap_or_default());
    message.push('.');
    if let Some(edge) = above {
        let edge = print_digits(edge.frequency_hz, Unit::Hertz, 3);
        let _ = write!(message, " That is above the crossover window's upper edge {edge}.");
    }
    let hint = if room {
        format!(
            "a greater LED resistor lowers it, up to {}; so does a fixed supply of the LED, which leaves no fast path",
            print_digits(greatest, Unit::Ohm, 3)
        )
    } else {
        "the LED resistor cannot grow for the sake of the operating point: lower the pull-up's gain by a fixed supply of the LED, which leaves no fast path".to_owned()
    };
    let place = "compensator.opto.led-resistor";
    Some(if above.is_some() { Finding::notice(place, message) } else { Finding::note(place, message) }.with_hint(hint))
}

/// How far the regulator's finite gain lets the output move over the conditions.
fn regulation(design: &CheckedDesign, cases: &[Case<'_>]) -> Option<Finding> {
    let errors = || cases.iter().map(|case| case.figures.output_error);
    let moved = errors().fold(f64::NEG_INFINITY, f64::max) - errors().fold(f64::INFINITY, f64::min);
    let share = moved / design.compensator.dc_output_voltage();
    if !share.is_finite() {
        return None;
    }
    let message = format!(
        "The regulator's gain of {} lets the output move by {} ({}) over the nine conditions, as its cathode follows the control voltage.",
        print_digits(design.compensator.isolated()?.dc_gain, Unit::One, 3),
        print_digits(moved, Unit::Volt, 2),
        print_digits(share, Unit::Fraction, 2)
    );
    let place = "compensator.shunt.dc-gain";
    Some(if share > REGULATION { Finding::notice(place, message) } else { Finding::note(place, message) })
}
