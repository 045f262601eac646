//! The schematic of isolated feedback: divider and regulator at the left, LED and transistor of the optocoupler face to face, pull-up and
//! control voltage at the right.

use super::compensator::Sheet;
use super::pen::{Frame, LINE, Label, Line};
use super::stroke::{Align, Dash, Mark, Point, Role};
use super::symbol::{self, HALF, Way};
use crate::circuit::Symbol;
use crate::compensator::{Compensator, LedSupply, Part, ShuntRegulator};

/// Height of the terminals [points].
const TOP: f64 = 6.0;
/// Room between the terminals and the first part [points].
const LEAD: f64 = 8.0;
/// Distance of the column beside the LED's from it [points].
const BESIDE: f64 = 26.0;
/// Height of the LED with its leads [points].
const LED: f64 = 34.0;
/// Room between symbol and words [points].
const GAP: f64 = 3.0;

/// Heights of the nodes [points].
struct Levels {
    /// Anode of the LED, and the control voltage.
    anode: f64,
    /// Cathode of the LED.
    led: f64,
    /// Cathode of the regulator, whence the network goes back.
    cathode: f64,
    /// The regulator's reference, tap of the divider.
    tap: f64,
}

impl Levels {
    fn new(compensator: &Compensator) -> Self {
        let above = if compensator.has(Part::C3) { 64.0 } else { 46.0 };
        let anode = TOP + LEAD + above;
        Levels { anode, led: anode + LED, cathode: anode + LED + 22.0, tap: anode + LED + 44.0 }
    }
}

