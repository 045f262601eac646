//! The load sweep: crossover, phase margin and duty ratio over the load current at three input voltages, and where
//! conduction changes.

use super::axis::extent;
use super::chart::{Chart, Pen, SMALL, Span, WIDTHS, heading, legend, line, text};
use super::stroke::{Align, Dash, Figure, Mark, Role, Weight};
use crate::analysis::{LoadSweep, LoadSweepFigures, LoadSweepLine};
use crate::converter::Conduction;
use crate::quantity::{Unit, print_digits};

/// Left, right, top and bottom room around the frames [points].
const ROOM: [f64; 4] = [76.0, 18.0, 76.0, 48.0];
/// Distance between frames [points].
const GAP: f64 = 12.0;
/// Line styles of least, nominal and greatest input voltage.
const DASHES: [Dash; 3] = [Dash::Dashed, Dash::Solid, Dash::DashDot];
/// Mean width of a letter of a mark's words [points].
const LETTER: f64 = 6.0;

/// Room below and above the curves as shares of their span; above stands the name of the quantity.
const HEADROOM: (f64, f64) = (0.15, 0.32);

/// A quantity over the load.
struct Row {
    name: &'static str,
    unit: Unit,
    take: fn(&LoadSweepFigures) -> Option<f64>,
}

const ROWS: [Row; 3] = [
    Row { name: "Crossover", unit: Unit::Hertz, take: |f| f.crossover_hz },
    Row { name: "Phase margin", unit: Unit::Degree, take: |f| f.phase_margin_deg },
    Row { name: "Duty ratio", unit: Unit::One, take: |f| Some(f.duty) },
];

/// Draws a sweep; size in points. None when no point has a result.
pub fn sweep(title: &str, sweep: &LoadSweep, size: [f64; 2]) -> Option<Figure> {
    let mut figure = Figure { size, ..Figure::default() };
    let points = sweep.lines.iter().flat_map(|line| &line.points);
    let (from, to) = extent(points.map(|point| point.load_current))?;
    heading(&mut figure, title, "Over the load current, at the least, the nominal and the greatest input voltage.");
    let [left, right, top, bottom] = ROOM;
    let height = (size[1] - top - bottom - 2.0 * GAP) / 3.0;
    for (k, row) in ROWS.iter().enumerate() {
        let upper = (height + GAP).mul_add(k as f64, top);
        let corners = [[left, upper], [size[0] - right, upper + height]];
        let Some(chart) = chart(sweep, row, corners, (from, to)) else { continue };
        panel(&mut figure, &chart, sweep, row, k == ROWS.len() - 1);
        if k == 0 {
            boundaries(&mut figure, &chart, sweep);
        }
    }
    let at = [size[0] - right, size[1] - 6.0];
    text(&mut figure, at, "load current", (Role::Quiet, SMALL, Weight::Regular), (Align::End, Align::End));
    let names: Vec<_> = sweep.lines.iter().zip(DASHES).map(|(line, dash)| (pen(dash), named(line))).collect();
    legend(&mut figure, [size[0] - right, 34.0], &names);
    Some(figure)
}

fn pen(dash: Dash) -> Pen {
    Pen { role: Role::LoopGain, width: WIDTHS.0, dash }
}

fn named(line: &LoadSweepLine) -> String {
    print_digits(line.input_voltage, Unit::Volt, 3)
}

/// Values of one line of a row; not a number where there is none.
fn values(line: &LoadSweepLine, row: &Row, wanted: impl Fn(&LoadSweepFigures) -> bool) -> Vec<f64> {
    let value = |figures: &LoadSweepFigures| if wanted(figures) { (row.take)(figures) } else { None };
    line.points.iter().map(|point| point.outcome.as_ref().ok().and_then(value).unwrap_or(f64::NAN)).collect()
}

fn chart(sweep: &LoadSweep, row: &Row, corners: [[f64; 2]; 2], loads: (f64, f64)) -> Option<Chart> {
    let all = sweep.lines.iter().flat_map(|line| values(line, row, |_| true));
    let (least, greatest) = extent(all)?;
    let across = Span::Logarithmic(loads.0, loads.1);
    let (below, above) = HEADROOM;
    let up = if row.unit == Unit::Hertz {
        let ratio = (greatest / least).max(1.6);
        Span::Logarithmic(least * ratio.powf(-below), greatest * ratio.powf(above))
    } else {
        let span = (greatest - least).max(0.02 * greatest.abs()).max(1e-9);
        Span::Linear(below.mul_add(-span, least), above.mul_add(span, greatest))
    };
    Some(Chart::new(corners, across, up))
}

