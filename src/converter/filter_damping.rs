//! Optimum damping of an input filter by a parallel branch.
//!
//! *Method*: for a branch of given size n there is one resistor that makes the greatest output impedance of the filter least; these
//! formulas leave source resistance, winding and ESR out. Across the input capacitor, n = Cb/C: R/R0 = √((2 + n)(4 + 3n)/(2n²(4 + n))), peak
//! R0·√(2(2 + n))/n at f0·√(2/(2 + n)). Across the filter inductor, n = Lb/L: R/R0 = √(n(3 + 4n)(1 + 2n)/(2(1 + 4n))), peak
//! R0·√(2n(1 + 2n)) at f0·√((1 + 2n)/(2n)).
//! Resistances can raise the peak (ESR does), so where there are any the branch is enlarged until the peak with them, found by scan, is
//! the one wanted.
//! *Source*: Middlebrook, Proc. Powercon 5, 1978, as in Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 17.4 (the
//! first seen, the second from memory; a search for the least peak confirms both).

use super::filter_values::InputFilter;
use super::filters::Damping;
use crate::linear::Complex;
use crate::quantity::{Unit, print_digits};
use std::f64::consts::TAU;

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

    /// Optimum damping that keeps the filter's peak at or below an impedance [Ω] where any branch can, resistances counted in; a branch
    /// that is there already is kept where its size suffices.
    pub fn damping_for(&self, peak: f64) -> OptimumDamping {
        if self.source_resistance + self.winding + self.esr <= 0.0 {
            return self.ideal_damping_for(peak);
        }
        let mut aim = peak;
        let mut best: Option<OptimumDamping> = None;
        for _ in 0..ENLARGEMENTS {
            let mut damping = self.ideal_damping_for(aim);
            (damping.peak, damping.peak_hz) = self.peak_with(damping.resistance, damping.ratio, SCAN);
            if best.is_none_or(|b| damping.peak < b.peak * WORTH_IT) {
                best = Some(damping);
            } else {
                break;
            }
            if damping.peak <= peak {
                break;
            }
            aim *= peak / damping.peak * WORTH_IT;
        }
        best.unwrap_or_else(|| self.ideal_damping_for(peak))
    }

    fn ideal_damping_for(&self, peak: f64) -> OptimumDamping {
        let needed = self.ratio_for_peak(peak);
        let ratio = match self.damping {
            Damping::Capacitor => needed.max(self.damping_capacitance / self.capacitance),
            Damping::Inductor => needed.min(self.damping_inductance / self.inductance),
            Damping::None => needed,
        };
        self.optimum_damping(ratio)
    }

    /// Greatest output impedance [Ω] of source and filter with a damping resistor [Ω] and a branch of ratio n, and where it lies [Hz]:
    /// by scan.
    fn peak_with(&self, resistance: f64, ratio: f64, points: u16) -> (f64, f64) {
        let impedance = |f: f64| {
            let s = Complex::new(0.0, TAU * f);
            let mut across_l = s * self.inductance + self.winding;
            let mut across_c = (s * self.capacitance).inv() + self.esr;
            if self.damping == Damping::Inductor {
                let branch = s * self.inductance * ratio + resistance;
                across_l = (across_l.inv() + branch.inv()).inv();
            } else {
                let branch = (s * self.capacitance * ratio).inv() + resistance;
                across_c = (across_c.inv() + branch.inv()).inv();
            }
            ((across_l + self.source_resistance).inv() + across_c.inv()).inv().norm()
        };
        let f0 = self.resonance_hz();
        let at = |k: u16| {
            f0 * 10_f64.powf(SCAN_DECADES[0] + (SCAN_DECADES[1] - SCAN_DECADES[0]) * f64::from(k) / f64::from(points))
        };
        let greatest = (0..=points).map(|k| (impedance(at(k)), at(k))).max_by(|a, b| a.0.total_cmp(&b.0));
        greatest.unwrap_or((self.source_resistance + self.winding, 0.0))
    }
}

/// The scan for the peak reaches from so many decades below the undamped resonance, where a large branch moves it, to above it, …
const SCAN_DECADES: [f64; 2] = [-4.0, 2.0];
/// … at so many points: a damped peak is broad.
const SCAN: u16 = 300;
/// How often a branch is enlarged for what resistances spoil, …
const ENLARGEMENTS: u32 = 8;
/// … and the part of the peak that must be left for one more enlargement to be worth it; the next aims so far below.
const WORTH_IT: f64 = 0.98;

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
            source_resistance: 0.0,
            winding: 0.0,
            esr: 0.0,
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

    /// The branch found holds the peak wanted with all resistances, by a scan finer than the search's.
    #[test]
    fn resistances_are_counted_in() {
        for damping in [Damping::Capacitor, Damping::Inductor] {
            let mut lossy = filter(damping);
            if damping == Damping::Inductor {
                lossy.damping_inductance = 1.0;
            }
            (lossy.winding, lossy.esr, lossy.source_resistance) = (20e-3, 150e-3, 10e-3);
            let found = lossy.damping_for(0.4);
            let fine = lossy.peak_with(found.resistance, found.ratio, 8000).0;
            assert!(fine <= 0.4 * 1.001 && fine > 0.25, "{found:?}: {fine}");
        }
        // No branch takes the filter below the resistance to direct current.
        let mut weak = filter(Damping::None);
        weak.source_resistance = 2.0;
        assert!((weak.damping_for(1.0).peak / 2.0 - 1.0).abs() < 0.05, "{:?}", weak.damping_for(1.0));
    }

    /// No resistor gives a lower peak than the optimum, and the peak is the one stated: by a search over resistors and frequencies.
    #[test]
    fn the_optimum_is_the_least_peak() {
        for (damping, ratios) in [(Damping::Capacitor, [0.5, 2.52, 8.0]), (Damping::Inductor, [0.1, 0.5, 1.0])] {
            for ratio in ratios {
                let filter = filter(damping);
                let optimum = filter.optimum_damping(ratio);
                let at = |factor: f64| filter.peak_with(optimum.resistance * factor, ratio, 8000).0;
                assert!((at(1.0) / optimum.peak - 1.0).abs() < 1e-4, "{optimum:?}: {}", at(1.0));
                for factor in [0.8, 0.97, 1.03, 1.25] {
                    assert!(at(factor) > optimum.peak * 1.000_1, "{optimum:?} at {factor}: {}", at(factor));
                }
                assert!((filter.ratio_for_peak(optimum.peak) / ratio - 1.0).abs() < 1e-9 || ratio < 1.0);
            }
        }
    }
}
