//! Networks around the error amplifier, parts from poles and zeros and back, placement.
//!
//! A [`Compensator`] is its parts: a divider with its reference, a type I, II or III network, an op amp, a transconductance
//! amplifier, or a shunt regulator with an optocoupler. Everything else is derived from them. [`Compensator::lanes`] says where the parts put each pole and zero when the
//! amplifier is ideal, [`Compensator::place`] finds parts for wanted poles and zeros, [`Compensator::rounded`] makes the parts
//! preferred values, [`k_factor`] and [`pole_zero_rules`] say where poles and zeros might go. [`Compensator::state_space`] solves
//! the actual netlist, amplifier limits and divider loading included: that is what is plotted.
//!
//! *The networks.* An inverting op amp has the upper divider resistor as its input and the series pair `r2`, `c1` with `c2`
//! across it as its feedback; `c1` alone for a type I. A transconductance amplifier reads the tap of the divider and drives the
//! same parts to ground. Type III has the branch `r3`, `c3` across the upper resistor; types I and II may have a capacitor
//! straight across it instead. `shunt` says where the parts of isolated feedback stand.
//!
//! *Sign.* The amplifier inverts. Every response here is control voltage from output voltage with the inversion taken out, so an
//! integrator is positive at low frequency; only [`Compensator::state_space`] keeps the sign of the circuit.
//!
//! | file | holds |
//! |---|---|
//! | `entries` | what a user enters and chooses, and what applies to which network |
//! | `network` | the compensator as checked parts |
//! | `lanes` | poles, zeros and gain from the parts, amplifier ideal |
//! | `place` | parts from poles, zeros and gain: exactly, or the nearest and why |
//! | `fit` | the nearest parts while some are kept |
//! | `netlist` | the actual network, solved |
//! | `limits` | where the amplifier's limits act, for whoever follows the network beyond them |
//! | `digital` | a compensator that is a difference equation |
//! | `digital_entries` | its rows |
//! | `difference` | its coefficients from poles and zeros by a method, and back |
//! | `fixed_point` | coefficients as whole numbers of a word length |
//! | `digital_lanes` | its lanes, as wanted and as built |
//! | `digital_place` | the placement methods for it |
//! | `preferred` | the series of preferred values |
//! | `rounding` | parts of preferred value |
//! | `method` | where poles and zeros might go: K factor, landmarks |
//! | `shunt` | isolated feedback: regulator and optocoupler, what contradicts itself |
//! | `shunt_entries`, `shunt_netlist`, `shunt_place`, `shunt_bias` | its rows, its netlist, its parts from lanes, its operating point |
//! | `crossing` | those methods carried out with the actual amplifier |

mod crossing;
mod difference;
mod digital;
mod digital_entries;
mod digital_lanes;
mod digital_place;
mod entries;
mod fit;
mod fixed_point;
mod lanes;
mod limits;
mod method;
mod netlist;
mod network;
mod place;
mod preferred;
mod rounding;
mod shunt;
mod shunt_bias;
mod shunt_entries;
mod shunt_netlist;
mod shunt_place;
#[cfg(test)]
mod shunt_tests;

pub use crossing::RuledPlacement;
pub use difference::{DifferenceEquation, Method};
pub use digital::{Digital, FixedPoint, Rounding};
pub use entries::{applies, choices, entries};
pub use fixed_point::{Codes, limits};
pub use lanes::{Corners, Lane, LaneKind};
pub use limits::{Limit, LimitKind, Limited};
pub use method::{KFactor, KFactorGoal, Reason, RuleGoal, RulePlacement, k_factor, pole_zero_rules};
pub use netlist::{FAST, NetworkError, ValuedNetlist, joined_paths};
pub use network::{Amplifier, Anchor, Compensator, Kind, OpAmp, Part, Parts, Transconductance};
pub use place::{Built, LEAST_RATIO, Placed, Placement};
pub use preferred::{Series, round_ratio};
pub use shunt::{LedSupply, ShuntRegulator};
pub use shunt_bias::Bias;
