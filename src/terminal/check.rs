//! `polewright check`: reads, sets, checks and analyses each file, and reports.

use super::arguments::CheckRequest;
use super::switched::Switched;
use super::{json, text};
use crate::analysis::{Analysis, Level, LoadSweep, Request, SWEEP_POINTS, Shown, analyse, load_sweep, referee, steady};
use crate::converter::Stage;
use crate::design::{CheckedDesign, Design, file};
use crate::finding::Finding;
use crate::quantity::{Unit, print};
use std::io::{self, Write};
use std::path::Path;

/// How a check ended, rising in gravity.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Outcome {
    /// Every loop is stable and every requirement met.
    Met,
    /// A loop is not stable or a requirement not met.
    NotMet,
    /// An input cannot be used.
    Unusable,
}

impl Outcome {
    /// Exit code of the program.
    pub fn code(self) -> u8 {
        match self {
            Outcome::Met => 0,
            Outcome::NotMet => 1,
            Outcome::Unusable => 2,
        }
    }

    /// The word in reports.
    pub(super) fn word(self) -> &'static str {
        match self {
            Outcome::Met => "met",
            Outcome::NotMet => "not met",
            Outcome::Unusable => "unusable",
        }
    }
}

/// Points of the step responses behind the figures; deviation and settling are refined between them.
const STEP_POINTS: usize = 200;

/// First frequency of the response when none is asked for [Hz].
const FIRST_FREQUENCY: f64 = 10.0;

/// What became of one file.
pub(super) struct Report {
    /// The file as named.
    pub(super) file: String,
    /// Title of its design, when it could be read.
    pub(super) title: Option<String>,
    /// How it ended.
    pub(super) outcome: Outcome,
    /// Design and results, when the design can be used.
    pub(super) results: Option<(CheckedDesign, Analysis)>,
    /// The load sweep, where it was asked for and could be computed.
    pub(super) load_sweep: Option<LoadSweep>,
    /// What the exact switched model says, where it was asked for.
    pub(super) switched: Option<Switched>,
    /// All findings, the gravest first.
    pub(super) findings: Vec<Finding>,
}

/// Checks every file and reports to `out`; with text reports, what cannot be used is told on `err`: files, and a condition asked
/// for that has no results.
///
/// # Errors
/// When writing fails.
pub fn check(request: &CheckRequest, out: &mut impl Write, err: &mut impl Write) -> io::Result<Outcome> {
    let reports: Vec<Report> = request.files.iter().map(|file| report(file, request)).collect();
    if request.json {
        json::write(&reports, out)?;
    } else {
        for report in &reports {
            match &report.results {
                Some(results) if report.outcome == Outcome::Unusable => {
                    text::write(report, results, request.at_hz.is_some(), err)?;
                }
                Some(results) => text::write(report, results, request.at_hz.is_some(), out)?,
                None => text::write_unusable(report, err)?,
            }
        }
    }
    out.flush()?;
    Ok(reports.iter().map(|report| report.outcome).max().unwrap_or(Outcome::Met))
}

fn report(path: &Path, request: &CheckRequest) -> Report {
    let file = path.display().to_string();
    let unusable = |title, findings| Report {
        file: file.clone(),
        title,
        outcome: Outcome::Unusable,
        results: None,
        load_sweep: None,
        switched: None,
        findings,
    };
    let mut design = match file::load(path) {
        Ok(design) => design,
        Err(error) => return unusable(None, error.findings()),
    };
    let title = Some(design.title.clone());
    let mut problems = set(&mut design, &request.settings);
    let idle = without_part(&design, &request.settings);
    let checked = match design.check() {
        Ok(checked) if problems.is_empty() => checked,
        Ok(_) => return unusable(title, problems),
        Err(more) => {
            problems.extend(more);
            return unusable(title, problems);
        }
    };
    let asked = asked(request, &checked.stage);
    let analysis = analyse(&checked, &asked);
    let mut findings = analysis.findings.clone();
    if let Err(finding) = &analysis.shown
        && !findings.contains(finding)
    {
        findings.insert(0, finding.clone());
    }
    findings.extend(outside((request.input_voltage, request.load_current), &checked.stage));
    findings.extend(idle);
    let switched = request
        .switched
        .then(|| Switched { referee: referee(&checked, &asked), steady: steady(&checked, asked.shown).ok() });
    let mut outcome = judge(&analysis);
    if let Some(Ok(exact)) = switched.as_ref().map(|switched| &switched.referee) {
        findings.extend(exact.findings.iter().cloned());
        findings.sort_by_key(|finding| std::cmp::Reverse(finding.severity));
        if !exact.stability.is_stable() {
            outcome = outcome.max(Outcome::NotMet);
        }
    }
    // A compensator that cannot be solved has been told by the analysis.
    let load_sweep = request.load_sweep.then(|| load_sweep(&checked, SWEEP_POINTS).ok()).flatten();
    Report { file, title, outcome, results: Some((checked, analysis)), load_sweep, switched, findings }
}

