//! First sizes of a topology's own parts for a new design, from lossless forms.

/// What a first size may follow from.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sizing {
    /// Least and greatest input voltage [V].
    pub input: (f64, f64),
    /// Output voltage, as a magnitude [V].
    pub output: f64,
    /// Greatest load current [A].
    pub load: f64,
    /// Switching frequency of the pulses [Hz].
    pub switching_frequency: f64,
    /// The inductance, where it is given [H].
    pub inductance: Option<f64>,
}

/// A number or an option.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Size {
    /// A number [SI unit of its entry].
    Value(f64),
    /// Key of an option of a choice.
    Option(&'static str),
}

/// A first size of one entry, or what to choose.
#[derive(Clone, Debug, PartialEq)]
pub struct Sized {
    /// Path of the entry or choice.
    pub path: &'static str,
    /// The number or option.
    pub size: Size,
    /// Why it is so.
    pub reason: String,
    /// True for a rule of thumb of the trade, which no law stands behind.
    pub common_practice: bool,
}

impl Sized {
    /// A size by a rule of thumb, to two digits: more would pretend to know more.
    pub fn by_rule(path: &'static str, value: f64, reason: impl Into<String>) -> Self {
        Sized { path, size: Size::Value(two_digits(value)), reason: reason.into(), common_practice: true }
    }

    /// An option chosen by common practice.
    pub fn chosen(path: &'static str, key: &'static str, reason: impl Into<String>) -> Self {
        Sized { path, size: Size::Option(key), reason: reason.into(), common_practice: true }
    }
}

/// A positive number to two significant digits, as one would write it: 7.5e-6, not a rounding error beside it.
pub(super) fn two_digits(value: f64) -> f64 {
    let exponent = value.log10().floor() - 1.0;
    if !exponent.is_finite() {
        return value;
    }
    // Powers of ten with a positive exponent are exact as far as entries reach, those with a negative one are not.
    let power = 10_f64.powf(exponent.abs()).round();
    if exponent < 0.0 { (value * power).round() / power } else { (value / power).round() * power }
}

#[cfg(test)]
mod tests {
    use super::two_digits;

    #[test]
    fn two_digits_are_kept() {
        for (value, kept) in [(0.23456, 0.23), (1.0, 1.0), (98.7, 99.0), (4.567e-6, 4.6e-6)] {
            assert!((two_digits(value) / kept - 1.0).abs() < 1e-12, "{value}");
        }
        assert_eq!(two_digits(7.49999e-6).to_bits(), 7.5e-6_f64.to_bits());
        assert!(two_digits(f64::NAN).is_nan());
    }
}
