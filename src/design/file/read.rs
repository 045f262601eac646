//! Reading a design: size and encoding first, then the version, then the structure of that version.

use super::error::{FileError, FileErrorKind};
use super::syntax::syntax;
use super::v1;
use crate::design::Design;
use serde::Deserialize;
use std::fs::File;
use std::io::Read;
use std::path::Path;

/// Largest file read [bytes]. A design with long notes takes some kilobytes; what is larger is not a design.
pub const LARGEST_FILE: u64 = 4 << 20;

/// The version this program writes, and the newest it reads.
pub const FORMAT: u32 = 1;

/// The part of a file that every version shares.
#[derive(Deserialize)]
struct Head {
    format: u32,
}

/// Reads a design.
///
/// # Errors
/// When the text cannot be read, is not a design file, is of a newer version, or holds entries that cannot be read.
pub fn read(reader: &mut impl Read) -> Result<Design, FileError> {
    let mut bytes = Vec::new();
    let limited = reader.take(LARGEST_FILE + 1).read_to_end(&mut bytes);
    limited.map_err(|error| FileErrorKind::Unreadable { reason: error.to_string() })?;
    if bytes.len() as u64 > LARGEST_FILE {
        return Err(FileErrorKind::TooLarge.into());
    }
    let text = decode(&bytes)?;
    let head: Head = ron::from_str(text).map_err(|error| syntax(&error))?;
    match head.format {
        1 => v1::read(text),
        format if format > FORMAT => Err(FileErrorKind::Newer { format }.into()),
        format => Err(FileErrorKind::NoSuchFormat { format }.into()),
    }
}

/// Reads the design in a file.
///
/// # Errors
/// As [`read`], with the file's path.
pub fn load(path: &Path) -> Result<Design, FileError> {
    let open = || {
        // Looked at before it is opened: opening a pipe waits for someone to write to it.
        let about = std::fs::metadata(path).map_err(|error| FileErrorKind::opening(&error))?;
        if about.is_dir() {
            return Err(FileErrorKind::Folder.into());
        }
        if !about.is_file() {
            return Err(FileErrorKind::NotAFile.into());
        }
        if about.len() > LARGEST_FILE {
            return Err(FileErrorKind::TooLarge.into());
        }
        let mut file = File::open(path).map_err(|error| FileErrorKind::opening(&error))?;
        read(&mut file)
    };
    open().map_err(|error: FileError| error.at(path))
}

/// UTF-8 text, a byte-order mark in front taken off.
fn decode(bytes: &[u8]) -> Result<&str, FileError> {
    if bytes.starts_with(&[0xFF, 0xFE]) || bytes.starts_with(&[0xFE, 0xFF]) {
        return Err(FileErrorKind::Utf16.into());
    }
    let bytes = bytes.strip_prefix(&[0xEF, 0xBB, 0xBF]).unwrap_or(bytes);
    if bytes.contains(&0) {
        return Err(
            FileErrorKind::NulByte { line: line_at(bytes, bytes.iter().position(|b| *b == 0).unwrap_or(0)) }.into()
        );
    }
    if bytes.iter().all(u8::is_ascii_whitespace) {
        return Err(FileErrorKind::Empty.into());
    }
    std::str::from_utf8(bytes)
        .map_err(|error| FileErrorKind::NotText { line: line_at(bytes, error.valid_up_to()) }.into())
}

/// Line, counted from 1, of a byte.
fn line_at(bytes: &[u8], position: usize) -> usize {
    1 + bytes.iter().take(position).filter(|byte| **byte == b'\n').count()
}
