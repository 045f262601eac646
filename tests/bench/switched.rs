//! Benchmark W6: the exact loop of a boost with a type III at 500 frequencies, orbit included; the same loop as in
//! `tests/bench/switched_peers.py`.

#![allow(missing_docs, reason = "the macros of criterion make public items")]
#![expect(clippy::expect_used, reason = "a benchmark may stop at a wrong value")]

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use polewright::analysis::loop_model::Shared;
use polewright::converter::StageCondition;
use polewright::design::{CheckedDesign, Design};
use polewright::linear::Complex;
use polewright::switched::{
    Closing, Driven, Goal, Joined, Orbit, Quantity, Reader, Response, Stability, Start, SwitchedSystem,
};

const CHOICES: [(&str, &str); 9] = [
    ("stage.topology", "boost"),
    ("stage.rectifier", "synchronous"),
    ("stage.load", "resistor"),
    ("stage.bank", "1"),
    ("stage.input-capacitor", "none"),
    ("control.mode", "voltage"),
    ("control.feedforward", "none"),
    ("compensator.type", "3"),
    ("compensator.amplifier", "op-amp"),
];

const VALUES: [(&str, f64); 27] = [
    ("stage.output.voltage", 24.0),
    ("stage.source.resistance", 0.0),
    ("stage.inductor.inductance", 10e-6),
    ("stage.inductor.resistance", 10e-3),
    ("stage.switch.resistance", 8e-3),
    ("stage.synchronous.resistance", 8e-3),
    ("stage.bank.1.capacitance", 150e-6),
    ("stage.bank.1.esr", 10e-3),
    ("stage.bank.1.esl", 0.0),
    ("stage.bank.1.count", 1.0),
    ("stage.bank.1.remaining", 1.0),
    ("stage.switching-frequency", 300e3),
    ("control.ramp.amplitude", 1.5),
    ("control.ramp.valley", 0.0),
    ("control.delay", 0.0),
    ("control.duty.least", 0.0),
    ("control.duty.greatest", 1.0),
    ("compensator.reference", 2.4),
    ("compensator.divider.upper", 90e3),
    ("compensator.divider.lower", 10e3),
    ("compensator.r2", 10e3),
    ("compensator.c1", 22e-9),
    ("compensator.c2", 220e-12),
    ("compensator.r3", 2.2e3),
    ("compensator.c3", 1e-9),
    ("compensator.op-amp.dc-gain", 10e3),
    ("compensator.op-amp.gain-bandwidth", 10e6),
];

fn boost() -> CheckedDesign {
    let mut design = Design::default();
    for (path, key) in CHOICES {
        design.set_from_text(path, key).expect("an option");
    }
    for (path, value) in VALUES {
        design.values.set(path, value).expect("finite");
    }
    for level in ["least", "nominal", "greatest"] {
        design.values.set(&format!("stage.input.{level}"), 12.0).expect("finite");
        design.values.set(&format!("stage.load.{level}"), 2.0).expect("finite");
    }
    design.check().expect("a sound design")
}

// What switched_peers.py prints of the same loop: duty ratio, loop gain at 10 kHz and at 700 kHz.
const DUTY: f64 = 0.5034445550363202;
const AT_10_KHZ: (f64, f64) = (-0.6323434370875074, -0.6127957571177332);
const AT_700_KHZ: (f64, f64) = (-1.0555537609173668e-05, 0.015981344325705037);

fn exact(criterion: &mut Criterion) {
    let checked = boost();
    let shared = Shared::new(&checked).expect("a compensator");
    let condition = StageCondition { input_voltage: 12.0, load_current: 2.0, output_voltage: 24.0 };
    let point = checked.stage.averaged(&condition).expect("a point").operating_point;
    let system = || {
        let driven = Driven::Loop(Closing::new(&shared.compensator, checked.compensator.reference));
        SwitchedSystem::new(&Joined { stage: &checked.stage, law: &shared.law, driven }, &condition).expect("a system")
    };
    let orbit = |system: &SwitchedSystem| Orbit::find(system, Start::of(&point), Goal::AsDriven).expect("an orbit");
    let frequencies: Vec<f64> = (0..500).map(|k| 100.0 * 9e3_f64.powf(f64::from(k) / 499.0)).collect();
    let curve = |response: &Response| {
        let mut reader = Reader::new(response, Quantity::LoopGain).expect("a reading");
        frequencies.iter().map(|f| reader.at(*f).expect("a value")).sum::<Complex>()
    };
    let (built, found) = (system(), orbit(&system()));
    let response = Response::new(found.clone()).expect("a response");
    let mut reader = Reader::new(&response, Quantity::LoopGain).expect("a reading");
    for (f, (re, im)) in [(10e3, AT_10_KHZ), (700e3, AT_700_KHZ)] {
        let value = reader.at(f).expect("a value");
        let error = (value - Complex::new(re, im)).norm() / value.norm();
        assert!(error < 1e-6, "{value} at {f} Hz is not {re} + {im}j");
    }
    assert!((found.duty - DUTY).abs() < 1e-9, "{} is not {DUTY}", found.duty);

    criterion.bench_function("W6 exact loop of a boost with type III at 500 frequencies, orbit included", |b| {
        b.iter(|| curve(&Response::new(orbit(black_box(&built))).expect("a response")));
    });
    criterion.bench_function("part: switched system", |b| b.iter(|| black_box(system())));
    criterion.bench_function("part: orbit", |b| b.iter(|| orbit(black_box(&built))));
    criterion.bench_function("part: linearised orbit", |b| b.iter(|| Response::new(black_box(&found).clone())));
    criterion.bench_function("part: loop gain at 500 frequencies", |b| b.iter(|| curve(black_box(&response))));
    criterion.bench_function("part: multipliers", |b| b.iter(|| Stability::new(black_box(&response))));
    criterion.bench_function("part: stress table", |b| b.iter(|| black_box(&found).figures()));
}

criterion_group!(benches, exact);
criterion_main!(benches);
