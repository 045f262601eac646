//! What a design is tried with: steps of load, line and reference, each with its slew, the band that counts as settled, start-up and overload.

use crate::quantity::{Bounds, Entry, Unit, Values};

const LOAD_CHANGE: Entry = Entry::new(
    "event.load-step.change",
    "Load step",
    Unit::Ampere,
    Bounds::Finite,
    0.5,
    "Rise of the load current from the condition's own load; negative for a release.",
);
// 1 A/µs is what a bench load or a processor rail commonly gives.
const LOAD_SLEW: Entry = Entry::new(
    "event.load-step.slew",
    "Load step slew",
    Unit::AmperePerSecond,
    Bounds::Positive,
    1e6,
    "How fast the load current changes.",
);
const LINE_CHANGE: Entry = Entry::new(
    "event.line-step.change",
    "Line step",
    Unit::Volt,
    Bounds::Finite,
    1.0,
    "Rise of the input voltage; negative for a dip.",
);
const LINE_SLEW: Entry = Entry::new(
    "event.line-step.slew",
    "Line step slew",
    Unit::VoltPerSecond,
    Bounds::Positive,
    1e5,
    "How fast the input voltage changes.",
);
const REFERENCE_CHANGE: Entry = Entry::new(
    "event.reference-step.change",
    "Reference step, at the output",
    Unit::Volt,
    Bounds::Finite,
    0.1,
    "Change of the reference, stated as the change of output voltage it asks for.",
);
const REFERENCE_SLEW: Entry = Entry::new(
    "event.reference-step.slew",
    "Reference step slew, at the output",
    Unit::VoltPerSecond,
    Bounds::Positive,
    1e5,
    "How fast the wanted output voltage changes.",
);
const SETTLING_BAND: Entry = Entry::new(
    "event.settling-band",
    "Settling band",
    Unit::Fraction,
    Bounds::Between(1e-4, 0.2),
    0.01,
    "The output has settled once it stays within this fraction of the output voltage around its final value.",
);

const SOFT_START: Entry = Entry::new(
    "event.soft-start",
    "Soft start",
    Unit::Second,
    Bounds::NonNegative,
    2e-3,
    "Time in which the reference rises from zero at start-up. Empty for none: it is there at once.",
)
.optional();
const PREBIAS: Entry = Entry::new(
    "event.start-up.prebias",
    "Output before start-up",
    Unit::Volt,
    Bounds::NonNegative,
    1.0,
    "Voltage that the output is charged to as the converter starts. Empty for none: it starts from zero.",
)
.optional();
const OVERLOAD_CURRENT: Entry = Entry::new(
    "event.overload.current",
    "Overload current",
    Unit::Ampere,
    Bounds::Positive,
    10.0,
    "Load current while the overload lasts; a short is one far beyond what the converter can give. Empty for twice the greatest load.",
)
.optional();
const OVERLOAD_TIME: Entry = Entry::new(
    "event.overload.time",
    "Overload, how long",
    Unit::Second,
    Bounds::Positive,
    1e-3,
    "How long the overload lasts. Empty for 1 ms.",
)
.optional();

/// The rows of the table, in form order.
pub(super) static ENTRIES: [Entry; 11] = [
    LOAD_CHANGE,
    LOAD_SLEW,
    LINE_CHANGE,
    LINE_SLEW,
    REFERENCE_CHANGE,
    REFERENCE_SLEW,
    SETTLING_BAND,
    SOFT_START,
    PREBIAS,
    OVERLOAD_CURRENT,
    OVERLOAD_TIME,
];

/// A change at a limited slew.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Event {
    /// Signed change [A] or [V].
    pub change: f64,
    /// Slew, as a magnitude [A/s] or [V/s].
    pub slew: f64,
}

impl Event {
    /// Time the change takes [s].
    pub fn rise_s(&self) -> f64 {
        self.change.abs() / self.slew
    }
}

/// The steps a design is tried with.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Events {
    /// Rise of the load current [A], [A/s].
    pub load_step: Event,
    /// Rise of the input voltage [V], [V/s].
    pub line_step: Event,
    /// Rise of the wanted output voltage [V], [V/s].
    pub reference_step: Event,
    /// Half-width of the band that counts as settled, as a fraction of the output voltage.
    pub settling_band: f64,
    /// Time in which the reference rises at start-up [s]; 0 for at once.
    pub soft_start_s: f64,
    /// Voltage of the output as the converter starts [V].
    pub prebias_v: f64,
    /// Load current of an overload [A]; none for twice the greatest load.
    pub overload_a: Option<f64>,
    /// How long an overload lasts [s].
    pub overload_s: f64,
}

impl Events {
    /// The steps entered; an empty row stands at its default. Bounds have been looked at before.
    pub fn from_values(values: &Values) -> Self {
        let read = |entry: &Entry| values.get(entry.path).unwrap_or(entry.default);
        Self {
            load_step: Event { change: read(&LOAD_CHANGE), slew: read(&LOAD_SLEW) },
            line_step: Event { change: read(&LINE_CHANGE), slew: read(&LINE_SLEW) },
            reference_step: Event { change: read(&REFERENCE_CHANGE), slew: read(&REFERENCE_SLEW) },
            settling_band: read(&SETTLING_BAND),
            soft_start_s: values.get(SOFT_START.path).unwrap_or(0.0),
            prebias_v: values.get(PREBIAS.path).unwrap_or(0.0),
            overload_a: values.get(OVERLOAD_CURRENT.path),
            overload_s: read(&OVERLOAD_TIME),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_are_read_by_path() {
        let mut values = Values::new();
        values.set("event.load-step.change", -2.0).expect("finite");
        values.set("event.load-step.slew", 4e6).expect("finite");
        values.set("event.settling-band", 0.02).expect("finite");
        let events = Events::from_values(&values);
        assert_eq!(events.load_step, Event { change: -2.0, slew: 4e6 });
        assert!((events.load_step.rise_s() - 0.5e-6).abs() < 1e-18);
        assert_eq!(events.settling_band.to_bits(), 0.02_f64.to_bits());
        assert_eq!(events.line_step.change.to_bits(), LINE_CHANGE.default.to_bits());
        assert_eq!((events.soft_start_s.to_bits(), events.overload_a), (0.0_f64.to_bits(), None));
        values.set("event.soft-start", 3e-3).expect("finite");
        values.set("event.overload.current", 8.0).expect("finite");
        let events = Events::from_values(&values);
        assert_eq!((events.soft_start_s.to_bits(), events.overload_a), (3e-3_f64.to_bits(), Some(8.0)));
    }
}
