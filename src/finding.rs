//! Findings: what is wrong or remarkable about a design, how grave, at which entry, what would mend it.

/// How grave a finding is, rising.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Severity {
    /// Worth knowing; nothing is wrong.
    Note,
    /// A result is doubtful, or the design departs from good practice.
    Notice,
    /// An entry cannot be used, or a result cannot be computed.
    Problem,
}

impl Severity {
    /// The word shown and written to JSON.
    pub fn word(self) -> &'static str {
        match self {
            Severity::Note => "note",
            Severity::Notice => "notice",
            Severity::Problem => "problem",
        }
    }
}

/// A remark about a design.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// How grave it is.
    pub severity: Severity,
    /// Path of the entry or choice it stands at; empty for the design as a whole.
    pub place: String,
    /// What is the matter, in a full sentence.
    pub message: String,
    /// What would help, in words.
    pub hint: Option<String>,
    /// A change that mends it, to be taken with one press.
    pub remedy: Option<Box<Remedy>>,
}

/// A change of a design that mends a finding.
#[derive(Clone, Debug, PartialEq)]
pub struct Remedy {
    /// What the button says: "Set the output voltage to 24.02 V".
    pub label: String,
    /// Numbers to set [SI base unit of the entry], by path.
    pub values: Vec<(String, f64)>,
    /// Options to choose, by path.
    pub choices: Vec<(String, String)>,
}

impl Finding {
    fn new(severity: Severity, place: impl Into<String>, message: impl Into<String>) -> Self {
        Self { severity, place: place.into(), message: message.into(), hint: None, remedy: None }
    }

    /// Something worth knowing.
    pub fn note(place: impl Into<String>, message: impl Into<String>) -> Self {
        Self::new(Severity::Note, place, message)
    }

    /// Something doubtful, beside a valid result.
    pub fn notice(place: impl Into<String>, message: impl Into<String>) -> Self {
        Self::new(Severity::Notice, place, message)
    }

    /// Something that cannot be used or computed.
    pub fn problem(place: impl Into<String>, message: impl Into<String>) -> Self {
        Self::new(Severity::Problem, place, message)
    }

    /// The same finding with a hint.
    #[must_use]
    pub fn with_hint(mut self, hint: impl Into<String>) -> Self {
        self.hint = Some(hint.into());
        self
    }

    /// The same finding with a change that mends it.
    #[must_use]
    pub fn with_remedy(mut self, remedy: Remedy) -> Self {
        self.remedy = Some(Box::new(remedy));
        self
    }

    /// Whether this is a [`Severity::Problem`].
    pub fn is_problem(&self) -> bool {
        self.severity == Severity::Problem
    }
}

/// Message with place before and hint behind, for a line of text.
impl std::fmt::Display for Finding {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        if !self.place.is_empty() {
            write!(f, "{}: ", self.place)?;
        }
        f.write_str(&self.message)?;
        match &self.hint {
            Some(hint) => write!(f, " ({hint})"),
            None => Ok(()),
        }
    }
}
