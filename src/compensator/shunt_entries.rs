//! Rows of the isolated feedback in the table of entries: shunt regulator of the 431 type and optocoupler.
//!
//! *Conventions.* `compensator.opto.` is the optocoupler with the resistors around its LED and transistor, `compensator.shunt.` the
//! regulator. The transfer ratio is collector current over LED current.

use super::entries::{CAPACITANCE, RESISTANCE};
use crate::quantity::{Bounds, Choice, ChoiceOption, Choices, Entry, Unit};

/// Transfer ratios of optocouplers: a plain transistor lies between 0.1 and 6, a Darlington reaches 20.
const RATIO: Bounds = Bounds::Between(1e-3, 100.0);
/// Voltages of supplies and junctions [V].
const VOLTAGE: Bounds = Bounds::PositiveUpTo(1000.0);

/// Every number of the isolated feedback, in the order of the form.
pub(super) const ENTRIES: &[Entry] = &[
    Entry::new(
        "compensator.opto.transfer-ratio.least",
        "Least transfer ratio",
        Unit::Fraction,
        RATIO,
        0.63,
        "Collector current over LED current, at the currents of this design: grade, temperature and age taken at their worst.",
    ),
    Entry::new(
        "compensator.opto.transfer-ratio.nominal",
        "Nominal transfer ratio",
        Unit::Fraction,
        RATIO,
        0.9,
        "Collector current over LED current that all curves are drawn with.",
    ),
    Entry::new(
        "compensator.opto.transfer-ratio.greatest",
        "Greatest transfer ratio",
        Unit::Fraction,
        RATIO,
        1.25,
        "Collector current over LED current at its highest: the loop gain rises with it.",
    ),
    Entry::new(
        "compensator.opto.led-resistor",
        "Rled, sets the gain of the fast path",
        Unit::Ohm,
        RESISTANCE,
        1e3,
        "From the LED's supply to the LED. Mid-band gain = transfer ratio × pull-up / this; it must leave LED and regulator their voltage.",
    )
    .spread(0.01),
    Entry::new(
        "compensator.opto.bias-resistor",
        "Rbias, feeds the regulator",
        Unit::Ohm,
        RESISTANCE,
        1e3,
        "Across the LED: its current, the LED's drop over this, keeps the regulator above its least current.",
    )
    .spread(0.01),
    Entry::new(
        "compensator.opto.pull-up",
        "Rpull, the pull-up",
        Unit::Ohm,
        RESISTANCE,
        4.7e3,
        "From the controller's supply to the optocoupler's collector, where the control voltage stands.",
    )
    .spread(0.01),
    Entry::new(
        "compensator.opto.supply",
        "Supply of the pull-up",
        Unit::Volt,
        VOLTAGE,
        5.0,
        "The control voltage rises to it when the LED is dark.",
    )
    .spread(0.02),
    Entry::new(
        "compensator.opto.saturation",
        "Saturation voltage",
        Unit::Volt,
        Bounds::Between(0.0, 10.0),
        0.3,
        "The lowest control voltage that the optocoupler's transistor reaches.",
    ),
    Entry::new(
        "compensator.opto.led-drop",
        "Drop of the LED",
        Unit::Volt,
        Bounds::PositiveUpTo(10.0),
        1.1,
        "Forward voltage of the LED, extrapolated to no current.",
    ),
    Entry::new(
        "compensator.opto.led-resistance",
        "Dynamic resistance of the LED",
        Unit::Ohm,
        Bounds::Between(0.0, 1e6),
        20.0,
        "Slope of the LED's forward voltage over its current; about 26 mV over the LED current, and some ohms of its own.",
    ),
    Entry::new(
        "compensator.opto.led-supply",
        "Fixed supply of the LED",
        Unit::Volt,
        VOLTAGE,
        12.0,
        "A voltage that does not follow the output. The LED resistor then carries no fast path.",
    )
    .spread(0.02),
    Entry::new(
        "compensator.opto.pole",
        "Pole of the optocoupler",
        Unit::Hertz,
        Bounds::Between(1.0, 1e9),
        15e3,
        "Where the optocoupler's response has fallen by 3 dB, measured with the collector resistor below.",
    )
    .spread(0.5),
    Entry::new(
        "compensator.opto.pole-at",
        "Measured with a resistor of",
        Unit::Ohm,
        RESISTANCE,
        4.7e3,
        "Collector resistor at which that pole was measured: the pole moves with the inverse of the pull-up.",
    ),
    Entry::new(
        "compensator.opto.capacitance",
        "Capacitance at the collector",
        Unit::Farad,
        CAPACITANCE,
        2.2e-9,
        "Equivalent capacitance of the optocoupler at its collector, 1 / (2π · pole · resistor); it stands in parallel with C2.",
    )
    .spread(0.5),
    Entry::new(
        "compensator.shunt.dc-gain",
        "Gain of the regulator at DC",
        Unit::One,
        Bounds::Between(1.0, 1e9),
        700.0,
        "Cathode voltage over reference voltage: the inverse of the data sheet's change of the reference with the cathode voltage, 700 for 1.4 mV/V.",
    )
    .spread(0.5),
    Entry::new(
        "compensator.shunt.gain-bandwidth",
        "Gain-bandwidth product",
        Unit::Hertz,
        Bounds::Between(1.0, 1e12),
        1e6,
        "Where the regulator's own gain, falling with one pole, reaches 1.",
    )
    .spread(0.3),
    Entry::new(
        "compensator.shunt.least-current",
        "Least cathode current",
        Unit::Ampere,
        Bounds::Between(1e-9, 10.0),
        1e-3,
        "Below it the regulator does not regulate: commonly 1 mA, 50 to 100 µA for low-power ones.",
    ),
    Entry::new(
        "compensator.shunt.least-voltage",
        "Least cathode voltage",
        Unit::Volt,
        VOLTAGE,
        2.5,
        "The lowest voltage the regulator pulls its cathode to: near its reference.",
    ),
];

