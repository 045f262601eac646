//! Preferred values of resistors and capacitors.
//!
//! *Source.* IEC 60063: E3, E6, E12 and E24 are tabulated (they are not the rounded powers); E48, E96 and E192 are 10^(i/n) to three
//! digits, with 9.20 in E192 as the one exception. From memory of the standard; the tests compare every series with the package
//! `eseries` of `PyPI`.
//!
//! *Conventions.* Nearest means nearest in ratio, as tolerances are ratios.

use super::entries::chosen;
use crate::quantity::Choices;

/// E24 in hundredths; every second one is E12, every fourth E6, every eighth E3.
const E24_HUNDREDTHS: [f64; 24] = [
    100.0, 110.0, 120.0, 130.0, 150.0, 160.0, 180.0, 200.0, 220.0, 240.0, 270.0, 300.0, 330.0, 360.0, 390.0, 430.0,
    470.0, 510.0, 560.0, 620.0, 680.0, 750.0, 820.0, 910.0,
];
/// The place in E192 where the standard departs from the rounded power, and what stands there, in hundredths.
const E192_EXCEPTION: (usize, f64) = (185, 920.0);
/// How far the upper divider resistor may move for the sake of the divider's ratio: one step of E24.
const DIVIDER_REACH: f64 = 1.1;
/// Two ratios nearer than this are the same; far below any tolerance, far above rounding.
const SAME_RATIO: f64 = 1e-9;

/// A series of preferred values.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Series {
    /// Not rounded.
    Exact,
    /// 3 values per decade.
    E3,
    /// 6 values per decade, usually 20 %.
    E6,
    /// 12 values per decade, usually 10 %.
    E12,
    /// 24 values per decade, usually 5 %.
    E24,
    /// 48 values per decade, usually 2 %.
    E48,
    /// 96 values per decade, usually 1 %.
    E96,
    /// 192 values per decade, usually 0.5 %.
    E192,
}

impl Series {
    /// Every series, coarse to fine, `Exact` first.
    pub const ALL: [Series; 8] =
        [Series::Exact, Series::E3, Series::E6, Series::E12, Series::E24, Series::E48, Series::E96, Series::E192];

    /// Its key in files and choices.
    pub fn key(self) -> &'static str {
        match self {
            Series::Exact => "exact",
            Series::E3 => "E3",
            Series::E6 => "E6",
            Series::E12 => "E12",
            Series::E24 => "E24",
            Series::E48 => "E48",
            Series::E96 => "E96",
            Series::E192 => "E192",
        }
    }

    /// The series of a key.
    pub fn from_key(key: &str) -> Option<Series> {
        Series::ALL.into_iter().find(|series| series.key() == key)
    }

    /// The series chosen for resistors and for capacitors.
    pub fn chosen(choices: &Choices) -> (Series, Series) {
        let series = |path| Series::from_key(chosen(choices, path)).unwrap_or(Series::Exact);
        (series("compensator.series.resistors"), series("compensator.series.capacitors"))
    }

    /// The values of one decade in hundredths, rising from 100 to below 1000; empty for `Exact`.
    fn hundredths(self) -> Vec<f64> {
        match self {
            Series::Exact => Vec::new(),
            Series::E3 => E24_HUNDREDTHS.into_iter().step_by(8).collect(),
            Series::E6 => E24_HUNDREDTHS.into_iter().step_by(4).collect(),
            Series::E12 => E24_HUNDREDTHS.into_iter().step_by(2).collect(),
            Series::E24 => E24_HUNDREDTHS.to_vec(),
            Series::E48 => powers(48),
            Series::E96 => powers(96),
            Series::E192 => {
                let mut values = powers(192);
                values[E192_EXCEPTION.0] = E192_EXCEPTION.1;
                values
            }
        }
    }

    /// The values of one decade, 1 up to below 10; empty for `Exact`.
    pub fn decade(self) -> Vec<f64> {
        self.hundredths().into_iter().map(|value| value / 100.0).collect()
    }

    /// Every value of the series from `least` to `greatest`, rising, both positive; empty for `Exact`.
    pub fn within(self, least: f64, greatest: f64) -> Vec<f64> {
        let usable = |bound: f64| bound.is_finite() && bound > 0.0;
        let decade = self.hundredths();
        let mut values = Vec::new();
        if decade.is_empty() || !usable(least) || !usable(greatest) {
            return values;
        }
        let mut exponent = decade_of(least);
        while scaled(100.0, exponent) <= greatest {
            values
                .extend(decade.iter().map(|&value| scaled(value, exponent)).filter(|v| (least..=greatest).contains(v)));
            exponent += 1;
        }
        values
    }

    /// The value of the series nearest to `value` in ratio; `value` itself for `Exact` or when it is not positive and finite.
    pub fn nearest(self, value: f64) -> f64 {
        // Neighbours of E3 lie a factor of 2.2 apart at most, so this range always holds both.
        let distance = |candidate: f64| (candidate / value).ln().abs();
        self.within(value / 2.5, value * 2.5)
            .into_iter()
            .min_by(|&a, &b| distance(a).total_cmp(&distance(b)))
            .unwrap_or(value)
    }
}

