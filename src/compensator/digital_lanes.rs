//! Lanes of a difference equation: where its rounded coefficients put gain, poles and zeros, and where they may be wanted.
//!
//! *Conventions*: a root in z stands for the frequency in s that the method would have made it of, so before rounding every lane is where it
//! is wanted. Of the zeros those nearest to z = −1 are the ones that were at infinity, and no lanes.

use std::collections::BTreeSet;
use std::f64::consts::TAU;

use super::difference::{DifferenceEquation, Method};
use super::digital::{Digital, lane_path};
use super::digital_entries::ENTRIES;
use super::lanes::{Corner, Corners};
use super::network::{Amplifier, Compensator};
use super::place::{Built, Placed, Placement};
use crate::linear::Complex;
use crate::quantity::{Unit, print, print_digits};

/// Lanes are told to be elsewhere than wanted from this relative distance on: finer is below what a curve shows.
const WORTH_A_WORD: f64 = 0.01;
/// Halvings in the search for the last place within reach.
const HALVINGS: usize = 40;

impl Digital {
    /// Where the rounded coefficients put every lane [Hz].
    pub fn corners(&self) -> Corners {
        self.corners_of(&self.equation())
    }

    /// Where the coefficients of an equation put every lane [Hz].
    pub fn corners_of(&self, equation: &DifferenceEquation) -> Corners {
        let hertz = |root: &Complex| {
            let frequency = self.method.frequency_hz(*root, self.period_s);
            // A root at 0 is infinitely far for matched poles.
            if frequency.is_finite() { frequency } else { 1e3 * self.highest_hz() }
        };
        let (integrator, mut poles) = apart(equation.poles());
        poles.resize(self.order - 1, Complex::ZERO);
        let mut zeros = equation.zeros().to_vec();
        zeros.resize(self.order, Complex::ZERO);
        zeros.sort_by(|p, q| q.re.total_cmp(&p.re));
        zeros.truncate(self.zeros);
        let in_order =
            |roots: Vec<Complex>, aims: [Option<f64>; 2]| ordered(&roots.iter().map(hertz).collect::<Vec<_>>(), aims);
        let [zero_1, zero_2] = in_order(zeros, [self.aims.zero_1, self.aims.zero_2]);
        let [pole_1, pole_2] = in_order(poles, [self.aims.pole_1, self.aims.pole_2]);
        let gain = Some(self.integrator_hz(equation, integrator));
        Corners { gain, zero_1, pole_1, zero_2, pole_2 }
    }

    /// Where the integrator alone has a gain of 1 [Hz].
    fn integrator_hz(&self, equation: &DifferenceEquation, integrator: Complex) -> f64 {
        let factors = equation.factors();
        let at_one = |roots: &[Complex]| roots.iter().map(|r| 1.0 - r).product::<Complex>();
        let mut others = factors.poles;
        if let Some(place) = others.iter().position(|pole| *pole == integrator) {
            others.remove(place);
        }
        let value = equation.gain() * self.scale() * (at_one(&factors.zeros) / at_one(&others)).norm();
        let rate = match self.method {
            Method::Prewarped(f) => TAU * f / (0.5 * TAU * f * self.period_s).tan() / 2.0,
            _ => self.period_s.recip(),
        };
        (value * rate / TAU).abs()
    }

    /// The same with other aims, as far as the lanes may go; and what kept one back.
    fn aimed(&self, wanted: &Corners, locks: &BTreeSet<String>) -> (Digital, Option<String>) {
        let mut aimed = *self;
        let mut why = None;
        for (key, frequency_hz) in wanted.iter() {
            let path = lane_path(key);
            let Some(corner) = Corner::from_key(key).filter(|corner| self.aims.at(*corner).is_some()) else { continue };
            if locks.contains(path) || !(frequency_hz.is_finite() && frequency_hz > 0.0) {
                continue;
            }
            let highest = if corner == Corner::Gain { f64::INFINITY } else { self.highest_hz() };
            if frequency_hz > highest * (1.0 + 1e-9) {
                why = Some(format!(
                    "Sampled once a period, no pole or zero stands above half that rate, {}.",
                    print(highest, Unit::Hertz)
                ));
            }
            let mut reached = frequency_hz.min(highest);
            if let Some(reason) = ENTRIES.iter().find(|row| row.path == path).and_then(|row| row.check(reached).err()) {
                why = Some(format!("Then the lane {reason}."));
                reached = self.aims.at(corner).unwrap_or(reached);
            }
            *aimed.aims.slot(corner) = Some(reached);
        }
        if aimed.usable() || !self.usable() {
            return (aimed, why);
        }
        let why = format!(
            "Beyond, a coefficient {} a word of {} bits.",
            if aimed.rounded().is_err() { "would overflow" } else { "would vanish in" },
            self.bits
        );
        (self.last_usable(&aimed), Some(why))
    }

