//! Tests of the stage against textbook forms, and of what must not happen.

use super::*;
use crate::finding::Severity;
use crate::linear::Zpk;
use crate::quantity::{Choices, Values};
use std::f64::consts::TAU;

/// A stage from entries; what is not given is lossless where it can be.
pub(super) fn stage(topology: &str, entries: &[(&str, f64)], chosen: &[(&str, &str)]) -> Stage {
    let mut values = Values::new();
    for path in [
        "stage.source.resistance",
        "stage.inductor.resistance",
        "stage.switch.resistance",
        "stage.diode.drop",
        "stage.diode.resistance",
        "stage.synchronous.resistance",
        "stage.bank.1.esr",
        "stage.bank.1.esl",
    ] {
        values.set(path, 0.0).unwrap();
    }
    for (path, value) in entries {
        values.set(path, *value).unwrap();
    }
    let mut choices = Choices::new();
    choices.set("stage.topology", topology);
    for (path, key) in chosen {
        choices.set(path, key);
    }
    Stage::from_values(&values, &choices).unwrap()
}

fn boost_9_to_24(esl: f64) -> (Stage, StageCondition) {
    let entries = [
        ("stage.output.voltage", 24.0),
        ("stage.inductor.inductance", 10e-6),
        ("stage.bank.1.capacitance", 150e-6),
        ("stage.bank.1.esr", 3e-3),
        ("stage.bank.1.esl", esl),
        ("stage.switching-frequency", 300e3),
    ];
    let condition = StageCondition { input_voltage: 9.0, load_current: 1.5, output_voltage: 24.0 };
    (stage("boost", &entries, &[]), condition)
}

fn vout_from_duty(stage: &Stage, condition: &StageCondition) -> Zpk {
    Zpk::from_state_space(&stage.averaged(condition).unwrap().stage, 0, 0).unwrap()
}

/// A 9 → 24 V boost at duty 0.625 gives 23.99 V ± 0.3 % whatever its capacitor's series inductance, and its plant up to
/// a tenth of the switching frequency moves less than 0.1 dB. (Averaged as a state, 1 nH would make it read 9 V.)
#[test]
fn series_inductance_does_not_upset_the_average() {
    let (base, condition) = boost_9_to_24(0.0);
    let plain = vout_from_duty(&base, &condition);
    for esl in [0.0, 1e-9, 5e-9] {
        let (stage, _) = boost_9_to_24(esl);
        let output = stage.output_at_duty(&condition, 0.625).unwrap();
        assert!((output / 23.99 - 1.0).abs() < 3e-3, "{output} V at {esl} H");
        let plant = vout_from_duty(&stage, &condition);
        for f in [100.0, 1e3, 1.5e3, 1e4, 3e4] {
            let moved = 20.0 * (plant.at_hz(f).norm() / plain.at_hz(f).norm()).log10();
            assert!(moved.abs() < 0.1, "{moved} dB at {f} Hz with {esl} H");
        }
        assert_eq!(stage.averaged(&condition).unwrap().bank_inductance.is_some(), esl > 0.0);
    }
}

/// A buck's bank carries no switched current, so its series inductance is an ordinary part of the plant: far above the
/// branch's own resonance L and ESL divide the input.
#[test]
fn series_inductance_of_a_buck_is_an_ordinary_part() {
    let entries = [
        ("stage.output.voltage", 5.0),
        ("stage.inductor.inductance", 10e-6),
        ("stage.bank.1.capacitance", 22e-6),
        ("stage.bank.1.esr", 2e-3),
        ("stage.bank.1.esl", 1e-9),
    ];
    let stage = stage("buck", &entries, &[]);
    assert!(stage.bank_inductance_averaged());
    let point = stage
        .averaged(&StageCondition { input_voltage: 12.0, load_current: 3.0, output_voltage: 5.0 })
        .unwrap()
        .operating_point;
    // A triangle has its peak-to-peak over √12 as RMS, and the bank carries all of the ripple but the share of the load.
    let ripple = point.inductors[0].current.ripple;
    assert!((point.output_bank_rms / (ripple / 12.0_f64.sqrt()) - 1.0).abs() < 3e-3);
    let plant = vout_from_duty(&stage, &StageCondition { input_voltage: 12.0, load_current: 3.0, output_voltage: 5.0 });
    // Nodal solution by hand at 2 MHz.
    let s = crate::linear::Complex::new(0.0, TAU * 2e6);
    let branch = s * 1e-9 + 2e-3 + (s * 22e-6).inv();
    let load = (branch.inv() + 3.0 / 5.0).inv();
    let expected = 12.0 * load / (load + s * 10e-6);
    assert!((plant.at_hz(2e6) / expected - 1.0).norm() < 1e-9);
}

