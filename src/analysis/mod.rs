//! A checked design in, every result of its nine conditions out.
//!
//! [`analyse`] joins stage, modulator and compensator into one [`loop_model`] per condition and reads everything off it:
//! margins, verdict, closed-loop curves, steps, ledger. Window, terminal and sheet read the [`Analysis`] and compute nothing.

mod analyse;
mod condition;
mod crossover_window;
mod curves;
mod ledger;
pub mod loop_model;
mod pairs;
mod placement;
mod readouts;
mod remarks;
mod requirement;
mod result;
mod steps;
#[cfg(test)]
mod tests;

pub use analyse::{Request, Shown, analyse, logarithmic};
pub use placement::{Goal, place_by_k_factor, place_by_rules, usual_goal};
pub use result::{
    Analysis, Condition, ConditionResult, ConditionSummary, CrossoverWindow, Curves, Detail, Ledger, LedgerRole,
    LedgerRow, Level, LimitKind, LoopResult, Readout, RequirementVerdict, Step, StepFigures, Steps, WindowEdge, Worst,
};
