//! Reading engineering notation: `4.7u`, `4.7 µF`, `22k`, `2k2`, `4R7`, `1.5 MHz`, `1e-6`, `5 %`, `1 A/µs`.
//!
//! *Conventions*: the decimal mark is a point. The text is turned into one decimal number (digits and a power of ten) and
//! converted once, so the result is the `f64` nearest to what was written. A prefix may stand without its unit. Capital and
//! small letters of a prefix differ in meaning (mHz, MHz), except `K`, which is read as kilo.
//! *Bad input*: everything else is refused with a reason and, where one can be given, a hint.

use super::Unit;

/// Why a text is not a number of the wanted unit.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ParseError {
    /// What is wrong, as a sentence without full stop.
    pub reason: String,
    /// What to write instead.
    pub hint: String,
}

impl std::fmt::Display for ParseError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{}; {}", self.reason, self.hint)
    }
}

impl std::error::Error for ParseError {}

/// Longest text looked at [characters]; a number needs no more, and a pasted file should not be echoed.
const LONGEST_TEXT: usize = 120;

/// A decimal number in pieces: `sign whole.fraction · 10^exponent`.
struct Decimal {
    negative: bool,
    whole: String,
    fraction: String,
    exponent: i32,
}

impl Decimal {
    /// The nearest `f64`, refusing what overflows or vanishes.
    fn value(&self, shown: &str, unit: Unit) -> Result<f64, ParseError> {
        let sign = if self.negative { "-" } else { "" };
        let text = format!("{sign}{}.{}e{}", self.whole, self.fraction, self.exponent);
        // Built from digits above, so it always parses; a failure would say nothing more than this.
        let Ok(value) = text.parse::<f64>() else { return Err(not_a_number(shown, unit)) };
        if !value.is_finite() {
            return Err(error(format!("“{shown}” is too large to be held"), example(unit)));
        }
        if value == 0.0 && self.whole.chars().chain(self.fraction.chars()).any(|c| c != '0') {
            return Err(error(format!("“{shown}” is too small to be told from zero"), example(unit)));
        }
        Ok(value)
    }
}

/// Reads a number of the given unit [SI base unit] from engineering notation.
///
/// # Errors
/// When the text is empty, not a number, carries another unit, uses a decimal comma, or leaves the range of `f64`.
pub fn parse(text: &str, unit: Unit) -> Result<f64, ParseError> {
    let text = text.trim_matches(is_space);
    if text.is_empty() {
        return Err(error("nothing is entered".into(), example(unit)));
    }
    if text.chars().count() > LONGEST_TEXT {
        let start: String = text.chars().take(20).collect();
        return Err(error(format!("“{start}…” is too long for a number"), example(unit)));
    }
    refuse_comma(text)?;
    let (negative, unsigned) = take_sign(text);
    let infix = take_infix(unsigned, unit);
    let has_infix = infix.is_some();
    let (decimal, rest) = infix.or_else(|| take_number(unsigned)).ok_or_else(|| not_a_number(text, unit))?;
    let mut decimal = Decimal { negative, ..decimal };
    let rest = rest.trim_matches(is_space);
    if has_infix && !rest.is_empty() && !is_unit(rest, unit) {
        return Err(not_a_number(text, unit));
    }
    if rest.starts_with(|c: char| c.is_ascii_digit()) {
        return Err(error(format!("“{text}” has a space inside the number"), example(unit)));
    }
    let bare = rest.is_empty();
    decimal.exponent = decimal.exponent.saturating_add(power_of_suffix(rest, text, unit)?);
    let value = decimal.value(text, unit)?;
    if bare && unit == Unit::Fraction && value.abs() > 1.0 {
        return Err(error(
            format!("“{text}” could mean {text} % or {text} times the whole"),
            format!("write “{text} %”, or the fraction itself, such as 0.8"),
        ));
    }
    Ok(value)
}

fn error(reason: String, hint: String) -> ParseError {
    ParseError { reason, hint }
}

