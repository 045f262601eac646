//! Format 1: its frozen structure, and the way between it and a [`Design`].
//!
//! The structure never changes; a later format gets its own file and this one a conversion to it. A choice that is absent has
//! its default, so files from before a choice existed keep their meaning; an absent number stays empty and is reported by the
//! check.

use super::error::{EntryError, FileError, FileErrorKind};
use super::syntax::syntax;
use crate::design::document::{Design, short, unknown_option};
use crate::design::table;
use crate::quantity::{Choices, Values, exact};
use serde::de::{MapAccess, Visitor};
use serde::ser::SerializeMap;
use serde::{Deserialize, Deserializer, Serialize, Serializer};
use std::collections::BTreeSet;

/// A file of format 1.
#[derive(Deserialize, Serialize)]
#[serde(deny_unknown_fields, rename = "design")]
struct DesignV1 {
    format: u32,
    title: String,
    #[serde(default)]
    notes: String,
    choices: TextMap,
    values: TextMap,
    #[serde(default)]
    locks: Vec<String>,
    #[serde(default)]
    aims: TextMap,
}

/// Text by text in file order. A key that stands twice is refused: one of the two would be lost in silence.
#[derive(Default)]
struct TextMap(Vec<(String, String)>);

impl Serialize for TextMap {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut map = serializer.serialize_map(Some(self.0.len()))?;
        for (key, text) in &self.0 {
            map.serialize_entry(key, text)?;
        }
        map.end()
    }
}

impl<'de> Deserialize<'de> for TextMap {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_map(TextMapVisitor)
    }
}

struct TextMapVisitor;

impl<'de> Visitor<'de> for TextMapVisitor {
    type Value = TextMap;

