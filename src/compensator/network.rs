//! The compensator as typed, checked parts: read from entered values, written back to them.
//!
//! *Conventions.* SI units. A part that the network does not have keeps its entered or default value, so changing the type and
//! back loses nothing; it never enters a result.
//!
//! *Bad input.* All entries that cannot be used are reported at once, each with its place, reason and hint.

use super::digital::Digital;
use super::entries::{applies, chosen, entries};
use super::shunt::ShuntRegulator;
use crate::finding::Finding;
use crate::quantity::{Bounds, Choices, Entry, Unit, Values};

/// How many poles and zeros the network has beside its integrator.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// An integrator.
    One,
    /// An integrator, a zero and a pole.
    Two,
    /// An integrator, two zeros and two poles.
    Three,
}

impl Kind {
    /// The name in words: "type II".
    pub fn name(self) -> &'static str {
        match self {
            Kind::One => "type I",
            Kind::Two => "type II",
            Kind::Three => "type III",
        }
    }
}

/// The resistor that stays when a lane is moved.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Anchor {
    /// The upper divider resistor.
    Upper,
    /// The resistor in series with c1.
    R2,
}

/// An op amp: one dominant pole, no output resistance, output voltage within limits.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct OpAmp {
    /// Open-loop gain at DC [V/V].
    pub dc_gain: f64,
    /// Gain-bandwidth product [Hz].
    pub gain_bandwidth_hz: f64,
    /// Least output voltage [V].
    pub output_least: f64,
    /// Greatest output voltage [V].
    pub output_greatest: f64,
}

/// A transconductance amplifier: a current source across its output resistance, current and voltage within limits.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transconductance {
    /// Output current per input voltage [S].
    pub gm: f64,
    /// Output resistance [Ω].
    pub output_resistance: f64,
    /// Greatest current sourced or sunk [A].
    pub output_current: f64,
    /// Least output voltage [V].
    pub output_least: f64,
    /// Greatest output voltage [V].
    pub output_greatest: f64,
}

/// The error amplifier.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Amplifier {
    /// A voltage amplifier with the network around it.
    OpAmp(OpAmp),
    /// A voltage-to-current amplifier with the network from its output to ground.
    Transconductance(Transconductance),
    /// None: the output is sampled, and a difference equation computes the control voltage.
    Digital(Digital),
    /// A shunt regulator that drives an optocoupler.
    ShuntRegulator(ShuntRegulator),
}

/// The name of a part, as in the drawings.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Part {
    /// Upper divider resistor.
    Upper,
    /// Lower divider resistor.
    Lower,
    /// Resistor in series with c1.
    R2,
    /// Integrating capacitor.
    C1,
    /// Capacitor across r2 and c1.
    C2,
    /// Resistor in series with c3.
    R3,
    /// Capacitor of the branch across the upper resistor.
    C3,
    /// Capacitor straight across the upper resistor.
    Feedforward,
    /// Resistor that feeds the LED of an optocoupler.
    Led,
    /// Resistor across that LED.
    Bias,
    /// Pull-up at the optocoupler's collector.
    PullUp,
}

impl Part {
    /// Every part, in the order of the form.
    pub const ALL: [Part; 11] = [
        Part::Upper,
        Part::Lower,
        Part::R2,
        Part::C1,
        Part::C2,
        Part::R3,
        Part::C3,
        Part::Feedforward,
        Part::Led,
        Part::Bias,
        Part::PullUp,
    ];

    /// Path of the part's entry.
    pub fn path(self) -> &'static str {
        match self {
            Part::Upper => "compensator.divider.upper",
            Part::Lower => "compensator.divider.lower",
            Part::R2 => "compensator.r2",
            Part::C1 => "compensator.c1",
            Part::C2 => "compensator.c2",
            Part::R3 => "compensator.r3",
            Part::C3 => "compensator.c3",
            Part::Feedforward => "compensator.cff",
            Part::Led => "compensator.opto.led-resistor",
            Part::Bias => "compensator.opto.bias-resistor",
            Part::PullUp => "compensator.opto.pull-up",
        }
    }

    /// Short name for messages.
    pub fn label(self) -> &'static str {
        match self {
            Part::Upper => "the upper divider resistor",
            Part::Lower => "the lower divider resistor",
            Part::R2 => "R2",
            Part::C1 => "C1",
            Part::C2 => "C2",
            Part::R3 => "R3",
            Part::C3 => "C3",
            Part::Feedforward => "the feed-forward capacitor",
            Part::Led => "the LED resistor",
            Part::Bias => "the bias resistor",
            Part::PullUp => "the pull-up",
        }
    }

    /// Whether it is a resistor; otherwise a capacitor.
    pub fn is_resistor(self) -> bool {
        !matches!(self, Part::C1 | Part::C2 | Part::C3 | Part::Feedforward)
    }

    /// The part's row in the table of entries.
    pub fn entry(self) -> &'static Entry {
        // The table and this list are fixed together; a row without bounds stands in for one that is missing, and a test sees to
        // it that none is.
        static MISSING: Entry = Entry::new("", "", Unit::One, Bounds::Finite, 0.0, "");
        entries().find(|row| row.path == self.path()).unwrap_or(&MISSING)
    }
}

