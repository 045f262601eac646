//! How far long work has come, and the wish to stop it.
//!
//! *Conventions*: both are handles; their copies mean the same work. Whoever works reads the wish at least every thousand
//! switching periods and gives back what it has by then.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};

/// The wish to stop some work.
#[derive(Clone, Debug, Default)]
pub struct Cancel(Arc<AtomicBool>);

impl Cancel {
    /// Nobody wishes to stop yet.
    pub fn new() -> Self {
        Self::default()
    }

    /// Wishes to stop; cannot be taken back.
    pub fn cancel(&self) {
        self.0.store(true, Ordering::Relaxed);
    }

    /// Whether somebody wishes to stop.
    pub fn is_cancelled(&self) -> bool {
        self.0.load(Ordering::Relaxed)
    }
}

/// The share of some work that is done.
#[derive(Clone, Debug, Default)]
pub struct Progress(Arc<AtomicU64>);

impl Progress {
    /// Nothing is done yet.
    pub fn new() -> Self {
        Self::default()
    }

    /// Says what share is done, 0 to 1; anything else counts as the nearer of the two.
    pub fn set(&self, share: f64) {
        let share = if share.is_nan() { 0.0 } else { share.clamp(0.0, 1.0) };
        self.0.store(share.to_bits(), Ordering::Relaxed);
    }

    /// The share that is done, 0 to 1.
    pub fn share(&self) -> f64 {
        f64::from_bits(self.0.load(Ordering::Relaxed))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn handles_speak_of_the_same_work() {
        let (cancel, progress) = (Cancel::new(), Progress::new());
        let (other_cancel, other_progress) = (cancel.clone(), progress.clone());
        assert!(!other_cancel.is_cancelled());
        assert_eq!(other_progress.share().to_bits(), 0.0_f64.to_bits());
        cancel.cancel();
        progress.set(0.25);
        assert!(other_cancel.is_cancelled());
        assert_eq!(other_progress.share().to_bits(), 0.25_f64.to_bits());
        for (set, held) in [(-1.0, 0.0), (2.0, 1.0), (f64::NAN, 0.0)] {
            progress.set(set);
            assert_eq!(progress.share().to_bits(), f64::to_bits(held), "{set}");
        }
    }
}
