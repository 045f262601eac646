//! Parts from poles and zeros: exactly where the network allows, else the nearest and why.
//!
//! *Conventions.* The anchor resistor and the locked parts are kept, bit for bit. Around an op amp the upper divider resistor
//! follows when r2 is the anchor, and the lower one follows it, so the DC output voltage stays. Behind a transconductance
//! amplifier the divider always stays: its ratio is all that the gain sees.
//!
//! *Source.* The formulas of `lanes.rs`, solved for the parts. With f the gain lane, z and p the lanes of a branch:
//! C1 + C2 = 1/(2π·f·Rupper) or gm·H/(2π·f), C2/(C1 + C2) = z1/p1, R2 = 1/(2π·z1·C1); around an op amp R3 = Rupper·z2/(p2 − z2);
//! behind a transconductance amplifier R3 = (Rupper − k·(Rupper || Rlower))/(k − 1) with k = p2/z2, so k stays below 1 + Rupper/Rlower.

use std::collections::BTreeSet;
use std::f64::consts::TAU;

use super::fit::{Fit, fit};
use super::lanes::{Corner, Corners};
use super::network::{Amplifier, Anchor, Compensator, Kind, Part, Parts};
use crate::quantity::{Unit, print, print_digits};

/// A pole stays this far above the zero of its branch: nearer, parts run off to extremes for no effect on the response.
pub const LEAST_RATIO: f64 = 1.01;
/// Behind a transconductance amplifier r3 keeps at least this fraction of (Rupper || Rlower) when a lane is pushed to the limit of
/// the divider, so that a resistor remains to be fitted.
const LEAST_R3: f64 = 0.01;
/// Relative change of a part below which it counts as kept; far above rounding, far below any tolerance.
const KEPT: f64 = 1e-11;
/// Relative distance of a lane from its aim that is worth a word: one hundred-thousandth, invisible on any axis.
const REACHED: f64 = 1e-5;
/// Halvings in the search for the last place within reach; 60 exhaust the bits of a frequency.
const HALVINGS: usize = 60;

/// The result of moving one lane.
#[derive(Clone, Debug, PartialEq)]
pub struct Placed {
    /// The compensator with its new parts.
    pub compensator: Compensator,
    /// Where the parts put the lane [Hz].
    pub as_built_hz: f64,
    /// Why the lane is not where it was asked to be, or what else had to move; absent when all went exactly.
    pub why: Option<String>,
}

/// Aim and as-built place of one lane.
#[derive(Clone, Debug, PartialEq)]
pub struct Built {
    /// The lane.
    pub key: &'static str,
    /// Where it was asked to be [Hz].
    pub aim_hz: f64,
    /// Where the parts put it, amplifier ideal [Hz].
    pub as_built_hz: f64,
}

/// The result of placing several lanes at once.
#[derive(Clone, Debug, PartialEq)]
pub struct Placement {
    /// The compensator with its new parts.
    pub compensator: Compensator,
    /// Every lane of the network with its aim.
    pub lanes: Vec<Built>,
    /// Why lanes are not where they were asked to be; absent when all went exactly.
    pub why: Option<String>,
}

impl Compensator {
    /// Moves one lane, the others staying where they are; finds the nearest parts when it cannot be exact.
    ///
    /// Kept parts come first, then the lane that is moved, then the other lanes.
    pub fn move_lane(&self, key: &str, frequency_hz: f64, locks: &BTreeSet<String>) -> Placed {
        let present = self.corners();
        let Some((corner, from)) = Corner::from_key(key).and_then(|c| Some((c, present.at(c)?))) else {
            let why = format!("A {} network here has no lane \"{key}\".", self.kind.name());
            return Placed { compensator: self.clone(), as_built_hz: f64::NAN, why: Some(why) };
        };
        if !(frequency_hz.is_finite() && frequency_hz > 0.0) {
            let why = "A lane needs a frequency above zero.".to_owned();
            return Placed { compensator: self.clone(), as_built_hz: from, why: Some(why) };
        }
        if let Some(digital) = self.digital() {
            return self.move_digital(&digital, corner, frequency_hz, locks);
        }
        let mut aim = present;
        *aim.slot(corner) = Some(frequency_hz);
        let (parts, why) = self.nearest_parts(&present, &aim, Some(corner), locks);
        let compensator = Compensator { parts, ..self.clone() };
        let built = compensator.corners();
        let as_built_hz = built.at(corner).unwrap_or(from);
        let why = join(why, compensator.strayed(&aim, &built));
        Placed { compensator, as_built_hz, why }
    }

