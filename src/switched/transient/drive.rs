//! What drives the system from outside: signals of straight lines, with jumps where they are asked for.

/// A signal made of straight lines.
#[derive(Clone, Debug, PartialEq)]
pub struct Signal {
    /// Begin [s], value there, slope [1/s]; by rising time, the first long before the run.
    lines: Vec<(f64, f64, f64)>,
}

impl Signal {
    /// A signal that stays.
    pub fn constant(value: f64) -> Self {
        Signal { lines: vec![(f64::NEG_INFINITY, value, 0.0)] }
    }

    /// The signal from a time on changed by a ramp of some length; a length of zero is a jump. Times must rise from call to call.
    #[must_use]
    pub fn ramp(mut self, from: f64, change: f64, length: f64) -> Self {
        let (value, slope) = self.at(from);
        if length > 0.0 {
            self.lines.push((from, value, slope + change / length));
            self.lines.push((from + length, value + change + slope * length, slope));
        } else {
            self.lines.push((from, value + change, slope));
        }
        self
    }

    /// Value and slope just after a time.
    pub(super) fn at(&self, time: f64) -> (f64, f64) {
        let line = self.lines.iter().rev().find(|line| line.0 <= time).or(self.lines.first());
        match line {
            Some((from, value, slope)) if *slope != 0.0 => (value + slope * (time - from), *slope),
            Some((_, value, _)) => (*value, 0.0),
            None => (0.0, 0.0),
        }
    }

    /// The signal raised by a constant.
    #[must_use]
    pub(super) fn raised(mut self, by: f64) -> Self {
        self.lines.iter_mut().for_each(|line| line.1 += by);
        self
    }

    /// Whether it never changes.
    pub(super) fn stays(&self) -> bool {
        self.lines.len() < 2
    }

    /// The next time after `time` at which another line begins.
    pub(super) fn next(&self, time: f64) -> f64 {
        self.lines.iter().map(|line| line.0).find(|from| *from > time).unwrap_or(f64::INFINITY)
    }

    /// Greatest value it ever has.
    pub(super) fn greatest(&self) -> f64 {
        self.lines.iter().map(|line| line.1).fold(f64::NEG_INFINITY, f64::max)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_follow_each_other() {
        let signal = Signal::constant(2.0).ramp(1.0, 3.0, 0.5).ramp(4.0, -1.0, 0.0);
        for (time, value, slope) in
            [(0.0, 2.0, 0.0), (1.0, 2.0, 6.0), (1.25, 3.5, 6.0), (1.5, 5.0, 0.0), (4.0, 4.0, 0.0), (9.0, 4.0, 0.0)]
        {
            let (v, s) = signal.at(time);
            assert!((v - value).abs() < 1e-12 && (s - slope).abs() < 1e-12, "{time}: {v} {s}");
        }
        assert!((signal.next(0.0) - 1.0).abs() < 1e-15 && signal.next(4.0).is_infinite());
        assert!((signal.greatest() - 5.0).abs() < 1e-15);
    }
}
