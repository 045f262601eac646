//! Input filter against converter: impedances at the stage's input terminals, the margins between them, what the filter does to
//! the loop.
//!
//! *Method*: the stage without its filter, fed by an ideal source at the voltage the filter leaves at its terminals, answers there
//! with three input impedances: ZD with the control voltage at rest, ZN with the control voltage that holds what the feedback reads at
//! rest (the output; with two unlike paths their sum), and
//! Zi with the loop closed, 1/Zi = (1/ZD + T/ZN)/(1 + T). With the filter's output impedance Zo the loop gain is
//! T·(1 + Zo/ZN)/(1 + Zo/ZD): it stays what it was where |Zo| is far below |ZN| and |ZD|, and the loop stays stable where |Zo| is
//! below |Zi| throughout (sufficient, not necessary).
//! *Conventions*: "without filter" and "with filter" loop gains are both derived from their netlists, not by that formula. Line
//! feed-forward senses the source, so it is no part of the input impedances. Searched from fs·1e-5 to fs/2.
//! *Source*: Middlebrook, IEEE Industry Applications Society Annual Meeting 1976, 366; Erickson & Maksimovic, Fundamentals of Power
//! Electronics, 3rd ed., ch. 17 (extra element theorem; from memory).

use super::fast_path::Fed;
use super::filter_result::{Against, ImpedanceCurves, ImpedanceMargin, InputFilterResult, LargestChange};
use super::loop_model::{LoopModel, Shared, model_finding};
use crate::control::CONTROL;
use crate::converter::signals::{INPUT_CURRENT, INPUT_VOLTAGE};
use crate::converter::{Stage, StageCondition};
use crate::finding::Finding;
use crate::linear::{Complex, FactoredResponse, FrequencyResponse, LinearError, StateSpace, Verdict, Zpk, margins};

/// Points of the search grid, beside the resonances.
const SEARCH_POINTS: usize = 160;
/// The search starts at this share of the switching frequency …
const SEARCH_FROM: f64 = 1e-5;
/// … and ends at this one.
const SEARCH_TO: f64 = 0.5;
/// Steps that narrow an extremum between grid points: the bracket shrinks by 0.62 each.
const NARROWINGS: usize = 24;

/// Filter and converter at one condition.
pub(super) struct Interface {
    /// The loop of the stage without its filter.
    pub(super) without: LoopModel,
    shared: Shared,
    /// Output impedance of source and filter [Ω].
    filter: FactoredResponse,
    current_from_input: FactoredResponse,
    current_from_control: FactoredResponse,
    /// What the feedback reads.
    fed_from_input: Fed,
    fed_from_control: Fed,
}

/// The impedances at one frequency [Ω].
struct Impedances {
    filter: Complex,
    open: Complex,
    nulled: Complex,
    closed: Complex,
}

impl Interface {
    /// The interface at a condition of a stage with an input filter; `input_current` is the source's [A]. None without a filter.
    ///
    /// # Errors
    /// A finding when the stage without its filter has no model there.
    pub(super) fn new(
        stage: &Stage,
        shared: &Shared,
        condition: &StageCondition,
        input_current: f64,
    ) -> Result<Option<Self>, Finding> {
        let (Some(bare), Some(network)) = (stage.without_input_filter(), stage.input_network_impedance()) else {
            return Ok(None);
        };
        let resistance = network.dc_gain(0, 0).unwrap_or(0.0);
        let terminals =
            StageCondition { input_voltage: condition.input_voltage - resistance * input_current, ..*condition };
        let shared = shared.with_law(shared.law.without_feedforward(condition.input_voltage));
        let without = LoopModel::new(bare, &shared, &terminals)?;
        let entry = |system: &StateSpace, output: usize, input: usize| {
            Zpk::from_state_space(system, output, input)
                .map(|zpk| FactoredResponse::new(zpk, 0.0))
                .map_err(|e| model_finding(&e))
        };
        let controlled = &without.controlled.stage;
        let row = |name: &str| controlled.need_output(name).map_err(|e| model_finding(&e));
        let current = row(INPUT_CURRENT)?;
        let fed = |input: &str| Fed::new(&without, input).map_err(|e| model_finding(&e));
        Ok(Some(Interface {
            filter: entry(network, 0, 0)?,
            current_from_input: entry(controlled, current, 1)?,
            current_from_control: entry(controlled, current, 0)?,
            fed_from_input: fed(INPUT_VOLTAGE)?,
            fed_from_control: fed(CONTROL)?,
            without,
            shared,
        }))
    }

    /// The impedances at a frequency [Hz]. The delay of the control voltage drops out of ZN and stands in T.
    fn at(&self, f: f64) -> Impedances {
        let direct = self.current_from_input.at_hz(f);
        let holding = self.fed_from_input.at_hz(f) / self.fed_from_control.at_hz(f);
        let nulled = direct - self.current_from_control.at_hz(f) * holding;
        let loop_gain = self.without.loop_gain.at_hz(f);
        let closed = (direct + loop_gain * nulled) / (loop_gain + 1.0);
        Impedances { filter: self.filter.at_hz(f), open: direct.inv(), nulled: nulled.inv(), closed: closed.inv() }
    }

