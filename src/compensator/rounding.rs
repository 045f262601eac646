//! A compensator with parts of preferred value.
//!
//! *Method.* The divider first, as a pair, because its ratio sets the output voltage. What it does to the impedance the other
//! parts follow, so that the poles and zeros stay; then each goes to its nearest value. Lanes show what rounding did to them.

use std::collections::BTreeSet;

use super::network::{Amplifier, Compensator, Part, Parts};
use super::preferred::{Series, round_ratio};

impl Compensator {
    /// The compensator with every part that is not locked at a preferred value of its kind. Rounding again changes nothing.
    #[must_use]
    pub fn rounded(&self, resistors: Series, capacitors: Series, locks: &BTreeSet<String>) -> Compensator {
        let locked = |part: Part| locks.contains(part.path());
        let mut rounded = self.clone();
        let parts = &mut rounded.parts;
        let (upper, lower) = round_ratio(parts.upper, parts.lower, resistors, locked(Part::Upper), locked(Part::Lower));
        let follow = upper / parts.upper;
        (parts.upper, parts.lower) = (upper, lower);
        let isolated = self.isolated().is_some();
        if isolated && !locked(Part::PullUp) {
            parts.pull_up = resistors.nearest(parts.pull_up);
        }
        // What others follow goes first.
        let mut order = self.fitted();
        order.sort_by_key(|part| *part != Part::Led);
        for part in order {
            let held = matches!(part, Part::Upper | Part::Lower) || (isolated && part == Part::PullUp);
            if held || locked(part) {
                continue;
            }
            let wanted = self.wanted_beside(&rounded.parts, part, follow);
            let series = if part.is_resistor() { resistors } else { capacitors };
            let nearest = series.nearest(wanted);
            if part.entry().check(nearest).is_ok() {
                rounded.parts.set(part, nearest);
            }
        }
        rounded
    }

    /// What a part should be beside parts that are rounded already, so that the lanes stay; `follow` is what the divider's impedance
    /// was multiplied by.
    fn wanted_beside(&self, rounded: &Parts, part: Part, follow: f64) -> f64 {
        let value = self.parts.get(part);
        let impedance = match self.amplifier {
            Amplifier::OpAmp(_) | Amplifier::Digital(_) => follow,
            Amplifier::Transconductance(_) if matches!(part, Part::R3 | Part::C3 | Part::Feedforward) => follow,
            Amplifier::Transconductance(_) => 1.0,
            Amplifier::ShuntRegulator(regulator) => match part {
                Part::R2 | Part::C1 => follow,
                Part::Led => rounded.pull_up / self.parts.pull_up,
                Part::R3 | Part::C3 => rounded.led / self.parts.led,
                Part::C2 => {
                    let own = regulator.capacitance;
                    let pull_up = rounded.pull_up / self.parts.pull_up;
                    // As much as the pull-up leaves of it; its own value where the optocoupler's is too much already.
                    return Some((value + own) / pull_up - own).filter(|c2| *c2 > 0.0).unwrap_or(value);
                }
                _ => 1.0,
            },
        };
        if part.is_resistor() { value * impedance } else { value / impedance }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::{Choices, Values};

    fn compensator(choices: &[(&str, &str)]) -> Compensator {
        let mut values = Values::new();
        for (path, value) in [
            ("compensator.divider.upper", 17.77e3),
            ("compensator.divider.lower", 1.013e3),
            ("compensator.r2", 9.31e3),
            ("compensator.c1", 23.4e-9),
            ("compensator.c2", 433e-12),
            ("compensator.r3", 491.0),
            ("compensator.c3", 4.4e-9),
            ("compensator.cff", 91e-12),
        ] {
            values.set(path, value).unwrap();
        }
        let mut chosen = Choices::new();
        for (path, key) in choices {
            chosen.set(path, key);
        }
        Compensator::from_values(&values, &chosen).unwrap()
    }

    #[test]
    fn every_part_is_preferred_and_rounding_again_changes_nothing() {
        for kind in ["1", "2", "3"] {
            for amplifier in ["op-amp", "transconductance"] {
                let before = compensator(&[("compensator.type", kind), ("compensator.amplifier", amplifier)]);
                let after = before.rounded(Series::E96, Series::E12, &BTreeSet::new());
                for part in after.fitted() {
                    let series = if part.is_resistor() { Series::E96 } else { Series::E12 };
                    assert_eq!(series.nearest(after.parts.get(part)).to_bits(), after.parts.get(part).to_bits());
                }
                assert_eq!(after.rounded(Series::E96, Series::E12, &BTreeSet::new()), after);
                // Steps of E96 are 2.4 % wide and nearly the same all over the decade, so half a step can remain.
                assert!((after.dc_output_voltage() / before.dc_output_voltage() - 1.0).abs() < 0.012);
                for (was, is) in before.lanes().iter().zip(after.lanes()) {
                    // Two roundings of E12 are 10 % each, one of E96 is 1 %.
                    assert!((is.frequency_hz / was.frequency_hz).ln().abs() < 0.21, "{}", was.key);
                }
            }
        }
    }

    #[test]
    fn locked_parts_and_exact_kinds_keep_their_bits() {
        let before = compensator(&[]);
        let locks: BTreeSet<String> = [Part::C1, Part::Upper].map(|part| part.path().to_owned()).into();
        let after = before.rounded(Series::E24, Series::Exact, &locks);
        for part in [Part::Upper, Part::C1, Part::C2, Part::C3] {
            assert_eq!(after.parts.get(part).to_bits(), before.parts.get(part).to_bits(), "{}", part.label());
        }
        assert_eq!(after.parts.r2.to_bits(), 9.1e3f64.to_bits());
        assert_eq!(before.rounded(Series::Exact, Series::Exact, &BTreeSet::new()), before);
    }
}
