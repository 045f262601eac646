//! Tests of stages with an input filter and a second stage.

use super::tests::stage;
use super::*;

/// Entries of a stage with all its losses, large enough that ripple does not spoil a power balance.
const LOSSY: [(&str, f64); 8] = [
    ("stage.output.voltage", 24.0),
    ("stage.inductor.inductance", 10e-3),
    ("stage.inductor.resistance", 0.05),
    ("stage.switch.resistance", 0.03),
    ("stage.diode.drop", 0.5),
    ("stage.diode.resistance", 0.02),
    ("stage.bank.1.capacitance", 1e-2),
    ("stage.source.resistance", 0.04),
];

const FILTERS: [(&str, f64); 10] = [
    ("stage.input-filter.inductance", 100e-6),
    ("stage.input-filter.resistance", 0.03),
    ("stage.input-filter.damping.resistance", 1.0),
    ("stage.input-filter.damping.capacitance", 4e-3),
    ("stage.input-filter.damping.inductance", 20e-6),
    ("stage.input-capacitor.capacitance", 1e-3),
    ("stage.input-capacitor.esr", 0.0),
    ("stage.output-filter.inductance", 10e-6),
    ("stage.output-filter.resistance", 0.02),
    ("stage.output-filter.damping.resistance", 0.5),
];

fn input_of(topology: &Topology) -> f64 {
    if topology.reach == Reach::BelowInput { 36.0 } else { 12.0 }
}

/// Energy is conserved through both filters, for every topology, damping, sensing and load; every inductor is named, the switched
/// one first, and the input filter's carries the source's current.
#[test]
fn power_balance_with_filters() {
    let entries = [&LOSSY[..], &FILTERS[..]].concat();
    for topology in registry() {
        let vin = input_of(topology);
        let condition = StageCondition { input_voltage: vin, load_current: 2.0, output_voltage: 24.0 };
        for damping in ["none", "capacitor", "inductor"] {
            for sense in ["load", "bank"] {
                for (load, rectifier, across) in [
                    ("resistor", "diode", "none"),
                    ("current", "synchronous", "resistor"),
                    ("power", "emulated", "none"),
                ] {
                    let chosen = [
                        ("stage.input-filter", "fitted"),
                        ("stage.input-filter.damping", damping),
                        ("stage.output-filter", "fitted"),
                        ("stage.output-filter.damping", across),
                        ("stage.output-filter.sense", sense),
                        ("stage.load", load),
                        ("stage.rectifier", rectifier),
                    ];
                    let stage = stage(topology.key, &entries, &chosen);
                    let model = stage.averaged(&condition).unwrap();
                    let point = &model.operating_point;
                    let balance = vin * point.input_current - 2.0 * point.load_voltage - point.conduction_loss;
                    assert!(balance.abs() < 2e-3 * 48.0, "{} {chosen:?}: {balance} W", topology.key);
                    let resistance = if across == "resistor" { 0.02 * 0.5 / 0.52 } else { 0.02 };
                    let drop = if sense == "bank" { 2.0 * resistance } else { 0.0 };
                    assert!((point.load_voltage - (24.0 - drop)).abs() < 1e-12);
                    let names: Vec<&str> = point.inductors.iter().map(|i| i.name).collect();
                    let own = stage.rows.inductors.len();
                    assert!(names[..own].iter().all(|name| name.starts_with("inductor")), "{names:?}");
                    assert_eq!(names.len(), own + 2 + usize::from(damping == "inductor"));
                    let filter = point.inductors.iter().find(|i| i.name == "input filter inductor").unwrap();
                    if damping != "inductor" {
                        assert!((filter.current.average - point.input_current).abs() < 1e-9);
                    }
                    let second = point.inductors.iter().find(|i| i.name == "output filter inductor").unwrap();
                    assert!((second.current.average / 2.0 - 1.0).abs() < 0.05, "{:?}", second.current);
                    // The load's voltage at rest follows the regulated one.
                    let outputs = &model.stage;
                    let dc = |output: &str, input: &str| {
                        outputs.dc_gain(outputs.output(output).unwrap(), outputs.input(input).unwrap()).unwrap()
                    };
                    let ratio = dc(signals::LOAD_VOLTAGE, signals::DUTY) / dc(signals::OUTPUT_VOLTAGE, signals::DUTY);
                    assert!((ratio - 1.0).abs() < 0.01, "{ratio}");
                }
            }
        }
    }
}