    fn expecting(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str("a map from text to text")
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<TextMap, A::Error> {
        let mut seen = BTreeSet::new();
        let mut pairs = Vec::new();
        while let Some((key, text)) = map.next_entry::<String, String>()? {
            if !seen.insert(key.clone()) {
                return Err(serde::de::Error::custom(format!("“{}” stands twice", short(&key))));
            }
            pairs.push((key, text));
        }
        Ok(TextMap(pairs))
    }
}

/// Reads a text of format 1.
pub(super) fn read(text: &str) -> Result<Design, FileError> {
    let file: DesignV1 = ron::from_str(text).map_err(|error| syntax(&error))?;
    let mut errors = Vec::new();
    let mut design = Design {
        title: file.title,
        notes: file.notes,
        choices: read_choices(&file.choices, text, &mut errors),
        values: read_values(&file.values, text, &mut errors),
        locks: read_locks(file.locks, text, &mut errors),
        aims: read_aims(&file.aims, text, &mut errors),
    };
    if !errors.is_empty() {
        return Err(FileErrorKind::Entries(errors).into());
    }
    design.complete_choices();
    Ok(design)
}

fn read_choices(map: &TextMap, text: &str, errors: &mut Vec<EntryError>) -> Choices {
    let mut choices = Choices::new();
    for (path, key) in &map.0 {
        let Some(choice) = table::choice(path) else {
            errors.push(unknown_path(path, text));
            continue;
        };
        if let Some(option) = choice.option(key) {
            choices.set(path, option.key);
        } else {
            let finding = unknown_option(choice, key);
            errors.push(at_line(path, text, finding.message, finding.hint.unwrap_or_default()));
        }
    }
    choices
}

fn read_values(map: &TextMap, text: &str, errors: &mut Vec<EntryError>) -> Values {
    let mut values = Values::new();
    for (path, written) in &map.0 {
        let Some(entry) = table::entry(path) else {
            errors.push(unknown_path(path, text));
            continue;
        };
        match entry.read(written) {
            Ok(value) => {
                if let Err(error) = values.set(path, value) {
                    errors.push(at_line(path, text, format!("{error}."), "write a finite number".into()));
                }
            }
            Err(error) => errors.push(at_line(path, text, format!("{}: {}.", entry.name, error.reason), error.hint)),
        }
    }
    values
}

fn read_locks(locks: Vec<String>, text: &str, errors: &mut Vec<EntryError>) -> BTreeSet<String> {
    for path in &locks {
        if table::entry(path).is_none() {
            errors.push(unknown_path(path, text));
        }
    }
    locks.into_iter().collect()
}

/// Aims are kept for lanes the present network does not have: they come back with it.
fn read_aims(map: &TextMap, text: &str, errors: &mut Vec<EntryError>) -> Values {
    let mut aims = Values::new();
    for (lane, written) in &map.0 {
        match crate::quantity::parse(written, crate::quantity::Unit::Hertz) {
            Ok(value) if value > 0.0 => {
                let _ = aims.set(lane, value);
            }
            Ok(_) => errors.push(at_line(lane, text, "An aim is not above 0 Hz.".into(), "write a frequency".into())),
            Err(error) => errors.push(at_line(lane, text, format!("Aim: {}.", error.reason), error.hint)),
        }
    }
    aims
}

fn unknown_path(path: &str, text: &str) -> EntryError {
    let hint = match table::nearest_path(path) {
        Some(near) => format!("did you mean {near}?"),
        None => "the entry may come from a later release".into(),
    };
    at_line(path, text, format!("There is no entry “{}”.", short(path)), hint)
}

fn at_line(entry: &str, text: &str, reason: String, hint: String) -> EntryError {
    let quoted = format!("\"{entry}\"");
    let starts = |line: &&str| line.trim_start().starts_with(&quoted);
    let position =
        text.lines().position(|line| starts(&line)).or_else(|| text.lines().position(|l| l.contains(&quoted)));
    EntryError { line: position.map(|index| index + 1), entry: short(entry), reason, hint }
}

/// Text of format 1: one entry a line, in form order, so that files compare well.
pub(super) fn write(design: &Design) -> Result<String, FileError> {
    let file = DesignV1 {
        format: 1,
        title: design.title.clone(),
        notes: design.notes.clone(),
        choices: written_choices(design)?,
        values: written_values(design)?,
        locks: design.locks.iter().cloned().collect(),
        aims: TextMap(
            design.aims.iter().map(|(lane, f)| (lane.to_owned(), exact(f, crate::quantity::Unit::Hertz))).collect(),
        ),
    };
    let pretty = ron::ser::PrettyConfig::new().new_line("\n").indentor("    ").escape_strings(!reads_plainly(&file));
    let mut text = ron::ser::to_string_pretty(&file, pretty)
        .map_err(|error| FileErrorKind::NotSaved { reason: error.to_string() })?;
    text.push('\n');
    Ok(text)
}

/// Whether title and notes can stand in the file as typed, line ends included; otherwise they are escaped.
fn reads_plainly(file: &DesignV1) -> bool {
    let plain = |text: &str| text.chars().all(|c| c == '\n' || !c.is_control());
    plain(&file.title) && plain(&file.notes)
}

fn written_choices(design: &Design) -> Result<TextMap, FileError> {
    if let Some((path, _)) = design.choices.iter().find(|(path, _)| table::choice(path).is_none()) {
        return Err(FileErrorKind::UnknownPath { entry: path.to_owned() }.into());
    }
    let rows = table::all_choices();
    Ok(TextMap(rows.filter_map(|row| Some((row.path.into(), design.choices.get(row.path)?.into()))).collect()))
}

fn written_values(design: &Design) -> Result<TextMap, FileError> {
    if let Some((path, _)) = design.values.iter().find(|(path, _)| table::entry(path).is_none()) {
        return Err(FileErrorKind::UnknownPath { entry: path.to_owned() }.into());
    }
    let rows = table::all_entries();
    Ok(TextMap(rows.filter_map(|row| Some((row.path.into(), exact(design.values.get(row.path)?, row.unit)))).collect()))
}
