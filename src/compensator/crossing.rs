//! Makes a compensator cross over where it is wanted: the placement methods carried out on its parts.
//!
//! *Method.* The methods of `method.rs` speak of an ideal amplifier. What the actual amplifier does to gain and phase at the
//! crossover is counted with the plant, and the placement repeated until that no longer changes.

use std::collections::BTreeSet;

use super::lanes::Corners;
use super::method::{
    KFactorGoal, Reason, RuleGoal, RulePlacement, boost_of, k_factor, pole_zero_rules, set_gain, spread_for,
};
use super::network::{Compensator, Kind};
use super::place::{LEAST_RATIO, Placement};
use crate::finding::Finding;
use crate::linear::Complex;

/// Rounds of counting the amplifier with the plant; each shrinks what is left by the amplifier's error, far below 1.
const ROUNDS: usize = 12;
/// Change of gain [dB] and of phase [°] that counts as settled.
const SETTLED: f64 = 1e-9;
/// How near the two pairs of a divider-limited type III may come to the boost of a pair infinitely wide [°].
const GREATEST_PAIR_BOOST_DEG: f64 = 88.0;

/// A compensator placed by the plant's landmarks.
#[derive(Clone, Debug, PartialEq)]
pub struct RuledPlacement {
    /// The compensator, its lanes with aims, and why they are not all met.
    pub placement: Placement,
    /// The reason for each lane's place.
    pub reasons: Vec<Reason>,
}

impl Compensator {
    /// Places poles, zeros and gain by the K factor, the amplifier's own lag included.
    ///
    /// Behind a transconductance amplifier the divider limits the second pair of a type III network; the first pair then gives
    /// what the second cannot.
    ///
    /// # Errors
    /// As [`k_factor`]: this type cannot give the boost, or a number of the goal is unusable.
    pub fn by_k_factor(&self, goal: &KFactorGoal, locks: &BTreeSet<String>) -> Result<Placement, Box<Finding>> {
        self.by_k_factor_apart(goal, Complex::ONE, locks)
    }

    /// The same where the fast path of isolated feedback does not see the sensed voltage: `fast_over_sensed` is the plant to the one
    /// over the plant to the other at the crossover.
    ///
    /// # Errors
    /// As [`Compensator::by_k_factor`].
    pub fn by_k_factor_apart(
        &self,
        goal: &KFactorGoal,
        fast_over_sensed: Complex,
        locks: &BTreeSet<String>,
    ) -> Result<Placement, Box<Finding>> {
        if let Some(digital) = self.digital() {
            return self.digital_by_k_factor(&digital, goal, locks);
        }
        self.settle((goal.crossover_hz, fast_over_sensed), locks, |gain_db, phase_deg| {
            let with_amplifier = KFactorGoal {
                plant_gain_db: goal.plant_gain_db + gain_db,
                plant_phase_deg: goal.plant_phase_deg + phase_deg,
                ..*goal
            };
            let placed = k_factor(self.kind, &with_amplifier)?;
            if self.kind == Kind::Three && placed.pole_over_zero > self.greatest_ratio_for(&placed.corners) {
                let ratio = self.greatest_ratio_for(&placed.corners);
                self.uneven_pairs(&with_amplifier, placed.boost_deg, ratio)
            } else {
                Ok(placed.corners)
            }
        })
    }

    /// Places poles, zeros and gain by the plant's landmarks, the amplifier's error of gain included.
    ///
    /// # Errors
    /// As [`pole_zero_rules`].
    pub fn by_rules(&self, goal: &RuleGoal, locks: &BTreeSet<String>) -> Result<RuledPlacement, Box<Finding>> {
        self.by_rules_apart(goal, Complex::ONE, locks)
    }

