//! The exact results that the session keeps beside the averaged ones: which are wanted, and the latest of each.

use crate::analysis::{self, Analysis, Referee, Request, Steady};
use crate::design::CheckedDesign;
use crate::finding::Finding;

/// Which exact results are looked at.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Wanted {
    /// Curves, margins, multipliers.
    pub referee: bool,
    /// Waveforms of a steady period.
    pub steady: bool,
}

/// Exact results of one design at one condition, as far as they are wanted.
#[derive(Debug, Default)]
pub(super) struct Found {
    referee: Option<Result<Referee, Finding>>,
    steady: Option<Result<Steady, Finding>>,
}

impl Found {
    /// Works out what is wanted.
    pub(super) fn work_out(design: &CheckedDesign, request: &Request, wanted: Wanted) -> Self {
        Found {
            referee: wanted.referee.then(|| analysis::referee(design, request)),
            steady: wanted.steady.then(|| analysis::steady(design, request.shown)),
        }
    }
}

/// The analysis, and beside it on another thread what is wanted of the exact side.
pub(super) fn beside(design: &CheckedDesign, request: &Request, wanted: Wanted) -> (Analysis, Found) {
    if wanted == Wanted::default() {
        return (analysis::analyse(design, request), Found::default());
    }
    std::thread::scope(|scope| {
        let exact = std::thread::Builder::new().spawn_scoped(scope, || Found::work_out(design, request, wanted));
        let analysis = analysis::analyse(design, request);
        // Where no thread is to be had, or it was lost, this one does the work.
        let found = exact.ok().and_then(|exact| exact.join().ok());
        (analysis, found.unwrap_or_else(|| Found::work_out(design, request, wanted)))
    })
}

/// The latest exact results.
#[derive(Debug, Default)]
pub(super) struct Exact {
    wanted: Wanted,
    found: Found,
    /// Decimal logarithms of the frequencies of its curves [Hz].
    log_hz: Vec<f64>,
}

impl Exact {
    /// Says what is wanted; true when that has changed.
    pub(super) fn ask(&mut self, wanted: Wanted) -> bool {
        let moved = self.wanted != wanted;
        self.wanted = wanted;
        moved
    }

    /// What is wanted of the design that is shown; nothing of one that is not.
    pub(super) fn wanted_now(&self, shown: bool) -> Wanted {
        if shown { self.wanted } else { Wanted::default() }
    }

    /// What the switched model says of the condition shown.
    pub(super) fn referee(&self) -> Option<&Result<Referee, Finding>> {
        self.found.referee.as_ref()
    }

    /// Decimal logarithms of the frequencies of its curves [Hz].
    pub(super) fn log_hz(&self) -> &[f64] {
        &self.log_hz
    }

    /// One steady period.
    pub(super) fn steady(&self) -> Option<&Result<Steady, Finding>> {
        self.found.steady.as_ref()
    }

    /// Takes new results over; what was not wanted goes, for it would be out of date.
    pub(super) fn take(&mut self, found: Found) {
        let curves = found.referee.as_ref().and_then(|exact| exact.as_ref().ok()).map(|exact| &exact.curves);
        self.log_hz = curves.map(|c| c.frequencies_hz.iter().map(|f| f.log10()).collect()).unwrap_or_default();
        self.found = found;
    }
}
