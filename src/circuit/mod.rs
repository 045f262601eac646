//! Ideal parts, netlists, and the state equations of a netlist for one set of closed switches.
//!
//! A [`Netlist`] is structure alone: which part joins which nodes, and which slot of a values vector each part reads.
//! [`Compiled`] is that structure with its elimination worked out once for one set of closed switches; it is replayed
//! for any values and gives [`StateEquations`]. A [`Sketch`] says where the parts stand in the drawing.

mod eliminate;
mod equations;
mod netlist;
mod sketch;
#[cfg(test)]
mod tests;

pub use eliminate::{CircuitError, Compiled};
pub use equations::StateEquations;
pub use netlist::{InputId, Netlist, Node, OutputId, PartId, Slot};
pub use sketch::{Drawn, Placed, Shows, Sketch, Stand, Symbol};