/// Values of all parts: resistors [Ω], capacitors [F].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Parts {
    /// Upper divider resistor [Ω].
    pub upper: f64,
    /// Lower divider resistor [Ω].
    pub lower: f64,
    /// Resistor in series with c1 [Ω].
    pub r2: f64,
    /// Integrating capacitor [F].
    pub c1: f64,
    /// Capacitor across r2 and c1 [F].
    pub c2: f64,
    /// Resistor in series with c3 [Ω].
    pub r3: f64,
    /// Capacitor of the branch across the upper resistor [F].
    pub c3: f64,
    /// Capacitor straight across the upper resistor [F].
    pub feedforward: f64,
    /// Resistor that feeds the LED of an optocoupler [Ω].
    pub led: f64,
    /// Resistor across that LED [Ω].
    pub bias: f64,
    /// Pull-up at the optocoupler's collector [Ω].
    pub pull_up: f64,
}

impl Parts {
    /// Fraction of the output voltage at the divider's tap, 0 to 1.
    pub(super) fn divider_ratio(&self) -> f64 {
        self.lower / (self.upper + self.lower)
    }

    /// Value of one part [Ω or F].
    pub fn get(&self, part: Part) -> f64 {
        match part {
            Part::Upper => self.upper,
            Part::Lower => self.lower,
            Part::R2 => self.r2,
            Part::C1 => self.c1,
            Part::C2 => self.c2,
            Part::R3 => self.r3,
            Part::C3 => self.c3,
            Part::Feedforward => self.feedforward,
            Part::Led => self.led,
            Part::Bias => self.bias,
            Part::PullUp => self.pull_up,
        }
    }

    /// Sets one part [Ω or F].
    pub fn set(&mut self, part: Part, value: f64) {
        match part {
            Part::Upper => self.upper = value,
            Part::Lower => self.lower = value,
            Part::R2 => self.r2 = value,
            Part::C1 => self.c1 = value,
            Part::C2 => self.c2 = value,
            Part::R3 => self.r3 = value,
            Part::C3 => self.c3 = value,
            Part::Feedforward => self.feedforward = value,
            Part::Led => self.led = value,
            Part::Bias => self.bias = value,
            Part::PullUp => self.pull_up = value,
        }
    }
}

/// A compensator: divider, reference, network and amplifier.
#[derive(Clone, Debug, PartialEq)]
pub struct Compensator {
    /// Type of the network.
    pub kind: Kind,
    /// The error amplifier.
    pub amplifier: Amplifier,
    /// The resistor that stays when a lane is moved.
    pub anchor: Anchor,
    /// Whether a capacitor stands straight across the upper resistor; never in a type III network.
    pub has_feedforward: bool,
    /// Values of the parts.
    pub parts: Parts,
    /// Reference voltage [V].
    pub reference: f64,
}

impl Compensator {
    /// Reads and checks the entered values and choices; entries that cannot be used come back together.
    ///
    /// # Errors
    /// One finding for each choice that is not an option, each value that is out of bounds, and for output limits
    /// that leave no room.
    pub fn from_values(values: &Values, choices: &Choices) -> Result<Self, Vec<Finding>> {
        Self::from_values_at(values, choices, values.get("stage.switching-frequency"))
    }