fn example(unit: Unit) -> String {
    format!("write {}, such as {}", unit.in_words(), unit.example())
}

fn not_a_number(text: &str, unit: Unit) -> ParseError {
    error(format!("“{text}” is not a number"), example(unit))
}

/// White space of any width, the kinds that are pasted from documents included.
fn is_space(c: char) -> bool {
    c.is_whitespace() || matches!(c, '\u{200b}' | '\u{2060}' | '\u{feff}')
}

/// Commas are refused, never guessed at: `1,500` is one and a half in one country and fifteen hundred in another.
fn refuse_comma(text: &str) -> Result<(), ParseError> {
    if !text.contains([',', '\u{66b}', '\u{ff0c}']) {
        return Ok(());
    }
    let with_point = text.replacen([',', '\u{66b}', '\u{ff0c}'], ".", 1);
    let without = text.replace([',', '\u{66b}', '\u{ff0c}'], "");
    Err(error(
        format!("“{text}” has a comma"),
        format!("the decimal mark is a point: write “{with_point}”, or “{without}” if thousands were meant"),
    ))
}

/// Sign as hyphen, minus sign (U+2212) or en dash, as documents have them.
fn take_sign(text: &str) -> (bool, &str) {
    for (mark, negative) in [("-", true), ("\u{2212}", true), ("\u{2013}", true), ("+", false)] {
        if let Some(rest) = text.strip_prefix(mark) {
            return (negative, rest.trim_start_matches(is_space));
        }
    }
    (false, text)
}

fn take_digits(text: &str) -> (&str, &str) {
    let end = text.find(|c: char| !c.is_ascii_digit()).unwrap_or(text.len());
    text.split_at(end)
}

/// `digits[.digits][e[sign]digits]`.
fn take_number(text: &str) -> Option<(Decimal, &str)> {
    let (whole, rest) = take_digits(text);
    let (fraction, rest) = match rest.strip_prefix('.') {
        Some(after) => take_digits(after),
        None => ("", rest),
    };
    if whole.is_empty() && fraction.is_empty() {
        return None;
    }
    let (exponent, rest) = take_exponent(rest).unwrap_or((0, rest));
    let whole = if whole.is_empty() { "0" } else { whole };
    let fraction = if fraction.is_empty() { "0" } else { fraction };
    Some((Decimal { negative: false, whole: whole.into(), fraction: fraction.into(), exponent }, rest))
}

fn take_exponent(text: &str) -> Option<(i32, &str)> {
    let after = text.strip_prefix(['e', 'E'])?;
    let (negative, after) = take_sign(after);
    let (digits, rest) = take_digits(after);
    if digits.is_empty() {
        return None;
    }
    // Far beyond what an f64 holds; the conversion then reports too large or too small.
    let magnitude = digits.parse::<i32>().unwrap_or(99_999).min(99_999);
    Some((if negative { -magnitude } else { magnitude }, rest))
}

/// The prefix or unit letter standing in place of the decimal point: `2k2`, `4R7`, `R47`, `3V3`, `4µ7F`.
fn take_infix(text: &str, unit: Unit) -> Option<(Decimal, &str)> {
    let (whole, rest) = take_digits(text);
    let letter = rest.chars().next()?;
    let (fraction, after) = take_digits(&rest[letter.len_utf8()..]);
    if fraction.is_empty() {
        return None;
    }
    let stands_for_unit = match unit {
        Unit::Ohm => matches!(letter, 'R' | 'r' | '\u{3a9}' | '\u{2126}'),
        Unit::Volt => letter == 'V',
        _ => false,
    };
    let exponent = if stands_for_unit {
        0
    } else if whole.is_empty() {
        return None;
    } else {
        prefix_power(&letter.to_string(), unit)?
    };
    let whole = if whole.is_empty() { "0" } else { whole };
    Some((Decimal { negative: false, whole: whole.into(), fraction: fraction.into(), exponent }, after))
}

