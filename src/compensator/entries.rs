//! The compensator's rows in the table of entries and its choices, and which of them apply to a network.
//!
//! *Conventions.* Paths start with `compensator.`; a part is named as in the drawings: `r2`, `c1` in series, `c2` across them,
//! `r3`, `c3` across the upper divider resistor.

use super::digital_entries as digital;
use super::shunt_entries as shunt;
use crate::quantity::{Bounds, Choice, ChoiceOption, Choices, Entry, Unit};

/// Resistances of a signal-level network [Ω]: wider than anything fitted, narrow enough to stop a slip of the prefix.
pub(super) const RESISTANCE: Bounds = Bounds::Between(1e-3, 1e9);
/// Capacitances of a signal-level network [F], likewise.
pub(super) const CAPACITANCE: Bounds = Bounds::Between(1e-16, 1.0);
/// Voltages an amplifier's output may be limited to [V].
const OUTPUT_VOLTAGE: Bounds = Bounds::Between(-1000.0, 1000.0);

/// Every number a user enters for the compensator, in the order of the form.
pub fn entries() -> impl Iterator<Item = &'static Entry> {
    ENTRIES.iter().chain(shunt::ENTRIES).chain(digital::ENTRIES)
}

/// Every choice a user makes for the compensator, in the order of the form.
pub fn choices() -> impl Iterator<Item = &'static Choice> {
    CHOICES.iter().chain(shunt::CHOICES).chain(digital::CHOICES)
}

/// Numbers of the networks, and of op amp and transconductance amplifier.
const ENTRIES: &[Entry] = &[
    Entry::new(
        "compensator.reference",
        "Reference voltage",
        Unit::Volt,
        Bounds::Between(1e-3, 1000.0),
        1.25,
        "Voltage at the amplifier's other input; with the divider it sets the output voltage.",
    )
    .spread(0.01),
    Entry::new(
        "compensator.divider.upper",
        "Upper divider resistor",
        Unit::Ohm,
        RESISTANCE,
        18.2e3,
        "From the converter's output to the amplifier's input. Around an op amp it also sets the gain.",
    )
    .spread(0.01),
    Entry::new(
        "compensator.divider.lower",
        "Lower divider resistor",
        Unit::Ohm,
        RESISTANCE,
        1e3,
        "From the amplifier's input to ground. Output voltage = reference × (1 + upper / lower).",
    )
    .spread(0.01),
    Entry::new(
        "compensator.r2",
        "R2, sets the first zero",
        Unit::Ohm,
        RESISTANCE,
        10e3,
        "In series with C1: around the op amp, or from the transconductance amplifier's output to ground.",
    )
    .spread(0.01),
    Entry::new(
        "compensator.c1",
        "C1, the integrating capacitor",
        Unit::Farad,
        CAPACITANCE,
        22e-9,
        "In series with R2; alone in a type I network.",
    )
    .spread(0.1),
    Entry::new(
        "compensator.c2",
        "C2, sets the first pole",
        Unit::Farad,
        CAPACITANCE,
        470e-12,
        "Across R2 and C1; rolls the gain off at high frequency.",
    )
    .spread(0.1),
    Entry::new(
        "compensator.r3",
        "R3, sets the second pole",
        Unit::Ohm,
        RESISTANCE,
        470.0,
        "In series with C3, across the upper divider resistor.",
    )
    .spread(0.01),
    Entry::new(
        "compensator.c3",
        "C3, sets the second zero",
        Unit::Farad,
        CAPACITANCE,
        4.7e-9,
        "In series with R3, across the upper divider resistor.",
    )
    .spread(0.1),
    Entry::new(
        "compensator.cff",
        "Feed-forward capacitor",
        Unit::Farad,
        CAPACITANCE,
        100e-12,
        "Straight across the upper divider resistor; adds phase from its zero on.",
    )
    .spread(0.1),
    Entry::new(
        "compensator.op-amp.dc-gain",
        "Open-loop DC gain",
        Unit::One,
        Bounds::Between(1.0, 1e9),
        10e3,
        "Ratio, not decibels: 80 dB is 10k. Take the least of the data sheet.",
    )
    .spread(0.5),
    Entry::new(
        "compensator.op-amp.gain-bandwidth",
        "Gain-bandwidth product",
        Unit::Hertz,
        Bounds::Between(1.0, 1e12),
        10e6,
        "Where the open-loop gain, falling with one pole, reaches 1.",
    )
    .spread(0.3),
    Entry::new(
        "compensator.op-amp.output-least",
        "Least output voltage",
        Unit::Volt,
        OUTPUT_VOLTAGE,
        0.05,
        "The lowest control voltage the op amp can give.",
    ),
    Entry::new(
        "compensator.op-amp.output-greatest",
        "Greatest output voltage",
        Unit::Volt,
        OUTPUT_VOLTAGE,
        4.5,
        "The highest control voltage the op amp can give.",
    ),
    Entry::new(
        "compensator.transconductance.gm",
        "Transconductance",
        Unit::Siemens,
        Bounds::Between(1e-9, 1e3),
        1e-3,
        "Output current per volt between the inputs, in S or A/V.",
    )
    .spread(0.2),
    Entry::new(
        "compensator.transconductance.output-resistance",
        "Output resistance",
        Unit::Ohm,
        Bounds::Between(1.0, 1e12),
        2e6,
        "Limits the DC gain to gm × this resistance.",
    )
    .spread(0.5),
    Entry::new(
        "compensator.transconductance.output-current",
        "Greatest output current",
        Unit::Ampere,
        Bounds::Between(1e-12, 1000.0),
        100e-6,
        "The most current the amplifier sources or sinks: it limits how fast the control voltage moves.",
    )
    .spread(0.2),
    Entry::new(
        "compensator.transconductance.output-least",
        "Least output voltage",
        Unit::Volt,
        OUTPUT_VOLTAGE,
        0.1,
        "The lowest control voltage the amplifier can give.",
    ),
    Entry::new(
        "compensator.transconductance.output-greatest",
        "Greatest output voltage",
        Unit::Volt,
        OUTPUT_VOLTAGE,
        3.0,
        "The highest control voltage the amplifier can give.",
    ),
];

