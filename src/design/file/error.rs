//! Why a design file could not be read or saved: file, place, reason and hint.

use crate::design::document::printable;
use crate::finding::Finding;
use std::fmt::Write as _;
use std::io;
use std::path::{Path, PathBuf};

/// A design file that failed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct FileError {
    /// The file, where there is one.
    pub path: Option<PathBuf>,
    /// What failed.
    pub kind: FileErrorKind,
}

/// What failed about a design file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum FileErrorKind {
    /// There is no such file.
    Missing,
    /// The file may not be read.
    NotAllowed,
    /// The path names a folder.
    Folder,
    /// The path names a pipe, a device or the like.
    NotAFile,
    /// Reading failed part of the way.
    Unreadable {
        /// What the system says.
        reason: String,
    },
    /// The file is larger than any design.
    TooLarge,
    /// The file holds nothing.
    Empty,
    /// The text is UTF-16.
    Utf16,
    /// The bytes are not UTF-8 text.
    NotText {
        /// Line of the first such byte, from 1.
        line: usize,
    },
    /// The bytes hold a NUL, which no text holds.
    NulByte {
        /// Line of the first one, from 1.
        line: usize,
    },
    /// The text is not a design in RON.
    Syntax {
        /// Line, from 1.
        line: usize,
        /// Column, from 1.
        column: usize,
        /// What was met.
        reason: String,
        /// What would help.
        hint: String,
    },
    /// A later release wrote the file.
    Newer {
        /// Its version.
        format: u32,
    },
    /// No release wrote this version.
    NoSuchFormat {
        /// Its version.
        format: u32,
    },
    /// Entries that cannot be read, all of them.
    Entries(Vec<EntryError>),
    /// Saving failed; the old file is untouched.
    NotSaved {
        /// What the system says.
        reason: String,
    },
    /// The folder to save in does not exist.
    NoFolder {
        /// The folder.
        folder: PathBuf,
    },
    /// The design holds a path that is not in the table.
    UnknownPath {
        /// The path.
        entry: String,
    },
}

/// One entry of a file that cannot be read.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct EntryError {
    /// Line, from 1, where it could be told.
    pub line: Option<usize>,
    /// Path of the entry.
    pub entry: String,
    /// What is wrong, as a sentence.
    pub reason: String,
    /// What would help.
    pub hint: String,
}

impl From<FileErrorKind> for FileError {
    fn from(kind: FileErrorKind) -> Self {
        Self { path: None, kind }
    }
}

impl FileErrorKind {
    pub(super) fn opening(error: &io::Error) -> Self {
        match error.kind() {
            io::ErrorKind::NotFound => FileErrorKind::Missing,
            io::ErrorKind::PermissionDenied => FileErrorKind::NotAllowed,
            _ => FileErrorKind::Unreadable { reason: error.to_string() },
        }
    }

    /// What is wrong, as a sentence.
    pub fn reason(&self) -> String {
        match self {
            FileErrorKind::Missing => "There is no such file.".into(),
            FileErrorKind::NotAllowed => "The file may not be read.".into(),
            FileErrorKind::Folder => "This is a folder, not a design file.".into(),
            FileErrorKind::NotAFile => "This is a pipe or a device, not a design file.".into(),
            FileErrorKind::Unreadable { reason } => format!("The file cannot be read: {reason}."),
            FileErrorKind::TooLarge => {
                format!("The file is larger than {} MB, which no design file is.", super::read::LARGEST_FILE >> 20)
            }
            FileErrorKind::Empty => "The file is empty.".into(),
            FileErrorKind::Utf16 => "The file is UTF-16 text.".into(),
            FileErrorKind::NotText { .. } => "The file is not UTF-8 text.".into(),
            FileErrorKind::NulByte { .. } => "The file holds a NUL byte, which text never does.".into(),
            FileErrorKind::Syntax { reason, .. } => reason.clone(),
            FileErrorKind::Newer { format } => {
                format!("The file has format {format}; this release reads formats up to {}.", super::read::FORMAT)
            }
            FileErrorKind::NoSuchFormat { format } => format!("There is no format {format}."),
            FileErrorKind::Entries(entries) => match entries.as_slice() {
                [one] => one.reason.clone(),
                all => format!("{} entries cannot be read.", all.len()),
            },
            FileErrorKind::NotSaved { reason } => format!("The file could not be saved: {reason}."),
            FileErrorKind::NoFolder { folder } => format!("The folder {} does not exist.", folder.display()),
            FileErrorKind::UnknownPath { entry } => format!("The design holds “{entry}”, which is not in the table."),
        }
    }

