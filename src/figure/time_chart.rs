//! Quantities over time in panels under one another on one time axis: one steady period, or what follows an event.
//!
//! *Conventions*: every panel has a row above its frame with its name and what its lines mean, so that no word stands over a curve. A trace
//! that was thinned to columns is the middle of each, with its least and greatest values as a band about it.

use super::axis::{Axis, extent};
use super::chart::{Chart, Pen, SMALL, Span, WIDTHS, heading, line, text};
use super::stroke::{Align, Dash, Figure, Point, Role, Weight};
use crate::quantity::Unit;

/// One quantity over time.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Trace {
    /// What it is, in a word or two.
    pub name: String,
    /// Times [s], never falling.
    pub times_s: Vec<f64>,
    /// Values at those times, in the panel's unit. One that is not finite breaks the line.
    pub values: Vec<f64>,
    /// Least and greatest value about those times, where the line is a middle; else empty.
    pub reach: Vec<(f64, f64)>,
    /// How it is drawn.
    pub look: TraceLook,
}

/// How a trace is drawn: colour by role, and a line style of its own within the panel.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TraceLook {
    /// What it stands for.
    pub role: Role,
    /// Style of the line.
    pub dash: Dash,
    /// True for the one that is read first.
    pub main: bool,
}

impl TraceLook {
    /// The one that is read first.
    pub const MAIN: TraceLook = TraceLook { role: Role::LoopGain, dash: Dash::Solid, main: true };

    /// One beside it.
    pub const fn beside(role: Role, dash: Dash) -> Self {
        TraceLook { role, dash, main: false }
    }
}

impl Default for TraceLook {
    fn default() -> Self {
        TraceLook::MAIN
    }
}

impl TraceLook {
    fn pen(self) -> Pen {
        Pen { role: self.role, width: if self.main { WIDTHS.0 } else { WIDTHS.1 }, dash: self.dash }
    }
}

/// Quantities of one unit in one frame.
#[derive(Clone, Debug, PartialEq)]
pub struct Panel {
    /// What it shows.
    pub name: String,
    /// Unit of all its traces.
    pub unit: Unit,
    /// The traces; painted in turn, so the main one stands last.
    pub traces: Vec<Trace>,
    /// A band to stay within, least and greatest.
    pub band: Option<(f64, f64)>,
    /// Levels that are marked: limits, with their names.
    pub levels: Vec<(f64, String)>,
    /// Height against the other panels.
    pub share: f64,
}

impl Panel {
    /// A panel without traces.
    pub fn new(name: &str, unit: Unit, share: f64) -> Self {
        Panel { name: name.to_owned(), unit, traces: Vec::new(), band: None, levels: Vec::new(), share }
    }

    /// Least and greatest value to be shown.
    fn range(&self) -> Option<(f64, f64)> {
        let ends =
            |trace: &Trace| trace.reach.iter().flat_map(|(least, greatest)| [*least, *greatest]).collect::<Vec<_>>();
        let all = self.traces.iter().flat_map(|trace| trace.values.iter().copied().chain(ends(trace)));
        let (least, greatest) = extent(all)?;
        // A level far off would flatten the traces: it is shown where it is within reach.
        let reach = (greatest - least).max(1e-3 * greatest.abs()).max(1e-9);
        let near = |level: &&(f64, String)| (least - reach..=greatest + reach).contains(&level.0);
        let levels = self.levels.iter().filter(near).map(|level| level.0);
        let (least, greatest) = extent(levels.chain([least, greatest]))?;
        let room = (greatest - least).max(1e-4 * greatest.abs()).max(1e-9) * ROOM_SHARE;
        Some((least - room, greatest + room))
    }
}

/// An instant that is marked across all panels.
#[derive(Clone, Debug, PartialEq)]
pub struct Instant {
    /// When [s].
    pub at_s: f64,
    /// What happens then; may be empty.
    pub name: String,
}

/// Panels over one time axis.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct TimeChart {
    /// Title, for what is put out.
    pub title: String,
    /// The condition and what is shown, for the same.
    pub condition: String,
    /// From when to when [s].
    pub span_s: (f64, f64),
    /// The panels, from above.
    pub panels: Vec<Panel>,
    /// Instants that are marked.
    pub instants: Vec<Instant>,
}

/// Where a panel was drawn.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Frame {
    /// Upper left and lower right corner [points].
    pub corners: [Point; 2],
    /// Time along the lower edge [s].
    pub x: Axis,
    /// Values along the left edge.
    pub y: Axis,
}

/// Room above and below the traces as a share of their span.
const ROOM_SHARE: f64 = 0.08;
/// Room left and right of the frames, and below the lowest [points].
const AROUND: (f64, f64, f64) = (64.0, 16.0, 22.0);
/// Room above the first panel for the names of instants, and for a heading where there is one [points].
const ABOVE: (f64, f64) = (15.0, 50.0);
/// Height of the row with names above each frame [points].
const ROW: f64 = 18.0;
/// Mean width of a letter of a row [points]; words stand apart, so an estimate serves.
const LETTER: f64 = 6.1;
/// Length of the piece of line in a row [points].
const SAMPLE: f64 = 20.0;

