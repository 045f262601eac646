//! Random numbers for planted and random designs: the same ones at every run, so that a failure comes back.
//!
//! *Source*: the generator is `SplitMix64` (Steele, Lea & Flood 2014), from memory; its quality is beyond what the checks need.

/// A stream of random numbers.
pub(crate) struct Random(u64);

impl Random {
    /// The stream of a seed.
    pub(crate) fn new(seed: u64) -> Self {
        Self(seed)
    }

    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Evenly spread from `low` to `high`.
    pub(crate) fn between(&mut self, low: f64, high: f64) -> f64 {
        let unit = (self.next() >> 11) as f64 / (1_u64 << 53) as f64;
        low + unit * (high - low)
    }

    /// Evenly spread in its logarithm.
    pub(crate) fn log(&mut self, low: f64, high: f64) -> f64 {
        self.between(low.ln(), high.ln()).exp()
    }

    /// One of a list.
    pub(crate) fn pick<'a, T>(&mut self, list: &'a [T]) -> &'a T {
        let last = list.len() - 1;
        let at = self.between(0.0, list.len() as f64).floor();
        let index = (0..last).find(|k| (*k as f64) >= at).unwrap_or(last);
        &list[index]
    }
}
