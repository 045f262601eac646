//! Optimum damping of an input filter by a parallel branch.
//!
//! *Method*: for a branch of given size n there is one resistor that makes the greatest output impedance of the filter least; winding
//! and ESR are left out, and help. Across the input capacitor, n = Cb/C: R/R0 = √((2 + n)(4 + 3n)/(2n²(4 + n))), peak
//! R0·√(2(2 + n))/n at f0·√(2/(2 + n)). Across the filter inductor, n = Lb/L: R/R0 = √(n(3 + 4n)(1 + 2n)/(2(1 + 4n))), peak
//! R0·√(2n(1 + 2n)) at f0·√((1 + 2n)/(2n)).
//! *Source*: Middlebrook, Proc. Powercon 5, 1978, as in Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 17.4 (the
//! first seen, the second from memory; a search for the least peak confirms both).

use super::filter_values::InputFilter;
use super::filters::Damping;
use crate::quantity::{Unit, print_digits};

/// A branch smaller than this against the filter's own part is not worth its resistor.
const LEAST_CAPACITOR_RATIO: f64 = 1.0;
/// A damping inductor above this against the filter's own leaves nothing to damp with.
const GREATEST_INDUCTOR_RATIO: f64 = 1.0;

/// A damping branch of optimum resistance.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct OptimumDamping {
    /// Across capacitor or inductor.
    pub kind: Damping,
    /// n: the branch's capacitor over the input capacitor, or its inductor over the filter inductor.
    pub ratio: f64,
    /// The resistor [Ω].
    pub resistance: f64,
    /// The branch's capacitor [F] or inductor [H].
    pub reactance_value: f64,
    /// Greatest output impedance of the filter so damped [Ω].
    pub peak: f64,
    /// Where it lies [Hz].
    pub peak_hz: f64,
}

impl OptimumDamping {
    /// The branch in words: "0.67 Ω + 1.18 mF across the input capacitor".
    pub fn in_words(&self) -> String {
        let (unit, place) = match self.kind {
            Damping::Inductor => (Unit::Henry, "filter inductor"),
            Damping::None | Damping::Capacitor => (Unit::Farad, "input capacitor"),
        };
        let part = print_digits(self.reactance_value, unit, 3);
        format!("{} + {part} across the {place}", print_digits(self.resistance, Unit::Ohm, 3))
    }
}

impl InputFilter {
    /// Optimum damping with a branch of a given ratio n; of the kind chosen, or across the capacitor where none is.
    pub fn optimum_damping(&self, ratio: f64) -> OptimumDamping {
        let (r0, f0, n) = (self.characteristic_impedance(), self.resonance_hz(), ratio);
        if self.damping == Damping::Inductor {
            let resistance = r0 * (n * (3.0 + 4.0 * n) * (1.0 + 2.0 * n) / (2.0 * (1.0 + 4.0 * n))).sqrt();
            let peak = r0 * (2.0 * n * (1.0 + 2.0 * n)).sqrt();
            let peak_hz = f0 * ((1.0 + 2.0 * n) / (2.0 * n)).sqrt();
            let reactance_value = n * self.inductance;
            return OptimumDamping { kind: Damping::Inductor, ratio, resistance, reactance_value, peak, peak_hz };
        }
        let resistance = r0 * ((2.0 + n) * (4.0 + 3.0 * n) / (2.0 * n * n * (4.0 + n))).sqrt();
        let peak = r0 * (2.0 * (2.0 + n)).sqrt() / n;
        let peak_hz = f0 * (2.0 / (2.0 + n)).sqrt();
        let reactance_value = n * self.capacitance;
        OptimumDamping { kind: Damping::Capacitor, ratio, resistance, reactance_value, peak, peak_hz }
    }

    /// The ratio n that brings the damped filter's peak to an impedance [Ω].
    pub fn ratio_for_peak(&self, peak: f64) -> f64 {
        let share = (peak / self.characteristic_impedance()).powi(2);
        if self.damping == Damping::Inductor {
            (((1.0 + 4.0 * share).sqrt() - 1.0) / 4.0).min(GREATEST_INDUCTOR_RATIO)
        } else {
            ((1.0 + (1.0 + 4.0 * share).sqrt()) / share).max(LEAST_CAPACITOR_RATIO)
        }
    }

