//! Where the parts put the integrator, the poles and the zeros when the amplifier is ideal.
//!
//! *Conventions.* Each lane is tied to the branch that makes it: `zero-1` and `pole-1` to r2, c1, c2; `zero-2` and `pole-2` to
//! what stands across the upper resistor. So two lanes at one frequency stay two lanes. The lane `gain` is where the integrator
//! alone would have a gain of 1: the response at low frequency is `j·f_gain/f` with the inversion taken out.
//!
//! *Source.* Nodal analysis of the networks with an ideal amplifier: an op amp keeps its inputs equal, so the response is
//! feedback impedance over input impedance; a transconductance amplifier takes no input current, so it is
//! divider × gm × load impedance.

use std::f64::consts::TAU;

use super::digital::lane_path;
use super::network::{Amplifier, Compensator, Kind, Part, Parts};
use super::shunt::ShuntRegulator;
use crate::linear::{Complex, Zpk};

/// What a lane moves.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LaneKind {
    /// The integrator's unity-gain frequency, and with it the gain at every frequency.
    Gain,
    /// A zero in the left half-plane.
    Zero,
    /// A pole in the left half-plane.
    Pole,
}

/// One lane: a frequency of the network that a slider moves.
#[derive(Clone, Debug, PartialEq)]
pub struct Lane {
    /// `gain`, `zero-1`, `pole-1`, `zero-2` or `pole-2`.
    pub key: &'static str,
    /// Name for people.
    pub name: &'static str,
    /// Integrator, zero or pole.
    pub kind: LaneKind,
    /// Where the parts put it, amplifier ideal [Hz].
    pub frequency_hz: f64,
    /// Paths of the parts that make it.
    pub parts: Vec<&'static str>,
    /// How it follows from the parts.
    pub formula: &'static str,
    /// What it is for.
    pub help: &'static str,
    /// Whether it is the pole that an optocoupler makes with its pull-up and the capacitor beside it.
    pub of_optocoupler: bool,
}

/// Which lane, inside this room.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Corner {
    Gain,
    Zero1,
    Pole1,
    Zero2,
    Pole2,
}

impl Corner {
    pub(super) const ALL: [Corner; 5] = [Corner::Gain, Corner::Zero1, Corner::Pole1, Corner::Zero2, Corner::Pole2];

    pub(super) fn key(self) -> &'static str {
        match self {
            Corner::Gain => "gain",
            Corner::Zero1 => "zero-1",
            Corner::Pole1 => "pole-1",
            Corner::Zero2 => "zero-2",
            Corner::Pole2 => "pole-2",
        }
    }

    pub(super) fn from_key(key: &str) -> Option<Corner> {
        Corner::ALL.into_iter().find(|corner| corner.key() == key)
    }

    pub(super) fn name(self) -> &'static str {
        match self {
            Corner::Gain => "integrator gain",
            Corner::Zero1 => "first zero",
            Corner::Pole1 => "first pole",
            Corner::Zero2 => "second zero",
            Corner::Pole2 => "second pole",
        }
    }

    fn help(self) -> &'static str {
        match self {
            Corner::Gain => "Moves the gain at every frequency: where the integrator alone would have a gain of 1.",
            Corner::Zero1 => "Ends the integrator's fall and gives back its 90°.",
            Corner::Pole1 => "Rolls the gain off, so switching ripple does not reach the modulator.",
            Corner::Zero2 => "Adds up to 90° from here on.",
            Corner::Pole2 => "Ends the rise that the second zero began.",
        }
    }

    fn kind(self) -> LaneKind {
        match self {
            Corner::Gain => LaneKind::Gain,
            Corner::Zero1 | Corner::Zero2 => LaneKind::Zero,
            Corner::Pole1 | Corner::Pole2 => LaneKind::Pole,
        }
    }
}

/// Frequencies of the lanes [Hz]; a lane that the network lacks, or that is not asked for, is `None`.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Corners {
    /// Where the integrator alone has a gain of 1 [Hz].
    pub gain: Option<f64>,
    /// Zero of r2 and c1 [Hz].
    pub zero_1: Option<f64>,
    /// Pole of r2 with c1 and c2 [Hz].
    pub pole_1: Option<f64>,
    /// Zero of the branch across the upper resistor [Hz].
    pub zero_2: Option<f64>,
    /// Pole of the branch across the upper resistor [Hz].
    pub pole_2: Option<f64>,
}

impl Corners {
    /// Frequency of a lane by its key [Hz].
    pub fn get(&self, key: &str) -> Option<f64> {
        Corner::from_key(key).and_then(|corner| self.at(corner))
    }

