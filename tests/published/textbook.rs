//! Worked examples of textbooks, recomputed: the buck and the buck-boost of Erickson & Maksimovic, the boost of Basso.

use crate::common::{
    PUBLISHED, PUBLISHED_DEG, analysed, assert_absolute, assert_relative, at_one_condition, ideal_op_amp, lossless,
    nominal, ratio,
};
use polewright::design::Design;
use std::f64::consts::TAU;

pub(crate) fn set(design: &mut Design, values: &[(&str, f64)]) {
    for (path, value) in values {
        design.values.set(path, *value).expect("finite");
    }
}

fn landmark(detail: &polewright::analysis::Detail, key: &str) -> f64 {
    let found = detail.landmarks.iter().find(|landmark| landmark.key == key);
    found.unwrap_or_else(|| panic!("no landmark {key}")).frequency_hz
}

/// Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 9.5.4 (seen): 28 V to 15 V, 3 Ω, 50 µH, 500 µF without ESR,
/// 100 kHz, ramp 4 V, reference 5 V.
pub(crate) fn buck() -> Design {
    let mut design = lossless(
        "buck",
        &[
            ("stage.output.voltage", 15.0),
            ("stage.switching-frequency", 100e3),
            ("stage.inductor.inductance", 50e-6),
            ("stage.bank.1.capacitance", 500e-6),
            ("control.ramp.amplitude", 4.0),
            ("compensator.reference", 5.0),
            ("compensator.divider.upper", 96e3),
            ("compensator.divider.lower", 48e3),
        ],
    );
    at_one_condition(&mut design, 28.0, 5.0);
    design.set_from_text("compensator.amplifier", "op-amp").expect("an option");
    ideal_op_amp(&mut design);
    design
}

/// A gain of 1/3 at all frequencies that matter: the sensor of the uncompensated loop. The integrating capacitor is so big, and the
/// one across it so small, that their corners lie outside the range looked at.
fn flat_third(design: &mut Design) {
    design.set_from_text("compensator.type", "2").expect("an option");
    set(design, &[("compensator.r2", 32e3), ("compensator.c1", 1.0), ("compensator.c2", 1e-16)]);
}

/// The printed compensator, its gain 3.7 behind a sensor of 1/3: zero 1.7 kHz, pole 14.5 kHz, and an inverted zero where given. In the
/// usual type III form with the upper resistor R: r2 = 3.7·R/3, (R + r3)·c3 = 1/ωz, r3·c3 = 1/ωp, r2·c1 = 1/ωL.
pub(crate) fn printed_network(design: &mut Design, inverted_zero_hz: Option<f64>) {
    design.set_from_text("compensator.type", "3").expect("an option");
    let upper = 96e3;
    let r2 = 3.7 * upper / 3.0;
    let r3 = upper / (14.5 / 1.7 - 1.0);
    let c1 = inverted_zero_hz.map_or(1.0, |f| 1.0 / (TAU * f * r2));
    set(
        design,
        &[
            ("compensator.r2", r2),
            ("compensator.c1", c1),
            ("compensator.c2", 1e-16),
            ("compensator.r3", r3),
            ("compensator.c3", 1.0 / (TAU * 14.5e3 * r3)),
        ],
    );
}

#[test]
fn the_buck_without_compensator() {
    let mut design = buck();
    flat_third(&mut design);
    let detail = nominal(&design, &[10.0, 5e3]);
    assert_relative("duty ratio", detail.operating_point.duty, 15.0 / 28.0, 1e-9);
    assert_relative("control voltage (printed 2.14 V)", detail.control.control_voltage, 2.14286, 1e-5);
    assert_relative("LC resonance (printed 1 kHz)", landmark(&detail, "lc-resonance"), 1006.6, 1e-4);
    assert_relative("Gd0/VM (printed 28 V / 4 V)", ratio(detail.curves.plant_db[0]), 7.0, PUBLISHED);
    // Recomputed; printed −20.6 dB is asymptotic.
    assert_relative("|Tu(5 kHz)|", ratio(detail.curves.loop_db[1]), ratio(-20.13), PUBLISHED);
    let [crossover] = detail.loop_gain.margins.crossovers.as_slice() else { panic!("one crossover") };
    assert_relative("crossover (printed about 1.8 kHz)", crossover.frequency_hz, 1836.0, PUBLISHED);
    assert_absolute("phase margin (printed under 5°)", crossover.phase_margin_deg, 4.7, PUBLISHED_DEG);
}