    /// The same where the stage's pulses come at another rate than its switch's own [Hz], as in one whose switches take turns: that is how
    /// often a difference equation samples.
    ///
    /// # Errors
    /// As [`Compensator::from_values`].
    pub fn from_values_at(values: &Values, choices: &Choices, pulses_hz: Option<f64>) -> Result<Self, Vec<Finding>> {
        let mut faults = wrong_choices(choices);
        let mut read = |path: &str| read_entry(path, values, choices, &mut faults);
        let parts = Parts {
            upper: read("compensator.divider.upper"),
            lower: read("compensator.divider.lower"),
            r2: read("compensator.r2"),
            c1: read("compensator.c1"),
            c2: read("compensator.c2"),
            r3: read("compensator.r3"),
            c3: read("compensator.c3"),
            feedforward: read("compensator.cff"),
            led: read("compensator.opto.led-resistor"),
            bias: read("compensator.opto.bias-resistor"),
            pull_up: read("compensator.opto.pull-up"),
        };
        let reference = read("compensator.reference");
        let op_amp = OpAmp {
            dc_gain: read("compensator.op-amp.dc-gain"),
            gain_bandwidth_hz: read("compensator.op-amp.gain-bandwidth"),
            output_least: read("compensator.op-amp.output-least"),
            output_greatest: read("compensator.op-amp.output-greatest"),
        };
        let transconductance = Transconductance {
            gm: read("compensator.transconductance.gm"),
            output_resistance: read("compensator.transconductance.output-resistance"),
            output_current: read("compensator.transconductance.output-current"),
            output_least: read("compensator.transconductance.output-least"),
            output_greatest: read("compensator.transconductance.output-greatest"),
        };
        let regulator = ShuntRegulator::read(&mut read, choices);
        let kind = match chosen(choices, "compensator.type") {
            "1" => Kind::One,
            "2" => Kind::Two,
            _ => Kind::Three,
        };
        let amplifier = match chosen(choices, "compensator.amplifier") {
            "transconductance" => Amplifier::Transconductance(transconductance),
            "digital" => {
                Amplifier::Digital(Digital::read(values, choices, pulses_hz, parts.divider_ratio(), &mut faults))
            }
            "shunt-regulator" => Amplifier::ShuntRegulator(regulator),
            _ => Amplifier::OpAmp(op_amp),
        };
        faults.extend(output_room(&amplifier));
        let anchor = match chosen(choices, "compensator.anchor") {
            "r2" => Anchor::R2,
            _ => Anchor::Upper,
        };
        let straight = kind != Kind::Three && !matches!(amplifier, Amplifier::ShuntRegulator(_));
        let has_feedforward = straight && chosen(choices, "compensator.feedforward-capacitor") == "fitted";
        let made = Self { kind, amplifier, anchor, has_feedforward, parts, reference };
        if faults.is_empty() {
            // What contradicts itself among usable numbers.
            faults.extend(made.isolated().into_iter().flat_map(|a| a.problems(kind, &parts, made.dc_output_voltage())));
        }
        if faults.is_empty() { Ok(made) } else { Err(faults) }
    }

    /// Writes the values of the parts that the network has; nothing else changes when a lane moves or parts are rounded.
    pub fn write(&self, values: &mut Values) {
        if let Some(digital) = self.digital() {
            digital.write(values);
        }
        for part in self.fitted() {
            // Every route to a part's value keeps it within the table's bounds, so it is finite and is taken.
            let _ = values.set(part.path(), self.parts.get(part));
        }
    }

    /// The parts this network has, in the order of the form.
    pub fn fitted(&self) -> Vec<Part> {
        Part::ALL.into_iter().filter(|&part| self.has(part)).collect()
    }

    /// Whether the network has this part.
    pub fn has(&self, part: Part) -> bool {
        if matches!(self.amplifier, Amplifier::Digital(_)) {
            return matches!(part, Part::Upper | Part::Lower);
        }
        match part {
            Part::Upper | Part::Lower | Part::C1 => true,
            Part::R2 if self.isolated().is_some_and(|regulator| !regulator.has_series_resistor) => false,
            Part::R2 | Part::C2 => self.kind != Kind::One,
            Part::R3 | Part::C3 => self.kind == Kind::Three,
            Part::Feedforward => self.has_feedforward && self.kind != Kind::Three,
            Part::Led | Part::Bias | Part::PullUp => self.isolated().is_some(),
        }
    }

    /// Output voltage that the divider and the reference ask for [V].
    pub fn dc_output_voltage(&self) -> f64 {
        self.reference * (1.0 + self.parts.upper / self.parts.lower)
    }

    /// Fraction of the output voltage at the divider's tap, 0 to 1.
    pub fn divider_ratio(&self) -> f64 {
        self.parts.divider_ratio()
    }

    /// The difference equation in place of an amplifier, with the divider as it stands.
    pub fn digital(&self) -> Option<Digital> {
        match self.amplifier {
            Amplifier::Digital(digital) => Some(Digital { divider_ratio: self.divider_ratio(), ..digital }),
            _ => None,
        }
    }
}

