//! Rows of the table of entries for the input filter and the second-stage output filter.

use super::entries::part;
use crate::quantity::{Bounds, Choice, ChoiceOption, Entry, Unit};

/// Inductor between source and input capacitor.
pub(super) const INPUT_INDUCTANCE: Entry = part(
    "stage.input-filter.inductance",
    "Filter inductor",
    Unit::Henry,
    Bounds::Positive,
    4.7e-6,
    "Inductance between the source and the input capacitor, at the greatest input current.",
)
.spread(0.2);
/// Its winding.
pub(super) const INPUT_RESISTANCE: Entry = part(
    "stage.input-filter.resistance",
    "Filter winding",
    Unit::Ohm,
    Bounds::NonNegative,
    0.01,
    "Resistance of the filter inductor's winding.",
)
.spread(0.1);
/// Resistor of either damping branch.
pub(super) const INPUT_DAMPING_RESISTANCE: Entry = part(
    "stage.input-filter.damping.resistance",
    "Damping resistor",
    Unit::Ohm,
    Bounds::Positive,
    0.2,
    "Resistor of the damping branch, the ESR of its capacitor or the winding of its inductor included.",
)
.spread(0.1);
/// Capacitor of the branch across the input capacitor.
pub(super) const INPUT_DAMPING_CAPACITANCE: Entry = part(
    "stage.input-filter.damping.capacitance",
    "Damping capacitor",
    Unit::Farad,
    Bounds::Positive,
    220e-6,
    "Capacitor in series with the damping resistor, as it is at bias and temperature; usually two to ten times the input capacitor.",
);
/// Inductor of the branch across the filter inductor.
pub(super) const INPUT_DAMPING_INDUCTANCE: Entry = part(
    "stage.input-filter.damping.inductance",
    "Damping inductor",
    Unit::Henry,
    Bounds::Positive,
    1e-6,
    "Inductor in series with the damping resistor; usually a tenth to a half of the filter inductor.",
)
.spread(0.2);
/// Inductor behind the output bank.
pub(super) const OUTPUT_INDUCTANCE: Entry = part(
    "stage.output-filter.inductance",
    "Second inductor",
    Unit::Henry,
    Bounds::Positive,
    0.22e-6,
    "Inductance between the output bank and the second output capacitor, at the greatest load current.",
)
.spread(0.2);
/// Its winding.
pub(super) const OUTPUT_RESISTANCE: Entry = part(
    "stage.output-filter.resistance",
    "Second winding resistance",
    Unit::Ohm,
    Bounds::NonNegative,
    0.005,
    "Resistance of the second inductor's winding.",
)
.spread(0.1);
/// Capacitor at the load.
pub(super) const OUTPUT_CAPACITANCE: Entry = part(
    "stage.output-filter.capacitance",
    "Second capacitor",
    Unit::Farad,
    Bounds::Positive,
    22e-6,
    "Capacitor across the load behind the second inductor, as it is at bias and temperature.",
);
/// Its series resistance.
pub(super) const OUTPUT_ESR: Entry = part(
    "stage.output-filter.esr",
    "Second capacitor ESR",
    Unit::Ohm,
    Bounds::NonNegative,
    0.005,
    "Equivalent series resistance of the second capacitor.",
);
/// Resistor across the second inductor.
pub(super) const OUTPUT_DAMPING_RESISTANCE: Entry = part(
    "stage.output-filter.damping.resistance",
    "Second damping resistor",
    Unit::Ohm,
    Bounds::Positive,
    0.5,
    "Resistor across the second inductor.",
)
.spread(0.05);

const FITTED: &str = "fitted";

/// Whether an input filter is fitted.
pub(super) const INPUT: Choice = Choice {
    path: "stage.input-filter",
    name: "Input filter",
    options: &[
        ChoiceOption { key: "none", name: "None", help: "The source feeds the stage through its resistance alone." },
        ChoiceOption {
            key: FITTED,
            name: "Fitted",
            help: "An inductor between source and input capacitor; the capacitor then always counts.",
        },
    ],
    default: "none",
    help: "Inductor and capacitor that keep switched current from the source.",
};

/// What damps the input filter.
pub(super) const INPUT_DAMPING: Choice = Choice {
    path: "stage.input-filter.damping",
    name: "Filter damping",
    options: &[
        ChoiceOption { key: "none", name: "None", help: "Only winding and ESR damp the filter." },
        ChoiceOption {
            key: "capacitor",
            name: "R–C across the capacitor",
            help: "A resistor in series with a larger capacitor, across the input capacitor.",
        },
        ChoiceOption {
            key: "inductor",
            name: "R–L across the inductor",
            help: "A resistor in series with a smaller inductor, across the filter inductor.",
        },
    ],
    default: "none",
    help: "Branch that takes the filter's resonance down.",
};

/// Whether a second-stage output filter is fitted.
pub(super) const OUTPUT: Choice = Choice {
    path: "stage.output-filter",
    name: "Output filter",
    options: &[
        ChoiceOption { key: "none", name: "None", help: "The load stands at the output bank." },
        ChoiceOption {
            key: FITTED,
            name: "Fitted",
            help: "A second inductor behind the output bank, a second capacitor and the load behind it.",
        },
    ],
    default: "none",
    help: "Second stage of filtering between output bank and load.",
};

/// What damps the output filter.
pub(super) const OUTPUT_DAMPING: Choice = Choice {
    path: "stage.output-filter.damping",
    name: "Output damping",
    options: &[
        ChoiceOption { key: "none", name: "None", help: "Only winding, ESR and load damp the second stage." },
        ChoiceOption {
            key: "resistor",
            name: "Resistor across the inductor",
            help: "A resistor parallel to the second inductor.",
        },
    ],
    default: "none",
    help: "What takes the second stage's resonance down.",
};

/// Where the regulated voltage is sensed.
pub(super) const OUTPUT_SENSE: Choice = Choice {
    path: "stage.output-filter.sense",
    name: "Sensed at",
    options: &[
        ChoiceOption {
            key: "load",
            name: "The load, behind the filter",
            help: "The load's voltage is regulated; the second stage stands inside the loop.",
        },
        ChoiceOption {
            key: "bank",
            name: "The bank, before the filter",
            help: "The bank's voltage is regulated; the load's lies below it by the drop of the second inductor.",
        },
    ],
    default: "load",
    help: "Where divider and regulated output voltage are taken.",
};