/// A row of preferred-value series, the same for resistors and capacitors.
const SERIES_OPTIONS: &[ChoiceOption] = &[
    ChoiceOption { key: "exact", name: "exact", help: "Not rounded." },
    ChoiceOption { key: "E3", name: "E3", help: "3 values per decade." },
    ChoiceOption { key: "E6", name: "E6", help: "6 values per decade, usually 20 %." },
    ChoiceOption { key: "E12", name: "E12", help: "12 values per decade, usually 10 %." },
    ChoiceOption { key: "E24", name: "E24", help: "24 values per decade, usually 5 %." },
    ChoiceOption { key: "E48", name: "E48", help: "48 values per decade, usually 2 %." },
    ChoiceOption { key: "E96", name: "E96", help: "96 values per decade, usually 1 %." },
    ChoiceOption { key: "E192", name: "E192", help: "192 values per decade, usually 0.5 % or better." },
];

/// Choices of network, amplifier and preferred values.
const CHOICES: &[Choice] = &[
    Choice {
        path: "compensator.type",
        name: "Network",
        options: &[
            ChoiceOption { key: "1", name: "type I", help: "An integrator." },
            ChoiceOption {
                key: "2",
                name: "type II",
                help: "An integrator, one zero and one pole: up to 90° of boost.",
            },
            ChoiceOption {
                key: "3",
                name: "type III",
                help: "An integrator, two zeros and two poles: up to 180° of boost.",
            },
        ],
        default: "3",
        help: "How many poles and zeros stand around the amplifier.",
    },
    Choice {
        path: "compensator.amplifier",
        name: "Amplifier",
        options: &[
            ChoiceOption { key: "op-amp", name: "op amp", help: "A voltage amplifier with the network around it." },
            ChoiceOption {
                key: "transconductance",
                name: "transconductance",
                help: "A voltage-to-current amplifier with the network from its output to ground.",
            },
            ChoiceOption {
                key: "shunt-regulator",
                name: "regulator and optocoupler",
                help: "Isolated feedback: a shunt regulator of the 431 type drives the LED of an optocoupler.",
            },
            ChoiceOption {
                key: "digital",
                name: "difference equation",
                help: "The divided output is sampled once a period, and a difference equation computes the control.",
            },
        ],
        default: "op-amp",
        help: "What kind of error amplifier the controller has.",
    },
    Choice {
        path: "compensator.anchor",
        name: "Resistor kept",
        options: &[
            ChoiceOption { key: "upper", name: "upper divider resistor", help: "Moving a lane keeps it; R2 follows." },
            ChoiceOption {
                key: "r2",
                name: "R2",
                help: "Moving a lane keeps it. Around an op amp the divider follows, its ratio kept.",
            },
        ],
        default: "upper",
        help: "The resistor that stays when a pole or zero is moved; it sets the impedance of the network.",
    },
    Choice {
        path: "compensator.feedforward-capacitor",
        name: "Capacitor across the upper resistor",
        options: &[
            ChoiceOption { key: "none", name: "none", help: "Not fitted." },
            ChoiceOption {
                key: "fitted",
                name: "fitted",
                help: "Straight across the upper resistor, no resistor in series.",
            },
        ],
        default: "none",
        help: "For types I and II; in a type III network R3 and C3 stand there.",
    },
    Choice {
        path: "compensator.series.resistors",
        name: "Resistors rounded to",
        options: SERIES_OPTIONS,
        default: "E96",
        help: "Series of preferred values (IEC 60063) for resistors.",
    },
    Choice {
        path: "compensator.series.capacitors",
        name: "Capacitors rounded to",
        options: SERIES_OPTIONS,
        default: "E12",
        help: "Series of preferred values (IEC 60063) for capacitors.",
    },
];

