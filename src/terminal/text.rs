//! The report as text for people: aligned columns, one section per subject, every number with its condition.

use super::check::Report;
use super::{input_filter, isolated};
use crate::analysis::{Analysis, Curves, Detail, LimitKind, RequirementVerdict};
use crate::design::{CheckedDesign, printable};
use crate::finding::Finding;
use crate::linear::Verdict;
use crate::quantity::{Unit, print, print_digits};
use std::fmt::Write as _;
use std::io::{self, Write};

/// Width of the column of names [characters].
const NAMES: usize = 26;
/// Width of a condition in words.
const CONDITIONS: usize = 46;

/// Width of lines of running text [characters].
const LINE: usize = 100;

/// Writes the report of a design that can be used; `response` when frequencies were asked for.
pub(super) fn write(
    report: &Report,
    (design, analysis): &(CheckedDesign, Analysis),
    response: bool,
    out: &mut impl Write,
) -> io::Result<()> {
    let mut text = heading(report);
    let _ = writeln!(text, "At {}\n", analysis.condition.label);
    if let Ok(detail) = &analysis.shown {
        operating_point(&mut text, detail, analysis);
        landmarks(&mut text, detail);
        input_filter(&mut text, detail);
        over_the_ratio(&mut text, analysis);
        text.push_str(&super::digital::text(detail));
        stability(&mut text, detail);
    }
    readouts(&mut text, analysis, design);
    if let Ok(detail) = &analysis.shown {
        load_step_line(&mut text, design);
        if response {
            response_table(&mut text, &detail.curves);
        }
    }
    if let (Some(switched), Ok(detail)) = (&report.switched, &analysis.shown) {
        super::switched::text(&mut text, switched, detail);
    }
    if let Some(sweep) = &report.load_sweep {
        super::sweep::text(&mut text, sweep);
    }
    requirements(&mut text, &analysis.requirements);
    findings(&mut text, &report.findings);
    let _ = writeln!(text, "{}\n", verdict(analysis));
    out.write_all(printable(&text).as_bytes())
}

/// Writes why a file cannot be used.
pub(super) fn write_unusable(report: &Report, out: &mut impl Write) -> io::Result<()> {
    let mut text = heading(report);
    findings(&mut text, &report.findings);
    let _ = writeln!(text, "Cannot be used.\n");
    out.write_all(printable(&text).as_bytes())
}

/// Title and file on one line, whatever line ends they hold.
fn heading(report: &Report) -> String {
    let one_line = |text: &str| text.replace(['\n', '\r'], " ");
    let file = one_line(&report.file);
    match &report.title {
        Some(title) => format!("{} ({file})\n", one_line(title)),
        None => format!("{file}\n"),
    }
}

/// A name padded to its column, one that fills it set apart by a space; widths are counted in characters, as all that is printed
/// here is one column wide.
pub(super) fn padded(text: &str, width: usize) -> String {
    let missing = width.saturating_sub(text.chars().count()).max(1);
    format!("{text}{}", " ".repeat(missing))
}

pub(super) fn row(text: &mut String, name: &str, value: &str) {
    let _ = writeln!(text, "  {}{value}", padded(name, NAMES));
}

/// The conduction mode here, and how many of the nine conditions share it where not all do.
fn conduction(detail: &Detail, analysis: &Analysis) -> String {
    let mode = detail.operating_point.conduction;
    let modes = || analysis.conditions.iter().filter_map(|row| row.outcome.as_ref().ok());
    let alike = modes().filter(|summary| summary.operating_point.conduction == mode).count();
    if alike == modes().count() {
        return mode.word().to_owned();
    }
    format!("{}; so in {alike} of the nine conditions", mode.word())
}

fn operating_point(text: &mut String, detail: &Detail, analysis: &Analysis) {
    let point = &detail.operating_point;
    let amperes = |value| print(value, Unit::Ampere);
    text.push_str("Operating point\n");
    row(text, "Duty ratio", &print(point.duty, Unit::Fraction));
    if let Some(second) = point.second_duty {
        row(text, "Rectifier conducts", &format!("{} of the period", print(second, Unit::Fraction)));
    }
    row(text, "Conduction", &conduction(detail, analysis));
    for figure in &point.further {
        row(text, figure.name, &figure.text(4));
    }
    for inductor in &point.inductors {
        let current = &inductor.current;
        let figures = format!(
            "{} average, {} ripple peak to peak, {} peak, {} RMS",
            amperes(current.average),
            amperes(current.ripple),
            amperes(current.peak),
            amperes(current.rms)
        );
        let of = if inductor.name == "inductor" { " current" } else { "" };
        row(text, &format!("{}{of}", capitalised(inductor.name)), &figures);
    }
    row(text, "Input current", &amperes(point.input_current));
    if point.load_voltage < point.output_voltage {
        let sensed = print(point.output_voltage, Unit::Volt);
        let value = format!(
            "{}, behind the second stage; {sensed} is regulated before it",
            print(point.load_voltage, Unit::Volt)
        );
        row(text, "Voltage at the load", &value);
    }
    row(text, "Conduction losses", &print(point.conduction_loss, Unit::Watt));
    row(text, "Control voltage", &print(detail.control.control_voltage, Unit::Volt));
    if let Some(load) = detail.boundary_load {
        row(text, "Discontinuous below", &format!("{} of load", amperes(load)));
    }
    text.push('\n');
}

