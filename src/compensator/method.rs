//! Where poles and zeros might go for a wanted crossover: the K factor, and common practice by the plant's landmarks.
//!
//! *Conventions.* Frequencies in hertz, gains in dB, phases in degrees. The plant is output voltage from control voltage,
//! modulator included; its phase counts from its own DC phase of 0°, so the integrator's −90° is not in it.
//!
//! *Source.* K factor: Venable, "The K Factor: A New Mathematical Tool for Stability Analysis and Synthesis", 1983. Boost is
//! margin − plant phase − 90°; type II: fz = fc/K, fp = fc·K, K = tan(boost/2 + 45°); type III: double zero and double pole
//! at fc/√k and fc·√k, √k = tan(boost/4 + 45°). Pole-zero rules: common practice, no single source.

use super::lanes::{Corners, ideal_response};
use super::network::Kind;
use super::place::LEAST_RATIO;
use crate::finding::Finding;
use crate::quantity::{Unit, print};

/// Boost this near to what a type could give with zero and pole infinitely apart is refused [°].
const BOOST_RESERVE_DEG: f64 = 2.0;

/// What a placement by the K factor starts from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct KFactorGoal {
    /// Wanted crossover [Hz].
    pub crossover_hz: f64,
    /// Wanted phase margin [°].
    pub phase_margin_deg: f64,
    /// Gain of the plant at the crossover [dB].
    pub plant_gain_db: f64,
    /// Phase of the plant at the crossover [°].
    pub plant_phase_deg: f64,
}

/// What the K factor asks for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct KFactor {
    /// Phase the poles and zeros must add to the integrator's −90° at the crossover [°].
    pub boost_deg: f64,
    /// Pole frequency over zero frequency; 1 for a type I network.
    pub pole_over_zero: f64,
    /// Where the lanes go [Hz].
    pub corners: Corners,
}

/// Poles, zeros and gain by the K factor.
///
/// A plant with phase to spare needs no boost; pole and zero then stand as close as the network lets them and the margin
/// becomes larger than asked.
///
/// # Errors
/// A finding when this type cannot give the boost, or when a number of the goal is unusable.
pub fn k_factor(kind: Kind, goal: &KFactorGoal) -> Result<KFactor, Box<Finding>> {
    let boost_deg = goal.phase_margin_deg - goal.plant_phase_deg - 90.0;
    check_goal(goal.crossover_hz, goal.plant_gain_db, boost_deg)?;
    let (greatest, pairs) = match kind {
        Kind::One => (0.0, 0.0),
        Kind::Two => (90.0 - BOOST_RESERVE_DEG, 1.0),
        Kind::Three => (180.0 - BOOST_RESERVE_DEG, 2.0),
    };
    if boost_deg > greatest {
        return Err(Box::new(beyond(kind, goal, boost_deg)));
    }
    let mut corners = Corners { gain: Some(1.0), ..Corners::default() };
    let mut spread = 1.0;
    if kind != Kind::One {
        spread = spread_for(boost_deg / pairs).max(LEAST_RATIO.sqrt());
        corners.zero_1 = Some(goal.crossover_hz / spread);
        corners.pole_1 = Some(goal.crossover_hz * spread);
    }
    if kind == Kind::Three {
        (corners.zero_2, corners.pole_2) = (corners.zero_1, corners.pole_1);
    }
    set_gain(&mut corners, goal.crossover_hz, goal.plant_gain_db);
    Ok(KFactor { boost_deg, pole_over_zero: spread * spread, corners })
}

/// The finding that a type cannot give the boost.
fn beyond(kind: Kind, goal: &KFactorGoal, boost_deg: f64) -> Finding {
    let (limit, better) = match kind {
        Kind::One => ("none", "type II gives up to 90°, type III up to 180°"),
        Kind::Two => ("less than 90°", "type III gives up to 180°; or lower the crossover or the phase margin"),
        Kind::Three => ("less than 180°", "lower the crossover or the phase margin"),
    };
    let message = format!(
        "The plant's phase of {} at the crossover needs a boost of {} for a phase margin of {}; a {} network gives {limit}",
        print(goal.plant_phase_deg, Unit::Degree),
        print(boost_deg, Unit::Degree),
        print(goal.phase_margin_deg, Unit::Degree),
        kind.name(),
    );
    Finding::problem("compensator.type", message).with_hint(better)
}

/// Crossover over zero, and pole over crossover, of a pair that gives this boost [°] in its middle: tan(boost/2 + 45°).
pub(super) fn spread_for(boost_deg: f64) -> f64 {
    (0.5 * boost_deg + 45.0).to_radians().tan()
}

/// Boost [°] of a pole and a zero whose ratio is `pole_over_zero`, in their middle.
pub(super) fn boost_of(pole_over_zero: f64) -> f64 {
    2.0 * pole_over_zero.sqrt().atan().to_degrees() - 90.0
}

