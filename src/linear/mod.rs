//! Linear systems: state space, zeros-poles-gain, margins, stability, exact time response.
//!
//! Conventions: inputs, states and outputs are SI, time is in seconds, poles and zeros are in rad/s, frequencies at
//! interfaces are in hertz. A loop gain `T` has the sign of the negative feedback taken out, so the critical point is −1.
//! No polynomial is ever expanded to find its roots or to multiply systems.
//!
//! | file | holds |
//! |---|---|
//! | `state_space` | systems with named inputs and outputs, their poles and their response at a frequency |
//! | `interconnect` | joining systems by state-space algebra |
//! | `eigen` | balancing and eigenvalues of real matrices |
//! | `zeros` | zeros of one input to one output |
//! | `zpk` | zeros, poles and gain |
//! | `cascade` | zeros, poles and gain back to state space, as a scaled cascade |
//! | `answer` | gain and phase with their slopes, of anything that answers at a frequency |
//! | `response` | gain and unwrapped phase as the sum of the factors' phases, with an exact delay |
//! | `discrete` | factors in z of a difference equation, at the frequencies of its samples |
//! | `kernel` | logarithm and angle of four numbers at once |
//! | `sampled` | a measured response that answers at a frequency |
//! | `sampled_loop` | a system sampled once a period and driven through a difference equation: its exact map |
//! | `sampled_step` | step responses of such a loop |
//! | `margins` | crossovers, phase, gain, modulus and delay margin of anything that answers at a frequency |
//! | `stability` | the verdict: closed-loop poles checked by the encirclement count on the exact delay |
//! | `dense` | small dense matrices by rows of vectors |
//! | `exponential` | the matrix exponential |
//! | `time` | exact step response on a uniform grid |
//! | `resolvent` | many solves with s·1 − A at changing s |
//! | `root` | a root between two values of opposite sign |
//! | `modes` | a stable system taken apart into its modes, and its step response from them |
//! | `settling` | extreme and last exit of a band along such a response |
//! | `delay` | a delay as a rational all-pass, for poles and time responses |

mod answer;
mod cascade;
mod delay;
mod dense;
mod discrete;
mod eigen;
mod error;
mod exponential;
mod interconnect;
mod kernel;
mod margins;
mod modes;
#[cfg(test)]
pub(crate) mod precision;
mod resolvent;
mod response;
mod root;
mod sampled;
mod sampled_loop;
mod sampled_step;
mod settling;
mod stability;
mod state_space;
mod time;
mod zeros;
mod zpk;

pub use answer::{FrequencyResponse, LogPoint};
pub use delay::{pade_delay, pade_phase_error_deg};
pub use discrete::DiscreteFactors;
pub use eigen::eigenvalues;
pub use error::LinearError;
pub use exponential::expm;
pub use interconnect::{Port, Wire};
pub use margins::{Crossover, Margins, PhaseCrossover, margins};
pub use modes::{Modes, StepMetrics, settle};
pub use resolvent::{Bench, Resolvent};
pub use response::{FactorKind, FactorPhase, FactoredResponse};
pub(crate) use root::bracketed_root;
pub use sampled::SampledResponse;
pub use sampled_loop::{Drive, SampleTiming, SampledLoop};
pub use sampled_step::{SampledInput, SampledOutput};
pub use stability::{Verdict, closed_loop_verdict, closed_loop_verdict_knowing, encirclement_count};
pub use state_space::StateSpace;
pub use time::{RampStep, UniformGrid, step_response};
pub use zpk::Zpk;

/// A complex number in double precision.
pub type Complex = num_complex::Complex<f64>;
