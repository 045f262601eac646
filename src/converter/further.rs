//! Figures of an operating point that only some stages have: views show the list without being told what stands in it.

use super::operating_point::CurrentFigures;
use crate::quantity::{Unit, print_digits};

/// A figure that only some stages have.
#[derive(Clone, Debug, PartialEq)]
pub struct Further {
    /// Word in JSON.
    pub key: &'static str,
    /// Name for people.
    pub name: &'static str,
    /// What it is.
    pub value: FurtherValue,
    /// One or two sentences that explain it.
    pub help: &'static str,
}

/// A number or a word.
#[derive(Clone, Debug, PartialEq)]
pub enum FurtherValue {
    /// A number [unit].
    Number(f64, Unit),
    /// A word.
    Word(&'static str),
}

impl Further {
    pub(super) fn number(key: &'static str, name: &'static str, value: f64, unit: Unit, help: &'static str) -> Self {
        Further { key, name, value: FurtherValue::Number(value, unit), help }
    }

    pub(super) fn word(key: &'static str, name: &'static str, word: &'static str, help: &'static str) -> Self {
        Further { key, name, value: FurtherValue::Word(word), help }
    }

    /// Its value as text with so many digits.
    pub fn text(&self, digits: usize) -> String {
        match self.value {
            FurtherValue::Number(value, unit) => print_digits(value, unit, digits),
            FurtherValue::Word(word) => word.to_owned(),
        }
    }
}

/// What several phases make together; nothing for one.
pub(super) fn of_phases(phases: f64, together: CurrentFigures, input: CurrentFigures) -> Vec<Further> {
    if phases <= 1.0 {
        return Vec::new();
    }
    vec![
        Further::number(
            "phases",
            "Phases",
            phases,
            Unit::One,
            "Equal phases driven one after the other. Inductor, switch and rectifier currents are those of one phase.",
        ),
        Further::number(
            "phases-together-ripple",
            "Ripple of all phases",
            together.ripple,
            Unit::Ampere,
            "Peak to peak of the sum of the inductor currents of all phases, which partly cancel.",
        ),
        Further::number(
            "input-ripple",
            "Input ripple",
            input.ripple,
            Unit::Ampere,
            "Peak to peak of the current drawn from the source, steps included, all phases together.",
        ),
    ]
}
