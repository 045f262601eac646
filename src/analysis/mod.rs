//! A checked design in, every result of its nine conditions out.
//!
//! [`analyse`] joins stage, control law and compensator into one [`loop_model`] per condition and reads everything off it:
//! margins, verdict, closed-loop curves, steps, ledger. Window, terminal and sheet read the [`Analysis`] and compute nothing.

mod analyse;
mod condition;
mod conduction;
mod control_figures;
mod control_remarks;
mod crossover_window;
mod curves;
mod digital;
mod digital_remarks;
mod fast_path;
mod filter_readouts;
mod filter_remarks;
mod filter_result;
mod impedance;
mod isolated;
mod isolated_readouts;
mod isolated_remarks;
#[cfg(test)]
mod isolated_tests;
mod ledger;
mod load_sweep;
pub mod loop_model;
pub mod motion;
mod pairs;
mod placement;
pub mod proposal;
mod readouts;
mod referee;
mod remarks;
mod requirement;
mod result;
pub mod sampled;
mod stability_remarks;
mod steps;
mod switched_terms;
pub mod terms;
#[cfg(test)]
mod tests;
mod transient;

pub use analyse::{Request, Shown, analyse, logarithmic};
pub use digital::DigitalDetail;
pub use fast_path::FastPath;
pub use filter_result::{
    Against, ImpedanceCurves, ImpedanceMargin, InputFilterDetail, InputFilterResult, LargestChange,
};
pub use isolated::{AtRatio, IsolatedFigures};
pub use load_sweep::{LoadSweep, LoadSweepFigures, LoadSweepLine, LoadSweepPoint, SWEEP_POINTS, load_sweep};
pub use placement::{Goal, place_by_k_factor, place_by_rules, usual_goal};
pub use referee::{
    ExactCurves, Reach, ReachedBy, Referee, Steady, Stress, SwitchedStability, Wave, WaveKind, referee, steady,
};
pub use result::{
    Analysis, Condition, ConditionResult, ConditionSummary, ControlFigures, CrossoverWindow, Curves, Detail,
    InnerResult, Ledger, LedgerRole, LedgerRow, Level, LimitKind, LoopResult, Readout, RequirementVerdict, Step,
    StepFigures, Steps, WindowEdge, Worst,
};
pub use transient::{
    MOST_PERIODS, Transient, TransientEvent, TransientFigures, TransientRequest, transient, transient_at,
};
