//! Placement methods for a difference equation, whose poles stay below half the sampling frequency and need not pair with its zeros.
//!
//! *Method*: poles as the K factor has them for as many zeros, brought to half the sampling frequency where they would be beyond; a pole without a
//! zero goes there, too. The zeros, all at one frequency, then give what boost is left to give: f = fc / tan(share), the share being the boost and
//! the poles' lag over the number of zeros.

use std::collections::BTreeSet;

use super::crossing::RuledPlacement;
use super::difference::Method;
use super::digital::Digital;
use super::lanes::Corners;
use super::method::{KFactorGoal, RuleGoal, RulePlacement, check_goal, pole_zero_rules, set_gain, spread_for};
use super::network::{Amplifier, Compensator, Kind};
use super::place::Placement;
use crate::finding::Finding;
use crate::linear::Complex;
use crate::quantity::{Unit, print};

/// Most that one zero is asked for [°]: beyond, it would be far below the crossover for nothing.
const GREATEST_SHARE_DEG: f64 = 88.0;
/// Least that one zero gives [°]; a plant with phase to spare gets more margin than asked.
const LEAST_SHARE_DEG: f64 = 2.0;

impl Compensator {
    /// The difference equation placed by the K factor.
    ///
    /// # Errors
    /// When its zeros cannot give the boost, or a number of the goal is unusable.
    pub(super) fn digital_by_k_factor(
        &self,
        digital: &Digital,
        goal: &KFactorGoal,
        locks: &BTreeSet<String>,
    ) -> Result<Placement, Box<Finding>> {
        let exact = self.exact_at(digital, goal.crossover_hz);
        exact.settle((goal.crossover_hz, Complex::ONE), locks, |gain_db, phase_deg| {
            let goal = KFactorGoal {
                plant_gain_db: goal.plant_gain_db + gain_db,
                plant_phase_deg: goal.plant_phase_deg + phase_deg,
                ..*goal
            };
            digital.by_boost(&goal)
        })
    }

    /// The difference equation placed by the plant's landmarks.
    ///
    /// # Errors
    /// As [`pole_zero_rules`].
    pub(super) fn digital_by_rules(
        &self,
        digital: &Digital,
        goal: &RuleGoal,
        locks: &BTreeSet<String>,
    ) -> Result<RuledPlacement, Box<Finding>> {
        let (_, mut reasons) = digital.by_landmarks(goal)?;
        let exact = self.exact_at(digital, goal.crossover_hz);
        let placement = exact.settle((goal.crossover_hz, Complex::ONE), locks, |gain_db, _| {
            let goal = RuleGoal { plant_gain_db: goal.plant_gain_db + gain_db, ..*goal };
            digital.by_landmarks(&goal).map(|(corners, _)| corners)
        })?;
        reasons.retain(|reason| digital.aims.get(reason.lane).is_some());
        Ok(RuledPlacement { placement, reasons })
    }

    /// The same equation, exact at the crossover where its method is to be exact somewhere.
    fn exact_at(&self, digital: &Digital, crossover_hz: f64) -> Compensator {
        let mut digital = *digital;
        if let Method::Prewarped(f) = &mut digital.method
            && crossover_hz > 0.0
            && crossover_hz < 0.49 / digital.period_s
        {
            *f = crossover_hz;
        }
        Compensator { amplifier: Amplifier::Digital(digital), ..self.clone() }
    }
}

impl Digital {
    fn by_boost(&self, goal: &KFactorGoal) -> Result<Corners, Box<Finding>> {
        let boost_deg = goal.phase_margin_deg - goal.plant_phase_deg - 90.0;
        check_goal(goal.crossover_hz, goal.plant_gain_db, boost_deg)?;
        let (crossover, half) = (goal.crossover_hz, self.highest_hz());
        let pairs = self.zeros.min(self.order - 1) as f64;
        let lone = self.order - 1 > self.zeros;
        let lag = |pole: f64| (crossover / pole).atan().to_degrees();
        let asked = (boost_deg + if lone { lag(half) } else { 0.0 }) / pairs;
        let paired = (crossover * spread_for(asked.clamp(0.0, GREATEST_SHARE_DEG))).min(half);
        let second = if lone { half } else { paired };
        let mut corners = Corners { gain: Some(1.0), pole_1: Some(paired), ..Corners::default() };
        corners.pole_2 = self.aims.pole_2.map(|_| second);
        let lags: f64 = [corners.pole_1, corners.pole_2].into_iter().flatten().map(lag).sum();
        let share = (boost_deg + lags) / self.zeros as f64;
        if share > GREATEST_SHARE_DEG {
            let message = format!(
                "The plant's phase of {} at the crossover, its delays included, needs a boost of {} for a phase margin of {}; {} below half the sampling frequency cannot give it.",
                print(goal.plant_phase_deg, Unit::Degree),
                print(boost_deg, Unit::Degree),
                print(goal.phase_margin_deg, Unit::Degree),
                if self.zeros == 1 { "one zero, its pole" } else { "two zeros, their poles" },
            );
            let hint = if self.zeros == 1 {
                "choose two zeros; or lower the crossover"
            } else {
                "lower the crossover or the phase margin"
            };
            return Err(Box::new(Finding::problem("compensator.digital.zeros", message).with_hint(hint)));
        }
        let zero = (crossover / share.max(LEAST_SHARE_DEG).to_radians().tan()).min(half);
        corners.zero_1 = Some(zero);
        corners.zero_2 = self.aims.zero_2.map(|_| zero);
        set_gain(&mut corners, crossover, goal.plant_gain_db);
        Ok(corners)
    }

    fn by_landmarks(&self, goal: &RuleGoal) -> Result<(Corners, Vec<super::Reason>), Box<Finding>> {
        let kind = if self.order == 2 && self.zeros == 1 { Kind::Two } else { Kind::Three };
        let RulePlacement { mut corners, mut reasons } = pole_zero_rules(kind, goal)?;
        if kind == Kind::Three && self.order == 2 {
            // The pole that means something stays, not the one against ripple.
            corners.pole_1 = corners.pole_2;
            if let Some(meant) = reasons.iter().find(|reason| reason.lane == "pole-2").copied() {
                reasons.retain(|reason| reason.lane != "pole-1");
                reasons.push(super::Reason { lane: "pole-1", ..meant });
            }
        }
        corners.zero_2 = corners.zero_2.filter(|_| self.aims.zero_2.is_some());
        corners.pole_2 = corners.pole_2.filter(|_| self.aims.pole_2.is_some());
        for lane in [&mut corners.zero_1, &mut corners.zero_2, &mut corners.pole_1, &mut corners.pole_2] {
            *lane = lane.map(|f| f.min(self.highest_hz()));
        }
        set_gain(&mut corners, goal.crossover_hz, goal.plant_gain_db);
        Ok((corners, reasons))
    }
}
