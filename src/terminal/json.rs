//! The report as JSON. Its fields are documented in the room's docs and kept stable.

use super::check::Report;
use super::digital::{self, Digital};
use super::input_filter::{self, InputFilter};
use super::isolated::{self, Isolated};
use crate::analysis::{Analysis, ConditionResult, Curves, Detail, RequirementVerdict};
use crate::converter::FurtherValue;
use crate::design::CheckedDesign;
use crate::finding::Finding;
use crate::linear::{Margins, Verdict};
use serde::Serialize;
use std::fmt::Write as _;
use std::io::{self, Write};

#[derive(Serialize)]
struct Object<'a> {
    file: &'a str,
    status: &'static str,
    title: Option<&'a str>,
    condition: Option<Condition<'a>>,
    operating_point: Option<OperatingPoint>,
    inductors: Vec<Inductor>,
    landmarks: Vec<Landmark>,
    control: Option<Control>,
    #[serde(rename = "loop")]
    loop_gain: Option<Loop>,
    conditions: Vec<NineRow<'a>>,
    worst: Vec<Worst<'a>>,
    response: Vec<Response>,
    digital: Option<Digital>,
    input_filter: Option<InputFilter>,
    isolated: Option<Isolated>,
    load_step: Option<LoadStep>,
    load_sweep: Option<super::sweep::Sweep>,
    switched: Option<super::switched::Object>,
    requirements: Vec<Requirement<'a>>,
    findings: Vec<FindingRow<'a>>,
}

#[derive(Serialize)]
struct Condition<'a> {
    input_voltage: f64,
    load_current: f64,
    label: &'a str,
}

#[derive(Serialize)]
struct Further {
    key: &'static str,
    value: Option<f64>,
    word: Option<&'static str>,
}

#[derive(Serialize)]
struct OperatingPoint {
    duty: f64,
    conduction: &'static str,
    second_duty: Option<f64>,
    control_voltage: f64,
    input_current: f64,
    load_voltage: f64,
    conduction_loss: f64,
    boundary_load: Option<f64>,
    further: Vec<Further>,
}

#[derive(Serialize)]
struct Control {
    mode: &'static str,
    #[serde(rename = "control_voltage")]
    voltage: f64,
    clamp: Option<f64>,
    sampling_quality: Option<f64>,
    subharmonic: Option<bool>,
    slope_factor: Option<f64>,
    fast_multiplier: Option<f64>,
    ramp_v_per_s: Option<f64>,
    ramp_share: Option<f64>,
    boundary_ramp_v_per_s: Option<f64>,
    recommended_ramp_v_per_s: Option<f64>,
    inner_loop: Option<InnerLoop>,
}

#[derive(Serialize)]
struct InnerLoop {
    stable: Option<bool>,
    crossover_hz: Option<f64>,
    phase_margin_deg: Option<f64>,
    gain_margin_db: Option<f64>,
    modulus_margin: f64,
    output_voltage: f64,
    slope_ratio: f64,
}

#[derive(Serialize)]
struct Inductor {
    name: &'static str,
    average: f64,
    ripple: f64,
    peak: f64,
}

#[derive(Serialize)]
struct Landmark {
    name: &'static str,
    frequency_hz: f64,
}

#[derive(Serialize)]
struct Loop {
    stable: Option<bool>,
    conditionally_stable: bool,
    crossovers: Vec<Crossover>,
    phase_crossovers: Vec<PhaseCrossover>,
    modulus_margin: f64,
    sensitivity_peak: f64,
    delay_margin_s: Option<f64>,
    gain_at_half_switching_db: f64,
}

#[derive(Serialize)]
struct Crossover {
    frequency_hz: f64,
    phase_margin_deg: f64,
    falling: bool,
    slope_db_per_decade: f64,
}

#[derive(Serialize)]
struct PhaseCrossover {
    frequency_hz: f64,
    gain_margin_db: f64,
}

