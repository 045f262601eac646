//! Units of entries and results: symbols, accepted spellings, the prefixes that make sense with each.

/// Unit of a number at an interface. Inside, every number is in the SI base unit named here.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Unit {
    /// A plain ratio, without unit.
    One,
    /// Volt [V].
    Volt,
    /// Ampere [A].
    Ampere,
    /// Ohm [Ω].
    Ohm,
    /// Farad [F].
    Farad,
    /// Henry [H].
    Henry,
    /// Hertz [Hz].
    Hertz,
    /// Second [s].
    Second,
    /// Siemens [S]; also reads A/V.
    Siemens,
    /// Watt [W].
    Watt,
    /// Joule [J].
    Joule,
    /// Degree of angle [°].
    Degree,
    /// Decibel [dB].
    Decibel,
    /// A fraction, held as a ratio and shown in per cent.
    Fraction,
    /// Ampere per second [A/s], shown per millisecond, microsecond or nanosecond where that reads better.
    AmperePerSecond,
    /// Volt per second [V/s], shown like [`Unit::AmperePerSecond`].
    VoltPerSecond,
    /// Decibel per decade of frequency [dB/decade].
    DecibelPerDecade,
}

/// An SI prefix: what is printed, and the power of ten it stands for.
pub(super) type Prefix = (&'static str, i32);

/// Prefixes with every electrical unit that is commonly written with both large and small ones.
const ALL_PREFIXES: &[Prefix] =
    &[("f", -15), ("p", -12), ("n", -9), ("µ", -6), ("m", -3), ("", 0), ("k", 3), ("M", 6), ("G", 9), ("T", 12)];

/// Prefixes with farad, henry and second: nobody means a megafarad, but `MF` is written for microfarad, so it is refused.
const SMALL_PREFIXES: &[Prefix] = &[("f", -15), ("p", -12), ("n", -9), ("µ", -6), ("m", -3), ("", 0), ("k", 3)];

/// For angles, decibels and per cent.
const NO_PREFIX: &[Prefix] = &[("", 0)];

impl Unit {
    /// Every unit, for tests and tables.
    pub const ALL: [Unit; 17] = [
        Unit::One,
        Unit::Volt,
        Unit::Ampere,
        Unit::Ohm,
        Unit::Farad,
        Unit::Henry,
        Unit::Hertz,
        Unit::Second,
        Unit::Siemens,
        Unit::Watt,
        Unit::Joule,
        Unit::Degree,
        Unit::Decibel,
        Unit::Fraction,
        Unit::AmperePerSecond,
        Unit::VoltPerSecond,
        Unit::DecibelPerDecade,
    ];

    /// Symbol as printed, without prefix; empty for a plain ratio.
    pub fn symbol(self) -> &'static str {
        match self {
            Unit::One => "",
            Unit::Volt => "V",
            Unit::Ampere => "A",
            Unit::Ohm => "Ω",
            Unit::Farad => "F",
            Unit::Henry => "H",
            Unit::Hertz => "Hz",
            Unit::Second => "s",
            Unit::Siemens => "S",
            Unit::Watt => "W",
            Unit::Joule => "J",
            Unit::Degree => "°",
            Unit::Decibel => "dB",
            Unit::Fraction => "%",
            Unit::AmperePerSecond => "A/s",
            Unit::VoltPerSecond => "V/s",
            Unit::DecibelPerDecade => "dB/decade",
        }
    }

    /// Name in words, for messages ("a resistance in Ω").
    pub fn in_words(self) -> &'static str {
        match self {
            Unit::One => "a plain number",
            Unit::Volt => "a voltage in V",
            Unit::Ampere => "a current in A",
            Unit::Ohm => "a resistance in Ω",
            Unit::Farad => "a capacitance in F",
            Unit::Henry => "an inductance in H",
            Unit::Hertz => "a frequency in Hz",
            Unit::Second => "a time in s",
            Unit::Siemens => "a transconductance in S",
            Unit::Watt => "a power in W",
            Unit::Joule => "an energy in J",
            Unit::Degree => "an angle in °",
            Unit::Decibel => "a ratio in dB",
            Unit::Fraction => "a fraction in %",
            Unit::AmperePerSecond => "a slew in A/s",
            Unit::VoltPerSecond => "a slew in V/s",
            Unit::DecibelPerDecade => "a slope in dB/decade",
        }
    }

    /// An example of how a number with this unit is written, for hints.
    pub fn example(self) -> &'static str {
        match self {
            Unit::One => "2.5",
            Unit::Volt => "24 V",
            Unit::Ampere => "1.5 A",
            Unit::Ohm => "2.2 kΩ",
            Unit::Farad => "4.7 µF",
            Unit::Henry => "10 µH",
            Unit::Hertz => "300 kHz",
            Unit::Second => "150 ns",
            Unit::Siemens => "1.2 mS",
            Unit::Watt => "36 W",
            Unit::Joule => "20 mJ",
            Unit::Degree => "55°",
            Unit::Decibel => "10 dB",
            Unit::Fraction => "80 %",
            Unit::AmperePerSecond => "1 A/µs",
            Unit::VoltPerSecond => "5 V/ms",
            Unit::DecibelPerDecade => "-20 dB/decade",
        }
    }

    /// Spellings accepted besides the symbol, compared without regard to case unless that would confuse two units.
    pub(super) fn spellings(self) -> &'static [&'static str] {
        match self {
            Unit::One => &[],
            Unit::Volt => &["V", "volt", "volts"],
            Unit::Ampere => &["A", "amp", "amps", "ampere", "amperes"],
            // U+03A9 Greek capital omega and U+2126 ohm sign look alike and are both typed.
            Unit::Ohm => &["\u{3a9}", "\u{2126}", "ohm", "ohms", "R"],
            Unit::Farad => &["F", "farad", "farads"],
            Unit::Henry => &["H", "henry", "henries"],
            Unit::Hertz => &["Hz", "hertz"],
            Unit::Second => &["s", "sec", "second", "seconds"],
            Unit::Siemens => &["S", "A/V", "siemens"],
            Unit::Watt => &["W", "watt", "watts"],
            Unit::Joule => &["J", "Ws", "joule", "joules"],
            Unit::Degree => &["°", "deg", "degree", "degrees"],
            Unit::Decibel => &["dB", "decibel", "decibels"],
            Unit::Fraction => &["%", "percent", "per cent"],
            Unit::AmperePerSecond => &["A/s"],
            Unit::VoltPerSecond => &["V/s"],
            Unit::DecibelPerDecade => &["dB/decade", "dB/dec"],
        }
    }

    /// Prefixes read and printed with this unit, rising.
    pub(super) fn prefixes(self) -> &'static [Prefix] {
        match self {
            Unit::Farad | Unit::Henry | Unit::Second => SMALL_PREFIXES,
            Unit::Degree | Unit::Decibel | Unit::Fraction | Unit::DecibelPerDecade => NO_PREFIX,
            _ => ALL_PREFIXES,
        }
    }

    /// For a slew, the unit before the stroke ("A" of A/s).
    pub(super) fn per_second_of(self) -> Option<&'static str> {
        match self {
            Unit::AmperePerSecond => Some("A"),
            Unit::VoltPerSecond => Some("V"),
            _ => None,
        }
    }

    /// Power of ten between the printed and the held number: −2 for per cent.
    pub(super) fn shift(self) -> i32 {
        if self == Unit::Fraction { -2 } else { 0 }
    }

    /// Greatest magnitude that can belong to a converter, and least magnitude other than zero. Wide on purpose: it only stops
    /// slips such as 1e300 before they reach the arithmetic as overflow.
    pub fn usable_magnitudes(self) -> (f64, f64) {
        match self {
            Unit::Volt | Unit::Ampere => (1e-9, 1e6),
            Unit::Ohm => (1e-9, 1e12),
            Unit::Farad => (1e-18, 1e3),
            Unit::Henry | Unit::Second => (1e-15, 1e3),
            Unit::Hertz => (1e-6, 1e12),
            Unit::Siemens => (1e-12, 1e6),
            Unit::Degree | Unit::Decibel | Unit::DecibelPerDecade => (1e-9, 1e4),
            Unit::Watt | Unit::Joule | Unit::One | Unit::Fraction => (1e-12, 1e9),
            Unit::AmperePerSecond | Unit::VoltPerSecond => (1e-6, 1e15),
        }
    }
}
