//! The words at a part: its designator, its value, what is written less loudly, and its name for those who do not see it.

use super::pen::Line;
use crate::circuit::{Drawn, Shows};
use crate::design::{self, Design};
use crate::quantity::{Unit, print_digits};

/// Significant digits of a value in a drawing; its field has them all.
const DIGITS: usize = 3;

/// Numbers a drawing shows: those of a design, at an operating condition where one is shown.
#[derive(Clone, Copy, Debug)]
pub struct Numbers<'a> {
    /// The design.
    pub design: &'a Design,
    /// Input voltage [V] and load current [A] of the condition shown; without one they are the nominal ones.
    pub condition: Option<(f64, f64)>,
}

impl Numbers<'_> {
    /// The number at a path and its unit.
    fn get(&self, path: &str) -> Option<(f64, Unit)> {
        let entry = design::entry(path)?;
        let shown = match (path, self.condition) {
            ("stage.input.nominal", Some((volts, _))) => Some(volts),
            ("stage.load.nominal", Some((_, amperes))) => Some(amperes),
            _ => None,
        };
        Some((shown.or_else(|| self.design.values.get_or_default(entry))?, entry.unit))
    }

    /// A number as text.
    pub(super) fn text(&self, path: &str) -> String {
        self.get(path).map(|(value, unit)| print_digits(value, unit, DIGITS)).unwrap_or_default()
    }

    fn shown(&self, shows: &Shows) -> String {
        match shows {
            Shows::Entry(path) => self.text(path),
            Shows::Led { words, path } => format!("{words}{}", self.text(path)),
            Shows::Count { count, each } => match self.get(count) {
                Some((count, _)) if count > 1.0 => {
                    format!("{} × {}", print_digits(count, Unit::One, 4), self.text(each))
                }
                _ => self.text(each),
            },
            Shows::Ratio { over, under, unit } => match (self.get(over), self.get(under)) {
                (Some((over, _)), Some((under, _))) if under != 0.0 => print_digits(over / under, *unit, DIGITS),
                _ => String::new(),
            },
        }
    }

    /// Whether the number shown is zero.
    pub(super) fn is_zero(&self, shows: &Shows) -> bool {
        let path = match shows {
            Shows::Entry(path)
            | Shows::Led { path, .. }
            | Shows::Count { each: path, .. }
            | Shows::Ratio { over: path, .. } => path,
        };
        self.get(path).is_some_and(|(value, _)| value == 0.0)
    }
}

/// The words at one part.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Words {
    pub(super) designator: String,
    pub(super) value: String,
    pub(super) quiet: Vec<String>,
    pub(super) name: String,
}

impl Words {
    pub(super) fn of(drawn: &Drawn, numbers: &Numbers<'_>) -> Self {
        let value = drawn.value.as_ref().map(|shows| numbers.shown(shows)).unwrap_or_default();
        let quiet = drawn.quiet.iter().filter(|shows| !numbers.is_zero(shows)).map(|shows| numbers.shown(shows));
        let comma = if drawn.name.ends_with(|c: char| c.is_ascii_digit()) { "," } else { "" };
        let name = format!("{}{comma} {value}", drawn.name).trim().to_owned();
        Words { designator: drawn.designator.clone(), quiet: quiet.collect(), value, name }
    }

    /// The same without designator and what is written less loudly.
    pub(super) fn value_alone(&self) -> Self {
        Words { designator: String::new(), quiet: Vec::new(), ..self.clone() }
    }

    /// Designator and value on one line, the rest below.
    pub(super) fn short_lines(&self) -> Vec<Line> {
        let quiet = self.quiet.iter().map(|text| Line::quiet(text));
        std::iter::once(Line::both(&self.designator, &self.value)).chain(quiet).collect()
    }

    /// Designator, value and the rest, each on a line of its own.
    pub(super) fn lines(&self) -> Vec<Line> {
        let quiet = self.quiet.iter().map(|text| Line::quiet(text));
        [Line::quiet(&self.designator), Line::value(&self.value)].into_iter().chain(quiet).collect()
    }
}
