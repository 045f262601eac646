//! Numbers as engineers write them, and the rows of the table of entries.
//!
//! Everything inside the program is SI in `f64`; this room is where text becomes such a number and back. [`parse`] reads
//! engineering notation, [`print`] writes it for people (rounded), [`exact`] writes it for files and fields (parses back to
//! the same bits). [`Entry`] and [`Choice`] are the rows every form, file, check and `--set` reads; [`Values`] and
//! [`Choices`] are what a design holds for them.

mod entry;
mod notation;
mod print;
mod unit;
mod values;

pub use entry::{Bounds, Choice, ChoiceOption, Entry};
pub use notation::{ParseError, parse};
pub use print::{exact, print, print_digits};
pub use unit::Unit;
pub use values::{Choices, NotFinite, Values};