/// Sets entries by path; every one that is wrong is told.
pub(super) fn set(design: &mut Design, settings: &[(String, String)]) -> Vec<Finding> {
    settings.iter().filter_map(|(path, value)| design.set_from_text(path, value).err()).collect()
}

/// The condition asked for: the nominal one where nothing else is.
pub(super) fn shown(asked: (Option<f64>, Option<f64>), stage: &Stage) -> Shown {
    match asked {
        (None, None) => Shown::Levels(Level::Nominal, Level::Nominal),
        (input, load) => Shown::At {
            input_voltage: input.unwrap_or(stage.input_voltages[Level::Nominal as usize]),
            load_current: load.unwrap_or(stage.load_currents[Level::Nominal as usize]),
        },
    }
}

fn asked(request: &CheckRequest, stage: &Stage) -> Request {
    let shown = shown((request.input_voltage, request.load_current), stage);
    let frequencies_hz = request.at_hz.clone().unwrap_or_else(|| one_two_five(stage.switching_frequency / 2.0));
    Request { shown, frequencies_hz, band_frequencies_hz: Vec::new(), step_points: STEP_POINTS }
}

/// A note for each value asked for that lies outside what the design is entered for.
pub(super) fn outside((input_voltage, load_current): (Option<f64>, Option<f64>), stage: &Stage) -> Vec<Finding> {
    let asked = [
        ("--input-voltage", "input voltage", input_voltage, stage.input_voltages, Unit::Volt),
        ("--load-current", "load current", load_current, stage.load_currents, Unit::Ampere),
    ];
    let note = |(option, name, value, [least, _, greatest], unit): (&str, &str, Option<f64>, [f64; 3], Unit)| {
        let value = value.filter(|value| !(least..=greatest).contains(value))?;
        let (value, least, greatest) = (print(value, unit), print(least, unit), print(greatest, unit));
        let message = format!("The {name} of {value} is outside the design's range of {least} to {greatest}.");
        Some(Finding::note(option, message))
    };
    asked.into_iter().filter_map(note).collect()
}

/// 10, 20, 50, 100, … up to a limit [Hz].
fn one_two_five(limit: f64) -> Vec<f64> {
    let decades = std::iter::successors(Some(FIRST_FREQUENCY), |decade| Some(decade * 10.0));
    decades.flat_map(|decade| [decade, 2.0 * decade, 5.0 * decade]).take_while(|f| *f <= limit).collect()
}

/// A condition asked for without results is unusable input; any of the nine without results, or not stable, is not met.
fn judge(analysis: &Analysis) -> Outcome {
    let Ok(detail) = &analysis.shown else {
        return Outcome::Unusable;
    };
    let sound = |outcome: &Result<crate::analysis::ConditionSummary, Finding>| {
        outcome.as_ref().is_ok_and(|summary| summary.loop_gain.stable())
    };
    let all_sound = detail.loop_gain.stable() && analysis.conditions.iter().all(|c| sound(&c.outcome));
    if all_sound && analysis.all_met() { Outcome::Met } else { Outcome::NotMet }
}

/// Notes about entries that were set and play no part under the choices made.
pub(super) fn without_part(design: &Design, settings: &[(String, String)]) -> Vec<Finding> {
    let plays = |path: &str| {
        design.entries().iter().any(|entry| entry.path == path)
            || design.choice_rows().iter().any(|choice| choice.path == path)
    };
    let idle = settings.iter().filter(|(path, _)| !plays(path));
    idle.map(|(path, _)| Finding::note(path, "It was set, but plays no part in a design of these choices.")).collect()
}