    /// Sets a lane by its key [Hz]; false when there is no such key.
    pub fn set(&mut self, key: &str, frequency_hz: f64) -> bool {
        let Some(corner) = Corner::from_key(key) else { return false };
        *self.slot(corner) = Some(frequency_hz);
        true
    }

    /// The lanes that have a frequency, with it [Hz].
    pub fn iter(&self) -> impl Iterator<Item = (&'static str, f64)> {
        let all = *self;
        Corner::ALL.into_iter().filter_map(move |corner| Some((corner.key(), all.at(corner)?)))
    }

    pub(super) fn at(&self, corner: Corner) -> Option<f64> {
        match corner {
            Corner::Gain => self.gain,
            Corner::Zero1 => self.zero_1,
            Corner::Pole1 => self.pole_1,
            Corner::Zero2 => self.zero_2,
            Corner::Pole2 => self.pole_2,
        }
    }

    pub(super) fn slot(&mut self, corner: Corner) -> &mut Option<f64> {
        match corner {
            Corner::Gain => &mut self.gain,
            Corner::Zero1 => &mut self.zero_1,
            Corner::Pole1 => &mut self.pole_1,
            Corner::Zero2 => &mut self.zero_2,
            Corner::Pole2 => &mut self.pole_2,
        }
    }
}

/// Corner frequency of a resistance and a capacitance [Hz].
pub(super) fn corner_hz(resistance: f64, capacitance: f64) -> f64 {
    1.0 / (TAU * resistance * capacitance)
}

/// Resistance of two resistors in parallel [Ω].
pub(super) fn parallel(a: f64, b: f64) -> f64 {
    a * b / (a + b)
}

impl Compensator {
    /// Where the parts put every lane of this network, amplifier ideal.
    pub fn corners(&self) -> Corners {
        if let Some(digital) = self.digital() {
            return digital.corners();
        }
        let parts = &self.parts;
        let capacitance = if self.kind == Kind::One { parts.c1 } else { parts.c1 + parts.c2 };
        let gain = match self.amplifier {
            Amplifier::OpAmp(_) => corner_hz(parts.upper, capacitance),
            Amplifier::Transconductance(a) => a.gm * self.divider_ratio() / (TAU * capacitance),
            Amplifier::Digital(_) => f64::NAN,
            Amplifier::ShuntRegulator(a) => a.branch_gain(parts) * corner_hz(parts.upper, parts.c1),
        };
        let mut corners = Corners { gain: Some(gain), ..Corners::default() };
        if self.kind != Kind::One {
            let feedback = || (parts.r2, parts.c1 * parts.c2 / (parts.c1 + parts.c2));
            let (resistance, capacitance) =
                self.isolated().map_or_else(feedback, |regulator| (parts.pull_up, parts.c2 + regulator.capacitance));
            corners.zero_1 = Some(corner_hz(self.zero_resistance(parts), parts.c1));
            corners.pole_1 = Some(corner_hz(resistance, capacitance));
        }
        let loads_divider = matches!(self.amplifier, Amplifier::Transconductance(_));
        if self.has(Part::C3) {
            let (across, behind) = self.across(parts);
            corners.zero_2 = Some(corner_hz(across + parts.r3, parts.c3));
            corners.pole_2 = Some(corner_hz(behind + parts.r3, parts.c3));
        } else if self.has(Part::Feedforward) {
            corners.zero_2 = Some(corner_hz(parts.upper, parts.feedforward));
            corners.pole_2 = loads_divider.then(|| corner_hz(parallel(parts.upper, parts.lower), parts.feedforward));
        }
        corners
    }

    /// The resistance that r3 and c3 stand across, and what stands in parallel with it as the branch sees it [Ω].
    pub(super) fn across(&self, parts: &Parts) -> (f64, f64) {
        match self.amplifier {
            Amplifier::OpAmp(_) | Amplifier::Digital(_) => (parts.upper, 0.0),
            Amplifier::Transconductance(_) => (parts.upper, parallel(parts.upper, parts.lower)),
            Amplifier::ShuntRegulator(a) => (parts.led, parallel(parts.led, a.led_side(parts))),
        }
    }

    /// The resistance that makes the first zero with c1 [Ω]: a fast path adds the upper resistor to r2.
    pub(super) fn zero_resistance(&self, parts: &Parts) -> f64 {
        let r2 = if self.has(Part::R2) { parts.r2 } else { 0.0 };
        let fast = self.isolated().is_some_and(ShuntRegulator::has_fast_path);
        if fast { r2 + parts.upper } else { r2 }
    }

