//! The check of a design: every problem at once, or a checked design of typed parts with its remarks.
//!
//! *Order*: choices and numbers row by row, then each room's own typed construction where that room's rows are sound, then
//! what ties rows together. The divider decides the output voltage: the stage is built for what reference and divider give,
//! and an entered voltage that differs is a notice.

use super::document::{Design, unknown_option};
use super::duty_limit::core_saturates;
use super::{Events, Requirements, caution, table};
use crate::compensator::Compensator;
use crate::control::ControlLaw;
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
    pub law: ControlLaw,
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
    /// The compensator alone, as far as it can be used without the rest.
    ///
    /// # Errors
    /// Every problem of its entries.
    pub fn compensator(&self) -> Result<Compensator, Vec<Finding>> {
        let pulses_hz = converter::pulse_frequency(&self.values, &self.choices);
        Compensator::from_values_at(&self.values, &self.choices, pulses_hz)
    }

    /// Turns the entries into typed parts.
    ///
    /// # Errors
    /// Every problem found, in form order.
    pub fn check(&self) -> Result<CheckedDesign, Vec<Finding>> {
        let mut problems = self.row_problems();
        problems.extend(self.order_problems());
        problems.extend(self.reach_problems());
        let mut rooms = Rooms { problems };
        let compensator = rooms.build("compensator", || self.compensator());
        let law = rooms.build("control", || ControlLaw::from_values(&self.values, &self.choices));
        let requirements = rooms.build("requirement", || Requirements::from_values(&self.values));
        let events = rooms.build("event", || Ok(Events::from_values(&self.values)));
        let regulated = self.regulated(compensator.as_ref());
        let stage = rooms.build("stage", || Stage::from_values(&regulated, &self.choices));
        match (stage, law, compensator, requirements, events) {
            (Some(stage), Some(law), Some(compensator), Some(requirements), Some(events))
                if rooms.problems.is_empty() =>
            {
                let mut findings = self.remarks(&compensator);
                findings.extend(core_saturates(&stage, &law));
                let title = self.title.clone();
                Ok(CheckedDesign { title, stage, law, compensator, requirements, events, findings })
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
        const RISING: [[&str; 2]; 5] = [
            ["stage.input.least", "stage.input.nominal"],
            ["stage.input.nominal", "stage.input.greatest"],
            ["stage.load.least", "stage.load.nominal"],
            ["stage.load.nominal", "stage.load.greatest"],
            ["control.duty.least", "control.duty.greatest"],
        ];
        let falling = |[lower, upper]: [&'static str; 2]| {
            let (lower, upper) = (table::entry(lower)?, table::entry(upper)?);
            let (low, high) = (self.values.get(lower.path)?, self.values.get(upper.path)?);
            let same_allowed = lower.path != "control.duty.least";
            if low < high || (same_allowed && low <= high) {
                return None;
            }
            let message = format!(
                "{}, {}, must {} {}, {}.",
                lower.name,
                print(low, lower.unit),
                if same_allowed { "not be above" } else { "be below" },
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
            let seen = topology.seen_input(greatest, self.turns_ratio());
            match topology.reach {
                // A turns ratio that cannot be used has a problem of its own.
                _ if seen <= 0.0 => {}
                Reach::AboveInput if output <= seen => problems.push(below_input(topology.name, output, seen)),
                Reach::BelowInput if output >= seen => problems.push(above_input(topology.name, output, seen)),
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
        remarks.extend(caution::caution(self, output));
        remarks.extend(self.left_out());
        if self.choices.is("stage.input-capacitor", "none") && !self.choices.is("stage.input-filter", "fitted") {
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

impl Design {
    /// What the topology's model leaves out.
    fn left_out(&self) -> impl Iterator<Item = Finding> {
        let topology = self.choices.get("stage.topology").and_then(converter::find);
        let remarks = topology.map_or(&[][..], |topology| topology.left_out);
        remarks.iter().map(|remark| Finding::note(remark.place, remark.message).with_hint(remark.hint))
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::sample;

    fn set(pairs: &[(&str, &str)]) -> Design {
        let mut design = sample::built_in();
        for (path, text) in pairs {
            design.set_from_text(path, text).unwrap_or_else(|problem| panic!("{problem}"));
        }
        design
    }

    /// The only problem of the built-in design after these settings.
    fn only_problem(pairs: &[(&str, &str)]) -> Finding {
        let problems = set(pairs).check().expect_err("a problem");
        assert_eq!(problems.len(), 1, "{problems:?}");
        assert!(problems[0].is_problem() && problems[0].hint.is_some(), "{problems:?}");
        problems[0].clone()
    }

    #[test]
    fn unusable_numbers_are_problems_with_place_reason_and_hint() {
        for (path, text, reason) in [
            ("stage.inductor.inductance", "-1u", "above 0 H"),
            ("stage.inductor.inductance", "0", "above 0 H"),
            ("stage.inductor.inductance", "1e300", "beyond"),
            ("stage.switching-frequency", "1e-300", "nearer to zero"),
            ("control.duty.greatest", "1.5", "from 0 to 1"),
            ("control.duty.greatest", "-0.1", "from 0 to 1"),
            ("requirement.phase-margin.worst", "200", "at most 180°"),
        ] {
            let problem = if path == "control.duty.greatest" && text.starts_with('-') {
                set(&[(path, text)]).check().expect_err("a problem").remove(1)
            } else {
                only_problem(&[(path, text)])
            };
            assert!(problem.place.starts_with(path.trim_end_matches(".greatest")), "{problem}");
            assert!(problem.message.contains(reason), "{problem}");
        }
    }

    /// Wrong input for every entry of the control: named at its place, nothing lost.
    #[test]
    fn unusable_control_entries_are_problems_at_their_place() {
        let peak = [("control.mode", "peak-current")];
        let lumped = [("control.mode", "valley-current"), ("control.sense", "transconductance")];
        let rate = [("control.mode", "peak-current"), ("control.slope", "rate")];
        let share = [("control.mode", "peak-current"), ("control.slope", "share")];
        let average = [("control.mode", "average-current")];
        let current = [("control.mode", "average-current"), ("control.inner.amplifier", "transconductance")];
        for (choices, path, text) in [
            (&peak[..], "control.sense.gain", "0"),
            (&peak, "control.sense.gain", "-10m"),
            (&peak, "control.sense.filter", "-1n"),
            (&peak, "control.sense.divider", "0"),
            (&peak, "control.sense.divider", "1.5"),
            (&peak, "control.sense.offset", "2k"),
            (&peak, "control.slope.quality", "0"),
            (&peak, "control.blanking", "-1n"),
            (&peak, "control.blanking", "4u"),
            (&peak, "control.on-time.least", "1 ms"),
            (&peak, "control.clamp", "-1"),
            (&lumped, "control.sense.transconductance", "0"),
            (&rate, "control.slope.rate", "-1k"),
            (&share, "control.slope.share", "-10 %"),
            (&average, "control.clamp", "0"),
            (&average, "control.inner.r1", "0"),
            (&average, "control.inner.r2", "-1k"),
            (&average, "control.inner.c1", "0"),
            (&average, "control.inner.c2", "0"),
            (&average, "control.inner.op-amp.dc-gain", "0.5"),
            (&average, "control.inner.op-amp.gain-bandwidth", "0"),
            (&average, "control.inner.output-least", "5"),
            (&average, "control.ramp.amplitude", "0"),
            (&current, "control.inner.transconductance.gm", "0"),
            (&current, "control.inner.transconductance.output-resistance", "0"),
        ] {
            let pairs: Vec<_> = choices.iter().copied().chain([(path, text)]).collect();
            let problem = only_problem(&pairs);
            assert_eq!(problem.place, path, "{problem}");
            let mended = {
                let mut design = set(&pairs);
                let row = table::entry(path).expect("a row");
                design.values.set(path, row.default).expect("finite");
                design
            };
            assert!(mended.check().is_ok(), "{path}");
        }
    }

    #[test]
    fn texts_that_are_no_numbers_change_nothing() {
        let mut design = sample::built_in();
        let before = design.clone();
        for text in ["", "ten", "NaN", "inf", "4,7u", "10 V", "1e999"] {
            let problem = design.set_from_text("stage.inductor.inductance", text).expect_err(text);
            assert_eq!(problem.place, "stage.inductor.inductance");
            assert!(problem.is_problem() && problem.hint.is_some());
        }
        assert!(
            design
                .set_from_text("stage.topology", "bosst")
                .expect_err("slip")
                .hint
                .is_some_and(|h| h.contains("boost"))
        );
        assert!(
            design
                .set_from_text("stage.topolgy", "buck")
                .expect_err("slip")
                .hint
                .is_some_and(|h| h.contains("stage.topology"))
        );
        assert_eq!(design, before);
    }

    #[test]
    fn an_optional_row_is_cleared_by_an_empty_text() {
        let mut design = sample::built_in();
        let asked = design.check().expect("usable").requirements.len();
        design.set_from_text("requirement.settling.worst", " ").expect("cleared");
        assert_eq!(design.check().expect("usable").requirements.len(), asked - 1);
    }

    #[test]
    fn outputs_out_of_the_topologys_reach_are_problems() {
        assert_eq!(only_problem(&[("stage.output.voltage", "15")]).place, "stage.output.voltage");
        assert!(only_problem(&[("stage.output.voltage", "15")]).message.contains("above the greatest input, 16 V"));
        assert!(only_problem(&[("stage.topology", "buck")]).message.contains("below the input"));
        assert!(set(&[("stage.topology", "buck-boost")]).check().is_ok());
        let reference = only_problem(&[("compensator.reference", "30 V")]);
        assert_eq!(reference.place, "compensator.reference");
        assert!(reference.message.contains("only divides"));
    }

    #[test]
    fn every_problem_is_reported_at_once_in_form_order() {
        let mut design = set(&[("stage.input.least", "20"), ("stage.load.nominal", "-1"), ("compensator.r2", "0")]);
        design.values.remove("stage.inductor.inductance");
        design.choices.set("stage.load", "motor");
        let problems = design.check().expect_err("five problems at least");
        let places: Vec<&str> = problems.iter().map(|problem| problem.place.as_str()).collect();
        for place in
            ["stage.load", "stage.input.least", "stage.load.nominal", "stage.inductor.inductance", "compensator.r2"]
        {
            assert!(places.contains(&place), "{place} is not in {places:?}");
        }
        assert!(problems.iter().all(|problem| problem.hint.is_some()), "{problems:?}");
        let empty = problems.iter().find(|p| p.place == "stage.inductor.inductance").expect("reported");
        let remedy = empty.remedy.clone().expect("a usual value is offered");
        for (path, value) in &remedy.values {
            design.values.set(path, *value).expect("finite");
        }
        assert!(!design.check().expect_err("the others stay").iter().any(|p| p.place == "stage.inductor.inductance"));
    }

    #[test]
    fn the_divider_decides_the_output_and_a_difference_is_a_notice_that_mends_itself() {
        let mut design = set(&[("stage.output.voltage", "23 V")]);
        let checked = design.check().expect("usable");
        // 1.2 V · (1 + 38.3 kΩ / 2.02 kΩ) = 23.952 V.
        assert!((checked.stage.output_voltage - 1.2 * (1.0 + 38.3 / 2.02)).abs() < 1e-12);
        let notice = &checked.findings[0];
        assert_eq!((notice.severity, notice.place.as_str()), (crate::finding::Severity::Notice, OUTPUT));
        let remedy = notice.remedy.clone().expect("mends itself");
        assert_eq!(remedy.label, "Set the output to 23.952 V");
        for (path, value) in &remedy.values {
            design.values.set(path, *value).expect("finite");
        }
        assert_eq!(design.check().expect("usable").findings, []);
        // Half a per cent either way passes without remark.
        assert_eq!(set(&[("stage.output.voltage", "24.07 V")]).check().expect("usable").findings, []);
        assert_eq!(set(&[("stage.output.voltage", "24.08 V")]).check().expect("usable").findings.len(), 1);
    }

    #[test]
    fn a_missing_input_capacitor_is_a_notice() {
        let findings = set(&[("stage.input-capacitor", "none")]).check().expect("usable").findings;
        assert_eq!(findings[0].place, "stage.input-capacitor");
    }

    #[test]
    fn choosing_fills_the_rows_that_come_to_apply() {
        let mut design = Design::default();
        assert_eq!(design.values.get("stage.bank.3.esr"), None);
        design.set_from_text("stage.bank", "3").expect("an option");
        assert!(design.values.get("stage.bank.3.esr").is_some());
        assert!(design.entries().iter().any(|row| row.path == "stage.bank.3.esr"));
        assert!(!design.entries().iter().any(|row| row.path == "stage.bank.4.esr"));
    }

    #[test]
    fn unusable_filters_are_named_and_nothing_is_lost() {
        let fitted = [
            ("stage.input-filter", "fitted"),
            ("stage.input-filter.damping", "capacitor"),
            ("stage.output-filter", "fitted"),
            ("stage.output-filter.damping", "resistor"),
        ];
        for (path, text, reason) in [
            ("stage.input-filter.inductance", "0", "above 0 H"),
            ("stage.input-filter.resistance", "-1m", "0 Ω or above"),
            ("stage.input-filter.damping.resistance", "0", "above 0 Ω"),
            ("stage.input-filter.damping.capacitance", "-1u", "above 0 F"),
            ("stage.input-filter.damping.inductance", "0", "above 0 H"),
            ("stage.input-capacitor.capacitance", "0", "above 0 F"),
            ("stage.output-filter.inductance", "0", "above 0 H"),
            ("stage.output-filter.resistance", "-1", "0 Ω or above"),
            ("stage.output-filter.capacitance", "0", "above 0 F"),
            ("stage.output-filter.esr", "-1", "0 Ω or above"),
            ("stage.output-filter.damping.resistance", "0", "above 0 Ω"),
        ] {
            let mut pairs = fitted.to_vec();
            if path.ends_with("damping.inductance") {
                pairs.push(("stage.input-filter.damping", "inductor"));
            }
            pairs.push((path, text));
            let problem = only_problem(&pairs);
            assert_eq!(problem.place, path);
            assert!(problem.message.contains(reason), "{problem}");
        }
        // A filter brings its own capacitor: the choice of one goes, and comes back as it was.
        let mut design = set(&[("stage.input-capacitor", "none"), ("stage.input-filter", "fitted")]);
        assert!(!design.choice_rows().iter().any(|row| row.path == "stage.input-capacitor"));
        assert!(!design.check().expect("usable").findings.iter().any(|f| f.place == "stage.input-capacitor"));
        design.set_from_text("stage.input-filter.damping.resistance", "3").expect("kept");
        design.set_from_text("stage.input-filter", "none").expect("an option");
        assert!(design.choices.is("stage.input-capacitor", "none"));
        design.set_from_text("stage.input-filter", "fitted").expect("an option");
        assert_eq!(design.values.get("stage.input-filter.damping.resistance"), Some(3.0));
    }
}
