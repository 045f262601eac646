//! What a design holds for the rows of the table: numbers by path, choices by path.

use super::{Choice, Entry};
use std::collections::BTreeMap;

/// A number that is not finite was offered to [`Values`].
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NotFinite {
    /// Path it was meant for.
    pub path: String,
}

impl std::fmt::Display for NotFinite {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "the number for {} is not finite", self.path)
    }
}

impl std::error::Error for NotFinite {}

/// Finite numbers [SI base unit of their entry] by entry path.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Values(BTreeMap<String, f64>);

impl Values {
    /// No values.
    pub fn new() -> Self {
        Self::default()
    }

    /// Number at a path, if there is one.
    pub fn get(&self, path: &str) -> Option<f64> {
        self.0.get(path).copied()
    }

    /// Number at an entry's path, else the entry's default unless it may be left empty.
    pub fn get_or_default(&self, entry: &Entry) -> Option<f64> {
        self.get(entry.path).or((!entry.optional).then_some(entry.default))
    }

    /// Puts a number at a path.
    ///
    /// # Errors
    /// When it is infinite or not a number; nothing is changed then.
    pub fn set(&mut self, path: &str, value: f64) -> Result<(), NotFinite> {
        if !value.is_finite() {
            return Err(NotFinite { path: path.to_owned() });
        }
        match self.0.get_mut(path) {
            Some(held) => *held = value,
            None => {
                self.0.insert(path.to_owned(), value);
            }
        }
        Ok(())
    }

    /// Takes the number at a path away and returns it.
    pub fn remove(&mut self, path: &str) -> Option<f64> {
        self.0.remove(path)
    }

    /// All numbers, in the order of their paths.
    pub fn iter(&self) -> impl Iterator<Item = (&str, f64)> {
        self.0.iter().map(|(path, value)| (path.as_str(), *value))
    }

    /// How many numbers there are.
    pub fn len(&self) -> usize {
        self.0.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.0.is_empty()
    }
}

/// Keys of chosen options by choice path.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Choices(BTreeMap<String, String>);

impl Choices {
    /// No choices.
    pub fn new() -> Self {
        Self::default()
    }

    /// Key chosen at a path, if there is one.
    pub fn get(&self, path: &str) -> Option<&str> {
        self.0.get(path).map(String::as_str)
    }

    /// Key chosen for a row, else the row's default.
    pub fn get_or_default<'a>(&'a self, choice: &Choice) -> &'a str {
        self.get(choice.path).unwrap_or(choice.default)
    }

    /// Whether the key at the path is this one.
    pub fn is(&self, path: &str, key: &str) -> bool {
        self.get(path) == Some(key)
    }

    /// Chooses a key at a path.
    pub fn set(&mut self, path: &str, key: &str) {
        self.0.insert(path.to_owned(), key.to_owned());
    }

    /// Takes the choice at a path away and returns it.
    pub fn remove(&mut self, path: &str) -> Option<String> {
        self.0.remove(path)
    }

    /// All choices, in the order of their paths.
    pub fn iter(&self) -> impl Iterator<Item = (&str, &str)> {
        self.0.iter().map(|(path, key)| (path.as_str(), key.as_str()))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_finite_numbers_enter() {
        let mut values = Values::new();
        assert_eq!(values.set("a", 1.0), Ok(()));
        for bad in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
            assert!(values.set("a", bad).is_err());
            assert!(values.set("b", bad).is_err());
        }
        assert_eq!(values.iter().collect::<Vec<_>>(), [("a", 1.0)]);
    }
}
