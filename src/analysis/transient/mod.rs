//! What the scope will show: the switched closed loop in time at one condition, from start-up to recovery from an overload.
//!
//! *Conventions*: an event begins at t = 0, a clock's edge; before it the converter runs its steady period, or rests. Voltages are means
//! over a period unless they are said to hold the ripple.
//!
//! | file | holds |
//! |---|---|
//! | `event` | the events, and what is asked for |
//! | `model` | the switched system of a design, and where it starts |
//! | `scenario` | what drives it during an event |
//! | `figures` | deviation, settling, peaks, read off the periods |
//! | `result` | the result as the views take it |
//! | `work` | the work itself |

mod event;
mod figures;
mod model;
mod result;
mod scenario;
mod work;

#[cfg(test)]
mod rest_tests;

pub use event::{MOST_PERIODS, TransientEvent, TransientRequest};
pub use result::{Transient, TransientFigures};
pub use work::{transient, transient_at};