    /// Multiplies the gain at every frequency by `factor`, poles and zeros staying.
    pub fn with_gain(&self, factor: f64, locks: &BTreeSet<String>) -> Placed {
        self.move_lane("gain", self.corners().gain.unwrap_or(f64::NAN) * factor, locks)
    }

    /// Places every lane that `aims` names, the others staying where they are.
    pub fn place(&self, aims: &Corners, locks: &BTreeSet<String>) -> Placement {
        if let Some(digital) = self.digital() {
            return self.place_digital(&digital, aims, locks);
        }
        let present = self.corners();
        let mut aim = present;
        for corner in Corner::ALL {
            if let (Some(wanted), Some(_)) = (aims.at(corner), present.at(corner))
                && wanted.is_finite()
                && wanted > 0.0
            {
                *aim.slot(corner) = Some(wanted);
            }
        }
        let (reachable, order) = self.in_order(&aim);
        // A capacitor straight across the upper resistor has one place for both its lanes: the one that is asked for decides.
        let asked = (aims.zero_2.is_none() && aims.pole_2.is_some()).then_some(Corner::Pole2);
        let (parts, limit) = self.nearest_parts(&present, &reachable, asked, locks);
        let compensator = Compensator { parts, ..self.clone() };
        let built = compensator.corners();
        let why = join(join(order, limit), compensator.strayed(&aim, &built));
        let lanes = Corner::ALL
            .into_iter()
            .filter_map(|c| Some(Built { key: c.key(), aim_hz: aim.at(c)?, as_built_hz: built.at(c)? }))
            .collect();
        Placement { compensator, lanes, why }
    }

    /// Parts that come as near to `aim` as the network, the bounds of its parts and the kept parts let them, and why not nearer.
    fn nearest_parts(
        &self,
        present: &Corners,
        aim: &Corners,
        moved: Option<Corner>,
        locks: &BTreeSet<String>,
    ) -> (Parts, Option<String>) {
        let kept = self.kept(locks);
        let changes_kept = |parts: &Parts| kept.iter().any(|&p| changed(self.parts.get(p), parts.get(p)));
        match self.exact_parts(aim, moved) {
            Ok(parts) if !changes_kept(&parts) => (self.settled(parts), None),
            Ok(_) => {
                let why = join(Some(keeps(&kept)), self.floor_of_kept(&kept));
                (fit(&Fit { start: self, aim, moved, kept: &kept }), why)
            }
            Err(limit) => {
                // The last reachable place on the straight way, in log frequency, from where the lanes are.
                let (mut reached, mut beyond) = (0.0, 1.0);
                let mut best = None;
                for _ in 0..HALVINGS {
                    let middle = 0.5 * (reached + beyond);
                    match self.exact_parts(&between(present, aim, middle), moved) {
                        Ok(parts) => {
                            reached = middle;
                            best = Some(parts);
                        }
                        Err(_) => beyond = middle,
                    }
                }
                match best {
                    Some(parts) if changes_kept(&parts) => {
                        let aim = between(present, aim, reached);
                        let why = format!("{limit} {}", keeps(&kept));
                        (fit(&Fit { start: self, aim: &aim, moved, kept: &kept }), Some(why))
                    }
                    Some(parts) => (self.settled(parts), Some(limit)),
                    None => (self.parts, Some(limit)),
                }
            }
        }
    }

