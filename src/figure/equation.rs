//! The drawing of a difference equation: from the converter's output through divider, sampling and equation to the control, and the equation
//! under it with its coefficients.

use super::pen::{Frame, Label, Line, Pen, QUIET, ROW, VALUE, finished, text_width};
use super::stroke::{Align, Figure, Place, Role};
use super::symbol::{self, HALF, Way};
use super::values::Numbers;
use crate::circuit::Symbol;
use crate::compensator::{Codes, Digital};
use crate::quantity::{Unit, print_digits};

/// Height of the line through the blocks [points].
const AXIS: f64 = 24.0;
/// Half a block's height [points].
const BLOCK: f64 = 13.0;
/// Radius of the ring at which reference and sample meet [points].
const RING: f64 = 6.0;
/// Digits of a coefficient in the drawing; the list has them all.
const DIGITS: usize = 6;

struct Sheet<'a> {
    pen: Pen,
    places: Vec<Place>,
    frame: Frame,
    numbers: &'a Numbers<'a>,
}

/// The drawing of a difference equation.
pub(super) fn equation_figure(digital: &Digital, numbers: &Numbers<'_>) -> Figure {
    let mut sheet = Sheet { pen: Pen::default(), places: Vec::new(), frame: Frame::new(0.0, 0.0, 0.0, 0.0), numbers };
    let tap = sheet.divider();
    let end = sheet.chain(digital, tap);
    sheet.table(digital, end);
    finished(sheet.pen.marks, sheet.places, sheet.frame.grown(2.0))
}

/// Width of a block with a word in it [points].
fn block_width(word: &str) -> f64 {
    (text_width(word, VALUE) + 10.0).max(30.0)
}

