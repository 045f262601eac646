//! Closed-loop responses over frequency: output impedance, line to output, reference to output, input impedance; the open loop,
//! and the input filter, beside.

use super::axis::extent;
use super::bode::EXACT_WIDTH;
use super::chart::{Chart, Pen, SMALL, Span, WIDTHS, heading, legend, text};
use super::stroke::{Align, Dash, Figure, Mark, Role, Weight};
use crate::analysis::{Analysis, Curves, Detail, InputFilterResult, Referee};
use crate::quantity::{Unit, print_digits};

/// Closed-loop response shown over frequency.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum ClosedLoop {
    /// Output impedance.
    #[default]
    Impedance,
    /// Input voltage to output voltage.
    Line,
    /// Reference to output voltage.
    Reference,
    /// Input impedance against the input filter's output impedance.
    Input,
}

impl ClosedLoop {
    /// Its name.
    pub fn name(self) -> &'static str {
        match self {
            ClosedLoop::Impedance => "Output impedance",
            ClosedLoop::Line => "Line to output",
            ClosedLoop::Reference => "Following",
            ClosedLoop::Input => "Input impedance",
        }
    }

    /// Closed-loop curve, open-loop curve where there is one, and their unit; empty for an input impedance without a filter.
    pub fn of(self, detail: &Detail) -> (&[f64], Option<&[f64]>, Unit) {
        let curves = &detail.curves;
        match self {
            ClosedLoop::Impedance => {
                (&curves.output_impedance_ohm, Some(&curves.open_loop_output_impedance_ohm), Unit::Ohm)
            }
            ClosedLoop::Line => (&curves.line_to_output_db, Some(&curves.open_loop_line_to_output_db), Unit::Decibel),
            ClosedLoop::Reference => (&curves.reference_to_output_db, None, Unit::Decibel),
            ClosedLoop::Input => match &detail.input_filter {
                Some(filter) => (&filter.curves.closed_loop_ohm, Some(&filter.curves.open_loop_ohm), Unit::Ohm),
                None => (&[], None, Unit::Ohm),
            },
        }
    }
}

/// Name of the filter's own impedance in a plot.
const FILTER: &str = "Zo of the filter";

impl ClosedLoop {
    /// Curves that stand beside the closed-loop one, with their names: of an input impedance the one with the output nulled, and the
    /// filter's.
    pub fn beside(self, detail: &Detail) -> Vec<(&[f64], &'static str)> {
        match &detail.input_filter {
            Some(filter) if self == ClosedLoop::Input => {
                vec![(&filter.curves.nulled_ohm, "ZN, output nulled"), (&filter.curves.filter_ohm, FILTER)]
            }
            _ => Vec::new(),
        }
    }
}

/// A closed-loop response at the shown condition; size in points. None when the condition has no results or its closed
/// loop is not stable.
pub fn response(
    title: &str,
    analysis: &Analysis,
    (held, exact): (Option<(&str, &Analysis)>, Option<&Referee>),
    which: ClosedLoop,
    size: [f64; 2],
) -> Option<Figure> {
    let detail = analysis.shown.as_ref().ok().filter(|detail| detail.loop_gain.stable())?;
    let curves = &detail.curves;
    let (closed, open, unit) = which.of(detail);
    let beside = which.beside(detail);
    let mut figure = Figure { size, ..Figure::default() };
    heading(&mut figure, title, &format!("{} at {}", which.name(), analysis.place()));
    let all = beside.iter().map(|(values, _)| *values).chain([closed]).chain(open);
    let chart = axes(curves, all, unit, size)?;
    chart.decades(&mut figure, true);
    if unit == Unit::Ohm {
        chart.level_decades(&mut figure, unit);
    } else {
        chart.levels(&mut figure, unit, None, 0.0);
    }
    let mut names = Vec::new();
    let xs = &curves.frequencies_hz;
    if let Some((name, held)) = held.and_then(|(name, held)| Some((name, held.shown.as_ref().ok()?)))
        && held.loop_gain.stable()
    {
        let pen = Pen { role: Role::Held, width: WIDTHS.1, dash: Dash::Dotted };
        chart.curve(&mut figure, &held.curves.frequencies_hz, which.of(held).0, pen);
        names.push((pen, format!("held: {name}")));
    }
    if let Some(open) = open {
        let pen = Pen { role: Role::Held, width: WIDTHS.1, dash: Dash::Dashed };
        chart.curve(&mut figure, xs, open, pen);
        names.push((pen, "open loop".to_owned()));
    }
    if let Some(exact) = exact.filter(|_| which == ClosedLoop::Impedance) {
        let pen = Pen { role: Role::ExactLoop, width: EXACT_WIDTH, dash: Dash::Solid };
        chart.curve(&mut figure, &exact.curves.frequencies_hz, &exact.curves.output_impedance_ohm, pen);
        names.push((pen, "exact".to_owned()));
    }
    let pen = Pen { role: Role::LoopGain, width: WIDTHS.0, dash: Dash::Solid };
    chart.curve(&mut figure, xs, closed, pen);
    names.push((pen, "closed loop".to_owned()));
    for (values, name) in &beside {
        let (role, dash) = if *name == FILTER { (Role::Compensator, Dash::Solid) } else { (Role::Plant, Dash::Dotted) };
        let pen = Pen { role, width: WIDTHS.0, dash };
        chart.curve(&mut figure, xs, values, pen);
        names.push((pen, (*name).to_owned()));
    }
    if let Some(filter) = detail.input_filter.as_ref().filter(|_| which == ClosedLoop::Input) {
        margin(&mut figure, &chart, &filter.result);
    }
    chart.frame(&mut figure);
    if which == ClosedLoop::Impedance {
        peak(&mut figure, &chart, curves);
    }
    legend(&mut figure, [size[0] - 18.0, 60.0], &names);
    Some(figure)
}

