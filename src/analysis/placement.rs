//! Poles and zeros placed for a wanted crossover: the compensator's placement methods, given what this stage's plant is like.
//!
//! *Conventions.* The K factor takes gain and phase of the plant at the condition that is shown, so the margin asked for is met
//! there. The rules take the landmarks of all nine conditions: the highest resonance, the lowest right-half-plane zero.

use super::analyse::{Request, Shown, analyse};
use super::crossover_window::highest_resonance;
use super::result::{Analysis, Detail};
use crate::compensator::{KFactorGoal, Placement, RuleGoal, RuledPlacement};
use crate::design::{Asked, CheckedDesign, Scope};
use crate::finding::Finding;
use crate::linear::Complex;
use crate::quantity::{Unit, print};
use std::collections::BTreeSet;

/// What a placement is asked for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Goal {
    /// Wanted crossover [Hz].
    pub crossover_hz: f64,
    /// Wanted phase margin [°].
    pub phase_margin_deg: f64,
}

/// Phase margin aimed at where no requirement asks for more [°]; common practice.
const USUAL_MARGIN_DEG: f64 = 60.0;
/// What an aim keeps above a required phase margin, for conditions and parts that differ from the nominal ones [°].
const MARGIN_TO_SPARE_DEG: f64 = 10.0;
/// Switching frequency over the crossover aimed at where no window is known; common practice.
const BELOW_SWITCHING: f64 = 10.0;

/// What to aim at when nobody says: the middle of the crossover window, and the required phase margin with some to spare.
pub fn usual_goal(design: &CheckedDesign, analysis: &Analysis) -> Goal {
    let window = &analysis.window;
    let crossover_hz = match (&window.lower, &window.upper) {
        (Some(low), Some(high)) if window.empty.is_empty() => (low.frequency_hz * high.frequency_hz).sqrt(),
        (_, Some(high)) => high.frequency_hz,
        _ => design.stage.switching_frequency / BELOW_SWITCHING,
    };
    let asked = |scope| design.requirements.get(Asked::PhaseMargin, scope).map(|limit| limit.value);
    let required = [Scope::Worst, Scope::Nominal].into_iter().filter_map(asked).fold(0.0, f64::max);
    Goal {
        crossover_hz: two_digits(crossover_hz),
        phase_margin_deg: USUAL_MARGIN_DEG.max(required + MARGIN_TO_SPARE_DEG),
    }
}

/// An aim nobody stated needs no more than two digits.
fn two_digits(value: f64) -> f64 {
    let unit = 10f64.powf(value.log10().floor() - 1.0);
    let rounded = (value / unit).round() * unit;
    if rounded.is_finite() { rounded } else { value }
}

/// The compensator placed by the K factor, for this crossover and phase margin at the condition `shown`.
///
/// # Errors
/// A finding when the goal is out of reach, the network cannot give the boost, or the condition has no plant.
pub fn place_by_k_factor(
    design: &CheckedDesign,
    locks: &BTreeSet<String>,
    shown: Shown,
    goal: Goal,
) -> Result<Placement, Box<Finding>> {
    let detail = plant_at(design, shown, goal)?.0;
    let goal = KFactorGoal {
        crossover_hz: goal.crossover_hz,
        phase_margin_deg: goal.phase_margin_deg,
        plant_gain_db: first(&detail.curves.plant_db),
        plant_phase_deg: first(&detail.curves.plant_deg),
    };
    design.compensator.by_k_factor_apart(&goal, fast_over_sensed(design, &detail), locks)
}

/// The compensator placed by the plant's landmarks, crossing over at the goal's crossover at the condition `shown`.
///
/// # Errors
/// A finding when the crossover is out of reach or the condition has no plant.
pub fn place_by_rules(
    design: &CheckedDesign,
    locks: &BTreeSet<String>,
    shown: Shown,
    goal: Goal,
) -> Result<RuledPlacement, Box<Finding>> {
    let (detail, analysis) = plant_at(design, shown, goal)?;
    let landmark = |key: &str| detail.landmarks.iter().find(|mark| mark.key == key).map(|mark| mark.frequency_hz);
    let summaries = analysis.conditions.iter().filter_map(|condition| condition.outcome.as_ref().ok());
    let goal = RuleGoal {
        crossover_hz: goal.crossover_hz,
        plant_gain_db: first(&detail.curves.plant_db),
        resonance_hz: landmark("lc-resonance").and(highest_resonance(design, &analysis.conditions).map(|(hz, _)| hz)),
        esr_zero_hz: landmark("esr-zero"),
        right_half_plane_zero_hz: summaries.filter_map(|s| s.right_half_plane_zero_hz).min_by(f64::total_cmp),
        switching_frequency_hz: design.stage.switching_frequency,
    };
    design.compensator.by_rules_apart(&goal, fast_over_sensed(design, &detail), locks)
}

/// The plant to the voltage that a fast path reads over the plant to the regulated one, at the only frequency of a detail: from
/// T = P·(Cs + r·Cf) with the present parts.
fn fast_over_sensed(design: &CheckedDesign, detail: &Detail) -> Complex {
    let curves = &detail.curves;
    let polar = |db: &[f64], deg: &[f64]| Complex::from_polar(10f64.powf(first(db) / 20.0), first(deg).to_radians());
    let feedback = polar(&curves.loop_db, &curves.loop_deg) / polar(&curves.plant_db, &curves.plant_deg);
    match design.compensator.paths_at(first(&curves.frequencies_hz)) {
        Some([slow, fast]) if fast != Complex::ZERO => (feedback - slow) / fast,
        _ => Complex::ONE,
    }
}

