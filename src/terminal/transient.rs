//! `polewright transient`: reads, sets and checks a design, follows it through an event, reports, and writes the waveforms.

use super::arguments::TransientCommand;
use super::check::{Outcome, outside, set, shown, without_part};
use super::json::{FindingRow, escaped, finding_row};
use super::text::{findings, row};
use crate::analysis::{
    Condition, Step, Transient, TransientEvent, TransientFigures, TransientRequest, transient as follow,
};
use crate::design::{CheckedDesign, file, printable};
use crate::finding::{Finding, Severity};
use crate::quantity::{Unit, print};
use crate::sheet::write_waveforms;
use crate::switched::{Cancel, Progress};
use serde::Serialize;
use std::fmt::Write as _;
use std::io::{self, Write};
use std::path::Path;

/// A run that was made.
struct Followed {
    design: CheckedDesign,
    transient: Transient,
}

/// The run with its notices, or what cannot be used.
type Ran = Result<(Followed, Vec<Finding>), Vec<Finding>>;

/// Follows the design and reports to `out`; in text, what cannot be used is told on `err`.
///
/// # Errors
/// When writing fails, the waveforms' file too.
pub fn transient(request: &TransientCommand, out: &mut impl Write, err: &mut impl Write) -> io::Result<Outcome> {
    let file = request.file.display().to_string();
    let (title, result) = run(request);
    let (outcome, notices) = match &result {
        Ok((followed, notices)) => {
            let stopped = followed.transient.notices.iter().any(|n| n.severity == Severity::Problem);
            (if stopped { Outcome::NotMet } else { Outcome::Met }, notices.clone())
        }
        Err(problems) => (Outcome::Unusable, problems.clone()),
    };
    let followed = result.ok().map(|(followed, _)| followed);
    let mut written = Ok(());
    if let (Some(followed), Some(path)) = (&followed, &request.csv) {
        written = write_csv(&followed.transient, path);
    }
    let text = if request.json {
        let status = ["done", "stopped", "unusable"][usize::from(outcome.code())];
        let object = Object {
            file: &file,
            status,
            title: title.as_deref(),
            event: request.event.key(),
            condition: followed.as_ref().map(|f| condition(&f.transient.condition)),
            from_s: followed.as_ref().map(|f| f.transient.waveforms.from_s),
            to_s: followed.as_ref().map(|f| end_s(&f.transient)),
            figures: followed.as_ref().map(|f| figures(&f.transient.figures)),
            prediction: followed.as_ref().and_then(|f| f.transient.prediction.as_ref()).map(predicted),
            findings: notices.iter().map(finding_row).collect(),
        };
        format!("{}\n", escaped(&serde_json::to_string_pretty(&object)?))
    } else {
        let heading = title.map_or(file.clone(), |title| format!("{title} ({file})")).replace(['\n', '\r'], " ");
        printable(&report(&heading, request, (followed.as_ref(), written.is_ok()), &notices))
    };
    if followed.is_none() && !request.json {
        err.write_all(text.as_bytes())?;
    } else {
        out.write_all(text.as_bytes())?;
    }
    out.flush()?;
    written?;
    Ok(outcome)
}

/// Title of the design where it can be read; the run with its notices, or what cannot be used.
fn run(request: &TransientCommand) -> (Option<String>, Ran) {
    let mut design = match file::load(&request.file) {
        Ok(design) => design,
        Err(error) => return (None, Err(error.findings())),
    };
    let title = Some(design.title.clone());
    let mut problems = set(&mut design, &request.settings);
    let idle = without_part(&design, &request.settings);
    let checked = match design.check() {
        Ok(checked) if problems.is_empty() => checked,
        Ok(_) => return (title, Err(problems)),
        Err(more) => {
            problems.extend(more);
            return (title, Err(problems));
        }
    };
    let asked = (request.input_voltage, request.load_current);
    let condition = Condition::shown(&checked.stage, shown(asked, &checked.stage));
    let wanted = TransientRequest { event: request.event, columns: request.rows, span_s: request.span_s };
    let outcome = follow(&checked, &condition, &wanted, &Cancel::new(), &Progress::new(), &mut |_| {});
    match outcome {
        Ok(transient) => {
            let mut notices = transient.notices.clone();
            notices.extend(outside(asked, &checked.stage));
            notices.extend(idle);
            (title, Ok((Followed { design: checked, transient }, notices)))
        }
        Err(problem) => (title, Err(vec![problem])),
    }
}

fn write_csv(transient: &Transient, path: &Path) -> io::Result<()> {
    let named = |error: io::Error| io::Error::new(error.kind(), format!("{}: {error}", path.display()));
    let mut bytes = Vec::new();
    write_waveforms(&transient.waveforms, &mut bytes).map_err(named)?;
    file::replace(path, &bytes).map_err(named)
}

fn end_s(transient: &Transient) -> f64 {
    let waveforms = &transient.waveforms;
    waveforms.from_s + waveforms.column_s * waveforms.filled as f64
}

/// A change with its sign.
fn signed(value: f64) -> String {
    format!("{}{}", if value > 0.0 { "+" } else { "" }, print(value, Unit::Volt))
}

