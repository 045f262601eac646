//! The power stage: one file per topology, operating point, averaged model, landmarks.
//!
//! A topology draws its netlist once ([`Topology`]); everything else follows from that netlist by general methods:
//! the duty ratio that gives the wanted output, currents, and the averaged small-signal model. Textbook formulas
//! appear as [`Landmark`]s only and feed no curve.

mod averaged;
mod bank;
mod buck_derived;
mod cell;
mod devices;
mod drawing;
mod drawing_pulses;
mod drawn;
mod entries;
mod filter_damping;
mod filter_entries;
mod filter_figures;
#[cfg(test)]
mod filter_tests;
mod filter_values;
mod filters;
mod further;
mod interleaved;
mod landmark;
mod load;
#[cfg(test)]
mod made_up;
mod magnetics;
mod operating_point;
mod phases;
#[cfg(test)]
mod phases_tests;
mod pulse;
mod pulse_point;
#[cfg(test)]
mod pulse_tests;
mod regions;
mod registry;
mod rows;
pub mod signals;
mod sizing;
mod stage;
mod switching;
#[cfg(test)]
mod tests;
mod topologies;
mod topology;
mod topology_entries;
mod two_inductors;
mod waves;

pub use averaged::AveragedModel;
pub use bank::{BankInductance, Branch};
pub use drawing::{StageDrawing, sketch};
pub use entries::applies;
pub use filter_damping::OptimumDamping;
pub use filter_values::{InputFilter, SecondStage};
pub use filters::Damping;
pub use further::{Further, FurtherValue};
pub use interleaved::Interleaved;
pub(crate) use interleaved::not_followed;
pub use landmark::{BANK, Form, Landmark, RestingForms, Textbook};
pub use operating_point::{Conduction, CurrentFigures, InductorFigures, Loss, OperatingPoint, SwitchedCurrent};
pub use registry::{find, pulse_frequency, registry};
pub use sizing::{Size, Sized, Sizing};
pub use stage::{LoadKind, OutOfReach, Rectifier, Stage, StageCondition};
pub use switching::{Magnetising, SwitchingEquations, SwitchingRows};
pub use topology::{DutyLimit, Entered, IN_TURN, LeftOut, Reach, SwitchSets, Topology, Voltages};
pub use topology_entries::{choices, entries, is_common, row};
