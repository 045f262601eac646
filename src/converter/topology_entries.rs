//! Rows of the table of entries that only some topologies have, shared between those that do.
//!
//! A topology lists what it needs; form, file, findings and `--set` follow. A row at the path of a common one stands in for
//! it where its topology is chosen.

use super::entries::part;
use super::registry::{find, registry};
use crate::quantity::{Bounds, Choice, ChoiceOption, Choices, Entry, Unit};
use std::sync::LazyLock;

/// Turns ratio of the transformer.
pub(super) static RATIO: Entry = turns_ratio(1.0);

/// The row of a turns ratio, with the default that suits a topology.
pub(super) const fn turns_ratio(default: f64) -> Entry {
    Entry::new(
        "stage.transformer.ratio",
        "Turns ratio, Ns/Np",
        Unit::One,
        Bounds::Between(1e-3, 1e3),
        default,
        "Turns of the secondary winding over turns of the primary winding.",
    )
}

/// Magnetising inductance in the place of the inductor.
pub(super) static MAGNETISING_INDUCTOR: Entry = part(
    "stage.inductor.inductance",
    "Magnetising inductance",
    Unit::Henry,
    Bounds::Positive,
    10e-6,
    "Inductance of the primary winding at the operating current, saturation taken into account: it stores the energy of each pulse.",
)
.spread(0.2);

/// Winding resistance of a transformer that stores energy.
pub(super) static PRIMARY_WINDING: Entry = part(
    "stage.inductor.resistance",
    "Winding resistance",
    Unit::Ohm,
    Bounds::NonNegative,
    0.018,
    "Resistance of the primary winding; the secondary's counts as alike, by the square of the turns ratio.",
)
.spread(0.1);

/// The inductor at the input, of a stage of two.
pub(super) static INPUT_SIDE_INDUCTOR: Entry = part(
    "stage.inductor.inductance",
    "Inductor L1, input side",
    Unit::Henry,
    Bounds::Positive,
    10e-6,
    "Inductance of the inductor at the input at its operating current, saturation taken into account; of a coupled pair, with the other winding open.",
)
.spread(0.2);

/// Its winding.
pub(super) static INPUT_SIDE_WINDING: Entry = part(
    "stage.inductor.resistance",
    "Winding resistance L1",
    Unit::Ohm,
    Bounds::NonNegative,
    0.018,
    "Resistance of the first inductor's winding.",
)
.spread(0.1);

/// The other inductor of a stage of two.
pub(super) static SECOND_INDUCTOR: Entry = part(
    "stage.second-inductor.inductance",
    "Inductor L2, output side",
    Unit::Henry,
    Bounds::Positive,
    10e-6,
    "Inductance of the second inductor at its operating current, saturation taken into account; of a coupled pair, with the other winding open.",
)
.spread(0.2);

/// Its winding.
pub(super) static SECOND_WINDING: Entry = part(
    "stage.second-inductor.resistance",
    "Winding resistance L2",
    Unit::Ohm,
    Bounds::NonNegative,
    0.018,
    "Resistance of the second inductor's winding.",
)
.spread(0.1);

/// Coupling factor of two inductors on one core.
pub(super) static COUPLING: Entry = Entry::new(
    "stage.inductors.coupling",
    "Coupling factor",
    Unit::One,
    Bounds::Between(0.0, 0.999),
    0.97,
    "Mutual inductance over √(L1·L2), dots so that both currents magnetise alike. What is missing to 1 is leakage, which keeps the circulating current between the windings small.",
);

/// Whether two inductors share a core.
pub(super) static INDUCTORS: Choice = Choice {
    path: "stage.inductors",
    name: "Inductors",
    options: &[
        ChoiceOption { key: "separate", name: "Separate", help: "Each inductor on a core of its own." },
        ChoiceOption { key: "coupled", name: "Coupled", help: "Both windings on one core, the dots at like ends." },
    ],
    default: "separate",
    help: "Whether the two inductors share a core.",
};

/// The capacitor that joins input side and output side.
pub(super) static COUPLING_CAPACITOR: Entry = part(
    "stage.coupling-capacitor.capacitance",
    "Coupling capacitor",
    Unit::Farad,
    Bounds::Positive,
    10e-6,
    "Capacitor between input side and output side, as it is at bias and temperature. It carries the whole power.",
);

/// Its series resistance.
pub(super) static COUPLING_CAPACITOR_ESR: Entry = part(
    "stage.coupling-capacitor.esr",
    "Coupling capacitor ESR",
    Unit::Ohm,
    Bounds::NonNegative,
    5e-3,
    "Equivalent series resistance of the coupling capacitor.",
);

