//! Benchmarks of the linear room: W1 response, W2 margins, W3 step; the same loop as in `tests/bench/peers.py`.

#![allow(missing_docs, reason = "the macros of criterion make public items")]
#![expect(clippy::expect_used, reason = "a benchmark may stop at a wrong value")]

use std::f64::consts::TAU;
use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use polewright::linear::{
    Complex, FactoredResponse, Modes, RampStep, StateSpace, UniformGrid, Verdict, Zpk, closed_loop_verdict, expm,
    margins, step_response,
};

/// A boost-like plant behind a type III compensator and an amplifier: six poles, four zeros, one of them in the right half-plane.
fn loop_gain() -> Zpk {
    let (lc_hz, q): (f64, f64) = (2e3, 3.0);
    let lc = Complex::new(-0.5 / q, (1.0 - 0.25 / (q * q)).sqrt()) * (TAU * lc_hz);
    let real = |f: f64| Complex::new(-TAU * f, 0.0);
    let zeros = vec![real(1.6e3), real(2.2e3), real(80e3), real(-45e3)];
    let poles = vec![Complex::ZERO, lc, lc.conj(), real(60e3), real(150e3), real(800e3)];
    let (unity_hz, plant_gain) = (264.0, 20.0);
    let over: Complex = poles[1..].iter().map(|p| -p).product();
    let under: Complex = zeros.iter().map(|z| -z).product();
    Zpk::new(zeros, poles, plant_gain * TAU * unity_hz * (over / under).re).expect("roots in pairs")
}

fn closed_loop(open: &Zpk) -> StateSpace {
    open.cascade().and_then(|system| system.negative_feedback()).expect("strictly proper")
}

// What peers.py prints of the same loop.
const CROSSOVER_HZ: f64 = 7033.25062092;
const PHASE_MARGIN_DEG: f64 = 51.9692389;
const GAIN_MARGIN_DB: f64 = 17.24737739;
const MODULUS_MARGIN: f64 = 0.7917535988913571;
const STEP_AT_100_US: f64 = 1.0712147573565434;

/// Stops when the loop is not the one the Python side times; its numbers, from its printout.
fn check(open: &FactoredResponse, closed: &StateSpace) {
    let near =
        |actual: f64, expected: f64| assert!((actual / expected - 1.0).abs() < 1e-6, "{actual} is not {expected}");
    let found = margins(open, 0.3, 150e3);
    near(found.crossovers[0].frequency_hz, CROSSOVER_HZ);
    near(found.crossovers[0].phase_margin_deg, PHASE_MARGIN_DEG);
    near(found.gain_margin_up_db().expect("a phase crossing"), GAIN_MARGIN_DB);
    near(found.modulus_margin, MODULUS_MARGIN);
    let step = step_response(closed, 0, 0, UniformGrid { step_s: 1e-6, count: 1000 }, RampStep::ideal(1.0));
    near(step.expect("stable")[100], STEP_AT_100_US);
    assert_eq!(closed_loop_verdict(&closed.poles().expect("finite"), open), Verdict::Stable { conditionally: false });
}

fn tasks(criterion: &mut Criterion) {
    let zpk = loop_gain();
    let open = FactoredResponse::new(zpk.clone(), 0.0);
    let closed = closed_loop(&zpk);
    check(&open, &closed);

    let frequencies: Vec<f64> = (0..2000).map(|k| 10.0 * 15e3_f64.powf(f64::from(k) / 1999.0)).collect();
    let (mut gain, mut phase) = (vec![0.0; 2000], vec![0.0; 2000]);
    criterion.bench_function("W1 response of a 6-state loop at 2,000 points", |b| {
        b.iter(|| open.curve(black_box(&frequencies), &mut gain, &mut phase));
    });
    criterion.bench_function("W2 all margins", |b| b.iter(|| margins(black_box(&open), 0.3, 150e3)));
    let grid = UniformGrid { step_s: 1e-6, count: 1000 };
    criterion.bench_function("W3 closed-loop step of 1,000 points", |b| {
        b.iter(|| step_response(black_box(&closed), 0, 0, grid, RampStep::ideal(1.0)));
    });
}

/// What W8 is made of.
fn parts(criterion: &mut Criterion) {
    let zpk = loop_gain();
    let open = FactoredResponse::new(zpk.clone(), 0.3e-6);
    let closed = closed_loop(&zpk);
    let poles = closed.poles().expect("finite");
    let modes = Modes::with_poles(&closed, &poles).expect("stable");
    let event = RampStep { from: 0.0, to: 1.0, rise_s: 1e-6 };
    criterion.bench_function("part: poles of a 6-state loop", |b| b.iter(|| black_box(&closed).poles()));
    criterion.bench_function("part: zeros, poles and gain of a 6-state loop", |b| {
        b.iter(|| Zpk::from_state_space(black_box(&closed), 0, 0));
    });
    criterion.bench_function("part: verdict", |b| b.iter(|| closed_loop_verdict(black_box(&poles), &open)));
    criterion.bench_function("part: modes", |b| b.iter(|| Modes::with_poles(black_box(&closed), &poles)));
    criterion.bench_function("part: settling from modes", |b| b.iter(|| modes.settle(0, 0, black_box(event), 0.01)));
    criterion.bench_function("part: step and settling of a slewed event, 1,000 points", |b| {
        b.iter(|| step_response(black_box(&closed), 0, 0, UniformGrid { step_s: 1e-6, count: 1000 }, event));
    });
    let small = &closed.a * 1e-6;
    criterion.bench_function("part: exponential 6 × 6", |b| b.iter(|| expm(black_box(&small))));
}

criterion_group!(benches, tasks, parts);
criterion_main!(benches);
