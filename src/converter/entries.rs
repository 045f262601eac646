//! The table of entries of the power stage.

use super::filter_entries as filters;
use super::stage::Rectifier;
use super::topology_entries::own_applies;
use crate::quantity::{Bounds, Choice, ChoiceOption, Choices, Entry, Unit};

/// Largest number of unlike branches in an output bank.
pub(super) const BRANCHES: usize = 4;

/// Numbers that every power stage has, in form order.
pub(super) static ENTRIES: &[Entry] = &[
    Entry::new(
        "stage.input.least",
        "Input, least",
        Unit::Volt,
        Bounds::Positive,
        9.0,
        "Smallest input voltage at which the design must work.",
    ),
    Entry::new("stage.input.nominal", "Input, nominal", Unit::Volt, Bounds::Positive, 12.0, "Usual input voltage."),
    Entry::new(
        "stage.input.greatest",
        "Input, greatest",
        Unit::Volt,
        Bounds::Positive,
        16.0,
        "Largest input voltage at which the design must work.",
    ),
    Entry::new(
        "stage.source.resistance",
        "Source resistance",
        Unit::Ohm,
        Bounds::NonNegative,
        0.0,
        "Resistance between the ideal input source and the stage: cable, connector, fuse.",
    ),
    filters::INPUT_INDUCTANCE,
    filters::INPUT_RESISTANCE,
    filters::INPUT_DAMPING_RESISTANCE,
    filters::INPUT_DAMPING_CAPACITANCE,
    filters::INPUT_DAMPING_INDUCTANCE,
    Entry::new(
        "stage.input-capacitor.capacitance",
        "Input capacitor",
        Unit::Farad,
        Bounds::Positive,
        100e-6,
        "Capacitor across the stage's input terminals, as it is at bias and temperature.",
    )
    .spread(0.2),
    Entry::new(
        "stage.input-capacitor.esr",
        "Input capacitor ESR",
        Unit::Ohm,
        Bounds::NonNegative,
        0.02,
        "Equivalent series resistance of the input capacitor.",
    ),
    Entry::new(
        "stage.output.voltage",
        "Output",
        Unit::Volt,
        Bounds::Positive,
        24.0,
        "Wanted output voltage; its magnitude for an inverting stage. The divider and reference decide; a difference above 0.5 % is a finding.",
    ),
    Entry::new(
        "stage.load.least",
        "Load, least",
        Unit::Ampere,
        Bounds::Positive,
        0.5,
        "Smallest load current at the regulated output voltage.",
    ),
    Entry::new(
        "stage.load.nominal",
        "Load, nominal",
        Unit::Ampere,
        Bounds::Positive,
        1.0,
        "Usual load current at the regulated output voltage.",
    ),
    Entry::new(
        "stage.load.greatest",
        "Load, greatest",
        Unit::Ampere,
        Bounds::Positive,
        1.5,
        "Largest load current at the regulated output voltage.",
    ),
    Entry::new(
        "stage.switching-frequency",
        "Switching frequency",
        Unit::Hertz,
        Bounds::Positive,
        300e3,
        "Switching cycles per second.",
    )
    .spread(0.1),
    Entry::new(
        "stage.inductor.inductance",
        "Inductor",
        Unit::Henry,
        Bounds::Positive,
        10e-6,
        "Inductance at the operating current, saturation taken into account.",
    )
    .spread(0.2),
    Entry::new(
        "stage.inductor.resistance",
        "Winding resistance",
        Unit::Ohm,
        Bounds::NonNegative,
        0.018,
        "Resistance of the inductor's winding.",
    )
    .spread(0.1),
    Entry::new(
        "stage.switch.resistance",
        "Switch resistance",
        Unit::Ohm,
        Bounds::NonNegative,
        0.012,
        "Resistance of the conducting controlled switch.",
    )
    .spread(0.3),
    Entry::new(
        "stage.diode.drop",
        "Diode drop",
        Unit::Volt,
        Bounds::NonNegative,
        0.42,
        "Forward voltage of the diode extrapolated to zero current.",
    ),
    Entry::new(
        "stage.diode.resistance",
        "Diode resistance",
        Unit::Ohm,
        Bounds::NonNegative,
        0.02,
        "Slope of the diode's forward voltage over its current.",
    ),
    Entry::new(
        "stage.synchronous.resistance",
        "Rectifier resistance",
        Unit::Ohm,
        Bounds::NonNegative,
        0.012,
        "Resistance of the conducting synchronous rectifier.",
    )
    .spread(0.3),
    part("stage.bank.1.capacitance", "Capacitance of one", Unit::Farad, Bounds::Positive, 47e-6, CAPACITANCE_HELP),
    part(
        "stage.bank.1.remaining",
        "Share left at bias",
        Unit::Fraction,
        Bounds::PositiveUpTo(2.0),
        1.0,
        REMAINING_HELP,
    ),
    part("stage.bank.1.esr", "ESR of one", Unit::Ohm, Bounds::NonNegative, 0.003, ESR_HELP),
    part("stage.bank.1.esl", "ESL of one", Unit::Henry, Bounds::NonNegative, 0.0, ESL_HELP),
    part("stage.bank.1.count", "Count in parallel", Unit::One, Bounds::Between(1.0, 1000.0), 1.0, COUNT_HELP),
    part("stage.bank.2.capacitance", "Capacitance of one", Unit::Farad, Bounds::Positive, 100e-6, CAPACITANCE_HELP),
    part(
        "stage.bank.2.remaining",
        "Share left at bias",
        Unit::Fraction,
        Bounds::PositiveUpTo(2.0),
        1.0,
        REMAINING_HELP,
    ),
    part("stage.bank.2.esr", "ESR of one", Unit::Ohm, Bounds::NonNegative, 0.035, ESR_HELP),
    part("stage.bank.2.esl", "ESL of one", Unit::Henry, Bounds::NonNegative, 0.0, ESL_HELP),
    part("stage.bank.2.count", "Count in parallel", Unit::One, Bounds::Between(1.0, 1000.0), 1.0, COUNT_HELP),
    part("stage.bank.3.capacitance", "Capacitance of one", Unit::Farad, Bounds::Positive, 10e-6, CAPACITANCE_HELP),
    part(
        "stage.bank.3.remaining",
        "Share left at bias",
        Unit::Fraction,
        Bounds::PositiveUpTo(2.0),
        1.0,
        REMAINING_HELP,
    ),
    part("stage.bank.3.esr", "ESR of one", Unit::Ohm, Bounds::NonNegative, 0.004, ESR_HELP),
    part("stage.bank.3.esl", "ESL of one", Unit::Henry, Bounds::NonNegative, 0.0, ESL_HELP),
    part("stage.bank.3.count", "Count in parallel", Unit::One, Bounds::Between(1.0, 1000.0), 1.0, COUNT_HELP),
    part("stage.bank.4.capacitance", "Capacitance of one", Unit::Farad, Bounds::Positive, 1e-6, CAPACITANCE_HELP),
    part(
        "stage.bank.4.remaining",
        "Share left at bias",
        Unit::Fraction,
        Bounds::PositiveUpTo(2.0),
        1.0,
        REMAINING_HELP,
    ),
    part("stage.bank.4.esr", "ESR of one", Unit::Ohm, Bounds::NonNegative, 0.01, ESR_HELP),
    part("stage.bank.4.esl", "ESL of one", Unit::Henry, Bounds::NonNegative, 0.0, ESL_HELP),
    part("stage.bank.4.count", "Count in parallel", Unit::One, Bounds::Between(1.0, 1000.0), 1.0, COUNT_HELP),
    filters::OUTPUT_INDUCTANCE,
    filters::OUTPUT_RESISTANCE,
    filters::OUTPUT_DAMPING_RESISTANCE,
    filters::OUTPUT_CAPACITANCE,
    filters::OUTPUT_ESR,
];

