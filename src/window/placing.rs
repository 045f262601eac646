//! Moving lanes and the crossover, alone or tied, and placing them by a method: each finds parts and is one named step.
//!
//! *Conventions*: moves of one gesture are all reckoned from the design it began with, so a drag there and back changes nothing.
//! Ties belong to the hand, not to the circuit: they are neither saved nor undone.

use super::findings::lower_first;
use super::history::Gesture;
use super::session::Session;
use crate::analysis::{self, Goal};
use crate::compensator::{Compensator, Corners, Lane, LaneKind, Placement};
use crate::design::CheckedDesign;
use crate::finding::Finding;

/// How lanes are moved, and what the last move has to say.
#[derive(Clone, Debug, Default)]
pub(super) struct Hand {
    tied_zeros: bool,
    tied_poles: bool,
    remark: Option<(&'static str, String)>,
    before: Option<(Gesture, Headline)>,
    pub(super) usual_goal: Option<Goal>,
}

/// The numbers a move is judged by; absent where there is no crossover.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Headline {
    /// Headline crossover [Hz] and its phase margin [°].
    pub crossover: Option<(f64, f64)>,
    /// The closed loop is stable.
    pub stable: bool,
}

/// How poles and zeros are placed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Method {
    /// For a phase margin at a crossover.
    KFactor,
    /// On the landmarks of the plant.
    Rules,
}

impl Method {
    /// Name of the undo step.
    fn step(self) -> &'static str {
        match self {
            Method::KFactor => "Place by K factor",
            Method::Rules => "Place by pole-zero rules",
        }
    }
}

impl Session {
    /// Why a lane could not go where it was asked to, or what else had to move.
    pub fn lane_remark(&self, key: &str) -> Option<&str> {
        self.hand.remark.as_ref().filter(|(lane, _)| *lane == key).map(|(_, remark)| remark.as_str())
    }

    /// Whether the lanes of a kind move together.
    pub fn tied(&self, kind: LaneKind) -> bool {
        match kind {
            LaneKind::Gain => false,
            LaneKind::Zero => self.hand.tied_zeros,
            LaneKind::Pole => self.hand.tied_poles,
        }
    }

    /// Ties the lanes of a kind, or lets them go.
    pub fn tie(&mut self, kind: LaneKind, tied: bool) {
        match kind {
            LaneKind::Gain => {}
            LaneKind::Zero => self.hand.tied_zeros = tied,
            LaneKind::Pole => self.hand.tied_poles = tied,
        }
    }

    /// What the shown condition's loop came to before a gesture's first change, once it has made one.
    pub(super) fn headline_before(&self, gesture: Gesture) -> Option<Headline> {
        self.hand.before.filter(|(of, _)| *of == gesture).map(|(_, headline)| headline)
    }

    /// What the shown condition's loop comes to now.
    pub(super) fn headline(&self) -> Headline {
        let detail = self.analysis().and_then(|analysis| analysis.shown.as_ref().ok());
        let crossover = detail.and_then(|detail| detail.loop_gain.margins.headline_crossover());
        Headline {
            crossover: crossover.map(|crossover| (crossover.frequency_hz, crossover.phase_margin_deg)),
            stable: detail.is_some_and(|detail| detail.loop_gain.stable()),
        }
    }

    fn lane(&self, key: &str) -> Option<&Lane> {
        self.lanes().iter().find(|lane| lane.key == key)
    }

    /// Moves a lane, and with it what it is tied to, by finding parts for it, reckoned from where the gesture began.
    pub fn move_lane(&mut self, key: &'static str, frequency_hz: f64, gesture: Gesture) {
        let start = self.design_before(gesture);
        let Ok(compensator) = start.compensator() else { return };
        let moved = self.moved_together(&compensator, key, frequency_hz);
        let locks = start.locks.clone();
        let (compensator, why) = match moved.as_slice() {
            [_] => {
                let placed = compensator.move_lane(key, frequency_hz, &locks);
                (placed.compensator, placed.why)
            }
            several => {
                let mut aims = Corners::default();
                for (key, frequency_hz) in several {
                    aims.set(key, *frequency_hz);
                }
                let placed = compensator.place(&aims, &locks);
                (placed.compensator, placed.why)
            }
        };
        if self.headline_before(gesture).is_none() {
            self.hand.before = Some((gesture, self.headline()));
        }
        let name = match (moved.len(), self.lane(key)) {
            (1, lane) => format!("Move {}", lower_first(lane.map_or(key, |lane| lane.name))),
            (_, Some(Lane { kind: LaneKind::Pole, .. })) => "Move the tied poles".to_owned(),
            _ => "Move the tied zeros".to_owned(),
        };
        self.change(&name, Some(gesture), |document| {
            compensator.write(&mut document.design.values);
            for (key, frequency_hz) in &moved {
                // The frequency comes from an axis or a parsed number, so it is finite.
                let _ = document.design.aims.set(key, *frequency_hz);
            }
        });
        self.hand.remark = why.map(|why| (key, why));
    }

