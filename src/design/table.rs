//! The whole table of entries: the rows of every room that takes numbers from a user, in form order.

use super::{events, requirements};
use crate::quantity::{Choice, Choices, Entry};
use crate::{compensator, control, converter};

/// Every row for a number, whether it applies or not.
pub fn all_entries() -> impl Iterator<Item = &'static Entry> {
    converter::entries()
        .iter()
        .copied()
        .chain(control::ENTRIES.iter())
        .chain(compensator::entries())
        .chain(requirements::entries())
        .chain(events::ENTRIES.iter())
}

/// Every row for a choice, whether it applies or not.
pub fn all_choices() -> impl Iterator<Item = &'static Choice> {
    converter::choices().iter().copied().chain(control::CHOICES.iter()).chain(compensator::choices())
}

/// The row for a number at a path.
pub fn entry(path: &str) -> Option<&'static Entry> {
    all_entries().find(|entry| entry.path == path)
}

/// The row for a choice at a path.
pub fn choice(path: &str) -> Option<&'static Choice> {
    all_choices().find(|choice| choice.path == path)
}

/// Whether the row at a path, number or choice, has a meaning under these choices.
pub(super) fn applies(path: &str, choices: &Choices) -> bool {
    match path.split('.').next() {
        Some("stage") => converter::applies(path, choices),
        Some("control") => control::applies(path, choices),
        Some("compensator") => compensator::applies(path, choices),
        _ => true,
    }
}

/// The known path most like an unknown one, when one is like it at all.
pub fn nearest_path(unknown: &str) -> Option<&'static str> {
    // More edits than a third of the text is another word, not a slip.
    let most = (unknown.chars().count() / 3).max(2);
    all_entries()
        .map(|entry| entry.path)
        .chain(all_choices().map(|choice| choice.path))
        .map(|path| (edits(unknown, path), path))
        .filter(|(count, _)| *count <= most)
        .min_by_key(|(count, _)| *count)
        .map(|(_, path)| path)
}

/// The option key most like an unknown one.
pub(super) fn nearest_key(choice: &Choice, unknown: &str) -> Option<&'static str> {
    let near = choice.options.iter().map(|option| (edits(unknown, option.key), option.key));
    near.filter(|(count, _)| *count <= 2).min_by_key(|(count, _)| *count).map(|(_, key)| key)
}

/// Insertions, deletions and replacements that turn one text into the other.
/// Source: Levenshtein 1966 (from memory); the row-by-row form of Wagner & Fischer 1974 (from memory).
fn edits(from: &str, to: &str) -> usize {
    // A pasted text of any length must not cost more than a path does.
    const LONGEST: usize = 80;
    let from: Vec<char> = from.chars().take(LONGEST).collect();
    let mut row: Vec<usize> = (0..=from.len()).collect();
    for (i, wanted) in to.chars().enumerate() {
        let mut diagonal = row[0];
        row[0] = i + 1;
        for (j, given) in from.iter().enumerate() {
            let replaced = diagonal + usize::from(*given != wanted);
            diagonal = row[j + 1];
            row[j + 1] = replaced.min(row[j] + 1).min(diagonal + 1);
        }
    }
    row[from.len()]
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::collections::BTreeSet;

    #[test]
    fn edits_are_counted() {
        // The textbook pair: kitten to sitting takes three.
        assert_eq!(edits("kitten", "sitting"), 3);
        assert_eq!(edits("", "abc"), 3);
        assert_eq!(edits("abc", "abc"), 0);
    }

    #[test]
    fn a_slip_finds_the_path_meant() {
        assert_eq!(nearest_path("stage.inductor.inductence"), Some("stage.inductor.inductance"));
        assert_eq!(nearest_path("stage.topologie"), Some("stage.topology"));
        assert_eq!(nearest_path("something else entirely"), None);
    }

    #[test]
    fn every_row_is_sound() {
        let mut seen = BTreeSet::new();
        for entry in all_entries() {
            assert!(seen.insert(entry.path), "{} stands twice", entry.path);
            assert!(!entry.name.is_empty() && !entry.help.is_empty(), "{}", entry.path);
            assert_eq!(entry.check(entry.default), Ok(()), "default of {}", entry.path);
            assert!(entry.path.chars().all(|c| c.is_ascii_lowercase() || c.is_ascii_digit() || ".-".contains(c)));
        }
        for choice in all_choices() {
            assert!(seen.insert(choice.path), "{} stands twice", choice.path);
            assert!(choice.option(choice.default).is_some(), "default of {}", choice.path);
            assert!(!choice.name.is_empty() && !choice.help.is_empty(), "{}", choice.path);
        }
    }
}