    /// The same where the fast path of isolated feedback does not see the sensed voltage, as in [`Compensator::by_k_factor_apart`].
    ///
    /// # Errors
    /// As [`Compensator::by_rules`].
    pub fn by_rules_apart(
        &self,
        goal: &RuleGoal,
        fast_over_sensed: Complex,
        locks: &BTreeSet<String>,
    ) -> Result<RuledPlacement, Box<Finding>> {
        if let Some(digital) = self.digital() {
            return self.digital_by_rules(&digital, goal, locks);
        }
        let RulePlacement { reasons, .. } = pole_zero_rules(self.kind, goal)?;
        let placement = self.settle((goal.crossover_hz, fast_over_sensed), locks, |gain_db, _| {
            let with_amplifier = RuleGoal { plant_gain_db: goal.plant_gain_db + gain_db, ..*goal };
            let mut corners = pole_zero_rules(self.kind, &with_amplifier)?.corners;
            if let (Kind::Three, Some(zero), Some(pole)) = (self.kind, corners.zero_2, corners.pole_2) {
                // What the divider forbids is known beforehand, so the gain allows for it.
                corners.pole_2 = Some(pole.min(zero * self.greatest_ratio_for(&corners)).max(zero * LEAST_RATIO));
                set_gain(&mut corners, goal.crossover_hz, with_amplifier.plant_gain_db);
            }
            Ok(corners)
        })?;
        Ok(RuledPlacement { placement, reasons })
    }

    /// A type III whose second pair is as wide as what it stands across lets it be, the first pair making up the boost.
    fn uneven_pairs(&self, goal: &KFactorGoal, boost_deg: f64, greatest_ratio: f64) -> Result<Corners, Box<Finding>> {
        let ratio = greatest_ratio.max(LEAST_RATIO);
        let rest_deg = boost_deg - boost_of(ratio);
        if rest_deg > GREATEST_PAIR_BOOST_DEG {
            let (what, hint) = if self.isolated().is_some() {
                (
                    "The LED's own resistance",
                    "lower the crossover or the phase margin; a greater LED resistor widens the range",
                )
            } else {
                (
                    "The divider",
                    "lower the crossover or the phase margin; a lower reference voltage or an op amp widens the range",
                )
            };
            let message =
                format!("{what} leaves the second pole and zero too close together for the boost this plant needs");
            return Err(Box::new(Finding::problem("compensator.amplifier", message).with_hint(hint)));
        }
        let (first, second) = (spread_for(rest_deg).max(LEAST_RATIO.sqrt()), ratio.sqrt());
        let mut corners = Corners {
            gain: Some(1.0),
            zero_1: Some(goal.crossover_hz / first),
            pole_1: Some(goal.crossover_hz * first),
            zero_2: Some(goal.crossover_hz / second),
            pole_2: Some(goal.crossover_hz * second),
        };
        set_gain(&mut corners, goal.crossover_hz, goal.plant_gain_db);
        Ok(corners)
    }

    /// Places what `method` asks for, given gain [dB] and phase [°] that the amplifier adds to the plant at the crossover,
    /// until those no longer change.
    pub(super) fn settle(
        &self,
        (crossover_hz, fast_over_sensed): (f64, Complex),
        locks: &BTreeSet<String>,
        method: impl Fn(f64, f64) -> Result<Corners, Box<Finding>>,
    ) -> Result<Placement, Box<Finding>> {
        let (mut gain_db, mut phase_deg) = (0.0, 0.0);
        let mut placement = self.place(&method(gain_db, phase_deg)?, locks);
        for _ in 0..ROUNDS {
            let Some((new_gain_db, new_phase_deg)) =
                placement.compensator.actual_over_ideal(crossover_hz, fast_over_sensed)
            else {
                break;
            };
            let change = (new_gain_db - gain_db).abs().max((new_phase_deg - phase_deg).abs());
            (gain_db, phase_deg) = (new_gain_db, new_phase_deg);
            if change < SETTLED {
                break;
            }
            placement = self.place(&method(gain_db, phase_deg)?, locks);
        }
        Ok(placement)
    }

