//! Remarks about the control law: subharmonic oscillation, a clamp below the current needed, too short an on-time, an inner loop
//! that is not sound.

use super::loop_model::Shared;
use super::remarks::summaries;
use super::result::{Condition, ConditionResult, ControlFigures, Detail};
use crate::compensator::Amplifier;
use crate::control::{ControlLaw, CurrentSense, Edge, ramp_remedy};
use crate::converter::OperatingPoint;
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::linear::Verdict;
use crate::quantity::{Unit, print, print_digits};

/// Quality factor of the sampling pair above which it is called lively. Common practice: near 1.
const LIVELY_QUALITY: f64 = 2.0;
/// Sense filter over the period above which the ripple at the comparator is far from the current's.
const FILTER_SHARE: f64 = 0.1;
/// Slope of the amplified ripple over the inner ramp's above which the averaged inner loop is doubtful.
const INNER_SLOPE: f64 = 1.0;

/// One condition with what the control law comes to.
struct Case<'a> {
    condition: &'a Condition,
    point: &'a OperatingPoint,
    control: &'a ControlFigures,
}

/// The remarks over the nine conditions and a what-if beside them.
pub(super) fn control_remarks(
    design: &CheckedDesign,
    shared: &Shared,
    detail: Option<&Detail>,
    conditions: &[ConditionResult],
) -> Vec<Finding> {
    if shared.law.voltage_mode() {
        return Vec::new();
    }
    let mut cases: Vec<Case<'_>> = summaries(conditions)
        .map(|(c, s)| Case { condition: &c.condition, point: &s.operating_point, control: &s.control })
        .collect();
    cases.extend(detail.filter(|d| d.condition.levels.is_none()).map(|d| Case {
        condition: &d.condition,
        point: &d.operating_point,
        control: &d.control,
    }));
    let period = design.stage.switching_frequency.recip();
    let mut findings = Vec::new();
    if let Some((edge, sense)) = shared.law.current() {
        findings.extend(subharmonic(edge, sense, &cases));
        findings.extend(too_short(edge, sense, shared.law.delay_s, period, &cases));
        findings.extend(slow_filter(sense.filter_s, period));
    }
    findings.extend(control_voltage(design, &shared.law, &cases));
    findings.extend(inner_loop(&cases));
    findings
}