    /// What would help.
    pub fn hint(&self) -> String {
        let hint = match self {
            FileErrorKind::Missing => "check the name and the folder",
            FileErrorKind::NotAllowed => "check the permissions of the file and its folder",
            FileErrorKind::Folder => "name a file in it",
            FileErrorKind::NotAFile => "put the design into a file and name that",
            FileErrorKind::Unreadable { .. } => "check that the disk or share is still there",
            FileErrorKind::TooLarge | FileErrorKind::Empty => "check that this is the right file",
            FileErrorKind::Utf16 | FileErrorKind::NotText { .. } | FileErrorKind::NulByte { .. } => {
                "save it as UTF-8 text, or check that this is the right file"
            }
            FileErrorKind::Syntax { hint, .. } => hint,
            FileErrorKind::Newer { .. } => "open it with a later release of Polewright",
            FileErrorKind::NoSuchFormat { .. } => "formats are counted from 1",
            FileErrorKind::Entries(entries) => match entries.as_slice() {
                [one] => &one.hint,
                _ => "see each of them",
            },
            FileErrorKind::NotSaved { .. } => {
                "nothing on disk was changed; check that the folder can be written and has room"
            }
            FileErrorKind::NoFolder { .. } => "create it, or choose another folder",
            FileErrorKind::UnknownPath { .. } => "remove the entry",
        };
        hint.to_owned()
    }

    /// Line the failure stands in, from 1.
    pub fn line(&self) -> Option<usize> {
        match self {
            FileErrorKind::NotText { line } | FileErrorKind::NulByte { line } | FileErrorKind::Syntax { line, .. } => {
                Some(*line)
            }
            FileErrorKind::Entries(entries) => match entries.as_slice() {
                [one] => one.line,
                _ => None,
            },
            _ => None,
        }
    }
}

impl FileError {
    /// The same error with the file it happened to.
    #[must_use]
    pub fn at(mut self, path: &Path) -> Self {
        self.path = Some(path.to_owned());
        self
    }

    /// The same as findings: one problem for each entry, else one for the file. The place of a finding is an entry's path, or
    /// the file and line.
    pub fn findings(&self) -> Vec<Finding> {
        if let FileErrorKind::Entries(entries) = &self.kind {
            let finding = |error: &EntryError| {
                let line = error.line.map(|line| format!("Line {line}: ")).unwrap_or_default();
                Finding::problem(error.entry.clone(), format!("{line}{}", error.reason)).with_hint(error.hint.clone())
            };
            return entries.iter().map(finding).collect();
        }
        vec![Finding::problem(self.place(), self.kind.reason()).with_hint(self.kind.hint())]
    }

    /// File and line, as `name:line`.
    pub fn place(&self) -> String {
        let file = self.path.as_ref().map(|path| path.display().to_string()).unwrap_or_default();
        match (self.kind.line(), file.is_empty()) {
            (Some(line), true) => format!("line {line}"),
            (Some(line), false) => format!("{file}:{line}"),
            (None, _) => file,
        }
    }
}

impl std::fmt::Display for FileError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let place = self.place();
        let place = if place.is_empty() { place } else { format!("{place}: ") };
        let mut text = format!("{place}{} ({})", self.kind.reason(), self.kind.hint());
        if let FileErrorKind::Entries(entries) = &self.kind
            && entries.len() > 1
        {
            for error in entries {
                let line = error.line.map(|line| format!("line {line}, ")).unwrap_or_default();
                let _ = write!(text, "\n  {line}{}: {} ({})", error.entry, error.reason, error.hint);
            }
        }
        f.write_str(&printable(&text))
    }
}

impl std::error::Error for FileError {}