    /// A lane's wanted frequency [Hz], and those of the lanes tied to it: they keep their ratio to it.
    fn moved_together(&self, start: &Compensator, key: &'static str, frequency_hz: f64) -> Vec<(&'static str, f64)> {
        let lanes = start.lanes();
        let Some(lane) = lanes.iter().find(|lane| lane.key == key).filter(|lane| self.tied(lane.kind)) else {
            return vec![(key, frequency_hz)];
        };
        let alike = lanes.iter().filter(|other| other.kind == lane.kind);
        alike.map(|other| (other.key, other.frequency_hz * frequency_hz / lane.frequency_hz)).collect()
    }

    /// Moves the crossover by the gain lane, by as much as the loop gain now differs from one at the wanted frequency [Hz].
    pub fn move_crossover(&mut self, frequency_hz: f64, gesture: Gesture) {
        let Some(Ok(detail)) = self.analysis().map(|analysis| &analysis.shown) else { return };
        let gain = super::axis::interpolate(&self.drawing().log_hz, &detail.curves.loop_db, frequency_hz.log10());
        let lane = self.lanes().iter().find(|lane| lane.kind == LaneKind::Gain);
        if let (Some(gain_db), Some(lane)) = (gain, lane) {
            self.move_lane(lane.key, lane.frequency_hz * 10f64.powf(-gain_db / 20.0), gesture);
        }
    }

    /// Returns a lane to where the pole-zero rules put it. The gain goes to where the loop crosses at `crossover_hz`, the poles
    /// and zeros staying; a pole or zero goes to its place for the crossover the loop has now.
    pub fn return_lane(&mut self, key: &'static str, crossover_hz: f64, gesture: Gesture) {
        let Some(kind) = self.lane(key).map(|lane| lane.kind) else { return };
        if kind == LaneKind::Gain {
            self.hand.remark = None;
            self.move_crossover(crossover_hz, gesture);
            if self.lane_remark(key).is_none() {
                let at = crate::quantity::print_digits(crossover_hz, crate::quantity::Unit::Hertz, 3);
                self.hand.remark = Some((key, format!("For a crossover at {at}, the aim beside the parts.")));
            }
            return;
        }
        let Ok(checked) = self.design().check() else { return };
        let present = self.headline().crossover.map_or(crossover_hz, |(frequency_hz, _)| frequency_hz);
        let goal = Goal { crossover_hz: present, phase_margin_deg: 60.0 };
        match analysis::place_by_rules(&checked, &self.design().locks, self.request().shown, goal) {
            Ok(ruled) => {
                let place = ruled.placement.lanes.iter().find(|lane| lane.key == key).map(|lane| lane.aim_hz);
                let reason = ruled.reasons.iter().find(|reason| reason.lane == key).map(|reason| reason.text);
                if let Some(frequency_hz) = place {
                    self.move_lane(key, frequency_hz, gesture);
                }
                if self.lane_remark(key).is_none()
                    && let Some(reason) = reason
                {
                    self.hand.remark = Some((key, format!("By rule {reason}.")));
                }
            }
            Err(finding) => self.hand.remark = Some((key, finding.message)),
        }
    }

    /// Places all lanes by a method, as one step. Gives back why lanes are not where the method wants them.
    ///
    /// # Errors
    /// Why the goal is out of reach; nothing is changed then.
    pub fn place(&mut self, method: Method, goal: Goal) -> Result<Option<String>, Finding> {
        let checked = self.design().check().map_err(|problems| {
            let first = problems.into_iter().next();
            first.unwrap_or_else(|| Finding::problem("", "The design cannot be used."))
        })?;
        let placement = self.placement(&checked, method, goal).map_err(|finding| *finding)?;
        self.change(method.step(), None, |document| {
            placement.compensator.write(&mut document.design.values);
            for lane in &placement.lanes {
                let _ = document.design.aims.set(lane.key, lane.aim_hz);
            }
        });
        self.hand.remark = None;
        Ok(placement.why)
    }

    fn placement(&self, checked: &CheckedDesign, method: Method, goal: Goal) -> Result<Placement, Box<Finding>> {
        let locks = &self.design().locks;
        match method {
            Method::KFactor => analysis::place_by_k_factor(checked, locks, self.request().shown, goal),
            Method::Rules => {
                analysis::place_by_rules(checked, locks, self.request().shown, goal).map(|ruled| ruled.placement)
            }
        }
    }

    /// What to aim at while nobody says; of the last usable design.
    pub fn usual_goal(&self) -> Option<Goal> {
        self.hand.usual_goal
    }
}
