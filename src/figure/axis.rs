//! Axes of plots: where a value stands on the screen, and which values get a line and a label.
//!
//! *Conventions*: an axis runs from `from` at `start` to `to` at `end`; for a vertical axis `start` is the lower edge, so
//! `start > end` in screen points. A logarithmic axis holds positive values only.

use crate::quantity::{self, Unit};

/// How values are spread along an axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Spacing {
    /// Equal distances for equal differences.
    Linear,
    /// Equal distances for equal ratios.
    Logarithmic,
}

/// A range of values laid along a range of the screen.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Axis {
    spacing: Spacing,
    low: f64,
    high: f64,
    start: f32,
    end: f32,
}

impl Axis {
    /// A linear axis from `from` at `start` to `to` at `end`.
    pub fn linear(from: f64, to: f64, start: f32, end: f32) -> Self {
        let high = if to > from { to } else { from + 1.0 };
        Axis { spacing: Spacing::Linear, low: from, high, start, end }
    }

    /// A logarithmic axis from `from` at `start` to `to` at `end`; both positive.
    pub fn logarithmic(from: f64, to: f64, start: f32, end: f32) -> Self {
        let low = from.max(f64::MIN_POSITIVE).log10();
        let high = to.max(f64::MIN_POSITIVE).log10();
        Axis { spacing: Spacing::Logarithmic, ..Axis::linear(low, high, start, end) }
    }

    /// Screen position of a value [points].
    pub fn at(&self, value: f64) -> f32 {
        self.at_inner(match self.spacing {
            Spacing::Linear => value,
            Spacing::Logarithmic => value.max(f64::MIN_POSITIVE).log10(),
        })
    }

    /// Screen position of a value already in the axis' own measure: its decimal logarithm on a logarithmic axis.
    pub fn at_inner(&self, inner: f64) -> f32 {
        let share = ((inner - self.low) / (self.high - self.low)).clamp(-100.0, 100.0);
        let length = f64::from(self.end) - f64::from(self.start);
        narrow(f64::from(self.start) + share * length)
    }

    /// Value at a screen position.
    pub fn value(&self, position: f32) -> f64 {
        let share = f64::from(position - self.start) / f64::from(self.end - self.start);
        let inner = self.low + share * (self.high - self.low);
        match self.spacing {
            Spacing::Linear => inner,
            Spacing::Logarithmic => 10f64.powf(inner),
        }
    }

    /// True when the value lies on the axis.
    pub fn holds(&self, value: f64) -> bool {
        let inner = match self.spacing {
            Spacing::Linear => value,
            Spacing::Logarithmic => value.max(f64::MIN_POSITIVE).log10(),
        };
        (self.low..=self.high).contains(&inner)
    }

    /// Smallest and greatest value.
    pub fn range(&self) -> (f64, f64) {
        match self.spacing {
            Spacing::Linear => (self.low, self.high),
            Spacing::Logarithmic => (10f64.powf(self.low), 10f64.powf(self.high)),
        }
    }
}

/// Least and greatest of the finite values.
pub fn extent(values: impl Iterator<Item = f64>) -> Option<(f64, f64)> {
    values.filter(|value| value.is_finite()).fold(None, |range, value| match range {
        None => Some((value, value)),
        Some((least, greatest)) => Some((f64::min(least, value), f64::max(greatest, value))),
    })
}

/// A screen coordinate from a number worked out in double precision; the loss is far below a pixel.
#[expect(clippy::cast_possible_truncation, reason = "screen coordinates are a few thousand points at most")]
pub fn narrow(value: f64) -> f32 {
    value as f32
}

/// A line of a decade grid.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DecadeLine {
    /// Where it stands.
    pub value: f64,
    /// 1 on a decade, 2 to 9 within it.
    pub digit: u8,
}

/// Lines of a decade grid within a range, rising; at most twenty decades.
pub fn decade_lines(from: f64, to: f64) -> impl Iterator<Item = DecadeLine> {
    let first = from.max(f64::MIN_POSITIVE).log10().floor();
    (0..20_u8)
        .flat_map(move |decade| {
            let base = 10f64.powf(first + f64::from(decade));
            (1..10_u8).map(move |digit| DecadeLine { value: base * f64::from(digit), digit })
        })
        .filter(move |line| line.value >= from * 0.999_999)
        .take_while(move |line| line.value <= to * 1.000_001)
}