    /// Parts that stay: the locked ones, the anchor, behind a transconductance amplifier the divider, and with isolated feedback all
    /// that holds its operating point.
    fn kept(&self, locks: &BTreeSet<String>) -> Vec<Part> {
        let stays = |part: Part| match self.amplifier {
            Amplifier::OpAmp(_) => part == self.anchor_part(),
            Amplifier::Digital(_) => true,
            Amplifier::Transconductance(_) => part == self.anchor_part() || matches!(part, Part::Upper | Part::Lower),
            Amplifier::ShuntRegulator(regulator) => match part {
                Part::Upper | Part::Lower | Part::PullUp | Part::Bias => true,
                Part::Led => self.kind == Kind::One || (self.has(Part::R2) && regulator.keeps_led_resistor),
                Part::R2 => !regulator.keeps_led_resistor,
                _ => false,
            },
        };
        self.fitted().into_iter().filter(|&part| stays(part) || locks.contains(part.path())).collect()
    }

    fn anchor_part(&self) -> Part {
        match self.anchor {
            Anchor::R2 if self.kind != Kind::One => Part::R2,
            _ => Part::Upper,
        }
    }

    /// Parts that put every lane exactly at `aim`, or the limit that forbids it.
    fn exact_parts(&self, aim: &Corners, moved: Option<Corner>) -> Result<Parts, String> {
        let mut parts = self.parts;
        let gain = aim.gain.unwrap_or(f64::NAN);
        let share = match (aim.zero_1, aim.pole_1) {
            _ if self.isolated().is_some() => None,
            (Some(zero), Some(pole)) if pole < zero * LEAST_RATIO * (1.0 - 1e-12) => return Err(order_limit()),
            (Some(zero), Some(pole)) => Some((zero, zero / pole)),
            _ => None,
        };
        match self.amplifier {
            // A difference equation has lanes in place of parts, and its own way here.
            Amplifier::Digital(_) => {}
            Amplifier::OpAmp(_) => {
                if let (Anchor::R2, Some((zero, share))) = (self.anchor, share) {
                    let total = 1.0 / (TAU * zero * parts.r2) / (1.0 - share);
                    parts.upper = 1.0 / (TAU * gain * total);
                    parts.lower = self.parts.lower * (parts.upper / self.parts.upper);
                }
                let total = 1.0 / (TAU * gain * parts.upper);
                fill_feedback(&mut parts, total, share);
            }
            Amplifier::Transconductance(a) => {
                fill_feedback(&mut parts, a.gm * self.divider_ratio() / (TAU * gain), share);
            }
            Amplifier::ShuntRegulator(regulator) => parts = self.isolated_parts(&regulator, aim)?,
        }
        self.fill_input(&mut parts, aim, moved)?;
        self.within_bounds(&parts)?;
        Ok(parts)
    }

    /// Branch across the upper resistor, or the LED's.
    fn fill_input(&self, parts: &mut Parts, aim: &Corners, moved: Option<Corner>) -> Result<(), String> {
        let (upper, source) = self.across(parts);
        if self.has(Part::Feedforward) {
            parts.feedforward = match (aim.zero_2, aim.pole_2, moved) {
                (_, Some(pole), Some(Corner::Pole2)) => 1.0 / (TAU * pole * source),
                (Some(zero), ..) => 1.0 / (TAU * zero * upper),
                _ => parts.feedforward,
            };
        }
        let (true, Some(zero), Some(pole)) = (self.has(Part::C3), aim.zero_2, aim.pole_2) else { return Ok(()) };
        if pole < zero * LEAST_RATIO * (1.0 - 1e-12) {
            return Err(order_limit());
        }
        let ratio = pole / zero;
        if ratio > self.greatest_ratio_of(parts) * (1.0 + 1e-12) && !self.is_present_ratio(ratio) {
            return Err(self.ratio_limit());
        }
        parts.r3 = (upper - ratio * source) * zero / (pole - zero);
        parts.c3 = 1.0 / (TAU * zero * (upper + parts.r3));
        Ok(())
    }

    /// Whether the second pole and zero already have this ratio: parts entered beyond the limit for moving stay usable.
    fn is_present_ratio(&self, ratio: f64) -> bool {
        let corners = self.corners();
        let (Some(zero), Some(pole)) = (corners.zero_2, corners.pole_2) else { return false };
        (ratio * zero / pole - 1.0).abs() < 1e-9
    }