    /// Optimum damping that keeps the filter's peak at or below an impedance [Ω]; a branch that is there already is kept where its
    /// size suffices.
    pub fn damping_for(&self, peak: f64) -> OptimumDamping {
        let needed = self.ratio_for_peak(peak);
        let ratio = match self.damping {
            Damping::Capacitor => needed.max(self.damping_capacitance / self.capacitance),
            Damping::Inductor => needed.min(self.damping_inductance / self.inductance),
            Damping::None => needed,
        };
        self.optimum_damping(ratio)
    }

    /// Greatest output impedance [Ω] of the filter with a resistor [Ω] and a branch of ratio n, winding and ESR left out: by scan.
    #[cfg(test)]
    fn peak_with(&self, resistance: f64, ratio: f64) -> f64 {
        use crate::linear::Complex;
        use std::f64::consts::TAU;
        let impedance = |f: f64| {
            let s = Complex::new(0.0, TAU * f);
            let (mut across_l, mut across_c) = (s * self.inductance, (s * self.capacitance).inv());
            if self.damping == Damping::Inductor {
                let branch = s * self.inductance * ratio + resistance;
                across_l = (across_l.inv() + branch.inv()).inv();
            } else {
                let branch = (s * self.capacitance * ratio).inv() + resistance;
                across_c = (across_c.inv() + branch.inv()).inv();
            }
            (across_l.inv() + across_c.inv()).inv().norm()
        };
        let f0 = self.resonance_hz();
        (0..4000).map(|k| impedance(f0 * 10_f64.powf(-1.5 + 3.0 * f64::from(k) / 4000.0))).fold(0.0, f64::max)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn filter(damping: Damping) -> InputFilter {
        InputFilter {
            inductance: 330e-6,
            capacitance: 470e-6,
            damping,
            damping_resistance: 0.0,
            damping_capacitance: 0.0,
            damping_inductance: 0.0,
        }
    }

    /// Erickson & Maksimovic 3rd ed., 17.4 (quoted): 330 µH, 470 µF damped to a peak of 1 Ω: R0f 0.838 Ω, 404 Hz, n 2.52,
    /// Cb 1184 µF, Rf 0.666 Ω (recomputed; printed 0.67), peak at 269 Hz.
    #[test]
    fn the_textbook_filter() {
        let filter = filter(Damping::None);
        assert!((filter.characteristic_impedance() - 0.838).abs() < 5e-4);
        assert!((filter.resonance_hz() - 404.0).abs() < 0.5);
        let damping = filter.damping_for(1.0);
        assert!((damping.ratio - 2.52).abs() < 0.005, "{damping:?}");
        assert!((damping.reactance_value - 1184e-6).abs() < 2e-6, "{damping:?}");
        assert!((damping.resistance - 0.666).abs() < 1e-3, "{damping:?}");
        assert!((damping.peak - 1.0).abs() < 1e-12 && (damping.peak_hz - 269.0).abs() < 0.5, "{damping:?}");
    }

    /// No resistor gives a lower peak than the optimum, and the peak is the one stated: by a search over resistors and frequencies.
    #[test]
    fn the_optimum_is_the_least_peak() {
        for (damping, ratios) in [(Damping::Capacitor, [0.5, 2.52, 8.0]), (Damping::Inductor, [0.1, 0.5, 1.0])] {
            for ratio in ratios {
                let filter = filter(damping);
                let optimum = filter.optimum_damping(ratio);
                let at = |factor: f64| filter.peak_with(optimum.resistance * factor, ratio);
                assert!((at(1.0) / optimum.peak - 1.0).abs() < 1e-4, "{optimum:?}: {}", at(1.0));
                for factor in [0.8, 0.97, 1.03, 1.25] {
                    assert!(at(factor) > optimum.peak * 1.000_1, "{optimum:?} at {factor}: {}", at(factor));
                }
                assert!((filter.ratio_for_peak(optimum.peak) / ratio - 1.0).abs() < 1e-9 || ratio < 1.0);
            }
        }
    }
}