const CAPACITANCE_HELP: &str = "Capacitance printed on one capacitor of this branch.";
const REMAINING_HELP: &str =
    "Share of the printed capacitance left at the output voltage and temperature; ceramics can lose more than half.";
const ESR_HELP: &str = "Equivalent series resistance of one capacitor of this branch.";
const ESL_HELP: &str = "Equivalent series inductance of one capacitor. It counts in the output impedance and load step everywhere; in the control path only where it carries no switched current and the load is a resistor.";
const COUNT_HELP: &str = "How many such capacitors stand in parallel.";

/// A row of a part, with the spread usual for its unit.
pub(super) const fn part(
    path: &'static str,
    name: &'static str,
    unit: Unit,
    bounds: Bounds,
    default: f64,
    help: &'static str,
) -> Entry {
    let row = Entry::new(path, name, unit, bounds, default, help);
    match unit {
        Unit::Farad => row.spread(0.2),
        Unit::Ohm => row.spread(0.5),
        _ => row,
    }
}

/// Choices that every power stage has, in form order.
pub(super) static CHOICES: &[Choice] = &[
    Choice {
        path: "stage.topology",
        name: "Topology",
        options: &super::registry::OPTIONS,
        default: "boost",
        help: "How switch, rectifier and inductor are joined.",
    },
    Choice {
        path: "stage.rectifier",
        name: "Rectifier",
        options: &[
            ChoiceOption {
                key: "diode",
                name: "Diode",
                help: "Blocks reverse current, so light loads run in discontinuous conduction.",
            },
            ChoiceOption {
                key: "synchronous",
                name: "Synchronous",
                help: "A switch that conducts whenever the controlled one does not: forced continuous conduction.",
            },
            ChoiceOption {
                key: "emulated",
                name: "Emulated diode",
                help: "A synchronous switch that opens when its current reaches zero, so light loads run in discontinuous conduction.",
            },
        ],
        default: "diode",
        help: "What conducts while the controlled switch is open.",
    },
    Choice {
        path: "stage.load",
        name: "Load kind",
        options: &[
            ChoiceOption { key: "resistor", name: "Resistor", help: "The current follows the voltage." },
            ChoiceOption {
                key: "current",
                name: "Constant current",
                help: "The current stays whatever the voltage does.",
            },
            ChoiceOption {
                key: "power",
                name: "Constant power",
                help: "The current rises when the voltage falls; taken by its tangent in linear results.",
            },
        ],
        default: "resistor",
        help: "How the load current answers the output voltage.",
    },
    filters::INPUT,
    filters::INPUT_DAMPING,
    Choice {
        path: "stage.input-capacitor",
        name: "Input capacitor",
        options: &[
            ChoiceOption { key: "none", name: "None", help: "The stage hangs on the source and its resistance alone." },
            ChoiceOption {
                key: "fitted",
                name: "Fitted",
                help: "A capacitor with its ESR across the stage's input terminals.",
            },
        ],
        default: "none",
        help: "Capacitor across the stage's input terminals. It counts only behind a source resistance; with an input filter it is the filter's capacitor.",
    },
    Choice {
        path: "stage.bank",
        name: "Output bank",
        options: &[
            ChoiceOption { key: "1", name: "One kind", help: "All output capacitors are alike." },
            ChoiceOption { key: "2", name: "Two kinds", help: "Two kinds of capacitor in parallel." },
            ChoiceOption { key: "3", name: "Three kinds", help: "Three kinds of capacitor in parallel." },
            ChoiceOption { key: "4", name: "Four kinds", help: "Four kinds of capacitor in parallel." },
        ],
        default: "1",
        help: "How many unlike kinds of capacitor stand in parallel at the output.",
    },
    filters::OUTPUT,
    filters::OUTPUT_DAMPING,
    filters::OUTPUT_SENSE,
];

