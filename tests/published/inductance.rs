//! Series inductance in the output bank of a boost: it must not spoil the average.
//!
//! *Source*: an exact switched calculation (throw-away experiment of the project's founders, matrix exponentials per interval): 9 → 24 V
//! boost, 10 µH, 150 µF / 3 mΩ, 16 Ω, 300 kHz, duty ratio 0.625, no losses: 23.99 V whatever the inductance.

use crate::common::{assert_relative, at_one_condition, checked, lossless, nominal};
use polewright::converter::StageCondition;
use polewright::design::Design;

fn boost(esl: f64) -> Design {
    let mut design = lossless(
        "boost",
        &[
            ("stage.output.voltage", 24.0),
            ("stage.switching-frequency", 300e3),
            ("stage.inductor.inductance", 10e-6),
            ("stage.bank.1.capacitance", 150e-6),
            ("stage.bank.1.esr", 3e-3),
            ("stage.bank.1.esl", esl),
            ("compensator.reference", 12.0),
            ("compensator.divider.upper", 10e3),
            ("compensator.divider.lower", 10e3),
        ],
    );
    at_one_condition(&mut design, 9.0, 1.5);
    design
}

/// The output at which the solved duty ratio is the given one, into 16 Ω.
fn output_at_duty(design: &Design, duty: f64) -> f64 {
    let stage = checked(design).stage;
    let (mut low, mut high) = (12.0, 40.0);
    for _ in 0..60 {
        let middle = f64::midpoint(low, high);
        let condition = StageCondition { input_voltage: 9.0, load_current: middle / 16.0, output_voltage: middle };
        let found = stage.averaged(&condition).expect("an operating point").operating_point.duty;
        if found < duty {
            low = middle;
        } else {
            high = middle;
        }
    }
    low
}

#[test]
fn a_boost_keeps_its_output_whatever_the_series_inductance() {
    for esl in [0.0, 1e-9, 5e-9] {
        assert_relative("output at duty 0.625", output_at_duty(&boost(esl), 0.625), 23.99, 0.003);
    }
}

#[test]
fn series_inductance_hardly_moves_the_plant_below_a_tenth_of_the_switching_frequency() {
    let frequencies: Vec<f64> = (0..=200).map(|k| 30.0 * 1000_f64.powf(f64::from(k) / 200.0)).collect();
    let bare = nominal(&boost(0.0), &frequencies).curves;
    for esl in [1e-9, 5e-9] {
        let curves = nominal(&boost(esl), &frequencies).curves;
        for (k, f) in frequencies.iter().enumerate() {
            let moved = (curves.plant_db[k] - bare.plant_db[k]).abs();
            assert!(moved < 0.1, "{moved} dB at {f} Hz with {esl} H");
        }
    }
}
