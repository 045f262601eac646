//! The document: title, notes, choices and numbers by path, locks and aims, usable or not.

use super::table;
use crate::converter;
use crate::finding::Finding;
use crate::quantity::{Choice, Choices, Entry, Values};
use std::collections::BTreeSet;

/// A design as entered. Numbers are finite but need not be usable; [`Design::check`] says whether they are.
#[derive(Clone, Debug, PartialEq)]
pub struct Design {
    /// One line that names it.
    pub title: String,
    /// Free text.
    pub notes: String,
    /// Chosen options by choice path.
    pub choices: Choices,
    /// Numbers [SI base unit of their entry] by entry path.
    pub values: Values,
    /// Paths of the part values that rounding and placement keep.
    pub locks: BTreeSet<String>,
    /// Where the lanes were asked to be [Hz], by lane key.
    pub aims: Values,
}

impl Default for Design {
    /// Every choice and every row that applies at its default, no requirements.
    fn default() -> Self {
        let mut design = Self {
            title: "Untitled".into(),
            notes: String::new(),
            choices: Choices::new(),
            values: Values::new(),
            locks: BTreeSet::new(),
            aims: Values::new(),
        };
        design.complete_choices();
        design.complete_values();
        design
    }
}

impl Design {
    /// Rows for numbers that apply under the present choices, in form order.
    pub fn entries(&self) -> Vec<&'static Entry> {
        table::all_entries()
            .filter(|entry| table::applies(entry.path, &self.choices))
            .map(|entry| converter::row(entry, &self.choices))
            .collect()
    }

    /// Rows for choices that apply under the present choices, in form order.
    pub fn choice_rows(&self) -> Vec<&'static Choice> {
        table::all_choices().filter(|choice| table::applies(choice.path, &self.choices)).collect()
    }

    /// Turns ratio of the transformer, second to first; 1 without one.
    pub(super) fn turns_ratio(&self) -> f64 {
        let row = self.entries().into_iter().find(|row| row.path == "stage.transformer.ratio");
        row.and_then(|row| self.values.get_or_default(row)).unwrap_or(1.0)
    }

    /// Sets the number or the choice at a path from text, as a form or `--set` gives it. An empty text clears an optional number.
    ///
    /// # Errors
    /// A problem with place, reason and hint; nothing is changed then.
    pub fn set_from_text(&mut self, path: &str, text: &str) -> Result<(), Finding> {
        if let Some(entry) = table::entry(path) {
            if entry.optional && text.trim().is_empty() {
                self.values.remove(path);
                return Ok(());
            }
            let value = entry.read(text).map_err(|error| {
                Finding::problem(path, format!("{}: {}.", entry.name, error.reason)).with_hint(error.hint)
            })?;
            return self.values.set(path, value).map_err(|error| Finding::problem(path, format!("{error}.")));
        }
        if let Some(choice) = table::choice(path) {
            return self.choose(choice, text.trim());
        }
        let problem = Finding::problem(path, format!("There is no entry “{}”.", short(path)));
        Err(match table::nearest_path(path) {
            Some(near) => problem.with_hint(format!("did you mean {near}?")),
            None => problem.with_hint("paths are dotted words such as stage.inductor.inductance"),
        })
    }

    /// Chooses an option by its key and fills the rows that thereby come to apply with their defaults.
    fn choose(&mut self, choice: &'static Choice, key: &str) -> Result<(), Finding> {
        let option = choice.option(key).ok_or_else(|| unknown_option(choice, key))?;
        self.choices.set(choice.path, option.key);
        self.complete_choices();
        self.complete_values();
        Ok(())
    }

    /// Gives every choice that is not made its default; one that only some topologies have, where the one chosen has it. A file of
    /// an earlier release lacks the choices added since.
    pub(super) fn complete_choices(&mut self) {
        for choice in table::all_choices() {
            let asked = converter::is_common(choice.path) || table::applies(choice.path, &self.choices);
            if asked && self.choices.get(choice.path).is_none() {
                self.choices.set(choice.path, choice.default);
            }
        }
    }

    /// Gives every required row that applies and is empty its default.
    pub fn complete_values(&mut self) {
        for entry in self.entries() {
            if !entry.optional && self.values.get(entry.path).is_none() {
                // Defaults are finite: a test of the table sees to it.
                let _ = self.values.set(entry.path, entry.default);
            }
        }
    }
}

/// A problem for a key that is none of a choice's options.
pub(super) fn unknown_option(choice: &Choice, key: &str) -> Finding {
    let keys: Vec<&str> = choice.options.iter().map(|option| option.key).collect();
    let hint = match table::nearest_key(choice, key) {
        Some(near) => format!("did you mean {near}? Options are {}", keys.join(", ")),
        None => format!("options are {}", keys.join(", ")),
    };
    Finding::problem(choice.path, format!("{}: “{}” is not an option.", choice.name, short(key))).with_hint(hint)
}

/// A text as it may go to a terminal: characters that would steer the terminal or turn the direction of writing are replaced
/// by U+FFFD, a tab by a space; line ends stay.
pub fn printable(text: &str) -> String {
    let safe = |c: char| match c {
        '\n' => c,
        '\t' => ' ',
        '\u{2028}'..='\u{202E}' | '\u{2066}'..='\u{2069}' => char::REPLACEMENT_CHARACTER,
        _ if c.is_control() => char::REPLACEMENT_CHARACTER,
        _ => c,
    };
    text.chars().map(safe).collect()
}

/// The start of a text, for a message.
pub(super) fn short(text: &str) -> String {
    const SHOWN: usize = 60;
    let mut start: String = text.chars().take(SHOWN).collect();
    if text.chars().nth(SHOWN).is_some() {
        start.push('…');
    }
    start
}
