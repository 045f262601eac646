//! The schematic of a compensator: divider, amplifier, and the network around it or behind it.
//!
//! An op amp has its network over it, from its output back to the tap of the divider. A transconductance amplifier has the same
//! parts from its output down to ground. Isolated feedback is drawn in `isolated`.

use super::pen::{Frame, Label, Line, Pen, finished};
use super::stroke::{Align, Figure, Place};
use super::symbol::{self, HALF, Way};
use super::values::Numbers;
use crate::circuit::Symbol;
use crate::compensator::{Amplifier, Compensator, Kind, Part};

/// Distance between lines that lie one over the other [points].
const STEP: f64 = 40.0;
/// Half of the amplifier's height [points].
const HEIGHT: f64 = 21.0;
/// Its length [points].
const LENGTH: f64 = 36.0;
/// Distance of its inputs from its axis [points].
const INPUT: f64 = 9.5;
/// Least room of a part on a line [points].
const PART: f64 = 42.0;

/// Least room of the upper resistor: its designator keeps off the word at the terminal [points].
const UPPER: f64 = 68.0;

/// Names of the parts in the drawing.
fn designator(part: Part) -> &'static str {
    match part {
        Part::Upper => "Rupper",
        Part::Lower => "Rlower",
        Part::R2 => "R2",
        Part::C1 => "C1",
        Part::C2 => "C2",
        Part::R3 => "R3",
        Part::C3 => "C3",
        Part::Feedforward => "Cff",
        Part::Led => "Rled",
        Part::Bias => "Rbias",
        Part::PullUp => "Rpull",
    }
}

/// A label with where it is anchored and how.
type Anchored = (Label, [f64; 2], (Align, Align));

/// A drawing in progress.
pub(super) struct Sheet<'a> {
    pub(super) pen: Pen,
    places: Vec<Place>,
    frame: Frame,
    pub(super) numbers: &'a Numbers<'a>,
}

/// The schematic of a compensator.
pub fn compensator_schematic(compensator: &Compensator, numbers: &Numbers<'_>) -> Figure {
    if let Some(digital) = compensator.digital() {
        return super::equation::equation_figure(&digital, numbers);
    }
    let mut sheet = Sheet { pen: Pen::default(), places: Vec::new(), frame: Frame::new(0.0, 0.0, 0.0, 0.0), numbers };
    if let Some(regulator) = compensator.isolated() {
        let end = sheet.isolated(compensator, regulator);
        sheet.control(end);
        return finished(sheet.pen.marks, sheet.places, sheet.frame.grown(2.0));
    }
    let op_amp = matches!(compensator.amplifier, Amplifier::OpAmp(_));
    let over = match compensator.kind {
        _ if !op_amp => 0.0,
        Kind::One => 1.0,
        Kind::Two | Kind::Three => 2.0,
    };
    let across = compensator.has(Part::C3) || compensator.has(Part::Feedforward);
    // Lines over the amplifier's inputs: those of the network, at least one for what is across the upper resistor.
    let y = 22.0 + STEP * f64::max(over, if across { 1.0 } else { 0.0 });
    let tap = sheet.input(compensator, y);
    let end = if op_amp { sheet.op_amp(compensator, [tap, y]) } else { sheet.transconductance(compensator, [tap, y]) };
    sheet.control(end);
    finished(sheet.pen.marks, sheet.places, sheet.frame.grown(2.0))
}