/// 10^(i/n) to three digits, in hundredths.
fn powers(count: u8) -> Vec<f64> {
    (0..count).map(|i| (100.0 * 10f64.powf(f64::from(i) / f64::from(count))).round()).collect()
}

/// Exponent of the decade that holds a positive value: 10^exponent ≤ value, up to rounding.
fn decade_of(value: f64) -> i32 {
    let mut exponent = 0;
    // Doubles span 632 decades, so both loops end.
    while scaled(100.0, exponent) > value && exponent > -400 {
        exponent -= 1;
    }
    while scaled(100.0, exponent + 1) <= value && exponent < 400 {
        exponent += 1;
    }
    exponent
}

/// `hundredths`/100 · 10^exponent, rounded once for exponents within ±20, so that 470 and −9 give the double written 4.7e-9.
fn scaled(hundredths: f64, exponent: i32) -> f64 {
    if exponent >= 2 { hundredths * 10f64.powi(exponent - 2) } else { hundredths / 10f64.powi(2 - exponent) }
}

/// A divider of preferred values: the pair with the ratio nearest to `upper / lower`, the upper one at most a step of E24 away.
///
/// A resistor that is kept stays as it is. Of pairs with the same ratio the one nearest to `upper` is taken. As the steps of a
/// series are nearly the same all over the decade, up to half a step of error can remain: 1.2 % of the ratio with E96.
pub fn round_ratio(upper: f64, lower: f64, series: Series, keep_upper: bool, keep_lower: bool) -> (f64, f64) {
    let ratio = upper / lower;
    if series == Series::Exact || (keep_upper && keep_lower) {
        return (upper, lower);
    }
    if keep_upper {
        return (upper, series.nearest(upper / ratio));
    }
    let mut candidates = series.within(upper / DIVIDER_REACH, upper * DIVIDER_REACH);
    candidates.push(series.nearest(upper));
    let away = |candidate: f64| (candidate / upper).ln().abs();
    candidates.sort_by(|&a, &b| away(a).total_cmp(&away(b)));
    let mut best = None;
    for candidate in candidates {
        let partner = if keep_lower { lower } else { series.nearest(candidate / ratio) };
        let error = (candidate / partner / ratio).ln().abs();
        if best.is_none_or(|(least, _)| error < least - SAME_RATIO) {
            best = Some((error, (candidate, partner)));
        }
    }
    best.map_or((upper, lower), |(_, pair)| pair)
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn nearest_is_the_double_one_would_type() {
        assert_eq!(Series::E12.nearest(4.6e-9).to_bits(), 4.7e-9f64.to_bits());
        assert_eq!(Series::E96.nearest(18.3e3).to_bits(), 18.2e3f64.to_bits());
        assert_eq!(Series::E192.nearest(9.19e-12).to_bits(), 9.2e-12f64.to_bits());
        assert_eq!(Series::E6.nearest(9.9e5).to_bits(), 1e6f64.to_bits());
        assert_eq!(Series::E3.nearest(1.4).to_bits(), 1f64.to_bits());
        assert_eq!(Series::Exact.nearest(1.2345).to_bits(), 1.2345f64.to_bits());
        assert!(Series::E24.nearest(f64::NAN).is_nan());
        assert_eq!(Series::E24.nearest(0.0).to_bits(), 0f64.to_bits());
    }

    #[test]
    fn every_option_of_the_choices_is_a_series() {
        assert_eq!(Series::chosen(&Choices::new()), (Series::E96, Series::E12));
        for row in crate::compensator::choices().filter(|row| row.path.starts_with("compensator.series.")) {
            let options: Vec<_> = row.options.iter().map(|option| Series::from_key(option.key).unwrap()).collect();
            assert_eq!(options, Series::ALL);
        }
    }

    #[test]
    fn a_divider_is_rounded_by_its_ratio() {
        // 5.0 V from 0.8 V: ratio 5.25; 10.5 k over 2 k is exact in E96, the nearest single values 10 k over 1.91 k are not.
        assert_eq!(round_ratio(10e3, 10e3 / 5.25, Series::E96, false, false), (10.5e3, 2e3));
        assert_eq!(round_ratio(10e3, 10e3 / 5.25, Series::E96, true, false), (10e3, 1.91e3));
        assert_eq!(round_ratio(10e3, 1.234e3, Series::E96, true, true), (10e3, 1.234e3));
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

        #[test]
        fn nearest_is_within_half_a_step_and_stays(exponent in -15.0f64..8.0, series in 1usize..8) {
            let series = Series::ALL[series];
            let value = 10f64.powf(exponent);
            let nearest = series.nearest(value);
            // The widest step of each series, from its table.
            let decade = series.decade();
            let widest = decade.windows(2).map(|pair| pair[1] / pair[0]).fold(10.0 / decade[decade.len() - 1], f64::max);
            prop_assert!((nearest / value).ln().abs() <= 0.5 * widest.ln() + 1e-12);
            prop_assert_eq!(series.nearest(nearest).to_bits(), nearest.to_bits());
        }

        #[test]
        fn a_rounded_divider_stays(upper in 1e3f64..1e6, ratio in 0.1f64..50.0) {
            let (a, b) = round_ratio(upper, upper / ratio, Series::E96, false, false);
            prop_assert_eq!(round_ratio(a, b, Series::E96, false, false), (a, b));
        }
    }
}