#[derive(Serialize)]
struct NineRow<'a> {
    condition: &'a str,
    input_voltage: f64,
    load_current: f64,
    duty: Option<f64>,
    conduction: Option<&'static str>,
    control_voltage: Option<f64>,
    sampling_quality: Option<f64>,
    stable: Option<bool>,
    crossover_hz: Option<f64>,
    phase_margin_deg: Option<f64>,
    gain_margin_db: Option<f64>,
    modulus_margin: Option<f64>,
    load_step_deviation_v: Option<f64>,
    settling_s: Option<f64>,
    filter_margin_db: Option<f64>,
    at_least_ratio: Option<isolated::End>,
    at_greatest_ratio: Option<isolated::End>,
    problem: Option<&'a str>,
}

#[derive(Serialize)]
struct Worst<'a> {
    requirement: &'static str,
    condition: &'a str,
    value: Option<f64>,
}

#[derive(Serialize)]
struct Response {
    frequency_hz: f64,
    plant_db: Option<f64>,
    plant_deg: Option<f64>,
    compensator_db: Option<f64>,
    compensator_deg: Option<f64>,
    loop_db: Option<f64>,
    loop_deg: Option<f64>,
    output_impedance_ohm: Option<f64>,
    output_impedance_deg: Option<f64>,
    line_to_output_db: Option<f64>,
    line_to_output_deg: Option<f64>,
    open_loop_output_impedance_ohm: Option<f64>,
    open_loop_line_to_output_db: Option<f64>,
}

#[derive(Serialize)]
struct LoadStep {
    step_a: f64,
    deviation_v: Option<f64>,
    settling_s: Option<f64>,
}

#[derive(Serialize)]
struct Requirement<'a> {
    name: &'static str,
    limit: f64,
    value: Option<f64>,
    met: bool,
    condition: &'a str,
    reason: &'a str,
}

#[derive(Serialize)]
pub(super) struct FindingRow<'a> {
    severity: &'static str,
    #[serde(rename = "where")]
    place: &'a str,
    message: &'a str,
    hint: Option<&'a str>,
}

/// Writes all reports as one array.
pub(super) fn write(reports: &[Report], out: &mut impl Write) -> io::Result<()> {
    let files: Vec<Object<'_>> = reports.iter().map(object).collect();
    // serde_json writes numbers that are not finite as null.
    let text = serde_json::to_string_pretty(&files)?;
    writeln!(out, "{}", escaped(&text))
}

/// The control characters that JSON allows as they are, escaped as well: some terminals obey them. They can only stand in texts.
pub(super) fn escaped(json: &str) -> String {
    let mut safe = String::with_capacity(json.len());
    for c in json.chars() {
        if ('\u{7F}'..='\u{9F}').contains(&c) {
            let _ = write!(safe, "\\u{:04x}", u32::from(c));
        } else {
            safe.push(c);
        }
    }
    safe
}

fn object(report: &Report) -> Object<'_> {
    let analysis = report.results.as_ref().map(|(_, analysis)| analysis);
    let detail = analysis.and_then(|analysis| analysis.shown.as_deref().ok());
    Object {
        file: &report.file,
        status: report.outcome.word(),
        title: report.title.as_deref(),
        condition: analysis.map(|a| Condition {
            input_voltage: a.condition.input_voltage,
            load_current: a.condition.load_current,
            label: &a.condition.label,
        }),
        operating_point: detail.map(operating_point),
        inductors: detail.map(inductors).unwrap_or_default(),
        landmarks: detail.map(landmarks).unwrap_or_default(),
        control: report.results.as_ref().zip(detail).map(|((design, _), detail)| control(design, detail)),
        loop_gain: detail.map(loop_gain),
        conditions: analysis.map(|a| a.conditions.iter().map(nine_row).collect()).unwrap_or_default(),
        worst: analysis.map(worst).unwrap_or_default(),
        response: detail.map(|d| response(&d.curves)).unwrap_or_default(),
        digital: detail.and_then(digital::object),
        input_filter: detail.and_then(input_filter::object),
        isolated: report.results.as_ref().zip(detail).and_then(|((design, _), d)| isolated::object(design, d)),
        load_step: report.results.as_ref().map(|(design, _)| load_step(design, detail)),
        load_sweep: report.load_sweep.as_ref().map(super::sweep::json),
        switched: report.switched.as_ref().map(super::switched::json),
        requirements: analysis.map(|a| a.requirements.iter().map(requirement).collect()).unwrap_or_default(),
        findings: report.findings.iter().map(finding_row).collect(),
    }
}