#[test]
fn the_buck_with_the_printed_compensator() {
    for (inverted_zero, frequency, margin, line) in
        [(None, 5272.0, 53.34, 0.0556), (Some(500.0), 5290.0, 47.93, 0.0121)]
    {
        let mut design = buck();
        printed_network(&mut design, inverted_zero);
        let detail = nominal(&design, &[100.0]);
        let [crossover] = detail.loop_gain.margins.crossovers.as_slice() else { panic!("one crossover") };
        assert!(detail.loop_gain.stable(), "stable");
        assert_relative("crossover (target 5 kHz)", crossover.frequency_hz, frequency, PUBLISHED);
        assert_absolute("phase margin (target 52°)", crossover.phase_margin_deg, margin, PUBLISHED_DEG);
        // Printed: 0.536 open loop, 62 mV and 12 mV per volt closed; recomputed 0.0556 and 0.0121.
        assert_relative(
            "line to output, open loop",
            ratio(detail.curves.open_loop_line_to_output_db[0]),
            0.5410,
            PUBLISHED,
        );
        assert_relative("line to output, closed loop", ratio(detail.curves.line_to_output_db[0]), line, PUBLISHED);
    }
}

/// The parts the book gives, as quoted: R1 11 k, R2 85 k, R3 120 k, C2 1.1 nF, C3 2.7 nF. The same response in the usual type III form
/// (recomputed): upper 96 k, 12.42 k + 862 pF across it, feedback 120 k + 2.7 nF; gain 1.25, zeros 1702 and 491 Hz, pole 14.86 kHz.
#[test]
fn the_printed_parts_give_the_printed_corners() {
    let mut design = buck();
    design.set_from_text("compensator.type", "3").expect("an option");
    set(
        &mut design,
        &[
            ("compensator.r2", 120e3),
            ("compensator.c1", 2.7e-9),
            ("compensator.c2", 1e-16),
            ("compensator.r3", 12.42e3),
            ("compensator.c3", 862e-12),
        ],
    );
    let lanes = crate::common::checked(&design).compensator.lanes();
    for wanted in [1702.0, 491.0, 14.86e3] {
        let nearest = lanes.iter().map(|lane| (lane.frequency_hz / wanted - 1.0).abs()).fold(f64::INFINITY, f64::min);
        assert!(nearest < PUBLISHED, "a lane at {wanted} Hz: {lanes:?}");
    }
}

/// Basso, Designing Control Loops for Linear and Switching Power Supplies, 2012, 9.4 (quoted): 11.5 V to 19 V, 3 A, 100 kHz. L 50 µH,
/// C 1000 µF and a ramp of 2 V reproduce the printed numbers (derived).
fn boost(esr: f64) -> Design {
    let mut design = lossless(
        "boost",
        &[
            ("stage.output.voltage", 19.0),
            ("stage.switching-frequency", 100e3),
            ("stage.inductor.inductance", 50e-6),
            ("stage.bank.1.capacitance", 1000e-6),
            ("stage.bank.1.esr", esr),
            ("control.ramp.amplitude", 2.0),
            ("compensator.reference", 2.5),
            ("compensator.divider.upper", 10e3),
            ("compensator.divider.lower", 10e3 * 2.5 / 16.5),
        ],
    );
    at_one_condition(&mut design, 11.5, 3.0);
    design.set_from_text("compensator.amplifier", "op-amp").expect("an option");
    design.set_from_text("compensator.type", "3").expect("an option");
    ideal_op_amp(&mut design);
    design
}

/// Type III parts for a double zero and two poles at a resistor r2 [Ω]; the gain goes with r2.
fn place(design: &mut Design, zero_hz: f64, poles_hz: [f64; 2], r2: f64) {
    let upper = 10e3;
    let r3 = upper / (poles_hz[0] / zero_hz - 1.0);
    let c1 = 1.0 / (TAU * zero_hz * r2);
    // The pole of r2 with c1 and c2 in series.
    let c2 = 1.0 / (TAU * poles_hz[1] * r2 - 1.0 / c1);
    set(
        design,
        &[
            ("compensator.r2", r2),
            ("compensator.c1", c1),
            ("compensator.c2", c2),
            ("compensator.r3", r3),
            ("compensator.c3", 1.0 / (TAU * poles_hz[0] * r3)),
        ],
    );
}

/// The two placements, gain set for 2 kHz at an ESR of 20 mΩ.
fn placements() -> [(f64, [f64; 2], f64); 2] {
    [(430.0, [7.9e3, 50e3]), (300.0, [9.9e3, 50e3])].map(|(zero, poles)| {
        let mut design = boost(0.02);
        place(&mut design, zero, poles, 10e3);
        let detail = nominal(&design, &[2e3]);
        (zero, poles, 10e3 / ratio(detail.curves.loop_db[0]))
    })
}