fn panel(figure: &mut Figure, chart: &Chart, sweep: &LoadSweep, row: &Row, lowest: bool) {
    chart.decades_of(figure, lowest.then_some(Unit::Ampere));
    if row.unit == Unit::Hertz {
        chart.level_decades(figure, row.unit);
    } else {
        chart.levels(figure, row.unit, None, f64::NAN);
    }
    for (line, dash) in sweep.lines.iter().zip(DASHES) {
        let loads: Vec<f64> = line.points.iter().map(|point| point.load_current).collect();
        let rests = |f: &LoadSweepFigures| f.conduction == Conduction::Discontinuous;
        let resting = Pen { role: Role::Plant, width: WIDTHS.1, dash };
        chart.curve(figure, &loads, &values(line, row, |f| !rests(f)), pen(dash));
        chart.curve(figure, &loads, &values(line, row, rests), resting);
        let lost = values(line, row, |f| f.stable == Some(false));
        for (load, value) in loads.iter().zip(lost).filter(|(_, value)| value.is_finite()) {
            let centre = chart.at(*load, value);
            figure.marks.push(Mark::Circle { centre, radius: 2.5, role: Role::Missed, width: None });
        }
    }
    chart.frame(figure);
    let at = [chart.corners[0][0] + 8.0, chart.corners[0][1] + 6.0];
    text(figure, at, row.name, (Role::Ink, SMALL, Weight::Bold), (Align::Start, Align::Start));
}

/// Where conduction changes, across all frames, with its load in words above.
fn boundaries(figure: &mut Figure, chart: &Chart, sweep: &LoadSweep) {
    let bottom = figure.size[1] - ROOM[3];
    let mut taken = f64::NEG_INFINITY;
    for boundary in sweep.lines.iter().filter_map(|line| line.boundary_load).filter(|load| chart.x.holds(*load)) {
        let x = f64::from(chart.x.at(boundary));
        line(figure, vec![[x, ROOM[2]], [x, bottom]], Role::Landmark, (1.0, Dash::Dotted));
        let words = print_digits(boundary, Unit::Ampere, 3);
        let half = LETTER * words.chars().count() as f64 / 2.0;
        if x - half > taken + 6.0 {
            taken = x + half;
            let at = [x, ROOM[2] - 4.0];
            text(figure, at, &words, (Role::Quiet, SMALL, Weight::Regular), (Align::Middle, Align::End));
        }
    }
    let words = remark(sweep);
    let at = [12.0, 46.0];
    text(figure, at, &words, (Role::Quiet, SMALL, Weight::Regular), (Align::Start, Align::Start));
}

/// How conduction and stability are told apart, as far as this sweep needs it.
fn remark(sweep: &LoadSweep) -> String {
    let figures = || sweep.lines.iter().flat_map(|line| &line.points).filter_map(|point| point.outcome.as_ref().ok());
    let rests = |f: &LoadSweepFigures| f.conduction == Conduction::Discontinuous;
    let conduction = match (figures().any(rests), figures().all(rests)) {
        (false, _) => "No discontinuous conduction at these loads.",
        (true, false) => "Thin and blue, left of its dotted line: discontinuous conduction.",
        (true, true) => "Thin and blue: discontinuous conduction at all of these loads.",
    };
    let lost = figures().any(|f| f.stable == Some(false));
    format!("{conduction}{}", if lost { " Dots: unstable." } else { "" })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::load_sweep;
    use crate::design::sample;

    #[test]
    fn every_sample_has_a_sweep_that_stays_in_its_figure() {
        for sample in sample::all() {
            let design = sample.design().expect("readable").check().expect("usable");
            let result = load_sweep(&design, 7).expect("swept");
            let drawn = sweep(sample.title, &result, [760.0, 500.0]).expect("a figure");
            for mark in &drawn.marks {
                if let Mark::Line { points, .. } = mark {
                    assert!(points.iter().flatten().all(|length| (-0.01..=760.01).contains(length)), "{}", sample.file);
                }
            }
            let boundary = result.lines.iter().any(|line| line.boundary_load.is_some());
            let blue = drawn.marks.iter().any(|m| matches!(m, Mark::Line { role: Role::Plant, .. }));
            assert_eq!(boundary, blue, "{}", sample.file);
        }
    }
}