    /// Whether its coefficients fit their words and answer something.
    fn usable(&self) -> bool {
        self.rounded().is_ok_and(|fixed| fixed.forward.codes.iter().any(|code| *code != 0))
    }

    /// The last usable place on the straight way, in log frequency, to other aims.
    fn last_usable(&self, beyond: &Digital) -> Digital {
        let between = |part: f64| {
            let mut between = *self;
            for corner in Corner::ALL {
                if let (Some(from), Some(to)) = (self.aims.at(corner), beyond.aims.at(corner)) {
                    *between.aims.slot(corner) = Some(from * (to / from).powf(part));
                }
            }
            between
        };
        let (mut reached, mut limit) = (0.0, 1.0);
        for _ in 0..HALVINGS {
            let middle = 0.5 * (reached + limit);
            if between(middle).usable() { reached = middle } else { limit = middle }
        }
        between(reached)
    }
}

impl Compensator {
    /// Moves one lane of a difference equation.
    pub(super) fn move_digital(
        &self,
        digital: &Digital,
        corner: Corner,
        frequency_hz: f64,
        locks: &BTreeSet<String>,
    ) -> Placed {
        let mut wanted = Corners::default();
        *wanted.slot(corner) = Some(frequency_hz);
        let placement = self.place_digital(digital, &wanted, locks);
        let as_built_hz = placement.compensator.corners().at(corner).unwrap_or(f64::NAN);
        Placed { compensator: placement.compensator, as_built_hz, why: placement.why }
    }

    /// Places the lanes of a difference equation that `wanted` names.
    pub(super) fn place_digital(&self, digital: &Digital, wanted: &Corners, locks: &BTreeSet<String>) -> Placement {
        let (aimed, limit) = digital.aimed(wanted, locks);
        let compensator = Compensator { amplifier: Amplifier::Digital(aimed), ..self.clone() };
        let built = aimed.corners();
        let lanes: Vec<Built> = Corner::ALL
            .into_iter()
            .filter_map(|corner| {
                let aim_hz = wanted.at(corner).or_else(|| aimed.aims.at(corner))?;
                Some(Built { key: corner.key(), aim_hz, as_built_hz: built.at(corner)? })
            })
            .collect();
        let strayed: Vec<String> = lanes
            .iter()
            .filter(|lane| (lane.as_built_hz / aimed.aims.get(lane.key).unwrap_or(f64::NAN) - 1.0).abs() > WORTH_A_WORD)
            .filter_map(|lane| {
                let name = Corner::from_key(lane.key)?.name();
                Some(format!("the {name} is at {}", print_digits(lane.as_built_hz, Unit::Hertz, 3)))
            })
            .collect();
        let rounding =
            (!strayed.is_empty()).then(|| format!("Rounded to words of {} bits, {}.", aimed.bits, strayed.join(", ")));
        let why = match (limit, rounding) {
            (Some(limit), Some(rounding)) => Some(format!("{limit} {rounding}")),
            (limit, rounding) => limit.or(rounding),
        };
        Placement { compensator, lanes, why }
    }
}

/// The pole nearest to z = 1, and the others.
fn apart(poles: &[Complex]) -> (Complex, Vec<Complex>) {
    let mut others = poles.to_vec();
    let distance = |p: &Complex| (p - 1.0).norm();
    let nearest = (0..others.len()).min_by(|a, b| distance(&others[*a]).total_cmp(&distance(&others[*b])));
    let integrator = nearest.map_or(Complex::ZERO, |place| others.remove(place));
    (integrator, others)
}

/// At most two frequencies, in the order that is nearer to the aims.
fn ordered(found: &[f64], aims: [Option<f64>; 2]) -> [Option<f64>; 2] {
    let found = [found.first().copied(), found.get(1).copied()];
    let ([Some(a), Some(b)], [Some(first), Some(second)]) = (found, aims) else { return found };
    let apart = |x: f64, y: f64| (x / first).ln().abs() + (y / second).ln().abs();
    if apart(b, a) < apart(a, b) { [Some(b), Some(a)] } else { [Some(a), Some(b)] }
}
