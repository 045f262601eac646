//! The table of entries of the control: mode, ramp, current sense, slope compensation, inner loop.

use crate::quantity::{Bounds, Choice, ChoiceOption, Choices, Entry, Unit};

/// Resistances of the inner network [Ω]: wider than anything fitted, narrow enough to stop a slip of the prefix.
const RESISTANCE: Bounds = Bounds::Between(1e-3, 1e9);
/// Capacitances of the inner network [F], likewise.
const CAPACITANCE: Bounds = Bounds::Between(1e-16, 1.0);
/// Voltages the inner amplifier's output may be limited to [V].
const OUTPUT_VOLTAGE: Bounds = Bounds::Between(-1000.0, 1000.0);

/// Numbers of the control, in form order.
pub static ENTRIES: &[Entry] = &[
    Entry::new("control.ramp.amplitude", "Ramp, peak to peak", Unit::Volt, Bounds::Positive, 1.2, "Height of the ramp the control voltage is compared with; in average current mode the inner amplifier's output is. With line feed-forward, its height at the nominal input.").spread(0.1),
    Entry::new("control.ramp.valley", "Ramp, lowest point", Unit::Volt, Bounds::Finite, 0.0, "Voltage at which the duty ratio is zero."),
    Entry::new("control.sense.gain", "Sense gain, V/A", Unit::Ohm, Bounds::Positive, 0.1, "Volts at the comparator per ampere of the controlled switch's current: shunt times amplifier. Behind a transformer that is the primary side's current.").spread(0.05),
    Entry::new("control.sense.transconductance", "Stage transconductance", Unit::Siemens, Bounds::Positive, 10.0, "Amperes of the controlled switch's current per volt of control voltage, as data sheets give it for the whole stage, in A/V.").spread(0.2),
    Entry::new("control.sense.filter", "Sense filter", Unit::Second, Bounds::NonNegative, 0.0, "Time constant R·C of the filter between sense and comparator; 0 for none."),
    Entry::new("control.sense.divider", "Divider to the comparator", Unit::One, Bounds::PositiveUpTo(1.0), 1.0, "Comparator's volts per volt of control voltage; 1 for none. It turns the ramp at the comparator into volts of control."),
    Entry::new("control.sense.offset", "Control voltage of no current", Unit::Volt, Bounds::Between(-1000.0, 1000.0), 0.0, "Offset between control voltage and comparator, ahead of the divider."),
    Entry::new("control.slope.rate", "Compensating ramp", Unit::VoltPerSecond, Bounds::NonNegative, 100e3, "Slope of the ramp added to the sensed current at the comparator."),
    Entry::new("control.slope.share", "Compensating ramp, share", Unit::Fraction, Bounds::NonNegative, 0.5, "Share of the current's slope at the nominal condition: of the down-slope in peak, of the up-slope in valley current mode."),
    Entry::new("control.slope.quality", "Qp wanted", Unit::One, Bounds::Between(0.05, 100.0), 1.0, "Quality factor of the sampling pair at half the switching frequency, at the nominal condition. Common practice: near 1."),
    Entry::new("control.blanking", "Blanking", Unit::Second, Bounds::NonNegative, 100e-9, "How long after the clock's edge the comparator is blind."),
    Entry::new("control.on-time.least", "Least on-time", Unit::Second, Bounds::NonNegative, 0.0, "Shortest time the switch conducts; 0 for none."),
    Entry::new("control.clamp", "Control voltage clamp", Unit::Volt, Bounds::Between(-1000.0, 1000.0), 3.0, "Greatest control voltage that is let through: it limits the current. Empty for none.").optional(),
    Entry::new("control.current-limit", "Current limit", Unit::Ampere, Bounds::Positive, 5.0, "Sensed current that ends the pulse in every period, whatever the control voltage asks; it acts in the switched transient. Empty for none.").optional(),
    Entry::new("control.inner.r1", "Inner R1, input", Unit::Ohm, RESISTANCE, 10e3, "From the sensed current to the inner op amp's input.").spread(0.01),
    Entry::new("control.inner.r2", "Inner R2, sets the zero", Unit::Ohm, RESISTANCE, 22e3, "In series with C1: around the inner op amp, or from the transconductance amplifier's output to ground.").spread(0.01),
    Entry::new("control.inner.c1", "Inner C1, integrating capacitor", Unit::Farad, CAPACITANCE, 680e-12, "In series with R2.").spread(0.1),
    Entry::new("control.inner.c2", "Inner C2, sets the pole", Unit::Farad, CAPACITANCE, 33e-12, "Across R2 and C1; keeps the current's ripple from the comparator.").spread(0.1),
    Entry::new("control.inner.op-amp.dc-gain", "Inner open-loop DC gain", Unit::One, Bounds::Between(1.0, 1e9), 10e3, "Ratio, not decibels: 80 dB is 10k.").spread(0.5),
    Entry::new("control.inner.op-amp.gain-bandwidth", "Inner gain-bandwidth product", Unit::Hertz, Bounds::Between(1.0, 1e12), 10e6, "Where the inner op amp's open-loop gain, falling with one pole, reaches 1.").spread(0.3),
    Entry::new("control.inner.transconductance.gm", "Inner transconductance", Unit::Siemens, Bounds::Between(1e-9, 1e3), 1e-3, "Output current per volt between the inner amplifier's inputs.").spread(0.2),
    Entry::new("control.inner.transconductance.output-resistance", "Inner output resistance", Unit::Ohm, Bounds::Between(1.0, 1e12), 2e6, "Limits the inner DC gain to gm × this resistance.").spread(0.5),
    Entry::new("control.inner.output-least", "Inner output, least", Unit::Volt, OUTPUT_VOLTAGE, 0.0, "The lowest voltage the inner amplifier gives."),
    Entry::new("control.inner.output-greatest", "Inner output, greatest", Unit::Volt, OUTPUT_VOLTAGE, 4.5, "The highest voltage the inner amplifier gives."),
    Entry::new("control.duty.least", "Duty ratio, least", Unit::One, Bounds::Between(0.0, 1.0), 0.0, "Smallest duty ratio the modulator gives."),
    Entry::new("control.duty.greatest", "Duty ratio, greatest", Unit::One, Bounds::Between(0.0, 1.0), 0.85, "Largest duty ratio the modulator gives."),
    Entry::new("control.delay", "Delay", Unit::Second, Bounds::NonNegative, 100e-9, "Time from comparator to switch node: exact in frequency responses, a third-order rational form in poles and steps, and inside the inner loop of average current mode."),
];

