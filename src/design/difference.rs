//! What differs between two designs, entry by entry, in words.

use std::collections::BTreeSet;

use super::document::{Design, short};
use super::table;
use crate::quantity::{Unit, exact};

/// One thing that differs.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Difference {
    /// Path of the entry; `title`, `notes`, or the key of a lane for what is not in the table.
    pub path: String,
    /// What it is.
    pub name: String,
    /// What the first design holds, as text; empty when nothing.
    pub before: String,
    /// What the second one holds.
    pub after: String,
}

/// All that differs, in form order: title and notes, choices, numbers, kept parts, places of lanes.
pub fn differences(before: &Design, after: &Design) -> Vec<Difference> {
    let mut found = Vec::new();
    let mut add = |path: &str, name: String, before: String, after: String| {
        if before != after {
            found.push(Difference { path: path.to_owned(), name, before, after });
        }
    };
    let line = |text: &str| short(&text.replace('\n', " "));
    add("title", "Title".to_owned(), line(&before.title), line(&after.title));
    if before.notes != after.notes {
        let (old, new) = (line(&before.notes), line(&after.notes));
        // Long notes that differ further on than is shown.
        let (old, new) = if old == new { ("one text".to_owned(), "another".to_owned()) } else { (old, new) };
        add("notes", "Notes".to_owned(), old, new);
    }
    for choice in table::all_choices() {
        let shown = |design: &Design| {
            let key = design.choices.get(choice.path).unwrap_or_default();
            choice.option(key).map_or(key, |option| option.name).to_owned()
        };
        add(choice.path, choice.name.to_owned(), shown(before), shown(after));
    }
    for entry in table::all_entries() {
        let shown = |design: &Design| design.values.get(entry.path).map_or_else(String::new, |v| exact(v, entry.unit));
        add(entry.path, entry.name.to_owned(), shown(before), shown(after));
    }
    for path in before.locks.union(&after.locks) {
        let name = table::entry(path).map_or(path.as_str(), |entry| entry.name);
        let shown = |design: &Design| if design.locks.contains(path) { "kept" } else { "free" }.to_owned();
        add(path, format!("{name}, lock"), shown(before), shown(after));
    }
    let lanes: BTreeSet<&str> = before.aims.iter().chain(after.aims.iter()).map(|(lane, _)| lane).collect();
    for lane in lanes {
        let shown = |design: &Design| design.aims.get(lane).map_or_else(String::new, |hz| exact(hz, Unit::Hertz));
        add(lane, format!("Aim of {lane}"), shown(before), shown(after));
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_design_does_not_differ_from_itself() {
        assert!(differences(&Design::default(), &Design::default()).is_empty());
    }

    #[test]
    fn everything_that_differs_is_told() {
        let before = Design { notes: "x".repeat(100), ..Design::default() };
        let mut after = before.clone();
        after.title = "Rail".to_owned();
        after.notes.push('y');
        after.set_from_text("stage.inductor.inductance", "8.2u").expect("a number");
        after.locks.insert("compensator.r2".to_owned());
        after.aims.set("zero-1", 1500.0).expect("finite");
        let found = differences(&before, &after);
        let paths: Vec<&str> = found.iter().map(|difference| difference.path.as_str()).collect();
        assert_eq!(paths, ["title", "notes", "stage.inductor.inductance", "compensator.r2", "zero-1"]);
        assert_eq!(found[2].after, "8.2 µH");
        assert!(found.iter().all(|difference| difference.before != difference.after));
        let back = differences(&after, &before);
        assert_eq!(back.len(), found.len());
        assert_eq!(back[4].after, "");
    }
}
