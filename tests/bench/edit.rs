//! Benchmark W8: one edit of the built-in boost → check → all nine conditions → the curves a window draws.

#![allow(missing_docs, reason = "the macros of criterion make public items")]
#![expect(clippy::expect_used, reason = "a benchmark may stop at a wrong value")]

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use polewright::analysis::{Level, Request, Shown, analyse};
use polewright::design::sample;

/// Columns of the Bode plots in a window 1280 wide.
const COLUMNS: usize = 650;

fn edit(criterion: &mut Criterion) {
    let mut design = sample::built_in();
    let checked = design.check().expect("the built-in design is sound");
    let request =
        Request::spanning(Shown::Levels(Level::Least, Level::Greatest), checked.stage.switching_frequency, COLUMNS);
    assert!(analyse(&checked, &request).all_met(), "the built-in design meets its requirements");
    let mut turn = 0_u32;
    criterion.bench_function("W8 one edit, nine conditions, plot data", |b| {
        b.iter(|| {
            // Never the same value twice in a row, so that nothing could be kept from the last edit.
            turn = (turn + 1) % 100;
            design.values.set("compensator.c1", 56e-9 * (1.0 + 1e-4 * f64::from(turn))).expect("finite");
            let checked = design.check().expect("sound");
            analyse(black_box(&checked), &request)
        });
    });
    criterion.bench_function("part: check of a design", |b| b.iter(|| black_box(&design).check()));
    criterion.bench_function("part: analysis of a checked design", |b| {
        b.iter(|| analyse(black_box(&checked), &request));
    });
}

criterion_group!(benches, edit);
criterion_main!(benches);