    /// The lanes of this network with where the parts put them, amplifier ideal.
    pub fn lanes(&self) -> Vec<Lane> {
        let corners = self.corners();
        Corner::ALL
            .into_iter()
            .filter_map(|corner| {
                let (formula, parts) = self.origin(corner);
                let parts = match self.amplifier {
                    Amplifier::Digital(_) => vec![lane_path(corner.key())],
                    _ => parts.iter().map(|part| part.path()).collect(),
                };
                Some(Lane {
                    key: corner.key(),
                    name: corner.name(),
                    kind: corner.kind(),
                    frequency_hz: corners.at(corner)?,
                    parts,
                    formula,
                    help: corner.help(),
                    of_optocoupler: corner == Corner::Pole1 && self.isolated().is_some(),
                })
            })
            .collect()
    }

    /// Formula and parts behind a lane.
    fn origin(&self, corner: Corner) -> (&'static str, &'static [Part]) {
        use Part::{C1, C2, C3, Feedforward, Lower, R2, R3, Upper};
        if let Amplifier::ShuntRegulator(regulator) = self.amplifier {
            return self.isolated_origin(&regulator, corner);
        }
        if let Amplifier::Digital(digital) = self.amplifier {
            let integrator = "(1 − z⁻¹) · C / T at z = 1, over 2π";
            return (if corner == Corner::Gain { integrator } else { digital.method.formula() }, &[]);
        }
        let op_amp = matches!(self.amplifier, Amplifier::OpAmp(_));
        let branch = self.has(C3);
        match corner {
            Corner::Gain => match (op_amp, self.kind) {
                (true, Kind::One) => ("1 / (2π · Rupper · C1)", &[Upper, C1]),
                (true, _) => ("1 / (2π · Rupper · (C1 + C2))", &[Upper, C1, C2]),
                (false, Kind::One) => ("gm · Rlower / (Rupper + Rlower) / (2π · C1)", &[Upper, Lower, C1]),
                (false, _) => ("gm · Rlower / (Rupper + Rlower) / (2π · (C1 + C2))", &[Upper, Lower, C1, C2]),
            },
            Corner::Zero1 => ("1 / (2π · R2 · C1)", &[R2, C1]),
            Corner::Pole1 => ("(C1 + C2) / (2π · R2 · C1 · C2)", &[R2, C1, C2]),
            Corner::Zero2 if branch => ("1 / (2π · (Rupper + R3) · C3)", &[Upper, R3, C3]),
            Corner::Zero2 => ("1 / (2π · Rupper · Cff)", &[Upper, Feedforward]),
            Corner::Pole2 if branch && op_amp => ("1 / (2π · R3 · C3)", &[R3, C3]),
            Corner::Pole2 if branch => ("1 / (2π · (R3 + Rupper || Rlower) · C3)", &[Upper, Lower, R3, C3]),
            Corner::Pole2 => ("1 / (2π · (Rupper || Rlower) · Cff)", &[Upper, Lower, Feedforward]),
        }
    }

    /// Control voltage from output voltage with an ideal amplifier, inversion taken out [V/V].
    pub fn ideal(&self) -> Zpk {
        let mut ideal = ideal_response(&self.corners());
        if let Some((_, frequency)) = self.beside_lanes() {
            ideal.poles.push(Complex::new(-TAU * frequency, 0.0));
            ideal.gain *= TAU * frequency;
        }
        ideal
    }

    /// Poles that the ideal network has beside its lanes, with what makes them [Hz].
    pub fn beside_lanes(&self) -> Option<(&'static str, f64)> {
        let regulator = self.isolated().filter(|_| self.kind == Kind::One)?;
        Some(("optocoupler", corner_hz(self.parts.pull_up, regulator.capacitance)))
    }
}

/// Response with an integrator, zeros and poles at these corners; a network without gain lane has gain 0.
pub(super) fn ideal_response(corners: &Corners) -> Zpk {
    let mut gain = TAU * corners.gain.unwrap_or(0.0);
    let mut zeros = Vec::new();
    let mut poles = vec![Complex::new(0.0, 0.0)];
    for frequency in [corners.zero_1, corners.zero_2].into_iter().flatten() {
        zeros.push(Complex::new(-TAU * frequency, 0.0));
        gain /= TAU * frequency;
    }
    for frequency in [corners.pole_1, corners.pole_2].into_iter().flatten() {
        poles.push(Complex::new(-TAU * frequency, 0.0));
        gain *= TAU * frequency;
    }
    Zpk { zeros, poles, gain }
}
