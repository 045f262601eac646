//! Closed-loop responses over frequency: output impedance, line to output, reference to output; the open loop beside.

use super::chart::{Chart, Pen, SMALL, Span, WIDTHS, extent, heading, legend, text};
use super::stroke::{Align, Dash, Figure, Mark, Role, Weight};
use crate::analysis::{Analysis, Curves};
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
}

impl ClosedLoop {
    /// Its name.
    pub fn name(self) -> &'static str {
        match self {
            ClosedLoop::Impedance => "Output impedance",
            ClosedLoop::Line => "Line to output",
            ClosedLoop::Reference => "Following",
        }
    }

    /// Closed-loop curve, open-loop curve where there is one, and their unit.
    pub fn of(self, curves: &Curves) -> (&[f64], Option<&[f64]>, Unit) {
        match self {
            ClosedLoop::Impedance => {
                (&curves.output_impedance_ohm, Some(&curves.open_loop_output_impedance_ohm), Unit::Ohm)
            }
            ClosedLoop::Line => (&curves.line_to_output_db, Some(&curves.open_loop_line_to_output_db), Unit::Decibel),
            ClosedLoop::Reference => (&curves.reference_to_output_db, None, Unit::Decibel),
        }
    }
}

/// A closed-loop response at the shown condition; size in points. None when the condition has no results or its closed
/// loop is not stable.
pub fn response(
    title: &str,
    analysis: &Analysis,
    held: Option<(&str, &Analysis)>,
    which: ClosedLoop,
    size: [f64; 2],
) -> Option<Figure> {
    let detail = analysis.shown.as_ref().ok().filter(|detail| detail.loop_gain.stable())?;
    let curves = &detail.curves;
    let (closed, open, unit) = which.of(curves);
    let mut figure = Figure { size, ..Figure::default() };
    heading(&mut figure, title, &format!("{} at {}", which.name(), analysis.place()));
    let chart = axes(curves, closed, open, unit, size)?;
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
        chart.curve(&mut figure, &held.curves.frequencies_hz, which.of(&held.curves).0, pen);
        names.push((pen, format!("held: {name}")));
    }
    if let Some(open) = open {
        let pen = Pen { role: Role::Held, width: WIDTHS.1, dash: Dash::Dashed };
        chart.curve(&mut figure, xs, open, pen);
        names.push((pen, "open loop".to_owned()));
    }
    let pen = Pen { role: Role::LoopGain, width: WIDTHS.0, dash: Dash::Solid };
    chart.curve(&mut figure, xs, closed, pen);
    names.push((pen, "closed loop".to_owned()));
    chart.frame(&mut figure);
    if which == ClosedLoop::Impedance {
        peak(&mut figure, &chart, curves);
    }
    legend(&mut figure, [size[0] - 18.0, 60.0], &names);
    Some(figure)
}

fn axes(curves: &Curves, closed: &[f64], open: Option<&[f64]>, unit: Unit, size: [f64; 2]) -> Option<Chart> {
    let across = Span::Logarithmic(*curves.frequencies_hz.first()?, *curves.frequencies_hz.last()?);
    let all = closed.iter().chain(open.unwrap_or_default()).copied();
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
