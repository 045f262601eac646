//! The document an engineer enters, its check and its file.
//!
//! [`Design`] holds numbers and choices by the paths of the table of entries, usable or not. [`Design::check`] turns it into a
//! [`CheckedDesign`] of typed parts, or reports every problem at once; only a checked design is analysed. [`file`] reads and
//! writes designs, [`sample`] holds those that come with the program.

mod caution;
mod check;
mod difference;
mod document;
mod duty_limit;
mod events;
pub mod file;
mod requirements;
pub mod sample;
mod table;

pub use check::CheckedDesign;
pub use difference::{Difference, differences};
pub use document::{Design, printable};
pub use events::{Event, Events};
pub use requirements::{Asked, Limit, Requirements, Scope};
pub use table::{all_choices, all_entries, choice, entry, nearest_path};