/// The plant at the goal's crossover, everything else left out.
fn plant_at(design: &CheckedDesign, shown: Shown, goal: Goal) -> Result<(Box<Detail>, Analysis), Box<Finding>> {
    check(design, goal)?;
    let request =
        Request { shown, frequencies_hz: vec![goal.crossover_hz], band_frequencies_hz: Vec::new(), step_points: 0 };
    let mut analysis = analyse(design, &request);
    let nothing = Finding::problem("", "The condition shown has no results.");
    let detail = std::mem::replace(&mut analysis.shown, Err(nothing)).map_err(Box::new)?;
    Ok((detail, analysis))
}

/// Refuses what no network could do, in words about the goal.
fn check(design: &CheckedDesign, goal: Goal) -> Result<(), Box<Finding>> {
    let half = design.stage.switching_frequency / 2.0;
    if !(goal.crossover_hz > 0.0 && goal.crossover_hz < half) {
        let message = format!(
            "A crossover of {} is not between 0 Hz and half the switching frequency, {}.",
            print(goal.crossover_hz, Unit::Hertz),
            print(half, Unit::Hertz)
        );
        return Err(Box::new(Finding::problem("", message).with_hint("a tenth of the switching frequency is common")));
    }
    if !(goal.phase_margin_deg > 0.0 && goal.phase_margin_deg < 180.0) {
        let message =
            format!("A phase margin of {} is not between 0° and 180°.", print(goal.phase_margin_deg, Unit::Degree));
        return Err(Box::new(Finding::problem("", message).with_hint("45° to 70° is common")));
    }
    Ok(())
}

fn first(values: &[f64]) -> f64 {
    values.first().copied().unwrap_or(f64::NAN)
}

#[cfg(test)]
mod tests {
    use super::super::result::Level;
    use super::*;
    use crate::design::{Design, sample};

    fn goal() -> Goal {
        Goal { crossover_hz: 8e3, phase_margin_deg: 55.0 }
    }

    /// Gain [dB] and phase [°] of the loop at 8 kHz with these parts, from a whole new analysis.
    fn loop_with(design: &Design, placement: &Placement, shown: Shown) -> (f64, f64) {
        let mut design = design.clone();
        placement.compensator.write(&mut design.values);
        let request = Request { shown, frequencies_hz: vec![8e3], band_frequencies_hz: Vec::new(), step_points: 0 };
        let analysis = analyse(&design.check().unwrap(), &request);
        let curves = &analysis.shown.as_ref().unwrap().curves;
        (curves.loop_db[0], curves.loop_deg[0])
    }

    /// The definition of crossover and phase margin: |T| = 1, and 180° plus its phase, at the condition that is shown.
    #[test]
    fn the_k_factor_meets_its_goal_at_the_condition_shown() {
        let design = sample::built_in();
        for shown in [Shown::Levels(Level::Nominal, Level::Nominal), Shown::Levels(Level::Least, Level::Greatest)] {
            let placement = place_by_k_factor(&design.check().unwrap(), &BTreeSet::new(), shown, goal()).unwrap();
            assert_eq!(placement.why, None);
            let (gain_db, phase_deg) = loop_with(&design, &placement, shown);
            assert!(gain_db.abs() < 1e-6, "{gain_db} dB");
            assert!((180.0 + phase_deg - 55.0).abs() < 1e-6, "{phase_deg}°");
        }
    }

    #[test]
    fn the_rules_cross_where_asked_with_the_zeros_on_the_highest_resonance() {
        let design = sample::built_in();
        let shown = Shown::Levels(Level::Nominal, Level::Nominal);
        let checked = design.check().unwrap();
        let ruled = place_by_rules(&checked, &BTreeSet::new(), shown, goal()).unwrap();
        let (gain_db, _) = loop_with(&design, &ruled.placement, shown);
        assert!(gain_db.abs() < 1e-6, "{gain_db} dB");
        // Lossless boost, textbook: (1 − D)/(2π√(LC)) with 1 − D = Vin/Vout; highest at 16 V input. 10 µH, 5 × 33 µF × 0.91.
        let resonance = 16.0 / checked.stage.output_voltage / (std::f64::consts::TAU * (10e-6_f64 * 150.15e-6).sqrt());
        let zero = ruled.placement.compensator.corners().zero_1.unwrap();
        assert!((zero / resonance - 1.0).abs() < 1e-6, "{zero} and {resonance}");
    }

    #[test]
    fn what_cannot_be_says_why() {
        let checked = sample::built_in().check().unwrap();
        let shown = Shown::Levels(Level::Nominal, Level::Nominal);
        for (crossover_hz, phase_margin_deg, word) in
            [(0.0, 50.0, "crossover"), (200e3, 50.0, "switching"), (8e3, -5.0, "phase margin"), (100e3, 150.0, "boost")]
        {
            let goal = Goal { crossover_hz, phase_margin_deg };
            let finding = place_by_k_factor(&checked, &BTreeSet::new(), shown, goal).unwrap_err();
            assert!(finding.message.contains(word), "{}", finding.message);
        }
        let request = Request::spanning(shown, checked.stage.switching_frequency, 10);
        let usual = usual_goal(&checked, &analyse(&checked, &request));
        assert!(usual.crossover_hz > 7e3 && usual.crossover_hz < 11.5e3, "{usual:?}");
        // The sample asks for 55° at the nominal condition.
        assert!((usual.phase_margin_deg - 65.0).abs() < 1e-9);
    }
}
