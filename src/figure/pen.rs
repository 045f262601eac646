//! What drawings of circuits share: frames, widths of text, lines of a label, and the marks they become.

use super::stroke::{Align, Dash, Figure, Mark, Place, Point, Role, Weight};

/// Width of wires and symbols [points].
pub(super) const LINE: f64 = 1.2;
/// Height of the letters of values [points].
pub(super) const VALUE: f64 = 10.5;
/// Height of the letters of designators and of what is written less loudly [points].
pub(super) const QUIET: f64 = 9.5;
/// Height of one line of a label [points].
pub(super) const ROW: f64 = 11.5;
/// Room between designator and value on one line [points].
const WORD_GAP: f64 = 3.5;
/// Radius of a junction's dot [points].
const DOT: f64 = 1.9;

/// Width of a text [points], rather too wide than too narrow for the window's face and others without serifs.
pub(super) fn text_width(text: &str, size: f64) -> f64 {
    let letter = |c: char| match c {
        ' ' | '.' | ',' | ':' | 'i' | 'j' | 'l' | '\'' => 0.3,
        'f' | 't' | 'r' | '(' | ')' => 0.39,
        'm' | 'M' | 'W' | 'w' | '…' | '%' | '∞' => 0.92,
        'Ω' | 'A'..='Z' => 0.76,
        '0'..='9' => 0.66,
        _ => 0.62,
    };
    text.chars().map(letter).sum::<f64>() * size
}

/// A rectangle along the axes [points].
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Frame {
    pub(super) left: f64,
    pub(super) top: f64,
    pub(super) right: f64,
    pub(super) bottom: f64,
}

impl Frame {
    pub(super) fn new(left: f64, top: f64, right: f64, bottom: f64) -> Self {
        Frame { left, top, right, bottom }
    }

    pub(super) fn union(self, other: Frame) -> Self {
        Frame {
            left: self.left.min(other.left),
            top: self.top.min(other.top),
            right: self.right.max(other.right),
            bottom: self.bottom.max(other.bottom),
        }
    }

    pub(super) fn moved(self, x: f64, y: f64) -> Self {
        Frame { left: self.left + x, top: self.top + y, right: self.right + x, bottom: self.bottom + y }
    }

    pub(super) fn grown(self, by: f64) -> Self {
        Frame { left: self.left - by, top: self.top - by, right: self.right + by, bottom: self.bottom + by }
    }

    pub(super) fn corners(self) -> [Point; 2] {
        [[self.left, self.top], [self.right, self.bottom]]
    }
}

/// One line of a label: pieces with their roles and sizes.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Line(Vec<(String, Role, f64)>);

impl Line {
    /// A value.
    pub(super) fn value(text: &str) -> Self {
        Line(vec![(text.to_owned(), Role::Ink, VALUE)])
    }

    /// A designator, or a number of less weight.
    pub(super) fn quiet(text: &str) -> Self {
        Line(vec![(text.to_owned(), Role::Quiet, QUIET)])
    }

    /// A designator and a value.
    pub(super) fn both(designator: &str, value: &str) -> Self {
        let pieces = [(designator, Role::Quiet, QUIET), (value, Role::Ink, VALUE)];
        Line(pieces.into_iter().filter(|(text, ..)| !text.is_empty()).map(|(t, r, s)| (t.to_owned(), r, s)).collect())
    }

    pub(super) fn is_empty(&self) -> bool {
        self.0.iter().all(|(text, ..)| text.is_empty())
    }

    pub(super) fn width(&self) -> f64 {
        let gaps = WORD_GAP * (self.0.len().max(1) - 1) as f64;
        self.0.iter().map(|(text, _, size)| text_width(text, *size)).sum::<f64>() + gaps
    }
}

/// Lines one below the other.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Label {
    pub(super) lines: Vec<Line>,
}

impl Label {
    pub(super) fn new(lines: Vec<Line>) -> Self {
        Label { lines: lines.into_iter().filter(|line| !line.is_empty()).collect() }
    }

    pub(super) fn width(&self) -> f64 {
        self.lines.iter().map(Line::width).fold(0.0, f64::max)
    }

    pub(super) fn height(&self) -> f64 {
        ROW * self.lines.len() as f64
    }