/// What a placement by poles and zeros starts from. A landmark the plant lacks is `None`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RuleGoal {
    /// Wanted crossover [Hz].
    pub crossover_hz: f64,
    /// Gain of the plant at the crossover [dB].
    pub plant_gain_db: f64,
    /// LC resonance, the highest of the conditions [Hz].
    pub resonance_hz: Option<f64>,
    /// ESR zero [Hz].
    pub esr_zero_hz: Option<f64>,
    /// Right-half-plane zero, the lowest of the conditions [Hz].
    pub right_half_plane_zero_hz: Option<f64>,
    /// Switching frequency [Hz].
    pub switching_frequency_hz: f64,
}

/// Where the rules put the lanes, and why.
#[derive(Clone, Debug, PartialEq)]
pub struct RulePlacement {
    /// Where the lanes go [Hz].
    pub corners: Corners,
    /// The reason for each lane's place.
    pub reasons: Vec<Reason>,
}

/// Why a lane stands where it stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Reason {
    /// Key of the lane.
    pub lane: &'static str,
    /// Words that follow the lane's name: "on the LC resonance".
    pub text: &'static str,
}

/// Poles and zeros by common practice: zeros on the LC resonance, one pole on the ESR zero (else on the right-half-plane zero)
/// where that lies above the zeros and below half the switching frequency, the other pole at half the switching frequency, and
/// the gain that makes the loop cross where it is wanted.
///
/// A plant without resonance has its zeros at a fifth of the crossover. In a type II network the single pole goes to half the
/// switching frequency when the plant's zero is below the crossover, because that zero's phase is needed there.
///
/// # Errors
/// A finding when a number of the goal is unusable.
pub fn pole_zero_rules(kind: Kind, goal: &RuleGoal) -> Result<RulePlacement, Box<Finding>> {
    check_goal(goal.crossover_hz, goal.plant_gain_db, 0.0)?;
    let half = 0.5 * goal.switching_frequency_hz;
    if !(half.is_finite() && goal.crossover_hz < half) {
        let message = "The crossover asked for is not below half the switching frequency";
        return Err(Box::new(
            Finding::problem("", message).with_hint("a tenth of the switching frequency is a common aim"),
        ));
    }
    let [(zero, why_zero), (pole, why_pole)] = places(kind, goal, half);
    let mut corners = Corners { gain: Some(1.0), ..Corners::default() };
    let against_ripple = "at half the switching frequency, against ripple";
    let mut reasons = vec![Reason { lane: "gain", text: "makes the loop cross where it is wanted" }];
    let mut give = |pairs: [(&'static str, &'static str); 2]| {
        reasons.extend(pairs.map(|(lane, text)| Reason { lane, text }));
    };
    if kind == Kind::Two {
        (corners.zero_1, corners.pole_1) = (Some(zero), Some(pole));
        give([("zero-1", why_zero), ("pole-1", why_pole)]);
    }
    if kind == Kind::Three {
        (corners.zero_1, corners.pole_1) = (Some(zero), Some(half));
        (corners.zero_2, corners.pole_2) = (Some(zero), Some(pole));
        give([("zero-1", why_zero), ("pole-1", against_ripple)]);
        give([("zero-2", why_zero), ("pole-2", why_pole)]);
    }
    set_gain(&mut corners, goal.crossover_hz, goal.plant_gain_db);
    Ok(RulePlacement { corners, reasons })
}

