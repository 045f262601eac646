//! Polewright: close the feedback loop around a switching power converter, and defend it at the review.
//!
//! One circuit, many views. The rooms, lowest floor first; a room uses those above it in this list, never those below:
//!
//! * [`quantity`]: numbers as engineers write them, and the rows of the table of entries.
//! * [`finding`]: what is wrong or remarkable, how grave, at which entry, what would mend it.
//! * [`linear`]: linear systems: state space, zeros-poles-gain, margins, stability, exact time response.
//! * [`circuit`]: ideal parts, netlists, and the state equations of a netlist for one set of closed switches.
//! * [`converter`]: the power stage: one file per topology, operating point, averaged model, landmarks.
//! * [`compensator`]: networks around the error amplifier, parts from poles and zeros and back, placement.
//! * [`control`]: what joins stage and compensator: the control law, from the modulator to current modes, and its delay.
//! * [`switched`]: a stage and its control without averaging: the orbit that repeats, its exact responses and stability, transients.
//! * [`design`]: the document an engineer enters, its check and its file.
//! * [`analysis`]: a checked design in, every result of its nine conditions out.
//! * [`figure`]: schematics and plots as neutral strokes, labels and colour roles.
//! * [`sheet`]: what leaves the program: pictures, tables, curves.
//! * [`terminal`]: the command line: the same results as text and JSON.
//! * `window`: the desktop window; shows an analysis, edits a design, computes no electronics.
//!
//! Everything inside is SI in `f64`; frequencies at interfaces are in hertz. `DEVELOPERS.md` tells how to add a topology.

pub mod analysis;
pub mod circuit;
pub mod compensator;
pub mod control;
pub mod converter;
pub mod design;
pub mod figure;
pub mod finding;
pub mod linear;
pub mod quantity;
pub mod sheet;
pub mod switched;
pub mod terminal;
#[cfg(feature = "window")]
pub mod window;