fn operating_point(detail: &Detail) -> OperatingPoint {
    let point = &detail.operating_point;
    OperatingPoint {
        duty: point.duty,
        conduction: point.conduction.word(),
        second_duty: point.second_duty,
        control_voltage: detail.control.control_voltage,
        input_current: point.input_current,
        load_voltage: point.load_voltage,
        conduction_loss: point.conduction_loss,
        boundary_load: detail.boundary_load,
        further: point.further.iter().map(further).collect(),
    }
}

fn further(figure: &crate::converter::Further) -> Further {
    let (value, word) = match figure.value {
        FurtherValue::Number(value, _) => (Some(value), None),
        FurtherValue::Word(word) => (None, Some(word)),
    };
    Further { key: figure.key, value, word }
}

fn inductors(detail: &Detail) -> Vec<Inductor> {
    let row = |inductor: &crate::converter::InductorFigures| Inductor {
        name: inductor.name,
        average: inductor.current.average,
        ripple: inductor.current.ripple,
        peak: inductor.current.peak,
    };
    detail.operating_point.inductors.iter().map(row).collect()
}

fn landmarks(detail: &Detail) -> Vec<Landmark> {
    detail.landmarks.iter().map(|mark| Landmark { name: mark.name, frequency_hz: mark.frequency_hz }).collect()
}

fn control(design: &CheckedDesign, detail: &Detail) -> Control {
    let (figures, sampling) = (&detail.control, detail.control.sampling);
    let inner = figures.inner.as_ref().map(|inner| {
        let crossover = inner.margins.headline_crossover();
        InnerLoop {
            stable: stable(&inner.verdict),
            crossover_hz: crossover.map(|c| c.frequency_hz),
            phase_margin_deg: crossover.map(|c| c.phase_margin_deg),
            gain_margin_db: inner.margins.gain_margin_up_db(),
            modulus_margin: inner.margins.modulus_margin.min(1.0),
            output_voltage: inner.output_voltage,
            slope_ratio: inner.slope_ratio,
        }
    });
    Control {
        mode: design.law.word(),
        voltage: figures.control_voltage,
        clamp: design.law.clamp,
        sampling_quality: sampling.and_then(|s| s.quality()),
        subharmonic: sampling.map(|s| s.subharmonic()),
        slope_factor: sampling.map(|s| s.slope_factor),
        fast_multiplier: sampling.map(|s| s.fast_multiplier),
        ramp_v_per_s: detail.ramp,
        ramp_share: sampling.map(|s| s.ramp_share),
        boundary_ramp_v_per_s: sampling.map(|s| s.boundary_ramp),
        recommended_ramp_v_per_s: sampling.map(|s| s.recommended_ramp),
        inner_loop: inner,
    }
}

fn stable(verdict: &Verdict) -> Option<bool> {
    match verdict {
        Verdict::Stable { .. } => Some(true),
        Verdict::Unstable { .. } => Some(false),
        Verdict::Undecided { .. } => None,
    }
}

fn loop_gain(detail: &Detail) -> Loop {
    let result = &detail.loop_gain;
    let margins = &result.margins;
    let crossovers = margins.crossovers.iter().map(|c| Crossover {
        frequency_hz: c.frequency_hz,
        phase_margin_deg: c.phase_margin_deg,
        falling: c.falling,
        slope_db_per_decade: c.slope_db_per_decade,
    });
    let phase_crossovers = margins
        .phase_crossovers
        .iter()
        .map(|c| PhaseCrossover { frequency_hz: c.frequency_hz, gain_margin_db: c.gain_margin_db });
    Loop {
        stable: stable(&result.verdict),
        conditionally_stable: result.conditionally_stable(),
        crossovers: crossovers.collect(),
        phase_crossovers: phase_crossovers.collect(),
        modulus_margin: margins.modulus_margin,
        sensitivity_peak: margins.sensitivity_peak,
        delay_margin_s: margins.delay_margin_s.filter(|_| result.stable()),
        gain_at_half_switching_db: result.gain_at_half_switching_db,
    }
}