fn input_filter(text: &mut String, detail: &Detail) {
    let rows = input_filter::rows(detail);
    if rows.is_empty() {
        return;
    }
    text.push_str("Input filter against converter\n");
    for (name, value) in rows {
        row(text, &name, &value);
    }
    text.push('\n');
}

/// Isolated feedback: what the ends of the transfer ratio make of every condition.
fn over_the_ratio(text: &mut String, analysis: &Analysis) {
    let rows = isolated::rows(analysis);
    if rows.is_empty() {
        return;
    }
    text.push_str("Over the transfer ratio\n");
    for (condition, ends) in rows {
        let _ = writeln!(text, "  {}{ends}", padded(&condition, CONDITIONS));
    }
    text.push('\n');
}

fn capitalised(name: &str) -> String {
    let mut letters = name.chars();
    letters.next().map(|first| first.to_uppercase().chain(letters).collect()).unwrap_or_default()
}

fn landmarks(text: &mut String, detail: &Detail) {
    text.push_str("Landmarks of the plant\n");
    for mark in &detail.landmarks {
        let value = print(mark.frequency_hz, Unit::Hertz);
        row(text, mark.name, &format!("{}{}", padded(&value, 14), mark.formula));
    }
    text.push('\n');
}

fn stability(text: &mut String, detail: &Detail) {
    let margins = &detail.loop_gain.margins;
    text.push_str("Loop\n");
    let words = match &detail.loop_gain.verdict {
        Verdict::Stable { conditionally: false } => "stable".to_owned(),
        Verdict::Stable { conditionally: true } => "conditionally stable: a lower gain makes it unstable".to_owned(),
        Verdict::Unstable { frequency_hz, growth_per_s, .. } => format!(
            "UNSTABLE: oscillation at {}, growing with {} per second",
            print(*frequency_hz, Unit::Hertz),
            print_digits(*growth_per_s, Unit::One, 3)
        ),
        Verdict::Undecided { reason } => format!("undecided: {reason}"),
    };
    row(text, "Stability", &words);
    // One falling crossover is the headline below; more than that are listed.
    if margins.crossovers.len() > 1 {
        for crossover in &margins.crossovers {
            let way = if crossover.falling { "falling" } else { "rising" };
            let value = format!(
                "{}{} phase margin, {way}, {}",
                padded(&print(crossover.frequency_hz, Unit::Hertz), 14),
                print(crossover.phase_margin_deg, Unit::Degree),
                print_digits(crossover.slope_db_per_decade, Unit::DecibelPerDecade, 3)
            );
            row(text, "  crosses 0 dB at", &value);
        }
    }
}

fn readouts(text: &mut String, analysis: &Analysis, design: &CheckedDesign) {
    let stands_still = analysis.shown.is_ok() && design.events.load_step.change == 0.0;
    // The control voltage stands with the operating point already.
    for readout in analysis.readouts.iter().filter(|readout| readout.key != "control-voltage") {
        let of_step = matches!(readout.key, "load-step-deviation" | "settling");
        if of_step && stands_still {
            row(text, readout.name, "no step");
            continue;
        }
        let here = readout.value.map_or(readout.absent.to_owned(), |value| readout.said(value, 4));
        let here = if readout.greyed { format!("({here})") } else { here };
        let worst = readout.worst.as_ref().map_or(String::new(), |worst| {
            let value = worst.value.map_or("none".to_owned(), |value| readout.said(value, 4));
            format!("worst {} at {}", padded(&value, 12), worst.condition)
        });
        row(text, readout.name, format!("{}{worst}", padded(&here, 16)).trim_end());
    }
    text.push('\n');
}

fn load_step_line(text: &mut String, design: &CheckedDesign) {
    let step = &design.events.load_step;
    if step.change == 0.0 {
        text.push_str("No load step is entered: its change is zero.\n\n");
        return;
    }
    let _ = writeln!(
        text,
        "The load step is {} at {}; settled means within {} of the output.\n",
        print(step.change, Unit::Ampere),
        print(step.slew, Unit::AmperePerSecond),
        print(design.events.settling_band, Unit::Fraction)
    );
}