/// Ripple of a filter inductor: a switched current of duty ½ drawn from an ideal capacitor makes a triangle of I·T/(4·C) peak to
/// peak, and a triangle of voltage makes ΔV·T/(8·L) of current, as a triangle of current makes ΔI·T/(8·C) of voltage (Erickson &
/// Maksimovic 3rd ed., 2.5; memory).
#[test]
fn ripple_of_the_input_filter_inductor() {
    let entries = [
        ("stage.output.voltage", 12.0),
        ("stage.inductor.inductance", 10e-3),
        ("stage.bank.1.capacitance", 1e-2),
        ("stage.input-filter.inductance", 10e-6),
        ("stage.input-filter.resistance", 0.0),
        ("stage.input-capacitor.capacitance", 100e-6),
        ("stage.input-capacitor.esr", 0.0),
    ];
    let stage = stage("buck", &entries, &[("stage.input-filter", "fitted")]);
    let condition = StageCondition { input_voltage: 24.0, load_current: 4.0, output_voltage: 12.0 };
    let point = stage.averaged(&condition).unwrap().operating_point;
    let current = point.inductors[1].current;
    let period = 1.0 / stage.switching_frequency;
    let voltage = 4.0 * period / (4.0 * 100e-6);
    let expected = voltage * period / (8.0 * 10e-6);
    // The resonance at a sixtieth of the switching frequency adds its square.
    assert!((current.ripple / expected - 1.0).abs() < 5e-3, "{} against {expected}", current.ripple);
    assert!((current.average - 2.0).abs() < 1e-6 && current.peak > 2.0 && current.least < 2.0);
}

/// A bank's series inductance behind a second stage: part of the averaged model where no switched current flows in it, even with a
/// load that damps nothing; left out elsewhere. It moves neither operating point nor the response well below its own resonance.
#[test]
fn series_inductance_with_a_second_stage() {
    for topology in registry() {
        for load in ["resistor", "current", "power"] {
            for branches in ["1", "2"] {
                let with = |esl: f64| {
                    let entries = [
                        ("stage.output.voltage", 24.0),
                        ("stage.inductor.inductance", 10e-6),
                        ("stage.bank.1.capacitance", 47e-6),
                        ("stage.bank.1.esr", 3e-3),
                        ("stage.bank.1.esl", esl),
                        ("stage.bank.2.capacitance", 100e-6),
                        ("stage.bank.2.esr", 30e-3),
                        ("stage.bank.2.esl", esl),
                        ("stage.output-filter.inductance", 1e-6),
                    ];
                    let chosen = [("stage.output-filter", "fitted"), ("stage.load", load), ("stage.bank", branches)];
                    stage(topology.key, &entries, &chosen)
                };
                let condition =
                    StageCondition { input_voltage: input_of(topology), load_current: 5.0, output_voltage: 24.0 };
                let (plain, inductive) = (with(0.0), with(2e-9));
                // Bucks and Ćuk feed their bank through an inductor.
                let through = topology.reach == Reach::BelowInput || topology.key == "cuk";
                assert_eq!(inductive.bank_inductance_averaged(), through, "{}", topology.key);
                let (plain, inductive) = (plain.averaged(&condition).unwrap(), inductive.averaged(&condition).unwrap());
                assert!(inductive.bank_inductance.is_none());
                assert!((plain.operating_point.duty / inductive.operating_point.duty - 1.0).abs() < 1e-12);
                for f in [100.0, 3e3, 30e3] {
                    let (a, b) = (plain.stage.at_hz(f).unwrap(), inductive.stage.at_hz(f).unwrap());
                    for output in 0..4 {
                        let moved = (a[(output, 0)] / b[(output, 0)] - 1.0).norm();
                        assert!(moved < 0.02, "{} {load} {branches} {output} at {f} Hz: {moved}", topology.key);
                    }
                }
            }
        }
    }
}

/// A second stage that drops the whole output is told, not computed.
#[test]
fn a_second_stage_that_drops_everything() {
    let entries = [("stage.output.voltage", 5.0), ("stage.output-filter.resistance", 3.0)];
    let chosen = [("stage.output-filter", "fitted"), ("stage.output-filter.sense", "bank")];
    let stage = stage("buck", &entries, &chosen);
    let condition = StageCondition { input_voltage: 12.0, load_current: 2.0, output_voltage: 5.0 };
    let finding = stage.averaged(&condition).unwrap_err();
    assert_eq!(finding.place, "stage.output-filter.resistance");
}
