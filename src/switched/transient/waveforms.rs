//! Waveforms thinned to the columns of a plot: of every column the least and the greatest value stay.

use super::flow::whole;
use crate::quantity::Unit;

/// One signal over time.
#[derive(Clone, Debug, PartialEq)]
pub struct Trace {
    /// What it is.
    pub name: String,
    /// Its unit: volt or ampere.
    pub unit: Unit,
    /// Least value in each column.
    pub least: Vec<f64>,
    /// Greatest value in each column.
    pub greatest: Vec<f64>,
}

/// Signals over time, thinned to columns of equal width.
#[derive(Clone, Debug, PartialEq)]
pub struct Waveforms {
    /// Time at which the first column begins [s]; the event begins at 0.
    pub from_s: f64,
    /// Width of a column [s].
    pub column_s: f64,
    /// Columns that are filled; in every trace the values up to here count.
    pub filled: usize,
    /// The signals.
    pub traces: Vec<Trace>,
    /// The sample before, and its time [s].
    last: Vec<f64>,
    last_s: f64,
}

impl Waveforms {
    /// Empty columns from `from_s` to `to_s`.
    pub(super) fn new(signals: &[(String, Unit)], from_s: f64, to_s: f64, columns: usize) -> Self {
        let columns = columns.max(1);
        let traces = signals.iter().map(|(name, unit)| Trace {
            name: name.clone(),
            unit: *unit,
            least: vec![f64::INFINITY; columns],
            greatest: vec![f64::NEG_INFINITY; columns],
        });
        Waveforms {
            from_s,
            column_s: (to_s - from_s) / columns as f64,
            filled: 0,
            traces: traces.collect(),
            last: Vec::new(),
            last_s: from_s,
        }
    }

    /// Columns in all.
    pub fn columns(&self) -> usize {
        self.traces.first().map_or(0, |trace| trace.least.len())
    }

    /// Middle of a column [s].
    pub fn time_s(&self, column: usize) -> f64 {
        self.from_s + (column as f64 + 0.5) * self.column_s
    }

    /// The signal of that name.
    pub fn trace(&self, name: &str) -> Option<&Trace> {
        self.traces.iter().find(|trace| trace.name == name)
    }

    /// Takes a sample; times do not fall.
    pub(super) fn sample(&mut self, time_s: f64, values: &[f64]) {
        let place = whole((time_s - self.from_s) / self.column_s);
        let place = place.min(self.columns().saturating_sub(1));
        if place >= self.filled {
            self.bridge(place, time_s, values);
        }
        for (trace, value) in self.traces.iter_mut().zip(values) {
            if let (Some(least), Some(greatest)) = (trace.least.get_mut(place), trace.greatest.get_mut(place)) {
                *least = least.min(*value);
                *greatest = greatest.max(*value);
            }
        }
        self.last.clear();
        self.last.extend_from_slice(values);
        self.last_s = time_s;
    }

    /// Columns that no sample fell into lie on the straight line between their neighbours.
    fn bridge(&mut self, place: usize, time_s: f64, values: &[f64]) {
        let (last_s, from) = (self.last_s, self.filled);
        for k in from..place {
            let share =
                if time_s > last_s { ((self.time_s(k) - last_s) / (time_s - last_s)).clamp(0.0, 1.0) } else { 1.0 };
            for ((trace, before), value) in self.traces.iter_mut().zip(&self.last).zip(values) {
                let between = before + share * (value - before);
                trace.least[k] = between;
                trace.greatest[k] = between;
            }
        }
        self.filled = place + 1;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn extremes_of_every_column_are_kept() {
        let mut waveforms = Waveforms::new(&[("output voltage".to_owned(), Unit::Volt)], -1.0, 9.0, 10);
        for (time, value) in [(-1.0, 1.0), (-0.5, 3.0), (-0.2, -2.0), (0.0, 5.0), (4.0, 7.0), (9.0, 8.0)] {
            waveforms.sample(time, &[value]);
        }
        let trace = waveforms.trace("output voltage").unwrap();
        assert_eq!(waveforms.filled, 10);
        assert_eq!(trace.least[..6], [-2.0, 5.0, 5.75, 6.25, 6.75, 7.0]);
        assert_eq!(trace.greatest[..6], [3.0, 5.0, 5.75, 6.25, 6.75, 7.0]);
        assert_eq!(trace.greatest[9].to_bits(), 8.0_f64.to_bits());
        assert!((waveforms.time_s(0) + 0.5).abs() < 1e-15);
    }
}
