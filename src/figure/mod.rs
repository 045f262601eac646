//! Schematics and plots as neutral strokes, labels and colour roles: the window paints them, the exports write them.

pub mod axis;
mod bode;
mod chart;
mod compensator;
mod equation;
mod isolated;
mod ladder;
mod pen;
mod plan;
mod response;
mod stage;
mod step;
mod stroke;
mod sweep;
mod symbol;
#[cfg(test)]
mod tests;
mod time_chart;
mod transient;
mod values;
mod waves;

pub use bode::{Shown, bode};
pub use compensator::compensator_schematic;
pub use response::{ClosedLoop, in_words as margin_in_words, response};
pub use stage::{schematic, stage_schematic};
pub use step::{Event, step};
pub use stroke::{Align, Dash, Figure, Mark, Place, Point, Role, Weight};
pub use sweep::sweep;
pub use time_chart::{Frame, Instant, Panel, TimeChart, Trace, TraceLook};
pub use transient::transient;
pub use values::Numbers;
pub use waves::waves;