/// Power of ten of a prefix this unit is written with.
fn prefix_power(text: &str, unit: Unit) -> Option<i32> {
    // U+00B5 micro sign and U+03BC Greek mu are both typed, and u stands in for them.
    let text = match text {
        "u" | "\u{3bc}" => "µ",
        "K" => "k",
        other => other,
    };
    unit.prefixes().iter().find(|(mark, power)| *mark == text && *power != 0).map(|&(_, power)| power)
}

/// What follows the number: prefix, unit, both or nothing, as a power of ten.
fn power_of_suffix(suffix: &str, shown: &str, unit: Unit) -> Result<i32, ParseError> {
    if suffix.is_empty() {
        return Ok(0);
    }
    if let Some(power) = slew_power(suffix, unit) {
        return Ok(power);
    }
    if unit == Unit::Farad && suffix == "f" {
        return Err(error(
            format!("“{shown}” could mean farad or femtofarad"),
            "write F for farad or fF for femtofarad".into(),
        ));
    }
    if unit == Unit::Hertz && suffix == "mhz" {
        return Err(error(
            format!("“{shown}” could mean millihertz or megahertz"),
            "write MHz for megahertz or mHz for millihertz".into(),
        ));
    }
    if is_unit(suffix, unit) {
        return Ok(unit.shift());
    }
    if let Some(power) = prefix_power(suffix, unit) {
        return Ok(power);
    }
    let mut letters = suffix.chars();
    if let Some(first) = letters.next() {
        let after = letters.as_str().trim_start_matches(is_space);
        if is_unit(after, unit) {
            if let Some(power) = prefix_power(&first.to_string(), unit) {
                return Ok(power + unit.shift());
            }
            return Err(wrong_prefix(first, shown, unit));
        }
    }
    Err(wrong_suffix(suffix, shown, unit))
}

/// Whether the text spells the unit. Case is free except between s (second) and S (siemens).
fn is_unit(text: &str, unit: Unit) -> bool {
    unit.spellings().iter().any(|spelling| {
        if matches!(*spelling, "s" | "S") { text == *spelling } else { text.to_lowercase() == spelling.to_lowercase() }
    })
}

/// `A/µs`, `mA/ms`, `V/s`: prefix before the unit, and a time after the stroke.
fn slew_power(suffix: &str, unit: Unit) -> Option<i32> {
    let before_stroke = unit.per_second_of()?;
    let (above, below) = suffix.split_once('/')?;
    let (above, below) = (above.trim_matches(is_space), below.trim_matches(is_space));
    let above = if above.eq_ignore_ascii_case(before_stroke) {
        0
    } else {
        let mark = above.strip_suffix(before_stroke)?;
        prefix_power(mark.trim_matches(is_space), unit)?
    };
    let below = if below == "s" { 0 } else { prefix_power(below.strip_suffix('s')?, Unit::Second)? };
    Some(above - below)
}

fn wrong_prefix(prefix: char, shown: &str, unit: Unit) -> ParseError {
    let symbol = unit.symbol();
    let reason = format!("“{shown}” starts its unit with “{prefix}”, which is no prefix of {symbol} here");
    let hint = match prefix {
        'U' => format!("micro is written µ or u: µ{symbol}"),
        'N' => format!("nano is a small n: n{symbol}"),
        'P' => format!("pico is a small p: p{symbol}"),
        'g' => format!("giga is a capital G: G{symbol}"),
        't' => format!("tera is a capital T: T{symbol}"),
        'M' => format!("M is mega; micro is written µ or u (µ{symbol}), milli a small m (m{symbol})"),
        _ => example(unit),
    };
    error(reason, hint)
}