    /// Frequencies of the search, rising [Hz].
    fn grid(&self, with: &LoopModel, fs: f64) -> Vec<f64> {
        let (from, to) = (fs * SEARCH_FROM, fs * SEARCH_TO);
        let mut grid = super::analyse::logarithmic(from, to, SEARCH_POINTS);
        for response in [&self.filter, &self.current_from_input, &self.without.loop_gain, &with.loop_gain] {
            grid.extend(response.breakpoints_hz().into_iter().filter(|f| *f > from && *f < to));
        }
        grid.sort_by(f64::total_cmp);
        grid
    }

    /// Margins and changes at this condition; `with` is the loop with the filter.
    ///
    /// # Errors
    /// As the joining of systems, for the verdict on the loop without filter.
    pub(super) fn study(
        &self,
        stage: &Stage,
        with: &LoopModel,
        unstable: bool,
    ) -> Result<Option<InputFilterResult>, LinearError> {
        let Some(filter) = stage.input_filter else { return Ok(None) };
        let fs = stage.switching_frequency;
        let grid = self.grid(with, fs);
        let (peak_hz, peak) = greatest(&grid, |f| self.filter.at_hz(f).norm());
        let margin = |against: Against, pick: fn(&Impedances) -> Complex| {
            let (frequency_hz, ratio) = greatest(&grid, |f| {
                let z = self.at(f);
                z.filter.norm() / pick(&z).norm()
            });
            let z = self.at(frequency_hz);
            ImpedanceMargin {
                against,
                margin_db: -20.0 * ratio.log10(),
                frequency_hz,
                converter_ohm: pick(&z).norm(),
                filter_ohm: z.filter.norm(),
            }
        };
        let margins_of = [
            margin(Against::OpenLoop, |z| z.open),
            margin(Against::Nulled, |z| z.nulled),
            margin(Against::ClosedLoop, |z| z.closed),
        ];
        let changed = |f: f64| with.loop_gain.at_hz(f) / self.without.loop_gain.at_hz(f);
        let (gain_hz, _) = greatest(&grid, |f| changed(f).norm().ln().abs());
        let (phase_hz, _) = greatest(&grid, |f| changed(f).arg().abs());
        let least = |z: &Impedances| z.open.norm().min(z.nulled.norm()).min(z.closed.norm());
        let (least_hz, _) = greatest(&grid, |f| least(&self.at(f)).recip());
        let least_ohm = least(&self.at(least_hz));
        let stable_without = if unstable {
            let found = margins(&self.without.loop_gain, fs * super::analyse::SEARCH_FROM, fs * SEARCH_TO);
            Some(matches!(self.without.stability(&self.shared, &found)?, Verdict::Stable { .. }))
        } else {
            None
        };
        Ok(Some(InputFilterResult {
            resonance_hz: filter.resonance_hz(),
            characteristic_impedance_ohm: filter.characteristic_impedance(),
            peak_ohm: peak,
            peak_hz,
            least_input_impedance_ohm: least_ohm,
            least_input_impedance_hz: least_hz,
            margins: margins_of,
            gain_change: LargestChange { amount: 20.0 * changed(gain_hz).norm().log10(), frequency_hz: gain_hz },
            phase_change: LargestChange { amount: changed(phase_hz).arg().to_degrees(), frequency_hz: phase_hz },
            stable_without,
        }))
    }

    /// The curves over a grid [Hz].
    pub(super) fn curves(&self, frequencies_hz: &[f64]) -> ImpedanceCurves {
        let mut curves = ImpedanceCurves::default();
        for f in frequencies_hz {
            let z = self.at(*f);
            for ((ohm, deg), value) in [
                (&mut curves.filter_ohm, &mut curves.filter_deg),
                (&mut curves.open_loop_ohm, &mut curves.open_loop_deg),
                (&mut curves.nulled_ohm, &mut curves.nulled_deg),
                (&mut curves.closed_loop_ohm, &mut curves.closed_loop_deg),
            ]
            .into_iter()
            .zip([z.filter, z.open, z.nulled, z.closed])
            {
                ohm.push(value.norm());
                deg.push(value.arg().to_degrees());
            }
        }
        curves
    }
}

/// Where a function of frequency is greatest over a rising grid, narrowed between its neighbours in ln f, and its value there.
fn greatest(grid: &[f64], of: impl Fn(f64) -> f64) -> (f64, f64) {
    let value = |f: f64| Some(of(f)).filter(|v| v.is_finite()).unwrap_or(0.0);
    let best = grid.iter().enumerate().map(|(k, f)| (k, value(*f))).max_by(|a, b| a.1.total_cmp(&b.1));
    let Some((place, at_place)) = best else { return (f64::NAN, f64::NAN) };
    let ln = |k: usize| grid[k.min(grid.len() - 1)].ln();
    let (mut low, mut high) = (ln(place.saturating_sub(1)), ln(place + 1));
    let golden = 0.5 * (5.0_f64.sqrt() - 1.0);
    for _ in 0..NARROWINGS {
        let (first, second) = (high - golden * (high - low), low + golden * (high - low));
        if value(first.exp()) > value(second.exp()) { high = second } else { low = first }
    }
    let found = f64::midpoint(low, high).exp();
    let at_found = value(found);
    if at_found >= at_place { (found, at_found) } else { (grid[place], at_place) }
}
