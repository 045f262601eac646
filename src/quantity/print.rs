//! Writing numbers in engineering notation: rounded for people, exact for files and fields.
//!
//! *Conventions*: a power of ten that is a multiple of three, as an SI prefix where the unit has one. For people a minus is
//! U+2212, as in print; exact text has the hyphen that keyboards type. Trailing zeros are left out.

use super::Unit;

/// Significant digits of [`print`]: a reading as good as the parts it comes from.
const DIGITS: usize = 4;

/// Most decimals of angles, decibels and per cent: below that is rounding noise, not information.
const MOST_DECIMALS: i32 = 3;

/// Zeros written after the point before an exponent is used instead.
const MOST_PADDING: i32 = 4;

/// Places written before the point, less one, before an exponent is used instead: an amplifier's gain of 1000000 is still plain.
const MOST_WHOLE: i32 = 6;

/// A number for people: four significant digits, `4.79 kHz`, `−3.2 dB`.
pub fn print(value: f64, unit: Unit) -> String {
    print_digits(value, unit, DIGITS)
}

/// A number for people with the given count of significant digits.
pub fn print_digits(value: f64, unit: Unit, digits: usize) -> String {
    if value.is_nan() {
        return "undefined".into();
    }
    if value.is_infinite() {
        return with_unit(if value > 0.0 { "∞" } else { "−∞" }, "", unit);
    }
    let digits = digits.clamp(1, 17);
    let mut text = format!("{value:.*e}", digits - 1);
    if unit.prefixes().len() == 1 {
        // A cap on the decimals: 1e-13 dB is rounding noise and reads as zero.
        let decimals = usize::try_from(MOST_DECIMALS - unit.shift()).unwrap_or(0);
        let rounded: f64 = text.parse().unwrap_or(value);
        let capped: f64 = format!("{rounded:.decimals$}").parse().unwrap_or(value);
        text = format!("{capped:e}");
    }
    let text = render(&text, unit);
    match text.strip_prefix('-') {
        Some(magnitude) => format!("\u{2212}{magnitude}"),
        None => text,
    }
}

/// The shortest text that [`super::parse`] reads back to the same bits: `4.7 µF`. The value must be finite.
pub fn exact(value: f64, unit: Unit) -> String {
    let text = render(&format!("{value:e}"), unit);
    if value == 0.0 && value.is_sign_negative() { format!("-{text}") } else { text }
}

/// A number in pieces: sign, its digits without point or trailing zeros, the power of ten of the first digit.
struct Scientific {
    negative: bool,
    digits: String,
    exponent: i32,
    unit: Unit,
}

/// Text of Rust's `{:e}` in engineering notation with its unit. Every digit given is kept.
fn render(source: &str, unit: Unit) -> String {
    let (negative, unsigned) = match source.strip_prefix('-') {
        Some(rest) => (true, rest),
        None => (false, source),
    };
    let (mantissa, exponent) = unsigned.split_once('e').unwrap_or((unsigned, "0"));
    let digits: String = mantissa.chars().filter(char::is_ascii_digit).collect();
    let digits = digits.trim_end_matches('0').to_owned();
    if digits.is_empty() {
        return with_unit("0", "", unit);
    }
    let exponent = exponent.parse::<i32>().unwrap_or(0) - unit.shift();
    Scientific { negative, digits, exponent, unit }.text()
}

impl Scientific {
    fn text(&self) -> String {
        if self.unit.per_second_of().is_some() && self.exponent >= 3 {
            return self.slew();
        }
        let (prefix, power) = self.prefix();
        let places = self.exponent - power;
        if (-MOST_PADDING..=MOST_WHOLE).contains(&places) {
            with_unit(&self.plain(places), prefix, self.unit)
        } else {
            with_unit(&format!("{}e{}", self.plain(0), self.exponent), "", self.unit)
        }
    }

    /// The greatest prefix not above the number, else the least there is.
    fn prefix(&self) -> (&'static str, i32) {
        let table = if self.unit == Unit::One { &[("", 0)] } else { self.unit.prefixes() };
        let fitting = table.iter().rev().find(|(_, power)| *power <= self.exponent);
        fitting.or(table.first()).copied().unwrap_or(("", 0))
    }

    /// Digits with the point after the digit number `places` (0 is the first), zeros filled in on either side.
    fn plain(&self, places: i32) -> String {
        let sign = if self.negative { "-" } else { "" };
        match usize::try_from(places) {
            Err(_) => {
                let zeros = "0".repeat(usize::try_from(-places - 1).unwrap_or(0));
                format!("{sign}0.{zeros}{}", self.digits)
            }
            Ok(places) if places + 1 >= self.digits.len() => {
                format!("{sign}{}{}", self.digits, "0".repeat(places + 1 - self.digits.len()))
            }
            Ok(places) => {
                let (whole, fraction) = self.digits.split_at(places + 1);
                format!("{sign}{whole}.{fraction}")
            }
        }
    }

    /// A slew of 1000 per second or more: per ms, µs or ns, as edges are spoken of.
    fn slew(&self) -> String {
        let (time, power) = match self.exponent {
            9.. => ("ns", 9),
            6.. => ("µs", 6),
            _ => ("ms", 3),
        };
        let places = self.exponent - power;
        let above = self.unit.per_second_of().unwrap_or_default();
        if places > MOST_WHOLE {
            return with_unit(&format!("{}e{}", self.plain(0), self.exponent), "", self.unit);
        }
        format!("{} {above}/{time}", self.plain(places))
    }
}

fn with_unit(number: &str, prefix: &str, unit: Unit) -> String {
    match unit {
        Unit::One => number.to_owned(),
        Unit::Degree => format!("{number}°"),
        _ => format!("{number} {prefix}{}", unit.symbol()),
    }
}