/// The report; `written` says whether the waveforms asked for are in their file.
fn report(
    heading: &str,
    request: &TransientCommand,
    (followed, written): (Option<&Followed>, bool),
    notices: &[Finding],
) -> String {
    let mut text = format!("{heading}\n");
    if let Some(followed) = followed {
        let (transient, design) = (&followed.transient, &followed.design);
        let _ = writeln!(text, "{} at {}\n", transient.event.name(), transient.condition.label);
        told(&mut text, transient, design);
        if let Some(path) = request.csv.as_ref().filter(|_| written) {
            let _ = writeln!(text, "Waveforms: {}\n", path.display());
        }
    }
    findings(&mut text, notices);
    if followed.is_none() {
        text.push_str("Cannot be used.\n");
    }
    text
}

fn told(text: &mut String, transient: &Transient, design: &CheckedDesign) {
    let figures = &transient.figures;
    let volts = |value| print(value, Unit::Volt);
    let seconds = |value| print(value, Unit::Second);
    let amperes = |value| print(value, Unit::Ampere);
    let event = transient.event;
    let span = format!(
        "{} to {}, {} periods",
        seconds(transient.waveforms.from_s),
        seconds(end_s(transient)),
        figures.periods
    );
    row(text, "Followed", &span);
    row(text, "Voltage before", &volts(figures.before_v));
    row(text, "Voltage at the end", &figures.after_v.map_or("none".to_owned(), volts));
    let beyond = matches!(event, TransientEvent::StartUp | TransientEvent::ReferenceStep);
    let name = if beyond { "Overshoot" } else { "Deviation" };
    if let (Some(value), Some(at)) = (figures.deviation_v, figures.deviation_at_s) {
        let predicted = transient.prediction.as_ref().filter(|_| !beyond);
        let predicted = predicted.map_or(String::new(), |step| format!("; small-signal {}", signed(step.deviation_v)));
        row(text, name, &format!("{} at {}{predicted}", signed(value), seconds(at)));
    }
    if let Some(value) = figures.rebound_v {
        row(text, "Beyond it on recovery", &signed(value));
    }
    let band = print(design.events.settling_band, Unit::Fraction);
    let since = if event == TransientEvent::Overload { ", from the overload's end" } else { "" };
    let settled = figures.settling_s.map_or("does not settle in this time".to_owned(), seconds);
    let predicted = transient.prediction.as_ref().and_then(|step| step.settling_s);
    let predicted = predicted.map_or(String::new(), |value| format!("; small-signal {}", seconds(value)));
    row(text, &format!("Settling to {band}"), &format!("{settled}{since}{predicted}"));
    row(text, "With ripple", &format!("{} to {}", volts(figures.least_v), volts(figures.greatest_v)));
    row(text, "Peak inductor current", &amperes(figures.peak_inductor_a));
    row(text, "Peak switch current", &amperes(figures.peak_switch_a));
    if figures.rested > 0 {
        row(text, "Current at rest", &format!("in {} periods", figures.rested));
    }
    if figures.skipped > 0 {
        row(text, "Without a pulse", &format!("{} periods", figures.skipped));
    }
    for (name, periods) in &figures.limited {
        row(text, &format!("Acted: {name}"), &format!("in {periods} periods"));
    }
    text.push('\n');
}

#[derive(Serialize)]
struct Object<'a> {
    file: &'a str,
    status: &'static str,
    title: Option<&'a str>,
    event: &'static str,
    condition: Option<At<'a>>,
    from_s: Option<f64>,
    to_s: Option<f64>,
    figures: Option<Figures>,
    prediction: Option<Predicted>,
    findings: Vec<FindingRow<'a>>,
}

#[derive(Serialize)]
struct At<'a> {
    input_voltage: f64,
    load_current: f64,
    label: &'a str,
}

#[derive(Serialize)]
struct Figures {
    before_v: f64,
    after_v: Option<f64>,
    deviation_v: Option<f64>,
    deviation_at_s: Option<f64>,
    rebound_v: Option<f64>,
    settling_s: Option<f64>,
    least_v: f64,
    greatest_v: f64,
    peak_inductor_a: f64,
    peak_switch_a: f64,
    periods: usize,
    rested_periods: u64,
    skipped_periods: u64,
    limits: Vec<Limit>,
}

#[derive(Serialize)]
struct Limit {
    name: &'static str,
    periods: u64,
}

#[derive(Serialize)]
struct Predicted {
    deviation_v: f64,
    deviation_at_s: Option<f64>,
    settling_s: Option<f64>,
}

fn condition(condition: &Condition) -> At<'_> {
    At { input_voltage: condition.input_voltage, load_current: condition.load_current, label: &condition.label }
}

fn figures(figures: &TransientFigures) -> Figures {
    Figures {
        before_v: figures.before_v,
        after_v: figures.after_v,
        deviation_v: figures.deviation_v,
        deviation_at_s: figures.deviation_at_s,
        rebound_v: figures.rebound_v,
        settling_s: figures.settling_s,
        least_v: figures.least_v,
        greatest_v: figures.greatest_v,
        peak_inductor_a: figures.peak_inductor_a,
        peak_switch_a: figures.peak_switch_a,
        periods: figures.periods,
        rested_periods: figures.rested,
        skipped_periods: figures.skipped,
        limits: figures.limited.iter().map(|(name, periods)| Limit { name, periods: *periods }).collect(),
    }
}

fn predicted(step: &Step) -> Predicted {
    Predicted { deviation_v: step.deviation_v, deviation_at_s: step.deviation_at_s, settling_s: step.settling_s }
}
