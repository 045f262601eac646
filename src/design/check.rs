//! The check of a design: every problem at once, or a checked design of typed parts with its remarks.
//!
//! *Order*: choices and numbers row by row, then each room's own typed construction where that room's rows are sound, then
//! what ties rows together. The divider decides the output voltage: the stage is built for what reference and divider give,
//! and an entered voltage that differs is a notice.

use super::document::{Design, unknown_option};
use super::{Events, Requirements, caution, table};
use crate::compensator::Compensator;
use crate::control::Modulator;
use crate::converter::{self, Reach, Stage};
use crate::finding::{Finding, Remedy};
use crate::quantity::{Entry, Unit, Values, print, print_digits};

/// Entered output voltage and the one the divider gives may differ by this fraction without remark: two 0.25 % resistors do.
const OUTPUT_TOLERANCE: f64 = 0.005;

/// Path of the entered output voltage.
const OUTPUT: &str = "stage.output.voltage";

/// Path of the reference.
const REFERENCE: &str = "compensator.reference";

/// A design whose every entry can be used, as typed parts.
#[derive(Clone, Debug)]
pub struct CheckedDesign {
    /// Title of the design.
    pub title: String,
    /// The power stage, for the output voltage that reference and divider give.
    pub stage: Stage,
    /// What turns control voltage into duty ratio.
    pub modulator: Modulator,
    /// The network around the error amplifier.
    pub compensator: Compensator,
    /// What the design is asked to meet.
    pub requirements: Requirements,
    /// The steps it is tried with.
    pub events: Events,
    /// Notes and notices; never problems.
    pub findings: Vec<Finding>,
}

impl Design {
    /// Turns the entries into typed parts.
    ///
    /// # Errors
    /// Every problem found, in form order.
    pub fn check(&self) -> Result<CheckedDesign, Vec<Finding>> {
        let mut problems = self.row_problems();
        problems.extend(self.order_problems());
        problems.extend(self.reach_problems());
        let mut rooms = Rooms { problems };
        let compensator = rooms.build("compensator", || Compensator::from_values(&self.values, &self.choices));
        let modulator = rooms.build("control", || Ok(Modulator::from_values(&self.values, &self.choices)));
        let requirements = rooms.build("requirement", || Requirements::from_values(&self.values));
        let events = rooms.build("event", || Ok(Events::from_values(&self.values)));
        let regulated = self.regulated(compensator.as_ref());
        let stage = rooms.build("stage", || Stage::from_values(&regulated, &self.choices));
        match (stage, modulator, compensator, requirements, events) {
            (Some(stage), Some(modulator), Some(compensator), Some(requirements), Some(events))
                if rooms.problems.is_empty() =>
            {
                let findings = self.remarks(&compensator);
                let title = self.title.clone();
                Ok(CheckedDesign { title, stage, modulator, compensator, requirements, events, findings })
            }
            _ => Err(in_form_order(rooms.problems)),
        }
    }

    /// Choices that are no option, required numbers that are missing, numbers out of bounds.
    fn row_problems(&self) -> Vec<Finding> {
        let choices = self.choice_rows().into_iter().filter_map(|row| {
            let key = self.choices.get_or_default(row);
            row.option(key).is_none().then(|| unknown_option(row, key))
        });
        let numbers = self.entries().into_iter().filter_map(|row| self.number_problem(row));
        choices.chain(numbers).collect()
    }

    fn number_problem(&self, row: &'static Entry) -> Option<Finding> {
        let Some(value) = self.values.get(row.path) else {
            return (!row.optional).then(|| missing(row));
        };
        let reason = row.check(value).err()?;
        Some(Finding::problem(row.path, format!("{} {reason}.", row.name)).with_hint(row.help))
    }

    /// Least, nominal and greatest that do not rise.
    fn order_problems(&self) -> Vec<Finding> {
        const RISING: [[&str; 2]; 6] = [
            ["stage.input.least", "stage.input.nominal"],
            ["stage.input.nominal", "stage.input.greatest"],
            ["stage.load.least", "stage.load.nominal"],
            ["stage.load.nominal", "stage.load.greatest"],
            ["control.duty.least", "control.duty.greatest"],
            ["stage.input.least", "stage.input.greatest"],
        ];
        let falling = |[lower, upper]: [&'static str; 2]| {
            let (lower, upper) = (table::entry(lower)?, table::entry(upper)?);
            let (low, high) = (self.values.get(lower.path)?, self.values.get(upper.path)?);
            let same_allowed = lower.path != "control.duty.least";
            if low < high || (same_allowed && low <= high) {
                return None;
            }
            let message = format!(
                "{}, {}, must be below {}, {}.",
                lower.name,
                print(low, lower.unit),
                upper.name,
                print(high, upper.unit)
            );
            Some(Finding::problem(lower.path, message).with_hint("least, nominal and greatest stand in rising order"))
        };
        RISING.into_iter().filter_map(falling).collect()
    }