impl TimeChart {
    /// Draws the panels into a figure of this size [points], with its heading or without, and says where each panel stands.
    pub fn figure(&self, size: [f64; 2], headed: bool) -> (Figure, Vec<Frame>) {
        let mut figure = Figure { size, ..Figure::default() };
        if headed {
            heading(&mut figure, &self.title, &self.condition);
        }
        let top = ABOVE.0 + if headed { ABOVE.1 } else { 0.0 };
        let count = self.panels.len();
        let shares: f64 = self.panels.iter().map(|panel| panel.share).sum();
        let heads: Vec<Head<'_>> = self.panels.iter().map(|panel| Head::new(panel, size[0] - AROUND.1)).collect();
        let words: f64 = heads.iter().map(Head::height).sum();
        let free = (size[1] - top - AROUND.2 - words).max(1.0);
        let mut frames: Vec<Frame> = Vec::with_capacity(count);
        let mut y = top;
        for (k, (panel, head)) in self.panels.iter().zip(&heads).enumerate() {
            let above = head.height();
            let height = free * panel.share / shares.max(1e-9);
            let corners = [[AROUND.0, y + above], [size[0] - AROUND.1, y + above + height]];
            let (least, greatest) = panel.range().unwrap_or((0.0, 1.0));
            let across = Span::Linear(self.span_s.0, self.span_s.1);
            let chart = Chart::new(corners, across, Span::Linear(least, greatest));
            head.draw(&mut figure, panel, y);
            self.panel(&mut figure, panel, &chart, k + 1 == count);
            frames.push(Frame { corners, x: chart.x, y: chart.y });
            y += above + height;
        }
        self.instants(&mut figure, &frames, top - 4.0);
        (figure, frames)
    }

    fn panel(&self, figure: &mut Figure, panel: &Panel, chart: &Chart, lowest: bool) {
        if let Some(band) = panel.band {
            chart.area(figure, self.span_s, band, Role::Settle);
        }
        chart.columns_of(figure, lowest.then_some(Unit::Second));
        let crosses_zero = chart.y.holds(0.0);
        chart.levels(figure, panel.unit, None, if crosses_zero { 0.0 } else { f64::NAN });
        let ends = [self.span_s.0, self.span_s.1];
        for (level, name) in panel.levels.iter().filter(|level| chart.y.holds(level.0)) {
            let pen = Pen { role: Role::Landmark, width: 1.0, dash: Dash::Dotted };
            chart.curve(figure, &ends, &[*level, *level], pen);
            let [[_, _], [right, _]] = chart.corners;
            let at = [right - 6.0, chart.at(0.0, *level)[1] - 2.0];
            text(figure, at, name, (Role::Landmark, SMALL, Weight::Regular), (Align::End, Align::End));
        }
        for trace in &panel.traces {
            chart.band(figure, &trace.times_s, &trace.reach, Role::ExactLoop);
        }
        for trace in &panel.traces {
            chart.curve(figure, &trace.times_s, &trace.values, trace.look.pen());
        }
        chart.frame(figure);
    }

    /// Lines across all frames, and their names above the first as far as there is room.
    fn instants(&self, figure: &mut Figure, frames: &[Frame], y: f64) {
        let Some(first) = frames.first() else { return };
        let mut taken = f64::NEG_INFINITY;
        let shown: Vec<&Instant> = self.instants.iter().filter(|instant| first.x.holds(instant.at_s)).collect();
        let width = |instant: &Instant| LETTER * instant.name.chars().count() as f64;
        for (k, instant) in shown.iter().enumerate() {
            let x = f64::from(first.x.at(instant.at_s));
            for Frame { corners: [[_, top], [_, bottom]], .. } in frames {
                line(figure, vec![[x, *top], [x, *bottom]], Role::Landmark, (1.0, Dash::Dotted));
            }
            let half = width(instant) / 2.0;
            // Two that stand close make way for each other: one ends at its line, the other begins there.
            let near = |other: Option<&&Instant>| {
                other.is_some_and(|other| {
                    (f64::from(first.x.at(other.at_s)) - x).abs() < half + width(other) / 2.0 + 8.0
                })
            };
            let way =
                f64::from(i8::from(k > 0 && near(shown.get(k.wrapping_sub(1)))) - i8::from(near(shown.get(k + 1))));
            let middle = way.mul_add(half + 3.0, x).clamp(half + 4.0, (figure.size[0] - half - 4.0).max(half + 4.0));
            if middle - half > taken + 8.0 && !instant.name.is_empty() {
                taken = middle + half;
                let words = (Role::Landmark, SMALL, Weight::Regular);
                text(figure, [middle, y], &instant.name, words, (Align::Middle, Align::Middle));
            }
        }
    }
}

/// What stands above a frame: its name and the lines with theirs, in as many rows as they need.
struct Head<'a> {
    /// Where each begins across [points], and in which row.
    names: Vec<(f64, usize, &'a Trace)>,
    /// Length of the pieces of line [points].
    sample: f64,
    rows: usize,
}