fn axes<'a>(curves: &Curves, shown: impl Iterator<Item = &'a [f64]>, unit: Unit, size: [f64; 2]) -> Option<Chart> {
    let across = Span::Logarithmic(*curves.frequencies_hz.first()?, *curves.frequencies_hz.last()?);
    let all = shown.flatten().copied();
    let up = if unit == Unit::Ohm {
        let (least, greatest) = extent(all.filter(|value| *value > 0.0))?;
        let low = (least.log10() - 0.1).max(greatest.log10() - 6.0);
        Span::Logarithmic(10f64.powf(low), 10f64.powf(greatest.log10() + 0.25))
    } else {
        let (least, greatest) = extent(all)?;
        Span::Linear(least.max(greatest - 140.0) - 4.0, greatest + 6.0)
    };
    Some(Chart::new([[76.0, 76.0], [size[0] - 18.0, size[1] - 30.0]], across, up))
}

/// Draws the least margin between filter and converter.
fn margin(figure: &mut Figure, chart: &Chart, result: &InputFilterResult) {
    let least = result.least_margin();
    let (low, high) =
        (chart.at(least.frequency_hz, least.filter_ohm), chart.at(least.frequency_hz, least.converter_ohm));
    let role = if least.margin_db < 0.0 { Role::Missed } else { Role::Good };
    for end in [low, high] {
        figure.marks.push(Mark::Circle { centre: end, radius: 3.0, role, width: None });
    }
    figure.marks.push(Mark::Line { points: vec![low, high], role, width: WIDTHS.0, dash: Dash::Solid });
    let words = in_words(result);
    let at_left = low[0] + 190.0 > chart.corners[1][0];
    let (x, align) = if at_left { (low[0] - 9.0, Align::End) } else { (low[0] + 9.0, Align::Start) };
    let y = 0.5 * (low[1] + high[1]);
    text(figure, [x, y], &words, (role, SMALL + 1.0, Weight::Bold), (align, Align::Middle));
}

/// "20.6 dB to ZD at 8.66 kHz".
pub fn in_words(result: &InputFilterResult) -> String {
    let least = result.least_margin();
    format!(
        "{} to {} at {}",
        print_digits(least.margin_db, Unit::Decibel, 3),
        least.against.symbol(),
        print_digits(least.frequency_hz, Unit::Hertz, 3)
    )
}

/// Marks the greatest closed-loop output impedance.
fn peak(figure: &mut Figure, chart: &Chart, curves: &Curves) {
    let pairs = curves.frequencies_hz.iter().zip(&curves.output_impedance_ohm);
    let Some((frequency_hz, ohm)) = pairs.max_by(|one, other| one.1.total_cmp(other.1)) else { return };
    let at = chart.at(*frequency_hz, *ohm);
    figure.marks.push(Mark::Circle { centre: at, radius: 3.5, role: Role::Good, width: None });
    let words = format!("{} at {}", print_digits(*ohm, Unit::Ohm, 3), print_digits(*frequency_hz, Unit::Hertz, 3));
    let at_left = at[0] + 150.0 > chart.corners[1][0];
    let (x, align) = if at_left { (at[0] - 9.0, Align::End) } else { (at[0] + 9.0, Align::Start) };
    text(figure, [x, at[1] - 4.0], &words, (Role::Good, SMALL + 1.0, Weight::Bold), (align, Align::End));
}