/// Conditions in which the current oscillates at half the switching frequency, or nearly so.
fn subharmonic(edge: Edge, sense: &CurrentSense, cases: &[Case<'_>]) -> Option<Finding> {
    let sampled = || cases.iter().filter_map(|c| c.control.sampling.map(|sampling| (c, sampling)));
    let (case, worst) = sampled().min_by(|a, b| a.1.damping.total_cmp(&b.1.damping))?;
    let most = |ramp: fn(&crate::control::Sampling) -> f64| sampled().map(|(_, s)| ramp(&s)).fold(0.0, f64::max);
    let slope = |rate| print_digits(rate, Unit::VoltPerSecond, 3);
    let (present, boundary) = (sense.ramp(), most(|s| s.boundary_ramp));
    // Rounded up to three digits, so that what is shown is what is set.
    let recommended = rounded_up(most(|s| s.recommended_ramp));
    let remedy = ramp_remedy(recommended, format!("Set the ramp to {}", slope(recommended)));
    let label = &case.condition.label;
    let share = print_digits(edge_share(edge, case.point), Unit::Fraction, 3);
    let told = match worst.quality() {
        None => format!(
            "Subharmonic oscillation at {label}: with the sensed slope over {share} of the period and a ramp of {}, a deviation of the current is multiplied by {} every period, whatever the voltage loop does. The boundary over all conditions is {}.",
            slope(present),
            print_digits(worst.fast_multiplier, Unit::One, 3),
            slope(boundary)
        ),
        Some(quality) if quality > LIVELY_QUALITY => format!(
            "The sampling pair at half the switching frequency has a Qp of {} at {label}, above {LIVELY_QUALITY}: the current rings for many periods.",
            print_digits(quality, Unit::One, 3)
        ),
        Some(_) => return None,
    };
    let finding = if worst.subharmonic() {
        Finding::problem("control.slope", told)
    } else {
        Finding::notice("control.slope", told)
    };
    let hint = format!("a ramp of {} at the comparator keeps Qp at or below 1 in every condition", slope(recommended));
    Some(finding.with_hint(hint).with_remedy(remedy))
}

/// Rounded up to three digits.
fn rounded_up(value: f64) -> f64 {
    if value <= 0.0 {
        return 0.0;
    }
    let unit = 10_f64.powf(value.log10().floor() - 2.0);
    (value / unit * (1.0 - 1e-12)).ceil() * unit
}

fn edge_share(edge: Edge, point: &OperatingPoint) -> f64 {
    match edge {
        Edge::Peak => point.duty,
        Edge::Valley => 1.0 - point.duty,
    }
}

/// On-times that blanking, delay or the least on-time do not allow.
fn too_short(edge: Edge, sense: &CurrentSense, delay: f64, period: f64, cases: &[Case<'_>]) -> Vec<Finding> {
    let shortest = |share: fn(&OperatingPoint) -> f64| {
        let times = cases.iter().map(|c| (share(c.point) * period, c));
        times.min_by(|a, b| a.0.total_cmp(&b.0))
    };
    let mut findings = Vec::new();
    let sensed = match edge {
        Edge::Peak => shortest(|p| p.duty),
        Edge::Valley => shortest(|p| 1.0 - p.duty),
    };
    let what = if edge == Edge::Peak { "on-time" } else { "off-time" };
    let blind = sense.blanking_s + delay;
    if let Some((time, case)) = sensed.filter(|(time, _)| *time < blind) {
        let message = format!(
            "The {what} of {} at {} is shorter than blanking and delay together, {}: the comparator cannot end it in time, and the current is not under control.",
            print(time, Unit::Second),
            case.condition.label,
            print(blind, Unit::Second)
        );
        findings.push(
            Finding::problem("control.blanking", message)
                .with_hint("shorten the blanking, lower the switching frequency, or narrow the input range"),
        );
    }
    let on = shortest(|p| p.duty).filter(|(time, _)| *time < sense.on_time_least_s);
    if let Some((time, case)) = on {
        let message = format!(
            "An on-time of {} is needed at {}, below the least on-time of {}: the converter skips periods there.",
            print(time, Unit::Second),
            case.condition.label,
            print(sense.on_time_least_s, Unit::Second)
        );
        findings.push(
            Finding::problem("control.on-time.least", message)
                .with_hint("lower the switching frequency or narrow the input range"),
        );
    }
    findings
}

fn slow_filter(filter: f64, period: f64) -> Option<Finding> {
    (filter > FILTER_SHARE * period).then(|| {
        let message = format!(
            "The sense filter's time constant, {}, is above a tenth of the period: the comparator sees little of the ripple, and the sampling effect near half the switching frequency is approximate.",
            print(filter, Unit::Second)
        );
        Finding::notice("control.sense.filter", message).with_hint("a filter against switching noise needs far less")
    })
}

/// Control voltages beyond the clamp or the error amplifier.
fn control_voltage(design: &CheckedDesign, law: &ControlLaw, cases: &[Case<'_>]) -> Vec<Finding> {
    let mut findings = Vec::new();
    let needed = |case: &&Case<'_>| case.control.control_voltage;
    let Some(most) = cases.iter().max_by(|a, b| needed(a).total_cmp(&needed(b))) else { return findings };
    let volts = |v| print_digits(v, Unit::Volt, 4);
    let amperes =
        |case: &Case<'_>| print_digits(case.point.sense_ratio * case.point.switched_current.peak, Unit::Ampere, 4);
    if let Some(clamp) = law.clamp.filter(|clamp| needed(&most) > *clamp) {
        let message = format!(
            "The clamp, {}, is below the control voltage of {} that a peak current of {} needs at {}: the output falls there.",
            volts(clamp),
            volts(needed(&most)),
            amperes(most),
            most.condition.label
        );
        findings.push(
            Finding::problem("control.clamp", message).with_hint("raise the clamp, lower the sense gain or the ramp"),
        );
    }
    // What limits isolated feedback is told by its own remarks, over the spread of its transfer ratio.
    if design.compensator.isolated().is_some() {
        return findings;
    }
    let (least, greatest) = design.compensator.output_limits();
    let lowest = cases.iter().min_by(|a, b| needed(a).total_cmp(&needed(b))).filter(|case| needed(case) < least);
    let above = (needed(&most) > greatest).then_some((most, greatest, "greatest"));
    if let Some((case, limit, end)) = above.or(lowest.map(|case| (case, least, "least"))) {
        let message = format!(
            "A control voltage of {} is needed at {}, and the error amplifier stops at {}.",
            volts(needed(&case)),
            case.condition.label,
            volts(limit)
        );
        let path = match design.compensator.amplifier {
            Amplifier::OpAmp(_) => format!("compensator.op-amp.output-{end}"),
            Amplifier::Transconductance(_) => format!("compensator.transconductance.output-{end}"),
            Amplifier::ShuntRegulator(_) => return findings,
            Amplifier::Digital(_) => "compensator.digital.output-range".to_owned(),
        };
        findings.push(
            Finding::problem(path, message).with_hint("change the sense gain or the offset, or the amplifier's supply"),
        );
    }
    findings
}

/// The inner loop of average current mode.
fn inner_loop(cases: &[Case<'_>]) -> Vec<Finding> {
    let mut findings = Vec::new();
    let inner = || cases.iter().filter_map(|c| c.control.inner.as_ref().map(|inner| (c, inner)));
    if let Some((case, inner)) = inner().find(|(_, inner)| !matches!(inner.verdict, Verdict::Stable { .. })) {
        let message = match &inner.verdict {
            Verdict::Undecided { reason } => {
                format!("Stability of the inner loop undecided at {}: {reason}.", case.condition.label)
            }
            _ => format!("The inner current loop is unstable at {}.", case.condition.label),
        };
        findings.push(Finding::problem("control.inner.r2", message).with_hint("lower R2 or the sense gain"));
    }
    let steepest = inner().max_by(|a, b| a.1.slope_ratio.total_cmp(&b.1.slope_ratio));
    if let Some((case, inner)) = steepest.filter(|(_, inner)| inner.slope_ratio > INNER_SLOPE) {
        let message = format!(
            "At the inner amplifier's output the current's falling ripple is {} times as steep as the ramp at {}: the comparator meets the ramp more than once, and the averaged inner loop is doubtful.",
            print_digits(inner.slope_ratio, Unit::One, 3),
            case.condition.label
        );
        findings
            .push(Finding::notice("control.inner.r2", message).with_hint("lower the inner gain, or raise the ramp"));
    }
    let outside = |v: f64, (least, greatest): (f64, f64)| !(least..=greatest).contains(&v);
    if let Some((case, inner)) = inner().find(|(_, i)| outside(i.output_voltage, i.output_limits)) {
        let message = format!(
            "The inner amplifier must give {} at {}, and gives {} to {}.",
            print_digits(inner.output_voltage, Unit::Volt, 4),
            case.condition.label,
            print(inner.output_limits.0, Unit::Volt),
            print(inner.output_limits.1, Unit::Volt)
        );
        let place = if inner.output_voltage > inner.output_limits.1 {
            "control.inner.output-greatest"
        } else {
            "control.inner.output-least"
        };
        findings.push(Finding::problem(place, message).with_hint("lower the ramp, or shift its lowest point"));
    }
    findings
}
