//! The table of entries of the modulator.

use crate::quantity::{Bounds, Choice, ChoiceOption, Choices, Entry, Unit};

/// Numbers of the modulator, in form order.
pub static ENTRIES: &[Entry] = &[
    Entry::new("control.ramp.amplitude", "Ramp, peak to peak", Unit::Volt, Bounds::Positive, 1.2, "Height of the ramp the control voltage is compared with; with line feed-forward, its height at the nominal input.").spread(0.1),
    Entry::new("control.ramp.valley", "Ramp, lowest point", Unit::Volt, Bounds::Finite, 0.0, "Control voltage at which the duty ratio is zero."),
    Entry::new("control.duty.least", "Duty ratio, least", Unit::One, Bounds::Between(0.0, 1.0), 0.0, "Smallest duty ratio the modulator gives."),
    Entry::new("control.duty.greatest", "Duty ratio, greatest", Unit::One, Bounds::Between(0.0, 1.0), 0.85, "Largest duty ratio the modulator gives."),
    Entry::new("control.delay", "Delay", Unit::Second, Bounds::NonNegative, 100e-9, "Time from comparator to switch node: exact in frequency responses, a third-order rational form in poles and steps."),
];

/// Choices of the modulator, in form order.
pub static CHOICES: &[Choice] = &[
    Choice {
        path: "control.mode",
        name: "Control",
        options: &[ChoiceOption {
            key: "voltage",
            name: "Voltage mode",
            help: "The control voltage sets the duty ratio through a ramp.",
        }],
        default: "voltage",
        help: "What the control voltage commands.",
    },
    Choice {
        path: "control.feedforward",
        name: "Line feed-forward",
        options: &[
            ChoiceOption { key: "none", name: "None", help: "The ramp has one height." },
            ChoiceOption {
                key: "line",
                name: "Ramp follows the input",
                help: "The ramp's height is proportional to the ideal source's voltage, without delay.",
            },
        ],
        default: "none",
        help: "Whether the ramp follows the input voltage, so that the duty ratio answers the line without the loop.",
    },
];

/// Whether an entry or choice of the modulator plays a part under these choices.
pub fn applies(_path: &str, _choices: &Choices) -> bool {
    true
}
