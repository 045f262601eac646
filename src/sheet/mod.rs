//! What leaves the program: pictures, tables, curves.

pub mod coefficients;
mod curves;
#[cfg(feature = "window")]
mod png;
mod svg;
mod table;
mod waveforms;

pub use curves::{write_curves, write_step, write_waves};
#[cfg(feature = "window")]
pub use png::{PictureError, png};
pub use svg::svg;
pub use table::{margin_table, parts_list};
pub use waveforms::write_waveforms;