fn response_table(text: &mut String, curves: &Curves) {
    const WIDTHS: [usize; 6] = [12, 22, 22, 22, 22, 22];
    let line = |cells: [String; 6]| {
        let joined: String = cells.iter().zip(WIDTHS).map(|(cell, width)| padded(cell, width)).collect();
        format!("  {}\n", joined.trim_end())
    };
    text.push_str("Response\n");
    let titles = ["frequency", "plant", "compensator", "loop", "output impedance", "line to output"];
    text.push_str(&line(titles.map(str::to_owned)));
    for (k, frequency) in curves.frequencies_hz.iter().enumerate() {
        let pair = |gain: &[f64], unit: Unit, phase: &[f64]| match (gain.get(k), phase.get(k)) {
            (Some(gain), Some(phase)) => format!("{}, {}", print(*gain, unit), print(*phase, Unit::Degree)),
            _ => String::new(),
        };
        text.push_str(&line([
            print(*frequency, Unit::Hertz),
            pair(&curves.plant_db, Unit::Decibel, &curves.plant_deg),
            pair(&curves.compensator_db, Unit::Decibel, &curves.compensator_deg),
            pair(&curves.loop_db, Unit::Decibel, &curves.loop_deg),
            pair(&curves.output_impedance_ohm, Unit::Ohm, &curves.output_impedance_deg),
            pair(&curves.line_to_output_db, Unit::Decibel, &curves.line_to_output_deg),
        ]));
    }
    text.push('\n');
}

fn requirements(text: &mut String, verdicts: &[RequirementVerdict]) {
    if verdicts.is_empty() {
        text.push_str("Requirements\n  none\n\n");
        return;
    }
    text.push_str("Requirements\n");
    for verdict in verdicts {
        let sign = match verdict.kind {
            LimitKind::AtLeast => "≥",
            LimitKind::AtMost => "≤",
        };
        let found = match verdict.value {
            Some(value) => format!("{} at {}", print(value, verdict.unit), verdict.condition),
            None => verdict.reason.clone(),
        };
        let met = if verdict.met { "met" } else { "MISSED" };
        let limit = format!("{sign} {}", print(verdict.limit, verdict.unit));
        let _ = writeln!(text, "  {}{}{}{found}", padded(met, 8), padded(verdict.name, 34), padded(&limit, 14));
    }
    text.push('\n');
}

pub(super) fn findings(text: &mut String, findings: &[Finding]) {
    if findings.is_empty() {
        return;
    }
    text.push_str("Findings\n");
    for finding in findings {
        let place = if finding.place.is_empty() { "the design" } else { &finding.place };
        let _ = writeln!(text, "  {}{place}", padded(finding.severity.word(), 9));
        wrapped(text, &finding.message);
        if let Some(hint) = &finding.hint {
            wrapped(text, &format!("Hint: {hint}"));
        }
    }
    text.push('\n');
}

/// Running text, broken between words and set in.
fn wrapped(text: &mut String, message: &str) {
    const INDENT: &str = "           ";
    let mut used = 0;
    for word in message.split_whitespace() {
        let length = word.chars().count();
        if used > 0 && used + 1 + length <= LINE - INDENT.len() {
            let _ = write!(text, " {word}");
            used += 1 + length;
        } else {
            let start = if used == 0 { "" } else { "\n" };
            let _ = write!(text, "{start}{INDENT}{word}");
            used = length;
        }
    }
    text.push('\n');
}

/// The closing sentence: the shown condition first when it is none of the nine, then the nine, then the requirements.
fn verdict(analysis: &Analysis) -> String {
    let Ok(detail) = &analysis.shown else {
        return "The condition asked for has no results.".into();
    };
    let loops = || analysis.conditions.iter().filter_map(|row| row.outcome.as_ref().ok()).map(|row| &row.loop_gain);
    let all = analysis.conditions.len();
    let mut parts = Vec::new();
    if analysis.condition.levels.is_none() && !detail.loop_gain.stable() {
        parts.push(format!("{} at the condition asked for", unsettled(&detail.loop_gain.verdict)));
    }
    let stable = loops().filter(|row| row.stable()).count();
    let unstable = loops().filter(|row| matches!(row.verdict, Verdict::Unstable { .. })).count();
    let undecided = loops().filter(|row| matches!(row.verdict, Verdict::Undecided { .. })).count();
    let absent = all - loops().count();
    if stable == all {
        parts.push("stable in all nine conditions".into());
    } else {
        let counts = [(unstable, "unstable"), (undecided, "undecided"), (absent, "without results")];
        let told = counts.iter().filter(|(count, _)| *count > 0);
        parts.extend(told.map(|(count, word)| match *count {
            count if count == all => format!("{word} in all nine conditions"),
            count => format!("{word} in {count} of the nine conditions"),
        }));
    }
    let missed = analysis.requirements.iter().filter(|requirement| !requirement.met).count();
    parts.push(match (analysis.requirements.len(), missed) {
        (0, _) => "nothing is required".into(),
        (_, 0) => "all requirements are met".into(),
        (asked, missed) => format!("{missed} of {asked} requirements missed"),
    });
    capitalised(&format!("{}.", parts.join("; ")))
}

fn unsettled(verdict: &Verdict) -> &'static str {
    match verdict {
        Verdict::Undecided { .. } => "undecided",
        _ => "unstable",
    }
}