/// Whether an entry or choice of the stage plays a part under these choices.
pub fn applies(path: &str, choices: &Choices) -> bool {
    if let Some(applies) = own_applies(path, choices) {
        return applies;
    }
    let (input_filter, output_filter) =
        (choices.is("stage.input-filter", "fitted"), choices.is("stage.output-filter", "fitted"));
    let damped = |by: &str| input_filter && choices.is("stage.input-filter.damping", by);
    match path {
        "stage.input-filter" | "stage.output-filter" => true,
        // The filter brings its capacitor along.
        "stage.input-capacitor" => !input_filter,
        "stage.input-capacitor.capacitance" | "stage.input-capacitor.esr" => {
            input_filter || choices.is("stage.input-capacitor", "fitted")
        }
        "stage.input-filter.damping.resistance" => damped("capacitor") || damped("inductor"),
        "stage.input-filter.damping.capacitance" => damped("capacitor"),
        "stage.input-filter.damping.inductance" => damped("inductor"),
        "stage.output-filter.damping.resistance" => {
            output_filter && choices.is("stage.output-filter.damping", "resistor")
        }
        _ if path.starts_with("stage.input-filter.") => input_filter,
        _ if path.starts_with("stage.output-filter.") => output_filter,
        "stage.diode.drop" | "stage.diode.resistance" => Rectifier::chosen(choices) == Rectifier::Diode,
        "stage.synchronous.resistance" => Rectifier::chosen(choices) != Rectifier::Diode,
        _ => match path.strip_prefix("stage.bank.") {
            Some(rest) => {
                let number = rest.split('.').next().and_then(|n| n.parse::<usize>().ok()).unwrap_or(0);
                number <= branch_count(choices)
            }
            None => true,
        },
    }
}

/// Number of unlike branches chosen.
pub(super) fn branch_count(choices: &Choices) -> usize {
    choices.get("stage.bank").and_then(|key| key.parse().ok()).unwrap_or(1).clamp(1, BRANCHES)
}