fn wrong_suffix(suffix: &str, shown: &str, unit: Unit) -> ParseError {
    if let Some(prefix) = suffix.chars().next().filter(|_| suffix.chars().count() == 1) {
        let known = matches!(prefix, 'U' | 'N' | 'P' | 'g' | 't' | 'M');
        if known && unit.prefixes().len() > 1 {
            return wrong_prefix(prefix, shown, unit);
        }
    }
    let other = Unit::ALL.into_iter().find(|other| *other != unit && power_fits(suffix, *other));
    match other {
        Some(Unit::Siemens) if unit == Unit::Second => {
            error(format!("“{shown}” is in siemens (capital S)"), "second is a small s".into())
        }
        Some(Unit::Second) if unit == Unit::Siemens => {
            error(format!("“{shown}” is in seconds (small s)"), "siemens is a capital S".into())
        }
        Some(Unit::Decibel) if unit == Unit::One => error(
            format!("“{shown}” is in dB, a plain number is wanted here"),
            "write the ratio itself: 20 dB is 10, 80 dB is 10k".into(),
        ),
        Some(other) => error(format!("“{shown}” is {}, not {}", other.in_words(), unit.in_words()), example(unit)),
        None => error(format!("“{suffix}” in “{shown}” is not a unit known here"), example(unit)),
    }
}

/// Whether a suffix would have been read for another unit, spelled with the case it is printed with.
fn power_fits(suffix: &str, unit: Unit) -> bool {
    if slew_power(suffix, unit).is_some() || is_unit(suffix, unit) {
        return true;
    }
    let mut letters = suffix.chars();
    let prefix = letters.next().map(String::from).unwrap_or_default();
    prefix_power(&prefix, unit).is_some() && is_unit(letters.as_str().trim_start_matches(is_space), unit)
}

#[cfg(test)]
mod tests {
    use super::super::{exact, print, print_digits};
    use super::*;
    use proptest::prelude::*;

    fn reads(text: &str, unit: Unit, value: f64) {
        let read = parse(text, unit).unwrap_or_else(|e| panic!("“{text}”: {e}"));
        assert_eq!(read.to_bits(), value.to_bits(), "“{text}” read as {read:e}");
    }

    fn refuses(text: &str, unit: Unit, reason: &str, hint: &str) {
        let refused = parse(text, unit).expect_err(text);
        assert!(refused.reason.contains(reason), "“{text}”: {}", refused.reason);
        assert!(refused.hint.contains(hint), "“{text}”: {}", refused.hint);
    }

    #[test]
    fn engineering_notation_is_read() {
        reads("4.7u", Unit::Farad, 4.7e-6);
        reads("4.7 \u{b5}F", Unit::Farad, 4.7e-6);
        reads("4.7\u{3bc}F", Unit::Farad, 4.7e-6);
        reads("4.7 uf", Unit::Farad, 4.7e-6);
        reads("22k", Unit::Ohm, 22e3);
        reads("22K", Unit::Ohm, 22e3);
        reads("22 kohm", Unit::Ohm, 22e3);
        reads("22 k\u{2126}", Unit::Ohm, 22e3);
        reads("22 k\u{3a9}", Unit::Ohm, 22e3);
        reads("1.5 MHz", Unit::Hertz, 1.5e6);
        reads("1.5 mHz", Unit::Hertz, 1.5e-3);
        reads("1e-6", Unit::Farad, 1e-6);
        reads("1E+3 Hz", Unit::Hertz, 1e3);
        reads("  +12 V ", Unit::Volt, 12.0);
        reads("12\u{a0}V", Unit::Volt, 12.0);
        reads("12\u{202f}m V", Unit::Volt, 12e-3);
        reads(".5", Unit::One, 0.5);
        reads("5.", Unit::One, 5.0);
        reads("-20 dB/decade", Unit::DecibelPerDecade, -20.0);
        reads("\u{2212}3.2 dB", Unit::Decibel, -3.2);
        reads("\u{2013}3.2dB", Unit::Decibel, -3.2);
        reads("55 deg", Unit::Degree, 55.0);
        reads("80 %", Unit::Fraction, 0.8);
        reads("0.8", Unit::Fraction, 0.8);
        reads("1.2 mA/V", Unit::Siemens, 1.2e-3);
        reads("1 A/\u{b5}s", Unit::AmperePerSecond, 1e6);
        reads("2.5 mA/ns", Unit::AmperePerSecond, 2.5e6);
        reads("5 V/ms", Unit::VoltPerSecond, 5e3);
        reads("10k", Unit::One, 1e4);
    }

