//! Writing a design in the newest format, to a writer or in place of a file.

use super::error::{FileError, FileErrorKind};
use super::save::{missing_folder, replace};
use super::v1;
use crate::design::Design;
use std::io::Write;
use std::path::Path;

/// Writes a design in the newest format.
///
/// # Errors
/// When a path is not in the table or the writer fails.
pub fn write(design: &Design, writer: &mut impl Write) -> Result<(), FileError> {
    let text = v1::write(design)?;
    writer.write_all(text.as_bytes()).map_err(|error| FileErrorKind::NotSaved { reason: error.to_string() }.into())
}

/// Saves a design so that the file always holds either the old design or the new one, whole.
///
/// # Errors
/// When the folder does not exist or cannot be written, or the file is read-only; the old file is untouched then.
pub fn save(design: &Design, path: &Path) -> Result<(), FileError> {
    let text = v1::write(design).map_err(|error| error.at(path))?;
    if let Some(folder) = missing_folder(path) {
        return Err(FileError::from(FileErrorKind::NoFolder { folder }).at(path));
    }
    replace(path, text.as_bytes())
        .map_err(|error| FileError::from(FileErrorKind::NotSaved { reason: error.to_string() }).at(path))
}