/// Ripple and boundary load of lossless stages, continuous conduction (Erickson & Maksimovic 3rd ed., 2.3 and 5.1;
/// memory): boost ΔI = Vin·D/(L·fs), boundary Iout = (1 − D)·ΔI/2.
#[test]
fn ripple_and_boundary_of_the_lossless_boost() {
    let (mut stage, condition) = boost_9_to_24(0.0);
    stage.bank[0].esr = 0.0;
    let point = stage.averaged(&condition).unwrap().operating_point;
    let ripple = 9.0 * 0.625 / (10e-6 * 300e3);
    let current = point.inductors[0].current;
    assert!((current.ripple / ripple - 1.0).abs() < 2e-3, "{} against {ripple}", current.ripple);
    assert!((current.average / (1.5 / 0.375) - 1.0).abs() < 2e-3);
    assert!((current.peak - current.average - ripple / 2.0).abs() < 0.01);
    let boundary = stage.boundary_load(&condition).unwrap();
    assert!((boundary / (0.375 * ripple / 2.0) - 1.0).abs() < 5e-3, "{boundary}");
    assert_eq!(point.conduction, Conduction::Continuous);
}

/// Energy is conserved: input power is output power plus conduction losses, when ripple is small.
#[test]
fn conduction_losses_close_the_power_balance() {
    let entries = [
        ("stage.output.voltage", 24.0),
        ("stage.inductor.inductance", 10e-3),
        ("stage.inductor.resistance", 0.05),
        ("stage.switch.resistance", 0.03),
        ("stage.diode.drop", 0.5),
        ("stage.diode.resistance", 0.02),
        ("stage.bank.1.capacitance", 1e-2),
        ("stage.source.resistance", 0.04),
    ];
    for topology in registry() {
        let vin = if topology.reach == Reach::BelowInput { 36.0 } else { 12.0 };
        let stage = stage(topology.key, &entries, &[]);
        let condition = StageCondition { input_voltage: vin, load_current: 2.0, output_voltage: 24.0 };
        let point = stage.averaged(&condition).unwrap().operating_point;
        let pulsed_source = topology.reach != Reach::AboveInput;
        // Averaging takes the source's current as d·i, a pulsed one's extra loss in the source is not in the average.
        let tolerance = if pulsed_source { 2e-2 } else { 1e-6 };
        let balance = vin * point.input_current - 48.0 - point.conduction_loss;
        assert!(balance.abs() < tolerance * 48.0, "{}: {balance} W", topology.key);
    }
}

/// Of two duty ratios the one below the peak is taken, and an output beyond the peak names the greatest that can be had.
#[test]
fn out_of_reach_names_the_greatest_output() {
    let entries = [
        ("stage.output.voltage", 24.0),
        ("stage.inductor.inductance", 10e-6),
        ("stage.inductor.resistance", 0.2),
        ("stage.bank.1.capacitance", 150e-6),
    ];
    let stage = stage("boost", &entries, &[]);
    let at = |output_voltage| StageCondition {
        input_voltage: 9.0,
        load_current: 24.0 / 16.0 * output_voltage / 24.0,
        output_voltage,
    };
    let point = stage.averaged(&at(24.0)).unwrap().operating_point;
    // M = 1/((1 − D)(1 + RL/(R(1 − D)²))), peak at (1 − D)² = RL/R (Erickson & Maksimovic 3rd ed., 3.4; memory).
    let conversion = |d: f64| 1.0 / ((1.0 - d) * (1.0 + 0.2 / (16.0 * (1.0 - d).powi(2))));
    assert!((conversion(point.duty) * 9.0 - 24.0).abs() < 1e-9);
    assert!(point.duty < 1.0 - (0.2_f64 / 16.0).sqrt());
    let greatest = 9.0 * conversion(1.0 - (0.2_f64 / 16.0).sqrt());
    let finding = stage.averaged(&at(50.0)).unwrap_err();
    assert_eq!(finding.severity, Severity::Problem);
    let named = crate::quantity::print(greatest, crate::quantity::Unit::Volt);
    assert!(finding.message.contains(&named), "{} should name {named}", finding.message);
    let below = stage.averaged(&StageCondition { input_voltage: 30.0, ..at(24.0) }).unwrap_err();
    assert!(below.message.contains("duty ratio of zero"), "{}", below.message);
}

