//! Input filters and second stages: worked examples of textbooks, and nodal equations written by hand.

use crate::common::{PUBLISHED, PUBLISHED_DEG, assert_absolute, assert_relative, nominal};
use crate::textbook::{buck, printed_network, set};
use polewright::design::Design;
use polewright::linear::Verdict;

/// An input filter without resistances, as the books draw it [H, F].
fn with_filter(design: &mut Design, inductance: f64, capacitance: f64) {
    design.set_from_text("stage.input-filter", "fitted").expect("an option");
    set(
        design,
        &[
            ("stage.input-filter.inductance", inductance),
            ("stage.input-filter.resistance", 0.0),
            ("stage.input-capacitor.capacitance", capacitance),
            ("stage.input-capacitor.esr", 0.0),
        ],
    );
}

/// A resistor [Ω] in series with a capacitor [F] across the input capacitor.
fn damped(design: &mut Design, resistance: f64, capacitance: f64) {
    design.set_from_text("stage.input-filter.damping", "capacitor").expect("an option");
    set(
        design,
        &[
            ("stage.input-filter.damping.resistance", resistance),
            ("stage.input-filter.damping.capacitance", capacitance),
        ],
    );
}

/// The buck of Erickson & Maksimovic 3rd ed., 9.5.4, with its printed compensator behind the input filter of 17.3 or a smaller one
/// (recomputed: averaged equations by hand and an exact switched orbit agree). One healthy-looking crossover says nothing: the
/// undamped filter makes the loop unstable at its own resonance.
#[test]
fn the_buck_behind_input_filters() {
    let mut design = buck();
    printed_network(&mut design, Some(500.0));
    with_filter(&mut design, 330e-6, 470e-6);
    let detail = nominal(&design, &[100.0]);
    let [crossover] = detail.loop_gain.margins.crossovers.as_slice() else { panic!("one crossover") };
    assert_relative("crossover", crossover.frequency_hz, 5337.0, PUBLISHED);
    assert_absolute("phase margin", crossover.phase_margin_deg, 48.3, PUBLISHED_DEG);
    let Verdict::Unstable { frequency_hz, growth_per_s, .. } = detail.loop_gain.verdict else { panic!("unstable") };
    assert_relative("oscillation", frequency_hz, 399.0, PUBLISHED);
    assert_relative("growth, as a frequency", growth_per_s / std::f64::consts::TAU, 16.7, PUBLISHED);

    damped(&mut design, 0.666, 1184e-6);
    let detail = nominal(&design, &[100.0]);
    let [crossover] = detail.loop_gain.margins.crossovers.as_slice() else { panic!("one crossover") };
    assert_relative("crossover, damped", crossover.frequency_hz, 5330.0, PUBLISHED);
    assert_absolute("phase margin, damped", crossover.phase_margin_deg, 48.4, PUBLISHED_DEG);
    assert!(detail.loop_gain.stable());
}

/// The same loop behind 31 µH and 47 µF (recomputed): three crossovers, one of them with a margin below zero, and yet stable.
#[test]
fn three_crossovers_of_a_stable_loop() {
    let mut design = buck();
    printed_network(&mut design, Some(500.0));
    with_filter(&mut design, 31e-6, 47e-6);
    let wanted = [
        [(3590.0, 30.2), (4290.0, -79.3), (6090.0, 53.7)],
        // Damped by 1.7 Ω and 29 µF.
        [(3310.0, 52.5), (3800.0, 89.4), (5760.0, 56.2)],
    ];
    for (k, wanted) in wanted.iter().enumerate() {
        if k == 1 {
            damped(&mut design, 1.7, 29e-6);
        }
        let detail = nominal(&design, &[100.0]);
        let crossovers = &detail.loop_gain.margins.crossovers;
        assert_eq!(crossovers.len(), 3, "{crossovers:?}");
        for (j, (crossover, (frequency, margin))) in crossovers.iter().zip(wanted).enumerate() {
            assert_relative("crossover", crossover.frequency_hz, *frequency, PUBLISHED);
            assert_absolute("phase margin", crossover.phase_margin_deg, *margin, PUBLISHED_DEG);
            assert_eq!(crossover.falling, j != 1);
        }
        assert!(detail.loop_gain.stable());
    }
}