impl<'a> Head<'a> {
    fn new(panel: &'a Panel, right: f64) -> Self {
        let left = AROUND.0;
        let (main, beside): (Vec<&Trace>, Vec<&Trace>) =
            panel.traces.iter().rev().filter(|trace| !trace.name.is_empty()).partition(|trace| trace.look.main);
        let named: Vec<&Trace> = main.into_iter().chain(beside).collect();
        let start = (LETTER + 0.4).mul_add(panel.name.chars().count() as f64, left + 16.0);
        // Where they have no room at their ease, they stand closer; where that is not enough, in further rows.
        let wanted = |trace: &&Trace| SAMPLE + 20.0 + LETTER * trace.name.chars().count() as f64;
        let ease = start + named.iter().map(wanted).sum::<f64>() <= right;
        let (sample, letter, gap) = if ease { (SAMPLE, LETTER, 14.0) } else { (12.0, 5.5, 7.0) };
        let (mut x, mut row) = (start, 0);
        let mut names = Vec::with_capacity(named.len());
        for trace in named {
            let width = letter.mul_add(trace.name.chars().count() as f64, sample + 5.0);
            if x + width > right && x > left {
                (x, row) = (left, row + 1);
            }
            names.push((x, row, trace));
            x += width + gap;
        }
        Head { names, sample, rows: row + 1 }
    }

    fn height(&self) -> f64 {
        ROW * self.rows as f64
    }

    fn draw(&self, figure: &mut Figure, panel: &Panel, top: f64) {
        let middle = |row: usize| ROW.mul_add(row as f64 + 0.5, top);
        let at = [AROUND.0, middle(0)];
        text(figure, at, &panel.name, (Role::Ink, SMALL, Weight::Bold), (Align::Start, Align::Middle));
        for (x, row, trace) in &self.names {
            let (pen, y) = (trace.look.pen(), middle(*row));
            line(figure, vec![[*x, y], [x + self.sample, y]], pen.role, (pen.width, pen.dash));
            let words = (Role::Quiet, SMALL, Weight::Regular);
            text(figure, [x + self.sample + 5.0, y], &trace.name, words, (Align::Start, Align::Middle));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::figure::Mark;

    fn chart() -> TimeChart {
        let times_s: Vec<f64> = (0..100).map(|k| f64::from(k) * 1e-7).collect();
        let values = |scale: f64| times_s.iter().map(|t| scale * (t * 1e6).sin()).collect::<Vec<f64>>();
        let trace = |name: &str, scale, look| Trace {
            name: name.to_owned(),
            times_s: times_s.clone(),
            values: values(scale),
            reach: Vec::new(),
            look,
        };
        let mut currents = Panel::new("Currents", Unit::Ampere, 2.0);
        currents.traces = vec![
            trace("switch", 0.5, TraceLook::beside(Role::Plant, Dash::Dashed)),
            trace("inductor", 1.0, TraceLook::MAIN),
        ];
        let mut output = Panel::new("Output voltage", Unit::Volt, 1.0);
        output.traces = vec![trace("", 1e-3, TraceLook::MAIN)];
        output.levels = vec![(1e3, "far off".to_owned()), (1.2e-3, "limit".to_owned())];
        TimeChart {
            title: "A <design>".to_owned(),
            condition: "one period".to_owned(),
            span_s: (0.0, 1e-5),
            panels: vec![currents, output],
            instants: vec![Instant { at_s: 4e-6, name: "switch opens".to_owned() }],
        }
    }

    #[test]
    fn panels_share_the_time_axis_and_stay_within_the_figure() {
        let size = [700.0, 400.0];
        let (figure, frames) = chart().figure(size, true);
        assert_eq!(frames.len(), 2);
        assert!((frames[0].x.at(5e-6) - frames[1].x.at(5e-6)).abs() < 1e-6);
        let height = |frame: &Frame| frame.corners[1][1] - frame.corners[0][1];
        assert!((height(&frames[0]) / height(&frames[1]) - 2.0).abs() < 1e-9);
        for mark in &figure.marks {
            if let Mark::Line { points, .. } = mark {
                assert!(points.iter().all(|[x, y]| (0.0..=size[0]).contains(x) && (0.0..=size[1]).contains(y)));
            }
        }
        let said: Vec<&str> = figure
            .marks
            .iter()
            .filter_map(|mark| if let Mark::Text { text, .. } = mark { Some(text.as_str()) } else { None })
            .collect();
        assert!(said.contains(&"switch opens") && said.contains(&"limit") && !said.contains(&"far off"), "{said:?}");
        assert!(frames[1].y.holds(1e-3) && !frames[1].y.holds(0.1), "a level far off does not flatten the trace");
    }

    #[test]
    fn a_constant_and_an_empty_panel_have_axes() {
        let mut chart = chart();
        chart.panels[0].traces.clear();
        for value in &mut chart.panels[1].traces[0].values {
            *value = 24.0;
        }
        let (_, frames) = chart.figure([300.0, 90.0], false);
        assert!(frames.iter().all(|frame| frame.y.range().0 < frame.y.range().1));
        assert!(frames[1].y.holds(24.0));
    }
}