    /// Where the label stands against a point, across and down.
    pub(super) fn frame(&self, at: Point, align: (Align, Align)) -> Frame {
        let start = |at: f64, size: f64, align: Align| match align {
            Align::Start => at,
            Align::Middle => at - size / 2.0,
            Align::End => at - size,
        };
        let (left, top) = (start(at[0], self.width(), align.0), start(at[1], self.height(), align.1));
        Frame::new(left, top, left + self.width(), top + self.height())
    }
}

/// Marks being put down.
#[derive(Clone, Debug, Default)]
pub(super) struct Pen {
    pub(super) marks: Vec<Mark>,
}

impl Pen {
    /// A line of the usual width through points.
    pub(super) fn line(&mut self, points: &[Point]) {
        self.thick(points, LINE);
    }

    pub(super) fn thick(&mut self, points: &[Point], width: f64) {
        self.marks.push(Mark::Line { points: points.to_vec(), role: Role::Ink, width, dash: Dash::Solid });
    }

    /// A thin line that leads from a part to its words.
    pub(super) fn leader(&mut self, points: &[Point]) {
        self.marks.push(Mark::Line { points: points.to_vec(), role: Role::GridStrong, width: 0.8, dash: Dash::Solid });
    }

    pub(super) fn dot(&mut self, centre: Point) {
        self.marks.push(Mark::Circle { centre, radius: DOT, role: Role::Ink, width: None });
    }

    pub(super) fn circle(&mut self, centre: Point, radius: f64) {
        self.marks.push(Mark::Circle { centre, radius, role: Role::Ink, width: Some(LINE) });
    }

    pub(super) fn area(&mut self, points: Vec<Point>) {
        self.marks.push(Mark::Area { points, role: Role::Ink });
    }

    /// A terminal to which something outside the drawing is joined.
    pub(super) fn terminal(&mut self, centre: Point) {
        self.marks.push(Mark::Circle { centre, radius: 2.2, role: Role::Ink, width: Some(LINE) });
    }

    /// The ground, hanging from a point.
    pub(super) fn ground(&mut self, at: Point) {
        let [x, y] = at;
        self.line(&[at, [x, y + 5.0]]);
        for (half, down) in [(6.0, 5.0), (3.8, 7.4), (1.6, 9.8)] {
            self.line(&[[x - half, y + down], [x + half, y + down]]);
        }
    }

    /// A label against a point; each line is placed by itself, the pieces of a line beside one another.
    pub(super) fn label(&mut self, label: &Label, at: Point, align: (Align, Align)) {
        let frame = label.frame(at, align);
        for (row, line) in label.lines.iter().enumerate() {
            let y = frame.top + ROW * (row as f64 + 0.5);
            if let [(text, role, size)] = line.0.as_slice() {
                self.text(text, *role, *size, [at[0], y], align.0);
                continue;
            }
            let spare = frame.right - frame.left - line.width();
            let mut x = frame.left
                + match align.0 {
                    Align::Start => 0.0,
                    Align::Middle => spare / 2.0,
                    Align::End => spare,
                };
            for (text, role, size) in &line.0 {
                let width = text_width(text, *size);
                self.text(text, *role, *size, [x + width / 2.0, y], Align::Middle);
                x += width + WORD_GAP;
            }
        }
    }

    pub(super) fn text(&mut self, text: &str, role: Role, size: f64, at: Point, across: Align) {
        let (text, align, weight) = (text.to_owned(), (across, Align::Middle), Weight::Regular);
        self.marks.push(Mark::Text { at, text, role, size, weight, align });
    }
}

/// A figure of what stands within a frame.
pub(super) fn finished(mut marks: Vec<Mark>, mut places: Vec<Place>, frame: Frame) -> Figure {
    let shift = |point: &mut Point| *point = [point[0] - frame.left, point[1] - frame.top];
    for mark in &mut marks {
        match mark {
            Mark::Line { points, .. } | Mark::Area { points, .. } => points.iter_mut().for_each(shift),
            Mark::Circle { centre, .. } => shift(centre),
            Mark::Text { at, .. } => shift(at),
        }
    }
    places.iter_mut().flat_map(|place| &mut place.corners).for_each(shift);
    Figure { size: [frame.right - frame.left, frame.bottom - frame.top], marks, places }
}