    /// An output that the topology cannot give at one of the input voltages, a reference that no divider brings to the output.
    fn reach_problems(&self) -> Vec<Finding> {
        let Some(output) = self.values.get(OUTPUT) else {
            return Vec::new();
        };
        let mut problems = Vec::new();
        let topology = self.choices.get("stage.topology").and_then(converter::find);
        let greatest = self.values.get("stage.input.greatest");
        if let (Some(topology), Some(greatest)) = (topology, greatest)
            && output > 0.0
        {
            match topology.reach {
                Reach::AboveInput if output <= greatest => problems.push(below_input(topology.name, output, greatest)),
                Reach::BelowInput if output >= greatest => problems.push(above_input(topology.name, output, greatest)),
                _ => {}
            }
        }
        if let Some(reference) = self.values.get(REFERENCE)
            && reference > output
            && output > 0.0
        {
            let message = format!(
                "A reference of {} cannot hold an output of {}: a divider only divides.",
                print(reference, Unit::Volt),
                print(output, Unit::Volt)
            );
            problems.push(Finding::problem(REFERENCE, message).with_hint("choose a reference at or below the output"));
        }
        problems
    }

    /// The numbers with the output voltage that reference and divider give in place of the entered one.
    fn regulated(&self, compensator: Option<&Compensator>) -> Values {
        let mut values = self.values.clone();
        if let Some(compensator) = compensator {
            // Finite: reference and divider are within their bounds.
            let _ = values.set(OUTPUT, compensator.dc_output_voltage());
        }
        values
    }

    /// Notes and notices of a design that can be used.
    fn remarks(&self, compensator: &Compensator) -> Vec<Finding> {
        let output = compensator.dc_output_voltage();
        let mut remarks = Vec::new();
        remarks.extend(self.values.get(OUTPUT).and_then(|entered| output_differs(entered, output)));
        remarks.extend(caution::findings(self, output));
        if self.choices.is("stage.input-capacitor", "none") {
            remarks.push(
                Finding::notice(
                    "stage.input-capacitor",
                    "No input capacitor is entered: the source feeds the switch directly.",
                )
                .with_hint(
                    "enter the input capacitor and the source's resistance; they shape line response and losses",
                ),
            );
        }
        remarks
    }
}

/// Problems so far, and the rule that a room with an unusable row is not built: what it would add repeats the row's problem.
struct Rooms {
    problems: Vec<Finding>,
}

impl Rooms {
    fn build<T>(&mut self, room: &str, make: impl FnOnce() -> Result<T, Vec<Finding>>) -> Option<T> {
        let in_room = |problem: &Finding| problem.place.split('.').next() == Some(room);
        if self.problems.iter().any(in_room) {
            return None;
        }
        match make() {
            Ok(made) => Some(made),
            Err(found) => {
                self.problems.extend(found);
                None
            }
        }
    }
}

fn missing(row: &'static Entry) -> Finding {
    let offered = print(row.default, row.unit);
    Finding::problem(row.path, format!("{}: nothing is entered.", row.name))
        .with_hint(format!("{} A usual value is {offered}", row.help))
        .with_remedy(Remedy {
            label: format!("Enter {offered}"),
            values: vec![(row.path.to_owned(), row.default)],
            choices: Vec::new(),
        })
}

fn below_input(topology: &str, output: f64, greatest: f64) -> Finding {
    let (output, greatest) = (print(output, Unit::Volt), print(greatest, Unit::Volt));
    let message = format!("{topology}: the output, {output}, must be above the greatest input, {greatest}.");
    Finding::problem(OUTPUT, message)
        .with_hint("raise the output, lower the greatest input, or choose another topology")
}

fn above_input(topology: &str, output: f64, greatest: f64) -> Finding {
    let (output, greatest) = (print(output, Unit::Volt), print(greatest, Unit::Volt));
    let message = format!("{topology}: the output, {output}, must be below the input, at most {greatest}.");
    Finding::problem(OUTPUT, message).with_hint("lower the output, raise the input, or choose another topology")
}

fn output_differs(entered: f64, given: f64) -> Option<Finding> {
    if (entered - given).abs() <= OUTPUT_TOLERANCE * given {
        return None;
    }
    // Five digits are more than a divider's tolerance and read well in the field.
    let text = print_digits(given, Unit::Volt, 5);
    let rounded = crate::quantity::parse(&text, Unit::Volt).unwrap_or(given);
    let message = format!(
        "The entered output, {}, differs from what reference and divider give, {text}; the divider decides.",
        print(entered, Unit::Volt)
    );
    Some(
        Finding::notice(OUTPUT, message)
            .with_hint("enter that voltage, or change the divider or the reference")
            .with_remedy(Remedy {
                label: format!("Set the output to {text}"),
                values: vec![(OUTPUT.into(), rounded)],
                choices: Vec::new(),
            }),
    )
}

/// Problems in the order in which their rows stand in the form.
fn in_form_order(mut problems: Vec<Finding>) -> Vec<Finding> {
    let paths: Vec<&str> =
        table::all_choices().map(|row| row.path).chain(table::all_entries().map(|row| row.path)).collect();
    problems.sort_by_key(|problem| paths.iter().position(|path| *path == problem.place).unwrap_or(usize::MAX));
    problems
}