/// Constant power is the tangent: the same operating point as a resistor, and the plant's damping turned round.
#[test]
fn load_kinds_share_the_operating_point() {
    let entries =
        [("stage.output.voltage", 5.0), ("stage.inductor.inductance", 10e-6), ("stage.bank.1.capacitance", 100e-6)];
    let condition = StageCondition { input_voltage: 12.0, load_current: 2.0, output_voltage: 5.0 };
    let plants: Vec<Zpk> = ["resistor", "current", "power"]
        .map(|kind| {
            let stage = stage("buck", &entries, &[("stage.load", kind)]);
            assert!((stage.averaged(&condition).unwrap().operating_point.duty - 5.0 / 12.0).abs() < 1e-12);
            vout_from_duty(&stage, &condition)
        })
        .into();
    let damping: Vec<f64> = plants.iter().map(|p| p.poles[0].re).collect();
    let expected = 1.0 / (2.0 * 2.5 * 100e-6);
    assert!((damping[0] + expected).abs() < 1e-6 * expected);
    assert!(damping[1].abs() < 1e-6 * expected);
    assert!((damping[2] - expected).abs() < 1e-6 * expected);
}

/// Slopes of the switched current in lossless stages, and how they answer the voltages (Erickson & Maksimovic 3rd ed.,
/// ch. 2; memory): buck (Vg − V)/L and −V/L, boost Vg/L and (Vg − V)/L, buck-boost Vg/L and −V/L.
#[test]
fn slopes_of_the_switched_current() {
    let (vg, v, l, load) = (12.0, [5.0, 24.0, 15.0], 10e-6, 2.0);
    for (topology, v) in registry().iter().zip(v) {
        let entries =
            [("stage.output.voltage", v), ("stage.inductor.inductance", l), ("stage.bank.1.capacitance", 1e-3)];
        let stage = stage(topology.key, &entries, &[("stage.rectifier", "synchronous")]);
        let condition = StageCondition { input_voltage: vg, load_current: load, output_voltage: v };
        let model = stage.averaged(&condition).unwrap();
        let (on, off, on_by_vin, on_by_vout) = match topology.key {
            "buck" => ((vg - v) / l, -v / l, 1.0, -1.0),
            "boost" => (vg / l, (vg - v) / l, 1.0, 0.0),
            _ => (vg / l, -v / l, 1.0, 0.0),
        };
        let point = &model.operating_point;
        assert!((point.on_slope / on - 1.0).abs() < 1e-9, "{}: {}", topology.key, point.on_slope);
        assert!((point.off_slope / off - 1.0).abs() < 1e-9, "{}: {}", topology.key, point.off_slope);
        let half = on * point.duty / stage.switching_frequency / 2.0;
        let current = point.switched_current;
        assert!((current.peak - current.average - half).abs() < 1e-9 * half);
        assert!((current.average - current.valley - half).abs() < 1e-9 * half);
        let row = model.stage.output(signals::ON_SLOPE).unwrap();
        let voltage = model.stage.c.row(model.stage.output(signals::OUTPUT_VOLTAGE).unwrap()).transpose().imax();
        assert!((model.stage.d[(row, 1)] * l - on_by_vin).abs() < 1e-9);
        assert!((model.stage.c[(row, voltage)] * l - on_by_vout).abs() < 1e-9);
        assert!(model.stage.d[(row, 0)].abs() < f64::MIN_POSITIVE);
        // The duty ratio turns the switched current by the slope difference.
        let switched = model.stage.c.row(model.stage.output(signals::SWITCHED_CURRENT).unwrap());
        let turn = (switched * model.stage.b.column(0))[0];
        assert!((turn / (on - off) - 1.0).abs() < 1e-9, "{}: {turn}", topology.key);
    }
}
