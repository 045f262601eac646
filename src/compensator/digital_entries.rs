//! The rows of a difference-equation compensator: lanes in hertz, method, word length, converters, times.

use crate::quantity::{Bounds, Choice, ChoiceOption, Choices, Entry, Unit};

/// Frequencies of lanes [Hz]; half the sampling frequency bounds them further.
const FREQUENCY: Bounds = Bounds::Between(1e-3, 1e10);
/// Full scales of converters [V].
const FULL_SCALE: Bounds = Bounds::Between(1e-3, 1000.0);

/// Numbers of a difference equation, in the order of the form.
pub(super) const ENTRIES: &[Entry] = &[
    Entry::new(
        "compensator.digital.gain",
        "Integrator's gain",
        Unit::Hertz,
        FREQUENCY,
        300.0,
        "Where the integrator alone would have a gain of 1, from output voltage to control voltage.",
    ),
    Entry::new(
        "compensator.digital.zero-1",
        "Zero 1, wanted",
        Unit::Hertz,
        FREQUENCY,
        1e3,
        "Where the first zero is wanted; the coefficients follow by the method chosen.",
    ),
    Entry::new(
        "compensator.digital.pole-1",
        "Pole 1, wanted",
        Unit::Hertz,
        FREQUENCY,
        40e3,
        "Where the first pole beside the integrator is wanted; at most half the sampling frequency.",
    ),
    Entry::new(
        "compensator.digital.zero-2",
        "Zero 2, wanted",
        Unit::Hertz,
        FREQUENCY,
        1e3,
        "Where the second zero is wanted; the coefficients follow by the method chosen.",
    ),
    Entry::new(
        "compensator.digital.pole-2",
        "Pole 2, wanted",
        Unit::Hertz,
        FREQUENCY,
        80e3,
        "Where the second pole beside the integrator is wanted; at most half the sampling frequency.",
    ),
    Entry::new(
        "compensator.digital.prewarp",
        "Exact at",
        Unit::Hertz,
        FREQUENCY,
        10e3,
        "Frequency at which the difference equation answers exactly like its continuous aim: the crossover aimed at. Placing by a method enters it.",
    ),
    Entry::new(
        "compensator.digital.bits",
        "Word length",
        Unit::One,
        Bounds::Between(2.0, 32.0),
        16.0,
        "Bits of a coefficient, its sign included.",
    ),
    Entry::new(
        "compensator.digital.fraction-bits",
        "Fraction bits, forward",
        Unit::One,
        Bounds::Between(0.0, 62.0),
        10.0,
        "Binary places of the coefficients b of the error. Empty: as many as the greatest of them leaves room for.",
    )
    .optional(),
    Entry::new(
        "compensator.digital.feedback-fraction-bits",
        "Fraction bits, feedback",
        Unit::One,
        Bounds::Between(0.0, 62.0),
        13.0,
        "Binary places of the coefficients a of the earlier outputs. Empty: as many as the greatest of them leaves room for.",
    )
    .optional(),
    Entry::new(
        "compensator.digital.computation",
        "Sample to update",
        Unit::Second,
        Bounds::NonNegative,
        500e-9,
        "From the instant the output is sampled to the start of the period whose pulse the result sets: conversion and computation.",
    ),
    Entry::new(
        "compensator.digital.input-range",
        "Converter's input range",
        Unit::Volt,
        FULL_SCALE,
        2.5,
        "Voltage at the divider's tap that is full scale of the analog-to-digital converter. The error counts as a fraction of it.",
    ),
    Entry::new(
        "compensator.digital.output-range",
        "Control voltage, full scale",
        Unit::Volt,
        FULL_SCALE,
        3.0,
        "Control voltage that the digital-to-analog converter gives at full scale. In voltage mode the output is the duty ratio itself and needs no converter.",
    ),
];

/// Choices of a difference equation, in the order of the form.
pub(super) const CHOICES: &[Choice] = &[
    Choice {
        path: "compensator.digital.order",
        name: "Poles",
        options: &[
            ChoiceOption { key: "2", name: "two", help: "An integrator and one more pole." },
            ChoiceOption { key: "3", name: "three", help: "An integrator and two more poles." },
        ],
        default: "3",
        help: "Poles of the difference equation, and with them how many earlier outputs it needs.",
    },
    Choice {
        path: "compensator.digital.zeros",
        name: "Zeros",
        options: &[
            ChoiceOption { key: "1", name: "one", help: "Gives back the integrator's 90°." },
            ChoiceOption { key: "2", name: "two", help: "Give up to 90° more." },
        ],
        default: "2",
        help: "Zeros that are placed; those at infinity go to half the sampling frequency.",
    },
    Choice {
        path: "compensator.digital.method",
        name: "Method",
        options: &[
            ChoiceOption {
                key: "tustin",
                name: "Tustin",
                help: "The trapezoidal rule: s becomes 2/T · (z − 1)/(z + 1). Frequencies near half the sampling frequency are moved.",
            },
            ChoiceOption {
                key: "tustin-prewarped",
                name: "Tustin, prewarped",
                help: "The trapezoidal rule, stretched so that it is exact at a stated frequency.",
            },
            ChoiceOption {
                key: "matched",
                name: "matched poles",
                help: "Each pole and zero goes to e^(s·T); zeros at infinity go to z = −1.",
            },
        ],
        default: "tustin",
        help: "How poles and zeros in hertz become coefficients.",
    },
    Choice {
        path: "compensator.digital.rounding",
        name: "Rounding",
        options: &[
            ChoiceOption {
                key: "integrator",
                name: "keeps the integrator",
                help: "Each coefficient to its nearest code, then as few by one code as the pole at z = 1 needs.",
            },
            ChoiceOption {
                key: "nearest",
                name: "each to its nearest",
                help: "Each coefficient to its nearest code, whatever becomes of the integrator.",
            },
        ],
        default: "integrator",
        help: "How coefficients become codes.",
    },
];

/// Chosen option of one of the rows here.
pub(super) fn chosen<'a>(choices: &'a Choices, path: &str) -> &'a str {
    let default = CHOICES.iter().find(|row| row.path == path).map_or("", |row| row.default);
    choices.get(path).unwrap_or(default)
}

/// Whether a row applies to a difference equation of these choices: one of its own, or one that all compensators share.
pub(super) fn applies(path: &str, choices: &Choices) -> bool {
    match path {
        "compensator.digital.zero-2" => chosen(choices, "compensator.digital.zeros") == "2",
        "compensator.digital.pole-2" => chosen(choices, "compensator.digital.order") == "3",
        "compensator.digital.prewarp" => chosen(choices, "compensator.digital.method") == "tustin-prewarped",
        "compensator.digital.output-range" => !voltage_mode(choices),
        _ => path.starts_with("compensator.digital.") || SHARED.contains(&path),
    }
}

/// Rows that stay with a difference equation; of preferred values only the divider's.
const SHARED: [&str; 5] = [
    "compensator.reference",
    "compensator.divider.upper",
    "compensator.divider.lower",
    "compensator.amplifier",
    "compensator.series.resistors",
];

/// Whether the output of the difference equation is the duty ratio.
pub(super) fn voltage_mode(choices: &Choices) -> bool {
    choices.get("control.mode").unwrap_or("voltage") == "voltage"
}
