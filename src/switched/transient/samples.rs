//! Samples of the running converter: the recorded probes at both sides of every edge and at some points between.

use super::flow::multiply;
use super::mode::Mode;
use super::waveforms::Waveforms;

/// Where samples go.
#[derive(Clone, Debug)]
pub(super) struct Samples {
    /// The recorded probes at the last sample.
    pub(super) values: Vec<f64>,
    pub(super) waveforms: Waveforms,
    /// Steps of the first table between samples within an interval.
    spacing: usize,
    /// One period in so many is sampled within its intervals; the edges of all are.
    pub(super) every: u64,
    /// Greatest value of each probe so far, and least.
    pub(super) greatest: Vec<f64>,
    pub(super) least: Vec<f64>,
    /// Times at which the values are kept one by one [s], rising, and those values.
    times_s: Vec<f64>,
    pub(super) kept: Vec<Vec<f64>>,
    state: Vec<f64>,
    count: usize,
}

impl Samples {
    /// Of some probes into waveforms.
    pub(super) fn new(waveforms: Waveforms, (spacing, every): (usize, u64), times_s: Vec<f64>) -> Self {
        let count = waveforms.traces.len();
        Samples {
            values: Vec::new(),
            waveforms,
            spacing: spacing.max(1),
            every: every.max(1),
            greatest: vec![f64::NEG_INFINITY; count],
            least: vec![f64::INFINITY; count],
            times_s,
            kept: Vec::new(),
            state: Vec::new(),
            count,
        }
    }

    /// The next time at which the values are kept [s].
    pub(super) fn next_s(&self) -> f64 {
        self.times_s.get(self.kept.len()).copied().unwrap_or(f64::INFINITY)
    }

    /// Reads the probes off an extended state.
    pub(super) fn probe(&mut self, mode: &Mode, z: &[f64]) {
        self.values.resize(mode.probe_stride, 0.0);
        multiply(&mode.probes, &z[..mode.flow.n + mode.flow.m], &mut self.values);
    }

    /// Takes the values read last.
    pub(super) fn take(&mut self, time_s: f64) {
        let values = &self.values[..self.count.min(self.values.len())];
        for ((greatest, least), value) in self.greatest.iter_mut().zip(&mut self.least).zip(values) {
            *greatest = greatest.max(*value);
            *least = least.min(*value);
        }
        self.waveforms.sample(time_s, values);
        if time_s >= self.next_s() {
            self.kept.push(values.to_vec());
        }
    }

    /// Forgets the extremes so far.
    pub(super) fn forget(&mut self) {
        self.greatest.fill(f64::NEG_INFINITY);
        self.least.fill(f64::INFINITY);
    }

    /// Samples within a stretch that began at `z` and `from_s`.
    pub(super) fn between(&mut self, mode: &Mode, z: &[f64], from_s: f64, elapsed: f64) {
        let flow = &mode.flow;
        let Some(step) = flow.tables.first().map(|table| table.step) else { return };
        let moving = z[flow.n + flow.m..].iter().any(|s| *s != 0.0);
        let mut steps = self.spacing;
        self.state.resize(flow.stride + flow.m, 0.0);
        while (steps as f64) * step < elapsed && steps <= 32 {
            let time = step * steps as f64;
            let mut state = std::mem::take(&mut self.state);
            flow.step(0, steps, z, moving, &mut state[..flow.stride]);
            state.copy_within(..flow.stride, 0);
            // The forcing signals stand right behind the states.
            state.resize(flow.n, 0.0);
            let signals = &z[flow.n..flow.n + flow.m];
            state.extend(signals.iter().zip(&z[flow.n + flow.m..]).map(|(w, s)| w + s * time));
            self.probe(mode, &state);
            state.resize(flow.stride + flow.m, 0.0);
            self.state = state;
            self.take(from_s + time);
            steps += self.spacing;
        }
    }
}
