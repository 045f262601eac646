//! Schematics and plots as neutral strokes, labels and colour roles: the window paints them, the exports write them.

mod compensator;
mod ladder;
mod pen;
mod plan;
mod stage;
mod stroke;
mod symbol;
#[cfg(test)]
mod tests;
mod values;

pub use compensator::compensator_schematic;
pub use stage::{schematic, stage_schematic};
pub use stroke::{Align, Dash, Figure, Mark, Place, Point, Role, Weight};
pub use values::Numbers;