/// Chosen option at a path; the table's default while nothing was chosen.
pub(super) fn chosen<'a>(choices: &'a Choices, path: &str) -> &'a str {
    let default = self::choices().find(|row| row.path == path).map_or("", |row| row.default);
    choices.get(path).unwrap_or(default)
}

/// Whether the entry or choice at `path` belongs to the network that `choices` describe. Paths of other rooms never apply.
pub fn applies(path: &str, choices: &Choices) -> bool {
    let kind = chosen(choices, "compensator.type");
    let amplifier = chosen(choices, "compensator.amplifier");
    if amplifier == "digital" {
        return digital::applies(path, choices);
    }
    let isolated = amplifier == "shunt-regulator";
    match path {
        "compensator.r2" if isolated => shunt::has_series_resistor(kind, choices),
        "compensator.anchor" | "compensator.feedforward-capacitor" | "compensator.cff" if isolated => false,
        "compensator.r2" | "compensator.c2" | "compensator.anchor" => kind != "1",
        "compensator.r3" | "compensator.c3" => kind == "3",
        "compensator.feedforward-capacitor" => kind != "3",
        "compensator.cff" => kind != "3" && chosen(choices, "compensator.feedforward-capacitor") == "fitted",
        _ if path.starts_with("compensator.op-amp.") => amplifier == "op-amp",
        _ if path.starts_with("compensator.transconductance.") => amplifier == "transconductance",
        _ if path.starts_with("compensator.digital.") => false,
        _ if path.starts_with("compensator.opto.") || path.starts_with("compensator.shunt.") => {
            isolated && shunt::applies(path, kind, choices)
        }
        _ => path.starts_with("compensator."),
    }
}