impl Sheet<'_> {
    pub(super) fn claim(&mut self, frame: Frame) {
        self.frame = self.frame.union(frame);
    }

    /// A part on a line, its value over it and its designator under it.
    fn along(&mut self, part: Part, centre: [f64; 2]) {
        let frame = symbol::frame(kind(part), Way::Right).moved(centre[0], centre[1]);
        let value = Label::new(vec![Line::value(&self.numbers.text(part.path()))]);
        let name = Label::new(vec![Line::quiet(designator(part))]);
        let words = [
            (value, [centre[0], frame.top - 1.0], (Align::Middle, Align::End)),
            (name, [centre[0], frame.bottom + 1.0], (Align::Middle, Align::Start)),
        ];
        self.part(part, centre, Way::Right, &words);
    }

    /// A part in a column, designator and value at one side.
    pub(super) fn down(&mut self, part: Part, centre: [f64; 2], words_at_left: bool) {
        let frame = symbol::frame(kind(part), Way::Down).moved(centre[0], centre[1]);
        let words = self.words(part);
        let (x, align) = if words_at_left { (frame.left - 3.0, Align::End) } else { (frame.right + 3.0, Align::Start) };
        self.part(part, centre, Way::Down, &[(words, [x, centre[1]], (align, Align::Middle))]);
    }

    /// Designator and value of a part, one below the other.
    pub(super) fn words(&self, part: Part) -> Label {
        Label::new(vec![Line::quiet(designator(part)), Line::value(&self.numbers.text(part.path()))])
    }

    fn part(&mut self, part: Part, centre: [f64; 2], way: Way, words: &[Anchored]) {
        let start = self.pen.marks.len();
        symbol::draw(&mut self.pen, kind(part), centre, way);
        let mut frame = symbol::frame(kind(part), way).moved(centre[0], centre[1]);
        for (label, at, align) in words {
            self.pen.label(label, *at, *align);
            frame = frame.union(label.frame(*at, *align));
        }
        let mut words = part.label().trim_start_matches("the ").to_owned();
        if let Some(first) = words.get_mut(..1) {
            first.make_ascii_uppercase();
        }
        let comma = if words.ends_with(|c: char| c.is_ascii_digit()) { "," } else { "" };
        let name = format!("{words}{comma} {}", self.numbers.text(part.path()));
        self.place(name, frame, vec![part.path().to_owned()], start);
    }

    pub(super) fn place(&mut self, name: String, frame: Frame, paths: Vec<String>, start: usize) {
        self.claim(frame);
        self.places.push(Place { name, corners: frame.corners(), paths, marks: start..self.pen.marks.len() });
    }

    /// From the converter's output through the divider; gives the place of its tap.
    fn input(&mut self, compensator: &Compensator, y: f64) -> f64 {
        let from = 10.0;
        let across: &[Part] = if compensator.has(Part::C3) {
            &[Part::R3, Part::C3]
        } else if compensator.has(Part::Feedforward) {
            &[Part::Feedforward]
        } else {
            &[]
        };
        let width = self.row_width(across).max(self.row_width(&[Part::Upper])).max(UPPER);
        let (tap, middle) = (from + width, from + width / 2.0);
        self.pen.line(&[[2.2, y], [middle - HALF, y]]);
        self.pen.terminal([0.0, y]);
        self.along(Part::Upper, [middle, y]);
        self.pen.line(&[[middle + HALF, y], [tap, y]]);
        if !across.is_empty() {
            self.row(across, (from, tap), y - STEP);
            for x in [from, tap] {
                self.pen.line(&[[x, y - STEP], [x, y]]);
                self.pen.dot([x, y]);
            }
        }
        let word = Label::new(vec![Line::quiet("Vout")]);
        let at = [-3.0, y + 5.0];
        self.claim(word.frame(at, (Align::Start, Align::Start)));
        self.pen.label(&word, at, (Align::Start, Align::Start));
        let lower = [tap, y + 31.0];
        self.pen.line(&[[tap, y], [tap, lower[1] - HALF]]);
        self.down(Part::Lower, lower, true);
        self.pen.dot([tap, y]);
        self.ground([tap, lower[1] + HALF]);
        tap
    }

    /// Room for parts on one line, their words included.
    pub(super) fn row_width(&self, parts: &[Part]) -> f64 {
        let width = |part: &Part| Line::value(&self.numbers.text(part.path())).width() + 6.0;
        parts.iter().map(width).fold(PART, f64::max) * parts.len() as f64 + 6.0
    }

    /// Parts on one line between two places.
    pub(super) fn row(&mut self, parts: &[Part], (from, to): (f64, f64), y: f64) {
        let pitch = (to - from) / parts.len() as f64;
        let mut x = from;
        for (k, part) in parts.iter().enumerate() {
            let centre = pitch.mul_add(k as f64 + 0.5, from);
            self.pen.line(&[[x, y], [centre - HALF, y]]);
            self.along(*part, [centre, y]);
            x = centre + HALF;
        }
        self.pen.line(&[[x, y], [to, y]]);
    }

    pub(super) fn ground(&mut self, at: [f64; 2]) {
        self.pen.ground(at);
        self.claim(Frame::new(at[0] - 6.0, at[1], at[0] + 6.0, at[1] + 11.0));
    }

    /// The amplifier with its minus input at a place, and the reference at its plus input; gives the place of its output.
    fn amplifier(&mut self, at: [f64; 2], name: &str, word: &str, paths: &[&str]) -> [f64; 2] {
        let start = self.pen.marks.len();
        let [x, y] = at;
        let axis = y + INPUT;
        self.pen.line(&[[x, axis - HEIGHT], [x + LENGTH, axis], [x, axis + HEIGHT], [x, axis - HEIGHT]]);
        let (minus, plus) = ([x + 6.5, y], [x + 6.5, axis + INPUT]);
        self.pen.line(&[[minus[0] - 2.6, y], [minus[0] + 2.6, y]]);
        self.pen.line(&[[plus[0] - 2.6, plus[1]], [plus[0] + 2.6, plus[1]]]);
        self.pen.line(&[[plus[0], plus[1] - 2.6], [plus[0], plus[1] + 2.6]]);
        let label = Label::new(vec![Line::quiet(word)]);
        self.pen.label(&label, [x + 12.5, axis], (Align::Start, Align::Middle));
        let paths = paths.iter().map(|path| (*path).to_owned()).collect();
        self.place(name.to_owned(), Frame::new(x, axis - HEIGHT, x + LENGTH, axis + HEIGHT), paths, start);
        self.reference([x, axis + INPUT]);
        [x + LENGTH, axis]
    }

    /// The reference at the amplifier's plus input: a terminal under it with its value.
    fn reference(&mut self, input: [f64; 2]) {
        let end = [input[0] - 7.0, input[1] + 18.0];
        self.pen.line(&[input, [end[0], input[1]], [end[0], end[1] - 2.2]]);
        let start = self.pen.marks.len();
        self.pen.terminal(end);
        let text = self.numbers.text("compensator.reference");
        let label = Label::new(vec![Line::value(&text)]);
        let (at, align) = ([end[0] + 6.0, end[1]], (Align::Start, Align::Middle));
        self.pen.label(&label, at, align);
        let frame = label.frame(at, align).union(Frame::new(end[0] - 3.0, end[1] - 6.0, end[0] + 3.0, end[1] + 6.0));
        self.place(format!("Reference {text}"), frame, vec!["compensator.reference".to_owned()], start);
    }

    /// An op amp with its network over it; gives the place of the control terminal's wire.
    fn op_amp(&mut self, compensator: &Compensator, tap: [f64; 2]) -> [f64; 2] {
        let [x, y] = tap;
        let paths = [
            "compensator.op-amp.gain-bandwidth",
            "compensator.op-amp.dc-gain",
            "compensator.op-amp.output-least",
            "compensator.op-amp.output-greatest",
        ];
        let name = format!("Op amp {}", self.numbers.text(paths[0]));
        let rows: &[&[Part]] = match compensator.kind {
            Kind::One => &[&[Part::C1]],
            Kind::Two | Kind::Three => &[&[Part::R2, Part::C1], &[Part::C2]],
        };
        let left = x + 16.0;
        let right = left + self.row_width(rows[0]).max(LENGTH + 20.0);
        let input = f64::midpoint(left, right) - LENGTH / 2.0;
        self.pen.line(&[tap, [input, y]]);
        let output = self.amplifier([input, y], &name, "", &paths);
        self.pen.line(&[output, [right, output[1]]]);
        let mut top = y;
        for (k, row) in rows.iter().enumerate() {
            let line = STEP.mul_add(-(k as f64 + 1.0), y) - 4.0;
            self.row(row, (left, right), line);
            if k > 0 {
                self.pen.dot([left, top]);
                self.pen.dot([right, top]);
            }
            top = line;
        }
        self.pen.line(&[[left, top], [left, y]]);
        self.pen.line(&[[right, top], [right, output[1]]]);
        self.pen.dot([left, y]);
        self.pen.dot([right, output[1]]);
        [right, output[1]]
    }

    /// A transconductance amplifier with its network from the output to ground; gives the place of the control terminal's wire.
    fn transconductance(&mut self, compensator: &Compensator, tap: [f64; 2]) -> [f64; 2] {
        let [x, y] = tap;
        let paths = [
            "compensator.transconductance.gm",
            "compensator.transconductance.output-resistance",
            "compensator.transconductance.output-current",
            "compensator.transconductance.output-least",
            "compensator.transconductance.output-greatest",
        ];
        let name = format!("Transconductance amplifier {}", self.numbers.text(paths[0]));
        let input = x + 22.0;
        self.pen.line(&[tap, [input, y]]);
        let [end, axis] = self.amplifier([input, y], &name, "gm", &paths);
        let columns: &[&[Part]] = match compensator.kind {
            Kind::One => &[&[Part::C1]],
            Kind::Two | Kind::Three => &[&[Part::R2, Part::C1], &[Part::C2]],
        };
        // A part's words stand clear of the reference's, also where one column is enough.
        let mut at = end + 14.0;
        let longest = columns[0].len() as f64;
        let ground = 2.0f64.mul_add(HALF, 6.0).mul_add(longest, axis + 4.0);
        for (k, column) in columns.iter().enumerate() {
            let mut from = axis;
            for (row, part) in column.iter().enumerate() {
                let share = (row as f64 + 0.5) / column.len() as f64;
                let centre = [at, share.mul_add(ground - axis, axis)];
                self.pen.line(&[[at, from], [at, centre[1] - HALF]]);
                self.down(*part, centre, false);
                from = centre[1] + HALF;
            }
            self.pen.line(&[[at, from], [at, ground]]);
            self.ground([at, ground]);
            self.pen.dot([at, axis]);
            if k + 1 < columns.len() {
                let widest = column.iter().map(|part| Line::value(&self.numbers.text(part.path())).width());
                at += widest.fold(24.0, f64::max) + 8.0 + 3.0 + 8.0 + 4.0;
            }
        }
        self.pen.line(&[[end, axis], [at, axis]]);
        [at, axis]
    }

    /// The terminal of the control voltage.
    fn control(&mut self, from: [f64; 2]) {
        let end = [from[0] + 22.0, from[1]];
        self.pen.line(&[from, [end[0] - 2.2, end[1]]]);
        self.pen.terminal(end);
        let label = Label::new(vec![Line::quiet("control")]);
        let (at, align) = ([end[0] + 3.0, end[1] - 4.0], (Align::End, Align::End));
        let at = [at[0].max(from[0] + label.width() + 4.0), at[1]];
        self.claim(label.frame(at, align).union(Frame::new(end[0], end[1] - 3.0, end[0] + 3.0, end[1] + 3.0)));
        self.pen.label(&label, at, align);
    }
}

fn kind(part: Part) -> Symbol {
    if part.is_resistor() { Symbol::Resistor } else { Symbol::Capacitor }
}