impl Sheet<'_> {
    fn claim(&mut self, frame: Frame) {
        self.frame = self.frame.union(frame);
    }

    fn label(&mut self, label: &Label, at: [f64; 2], align: (Align, Align)) -> Frame {
        self.pen.label(label, at, align);
        let frame = label.frame(at, align);
        self.claim(frame);
        frame
    }

    fn place(&mut self, name: String, frame: Frame, paths: &[&str], start: usize) {
        self.claim(frame);
        let paths = paths.iter().map(|path| (*path).to_owned()).collect();
        self.places.push(Place { name, corners: frame.corners(), paths, marks: start..self.pen.marks.len() });
    }

    /// The output's terminal and the divider; gives the place of its tap.
    fn divider(&mut self) -> f64 {
        let (middle, tap) = (44.0, 71.0);
        self.pen.line(&[[2.2, AXIS], [middle - HALF, AXIS]]);
        self.pen.terminal([0.0, AXIS]);
        self.claim(Frame::new(-3.0, AXIS - 3.0, 3.0, AXIS + 3.0));
        let word = Label::new(vec![Line::quiet("Vout")]);
        self.label(&word, [-3.0, AXIS + 5.0], (Align::Start, Align::Start));
        self.resistor("compensator.divider.upper", "Rupper", [middle, AXIS], Way::Right);
        self.pen.line(&[[middle + HALF, AXIS], [tap, AXIS]]);
        self.pen.dot([tap, AXIS]);
        // Below the upper resistor's name, beside which its own words stand.
        let centre = [tap, AXIS + 20.0 + HALF];
        self.pen.line(&[[tap, AXIS], [tap, centre[1] - HALF]]);
        self.resistor("compensator.divider.lower", "Rlower", centre, Way::Down);
        self.pen.line(&[[tap, centre[1] + HALF], [tap, centre[1] + HALF + 3.0]]);
        self.pen.ground([tap, centre[1] + HALF + 3.0]);
        self.claim(Frame::new(tap - 6.0, AXIS, tap + 6.0, centre[1] + HALF + 14.0));
        tap
    }

    fn resistor(&mut self, path: &str, designator: &str, centre: [f64; 2], way: Way) {
        let start = self.pen.marks.len();
        symbol::draw(&mut self.pen, Symbol::Resistor, centre, way);
        let mut frame = symbol::frame(Symbol::Resistor, way).moved(centre[0], centre[1]);
        let text = self.numbers.text(path);
        if way == Way::Right {
            let value = Label::new(vec![Line::value(&text)]);
            frame = frame.union(self.label(&value, [centre[0], frame.top - 1.0], (Align::Middle, Align::End)));
            let name = Label::new(vec![Line::quiet(designator)]);
            frame = frame.union(self.label(&name, [centre[0], frame.bottom + 1.0], (Align::Middle, Align::Start)));
        } else {
            let words = Label::new(vec![Line::quiet(designator), Line::value(&text)]);
            frame = frame.union(self.label(&words, [frame.left - 3.0, centre[1]], (Align::End, Align::Middle)));
        }
        let word = if designator == "Rupper" { "Upper divider resistor" } else { "Lower divider resistor" };
        self.place(format!("{word} {text}"), frame, &[path], start);
    }

    /// A block on the line with a word in it and a number under it; gives its right end.
    fn block(&mut self, left: f64, word: &str, under: &str, name: String, paths: &[&str]) -> f64 {
        let width = block_width(word);
        let start = self.pen.marks.len();
        let (right, top, bottom) = (left + width, AXIS - BLOCK, AXIS + BLOCK);
        self.pen.line(&[[left, top], [right, top], [right, bottom], [left, bottom], [left, top]]);
        self.pen.text(word, Role::Ink, VALUE, [f64::midpoint(left, right), AXIS], Align::Middle);
        let frame = Frame::new(left, top, right, bottom);
        if !under.is_empty() {
            let label = Label::new(vec![Line::quiet(under)]);
            let at = [f64::midpoint(left, right), bottom + 2.0];
            self.label(&label, at, (Align::Middle, Align::Start));
        }
        if paths.is_empty() {
            self.claim(frame);
        } else {
            self.place(name, frame, paths, start);
        }
        right
    }

    /// Converter, difference, equation and what follows, from the tap on; gives the right end.
    fn chain(&mut self, digital: &Digital, tap: f64) -> f64 {
        let wire = |sheet: &mut Self, from: f64, to: f64| sheet.pen.line(&[[from, AXIS], [to, AXIS]]);
        let range = self.numbers.text("compensator.digital.input-range");
        let left = tap + 10.0;
        wire(self, tap, left);
        let name = format!("Analog-to-digital converter, {range}");
        let right = self.block(left, "A/D", &range, name, &["compensator.digital.input-range"]);
        let ring = right + 9.0 + RING;
        wire(self, right, ring - RING);
        self.reference(ring);
        // What stands under the block keeps clear of the reference's wire.
        let period = print_digits(digital.period_s, Unit::Second, 3);
        let under = text_width(&format!("each {period}"), QUIET);
        let left = (ring + RING + 8.0).max(ring + 4.0 + (under - block_width("C(z)")) / 2.0);
        wire(self, ring + RING, left);
        let paths = [
            "compensator.digital.gain",
            "compensator.digital.zero-1",
            "compensator.digital.pole-1",
            "compensator.digital.zero-2",
            "compensator.digital.pole-2",
            "compensator.digital.prewarp",
            "compensator.digital.bits",
            "compensator.digital.fraction-bits",
            "compensator.digital.feedback-fraction-bits",
        ];
        let name = format!("Difference equation, every {period}, {} bits", digital.bits);
        let right = self.block(left, "C(z)", &format!("each {period}"), name, &paths);
        let left = self.wait([right, f64::midpoint(left, right) + under / 2.0]);
        let right = if digital.duty_command {
            self.block(left, "PWM", "", String::new(), &[])
        } else {
            let range = self.numbers.text("compensator.digital.output-range");
            let name = format!("Digital-to-analog converter, {range}");
            self.block(left, "D/A", &range, name, &["compensator.digital.output-range"])
        };
        let end = right + 14.0;
        wire(self, right, end - 2.2);
        self.pen.terminal([end, AXIS]);
        let word = Label::new(vec![Line::quiet(if digital.duty_command { "duty" } else { "control" })]);
        let at = [(end + 3.0).max(right + 3.0 + word.width()), AXIS + BLOCK + 2.0];
        self.claim(Frame::new(end, AXIS - 3.0, end + 3.0, AXIS + 3.0));
        self.label(&word, at, (Align::End, Align::Start));
        end
    }

    /// What passes from sample to update, over the wire behind the equation; gives where the next block begins. `from` is the wire's start and where
    /// what stands under the block before it ends.
    fn wait(&mut self, from: [f64; 2]) -> f64 {
        let text = self.numbers.text("compensator.digital.computation");
        let label = Label::new(vec![Line::value(&text)]);
        let end = (from[0] + label.width() + 8.0).max(from[1] + 6.0);
        self.pen.line(&[[from[0], AXIS], [end, AXIS]]);
        let start = self.pen.marks.len();
        let at = [f64::midpoint(from[0], end), AXIS - 3.0];
        let frame = self.label(&label, at, (Align::Middle, Align::End));
        self.place(format!("Sample to update {text}"), frame, &["compensator.digital.computation"], start);
        end
    }

    /// The ring where the sample is taken from the reference.
    fn reference(&mut self, x: f64) {
        self.pen.circle([x, AXIS], RING);
        self.claim(Frame::new(x - RING, AXIS - RING, x + RING, AXIS + RING));
        let start = self.pen.marks.len();
        let end = AXIS + BLOCK + 25.0;
        self.pen.line(&[[x, AXIS + RING], [x, end - 2.2]]);
        self.pen.terminal([x, end]);
        let text = self.numbers.text("compensator.reference");
        let label = Label::new(vec![Line::value(&text)]);
        let frame = self.label(&label, [x + 6.0, end], (Align::Start, Align::Middle));
        let frame = frame.union(Frame::new(x - 3.0, end - 6.0, x + 3.0, end + 6.0));
        self.place(format!("Reference {text}"), frame, &["compensator.reference"], start);
        // What comes from the converter is taken off.
        self.pen.line(&[[x - RING - 6.0, AXIS - 5.0], [x - RING - 2.5, AXIS - 5.0]]);
    }

    /// The equation in general, and a row for each coefficient: name, value, code.
    fn table(&mut self, digital: &Digital, end: f64) {
        let Some(codes) = digital.fixed_point() else { return };
        let mut y = self.frame.bottom + 10.0;
        let terms = |name: char, signal: char, from: usize, count: usize| {
            (from..from + count).map(move |k| {
                let back = if k == 0 { String::new() } else { format!("−{k}") };
                format!("{name}{k}·{signal}[n{back}]")
            })
        };
        let rows: [Vec<String>; 2] = [
            terms('a', 'u', 1, codes.feedback.codes.len()).collect(),
            terms('b', 'e', 0, codes.forward.codes.len()).collect(),
        ];
        for (lead, row) in ["u[n] = ", "+ "].into_iter().zip(&rows) {
            let text = format!("{lead}{}", row.join(" + "));
            let x = if lead.starts_with('u') { 0.0 } else { text_width("u[n] =", QUIET) - text_width("+ ", QUIET) };
            self.label(&Label::new(vec![Line::quiet(&text)]), [x, y], (Align::Start, Align::Start));
            y += ROW + 1.0;
        }
        y += 4.0;
        let columns = [0.0, 24.0, f64::max(140.0, end * 0.55)];
        self.group('a', 1, &codes.feedback, columns, &mut y);
        self.group('b', 0, &codes.forward, columns, &mut y);
    }

    fn group(&mut self, name: char, from: usize, codes: &Codes, columns: [f64; 3], y: &mut f64) {
        for (k, (value, code)) in codes.values().iter().zip(&codes.codes).enumerate() {
            let words = [
                Line::quiet(&format!("{name}{}", from + k)),
                Line::value(&print_digits(*value, Unit::One, DIGITS)),
                Line::quiet(&format!("{} / 2^{}", code.to_string().replace('-', "−"), codes.fraction_bits)),
            ];
            for (words, x) in words.into_iter().zip(columns) {
                self.label(&Label::new(vec![words]), [x, *y], (Align::Start, Align::Start));
            }
            *y += ROW + 1.0;
        }
    }
}
