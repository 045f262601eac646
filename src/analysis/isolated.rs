//! Isolated feedback at one condition: its operating point, and the loop at the ends of the transfer ratio.
//!
//! *Conventions.* All curves are those of the nominal transfer ratio. Both paths of the feedback go through the optocoupler, so the loop gain
//! at another ratio is the nominal one times their quotient; stability there is decided by its own closed-loop poles.

use super::loop_model::{LoopModel, Shared};
use super::result::ConditionSummary;
use crate::compensator::{Bias, LedSupply};
use crate::control::CONTROL;
use crate::converter::StageCondition;
use crate::design::CheckedDesign;
use crate::linear::{FactoredResponse, LinearError, Margins, StateSpace, Verdict, margins};
use crate::quantity::{Unit, print, print_digits};

/// The loop at one end of the transfer ratio.
#[derive(Clone, Debug)]
pub struct AtRatio {
    /// The transfer ratio.
    pub ratio: f64,
    /// Stability, by closed-loop poles and encirclements.
    pub verdict: Verdict,
    /// Crossovers and margins.
    pub margins: Margins,
}

impl AtRatio {
    /// True when the closed loop is stable.
    pub fn stable(&self) -> bool {
        matches!(self.verdict, Verdict::Stable { .. })
    }

    /// Headline crossover [Hz] and phase margin [°].
    pub fn headline(&self) -> Option<(f64, f64)> {
        self.margins.headline_crossover().map(|crossover| (crossover.frequency_hz, crossover.phase_margin_deg))
    }
}

/// Isolated feedback at one condition.
#[derive(Clone, Debug)]
pub struct IsolatedFigures {
    /// LED and regulator at the nominal transfer ratio.
    pub bias: Bias,
    /// Voltage that feeds the LED [V].
    pub feed: f64,
    /// Least control voltage at the least transfer ratio, and greatest one at the greatest [V].
    pub control_limits: (f64, f64),
    /// Error of the output by the regulator's finite gain, that of a cathode at 0 V taken as none [V].
    pub output_error: f64,
    /// The loop at the least and at the greatest transfer ratio.
    pub ends: [AtRatio; 2],
    /// Crossover that the fast path alone would make [Hz]: gain and zero lanes cannot bring the loop's below it. None without a fast
    /// path, where it makes none, and where it reads another voltage than the slow one: there the two may take from one another.
    pub floor_crossover_hz: Option<f64>,
}

impl ConditionSummary {
    /// What a condition comes to beside its headline, in lines: crossover and phase margin at the ends of a transfer ratio.
    pub fn beside(&self) -> Vec<String> {
        let end = |at: &AtRatio| {
            let ratio = print(at.ratio, Unit::Fraction);
            match at.headline() {
                _ if !at.stable() => format!("not stable at a transfer ratio of {ratio}"),
                Some((hz, deg)) => format!(
                    "{}, {} at a transfer ratio of {ratio}",
                    print_digits(hz, Unit::Hertz, 3),
                    print_digits(deg, Unit::Degree, 3)
                ),
                None => format!("no crossover at a transfer ratio of {ratio}"),
            }
        };
        self.isolated.iter().flat_map(|figures| &figures.ends).map(end).collect()
    }
}

/// Works isolated feedback out at a condition; none where the feedback is not isolated.
///
/// # Errors
/// As the joining of systems.
pub(super) fn isolated_figures(
    design: &CheckedDesign,
    shared: &Shared,
    model: &LoopModel,
    condition: &StageCondition,
    (from_hz, to_hz): (f64, f64),
) -> Result<Option<IsolatedFigures>, LinearError> {
    let compensator = &design.compensator;
    let Some(regulator) = compensator.isolated() else { return Ok(None) };
    let feed = match regulator.led_supply {
        LedSupply::Load => design.stage.load_voltage(condition),
        LedSupply::Bank => design.stage.bank_voltage(condition),
        LedSupply::Fixed(volts) => volts,
    };
    let [least, nominal, greatest] = regulator.ratios;
    let control_voltage = model.controlled.control_voltage;
    let Some(bias) = compensator.bias(control_voltage, feed, nominal) else { return Ok(None) };
    let limits = |ratio| compensator.control_limits_at(feed, ratio).unwrap_or((0.0, regulator.supply));
    let at = |ratio: f64| -> Result<AtRatio, LinearError> {
        let share = ratio / nominal;
        let gain = FactoredResponse::new(model.loop_gain.zpk().scaled(share), model.controlled.delay_s);
        let mut found = margins(&gain, from_hz, to_hz);
        found.modulus_margin = found.modulus_margin.min(1.0);
        let verdict = model.stability_with(shared, &scaled(&shared.compensator, share), &gain, &found)?;
        Ok(AtRatio { ratio, verdict, margins: found })
    };
    let floor_crossover_hz = match &shared.fast_path {
        Some(path) if !path.apart => {
            let alone = model.open_loop(path.signal, CONTROL)?.multiply(path.paths[1].zpk());
            let found = margins(&FactoredResponse::new(alone, model.controlled.delay_s), from_hz, to_hz);
            found.crossovers.iter().map(|crossover| crossover.frequency_hz).max_by(f64::total_cmp)
        }
        _ => None,
    };
    let divided = compensator.dc_output_voltage() / compensator.reference;
    Ok(Some(IsolatedFigures {
        bias,
        feed,
        control_limits: (limits(least).0, limits(greatest).1),
        output_error: -bias.cathode_voltage / regulator.dc_gain * divided,
        ends: [at(least)?, at(greatest)?],
        floor_crossover_hz,
    }))
}

/// A compensator whose control voltage answers this many times as strongly.
fn scaled(compensator: &StateSpace, share: f64) -> StateSpace {
    let mut scaled = compensator.clone();
    // The first output is the control voltage.
    scaled.c.row_mut(0).scale_mut(share);
    scaled.d.row_mut(0).scale_mut(share);
    scaled
}