/// Whether a branch damps the resonance of the coupling capacitor with the inductors.
pub(super) static DAMPING: Choice = Choice {
    path: "stage.coupling-capacitor.damping",
    name: "Coupling damping",
    options: &[
        ChoiceOption {
            key: "none",
            name: "None",
            help: "ESR and windings alone damp the resonance with the inductors.",
        },
        ChoiceOption {
            key: "capacitor",
            name: "Resistor and capacitor",
            help: "A resistor in series with a larger capacitor, across the coupling capacitor.",
        },
    ],
    default: "none",
    help: "Branch across the coupling capacitor, whose resonance with the inductors turns the phase by whole turns when it is not damped.",
};

/// Capacitor of that branch.
pub(super) static DAMPING_CAPACITANCE: Entry = part(
    "stage.coupling-capacitor.damping.capacitance",
    "Damping capacitor",
    Unit::Farad,
    Bounds::Positive,
    47e-6,
    "Capacitor in series with the damping resistor, as it is at bias and temperature. Common practice: four times the coupling capacitor or more.",
);

/// Resistor of that branch.
pub(super) static DAMPING_RESISTANCE: Entry = part(
    "stage.coupling-capacitor.damping.resistance",
    "Damping resistor",
    Unit::Ohm,
    Bounds::Positive,
    1.5,
    "Resistor in series with the damping capacitor, its ESR included. Common practice: 0.6 times the characteristic impedance of inductors and coupling capacitor, where the branch's capacitor is four times that.",
);

/// Own rows that play a part whatever is chosen.
pub(super) fn always(_: &str, _: &Choices) -> bool {
    true
}

/// Own rows of a stage of two inductors: a coupling factor only for coupled ones, a damping branch only where one is fitted.
pub(super) fn of_two_inductors(path: &str, choices: &Choices) -> bool {
    match path {
        _ if path == COUPLING.path => coupled(choices),
        _ if path == DAMPING_CAPACITANCE.path || path == DAMPING_RESISTANCE.path => damped(choices),
        _ => true,
    }
}

/// Whether the two inductors share a core.
pub(super) fn coupled(choices: &Choices) -> bool {
    choices.is(INDUCTORS.path, "coupled")
}

/// Whether a branch damps the coupling capacitor.
pub(super) fn damped(choices: &Choices) -> bool {
    choices.is(DAMPING.path, "capacitor")
}

/// Row after which the own rows of topologies stand in the form.
const AFTER: &str = "stage.inductor.resistance";

static ALL_ENTRIES: LazyLock<Vec<&'static Entry>> = LazyLock::new(|| {
    let common = super::entries::ENTRIES;
    let is_common = |path: &str| common.iter().any(|entry| entry.path == path);
    let mut own: Vec<&'static Entry> = Vec::new();
    for entry in registry().iter().flat_map(|topology| topology.entries.iter().copied()) {
        if !is_common(entry.path) && !own.iter().any(|known| known.path == entry.path) {
            own.push(entry);
        }
    }
    let after = common.iter().position(|entry| entry.path == AFTER).map_or(common.len(), |at| at + 1);
    common[..after].iter().chain(own).chain(&common[after..]).collect()
});

static ALL_CHOICES: LazyLock<Vec<&'static Choice>> = LazyLock::new(|| {
    let mut all: Vec<&'static Choice> = super::entries::CHOICES.iter().collect();
    let mut at = all.iter().position(|choice| choice.path == "stage.topology").map_or(0, |at| at + 1);
    for choice in registry().iter().flat_map(|topology| topology.choices.iter().copied()) {
        if !all.iter().any(|known| known.path == choice.path) {
            all.insert(at, choice);
            at += 1;
        }
    }
    all
});

/// Numbers of the power stage, those of every topology among them, in form order.
pub fn entries() -> &'static [&'static Entry] {
    &ALL_ENTRIES
}

/// Choices of the power stage, likewise.
pub fn choices() -> &'static [&'static Choice] {
    &ALL_CHOICES
}

/// The row that stands at a row's path under these choices: the chosen topology's own, where it has one.
pub fn row(entry: &'static Entry, choices: &Choices) -> &'static Entry {
    chosen(choices).and_then(|topology| topology.entry(entry.path)).unwrap_or(entry)
}

fn chosen(choices: &Choices) -> Option<&'static super::Topology> {
    find(choices.get("stage.topology").unwrap_or("boost"))
}

/// Whether a row, number or choice, is not one that only some topologies have.
pub fn is_common(path: &str) -> bool {
    // Few rows are in any topology's list, so that is asked first.
    !registry().iter().any(|topology| topology.has(path))
        || super::entries::ENTRIES.iter().any(|entry| entry.path == path)
        || super::entries::CHOICES.iter().any(|choice| choice.path == path)
}

/// Whether a row that only some topologies have plays a part; none for a row that all have.
pub(super) fn own_applies(path: &str, choices: &Choices) -> Option<bool> {
    if is_common(path) {
        return None;
    }
    Some(chosen(choices).is_some_and(|topology| topology.has(path) && (topology.applies)(path, choices)))
}