    #[test]
    fn a_letter_may_stand_for_the_point() {
        reads("2k2", Unit::Ohm, 2.2e3);
        reads("4R7", Unit::Ohm, 4.7);
        reads("R47", Unit::Ohm, 0.47);
        reads("4\u{3a9}7", Unit::Ohm, 4.7);
        reads("4m7\u{3a9}", Unit::Ohm, 4.7e-3);
        reads("4u7F", Unit::Farad, 4.7e-6);
        reads("3V3", Unit::Volt, 3.3);
        refuses("2k2k", Unit::Ohm, "not a number", "2.2 kΩ");
        refuses("k47", Unit::Ohm, "not a number", "2.2 kΩ");
        refuses("4R7", Unit::Farad, "not a unit", "4.7 µF");
    }

    #[test]
    fn bad_texts_are_refused_with_a_way_out() {
        refuses("", Unit::Volt, "nothing is entered", "24 V");
        refuses(" \u{a0} ", Unit::Volt, "nothing is entered", "24 V");
        refuses("twelve", Unit::Volt, "not a number", "24 V");
        refuses("NaN", Unit::Volt, "not a number", "24 V");
        refuses("inf", Unit::Volt, "not a number", "24 V");
        refuses("-", Unit::Volt, "not a number", "24 V");
        refuses(".", Unit::Volt, "not a number", "24 V");
        refuses("1e999", Unit::Volt, "too large", "24 V");
        refuses("1e-999", Unit::Volt, "too small", "24 V");
        refuses("1e99999999999", Unit::Volt, "too large", "24 V");
        refuses("4,7 µF", Unit::Farad, "comma", "“4.7 µF”");
        refuses("1,000", Unit::Ohm, "comma", "“1000” if thousands");
        refuses("1 000", Unit::Ohm, "space inside", "2.2 kΩ");
        refuses("10 V", Unit::Ohm, "is a voltage in V, not a resistance in Ω", "2.2 kΩ");
        refuses("10 µF", Unit::Henry, "a capacitance in F", "10 µH");
        refuses("10 MH", Unit::Henry, "“M”", "µH");
        refuses("10 M", Unit::Henry, "“M”", "µH");
        refuses("10 NF", Unit::Farad, "“N”", "nF");
        refuses("10 P", Unit::Farad, "“P”", "pF");
        refuses("4 f", Unit::Farad, "farad or femtofarad", "fF");
        refuses("1.5 mhz", Unit::Hertz, "millihertz or megahertz", "MHz");
        refuses("10 mS", Unit::Second, "siemens", "small s");
        refuses("10 ms", Unit::Siemens, "seconds", "capital S");
        refuses("80 dB", Unit::One, "dB", "80 dB is 10k");
        refuses("80", Unit::Fraction, "80 %", "“80 %”");
        refuses("3 apples", Unit::Volt, "not a unit", "24 V");
        refuses("5 k%", Unit::Fraction, "prefix", "80 %");
        refuses(&"9".repeat(5000), Unit::Volt, "too long", "24 V");
        refuses("🙂", Unit::Volt, "not a number", "24 V");
    }