/// The step of a linear grid: 1, 2 or 5 times a power of ten, so that at most `most` steps fit into `span`.
pub fn nice_step(span: f64, most: f64) -> f64 {
    let raw = (span / most).max(f64::MIN_POSITIVE);
    let decade = 10f64.powf(raw.log10().floor());
    let scaled = raw / decade;
    let factor = if scaled <= 1.0 + 1e-9 {
        1.0
    } else if scaled <= 2.0 + 1e-9 {
        2.0
    } else if scaled <= 5.0 + 1e-9 {
        5.0
    } else {
        10.0
    };
    factor * decade
}

/// Multiples of `step` within a range, rising; at most two hundred.
pub fn multiples(from: f64, to: f64, step: f64) -> impl Iterator<Item = f64> {
    let first = (from / step - 1e-6).ceil();
    (0..200_u16).map(move |index| (first + f64::from(index)) * step).take_while(move |value| *value <= to + step * 1e-6)
}

/// Label of a grid line. Zeros behind the last digit are not printed, so six digits say what the grid needs and no more.
pub fn grid_label(value: f64, step: f64, unit: Unit) -> String {
    let value = if value.abs() < step * 1e-6 { 0.0 } else { value };
    quantity::print_digits(value, unit, 6)
}

/// Value of a sampled curve between its points, or nothing outside them. `xs` rises.
pub fn interpolate(xs: &[f64], ys: &[f64], x: f64) -> Option<f64> {
    let after = xs.partition_point(|at| *at < x);
    if after == 0 {
        return (*xs.first()? - x).abs().lt(&1e-9).then(|| ys.first().copied()).flatten();
    }
    let (x0, x1) = (*xs.get(after - 1)?, *xs.get(after)?);
    let (y0, y1) = (*ys.get(after - 1)?, *ys.get(after)?);
    Some(y0 + (y1 - y0) * (x - x0) / (x1 - x0))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_position_goes_back_to_its_value() {
        let axis = Axis::logarithmic(10.0, 1e6, 56.0, 756.0);
        for frequency in [10.0, 123.0, 4_790.0, 1e6] {
            let back = axis.value(axis.at(frequency));
            assert!((back / frequency - 1.0).abs() < 1e-5, "{frequency} came back as {back}");
        }
        assert!((axis.at(1e3) - (56.0 + 700.0 * 2.0 / 5.0)).abs() < 1e-3);
    }

    #[test]
    fn a_vertical_axis_grows_upward() {
        let axis = Axis::linear(-60.0, 60.0, 300.0, 100.0);
        assert!((axis.at(0.0) - 200.0).abs() < 1e-4);
        assert!(axis.at(20.0) < axis.at(0.0));
        assert!(axis.holds(60.0) && !axis.holds(61.0));
    }

    #[test]
    fn a_decade_has_nine_lines() {
        let lines: Vec<_> = decade_lines(10.0, 1_000.0).collect();
        assert_eq!(lines.len(), 19);
        assert_eq!(lines.iter().filter(|line| line.digit == 1).count(), 3);
        assert!((lines[0].value - 10.0).abs() < 1e-9);
    }

    #[test]
    fn between_points_a_curve_is_straight() {
        let (xs, ys) = ([0.0, 1.0, 3.0], [5.0, 7.0, 3.0]);
        assert_eq!(interpolate(&xs, &ys, 2.0), Some(5.0));
        assert_eq!(interpolate(&xs, &ys, 0.0), Some(5.0));
        assert_eq!(interpolate(&xs, &ys, -0.1), None);
        assert_eq!(interpolate(&xs, &ys, 3.1), None);
    }

    #[test]
    fn steps_are_one_two_or_five() {
        assert!((nice_step(0.45, 5.0) - 0.1).abs() < 1e-12);
        assert!((nice_step(120.0, 7.0) - 20.0).abs() < 1e-12);
        assert!((nice_step(3.1e-3, 4.0) - 1e-3).abs() < 1e-12);
        let marks: Vec<f64> = multiples(-100.0, 80.0, 45.0).collect();
        assert_eq!(marks, vec![-90.0, -45.0, 0.0, 45.0]);
    }
}