impl Sheet<'_> {
    /// Draws isolated feedback; gives the place of the control terminal's wire.
    pub(super) fn isolated(&mut self, compensator: &Compensator, regulator: &ShuntRegulator) -> Point {
        let at = Levels::new(compensator);
        let row: &[Part] = if compensator.has(Part::R2) { &[Part::C1, Part::R2] } else { &[Part::C1] };
        let divider = 2.0 + self.widest(&[Part::Upper, Part::Lower]) + GAP + 4.5;
        let beside: &[Part] = if compensator.has(Part::C3) { &[Part::R3, Part::C3, Part::Bias] } else { &[Part::Bias] };
        let turn = divider + 12.0;
        let for_words = divider + 8.0 + self.widest(beside) + GAP + 7.2 + BESIDE;
        let led = for_words.max(turn + self.row_width(row) + 8.0);
        self.divider([divider, at.tap]);
        self.pen.line(&[[divider, at.tap], [led - HALF, at.tap]]);
        self.network(row, (turn, led), &at);
        self.led_branch(compensator, regulator, led, &at);
        self.regulator([led, at.tap]);
        let words = self.widest(&[Part::Led]).max(self.led_words().width() + 8.0);
        self.transistor(compensator, led + GAP + 4.5 + words + 17.0, &at)
    }

    /// Width of the widest words among parts.
    fn widest(&self, parts: &[Part]) -> f64 {
        parts.iter().map(|part| self.words(*part).width()).fold(0.0, f64::max)
    }

    /// A terminal at the top of a column.
    fn terminal_at_top(&mut self, x: f64) {
        self.pen.terminal([x, TOP]);
        self.claim(Frame::new(x - 3.0, TOP - 6.0, x + 3.0, TOP + 6.0));
    }

    /// The divider from its terminal over the tap to ground.
    fn divider(&mut self, [x, tap]: Point) {
        self.terminal_at_top(x);
        let word = Label::new(vec![Line::quiet("Vout")]);
        let (at, align) = ([x - 6.0, TOP], (Align::End, Align::Middle));
        self.claim(word.frame(at, align));
        self.pen.label(&word, at, align);
        let (upper, lower) = (f64::midpoint(TOP, tap), tap + HALF + 4.0);
        self.pen.line(&[[x, TOP + 2.2], [x, upper - HALF]]);
        self.down(Part::Upper, [x, upper], true);
        self.pen.line(&[[x, upper + HALF], [x, lower - HALF]]);
        self.pen.dot([x, tap]);
        self.down(Part::Lower, [x, lower], true);
        self.ground([x, lower + HALF]);
    }

    /// C1, and R2 where one is fitted, from the cathode back to the tap's wire.
    fn network(&mut self, row: &[Part], (turn, led): (f64, f64), at: &Levels) {
        self.row(row, (turn, led), at.cathode);
        self.pen.line(&[[turn, at.cathode], [turn, at.tap]]);
        self.pen.dot([turn, at.tap]);
        self.pen.dot([led, at.cathode]);
    }

    /// LED resistor, LED, and what stands beside them.
    fn led_branch(&mut self, compensator: &Compensator, regulator: &ShuntRegulator, x: f64, at: &Levels) {
        self.feed(regulator, x);
        let beside = x - BESIDE;
        let resistor = f64::midpoint(TOP + LEAD, at.anode);
        self.pen.line(&[[x, TOP + 2.2], [x, resistor - HALF]]);
        self.down(Part::Led, [x, resistor], false);
        self.pen.line(&[[x, resistor + HALF], [x, at.anode + 4.0]]);
        if compensator.has(Part::C3) {
            let top = TOP + LEAD;
            let (r3, c3) = (top + 4.0 + HALF, at.anode - 4.0 - HALF);
            self.pen.line(&[[x, top], [beside, top], [beside, r3 - HALF]]);
            self.pen.dot([x, top]);
            self.down(Part::R3, [beside, r3], true);
            self.pen.line(&[[beside, r3 + HALF], [beside, c3 - HALF]]);
            self.down(Part::C3, [beside, c3], true);
            self.pen.line(&[[beside, c3 + HALF], [beside, at.anode + 4.0]]);
            self.pen.dot([beside, at.anode]);
            self.pen.line(&[[beside, at.anode], [x, at.anode]]);
        } else {
            self.pen.line(&[[x, at.anode], [beside, at.anode], [beside, at.anode + 4.0]]);
        }
        self.pen.dot([x, at.anode]);
        let middle = f64::midpoint(at.anode, at.led);
        self.down(Part::Bias, [beside, middle], true);
        self.pen.line(&[[beside, middle + HALF], [beside, at.led], [x, at.led]]);
        self.led([x, middle]);
        self.pen.dot([x, at.led]);
        self.pen.line(&[[x, middle + HALF], [x, at.tap - HALF]]);
    }

    /// What feeds the LED: a terminal with its word, or the voltage of its supply.
    fn feed(&mut self, regulator: &ShuntRegulator, x: f64) {
        let start = self.pen.marks.len();
        self.terminal_at_top(x);
        let (line, fixed) = match regulator.led_supply {
            LedSupply::Load => (Line::quiet("load"), false),
            LedSupply::Bank => (Line::quiet("bank"), false),
            LedSupply::Fixed(_) => (Line::value(&self.numbers.text(LED_SUPPLY)), true),
        };
        let label = Label::new(vec![line]);
        let (at, align) = ([x + 6.0, TOP], (Align::Start, Align::Middle));
        self.pen.label(&label, at, align);
        let frame = label.frame(at, align).union(Frame::new(x - 3.0, TOP - 6.0, x + 3.0, TOP + 6.0));
        self.claim(frame);
        if fixed {
            let name = format!("Supply of the LED {}", self.numbers.text(LED_SUPPLY));
            self.place(name, frame, vec![LED_SUPPLY.to_owned()], start);
        }
    }

    fn led_words(&self) -> Label {
        Label::new(vec![Line::quiet("LED"), Line::value(&self.numbers.text("compensator.opto.led-drop"))])
    }

    /// The LED, its light towards the transistor.
    fn led(&mut self, [x, y]: Point) {
        let start = self.pen.marks.len();
        symbol::draw(&mut self.pen, Symbol::Diode, [x, y], Way::Down);
        for row in [y - 4.0, y + 3.0] {
            self.pen.line(&[[x + 8.5, row], [x + 14.5, row]]);
            self.pen.area(vec![[x + 18.0, row], [x + 14.0, row - 2.2], [x + 14.0, row + 2.2]]);
        }
        let label = self.led_words();
        let (at, align) = ([x + 8.0, y + HALF + 3.0], (Align::Start, Align::Start));
        self.pen.label(&label, at, align);
        let frame = symbol::frame(Symbol::Diode, Way::Down).moved(x, y).union(label.frame(at, align));
        let paths = ["compensator.opto.led-drop", "compensator.opto.led-resistance"].map(str::to_owned);
        let name = format!("LED {}", self.numbers.text("compensator.opto.led-drop"));
        self.place(name, frame.union(Frame::new(x, y - 7.0, x + 18.5, y + 7.0)), paths.to_vec(), start);
    }

    /// The regulator: a diode from ground to the cathode with bent bar, its reference at the left.
    fn regulator(&mut self, [x, y]: Point) {
        let start = self.pen.marks.len();
        symbol::draw(&mut self.pen, Symbol::Diode, [x, y], Way::Up);
        self.pen.line(&[[x - 5.4, y - 5.0], [x - 5.4, y - 2.4]]);
        self.pen.line(&[[x + 5.4, y - 5.0], [x + 5.4, y - 7.6]]);
        self.pen.line(&[[x - HALF, y], [x - 2.7, y]]);
        let text = self.numbers.text("compensator.reference");
        let label = Label::new(vec![Line::value(&text)]);
        let (at, align) = ([x + 10.0, y], (Align::Start, Align::Middle));
        self.pen.label(&label, at, align);
        let frame = Frame::new(x - 7.0, y - 8.5, x + 6.0, y + HALF).union(label.frame(at, align));
        let paths =
            ["reference", "shunt.dc-gain", "shunt.gain-bandwidth", "shunt.least-current", "shunt.least-voltage"];
        let paths = paths.map(|path| format!("compensator.{path}"));
        self.place(format!("Shunt regulator {text}"), frame, paths.to_vec(), start);
        self.ground([x, y + HALF]);
    }

    /// The optocoupler's transistor with pull-up, C2 and the control voltage's wire.
    fn transistor(&mut self, compensator: &Compensator, x: f64, at: &Levels) -> Point {
        self.supply(x);
        let pull_up = f64::midpoint(TOP + LEAD, at.anode);
        self.pen.line(&[[x, TOP + 2.2], [x, pull_up - HALF]]);
        self.down(Part::PullUp, [x, pull_up], false);
        let middle = f64::midpoint(at.anode, at.led);
        self.pen.line(&[[x, pull_up + HALF], [x, middle - HALF]]);
        self.pen.dot([x, at.anode]);
        let start = self.pen.marks.len();
        // The insulation between the sides; it belongs to the optocoupler.
        let insulation = vec![[x - 12.5, TOP - 6.0], [x - 12.5, at.tap + HALF]];
        self.pen.marks.push(Mark::Line { points: insulation, role: Role::GridStrong, width: 0.9, dash: Dash::Dashed });
        let [bar, up, down] = [x - 7.0, middle - HALF, middle + HALF];
        self.pen.thick(&[[bar, middle - 7.0], [bar, middle + 7.0]], LINE * 1.6);
        self.pen.line(&[[bar, middle - 3.0], [x, middle - 9.0], [x, up]]);
        self.pen.line(&[[bar, middle + 3.0], [x, middle + 9.0], [x, down]]);
        self.pen.area(vec![[x - 0.6, middle + 8.5], [x - 5.0, middle + 7.6], [x - 2.6, middle + 4.0]]);
        let text = self.numbers.text("compensator.opto.transfer-ratio.nominal");
        let label = Label::new(vec![Line::value(&text)]);
        let (word, align) = ([x + 5.0, middle], (Align::Start, Align::Middle));
        self.pen.label(&label, word, align);
        let frame = Frame::new(bar - 1.5, up, x + 1.0, down).union(label.frame(word, align));
        let of_opto = [
            "transfer-ratio.nominal",
            "transfer-ratio.least",
            "transfer-ratio.greatest",
            "saturation",
            "pole",
            "pole-at",
            "capacitance",
        ];
        let paths = of_opto.map(|path| format!("compensator.opto.{path}"));
        self.place(format!("Optocoupler, transfer ratio {text}"), frame, paths.to_vec(), start);
        self.ground([x, down]);
        if !compensator.has(Part::C2) {
            // Far enough for the terminal's word to stand beside the pull-up's.
            let end = x + self.widest(&[Part::PullUp]) + 30.0;
            self.pen.line(&[[x, at.anode], [end, at.anode]]);
            return [end, at.anode];
        }
        let capacitor = [x + 5.0 + label.width() + 8.0 + 7.2, at.anode + LED / 2.0 + 2.0];
        self.pen.line(&[[x, at.anode], [capacitor[0], at.anode]]);
        self.pen.line(&[[capacitor[0], at.anode], [capacitor[0], capacitor[1] - HALF]]);
        self.pen.dot([capacitor[0], at.anode]);
        self.down(Part::C2, capacitor, false);
        self.ground([capacitor[0], capacitor[1] + HALF]);
        [capacitor[0], at.anode]
    }

    /// The pull-up's supply.
    fn supply(&mut self, x: f64) {
        let start = self.pen.marks.len();
        self.terminal_at_top(x);
        let text = self.numbers.text("compensator.opto.supply");
        let label = Label::new(vec![Line::value(&text)]);
        let (at, align) = ([x + 6.0, TOP], (Align::Start, Align::Middle));
        self.pen.label(&label, at, align);
        let frame = label.frame(at, align).union(Frame::new(x - 3.0, TOP - 6.0, x + 3.0, TOP + 6.0));
        self.place(format!("Supply {text}"), frame, vec!["compensator.opto.supply".to_owned()], start);
    }
}

const LED_SUPPLY: &str = "compensator.opto.led-supply";
