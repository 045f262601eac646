//! A plot being drawn into a figure: ground, grid, curves and words within a frame with an axis along each side.
//!
//! *Conventions*: the frame is given in the figure's points; curves are cut at the frame, and a point that is not finite
//! breaks a curve.

use super::axis::{Axis, DecadeLine, decade_lines, grid_label, multiples, narrow, nice_step};
use super::stroke::{Align, Dash, Figure, Mark, Point, Role, Weight};
use crate::quantity::{Unit, print_digits};

/// Height of the letters of labels [points].
pub(super) const SMALL: f64 = 11.0;
/// Width of the main curve and of those beside it [points].
pub(super) const WIDTHS: (f64, f64) = (1.9, 1.4);
/// Room a label of the axis across needs [points].
const LABEL_WIDTH: f64 = 74.0;
/// Room a label of the axis along the left needs [points].
const LABEL_HEIGHT: f64 = 22.0;

/// Lines of a decade.
const EVERY_DIGIT: [u8; 9] = [1, 2, 3, 4, 5, 6, 7, 8, 9];

/// A frame with its axes.
#[derive(Clone, Copy, Debug)]
pub(super) struct Chart {
    /// Upper left and lower right corner [points].
    pub(super) corners: [Point; 2],
    /// Along the lower edge.
    pub(super) x: Axis,
    /// Along the left edge.
    pub(super) y: Axis,
}

/// How values are spread along an axis, and between which.
#[derive(Clone, Copy, Debug)]
pub(super) enum Span {
    /// Equal distances for equal differences.
    Linear(f64, f64),
    /// Equal distances for equal ratios; both positive.
    Logarithmic(f64, f64),
}

impl Span {
    fn axis(self, start: f64, end: f64) -> Axis {
        match self {
            Span::Linear(from, to) => Axis::linear(from, to, narrow(start), narrow(end)),
            Span::Logarithmic(from, to) => Axis::logarithmic(from, to, narrow(start), narrow(end)),
        }
    }
}

/// How a curve is drawn.
#[derive(Clone, Copy, Debug)]
pub(super) struct Pen {
    pub(super) role: Role,
    pub(super) width: f64,
    pub(super) dash: Dash,
}

impl Chart {
    /// A frame between two corners.
    pub(super) fn new(corners: [Point; 2], x: Span, y: Span) -> Self {
        let [[left, top], [right, bottom]] = corners;
        Chart { corners, x: x.axis(left, right), y: y.axis(bottom, top) }
    }

    /// Where a pair of values stands.
    pub(super) fn at(&self, x: f64, y: f64) -> Point {
        [f64::from(self.x.at(x)), f64::from(self.y.at(y))]
    }

    /// Paints the ground of the frame in a role.
    pub(super) fn area(&self, figure: &mut Figure, x: (f64, f64), y: (f64, f64), role: Role) {
        let inside = |[px, py]: Point| {
            let [[left, top], [right, bottom]] = self.corners;
            [px.clamp(left, right), py.clamp(top, bottom)]
        };
        let (low, high) = (inside(self.at(x.0, y.0)), inside(self.at(x.1, y.1)));
        if (high[0] - low[0]).abs() > 0.0 && (high[1] - low[1]).abs() > 0.0 {
            let points = vec![low, [high[0], low[1]], high, [low[0], high[1]]];
            figure.marks.push(Mark::Area { points, role });
        }
    }

    /// Lines of a decade grid of frequencies across, with labels at the decades when they have room below.
    pub(super) fn decades(&self, figure: &mut Figure, labels: bool) {
        self.decades_of(figure, labels.then_some(Unit::Hertz));
    }

    /// Lines of a decade grid across, with labels in a unit at the decades; none without a unit.
    pub(super) fn decades_of(&self, figure: &mut Figure, labels: Option<Unit>) {
        let (from, to) = self.x.range();
        let [[left, _], [right, bottom]] = self.corners;
        for DecadeLine { value, digit } in decade_lines(from, to) {
            let decade = digit == 1;
            self.vertical(figure, value, if decade { Role::GridStrong } else { Role::Grid }, (0.8, Dash::Solid));
            if let Some(unit) = labels.filter(|_| decade) {
                let at = [f64::from(self.x.at(value)).clamp(left + 10.0, right - 14.0), bottom + 6.0];
                let words = print_digits(value, unit, 1);
                text(figure, at, &words, (Role::Quiet, SMALL, Weight::Regular), (Align::Middle, Align::Start));
            }
        }
    }

    /// Lines and labels of a linear grid across.
    pub(super) fn columns(&self, figure: &mut Figure, unit: Unit) {
        self.columns_of(figure, Some(unit));
    }