fn nine_row(row: &ConditionResult) -> NineRow<'_> {
    let summary = row.outcome.as_ref().ok();
    let margins = summary.map(|s| &s.loop_gain.margins);
    let crossover = margins.and_then(Margins::headline_crossover);
    let step = summary.and_then(|s| s.load_step);
    let end = |k: usize| summary.and_then(|s| s.isolated.as_ref()).map(|f| isolated::end(&f.ends[k]));
    NineRow {
        condition: &row.condition.label,
        input_voltage: row.condition.input_voltage,
        load_current: row.condition.load_current,
        duty: summary.map(|s| s.operating_point.duty),
        conduction: summary.map(|s| s.operating_point.conduction.word()),
        control_voltage: summary.map(|s| s.control.control_voltage),
        sampling_quality: summary.and_then(|s| s.control.sampling?.quality()),
        stable: summary.and_then(|s| stable(&s.loop_gain.verdict)),
        crossover_hz: crossover.map(|c| c.frequency_hz),
        phase_margin_deg: crossover.map(|c| c.phase_margin_deg),
        gain_margin_db: margins.and_then(Margins::gain_margin_up_db),
        modulus_margin: margins.map(|m| m.modulus_margin),
        load_step_deviation_v: step.map(|s| s.deviation_v),
        settling_s: step.and_then(|s| s.settling_s),
        filter_margin_db: summary.and_then(|s| s.input_filter).map(|f| f.least_margin().margin_db),
        at_least_ratio: end(0),
        at_greatest_ratio: end(1),
        problem: row.outcome.as_ref().err().map(|finding| finding.message.as_str()),
    }
}

fn worst(analysis: &Analysis) -> Vec<Worst<'_>> {
    let rows = analysis.readouts.iter().filter_map(|readout| {
        let worst = readout.worst.as_ref()?;
        Some(Worst { requirement: readout.key, condition: &worst.condition, value: worst.value })
    });
    rows.collect()
}

fn response(curves: &Curves) -> Vec<Response> {
    let row = |(k, frequency): (usize, &f64)| {
        let at = |curve: &[f64]| curve.get(k).copied();
        Response {
            frequency_hz: *frequency,
            plant_db: at(&curves.plant_db),
            plant_deg: at(&curves.plant_deg),
            compensator_db: at(&curves.compensator_db),
            compensator_deg: at(&curves.compensator_deg),
            loop_db: at(&curves.loop_db),
            loop_deg: at(&curves.loop_deg),
            output_impedance_ohm: at(&curves.output_impedance_ohm),
            output_impedance_deg: at(&curves.output_impedance_deg),
            line_to_output_db: at(&curves.line_to_output_db),
            line_to_output_deg: at(&curves.line_to_output_deg),
            open_loop_output_impedance_ohm: at(&curves.open_loop_output_impedance_ohm),
            open_loop_line_to_output_db: at(&curves.open_loop_line_to_output_db),
        }
    };
    curves.frequencies_hz.iter().enumerate().map(row).collect()
}

fn load_step(design: &CheckedDesign, detail: Option<&Detail>) -> LoadStep {
    let step = detail.and_then(|d| d.steps.load.as_ref());
    LoadStep {
        step_a: design.events.load_step.change,
        deviation_v: step.map(|s| s.deviation_v),
        settling_s: step.and_then(|s| s.settling_s),
    }
}

fn requirement(verdict: &RequirementVerdict) -> Requirement<'_> {
    Requirement {
        name: verdict.path,
        limit: verdict.limit,
        value: verdict.value,
        met: verdict.met,
        condition: &verdict.condition,
        reason: &verdict.reason,
    }
}

pub(super) fn finding_row(finding: &Finding) -> FindingRow<'_> {
    FindingRow {
        severity: finding.severity.word(),
        place: &finding.place,
        message: &finding.message,
        hint: finding.hint.as_deref(),
    }
}