/// One finding per choice that is none of its options.
fn wrong_choices(choices: &Choices) -> Vec<Finding> {
    super::entries::choices()
        .filter_map(|row| {
            let key = choices.get(row.path)?;
            if row.options.iter().any(|option| option.key == key) {
                return None;
            }
            let keys: Vec<_> = row.options.iter().map(|option| option.key).collect();
            Some(
                Finding::problem(row.path, format!("{}: \"{key}\" is not an option", row.name))
                    .with_hint(format!("choose one of {}", keys.join(", "))),
            )
        })
        .collect()
}

/// Value at a path, the default where none was entered. An entry that applies must be within bounds; one that does not apply
/// stands in with what was entered when that is usable, else with its default.
pub(super) fn read_entry(path: &str, values: &Values, choices: &Choices, faults: &mut Vec<Finding>) -> f64 {
    let Some(entry) = entries().find(|row| row.path == path) else { return f64::NAN };
    let Some(value) = values.get_or_default(entry) else { return entry.default };
    match entry.check(value) {
        Ok(()) => value,
        Err(reason) => {
            if applies(path, choices) {
                faults.push(Finding::problem(path, format!("{} {reason}", entry.name)).with_hint(entry.help));
            }
            entry.default
        }
    }
}

/// A finding when the amplifier's least output voltage is not below its greatest.
fn output_room(amplifier: &Amplifier) -> Option<Finding> {
    let (least, greatest, place) = match amplifier {
        Amplifier::OpAmp(a) => (a.output_least, a.output_greatest, "compensator.op-amp.output-greatest"),
        Amplifier::Transconductance(a) => {
            (a.output_least, a.output_greatest, "compensator.transconductance.output-greatest")
        }
        // Its room follows from the parts, a converter's range is above zero by its row.
        Amplifier::ShuntRegulator(_) | Amplifier::Digital(_) => return None,
    };
    (least >= greatest).then(|| {
        Finding::problem(
            place,
            "The greatest output voltage is not above the least, so the amplifier has no room to move",
        )
        .with_hint("enter the output range of the amplifier's data sheet, least below greatest")
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn defaults() -> Values {
        let mut values = Values::new();
        for row in entries() {
            values.set(row.path, row.default).unwrap();
        }
        values
    }

    fn choices(pairs: &[(&str, &str)]) -> Choices {
        let mut choices = Choices::new();
        for (path, key) in pairs {
            choices.set(path, key);
        }
        choices
    }

    #[test]
    fn every_default_is_usable_and_every_part_has_its_row() {
        for row in entries() {
            assert!(row.check(row.default).is_ok(), "{}", row.path);
        }
        for row in super::super::entries::choices() {
            assert!(row.options.iter().any(|option| option.key == row.default), "{}", row.path);
        }
        for part in Part::ALL {
            assert_eq!(part.entry().path, part.path());
        }
        let compensator = Compensator::from_values(&defaults(), &Choices::new()).unwrap();
        assert!((compensator.dc_output_voltage() - 24.0).abs() < 1e-9);
    }

    #[test]
    fn every_fault_is_reported_at_its_place_and_entries_that_do_not_apply_are_left_alone() {
        let mut values = defaults();
        values.set("compensator.c1", -1e-9).unwrap();
        values.set("compensator.reference", 1e300).unwrap();
        values.set("compensator.r3", -5.0).unwrap();
        let faults =
            Compensator::from_values(&values, &choices(&[("compensator.type", "2"), ("compensator.anchor", "r9")]))
                .unwrap_err();
        let places: Vec<_> = faults.iter().map(|fault| fault.place.as_str()).collect();
        assert_eq!(places, ["compensator.anchor", "compensator.c1", "compensator.reference"]);
        assert!(faults.iter().all(|fault| fault.hint.is_some()));
    }

    #[test]
    fn an_amplifier_without_room_is_a_fault() {
        let mut values = defaults();
        values.set("compensator.op-amp.output-least", 5.0).unwrap();
        let faults = Compensator::from_values(&values, &Choices::new()).unwrap_err();
        assert_eq!(faults.len(), 1);
        assert_eq!(faults[0].place, "compensator.op-amp.output-greatest");
    }

    #[test]
    fn written_values_read_back_the_same() {
        for kind in ["1", "2", "3"] {
            for amplifier in ["op-amp", "transconductance"] {
                let choices = choices(&[
                    ("compensator.type", kind),
                    ("compensator.amplifier", amplifier),
                    ("compensator.feedforward-capacitor", "fitted"),
                ]);
                let read = Compensator::from_values(&defaults(), &choices).unwrap();
                let mut values = defaults();
                read.write(&mut values);
                assert_eq!(Compensator::from_values(&values, &choices).unwrap(), read);
                assert_eq!(read.has(Part::Feedforward), kind != "3");
            }
        }
    }
}