    /// Greatest ratio of second pole to second zero that moving a lane may reach; infinite around an op amp.
    pub fn greatest_ratio(&self) -> f64 {
        self.greatest_ratio_of(&self.parts)
    }

    /// The same where other lanes are moved, too: an LED resistor that follows them widens or narrows it.
    pub(super) fn greatest_ratio_for(&self, aim: &Corners) -> f64 {
        self.greatest_ratio_of(&self.aimed_parts(aim))
    }

    fn greatest_ratio_of(&self, parts: &Parts) -> f64 {
        let (across, source) = self.across(parts);
        if source > 0.0 { (across + LEAST_R3 * source) / ((1.0 + LEAST_R3) * source) } else { f64::INFINITY }
    }

    /// The aim with each pole brought to where its zero and the divider let it be, and why.
    fn in_order(&self, aim: &Corners) -> (Corners, Option<String>) {
        let (mut aim, mut why) = match self.isolated() {
            Some(regulator) => self.isolated_order(regulator, aim),
            None => (*aim, None),
        };
        if let (Some(zero), Some(pole), None) = (aim.zero_1, aim.pole_1, self.isolated())
            && pole < zero * LEAST_RATIO
        {
            aim.pole_1 = Some(zero * LEAST_RATIO);
            why = Some(order_limit());
        }
        if let (true, Some(zero), Some(pole)) = (self.has(Part::C3), aim.zero_2, aim.pole_2) {
            let most = self.greatest_ratio_for(&aim);
            if pole > zero * most && !self.is_present_ratio(pole / zero) {
                aim.pole_2 = Some(zero * most);
                why = join(why, Some(self.ratio_limit()));
            } else if pole < zero * LEAST_RATIO {
                aim.pole_2 = Some(zero * LEAST_RATIO);
                why = join(why, Some(order_limit()));
            }
        }
        (aim, why)
    }

    /// Checks every part of the network against its row in the table.
    fn within_bounds(&self, parts: &Parts) -> Result<(), String> {
        for part in self.fitted() {
            let entry = part.entry();
            let value = parts.get(part);
            if changed(self.parts.get(part), value)
                && let Err(reason) = entry.check(value)
            {
                return Err(format!("Then {} {reason}.", part.label()));
            }
        }
        Ok(())
    }

    /// New parts, those that only changed by rounding keeping their bits.
    fn settled(&self, mut parts: Parts) -> Parts {
        for part in Part::ALL {
            if !changed(self.parts.get(part), parts.get(part)) {
                parts.set(part, self.parts.get(part));
            }
        }
        parts
    }

    /// Names the lanes that are not at their aim.
    fn strayed(&self, aim: &Corners, built: &Corners) -> Option<String> {
        let strayed: Vec<_> = self
            .lanes()
            .into_iter()
            .filter_map(|lane| {
                let (aim, built) = (aim.get(lane.key)?, built.get(lane.key)?);
                let apart = (built / aim - 1.0).abs();
                (apart > REACHED).then(|| format!("the {} is at {}", lane.name, print(built, Unit::Hertz)))
            })
            .collect();
        (!strayed.is_empty()).then(|| format!("So {}.", strayed.join(", ")))
    }

    /// Why the second pole and zero cannot be further apart.
    fn ratio_limit(&self) -> String {
        let (across, source) = self.across(&self.parts);
        let most = print_digits(across / source, Unit::One, 3);
        let (word, ratio) = if self.isolated().is_some() {
            ("Across the LED resistor", "1 + Rled/(Rd || Rbias)")
        } else {
            ("With a transconductance amplifier", "1 + Rupper/Rlower")
        };
        format!(
            "{word} the second pole is less than {ratio} = {most} times the second zero: beyond, R3 would have to be negative."
        )
    }
}

