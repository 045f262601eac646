//! Schematics and plots as neutral strokes, labels and colour roles: the window paints them, the exports write them.

mod stroke;

pub use stroke::{Align, Dash, Figure, Mark, Place, Point, Role, Weight};