    /// Lines of a linear grid across, with labels in a unit; none without one.
    pub(super) fn columns_of(&self, figure: &mut Figure, labels: Option<Unit>) {
        let ((from, to), [[left, _], [right, bottom]]) = (self.x.range(), self.corners);
        let step = nice_step(to - from, ((right - left) / LABEL_WIDTH).max(1.0));
        for value in multiples(from, to, step) {
            self.vertical(figure, value, Role::Grid, (0.8, Dash::Solid));
            if let Some(unit) = labels {
                let at = [f64::from(self.x.at(value)).min(right - 10.0), bottom + 6.0];
                let words = grid_label(value, step, unit);
                text(figure, at, &words, (Role::Quiet, SMALL, Weight::Regular), (Align::Middle, Align::Start));
            }
        }
    }

    /// Lines and labels of a linear grid along the left; the line at `strong` is the heavy one.
    pub(super) fn levels(&self, figure: &mut Figure, unit: Unit, step: Option<f64>, strong: f64) {
        let ((low, high), [[_, top], [_, bottom]]) = (self.y.range(), self.corners);
        let step = step.unwrap_or_else(|| nice_step(high - low, ((bottom - top) / LABEL_HEIGHT).max(1.0)));
        for value in multiples(low, high, step) {
            let heavy = (value - strong).abs() < step * 1e-6;
            self.level(figure, value, if heavy { Role::GridStrong } else { Role::Grid });
            self.level_label(figure, value, &grid_label(value, step, unit));
        }
    }

    /// Lines of a decade grid along the left, with labels at the decades, and between them where those are few.
    pub(super) fn level_decades(&self, figure: &mut Figure, unit: Unit) {
        let (low, high) = self.y.range();
        let labelled = |digits: &[u8]| decade_lines(low, high).filter(|line| digits.contains(&line.digit)).count() > 1;
        let digits = [&[1][..], &[1, 2, 5]].into_iter().find(|digits| labelled(digits)).unwrap_or(&EVERY_DIGIT);
        for DecadeLine { value, digit } in decade_lines(low, high) {
            self.level(figure, value, if digit == 1 { Role::GridStrong } else { Role::Grid });
            if digits.contains(&digit) {
                self.level_label(figure, value, &print_digits(value, unit, 1));
            }
        }
    }

    fn level(&self, figure: &mut Figure, value: f64, role: Role) {
        let ([[left, _], [right, _]], y) = (self.corners, f64::from(self.y.at(value)));
        line(figure, vec![[left, y], [right, y]], role, (0.8, Dash::Solid));
    }

    fn level_label(&self, figure: &mut Figure, value: f64, words: &str) {
        let at = [self.corners[0][0] - 7.0, f64::from(self.y.at(value))];
        text(figure, at, words, (Role::Quiet, SMALL, Weight::Regular), (Align::End, Align::Middle));
    }

    /// A line across the whole height at a value; none outside the frame.
    pub(super) fn vertical(&self, figure: &mut Figure, value: f64, role: Role, pen: (f64, Dash)) {
        if self.x.holds(value) {
            let ([[_, top], [_, bottom]], x) = (self.corners, f64::from(self.x.at(value)));
            line(figure, vec![[x, top], [x, bottom]], role, pen);
        }
    }

    /// The frame itself.
    pub(super) fn frame(&self, figure: &mut Figure) {
        let [[left, top], [right, bottom]] = self.corners;
        let points = vec![[left, top], [right, top], [right, bottom], [left, bottom], [left, top]];
        line(figure, points, Role::GridStrong, (1.0, Dash::Solid));
    }

    /// A curve, cut at the frame.
    pub(super) fn curve(&self, figure: &mut Figure, xs: &[f64], ys: &[f64], pen: Pen) {
        let mut run: Vec<Point> = Vec::new();
        let mut before: Option<Point> = None;
        for (&x, &y) in xs.iter().zip(ys) {
            let here = (x.is_finite() && y.is_finite()).then(|| self.at(x, y));
            match (before, here) {
                (Some(one), Some(other)) => match self.cut(one, other) {
                    Some([from, to]) => {
                        if run.last() != Some(&from) {
                            flush(figure, &mut run, pen);
                            run.push(from);
                        }
                        run.push(to);
                    }
                    None => flush(figure, &mut run, pen),
                },
                _ => flush(figure, &mut run, pen),
            }
            before = here;
        }
        flush(figure, &mut run, pen);
    }

