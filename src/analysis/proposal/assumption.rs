//! The design being filled in: every value that was not given is told with its reason.

use super::brief::Brief;
use crate::converter;
use crate::design::{self, CheckedDesign, Design};
use crate::finding::Finding;
use crate::quantity::{print, print_digits};

/// Digits of a value in the list of assumptions.
const DIGITS: usize = 3;

/// A value that was not given.
#[derive(Clone, Debug, PartialEq)]
pub struct Assumption {
    /// What it is.
    pub name: String,
    /// Its value, as text.
    pub value: String,
    /// Why it is so.
    pub reason: String,
    /// True for a rule of thumb of the trade, which no law stands behind.
    pub common_practice: bool,
    /// Path of the entry or choice.
    pub path: &'static str,
}

/// A design of which some values are still assumed.
#[derive(Clone, Debug)]
pub(super) struct Draft {
    pub(super) design: Design,
    pub(super) assumptions: Vec<Assumption>,
}

impl Draft {
    /// The given numbers in a design, and the nominal values between them.
    pub(super) fn new(brief: &Brief) -> Result<Self, Vec<Finding>> {
        let mut design = Design::default();
        design.set_from_text("stage.topology", &brief.topology).map_err(|problem| vec![problem])?;
        for row in Brief::rows(brief.parts) {
            if design::entry(row.path).is_some() {
                set(&mut design, row.path, brief.get(row.path));
            }
        }
        let mut draft = Draft { design, assumptions: Vec::new() };
        for (least, nominal, greatest) in [
            ("stage.input.least", "stage.input.nominal", "stage.input.greatest"),
            ("stage.load.least", "stage.load.nominal", "stage.load.greatest"),
        ] {
            let middle = f64::midpoint(brief.get(least), brief.get(greatest));
            draft.assume(nominal, middle, "the middle of least and greatest", false);
        }
        // The default bank may have lost capacitance; here the capacitance is meant as it is at work.
        draft.assume(
            "stage.bank.1.remaining",
            1.0,
            "capacitances are meant as they are at bias and temperature",
            false,
        );
        draft.assume("stage.bank.1.count", 1.0, "one row stands for the whole bank; split it in the form", false);
        let duty = 0.95;
        draft.assume("control.duty.greatest", duty, "what most modulators reach", true);
        Ok(draft)
    }

    /// Assumes a number, for a reason.
    pub(super) fn assume(&mut self, path: &'static str, value: f64, reason: impl Into<String>, common_practice: bool) {
        set(&mut self.design, path, value);
        let Some(entry) = design::entry(path).map(|entry| converter::row(entry, &self.design.choices)) else { return };
        self.assumptions.retain(|assumption| assumption.path != path);
        self.assumptions.push(Assumption {
            name: entry.name.to_owned(),
            value: print_digits(value, entry.unit, DIGITS),
            reason: reason.into(),
            common_practice,
            path,
        });
    }

    /// Assumes an option, for a reason.
    pub(super) fn choose(&mut self, path: &'static str, key: &str, reason: &str, common_practice: bool) {
        // Keys stand in the table: the tests propose every topology.
        let _ = self.design.set_from_text(path, key);
        let Some(choice) = design::choice(path) else { return };
        self.assumptions.retain(|assumption| assumption.path != path);
        self.assumptions.push(Assumption {
            name: choice.name.to_owned(),
            value: choice.option(key).map_or(key, |option| option.name).to_owned(),
            reason: reason.to_owned(),
            common_practice,
            path,
        });
    }

    /// Puts the assumptions into the order of the form.
    pub(super) fn sort(&mut self) {
        let rows: Vec<&str> =
            design::all_choices().map(|row| row.path).chain(design::all_entries().map(|row| row.path)).collect();
        self.assumptions.sort_by_key(|assumption| rows.iter().position(|path| *path == assumption.path));
    }

    /// A number of the design.
    pub(super) fn get(&self, path: &str) -> f64 {
        self.design.values.get(path).unwrap_or(f64::NAN)
    }

    /// The draft as typed parts.
    pub(super) fn checked(&self) -> Result<CheckedDesign, Vec<Finding>> {
        self.design.check()
    }

    /// The assumptions as a note of the design.
    pub(super) fn notes(&self) -> String {
        let lines = self.assumptions.iter().map(|assumption| {
            let practice = if assumption.common_practice { " (common practice)" } else { "" };
            format!("{}: {}, {}{practice}.", assumption.name, assumption.value, assumption.reason)
        });
        let first = "Begun from the short form of a new design. What was not given was assumed:".to_owned();
        std::iter::once(first).chain(lines).collect::<Vec<_>>().join("\n")
    }
}

/// Sets a finite number; what is not finite is left out and found missing by the check.
pub(super) fn set(design: &mut Design, path: &str, value: f64) {
    let _ = design.values.set(path, value);
}

/// Volts, amperes and so on with the digits of a list.
pub(super) fn text(value: f64, unit: crate::quantity::Unit) -> String {
    print_digits(value, unit, DIGITS)
}

/// The same with four digits, for titles.
pub(super) fn full(value: f64, unit: crate::quantity::Unit) -> String {
    print(value, unit)
}
