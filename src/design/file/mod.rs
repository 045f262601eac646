//! Design files: reading, writing, atomic saving.
//!
//! *Format*: RON, UTF-8, meant to be read and compared by people. `format` is the version and is read first; then one frozen
//! structure per version (unknown fields refused) with one conversion to the next. Numbers are engineering text with their
//! unit, written by [`crate::quantity::exact`] and read by [`crate::quantity::parse`], so a file holds the same bits.
//! *Bad input*: every failure names file, line where there is one, reason and hint; wrong entries are reported all at once.

mod error;
mod read;
mod save;
mod syntax;
#[cfg(test)]
mod tests;
mod v1;
mod write;

pub use error::{EntryError, FileError, FileErrorKind};
pub use read::{FORMAT, LARGEST_FILE, load, read};
pub use save::replace;
pub use write::{save, write};
