//! The load sweep in both reports.

use super::text::padded;
use crate::analysis::{LoadSweep, LoadSweepFigures, LoadSweepLine, LoadSweepPoint};
use crate::quantity::{Unit, print, print_digits};
use serde::Serialize;
use std::fmt::Write as _;

/// The sweep at one input voltage.
#[derive(Serialize)]
pub(super) struct Line {
    input_voltage: f64,
    boundary_load: Option<f64>,
    points: Vec<Point>,
}

/// All input voltages.
pub(super) type Sweep = Vec<Line>;

#[derive(Serialize)]
struct Point {
    load_current: f64,
    duty: Option<f64>,
    conduction: Option<&'static str>,
    crossover_hz: Option<f64>,
    phase_margin_deg: Option<f64>,
    gain_margin_db: Option<f64>,
    stable: Option<bool>,
    problem: Option<String>,
}

/// The sweep for the JSON report.
pub(super) fn json(sweep: &LoadSweep) -> Sweep {
    let point = |point: &LoadSweepPoint| {
        let figures = point.outcome.as_ref().ok();
        Point {
            load_current: point.load_current,
            duty: figures.map(|f| f.duty),
            conduction: figures.map(|f| f.conduction.word()),
            crossover_hz: figures.and_then(|f| f.crossover_hz),
            phase_margin_deg: figures.and_then(|f| f.phase_margin_deg),
            gain_margin_db: figures.and_then(|f| f.gain_margin_db),
            stable: figures.and_then(|f| f.stable),
            problem: point.outcome.as_ref().err().map(|finding| finding.message.clone()),
        }
    };
    let line = |line: &LoadSweepLine| Line {
        input_voltage: line.input_voltage,
        boundary_load: line.boundary_load,
        points: line.points.iter().map(point).collect(),
    };
    sweep.lines.iter().map(line).collect()
}

/// Widths of the columns [characters].
const WIDTHS: [usize; 7] = [12, 20, 10, 14, 15, 16, 10];

fn table_row(cells: &[String; 7]) -> String {
    let joined: String = cells.iter().zip(WIDTHS).map(|(cell, width)| padded(cell, width)).collect();
    format!("  {}\n", joined.trim_end())
}

/// Appends the sweep to the text report.
pub(super) fn text(text: &mut String, sweep: &LoadSweep) {
    for line in &sweep.lines {
        let boundary = line
            .boundary_load
            .map_or(String::new(), |load| format!(", discontinuous below {}", print(load, Unit::Ampere)));
        let input = print(line.input_voltage, Unit::Volt);
        let _ = writeln!(text, "Load sweep at {} input {input}{boundary}", line.level.word());
        let titles = ["load", "conduction", "duty", "crossover", "phase margin", "gain margin", "stable"];
        text.push_str(&table_row(&titles.map(str::to_owned)));
        for point in &line.points {
            let load = print_digits(point.load_current, Unit::Ampere, 4);
            match &point.outcome {
                Ok(figures) => text.push_str(&table_row(&cells(load, figures))),
                Err(finding) => {
                    let _ = writeln!(text, "  {}{}", padded(&load, WIDTHS[0]), finding.message);
                }
            }
        }
        text.push('\n');
    }
}

fn cells(load: String, figures: &LoadSweepFigures) -> [String; 7] {
    let value = |number: Option<f64>, unit| number.map_or("none".to_owned(), |v| print_digits(v, unit, 4));
    [
        load,
        figures.conduction.word().to_owned(),
        print_digits(figures.duty, Unit::One, 3),
        value(figures.crossover_hz, Unit::Hertz),
        value(figures.phase_margin_deg, Unit::Degree),
        value(figures.gain_margin_db, Unit::Decibel),
        figures.stable.map_or("undecided", |stable| if stable { "yes" } else { "NO" }).to_owned(),
    ]
}