/// Zero, and the pole that is not at half the switching frequency for ripple's sake: place [Hz] and reason.
fn places(kind: Kind, goal: &RuleGoal, half: f64) -> [(f64, &'static str); 2] {
    let zero = match usable(goal.resonance_hz) {
        // Above half the switching frequency no pole would have room.
        Some(resonance) if resonance * LEAST_RATIO < half => (resonance, "on the LC resonance"),
        _ => (0.2 * goal.crossover_hz, "a fifth of the crossover, as the plant has no resonance to meet"),
    };
    let least_pole = if kind == Kind::Two { goal.crossover_hz } else { zero.0 * LEAST_RATIO };
    let landmark = |frequency: Option<f64>| usable(frequency).filter(|&f| f >= least_pole && f < half);
    let pole = if let Some(esr_zero) = landmark(goal.esr_zero_hz) {
        (esr_zero, "on the ESR zero, which it cancels")
    } else if let Some(rhp_zero) = landmark(goal.right_half_plane_zero_hz) {
        (rhp_zero, "on the right-half-plane zero, whose rise in gain it ends")
    } else {
        (half, "at half the switching frequency, against ripple")
    };
    [zero, pole]
}

/// A landmark that is there and is a frequency.
fn usable(frequency: Option<f64>) -> Option<f64> {
    frequency.filter(|f| f.is_finite() && *f > 0.0)
}

/// Refuses numbers that no placement can work with.
pub(super) fn check_goal(crossover_hz: f64, plant_gain_db: f64, boost_deg: f64) -> Result<(), Box<Finding>> {
    let usable = crossover_hz.is_finite() && crossover_hz > 0.0 && plant_gain_db.abs() < 1e3 && boost_deg.is_finite();
    if usable {
        return Ok(());
    }
    let message = "The crossover asked for, or the plant's response there, is not a usable number";
    Err(Box::new(
        Finding::problem("", message).with_hint("ask for a crossover above 0 Hz, where the plant has a response"),
    ))
}

/// Sets the gain lane so that these poles and zeros give the inverse of the plant's gain at a frequency.
pub(super) fn set_gain(corners: &mut Corners, frequency_hz: f64, plant_gain_db: f64) {
    corners.gain = Some(1.0);
    let at_one = ideal_response(corners).at_hz(frequency_hz).norm();
    corners.gain = Some(10f64.powf(-plant_gain_db / 20.0) / at_one);
}

#[cfg(test)]
mod tests {
    use super::*;

    fn goal(margin_deg: f64, phase_deg: f64) -> KFactorGoal {
        KFactorGoal { crossover_hz: 5e3, phase_margin_deg: margin_deg, plant_gain_db: -9.2, plant_phase_deg: phase_deg }
    }

    /// Lag of the compensator at the crossover [°], the amplifier's own 180° counted.
    fn lag(kind: Kind, spread: f64) -> f64 {
        let pairs = if kind == Kind::Two { 1.0 } else { 2.0 };
        let boost = pairs * boost_of(spread * spread);
        let placed = k_factor(kind, &goal(boost, -90.0)).unwrap();
        assert!((placed.pole_over_zero - spread * spread).abs() < 1e-9 * spread * spread);
        let response = ideal_response(&placed.corners).at_hz(5e3);
        assert!((20.0 * response.norm().log10() - 9.2).abs() < 1e-9);
        180.0 - response.arg().to_degrees()
    }

    /// Lag tables of the K factor: type II 233, 208, 191° at K 2, 4, 10, type III 196, 164, 146, 128° at K 2, 3, 4, 6
    /// (method: Venable 1983; figures quoted, rounded to a degree).
    #[test]
    fn lag_tables() {
        for (spread, table) in [(2.0, 233.0), (4.0, 208.0), (10.0, 191.0)] {
            assert!((lag(Kind::Two, spread) - table).abs() < 0.6);
        }
        // 196° at K = 2 is 196.26°, 164° at K = 3 is 163.74°, 146° at K = 4 is 146.07°, 128° at K = 6 is 127.85°.
        for (spread, table) in [(2.0, 196.0), (3.0, 164.0), (4.0, 146.0), (6.0, 128.0)] {
            assert!((lag(Kind::Three, spread) - table).abs() < 0.6);
        }
    }

    #[test]
    fn a_type_that_cannot_give_the_boost_says_so() {
        assert!(k_factor(Kind::One, &goal(45.0, -100.0)).is_err());
        assert!(k_factor(Kind::One, &goal(45.0, -30.0)).is_ok());
        let fault = k_factor(Kind::Two, &goal(45.0, -146.0)).unwrap_err();
        assert_eq!(fault.place, "compensator.type");
        assert!(fault.message.contains("type II"));
        assert!(k_factor(Kind::Three, &goal(45.0, -330.0)).is_err());
        assert!(k_factor(Kind::Three, &goal(f64::NAN, -90.0)).is_err());
    }

    #[test]
    fn a_plant_with_phase_to_spare_gets_pole_and_zero_side_by_side() {
        let placed = k_factor(Kind::Two, &goal(45.0, -20.0)).unwrap();
        assert!((placed.pole_over_zero - LEAST_RATIO).abs() < 1e-12);
    }

    /// Placements of Basso, Designing Control Loops, 2012, 9.4 (quoted): zeros on the 430 Hz resonance, poles on the 7.9 kHz ESR
    /// zero and at half of 100 kHz.
    #[test]
    fn rules_on_a_boost() {
        let goal = RuleGoal {
            crossover_hz: 2e3,
            plant_gain_db: -3.0,
            resonance_hz: Some(430.0),
            esr_zero_hz: Some(7.9e3),
            right_half_plane_zero_hz: Some(7.4e3),
            switching_frequency_hz: 100e3,
        };
        let placed = pole_zero_rules(Kind::Three, &goal).unwrap().corners;
        assert_eq!((placed.zero_1, placed.zero_2), (Some(430.0), Some(430.0)));
        assert_eq!((placed.pole_1, placed.pole_2), (Some(50e3), Some(7.9e3)));
        let gain = ideal_response(&placed).at_hz(2e3).norm();
        assert!((20.0 * gain.log10() - 3.0).abs() < 1e-9);
        // The ESR zero out of reach: the right-half-plane zero takes its place.
        let ceramic = RuleGoal { esr_zero_hz: Some(1e6), ..goal };
        assert_eq!(pole_zero_rules(Kind::Three, &ceramic).unwrap().corners.pole_2, Some(7.4e3));
        // A type II needs the phase of an ESR zero below the crossover, so its pole stays away.
        let electrolytic = RuleGoal { esr_zero_hz: Some(900.0), right_half_plane_zero_hz: None, ..goal };
        assert_eq!(pole_zero_rules(Kind::Two, &electrolytic).unwrap().corners.pole_1, Some(50e3));
        assert!(pole_zero_rules(Kind::Three, &RuleGoal { crossover_hz: 60e3, ..goal }).is_err());
    }
}