/// Choices of the control, in form order.
pub static CHOICES: &[Choice] = &[
    Choice {
        path: "control.mode",
        name: "Control",
        options: &[
            ChoiceOption {
                key: "voltage",
                name: "Voltage mode",
                help: "The control voltage sets the duty ratio through a ramp.",
            },
            ChoiceOption {
                key: "peak-current",
                name: "Peak current mode",
                help: "The clock closes the switch, the current's peak opens it.",
            },
            ChoiceOption {
                key: "valley-current",
                name: "Valley current mode",
                help: "The clock opens the switch, the current's valley closes it.",
            },
            ChoiceOption {
                key: "average-current",
                name: "Average current mode",
                help: "An inner loop with its own compensator makes the average current follow the control voltage.",
            },
        ],
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
    Choice {
        path: "control.sense",
        name: "Current sense given as",
        options: &[
            ChoiceOption { key: "gain", name: "Sense gain", help: "Volts at the comparator per ampere." },
            ChoiceOption {
                key: "transconductance",
                name: "Stage transconductance",
                help: "Amperes per volt of control voltage, everything between included: the data sheet's form.",
            },
        ],
        default: "gain",
        help: "How the data at hand give current against control voltage.",
    },
    Choice {
        path: "control.slope",
        name: "Slope compensation given as",
        options: &[
            ChoiceOption { key: "rate", name: "Slope", help: "The ramp's slope at the comparator, in V/s." },
            ChoiceOption {
                key: "share",
                name: "Share of the current's slope",
                help: "Of the down-slope in peak, of the up-slope in valley current mode, at the nominal condition.",
            },
            ChoiceOption {
                key: "quality",
                name: "Qp wanted",
                help: "As much as gives this quality factor of the sampling pair at the nominal condition.",
            },
        ],
        default: "quality",
        help: "How the compensating ramp is stated. It is one ramp for all conditions, shown in V/s.",
    },
    Choice {
        path: "control.inner.amplifier",
        name: "Inner amplifier",
        options: &[
            ChoiceOption { key: "op-amp", name: "Op amp", help: "A voltage amplifier, its network around it." },
            ChoiceOption {
                key: "transconductance",
                name: "Transconductance",
                help: "A voltage-to-current amplifier, its network from its output to ground.",
            },
        ],
        default: "op-amp",
        help: "What kind of amplifier compares sensed current and control voltage.",
    },
];

/// The mode chosen.
pub(super) fn mode(choices: &Choices) -> &str {
    choices.get("control.mode").unwrap_or("voltage")
}

/// Whether an entry or choice of the control plays a part under these choices.
pub fn applies(path: &str, choices: &Choices) -> bool {
    let mode = mode(choices);
    let average = mode == "average-current";
    let programmed = matches!(mode, "peak-current" | "valley-current");
    let slope = |key: &str| programmed && choices.get("control.slope").unwrap_or("quality") == key;
    let lumped = programmed && choices.is("control.sense", "transconductance");
    let op_amp = !choices.is("control.inner.amplifier", "transconductance");
    match path {
        "control.ramp.amplitude" | "control.ramp.valley" | "control.feedforward" => !programmed,
        "control.sense.gain" => average || programmed && !lumped,
        "control.sense.transconductance" => lumped,
        "control.sense.filter" | "control.clamp" => average || programmed,
        "control.slope.rate" => slope("rate"),
        "control.slope.share" => slope("share"),
        "control.slope.quality" => slope("quality"),
        "control.sense"
        | "control.sense.divider"
        | "control.sense.offset"
        | "control.slope"
        | "control.blanking"
        | "control.on-time.least" => programmed,
        "control.inner.r1" => average && op_amp,
        _ if path.starts_with("control.inner.op-amp.") => average && op_amp,
        _ if path.starts_with("control.inner.transconductance.") => average && !op_amp,
        _ if path.starts_with("control.inner.") => average,
        _ => true,
    }
}