    /// What the amplifier's limits, and a fast path that sees another voltage, do to the response at a frequency: gain [dB] and phase
    /// [°] against the ideal network.
    fn actual_over_ideal(&self, frequency_hz: f64, fast_over_sensed: Complex) -> Option<(f64, f64)> {
        let [slow, fast] = self.paths_at(frequency_hz)?;
        let difference = (slow + fast * fast_over_sensed) / self.ideal().at_hz(frequency_hz);
        let (gain_db, phase_deg) = (20.0 * difference.norm().log10(), difference.arg().to_degrees());
        (gain_db.is_finite() && phase_deg.is_finite()).then_some((gain_db, phase_deg))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::compensator::network::{Amplifier, Part};
    use crate::quantity::{Choices, Values};

    fn compensator(kind: &str, amplifier: &str) -> Compensator {
        let mut choices = Choices::new();
        choices.set("compensator.type", kind);
        choices.set("compensator.amplifier", amplifier);
        Compensator::from_values(&Values::new(), &choices).unwrap()
    }

    fn goal(plant_phase_deg: f64) -> KFactorGoal {
        KFactorGoal { crossover_hz: 5e3, phase_margin_deg: 55.0, plant_gain_db: -9.2, plant_phase_deg }
    }

    /// Gain [dB] and phase [°] of the loop at the goal's crossover.
    fn loop_at(placement: &Placement, goal: &KFactorGoal) -> (f64, f64) {
        let response = placement.compensator.response().unwrap().at_hz(goal.crossover_hz);
        (20.0 * response.norm().log10() + goal.plant_gain_db, response.arg().to_degrees() + goal.plant_phase_deg)
    }

    #[test]
    fn the_actual_network_crosses_where_asked_with_the_margin_asked() {
        for (kind, phase) in [("2", -95.0), ("3", -150.0)] {
            for amplifier in ["op-amp", "transconductance"] {
                let goal = goal(phase);
                let placement = compensator(kind, amplifier).by_k_factor(&goal, &BTreeSet::new()).unwrap();
                assert_eq!(placement.why, None, "{kind} {amplifier}");
                let (gain_db, phase_deg) = loop_at(&placement, &goal);
                assert!(gain_db.abs() < 1e-6, "{kind} {amplifier}: {gain_db} dB");
                assert!((180.0 + phase_deg - 55.0).abs() < 1e-6, "{kind} {amplifier}: {phase_deg}°");
            }
        }
    }

    #[test]
    fn the_first_pair_makes_up_for_a_divider_that_limits_the_second() {
        let mut network = compensator("3", "transconductance");
        network.parts.set(Part::Lower, network.parts.upper / 2.0);
        let greedy = goal(-195.0);
        let goal = goal(-140.0);
        let placement = network.by_k_factor(&goal, &BTreeSet::new()).unwrap();
        assert_eq!(placement.why, None);
        let (gain_db, phase_deg) = loop_at(&placement, &goal);
        assert!(gain_db.abs() < 1e-6 && (180.0 + phase_deg - 55.0).abs() < 1e-6);
        let corners = placement.compensator.corners();
        assert!(corners.pole_2.unwrap() / corners.zero_2.unwrap() < 3.0);
        // Ask for more than both pairs can give.
        assert_eq!(network.by_k_factor(&greedy, &BTreeSet::new()).unwrap_err().place, "compensator.amplifier");
    }

    #[test]
    fn the_rules_cross_where_asked_with_either_amplifier() {
        let goal = RuleGoal {
            crossover_hz: 4e3,
            plant_gain_db: -3.0,
            resonance_hz: Some(1.2e3),
            esr_zero_hz: Some(353e3),
            right_half_plane_zero_hz: Some(35e3),
            switching_frequency_hz: 300e3,
        };
        for kind in ["1", "2", "3"] {
            for amplifier in ["op-amp", "transconductance"] {
                let RuledPlacement { placement, reasons } =
                    compensator(kind, amplifier).by_rules(&goal, &BTreeSet::new()).unwrap();
                let gain = placement.compensator.response().unwrap().at_hz(goal.crossover_hz).norm();
                assert!((20.0 * gain.log10() + goal.plant_gain_db).abs() < 1e-6, "{kind} {amplifier}: {gain}");
                assert_eq!(reasons.len(), placement.lanes.len());
                let divider = matches!(placement.compensator.amplifier, Amplifier::Transconductance(_));
                assert!(placement.why.is_none() || divider);
            }
        }
    }
}
