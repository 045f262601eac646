//! What an analysis finds of an input filter: plain results, as in `result`.
//!
//! *Conventions*: impedances are those at the stage's input terminals; a margin is |Z| of the converter over |Zo| of the filter.

use crate::converter::OptimumDamping;

/// Which of the converter's input impedances a filter is held against.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Against {
    /// ZD: control voltage at rest.
    OpenLoop,
    /// ZN: the control voltage holds the output at rest.
    Nulled,
    /// Zi: loop closed.
    ClosedLoop,
}

impl Against {
    /// The symbol.
    pub fn symbol(self) -> &'static str {
        match self {
            Against::OpenLoop => "ZD",
            Against::Nulled => "ZN",
            Against::ClosedLoop => "Zi",
        }
    }

    /// The name for people.
    pub fn name(self) -> &'static str {
        match self {
            Against::OpenLoop => "open-loop input impedance ZD",
            Against::Nulled => "input impedance with the output nulled ZN",
            Against::ClosedLoop => "closed-loop input impedance Zi",
        }
    }
}

/// Least distance between the input filter's output impedance and one of the converter's input impedances.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ImpedanceMargin {
    /// Which one.
    pub against: Against,
    /// Least |Z|/|Zo| [dB]; negative where they overlap.
    pub margin_db: f64,
    /// Where it lies [Hz].
    pub frequency_hz: f64,
    /// The converter's impedance there [Ω].
    pub converter_ohm: f64,
    /// The filter's impedance there [Ω].
    pub filter_ohm: f64,
}

/// The greatest change the input filter makes to the loop gain below half the switching frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LargestChange {
    /// Signed change, with filter against without: [dB] or [°], the latter within (−180°, 180°].
    pub amount: f64,
    /// Where it lies [Hz].
    pub frequency_hz: f64,
}

/// Input filter against converter at one condition.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct InputFilterResult {
    /// Undamped resonance of the filter [Hz].
    pub resonance_hz: f64,
    /// Its characteristic impedance [Ω].
    pub characteristic_impedance_ohm: f64,
    /// Greatest output impedance of source and filter [Ω].
    pub peak_ohm: f64,
    /// Where it lies [Hz].
    pub peak_hz: f64,
    /// Least of the converter's three input impedances [Ω].
    pub least_input_impedance_ohm: f64,
    /// Where it lies [Hz].
    pub least_input_impedance_hz: f64,
    /// Margins against ZD, ZN and Zi.
    pub margins: [ImpedanceMargin; 3],
    /// Greatest change of the loop's gain.
    pub gain_change: LargestChange,
    /// Greatest change of the loop's phase.
    pub phase_change: LargestChange,
    /// Whether the loop would be stable without the filter; only asked where it is not stable with it.
    pub stable_without: Option<bool>,
}

impl InputFilterResult {
    /// The least of the three margins.
    pub fn least_margin(&self) -> &ImpedanceMargin {
        let [open, nulled, closed] = &self.margins;
        let first = if nulled.margin_db < open.margin_db { nulled } else { open };
        if closed.margin_db < first.margin_db { closed } else { first }
    }

    /// The least of the margins against ZD and ZN: Middlebrook's criterion for a loop gain the filter leaves alone.
    pub fn criterion(&self) -> &ImpedanceMargin {
        let [open, nulled, _] = &self.margins;
        if nulled.margin_db < open.margin_db { nulled } else { open }
    }
}

/// Impedances at the stage's input terminals over the curves' frequencies: magnitude [Ω] and phase [°].
#[derive(Clone, Debug, Default, PartialEq)]
pub struct ImpedanceCurves {
    /// Output impedance Zo of source and filter [Ω].
    pub filter_ohm: Vec<f64>,
    /// Its phase [°].
    pub filter_deg: Vec<f64>,
    /// Open-loop input impedance ZD [Ω].
    pub open_loop_ohm: Vec<f64>,
    /// Its phase [°].
    pub open_loop_deg: Vec<f64>,
    /// Input impedance with the output nulled, ZN [Ω].
    pub nulled_ohm: Vec<f64>,
    /// Its phase [°].
    pub nulled_deg: Vec<f64>,
    /// Closed-loop input impedance Zi [Ω].
    pub closed_loop_ohm: Vec<f64>,
    /// Its phase [°].
    pub closed_loop_deg: Vec<f64>,
}

/// The input filter of the condition shown in full.
#[derive(Clone, Debug, PartialEq)]
pub struct InputFilterDetail {
    /// Margins and changes.
    pub result: InputFilterResult,
    /// Curves on the requested grid.
    pub curves: ImpedanceCurves,
    /// Optimum damping that keeps the filter's peak 6 dB below the least input impedance of this condition.
    pub damping: OptimumDamping,
}