#[test]
fn the_boost_plant() {
    // Printed: D 0.395, 23.9 dB, 430.8 Hz, RHP zero 7.4 kHz; ESR zero 7.9 kHz; recomputed to more digits.
    let detail = nominal(&boost(0.02), &[0.5]);
    assert_relative("LC resonance", landmark(&detail, "lc-resonance"), 430.8, 2e-4);
    assert_relative("RHP zero", landmark(&detail, "right-half-plane-zero"), 7385.0, 2e-4);
    assert_relative("ESR zero", landmark(&detail, "esr-zero"), 7957.7, 1e-4);
    let bare = nominal(&boost(0.0), &[0.5]);
    assert_relative("duty ratio without ESR", bare.operating_point.duty, 0.39474, 2e-5);
    assert_relative("gain at low frequency without ESR", ratio(bare.curves.plant_db[0]), ratio(23.92), 1e-3);
    // Derived at each ESR [mΩ]: D, RHP zero [Hz].
    for (esr, duty, zero) in [(0.04, 0.3972, 7279.0), (0.02, 0.3960, 7332.0), (0.01, 0.3954, 7359.0)] {
        let analysis = analysed(&boost(esr), &[0.5], 10);
        let summary = analysis.conditions[4].outcome.as_ref().expect("computed");
        assert_relative("duty ratio", summary.operating_point.duty, duty, PUBLISHED);
        assert_relative("RHP zero", summary.right_half_plane_zero_hz.expect("one"), zero, PUBLISHED);
    }
}

#[test]
fn the_boost_loop_over_its_esr() {
    // Recomputed; phase margins at 2 kHz with the gain of 20 mΩ, printed 62/50/43° and 72/60/53° (the book keeps one Q throughout).
    let fixed = [[63.59, 49.99, 42.52], [73.59, 59.98, 52.51]];
    // Parts held, crossover free: frequency [Hz] and margin [°].
    let free = [[(2161.0, 64.5), (2000.0, 50.0), (1968.0, 42.5)], [(2173.0, 74.2), (2000.0, 60.0), (1967.0, 52.6)]];
    for (k, (zero, poles, r2)) in placements().into_iter().enumerate() {
        for (j, esr) in [0.04, 0.02, 0.01].into_iter().enumerate() {
            let mut design = boost(esr);
            place(&mut design, zero, poles, r2);
            let detail = nominal(&design, &[2e3]);
            let phase = detail.curves.loop_deg[0];
            assert_absolute("phase above −180° at 2 kHz", 180.0 + phase, fixed[k][j], PUBLISHED_DEG);
            let [crossover] = detail.loop_gain.margins.crossovers.as_slice() else { panic!("one crossover") };
            assert_relative("crossover", crossover.frequency_hz, free[k][j].0, PUBLISHED);
            assert_absolute("phase margin", crossover.phase_margin_deg, free[k][j].1, PUBLISHED_DEG);
        }
    }
}

/// Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., 8.2.1 (seen): D 0.6, 10 Ω, 30 V, 160 µH, 160 µF.
#[test]
fn the_buck_boost_plant() {
    let mut design = lossless(
        "buck-boost",
        &[
            ("stage.output.voltage", 45.0),
            ("stage.switching-frequency", 100e3),
            ("stage.inductor.inductance", 160e-6),
            ("stage.bank.1.capacitance", 160e-6),
            ("control.ramp.amplitude", 1.0),
            ("compensator.reference", 5.0),
            ("compensator.divider.upper", 8e3),
            ("compensator.divider.lower", 1e3),
        ],
    );
    at_one_condition(&mut design, 30.0, 4.5);
    let f0 = 397.887;
    let detail = nominal(&design, &[0.5, f0]);
    assert_relative("duty ratio", detail.operating_point.duty, 0.6, 1e-9);
    assert_relative("Gd0 (printed 45.5 dBV)", ratio(detail.curves.plant_db[0]), 187.5, PUBLISHED);
    assert_relative("Gg0 (printed 3.5 dB)", ratio(detail.curves.open_loop_line_to_output_db[0]), 1.5, PUBLISHED);
    assert_relative("LC resonance", landmark(&detail, "lc-resonance"), 397.9, 1e-4);
    assert_relative("RHP zero", landmark(&detail, "right-half-plane-zero"), 2652.6, 1e-4);
    // Q 4: at the resonance the line response is Q times its low-frequency gain.
    assert_relative("Q·Gg0", ratio(detail.curves.open_loop_line_to_output_db[1]), 6.0, PUBLISHED);
}