/// Feedback branch from its total capacitance [F] and, beyond type I, its zero [Hz] and the share of c2.
fn fill_feedback(parts: &mut Parts, total: f64, share: Option<(f64, f64)>) {
    let Some((zero, share)) = share else {
        parts.c1 = total;
        return;
    };
    parts.c2 = total * share;
    parts.c1 = total - parts.c2;
    parts.r2 = 1.0 / (TAU * zero * parts.c1);
}

/// Why a pole cannot go below its zero.
fn order_limit() -> String {
    "A pole of this network stays above the zero of its branch: below, a part would have to be negative.".to_owned()
}

/// Which parts are kept.
fn keeps(kept: &[Part]) -> String {
    let names: Vec<_> = kept.iter().map(|part| part.label()).collect();
    format!("Kept: {}.", names.join(", "))
}

/// Joins two reasons.
pub(super) fn join(first: Option<String>, second: Option<String>) -> Option<String> {
    match (first, second) {
        (Some(first), Some(second)) => Some(format!("{first} {second}")),
        (first, second) => first.or(second),
    }
}

/// Whether a part changed by more than rounding.
fn changed(before: f64, after: f64) -> bool {
    let apart = (after / before - 1.0).abs();
    apart > KEPT || apart.is_nan()
}

/// Corners at a fraction of the way, in log frequency; a lane that does not move keeps its bits.
fn between(from: &Corners, to: &Corners, fraction: f64) -> Corners {
    let mut corners = *from;
    for corner in Corner::ALL {
        if let (Some(a), Some(b)) = (from.at(corner), to.at(corner))
            && changed(a, b)
        {
            *corners.slot(corner) = Some(a * (b / a).powf(fraction));
        }
    }
    corners
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;
    use crate::compensator::network::{OpAmp, Transconductance};

    const OP_AMP: Amplifier =
        Amplifier::OpAmp(OpAmp { dc_gain: 1e4, gain_bandwidth_hz: 1e7, output_least: 0.0, output_greatest: 5.0 });
    const TRANSCONDUCTANCE: Amplifier = Amplifier::Transconductance(Transconductance {
        gm: 1e-3,
        output_resistance: 1e6,
        output_current: 1e-4,
        output_least: 0.0,
        output_greatest: 5.0,
    });

    fn compensator(kind: Kind, amplifier: Amplifier, anchor: Anchor) -> Compensator {
        let parts = Parts {
            upper: 18.2e3,
            lower: 2e3,
            r2: 10e3,
            c1: 22e-9,
            c2: 470e-12,
            r3: 470.0,
            c3: 4.7e-9,
            feedforward: 330e-12,
            led: 1.5e3,
            bias: 1e3,
            pull_up: 4.7e3,
        };
        Compensator { kind, amplifier, anchor, has_feedforward: false, parts, reference: 2.5 }
    }

    fn unlocked() -> BTreeSet<String> {
        BTreeSet::new()
    }

    /// Any network, its parts over several decades, and whether a straight capacitor is fitted.
    fn any_network() -> impl Strategy<Value = Compensator> {
        let decades = (-1.0..1.0, -1.0..1.0, -1.0..1.0, -1.0..1.0, -1.0..1.0, -1.0..1.0, -1.0..1.0);
        (0usize..3, any::<bool>(), any::<bool>(), any::<bool>(), decades).prop_map(
            |(kind, op_amp, upper, has_feedforward, d)| {
                let kind = [Kind::One, Kind::Two, Kind::Three][kind];
                let anchor = if upper { Anchor::Upper } else { Anchor::R2 };
                let mut network = compensator(kind, if op_amp { OP_AMP } else { TRANSCONDUCTANCE }, anchor);
                network.has_feedforward = has_feedforward && kind != Kind::Three;
                for (part, decade) in [Part::Upper, Part::Lower, Part::R2, Part::C1, Part::C2, Part::R3, Part::C3]
                    .into_iter()
                    .zip([d.0, d.1, d.2, d.3, d.4, d.5, d.6])
                {
                    network.parts.set(part, network.parts.get(part) * 10f64.powf(decade));
                }
                network
            },
        )
    }

    fn same(one: &Parts, other: &Parts, part: Part) -> bool {
        one.get(part).to_bits() == other.get(part).to_bits()
    }

    fn assert_near(actual: f64, wanted: f64, what: &str) {
        assert!((actual / wanted - 1.0).abs() < 1e-9, "{what}: {actual} for {wanted}");
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, ..ProptestConfig::default() })]

        /// The lanes of any network, asked of the same network with other parts, give back the parts.
        #[test]
        fn parts_to_lanes_to_parts(network in any_network(), scale in 0.1f64..10.0) {
            let lanes = network.corners();
            let ratio = |zero: Option<f64>, pole: Option<f64>| Some(pole? / zero?);
            prop_assume!(ratio(lanes.zero_1, lanes.pole_1).is_none_or(|ratio| ratio >= LEAST_RATIO));
            let second = ratio(lanes.zero_2, lanes.pole_2);
            prop_assume!(second.is_none_or(|ratio| ratio >= LEAST_RATIO));
            prop_assume!(network.kind != Kind::Three || second.is_none_or(|ratio| ratio <= network.greatest_ratio()));
            let mut other = network.clone();
            for part in [Part::C1, Part::C2, Part::R3, Part::C3, Part::Feedforward] {
                other.parts.set(part, network.parts.get(part) * scale);
            }
            let exact = other.exact_parts(&lanes, None).unwrap();
            for part in network.fitted() {
                assert_near(exact.get(part), network.parts.get(part), part.label());
            }
        }

        /// Any lane moved anywhere: it arrives, or says why not; the anchor, the output voltage and every bound hold.
        #[test]
        fn a_moved_lane_arrives_or_says_why(
            network in any_network(), lane in 0usize..5, decades in -4.0f64..4.0, locked in 0usize..12,
        ) {
            let Some(lane) = network.lanes().get(lane).cloned() else { return Ok(()) };
            let locks: BTreeSet<_> = Part::ALL.get(locked).map(|part| part.path().to_owned()).into_iter().collect();
            let aim = lane.frequency_hz * 10f64.powf(decades);
            let placed = network.move_lane(lane.key, aim, &locks);
            prop_assert!((placed.as_built_hz / aim - 1.0).abs() < 1e-5 || placed.why.is_some());
            let built = &placed.compensator;
            assert_near(built.dc_output_voltage(), network.dc_output_voltage(), "output voltage");
            for part in network.fitted() {
                prop_assert!(same(&built.parts, &network.parts, part) || part.entry().check(built.parts.get(part)).is_ok());
                prop_assert!(!locks.contains(part.path()) || same(&built.parts, &network.parts, part));
            }
            let anchor = if network.anchor == Anchor::R2 && network.kind != Kind::One { Part::R2 } else { Part::Upper };
            prop_assert!(same(&built.parts, &network.parts, anchor));
        }
    }

    #[test]
    fn a_double_zero_stays_two_lanes() {
        for amplifier in [OP_AMP, TRANSCONDUCTANCE] {
            let network = compensator(Kind::Three, amplifier, Anchor::Upper);
            let aims = Corners {
                gain: Some(400.0),
                zero_1: Some(1e3),
                zero_2: Some(1e3),
                pole_1: Some(4e3),
                pole_2: Some(4e3),
            };
            let placement = network.place(&aims, &unlocked());
            assert_eq!(placement.why, None);
            for lane in &placement.lanes {
                assert_near(lane.as_built_hz, lane.aim_hz, lane.key);
            }
            let again = placement.compensator.place(&aims, &unlocked());
            assert_eq!(again.compensator, placement.compensator);
        }
    }

    #[test]
    fn the_divider_limits_the_second_pole_of_a_transconductance_amplifier() {
        let network = compensator(Kind::Three, TRANSCONDUCTANCE, Anchor::Upper);
        let placed = network.move_lane("pole-2", 1e9, &unlocked());
        let corners = placed.compensator.corners();
        assert_near(corners.zero_2.unwrap(), network.corners().zero_2.unwrap(), "zero-2 stays");
        assert_near(corners.pole_2.unwrap() / corners.zero_2.unwrap(), network.greatest_ratio(), "ratio");
        assert!(network.greatest_ratio() < 1.0 + network.parts.upper / network.parts.lower);
        assert!(placed.why.unwrap().contains("1 + Rupper/Rlower"));
    }

    #[test]
    fn a_pole_stops_above_its_zero() {
        let network = compensator(Kind::Two, OP_AMP, Anchor::R2);
        let zero = network.corners().zero_1.unwrap();
        let placed = network.move_lane("pole-1", zero / 3.0, &unlocked());
        assert_near(placed.as_built_hz, zero * LEAST_RATIO, "pole");
        assert!(placed.why.is_some());
    }

    #[test]
    fn r2_as_anchor_of_a_transconductance_amplifier_lets_the_gain_follow_the_zero() {
        let network = compensator(Kind::Two, TRANSCONDUCTANCE, Anchor::R2);
        let aim = network.corners().zero_1.unwrap() * 2.0;
        let placed = network.move_lane("zero-1", aim, &unlocked());
        assert_near(placed.as_built_hz, aim, "zero");
        assert_eq!(placed.compensator.parts.r2.to_bits(), network.parts.r2.to_bits());
        assert!(placed.why.unwrap().contains("integrator gain"));
    }

    #[test]
    fn beside_a_locked_part_the_moved_lane_comes_first() {
        let network = compensator(Kind::Three, OP_AMP, Anchor::Upper);
        let locks: BTreeSet<_> = [Part::C1.path().to_owned()].into();
        let aim = network.corners().zero_1.unwrap() * 3.0;
        let placed = network.move_lane("zero-1", aim, &locks);
        assert_near(placed.as_built_hz, aim, "zero");
        assert!(same(&placed.compensator.parts, &network.parts, Part::C1));
        let (before, after) = (network.corners(), placed.compensator.corners());
        assert_near(after.zero_2.unwrap(), before.zero_2.unwrap(), "the other branch stays");
        assert!((after.pole_1.unwrap() / before.pole_1.unwrap()).ln().abs() < 0.1);
        assert!(placed.why.unwrap().contains("C1"));
    }

    #[test]
    fn gain_moves_without_poles_and_zeros() {
        for (amplifier, anchor) in [(OP_AMP, Anchor::Upper), (OP_AMP, Anchor::R2), (TRANSCONDUCTANCE, Anchor::Upper)] {
            let network = compensator(Kind::Three, amplifier, anchor);
            let placed = network.with_gain(2.0, &unlocked());
            assert_eq!(placed.why, None);
            for frequency in [1.0, 1e3, 1e6] {
                let (before, after) = (network.ideal().at_hz(frequency), placed.compensator.ideal().at_hz(frequency));
                assert!((after / before - 2.0).norm() < 1e-9);
            }
            assert_near(placed.compensator.dc_output_voltage(), network.dc_output_voltage(), "output voltage");
        }
    }

    #[test]
    fn one_capacitor_behind_a_divider_moves_both_its_lanes() {
        let mut network = compensator(Kind::Two, TRANSCONDUCTANCE, Anchor::Upper);
        network.has_feedforward = true;
        let aim = network.corners().pole_2.unwrap() * 3.0;
        let placed = network.move_lane("pole-2", aim, &unlocked());
        assert_near(placed.as_built_hz, aim, "pole");
        assert!(placed.why.unwrap().contains("second zero"));
        let aims = Corners { pole_2: Some(aim), ..Corners::default() };
        assert_near(network.place(&aims, &unlocked()).compensator.corners().pole_2.unwrap(), aim, "placed pole");
    }

    #[test]
    fn a_lane_the_network_lacks_and_a_frequency_below_zero_change_nothing() {
        let network = compensator(Kind::Two, OP_AMP, Anchor::Upper);
        for (key, frequency) in [("zero-2", 1e3), ("nonsense", 1e3), ("zero-1", -1.0), ("gain", f64::NAN)] {
            let placed = network.move_lane(key, frequency, &unlocked());
            assert_eq!(placed.compensator, network);
            assert!(placed.why.is_some());
        }
    }
}