    #[test]
    fn numbers_for_people_have_four_digits() {
        let cases = [
            (4790.4, Unit::Hertz, "4.79 kHz"),
            (999.96, Unit::Hertz, "1 kHz"),
            (-3.2, Unit::Decibel, "\u{2212}3.2 dB"),
            (1e-13, Unit::Decibel, "0 dB"),
            (-1e-13, Unit::Degree, "0°"),
            (52.3456, Unit::Degree, "52.35°"),
            (0.0, Unit::Volt, "0 V"),
            (-0.0, Unit::Volt, "0 V"),
            (0.625, Unit::Fraction, "62.5 %"),
            (0.012346, Unit::Fraction, "1.235 %"),
            (1e6, Unit::AmperePerSecond, "1 A/µs"),
            (2.5e12, Unit::AmperePerSecond, "2500 A/ns"),
            (0.5, Unit::AmperePerSecond, "500 mA/s"),
            (10000.0, Unit::One, "10000"),
            (1e9, Unit::One, "1e9"),
            (0.0333333, Unit::One, "0.03333"),
            (5000.0, Unit::Second, "5 ks"),
            (f64::INFINITY, Unit::Decibel, "∞ dB"),
            (f64::NAN, Unit::Hertz, "undefined"),
        ];
        for (value, unit, text) in cases {
            assert_eq!(print(value, unit), text);
        }
        assert_eq!(print_digits(4790.4, Unit::Hertz, 2), "4.8 kHz");
        assert_eq!(print_digits(24.173, Unit::Volt, 5), "24.173 V");
    }

    #[test]
    fn exact_text_is_short() {
        let cases = [
            (4.7e-6, Unit::Farad, "4.7 µF"),
            (1e-5, Unit::Henry, "10 µH"),
            (0.05, Unit::Fraction, "5 %"),
            (3e5, Unit::Hertz, "300 kHz"),
            (-0.5, Unit::Volt, "-500 mV"),
            (1e7, Unit::Farad, "10000 kF"),
            (1e-30, Unit::Ohm, "1e-30 Ω"),
            (1e300, Unit::Volt, "1e300 V"),
            (1e6, Unit::AmperePerSecond, "1 A/µs"),
        ];
        for (value, unit, text) in cases {
            assert_eq!(exact(value, unit), text);
            reads(text, unit, value);
        }
    }

    fn any_unit() -> impl Strategy<Value = Unit> {
        proptest::sample::select(Unit::ALL.to_vec())
    }

    proptest! {
        #[test]
        fn exact_text_parses_back_to_the_same_bits(bits in any::<u64>(), unit in any_unit()) {
            let value = f64::from_bits(bits);
            prop_assume!(value.is_finite());
            let text = exact(value, unit);
            let back = parse(&text, unit).map_err(|e| TestCaseError::fail(format!("{text}: {e}")))?;
            prop_assert_eq!(back.to_bits(), value.to_bits(), "{}", text);
        }

        #[test]
        fn exact_text_of_usual_magnitudes_parses_back(
            mantissa in -1000.0..1000.0_f64, power in -16..13_i32, unit in any_unit()
        ) {
            let value = mantissa * 10f64.powi(power);
            let text = exact(value, unit);
            prop_assert_eq!(parse(&text, unit).map(f64::to_bits), Ok(value.to_bits()), "{}", text);
        }

        #[test]
        fn printed_text_parses_back_within_its_digits(
            mantissa in 1.0..10.0_f64, power in -12..9_i32, negative in any::<bool>(), unit in any_unit()
        ) {
            prop_assume!(unit.prefixes().len() > 1);
            let value = mantissa * 10f64.powi(power) * if negative { -1.0 } else { 1.0 };
            let text = print(value, unit);
            let back = parse(&text, unit).map_err(|e| TestCaseError::fail(format!("{text}: {e}")))?;
            prop_assert!((back - value).abs() <= 0.5001e-3 * value.abs(), "{} for {}", text, value);
        }

        #[test]
        fn no_text_panics_and_only_finite_numbers_come_out(text in "\\PC{0,12}", unit in any_unit()) {
            if let Ok(value) = parse(&text, unit) {
                prop_assert!(value.is_finite());
            }
        }

        #[test]
        fn no_near_number_panics(text in "[-+−0-9.,eEkmMµuRrVF %/sΩ°dB]{0,10}", unit in any_unit()) {
            if let Ok(value) = parse(&text, unit) {
                prop_assert!(value.is_finite());
            }
        }
    }
}
