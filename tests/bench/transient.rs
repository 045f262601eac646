//! Benchmark W7: 5,000 switching periods of the built-in boost with its loop closed, from the exact steady period through a load step, with
//! the waveforms of a plot.

#![allow(missing_docs, reason = "the macros of criterion make public items")]
#![expect(clippy::expect_used, reason = "a benchmark may stop at a wrong value")]

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use polewright::analysis::{Condition, Level, Shown, TransientEvent, TransientRequest, transient};
use polewright::design::sample;
use polewright::switched::{Cancel, Progress};

/// Columns of the plot in a window 1280 wide.
const COLUMNS: usize = 650;
/// Switching periods after the step; a twentieth more is shown ahead of it.
const PERIODS: f64 = 4761.0;

fn follow(criterion: &mut Criterion) {
    let checked = sample::built_in().check().expect("the built-in design is sound");
    let condition = Condition::shown(&checked.stage, Shown::Levels(Level::Nominal, Level::Nominal));
    let mut run = |name: &str, periods: f64| {
        let span_s = Some(periods / checked.stage.switching_frequency);
        let request = TransientRequest { event: TransientEvent::LoadStep, columns: COLUMNS, span_s };
        let once = || {
            let (cancel, progress) = (Cancel::new(), Progress::new());
            transient(black_box(&checked), &condition, &request, &cancel, &progress, &mut |_| {}).expect("it runs")
        };
        let result = once();
        assert!(result.notices.iter().all(|notice| !notice.is_problem()), "{:?}", result.notices);
        criterion.bench_function(name, |b| b.iter(once));
    };
    run("W7 5,000 periods of the closed loop", PERIODS);
    run("part: what does not grow with the periods, and 22 of them", 20.0);
}

criterion_group!(benches, follow);
criterion_main!(benches);
