//! The events a switched closed loop is followed through, and what is asked for.

/// An event.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TransientEvent {
    /// The reference rises from zero, the converter at rest before.
    StartUp,
    /// The load current changes.
    LoadStep,
    /// The input voltage changes.
    LineStep,
    /// The reference changes.
    ReferenceStep,
    /// The load draws an overload for a time.
    Overload,
}

impl TransientEvent {
    /// All, in the order shown.
    pub const ALL: [TransientEvent; 5] = [
        TransientEvent::StartUp,
        TransientEvent::LoadStep,
        TransientEvent::LineStep,
        TransientEvent::ReferenceStep,
        TransientEvent::Overload,
    ];

    /// Word on the command line and in JSON.
    pub fn key(self) -> &'static str {
        match self {
            TransientEvent::StartUp => "start-up",
            TransientEvent::LoadStep => "load-step",
            TransientEvent::LineStep => "line-step",
            TransientEvent::ReferenceStep => "reference-step",
            TransientEvent::Overload => "overload",
        }
    }

    /// Name for people.
    pub fn name(self) -> &'static str {
        match self {
            TransientEvent::StartUp => "Start-up",
            TransientEvent::LoadStep => "Load step",
            TransientEvent::LineStep => "Line step",
            TransientEvent::ReferenceStep => "Reference step",
            TransientEvent::Overload => "Overload",
        }
    }

    /// The event of that word.
    pub fn from_key(key: &str) -> Option<Self> {
        TransientEvent::ALL.into_iter().find(|event| event.key() == key)
    }
}

/// What is asked of a transient.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TransientRequest {
    /// The event.
    pub event: TransientEvent,
    /// Columns of the waveforms: the pixels of a plot, or the rows of a table.
    pub columns: usize,
    /// Time from the event on [s]; none leaves the choice to what the event needs.
    pub span_s: Option<f64>,
}

/// Switching periods that are followed at most.
pub const MOST_PERIODS: f64 = 2e6;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_lead_back_to_their_events() {
        for event in TransientEvent::ALL {
            assert_eq!(TransientEvent::from_key(event.key()), Some(event));
            assert!(!event.name().is_empty());
        }
        assert_eq!(TransientEvent::from_key("load"), None);
    }
}