    /// The part of a segment inside the frame.
    ///
    /// *Source*: Liang & Barsky 1984, clipping by the parameter of the segment.
    fn cut(&self, from: Point, to: Point) -> Option<[Point; 2]> {
        let [[left, top], [right, bottom]] = self.corners;
        let (dx, dy) = (to[0] - from[0], to[1] - from[1]);
        let (mut start, mut end) = (0.0_f64, 1.0_f64);
        let edges = [(-dx, from[0] - left), (dx, right - from[0]), (-dy, from[1] - top), (dy, bottom - from[1])];
        for (slope, distance) in edges {
            if slope == 0.0 {
                if distance < 0.0 {
                    return None;
                }
            } else if slope < 0.0 {
                start = start.max(distance / slope);
            } else {
                end = end.min(distance / slope);
            }
        }
        let at = |share: f64| {
            if share <= 0.0 {
                from
            } else if share >= 1.0 {
                to
            } else {
                [share.mul_add(dx, from[0]), share.mul_add(dy, from[1])]
            }
        };
        (start <= end).then(|| [at(start), at(end)])
    }

    /// The area between two curves, cut at the frame from above and below.
    pub(super) fn band(&self, figure: &mut Figure, xs: &[f64], low_high: &[(f64, f64)], role: Role) {
        let [[left, top], [right, bottom]] = self.corners;
        let usable = |&(&x, &(low, high)): &(&f64, &(f64, f64))| {
            let across = f64::from(self.x.at(x));
            low.is_finite() && high.is_finite() && (left..=right).contains(&across)
        };
        let place = |x: f64, y: f64| {
            let [across, down] = self.at(x, y);
            [across, down.clamp(top, bottom)]
        };
        let pairs: Vec<_> = xs.iter().zip(low_high).filter(usable).collect();
        let mut points: Vec<Point> = pairs.iter().map(|(x, (_, high))| place(**x, *high)).collect();
        points.extend(pairs.iter().rev().map(|(x, (low, _))| place(**x, *low)));
        if points.len() > 3 {
            figure.marks.push(Mark::Area { points, role });
        }
    }
}

fn flush(figure: &mut Figure, run: &mut Vec<Point>, pen: Pen) {
    let points = std::mem::take(run);
    if points.len() > 1 {
        line(figure, points, pen.role, (pen.width, pen.dash));
    }
}

/// A line through points; width [points] and style.
pub(super) fn line(figure: &mut Figure, points: Vec<Point>, role: Role, (width, dash): (f64, Dash)) {
    figure.marks.push(Mark::Line { points, role, width, dash });
}

/// A line of text; its role, height [points] and weight.
pub(super) fn text(
    figure: &mut Figure,
    at: Point,
    words: &str,
    (role, size, weight): (Role, f64, Weight),
    align: (Align, Align),
) {
    figure.marks.push(Mark::Text { at, text: words.to_owned(), role, size, weight, align });
}

/// Heading of a figure: what it is of, and the condition it holds for.
pub(super) fn heading(figure: &mut Figure, title: &str, condition: &str) {
    let start = (Align::Start, Align::Start);
    text(figure, [12.0, 9.0], title, (Role::Ink, 14.0, Weight::Bold), start);
    text(figure, [12.0, 28.0], condition, (Role::Quiet, 11.5, Weight::Regular), start);
}

/// A legend: short pieces of lines with their names, side by side from the right end of a row.
pub(super) fn legend(figure: &mut Figure, right_end: Point, entries: &[(Pen, String)]) {
    /// Mean width of a letter at the legend's height [points]; names stand well apart, so an estimate serves.
    const LETTER: f64 = 6.1;
    let mut x = right_end[0];
    for (pen, name) in entries.iter().rev() {
        x -= LETTER * name.chars().count() as f64;
        let words = (Role::Ink, SMALL, Weight::Regular);
        text(figure, [x, right_end[1]], name, words, (Align::Start, Align::Middle));
        line(figure, vec![[x - 30.0, right_end[1]], [x - 7.0, right_end[1]]], pen.role, (pen.width, pen.dash));
        x -= 46.0;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn curves_end_at_the_frame_and_break_where_there_is_no_value() {
        let chart = Chart::new([[0.0, 0.0], [100.0, 100.0]], Span::Linear(0.0, 10.0), Span::Linear(0.0, 10.0));
        let mut figure = Figure::default();
        let pen = Pen { role: Role::LoopGain, width: 1.0, dash: Dash::Solid };
        chart.curve(&mut figure, &[0.0, 5.0, 6.0, f64::NAN, 7.0, 8.0], &[5.0, 15.0, 5.0, 1.0, 5.0, -5.0], pen);
        let runs: Vec<_> = figure
            .marks
            .iter()
            .map(|mark| match mark {
                Mark::Line { points, .. } => points.clone(),
                _ => Vec::new(),
            })
            .collect();
        assert_eq!(runs.len(), 3, "{runs:?}");
        assert_eq!(runs[0], [[0.0, 50.0], [25.0, 0.0]]);
        assert_eq!(runs[1], [[55.0, 0.0], [60.0, 50.0]]);
        assert_eq!(runs[2], [[70.0, 50.0], [75.0, 100.0]]);
    }
}
