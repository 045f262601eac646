//! A checked design in, every result of its nine conditions out.
//!
//! [`analyse`] joins stage, modulator and compensator into one [`loop_model`] per condition and reads everything off it:
//! margins, verdict, closed-loop curves, steps, ledger. Window, terminal and sheet read the [`Analysis`] and compute nothing.

mod analyse;
mod condition;
mod conduction;
mod crossover_window;
mod curves;
mod ledger;
mod load_sweep;
pub mod loop_model;
mod readouts;
mod remarks;
mod requirement;
mod result;
mod steps;
#[cfg(test)]
mod tests;

pub use analyse::{Request, Shown, analyse, logarithmic};
pub use load_sweep::{LoadSweep, LoadSweepFigures, LoadSweepLine, LoadSweepPoint, SWEEP_POINTS, load_sweep};
pub use result::{
    Analysis, Condition, ConditionResult, ConditionSummary, CrossoverWindow, Curves, Detail, Ledger, LedgerRole,
    LedgerRow, Level, LimitKind, LoopResult, Readout, RequirementVerdict, Step, StepFigures, Steps, WindowEdge, Worst,
};