/// Every choice of the isolated feedback, in the order of the form.
pub(super) const CHOICES: &[Choice] = &[
    Choice {
        path: "compensator.opto.fast-path",
        name: "LED fed from",
        options: &[
            ChoiceOption {
                key: "load",
                name: "output, at the load",
                help: "The fast path: changes of the output drive the LED at once. Behind a second stage it lags like the load.",
            },
            ChoiceOption {
                key: "bank",
                name: "output bank",
                help: "The fast path ahead of a second stage: it does not see that filter's lag.",
            },
            ChoiceOption {
                key: "none",
                name: "fixed supply",
                help: "No fast path: the regulator's network alone decides, as around an op amp.",
            },
        ],
        default: "load",
        help: "What the LED resistor is tied to: a supply that follows the output is a second path of the feedback.",
    },
    Choice {
        path: "compensator.shunt.series-resistor",
        name: "R2 in series with C1",
        options: &[
            ChoiceOption { key: "none", name: "none", help: "The zero is that of the upper divider resistor and C1." },
            ChoiceOption {
                key: "fitted",
                name: "fitted",
                help: "Lifts the mid-band gain above that of the fast path, by 1 + R2 / Rupper.",
            },
        ],
        default: "none",
        help: "Beside a fast path the network has its zero without it.",
    },
    Choice {
        path: "compensator.opto.kept",
        name: "Resistor kept",
        options: &[
            ChoiceOption { key: "r2", name: "R2", help: "Moving a lane keeps it; the LED resistor follows." },
            ChoiceOption { key: "led-resistor", name: "LED resistor", help: "Moving a lane keeps it; R2 follows." },
        ],
        default: "r2",
        help: "The resistor that stays when a pole or zero is moved. Divider, pull-up and bias resistor always stay.",
    },
    Choice {
        path: "compensator.opto.speed",
        name: "Optocoupler's speed by",
        options: &[
            ChoiceOption {
                key: "pole",
                name: "a measured pole",
                help: "A frequency, and the resistor it was measured with.",
            },
            ChoiceOption {
                key: "capacitance",
                name: "a capacitance",
                help: "The same as a capacitance at the collector.",
            },
        ],
        default: "pole",
        help: "The collector capacitance makes a pole with the pull-up that is fitted.",
    },
];

/// Whether a row of the isolated feedback applies where this amplifier is chosen; `kind` is the network's key.
pub(super) fn applies(path: &str, kind: &str, choices: &Choices) -> bool {
    let fixed = choices.is("compensator.opto.fast-path", "none");
    match path {
        "compensator.opto.led-supply" => fixed,
        "compensator.shunt.series-resistor" => kind != "1" && !fixed,
        "compensator.opto.kept" => has_series_resistor(kind, choices),
        "compensator.opto.pole" | "compensator.opto.pole-at" => !choices.is("compensator.opto.speed", "capacitance"),
        "compensator.opto.capacitance" => choices.is("compensator.opto.speed", "capacitance"),
        _ => true,
    }
}

/// Whether a resistor stands in series with C1: where one is fitted, and where there is no fast path to make the zero.
pub(super) fn has_series_resistor(kind: &str, choices: &Choices) -> bool {
    let fixed = choices.is("compensator.opto.fast-path", "none");
    kind != "1" && (fixed || choices.is("compensator.shunt.series-resistor", "fitted"))
}
