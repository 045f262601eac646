//! Schematics and plots as neutral strokes, labels and colour roles: the window paints them, the exports write them.

pub(crate) mod axis;
mod bode;
mod chart;
mod response;
mod step;
mod stroke;

pub use bode::{Shown, bode};
pub use response::{ClosedLoop, response};
pub use step::{Event, step};
pub use stroke::{Align, Dash, Figure, Mark, Place, Point, Role, Weight};
