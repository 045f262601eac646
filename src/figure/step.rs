//! The time response to a load, line or reference step, with its deviation and the band it settles into.

use super::axis::extent;
use super::chart::{Chart, Pen, SMALL, Span, WIDTHS, heading, legend, line, text};
use super::stroke::{Align, Dash, Figure, Role, Weight};
use crate::analysis::{Analysis, Step};
use crate::quantity::{Unit, print_digits};

/// Event whose time response is shown.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Event {
    /// Rise in load current.
    #[default]
    Load,
    /// Rise in input voltage.
    Line,
    /// Rise of the reference.
    Reference,
}

impl Event {
    /// Its name.
    pub fn name(self) -> &'static str {
        match self {
            Event::Load => "Load step",
            Event::Line => "Line step",
            Event::Reference => "Reference step",
        }
    }

    /// The response to it, where there is one.
    pub fn of(self, analysis: &Analysis) -> Option<&Step> {
        let steps = &analysis.shown.as_ref().ok()?.steps;
        match self {
            Event::Load => steps.load.as_ref(),
            Event::Line => steps.line.as_ref(),
            Event::Reference => steps.reference.as_ref(),
        }
    }

    fn unit(self) -> Unit {
        if self == Event::Load { Unit::Ampere } else { Unit::Volt }
    }
}

/// Half of the band that is seen at most, as a share of the span of the response.
const BAND_SHARE: f64 = 1.2;

/// Response of the output voltage to an event at the shown condition; size in points. None when there is no response.
pub fn step(
    title: &str,
    analysis: &Analysis,
    held: Option<(&str, &Analysis)>,
    event: Event,
    size: [f64; 2],
) -> Option<Figure> {
    let response = event.of(analysis)?;
    let held = held.and_then(|(name, held)| event.of(held).map(|step| (name, step)));
    let mut figure = Figure { size, ..Figure::default() };
    let rise = print_digits(response.size, event.unit(), 3);
    heading(&mut figure, title, &format!("{}, +{rise}, at {}", event.name(), analysis.place()));
    let chart = axes(response, held.map(|(_, step)| step), size)?;
    let band = (response.final_v - response.band_v, response.final_v + response.band_v);
    chart.area(&mut figure, chart.x.range(), band, Role::Settle);
    chart.columns(&mut figure, Unit::Second);
    chart.levels(&mut figure, Unit::Volt, None, f64::NAN);
    let pen = Pen { role: Role::LoopGain, width: WIDTHS.0, dash: Dash::Solid };
    let mut names = Vec::new();
    if let Some((name, held)) = held {
        let pen = Pen { role: Role::Held, width: WIDTHS.1, dash: Dash::Dotted };
        chart.curve(&mut figure, &held.times_s, &held.output_v, pen);
        names.push((pen, format!("held: {name}")));
    }
    chart.curve(&mut figure, &response.times_s, &response.output_v, pen);
    names.push((pen, "output voltage".to_owned()));
    chart.frame(&mut figure);
    read(&mut figure, &chart, response);
    legend(&mut figure, [size[0] - 18.0, 60.0], &names);
    Some(figure)
}

fn axes(step: &Step, held: Option<&Step>, size: [f64; 2]) -> Option<Chart> {
    let all = step.output_v.iter().chain(held.into_iter().flat_map(|held| &held.output_v)).copied();
    let (least, greatest) = extent(all.clone())?;
    // A band far wider than the response would flatten it: then only part of the band is seen.
    let half = step.band_v.min(BAND_SHARE * (greatest - least));
    let (least, greatest) = extent(all.chain([step.final_v - half, step.final_v + half]))?;
    let room = (greatest - least).max(1e-9) * 0.08;
    let corners = [[76.0, 76.0], [size[0] - 18.0, size[1] - 30.0]];
    let end = step.times_s.last().copied()?;
    Some(Chart::new(corners, Span::Linear(0.0, end), Span::Linear(least - room, greatest + 2.0 * room)))
}

/// Marks deviation and settling, in words and in the plot.
fn read(figure: &mut Figure, chart: &Chart, step: &Step) {
    if let Some(time) = step.deviation_at_s {
        let (from, to) = (chart.at(time, step.initial_v), chart.at(time, step.initial_v + step.deviation_v));
        line(figure, vec![from, to], Role::Good, (1.5, Dash::Solid));
        let words = print_digits(step.deviation_v, Unit::Volt, 3);
        let at = [to[0] + 7.0, from[1].midpoint(to[1])];
        text(figure, at, &words, (Role::Good, 12.0, Weight::Bold), (Align::Start, Align::Middle));
    }
    if let Some(time) = step.settling_s.filter(|time| *time > 0.0) {
        chart.vertical(figure, time, Role::Good, (1.0, Dash::Dotted));
    }
    let band = print_digits(step.band_v, Unit::Volt, 3);
    let words = match step.settling_s {
        Some(0.0) => format!("stays within ±{band}"),
        Some(time) => format!("settles to ±{band} in {}", print_digits(time, Unit::Second, 3)),
        None => format!("does not settle to ±{band} here"),
    };
    let [[_, top], [right, bottom]] = chart.corners;
    let (y, down) = if step.deviation_v > 0.0 { (bottom - 8.0, Align::End) } else { (top + 8.0, Align::Start) };
    text(figure, [right - 8.0, y], &words, (Role::Quiet, SMALL, Weight::Regular), (Align::End, down));
}
